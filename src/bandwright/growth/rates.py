"""Which cells are open for a layer, what they put down, and how fast.

Atoms add, not monolayers of different lattices: each cell's flux is a number of atoms per area
and time, whatever lattice it was measured on, and a film has one monolayer more whenever
2/a^2 atoms per area have arrived, a its lattice constant in the plane. Anions are in excess.

The rule for open cells: of every choice of one cell or more for each cation, the one whose largest
error in a fraction is least; of those equally good (to 1e-9) the one with fewest cells, then
the fastest, then the first in the order of the calibrations.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import combinations, product
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, GrowthError, close_matches
from ..formula import Composition, Value, text
from ..materials import Library
from .calibrations import Calibrations, Cell, Key, composition_key
from .films import Film

Floats = npt.NDArray[np.float64]

#: choices of cells as good as this in every fraction are equally good
_TIE = 1e-9
#: digits of a fraction in the formula that the fluxes imply
_DIGITS = 4


class Deposit(NamedTuple):
    """How a film is put down.

    Parameters
    ----------
    source : str
        The open cells, ``"Al1 + Ga1"``, or the alloy whose own rate was taken.
    rate : float
        Monolayers a second.
    implied : str or None
        The composition that the fluxes imply; None where an alloy's own rate was taken.
    difference : float or None
        Of the cation's fraction that is furthest off, implied less asked; None where nothing
        is mixed.
    element : str or None
        The cation that ``difference`` is about.
    """

    source: str
    rate: float
    implied: str | None = None
    difference: float | None = None
    element: str | None = None


class _Choices(NamedTuple):
    """Every choice of open cells for some cations, in the order in which ties are broken."""

    cells: tuple[tuple[Cell, ...], ...]
    fluxes: Floats  # (n_choices, n_cations) [nm^-2 s^-1]


@dataclass
class Reactor:
    """Calibrations with the lattices they are on, asked for one film after the other.

    Raises
    ------
    GrowthError
        If the lattice of a cell is not known.
    """

    calibrations: Calibrations
    library: Library
    fluxes: dict[str, float] = field(init=False)
    _choices: dict[tuple[str, ...], _Choices] = field(default_factory=dict, init=False)
    _deposits: dict[tuple[Key, float, float], Deposit] = field(default_factory=dict, init=False)

    def __post_init__(self) -> None:
        self.fluxes = {}
        for cell in self.calibrations.cells:
            try:
                lattice = self.library.lattice(cell.on)
            except BandwrightError as error:
                raise GrowthError(
                    f"on: no lattice is known for {cell.on!r}: {error.message}",
                    f"cell {cell.name!r}",
                ) from None
            self.fluxes[cell.name] = cell.flux(lattice)
        self._alloys = {alloy.key: alloy for alloy in self.calibrations.alloys}

    def deposit(self, film: Film) -> Deposit:
        """Return how a film of one composition is put down.

        Raises
        ------
        GrowthError
            If a cation has no cell.
        """
        assert film.composition is not None
        key = composition_key(film.composition)
        asked = (key, film.monolayer_nm, film.in_plane_nm)
        if asked not in self._deposits:
            self._deposits[asked] = self._deposit(film, film.composition, key)
        return self._deposits[asked]

    def _deposit(self, film: Film, composition: Composition, key: Key) -> Deposit:
        alloy = self._alloys.get(key)
        if alloy is not None:
            per_second, unit = alloy.rate
            rate = per_second / film.monolayer_nm if unit == "nm/s" else per_second
            return Deposit(alloy.formula, rate)
        cations = {e: float(f) for e, f in composition.cations if float(f) > 0.0}
        self._check_cells(cations, composition)
        choices = self._all_choices(tuple(cations))
        totals = choices.fluxes.sum(axis=1)
        fractions = choices.fluxes / totals[:, np.newaxis]
        errors = fractions - np.array(list(cations.values()))
        worst = np.abs(errors).max(axis=1)
        best = int(np.argmax(worst <= worst.min() + _TIE))
        rate = float(totals[best]) * film.in_plane_nm**2 / 2.0
        source = " + ".join(cell.name for cell in choices.cells[best])
        implied = _text(tuple(cations), fractions[best], composition)
        if len(cations) == 1:
            return Deposit(source, rate, implied)
        off = np.abs(errors[best])
        furthest = int(np.argmax(off >= off.max() - _TIE))  # of two that share it, the first
        return Deposit(source, rate, implied, float(errors[best, furthest]),
                       tuple(cations)[furthest])  # fmt: skip

    def _check_cells(self, cations: dict[str, float], composition: Composition) -> None:
        given = self.calibrations.elements
        for element in cations:
            if element in given:
                continue
            if not given:
                alloys = [alloy.formula for alloy in self.calibrations.alloys]
                near = close_matches(text(composition), alloys)
                raise GrowthError(f"no rate for {text(composition)} among the alloys{near}")
            raise GrowthError(
                f"no cell gives {element}; write one with element = '{element}', or the alloy's"
                f" own rate (cells give {', '.join(given)})"
            )

    def _all_choices(self, cations: tuple[str, ...]) -> _Choices:
        if cations not in self._choices:
            self._choices[cations] = self._found(cations)
        return self._choices[cations]

    def _found(self, cations: tuple[str, ...]) -> _Choices:
        cells = self.calibrations.cells
        every = []
        for chosen in product(*(_subsets([c for c in cells if c.element == e]) for e in cations)):
            amounts = [sum(self.fluxes[cell.name] for cell in some) for some in chosen]
            every.append((tuple(cell for some in chosen for cell in some), amounts))
        every.sort(key=lambda choice: (len(choice[0]), -sum(choice[1])))
        return _Choices(tuple(cells for cells, _ in every), np.array([f for _, f in every]))


def _subsets(cells: Sequence[Cell]) -> list[tuple[Cell, ...]]:
    """Return every choice of one cell or more, fewest first."""
    return [some for size in range(1, len(cells) + 1) for some in combinations(cells, size)]


def _text(cations: tuple[str, ...], fractions: Floats, composition: Composition) -> str:
    """Return the formula of the fractions that fluxes imply, rounded so that they add up to 1."""
    rounded = [round(float(f), _DIGITS) for f in fractions]
    rounded[-1] = round(1.0 - sum(rounded[:-1]), _DIGITS)
    site: tuple[tuple[str, Value], ...] = tuple(zip(cations, rounded, strict=True))
    return text(Composition((site, composition.anions)))
