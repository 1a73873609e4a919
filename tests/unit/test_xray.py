"""X-ray positions: Bragg's law by hand, with silicon as the anchor, and bad input."""

import math
from html import unescape

import numpy as np
import pytest

import bandwright as bw
from bandwright.errors import QuantityError, StackError, UnknownName
from bandwright.xray import LINES, read_reflection, read_wavelength, xray_pattern

A_GAAS = 0.565325  # Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), from memory [nm]
CU = 0.154059313  # copper K-alpha1 [nm], see test_wavelengths
GROUP = "200 nm GaAs, 20 x (8 nm In0.1Ga0.9As, 12 nm GaAs)"


def pattern(line=GROUP, *args, substrate="GaAs", **more):
    return xray_pattern(bw.parse_line(line, substrate=substrate), *args, **more)


def angle(a, b, length=CU, indices=(0, 0, 4)):
    """Bragg's law written out: in the plane a, along growth b."""
    h, k, l = indices  # noqa: E741
    inverse = math.sqrt((h * h + k * k) / a**2 + l * l / b**2)
    return math.degrees(math.asin(0.5 * length * inverse))


# In0.1Ga0.9As on GaAs: relaxed mismatch, strain along growth; Van de Walle, Phys. Rev. B 39, 1871
# (1989), with numbers of Vurgaftman et al., computed apart from this project.
MISFIT, EZZ = 0.007164905143, 0.006675432709
HIGH = A_GAAS * (1.0 + MISFIT) * (1.0 + EZZ)  # the strained lattice constant along growth
MEAN = 20.0 / (8.0 / HIGH + 12.0 / A_GAAS)


def test_wavelengths():
    # CODATA 2018: Cu x unit 1.00207697(28)e-13 m, Mo x unit 1.00209952(53)e-13 m; K-alpha1 is
    # 1537.400 and 707.831 of them by definition
    assert LINES["Cu K-alpha1"] == pytest.approx(0.15405931, abs=5e-9)
    assert LINES["Mo K-alpha1"] == pytest.approx(0.07093171, abs=5e-9)
    # copper measured: 0.15405929(5) nm, G. Hoelzer et al., Phys. Rev. A 56, 4554 (1997), from
    # memory; both agree to their uncertainties
    assert LINES["Cu K-alpha1"] == pytest.approx(0.15405929, abs=7e-8)


@pytest.fixture
def silicon(tmp_path):
    """A file that gives GaAs the lattice constant of silicon."""

    def stack(lattice):
        path = tmp_path / "silicon.toml"
        path.write_text(
            '[sources]\nanchor = "for this test: the lattice constant of silicon"\n'
            f'[binary.GaAs]\nlattice = {{ value = "{lattice} nm", source = "anchor" }}\n'
        )
        return bw.Stack([bw.Layer("90 nm", "GaAs")], substrate="GaAs", materials=path)

    return stack


def test_silicon_by_its_measured_220_spacing(silicon):
    # CODATA 2018: lattice parameter of silicon 0.5431020511(89) nm; spacing of its 220 planes
    # 0.1920155716(32) nm, so that 004 planes are 0.1920155716/sqrt 2 apart
    found = xray_pattern(silicon("0.5431020511"))
    due = math.degrees(math.asin(0.5 * LINES["Cu K-alpha1"] * math.sqrt(2.0) / 0.1920155716))
    print(found.substrate_deg, due)
    assert found.substrate_deg == pytest.approx(due, abs=1e-7)
    assert found.zero_order_deg == pytest.approx(due, abs=1e-7)
    assert found.perpendicular_mismatch_ppm == pytest.approx(0.0, abs=1e-6)


def test_silicon_by_its_powder_card(silicon):
    # silicon powder, card 27-1402 of the powder diffraction file, from memory: lattice constant
    # 0.543088 nm, wavelength 0.15405981 nm, 400 at 69.130 degrees, printed to 0.001
    found = xray_pattern(silicon("0.543088"), wavelength="1.5405981 Å")
    assert 2.0 * found.substrate_deg == pytest.approx(69.130, abs=1.5e-3)


def test_zero_order_and_mismatch_by_hand():
    found = pattern()
    assert (found.period_nm, found.times) == (20.0, 20)
    assert found.members == ("layer 2 (In0.1Ga0.9As)", "layer 3 (GaAs)")
    assert found.mean_perpendicular_nm == pytest.approx(MEAN, rel=1e-10)
    assert found.zero_order_deg == pytest.approx(angle(A_GAAS, MEAN), abs=2e-6)
    assert found.substrate_deg == pytest.approx(angle(A_GAAS, A_GAAS), abs=2e-6)
    assert found.perpendicular_mismatch_ppm == pytest.approx(1e6 * (MEAN / A_GAAS - 1.0), rel=1e-7)
    assert found.mean_mismatch_ppm == pytest.approx(1e6 * 0.4 * MISFIT, rel=1e-9)


def test_the_period_comes_back_from_neighbouring_satellites():
    # L = wavelength/(2 (sin t1 - sin t2)), as a grower reads it from a measured curve
    found = pattern(orders=4)
    sines = np.sin(np.radians(found.table["bragg_angle_deg"].to_numpy()))
    periods = found.wavelength_nm / (2.0 * np.diff(sines))
    assert list(found.table.index) == list(range(-4, 5))
    np.testing.assert_allclose(periods, 20.0, rtol=1e-11)


def test_the_spacing_by_the_derivative_of_braggs_law():
    found = pattern()
    slope = CU / (2.0 * 20.0 * math.cos(math.radians(found.zero_order_deg)))
    # exact but for the third derivative
    assert found.spacing_deg == pytest.approx(math.degrees(slope), rel=1e-4)


def test_the_table_counts_from_the_substrate():
    table = pattern().table
    zero = 3600.0 * (angle(A_GAAS, MEAN) - angle(A_GAAS, A_GAAS))
    assert table.loc[0, "from_substrate_arcsec"] == pytest.approx(zero, abs=0.01)
    assert table.loc[1, "two_theta_deg"] == 2.0 * table.loc[1, "bragg_angle_deg"]


def test_a_tilted_reflection_keeps_the_substrates_lattice_in_the_plane():
    found = pattern(GROUP, "115")
    assert found.zero_order_deg == pytest.approx(angle(A_GAAS, MEAN, indices=(1, 1, 5)), abs=2e-6)
    assert found.substrate_tilt_deg == pytest.approx(15.7932, abs=1e-4)  # atan(sqrt 2/5)
    tilt = math.degrees(math.atan2(math.sqrt(2.0) / A_GAAS, 5.0 / MEAN))
    assert found.table.loc[0, "tilt_deg"] == pytest.approx(tilt, rel=1e-9)
    assert found.cautions[0].startswith("reflection 115: its planes are tilted, by another angle")
    assert found.zero_order_deg == pattern(GROUP, "-1 1 5").zero_order_deg


def test_molybdenum():
    found = pattern(GROUP, "008", "Mo K-alpha1")
    assert found.substrate_deg == pytest.approx(
        angle(A_GAAS, A_GAAS, 0.0709317105, (0, 0, 8)), abs=1e-6
    )


def test_the_thickest_group_is_the_period():
    found = pattern("2 x (5 nm GaAs, 5 nm AlAs), 9 x (4 nm GaAs, 3 nm AlAs), 3 x (8 nm AlAs)")
    assert (found.period_nm, found.times) == (7.0, 9)
    nested = pattern("5 x (9 nm GaAs, 3 x (4 nm GaAs, 3 nm AlAs))")
    assert (nested.period_nm, nested.times) == (30.0, 5)
    assert nested.cells == pytest.approx(21.0 / A_GAAS + 9.0 / _tall_alas(), rel=1e-9)


def _tall_alas():
    a, c11, c12 = 0.56611, 125.0, 53.4  # Vurgaftman et al. (2001), from memory
    return a * (1.0 - 2.0 * c12 / c11 * (A_GAAS - a) / a)


def test_without_a_group_all_layers_are_one():
    found = pattern("20 nm GaAs, 8 nm In0.1Ga0.9As, 1 x (22 nm GaAs)")
    assert (found.period_nm, found.times) == (50.0, 1)
    mean = 50.0 / (8.0 / HIGH + 42.0 / A_GAAS)
    assert found.zero_order_deg == pytest.approx(angle(A_GAAS, mean), abs=2e-6)
    assert any(text.startswith("no group is repeated: all layers") for text in found.cautions)


def test_a_grade_counts_by_its_mean():
    x = pattern("9 x (10 nm InxGa1-xAs {x 0 to 0.1}, 10 nm GaAs)").mean_mismatch_ppm
    assert x == pytest.approx(1e6 * 0.25 * MISFIT, rel=1e-9)


def test_monolayers_make_the_period():
    found = pattern("9 x (20 ML In0.1Ga0.9As, 40 ML GaAs)")
    assert found.cells == pytest.approx(30.0, rel=1e-12)
    assert found.period_nm == pytest.approx(10.0 * HIGH + 20.0 * A_GAAS, rel=1e-9)


def test_satellites_beyond_ninety_degrees_are_left_out():
    found = pattern("9 x (8 ML In0.1Ga0.9As, 8 ML GaAs)", "006", "1.87 Å", orders=3)
    assert list(found.table.index) == [-3, -2, -1, 0]
    assert found.spacing_deg == found.zero_order_deg - found.angle_deg(-1)
    with pytest.raises(StackError, match=r"006: satellite \+1 has no angle at 0.187 nm"):
        found.angle_deg(1)


# -- what is asked ----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("given", "indices"),
    [("004", (0, 0, 4)), ("(0 0 4)", (0, 0, 4)), (" 1 1 5 ", (1, 1, 5)), ("-1-15", (-1, -1, 5)),
     ((2, 2, 4), (2, 2, 4)), (np.array([0, 0, 2]), (0, 0, 2)), ("0 0 10", (0, 0, 10))],
)  # fmt: skip
def test_reflections(given, indices):
    assert read_reflection(given) == indices


@pytest.mark.parametrize("given", ["", "04", "four", "004 5", "0.4", 4, (0, 4), (0, 0, 4.0), None])
def test_an_unknown_reflection(given):
    with pytest.raises(StackError, match=r"^reflection: got .*write three indices, such as '004'"):
        read_reflection(given)


@pytest.mark.parametrize("given", ["003", "005", "114", "1 0 4", "123"])
def test_a_forbidden_reflection(given):
    if given in ("003", "005"):
        given = f"0 {given[1]} {given[2]}"
    with pytest.raises(StackError, match="is forbidden in zincblende, which has all indices odd"):
        read_reflection(given)


@pytest.mark.parametrize("given", ["220", "0 0 0", "0 0 -4", "1 1 -1"])
def test_a_reflection_that_shows_no_layers(given):
    with pytest.raises(StackError, match="its last index, along growth, must be 1 or more"):
        read_reflection(given)


def test_a_weak_reflection_is_said_to_be():
    (text,) = pattern(GROUP, "002").cautions
    assert text == "reflection 002 is weak: only the difference of both sublattices scatters"
    assert not any("weak" in text for text in pattern(GROUP, "224").cautions)
    assert pattern(GROUP, "006").cautions[0].startswith("reflection 006 is weak")


def test_a_reflection_from_below_the_surface_is_said_to_be():
    text = pattern(GROUP, "111").cautions[-1]
    assert text.startswith("reflection 111: its planes are tilted by 54.74 degrees, more than")


def test_wavelengths_in_other_words():
    assert read_wavelength("0.15406 nm") == read_wavelength("1.5406 Å")
    assert read_wavelength("Cu K-alpha1") == (LINES["Cu K-alpha1"], "Cu K-alpha1")


@pytest.mark.parametrize(
    ("given", "error", "says"),
    [
        ("0.154 eV", QuantityError, "wavelength: got '0.154 eV'; that is an energy; write a"),
        ("8.05 keV", QuantityError, "wavelength: got '8.05 keV'; that is an energy"),
        (0.154, QuantityError, "wavelength: got 0.154; write '0.154 nm'"),
        ("0 nm", QuantityError, "wavelength: got '0 nm'; it must be above zero"),
        ("-1.54 Å", QuantityError, "it must be above zero"),
        ("Cu K-alpha", UnknownName, "no line 'Cu K-alpha'; did you mean 'Cu K-alpha1'"),
        ("Fe", UnknownName, "wavelength: there is no line 'Fe'.*or write a length, '0.15406 nm'"),
    ],
)
def test_wavelengths_that_are_none(given, error, says):
    with pytest.raises(error, match=says):
        read_wavelength(given)


def test_an_angle_beyond_ninety_degrees():
    says = "reflection 008: the substrate has no angle at 0.154059 nm, the sine would be 1.090"
    with pytest.raises(StackError, match=says):
        pattern(GROUP, "008")
    with pytest.raises(StackError, match=r"the zero order has no angle.*take a lower reflection"):
        # the substrate just below 90 degrees, the layers pressed flat just beyond
        pattern("9 x (8 nm GaAs0.9P0.1, 2 nm GaAs)", "004", "0.2826 nm")


@pytest.mark.parametrize("orders", [-1, 1.5, True, "3"])
def test_orders(orders):
    with pytest.raises(StackError, match=r"^orders: got .*; a whole number from 0 is due"):
        pattern(orders=orders)


def test_stacks_without_a_lattice():
    own = "9 nm {edge 200 meV, mass 0.1, label mine}"
    with pytest.raises(StackError, match=r"^substrate: missing"):
        pattern(substrate=None)
    with pytest.raises(StackError, match=r"^no layer of a material"):
        pattern(own)
    stack = bw.parse_line(f"4 nm GaAs, 3 x (5 nm GaAs, {own})", substrate="GaAs", zero="GaAs")
    with pytest.raises(StackError, match=r"^mine: own numbers.*every layer of the repeated group"):
        xray_pattern(stack)
    stack = bw.parse_line(f"4 nm GaAs, {own}", substrate="GaAs", zero="GaAs")
    with pytest.raises(StackError, match=r"^mine: own numbers, so no lattice.*of the stack"):
        xray_pattern(stack)
    stack = bw.parse_line(f"{own}, 3 x (5 nm GaAs, 5 nm AlAs)", substrate="GaAs", zero="GaAs")
    assert xray_pattern(stack).period_nm == 10.0  # outside the period it does no harm


def test_text_and_html_say_that_positions_are_kinematic():
    found = pattern()
    for page in (str(found), found._repr_html_()):
        flat = " ".join(unescape(page).split())
        assert "kinematic positions, where Bragg's law puts them: no refraction" in flat
        assert "20 nm (20 times): layer 2 (In0.1Ga0.9As) + layer 3 (GaAs)" in flat
        assert "0 0 4, Cu K-alpha1, 0.1540593 nm" in flat
