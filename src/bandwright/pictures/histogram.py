"""Wavelengths of many grown pieces as a histogram, with the window and the yield."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import PictureError
from ..lines import read_window
from ..quantities import show
from .sheet import (
    BLACK,
    BLUE,
    BOLD,
    COLUMN,
    FAINT,
    GAP,
    PLAIN,
    VERMILION,
    axes,
    dress,
    legend,
)
from .words import printed

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Floats = npt.NDArray[np.float64]

#: fewest and most bins
_BINS = (8, 60)


class Sides(NamedTuple):
    """A window of wavelengths [um]; an open side is infinite."""

    low: float
    high: float


def yield_histogram(
    wavelengths_um: Sequence[float] | Floats,
    window: Sequence[object] | None = None,
    ax: Axes | None = None,
    *,
    mean_um: float | None = None,
    sigma_um: float | None = None,
    width: object = COLUMN,
    height: object = None,
) -> Axes:
    """Draw wavelengths drawn at random as a histogram, the window and the yield in it.

    Parameters
    ----------
    wavelengths_um : array
        One a draw [um]; nan for a draw without the line, which is no yield.
    window : pair of wavelengths, optional
        As ``("10.2 um", "10.5 um")``; None leaves a side open.
    ax : Axes, optional
        Where to draw; a new figure of pyplot's if absent.
    mean_um, sigma_um : float, optional
        Of the linear propagation [um], drawn as a normal curve beside.
    width, height : length
        Size of a new figure.

    Returns
    -------
    Axes

    Raises
    ------
    PictureError
        If there are fewer than two wavelengths, or only one of mean and sigma.
    QuantityError
        If ``window`` is no pair of wavelengths.

    Examples
    --------
    >>> ax = yield_histogram([10.1, 10.3, 10.4], ("10.2 um", "10.5 um"))
    >>> print(ax.get_legend().get_texts()[0].get_text())
    yield 66.7 ± 27.2 %
    """
    drawn = _numbers(wavelengths_um)
    found = drawn[np.isfinite(drawn)]
    if len(found) < 2:
        raise PictureError(f"wavelengths_um: {len(found)} of {len(drawn)} are numbers; two are due")
    if (mean_um is None) != (sigma_um is None):
        raise PictureError("mean_um and sigma_um: one is missing; give both or none")
    if sigma_um is not None and not (math.isfinite(sigma_um) and sigma_um > 0.0):
        raise PictureError(f"sigma_um: got {show(sigma_um)}; a number above zero is due")
    sides = Sides(*(_um(side, open_end) for side, open_end in
                    zip(read_window(window), (-math.inf, math.inf), strict=True)))  # fmt: skip
    ax = axes(ax, width, height)
    edges = bins(found, sides)
    handles = _columns(ax, found, edges, sides, len(drawn), window is not None)
    if mean_um is not None and sigma_um is not None:
        handles.append(_normal(ax, mean_um, sigma_um, edges, len(drawn), sides))
    finite = [side for side in sides if math.isfinite(side)]
    for side in finite:
        line = ax.axvline(side, color=BLACK, linewidth=BOLD, linestyle=(0, (3, 1.5)), gid="window",
                          label=_window_text(sides))  # fmt: skip
    handles += [line] if finite else []
    dress(ax, f"wavelength in vacuum{GAP}(µm)", f"draws per {printed(_rounded(edges))} µm")
    ax.set_ylim(0.0, None)
    missing = len(drawn) - len(found)
    note = f"{len(drawn)} draws" + (f", {missing} of them without the line" if missing else "")
    mean, sigma = _short(float(found.mean())), _short(float(found.std(ddof=1)))
    legend(ax, handles, f"{note}; mean {mean}, sigma {sigma} µm")
    return ax


def _numbers(values: object) -> Floats:
    try:
        drawn = np.asarray(values, dtype=float)
    except (TypeError, ValueError):
        drawn = np.zeros((0, 0))
    if drawn.ndim != 1:
        raise PictureError(f"wavelengths_um: got {show(values)}; give a list of numbers in um")
    return drawn


def _um(side: float | None, otherwise: float) -> float:
    return otherwise if side is None else side * 1e-3


def bins(found: Floats, sides: Sides) -> Floats:
    """Return edges of equal bins [um] such that the window's sides are among them.

    The width is near Freedman and Diaconis' (Z. Wahrscheinlichkeitstheorie 57, 453 (1981), from
    memory).

    Examples
    --------
    >>> edges = bins(np.linspace(1.0, 2.0, 1000), Sides(1.25, 1.75))
    >>> bool(np.isclose(edges, 1.25).any() and np.isclose(edges, 1.75).any())
    True
    """
    low, high = float(found.min()), float(found.max())
    span = (high - low) or max(abs(low), 1.0) * 1e-6
    ideal = len(np.histogram_bin_edges(found, "fd")) - 1 if high > low else 1
    step = span / int(np.clip(ideal, *_BINS))
    anchor = sides.low if math.isfinite(sides.low) else sides.high
    if math.isfinite(sides.high - sides.low) and sides.high - sides.low < 20.0 * span:
        length = sides.high - sides.low
        step = length / max(1, round(length / step)) if length > 0.0 else step
    if not math.isfinite(anchor):
        anchor = low
    first = math.floor((low - anchor) / step)
    last = max(first + 1, math.ceil((high - anchor) / step))
    return np.asarray(anchor + step * np.arange(first, last + 1))


def _rounded(edges: Floats) -> float:
    return float(f"{edges[1] - edges[0]:.2g}")


def _short(value: float) -> str:
    return printed(float(f"{value:.4g}"))


def _columns(
    ax: Axes, found: Floats, edges: Floats, sides: Sides, total: int, windowed: bool
) -> list[Any]:
    """Draw the columns, those outside the window hatched, and return what they mean."""
    counts, _ = np.histogram(found, edges)
    middle = 0.5 * (edges[1:] + edges[:-1])
    inside = (middle > sides.low) & (middle < sides.high)
    width = edges[1] - edges[0]
    bars = ax.bar(middle[inside], counts[inside], width, facecolor=BLUE, edgecolor="white",
                  linewidth=0.3, gid="inside")  # fmt: skip
    rest = ax.bar(middle[~inside], counts[~inside], width, facecolor="white", edgecolor=FAINT,
                  linewidth=0.3, hatch="//////", gid="outside")  # fmt: skip
    if not windowed:
        return []
    share = float(np.sum((found >= sides.low) & (found <= sides.high))) / total
    error = math.sqrt(share * (1.0 - share) / total)
    bars.set_label(f"yield {share * 100:.1f} ± {error * 100:.1f} %")
    rest.set_label("outside")
    return [bars, rest] if (~inside).any() else [bars]


def _normal(
    ax: Axes, mean: float, sigma: float, edges: Floats, total: int, sides: Sides
) -> Any:
    """Draw the normal curve of the linear propagation, and return what it means."""
    low, high = min(edges[0], mean - 3.5 * sigma), max(edges[-1], mean + 3.5 * sigma)
    x = np.linspace(low, high, 300)
    height = total * (edges[1] - edges[0]) / (sigma * math.sqrt(2.0 * math.pi))
    share = [0.5 * (1.0 + math.erf((side - mean) / sigma / math.sqrt(2.0))) for side in sides]
    windowed = any(math.isfinite(side) for side in sides)
    told = f", yield {(share[1] - share[0]) * 100:.1f} %" if windowed else ""
    (line,) = ax.plot(x, height * np.exp(-0.5 * ((x - mean) / sigma) ** 2), color=VERMILION,
                      linewidth=PLAIN, label=f"linear{told}", gid="linear")  # fmt: skip
    return line


def _window_text(sides: Sides) -> str:
    if not math.isfinite(sides.low):
        return f"window to {_short(sides.high)} µm"
    if not math.isfinite(sides.high):
        return f"window from {_short(sides.low)} µm"
    return f"window {_short(sides.low)} to {_short(sides.high)} µm"
