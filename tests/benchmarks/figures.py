"""What `tests/benchmarks/run.py` prints: all parts, as tables of one run."""

from __future__ import annotations

import argparse
import platform
import tempfile
import time
import warnings

import numpy as np
import scipy

import bandwright as bw
from benchmarks import breakdown, floor, grids, growth, memory, sides
from benchmarks.cases import CASES
from benchmarks.timing import table, text

QUICK = ("single", "stage-20", "graded-alloy", "single, two-band")
STICKS = ("m", "1/m", "loose", "spectral")


def say(line="", *cells):
    print(line, *cells, flush=True)


def ratios(rows, name):
    """Print the median, worst and superlattice of a column of ratios."""
    found = sides.summary(rows)
    if found:
        say(f"  {name}: median {text(found['median'])}, worst {text(found['worst'])}"
            f" ({found['worst_case']}), superlattice {text(found['superlattice'])}")  # fmt: skip


def attempt(options, measure, *arguments):
    """Measure one case; what misses its error is printed, not timed, and fails the run."""
    try:
        return measure(*arguments)
    except sides.Wrong as wrong:
        options.missed.append(str(wrong))
        say(f"MISSED {wrong}")
        return None


def levels_alone(cases, options):
    for tolerance in options.tolerance:
        say(f"\nsolve, levels alone, true error {tolerance:g} eV; x = times as long as solve")
        rows, found = [], []
        for case in cases:
            one = attempt(options, sides.one, case, tolerance, options.seconds)
            if one is None:
                continue
            found.append((case, one))
            rows.append([
                case.name, one["levels"], one["cells"], one["ms"]["m"], one["ms"]["solve"],
                one["error"], *(one["ratio"].get(k) for k in STICKS),
            ])  # fmt: skip
        say(table(("case", "levels", "cells", "m, ms", "solve, ms", "error, eV",
                   *(f"{k}, x" for k in STICKS)), rows))  # fmt: skip
        for stick in STICKS:
            ratios([(c, o["ratio"][stick]) for c, o in found if stick in o["ratio"]], stick)


def with_states(cases, options):
    for tolerance in options.tolerance:
        say(f"\nsolve with wavefunctions and dipoles, true error {tolerance:g} eV")
        rows, found = [], []
        for case in cases:
            if case.apart:
                continue
            one = attempt(options, sides.with_states, case, tolerance, options.seconds)
            if one is None:
                continue
            found.append((case, one["ratio"]))
            rows.append([case.name, one["ms"]["yardstick"], one["ms"]["solve"],
                         one["dipole_difference"], one["ratio"]])  # fmt: skip
        say(table(("case", "m, ms", "solve, ms", "dipoles apart, nm", "m, x"), rows))
        ratios(found, "m")


def families(cases, options):
    sticks = STICKS[:3]
    for tolerance in options.tolerance:
        say(f"\nsolve_many, {options.designs} neighbours of each case, per design, true error"
            f" {tolerance:g} eV")  # fmt: skip
        rows, found = [], []
        for case in cases:
            one = attempt(options, sides.many, case, tolerance, options.designs,
                          2 * options.seconds)  # fmt: skip
            if one is None:
                continue
            found.append((case, one))
            rows.append([case.name, one["ms"], one["error"], one["alone"],
                         *(one["ratio"].get(k) for k in sticks), one["loop"]])  # fmt: skip
        say(table(("case", "ms a design", "error, eV", "share alone",
                   *(f"{k}, x" for k in sticks), "loop of solve, x"), rows))  # fmt: skip
        for stick in (*sticks, "loop"):
            column = [(c, o["loop"] if stick == "loop" else o["ratio"].get(stick))
                      for c, o in found]  # fmt: skip
            ratios([(c, ratio) for c, ratio in column if ratio is not None], stick)


def sweeps(_, options):
    values = 20 if options.quick else 100
    for tolerance in options.tolerance:
        say(f"\nsweep of a double well, {values} x {values} designs with their table, per design,"
            f" true error {tolerance:g} eV")  # fmt: skip
        try:
            one = grids.measure(tolerance, values, seconds=2 * options.seconds)
        except sides.Wrong as wrong:
            options.missed.append(str(wrong))
            say(f"MISSED {wrong}")
            continue
        row = [one["ms"], one["error"], *(one["ratio"].get(k) for k in STICKS[:3])]
        say(table(("ms a design", "error, eV", *(f"{k}, x" for k in STICKS[:3])), [row]))
    say("\npeak memory of a process that sweeps, without and with a results file")
    rows = []
    for designs in (2000, 4000) if options.quick else (2000, 20_000, 200_000):
        with tempfile.TemporaryDirectory() as folder:
            rows.append([designs, grids.peak(designs), grids.peak(designs, f"{folder}/r.csv")])
    say(table(("designs", "MB", "MB, with a file"), rows))


def kernels(_, options):
    say("\nkernel (elements, matrix, count) beside the roots and tangents alone")
    rows = []
    for slices, energies in floor.SIZES[: 1 if options.quick else None]:
        for name, slope in (("flat", 0.0), ("tilted", 0.004)):
            one = floor.measure(slices, energies, slope, options.seconds)
            name = f"{slices} {name} slices, {energies} energies"
            rows.append([name, one["ms"]["floor"], one["ms"]["kernel"], one["ratio"]["floor"],
                         one["ratio"]["bare"]])  # fmt: skip
    say(table(("", "floor, ms", "kernel, ms", "x", "without allocation, x"), rows))


def growths(_, options):
    for name, build, sizes in (
        ("layers", growth.digital, growth.LAYERS),
        ("periods", growth.periods, growth.PERIODS),
    ):
        sizes = sizes[:-2] if options.quick else sizes
        found = growth.measure(build, sizes, seconds=2 * options.seconds)
        say(f"\ngrowth with {name} at a fixed number of levels: slope {growth.slope(found):.2f},"
            f" between the last two {growth.steepest(found):.2f}")  # fmt: skip
        say(table((name, "levels", "ms"), [[n, k, ms] for n, (k, ms) in found.items()]))


def memories(_, options):
    numbers = (5, 10, 20, 40) if options.quick else (5, 10, 20, 40, 80, 160)
    for name, states in (("levels alone", False), ("with dipoles", True)):
        say(f"\npeak memory of solve, {name}")
        found = memory.of_solve(numbers, states)
        rows = [[n, k, s, most / 1e6, arrays] for n, (k, s, most, arrays) in found.items()]
        say(table(("periods", "levels", "slices", "MB", "arrays of levels x slices"), rows))
    say("\npeak memory of solve_many, single wells")
    rows = []
    for chunk in (50, 100) if options.quick else (250, 1000):
        found = memory.of_many(chunk=chunk, numbers=tuple(chunk * k for k in (1, 2, 4)))
        rows += [[chunk, n, most / 1e6, more / 1e6] for n, (most, more) in found.items()]
    say(table(("chunk", "designs", "MB", "MB beyond the result"), rows))


def rooms(cases, options):
    for case in cases[:1] if options.quick else cases:
        found, ms = breakdown.shares(case, 30 if options.quick else 100)
        say(f"\nwhere the time of solve goes, {case.name}: {ms:.2f} ms under the profiler")
        rows = [[n, 100 * share, round(calls)] for n, (share, calls) in found.items()]
        say(table(("room", "share, %", "calls"), rows))


PARTS = {
    "levels": levels_alone, "states": with_states, "many": families, "sweep": sweeps,
    "floor": kernels,
    "growth": growths, "memory": memories, "breakdown": rooms,
}  # fmt: skip


def main(arguments=None):
    parser = argparse.ArgumentParser(description="bandwright beside other ways, in one run")
    parser.add_argument("--quick", action="store_true", help="few cases, small families")
    parser.add_argument("--case", action="append", choices=CASES, metavar="NAME",
                        help="only this case; can be given again: " + "; ".join(CASES))  # fmt: skip
    parser.add_argument("--part", action="append", choices=PARTS, metavar="NAME",
                        help="only this part; can be given again: " + ", ".join(PARTS))  # fmt: skip
    parser.add_argument("--tolerance", action="append", type=float, metavar="EV",
                        help="true error [eV]; 1e-4 and 1e-6 by default")  # fmt: skip
    options = parser.parse_args(arguments)
    options.tolerance = options.tolerance or ([1e-6] if options.quick else [1e-4, 1e-6])
    options.seconds, options.designs = (0.5, 50) if options.quick else (3.0, 1000)
    options.missed = []
    names = options.case or (QUICK if options.quick else CASES)
    say(f"python {platform.python_version()}, numpy {np.__version__}, scipy {scipy.__version__},"
        f" {platform.machine()}, one BLAS thread; medians of processor time, in turns")  # fmt: skip
    say("m, 1/m, loose: finite volumes (tests/benchmarks/yardstick.py, sides.py);"
        " two-band cases stay out of the medians")  # fmt: skip
    start = time.perf_counter()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", bw.BandwrightWarning)
        for part in options.part or PARTS:
            PARTS[part]([CASES[name] for name in names], options)
    say(f"\n{time.perf_counter() - start:.0f} s, {len(options.missed)} missed their error")
    return bool(options.missed)

