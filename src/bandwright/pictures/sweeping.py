"""A sweep as curves, or as a map with contours where two parameters span a grid."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from ..errors import PictureError, close_matches
from ..quantities import show
from ..report.grid import unit_of
from .margin import Label, margin_labels
from .sheet import (
    BLACK,
    COLUMN,
    FAINT,
    GROUND,
    HAIR,
    INKS,
    PLAIN,
    SMALL,
    STROKES,
    THIN,
    axes,
    dress,
    legend,
)
from .words import axis_text, checked, column, common_text, numeric, printed, words_of

if TYPE_CHECKING:
    import pandas as pd
    from matplotlib.axes import Axes

Floats = npt.NDArray[np.float64]

KINDS = ("curves", "map")
#: the metric that is drawn if nothing else is asked
USUAL = "wavelength_um"
#: a grid of at least so many values each way is a map if nothing else is asked
MAP_FROM = 6
#: a curve of at most so many points shows them
POINTS = 40
_MARKERS = ("o", "s", "^", "D", "v")
#: the fill of a map from its lowest to its highest value; the contours tell the numbers
_SHADES = ("#F7FBFF", "#8FC1E3")


def sweep_curves(
    table: pd.DataFrame,
    ax: Axes | None = None,
    *,
    over: str | Sequence[str] | None = None,
    metrics: str | Sequence[str] | None = None,
    kind: str | None = None,
    width: object = COLUMN,
    height: object = None,
) -> Axes:
    """Draw metrics of a sweep over its parameter, or one metric over its two parameters.

    Over one parameter each metric is a curve; over two, each value of the second is a curve, or
    both span a map with contours. A gap is a design without that number.

    Parameters
    ----------
    table : DataFrame
        One row a design: columns of parameters, then of metrics; units in the names.
    ax : Axes, optional
        Where to draw; a new figure of pyplot's if absent.
    over : str or pair of str, optional
        The parameters; if absent those that the sweep noted, else the first column.
    metrics : str or sequence of str, optional
        Columns to draw, all of one unit. If absent ``"wavelength_um"``; without such a column the
        first that has a unit, and over one parameter the others of this unit.
    kind : str, optional
        ``"curves"`` or ``"map"``; if absent a map where two parameters span a grid of at least
        6 by 6.
    width, height : length
        Size of a new figure.

    Returns
    -------
    Axes

    Raises
    ------
    PictureError
        If the table has no such numbers, a parameter's values do not tell the rows apart, metrics
        differ in unit, or a map has no full grid.

    Examples
    --------
    >>> import pandas as pd
    >>> table = pd.DataFrame({"thickness_nm": [6.0, 7.0, 8.0], "wavelength_um": [8.1, 9.4, 10.9]})
    >>> len(sweep_curves(table).lines)
    1
    """
    table = checked(table)
    parameters = _parameters(table, over)
    chosen = _metrics(table, parameters, metrics)
    if kind is not None and kind not in KINDS:
        raise PictureError(f"kind: got {show(kind)}{close_matches(str(kind), KINDS)}")
    if len(parameters) == 1:
        if kind == "map":
            raise PictureError("kind: a map needs two parameters; name them, over = (one, other)")
        curves = _by_metric(table, parameters[0], chosen)
        head = ""
    else:
        grid = _grid(table, parameters, chosen[0])
        wide = grid is not None and min(grid[2].shape) >= MAP_FROM
        if kind == "map" and grid is None:
            raise PictureError(
                "kind: a map needs every pair of both parameters' values once, and numbers; draw"
                " kind = 'curves'"
            )
        if grid is not None and (kind == "map" or (kind is None and wide)):
            return _map(axes(ax, width, height), grid, parameters, chosen[0])
        curves = _by_value(table, parameters, chosen[0])
        head = axis_text(parameters[1])
    ax = axes(ax, width, height)
    ends = [_curve(ax, place, *curve) for place, curve in enumerate(curves)]
    dress(ax, axis_text(parameters[0]), common_text(chosen))
    ax.margins(x=0.02)
    if len(curves) > 1 or head:
        margin_labels(ax, [end for end in ends if end is not None], head)
    return ax


def _parameters(table: pd.DataFrame, over: str | Sequence[str] | None) -> list[str]:
    """Return the one or two columns that are swept over."""
    if over is None:
        over = table.attrs.get("parameters") or [str(table.columns[0])]
    names = [over] if isinstance(over, str) else [str(name) for name in over]
    if not 1 <= len(names) <= 2:
        raise PictureError(
            f"over: {len(names)} parameters ({', '.join(names)}); a picture shows one or two: take"
            " the rows of one value of the others and name two, over = (one, other)"
        )
    column(table, names[0])
    if names[-1] not in table.columns:
        column(table, names[-1])
    doubled = table.duplicated(subset=names)
    if doubled.any():
        row = table.loc[doubled, names].iloc[0]
        found = ", ".join(f"{name} {printed(row[name])}" for name in names)
        raise PictureError(
            f"over: {found} is there more than once; name the parameters that tell the rows apart,"
            " over = (one, other)"
        )
    return names


def _metrics(
    table: pd.DataFrame, parameters: Sequence[str], metrics: str | Sequence[str] | None
) -> list[str]:
    """Return the columns to draw, all of one unit."""
    if metrics is None:
        free = [name for name in numeric(table) if name not in parameters]
        if not free:
            raise PictureError(
                f"table: no column of numbers beside {' and '.join(parameters)}; there are"
                f" {', '.join(map(str, table.columns))}"
            )
        if USUAL in free:
            return [USUAL]
        free.sort(key=lambda name: not unit_of(name)[1])  # a count or a level's number comes last
        unit = unit_of(free[0])[1]
        same = [name for name in free if unit and unit_of(name)[1] == unit]
        return same if same and len(parameters) == 1 else free[:1]
    names = [metrics] if isinstance(metrics, str) else [str(name) for name in metrics]
    for name in names:
        column(table, name)
    if not names or (len(parameters) == 2 and len(names) > 1):
        raise PictureError(f"metrics: got {len(names)}; over two parameters one is drawn at a time")
    units = {unit_of(name)[1] for name in names}
    if len(units) > 1:
        told = ", ".join(sorted(unit or "no unit" for unit in units))
        raise PictureError(f"metrics: they differ in unit ({told}); draw each unit on its own Axes")
    return names


def _by_metric(
    table: pd.DataFrame, parameter: str, metrics: Sequence[str]
) -> list[tuple[str, Floats, Floats]]:
    x = column(table, parameter)
    order = np.argsort(x, kind="stable")
    return [(words_of(name), x[order], column(table, name)[order]) for name in metrics]


def _by_value(
    table: pd.DataFrame, parameters: Sequence[str], metric: str
) -> list[tuple[str, Floats, Floats]]:
    x, y = column(table, parameters[0]), column(table, metric)
    values = table[parameters[1]].tolist()
    curves = []
    for value in sorted(set(values)) if parameters[1] in numeric(table) else dict.fromkeys(values):
        here = np.array([each == value for each in values])
        order = np.argsort(x[here], kind="stable")
        curves.append((printed(value), x[here][order], y[here][order]))
    return curves


def _curve(ax: Axes, place: int, name: str, x: Floats, y: Floats) -> Label | None:
    """Draw one curve and return the label at its end; none for a curve without a number."""
    ink, stroke = INKS[place % len(INKS)], STROKES[place % len(STROKES)]
    marker: Any = _MARKERS[place % len(_MARKERS)] if len(x) <= POINTS else None
    ax.plot(x, y, color=ink, linestyle=stroke, linewidth=PLAIN, marker=marker, markersize=2.4,
            label=name, gid=f"curve {name}")  # fmt: skip
    known = np.flatnonzero(np.isfinite(y))
    return Label(float(y[known[-1]]), name, ink) if len(known) else None


def _grid(
    table: pd.DataFrame, parameters: Sequence[str], metric: str
) -> tuple[Floats, Floats, Floats] | None:
    """Return both axes and the metric on their grid; None where it is not full."""
    if parameters[1] not in numeric(table):
        return None
    x, at_x = np.unique(column(table, parameters[0]), return_inverse=True)
    y, at_y = np.unique(column(table, parameters[1]), return_inverse=True)
    if len(x) * len(y) != len(table) or min(len(x), len(y)) < 2:
        return None
    z = np.full((len(y), len(x)), np.nan)
    z[at_y, at_x] = column(table, metric)
    return (x, y, z) if np.isfinite(z).any() else None


def _map(
    ax: Axes, grid: tuple[Floats, Floats, Floats], parameters: Sequence[str], metric: str
) -> Axes:
    """Draw contours with their numbers over a fill."""
    from matplotlib.colors import LinearSegmentedColormap
    from matplotlib.patches import Patch
    from matplotlib.ticker import MaxNLocator

    x, y, z = grid
    masked = np.ma.masked_invalid(z)
    low, high = float(masked.min()), float(masked.max())
    handles = []
    ax.set_facecolor(GROUND)
    if masked.mask is not np.ma.nomask and masked.mask.any():
        handles.append(Patch(facecolor=GROUND, edgecolor=FAINT, linewidth=HAIR, label="no value"))
    dress(ax, axis_text(parameters[0]), axis_text(parameters[1]), axis_text(metric))
    ax.set_xlim(x[0], x[-1])
    ax.set_ylim(y[0], y[-1])
    if high > low:
        steps = MaxNLocator(9, steps=[1, 2, 2.5, 5, 10]).tick_values(low, high)
        shades = LinearSegmentedColormap.from_list("shades", list(_SHADES))
        ax.contourf(x, y, masked, levels=steps, cmap=shades).set_gid("map")
        lines = ax.contour(x, y, masked, levels=steps, colors=BLACK, linewidths=THIN)
        lines.set_gid("contours")
        for number in ax.clabel(lines, fontsize=SMALL, fmt=printed, inline_spacing=2):
            number.set_clip_on(False)  # one at the side is read in full
    else:
        ax.text(0.5, 0.5, f"{printed(low)} everywhere", transform=ax.transAxes, fontsize=SMALL,
                ha="center")  # fmt: skip
    if handles:
        legend(ax, handles)
    return ax
