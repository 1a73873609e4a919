"""Slopes where interfaces are wide: the profile built anew beside each number, the states kept.

A number then changes the composition beyond its own layer. The profile's slope by it is taken from
profiles built at four numbers beside it; the states weigh that slope exactly, to first order.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, StackError
from ..parameters import Parameter, shifted
from ..profile import Profile
from ..profile.build import build_profile
from ..solver.sensitivity import Sensitivity, numbers_at
from ..stack import Stack
from .columns import Columns
from .layout import Layout
from .zero import zero_places, zero_slopes

Floats = npt.NDArray[np.float64]

#: steps by kind of parameter, in its unit; others take the first
_STEP = 1e-3
_STEPS = {"temperature": 0.5, "field": 1e-6, "internal field": 1e-6, "substrate lattice": 1e-5}
#: places in steps, and weights of the first derivative: central, and towards larger numbers
_CENTRAL = np.array([-2.0, -1.0, 1.0, 2.0]), np.array([1.0, -8.0, 8.0, -1.0]) / 12.0
_FORWARD = np.arange(5.0), np.array([-25.0, 48.0, -36.0, 16.0, -3.0]) / 12.0
#: a bend that goes as the step, and is larger than this part of the slope's size, is a kink
_KINK = 1e-6


class Rebuilt(NamedTuple):
    """Slopes of all rows of weights by parameters (n_rows, n_parameters), and kinks."""

    rows: Floats
    kinked: npt.NDArray[np.bool_]


def rebuilt(
    stack: Stack, profile: Profile, weights: Sequence[Sensitivity], parameters: Sequence[Parameter]
) -> Rebuilt:
    """Return what parameters do to the rows of weights, exact to first order in the states.

    Raises
    ------
    StackError
        If a number's slope can't be taken from profiles.
    BandwrightError
        If it can be moved to neither side.
    """
    columns, kinked = [], []
    for parameter in parameters:
        kind = parameter.kind
        if kind in ("donors", "acceptors"):
            column, bent = np.zeros(sum(len(one.edge) for one in weights)), False
        elif kind == "masses":
            column, bent = np.concatenate([_masses(one, profile) for one in weights]), False
        elif kind == "offset share":
            column, bent = _offset_share(stack, profile, weights, parameter), False
        else:
            column, bent = _column(stack, profile, weights, parameter)
        columns.append(column)
        kinked.append(bent)
    return Rebuilt(np.array(columns).T, np.array(kinked, dtype=bool))


def _masses(weights: Sensitivity, profile: Profile) -> Floats:
    """Return what one more of every mass, as a factor, does."""
    return np.asarray(weights.mass @ numbers_at(profile, weights.section, weights.share)[1])


def _offset_share(
    stack: Stack, profile: Profile, weights: Sequence[Sensitivity], parameter: Parameter
) -> Floats:
    """Return what one more of the share of the gap does: the gap there, less that of zero."""
    if any(fact.own for fact in profile.facts):
        raise StackError(
            "interfaces that are not abrupt between a material and own numbers do not follow it;"
            " ask of the abrupt stack, stack.abrupt()",
            parameter.name,
        )
    sharp = Layout(stack.abrupt(), build_profile(stack.abrupt(), "two-band"))
    columns = Columns(sharp, [parameter], [zero_places(sharp)])
    zero = zero_slopes(columns, [parameter], 0).material[0]
    two_band = build_profile(stack, "two-band")
    rows = []
    for one in weights:
        gap = 1.0 / numbers_at(two_band, one.section, one.share)[2]
        rows.append(one.edge @ (gap - zero))
    return np.concatenate(rows)


def _column(
    stack: Stack, profile: Profile, weights: Sequence[Sensitivity], parameter: Parameter
) -> tuple[Floats, bool]:
    built = _builder(stack, profile, parameter)
    step = _STEPS.get(parameter.kind, _STEP)
    failed: BandwrightError | None = None
    for (places, parts), way in ((_CENTRAL, 1.0), (_FORWARD, 1.0), (_FORWARD, -1.0)):
        try:
            profiles = [built(way * step * place) for place in places]
        except BandwrightError as error:
            failed = error
            continue
        values = np.array([_weighed(weights, one) for one in profiles])
        slope = np.tensordot(way * parts / step, values, axes=1)
        return slope, way * len(places) == 4.0 and _bent(values, weights, profile, step)
    assert failed is not None
    raise failed


def _bent(values: Floats, weights: Sequence[Sensitivity], profile: Profile, step: float) -> bool:
    """Return whether the slopes to both sides differ: the bend goes as the step, not its square."""
    here = _weighed(weights, profile)
    far, near = values[0] + values[3] - 2.0 * here, values[1] + values[2] - 2.0 * here
    size = np.abs(values[3] - values[0]) + step
    return bool(np.any((np.abs(near) > _KINK * size) & (np.abs(far) < 3.0 * np.abs(near))))


def _builder(stack: Stack, profile: Profile, parameter: Parameter) -> Callable[[float], Profile]:
    """Return what builds the profile with a parameter moved by so much."""
    kind, bands, count = parameter.kind, profile.bands, len(profile.sections)

    def build(amount: float) -> Profile:
        if kind == "substrate lattice":
            from ..materials import Library

            library = Library.with_files(stack.materials) if stack.materials else Library.shipped()
            lattice = library.lattice(str(stack.substrate)) + amount
            found = build_profile(stack, bands, substrate_lattice=lattice)
        elif kind == "offsets":
            found = build_profile(_scaled(stack, 1.0 + amount), bands)
        else:
            found = build_profile(shifted(stack, parameter.name, amount), bands)
        if len(found.sections) != count:
            raise StackError(
                "interfaces meet here as it moves; change their width a little and ask again",
                parameter.name,
            )
        return found

    return build


def _scaled(stack: Stack, factor: float) -> Stack:
    """Return the stack with all own edges times a factor."""
    for written in stack.written():
        edge = written.layer.edge
        if edge is not None:
            layer = written.layer.replace(edge=edge.mapped(lambda value: factor * value))
            stack = stack.with_layer(written.number, layer)
    return stack


def _weighed(weights: Sequence[Sensitivity], profile: Profile) -> Floats:
    """Return the weighed numbers of a profile, a row's sum; only differences mean anything."""
    rows = []
    for one in weights:
        edge, mass, inverse_gap = numbers_at(profile, one.section, one.share)
        rows.append(
            one.edge @ edge + one.mass @ mass + one.inverse_gap @ inverse_gap
            + one.thickness @ profile.numbers.thickness
        )  # fmt: skip
    return np.concatenate(rows)
