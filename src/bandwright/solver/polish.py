"""States of found levels at the slice faces: sharp vectors, clusters as one subspace."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy.linalg import eigh

from ..constants import H2M
from ..errors import SolveError
from .find import CLUSTER, Found
from .system import Joint, System, chunks, dot

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

_RITZ_STEPS = 60
#: a smaller step [eV] ends at rounding, and so does the vector it is taken with
_ROUNDED = 1e-10


def polish(system: System, found: Found) -> tuple[Floats, Floats]:
    """Return energies [eV] and u at all faces (n_faces, n_levels), normalised.

    Single levels are taken on to rounding. Members of a cluster
    are separated inside their common subspace; only that subspace is certain if their distance
    is not well above the energies' error.
    """
    energies = found.energies.copy()
    nodes = found.nodes.copy()
    cluster = _clusters(energies, CLUSTER)
    size = np.bincount(cluster, minlength=len(energies))[cluster]
    alone = np.flatnonzero((size == 1) & found.single)
    for part in chunks(len(alone), system.nodes):
        some = alone[part]
        energies[some], nodes[:, some] = _sharpen(system, energies[some], nodes[:, some])
    for first in np.unique(cluster[(size > 1) | ~found.single]):
        members = np.flatnonzero(cluster == first)
        room = _room(energies, int(members[0]), int(members[-1]))
        nodes[:, members] = _ritz(system, energies[members], room)
    return energies, system.full(_signed(nodes))


def _sharpen(system: System, energies: Floats, nodes: Floats) -> tuple[Floats, Floats]:
    """Take each level to its own zero of K, then its vector from there."""
    z = nodes.T.copy()
    for _ in range(2):
        matrix, slope = (Joint.of(m) for m in system.matrix_and_slope(energies))
        for _ in range(2):
            r = slope.apply(z / np.abs(z).max(axis=1)[:, None])
            z = matrix.solve(r)
        rate = dot(z, slope.apply(z))
        step = dot(z, r) / -rate
        energies = energies + step
        if np.abs(step).max(initial=0.0) < _ROUNDED:
            break
    return energies, (z / np.sqrt(-H2M * rate)[:, None]).T


def _signed(z: Floats) -> Floats:
    """Give each vector the sign that makes its first sizeable lobe positive."""
    if not z.size:
        return z
    large = np.abs(z) > 0.3 * np.max(np.abs(z), axis=0)
    first = np.argmax(large, axis=0)
    return np.asarray(z * np.sign(z[first, np.arange(z.shape[1])]))


def _clusters(energies: Floats, width: float) -> Indices:
    """Return the first member's number of each level's cluster, neighbours within ``width``."""
    starts = np.concatenate(([True], np.diff(energies) > width))
    return np.asarray(np.flatnonzero(starts)[np.cumsum(starts) - 1], dtype=np.int64)


def _room(energies: Floats, first: int, last: int) -> float:
    """Return how far the nearest level outside first..last is; at least `CLUSTER`."""
    below = energies[first] - energies[first - 1] if first else 1e-6
    above = energies[last + 1] - energies[last] if last + 1 < len(energies) else 1e-6
    return float(max(CLUSTER, min(below, above)))


def _ritz(system: System, energies: Floats, room: float) -> Floats:
    """Separate a cluster: block inverse iterations with -K' as mass, then a small eigenproblem.

    ``room`` is the distance to the nearest level outside the cluster [eV]. The shift stands off
    the middle of the cluster, nearer to every member than to any other level.
    """
    size = len(energies)
    spread = float(energies[-1] - energies[0])
    shift = float(energies[0]) + 0.43 * spread - min(1e-11, 0.05 * room)
    matrix, slope = (
        Joint.of(m).repeated(size) for m in system.matrix_and_slope(np.array([shift]))
    )
    z = np.random.default_rng(11).uniform(-1.0, 1.0, (size, system.nodes))
    before = np.full(size, np.inf)
    mu = np.zeros(size)
    for _ in range(_RITZ_STEPS):
        z = matrix.solve(-slope.apply(z))
        z = _orthonormal(z, -slope.apply(z))
        small = z @ matrix.apply(z).T
        mass = -(z @ slope.apply(z).T)
        mu, mix = eigh(0.5 * (small + small.T), 0.5 * (mass + mass.T))
        z = mix.T @ z
        if np.max(np.abs(mu - before)) < 1e-16 + 1e-3 * spread:
            break
        before = mu
    if np.max(np.abs(shift + mu - energies)) > 1e-11:
        raise SolveError(
            f"{size} levels near {energies[0]:.9f} eV could not be told apart from each other and"
            " from their neighbours"
        )
    return np.asarray(z.T / np.sqrt(H2M))


def _orthonormal(z: Floats, mz: Floats) -> Floats:
    """Orthonormalise rows in the product z.Mz."""
    gram = z @ mz.T
    scale = 1.0 / np.sqrt(np.diag(gram))
    gram = gram * scale[:, None] * scale
    values, vectors = eigh(0.5 * (gram + gram.T))
    values = np.maximum(values, 1e-14)
    return np.asarray((vectors / np.sqrt(values)).T @ (z * scale[:, None]))
