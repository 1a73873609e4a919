"""What slices half as thick say of the levels found: their error, and that none is missing."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .find import Found, Solvable
from .matrix import Matrix
from .newton import random_vector
from .system import Joint, apply, chunks, dot

Floats = npt.NDArray[np.float64]
Flags = npt.NDArray[np.bool_]
Indices = npt.NDArray[np.int64]


class Proof(NamedTuple):
    """Whether the counts agree around each level (n_levels,), and at the bounds (n_designs,)."""

    checked: Flags
    complete: Flags


def halving_error(fine: Solvable, found: Found) -> Floats:
    """Estimate each error from slices half as thick: to first order, times 64/63.

    With u at the faces of whole slices and K(E) u at the middles zero, -(u.Ku)/(u.K'u) is the way
    to the level of the halved slices. A vector that is not known is found first.
    """
    error = np.empty(len(found.energies))
    for part in chunks(len(error), fine.rows):
        energies, owner = found.energies[part], found.owner[part]
        if found.single[part].all():
            matrix = fine.matrix(energies, owner)
            u = _between(matrix, found.nodes[:, part], fine.ends)
            error[part] = np.abs((u * apply(matrix, u)).sum(axis=0))  # u.K'u is -1
        else:
            error[part] = _inverse_error(fine, energies, owner)
    return error * 64.0 / 63.0


def _inverse_error(fine: Solvable, energies: Floats, owner: Indices) -> Floats:
    """Return how far each level of halved slices is, by inverse iteration from any vector."""
    matrix, slope = (Joint.of(m) for m in fine.matrix_and_slope(energies, owner))
    z = np.empty_like(matrix.diagonal)
    z[:] = random_vector(fine.nodes)
    for _ in range(3):
        r = slope.apply(z)
        r /= np.abs(r).max(axis=1)[:, None]
        z = matrix.solve(r)
    return np.abs(dot(z, r) / dot(z, slope.apply(z)))


def _between(matrix: Matrix, nodes: Floats, ends: tuple[str, str]) -> Floats:
    """Carry u at whole slices' free faces to those of halved ones, K(E) u = 0 at the middles."""
    first, last = (int(end == "wall") for end in ends)
    u = np.pad(nodes, [(first, last), (0, 0)])
    off = np.pad(matrix.off, [(first, last), (0, 0)])
    full = np.empty((2 * len(u) - 1, u.shape[1]))
    full[::2] = u
    full[1::2] = (off[::2] * u[:-1] + off[1::2] * u[1:]) / -matrix.diagonal[1 - first :: 2]
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
    apart = (energies[1:] - energies[:-1] > 2.0 * tolerance) | (owner[1:] != owner[:-1])
    firsts: Indices | slice = slice(None)
    lasts, group = firsts, firsts
    if not apart.all():
        starts = np.concatenate(([True], apart))
        firsts, group = np.flatnonzero(starts), np.cumsum(starts) - 1
        lasts = np.append(firsts[1:], len(energies)) - 1
    first, last, mine = numbers[firsts], numbers[lasts], owner[firsts]
    counted = fine.count_and_pivot(
        np.concatenate(
            (energies[firsts] - tolerance, energies[lasts] + tolerance,
             low, high - tolerance, high + tolerance)
        ),
        np.concatenate((mine, mine, designs, designs, designs)),
    )[0]  # fmt: skip
    groups = len(first)
    at_low, under, over = counted[2 * groups :].reshape(3, len(low))
    good = (counted[:groups] == first) & (counted[groups : 2 * groups] == last + 1)
    size = np.bincount(owner, minlength=len(low))
    begin = np.array(at_low)
    begin[mine[::-1]] = first[::-1]  # the first of each design comes last, and stays
    end = begin + size
    complete = (at_low <= begin) & (under <= end) & ((end <= over) | (size == 0))
    if good.all():
        return Proof(np.ones(len(energies), dtype=bool), complete)
    checked = good[group]
    complete[owner[~checked]] = False
    return Proof(checked, complete)
