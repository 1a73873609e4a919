"""What a user gives, checked and turned into floats of core units."""

from __future__ import annotations

import math
from collections.abc import Mapping
from decimal import Decimal
from fractions import Fraction
from typing import Any, SupportsFloat

from ..errors import QuantityError
from .reading import (
    DENSITY,
    ENERGY,
    FIELD,
    INVERSE_ENERGY,
    LENGTH,
    TEMPERATURE,
    TEXT,
    THICKNESS,
    VOLTAGE,
    Kind,
    Wrong,
    bare,
    cleaned,
    garbled,
    photon,
    read_text,
    rounded,
)
from .texts import Density, Length, number_text, show

_DIGITS = 15  # every decimal of this many digits survives float and back


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
    return _read(value, name, LENGTH)[0]


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
        number, dimension = _read(value, name, THICKNESS)
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
    return _read(value, name, ENERGY)[0]


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
    return _read(value, name, FIELD)[0]


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
    return _read(value, name, VOLTAGE)[0]


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
    kelvin = _read(value, name, TEMPERATURE)[0]
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
        number, dimension = _read(value, name, DENSITY)
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
    return _read(value, name, INVERSE_ENERGY)[0]


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


_KIND_OF = {
    "nm": THICKNESS, "ML": THICKNESS, "eV": ENERGY, "V/nm": FIELD, "V": VOLTAGE, "K": TEMPERATURE,
    "nm^-2": DENSITY, "nm^-3": DENSITY, "1/eV": INVERSE_ENERGY,
}  # fmt: skip
_UNIT_OF = {"length": "nm", "monolayers": "ML", "1/length^2": "nm^-2", "1/length^3": "nm^-3"}


def as_value(value: object, name: str, unit: str) -> tuple[float, str]:
    """Return a value of the kind that a core unit is of, and its core unit.

    Parameters
    ----------
    value : str, quantity, or number where ``unit`` has no dimension
    name : str
    unit : str
        Core unit as `bandwright.parameters.Parameter` has it: ``"nm"``, ``"eV"``, ..., ``"m0"``
        or ``""``. Lengths may come back in ``"ML"``, densities per area or per volume.

    Raises
    ------
    QuantityError
        If the value is no finite quantity of the kind.

    Examples
    --------
    >>> as_value("250 meV", "edge", "eV"), as_value("22 ML", "thickness", "nm")
    ((0.25, 'eV'), (22.0, 'ML'))
    >>> as_value("28 %", "composition", ""), as_value(0.067, "mass", "m0")
    ((0.28, ''), (0.067, 'm0'))
    """
    if unit not in _KIND_OF:
        factors = {"": "1", "m0": "1"} if unit == "m0" else {"": "1", "%": "0.01"}
        return _plain(value, name, "0.067" if unit == "m0" else "0.28", factors), unit
    number, dimension = _read(value, name, _KIND_OF[unit])
    return number, _UNIT_OF.get(dimension, unit)


def _read(value: object, name: str, kind: Kind) -> tuple[float, str]:
    """Return (core value, dimension) of a text or quantity of one kind."""
    try:
        if isinstance(value, str):
            return read_text(str(value), kind)
        if hasattr(value, "m_as"):
            return _read_quantity(value, kind)
        if not _is_number(value):
            raise Wrong(f"write {kind.noun} as text such as '{kind.example}'")
        raise Wrong(bare(number_text(_scalar(value, kind.noun)), kind))
    except Wrong as wrong:
        raise QuantityError(f"{name}: got {show(value)}; {wrong}") from None


def _read_quantity(value: Any, kind: Kind) -> tuple[float, str]:
    for unit, dimension in kind.pint_units:
        try:
            converted = value.m_as(unit)
        except (TypeError, ValueError, AttributeError):
            continue
        number = Fraction(Decimal(repr(_snapped(converted, value, kind.noun))))
        return rounded(number * photon(dimension, kind)), dimension
    raise Wrong(f"that is no {kind.noun.split(' ', 1)[1]}; write for example '{kind.example}'")


def _is_number(value: object) -> bool:
    truth = type(value).__name__ in ("bool", "bool_")  # numpy's is "bool", once "bool_"
    return isinstance(value, SupportsFloat) and not truth


def _snapped(converted: object, value: object, noun: str) -> float:
    """Return a converted value without the last-digit error of the conversion.

    62 Å is 6.2 nm, not 6.200000000000001 nm: a magnitude of few digits stays one.
    """
    number = _scalar(converted, noun)
    magnitude = getattr(value, "magnitude", None)
    return number if _long(magnitude) else float(f"{number:.{_DIGITS}g}")


def _scalar(value: Any, noun: str) -> float:
    if getattr(value, "ndim", 0):
        raise Wrong(f"that is an array; write one {noun.split(' ', 1)[1]}")
    try:
        number = float(value)
    except (TypeError, ValueError):
        raise Wrong("that is no plain number") from None
    except OverflowError:
        raise Wrong("the number is too large") from None
    if not math.isfinite(number):
        raise Wrong("that is not finite")
    return number


def _long(magnitude: object) -> bool:
    """Whether a magnitude uses more digits than survive a rounding to `_DIGITS`."""
    if isinstance(magnitude, SupportsFloat):
        number = float(magnitude)
        return bool(float(f"{number:.{_DIGITS}g}") != number)
    return True


def _plain(value: object, name: str, example: str, factors: Mapping[str, str]) -> float:
    """Return a dimensionless number, from a number, a dimensionless quantity or a text."""
    try:
        if isinstance(value, str):
            match = TEXT.fullmatch(cleaned(str(value)))
            if match is None or match[2] not in factors:
                raise Wrong(garbled(cleaned(str(value)), example, "a number such as " + example))
            number = Fraction(Decimal(match[1]))
            return rounded(number * Fraction(factors[match[2]]))
        if hasattr(value, "m_as"):
            try:
                return _snapped(value.m_as(""), value, "a number")
            except (TypeError, ValueError, AttributeError):
                raise Wrong(f"write a number without unit such as {example}") from None
        if not _is_number(value):
            raise Wrong(f"write a number such as {example}")
        return _scalar(value, "a number")
    except Wrong as wrong:
        raise QuantityError(f"{name}: got {show(value)}; {wrong}") from None


def _finite(value: object, name: str, found: object) -> float:
    try:
        return _scalar(value, "a number")
    except Wrong as wrong:
        raise QuantityError(f"{name}: got {show(found)}; {wrong}") from None
