"""K(E) of one sliced profile with its ends: counts, and many shifted solves at once."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.linalg.lapack import dgtsv

from bandwright.constants import H2M
from bandwright.profile import Section
from bandwright.solver.matrix import Counts, Matrix, assemble, count_below
from bandwright.solver.propagation import local_mass
from bandwright.solver.slices import Slices

Floats = npt.NDArray[np.float64]


@dataclass(frozen=True)
class System:
    """One sliced profile between two ends, each ``"open"`` or ``"wall"``."""

    slices: Slices
    ends: tuple[str, str]

    def halved(self) -> System:
        """Return the same system on slices half as thick."""
        return System(self.slices.halved(), self.ends)

    def matrix(self, energies: Floats) -> Matrix:
        """Return K at each energy [eV]."""
        first, last = self.outside(energies)
        return assemble(self.slices.elements(energies), _value(first), _value(last))

    def matrix_and_slope(self, energies: Floats) -> tuple[Matrix, Matrix]:
        """Return K and its exact derivative by E at each energy."""
        value, slope = self.slices.elements_and_slopes(energies)
        first, last = self.outside(energies)
        return (
            assemble(value, _value(first), _value(last)),
            assemble(slope, _slope(first), _slope(last)),
        )

    def count(self, energies: npt.ArrayLike) -> Counts:
        """Return the number of levels below each energy."""
        energies = np.atleast_1d(np.asarray(energies, dtype=float))
        total = np.empty(energies.shape, dtype=np.int64)
        for part in chunks(len(energies), len(self.slices.thickness)):
            total[part] = count_below(self.matrix(energies[part]))
        return total

    def outside(self, energies: Floats) -> tuple[Outside, Outside]:
        """Return kappa/m of both open ends with its slope and kappa; None at a wall."""
        sections = self.slices.profile.sections
        return (
            _outside(self.ends[0], sections[0], 0.0, energies),
            _outside(self.ends[1], sections[-1], sections[-1].thickness, energies),
        )

    def full(self, nodes: Floats) -> Floats:
        """Return u at every face from u at the free faces (zero at walls)."""
        pad = [(int(self.ends[0] == "wall"), int(self.ends[1] == "wall")), (0, 0)]
        return np.pad(nodes, pad)


Outside = tuple[Floats, Floats, Floats] | None


def _value(outside: Outside) -> Floats | None:
    return None if outside is None else outside[0]


def _slope(outside: Outside) -> Floats | None:
    return None if outside is None else outside[1]


def _outside(end: str, section: Section, depth: float, energies: Floats) -> Outside:
    """kappa/m(E), its derivative by E, and kappa, of an outer layer that never ends."""
    if end == "wall":
        return None
    place = np.array([depth])
    edge, mass, gap = (c.at(place)[0] for c in (section.edge, section.mass, section.inverse_gap))
    local, b = local_mass(energies, edge, mass, gap)
    below = np.maximum(edge - energies, 0.0)
    kappa = np.sqrt(local * below / H2M)
    over = kappa / local
    safe = np.maximum(kappa, 1e-150)
    slope = (b * below - local) / (2.0 * H2M * safe * local) - over * b / local
    return over, np.where(below > 0, slope, 0.0), kappa


def chunks(columns: int, rows: int, cells: int = 2_000_000) -> list[slice]:
    """Return column ranges that keep each array of ``rows`` under ``cells`` numbers."""
    width = max(1, cells // max(rows, 1))
    return [slice(i, min(i + width, columns)) for i in range(0, columns, width)]


def solve_shifted(matrix: Matrix, right: Floats) -> Floats:
    """Solve K(E_j) z_j = r_j for every energy at once, shapes (n_nodes, n_energies).

    All energies stand as one block-diagonal tridiagonal matrix, one LAPACK call.
    """
    n, m = matrix.diagonal.shape
    joint = np.zeros((m, n))
    joint[:, : n - 1] = matrix.off.T
    between = joint.reshape(-1)[:-1]
    diagonal = matrix.diagonal.T.reshape(-1)
    _, _, _, z, info = dgtsv(between, diagonal, between, right.T.reshape(-1, 1))
    if info > 0:  # an exact singularity: the next float is as good a shift
        nudged = Matrix(np.nextafter(matrix.diagonal, np.inf), matrix.off, matrix.clamped)
        return solve_shifted(nudged, right)
    return np.ascontiguousarray(np.asarray(z).reshape(m, n).T)


def apply(matrix: Matrix, z: Floats) -> Floats:
    """Return the product of each column's tridiagonal matrix with its vector."""
    result = matrix.diagonal * z
    result[:-1] += matrix.off * z[1:]
    result[1:] += matrix.off * z[:-1]
    return result
