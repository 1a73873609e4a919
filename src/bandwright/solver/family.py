"""Designs of one slice pattern as one system: slices as rows, designs and energies as columns.

Each design's numbers, grid and Newton steps are those it would have alone, so that one and many
agree to rounding.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from ..profile import Origin, Profile
from ..profile.alike import chosen
from .alike import Some, find_alike
from .certificate import certify, halving_error
from .find import Asked, Found, Solvable, find, guess_levels
from .kinds import joined
from .matrix import Counts, Elements, Matrix, assemble, count_and_pivot
from .need import needed
from .slices import Slices, cut
from .solve import MOST_CELLS, MOST_KEPT_SLICES, ROUGH, SHARP, Solution, lowest_edge, tops
from .system import OpenEnd, chunks, open_ends

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]


class Family:
    """Sliced designs of one pattern between ends of one kind.

    Parameters
    ----------
    slices : Slices
        Of a profile of many designs.
    ends : (str, str)
    """

    def __init__(self, slices: Slices, ends: tuple[str, str]) -> None:
        self.slices, self.ends = slices, ends
        self.rows = len(slices)
        self.nodes = self.rows + 1 - ends.count("wall")
        self._kinds = [(rows, kind(*arrays)) for rows, kind, arrays in slices.kinds()]
        designs = np.empty(slices.thickness.shape[1])
        self._outside = [
            None if end is None else np.stack(np.broadcast_arrays(*end, designs)[:3])
            for end in open_ends(slices.profile, ends)
        ]

    def halved(self) -> Family:
        """Return the same designs on slices half as thick."""
        return Family(self.slices.halved(), self.ends)

    def count_and_pivot(self, energies: Floats, owner: Indices) -> tuple[Counts, Floats]:
        """Return how many levels of each energy's design lie below it, and K's last pivot."""
        counts, pivots = np.empty(len(energies), dtype=np.int64), np.empty(len(energies))
        for part in chunks(len(energies), self.rows):
            matrix = self._matrix(energies[part], owner[part], slopes=False)
            counts[part], pivots[part] = count_and_pivot(matrix)
        return counts, pivots

    def matrix(self, energies: Floats, owner: Indices) -> Matrix:
        """Return K of each energy's design."""
        return self._matrix(energies, owner, slopes=False)

    def matrix_and_slope(self, energies: Floats, owner: Indices) -> tuple[Matrix, Matrix]:
        """Return K of each energy's design, and its derivative by E."""
        return self._matrix(energies, owner, slopes=True).split()

    def _matrix(self, energies: Floats, owner: Indices, slopes: bool) -> Matrix:
        outside: list[Floats | None] = []
        for numbers in self._outside:
            if numbers is None:
                outside.append(None)
                continue
            end = OpenEnd(*numbers[:, owner])
            outside.append(end.value_and_slope(energies) if slopes else end.value(energies))
        return assemble(self._elements(energies, owner, slopes), *outside)

    def _elements(self, energies: Floats, owner: Indices, slopes: bool) -> Elements:
        parts = [(rows, kind(energies, slopes, owner)) for rows, kind in self._kinds]
        return joined(parts, self.rows)


@dataclass(frozen=True)
class Batch:
    """The levels of all designs of one slice pattern, and their evidence.

    Attributes
    ----------
    which : array (n_designs,)
        Index of each design among those given.
    found : Found
        Levels, design after design.
    bounds : array (n_designs + 1,)
        Where each design's levels begin in ``found``, and where the last one's end.
    error, checked : array (n_levels,)
        As in `Solution`.
    good : array of bool (n_designs,)
        Whether counts prove the design's levels and their errors are within the tolerance.
    low, high : array (n_designs,)
        Bounds of each set [eV].
    """

    which: Indices
    counts: Indices
    ends: tuple[str, str]
    found: Found
    bounds: Indices
    error: Floats
    checked: npt.NDArray[np.bool_]
    good: npt.NDArray[np.bool_]
    low: Floats
    high: Floats
    tolerance: float

    def energies(self, place: int) -> Floats:
        """Return the energies of a design [eV], by its place in this batch."""
        return self.found.energies[self.bounds[place] : self.bounds[place + 1]]

    def solution(self, place: int, origin: Origin) -> Solution:
        """Return the solution of a design, by its place in this batch and what has its profile."""
        own = slice(int(self.bounds[place]), int(self.bounds[place + 1]))
        return Solution(
            origin, self.counts, self.ends, self.found.part(own), self.error[own],
            self.checked[own], True, float(self.low[place]), float(self.high[place]),
            self.tolerance,
        )  # fmt: skip


def solve_family(
    profile: Profile, high: Floats, ends: tuple[str, str], at_most: int | None, tolerance: float
) -> Iterator[Batch]:
    """Yield the levels of many designs of one layout, those of one slice pattern at once.

    Each design is count-checked; those too large to be held are left out, those that are not good
    may come again in a later batch. What is good in none is for `solve_profile` alone.

    Parameters
    ----------
    profile : Profile
        Of many designs.
    high : array (n_designs,)
        Highest energy asked of each [eV].
    ends : (str, str)
    at_most : int, optional
        Most levels of each.
    tolerance : float
        Largest error of an energy [eV].
    """
    low = lowest_edge(profile)
    top = high
    for end in open_ends(profile, ends):
        if end is not None:  # nothing is bound above an open end's edge
            top = np.minimum(top, end.edge)
    top = np.maximum(low, top)
    if at_most is not None:
        for which, family in _families(profile, top, ROUGH, ends, at_most):
            top[which] = tops(family, low[which], top[which], at_most)
    for which, family in _families(profile, top, tolerance, ends, at_most):
        yield from _solve_pattern(which, family, low[which], top[which], at_most, tolerance)


def _families(
    profile: Profile, top: Floats, tolerance: float, ends: tuple[str, str], at_most: int | None
) -> Iterator[tuple[Indices, Family]]:
    """Yield the designs of each slice pattern, by index and as a family.

    Those too large to be held are left out: alone they say so.
    """
    counts = needed(profile, top, tolerance, ends)
    numbers = profile.numbers
    levels = guess_levels(
        numbers.thickness.T, numbers.lowest.T, numbers.mass.T, numbers.inverse_gap.T, top
    )
    kept = levels if at_most is None else np.minimum(levels, at_most)
    slices = counts.sum(axis=0)
    held = np.flatnonzero((slices <= MOST_KEPT_SLICES) & (slices * kept <= MOST_CELLS))
    patterns: dict[bytes, list[int]] = {}
    for index, pattern in zip(held.tolist(), counts.T[held], strict=True):
        patterns.setdefault(pattern.tobytes(), []).append(index)
    for key, indices in patterns.items():
        some = profile if len(indices) == len(top) else chosen(profile, np.array(indices))
        pattern = np.frombuffer(key, dtype=np.int64)
        yield np.array(indices), Family(cut(some, pattern), ends)


def _solve_pattern(
    which: Indices, family: Family, low: Floats, high: Floats, at_most: int | None,
    tolerance: float,
) -> Iterator[Batch]:  # fmt: skip
    designs, slices = len(low), family.slices
    most = np.full(designs, np.iinfo(np.int64).max if at_most is None else at_most)
    guess = guess_levels(
        slices.thickness.T, slices.edge.T, slices.mass.T, slices.inverse_gap.T, high
    )
    asked = Asked(low, high, np.zeros(designs, dtype=np.int64), most, guess)
    found = find_alike(family, asked, min(1e-3 * tolerance, SHARP))
    fine = None if slices.profile.numbers.all_flat else family.halved()
    batch = _proven(which, family, fine, asked, found, tolerance, slices.counts)
    yield batch
    left = np.flatnonzero(~batch.good)
    if len(left):  # a Newton stopped too soon is one reason: go on to rounding, as one design does
        some = Some(family, left)
        again = find(some, asked.of(left), 1e-14)
        halves = None if fine is None else Some(fine, left)
        yield _proven(which[left], some, halves, asked.of(left), again, tolerance, slices.counts)


def _proven(
    which: Indices, family: Solvable, fine: Solvable | None, asked: Asked, found: Found,
    tolerance: float, counts: Indices,
) -> Batch:  # fmt: skip
    """Return levels with their errors and counts on halved slices, None where whole are exact."""
    designs = len(which)
    error = np.zeros(len(found.numbers)) if fine is None else halving_error(fine, found)
    bounds = np.concatenate(([0], np.cumsum(np.bincount(found.owner, minlength=designs))))
    cut_short = np.diff(bounds) == asked.at_most
    last = np.append(found.energies, 0.0)[bounds[1:] - 1] + tolerance
    upper = np.where(cut_short, last, asked.high)
    proof = certify(fine or family, found, asked.low, upper, tolerance)
    good = proof.complete.copy()
    good[found.owner[3.0 * error > tolerance]] = False
    return Batch(
        which, counts, family.ends, found, bounds, error, proof.checked, good, asked.low, upper,
        tolerance,
    )  # fmt: skip
