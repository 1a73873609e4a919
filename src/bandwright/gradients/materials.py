"""What composition, temperature and the substrate's lattice do to the numbers of a material."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from ..formula import Composition, Value, parse
from ..materials import BandPoint, Library
from ..parameters import FLUX
from ..parameters.fractions import SITES, letter_effects, mixed_sites
from .stencil import stencil

Floats = npt.NDArray[np.float64]

# Steps large enough for rounding, small enough for sixth order.
_FRACTION, _FACTOR, _KELVIN, _LATTICE = 4e-3, 5e-3, 2.0, 2e-4
_NONE = 1e-9  # a weight this small beside 1/step is none

TEMPERATURE, LATTICE = "temperature", "lattice"


class Around(NamedTuple):
    """What the numbers of a material depend on beside its composition."""

    library: Library
    temperature: float
    substrate: str | None


class Slopes(NamedTuple):
    """Derivatives of edge [eV], mass [m0], inverse gap [1/eV], monolayer and lattice [nm]."""

    edge: Any
    mass: Any
    inverse_gap: Any
    monolayer: Any
    lattice: Any


def slopes(around: Around, material: str, values: Mapping[str, Floats], direction: str) -> Slopes:
    """Return derivatives at each point of a layer.

    Parameters
    ----------
    around : Around
    material : str
        Formula.
    values : mapping of arrays (n_points,)
        Of its letters; empty for a formula without, which is one point.
    direction : str
        A letter, ``"composition"`` or ``"anion_composition"``, ``"flux Al"`` and the like,
        `TEMPERATURE`, or `LATTICE`, the substrate's.

    Raises
    ------
    BandwrightError
        If there is no room on either side, or no number there.
    """
    composition = parse(material, **values)
    shape = np.shape(next(iter(values.values()), np.zeros(1)))
    if direction == TEMPERATURE:
        (places,), (weights,) = _single(around.temperature, around.temperature, _KELVIN)
        points = (
            around.library.properties(composition, max(t, 0.0), around.substrate) for t in places
        )
        return _weighed(points, weights, shape)
    if direction == LATTICE:
        lattice = around.library.lattice(str(around.substrate))
        (places,), (weights,) = _single(lattice, lattice, _LATTICE)
        points = (
            _held(around.library, float(a)).properties(
                composition, around.temperature, around.substrate
            )
            for a in places
        )
        return _weighed(points, weights, shape)
    value, below, above, step, made = _way(material, composition, values, direction, shape)
    grid, weight = stencil(value, below, above, step)
    point = around.library.properties(made(grid), around.temperature, around.substrate)
    return Slopes(*np.einsum("qkn,kn->qn", _numbers(point, grid.shape), weight))


@lru_cache(maxsize=4096)
def single_slopes(
    around: Around, material: str, values: tuple[tuple[str, float], ...], direction: str
) -> Slopes:
    """Return derivatives of one composition, floats; remembered."""
    arrays = {letter: np.array([value]) for letter, value in values}
    return Slopes(*(float(v[0]) for v in slopes(around, material, arrays, direction)))


@lru_cache(maxsize=64)
def _held(library: Library, lattice: float) -> Library:
    return library.on_lattice(lattice)


def _single(value: float, below: float, step: float) -> tuple[Floats, Floats]:
    """Return the places and weights of one number, those of no weight left out, each (1, k)."""
    places, weights = stencil(np.array([value]), below, np.inf, step)
    counts = np.abs(weights[:, 0]) * step > _NONE
    return places[counts].T, weights[counts].T


def _numbers(point: BandPoint, shape: tuple[int, ...]) -> Floats:
    inverse_gap = 1.0 / np.asarray(point.gap)
    numbers = (point.edge, point.mass, inverse_gap, point.monolayer, point.lattice)
    return np.array([np.broadcast_to(v, shape) for v in numbers])


def _weighed(points: Iterable[BandPoint], weights: Floats, shape: tuple[int, ...]) -> Slopes:
    total = np.zeros((len(Slopes._fields), *shape))
    for weight, point in zip(weights, points, strict=True):
        total += weight * _numbers(point, shape)
    return Slopes(*total)


def _way(
    material: str, composition: Composition, values: Mapping[str, Floats], direction: str,
    shape: tuple[int, ...],
) -> tuple[Floats, Any, Any, float, Callable[[Floats], Composition]]:  # fmt: skip
    """Return a number that moves the composition, its room to both sides, its step, and how."""
    if direction.startswith(FLUX):
        element = direction.removeprefix(FLUX)
        return np.ones(shape), 1.0, np.inf, _FACTOR, _Flux(composition, element)
    if direction in SITES:
        sublattice = dict(mixed_sites(material))[direction]
        first = np.array([float(sublattice[0][1])])
        return first, first, 1.0 - first, _FRACTION, _First(composition, sublattice[0][0])
    effects = letter_effects(material, direction)
    room = {
        sign: np.min([np.asarray(composition.fraction(e)) for e, s in effects if s == sign], axis=0)
        for sign in (1, -1)
    }
    return values[direction], room[1], room[-1], _FRACTION, _Letter(material, values, direction)


@dataclass(frozen=True)
class _Letter:
    """The composition by one letter."""

    material: str
    values: Mapping[str, Floats]
    letter: str

    def __call__(self, grid: Floats) -> Composition:
        others = {k: np.broadcast_to(v, grid.shape) for k, v in self.values.items()}
        return parse(self.material, **{**others, self.letter: grid})


@dataclass(frozen=True)
class _First:
    """The composition by the first fraction of a sublattice, the others in proportion."""

    composition: Composition
    first: str

    def __call__(self, grid: Floats) -> Composition:
        cations, anions = (self._moved(site, grid) for site in self.composition.sublattices)
        return Composition((cations, anions))

    def _moved(self, site: tuple[tuple[str, Value], ...], grid: Floats) -> Any:
        if site[0][0] != self.first:
            return tuple((e, np.full(grid.shape, f)) for e, f in site)
        old = float(site[0][1])
        rest = [float(f) / (1.0 - old) if old != 1.0 else 0.0 for _, f in site[1:]]
        rest[-1] = 1.0 - sum(rest[:-1])
        others = ((e, (1.0 - grid) * r) for (e, _), r in zip(site[1:], rest, strict=True))
        return ((self.first, grid), *others)


@dataclass(frozen=True)
class _Flux:
    """The composition by a factor on one cation's flux."""

    composition: Composition
    element: str

    def __call__(self, grid: Floats) -> Composition:
        share = self.composition.fraction(self.element)
        total = 1.0 + (grid - 1.0) * share
        cations = tuple(
            (e, f * (grid if e == self.element else 1.0) / total)
            for e, f in self.composition.cations
        )
        anions = tuple((e, np.broadcast_to(f, grid.shape)) for e, f in self.composition.anions)
        return Composition((cations, anions))
