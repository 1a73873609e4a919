"""Results as HTML, for the ``_repr_html_`` of notebooks: the same facts, digits and cautions."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from html import escape
from typing import TYPE_CHECKING, Any

from .data import columns_of
from .facts import Fact, facts
from .grid import DIGITS, cell, digits_for, unit_of
from .text import budget_parts, level_columns, level_notes, line_notes

if TYPE_CHECKING:
    from ..levels import Levels
    from ..lines import Lines


def html_table(columns: Mapping[str, Sequence[Any]], digits: Mapping[str, str] = DIGITS) -> str:
    """Return columns as a table, the unit below each heading, numbers flush right.

    Examples
    --------
    >>> html_table({"energy_meV": [61.2346]})  # doctest: +ELLIPSIS
    '<table><thead><tr><th>energy<br><small>meV</small></th></tr></thead>...>61.23</td></tr>...'
    """
    heads = []
    for name in columns:
        words, unit = unit_of(name)
        small = f"<br><small>{escape(unit)}</small>" if unit else ""
        heads.append(f"<th>{escape(words)}{small}</th>")
    body = []
    for row in zip(*columns.values(), strict=True):
        tds = []
        for name, value in zip(columns, row, strict=True):
            side = "left" if isinstance(value, str) else "right"
            text = escape(cell(name, value, digits))
            tds.append(f'<td style="text-align:{side}">{text}</td>')
        body.append(f"<tr>{''.join(tds)}</tr>")
    return (
        f"<table><thead><tr>{''.join(heads)}</tr></thead>"
        f"<tbody>{''.join(body)}</tbody></table>"
    )


def html_facts(labelled: Iterable[Fact]) -> str:
    """Return labelled sentences, one a line.

    Examples
    --------
    >>> html_facts([("model", "one-band")])
    '<div><b>model</b> one-band</div>'
    """
    return "".join(
        f"<div><b>{escape(label)}</b> {escape(text)}</div>" for label, text in labelled
    )


def html_page(title: str, body: str) -> str:
    """Return a page of HTML that needs no other file.

    Examples
    --------
    >>> html_page("Wells", "<p>two</p>").splitlines()[1]
    '<html lang="en"><head><meta charset="utf-8"><title>Wells</title></head><body>'
    """
    return (
        f'<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8"><title>{escape(title)}'
        f"</title></head><body>\n{body}\n</body></html>\n"
    )


def levels_html(levels: Levels) -> str:
    """Return levels as HTML: what was solved, the table, the cautions."""
    columns, digits = level_columns(levels)
    return html_facts(facts(levels)) + html_table(columns, digits) + html_facts(level_notes(levels))


def lines_html(lines: Lines) -> str:
    """Return lines as HTML: what was solved, the table, the error budget, what to beware of."""
    table = html_table(columns_of(lines.table), digits_for(lines.levels.tolerance))
    head, columns, notes = budget_parts(lines)
    budget = f"<div>{escape(head)}</div>{html_table(columns)}{html_facts(notes)}" if head else ""
    return html_facts(facts(lines.levels)) + table + budget + html_facts(line_notes(lines))
