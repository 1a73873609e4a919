"""Units hold for every number: one spelling is another, and what is written reads back."""

from decimal import Decimal

import pint
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from bandwright import quantities as q
from bandwright.errors import QuantityError

UREG = pint.UnitRegistry()

# What a person writes: up to 9 digits, a point anywhere among them.
written = st.builds(
    lambda digits, places: Decimal(digits).scaleb(-places),
    st.integers(1, 999_999_999),
    st.integers(0, 6),
)
finite = st.floats(allow_nan=False, allow_infinity=False, min_value=-1e200, max_value=1e200)
positive = st.floats(min_value=1e-200, max_value=1e200)


def text(number):
    return f"{number:f}"


@given(written)
def test_nm_against_angstrom(number):
    nm = q.as_length(f"{text(number)} nm", "t")
    assert nm == float(number)
    for unit in ("Å", "Angstrom", "A"):
        assert q.as_length(f"{text(number * 10)} {unit}", "t") == nm
    assert q.as_length(f"{text(number / 1000)} um", "t") == nm
    assert q.as_length(f"{text(number / 1000)}µm", "t") == nm
    assert q.as_length(f"{text(number * 1000)} pm", "t") == nm
    assert q.as_thickness(f"{text(number * 10)} Å", "t") == q.Length(nm, "nm")
    assert hash(q.as_thickness(f"{text(number * 10)} Å", "t")) == hash(q.Length(nm, "nm"))


@given(written)
def test_prefixes_are_exact(number):
    assert q.as_energy(f"{text(number)} meV", "e") == q.as_energy(f"{number / 1000} eV", "e")
    assert q.as_voltage(f"{text(number)} mV", "u") == q.as_voltage(f"{number / 1000} V", "u")
    assert q.as_field(f"{text(number)} kV/cm", "f") == q.as_field(f"{number / 10} MV/m", "f")
    assert q.as_density(f"{number} / cm^2", "n") == q.as_density(f"{number * 10000} m-2", "n")
    assert q.as_density(f"{number} cm^-3", "n") == q.as_density(f"{number * 10**6} / m^3", "n")


@given(written)
def test_text_and_pint_quantity_agree(number):
    value = float(number)
    assert q.as_length(value * UREG.angstrom, "t") == q.as_length(f"{number} Å", "t")
    assert q.as_length(value * UREG.um, "t") == q.as_length(f"{number} um", "t")
    assert q.as_energy(value * UREG.meV, "e") == q.as_energy(f"{number} meV", "e")
    assert q.as_energy(value / UREG.cm, "e") == q.as_energy(f"{number} cm-1", "e")
    assert q.as_voltage(value * UREG.mV, "u") == q.as_voltage(f"{number} mV", "u")
    assert q.as_field(value * UREG.kV / UREG.cm, "f") == q.as_field(f"{number} kV/cm", "f")
    assert q.as_density(value / UREG.cm**2, "n") == q.as_density(f"{number} / cm^2", "n")
    assert q.as_density(value / UREG.cm**3, "n") == q.as_density(f"{number} / cm^3", "n")


@given(finite)
def test_a_written_value_reads_back_as_itself(value):
    assert q.as_length(q.length_text(value), "t") == value
    assert q.as_energy(q.energy_text(value), "e") == value
    assert q.as_field(q.field_text(value), "f") == value
    assert q.as_voltage(q.voltage_text(value), "u") == value
    assert q.as_inverse_energy(q.inverse_energy_text(value), "a") == value
    assert float(q.number_text(value)) == value


@given(positive)
def test_a_written_positive_value_reads_back_as_itself(value):
    assert q.as_temperature(q.temperature_text(value), "T") == value
    assert q.as_mass(q.number_text(value), "m") == value
    for unit in ("nm", "ML"):
        assert q.as_thickness(q.length_text(q.Length(value, unit)), "t") == q.Length(value, unit)
    for kind in ("sheet", "volume"):
        density = q.Density(value, kind)
        assert q.as_density(q.density_text(density), "n") == density


@given(written)
def test_a_text_written_by_hand_is_written_back_no_longer(number):
    by_hand = f"{number.normalize():f} nm"
    again = q.length_text(q.as_length(by_hand, "t"))
    assert q.as_length(again, "t") == float(number)
    assert len(again) <= len(by_hand)


@given(finite)
def test_quantities_out_come_back_in(value):
    assert q.as_length(q.quantity(value, "nm"), "t") == value
    assert q.as_energy(q.quantity(value, "eV"), "e") == value


@given(st.one_of(st.floats(), st.integers(), st.booleans(), st.none()))
def test_a_bare_number_is_never_a_length(value):
    with pytest.raises(QuantityError, match=r"^t: got "):
        q.as_length(value, "t")


@given(st.text(max_size=12))
def test_any_text_is_read_or_refused_by_name(anything):
    for door in (q.as_length, q.as_energy, q.as_field, q.as_density, q.as_temperature, q.as_mass):
        try:
            value = door(anything, "key")
        except QuantityError as error:
            assert str(error).startswith("key: got ")
        else:
            assert value == value


@given(written, written, st.sampled_from([" + ", "..", " .. ", "-", " to ", ", ", " ", "_", ","]))
def test_two_numbers_are_never_one(first, second, between):
    for joined in (f"{first} nm{between}{second} nm", f"{first}{between}{second} nm"):
        assume("E" not in joined)
        with pytest.raises(QuantityError, match=r"^t: got "):
            q.as_length(joined, "t")
