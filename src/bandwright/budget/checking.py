"""Whole changes solved again: whether they are linear, and between the same two levels."""

from __future__ import annotations

import math
import warnings
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, BandwrightWarning, SolveError
from ..levels import Levels, solve
from ..lines import CONTINUUM, Line, continuum_edge
from ..parameters import shifted
from ..stack import Stack
from .changes import MODEL, Change
from .slopes import members
from .words import length_shift, wavelength_shift

Floats = npt.NDArray[np.float64]

#: a level that keeps less of itself (probability) over a whole change has mixed with another
SAME_LEVEL = 0.7
#: levels looked at beyond the upper one, in case others pass
PASSING = 4
#: a whole change is called linear if its shift is this near to it, relative or in eV
LINEAR, LINEAR_EV = 0.25, 0.5e-3
#: how far a level may rise in a change [eV]
ROOM = 0.1


def moved(stack: Stack, change: Change) -> Stack:
    """Return the changed stack.

    Raises
    ------
    BandwrightError
        If there is no such stack.
    """
    return shifted(stack, change.parameter.name, change.amount)


def _solved(levels: Levels, stack: Stack, line: Line, more: int = 0) -> Levels:
    """Return the lowest levels of another stack, up to the upper one of a line and ``more``."""
    group = members(levels, line.lower if line.upper == CONTINUUM else int(line.upper))
    below = float(levels.energies[group].max()) + ROOM
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", BandwrightWarning)  # said about the stack itself already
        return solve(
            stack,
            below=f"{below!r} eV",
            at_most=group.stop + more,
            tolerance=f"{levels.tolerance!r} eV",
            bands=levels.profile.bands,
        )


def _ends(found: Levels, levels: Levels, line: Line) -> Floats:
    """Return (upper, lower) energy [eV] of a line in another solution, levels by number."""
    ends = []
    for number in (line.upper, line.lower):
        if number == CONTINUUM:
            edge = continuum_edge(found)
            ends.append(math.nan if edge is None else edge)
        else:
            group = members(levels, int(number))
            if group.stop > len(found):
                raise SolveError(f"level {number} is no longer there")
            if not found.count_checked[group].all():
                raise SolveError(f"the counts do not agree around level {number}")
            ends.append(float(np.mean(found.energies[group])))
    return np.array(ends)


def abrupt_shift(levels: Levels, line: Line) -> tuple[float, str]:
    """Return how a line shifts [eV] if every interface becomes abrupt, solved; and a remark."""
    try:
        upper, lower = _ends(_solved(levels, levels.stack.abrupt(), line), levels, line)
    except BandwrightError as error:
        return math.nan, f"the abrupt stack has no such line: {error}"
    return upper - lower - line.energy_meV * 1e-3, ""


def remark_on(levels: Levels, line: Line, change: Change, shift: float, before: Sample) -> str:
    """Return what must be said of a whole change beside its linear shift, '' if nothing.

    ``before`` holds the states to be followed.
    """
    if change.parameter.kind in MODEL:
        return ""  # no stack has it as a number
    try:
        whole = moved(levels.stack, change)
        found = _solved(levels, whole, line, more=PASSING)
        upper, lower = _ends(found, levels, line)
    except BandwrightError as error:
        return f"only for a smaller change: {error}"
    ends = {line.upper: upper, line.lower: lower}
    said, parted = [], []
    for number in ends:
        if number == CONTINUUM:
            continue
        group = members(levels, int(number))
        places, kept = before.followed(found, group)
        if kept < SAME_LEVEL:
            return (
                f"level {number} crosses another on the way and mixes with it (keeps {kept:.0%}):"
                " compare the changed stack itself"
            )
        if places[0] != group.start:
            said.append(f"level {number} is level {places[0] + 1} then")
        spread = float(np.ptp(found.energies[places]))
        if spread > max(levels.group, LINEAR_EV):
            parted.append(f"those of level {number} by {spread * 1e3:.2g} meV")
        ends[number] = float(np.mean(found.energies[places]))
    whole = ends[line.upper] - ends[line.lower] - line.energy_meV * 1e-3
    if abs(whole - shift) > max(LINEAR_EV, LINEAR * abs(shift)):
        shown = length_shift(wavelength_shift(line, whole))
        said.insert(0, f"not linear, the whole change gives {shown}")
    if parted:
        said.append(f"the mean over copies that part, {' and '.join(parted)}")
    return "; ".join(said)


class Sample(NamedTuple):
    """States of all levels of a solution at fractional depths, to compare solutions by.

    A thicker layer is compared with itself. ``share`` is the number of depths in each section,
    ``u`` (n_levels, n_depths) is weighted so that rows have their products as overlaps.
    """

    share: npt.NDArray[np.int64]
    u: Floats

    @staticmethod
    def of(levels: Levels, share: npt.NDArray[np.int64] | None = None) -> Sample:
        """Return the states of a solution; without ``share``, at some 150 depths."""
        profile = levels.profile
        thickness = np.array([s.thickness for s in profile.sections])
        if share is None:
            share = np.maximum(6, np.rint(150.0 * thickness / thickness.sum())).astype(np.int64)
        width = np.repeat(thickness / share, share)
        inside = np.concatenate([np.arange(n) + 0.5 for n in share])
        z = np.repeat(profile.faces[:-1], share) + inside * width
        return Sample(share, levels.states.sample(z)[0] * np.sqrt(width))

    def followed(self, found: Levels, group: slice) -> tuple[list[int], float]:
        """Return which levels of another solution a group has become, and how surely.

        The levels (indices from 0) that lie most in the group's subspace, and the least part of
        them that does, 0 to 1.
        """
        if len(found.profile.sections) != len(self.share):
            return [group.start], 0.0
        other = Sample.of(found, self.share).u
        old = np.linalg.svd(self.u[group], full_matrices=False)[2]
        parts = np.sum((old @ other.T) ** 2, axis=0) / np.sum(other**2, axis=1)
        best = sorted(map(int, np.argsort(-parts, kind="stable")[: group.stop - group.start]))
        return best, float(parts[best].min())
