"""TOML <-> Calibrations: the file that a reactor's rates are kept in."""

from __future__ import annotations

import datetime
import os
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from .. import quantities as q
from ..errors import BandwrightError, GrowthError, close_matches
from ..stackfile.writer import toml_value
from .calibrations import AlloyRate, Calibrations, Cell

_TABLES = ("calibrations", "cells", "alloys")
_HEAD = ("name", "note", "date")
_KEYS = {"cells": ("element", "rate", "on", "note", "date"), "alloys": ("rate", "note", "date")}
_NEEDED = {
    "cells": {"element": '"Ga"', "rate": '"0.7 ML/s"', "on": '"GaAs"'},
    "alloys": {"rate": '"0.5 nm/s"'},
}


def read_calibrations(path: str | os.PathLike[str]) -> Calibrations:
    """Return the calibrations that a TOML file describes.

    Parameters
    ----------
    path : path

    Raises
    ------
    GrowthError
        If the file can't be read, is not TOML, has keys that mean nothing, or lacks one.
    QuantityError, MaterialError
        If a rate or a formula can't be read. The text begins with the file's path.

    Examples
    --------
    >>> read_calibrations("none.toml")
    Traceback (most recent call last):
    ...
    bandwright.errors.GrowthError: none.toml: can't be read: No such file or directory
    """
    source = os.fspath(path)
    try:
        text = Path(source).read_bytes().decode("utf-8-sig")
    except OSError as error:
        raise GrowthError(f"can't be read: {error.strerror or error}", source) from None
    except UnicodeDecodeError:
        raise GrowthError("is not UTF-8 text; save the file as UTF-8", source) from None
    return calibrations_of(text, source)


def calibrations_of(text: str, source: str = "calibrations text") -> Calibrations:
    r"""Return the calibrations that a TOML text describes.

    Parameters
    ----------
    text : str
    source : str
        What errors call the text.

    Raises
    ------
    GrowthError, QuantityError, MaterialError
        As `read_calibrations`.

    Examples
    --------
    An invented cell:

    >>> text = '[cells.Ga1]\nelement = "Ga"\nrate = "0.7 ML/s"\non = "GaAs"'
    >>> calibrations_of(text).cells[0].on
    'GaAs'
    """
    try:
        content = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise GrowthError(f"not TOML: {error}", source) from None
    try:
        _known(content, _TABLES, None)
        head = _texts(_table(content.get("calibrations", {}), "[calibrations]"))
        _known(head, _HEAD, "[calibrations]")
        cells = [Cell(name, **given) for name, given in _entries(content, "cells")]
        alloys = [AlloyRate(name, **given) for name, given in _entries(content, "alloys")]
        return Calibrations(cells, alloys, **head)
    except BandwrightError as error:
        raise error.at(source) from None


def calibrations_text(calibrations: Calibrations) -> str:
    """Return the text of a calibrations file, which `calibrations_of` reads as equal ones.

    Examples
    --------
    >>> print(calibrations_text(Calibrations([Cell("Ga1", "Ga", "0.7 ML/s", "GaAs")])), end="")
    [cells.Ga1]
    element = "Ga"
    rate = "0.7 ML/s"
    on = "GaAs"
    """
    blocks = []
    head = _lines(calibrations, _HEAD)
    if head:
        blocks.append(["[calibrations]", *head])
    for cell in calibrations.cells:
        blocks.append([f"[cells.{_name(cell.name)}]", *_lines(cell, _KEYS["cells"])])
    for alloy in calibrations.alloys:
        blocks.append([f"[alloys.{_name(alloy.formula)}]", *_lines(alloy, _KEYS["alloys"])])
    return "\n\n".join("\n".join(block) for block in blocks) + "\n"


def write_calibrations(calibrations: Calibrations, path: str | os.PathLike[str]) -> None:
    """Write calibrations to a TOML file that `read_calibrations` reads as equal ones.

    Parameters
    ----------
    calibrations : Calibrations
    path : path
        Overwritten if it exists.

    Raises
    ------
    GrowthError
        If the file can't be written.
    """
    target = os.fspath(path)
    try:
        Path(target).write_text(calibrations_text(calibrations), encoding="utf-8", newline="\n")
    except OSError as error:
        raise GrowthError(f"can't be written: {error.strerror or error}", target) from None


def _entries(content: Mapping[str, Any], kind: str) -> list[tuple[str, dict[str, Any]]]:
    """Return the name and the checked keys of every cell or alloy."""
    found = []
    for name, given in _table(content.get(kind, {}), f"[{kind}]").items():
        where = f"[{kind}.{_name(name)}]"
        table = _texts(_table(given, where))
        _known(table, _KEYS[kind], where)
        for key, example in _NEEDED[kind].items():
            if key not in table:
                raise GrowthError(f"{key}: missing; write for example {key} = {example}", where)
        found.append((name, table))
    return found


def _table(value: Any, where: str) -> Mapping[str, Any]:
    if not isinstance(value, Mapping):
        raise GrowthError(f"got {q.show(value)}; write a table", where)
    return value


def _known(found: Mapping[str, Any], known: tuple[str, ...], where: str | None) -> None:
    for key in found:
        if key not in known:
            raise GrowthError(f"unknown key {key!r}{close_matches(key, known)}", where)


def _texts(table: Mapping[str, Any]) -> dict[str, Any]:
    """Return a table whose date, which TOML knows as such, is a text."""
    found = dict(table)
    if isinstance(found.get("date"), datetime.date | datetime.datetime):
        found["date"] = found["date"].isoformat()
    return found


def _lines(given: object, keys: tuple[str, ...]) -> list[str]:
    lines = []
    for key in keys:
        value = getattr(given, key)
        if value is not None:
            text = q.rate_text(value) if isinstance(value, q.Rate) else value
            lines.append(f"{key} = {toml_value(text)}")
    return lines


def _name(name: str) -> str:
    bare = name.isascii() and name.replace("_", "").replace("-", "").isalnum()
    return name if bare else toml_value(name)
