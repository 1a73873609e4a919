"""Numbers of a material file: text with a unit, a source, perhaps a temperature form.

A number is refused without a source, in a unit of another kind, or far from what a
semiconductor can have (elastic constants in kbar that are called GPa, for one).
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from ..errors import MaterialError, close_matches

_TEXT = re.compile(r"([-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)\s*([^\d\s.,].*)?")


@dataclass(frozen=True)
class Kind:
    """What a number measures: its units (text -> factor to core units), example and bounds."""

    name: str
    units: Mapping[str, str]
    example: str
    low: float
    high: float


_ENERGY = {"eV": "1", "meV": "1e-3"}
_LENGTH = {"nm": "1", "Å": "0.1", "\u212b": "0.1", "A": "0.1", "angstrom": "0.1", "pm": "1e-3"}
_STIFFNESS = {"GPa": "1", "kbar": "0.1", "MPa": "1e-3", "dyn/cm^2": "1e-10"}

LATTICE = Kind("a lattice constant", _LENGTH, "0.565 nm", 0.3, 0.9)
ENERGY = Kind("an energy", _ENERGY, "1.519 eV", -30.0, 30.0)
GAP = Kind("a gap", _ENERGY, "1.519 eV", -1.0, 12.0)
SLOPE = Kind("an energy per temperature", {"eV/K": "1", "meV/K": "1e-3"}, "0.5 meV/K", -2e-3, 2e-3)
TEMPERATURE = Kind("a temperature", {"K": "1"}, "300 K", 0.0, 5000.0)
C11 = Kind("an elastic constant", _STIFFNESS, "122.1 GPa", 20.0, 500.0)
C12 = Kind("an elastic constant", _STIFFNESS, "56.6 GPa", 5.0, 200.0)
MASS = Kind("a mass", {}, "0.067", 1e-3, 5.0)
RATIO = Kind("a share", {}, "0.65", -2.0, 3.0)


@dataclass(frozen=True)
class Number:
    """One number, in core units, and where it comes from.

    Parameters
    ----------
    value : float
        Core units: eV, nm, GPa, or free-electron masses.
    source : str
        Author, journal, year, table; or "from memory", "common practice".
    origin : str
        The file the number stands in.
    at : float, optional
        Temperature the number was taken at [K].
    """

    value: float
    source: str
    origin: str
    at: float | None = None


@dataclass(frozen=True)
class Fit(Number):
    """An energy that changes with temperature.

    ``form`` is "constant", "linear" (value + slope T), "varshni" (value - alpha T^2/(T + beta))
    or "coth" (value + amplitude [1 - coth(theta/T)]); ``first`` and ``second`` hold slope,
    alpha and beta, or amplitude and theta. ``valid`` is the range of the fit [K].
    """

    form: str = "constant"
    first: float = 0.0
    second: float = 0.0
    valid: tuple[float, float] | None = None

    def energy(self, temperature_K: float) -> float:
        """Return the energy [eV] at a temperature [K]."""
        t = temperature_K
        if self.form == "varshni":
            return self.value - self.first * t * t / (t + self.second) if t else self.value
        if self.form == "linear":
            return self.value + self.first * t
        if self.form == "coth":
            return self.value + (
                self.first * (1.0 - 1.0 / math.tanh(self.second / t)) if t else 0.0
            )
        return self.value


FORMS: Mapping[str, tuple[str, ...]] = {
    "constant": (),
    "linear": ("slope",),
    "varshni": ("alpha", "beta"),
    "coth": ("amplitude", "theta"),
}
_FORM_KINDS = {
    "slope": SLOPE,
    "alpha": SLOPE,
    "beta": TEMPERATURE,
    "amplitude": ENERGY,
    "theta": TEMPERATURE,
}


def _like(name: str) -> str:
    """Return how a key of a temperature form is written."""
    if name == "valid":
        return ', the temperatures it is good for: valid = ["0 K", "300 K"]'
    kind = GAP if name == "value" else _FORM_KINDS[name]
    return f": {name} = {kind.example!r}"


class Reader:
    """Reads the tables of one file, so that every error names file and key.

    Parameters
    ----------
    origin : str
        The file's name.
    sources : mapping
        The file's ``[sources]``: short name -> full text.
    """

    def __init__(self, origin: str, sources: Mapping[str, str]) -> None:
        self.origin = origin
        self.sources = sources

    def error(self, key: str, message: str) -> MaterialError:
        """Return an error with the file and the key before its message."""
        return MaterialError(message, f"{self.origin}, {key}")

    def table(self, key: str, found: Any, known: tuple[str, ...]) -> Mapping[str, Any]:
        """Return a table after a look at its keys."""
        if not isinstance(found, dict):
            raise self.error(
                key, f"got {found!r}, not a number with its source; "
                'write { value = "...", source = "..." }'
            )  # fmt: skip
        for name in found:
            if name not in known:
                raise self.error(key, f"unknown key {name!r}{close_matches(name, known)}")
        return found

    def source(self, key: str, table: Mapping[str, Any]) -> str:
        """Return the full text of a number's source."""
        found = table.get("source")
        if not isinstance(found, str) or not found.strip():
            raise self.error(
                key,
                'a number needs its source; add source = "author, journal, year, table", '
                'or "from memory", or "common practice", or what you measured it on',
            )
        if found in self.sources:
            return self.sources[found]
        if len(found.split()) < 2:
            near = close_matches(found, self.sources)
            raise self.error(key, f"source {found!r} is not in the file's [sources]{near}")
        return found

    def value(self, key: str, found: Any, kind: Kind) -> float:
        """Return a value in core units: text with a unit, or a bare number where none is due."""
        if isinstance(found, bool) or not isinstance(found, str | int | float):
            raise self.error(key, f"got {found!r}; write {kind.name} like {kind.example!r}")
        match = _TEXT.fullmatch(str(found).strip())
        if match is None:
            raise self.error(
                key, f"can't read {found!r} as {kind.name}; write it like {kind.example!r}"
            )
        digits, unit = match.groups()
        if not kind.units:
            if unit:
                raise self.error(key, f"{kind.name} has no unit, got {found!r}")
            value = float(digits)
        else:
            if not unit:
                raise self.error(
                    key, f"{found!r} has no unit; write {kind.name} like {kind.example!r}"
                )
            if unit not in kind.units:
                known = ", ".join(dict.fromkeys(kind.units))
                raise self.error(key, f"{unit!r} is no unit of {kind.name}; use one of {known}")
            value = float(Decimal(digits) * Decimal(kind.units[unit]))
        self._check_bounds(key, found, value, kind)
        return value

    def _check_bounds(self, key: str, found: Any, value: float, kind: Kind) -> None:
        if kind.low <= value <= kind.high:
            return
        unit = next(iter(kind.units), "")
        hint = f"{kind.name} lies between {kind.low:g} and {kind.high:g} {unit}".rstrip()
        if kind in (C11, C12) and value > kind.high:
            hint += (
                "; tables often print kbar and call it GPa (10 kbar are 1 GPa): "
                f"if so, write '{value:g} kbar'"
            )
        elif kind in (C11, C12) and value > 0:
            hint += "; tables often print units of 1e11 dyn/cm^2, which is 10 GPa"
        raise self.error(key, f"{found!r} can't be right: {hint}")

    def optional_temperature(self, key: str, table: Mapping[str, Any]) -> float | None:
        """Return the temperature ``at`` which a number holds [K], or None."""
        return self.value(f"{key}.at", table["at"], TEMPERATURE) if "at" in table else None

    def number(self, key: str, found: Any, kind: Kind) -> Number:
        """Return a plain number."""
        table = self.table(key, found, ("value", "source", "at"))
        if "value" not in table:
            raise self.error(key, f"has no value; add value = {kind.example!r}")
        value = self.value(f"{key}.value", table["value"], kind)
        at = self.optional_temperature(key, table)
        return Number(value, self.source(key, table), self.origin, at)

    def fit(self, key: str, found: Any) -> Fit:
        """Return an energy with its temperature form."""
        form = found.get("form", "constant") if isinstance(found, dict) else "constant"
        if form not in FORMS:
            raise self.error(key, f"unknown temperature form {form!r}{close_matches(form, FORMS)}")
        names = FORMS[form]
        table = self.table(key, found, ("form", "value", *names, "valid", "source"))
        for name in ("value", *names, "valid"):
            if name not in table:
                raise self.error(key, f"the form {form!r} needs {name!r}{_like(name)}")
        numbers = [self.value(f"{key}.{n}", table[n], _FORM_KINDS[n]) for n in names] + [0.0, 0.0]
        return Fit(
            self.value(f"{key}.value", table["value"], GAP),
            self.source(key, table),
            self.origin,
            form=form,
            first=numbers[0],
            second=numbers[1],
            valid=self.range(f"{key}.valid", table["valid"], TEMPERATURE),
        )

    def range(self, key: str, found: Any, kind: Kind) -> tuple[float, float]:
        """Return a pair (lowest, highest)."""
        if not isinstance(found, list) or len(found) != 2:
            raise self.error(key, f"got {found!r}; write a pair like [lowest, highest]")
        low, high = (self.value(key, item, kind) for item in found)
        if not low < high:
            raise self.error(key, f"the range {found!r} runs downwards")
        return low, high
