"""Shifted solves of K(E): one LAPACK call for all energies, also where K is singular."""

import numpy as np
import pytest

from bandwright.solver.matrix import Matrix
from bandwright.solver.system import Joint, dot


def test_solves_every_energy_by_itself():
    rng = np.random.default_rng(3)
    matrix = Matrix(rng.uniform(3.0, 4.0, (5, 4)), rng.uniform(-1.0, 1.0, (4, 4)), None)
    right = rng.uniform(-1.0, 1.0, (4, 5))
    found = Joint.of(matrix).solve(right)
    assert Joint.of(matrix).apply(found) == pytest.approx(right, abs=1e-13)
    for energy in range(4):
        off = np.diag(matrix.off[:, energy], 1)
        whole = np.diag(matrix.diagonal[:, energy]) + off + off.T
        assert whole @ found[energy] == pytest.approx(right[energy], abs=1e-13)


def test_an_exactly_singular_matrix_gives_its_null_vector_not_nan():
    """K of a well cut in four, at its second level: each slice a quarter wave, cot = 0."""
    diagonal = np.array([[0.0, 2.0], [0.0, 2.0], [0.0, 2.0]])
    joint = Joint.of(Matrix(diagonal, -np.ones((2, 2)), None))
    z = joint.solve(np.array([[1.0, 0.5, -0.7], [1.0, 1.0, 1.0]]))
    assert np.isfinite(z).all()
    assert np.abs(z[0]).max() > 1e12
    assert z[0] / z[0, 0] == pytest.approx([1.0, 0.0, -1.0], abs=1e-12)
    assert joint.apply(z)[1] == pytest.approx(np.ones(3), abs=1e-12)


@pytest.mark.parametrize("diagonal", [2.0, 0.0])
def test_one_face_and_one_energy(diagonal):
    joint = Joint.of(Matrix(np.array([[diagonal]]), np.zeros((0, 1)), None))
    z = joint.solve(np.array([[3.0]]))
    assert np.isfinite(z).all()
    assert z[0, 0] == (1.5 if diagonal else pytest.approx(3e300))
    assert dot(z / z, joint.apply(z / z)) == [diagonal]
