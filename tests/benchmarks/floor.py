"""The kernel beside its floor: numpy's time for the roots and tangents alone, at equal counts.

Twice: with fresh result arrays, as the kernel makes them, and into arrays that are there already,
because the allocator takes from fresh ones anything from nothing to twice the time of the maths.
"""

from __future__ import annotations

import numpy as np

from bandwright.constants import H2M
from bandwright.profile import Polynomial, Profile, Section
from bandwright.solver.matrix import assemble, count_below
from bandwright.solver.slices import cut
from benchmarks.timing import medians

SIZES = ((200, 5000), (2000, 500), (20000, 50))  # slices, energies: a million elements each


def profile(slices, slope=0.0):
    """Distinct thin layers, all unlike each other, so that none is evaluated once for many."""
    rng = np.random.default_rng(5)
    thickness = rng.uniform(0.5, 1.5, slices)
    edges = np.where(np.arange(slices) % 2, 0.0, 0.25) + rng.uniform(0.0, 0.01, slices)
    masses = rng.uniform(0.065, 0.09, slices)
    return Profile(tuple(
        Section(t, Polynomial((e, slope) if slope else (e,)), Polynomial((m,)))
        for t, e, m in zip(thickness.tolist(), edges.tolist(), masses.tolist(), strict=True)
    ), ("wall", "wall"))  # fmt: skip


def measure(slices, energies, slope=0.0, seconds=2.0):
    """Return ms of the kernel and of both floors, and its ratio to each."""
    sliced = cut(profile(slices, slope), np.ones(slices, dtype=int))
    at = np.linspace(0.005, 0.24, energies)

    def kernel():
        return count_below(assemble(sliced.elements(at), None, None))

    phase = sliced.thickness[:, None] ** 2 * sliced.mass[:, None] / H2M * (
        at - sliced.edge[:, None])  # fmt: skip
    size = np.abs(phase)
    half = 0.5 * np.sqrt(size)
    waves, decays = half[phase >= 0.0], half[phase < 0.0]
    out = np.empty_like(half), np.empty_like(waves), np.empty_like(decays)

    def floor():
        return np.sqrt(size), np.tan(waves), np.tanh(decays)

    def bare():
        np.sqrt(size, out=out[0])
        np.tan(waves, out=out[1])
        np.tanh(decays, out=out[2])

    counted = kernel()
    assert counted.shape == (energies,) and (np.diff(counted) >= 0).all() and counted[-1] > 0
    times = medians({"kernel": kernel, "floor": floor, "bare": bare}, seconds)
    return {"ms": {k: 1e3 * t for k, t in times.items()},
            "ratio": {k: times["kernel"] / times[k] for k in ("floor", "bare")}}  # fmt: skip
