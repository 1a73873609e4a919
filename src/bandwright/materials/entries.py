"""Entries of a material file: a binary compound, and how two of them mix to an alloy."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

from .. import formula
from ..errors import MaterialError, close_matches
from .numbers import (
    C11,
    C12,
    ENERGY,
    GAP,
    LATTICE,
    MASS,
    RATIO,
    Kind,
    Number,
    Reader,
)

#: quantities of a binary and what they measure; gaps are read as fits
QUANTITIES: Mapping[str, Kind] = {
    "lattice": LATTICE,
    "gap": GAP,
    "gap_x": GAP,
    "gap_l": GAP,
    "mass": MASS,
    "valence_offset": ENERGY,
    "a_c": ENERGY,
    "a_v": ENERGY,
    "c11": C11,
    "c12": C12,
    "share": RATIO,
    "step": ENERGY,
}
GAPS = ("gap", "gap_x", "gap_l")
ROUTES = {
    "valence offset": "valence_offset",
    "share": "share",
    "step": "step",
}
#: the two conventions of a_v -> its sign in the one used here
GAP_SHIFTS = {"(a_c + a_v) Tr": 1.0, "(a_c - a_v) Tr": -1.0}


@dataclass(frozen=True)
class Route:
    """How a conduction edge is placed: by "valence offset", "share" or "step" to a partner."""

    kind: str
    partner: str | None = None


@dataclass(frozen=True)
class Binary:
    """A compound of two elements."""

    name: str
    numbers: Mapping[str, Number]
    route: Route | None = None
    follows_gap: bool | None = None

    def over(self, older: Binary) -> Binary:
        """Return the older entry with what this one says put in its place."""
        return Binary(
            self.name,
            {**older.numbers, **self.numbers},
            self.route or older.route,
            older.follows_gap if self.follows_gap is None else self.follows_gap,
        )


@dataclass(frozen=True)
class Mixed:
    """How one quantity goes between two binaries, as a polynomial in x = share of ``first``.

    ``bowing``: value = mean - C(x) x (1 - x), C the polynomial. Otherwise the polynomial is the
    value itself, at the temperature ``at`` [K] where that matters.
    """

    first: str
    coefficients: tuple[float, ...]
    bowing: bool
    source: str
    origin: str
    at: float | None = None
    valid: tuple[float, float] = (0.0, 1.0)


@dataclass(frozen=True)
class Alloy:
    """Two binaries that share an element, and how their quantities mix.

    ``bowings`` serve every alloy that holds the pair; ``laws``, polynomials of the value itself,
    and ``route`` serve the ternary alone, where they go before the bowings.
    """

    pattern: str
    first: str
    second: str
    bowings: Mapping[str, Mixed]
    laws: Mapping[str, Mixed]
    route: Route | None = None
    follows_gap: bool | None = None
    direct: Mixed | None = None

    def over(self, older: Alloy) -> Alloy:
        """Return the older entry with what this one says put in its place."""
        return replace(
            self,
            bowings={**older.bowings, **self.bowings},
            laws={q: law for q, law in older.laws.items() if q not in self.bowings} | {**self.laws},
            route=self.route or older.route,
            follows_gap=older.follows_gap if self.follows_gap is None else self.follows_gap,
            direct=self.direct or older.direct,
        )


def _route(reader: Reader, key: str, table: Mapping[str, Any]) -> Route | None:
    """Return the route of the conduction edge, or None where a table names none."""
    kind = table.get("conduction_edge")
    partner = table.get("partner")
    if kind is None:
        for name in ("partner", "share", "step"):
            if name in table:
                raise reader.error(
                    key, f"has {name!r} but no 'conduction_edge'; it names the route, one of "
                    + ", ".join(map(repr, ROUTES))
                )  # fmt: skip
        return None
    if kind not in ROUTES:
        raise reader.error(f"{key}.conduction_edge", f"unknown route {kind!r}"
                           + close_matches(str(kind), ROUTES))  # fmt: skip
    if kind == "valence offset":
        if partner is not None:
            raise reader.error(key, "the route 'valence offset' has no partner")
        return Route(kind)
    if not isinstance(partner, str):
        raise reader.error(key, f'the route {kind!r} needs partner = "GaAs" or the like')
    if ROUTES[kind] not in table:
        raise reader.error(key, f"the route {kind!r} needs the number {ROUTES[kind]!r}")
    try:
        formula.parse(partner)
    except MaterialError as error:
        raise error.at(f"{reader.origin}, {key}.partner") from None
    return Route(kind, partner)


def _sign_of_a_v(reader: Reader, key: str, found: Any) -> tuple[float, Any]:
    """Return the sign that brings a_v to the convention used here, and the rest of its table."""
    if not isinstance(found, dict):
        return 1.0, found
    convention = found.get("gap_shift")
    if convention not in GAP_SHIFTS:
        raise reader.error(
            key,
            f"says gap_shift = {convention!r}; two signs are in use, so write the one meant: "
            + " or ".join(f'"{text}"' for text in GAP_SHIFTS)
            + " (GaAs has -1.16 eV in the first, +1.16 eV in the second)",
        )
    return GAP_SHIFTS[convention], {k: v for k, v in found.items() if k != "gap_shift"}


def _flag(reader: Reader, key: str, table: Mapping[str, Any]) -> bool | None:
    found = table.get("mass_follows_gap")
    if found is not None and not isinstance(found, bool):
        raise reader.error(f"{key}.mass_follows_gap", f"got {found!r}; write true or false")
    return found


def read_binary(reader: Reader, name: str, found: Any) -> Binary:
    """Return the entry ``[binary.NAME]``.

    Raises
    ------
    MaterialError
        If a key is unknown, or a number has no source, a wrong unit or an impossible value.
    """
    key = f"binary.{name}"
    try:
        written = formula.text(formula.parse(name))
    except MaterialError as error:
        raise error.at(f"{reader.origin}, {key}") from None
    if sum(len(site) for site in formula.parse(name).sublattices) != 2 or written != name:
        raise reader.error(key, f"{name!r} is no binary; alloys are [alloy.AlxGa1-xAs]")
    table = reader.table(
        key, found, (*QUANTITIES, "conduction_edge", "partner", "mass_follows_gap")
    )
    numbers: dict[str, Number] = {}
    for quantity, entry in table.items():
        if quantity not in QUANTITIES:
            continue
        place = f"{key}.{quantity}"
        if quantity in GAPS:
            numbers[quantity] = reader.fit(place, entry)
        elif quantity == "a_v":
            sign, entry = _sign_of_a_v(reader, place, entry)
            number = reader.number(place, entry, ENERGY)
            numbers[quantity] = replace(number, value=sign * number.value)
        else:
            numbers[quantity] = reader.number(place, entry, QUANTITIES[quantity])
    if "c11" in numbers and "c12" in numbers and numbers["c12"].value >= numbers["c11"].value:
        raise reader.error(f"{key}.c12", "c12 is not below c11; are the two swapped?")
    if "mass" in numbers and numbers["mass"].at is None:
        raise reader.error(f"{key}.mass", 'needs the temperature it holds at, like at = "0 K"')
    return Binary(name, numbers, _route(reader, key, table), _flag(reader, key, table))


def read_alloy(reader: Reader, pattern: str, found: Any) -> Alloy:
    """Return the entry ``[alloy.PATTERN]``, where x counts the binary left at x = 1.

    Raises
    ------
    MaterialError
        If the pattern does not mix two binaries, a key is unknown, or a number has no source, a
        wrong unit or an impossible value.
    """
    key = f"alloy.{pattern}"
    try:
        first, second = (formula.text(formula.parse(pattern, x=x)) for x in (1.0, 0.0))
        elements = {e for site in formula.parse(pattern, x=0.5).sublattices for e, _ in site}
    except MaterialError as error:
        message = "an alloy is named by a pattern of two binaries, like [alloy.AlxGa1-xAs]"
        raise reader.error(key, f"{error.message}; {message}") from None
    if len(elements) != 3:
        raise reader.error(key, f"{pattern!r} does not mix two binaries; like [alloy.AlxGa1-xAs]")
    known = (*QUANTITIES, "conduction_edge", "partner", "mass_follows_gap", "direct")
    table = reader.table(key, found, known)
    mixed = {
        quantity: _mixed(reader, f"{key}.{quantity}", first, quantity, entry)
        for quantity, entry in table.items()
        if quantity in QUANTITIES
    }
    direct = None
    if "direct" in table:
        place = f"{key}.direct"
        inner = reader.table(place, table["direct"], ("range", "source"))
        source = reader.source(place, inner)
        valid = reader.range(f"{place}.range", inner.get("range"), RATIO)
        direct = Mixed(first, (), False, source, reader.origin, valid=valid)
    return Alloy(
        pattern,
        first,
        second,
        {quantity: law for quantity, law in mixed.items() if law.bowing},
        {quantity: law for quantity, law in mixed.items() if not law.bowing},
        _route(reader, key, table),
        _flag(reader, key, table),
        direct,
    )


def _mixed(reader: Reader, key: str, first: str, quantity: str, entry: Any) -> Mixed:
    """Return how one quantity mixes."""
    sign = 1.0
    if quantity == "a_v":
        sign, entry = _sign_of_a_v(reader, key, entry)
    table = reader.table(key, entry, ("bowing", "polynomial", "value", "at", "valid", "source"))
    ways = [way for way in ("bowing", "polynomial", "value") if way in table]
    if len(ways) != 1:
        raise reader.error(
            key,
            "give one of bowing = C for mean - C x (1 - x), polynomial = [p0, p1, ...] "
            "for p0 + p1 x + ..., value = one number for every x",
        )
    bowing = ways == ["bowing"]
    if bowing and quantity in ("share", "step"):
        raise reader.error(key, f"a {quantity} has no bowing; write value or polynomial")
    kind = QUANTITIES[quantity]
    loose = Kind(kind.name, kind.units, kind.example, -1e3, 1e3)
    found = table[ways[0]]
    items = found if isinstance(found, list) else [found]
    if not items:
        raise reader.error(key, "the polynomial is empty")
    at = reader.optional_temperature(key, table)
    if not bowing and at is None and quantity in (*GAPS, "mass"):
        raise reader.error(key, 'needs the temperature it holds at, like at = "300 K"')
    if bowing and at is not None:
        raise reader.error(key, "a bowing holds at every temperature; leave 'at' out")
    return Mixed(
        first,
        tuple(sign * reader.value(key, item, loose) for item in items),
        bowing,
        reader.source(key, table),
        reader.origin,
        at,
        reader.range(f"{key}.valid", table["valid"], RATIO) if "valid" in table else (0.0, 1.0),
    )
