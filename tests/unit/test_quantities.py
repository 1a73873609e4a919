"""Texts and quantities in, core units out: what is read, what is refused, and how it says so."""

import math
import pickle
import re
import subprocess
import sys
from decimal import Decimal
from fractions import Fraction

import numpy as np
import pint
import pytest
from scipy import constants as si

from bandwright import quantities as q
from bandwright.errors import QuantityError


def refused(text):
    return pytest.raises(QuantityError, match="^" + re.escape(text) + "$")


LENGTHS = [
    ("6.2 nm", 6.2),
    ("62 Å", 6.2),
    ("62 \N{ANGSTROM SIGN}", 6.2),
    ("62 A\N{COMBINING RING ABOVE}", 6.2),
    ("62 A", 6.2),
    ("62 Angstrom", 6.2),
    ("62 angstroms", 6.2),
    ("10nm", 10.0),
    ("  10\N{NO-BREAK SPACE}nm ", 10.0),
    ("10.3 um", 10300.0),
    ("10.3 \N{MICRO SIGN}m", 10300.0),
    ("10.3 \N{GREEK SMALL LETTER MU}m", 10300.0),
    ("10.3 micron", 10300.0),
    ("6200 pm", 6.2),
    ("0.00001 mm", 10.0),
    ("1e-6 cm", 10.0),
    ("+1E-8 m", 10.0),
    (".5 nm", 0.5),
    ("5. nm", 5.0),
    ("-3 nm", -3.0),
    ("\N{MINUS SIGN}3 nm", -3.0),
]


@pytest.mark.parametrize(("text", "nm"), LENGTHS)
def test_lengths(text, nm):
    assert q.as_length(text, "depth") == nm


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("6.2", "write '6.2 nm'"),
        ("", "write one number and one unit such as '6.2 nm'"),
        ("nm", "write one number and one unit such as '6.2 nm'"),
        ("nan nm", "write one number and one unit such as '6.2 nm'"),
        ("inf nm", "write one number and one unit such as '6.2 nm'"),
        ("5,5 nm", "use a decimal point, no comma: write '5.5 nm'"),
        ("5,5", "use a decimal point, no comma: write '5.5 nm'"),
        ("1,000 nm", "a comma may mean two things: write '1.000 nm' or '1000 nm'"),
        ("1_000 nm", "write '1000 nm'"),
        ("1_000", "write '1000 nm'"),
        ("4 nm..9 nm", "write one number and one unit such as '6.2 nm'"),
        ("4-9 nm", "write one number and one unit such as '6.2 nm'"),
        ("4 to 9 nm", "unit 'to' is not known; known are cm, m, mm, nm, pm, um, Å"),
        ("5 nm + 1 nm", "write one number and one unit such as '6.2 nm'"),
        ("5 * 2 nm", "write one number and one unit such as '6.2 nm'"),
        ("5 nm nm", "that is a quantity of kind length^2; write a length such as '6.2 nm'"),
        ("5 nm/", "the unit ends with '/'; write for example '6.2 nm'"),
        ("5 meV", "that is an energy; write a length such as '6.2 nm'"),
        ("5 K", "that is a temperature; write a length such as '6.2 nm'"),
        ("5 °C", "that is a temperature; write a length such as '6.2 nm'"),
        ("5 V", "that is a voltage; write a length such as '6.2 nm'"),
        ("5 kV/cm", "that is an electric field; write a length such as '6.2 nm'"),
        ("5 cm-1", "that is a wavenumber; write a length such as '6.2 nm'"),
        ("5 cm-2", "that is a density; write a length such as '6.2 nm'"),
        ("5 / cm^3", "that is a density; write a length such as '6.2 nm'"),
        ("5 / eV", "that is an inverse energy; write a length such as '6.2 nm'"),
        ("5 THz", "that is a frequency; write a length such as '6.2 nm'"),
        ("5 nm/nm", "that is a plain number; write a length such as '6.2 nm'"),
        ("22 ML", "that is a number of monolayers; write a length such as '6.2 nm'"),
        ("6.2 NM", "unit 'NM' is not known; did you mean 'nm'?"),
        ("6.2 kg", "unit 'kg' is not known; known are cm, m, mm, nm, pm, um, Å"),
        ("1e999", "write '1e999 nm'"),
        ("1e999 nm", "the number is too large"),
        ("1e-999 nm", "the number is too small"),
        ("1e99999 nm", "write one number and one unit such as '6.2 nm'"),
    ],
)
def test_texts_that_are_no_length(text, says):
    with refused(f"thickness: got '{text}'; {says}"):
        q.as_length(text, "thickness")


@pytest.mark.parametrize(
    ("value", "says"),
    [
        (6.2, "got 6.2; write '6.2 nm'"),
        (np.float64(6.2), "got 6.2; write '6.2 nm'"),
        (6, "got 6; write '6 nm'"),
        (math.nan, "got nan; that is not finite"),
        (math.inf, "got inf; that is not finite"),
        (None, "got None; write a length as text such as '6.2 nm'"),
        (True, "got True; write a length as text such as '6.2 nm'"),
        (np.True_, "got True; write a length as text such as '6.2 nm'"),
        (["6.2 nm"], "got ['6.2 nm']; write a length as text such as '6.2 nm'"),
        (np.array([1.0, 2.0]), "got [1. 2.]; that is an array; write one length"),
    ],
)
def test_values_that_are_no_length(value, says):
    with refused(f"thickness: {says}"):
        q.as_length(value, "thickness")


def test_thickness_keeps_monolayers():
    assert q.as_thickness("22 ML", "thickness") == q.Length(22.0, "ML")
    assert q.as_thickness("22 monolayers", "thickness") == q.Length(22.0, "ML")
    assert q.as_thickness("62 Å", "thickness") == q.Length(6.2, "nm")
    assert q.as_thickness(q.Length(6.2, "nm"), "thickness") == q.Length(6.2, "nm")


@pytest.mark.parametrize(
    ("value", "says"),
    [
        ("0 nm", "got '0 nm'; a thickness must be above zero"),
        ("-3 nm", "got '-3 nm'; a thickness must be above zero"),
        ("0 ML", "got '0 ML'; a thickness must be above zero"),
        (q.Length(6.2, "um"), "got Length(value=6.2, unit='um'); the unit must be 'nm' or 'ML'"),
        (q.Length(math.nan, "nm"), "got Length(value=nan, unit='nm'); that is not finite"),
        ("5 ML/nm", "got '5 ML/nm'; that is a quantity of kind monolayers/length; write a thickn"
         "ess such as '6.2 nm'"),
    ],
)  # fmt: skip
def test_thickness_that_cannot_be(value, says):
    with refused(f"thickness: {says}"):
        q.as_thickness(value, "thickness")


HC = si.h * si.c / si.e  # eV m


@pytest.mark.parametrize(
    ("text", "ev"),
    [
        ("235 meV", 0.235),
        ("0.235 eV", 0.235),
        ("235000 ueV", 0.235),
        ("235000 \N{MICRO SIGN}eV", 0.235),
        ("0.0018 keV", 1.8),
        ("-20meV", -0.02),
        ("1000 cm-1", pytest.approx(HC * 1e5, rel=1e-15)),
        ("1000 cm^-1", pytest.approx(HC * 1e5, rel=1e-15)),
        ("1000 cm**-1", pytest.approx(HC * 1e5, rel=1e-15)),
        ("1000 cm⁻¹", pytest.approx(HC * 1e5, rel=1e-15)),
        ("1000 / cm", pytest.approx(HC * 1e5, rel=1e-15)),
        ("1000 1/cm", pytest.approx(HC * 1e5, rel=1e-15)),
        ("3 THz", pytest.approx(3e12 * si.h / si.e, rel=1e-15)),
        ("3000 GHz", pytest.approx(3e12 * si.h / si.e, rel=1e-15)),
    ],
)
def test_energies(text, ev):
    assert q.as_energy(text, "edge") == ev


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("12 kV/cm", 0.0012),
        ("12kV/cm", 0.0012),
        ("12 kV cm-1", 0.0012),
        ("12 kV·cm^-1", 0.0012),
        ("1.2 MV/m", 0.0012),
        ("0.12 V/um", 0.00012),
        ("3 MV/cm", 0.3),
        ("0.0012 V/nm", 0.0012),
        ("-12 kV/cm", -0.0012),
        ("0 kV/cm", 0.0),
    ],
)
def test_fields(text, value):
    assert q.as_field(text, "field") == value


@pytest.mark.parametrize(
    ("text", "value"), [("0.3 V", 0.3), ("300 mV", 0.3), ("-0.3V", -0.3), ("300000 uV", 0.3)]
)
def test_voltages(text, value):
    assert q.as_voltage(text, "bias") == value


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("77 K", 77.0),
        ("0 K", 0.0),
        ("50 mK", 0.05),
        ("27 °C", 300.15),
        ("27 ℃", 300.15),
        ("-196 degC", 77.15),
    ],
)
def test_temperatures(text, value):
    assert q.as_temperature(text, "temperature") == value


@pytest.mark.parametrize(
    ("text", "density"),
    [
        ("2e11 / cm^2", q.Density(0.002, "sheet")),
        ("2e11 cm^-2", q.Density(0.002, "sheet")),
        ("2e11 cm-2", q.Density(0.002, "sheet")),
        ("2e11 /cm2", q.Density(0.002, "sheet")),
        ("2e11/cm²", q.Density(0.002, "sheet")),
        ("2e15 / m^2", q.Density(0.002, "sheet")),
        ("3e17 / cm^3", q.Density(0.0003, "volume")),
        ("3e17 cm^-3", q.Density(0.0003, "volume")),
        ("3e17 1/cm^3", q.Density(0.0003, "volume")),
        ("0 / cm^3", q.Density(0.0, "volume")),
    ],
)
def test_densities(text, density):
    assert q.as_density(text, "donors") == density
    assert q.as_density(density, "donors") == density


@pytest.mark.parametrize("text", ["0.56 / eV", "0.56 eV^-1", "0.56 1/eV", "0.00056 / meV"])
def test_inverse_energies(text):
    assert q.as_inverse_energy(text, "nonparabolicity") == 0.56


@pytest.mark.parametrize(
    ("door", "value", "says"),
    [
        (q.as_energy, 235, "got 235; write '235 meV'"),
        (q.as_energy, "235", "got '235'; write '235 meV'"),
        (q.as_energy, "5 nm", "got '5 nm'; that is a length; write an energy such as '235 meV'"),
        (q.as_energy, "5 mev", "got '5 mev'; unit 'mev' is not known; did you mean 'meV'?"),
        (q.as_field, 12, "got 12; write '12 kV/cm'"),
        (q.as_field, "5 V", "got '5 V'; that is a voltage; write an electric field such as '12 kV/"
         "cm'"),
        (q.as_field, "5 kV/mc", "got '5 kV/mc'; unit 'mc' is not known; did you mean 'm'?"),
        (q.as_voltage, 0.3, "got 0.3; write '0.3 V'"),
        (q.as_voltage, "3 kV/cm", "got '3 kV/cm'; that is an electric field; write a voltage such"
         " as '0.3 V'"),
        (q.as_temperature, 77, "got 77; write '77 K'"),
        (q.as_temperature, "-1 K", "got '-1 K'; it lies below absolute zero"),
        (q.as_temperature, "-300 °C", "got '-300 °C'; it lies below absolute zero"),
        (q.as_density, 2e11, "got 200000000000.0; write '2e11 / cm^2'"),
        (q.as_density, "2e11", "got '2e11'; write '2e11 / cm^2'"),
        (q.as_density, "2e11 / cm", "got '2e11 / cm'; that is a wavenumber; write a density such a"
         "s '2e11 / cm^2'"),
        (q.as_density, "-2 / cm^2", "got '-2 / cm^2'; a density can't be negative"),
        (q.as_density, q.Density(1.0, "area"), "got Density(value=1.0, kind='area'); kind must be"
         " 'sheet' or 'volume'"),
        (q.as_density, q.Density(math.inf, "sheet"), "got Density(value=inf, kind='sheet'); that i"
         "s not finite"),
        (q.as_inverse_energy, 0.56, "got 0.56; write '0.56 / eV'"),
        (q.as_inverse_energy, "0.56 eV", "got '0.56 eV'; that is an energy; write an inverse energ"
         "y such as '0.56 / eV'"),
        (q.as_fraction, 28, "got 28; a fraction lies between 0 and 1; for percent write 0.28"),
        (q.as_fraction, 128, "got 128; a fraction lies between 0 and 1"),
        (q.as_fraction, -0.1, "got -0.1; a fraction lies between 0 and 1"),
        (q.as_fraction, "0,28", "got '0,28'; use a decimal point, no comma: write '0.28'"),
        (q.as_fraction, "a lot", "got 'a lot'; write a number such as 0.28"),
        (q.as_fraction, "0.28 nm", "got '0.28 nm'; write a number such as 0.28"),
        (q.as_fraction, None, "got None; write a number such as 0.28"),
        (q.as_fraction, True, "got True; write a number such as 0.28"),
        (q.as_fraction, math.nan, "got nan; that is not finite"),
        (q.as_fraction, 1j, "got 1j; write a number such as 0.28"),
        (q.as_mass, 0.0, "got 0.0; a mass must be above zero"),
        (q.as_mass, -0.067, "got -0.067; a mass must be above zero"),
        (q.as_mass, math.inf, "got inf; that is not finite"),
        (q.as_mass, 10**400, f"got {str(10**400)[:77]}...; the number is too large"),
        (q.as_mass, "0.067 kg", "got '0.067 kg'; write a number such as 0.067"),
        (q.as_mass, np.array([0.067, 0.09]), "got [0.067 0.09 ]; that is an array; write one numb"
         "er"),
    ],
)  # fmt: skip
def test_each_door_refuses_and_mends(door, value, says):
    with refused(f"key: {says}"):
        door(value, "key")


@pytest.mark.parametrize(
    "value",
    [0.28, np.float64(0.28), np.array(0.28), Decimal("0.28"), Fraction(28, 100), "0.28", "28 %"],
)
def test_fractions_of_any_number_type(value):
    fraction = q.as_fraction(value, "x")
    assert fraction == 0.28
    assert type(fraction) is float


def test_masses():
    assert q.as_mass(np.float32(0.5), "mass") == 0.5
    assert q.as_mass("0.067", "mass") == q.as_mass("0.067 m0", "mass") == 0.067


# --- quantities of pint ---------------------------------------------------------------------


@pytest.fixture(scope="module")
def ureg():
    """A registry of the user's own, which is not pint's application registry."""
    return pint.UnitRegistry()


def test_quantities_of_any_registry(ureg):
    assert q.as_length(62 * ureg.angstrom, "depth") == 6.2
    assert q.as_length(pint.Quantity(3, "angstrom"), "depth") == 0.3
    assert q.as_thickness(ureg.Quantity(62, "angstrom"), "t") == q.Length(6.2, "nm")
    assert q.as_energy(235 * ureg.meV, "edge") == 0.235
    assert q.as_energy(1000 / ureg.cm, "edge") == q.as_energy("1000 cm-1", "edge")
    assert q.as_field(12 * ureg.kV / ureg.cm, "field") == 0.0012
    assert q.as_voltage(300 * ureg.mV, "bias") == 0.3
    assert q.as_temperature(ureg.Quantity(27, "degC"), "temperature") == 300.15
    assert q.as_density(2e11 / ureg.cm**2, "donors") == q.Density(0.002, "sheet")
    assert q.as_density(3e17 / ureg.cm**3, "donors") == q.Density(0.0003, "volume")
    assert q.as_inverse_energy(0.56 / ureg.eV, "nonparabolicity") == 0.56
    assert q.as_fraction(ureg.Quantity(28, "percent"), "x") == 0.28
    assert q.as_mass(ureg.Quantity(np.float64(0.067), ""), "mass") == 0.067


def test_a_quantity_in_core_units_is_taken_as_it_is(ureg):
    value = 0.1 + 0.2  # 17 digits
    assert q.as_length(value * ureg.nm, "depth") == value
    assert q.as_length(10**17 * ureg.pm, "depth") == 1e14
    assert q.as_length(ureg.Quantity(Decimal("62"), "nm"), "depth") == 62.0


@pytest.mark.parametrize(
    ("door", "magnitude", "unit", "says"),
    [
        (q.as_length, 5, "meV", "that is no length; write for example '6.2 nm'"),
        (q.as_energy, 5, "nm", "that is no energy; write for example '235 meV'"),
        (q.as_energy, 3, "THz", "that is no energy; write for example '235 meV'"),
        (q.as_density, 3, "1/cm", "that is no density; write for example '2e11 / cm^2'"),
        (q.as_length, math.nan, "nm", "that is not finite"),
        (q.as_length, [1.0, 2.0], "nm", "that is an array; write one length"),
        (q.as_mass, 1, "kg", "write a number without unit such as 0.067"),
    ],
)
def test_quantities_of_another_kind(ureg, door, magnitude, unit, says):
    with pytest.raises(QuantityError, match=re.escape(says)):
        door(ureg.Quantity(magnitude, unit), "key")


class Strange:
    """Has `m_as` and little else of a quantity."""

    def __init__(self, value):
        self.value = value

    def m_as(self, unit):
        return self.value

    def __str__(self):
        return "something strange"


def test_a_quantity_that_gives_no_number():
    with refused("depth: got something strange; that is no plain number"):
        q.as_length(Strange("much"), "depth")
    assert q.as_length(Strange(0.1 + 0.2), "depth") == 0.1 + 0.2


def test_quantities_out():
    energy = q.quantity(0.235, "eV")
    assert isinstance(energy, pint.Quantity)
    assert energy.m_as("meV") == pytest.approx(235.0, rel=1e-15)
    assert q.as_energy(energy, "edge") == 0.235
    lengths = q.quantity(np.array([1.0, 2.0]), "nm")
    assert lengths.to("angstrom").magnitude.tolist() == pytest.approx([10.0, 20.0], rel=1e-15)


# --- texts out ------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (q.length_text(6.2), "6.2 nm"),
        (q.length_text(30.0), "30 nm"),
        (q.length_text(-0.0), "0 nm"),
        (q.length_text(q.Length(22.0, "ML")), "22 ML"),
        (q.length_text(1e-7), "1e-7 nm"),
        (q.length_text(12_300_000.0), "1.23e7 nm"),
        (q.length_text(123_456_789.0), "123456789 nm"),
        (q.energy_text(0.235), "235 meV"),
        (q.energy_text(-0.02), "-20 meV"),
        (q.energy_text(1.79), "1.79 eV"),
        (q.field_text(0.0012), "12 kV/cm"),
        (q.field_text(-0.3), "-3000 kV/cm"),
        (q.voltage_text(0.3), "0.3 V"),
        (q.temperature_text(300.0), "300 K"),
        (q.density_text(q.Density(0.002, "sheet")), "2e11 / cm^2"),
        (q.density_text(q.Density(-0.00031, "volume")), "-3.1e17 / cm^3"),
        (q.inverse_energy_text(0.56), "0.56 / eV"),
        (q.number_text(0.1 + 0.2), "0.30000000000000004"),
    ],
)
def test_texts(text, expected):
    assert text == expected


def test_show_keeps_to_one_short_line():
    assert q.show(True) == "True"
    assert q.show("a\nb") == "'a\\nb'"
    assert q.show(np.zeros((2, 2))) == "[[0. 0.] [0. 0.]]"
    assert len(q.show("long" * 40)) == 80
    assert q.show(["long"] * 40).endswith("...")
    assert len(q.show(["long"] * 40)) == 80


# --- habits ---------------------------------------------------------------------------------


def test_values_and_errors_pickle():
    for value in (q.Length(6.2, "nm"), q.Density(0.002, "sheet")):
        assert pickle.loads(pickle.dumps(value)) == value
        assert hash(pickle.loads(pickle.dumps(value))) == hash(value)
    with pytest.raises(QuantityError, match=r"write '6\.2 nm'") as caught:
        q.as_length(6.2, "thickness")
    again = pickle.loads(pickle.dumps(caught.value))
    assert (str(again), again.message) == (str(caught.value), caught.value.message)


def test_reading_texts_loads_no_pint():
    code = (
        "import sys, bandwright.quantities as q; q.as_length('62 Å', 'd'); q.as_mass(0.067, 'm');"
        "q.as_energy('235 meV', 'e'); q.energy_text(0.235);"
        "sys.exit(sum(m in sys.modules for m in ('pint', 'numpy', 'scipy', 'pandas')))"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


@pytest.mark.parametrize(
    ("value", "unit", "found"),
    [
        ("62 Å", "nm", (6.2, "nm")),
        ("22 ML", "nm", (22.0, "ML")),
        ("22 nm", "ML", (22.0, "nm")),
        ("-5 meV", "eV", (-0.005, "eV")),
        ("12 kV/cm", "V/nm", (0.0012, "V/nm")),
        ("27 °C", "K", (300.15, "K")),
        ("2e11 / cm^2", "nm^-3", (0.002, "nm^-2")),
        ("0.56 / eV", "1/eV", (0.56, "1/eV")),
        ("28 %", "", (0.28, "")),
        (1.25, "", (1.25, "")),
        ("0.067 m0", "m0", (0.067, "m0")),
    ],
)
def test_a_value_of_the_kind_of_a_core_unit(value, unit, found):
    assert q.as_value(value, "well.it", unit) == found


@pytest.mark.parametrize(
    ("value", "unit", "says"),
    [
        ("5 meV", "nm", "well.it: got '5 meV'; that is an energy; write a thickness such as"),
        (5.0, "eV", "well.it: got 5.0; write '5 meV'"),
        ("5 nm", "", "well.it: got '5 nm'; write a number such as 0.28"),
        (math.nan, "m0", "well.it: got nan; that is not finite"),
    ],
)
def test_a_value_of_another_kind(value, unit, says):
    with pytest.raises(QuantityError, match=re.escape(says)):
        q.as_value(value, "well.it", unit)
