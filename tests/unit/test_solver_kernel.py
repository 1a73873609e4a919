"""The elements of K(E), their derivatives and the count, against other ways to the same numbers."""

import numpy as np
import pytest

from bandwright.constants import H2M
from bandwright.solver.kinds import GAUSS, Constant, Curved, Tilted, joined
from bandwright.solver.matrix import Matrix, assemble, count_and_pivot
from bandwright.solver.propagation import (
    MASS_FLOOR,
    curved,
    dual_product,
    half_wave_functions,
    half_wave_slopes,
    local_mass,
    magnus,
)

GAPS = (0.0, 0.7, 4.0)  # 1/Eg; at the last one masses reach their floor


def numbers(kind, rows, gap, columns=1, seed=1):
    """Random slices of one kind, some in a well and some in a barrier, as its evaluator asks."""
    rng = np.random.default_rng(seed)
    shape = (rows, columns)
    thickness = rng.uniform(0.3, 1.5, shape)
    edge = rng.choice([0.0, 0.3], (rows, 1)) + rng.uniform(0.0, 0.02, shape)
    mass, inverse_gap = rng.uniform(0.06, 0.1, shape), np.full(shape, gap)
    if kind is Constant:
        return thickness, edge, mass, inverse_gap, np.zeros(shape)
    drop = rng.uniform(-0.05, 0.05, shape)
    if kind is Tilted:
        return thickness, edge, mass, inverse_gap, drop
    z = GAUSS[:, None, None]
    return (
        thickness, edge + drop * z + 0.2 * z * z, mass * (1.0 + 0.1 * z),
        inverse_gap * (1.0 - 0.1 * z),
    )  # fmt: skip


def same(one, other, tolerance=1e-12):
    for a, b in zip(one[:3], other[:3], strict=True):
        np.testing.assert_allclose(a, b, rtol=tolerance, atol=tolerance)
    clamped = (np.zeros(one.off.shape, int) if v.clamped is None else v.clamped
               for v in (one, other))  # fmt: skip
    np.testing.assert_array_equal(*clamped)


def test_half_wave_functions_are_those_of_a_complex_argument():
    w = np.concatenate((np.linspace(-40.0, 2.3, 300), [-1e-9, 1e-9]))
    x = 2.0 * np.sqrt(w.astype(complex))
    f, g = half_wave_functions(w)
    np.testing.assert_allclose(f, (x / np.tan(x)).real, rtol=1e-13, atol=1e-13)
    np.testing.assert_allclose(g, (x / np.sin(x)).real, rtol=1e-13, atol=1e-14)


def test_half_wave_functions_of_nothing_and_of_a_thick_barrier():
    f, g = half_wave_functions(np.array([0.0, -1e6]))
    np.testing.assert_allclose(f, [1.0, 2000.0], rtol=1e-15)
    assert g[0] == 1.0 and g[1] == 0.0


def test_half_wave_slopes_by_a_complex_step():
    w = np.concatenate((np.linspace(-20.0, 2.3, 200), np.linspace(-0.02, 0.02, 41) + 3e-4))
    x = 2.0 * np.sqrt(w + 1e-20j)
    df, dg = half_wave_slopes(w, *half_wave_functions(w))
    np.testing.assert_allclose(df, (x / np.tan(x)).imag / 1e-20, rtol=1e-11)
    np.testing.assert_allclose(dg, (x / np.sin(x)).imag / 1e-20, rtol=1e-11)


def test_half_wave_slopes_at_zero():
    zero = np.zeros(1)
    df, dg = half_wave_slopes(zero, *half_wave_functions(zero))
    np.testing.assert_allclose([df[0], dg[0]], [-4.0 / 3.0, 2.0 / 3.0], rtol=1e-15)


@pytest.mark.parametrize(("gap", "steady"), [(0.0, True), (0.0, False), (0.7, False)])
def test_coefficients_give_the_exponent(gap, steady):
    thickness, edge, mass, inverse_gap = numbers(Curved, 30, gap)
    if steady:
        mass = np.broadcast_to(mass[1], mass.shape)
    e = np.linspace(-0.6, 1.2, 23)
    energies = edge[1] + e
    above = energies - edge
    local = mass * (1.0 + above * inverse_gap)
    found = curved(thickness, edge, mass, inverse_gap)
    assert len(found.a) == (1 if steady else 3 if gap == 0.0 else 6)
    for coefficients, exact in zip(
        found, magnus(thickness * local, -thickness / H2M * above), strict=True
    ):
        value = sum(c * e**power for power, c in enumerate(coefficients))
        np.testing.assert_allclose(np.broadcast_to(value, exact.shape), exact, rtol=0.0,
                                   atol=1e-13 * np.abs(exact).max())  # fmt: skip


@pytest.mark.parametrize("gap", GAPS)
@pytest.mark.parametrize("kind", [Constant, Tilted, Curved])
def test_slopes_are_the_derivatives(kind, gap):
    evaluator = kind(*numbers(kind, 9, gap))
    energies, step = np.linspace(0.15, 0.4, 26), 1e-3
    pair = evaluator(energies, True)
    same(type(pair)(*(v[0] for v in pair[:3])), evaluator(energies, False)._replace(clamped=None))
    weights = {-3: -1 / 60, -2: 3 / 20, -1: -3 / 4, 1: 3 / 4, 2: -3 / 20, 3: 1 / 60}
    around = [evaluator(energies + n * step, False) for n in weights]
    for k in range(3):
        slope = sum(w * v[k] for w, v in zip(weights.values(), around, strict=True)) / step
        np.testing.assert_allclose(pair[k][1], slope, rtol=1e-8, atol=1e-8)


@pytest.mark.parametrize("slopes", [False, True])
@pytest.mark.parametrize("kind", [Constant, Tilted, Curved])
def test_rows_at_the_floor_of_their_mass(kind, slopes):
    """Each energy alone, so by polynomials where it can, and all of them at once."""
    evaluator = kind(*numbers(kind, 8, 4.0))
    energies = np.linspace(-0.1, 0.6, 36)
    points = evaluator._points
    low = 1.0 + (energies - points.edge) * points.inverse_gap <= MASS_FLOOR
    assert low.any() and not low.all()
    whole = evaluator(energies, slopes)
    for column, energy in enumerate(energies):
        alone = evaluator(np.array([energy]), slopes)
        same(alone, type(whole)(*(v if v is None else v[..., [column]] for v in whole)))


@pytest.mark.parametrize("slopes", [False, True])
def test_a_slice_at_the_floor_is_one_of_a_constant_mass(slopes):
    thickness, edge, mass, inverse_gap, drop = numbers(Tilted, 6, 4.0)
    energies = np.linspace(-0.4, -0.27, 7)
    light = Tilted(thickness, edge, MASS_FLOOR * mass, 0.0 * mass, drop)
    same(Tilted(thickness, edge, mass, inverse_gap, drop)(energies, slopes),
         light(energies, slopes))  # fmt: skip


def test_direct_exponents_carry_their_derivative():
    thickness, edge, mass, inverse_gap = numbers(Curved, 5, 0.7)

    def pair(energy):
        above = energy - edge
        local, b = local_mass(np.array([energy]), edge, mass, inverse_gap)
        a = np.stack((thickness * local, np.broadcast_to(thickness * b, local.shape)), axis=1)
        c = -thickness / H2M * np.stack((above, np.ones_like(above)), axis=1)
        return magnus(a, c, dual_product)

    here, low, high = pair(0.3), pair(0.3 - 1e-4), pair(0.3 + 1e-4)
    for value, before, after in zip(here, low, high, strict=True):
        np.testing.assert_allclose(value[1], (after[0] - before[0]) / 2e-4, rtol=1e-6, atol=1e-9)


@pytest.mark.parametrize("slopes", [False, True])
@pytest.mark.parametrize("kind", [Constant, Tilted, Curved])
def test_many_rows_are_evaluated_as_few_are(kind, slopes):
    arrays = numbers(kind, 301, 0.7)
    energies = np.linspace(0.01, 9.0, 211)
    whole = kind(*arrays)(energies, slopes)
    parts = [kind(*(v[..., r : r + 7, :] for v in arrays))(energies, slopes)
             for r in range(0, 301, 7)]  # fmt: skip
    rows = [np.arange(r, r + 7) for r in range(0, 301, 7)]
    same(joined(list(zip(rows, parts, strict=True)), 301), whole, 1e-13)
    assert slopes or whole.clamped.any()


@pytest.mark.parametrize("gap", GAPS)
@pytest.mark.parametrize("kind", [Constant, Tilted, Curved])
def test_columns_of_designs(kind, gap):
    arrays = numbers(kind, 5, gap, columns=3)
    owner = np.array([0, 0, 1, 2, 2, 2])
    energies = np.linspace(0.05, 0.5, 6)
    together = kind(*arrays)(energies, True, owner)
    for column in range(3):
        mine = owner == column
        alone = kind(*(v[..., column : column + 1] for v in arrays))(energies[mine], True)
        same(alone, type(alone)(*(v[..., mine] for v in together[:3])))


def test_joined_puts_kinds_where_they_belong():
    energies = np.linspace(0.0, 0.2, 4)
    flat, tilted = (kind(*numbers(kind, 3, 0.0))(energies, True) for kind in (Constant, Tilted))
    mixed = joined([(np.array([0, 2, 5]), flat), (np.array([1, 3, 4]), tilted)], 6)
    same(flat, mixed.rows(np.array([0, 2, 5])), 0.0)
    same(tilted, mixed.rows(np.array([1, 3, 4])), 0.0)


def test_count_is_that_of_the_eigenvalues():
    rng = np.random.default_rng(2)
    for rows, columns in ((1, 5), (2, 40), (70, 9), (600, 3), (600, 45)):
        diagonal = rng.normal(-1.0, 1.0, (rows, columns))
        off = rng.normal(size=(rows - 1, columns)) * 0.5
        clamped = rng.integers(0, 3, columns)
        counts, pivots = count_and_pivot(Matrix(diagonal, off, clamped))
        for j in range(min(columns, 6)):
            full = np.diag(diagonal[:, j]) + np.diag(off[:, j], 1) + np.diag(off[:, j], -1)
            assert counts[j] == clamped[j] + (np.linalg.eigvalsh(full) < 0.0).sum()
            assert 1.0 / pivots[j] == pytest.approx(np.linalg.inv(full)[-1, -1], rel=1e-6)


@pytest.mark.parametrize("kind", [Constant, Tilted])
def test_count_far_above_what_slices_were_cut_for(kind):
    """Slices of many half waves, against the same ones cut in sixteen."""
    thickness, edge, mass, inverse_gap, drop = numbers(kind, 6, 0.0)
    energies = np.linspace(1.0, 300.0, 57)
    short = np.repeat(thickness / 16.0, 16, axis=0)
    part = (np.arange(16) + 0.5) / 16.0 - 0.5
    fine = (edge[:, None] + part[:, None] * drop[:, None]).reshape(-1, 1)
    mass = np.repeat(mass, 16, axis=0)
    coarse = kind(thickness, edge, mass[::16], inverse_gap, drop)(energies, False)
    cut = kind(short, fine, mass, 0.0 * mass, np.repeat(drop / 16.0, 16, axis=0))(energies, False)
    assert coarse.clamped.max() > 1
    found, expected = (count_and_pivot(assemble(v, None, None))[0] for v in (coarse, cut))
    np.testing.assert_array_equal(found, expected)
