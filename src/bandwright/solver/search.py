"""Levels by number: bisection on the count alone, which can neither miss nor invent one."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Counts = npt.NDArray[np.int64]


def bisect_by_count(
    count: Callable[[Floats], Counts],
    numbers: npt.ArrayLike,
    low: float,
    high: float,
    width: float,
) -> tuple[Floats, Floats]:
    """Return brackets (low, high) of the levels with these numbers, counted from 0.

    Parameters
    ----------
    count : callable
        Energies (n,) -> number of levels below each, never falling with the energy.
    numbers : array of int, shape (n,)
        ``count(low) <= number < count(high)`` must hold for each.
    low, high : float
        Bounds [eV].
    width : float
        Brackets are halved until narrower than this [eV], or as narrow as floats allow.
    """
    wanted = np.asarray(numbers, dtype=np.int64)
    lows, highs = np.full(wanted.shape, low), np.full(wanted.shape, high)
    for _ in range(200):
        middle = 0.5 * (lows + highs)
        open_ = (highs - lows > width) & (middle > lows) & (middle < highs)
        if not open_.any():
            break
        points, where = np.unique(middle[open_], return_inverse=True)
        above = np.zeros(wanted.shape, dtype=bool)
        above[open_] = count(points)[where] > wanted[open_]
        highs = np.where(open_ & above, middle, highs)
        lows = np.where(open_ & ~above, middle, lows)
    return lows, highs
