"""Labels in the right margin of a picture, each joined to its value, none over another."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
import numpy.typing as npt

from .sheet import BLACK, FAINT, HAIR, SMALL, paper

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Floats = npt.NDArray[np.float64]

#: height of a line of type, and the way from the axis to the label [pt]
LINE, LEAD = 1.25 * SMALL, 9.0
#: where there is room for fewer labels the line above them gives way
FEW = 3


class Label(NamedTuple):
    """A text, the value it belongs to, and the ink of the line that joins them."""

    value: float
    text: str
    ink: str = BLACK


def spread(wanted: Sequence[float] | Floats, gap: float, low: float, high: float) -> Floats:
    """Return places as near as can be to those wanted, apart by ``gap`` and within bounds.

    The least sum of squared moves, by pooling neighbours that are too close (Ayer et al.,
    Ann. Math. Stat. 26, 641 (1955), from memory).

    Parameters
    ----------
    wanted : sequence of float
        Ascending, at most ``1 + (high - low) / gap`` of them.

    Examples
    --------
    >>> spread([0.0, 4.0, 4.5, 5.0], 1.0, 0.0, 10.0)
    array([0. , 3.5, 4.5, 5.5])
    """
    steps = gap * np.arange(len(wanted))
    pools: list[tuple[float, int]] = []
    for place in np.asarray(wanted, dtype=float) - steps:
        mean, count = float(place), 1
        while pools and pools[-1][0] > mean:
            before, many = pools.pop()
            mean = (before * many + mean * count) / (many + count)
            count += many
        pools.append((mean, count))
    level = np.repeat([mean for mean, _ in pools], [count for _, count in pools])
    top = high - (steps[-1] if len(steps) else 0.0)
    return np.asarray(np.clip(level, low, max(low, top)) + steps)


def rows_for(height: float) -> int:
    """Return how many labels stand over one another on a height [pt].

    Examples
    --------
    >>> rows_for(76.0)
    10
    """
    return 1 + int(max(0.0, height - LINE) / LINE)


def margin_labels(ax: Axes, labels: Sequence[Label], head: str = "") -> None:
    """Set labels right of an Axes; where there is no room for all, evenly chosen ones.

    To be called last: the layout is made here, so that the height of the Axes is known.

    Parameters
    ----------
    ax : Axes
    labels : sequence of Label
    head : str
        What the labels are, above them.
    """
    from matplotlib.transforms import blended_transform_factory, offset_copy

    figure = paper(ax)
    figure.draw_without_rendering()
    height = float(ax.get_window_extent().height) * 72.0 / figure.dpi
    low, high = ax.get_ylim()
    seen = sorted(one for one in labels if low <= one.value <= high)
    first = len(head.splitlines())
    if rows_for(height) < first + FEW:
        first, head = 0, ""
    room = max(1, rows_for(height) - first)
    if len(seen) > room and head:
        first, room = first + 1, max(1, room - 1)
        head += f"\n({room} of {len(seen)} named)"
    if len(seen) > room:
        chosen = np.rint(np.linspace(0, len(seen) - 1, room)).astype(int)
        seen = [seen[i] for i in chosen]
    wanted = [(one.value - low) / (high - low) * height for one in seen]
    top = height - 0.5 * LINE - first * LINE
    places = spread(wanted, LINE, 0.5 * LINE, top)
    beside = offset_copy(ax.transAxes, fig=figure, x=LEAD, units="points")
    values = blended_transform_factory(ax.transAxes, ax.transData)
    for one, place in zip(seen, places, strict=True):
        ax.annotate(
            one.text, xy=(1.0, one.value), xycoords=values, xytext=(1.0, place / height),
            textcoords=beside, fontsize=SMALL, va="center", ha="left", annotation_clip=False,
            arrowprops={"arrowstyle": "-", "linewidth": HAIR, "color": one.ink, "shrinkA": 0.5,
                        "shrinkB": 0.0, "relpos": (0.0, 0.5)},
        ).set_gid("label")  # fmt: skip
    if head:
        ax.text(1.0, 1.0, head.strip(), transform=beside, fontsize=SMALL, va="top", ha="left",
                color=FAINT).set_gid("head")  # fmt: skip
