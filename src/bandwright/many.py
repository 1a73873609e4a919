"""solve_many(): many stacks in, their levels out; designs alike are solved at once."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

from .errors import BandwrightError, SolveError, StackError
from .frames import frame
from .levels import Levels
from .levels.ranges import Range
from .levels.result import Part
from .levels.solving import Request, check_stack, read_request, shoot, span_of
from .profile import Profile
from .profile.build import build_profile
from .quantities import show
from .solver import Solution
from .solver.family import solve_family
from .stack import Stack

if TYPE_CHECKING:
    import pandas as pd


@dataclass(frozen=True)
class Many:
    """Levels of many designs, in the order given; a bad design is its error.

    Made by `bandwright.solve_many`. ``many[i]`` is the `Levels` of design i, or the
    `BandwrightError` that stopped it; iteration gives all of them.

    Attributes
    ----------
    results : tuple of Levels or BandwrightError
    alone : int
        How many designs one pass left unchecked, so that they were solved alone.
    """

    results: tuple[Levels | BandwrightError, ...]
    alone: int = 0

    def __len__(self) -> int:
        return len(self.results)

    def __getitem__(self, index: int) -> Levels | BandwrightError:
        return self.results[index]

    def __iter__(self) -> Iterator[Levels | BandwrightError]:
        return iter(self.results)

    @property
    def share_alone(self) -> float:
        """Share of the designs that were solved alone."""
        return self.alone / len(self) if len(self) else 0.0

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a level of each design: design (from 0), name, level, energy, checked, reason.

        A design that failed keeps one row with its reason and no level.
        """
        design: list[int] = []
        name: list[str | None] = []
        level: list[int | None] = []
        energy: list[float | None] = []
        checked: list[bool] = []
        reason: list[str | None] = []
        for index, result in enumerate(self.results):
            if isinstance(result, Levels):
                count = len(result)
                design += [index] * count
                name += [result.stack.name] * count
                level += range(1, count + 1)
                energy += (1e3 * result.energies).tolist()
                checked += result.count_checked.tolist()
                reason += [None] * count
            else:
                design.append(index)
                name.append(None)
                level.append(None)
                energy.append(None)
                checked.append(False)
                reason.append(str(result))
        columns: dict[str, list[Any]] = {
            "design": design, "name": name, "level": level, "energy_meV": energy,
            "count_checked": checked, "reason": reason,
        }  # fmt: skip
        return frame(columns, texts=("name", "reason"), integers=("design",))


@dataclass
class _Waiting:
    """Designs of one layout, ends and model, to be solved together."""

    indices: list[int] = field(default_factory=list)
    profiles: list[Profile] = field(default_factory=list)
    spans: list[Range] = field(default_factory=list)


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
    results: list[Levels | BandwrightError] = []
    alone = 0
    batch: list[Stack] = []
    if isinstance(stacks, Stack | str) or not isinstance(stacks, Iterable):
        raise StackError(f"stacks: got {show(stacks)}; give a list of stacks, [stack, ...]")
    for number, stack in enumerate(stacks):
        check_stack(stack, f"stack {number}")
        batch.append(stack)
        if len(batch) == chunk:
            alone += _solve_batch(batch, request, results)
            batch = []
    alone += _solve_batch(batch, request, results)
    return Many(tuple(results), alone)


def _solve_batch(
    stacks: Sequence[Stack], request: Request, results: list[Levels | BandwrightError]
) -> int:
    """Append the results of some stacks; return how many were solved alone."""
    found: list[Levels | BandwrightError | None] = [None] * len(stacks)
    waiting: dict[object, _Waiting] = {}
    singles: list[tuple[int, Profile, tuple[Range, ...]]] = []
    for index, stack in enumerate(stacks):
        try:
            profile = build_profile(stack, request.bands)
            spans = span_of(profile, request)
        except BandwrightError as error:
            found[index] = error
            continue
        if len(spans) > 1:
            singles.append((index, profile, spans))
            continue
        numbers = profile.numbers
        key = (spans[0].ends, numbers.flat.tobytes(), numbers.curved.tobytes(), profile.bands)
        wait = waiting.setdefault(key, _Waiting())
        wait.indices.append(index)
        wait.profiles.append(profile)
        wait.spans.append(spans[0])
    for wait in waiting.values():
        for index, profile, span, solution in zip(
            wait.indices, wait.profiles, wait.spans, _together(wait, request), strict=True
        ):
            if solution is None:
                singles.append((index, profile, (span,)))
            else:
                part = Part(span, solution.numbers, solution.energies, solution)
                found[index] = request.levels(stacks[index], profile, (part,))
    for index, profile, spans in singles:
        try:
            found[index] = request.levels(
                stacks[index], profile, shoot(profile, spans, request.at_most, request.tolerance)
            )
        except BandwrightError as error:
            found[index] = error
    results += [one for one in found if one is not None]
    return len(singles)


def _together(wait: _Waiting, request: Request) -> list[Solution | None]:
    """Solve designs of one layout in one pass; none if even its setting up fails."""
    highs = [span.high for span in wait.spans]
    try:
        return solve_family(
            wait.profiles, highs, wait.spans[0].ends, request.at_most, request.tolerance
        )
    except (SolveError, np.linalg.LinAlgError):
        return [None] * len(wait.profiles)
