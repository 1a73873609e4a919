"""A wish list, weighted: designs marked by it and ranked."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .errors import QuantityError, StackError, close_matches
from .quantities import show

Floats = npt.NDArray[np.float64]

#: what may be wished of a number
KINDS = ("near", "large", "small")
_TEXT = re.compile(r"(\w+)(?:\s+([^\s,]+))?\s*(?:,\s*weight\s+(\S+))?")
_EXAMPLES = "('near', 10.3), ('large', 2.0) or 'near 10.3, weight 2'"


class Wish(NamedTuple):
    """What is wished of one column.

    Attributes
    ----------
    kind : str
        ``"near"``, ``"large"`` or ``"small"``.
    target : float
        What it should be near to, in the column's unit; nan otherwise.
    weight : float
        How much it counts beside other wishes.
    """

    kind: str
    target: float = math.nan
    weight: float = 1.0

    def marks(self, values: Floats) -> Floats:
        """Return a mark of each design, 1 for the best of them, 0 for the worst or none.

        Examples
        --------
        >>> Wish("near", 10.0).marks(np.array([10.1, 9.6, 10.0, np.nan])).round(3).tolist()
        [0.75, 0.0, 1.0, 0.0]
        """
        there = np.isfinite(values)
        marks = np.zeros(len(values))
        if not there.any():
            return marks
        found = values[there]
        if self.kind == "near":
            off = np.abs(found - self.target)
            marks[there] = 1.0 - off / (off.max() or 1.0)
            return marks
        span = np.ptp(found)
        up = (found - found.min()) / span if span else np.ones_like(found)
        marks[there] = up if self.kind == "large" or not span else 1.0 - up
        return marks


def read_wishes(wishes: Mapping[str, object] | None) -> dict[str, Wish]:
    """Return wishes by column.

    Parameters
    ----------
    wishes : mapping of str to tuple or str
        ``("near", target)``, ``("large",)``, ``("small",)``, each with a weight behind if it is
        not 1; or as text, ``"near 10.3, weight 2"``.

    Raises
    ------
    StackError
        If they are no mapping, or one is of no known kind.
    QuantityError
        If a target or a weight is no number, or a weight not above zero.

    Examples
    --------
    >>> read_wishes({"wavelength_um": "near 10.3, weight 2", "dipole_nm": "large"})["dipole_nm"]
    Wish(kind='large', target=nan, weight=1.0)
    """
    if wishes is None:
        return {}
    if not isinstance(wishes, Mapping) or not wishes:
        raise StackError(
            f"wishes: got {show(wishes)}; give a mapping such as"
            " {'wavelength_um': ('near', 10.3), 'dipole_nm': ('large', 2.0)}"
        )
    return {str(name): _wish(str(name), given) for name, given in wishes.items()}


def _wish(name: str, given: object) -> Wish:
    parts = _parts(given)
    if not parts:
        raise StackError(f"wish for {name}: got {show(given)}; write {_EXAMPLES}")
    kind, *numbers = parts
    if kind not in KINDS:
        raise StackError(f"wish for {name}: got {show(kind)}{close_matches(str(kind), KINDS)}")
    due = 1 if kind == "near" else 0
    if not due <= len(numbers) <= due + 1:
        raise StackError(f"wish for {name}: got {show(given)}; write {_EXAMPLES}")
    target = _number(name, "target", numbers[0]) if due else math.nan
    weight = _number(name, "weight", numbers[due]) if len(numbers) > due else 1.0
    if weight <= 0.0:
        raise QuantityError(f"wish for {name}: weight {weight:g}; a weight must be above zero")
    return Wish(str(kind), target, weight)


def _parts(given: object) -> list[object]:
    """Return kind, target if any and weight if any."""
    if isinstance(given, Wish):
        target = [] if math.isnan(given.target) else [given.target]
        return [given.kind, *target, given.weight]
    if isinstance(given, str):
        match = _TEXT.fullmatch(given.strip())
        return [] if match is None else [part for part in match.groups() if part is not None]
    return list(given) if isinstance(given, Sequence) else []


def _number(name: str, what: str, value: object) -> float:
    try:
        number = math.nan if isinstance(value, bool) else float(value)  # type: ignore[arg-type]
    except (TypeError, ValueError):  # what is no number is told below
        number = math.nan
    if not math.isfinite(number):
        raise QuantityError(
            f"wish for {name}: {what} {show(value)}; a number is due, in the unit of the column"
        )
    return number


def scores(wishes: Mapping[str, Wish], columns: Mapping[str, Floats]) -> Floats:
    """Return the score of each design: the mean of its marks, weighted; 0 to 1."""
    weights = np.array([wish.weight for wish in wishes.values()])
    marks = np.array([wish.marks(columns[name]) for name, wish in wishes.items()])
    return np.asarray(weights @ marks / weights.sum())


def ranks(scores: Floats) -> list[int | None]:
    """Return 1 for the best score, and so on; equals share the better rank, nan has none.

    Examples
    --------
    >>> ranks(np.array([0.2, 0.9, np.nan, 0.9]))
    [3, 1, None, 1]
    """
    rounded = np.round(scores, 12)
    return [None if np.isnan(s) else int(np.sum(rounded > s)) + 1 for s in rounded]
