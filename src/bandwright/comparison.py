"""compare(): designs side by side, one row each, columns from a registry of metrics."""

from __future__ import annotations

import os
from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from .errors import BandwrightError, StackError
from .frames import frame
from .levels import solve
from .metrics import WHOLE, Choice, Metric, Value, choose, read_choice
from .quantities import show
from .stack import Stack
from .stackfile import read_stack

if TYPE_CHECKING:
    import pandas as pd

DEFAULT = (
    "levels", "upper", "lower", "wavelength_um", "energy_meV", "dipole_nm", "oscillator_strength",
    "largest_difference_meV", "thickness_nm",
)  # fmt: skip


def compare(
    stacks: Iterable[Stack | str | os.PathLike[str]],
    metrics: Sequence[str] | Mapping[str, Metric] | None = None,
    *,
    line: object = None,
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
        Columns by name (`bandwright.metrics.METRICS` lists them), or name -> function of a
        `Solved`. By default the number of levels, the line (its levels, wavelength, energy,
        dipole, oscillator strength), the largest phase-integral difference, and the total
        thickness.
    line : (upper, lower), optional
        The line by the numbers of its levels; each design's strongest if absent.
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
        If ``stacks`` holds something else, or ``line`` is no pair of levels.
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
    chosen = choose(metrics, DEFAULT)
    choice = read_choice(line, window, strength)
    rows = [_row(stack, chosen, choice, solve_args) for stack in _designs(stacks)]
    columns = {name: [row.get(name) for row in rows] for name in ("name", *chosen, "reason")}
    return frame(
        {"design": list(range(1, len(rows) + 1)), **columns},
        index="design", texts=("name", "reason"), integers=[n for n in WHOLE if n in chosen],
    )  # fmt: skip


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
