"""Results for other programs: columns of plain values, CSV with full precision, JSON objects."""

from __future__ import annotations

import csv
import io
import json
import math
from typing import TYPE_CHECKING, Any

from ..stackfile import dumps
from .facts import SAFETY

if TYPE_CHECKING:
    from ..levels import Levels
    from ..lines import Lines
    from ..stack import Stack

Columns = dict[str, list[Any]]

#: columns of counts and level numbers
WHOLE = {"copies", "design", "level", "levels", "levels_found", "lower", "upper"}


def plain(value: Any) -> Any:
    """Return a value as JSON knows it; what is not there is None, never NaN."""
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value


def columns_of(table: Any) -> Columns:
    """Return column name -> plain values of a DataFrame, its index first if it has a name.

    Counts and level numbers are whole, also where a gap in their column made pandas' floats.
    """
    flat = table.reset_index() if any(table.index.names) else table
    columns = {str(name): [plain(v) for v in flat[name].tolist()] for name in flat.columns}
    for name in WHOLE & columns.keys():
        columns[name] = [int(v) if isinstance(v, float) else v for v in columns[name]]
    return columns


def rows_of(columns: Columns) -> list[dict[str, Any]]:
    """Return one mapping a row.

    Examples
    --------
    >>> rows_of({"level": [1, 2], "energy_meV": [61.2, 140.1]})
    [{'level': 1, 'energy_meV': 61.2}, {'level': 2, 'energy_meV': 140.1}]
    """
    return [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]


def csv_text(columns: Columns) -> str:
    r"""Return header and rows with every digit of each float.

    Examples
    --------
    >>> csv_text({"level": [1], "energy_meV": [0.1 + 0.2], "copies": [None]})
    'level,energy_meV,copies\n1,0.30000000000000004,\n'
    """
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(zip(*columns.values(), strict=True))
    return out.getvalue()


def json_text(value: Any) -> str:
    """Return a value as JSON text, one object or list, newline at the end."""
    return json.dumps(value, ensure_ascii=False, allow_nan=False, indent=2) + "\n"


def stack_object(stack: Stack) -> dict[str, Any]:
    """Return a stack: what a reader looks for first, and ``toml``, its whole file."""
    return {
        "name": stack.name,
        "temperature_K": stack.temperature,
        "substrate": stack.substrate,
        "ends": list(stack.ends),
        "toml": dumps(stack),
    }


def solved_object(levels: Levels) -> dict[str, Any]:
    """Return what was solved, the keys that every JSON object of levels or lines has."""
    return {
        "stack": stack_object(levels.stack),
        "zero": levels.profile.zero,
        "bands": levels.profile.bands,
        "electrons_run": levels.direction,
        "complete": bool(levels.complete),
        "phase_exact": bool(levels.phase_exact),
    }


def levels_object(levels: Levels) -> dict[str, Any]:
    """Return levels as one JSON object."""
    return {
        **solved_object(levels),
        "levels": rows_of(columns_of(levels.table)),
        "cautions": list(levels.cautions),
    }


def lines_object(lines: Lines) -> dict[str, Any]:
    """Return lines, the error budget of the main one and the safety line as one JSON object."""
    line = lines.main
    budget = {} if line is None else columns_of(lines.error_budget(line))
    return {
        **solved_object(lines.levels),
        "lines": rows_of(columns_of(lines.table)),
        "error_budget": rows_of(budget),
        "error_budget_of": None if line is None else line.name,
        "cautions": list(lines.cautions),
        "safety": SAFETY,
    }
