"""How the time grows with layers and with periods, at a fixed number of levels."""

from __future__ import annotations

import numpy as np

import bandwright as bw
from benchmarks.timing import medians

LAYERS = (10, 30, 100, 300, 1000, 3000, 10000)
PERIODS = (1, 2, 5, 10, 20, 50, 100, 200)


def digital(layers):
    """A parabola built of flat layers of 0.8 nm between two walls, the five lowest levels."""
    middles = (np.arange(layers) + 0.5) / layers
    edges = 0.3 * (2.0 * middles - 1.0) ** 2
    rows = [bw.Layer("0.8 nm", edge=f"{e} eV", mass=0.067) for e in edges.tolist()]
    return bw.Stack(rows, ends="wall"), {"at_most": 5}


def periods(number):
    """Wells in a row, the two lowest levels."""
    barrier = bw.Layer("2.5 nm", edge="0.25 eV", mass=0.092)
    group = [bw.Layer("9 nm", edge="0 eV", mass=0.067), barrier]
    return bw.Stack([barrier, bw.Repeat(number, group)]), {"below": "0.2 eV", "at_most": 2}


def measure(build, sizes, tolerance=1e-6, seconds=4.0):
    """Return the number of levels and ms at each size, all sizes taking turns."""
    competitors, levels = {}, {}
    for size in sizes:
        stack, asked = build(size)
        asked["tolerance"] = f"{tolerance} eV"
        found = bw.solve(stack, **asked)
        assert found.complete, f"size {size}: the counts do not agree"
        levels[size] = len(found.energies)
        competitors[size] = lambda stack=stack, asked=asked: bw.solve(stack, **asked).energies
    times = medians(competitors, seconds)
    return {size: (levels[size], 1e3 * times[size]) for size in sizes}


def slope(found):
    """Slope of the log-log fit of time against size."""
    sizes = np.array(list(found))
    times = np.array([ms for _, ms in found.values()])
    return float(np.polyfit(np.log(sizes), np.log(times), 1)[0])


def steepest(found):
    """Slope between the two largest sizes: what an overhead at small ones can't hide."""
    (a, (_, first)), (b, (_, last)) = list(found.items())[-2:]
    return float(np.log(last / first) / np.log(b / a))
