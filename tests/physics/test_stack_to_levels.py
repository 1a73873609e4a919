"""From a stack as a user writes it to levels, against a profile built here by hand.

Grading, points, internal fields, the stack's field and its direction, and the zero of energy are
each written out below from their definition, not taken from the package; the levels come from the
independent discretisation.
"""

import numpy as np
import pytest

import bandwright as bw
from bandwright.profile import ZERO, Polynomial, Profile, Sampled, Section
from physics.dense import levels

pytestmark = pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
POINTS = 4


def draw_layer(rng, two, walls):
    """One layer: inputs for bw.Layer, and the same as functions of the share of its depth."""
    thickness = round(float(rng.uniform(1.0, 9.0)), 2)
    grading = rng.choice(["none", "linear", "quadratic", "points"])
    edges = [round(float(rng.uniform(0, 450)), 1) for _ in range(POINTS)]  # meV
    masses = [round(float(rng.uniform(0.04, 0.12)), 4) for _ in range(POINTS)]
    gap = round(float(rng.uniform(1.4, 2.5)), 3)
    inputs = {"thickness": f"{thickness} nm"}
    if two:
        inputs["gap"] = f"{gap} eV"
    inner = 0.0
    if walls and rng.random() < 0.4:
        inner = round(float(rng.uniform(-300, 300)), 1)  # kV/cm
        inputs["field"] = f"{inner} kV/cm"
    if grading == "none":
        inputs |= {"edge": f"{edges[0]} meV", "mass": masses[0]}
        shares, edges, masses = [0.0, 1.0], edges[:1] * 2, masses[:1] * 2
    elif grading == "points":
        shares = [0.0, *np.sort(rng.uniform(0.1, 0.9, POINTS - 2)).round(3), 1.0]
        depths = [f"{share * thickness!r} nm" for share in map(float, shares)]
        depths[-1] = f"{thickness} nm"
        inputs["edge"] = [(d, f"{e} meV") for d, e in zip(depths, edges, strict=True)]
        inputs["mass"] = list(zip(depths, masses, strict=True))
    else:
        inputs |= {"edge": (f"{edges[0]} meV", f"{edges[1]} meV"), "mass": tuple(masses[:2])}
        if grading == "quadratic":
            inputs["grading"] = "quadratic"
        shares, edges, masses = [0.0, 1.0], edges[:2], masses[:2]
    return inputs, (thickness, grading, shares, edges, masses, gap, 1e-4 * inner)


def by_hand(layers, field, ends, two):
    """Sections with the edge counted from the lowest edge there is without the stack's field."""
    sections, potential, z, lowest = [], 0.0, 0.0, np.inf
    for thickness, grading, shares, edges, masses, gap, inner in layers:
        for k in range(len(shares) - 1):
            width = (shares[k + 1] - shares[k]) * thickness
            first, last = 1e-3 * edges[k], 1e-3 * edges[k + 1]
            flat_first = first <= last
            slope = inner + field
            start = potential + field * z

            def curve(a, b, grading=grading, width=width, flat_first=flat_first):
                if grading != "quadratic":
                    return Polynomial((a, (b - a) / width))
                if flat_first:
                    return Polynomial((a, 0.0, (b - a) / width**2))
                return Polynomial((a, 2 * (b - a) / width, (a - b) / width**2))

            edge = curve(first, last)
            fine = np.linspace(0, width, 2001)
            lowest = min(lowest, float((edge.at(fine) + potential + inner * fine).min()))
            inverse = Polynomial((1.0 / gap,)) if two else ZERO
            sections.append(Section(width, edge.plus(start, slope),
                                    curve(masses[k], masses[k + 1]), inverse))  # fmt: skip
            potential += inner * width
            z += width
    return Profile(tuple(sections), ends, field, bands="two-band" if two else "one-band"), lowest


@pytest.mark.parametrize("seed", range(24))
def test_levels_of_a_written_stack(seed):
    rng = np.random.default_rng([77, seed])
    two, walls = bool(rng.integers(2)), bool(rng.integers(3))
    drawn = [draw_layer(rng, two, walls) for _ in range(int(rng.integers(1, 7)))]
    field = round(float(rng.uniform(-90, 90)), 1) if walls and rng.random() < 0.7 else 0.0
    ends = ("wall", "wall") if walls else ("open", "open")
    stack = bw.Stack([bw.Layer(**inputs) for inputs, _ in drawn], ends=ends,
                     field=f"{field} kV/cm")  # fmt: skip
    profile, lowest = by_hand([numbers for _, numbers in drawn], 1e-4 * field, ends, two)
    found = bw.solve(stack, below="0.5 eV" if walls else None, tolerance="1e-9 eV", group="0 meV")
    assert found.complete
    high = 0.5 if walls else min(
        float(profile.sections[0].edge.at(np.zeros(1))[0]),
        float(profile.sections[-1].edge.at(np.array([profile.sections[-1].thickness]))[0]),
    ) - lowest - 1e-9  # fmt: skip
    if high <= 0:
        assert not len(found)
        return
    expected = levels(profile, high + lowest).energies - lowest
    print(f"seed {seed}: {len(expected)} levels, bands {'two' if two else 'one'}, ends {ends}")
    assert len(found.energies) == len(expected)
    # the lowest edge by hand is sampled: good to (width/2000)^2 of its bend
    assert np.abs(found.energies - expected).max(initial=0.0) < 2e-7
    assert np.abs(np.diff(found.energies) - np.diff(expected)).max(initial=0.0) < 2e-9


def test_callable_layer_is_the_tabulated_curve():
    """A callable of depth and the polynomial it stands for."""
    def edge(depth):
        return 0.02 * (depth - 4.0) ** 2

    wall = {"ends": ("wall", "wall")}
    stack = bw.Stack([bw.Layer("8 nm", edge=edge, mass=0.067)], zero=None, **wall)
    found = bw.solve(stack, below="0.6 eV", tolerance="1e-9 eV")
    profile = Profile((Section(8.0, Sampled(edge), Polynomial((0.067,))),), ("wall", "wall"))
    expected = levels(profile, 0.6).energies
    assert np.abs(found.energies - expected).max() < 1e-8
