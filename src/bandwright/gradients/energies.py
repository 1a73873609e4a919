"""dE of every level by every parameter, from the states; nothing is solved.

The states weigh any change of the profile (`bandwright.solver.sensitivity`). What a parameter
changes is linear to first order: numbers of layers, thicknesses that shift what lies behind them,
fields, and the zero that energies count from.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import UnknownName, close_matches
from ..levels import Levels
from ..parameters import Parameter, list_parameters
from ..profile import Profile
from ..solver.find import CLUSTER
from ..solver.sensitivity import numbers_at
from ..stack import Stack
from .columns import Columns, changed
from .layout import Fold, Layout, at_points
from .rebuilt import rebuilt
from .zero import zero_places, zero_slopes

Floats = npt.NDArray[np.float64]

#: numbers that no stack holds as its own: name, kind, unit
_MODEL = {
    "substrate_lattice": ("substrate lattice", "nm"),
    "offset_share": ("offset share", ""),
    "offsets": ("offsets", ""),
    "masses": ("masses", ""),
}
#: open edges closer than this [eV] are one edge with a kink
_TIE = 1e-12
#: levels closer than this many energy errors are not told apart singly
_TOLD_APART, _ROUNDING = 100.0, 1e-15


class Slopes(NamedTuple):
    """dE by parameters.

    Attributes
    ----------
    energies : array (n_levels, n_parameters)
        [eV] per unit of the parameter.
    edges : array (n_parameters,)
        Of the lower open edge, towards larger values where both are equal; nan between walls.
    kinked : array of bool (n_parameters,)
        Whether both sides differ; the numbers are then their mean.
    """

    energies: Floats
    edges: Floats
    kinked: npt.NDArray[np.bool_]


def parameters_of(levels: Levels, names: Sequence[str] | None) -> tuple[Parameter, ...]:
    """Return the parameters asked, or every one that the levels can follow.

    Left out by default are donors and acceptors, whose charge is not modelled, and factors on the
    model: on masses, on own edges, and the offset share.

    Raises
    ------
    UnknownName
        If a name is none of the stack's.
    """
    known = {p.name: p for p in list_parameters(levels.stack)}
    model = model_parameters(levels.stack)
    if names is None:
        every = [p for p in known.values() if p.kind not in ("donors", "acceptors")]
        return (*every, *(p for p in model.values() if p.kind == "substrate lattice"))
    known |= model
    found = []
    for name in names:
        parameter = known.get(name) or _by_number(levels, name)
        if parameter is None:
            raise UnknownName(f"no parameter{close_matches(name, known)}", name)
        found.append(parameter)
    return tuple(found)


def model_parameters(stack: Stack) -> dict[str, Parameter]:
    """Return the numbers of the model that can be moved in a stack."""
    materials = [w.number for w in stack.written() if w.layer.material is not None]
    own = [w.number for w in stack.written() if w.layer.material is None]
    moved = {"masses": (*materials, *own), "offset_share": materials, "offsets": own}
    if stack.substrate is not None:
        moved["substrate_lattice"] = materials
    return {
        name: Parameter(name, None, kind, unit, tuple(moved[name]))
        for name, (kind, unit) in _MODEL.items()
        if moved.get(name)
    }


def _by_number(levels: Levels, name: str) -> Parameter | None:
    """Return the parameter of one layer by its number, where a label has it in the list."""
    head, _, key = name.rpartition(".")
    for written in levels.stack.written():
        if head == f"layer {written.number}":
            bare = levels.stack.with_layer(written.number, written.layer.replace(label=None))
            return next((p for p in list_parameters(bare) if p.name == name), None)
    return None


def energy_slopes(levels: Levels, parameters: Sequence[Parameter]) -> Slopes:
    """Return dE of every level by parameters, exact to first order.

    Raises
    ------
    SolveError
        If the levels were found by the phase integral, which gives no states.
    BandwrightError
        If a number can be moved to neither side; the text says why.
    """
    profile = levels.profile
    layout = Layout(levels.stack, profile)
    last = len(profile.sections) - 1
    real = levels.stack.realistic
    outer = at_points(np.array([0, last]), np.array([0.0, 1.0]), last + 1)
    at_points_only = layout.bent or real
    weights = [
        *(s.sensitivity_at_points if at_points_only else s.sensitivity for s in levels.states.sets),
        outer,
    ]
    if real:
        found, kinked = rebuilt(levels.stack, profile, weights, parameters)
        return Slopes(found[:-2], _open_edge_slopes(profile, found[-2:]), kinked)
    folds = [Fold(layout, one, profile.field) for one in weights]
    columns = Columns(layout, parameters, [*folds, zero_places(layout)])
    zero = zero_slopes(columns, parameters, len(folds))
    rows = []
    for place, fold in enumerate(folds):
        own = fold.edge[:, layout.own].sum(axis=1, keepdims=True)
        materials = fold.edge[:, ~layout.own].sum(axis=1, keepdims=True)
        rows.append(changed(columns, place) - materials * zero.material - own * zero.own)
    edges = _open_edge_slopes(profile, rows.pop())
    energies = np.concatenate([np.zeros((0, len(parameters))), *rows])
    return Slopes(energies, edges, zero.kinked)


def couplings(levels: Levels, parameters: Sequence[Parameter], level: int) -> Floats:
    """Return what parameters do between one level (index) and each, (n_levels, n_parameters).

    In eV per unit; W^2/(E - E_other) is what mixing with another adds to E to second order. Zero
    with levels between other ends.

    Raises
    ------
    SolveError, BandwrightError
        As `energy_slopes`.
    """
    found, start = np.zeros((len(levels), len(parameters))), 0
    layout = Layout(levels.stack, levels.profile)
    real = levels.stack.realistic
    for states in levels.states.sets:
        stop = start + len(states.energies)
        if start <= level < stop:
            weights = states.coupling(level - start)
            if real:
                found[start:stop] = rebuilt(
                    levels.stack, levels.profile, [weights], parameters
                ).rows
            else:
                fold = Fold(layout, weights, levels.profile.field)
                found[start:stop] = changed(Columns(layout, parameters, [fold]), 0)
        start = stop
    return found


def _open_edge_slopes(profile: Profile, slopes: Floats) -> Floats:
    """Return the slope of the lower open edge; where both are equal, towards larger values.

    ``slopes`` (2, n_parameters) are of the edge at both outer faces.
    """
    ends = np.array([i for i in (0, 1) if profile.ends[i] == "open"], dtype=np.int64)
    if not len(ends):
        return np.full(slopes.shape[1], np.nan)
    last = len(profile.sections) - 1
    edges = numbers_at(profile, np.array([0, last]), np.array([0.0, 1.0]))[0][ends]
    return np.asarray(slopes[ends[edges <= edges.min() + _TIE]].min(axis=0))


def clusters(levels: Levels) -> npt.NDArray[np.int64]:
    """Return a label (n_levels,) that levels too close to be told apart have in common.

    They lie within 100 times the error of their energies, or are one subspace to the solver.
    """
    labels, first = [np.zeros(0, dtype=np.int64)], 0
    for part in levels.parts:
        if part.solution is None or not len(part.energies):
            continue
        error = np.maximum(part.solution.error, _ROUNDING)
        distance = np.diff(part.energies)
        near = distance < _TOLD_APART * np.maximum(error[1:], error[:-1])
        single = part.solution.found.single
        near |= ~single[1:] & ~single[:-1] & (distance < CLUSTER)
        labels.append(first + np.concatenate(([0], np.cumsum(~near))))
        first = int(labels[-1][-1]) + 1
    return np.concatenate(labels)
