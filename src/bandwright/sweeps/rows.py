"""Rows: the columns of a sweep as they fill, in the order of the designs, and their table."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from ..errors import StackError
from ..frames import frame
from .plan import Plan
from .work import Block, Column, Task

if TYPE_CHECKING:
    import pandas as pd

_AT_ONCE = 4096
#: whole numbers up to here are floats without loss
_EXACT = 2**53


class Rows:
    """The rows of a sweep, filled in any order.

    Parameters
    ----------
    plan : Plan
    task : Task

    Raises
    ------
    StackError
        If a metric has the name of another column.
    """

    def __init__(self, plan: Plan, task: Task) -> None:
        self._plan, self._pair = plan, task.choice.pair
        self.parameters = [axis.column for axis in plan.axes]
        self._metrics = {name: _Cells(len(plan)) for name in task.metrics}
        self._reasons: dict[int, str] = {}
        self.missing = np.ones(len(plan), dtype=bool)
        self.names = ("design", *self.parameters, *self._metrics, "reason")
        for name in self.names:
            if self.names.count(name) > 1:
                raise StackError(f"metrics: {name!r} is the name of another column")

    @property
    def done(self) -> int:
        """How many designs have their row."""
        return len(self.missing) - int(np.sum(self.missing))

    def add(self, block: Block) -> None:
        """Fill in the rows of some designs."""
        designs = np.array(block.designs, dtype=np.int64)
        self.missing[designs] = False
        failed = {d: why for d, why in zip(block.designs, block.reasons, strict=True) if why}
        self._reasons |= failed
        for name, cells in self._metrics.items():
            cells.put(designs, block.columns[name])

    def listed(self, block: Block) -> list[tuple[Any, ...]]:
        """Return rows for the results file: the design's number from 1, and its other cells."""
        columns = [
            column.tolist() if isinstance(column, np.ndarray) else column
            for column in (block.columns[name] for name in self._metrics)
        ]
        numbers = [design + 1 for design in block.designs]
        shown = self._plan.shown(block.designs)
        return list(zip(numbers, *shown, *columns, block.reasons, strict=True))

    def restore(self, recorded: Iterable[tuple[int, list[Any]]]) -> None:
        """Fill in rows of a results file."""
        batch: list[tuple[int, list[Any]]] = []
        for row in recorded:
            batch.append(row)
            if len(batch) == _AT_ONCE:
                self.add(self._block(batch))
                batch = []
        if batch:
            self.add(self._block(batch))

    def _block(self, rows: Sequence[tuple[int, list[Any]]]) -> Block:
        skip = len(self.parameters)
        cells = list(zip(*(cells[skip:] for _, cells in rows), strict=True))
        columns: dict[str, Column] = {
            name: list(column) for name, column in zip(self._metrics, cells, strict=False)
        }
        reasons = [None if why is None else str(why) for why in cells[-1]]
        return Block([design for design, _ in rows], columns, reasons)

    def table(self) -> pd.DataFrame:
        """Return the table, in the order of the designs."""
        size = len(self._plan)
        columns: dict[str, Any] = {"design": np.arange(1, size + 1)}
        texts = ["reason"]
        shown = self._plan.shown(range(size))
        for name, column in zip(self.parameters, shown, strict=True):
            floats = set(map(type, column)) == {float}
            columns[name] = np.array(column) if floats else column
            texts += [name] if any(isinstance(cell, str) for cell in column) else []
        for name, cells in self._metrics.items():
            columns[name] = cells.column()
            texts += [name] if cells.holds_text else []
        columns["reason"] = [self._reasons.get(design) for design in range(size)]
        table = frame(columns, index="design", texts=texts)
        table.attrs["parameters"] = tuple(self.parameters)
        table.attrs["line"] = self._pair
        return table


class _Cells:
    """One column: numbers in an array, anything else beside it."""

    def __init__(self, size: int) -> None:
        self._numbers = np.full(size, np.nan)
        self._others: dict[int, Any] = {}
        self._whole = True

    def put(self, designs: npt.NDArray[np.int64], values: Column) -> None:
        """Fill in some cells; None leaves them empty."""
        if isinstance(values, np.ndarray):
            self._whole &= bool(np.issubdtype(values.dtype, np.integer))
            self._numbers[designs] = values
            return
        for design, value in zip(designs.tolist(), values, strict=True):
            if isinstance(value, float):
                self._whole &= value != value
                self._numbers[design] = value
            elif isinstance(value, int) and not isinstance(value, bool) and abs(value) < _EXACT:
                self._numbers[design] = value
            elif value is not None:
                self._others[design] = value

    @property
    def holds_text(self) -> bool:
        """Whether any cell is text."""
        return any(isinstance(value, str) for value in self._others.values())

    def column(self) -> Column:
        """Return all cells."""
        gaps = bool(np.isnan(self._numbers).any())
        if self._others:
            cells = self._integers() if self._whole else self._numbers.tolist()
            for design, value in self._others.items():
                cells[design] = value
            return cells
        if self._whole and not gaps:
            return self._numbers.astype(np.int64)
        return self._numbers

    def _integers(self) -> list[Any]:
        return [None if number != number else int(number) for number in self._numbers.tolist()]
