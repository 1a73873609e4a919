"""Linear propagation against a closed form, and against stacks drawn at random.

Sampling errors are those of normal draws: s/sqrt(n) of a mean, s/sqrt(2n) of a sigma,
sqrt(p(1 - p)/n) of a share (any textbook). Agreement is asked within four of them, which a right
answer misses once in 16,000; spreads are so small that what is of second order, relative
(sigma_E/E)^2 or so, hides below.
"""

import math

import numpy as np
import pytest

import bandwright as bw

DRAWS = 100_000


def test_an_infinite_well_by_its_closed_form():
    """E goes as L^-2 and 1/m: dE/E = -2 dL/L - dm/m, of the wavelength with the other sign."""
    length, mass, s_length, s_mass = 8.0, 0.07, 0.02, 0.0004
    well = bw.Layer(f"{length} nm", edge="0 meV", mass=mass, label="well")
    found = bw.tolerance(
        bw.Stack([well], ends="wall"), {"well.thickness": f"{s_length} nm", "well.mass": s_mass},
        at_most=4, tolerance="1e-10 eV",
    )  # fmt: skip
    relative = math.hypot(2.0 * s_length / length, s_mass / mass)
    table = found.table
    assert len(table) == 6
    for sigma, value in (("sigma_um", "wavelength_um"), ("sigma_meV", "energy_meV")):
        ratio = table[sigma] / table[value]
        print(f"{sigma}: found {ratio[0]:.12f}, reference {relative:.12f}")
        np.testing.assert_allclose(ratio, relative, rtol=1e-8)
    shares = dict(zip(found.shares["parameter"], found.shares["share_percent"], strict=True))
    wanted = 100.0 * (2.0 * s_length / length / relative) ** 2
    assert shares["well.thickness"] == pytest.approx(wanted, rel=1e-8)


def test_linear_propagation_against_a_hundred_thousand_draws():
    """An invented well, thickness and both edges spread by a few tenths of a per cent."""
    stack = bw.parse_line("15 nm {edge 250 meV, mass 0.092, label lower}, 7 nm {edge 0 meV,"
                          " mass 0.067, label well}, 15 nm {edge 240 meV, mass 0.092}")  # fmt: skip
    spreads = {"well.thickness": "0.02 nm", "lower.edge": "1.5 meV", "lower.thickness": "0.1 nm"}
    free = bw.tolerance(stack, spreads)
    center, sigma = free.line.wavelength_um, free.sigma_um
    window = (f"{center - 0.7 * sigma!r} um", f"{center + 1.2 * sigma!r} um")
    found = bw.tolerance(stack, spreads, window=window, draws=DRAWS, seed=11)
    draws, linear = found.draws, found.linear_yield
    assert draws.failed == draws.missing == draws.unlike == 0
    band = draws.inside(found.window)
    errors = {
        "mean": (draws.mean_um, center, sigma / math.sqrt(DRAWS)),
        "sigma": (draws.sigma_um, sigma, sigma / math.sqrt(2.0 * DRAWS)),
        "yield": (band.share, linear, math.sqrt(linear * (1.0 - linear) / DRAWS)),
    }
    for name, (drawn, wanted, error) in errors.items():
        print(f"{name}: drawn {drawn:.6f}, linear {wanted:.6f}, error {error:.6f}")
        assert abs(drawn - wanted) < 4.0 * error, name
    assert draws.mean_error_um == pytest.approx(errors["mean"][2], rel=0.02)
    assert draws.sigma_error_um == pytest.approx(errors["sigma"][2], rel=0.05)
    assert band.error == pytest.approx(errors["yield"][2], rel=0.02)
    assert found.cautions == found.lines.cautions
