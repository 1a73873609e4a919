"""All levels of one system: brackets by count, then Newton for all of them at once."""

from __future__ import annotations

from functools import lru_cache
from typing import NamedTuple, Protocol

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from .matrix import Matrix
from .newton import newton
from .system import chunks

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

#: levels closer than this [eV] are refined together, as one subspace
CLUSTER = 1e-10
_ROUNDS = 6
# phase [rad] of a half wave, of wave numbers in units of 1/sqrt(h2m)
_PHASE = np.pi * np.sqrt(H2M)
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

    def of(self, designs: Indices) -> Asked:
        """Return what is asked of some designs."""
        low, high, skip, at_most, guess = self
        return Asked(low[designs], high[designs], skip[designs], at_most[designs], guess[designs])


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

    def matrix(self, energies: Floats, owner: Indices) -> Matrix:
        """Return K of each energy's design."""
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
        energies = np.where(single, energies, 0.5 * (lows + highs))
        single = _alone(owner, lows, highs)
    if not inner.all():
        owner, numbers, lows, highs = owner[inner], numbers[inner], lows[inner], highs[inner]
        energies, single = energies[inner], single[inner]
        start = None if start is None else start[:, inner]
    energies, count = energies.copy(), len(numbers)
    nodes, done = np.zeros((system.nodes, count)), np.zeros(count, dtype=bool)
    todo = np.flatnonzero(single)
    for _ in range(_ROUNDS):
        for part in chunks(len(todo), system.rows):
            some = part if len(todo) == count else todo[part]
            with np.errstate(all="ignore"):  # what divides by zero is not taken as reached
                energies[some], nodes[:, some], done[some] = newton(
                    system.matrix_and_slope, owner[some], energies[some], lows[some], highs[some],
                    accuracy, None if start is None else start[:, some],
                )  # fmt: skip
        if done.all():
            return Found(numbers, energies, nodes, done, owner)
        start = None
        todo = np.flatnonzero(single & ~done)
        if not len(todo):
            break
        lows[todo], highs[todo] = _narrowed(
            system, owner[todo], numbers[todo], lows[todo], highs[todo], 2
        )
        energies[todo] = 0.5 * (lows[todo] + highs[todo])
    rest = np.flatnonzero(~done)
    lows[rest], highs[rest] = _narrowed(
        system, owner[rest], numbers[rest], lows[rest], highs[rest], 20
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
    return np.atleast_1d((wave * thickness).sum(axis=-1) / _PHASE + 1.0).astype(np.int64)


def bracketed(system: Solvable, asked: Asked) -> Brackets:
    """Count on a grid of each design, and bracket every level asked."""
    owner, part, ends = _scan(tuple((5 * asked.guess + 16).tolist()))
    scanned = asked.low[owner] + (asked.high - asked.low)[owner] * part
    counts, pivots = system.count_and_pivot(scanned, owner)
    keys = np.maximum.accumulate(counts + _APART * owner)  # rounding at a level; no count falls
    first = keys[np.concatenate(([0], ends[:-1]))]
    owner, numbers, inner = _wanted(asked, first % _APART, keys[ends - 1] % _APART)
    index = keys.searchsorted(numbers + _APART * owner, side="right")
    lows, highs = scanned[index - 1], scanned[index]
    energies = _crossing(lows, highs, pivots[index - 1], pivots[index])
    return Brackets(owner, numbers, inner, lows, highs, energies)


@lru_cache(maxsize=64)
def _scan(sizes: tuple[int, ...]) -> tuple[Indices, Floats, Indices]:
    """Return each place's design, its share of the way up, and where each design's places end."""
    owner = np.repeat(np.arange(len(sizes)), sizes)
    part = np.concatenate([np.arange(size) / (size - 1) for size in sizes])
    return owner, part, np.cumsum(sizes)


def _wanted(asked: Asked, first: Indices, last: Indices) -> tuple[Indices, Indices, Flags]:
    """Return owner and number of the levels asked, and of neighbours just outside: not inner.

    ``first`` and ``last`` are the counts at the bounds of each design.
    """
    owner: list[int] = []
    numbers: list[int] = []
    inner: list[bool] = []
    for design, (skip, most, low, high) in enumerate(
        zip(asked.skip.tolist(), asked.at_most.tolist(), first.tolist(), last.tolist(),
            strict=True)
    ):  # fmt: skip
        begin = max(skip, low)
        size = min(high - begin, most)
        if size <= 0:
            continue
        before, after = begin > low, begin + size < high
        numbers += range(begin - before, begin + size + after)
        owner += [design] * (size + before + after)
        inner += [False] * before + [True] * size + [False] * after
    return (
        np.array(owner, dtype=np.int64), np.array(numbers, dtype=np.int64),
        np.array(inner, dtype=bool),
    )  # fmt: skip


def _crossing(lows: Floats, highs: Floats, first: Floats, last: Floats) -> Floats:
    """Return where the last pivot's chord passes zero in each bracket, kept off its ends."""
    with np.errstate(divide="ignore", invalid="ignore"):
        part = first / (first - last)
    part = np.where(np.abs(part - 0.5) < 0.48, part, 0.5)
    return np.asarray(lows + part * (highs - lows))


def _alone(owner: Indices, lows: Floats, highs: Floats) -> Flags:
    """Return whether each bracket shares no energies with its neighbours'."""
    alone = np.ones(len(lows), dtype=bool)
    shared = lows[1:] < highs[:-1]
    if shared.any():
        shared &= owner[1:] == owner[:-1]
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
        lows[some], highs[some] = _narrowed(
            system, owner[some], numbers[some], lows[some], highs[some], 1
        )
    return lows, highs


def _narrowed(
    system: Solvable, owner: Indices, numbers: Indices, lows: Floats, highs: Floats, times: int
) -> tuple[Floats, Floats]:
    """Cut brackets by counts to an eighth, so many times."""
    lows, highs = lows.copy(), highs.copy()
    for part in chunks(len(lows), system.rows * len(_PARTS)):
        low, high, column = lows[part], highs[part], np.arange(len(lows[part]))
        for _ in range(times):
            trial = low + _PARTS * (high - low)
            flat = np.broadcast_to(owner[part], trial.shape).reshape(-1)
            counts = system.count_and_pivot(trial.reshape(-1), flat)[0].reshape(trial.shape)
            above = np.maximum.accumulate(counts, axis=0) > numbers[part]
            floor = len(_PARTS) - above.sum(axis=0)  # how many points lie at or below the level
            ladder = np.vstack((low, trial, high))
            low, high = ladder[floor, column], ladder[floor + 1, column]
        lows[part], highs[part] = low, high
    return lows, highs
