"""Where two levels are closest, between two designs of a coarse sweep."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from scipy.optimize import minimize_scalar

from ..errors import BandwrightError
from ..following import overlaps
from ..levels import Levels
from ..quantities import energy_text
from .candidates import LEAST, LEAST_AT_END, REACH, SHARE, Bend, bend, exchanged
from .path import Path

#: tolerance of refined levels, unless a finer one is asked [eV]
FINE = 1e-9
#: rounding of a level [eV]
_ROUNDING = 1e-13
#: accuracy of the middle, as a share of the half-width; the splitting has half its square
_MIDDLE = 1e-3
#: no closer than this share of the bracket, where parameters are told apart at all
_FINEST = 1e-11
#: most vertices of parabolas that are tried
_STEPS = 12
#: shares of the window that are tried
_NEARER = (1.0, 0.5, 0.25)


class Point(NamedTuple):
    """Two levels of one design: value of the parameter, indices of the lower and the upper."""

    value: float
    levels: Levels
    pair: tuple[int, int]

    @property
    def spacing(self) -> float:
        """How far the two are apart [eV]."""
        lower, upper = self.levels.energies[list(self.pair)]
        return float(upper - lower)

    @property
    def error(self) -> float:
        """Estimate of the spacing's error [eV]."""
        solutions = [part.solution for part in self.levels.parts]
        errors = np.concatenate([s.error for s in solutions if s is not None])
        return float(np.sum(np.maximum(errors[list(self.pair)], _ROUNDING)))

    @property
    def of_box(self) -> bool:
        """Whether one of the two belongs to the closed box."""
        return bool(self.levels.of_box[list(self.pair)].any())


class Narrowest(NamedTuple):
    """A refined anticrossing.

    Attributes
    ----------
    at : Point
    error : float
        Of the splitting [eV].
    width : float
        Distance from the middle at which the spacing has grown by the root of two.
    exchange : float
        How much of their character the two exchange, over what two levels of their own would.
    due : float
        The exchange of two levels of their own within the range, between 0 and 1.
    at_end : bool
        Whether the spacing is smallest at an end of the range.
    of_box : bool
        Whether a level that belongs to the closed box takes part, before and after.
    """

    at: Point
    error: float
    width: float
    exchange: float
    due: float
    at_end: bool
    of_box: bool


class Gone(Exception):
    """A level that has left the range of energies."""


class Pair:
    """Two levels followed along a path: whatever their numbers, they span the same subspace."""

    def __init__(self, path: Path, known: Sequence[Point], tolerance: float) -> None:
        self._path, self._known = path, list(known)
        self._tolerance = energy_text(min(tolerance, FINE))

    def at(self, value: float) -> Point:
        """Return the two levels at a value.

        Raises
        ------
        Gone
            If they are not among the levels there.
        """
        near = min(self._known, key=lambda point: abs(point.value - value))
        (levels,) = self._path.solve([value], self._tolerance)
        if isinstance(levels, BandwrightError):
            raise levels
        shares = (overlaps(near.levels, levels)[list(near.pair)] ** 2).sum(axis=0)
        if np.count_nonzero(shares > 0.5) < 2:
            raise Gone
        lower, upper = np.sort(np.argsort(shares)[-2:]).tolist()
        point = Point(float(value), levels, (lower, upper))
        self._known.append(point)
        return point

    def least(
        self, low: Point, high: Point, ends: tuple[float, float]
    ) -> tuple[Point, float, Point]:
        """Return where they are closest, how far off that may be, and a design beside it.

        The square of the spacing is nearly a parabola, whose vertex three designs give, more
        exactly the nearer they are; where it is none, a bounded search does without.
        """
        reach = high.value - low.value
        share = low.spacing / (low.spacing + high.spacing)
        points = [low, self.at(low.value + min(max(share, 0.1), 0.9) * reach), high]
        for _ in range(_STEPS):
            points.sort(key=lambda point: point.spacing)
            three = sorted(points[:3], key=lambda point: point.value)
            formula = bend([p.value for p in three], [p.spacing for p in three])
            if formula is None:
                break
            if not low.value < formula.middle < high.value:
                beyond = low if formula.middle <= low.value else high
                if beyond.value in ends and beyond is points[0]:
                    return beyond, 0.0, high if beyond is low else low
                break
            finest = max(_FINEST * reach, points[0].error / formula.slope)
            off = abs(points[0].value - formula.middle)
            aim = max(_MIDDLE * formula.width, finest)
            far = max(three, key=lambda point: abs(point.value - formula.middle))
            near = 2.0 * max(formula.width, 100.0 * finest)
            if off > aim:
                following = formula.middle
            elif abs(far.value - formula.middle) > 2.0 * near:
                following = formula.middle + np.copysign(near, far.value - formula.middle)
            else:
                return points[0], aim, far
            points.append(self.at(following))
        return self._searched(low, high)

    def _searched(self, low: Point, high: Point) -> tuple[Point, float, Point]:
        seen: list[Point] = [low, high]
        nearer = 1e-4 * (high.value - low.value)

        def square(value: float) -> float:
            seen.append(self.at(value))
            return 1e6 * seen[-1].spacing ** 2

        minimize_scalar(
            square, bounds=(low.value, high.value), method="bounded", options={"xatol": nearer}
        )
        best = min(seen, key=lambda point: point.spacing)
        return best, nearer, max((low, high), key=lambda point: abs(point.value - best.value))


def refine(pair: Pair, low: Point, high: Point, ends: tuple[float, float]) -> Narrowest | None:
    """Return where two levels are closest between two designs; None if they don't mix there.

    Parameters
    ----------
    pair : Pair
    low, high : Point
        The designs.
    ends : pair of float
        The range of the parameter.
    """
    try:
        return _refined(pair, low, high, ends)
    except Gone:
        return None


def _refined(pair: Pair, low: Point, high: Point, ends: tuple[float, float]) -> Narrowest | None:
    best, off, near = pair.least(low, high, ends)
    for end in (low, high):
        if end.value in ends and abs(best.value - end.value) <= off:
            return _at_end(pair, pair.at(end.value), low, high, ends)
    slope = np.sqrt(max(near.spacing**2 - best.spacing**2, 1e-300)) / abs(near.value - best.value)
    formula = Bend(best.value, float(slope), best.spacing)
    place = best.spacing - np.sqrt(max(best.spacing**2 - (formula.slope * off) ** 2, 0.0))
    found = _judged(pair, best, formula, REACH, ends)
    if found is None or found.due < LEAST:
        return None
    return found._replace(error=best.error + float(place))


def _at_end(
    pair: Pair, best: Point, low: Point, high: Point, ends: tuple[float, float]
) -> Narrowest | None:
    middle = pair.at(0.5 * (low.value + high.value))
    points = (low, middle, high)
    formula = bend([p.value for p in points], [p.spacing for p in points])
    if formula is None or formula.splitting == 0.0:
        return None
    found = _judged(pair, best, formula, 2.0 * REACH, ends)
    if found is None or found.due < LEAST_AT_END:
        return None
    return found._replace(at_end=True)


def _judged(
    pair: Pair, best: Point, formula: Bend, reach: float, ends: tuple[float, float]
) -> Narrowest | None:
    """Return the anticrossing if the two levels exchange their character across it."""
    # closer than this the states can't be told apart
    seen = formula._replace(splitting=max(formula.splitting, 1e3 * best.error))
    around = _around_middle(pair, best, seen, reach, ends)
    due = formula.exchange(around[0].value, around[1].value)
    found = exchanged(overlaps(around[0].levels, around[1].levels), *(p.pair for p in around))
    if not found >= SHARE * due > 0.0:
        return None
    of_box = all(point.of_box for point in around)
    return Narrowest(best, best.error, formula.width, found / due, due, False, of_box)


def _around_middle(
    pair: Pair, best: Point, formula: Bend, reach: float, ends: tuple[float, float]
) -> list[Point]:
    """Return the designs before and after, nearer if a level leaves the range of energies."""
    for share in _NEARER:
        window = formula.window(*ends, share * reach)
        try:
            return [best if value == best.value else pair.at(value) for value in window]
        except Gone:
            continue
    raise Gone
