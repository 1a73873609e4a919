"""Core units back to text or to a quantity; how an error shows what it found."""

from __future__ import annotations

from decimal import Decimal
from typing import TYPE_CHECKING, Any, NamedTuple, SupportsFloat

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


class Rate(NamedTuple):
    """A growth rate as written: its value and ``"nm/s"`` or ``"ML/s"``."""

    value: float
    unit: str


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


def rate_text(value: Rate) -> str:
    """Return the shortest text that reads back as exactly this rate.

    Examples
    --------
    >>> rate_text(Rate(0.7, "ML/s"))
    '0.7 ML/s'
    """
    return f"{number_text(value.value)} {value.unit}"


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
    _sign, digits, exponent = number.as_tuple()
    assert isinstance(exponent, int)
    text = "".join(map(str, digits))
    mantissa = text if len(text) == 1 else f"{text[0]}.{text[1:]}"
    short = f"{'-' if number < 0 else ''}{mantissa}e{exponent + len(text) - 1}"
    if -5 <= number.adjusted() < 7:
        return f"{number:f}"
    plain = f"{number:f}" if abs(number.adjusted()) < 20 else ""
    return plain if 0 < len(plain) <= len(short) else short


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
    """Return a found value as an error text shows it: in one line, text in quotes.

    Examples
    --------
    >>> show("6.2"), show(6.2)
    ("'6.2'", '6.2')
    """
    if isinstance(value, str):
        text = repr(str(value))
    elif hasattr(value, "m_as") or isinstance(value, SupportsFloat):
        text = " ".join(str(value).split())
    else:
        text = " ".join(repr(value).split())
    return text if len(text) <= 80 else text[:77] + "..."
