"""TOML <-> Stack: the file a stack is kept in.

`read_stack` and `write_stack` are what most people need; writing and reading again gives an
equal stack.
"""

from __future__ import annotations

import os
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from ..errors import BandwrightError, StackFileError
from ..stack import Layer, Repeat, Stack
from .keys import LAYER_KEYS, SHAPED, STACK_KEYS, check_keys, layer_from, place, settings
from .points import joined, read_points, tabulated
from .writer import dumps

__all__ = ["read_stack", "write_stack", "loads", "dumps", "settings", "tabulated"]

_TABLES = ("stack", "layers")
_GROUP_KEYS = ("times", "layers")
_FILE_KEYS = LAYER_KEYS + tuple(f"{key}_{form}" for key in SHAPED for form in ("points", "file"))


def read_stack(path: str | os.PathLike[str]) -> Stack:
    """Return the stack that a TOML file describes.

    Parameters
    ----------
    path : path
        Files it names (own materials, tables of points) are looked for beside it.

    Raises
    ------
    StackFileError
        If the file can't be read, is not TOML, or has keys that mean nothing.
    StackError, QuantityError
        If what it says can't be grown or solved. The text begins with the file's path.

    Examples
    --------
    >>> read_stack("wells/none.toml")
    Traceback (most recent call last):
    ...
    bandwright.errors.StackFileError: wells/none.toml: can't be read: No such file or directory
    """
    source = os.fspath(path)
    try:
        content = Path(source).read_bytes()
        text = content.decode("utf-8-sig")
    except OSError as error:
        raise StackFileError(f"can't be read: {error.strerror or error}", source) from None
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        raise StackFileError(
            f"line {line} is not UTF-8 text; save the file as UTF-8", source
        ) from None
    return loads(text, os.path.dirname(source) or ".", source=source)


def write_stack(stack: Stack, path: str | os.PathLike[str]) -> None:
    """Write a stack to a TOML file that `read_stack` reads as an equal stack.

    Parameters
    ----------
    stack : Stack
    path : path
        Overwritten if it exists. Own material files are named relative to its folder.

    Raises
    ------
    StackFileError
        If a value along a layer is a callable, or the file can't be written.
    """
    target = os.fspath(path)
    try:
        text = dumps(stack, os.path.dirname(target) or ".")
        Path(target).write_text(text, encoding="utf-8", newline="\n")
    except OSError as error:
        raise StackFileError(f"can't be written: {error.strerror or error}", target) from None
    except BandwrightError as error:
        raise error.at(target) from None


def loads(text: str, folder: str | os.PathLike[str] = ".", *, source: str = "stack text") -> Stack:
    """Return the stack that a TOML text describes.

    Parameters
    ----------
    text : str
    folder : path
        Where files that the text names are looked for.
    source : str
        What errors call the text.

    Raises
    ------
    StackFileError, StackError, QuantityError
        As `read_stack`.

    Examples
    --------
    >>> loads('layers = [{ material = "GaAs", thickness = "62 Å" }]')
    Stack([Layer('6.2 nm', 'GaAs')])
    """
    try:
        content = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        end = f"at line {text.rstrip().count(chr(10)) + 1}, the end of the document"
        reason = str(error).replace("at end of document", end)
        raise StackFileError(f"not TOML: {reason}", source) from None
    try:
        return _stack(content, folder)
    except BandwrightError as error:
        said = content.get("stack")
        turned = isinstance(said, Mapping) and said.get("order") == "surface first"
        raise error.at(f"{source} (surface first)" if turned else source) from None


def _stack(content: Mapping[str, Any], folder: str | os.PathLike[str]) -> Stack:
    for key in content:
        if key in _FILE_KEYS or key in (*STACK_KEYS, "order"):
            under = "[[layers]]" if key in _FILE_KEYS else "[stack]"
            raise StackFileError(f"{key!r} stands outside a table; write it under {under}")
    check_keys(content, _TABLES, None)
    said = content.get("stack", {})
    if not isinstance(said, Mapping):
        raise StackFileError(f"stack: got {said!r}; write a table [stack]")
    check_keys(said, (*STACK_KEYS, "order"), "[stack]")
    arguments = dict(said)
    if "materials" in arguments:
        arguments["materials"] = _material_files(arguments["materials"], folder)
    layers, _ = _layers(content.get("layers"), folder, 1, "stack")
    return Stack(layers, **arguments)


def _material_files(given: Any, folder: str | os.PathLike[str]) -> list[str]:
    paths = [given] if isinstance(given, str) else given
    if not isinstance(paths, list) or not all(isinstance(path, str) for path in paths):
        raise StackFileError(
            f"materials: got {given!r}; write paths, such as ['house.toml']", "[stack]"
        )
    return [joined(folder, path) for path in paths]


def _layers(
    tables: Any, folder: str | os.PathLike[str], number: int, where: str
) -> tuple[list[Layer | Repeat], int]:
    """Return layers and groups, and the number of the next written layer."""
    if tables is None or tables == []:
        raise StackFileError("no layers; write a [[layers]] table for each", where)
    if isinstance(tables, Mapping):
        raise StackFileError("layers: write [[layers]] in double brackets for each layer", where)
    if not isinstance(tables, list):
        raise StackFileError(f"layers: got {tables!r}; write a list of tables", where)
    found: list[Layer | Repeat] = []
    for table in tables:
        if not isinstance(table, Mapping):
            raise StackFileError(
                f'got {table!r}; write a table, such as {{ thickness = "6.2 nm", ... }}',
                f"layer {number}",
            )
        if "layers" in table or "times" in table:
            group, number = _group(table, folder, number)
            found.append(group)
        else:
            found.append(layer_from(_with_points(table, folder, number), number))
            number += 1
    return found, number


def _group(
    table: Mapping[str, Any], folder: str | os.PathLike[str], number: int
) -> tuple[Repeat, int]:
    where = f"group from layer {number} on"
    mixed = [key for key in table if key in _FILE_KEYS]
    if mixed:
        both = "layers" if "layers" in table else "times"
        raise StackFileError(
            f"both {both!r} and {mixed[0]!r} in one table; a group has only times and layers, and"
            f" {mixed[0]} belongs into a layer inside it",
            where,
        )
    check_keys(table, _GROUP_KEYS, where)
    for key, example in (("times", "30"), ("layers", "[{ ... }, { ... }]")):
        if key not in table:
            raise StackFileError(f"{key}: missing; write for example {key} = {example}", where)
    layers, after = _layers(table["layers"], folder, number, where)
    try:
        return Repeat(table["times"], layers), after
    except BandwrightError as error:
        raise type(error)(error.message, where) from None


def _with_points(
    table: Mapping[str, Any], folder: str | os.PathLike[str], number: int
) -> dict[str, Any]:
    """Return a layer's table with tables of points under the bare key."""
    where = place(number, table)
    check_keys(table, _FILE_KEYS, where)
    entries = dict(table)
    for key in SHAPED:
        given = [k for k in (key, f"{key}_points", f"{key}_file") if k in table]
        if len(given) > 1:
            raise StackFileError(f"both {given[0]!r} and {given[1]!r} given; leave one out", where)
        if f"{key}_points" in table:
            entries[key] = _inline(entries.pop(f"{key}_points"), key, where)
        if f"{key}_file" in table:
            name = entries.pop(f"{key}_file")
            if not isinstance(name, str):
                raise StackFileError(f"{key}_file: got {name!r}; write the path of a CSV", where)
            try:
                entries[key] = read_points(os.path.join(os.fspath(folder), name), key)
            except BandwrightError as error:
                raise error.at(f"{where}, {key}_file") from None
    return entries


def _inline(points: Any, key: str, where: str) -> list[Any]:
    if not isinstance(points, list) or not all(isinstance(p, list) for p in points):
        example = '[["0 nm", 0.0], ["8 nm", 0.3]]' if key in ("x", "y") else "[[depth, value], ...]"
        raise StackFileError(
            f"{key}_points: got {points!r}; write points, such as {example}", where
        )
    return points
