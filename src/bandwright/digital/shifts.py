"""What pulses do to levels and lines: both stacks solved, levels followed by their states."""

from __future__ import annotations

import warnings
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightWarning
from ..following.matching import LOST, assign
from ..frames import frame
from ..levels import Levels, solve
from ..metrics import line_between
from ..profile.build import build_profile
from ..profile.layers import Built
from ..solver.overlaps import Laid, grid_for, lay, product
from ..solver.states import States
from ..stack import Stack
from .layers import Pulsed, zero_is_lost

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]

#: how far above the highest level of the design is looked [eV]
_ROOM = 0.1


@dataclass(frozen=True, eq=False)
class Shifts:
    """Levels and lines of a design beside those of its digital stack; made by `digital_alloy`.

    Attributes
    ----------
    designed, grown : Levels
    offset : float
        What is added to a digital energy so that it counts from the design's zero [eV].
    overlaps : array (n_designed, n_grown)
        |<i|j>| of the states of both.
    partners : array of int (n_designed,)
        Index of each level in the digital stack, -1 where it is lost.
    """

    designed: Levels
    grown: Levels
    offset: float
    overlaps: Floats
    partners: npt.NDArray[np.int64]

    @property
    def levels(self) -> pd.DataFrame:
        """One row a level of the design, index ``level``; see `level_columns`."""
        return frame(self.level_columns, index="level", integers=("level",))

    @cached_property
    def level_columns(self) -> dict[str, list[Any]]:
        """Both energies from the design's zero, their difference, and |<i|j>|."""
        digital = self.grown.energies + self.offset
        columns: dict[str, list[Any]] = {
            "level": list(range(1, len(self.partners) + 1)),
            "energy_meV": (1e3 * self.designed.energies).tolist(),
        }
        others: list[list[Any]] = []
        for index, partner in enumerate(self.partners.tolist()):
            if partner == LOST:
                others.append([None] * 4)
                continue
            shift = digital[partner] - self.designed.energies[index]
            others.append([partner + 1, 1e3 * float(digital[partner]), 1e3 * float(shift),
                           float(self.overlaps[index, partner])])  # fmt: skip
        names = ("digital_level", "digital_meV", "shift_meV", "overlap")
        return columns | {name: [row[n] for row in others] for n, name in enumerate(names)}

    @property
    def lines(self) -> pd.DataFrame:
        """One row a line of the design between two levels; see `line_columns`."""
        return frame(self.line_columns, integers=("upper", "lower"))

    @cached_property
    def line_columns(self) -> dict[str, list[Any]]:
        """Both wavelengths, their difference, that of the photon energies, and the strength."""
        names = ("upper", "lower", "wavelength_um", "digital_um", "shift_um", "shift_meV",
                 "oscillator_strength")  # fmt: skip
        rows: list[tuple[Any, ...]] = []
        for line in self.designed.lines().rows:
            if not isinstance(line.upper, int):
                continue
            ends = [int(self.partners[number - 1]) for number in (line.upper, line.lower)]
            length = shift_um = shift_meV = None
            if LOST not in ends:
                other = line_between(self.grown, (max(ends) + 1, min(ends) + 1), dipole=False)
                if other is not None:
                    length = other.wavelength_um
                    shift_um = length - line.wavelength_um
                    shift_meV = other.energy_meV - line.energy_meV
            rows.append((line.upper, line.lower, line.wavelength_um, length, shift_um, shift_meV,
                         line.oscillator_strength))  # fmt: skip
        return {name: [row[n] for row in rows] for n, name in enumerate(names)}


def shifts_of(levels: Levels, stack: Stack, layers: Sequence[Pulsed]) -> Shifts:
    """Return what a digital stack makes of the levels of its design."""
    offset = _offset(levels, stack, layers)
    grown = _solved(levels, stack, offset)
    shared = _overlaps(levels, grown, layers)
    return Shifts(
        levels, grown, offset, shared, assign(shared**2, levels.groups, grown.groups)
    )


def _solved(levels: Levels, stack: Stack, offset: float) -> Levels:
    """Return the levels of the digital stack, as many as the design has at most."""
    below = None
    if len(levels) and levels.boxed.any():
        below = f"{float(levels.energies[-1]) + _ROOM - offset!r} eV"
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", BandwrightWarning)  # the result has them as cautions
        return solve(
            stack, below=below, at_most=max(len(levels), 1),
            tolerance=f"{levels.tolerance!r} eV", group=f"{levels.group!r} eV",
            bands=levels.profile.bands,
        )  # fmt: skip


def _offset(levels: Levels, stack: Stack, layers: Sequence[Pulsed]) -> float:
    """Return the zero of the digital stack, counted from that of the design [eV].

    Both are found from one material, by the edge at the first face.
    """
    design = levels.stack
    if design.zero is not None and not zero_is_lost(design, layers):
        return 0.0
    bands, common = levels.profile.bands, layers[0].ends.first
    known: dict[object, Built] = {}

    def first_edge(one: Stack) -> float:
        return float(build_profile(one, bands, known=known).sections[0].edge.value(0.0))

    def zero(one: Stack, own: float) -> float:
        return first_edge(one.replace(zero=common)) - own

    ours = float(levels.profile.sections[0].edge.value(0.0))
    return zero(stack, first_edge(stack)) - zero(design, ours)


def _overlaps(designed: Levels, grown: Levels, layers: Sequence[Pulsed]) -> Floats:
    """Return |<i|j>|, each layer laid on its pulses by fractions of its thickness."""
    ours, theirs = designed.states.sets, grown.states.sets
    if not ours or not theirs:
        return np.zeros((len(designed), len(grown)))
    grid = grid_for(theirs)
    profile = grown.profile
    thickness = profile.numbers.thickness[grid.section]
    z = profile.faces[grid.section] + grid.fraction * thickness
    faces, others = _faces(designed, layers)
    place = np.interp(z, others, faces)
    stretch = np.diff(faces) / np.diff(others)
    inside = np.clip(np.searchsorted(others, z, side="right") - 1, 0, len(stretch) - 1)
    root = np.sqrt(grid.weight * thickness * stretch[inside])

    def laid(states: States) -> Laid:
        parts = [part * root for part in states.components(place)]
        return Laid(np.concatenate(parts, axis=1), (states.beyond(0), states.beyond(1)))

    left, right = [laid(states) for states in ours], [lay(states, grid) for states in theirs]
    return np.asarray(np.abs(np.block([[product(a, b) for b in right] for a in left])))


def _faces(designed: Levels, layers: Sequence[Pulsed]) -> tuple[Floats, Floats]:
    """Return the faces of the grown layers of the design, and where they are among pulses [nm]."""
    pulsed = {one.number: one.grown_nm for one in layers}
    numbers = [number for _, number in designed.stack.grown()]
    here = [float(designed.profile.facts[n - 1].thickness) for n in numbers]
    there = [pulsed.get(n, thickness) for n, thickness in zip(numbers, here, strict=True)]
    return (np.concatenate([[0.0], np.cumsum(here)]), np.concatenate([[0.0], np.cumsum(there)]))
