"""Windows, shares of a variance and of a normal distribution, and what is said of draws."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from ..errors import QuantityError, SolveError
from ..lines import Line, read_window
from ..quantities import show
from .drawing import Draws

Floats = npt.NDArray[np.float64]
Window = tuple[float | None, float | None]


def read_sides(window: Sequence[object] | None) -> Window:
    """Return a window [nm] that is written the right way round.

    Raises
    ------
    QuantityError
        If it is no pair of wavelengths, or nothing lies in it.
    """
    low, high = read_window(window)
    if window is None or low is None or high is None:
        return low, high
    if low == high or low != read_window((window[0], None))[0]:
        raise QuantityError(
            f"window: got {show(tuple(window))}; write the shorter wavelength first, then a longer"
            " one, such as ('10 um', '10.6 um')"
        )
    return low, high


def whole(value: object, name: str, least: int) -> int:
    """Return a whole number.

    Raises
    ------
    SolveError
        If it is none, or too small.
    """
    if isinstance(value, bool) or not isinstance(value, int | np.integer) or value < least:
        raise SolveError(f"{name}: got {show(value)}; a whole number from {least} is due")
    return int(value)


def sigma_length(line: Line, sigma_meV: float) -> float:
    """Return sigma of a wavelength [um], hc/E^2 times that of the energy."""
    return float(line.wavelength_um * sigma_meV / line.energy_meV)


def shares_of(shifts: Floats) -> Floats:
    """Return each spread's share of the variance; zeros where nothing moves."""
    total = float(np.sum(shifts**2))
    return shifts**2 / total if total else np.zeros_like(shifts)


def normal_share(line: Line, sigma: float, window: Window) -> float:
    """Return the share of a normal distribution of wavelengths inside a window."""
    ends = []
    for side, missing in zip(window, (0.0, 1.0), strict=True):
        if side is None:
            ends.append(missing)
        elif sigma == 0.0:
            ends.append(float(line.wavelength_um <= side * 1e-3))
        else:
            ends.append(0.5 * math.erfc((line.wavelength_um - side * 1e-3) / sigma / math.sqrt(2)))
    return ends[1] - ends[0]


def gone_wrong(draws: Draws) -> list[str]:
    """Return what went wrong with draws."""
    total, texts = len(draws), []
    if draws.failed:
        why = "; ".join(draws.reasons)
        texts.append(f"{draws.failed} of {total} draws failed and count as no yield: {why}")
    if draws.missing:
        texts.append(f"{draws.missing} of {total} draws have not the line and count as no yield")
    if draws.unlike:
        texts.append(
            f"in {draws.unlike} of {total} draws a level of that number has another character than"
            " in the design: the line is followed by number"
        )
    return texts
