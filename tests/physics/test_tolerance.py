"""What a caller may ask of one search: tolerances, a part of the spectrum, levels at an edge."""

import numpy as np
import pytest

from bandwright.errors import SolveError
from bandwright.profile import Polynomial, Profile, Sampled, Section
from bandwright.solver import solve_profile
from physics.build import flat, profile
from physics.dense import count, levels
from physics.randomstacks import random_case

CURVED = [
    ("quadratic", "two-band", 3), ("error-function", "two-band", 2), ("field", "two-band", 1),
    ("linear", "one-band", 4), ("points", "two-band", 3), ("clamped", "two-band", 2),
]  # fmt: skip


@pytest.mark.parametrize("which", CURVED)
def test_every_tolerance_is_kept(which):
    """1e-3 to 1e-10 eV; the reference itself is good to 1e-12."""
    case = random_case(*which)
    wanted = levels(case.profile, case.high).energies
    assert len(wanted)
    errors = []
    for tolerance in (1e-3, 1e-4, 1e-6, 1e-8, 1e-10):
        gaps = np.diff(wanted, append=case.high)
        high = wanted[-1] + 0.4 * gaps[-1] if gaps[-1] > 4 * tolerance else case.high
        found = solve_profile(case.profile, high=high, tolerance=tolerance)
        if len(found.energies) == len(wanted):
            errors.append(np.abs(found.energies - wanted).max())
        else:  # one more or less only within the tolerance of the bound
            assert gaps[-1] < 4 * tolerance
            continue
        assert errors[-1] < tolerance
        assert found.count_checked.all()
    print(f"{case}: errors {[f'{e:.1e}' for e in errors]}")
    assert errors[-1] < 1e-10


WALLS = ("wall", "wall")


def curve(function):
    return Profile((Section(9.0, Sampled(function), Polynomial((0.067,))),), WALLS)


@pytest.mark.parametrize("place", [3.217, 4.5, 3.14159, 7.77])
def test_a_jump_hidden_in_a_callable_is_refused(place):
    """It can't be cut where it is: an error that says where, never a silent wrong number."""
    hidden = curve(lambda s: np.where(s < place, 0.0, 0.31))
    with pytest.raises(SolveError, match=rf"jumps by 0\.31 about {place} nm"):
        solve_profile(hidden, high=0.6, tolerance=1e-6)


@pytest.mark.parametrize("place", [3.217, 4.5, np.pi])
def test_a_kink_hidden_in_a_callable_is_an_error_or_a_right_level(place):
    """Continuous, its slope jumps: more slices help, the sixth order is lost."""
    known = profile(
        Section(place, Polynomial((0.0,)), Polynomial((0.067,))),
        Section(9.0 - place, Polynomial((0.0, 0.08)), Polynomial((0.067,))), ends=WALLS,
    )  # fmt: skip
    hidden = curve(lambda s: 0.08 * np.maximum(s - place, 0.0))
    try:
        found = solve_profile(hidden, high=0.7, tolerance=1e-6)
    except SolveError as error:
        assert "jump or kink inside a layer's shape" in str(error)
    else:
        assert np.abs(found.energies - levels(known, 0.7).energies).max() < 1e-6


@pytest.mark.parametrize("width", [0.3, 0.1, 0.03])
@pytest.mark.parametrize("place", [3.217, 4.5])
def test_a_steep_but_smooth_callable_is_solved(place, width):
    """Interfaces of one atom's width and less are no jumps."""
    steep = curve(lambda s: 0.155 * (1 + np.tanh((s - place) / width)))
    found = solve_profile(steep, high=0.6, tolerance=1e-8)
    wanted = levels(steep, 0.6)
    assert len(found.energies) == len(wanted.energies) > 1
    assert np.abs(found.energies - wanted.energies).max() < 1e-8


@pytest.mark.parametrize("which", [("coupled", "one-band", 1), ("polar", "two-band", 5)])
def test_parts_of_a_spectrum(which):
    case = random_case(*which)
    whole = solve_profile(case.profile, high=case.high, tolerance=1e-9).energies
    number = len(whole)
    assert number > 6
    for most in (1, 3, number, number + 5):
        some = solve_profile(case.profile, high=case.high, at_most=most, tolerance=1e-9)
        assert len(some.energies) == min(most, number)
        assert np.abs(some.energies - whole[:most]).max() < 2e-9
        assert some.count_checked.all()
        assert some.complete
    wide = int(np.argmax(np.diff(whole)))
    low = 0.5 * (whole[wide] + whole[wide + 1])
    rest = solve_profile(case.profile, low=low, high=case.high, tolerance=1e-9)
    assert np.abs(rest.energies - whole[wide + 1 :]).max(initial=0.0) < 2e-9
    later = solve_profile(case.profile, high=case.high, skip=2, at_most=3, tolerance=1e-9)
    assert np.abs(later.energies - whole[2:5]).max() < 2e-9


@pytest.mark.parametrize("gaps", [(None, None), (1.5, 1.9)])
@pytest.mark.parametrize("under", [1e-4, 1e-6, 1e-8])
def test_level_just_under_an_open_edge(under, gaps):
    """The well is trimmed until its second level lies a hair under the edge; tails of 100s of nm.

    Just above the width at which it appears, the depth grows as the square of the excess width.
    """
    def well(width):
        outer = flat(2.0, 0.25, 0.092, gaps[1])
        return profile(outer, flat(width, 0.0, 0.067, gaps[0]), outer)

    low, high = 4.0, 6.0
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (low, middle) if count(well(middle), 0.25 - under) > 1 else (middle, high)
    found = solve_profile(well(high), high=0.25 - 0.1 * under, tolerance=1e-10)
    assert len(found.energies) == 2
    assert found.complete
    assert abs(found.energies[1] - (0.25 - under)) < 1e-10
    wanted = levels(well(high), 0.25 - 0.1 * under)
    both = np.abs(found.dipoles()), np.abs(wanted.dipoles())
    assert abs(both[0][0, 1] - both[1][0, 1]) < 1e-4
    assert np.isfinite(both[0]).all()


@pytest.mark.parametrize("ends", [("open", "open"), ("wall", "open"), ("wall", "wall")])
def test_no_level_is_an_answer(ends):
    case = profile(flat(2.0, 0.25, 0.092), flat(1.0, 0.0, 0.067), flat(2.0, 0.25, 0.092), ends=ends)
    found = solve_profile(case, high=0.05)
    assert len(found.energies) == 0
    assert found.complete
    assert found.dipoles().shape == (0, 0)
    assert found.sample(np.array([0.5, 1.0])).shape == (0, 2)
    assert found.wall_shifts.shape == (0,)
    assert found.states.probabilities.shape == (0, 3)
