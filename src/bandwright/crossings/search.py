"""anticrossings(): a stack and a range of one parameter in, a row an anticrossing out."""

from __future__ import annotations

import warnings
from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from ..errors import BandwrightError, BandwrightWarning, StackError
from ..frames import frame
from ..levels import Levels
from ..levels.solving import read_request
from ..quantities import show
from ..stack import Stack
from .candidates import Candidate, Coarse, Floats
from .narrowest import Narrowest, Pair, Point, refine
from .path import LEAST_VALUES, Path

if TYPE_CHECKING:
    import pandas as pd

#: how often a step of the coarse sweep is halved where a level has no successor
_HALVINGS = 3
_SOLVE = ("below", "at_most", "tolerance", "group", "bands")


def anticrossings(
    design: Stack | Callable[..., Stack],
    over: Mapping[str, Any] | pd.DataFrame,
    *,
    of_box: bool = False,
    **solve_args: Any,
) -> pd.DataFrame:
    """Return every anticrossing along one parameter: where it is narrowest, and how narrow.

    Two levels that meet as a parameter changes, above all the field, repel each other and exchange
    their character. Their smallest splitting is twice the coupling between the two states: that
    of an injector and an upper laser level, say.

    Parameters
    ----------
    design : Stack, or callable that returns one
    over : mapping of str to values
        One parameter, as for `bandwright.sweep`: ``{"field": "0 kV/cm..60 kV/cm step 2 kV/cm"}``.
        A range without a step or a count has 31 values. The step should be finer than the
        distance between two anticrossings of the same two levels; an anticrossing itself may be
        any narrower than the step.
    of_box : bool
        Whether anticrossings with levels of the closed box, not of the structure, are listed.
    **solve_args
        ``below``, ``at_most``, ``tolerance``, ``group``, ``bands``, as for `bandwright.solve`.

    Returns
    -------
    DataFrame
        A row an anticrossing, by the parameter's value where it is narrowest: the parameter;
        ``lower`` and ``upper``, the levels' numbers there; ``lower_track`` and ``upper_track``,
        from 1, the states that come in from smaller values: of one number, it is the same state
        from row to row; ``splitting_meV``, the spacing there, with ``splitting_error_meV``;
        ``half_width``, in the parameter's unit, how far from there the spacing has grown by the
        root of two; ``exchange``, how much of their character the two exchange within that, over
        what the two-level formula gives: far from 1 where a third level takes part; ``at_end``,
        whether the spacing is smallest at an end of the range, so that the true minimum may lie
        beyond. With ``of_box`` also whether a level of the box takes part. ``attrs`` hold the
        name of the parameter's column and cautions on designs that were left out.

    Raises
    ------
    StackError, QuantityError, UnknownName
        If parameter or values can't be read, or no design of the range can be solved.
    SolveError
        If an argument of the solution is wrong, or levels can't be found to 1e-9 eV.

    Notes
    -----
    Near the middle two levels are sqrt(splitting^2 + slope^2 (x - x0)^2) apart. Levels are
    followed by overlap along the values given, each step judged by itself; tracks that cross, and
    minima of the spacing at which two levels begin to exchange their character, are refined with
    levels of 1e-9 eV: the square of the spacing is nearly a parabola, so that a few designs give
    its vertex to a thousandth of the half-width (where it is none, a bounded search does). Levels
    that truly cross have a splitting of zero within its error. Where three or more meet at one
    value, as the copies of a superlattice without a field, the rows are pairs of them, and
    ``exchange`` is far from 1.

    Examples
    --------
    An invented pair of wells in a field that brings their lowest levels together:

    >>> import bandwright as bw
    >>> stack = bw.parse_line(
    ...     "15 nm Al0.3Ga0.7As, 5 nm GaAs, 4 nm Al0.3Ga0.7As, 8 nm GaAs, 15 nm Al0.3Ga0.7As",
    ...     substrate="GaAs")
    >>> found = bw.anticrossings(stack, {"field": "10 kV/cm..60 kV/cm step 5 kV/cm"})
    >>> found[["field_kV_per_cm", "lower", "upper", "splitting_meV"]].round(2)
       field_kV_per_cm  lower  upper  splitting_meV
    0            34.44      1      2           5.31
    """
    request, arguments = _solution(solve_args)
    if not isinstance(of_box, bool):
        raise StackError(f"of_box: got {show(of_box)}; True or False is due")
    path = Path.read(design, over, arguments)
    coarse = _swept(path, of_box)
    ends = float(path.values[0]), float(path.values[-1])
    found: list[tuple[Candidate, Narrowest]] = []
    for candidate in coarse.candidates():
        low, high = (
            Point(float(coarse.values[k]), coarse.levels[k], coarse.pair(k, candidate.tracks))
            for k in (candidate.low, candidate.high)
        )
        narrowest = refine(Pair(path, (low, high), request.tolerance), low, high, ends)
        if narrowest is not None and (of_box or not narrowest.of_box):
            found.append((candidate, narrowest))
    table = _table(path, coarse, _distinct(found), of_box)
    table.attrs["parameter"], table.attrs["cautions"] = path.axis.column, _left_out(path, coarse)
    for caution in table.attrs["cautions"]:
        warnings.warn(caution, BandwrightWarning, stacklevel=2)
    return table


def _solution(solve_args: Mapping[str, Any]) -> tuple[Any, dict[str, Any]]:
    for name in solve_args:
        if name not in _SOLVE:
            raise TypeError(f"anticrossings() got an unexpected keyword argument {name!r}")
    given = {"tolerance": "1e-6 eV", "group": "0.01 meV", "below": None, "at_most": None,
             "bands": None, **solve_args}  # fmt: skip
    return read_request(method="shooting", phase_order=1, **given), given


def _swept(path: Path, of_box: bool) -> Coarse:
    """Return the coarse sweep, its steps halved where a level is not found again."""
    values, levels = _solved(path)
    for _ in range(_HALVINGS):
        coarse = Coarse(values, levels, of_box)
        torn = coarse.torn()
        if not len(torn):
            break
        between = 0.5 * (values[torn] + values[torn + 1])
        more = [(value, one) for value, one in zip(between, path.solve(between), strict=True)
                if isinstance(one, Levels)]  # fmt: skip
        values = np.concatenate((values, [value for value, _ in more]))
        levels += [one for _, one in more]
        order = np.argsort(values)
        values, levels = values[order], [levels[k] for k in order]
    return Coarse(values, levels, of_box)


def _solved(path: Path) -> tuple[Floats, list[Levels]]:
    """Return the designs of the coarse sweep that have levels."""
    found = path.solve(path.values)
    good = [isinstance(one, Levels) for one in found]
    if sum(good) < LEAST_VALUES:
        raise next(one for one in found if isinstance(one, BandwrightError))
    return path.values[good], [one for one in found if isinstance(one, Levels)]


def _left_out(path: Path, coarse: Coarse) -> tuple[str, ...]:
    """Return what to say of designs that have no levels."""
    missing = [value for value in path.values if value not in coarse.values]
    if not missing:
        return ()
    (why,) = path.solve(missing[:1])
    return (f"{len(missing)} of {len(path.values)} designs have no levels and are left out, the"
            f" first at {path.axis.name} = {path.shown(missing[0]):.6g}: {why}",)  # fmt: skip


def _distinct(
    found: Sequence[tuple[Candidate, Narrowest]],
) -> list[tuple[Candidate, Narrowest]]:
    """Return each anticrossing once, by the parameter's value."""
    kept: list[tuple[Candidate, Narrowest]] = []
    for one in sorted(found, key=lambda one: one[1].at.value):
        new = one[1]
        same = [
            old for _, old in kept
            if old.at.pair == new.at.pair
            and abs(old.at.value - new.at.value) <= 0.1 * max(old.width, new.width)
        ]  # fmt: skip
        if not same:
            kept.append(one)
    return kept


def _table(
    path: Path, coarse: Coarse, found: Sequence[tuple[Candidate, Narrowest]], of_box: bool
) -> pd.DataFrame:
    rows = [narrowest for _, narrowest in found]
    tracks = [_coming_in(coarse, candidate) for candidate, _ in found]
    unit = path.axis.column.removeprefix(path.axis.name)
    parameter = {path.axis.column: [path.shown(row.at.value) for row in rows]}
    columns: dict[str, list[Any]] = {
        "lower": [row.at.pair[0] + 1 for row in rows],
        "upper": [row.at.pair[1] + 1 for row in rows],
        "lower_track": [pair[0] + 1 for pair in tracks],
        "upper_track": [pair[1] + 1 for pair in tracks],
        "splitting_meV": [1e3 * row.at.spacing for row in rows],
        "splitting_error_meV": [1e3 * row.error for row in rows],
        f"half_width{unit}": [path.shown(row.width) for row in rows],
        "exchange": [row.exchange for row in rows],
        "at_end": [row.at_end for row in rows],
    }
    if of_box:
        columns["of_box"] = [row.of_box for row in rows]
    if path.axis.column in columns:
        raise StackError("is the name of another column; give the argument another name",
                         path.axis.column)  # fmt: skip
    return frame(parameter | columns, integers=("lower", "upper", "lower_track", "upper_track"))


def _coming_in(coarse: Coarse, candidate: Candidate) -> tuple[int, int]:
    """Return the tracks of an anticrossing, the lower one before it first."""
    one, two = candidate.tracks
    lower = coarse.tracks[candidate.low, one] < coarse.tracks[candidate.low, two]
    return (one, two) if lower else (two, one)
