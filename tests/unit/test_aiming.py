"""aim(): what is read, what is found, what is out of reach, what is rounded."""

import itertools
import math
import pickle
import re

import numpy as np
import pytest
from scipy.optimize import lsq_linear

import bandwright as bw
from bandwright.aiming.asking import read_wishes
from bandwright.aiming.nearest import least_squares
from bandwright.aiming.problem import Problem, at_most
from bandwright.constants import H2M
from bandwright.errors import QuantityError, SolveError, StackError, UnknownName
from bandwright.parameters import read, replace
from bandwright.quantities.spans import split_span

WELL = bw.parse_line(
    "40 nm Al0.24Ga0.76As {label barrier}, 6 nm GaAs {label well},"
    " 40 nm Al0.24Ga0.76As {label barrier}",
    substrate="GaAs", temperature="77 K",
)  # fmt: skip
FREE = {"well.thickness": "4nm..12nm"}
TARGET = {"2 to 1": "10.3 um"}
PAIR = bw.parse_line(
    "20 nm Al0.3Ga0.7As {label wall}, 7.3 nm GaAs {label wide}, 1.5 nm Al0.3Ga0.7As {label thin},"
    " 5.1 nm GaAs {label narrow}, 20 nm Al0.3Ga0.7As {label wall}",
    substrate="GaAs",
)
WIDTHS = {"wide.thickness": 7.3, "thin.thickness": 1.5, "narrow.thickness": 5.1}
SPANS = {
    "wide.thickness": "4nm..12nm", "thin.thickness": "0.5nm..4nm", "narrow.thickness": "2nm..9nm"
}  # fmt: skip


def off_by(*factors):
    stack = PAIR
    for (name, width), factor in zip(WIDTHS.items(), factors, strict=True):
        stack = replace(stack, name, width * factor)
    return stack


def problem(stack, free, targets, limits=None, maximise=None):
    wishes = read_wishes(stack, free, targets, None, maximise, limits)
    arguments = {"tolerance": "1e-10 eV", "at_most": at_most(wishes, False)}
    return Problem(wishes, arguments, False)


# -- three free parameters --------------------------------------------------------------------


@pytest.mark.parametrize("factors", list(itertools.product((0.7, 1.3), repeat=3)))
def test_three_free_from_30_percent_off_take_fewer_than_40_solves(factors):
    aimed = bw.aim(off_by(*factors), SPANS, {"3 to 2": "12 um", "2 to 1": "36 meV"})
    print(f"{factors}: {aimed.solves} solves")
    assert aimed.reached
    assert aimed.solves < 40
    solved = bw.solve(aimed.stack, tolerance="1e-10 eV")
    energies = solved.energies
    assert (energies[1] - energies[0]) * 1e3 == pytest.approx(36.0, abs=1e-5)
    assert solved.lines().find(3, 2).wavelength_um == pytest.approx(12.0, abs=1e-6)
    for name, span in SPANS.items():
        low, high = (float(end.removesuffix("nm")) for end in span.split(".."))
        assert low <= read(aimed.stack, name) <= high


@pytest.mark.parametrize("factors", [(1.3, 0.7, 1.3), (1.3, 1.3, 1.3), (0.7, 0.7, 0.7)])
def test_a_dipole_is_raised_with_three_free_in_fewer_than_40_solves(factors):
    # the thin barrier is all the freedom two targets leave: a search by hand along it
    targets = {"3 to 2": "10.3 um", "2 to 1": "36 meV"}
    aimed = bw.aim(off_by(*factors), SPANS, targets, maximise="dipole 3 to 2")
    assert aimed.reached
    assert aimed.solves < 40
    print(f"{factors}: {aimed.solves} solves, {aimed.targets.reached.iloc[-1]:.4f} nm")
    for thin in (-0.05, 0.05):
        value = read(aimed.stack, "thin.thickness") + thin
        fixed = replace(aimed.stack, "thin.thickness", value)
        spans = {name: span for name, span in SPANS.items() if name != "thin.thickness"}
        beside = bw.aim(fixed, spans, targets)
        if beside.reached:
            dipole = bw.solve(beside.stack).lines().find(3, 2).dipole_nm
            assert dipole <= aimed.targets.reached.iloc[-1] * (1.0 + 1e-4)
    found = bw.solve(aimed.stack).lines().find(3, 2)
    assert found.dipole_nm == pytest.approx(aimed.targets.reached.iloc[-1], rel=1e-5)
    assert found.wavelength_um == pytest.approx(10.3, abs=1e-6)


def test_what_is_maximised_is_the_largest_of_a_scan():
    # one free parameter and no target: every design of a fine scan has a smaller dipole
    aimed = bw.aim(off_by(1.0, 1.0, 1.3), {"narrow.thickness": "3nm..7nm"},
                   maximise="dipole 3 to 2", starts=3)  # fmt: skip
    scan = bw.solve_many(replace(PAIR, "narrow.thickness", w) for w in np.linspace(3, 7, 81))
    dipoles = [levels.dipoles()[1, 2] for levels in scan]
    best = aimed.targets.reached[0]
    assert best == pytest.approx(np.abs(dipoles).max(), rel=1e-3)
    assert best >= np.abs(dipoles).max() * (1.0 - 1e-4)
    assert aimed.starts == 3


def test_a_strength_is_the_one_of_the_lines():
    aimed = bw.aim(PAIR, {"narrow.thickness": "3nm..7nm"}, maximise="oscillator strength of 2 to 1")
    due = bw.solve(aimed.stack).lines().find(2, 1).oscillator_strength
    assert aimed.targets.reached[0] == pytest.approx(due, rel=1e-6)
    assert "oscillator strength 2 to 1 raised to" in aimed.message


# -- slopes and steps -------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("free", "targets"),
    [
        (SPANS, {"2 to 1": "36 meV", "3 to 2": "12 um", "continuum to 1": "200 meV"}),
        ({"wide.thickness": "4nm..12nm", "wall.composition": "0.2..0.4"}, {"3 to 1": "10 um"}),
        ({"flux Al": "0.7..1.3"}, {"2 to 1": "36 meV"}),
        ({"all thicknesses": "0.7..1.6", "temperature": "77 K..400 K"}, {"3 to 1": "10 um"}),
    ],
)
def test_slopes_are_those_of_differences(free, targets):
    asked = problem(PAIR, free, targets, {"thickness": "..60 nm", "2 to 1": "30 meV..40 meV"})
    x = np.full(len(free), 0.37)
    point = asked.at(x)
    step = 1e-4
    for place in range(len(free)):
        ends = [asked.at(x + side * step * np.eye(len(free))[place]) for side in (-1, 1)]
        slope = (ends[1].deviations - ends[0].deviations) / (2 * step)
        assert point.deviation_slopes[:, place] == pytest.approx(slope, rel=1e-4, abs=1e-5)
        slope = (ends[1].rests - ends[0].rests) / (2 * step)
        assert point.rest_slopes[:, place] == pytest.approx(slope, rel=1e-4, abs=1e-5)


@pytest.mark.parametrize("seed", range(20))
def test_least_squares_in_a_box_is_scipys(seed):
    draw = np.random.default_rng(seed)
    rows, values = draw.normal(size=(6, 4)), draw.normal(size=6)
    low, high = -draw.uniform(0.01, 0.4, 4), draw.uniform(0.01, 0.4, 4)
    box = np.vstack((np.eye(4), -np.eye(4)))
    found = least_squares(rows, values, box, np.concatenate((low, -high)))
    due = lsq_linear(rows, values, (low, high), tol=1e-14).x
    assert found == pytest.approx(due, abs=1e-6)


def test_least_squares_says_where_nothing_fits():
    sides = np.array([[1.0, 0.0], [-1.0, 0.0]])
    assert least_squares(np.ones((1, 2)), np.ones(1), sides, np.array([1.0, -0.5])) is None
    still = np.array([[0.0, 0.0]])
    assert least_squares(np.ones((1, 2)), np.ones(1), still, np.array([1.0])) is None


# -- out of reach, limits, weights ------------------------------------------------------------


def test_out_of_reach_names_the_nearest():
    aimed = bw.aim(WELL, {"well.thickness": "6nm..7nm"}, TARGET)
    assert not aimed.reached
    due = bw.solve(replace(WELL, "well.thickness", 7.0)).lines().find(2, 1).wavelength_um
    assert aimed.targets.reached[0] == pytest.approx(due, rel=1e-7)
    assert aimed.message == (
        f"out of reach within these bounds: the nearest to 10.3 um of 2 to 1 is {due:.6g} um;"
        " well.thickness is at its upper bound, 7 nm"
    )
    assert repr(aimed).startswith("<Aimed: out of reach, ")


def test_out_of_reach_inside_the_bounds_is_the_extreme_of_a_scan():
    # the spacing of the anticrossing has a smallest value; 5 meV lies below it
    free = {"narrow.thickness": "5nm..9nm"}
    aimed = bw.aim(PAIR, free, {"2 to 1": "5 meV"})
    scan = bw.solve_many(replace(PAIR, "narrow.thickness", w) for w in np.linspace(5, 9, 401))
    spacing = min(float(levels.energies[1] - levels.energies[0]) for levels in scan) * 1e3
    assert not aimed.reached
    assert aimed.targets.reached[0] == pytest.approx(spacing, rel=1e-4)
    assert 5.1 < aimed.values.value[0] < 8.9
    assert "bound" not in aimed.message.replace("bounds", "")


def test_a_limit_of_thickness_is_kept():
    free = {"wide.thickness": "4nm..12nm", "narrow.thickness": "2nm..9nm"}
    aimed = bw.aim(PAIR, free, {"2 to 1": "60 meV"}, limits={"thickness": "..52 nm"})
    bare = bw.aim(PAIR, free, {"2 to 1": "60 meV"})
    assert bare.reached and bare.found.thickness > 52.01
    assert aimed.reached and aimed.found.thickness <= 52.0 * (1.0 + 1e-9)
    assert aimed.limits.reached[0] == pytest.approx(aimed.found.thickness)
    assert aimed.whole.thickness <= 52.0 * (1.0 + 1e-9)
    assert "every target is met, every limit is kept" in aimed.message


def test_a_target_beyond_a_limit_is_out_of_reach_and_the_limit_is_kept():
    aimed = bw.aim(WELL, FREE, TARGET, limits={"thickness": "..86.5 nm"})
    assert not aimed.reached
    assert aimed.found.thickness == pytest.approx(86.5, abs=1e-6)
    assert "the nearest to 10.3 um of 2 to 1 is" in aimed.message


def test_a_limit_that_nothing_keeps_is_said():
    aimed = bw.aim(WELL, {"well.thickness": "5nm..9nm"}, TARGET, limits={"thickness": "..60 nm"})
    assert not aimed.reached
    assert "thickness is 85 nm, beyond its limit of 60 nm" in aimed.message
    aimed = bw.aim(WELL, {"well.thickness": "6nm..7nm"}, TARGET, limits={"2 to 1": "11 um.."})
    assert re.search(r"2 to 1 is [\d.]+ um, beyond its limit of 11 um", aimed.message)


def test_a_spacing_stays_near_a_phonon():
    limits = {"2 to 1": "34 meV..38 meV"}
    aimed = bw.aim(off_by(1.3, 1.3, 1.3), SPANS, {"3 to 2": "11 um"}, limits=limits)
    energies = bw.solve(aimed.stack).energies * 1e3
    assert aimed.reached
    assert 34.0 - 1e-5 < energies[1] - energies[0] < 38.0 + 1e-5


def test_weights_decide_where_not_all_is_met():
    free = {"well.thickness": "5nm..12nm"}
    both = {"2 to 1": "9.5 um", "continuum to 1": "170 meV"}
    plain = bw.aim(WELL, free, both).targets.reached[0]
    weighed = bw.aim(WELL, free, both, weights={"2 to 1": 10}).targets.reached[0]
    assert abs(weighed - 9.5) < 0.2 * abs(plain - 9.5)


def test_a_level_that_leaves_is_named_where_the_search_ends():
    # the second level of a well 7 nm wide leaves it where k L = pi at the barriers' top, at a
    # depth of (hbar pi / L)^2 / 2m = 114.5 meV: its spacing gets no smaller than there
    stack = bw.parse_line(
        "20 nm {edge 250 meV, mass 0.067, label barrier}, 7 nm {edge 0 meV, mass 0.067},"
        " 20 nm {edge 250 meV, mass 0.067, label barrier}"
    )
    depth = H2M / 0.067 * (math.pi / 7.0) ** 2 * 1e3
    aimed = bw.aim(stack, {"barrier.edge": "60 meV..400 meV"}, {"2 to 1": "60 meV"})
    assert not aimed.reached
    assert aimed.values.value[0] == pytest.approx(depth, abs=0.05)
    assert "a step further there is no line 2 to 1: the stack has 1 level" in aimed.message


def test_a_start_without_the_line_begins_elsewhere():
    stack = replace(WELL, "well.thickness", 2.0)
    assert len(bw.solve(stack)) == 1
    aimed = bw.aim(stack, {"well.thickness": "2nm..12nm"}, TARGET)
    assert aimed.reached


def test_levels_are_followed_by_character():
    # the first of two wells closed off from each other passes the second: by number the line
    # would hop to the other well
    def two(width):
        return bw.parse_line(
            f"20 nm Al0.4Ga0.6As, {width} nm GaAs {{label first}}, 14 nm Al0.4Ga0.6As, 6 nm GaAs,"
            " 20 nm Al0.4Ga0.6As", substrate="GaAs",
        )  # fmt: skip

    alone = bw.parse_line("20 nm Al0.4Ga0.6As, 7 nm GaAs, 20 nm Al0.4Ga0.6As", substrate="GaAs")
    photon = bw.solve(alone).lines().find(2, 1).energy_meV
    free = {"first.thickness": "5nm..8nm"}
    aimed = bw.aim(two(5.5), free, {"4 to 2": f"{photon} meV"}, follow=True)
    assert aimed.reached
    assert aimed.values.value[0] == pytest.approx(7.0, abs=0.02)
    assert aimed.found.places == {2: 0, 4: 2}
    by_number = bw.aim(two(5.5), free, {"4 to 2": f"{photon} meV"})
    assert abs(by_number.values.value[0] - 7.0) > 0.1 or not by_number.reached


# -- rounding ---------------------------------------------------------------------------------


def test_every_layer_is_rounded_to_whole_monolayers():
    aimed = bw.aim(PAIR, SPANS, {"3 to 2": "12 um", "2 to 1": "36 meV"})
    for written in aimed.rounded.written():
        assert written.layer.thickness.unit == "ML"
        assert written.layer.thickness.value == round(written.layer.thickness.value)
    for fact in bw.solve(aimed.rounded).profile.facts:
        count = fact.thickness / fact.monolayer
        assert count == pytest.approx(round(count), abs=1e-9)
    due = bw.solve(aimed.rounded).lines().find(3, 2).wavelength_um
    table = aimed.targets.set_index("target")
    assert table["rounded"]["3 to 2"] == pytest.approx(due, rel=1e-7)
    assert table["by"]["3 to 2"] == pytest.approx(due - 12.0, abs=1e-6)
    assert list(aimed.values.monolayers) == [
        aimed.rounded.written()[n].layer.thickness.value for n in (1, 2, 3, 0)
    ]
    assert list(aimed.values.free) == [True, True, True, False]


def test_rounding_together_beats_one_by_one():
    # every neighbouring combination solved: none is much better, and one by one is worse
    targets = {"3 to 2": "12 um", "2 to 1": "36 meV"}
    aimed = bw.aim(off_by(0.9, 1.2, 1.1), SPANS, targets)
    levels = aimed.levels
    height = levels.profile.facts[1].monolayer
    names = list(SPANS)
    counts = [read(aimed.stack, name) / levels.profile.facts[i].monolayer
              for i, name in enumerate(names, start=1)]  # fmt: skip
    assert height > 0.25

    def cost(whole):
        stack = aimed.rounded
        for name, count in zip(names, whole, strict=True):
            stack = replace(stack, name, float(count))
        e = bw.solve(stack, tolerance="1e-9 eV").energies
        return sum(
            math.log(found / due) ** 2
            for found, due in ((e[2] - e[1], 1.239841984 / 12), (e[1] - e[0], 0.036))
        )

    around = itertools.product(*[[math.floor(c), math.floor(c) + 1] for c in counts])
    best = min(cost(whole) for whole in around)
    own = cost([int(n) for n in aimed.values.monolayers[:3]])
    single = cost([round(c) for c in counts])
    print(f"together {own:.3e}, best neighbour {best:.3e}, one by one {single:.3e}")
    assert own <= best * 1.001
    assert own <= single


def test_other_parameters_have_a_grid_or_are_left():
    free = {"barrier.composition": "0.2..0.3", "well.thickness": "6nm..9nm"}
    aimed = bw.aim(WELL, free, TARGET, grid={"barrier.composition": 0.01})
    table = aimed.values.set_index("parameter")
    fraction = table["rounded"]["barrier.composition"]
    assert fraction == pytest.approx(round(fraction, 2), abs=1e-12)
    left = bw.aim(WELL, free, TARGET).values.set_index("parameter")
    assert left["rounded"]["barrier.composition"] == left["value"]["barrier.composition"]


def test_a_thickness_in_monolayers_may_be_freed_and_bounds_may_be_in_them():
    stack = replace(WELL, "well.thickness", 6.0)
    number = stack.written()[1].number
    counted = stack.with_layer(number, bw.Layer("22 ML", "GaAs", label="well"))
    one = bw.aim(counted, {"well.thickness": "4 nm..12 nm"}, TARGET)
    two = bw.aim(stack, {"well.thickness": "15 ML..42 ML"}, TARGET)
    height = one.levels.profile.facts[1].monolayer
    assert one.values.unit[0] == "ML" and two.values.unit[0] == "nm"
    assert one.values.value[0] * height == pytest.approx(two.values.value[0], abs=1e-6)
    assert one.values["rounded"][0] == one.values.monolayers[0] == two.values.monolayers[0]


def test_copies_of_a_group_move_together():
    layers = [bw.Layer("5 nm", "Al0.3Ga0.7As"),
              bw.Repeat(2, [bw.Layer("6 nm", "GaAs", label="well"),
                            bw.Layer("2 nm", "Al0.3Ga0.7As", label="thin")]),
              bw.Layer("5 nm", "Al0.3Ga0.7As")]  # fmt: skip
    stack = bw.Stack(layers, substrate="GaAs")
    limits = {"thickness": "..27 nm"}
    aimed = bw.aim(stack, {"well.thickness": "5nm..9nm", "thin.thickness": "1nm..4nm"},
                   {"2 to 1": "20 meV"}, limits=limits)  # fmt: skip
    assert aimed.reached
    assert aimed.whole.thickness <= 27.0 * (1.0 + 1e-9)
    assert [w.copies for w in aimed.rounded.written()] == [1, 2, 2, 1]


def test_a_finer_tolerance_is_kept():
    assert bw.aim(WELL, FREE, TARGET, tolerance="1e-10 eV").levels.tolerance == 1e-10
    assert bw.aim(WELL, FREE, TARGET, tolerance="1e-3 eV").levels.tolerance == 1e-9


# -- output -----------------------------------------------------------------------------------


def test_text_and_html_say_the_same():
    aimed = bw.aim(WELL, FREE, TARGET, limits={"thickness": "..100nm"}, maximise="dipole")
    text, html = str(aimed), aimed._repr_html_()
    for each in (text, html):
        assert aimed.message.split(", dipole")[0] in " ".join(each.split())
        assert "well.thickness" in each and "can injure eyes" in each
    assert f"{aimed.solves} solves from 1 start, levels followed by number" in " ".join(
        text.split()
    )
    assert list(aimed.targets.columns) == ["target", "asked", "reached", "rounded", "by", "unit"]
    assert repr(aimed) == f"<Aimed: reached, {aimed.solves} solves>"


# -- bad input --------------------------------------------------------------------------------

BAD = [
    ({}, TARGET, {}, StackError, r"free: no free parameter; give names with their bounds"),
    (None, TARGET, {}, StackError, r"free: no free parameter"),
    ("well.thickness", TARGET, {}, StackError, r"free: got 'well.thickness'; give names"),
    ({"wel.thickness": "4nm..9nm"}, TARGET, {}, UnknownName,
     r"no layer has the label 'wel'; did you mean 'well.thickness'"),
    ({"well.thickness": "9nm..4nm"}, TARGET, {}, StackError,
     r"well.thickness: got '9nm..4nm', which runs backwards"),
    ({"well.thickness": "9nm..9nm"}, TARGET, {}, StackError, r"leaves nothing free"),
    ({"well.thickness": "9nm"}, TARGET, {}, QuantityError, r"got '9nm'; write both ends"),
    ({"well.thickness": "4nm.."}, TARGET, {}, QuantityError, r"got '4nm..'; it needs both ends"),
    ({"well.thickness": "4 meV..9 meV"}, TARGET, {}, QuantityError, r"well.thickness: got '4 meV'"),
    ({"well.thickness": "0nm..9nm"}, TARGET, {}, StackError, r"thickness must be above zero"),
    ({"well.thickness": "4nm..9nm", "layer 2.thickness": "4nm..9nm"}, TARGET, {}, StackError,
     r"layer 2.thickness: moves what well.thickness moves too"),
    ({"well.thickness": "4nm..9nm", "all thicknesses": "0.5..2"}, TARGET, {}, StackError,
     r"all thicknesses: moves what well.thickness moves too"),
    (FREE, None, {}, StackError, r"targets: none is given, and nothing to maximise"),
    (FREE, "10.3 um", {}, StackError, r"targets: got '10.3 um'; write for example"),
    (FREE, {"2-1": "10.3 um"}, {}, StackError, r"targets: got '2-1'; write a line as '2 to 1'"),
    (FREE, {"1 to 2": "10.3 um"}, {}, StackError, r"targets: line: .* upper level comes first"),
    (FREE, {"2 to 1": "10.3 kV/cm"}, {}, QuantityError,
     r"targets, 2 to 1: got '10.3 kV/cm'; a wavelength or an energy is due"),
    (FREE, {"2 to 1": 10.3}, {}, QuantityError, r"targets, 2 to 1: got 10.3; a wavelength or"),
    (FREE, {"2 to 1": "-3 um"}, {}, QuantityError, r"targets, 2 to 1: got '-3 um'; it must be"),
    (FREE, {"2 to 1": "9 um", (2, 1): "8 um"}, {}, StackError, r"2 to 1 is given more than once"),
    (FREE, {"9 to 1": "10.3 um"}, {}, StackError,
     r"targets: there is no line 9 to 1: the stack has 2 levels, nor has any of 11 other designs"),
    (FREE, TARGET, {"weights": {"3 to 1": 2}}, UnknownName,
     r"weights: 3 to 1 is no target; did you mean '2 to 1'"),
    (FREE, TARGET, {"weights": {"2 to 1": 0}}, StackError,
     r"weights, 2 to 1: got 0; a number above zero is due"),
    (FREE, TARGET, {"maximise": "dipol"}, UnknownName, r"did you mean 'dipole'"),
    (FREE, TARGET, {"maximise": 3}, UnknownName, r"maximise: got 3; write for example"),
    (FREE, None, {"maximise": "dipole"}, StackError, r"say of which line, as 'dipole 2 to 1'"),
    (FREE, TARGET, {"maximise": ("dipole", ("continuum", 1))}, StackError,
     r"an onset to the continuum has no dipole"),
    (FREE, TARGET, {"limits": {"thicknes": "..9nm"}}, UnknownName,
     r"limits: 'thicknes' can't be limited; did you mean 'thickness'"),
    (FREE, TARGET, {"limits": {"thickness": ".."}}, QuantityError,
     r"limits, thickness: got '..'; write both ends"),
    (FREE, TARGET, {"limits": {"thickness": "9nm..4nm"}}, StackError,
     r"limits, thickness: got '9nm..4nm', which runs backwards"),
    (FREE, TARGET, {"limits": {"2 to 1": "9um..80meV"}}, StackError,
     r"limits, 2 to 1: got '9um..80meV'; write both ends as wavelengths"),
    (FREE, TARGET, {"limits": {"2 to 1": "9um..8um"}}, StackError,
     r"limits, 2 to 1: got '9um..8um', which runs backwards"),
    (FREE, TARGET, {"starts": 0}, StackError, r"starts: got 0; a whole number from 1 is due"),
    (FREE, TARGET, {"grid": {"well.x": 0.01}}, UnknownName, r"grid: 'well.x' is no free parameter"),
    (FREE, TARGET, {"grid": 0.01}, StackError, r"grid: got 0.01; write for example"),
    (FREE, TARGET, {"grid": {"well.thickness": "0 nm"}}, StackError, r"a step above zero is due"),
    (FREE, TARGET, {"grid": {"well.thickness": "1 ML"}}, StackError, r"it is counted in nm"),
    ({"flux Al": "0.8..1.2"}, TARGET, {"grid": {"flux Al": 0.1}}, StackError,
     r"grid, flux Al: what is relative to the stack has no whole steps"),
]  # fmt: skip


@pytest.mark.parametrize(("free", "targets", "more", "error", "text"), BAD)
def test_bad_input(free, targets, more, error, text):
    with pytest.raises(error, match=text) as raised:
        bw.aim(WELL, free, targets, **more)
    assert "\n" not in str(raised.value)


def test_monolayers_of_own_numbers_and_of_other_units():
    own = bw.Stack([bw.Layer("9 nm", edge="0 meV", mass=0.067, label="well")], ends="wall")
    with pytest.raises(QuantityError, match="a layer of own numbers has no monolayer"):
        bw.aim(own, {"well.thickness": "10 ML..30 ML"}, TARGET)
    doped = bw.Stack([bw.Layer("9 nm", edge="0 meV", mass=0.067, donors="1e17 / cm^3",
                               label="well")], ends="wall")  # fmt: skip
    with pytest.raises(QuantityError, match=r"it is counted in nm\^-3"):
        bw.aim(doped, {"well.donors": "1e11 / cm^2..2e11 / cm^2"}, TARGET)


def test_no_stack():
    with pytest.raises(StackError, match="a Stack is due"):
        bw.aim("6 nm GaAs", FREE, TARGET)


def test_a_stack_that_cannot_be_solved_is_said_at_once():
    with pytest.raises(StackError, match=r"^zero = 'nothing' is neither a label nor a material"):
        bw.aim(WELL.replace(zero="nothing"), FREE, TARGET)
    with pytest.raises(SolveError, match="ends = 'periodic' is read but not solved yet"):
        bw.aim(WELL.replace(ends="periodic"), FREE, TARGET)


def test_a_field_is_free_and_the_result_pickles():
    stack = PAIR.replace(field="20 kV/cm")
    aimed = bw.aim(stack, {"field": "0 kV/cm..60 kV/cm"}, {"2 to 1": "50 meV"})
    assert aimed.reached
    assert aimed.values.unit[0] == "kV/cm"
    assert aimed.values.value[0] == pytest.approx(aimed.stack.field * 1e4)
    assert str(pickle.loads(pickle.dumps(aimed))) == str(aimed)


SLOPE = bw.parse_line(
    "20 nm Al0.3Ga0.7As {label wall}, 8 nm GaAs {label well}, 2 nm AlxGa1-xAs {x 0 to 0.3,"
    " label slope}, 20 nm Al0.3Ga0.7As {label wall}", substrate="GaAs",
)  # fmt: skip


def test_a_grade_is_moved_by_its_shift_and_rounded():
    aimed = bw.aim(SLOPE, {"slope.x_shift": "0..0.1", "well.thickness": "6nm..9nm"},
                   {"2 to 1": "110 meV", "continuum to 1": "185 meV"})  # fmt: skip
    table = aimed.values.set_index("parameter")
    ends = dict(aimed.stack.written()[2].layer.shapes)["x"].at(np.array([0.0, 2.0]), 2.0, "first")
    assert ends - [0.0, 0.3] == pytest.approx(table["value"]["slope.x_shift"], abs=1e-12)
    assert table["monolayers"]["slope.thickness"] == round(table["monolayers"]["slope.thickness"])
    assert aimed.targets.reached.tolist() == pytest.approx(
        [float(aimed.found.energy(t.pair)) * 1e3 for t in aimed.wishes.targets]
    )


def test_a_flux_that_bends_a_grade_is_aimed():
    aimed = bw.aim(SLOPE, {"flux Al": "0.8..1.3"}, {"2 to 1": "110 meV"})
    assert aimed.reached
    moved = replace(SLOPE, "flux Al", float(aimed.values.value[0]))
    line = bw.solve(moved, tolerance="1e-9 eV").lines().find(2, 1)
    assert line.energy_meV == pytest.approx(110.0, abs=1e-4)


def test_a_table_of_depths_stays_in_nm():
    points = bw.Layer("10 nm", "AlxGa1-xAs", label="valley",
                      x=[("0 nm", 0.3), ("5 nm", 0.0), ("10 nm", 0.3)])  # fmt: skip
    wall = bw.Layer("20 nm", "Al0.3Ga0.7As", label="wall")
    stack = bw.Stack([wall, points, wall], substrate="GaAs")
    aimed = bw.aim(stack, {"valley.thickness": "6nm..20nm"}, {"2 to 1": "11 um"})
    layer, fact = aimed.rounded.written()[1].layer, aimed.rounded_levels.profile.facts[1]
    assert aimed.reached and layer.thickness.unit == "nm"
    count = layer.thickness.value / fact.monolayer
    assert count == pytest.approx(round(count), abs=1e-9)
    assert aimed.values.monolayers[0] == round(count)


def test_a_composition_that_is_a_function_is_stretched():
    valley = bw.Layer("10 nm", "AlxGa1-xAs", label="valley",
                      x=lambda z: 0.3 * np.cos(np.pi * z / 10.0) ** 2)  # fmt: skip
    wall = bw.Layer("20 nm", "Al0.3Ga0.7As", label="wall")
    stack = bw.Stack([wall, valley, wall], substrate="GaAs")
    aimed = bw.aim(stack, {"valley.thickness": "6nm..24nm"}, {"2 to 1": "11 um"})
    assert aimed.reached and aimed.solves < 15
    found = bw.solve(aimed.stack).lines().find(2, 1)
    assert found.wavelength_um == pytest.approx(11.0, abs=1e-5)


def test_spans():
    assert split_span(("4 nm", "9 nm"), "well") == ("4 nm", "9 nm")
    with pytest.raises(QuantityError, match="well: got 7; write both ends"):
        split_span(7, "well")
