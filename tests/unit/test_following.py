"""Levels followed by character: overlaps, tracks, lines; all designs invented."""

import numpy as np
import pytest
from scipy.integrate import trapezoid

import bandwright as bw
from bandwright.errors import SolveError, StackError
from bandwright.following import followed_pairs, matched
from bandwright.following.matching import LOST, assign
from bandwright.metrics import line_between
from bandwright.solver.overlaps import grid_for, lay

WALL = "Al0.3Ga0.7As"


def pair(first=6.0, barrier=3.0, second=6.0, outer=20.0, **given):
    text = (f"{outer} nm {WALL}, {first} nm GaAs, {barrier} nm {WALL}, {second} nm GaAs,"
            f" {outer} nm {WALL}")  # fmt: skip
    return bw.parse_line(text, substrate="GaAs", **given)


def deep(first=6.0, barrier=3.0, second=6.0, **given):
    """Wells between walls: every level is bound in a field as well."""
    return pair(first, barrier, second, outer=8.0, ends=("wall", "wall"), **given)


def singles(count):
    return [slice(i, i + 1) for i in range(count)]


# -- overlaps ---------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "given",
    [{}, {"field": "20 kV/cm"}, {"bands": "one-band"}, {"ends": ("wall", "wall")}],
    ids=str,
)
def test_states_of_equal_designs(given):
    stack = pair(7.0, **given)
    one, two = (bw.solve(stack, tolerance="1e-10 eV") for _ in range(2))
    found = bw.overlaps(one, two)
    assert len(one) >= 4
    assert np.abs(found - np.eye(len(one))).max() < 1e-9


def test_bound_states_and_those_of_a_box():
    stack = pair(7.0, 1.5)
    levels = bw.solve(stack, below="0.5 eV")
    assert len(levels.states.sets) == 2
    found = bw.overlaps(levels, levels)
    assert found.shape == (len(levels),) * 2
    assert np.abs(found.diagonal() - 1).max() < 1e-6
    walled = bw.solve(stack, below="0.5 eV", at_most=2)
    assert bw.overlaps(walled, levels).shape == (2, len(levels))


def test_a_plain_integral_in_the_same_design():
    # other widths of slices, other points: one-band states by the trapezoidal rule
    one = bw.solve(deep(7.0, bands="one-band"))
    two = bw.solve(deep(7.0, bands="one-band", field="15 kV/cm"))
    z = np.linspace(0.0, one.profile.thickness, 20_001)
    u, v = (levels.states.sample(z)[0] for levels in (one, two))
    plain = np.abs(trapezoid(u[:, None] * v, z, axis=2))
    assert np.abs(bw.overlaps(one, two) - plain).max() < 1e-6


def test_a_tail_counts():
    # a thin first layer that never ends: most of the level's barrier part lies outside
    thin = bw.parse_line(f"0.5 nm {WALL}, 4 nm GaAs, 0.5 nm {WALL}", substrate="GaAs")
    levels = bw.solve(thin, at_most=1)
    (states,) = levels.states.sets
    laid = lay(states, grid_for([states]))
    within = float((laid.inside @ laid.inside.T)[0, 0])
    assert within == pytest.approx(states.probabilities.sum() - _beyond(states), abs=1e-12)
    assert within < 0.9
    assert bw.overlaps(levels, levels)[0, 0] == pytest.approx(1.0, abs=1e-12)


def _beyond(states):
    decay, u, partner = states.beyond(0)
    return 2 * float((u**2 + partner**2)[0] / (2 * decay[0]))


def test_a_thicker_first_layer_shifts_nothing():
    thin, thick = bw.solve(pair(outer=20.0)), bw.solve(pair(outer=27.0))
    assert bw.overlaps(thin, thick).diagonal().min() > 0.995
    # the states themselves have moved by more than a well
    assert abs(thin.states.positions[0] - thick.states.positions[0]) > 6.5


def test_no_overlap_is_above_one():
    one, two = bw.solve(pair(4.0, 2.0)), bw.solve(pair(9.0, 6.0, 3.0))
    found = bw.overlaps(one, two)
    assert (found**2).sum(axis=0).max() < 1 + 1e-9
    assert (found**2).sum(axis=1).max() < 1 + 1e-9


def test_a_set_without_levels():
    none = bw.solve(pair(), below="1 meV")
    assert bw.overlaps(none, bw.solve(pair())).shape == (0, 4)
    assert bw.follow([none, bw.solve(pair())]).tolist() == [[LOST] * 4, [0, 1, 2, 3]]


# -- one design and the next ------------------------------------------------------------------


def test_a_small_step_keeps_every_level():
    steps = [bw.solve(pair(first)) for first in np.arange(7.0, 9.01, 0.1)]
    tracks = bw.follow(steps)
    count = len(steps[0])
    assert tracks[:, :count].tolist() == [list(range(count))] * len(steps)


def test_far_wells_cross_by_track():
    many = bw.solve_many([pair(first, 14.0) for first in np.arange(5.45, 6.6, 0.1)])
    tracks = bw.follow(many)
    assert tracks[0, :2].tolist() == [0, 1] and tracks[-1, :2].tolist() == [1, 0]
    # the track that starts in the second well stays in it
    middle = [levels.states.positions[index] for levels, index in zip(many, tracks[:, 0],
                                                                     strict=True)]  # fmt: skip
    ends = [20.0 + first + 14.0 for first in np.arange(5.45, 6.6, 0.1)]
    assert all(position > end for position, end in zip(middle, ends, strict=True))


def test_coarse_steps_pass_an_anticrossing_and_fine_ones_turn_back():
    def tracks(count):
        return bw.follow(bw.solve_many([pair(first, 4.0) for first in np.linspace(5, 7, count)]))

    assert tracks(2)[-1, :2].tolist() == [1, 0]
    assert tracks(81)[-1, :2].tolist() == [0, 1]


def test_the_very_middle_keeps_the_order():
    levels = [bw.solve(pair(first, 8.0)) for first in (5.0, 6.0)]
    assert np.abs(bw.overlaps(*levels)[:2, :2] - np.sqrt(0.5)).max() < 0.06
    assert bw.follow(levels)[:, :2].tolist() == [[0, 1], [0, 1]]
    # and the next design is compared with the one before
    assert bw.follow([*levels, bw.solve(pair(7.0, 8.0))])[-1, :2].tolist() == [1, 0]
    assert bw.follow([*levels, levels[0]])[-1, :2].tolist() == [0, 1]


@pytest.mark.parametrize("group", ["0.01 meV", "0 meV"])
def test_copies_are_subspaces(group):
    # three wells that hardly feel each other: the lowest three levels are one row
    far = "25 nm Al0.3Ga0.7As, 3 * (6 nm GaAs, 25 nm Al0.3Ga0.7As)"
    wells = [bw.parse_line(far.replace("6 nm", f"{width} nm"), substrate="GaAs")
             for width in (6.0, 6.1)]  # fmt: skip
    first, second = bw.solve_many(wells, group=group)
    assert len(first.groups) == (4 if group == "0.01 meV" else 6)
    assert matched(first, second).tolist() == [0, 1, 2, 3, 4, 5]


def test_copies_that_part():
    # in a field a row of three becomes three levels of their own
    wells = bw.parse_line("25 nm Al0.3Ga0.7As, 3 * (6 nm GaAs, 25 nm Al0.3Ga0.7As)",
                          substrate="GaAs")  # fmt: skip
    parted = bw.solve(wells.replace(field="0.2 kV/cm", electrons_run="to substrate"))
    found = matched(bw.solve(wells), parted)
    main = parted.states.positions[found[:3]]
    assert len(set(found[:3].tolist())) == 3 and LOST not in found[:3]
    assert np.ptp(main) > 2 * 30  # one in each well


@pytest.mark.parametrize(
    ("squares", "due"),
    [
        ([[0.9, 0.1], [0.1, 0.9]], [0, 1]),
        ([[0.1, 0.9], [0.9, 0.1]], [1, 0]),
        ([[0.5, 0.5], [0.5, 0.5]], [0, 1]),  # half and half: in order
        ([[0.49, 0.5], [0.5, 0.49]], [0, 1]),  # mixtures of each other: in order
        ([[0.9, 0.0], [0.0, 0.3]], [0, LOST]),
        ([[0.9, 0.0], [0.0, 0.0], [0.1, 0.0]], [0, LOST, LOST]),
        ([[0.3, 0.3, 0.3], [0.0, 0.0, 0.1]], [LOST, LOST]),  # spread over levels of others
        ([[0.4, 0.4, 0.1], [0.4, 0.3, 0.1], [0.0, 0.1, 0.2]], [0, 1, LOST]),
        ([[0.4, 0.4], [0.3, 0.3], [0.3, 0.3]], [0, 1, LOST]),
        ([[0.34, 0.33, 0.32], [0.33, 0.32, 0.33], [0.31, 0.33, 0.34]], [0, 1, 2]),
    ],
)
def test_assignment(squares, due):
    squares = np.array(squares)
    assert assign(squares, singles(len(squares)), singles(squares.shape[1])).tolist() == due


def test_assignment_of_rows_that_share_a_subspace():
    half = np.full((2, 2), 0.5)
    assert assign(half, [slice(0, 2)], singles(2)).tolist() == [0, 1]
    turned = np.array([[0.1, 0.9], [0.9, 0.1]])
    assert assign(turned, [slice(0, 2)], [slice(0, 2)]).tolist() == [0, 1]
    assert assign(turned, singles(2), singles(2)).tolist() == [1, 0]


# -- sequences --------------------------------------------------------------------------------


def test_a_design_that_failed_is_stepped_over():
    good = bw.solve(pair())
    bad = StackError("no such design")
    tracks = bw.follow([good, bad, good])
    assert tracks.tolist() == [[0, 1, 2, 3], [LOST] * 4, [0, 1, 2, 3]]
    assert bw.follow([bad, good]).tolist() == [[LOST] * 4, [0, 1, 2, 3]]
    assert bw.follow([]).shape == (0, 0)


def test_a_level_that_leaves_and_a_new_one():
    many = list(bw.solve_many([pair(first) for first in (6.0, 3.0, 6.0)]))
    counts = [len(levels) for levels in many]
    assert counts[1] < counts[0]
    tracks = bw.follow(many)
    assert [int((row != LOST).sum()) for row in tracks] == counts
    assert tracks.shape[1] > counts[0]  # found again, it is a new track
    gone = tracks[1] == LOST
    assert (tracks[2, : counts[0]][gone[: counts[0]]] == LOST).all()


def test_a_line_is_the_same_line():
    many = list(bw.solve_many([pair(first, 14.0) for first in np.arange(5.45, 6.6, 0.1)]))
    table = bw.follow_line(many, (4, 2))  # of the first well, which starts as the shallower one
    assert table.index.tolist() == list(range(1, len(many) + 1))
    assert (table["upper"].iloc[-1], table["lower"].iloc[-1]) == (3, 1)
    assert table["dipole_nm"].min() > 1.5  # a line between wells has hardly any
    for design, row in table.iterrows():
        line = line_between(many[design - 1], (int(row["upper"]), int(row["lower"])))
        assert row["wavelength_um"] == line.wavelength_um
    back = bw.follow_line(many, (3, 1), start=len(many))
    assert back["wavelength_um"].tolist() == pytest.approx(table["wavelength_um"].tolist())


def test_a_line_upside_down_and_a_line_lost():
    many = [*bw.solve_many([pair(5.45, 14.0), pair(6.55, 14.0), pair(2.0, 14.0)]),
            StackError("no such design")]  # fmt: skip
    assert followed_pairs(many[:2], (2, 1)) == [(2, 1), (2, 1)]
    assert followed_pairs(many, (4, 2))[2:] == [None, None]
    assert bw.follow_line(many, (4, 2))["wavelength_um"].isna().tolist() == [False] * 2 + [True] * 2
    onsets = followed_pairs(many, ("continuum", 1))
    assert onsets[:2] == [("continuum", 1), ("continuum", 2)]


# -- bad input --------------------------------------------------------------------------------


def test_something_else_than_levels():
    levels = bw.solve(pair())
    with pytest.raises(StackError, match=r"second: got 3; Levels are due, as solve\(stack\)"):
        bw.overlaps(levels, 3)
    with pytest.raises(StackError, match=r"follow: got .*; give a list of Levels"):
        bw.follow(levels)
    with pytest.raises(StackError, match=r"design 2: got 'well'; Levels are due"):
        bw.follow([levels, "well"])


def test_designs_of_another_sequence():
    one, two = bw.solve(pair()), bw.solve(bw.parse_line("9 nm GaAs", ends=("wall", "wall")),
                                          at_most=2)  # fmt: skip
    with pytest.raises(StackError, match="overlaps: designs of 5 and 1 layers in 5 and 1 str"):
        bw.overlaps(one, two)
    with pytest.raises(StackError, match="follow, design 2: overlaps: designs of 5 and 1 layers"):
        bw.follow([one, two])


def test_the_phase_integral_has_no_states():
    levels = bw.solve(pair(), method="phase-integral")
    with pytest.raises(SolveError, match="the phase integral gives energies only"):
        bw.overlaps(levels, levels)


def test_lines_that_are_not_there():
    levels = bw.solve(pair())
    with pytest.raises(StackError, match=r"line: got \(9, 1\); design 1 has levels 1 to 4"):
        bw.follow_line([levels], (9, 1))
    with pytest.raises(StackError, match="start: got 3; the designs are 1 to 2"):
        bw.follow_line([levels, levels], (2, 1), start=3)
    with pytest.raises(StackError, match="start: design 1 has no levels: no such design"):
        bw.follow_line([StackError("no such design"), levels], (2, 1))
