"""What slices half as thick say of the levels found: their error, and that none is missing."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .find import Found, Solvable, random_vector
from .system import apply, chunks, solve_shifted

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]


class Proof(NamedTuple):
    """Whether the counts agree around each level (n_levels,), and at the bounds (n_designs,)."""

    checked: Flags
    complete: Flags


def halving_error(fine: Solvable, found: Found) -> Floats:
    """Estimate each error from one Rayleigh step on slices half as thick (factor 64/63)."""
    error = np.empty(len(found.energies))
    for part in chunks(len(error), fine.rows):
        matrix, slope = fine.matrix_and_slope(found.energies[part], found.owner[part])
        z = _refine(fine, found.nodes[:, part])
        z = np.where(found.single[part], z, random_vector(fine.nodes)[:, None])
        for _ in range(2):
            r = apply(slope, z)
            z = solve_shifted(matrix, r)
            scale = np.max(np.abs(z), axis=0)
            z, r = z / scale, r / scale
        error[part] = np.abs(np.sum(z * r, axis=0) / np.sum(z * apply(slope, z), axis=0))
    return error * 64.0 / 63.0


def _refine(fine: Solvable, nodes: Floats) -> Floats:
    """Carry u at the coarse free faces to those of halved slices, midpoints by the mean."""
    first, last = (int(end == "wall") for end in fine.ends)
    u = np.pad(nodes, [(first, last), (0, 0)])
    full = np.empty((2 * len(u) - 1, u.shape[1]))
    full[::2] = u
    full[1::2] = 0.5 * (u[:-1] + u[1:])
    return np.asarray(full[first : len(full) - last])


def certify(fine: Solvable, found: Found, low: Floats, high: Floats, tolerance: float) -> Proof:
    """Count on halved slices below and above each level or cluster, and at both bounds.

    Parameters
    ----------
    fine : Solvable
        The system on slices half as thick.
    found : Found
    low, high : array (n_designs,)
        Bounds [eV] of each design's set.
    tolerance : float
        How far from a level the counts are taken [eV].
    """
    energies, numbers, owner = found.energies, found.numbers, found.owner
    designs = np.arange(len(low))
    starts = np.ones(len(energies), dtype=bool)
    starts[1:] = (energies[1:] - energies[:-1] > 2.0 * tolerance) | (owner[1:] != owner[:-1])
    firsts = np.flatnonzero(starts)
    lasts = np.append(firsts[1:], len(energies))[: len(firsts)] - 1
    counted = fine.count_and_pivot(
        np.concatenate(
            (energies[firsts] - tolerance, energies[lasts] + tolerance,
             low, high - tolerance, high + tolerance)
        ),
        np.concatenate((owner[firsts], owner[lasts], designs, designs, designs)),
    )[0]  # fmt: skip
    n, groups = len(low), len(firsts)
    below, above = counted[:groups], counted[groups : 2 * groups]
    at_low, under, over = counted[2 * groups :].reshape(3, n)
    good = (below == numbers[firsts]) & (above == numbers[lasts] + 1)
    checked = good[np.cumsum(starts) - 1]
    size = np.bincount(owner, minlength=len(low))
    begin = np.array(at_low)
    begin[owner[firsts][::-1]] = numbers[firsts][::-1]
    end = begin + size
    complete = (at_low <= begin) & (under <= end) & ((end <= over) | (size == 0))
    complete[owner[~checked]] = False
    return Proof(checked, complete)
