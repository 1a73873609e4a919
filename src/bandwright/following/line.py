"""One line, named in one design, in every other."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from ..errors import BandwrightError, StackError
from ..frames import frame
from ..levels import Levels
from ..lines import CONTINUUM, Line
from ..metrics import Pair, line_between, read_pair
from ..quantities import show
from .matching import LOST
from .tracks import follow

if TYPE_CHECKING:
    import pandas as pd


def follow_line(
    levels: Sequence[Levels | BandwrightError], line: object, *, start: int = 1
) -> pd.DataFrame:
    """Return one line in each design of a sequence, followed by character.

    Parameters
    ----------
    levels : sequence of Levels
        As `follow` takes it.
    line : (upper, lower)
        Its levels by number in the design ``start``; the upper may be ``"continuum"``.
    start : int
        The design in which ``line`` has these numbers, from 1.

    Returns
    -------
    DataFrame
        Index ``design`` from 1, and the columns of `Lines.table`. ``upper`` and ``lower`` are the
        numbers that the levels have there; the line is upside down where they have crossed.
        Empty where a level is lost.

    Raises
    ------
    StackError
        If ``line`` is no pair of levels that design ``start`` has.

    Examples
    --------
    The invented pair of wells of `follow`; the wide well's two levels stay its two levels:

    >>> import bandwright as bw
    >>> many = bw.solve_many([bw.parse_line(
    ...     f"20 nm Al0.3Ga0.7As, {width} nm GaAs, 12 nm Al0.3Ga0.7As, 6 nm GaAs,"
    ...     " 20 nm Al0.3Ga0.7As", substrate="GaAs") for width in (6.5, 7.5)])
    >>> table = bw.follow_line(list(many), (3, 1))
    >>> table[["upper", "lower", "wavelength_um", "dipole_nm"]].round(2)
            upper  lower  wavelength_um  dipole_nm
    design
    1           3      1           8.49       1.85
    2           3      1           9.77       2.02
    """
    pairs = followed_pairs(levels, line, start=start)
    lines = [
        None if pair is None or not isinstance(one, Levels) else line_between(one, pair)
        for one, pair in zip(levels, pairs, strict=True)
    ]
    columns: dict[str, list[Any]] = {"design": list(range(1, len(lines) + 1))}
    columns |= {name: [getattr(one, name, None) for one in lines] for name in Line._fields}
    return frame(columns, index="design")


def followed_pairs(
    levels: Sequence[Levels | BandwrightError], line: object, *, start: int = 1
) -> list[Pair | None]:
    """Return the numbers of a line's levels in each design, None where one of them is lost.

    Parameters and errors as `follow_line`. The level that lies higher comes first.
    """
    pair = read_pair(line)
    if isinstance(start, bool) or not isinstance(start, int) or not 1 <= start <= len(levels):
        raise StackError(f"start: got {show(start)}; the designs are 1 to {len(levels)}")
    first = levels[start - 1]
    if isinstance(first, BandwrightError):
        raise StackError(f"start: design {start} has no levels: {first}")
    tracks = follow(levels)
    ends = []
    for number in pair:
        if isinstance(number, int):
            if number > len(first):
                raise StackError(f"line: got {show(line)}; design {start} has levels 1 to"
                                 f" {len(first)}")  # fmt: skip
            ends.append(tracks[:, np.flatnonzero(tracks[start - 1] == number - 1)[0]])
    return [_pair(pair, [int(end[design]) for end in ends]) for design in range(len(levels))]


def _pair(asked: Pair, found: list[int]) -> Pair | None:
    if LOST in found:
        return None
    if asked[0] == CONTINUUM:
        return CONTINUUM, found[0] + 1
    return max(found) + 1, min(found) + 1
