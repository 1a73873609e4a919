"""A fit: the text, Markdown, HTML, and one JSON object."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Any

import numpy as np

from ..errors import BandwrightError
from .compared import markdown_facts, markdown_table
from .data import Columns, plain, rows_of, stack_object
from .facts import SAFETY, Fact, drive, held_at
from .grid import grid
from .growing import sheet_html, sheet_markdown, sheet_object, sheet_text
from .html import html_facts, html_table
from .text import page, sheet

if TYPE_CHECKING:
    from ..fitting import Fit
    from ..growth import GrowthSheet
    from ..stack import Layer

FACTOR_DIGITS = {"off_percent": "+.3f", "sigma": ".2g"}
DATA_DIGITS = {"pull": "+.2f"}
TO_SET = (
    "for a reactor that does again what it did: change the cells by the factors to set, and the "
    "sheet of the design holds; or leave the cells, and grow by a sheet with the rates that this "
    "wafer tells"
)
HEAD = "what to set in place of the design:"
#: what the heading of the growth sheet says
NEXT = "growth sheet of the next run, by the rates that this wafer tells, cells left as they are"


def fit_facts(found: Fit) -> list[Fact]:
    """Return what was fitted to what, and how well."""
    stack, data = found.stack, found.measured
    said: list[Fact] = [
        ("fit", f"{stack.name or 'without a name'}: {drive(stack)};"
                f" {held_at(stack.temperature, stack.substrate)}"),
    ]  # fmt: skip
    origin = ", ".join(text for text in (data.name, data.note) if text)
    if origin:
        said.append(("measured", origin))
    factors, count = len(found.names), len(data)
    said.append(("found", f"{factors} factor{'s' if factors > 1 else ''} to {count}"
                 f" {'data' if count > 1 else 'datum'}, by {found.solves} solves"))  # fmt: skip
    return [*said, ("goodness", found.goodness)]


def factor_columns(found: Fit) -> Columns:
    """Return the columns of the factors, the unit where one has any."""
    columns = {name: [plain(v) for v in cells] for name, cells in found.columns.items()}
    return _without_empty_unit(columns)


def data_columns(found: Fit) -> Columns:
    """Return the columns of the data."""
    return dict(found.data_columns)


def layer_columns(found: Fit) -> Columns:
    """Return what each layer was designed to be and what to set, thickness in its own unit.

    Empty where what to set can't be grown; a caution says so.
    """
    try:
        corrected = found.corrected
    except BandwrightError:
        return {}
    rows = []
    for before, after in zip(found.stack.written(), corrected.written(), strict=True):
        old, new = before.layer, after.layer
        rows.append((
            old.label or f"layer {before.number}", _material(old),
            f"{old.thickness.value:.6g} {old.thickness.unit}", _material(new),
            f"{new.thickness.value:.6g} {new.thickness.unit}",
        ))  # fmt: skip
    names = ("layer", "designed", "designed_thickness", "to_set", "thickness_to_set")
    return {name: list(cells) for name, cells in zip(names, zip(*rows, strict=True), strict=True)}


def fit_notes(found: Fit) -> list[Fact]:
    """Return how to read what to set, the cautions, and the safety line."""
    return [("note", TO_SET), *(("caution", text) for text in found.cautions), ("safety", SAFETY)]


def fit_text(found: Fit, growth: GrowthSheet | None = None) -> str:
    """Return a fit as text, the growth sheet of the next run behind it."""
    layers = layer_columns(found)
    text = page(
        sheet(fit_facts(found)), grid(factor_columns(found), FACTOR_DIGITS),
        grid(data_columns(found), DATA_DIGITS),
        [HEAD, *grid(layers)] if layers else [],
        sheet(fit_notes(found)),
    )  # fmt: skip
    return text if growth is None else f"{text}\n{NEXT}:\n\n{sheet_text(growth)}"


def fit_html(found: Fit, growth: GrowthSheet | None = None) -> str:
    """Return a fit as HTML."""
    tables = html_table(factor_columns(found), FACTOR_DIGITS)
    tables += html_table(data_columns(found), DATA_DIGITS)
    layers = layer_columns(found)
    tables += f"<div>{HEAD}</div>{html_table(layers)}" if layers else ""
    text = html_facts(fit_facts(found)) + tables + html_facts(fit_notes(found))
    return text if growth is None else f"{text}<h2>{NEXT}</h2>{sheet_html(growth)}"


def fit_markdown(found: Fit, growth: GrowthSheet | None = None) -> str:
    """Return a fit as Markdown."""
    layers = layer_columns(found)
    text = "\n".join((
        markdown_facts(fit_facts(found)), markdown_table(factor_columns(found), FACTOR_DIGITS),
        markdown_table(data_columns(found), DATA_DIGITS),
        *([f"{HEAD[0].upper()}{HEAD[1:]}\n", markdown_table(layers)] if layers else []),
        markdown_facts(fit_notes(found)),
    ))  # fmt: skip
    heading = NEXT[0].upper() + NEXT[1:]
    return text if growth is None else f"{text}\n{heading}:\n\n{sheet_markdown(growth)}"


def fit_object(found: Fit, growth: GrowthSheet | None = None) -> dict[str, Any]:
    """Return a fit as one JSON object; the sheet is null where none was asked."""
    covariance = [[plain(float(v)) for v in row] for row in found.covariance]
    return {
        "stack": stack_object(found.stack),
        "solves": found.solves,
        "chi_square": found.chi_square,
        "degrees_of_freedom": found.freedom,
        "probability": found.probability,
        "factors": rows_of({n: [plain(v) for v in c] for n, c in found.columns.items()}),
        "covariance": covariance,
        "told_apart": not found.apart,
        "data": rows_of(found.data_columns),
        "grown": _object(found, "grown"),
        "corrected": _object(found, "corrected"),
        "sheet": None if growth is None else sheet_object(growth),
        "cautions": list(found.cautions),
        "safety": SAFETY,
    }


def _object(found: Fit, name: str) -> dict[str, Any] | None:
    """Return a stack; None where it can't be grown, or a grade became a curve no file can hold."""
    try:
        return stack_object(getattr(found, name))
    except BandwrightError:
        return None


def _material(layer: Layer) -> str:
    """Return what a layer is made of, fractions with as many digits as growth can use."""
    if layer.material is None:
        return "own numbers"
    parts = re.split(r"(\d*\.\d+)", layer.material)
    text = "".join(f"{float(p):.5g}" if i % 2 else p for i, p in enumerate(parts))
    thickness = layer.thickness.value
    letters = []
    for letter, shape in layer.fractions:
        ends = [f"{v:.5g}" for v in shape.at(np.array([0.0, thickness]), thickness, "first")]
        letters.append(f"{letter} {' to '.join(dict.fromkeys(ends))}")
    return f"{text} {{{', '.join(letters)}}}" if letters else text


def _without_empty_unit(columns: Columns) -> Columns:
    return {n: cells for n, cells in columns.items() if any(c is not None for c in cells)}
