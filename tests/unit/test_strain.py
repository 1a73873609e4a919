"""Strain: plain functions of floats and arrays."""

import numpy as np
import pytest

from bandwright import strain


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
