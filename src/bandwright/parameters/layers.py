"""The numbers of one written layer: their names, values and units, and a layer with one changed."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, NamedTuple

from ..errors import BandwrightError, StackError, UnknownName, close_matches
from ..formula import Sublattice
from ..quantities import Density, Length, field_text, number_text
from ..shapes import Flat, Linear, Quadratic, Shape
from ..stack import Layer, Written
from .fractions import SITES, first_fraction, mixed_sites, with_fraction

_UNITS = {"x": "", "y": "", "edge": "eV", "mass": "m0", "gap": "eV", "nonparabolicity": "1/eV"}
_DENSITY_UNITS = {"sheet": "nm^-2", "volume": "nm^-3"}
_LETTERS = ("x", "y")


class Number(NamedTuple):
    """One number of a layer: what stands behind the dot of its name, what it is, its value."""

    key: str
    kind: str
    unit: str
    value: float


def numbers_of(written: Written) -> Iterator[Number]:
    """Yield every number of a layer.

    Raises
    ------
    MaterialError
        If its formula can't be read.
    """
    layer = written.layer
    yield Number("thickness", "thickness", layer.thickness.unit, layer.thickness.value)
    for site, sublattice in _layer_sites(written):
        yield Number(site, "composition", "", first_fraction(sublattice))
    for key, shape in layer.shapes:
        kind = "composition" if key in _LETTERS else key
        if isinstance(shape, Flat):
            yield Number(key, kind, _UNITS[key], shape.value)
            continue
        if isinstance(shape, Linear | Quadratic):
            yield Number(f"{key}_first", f"{kind} end", _UNITS[key], shape.first)
            yield Number(f"{key}_last", f"{kind} end", _UNITS[key], shape.last)
        yield Number(f"{key}_shift", kind, _UNITS[key], 0.0)
    if layer.field is not None:
        yield Number("field", "internal field", "V/nm", layer.field)
    for key, density in (("donors", layer.donors), ("acceptors", layer.acceptors)):
        if density is not None:
            yield Number(key, key, _DENSITY_UNITS[density.kind], density.value)


def _layer_sites(written: Written) -> list[tuple[str, Sublattice]]:
    material = written.layer.material
    try:
        return [] if material is None else mixed_sites(material)
    except BandwrightError as error:
        raise error.at(f"layer {written.number}") from None


def number_of(written: Written, key: str, name: str) -> Number:
    """Return one number of a layer.

    Raises
    ------
    UnknownName
        If the layer has no number of that key.
    """
    known = {number.key: number for number in numbers_of(written)}
    if key not in known:
        raise UnknownName(f"{written.name} has no {key!r}{close_matches(key, known)}", name)
    return known[key]


def replaced(layer: Layer, key: str, value: float) -> Layer:
    """Return the layer with the number of one key set to a value.

    Raises
    ------
    StackError
        If the value is not finite, or the layer can't have it.
    """
    value = finite(value)
    if key == "thickness":
        return stretched(layer, value / layer.thickness.value, value)
    if key in SITES:
        material = str(layer.material)
        sublattice = dict(mixed_sites(material))[key]
        return layer.replace(material=with_fraction(material, key, sublattice, value))
    if key == "field":
        return layer.replace(field=field_text(value))
    if key in ("donors", "acceptors"):
        return layer.replace(**{key: Density(value, getattr(layer, key).kind)})
    base, _, part = key.partition("_")
    return layer.replace(**{base: moved(dict(layer.shapes)[base], part, value)})


def stretched(layer: Layer, factor: float, value: float | None = None) -> Layer:
    """Return the layer ``factor`` times as thick, everything along it at its fractional depth.

    ``value`` is the new thickness in the unit it is written in, where it is known exactly.

    Raises
    ------
    StackError
        If nothing would be left.
    """
    if factor <= 0.0:
        shown = factor if value is None else value
        raise StackError(f"got {number_text(shown)}; a thickness must be above zero")
    value = factor * layer.thickness.value if value is None else value
    changes: dict[str, Any] = {key: shape.stretched(factor) for key, shape in layer.shapes}
    return layer.replace(thickness=Length(value, layer.thickness.unit), **changes)


def moved(shape: Shape, part: str, value: float) -> Shape:
    """Return a shape with its value, its first or last one, or its shift set to a value."""
    if part == "shift":
        return shape.mapped(_Shift(value))
    if isinstance(shape, Linear | Quadratic):
        first, last = (value, shape.last) if part == "first" else (shape.first, value)
        return type(shape)(first, last)
    return Flat(value)


@dataclass(frozen=True)
class _Shift:
    """Adds a step: a function that compares by value and pickles."""

    step: float

    def __call__(self, value: Any) -> Any:
        return value + self.step


def finite(value: float) -> float:
    """Return a value that is finite.

    Raises
    ------
    StackError
        If it is not.
    """
    if not math.isfinite(value):
        raise StackError(f"got {value}; a parameter must be finite")
    return value
