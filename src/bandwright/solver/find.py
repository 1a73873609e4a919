"""All levels of one system: brackets by count, then Newton for all of them at once."""

from __future__ import annotations

from functools import lru_cache
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from bandwright.constants import H2M
from bandwright.errors import SolveError
from bandwright.solver.system import System, apply, chunks, solve_shifted

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

#: levels closer than this [eV] are refined together, as one subspace
CLUSTER = 1e-10
_NEWTON_STEPS = 7
_ROUNDS = 6
# K is bent by about this much per eV: a Newton step s leaves an error of about s^2 times it [1/eV]
_BENT = 20.0


class Found(NamedTuple):
    """Levels of a system, ascending: numbers from 0, energies (n,), rough u at the free faces.

    ``single`` says whether Newton reached the level alone; others are members of clusters.
    """

    numbers: Indices
    energies: Floats
    nodes: Floats
    single: Flags


def find(
    system: System, low: float, high: float, skip: int, at_most: int | None, accuracy: float
) -> Found:
    """Return the levels between two energies.

    Parameters
    ----------
    system : System
    low, high : float
        Bounds [eV].
    skip : int
        Level numbers below this one are left out.
    at_most : int or None
        Most levels returned, from the lowest.
    accuracy : float
        How well the zeros of K are met [eV].
    """
    scanned = np.linspace(low, high, 5 * _guess(system, high) + 16)
    counts, pivots = system.count_and_pivot(scanned)
    if (counts[1:] < counts[:-1]).any():  # rounding at a level; a count never falls
        counts = np.maximum.accumulate(counts)
    first, last = int(counts[0]), int(counts[-1])
    numbers = np.arange(max(skip, first), last)[:at_most]
    if not len(numbers):
        return Found(numbers, np.zeros(0), np.zeros((system.nodes, 0)), np.zeros(0, dtype=bool))
    before, after = int(numbers[0] > first), int(numbers[-1] < last - 1)
    wide = np.arange(numbers[0] - before, numbers[-1] + 1 + after)  # the neighbours left out, too
    place = np.searchsorted(counts, wide, side="right")
    lows, highs = scanned[place - 1], scanned[place]
    energies = _crossing(lows, highs, pivots[place - 1], pivots[place])
    single = _alone(lows, highs)
    if not single.all():
        lows, highs = _isolate(system, wide, lows, highs)
        energies[~single] = 0.5 * (lows + highs)[~single]
        single = _alone(lows, highs)
    if before or after:
        inner = slice(before, len(wide) - after)
        lows, highs, energies, single = lows[inner], highs[inner], energies[inner], single[inner]
    nodes = np.zeros((system.nodes, len(numbers)))
    done = np.zeros(len(numbers), dtype=bool)
    for _ in range(_ROUNDS):
        todo = np.flatnonzero(single & ~done)
        if not len(todo):
            break
        for part in chunks(len(todo), len(nodes)):
            some = todo[part]
            energies[some], nodes[:, some], done[some] = _newton(
                system, energies[some], lows[some], highs[some], accuracy
            )
        left = np.flatnonzero(single & ~done)
        if len(left):
            lows[left], highs[left] = _bisect(system, numbers[left], lows[left], highs[left], 6)
            energies[left] = 0.5 * (lows[left] + highs[left])
    rest = np.flatnonzero(~done)
    if len(rest):
        lows[rest], highs[rest] = _bisect(system, numbers[rest], lows[rest], highs[rest], 60)
        energies[rest] = 0.5 * (lows[rest] + highs[rest])
    if (energies[1:] < energies[:-1]).any():
        worst = float(np.max(energies[:-1] - energies[1:]))
        if worst > 1e-9:
            raise SolveError(f"levels came out of order by {worst:g} eV; please report this stack")
        energies = np.maximum.accumulate(energies)
    return Found(numbers, energies, nodes, done)


def _guess(system: System, high: float) -> int:
    """Return about how many levels lie below ``high``, from the phase across all slices."""
    slices = system.slices
    above = np.maximum(high - slices.edge, 0.0)
    wave = np.sqrt(slices.mass * (1.0 + above * slices.inverse_gap) * above)
    return int(np.dot(wave, slices.thickness) / (np.pi * np.sqrt(H2M))) + 1


def _crossing(lows: Floats, highs: Floats, first: Floats, last: Floats) -> Floats:
    """Return where the last pivot's chord passes zero in each bracket, kept off its ends."""
    with np.errstate(divide="ignore", invalid="ignore"):
        part = first / (first - last)
    part = np.where((part > 0.02) & (part < 0.98), part, 0.5)
    return np.asarray(lows + part * (highs - lows))


def _alone(lows: Floats, highs: Floats) -> Flags:
    """Return whether each bracket shares no energies with its neighbours'."""
    alone = np.ones(len(lows), dtype=bool)
    shared = lows[1:] < highs[:-1]
    alone[1:] &= ~shared
    alone[:-1] &= ~shared
    return alone


def _isolate(
    system: System, numbers: Indices, lows: Floats, highs: Floats
) -> tuple[Floats, Floats]:
    """Cut brackets that hold several levels, until each holds one or is narrower than a cluster.

    Each round puts a few energies for each level into every such bracket and counts them all.
    """
    for _ in range(60):
        wide = np.flatnonzero(~_alone(lows, highs) & (highs - lows > 0.25 * CLUSTER))
        if not len(wide):
            break
        starts, first = np.unique(lows[wide], return_index=True)
        stops = highs[wide][first]
        holds = np.bincount(np.searchsorted(starts, lows[wide]), minlength=len(starts))
        points = [
            np.linspace(a, b, 3 * int(k) + 2)[1:-1]
            for a, b, k in zip(starts, stops, holds, strict=True)
        ]
        trial = np.unique(np.concatenate(points))
        counts = np.maximum.accumulate(system.count(trial))
        place = np.searchsorted(counts, numbers[wide], side="right")
        floor = np.append(-np.inf, trial)[place]
        roof = np.append(trial, np.inf)[place]
        lows[wide] = np.maximum(lows[wide], floor)
        highs[wide] = np.minimum(highs[wide], roof)
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


@lru_cache(maxsize=64)
def random_vector(nodes: int) -> Floats:
    """Return a random vector, the same each time: a symmetric start would miss odd levels."""
    rng = np.random.default_rng(20250101)
    return np.asarray(rng.uniform(0.5, 1.5, nodes) * rng.choice([-1.0, 1.0], nodes))


def _newton(
    system: System, energies: Floats, lows: Floats, highs: Floats, accuracy: float
) -> tuple[Floats, Floats, Flags]:
    """Newton on K(E) z = 0: mu = -(z.r)/(z.K'z) with z = K^-1 r, r = K'z of the step before.

    Its error after a step s is about s^2 times `_BENT` plus one over the distance to the
    neighbours. A level counts as reached if it stayed inside its bracket; a step that leaves it
    is a sign of a neighbour's vector.
    """
    r = np.repeat(random_vector(system.nodes)[:, None], len(energies), axis=1)
    width = highs - lows
    narrow = _BENT + 4.0 / width
    accurate = np.minimum(accuracy, 1e-4 * width)  # crowded levels to a part of their distance
    for turn in range(_NEWTON_STEPS):
        matrix, slope = system.matrix_and_slope(energies)
        z = solve_shifted(matrix, r)
        if turn == 0:
            r = apply(slope, z)
            z = solve_shifted(matrix, r)
        after = apply(slope, z)
        rayleigh = (z * after).sum(axis=0)
        step = (z * r).sum(axis=0) / -rayleigh
        moved = energies + step
        inside = (moved >= lows) & (moved <= highs)
        energies = np.where(inside, moved, energies)
        scale = np.sqrt(np.abs(rayleigh))
        z, r = z / scale, after / scale
        left = step * step * narrow
        if turn and ((left < accurate) | ~inside).all():
            break
    return energies, z, inside & (left < accurate)
