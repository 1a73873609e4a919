"""A tolerance as text, HTML and JSON: sigma of each line, its shares, the yield both ways."""

from __future__ import annotations

from html import escape
from typing import TYPE_CHECKING, Any

from .data import Columns, columns_of, rows_of, solved_object
from .facts import SAFETY, Fact, facts
from .grid import cell, digits_for, grid
from .html import html_facts, html_table
from .text import page, sheet

if TYPE_CHECKING:
    from ..tolerances import Tolerance

ERRORS = (
    "to first order, wavelengths are normal; errors of the draws are one standard deviation, "
    "binomial for the yield (Wilson) and by the fourth moment for sigma"
)


def _digits(found: Tolerance) -> dict[str, str]:
    more = dict.fromkeys(("mean_um", "mean_error_um", "sigma_error_um"), ".4f")
    more |= dict.fromkeys(("most_percent", "share_percent"), ".1f")
    more |= {"shift_um": "+.4f", "yield_error_percent": ".2f"}
    return {**digits_for(found.lines.levels.tolerance), **more}


def _named(found: Tolerance) -> str:
    digits = digits_for(found.lines.levels.tolerance)
    return f"{found.line.name}, {cell('wavelength_um', found.line.wavelength_um, digits)} um"


def _heads(found: Tolerance) -> tuple[str, str]:
    """Return what stands above the shares and above the estimates."""
    low, high = (None if side is None else f"{side * 1e-3:.6g} um" for side in found.window)
    window = ""
    if found.windowed:
        sides = (f"up to {high}" if low is None else f"from {low} on" if high is None
                 else f"from {low} to {high}")  # fmt: skip
        window = f", and its yield {sides}"
    shares = f"what one sigma of each does to {_named(found)}, and its share of the variance:"
    return shares, f"sigma of {_named(found)}{window}:"


def _estimates(found: Tolerance) -> Columns:
    columns = columns_of(found.estimates)
    return {n: cells for n, cells in columns.items() if any(v is not None for v in cells)}


def _notes(found: Tolerance) -> list[Fact]:
    drawn = found.draws
    said = f"{len(drawn)} draws, seed {drawn.seed}; " if drawn is not None else ""
    note = ERRORS if drawn is not None else ERRORS.partition(";")[0]
    cautions = [("caution", text) for text in found.cautions]
    return [("note", said + note), *cautions, ("safety", SAFETY)]


def tolerance_text(found: Tolerance) -> str:
    """Return a tolerance with what was solved above and the cautions below."""
    digits = _digits(found)
    shares, estimates = _heads(found)
    return page(
        sheet(facts(found.lines.levels)),
        grid(columns_of(found.table), digits),
        [shares, *grid(columns_of(found.shares), digits)],
        [estimates, *grid(_estimates(found), digits)],
        sheet(_notes(found)),
    )


def beside_text(found: Tolerance) -> list[str]:
    """Return what must be read with the table of lines alone."""
    digits = _digits(found)
    shares, estimates = _heads(found)
    blocks = ([shares, *grid(columns_of(found.shares), digits)],
              [estimates, *grid(_estimates(found), digits)], sheet(_notes(found)))  # fmt: skip
    return page(*blocks).splitlines()


def tolerance_html(found: Tolerance) -> str:
    """Return a tolerance as HTML, the same facts, digits and cautions."""
    digits = _digits(found)
    shares, estimates = (f"<div>{escape(head)}</div>" for head in _heads(found))
    return (
        html_facts(facts(found.lines.levels))
        + html_table(columns_of(found.table), digits)
        + shares + html_table(columns_of(found.shares), digits)
        + estimates + html_table(_estimates(found), digits)
        + html_facts(_notes(found))
    )  # fmt: skip


def tolerance_object(found: Tolerance) -> dict[str, Any]:
    """Return a tolerance as one JSON object."""
    drawn = found.draws
    return {
        **solved_object(found.lines.levels),
        "lines": rows_of(columns_of(found.table)),
        "line": [found.line.upper, found.line.lower],
        "window_um": [None if side is None else side * 1e-3 for side in found.window],
        "shares": rows_of(columns_of(found.shares)),
        "estimates": rows_of(columns_of(found.estimates)),
        "draws": None if drawn is None else {
            "draws": len(drawn), "seed": drawn.seed, "failed": drawn.failed,
            "missing": drawn.missing, "unlike": drawn.unlike,
        },
        "cautions": list(found.cautions),
        "safety": SAFETY,
    }  # fmt: skip
