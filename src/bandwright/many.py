"""solve_many(): many stacks in, their levels out; designs alike are solved at once."""

from __future__ import annotations

from collections.abc import Hashable, Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
import numpy.typing as npt

from .errors import BandwrightError, SolveError, StackError
from .frames import frame
from .levels import Levels
from .levels.ranges import Ends, Range, ranges, ranges_of_many
from .levels.result import Part
from .levels.solving import Request, check_stack, read_request, shoot
from .profile import Profile, Ready
from .profile.alike import build_alike, chosen, together
from .profile.build import Blueprint, build_profile
from .profile.sections import Unlike
from .quantities import show
from .solver.family import Batch, solve_family
from .stack import Stack
from .stack.layout import layout

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]


class _Later(NamedTuple):
    """A design solved in a batch, whose `Levels` are made when asked for."""

    batch: Batch
    place: int
    stack: Stack
    span: Range
    request: Request

    @property
    def energies(self) -> Floats:
        return self.batch.energies(self.place)

    @property
    def checked(self) -> npt.NDArray[np.bool_]:
        return self.batch.checked[self.batch.bounds[self.place] : self.batch.bounds[self.place + 1]]

    def levels(self) -> Levels:
        origin = Blueprint(self.stack, self.request.bands)
        solution = self.batch.solution(self.place, origin)
        part = Part(self.span, solution.numbers, solution.energies, solution)
        return self.request.levels(self.stack, origin, (part,))


_Entry = Levels | BandwrightError | _Later


@dataclass(frozen=True, eq=False)
class Many:
    """Levels of many designs, in the order given; a bad design is its error.

    Made by `bandwright.solve_many`. ``many[i]`` is the `Levels` of design i, or the
    `BandwrightError` that stopped it; iteration gives all of them. Where energies are enough,
    `energies` gives them without an object a design.

    Attributes
    ----------
    alone : int
        How many designs one pass left unchecked, so that they were solved alone.
    """

    _entries: list[_Entry] = field(default_factory=list, repr=False)
    alone: int = 0

    def __len__(self) -> int:
        return len(self._entries)

    def __getitem__(self, index: int) -> Levels | BandwrightError:
        entry = self._entries[index]
        if isinstance(entry, _Later):
            self._entries[index] = entry = entry.levels()
        return entry

    def __iter__(self) -> Iterator[Levels | BandwrightError]:
        return (self[index] for index in range(len(self)))

    @property
    def results(self) -> tuple[Levels | BandwrightError, ...]:
        """Levels or error of every design."""
        return tuple(self)

    @property
    def energies(self) -> list[Floats]:
        """Energies of each design [eV], (n_levels,); none of a design that failed."""
        none = np.zeros(0)
        return [none if isinstance(e, BandwrightError) else e.energies for e in self._entries]

    @property
    def errors(self) -> dict[int, BandwrightError]:
        """What is wrong with each design that failed, by its index."""
        return {i: e for i, e in enumerate(self._entries) if isinstance(e, BandwrightError)}

    @property
    def share_alone(self) -> float:
        """Share of the designs that were solved alone."""
        return self.alone / len(self) if len(self) else 0.0

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a level of each design: design (from 1), name, level, energy, checked, reason.

        A design that failed keeps one row with its reason and no level.
        """
        design: list[int] = []
        name: list[str | None] = []
        level: list[int | None] = []
        energy: list[float | None] = []
        checked: list[bool] = []
        reason: list[str | None] = []
        for index, entry in enumerate(self._entries, start=1):
            if isinstance(entry, BandwrightError):
                design.append(index)
                name.append(None)
                level.append(None)
                energy.append(None)
                checked.append(False)
                reason.append(str(entry))
                continue
            count = len(entry.energies)
            design += [index] * count
            name += [entry.stack.name] * count
            level += range(1, count + 1)
            energy += (1e3 * entry.energies).tolist()
            own = entry.checked if isinstance(entry, _Later) else entry.count_checked
            checked += own.tolist()
            reason += [None] * count
        columns: dict[str, list[Any]] = {
            "design": design, "name": name, "level": level, "energy_meV": energy,
            "count_checked": checked, "reason": reason,
        }  # fmt: skip
        return frame(columns, texts=("name", "reason"), integers=("design",))


def solve_many(
    stacks: Iterable[Stack],
    *,
    below: object = None,
    at_most: int | None = None,
    tolerance: object = "1e-6 eV",
    group: object = "0.01 meV",
    bands: str | None = None,
    chunk: int = 2000,
) -> Many:
    """Return the levels of many stacks; designs of one slice pattern are solved at once.

    Each design takes the slices and steps it would take in `bandwright.solve`, so that one and
    many agree to rounding; every design is checked by count, and what one pass leaves unchecked
    is solved alone.

    Parameters
    ----------
    stacks : iterable of Stack
        Any number; ``chunk`` designs are held in work at a time, which bounds the memory
        beyond the results.
    below, at_most, tolerance, group, bands
        As for `bandwright.solve`, for every stack.
    chunk : int
        Designs in work at a time.

    Returns
    -------
    Many

    Raises
    ------
    QuantityError, SolveError
        If an argument is wrong for every stack. What is wrong with one stack is its result.
    StackError
        If ``stacks`` is no list of stacks, or holds something else.

    Examples
    --------
    >>> import bandwright as bw
    >>> wells = [bw.parse_line(f"20 nm Al0.3Ga0.7As, {width} nm GaAs, 20 nm Al0.3Ga0.7As",
    ...                        substrate="GaAs") for width in (6, 7, 8)]
    >>> many = bw.solve_many(wells)
    >>> [len(levels) for levels in many], many.share_alone
    ([2, 2, 2], 0.0)
    """
    request = read_request(below, at_most, tolerance, group, "shooting", 1, bands)
    if not isinstance(chunk, int) or chunk < 1:
        raise SolveError(f"chunk: got {chunk!r}; a whole number from 1 is due")
    results: list[_Entry] = []
    alone = 0
    batch: list[Stack] = []
    if isinstance(stacks, Stack | str) or not isinstance(stacks, Iterable):
        raise StackError(f"stacks: got {show(stacks)}; give a list of stacks, [stack, ...]")
    for number, stack in enumerate(stacks, start=1):
        check_stack(stack, f"stack {number}")
        batch.append(stack)
        if len(batch) == chunk:
            alone += _solve_batch(batch, request, results)
            batch = []
    alone += _solve_batch(batch, request, results)
    return Many(results, alone)


def _solve_batch(stacks: Sequence[Stack], request: Request, results: list[_Entry]) -> int:
    """Append the results of some stacks; return how many of a family were solved alone."""
    found: list[_Entry | None] = [None] * len(stacks)
    layouts: dict[Hashable, list[int]] = {}
    numbers = []
    for index, stack in enumerate(stacks):
        kind, own = layout(stack)
        layouts.setdefault(kind, []).append(index)
        numbers.append(own)
    for indices in layouts.values():
        if len(indices) > 1:
            columns = np.array([numbers[i] for i in indices]).T
            for place, later in _solve_alike([stacks[i] for i in indices], columns, request):
                found[indices[place]] = later
    alone = 0
    for indices in layouts.values():
        for index in indices:
            if found[index] is None:
                found[index] = one = _alone(stacks[index], request)
                alone += len(indices) > 1 and isinstance(one, Levels)
    results += [entry for entry in found if entry is not None]
    return alone


def _solve_alike(
    stacks: Sequence[Stack], numbers: Floats, request: Request
) -> Iterator[tuple[int, _Later]]:
    """Yield the designs of one layout, those that one pass leaves unchecked left out."""
    try:
        profile = build_alike(stacks[0], numbers, request.bands)
        yield from _solve_group(profile, range(len(stacks)), stacks, request)
        return
    except (Unlike, BandwrightError):
        pass  # they are not all of one kind, or one of them can't be built
    kinds: dict[Hashable, list[int]] = {}
    profiles: dict[int, Profile] = {}
    for index, stack in enumerate(stacks):
        try:
            profiles[index] = profile = build_profile(stack, request.bands)
        except BandwrightError:
            continue  # alone it says why
        sections = profile.numbers
        kind = (sections.flat.tobytes(), sections.curved.tobytes(), profile.bands)
        kinds.setdefault(kind, []).append(index)
    for indices in kinds.values():
        joined = together([profiles[i] for i in indices])
        yield from _solve_group(joined, indices, stacks, request)


def _solve_group(
    profile: Profile, indices: Sequence[int], stacks: Sequence[Stack], request: Request
) -> Iterator[tuple[int, _Later]]:
    """Yield the designs that are one profile of many, if one range each is asked of them."""
    try:
        spans = ranges_of_many(profile, request.below, request.at_most)
    except SolveError:
        return
    ends: dict[Ends, list[int]] = {}
    for place, span in enumerate(spans):
        if len(span) == 1:
            ends.setdefault(span[0].ends, []).append(place)
    for pair, places in ends.items():
        some = profile if len(places) == len(spans) else chosen(profile, np.array(places))
        high = np.array([spans[place][0].high for place in places])
        try:
            for batch in solve_family(some, high, pair, request.at_most, request.tolerance):
                for row in np.flatnonzero(batch.good).tolist():
                    place = places[batch.which[row]]
                    index = indices[place]
                    yield index, _Later(batch, row, stacks[index], spans[place][0], request)
        except (SolveError, np.linalg.LinAlgError):
            continue


def _alone(stack: Stack, request: Request) -> Levels | BandwrightError:
    try:
        profile = build_profile(stack, request.bands)
        spans = ranges(profile, request.below, request.at_most)
        parts = shoot(profile, spans, request.at_most, request.tolerance)
        return request.levels(stack, Ready(profile), parts)
    except BandwrightError as error:
        return error
