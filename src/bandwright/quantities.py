"""Text or quantity in, plain float in core units out, and back: the only room that knows pint.

Texts are read by a pattern and a small table of units, exactly: the decimal number times the
decimal factor of its unit, rounded once. So 62 Å is the same float as 6.2 nm, and a written
value reads back as itself. Quantities of any pint registry are asked for their value by
``m_as``; pint itself is imported only to hand quantities out.

Core units: energy eV, length nm, field V/nm, bias V, temperature K, density nm^-2 or nm^-3.
"""

from __future__ import annotations

import math
import re
import unicodedata
from collections.abc import Mapping
from decimal import Decimal
from fractions import Fraction
from functools import lru_cache
from typing import TYPE_CHECKING, Any, NamedTuple, SupportsFloat

from .errors import QuantityError, close_matches

if TYPE_CHECKING:
    import pint


class Length(NamedTuple):
    """A thickness as written: its value and ``"nm"`` or ``"ML"`` (strained monolayers)."""

    value: float
    unit: str


class Density(NamedTuple):
    """A doping density: ``"sheet"`` [nm^-2] or ``"volume"`` [nm^-3]."""

    value: float
    kind: str


class _Kind(NamedTuple):
    """What a quantity of one kind accepts: dimensions in order of preference, and examples."""

    noun: str
    example: str
    dimensions: tuple[str, ...]
    pint_units: tuple[tuple[str, str], ...]  # (pint unit, dimension), tried in this order


_LENGTH = _Kind("a length", "6.2 nm", ("length",), (("nm", "length"),))
_THICKNESS = _Kind("a thickness", "6.2 nm", ("length", "monolayers"), (("nm", "length"),))
_ENERGY = _Kind(
    "an energy",
    "235 meV",
    ("energy", "1/length", "frequency"),
    (("eV", "energy"), ("1/nm", "1/length")),
)
_FIELD = _Kind("an electric field", "12 kV/cm", ("potential/length",), (("V/nm", "field"),))
_VOLTAGE = _Kind("a voltage", "0.3 V", ("potential",), (("V", "potential"),))
_TEMPERATURE = _Kind("a temperature", "300 K", ("temperature",), (("K", "temperature"),))
_DENSITY = _Kind(
    "a density",
    "2e11 / cm^2",
    ("1/length^2", "1/length^3"),
    (("1/nm^2", "1/length^2"), ("1/nm^3", "1/length^3")),
)
_INVERSE_ENERGY = _Kind("an inverse energy", "0.56 / eV", ("1/energy",), (("1/eV", "1/energy"),))
_KINDS = (_LENGTH, _THICKNESS, _ENERGY, _FIELD, _VOLTAGE, _TEMPERATURE, _DENSITY, _INVERSE_ENERGY)

_LONG_NAMES: Mapping[str, tuple[str, ...]] = {
    "nm": ("nanometer", "nanometers", "nanometre", "nanometres"),
    "um": ("μm", "micron", "microns", "micrometer", "micrometers", "micrometre", "micrometres"),
    "Å": ("A", "Angstrom", "Angstroms", "angstrom", "angstroms", "Ångström", "ångström"),
    "ML": ("monolayer", "monolayers"),
    "ueV": ("μeV",),
    "uV": ("μV",),
    "K": ("kelvin", "Kelvin"),
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
}
_UNITS: dict[str, tuple[str, Fraction]] = {
    spelling: (dimension, Fraction(factor))
    for name, (dimension, factor) in _FACTORS.items()
    for spelling in (name, *_LONG_NAMES.get(name, ()))
}
_FREEZING = Fraction("273.15")

_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,4})?"
_TEXT = re.compile(rf"({_NUMBER})\s*(.*)", re.DOTALL)
_TERM = re.compile(r"([A-Za-zÅμ°åö]+)(?:(?:\^|\*\*)?([+-]?[1-9]))?")
_COMMA = re.compile(r"([+-]?[0-9]+),([0-9]+)\s*(\D.*)?", re.DOTALL)
_UNDERSCORES = re.compile(r"([+-]?[0-9]+(?:_[0-9]+)+(?:\.[0-9]*)?)\s*(\D.*)?", re.DOTALL)
_DIGITS = 15  # every decimal of this many digits survives float and back


class _Wrong(Exception):
    """Why a value can't be read; the caller adds the name and the found value."""


# --- the doors in ---------------------------------------------------------------------------


def as_length(value: object, name: str) -> float:
    """Return a length [nm].

    Parameters
    ----------
    value : str or quantity
        ``"6.2 nm"``, ``"62 Å"``, ``"10.3 um"``, or a quantity of any pint registry.
    name : str
        What the value is for; begins the text of an error.

    Raises
    ------
    QuantityError
        If the value is no finite length with a unit.

    Examples
    --------
    >>> as_length("62 Å", "depth") == as_length("6.2 nm", "depth") == 6.2
    True
    >>> as_length(6.2, "depth")
    Traceback (most recent call last):
    ...
    bandwright.errors.QuantityError: depth: got 6.2; write '6.2 nm'
    """
    return _read(value, name, _LENGTH)[0]


def as_thickness(value: object, name: str) -> Length:
    """Return a positive thickness, in nm or kept in monolayers.

    Raises
    ------
    QuantityError
        If the value is no positive finite length or number of monolayers.

    Examples
    --------
    >>> as_thickness("62 Å", "thickness"), as_thickness("22 ML", "thickness")
    (Length(value=6.2, unit='nm'), Length(value=22.0, unit='ML'))
    """
    if isinstance(value, Length):
        number, unit = _finite(value.value, name, value), value.unit
        if unit not in ("nm", "ML"):
            raise QuantityError(f"{name}: got {show(value)}; the unit must be 'nm' or 'ML'")
    else:
        number, dimension = _read(value, name, _THICKNESS)
        unit = "ML" if dimension == "monolayers" else "nm"
    if number <= 0.0:
        raise QuantityError(f"{name}: got {show(value)}; a thickness must be above zero")
    return Length(number, unit)


def as_energy(value: object, name: str) -> float:
    """Return an energy [eV]; wavenumbers (cm^-1) and frequencies (THz) are photon energies.

    Raises
    ------
    QuantityError
        If the value is no finite energy with a unit.

    Examples
    --------
    >>> as_energy("235 meV", "edge")
    0.235
    >>> round(as_energy("1000 cm-1", "below"), 6)
    0.123984
    """
    return _read(value, name, _ENERGY)[0]


def as_field(value: object, name: str) -> float:
    """Return an electric field [V/nm].

    Raises
    ------
    QuantityError
        If the value is no finite field with a unit.

    Examples
    --------
    >>> as_field("12 kV/cm", "field")
    0.0012
    """
    return _read(value, name, _FIELD)[0]


def as_voltage(value: object, name: str) -> float:
    """Return a voltage [V].

    Raises
    ------
    QuantityError
        If the value is no finite voltage with a unit.

    Examples
    --------
    >>> as_voltage("300 mV", "bias")
    0.3
    """
    return _read(value, name, _VOLTAGE)[0]


def as_temperature(value: object, name: str) -> float:
    """Return an absolute temperature [K].

    Raises
    ------
    QuantityError
        If the value is no finite temperature with a unit, or lies below 0 K.

    Examples
    --------
    >>> as_temperature("77 K", "temperature"), as_temperature("27 °C", "temperature")
    (77.0, 300.15)
    """
    kelvin = _read(value, name, _TEMPERATURE)[0]
    if kelvin < 0.0:
        raise QuantityError(f"{name}: got {show(value)}; it lies below absolute zero")
    return kelvin


def as_density(value: object, name: str) -> Density:
    """Return a doping density, per area or per volume.

    Raises
    ------
    QuantityError
        If the value is no finite density of at least zero with a unit.

    Examples
    --------
    >>> as_density("2e11 / cm^2", "donors")
    Density(value=0.002, kind='sheet')
    >>> as_density("3e17 cm^-3", "donors")
    Density(value=0.0003, kind='volume')
    """
    if isinstance(value, Density):
        number, kind = _finite(value.value, name, value), value.kind
        if kind not in ("sheet", "volume"):
            raise QuantityError(f"{name}: got {show(value)}; kind must be 'sheet' or 'volume'")
    else:
        number, dimension = _read(value, name, _DENSITY)
        kind = "sheet" if dimension == "1/length^2" else "volume"
    if number < 0.0:
        raise QuantityError(f"{name}: got {show(value)}; a density can't be negative")
    return Density(number, kind)


def as_inverse_energy(value: object, name: str) -> float:
    """Return an inverse energy [1/eV], such as a nonparabolicity.

    Raises
    ------
    QuantityError
        If the value is no finite inverse energy with a unit.

    Examples
    --------
    >>> as_inverse_energy("0.56 / eV", "nonparabolicity")
    0.56
    """
    return _read(value, name, _INVERSE_ENERGY)[0]


def as_fraction(value: object, name: str) -> float:
    """Return a fraction between 0 and 1, from a number or a text such as ``"28 %"``.

    Raises
    ------
    QuantityError
        If the value is no number from 0 to 1.

    Examples
    --------
    >>> as_fraction(0.28, "x"), as_fraction("28 %", "x")
    (0.28, 0.28)
    """
    number = _plain(value, name, "0.28", {"": "1", "%": "0.01"})
    if 0.0 <= number <= 1.0:
        return number
    fix = f"; for percent write {number / 100:g}" if 1.0 < number <= 100.0 else ""
    raise QuantityError(f"{name}: got {show(value)}; a fraction lies between 0 and 1{fix}")


def as_mass(value: object, name: str) -> float:
    """Return a positive effective mass in units of the free-electron mass.

    Raises
    ------
    QuantityError
        If the value is no positive finite number.

    Examples
    --------
    >>> as_mass(0.067, "mass"), as_mass("0.067 m0", "mass")
    (0.067, 0.067)
    """
    number = _plain(value, name, "0.067", {"": "1", "m0": "1"})
    if number <= 0.0:
        raise QuantityError(f"{name}: got {show(value)}; a mass must be above zero")
    return number


# --- the doors out --------------------------------------------------------------------------


def length_text(value: Length | float) -> str:
    """Return the shortest text that reads back as exactly this length [nm, or ML].

    Examples
    --------
    >>> length_text(Length(22.0, "ML")), length_text(6.2)
    ('22 ML', '6.2 nm')
    """
    if isinstance(value, Length):
        return f"{number_text(value.value)} {value.unit}"
    return f"{number_text(value)} nm"


def energy_text(value: float) -> str:
    """Return the shortest text that reads back as exactly this energy [eV].

    Examples
    --------
    >>> energy_text(0.235), energy_text(1.79)
    ('235 meV', '1.79 eV')
    """
    if abs(value) < 1.0:
        return f"{number_text(value, 3)} meV"
    return f"{number_text(value)} eV"


def field_text(value: float) -> str:
    """Return the shortest text that reads back as exactly this field [V/nm].

    Examples
    --------
    >>> field_text(0.0012)
    '12 kV/cm'
    """
    return f"{number_text(value, 4)} kV/cm"


def voltage_text(value: float) -> str:
    """Return the shortest text that reads back as exactly this voltage [V].

    Examples
    --------
    >>> voltage_text(0.3)
    '0.3 V'
    """
    return f"{number_text(value)} V"


def temperature_text(value: float) -> str:
    """Return the shortest text that reads back as exactly this temperature [K].

    Examples
    --------
    >>> temperature_text(77.0)
    '77 K'
    """
    return f"{number_text(value)} K"


def density_text(value: Density) -> str:
    """Return the shortest text that reads back as exactly this density.

    Examples
    --------
    >>> density_text(Density(0.002, "sheet")), density_text(Density(3e-4, "volume"))
    ('2e11 / cm^2', '3e17 / cm^3')
    """
    if value.kind == "sheet":
        return f"{number_text(value.value, 14)} / cm^2"
    return f"{number_text(value.value, 21)} / cm^3"


def inverse_energy_text(value: float) -> str:
    """Return the shortest text that reads back as exactly this inverse energy [1/eV].

    Examples
    --------
    >>> inverse_energy_text(0.56)
    '0.56 / eV'
    """
    return f"{number_text(value)} / eV"


def number_text(value: float, power: int = 0) -> str:
    """Return ``value * 10**power`` as decimal text that scales back to exactly ``value``.

    Examples
    --------
    >>> number_text(0.1), number_text(0.0012, 4), number_text(2e-3, 14)
    ('0.1', '12', '2e11')
    """
    number = Decimal(repr(float(value) + 0.0)).scaleb(power).normalize()
    if number.is_zero():
        return "0"
    if -5 <= number.adjusted() < 7:
        return f"{number:f}"
    _sign, digits, exponent = number.as_tuple()
    assert isinstance(exponent, int)
    text = "".join(map(str, digits))
    mantissa = text if len(text) == 1 else f"{text[0]}.{text[1:]}"
    return f"{'-' if number < 0 else ''}{mantissa}e{exponent + len(text) - 1}"


def quantity(value: Any, unit: str) -> pint.Quantity[Any]:
    """Return ``value`` in ``unit`` as a quantity of pint's application registry.

    Parameters
    ----------
    value : float or ndarray
    unit : str
        A unit pint knows, such as ``"meV"`` or ``"nm"``.

    Examples
    --------
    >>> print(quantity(6.2, "nm").to("angstrom"))
    62.0 angstrom
    """
    import pint

    return pint.Quantity(value, unit)


def show(value: object) -> str:
    """Return a found value as an error text shows it: text in quotes, numbers bare.

    Examples
    --------
    >>> show("6.2"), show(6.2)
    ("'6.2'", '6.2')
    """
    if isinstance(value, str):
        return repr(str(value))
    if isinstance(value, SupportsFloat) and not isinstance(value, bool):
        return str(value)
    text = str(value) if hasattr(value, "m_as") else repr(value)
    return text if len(text) <= 80 else text[:77] + "..."


# --- reading --------------------------------------------------------------------------------


def _read(value: object, name: str, kind: _Kind) -> tuple[float, str]:
    """Return (core value, dimension) of a text or quantity of one kind."""
    try:
        if isinstance(value, str):
            return _read_text(str(value), kind)
        if hasattr(value, "m_as"):
            return _read_quantity(value, kind)
        if value is None or isinstance(value, bool) or not isinstance(value, SupportsFloat):
            raise _Wrong(f"write {kind.noun} as text such as '{kind.example}'")
        raise _Wrong(_bare(_scalar(value, kind.noun), kind))
    except _Wrong as wrong:
        raise QuantityError(f"{name}: got {show(value)}; {wrong}") from None


@lru_cache(maxsize=4096)
def _read_text(text: str, kind: _Kind) -> tuple[float, str]:
    clean = _clean(text)
    match = _TEXT.fullmatch(clean)
    if match is None or not _is_unit_like(match[2]):
        raise _Wrong(_garbled(clean, kind))
    number = Fraction(Decimal(match[1]))
    if not match[2]:
        raise _Wrong(_bare(float(number), kind, match[1]))
    dimension, factor = _unit(match[2], kind)
    if dimension == "celsius" and kind is _TEMPERATURE:
        return _round(number + _FREEZING, number), "temperature"
    if dimension not in kind.dimensions:
        raise _Wrong(f"that is {_noun(dimension)}; write {kind.noun} such as '{kind.example}'")
    return _round(number * factor * _photon(dimension, kind), number), dimension


def _read_quantity(value: Any, kind: _Kind) -> tuple[float, str]:
    for unit, dimension in kind.pint_units:
        try:
            converted = value.m_as(unit)
        except (TypeError, ValueError, AttributeError):
            continue
        number = _scalar(converted, kind.noun)
        if not _long(getattr(value, "magnitude", None)):
            number = float(f"{number:.{_DIGITS}g}")  # 62 Å is 6.2 nm, not 6.2000000000000002
        return number * float(_photon(dimension, kind)), dimension
    raise _Wrong(f"that is no {kind.noun.split(' ', 1)[1]}; write for example '{kind.example}'")


def _scalar(value: Any, noun: str) -> float:
    if getattr(value, "ndim", 0):
        raise _Wrong(f"that is an array; write one {noun.split(' ', 1)[1]}")
    try:
        number = float(value)
    except (TypeError, ValueError):
        raise _Wrong("that is no plain number") from None
    if not math.isfinite(number):
        raise _Wrong("that is not finite")
    return number


def _long(magnitude: object) -> bool:
    """Whether a magnitude uses more digits than survive a rounding to `_DIGITS`."""
    if isinstance(magnitude, int):
        return abs(magnitude) >= 1e15
    if isinstance(magnitude, SupportsFloat):
        number = float(magnitude)
        return bool(float(f"{number:.{_DIGITS}g}") != number)
    return True


def _plain(value: object, name: str, example: str, factors: Mapping[str, str]) -> float:
    """Return a dimensionless number, from a number, a dimensionless quantity or a text."""
    try:
        if isinstance(value, str):
            match = _TEXT.fullmatch(_clean(str(value)))
            if match is None or match[2] not in factors:
                raise _Wrong(f"write a number such as {example}")
            number = Fraction(Decimal(match[1]))
            return _round(number * Fraction(factors[match[2]]), number)
        if hasattr(value, "m_as"):
            try:
                return _scalar(value.m_as(""), "a number")
            except (TypeError, ValueError, AttributeError):
                raise _Wrong(f"write a number without unit such as {example}") from None
        if value is None or isinstance(value, bool) or not isinstance(value, SupportsFloat):
            raise _Wrong(f"write a number such as {example}")
        return _scalar(value, "a number")
    except _Wrong as wrong:
        raise QuantityError(f"{name}: got {show(value)}; {wrong}") from None


def _finite(value: object, name: str, found: object) -> float:
    try:
        return _scalar(value, "a number")
    except _Wrong as wrong:
        raise QuantityError(f"{name}: got {show(found)}; {wrong}") from None


def _clean(text: str) -> str:
    """Return text with one spelling of Å, µ, superscripts, minus signs and spaces."""
    return unicodedata.normalize("NFKC", text).replace("\N{MINUS SIGN}", "-").strip()


def _is_unit_like(text: str) -> bool:
    return not text or bool(re.match(r"[A-Za-zÅμ°åö/]|1\s*/", text))


@lru_cache(maxsize=1024)
def _unit(text: str, kind: _Kind) -> tuple[str, Fraction]:
    """Return (dimension, factor to core units) of a unit such as ``kV/cm`` or ``/ cm^2``."""
    powers: dict[str, int] = {}
    factor = Fraction(1)
    numerator, slash, denominator = text.partition("/")
    if slash and not denominator.strip():
        raise _Wrong(f"the unit ends with '/'; write for example '{kind.example}'")
    for part, sign in ((numerator, 1), (denominator, -1)):
        part = part.strip()
        if part == "1" and sign == 1:
            continue
        for term in re.split(r"\s*[*·]\s*(?!\*)|\s+", part) if part else ():
            match = _TERM.fullmatch(term)
            if match is None:
                raise _Wrong(_garbled(text, kind))
            if match[1] not in _UNITS:
                raise _Wrong(f"unit '{match[1]}' is not known{close_matches(match[1], _UNITS)}")
            dimension, size = _UNITS[match[1]]
            power = sign * int(match[2] or 1)
            powers[dimension] = powers.get(dimension, 0) + power
            factor *= size**power
    up = "*".join(_power(d, p) for d, p in sorted(powers.items()) if p > 0)
    down = "*".join(_power(d, -p) for d, p in sorted(powers.items()) if p < 0)
    return (f"{up or '1'}/{down}" if down else up), factor


def _power(dimension: str, power: int) -> str:
    return dimension if power == 1 else f"{dimension}^{power}"


def _photon(dimension: str, kind: _Kind) -> Fraction:
    """Return the photon energy [eV] of one core unit when an energy is given otherwise."""
    if kind is not _ENERGY or dimension == "energy":
        return Fraction(1)
    from .constants import EV_PER_THZ, HC

    return Fraction(HC if dimension == "1/length" else EV_PER_THZ)


def _round(exact: Fraction, written: Fraction) -> float:
    try:
        value = float(exact)
    except OverflowError:
        raise _Wrong("the number is too large") from None
    if value == 0.0 and exact != 0:
        raise _Wrong("the number is too small")
    return value


def _noun(dimension: str) -> str:
    for kind in _KINDS:
        if kind.dimensions[0] == dimension:
            return kind.noun
    other = {
        "monolayers": "a number of monolayers",
        "1/length": "a wavenumber",
        "frequency": "a frequency",
        "celsius": "a temperature",
        "1/length^3": "a density",
        "": "a plain number",
    }
    return other.get(dimension, f"a quantity of kind {dimension}")


def _bare(number: float, kind: _Kind, written: str | None = None) -> str:
    unit = kind.example.split(" ", 1)[1]
    return f"write '{written or number_text(number)} {unit}'"


def _garbled(text: str, kind: _Kind) -> str:
    """Return how to mend a text that is not one number and one unit."""
    comma, underscores = _COMMA.fullmatch(text), _UNDERSCORES.fullmatch(text)
    if comma:
        unit = (comma[3] or kind.example.split(" ", 1)[1]).strip()
        return f"use a decimal point, no comma: write '{comma[1]}.{comma[2]} {unit}'"
    if underscores:
        unit = (underscores[2] or kind.example.split(" ", 1)[1]).strip()
        return f"write '{underscores[1].replace('_', '')} {unit}'"
    return f"write one number and one unit such as '{kind.example}'"
