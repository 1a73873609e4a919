"""Edges at X and L along a profile: what a picture shows beside the edge that is solved."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..formula import Value, parse
from ..materials import BandPoint, Library
from ..shapes import Face
from ..stack import Layer, Stack
from .build import build_profile
from .sections import Floats, Profile

#: depths at which a section of a varying composition is looked at
_GRADED = 33


class Valleys(NamedTuple):
    """Edges at X and L along growth, both sides of every face included, (n_points,) each.

    Attributes
    ----------
    position : array
        [nm].
    section : array of int
        The section that a point lies in.
    edge : array
        The conduction edge that is solved [eV], fields included.
    x_edge, l_edge : array
        [eV] from the same zero, without their own shift by strain; nan where no source gives them.
    """

    position: Floats
    section: npt.NDArray[np.int64]
    edge: Floats
    x_edge: Floats
    l_edge: Floats


def valleys(stack: Stack, profile: Profile) -> Valleys:
    """Return the edges at X and L of a stack along its profile.

    Parameters
    ----------
    stack : Stack
    profile : Profile
        Made from this stack. Interfaces that are not abrupt are shown as if they were.

    Examples
    --------
    >>> from bandwright.profile.build import build_profile
    >>> from bandwright.stackline import parse_line
    >>> stack = parse_line("9 nm AlAs, 5 nm GaAs, 9 nm AlAs")
    >>> found = valleys(stack, build_profile(stack))
    >>> print((found.x_edge - found.edge)[:1].round(2))
    [-0.84]
    """
    if stack.realistic:  # how X and L go on in an interface nobody asks
        stack = stack.abrupt()
        profile = build_profile(stack, profile.bands)
    library = Library.with_files(stack.materials) if stack.materials else Library.shipped()
    layers = {one.number: one.layer for one in stack.written()}
    offsets: dict[tuple[int, float], tuple[Floats, Floats, Floats]] = {}
    parts = []
    start_of_layer, layer_before = 0.0, -1
    for index, section in enumerate(profile.sections):
        if section.layer != layer_before:
            start_of_layer, layer_before = float(profile.faces[index]), section.layer
        number = profile.written[section.layer] + 1
        inside = float(profile.faces[index]) - start_of_layer
        key = number, round(inside, 9)
        if key not in offsets:
            thickness = profile.facts[number - 1].thickness
            offsets[key] = _offsets(
                layers[number], stack, library, inside, section.thickness, thickness
            )
        depth, x_offset, l_offset = offsets[key]
        edge = section.edge.at(depth)
        position = profile.faces[index] + depth
        where = np.full(len(depth), index, dtype=np.int64)
        parts.append((position, where, edge, edge + x_offset, edge + l_offset))
    positions, sections, edges, x_edges, l_edges = zip(*parts, strict=True)
    return Valleys(
        np.concatenate(positions), np.concatenate(sections), np.concatenate(edges),
        np.concatenate(x_edges), np.concatenate(l_edges),
    )  # fmt: skip


def _offsets(
    layer: Layer, stack: Stack, library: Library, inside: float, span: float, thickness: float
) -> tuple[Floats, Floats, Floats]:
    """Return depths in a section [nm] and how far X and L lie above the conduction edge [eV]."""
    if layer.material is None:
        depth = np.array([0.0, span])
        nothing = np.full(2, np.nan)
        return depth, nothing, nothing
    graded = any(not shape.constant for _, shape in layer.fractions)
    depth = np.linspace(0.0, span, _GRADED if graded else 2)
    faces = _at(layer, stack, library, np.array([0.0, thickness]), thickness, "first").edge
    first, last = np.broadcast_to(faces, 2)
    point = _at(layer, stack, library, inside + depth, thickness,
                "first" if first <= last else "last")  # fmt: skip
    x_offset, l_offset = (
        np.broadcast_to(np.nan if side is None else np.asarray(side) - point.edge, depth.shape)
        for side in (point.x_edge, point.l_edge)
    )
    return depth, x_offset, l_offset


def _at(
    layer: Layer, stack: Stack, library: Library, depth: Floats, thickness: float, face: Face
) -> BandPoint:
    """Return a material layer's numbers at depths along it [nm]."""
    assert layer.material is not None
    values: dict[str, Value] = {
        letter: shape.at(depth, thickness, face) for letter, shape in layer.fractions
    }
    return library.properties(parse(layer.material, **values), stack.temperature, stack.substrate)
