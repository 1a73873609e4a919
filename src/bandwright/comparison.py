"""compare(): designs side by side, one row each, columns from a registry of metrics."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from .errors import BandwrightError, StackError
from .frames import frame
from .levels import solve
from .metrics import WHOLE, Choice, Metric, Value, choose, read_choice
from .quantities import show
from .stack import Stack
from .stackfile import read_stack
from .tolerances.columns import NAMES as TOLERANCES
from .tolerances.columns import with_spreads
from .wishes import ranks, read_wishes, scores

if TYPE_CHECKING:
    import pandas as pd

DEFAULT = (
    "levels", "upper", "lower", "wavelength_um", "energy_meV", "dipole_nm", "oscillator_strength",
    "largest_difference_meV", "thickness_nm",
)  # fmt: skip
#: what the phase integral knows alone
ENERGIES_ONLY = ("levels", "level_1_meV", "level_2_meV", "spacing_2_1_meV", "thickness_nm")
#: columns that `compare` makes itself
_OWN = ("name", "rank", "score", "reason")
_NEEDED = {
    "spreads": "spreads={'every thickness': '0.3 ML'}, in the shell --spread",
    "yield_window": "yield_window=('10 um', '10.6 um'), in the shell --yield-window",
}


def compare(
    stacks: Iterable[Stack | str | os.PathLike[str]],
    metrics: Sequence[str] | Mapping[str, Metric] | None = None,
    *,
    line: object = None,
    window: Sequence[object] | None = None,
    strength: float | None = None,
    spreads: Mapping[str, object] | None = None,
    yield_window: Sequence[object] | None = None,
    wishes: Mapping[str, object] | None = None,
    **solve_args: Any,
) -> pd.DataFrame:
    """Return designs side by side, one row each; ranked, if wishes say what is good.

    A wish marks each design from 1, the best of those compared, to 0, the worst, straight in
    between: by the distance from its target (``"near"``; 0 is the farthest), or by the number
    itself (``"large"``, ``"small"``). A design without the number gets 0. The score is the mean of
    its marks, weighted; so it says how designs stand among each other, and changes with the
    company. A design that failed has none.

    Parameters
    ----------
    stacks : iterable of Stack or path
        The designs; a path is a stack file.
    metrics : sequence of str, or mapping of str to callable, optional
        Columns by name (`bandwright.metrics.METRICS` lists them), or name -> function of a
        `Solved`. By default the number of levels, the line (its levels, wavelength, energy,
        dipole, oscillator strength), the largest phase-integral difference, and the total
        thickness; by the phase integral alone, the lowest levels. With ``spreads``, also
        ``"sigma_um"`` and ``"sigma_meV"``, and ``"yield_percent"`` with ``yield_window``.
    line : (upper, lower), optional
        The line by the numbers of its levels; each design's strongest if absent.
    window, strength : optional
        Which lines count, as for `Levels.lines`.
    spreads : mapping of str to quantity or text, optional
        Standard deviations, as for `bandwright.tolerance`; sigma and yield are to first order.
    yield_window : pair of wavelengths, optional
        What counts as yield.
    wishes : mapping of str to tuple or text, optional
        Metric -> ``("near", target)``, ``("large",)`` or ``("small",)``, with a weight behind if
        it is not 1; as text, ``"near 10.3, weight 2"``. Targets are in the column's unit. A wish's
        metric is a column too.
    **solve_args
        As for `bandwright.solve`.

    Returns
    -------
    DataFrame
        Index ``design`` (from 1 in the order given), columns ``name``, with wishes ``rank`` (1 is
        the best) and ``score``, the metrics, and ``reason``: why a design has no numbers, empty
        for those that have.

    Raises
    ------
    StackError
        If ``stacks`` holds something else, ``line`` is no pair of levels, or a wish is of no known
        kind.
    QuantityError
        If ``window``, ``yield_window``, ``strength``, or a target or weight can't be read.
    UnknownName
        If there is no metric of a name, in ``metrics`` or ``wishes``.

    Examples
    --------
    Invented wells, once as they are, once against a wish:

    >>> import bandwright as bw
    >>> wells = [bw.parse_line(f"20 nm {{edge 250 meV, mass 0.092}}, {w} nm {{edge 0 meV,"
    ...          f" mass 0.067}}, 20 nm {{edge 250 meV, mass 0.092}}") for w in (8, 10)]
    >>> print(bw.compare(wells, ["upper", "lower", "wavelength_um"]).round(3))
            name  upper  lower  wavelength_um reason
    design
    1       None      2      1         10.350   None
    2       None      3      2         10.003   None
    >>> wishes = {"wavelength_um": ("near", 10.3, 2.0), "dipole_nm": ("large",)}
    >>> print(bw.compare(wells, [], wishes=wishes).round(3))
            name  rank  score  wavelength_um  dipole_nm reason
    design
    1       None     1  0.554         10.350      2.146   None
    2       None     2  0.333         10.003      2.614   None
    """
    wanted = read_wishes(wishes)
    chosen = metrics_of(metrics, spreads, yield_window, solve_args.get("method"))
    more = with_spreads(spreads, yield_window)
    chosen |= choose([name for name in wanted if name not in chosen], (), more, "wishes")
    for name in chosen:
        if name in _OWN:
            raise StackError(f"metrics: {name!r} is the name of another column")
    choice = read_choice(line, window, strength)
    rows = [_row(stack, chosen, choice, solve_args) for stack in _designs(stacks)]
    ranked: dict[str, list[Any]] = {}
    if wanted:
        found = scores(wanted, {name: _numbers(name, rows) for name in wanted})
        found[[row.get("reason") is not None for row in rows]] = np.nan
        ranked = {"rank": ranks(found), "score": found.tolist()}
    columns = {"name": [row["name"] for row in rows], **ranked}
    columns |= {name: [row.get(name) for row in rows] for name in (*chosen, "reason")}
    return frame(
        {"design": list(range(1, len(rows) + 1)), **columns},
        index="design", texts=("name", "reason"), integers=[n for n in WHOLE if n in chosen],
    )  # fmt: skip


def metrics_of(
    metrics: Sequence[str] | Mapping[str, Metric] | None,
    spreads: Mapping[str, object] | None = None,
    yield_window: Sequence[object] | None = None,
    method: str | None = None,
) -> dict[str, Metric]:
    """Return the metrics of a comparison by column: those asked, or the usual ones.

    Raises
    ------
    UnknownName, StackError, QuantityError
        As `compare`.

    Examples
    --------
    >>> list(metrics_of(None, method="phase-integral"))[:2]
    ['levels', 'level_1_meV']
    """
    more = with_spreads(spreads, yield_window)
    if method == "phase-integral":
        return choose(metrics, ENERGIES_ONLY, more)
    for name in TOLERANCES if not isinstance(metrics, Mapping | None) else ():
        if name in (metrics or ()) and name not in more:
            what = "yield_window" if spreads is not None else "spreads"
            raise StackError(f"metrics: {name} needs {what}, such as {_NEEDED[what]}")
    return choose(metrics, (*DEFAULT, *more), more)


def _numbers(name: str, rows: Sequence[Mapping[str, Value]]) -> npt.NDArray[np.float64]:
    """Return a column of wishes as numbers, nan where there is none."""
    try:
        return np.array([row.get(name) for row in rows], dtype=float)
    except ValueError:
        raise StackError(f"wish for {name}: its column holds words; wish for a number") from None


def _designs(stacks: object) -> list[Stack | str | os.PathLike[str]]:
    if isinstance(stacks, Stack | str | os.PathLike) or not isinstance(stacks, Iterable):
        raise StackError(f"stacks: got {show(stacks)}; give a list of stacks, [stack, ...]")
    designs = list(stacks)
    for number, stack in enumerate(designs, start=1):
        if not isinstance(stack, Stack | str | os.PathLike):
            raise StackError(f"design {number}: got {show(stack)}; a Stack or a path is due")
    return designs


def _row(
    given: Stack | str | os.PathLike[str],
    chosen: Mapping[str, Metric],
    choice: Choice,
    solve_args: Mapping[str, Any],
) -> dict[str, Value]:
    """Return one design's numbers, or its name and the reason it has none."""
    name = given.name if isinstance(given, Stack) else os.fspath(given)
    row: dict[str, Value] = {"name": name}
    try:
        stack = given if isinstance(given, Stack) else read_stack(given)
        row["name"] = stack.name or name
        solved = choice.solved(solve(stack, **solve_args))
        return row | {column: metric(solved) for column, metric in chosen.items()}
    except BandwrightError as error:
        return row | {"reason": str(error)}
