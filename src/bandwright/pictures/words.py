"""Columns of a table as numbers, and their names as a picture says them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, cast

import numpy as np
import numpy.typing as npt

from ..errors import PictureError, close_matches
from ..quantities import show
from ..report.grid import unit_of
from .sheet import GAP

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]

_PRINTED = {"um": "µm", "cm-1": "cm⁻¹", "m0": "m₀"}
_KINDS = {
    "meV": "energy", "eV": "energy", "um": "wavelength", "nm": "length", "THz": "frequency",
    "cm-1": "wavenumber", "K": "temperature", "kV/cm": "field",
}  # fmt: skip


def checked(table: object) -> pd.DataFrame:
    """Return a DataFrame as it is.

    Raises
    ------
    PictureError
        If it is none, or has no row.
    """
    if not (hasattr(table, "columns") and hasattr(table, "iloc")):
        raise PictureError(f"table: got {show(table)}; give a pandas DataFrame")
    found = cast("pd.DataFrame", table)
    if not len(found):
        raise PictureError("table: it has no row to draw")
    return found


def numeric(table: pd.DataFrame) -> list[str]:
    """Return the names of the columns that hold a number at all, truth values left out."""
    return [
        name
        for name in table.columns
        if isinstance(name, str)
        and table[name].dtype.kind in "iuf"
        and np.isfinite(table[name].to_numpy(dtype=float)).any()
    ]


def column(table: pd.DataFrame, name: str) -> Floats:
    """Return a column as floats.

    Raises
    ------
    PictureError
        If there is none of this name, or it holds no number.
    """
    if name not in table.columns:
        known = [str(each) for each in table.columns]
        raise PictureError(f"table: there is no column {name!r}{close_matches(str(name), known)}")
    if name not in numeric(table):
        raise PictureError(f"table: column {name!r} holds no numbers")
    return np.asarray(table[name].to_numpy(dtype=float))


def axis_text(name: str) -> str:
    """Return a column's name as the label of an axis.

    Examples
    --------
    >>> print(axis_text("wavelength_um").replace(GAP, " "), "|", axis_text("levels"))
    wavelength (µm) | levels
    """
    words, unit = unit_of(name)
    return f"{words}{GAP}({_PRINTED.get(unit, unit)})" if unit else words


def common_text(names: Sequence[str]) -> str:
    """Return the label of an axis that several columns of one unit share.

    Examples
    --------
    >>> print(common_text(["level 1_meV", "level 2_meV"]).replace(GAP, " "))
    energy (meV)
    """
    if len(names) == 1:
        return axis_text(names[0])
    unit = unit_of(names[0])[1]
    return f"{_KINDS.get(unit, 'value')}{GAP}({_PRINTED.get(unit, unit)})" if unit else "value"


def words_of(name: str) -> str:
    """Return a column's name without its unit."""
    return unit_of(name)[0]


def printed(value: Any) -> str:
    """Return a number or a word as a label.

    Examples
    --------
    >>> printed(-2.50000001), printed("GaAs")
    ('−2.5', 'GaAs')
    """
    if isinstance(value, float | int | np.number):
        return f"{float(value):.6g}".replace("-", "\N{MINUS SIGN}")
    return str(value)
