"""Growth rates and times as a user gives them."""

from __future__ import annotations

from ..errors import QuantityError
from .given import _finite, _read
from .reading import DURATION, RATE
from .texts import Rate, show


def as_rate(value: object, name: str) -> Rate:
    """Return a positive growth rate, in nm/s or kept in monolayers a second.

    Raises
    ------
    QuantityError
        If the value is no positive finite rate with a unit.

    Examples
    --------
    >>> as_rate("0.7 ML/s", "rate"), as_rate("1.8 um/h", "rate")
    (Rate(value=0.7, unit='ML/s'), Rate(value=0.5, unit='nm/s'))
    """
    if isinstance(value, Rate):
        number, unit = _finite(value.value, name, value), value.unit
        if unit not in ("nm/s", "ML/s"):
            raise QuantityError(f"{name}: got {show(value)}; the unit must be 'nm/s' or 'ML/s'")
    else:
        number, dimension = _read(value, name, RATE)
        unit = "ML/s" if dimension == "monolayers/time" else "nm/s"
    if number <= 0.0:
        raise QuantityError(f"{name}: got {show(value)}; a growth rate must be above zero")
    return Rate(number, unit)


def as_duration(value: object, name: str) -> float:
    """Return a time of at least zero [s].

    Raises
    ------
    QuantityError
        If the value is no finite time of at least zero with a unit.

    Examples
    --------
    >>> as_duration("1.5 min", "interruption")
    90.0
    """
    seconds = _read(value, name, DURATION)[0]
    if seconds < 0.0:
        raise QuantityError(f"{name}: got {show(value)}; a time can't be negative")
    return seconds
