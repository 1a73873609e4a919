"""A digital alloy as text, HTML, Markdown, and one JSON object."""

from __future__ import annotations

from itertools import groupby
from typing import TYPE_CHECKING, Any

from ..growth.sheet import SAFETY
from .compared import markdown_facts, markdown_table
from .data import Columns, rows_of, stack_object
from .facts import Fact
from .grid import DIGITS, grid
from .html import html_facts, html_table
from .text import page, sheet

if TYPE_CHECKING:
    from ..digital import Digital

_DIGITS = {
    **DIGITS, "asked_nm": ".3f", "grown_nm": ".3f", "asked_ML": ".2f", "difference_ML": "+.2f",
    "digital_meV": ".2f", "digital_um": ".3f", "overlap": ".3f", "grown_ML": ".4g",
}  # fmt: skip
#: how many lines are read, the strongest
_LINES = 8


def digital_facts(found: Digital) -> list[Fact]:
    """Return what was turned into pulses of what, and the pulses."""
    facts: list[Fact] = [
        ("stack", found.stack.name or "without a name"),
        ("cells", f"of {found.period} ML; at the end of each, either end has had what the layer"
                  " has, to half a monolayer"),
    ]  # fmt: skip
    columns = found.pulse_columns
    rows = list(zip(columns["layer"], columns["material"], columns["monolayers"], strict=True))
    start = 0
    for one in found.layers:
        stop = start + len(one.pulses)
        said = ", ".join(f"{count} {material}" for _, material, count in rows[start:stop])
        facts.append(("pulses", f"{one.name}, in ML, first grown first: {said}"))
        start = stop
    solved = [len(levels.profile.written) for levels in (found.shifts.designed, found.shifts.grown)]
    facts.append(("solved", f"the design of {solved[0]} grown layers and the digital stack of"
                  f" {solved[1]}; levels followed by the overlap of their states"))  # fmt: skip
    return facts


def digital_tables(found: Digital) -> list[Columns]:
    """Return thickness, content, levels and the strongest lines, as they are read."""
    thickness = dict(found.thickness_columns)
    if all(copies == 1 for copies in thickness["copies"]):
        del thickness["copies"]
    tables = [thickness, found.content_columns]
    shifts = found.shifts
    if shifts.level_columns["level"]:
        tables.append(shifts.level_columns)
    if shifts.line_columns["upper"]:
        tables.append(_strongest(shifts.line_columns))
    return tables


def _strongest(lines: Columns) -> Columns:
    # forbidden lines are zero but for rounding, which may not decide what is shown
    strengths = [-round(abs(strength or 0.0), 6) for strength in lines["oscillator_strength"]]
    kept = sorted(sorted(range(len(strengths)), key=strengths.__getitem__)[:_LINES])
    return {name: [values[n] for n in kept] for name, values in lines.items()}


def digital_notes(found: Digital) -> list[Fact]:
    """Return how many lines are left out, the cautions, and the safety line."""
    more = len(found.shifts.line_columns["upper"]) - _LINES
    notes = [("note", f"the {_LINES} strongest lines; {more} weaker ones are left out")]
    cautions = [("caution", text) for text in found.cautions]
    return [*(notes if more > 0 else []), *cautions, ("safety", SAFETY)]


def digital_text(found: Digital) -> str:
    """Return a digital alloy as text."""
    tables = [grid(table, _DIGITS) for table in digital_tables(found)]
    return page(sheet(digital_facts(found)), *tables, sheet(digital_notes(found)))


def digital_html(found: Digital) -> str:
    """Return a digital alloy as HTML."""
    tables = "".join(html_table(table, _DIGITS) for table in digital_tables(found))
    return html_facts(digital_facts(found)) + tables + html_facts(digital_notes(found))


def digital_markdown(found: Digital) -> str:
    """Return a digital alloy as Markdown."""
    tables = "\n".join(markdown_table(table, _DIGITS) for table in digital_tables(found))
    facts, notes = digital_facts(found), digital_notes(found)
    return f"{markdown_facts(facts)}\n{tables}\n{markdown_facts(notes)}"


def digital_object(found: Digital) -> dict[str, Any]:
    """Return a digital alloy as one JSON object."""
    return {
        "design": stack_object(found.shifts.designed.stack),
        "stack": stack_object(found.stack),
        "period": found.period,
        "layers": [
            {"layer": one.name, "between": list(one.ends), "pulses": list(group)}
            for one, group in zip(found.layers, _pulses(found), strict=True)
        ],
        "thickness": rows_of(found.thickness_columns),
        "content": rows_of(found.content_columns),
        "levels": rows_of(found.shifts.level_columns),
        "lines": rows_of(found.shifts.line_columns),
        "cautions": list(found.cautions),
        "safety": SAFETY,
    }


def _pulses(found: Digital) -> list[list[dict[str, Any]]]:
    """Return the rows of each layer's pulses."""
    rows = rows_of(found.pulse_columns)
    owner = [place for place, one in enumerate(found.layers) for _ in one.pulses]
    paired = groupby(zip(owner, rows, strict=True), lambda pair: pair[0])
    return [[row for _, row in group] for _, group in paired]
