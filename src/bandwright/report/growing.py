"""A growth sheet as text, markdown, HTML and CSV."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from ..growth.files import calibrations_text
from ..growth.sheet import stack_formula
from ..quantities import rate_text
from ..stack import DOPING
from .compared import markdown_facts, markdown_table
from .data import Columns, csv_text, rows_of, stack_object
from .facts import Fact
from .grid import DIGITS, grid
from .html import html_facts, html_table
from .text import page, sheet

if TYPE_CHECKING:
    from ..growth import Calibrations, GrowthSheet
    from ..growth.steps import Step

_DIGITS = {**DIGITS, "rounding_nm": "+.3f", "total_nm": ".2f", "difference": "+.4f",
           "time_s": ".1f"}  # fmt: skip
#: one group deeper, where plain spaces would be lost
_INDENT = "\u00a0\u00a0"


def duration(seconds: float) -> str:
    """Return a time as people say it, to a tenth of a second.

    Examples
    --------
    >>> duration(3723.04), duration(59.96), duration(12.3)
    ('1 h 2 min 3.0 s', '1 min 0.0 s', '12.3 s')
    """
    tenths = round(10.0 * seconds)
    hours, rest = divmod(tenths, 36000)
    minutes, rest = divmod(rest, 600)
    parts = [f"{hours} h"] if hours else []
    parts += [f"{minutes} min"] if hours or minutes else []
    return " ".join([*parts, f"{rest / 10:.1f} s"])


def sheet_facts(found: GrowthSheet) -> list[Fact]:
    """Return what is grown, how it is listed and by which calibrations."""
    stack = found.stack
    side = "substrate" if found.order == "first grown first" else "surface"
    grown = "whole monolayers" if found.whole else "the thicknesses as designed"
    said: list[Fact] = [
        ("growth", stack.name or "without a name"),
        ("on", stack.substrate or "no substrate named"),
        ("listed", f"{found.order}; total counts from the {side}"),
        ("grown", f"{grown}, {found.total_nm:.2f} nm in all"),
    ]
    if found.calibrations is not None:
        opened = {step.cells for step in found.steps if step.cells}
        said += _calibration_facts(found.calibrations, opened)
    if found.total_s is not None:
        said.append(("takes", _time_said(found, found.total_s)))
    if found.shift is not None:
        shift = found.shift
        said.append(("line", (
            f"{shift.pair[0]} to {shift.pair[1]}: {shift.before_um:.3f} um as designed,"
            f" {shift.after_um:.3f} um in whole monolayers, both solved; the exact gradient gives"
            f" {shift.first_order_um:.3f} um to first order"
        )))  # fmt: skip
    return said


def _time_said(found: GrowthSheet, total_s: float) -> str:
    """Return how long growth takes, and what is not part of it."""
    if found.calibrations is None:
        return f"{duration(total_s)} of interruptions; no calibrations, so no time for layers"
    pauses = found.interrupted_s
    text = duration(total_s) + (f", {duration(pauses)} of it interruptions" if pauses else "")
    timeless = any(step.step == "layer" and step.time_s is None for step in found.steps)
    return text + (", layers without a time left out" if timeless else "")


def _calibration_facts(given: Calibrations, opened: set[str]) -> list[Fact]:
    """Return where the rates come from that are used."""
    facts: list[Fact] = []
    head = ", ".join(text for text in (given.name, given.date, given.note) if text)
    if head:
        facts.append(("calibrated", head))
    for one in (cell for cell in given.cells if any(cell.name in used for used in opened)):
        facts.append(("cell", f"{one.name}: {one.element} {rate_text(one.rate)} on {one.on}"
                      + _origin(one.date, one.note)))  # fmt: skip
    for alloy in (alloy for alloy in given.alloys if alloy.formula in opened):
        facts.append(("alloy", f"{alloy.formula}: {rate_text(alloy.rate)}"
                      + _origin(alloy.date, alloy.note)))  # fmt: skip
    return facts


def _origin(*texts: str | None) -> str:
    said = ", ".join(text for text in texts if text)
    return f" ({said})" if said else ""


def sheet_columns(found: GrowthSheet, indent: str = _INDENT) -> Columns:
    """Return the columns that are read beside the reactor."""
    every: Columns = {
        "layer": [_layer(step, indent) for step in found.steps],
        "formula": [stack_formula(step) or _own(step) for step in found.steps],
    }
    for name in ("thickness_nm", "whole_ML", "rounding_nm"):
        every[name] = [getattr(step, name) for step in found.steps]
    for name in DOPING:
        every[name] = [step.entries.get(name) for step in found.steps]
    for name in ("total_nm", "cells", "implied", "difference", "time_s"):
        every[name] = [getattr(step, name) for step in found.steps]
    return {n: values for n, values in every.items() if any(v is not None for v in values)}


def _layer(step: Step, indent: str) -> str:
    """Return what a line is about: a layer's number and label, or what is done."""
    before = indent * step.depth
    if step.times is not None:
        return before + (f"{step.times} x" if step.step == "repeat" else f"end of {step.times} x")
    if step.number is None:
        return before + ("pause" if step.step == "interruption" else step.step)
    return before + f"{step.number} {step.entries.get('label', '')}".rstrip()


def _own(step: Step) -> str | None:
    return "own numbers" if step.number is not None else None


def sheet_notes(found: GrowthSheet) -> list[Fact]:
    """Return the cautions, and the safety line."""
    return [*(("caution", text) for text in found.cautions), ("safety", found.safety)]


def sheet_text(found: GrowthSheet) -> str:
    """Return a growth sheet as text; a cell with nothing to say is empty."""
    shown = {
        name: ["" if value is None else value for value in values]
        for name, values in sheet_columns(found, "  ").items()
    }
    return page(sheet(sheet_facts(found)), grid(shown, _DIGITS), sheet(sheet_notes(found)))


def sheet_csv(found: GrowthSheet) -> str:
    """Return a growth sheet as CSV, every digit of each number."""
    return csv_text(found.columns)


def sheet_html(found: GrowthSheet) -> str:
    """Return a growth sheet as HTML."""
    table = html_table(sheet_columns(found), _DIGITS)
    return html_facts(sheet_facts(found)) + table + html_facts(sheet_notes(found))


def sheet_markdown(found: GrowthSheet) -> str:
    """Return a growth sheet as Markdown: a list, a table, a list."""
    table = markdown_table(sheet_columns(found), _DIGITS)
    facts, notes = sheet_facts(found), sheet_notes(found)
    return f"{markdown_facts(facts)}\n{table}\n{markdown_facts(notes)}"


def sheet_object(found: GrowthSheet) -> dict[str, Any]:
    """Return a growth sheet as one JSON object."""
    given, shift = found.calibrations, found.shift
    return {
        "stack": stack_object(found.stack),
        "calibrations": None if given is None else calibrations_text(given),
        "order": found.order,
        "whole": found.whole,
        "total_nm": found.total_nm,
        "total_s": found.total_s,
        "line": None if shift is None else shift._asdict(),
        "steps": rows_of(found.columns),
        "cautions": list(found.cautions),
        "safety": found.safety,
    }
