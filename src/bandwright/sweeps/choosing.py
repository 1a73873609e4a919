"""What a sweep asks of each design: its metrics, and the one line they are about.

Both are settled once for all designs, so that no column changes its meaning from row to row.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from ..errors import StackError
from ..levels import Levels
from ..metrics import Choice, Metric, OfEnergies, OfLine, Pair, choose, read_choice
from .plan import Plan
from .work import Part, Task, solve_part

#: most levels that have a column unless metrics are named
MOST_LEVELS = 12
#: what ``line`` may be besides a pair: each design's own, though it may change from one to the next
STRONGEST = "strongest"


def settle(
    plan: Plan,
    metrics: Sequence[str] | Mapping[str, Metric] | None,
    line: object,
    window: Sequence[object] | None,
    strength: float | None,
    group: float,
    arguments: Mapping[str, Any],
    follow: bool = False,
) -> Task:
    """Return what is done with every design.

    A few designs (the first, the last, other corners of the grid) are solved for it: the line, if
    none is named, is the strongest of the first that has one.

    Raises
    ------
    StackError
        If a level is asked from the zero of a stack that names none, or if the line to follow is
        each design's own.
    """
    hops = isinstance(line, str) and line == STRONGEST
    if hops and follow:
        raise StackError("follow: each design's strongest line is not one line; name its levels,"
                         " as line = (2, 1)")  # fmt: skip
    choice = read_choice(None if hops else line, window, strength)
    names = tuple(axis.name for axis in plan.axes)
    task = Task(plan.design, names, tuple(axis.unit for axis in plan.axes), {}, choice, group,
                arguments)  # fmt: skip
    chosen = None if metrics is None else choose(metrics, ())
    probes = _probes(plan, task)
    if chosen is None:
        chosen = _default(probes, arguments)
        if follow:
            chosen = {**choose(["upper", "lower"], ()), **chosen}
    _refuse_hopping(chosen, probes)
    about_line = any(isinstance(metric, OfLine) for metric in chosen.values())
    if choice.pair is None and (about_line or follow) and not hops:
        choice = choice._replace(pair=_strongest(probes, choice))
    return Task(task.design, task.names, task.units, chosen, choice, group, arguments)


def _probes(plan: Plan, task: Task) -> list[Levels]:
    designs = plan.probes()
    found = solve_part(task, Part(designs, plan.values(designs)))
    return [levels for _, levels in found.levels()]


def _default(probes: Sequence[Levels], arguments: Mapping[str, Any]) -> dict[str, Metric]:
    """Return the metrics that cost no states: levels by number, and one line."""
    most = max((len(levels) for levels in probes), default=0)
    most = min(most, arguments.get("at_most") or most, MOST_LEVELS)
    if probes and all(levels.stack.zero is not None for levels in probes):
        levels = [f"level_{number}_meV" for number in range(1, max(most, 1) + 1)]
    else:
        levels = [f"spacing_{number}_1_meV" for number in range(2, max(most, 2) + 1)]
    return choose(["levels_found", *levels, "energy_meV", "wavelength_um"], ())


def _refuse_hopping(chosen: Mapping[str, Metric], probes: Sequence[Levels]) -> None:
    for name, metric in chosen.items():
        counted = isinstance(metric, OfEnergies) and metric.lower is None
        if counted and any(levels.stack.zero is None for levels in probes):
            raise StackError(
                f"metrics: {name} counts from zero, and the stack names none, so that it would hop"
                " when another layer becomes the lowest; name one, as zero = 'GaAs' or the label"
                " of a layer, or ask for spacing_2_1_meV"
            )


def _strongest(probes: Sequence[Levels], choice: Choice) -> Pair:
    for levels in probes:
        line = choice.solved(levels).lines.strongest
        if line is not None:
            return line.upper, line.lower
    return 2, 1
