"""What each parameter changes in the layers of a profile, to first order: a column each.

Uniform layers have one number for a whole section; along other layers a change is known at the
points where states are weighed.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError
from ..formula import parse
from ..materials import Library
from ..parameters import FLUX, Parameter
from ..parameters.fluxes import cations_of
from ..parameters.layers import replaced
from ..shapes import Flat, Shape
from .along import STEP, Along
from .fluxes import graded_flux
from .layout import Fold, Layout, Site
from .materials import LATTICE, TEMPERATURE, Around, Slopes, single_slopes

Floats = npt.NDArray[np.float64]

_LETTERS = ("x", "y")


class Columns:
    """All parameters' changes: per section (n_sections, n_parameters), per stack, along layers.

    Attributes
    ----------
    stretch, edge, mass, inverse_gap, inner : array (n_sections, n_parameters)
        Of a section's thickness [nm], edge [eV], mass [m0], inverse gap [1/eV], internal field.
    field : array (n_parameters,)
        Of the stack's field [V/nm].
    along : dict
        Of a site's number: changes at the points of all folds, one after the other.
    """

    def __init__(self, layout: Layout, parameters: Sequence[Parameter], folds: Sequence[Fold]):
        self.layout, self.folds = layout, folds
        shape = (len(layout.heights), len(parameters))
        self.stretch, self.edge, self.mass, self.inverse_gap, self.inner = np.zeros((5, *shape))
        self.field = np.zeros(len(parameters))
        self.two_band = layout.profile.bands == "two-band"
        self.along: dict[int, list[tuple[int, Any, Any, Any]]] = {}
        self._sites: dict[int, Along] = {}
        for column, parameter in enumerate(parameters):
            try:
                self._fill(column, parameter)
            except BandwrightError as error:
                text = str(error)
                raise (
                    error if text.startswith(parameter.name) else error.at(parameter.name)
                ) from None
        self._follow_bias()

    # --- what is asked -----------------------------------------------------------------------

    def _fill(self, column: int, parameter: Parameter) -> None:
        kind, stack = parameter.kind, self.layout.stack
        if kind in ("field", "bias"):
            negative = "to surface" if kind == "field" else "to substrate"
            sign = -1.0 if stack.electrons_run == negative else 1.0
            self.field[column] = sign if kind == "field" else -sign / self.layout.profile.thickness
        elif kind == "scale":
            self.stretch[:, column] = self.layout.heights
        elif kind == "masses":
            self._masses(column)
        elif parameter.layer_number is None or kind == "flux":
            self._everywhere(column, parameter)
        else:
            key = parameter.name.rpartition(".")[2]
            for number in parameter.layer_numbers:
                self._of_layer(column, self.layout.sites[number], key)

    def _everywhere(self, column: int, parameter: Parameter) -> None:
        """Fill the change of a number that every layer of a material follows."""
        kind = parameter.kind
        for site in self.layout.sites.values():
            if kind == "offsets":
                if site.layer.material is None:
                    self._own_edge(column, site)
            elif site.layer.material is None:
                continue
            elif kind == "offset share":
                self._gap(column, site)
            elif kind == "flux":
                if site.number in parameter.layer_numbers:
                    self._flux(column, site, parameter.name)
            elif kind == "temperature":
                self._material(column, site, TEMPERATURE)
            else:
                factor = self.lattice_per_fraction if kind == "substrate" else 1.0
                self._material(column, site, LATTICE, factor)

    def _of_layer(self, column: int, site: Site, key: str) -> None:
        """Fill the change of one number of a layer."""
        if key == "thickness":
            self._thicker(column, site, site.per_unit)
        elif key == "field":
            self.inner[site.sections, column] += 1.0
        elif key in ("donors", "acceptors"):
            return  # their charge is not modelled
        elif site.layer.material is None:
            self._own(column, site, key)
        elif key.partition("_")[0] in _LETTERS:
            self._letter(column, site, key)
        else:
            self._material(column, site, key)

    # --- materials ---------------------------------------------------------------------------

    @cached_property
    def around(self) -> Around:
        """What materials depend on beside their composition."""
        stack = self.layout.stack
        library = Library.with_files(stack.materials) if stack.materials else Library.shipped()
        return Around(library, stack.temperature, stack.substrate)

    @cached_property
    def lattice_per_fraction(self) -> float:
        """The substrate's lattice constant by its composition [nm]."""
        around = self.around._replace(substrate=None)
        return float(
            single_slopes(around, str(self.layout.stack.substrate), (), "composition").lattice
        )

    def _composition(self, site: Site) -> Any:
        """Return the composition of a uniform layer."""
        values: dict[str, Any] = {k: s.samples[0] for k, s in site.layer.fractions}
        return parse(str(site.layer.material), **values)

    def _single(self, site: Site, direction: str) -> Slopes:
        values = tuple((k, s.value) for k, s in site.layer.fractions if isinstance(s, Flat))
        return single_slopes(self.around, str(site.layer.material), values, direction)

    def _material(self, column: int, site: Site, direction: str, factor: float = 1.0) -> None:
        """Fill the change of a layer's material in one direction."""
        if site.uniform:
            found = self._single(site, direction)
            self._uniform(column, site, found, factor)
        else:
            found = self._places(site).slopes(direction)
            self._varied(column, site, found, factor)

    def _uniform(self, column: int, site: Site, found: Slopes, factor: float = 1.0) -> None:
        at = site.sections
        self.edge[at, column] += found.edge * factor
        self.mass[at, column] += found.mass * factor
        self.inverse_gap[at, column] += found.inverse_gap * factor * self.two_band
        if site.layer.thickness.unit == "ML":
            self._thicker(column, site, site.layer.thickness.value * found.monolayer * factor)

    def _varied(self, column: int, site: Site, found: Slopes, factor: Any = 1.0) -> None:
        """Fill changes along a layer, ``factor`` times those found; the last two are its faces'."""
        edge, mass, gap = (np.asarray(q * factor)[:-2] for q in found[:3])
        self.along.setdefault(site.number, []).append((column, edge, mass, gap * self.two_band))
        if site.layer.thickness.unit == "ML":
            higher = np.broadcast_to(found.monolayer * factor, len(found.monolayer))[-2:]
            self._thicker(column, site, site.layer.thickness.value * float(np.mean(higher)))

    def _letter(self, column: int, site: Site, key: str) -> None:
        letter, _, part = key.partition("_")
        if site.uniform:
            self._uniform(column, site, self._single(site, letter))
            return
        places = self._places(site)
        shape = dict(site.layer.fractions)[letter]
        _check_room(site, key, shape)
        self._varied(column, site, places.slopes(letter), places.change(shape, part))

    def _flux(self, column: int, site: Site, name: str) -> None:
        element = name.removeprefix(FLUX)
        if len(cations_of(site.layer)) == 1:
            self._thicker(column, site, site.thickness)
        elif site.uniform:
            found = self._single(site, name)
            share, monolayer = self._composition(site).fraction(element), site.monolayer
            self._uniform(column, site, found._replace(monolayer=0.0))
            self._thicker(column, site, site.thickness * (share + found.monolayer / monolayer))
        else:
            changes, taller = graded_flux(self._places(site), element)
            sections = len(taller)
            self.stretch[site.sections, column] += np.tile(taller, len(site.sections) // sections)
            for letter, change in changes.items():
                found = self._places(site).slopes(letter)
                still = found._replace(monolayer=np.zeros_like(found.monolayer))
                self._varied(column, site, still, change)

    def _gap(self, column: int, site: Site) -> None:
        if site.uniform:
            around = self.around
            point = around.library.properties(
                self._composition(site), around.temperature, around.substrate
            )
            self.edge[site.sections, column] += float(point.gap)
        else:
            places = self._places(site)
            zero = np.zeros(len(places.depth))
            self._varied(column, site, Slopes(zero + places.point.gap, zero, zero, zero, zero))

    # --- own numbers -------------------------------------------------------------------------

    def _own(self, column: int, site: Site, key: str) -> None:
        base, _, part = key.partition("_")
        shape = site.shapes[base]
        if site.uniform:
            table = {"edge": self.edge, "mass": self.mass}.get(base, self.inverse_gap)
            if base in ("edge", "mass") or self.two_band:
                table[site.sections, column] += (
                    -1.0 / shape.samples[0] ** 2 if base == "gap" else 1.0
                )
            return
        _check_room(site, key, shape)
        places = self._places(site)
        change = places.change(shape, part)
        if base == "gap":
            change = -change / places.values(shape) ** 2
        zero = np.zeros_like(change)
        found = Slopes(zero, zero, zero, zero, zero)
        name = base if base in ("edge", "mass") else "inverse_gap"
        self._varied(column, site, found._replace(**{name: change}))

    def _own_edge(self, column: int, site: Site) -> None:
        shape = site.layer.edge
        assert shape is not None
        if site.uniform:
            self.edge[site.sections, column] += shape.samples[0]
        else:
            edge = self._places(site).values(shape)
            zero = np.zeros_like(edge)
            self._varied(column, site, Slopes(edge, zero, zero, zero, zero))

    def _masses(self, column: int) -> None:
        """Fill one more of every mass, as a factor."""
        numbers = self.layout.profile.numbers
        for site in self.layout.sites.values():
            if site.uniform:
                self.mass[site.sections, column] = numbers.mass[site.sections]
                continue
            places = self._places(site)
            mass = places.point.mass if site.layer.mass is None else places.values(site.layer.mass)
            zero = np.zeros(len(places.depth))
            self._varied(column, site, Slopes(zero, zero + mass, zero, zero, zero))

    # --- thickness ---------------------------------------------------------------------------

    def _thicker(self, column: int, site: Site, change: float) -> None:
        """Fill a change of a layer's thickness [nm], at fixed fractional depth."""
        heights = self.layout.heights[site.sections]
        self.stretch[site.sections, column] += change / site.thickness * heights

    def _follow_bias(self) -> None:
        """Change the field of a bias, which falls over the whole thickness."""
        profile = self.layout.profile
        if self.layout.stack.bias is not None:
            self.field -= profile.field * self.stretch.sum(axis=0) / profile.thickness

    def _places(self, site: Site) -> Along:
        if site.number not in self._sites:
            depth = [self.layout.depths(f.weights, points_of(f, site)) for f in self.folds]
            ends = np.array([0.0, site.thickness])
            self._sites[site.number] = Along(site, self.around, np.concatenate([*depth, ends]))
        return self._sites[site.number]


def points_of(fold: Fold, site: Site) -> npt.NDArray[np.int64]:
    """Return which points of a fold's weights lie in a site."""
    return np.flatnonzero(fold.layout.written[fold.weights.section] == site.number - 1)


def _check_room(site: Site, key: str, shape: Shape) -> None:
    """Refuse a shape that can be moved to neither side."""
    part = key.rpartition("_")[2]
    base = 0.0 if part == "shift" else shape.samples[-1 if part == "last" else 0]
    try:
        replaced(site.layer, key, base + STEP)
    except BandwrightError:
        replaced(site.layer, key, base - STEP)


def changed(
    columns: Columns, fold: int, *, with_field: bool = True, with_numbers: bool = True
) -> Floats:
    """Return what the columns do to the rows of a fold, (n_rows, n_parameters), zero left alone.

    ``fold`` is its place among those of the columns; ``with_numbers`` False counts fields and
    thicknesses alone.
    """
    here = columns.folds[fold]
    total = here.stretch @ columns.stretch
    if columns.inner.any():
        total += here.inner @ columns.inner
    if with_field and columns.field.any():
        total += np.outer(here.outer, columns.field)
    if not with_numbers:
        return np.asarray(total)
    total += here.edge @ columns.edge + here.mass @ columns.mass
    if columns.inverse_gap.any():
        total += here.inverse_gap @ columns.inverse_gap
    for number, changes in columns.along.items():
        site = columns.layout.sites[number]
        places = [points_of(one, site) for one in columns.folds]
        start = sum(len(p) for p in places[:fold])
        span, at = slice(start, start + len(places[fold])), places[fold]
        weights = here.weights
        for column, edge, mass, inverse_gap in changes:
            total[:, column] += (
                weights.edge[:, at] @ edge[span] + weights.mass[:, at] @ mass[span]
                + weights.inverse_gap[:, at] @ inverse_gap[span]
            )  # fmt: skip
    return np.asarray(total)
