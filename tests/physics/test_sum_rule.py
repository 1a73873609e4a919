"""The dipole sum rule: a check on all states and matrix elements at once.

In the one-band model  sum_j (E_j - E_i) z_ij^2 = h2m <i| 1/m(z) |i>  (from the double commutator
[z, [H, z]]; Thomas, Reiche and Kuhn 1925 for constant mass, Sirtori, Capasso, Faist, Scandolo,
Phys. Rev. B 50, 8663, 1994 for layers). Between walls all states are discrete; the sum over the
lowest N converges with N. In the two-band model the total over conduction- and valence-like
states is zero, so conduction-like ones alone must not follow the one-band rule.
"""

import numpy as np
import pytest

from bandwright.constants import H2M
from bandwright.profile import Profile, Section
from bandwright.solver import solve_profile
from physics.build import poly
from physics.randomstacks import tilt


def inverse_mass(found, profile):
    """<i| 1/m |i> by Gauss points on pieces of each section, shape (n_levels,)."""
    x, w = np.polynomial.legendre.leggauss(12)
    total = np.zeros(len(found.energies))
    for section, start in zip(profile.sections, profile.faces[:-1], strict=True):
        pieces = 100
        h = section.thickness / pieces
        depth = ((np.arange(pieces)[:, None] + 0.5) * h + 0.5 * h * x).ravel()
        weight = np.tile(0.5 * h * w, pieces)
        u = found.sample(start + depth)
        total += (u**2 * (weight / section.mass.at(depth))).sum(axis=1)
    return total


def section(width, edge, mass):
    return Section(width, poly(edge), poly(mass))


# What is missing from the first 400 eV of states: nothing much in a smooth box; where the mass
# jumps, z_ij^2 (E_j - E_i) falls as 1/j^2 only and the rest as 1/N, which is checked too.
CASES = {
    "one mass": (1e-5, (section(12.0, 0.0, 0.067),)),
    "well of another mass": (4e-4, (
        section(6.0, 0.25, 0.092), section(8.0, 0.0, 0.067), section(6.0, 0.25, 0.092)
    )),
    "three masses in a field": (3e-3, tilt(
        (section(5.0, 0.3, 0.12), section(7.0, 0.0, 0.05), section(4.0, 0.15, 0.08)), 0.005
    )),
    "graded mass": (2e-5, (Section(12.0, poly(0.0, 0.01), poly(0.05, 0.005)),)),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_dipole_sum_rule(name):
    share, sections = CASES[name]
    profile = Profile(sections, ("wall", "wall"))
    found = solve_profile(profile, high=400.0, tolerance=1e-6)
    assert found.complete
    energies, z = found.energies, found.dipoles()
    count = len(energies)
    assert count > 100
    expected = H2M * inverse_mass(found, profile)
    strengths = (energies[None, :] - energies[:, None]) * z**2
    for i in range(3):
        whole, third = strengths[i].sum(), strengths[i, : count // 3].sum()
        print(f"{name}, level {i + 1}: sum {whole:.9f}, rule {expected[i]:.9f} eV nm^2")
        assert abs(whole / expected[i] - 1) < share
        assert abs(third - expected[i]) > 2 * abs(whole - expected[i])  # it converges


def test_two_band_states_do_not_follow_the_one_band_rule():
    layer = Section(12.0, poly(0.0), poly(0.05), poly(1.0 / 0.6))
    profile = Profile((layer,), ("wall", "wall"), bands="two-band")
    found = solve_profile(profile, high=20.0, tolerance=1e-7)
    energies, z = found.energies, found.dipoles()
    total = ((energies - energies[0]) * z[0] ** 2).sum()
    assert 0 < total < 0.95 * H2M * inverse_mass(found, profile)[0]
