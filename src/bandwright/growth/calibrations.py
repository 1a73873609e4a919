"""Calibrations: how fast each cell, or each alloy, grew when somebody measured it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

from .. import quantities as q
from ..errors import BandwrightError, GrowthError, UnknownName, close_matches
from ..formula import SITES, Composition, parse

#: most cells of one element; every choice of open ones is looked at
MOST_CELLS = 6
_CATIONS = tuple(element for cations, _ in SITES.values() for element in cations)
_ANIONS = tuple(element for _, anions in SITES.values() for element in anions)

#: cations, then anions, each an element with its fraction, in alphabetical order
Key = tuple[tuple[tuple[str, float], ...], ...]


@dataclass(frozen=True, init=False)
class Cell:
    """One cell: what it gives, and how fast it grew on a known lattice.

    Parameters
    ----------
    name : str
        ``"Ga1"``: your own.
    element : str
        The cation it gives, such as ``"Ga"``.
    rate : growth rate
        ``"0.7 ML/s"``: monolayers with as many atoms as the lattice ``on`` has; or ``"0.2 nm/s"``:
        thickness of a crystal of that lattice, unstrained.
    on : str
        Formula of the crystal whose lattice was grown on, such as ``"GaAs"``.
    note, date : str, optional
        Where the number comes from.

    Raises
    ------
    GrowthError, QuantityError
        If it is no cell that can set a growth time; the text begins with its name.

    Examples
    --------
    An invented cell:

    >>> Cell("Ga1", "Ga", "0.7 ML/s", "GaAs").rate
    Rate(value=0.7, unit='ML/s')
    """

    name: str
    element: str
    rate: q.Rate
    on: str
    note: str | None
    date: str | None

    def __init__(
        self, name: str, element: str, rate: object, on: str, note: str | None = None,
        date: str | None = None,
    ) -> None:  # fmt: skip
        where = f"cell {q.show(name)}"
        fill = {"name": line(name, "name", "cell"), "element": _element(element, where)}
        fill |= _measured(rate, note, date, where) | {"on": line(on, "on", where)}
        for key, value in fill.items():
            object.__setattr__(self, key, value)

    def flux(self, lattice_nm: float) -> float:
        """Return the atoms that arrive [nm^-2 s^-1], for the lattice constant of ``on`` [nm].

        A monolayer of a (001) crystal has 2/a^2 atoms of one sublattice and is a/2 thick.

        Examples
        --------
        >>> print(f"{Cell('Ga1', 'Ga', '0.7 ML/s', 'GaAs').flux(0.565325):.6f}")
        4.380580
        """
        per_second = self.rate.value
        if self.rate.unit == "nm/s":
            per_second /= 0.5 * lattice_nm
        return per_second * 2.0 / lattice_nm**2


@dataclass(frozen=True, init=False)
class AlloyRate:
    """How fast one alloy grew as a whole, as a vapour-phase reactor is calibrated.

    Parameters
    ----------
    formula : str
        A formula without letters, such as ``"Al0.3Ga0.7As"``.
    rate : growth rate
        Of the film as it is grown, ``"0.5 nm/s"`` or ``"1.8 um/h"``; or its monolayers.
    note, date : str, optional
        Where the number comes from.

    Raises
    ------
    GrowthError, QuantityError, MaterialError
        If it is no alloy or no rate; the text begins with the formula.

    Examples
    --------
    An invented rate:

    >>> AlloyRate("Al0.3Ga0.7As", "1.8 um/h").rate
    Rate(value=0.5, unit='nm/s')
    """

    formula: str
    rate: q.Rate
    note: str | None
    date: str | None

    def __init__(
        self, formula: str, rate: object, note: str | None = None, date: str | None = None
    ) -> None:
        where = f"alloy {q.show(formula)}"
        try:
            parse(formula)
        except BandwrightError as error:
            raise error.at(where) from None
        fill = {"formula": formula, **_measured(rate, note, date, where)}
        for key, value in fill.items():
            object.__setattr__(self, key, value)

    @property
    def key(self) -> Key:
        """What identifies the composition."""
        return composition_key(parse(self.formula))


@dataclass(frozen=True, init=False)
class Calibrations:
    """What a reactor was measured to do: its cells, and alloys measured as a whole.

    Parameters
    ----------
    cells : iterable of Cell
        Several may give the same element.
    alloys : iterable of AlloyRate
        Where an alloy's own rate is known, it is taken, not its cells.
    name, note, date : str, optional

    Raises
    ------
    GrowthError
        If there is neither a cell nor an alloy, or one of them twice.

    Examples
    --------
    An invented reactor:

    >>> reactor = Calibrations([Cell("Ga1", "Ga", "0.7 ML/s", "GaAs"),
    ...                         Cell("Al1", "Al", "0.3 ML/s", "GaAs")])
    >>> reactor.elements
    ('Ga', 'Al')
    """

    cells: tuple[Cell, ...]
    alloys: tuple[AlloyRate, ...]
    name: str | None
    note: str | None
    date: str | None

    def __init__(
        self, cells: Iterable[Cell] = (), alloys: Iterable[AlloyRate] = (),
        name: str | None = None, note: str | None = None, date: str | None = None,
    ) -> None:  # fmt: skip
        texts = {"name": name, "note": note, "date": date}
        fill: dict[str, Any] = {"cells": tuple(cells), "alloys": tuple(alloys)}
        for key, value in texts.items():
            fill[key] = None if value is None else line(value, key, "calibrations")
        for key, value in fill.items():
            object.__setattr__(self, key, value)
        _check(self)

    @property
    def elements(self) -> tuple[str, ...]:
        """What the cells give, each element once, in the order of the cells."""
        return tuple(dict.fromkeys(cell.element for cell in self.cells))

    def scaled(self, factors: Mapping[str, float]) -> Calibrations:
        """Return the calibrations with some rates multiplied.

        Parameters
        ----------
        factors : mapping of str to float
            By the name of a cell, by an element (all its cells), or by an alloy's formula.

        Raises
        ------
        UnknownName
            If nothing here has the name.
        QuantityError
            If a rate would not be above zero.

        Examples
        --------
        >>> invented = Calibrations([Cell("Ga1", "Ga", "0.7 ML/s", "GaAs")])
        >>> print(f"{invented.scaled({'Ga': 1.02}).cells[0].rate.value:.3f}")
        0.714
        """
        known = [*(c.name for c in self.cells), *self.elements, *(a.formula for a in self.alloys)]
        for name in factors:
            if name not in known:
                raise UnknownName(f"no cell, element or alloy {name!r}{close_matches(name, known)}")

        def times(rate: q.Rate, *names: str) -> q.Rate:
            value = rate.value
            for name in dict.fromkeys(names):  # a cell called like its element is meant once
                value *= factors.get(name, 1.0)
            return q.Rate(value, rate.unit)

        cells = [
            Cell(c.name, c.element, times(c.rate, c.name, c.element), c.on, c.note, c.date)
            for c in self.cells
        ]
        alloys = [AlloyRate(a.formula, times(a.rate, a.formula), a.note, a.date)
                  for a in self.alloys]  # fmt: skip
        return Calibrations(cells, alloys, self.name, self.note, self.date)


def composition_key(composition: Composition) -> Key:
    """Return what two formulas of the same composition have in common.

    Examples
    --------
    >>> composition_key(parse("Al0.3Ga0.7As")) == composition_key(parse("AlxGa1-xAs", x=0.3))
    True
    """
    return tuple(
        tuple(sorted((e, round(float(f), 9)) for e, f in site if float(f) > 0.0))
        for site in composition.sublattices
    )


def line(value: object, name: str, where: str) -> str:
    """Return a given text of one line.

    Raises
    ------
    GrowthError
        If it is none.
    """
    if not isinstance(value, str) or not value.strip() or not value.isprintable():
        raise GrowthError(f"{name}: got {q.show(value)}; write one line of text", where)
    return value.strip()


def _element(value: object, where: str) -> str:
    if isinstance(value, str) and value in _ANIONS:
        raise GrowthError(
            f"element: {value} is offered in excess and sets no growth time; leave this cell out",
            where,
        )
    if not isinstance(value, str) or value not in _CATIONS:
        hint = close_matches(str(value), _CATIONS)
        raise GrowthError(f"element: {q.show(value)} is no cation of a crystal{hint}", where)
    return value


def _measured(rate: object, note: object, date: object, where: str) -> dict[str, Any]:
    try:
        found: dict[str, Any] = {"rate": q.as_rate(rate, "rate")}
    except BandwrightError as error:
        raise error.at(where) from None
    for key, value in (("note", note), ("date", date)):
        found[key] = None if value is None else line(value, key, where)
    return found


def _check(given: Calibrations) -> None:
    where = "calibrations"
    if not given.cells and not given.alloys:
        raise GrowthError("neither a cell nor an alloy; write [cells.NAME] tables", where)
    names = [cell.name for cell in given.cells]
    for name in names:
        if names.count(name) > 1:
            raise GrowthError(f"two cells are called {name!r}; give each a name of its own", where)
    for element in given.elements:
        cells = [cell.name for cell in given.cells if cell.element == element]
        if len(cells) > MOST_CELLS:
            raise GrowthError(
                f"{len(cells)} cells of {element} ({', '.join(cells)}); at most {MOST_CELLS} are"
                " chosen from: leave out those that are empty",
                where,
            )
    found: dict[Key, str] = {}
    for alloy in given.alloys:
        other = found.setdefault(alloy.key, alloy.formula)
        if other is not alloy.formula:
            raise GrowthError(
                f"{other} and {alloy.formula} are the same alloy; leave one out", where
            )
