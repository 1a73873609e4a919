"""Aimed: the design that was found, as it is and in whole monolayers, and how near it comes."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np

from ..frames import frame
from ..levels import Levels
from ..parameters import Parameter, read, replace
from ..stack import Stack
from .asking import SHOWN, Limit, Wishes, relative, shown_energy
from .problem import Point

if TYPE_CHECKING:
    import pandas as pd

#: a target counts as reached when its energy is this close, relative
REACHED = 1e-6
#: a parameter this close to a bound, in scaled parameters, is at it
_AT_BOUND = 1e-6
#: a number of monolayers this close to a whole one is whole
_WHOLE = 1e-9


@dataclass(frozen=True, eq=False, repr=False)
class Aimed:
    """A design aimed at targets; made by `bandwright.aim`.

    Attributes
    ----------
    wishes : Wishes
        What was asked, as floats.
    found, whole : Point
        The design and the one in whole monolayers, solved; ``whole`` is None where nothing
        has monolayers or a grid.
    rounded_parameters : tuple of Parameter
        What was rounded, the layers that were not free as well.
    solves : int
        How many designs were solved in all.
    starts : int
        How many starts were followed.
    follow : bool
        Whether levels were followed by character.
    """

    wishes: Wishes
    found: Point
    whole: Point | None
    rounded_parameters: tuple[Parameter, ...]
    solves: int
    starts: int
    follow: bool

    @property
    def stack(self) -> Stack:
        """The design, its parameters to the last digit."""
        return self.found.levels.stack

    def shown(self, stack: Stack) -> Stack:
        """Return a design with free parameters to seven digits, as texts print it.

        Thicknesses in whole monolayers stay as they are.
        """
        for one in self.wishes.free:
            if not relative(one.parameter):
                value = float(f"{read(stack, one.name):.7g}")
                stack = replace(stack, one.name, value)
        return stack

    @property
    def rounded(self) -> Stack | None:
        """The design in whole monolayers; None where nothing has monolayers or a grid."""
        return None if self.whole is None else self.whole.levels.stack

    @property
    def levels(self) -> Levels:
        """The levels of the design, as far up as was asked."""
        return self.found.levels

    @property
    def rounded_levels(self) -> Levels | None:
        """The levels of the design in whole monolayers."""
        return None if self.whole is None else self.whole.levels

    @cached_property
    def reached(self) -> bool:
        """Whether the design meets every target and keeps every limit, to 1e-6."""
        deviations = self.found.deviations / self.found.problem.weights
        return bool(np.abs(deviations).max(initial=0.0) <= REACHED and self.found.broken <= REACHED)

    @cached_property
    def values(self) -> pd.DataFrame:
        """One row a parameter: start, value, rounded, unit, monolayers, and whether it was free.

        Layers that were not free have a row where rounding moved them. ``monolayers`` is the
        whole number of a rounded thickness.
        """
        rows = [self._row(one.parameter, True) for one in self.wishes.free]
        free = {one.name for one in self.wishes.free}
        rows += [self._row(p, False) for p in self.rounded_parameters if p.name not in free]
        names = ("parameter", "start", "value", "rounded", "unit", "monolayers", "free")
        columns = {name: [row[place] for row in rows] for place, name in enumerate(names)}
        return frame(columns, texts=("parameter", "unit"))

    def _row(self, parameter: Parameter, free: bool) -> tuple[Any, ...]:
        unit, places = SHOWN.get(parameter.unit, (parameter.unit, 0))
        values = [read(stack, parameter.name) for stack in (self.wishes.stack, self.stack)]
        if free and relative(parameter):
            values[1] = dict(
                zip(self.wishes.names, self.found.problem.values(self.found.x), strict=True)
            )[parameter.name]
        whole, count = self._whole(parameter, values[1])
        size = 10.0**places
        shown = [None if v is None else v * size for v in (*values, whole)]
        return (parameter.name, *shown, unit, count, free)

    def _whole(self, parameter: Parameter, value: float) -> tuple[float | None, float | None]:
        """Return a parameter of the rounded design, and its monolayers where they are whole."""
        if self.whole is None:
            return None, None
        if relative(parameter):
            return value, None
        stack = self.whole.levels.stack
        if parameter.kind != "thickness" or parameter.layer_number is None:
            return read(stack, parameter.name), None
        length = stack.written()[parameter.layer_number - 1].layer.thickness
        fact = self.whole.levels.profile.facts[parameter.layer_number - 1]
        count = length.value if length.unit == "ML" else fact.thickness / fact.monolayer
        whole = np.isfinite(count) and abs(count - round(count)) < _WHOLE
        monolayers = round(count) if whole else None
        return (length.value if parameter.unit == "ML" else fact.thickness), monolayers

    @cached_property
    def targets(self) -> pd.DataFrame:
        """One row a target: asked, reached, rounded, by, unit; then what is maximised.

        ``by`` is how far the rounded design is off, or the design itself where nothing was
        rounded.
        """
        rows: list[tuple[Any, ...]] = []
        for target in self.wishes.targets:
            both = [None if p is None else shown_energy(p.energy(target.pair), target.unit)
                    for p in (self.found, self.whole)]  # fmt: skip
            last = both[0] if both[1] is None else both[1]
            off = None if last is None else last - target.asked
            rows.append((target.name, target.asked, *both, off, target.unit))
        wished = self.wishes.quantity
        if wished is not None:
            whole = None if self.whole is None else self.whole.quantity
            unit = "nm" if wished.column == "dipole_nm" else ""
            rows.append((wished.name, None, self.found.quantity, whole, None, unit))
        names = ("target", "asked", "reached", "rounded", "by", "unit")
        columns = {name: [row[place] for row in rows] for place, name in enumerate(names)}
        return frame(columns, texts=("target", "unit"))

    @cached_property
    def limits(self) -> pd.DataFrame:
        """One row a limit: least, most, reached, rounded, unit."""
        rows = [(one.name, *self._limit(one), one.unit) for one in self.wishes.limits]
        names = ("limit", "least", "most", "reached", "rounded", "unit")
        columns = {name: [row[place] for row in rows] for place, name in enumerate(names)}
        return frame(columns, texts=("limit", "unit"))

    def _limit(self, one: Limit) -> tuple[float | None, ...]:
        def of(point: Point) -> float:
            return point.thickness if one.pair is None else point.energy(one.pair)

        def shown(value: float | None) -> float | None:
            return value if value is None or one.pair is None else shown_energy(value, one.unit)

        ends = (shown(one.least), shown(one.most))
        ends = ends[::-1] if one.unit == "um" else ends
        whole = None if self.whole is None else of(self.whole)
        return (*ends, shown(of(self.found)), shown(whole))

    @cached_property
    def message(self) -> str:
        """What was reached, in a sentence; what is nearest where it is out of reach."""
        if self.reached:
            found = "every target is met" if self.wishes.targets else ""
            kept = "every limit is kept" if self.wishes.limits else ""
            raised = ""
            if self.wishes.quantity:
                unit = "nm" if self.wishes.quantity.column == "dipole_nm" else ""
                raised = f"{self.wishes.quantity.name} raised to {self.found.quantity:.4g} {unit}"
            return ", ".join(text.rstrip() for text in (found, kept, raised) if text)
        told = [*self._missed(), *self._broken()]
        bounds = self._at_bounds()
        edge = self.found.problem.edges.get(self.found.x.tobytes())
        bounds += [f"a step further {edge}"] if edge else []
        within = f"; {', '.join(bounds)}" if bounds else ""
        unraised = ""
        if self.wishes.quantity:
            unraised = f"; {self.wishes.quantity.name} was not raised"
        return f"out of reach within these bounds: {', '.join(told)}{within}{unraised}"

    def _missed(self) -> list[str]:
        texts = []
        for target in self.wishes.targets:
            near = self.found.energy(target.pair)
            if abs(near / target.energy - 1.0) > REACHED:
                value = shown_energy(near, target.unit)
                texts.append(
                    f"the nearest to {target.asked:.6g} {target.unit} of {target.name} is"
                    f" {value:.6g} {target.unit}"
                )
        return texts

    def _broken(self) -> list[str]:
        texts = []
        for (one, sign, _), rest in zip(self.found.problem.ends, self.found.rests, strict=True):
            if rest < -REACHED:
                least, most, reached, _ = self._limit(one)
                end = least if (sign > 0.0) != (one.unit == "um") else most
                texts.append(f"{one.name} is {reached:.6g} {one.unit}, beyond its limit of"
                             f" {end:.6g} {one.unit}")  # fmt: skip
        return texts

    def _at_bounds(self) -> list[str]:
        texts = []
        for one, share in zip(self.wishes.free, self.found.x, strict=True):
            if min(share, 1.0 - share) > _AT_BOUND:
                continue
            unit, places = SHOWN.get(one.parameter.unit, (one.parameter.unit, 0))
            end, side = (one.least, "lower") if share < 0.5 else (one.most, "upper")
            texts.append(f"{one.name} is at its {side} bound, {end * 10.0**places:.6g} {unit}"
                         .rstrip())  # fmt: skip
        return texts

    def __repr__(self) -> str:
        state = "reached" if self.reached else "out of reach"
        return f"<Aimed: {state}, {self.solves} solves>"

    def __str__(self) -> str:
        from ..report.aimed import aimed_text

        return aimed_text(self)

    def _repr_html_(self) -> str:
        from ..report.aimed import aimed_html

        return aimed_html(self)
