"""Chemical formulas as the trade writes them <-> fractions on the two sublattices.

``Al0.28Ga0.72As`` has 28 % aluminium and 72 % gallium on the cation sites and arsenic on every
anion site. ``AlxGa1-xAs`` leaves the fraction to a letter, whose value follows as ``x = 0.28``.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from decimal import Decimal
from functools import lru_cache

import numpy as np
import numpy.typing as npt

from .errors import MaterialError, close_matches

Value = float | npt.NDArray[np.float64]
#: one sublattice: (element, fraction) in the order written
Sublattice = tuple[tuple[str, Value], ...]

#: elements a zincblende compound can hold: group -> (cations, anions)
SITES = {
    "III-V": (("B", "Al", "Ga", "In", "Tl"), ("N", "P", "As", "Sb", "Bi")),
    "II-VI": (("Be", "Mg", "Zn", "Cd", "Hg", "Mn"), ("O", "S", "Se", "Te")),
}
LETTERS = ("x", "y", "z")

_ELEMENTS = {name for sites in SITES.values() for site in sites for name in site}
_AMOUNT = r"\(?(?:1(?:-[xyz])+|[xyz]|\d+\.?\d*(?:[eE][-+]?\d+)?|\.\d+)\)?"
_KNOWN = "|".join(sorted(_ELEMENTS, key=len, reverse=True))
_PART = re.compile(rf"(?P<element>(?:{_KNOWN})(?![a-w])|[A-Z][a-z]?)(?P<amount>{_AMOUNT})?")
_ANY_CASE = re.compile(rf"(?P<element>{_KNOWN})(?P<amount>{_AMOUNT})?", re.IGNORECASE)
_ROUNDING = 1e-9


@dataclass(frozen=True)
class Composition:
    """Fractions of the elements on the cation and on the anion sites.

    Parameters
    ----------
    sublattices : tuple of tuple
        Cations, then anions; each a tuple of ``(element, fraction)`` in the order written.
        Fractions are floats, or arrays of one shape for a graded layer.
    """

    sublattices: tuple[Sublattice, Sublattice]

    @property
    def cations(self) -> Sublattice:
        """Elements and fractions of the cation sites."""
        return self.sublattices[0]

    @property
    def anions(self) -> Sublattice:
        """Elements and fractions of the anion sites."""
        return self.sublattices[1]

    @property
    def graded(self) -> bool:
        """Whether any fraction is an array."""
        return any(np.ndim(fraction) > 0 for site in self.sublattices for _, fraction in site)

    def fraction(self, element: str) -> Value:
        """Return the fraction of one element, 0 where the formula does not name it."""
        for site in self.sublattices:
            for name, fraction in site:
                if name == element:
                    return fraction
        return 0.0


@dataclass(frozen=True)
class _Part:
    """One element of a formula: its amount is ``constant`` minus, or plus one, letter."""

    element: str
    constant: Decimal
    letters: tuple[str, ...]  # subtracted; a lone letter has constant 0 and `plus` set
    plus: bool = False
    written: bool = True

    def rewritten(self, amount: float | str | None) -> str:
        if amount is not None:
            return self.element + (amount if isinstance(amount, str) else f"{amount:.3g}")
        if not self.letters:
            return self.element + (f"{self.constant}" if self.written else "")
        rest = "-".join(self.letters)
        return self.element + (rest if self.plus else f"1-{rest}")

    def value(self, given: dict[str, Value]) -> Value:
        sign = 1 if self.plus else -1
        if any(np.ndim(given[letter]) for letter in self.letters):
            total: Value = np.asarray(float(self.constant))
            for letter in self.letters:
                total = total + sign * np.asarray(given[letter], dtype=float)
            return total
        exact = self.constant
        for letter in self.letters:
            exact += sign * Decimal(repr(float(given[letter])))
        return float(exact)


def letters(formula: str) -> tuple[str, ...]:
    """Return the letters a formula leaves open, in alphabetical order.

    Parameters
    ----------
    formula : str
        For example ``"AlxInyGa1-x-yAs"``.

    Raises
    ------
    MaterialError
        If the text is no formula.

    Examples
    --------
    >>> letters("AlxInyGa1-x-yAs"), letters("GaAs")
    (('x', 'y'), ())
    """
    return tuple(sorted({name for part in _parts(formula) for name in part.letters}))


def elements(formula: str) -> tuple[str, ...]:
    """Return the elements a formula or a bare name like ``AlGaAs`` holds, in the order written.

    Raises
    ------
    MaterialError
        If the text is no formula.

    Examples
    --------
    >>> elements("AlxGa1-xAs")
    ('Al', 'Ga', 'As')
    """
    return tuple(part.element for part in _parts(formula))


def parse(formula: str, **fractions: Value) -> Composition:
    """Read a chemical formula, with a value for each letter in it.

    Parameters
    ----------
    formula : str
        For example ``"Al0.28Ga0.72As"`` or ``"AlxGa1-xAs"``.
    **fractions : float or array
        One value for each letter: ``x=0.28``, or an array of fractions along a graded layer.

    Returns
    -------
    Composition

    Raises
    ------
    MaterialError
        If the text is no formula, an element has no site in it, the fractions of a sublattice
        do not add up to 1, one is outside 0 to 1, or letters and values do not match.

    Examples
    --------
    >>> parse("Al0.28Ga0.72As").cations
    (('Al', 0.28), ('Ga', 0.72))
    >>> parse("AlxGa1-xAs", x=0.9).cations
    (('Al', 0.9), ('Ga', 0.1))
    """
    if all(isinstance(fraction, float) for fraction in fractions.values()):
        return _of_numbers(formula, *fractions.items())
    return _composition(formula, fractions)


@lru_cache(maxsize=4096)
def _of_numbers(formula: str, *fractions: tuple[str, float]) -> Composition:
    return _composition(formula, dict(fractions))


def _composition(formula: str, fractions: dict[str, Value]) -> Composition:
    parts = _parts(formula)
    _check_letters(formula, parts, fractions)
    values = [(part.element, part.value(fractions)) for part in parts]
    sites = _sites(formula, elements(formula))
    sublattices = [tuple(v for v in values if v[0] in site) for site in sites]
    for site in sublattices:
        _check_sum(formula, site, parts)
    checked = [tuple(_checked(formula, *pair, fractions) for pair in site) for site in sublattices]
    return Composition((checked[0], checked[1]))


def text(composition: Composition) -> str:
    """Return the formula of a composition; elements with the fraction 0 are left out.

    Examples
    --------
    >>> text(parse("AlxGa1-xAs", x=0.28))
    'Al0.28Ga0.72As'
    >>> text(parse("AlxGa1-xAs", x=0.0))
    'GaAs'
    >>> text(parse("AlxGa1-xAs", x=np.linspace(0.0, 0.3, 5)))
    'Al(0 to 0.3)Ga(1 to 0.7)As'
    """
    return "".join(
        element + _amount(fraction)
        for site in composition.sublattices
        for element, fraction in site
        if (fraction != 0.0 if isinstance(fraction, float) else np.any(fraction != 0.0))
    )


def _amount(fraction: Value) -> str:
    if isinstance(fraction, float | int):
        value = float(fraction)
    elif fraction.min() != fraction.max():
        return f"({fraction.flat[0]:.4g} to {fraction.flat[-1]:.4g})"
    else:
        value = float(fraction.flat[0])
    short = f"{value:.12g}"
    written = short if float(short) == value else repr(value)
    return "" if written == "1" else written


@lru_cache(maxsize=4096)
def _parts(formula: str) -> tuple[_Part, ...]:
    """Cut a formula into its elements and amounts."""
    if not isinstance(formula, str):
        raise MaterialError(f"a formula is text like 'Al0.28Ga0.72As', got {formula!r}")
    compact = formula.strip()
    if not compact:
        raise MaterialError("an empty text is no formula; write one like 'GaAs'")
    parts: list[_Part] = []
    place = 0
    while place < len(compact):
        found = _PART.match(compact, place)
        if found is None:
            raise MaterialError(
                f"{formula!r} can't be read from {compact[place:]!r} on" + _readable(compact)
            )
        part = _part(found["element"], found["amount"])
        if part.element not in _ELEMENTS:
            near = _recased(compact) or close_matches(part.element, _ELEMENTS)
            place_in = f"{formula!r}: " if part.element != compact else ""
            raise MaterialError(
                f"{place_in}{part.element!r} sits on no sublattice of a compound{near}"
            )
        if any(part.element == other.element for other in parts):
            raise MaterialError(f"{formula!r} names {part.element} twice")
        parts.append(part)
        place = found.end()
    return tuple(parts)


def _readable(formula: str) -> str:
    """Return a hint for a text that is no formula."""
    return _recased(formula) or "; write a formula like 'Al0.28Ga0.72As' or 'AlxGa1-xAs'"


def _recased(formula: str) -> str:
    """Return a hint for a formula that is one but for its capitals or its commas, else ""."""
    dotted = formula.replace(",", ".")
    place = 0
    mended = ""
    while found := _ANY_CASE.match(dotted, place):
        mended += found["element"].capitalize() + (found["amount"] or "").lower()
        place = found.end()
    return f"; did you mean {mended!r}?" if mended and place == len(dotted) else ""


def _part(element: str, amount: str | None) -> _Part:
    if amount is None:
        return _Part(element, Decimal(1), (), written=False)
    bare = amount.strip("()")
    if bare in LETTERS:
        return _Part(element, Decimal(0), (bare,), plus=True)
    if "-" in bare and bare[-1] in LETTERS:
        return _Part(element, Decimal(1), tuple(bare[2:].split("-")))
    return _Part(element, Decimal(bare), ())


def _check_letters(formula: str, parts: tuple[_Part, ...], given: dict[str, Value]) -> None:
    wanted = {name for part in parts for name in part.letters}
    missing = sorted(wanted - given.keys())
    if missing:
        names = " and ".join(missing)
        example = ", ".join(f"{name} = 0.3" for name in missing)
        raise MaterialError(f"{formula!r} needs a value for {names}, for example {example}")
    extra = sorted(given.keys() - wanted)
    if extra:
        has = f"only has {', '.join(sorted(wanted))}" if wanted else "has no letters"
        raise MaterialError(
            f"{formula!r} {has}, but a value for {' and '.join(extra)} was given; "
            "write the letter into the formula, like 'AlxGa1-xAs'"
        )


def _sites(formula: str, named: tuple[str, ...]) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Return the group of sites that holds every element, with both sites taken."""
    for cations, anions in SITES.values():
        if all(element in cations + anions for element in named):
            for site, name, like in ((cations, "cation", "Ga"), (anions, "anion", "As")):
                if not any(element in site for element in named):
                    raise MaterialError(f"{formula!r} has no {name} (an element like {like})")
            return cations, anions
    first = next(g for g, s in SITES.items() if named[0] in s[0] + s[1])
    stranger = next(e for e in named if e not in SITES[first][0] + SITES[first][1])
    raise MaterialError(f"{formula!r}: {stranger} has no site in a {first} compound")


def _check_sum(formula: str, site: Sublattice, parts: tuple[_Part, ...]) -> None:
    """Refuse fractions that do not add up to 1, and say what would."""
    plain = [f for _, f in site if isinstance(f, float)]
    if len(plain) == len(site) and abs(sum(plain) - 1.0) <= _ROUNDING:
        return
    with np.errstate(invalid="ignore"):  # infinite fractions are refused below
        total = sum((np.asarray(f, dtype=float) for _, f in site), np.asarray(0.0))
    wrong = np.abs(total - 1.0)
    if np.all(wrong <= _ROUNDING):
        return
    index = int(np.argmax(np.where(np.isnan(wrong), np.inf, wrong)))
    values = {e: float(np.broadcast_to(f, total.shape).flat[index]) for e, f in site}
    listed = " and ".join(f"{e} {v:.12g}" for e, v in values.items())
    found = f"{listed} add up to {float(total.flat[index]):.12g} instead of 1"
    if len(values) == 1:
        found = f"the amount of {listed.replace(' ', ' is ')} instead of 1"
    raise MaterialError(f"{formula!r}: {found}; {_would_be_right(formula, values, parts)}")


def _would_be_right(formula: str, values: dict[str, float], parts: tuple[_Part, ...]) -> str:
    """Return formulas near the one written whose fractions on one sublattice add up to 1."""
    names = list(values)
    if not all(np.isfinite(v) for v in values.values()):
        return "a fraction must be a number between 0 and 1"
    if len(values) == 1:
        return f"{names[0]} is alone on its sites: write it without a number"
    if any(part.letters for part in parts if part.element in values):
        amounts = [*LETTERS[: len(names) - 1], "1-" + "-".join(LETTERS[: len(names) - 1])]
        return f"write {_rewritten(parts, dict(zip(names, amounts, strict=False)))}"
    total = sum(values.values())
    bare = [part.element for part in parts if part.element in values and not part.written]
    mended: list[dict[str, float]] = []
    if abs(total - 100.0) < 1e-6:
        mended.append({e: v / 100.0 for e, v in values.items()})
    elif len(bare) <= 1:
        for element in bare or reversed(names):
            rest = 1.0 - (total - values[element])
            if 0.0 < rest < 1.0:
                mended.append({**values, element: rest})
    if not mended:
        mended.append(dict.fromkeys(names, 1.0 / len(names)))
        return "an alloy is written with fractions, like " + _rewritten(parts, mended[0])
    return " or ".join(_rewritten(parts, new) for new in mended[:2]) + " would"


def _rewritten(parts: tuple[_Part, ...], amounts: Mapping[str, float | str]) -> str:
    """Return the formula with other amounts on some elements."""
    return "".join(part.rewritten(amounts.get(part.element)) for part in parts)


def _checked(
    formula: str, element: str, fraction: Value, given: dict[str, Value]
) -> tuple[str, Value]:
    """Refuse a fraction outside 0 to 1; rounding of a sum's last digits is set to the bound."""
    if isinstance(fraction, float) and -1e-12 <= fraction <= 1.0 + _ROUNDING:
        return element, min(max(fraction, 0.0), 1.0)
    values = np.asarray(fraction, dtype=float)
    inside = (values >= -1e-12) & (values <= 1.0 + _ROUNDING)
    if not np.all(inside):
        index = int(np.argmin(inside))
        found = float(values.flat[index])
        letters_given = ", ".join(
            f"{n} = {float(np.broadcast_to(v, values.shape).flat[index]):.12g}"
            for n, v in given.items()
        )
        because = f" ({letters_given})" if given else ""
        raise MaterialError(
            f"{formula!r}: the fraction of {element} is {found:.12g}{because}; "
            "it must lie between 0 and 1"
        )
    if values.ndim == 0:
        return element, min(max(float(values), 0.0), 1.0)
    return element, np.clip(values, 0.0, 1.0)


def pairs(composition: Composition) -> Iterator[tuple[str, Value]]:
    """Yield the binaries of a composition with the share of each, product of two fractions.

    Examples
    --------
    >>> list(pairs(parse("Al0.25Ga0.75As")))
    [('AlAs', 0.25), ('GaAs', 0.75)]
    """
    for cation, x in composition.cations:
        for anion, y in composition.anions:
            yield cation + anion, x * y
