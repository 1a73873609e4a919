"""The two ends of an alloy, and how much of each there is along a layer."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from .. import quantities as q
from ..errors import BandwrightError, StackError
from ..formula import SITES, Composition, Value, elements, parse
from ..materials import Library
from ..profile.layers import lower_face
from ..shapes import Face, Flat, Points
from ..stack import Layer, Stack

Floats = npt.NDArray[np.float64]

#: panels a monolayer is cut into, each with three points
_PANELS = 16
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(3)
#: how far a composition may be off the line between the ends
_OFF = 1e-6


class Ends(NamedTuple):
    """Two compositions by formula; a layer is so much of the first, the rest of the second."""

    first: str
    second: str

    @property
    def compositions(self) -> tuple[Composition, Composition]:
        """Both, as fractions."""
        return parse(self.first), parse(self.second)


class Amounts(NamedTuple):
    """What is grown down to each depth of a layer, in monolayers, (n_depths,).

    ``second`` is how much of it is the second end, ``moment`` the integral of ``second`` over
    ``grown``.
    """

    grown: Floats
    second: Floats
    moment: Floats


def read_between(given: object) -> Ends | None:
    """Return the two ends that were named.

    Raises
    ------
    StackError, MaterialError
        If they are no two different formulas without letters.
    """
    if given is None:
        return None
    names = tuple(given) if isinstance(given, Sequence) and not isinstance(given, str) else ()
    if len(names) != 2 or not all(isinstance(name, str) for name in names):
        raise StackError(
            f"between: got {q.show(given)}; give two formulas, such as ('GaAs', 'Al0.5Ga0.5As')"
        )
    ends = Ends(*names)
    try:
        first, second = ends.compositions
    except BandwrightError as error:
        raise error.at("between") from None
    if np.array_equal(*_vectors([first, second])):
        raise StackError(f"between: {names[0]} and {names[1]} are the same; give two that differ")
    return ends


def mixed(layer: Layer) -> bool:
    """Whether a layer is an alloy: more than one element on a sublattice."""
    return layer.material is not None and any(
        len(site) > 1 for site in _sublattices(layer.material)
    )


def binaries(material: str) -> Ends:
    """Return the two binaries of a ternary, the one with its first element second.

    Raises
    ------
    StackError
        If the formula holds more or fewer elements than a ternary.

    Examples
    --------
    >>> binaries("AlxGa1-xAs"), binaries("GaAs0.9P0.1")
    (Ends(first='GaAs', second='AlAs'), Ends(first='GaP', second='GaAs'))
    """
    sites = _sublattices(material)
    sizes = [len(site) for site in sites]
    if sizes == [1, 1]:
        raise StackError(f"{material} is no alloy, it is grown as it is")
    if sorted(sizes) != [1, 2]:
        raise StackError(
            f"no two binaries make {material}, which holds {', '.join(sites[0] + sites[1])}; name"
            " two compositions that do, such as between = ('GaAs', 'Al0.5Ga0.5As')"
        )
    if sizes[0] == 2:
        return Ends(sites[0][1] + sites[1][0], sites[0][0] + sites[1][0])
    return Ends(sites[0][0] + sites[1][1], sites[0][0] + sites[1][0])


def _sublattices(material: str) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Return the elements of the cation and of the anion sites, in the order written."""
    named = elements(material)
    cations = {element for sites in SITES.values() for element in sites[0]}
    return tuple(e for e in named if e in cations), tuple(e for e in named if e not in cations)


def amounts(
    layer: Layer, thickness: float, ends: Ends, stack: Stack, library: Library
) -> Amounts:
    """Return how much of each end there is down to depths along a layer.

    Parameters
    ----------
    layer : Layer
        Of a material.
    thickness : float
        Its thickness [nm].

    Raises
    ------
    StackError
        If the composition is somewhere not between the ends.
    """
    faces = np.array([0.0, thickness])
    face: Face = "first"
    if not all(isinstance(shape, Flat) for _, shape in layer.fractions):
        _, height, edge = _numbers(layer, faces, thickness, face, stack, library)
        face = lower_face(float(edge[0]), float(edge[1]))
        count = max(4, int(np.ceil(_PANELS * thickness / float(height.min()))))
        faces = np.linspace(0.0, thickness, count + 1)
    kinks = [
        depth
        for _, shape in layer.fractions
        if isinstance(shape, Points)
        for depth in shape.breaks(thickness)
    ]
    faces = np.unique(np.concatenate([faces, kinks]))
    half = np.diff(faces)[:, None] / 2.0
    depth = faces[:-1, None] + half * (1.0 + _NODES)
    composition, heights, _ = _numbers(layer, depth, thickness, face, stack, library)
    share = _share(composition, ends, depth)
    rate = half * _WEIGHTS / heights
    grown = _summed(rate.sum(axis=1))
    second = _summed((rate * share).sum(axis=1))
    moment = _summed(np.diff(grown) * (second[1:] + second[:-1]) / 2.0)
    return Amounts(grown, second, moment)


def _summed(parts: Floats) -> Floats:
    return np.concatenate([[0.0], np.cumsum(parts)])


def _numbers(
    layer: Layer, depth: Floats, thickness: float, face: Face, stack: Stack, library: Library
) -> tuple[Composition, Floats, Floats]:
    """Return composition, height of a monolayer [nm] and edge [eV] at each depth [nm]."""
    values: dict[str, Value] = {k: s.at(depth, thickness, face) for k, s in layer.fractions}
    assert layer.material is not None
    composition = parse(layer.material, **values)
    point = library.properties(composition, stack.temperature, stack.substrate)
    height, edge = (
        np.broadcast_to(np.asarray(v, dtype=float), depth.shape)
        for v in (point.monolayer, point.edge)
    )
    return composition, height, edge


def _share(composition: Composition, ends: Ends, depth: Floats) -> Floats:
    """Return how much of a composition is the second end, in the shape of ``depth``."""
    here, first, second = _vectors([composition, *ends.compositions])
    span = second - first
    flat = np.array([np.broadcast_to(v, depth.shape) for v in here])
    offset = flat - first.astype(float).reshape(-1, *[1] * depth.ndim)
    share = np.tensordot(span, offset, axes=1) / float(span @ span)
    rest = np.abs(offset - span.reshape(-1, *[1] * depth.ndim) * share).max(axis=0)
    outside = np.maximum(-share, share - 1.0)
    wrong = np.maximum(rest, outside) > _OFF
    if wrong.any():
        at = float(depth[wrong][0])
        raise StackError(
            f"the composition at {q.number_text(round(at, 3))} nm is not between {ends.first} and"
            f" {ends.second}; name two ends that it is between"
        )
    return np.asarray(np.clip(share, 0.0, 1.0))


def _vectors(compositions: Sequence[Composition]) -> list[Any]:
    """Return the fractions of each composition, by the same elements."""
    named = list(
        dict.fromkeys(e for c in compositions for site in c.sublattices for e, _ in site)
    )
    vectors = []
    for composition in compositions:
        fractions = [composition.fraction(element) for element in named]
        plain = all(isinstance(f, float) for f in fractions)
        vectors.append(np.array(fractions) if plain else fractions)
    return vectors
