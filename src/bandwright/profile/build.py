"""Stack -> Profile: materials looked up, monolayers resolved, zero, bands and field applied."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from bandwright.errors import BandwrightError, MaterialError, StackError
from bandwright.formula import Value, parse
from bandwright.materials import BandPoint, Library
from bandwright.profile.curves import fitted, least, straight
from bandwright.profile.sections import (
    ZERO,
    Curve,
    Floats,
    LayerFacts,
    Polynomial,
    Profile,
    Sampled,
    Section,
)
from bandwright.shapes import Face, Flat, Function, Linear, Points, Shape
from bandwright.stack import Layer, Stack


class _Piece(NamedTuple):
    """A section of one layer: edge on the materials' or the own scale, without any field."""

    thickness: float
    edge: Curve
    mass: Curve
    inverse_gap: Curve


@dataclass(frozen=True)
class _Built:
    """A written layer, looked up."""

    pieces: tuple[_Piece, ...]
    facts: LayerFacts
    field: float
    label: str | None

    @property
    def first_edge(self) -> float:
        """Edge at the first-grown face [eV]."""
        return float(self.pieces[0].edge.at(np.zeros(1))[0])


def build_profile(stack: Stack, bands: str | None = None) -> Profile:
    """Return the profile of a stack.

    Parameters
    ----------
    stack : Stack
    bands : str, optional
        ``"one-band"`` or ``"two-band"`` instead of the stack's own choice.

    Returns
    -------
    Profile
        Edges count from the stack's zero and hold all fields.

    Raises
    ------
    StackError
        If zero, bands or a layer's shape can't be settled; the text names the layer.
    MaterialError
        If a material gives no number that is needed.
    """
    library = Library.with_files(stack.materials) if stack.materials else Library.shipped()
    grown = stack.grown()
    two_band = _choose_bands(stack, bands or stack.bands)
    built: dict[int, _Built] = {}
    for one in stack.written():
        try:
            built[one.number] = _build_layer(one.layer, one.name, stack, library, two_band)
        except BandwrightError as error:
            raise error.at(one.name) from None
    order = sorted(built)
    facts = tuple(built[number].facts for number in order)
    written = tuple(order.index(number) for _, number in grown)
    layers = [built[number] for _, number in grown]
    shift, words = _zero(stack, layers, library)
    field = _field(stack, sum(one.facts.thickness for one in layers))
    return Profile(
        _sections(layers, shift, field), stack.ends, field,
        "two-band" if two_band else "one-band", words, facts, written,
    )  # fmt: skip


def _choose_bands(stack: Stack, asked: str | None) -> bool:
    """Return whether the two-band model holds; every layer must then give its gap."""
    every = stack.written()
    lacking = [
        one.name
        for one in every
        if one.layer.material is None
        and one.layer.gap is None
        and one.layer.nonparabolicity is None
    ]
    if asked == "one-band":
        return False
    if not lacking:
        return True
    if asked is None and len(lacking) == len(every):
        return False
    need = "bands = 'two-band' needs" if asked else "some layers give a gap and some do not:"
    raise StackError(
        f"{need} a gap or nonparabolicity in every layer; missing in {', '.join(lacking)};"
        " add gap = '... eV' there, or say bands = 'one-band'"
    )


def _build_layer(layer: Layer, name: str, stack: Stack, library: Library, two_band: bool) -> _Built:
    if layer.material is None:
        return _own_layer(layer, name, two_band)
    points = _Points(layer, stack, library)
    shapes = [shape for _, shape in layer.fractions]
    probe = points.at(np.zeros(1), 1.0, "first") if not shapes else None
    if layer.thickness.unit == "ML":
        thickness = layer.thickness.value * points.monolayer()
    else:
        thickness = layer.thickness.value
    pieces: list[_Piece] = []
    if probe is None and all(shape.constant for shape in shapes):
        probe = points.at(np.zeros(1), thickness, "first")
    if probe is not None:
        flat = (probe.edge, probe.mass, _inverse(probe.gap) if two_band else np.zeros(1))
        pieces.append(_Piece(thickness, *(Polynomial((float(np.ravel(v)[0]),)) for v in flat)))
        ends = probe
    else:
        ends = points.at(np.array([0.0, thickness]), thickness, "first")
        first, last = np.ravel(ends.edge)
        face: Face = "first" if first <= last else "last"
        smooth = not any(isinstance(shape, Function) for shape in shapes)
        for start, stop in _spans(shapes, thickness):
            pieces.append(points.piece(start, stop, thickness, face, two_band, smooth))
        ends = points.at(np.linspace(0.0, thickness, 17), thickness, face)
    return _Built(tuple(pieces), _facts(name, layer, thickness, ends), layer.field or 0.0,
                  layer.label)  # fmt: skip


def _facts(name: str, layer: Layer, thickness: float, point: BandPoint) -> LayerFacts:
    mismatch = np.ravel(point.exx)
    worst = int(np.argmax(np.abs(mismatch)))
    lattice = np.broadcast_to(np.ravel(point.lattice), mismatch.shape)
    return LayerFacts(
        name, thickness, False, layer.material or "", float(np.ravel(point.monolayer)[0]),
        float(lattice[worst]), float(mismatch[worst]), bool(np.all(point.direct)),
        tuple(point.cautions),
    )  # fmt: skip


@dataclass(frozen=True)
class _Points:
    """Material numbers of one layer at depths along it."""

    layer: Layer
    stack: Stack
    library: Library

    def at(self, depth: Floats, thickness: float, face: Face) -> BandPoint:
        """Return the numbers at each depth [nm]."""
        values: dict[str, Value] = {
            letter: shape.at(depth, thickness, face) for letter, shape in self.layer.fractions
        }
        assert self.layer.material is not None
        composition = parse(self.layer.material, **values)
        return self.library.properties(composition, self.stack.temperature, self.stack.substrate)

    def monolayer(self) -> float:
        """Return the thickness of one monolayer [nm], the mean of both faces for a grade."""
        if any(isinstance(shape, Points | Function) for _, shape in self.layer.fractions):
            raise StackError(
                "a thickness in ML needs a composition that is constant or graded between two"
                " values; give the thickness of a table or callable in nm"
            )
        ends = self.at(np.array([0.0, 1.0]), 1.0, "first")
        return float(np.mean(ends.monolayer))

    def piece(
        self, start: float, stop: float, thickness: float, face: Face, two_band: bool,
        smooth: bool,
    ) -> _Piece:  # fmt: skip
        """Return the section from start to stop [nm] of the layer."""
        span = stop - start
        along = [_Along(self, which, start, thickness, face) for which in range(3)]
        edge, mass, gap = (fitted(a, span) if smooth else Sampled(a) for a in along)
        return _Piece(span, edge, mass, gap if two_band else ZERO)


@dataclass(frozen=True)
class _Along:
    """Edge, mass or inverse gap (0, 1, 2) of a graded material at depths of one section."""

    points: _Points
    which: int
    start: float
    thickness: float
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
    thickness: float
    face: Face
    invert: bool

    def __call__(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        value = np.asarray(self.shape.at(self.start + depth, self.thickness, self.face))
        return 1.0 / value if self.invert else value


def _inverse(gap: object) -> Floats:
    return np.asarray(1.0 / np.asarray(gap, dtype=float))


def _spans(shapes: Sequence[Shape], thickness: float) -> list[tuple[float, float]]:
    """Return the stretches between the kinks of all shapes of a layer."""
    for shape in shapes:
        if isinstance(shape, Points):
            shape.check_covers(thickness)
    cuts = sorted({0.0, thickness, *(b for s in shapes for b in s.breaks(thickness))})
    cuts = [c for c in cuts if c <= thickness]
    return list(pairwise(cuts))


def _own_layer(layer: Layer, name: str, two_band: bool) -> _Built:
    """Return a layer that brings its own edge, mass and gap."""
    if layer.thickness.unit == "ML":
        raise StackError(
            "a thickness in ML needs a material's lattice; give this layer's thickness in nm"
        )
    if layer.edge is None or layer.mass is None:
        raise StackError("own numbers need both edge and mass; add what is missing")
    thickness = layer.thickness.value
    shapes: list[Shape] = [layer.edge, layer.mass]
    nonparabolic = layer.nonparabolicity or layer.gap
    if two_band and nonparabolic is not None:
        shapes.append(nonparabolic)
    ends = layer.edge.at(np.array([0.0, thickness]), thickness, "first")
    face: Face = "first" if ends[0] <= ends[1] else "last"
    invert = layer.nonparabolicity is None
    pieces = []
    for start, stop in _spans(shapes, thickness):
        curves = [_own_curve(s, start, stop, thickness, face) for s in shapes[:2]]
        gap = _own_curve(shapes[2], start, stop, thickness, face, invert) if two_band else ZERO
        _positive(curves[1], stop - start, "mass")
        if two_band:
            _positive(gap, stop - start, "gap" if invert else "nonparabolicity", invert)
        pieces.append(_Piece(stop - start, curves[0], curves[1], gap))
    facts = LayerFacts(name, thickness)
    return _Built(tuple(pieces), facts, layer.field or 0.0, layer.label)


def _positive(curve: Curve, thickness: float, what: str, strict: bool = True) -> None:
    low = least(curve, thickness)
    if low < 0.0 or (strict and low == 0.0):
        raise StackError(f"{what}: the shape falls to {low:g} inside the layer; it must stay above"
                         " zero")  # fmt: skip


def _own_curve(
    shape: Shape, start: float, stop: float, thickness: float, face: Face, invert: bool = False
) -> Curve:
    along = _OwnAlong(shape, start, thickness, face, invert)
    if isinstance(shape, Function):
        return Sampled(along)
    if shape.constant or (isinstance(shape, Linear | Points | Flat) and not invert):
        first, last = along(np.array([0.0, stop - start]))
        return straight(float(first), float(last), stop - start)
    return fitted(along, stop - start)


def _zero(
    stack: Stack, layers: Sequence[_Built], library: Library
) -> tuple[tuple[float, float], str]:
    """Return what to take off material edges and off own edges [eV], and zero in words."""
    mixed = len({one.facts.own for one in layers}) == 2
    own = all(one.facts.own for one in layers)
    if stack.zero is None:
        if mixed:
            raise StackError(
                "zero: own edges stand beside materials, so zero must be named: a material"
                " (zero = 'GaAs') or the label of a material layer, from which own edges count"
            )
        low = _lowest(layers)
        return (low, low), "the lowest band edge of the stack"
    labelled = [one for one in layers if one.label == stack.zero]
    if labelled:
        return _zero_at_label(stack.zero, layers, labelled, mixed, own)
    try:
        edge = float(library.properties(parse(stack.zero), stack.temperature, stack.substrate).edge)
    except MaterialError as error:
        known = sorted({one.label for one in layers if one.label})
        extra = f"; labels here: {', '.join(known)}" if known else "; no layer has a label"
        raise StackError(f"zero = {stack.zero!r} is neither a label nor a material:"
                         f" {error.message}{extra}") from None  # fmt: skip
    strained = f", strained to {stack.substrate}" if stack.substrate else ""
    return (edge, 0.0), f"the conduction edge of {stack.zero}{strained}"


def _zero_at_label(
    label: str, layers: Sequence[_Built], labelled: Sequence[_Built], mixed: bool, own: bool
) -> tuple[tuple[float, float], str]:
    edges = [one.first_edge for one in labelled]
    if max(edges) - min(edges) > 1e-12:
        raise StackError(
            f"zero = {label!r}: layers of this label have different edges"
            f" ({min(edges):.6g} to {max(edges):.6g} eV); give one of them a label of its own"
        )
    if mixed and labelled[0].facts.own:
        raise StackError(
            f"zero = {label!r} is a layer with its own edge, which counts from zero itself;"
            " name a material or a material layer's label"
        )
    potential = 0.0
    for one in layers:
        if one is labelled[0]:
            break
        potential += one.field * one.facts.thickness
    shift = edges[0] + potential
    words = f"the first-grown face of {label!r}"
    return (shift, shift if own else potential), words


def _lowest(layers: Sequence[_Built]) -> float:
    """Return the lowest edge [eV], internal fields included."""
    low, potential = np.inf, 0.0
    for one in layers:
        start = 0.0
        for piece in one.pieces:
            tilted = piece.edge.plus(potential + one.field * start, one.field)
            low = min(low, least(tilted, piece.thickness))
            start += piece.thickness
        potential += one.field * one.facts.thickness
    return float(low)


def _field(stack: Stack, thickness: float) -> float:
    """Return the stack's field along growth [V/nm], an electron's energy slope [eV/nm]."""
    bias = stack.signed_bias
    if bias is not None:
        return -bias / thickness
    return stack.signed_field or 0.0


def _sections(
    layers: Sequence[_Built], shift: tuple[float, float], field: float
) -> tuple[Section, ...]:
    """Return all sections with zero, internal fields and the stack's field in their edges."""
    sections = []
    potential, position = 0.0, 0.0
    for index, one in enumerate(layers):
        start = 0.0
        for piece in one.pieces:
            constant = (
                potential + one.field * start + field * (position + start)
                - shift[1 if one.facts.own else 0]
            )  # fmt: skip
            slope = one.field + field
            edge = piece.edge.plus(constant, slope)
            sections.append(Section(piece.thickness, edge, piece.mass, piece.inverse_gap, index))
            start += piece.thickness
        potential += one.field * one.facts.thickness
        position += one.facts.thickness
    return tuple(sections)
