"""One written layer -> its sections without any field, and what it turned out to be."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, NamedTuple

import numpy as np

from ..errors import StackError
from ..formula import Value, parse
from ..materials import BandPoint, Library
from ..shapes import Face, Flat, Function, Linear, Points, Quadratic, Shape
from ..stack import Layer, Stack
from .curves import fit_depths, fitted, least, straight
from .sections import ZERO, Curve, Floats, LayerFacts, Number, Polynomial, Sampled, Unlike

#: weights of the mean over 17 depths, Simpson's
_SIMPSON = np.array([1.0, *[4.0, 2.0] * 7, 4.0, 1.0]) / 48.0


class Piece(NamedTuple):
    """A section of one layer: edge on the materials' or the own scale, without any field."""

    thickness: Any
    edge: Curve
    mass: Curve
    inverse_gap: Curve


@dataclass(frozen=True)
class Built:
    """A written layer, looked up."""

    pieces: tuple[Piece, ...]
    facts: LayerFacts
    field: Any
    label: str | None

    @property
    def first_edge(self) -> Any:
        """Edge at the first-grown face [eV]."""
        return self.pieces[0].edge.value(0.0)


def build_layer(layer: Layer, name: str, stack: Stack, library: Library, two_band: bool) -> Built:
    """Return a layer's sections and facts.

    Raises
    ------
    StackError
        If its thickness in ML or its shapes can't be resolved.
    MaterialError
        If its material gives no number that is needed.
    """
    if layer.material is None:
        pieces, facts = _own(layer, name, two_band)
    elif all(isinstance(shape, Flat) for _, shape in layer.fractions):
        pieces, facts = _uniform(layer, name, stack, library, two_band)
    else:
        pieces, facts = _graded(layer, name, stack, library, two_band)
    return Built(pieces, facts, 0.0 if layer.field is None else layer.field, layer.label)


def _uniform(
    layer: Layer, name: str, stack: Stack, library: Library, two_band: bool
) -> tuple[tuple[Piece, ...], LayerFacts]:
    """Return a material layer of one composition."""
    assert layer.material is not None
    values: dict[str, Value] = {
        letter: shape.value for letter, shape in layer.fractions if isinstance(shape, Flat)
    }
    composition = parse(layer.material, **values)
    point = library.properties(composition, stack.temperature, stack.substrate)
    edge, mass, gap, lattice, monolayer, exx = (plain(v) for v in point[:6])
    thickness, unit = layer.thickness
    if unit == "ML":
        thickness = thickness * monolayer
    inverse_gap = Polynomial((1.0 / gap,)) if two_band else ZERO
    piece = Piece(thickness, Polynomial((edge,)), Polynomial((mass,)), inverse_gap)
    facts = LayerFacts(name, thickness, False, layer.material, monolayer, lattice, exx,
                       bool(np.all(point.direct)), point.cautions, exx)  # fmt: skip
    return (piece,), facts


def _graded(
    layer: Layer, name: str, stack: Stack, library: Library, two_band: bool
) -> tuple[tuple[Piece, ...], LayerFacts]:
    """Return a material layer whose composition varies."""
    points = _Points(layer, stack, library)
    shapes = [shape for _, shape in layer.fractions]
    thickness, unit = layer.thickness
    if unit == "ML":
        thickness = thickness * points.monolayer(thickness)
    many = np.ndim(thickness) > 0
    places = np.multiply.outer(np.linspace(0.0, 1.0, 2 if many else 17), thickness)
    along = points.at(places, thickness, "first")
    edge = np.broadcast_to(along.edge, places.shape)
    face = lower_face(edge[0], edge[-1])
    smooth = not any(isinstance(shape, Function) for shape in shapes)
    pieces = tuple(
        points.piece(start, stop, thickness, face, two_band, smooth)
        for start, stop in _spans(shapes, thickness)
    )
    if many:  # whose facts nobody asks
        return pieces, LayerFacts(name, thickness, False, layer.material or "")
    if face == "last" and any(isinstance(shape, Quadratic) for shape in shapes):
        along = points.at(places, thickness, face)
    exx, lattice = np.broadcast_arrays(along.exx, along.lattice)
    worst = np.argmax(np.abs(exx))
    return pieces, LayerFacts(
        name, thickness, False, layer.material or "", float(np.mean(along.monolayer)),
        float(np.ravel(lattice)[worst]), float(np.ravel(exx)[worst]), bool(np.all(along.direct)),
        along.cautions, float(_SIMPSON @ exx),
    )  # fmt: skip


def lower_face(first: Number, last: Number) -> Face:
    """Return the face at which the edge is lower, the first if both are alike.

    Raises
    ------
    Unlike
        If it is not the same face in all designs.
    """
    here = first <= last
    if np.ndim(here) and not (here == np.ravel(here)[0]).all():
        raise Unlike("a grade goes up in some designs and down in others")
    return "first" if np.all(here) else "last"


def plain(number: Value) -> Any:
    """Return a float; numbers of many designs stay an array."""
    return number if np.ndim(number) else float(number)


@dataclass(frozen=True)
class _Points:
    """Material numbers of one layer at depths along it."""

    layer: Layer
    stack: Stack
    library: Library

    def at(self, depth: Floats, thickness: Any, face: Face) -> BandPoint:
        """Return the numbers at each depth [nm]."""
        values: dict[str, Value] = {
            letter: shape.at(depth, thickness, face) for letter, shape in self.layer.fractions
        }
        assert self.layer.material is not None
        composition = parse(self.layer.material, **values)
        return self.library.properties(composition, self.stack.temperature, self.stack.substrate)

    def monolayer(self, thickness: Number = 1.0) -> Any:
        """Return the thickness of one monolayer [nm], the mean of both faces for a grade."""
        if any(isinstance(shape, Points | Function) for _, shape in self.layer.fractions):
            raise StackError(
                "a thickness in ML needs a composition that is constant or graded between two"
                " values; give the thickness of a table or callable in nm"
            )
        ends = self.at(np.multiply.outer([0.0, 1.0], np.ones_like(thickness)), 1.0, "first")
        return plain(np.mean(ends.monolayer, axis=0))

    def piece(
        self, start: float, stop: Any, thickness: Any, face: Face, two_band: bool,
        smooth: bool,
    ) -> Piece:  # fmt: skip
        """Return the section from start to stop [nm] of the layer."""
        span = stop - start
        along = [_Along(self, which, start, thickness, face) for which in range(3)]
        edge: Curve
        mass: Curve
        gap: Curve
        if not smooth:
            edge, mass, gap = (Sampled(a) for a in along)
        else:
            depth = fit_depths(span)
            point = self.at(start + depth, thickness, face)
            values = (point.edge, point.mass, _inverse(point.gap))
            edge, mass, gap = (
                fitted(np.array(np.broadcast_to(v, depth.shape)), span, a)
                for v, a in zip(values, along, strict=True)
            )
        return Piece(span, edge, mass, gap if two_band else ZERO)


@dataclass(frozen=True)
class _Along:
    """Edge, mass or inverse gap (0, 1, 2) of a graded material at depths of one section."""

    points: _Points
    which: int
    start: float
    thickness: Number
    face: Face

    def __call__(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        point = self.points.at(self.start + depth, self.thickness, self.face)
        value = (point.edge, point.mass, point.gap)[self.which]
        value = np.broadcast_to(np.asarray(value, dtype=float), np.shape(depth))
        return _inverse(value) if self.which == 2 else value


@dataclass(frozen=True)
class _OwnAlong:
    """A layer's own shape, or its inverse, at depths of one section."""

    shape: Shape
    start: float
    thickness: Number
    face: Face
    invert: bool

    def __call__(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        value = np.asarray(self.shape.at(self.start + depth, self.thickness, self.face))
        return 1.0 / value if self.invert else value


def _inverse(gap: object) -> Floats:
    return np.asarray(1.0 / np.asarray(gap, dtype=float))


def _spans(shapes: Sequence[Shape], thickness: Number) -> list[tuple[float, Any]]:
    """Return the stretches between the kinks of all shapes of a layer."""
    if not isinstance(thickness, float) and any(
        isinstance(shape, Points | Function) for shape in shapes
    ):
        raise Unlike("tables of points and callables are built design by design")
    if not any(isinstance(shape, Points) for shape in shapes):
        return [(0.0, thickness)]
    for shape in shapes:
        if isinstance(shape, Points):
            shape.check_covers(thickness)
    cuts = sorted({0.0, thickness, *(b for s in shapes for b in s.breaks(thickness))})
    cuts = [c for c in cuts if c <= thickness]
    return list(pairwise(cuts))


def _own(layer: Layer, name: str, two_band: bool) -> tuple[tuple[Piece, ...], LayerFacts]:
    """Return a layer that brings its own edge, mass and gap."""
    thickness, unit = layer.thickness
    if unit == "ML":
        raise StackError(
            "a thickness in ML needs a material's lattice; give this layer's thickness in nm"
        )
    if layer.edge is None or layer.mass is None:
        raise StackError("own numbers need both edge and mass; add what is missing")
    invert = layer.nonparabolicity is None
    shapes: list[Shape] = [layer.edge, layer.mass]
    curvature = layer.gap if invert else layer.nonparabolicity
    if two_band and curvature is not None:
        shapes.append(curvature)
    facts = LayerFacts(name, thickness)
    if all(isinstance(shape, Flat) for shape in shapes):
        edge, mass, *gap = (shape.value for shape in shapes if isinstance(shape, Flat))
        curve = Polynomial((1.0 / gap[0] if invert else gap[0],)) if gap else ZERO
        return (Piece(thickness, Polynomial((edge,)), Polynomial((mass,)), curve),), facts
    face = lower_face(*layer.edge.at(np.multiply.outer([0.0, 1.0], thickness), thickness, "first"))
    pieces = []
    for start, stop in _spans(shapes, thickness):
        curves = [_own_curve(s, start, stop, thickness, face) for s in shapes[:2]]
        gap_curve: Curve = ZERO
        if two_band:
            gap_curve = _own_curve(shapes[2], start, stop, thickness, face, invert)
            _positive(gap_curve, stop - start, "gap" if invert else "nonparabolicity", invert)
        _positive(curves[1], stop - start, "mass")
        pieces.append(Piece(stop - start, curves[0], curves[1], gap_curve))
    return tuple(pieces), facts


def _positive(curve: Curve, thickness: Number, what: str, strict: bool = True) -> None:
    low = np.min(least(curve, thickness))
    if low < 0.0 or (strict and low == 0.0):
        raise StackError(f"{what}: the shape falls to {low:g} inside the layer; it must stay above"
                         " zero")  # fmt: skip


def _own_curve(
    shape: Shape, start: float, stop: Any, thickness: Any, face: Face, invert: bool = False
) -> Curve:
    along = _OwnAlong(shape, start, thickness, face, invert)
    if isinstance(shape, Function):
        return Sampled(along)
    if shape.constant or (isinstance(shape, Linear | Points | Flat) and not invert):
        first, last = along(np.multiply.outer([0.0, 1.0], stop - start))
        return straight(plain(first), plain(last), stop - start)
    return fitted(along(fit_depths(stop - start)), stop - start, along)
