"""States of different designs laid on each other, section by section, and their product.

A point is a section and a fraction of its thickness, so that a design whose layers are thicker
lies on the other without a shift. Each state is stretched to one thickness and keeps its norm:
equal states have a product of 1, and no product is larger.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .states import States, cells_for, gauss, rates

Floats = npt.NDArray[np.float64]


class Grid(NamedTuple):
    """Quadrature points: section, fraction of it, and weight as a fraction of it, (n_points,)."""

    section: npt.NDArray[np.int64]
    fraction: Floats
    weight: Floats


class Laid(NamedTuple):
    """States on a grid.

    ``inside`` holds u and partner times the root of the weight, (n_levels, 2 n_points);
    ``beyond`` what each outer face has outside: decay, u and partner.
    """

    inside: Floats
    beyond: tuple[tuple[Floats, Floats, Floats] | None, ...]


def grid_for(sets: Sequence[States]) -> Grid:
    """Return points fine enough for the states of all these sets, which have as many sections."""
    return Grid(*gauss(np.max([_cells(states) for states in sets], axis=0)))


def lay(states: States, grid: Grid) -> Laid:
    """Return states on a grid."""
    profile = states.system.slices.profile
    thickness = profile.numbers.thickness[grid.section]
    z = profile.faces[grid.section] + grid.fraction * thickness
    root = np.sqrt(grid.weight * thickness)
    inside = np.concatenate([part * root for part in states.components(z)], axis=1)
    return Laid(inside, (states.beyond(0), states.beyond(1)))


def product(one: Laid, two: Laid) -> Floats:
    """Return <i|j> of the states of both, (n_one, n_two)."""
    found = one.inside @ two.inside.T
    for here, there in zip(one.beyond, two.beyond, strict=True):
        if here is not None and there is not None:
            decay, u, partner = here
            other, v, second = there
            size = np.outer(u, v) + np.outer(partner, second)
            found += size / (decay[:, None] + other)
    return np.asarray(found)


def _cells(states: States) -> npt.NDArray[np.int64]:
    """Return how many cells each section needs for states, those with a tail alone as well."""
    system, profile = states.system, states.system.slices.profile
    energies = states.energies
    fastest = np.zeros(len(profile.sections))
    found = rates(system, float(energies.min()), float(energies.max()))
    np.maximum.at(fastest, system.slices.section, found)
    for end in (0, 1):
        tail = states.beyond(end)
        if tail is not None:
            fastest[-end] = max(fastest[-end], float(tail[0].max()))
    return cells_for(fastest * profile.numbers.thickness)
