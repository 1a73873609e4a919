"""Stack -> TOML text. The standard library reads TOML and does not write it."""

from __future__ import annotations

import os
from collections.abc import Mapping, Sequence
from typing import Any

from ..errors import StackFileError
from ..stack import Layer, Repeat, Stack
from .keys import entries_of, settings

_ESCAPES = {'"': '\\"', "\\": "\\\\", "\b": "\\b", "\t": "\\t", "\n": "\\n", "\f": "\\f"}
_ESCAPES |= {"\r": "\\r"}
_LONG = 4  # a table with more points than this is written one point a line


def dumps(stack: Stack, folder: str | os.PathLike[str] = ".") -> str:
    """Return the text of a stack file.

    Parameters
    ----------
    stack : Stack
    folder : path
        Where the file will lie; paths of material files are written relative to it.

    Raises
    ------
    StackFileError
        If a value along a layer is a callable.

    Examples
    --------
    >>> from bandwright.stack import Layer, Stack
    >>> print(dumps(Stack([Layer("6.2 nm", "GaAs", label="well")], temperature="77 K")), end="")
    [stack]
    temperature = "77 K"
    <BLANKLINE>
    [[layers]]
    label = "well"
    material = "GaAs"
    thickness = "6.2 nm"
    """
    blocks = []
    said = settings(stack)
    if "materials" in said:
        said["materials"] = [relative(path, folder) for path in said["materials"]]
    if said:
        blocks.append(["[stack]", *(f"{key} = {toml_value(v)}" for key, v in said.items())])
    number = 1
    for entry in stack.layers:
        lines = ["[[layers]]"]
        if isinstance(entry, Repeat):
            inner, number = _group(entry, number)
            lines += [f"times = {entry.times}", "layers = [", *(f"  {one}," for one in inner), "]"]
        else:
            lines += [line for pair in _entries(entry, number).items() for line in _line(*pair)]
            number += 1
        blocks.append(lines)
    return "\n\n".join("\n".join(block) for block in blocks) + "\n"


def relative(path: str, folder: str | os.PathLike[str]) -> str:
    """Return how a file in ``folder`` names the file at ``path``, with forward slashes."""
    try:
        written = os.path.relpath(path, os.fspath(folder))
    except ValueError:  # another drive
        written = os.path.abspath(path)
    return written.replace(os.sep, "/")


def toml_value(value: Any) -> str:
    """Return a value in TOML: text, number, list, or mapping as an inline table.

    Examples
    --------
    >>> print(toml_value({"thickness": "6 nm", "x": [0.0, 0.3]}))
    { thickness = "6 nm", x = [0.0, 0.3] }
    """
    if isinstance(value, str):
        return '"' + "".join(_escaped(character) for character in value) + '"'
    if isinstance(value, Mapping):
        return "{ " + ", ".join(f"{_key(k)} = {toml_value(v)}" for k, v in value.items()) + " }"
    if isinstance(value, Sequence):
        return "[" + ", ".join(toml_value(item) for item in value) + "]"
    return repr(value)


def _escaped(character: str) -> str:
    if character in _ESCAPES:
        return _ESCAPES[character]
    if ord(character) < 0x20 or ord(character) == 0x7F:
        return f"\\u{ord(character):04X}"
    if 0xD800 <= ord(character) < 0xE000:
        raise StackFileError(f"{character!r} is half a character, which no file can hold")
    return character


def _key(key: str) -> str:
    bare = key.isascii() and key.replace("_", "").replace("-", "").isalnum()
    return key if bare else toml_value(key)


def _group(group: Repeat, number: int) -> tuple[list[str], int]:
    """Return a group's entries as inline tables, and the number of the next written layer."""
    tables = []
    for entry in group.layers:
        if isinstance(entry, Repeat):
            inner, number = _group(entry, number)
            tables.append(f"{{ times = {entry.times}, layers = [{', '.join(inner)}] }}")
        else:
            tables.append(toml_value(_entries(entry, number)))
            number += 1
    return tables, number


def _entries(layer: Layer, number: int) -> dict[str, Any]:
    """Return a layer's entries, tables of points under keys of their own."""
    entries = entries_of(layer, number)
    return {f"{k}_points" if _is_table(v) else k: v for k, v in entries.items()}


def _is_table(value: Any) -> bool:
    return isinstance(value, list) and isinstance(value[0], list)


def _line(key: str, value: Any) -> list[str]:
    if _is_table(value) and len(value) > _LONG:
        return [f"{key} = [", *(f"  {toml_value(point)}," for point in value), "]"]
    return [f"{key} = {toml_value(value)}"]
