"""Strain of whole stacks: by hand, by closed forms, and what is said of it."""

import numpy as np
import pytest

import bandwright as bw
from bandwright.errors import StackError, UnknownName
from bandwright.materials import Library
from bandwright.mismatch import groups_of, mismatches

# Lattice constants [nm] and C11, C12 [GPa] of Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001),
# from memory, linear in x; written out here so that nothing below rests on the material files.
A_GAAS, A_INAS, A_GAP = 0.565325, 0.60583, 0.54505
C_GAAS, C_INAS, C_GAP = np.array([122.1, 56.6]), np.array([83.29, 45.26]), np.array([140.5, 62.03])
WELL = "20 nm GaAs, {} nm In0.2Ga0.8As, 20 nm GaAs"


def on_gaas(line, **more):
    return mismatches(bw.parse_line(line, substrate="GaAs", **more))


def ingaas(x):
    return A_GAAS + x * (A_INAS - A_GAAS), C_GAAS + x * (C_INAS - C_GAAS)


def gaasp(p):
    return A_GAAS + p * (A_GAP - A_GAAS), C_GAAS + p * (C_GAP - C_GAAS)


def stiffness(c):
    return c[0] + c[1] - 2.0 * c[1] ** 2 / c[0]


def test_one_layer_by_hand():
    found = on_gaas(WELL.format(8))
    a, c = ingaas(0.2)
    exx = (A_GAAS - a) / a
    ezz = -2.0 * c[1] / c[0] * exx
    stress = c[0] * exx + c[1] * (exx + ezz)  # Hooke's law, eyy = exx
    row = found.table.loc["layer 2 (In0.2Ga0.8As)"]
    assert row["mismatch_percent"] == pytest.approx(1.432981029, rel=1e-9)
    assert row["stress_GPa"] == pytest.approx(stress, rel=1e-12)
    assert found.mean_mismatch == pytest.approx(8.0 / 48.0 * 0.01432981029, rel=1e-9)
    mean = stress * 8.0 / a / (40.0 / A_GAAS + 8.0 / a)
    assert found.mean_stress_GPa == pytest.approx(mean, rel=1e-12)
    assert list(found.table["case"]) == ["single layer", "single layer", "free surface"]


# Fixed point of Matthews and Blakeslee's equation (J. Cryst. Growth 27, 118, 1974) for
# In0.2Ga0.8As on GaAs, with numbers as above: 4 pi, 8 pi, and 2 pi against GaAs.
def test_critical_thickness_of_a_buried_a_free_and_a_repeated_layer():
    buried = on_gaas(WELL.format(8)).table["critical_thickness_nm"].iloc[1]
    free = on_gaas("20 nm GaAs, 8 nm In0.2Ga0.8As").table["critical_thickness_nm"].iloc[1]
    repeated = on_gaas("3 x (8 nm In0.2Ga0.8As, 8 nm GaAs)").table["critical_in_group_nm"].iloc[0]
    print(buried, free, repeated)
    assert buried == pytest.approx(14.08631323, rel=1e-9)
    assert free == pytest.approx(5.62630551, rel=1e-9)
    assert repeated == pytest.approx(33.527662, rel=1e-8)


def test_a_matched_layer_has_no_critical_thickness_and_an_unrepeated_one_none_in_a_group():
    table = on_gaas(WELL.format(8)).table
    assert table["critical_thickness_nm"].iloc[0] == np.inf
    assert table["critical_in_group_nm"].isna().all()


def test_a_group_is_judged_by_its_innermost_repeat():
    found = on_gaas("2 x (30 nm Al0.3Ga0.7As, 3 x (8 nm In0.2Ga0.8As, 8 nm GaAs))")
    table = found.table
    assert table["critical_in_group_nm"].iloc[1] == pytest.approx(33.527662, rel=1e-8)
    inner, outer = groups_of(found.stack, found.films)
    assert (inner.times, inner.members, inner.thickness) == (3, ((1, 1), (2, 1)), 16.0)
    assert (outer.times, outer.members, outer.thickness) == (2, ((0, 1), (1, 3), (2, 3)), 78.0)
    alone = on_gaas("3 x (8 nm In0.2Ga0.8As)").table
    assert alone["critical_in_group_nm"].isna().all()  # a layer repeated has no neighbour


def test_repeats_are_the_layers_written_out():
    short = on_gaas("10 nm GaAs, 4 x (6 nm In0.1Ga0.9As, 9 nm GaAs0.9P0.1), 5 nm GaAs")
    pair = "6 nm In0.1Ga0.9As, 9 nm GaAs0.9P0.1, "
    long = on_gaas("10 nm GaAs, " + 4 * pair + "5 nm GaAs")
    assert short.mean_mismatch == pytest.approx(long.mean_mismatch, rel=1e-13)
    assert short.mean_stress_GPa == pytest.approx(long.mean_stress_GPa, rel=1e-13)
    assert short.thickness_nm == pytest.approx(75.0)
    assert short.whole.thickness == pytest.approx(60.0)
    assert short.whole.limit == pytest.approx(long.whole.limit, rel=1e-12)
    assert list(short.table["copies"]) == [1, 4, 4, 1]


def test_the_whole_as_one_film():
    found = on_gaas("30 nm GaAs, 12 x (8 nm In0.2Ga0.8As, 8 nm GaAs), 30 nm GaAs")
    whole = found.whole
    assert whole.thickness == pytest.approx(12 * 16 - 8)  # from the first to the last strained one
    a, c = ingaas(0.2)  # the mean misfit, weighted with t A/a^2
    wells, rest = 96.0 * stiffness(c) / a**2, 88.0 * stiffness(C_GAAS) / A_GAAS**2
    assert whole.misfit == pytest.approx(0.01432981029 * wells / (wells + rest), rel=1e-9)
    assert whole.case == "single layer" and whole.limit < whole.thickness
    assert "though no layer alone is" in " ".join(found.cautions)
    assert on_gaas("30 nm GaAs, 8 nm In0.2Ga0.8As").whole.case == "free surface"
    assert on_gaas("30 nm GaAs, 8 nm Al0.3Ga0.7As").whole is None


def test_levels_and_strain_say_the_same_of_a_layer_that_is_too_thick():
    stack = bw.parse_line(WELL.format(16), substrate="GaAs")
    with pytest.warns(bw.BandwrightWarning):
        levels = bw.solve(stack, at_most=1)
    (text,) = [c for c in mismatches(stack).cautions if "critical" in c]
    assert "16 nm with a misfit of +1.43% is beyond" in text
    assert text in levels.cautions


def test_levels_and_strain_say_the_same_of_a_whole_that_is_too_thick_or_balanced():
    stack = bw.parse_line(
        "30 nm GaAs, 20 x (8 nm In0.2Ga0.8As, 10 nm GaAs0.9P0.1 {label barrier}), 30 nm GaAs",
        substrate="GaAs",
    )
    found = mismatches(stack)
    with pytest.warns(bw.BandwrightWarning):
        levels = bw.solve(stack, at_most=1)
        balanced = bw.solve(found.balanced("barrier.thickness").stack, at_most=1)
    (text,) = [c for c in found.cautions if "critical" in c]
    assert "though no layer alone is" in text and text in levels.cautions
    assert not any("critical" in c for c in balanced.cautions)


# -- grades -----------------------------------------------------------------------------------


def graded(x):
    layer = bw.Layer("8 nm", "InxGa1-xAs", x=x, label="grade")
    return mismatches(bw.Stack([bw.Layer("9 nm", "GaAs"), layer], substrate="GaAs"))


STEP = (A_INAS - A_GAAS) / A_GAAS


def test_a_linear_grade_by_its_mean_and_worst():
    row = graded((0.0, 0.2)).table.loc["grade"]
    assert row["mismatch_percent"] == pytest.approx(10.0 * STEP, rel=1e-12)
    assert row["worst_mismatch_percent"] == pytest.approx(20.0 * STEP, rel=1e-12)
    assert row["critical_thickness_nm"] == pytest.approx(5.62630551, rel=1e-9)


def test_a_table_of_points():
    row = graded([("0 nm", 0.0), ("2 nm", 0.2), ("8 nm", 0.1)]).table.loc["grade"]
    assert row["mismatch_percent"] == pytest.approx(100.0 * STEP * (0.1 * 2 + 0.15 * 6) / 8)
    assert row["worst_mismatch_percent"] == pytest.approx(20.0 * STEP, rel=1e-12)


def test_a_quadratic_grade_is_flat_where_the_edge_is_lower():
    layer = bw.Layer("8 nm", "InxGa1-xAs", x=(0.0, 0.2), grading="quadratic", label="grade")
    row = mismatches(bw.Stack([layer], substrate="GaAs")).table.loc["grade"]
    # the edge is lower at the last face: x = 0.2 - 0.2 (1 - p)^2, whose mean is 0.2 (1 - 1/3)
    assert row["mismatch_percent"] == pytest.approx(100.0 * STEP * 0.2 * 2.0 / 3.0, rel=1e-12)


def test_a_callable():
    row = graded(lambda z: 0.1 * (1.0 - np.cos(2.0 * np.pi * z / 8.0))).table.loc["grade"]
    assert row["mismatch_percent"] == pytest.approx(10.0 * STEP, rel=1e-9)
    assert row["worst_mismatch_percent"] == pytest.approx(20.0 * STEP, rel=1e-2)


def test_the_stress_of_a_grade_is_that_of_many_thin_layers():
    n = 400
    slices = [bw.Layer(f"{8 / n!r} nm", f"In{x:.6f}Ga{1 - x:.6f}As")
              for x in 0.2 * (np.arange(n) + 0.5) / n]  # fmt: skip
    many = mismatches(bw.Stack([bw.Layer("9 nm", "GaAs"), *slices], substrate="GaAs"))
    assert graded((0.0, 0.2)).mean_stress_GPa == pytest.approx(many.mean_stress_GPa, rel=1e-5)


def test_a_grade_is_said_to_be_judged_where_it_is_farthest_off():
    (text,) = [c for c in graded((0.0, 0.05)).cautions if "graded" in c]
    assert text.startswith("grade: graded; mismatch and stress are means")


def test_monolayers_are_those_of_the_strained_film():
    found = on_gaas("20 nm GaAs, 10 ML In0.2Ga0.8As")
    a, c = ingaas(0.2)
    height = 0.5 * a * (1.0 - 2.0 * c[1] / c[0] * (A_GAAS - a) / a)
    assert found.table["thickness_nm"].iloc[1] == pytest.approx(10.0 * height, rel=1e-12)


# -- own numbers ------------------------------------------------------------------------------

OWN = "9 nm {edge 200 meV, mass 0.1, label mine}"


def test_own_numbers_have_no_lattice_and_are_left_out_and_said():
    found = on_gaas(f"20 nm GaAs, {OWN}, 8 nm In0.2Ga0.8As", zero="GaAs")
    bare = on_gaas("20 nm GaAs, 8 nm In0.2Ga0.8As")
    assert found.mean_mismatch == bare.mean_mismatch
    assert found.mean_stress_GPa == bare.mean_stress_GPa
    assert list(found.table.index) == ["layer 1 (GaAs)", "layer 3 (In0.2Ga0.8As)"]
    assert found.left_out == ("mine",) and found.whole is None
    assert any(c.startswith("mine: own numbers, so no lattice; left out") for c in found.cautions)
    assert "not taken as one film: a layer has no lattice" in str(found)


# -- balance ----------------------------------------------------------------------------------

PAIR = "20 x (8 nm In0.2Ga0.8As {label well}, 10 nm GaAs0.9P0.1 {label barrier})"


def test_the_thickness_that_balances_two_layers_by_its_closed_form():
    # t1 A1 e1 a2 + t2 A2 e2 a1 = 0: N. J. Ekins-Daukes, K. Kawaguchi, J. Zhang, Cryst. Growth
    # Des. 2, 287 (2002), from memory
    (a1, c1), (a2, c2) = ingaas(0.2), gaasp(0.1)
    e1, e2 = (A_GAAS - a1) / a1, (A_GAAS - a2) / a2
    due = -8.0 * stiffness(c1) * e1 * a2 / (stiffness(c2) * e2 * a1)
    balance = on_gaas(PAIR).balanced("barrier.thickness")
    assert balance.after == pytest.approx(due, rel=1e-11)
    assert (balance.before, balance.unit) == (10.0, "nm")
    assert balance.change == pytest.approx(due - 10.0, rel=1e-11)
    after = mismatches(balance.stack)
    assert abs(after.mean_stress_GPa) < 1e-12
    assert abs(after.whole.misfit) < 1e-12 and after.cautions == ()


def test_the_substrate_on_which_two_layers_are_balanced_by_its_closed_form():
    # a0 = (A1 t1 a1 a2^2 + A2 t2 a2 a1^2)/(A1 t1 a2^2 + A2 t2 a1^2), same source
    (a1, c1), (a2, c2) = ingaas(0.2), gaasp(0.1)
    w1, w2 = 8.0 * stiffness(c1) * a2**2, 10.0 * stiffness(c2) * a1**2
    a0 = (w1 * a1 + w2 * a2) / (w1 + w2)
    x = (a0 - A_GAAS) / (A_INAS - A_GAAS)
    found = mismatches(bw.parse_line(PAIR, substrate=f"In{x:.15f}Ga{1 - x:.15f}As"))
    assert abs(found.mean_stress_GPa) < 1e-11
    assert mismatches(bw.parse_line(PAIR, substrate="In0.06Ga0.94As")).mean_stress_GPa != 0.0


@pytest.mark.parametrize("name", ["well.composition", "barrier.composition", "well.thickness",
                                  "layer 1.composition", "layer 2.thickness"])  # fmt: skip
def test_every_way_to_balance_does(name):
    balance = on_gaas(PAIR).balanced(name)
    assert abs(mismatches(balance.stack).mean_stress_GPa) < 1e-12
    assert balance.change != 0.0


def test_a_composition_that_balances_by_hand():
    # equal thickness: A1 e1/a1 of In0.1Ga0.9As against GaAs1-pPp, bisected on p
    def force(p):
        (a1, c1), (a2, c2) = ingaas(0.1), gaasp(p)
        return stiffness(c1) * (A_GAAS - a1) / a1**2 + stiffness(c2) * (A_GAAS - a2) / a2**2

    low, high = 0.0, 1.0
    for _ in range(60):
        p = 0.5 * (low + high)
        low, high = (p, high) if force(p) < 0.0 else (low, p)
    line = "5 x (6 nm In0.1Ga0.9As, 6 nm GaAs0.9P0.1 {label barrier})"
    found = on_gaas(line).balanced("barrier.composition")
    assert found.after == pytest.approx(1.0 - p, rel=1e-11)  # of As, the first of its sublattice


def test_a_grade_and_monolayers_balance_too():
    line = "5 x (20 ML In0.1Ga0.9As {label well}, 9 nm GaAsxP1-x {x 1 to 0.8, label barrier})"
    found = on_gaas(line)
    for name in ("well.thickness", "barrier.x_last", "barrier.x_shift"):
        balance = found.balanced(name)
        assert abs(mismatches(balance.stack).mean_stress_GPa) < 1e-11
    assert found.balanced("well.thickness").unit == "ML"


# -- mistakes ---------------------------------------------------------------------------------


def test_no_substrate():
    with pytest.raises(StackError, match=r"^substrate: missing; strain counts from it: name it"):
        mismatches(bw.parse_line(WELL.format(8)))


def test_an_unknown_substrate():
    with pytest.raises(bw.BandwrightError, match=r"^substrate: .*'Gas'"):
        mismatches(bw.parse_line(WELL.format(8), substrate="Gas"))


def test_no_layer_of_a_material():
    with pytest.raises(StackError, match=r"^no layer of a material: own numbers have no lattice"):
        on_gaas(OWN)


def test_a_material_that_lacks_a_number_names_its_layer():
    with pytest.raises(bw.BandwrightError, match=r"^layer 2 \(GaN\): .*GaN"):
        on_gaas("5 nm GaAs, 5 nm GaN")


@pytest.mark.parametrize(
    ("name", "error", "says"),
    [
        ("temperature", StackError, "temperature: a temperature balances no strain; name a layer"),
        ("flux In", StackError, "flux In: a flux balances no strain"),
        ("well.thicknes", UnknownName, "did you mean 'thickness'"),
        ("cap.thickness", StackError, "cap.thickness: it has no strain, so no thickness of it"),
        ("mine.thickness", StackError, "mine.thickness: it has no strain"),
        ("well.thickness", StackError, "well.thickness: no thickness of it .* strained alike"),
        ("well.composition", StackError,
         "well.composition: no composition of it .* stays pressed together all the way"),
    ],
)  # fmt: skip
def test_what_balances_nothing(name, error, says):
    line = ("5 nm In0.2Ga0.8As {label well}, 50 nm In0.1Ga0.9As, 9 nm GaAs {label cap},"
            " 9 nm {edge 200 meV, mass 0.1, label mine}")  # fmt: skip
    with pytest.raises(error, match=says):
        on_gaas(line, zero="cap").balanced(name)


def test_nothing_is_left_to_balance_one_strained_layer():
    with pytest.raises(StackError, match="the other layers together are without stress"):
        on_gaas(WELL.format(8)).balanced("layer 2.thickness")


def test_a_composition_that_stays_stretched():
    with pytest.raises(StackError, match="the stack stays stretched all the way"):
        on_gaas("500 nm GaAs0.5P0.5, 1 nm In0.2Ga0.8As").balanced("layer 2.composition")


# -- what a reader sees -----------------------------------------------------------------------


def test_text_and_html_name_the_three_prefactors_and_the_means():
    found = on_gaas(PAIR, name="invented")
    for page in (str(found), found._repr_html_()):
        flat = " ".join(page.split())
        assert "K = 8 pi for a free surface, 4 pi for a single layer between others, 2 pi" in flat
        assert "stress in the plane -0.4" in flat or "pressed together" in flat
        assert "beyond the critical thickness" in flat
    assert "balanced" in str(mismatches(found.balanced("barrier.thickness").stack))


def test_the_library_gives_the_elastic_constants_of_a_composition():
    c11, c12 = Library.shipped().stiffness("In0.2Ga0.8As")
    assert [c11, c12] == pytest.approx(ingaas(0.2)[1], rel=1e-14)
