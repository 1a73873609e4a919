"""A sequence of designs -> tracks: each a level followed through it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, StackError
from ..levels import Levels
from ..quantities import show
from .matching import HALF, LOST, assign
from .overlapping import check_levels, overlaps

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: a level that holds less of what it was has begun to mix: a rotation by more than pi/8
CLEAR = float(np.cos(np.pi / 8) ** 2)


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
    order in energy, and change places. The limit is an overlap of 1/sqrt(2), where half of a
    state has gone over, on one step, or on two where the first has turned it by more than pi/8: so
    a design in the very middle, where the two keep their order in energy, is seen through.

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
    return along(levels, Tracked())


def along(levels: Iterable[Levels | BandwrightError], state: Tracked) -> Indices:
    """Return what `follow` does, from a state before the first design."""
    rows: list[dict[int, int]] = []
    for number, one in enumerate(levels):
        if isinstance(one, BandwrightError):
            rows.append({})
            continue
        check_levels(one, f"design {number + 1}")
        try:
            state = state.step(one)
        except BandwrightError as error:
            raise error.at(f"follow, design {number + 1}") from None
        rows.append({track: place.at for track, place in state.places.items()})
    result = np.full((len(rows), state.count), LOST)
    for design, row in enumerate(rows):
        result[design, list(row)] = list(row.values())
    return result


class Place(NamedTuple):
    """A track in one design: the index of its level, ``at``.

    ``earlier`` is the place before, if the level has begun to mix here, so that the next design is
    better compared with that one.
    """

    levels: Levels
    at: int
    earlier: Place | None = None


@dataclass(frozen=True)
class Tracked:
    """Where each track is after some designs.

    Parameters
    ----------
    places : mapping of int to Place
        By number of the track; those that are lost are not in it.
    count : int
        How many tracks there have been.
    patient : bool
        Whether a level that begins to mix is judged after the next step; else each step decides.
    """

    places: Mapping[int, Place] = field(default_factory=dict)
    count: int = 0
    patient: bool = True

    def step(self, now: Levels) -> Tracked:
        """Return where each track is in the next design; levels without a track begin one.

        Raises
        ------
        StackError, SolveError
            As `bandwright.overlaps`.
        """
        tracks = sorted(self.places, key=lambda track: self.places[track].at)
        before = [self.places[track] for track in tracks]
        every = [p for place in before for p in (place, place.earlier) if p is not None]
        known = {id(place.levels): place.levels for place in every}
        squares = {key: overlaps(levels, now) ** 2 for key, levels in known.items()}

        def row(place: Place) -> Floats:
            return np.asarray(squares[id(place.levels)][place.at])

        sources = [
            place.earlier
            if place.earlier is not None and row(place.earlier).max(initial=0.0) > HALF
            else place
            for place in before
        ]
        each = np.array([row(source) for source in sources]).reshape(len(sources), len(now))
        found = assign(each, _copies(sources), now.groups).tolist()
        places: dict[int, Place] = {}
        for track, place, own, index in zip(tracks, before, each, found, strict=True):
            if index != LOST:
                mixed = self.patient and own[index] < CLEAR and place.earlier is None
                places[track] = Place(now, index, Place(*place[:2]) if mixed else None)
        fresh = sorted(set(range(len(now))) - set(found))
        new = {self.count + i: Place(now, index) for i, index in enumerate(fresh)}
        return Tracked(places | new, self.count + len(fresh), self.patient)


def _copies(places: Sequence[Place]) -> list[slice]:
    """Return which of them, as ranges, are copies of each other."""
    kinds = [
        (id(levels), next(g.start for g in levels.groups if g.start <= index < g.stop))
        for levels, index, _ in places
    ]
    if not kinds:
        return []
    starts = [i for i, kind in enumerate(kinds) if i == 0 or kind != kinds[i - 1]]
    return [slice(a, b) for a, b in zip(starts, [*starts[1:], len(kinds)], strict=True)]
