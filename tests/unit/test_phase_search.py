"""Counting and finding phase-integral levels, and what the room may import."""

import ast
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest

import bandwright.phase
from bandwright import phase
from bandwright.errors import SolveError
from bandwright.phase.joints import joined
from bandwright.phase.pieces import pieces_of, turns
from bandwright.phase.sections import Plan
from bandwright.profile import Polynomial, Profile, Sampled, Section


def section(thickness, *edge, mass=0.067, inverse_gap=0.0):
    return Section(float(thickness), Polynomial(edge), Polynomial((mass,)),
                   Polynomial((inverse_gap,)))


WELL = Profile((section(8, 0.25, mass=0.09), section(9, 0.0), section(8, 0.25, mass=0.09)))


def test_numbers_outside_the_bounds_are_nan():
    found = phase.levels(WELL, 0.0, 0.2, numbers=[0, 1, 7])
    assert np.isnan(found).tolist() == [False, False, True]
    assert found[:2] == pytest.approx(phase.levels(WELL, 0.0, 0.2))


def test_at_most_and_ends():
    assert len(phase.levels(WELL, 0.0, 0.25, at_most=1)) == 1
    walled = phase.levels(WELL, 0.0, 0.6, ends=("wall", "wall"))
    assert len(walled) == phase.count(WELL, [0.6], ("wall", "wall"))[0] > 3


def test_periodic_ends_are_refused():
    with pytest.raises(SolveError, match="found 'periodic'; give ends = 'open' or 'wall'"):
        phase.count(Profile(WELL.sections, ("periodic", "periodic")), [0.1])


def test_exact_only_for_flat_sections():
    assert phase.exact(WELL)
    assert not phase.exact(Profile((*WELL.sections, section(3, 0.1, 0.01))))


def test_no_shooting_inside():
    allowed = {"matrix", "search"}
    for path in Path(bandwright.phase.__file__).parent.glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text())):
            if isinstance(node, ast.ImportFrom) and node.module and "solver" in node.module:
                assert node.module.rsplit(".", 1)[-1] in allowed, path
            assert not (isinstance(node, ast.Import) and "solver" in node.names[0].name), path


def test_a_section_is_cut_where_its_edge_turns():
    wave = Sampled(lambda z: 0.1 * np.cos(z))
    curved = Section(10.0, wave, Polynomial((0.067,)))
    assert turns(curved) == pytest.approx([np.pi, 2 * np.pi, 3 * np.pi], abs=1e-6)
    pieces = pieces_of(curved)
    assert [p.direction for p in pieces] == [-1, 1, -1, 1]
    assert sum(p.length for p in pieces) == pytest.approx(10.0)
    assert turns(section(10, 0.0, 0.0, 0.0, 0.001)) == []
    assert turns(section(10, 0.2, -0.02, 0.001)) == []  # level at the face, no turn inside


def test_smooth_neighbours_are_one_section_and_others_are_not():
    def parts(*sections):
        return [s.thickness for s in joined(sections)]

    bent = Section(4.0, Sampled(lambda z: 0.1 * np.cos(z)), Polynomial((0.067,)))
    goes_on = Section(3.0, Sampled(lambda z: 0.1 * np.cos(z + 4.0)), Polynomial((0.067,)))
    kinked = Section(3.0, Sampled(lambda z: 0.1 * np.cos(4.0 - z)), Polynomial((0.067,)))
    assert parts(bent, goes_on) == [7.0]
    assert parts(bent, kinked) == [4.0, 3.0]
    assert parts(section(2, 0.1), section(3, 0.1)) == [5.0]
    assert parts(section(2, 0.1), section(3, 0.1, mass=0.08)) == [2.0, 3.0]
    assert parts(section(2, 0.1), section(3, 0.1, inverse_gap=0.5)) == [2.0, 3.0]
    assert parts(section(2, 0.1), section(3, 0.1, 0.01)) == [2.0, 3.0]
    assert parts(section(2, 0.1, 0.01), section(3, 0.12, 0.01)) == [5.0]
    assert parts(section(2, 0.1, 0.01), section(3, 0.121, 0.01)) == [2.0, 3.0]
    whole = joined((bent, goes_on))[0].edge.at(np.array([1.0, 6.0]))
    assert whole == pytest.approx(0.1 * np.cos([1.0, 6.0]))


def test_a_flat_stretch_in_a_sampled_edge_is_cut_in_its_middle():
    trough = Sampled(lambda z: np.clip(np.abs(z - 10.0) - 4.0, 0.0, 0.25))
    assert turns(Section(20.0, trough, Polynomial((0.067,)))) == pytest.approx([10.0], abs=0.1)


def test_equal_sections_are_worked_out_once():
    period = (section(3, 0.25, 0.01), section(5, 0.0, 0.01))
    plan = Plan(Profile(period * 20, ("wall", "wall")))
    assert len(plan.rows) == 40
    # the walled first and last section are pieces of their own
    assert len({row[:2] for row in plan.rows}) == 4


@pytest.mark.parametrize("inverse_gap", [0.0, 0.9])
def test_the_count_never_falls_and_nothing_overflows(inverse_gap):
    thick = [section(h, e, mass=m, inverse_gap=inverse_gap)
             for h, e, m in ((200, 1.75, 0.1), (0.28, 0.0, 0.05), (6, 0.0, 0.067), (200, 1.75, 0.1),
                             (6, 0.0, 0.067), (200, 1.75, 0.1))]
    steep = [section(8, 0.3), section(30, 0.0, 0.3, inverse_gap=inverse_gap), section(20, 9.0)]
    for sections, ends, top in ((thick, ("open", "open"), 1.749), (steep, ("wall", "wall"), 8.0)):
        counts = phase.count(Profile(tuple(sections), ends), np.linspace(-0.01, top, 2000))
        assert (np.diff(counts) >= 0).all()
        assert counts[0] == 0 and counts[-1] > 2


def test_a_vanishing_tilt_is_a_flat_section():
    def levels(tilt):
        sections = (section(5, 0.25, tilt), section(8, 0.0, tilt), section(5, 0.25, tilt))
        return phase.levels(Profile(sections), 0.0, 0.24)

    for tilt in (1e-15, 1e-12, 1e-9):
        assert levels(tilt) == pytest.approx(levels(0.0), abs=20 * tilt + 1e-10)


def test_a_barely_tilted_layer_at_a_wall_keeps_the_count_rising():
    tilt = 1e-5
    outer = (10.0, 0.2, tilt), (10.0, 0.2 + 25 * tilt, tilt)
    sections = [section(*outer[0], inverse_gap=0.6), section(5, 10 * tilt, tilt, inverse_gap=0.9),
                section(4, 0.2 + 15 * tilt, tilt, inverse_gap=0.6),
                section(6, 19 * tilt, tilt, inverse_gap=0.9), section(*outer[1], inverse_gap=0.6)]
    stack = Profile(tuple(sections), ("wall", "wall"))
    counts = phase.count(stack, np.linspace(0.1995, 0.2015, 801))
    assert (np.diff(counts) >= 0).all()


def test_splittings_far_below_a_nanovolt_are_kept():
    def pair(width):
        barrier, well = section(60, 0.25, mass=0.092), section(6, 0.0)
        middle = section(width, 0.25, mass=0.092)
        return np.diff(phase.levels(Profile((barrier, well, middle, well, barrier)), 0, 0.1,
                                    tolerance=1e-17))[0]

    logs = np.log([pair(w) for w in (22.0, 26.0, 30.0)])
    assert logs[2] < np.log(1e-9)
    slopes = [b - a for a, b in pairwise(logs)]
    assert slopes[0] == pytest.approx(slopes[1], rel=1e-4)


def test_short_grades_are_said_to_be_followed():
    flat = Section(10.0, Polynomial((0.0,)), Polynomial((0.067,)))
    wall = Section(10.0, Polynomial((0.3,)), Polynomial((0.067,)))

    def grade(thickness):
        return Section(thickness, Polynomial((0.0, 0.0, 0.3 / thickness**2)), Polynomial((0.067,)))

    short = Profile((wall, flat, grade(2.0), wall))
    long = Profile((wall, flat, grade(40.0), wall))
    linear = Profile((wall, Section(2.0, Polynomial((0.3, -0.15)), Polynomial((0.067,))), wall))
    assert phase.followed(short, [0.03, 0.1]).tolist() == [True, True]
    assert phase.followed(long, [0.03, 0.1]).tolist() == [False, False]
    assert phase.followed(linear, [0.03]).tolist() == [False]  # Airy: exact, and not slices
    assert phase.followed(Profile((wall, flat, wall)), [0.03]).tolist() == [False]
