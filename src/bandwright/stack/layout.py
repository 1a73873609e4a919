"""What a stack is but for its numbers, so that designs that differ in numbers are seen as alike.

A layout holds everything else whole: materials, kinds of shapes, labels, tables, groups. Whether
a number is exactly zero, and a fraction 0 or 1, is part of it, since that decides what a layer is.
"""

from __future__ import annotations

from collections.abc import Hashable, Iterator
from functools import lru_cache
from typing import Any, NamedTuple

from ..errors import BandwrightError
from ..formula import LETTERS, parse
from ..quantities import Length
from ..shapes import Flat, Linear, Quadratic, Shape
from .groups import Repeat
from .layer import Layer
from .whole import Stack

_OWN = ("edge", "mass", "gap", "nonparabolicity")


class Layout(NamedTuple):
    """What designs must share to be alike, and the numbers of one, in a fixed order."""

    kind: Hashable
    numbers: tuple[float, ...]


def layout(stack: Stack) -> Layout:
    """Return a stack's layout and numbers.

    Examples
    --------
    >>> one, other = (Stack([Layer(t, "Al0.3Ga0.7As"), Layer("6 nm", "GaAs")]) for t in
    ...               ("8 nm", "9 nm"))
    >>> layout(one).kind == layout(other).kind, layout(other).numbers
    (True, (9.0, 0.3, 6.0))
    """
    numbers: list[float] = []
    kinds = _layers(stack.layers, numbers)
    field, bias = stack.signed_field, stack.signed_bias
    kind = (kinds, stack.temperature, stack.substrate, stack.ends, stack.zero, stack.bands,
            stack.materials, stack.interface_width, stack.segregation, not field,
            not bias)  # fmt: skip
    numbers += [number for number in (field, bias) if number]
    return Layout(kind, tuple(numbers))


def filled(stack: Stack, numbers: Any) -> Stack:
    """Return a stack of the same layout with other numbers, unchecked: floats, or arrays.

    With arrays (n_designs,) it stands for many designs, for `build_profile` alone.
    """
    given = iter(numbers)
    values = {name: getattr(stack, name) for name in Stack.__dataclass_fields__}
    values["layers"] = _filled(stack.layers, given)
    values |= {"field": next(given) if stack.signed_field else None,
               "bias": next(given) if stack.signed_bias else None,
               "electrons_run": None}  # fmt: skip
    new: Stack = _unchecked(Stack, values)
    return new


def _layers(layers: tuple[Layer | Repeat, ...], numbers: list[float]) -> tuple[Hashable, ...]:
    """Add the numbers of layers and groups; return their kinds."""
    kinds: list[Hashable] = []
    for layer in layers:
        if isinstance(layer, Repeat):
            kinds.append((layer.times, _layers(layer.layers, numbers)))
            continue
        found: Layout | None = layer.__dict__.get("_layout")
        if found is None:  # designs of a sweep share most of their layers
            found = _layer(layer)
            object.__setattr__(layer, "_layout", found)
        kinds.append(found.kind)
        numbers += found.numbers
    return tuple(kinds)


def _layer(layer: Layer) -> Layout:
    numbers = [layer.thickness.value]
    material, fractions = _formula(layer)
    kinds: list[Hashable] = [layer.thickness.unit, layer.label, material, layer.interface_width]
    for name, shape in fractions:
        kinds.append((name, _shape(shape, numbers), *(v in (0.0, 1.0) for v in shape.samples)))
    for name in _OWN:
        own = getattr(layer, name)
        kinds.append(None if own is None else _shape(own, numbers))
    kinds.append(not layer.field)
    numbers += [layer.field] if layer.field else []
    return Layout(tuple(kinds), tuple(numbers))


def _formula(layer: Layer) -> tuple[str | None, tuple[tuple[str, Shape], ...]]:
    """Return a layer's formula with letters for its fractions, and those."""
    if layer.material is None or layer.fractions:
        return layer.material, layer.fractions
    pattern, values = _lettered(layer.material)
    return pattern, tuple((letter, Flat(value)) for letter, value in values)


@lru_cache(maxsize=4096)
def _lettered(formula: str) -> tuple[str, tuple[tuple[str, float], ...]]:
    """Return a formula of numbers with letters in their place, and what each letter stands for.

    A formula that needs more letters than there are stays as it is.
    """
    try:
        sites = parse(formula).sublattices
    except BandwrightError:  # what is wrong with it is said when its layer is built
        return formula, ()
    if sum(len(site) - 1 for site in sites) > len(LETTERS):
        return formula, ()
    free = iter(LETTERS)
    written, values = "", []
    for site in sites:
        used = [next(free) for _ in site[1:]]
        amounts = [*used, "-".join(["1", *used])] if used else [""]
        written += "".join(e + amount for (e, _), amount in zip(site, amounts, strict=True))
        values += [(name, float(f)) for name, (_, f) in zip(used, site, strict=False)]
    return written, tuple(values)


def _shape(shape: Shape, numbers: list[float]) -> Hashable:
    if isinstance(shape, Flat):
        numbers.append(shape.value)
        return Flat
    if isinstance(shape, Linear | Quadratic):
        numbers += (shape.first, shape.last)
        return type(shape), shape.first == shape.last
    return shape


def _filled(
    layers: tuple[Layer | Repeat, ...], numbers: Iterator[Any]
) -> tuple[Layer | Repeat, ...]:
    return tuple(
        _unchecked(Repeat, {"times": layer.times, "layers": _filled(layer.layers, numbers)})
        if isinstance(layer, Repeat)
        else _filled_layer(layer, numbers)
        for layer in layers
    )


def _filled_layer(layer: Layer, numbers: Iterator[Any]) -> Layer:
    values = {name: getattr(layer, name) for name in Layer.__dataclass_fields__}
    values["thickness"] = Length(next(numbers), layer.thickness.unit)
    material, fractions = _formula(layer)
    values["material"] = material
    values["fractions"] = tuple((name, _filled_shape(shape, numbers)) for name, shape in fractions)
    for name in _OWN:
        if values[name] is not None:
            values[name] = _filled_shape(values[name], numbers)
    values["field"] = next(numbers) if layer.field else None
    new: Layer = _unchecked(Layer, values)
    return new


def _filled_shape(shape: Shape, numbers: Iterator[Any]) -> Shape:
    new: Shape = shape
    if isinstance(shape, Flat):
        new = _unchecked(Flat, {"value": next(numbers)})
    elif isinstance(shape, Linear | Quadratic):
        new = _unchecked(type(shape), {"first": next(numbers), "last": next(numbers)})
    return new


def _unchecked(kind: Any, values: dict[str, Any]) -> Any:
    new = object.__new__(kind)
    for name, value in values.items():
        object.__setattr__(new, name, value)
    return new
