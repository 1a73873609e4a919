"""A layer's numbers, and what moves them, at depths along it."""

from __future__ import annotations

from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from ..formula import parse
from ..materials import BandPoint
from ..parameters.layers import moved
from ..shapes import Face, Flat, Shape
from .layout import Site, lower_face
from .materials import Around, Slopes, slopes

Floats = npt.NDArray[np.float64]

#: a change of shapes, which are linear in their numbers
STEP = 1e-2


class Along:
    """A layer's numbers at depths along it, the last two its faces."""

    def __init__(self, site: Site, around: Around, depth: Floats):
        self.site, self.around, self.depth = site, around, depth
        self._slopes: dict[str, Slopes] = {}

    @cached_property
    def face(self) -> Face:
        """The face where the edge is lower."""
        layer, ends = self.site.layer, np.array([0.0, self.site.thickness])
        if layer.edge is not None:
            return lower_face(*layer.edge.at(ends, self.site.thickness, "first"))
        values = {k: s.at(ends, self.site.thickness, "first") for k, s in layer.fractions}
        return lower_face(*np.broadcast_to(self._point(values).edge, 2))

    def values(self, shape: Shape, depth: Floats | None = None) -> Floats:
        """Return a shape's value at each depth."""
        return shape.at(self.depth if depth is None else depth, self.site.thickness, self.face)

    def letters(self, depth: Floats | None = None) -> dict[str, Floats]:
        """Return the value of each letter at each depth."""
        return {k: self.values(shape, depth) for k, shape in self.site.layer.fractions}

    def change(self, shape: Shape, part: str) -> Floats:
        """Return the change at each depth by a shape's first or last value, or by its shift."""
        if isinstance(shape, Flat):
            return np.ones_like(self.depth)
        value = 0.0 if part == "shift" else shape.samples[-1 if part == "last" else 0]
        step = moved(shape, part, value + STEP)
        return (self.values(step) - self.values(shape)) / STEP

    def _point(self, values: dict[str, Any]) -> BandPoint:
        composition = parse(str(self.site.layer.material), **values)
        return self.around.library.properties(
            composition, self.around.temperature, self.around.substrate
        )

    @cached_property
    def point(self) -> BandPoint:
        """The material's numbers at each depth."""
        return self._point(self.letters())

    def monolayers(self, depth: Floats) -> Floats:
        """Return the height of a monolayer at other depths [nm]."""
        return np.asarray(self._point(self.letters(depth)).monolayer)

    def slopes(self, direction: str, depth: Floats | None = None) -> Slopes:
        """Return the material's derivatives at each depth, remembered for its own depths."""
        material = str(self.site.layer.material)
        if depth is not None:
            return slopes(self.around, material, self.letters(depth), direction)
        if direction not in self._slopes:
            self._slopes[direction] = slopes(self.around, material, self.letters(), direction)
        return self._slopes[direction]
