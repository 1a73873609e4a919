"""K(E) of one sliced profile with its ends: counts, and many shifted solves at once."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.linalg.lapack import dgtsv

from ..constants import H2M
from ..profile import Profile
from .matrix import Counts, Matrix, assemble, count_and_pivot
from .propagation import local_mass
from .slices import Slices

Floats = npt.NDArray[np.float64]


class OpenEnd(NamedTuple):
    """An outer layer that never ends: edge [eV], mass, inverse gap [1/eV] of its outer face.

    Floats, or arrays with one design's numbers for each energy.
    """

    edge: float | Floats
    mass: float | Floats
    inverse_gap: float | Floats

    def decay(self, energies: Floats) -> tuple[Floats, Floats]:
        """Return kappa [1/nm] and the mass m(E), below the edge (kappa = 0 above it)."""
        local = np.broadcast_to(self._mass(energies)[0], energies.shape)
        return np.sqrt(local * np.maximum(self.edge - energies, 0.0) / H2M), local

    def value(self, energies: Floats) -> Floats:
        """Return kappa/m, which the end adds to K."""
        rate = np.maximum(self.edge - energies, 0.0)
        rate /= H2M * self._mass(energies)[0]
        return np.sqrt(rate)

    def value_and_slope(self, energies: Floats) -> Floats:
        """Return kappa/m and its derivative by E (huge at the edge itself), (2, n_energies)."""
        local, b = self._mass(energies)
        below = np.maximum(self.edge - energies, 1e-60)
        pair = np.empty((2, len(energies)))
        np.sqrt(below / (H2M * local), out=pair[0])
        np.multiply(-0.5 * pair[0], 1.0 / below + b / local, out=pair[1])
        return pair

    def _mass(self, energies: Floats) -> tuple[Floats | float, Floats | float]:
        if isinstance(self.inverse_gap, float) and self.inverse_gap == 0.0:
            return self.mass, 0.0
        return local_mass(
            energies, np.asarray(self.edge), np.asarray(self.mass), np.asarray(self.inverse_gap)
        )


@dataclass(frozen=True)
class System:
    """One sliced profile between two ends, each ``"open"`` or ``"wall"``.

    ``outside`` is what lies beyond them; None is a wall.
    """

    slices: Slices
    ends: tuple[str, str]
    outside: tuple[OpenEnd | None, OpenEnd | None]

    @classmethod
    def of(cls, slices: Slices, ends: tuple[str, str]) -> System:
        """Return the system of slices between these ends."""
        return cls(slices, ends, open_ends(slices.profile, ends))

    def halved(self) -> System:
        """Return the same system on slices half as thick."""
        return System(self.slices.halved(), self.ends, self.outside)

    @property
    def nodes(self) -> int:
        """Number of free faces."""
        return len(self.slices) + 1 - self.ends.count("wall")

    @property
    def rows(self) -> int:
        """Number of slices."""
        return len(self.slices)

    def matrix(self, energies: Floats, owner: object = None) -> Matrix:
        """Return K at each energy [eV]."""
        first, last = self.outside
        return assemble(
            self.slices.elements(energies),
            None if first is None else first.value(energies),
            None if last is None else last.value(energies),
        )

    def matrix_and_slope(self, energies: Floats, owner: object = None) -> tuple[Matrix, Matrix]:
        """Return K and its exact derivative by E at each energy."""
        first, last = self.outside
        return assemble(
            self.slices.elements_and_slopes(energies),
            None if first is None else first.value_and_slope(energies),
            None if last is None else last.value_and_slope(energies),
        ).split()

    def count(self, energies: npt.ArrayLike) -> Counts:
        """Return the number of levels below each energy."""
        return self.count_and_pivot(np.asarray(energies, dtype=float))[0]

    def count_and_pivot(self, energies: Floats, owner: object = None) -> tuple[Counts, Floats]:
        """Return the number of levels below each energy, and the last pivot of K there."""
        parts = chunks(len(energies), len(self.slices))
        if len(parts) == 1:
            return count_and_pivot(self.matrix(energies))
        found = [count_and_pivot(self.matrix(energies[part])) for part in parts]
        return np.concatenate([c for c, _ in found]), np.concatenate([p for _, p in found])

    def full(self, nodes: Floats) -> Floats:
        """Return u at every face from u at the free faces (zero at walls)."""
        pad = [(int(self.ends[0] == "wall"), int(self.ends[1] == "wall")), (0, 0)]
        return np.pad(nodes, pad)


def open_ends(profile: Profile, ends: tuple[str, str]) -> tuple[OpenEnd | None, OpenEnd | None]:
    """Return what lies beyond both ends of a profile; None is a wall."""
    first, last = (
        OpenEnd(*(c.value(depth) for c in (section.edge, section.mass, section.inverse_gap)))
        if end == "open"
        else None
        for end, section, depth in (
            (ends[0], profile.sections[0], 0.0),
            (ends[1], profile.sections[-1], profile.sections[-1].thickness),
        )
    )
    return first, last


def chunks(columns: int, rows: int) -> list[slice]:
    """Return column ranges that keep each array of ``rows`` small.

    About 60,000 numbers stay in the cache; many rows take up to 100 columns all the same, which a
    march from row to row needs to be worth its calls, and at most a million numbers.
    """
    rows = max(rows, 1)
    width = max(60_000 // rows, min(100, 1_000_000 // rows), 1)
    return [slice(i, min(i + width, columns)) for i in range(0, columns, width)]


class Joint(NamedTuple):
    """The matrices of all energies as one, block beside block: rows are energies.

    ``diagonal`` and ``off`` (n_energies, n_nodes), the last column of ``off`` zero.
    """

    diagonal: Floats
    off: Floats

    @classmethod
    def of(cls, matrix: Matrix) -> Joint:
        """Return the matrices of all energies as one."""
        diagonal = matrix.diagonal.T.copy()
        off = np.zeros_like(diagonal)
        off[:, :-1] = matrix.off.T
        return cls(diagonal, off)

    def rows(self, which: npt.NDArray[np.bool_]) -> Joint:
        """Return the matrices of these energies."""
        return Joint(self.diagonal[which], self.off[which])

    def repeated(self, times: int) -> Joint:
        """Return one energy's matrix as often."""
        return Joint(self.diagonal.repeat(times, axis=0), self.off.repeat(times, axis=0))

    def solve(self, right: Floats) -> Floats:
        """Return the solutions of K(E_j) z_j = r_j, one row an energy, by one LAPACK call."""
        size = self.diagonal.size
        if size == 1:
            return np.asarray(right / np.where(self.diagonal == 0.0, 1e-300, self.diagonal))
        off = self.off.reshape(-1)[: size - 1]
        z, info = dgtsv(off, self.diagonal.reshape(-1), off, right.reshape(-1))[3:]
        if info > 0:  # an exact singularity: a shift by the rounding of K is as good
            scale = np.abs(self.diagonal).max(axis=1) + np.abs(self.off).max(axis=1)
            return Joint(self.diagonal + np.spacing(scale)[:, None], self.off).solve(right)
        return np.asarray(z.reshape(right.shape))

    def apply(self, z: Floats) -> Floats:
        """Return the product of each energy's matrix with its row."""
        result = np.multiply(self.diagonal, z, order="C")
        flat, given, off = result.reshape(-1), z.reshape(-1), self.off.reshape(-1)[:-1]
        flat[:-1] += off * given[1:]
        flat[1:] += off * given[:-1]
        return result


def apply(matrix: Matrix, z: Floats) -> Floats:
    """Return the product of each column's tridiagonal matrix with its vector."""
    result = matrix.diagonal * z
    result[:-1] += matrix.off * z[1:]
    result[1:] += matrix.off * z[:-1]
    return result


def dot(one: Floats, two: Floats) -> Floats:
    """Return the product of each row with the other's."""
    return np.asarray(np.add.reduce(one * two, axis=1))
