"""The line of a sweep by the numbers that its levels have in each design."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from ..errors import BandwrightError
from ..following import Tracked
from ..levels import Levels
from ..metrics import Pair, line_between
from .plan import Plan
from .work import Part, Task, solve_part


class _Seen(NamedTuple):
    """Where the line was seen last: all tracks, and those of its levels, the upper first."""

    tracked: Tracked
    ends: tuple[int | str, int]


class Following:
    """Walks through the designs of a sweep in their order, a line's levels by character in each.

    A design is followed from its neighbour one step back along the last direction that is not at
    its first value (`Plan.before`), so that only one design for each direction is kept. Where the
    line is lost, later designs are followed from where it was seen last.

    Parameters
    ----------
    plan : Plan
    task : Task
        Its choice has the numbers in the first design that has both levels.
    """

    def __init__(self, plan: Plan, task: Task) -> None:
        self._plan, self._task, self._make = plan, task, task.maker()
        self._seen: list[_Seen | None] = [None] * len(plan.shape)

    def pairs(self, designs: Sequence[int]) -> list[Pair | None]:
        """Return the line's numbers in the next designs, None where it is lost.

        Raises
        ------
        StackError
            If two designs can't be laid on each other.
        """
        part = Part(list(designs), self._plan.values(designs))
        found = dict(solve_part(self._task, part, self._make).levels())
        return [self._next(design, found.get(place)) for place, design in enumerate(designs)]

    def _next(self, design: int, levels: Levels | None) -> Pair | None:
        place = np.unravel_index(design, self._plan.shape)
        moved = max((k for k, at in enumerate(place) if at), default=0)
        before = seen = self._seen[moved]
        pair: Pair | None = None
        if levels is not None:
            now = self._first(levels) if before is None else self._followed(design, before, levels)
            pair = None if now is None else _numbers(now)
            seen = before if pair is None else now
        self._seen[moved:] = [seen] * (len(self._seen) - moved)
        return pair

    def _first(self, levels: Levels) -> _Seen | None:
        """Return the line by its own numbers, None where it is not there."""
        asked = self._task.choice.pair
        if asked is None or line_between(levels, asked, dipole=False) is None:
            return None
        upper, lower = asked  # the first tracks are the levels themselves
        return _Seen(Tracked().step(levels), (upper - 1 if isinstance(upper, int) else upper,
                                              lower - 1))  # fmt: skip

    def _followed(self, design: int, before: _Seen, levels: Levels) -> _Seen:
        try:
            return _Seen(before.tracked.step(levels), before.ends)
        except BandwrightError as error:
            raise error.at(f"follow, design {design + 1}") from None


def _numbers(seen: _Seen) -> Pair | None:
    """Return the numbers of the line's levels, the higher first; None where one is lost."""
    places = [seen.tracked.places.get(end) for end in seen.ends if isinstance(end, int)]
    numbers = [place.at + 1 for place in places if place is not None]
    if len(numbers) < len(places):
        return None
    if isinstance(seen.ends[0], str):
        return seen.ends[0], numbers[0]
    return max(numbers), min(numbers)
