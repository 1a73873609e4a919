"""Real interfaces: the composition of neighbours joined by error functions.

The step of each element's fraction at an interface at z_i, of standard deviation s, is spread:

    x(z) = abrupt x(z) + sum of step_i (Phi((z - z_i)/s) - H(z - z_i)) ,

Phi the normal distribution and H the unit step. Both halves hold as much of it as each other, so
that every element keeps its amount and fractions still add up to one; the material follows from
the composition. Where a layer with its own numbers meets another, edge, mass and inverse gap
themselves are spread in the same way. At the outer faces what would leave is folded back, between
periodic ends it goes on at the other side.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from scipy.special import ndtr

from ..errors import StackError
from ..formula import Composition, parse
from ..materials import Library
from ..shapes import Face, Flat
from ..stack import Layer, Stack
from .layers import Built, lower_face
from .sections import Floats
from .segregation import Carried

#: how far a fraction may lie outside 0 to 1
_ROUNDING = 1e-6

Element = tuple[int, str]
Fractions = dict[Element, Floats]


class Rise(NamedTuple):
    """One interface as a layer sees it, or its image at an outer face.

    Attributes
    ----------
    place, width : float
        Where, from the layer's first-grown face, and its standard deviation [nm].
    face : int
        The grown layer from 0 on whose first-grown face it lies.
    sign, direction : float
        -1 for a step seen turned over, and for one that rises towards the first layer.
    before : bool
        Whether the layer lies behind it, the abrupt step done.
    """

    place: float
    width: float
    face: int
    sign: float
    direction: float
    before: bool

    def spread(self, depth: Floats) -> Floats:
        """Return Phi - H at depths in the layer [nm], by the step."""
        far = self.direction * (depth - self.place) / self.width
        return np.asarray(self.sign * (-ndtr(-far) if self.before else ndtr(far)))


@dataclass(frozen=True)
class Nominal:
    """A written material layer as asked for: fractions along it.

    Attributes
    ----------
    layer : Layer
    thickness : float
        [nm]
    face : str
        The face where its edge is lower.
    """

    layer: Layer
    thickness: float
    face: Face

    def fractions(self, depth: Floats) -> Fractions:
        """Return the fraction of each (sublattice, element) at depths [nm]."""
        values: dict[str, Any] = {
            letter: shape.at(depth, self.thickness, self.face)
            for letter, shape in self.layer.fractions
        }
        found = parse(str(self.layer.material), **values)
        return {
            (site, element): np.broadcast_to(np.asarray(fraction, dtype=float), depth.shape)
            for site, part in enumerate(found.sublattices)
            for element, fraction in part
        }


def nominal(layer: Layer, built: Built, stack: Stack, library: Library) -> Nominal | None:
    """Return a layer's composition as asked for; None for own numbers."""
    if layer.material is None:
        return None
    thickness = float(built.facts.thickness)
    one = Nominal(layer, thickness, "first")
    if all(isinstance(shape, Flat) for _, shape in layer.fractions):
        return one
    ends = one.fractions(np.array([0.0, thickness]))
    edge = library.properties(composition(ends), stack.temperature, stack.substrate).edge
    first, last = np.broadcast_to(edge, 2)
    return Nominal(layer, thickness, lower_face(float(first), float(last)))


def composition(fractions: Mapping[Element, Floats]) -> Composition:
    """Return fractions by sublattice as a composition."""
    sites = [tuple((e, f) for (s, e), f in fractions.items() if s == site) for site in (0, 1)]
    return Composition((sites[0], sites[1]))


@dataclass(frozen=True)
class Real:
    """The grown layers of a stack and the steps between them.

    Attributes
    ----------
    stack : Stack
    library : Library
    nominals : tuple
        Each grown layer's composition, None of own numbers.
    layers : tuple of Built
    faces : array (n_layers + 1,)
        [nm]
    steps : tuple of dict
        Each layer's fractions at its first-grown face over those of the layer before.
    jumps : array (n_layers, 3)
        The same of edge [eV], mass [m0] and inverse gap [1/eV] where own numbers meet.
    carried : Carried, optional
        The fractions where elements segregate.
    """

    stack: Stack
    library: Library
    nominals: tuple[Nominal | None, ...]
    layers: tuple[Built, ...]
    faces: Floats
    steps: tuple[Mapping[Element, float], ...]
    jumps: Floats
    carried: Carried | None = None

    def fractions(self, index: int, depth: Floats, rises: Sequence[Rise]) -> Fractions:
        """Return the fractions at depths in a grown layer [nm], interfaces spread."""
        if self.carried is not None:
            return self.carried.fractions(self.faces[index] + depth)
        here = self.nominals[index]
        assert here is not None
        found = here.fractions(depth)
        for rise in rises:
            spread = rise.spread(depth)
            for element, step in self.steps[rise.face].items():
                found[element] = found.get(element, np.zeros_like(depth)) + step * spread
        return found

    def numbers(self, index: int, depth: Floats, rises: Sequence[Rise]) -> Floats:
        """Return edge, mass and inverse gap at depths in a grown layer, (3, n_depths)."""
        if not depth.size:
            return np.zeros((3, *depth.shape))
        built = self.layers[index]
        if self.nominals[index] is None:
            start, values = 0.0, np.empty((3, *depth.shape))
            for piece in built.pieces:
                curves = (piece.edge, piece.mass, piece.inverse_gap)
                here = depth >= start
                for row, curve in enumerate(curves):
                    values[row][here] = curve.at(depth[here] - start)
                start += piece.thickness
        else:
            found = self.fractions(index, depth, rises)
            for (_, element), fraction in found.items():
                outside = np.abs(fraction - 0.5) > 0.5 + _ROUNDING
                if outside.any():
                    worst = float(fraction[np.argmax(np.abs(fraction - 0.5))])
                    raise StackError(
                        f"its interfaces spread {element} to a fraction of {worst:.6g}; the layers"
                        " there are too thin, or graded too steeply, for an interface_width or"
                        " segregation as large"
                    )
            inside = {name: np.clip(fraction, 0.0, 1.0) for name, fraction in found.items()}
            point = self.library.properties(
                composition(inside), self.stack.temperature, self.stack.substrate
            )
            values = np.stack(
                [np.broadcast_to(q, depth.shape) for q in (point.edge, point.mass, 1.0 / point.gap)]
            )
        for rise in rises:
            jump = self.jumps[rise.face]
            if jump.any():
                values = values + jump[:, None] * rise.spread(depth)
        return np.asarray(values)
