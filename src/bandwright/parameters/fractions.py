"""The fractions of a formula with numbers, as parameters: read and replaced in the text."""

from __future__ import annotations

from decimal import Decimal
from functools import lru_cache

from ..errors import StackError
from ..formula import Sublattice, Value, letters, parse
from ..quantities import number_text

SITES = ("composition", "anion_composition")


def mixed_sites(formula: str) -> list[tuple[str, Sublattice]]:
    """Return (key, sublattice) of each mixed sublattice of a formula without letters.

    Raises
    ------
    MaterialError
        If the formula can't be read.
    """
    if letters(formula):
        return []
    mixed = [site for site in parse(formula).sublattices if len(site) > 1]
    return list(zip(SITES, mixed, strict=False))


@lru_cache(maxsize=256)
def letter_effects(formula: str, letter: str) -> tuple[tuple[str, int], ...]:
    """Return the elements whose fraction a letter raises (1) or lowers (-1).

    Examples
    --------
    >>> letter_effects("AlxGa1-xAs", "x")
    (('Al', 1), ('Ga', -1))
    """
    zeros: dict[str, Value] = dict.fromkeys(letters(formula), 0.0)
    before = parse(formula, **zeros)
    after = parse(formula, **{**zeros, letter: 1.0})
    effects = [(e, round(float(f - before.fraction(e)))) for s in after.sublattices for e, f in s]
    return tuple((element, sign) for element, sign in effects if sign)


def first_fraction(sublattice: Sublattice) -> float:
    """Return the fraction of a sublattice's first element."""
    return float(sublattice[0][1])


def with_fraction(formula: str, key: str, sublattice: Sublattice, value: float) -> str:
    """Return the formula with another first fraction of one sublattice, the rest in proportion.

    Raises
    ------
    StackError
        If the fraction is outside 0 to 1.
    """
    value += 0.0  # no minus zero
    if not 0.0 <= value <= 1.0:
        raise StackError(f"got {number_text(value)}; a fraction lies between 0 and 1")
    amounts = {e: Decimal(repr(float(f))) for site in parse(formula).sublattices for e, f in site}
    (first, _), *others = sublattice
    new, old = Decimal(repr(value)), amounts[first]
    rest = 1 - new
    for element, _ in others[:-1]:
        part = amounts[element] / (1 - old) if old != 1 else Decimal(0)
        amounts[element] = min(rest, Decimal(repr(float((1 - new) * part))))
        rest -= amounts[element]
    amounts[first], amounts[others[-1][0]] = new, rest
    mixed = {element for site in parse(formula).sublattices if len(site) > 1 for element, _ in site}
    return "".join(e + (f"{a.normalize():f}" if e in mixed else "") for e, a in amounts.items())


def with_amounts(formula: str, amounts: dict[str, float]) -> str:
    """Return the formula with other fractions on one mixed sublattice; the last fills it up.

    Examples
    --------
    >>> with_amounts("In0.53Ga0.47As", {"In": 0.5, "Ga": 0.5}), with_amounts("GaAs", {"Ga": 1.0})
    ('In0.5Ga0.5As', 'GaAs')
    """
    sites = parse(formula).sublattices
    exact = {e: Decimal(repr(float(f))) for site in sites for e, f in site}
    mixed = {element for site in sites if len(site) > 1 for element, _ in site}
    if not mixed & amounts.keys():
        return formula
    *others, last = amounts
    rest = Decimal(1)
    for element in others:
        exact[element] = min(rest, Decimal(repr(float(amounts[element]))))
        rest -= exact[element]
    exact[last] = rest
    return "".join(e + (f"{a.normalize():f}" if e in mixed else "") for e, a in exact.items())
