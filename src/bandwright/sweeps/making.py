"""Values -> stacks: only the layers that a value concerns are made, once a value.

A sweep of n designs has far fewer values than designs; a layer, once made with a value, is shared
by all designs that have it.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import fields
from functools import partial
from typing import Any, Protocol, TypeVar

from ..errors import BandwrightError, StackError
from ..parameters import find, replace
from ..parameters.layers import replaced
from ..quantities import Length, show
from ..shapes import Function, Points
from ..stack import Layer, Repeat, Stack
from ..stack.groups import exchanged
from .axes import called

Made = Stack | BandwrightError
#: layers with their paths in the stack
Placed = tuple[tuple[tuple[int, ...], Layer], ...]
Result = TypeVar("Result")

_AROUND = ("temperature", "field", "bias", "substrate")
_FIELDS = tuple(field.name for field in fields(Stack))


class Maker(Protocol):
    """Makes the stacks of some designs."""

    def __call__(self, values: Sequence[Sequence[Any]]) -> list[Made]:
        """Return each design's stack, or what is wrong with it, from values axis by axis."""
        ...


def maker(
    design: Stack | Callable[..., Stack], names: Sequence[str], units: Sequence[str]
) -> Maker:
    """Return what makes the stacks of a sweep.

    Parameters
    ----------
    design : Stack or callable
    names : sequence of str
        What is set, in this order.
    units : sequence of str
        Core unit of each.

    Raises
    ------
    StackError
        If a layer's thickness can't be given in the unit of its values.
    """
    if not isinstance(design, Stack):
        return partial(_one_by_one, _Called(design, names))
    base = _in_units(design, names, units)
    if all(name in _AROUND or "." in name for name in names):
        return _Exchange(base, names)
    return partial(_one_by_one, _Replace(base, names))


def _one_by_one(
    make: Callable[[Sequence[Any]], Stack], values: Sequence[Sequence[Any]]
) -> list[Made]:
    return [_made(make, each) for each in zip(*values, strict=True)]


def _made(make: Callable[[Any], Result], given: Any) -> Result | BandwrightError:
    """Return what is made of a value, or the error that it is."""
    try:
        return make(given)
    except BandwrightError as error:
        return error


class _Called:
    """Asks a user's function."""

    def __init__(self, function: Callable[..., Stack], names: Sequence[str]) -> None:
        self._function, self._names = function, tuple(names)

    def __call__(self, values: Sequence[Any]) -> Stack:
        arguments = dict(zip(self._names, values, strict=True))
        try:
            stack = self._function(**arguments)
        except BandwrightError:
            raise
        except Exception as error:  # whatever a user's function does, the sweep goes on
            raise StackError(f"{type(error).__name__}: {error}", self._call(arguments)) from None
        if not isinstance(stack, Stack):
            raise StackError(f"returned {show(stack)}; a Stack is due", self._call(arguments))
        return stack

    def _call(self, arguments: dict[str, Any]) -> str:
        given = ", ".join(f"{name}={show(value)}" for name, value in arguments.items())
        return f"{called(self._function)[:-1]}{given})"


class _Replace:
    """Sets one parameter after the other, as those on the whole stack need."""

    def __init__(self, base: Stack, names: Sequence[str]) -> None:
        self._base, self._names = base, tuple(names)

    def __call__(self, values: Sequence[Any]) -> Stack:
        stack = self._base
        for name, value in zip(self._names, values, strict=True):
            stack = replace(stack, name, value)
        return stack


class _Exchange:
    """Exchanges layers made once a value, in a stack whose surroundings are made once a value.

    What `Stack` checks of its layers together does not depend on their numbers, so designs are
    not checked again.
    """

    def __init__(self, base: Stack, names: Sequence[str]) -> None:
        self._base = base
        around = [i for i, name in enumerate(names) if name in _AROUND]
        self._set_around = _Replace(base, [names[i] for i in around])
        self._around = _OnceAValue(self._surroundings, around)
        self._groups = [
            _OnceAValue(_Layers(base, names, group), group) for group in _groups(base, names)
        ]
        self._nested = any(isinstance(layer, Repeat) for layer in base.layers)

    def __call__(self, values: Sequence[Sequence[Any]]) -> list[Made]:
        """Return each design's stack, or what is wrong with it."""
        count = len(values[0])
        bad: dict[int, BandwrightError] = {}
        around = self._around(values, count, bad)
        exchanged = [group(values, count, bad) for group in self._groups]
        made: list[Made] = []
        for index, (inner, *parts) in enumerate(zip(around, *exchanged, strict=True)):
            if index in bad:
                made.append(bad[index])
                continue
            stack = object.__new__(Stack)
            stack.__dict__.update(inner, layers=self._layers(parts))
            made.append(stack)
        return made

    def _layers(self, parts: Sequence[Placed]) -> tuple[Layer | Repeat, ...]:
        if self._nested:
            layers = self._base.layers
            for part in parts:
                for path, layer in part:
                    layers = exchanged(layers, path, layer)
            return layers
        flat = list(self._base.layers)
        for part in parts:
            for path, layer in part:
                flat[path[0]] = layer
        return tuple(flat)

    def _surroundings(self, values: Sequence[Any]) -> dict[str, Any]:
        stack = self._set_around(values)
        return {name: getattr(stack, name) for name in _FIELDS}


class _OnceAValue:
    """What is made of some axes' values; those of the last designs are kept for the next.

    Parameters
    ----------
    make : callable
        Takes values of the axes.
    axes : sequence of int
    """

    def __init__(self, make: Callable[[Sequence[Any]], Any], axes: Sequence[int]) -> None:
        self._make, self._axes = make, tuple(axes)
        self._known: dict[tuple[Any, ...], Any] = {}

    def __call__(
        self, values: Sequence[Sequence[Any]], count: int, bad: dict[int, BandwrightError]
    ) -> list[Any]:
        """Return what is made for each design, and add to what is wrong with some."""
        known = self._known
        columns = [values[i] for i in self._axes]
        keys = list(zip(*columns, strict=True)) if columns else [()] * count
        table = {
            key: known[key] if key in known else _made(self._make, key)
            for key in dict.fromkeys(keys)
        }
        self._known = table
        wrong = {key: made for key, made in table.items() if isinstance(made, BandwrightError)}
        if wrong:
            for index, key in enumerate(keys):
                if key in wrong:
                    bad.setdefault(index, wrong[key])
        return [table[key] for key in keys]


class _Layers:
    """The layers that some axes concern, which concern no others."""

    def __init__(self, base: Stack, names: Sequence[str], group: Sequence[int]) -> None:
        written = {one.number: one for one in base.written()}
        self._steps = [(names[i], names[i].rpartition(".")[2], find(base, names[i]).layer_numbers)
                       for i in group]  # fmt: skip
        numbers = sorted({n for _, _, moved in self._steps for n in moved})
        self._first = {n: written[n].layer for n in numbers}
        self._paths = [written[n].path for n in numbers]

    def __call__(self, values: Sequence[Any]) -> Placed:
        """Return the path and the layer of each, for values of the group's axes."""
        layers = dict(self._first)
        for (name, key, moved), value in zip(self._steps, values, strict=True):
            try:
                for number in moved:
                    layers[number] = replaced(layers[number], key, value)
            except BandwrightError as error:
                raise error.at(name) from None
        return tuple(zip(self._paths, layers.values(), strict=True))


def _groups(base: Stack, names: Sequence[str]) -> list[list[int]]:
    """Return the axes by index, those that concern a common layer together."""
    groups: list[tuple[set[int], list[int]]] = []
    for index, name in enumerate(names):
        if name in _AROUND:
            continue
        moved, members = set(find(base, name).layer_numbers), [index]
        apart = []
        for numbers, others in groups:
            if numbers & moved:
                moved |= numbers
                members = [*others, *members]
            else:
                apart.append((numbers, others))
        groups = [*apart, (moved, sorted(members))]
    return [members for _, members in groups]


def _in_units(base: Stack, names: Sequence[str], units: Sequence[str]) -> Stack:
    """Return the stack with the layers whose thickness is swept written in the sweep's unit."""
    for name, unit in zip(names, units, strict=True):
        parameter = find(base, name)
        if parameter.kind != "thickness" or parameter.unit == unit:
            continue
        for number in parameter.layer_numbers:
            layer = next(one.layer for one in base.written() if one.number == number)
            if any(isinstance(shape, Points | Function) for _, shape in layer.shapes):
                raise StackError(
                    f"got values in {unit}; a layer with a table or a callable is stretched from"
                    f" the {parameter.unit} it is written in", name
                )  # fmt: skip
            base = base.with_layer(number, layer.replace(thickness=Length(1.0, unit)))
    return base
