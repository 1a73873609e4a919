"""A sequence of designs -> tracks: each a level followed through it."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, StackError
from ..levels import Levels
from ..quantities import show
from .matching import LOST, matched
from .overlapping import check_levels

Indices = npt.NDArray[np.int64]


def follow(levels: Iterable[Levels | BandwrightError]) -> Indices:
    """Return the level index of each track in each design, (n_designs, n_tracks).

    A track is a level followed by its character from design to design (`overlaps`), whatever its
    number becomes. -1 stands where a track is lost: its level has left the range of energies, or
    the step was so large that nothing of it is left; a level without a track begins a new one.
    A design that failed has no level, and is stepped over.

    Parameters
    ----------
    levels : iterable of Levels
        In order, of designs with the same sequence of layers; ``solve_many(stacks)`` can be given
        as it is.

    Returns
    -------
    array of int
        Indices from 0 into ``levels[design].energies``.

    Raises
    ------
    StackError, SolveError
        If something else is given, or two designs can't be laid on each other; the text says
        which.

    Notes
    -----
    Where two levels meet in an anticrossing, the step decides. Steps longer than its width carry
    each track through it: the tracks cross, and each keeps its place in the structure. Steps much
    shorter see the states mix a little at a time: the tracks turn back from each other, keep their
    order in energy, and change places. The limit is a step on which the states mix by half, an
    overlap of 1/sqrt(2); a design in the very middle keeps the order.

    Examples
    --------
    An invented pair of wells, nearly closed off from each other: with the width of the first one
    its level passes that of the second, which is number 2 and then number 1.

    >>> import bandwright as bw
    >>> many = bw.solve_many([bw.parse_line(
    ...     f"20 nm Al0.3Ga0.7As, {width} nm GaAs, 12 nm Al0.3Ga0.7As, 6 nm GaAs,"
    ...     " 20 nm Al0.3Ga0.7As", substrate="GaAs") for width in (5.5, 6.5)])
    >>> bw.follow(many)[:, :2]
    array([[0, 1],
           [1, 0]])
    """
    if isinstance(levels, Levels | str) or not isinstance(levels, Iterable):
        raise StackError(f"follow: got {show(levels)}; give a list of Levels, [levels, ...]")
    rows: list[dict[int, int]] = []  # track -> index
    before: Levels | None = None
    last: dict[int, int] = {}
    tracks = 0
    for number, one in enumerate(levels):
        if isinstance(one, BandwrightError):
            rows.append({})
            continue
        check_levels(one, f"design {number + 1}")
        row = {} if before is None else _carried(before, one, last, number)
        held = set(row.values())
        fresh = [index for index in range(len(one)) if index not in held]
        row |= dict(zip(range(tracks, tracks + len(fresh)), fresh, strict=True))
        tracks += len(fresh)
        rows.append(row)
        before, last = one, row
    result = np.full((len(rows), tracks), LOST)
    for design, row in enumerate(rows):
        result[design, list(row)] = list(row.values())
    return result


def _carried(before: Levels, now: Levels, last: dict[int, int], number: int) -> dict[int, int]:
    """Return the tracks of one design that the next one has."""
    try:
        found = matched(before, now)
    except BandwrightError as error:
        raise error.at(f"follow, design {number + 1}") from None
    return {track: int(found[i]) for track, i in last.items() if found[i] != LOST}
