"""A composition's numbers from its binaries: shares of each, then bowing for each pair.

For cations i, j and anions k, l with fractions x and y,

    Q = sum x_i y_k Q_ik - sum x_i x_j y_k C_ijk - sum x_i y_k y_l C_ikl ,

the sum over pairs; with one mixed pair it is the ternary's own law. A bowing C(x) that itself
depends on the ternary's x is taken at x = (1 + x_i - x_j)/2, which is x_i in the ternary and
keeps the sum smooth where both vanish (Muggianu, Gambino, Bros, J. Chim. Phys. 72, 83, 1975;
from memory).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from .. import formula
from ..errors import MaterialError, UnknownName, close_matches
from ..formula import Composition, Value
from .entries import GAPS, Alloy, Binary, Mixed
from .files import Catalogue
from .numbers import Fit

_NEEDED = {
    **dict.fromkeys(("c11", "c12", "a_c", "a_v"), "to strain it to a substrate"),
    **dict.fromkeys(("lattice", "gap", "mass"), "by every layer"),
}


@dataclass(frozen=True)
class Pair:
    """Two binaries that mix: their alloy, the weight of its bowing, and x = share of ``first``."""

    alloy: Alloy
    first: str
    weight: Value
    share: Value

    def x(self, counts: str) -> Value:
        """Return x as a law counts it."""
        return self.share if counts == self.first else 1.0 - self.share


def _horner(coefficients: tuple[float, ...], x: Value) -> Value:
    total: Value = coefficients[-1]
    for coefficient in coefficients[-2::-1]:
        total = total * x + coefficient
    return total


class Mix:
    """The binaries and pairs of one composition.

    Parameters
    ----------
    composition : Composition
        Fractions, floats or arrays of one shape.
    catalogue : Catalogue
        Where the entries come from.
    """

    def __init__(self, composition: Composition, catalogue: Catalogue) -> None:
        self.name = formula.text(composition)
        self.parts = [
            (self._binary(name, catalogue), weight)
            for name, weight in formula.pairs(composition)
            if np.any(weight)
        ]
        self.pairs = [
            Pair(self._alloy(first, second, catalogue), first, weight, share)
            for first, second, weight, share in _mixing_pairs(composition)
            if np.any(weight)
        ]
        #: the law of a ternary; None for a binary and for more than one mixed pair
        self.ternary = self.pairs[0] if len(self.pairs) == 1 and len(self.parts) == 2 else None

    def _binary(self, name: str, catalogue: Catalogue) -> Binary:
        found = catalogue.binary(name)
        if found is None:
            known, _ = catalogue.names()
            whose = "" if name == self.name else f" (part of {self.name})"
            raise UnknownName(
                f"no material file has {name}{whose}{close_matches(name, known)}; "
                f"add [binary.{name}] in a material file of your own"
            )
        return found

    def _alloy(self, first: str, second: str, catalogue: Catalogue) -> Alloy:
        elements = frozenset((*formula.elements(first), *formula.elements(second)))
        found = catalogue.alloy(elements)
        if found is None:
            pattern = pattern_of(first, second)
            raise UnknownName(
                f"no material file says how {first} and {second} mix (in {self.name}); add "
                f"[alloy.{pattern}] with its bowing of the gap in a material file of your own"
            )
        return found

    def has(self, quantity: str) -> bool:
        """Return whether every binary has a number for a quantity."""
        return all(quantity in binary.numbers for binary, _ in self.parts)

    def _law(self, quantity: str) -> Mixed | None:
        """Return the polynomial of a ternary, where its file gives one."""
        return self.ternary.alloy.laws.get(quantity) if self.ternary else None

    def _of(self, binary: Binary, quantity: str, temperature_K: float | None) -> float:
        number = binary.numbers.get(quantity)
        if number is None:
            raise MaterialError(
                f"{self.name}: the file of {binary.name} has no {quantity!r}, "
                f"needed {_NEEDED.get(quantity, 'by the route of its conduction edge')}"
            )
        if not isinstance(number, Fit):
            return number.value
        if temperature_K is None:  # the temperature its mass was taken at
            temperature_K = binary.numbers["mass"].at if "mass" in binary.numbers else 300.0
        return number.energy(temperature_K or 0.0)

    def _mean(self, quantity: str, temperature_K: float | None) -> Value:
        total: Value = 0.0
        for binary, weight in self.parts:
            total = total + weight * self._of(binary, quantity, temperature_K)
        return total

    def bowing(self, quantity: str) -> Value:
        """Return what the bowings of all pairs take off the mean."""
        total: Value = 0.0
        for pair in self.pairs:
            law = pair.alloy.bowings.get(quantity)
            if law is not None:
                total = total + pair.weight * _horner(law.coefficients, pair.x(law.first))
            elif quantity == "gap":
                raise MaterialError(
                    f"{self.name}: the file of {pair.alloy.pattern} has no bowing of the gap; "
                    'give it, or bowing = "0 eV" with the source that says so'
                )
        return total

    def value(self, quantity: str, temperature_K: float | None = None) -> Value:
        """Return a quantity in core units.

        A gap is taken at ``temperature_K``, or where that is None at the temperature at which
        each binary's mass was taken.
        """
        law = self._law(quantity)
        if law is None or self.ternary is None:
            return self._mean(quantity, temperature_K) - self.bowing(quantity)
        value = _horner(law.coefficients, self.ternary.x(law.first))
        if quantity in GAPS:  # the law holds at one temperature; from there on the binaries' fits
            value = value + self._mean(quantity, temperature_K) - self._mean(quantity, law.at)
        return value

    def gap_of_mass(self) -> Value:
        """Return the unstrained gap at the temperature at which the mass was taken [eV]."""
        mass = self._law("mass")
        return self.value("gap", mass.at if mass is not None else None)

    @property
    def follows_gap(self) -> bool:
        """Whether the mass follows the gap with temperature and strain.

        Raises
        ------
        MaterialError
            If the binaries disagree and no alloy entry decides.
        """
        if self.ternary is not None and self.ternary.alloy.follows_gap is not None:
            return self.ternary.alloy.follows_gap
        answers = {binary.follows_gap is not False for binary, _ in self.parts}
        if len(answers) > 1:
            fixed = [b.name for b, _ in self.parts if b.follows_gap is False]
            raise MaterialError(
                f"{self.name}: the mass of {' and '.join(fixed)} does not follow the gap, that of "
                "the others does; say mass_follows_gap = true or false in the alloy's entry"
            )
        return answers.pop()

    def cautions(self, temperature_K: float, strained: bool) -> Iterator[str]:
        """Yield a caution for each law used outside the range its source gives, and the like."""
        for binary, _ in self.parts:
            a_v = binary.numbers.get("a_v")
            if strained and a_v is not None and a_v.value > 0.0:
                yield (
                    f"{binary.name}: a_v is {a_v.value:+g} eV in the convention (a_c + a_v) Tr, "
                    "where nearly every compound is negative; look at its gap_shift"
                )
            gap = binary.numbers.get("gap")
            if isinstance(gap, Fit) and gap.valid is not None:
                low, high = gap.valid
                if not low <= temperature_K <= high:
                    yield (
                        f"{binary.name}: its gap is fitted from {low:g} to {high:g} K, "
                        f"used at {temperature_K:g} K"
                    )
        for pair in self.pairs:
            alloy = pair.alloy
            if self.ternary is None and (alloy.laws or (alloy.route and alloy.route.partner)):
                yield (
                    f"{self.name}: own polynomials and edge of {alloy.pattern} serve the ternary "
                    "alone; here its bowings are used"
                )
            laws = {**alloy.bowings, **(alloy.laws if self.ternary else {})}
            for quantity, law in laws.items():
                x = np.asarray(pair.x(law.first))
                low, high = law.valid
                if np.any(x < low) or np.any(x > high):
                    yield (
                        f"{self.name}: {quantity} of {alloy.pattern} holds for a share of "
                        f"{law.first} from {low:g} to {high:g}"
                    )


def pattern_of(first: str, second: str) -> str:
    """Return the pattern in which two binaries mix.

    Examples
    --------
    >>> pattern_of("AlAs", "GaAs"), pattern_of("InAs", "InSb")
    ('AlxGa1-xAs', 'InAsxSb1-x')
    """
    (a, b), (c, d) = formula.elements(first), formula.elements(second)
    return f"{a}x{c}1-x{b}" if b == d else f"{a}{b}x{d}1-x"


def _mixing_pairs(composition: Composition) -> Iterator[tuple[str, str, Value, Value]]:
    """Yield (first binary, second, weight of the bowing, share of the first) of every pair."""
    for (a, x_a), (b, x_b) in combinations(composition.cations, 2):
        for anion, y in composition.anions:
            yield a + anion, b + anion, x_a * x_b * y, 0.5 * (1.0 + x_a - x_b)
    for (a, y_a), (b, y_b) in combinations(composition.anions, 2):
        for cation, x in composition.cations:
            yield cation + a, cation + b, y_a * y_b * x, 0.5 * (1.0 + y_a - y_b)
