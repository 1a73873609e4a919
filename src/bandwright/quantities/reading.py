"""Texts such as ``"6.2 nm"`` read exactly: a pattern, a small table of units, one rounding."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping
from decimal import Decimal
from fractions import Fraction
from functools import lru_cache
from typing import NamedTuple

from ..errors import close_matches


class Kind(NamedTuple):
    """What a quantity of one kind accepts: dimensions in order of preference, and examples."""

    noun: str
    example: str
    dimensions: tuple[str, ...]
    pint_units: tuple[tuple[str, str], ...]  # (pint unit, dimension), tried in this order


LENGTH = Kind("a length", "6.2 nm", ("length",), (("nm", "length"),))
THICKNESS = Kind("a thickness", "6.2 nm", ("length", "monolayers"), (("nm", "length"),))
ENERGY = Kind(
    "an energy",
    "235 meV",
    ("energy", "1/length", "frequency"),
    (("eV", "energy"), ("1/nm", "1/length")),
)
FIELD = Kind("an electric field", "12 kV/cm", ("potential/length",), (("V/nm", "field"),))
VOLTAGE = Kind("a voltage", "0.3 V", ("potential",), (("V", "potential"),))
TEMPERATURE = Kind("a temperature", "300 K", ("temperature",), (("K", "temperature"),))
DENSITY = Kind(
    "a density",
    "2e11 / cm^2",
    ("1/length^2", "1/length^3"),
    (("1/nm^2", "1/length^2"), ("1/nm^3", "1/length^3")),
)
INVERSE_ENERGY = Kind("an inverse energy", "0.56 / eV", ("1/energy",), (("1/eV", "1/energy"),))
RATE = Kind(
    "a growth rate", "0.7 ML/s", ("monolayers/time", "length/time"), (("nm/s", "length/time"),)
)
DURATION = Kind("a time", "5 s", ("time",), (("s", "time"),))
KINDS = (
    *(LENGTH, THICKNESS, ENERGY, FIELD, VOLTAGE, TEMPERATURE, DENSITY, INVERSE_ENERGY),
    *(RATE, DURATION),
)

_LONG_NAMES: Mapping[str, tuple[str, ...]] = {
    "nm": ("nanometer", "nanometers", "nanometre", "nanometres"),
    "um": ("μm", "micron", "microns", "micrometer", "micrometers", "micrometre", "micrometres"),
    "Å": ("A", "Angstrom", "Angstroms", "angstrom", "angstroms", "Ångström", "ångström"),
    "ML": ("monolayer", "monolayers"),
    "ueV": ("μeV",),
    "uV": ("μV",),
    "K": ("kelvin", "Kelvin"),
    "s": ("sec", "second", "seconds"),
    "min": ("minute", "minutes"),
    "h": ("hr", "hour", "hours"),
}
_FACTORS: Mapping[str, tuple[str, str]] = {
    "m": ("length", "1e9"),
    "cm": ("length", "1e7"),
    "mm": ("length", "1e6"),
    "um": ("length", "1e3"),
    "nm": ("length", "1"),
    "pm": ("length", "1e-3"),
    "Å": ("length", "0.1"),
    "ML": ("monolayers", "1"),
    "keV": ("energy", "1e3"),
    "eV": ("energy", "1"),
    "meV": ("energy", "1e-3"),
    "ueV": ("energy", "1e-6"),
    "THz": ("frequency", "1"),
    "GHz": ("frequency", "1e-3"),
    "MV": ("potential", "1e6"),
    "kV": ("potential", "1e3"),
    "V": ("potential", "1"),
    "mV": ("potential", "1e-3"),
    "uV": ("potential", "1e-6"),
    "K": ("temperature", "1"),
    "mK": ("temperature", "1e-3"),
    "°C": ("celsius", "1"),
    "degC": ("celsius", "1"),
    "ms": ("time", "1e-3"),
    "s": ("time", "1"),
    "min": ("time", "60"),
    "h": ("time", "3600"),
}
_UNITS: dict[str, tuple[str, Fraction]] = {
    spelling: (dimension, Fraction(factor))
    for name, (dimension, factor) in _FACTORS.items()
    for spelling in (name, *_LONG_NAMES.get(name, ()))
}
_FREEZING = Fraction("273.15")

_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,4})?"
TEXT = re.compile(rf"({_NUMBER})\s*(.*)", re.DOTALL)
_TERM = re.compile(r"([A-Za-zÅμ°åö]+)(?:(?:\^|\*\*)?([+-]?[1-9]))?")
_COMMA = re.compile(r"(?P<number>[+-]?[0-9]+,[0-9]+)\s*(?P<unit>\D.*)?", re.DOTALL)
_UNDERSCORES = re.compile(
    r"(?P<number>[+-]?[0-9]+(?:_[0-9]+)+(?:\.[0-9]*)?)\s*(?P<unit>\D.*)?", re.DOTALL
)


class Wrong(Exception):
    """Why a value can't be read; the caller adds the name and the found value."""


@lru_cache(maxsize=4096)
def read_text(text: str, kind: Kind) -> tuple[float, str]:
    """Return (core value, dimension) of a text; raise `Wrong` with the way to mend it."""
    clean = cleaned(text)
    match = TEXT.fullmatch(clean)
    if match is None or not _is_unit_like(match[2]):
        raise Wrong(garbled(clean, kind.example, _due(kind)))
    number = Fraction(Decimal(match[1]))
    if not match[2]:
        raise Wrong(bare(match[1], kind))
    dimension, factor = _unit(match[2], kind)
    if dimension == "celsius" and kind is TEMPERATURE:
        return rounded(number + _FREEZING), "temperature"
    if dimension not in kind.dimensions:
        raise Wrong(f"that is {_noun(dimension)}; write {kind.noun} such as '{kind.example}'")
    return rounded(number * factor * photon(dimension, kind)), dimension


def cleaned(text: str) -> str:
    """Return text with one spelling of Å, µ, superscripts, minus signs and spaces."""
    return unicodedata.normalize("NFKC", text).replace("\N{MINUS SIGN}", "-").strip()


def _is_unit_like(text: str) -> bool:
    return not text or bool(re.match(r"[A-Za-zÅμ°åö/]|1\s*/", text))


@lru_cache(maxsize=1024)
def _unit(text: str, kind: Kind) -> tuple[str, Fraction]:
    """Return (dimension, factor to core units) of a unit such as ``kV/cm`` or ``/ cm^2``."""
    powers: dict[str, int] = {}
    factor = Fraction(1)
    numerator, slash, denominator = text.partition("/")
    if slash and not denominator.strip():
        raise Wrong(f"the unit ends with '/'; write for example '{kind.example}'")
    for part, sign in ((numerator, 1), (denominator, -1)):
        part = part.strip()
        if part == "1" and sign == 1:
            continue
        for term in re.split(r"\s*(?<!\*)[*·](?!\*)\s*|\s+", part) if part else ():
            match = _TERM.fullmatch(term)
            if match is None:
                raise Wrong(f"write {_due(kind)}")
            if match[1] not in _UNITS:
                raise Wrong(f"unit '{match[1]}' is not known{_similar(match[1], kind)}")
            dimension, size = _UNITS[match[1]]
            power = sign * int(match[2] or 1)
            powers[dimension] = powers.get(dimension, 0) + power
            factor *= size**power
    up = "*".join(_power(d, p) for d, p in sorted(powers.items()) if p > 0)
    down = "*".join(_power(d, -p) for d, p in sorted(powers.items()) if p < 0)
    return (f"{up or '1'}/{down}" if down else up), factor


def _similar(symbol: str, kind: Kind) -> str:
    """Return the units of this kind that a wrong one may have meant, as the end of a text."""
    bases = {base for dimension in kind.dimensions for base in re.findall("[a-z]+", dimension)}
    names = [name for name, (dimension, _) in _FACTORS.items() if dimension in bases]
    same = [name for name in names if name.lower() == symbol.lower()]
    if same:
        return f"; did you mean {' or '.join(map(repr, same))}?"
    return close_matches(symbol, names)


def _power(dimension: str, power: int) -> str:
    return dimension if power == 1 else f"{dimension}^{power}"


def photon(dimension: str, kind: Kind) -> Fraction:
    """Return the photon energy [eV] of one core unit when an energy is given otherwise."""
    if kind is not ENERGY or dimension == "energy":
        return Fraction(1)
    from ..constants import EV_PER_THZ, HC

    return Fraction(HC if dimension == "1/length" else EV_PER_THZ)


def rounded(exact: Fraction) -> float:
    """Return the nearest float of an exact value."""
    try:
        value = float(exact)
    except OverflowError:
        raise Wrong("the number is too large") from None
    if value == 0.0 and exact != 0:
        raise Wrong("the number is too small")
    return value


def _noun(dimension: str) -> str:
    for kind in KINDS:
        if kind.dimensions[0] == dimension:
            return kind.noun
    other = {
        "monolayers": "a number of monolayers",
        "1/length": "a wavenumber",
        "frequency": "a frequency",
        "celsius": "a temperature",
        "1/length^3": "a density",
        "length/time": "a growth rate",
        "": "a plain number",
    }
    return other.get(dimension, f"a quantity of kind {dimension}")


def bare(number: str, kind: Kind) -> str:
    """Return how to mend a number without a unit."""
    return f"write '{number} {kind.example.partition(' ')[2]}'"


def _due(kind: Kind) -> str:
    return f"one number and one unit such as '{kind.example}'"


def garbled(text: str, example: str, due: str) -> str:
    """Return how to mend a text that is not one number and one unit; ``due`` is what is."""
    comma, underscores = _COMMA.fullmatch(text), _UNDERSCORES.fullmatch(text)
    match = comma or underscores
    if match is None:
        return f"write {due}"
    unit = match["unit"] or example.partition(" ")[2]

    def fix(between: str) -> str:
        return "'" + f"{re.sub('[,_]', between, match['number'])} {unit}".strip() + "'"

    if underscores:
        return f"write {fix('')}"
    if len(match["number"].partition(",")[2]) == 3:
        return f"a comma may mean two things: write {fix('.')} or {fix('')}"
    return f"use a decimal point, no comma: write {fix('.')}"
