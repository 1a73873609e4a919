"""Levels by Newton: start vectors, few evaluations, and energies held to rounding."""

import numpy as np
import pytest

import bandwright as bw
from bandwright.profile.build import build_profile
from bandwright.solver import solve_profile
from bandwright.solver.find import bracketed, refine
from bandwright.solver.solve import asked_of
from bandwright.solver.system import System

COUPLED = (
    "20 nm {edge 250 meV, mass 0.092}, 7.3 nm {edge 0 meV, mass 0.067},"
    " 1.7 nm {edge 250 meV, mass 0.092}, 4.6 nm {edge 0 meV, mass 0.067},"
    " 20 nm {edge 250 meV, mass 0.092}"
)


class Counting:
    """A system that counts how often K and its derivative are evaluated."""

    def __init__(self, system):
        self.system, self.evaluations = system, 0

    def __getattr__(self, name):
        return getattr(self.system, name)

    def matrix_and_slope(self, energies, owner=None):
        self.evaluations += 1
        return self.system.matrix_and_slope(energies, owner)


@pytest.fixture
def solution():
    profile = build_profile(bw.parse_line(COUPLED))
    return solve_profile(profile, high=0.24, tolerance=1e-9)


@pytest.fixture
def asked(solution):
    return asked_of(solution.system.slices, solution.low, 0.24, 0, None)


def test_well_bracketed_levels_take_two_evaluations(solution, asked):
    system = Counting(solution.system)
    found = refine(system, bracketed(system, asked), 1e-9)
    assert system.evaluations == 2
    assert len(found.energies) == 3
    assert found.single.all()
    # the second step is a cubic's: what is left is far below what was asked
    assert found.energies == pytest.approx(solution.energies, abs=1e-13)


def test_known_energies_and_vectors_take_one(solution, asked):
    system = Counting(solution.system)
    brackets = bracketed(system, asked)._replace(
        energies=solution.energies + 1e-7, nodes=solution.found.nodes
    )
    found = refine(system, brackets, 1e-9)
    assert system.evaluations == 1
    assert found.energies == pytest.approx(solution.energies, abs=1e-12)


def test_a_neighbours_vector_leads_to_no_wrong_level(solution, asked):
    system: System = solution.system
    nodes = np.roll(solution.found.nodes, 1, axis=1)
    found = refine(system, bracketed(system, asked)._replace(nodes=nodes), 1e-9)
    assert found.energies == pytest.approx(solution.energies, abs=1e-10)
    assert np.array_equal(found.numbers, [0, 1, 2])
