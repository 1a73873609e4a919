"""The growth sheet: what is set for each layer, and what that makes of it."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

from .. import quantities as q
from ..errors import GrowthError
from ..frames import frame
from ..levels import solve
from ..materials import Library
from ..stack import Stack
from ..stack.words import word
from ..stackfile.keys import LAYER_KEYS, SHAPED
from .calibrations import Calibrations
from .files import read_calibrations
from .films import Film, films_of
from .rates import Reactor
from .rows import said_of, stack_of_rows
from .shift import Shift, shift_of
from .steps import INTERRUPTION, LAYER, SAID, Step, Walk, grown_nm, read_pauses, steps_of, total

if TYPE_CHECKING:
    import pandas as pd

_ORDERS = ("first grown first", "surface first")
_TEXTS = tuple(key for key in LAYER_KEYS if key != "thickness")
#: text of the thickness as it is written in the stack
_WRITTEN = "written"
_NUMBERS = (
    "thickness_nm", "thickness_ML", "whole_ML", "rounding_nm", "monolayer_nm", "total_nm", "cells",
    "implied", "difference", "rate_ML_per_s", "time_s",
)  # fmt: skip
_WHOLE = ("line", "depth", "times", "number", "whole_ML")

SAFETY = (
    "Epitaxy uses toxic and pyrophoric sources (arsine, phosphine, arsenic, metal alkyls among"
    " them). This sheet is arithmetic, no growth procedure: defer to the reactor's own rules,"
    " local codes and licensed practice."
)


@dataclass(frozen=True, repr=False)
class GrowthSheet:
    """A stack layer by layer, as it is grown.

    Parameters
    ----------
    stack : Stack
        As designed.
    calibrations : Calibrations or None
    order : {"first grown first", "surface first"}
        Of the steps.
    whole : bool
        Whether whole monolayers are grown, or the thicknesses as designed.
    steps : tuple of Step
    shift : Shift or None
        What rounding does to the chosen line.
    cautions : tuple of str
    """

    stack: Stack
    calibrations: Calibrations | None
    order: str
    whole: bool
    steps: tuple[Step, ...]
    shift: Shift | None
    cautions: tuple[str, ...]

    safety = SAFETY

    @property
    def total_nm(self) -> float:
        """Thickness of everything that is grown [nm]."""
        return total(self.steps, lambda s: grown_nm(s, self.whole) if s.step == LAYER else 0.0)

    @property
    def total_s(self) -> float | None:
        """Time of everything that has one, interruptions too [s]; None without any."""
        if all(step.time_s is None for step in self.steps):
            return None
        return total(self.steps, lambda s: s.time_s or 0.0)

    @property
    def interrupted_s(self) -> float:
        """Time of all interruptions [s]."""
        return total(self.steps, lambda s: (s.time_s or 0.0) if s.step == INTERRUPTION else 0.0)

    @cached_property
    def columns(self) -> dict[str, list[Any]]:
        """Columns that hold something, by name with unit; a row a step."""
        steps = self.steps
        found: dict[str, list[Any]] = {
            "line": list(range(1, len(steps) + 1)),
            "step": [step.step for step in steps],
        }
        for name in ("depth", "times", "number"):
            found[name] = [getattr(step, name) for step in steps]
        for name in _TEXTS:
            found[name] = [step.entries.get(name) for step in steps]
        found[_WRITTEN] = [step.entries.get("thickness") for step in steps]
        for name in _NUMBERS:
            found[name] = [getattr(step, name) for step in steps]
        kept = ("line", "step", "depth")
        return {
            name: cells
            for name, cells in found.items()
            if name in kept or any(cell is not None for cell in cells)
        }

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a step, indexed by line from 1; see `columns`."""
        texts = ("step", *_TEXTS, _WRITTEN, "cells", "implied")
        return frame(self.columns, index="line", texts=texts, integers=_WHOLE)

    @cached_property
    def grown(self) -> Stack:
        """The stack that is grown by this sheet: in whole monolayers, or as designed."""
        return stack_of_rows(self.rows, whole=self.whole, **said_of(self.stack, self.order))

    @property
    def rows(self) -> list[dict[str, Any]]:
        """The columns as one mapping a step, without empty cells."""
        names = list(self.columns)
        return [
            {name: cell for name, cell in zip(names, cells, strict=True) if cell is not None}
            for cells in zip(*self.columns.values(), strict=True)
        ]

    def csv(self) -> str:
        """Return every column with every digit, as CSV."""
        from ..report.growing import sheet_csv

        return sheet_csv(self)

    def markdown(self) -> str:
        """Return what is read beside the reactor, as markdown."""
        from ..report.growing import sheet_markdown

        return sheet_markdown(self)

    def __str__(self) -> str:
        from ..report.growing import sheet_text

        return sheet_text(self)

    def __repr__(self) -> str:
        return f"<GrowthSheet of {len(self.steps)} steps, {self.order}>"

    def _repr_html_(self) -> str:
        from ..report.growing import sheet_html

        return sheet_html(self)


def growth_sheet(
    stack: Stack,
    calibrations: Calibrations | str | os.PathLike[str] | None = None,
    *,
    order: str = "first grown first",
    line: object = None,
    interruption: object = None,
    whole: bool = True,
    within: float = 0.02,
    **solve_arguments: Any,
) -> GrowthSheet:
    """Return a stack as it is grown, layer by layer.

    Parameters
    ----------
    stack : Stack
    calibrations : Calibrations or path, optional
        Rates of cells or of alloys; without them there are no times.
    order : {"first grown first", "surface first"}
        In which the layers are listed; thicknesses are added up in the same order.
    line : (upper, lower) or "strongest", optional
        The line for which to say what rounding does to it: both stacks are solved, and the exact
        gradient of the first stands beside.
    interruption : time, or mapping of str to time, optional
        After every layer but the last, or after those named by label or as ``"layer 2"``.
    whole : bool
        Whether whole monolayers are grown (one at least), or the thicknesses as designed.
    within : float
        How far a cation's fraction may be off before it is an error. From 0.001 on a caution
        says so.
    **solve_arguments
        As for `bandwright.solve`, where a line is asked.

    Returns
    -------
    GrowthSheet

    Raises
    ------
    GrowthError
        If a layer can't be grown by the calibrations, or they can't be read.
    StackError, MaterialError, QuantityError, UnknownName
        If the stack or an argument can't be used.

    Examples
    --------
    An invented well in an invented reactor:

    >>> import bandwright as bw
    >>> reactor = bw.Calibrations([bw.Cell("Ga1", "Ga", "0.7 ML/s", "GaAs"),
    ...                            bw.Cell("Al1", "Al", "0.3 ML/s", "GaAs")])
    >>> stack = bw.parse_line("10 nm Al0.3Ga0.7As, 6.2 nm GaAs, 10 nm Al0.3Ga0.7As",
    ...                       substrate="GaAs")
    >>> sheet = bw.growth_sheet(stack, reactor)
    >>> print(sheet.table[["material", "whole_ML", "cells", "time_s"]].round(2))
                material  whole_ML      cells  time_s
    line
    1     Al0.3Ga0.7As        35  Al1 + Ga1   35.00
    2             GaAs        22        Ga1   31.43
    3     Al0.3Ga0.7As        35  Al1 + Ga1   35.00

    Notes
    -----
    A monolayer is half the lattice constant along growth of the film, strained to the substrate by
    elastic theory; lattice constants are those of the material files, at room temperature. Each
    layer is rounded to the nearest whole monolayer on its own. Cells are opened by the rule that
    `bandwright.growth.rates` tells, and stay at one rate, so that they can't grow a grade.
    """
    word(order, _ORDERS, "order")
    within = q.as_fraction(within, "within")
    if isinstance(calibrations, str | os.PathLike):
        calibrations = read_calibrations(calibrations)
    if not isinstance(calibrations, Calibrations | None):
        raise GrowthError(
            f"got {q.show(calibrations)}; give Calibrations, or the path of a file", "calibrations"
        )
    library = Library.with_files(stack.materials)
    reactor = None if calibrations is None else Reactor(calibrations, library)
    films = films_of(stack)
    walk = Walk(films, reactor, whole, order == _ORDERS[1], read_pauses(interruption, stack),
                within)  # fmt: skip
    steps = tuple(steps_of(stack, walk))
    cautions = tuple(_cautions(stack, films, steps, reactor))
    sheet = GrowthSheet(stack, calibrations, order, whole, steps, None, cautions)
    if line is None:
        if solve_arguments:
            raise GrowthError(f"{next(iter(solve_arguments))}: nothing is solved without a line;"
                              " name one, such as line = (2, 1)")  # fmt: skip
        return sheet
    grown = stack_of_rows(sheet.rows, whole=True, **said_of(stack, order))
    shift = shift_of(solve(stack, **solve_arguments), grown, steps, line)
    return GrowthSheet(stack, calibrations, order, whole, steps, shift, cautions)


def _cautions(
    stack: Stack, films: Mapping[int, Film], steps: tuple[Step, ...], reactor: Reactor | None
) -> list[str]:
    """Return what a reader of the sheet should know."""
    found = []
    grown = [step for step in steps if step.step == LAYER]
    numbers = {w.number: w.name for w in stack.written()}

    def named(some: list[Step]) -> str:
        names = list(dict.fromkeys(numbers[step.number or 0] for step in some))
        return ", ".join(names[:6]) + (f" and {len(names) - 6} more" if len(names) > 6 else "")

    if stack.substrate is None and films:
        found.append("no substrate is named, so each layer is taken as unstrained, with its atoms"
                     " on its own lattice")  # fmt: skip
    thin = [s for s in grown if s.thickness_ML is not None and s.thickness_ML < 0.5]
    if thin:
        found.append(f"{named(thin)}: less than half a monolayer, rounded up to one")
    own = [s for s in grown if s.whole_ML is None]
    if own:
        found.append(f"{named(own)}: own numbers without a formula, so no monolayers")
    if reactor is None:
        return found
    graded = [s for s in grown if s.rate_ML_per_s is None]
    if graded:
        found.append(f"{named(graded)}: the composition varies, and cells at one rate each give"
                     " one composition, so no time; turn it into a digital alloy")  # fmt: skip
    off: dict[str, list[Step]] = {}
    for step in grown:
        if step.difference is not None and abs(step.difference) >= SAID:
            off.setdefault(f"the fluxes imply {step.implied} ({step.cells})", []).append(step)
    for text, some in off.items():
        asked = stack_formula(some[0])
        found.append(f"{named(some)}: {text} in place of {asked}")
    mixed = [s for s in grown if s.implied and _anions(films[s.number or 0]) > 1]
    if mixed:
        found.append(f"{named(mixed)}: anions are in excess, and the fluxes of cations imply"
                     " nothing about the share of each anion")  # fmt: skip
    return found


def _anions(film: Film) -> int:
    anions = () if film.composition is None else film.composition.anions
    return sum(1 for _, fraction in anions if float(fraction) > 0.0)


def stack_formula(step: Step) -> str:
    """Return what a layer is made of, as it is written: formula, and fractions of its letters.

    Examples
    --------
    >>> stack_formula(Step(LAYER, 0, entries={"material": "AlxGa1-xAs", "x": "0 to 0.3"}))
    'AlxGa1-xAs {x 0 to 0.3}'
    """
    letters = ", ".join(
        f"{name} {value if isinstance(value, str) else q.number_text(value)}"
        for name, value in step.entries.items()
        if name in SHAPED
    )
    material = step.entries.get("material", "")
    return f"{material} {{{letters}}}".strip() if letters else material
