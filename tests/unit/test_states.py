import numpy as np
import pytest

import bandwright as bw


def own(thickness, edge):
    return bw.Layer(f"{thickness} nm", edge=f"{edge} eV", mass=0.067)


def test_dipoles_from_bound_levels_to_the_box_count_the_outer_layers():
    """A flat outer layer has no slices for bound levels; they live there all the same."""
    levels = bw.solve(bw.Stack([own(8, 0.26), own(6, 0.0), own(8, 0.25)]), below="0.4 eV")
    boxed = levels.boxed
    assert boxed.any() and not boxed.all()
    z = np.linspace(0.0, 22.0, 40001)
    u = levels.states.sample(z)[0]
    weight = np.full(len(z), z[1])
    weight[[0, -1]] *= 0.5  # trapezia: (dz k)^2 / 12 of it, below 1e-7
    middle = 0.5 * (levels.states.positions[:, None] + levels.states.positions)
    expected = (u * weight * z) @ u.T - middle * ((u * weight) @ u.T)
    found = levels.dipoles()
    print(found[~boxed][:, boxed], expected[~boxed][:, boxed])
    assert found[~boxed][:, boxed] == pytest.approx(expected[~boxed][:, boxed], abs=1e-6)
    assert found == pytest.approx(found.T)
