"""dE of every level by every parameter, from the states and a few profiles; nothing is solved.

The states weigh any change of the profile at fixed fractional depth of its sections
(`bandwright.solver.sensitivity`); what a parameter changes there follows from the profiles of
stacks a few small steps away, so that zero, bias, strain and monolayers come along by themselves.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import StackError, UnknownName, close_matches
from ..levels import Levels
from ..materials import Library
from ..parameters import Parameter, list_parameters, read, replace
from ..profile import Profile
from ..profile.build import build_profile
from ..solver.find import CLUSTER
from ..solver.sensitivity import Sensitivity, numbers_at
from .differences import slope

Floats = npt.NDArray[np.float64]

#: the substrate's lattice constant [nm], which no stack holds as a number of its own
SUBSTRATE_LATTICE = "substrate lattice"

# Steps in core units, large enough for rounding, small enough for sixth order.
_STEPS = {
    "composition": 4e-3, "composition end": 4e-3, "substrate": 4e-3, "edge": 1e-3,
    "edge end": 1e-3, "field": 1e-4, "internal field": 1e-4, "bias": 1e-2, "temperature": 2.0,
    SUBSTRATE_LATTICE: 2e-4,
}  # fmt: skip
_SHARE = 5e-3  # of the value, for thickness, mass, gap, nonparabolicity
#: kinds that every number of a profile is linear in, but for kinks and a bias
_STRAIGHT = ("thickness", "edge", "edge end", "mass", "mass end", "nonparabolicity",
             "nonparabolicity end", "internal field", "field", "bias")  # fmt: skip
#: open edges closer than this [eV] are one edge with a kink
_TIE = 1e-12
#: levels closer than this many energy errors are not told apart singly
_TOLD_APART, _ROUNDING = 100.0, 1e-15


class EnergySlope(NamedTuple):
    """dE by one parameter.

    Attributes
    ----------
    energies : array (n_levels,)
        [eV] per unit of the parameter.
    edge : float
        Of the lower open edge, towards larger values where both are equal; nan between walls.
    kinked : bool
        Whether both sides differ; the numbers are then their mean.
    """

    energies: Floats
    edge: float
    kinked: bool


def parameters_of(levels: Levels, names: Sequence[str] | None) -> tuple[Parameter, ...]:
    """Return the parameters asked, or every one that the levels can follow.

    Left out by default are donors and acceptors, whose charge is not modelled.

    Raises
    ------
    UnknownName
        If a name is none of the stack's.
    """
    known = {p.name: p for p in list_parameters(levels.stack)}
    if levels.stack.substrate is not None:
        name = SUBSTRATE_LATTICE.replace(" ", "_")
        known[name] = Parameter(name, None, SUBSTRATE_LATTICE, "nm")
    if names is None:
        return tuple(p for p in known.values() if p.kind not in ("donors", "acceptors"))
    found = []
    for name in names:
        parameter = known.get(name) or _by_number(levels, name)
        if parameter is None:
            raise UnknownName(f"no parameter{close_matches(name, known)}", name)
        found.append(parameter)
    return tuple(found)


def _by_number(levels: Levels, name: str) -> Parameter | None:
    """Return the parameter of one layer by its number, where a label has it in the list."""
    head, _, key = name.rpartition(".")
    for written in levels.stack.written():
        if head == f"layer {written.number}":
            bare = levels.stack.with_layer(written.number, written.layer.replace(label=None))
            return next((p for p in list_parameters(bare) if p.name == name), None)
    return None


def energy_slope(
    levels: Levels, parameter: Parameter, known: dict[object, Any] | None = None
) -> EnergySlope:
    """Return dE of every level by one parameter, exact to first order.

    ``known`` keeps looked-up layers from one parameter to the next.

    Raises
    ------
    SolveError
        If the levels were found by the phase integral, which gives no states.
    BandwrightError
        If no stack a step away can be built on either side; the text says why.
    """
    weights = [states.sensitivity for states in levels.states.sets]
    build, centre = _builder(levels, parameter, {} if known is None else known)

    def answer(value: float) -> Floats:
        profile = build(value)
        _check_alike(levels.profile, profile, parameter.name)
        return np.concatenate([_weighed(one, profile) for one in weights] + [_outer(profile)])

    straight = parameter.kind in _STRAIGHT
    found = slope(answer, centre, _step(parameter, centre), straight)
    return EnergySlope(
        found.value[:-2], _open_edge_slope(levels.profile, found.value[-2:]), found.kinked
    )


def _builder(
    levels: Levels, parameter: Parameter, known: dict[object, Any]
) -> tuple[Callable[[float], Profile], float]:
    """Return the profile as a function of a parameter, and the parameter's value."""
    stack, bands = levels.stack, levels.profile.bands
    if parameter.kind == SUBSTRATE_LATTICE:
        library = Library.with_files(stack.materials) if stack.materials else Library.shipped()
        return (
            lambda value: build_profile(stack, bands, substrate_lattice=value, known=known),
            library.lattice(str(stack.substrate)),
        )
    name = parameter.name
    return (
        lambda value: build_profile(replace(stack, name, value), bands, known=known),
        read(stack, name),
    )


def _step(parameter: Parameter, value: float) -> float:
    kind = parameter.kind
    if kind in _STEPS:
        return _STEPS[kind]
    return _SHARE * (abs(value) or 1.0)


def _check_alike(one: Profile, other: Profile, name: str) -> None:
    if len(one.sections) != len(other.sections):
        raise StackError(
            f"the profile falls into {len(other.sections)} sections a small step away, into"
            f" {len(one.sections)} here; a derivative needs the same ones",
            name,
        )


def _weighed(weights: Sensitivity, profile: Profile) -> Floats:
    """Return a profile's numbers, each weighed by what it does to each level, (n_levels,)."""
    edge, mass, inverse_gap = numbers_at(profile, weights.section, weights.share)
    return np.asarray(
        weights.edge @ edge + weights.mass @ mass + weights.inverse_gap @ inverse_gap
        + weights.thickness @ profile.numbers.thickness
    )  # fmt: skip


def _outer(profile: Profile) -> Floats:
    """Return the edge at both outer faces [eV]."""
    first, last = profile.sections[0], profile.sections[-1]
    return np.array([first.edge.value(0.0), last.edge.value(last.thickness)])


def _open_edge_slope(profile: Profile, slopes: Floats) -> float:
    """Return the slope of the lower open edge; where both are equal, towards larger values."""
    ends = [i for i in (0, 1) if profile.ends[i] == "open"]
    if not ends:
        return float("nan")
    edges = _outer(profile)
    low = min(edges[i] for i in ends)
    return float(min(slopes[i] for i in ends if edges[i] <= low + _TIE))


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
