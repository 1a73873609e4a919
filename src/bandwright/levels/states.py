"""States of all parts of a spectrum as one set."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from ..solver import States
from ..solver.states import cross_moment

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class AllStates:
    """Normalised states of bound levels (open ends) and of a closed box, in this order.

    Across the two sets matrix elements are taken inside the structure, about the mean of both
    states' positions, since states of different ends are only nearly orthogonal.
    """

    sets: tuple[States, ...]

    def sample(self, z: npt.ArrayLike) -> tuple[Floats, Floats]:
        """Return u [nm^-1/2] and p = u'/m [nm^-3/2] at positions z [nm], (n_levels, n_points)."""
        z = np.atleast_1d(np.asarray(z, dtype=float))
        found = [s.sample(z) for s in self.sets]
        if not found:
            return np.zeros((0, len(z))), np.zeros((0, len(z)))
        return np.concatenate([u for u, _ in found]), np.concatenate([p for _, p in found])

    @cached_property
    def dipoles(self) -> Floats:
        """Matrix elements of z [nm], (n_levels, n_levels); positions on the diagonal."""
        blocks = [
            [
                a.dipoles if a is b else cross_moment(a, b) if i < j else cross_moment(b, a).T
                for j, b in enumerate(self.sets)
            ]
            for i, a in enumerate(self.sets)
        ]
        return np.block(blocks) if blocks else np.zeros((0, 0))

    def _joined(self, name: str) -> Floats:
        parts = [getattr(s, name) for s in self.sets]
        return np.concatenate(parts) if parts else np.zeros(0)

    @property
    def positions(self) -> Floats:
        """Mean position of each level [nm], (n_levels,)."""
        return self._joined("positions")

    @property
    def squares(self) -> Floats:
        """Mean square of the position of each level [nm^2], (n_levels,)."""
        return self._joined("squares")

    @property
    def probabilities(self) -> Floats:
        """Probability in each section, tails with the outer ones, (n_levels, n_sections)."""
        return self._joined("probabilities")

    @property
    def clamped(self) -> Floats:
        """Probability where the two-band mass stands at its floor, (n_levels,)."""
        return self._joined("clamped")

    @property
    def wall_shifts(self) -> Floats:
        """dE/dwall of the more sensitive wall [eV/nm], (n_levels,)."""
        return self._joined("wall_shifts")
