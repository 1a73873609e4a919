"""compare(): designs side by side, one row each, columns from a registry of metrics."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from .errors import BandwrightError, StackError, UnknownName, close_matches
from .frames import frame
from .levels import Levels, solve
from .lines import Lines, read_strength, read_window
from .quantities import show
from .stack import Stack
from .stackfile import read_stack

if TYPE_CHECKING:
    import pandas as pd

Value = float | int | str | None
#: a number, word or None of one solved design
Metric = Callable[["Solved"], Value]


class Solved(NamedTuple):
    """What a metric is given: a design's stack, its levels, and its lines as filtered."""

    stack: Stack
    levels: Levels
    lines: Lines


def _of_strongest(name: str) -> Metric:
    """Return the metric that reads one number of the strongest line; None without a line."""
    return lambda solved: getattr(solved.lines.strongest, name, None)


def _level_count(solved: Solved) -> int:
    """Return the number of levels of the structure, copies counted, those of a box not."""
    return int(np.sum(~solved.levels.of_box))


def _largest_difference(solved: Solved) -> float | None:
    """Return the largest |phase integral - shooting| of the structure's levels [meV]."""
    levels = solved.levels
    differences = np.abs(levels.phase_integral - levels.energies)[~levels.of_box] * 1e3
    known = differences[np.isfinite(differences)]
    return float(known.max()) if len(known) else None


def _thickness(solved: Solved) -> float:
    return solved.levels.profile.thickness


#: every metric by the name of its column; `add_metric` adds to it
METRICS: dict[str, Metric] = {
    "levels": _level_count,
    "upper": _of_strongest("upper"),
    "lower": _of_strongest("lower"),
    "wavelength_um": _of_strongest("wavelength_um"),
    "energy_meV": _of_strongest("energy_meV"),
    "wavenumber_per_cm": _of_strongest("wavenumber_per_cm"),
    "frequency_THz": _of_strongest("frequency_THz"),
    "dipole_nm": _of_strongest("dipole_nm"),
    "oscillator_strength": _of_strongest("oscillator_strength"),
    "largest_difference_meV": _largest_difference,
    "thickness_nm": _thickness,
    "cautions": lambda solved: len(solved.lines.cautions),
}
DEFAULT = (
    "levels", "upper", "lower", "wavelength_um", "energy_meV", "dipole_nm", "oscillator_strength",
    "largest_difference_meV", "thickness_nm",
)  # fmt: skip
_WHOLE = ("levels", "upper", "lower", "cautions")


def add_metric(column: str, metric: Metric) -> None:
    """Make a metric known to `compare` by the name of its column.

    Parameters
    ----------
    column : str
        Name of the column, with its unit: ``"thickness_nm"``.
    metric : callable
        Takes a `Solved` (``.stack``, ``.levels``, ``.lines``), gives a number, a word or None.

    Raises
    ------
    StackError
        If the name is taken or the metric can't be called.

    Examples
    --------
    >>> add_metric("bare_levels", lambda solved: len(solved.levels))
    >>> METRICS.pop("bare_levels") is not None
    True
    """
    if column in METRICS or column in ("design", "reason"):
        raise StackError(f"metric {column!r} is taken; choose another name")
    if not callable(metric):
        raise StackError(f"metric {column!r}: got {show(metric)}; give a function of one argument")
    METRICS[column] = metric


def compare(
    stacks: Iterable[Stack | str | os.PathLike[str]],
    metrics: Sequence[str] | Mapping[str, Metric] | None = None,
    *,
    window: Sequence[object] | None = None,
    strength: float | None = None,
    **solve_args: Any,
) -> pd.DataFrame:
    """Return designs side by side, one row each.

    Parameters
    ----------
    stacks : iterable of Stack or path
        The designs; a path is a stack file.
    metrics : sequence of str, or mapping of str to callable, optional
        Columns by name (`METRICS` lists them), or name -> function of a `Solved`. By default the
        number of levels, the strongest line (its levels, wavelength, energy, dipole, oscillator
        strength), the largest phase-integral difference, and the total thickness.
    window, strength : optional
        Which lines count, as for `Levels.lines`.
    **solve_args
        As for `bandwright.solve`.

    Returns
    -------
    DataFrame
        Index ``design`` (from 1 in the order given), columns ``name``, the metrics, and
        ``reason``: why a design has no numbers, empty for those that have.

    Raises
    ------
    StackError
        If ``stacks`` holds something else.
    QuantityError
        If ``window`` or ``strength`` can't be read.
    UnknownName
        If there is no metric of a name.

    Examples
    --------
    >>> import bandwright as bw
    >>> wells = [bw.parse_line(f"20 nm {{edge 250 meV, mass 0.092}}, {w} nm {{edge 0 meV,"
    ...          f" mass 0.067}}, 20 nm {{edge 250 meV, mass 0.092}}") for w in (8, 10)]
    >>> print(bw.compare(wells, ["upper", "lower", "wavelength_um"]).round(3))
            name  upper  lower  wavelength_um reason
    design
    1       None      2      1         10.350   None
    2       None      3      2         10.003   None
    """
    chosen = _chosen(metrics)
    filters = {"window": read_window(window), "strength": read_strength(strength)}
    rows = [_row(stack, chosen, filters, solve_args) for stack in _designs(stacks)]
    columns = {name: [row.get(name) for row in rows] for name in ("name", *chosen, "reason")}
    return frame(
        {"design": list(range(1, len(rows) + 1)), **columns},
        index="design", texts=("name", "reason"), integers=[n for n in _WHOLE if n in chosen],
    )  # fmt: skip


def _designs(stacks: object) -> list[Stack | str | os.PathLike[str]]:
    if isinstance(stacks, Stack | str | os.PathLike) or not isinstance(stacks, Iterable):
        raise StackError(f"stacks: got {show(stacks)}; give a list of stacks, [stack, ...]")
    designs = list(stacks)
    for number, stack in enumerate(designs, start=1):
        if not isinstance(stack, Stack | str | os.PathLike):
            raise StackError(f"design {number}: got {show(stack)}; a Stack or a path is due")
    return designs


def _chosen(metrics: Sequence[str] | Mapping[str, Metric] | None) -> dict[str, Metric]:
    if metrics is None:
        metrics = DEFAULT
    if isinstance(metrics, Mapping):
        return dict(metrics)
    if isinstance(metrics, str):
        metrics = (metrics,)
    for name in metrics:
        if name not in METRICS:
            raise UnknownName(f"metrics: there is none of the name {name!r}"
                              f"{close_matches(str(name), METRICS)}")  # fmt: skip
    return {name: METRICS[name] for name in metrics}


def _row(
    given: Stack | str | os.PathLike[str],
    chosen: Mapping[str, Metric],
    filters: Mapping[str, Any],
    solve_args: Mapping[str, Any],
) -> dict[str, Value]:
    """Return one design's numbers, or its name and the reason it has none."""
    name = given.name if isinstance(given, Stack) else os.fspath(given)
    row: dict[str, Value] = {"name": name}
    try:
        stack = given if isinstance(given, Stack) else read_stack(given)
        row["name"] = stack.name or name
        levels = solve(stack, **solve_args)
        solved = Solved(stack, levels, Lines(levels, **filters))
        return row | {column: metric(solved) for column, metric in chosen.items()}
    except BandwrightError as error:
        return row | {"reason": str(error)}
