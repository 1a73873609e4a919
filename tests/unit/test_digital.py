"""Digital alloys: whole monolayers, what they hold, and what both solutions say of them."""

import time
import warnings

import numpy as np
import pytest

import bandwright as bw
from bandwright.constants import H2M
from bandwright.digital.cells import pulses_of
from bandwright.digital.ends import Amounts, binaries
from bandwright.errors import MaterialError, StackError, UnknownName

GRADE = "15 nm Al0.3Ga0.7As, {} AlxGa1-xAs {{x {}, label grade}}, 5 nm GaAs, 15 nm Al0.3Ga0.7As"
SHARES = {
    "flat": lambda p: 0.3 + 0.0 * p,
    "up": lambda p: p,
    "parabola": lambda p: (2.0 * p - 1.0) ** 2,
    "wave": lambda p: 0.5 - 0.5 * np.cos(20.0 * p),
    "rare": lambda p: 0.01 + 0.0 * p,
}


def graded(thickness="12 nm", x="0.3 to 0", **more):
    return bw.parse_line(GRADE.format(thickness, x), **{"substrate": "GaAs", **more})


def content(digital, element):
    table = digital.content
    return table[table["element"] == element].iloc[0]


# -- pulses ---------------------------------------------------------------------------------


def along(share, total, panels=4000):
    """Amounts of a share, by the trapezoid rule on panels of its own."""
    n = np.linspace(0.0, total, panels + 1)
    second = np.concatenate([[0.0], np.cumsum(np.diff(n) * _middles(share(n / total)))])
    moment = np.concatenate([[0.0], np.cumsum(np.diff(n) * _middles(second))])
    return Amounts(n, second, moment)


def _middles(values):
    return (values[1:] + values[:-1]) / 2.0


@pytest.mark.parametrize("period", [2, 3, 7, 20])
@pytest.mark.parametrize("total", [40.0, 61.37, 5.5])
@pytest.mark.parametrize("name", SHARES)
def test_either_end_stays_within_half_a_monolayer(name, total, period):
    amounts = along(SHARES[name], total)
    pulses = pulses_of(amounts, period)
    assert all(pulse.monolayers > 0 for pulse in pulses)
    assert all(a.second != b.second for a, b in zip(pulses, pulses[1:], strict=False))
    grown = [pulse.second for pulse in pulses for _ in range(pulse.monolayers)]
    second = np.concatenate([[0], np.cumsum(grown)])
    ends = [*range(0, int(total) + 1, period)]
    for end in ends:
        asked = np.interp(end, amounts.grown, amounts.second)
        assert abs(second[end] - asked) <= 0.5 + 1e-6
        assert abs(end - second[end] - (end - asked)) <= 0.5 + 1e-6
    assert abs(second[-1] - amounts.second[-1]) <= 0.5 + 1e-6
    assert abs(len(grown) - second[-1] - (total - amounts.second[-1])) <= 0.5 + 1e-6


def test_the_mean_is_reached_in_the_limit():
    # 0.3 of n monolayers, rounded once for all cells: off by less than 0.5/n
    for n in (10, 100, 1000):
        pulses = pulses_of(along(SHARES["flat"], float(n)), 6)
        second = sum(pulse.monolayers for pulse in pulses if pulse.second)
        assert abs(second / n - 0.3) <= 0.5 / n


def test_pulses_neither_lead_nor_lag():
    # a quarter: two of eight monolayers, in the middle of each cell
    pulses = pulses_of(along(lambda p: 0.25 + 0.0 * p, 24.0), 8)
    assert [tuple(p) for p in pulses] == [
        (False, 3), (True, 2), (False, 6), (True, 2), (False, 6), (True, 2), (False, 3)
    ]  # fmt: skip
    # in a rising grade it comes late: from 0 to 1 the middle of the amount is at two thirds
    pulses = pulses_of(along(SHARES["up"], 12.0), 12)
    assert [tuple(p) for p in pulses] == [(False, 5), (True, 6), (False, 1)]


# -- stacks ---------------------------------------------------------------------------------


def test_pulses_are_layers_of_whole_monolayers():
    digital = bw.digital_alloy(graded(), "grade", period=6)
    layers = digital.stack.layers
    assert [layers[0], *layers[-2:]] == [graded().layers[0], *graded().layers[-2:]]
    pulses = [(layer.material, layer.thickness) for layer in layers[1:-2]]
    table = digital.table
    assert pulses == [
        (material, (float(n), "ML"))
        for material, n in zip(table["material"], table["monolayers"], strict=True)
    ]
    facts = digital.shifts.grown.profile.facts
    assert table["thickness_nm"].tolist() == pytest.approx([f.thickness for f in facts[1:-2]])
    (row,) = digital.thickness.itertuples()
    assert row.grown_nm == pytest.approx(table["thickness_nm"].sum(), rel=1e-12)
    assert (row.asked_nm, row.pulses) == (12.0, len(table))


def test_content_by_hand():
    # 12 nm from 0.3 to 0 without a substrate: a(x) = 0.565325 + 0.000785 x (material files), so
    # the monolayers are 2 L ln(a1/a0)/(a1 - a0), and of Al the integral of x/(a/2)
    a0, a1 = 0.565325, 0.565325 + 0.3 * 0.000785
    total = 2.0 * 12.0 * np.log(a1 / a0) / (a1 - a0)
    aluminium = (2.0 * 12.0 - a0 * total) / 0.000785
    digital = bw.digital_alloy(graded(substrate=None), "grade", period=5)
    assert content(digital, "As").asked_ML == pytest.approx(total, rel=1e-9)
    assert content(digital, "Al").asked_ML == pytest.approx(aluminium, rel=1e-6)
    for element in ("Al", "Ga"):
        row = content(digital, element)
        assert abs(row.difference_ML) <= 0.5 and row.grown_ML == round(row.grown_ML)
        assert row.difference_ML == pytest.approx(row.grown_ML - row.asked_ML, abs=1e-12)
    assert any("no substrate" in text for text in digital.cautions)


def test_a_thickness_in_monolayers_a_table_and_a_callable():
    in_ml = bw.digital_alloy(graded("42 ML"), "grade")
    assert in_ml.thickness["grown_ML"].tolist() == [42]

    def tables(x):
        layer = bw.Layer("12 nm", "AlxGa1-xAs", x=x, label="grade")
        stack = bw.Stack([*graded().layers[:1], layer, *graded().layers[2:]], substrate="GaAs")
        return bw.digital_alloy(stack).table["monolayers"].tolist()

    straight = bw.digital_alloy(graded("12 nm", "0.3 to 0")).table["monolayers"].tolist()
    points = [("0 nm", 0.3), ("4 nm", 0.2), ("12 nm", 0.0)]
    assert tables(points) == tables(lambda z: 0.3 - 0.025 * z) == straight


def test_letters_and_formulas_are_the_same_alloy():
    letters, literal = (
        bw.digital_alloy(bw.parse_line(f"9 nm GaAs, 8 nm {text}, 9 nm GaAs", substrate="GaAs"),
                         at_most=1)
        for text in ("AlxGa1-xAs {x 0.2}", "Al0.2Ga0.8As")
    )  # fmt: skip
    assert letters.stack == literal.stack


def test_copies_of_a_group_stay_a_group():
    line = "20 nm Al0.3Ga0.7As, 3 x (6 nm GaAs, 3 nm Al0.3Ga0.7As {label b}), 20 nm Al0.3Ga0.7As"
    stack = bw.parse_line(line, substrate="GaAs")
    digital = bw.digital_alloy(stack, "b", period=4)
    group = digital.stack.layers[1]
    assert isinstance(group, bw.Repeat) and group.times == 3
    assert digital.thickness["copies"].tolist() == [3]
    assert len(digital.stack.grown()) == 2 + 3 * len(group.layers)
    assert len(group.layers) == 1 + len(digital.table)
    assert digital.shifts.levels["overlap"].min() > 0.9


def test_names_numbers_and_what_is_chosen_without_any():
    stack = graded()
    assert bw.digital_alloy(stack).stack == bw.digital_alloy(stack, ["layer 2"]).stack
    flat = bw.parse_line("9 nm Al0.3Ga0.7As, 6 nm GaAs, 9 nm Al0.3Ga0.7As", substrate="GaAs")
    assert [one.number for one in bw.digital_alloy(flat).layers] == [1, 3]


def test_field_and_doping_go_on_and_what_is_of_the_first_face_stays_there():
    layer = bw.Layer("6 nm", "Al0.25Ga0.75As", label="b", field="3 kV/cm", donors="2e11 / cm^2",
                     acceptors="1e17 / cm^3", interface_width="0.1 nm",
                     delta_donors="3e11 / cm^2")  # fmt: skip
    stack = bw.Stack([bw.Layer("9 nm", "GaAs"), layer, bw.Layer("9 nm", "GaAs")],
                     substrate="GaAs", ends="wall")  # fmt: skip
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", bw.BandwrightWarning)
        made = bw.digital_alloy(stack, "b", at_most=2).stack.layers[1:-1]
    assert sum(one.donors.value for one in made) == pytest.approx(layer.donors.value, rel=1e-12)
    assert {one.acceptors for one in made} == {layer.acceptors}
    assert {one.field for one in made} == {layer.field}
    assert [one.interface_width for one in made] == [0.1] + [None] * (len(made) - 1)
    assert [one.delta_donors for one in made] == [layer.delta_donors] + [None] * (len(made) - 1)
    assert {one.label for one in made} == {None}


def test_two_compositions_as_ends():
    digital = bw.digital_alloy(graded(), "grade", between=("GaAs", "Al0.4Ga0.6As"), period=8)
    assert set(digital.table["material"]) == {"GaAs", "Al0.4Ga0.6As"}
    assert abs(content(digital, "Al").difference_ML) <= 0.5 * 0.4
    quaternary = bw.parse_line(
        "9 nm In0.52Al0.48As, 6 nm In0.53Al0.2Ga0.27As {label q}, 9 nm In0.52Al0.48As",
        substrate="InP",
    )
    ends = ("In0.53Al0.47As", "In0.53Ga0.47As")
    made = bw.digital_alloy(quaternary, "q", between=ends)
    assert {"Al", "Ga", "In", "As"} == set(made.content["element"])
    assert abs(content(made, "Al").difference_ML) <= 0.5 * 0.47


def test_anions_mix_as_well():
    assert binaries("GaAs0.9P0.1") == ("GaP", "GaAs")
    stack = bw.parse_line("9 nm GaAs, 6 nm GaAs0.9P0.1, 9 nm GaAs", substrate="GaAs", ends="wall")
    assert set(bw.digital_alloy(stack, at_most=2).table["material"]) == {"GaAs", "GaP"}


# -- levels ---------------------------------------------------------------------------------

LINEAR = """
[sources]
ours = "invented for a test"

[binary.{0}]
conduction_edge = "valence offset"
valence_offset = {{ value = "-0.8 eV", source = "ours" }}
gap = {{ value = "{1} eV", valid = ["0 K", "400 K"], source = "ours" }}
mass = {{ value = 0.067, at = "0 K", source = "ours" }}
lattice = {{ value = "5.6533 Å", at = "300 K", source = "ours" }}
"""
#: height of a monolayer [nm], and step of the edge from GaAs to AlAs [eV] in LINEAR
HEIGHT, STEP = 0.282665, 1.0


@pytest.fixture
def linear(tmp_path):
    """Return a material file in which edges mix linearly, and masses are alike."""
    path = tmp_path / "linear.toml"
    sources, *rest = LINEAR.partition("[binary")
    text = sources + "".join(
        "".join(rest).format(name, gap) for name, gap in (("GaAs", 1.4), ("AlAs", 1.4 + STEP))
    )
    text += '[alloy.AlxGa1-xAs]\ngap = { bowing = "0 eV", source = "ours" }\n'
    path.write_text(text, encoding="utf-8")
    return path


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
def test_a_ternary_tends_to_its_level_by_the_closed_form_of_fast_ripples(linear):
    # An edge that ripples as a square wave of +-step/2 and the wavelength w lowers a slow state, to
    # second order, by 2 sum |V_k|^2/E_k over odd k, V_k = step/(pi k), E_k = (H2M/m)(2 pi k/w)^2;
    # as sum 1/k^4 = pi^4/96, that is step^2 w^2/(192 H2M/m).
    barrier = bw.Layer("35 ML", "Al0.8Ga0.2As")
    stack = bw.Stack([barrier, bw.Layer("40 ML", "Al0.5Ga0.5As", label="w"), barrier],
                     materials=linear, bands="one-band", zero="GaAs")  # fmt: skip
    shifts = {}
    for period in (8, 4, 2):
        found = bw.digital_alloy(stack, "w", period=period)
        shifts[period] = found.shifts.levels["shift_meV"].iloc[0]
        closed = -1e3 * STEP**2 * (period * HEIGHT) ** 2 / (192.0 * H2M / 0.067)
        print(period, shifts[period], closed)
        assert content(found, "Al").difference_ML == pytest.approx(0.0, abs=1e-9)
        assert found.shifts.levels["overlap"].iloc[0] == pytest.approx(1.0, abs=0.01)
        # the faces of the well, where the first and the last pulse lie, add a tenth
        assert shifts[period] == pytest.approx(closed, rel=0.12)
    assert abs(shifts[2]) < 4.0


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
def test_a_parabolic_well_keeps_its_steps_the_better_the_shorter_the_cells(linear):
    half, depth = 60.0, 0.3
    barrier = bw.Layer("5 nm", "Al0.3Ga0.7As")
    x = {"grading": "quadratic"}
    stack = bw.Stack(
        [barrier, bw.Layer(f"{half} nm", "AlxGa1-xAs", x=(0.3, 0.0), **x),
         bw.Layer(f"{half} nm", "AlxGa1-xAs", x=(0.0, 0.3), **x), barrier],
        materials=linear, bands="one-band", zero="GaAs",
    )  # fmt: skip
    quantum = 2.0 * np.sqrt(H2M / 0.067 * depth) / half  # V = depth (z/half)^2
    worst = []
    for period in (48, 24, 12, 6, 3):
        found = bw.digital_alloy(stack, period=period, between=("GaAs", "Al0.3Ga0.7As"),
                                 below="0.1 eV").shifts  # fmt: skip
        designed = found.designed.energies[:5]
        assert np.diff(designed) == pytest.approx(quantum, rel=1e-3)
        steps = np.diff(found.grown.energies[:5])
        worst.append(np.abs(steps / quantum - 1.0).max())
        print(period, worst[-1])
        assert worst[-1] < 0.15 + 0.01 * period  # whole monolayers leave the constant part
    assert worst == sorted(worst, reverse=True)


def test_shifts_are_those_of_two_solutions():
    digital = bw.digital_alloy(graded(zero="GaAs"), "grade")
    before, after = bw.solve(graded(zero="GaAs")), bw.solve(digital.stack)
    table = digital.shifts.levels
    assert table["energy_meV"].to_numpy() == pytest.approx(1e3 * before.energies, abs=1e-6)
    assert table["digital_meV"].to_numpy() == pytest.approx(1e3 * after.energies, abs=1e-3)
    assert table["digital_level"].tolist() == [1, 2, 3]
    line = digital.shifts.lines.set_index(["upper", "lower"]).loc[(2, 1)]
    lengths = [
        levels.lines().table.set_index(["upper", "lower"]).loc[(2, 1), "wavelength_um"]
        for levels in (before, after)
    ]
    assert [line["wavelength_um"], line["digital_um"]] == pytest.approx(lengths, rel=1e-6)
    assert line["shift_um"] == pytest.approx(lengths[1] - lengths[0], abs=1e-6)
    assert line["shift_meV"] == pytest.approx(
        1e3 * (np.diff(after.energies[:2]) - np.diff(before.energies[:2]))[0], abs=1e-3
    )


@pytest.mark.parametrize("zero", [None, "grade", "AlAs"])
def test_shifts_do_not_hang_on_zero(zero):
    # the lowest edge, and that of the layer itself, are others in pulses: shifts count that in
    line = "12 nm Al0.4Ga0.6As, 9 nm Al0.1Ga0.9As {label grade}, 12 nm Al0.4Ga0.6As"
    one, two = (
        bw.digital_alloy(bw.parse_line(line, substrate="GaAs", zero=which), "grade")
        for which in (zero, "GaAs")
    )
    shifts = [digital.shifts.levels["shift_meV"].to_numpy() for digital in (one, two)]
    assert shifts[0] == pytest.approx(shifts[1], abs=1e-2) and np.abs(shifts[0]).max() > 1.0
    assert one.stack.zero == ("GaAs" if zero == "grade" else zero)
    assert any("label of a layer that became pulses" in t for t in one.cautions) == (
        zero == "grade"
    )


def test_in_a_field_with_walls_for_open_ends_and_in_both_models():
    for bands in ("one-band", "two-band"):
        stack = graded(field="20 kV/cm", electrons_run="to surface", bands=bands)
        shifts = bw.digital_alloy(stack, "grade", period=4, at_most=3).shifts
        assert shifts.designed.profile.bands == shifts.grown.profile.bands == bands
        assert shifts.designed.boxed.all() and shifts.grown.boxed.all()
        assert shifts.levels["overlap"].iloc[0] > 0.95


def test_a_layer_that_is_one_of_the_ends_is_one_pulse_and_shifts_nothing():
    stack = bw.parse_line("9 nm Al0.3Ga0.7As, 24 ML GaAs {label w}, 9 nm Al0.3Ga0.7As",
                          substrate="GaAs")  # fmt: skip
    shifts = bw.digital_alloy(stack, "w", between=("GaAs", "AlAs")).shifts
    assert shifts.overlaps == pytest.approx(np.eye(len(shifts.partners)), abs=1e-5)
    assert shifts.levels["shift_meV"].to_numpy() == pytest.approx(0.0, abs=1e-3)


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
def test_levels_that_are_lost_are_said():
    digital = bw.digital_alloy(graded("12 nm", "0.3 to 0"), "grade", period=42)
    lost = digital.shifts.levels["digital_level"].isna()
    assert lost.any()
    assert any("is not found again" in text for text in digital.cautions)
    lines = digital.shifts.lines
    gone = set(lost.index[lost])
    for row in lines.itertuples():
        assert np.isnan(row.digital_um) == bool(gone & {row.upper, row.lower})


def test_no_level_no_shift():
    stack = bw.parse_line("9 nm GaAs, 6 nm Al0.2Ga0.8As {label b}, 9 nm GaAs", substrate="GaAs")
    with pytest.warns(bw.BandwrightWarning):
        digital = bw.digital_alloy(stack)
    assert len(digital.shifts.levels) == len(digital.shifts.lines) == 0
    assert "level" not in str(digital).split("solved")[0]


def test_cautions_say_that_pulses_are_thin_and_aluminium_arsenide_is_indirect():
    digital = bw.digital_alloy(graded(), "grade")
    thin, indirect = digital.cautions
    assert "AlAs (from 1 ML)" in thin and "an effective mass is not made for" in thin
    assert indirect.startswith("AlAs: the lowest conduction edge is not at the zone centre")


def test_an_open_end_that_goes_on_as_a_pulse_is_said():
    line = "8 nm Al0.3Ga0.7As {label b}, 6 nm GaAs, 9 nm Al0.3Ga0.7As"

    def said(names, **more):
        digital = bw.digital_alloy(bw.parse_line(line, substrate="GaAs", **more), names)
        return [text for text in digital.cautions if text.startswith("outermost")]

    (text,) = said("b")
    assert "outermost: b (now GaAs); an open end goes on as its last pulse" in text
    assert "b (now GaAs), layer 3 (Al0.3Ga0.7As) (now AlAs)" in said(None)[0]
    assert said("b", ends=("wall", "open")) == said("b", field="9 kV/cm") == []


def test_pulses_thinner_than_an_interface_are_said():
    digital = bw.digital_alloy(graded(interface_width="0.5 nm"), "grade")
    assert any("thinner than an interface_width of 0.5 nm" in text for text in digital.cautions)
    assert digital.shifts.levels["overlap"].min() > 0.9


def test_strained_pulses_that_may_relax_are_said():
    stack = bw.parse_line("9 nm GaAs, 12 nm In0.4Ga0.6As {label w}, 9 nm GaAs", substrate="GaAs")
    with pytest.warns(bw.BandwrightWarning):
        digital = bw.digital_alloy(stack, period=30)
    assert any("critical thickness" in text for text in digital.cautions)


def test_it_says_what_it_is():
    digital = bw.digital_alloy(graded(), "grade")
    assert repr(digital) == "<Digital of 1 layers, cells of 6 ML>"
    assert "grade, in ML, first grown first: 2 GaAs, 2 AlAs" in str(digital)
    assert "<table" in digital._repr_html_() and "AlAs" in digital._repr_html_()


def test_an_alloy_of_many_layers_costs_a_few_times_its_two_solutions():
    pair = "2 nm Al0.3Ga0.7As, 4 nm GaAs, "
    stack = bw.parse_line("9 nm Al0.3Ga0.7As, 8 nm AlxGa1-xAs {x 0.3 to 0}, " + 14 * pair
                          + "9 nm Al0.3Ga0.7As", substrate="GaAs")  # fmt: skip
    ours, theirs = np.inf, np.inf
    digital = bw.digital_alloy(stack, at_most=8)
    for _ in range(5):
        start = time.perf_counter()
        bw.digital_alloy(stack, at_most=8)
        ours = min(ours, time.perf_counter() - start)
        start = time.perf_counter()
        bw.solve(stack, at_most=8)
        bw.solve(digital.stack, at_most=8)
        theirs = min(theirs, time.perf_counter() - start)
    print(ours, theirs)
    assert ours < 4.0 * theirs


# -- mistakes -------------------------------------------------------------------------------

MISTAKES = {
    "graed": (UnknownName, "layers: no layer 'graed'; did you mean 'grade'"),
    "layer 3": (StackError, r"layer 3 \(GaAs\): GaAs is no alloy, it is grown as it is"),
    3: (StackError, "layers: got 3; give names such as 'grade' or 'layer 2'"),
    (): (StackError, r"layers: got \(\); give names"),
}


@pytest.mark.parametrize("names", MISTAKES)
def test_layers_that_can_not_be_pulses(names):
    error, text = MISTAKES[names]
    with pytest.raises(error, match=text):
        bw.digital_alloy(graded(), names)


@pytest.mark.parametrize("period", [1, 0, 2.5, True, "6"])
def test_periods_that_are_none(period):
    with pytest.raises(StackError, match=r"period: got .*; write a whole number of monolayers"):
        bw.digital_alloy(graded(), period=period)


BETWEEN = {
    "GaAs": (StackError, "between: got 'GaAs'; give two formulas"),
    ("GaAs",): (StackError, r"between: got \('GaAs',\); give two"),
    ("GaAs", "GaAs"): (StackError, "between: GaAs and GaAs are the same; give two that differ"),
    ("GaAs", "AlxGa1-xAs"): (MaterialError, "between: 'AlxGa1-xAs' needs a value for x"),
    ("GaAs", "Al0.2Ga0.8As"): (StackError, "grade: the composition at .* nm is not between GaAs"
                                           " and Al0.2Ga0.8As; name two ends"),
    ("GaAs", "InAs"): (StackError, "grade: the composition at .* nm is not between GaAs and InAs"),
}  # fmt: skip


@pytest.mark.parametrize("between", BETWEEN)
def test_ends_that_can_not_be(between):
    error, text = BETWEEN[between]
    with pytest.raises(error, match=text):
        bw.digital_alloy(graded(), between=between)


def test_other_mistakes():
    line = "9 nm In0.52Al0.48As, 6 nm In0.53Al0.2Ga0.27As {label q}, 9 nm In0.52Al0.48As"
    with pytest.raises(StackError, match=r"q: no two binaries make In0\.53Al0\.2Ga0\.27As, which"
                       " holds In, Al, Ga, As; name two compositions that do"):  # fmt: skip
        bw.digital_alloy(bw.parse_line(line, substrate="InP"), "q")
    with pytest.raises(StackError, match="stack: got 'GaAs'; a Stack is due"):
        bw.digital_alloy("GaAs")
    with pytest.raises(StackError, match="method: got 'phase-integral'; levels are followed by"):
        bw.digital_alloy(graded(), method="phase-integral")
    binary = bw.parse_line("9 nm AlAs, 6 nm GaAs, 9 nm AlAs", substrate="GaAs")
    with pytest.raises(StackError, match="layers: no layer of the stack is an alloy"):
        bw.digital_alloy(binary)
    own = bw.parse_line("9 nm {edge 0.2 eV, mass 0.08, label own}, 6 nm {edge 0 eV, mass 0.067},"
                        " 9 nm {edge 0.2 eV, mass 0.08}")  # fmt: skip
    with pytest.raises(StackError, match="own: own numbers hold no atoms; give the layer a mat"):
        bw.digital_alloy(own, "own")
    thin = bw.parse_line("9 nm Al0.3Ga0.7As, 6 nm GaAs, 0.2 nm Al0.5Ga0.5As {label thin},"
                         " 9 nm Al0.3Ga0.7As", substrate="GaAs")  # fmt: skip
    with (
        pytest.warns(bw.BandwrightWarning),
        pytest.raises(StackError, match=r"thin: 0\.71 monolayers thick, .* too thin for pulses"),
    ):
        bw.digital_alloy(thin, "thin")
