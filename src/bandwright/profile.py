"""Stack -> Profile: a tuple of smooth sections, the one thing solvers and pictures read.

A section is a stretch of the structure on which the conduction edge V, the mass m and the
inverse gap are smooth functions of the depth s from the section's first-grown face. Faces of
layers, points of a table and every other kink lie between sections.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Polynomial:
    """A polynomial of the depth s [nm], coefficients in ascending powers."""

    coefficients: tuple[float, ...]

    def at(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        depth = np.asarray(depth, dtype=float)
        value = np.zeros_like(depth)
        for coefficient in reversed(self.coefficients):
            value = value * depth + coefficient
        return value

    @property
    def degree(self) -> int:
        """Degree after trailing zeros are dropped; 0 for a constant."""
        nonzero = [i for i, c in enumerate(self.coefficients) if c != 0.0]
        return nonzero[-1] if nonzero else 0

    def plus(self, constant: float, slope: float) -> Polynomial:
        """Return this polynomial with ``constant + slope * s`` added."""
        c = list(self.coefficients) + [0.0] * (2 - len(self.coefficients))
        c[0] += constant
        c[1] += slope
        return Polynomial(tuple(c))


@dataclass(frozen=True, slots=True)
class Sampled:
    """Any smooth function of the depth s [nm], plus ``constant + slope * s``."""

    function: Callable[[Floats], Floats]
    constant: float = 0.0
    slope: float = 0.0

    degree = 99  # neither flat nor linear: solvers treat it as curved

    def at(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        depth = np.asarray(depth, dtype=float)
        value = np.asarray(self.function(depth), dtype=float)
        return value + self.constant + self.slope * depth

    def plus(self, constant: float, slope: float) -> Sampled:
        """Return this curve with ``constant + slope * s`` added."""
        return Sampled(self.function, self.constant + constant, self.slope + slope)


Curve = Polynomial | Sampled
ZERO = Polynomial((0.0,))


@dataclass(frozen=True, slots=True)
class Section:
    """One smooth stretch: thickness [nm], edge [eV], mass [m0], inverse gap [1/eV].

    ``edge`` holds everything: the material, internal fields and the stack's field.
    ``inverse_gap`` is identically zero in the one-band model. ``layer`` counts grown layers
    from 0; ``bare_edge`` is the edge without the stack's field.
    """

    thickness: float
    edge: Curve
    mass: Curve
    inverse_gap: Curve = ZERO
    layer: int = 0

    @property
    def flat(self) -> bool:
        """Whether edge, mass and gap are constant."""
        return self.edge.degree == 0 and self.mass.degree == 0 and self.inverse_gap.degree == 0

    @property
    def tilted(self) -> bool:
        """Whether the edge is exactly linear (or flat) with constant mass and gap."""
        return self.edge.degree <= 1 and self.mass.degree == 0 and self.inverse_gap.degree == 0


@dataclass(frozen=True)
class Profile:
    """Sections in growth order, the ends, and how a reader names the layers.

    Parameters
    ----------
    sections : tuple of Section
    ends : tuple of str
        ``"open"``, ``"wall"`` or ``"periodic"`` at the first-grown and the last-grown face.
    field : float
        The stack's electric field along growth [V/nm]; already part of each section's edge.
    names : tuple of str
        One name a grown layer.
    bands : str
        ``"one-band"`` or ``"two-band"``.
    """

    sections: tuple[Section, ...]
    ends: tuple[str, str] = ("open", "open")
    field: float = 0.0
    names: tuple[str, ...] = ()
    bands: str = "one-band"
    zero: str = "zero"
    details: Any = None

    @property
    def faces(self) -> Floats:
        """Positions of all section faces [nm], shape (n_sections + 1,), the first is 0."""
        return np.concatenate(([0.0], np.cumsum([s.thickness for s in self.sections])))
