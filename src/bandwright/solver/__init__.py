"""Exact levels by two-sided shooting on one tridiagonal matrix, certified by counts."""

from bandwright.solver.solve import Solution, lowest_edge, solve_profile
from bandwright.solver.states import States

__all__ = ["Solution", "States", "lowest_edge", "solve_profile"]
