"""How the zero that energies count from moves with each parameter."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..formula import parse
from ..parameters import Parameter
from ..solver.sensitivity import numbers_at
from .columns import Columns, changed
from .layout import Fold, Layout, at_points
from .materials import LATTICE, TEMPERATURE, single_slopes

Floats = npt.NDArray[np.float64]

#: edges closer than this [eV] tie for the lowest
_TIE = 1e-12
#: slopes of tied edges that differ by more than this are a kink, relative
_KINK = 1e-9
_SAMPLES = np.linspace(0.0, 1.0, 257)


class ZeroSlopes(NamedTuple):
    """Slopes of what comes off edges of materials and off own ones [eV], (n_parameters,) each."""

    material: Floats
    own: Floats
    kinked: npt.NDArray[np.bool_]


def zero_places(layout: Layout) -> Fold:
    """Return the points whose edge is zero, the stack's field left out; none for a material."""
    stack, sections = layout.stack, len(layout.heights)
    labelled = [w.number for w in stack.written() if w.layer.label == stack.zero]
    if stack.zero is None:
        section, share = _lowest(layout)
    elif labelled:
        section = np.array([min(layout.sites[n].sections[0] for n in labelled)])
        share = np.zeros(1)
    else:
        section, share = np.zeros(0, dtype=np.int64), np.zeros(0)
    return Fold(layout, at_points(section, share, sections), 0.0)


def _lowest(layout: Layout) -> tuple[npt.NDArray[np.int64], Floats]:
    """Return section and fractional depth of all places of the lowest edge."""
    profile, count = layout.profile, len(layout.heights)
    section = np.repeat(np.arange(count), 2)
    share = np.tile([0.0, 1.0], count)
    for index in np.flatnonzero(profile.numbers.curved):
        section = np.append(section, index)
        share = np.append(share, _valley(layout, int(index)))
    order = np.lexsort((share, section))
    section, share = section[order], share[order]
    z = profile.faces[section] + share * layout.heights[section]
    edge = numbers_at(profile, section, share)[0] - profile.field * z
    low = edge <= edge.min() + _TIE
    return section[low], share[low]


def _valley(layout: Layout, index: int) -> float:
    """Return the fractional depth of the lowest edge of a curved section, without the field."""
    section, field = layout.profile.sections[index], layout.profile.field
    height = section.thickness

    def edge(share: Floats) -> Floats:
        return np.asarray(section.edge.at(share * height) - field * share * height)

    best = int(np.argmin(edge(_SAMPLES)))
    low, high = _SAMPLES[max(best - 1, 0)], _SAMPLES[min(best + 1, len(_SAMPLES) - 1)]
    if best in (0, len(_SAMPLES) - 1):
        return float(_SAMPLES[best])
    from scipy.optimize import minimize_scalar  # a quarter second that flat stacks need not pay

    found = minimize_scalar(
        lambda s: float(edge(np.array([s]))[0]), bounds=(low, high), method="bounded",
        options={"xatol": 1e-10},
    )  # fmt: skip
    return float(found.x)


def zero_slopes(columns: Columns, parameters: Sequence[Parameter], fold: int) -> ZeroSlopes:
    """Return how zero moves; ``fold`` is the place of `zero_places` among the columns' folds."""
    stack = columns.layout.stack
    rows = changed(columns, fold, with_field=False)
    none = np.zeros(len(parameters), dtype=bool)
    if not len(rows):
        material = np.array([_of_material(columns, p) for p in parameters])
        return ZeroSlopes(material, np.zeros(len(parameters)), none)
    low, high = rows.min(axis=0), rows.max(axis=0)
    apart = high - low
    mean = np.where(apart > 0.0, 0.5 * (low + high), rows[0])
    kinked = apart > _KINK * np.maximum(np.abs(low), np.abs(high)) + 1e-15
    mixed = stack.zero is not None and len({fact.own for fact in columns.layout.profile.facts}) > 1
    if mixed:
        potential = changed(columns, fold, with_field=False, with_numbers=False)[0]
        return ZeroSlopes(mean, potential, none)
    return ZeroSlopes(mean, mean, kinked)


def _of_material(columns: Columns, parameter: Parameter) -> float:
    """Return the slope of the edge of the material that is zero."""
    around, zero = columns.around, str(columns.layout.stack.zero)
    kind = parameter.kind
    if kind == "temperature":
        return float(single_slopes(around, zero, (), TEMPERATURE).edge)
    if kind == "offset share":
        point = around.library.properties(parse(zero), around.temperature, around.substrate)
        return float(point.gap)
    if around.substrate is None or kind not in ("substrate", "substrate lattice"):
        return 0.0
    factor = columns.lattice_per_fraction if kind == "substrate" else 1.0
    return float(single_slopes(around, zero, (), LATTICE).edge) * factor
