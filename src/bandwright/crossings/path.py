"""Designs along one parameter, at any value of it."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, StackError
from ..levels import Levels
from ..many import solve_many
from ..quantities import number_text, show
from ..stack import Stack
from ..sweeps.axes import Axis, in_column, read_axes
from ..sweeps.making import Maker, maker
from ..sweeps.ranges import is_range

Floats = npt.NDArray[np.float64]
Solved = Levels | BandwrightError

#: values of a range that says neither step nor count
COUNT = 31
#: fewest designs that show where two levels are closest
LEAST_VALUES = 3


@dataclass(frozen=True)
class Path:
    """A design whose one parameter is a number.

    Parameters
    ----------
    design : Stack or callable
    axis : Axis
        The parameter with the values of the coarse sweep.
    arguments : mapping
        Of `bandwright.solve_many`.
    """

    design: Stack | Callable[..., Stack]
    axis: Axis
    arguments: Mapping[str, Any]

    @classmethod
    def read(
        cls, design: Stack | Callable[..., Stack], over: object, arguments: Mapping[str, Any]
    ) -> Path:
        """Return the path that a user's ``over`` means.

        Raises
        ------
        StackError
            If it is not one parameter with at least three numbers as values.
        """
        if isinstance(over, Mapping):
            over = {name: _counted(values) for name, values in over.items()}
        axes = read_axes(design, over)
        if len(axes) > 1:
            names = " and ".join(axis.name for axis in axes)
            raise StackError(f"over: got {names}; anticrossings are looked for along one parameter")
        path = cls(design, axes[0], arguments)
        values = axes[0].values if path._of_stack else axes[0].shown
        for value in values:
            if isinstance(value, bool) or not isinstance(value, int | float):
                raise StackError(f"got {show(value)}; anticrossings are looked for along numbers",
                                 axes[0].name)  # fmt: skip
        if len(set(values)) < LEAST_VALUES:
            raise StackError(f"got {len(set(values))} values; {LEAST_VALUES} are the least that"
                             " show where two levels are closest", axes[0].name)  # fmt: skip
        return path

    @property
    def _of_stack(self) -> bool:
        return isinstance(self.design, Stack)

    @cached_property
    def values(self) -> Floats:
        """Values of the coarse sweep, ascending, each once."""
        return np.unique(np.array(self.axis.values if self._of_stack else self.axis.shown, float))

    def shown(self, value: float) -> float:
        """Return a value as its column shows it."""
        return in_column(value, self.axis.unit) if self._of_stack else value

    @cached_property
    def _maker(self) -> Maker:
        return maker(self.design, (self.axis.name,), (self.axis.unit,))

    def solve(self, values: Sequence[float] | Floats, tolerance: object = None) -> list[Solved]:
        """Return the levels at some values, or what is wrong there."""
        given: list[Any] = [float(value) for value in values]
        if not self._of_stack and self.axis.unit:
            given = [f"{number_text(value)} {self.axis.unit}" for value in given]
        made = self._maker([given])
        stacks = [one for one in made if isinstance(one, Stack)]
        arguments = dict(self.arguments)
        if tolerance is not None:
            arguments["tolerance"] = tolerance
        solved = iter(solve_many(stacks, **arguments))
        return [next(solved) if isinstance(one, Stack) else one for one in made]


def _counted(values: Any) -> Any:
    """Return a range without step or count as one of our own count."""
    if isinstance(values, str) and is_range(values) and not any(
        word in values for word in ("step", "count")
    ):  # fmt: skip
        return f"{values} count {COUNT}"
    return values
