"""Face models of the phase integral against the special functions they stand for."""

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.special import airy, pbdv

from bandwright.phase import maps


@pytest.mark.parametrize("model", [maps.allowed_modulus, maps.forbidden_modulus])
def test_airy_functions_and_their_series_join(model):
    before, after = maps._FAR * (1 - 1e-12), maps._FAR * (1 + 1e-12)
    for values in model(np.array([before, after])):
        assert values[0] == pytest.approx(values[1], abs=2e-11)


def test_airy_face_at_the_turning_point_itself():
    face = maps.airy_face(np.array([0.0, 1e-9]), np.array([-1.0, -1.0]))
    ai, _, bi, _ = airy(0.0)
    assert face.allowed.tolist() == [False, True]
    assert face.square[0] == pytest.approx(2 * np.pi * ai * bi)
    assert face.square[1] == pytest.approx(np.pi * (ai**2 + bi**2), rel=1e-6)
    assert face.shift[1] == pytest.approx(np.pi / 6 - np.pi / 4, abs=1e-6)


def test_airy_face_of_a_level_edge_is_the_plain_amplitude():
    face = maps.airy_face(np.array([4.0, -4.0]), np.array([0.0, 0.0]))
    assert face.square == pytest.approx([0.5, 0.5])
    assert face.slope == pytest.approx([0.0, 0.0])
    assert face.shift == pytest.approx([0.0, 0.0])


@pytest.mark.parametrize("height", [0.2, 0.5, 0.9, 1.7, 3.3, -0.3, -2.0])
def test_bottom_model_is_the_parabolic_cylinder_function(height):
    value, slope = pbdv(height - 0.5, 0.0)  # DLMF 12.1: U(a, x) = D_(-a-1/2)(x)
    face = maps.bottom_face(np.array([height]), np.array([1.0]))
    across = 1 / np.tan(np.pi * height / 2 + np.pi / 4) if height > 0 else 1.0
    assert across / face.square[0] == pytest.approx(-slope / value, rel=1e-9, abs=1e-12)


@pytest.mark.parametrize("n, factor", [(0, 1.075047603), (1, 1.027507735), (3, 1.011919937)])
def test_bottom_exponent_is_half_the_log_of_furrys_factor(n, factor):
    assert 2 * maps.bottom_exponent(np.array([n + 0.5]))[0] == pytest.approx(np.log(factor))


def test_top_model_joins_across_the_top_and_dies_out_away_from_it():
    a = np.array([-1e-7, 1e-7])
    assert np.ptp(maps.top_phase(a)) < 1e-4
    assert abs(maps.top_phase(np.array([50.0]))[0]) < 1e-3
    assert maps.top_exponent(np.array([16.999, 17.001])) == pytest.approx(
        [16.999 + np.log(2) / 2, 17.001 + np.log(2) / 2], rel=1e-13
    )
    assert maps.top_exponent(np.array([-20.0]))[0] < 1e-16


def test_edge_phase_of_a_sharp_edge_is_the_steps():
    k, kappa = np.array([1e-5, 3e-5]), np.array([2e-5, 1e-5])
    assert maps.edge_phase(k, kappa) == pytest.approx(np.arctan(k / kappa) - np.pi / 4, abs=1e-3)
    assert np.abs(maps.edge_phase(np.array([300.0]), np.array([200.0]))) < 1e-3


@pytest.mark.parametrize("k, kappa", [(0.3, 0.5), (1.0, 0.4), (2.0, 2.0)])
def test_edge_phase_against_integration_of_the_equation(k, kappa):
    def q(y):
        return k**2 - (k**2 + kappa**2) / (1 + np.exp(-y))

    far = 25.0
    path = solve_ivp(lambda y, f: [f[1], -q(y) * f[0]], (far, -far), [1.0, -kappa],
                     rtol=1e-11, atol=1e-14)
    u, p = path.y[:, -1]
    theta = np.arctan2(u * k, -p)  # u = M sin(Theta), p = -cos(Theta) / M
    v = np.sqrt(q(-far))
    action = 2 * (k * 0.5 * np.log((k + v) ** 2 / (k * k - v * v)) - kappa * np.arctan(v / kappa))
    found = maps.edge_phase(np.array([k]), np.array([kappa]))[0]
    turns = (action + np.pi / 4 + found - theta) / np.pi
    assert turns == pytest.approx(round(turns), abs=1e-5)
