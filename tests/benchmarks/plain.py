"""What every competitor gets: a structure as plain arrays, made once and outside the timing."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.polynomial import chebyshev, polynomial

import bandwright as bw
from bandwright.constants import H2M
from physics.dense import levels

_DEGREE = 16


class Plain(NamedTuple):
    """Faces [nm], and powers of the depth from the left face for each section, one row a power.

    Walls stand at both outer faces. ``mass`` is the mass at E = 0, ``slope`` its derivative by E
    (zero in the one-band model), ``light`` 1/mass.
    """

    faces: np.ndarray
    edge: np.ndarray
    mass: np.ndarray
    slope: np.ndarray
    light: np.ndarray

    @property
    def two_band(self):
        return bool(self.slope.any())


@dataclass(frozen=True)
class Question:
    """One structure with the levels asked of it, known beforehand from the spectral elements."""

    plain: Plain
    high: float
    truth: np.ndarray

    @property
    def levels(self):
        return len(self.truth)

    def error(self, energies):
        """Return the largest error [eV], infinite when the number of levels is wrong."""
        if len(energies) != len(self.truth):
            return np.inf
        return float(np.max(np.abs(energies - self.truth), initial=0.0))


def question(stack, asked, accuracy):
    """Return what is asked of a stack.

    Only the definition of the problem comes from `solve`: profile, ends, highest energy. An open
    end is moved out, where it must, until a wall there moves no level by a tenth of ``accuracy``
    [eV]: the competitors know walls only.
    """
    found = bw.solve(stack, **asked)
    (part,) = found.parts
    profile = dataclasses.replace(found.profile, ends=part.span.ends)
    truth = levels(profile, part.span.high).energies[: asked.get("at_most")]
    high = part.span.high
    if len(truth) == asked.get("at_most"):
        high = float(truth[-1]) + 1e-3
    pads = [
        _pad(profile, side, float(truth[-1]), accuracy) if end == "open" else 0.0
        for side, end in zip((0, -1), part.span.ends, strict=True)
    ]
    return Question(_plain(profile, pads), high, truth)


def _face(profile, side):
    section = profile.sections[side]
    place = np.array([0.0 if side == 0 else section.thickness])
    return [float(c.at(place)[0]) for c in (section.edge, section.mass, section.inverse_gap)]


def _pad(profile, side, energy, accuracy):
    """Return how much farther than the outer face a wall must stand [nm].

    A wall at a distance d in a barrier moves a level by at most about 2 (V - E) exp(-2 kappa d).
    """
    edge, mass, inverse_gap = _face(profile, side)
    kappa = np.sqrt(mass * (1.0 + (energy - edge) * inverse_gap) * (edge - energy) / H2M)
    reach = np.log(20.0 * (edge - energy) / accuracy) / (2.0 * kappa)
    outer = profile.sections[side]
    return max(0.0, reach - (outer.thickness if outer.flat else 0.0))


def _plain(profile, pads):
    thickness, rows = [], []
    for section in profile.sections:
        thickness.append(section.thickness)
        rows.append([_powers(f, section.thickness) for f in _functions(section)])
    for side, pad in zip((0, -1), pads, strict=True):
        edge, mass, inverse_gap = _face(profile, side)
        zero = mass * (1.0 - edge * inverse_gap)
        flat = (edge, zero, mass * inverse_gap, 1.0 / zero)
        at = 0 if side == 0 else len(rows)
        if pad and profile.sections[side].flat:
            thickness[side] += pad
        elif pad:
            thickness.insert(at, pad)
            rows.insert(at, [np.array([value]) for value in flat])
    faces = np.concatenate(([0.0], np.cumsum(thickness)))
    columns = []
    for which in range(4):
        powers = max(len(row[which]) for row in rows)
        column = np.zeros((powers, len(rows)))
        for i, row in enumerate(rows):
            column[: len(row[which]), i] = row[which]
        columns.append(column)
    return Plain(faces, *columns)


def _functions(section):
    edge, mass, inverse = section.edge.at, section.mass.at, section.inverse_gap.at

    def zero(s):
        return mass(s) * (1.0 - edge(s) * inverse(s))

    return edge, zero, lambda s: mass(s) * inverse(s), lambda s: 1.0 / zero(s)


def _powers(function, thickness):
    """Return a smooth function as powers of the depth; fails if degree 16 does not hold it."""
    x = np.cos(np.pi * (np.arange(_DEGREE + 1) + 0.5) / (_DEGREE + 1))
    values = function(0.5 * thickness * (1.0 + x)) * np.ones(len(x))
    series = chebyshev.chebfit(x, values, _DEGREE)
    size = max(float(np.abs(values).max()), 1e-300)
    large = np.flatnonzero(np.abs(series) > 1e-11 * size)
    degree = int(large[-1]) if len(large) else 0
    if degree == _DEGREE:
        raise ValueError("a section's curve needs more than degree 16; cut it")
    powers = chebyshev.cheb2poly(series[: degree + 1])
    out = np.zeros(1)
    for k, c in enumerate(powers):
        out = polynomial.polyadd(out, c * polynomial.polypow([-1.0, 2.0 / thickness], k))
    return out
