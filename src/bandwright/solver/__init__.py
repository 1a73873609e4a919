"""Exact levels by two-sided shooting on one tridiagonal matrix, certified by counts."""

from .solve import Solution, lowest_edge, solve_profile
from .states import States

__all__ = ["Solution", "States", "lowest_edge", "solve_profile"]
