"""What the files say about a composition, as rows a person can read and check."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from .entries import QUANTITIES, Mixed, Route
from .mixing import Mix
from .numbers import Fit, Number

if TYPE_CHECKING:
    from .library import BandPoint


class Row(NamedTuple):
    """One material in the list of all.

    ``name`` is a binary or an alloy's pattern; the numbers of a binary hold at 300 K,
    unstrained, and are None for an alloy or where the file does not give them. ``direct`` is
    "yes", "no", or the range of x; ``origin`` the files it comes from; ``note`` what is missing.
    """

    name: str
    kind: str
    gap_eV: float | None
    mass: float | None
    lattice_nm: float | None
    direct: str
    origin: str
    note: str


class Fact(NamedTuple):
    """One number a composition rests on: what of, how much, who says so, in which file."""

    name: str
    quantity: str
    value: str
    source: str
    origin: str


class Shown(NamedTuple):
    """One composition at a temperature and on a substrate, with all it rests on."""

    formula: str
    temperature_K: float
    substrate: str | None
    point: BandPoint
    edge_route: str
    facts: tuple[Fact, ...]


def facts(mix: Mix) -> Iterator[Fact]:
    """Yield every number of the files that a composition rests on."""
    for binary, _ in mix.parts:
        for quantity in QUANTITIES:
            if quantity in binary.numbers:
                number = binary.numbers[quantity]
                yield Fact(
                    binary.name, quantity, _number(quantity, number), number.source, number.origin
                )
    for pair in mix.pairs:
        laws = pair.alloy.laws if mix.ternary is not None else {}
        for quantity, law in {**pair.alloy.bowings, **laws}.items():
            value = _law(quantity, law)
            yield Fact(pair.alloy.pattern, quantity, value, law.source, law.origin)
        if pair.alloy.direct is not None:
            law = pair.alloy.direct
            yield Fact(pair.alloy.pattern, "direct", _valid(law), law.source, law.origin)


def route_text(route: Route | None) -> str:
    """Return how the conduction edge is placed."""
    if route is None or route.partner is None:
        return "valence offset plus gap"
    if route.kind == "share":
        return f"share of the gap difference to {route.partner}"
    return f"step from the edge of {route.partner}"


def direct_text(x: np.ndarray[tuple[int, ...], np.dtype[np.float64]], direct: object) -> str:
    """Return where an alloy is direct, from flags along x.

    Examples
    --------
    >>> direct_text(np.array([0.0, 0.25, 0.5, 1.0]), np.array([True, True, False, False]))
    'x up to 0.38'
    """
    flags = np.asarray(direct, dtype=bool)
    if flags.all() or not flags.any():
        return "yes" if flags.all() else "no"
    turns = np.flatnonzero(flags[1:] != flags[:-1])
    places = [0.5 * float(x[i] + x[i + 1]) for i in turns]
    if len(places) == 1:
        return f"x {'up to' if flags[0] else 'from'} {places[0]:.2f}"
    bounds = ([0.0] if flags[0] else []) + places + ([1.0] if flags[-1] else [])
    spans = zip(bounds[::2], bounds[1::2], strict=True)
    return "x " + " and ".join(f"{low:.2f} to {high:.2f}" for low, high in spans)


def _unit(quantity: str) -> str:
    unit = next(iter(QUANTITIES[quantity].units), "")
    return f" {unit}" if unit else ""


def _number(quantity: str, number: Number) -> str:
    unit = _unit(quantity)
    value = f"{number.value:.8g}{unit}"
    if isinstance(number, Fit):
        a, b = number.first, number.second
        if number.form == "varshni":
            value += f" - {1e3 * a:.6g} meV/K T^2/(T + {b:g} K)"
        elif number.form == "linear":
            value += f" {'-' if a < 0 else '+'} {1e3 * abs(a):.6g} meV/K T"
        elif number.form == "coth":
            value += f" + {a:.6g} eV [1 - coth({b:g} K/T)]"
        if number.valid is not None:
            value += ", {:g} to {:g} K".format(*number.valid)
    elif number.at is not None:
        value += f" at {number.at:g} K"
    return value


def _valid(law: Mixed) -> str:
    low, high = law.valid
    return f"share of {law.first} from {low:g} to {high:g}"


def _law(quantity: str, law: Mixed) -> str:
    powers = ("", " x", " x^2")
    terms = [
        f"{c:.6g}" + (powers[i] if i < 3 else f" x^{i}") for i, c in enumerate(law.coefficients)
    ]
    value = f"({' + '.join(terms)})" if len(terms) > 1 else terms[0]
    text = f"{'bowing ' if law.bowing else ''}{value}{_unit(quantity)}".replace("+ -", "- ")
    if len(terms) > 1:
        text += f", x the share of {law.first}"
    if law.at is not None:
        text += f", at {law.at:g} K"
    return text + (f", for a {_valid(law)}" if law.valid != (0.0, 1.0) else "")
