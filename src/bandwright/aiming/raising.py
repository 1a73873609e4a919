"""On from a design that meets the targets to the one with the largest dipole or strength.

Steps along the directions that the targets leave open, by a quadratic model that learns its
curvature from the steps; after each the targets are met again. States have no exact slopes here:
what is maximised is differenced, a solve for each open direction.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from .nearest import least_squares, met, nearest
from .problem import Point, Problem

Floats = npt.NDArray[np.float64]

#: step of the differences, in scaled parameters; states are good to far better
_STEP = 1e-4
#: directions that change a target by less than this are open
_OPEN = 1e-7
#: first and smallest reach of a step, in scaled parameters
_REACH, _SHORTEST = 0.25, 1e-3
#: a step that promises to raise the logarithm of what is maximised by less is none
_GAIN = 1e-4
#: how close targets are met between steps, relative
_CLOSE = 1e-4
_MOST = 20


def raised(problem: Problem, start: Point) -> Point:
    """Return the design of the largest quantity that is found from one which meets the targets."""
    here, reach, fresh = start, _REACH, True
    open_ = open_directions(here)
    if not open_.shape[1]:
        return start
    slope = quantity_slope(problem, here, open_)
    bend = _round_bend(slope, reach)
    for _ in range(_MOST):
        step = _step(here, slope, bend, open_, reach)
        promised = float(slope @ step - 0.5 * step @ bend @ step)
        if promised < _GAIN or reach < _SHORTEST:
            break
        there = nearest(problem, np.clip(here.x + step, 0.0, 1.0), here, close=_CLOSE)
        if there is None or not met(there, _CLOSE):
            reach = 0.25 * float(np.abs(step).max())
            continue
        gone = there.x - here.x
        gain = _log(there.quantity) - _log(here.quantity)
        reach = _next_reach(reach, step, gain / promised)
        if gain <= 0.0:
            bend = _bent(bend, gone, float(2.0 * (slope @ gone - gain)))
            continue
        before, here = slope, there
        open_ = open_directions(here)
        slope = quantity_slope(problem, here, open_)
        if fresh:  # what the first slope alone made believe
            bend, fresh = _round_bend(slope, reach), False
        bend = _learned(bend, gone, before - slope)
    found = nearest(problem, here.x, here)
    better = found is not None and met(found) and found.quantity > start.quantity
    return found if better and found is not None else start


def _next_reach(reach: float, step: Floats, kept: float) -> float:
    """Return the reach of the next step, by what share of its promise this one has kept."""
    length = float(np.abs(step).max())
    if kept < 0.25:
        return 0.25 * length if kept < 0.0 else 0.5 * length
    return min(2.0 * reach, 1.0) if kept > 0.75 and length > 0.99 * reach else reach


def _round_bend(slope: Floats, reach: float) -> Floats:
    """Return a curvature alike in all directions, whose maximum lies at a reach."""
    return np.eye(len(slope)) * max(float(np.linalg.norm(slope)), _GAIN) / reach


def _bent(bend: Floats, gone: Floats, due: float) -> Floats:
    """Return a curvature that foretells what a step has lost."""
    more = due - float(gone @ bend @ gone)
    return bend + max(more, 0.0) / float(gone @ gone) ** 2 * np.outer(gone, gone)


def _learned(bend: Floats, gone: Floats, turned: Floats) -> Floats:
    """Return the curvature updated by how a slope has turned along a step (BFGS)."""
    along, turn = bend @ gone, float(turned @ gone)
    size = float(gone @ along)
    if turn < 0.1 * size:  # damped, so that it stays a maximum's
        share = 0.9 * size / (size - turn)
        turned = share * turned + (1.0 - share) * along
        turn = float(turned @ gone)
    return np.asarray(bend - np.outer(along, along) / size + np.outer(turned, turned) / turn)


def _step(point: Point, slope: Floats, bend: Floats, open_: Floats, reach: float) -> Floats:
    """Return the best step of the quadratic model along the open directions."""
    count = len(point.x)
    inner = open_.T @ bend @ open_ + 1e-12 * np.eye(open_.shape[1])
    root: Floats = np.asarray(np.linalg.cholesky(inner), dtype=float)
    low, high = np.maximum(-point.x, -reach), np.minimum(1.0 - point.x, reach)
    sides = np.vstack((np.eye(count), -np.eye(count), point.rest_slopes)) @ open_
    # what is broken by less than rounding must not forbid every step
    least = np.concatenate((low, -high, np.minimum(-point.rests, 0.0)))
    best: Floats = np.asarray(np.linalg.solve(root, open_.T @ slope), dtype=float)
    found = least_squares(np.asarray(root.T, dtype=float), best, sides, least)
    return np.zeros(count) if found is None else open_ @ found


def open_directions(point: Point) -> Floats:
    """Return unit vectors (n_free, n_open) along which no target changes."""
    rows = point.deviation_slopes
    if not len(rows):
        return np.eye(len(point.x))
    _, sizes, directions = np.linalg.svd(rows)
    taken = int(np.sum(sizes > _OPEN * max(1.0, float(sizes[0]))))
    return np.asarray(directions[taken:].T)


def quantity_slope(problem: Problem, point: Point, directions: Floats) -> Floats:
    """Return the slope of the logarithm of what is maximised along directions, (n_free,)."""
    slope = np.zeros(len(point.x))
    for direction in directions.T:
        ahead = point.x + _STEP * direction
        # away from the bounds where that is possible; over one by a hair elsewhere
        inside = bool(np.all((ahead >= 0.0) & (ahead <= 1.0)))
        step = _STEP if inside else -_STEP
        there = problem.at(point.x + step * direction, point)
        if there is not None:
            slope += direction * (_log(there.quantity) - _log(point.quantity)) / step
    return slope


def _log(value: float) -> float:
    return math.log(max(value, 1e-300))
