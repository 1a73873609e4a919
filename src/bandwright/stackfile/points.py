"""Tables of points: read from a CSV beside the stack file, or taken from a callable."""

from __future__ import annotations

import csv
import os
from collections.abc import Mapping

import numpy as np

from ..errors import StackFileError, close_matches
from ..shapes import Function, Points
from ..stack import Layer, Stack, layer_name
from .keys import UNITS, column


def tabulated(stack: Stack, points: int = 101) -> Stack:
    """Return a copy of the stack whose callables are tables of points, so that it can be written.

    Parameters
    ----------
    stack : Stack
    points : int
        Points of each table, both faces included; at least 2.

    Raises
    ------
    StackFileError
        If there are fewer than 2 points, or a callable runs along a layer counted in ML.
    StackError
        If a callable gives a value that the layer can't have.

    Examples
    --------
    >>> bowl = Layer("8 nm", "AlxGa1-xAs", x=lambda depth_nm: 0.3 * (depth_nm / 8) ** 2)
    >>> tabulated(Stack([bowl]), points=3)
    Stack([Layer('8 nm', 'AlxGa1-xAs', x=[('0 nm', 0), ('4 nm', 0.075), ('8 nm', 0.3)])])
    """
    if points < 2:
        raise StackFileError(f"points: got {points}; a table needs two or more")
    for written in stack.written():
        changes = {}
        for key, shape in written.layer.shapes:
            if isinstance(shape, Function):
                changes[key] = _table(shape, written.layer, key, written.number, points)
        if changes:
            stack = stack.with_layer(written.number, written.layer.replace(**changes))
    return stack


def _table(shape: Function, layer: Layer, key: str, number: int, points: int) -> Points:
    if layer.thickness.unit != "nm":
        raise StackFileError(
            f"{key} is a callable and the thickness is in ML; give the thickness in nm to tabulate"
            " it",
            layer_name(number, layer),
        )
    depths = np.linspace(0.0, layer.thickness.value, points)
    values = shape.at(depths, layer.thickness.value)
    return Points(tuple(depths.tolist()), tuple(values.tolist()))


def read_points(path: str, key: str) -> list[list[str]]:
    """Return the points of one quantity from a CSV file, as ``[depth, value]`` texts.

    Parameters
    ----------
    path : str
        The first row names the columns: ``depth_nm`` and the quantity with its unit, for
        example ``x`` or ``edge_meV``. Other columns are left alone; so are empty lines and
        lines that begin with ``#``.
    key : str
        The quantity, such as ``"edge"``.

    Raises
    ------
    StackFileError
        If the file can't be read, a column is missing or twice there, or a cell is empty.
    """
    try:
        with open(path, encoding="utf-8-sig", newline="") as file:
            lines = [(n, line) for n, line in enumerate(file, start=1)]
    except (OSError, UnicodeDecodeError, ValueError) as error:
        reason = (error.strerror or str(error)) if isinstance(error, OSError) else "not UTF-8 text"
        raise StackFileError(f"can't be read: {reason}", path) from None
    kept = [(n, line) for n, line in lines if line.strip() and not line.lstrip().startswith("#")]
    rows = [next(csv.reader([line], skipinitialspace=True)) for _, line in kept]
    if not rows:
        raise StackFileError(f"holds no table; write columns depth_nm and {_columns(key)}", path)
    header = [name.strip() for name in rows[0]]
    depth_at, depth_unit = _find(header, "depth", path)
    value_at, value_unit = _find(header, key, path)
    points = []
    for (number, _), row in zip(kept[1:], rows[1:], strict=True):
        cells = [cell.strip() for cell in row]
        if len(cells) != len(header):
            raise StackFileError(
                f"{len(cells)} cells under {len(header)} columns; write decimals with a point and"
                " columns with commas",
                f"{path}, line {number}",
            )
        for at in (depth_at, value_at):
            if not cells[at]:
                raise StackFileError(f"no value under {header[at]!r}", f"{path}, line {number}")
        depth, value = cells[depth_at], cells[value_at]
        points.append([f"{depth} {depth_unit}".strip(), f"{value} {value_unit}".strip()])
    return points


def _find(header: list[str], key: str, path: str) -> tuple[int, str]:
    """Return (index, unit) of the one column that holds a quantity."""
    names: Mapping[str, str] = {column(key, unit): text for unit, text in UNITS[key].items()}
    found = [name for name in header if name in names]
    if len(found) == 1:
        return header.index(found[0]), names[found[0]]
    if found:
        raise StackFileError(f"columns {' and '.join(found)} both say {key}; leave one", path)
    given = ", ".join(repr(name) for name in header)
    near = close_matches(header[0], names) if len(header) == 1 else ""
    hint = near if "mean" in near else ""
    if len(header) == 1 and ";" in header[0]:
        hint = "; separate columns by commas"
    raise StackFileError(f"no column {_columns(key)}; found {given}{hint}", path)


def _columns(key: str) -> str:
    return " or ".join(column(key, unit) for unit in UNITS[key])


def joined(folder: str | os.PathLike[str], path: str) -> str:
    """Return an absolute path for a path that a file in ``folder`` names."""
    return os.path.abspath(os.path.join(os.fspath(folder), path))
