"""Peak memory: of `solve` against levels times slices, of `solve_many` against the designs."""

from __future__ import annotations

import tracemalloc

import bandwright as bw
from benchmarks.cases import CASES, Vary, superlattice

NUMBER = 8  # bytes


def peak(function):
    """Return bytes at most in use during a call above those before it, and its result."""
    function()  # imports and caches
    tracemalloc.start()
    try:
        before, _ = tracemalloc.get_traced_memory()
        tracemalloc.reset_peak()
        result = function()
        return tracemalloc.get_traced_memory()[1] - before, result
    finally:
        tracemalloc.stop()


def of_solve(numbers=(5, 10, 20, 40, 80, 160), states=False):
    """Return {periods: (levels, slices, bytes, bytes per level and slice / 8)}."""
    found = {}
    for periods in numbers:
        stack = superlattice(Vary(), periods)

        def ask(stack=stack):
            levels = bw.solve(stack, below="0.24 eV")
            return levels, levels.energies, levels.dipoles() if states else None

        most, (levels, energies, _) = peak(ask)
        slices = sum(len(part.solution.system.slices) for part in levels.parts)
        cells = len(energies) * slices
        found[periods] = (len(energies), slices, most, most / (NUMBER * cells))
    return found


def of_many(name="single", numbers=(250, 500, 1000), chunk=250):
    """Return {designs: (bytes at most, bytes at most beyond what the results keep)}."""
    case = CASES[name]
    family = case.family(max(numbers))
    found = {}
    bw.solve_many(family[:20], **case.asked)  # imports and caches
    for designs in numbers:
        stacks = family[:designs]
        tracemalloc.start()
        try:
            kept = bw.solve_many(stacks, chunk=chunk, **case.asked)
            in_use, most = tracemalloc.get_traced_memory()
            found[designs] = (most, most - in_use)
            del kept
        finally:
            tracemalloc.stop()
    return found
