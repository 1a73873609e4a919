"""A sweep as text: what was varied, a row a design, and why some have none."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from .data import Columns
from .facts import drive, grown, held_at
from .grid import digits_for, grid, unit_of
from .text import cautions_text, layers, page, paragraph

if TYPE_CHECKING:
    from ..stack import Stack

#: reasons shown one by one
_MOST = 5


def sweep_text(
    stack: Stack,
    columns: Columns,
    parameters: Sequence[str],
    line: Sequence[Any] | None,
    tolerance: float,
    followed: bool = False,
) -> str:
    """Return a sweep's table, of levels good to a tolerance [eV], under what it is a sweep of."""
    said = (stack.name or "without a name", drive(stack))
    head = paragraph("varied", f"{': '.join(said)}; {held_at(stack.temperature, stack.substrate)}")
    head += layers("", grown(stack))
    for name in parameters:
        words, unit = unit_of(name)
        head += paragraph("over", f"{words}, {_span(list(dict.fromkeys(columns[name])), unit)}")
    if line is not None:
        where = "in the first design, followed by character" if followed else "in every design"
        head += paragraph("line", f"{line[0]} to {line[1]}, {where}")
    # a dot is no place to break a heading; a space is
    shown = {
        name.replace(".", " "): cells
        for name, cells in columns.items()
        if name != "reason" and any(value is not None for value in cells)
    }
    return page(head, grid(shown, _digits(shown, len(parameters), tolerance)),
                failures_text(columns))  # fmt: skip


def _digits(shown: Columns, parameters: int, tolerance: float) -> dict[str, str]:
    """Return formats: levels as energies, each parameter with as many decimals as it needs."""
    digits = digits_for(tolerance)
    for name in shown:
        if name.startswith(("level_", "spacing_")):
            digits[name] = digits["energy_meV"]
    for name in list(shown)[1 : parameters + 1]:
        texts = {f"{v:.6g}" for v in shown[name] if isinstance(v, float)}
        if texts and not any("e" in text for text in texts):
            digits[name] = f".{max(len(text.partition('.')[2]) for text in texts)}f"
    return digits


def _span(values: Sequence[Any], unit: str) -> str:
    """Return the values of a parameter, the first and the last of many.

    Examples
    --------
    >>> _span([4.0], "nm"), _span([4.0, 4.5, 5.0], "nm")
    ('4 nm', '3 values from 4 to 5 nm')
    """
    first, last = (f"{v:.6g}" if isinstance(v, float) else str(v) for v in (values[0], values[-1]))
    many = f"{len(values)} values from {first} to {last}"
    return f"{first if len(values) == 1 else many} {unit}".rstrip()


def failures_text(columns: Columns) -> list[str]:
    """Return one paragraph a reason, with the designs it is about."""
    about: dict[str, list[int]] = {}
    for design, why in zip(columns["design"], columns["reason"], strict=True):
        if why:
            about.setdefault(why, []).append(design)
    failed = sum(map(len, about.values()))
    if not failed:
        return []
    total = len(columns["design"])
    texts = [
        f"design{'s' if len(designs) > 1 else ''} {_few(designs)}: {why}"
        for why, designs in list(about.items())[:_MOST]
    ]
    if len(about) > _MOST:
        texts.append(f"and {len(about) - _MOST} more reasons, in the column of CSV and JSON")
    return cautions_text([f"{failed:,} of {total:,} designs lack numbers", *texts])


def _few(designs: Sequence[int]) -> str:
    """Return numbers, the first of many.

    Examples
    --------
    >>> _few([1, 2, 3]), _few(range(1, 12))
    ('1, 2, 3', '1, 2, 3, 4, 5 and 6 more')
    """
    shown = ", ".join(map(str, designs[:_MOST]))
    more = len(designs) - _MOST
    return shown if more <= 0 else f"{shown} and {more} more"
