"""Digital: a stack grown as pulses, what it holds, and what that does to its levels."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

from .. import quantities as q
from ..cautions.layers import interfaces
from ..cautions.states import counts, nothing
from ..cautions.strained import runs_too_thick
from ..cautions.words import listed
from ..errors import StackError
from ..following.matching import LOST
from ..frames import frame
from ..levels import solve
from ..materials import Library
from ..stack import Stack
from .ends import read_between
from .layers import Pulsed, chosen, digital_stack, pulsed, zero_is_lost
from .shifts import Shifts, shifts_of

if TYPE_CHECKING:
    import pandas as pd

#: pulses of fewer monolayers are thinner than an envelope is made for
_THIN = 4


@dataclass(frozen=True, eq=False, repr=False)
class Digital:
    """A design, the stack of pulses that stands for it, and both solved.

    Attributes
    ----------
    stack : Stack
        With whole-monolayer pulses in place of layers.
    period : int
        Monolayers of a cell.
    layers : tuple of Pulsed
        Each layer that became pulses.
    shifts : Shifts
        ``.levels`` and ``.lines``, tables of both solutions beside each other; ``.designed`` and
        ``.grown`` are the `Levels`.
    """

    stack: Stack
    period: int
    layers: tuple[Pulsed, ...]
    shifts: Shifts

    @property
    def table(self) -> pd.DataFrame:
        """One row a pulse in growth order, index ``pulse``; see `pulse_columns`."""
        return frame(self.pulse_columns, index="pulse", texts=("layer", "material"))

    @cached_property
    def pulse_columns(self) -> dict[str, list[Any]]:
        """Layer, material, monolayers and thickness of each pulse, each written layer once."""
        rows = [
            (one.name, one.ends[pulse.second], pulse.monolayers,
             pulse.monolayers * one.heights_nm[pulse.second])
            for one in self.layers
            for pulse in one.pulses
        ]  # fmt: skip
        names = ("layer", "material", "monolayers", "thickness_nm")
        columns: dict[str, list[Any]] = {"pulse": list(range(1, len(rows) + 1))}
        return columns | {name: [row[n] for row in rows] for n, name in enumerate(names)}

    @property
    def thickness(self) -> pd.DataFrame:
        """One row a layer, index ``layer``; see `thickness_columns`."""
        return frame(self.thickness_columns, index="layer", texts=("layer",))

    @cached_property
    def thickness_columns(self) -> dict[str, list[Any]]:
        """Thickness of each layer that became pulses, as asked and as grown, in nm and ML."""
        return {
            "layer": [one.name for one in self.layers],
            "copies": [one.copies for one in self.layers],
            "pulses": [len(one.pulses) for one in self.layers],
            "asked_nm": [one.asked_nm for one in self.layers],
            "grown_nm": [one.grown_nm for one in self.layers],
            "asked_ML": [sum(one.asked_ML) for one in self.layers],
            "grown_ML": [sum(one.grown_ML) for one in self.layers],
        }

    @property
    def content(self) -> pd.DataFrame:
        """One row a layer and element; see `content_columns`."""
        return frame(self.content_columns, texts=("layer", "element"))

    @cached_property
    def content_columns(self) -> dict[str, list[Any]]:
        """How much of each element a layer was asked to hold and holds, as full monolayers."""
        rows = []
        for one in self.layers:
            ends = one.ends.compositions
            named = dict.fromkeys(e for c in ends for site in c.sublattices for e, _ in site)
            for element in named:
                shares = [float(end.fraction(element)) for end in ends]
                asked, grown = (
                    sum(n * share for n, share in zip(amount, shares, strict=True))
                    for amount in (one.asked_ML, one.grown_ML)
                )
                rows.append((one.name, element, asked, grown, grown - asked))
        names = ("layer", "element", "asked_ML", "grown_ML", "difference_ML")
        return {name: [row[n] for row in rows] for n, name in enumerate(names)}

    @cached_property
    def cautions(self) -> tuple[str, ...]:
        """What a reader should know: pulses too thin for the model, levels lost."""
        texts = [*self._thin(), *self._indirect(), *self._outermost(), *self._lost()]
        design = self.shifts.designed.stack
        if zero_is_lost(design, self.layers):
            texts.append(
                f"zero = {design.zero!r} is the label of a layer that became pulses: energies of"
                f" the digital stack count from {self.stack.zero}, those below from the design's"
                " zero"
            )
        if design.substrate is None:
            texts.append(
                "no substrate is named, so a monolayer of each end is as high and holds as many"
                " atoms as its own lattice has; contents are monolayers"
            )
        grown = self.shifts.grown
        return (*texts, *counts(grown), *nothing(grown), *interfaces(grown), *self._relaxing())

    def _relaxing(self) -> list[str]:
        """Return runs of pulses that are beyond their critical thickness."""
        substrate = self.stack.substrate
        if substrate is None:
            return []
        profile = self.shifts.grown.profile
        lattice = Library.with_files(self.stack.materials).lattice(substrate)
        return runs_too_thick([profile.facts[index] for index in profile.written], lattice)

    def _thin(self) -> list[str]:
        thin: dict[str, list[int]] = {}
        for one in self.layers:
            for pulse in one.pulses:
                if pulse.monolayers < _THIN:
                    thin.setdefault(one.ends[pulse.second], []).append(pulse.monolayers)
        if not thin:
            return []
        said = " and ".join(f"{len(n)} of {name} (from {min(n)} ML)" for name, n in thin.items())
        return [
            f"pulses thinner than {_THIN} ML: {said}; an effective mass is not made for layers"
            " this thin, so take the shifts for their sign and size, not to their last digit"
        ]

    def _indirect(self) -> list[str]:
        names = dict.fromkeys(name for one in self.layers for name in one.indirect)
        if not names:
            return []
        return [
            f"{listed(list(names))}: the lowest conduction edge is not at the zone centre; only"
            " the zone centre's is followed, and how its states mix with the others in thin"
            " pulses is left out"
        ]

    def _outermost(self) -> list[str]:
        """Return open ends that go on as a pulse, not as the layer that became pulses."""
        if self.shifts.grown.profile.field != 0.0:  # walls stand in for open ends
            return []
        written = self.stack.grown()
        numbers = [number for _, number in self.shifts.designed.stack.grown()]
        named = {one.number: one.name for one in self.layers}
        outer = [
            f"{named[numbers[face]]} (now {written[face][0].material})"
            for face, end in zip((0, -1), self.stack.ends, strict=True)
            if end == "open" and numbers[face] in named
        ]
        if not outer:
            return []
        return [
            f"outermost: {listed(outer)}; an open end goes on as its last pulse, not as the layer,"
            " and levels may no longer be bound; add a layer outside, or write ends = 'wall'"
        ]

    def _lost(self) -> list[str]:
        partners = self.shifts.partners
        lost = [str(n + 1) for n, partner in enumerate(partners.tolist()) if partner == LOST]
        if not lost:
            return []
        return [
            f"level {', '.join(lost)} of the design is not found again in the digital stack: no"
            " level there holds half of it; a shorter period, or ends that differ less, change less"
        ]

    def __str__(self) -> str:
        from ..report.digitized import digital_text

        return digital_text(self)

    def __repr__(self) -> str:
        return f"<Digital of {len(self.layers)} layers, cells of {self.period} ML>"

    def _repr_html_(self) -> str:
        from ..report.digitized import digital_html

        return digital_html(self)


def digital_alloy(
    stack: Stack,
    layers: str | Iterable[str] | None = None,
    *,
    period: int = 6,
    between: tuple[str, str] | None = None,
    **solve_arguments: Any,
) -> Digital:
    """Return a stack whose graded layers or alloys are grown as pulses of two ends.

    Parameters
    ----------
    stack : Stack
    layers : str or sequence of str, optional
        Labels, or ``"layer 2"``. Every graded layer if absent, and every alloy where none is
        graded.
    period : int
        Monolayers of a cell, 2 at least; each holds one pulse of the second end at most.
    between : (str, str), optional
        The two ends as formulas; the binaries of a ternary if absent.
    **solve_arguments
        As for `bandwright.solve`.

    Returns
    -------
    Digital
        ``.stack``, ``.table`` of pulses, ``.thickness``, ``.content``, ``.shifts`` of levels and
        lines, ``.cautions``.

    Raises
    ------
    StackError, MaterialError, UnknownName
        If a layer or an argument can't be used; the text names it.

    Notes
    -----
    A cell is ``period`` monolayers of the strained layer. At the end of every cell either end has
    had what the layer has down to there, to half a monolayer: rounding is carried on, not lost.
    Within the cell, the pulse is put where the running amount is right on average, so that pulses
    neither lead nor lag the layer. Each copy of a repeated layer is alike.

    Shifts are no estimate: both stacks are solved, and levels are followed by the overlap of
    their states, layer laid on pulses.

    Examples
    --------
    An invented well with a graded side:

    >>> import bandwright as bw
    >>> stack = bw.parse_line("15 nm Al0.3Ga0.7As, 12 nm AlxGa1-xAs {x 0.3 to 0, label grade},"
    ...                       " 5 nm GaAs, 15 nm Al0.3Ga0.7As", substrate="GaAs")
    >>> digital = bw.digital_alloy(stack, "grade", period=6)
    >>> digital.table[["material", "monolayers"]].head(3)
          material  monolayers
    pulse
    1         GaAs           2
    2         AlAs           2
    3         GaAs           5
    >>> digital.content.round(2).iloc[:2, 1:]
      element  asked_ML  grown_ML  difference_ML
    0      Ga     36.07      36.0          -0.07
    1      As     42.44      42.0          -0.44
    """
    if not isinstance(stack, Stack):
        raise StackError(f"stack: got {q.show(stack)}; a Stack is due")
    if isinstance(period, bool) or not isinstance(period, int) or period < 2:
        raise StackError(f"period: got {q.show(period)}; write a whole number of monolayers from 2")
    ends = read_between(between)
    method = solve_arguments.get("method")
    if method not in (None, "shooting"):
        raise StackError(f"method: got {q.show(method)}; levels are followed by their states,"
                         " which need 'shooting'")  # fmt: skip
    some = chosen(stack, layers)
    levels = solve(stack, **solve_arguments)
    found = tuple(pulsed(levels, one, period, ends) for one in some)
    grown = digital_stack(stack, found)
    return Digital(grown, period, found, shifts_of(levels, grown, found))
