"""Plan: the designs of a sweep by number, a full grid or one by one, and parts of it."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import product
from typing import Any

import numpy as np
import numpy.typing as npt

from ..errors import StackError
from ..stack import Stack
from .axes import Axis
from .ranges import MOST

Indices = npt.NDArray[np.int64]


@dataclass(frozen=True)
class Plan:
    """Every design of a sweep, numbered from 0; the last parameter of a grid changes fastest.

    Parameters
    ----------
    design : Stack or callable
    axes : tuple of Axis
    paired : bool
        Whether design i takes value i of every axis; else all values meet all others.
    """

    design: Stack | Callable[..., Stack]
    axes: tuple[Axis, ...]
    paired: bool

    def __post_init__(self) -> None:
        lengths = {axis.name: len(axis) for axis in self.axes}
        if self.paired and len(set(lengths.values())) > 1:
            found = ", ".join(f"{name} has {count}" for name, count in lengths.items())
            raise StackError(f"paired: {found}; give as many values of each")
        if len(self) > MOST:
            raise StackError(f"over: {len(self):,} designs; at most {MOST:,} are swept at once")

    @property
    def shape(self) -> tuple[int, ...]:
        """Number of values along each direction of the grid."""
        return (len(self.axes[0]),) if self.paired else tuple(len(axis) for axis in self.axes)

    def __len__(self) -> int:
        return math.prod(self.shape)

    def places(self, designs: Sequence[int] | Indices) -> list[Indices]:
        """Return, axis by axis, which value each design takes."""
        numbers = np.asarray(designs, dtype=np.int64)
        if self.paired:
            return [numbers] * len(self.axes)
        return list(np.unravel_index(numbers, self.shape))

    def values(self, designs: Sequence[int] | Indices) -> list[list[Any]]:
        """Return, axis by axis, what each design is made with."""
        places = self.places(designs)
        return [_picked(axis.values, at) for axis, at in zip(self.axes, places, strict=True)]

    def shown(self, designs: Sequence[int] | Indices) -> list[list[Any]]:
        """Return, axis by axis, what the columns of the parameters show."""
        places = self.places(designs)
        return [_picked(axis.shown, at) for axis, at in zip(self.axes, places, strict=True)]

    def before(self, design: int) -> int | None:
        """Return the neighbour that a design's levels are followed from; None for the first.

        It is one step back along the fastest direction that is not at its first value, so that it
        does not depend on how the sweep is cut into chunks.
        """
        stride = 1
        for length in reversed(self.shape):
            if (design // stride) % length:
                return design - stride
            stride *= length
        return None

    def probes(self) -> list[int]:
        """Return a few designs that stand for all: the first, the last, other corners."""
        corners = [sorted({0, length - 1}) for length in self.shape[:4]]
        rest = (0,) * len(self.shape[4:])
        picked = [
            int(np.ravel_multi_index((*corner, *rest), self.shape)) for corner in product(*corners)
        ]
        middle = int(np.ravel_multi_index(tuple(n // 2 for n in self.shape), self.shape))
        return list(dict.fromkeys([0, len(self) - 1, middle, *picked]))


def _picked(values: Sequence[Any], at: Indices) -> list[Any]:
    return [values[place] for place in at.tolist()]
