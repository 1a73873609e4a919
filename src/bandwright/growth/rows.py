"""Rows of a growth sheet back to layers and groups."""

from __future__ import annotations

import csv
import os
from collections.abc import Mapping, Sequence
from typing import Any

from .. import quantities as q
from ..errors import BandwrightError, GrowthError, close_matches
from ..parameters.layers import stretched
from ..shapes import Function, Points
from ..stack import PLANES, Layer, Repeat, Stack
from ..stackfile.keys import LAYER_KEYS, SHAPED, layer_from, settings
from ..stackfile.shapetext import shape_value
from .steps import END, INTERRUPTION, LAYER, PLANE, REPEAT

_STEPS = (LAYER, REPEAT, END, INTERRUPTION, PLANE)
_LOOSE = "a delta doping without the layer grown on it, which must be the next that is grown"


def said_of(stack: Stack, order: str) -> dict[str, Any]:
    """Return what a stack says beyond its layers, as `Stack` takes it beside layers in an order."""
    said = settings(stack)
    if order == "surface first" and "ends" in said:
        said["ends"] = said["ends"][::-1]
    return {"order": order, **said}


def stack_of_rows(rows: Sequence[Mapping[str, Any]], *, whole: bool, **arguments: Any) -> Stack:
    """Return the stack of the rows of a sheet, without their empty cells.

    Raises
    ------
    GrowthError
        If a row is no step, or a group does not end where it should.
    StackError, QuantityError
        If its layers can't be grown.
    """
    groups: list[tuple[int, list[Layer | Repeat]]] = [(1, [])]
    planes: dict[str, Any] = {}  # on the face of the layer in the next row
    turned = arguments.get("order") == "surface first"
    for number, row in enumerate(rows, start=1):
        where = f"row {number}"
        step = row.get("step")
        if planes and step != LAYER:
            raise GrowthError(_LOOSE, f"row {number - 1}")
        if step == REPEAT:
            groups.append((_times(row, where), []))
        elif step == END:
            if len(groups) == 1:
                raise GrowthError("the end of a repeat that has not begun", where)
            times, inside = groups.pop()
            groups[-1][1].append(Repeat(times, inside))
        elif step == LAYER:
            groups[-1][1].append(_layer({**row, **planes}, number, whole))
            planes = {}
        elif step == PLANE:
            found = {key: row[key] for key in PLANES if key in row}
            if turned:
                _dope(groups[-1][1], found, where)
            else:
                planes = found
        elif step != INTERRUPTION:
            raise GrowthError(f"step: got {q.show(step)}{close_matches(str(step), _STEPS)}", where)
    if planes:
        raise GrowthError(_LOOSE, f"row {len(rows)}")
    if len(groups) > 1:
        raise GrowthError("a repeat without an end; write the row 'end of repeat'", "growth sheet")
    return Stack(groups[0][1], **arguments)


def _dope(layers: list[Layer | Repeat], planes: Mapping[str, Any], where: str) -> None:
    """Give the last of some layers the planes on its first-grown face."""
    last = layers[-1] if layers else None
    if not isinstance(last, Layer):
        raise GrowthError(_LOOSE, where)
    layers[-1] = last.replace(**planes)


def _layer(row: Mapping[str, Any], number: int, whole: bool) -> Layer:
    """Return the layer of a row."""
    where = f"row {number}"
    entries: dict[str, Any] = {key: row[key] for key in LAYER_KEYS if key in row}
    for key in SHAPED:
        if isinstance(entries.get(key), str):
            entries[key] = shape_value(entries[key])[0]
    entries["thickness"] = row.get("written")
    if entries["thickness"] is None:
        raise GrowthError("written: missing; it says the thickness as designed", where)
    try:
        layer = layer_from(entries, number)
    except BandwrightError as error:
        raise type(error)(error.message, where) from None
    if not whole or "whole_ML" not in row:
        return layer
    count = _number(row, "whole_ML", where)
    if not any(isinstance(shape, Points | Function) for _, shape in layer.fractions):
        return layer.replace(thickness=q.Length(count, "ML"))
    grown = count * _number(row, "monolayer_nm", where)
    return stretched(layer, grown / layer.thickness.value, grown)


def _number(row: Mapping[str, Any], name: str, where: str) -> float:
    try:
        return float(row[name])
    except (KeyError, ValueError):
        raise GrowthError(f"{name}: got {q.show(row.get(name))}; write a number", where) from None


def _times(row: Mapping[str, Any], where: str) -> int:
    times = _number(row, "times", where)
    if not times.is_integer():
        raise GrowthError(f"times: got {times:g}; write a whole number from 1", where)
    return int(times)


def read_rows(path: str | os.PathLike[str]) -> list[dict[str, Any]]:
    """Return the rows of a CSV file, without empty cells.

    Raises
    ------
    GrowthError
        If it can't be read.
    """
    source = os.fspath(path)
    try:
        with open(source, encoding="utf-8-sig", newline="") as file:
            return [{k: v for k, v in row.items() if v} for row in csv.DictReader(file)]
    except OSError as error:
        raise GrowthError(f"can't be read: {error.strerror or error}", source) from None
