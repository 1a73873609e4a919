"""Designs of one slice pattern as one system: slices as rows, designs and energies as columns.

Each design's numbers, grid and Newton steps are those it would have alone, so that one and many
agree to rounding.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
import numpy.typing as npt

from ..errors import SolveError
from ..profile import Profile
from .certificate import certify, halving_error
from .find import Asked, Found, find, guess_levels
from .kinds import Kind, joined
from .matrix import Counts, Elements, Matrix, assemble, count_and_pivot
from .need import needed
from .slices import Slices, cut
from .solve import ROUGH, Solution, lowest_edge, refuse_huge, tops
from .system import OpenEnd, System, chunks, open_ends

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]


class Family:
    """Sliced designs of one pattern between ends of one kind.

    Parameters
    ----------
    members : sequence of Slices
        All of the same number of slices, of the same kinds row by row.
    ends : (str, str)
    """

    def __init__(self, members: Sequence[Slices], ends: tuple[str, str]) -> None:
        self.members, self.ends = members, ends
        first = members[0]
        self.rows = len(first)
        self.nodes = self.rows + 1 - ends.count("wall")
        kinds = [member.kinds() for member in members]
        self._kinds: list[tuple[Indices | None, Kind]] = []
        for same in zip(*kinds, strict=True):
            rows, kind, _ = same[0]
            arrays = zip(*(numbers for _, _, numbers in same), strict=True)
            self._kinds.append((rows, kind(*(np.concatenate(a, axis=-1) for a in arrays))))
        outside = [open_ends(m.profile, ends) for m in members]
        self._outside = [
            None if same[0] is None else np.array(same).T for same in zip(*outside, strict=True)
        ]

    def halved(self) -> Family:
        """Return the same designs on slices half as thick."""
        return Family([member.halved() for member in self.members], self.ends)

    def count_and_pivot(self, energies: Floats, owner: Indices) -> tuple[Counts, Floats]:
        """Return how many levels of each energy's design lie below it, and K's last pivot."""
        counts, pivots = np.empty(len(energies), dtype=np.int64), np.empty(len(energies))
        for part in chunks(len(energies), self.rows):
            matrix = self._matrix(energies[part], owner[part], slopes=False)
            counts[part], pivots[part] = count_and_pivot(matrix)
        return counts, pivots

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


def solve_family(
    profiles: Sequence[Profile], high: Sequence[float], ends: tuple[str, str],
    at_most: int | None, tolerance: float,
) -> list[Solution | None]:  # fmt: skip
    """Return the levels of profiles of one layout, all solved at once and each count-checked.

    Parameters
    ----------
    profiles : sequence of Profile
        All of the same number of sections, flat, linear and curved alike.
    high : sequence of float
        Highest energy asked of each [eV].
    ends : (str, str)
    at_most : int, optional
        Most levels of each.
    tolerance : float
        Largest error of an energy [eV].

    Returns
    -------
    list
        None for a design that one pass leaves unchecked: it is for `solve_profile` alone.
    """
    results: list[Solution | None] = [None] * len(profiles)
    low = np.array([lowest_edge(profile) for profile in profiles])
    edges = [
        [end.edge for end in open_ends(profile, ends) if end is not None] for profile in profiles
    ]
    top = np.array([max(a, min([h, *e])) for a, h, e in zip(low, high, edges, strict=True)])
    if at_most is not None:
        counts = _counts(profiles, top, ROUGH, ends, at_most)
        for indices, family in _families(profiles, counts, ends):
            top[indices] = tops(family, low[indices], top[indices], at_most)
    counts = _counts(profiles, top, tolerance, ends, at_most)
    for indices, family in _families(profiles, counts, ends):
        solved = _solve_pattern(family, low[indices], top[indices], at_most, tolerance)
        for i, solution in zip(indices, solved, strict=True):
            results[i] = solution
    return results


def _counts(
    profiles: Sequence[Profile], top: Floats, tolerance: float, ends: tuple[str, str],
    at_most: int | None,
) -> list[Indices | None]:  # fmt: skip
    """Return each design's slices a section; None if it is too large, as it will say alone."""
    counts: list[Indices | None] = []
    for profile, high in zip(profiles, top.tolist(), strict=True):
        count = needed(profile, high, tolerance, ends)
        try:
            refuse_huge(profile, count, high, at_most)
            counts.append(count)
        except SolveError:
            counts.append(None)
    return counts


def _families(
    profiles: Sequence[Profile], counts: Sequence[Indices | None], ends: tuple[str, str]
) -> Iterator[tuple[list[int], Family]]:
    """Yield the designs of each slice pattern, by index and as a family."""
    patterns: dict[bytes, list[int]] = {}
    for index, count in enumerate(counts):
        if count is not None:
            patterns.setdefault(count.tobytes(), []).append(index)
    for key, indices in patterns.items():
        pattern = np.frombuffer(key, dtype=np.int64)
        yield indices, Family([cut(profiles[i], pattern) for i in indices], ends)


def _solve_pattern(
    family: Family, low: Floats, high: Floats, at_most: int | None, tolerance: float
) -> list[Solution | None]:
    designs = len(low)
    most = np.full(designs, np.iinfo(np.int64).max if at_most is None else at_most)
    guess = np.array(
        [
            guess_levels(m.thickness, m.edge, m.mass, m.inverse_gap, float(h))[0]
            for m, h in zip(family.members, high, strict=True)
        ]
    )
    asked = Asked(low, high, np.zeros(designs, dtype=np.int64), most, guess)
    found = find(family, asked, min(1e-3 * tolerance, 1e-9))
    exact = family.members[0].profile.numbers.all_flat
    fine = family if exact else family.halved()
    error = np.zeros(len(found.numbers)) if exact else halving_error(fine, found)
    bounds = np.concatenate(([0], np.cumsum(np.bincount(found.owner, minlength=designs))))
    cut_short = np.diff(bounds) == most
    last = np.append(found.energies, 0.0)[bounds[1:] - 1] + tolerance
    upper = np.where(cut_short, last, high)
    proof = certify(fine, found, low, upper, tolerance)
    results: list[Solution | None] = []
    for i in range(designs):
        own = slice(bounds[i], bounds[i + 1])
        if not proof.complete[i] or 3.0 * error[own].max(initial=0.0) > tolerance:
            results.append(None)
            continue
        alone = np.zeros(bounds[i + 1] - bounds[i], dtype=np.int64)
        mine = Found(
            found.numbers[own], found.energies[own], found.nodes[:, own], found.single[own], alone
        )
        results.append(
            Solution(
                System.of(family.members[i], family.ends), mine, error[own], proof.checked[own],
                True, float(low[i]), float(upper[i]), tolerance,
            )
        )  # fmt: skip
    return results
