"""Derivatives of all levels by the changes of a budget, and which of them would meet."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError
from ..gradients import Gradient, couplings
from ..levels import Levels
from ..lines import CONTINUUM, Line
from .changes import Change

Floats = npt.NDArray[np.float64]

#: a neighbour that comes nearer by this part of its distance, or of the floor [eV], is said
NEARER, FLOOR = 0.5, 0.5e-3
#: how a remark that rests on slopes ends
CHECK = "error_budget(checked=True) solves the changed stack"


class Derivatives(NamedTuple):
    """dE by changes, in eV per unit of the parameter; nan where it can be moved to neither side.

    Attributes
    ----------
    ends : array (n_changes, 2)
        Of the upper and of the lower level of a line, a group of copies by its mean.
    levels : array (n_changes, n_levels)
    """

    ends: Floats
    levels: Floats


def derivatives(levels: Levels, line: Line, changes: Sequence[Change]) -> Derivatives:
    """Return dE of a line's ends and of all levels by each parameter; nothing is solved.

    Parameters
    ----------
    levels : Levels
    line : Line
        The upper level of an onset is the lower open edge; where both edges are equal, towards
        larger values.
    changes : sequence of Change
    """
    names = [change.parameter.name for change in changes]
    try:
        found: list[Gradient | None] = [levels.gradient(names)]
    except BandwrightError:  # one of them can't be moved: ask for each
        found = [_gradient(levels, name) for name in names]
    ends, every = [], []
    for gradient in found:
        if gradient is None:
            ends.append(np.full((1, 2), np.nan))
            every.append(np.full((1, len(levels)), np.nan))
        else:
            ends.append(np.array([gradient.of_row(e) for e in (line.upper, line.lower)]).T)
            every.append(gradient.energies.T)
    return Derivatives(np.concatenate(ends), np.concatenate(every))


def _gradient(levels: Levels, name: str) -> Gradient | None:
    try:
        return levels.gradient([name])
    except BandwrightError:
        return None


def meeting(levels: Levels, line: Line, shifts: Floats) -> str:
    """Return which level meets one of the line's in a change, as far as slopes tell, or ''.

    ``shifts`` (n_levels,) are those of all levels [eV].
    """
    for number in (line.upper, line.lower):
        if number == CONTINUUM:
            continue
        group = members(levels, int(number))
        energy, shift = levels.energies[group].mean(), shifts[group].mean()
        away = levels.energies - energy
        nearer = -(shifts - shift) * np.sign(away) / np.maximum(np.abs(away), FLOOR)
        nearer[group] = 0.0
        nearer[levels.of_box] = 0.0
        if len(nearer) and float(nearer.max()) > NEARER:
            other = int(np.argmax(nearer)) + 1
            return f"level {number} comes near level {other} by then: {CHECK}"
    return ""


def mixing(levels: Levels, line: Line, changes: Sequence[Change]) -> Floats:
    """Return what mixing with each other level adds to a line by each change [eV], to second order.

    (n_changes, n_levels); nothing is solved. Copies, and what can't be moved, are left out.
    """
    added = np.zeros((len(changes), len(levels)))
    amounts = np.array([change.amount for change in changes])
    for number, sign in ((line.upper, 1.0), (line.lower, -1.0)):
        group = slice(0, 0) if number == CONTINUUM else members(levels, int(number))
        if group.stop - group.start != 1:
            continue
        away = levels.energies[group.start] - levels.energies
        away[np.abs(away) < FLOOR] = np.inf
        try:
            moved = [change.parameter for change in changes]
            coupled = couplings(levels, moved, group.start) * amounts
        except BandwrightError:
            continue
        added += sign * (coupled**2 / away[:, None]).T
    return added


def members(levels: Levels, number: int) -> slice:
    """Return the levels of the row that a level number names."""
    return next(group for group in levels.groups if group.start + 1 == number)
