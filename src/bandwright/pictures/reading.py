"""Tables that commands wrote as CSV, read again to be drawn."""

from __future__ import annotations

import csv
import json
import os
import re
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import PictureError
from ..frames import frame

if TYPE_CHECKING:
    import pandas as pd


def read_table(path: str | os.PathLike[str]) -> pd.DataFrame:
    """Return the table of a CSV file: columns of numbers where every cell is one or empty.

    Lines that begin with ``#`` are no rows; the first line of a sweep's results file tells which
    columns are its parameters.

    Parameters
    ----------
    path : path

    Raises
    ------
    PictureError
        If the file can't be read or holds no table.
    """
    where = os.fspath(path)
    try:
        lines = Path(path).read_text(encoding="utf-8").splitlines()
    except OSError as error:
        raise PictureError(f"can't be read: {error.strerror or error}", where) from None
    except UnicodeDecodeError:
        raise PictureError("is no text; a table in CSV is due", where) from None
    head = "".join(line for line in lines[:1] if line.startswith("#"))
    rows = [row for row in csv.reader(line for line in lines if not line.startswith("#")) if row]
    if len(rows) < 2:
        raise PictureError("holds no table; a line of names and a line a row are due", where)
    names = rows[0]
    for number, row in enumerate(rows[1:], start=1):
        if len(row) != len(names):
            raise PictureError(f"row {number} has {len(row)} cells under {len(names)} names", where)
    columns = {
        name: _column(cells)
        for name, cells in zip(names, zip(*rows[1:], strict=True), strict=True)
        if name != "design"
    }
    words = [name for name, cells in columns.items() if any(isinstance(c, str) for c in cells)]
    table = frame(columns, texts=words)
    table.attrs["parameters"] = tuple(name for name in _parameters(head) if name in columns)
    return table


def _column(cells: Sequence[str]) -> list[Any]:
    try:
        return [float(cell) if cell else None for cell in cells]
    except ValueError:
        return [cell or None for cell in cells]


def _parameters(head: str) -> list[str]:
    """Return the columns that the first line of a results file calls parameters.

    Examples
    --------
    >>> _parameters('# sweep: {"over": {"parameters": [{"column": "field_kV_per_cm"}]}}')
    ['field_kV_per_cm']
    >>> _parameters("# my own words")
    []
    """
    found = re.search(r"\{.*\}", head)
    try:
        return [str(one["column"]) for one in json.loads(found[0] if found else "")["over"]
                ["parameters"]]  # fmt: skip
    except (ValueError, KeyError, TypeError):
        return []
