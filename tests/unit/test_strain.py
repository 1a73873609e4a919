"""Strain: plain functions of floats and arrays."""

import numpy as np
import pytest

from bandwright import strain
from bandwright.errors import UnknownName


def test_a_layer_wider_than_its_substrate_is_pressed_together_and_grows_taller():
    exx = strain.in_plane(0.574, 0.565)
    ezz = strain.along_growth(exx, 110.0, 55.0)
    assert exx == pytest.approx(-0.009 / 0.574)
    assert ezz == pytest.approx(-exx)  # 2 C12 = C11
    assert strain.trace(exx, ezz) == pytest.approx(exx)
    assert strain.monolayer(0.574, ezz) > 0.287


def test_no_misfit_no_strain():
    assert strain.in_plane(0.565325, 0.565325) == 0.0


def test_pressing_together_lifts_the_edge_and_opens_the_gap():
    assert strain.edge_shift(-7.17, -0.01) == pytest.approx(0.0717)
    assert strain.gap_shift(-7.17, -1.16, -0.01) == pytest.approx(0.0833)


def test_only_the_ratio_of_the_elastic_constants_matters():
    assert strain.along_growth(0.01, 1221.0, 566.0) == pytest.approx(
        strain.along_growth(0.01, 122.1, 56.6), rel=1e-15
    )


def test_the_layer_is_free_of_stress_along_growth():
    exx = np.linspace(-0.02, 0.02, 5)
    c11, c12 = 122.1, 56.6
    ezz = strain.along_growth(exx, c11, c12)
    np.testing.assert_allclose(2.0 * c12 * exx + c11 * ezz, 0.0, atol=1e-13)


def test_arrays_along_a_graded_layer():
    lattice = np.array([0.565, 0.570, 0.575])
    exx = strain.in_plane(lattice, 0.565)
    assert exx.shape == (3,) and exx[0] == 0.0
    assert np.all(np.diff(exx) < 0.0)


# InxGa1-xAs on GaAs: h = b (1 - nu cos^2 a)[ln(h/b) + 1]/(K f (1 + nu) cos l) of Matthews and
# Blakeslee, J. Cryst. Growth 27, 118 (1974), solved by fixed point on lattices and C11, C12 of
# Vurgaftman et al., J. Appl. Phys. 89, 5815 (2001), from memory. f, nu, h [nm] for K = 8 pi,
# 4 pi, 2 pi; the last to the ten digits kept.
CRITICAL = [
    (0.0071649051430593, 0.319348245386763, 14.1378558242449, 33.645072340079, 77.64886235),
    (0.0143298102861186, 0.322120116203237, 5.62630551030132, 14.0863132284443, 33.527662),
    (0.0214947154291779, 0.325061867953927, 3.14161750770562, 8.26944043418618, 20.20581595),
]


@pytest.mark.parametrize(("misfit", "poisson", "free", "buried", "superlattice"), CRITICAL)
def test_critical_thickness(misfit, poisson, free, buried, superlattice):
    found = strain.critical_thickness(misfit, 0.565325, poisson, "free surface")
    print(f"found {found!r}, reference {free!r}")
    assert found == pytest.approx(free, rel=1e-12)
    assert strain.critical_thickness(-misfit, 0.565325, poisson) == pytest.approx(buried, rel=1e-12)
    found = strain.critical_thickness(misfit, 0.565325, poisson, "superlattice")
    assert found == pytest.approx(superlattice, rel=1e-9)


@pytest.mark.parametrize("case", strain.CASES)
def test_the_critical_thickness_solves_its_equation(case):
    misfit, lattice, nu = 0.006, 0.58, 0.33
    h, b = strain.critical_thickness(misfit, lattice, nu, case), lattice / np.sqrt(2.0)
    k = {"free surface": 8, "single layer": 4, "superlattice": 2}[case] * np.pi
    right = b * (1 - nu / 4) * (np.log(h / b) + 1) / (k * misfit * (1 + nu) / 2)
    assert h == pytest.approx(right, rel=1e-12)


def test_critical_thickness_at_its_limits():
    assert strain.critical_thickness(0.0, 0.565325) == np.inf
    assert strain.critical_thickness(0.2, 0.565325) == 0.0


def test_an_unknown_case_of_the_critical_thickness():
    with pytest.raises(UnknownName, match="no 'surface'; did you mean 'free surface'"):
        strain.critical_thickness(0.01, 0.565325, case="surface")


def test_stress_in_the_plane_per_strain():
    # Hooke's law of a cubic layer with exx = eyy and no stress along growth, written out
    c11, c12, exx = 122.1, 56.6, -0.01
    ezz = strain.along_growth(exx, c11, c12)
    stress = c11 * exx + c12 * exx + c12 * ezz
    assert strain.biaxial_stiffness(c11, c12) * exx == pytest.approx(stress, rel=1e-14)
    assert strain.biaxial_stiffness(c11, c12) == pytest.approx(126.2256347256, rel=1e-10)


def test_layers_that_share_a_misfit_equally_are_single_layers_of_half_of_it():
    # why K of a superlattice is half that of a single layer: each layer bears half the misfit
    whole = strain.critical_thickness(0.01, 0.565, 0.32, "superlattice")
    assert whole == pytest.approx(strain.critical_thickness(0.005, 0.565, 0.32), rel=1e-14)
