"""Newton for the levels of many brackets at once, each to its own accuracy."""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .matrix import Matrix
from .system import Joint, dot

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]
Flags = npt.NDArray[np.bool_]

_STEPS = 7
# K is bent by at most about this much per eV, more only near an open end's edge: a Newton step s
# leaves an error of about s^2 times it [1/eV]
_BENT = 20.0


@lru_cache(maxsize=64)
def random_vector(nodes: int) -> Floats:
    """Return a random vector, the same each time: a symmetric start would miss odd levels."""
    rng = np.random.default_rng(20250101)
    return np.asarray(rng.uniform(0.5, 1.5, nodes) * rng.choice([-1.0, 1.0], nodes))


class _Place(NamedTuple):
    """Energies that K and its derivative were taken at."""

    energies: Floats
    matrix: Joint
    slope: Joint

    def rows(self, which: Flags) -> _Place:
        return _Place(self.energies[which], self.matrix.rows(which), self.slope.rows(which))


def newton(
    evaluate: Callable[[Floats, Indices], tuple[Matrix, Matrix]], owner: Indices,
    energies: Floats, lows: Floats, highs: Floats, accuracy: float, start: Floats | None,
) -> tuple[Floats, Floats, Flags]:  # fmt: skip
    """Newton on K(E) z = 0, from the second energy on by the cubic through K and K' at both.

    At each energy solves z = K^-1 r, r = K'z of the one before, turn the vector to the level's
    own, and -(z.r)/(z.K'z) is the way to the level. A level counts as reached if it stayed inside
    its bracket and what is unsure is small: what other levels' share of the vector does, and how
    far K bends. A step that leaves the bracket is a sign of a neighbour's vector. Each level
    stops on its own, whatever the others do.
    """
    found = vectors = energies
    done = np.zeros(len(energies), dtype=bool)
    act: Indices | None = None
    at, low, high = energies, lows, highs
    due = np.minimum(accuracy, 1e-4 * (highs - lows))  # crowded: a part of their distance
    before: _Place | None = None
    for _ in range(_STEPS):
        here = _Place(at, *(Joint.of(m) for m in evaluate(at, owner)))
        room = np.minimum(at - low, high - at)  # other levels are at least as far
        if before is None:
            r, last = _turned(here, start)
        else:
            last = None
        for _ in range(2):
            z = here.matrix.solve(r)
            value = dot(z, r)
            r = here.slope.apply(z)
            rate = dot(z, r)
            step = way = value / -rate
            if last is not None:  # twice the same way: other levels have no share left
                vague = np.abs(way - last)
            unsure = step * step
            if before is None:
                unsure *= _BENT + 0.25 / room
            else:
                vague = vague + unsure / room
                step, unsure = _cubic(before, at, z, value, rate)
            share = np.minimum(np.abs(way) / room, 1.0)
            vague = vague * share * share  # by so much a solve and its square lessen it
            moved = at + step
            inside = (moved >= low) & (moved <= high)
            good = inside & (unsure + vague < due)
            if last is not None or good.all():
                break
            last = way
        scale = 1.0 / np.sqrt(np.abs(rate))[:, None]
        z *= scale
        if act is None:
            found, vectors, done = moved, z, good
        else:
            found[act], vectors[act], done[act] = moved, z, good
        if good.all():
            break
        going = ~good
        if before is None:  # half the way if it leaves the bracket: the vector may be rough yet
            moved = np.where(inside, moved, 0.5 * (at + np.where(step > 0.0, high, low)))
        else:
            going &= inside
        before, at = here, moved
        r *= scale
        if not going.all():
            if not going.any():
                break
            act = np.flatnonzero(going) if act is None else act[going]
            at, low, high, due, r, vague = (v[going] for v in (at, low, high, due, r, vague))
            owner, before = owner[going], before.rows(going)
    return found, vectors.T, done


def _turned(here: _Place, start: Floats | None) -> tuple[Floats, Floats]:
    """Return r = K'z of vectors turned to the levels near here, and a first way to them.

    Without vectors to start from any one is taken, and turned once more.
    """
    if start is None:
        every = np.empty_like(here.matrix.diagonal)
        every[:] = random_vector(every.shape[1])
        z = here.matrix.solve(every)
    else:
        z = start.T.copy()
    last = here.slope.apply(z)
    z = here.matrix.solve(last)
    r = here.slope.apply(z)
    return r, dot(z, last) / -dot(z, r)


def _cubic(
    before: _Place, at: Floats, z: Floats, value: Floats, rate: Floats
) -> tuple[Floats, Floats]:
    """Return the step to the zero of the cubic through z.Kz and its slope here and before.

    The second array is how far the zero of the parabola through all but the value before lies
    from it.
    """
    way = at - before.energies
    first = (dot(z, before.matrix.apply(z)) - value) / way + rate
    second = rate - dot(z, before.slope.apply(z))
    bend, twist = (3.0 * first - second) / way, (2.0 * first - second) / (way * way)
    one = -value / rate
    two = -value / (rate + (bend + twist * one) * one)
    step = -value / (rate + (bend + twist * two) * two)
    return step, np.abs(step - two) + np.abs(1.5 * twist * way / rate) * step * step
