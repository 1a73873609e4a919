"""A design that was aimed at something: the text, the HTML, and one JSON object."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from .data import Columns, columns_of, rows_of, stack_object
from .facts import SAFETY, Fact, drive, grown, held_at
from .grid import grid
from .html import html_facts, html_table
from .text import layers, page, paragraph, sheet

if TYPE_CHECKING:
    from ..aiming import Aimed

_DIGITS = {"by": "+.4g"}


def aimed_facts(aimed: Aimed) -> list[Fact]:
    """Return what was found, in the order it is read."""
    stack = aimed.shown(aimed.stack)
    found: list[Fact] = [
        ("aimed", f"{stack.name or 'without a name'}: {drive(stack)};"
                  f" {held_at(stack.temperature, stack.substrate)}"),
        ("grown", grown(stack)),
    ]  # fmt: skip
    if aimed.rounded is not None:
        found.append(("rounded", grown(aimed.shown(aimed.rounded))))
    starts = f"{aimed.starts} start{'s' if aimed.starts > 1 else ''}"
    by = "by character" if aimed.follow else "by number"
    found.append(("found", f"by {aimed.solves} solves from {starts}, levels followed {by}"))
    return [*found, ("result", aimed.message)]


def aimed_tables(aimed: Aimed) -> list[Columns]:
    """Return the tables that hold something: targets, limits, values."""
    tables = [columns_of(aimed.targets), columns_of(aimed.limits), values_columns(aimed)]
    kept = []
    for table in tables:
        shown = {k: v for k, v in table.items() if any(c is not None for c in v)}
        if shown:
            kept.append(shown)
    return kept


def values_columns(aimed: Aimed) -> Columns:
    """Return the columns of the values, monolayers as whole numbers."""
    values = columns_of(aimed.values)
    values["monolayers"] = [None if v is None else int(v) for v in values["monolayers"]]
    return values


def aimed_notes(aimed: Aimed) -> list[Fact]:
    """Return the cautions of the design, and the safety line."""
    return [*(("caution", text) for text in aimed.levels.cautions), ("safety", SAFETY)]


def aimed_text(aimed: Aimed) -> str:
    """Return what was found as text."""
    tables = [grid(table, _DIGITS) for table in aimed_tables(aimed)]
    head = [
        line for label, text in aimed_facts(aimed)
        for line in (layers if label in ("grown", "rounded") else paragraph)(label, text)
    ]  # fmt: skip
    return page(head, *tables, sheet(aimed_notes(aimed)))


def aimed_html(aimed: Aimed) -> str:
    """Return what was found as HTML."""
    tables = "".join(html_table(table, _DIGITS) for table in aimed_tables(aimed))
    return html_facts(aimed_facts(aimed)) + tables + html_facts(aimed_notes(aimed))


def aimed_object(aimed: Aimed) -> dict[str, Any]:
    """Return what was found as one JSON object."""
    return {
        "reached": aimed.reached,
        "message": aimed.message,
        "solves": aimed.solves,
        "starts": aimed.starts,
        "targets": rows_of(columns_of(aimed.targets)),
        "limits": rows_of(columns_of(aimed.limits)),
        "values": rows_of(values_columns(aimed)),
        "stack": stack_object(aimed.stack),
        "rounded": None if aimed.rounded is None else stack_object(aimed.rounded),
        "cautions": list(aimed.levels.cautions),
        "safety": SAFETY,
    }
