"""What must not change a level, or must change it in one direction, on arbitrary profiles."""

from decimal import Decimal

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from bandwright import Layer, Stack
from bandwright import solve as bw_solve
from bandwright.constants import H2M
from bandwright.solver import solve_profile
from physics.dense import count
from physics.randomstacks import CLASSES, random_case
from properties.profiles import (
    cut,
    lifted,
    lowest,
    mirrored,
    moved,
    outer_edges,
    profiles,
    stretched,
)

TOLERANCE = 1e-9  # eV
DIPOLE = 1e-4  # nm
some = settings(max_examples=30, deadline=None)


def solve(profile, high, tolerance=TOLERANCE):
    found = solve_profile(profile, high=high, tolerance=tolerance)
    assert found.count_checked.all()
    assert found.complete
    return found


def pairs(one, other, high, tolerance=2 * TOLERANCE):
    """Compare two lists of levels below an energy that none of them is near; return how many."""
    bound = high
    while any(np.abs(e - bound).min(initial=1.0) < 4 * tolerance for e in (one, other)):
        bound -= 8 * tolerance
    one, other = one[one < bound], other[other < bound]
    assert len(one) == len(other)
    assert np.abs(one - other).max(initial=0.0) < tolerance
    return len(one)


def lone(energies, apart=1e-7):
    return np.minimum(np.diff(energies, prepend=-9.0), np.diff(energies, append=99.0)) > apart


def same_dipoles(one, other, number):
    keep = np.flatnonzero(lone(one.energies)[:number])
    a, b = (np.abs(f.dipoles())[np.ix_(keep, keep)] for f in (one, other))
    off = ~np.eye(len(keep), dtype=bool)
    assert np.abs(a - b)[off].max(initial=0.0) < DIPOLE


@some
@given(profiles(), st.floats(-3.0, 3.0))
def test_shift_of_the_energy_origin(drawn, energy):
    profile, high = drawn
    assume(high > lowest(profile))
    one, other = solve(profile, high), solve(moved(profile, energy), high + energy)
    number = pairs(one.energies, other.energies - energy, high)
    same_dipoles(one, other, number)


@some
@given(profiles())
def test_mirror_with_the_field_reversed(drawn):
    profile, high = drawn
    assume(high > lowest(profile))
    one, other = solve(profile, high), solve(mirrored(profile), high)
    number = pairs(one.energies, other.energies, high)
    same_dipoles(one, other, number)
    keep = np.flatnonzero(lone(one.energies)[:number])
    here, there = (np.diag(f.dipoles())[keep] for f in (one, other))
    assert np.abs(here + there - profile.faces[-1]).max(initial=0.0) < DIPOLE


tenths = st.integers(3, 140)


@some
@given(
    st.lists(st.tuples(tenths, st.integers(0, 500)), min_size=1, max_size=5),
    st.sampled_from(["Å", "Angstrom", "pm", "um"]),
    st.sampled_from(["0 kV/cm", "-35 kV/cm"]),
)
def test_nm_against_angstrom(layers, unit, field):
    """The same lengths in another unit are the same stack, and its levels the same floats."""
    exponent = {"Å": 1, "Angstrom": 1, "pm": 3, "um": -3}[unit]

    def stack(length):
        return Stack(
            [
                Layer(length(tenth), edge=f"{edge} meV", mass=0.05 + edge * 1e-4, gap="1.2 eV")
                for tenth, edge in layers
            ],
            field=field, ends=("wall", "wall"),
        )  # fmt: skip

    in_nm = stack(lambda tenth: f"{Decimal(tenth) / 10} nm")
    other = stack(lambda tenth: f"{(Decimal(tenth) / 10).scaleb(exponent):f} {unit}")
    assert in_nm == other
    one, two = (bw_solve(s, below="1.5 eV") for s in (in_nm, other))
    assert np.array_equal(one.energies, two.energies)


@some
@given(profiles(), st.data())
def test_cutting_a_layer(drawn, data):
    profile, high = drawn
    assume(high > lowest(profile))
    number = data.draw(st.integers(0, len(profile.sections) - 1))
    parts = cut(profile, number, data.draw(st.floats(0.01, 0.99)))
    one, other = solve(profile, high), solve(parts, high)
    same_dipoles(one, other, pairs(one.energies, other.energies, high))


@some
@given(profiles(), st.sampled_from([1e-4, 1e-6, 1e-8]))
def test_cutting_slices(drawn, tolerance):
    """A finer tolerance cuts the slices; every level stays within the coarser tolerance."""
    profile, high = drawn
    assume(high > lowest(profile))
    coarse, fine = solve(profile, high, tolerance), solve(profile, high, tolerance / 20)
    pairs(coarse.energies, fine.energies, high, tolerance)


@some
@given(profiles(flat=True), st.lists(st.floats(0.05, 0.95), min_size=1, max_size=5))
def test_merging_equal_neighbours(drawn, shares):
    """A flat layer in pieces is the layer: the same to rounding, since both are exact."""
    profile, high = drawn
    assume(high > lowest(profile))
    pieces = profile
    for share in shares:
        pieces = cut(pieces, 0, share)
    one, other = solve(profile, high), solve(pieces, high)
    pairs(one.energies, other.energies, high, 1e-9)


@some
@given(profiles(), st.floats(0.3, 4.0))
def test_lengths_scaled_with_energies(drawn, factor):
    """Lengths times f and energies over f^2 give levels over f^2 and dipoles times f."""
    profile, high = drawn
    assume(high > lowest(profile))
    scaled = solve(stretched(profile, factor), high / factor**2, TOLERANCE / factor**2)
    one = solve(profile, high)
    number = pairs(one.energies, scaled.energies * factor**2, high)
    keep = np.flatnonzero(lone(one.energies)[:number])
    here, there = (np.abs(f.dipoles())[np.ix_(keep, keep)] for f in (one, scaled))
    assert np.abs(here - there / factor).max(initial=0.0) < DIPOLE


@settings(max_examples=40, deadline=None)
@given(st.sampled_from(CLASSES), st.integers(0, 10**6), st.floats(0.2, 1.0))
def test_number_found_is_an_independent_count(which, seed, share):
    """1 to 60 layers; the count is that of a dense matrix of another discretisation."""
    case = random_case(*which, seed)
    energy = lowest(case.profile) + share * (case.high - lowest(case.profile))
    found = solve(case.profile, energy, 1e-6)
    below = count(case.profile, energy - 2e-6)
    above = count(case.profile, energy + min(2e-6, 0.5 * (case.high + 1e-5 - energy)))
    assert below <= len(found.energies) <= above


@some
@given(profiles())
def test_orthonormal_in_the_two_band_product(drawn):
    """<i|j> = int u_i u_j + h2m b p_i p_j by our own Gauss points, tails of open ends by exp."""
    profile, high = drawn
    assume(high > lowest(profile))
    found = solve(profile, high)
    assume(len(found.energies))
    x, w = np.polynomial.legendre.leggauss(10)
    product = np.zeros((len(found.energies),) * 2)
    faces = profile.faces
    for s, start in zip(profile.sections, faces[:-1], strict=True):
        pieces = int(np.ceil(4 * s.thickness))
        h = s.thickness / pieces
        depth = ((np.arange(pieces)[:, None] + 0.5) * h + 0.5 * h * x).ravel()
        weight = np.tile(0.5 * h * w, pieces)
        u, p = found.states.sample(start + depth)
        b = s.mass.at(depth) * s.inverse_gap.at(depth)
        product += (u * weight) @ u.T + (p * (H2M * b * weight)) @ p.T
    outer = zip(profile.ends, (profile.sections[0], profile.sections[-1]), faces[[0, -1]],
                outer_edges(profile), (0.0, profile.sections[-1].thickness),
                strict=True)  # fmt: skip
    for end, s, face, edge, depth in outer:
        if end == "open":
            mass, inverse = (float(c.at(np.array([depth]))[0]) for c in (s.mass, s.inverse_gap))
            heavy = mass * (1 + (found.energies - edge) * inverse)
            kappa = np.sqrt(heavy * (edge - found.energies) / H2M)
            u, p = (f[:, 0] for f in found.states.sample(np.array([face])))
            size = np.outer(u, u) + H2M * mass * inverse * np.outer(p, p)
            product += size / (kappa[:, None] + kappa)
    keep = np.flatnonzero(lone(found.energies))
    away = np.abs(product - np.eye(len(product)))[np.ix_(keep, keep)]
    assert away.max(initial=0.0) < 1e-5


@some
@given(profiles(ends=("open", "open"), flat=True), st.floats(0.005, 0.2))
def test_raising_the_lower_cladding_edge_raises_every_level(drawn, energy):
    profile, high = drawn
    assume(high > lowest(profile) and len(profile.sections) > 1)
    lower = int(np.argmin(outer_edges(profile)))
    number = 0 if lower == 0 else len(profile.sections) - 1
    one, other = solve(profile, high), solve(lifted(profile, number, energy), high)
    number_found = len(other.energies)
    assert number_found <= len(one.energies)
    rise = other.energies - one.energies[:number_found]
    assert (rise > -2 * TOLERANCE).all()
    inside = one.states.probabilities[:number_found, number]
    assert (rise[inside * energy > 1e-6] > 0).all()
