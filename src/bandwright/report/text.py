"""Results as text: what was solved, the table, what it rests on, what to beware of."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from textwrap import wrap
from typing import TYPE_CHECKING

import numpy as np

from ..cautions.words import numbered
from .data import Columns, columns_of
from .facts import SAFETY, Fact, drive, facts, grown, held_at
from .grid import cell, digits_for, grid
from .known import COMMON_SCALE, Known

if TYPE_CHECKING:
    from ..levels import Levels
    from ..lines import Lines
    from ..stack import Stack

WIDTH = 96  # of prose; a table is as wide as it must be
LABEL = 11

ONE_MATRIX = (
    "exact here: on this stack phase integral and shooting are one and the same matrix, so that "
    "their agreement is no evidence; the count is."
)
BY_SLICES = (
    "every curved stretch is shorter than half a wave, and both methods follow it by slices: their "
    "agreement is little evidence; the count is."
)
NO_APPROXIMATION = (
    "exact here: on this stack the phase integral is the very matrix that shooting solves, and "
    "approximates nothing."
)
FREE_MASS = "oscillator strengths are with the free-electron mass, wavelengths in vacuum"


def paragraph(label: str, text: str) -> list[str]:
    """Return text wrapped behind a label, in the two columns that all heads have.

    Examples
    --------
    >>> paragraph("model", "one-band")
    ['model      one-band']
    """
    lines = wrap(text, WIDTH - LABEL, break_long_words=False, break_on_hyphens=False) or [""]
    return [f"{'' if i else label:<{LABEL}}{line}" for i, line in enumerate(lines)]


def layers(label: str, line: str) -> list[str]:
    """Return a line of layers wrapped behind a label, only between layers.

    Examples
    --------
    >>> layers("grown", "9 nm AlAs, 8 nm {edge 0.2 eV, mass 0.1}")
    ['grown      9 nm AlAs, 8 nm {edge 0.2 eV, mass 0.1}']
    """
    kept = re.sub(r"(?<!,) |, (?=[^{]*})", lambda found: found[0].replace(" ", "\0"), line)
    return [text.replace("\0", " ") for text in paragraph(label, kept)]


def sheet(labelled: Iterable[Fact]) -> list[str]:
    """Return one paragraph a fact."""
    return [
        line
        for label, text in labelled
        for line in (layers if label == "grown" else paragraph)(label, text)
    ]


def page(*blocks: Sequence[str]) -> str:
    r"""Return blocks of lines as text, an empty line between those that hold something.

    Examples
    --------
    >>> page(["a", "b"], [], ["c"])
    'a\nb\n\nc\n'
    """
    return "\n\n".join("\n".join(block) for block in blocks if block) + "\n"


def cautions_text(cautions: Iterable[str]) -> list[str]:
    """Return one paragraph a caution."""
    return sheet(("caution", text) for text in cautions)


def level_columns(levels: Levels) -> tuple[Columns, dict[str, str]]:
    """Return the columns that say something about these levels, and the digits they deserve."""
    columns = columns_of(levels.table)
    idle = {"copies": 1, "wall_shift_meV_per_nm": None, "of_box": False}
    for name, empty in idle.items():
        if all(value == empty for value in columns.get(name, ())):
            columns.pop(name, None)
    if levels.phase_exact and "difference_meV" in columns:
        columns["difference_meV"] = ["exact here"] * len(levels.table)
    return columns, digits_for(levels.tolerance)


def level_notes(levels: Levels) -> list[Fact]:
    """Return what must be read with the levels: where there is no evidence, and the cautions."""
    exact = ONE_MATRIX if levels.method == "shooting" else NO_APPROXIMATION
    note = [("note", exact)] if levels.phase_exact and len(levels.table) else []
    if levels.method == "shooting" and not levels.phase_exact and levels.phase_followed.any():
        numbers = numbered(np.flatnonzero(levels.phase_followed) + 1)
        note = [("note", f"{numbers}: {BY_SLICES}")]
    return note + [("caution", text) for text in levels.cautions]


def levels_text(levels: Levels) -> str:
    """Return the levels with what was solved above and the cautions below."""
    table = grid(*level_columns(levels)) if len(levels.table) else ["no level"]
    return page(sheet(facts(levels)), table, sheet(level_notes(levels)))


def budget_parts(lines: Lines) -> tuple[str, Columns, list[Fact]]:
    """Return the error budget of the main line: its heading, its columns, its remarks.

    All three are empty where there is no line.
    """
    line = lines.main
    if line is None:
        return "", {}, []
    wavelength = cell("wavelength_um", line.wavelength_um, digits_for(lines.levels.tolerance))
    columns = columns_of(lines.error_budget(line))
    # a sentence says in words what its row says in numbers, and its remark
    said = zip(columns.pop("sentence"), columns.pop("remark"), strict=True)
    notes = [("note", text) for text, remark in said if remark]
    return f"what moves {line.name}, {wavelength} um, to first order:", columns, notes


def budget_text(lines: Lines) -> list[str]:
    """Return the error budget of the main line, with its name above."""
    head, columns, notes = budget_parts(lines)
    return [head, *grid(columns), *sheet(notes)] if head else []


def lines_text(lines: Lines) -> str:
    """Return the lines, beside the main one its error budget, cautions and the safety line."""
    digits = digits_for(lines.levels.tolerance)
    table = grid(columns_of(lines.table), digits) if len(lines.table) else ["no line"]
    return page(sheet(facts(lines.levels)), table, budget_text(lines), lines_notes(lines))


def line_notes(lines: Lines) -> list[Fact]:
    """Return what must be read with the lines: whose mass, the cautions, the safety line."""
    note = [("note", FREE_MASS)] if lines.strongest else []
    return [*note, *(("caution", text) for text in lines.cautions), ("safety", SAFETY)]


def lines_notes(lines: Lines) -> list[str]:
    """Return `line_notes` as text."""
    return sheet(line_notes(lines))


def designs_cautions(cautions: Sequence[Sequence[str]]) -> list[str]:
    """Return one paragraph a caution, the designs it is about before it.

    Examples
    --------
    >>> designs_cautions([["off the lattice"], [], ["off the lattice"]])
    ['caution    designs 1, 3: off the lattice']
    """
    about: dict[str, list[str]] = {}
    for number, texts in enumerate(cautions, 1):
        for text in texts:
            about.setdefault(text, []).append(str(number))
    return cautions_text(
        f"design{'s' if len(numbers) > 1 else ''} {', '.join(numbers)}: {text}"
        for text, numbers in about.items()
    )


def compare_text(
    stacks: Sequence[Stack], columns: Columns, cautions: Sequence[Sequence[str]] = ()
) -> str:
    """Return designs side by side, what each is above, the cautions about each below."""
    legend = []
    for number, stack in enumerate(stacks, 1):
        said = (stack.name or "without a name", drive(stack))
        held = held_at(stack.temperature, stack.substrate)
        legend += paragraph(f"design {number}", f"{': '.join(said)}; {held}")
        legend += layers("", grown(stack))
    reasons = columns.get("reason", [])
    failed = [(f"design {n}", f"failed: {why}") for n, why in enumerate(reasons, 1) if why]
    shown = {
        name: cells
        for name, cells in columns.items()
        if name not in ("name", "reason") and any(value is not None for value in cells)
    }
    return page(legend, grid(shown), sheet(failed) + designs_cautions(cautions))


def materials_text(found: Known) -> str:
    """Return materials, one row each, and below them what their numbers rest on."""
    columns = dict(found.columns)
    if not found.facts:
        return page(grid(columns), cautions_text(found.cautions))
    kelvin, substrate = columns.pop("temperature_K")[0], columns.pop("substrate")[0]
    head = sheet([("held at", held_at(kelvin, substrate))])
    behind = dict(found.facts)
    sources = list(dict.fromkeys(behind.pop("source")))
    behind["source"] = [f"[{sources.index(text) + 1}]" for text in found.facts["source"]]
    listed = sheet((f"[{n}]", text) for n, text in enumerate(sources, 1))
    notes = sheet([("note", COMMON_SCALE)]) + cautions_text(found.cautions)
    return page(head, grid(columns), notes, ["what this rests on:", *grid(behind)], listed)
