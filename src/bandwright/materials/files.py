"""Which material files there are: the shipped ones, read one by one when asked for, and the user's.

A user's entry goes over the shipped entry of the same compound, quantity by quantity.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Mapping
from functools import lru_cache
from importlib.resources import files
from importlib.resources.abc import Traversable
from pathlib import Path
from typing import Any

from .. import formula
from ..errors import MaterialError, close_matches
from .entries import Alloy, Binary, read_alloy, read_binary
from .numbers import Reader

SHIPPED = "bandwright_materials"


def elements_of(name: str) -> frozenset[str]:
    """Return the elements of a name or pattern, whatever its amounts.

    Examples
    --------
    >>> sorted(elements_of("AlxGa1-xAs"))
    ['Al', 'As', 'Ga']
    """
    return frozenset(formula.elements(name))


class Entries:
    """The binaries and alloys of one file."""

    def __init__(self, text: str, origin: str) -> None:
        try:
            content = tomllib.loads(text)
        except tomllib.TOMLDecodeError as error:
            raise MaterialError(f"is not TOML: {error}", origin) from None
        known = ("sources", "binary", "alloy")
        for key in content:
            if key not in known:
                raise MaterialError(f"unknown table {key!r}{close_matches(key, known)}", origin)
        reader = Reader(origin, _sources(content.get("sources", {}), origin))
        self.origin = origin
        self.binaries = {
            name: read_binary(reader, name, entry)
            for name, entry in _tables(content, "binary", origin).items()
        }
        self.alloys: dict[frozenset[str], Alloy] = {}
        for pattern, entry in _tables(content, "alloy", origin).items():
            alloy = read_alloy(reader, pattern, entry)
            same = elements_of(pattern)
            if same in self.alloys:
                other = self.alloys[same].pattern
                raise reader.error(f"alloy.{pattern}", f"is the alloy of [alloy.{other}] again")
            self.alloys[same] = alloy


def _tables(content: Mapping[str, Any], key: str, origin: str) -> Mapping[str, Any]:
    found = content.get(key, {})
    if not isinstance(found, dict):
        raise MaterialError(f"write [{key}.NAME] and its keys below it", f"{origin}, {key}")
    return found


def _sources(found: Any, origin: str) -> dict[str, str]:
    if not isinstance(found, dict):
        raise MaterialError('write [sources] and lines like short = "author, ..."', origin)
    for name, text in found.items():
        if not isinstance(text, str) or len(text.split()) < 2:
            raise MaterialError(
                f"got {text!r}; a source names author, journal, year and table, "
                'or says "from memory" or "common practice", or what you measured it on: '
                '"our own luminescence, batch 7"',
                f"{origin}, sources.{name}",
            )
    return dict(found)


@lru_cache(maxsize=1)
def shipped_index() -> dict[frozenset[str], Traversable]:
    """Return the shipped files by the elements their names hold; nothing is read."""
    found = {}
    for path in files(SHIPPED).iterdir():
        if path.name.endswith(".toml"):
            found[elements_of(path.name.removesuffix(".toml"))] = path
    return found


@lru_cache(maxsize=256)
def shipped_entries(elements: frozenset[str]) -> Entries | None:
    """Return the shipped file of a compound, read once a process, or None."""
    path = shipped_index().get(elements)
    if path is None:
        return None
    return Entries(path.read_text(encoding="utf-8"), path.name)


def read_file(path: str | Path) -> Entries:
    """Return the entries of a user's file.

    Raises
    ------
    MaterialError
        If the file can't be read, or an entry is refused.
    """
    path = Path(path)
    try:
        text = path.read_text(encoding="utf-8")
    except FileNotFoundError:
        beside = [p.name for p in path.parent.glob("*.toml")] if path.parent.is_dir() else []
        near = close_matches(path.name, beside) if beside else ""
        raise MaterialError(f"there is no such material file{near}", str(path)) from None
    except (OSError, UnicodeDecodeError) as error:
        raise MaterialError(f"can't be read: {error}", str(path)) from None
    return Entries(text, path.name)


class Catalogue:
    """Binaries and alloys from the shipped files and from a user's, later files over earlier."""

    def __init__(self, own: Iterable[Entries] = ()) -> None:
        self.own = tuple(own)

    def binary(self, name: str) -> Binary | None:
        """Return a binary's entry, or None."""
        shipped = shipped_entries(elements_of(name))
        found = shipped.binaries.get(name) if shipped else None
        for file in self.own:
            if name in file.binaries:
                found = file.binaries[name].over(found) if found else file.binaries[name]
        return found

    def alloy(self, elements: frozenset[str]) -> Alloy | None:
        """Return the entry of an alloy of two binaries by its three elements, or None."""
        shipped = shipped_entries(elements)
        found = shipped.alloys.get(elements) if shipped else None
        for file in self.own:
            if elements in file.alloys:
                newer = file.alloys[elements]
                found = newer.over(found) if found else newer
        return found

    def names(self) -> tuple[tuple[str, ...], tuple[str, ...]]:
        """Return the names of all binaries and the patterns of all alloys; reads every file."""
        binaries: dict[str, None] = {}
        alloys: dict[frozenset[str], str] = {}
        for elements in sorted(shipped_index(), key=sorted):
            entries = shipped_entries(elements)
            assert entries is not None
            binaries.update(dict.fromkeys(entries.binaries))
            alloys.update({e: a.pattern for e, a in entries.alloys.items()})
        for file in self.own:
            binaries.update(dict.fromkeys(file.binaries))
            alloys.update({e: a.pattern for e, a in file.alloys.items()})
        return tuple(sorted(binaries)), tuple(sorted(alloys.values()))

    def origins(self, name: str) -> tuple[str, ...]:
        """Return the files that say something about a binary or an alloy, in order."""
        elements = elements_of(name)
        shipped = shipped_entries(elements)
        found = ["shipped"] if shipped is not None else []
        for file in self.own:
            named = {elements_of(b) for b in file.binaries} | file.alloys.keys()
            if elements in named:
                found.append(file.origin)
        return tuple(found)
