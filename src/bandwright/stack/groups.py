"""Repeat, a group of layers grown several times, and the walk through groups."""

from __future__ import annotations

import operator
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import NamedTuple

from ..errors import StackError
from ..quantities import show
from .layer import Layer, layer_name

#: a stack of more grown layers than this is refused
MOST_LAYERS = 1_000_000


@dataclass(frozen=True, init=False, repr=False)
class Repeat:
    """A group of layers grown several times.

    Parameters
    ----------
    times : int
        At least 1.
    layers : sequence of Layer or Repeat
        In the order of the stack they are part of.

    Raises
    ------
    StackError
        If ``times`` is no whole number from 1, or ``layers`` is empty or holds anything else.

    Examples
    --------
    >>> Repeat(30, [Layer("5 nm", "GaAs"), Layer("8 nm", "Al0.3Ga0.7As")]).times
    30
    """

    times: int
    layers: tuple[Layer | Repeat, ...]

    def __init__(self, times: int, layers: Iterable[Layer | Repeat]) -> None:
        try:
            whole = operator.index(times)
        except TypeError:
            whole = 0
        if whole < 1 or isinstance(times, bool):
            raise StackError(f"times: got {show(times)}; write a whole number from 1", "group")
        if whole > MOST_LAYERS:
            raise StackError(f"times: got {show(times)}; at most {MOST_LAYERS:,}", "group")
        object.__setattr__(self, "times", whole)
        object.__setattr__(self, "layers", read_layers(layers, "group"))

    def reversed(self) -> Repeat:
        """Return the group turned over: layers in the other order, each turned over."""
        return Repeat(self.times, [layer.reversed() for layer in reversed(self.layers)])

    def __repr__(self) -> str:
        return f"Repeat({self.times}, {list(self.layers)!r})"


class Written(NamedTuple):
    """A layer as written once: its number from 1 in growth order, its path, its copies.

    ``path`` holds the index in `Stack.layers`, then the index in each group's `layers`.
    """

    number: int
    layer: Layer
    path: tuple[int, ...]
    copies: int

    @property
    def name(self) -> str:
        """The label, or the number and formula."""
        return layer_name(self.number, self.layer)


def read_layers(given: object, place: str) -> tuple[Layer | Repeat, ...]:
    """Return given layers and groups, one at least."""
    if isinstance(given, str):
        raise StackError(
            f"layers: got {show(given)}; a line of text is read by parse_line(text)", place
        )
    if isinstance(given, Layer | Repeat) or not isinstance(given, Iterable):
        raise StackError(f"layers: got {show(given)}; give a list of layers", place)
    layers = tuple(given)
    if not layers:
        raise StackError("no layers; give at least one", place)
    for number, layer in enumerate(layers, start=1):
        if not isinstance(layer, Layer | Repeat):
            raise StackError(f"entry {number} is {show(layer)}; a Layer or a Repeat is due", place)
    return layers


def walk(
    layers: tuple[Layer | Repeat, ...], path: tuple[int, ...], copies: int, found: list[Written]
) -> None:
    """Add every written layer to ``found``, in order."""
    for index, layer in enumerate(layers):
        if isinstance(layer, Repeat):
            walk(layer.layers, (*path, index), copies * layer.times, found)
        else:
            found.append(Written(len(found) + 1, layer, (*path, index), copies))


def expand(layers: tuple[Layer | Repeat, ...], number: int) -> tuple[list[tuple[Layer, int]], int]:
    """Return the grown layers, and the number the next written layer has."""
    grown: list[tuple[Layer, int]] = []
    for layer in layers:
        if isinstance(layer, Repeat):
            group, number = expand(layer.layers, number)
            grown += group * layer.times
        else:
            grown.append((layer, number))
            number += 1
    return grown, number


def count(layers: tuple[Layer | Repeat, ...]) -> int:
    """Return the number of grown layers."""
    return sum(
        layer.times * count(layer.layers) if isinstance(layer, Repeat) else 1 for layer in layers
    )


def mapped(
    layers: tuple[Layer | Repeat, ...], change: Callable[[Layer], Layer]
) -> tuple[Layer | Repeat, ...]:
    """Return the layers and groups with each layer changed."""
    return tuple(
        Repeat(entry.times, mapped(entry.layers, change))
        if isinstance(entry, Repeat)
        else change(entry)
        for entry in layers
    )


def exchanged(
    layers: tuple[Layer | Repeat, ...], path: tuple[int, ...], new: Layer
) -> tuple[Layer | Repeat, ...]:
    """Return the layers with the one at a path exchanged."""
    index, *rest = path
    here = layers[index]
    entry: Layer | Repeat = new
    if isinstance(here, Repeat):
        entry = Repeat(here.times, exchanged(here.layers, tuple(rest), new))
    return (*layers[:index], entry, *layers[index + 1 :])
