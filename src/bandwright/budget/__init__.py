"""Error budget of a line: what a monolayer, a per cent, ten kelvin and a field do to it.

The shift of a row is a derivative, exact from the states, times its change: nothing is solved,
but for what interfaces that are not abrupt cause.
Whether the whole change is still linear, and still the same two levels, is checked on request by
one solution there; without, slopes say which levels of those found would meet on the way.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError
from ..frames import frame
from ..levels import Levels
from ..lines import CONTINUUM, Line, Lines
from .changes import ABRUPT, MODEL, Change, changes
from .checking import LINEAR, LINEAR_EV, Sample, abrupt_shift, moved, remark_on
from .slopes import CHECK, derivatives, meeting, mixing
from .words import length_shift, wavelength_shift

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]

__all__ = ["Change", "changes", "derivatives", "error_budget"]


def error_budget(
    lines: Lines, line: Line | tuple[int | str, int] | None = None, *, checked: bool = False
) -> pd.DataFrame:
    """Return what small changes of the stack do to a line, the largest shift first.

    Changes: one monolayer more in each written layer (repeats, and layers of one label,
    together; +0.1 nm where a layer brings its own numbers and so no lattice), 0.01 more of each
    composition, 1 % more of each group-III flux (in every layer that holds the element, thickness
    and composition together), 10 K more, 1 kV/cm more along growth (10 mV more of a bias); and 1 %
    on what the model rests on: all masses, the share of each step of the gap that falls to the
    conduction band, all own edges as they count from zero. Where interfaces are not abrupt, one
    more row says what making all of them abrupt would do, what they cause with the other sign:
    solved once, since that may be no small change.

    Parameters
    ----------
    lines : Lines
    line : Line or (upper, lower), optional
        The strongest line if absent, or the first onset where no line joins two levels.
    checked : bool
        Whether to solve each changed stack as well (those of the model excepted): remarks then
        say where a level crosses another, where copies part, and where a change is too large to be
        linear. Otherwise shifts are of first order, nothing is solved, and remarks say where the
        slopes bring two of the levels found together, or where mixing with another level found
        bends a shift, to second order.

    Returns
    -------
    DataFrame
        ``what``, ``change``, ``shift_meV``, ``shift_um``, ``remark`` and ``sentence``, all of it in
        words, in nm below 0.1 um; empty without a line. Copies move by their mean.

    Raises
    ------
    StackError
        If there is no such line.

    Examples
    --------
    >>> import bandwright as bw
    >>> well = bw.Layer("10 nm", edge="0 meV", mass=0.067, label="well")
    >>> wall = bw.Layer("20 nm", edge="250 meV", mass=0.092, label="barrier")
    >>> budget = bw.solve(bw.Stack([wall, well, wall])).lines().error_budget((2, 1))
    >>> print(budget["sentence"][0])
    well, +0.1 nm: +0.2 um
    """
    levels = lines.levels
    if line is None:
        chosen = lines.main
    else:
        upper, lower = line[:2]
        chosen = lines.find(upper, lower)
    rows: list[tuple[Change, float, str]] = []
    if chosen is not None:
        every = [
            change
            for change in changes(levels)
            if chosen.upper != CONTINUUM or change.parameter.kind not in ("field", "bias")
        ]
        slopes = derivatives(levels, chosen, every)
        before = Sample.of(levels) if checked else None
        mixed = np.zeros_like(slopes.levels)
        if not checked:
            known = np.flatnonzero(np.isfinite(slopes.ends).all(axis=1))
            mixed[known] = mixing(levels, chosen, [every[place] for place in known])
        if levels.stack.realistic:
            rows.append((ABRUPT, *abrupt_shift(levels, chosen)))
        for place, (change, (up, down)) in enumerate(zip(every, slopes.ends, strict=True)):
            shift = float(up - down) * change.amount
            if not math.isfinite(shift):
                remark = "it can be moved to neither side"
            elif before is None:
                every_shift = slopes.levels[place] * change.amount
                remark = _first_order(levels, chosen, change, shift, every_shift, mixed[place])
            else:
                remark = remark_on(levels, chosen, change, shift, before)
            rows.append((change, shift, remark))
    # equal to 1e-7 eV keeps the stack's order, whatever the rounding
    rows.sort(key=lambda row: -round(abs(row[1]), 7) if math.isfinite(row[1]) else math.inf)
    return _table(chosen, rows)


def _first_order(
    levels: Levels, line: Line, change: Change, shift: float, shifts: Floats, mixed: Floats
) -> str:
    """Return what must be said of a change that is not solved, '' if nothing.

    ``shifts`` and ``mixed`` (n_levels,) are the shifts of all levels, and what mixing with each
    adds to the line's.
    """
    if change.parameter.kind not in MODEL:
        try:
            moved(levels.stack, change)
        except BandwrightError as error:
            return f"only for a smaller change: {error}"
    met = meeting(levels, line, shifts)
    added = float(mixed.sum())
    if met or abs(added) <= max(LINEAR_EV, LINEAR * abs(shift)):
        return met
    number = int(np.argmax(np.abs(mixed))) + 1
    whole = length_shift(wavelength_shift(line, shift + added))
    return f"not linear, mixing with level {number} makes it about {whole}: {CHECK}"


def _table(line: Line | None, rows: Sequence[tuple[Change, float, str]]) -> pd.DataFrame:
    lengths = [wavelength_shift(line, shift) for _, shift, _ in rows]
    sentences = [
        f"{change.what}, {change.text}: {length_shift(length)}" + (f"; {remark}" if remark else "")
        for (change, _, remark), length in zip(rows, lengths, strict=True)
    ]
    return frame(
        {
            "what": [change.what for change, _, _ in rows],
            "change": [change.text for change, _, _ in rows],
            "shift_meV": [shift * 1e3 for _, shift, _ in rows],
            "shift_um": lengths,
            "remark": [remark or None for _, _, remark in rows],
            "sentence": sentences,
        },
        texts=("what", "change", "remark", "sentence"),
    )
