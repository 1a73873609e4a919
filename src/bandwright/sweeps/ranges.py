"""``4 nm..9 nm step 0.5 nm``: ranges and lists as text, into values exact to the last decimal."""

from __future__ import annotations

import re
from collections.abc import Callable
from decimal import Decimal
from fractions import Fraction
from typing import NamedTuple

from ..errors import StackError
from ..quantities import show

#: a parameter of more values is refused
MOST = 10_000_000
_REST = re.compile(r"(?P<last>.*?)(?:\b(?P<how>step|count)\b(?P<what>.*))?", re.DOTALL)
#: reads a text or number: its value and its unit
Reader = Callable[[object], tuple[float, str]]


class Values(NamedTuple):
    """Values of one unit, in the order given."""

    numbers: list[float]
    unit: str


def is_range(text: object) -> bool:
    """Return whether a value is a text of the form ``first..last``."""
    return isinstance(text, str) and ".." in text


def split(text: str) -> list[str]:
    """Return the entries of a list written as text.

    Examples
    --------
    >>> split("4 nm, 5 nm,7 nm")
    ['4 nm', '5 nm', '7 nm']
    """
    return [part.strip() for part in text.split(",")]


def expand(text: str, name: str, read: Reader) -> Values:
    """Return the values of a range.

    Parameters
    ----------
    text : str
        ``"4 nm..9 nm step 0.5 nm"`` or ``"4 nm..9 nm count 11"``. A step that does not lead to the
        last value stops before it.
    name : str
        Begins the text of an error.
    read : callable
        Reads one end, or the step.

    Raises
    ------
    StackError
        If the range runs backwards, its step or count leads nowhere, or has no end.

    Examples
    --------
    >>> from bandwright.quantities import as_value
    >>> expand("4.1nm..4.3nm step 1 Å", "well", lambda text: as_value(text, "well", "nm"))
    Values(numbers=[4.1, 4.2, 4.3], unit='nm')
    """
    start, _, rest = text.partition("..")
    match = _REST.fullmatch(rest)
    assert match is not None  # it takes any text
    start, stop, how = start.strip(), match["last"].strip(), match["how"]
    if not start or not stop:
        raise StackError(f"got {show(text)}; write a range as '4 nm..9 nm step 0.5 nm'", name)
    if how is None:
        raise StackError(
            f"got {show(text)}, without a step or a count; write for example"
            f" '{start}..{stop} count 11'", name
        )  # fmt: skip
    what = match["what"].strip()
    first, unit = _exact(read, start)
    last, other = _exact(read, stop)
    if unit != other:
        raise StackError(f"got {show(text)}; write both ends in one unit", name)
    if last < first:
        raise StackError(
            f"got {show(text)}, which runs backwards; write '{stop}..{start} {how} {what}'", name
        )
    if how == "count":
        return Values(_counted(first, last, what, text, name), unit)
    return Values(_stepped(first, last, what, unit, text, name, read), unit)


def _exact(read: Reader, text: str) -> tuple[Fraction, str]:
    number, unit = read(text)
    return Fraction(Decimal(repr(number))), unit


def _counted(first: Fraction, last: Fraction, what: str, text: str, name: str) -> list[float]:
    if not re.fullmatch(r"[0-9]+", what) or int(what) < 1:
        raise StackError(f"count: got {show(what)}; a whole number from 1 is due", name)
    count = int(what)
    if count == 1 and first != last:
        raise StackError(f"got {show(text)}: one value has no two ends; count 2 at least", name)
    _refuse_many(count, name)
    return [float(first + (last - first) * Fraction(i, max(count - 1, 1))) for i in range(count)]


def _stepped(
    first: Fraction, last: Fraction, what: str, unit: str, text: str, name: str, read: Reader
) -> list[float]:
    if re.search(r"°C|degC", what):
        raise StackError(f"step: got {show(what)}; write a step of temperature in K", name)
    step, other = _exact(read, what)
    if unit != other:
        raise StackError(f"step: got {show(what)} in a range of {unit}; write one unit", name)
    if step <= 0:
        raise StackError(f"step: got {show(what)}; a step above zero is due", name)
    if last != first and step > last - first:
        raise StackError(f"step: got {show(what)}, longer than the range {show(text)}", name)
    count = int((last - first) / step) + 1
    _refuse_many(count, name)
    return [float(first + i * step) for i in range(count)]


def _refuse_many(count: int, name: str) -> None:
    if count > MOST:
        raise StackError(f"{count:,} values; at most {MOST:,} are swept", name)
