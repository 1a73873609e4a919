"""The nearest design that targets and limits allow: Gauss-Newton steps in a trust region.

Each step is the least-squares solution of the linear model under its linear limits, found exactly
by `scipy.optimize.nnls`; the design is solved once a step, its slopes are exact.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .problem import Point, Problem

Floats = npt.NDArray[np.float64]

#: a target is met when its energy is this close, relative
MET = 1e-9
#: first reach of a step, in scaled parameters
_REACH = 0.5


class Patience(NamedTuple):
    """When a search ends: its smallest reach, and what a step must promise of what is left."""

    reach: float
    promise: float


FINE = Patience(1e-5, 1e-7)
#: of a search that only looks whether a start is worth it, while targets are farther than this
COARSE, _FAR = Patience(1e-2, 2e-2), 2e-3
#: where reaches have become so short, what refused a longer step is what ends the search
_AT_EDGE = 1e-2
#: weighs a step that no target needs, against deviations
_REST = 1e-5
#: weighs what is broken of limits, against deviations
_BROKEN = 10.0
_MOST = 40


def nearest(
    problem: Problem, x: Floats, near: Point | None = None, close: float = MET,
    patience: Patience = FINE,
) -> Point | None:  # fmt: skip
    """Return the design nearest to the targets that is found from a start.

    Deviations that stay are worth a second order: once a step keeps little of its promise, the
    curvature that the slopes so far have shown joins the model. None if the start has no such
    levels; ``problem.why`` says so.
    """
    here = problem.at(x, near)
    if here is None:
        return None
    reach, refused = _REACH, ""
    bend, bends = np.zeros((len(x), len(x))), False
    for _ in range(_MOST):
        if met(here, close):
            break
        rows = _rows(bend) if bends else np.zeros((0, len(x)))
        step = _step(here, reach, rows)
        promised = _merit(here) - _modelled(here, step) - 0.5 * float(np.sum((rows @ step) ** 2))
        limit = patience if _merit(here) > _FAR else FINE
        if promised <= limit.promise * _merit(here) or reach < limit.reach:
            break
        there = problem.at(np.clip(here.x + step, 0.0, 1.0), here)
        gain = -np.inf if there is None else _merit(here) - _merit(there)
        refused = problem.why if there is None else refused
        length = float(np.abs(step).max())
        if there is not None:
            bend = _learned(bend, here, there)
        if gain < 0.25 * promised:
            reach, bends = 0.25 * length, True
        elif gain > 0.75 * promised and length > 0.99 * reach:
            reach = min(2.0 * reach, 1.0)
        if there is not None and gain > 0.0:
            bend *= np.linalg.norm(there.deviations) / np.linalg.norm(here.deviations)
            here = there
    if reach < _AT_EDGE and refused and not met(here, close):
        problem.edges[here.x.tobytes()] = refused
    return here


def met(point: Point, close: float = MET) -> bool:
    """Return whether targets and limits are met."""
    return bool(np.abs(point.deviations).max(initial=0.0) <= close and point.broken <= close)


def _merit(point: Point) -> float:
    return float(0.5 * point.deviations @ point.deviations + _BROKEN * point.broken)


def _modelled(point: Point, step: Floats) -> float:
    left = point.deviations + point.deviation_slopes @ step
    rests = point.rests + point.rest_slopes @ step
    return float(0.5 * left @ left - _BROKEN * np.minimum(rests, 0.0).sum())


def _learned(bend: Floats, here: Point, there: Point) -> Floats:
    """Return the curvature of the deviations, times them, by how slopes have turned (SR1)."""
    gone = there.x - here.x
    left = (there.deviation_slopes - here.deviation_slopes).T @ here.deviations - bend @ gone
    size = float(left @ gone)
    if abs(size) < 1e-8 * float(np.linalg.norm(left) * np.linalg.norm(gone)) or size == 0.0:
        return bend
    return np.asarray(bend + np.outer(left, left) / size)


def _rows(bend: Floats) -> Floats:
    """Return rows whose squares are the curvature, where it is a minimum's, (n_rows, n_free)."""
    sizes, directions = np.linalg.eigh(bend)
    return np.asarray(np.sqrt(np.maximum(sizes, 0.0))[:, None] * directions.T)


def _step(point: Point, reach: float, bends: Floats) -> Floats:
    """Return the step that the linear model asks for, with rows of curvature beside it."""
    count = len(point.x)
    low, high = np.maximum(-point.x, -reach), np.minimum(1.0 - point.x, reach)
    box = np.vstack((np.eye(count), -np.eye(count)))
    ends = np.concatenate((low, -high))
    slopes = np.vstack((point.deviation_slopes, bends))
    deviations = np.concatenate((point.deviations, np.zeros(len(bends))))
    broken = point.rests < 0.0
    limited = least_squares(
        slopes, -deviations,
        np.vstack((box, point.rest_slopes)), np.concatenate((ends, -point.rests)),
    )  # fmt: skip
    if limited is not None:
        return limited
    # the limits are out of reach of one step: towards them, and nothing else
    towards = least_squares(point.rest_slopes[broken], -point.rests[broken], box, ends)
    return np.zeros(count) if towards is None else towards


def least_squares(rows: Floats, values: Floats, sides: Floats, least: Floats) -> Floats | None:
    """Return the d of smallest |rows d - values|, with sides d >= least; None if nothing fits.

    Where the rows leave d open, the shortest.

    Notes
    -----
    C. L. Lawson and R. J. Hanson, "Solving Least Squares Problems" (1974), chapter 23, from
    memory: a change of variables makes it the shortest vector under inequalities, which is the
    residual of a least-squares problem of non-negative unknowns.

    Examples
    --------
    The shortest d with d1 + d2 = 1 and d1 >= 0.75:

    >>> one = np.ones((1, 2))
    >>> print(least_squares(one, np.ones(1), np.array([[1.0, 0.0]]), np.array([0.75])).round(6))
    [0.75 0.25]
    """
    from scipy.linalg import solve_triangular
    from scipy.optimize import nnls

    count = sides.shape[1]
    moved = np.abs(sides).max(axis=1) > 0.0
    if np.any(least[~moved] > 0.0):
        return None  # what nothing moves is broken
    sides, least = sides[moved], least[moved]
    size = _REST * max(1.0, float(np.abs(rows).max(initial=0.0)))
    q, r = np.linalg.qr(np.vstack((rows, size * np.eye(count))))
    best = q.T @ np.concatenate((values, np.zeros(count)))
    turned = solve_triangular(r, sides.T, trans="T").T
    needed = least - turned @ best
    scale = np.linalg.norm(turned, axis=1)
    turned, needed = turned / scale[:, None], needed / scale
    unit = float(needed.max(initial=0.0))
    if unit <= 0.0:
        return np.asarray(solve_triangular(r, best))
    system = np.vstack((turned.T, needed / unit))
    right = np.append(np.zeros(count), 1.0)
    weights, distance = nnls(system, right)
    if distance < 1e-10:
        return None
    left = system @ weights - right
    return np.asarray(solve_triangular(r, best - unit * left[:count] / left[count]))
