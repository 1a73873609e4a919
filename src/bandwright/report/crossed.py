"""Anticrossings as text: along what, a row each, and how a row is read."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

from .data import Columns
from .facts import drive, grown, held_at
from .grid import DIGITS, grid
from .text import cautions_text, layers, page, paragraph

if TYPE_CHECKING:
    from ..stack import Stack

_NOTE = (
    "splitting is the smallest spacing of the two levels, twice their coupling; at half width from"
    " there the spacing is 1.41 times that; a track is one state, whatever its number becomes;"
    " exchange is 1 where two levels alone exchange their character"
)
_ERROR = "splitting_error_meV"


def crossed_text(
    stack: Stack,
    columns: Columns,
    parameter: str,
    over: Mapping[str, str],
    cautions: Sequence[str],
) -> str:
    """Return the table of anticrossings under what was varied."""
    said = (stack.name or "without a name", drive(stack))
    head = paragraph("varied", f"{': '.join(said)}; {held_at(stack.temperature, stack.substrate)}")
    head += layers("", grown(stack))
    head += paragraph("over", "; ".join(f"{name}, {values}" for name, values in over.items()))
    if not columns[parameter]:
        none = "no two levels come closest and exchange their character along this range"
        return page(head, paragraph("found", none), cautions_text(cautions))
    shown = {name.replace(".", " "): cells for name, cells in columns.items() if name != _ERROR}
    good = f"splittings are good to {10.0 ** math.ceil(math.log10(max(columns[_ERROR]))):g} meV"
    notes = [*paragraph("note", good), *paragraph("note", _NOTE), *cautions_text(cautions)]
    return page(head, grid(shown, _digits(columns, parameter)), notes)


def _digits(columns: Columns, parameter: str) -> dict[str, str]:
    """Return formats; the parameter as its place is known, to a thousandth of the half-width."""
    width = next(name for name in columns if name.startswith("half_width"))
    places = max(0, 2 - math.floor(math.log10(max(min(columns[width]), 1e-12))))
    return {**DIGITS, "splitting_meV": ".4g", "exchange": ".2f",
            width: ".3g", parameter.replace(".", " "): f".{places}f"}  # fmt: skip
