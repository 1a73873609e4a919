"""Columns into a DataFrame, a user's DataFrame into rows: types, gaps, and what is refused."""

import datetime
import io
import math
import re

import numpy as np
import pandas as pd
import pytest

from bandwright.errors import StackError
from bandwright.frames import frame, rows


def refused(text, kind=StackError):
    return pytest.raises(kind, match="^" + re.escape(text) + "$")


def test_columns_keep_their_types():
    table = frame(
        {
            "level": [1, 2],
            "energy_meV": np.array([51.2, 130.9]),
            "difference_meV": [0.1, None],
            "mean_position_nm": [3, None],
            "copies": [np.int64(1), 30],
            "count_checked": [True, np.False_],
            "main_layer": ["NA", None],
            "upper": [2, "continuum"],
        },
        index="level",
    )
    assert table.index.tolist() == [1, 2]
    assert (table.index.name, table.index.dtype) == ("level", np.int64)
    assert {name: str(dtype) for name, dtype in table.dtypes.items()} == {
        "energy_meV": "float64",
        "difference_meV": "float64",
        "mean_position_nm": "float64",
        "copies": "int64",
        "count_checked": "bool",
        "main_layer": "object",
        "upper": "object",
    }
    assert math.isnan(table["difference_meV"][2])
    assert table["main_layer"].tolist() == ["NA", None]
    assert table["upper"].tolist() == [2, "continuum"]
    assert type(table["upper"][1]) is int


def test_gaps_in_text_are_none():
    assert frame({"reason": ["failed", math.nan]})["reason"].tolist() == ["failed", None]
    assert frame({"reason": [None, None]}, texts=["reason"])["reason"].tolist() == [None, None]
    assert frame({"flag": [True, None]})["flag"].tolist() == [True, None]
    assert frame({"gap": [None, None]})["gap"].dtype == np.float64


def test_a_table_without_rows_keeps_its_types():
    columns = {"level": [], "energy_meV": np.array([]), "copies": [], "main_layer": []}
    table = frame(columns, index="level", texts=["main_layer"], integers=["copies"])
    assert len(table) == 0
    assert (table.index.name, table.index.dtype) == ("level", np.int64)
    assert [str(dtype) for dtype in table.dtypes] == ["float64", "int64", "object"]
    named = frame({"name": [], "length_nm": []}, index="name", texts=["name"])
    assert named.index.dtype == object


def test_without_an_index():
    table = frame({"upper": [2, 3], "lower": [1, 1]})
    assert table.index.tolist() == [0, 1]
    assert list(table.columns) == ["upper", "lower"]


def test_csv_and_back():
    columns = {"level": [1, 2], "energy_meV": [0.1 + 0.2, None], "main_layer": ["NA", "well"]}
    text = frame(columns, index="level").to_csv()
    assert text == "level,energy_meV,main_layer\n1,0.30000000000000004,NA\n2,,well\n"
    again = rows(pd.read_csv(io.StringIO(text), keep_default_na=False))
    assert again == [
        {"level": 1, "energy_meV": "0.30000000000000004", "main_layer": "NA"},
        {"level": 2, "main_layer": "well"},
    ]


def test_columns_that_make_no_table():
    with refused("columns of different length: {'upper': 2, 'lower': 1}", ValueError):
        frame({"upper": [2, 3], "lower": [1]})
    with refused("index 'level' is no column; columns are upper, lower", ValueError):
        frame({"upper": [2], "lower": [1]}, index="level")


def test_rows_leave_empty_cells_out():
    table = pd.DataFrame(
        {
            "thickness": ["30 nm", "6.2 nm"],
            " label ": ["NA", " "],
            "mass": [0.089, math.nan],
            "edge": [None, "235 meV"],
            "times": [30, 1],
            "donors": [pd.NA, pd.NaT],
        },
        index=["a", "b"],
    )
    assert rows(table) == [
        {"thickness": "30 nm", "label": "NA", "mass": 0.089, "times": 30},
        {"thickness": "6.2 nm", "edge": "235 meV", "times": 1},
    ]
    assert rows(table.iloc[:0]) == []


def test_rows_hold_python_values():
    table = pd.DataFrame(
        {
            "x": np.array([0.3], dtype=np.float32),
            "times": np.array([3], dtype=np.int16),
            "flag": [np.True_],
            "any": pd.Series([np.float64(0.5)], dtype=object),
            "whole": pd.array([7], dtype="Int64"),
            "day": [datetime.date(2020, 1, 2)],
            "points": [[("0 nm", 0.0), ("8 nm", 0.3)]],
        }
    )
    (row,) = rows(table)
    types = {name: type(value) for name, value in row.items()}
    assert types == {
        "x": float,
        "times": int,
        "flag": bool,
        "any": float,
        "whole": int,
        "day": datetime.date,
        "points": list,
    }


@pytest.mark.parametrize(
    ("table", "says"),
    [
        ([1, 2], "got [1, 2]; give a pandas DataFrame, one row a layer"),
        (pd.DataFrame([[1, 2]]), "column 0: give every column a name"),
        (pd.DataFrame([[1]], columns=[" "]), "column ' ': give every column a name"),
        (pd.DataFrame([[1, 2]], columns=["x", "x "]), "column 'x': 2 columns have this name"),
    ],
)
def test_tables_without_rows_to_read(table, says):
    with refused(says):
        rows(table)
