"""aim(): a stack and what it should do in, the design that does it out."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import numpy.typing as npt

from ..cautions import warn
from ..errors import StackError
from ..levels.solving import check_stack
from ..quantities import as_energy, show
from ..stack import Stack
from .asking import read_wishes
from .nearest import COARSE, met, nearest
from .problem import Point, Problem, at_most
from .raising import raised
from .result import Aimed
from .rounding import read_grid, rounded, steps_of

Floats = npt.NDArray[np.float64]

#: coarsest tolerance of a solve [eV]: thicknesses to 1e-6 nm need it
_FINE = 1e-9
#: starts followed if nothing says, and starts that may lack a level beside them
_STARTS, _LACKING = 4, 8
#: places that starts are taken from
_SPREAD = 100


def aim(
    stack: Stack,
    free: object,
    targets: object = None,
    *,
    weights: object = None,
    maximise: object = None,
    limits: object = None,
    starts: int | None = None,
    follow: bool = False,
    grid: object = None,
    below: object = None,
    tolerance: object = "1e-9 eV",
    bands: str | None = None,
) -> Aimed:
    """Return the design whose lines have the wavelengths asked, as it is and in whole monolayers.

    Parameters
    ----------
    stack : Stack
        Where the search starts.
    free : mapping of str to span
        Parameters that may change, as `bandwright.parameters.list_parameters` names them, with
        their bounds: ``{"well.thickness": "4 nm..9 nm"}``.
    targets : mapping of line to wavelength or energy
        ``{"2 to 1": "10.3 um", "3 to 2": "120 meV"}``. A line is the spacing of two single
        levels, by number; the upper may be ``"continuum"``.
    weights : mapping of line to number, optional
        What a relative deviation of a target counts where not all can be met; 1 if absent.
    maximise : str, optional
        ``"dipole 3 to 2"`` or ``"oscillator strength 3 to 2"``, with what freedom the targets
        leave. The line may be left out where there is one target.
    limits : mapping, optional
        ``"thickness"``, of all grown layers, or a line, with a span that may be open:
        ``{"thickness": "..60 nm", "2 to 1": "34 meV..38 meV"}``.
    starts : int, optional
        How many starts are followed, the best kept: the stack itself, then places spread over the
        bounds. If absent, up to four, and the first that meets its targets ends the search.
    follow : bool
        Whether levels keep their character, not their number, from the start on.
    grid : mapping of str to step, optional
        Free parameters that are rounded to whole steps, beside the thicknesses.
    below, bands
        As for `bandwright.solve`.
    tolerance : energy
        Of each level; 1e-9 eV at least.

    Returns
    -------
    Aimed
        ``.stack``, ``.rounded``, the tables ``.values``, ``.targets`` and ``.limits``,
        ``.reached``, ``.message``, ``.solves``.

    Raises
    ------
    StackError, QuantityError, UnknownName
        If something asked can't be read, or no design within the bounds has a line; a target out
        of reach is no error: ``.reached`` is False, and the design is the nearest one.

    Notes
    -----
    Deviations are logarithms of energies, so that one percent of a wavelength weighs what one
    percent of an energy does; the design of the smallest sum of squares is found by Gauss-Newton
    steps with the exact slopes of `Levels.gradient`, one solve a step. Where targets leave
    freedom and nothing is maximised, the parameters move as little as they must. What is
    maximised is raised by SLSQP of scipy.optimize.

    Every layer that has monolayers is rounded, free or not (those by less than a monolayer), all
    of them together: the combination whose deviations the exact slopes foretell to be smallest,
    the best few of them solved.

    Examples
    --------
    An invented well; which thickness gives 10.3 um?

    >>> import bandwright as bw
    >>> stack = bw.parse_line(
    ...     "40 nm Al0.24Ga0.76As {label barrier}, 6 nm GaAs {label well},"
    ...     " 40 nm Al0.24Ga0.76As {label barrier}", substrate="GaAs", temperature="77 K")
    >>> aimed = bw.aim(stack, {"well.thickness": "4 nm..12 nm"}, {"2 to 1": "10.3 um"})
    >>> aimed.reached, aimed.solves < 20
    (True, True)
    >>> aimed.values[["parameter", "value", "rounded", "monolayers"]].round(2)
               parameter  value  rounded  monolayers
    0     well.thickness   7.18     7.07          25
    1  barrier.thickness  40.00    39.88         141
    >>> aimed.targets.round(3)
       target  asked  reached  rounded     by unit
    0  2 to 1   10.3     10.3   10.152 -0.148   um
    """
    check_stack(stack, "stack")
    wishes = read_wishes(stack, free, targets, weights, maximise, limits)
    steps = read_grid(wishes, grid)
    if starts is not None and (isinstance(starts, bool) or not isinstance(starts, int)
                               or starts < 1):  # fmt: skip
        raise StackError(f"starts: got {show(starts)}; a whole number from 1 is due")
    finest = min(as_energy(tolerance, "tolerance"), _FINE)
    arguments = {
        "below": below, "bands": bands, "tolerance": f"{finest!r} eV",
        "at_most": at_most(wishes, follow),
    }  # fmt: skip
    problem = Problem(wishes, arguments, follow)
    found, followed = _best(problem, starts)
    in_steps = steps_of(wishes, found, steps)
    whole = rounded(problem, found, steps)
    warn(found.levels)
    return Aimed(
        wishes, found, None if whole is None else whole[0],
        tuple(step.parameter for step in in_steps) if whole else (), problem.solves, followed,
        follow,
    )  # fmt: skip


def _best(problem: Problem, starts: int | None) -> tuple[Point, int]:
    """Return the best design of all starts, and how many were followed."""
    most = _STARTS if starts is None else starts
    problem.solve(problem.stack_at(problem.start))  # what keeps it from being solved is raised
    origin = problem.at(problem.start) if problem.follow else None
    best: Point | None = None
    followed, why = 0, ""
    for place in _places(problem.start, most + _LACKING):
        point = nearest(problem, place, origin, patience=COARSE)
        why = why or problem.why
        if point is None:
            continue
        followed += 1
        if problem.wishes.quantity is not None and met(point):
            point = raised(problem, point)
        best = point if best is None or _rank(point) < _rank(best) else best
        if followed == most or (starts is None and met(point)):
            break
    if best is None:
        raise StackError(f"targets: {why}, nor has any of {most + _LACKING - 1} other designs"
                         " within the bounds")  # fmt: skip
    if not met(best):
        best = nearest(problem, best.x, best) or best
    return best, followed


def _rank(point: Point) -> tuple[float, float]:
    """Return what makes a design better than another, the smaller the better."""
    if met(point):
        return 0.0, -point.quantity if point.problem.wishes.quantity else 0.0
    return 1.0 + point.broken, float(point.deviations @ point.deviations)


def _places(start: Floats, count: int) -> Iterator[Floats]:
    """Yield the start, then places spread over the unit box, each far from those before.

    They are taken from multiples of powers of 1/g, where g^(n+1) = g + 1, a generalised golden
    ratio (common practice for evenly spread points).
    """
    golden = 2.0
    for _ in range(40):
        golden = (1.0 + golden) ** (1.0 / (len(start) + 1))
    steps = golden ** -np.arange(1.0, len(start) + 1)
    spread = (0.5 + np.arange(1, _SPREAD)[:, None] * steps) % 1.0
    away = np.full(len(spread), np.inf)
    place = start
    for _ in range(count):
        yield place
        away = np.minimum(away, np.abs(spread - place).max(axis=1))
        place = spread[np.argmax(away)]
