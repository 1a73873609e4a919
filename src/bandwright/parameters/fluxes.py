"""One cell's flux as a parameter: the stack grown with a factor more of one group-III element.

Group V in excess, every group-III atom stays where it lands. A factor f on the flux of an element
whose fraction is x puts 1 + (f - 1) x times as many atoms on the layer: its fraction becomes
f x / (1 + (f - 1) x), and the layer as many times thicker, in monolayers. In nm the height of a
monolayer, which follows the composition, comes on top. In a grade that holds at every depth.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
import numpy.typing as npt
from numpy.polynomial import chebyshev

from ..formula import SITES, Value, letters, parse
from ..materials import BandPoint, Library
from ..quantities import Length
from ..shapes import Face, Flat, Function, Points, Shape
from ..stack import Layer, Stack
from .fractions import letter_effects, with_amounts
from .layers import stretched

Floats = npt.NDArray[np.float64]

_GROUP_III = SITES["III-V"][0]
_DEGREE = 24
_NODES = np.cos(np.pi * (np.arange(_DEGREE + 1) + 0.5) / (_DEGREE + 1))
_GAUSS, _WEIGHTS = np.polynomial.legendre.leggauss(8)
_NEWTON = 60
_NEGLIGIBLE = 1e-15


def flux_elements(stack: Stack) -> dict[str, tuple[int, ...]]:
    """Return the group-III elements whose flux can be moved, with the written layers that hold it.

    Raises
    ------
    MaterialError
        If a formula can't be read.
    """
    found: dict[str, tuple[int, ...]] = {}
    fixed: set[str] = set()
    for written in stack.written():
        held = cations_of(written.layer)
        for element in held:
            found[element] = (*found.get(element, ()), written.number)
            if _called(written.layer) and len(held) > 1:
                fixed.add(element)
    return {e: numbers for e, numbers in found.items() if e in _GROUP_III and e not in fixed}


def cations_of(layer: Layer) -> tuple[str, ...]:
    """Return the cations a layer's formula names, none of a layer with its own numbers."""
    if layer.material is None:
        return ()
    zeros: dict[str, Value] = dict.fromkeys(letters(layer.material), 0.0)
    return tuple(element for element, _ in parse(layer.material, **zeros).cations)


def cation_of(material: str, letter: str) -> str | None:
    """Return the cation whose fraction a letter of a formula is, None for a letter of anions.

    Examples
    --------
    >>> cation_of("InxGa1-xAsyP1-y", "x"), cation_of("InxGa1-xAsyP1-y", "y")
    ('In', None)
    """
    effects = letter_effects(material, letter)
    return next((e for e, sign in effects if sign > 0 and e in _GROUP_III), None)


def _called(layer: Layer) -> bool:
    """Return whether a callable of the user's is along it; our series can be moved again."""
    return any(
        isinstance(shape, Function) and not isinstance(shape.function, _Series)
        for _, shape in layer.fractions
    )


def with_flux(layer: Layer, element: str, factor: float, stack: Stack) -> Layer:
    """Return a layer grown with another flux of one element; as it is where it holds none.

    A callable is left out by `flux_elements`.

    Raises
    ------
    MaterialError
        If its material gives no lattice.
    """
    held = cations_of(layer)
    if element not in held:
        return layer
    if len(held) == 1:
        return stretched(layer, factor)
    grown = _Grown(layer, stack, element, factor)
    if all(isinstance(shape, Flat) for _, shape in layer.fractions):
        return grown.uniform()
    return grown.graded()


@dataclass(frozen=True)
class _Grown:
    """A layer, the stack around it, and a factor on one element's flux."""

    layer: Layer
    stack: Stack
    element: str
    factor: float

    def cations(self, values: Mapping[str, Value]) -> dict[str, Value]:
        """Return the layer's cations as designed, for values of its letters."""
        return dict(parse(str(self.layer.material), **values).cations)

    def share(self, values: Mapping[str, Value]) -> Value:
        """Return the element's fraction as designed."""
        return self.cations(values).get(self.element, 0.0)

    def more(self, values: Mapping[str, Value]) -> Value:
        """Return how many times as many atoms arrive."""
        return 1.0 + (self.factor - 1.0) * self.share(values)

    def changed(self, values: Mapping[str, Value]) -> dict[str, Value]:
        """Return the cations' fractions as grown."""
        total = self.more(values)
        return {
            element: fraction * (self.factor if element == self.element else 1.0) / total
            for element, fraction in self.cations(values).items()
        }

    def new_values(self, values: Mapping[str, Value]) -> dict[str, Value]:
        """Return the letters' values as grown; those of anions stay."""
        new = self.changed(values)
        owner = {letter: cation_of(str(self.layer.material), letter) for letter in values}
        return {k: v if owner[k] is None else new[str(owner[k])] for k, v in values.items()}

    def material(self, values: Mapping[str, Value]) -> str:
        """Return the formula as grown: fractions in it changed, letters kept."""
        material = str(self.layer.material)
        if letters(material):
            return material
        return with_amounts(material, {e: float(f) for e, f in self.changed(values).items()})

    def point(self, material: str, values: Mapping[str, Value]) -> BandPoint:
        """Return the numbers of a composition on the stack's substrate."""
        stack = self.stack
        library = Library.with_files(stack.materials) if stack.materials else Library.shipped()
        return library.properties(parse(material, **values), stack.temperature, stack.substrate)

    def higher(self, values: Mapping[str, Value]) -> Value:
        """Return how many times as thick a stretch becomes, in nm."""
        old = self.point(str(self.layer.material), values)
        new = self.point(self.material(values), self.new_values(values))
        return self.more(values) * new.monolayer / old.monolayer

    def uniform(self) -> Layer:
        """Return a layer of one composition as grown."""
        values: dict[str, Value] = {k: s.samples[0] for k, s in self.layer.fractions}
        thickness, unit = self.layer.thickness
        growth = self.more(values) if unit == "ML" else self.higher(values)
        changes: dict[str, Any] = {k: Flat(float(v)) for k, v in self.new_values(values).items()}
        return self.layer.replace(
            material=self.material(values), thickness=Length(thickness * float(growth), unit),
            **changes,
        )  # fmt: skip

    def graded(self) -> Layer:
        """Return a layer whose composition varies as grown, its thickness in nm."""
        thickness, unit = self.layer.thickness
        ends = self._at(np.array([0.0, 1.0]), 1.0, "first")
        edges = np.broadcast_to(self.point(str(self.layer.material), ends).edge, 2)
        face: Face = "first" if edges[0] <= edges[1] else "last"
        if unit == "ML":
            thickness *= float(np.mean(self.point(str(self.layer.material), ends).monolayer))
        shapes = [shape for _, shape in self.layer.fractions]
        depths = np.array(sorted({0.0, thickness, *_breaks(shapes, thickness)}))
        growth = _Rise(self, thickness, face)
        if len(depths) > 2 or any(isinstance(shape, Points) for shape in shapes):
            return self._table(depths, growth, thickness, face)
        return self._series(growth, thickness, face)

    def _at(self, depth: Floats, thickness: float, face: Face) -> dict[str, Value]:
        return {k: shape.at(depth, thickness, face) for k, shape in self.layer.fractions}

    def _table(self, depths: Floats, growth: _Rise, thickness: float, face: Face) -> Layer:
        """Return it as a table: each point exactly, straight in between."""
        spans = [growth.between(a, b) for a, b in pairwise(depths)]
        new = tuple(map(float, np.concatenate(([0.0], np.cumsum(spans)))))
        values = self.new_values(self._at(depths, thickness, face))
        changes: dict[str, Any] = {
            k: Points(new, tuple(map(float, np.broadcast_to(v, len(new)))))
            for k, v in values.items()
        }
        return self.layer.replace(thickness=Length(new[-1], "nm"), **changes)

    def _series(self, growth: _Rise, thickness: float, face: Face) -> Layer:
        """Return it as a smooth function of the new depth."""
        total = growth.between(0.0, thickness)
        target = 0.5 * total * (1.0 + _NODES)
        depth = target * (thickness / total)
        for _ in range(_NEWTON):
            step = (growth.up_to(depth) - target) / growth.rate(depth)
            depth = np.clip(depth - step, 0.0, thickness)
            if np.max(np.abs(step)) < 1e-14 * thickness:
                break
        values = self.new_values(self._at(depth, thickness, face))
        changes: dict[str, Any] = {}
        for letter, value in values.items():
            along = np.broadcast_to(value, depth.shape)
            series = chebyshev.chebfit(_NODES, along, _DEGREE)
            series = chebyshev.chebtrim(series, _NEGLIGIBLE)
            changes[letter] = Function(_Series(tuple(map(float, series)), total))
        return self.layer.replace(thickness=Length(total, "nm"), **changes)


@dataclass(frozen=True)
class _Rise:
    """How a grade's depth grows: integrals of the new height of each stretch."""

    grown: _Grown
    thickness: float
    face: Face

    def rate(self, depth: Floats) -> Floats:
        """Return d(new depth)/d(depth)."""
        values = self.grown._at(np.ravel(depth), self.thickness, self.face)
        rate = np.broadcast_to(self.grown.higher(values), np.size(depth))
        return np.asarray(rate, dtype=float).reshape(np.shape(depth))

    def between(self, start: float, stop: float) -> float:
        """Return how thick the stretch between two depths becomes [nm]."""
        return float(self.up_to(np.array([stop]), start)[0])

    def up_to(self, depth: Floats, start: float = 0.0) -> Floats:
        """Return how thick the stretch from ``start`` to each depth becomes [nm]."""
        half = 0.5 * (depth - start)[:, None]
        return np.asarray((half * _WEIGHTS * self.rate(start + half * (1.0 + _GAUSS))).sum(axis=1))


@dataclass(frozen=True)
class _Series:
    """A Chebyshev series on a layer: a function that compares by value and pickles."""

    coefficients: tuple[float, ...]
    thickness: float

    def __call__(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        place = np.clip(2.0 * np.asarray(depth, dtype=float) / self.thickness - 1.0, -1.0, 1.0)
        return np.asarray(np.clip(chebyshev.chebval(place, np.array(self.coefficients)), 0.0, 1.0))


def _breaks(shapes: list[Shape], thickness: float) -> Iterator[float]:
    for shape in shapes:
        yield from shape.breaks(thickness)
