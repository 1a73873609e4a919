"""A sweep of a double well over both its widths, beside the yardstick in a loop over designs.

`bandwright.sweep` does the whole of it: stacks, levels, metrics, table. The yardstick is given its
arrays, and is timed on a sample of the grid's designs, each on the coarsest grid that holds its
own error.
"""

from __future__ import annotations

import json
import subprocess
import sys
import warnings

import numpy as np

import bandwright as bw
from benchmarks import sides
from benchmarks.plain import question
from benchmarks.timing import medians

ASKED = {"below": "0.24 eV"}
WIDE, NARROW = (6.0, 9.0), (3.0, 5.0)  # nm

PEAK = """
import json, sys
from benchmarks import grids
designs, results = int(sys.argv[1]), sys.argv[2] or None
table = grids.sweep(designs // 100, 100, results=results)
(most,) = [line for line in open("/proc/self/status") if line.startswith("VmHWM")]
print(json.dumps([len(table), int(most.split()[1]) / 1024]))
"""


def double_well():
    """The coupled wells of the other benchmarks, with labels."""
    barrier = {"edge": "0.25 eV", "mass": 0.092}
    well = {"edge": "0 eV", "mass": 0.067}
    return bw.Stack(
        [bw.Layer("20 nm", **barrier), bw.Layer("7.3 nm", label="wide", **well),
         bw.Layer("1.7 nm", label="thin", **barrier), bw.Layer("4.6 nm", label="narrow", **well),
         bw.Layer("20 nm", **barrier)], zero="wide",
    )  # fmt: skip


def sweep(wide=100, narrow=100, tolerance=1e-6, **arguments):
    """Sweep both widths, so many values each."""
    over = {
        "wide.thickness": f"{WIDE[0]} nm..{WIDE[1]} nm count {wide}",
        "narrow.thickness": f"{NARROW[0]} nm..{NARROW[1]} nm count {narrow}",
    }
    return bw.sweep(double_well(), over, tolerance=f"{tolerance} eV", progress=False, **ASKED,
                    **arguments)  # fmt: skip


def _design(table, number):
    row = table.loc[number]
    stack = double_well()
    layers = list(stack.layers)
    layers[1] = layers[1].replace(thickness=f"{float(row['wide.thickness_nm'])!r} nm")
    layers[3] = layers[3].replace(thickness=f"{float(row['narrow.thickness_nm'])!r} nm")
    return stack.replace(layers=layers)


def measure(tolerance, values=100, sampled=6, seconds=6.0):
    """Return ms a design of the sweep, its worst error, and ratios of the yardstick's ways."""
    table = sweep(values, values, tolerance)
    numbers = np.linspace(1, len(table), sampled).astype(int)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", bw.BandwrightWarning)
        questions = [question(_design(table, n), ASKED, tolerance) for n in numbers]
    columns = [name for name in table.columns if name.startswith("level_")]
    worst = 0.0
    for number, asked in zip(numbers, questions, strict=True):
        found = table.loc[number, columns].dropna().to_numpy(dtype=float) * 1e-3
        error = sides._held(f"sweep, design {number}", asked.error(found), tolerance)
        worst = max(worst, error)
    sticks = [sides.yardsticks(asked, tolerance)[0] for asked in questions]
    common = [name for name in sticks[0] if all(name in stick for stick in sticks)]
    times = medians({
        "sweep": lambda: sweep(values, values, tolerance),
        **{name: (lambda name=name: [stick[name]() for stick in sticks]) for name in common},
    }, seconds)  # fmt: skip
    each = times["sweep"] / len(table)
    return {"designs": len(table), "ms": 1e3 * each, "error": worst,
            "ratio": {name: times[name] / len(sticks) / each for name in common}}  # fmt: skip


def peak(designs, results=None):
    """Return the largest memory [MB] of a process that does a sweep; on Linux only."""
    run = subprocess.run(
        [sys.executable, "-c", PEAK, str(designs), str(results or "")],
        check=True, capture_output=True, text=True,
        env={"PYTHONPATH": ":".join(p for p in sys.path if p), "OPENBLAS_NUM_THREADS": "1"},
    )  # fmt: skip
    done, most = json.loads(run.stdout)
    assert done == designs
    return most
