"""Levels of one profile, to a tolerance, with the certificate that none is missing."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import numpy.typing as npt

from bandwright.errors import SolveError
from bandwright.profile import Profile
from bandwright.solver.find import Found, find
from bandwright.solver.need import MOST_SLICES, needed
from bandwright.solver.slices import cut
from bandwright.solver.states import States
from bandwright.solver.system import System, apply, chunks, solve_shifted

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

_ATTEMPTS = 12


@dataclass(frozen=True)
class Solution:
    """Levels of one profile between its ends.

    Attributes
    ----------
    system : System
        The slices the levels were found on.
    numbers : array of int
        Level numbers counted from 0 in this system.
    found : Found
        Energies [eV], states at the faces, clusters.
    error : array (n_levels,)
        Estimate of each energy's discretisation error [eV].
    count_checked : array of bool
        Whether the counts on halved slices agree around each level.
    low, high : float
        Bounds [eV] between which the set is complete if ``complete``.
    """

    system: System
    numbers: Indices
    found: Found
    error: Floats
    count_checked: npt.NDArray[np.bool_]
    complete: bool
    low: float
    high: float
    tolerance: float

    @property
    def energies(self) -> Floats:
        """Energies [eV], ascending."""
        return self.found.energies

    @cached_property
    def states(self) -> States:
        """The states of all levels."""
        return States(self.system, self.found.energies, self.found.u)

    def dipoles(self) -> Floats:
        """Return the matrix elements of z [nm], (n_levels, n_levels)."""
        return self.states.dipoles

    def sample(self, z: npt.ArrayLike) -> Floats:
        """Return u [nm^-1/2] at positions z [nm], shape (n_levels, n_points)."""
        return self.states.sample(np.asarray(z, dtype=float))[0]

    @property
    def wall_shifts(self) -> Floats:
        """How far each level moves if an outer wall moves outward [eV/nm], the larger side."""
        return self.states.wall_shifts


def solve_profile(
    profile: Profile,
    low: float | None = None,
    high: float | None = None,
    at_most: int | None = None,
    tolerance: float = 1e-6,
    ends: tuple[str, str] | None = None,
    skip: int = 0,
) -> Solution:
    """Return the levels of a profile below ``high``.

    Parameters
    ----------
    profile : Profile
    low : float, optional
        Where the search starts [eV]; default below the lowest edge.
    high : float
        Where it ends [eV].
    at_most : int, optional
        Most levels returned, counted from the lowest one returned.
    tolerance : float
        Largest error of an energy [eV].
    ends : (str, str), optional
        Instead of the profile's own.
    skip : int
        Levels left out from below (bound levels found elsewhere).

    Raises
    ------
    SolveError
        If the tolerance is not reached, or an end is of a kind not solved yet.
    """
    ends = ends or profile.ends
    if "periodic" in ends:
        raise SolveError("ends = 'periodic' is not solved yet; use 'open' or 'wall'")
    if high is None:
        raise SolveError("the highest energy asked is missing; give high")
    floor = lowest_edge(profile) if low is None else low
    high = max(high, floor + tolerance)
    numbers, top = _wanted(System(cut(profile, needed(profile, high, 1e-4)), ends),
                           floor, high, at_most, skip)  # fmt: skip
    counts = needed(profile, top, tolerance)
    flat = np.array([s.flat for s in profile.sections])
    for _ in range(_ATTEMPTS):
        if counts.sum() > MOST_SLICES:
            break
        system = System(cut(profile, counts), ends)
        fine = system.halved()
        first, last = system.count([floor, top])
        numbers = np.arange(max(skip, first), last)
        if at_most is not None:
            numbers = numbers[:at_most]
        found = find(system, numbers, floor, top)
        error = np.zeros(len(numbers)) if flat.all() else _halving_error(fine, found)
        worst = float(np.max(error, initial=0.0))
        if worst <= 0.5 * tolerance:
            return _certified(system, fine, numbers, found, error, floor, top, high, tolerance)
        grow = max(1.3, 1.15 * (worst / (0.4 * tolerance)) ** (1 / 6))
        counts = np.where(flat, counts, np.ceil(counts * min(grow, 4.0)).astype(np.int64))
    raise SolveError(
        f"{len(counts)} sections need more than {int(counts.sum())} slices for a tolerance of"
        f" {tolerance:g} eV; is there a jump or kink inside a layer's shape? Split the layer"
        " there, or ask for a coarser tolerance"
    )


def lowest_edge(profile: Profile) -> float:
    """Return an energy [eV] below every level: the lowest edge, less a hair."""
    least = np.inf
    for section in profile.sections:
        points = np.linspace(0.0, section.thickness, 3 if section.tilted else 65)
        values = section.edge.at(points)
        least = min(least, float(values.min()))
        if not section.tilted:
            least -= float(np.max(np.abs(np.diff(values)))) * 0.25
    return least - 1e-9


def _wanted(
    system: System, low: float, high: float, at_most: int | None, skip: int
) -> tuple[Indices, float]:
    """Return the numbers of the levels asked, and an energy just above the last of them."""
    first, last = (int(n) for n in system.count([low, high]))
    numbers = np.arange(max(skip, first), last)
    if at_most is None or len(numbers) <= at_most:
        return numbers, high
    numbers = numbers[:at_most]
    bottom, top = low, high
    while top - bottom > 0.02 * (top - low):
        middle = 0.5 * (bottom + top)
        if system.count([middle])[0] > numbers[-1] + 1:
            top = middle
        else:
            bottom = middle
    return numbers, top


def _halving_error(fine: System, found: Found) -> Floats:
    """Estimate each error from one Rayleigh step on slices half as thick (factor 64/63)."""
    error = np.empty(len(found.energies))
    for part in chunks(len(error), len(fine.slices.thickness)):
        matrix, slope = fine.matrix_and_slope(found.energies[part])
        z = _refine(fine, found.u[:, part], matrix.diagonal.shape[0])
        for _ in range(2):
            z /= np.max(np.abs(z), axis=0)
            r = apply(slope, z)
            z = solve_shifted(matrix, r)
        error[part] = np.abs(np.sum(z * r, axis=0) / np.sum(z * apply(slope, z), axis=0))
    return error * 64.0 / 63.0


def _refine(fine: System, u: Floats, nodes: int) -> Floats:
    """Carry u at the coarse faces to the free faces of halved slices, midpoints by the mean."""
    full = np.empty((2 * len(u) - 1, u.shape[1]))
    full[::2] = u
    full[1::2] = 0.5 * (u[:-1] + u[1:])
    start = int(fine.ends[0] == "wall")
    return full[start : start + nodes]


def _certified(
    system: System, fine: System, numbers: Indices, found: Found, error: Floats,
    low: float, top: float, high: float, tolerance: float,
) -> Solution:  # fmt: skip
    """Count on halved slices below and above each level or cluster, and at both bounds."""
    energies = found.energies
    cut_short = top < high  # at_most: levels above the last one are known and left out
    upper = float(energies[-1] + tolerance) if cut_short and len(energies) else high
    at_low, under, over = fine.count([low, upper - tolerance, upper + tolerance])
    past = numbers[-1] + 1 if len(numbers) else at_low
    bounded = at_low <= (numbers[0] if len(numbers) else past) and under <= past <= over
    if not len(energies):
        return Solution(system, numbers, found, error, np.zeros(0, dtype=bool),
                        bool(bounded), low, upper, tolerance)  # fmt: skip
    starts = np.concatenate(([True], np.diff(energies) > 2.0 * tolerance))
    group = np.cumsum(starts) - 1
    firsts = np.flatnonzero(starts)
    lasts = np.concatenate((firsts[1:], [len(energies)])) - 1
    below = fine.count(energies[firsts] - tolerance)
    above = fine.count(energies[lasts] + tolerance)
    good = (below == numbers[firsts]) & (above == numbers[lasts] + 1)
    checked = good[group]
    complete = bool(checked.all() and bounded)
    return Solution(system, numbers, found, error, checked, complete, low, upper, tolerance)


def with_ends(profile: Profile, ends: tuple[str, str]) -> Profile:
    """Return the profile between other ends."""
    return replace(profile, ends=ends)
