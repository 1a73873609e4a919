"""All levels of one system: brackets by count, Newton for all at once, Ritz for clusters."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.linalg import eigh

from bandwright.constants import H2M
from bandwright.errors import SolveError
from bandwright.solver.matrix import Matrix
from bandwright.solver.system import System, apply, chunks, solve_shifted

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: levels closer than this [eV] are refined together, as one subspace
CLUSTER = 1e-10
_RITZ_STEPS = 60
_NEWTON_STEPS = 8
_ROUNDS = 6


class Found(NamedTuple):
    """Levels of a system, ascending: energies (n,), u at all faces (n_faces, n), clusters.

    ``u`` is normalised in the model's own product. ``cluster`` (n,) gives the number of the
    first member for each level.
    """

    energies: Floats
    u: Floats
    cluster: Indices


def find(system: System, numbers: Indices, low: float, high: float) -> Found:
    """Return the levels with these numbers (counted from 0), which lie in (low, high).

    Parameters
    ----------
    system : System
    numbers : array of int
        Consecutive level numbers; ``count(low) <= number < count(high)`` for each.
    low, high : float
        Bounds [eV].
    """
    if not len(numbers):
        faces = len(system.slices.thickness) + 1
        return Found(np.zeros(0), np.zeros((faces, 0)), np.zeros(0, dtype=np.int64))
    scanned = np.linspace(low, high, 5 * len(numbers) + 16)
    counts = np.maximum.accumulate(system.count(scanned))
    place = np.searchsorted(counts, numbers, side="right")
    place = np.clip(place, 1, len(scanned) - 1)
    lows, highs = scanned[place - 1], scanned[place]
    lows, highs = _isolate(system, numbers, lows, highs)
    single = _single(lows, highs)
    energies = 0.5 * (lows + highs)
    nodes = np.zeros((system.matrix(energies[:1]).diagonal.shape[0], len(numbers)))
    done = np.zeros(len(numbers), dtype=bool)
    for _ in range(_ROUNDS):
        todo = np.flatnonzero(single & ~done)
        if not len(todo):
            break
        for part in chunks(len(todo), len(nodes)):
            some = todo[part]
            energies[some], nodes[:, some], done[some] = _newton(
                system, energies[some], lows[some], highs[some]
            )
        left = np.flatnonzero(single & ~done)
        if len(left):
            lows[left], highs[left] = _bisect(system, numbers[left], lows[left], highs[left], 6)
            energies[left] = 0.5 * (lows[left] + highs[left])
    rest = np.flatnonzero(~done)
    if len(rest):
        lows[rest], highs[rest] = _bisect(system, numbers[rest], lows[rest], highs[rest], 60)
        energies[rest] = 0.5 * (lows[rest] + highs[rest])
    cluster = _clusters(energies, CLUSTER)
    for first in np.unique(cluster):
        members = np.flatnonzero(cluster == first)
        if len(members) > 1 or not done[members[0]]:
            room = _room(energies, int(members[0]), int(members[-1]))
            energies[members], nodes[:, members] = _ritz(system, energies[members], room)
    return Found(energies, system.full(nodes), cluster)


def _single(lows: Floats, highs: Floats) -> npt.NDArray[np.bool_]:
    """Whether each bracket is apart from both neighbours' and wide enough to be a cluster's."""
    alone = np.ones(len(lows), dtype=bool)
    shared = lows[1:] < highs[:-1]
    alone[1:] &= ~shared
    alone[:-1] &= ~shared
    return alone


def _isolate(
    system: System, numbers: Indices, lows: Floats, highs: Floats
) -> tuple[Floats, Floats]:
    """Halve brackets until each holds one level, or is a quarter of `CLUSTER` wide."""
    for _ in range(80):
        wide = ~_single(lows, highs) & (highs - lows > 0.25 * CLUSTER)
        if not wide.any():
            break
        lows[wide], highs[wide] = _bisect(system, numbers[wide], lows[wide], highs[wide], 1)
    return lows, highs


def _bisect(
    system: System, numbers: Indices, lows: Floats, highs: Floats, times: int
) -> tuple[Floats, Floats]:
    lows, highs = lows.copy(), highs.copy()
    for _ in range(times):
        middle = 0.5 * (lows + highs)
        points, where = np.unique(middle, return_inverse=True)
        above = system.count(points)[where] > numbers
        highs = np.where(above, middle, highs)
        lows = np.where(above, lows, middle)
    return lows, highs


def _start(nodes: int, columns: int) -> Floats:
    """Random vectors, the same each time: a symmetric start would miss odd levels."""
    column = np.random.default_rng(20250101).uniform(0.5, 1.5, nodes)
    sign = np.random.default_rng(7).choice([-1.0, 1.0], nodes)
    return np.repeat((column * sign)[:, None], columns, axis=1)


def _newton(
    system: System, energies: Floats, lows: Floats, highs: Floats
) -> tuple[Floats, Floats, npt.NDArray[np.bool_]]:
    """Newton on K(E) z = 0: mu = -(z.r)/(z.K'z) with z = K^-1 r, r = K'z of the step before."""
    energies = energies.copy()
    matrix, slope = system.matrix_and_slope(energies)
    z = solve_shifted(matrix, _start(len(matrix.diagonal), len(energies)))
    inside = np.ones(len(energies), dtype=bool)
    step = np.full(len(energies), np.inf)
    for _ in range(_NEWTON_STEPS):
        z /= np.max(np.abs(z), axis=0)
        r = apply(slope, z)
        z = solve_shifted(matrix, r)
        step = -np.sum(z * r, axis=0) / np.sum(z * apply(slope, z), axis=0)
        moved = energies + step
        inside = (moved >= lows) & (moved <= highs)
        energies = np.where(inside, moved, energies)
        small = np.abs(step) < 4e-15 * (1.0 + np.abs(energies)) + 1e-13
        if np.all(small | ~inside):
            break
        matrix, slope = system.matrix_and_slope(energies)
    norm = -H2M * np.sum(z * apply(slope, z), axis=0)
    done = inside & (np.abs(step) < 1e-10) & (norm > 0)
    with np.errstate(invalid="ignore"):
        z = z / np.sqrt(np.abs(norm))
    return energies, _signed(z), done


def _signed(z: Floats) -> Floats:
    """Give each vector the sign that makes its first sizeable lobe positive."""
    large = np.abs(z) > 0.3 * np.max(np.abs(z), axis=0)
    first = np.argmax(large, axis=0)
    return np.asarray(z * np.sign(z[first, np.arange(z.shape[1])]))


def _clusters(energies: Floats, width: float) -> Indices:
    """Return the first member's number of each level's cluster, neighbours within ``width``."""
    starts = np.concatenate(([True], np.diff(energies) > width))
    return np.asarray(np.flatnonzero(starts)[np.cumsum(starts) - 1], dtype=np.int64)


def _room(energies: Floats, first: int, last: int) -> float:
    """Return how far the nearest level outside first..last is; at least `CLUSTER`."""
    below = energies[first] - energies[first - 1] if first else 1e-6
    above = energies[last + 1] - energies[last] if last + 1 < len(energies) else 1e-6
    return float(max(CLUSTER, min(below, above)))


def _ritz(system: System, energies: Floats, room: float) -> tuple[Floats, Floats]:
    """Refine a cluster: block inverse iterations with -K' as mass, then a small eigenproblem.

    ``room`` is the distance to the nearest level outside the cluster [eV]. The shift stands just
    below the cluster, so that K is linear in E across it and the members grow alike.
    """
    size = len(energies)
    spread = float(energies[-1] - energies[0])
    shift = float(energies[0]) - 0.5 * spread - min(1e-10, 0.1 * room)
    matrix, slope = (_repeat(m, size) for m in system.matrix_and_slope(np.array([shift])))
    z = np.random.default_rng(11).uniform(-1.0, 1.0, (len(matrix.diagonal), size))
    before = np.full(size, np.inf)
    mu = np.zeros(size)
    for _ in range(_RITZ_STEPS):
        z = solve_shifted(matrix, -apply(slope, z))
        z = _orthonormal(z, -apply(slope, z))
        small = z.T @ apply(matrix, z)
        mass = -(z.T @ apply(slope, z))
        mu, mix = eigh(0.5 * (small + small.T), 0.5 * (mass + mass.T))
        z = z @ mix
        if np.max(np.abs(mu - before)) < 1e-16 + 1e-3 * spread:
            break
        before = mu
    if np.max(np.abs(shift + mu - energies)) > 1e-11:
        raise SolveError(
            f"{size} levels near {energies[0]:.9f} eV could not be told apart from each other and"
            " from their neighbours"
        )
    return np.asarray(shift + mu), _signed(z / np.sqrt(H2M))


def _repeat(matrix: Matrix, size: int) -> Matrix:
    """Return one energy's matrix once for each vector."""
    return Matrix(
        np.repeat(matrix.diagonal, size, axis=1),
        np.repeat(matrix.off, size, axis=1),
        np.repeat(matrix.clamped, size),
    )


def _orthonormal(z: Floats, mz: Floats) -> Floats:
    """Orthonormalise columns in the product z.Mz, twice for stability."""
    gram = z.T @ mz
    scale = 1.0 / np.sqrt(np.diag(gram))
    gram = gram * scale[:, None] * scale
    values, vectors = eigh(0.5 * (gram + gram.T))
    values = np.maximum(values, 1e-14)
    return np.asarray((z * scale) @ (vectors / np.sqrt(values)))
