"""The structures that are timed, and seeded families of neighbours of each. All are invented.

A builder writes its stack through `v`, which returns every number as it is for the case itself
and varied by a few percent for a neighbour.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

import bandwright as bw

THICKNESS, EDGE = 0.03, 0.02  # largest relative change of a neighbour's numbers


class Vary:
    """Numbers as text with a unit, each off by up to a few percent; without a seed as they are."""

    def __init__(self, seed=None):
        self.rng = None if seed is None else np.random.default_rng(seed)

    def __call__(self, value, share):
        if self.rng is None:
            return value
        return round(value * (1.0 + share * self.rng.uniform(-1.0, 1.0)), 9)

    def nm(self, value):
        return f"{self(value, THICKNESS)} nm"

    def eV(self, value):
        return f"{self(value, EDGE)} eV"

    def x(self, value):
        return self(value, EDGE)

    def own(self, thickness, edge, mass, gap=None, **more):
        """Return a layer with numbers of its own."""
        more |= {} if gap is None else {"gap": f"{gap} eV"}
        edge = self.eV(edge) if edge else "0 eV"
        return bw.Layer(self.nm(thickness), edge=edge, mass=mass, **more)


@dataclass(frozen=True)
class Case:
    """A structure, what is asked of it, and its neighbours.

    ``apart`` keeps it out of the medians (two-band wells, whose yardstick is another one).
    """

    name: str
    build: Callable[[Vary], bw.Stack]
    asked: dict = field(default_factory=dict)
    apart: bool = False
    superlattice: bool = False

    @property
    def stack(self):
        return self.build(Vary())

    def family(self, designs, seed=20260101):
        """Return neighbours of the stack, the same on every machine."""
        return [self.build(Vary([seed, i])) for i in range(designs)]


WELL, BARRIER = (0.0, 0.067), (0.25, 0.092)
NARROW, HIGH = (0.0, 0.043), (0.52, 0.075)
NARROW_2, HIGH_2 = (*NARROW, 0.8), (*HIGH, 1.5)


def single(v):
    return bw.Stack([v.own(20, *BARRIER), v.own(11, *WELL), v.own(20, *BARRIER)])


def single_materials(v):
    barrier = {"material": "AlxGa1-xAs", "x": v.x(0.3)}
    layers = [bw.Layer("20 nm", **barrier), bw.Layer(v.nm(8.4), "GaAs")]
    return bw.Stack([*layers, bw.Layer("20 nm", **barrier)], bands="one-band", zero="GaAs")


def coupled(v):
    inside = [v.own(7.3, *WELL), v.own(1.7, *BARRIER), v.own(4.6, *WELL)]
    return bw.Stack([v.own(20, *BARRIER), *inside, v.own(20, *BARRIER)])


def alternating(v, thicknesses, barrier, well, field, to="to substrate"):
    layers = [v.own(t, *(well if i % 2 else barrier)) for i, t in enumerate(thicknesses)]
    return bw.Stack(layers, field=field, electrons_run=to)


STAGE_20 = (3.6, 2.3, 1.1, 6.1, 1.3, 5.2, 1.2, 4.6, 2.4, 3.9,
            1.6, 3.6, 1.7, 3.3, 1.9, 3.0, 2.2, 2.7, 2.6, 2.4)  # fmt: skip
STAGE_31 = (4.1, 1.9, 0.9, 5.4, 1.0, 4.9, 1.1, 4.4, 1.9, 3.4, 1.5, 3.2, 1.6, 2.9, 1.8, 2.7, 2.5,
            2.6, 1.2, 5.1, 1.1, 4.7, 1.3, 4.2, 2.0, 3.5, 1.6, 3.1, 1.7, 2.8, 3.0)  # fmt: skip


def stage_20(v):
    return alternating(v, STAGE_20, (0.29, 0.1), WELL, "45 kV/cm")


def stage_31(v):
    return alternating(v, STAGE_31, HIGH, NARROW, "55 kV/cm", "to surface")


def stage_20_two_band(v):
    return alternating(v, STAGE_20, HIGH_2, NARROW_2, "45 kV/cm")


def superlattice(v, periods=50, barrier=BARRIER, well=WELL):
    edge = v.eV(barrier[0])
    between = v.own(2.9, 0, *barrier[1:]).replace(edge=edge)
    outer = bw.Layer("15 nm", edge=edge, mass=barrier[1], gap=between.gap)
    group = [v.own(7.6, *well), between]
    return bw.Stack([outer, bw.Repeat(periods, group), outer])


def superlattice_two_band(v):
    return superlattice(v, 10, HIGH_2, NARROW_2)


def parabolic(v):
    top = v.eV(0.24)
    pair = {"mass": 0.067, "grading": "quadratic"}
    left = bw.Layer(v.nm(16), edge=[top, "0 eV"], **pair)
    right = bw.Layer(v.nm(16), edge=["0 eV", top], **pair)
    outer = bw.Layer("15 nm", edge=v.eV(0.28), mass=0.092)
    return bw.Stack([outer, left, right, outer])


def graded_alloy(v):
    x = v.x(0.32)
    barrier = bw.Layer("20 nm", "AlxGa1-xAs", x=x)
    grade = bw.Layer(v.nm(14), "AlxGa1-xAs", x=[0.0, v.x(0.27)])
    return bw.Stack([barrier, bw.Layer(v.nm(3.5), "GaAs"), grade, barrier], bands="one-band",
                    zero="GaAs")  # fmt: skip


def polar(v, wells):
    """Wells and barriers with internal fields of opposite sign that add up to no potential."""
    layers = []
    for _ in range(wells):
        well, barrier = v.own(3.4, 0.0, 0.2), v.own(2.3, 0.42, 0.22)
        inward = -0.06
        outward = -inward * well.thickness.value / barrier.thickness.value
        layers += [well.replace(field=f"{inward} V/nm"), barrier.replace(field=f"{outward} V/nm")]
    return layers


def nitride_walls(v):
    return bw.Stack([v.own(4.35, 0.42, 0.22), *polar(v, 3)], ends="wall")


def nitride_open(v):
    outer = v.own(8, 0.42, 0.22)
    return bw.Stack([outer, *polar(v, 2), outer])


def single_two_band(v):
    return bw.Stack([v.own(12, *HIGH_2), v.own(8.7, *NARROW_2), v.own(12, *HIGH_2)])


CASES = {
    case.name: case
    for case in (
        Case("single", single, {"below": "0.24 eV"}),
        Case("single-materials", single_materials, {"below": "0.2 eV"}),
        Case("coupled", coupled, {"below": "0.24 eV"}),
        Case("stage-20", stage_20, {"below": "0.6 eV", "at_most": 12}),
        Case("stage-31", stage_31, {"below": "0.3 eV"}),
        Case("superlattice-50", superlattice, {"below": "0.24 eV"}, superlattice=True),
        Case("parabolic", parabolic, {"below": "0.24 eV"}),
        Case("graded-alloy", graded_alloy, {"below": "0.2 eV"}),
        Case("nitride-walls", nitride_walls, {"below": "0.35 eV"}),
        Case("nitride-open", nitride_open, {"below": "0.38 eV"}),
        Case("single, two-band", single_two_band, {"below": "0.5 eV"}, apart=True),
        Case("stage-20, two-band", stage_20_two_band, {"below": "0.4 eV"}, apart=True),
        Case("superlattice-10, two-band", superlattice_two_band, {"below": "0.5 eV"}, apart=True),
    )
}
