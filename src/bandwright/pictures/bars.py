"""An error budget as bars, the largest shift on top."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from ..errors import PictureError, close_matches
from ..quantities import show
from .sheet import (
    BLACK,
    BLUE,
    COLUMN,
    FAINT,
    GAP,
    SMALL,
    THIN,
    VERMILION,
    axes,
    cell,
    depth,
    dress,
    folded,
)
from .words import checked, column

if TYPE_CHECKING:
    import pandas as pd
    from matplotlib.axes import Axes

UNITS = {"um": ("shift_um", "shift of the wavelength", "µm"),
         "meV": ("shift_meV", "shift of the energy", "meV")}  # fmt: skip
#: a shift below this [um, meV] is rounding
_NOTHING = 1e-9
#: the rows' names take at most this part of the width
NAMES = 0.38


def budget_bars(
    table: pd.DataFrame,
    ax: Axes | None = None,
    *,
    unit: str = "um",
    most: int = 12,
    title: str = "",
    width: object = COLUMN,
    height: object = None,
) -> Axes:
    """Draw what small changes of the stack do to a line, as bars from zero.

    Parameters
    ----------
    table : DataFrame
        From `Lines.error_budget`.
    ax : Axes, optional
        Where to draw; a new figure of pyplot's if absent.
    unit : str
        ``"um"`` or ``"meV"``.
    most : int
        Most bars; the picture tells how many smaller ones are left out.
    title : str
        Such as the line's name.
    width, height : length
        Size of a new figure, the height from the number of bars if not given.

    Returns
    -------
    Axes

    Raises
    ------
    PictureError
        If the table is no error budget or ``unit`` and ``most`` are none that can be drawn.

    Examples
    --------
    >>> import bandwright as bw
    >>> levels = bw.solve(bw.parse_line("20 nm Al0.3Ga0.7As, 7 nm GaAs, 20 nm Al0.3Ga0.7As"))
    >>> ax = budget_bars(levels.lines().error_budget())
    >>> print(ax.get_yticklabels()[0].get_text())
    layer 2 (GaAs), +1 ML
    """
    table = checked(table)
    if unit not in UNITS:
        raise PictureError(f"unit: got {show(unit)}{close_matches(str(unit), UNITS)}")
    if not isinstance(most, int) or most < 1:
        raise PictureError(f"most: got {show(most)}; a whole number from 1 is due")
    name, words, printed_unit = UNITS[unit]
    for due in ("what", "change"):
        if due not in table.columns:
            raise PictureError(f"table: there is no column {due!r}; give lines.error_budget()")
    shifts: list[float] = column(table, name).tolist()
    known = sorted(
        (row for row in range(len(shifts)) if math.isfinite(shifts[row])),
        key=lambda row: -abs(round(shifts[row], 9)),
    )
    shown, left_out = known[:most], len(table) - len(known[:most])
    remarks = table["remark"].tolist() if "remark" in table.columns else [None] * len(table)
    remarked = [isinstance(remark, str) and bool(remark) for remark in remarks]
    names = [f"{table['what'].iloc[row]}, {table['change'].iloc[row]}" for row in shown]
    widest = max((abs(shifts[row]) for row in shown), default=0.0)
    if widest < _NOTHING:
        raise PictureError(f"table: no {name} is above rounding; there is nothing to draw")
    ax = axes(ax, width, height, 20.0 + 5.0 * len(shown))
    left = NAMES * cell(ax)[0]
    for place, row in enumerate(shown):
        _bar(ax, place, shifts[row], widest, remarked[row])
    ax.axvline(0.0, color=BLACK, linewidth=THIN)
    ax.set_yticks(range(len(shown)), [folded(text, left, SMALL) for text in names])
    ax.set_ylim(len(shown) - 0.4, -0.6)
    ax.set_xlim(*_limits([shifts[row] for row in shown], widest))
    dress(ax, f"{words}{GAP}({printed_unit})", "", title, left)
    ax.tick_params(axis="y", length=0.0)
    ax.spines["left"].set_visible(False)
    notes = []
    if any(remarked[row] for row in shown):
        notes.append("* read the remark in the table")
    if left_out:
        notes.append(f"{left_out} smaller or unknown not shown")
    if notes:
        note = ax.annotate(
            "\n".join(notes), xy=(1.0, 0.0), xycoords="axes fraction", xytext=(0.0, -depth(ax)),
            textcoords="offset points", fontsize=SMALL, color=FAINT, ha="right", va="top",
            annotation_clip=False,
        )  # fmt: skip
        note.set_gid("note")
    return ax


def _bar(ax: Axes, place: int, shift: float, widest: float, remarked: bool) -> None:
    """Draw one bar with its number at the end; the sign is told by side, hatch and number."""
    up = shift >= 0.0
    ax.barh(place, shift, height=0.62, facecolor=BLUE if up else "white", linewidth=THIN,
            edgecolor=BLUE if up else VERMILION, hatch=None if up else "//////",
            gid=f"bar {place + 1}")  # fmt: skip
    ax.annotate(_signed(shift, widest) + ("*" if remarked else ""), xy=(shift, place),
                xytext=(3.0 if up else -3.0, 0.0), textcoords="offset points", fontsize=SMALL,
                va="center", ha="left" if up else "right").set_gid("value")  # fmt: skip


def _signed(shift: float, widest: float) -> str:
    """Return a shift with its sign, to three digits of the widest.

    Examples
    --------
    >>> _signed(1.0, 1.19), _signed(-0.0499, 1.19), _signed(6e-15, 1.19)
    ('+1.00', '−0.05', '0')
    """
    digits = max(0, 2 - math.floor(math.log10(widest)))
    text = f"{shift:+.{digits}f}".replace("-", "\N{MINUS SIGN}")
    return text if any(letter in "123456789" for letter in text) else "0"


def _limits(shifts: list[float], widest: float) -> tuple[float, float]:
    """Return limits with room for the numbers at the ends of the bars."""
    low, high = min([*shifts, 0.0]), max([*shifts, 0.0])
    room = 0.3 * (high - low or widest)
    return low - (room if low < 0.0 else 0.0), high + room
