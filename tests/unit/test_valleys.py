"""Edges at X and L along a profile."""

import numpy as np
import pytest

import bandwright as bw
from bandwright.formula import parse
from bandwright.profile.build import build_profile
from bandwright.profile.valleys import valleys


def found(line, **arguments):
    stack = bw.parse_line(line, **arguments)
    profile = build_profile(stack)
    return valleys(stack, profile), profile


def test_both_edges_are_those_of_the_materials_from_the_same_zero():
    side, profile = found("9 nm AlAs, 5 nm GaAs, 9 nm AlAs", zero="GaAs")
    library = bw.Library.shipped()
    zero = library.properties(parse("GaAs"), 300.0).edge
    for section, name in enumerate(("AlAs", "GaAs", "AlAs")):
        point = library.properties(parse(name), 300.0)
        here = side.section == section
        assert side.x_edge[here] == pytest.approx(point.x_edge - zero)
        assert side.l_edge[here] == pytest.approx(point.l_edge - zero)
        assert side.edge[here] == pytest.approx(point.edge - zero)
    assert side.position[[0, -1]].tolist() == [0.0, profile.thickness]


def test_they_run_with_the_field():
    flat, _ = found("9 nm AlAs, 5 nm GaAs, 9 nm AlAs", zero="GaAs")
    tilted, _ = found("9 nm AlAs, 5 nm GaAs, 9 nm AlAs", zero="GaAs", field="100 kV/cm")
    assert tilted.x_edge - flat.x_edge == pytest.approx(0.01 * flat.position)


def test_they_follow_a_grade_whichever_face_it_is_flat_at():
    for ends in ("0.6 to 0.1", "0.1 to 0.6"):
        side, _ = found(
            f"5 nm GaAs, 8 nm AlxGa1-xAs {{x {ends}, grading quadratic}}, 5 nm GaAs", zero="GaAs"
        )
        here = side.section == 1
        # the composition that the solved edge has tells the X edge to expect
        x = np.linspace(0.1, 0.6, 4001)
        along = bw.Library.shipped().properties(parse("AlxGa1-xAs", x=x), 300.0)
        zero = bw.Library.shipped().properties(parse("GaAs"), 300.0).edge
        expected = np.interp(side.edge[here], along.edge - zero, along.x_edge - zero)
        assert side.x_edge[here] == pytest.approx(expected, abs=1e-6)


def test_copies_and_strain():
    side, profile = found("9 nm AlAs, 3 x (4 nm In0.2Ga0.8As, 3 nm AlAs)", substrate="GaAs")
    assert len(np.unique(side.section)) == len(profile.sections) == 7
    wells = [side.x_edge[side.section == n][0] for n in (1, 3, 5)]
    assert wells == pytest.approx([wells[0]] * 3)
    free, _ = found("9 nm AlAs, 3 x (4 nm In0.2Ga0.8As, 3 nm AlAs)", zero="GaAs")
    held, _ = found("9 nm AlAs, 3 x (4 nm In0.2Ga0.8As, 3 nm AlAs)", zero="GaAs", substrate="GaAs")
    assert held.x_edge == pytest.approx(free.x_edge)  # not shifted by strain
    assert abs(held.edge - free.edge).max() > 0.01  # as Gamma is


def test_own_numbers_have_none():
    side, _ = found("9 nm {edge 200 meV, mass 0.1}, 5 nm {edge 0 meV, mass 0.067}")
    assert np.isnan(side.x_edge).all() and np.isnan(side.l_edge).all()
