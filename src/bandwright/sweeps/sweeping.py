"""sweep(): designs by parameters, one row each, through solve_many."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import Executor
from contextlib import ExitStack, closing
from typing import TYPE_CHECKING, Any

import numpy as np

from ..errors import SolveError, StackError
from ..frames import is_table
from ..levels.solving import read_request
from ..metrics import Metric
from ..quantities import energy_text, show
from ..stack import Stack
from .axes import read_axes
from .choosing import settle
from .fingerprint import head_of
from .followed import Following
from .plan import Plan
from .progress import Progress
from .record import Record
from .rows import Rows
from .running import run, worker_count
from .work import Part

if TYPE_CHECKING:
    import pandas as pd

#: designs of one chunk, unless the sweep is small
CHUNK = 1000
_SOLVE = ("below", "at_most", "tolerance", "group", "bands")


def sweep(
    design: Stack | Callable[..., Stack],
    over: Mapping[str, Any] | pd.DataFrame,
    *,
    metrics: Sequence[str] | Mapping[str, Metric] | None = None,
    line: object = None,
    window: Sequence[object] | None = None,
    strength: float | None = None,
    paired: bool = False,
    follow: bool = False,
    results: str | os.PathLike[str] | None = None,
    workers: int = 1,
    executor: Executor | None = None,
    chunk: int | None = None,
    progress: bool = True,
    **solve_args: Any,
) -> pd.DataFrame:
    """Return the designs of a sweep over one or several parameters, one row each.

    Parameters
    ----------
    design : Stack, or callable that returns one
        What is varied. A function is called with the parameters as keyword arguments.
    over : mapping of str to values, or DataFrame
        Parameters of the stack, as `bandwright.parameters` names them (``"well.thickness"``,
        ``"layer 2.composition"``, ``"well.edge"``, ``"field"``, ``"temperature"``), or arguments
        of the function. Values are a range, ``"4 nm..9 nm step 0.5 nm"`` or
        ``"4nm..9nm count 11"``, or a list; with the unit in the name, as
        ``"well.thickness_nm"``, bare numbers. A DataFrame has one row a design.
    metrics : sequence of str, or mapping of str to callable, optional
        Columns by name (`bandwright.metrics.METRICS`, ``"level_2_meV"``, ``"spacing_3_1_meV"``),
        or name -> function of a `bandwright.metrics.Solved`. By default the number of levels
        found, the levels from the stack's zero, or from level 1 where it names none, and energy
        and wavelength of the line: all of them without states, and so the fastest.
    line : (upper, lower) or "strongest", optional
        The line that metrics are about, the same in all designs. If absent, the strongest of the
        first design; ``"strongest"`` is each design's own, which may hop.
    window, strength : optional
        Which lines count, as for `Levels.lines`.
    paired : bool
        Whether design i takes value i of each parameter; else all values meet all others, the
        last parameter changing fastest.
    follow : bool
        Whether the line is followed by character from design to design (`bandwright.follow`):
        its levels have the numbers given in the first design, and their own in each other. Each
        design is followed from the one before it along the last parameter, or from the first of
        the row before; this process solves it for that, besides whoever computes its row.
    results : path, optional
        A file (CSV) that rows are added to as they come. A sweep that was stopped goes on with
        the same call; a file of anything else is refused and stays as it is.
    workers : int
        Processes at work; with an executor, how many chunks it is given at a time.
    executor : concurrent.futures.Executor, optional
        Does the work instead, such as ``client.get_executor()`` of dask.distributed.
    chunk : int, optional
        Designs solved together; by default up to 1,000. A number below it for designs that take
        long each gives smaller steps to go on from.
    progress : bool
        Whether to show a bar, if standard error is a terminal.
    **solve_args
        ``below``, ``at_most``, ``tolerance``, ``group``, ``bands``, as for `bandwright.solve`.

    Returns
    -------
    DataFrame
        Index ``design`` from 1, the parameters, the metrics, and ``reason``: why a design, or one
        of its metrics, has no number. ``attrs`` hold the names of the parameters' columns and the
        line.

    Raises
    ------
    StackError, QuantityError, UnknownName
        If a parameter, a range, a metric or a line can't be read, or nothing is left to sweep.
        What is wrong with some designs only is the reason in their rows.
    SolveError
        If an argument of the solution, ``chunk`` or ``workers`` is wrong.
    ResultsError
        If the results file can't be written, or holds something else.

    Examples
    --------
    An invented pair of wells, the first of them swept:

    >>> import bandwright as bw
    >>> stack = bw.parse_line(
    ...     "20 nm Al0.3Ga0.7As, 7 nm GaAs {label wide}, 1.5 nm Al0.3Ga0.7As, 5 nm GaAs,"
    ...     " 20 nm Al0.3Ga0.7As", substrate="GaAs")
    >>> table = bw.sweep(stack, {"wide.thickness": "6 nm..8 nm step 1 nm"}, line=(3, 1))
    >>> print(table[["wide.thickness_nm", "energy_meV", "wavelength_um"]].round(2))
            wide.thickness_nm  energy_meV  wavelength_um
    design
    1                     6.0      163.87           7.57
    2                     7.0      144.17           8.60
    3                     8.0      126.01           9.84
    """
    request, arguments = _solution(solve_args)
    axes = read_axes(design, over)
    plan = Plan(design, axes, paired or is_table(over))
    if not isinstance(paired, bool):
        raise StackError(f"paired: got {show(paired)}; True or False is due")
    size = _chunk(chunk, len(plan))
    count = worker_count(workers, executor)
    if not isinstance(follow, bool):
        raise StackError(f"follow: got {show(follow)}; True or False is due")
    task = settle(plan, metrics, line, window, strength, request.group, arguments, follow)
    following = Following(plan, task) if follow else None
    rows = Rows(plan, task)
    with ExitStack() as stack:
        record = None
        if results is not None:
            record = Record(results, head_of(plan, task, follow), rows.names, len(plan))
            stack.enter_context(record)
            rows.restore(record.rows())
        bar = stack.enter_context(Progress(len(plan), rows.done, progress))
        # closed here, so that no worker outlives a sweep that is stopped
        work = run(task, _parts(plan, rows.missing, size, following), count, executor)
        try:
            for found in stack.enter_context(closing(work)):
                block = found.only(rows.missing)
                if record is not None:
                    record.write(rows.listed(block))
                rows.add(block)
                bar.forward(len(block.designs))
        except KeyboardInterrupt as stopped:
            if record is not None:
                stopped.add_note(f"{record.path} holds {rows.done:,} of {len(plan):,} designs; the"
                                 " same call goes on from there")  # fmt: skip
            raise
    return rows.table()


def _solution(solve_args: Mapping[str, Any]) -> tuple[Any, dict[str, Any]]:
    """Return the arguments of the solution, read, and as texts that any process reads alike."""
    for name in solve_args:
        if name not in _SOLVE:
            raise TypeError(f"sweep() got an unexpected keyword argument {name!r}")
    given = {"tolerance": "1e-6 eV", "group": "0.01 meV", "below": None, "at_most": None,
             "bands": None, **solve_args}  # fmt: skip
    request = read_request(method="shooting", phase_order=1, **given)
    arguments = {
        "below": None if request.below is None else energy_text(request.below),
        "at_most": request.at_most,
        "tolerance": energy_text(request.tolerance),
        "group": energy_text(request.group),
        "bands": request.bands,
    }
    return request, arguments


def _chunk(chunk: object, designs: int) -> int:
    """Return how many designs are solved together.

    That depends on the sweep alone, not on who works, and so the results don't either.
    """
    if chunk is None:
        return min(CHUNK, max(50, -(-designs // 8)))
    if isinstance(chunk, bool) or not isinstance(chunk, int) or chunk < 1:
        raise SolveError(f"chunk: got {show(chunk)}; a whole number from 1 is due")
    return chunk


def _parts(
    plan: Plan, missing: np.ndarray[Any, Any], size: int, following: Following | None
) -> Iterator[Part]:
    """Yield the chunks of a sweep that are not there yet.

    A chunk of which a part is there is solved as a whole, so that its designs keep their company,
    and their last digits.
    """
    for start in range(0, len(plan), size):
        if not missing[start:].any():
            return
        designs = range(start, min(start + size, len(plan)))
        # a line is followed through chunks that are there as well
        pairs = None if following is None else following.pairs(designs)
        if missing[start : start + size].any():
            yield Part(list(designs), plan.values(designs), pairs)
