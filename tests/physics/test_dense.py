"""The independent discretisation itself, against closed forms: it must deserve its role."""

import numpy as np
import pytest

from physics.build import curved, flat, poly, profile, reference, scaled
from physics.dense import count, levels, mixed_levels
from physics.matching import check
from physics.randomstacks import random_case

TIGHT = 1e-11  # eV


def energies(name):
    outputs = reference()[1][name]["outputs"]
    return next(outputs[k] for k in ("E_eV", "E_1..5_eV", "E_eV (V=0 at left wall)")
                if k in outputs)  # fmt: skip


def source(name):
    return reference()[1][name]["source"]


def well(width, step, inner, outer, gaps=(None, None)):
    barrier = flat(3.0, step, outer, gaps[1])
    return profile(barrier, flat(width, 0.0, inner, gaps[0]), barrier)


CASES = {
    "A1.m0.067.L10": (profile(flat(10, 0, 0.067), ends="wall"), 1.7),
    "A3.L10.V0.25.mb0.092": (well(10, 0.25, 0.067, 0.092), 0.2499999),
    "A2.L20.V0.50.mb0.067": (well(20, 0.5, 0.067, 0.067), 0.4999999),
    "A13.InGaAs.L10": (well(10, 0.52, 0.043, 0.075, (0.816, 1.53)), 0.5199999),
    "A13.infinite": (profile(flat(10, 0, 0.067, 1.519), ends="wall"), 1.0),
    "A6.L20.F0.02": (profile(curved(20, poly(0, 0.02), 0.067), ends="wall"), 0.6),
    "A8.linmass": (
        profile(curved(10, poly(0), poly(scaled(0.067), scaled(0.0025))), ends="wall"), 1.5
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_dense_closed_form(name):
    case, high = CASES[name]
    expected = energies(name)
    found = levels(case, high).energies[: len(expected)]
    check(name, found, expected, TIGHT, source(name))


@pytest.mark.parametrize("barrier", ["2", "10"])
def test_dense_double_well_splitting(barrier):
    record = reference()[1]["A11.finite"]["outputs"][f"b={barrier}"]
    outer, inner = flat(3, 0.25, 0.092), flat(6, 0, 0.067)
    found = levels(profile(outer, inner, flat(float(barrier), 0.25, 0.092), inner, outer), 0.1)
    check(f"splitting, {barrier} nm", np.diff(found.energies), [record["splitting_1"]], 1e-14,
          "closed equation of two coupled wells")  # fmt: skip


def test_dense_dipoles_closed_form():
    _, records = reference()
    found = levels(CASES["A3.L10.V0.25.mb0.092"][0], 0.2499999)
    expected = records["A3.L10.V0.25.mb0.092"]["outputs"]["z12_nm"]
    check("z12, finite well", [abs(found.dipoles()[0, 1])], [expected], 1e-8, "closed form")
    found = levels(CASES["A1.m0.067.L10"][0], 1.0)
    expected = records["A1.m0.067.L10"]["outputs"]["|z12|_nm"]
    check("z12, box", [abs(found.dipoles()[0, 1])], [expected], 1e-10, "16 L / (9 pi^2)")


@pytest.mark.parametrize("seed", [0, 3, 5])
@pytest.mark.parametrize("kind", ["linear", "field"])
def test_dense_agrees_with_mixed_form(kind, seed):
    """Two formulations: Newton on T(E), and a pencil linear in E with u and p discretised."""
    case = random_case(kind, "two-band", seed)
    sections = case.profile.sections[:9]
    walls = type(case.profile)(sections, ("wall", "wall"), bands="two-band")
    high = min(case.high, min(float(s.edge.at(np.zeros(1))[0]) for s in sections) + 0.5)
    one, other = levels(walls, high).energies, mixed_levels(walls, high)
    assert len(one) == len(other)
    assert np.abs(one - other).max(initial=0.0) < TIGHT


@pytest.mark.parametrize("kind", ["mixed", "coupled", "polar"])
def test_dense_states_are_orthonormal_in_the_two_band_product(kind):
    case = random_case(kind, "two-band", 2)
    product = levels(case.profile, case.high).products()
    assert len(product) > 1
    assert np.abs(product - np.eye(len(product))).max() < 1e-9


def test_dense_count_steps_by_one_at_each_level():
    case, high = CASES["A13.InGaAs.L10"]
    found = levels(case, high).energies
    for i, energy in enumerate(found):
        assert count(case, energy - 1e-9) == i
        assert count(case, energy + 1e-9) == i + 1
