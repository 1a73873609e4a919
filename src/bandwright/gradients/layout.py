"""How a profile's sections belong to written layers, and weights of changes summed over sections.

Along growth the edge at fractional depth s of a section is

    V = e(s) + sum of f t over the layers before + f (start + s h) + F z - zero ,

e the layer's own edge, f its internal field, t its thickness, `start` where the section begins in
it, h its thickness, F the stack's field. What a level weighs V by at each point therefore says what
any e, f, h and F does to it.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from ..profile import Profile
from ..shapes import Face, Flat, Quadratic, Shape
from ..solver.sensitivity import Sensitivity
from ..stack import Layer, Stack

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]


@dataclass(frozen=True)
class Site:
    """A written layer in a profile.

    Attributes
    ----------
    number : int
        From 1.
    layer : Layer
    thickness : float
        [nm], monolayers resolved.
    monolayer : float
        [nm]; nan of own numbers.
    sections : array
        Of all its copies.
    """

    number: int
    layer: Layer
    thickness: float
    monolayer: float
    sections: Indices

    @cached_property
    def shapes(self) -> dict[str, Shape]:
        """The shapes of its numbers, by key."""
        return dict(self.layer.shapes)

    @cached_property
    def uniform(self) -> bool:
        """Whether nothing varies along it."""
        return all(isinstance(shape, Flat) for shape in self.shapes.values())

    @property
    def per_unit(self) -> float:
        """Its thickness [nm] over the number it is written with."""
        return self.thickness / self.layer.thickness.value


@dataclass(frozen=True)
class Layout:
    """A stack and its profile, section by section."""

    stack: Stack
    profile: Profile

    @cached_property
    def layers(self) -> Indices:
        """The grown layer of each section, from 0."""
        return np.array([section.layer for section in self.profile.sections])

    @cached_property
    def written(self) -> Indices:
        """The written layer of each section, from 0."""
        return np.array(self.profile.written)[self.layers]

    @cached_property
    def sites(self) -> dict[int, Site]:
        """The written layers by number."""
        facts = self.profile.facts
        order = np.argsort(self.written, kind="stable")
        cuts = np.searchsorted(self.written[order], np.arange(1, len(facts)))
        parts = np.split(order, cuts)
        return {
            w.number: Site(w.number, w.layer, fact.thickness, fact.monolayer, sections)
            for w, fact, sections in zip(self.stack.written(), facts, parts, strict=True)
        }

    @cached_property
    def bent(self) -> bool:
        """Whether a number can bend along a layer that is flat as designed."""
        sites = self.sites.values()
        return any(isinstance(shape, Quadratic) for site in sites for shape in site.shapes.values())

    @cached_property
    def heights(self) -> Floats:
        """Thickness of each section [nm]."""
        return np.asarray(self.profile.numbers.thickness, dtype=float)

    @cached_property
    def starts(self) -> Floats:
        """Where each section begins in its layer [nm]."""
        faces = self.profile.faces[:-1]
        first = np.searchsorted(self.layers, self.layers)
        return np.asarray(faces - faces[first])

    @cached_property
    def fields(self) -> Floats:
        """Internal field of each section's layer [V/nm]."""
        fields = [w.layer.field or 0.0 for w in self.stack.written()]
        return np.array(fields)[self.written]

    @cached_property
    def own(self) -> npt.NDArray[np.bool_]:
        """Whether each section's layer brings its own numbers."""
        return np.array([fact.own for fact in self.profile.facts])[self.written]

    def depths(self, weights: Sensitivity, places: Indices) -> Floats:
        """Return the depth in its layer of some of the points of weights [nm]."""
        section = weights.section[places]
        return np.asarray(self.starts[section] + weights.share[places] * self.heights[section])


def lower_face(first: float, last: float) -> Face:
    """Return the face where the edge is lower."""
    return "first" if first <= last else "last"


def at_points(section: Indices, share: Floats, sections: int) -> Sensitivity:
    """Return weights that pick the edge at some points, each a row; sections ascending."""
    rows = len(section)
    nothing = np.zeros((rows, rows))
    return Sensitivity(
        section, share, np.eye(rows), nothing, nothing, np.zeros((rows, sections))
    )  # fmt: skip


@dataclass(frozen=True)
class Fold:
    """Weights summed over the points of each section, under a stack's field F [V/nm].

    Attributes
    ----------
    layout : Layout
    weights : Sensitivity
        Its rows are levels, or points whose edge is asked.
    field : float
    """

    layout: Layout
    weights: Sensitivity
    field: float

    @cached_property
    def _present(self) -> tuple[Indices, Indices]:
        """Sections that have points, and where theirs begin."""
        present, starts = np.unique(self.weights.section, return_index=True)
        return present, starts

    def _sum(self, values: Floats) -> Floats:
        """Sum over the points of each section, (n_rows, n_sections)."""
        total = np.zeros((len(values), len(self.layout.heights)))
        present, starts = self._present
        total[:, present] = np.add.reduceat(values, starts, axis=1)
        return total

    @cached_property
    def edge(self) -> Floats:
        """Rows by sections: what a lift of a section's edge does [1]."""
        return self._sum(self.weights.edge)

    @cached_property
    def mass(self) -> Floats:
        """Rows by sections: by its mass [eV/m0]."""
        return self._sum(self.weights.mass)

    @cached_property
    def inverse_gap(self) -> Floats:
        """Rows by sections: by its inverse gap [eV^2]."""
        return self._sum(self.weights.inverse_gap)

    @cached_property
    def _shared(self) -> Floats:
        return self._sum(self.weights.edge * self.weights.share)

    @cached_property
    def _after(self) -> Floats:
        """Edge weights of all sections after each, (n_rows, n_sections)."""
        return np.asarray(np.cumsum(self.edge[:, ::-1], axis=1)[:, ::-1] - self.edge)

    @cached_property
    def stretch(self) -> Floats:
        """Rows by sections: by its thickness at fixed fields [eV/nm]."""
        slope = self.layout.fields + self.field
        return np.asarray(self.weights.thickness + slope * (self._shared + self._after))

    @cached_property
    def inner(self) -> Floats:
        """Rows by sections: by the internal field in it, summed over a layer [nm]."""
        heights, layers = self.layout.heights, self.layout.layers
        last = np.searchsorted(layers, layers, side="right") - 1
        behind = self._after[:, last]
        return np.asarray(
            self.edge * self.layout.starts + self._shared * heights + behind * heights
        )

    @cached_property
    def outer(self) -> Floats:
        """By the stack's field, (n_rows,) [nm]."""
        faces = self.layout.profile.faces[:-1]
        return np.asarray(self.edge @ faces + self._shared @ self.layout.heights)
