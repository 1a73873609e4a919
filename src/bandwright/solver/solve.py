"""Levels of one profile, to a tolerance, with the certificate that none is missing."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from ..errors import SolveError
from ..profile import Origin, Profile, Ready
from .certificate import certify, halving_error
from .find import Asked, Found, Solvable, find, guess_levels
from .need import MOST_SLICES, needed
from .polish import polish
from .slices import Slices, cut
from .states import States
from .system import System, open_ends

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

_ATTEMPTS = 12
#: most slices of a first attempt, and most slices times levels (80 MB an array)
MOST_KEPT_SLICES, MOST_CELLS = 150_000, 10_000_000
#: states of levels farther apart than this [eV] are told apart
NEAREST = 1e-7
# ... to this part of each other at a tolerance of 1e-9 eV
_MIXED = 1e-5
#: an energy with so many levels more than asked below it is near enough to cut for
_NEAR = 3
#: how well zeros of K are met at most [eV], so that other ways to the same level agree to 1e-10 eV
SHARP = 2e-11
#: tolerance [eV] of the slices on which the energy to cut for is looked up
ROUGH = 1e-4


@dataclass(frozen=True)
class Solution:
    """Levels of one profile between its ends.

    Attributes
    ----------
    origin : Origin
        Whatever has the profile.
    counts : array (n_sections,)
        Slices a section.
    ends : (str, str)
    found : Found
        Numbers from 0, energies [eV] and rough states.
    error : array (n_levels,)
        Estimate of each energy's discretisation error [eV].
    count_checked : array of bool
        Whether the counts on halved slices agree around each level.
    complete : bool
        Whether they agree at the bounds as well.
    low, high : float
        Bounds [eV] between which the set is complete if ``complete``.
    """

    origin: Origin
    counts: Indices
    ends: tuple[str, str]
    found: Found
    error: Floats
    count_checked: npt.NDArray[np.bool_]
    complete: bool
    low: float
    high: float
    tolerance: float

    @cached_property
    def system(self) -> System:
        """The slices the levels were found on."""
        return System.of(cut(self.origin.profile, self.counts), self.ends)

    @property
    def numbers(self) -> Indices:
        """Level numbers, counted from 0 in this system."""
        return self.found.numbers

    @property
    def energies(self) -> Floats:
        """Energies [eV], ascending."""
        return self.found.energies

    @cached_property
    def states(self) -> States:
        """The states of all levels.

        Levels near each other mix by their energies' error over their distance; where that is too
        much for the tolerance asked, the states are those of a finer solve.
        """
        finer = self._finer()
        if finer is not None:
            return States(finer.system, *polish(finer.system, finer.found))
        return States(self.system, *polish(self.system, self.found))

    def _finer(self) -> Solution | None:
        gaps = np.diff(self.energies)
        close = float(np.min(gaps, initial=1.0, where=gaps > NEAREST))
        aim = max(close * _MIXED * np.sqrt(max(self.tolerance / 1e-9, 1.0)), 3e-13)
        if aim > float(self.error.max(initial=0.0)):
            return None
        finer = solve_profile(
            self.origin.profile, self.low, self.high, len(self.energies), aim, self.ends,
            int(self.numbers[0]),
        )  # fmt: skip
        return finer if len(finer.energies) == len(self.energies) else None

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
    outside = open_ends(profile, ends)
    edges = [float(end.edge) for end in outside if end is not None]
    top = high = max(floor, min([high, *edges]))  # nothing is bound above an open end's edge
    if at_most is not None:
        count = needed(profile, high, ROUGH, ends)
        refuse_huge(profile, count, high, at_most)
        rough = System(cut(profile, count), ends, outside)
        top = float(tops(rough, np.array([floor]), np.array([high]), at_most + skip)[0])
    counts = needed(profile, top, tolerance, ends)
    refuse_huge(profile, counts, top, at_most)
    flat = profile.numbers.flat
    exact = profile.numbers.all_flat
    accuracy = min(1e-3 * tolerance, SHARP)
    size, before = int(counts.sum()), np.inf
    for _ in range(_ATTEMPTS):
        if counts.sum() > MOST_SLICES:
            break
        system = System(cut(profile, counts), ends, outside)
        fine = system if exact else system.halved()
        found = find(system, asked_of(system.slices, floor, top, skip, at_most), accuracy)
        error = np.zeros(len(found.numbers)) if exact else halving_error(fine, found)
        worst = float(error.max(initial=0.0))
        if 3.0 * worst <= tolerance:
            cut_short = at_most is not None and len(found.numbers) == at_most
            bound = float(found.energies[-1]) + tolerance if cut_short else high
            proof = certify(fine, found, np.array([floor]), np.array([bound]), tolerance)
            if proof.complete[0] or accuracy < 1e-13:
                return Solution(Ready(profile), counts, ends, found, error, proof.checked,
                                bool(proof.complete[0]), floor, bound, tolerance)  # fmt: skip
            accuracy = 1e-14  # a Newton stopped too soon would show here: go on to rounding
            continue
        if counts.sum() > 4 * size and worst > 0.2 * before:
            break  # four times the slices for a fifth of the error: no smooth shape does that
        if counts.sum() > 4 * size:
            size, before = int(counts.sum()), worst
        grow = max(1.3, 1.15 * (worst / (0.25 * tolerance)) ** (1 / 6))
        counts = np.where(flat, counts, np.ceil(counts * min(grow, 4.0)).astype(np.int64))
    raise SolveError(
        f"{len(counts)} sections need more than {int(counts.sum())} slices for a tolerance of"
        f" {tolerance:g} eV; is there a jump or kink inside a layer's shape? Split the layer"
        " there, or ask for a coarser tolerance"
    )


def refuse_huge(profile: Profile, counts: Indices, high: float, at_most: int | None) -> None:
    """Raise `SolveError` before work that no memory holds, as for a thickness in a wrong unit."""
    slices = int(counts.sum())
    if slices * slices <= MOST_CELLS:  # a slice holds at most two thirds of a level
        return
    numbers = profile.numbers
    levels = int(guess_levels(numbers.thickness, numbers.lowest, numbers.mass,
                              numbers.inverse_gap, high)[0])  # fmt: skip
    kept = min(levels, at_most or levels)
    if slices <= MOST_KEPT_SLICES and slices * kept <= MOST_CELLS:
        return
    thickest = int(np.argmax(numbers.thickness))
    raise SolveError(
        f"about {kept:,} levels on {slices:,} slices are more than can be held; the thickest layer"
        f" is {profile.name(thickest)} with {numbers.thickness[thickest]:,.6g} nm: is its unit"
        " right? If so, lower below, or give at_most"
    )


def asked_of(slices: Slices, low: float, high: float, skip: int, at_most: int | None) -> Asked:
    """Return what is asked of one design, as `find` takes it."""
    guess = guess_levels(slices.thickness, slices.edge, slices.mass, slices.inverse_gap, high)
    most = np.iinfo(np.int64).max if at_most is None else at_most
    return Asked(np.array([low]), np.array([high]), np.array([skip]), np.array([most]), guess)


def lowest_edge(profile: Profile) -> Any:
    """Return an energy [eV] below every level: the lowest edge, less a hair; or each design's."""
    numbers = profile.numbers
    least = numbers.lowest.min(axis=0)
    for index in np.flatnonzero(numbers.curved):
        section = profile.sections[index]
        values = section.edge.at(np.linspace(0.0, section.thickness, 65))
        steps = np.abs(np.diff(values, axis=0)).max(axis=0)
        least = np.minimum(least, values.min(axis=0) - 0.25 * steps)
    return least - 1e-9 if profile.designs else float(least) - 1e-9


def tops(system: Solvable, low: Floats, high: Floats, wanted: int) -> Floats:
    """Return an energy not far above each design's level of this number, or its ``high``."""
    designs = np.arange(len(low))
    part = np.arange(33) / 32.0
    for _ in range(2):
        trial = low[:, None] + (high - low)[:, None] * part
        counts = system.count_and_pivot(trial.reshape(-1), np.repeat(designs, len(part)))[0]
        counts = counts.reshape(trial.shape)
        above = counts > wanted
        place = np.where(above.any(axis=1), np.argmax(above, axis=1), len(part) - 1)
        place = np.maximum(place, 1)
        crowded = counts[designs, place] > wanted + _NEAR
        high = trial[designs, place]
        if not crowded.any():
            break
        low = np.where(crowded, trial[designs, place - 1], high)
    return high
