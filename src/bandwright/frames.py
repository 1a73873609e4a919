"""Columns into a DataFrame and a user's DataFrame into rows: the only room that knows pandas."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from .errors import StackError
from .quantities import show

if TYPE_CHECKING:
    import pandas as pd


def frame(
    columns: Mapping[str, Sequence[Any] | npt.NDArray[Any]],
    *,
    index: str | None = None,
    texts: Collection[str] = (),
    integers: Collection[str] = (),
) -> pd.DataFrame:
    """Return a DataFrame of plain columns: float64, int64, bool, or text (object).

    Whole numbers stay integers; a column of numbers with a gap (``None``) is float64 with NaN;
    a text column keeps ``None`` as ``None``, and may mix text and integers.

    Parameters
    ----------
    columns : mapping of str to sequence
        Values of each column, all as long; the unit belongs into the name.
    index : str, optional
        The column that becomes the index.
    texts, integers : collection of str, optional
        Columns that hold text or integers even when no row shows it.

    Raises
    ------
    ValueError
        If the columns are not all as long, or ``index`` is none of them.

    Examples
    --------
    >>> table = frame({"level": [1, 2], "energy_meV": [51.2, None]}, index="level")
    >>> print(table)
           energy_meV
    level
    1            51.2
    2             NaN
    """
    import pandas as pd

    lengths = {name: len(values) for name, values in columns.items()}
    if len(set(lengths.values())) > 1:
        raise ValueError(f"columns of different length: {lengths}")
    if index is not None and index not in columns:
        raise ValueError(f"index {index!r} is no column; columns are {', '.join(columns)}")
    arrays = {}
    for name, values in columns.items():
        whole = name in integers or (name == index and name not in texts)
        arrays[name] = _column(values, text=name in texts, whole=whole)
    labels = None
    if index is not None:
        found = arrays.pop(index)
        labels = pd.Index(found, dtype=found.dtype, name=index)
    # each with its own dtype: pandas 3 would make text of its own, with NaN for None
    series = {
        name: pd.Series(values, index=labels, dtype=values.dtype) for name, values in arrays.items()
    }
    return pd.DataFrame(series, index=labels)


def is_table(value: object) -> bool:
    """Return whether a value is a DataFrame; pandas is not loaded to see that it is none."""
    import sys

    pandas = sys.modules.get("pandas")
    return pandas is not None and isinstance(value, pandas.DataFrame)


def columns_of_table(table: Any) -> dict[str, list[Any]]:
    """Return the columns of a user's DataFrame by name, as lists of Python's values.

    Raises
    ------
    StackError
        If a column has no name or the name of another.

    Examples
    --------
    >>> import pandas as pd
    >>> columns_of_table(pd.DataFrame({"well.thickness_nm": [4.0, 5.5]}))
    {'well.thickness_nm': [4.0, 5.5]}
    """
    names = _names(table)
    return {name: table.iloc[:, position].tolist() for position, name in enumerate(names)}


def rows(table: object) -> list[dict[str, Any]]:
    """Return the rows of a user's DataFrame as dicts, without the cells that are empty.

    NaN, None, NA and blank text are empty; a text ``"NA"`` is a text. Numbers are Python's.

    Raises
    ------
    StackError
        If ``table`` is no DataFrame, or a column has no name or the name of another.

    Examples
    --------
    >>> import pandas as pd
    >>> rows(pd.DataFrame({"thickness": ["5 nm", "8 nm"], "label": ["NA", None]}))
    [{'thickness': '5 nm', 'label': 'NA'}, {'thickness': '8 nm'}]
    """
    import pandas as pd

    if not isinstance(table, pd.DataFrame):
        raise StackError(f"got {show(table)}; give a pandas DataFrame, one row a layer")
    names = _names(table)
    series = [table.iloc[:, position].tolist() for position in range(len(names))]
    return [
        {name: _plain(cell) for name, cell in zip(names, cells, strict=True) if not _empty(cell)}
        for cells in zip(*series, strict=True)
    ]


def _names(table: pd.DataFrame) -> list[str]:
    names = [_name(column) for column in table.columns]
    for name in names:
        if names.count(name) > 1:
            raise StackError(f"column {name!r}: {names.count(name)} columns have this name")
    return names


def _column(values: Sequence[Any] | npt.NDArray[Any], text: bool, whole: bool) -> npt.NDArray[Any]:
    if isinstance(values, np.ndarray) and values.dtype == np.float64 and len(values) and not text:
        return values.copy()
    cells = values.tolist() if isinstance(values, np.ndarray) else [_plain(v) for v in values]
    if text:
        return _objects(cells)
    if not cells:
        return np.array([], dtype=np.int64 if whole else np.float64)
    if all(isinstance(cell, bool) for cell in cells):
        return np.array(cells, dtype=bool)
    if all(isinstance(cell, int) and not isinstance(cell, bool) for cell in cells):
        return np.array(cells, dtype=np.int64)
    if all(cell is None or _is_number(cell) for cell in cells):
        return np.array([np.nan if cell is None else cell for cell in cells], dtype=np.float64)
    return _objects(cells)


def _objects(cells: list[Any]) -> npt.NDArray[Any]:
    column = np.empty(len(cells), dtype=object)
    column[:] = [None if isinstance(cell, float) and np.isnan(cell) else cell for cell in cells]
    return column


def _is_number(cell: object) -> bool:
    return isinstance(cell, int | float) and not isinstance(cell, bool)


def _plain(cell: Any) -> Any:
    """Return numpy's scalars as Python's."""
    return cell.item() if isinstance(cell, np.generic) else cell


def _empty(cell: Any) -> bool:
    if isinstance(cell, str):
        return not cell.strip()
    if cell is None or type(cell).__name__ in ("NAType", "NaTType"):
        return True
    return isinstance(cell, float | np.floating) and bool(np.isnan(cell))


def _name(column: object) -> str:
    if not isinstance(column, str) or not column.strip():
        raise StackError(f"column {show(column)}: give every column a name")
    return column.strip()
