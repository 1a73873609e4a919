"""What the solver refuses at once: work that no memory holds, a tolerance below rounding."""

import pytest

import bandwright as bw
from bandwright.errors import SolveError


@pytest.mark.parametrize(
    ("middle", "more"),
    [
        ("1 mm GaAs", {"at_most": 2}),
        ("1 mm GaAs", {}),
        ("1 mm GaAs", {"field": "10 kV/cm"}),
        ("30 um GaAs", {"field": "10 kV/cm"}),
    ],
)
def test_a_unit_slip_is_said_at_once(middle, more):
    field = {k: v for k, v in more.items() if k == "field"}
    asked = {k: v for k, v in more.items() if k == "at_most"}
    line = f"20 nm Al0.3Ga0.7As, {middle}, 20 nm Al0.3Ga0.7As"
    stack = bw.parse_line(line, substrate="GaAs", **field)
    with pytest.raises(SolveError, match=r"layer 2 \(GaAs\) with .* nm: is its unit right"):
        bw.solve(stack, **asked)


def test_many_say_it_for_the_one_and_solve_the_other():
    good = bw.parse_line("20 nm AlAs, 5 nm GaAs, 20 nm AlAs", substrate="GaAs")
    slip = bw.parse_line("20 nm AlAs, 5 mm GaAs, 20 nm AlAs", substrate="GaAs")
    many = bw.solve_many([good, slip])
    assert len(many[0]) > 0
    assert isinstance(many[1], SolveError) and "is its unit right" in str(many[1])


def test_thick_layers_within_reach_are_solved():
    levels = bw.solve(
        bw.parse_line("20 nm Al0.3Ga0.7As, 2 um GaAs, 20 nm Al0.3Ga0.7As", substrate="GaAs"),
        at_most=5,
    )
    assert len(levels) == 5 and levels.complete


def test_a_tolerance_below_rounding():
    stack = bw.parse_line("20 nm AlAs, 5 nm GaAs, 20 nm AlAs", substrate="GaAs")
    with pytest.raises(SolveError, match="tolerance: got 1e-14 eV, finer than rounding"):
        bw.solve(stack, tolerance="1e-14 eV")
    assert bw.solve(stack, tolerance="1e-12 eV").complete
