"""Phase-integral levels against closed forms, printed tables, quadrature and a dense solver.

Run with ``-s`` to see found, reference and matching digits, and the measured accuracy.
"""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.optimize import brentq
from scipy.special import erf

from bandwright import phase
from bandwright.constants import H2M
from bandwright.profile import Polynomial, Profile, Sampled, Section
from physics.build import curved, flat, poly, profile
from physics.dense import levels as dense_levels
from physics.matching import check

WALLS = ("wall", "wall")


# Exact stretches ---------------------------------------------------------------------------

FLAT = {
    # BenDaniel & Duke, Phys. Rev. 152, 683 (1966), closed equations in 40-digit arithmetic
    "finite well, unequal masses": (
        profile(flat(5, 0.25, 0.092), flat(10, 0.0, 0.067), flat(5, 0.25, 0.092)), 0.25,
        ["0.030538798197", "0.120014664898", "0.243966547091"]),
    "asymmetric well": (
        profile(flat(5, 0.20, 0.085), flat(10, 0.0, 0.067), flat(5, 0.35, 0.1)), 0.20,
        ["0.0308707311505016", "0.12084048470861"]),
    "step well": (
        profile(flat(5, 0.28, 0.092), flat(6, 0.0, 0.067), flat(8, 0.12, 0.078),
                flat(5, 0.28, 0.092)), 0.28,
        ["0.0539987645494822", "0.154367450137966", "0.217022376895491"]),
    "two-band well": (
        profile(flat(5, 0.52, 0.075, 1.53), flat(10, 0.0, 0.043, 0.816),
                flat(5, 0.52, 0.075, 1.53)), 0.52,
        ["0.050752831936469", "0.17975042825139", "0.34718850632316", "0.51085397969502"]),
    "coupled wells, 3 nm barrier": (
        profile(flat(5, 0.25, 0.092), flat(6, 0.0, 0.067), flat(3, 0.25, 0.092),
                flat(6, 0.0, 0.067), flat(5, 0.25, 0.092)), 0.15,
        ["0.056462263462503", "0.0657809117506"]),
}


@pytest.mark.parametrize("name", FLAT)
def test_flat_sections_are_exact(name):
    case, high, values = FLAT[name]
    found = phase.levels(case, -0.01, high)
    check(name, found[: len(values)], values, 1e-10,
          "closed equations, BenDaniel & Duke 1966; Bastard 1981; Nelson et al. 1987 (two-band)")


def test_well_in_a_field_is_exact():
    # Miller et al., Phys. Rev. B 32, 1043 (1985): determinant of Airy functions
    for length, field, values in (
        (10, 0.01, ["0.1042062264907", "0.2750595117947", "0.5554575636527"]),
        (20, 0.02, ["0.142725335646", "0.2496226779961", "0.3399760986813"]),
    ):
        case = profile(curved(length, poly(0.0, field), 0.067), ends="wall")
        check(f"{length} nm, {field} V/nm", phase.levels(case, 0.0, 1.0)[:3], values, 1e-10,
              "Airy determinant")


def test_triangular_well_is_exact():
    case = profile(curved(60, poly(0.0, 0.01), 0.067), ends=("wall", "open"))
    values = ["0.089911208756", "0.157200851514", "0.212291447747", "0.260980793749"]
    check("triangular well", phase.levels(case, 0.0, 0.3)[:4], values, 1e-10, "DLMF 9.9")


def test_linear_sections_of_random_stacks_are_exact():
    rng = np.random.default_rng(20)
    worst, total = 0.0, 0
    for _ in range(12):
        field, depth, sections = rng.uniform(-0.015, 0.015), 0.0, []
        for i in range(int(rng.integers(3, 9))):
            h, edge = rng.uniform(2, 12), (0.0 if i % 2 else rng.uniform(0.1, 0.4))
            grade = rng.choice([0.0, rng.uniform(-0.02, 0.02)])
            sections.append(Section(h, poly(edge + field * depth, field + grade),
                                    poly(rng.uniform(0.04, 0.12))))
            depth += h
        case = Profile(tuple(sections), WALLS)
        low = _floor(case)
        exact = np.asarray(dense_levels(case, low + 0.5).energies)
        found = phase.levels(case, low - 0.01, low + 0.5)
        assert len(found) == len(exact)
        worst, total = max(worst, np.abs(found - exact).max()), total + len(found)
    print(f"\none-band linear: {total} levels, worst difference {worst:.1e} eV")
    assert worst < 1e-8
    assert total > 50


# Curved stretches: the plain condition -------------------------------------------------------

BOTTOMS = {
    "rising parabola": (poly(0.0, 0.0, 0.002), poly(0.067), 0.0, 10.0),
    "parabola with its bottom inside": (poly(0.05, -0.025, 0.003125), poly(0.067, 0.002), 0.0, 9.0),
    "exponential (Paine)": (Sampled(lambda z: np.exp(z)), poly(H2M), 0.0, np.pi),
    "tilt, two bands": (poly(0.0, 0.015), poly(0.05), 1 / 0.8, 14.0),
    "wave, two bands": (Sampled(lambda z: 0.03 * np.cos(z / 2)), poly(0.067), 1 / 1.5, 12.0),
}


@pytest.mark.parametrize("name", BOTTOMS)
def test_between_hard_walls_the_action_is_a_whole_number_of_half_waves(name):
    edge, mass, inverse_gap, length = BOTTOMS[name]
    case = Profile((Section(length, edge, mass, poly(inverse_gap)),), WALLS)
    values = edge.at(np.linspace(0, length, 4001))
    top = float(values.max())

    def action(energy):
        def k(z):
            x = energy - edge.at(np.array(z))
            return float(np.sqrt(mass.at(np.array(z)) * (1 + x * inverse_gap) * x / H2M))
        return quad(k, 0.0, length, epsabs=1e-12, epsrel=1e-12, limit=400)[0]

    margin = 0.06 if name.startswith("wave") else 1e-6  # half a quantum of a top inside
    first = int(action(top + margin) / np.pi) + 1
    expected = [brentq(lambda e, n=n: action(e) - n * np.pi, top, top + 2000 * H2M, xtol=1e-13)
                for n in range(first, first + 5)]
    found = phase.levels(case, float(values.min()) - 0.01, expected[-1] + 1e-6)
    check(name, found[first - 1:], expected, 1e-8 if edge.at(np.zeros(1))[0] == 1.0 else 1e-10,
          "action = n pi by scipy quad and brentq")


def test_harmonic_levels_are_exact_at_first_order():
    c = 0.25 / 25**2
    case = profile(curved(70, poly(c * 35**2, -70 * c, c), 0.067), ends="wall")
    quantum = 0.0301636614863175  # hbar omega = (4/W) sqrt(V0 C/m), V0 = 0.25 eV, W = 50 nm
    check("harmonic", phase.levels(case, 0.0, 0.16), quantum * (np.arange(5) + 0.5), 2e-8,
          "E = (n + 1/2) hbar omega")
    half = profile(curved(35, poly(0.0, 0.0, c), 0.067), ends="wall")
    check("half harmonic, a wall at the bottom", phase.levels(half, 0.0, 0.12),
          quantum * (np.arange(1, 5, 2) + 0.5), 2e-8, "its odd levels")


QUARTIC = [  # n, exact, first order, next order over exact minus 1
    ("1.06036209048418", "0.867145326484821", "-0.0750647"),
    ("3.79967302980139", "3.75191992355043", "0.00280469"),
    ("7.45569793798674", "7.41398825281078", "1.31095e-5"),
    ("11.6447455113782", "11.6115253451971", "2.09518e-5"),
    ("16.2618260188502", "16.2336146927053", "6.80889e-6"),
    ("21.2383729182359", "21.2136533590572", "3.05937e-6"),
    ("26.5284711836825", "26.5063355109631", "1.55938e-6"),
    ("32.0985977109683", "32.0784641156416", "8.76971e-7"),
    ("37.923001027034", "37.9044718450677", "5.30377e-7"),
    ("43.9811580972897", "43.9639483585989", "3.3937e-7"),
    ("50.2562545166829", "50.2401523191724", "2.27142e-7"),
    ("56.734214055173", "56.7190570966241", "1.57716e-7"),
]


@pytest.mark.parametrize("cut", [False, True])
def test_quartic_well_at_first_and_next_order(cut):
    source = "Bender & Orszag 1978 sec. 10.5; Dunham, Phys. Rev. 41, 713 (1932)"
    half = 5.5  # -y'' + x^4 y = E y: h2m / m = 1
    full = np.poly1d([1.0, 0, 0, 0, 0])

    def piece(start, stop):
        shifted = full(np.poly1d([1.0, start]))
        return Section(stop - start, Polynomial(tuple(shifted.coeffs[::-1])), poly(H2M))

    cuts = [-half, -0.7, 1.3, half] if cut else [-half, half]
    case = Profile(tuple(piece(a, b) for a, b in zip(cuts[:-1], cuts[1:], strict=True)), WALLS)
    first = phase.levels(case, 0.0, 60.0)
    check("quartic, first order", first, [row[1] for row in QUARTIC], 1e-7, source)
    second = phase.levels(case, 0.0, 60.0, phase_order=2)
    expected = [float(e) * (1 + float(r)) for e, _, r in QUARTIC]
    check("quartic, next order", second, expected, 1e-6, source)
    for n, printed in ((0, (-0.182, -0.075)), (1, (-0.013, 0.003))):
        exact = float(QUARTIC[n][0])
        assert (first[n] / exact - 1, second[n] / exact - 1) == pytest.approx(printed, abs=6e-4)


def test_poeschl_teller_trough():
    """The trough's own comparison makes its levels exact where plain pi/4 is 2 to 7 % off."""
    depth, alpha = 0.614146370126279, 0.3  # lambda = 4, Z. Phys. 83, 143 (1933)
    edge = Sampled(lambda z: -depth / np.cosh(alpha * (z - 30)) ** 2)
    case = profile(curved(60, edge, 0.067), ends="open")
    values = [-0.46060977759471, -0.20471545670876, -0.05117886417719]
    check("Poeschl-Teller", phase.levels(case, -0.6, -0.01), values, 2e-5, "closed form")


@pytest.mark.parametrize("g, n, mean, splitting", [
    (6, 0, -5.727491519, 0.04139800350043),
    (8, 0, -12.13557253, 0.001516375420614),
    (8, 1, -5.068731758, 0.1156368927237),
    (10, 0, -20.63356179, 2.981854288807e-05),
    (10, 1, -12.37760875, 0.003870065307694),
])
def test_tunnelling_through_a_smooth_barrier(g, n, mean, splitting):
    """-y'' + (x^4 - g x^2) y = E y, exact values converged in double precision.

    The uniform barrier (Froeman et al., Ann. Phys. 74, 314, 1972; Child, J. Mol. Spectrosc. 53,
    280, 1974) with the bottom's factor (Furry, Phys. Rev. 71, 360, 1947), here taken from the
    barrier's side of a lopsided well: 0.6 % of the splitting; without it, 7 % at n = 0.
    """
    quartic = np.poly1d([1.0, 0, -g, 0, 0])(np.poly1d([1.0, -6.0]))
    case = Profile((Section(12.0, Polynomial(tuple(quartic.coeffs[::-1])), poly(H2M)),), WALLS)
    pair = phase.levels(case, -g * g / 4 - 1, 0.0, numbers=[2 * n, 2 * n + 1], tolerance=1e-14)
    ratio = (pair[1] - pair[0]) / splitting
    print(f"\ng {g}, pair {n}: mean {pair.mean():.6f} ({mean}), splitting / exact {ratio:.5f}")
    assert ratio == pytest.approx(1.0, abs=0.006)
    assert pair.mean() == pytest.approx(mean, abs=0.025)


# Cutting changes nothing -----------------------------------------------------------------------

def _cut(section, places):
    faces = [0.0, *sorted(places), section.thickness]
    parts = []
    for a, b in zip(faces[:-1], faces[1:], strict=True):
        def moved(curve, a=a):
            if isinstance(curve, Polynomial):
                shifted = np.poly1d(curve.coefficients[::-1])(np.poly1d([1.0, a]))
                return Polynomial(tuple(float(c) for c in shifted.coeffs[::-1]))
            return Sampled(lambda s, a=a: curve.at(s + a))
        parts.append(Section(b - a, moved(section.edge), moved(section.mass),
                             moved(section.inverse_gap), section.layer))
    return parts


CUT = {
    "tilt, one band": Section(12.0, poly(0.0, 0.01), poly(0.067)),
    "tilt, two bands": Section(12.0, poly(0.0, 0.012), poly(0.067), poly(0.8)),
    "parabola": Section(14.0, poly(0.1225, -0.035, 0.0025), poly(0.067), poly(0.5)),
    "graded mass": Section(10.0, poly(0.1, -0.01), poly(0.06, 0.003)),
    "flat": Section(10.0, poly(0.05), poly(0.067), poly(0.5)),
    "soft edge": Section(16.0, Sampled(lambda z: 0.3 / (1 + np.exp(10.0 - 2 * z))), poly(0.067)),
}


@pytest.mark.parametrize("name", CUT)
def test_cutting_a_section_changes_nothing(name):
    outer = flat(8, 0.3, 0.09, 2.0 if CUT[name].inverse_gap.coefficients[0] else None)
    for order in (1, 2):
        whole = phase.levels(Profile((outer, CUT[name], outer)), 0.0, 0.29, phase_order=order)
        parts = _cut(CUT[name], [2.3, 5.1])
        again = phase.levels(Profile((outer, *parts, outer)), 0.0, 0.29, phase_order=order)
        check(f"{name}, order {order}", again, list(whole), 2e-9, "the section in one")
        assert len(whole) >= 2


# Accuracy on curved profiles --------------------------------------------------------------------

def _floor(case):
    return min(float(s.edge.at(np.linspace(0, s.thickness, 201)).min()) for s in case.sections)


def _numbers(rng):
    light, heavy = rng.uniform(0.04, 0.07), rng.uniform(0.07, 0.12)
    gaps = (1 / rng.uniform(0.8, 1.6), 1 / rng.uniform(1.5, 2.2)) if rng.random() < 0.5 else (0, 0)
    return light, heavy, *gaps, rng.uniform(0.15, 0.5)


def quadratic_stack(rng):
    """A well between grades that are flat at their low face, some with a step at the high one."""
    light, heavy, gap_light, gap_heavy, top = _numbers(rng)
    outer = Section(rng.uniform(8, 15), poly(top), poly(heavy), poly(gap_heavy))
    inner = []
    for side in (-1, 1):
        a, height = rng.uniform(2, 15), rng.uniform(0.3, 1.0) * top
        edge = (height, -2 * height / a, height / a**2) if side < 0 else (0, 0, height / a**2)
        inner.append(Section(a, poly(*edge), poly(light), poly(gap_light)))
    well = Section(rng.uniform(1, 8), poly(0.0), poly(light), poly(gap_light))
    middle = [well] if rng.random() < 0.7 else []
    return Profile((outer, inner[0], *middle, inner[1], outer)), top


def interdiffused_stack(rng):
    """A well whose two edges are error functions, diffusion length 0.3 to 3 nm."""
    light, heavy, gap_light, gap_heavy, top = _numbers(rng)
    begin, width, spread = rng.uniform(9, 14), rng.uniform(3, 15), rng.uniform(0.3, 3)

    def share(z):
        return 1 - 0.5 * (erf((z - begin) / (2 * spread)) - erf((z - begin - width) / (2 * spread)))

    section = Section(
        2 * begin + width, Sampled(lambda z: top * share(z)),
        Sampled(lambda z: light + (heavy - light) * share(z)),
        Sampled(lambda z: gap_light + (gap_heavy - gap_light) * share(z)) if gap_light
        else poly(0.0))
    outer = section.edge.at(np.array([0.0, section.thickness]))
    return Profile((section,)), float(outer.min())


def tilted_stack(rng):
    """Two-band wells and barriers in a field of up to 150 kV/cm, in a closed box."""
    light, heavy, *_, top = _numbers(rng)
    gap_light, gap_heavy = 1 / rng.uniform(0.5, 1.6), 1 / rng.uniform(1.5, 2.2)
    field, depth, sections = rng.uniform(-0.015, 0.015), 0.0, []
    count = 2 * int(rng.integers(2, 5)) + 1
    for i in range(count):
        h = 10.0 if i in (0, count - 1) else rng.uniform(2, 10) if i % 2 else rng.uniform(1, 5)
        edge, mass, gap = (0.0, light, gap_light) if i % 2 else (top, heavy, gap_heavy)
        sections.append(Section(h, poly(edge + field * depth, field), poly(mass), poly(gap)))
        depth += h
    return Profile(tuple(sections), WALLS), _floor(Profile(tuple(sections))) + top


@pytest.mark.parametrize("kind", [quadratic_stack, interdiffused_stack, tilted_stack])
@pytest.mark.parametrize("order", [1, 2])
def test_accuracy_on_curved_profiles(kind, order):
    """Error over the spacing to the nearer neighbour: 2 % as a median, 15 % for 95 % of levels."""
    rng = np.random.default_rng(77)
    errors = []
    for _ in range(12):
        case, top = kind(rng)
        exact = np.asarray(dense_levels(case, top - 1e-6).energies)
        if not len(exact):
            continue
        found = phase.levels(case, _floor(case) - 0.01, top + (0.0 if case.ends[0] == "open"
                             else 0.1), numbers=np.arange(len(exact)), phase_order=order)
        spacing = np.diff(np.concatenate(([exact[0] - top], exact, [exact[-1] + top])))
        spacing = np.minimum(spacing[:-1], spacing[1:])
        errors += list(np.where(np.isnan(found), 1.0, np.abs(found - exact) / spacing))
    median, most = np.median(errors), np.quantile(errors, 0.95)
    print(f"\n{kind.__name__}, order {order}: {len(errors)} levels, median {median:.2%}, "
          f"95 % within {most:.2%}, largest {max(errors):.1%}")
    assert len(errors) > 25
    assert median < 0.02
    assert most < 0.15
