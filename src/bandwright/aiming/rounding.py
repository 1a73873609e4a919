"""A design in whole monolayers: all layers together, by the linear model, the best ones solved.

A layer's neighbouring whole numbers of monolayers, one less or more each, are combined so that
what one layer's rounding does to the targets another's takes back.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, StackError, UnknownName, close_matches
from ..parameters import Parameter, list_parameters, read, replace
from ..quantities import Length, as_value, show
from ..shapes import Function, Points
from ..stack import Stack
from .asking import Free, Wishes, relative
from .problem import Point, Problem

Floats = npt.NDArray[np.float64]

#: combinations carried along while layers are added one by one
_CARRIED = 3000
#: combinations solved exactly
_SOLVED = 5
#: weighs deviations against the logarithm of what is maximised
_TARGETS = 30.0
#: weighs the distance from the continuous design, in steps, where targets do not care
_NEAR = 1e-7
#: limits may be broken by less than rounding
_SLACK = 1e-9


@dataclass(frozen=True)
class Step:
    """A parameter that is rounded: the size of a whole step in its unit, what it may be.

    Attributes
    ----------
    parameter : Parameter
    size : float
    in_monolayers : bool
    value : float
        As the continuous design has it.
    choices : tuple of int
        Whole numbers of steps.
    """

    parameter: Parameter
    size: float
    in_monolayers: bool
    value: float
    choices: tuple[int, ...]


def read_grid(wishes: Wishes, grid: object) -> dict[str, float]:
    """Return the grid of parameters that are no thickness, in their units.

    Raises
    ------
    StackError, UnknownName, QuantityError
        If a name is no free parameter, or a step is none.
    """
    if grid is None:
        return {}
    if not isinstance(grid, Mapping):
        raise StackError(f"grid: got {show(grid)}; write for example {{'well.x': 0.01}}")
    free = {one.name: one.parameter for one in wishes.free}
    found = {}
    for name, step in grid.items():
        if name not in free:
            raise UnknownName(f"grid: {name!r} is no free parameter{close_matches(name, free)}")
        if relative(free[name]):
            raise StackError(f"grid, {name}: what is relative to the stack has no whole steps;"
                             " leave it out")  # fmt: skip
        value, unit = as_value(step, f"grid, {name}", free[name].unit)
        if unit != free[name].unit:
            raise StackError(f"grid, {name}: got {show(step)}; it is counted in {free[name].unit}")
        if value <= 0.0:
            raise StackError(f"grid, {name}: got {show(step)}; a step above zero is due")
        found[name] = value
    return found


def rounded(problem: Problem, here: Point, grid: Mapping[str, float]) -> tuple[Point, Stack] | None:
    """Return the best design in whole steps; None if nothing has any, or none can be solved."""
    steps = steps_of(problem.wishes, here, grid)
    if not steps:
        return None
    best: tuple[float, Point, Stack] | None = None
    for counts in _candidates(problem, here, steps):
        stack = _grown(here.levels.stack, steps, counts)
        try:
            point = problem.placed(problem.solve(stack), here)
        except BandwrightError:
            continue
        if point is None or any(not point.energy(pair) > 0.0 for pair in problem.wishes.pairs):
            continue
        score = _score(point.deviations, point.broken, math.log(max(point.quantity, 1e-300))
                       if problem.wishes.quantity else 0.0)  # fmt: skip
        if best is None or score < best[0]:
            best = score, point, stack
    return None if best is None else best[1:]


def _score(deviations: Floats, broken: float, gained: float) -> float:
    lost = 1.0 + broken if broken > _SLACK else 0.0  # what breaks a limit comes after all others
    return float(0.5 * _TARGETS**2 * (deviations @ deviations + lost) - gained)


def steps_of(wishes: Wishes, here: Point, grid: Mapping[str, float]) -> list[Step]:
    """Return what is rounded: each thickness whose layers have one monolayer, and what has a grid.

    Layers that were not free are rounded as well, but by less than a monolayer.
    """
    stack, free = here.levels.stack, {one.name: one for one in wishes.free}
    taken = {n for one in wishes.free if one.parameter.kind == "thickness"
             for n in one.parameter.layer_numbers}  # fmt: skip
    others = [
        p for p in list_parameters(stack)
        if p.kind == "thickness" and not taken.intersection(p.layer_numbers)
    ]  # fmt: skip
    found = []
    for parameter in (*(one.parameter for one in wishes.free), *others):
        own = free.get(parameter.name)
        size = grid.get(parameter.name)
        whole = size is None and parameter.kind == "thickness"
        if whole:
            size = _monolayer(here, parameter)
        if size is not None:
            value = read(stack, parameter.name)
            choices = _choices(value / size, own, size)
            if choices:
                found.append(Step(parameter, size, whole, value, choices))
    return found


def _monolayer(here: Point, parameter: Parameter) -> float | None:
    """Return the monolayer in the parameter's unit; None where its layers have none in common."""
    facts = here.levels.profile.facts
    heights = [facts[number - 1].monolayer for number in parameter.layer_numbers]
    if not all(abs(height - heights[0]) <= 1e-12 for height in heights):  # nan is none either
        return None
    return 1.0 if parameter.unit == "ML" else heights[0]


def _choices(count: float, own: Free | None, size: float) -> tuple[int, ...]:
    """Return the whole numbers around a number of steps, within the bounds of a free parameter."""
    nearest = round(count)
    if abs(count - nearest) < 1e-9 * max(1.0, abs(count)) and own is None:
        return (nearest,)
    low = math.floor(count)
    if own is None:
        return tuple(n for n in (low, low + 1) if n > 0)
    least, most = own.least / size * (1 - 1e-12), own.most / size * (1 + 1e-12)
    around = [n for n in range(low - 1, low + 3) if least <= n <= most]
    positive = own.parameter.kind == "thickness"
    return tuple(n for n in around if n > 0 or not positive)


def _candidates(problem: Problem, here: Point, steps: list[Step]) -> list[tuple[int, ...]]:
    """Return the best combinations by the linear model, those that keep the limits first."""
    slopes = _slopes(problem, here, [step.parameter for step in steps])
    targets = len(here.deviations)
    sizes = np.array([step.size for step in steps])
    changes = slopes * sizes
    # those that matter most first, so that the fine ones take back what is left
    order = np.argsort(-np.abs(changes[:targets]).sum(axis=0), kind="stable")
    sums = np.concatenate((here.deviations, here.rests))[None, :]
    picks = np.zeros((1, 0), dtype=np.int64)
    distance = np.zeros(1)
    for place in order:
        step = steps[place]
        counts = np.array(step.choices)
        away = counts - step.value / step.size
        sums = sums[:, None, :] + away[:, None] * changes[:, place]
        sums = sums.reshape(len(distance) * len(counts), len(changes))
        distance = (distance[:, None] + away**2).ravel()
        picks = np.hstack((np.repeat(picks, len(counts), axis=0),
                           np.tile(counts, len(picks))[:, None]))  # fmt: skip
        broken = -np.minimum(sums[:, targets:], 0.0).sum(axis=1)
        cost = (sums[:, :targets] ** 2).sum(axis=1) + _NEAR * distance + 10.0 * broken
        kept = np.argsort(cost, kind="stable")[:_CARRIED]
        sums, distance, picks = sums[kept], distance[kept], picks[kept]
    back = np.argsort(order)
    return [tuple(int(n) for n in row[back]) for row in picks[:_SOLVED]]


def _slopes(problem: Problem, here: Point, parameters: list[Parameter]) -> Floats:
    """Return slopes of deviations and of what limits leave, (n_rows, n_parameters) per unit."""
    names = [parameter.name for parameter in parameters]
    gradient = here.levels.gradient(names)
    ends = {number: gradient.energies[place] for number, place in here.places.items()}

    def line(pair: tuple[int | str, int]) -> Floats:
        upper = ends[pair[0]] if isinstance(pair[0], int) else gradient.of_row(pair[0])
        return np.asarray(upper - ends[pair[1]])

    targets = [w * line(t.pair) / here.energy(t.pair)
               for w, t in zip(problem.weights, problem.wishes.targets, strict=True)]  # fmt: skip
    thick = _thickness(here, parameters)
    limits = [sign / end * (thick if one.pair is None else line(one.pair))
              for one, sign, end in problem.ends]  # fmt: skip
    return np.array([*targets, *limits]).reshape(-1, len(parameters))


def _thickness(here: Point, parameters: list[Parameter]) -> Floats:
    """Return how the total thickness [nm] changes with each thickness, per unit."""
    copies = {w.number: w.copies for w in here.levels.stack.written()}
    facts = here.levels.profile.facts
    return np.array([
        sum(copies[n] * (facts[n - 1].monolayer if p.unit == "ML" else 1.0)
            for n in p.layer_numbers) if p.kind == "thickness" else 0.0
        for p in parameters
    ])  # fmt: skip


def _grown(stack: Stack, steps: list[Step], counts: tuple[int, ...]) -> Stack:
    """Return the design in whole steps; monolayers are written as such, but for tables in nm."""
    for step, count in zip(steps, counts, strict=True):
        if step.in_monolayers:
            value = count * step.size
        else:
            value = float(count * Decimal(repr(step.size)))
        stack = replace(stack, step.parameter.name, value)
        if step.in_monolayers:
            for written in stack.written():
                shapes = [shape for _, shape in written.layer.shapes]
                tabled = any(isinstance(shape, Points | Function) for shape in shapes)
                if written.number in step.parameter.layer_numbers and not tabled:
                    whole = written.layer.replace(thickness=Length(float(count), "ML"))
                    stack = stack.with_layer(written.number, whole)
    return stack
