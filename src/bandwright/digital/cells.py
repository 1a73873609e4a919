"""Amounts along a layer -> pulses of whole monolayers, rounding carried from cell to cell."""

from __future__ import annotations

import math
from itertools import groupby
from typing import NamedTuple

import numpy as np

from .ends import Amounts

#: amounts closer to a whole number are one
_WHOLE = 1e-9


class Pulse(NamedTuple):
    """One end, grown for so many monolayers.

    ``second`` says which end: False for the first.
    """

    second: bool
    monolayers: int


def pulses_of(amounts: Amounts, period: int) -> tuple[Pulse, ...]:
    """Return the pulses of a layer in growth order, equal neighbours as one.

    Each cell holds ``period`` monolayers, the last one what is left. What either end has had at
    the end of a cell is within half a monolayer of what it has in the layer; and the second end's
    pulse is put where, on average over the cell, its running amount is nearest to the layer's.

    Parameters
    ----------
    amounts : Amounts
    period : int
        Monolayers of a cell.

    Examples
    --------
    Sixteen monolayers, a quarter of them the second end:

    >>> n = np.linspace(0.0, 16.0, 65)
    >>> [tuple(pulse) for pulse in pulses_of(Amounts(n, n / 4, n**2 / 8), 8)]
    [(False, 3), (True, 2), (False, 6), (True, 2), (False, 3)]
    """
    total = float(amounts.grown[-1])
    whole = int(total + _WHOLE) // period
    ends = np.append(np.arange(1, whole + 1) * float(period), total)
    second = np.interp(ends, amounts.grown, amounts.second)
    panel = np.clip(np.searchsorted(amounts.grown, ends) - 1, 0, None)
    mean = (second + amounts.second[panel]) / 2.0
    moments = amounts.moment[panel] + mean * (ends - amounts.grown[panel])
    found: list[Pulse] = []
    had = start = 0
    before = 0.0
    for end, asked, moment in zip(ends.tolist(), second.tolist(), moments.tolist(), strict=True):
        upto = _nearest(asked)
        part = abs(end - round(end)) > _WHOLE  # of a monolayer, at the very end
        stop = upto + _nearest(end - asked) if part else round(end)
        length, pulse = stop - start, upto - had
        lead = 0
        if pulse:
            after = (moment - before - had * length) / pulse  # from its middle to the cell's end
            lead = min(max(_nearest(length - pulse / 2.0 - after), 0), length - pulse)
        found += [Pulse(False, lead), Pulse(True, pulse), Pulse(False, length - lead - pulse)]
        had, start, before = upto, stop, moment
    return _merged(found)


def _nearest(amount: float) -> int:
    """Return the nearest whole number, the lower one of a tie to the last digits."""
    return math.ceil(amount - 0.5 - _WHOLE)


def _merged(pulses: list[Pulse]) -> tuple[Pulse, ...]:
    kept = [pulse for pulse in pulses if pulse.monolayers]
    return tuple(
        Pulse(second, sum(pulse.monolayers for pulse in group))
        for second, group in groupby(kept, lambda pulse: pulse.second)
    )
