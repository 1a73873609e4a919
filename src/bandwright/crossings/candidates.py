"""A coarse sweep -> pairs of levels that may exchange their character, and between which designs.

Two levels of slopes that differ by s, coupled by half a splitting S0, are
sqrt(S0^2 + s^2 (x - x0)^2) apart: the square of the spacing is a parabola. Three designs give it,
and with it the half-width S0/s within which the states mix.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import cached_property
from itertools import combinations
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..following import Tracked, along, overlaps
from ..levels import Levels

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: how many half-widths before and after the middle characters are compared: far enough for half
#: of the whole exchange, and no nearer to the anticrossings with further levels than need be
REACH = 1.0
#: least exchange of character that a range must be able to show: a rotation of the states by
#: pi/8, or half as much where their middle lies at its end
LEAST, LEAST_AT_END = (float(np.sin(np.pi / n) ** 2) for n in (8, 16))
#: share of the two-level formula's exchange that is asked of a refined anticrossing, and of one
#: judged by the coarse sweep's own designs
SHARE, COARSE = 0.6, 0.3


class Bend(NamedTuple):
    """The two-level formula through three designs: middle, slope of the spacing, splitting."""

    middle: float
    slope: float
    splitting: float

    @property
    def width(self) -> float:
        """Distance from the middle at which the spacing has grown by the root of two."""
        return self.splitting / self.slope

    def exchange(self, low: float, high: float) -> float:
        """Return the exchange of character that the formula gives between two values."""
        before, after = (np.arctan2(value - self.middle, self.width) for value in (low, high))
        return float(np.sin(0.5 * (after - before)) ** 2)

    def window(self, low: float, high: float, reach: float = REACH) -> tuple[float, float]:
        """Return values so many half-widths before and after the middle, within a range."""
        apart = reach * self.width
        before, after = np.clip([self.middle - apart, self.middle + apart], low, high)
        return float(before), float(after)


def bend(values: Sequence[float] | Floats, spacings: Sequence[float] | Floats) -> Bend | None:
    """Return the two-level formula through three designs; None where the spacing bends down.

    Examples
    --------
    >>> found = bend([0.0, 1.0, 3.0], [13**0.5, 3.0, 5.0])
    >>> [round(number, 9) for number in found]
    [1.0, 2.0, 3.0]
    """
    (a, b, c), (f, g, h) = values, np.square(spacings)
    first, second = (g - f) / (b - a), (h - g) / (c - b)
    curve = (second - first) / (c - a)
    if not curve > 0.0:
        return None
    middle = 0.5 * (a + b - first / curve)
    least = f - curve * (a - middle) ** 2
    return Bend(float(middle), float(np.sqrt(curve)), float(np.sqrt(max(least, 0.0))))


class Candidate(NamedTuple):
    """Two tracks that may exchange their character between two designs of the coarse sweep."""

    tracks: tuple[int, int]
    low: int
    high: int


class Coarse:
    """A solved coarse sweep with its tracks.

    Parameters
    ----------
    values : array (n_designs,)
        Ascending.
    levels : sequence of Levels
    of_box : bool
        Whether levels that belong to the closed box are among the candidates.
    """

    def __init__(self, values: Floats, levels: Sequence[Levels], of_box: bool) -> None:
        self.values, self.levels, self._of_box = values, levels, of_box
        self._seen: dict[tuple[int, int], Floats] = {}

    @cached_property
    def tracks(self) -> Indices:
        """Level index of each track in each design, -1 where it has none.

        Each step is judged by itself, so that a step on which tracks cross holds their middle.
        """
        return along(self.levels, Tracked(patient=False))

    @cached_property
    def energies(self) -> Floats:
        """Energy of each track in each design [eV], nan where it has none."""
        return self._by_track([levels.energies for levels in self.levels], np.nan)

    @cached_property
    def boxed(self) -> npt.NDArray[np.bool_]:
        """Whether the level of each track belongs to the box in each design."""
        return self._by_track([levels.of_box for levels in self.levels], False) > 0.0

    def _by_track(self, each: Sequence[npt.NDArray[np.generic]], none: float) -> Floats:
        found = np.full(self.tracks.shape, none, dtype=float)
        for row, indices, numbers in zip(found, self.tracks, each, strict=True):
            there = indices >= 0
            row[there] = numbers[indices[there]]
        return found

    def torn(self) -> Indices:
        """Return the designs after which a level of the structure's own has no successor."""
        there = self.tracks >= 0
        own = there & (~self.boxed | self._of_box)
        lost = own[:-1] & ~there[1:]
        new = own[1:] & ~there[:-1]
        return np.flatnonzero(lost.any(axis=1) | new.any(axis=1))

    def pair(self, design: int, tracks: tuple[int, int]) -> tuple[int, int]:
        """Return the level indices of two tracks in a design, the lower first."""
        one, two = (int(self.tracks[design, track]) for track in tracks)
        return min(one, two), max(one, two)

    def candidates(self) -> Iterator[Candidate]:
        """Yield the pairs of tracks that may exchange their character, and between which designs.

        Tracks that cross do; others come closest there, and have exchanged enough of their
        character between designs before and after.
        """
        for tracks in combinations(range(self.tracks.shape[1]), 2):
            apart = self.energies[:, tracks[1]] - self.energies[:, tracks[0]]
            both = np.isfinite(apart)
            if np.count_nonzero(both) < 2:
                continue
            for low, high in self._places(np.abs(apart), apart >= 0.0, both):
                found = Candidate(tracks, low, high)
                crossed = bool((apart[low] >= 0.0) != (apart[high] >= 0.0))
                if not self._outside(found) and (crossed or self._mixes(found, np.abs(apart))):
                    yield found

    def _places(
        self, size: Floats, sign: npt.NDArray[np.bool_], both: npt.NDArray[np.bool_]
    ) -> Iterator[tuple[int, int]]:
        """Yield the designs between which a spacing is smallest, or changes its sign."""
        last = len(size) - 1
        crossed = both[:-1] & both[1:] & (sign[:-1] != sign[1:])
        for k in np.flatnonzero(crossed).tolist():
            yield k, k + 1
        for k in np.flatnonzero(both).tolist():
            low, high = max(k - 1, 0), min(k + 1, last)
            if both[low] and both[high] and not crossed[low:high].any():
                before = k == 0 or size[k] <= size[low]
                after = k == last or size[k] < size[high]
                if before and after:
                    yield low, high

    def _outside(self, found: Candidate) -> bool:
        """Return whether one of the two belongs to the box before and after."""
        if self._of_box:
            return False
        return all(self.boxed[k, list(found.tracks)].any() for k in (found.low, found.high))

    def _mixes(self, found: Candidate, size: Floats) -> bool:
        """Return whether two levels that come close mix, by what the coarse sweep holds."""
        low, high = found.low, found.high
        at_end = high - low == 1
        if at_end:  # the third design is the next one
            low, high = (low, high + 1) if low == 0 else (low - 1, high)
        three = slice(low, high + 1)
        if high - low != 2 or not np.isfinite(size[three]).all():
            return False
        formula = bend(self.values[three], size[three])
        if formula is None:
            return False
        there = np.flatnonzero(np.isfinite(size))
        at = self.values[there]
        before, after = formula.window(at[0], at[-1], 2.0 * REACH if at_end else REACH)
        first = int(there[max(int(np.searchsorted(at, before)), 1) - 1])
        second = int(there[min(int(np.searchsorted(at, after, side="right")), len(at) - 1)])
        first, second = min(first, found.low), max(second, found.high)
        due = formula.exchange(self.values[first], self.values[second])
        if due < COARSE * (LEAST_AT_END if at_end else LEAST):
            return False
        return self.exchange(found.tracks, first, second) >= COARSE * due

    def exchange(self, tracks: tuple[int, int], first: int, second: int) -> float:
        """Return how much of their character two tracks have exchanged between two designs."""
        if (first, second) not in self._seen:
            self._seen[first, second] = overlaps(self.levels[first], self.levels[second])
        found = self._seen[first, second]
        return exchanged(found, self.pair(first, tracks), self.pair(second, tracks))


def exchanged(found: Floats, first: tuple[int, int], second: tuple[int, int]) -> float:
    """Return how much of the lower level of one design is the upper of another, and reverse.

    Parameters
    ----------
    found : array
        Overlaps.
    first, second : pair of int
        Indices of the lower and the upper level in both designs.

    Examples
    --------
    >>> exchanged(np.array([[0.6, 0.8], [0.8, 0.6]]), (0, 1), (0, 1))
    0.64...
    """
    crossed = found[first[0], second[1]], found[first[1], second[0]]
    return float(min(crossed) ** 2)
