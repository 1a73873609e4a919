"""All levels of one system: brackets by count, then Newton for all of them at once."""

from __future__ import annotations

from functools import lru_cache
from typing import NamedTuple, Protocol

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from .matrix import Matrix
from .system import apply, chunks, solve_shifted

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

#: levels closer than this [eV] are refined together, as one subspace
CLUSTER = 1e-10
_NEWTON_STEPS = 7
_ROUNDS = 6
# K is bent by about this much per eV: a Newton step s leaves an error of about s^2 times it [1/eV]
_BENT = 20.0
#: keeps the counts of different designs apart in one sorted array
_APART = 1 << 32
#: where a crowded bracket is counted
_PARTS = np.arange(1, 8)[:, None] / 8.0


class Found(NamedTuple):
    """Levels of a system, ascending: numbers from 0, energies (n,), rough u at the free faces.

    ``single`` says whether Newton reached the level alone; others are members of clusters.
    ``owner`` is the design each level belongs to, 0 for a system of one.
    """

    numbers: Indices
    energies: Floats
    nodes: Floats
    single: Flags
    owner: Indices

    def part(self, which: slice) -> Found:
        """Return the levels of one design of many, as a system of one has them."""
        return Found(
            self.numbers[which], self.energies[which], self.nodes[:, which], self.single[which],
            np.zeros(which.stop - which.start, dtype=np.int64),
        )  # fmt: skip


class Asked(NamedTuple):
    """What is asked of each design of a system; arrays (n_designs,).

    Levels between ``low`` and ``high`` [eV], those numbered below ``skip`` left out, at most
    ``at_most`` of the rest. ``guess`` is about how many levels there are.
    """

    low: Floats
    high: Floats
    skip: Indices
    at_most: Indices
    guess: Indices


class Brackets(NamedTuple):
    """Where each level is looked for, design after design, ascending; arrays (n_levels,).

    ``inner`` says which are wanted: neighbours just outside what is asked may come along, for
    crowded brackets to see them. A level lies between ``lows`` and ``highs`` [eV] by count, and
    near ``energies``. ``nodes`` (n_nodes, n_levels) are rough u at the free faces, if known.
    """

    owner: Indices
    numbers: Indices
    inner: Flags
    lows: Floats
    highs: Floats
    energies: Floats
    nodes: Floats | None = None


class Solvable(Protocol):
    """What levels are found in: one sliced design, or a family of designs of one pattern."""

    @property
    def ends(self) -> tuple[str, str]:
        """``"open"`` or ``"wall"`` at both ends."""
        ...

    @property
    def nodes(self) -> int:
        """Number of free faces."""
        ...

    @property
    def rows(self) -> int:
        """Number of slices."""
        ...

    def count_and_pivot(self, energies: Floats, owner: Indices) -> tuple[Indices, Floats]:
        """Return how many levels of each energy's design lie below it, and K's last pivot."""
        ...

    def matrix_and_slope(self, energies: Floats, owner: Indices) -> tuple[Matrix, Matrix]:
        """Return K of each energy's design, and its derivative by E."""
        ...


def find(system: Solvable, asked: Asked, accuracy: float) -> Found:
    """Return the levels asked of a system, design after design.

    Parameters
    ----------
    system : Solvable
    asked : Asked
    accuracy : float
        How well the zeros of K are met [eV].
    """
    return refine(system, bracketed(system, asked), accuracy)


def refine(system: Solvable, brackets: Brackets, accuracy: float) -> Found:
    """Return the wanted levels of these brackets.

    Parameters
    ----------
    system : Solvable
    brackets : Brackets
    accuracy : float
        How well the zeros of K are met [eV].
    """
    owner, numbers, inner, lows, highs, energies, start = brackets
    single = _alone(owner, lows, highs)
    if not single.all():
        lows, highs = _isolate(system, owner, numbers, lows, highs)
        energies[~single] = 0.5 * (lows + highs)[~single]
        single = _alone(owner, lows, highs)
    if not inner.all():
        owner, numbers, lows, highs = owner[inner], numbers[inner], lows[inner], highs[inner]
        energies, single = energies[inner], single[inner]
        start = None if start is None else start[:, inner]
    nodes = np.zeros((system.nodes, len(numbers)))
    done = np.zeros(len(numbers), dtype=bool)
    for _ in range(_ROUNDS):
        todo = np.flatnonzero(single & ~done)
        if not len(todo):
            break
        for part in chunks(len(todo), system.rows):
            some = todo[part]
            energies[some], nodes[:, some], done[some] = _newton(
                system, owner[some], energies[some], lows[some], highs[some], accuracy,
                None if start is None else start[:, some],
            )  # fmt: skip
        start = None
        left = np.flatnonzero(single & ~done)
        if len(left):
            lows[left], highs[left] = _bisect(
                system, owner[left], numbers[left], lows[left], highs[left], 6
            )
            energies[left] = 0.5 * (lows[left] + highs[left])
    rest = np.flatnonzero(~done)
    if len(rest):
        lows[rest], highs[rest] = _bisect(
            system, owner[rest], numbers[rest], lows[rest], highs[rest], 60
        )
        energies[rest] = 0.5 * (lows[rest] + highs[rest])
    late = (energies[1:] < energies[:-1]) & (owner[1:] == owner[:-1])
    if late.any():  # members of a cluster, apart by rounding
        energies[1:][late] = energies[:-1][late]
    return Found(numbers, energies, nodes, done, owner)


def guess_levels(
    thickness: Floats, edge: Floats, mass: Floats, inverse_gap: Floats, high: Floats | float
) -> Indices:
    """Return about how many levels lie below ``high``, from the phase across all slices.

    Arrays have the slices along the last axis.
    """
    above = np.maximum(np.asarray(high)[..., None] - edge, 0.0)
    wave = np.sqrt(mass * (1.0 + above * inverse_gap) * above)
    phase = (wave * thickness).sum(axis=-1) / (np.pi * np.sqrt(H2M))
    return np.atleast_1d(phase).astype(np.int64) + 1


def bracketed(system: Solvable, asked: Asked) -> Brackets:
    """Count on a grid of each design, and bracket every level asked."""
    sizes = 5 * asked.guess + 16
    ends = np.cumsum(sizes)
    starts = ends - sizes
    owner = np.repeat(np.arange(len(sizes)), sizes)
    part = (np.arange(len(owner)) - starts[owner]) / (sizes - 1)[owner]
    scanned = asked.low[owner] + (asked.high - asked.low)[owner] * part
    counts, pivots = system.count_and_pivot(scanned, owner)
    keys = counts + _APART * owner
    if (keys[1:] < keys[:-1]).any():  # rounding at a level; a count never falls
        keys = np.maximum.accumulate(keys)
    first, last = keys[starts] % _APART, keys[ends - 1] % _APART
    begin = np.maximum(asked.skip, first)
    size = np.clip(last - begin, 0, asked.at_most)
    before = (size > 0) & (begin > first)
    after = (size > 0) & (begin + size < last)
    begin, size = begin - before, size + before + after
    owner = np.repeat(np.arange(len(size)), size)
    place = np.arange(len(owner)) - (np.cumsum(size) - size)[owner]
    numbers = begin[owner] + place
    inner = np.ones(len(owner), dtype=bool)
    if before.any() or after.any():
        inner = ~((before[owner] & (place == 0)) | (after[owner] & (place == (size - 1)[owner])))
    index = np.searchsorted(keys, numbers + _APART * owner, side="right")
    lows, highs = scanned[index - 1], scanned[index]
    energies = _crossing(lows, highs, pivots[index - 1], pivots[index])
    return Brackets(owner, numbers, inner, lows, highs, energies)


def _crossing(lows: Floats, highs: Floats, first: Floats, last: Floats) -> Floats:
    """Return where the last pivot's chord passes zero in each bracket, kept off its ends."""
    with np.errstate(divide="ignore", invalid="ignore"):
        part = first / (first - last)
    part = np.where((part > 0.02) & (part < 0.98), part, 0.5)
    return np.asarray(lows + part * (highs - lows))


def _alone(owner: Indices, lows: Floats, highs: Floats) -> Flags:
    """Return whether each bracket shares no energies with its neighbours'."""
    alone = np.ones(len(lows), dtype=bool)
    shared = (lows[1:] < highs[:-1]) & (owner[1:] == owner[:-1])
    alone[1:] &= ~shared
    alone[:-1] &= ~shared
    return alone


def _isolate(
    system: Solvable, owner: Indices, numbers: Indices, lows: Floats, highs: Floats
) -> tuple[Floats, Floats]:
    """Cut brackets that hold several levels, until each holds one or is narrower than a cluster."""
    lows, highs = lows.copy(), highs.copy()
    for _ in range(60):
        wide = ~_alone(owner, lows, highs) & (highs - lows > 0.25 * CLUSTER)
        some = np.flatnonzero(wide)
        if not len(some):
            break
        for part in chunks(len(some), system.rows * len(_PARTS)):
            here = some[part]
            trial = lows[here] + _PARTS * (highs - lows)[here]
            flat = np.broadcast_to(owner[here], trial.shape).reshape(-1)
            counts = system.count_and_pivot(trial.reshape(-1), flat)[0].reshape(trial.shape)
            above = np.maximum.accumulate(counts, axis=0) > numbers[here]
            column = np.arange(len(here))
            floor = len(_PARTS) - above.sum(axis=0)  # how many points lie at or below the level
            ladder = np.vstack((lows[here], trial, highs[here]))
            lows[here], highs[here] = ladder[floor, column], ladder[floor + 1, column]
    return lows, highs


def _bisect(
    system: Solvable, owner: Indices, numbers: Indices, lows: Floats, highs: Floats, times: int
) -> tuple[Floats, Floats]:
    lows, highs = lows.copy(), highs.copy()
    for _ in range(times):
        middle = 0.5 * (lows + highs)
        above = system.count_and_pivot(middle, owner)[0] > numbers
        highs = np.where(above, middle, highs)
        lows = np.where(above, lows, middle)
    return lows, highs


@lru_cache(maxsize=64)
def random_vector(nodes: int) -> Floats:
    """Return a random vector, the same each time: a symmetric start would miss odd levels."""
    rng = np.random.default_rng(20250101)
    return np.asarray(rng.uniform(0.5, 1.5, nodes) * rng.choice([-1.0, 1.0], nodes))


def _newton(
    system: Solvable, owner: Indices, energies: Floats, lows: Floats, highs: Floats,
    accuracy: float, start: Floats | None,
) -> tuple[Floats, Floats, Flags]:  # fmt: skip
    """Newton on K(E) z = 0: mu = -(z.r)/(z.K'z) with z = K^-1 r, r = K'z of the step before.

    Its error after a step s is about s^2 times `_BENT` plus one over the distance to the
    neighbours. A level counts as reached if it stayed inside its bracket; a step that leaves it
    is a sign of a neighbour's vector. Each level stops on its own, whatever the others do.
    """
    energies = energies.copy()
    width = highs - lows
    narrow = _BENT + 4.0 / width
    accurate = np.minimum(accuracy, 1e-4 * width)  # crowded levels to a part of their distance
    vectors = np.empty((system.nodes, len(energies)))
    done = np.zeros(len(energies), dtype=bool)
    act = np.arange(len(energies))
    r = np.repeat(random_vector(system.nodes)[:, None], len(energies), axis=1)
    known = start is not None
    for turn in range(_NEWTON_STEPS):
        matrix, slope = system.matrix_and_slope(energies[act], owner[act])
        if start is not None and turn == 0:
            r = apply(slope, start)
        z = solve_shifted(matrix, r)
        if turn == 0 and not known:
            r = apply(slope, z)
            z = solve_shifted(matrix, r)
        after = apply(slope, z)
        rayleigh = (z * after).sum(axis=0)
        step = (z * r).sum(axis=0) / -rayleigh
        moved = energies[act] + step
        inside = (moved >= lows[act]) & (moved <= highs[act])
        energies[act] = np.where(inside, moved, energies[act])
        scale = np.sqrt(np.abs(rayleigh))
        z, r = z / scale, after / scale
        if turn == 0 and not known:
            continue
        good = step * step * narrow[act] < accurate[act]
        vectors[:, act] = z
        done[act] = inside & good
        going = inside & ~good
        if not going.any():
            break
        if not going.all():
            act, r = act[going], r[:, going]
    return energies, vectors, done
