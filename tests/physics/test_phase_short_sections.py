"""Phase integral on short and on weakly curved sections: the flat limit, and real interfaces.

Far from turning points the plain action holds; what edges and bottoms add must die out with
the variation of the edge, with the thickness of its section, and high above both.
"""

import numpy as np
import pytest

from bandwright import phase
from bandwright.profile import Profile, Sampled, Section
from physics.build import curved, flat, poly, profile
from physics.dense import levels as dense_levels
from physics.matching import check

BARRIER = flat(15, 0.4, 0.067)
SHAPES = {
    "flat where it is low": lambda h, v: poly(0, 0, v / h**2),
    "flat where it is high": lambda h, v: poly(0, 2 * v / h, -v / h**2),
    "soft step": lambda h, v: Sampled(lambda z: v / 2 * (1 - np.cos(np.pi * z / h))),
    "bump": lambda h, v: Sampled(lambda z: v * np.sin(np.pi * z / h) ** 2),
    "hollow": lambda h, v: Sampled(lambda z: -v * np.sin(np.pi * z / h) ** 2),
}


def _worst(case, high, order=1):
    """Return the largest error over the spacing to the nearer neighbour."""
    exact = np.asarray(dense_levels(case, high).energies)
    found = phase.levels(case, -0.15, high + 0.05, numbers=np.arange(len(exact)),
                         phase_order=order)
    assert np.isfinite(found).all()
    spacing = np.diff(np.concatenate(([exact[0] - high], exact, [exact[-1] + high])))
    return float((np.abs(found - exact) / np.minimum(spacing[:-1], spacing[1:])).max())


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("thickness", [2, 5, 20])
def test_a_vanishing_variation_leaves_a_flat_section(shape, thickness):
    errors = []
    for variation in (1e-3, 1e-4, 1e-6):
        section = curved(thickness, SHAPES[shape](thickness, variation), 0.067)
        errors.append(_worst(profile(BARRIER, flat(8, 0.0, 0.067), section, BARRIER), 0.38))
    print(f"\n{shape}, {thickness} nm: errors {errors} of the spacing")
    assert errors[0] < 5e-3
    assert errors[1] < 5e-4
    assert errors[2] < 5e-6  # falls as the variation does


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("variation", [0.01, 0.1, 0.35])
def test_a_vanishing_thickness_leaves_a_step(shape, variation):
    errors = []
    for thickness in (3.0, 1.0, 0.2):
        section = curved(thickness, SHAPES[shape](thickness, variation), 0.067)
        errors.append(_worst(profile(BARRIER, flat(8, 0.0, 0.067), section, BARRIER), 0.38))
    print(f"\n{shape}, {variation} eV: errors {errors} of the spacing")
    assert errors[0] < 0.01
    assert errors[1] < 1e-6
    assert errors[2] < 1e-8


@pytest.mark.parametrize("shape", SHAPES)
def test_high_above_a_section_only_the_action_counts(shape):
    section = curved(6, SHAPES[shape](6, 0.05), 0.067)
    case = profile(flat(5, 0.0, 0.067), section, flat(7, 0.0, 0.067), ends="wall")
    exact = np.asarray(dense_levels(case, 4.0).energies)
    found = phase.levels(case, -0.1, 4.1, numbers=np.arange(len(exact)))
    errors = np.abs(found - exact)[1:-1] / np.minimum(np.diff(exact)[1:], np.diff(exact)[:-1])
    print(f"\n{shape}: errors {errors[[1, 4, -1]]} of the spacing")
    assert errors[len(errors) // 2:].max() < 1e-3
    assert errors[-3:].max() < 5e-5


def test_a_grade_of_one_millielectronvolt_over_two_nanometres():
    """Far above the grade's bottom, with a fifteenth of a wave on it: 27.03 meV."""
    case = profile(flat(20, 0.4, 0.067), flat(10, 0.0, 0.067),
                   curved(2, poly(0, 0, 0.001 / 4), 0.067), flat(20, 0.4, 0.067))
    exact = np.asarray(dense_levels(case, 0.39).energies)
    check("flat and a short grade", phase.levels(case, 0.0, 0.39), list(exact), 5e-5,
          "spectral elements")


def graded_stack(rng):
    """Wells of flat layers whose faces are grades of 0.3 to 4 nm in edge, mass and gap."""
    light, heavy = rng.uniform(0.04, 0.07), rng.uniform(0.07, 0.12)
    top, gaps = rng.uniform(0.15, 0.5), rng.choice([0.0, 0.8], 2)

    def layer(thickness, share):
        return Section(thickness, poly(top * share), poly(light + (heavy - light) * share),
                       poly(gaps[0]))

    def grade(a, b):
        h = rng.uniform(0.3, 4)

        def between(low, high):
            first, last = low + (high - low) * a, low + (high - low) * b
            if a < b:
                return poly(first, 0, (last - first) / h**2)
            return poly(first, 2 * (last - first) / h, (first - last) / h**2)

        return Section(h, between(0.0, top), between(light, heavy), poly(gaps[0]))

    sections, here = [layer(12, 1.0)], 1.0
    wells = int(rng.integers(1, 4))
    for i in range(wells):
        low = 0.0 if i == 0 else rng.uniform(0, 0.3)
        high = 1.0 if i == wells - 1 else rng.uniform(0.5, 1)
        sections += [grade(here, low), layer(rng.uniform(2, 10), low), grade(low, high)]
        sections.append(layer(12 if i == wells - 1 else rng.uniform(1, 5), high))
        here = high
    return Profile(tuple(sections)), top


def soft_stack(rng):
    """Wells of flat layers whose faces are half waves of a cosine, 0.5 to 5 nm wide."""
    light, heavy = rng.uniform(0.04, 0.07), rng.uniform(0.07, 0.12)
    top, gap = rng.uniform(0.15, 0.5), rng.choice([0.0, 0.8])

    def layer(thickness, high):
        return Section(thickness, poly(top * high), poly(heavy if high else light), poly(gap))

    def face(rises):
        h = rng.uniform(0.5, 5)

        def share(z):
            return 0.5 * (1 - np.cos(np.pi * (z if rises else h - z) / h))

        return Section(h, Sampled(lambda z: top * share(z)),
                       Sampled(lambda z: light + (heavy - light) * share(z)), poly(gap))

    sections = [layer(12, True)]
    for _ in range(int(rng.integers(1, 3))):
        sections += [face(False), layer(rng.uniform(1, 8), False), face(True),
                     layer(rng.uniform(3, 8), True)]
    return Profile((*sections, layer(12, True))), top


@pytest.mark.parametrize("kind", [graded_stack, soft_stack])
@pytest.mark.parametrize("order", [1, 2])
def test_accuracy_on_graded_faces(kind, order):
    """2 % of the spacing to the nearer neighbour as a median, 15 % for 95 % of levels."""
    rng = np.random.default_rng(78)
    errors = []
    for _ in range(12):
        case, top = kind(rng)
        exact = np.asarray(dense_levels(case, top - 1e-6).energies)
        if not len(exact):
            continue
        found = phase.levels(case, -0.01, top, numbers=np.arange(len(exact)), phase_order=order)
        spacing = np.diff(np.concatenate(([exact[0] - top], exact, [exact[-1] + top])))
        spacing = np.minimum(spacing[:-1], spacing[1:])
        errors += list(np.where(np.isnan(found), 1.0, np.abs(found - exact) / spacing))
    median, most = np.median(errors), np.quantile(errors, 0.95)
    print(f"\n{kind.__name__}, order {order}: {len(errors)} levels, median {median:.2%}, "
          f"95 % within {most:.2%}, largest {max(errors):.1%}")
    assert len(errors) > 25
    assert median < 0.02
    assert most < 0.15


@pytest.mark.parametrize("inverse_gap", [0.0, 0.7])
@pytest.mark.parametrize("thickness", [1.0, 2.0, 4.0])
def test_cutting_a_short_grade_changes_nothing(thickness, inverse_gap):
    outer, well = flat(10, 0.35, 0.09, 2.0), flat(6, 0.0, 0.067, 1.2)
    c = 0.3 / thickness**2

    def part(start, stop):
        return Section(stop - start, poly(c * start**2, 2 * c * start, c), poly(0.07),
                       poly(inverse_gap))

    cuts = [0.0, 0.3 * thickness, 0.55 * thickness, thickness]
    parts = [part(a, b) for a, b in zip(cuts[:-1], cuts[1:], strict=True)]
    for order in (1, 2):
        whole = phase.levels(profile(outer, well, part(0, thickness), outer), 0, 0.34,
                             phase_order=order)
        again = phase.levels(profile(outer, well, *parts, outer), 0, 0.34, phase_order=order)
        assert len(whole) >= 2
        assert again == pytest.approx(whole, abs=2e-9)
