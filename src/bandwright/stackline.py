"""One line of text <-> Stack, for the shell, and for a table's cell.

A line lists layers in growth order: ``30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As``.
A group is ``30 x (5 nm GaAs, 8 nm Al0.3Ga0.7As)``. Braces hold what else a layer has:
``8 nm AlxGa1-xAs {x 0 to 0.3, label ramp}``, ``8 nm {edge 250 meV, mass 0.09, gap 1.8 eV}``. A
parabola is ``{x 0 to 0.3 quadratic}``, a table ``{x 0 at 0 nm to 0.12 at 3 nm to 0.3 at 8 nm}``.
"""

from __future__ import annotations

import json
import os
import re
from pathlib import Path
from typing import Any

from .errors import BandwrightError, MaterialError, StackFileError, close_matches
from .formula import letters
from .quantities import length_text
from .stack import Layer, Repeat, Stack
from .stackfile import read_stack
from .stackfile.keys import LAYER_KEYS, SHAPED, entries_of, layer_from
from .stackfile.shapetext import is_pair, shape_text, shape_value

_GROUP = re.compile(r"(?P<times>\S+?)\s*[x×*]\s*\((?P<inner>.*)\)", re.DOTALL)
_LAYER = re.compile(
    r"(?P<number>[+\-−]?[\d.][\d._]*(?:[eE][+-]?\d+)?)\s*(?P<unit>[^\s{}\"]+)?\s*(?P<rest>.*)",
    re.DOTALL,
)
_SETTING = re.compile(r"(?P<key>\w+)(?:\s*[=:]\s*|\s+|(?=\"))(?P<value>.+)", re.DOTALL)
_DECIMAL_COMMA = re.compile(r"\d+,\d+")
_BARE_NAME = re.compile(r"[A-Za-z0-9.-]+")
_BARE_LABEL = re.compile(r"\w(?:[\w .+-]*[\w.+-])?")
_CLOSING = {"(": ")", "{": "}"}
_INSIDE = tuple(key for key in LAYER_KEYS if key not in ("thickness", "material"))
_EXAMPLE = "'30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As'"


def parse_line(text: str, **stack_arguments: Any) -> Stack:
    """Return the stack that a line of text describes.

    Parameters
    ----------
    text : str
        Layers in growth order (or the order named in ``stack_arguments``).
    **stack_arguments
        What a line can't say, as for `Stack`: ``temperature="77 K"``.

    Raises
    ------
    StackFileError
        If the line can't be read; the text names the layer.
    StackError, QuantityError
        If what it says can't be grown or solved.

    Examples
    --------
    >>> parse_line("2 x (5 nm GaAs, 8 nm AlxGa1-xAs {x 0 to 0.3})", temperature="77 K")
    Stack([Repeat(2, [Layer('5 nm', 'GaAs'),
           Layer('8 nm', 'AlxGa1-xAs', x=(0, 0.3))])], temperature='77 K')
    """
    layers, _ = _layers(text, 1, "line")
    return Stack(layers, **stack_arguments)


def read_any(text: str, **stack_arguments: Any) -> Stack:
    """Return the stack that a person in a shell means: a file's path, or a line of text.

    Parameters
    ----------
    text : str
        An existing file or a path ending in ``.toml`` is read as a file, anything else as a
        line.
    **stack_arguments
        Given to `Stack` with a line; they replace what a file says.

    Raises
    ------
    StackFileError
        If the path leads to no file, or the text is neither a path nor a line.
    StackError, QuantityError
        If the stack can't be grown or solved as written.

    Examples
    --------
    >>> read_any("6.2 nm GaAs")
    Stack([Layer('6.2 nm', 'GaAs')])
    """
    kind = _kind(text)
    if kind == "file":
        stack = read_stack(text)
        return stack.replace(**stack_arguments) if stack_arguments else stack
    if kind == "folder":
        raise StackFileError("is a folder; name a stack file in it", text)
    if kind == "no file":
        folder = os.path.dirname(text) or "."
        near = close_matches(os.path.basename(text), _stack_files(folder))
        raise StackFileError(f"no such file{near if 'mean' in near else ''}", text)
    if not re.match(r"\s*[+\-−(]?[\d.]", text):
        if text.strip():
            raise StackFileError(
                f"{text!r} is neither an existing stack file nor a line of layers; a line begins"
                f" with a thickness, like {_EXAMPLE}"
            )
    return parse_line(text, **stack_arguments)


def _kind(text: str) -> str:
    try:
        path = Path(text)
        if path.is_file():
            return "file"
        if text.strip() and path.is_dir():
            return "folder"
    except (OSError, ValueError):  # too long or impossible as a path
        return "line"
    if text.lower().endswith(".toml"):
        return "no file"
    bare = not re.search(r"[\s,{(]", text)
    return "no file" if bare and ("/" in text or os.sep in text) else "line"


def _stack_files(folder: str) -> list[str]:
    try:
        return [name for name in os.listdir(folder) if name.lower().endswith(".toml")]
    except OSError:
        return []


def line_text(stack: Stack) -> str:
    """Return the line that `parse_line` reads as the layers of this stack.

    What the stack says beyond its layers is not part of a line; `stackfile.settings` returns
    it as the arguments that `parse_line` takes.

    Raises
    ------
    StackFileError
        If a value along a layer is a callable.

    Examples
    --------
    >>> line_text(Stack([Layer("5 nm", "GaAs", label="well"), Layer("8 nm", "Al0.3Ga0.7As")]))
    '5 nm GaAs {label well}, 8 nm Al0.3Ga0.7As'
    """
    return _written(stack.layers, 1)[0]


# --- line -> stack --------------------------------------------------------------------------


def _layers(text: str, number: int, where: str) -> tuple[list[Layer | Repeat], int]:
    """Return layers and groups of a list, and the number of the next written layer."""
    found: list[Layer | Repeat] = []
    if not text.strip():
        raise StackFileError(f"no layers; write them like {_EXAMPLE}", where)
    for item in _split(text, where):
        if not item:
            raise StackFileError(
                "nothing stands between two commas, or after the last; take one away",
                f"layer {number}",
            )
        group = _GROUP.fullmatch(item)
        if group:
            place = f"group from layer {number} on"
            layers, number = _layers(group["inner"], number, place)
            try:
                found.append(Repeat(_times(group["times"]), layers))
            except BandwrightError as error:
                raise type(error)(error.message, place) from None
        else:
            found.append(_layer(item, number))
            number += 1
    return found, number


def _times(text: str) -> Any:
    return int(text) if text.isascii() and text.isdigit() and len(text) < 20 else text


def _split(text: str, where: str) -> list[str]:
    """Return the parts of a text between the commas outside brackets and quotes."""
    parts, start, open_, place = [], 0, [], 0
    while place < len(text):
        character = text[place]
        if character == '"':
            place = _quote_end(text, place, where)
        elif character in _CLOSING:
            open_.append((_CLOSING[character], place))
        elif character in _CLOSING.values():
            if not open_ or open_.pop()[0] != character:
                raise StackFileError(
                    f"{character!r} closes nothing in {_around(text, place)}", where
                )
        elif character == "," and not open_:
            digits = _DECIMAL_COMMA.search(text[:place][-20:] + text[place : place + 20])
            if (
                digits
                and text[place - 1 : place].isdigit()
                and text[place + 1 : place + 2].isdigit()
            ):
                raise StackFileError(
                    f"a comma between two digits in {_around(text, place)}; write decimals with"
                    " a point, and a space after the comma between layers",
                    where,
                )
            parts.append(text[start:place].strip())
            start = place + 1
        place += 1
    if open_:
        closing, at = open_[-1]
        raise StackFileError(
            f"{text[at]!r} is not closed by {closing!r} in {_around(text, at)}", where
        )
    return [*parts, text[start:].strip()]


def _quote_end(text: str, place: int, where: str) -> int:
    """Return where the quote that begins at ``place`` ends."""
    end = place + 1
    while end < len(text) and text[end] != '"':
        end += 2 if text[end] == "\\" else 1
    if end >= len(text):
        raise StackFileError(f"a quote is not closed in {_around(text, place)}", where)
    return end


def _around(text: str, place: int) -> str:
    return repr(text[max(0, place - 12) : place + 16].strip())


def _layer(item: str, number: int) -> Layer:
    where = f"layer {number}"
    match = _LAYER.fullmatch(item)
    if match is None:
        if item.startswith("(") or item.endswith(")"):
            raise StackFileError(f"got {item!r}; a group is written 30 x (...)", where)
        raise StackFileError(
            f"got {item!r}; a layer begins with its thickness, like '6.2 nm GaAs'", where
        )
    thickness = f"{match['number']} {match['unit'] or ''}".strip()
    if match["unit"] and _is_formula(match["unit"]):
        raise StackFileError(
            f"thickness: got {match['number']!r} before {match['unit']!r}; write"
            f" '{match['number']} nm {match['unit']}'",
            where,
        )
    material, inside = _material(match["rest"], where)
    entries: dict[str, Any] = {"thickness": thickness}
    if material:
        entries["material"] = material
    if inside is not None:
        entries |= _settings(inside, f"{where} ({material})" if material else where)
    return layer_from(entries, number)


def _is_formula(text: str) -> bool:
    try:
        letters(text)
    except MaterialError:
        return False
    return True


def _material(rest: str, where: str) -> tuple[str, str | None]:
    """Return the material, and what stands in the braces behind it."""
    name, inside = rest, None
    if rest.startswith('"'):
        end = _quote_end(rest, 0, where) + 1
        name, rest = _unquoted(rest[:end], where), rest[end:].strip()
        if rest and not rest.startswith("{"):
            raise StackFileError(
                f"{rest!r} follows the material; put a comma between layers", where
            )
    else:
        name = rest.partition("{")[0].strip()
        rest = rest[len(rest.partition("{")[0]) :]
        if re.search(r"\s", name):
            raise StackFileError(
                f"got {name!r} as material; put a comma between layers, and quotes around a name"
                " with spaces",
                where,
            )
    if rest:
        inside = rest[1:-1]
        if not rest.endswith("}") or "{" in inside.partition('"')[0]:
            raise StackFileError(
                f"got {rest!r}; braces hold everything else and end the layer", where
            )
    return name, inside


def _unquoted(text: str, where: str) -> str:
    try:
        return str(json.loads(text))
    except ValueError:
        raise StackFileError(f'{text} is no quoted text; write \\" for a quote', where) from None


def _settings(inside: str, where: str) -> dict[str, Any]:
    entries: dict[str, Any] = {}
    pairs: dict[str, str | None] = {}
    for item in _split(inside, where):
        match = _SETTING.fullmatch(item)
        if match is None:
            raise StackFileError(
                f"got {item!r} in braces; write a key and a value, like x 0.3", where
            )
        key, value = match["key"], match["value"].strip()
        if key not in _INSIDE:
            raise StackFileError(f"unknown key {key!r}{close_matches(key, _INSIDE)}", where)
        if key in entries:
            raise StackFileError(f"{key!r} is given twice; leave one out", where)
        if key in SHAPED:
            entries[key], grading = shape_value(value)
            if grading or is_pair(entries[key]):
                pairs[key] = grading
        else:
            entries[key] = _unquoted(value, where) if value.startswith('"') else value
    words = set(pairs.values())
    if words <= {None}:
        return entries
    if len(words) > 1 or "grading" in entries:
        raise StackFileError(
            "a grading for some; write 'linear' or 'quadratic' behind every pair, or one"
            " grading for all",
            where,
        )
    return entries | {"grading": words.pop()}


# --- stack -> line --------------------------------------------------------------------------


def _written(layers: tuple[Layer | Repeat, ...], number: int) -> tuple[str, int]:
    parts = []
    for entry in layers:
        if isinstance(entry, Repeat):
            inner, number = _written(entry.layers, number)
            parts.append(f"{entry.times} x ({inner})")
        else:
            parts.append(_layer_text(entry, number))
            number += 1
    return ", ".join(parts), number


def _layer_text(layer: Layer, number: int) -> str:
    entries = entries_of(layer, number)
    grading = entries.pop("grading", None)
    inside = []
    for key in (key for key in _INSIDE if key in entries):
        value = entries[key]
        if key == "label":
            value = value if _BARE_LABEL.fullmatch(value) else json.dumps(value, ensure_ascii=False)
        elif key in SHAPED:
            value = shape_text(value) + (f" {grading}" if grading and is_pair(value) else "")
        inside.append(f"{key} {value}")
    text = length_text(layer.thickness)
    if layer.material is not None:
        bare = _BARE_NAME.fullmatch(layer.material)
        text += " " + (layer.material if bare else json.dumps(layer.material, ensure_ascii=False))
    return text + (f" {{{', '.join(inside)}}}" if inside else "")
