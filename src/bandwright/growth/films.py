"""What a written layer is as a film: its atoms, and how high one monolayer of them is."""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.integrate import trapezoid

from ..errors import BandwrightError
from ..formula import Composition, Sublattice, Value, parse
from ..materials import BandPoint, Library
from ..shapes import Function, Points
from ..stack import Layer, Stack, Written

Floats = npt.NDArray[np.float64]

#: depths at which a table of points or a callable is looked at
_DEPTHS = 129


class Film(NamedTuple):
    """One written layer as it is grown.

    Parameters
    ----------
    monolayer_nm : float
        Height of a monolayer of the strained film [nm].
    in_plane_nm : float
        Lattice constant in the plane [nm].
    composition : Composition or None
        None where it varies along the layer.
    """

    monolayer_nm: float
    in_plane_nm: float
    composition: Composition | None


def films_of(stack: Stack) -> dict[int, Film]:
    """Return the film of each written layer by number; layers with their own numbers have none.

    Raises
    ------
    MaterialError, UnknownName
        If a formula, a lattice or an elastic constant is not known; the text names the layer.
    """
    library = Library.with_files(stack.materials)
    films: dict[int, Film] = {}
    flat: dict[tuple[tuple[str, ...], ...], list[tuple[Written, Composition]]] = {}
    for written in stack.written():
        layer = written.layer
        if layer.material is None:
            continue
        try:
            if all(shape.constant for _, shape in layer.fractions):
                composition = _uniform(layer)
                kind = tuple(tuple(e for e, _ in site) for site in composition.sublattices)
                flat.setdefault(kind, []).append((written, composition))
            else:
                films[written.number] = _graded(layer, stack, library)
        except BandwrightError as error:
            raise error.at(written.name) from None
    for group in flat.values():
        films |= _together(group, stack, library)
    return films


def _uniform(layer: Layer) -> Composition:
    assert layer.material is not None
    values: dict[str, Value] = {letter: shape.samples[0] for letter, shape in layer.fractions}
    return parse(layer.material, **values)


def _together(
    group: Iterable[tuple[Written, Composition]], stack: Stack, library: Library
) -> dict[int, Film]:
    """Return the films of layers of the same elements, looked up as one array of compositions."""
    compositions = list(dict.fromkeys(composition for _, composition in group))
    try:
        found = _points(compositions, stack, library)
    except BandwrightError:  # one of them has no numbers: find it, and say which layer it is
        found = {}
        for written, composition in group:
            try:
                found |= _points([composition], stack, library)
            except BandwrightError as error:
                raise error.at(written.name) from None
    return {w.number: Film(*found[composition], composition) for w, composition in group}


def _points(
    compositions: list[Composition], stack: Stack, library: Library
) -> dict[Composition, tuple[float, float]]:
    """Return the height of a monolayer and the lattice in the plane [nm] of each composition."""
    if len(compositions) == 1:
        asked = compositions[0]
    else:
        first, second = (
            _stacked([composition.sublattices[site] for composition in compositions])
            for site in (0, 1)
        )
        asked = Composition((first, second))
    point = library.properties(asked, stack.temperature, stack.substrate)
    heights, planes = (
        np.broadcast_to(value, len(compositions)).tolist()
        for value in (point.monolayer, _in_plane(point))
    )
    return dict(zip(compositions, zip(heights, planes, strict=True), strict=True))


def _stacked(sites: list[Sublattice]) -> Sublattice:
    values = np.array([[fraction for _, fraction in site] for site in sites], dtype=float)
    return tuple((element, values[:, n]) for n, (element, _) in enumerate(sites[0]))


def _in_plane(point: BandPoint) -> Value:
    return point.lattice * (1.0 + point.exx)


def _graded(layer: Layer, stack: Stack, library: Library) -> Film:
    """Return the film of a layer whose composition varies.

    Its monolayer is the mean of both faces', by which a thickness in ML is meant; along a table
    or a callable, whose thickness is given in nm, the mean over what was grown.
    """
    assert layer.material is not None
    tabled = any(isinstance(shape, Points | Function) for _, shape in layer.fractions)
    thickness = layer.thickness.value
    depths = np.linspace(0.0, thickness, _DEPTHS if tabled else 2)
    if tabled:
        kinks = [depth for _, shape in layer.fractions for depth in shape.breaks(thickness)]
        depths = np.unique(np.concatenate([depths, kinks]))
    values: dict[str, Value] = {k: shape.at(depths, thickness) for k, shape in layer.fractions}
    composition = parse(layer.material, **values)
    point = library.properties(composition, stack.temperature, stack.substrate)
    heights, planes = (
        np.broadcast_to(np.asarray(v, dtype=float), depths.shape)
        for v in (point.monolayer, _in_plane(point))
    )
    height = float(np.mean(heights))
    if tabled:
        height = thickness / float(trapezoid(1.0 / heights, depths))
    return Film(height, float(np.mean(planes)), None)
