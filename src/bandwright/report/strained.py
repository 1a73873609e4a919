"""Strain and X-ray positions of a stack: text, HTML, Markdown, and one JSON object."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from .compared import markdown_facts, markdown_table
from .data import Columns, plain, rows_of, stack_object
from .facts import Fact, grown
from .grid import grid
from .html import html_facts, html_table
from .text import page, sheet

if TYPE_CHECKING:
    from ..mismatch import Balance, Mismatches
    from ..stack import Stack
    from ..xray import XrayPattern

PREFACTORS = (
    "critical thickness by Matthews and Blakeslee (1974), K = 8 pi for a free surface, 4 pi for a "
    "single layer between others, 2 pi for a superlattice: a layer of a repeated group against "
    "the others of it, once the group has come off the substrate's lattice; metastable films go "
    "beyond it"
)
KINEMATIC = (
    "kinematic positions, where Bragg's law puts them: no refraction, no dynamical shift, no "
    "intensities; lattice constants of 300 K, every layer strained to the substrate"
)


# -- strain ---------------------------------------------------------------------------------


def mismatch_facts(found: Mismatches) -> list[Fact]:
    """Return what was looked at and the means, in the order they are read."""
    mean = (
        f"mismatch {100.0 * found.mean_mismatch:+.4f} % over {found.thickness_nm:.6g} nm; stress "
        f"in the plane {found.mean_stress_GPa:+.4f} GPa{_sense(found.mean_stress_GPa)}"
    )
    return [*_of_stack(found.stack), ("mean", mean), ("whole", _whole(found))]


def _of_stack(stack: Stack) -> list[Fact]:
    return [
        ("stack", stack.name or "without a name"),
        ("grown", grown(stack)),
        ("strained", f"to {stack.substrate}; lattice and elastic constants of 300 K"),
    ]


def _sense(stress: float) -> str:
    if f"{abs(stress):.4f}" == "0.0000":
        return ", balanced"
    return ", stretched" if stress > 0.0 else ", pressed together"


def _whole(found: Mismatches) -> str:
    film = found.whole
    if film is None:
        why = "a layer has no lattice" if found.left_out else "no layer is off by more than 0.1 %"
        return f"not taken as one film: {why}"
    limit = "no critical thickness, it is balanced"
    if abs(film.misfit) >= 1e-6:
        limit = f"critical thickness {film.limit:.6g} nm ({film.case})"
    return (
        f"from the first to the last strained layer {film.thickness:.6g} nm, mismatch weighted "
        f"with stiffness {100.0 * film.misfit:+.4f} %: {limit}"
    )


def shown_columns(found: Mismatches) -> Columns:
    """Return the columns that say something about this stack."""
    columns = {name: [plain(v) for v in cells] for name, cells in found.columns.items()}
    if columns["worst_mismatch_percent"] == columns["mismatch_percent"]:
        del columns["worst_mismatch_percent"]
    if all(value is None for value in columns["critical_in_group_nm"]):
        del columns["critical_in_group_nm"]
    if all(copies == 1 for copies in columns["copies"]):
        del columns["copies"]
    return columns


def mismatch_notes(found: Mismatches, balances: Sequence[Balance] = ()) -> list[Fact]:
    """Return what balances, whose critical thickness it is, and the cautions."""
    changes = [("balance", balance_text(balance)) for balance in balances]
    return [*changes, ("note", PREFACTORS), *(("caution", text) for text in found.cautions)]


def balance_text(balance: Balance) -> str:
    """Return in words what brings the mean stress to zero."""
    unit = f" {balance.unit}" if balance.unit else ""
    return (
        f"{balance.name} from {balance.before:.6g}{unit} to {balance.after:.6g}{unit} "
        f"({balance.change:+.6g}{unit}) brings the mean stress to zero"
    )


def mismatch_text(found: Mismatches, balances: Sequence[Balance] = ()) -> str:
    """Return the strain of a stack as text."""
    notes = sheet(mismatch_notes(found, balances))
    return page(sheet(mismatch_facts(found)), grid(shown_columns(found)), notes)


def mismatch_html(found: Mismatches, balances: Sequence[Balance] = ()) -> str:
    """Return the strain of a stack as HTML."""
    notes = mismatch_notes(found, balances)
    table = html_table(shown_columns(found))
    return html_facts(mismatch_facts(found)) + table + html_facts(notes)


def mismatch_markdown(found: Mismatches, balances: Sequence[Balance] = ()) -> str:
    """Return the strain of a stack as Markdown."""
    notes = mismatch_notes(found, balances)
    return _markdown(mismatch_facts(found), shown_columns(found), notes)


def mismatch_object(found: Mismatches, balances: Sequence[Balance] = ()) -> dict[str, Any]:
    """Return the strain of a stack as one JSON object."""
    film = found.whole
    whole = None
    if film is not None:
        whole = {
            "thickness_nm": film.thickness,
            "mismatch_percent": 100.0 * film.misfit,
            "critical_thickness_nm": plain(film.limit),
            "case": film.case,
        }
    return {
        "stack": stack_object(found.stack),
        "mean_mismatch_percent": 100.0 * found.mean_mismatch,
        "mean_stress_GPa": found.mean_stress_GPa,
        "thickness_nm": found.thickness_nm,
        "whole": whole,
        "layers": rows_of({k: [plain(v) for v in cells] for k, cells in found.columns.items()}),
        "left_out": list(found.left_out),
        "balances": [
            {"name": b.name, "unit": b.unit, "before": b.before, "after": b.after,
             "stack": stack_object(b.stack)}
            for b in balances
        ],
        "note": PREFACTORS,
        "cautions": list(found.cautions),
    }  # fmt: skip


# -- X-rays ---------------------------------------------------------------------------------


def xray_facts(pattern: XrayPattern) -> list[Fact]:
    """Return the period, the zero order, the spacing and the mismatches."""
    h, k, l = pattern.reflection  # noqa: E741 - Miller indices have these names
    length = f"{pattern.wavelength_nm:.7g} nm"
    named = length if pattern.line == length else f"{pattern.line}, {length}"
    period = f"{pattern.period_nm:.6g} nm"
    of = f"{pattern.times} times" if pattern.times > 1 else "all layers as one"
    zero = f"{pattern.zero_order_deg:.4f} deg"
    return [
        *_of_stack(pattern.stack),
        ("reflection", f"{h} {k} {l}, {named}"),
        ("period", f"{period} ({of}): {' + '.join(pattern.members)}"),
        ("zero order", f"{zero}; substrate {pattern.substrate_deg:.4f} deg"),
        ("satellites", f"{pattern.spacing_deg:.4f} deg from one to the next"),
        ("mismatch", f"{pattern.perpendicular_mismatch_ppm:+.0f} ppm along growth, as the zero "
                     f"order shows; {pattern.mean_mismatch_ppm:+.0f} ppm if it were relaxed"),
    ]  # fmt: skip


def shown_satellites(pattern: XrayPattern) -> Columns:
    """Return the columns of the satellites, the tilt where there is one."""
    columns = pattern.columns
    if pattern.substrate_tilt_deg == 0.0:
        del columns["tilt_deg"]
    return columns


def xray_notes(pattern: XrayPattern) -> list[Fact]:
    """Return what the positions leave out, and the cautions."""
    return [("note", KINEMATIC), *(("caution", text) for text in pattern.cautions)]


def xray_text(pattern: XrayPattern) -> str:
    """Return the X-ray positions of a stack as text."""
    table = grid(shown_satellites(pattern))
    return page(sheet(xray_facts(pattern)), table, sheet(xray_notes(pattern)))


def xray_html(pattern: XrayPattern) -> str:
    """Return the X-ray positions of a stack as HTML."""
    table = html_table(shown_satellites(pattern))
    return html_facts(xray_facts(pattern)) + table + html_facts(xray_notes(pattern))


def xray_markdown(pattern: XrayPattern) -> str:
    """Return the X-ray positions of a stack as Markdown."""
    return _markdown(xray_facts(pattern), shown_satellites(pattern), xray_notes(pattern))


def xray_object(pattern: XrayPattern) -> dict[str, Any]:
    """Return the X-ray positions of a stack as one JSON object."""
    return {
        "stack": stack_object(pattern.stack),
        "reflection": list(pattern.reflection),
        "wavelength_nm": pattern.wavelength_nm,
        "period_nm": pattern.period_nm,
        "times": pattern.times,
        "period_of": list(pattern.members),
        "zero_order_deg": pattern.zero_order_deg,
        "substrate_deg": pattern.substrate_deg,
        "spacing_deg": pattern.spacing_deg,
        "perpendicular_mismatch_ppm": pattern.perpendicular_mismatch_ppm,
        "mean_mismatch_ppm": pattern.mean_mismatch_ppm,
        "satellites": rows_of(pattern.columns),
        "note": KINEMATIC,
        "cautions": list(pattern.cautions),
    }


def _markdown(facts: Sequence[Fact], columns: Columns, notes: Sequence[Fact]) -> str:
    return f"{markdown_facts(facts)}\n{markdown_table(columns)}\n{markdown_facts(notes)}"
