"""TOML -> Measured: the file that the data of one wafer are kept in."""

from __future__ import annotations

import os
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from ..errors import BandwrightError, ResultsError, close_matches
from ..quantities import show
from .measured import STRONGEST, Measured, MeasuredLine, end_of

_TABLES = ("measured", "line", "xray")
_HEAD = ("name", "note")
_LINE = ("upper", "lower", "wavelength", "error", "temperature")
_XRAY = ("period", "period_error", "mismatch_ppm", "perpendicular_mismatch_ppm", "mismatch_error")
_NEEDED = {"wavelength": '"10.3 um"', "error": '"0.02 um"'}


def read_measured(path: str | os.PathLike[str]) -> Measured:
    """Return the measured data that a TOML file holds.

    Parameters
    ----------
    path : path

    Raises
    ------
    ResultsError
        If the file can't be read, is not TOML, has keys that mean nothing, or lacks one.
    QuantityError, StackError
        If a value or a line can't be read. The text begins with the file's path.

    Examples
    --------
    >>> read_measured("none.toml")
    Traceback (most recent call last):
    ...
    bandwright.errors.ResultsError: none.toml: can't be read: No such file or directory
    """
    source = os.fspath(path)
    try:
        text = Path(source).read_bytes().decode("utf-8-sig")
    except OSError as error:
        raise ResultsError(f"can't be read: {error.strerror or error}", source) from None
    except UnicodeDecodeError:
        raise ResultsError("is not UTF-8 text; save the file as UTF-8", source) from None
    return measured_of(text, source)


def measured_of(text: str, source: str = "measured text") -> Measured:
    r"""Return the measured data that a TOML text holds.

    Parameters
    ----------
    text : str
    source : str
        What errors call the text.

    Raises
    ------
    ResultsError, QuantityError, StackError
        As `read_measured`.

    Examples
    --------
    Invented:

    >>> text = '[[line]]\nupper = 2\nlower = 1\nwavelength = "10.3 um"\nerror = "0.02 um"'
    >>> measured_of(text).lines[0].name
    '2 to 1'
    """
    try:
        content = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise ResultsError(f"not TOML: {error}", source) from None
    try:
        _known(content, _TABLES, None)
        head = _table(content.get("measured", {}), "[measured]", _HEAD)
        xray = _table(content.get("xray", {}), "[xray]", _XRAY)
        given = content.get("line", [])
        if not isinstance(given, list):
            raise ResultsError(f"got {show(given)}; begin each line with [[line]]", "line")
        lines = [_line(one, f"line {number}") for number, one in enumerate(given, 1)]
        return Measured(lines, **head, **xray)
    except BandwrightError as error:
        raise error.at(source) from None


def _line(given: Any, where: str) -> MeasuredLine:
    table = _table(given, where, _LINE)
    for key, example in _NEEDED.items():
        if key not in table:
            raise ResultsError(f"{key}: missing; write for example {key} = {example}", where)
    ends = [key for key in ("upper", "lower") if key in table]
    if len(ends) == 1:
        raise ResultsError(f"only {ends[0]} is given; write upper and lower, or neither for the"
                           " strongest line", where)  # fmt: skip
    pair = (end_of(table["upper"]), end_of(table["lower"])) if ends else STRONGEST
    try:
        return MeasuredLine(table["wavelength"], table["error"], pair, table.get("temperature"))
    except BandwrightError as error:
        raise error.at(where) from None


def _table(value: Any, where: str, known: tuple[str, ...]) -> dict[str, Any]:
    if not isinstance(value, Mapping):
        raise ResultsError(f"got {show(value)}; write a table", where)
    _known(value, known, where)
    return dict(value)


def _known(found: Mapping[str, Any], known: tuple[str, ...], where: str | None) -> None:
    for key in found:
        if key not in known:
            raise ResultsError(f"unknown key {key!r}{close_matches(key, known)}", where)
