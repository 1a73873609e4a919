"""Each written layer as a strained film: thickness, mismatch and stress, means along a grade."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, StackError
from ..formula import Value, parse
from ..materials import Library
from ..profile import LayerFacts
from ..profile.layers import build_layer, lower_face
from ..shapes import Face
from ..stack import Layer, Repeat, Stack
from ..strain import biaxial_stiffness

Floats = npt.NDArray[np.float64]

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(6)
#: stretches that each smooth part of a grade is cut into
_STRETCHES = 6


class Film(NamedTuple):
    """A written layer strained to the substrate; numbers are nan for a layer without a lattice.

    Attributes
    ----------
    name : str
        Label, or number and formula.
    copies : int
        How often it is grown.
    thickness : float
        [nm], monolayers resolved.
    mismatch : float
        (a - a_substrate)/a_substrate of the relaxed lattice, the mean along the layer.
    worst : float
        The same, where it is farthest off.
    stress : float
        Mean stress in the plane [GPa], positive where stretched.
    pull : float
        Mean of the stress over the relaxed lattice constant a [GPa/nm], A e/a.
    weight : float
        Mean of A a_substrate/a^2 [GPa/nm]: what the mismatch counts with, to give ``-pull``.
    per_lattice : float
        Mean of 1 over the relaxed lattice constant [1/nm].
    cells : float
        Unit cells of the strained film, two monolayers each, in one nm.
    poisson : float
        C12/(C11 + C12), where it is farthest off.
    facts : LayerFacts
        What the profile says of it, lattice and monolayer where it is farthest off.
    """

    name: str
    copies: int
    thickness: float
    mismatch: float
    worst: float
    stress: float
    pull: float
    weight: float
    per_lattice: float
    cells: float
    poisson: float
    facts: LayerFacts

    @property
    def own(self) -> bool:
        """Whether the layer brings its own numbers, and so no lattice."""
        return self.facts.own


class Group(NamedTuple):
    """A repeated group: ``members`` are (place of the film, times in one period)."""

    times: int
    members: tuple[tuple[int, int], ...]
    thickness: float


def substrate_of(stack: Stack, library: Library) -> float:
    """Return the substrate's lattice constant [nm].

    Raises
    ------
    StackError
        If the stack names no substrate.
    """
    if stack.substrate is None:
        raise StackError(
            "substrate: missing; strain counts from it: name it, for example substrate = 'GaAs'"
        )
    try:
        return library.lattice(stack.substrate)
    except BandwrightError as error:
        raise error.at("substrate") from None


def films_of(stack: Stack, library: Library) -> tuple[Film, ...]:
    """Return every written layer as a film, in growth order.

    Raises
    ------
    StackError
        If no layer has a material.
    MaterialError, UnknownName
        If a material lacks a number that is needed.
    """
    substrate = substrate_of(stack, library)
    films: list[Film] = []
    for written in stack.written():
        try:
            film = film_of(written.layer, written.name, stack, library, substrate)
        except BandwrightError as error:
            raise error.at(written.name) from None
        films.append(film._replace(copies=written.copies))
    if all(film.own for film in films):
        raise StackError(
            "no layer of a material: own numbers have no lattice; give a formula to one at least"
        )
    return tuple(films)


def film_of(layer: Layer, name: str, stack: Stack, library: Library, substrate: float) -> Film:
    """Return one layer as a film on a substrate of a lattice constant [nm], one copy."""
    facts = build_layer(layer, name, stack, library, False).facts
    thickness = float(facts.thickness)
    if layer.material is None:
        nan = float("nan")
        return Film(name, 1, thickness, nan, nan, nan, nan, nan, nan, nan, nan, facts)
    depth, weight = _depths(layer, thickness)
    face = _face(layer, thickness, stack, library)
    composition = parse(layer.material, **_fractions(layer, depth, thickness, face))
    point = library.properties(composition, stack.temperature, stack.substrate)
    c11, c12 = library.stiffness(composition)
    rows = (point.lattice, point.exx, point.monolayer, biaxial_stiffness(c11, c12),
            c12 / (c11 + c12))  # fmt: skip
    lattice, exx, monolayer, stiffness, poisson = (np.broadcast_to(row, depth.shape)
                                                   for row in rows)  # fmt: skip
    off = int(np.argmax(np.abs(exx)))
    worst = replace(facts, lattice=float(lattice[off]), mismatch=float(exx[off]),
                    monolayer=float(monolayer[off]))  # fmt: skip
    along = (lattice / substrate - 1.0, stiffness * exx, stiffness * exx / lattice,
             stiffness * substrate / lattice**2, 1.0 / lattice, 0.5 / monolayer)  # fmt: skip
    mismatch, stress, pull, balance, per_lattice, cells = (float(weight @ row) for row in along)
    return Film(name, 1, thickness, mismatch, float(lattice[off]) / substrate - 1.0, stress, pull,
                balance, per_lattice, cells, float(poisson[off]), worst)  # fmt: skip


def _fractions(layer: Layer, depth: Floats, thickness: float, face: Face) -> dict[str, Value]:
    if all(shape.constant for _, shape in layer.fractions):
        return {letter: float(shape.samples[0]) for letter, shape in layer.fractions}
    return {letter: shape.at(depth, thickness, face) for letter, shape in layer.fractions}


def _face(layer: Layer, thickness: float, stack: Stack, library: Library) -> Face:
    """Return the face at which the band edge is lower, where a quadratic grade is flat."""
    if all(shape.constant for _, shape in layer.fractions):
        return "first"
    ends = _fractions(layer, np.array([0.0, thickness]), thickness, "first")
    edge = library.properties(
        parse(str(layer.material), **ends), stack.temperature, stack.substrate
    ).edge
    return lower_face(*np.broadcast_to(edge, 2))


def _depths(layer: Layer, thickness: float) -> tuple[Floats, Floats]:
    """Return depths [nm] and weights of the mean along a layer; kinks and faces weigh nothing."""
    if all(shape.constant for _, shape in layer.fractions):
        return np.zeros(1), np.ones(1)
    inside = {cut for _, shape in layer.fractions for cut in shape.breaks(thickness)}
    cuts = sorted({0.0, thickness, *inside})
    starts = [np.linspace(a, b, _STRETCHES + 1)[:-1] for a, b in pairwise(cuts)]
    bounds = np.append(np.concatenate(starts), thickness)
    half = 0.5 * np.diff(bounds)[:, None]
    depth = (bounds[:-1, None] + half * (1.0 + _NODES)).ravel()
    weight = (half * _WEIGHTS).ravel() / thickness
    return np.append(depth, cuts), np.append(weight, np.zeros(len(cuts)))


def groups_of(stack: Stack, films: Sequence[Film]) -> list[Group]:
    """Return every group that is grown more than once, an inner one before the one around it."""
    found: list[Group] = []
    _walk(stack.layers, films, 0, found)
    return found


def _walk(
    layers: Sequence[Layer | Repeat], films: Sequence[Film], place: int, found: list[Group]
) -> list[tuple[int, int]]:
    """Return the members of some layers; add the groups among them to ``found``."""
    members: list[tuple[int, int]] = []
    for layer in layers:
        start = place + len(members)
        if not isinstance(layer, Repeat):
            members.append((start, 1))
            continue
        inner = _walk(layer.layers, films, start, found)
        if layer.times > 1:
            thickness = sum(films[at].thickness * times for at, times in inner)
            found.append(Group(layer.times, tuple(inner), thickness))
        members += [(at, times * layer.times) for at, times in inner]
    return members
