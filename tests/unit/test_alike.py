"""Designs of one layout as one profile: the same numbers as each design's own profile."""

import numpy as np
import pytest

import bandwright as bw
from bandwright.profile.alike import build_alike, chosen, together
from bandwright.profile.build import build_profile
from bandwright.profile.sections import Unlike
from bandwright.solver.need import needed
from bandwright.solver.slices import cut
from bandwright.stack.layout import filled, layout

LINES = {
    "own": "20 nm {{edge {0} meV, mass 0.09, gap 1.9 eV}}, {1} nm {{edge 0 meV, mass 0.067,"
    " gap 1.5 eV}}, 20 nm {{edge {0} meV, mass 0.09, gap 1.9 eV}}",
    "literal": "20 nm Al0.{0}Ga0.{2}As, {1} nm GaAs, 22 ML Al0.{0}Ga0.{2}As",
    "lettered": "20 nm AlxGa1-xAs {{x 0.{0}}}, {1} nm GaAs, 20 nm AlxGa1-xAs {{x 0.{0}}}",
    "grade": "20 nm Al0.{0}Ga0.{2}As, {1} nm AlxGa1-xAs {{x 0.{0} to 0}}, 5 nm GaAs,"
    " {1} nm AlxGa1-xAs {{x 0 to 0.{0} quadratic}}, 20 nm Al0.{0}Ga0.{2}As",
    "group": "20 nm Al0.{0}Ga0.{2}As, 5 x ({1} nm GaAs, 2 nm Al0.{0}Ga0.{2}As),"
    " 20 nm Al0.{0}Ga0.{2}As",
    "internal field": "20 nm {{edge {0} meV, mass 0.2, field 0.02 V/nm}}, {1} nm {{edge 0 meV,"
    " mass 0.2, field -0.05 V/nm}}, 20 nm {{edge {0} meV, mass 0.2}}",
}  # fmt: skip
NUMBERS = ((31, 6.2), (28, 7.9), (35, 5.0))


def designs(kind, **around):
    around = {"substrate": "GaAs"} | around if "edge" not in LINES[kind] else around
    return [bw.parse_line(LINES[kind].format(a, b, 100 - a), **around) for a, b in NUMBERS]


def assert_same(many, alone):
    """Compare a profile of many with each design's own."""
    for index, one in enumerate(alone):
        for name in ("thickness", "edge", "slope", "mass", "inverse_gap", "lowest"):
            found, due = getattr(many.numbers, name)[:, index], getattr(one.numbers, name)
            assert np.abs(found - due).max() < 1e-14, name
        assert np.array_equal(many.numbers.flat, one.numbers.flat)
        assert np.array_equal(many.numbers.curved, one.numbers.curved)
        for row in np.flatnonzero(one.numbers.curved):
            depth = np.linspace(0.0, 1.0, 9)[:, None] * many.sections[row].thickness
            for name in ("edge", "mass", "inverse_gap"):
                due = getattr(one.sections[row], name).at(depth[:, index])
                found = getattr(many.sections[row], name).at(depth)
                found = np.broadcast_to(found, depth.shape)[:, index]
                assert np.abs(found - due).max() < 2e-14, name


TO_SURFACE = {"field": "12 kV/cm", "electrons_run": "to surface"}


@pytest.mark.parametrize("around", [{}, {"field": "12 kV/cm"}, {"bias": "0.1 V"}, TO_SURFACE])
@pytest.mark.parametrize("kind", LINES)
def test_many_are_what_each_is(kind, around):
    stacks = designs(kind, **around)
    layouts = [layout(stack) for stack in stacks]
    assert len({one.kind for one in layouts}) == 1
    many = build_alike(stacks[0], np.array([one.numbers for one in layouts]).T)
    alone = [build_profile(stack) for stack in stacks]
    assert_same(many, alone)
    assert_same(together(alone), alone)
    assert_same(chosen(many, np.array([2, 0])), [alone[2], alone[0]])


@pytest.mark.parametrize("kind", ["own", "grade", "internal field"])
def test_many_are_sliced_as_each_is(kind):
    stacks = designs(kind, field="20 kV/cm")
    many = together([build_profile(stack) for stack in stacks])
    high = np.array([0.2, 0.22, 0.25])
    counts = needed(many, high, 1e-6, many.ends)
    for index, stack in enumerate(stacks):
        own = build_profile(stack)
        assert np.array_equal(counts[:, index], needed(own, high[index], 1e-6, own.ends))
    slices = cut(many, counts[:, 0])
    one = cut(build_profile(stacks[1]), counts[:, 0])
    for name in ("start", "thickness", "edge", "mass", "inverse_gap", "drop"):
        assert np.abs(getattr(slices, name)[:, 1] - getattr(one, name)).max() < 2e-14, name


def test_filled_with_its_own_numbers_is_the_same_design():
    for kind in LINES:
        for stack in designs(kind, bias="0.1 V", electrons_run="to substrate"):
            again = build_profile(filled(stack, layout(stack).numbers))
            assert_same(together([again]), [build_profile(stack)])


def test_what_is_no_number_makes_another_layout():
    lines = (
        "20 nm Al0.3Ga0.7As, 6 nm GaAs", "20 nm Al0.3Ga0.7As, 21 ML GaAs",
        "20 nm AlAs, 6 nm GaAs", "20 nm Al0.3Ga0.7As, 6 nm InAs",
        "20 nm Al0.3Ga0.7As, 6 nm GaAs, 6 nm GaAs", "20 nm Al0.3Ga0.7As, 2 x (6 nm GaAs)",
        "20 nm AlxGa1-xAs {x 0.3 to 0.2}, 6 nm GaAs",
    )  # fmt: skip
    stacks = [bw.parse_line(line, substrate="GaAs") for line in lines]
    stacks += [stacks[0].replace(field="1 kV/cm"), stacks[0].replace(temperature="77 K"),
               stacks[0].replace(ends="wall"), stacks[0].replace(substrate=None)]  # fmt: skip
    kinds = [layout(stack).kind for stack in stacks]
    assert len(set(kinds)) == len(kinds)
    lettered = bw.parse_line("20 nm AlxGa1-xAs {x 0.3}, 6 nm GaAs", substrate="GaAs")
    assert layout(lettered) == layout(stacks[0])


def test_designs_of_different_kinds_are_not_one():
    flat = bw.parse_line("9 nm {edge 0 meV, mass 0.1}", ends="wall")
    tilted = flat.replace(field="10 kV/cm")
    with pytest.raises(Unlike, match="flat in some designs and tilted in others"):
        together([build_profile(flat), build_profile(tilted)])
    up, down = (
        bw.Stack(
            [bw.Layer("9 nm", edge=edges, mass=0.1, grading="quadratic")],
            ends="wall",
            bands="one-band",
        )
        for edges in (("1 meV", "90 meV"), ("80 meV", "10 meV"))
    )
    assert layout(up).kind == layout(down).kind
    with pytest.raises(Unlike, match="up in some designs and down in others"):
        build_alike(up, np.array([layout(up).numbers, layout(down).numbers]).T)
    for levels, stack in zip(bw.solve_many([up, down], at_most=3), (up, down), strict=True):
        assert np.array_equal(levels.energies, bw.solve(stack, at_most=3).energies)


@pytest.mark.parametrize("shape", [[("0 nm", "0 eV"), ("4 nm", "0.1 eV"), ("9 nm", "0 eV")],
                                   lambda z: 0.1 * np.cos(z / 3.0)])  # fmt: skip
def test_tables_and_callables_are_built_design_by_design(shape):
    wells = [
        bw.Stack([bw.Layer("9 nm", edge=shape, mass=mass)], ends="wall", bands="one-band")
        for mass in (0.1, 0.12)
    ]
    assert layout(wells[0]).kind == layout(wells[1]).kind
    with pytest.raises(Unlike, match="design by design"):
        build_alike(wells[0], np.array([layout(well).numbers for well in wells]).T)
    many = bw.solve_many(wells, at_most=4)
    for levels, stack in zip(many, wells, strict=True):
        assert np.allclose(levels.energies, bw.solve(stack, at_most=4).energies, atol=1e-12)
    assert many.alone == 0
