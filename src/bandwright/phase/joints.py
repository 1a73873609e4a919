"""Neighbouring sections that are one smooth curve, taken as one section.

A cut inside a smooth stretch must not change the phase integral: what a turning point, an edge
or the bottom of a well adds depends on the curve around it, not on where sections end.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
import numpy.typing as npt

from ..profile import Curve, Polynomial, Sampled, Section
from .pieces import derivative

Floats = npt.NDArray[np.float64]

_SAME = 1e-10  # of a polynomial's size: coefficients this close are rounding
_SMOOTH = (1e-9, 1e-6, 1e-4)  # of value, slope, bend of a sampled curve, by its size and length


def joined(sections: Sequence[Section]) -> list[Section]:
    """Return the sections with smooth continuations put together.

    Examples
    --------
    >>> halves = [Section(2.0, Polynomial((0.1, 0.05)), Polynomial((0.067,))),
    ...           Section(3.0, Polynomial((0.2, 0.05)), Polynomial((0.067,)))]
    >>> [section.thickness for section in joined(halves)]
    [5.0]
    """
    found: list[Section] = []
    for section in sections:
        whole = _whole(found[-1], section) if found else None
        if whole is None:
            found.append(section)
        else:
            found[-1] = whole
    return found


def _whole(first: Section, second: Section) -> Section | None:
    at, beyond = first.thickness, second.thickness
    for a, b in ((first.mass, second.mass), (first.edge, second.edge)):  # most end here
        left, right = float(a.at(np.array([at]))[0]), float(b.at(np.zeros(1))[0])
        if abs(left - right) > 1e-8 * (1 + abs(left)):
            return None
    edge = _continued(first.edge, second.edge, at, beyond)
    mass = _continued(first.mass, second.mass, at, beyond) if edge else None
    gap = _continued(first.inverse_gap, second.inverse_gap, at, beyond) if mass else None
    if edge is None or mass is None or gap is None:
        return None
    return replace(first, thickness=at + beyond, edge=edge, mass=mass, inverse_gap=gap)


def _continued(a: Curve, b: Curve, at: float, beyond: float) -> Curve | None:
    """Return the curve that is ``a`` up to depth ``at`` and ``b`` for ``beyond`` more, or None."""
    if isinstance(a, Polynomial) and isinstance(b, Polynomial):
        return a if _same(a, b, at, at + beyond) else None
    size = max(abs(float(a.at(np.array([at]))[0])), 1e-3)
    length = min(at, beyond)
    if abs(float(a.at(np.array([at]))[0] - b.at(np.zeros(1))[0])) > _SMOOTH[0] * size:
        return None
    before, after = derivative(a, at, -1, length), derivative(b, 0.0, 1, length)
    for power in (1, 2):
        if abs(before[power - 1] - after[power - 1]) * length**power > _SMOOTH[power] * size:
            return None

    def both(depth: Floats) -> Floats:
        depth = np.asarray(depth, dtype=float)
        return np.where(depth < at, a.at(np.minimum(depth, at)), b.at(np.maximum(depth - at, 0.0)))

    return Sampled(both)


def _same(a: Polynomial, b: Polynomial, at: float, length: float) -> bool:
    """Whether b(s) = a(s + at)."""
    if a.degree != b.degree and max(a.degree, b.degree) < 2:
        return False
    moved = np.poly1d(a.coefficients[::-1])(np.poly1d([1.0, at])).coeffs[::-1]
    n = max(len(moved), len(b.coefficients))
    gap = np.zeros(n)
    gap[: len(moved)] += moved
    gap[: len(b.coefficients)] -= b.coefficients
    powers = length ** np.arange(n)
    size = max(float(np.abs(np.array(a.coefficients) * powers[: len(a.coefficients)]).max()), 1e-6)
    return bool((np.abs(gap) * powers).max() <= _SAME * size)
