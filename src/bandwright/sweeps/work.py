"""A part of a sweep -> its rows: stacks made, solved together, asked for their metrics.

What is here runs wherever an executor runs it: a task and a part are sent, a block comes back.
"""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, StackError
from ..levels import Levels
from ..many import Many, solve_many
from ..metrics import Choice, Floats, Metric, Pair
from ..stack import Stack
from .making import Maker, maker

#: a column of some designs: numbers, or whatever a metric gives, None where a design has nothing
Column = npt.NDArray[Any] | list[Any]


#: levels that no design has, for a line that is lost
LOST_LINE: Pair = (sys.maxsize, 1)
_LOST = "the line is lost: a level has left the range, or the step before is too long to follow it"


@dataclass(frozen=True)
class Task:
    """What is done with every design of a sweep.

    Parameters
    ----------
    design : Stack or callable
    names, units : tuple of str
        Of the axes.
    metrics : mapping of str to Metric
    choice : Choice
    group : float
        Levels closer than this are copies [eV].
    arguments : mapping
        Of `bandwright.solve_many`.
    """

    design: Stack | Callable[..., Stack]
    names: tuple[str, ...]
    units: tuple[str, ...]
    metrics: Mapping[str, Metric]
    choice: Choice
    group: float
    arguments: Mapping[str, Any] = field(default_factory=dict)

    def maker(self) -> Maker:
        """Return what makes the stacks."""
        return maker(self.design, self.names, self.units)


class Part(NamedTuple):
    """Some designs: their numbers from 0, and what each is made with, axis by axis.

    ``pairs`` are the levels of the followed line in each, None where it is lost; without it the
    line has its numbers in all.
    """

    designs: list[int]
    values: list[list[Any]]
    pairs: list[Pair | None] | None = None


class Block(NamedTuple):
    """The rows of some designs: numbers from 0, metrics by name, and why a design has none."""

    designs: list[int]
    columns: dict[str, Column]
    reasons: list[str | None]

    def only(self, wanted: npt.NDArray[np.bool_]) -> Block:
        """Return the rows of the designs that are wanted."""
        kept = [i for i, design in enumerate(self.designs) if wanted[design]]
        if len(kept) == len(self.designs):
            return self
        return Block(
            [self.designs[i] for i in kept],
            {name: _taken(column, kept) for name, column in self.columns.items()},
            [self.reasons[i] for i in kept],
        )


class Solutions:
    """The levels of some designs, made one by one only for what takes more than energies.

    Parameters
    ----------
    made : sequence of Stack or BandwrightError
        Each design.
    many : Many
        Of those that are stacks, in this order.
    """

    def __init__(self, made: Sequence[Stack | BandwrightError], many: Many) -> None:
        self._many = many
        self._places = [i for i, one in enumerate(made) if isinstance(one, Stack)]
        self.errors: list[BandwrightError | None] = [
            None if isinstance(one, Stack) else one for one in made
        ]
        for index, error in many.errors.items():
            self.errors[self._places[index]] = error

    @property
    def energies(self) -> Floats:
        """Energies of all designs [eV] (n_designs, n_levels), nan where there are fewer."""
        each = self._many.energies
        most = max(map(len, each), default=0)
        energies = np.full((len(self.errors), most), np.nan)
        for place, own in zip(self._places, each, strict=True):
            energies[place, : len(own)] = own
        return energies

    def levels(self) -> Iterator[tuple[int, Levels]]:
        """Yield the place and the levels of each design that has them."""
        for index, place in enumerate(self._places):
            levels = self._many[index]
            if isinstance(levels, Levels):
                yield place, levels


def _taken(column: Column, kept: Sequence[int]) -> Column:
    return column[kept] if isinstance(column, np.ndarray) else [column[i] for i in kept]


def compute(task: Task, part: Part, make: Maker | None = None) -> Block:
    """Return the rows of some designs; ``make``, if it is at hand, is ``task.maker()``."""
    found = solve_part(task, part, make)
    reasons = [None if error is None else _reason(error) for error in found.errors]
    columns = _columns(task, found, reasons, part.pairs)
    return Block(part.designs, columns, reasons)


def solve_part(task: Task, part: Part, make: Maker | None = None) -> Solutions:
    """Return the levels of some designs, or what is wrong with them."""
    made = (make or task.maker())(part.values)
    many = solve_many([one for one in made if isinstance(one, Stack)], **task.arguments)
    return Solutions(made, many)


def _reason(error: BaseException) -> str:
    """Return what is wrong, in one line."""
    return " ".join(str(error).split())


def _columns(
    task: Task, found: Solutions, reasons: list[str | None], pairs: Sequence[Pair | None] | None
) -> dict[str, Column]:
    """Return every metric of designs, and add to the reasons of those where one fails."""
    energies = found.energies
    choice = task.choice if pairs is None else task.choice._replace(pair=None)
    solved = [error is None for error in found.errors]
    columns: dict[str, Column | None] = {}
    for name, metric in task.metrics.items():
        together = getattr(metric, "of_energies", None)
        column = together(energies, choice, task.group) if together else None
        columns[name] = None if column is None else _where_solved(column, solved)
    slow = {name: task.metrics[name] for name, column in columns.items() if column is None}
    if slow:
        columns |= _one_by_one(slow, _choices(task.choice, pairs, len(reasons)), found, reasons)
    return {name: columns[name] for name in task.metrics}  # type: ignore[misc]  # all are there


def _where_solved(column: npt.NDArray[Any], solved: Sequence[bool]) -> Column:
    """Return a column without what counts for designs that have no levels."""
    if all(solved) or column.dtype == np.float64:  # those have no energy, and so are nan
        return column
    return [cell if there else None for cell, there in zip(column.tolist(), solved, strict=True)]


def _choices(
    choice: Choice, pairs: Sequence[Pair | None] | None, count: int
) -> Sequence[Choice]:
    """Return the choice of each design, its line by the numbers that it has there."""
    if pairs is None:
        return [choice] * count
    return [choice._replace(pair=pair or LOST_LINE) for pair in pairs]


def _one_by_one(
    metrics: Mapping[str, Metric],
    choices: Sequence[Choice],
    found: Solutions,
    reasons: list[str | None],
) -> dict[str, Column | None]:
    """Return metrics that take more than energies, design by design."""
    columns: dict[str, list[Any]] = {name: [None] * len(reasons) for name in metrics}
    for index, levels in found.levels():
        if choices[index].pair == LOST_LINE:
            reasons[index] = reasons[index] or _LOST
        solved = choices[index].solved(levels)
        for name, metric in metrics.items():
            try:
                columns[name][index] = _plain(metric(solved), name)
            except BandwrightError as error:
                reasons[index] = reasons[index] or _reason(error)
            except Exception as error:  # whatever a user's metric does, the sweep goes on
                reasons[index] = reasons[index] or _reason(
                    StackError(f"{type(error).__name__}: {error}", f"metric {name!r}")
                )
    return dict(columns)


def _plain(value: Any, name: str) -> Any:
    """Return a metric's value as Python's own number, text or None."""
    value = value.item() if isinstance(value, np.generic) else value
    if value is None or isinstance(value, int | float | str):
        return value
    raise StackError(f"gave {type(value).__name__}; a number, a word or None is due",
                     f"metric {name!r}")  # fmt: skip
