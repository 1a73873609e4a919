"""The derivative of a smooth array-valued function of one number, to rounding.

Central differences of fourth and sixth order; one-sided ones of sixth order where one side is
not allowed (a fraction at 0 or 1). A kink near the place makes orders disagree: then the step
shrinks.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError

Floats = npt.NDArray[np.float64]

_CENTRAL = {
    2: {1: 1 / 2},
    4: {1: 2 / 3, 2: -1 / 12},
    6: {1: 3 / 4, 2: -3 / 20, 3: 1 / 60},
}
_FORWARD = {
    4: (-25 / 12, 4.0, -3.0, 4 / 3, -1 / 4),
    6: (-49 / 20, 6.0, -15 / 2, 20 / 3, -15 / 4, 6 / 5, -1 / 6),
}
#: orders 2 and 4, or 4 and 6, that differ by less, relative to the largest entry, have converged
_AGREE = {4: 1e-10, 6: 1e-7}
#: ... or by less than this many roundings of the largest value over the step
_ROUNDINGS = 4e-15
#: the sides' derivatives differ by more than this at a kink, relative
_KINK = 1e-6
_TRIES = 4


class Slope(NamedTuple):
    """A derivative, and whether the function has a kink there: it is then both sides' mean."""

    value: Floats
    kinked: bool


def slope(
    function: Callable[[float], Floats], centre: float, step: float, straight: bool = False
) -> Slope:
    """Return the derivative of ``function`` at ``centre``.

    Parameters
    ----------
    function : callable
        Of a float; returns an array, always of one shape. Raises `BandwrightError` where it is
        not defined.
    centre, step : float
    straight : bool
        Whether the function is linear if its value at ``centre`` is the mean of those a step
        away: two values then give the derivative.

    Raises
    ------
    BandwrightError
        The function's own, if neither side is defined.

    Examples
    --------
    >>> found = slope(lambda x: np.array([np.exp(x), abs(x)]), 0.0, 0.01)
    >>> print(np.round(found.value, 12), found.kinked)
    [1. 0.] True
    """
    best: _Steps | None = None
    refused: BandwrightError | None = None
    for attempt in range(_TRIES):
        steps = _Steps(function, centre, step / 8.0**attempt, straight)
        try:
            rough = steps.best[1]
        except BandwrightError as error:
            refused = error
            continue
        if best is None or rough < best.best[1]:
            best = steps
        if rough == 0.0:
            break
    if best is None:
        assert refused is not None
        raise refused
    return Slope(best.best[0], best.kinked)


class _Steps:
    """Values a few steps away, each worked out once, and the derivatives they give."""

    def __init__(
        self, function: Callable[[float], Floats], centre: float, step: float, straight: bool
    ) -> None:
        self.function, self.centre, self.step = function, centre, step
        self.straight = straight
        self.known: dict[int, Floats] = {}

    def at(self, steps: int) -> Floats:
        """Return the value a number of steps away."""
        if steps not in self.known:
            self.known[steps] = self.function(self.centre + steps * self.step)
        return self.known[steps]

    @cached_property
    def best(self) -> tuple[Floats, float]:
        """The derivative, and how far its last two orders differ (0 where they agree)."""
        try:
            return self._central()
        except BandwrightError:
            pass
        try:
            return self._one_sided(1)
        except BandwrightError:
            return self._one_sided(-1)

    def _central(self) -> tuple[Floats, float]:
        second = self._sum(_CENTRAL[2])
        if self.straight:
            bend = np.abs(self.at(1) + self.at(-1) - 2.0 * self.at(0)) / self.step
            if not bend.size or float(bend.max()) <= self._noise:
                return second, 0.0
        fourth = self._sum(_CENTRAL[4])
        if self._apart(second, fourth, _AGREE[4]) == 0.0:
            return fourth, 0.0
        sixth = self._sum(_CENTRAL[6])
        return sixth, self._apart(fourth, sixth, _AGREE[6])

    def _sum(self, weights: dict[int, float]) -> Floats:
        total = sum(w * (self.at(k) - self.at(-k)) for k, w in weights.items())
        return np.asarray(total / self.step)

    def _one_sided(self, sign: int) -> tuple[Floats, float]:
        low, high = (
            np.asarray(sum(w * self.at(sign * k) for k, w in enumerate(_FORWARD[order])))
            * (sign / self.step)
            for order in (4, 6)
        )
        return high, self._apart(low, high, _AGREE[6])

    def _apart(self, low: Floats, high: Floats, agree: float) -> float:
        if not high.size:
            return 0.0
        most = float(np.max(np.abs(high)))
        apart = float(np.max(np.abs(high - low)))
        return 0.0 if apart <= max(agree * most, self._noise) else apart / most

    @property
    def _noise(self) -> float:
        return _ROUNDINGS * max(float(np.max(np.abs(v))) for v in self.known.values()) / self.step

    @property
    def kinked(self) -> bool:
        """Whether both sides' slopes differ, by as much however well each is taken."""
        if not {-2, -1, 1, 2} <= set(self.known) or not self.at(1).size:
            return False
        middle = self.at(0)
        once = (self.at(1) + self.at(-1) - 2.0 * middle) / self.step
        twice = 2.0 * once - 0.5 * (self.at(2) + self.at(-2) - 2.0 * middle) / self.step
        jump = float(np.max(np.abs(twice)))
        most = max(float(np.max(np.abs(self.at(k) - middle))) for k in (-1, 1)) / self.step
        first = float(np.max(np.abs(once)))
        return jump > 0.5 * first and jump > max(_KINK * most, 10.0 * self._noise)
