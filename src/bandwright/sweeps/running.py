"""Parts of a sweep through an executor: a bounded number in work, blocks as they come."""

from __future__ import annotations

import os
import pickle
import signal
import sys
import threading
from collections.abc import Generator, Iterator
from concurrent.futures import FIRST_COMPLETED, Executor, Future, wait
from typing import Any

from ..errors import SolveError, StackError
from ..quantities import show
from .work import Block, Part, Task, compute

_GUARD = (
    "a worker process ended before its work; in a script, put the call below"
    " if __name__ == '__main__':, and give a function from a file that can be imported; if memory"
    " ran out, give a smaller chunk"
)


def run(
    task: Task, parts: Iterator[Part], workers: int, executor: Executor | None
) -> Generator[Block, None, None]:
    """Yield the rows of each part, in the order in which they come.

    No more than ``workers`` parts are unfinished at any time, so that a run that is killed has so
    many to do again, and so that memory is bounded.

    Parameters
    ----------
    task : Task
    parts : iterator of Part
    workers : int
        With 1 and no executor, this process does the work.
    executor : Executor, optional
        Anything with ``submit`` of concurrent.futures; processes of this machine if absent.

    Raises
    ------
    StackError
        If the task can't be sent to other processes.
    SolveError
        If a worker process dies.
    """
    if executor is not None:
        yield from _submitted(task, parts, workers, executor)
    elif workers == 1:
        make = task.maker()
        for part in parts:
            yield compute(task, part, make)
    else:
        yield from _in_processes(task, parts, workers)


def worker_count(workers: object, executor: object) -> int:
    """Return how many parts are in work at a time.

    Raises
    ------
    SolveError
        If ``workers`` is no whole number from 1, or ``executor`` is no executor.
    """
    if isinstance(workers, bool) or not isinstance(workers, int) or workers < 1:
        raise SolveError(f"workers: got {show(workers)}; a whole number from 1 is due")
    if executor is None or workers > 1:
        return workers
    if not callable(getattr(executor, "submit", None)):
        raise SolveError(
            f"executor: got {show(executor)}; one of concurrent.futures is due, or what"
            " client.get_executor() of dask.distributed gives"
        )
    return _size_of(executor) or os.cpu_count() or 1


def _size_of(executor: Any) -> int:
    """Return how many calls an executor runs at a time, 0 if it does not tell."""
    own = getattr(executor, "_max_workers", None)
    if isinstance(own, int):
        return own
    threads = getattr(getattr(executor, "_client", None), "nthreads", None)
    return sum(threads().values()) if callable(threads) else 0


def _in_processes(task: Task, parts: Iterator[Part], workers: int) -> Generator[Block, None, None]:
    from concurrent.futures import ProcessPoolExecutor
    from concurrent.futures.process import BrokenProcessPool
    from multiprocessing import get_context

    _refuse_unsendable(task)
    # spawned everywhere alike: a forked copy of a process with threads may stand still
    pool = ProcessPoolExecutor(workers, mp_context=get_context("spawn"), initializer=_start_worker)
    try:
        yield from _submitted(task, parts, workers, pool)
    except BrokenProcessPool:
        raise SolveError(_GUARD) from None
    finally:
        pool.shutdown(wait=True, cancel_futures=True)


def _submitted(
    task: Task, parts: Iterator[Part], workers: int, executor: Executor
) -> Generator[Block, None, None]:
    waiting: set[Future[Block]] = set()
    try:
        for part in parts:
            waiting.add(executor.submit(compute, task, part))
            if len(waiting) >= workers:
                done, waiting = wait(waiting, return_when=FIRST_COMPLETED)
                for future in done:
                    yield future.result()
        while waiting:
            done, waiting = wait(waiting, return_when=FIRST_COMPLETED)
            for future in done:
                yield future.result()
    finally:
        for future in waiting:
            future.cancel()


def _refuse_unsendable(task: Task) -> None:
    named = {"design": task.design, **{f"metric {n!r}": m for n, m in task.metrics.items()}}
    for name, value in named.items():
        try:
            pickle.dumps(value)
        except Exception as error:  # each kind of object has its own way to refuse
            said = " ".join(str(error).split())
            raise StackError(
                f"{name}: can't be sent to other processes ({said}); give a function that is"
                " defined at the top of a module, or workers = 1"
            ) from None
        main = sys.modules.get("__main__")
        if getattr(value, "__module__", None) == "__main__" and not hasattr(main, "__file__"):
            raise StackError(
                f"{name}: is defined in an interactive session, which other processes don't see;"
                " define it in a module and import it, or give workers = 1"
            )


def _start_worker() -> None:
    """Let a worker process end with Ctrl-C at once, and with its parent."""
    from multiprocessing import parent_process

    signal.signal(signal.SIGINT, signal.SIG_DFL)
    parent = parent_process()
    if parent is not None:
        threading.Thread(target=_leave_with, args=(parent,), daemon=True).start()


def _leave_with(parent: Any) -> None:
    parent.join()
    os._exit(1)
