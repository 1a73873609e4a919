"""Levels of the phase integral by their number, from the count of its own matrix alone."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from ..profile import Profile
from ..solver.matrix import assemble, count_below
from ..solver.search import bisect_by_count
from .sections import Plan

Floats = npt.NDArray[np.float64]
Counts = npt.NDArray[np.int64]


def exact(profile: Profile) -> bool:
    """Return whether every section is flat: phase integral and shooting are then one matrix.

    Examples
    --------
    >>> from bandwright.profile import Polynomial, Profile, Section
    >>> flat = Section(5.0, Polynomial((0.1,)), Polynomial((0.067,)))
    >>> exact(Profile((flat,)))
    True
    """
    return all(section.flat for section in profile.sections)


def followed(profile: Profile, energies: npt.ArrayLike,
             ends: tuple[str, str] | None = None) -> npt.NDArray[np.bool_]:
    """Return whether all curved stretches are too short for a phase at each energy.

    They are then followed by slices, much as shooting does, and an agreement of both methods is
    little evidence. False where every section is exact anyway, see `exact`.

    Parameters
    ----------
    profile : Profile
    energies : array_like
        Energies [eV].
    ends : tuple of str, optional
        Instead of the profile's own.
    """
    return Plan(profile, ends).followed(np.atleast_1d(np.asarray(energies, dtype=float)))


def _counter(plan: Plan, phase_order: int, energies: Floats) -> Counts:
    energies = np.atleast_1d(np.asarray(energies, dtype=float))
    total = np.empty(energies.shape, dtype=np.int64)
    for first in range(0, len(energies), 64):  # bounds the memory of the action integrals
        part = energies[first:first + 64]
        matrix = assemble(plan.elements(part, phase_order), *plan.outside(part))
        total[first:first + 64] = count_below(matrix)
    return total


def count(profile: Profile, energies: npt.ArrayLike, ends: tuple[str, str] | None = None,
          phase_order: int = 1) -> Counts:
    """Return how many phase-integral levels lie below each energy, shape (n_energies,).

    Parameters
    ----------
    profile : Profile
    energies : array_like
        Energies [eV].
    ends : tuple of str, optional
        ``"open"`` or ``"wall"`` for each end, instead of the profile's own.
    phase_order : int
        1, or 2 for the next correction on curved sections.

    Raises
    ------
    SolveError
        If an end is ``"periodic"``.
    """
    return _counter(Plan(profile, ends), phase_order, np.asarray(energies, dtype=float))


def levels(profile: Profile, low: float, high: float, numbers: npt.ArrayLike | None = None,
           ends: tuple[str, str] | None = None, phase_order: int = 1,
           at_most: int | None = None, tolerance: float = 1e-11) -> Floats:
    """Return the phase-integral levels between two energies [eV].

    Parameters
    ----------
    profile : Profile
    low, high : float
        Bounds [eV].
    numbers : array of int, optional
        Which levels, the lowest of the whole profile being 0. All between the bounds if absent.
    ends : tuple of str, optional
        ``"open"`` or ``"wall"`` for each end, instead of the profile's own.
    phase_order : int
        1, or 2 for the next correction on curved sections (Dunham, Phys. Rev. 41, 713, 1932).
    at_most : int, optional
        Return no more than this many.
    tolerance : float
        Width of the last bracket [eV].

    Returns
    -------
    ndarray, shape (n_levels,)
        Energies [eV]; nan where the method has no level of that number between the bounds.

    Raises
    ------
    SolveError
        If an end is ``"periodic"``.

    Examples
    --------
    A 10 nm box of mass 0.067 between walls:

    >>> from bandwright.profile import Polynomial, Profile, Section
    >>> box = Section(10.0, Polynomial((0.0,)), Polynomial((0.067,)))
    >>> levels(Profile((box,), ("wall", "wall")), 0.0, 0.3).round(4)
    array([0.0561, 0.2245])
    """
    plan = Plan(profile, ends)
    below, above = (int(n) for n in _counter(plan, phase_order, np.array([low, high])))
    wanted = np.arange(below, above) if numbers is None else np.asarray(numbers, dtype=np.int64)
    if at_most is not None:
        wanted = wanted[:at_most]
    found = np.full(wanted.shape, np.nan)
    there = (wanted >= below) & (wanted < above)
    if there.any():
        a, b = bisect_by_count(lambda e: _counter(plan, phase_order, e), wanted[there], low, high,
                               tolerance)
        found[there] = 0.5 * (a + b)
    return found
