"""Designs side by side as Markdown and as a page of HTML; as text they are in `text`."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from .data import Columns
from .facts import Fact, drive, grown, held_at
from .grid import DIGITS, cell, unit_of
from .html import html_facts, html_page, html_table

if TYPE_CHECKING:
    from ..stack import Stack


def shown_columns(columns: Columns) -> Columns:
    """Return the columns of a comparison that say something, reasons and names left out."""
    return {
        name: cells
        for name, cells in columns.items()
        if name not in ("name", "reason") and any(value is not None for value in cells)
    }


def facts_of(
    stacks: Sequence[Stack], columns: Columns, cautions: Sequence[Sequence[str]]
) -> list[Fact]:
    """Return what each design is, why one failed, and the cautions about each."""
    reasons = columns.get("reason", [])
    told: list[Fact] = []
    for number, stack in enumerate(stacks, 1):
        held = held_at(stack.temperature, stack.substrate)
        said = f"{stack.name or 'without a name'}: {drive(stack)}; {held}; {grown(stack)}"
        told.append((f"design {number}", said))
    told += [(f"design {n}", f"failed: {why}") for n, why in enumerate(reasons, 1) if why]
    for number, texts in enumerate(cautions, 1):
        told += [("caution", f"design {number}: {text}") for text in texts]
    return told


def markdown_table(
    columns: Mapping[str, Sequence[Any]], digits: Mapping[str, str] = DIGITS
) -> str:
    r"""Return columns as a table in Markdown, numbers flush right.

    Examples
    --------
    >>> print(markdown_table({"design": [1], "wavelength_um": [10.3271]}), end="")
    | design | wavelength (um) |
    | ---: | ---: |
    | 1 | 10.327 |
    """
    heads, rules = [], []
    for name, values in columns.items():
        words, unit = unit_of(name)
        heads.append(f"{words} ({unit})" if unit else words)
        rules.append("---" if any(isinstance(value, str) for value in values) else "---:")
    rows = [[cell(name, value, digits) for name, value in zip(columns, row, strict=True)]
            for row in zip(*columns.values(), strict=True)]  # fmt: skip
    return "".join(f"| {' | '.join(map(_escaped, row))} |\n" for row in (heads, rules, *rows))


def markdown_facts(labelled: Iterable[Fact]) -> str:
    r"""Return labelled sentences as a list in Markdown.

    Examples
    --------
    >>> print(markdown_facts([("model", "one-band")]), end="")
    - **model** one-band
    """
    return "".join(f"- **{label}** {_escaped(text)}\n" for label, text in labelled)


def compare_markdown(
    stacks: Sequence[Stack], columns: Columns, cautions: Sequence[Sequence[str]] = ()
) -> str:
    """Return a comparison in Markdown: the table, then what each design is."""
    listed = markdown_facts(facts_of(stacks, columns, cautions))
    return f"{markdown_table(shown_columns(columns))}\n{listed}"


def compare_html(
    stacks: Sequence[Stack], columns: Columns, cautions: Sequence[Sequence[str]] = ()
) -> str:
    """Return a comparison as a page of HTML that needs no other file."""
    body = html_table(shown_columns(columns)) + html_facts(facts_of(stacks, columns, cautions))
    return html_page("Designs side by side", body)


def _escaped(text: str) -> str:
    return text.replace("\\", "\\\\").replace("|", "\\|").replace("*", "\\*").replace("<", "&lt;")
