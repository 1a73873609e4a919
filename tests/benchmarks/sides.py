"""Side by side on one question: yardstick, spectral elements, `solve` and `solve_many`."""

from __future__ import annotations

import statistics
import warnings

import numpy as np

import bandwright as bw
from benchmarks import spectral, yardstick
from benchmarks.plain import question
from benchmarks.timing import medians

POINTS = 400  # at which wavefunctions are asked
SAME = 1e-10  # eV: solve_many against solve


class Wrong(AssertionError):
    """A competitor, bandwright above all, missed the error it is timed at."""


def _asked(case, tolerance):
    return {**case.asked, "tolerance": f"{tolerance} eV"}


def _questions(stacks, case, tolerance):
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", bw.BandwrightWarning)
        return [question(stack, case.asked, tolerance) for stack in stacks]


def _held(name, error, tolerance):
    if not error <= tolerance:
        raise Wrong(f"{name}: error {error:.3g} eV where {tolerance:g} eV is asked")
    return error


def yardsticks(asked, tolerance):
    """Return {name: function of no argument} and {name: cells}, each on its coarsest grid.

    "m" and "1/m" are the two means of `benchmarks.yardstick`, the latter left out where it needs
    20 times as many cells (4 times with many levels); "loose" is "m" with LAPACK's bisection
    stopped at a tenth of the tolerance.
    """
    plain, high = asked.plain, asked.high
    solvers = {
        "m": lambda n: yardstick.solve(plain, n, high),
        "1/m": lambda n: yardstick.solve(plain, n, high, mean="1/m"),
        "loose": lambda n: yardstick.solve(plain, n, high, tol=0.1 * tolerance),
    }
    if plain.two_band:
        solvers = {"m": lambda n: yardstick.solve_two_band(plain, n, asked.levels)}
    cells = {"m": yardstick.grid(asked, tolerance, solvers["m"])}
    most = (20 if asked.levels <= 20 else 4) * cells["m"]
    for name in list(solvers)[1:]:
        try:
            cells[name] = yardstick.grid(asked, tolerance, solvers[name], most)
        except yardstick.TooFine:
            del solvers[name]
    return {name: (lambda f=f, n=cells[name]: f(n)) for name, f in solvers.items()}, cells


def one(case, tolerance, seconds=3.0):
    """Return the levels alone: a dict of ms, errors and ratios."""
    stack = case.stack
    (asked,) = _questions([stack], case, tolerance)
    competitors, cells = yardsticks(asked, tolerance)
    if not case.apart:
        elements = spectral.grid(asked, tolerance)
        competitors["spectral"] = lambda: spectral.solve(asked.plain, *elements, asked.levels)
    wanted = _asked(case, tolerance)
    competitors["solve"] = lambda: bw.solve(stack, **wanted).energies
    errors = {
        name: _held(f"{case.name}, {name}", asked.error(f()), tolerance)
        for name, f in competitors.items()
    }
    times = medians(competitors, seconds)
    return {"levels": asked.levels, "cells": cells["m"], "error": errors["solve"],
            "yardstick_error": errors["m"], "ms": {k: 1e3 * t for k, t in times.items()},
            "ratio": {k: t / times["solve"] for k, t in times.items()}}  # fmt: skip


def with_states(case, tolerance, seconds=3.0):
    """Return the levels with wavefunctions and dipoles, one-band cases only."""
    stack, wanted = case.stack, _asked(case, tolerance)
    (asked,) = _questions([stack], case, tolerance)
    cells = yardstick.grid(
        asked, tolerance, lambda n: yardstick.solve(asked.plain, n, asked.high)
    )

    def engineer():
        energies, u = yardstick.solve(asked.plain, cells, asked.high, states=True)
        return energies, u, yardstick.dipoles(asked.plain, cells, u)

    def ours():
        levels = bw.solve(stack, **wanted)
        return levels.energies, levels.wavefunctions(POINTS), levels.dipoles()

    energies, _, moments = engineer()
    found, (z, psi), dipoles = ours()
    _held(f"{case.name}, yardstick with states", asked.error(energies), tolerance)
    _held(f"{case.name}, solve with states", asked.error(found), tolerance)
    if psi.shape != (asked.levels, len(z)):
        raise Wrong(f"{case.name}: wavefunctions of shape {psi.shape}")
    times = medians({"yardstick": engineer, "solve": ours}, seconds)
    nearest = np.abs(np.abs(dipoles) - np.abs(moments))[np.triu_indices(asked.levels, 1)]
    return {"ms": {k: 1e3 * t for k, t in times.items()},
            "ratio": times["yardstick"] / times["solve"],
            "dipole_difference": float(nearest.max(initial=0.0))}  # fmt: skip


def many(case, tolerance, designs=1000, seconds=6.0, sampled=3):
    """Return a family by `solve_many`, per design, beside a loop over `solve` and the yardstick.

    The yardstick and the truth take ``sampled`` neighbours spread over the family, each on the
    coarsest grid that holds its own error; the loop takes 40 of them.
    """
    family, wanted = case.family(designs), _asked(case, tolerance)
    places = np.linspace(0, designs - 1, sampled).astype(int)
    loop = family[:: max(1, designs // 40)]
    questions = _questions([family[i] for i in places], case, tolerance)
    sticks = [yardsticks(asked, tolerance)[0] for asked in questions]
    common = [name for name in sticks[0] if all(name in stick for stick in sticks)]

    def batch():
        found = bw.solve_many(family, **wanted)
        return found, found.energies

    found, energies = batch()
    worst = 0.0
    for place, asked in zip(places, questions, strict=True):
        error = _held(f"{case.name}, design {place}", asked.error(energies[place]), tolerance)
        worst = max(worst, error)
    for i in range(0, designs, max(1, designs // 40)):
        alone = bw.solve(family[i], **wanted).energies
        apart = np.max(np.abs(energies[i] - alone), initial=0.0) if (
            len(alone) == len(energies[i])) else np.inf  # fmt: skip
        _held(f"{case.name}, design {i} against solve", apart, SAME)
    times = medians({
        "batch": batch,
        "loop": lambda: [bw.solve(stack, **wanted).energies for stack in loop],
        **{name: (lambda name=name: [stick[name]() for stick in sticks]) for name in common},
    }, seconds)  # fmt: skip
    each = times["batch"] / designs
    return {"ms": 1e3 * each, "error": worst, "loop": times["loop"] / len(loop) / each,
            "ratio": {k: times[k] / len(sticks) / each for k in common},
            "alone": found.share_alone}  # fmt: skip


def summary(rows):
    """Return median, worst and superlattice of ratios: [(case, ratio)] of the cases in them."""
    inside = [(case, ratio) for case, ratio in rows if not case.apart]
    if not inside:
        return None
    worst = min(inside, key=lambda row: row[1])
    lattices = [ratio for case, ratio in inside if case.superlattice]
    return {"median": statistics.median(ratio for _, ratio in inside),
            "worst": worst[1], "worst_case": worst[0].name,
            "superlattice": min(lattices) if lattices else None}  # fmt: skip
