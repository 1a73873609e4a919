"""Medians of competitors whose repetitions take turns, and tables of text.

Processor time of the whole process is measured, so that a neighbour on the machine costs little
and a second thread would win nothing.
"""

from __future__ import annotations

import gc
import statistics
import time

SHORTEST = 4e-3  # seconds that one measurement should last at least


def _once(function, times):
    start = time.process_time()
    for _ in range(times):
        function()
    return (time.process_time() - start) / times


def medians(competitors, seconds=3.0, rounds=15, fewest=3):
    """Return the median seconds of each function of a dict; all take turns, round by round.

    After ``seconds`` no further round is begun, but ``fewest`` are made in any case.
    """
    times = {}
    for name, function in competitors.items():
        function()
        times[name] = max(1, min(2000, int(SHORTEST / max(_once(function, 1), 1e-7))))
    found = {name: [] for name in competitors}
    start = time.process_time()
    gc.collect()
    gc.disable()
    try:
        for turn in range(rounds):
            if turn >= fewest and time.process_time() - start > seconds:
                break
            for name, function in competitors.items():
                found[name].append(_once(function, times[name]))
            gc.collect()
    finally:
        gc.enable()
    return {name: statistics.median(values) for name, values in found.items()}


def text(value):
    """A cell of a table: three digits of a number, - for nothing."""
    if value is None:
        return "-"
    if isinstance(value, float):
        return f"{value:.0f}" if abs(value) >= 1000 else f"{value:.3g}"
    return str(value)


def table(columns, rows):
    """Text of a table: first column to the left, others to the right."""
    cells = [list(columns), *([text(v) for v in row] for row in rows)]
    widths = [max(len(row[i]) for row in cells) for i in range(len(columns))]
    return "\n".join(
        "  ".join(c.rjust(w) if i else c.ljust(w)
                  for i, (c, w) in enumerate(zip(row, widths, strict=True))).rstrip()
        for row in cells
    )  # fmt: skip
