"""An independent discretisation of the same equation, to check the solver against.

Spectral elements (`physics.elements`) for the weak form

    integral of  h2m u' v' / m(E, z) + (V - E) u v  =  0 ,     m(E, z) = m max(1 + (E - V)/Eg, 0.05)

so that levels are the energies at which the symmetric matrix T(E) is singular. All levels below
an energy are counted by the eigenvalues of the dense T (no pivots of faces, no march), start from
dense eigenproblems with the mass frozen at a few energies, and are polished by small Ritz
problems whose quadratic forms are sums over the Gauss points, which keeps 14 digits. Only
`Profile`, the plain data, is shared with the solver.

`mixed_levels` is a second, slower form for small structures: u and p = psi'/m both discretised,
which is linear in E for the two-band mass.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.polynomial import legendre
from scipy.linalg import cholesky, eigh, eigvalsh, solve_banded, solve_triangular

from bandwright.constants import H2M
from bandwright.profile import Profile
from physics.elements import FLOOR, Mesh, basis, bottoms, clamp_cuts, curves, mass_at, split


class NotSure(RuntimeError):
    """The reference could not certify its own levels; never a verdict on the solver."""


def count(profile, energy, mesh=None):
    """Number of levels below an energy: negative eigenvalues of the dense matrix."""
    mesh = mesh or Mesh(profile, energy, clamp_cuts(profile, energy))
    stiff, _, ends = mesh.pieces(energy)
    return int((eigvalsh(mesh.full(stiff, ends, 0)) < 0).sum())


@dataclass
class Dense:
    """Levels of a profile below ``high``: energies [eV] and states at Gauss points."""

    profile: Profile
    energies: np.ndarray
    mesh: Mesh
    vectors: np.ndarray
    clamped: np.ndarray = field(default_factory=lambda: np.zeros(0, dtype=bool))

    def products(self, moment=0):
        """<i|j> (moment 0) or z_ij (moment 1) with the two-band product, normalised.

        b = dm/dE of a pair is zero where either state's mass is clamped.
        """
        z, weight, edge, mass, inverse = self.mesh.points()
        u, du = self.mesh.fields(self.vectors)
        p = np.empty_like(du)
        for i, energy in enumerate(self.energies):
            m, b = mass_at(energy, edge, mass, inverse)
            p[i] = np.sqrt(H2M * b) * du[i] / m
        lever = weight * (z if moment else 1.0)
        out = (u * lever) @ u.T + (p * lever) @ p.T
        norm = ((u**2 + p**2) * weight).sum(axis=1)
        faces = zip(self.mesh.end_curves, (0, -1), (-1, 1), (0.0, self.mesh.length), strict=True)
        for face, node, side, place in faces:
            if face is None:
                continue
            m, b = mass_at(self.energies, face[0], face[1], face[2])
            kappa = np.sqrt(m * (face[0] - self.energies) / H2M)
            q = np.sqrt(H2M * b) * kappa / m
            amplitude = np.outer(self.vectors[node], self.vectors[node])
            amplitude = amplitude * (1 + np.outer(q, q))
            reach = kappa[:, None] + kappa[None, :]
            norm += np.diag(amplitude / reach)
            out += amplitude * ((place / reach + side / reach**2) if moment else 1 / reach)
        return out / np.sqrt(np.outer(norm, norm))

    def dipoles(self):
        """z_ij [nm], shape (n, n)."""
        return self.products(moment=1)

    def sample(self, z):
        """Normalised u at positions z [nm] inside the profile, shape (n_levels, len(z))."""
        out = np.empty((len(self.energies), len(z)))
        for i, energy in enumerate(self.energies):
            vector = self.vectors[:, i : i + 1]
            out[i] = self.mesh.sample(vector, z)[0]
            out[i] /= np.sqrt(self.mesh.forms(energy, vector)[1][0, 0])
        return out


def levels(profile, high, low=None):
    """Return every level of a profile between low and high [eV]; raises NotSure, never guesses."""
    mesh = Mesh(profile, high)
    stiff, weight, ends = mesh.pieces(high)
    total = int((eigvalsh(mesh.full(stiff, ends, 0)) < 0).sum())
    two_band = any(np.any(g.inverse) for g in mesh.groups)
    nodes = ([0.6, *np.linspace(0.05, 1, 12)] if two_band else [0.9]) if total else []
    bottom = min(float(g.edge.min()) for g in mesh.groups)
    for attempt in range(3):
        at = [bottom + f * (high - bottom) for f in nodes]
        energies, vectors = _start(mesh, at, total, every=attempt > 0)
        energies, vectors = _polish(mesh, energies, vectors)
        found = Dense(profile, energies, mesh, vectors)
        if _certified(found, high, total):
            break
        nodes = list(np.linspace(0.05, 1.0, 8 + 12 * attempt))
    else:
        raise NotSure(f"found {found.energies} below {high} eV, count {total}")
    found = _clamped(found, high)
    if low is not None:
        keep = found.energies > low
        found = Dense(profile, found.energies[keep], found.mesh, found.vectors[:, keep])
    return found


def _start(mesh, nodes, total, every):
    """Levels and vectors from the mass frozen at each node; each level from its nearest node.

    Only the first node's problem is solved in the whole space, the others' in the span of its
    lowest vectors, unless ``every``.
    """
    energies, vectors = np.full(total, np.inf), np.zeros((mesh.size, total))
    away = np.full(total, np.inf)
    span = None
    for node in nodes:
        if span is None or every:
            mu, x = _frozen(mesh, node, min(mesh.size, 2 * total + 40))
            span = x if span is None else span
        else:
            mu, y = eigh(*mesh.forms(node, span, frozen=True))
            x = span @ y
        mu, x = mu[:total], x[:, :total]
        better = np.flatnonzero(np.abs(mu) < away)
        away[better], energies[better] = np.abs(mu[better]), node + mu[better]
        vectors[:, better] = x[:, better]
    if len(nodes) > 1:
        energies = np.array([_rayleigh(mesh, e, vectors[:, [i]]) for i, e in enumerate(energies)])
    return energies, vectors


def _frozen(mesh, node, most):
    """Lowest eigenpairs of T(node) x = mu M x, the mass frozen at the node."""
    stiff, norm, ends = mesh.pieces(node, frozen=True)
    lower = cholesky(mesh.full(norm, ends, 1), lower=True)
    half = solve_triangular(lower, mesh.full(stiff, ends, 0), lower=True)
    standard = solve_triangular(lower, half.T, lower=True)
    mu, y = eigh(0.5 * (standard + standard.T), subset_by_index=[0, most - 1])
    return mu, solve_triangular(lower, y, lower=True, trans="T")


def _clusters(energies, width):
    if not len(energies):
        return []
    parts = np.flatnonzero(np.diff(energies) > width) + 1
    return np.split(np.arange(len(energies)), parts)


def _polish(mesh, energies, vectors):
    """Refine clusters together by block inverse iteration and a Ritz problem."""
    energies, vectors = energies.copy(), vectors.copy()
    for width in (3e-3, 1e-4, 1e-6, 1e-8, 1e-8):
        order = np.argsort(energies, kind="stable")
        energies, vectors = energies[order], vectors[:, order]
        for part in _clusters(energies, width):
            energies[part], vectors[:, part] = _ritz(mesh, energies[part], vectors[:, part])
    return energies, vectors


def _ritz(mesh, energies, block):
    shift = min(float(energies.mean()), mesh.top)
    stiff, weight, ends = mesh.pieces(shift)
    band = mesh.band
    right = _times(mesh, mesh.banded(weight, ends, 1), block)
    image = solve_banded((band, band), mesh.banded(stiff, ends, 0), right)
    image /= np.sqrt((image**2).sum(axis=0))
    if image.shape[1] > 1:
        image = np.linalg.qr(image)[0]
    a, b = mesh.forms(shift, image)
    mu, y = eigh(a, b)
    block = image @ y
    energies = shift + mu
    if len(energies) > 1 and energies[-1] - energies[0] > 1e-7:
        energies = np.array([_rayleigh(mesh, e, block[:, [i]]) for i, e in enumerate(energies)])
    return energies, block


def _rayleigh(mesh, energy, vector):
    """Root of x'T(E)x."""
    for _ in range(4):
        a, b = mesh.forms(min(energy, mesh.top), vector)
        energy = min(energy, mesh.top) + float(a[0, 0] / b[0, 0])
    return energy


def _times(mesh, banded, block):
    w, n = mesh.band, mesh.size
    out = np.zeros_like(block)
    for k in range(-w, w + 1):  # entry (i, i - k) sits in row w + k, column i - k
        lo, hi = max(0, k), min(n, n + k)
        if hi > lo:
            out[lo:hi] += banded[w + k, lo - k : hi - k, None] * block[lo - k : hi - k]
    return out


def _certified(found, high, total):
    """All below high, as many as counted, orthonormal (so none twice), residuals tiny."""
    if len(found.energies) != total or (total and found.energies[-1] >= high):
        return False
    if not total:
        return True
    product = found.products()
    edge, inverse = (
        np.concatenate([getattr(g, k).ravel() for g in found.mesh.groups])
        for k in ("edge", "inverse")
    )
    unclamped = np.all(1 + (found.energies[0] - edge) * inverse > FLOOR)
    if np.abs(product - np.eye(total)).max() > (1e-6 if unclamped else 1e-2):
        return False
    moves = [
        abs(_rayleigh(found.mesh, e, found.vectors[:, [i]]) - e)
        for i, e in enumerate(found.energies)
    ]
    return max(moves) < 1e-10


def _clamped(found, high):
    """Where a mass is clamped inside a section, solve that level again with a cut there."""
    profile = found.profile
    flags = np.zeros(len(found.energies), dtype=bool)
    energies = found.energies.copy()
    for i, energy in enumerate(found.energies):
        cuts = clamp_cuts(profile, energy)
        if not any(cuts):
            continue
        flags[i] = True
        for _ in range(2):
            mesh = Mesh(profile, high, clamp_cuts(profile, energies[i]))
            z, weight, *_ = mesh.points()
            u = found.mesh.sample(found.vectors[:, [i]], z)[0]
            vector = _project(mesh, u * weight)
            for _ in range(2):
                new, vector = _ritz(mesh, np.array([energies[i]]), vector)
                energies[i] = new[0]
        if abs(energies[i] - energy) > 1e-6:
            raise NotSure(f"level {i} moved by {energies[i] - energy} eV with the clamp's cut")
    return Dense(profile, energies, found.mesh, found.vectors, flags)


def _project(mesh, load):
    """Solve for a start vector whose moments are given: (stiffness + norm) x = load."""
    out = np.zeros(mesh.size + 1)
    done = 0
    for g in mesh.groups:
        piece = load[done : done + g.z.size].reshape(g.z.shape)
        np.add.at(out, g.dofs, piece @ g.value)
        done += g.z.size
    _, weight, ends = mesh.pieces(max(float(g.edge.min()) for g in mesh.groups) - 1.0)
    band = mesh.band
    return solve_banded((band, band), mesh.banded(weight, ends, 1), out[:-1])[:, None]


def mixed_levels(profile, high, degree=14):
    """Levels between walls from u and p both discretised, linear in E (no clamped layer).

    With p free of continuity, ``h2m (u', p) - ... = E (u, v)`` and ``(u' - a p, q) = E (b p, q)``
    with m(E) = a + E b make one symmetric-definite pencil, if b > 0 everywhere.
    """
    if profile.ends != ("wall", "wall"):
        raise ValueError("mixed_levels needs walls")
    x, w, value, slope = basis(degree, degree + 9)
    tests = legendre.legvander(x, degree - 1)
    pieces, z0 = [], 0.0
    for section, lowest in zip(profile.sections, bottoms(profile), strict=True):
        for a, b, _ in split(section, high, lowest, ()):
            pieces.append((section, a, b))
    n_u, n_p = degree * len(pieces) - 1, degree * len(pieces)
    left = np.zeros((n_u + n_p, n_u + n_p))
    right = np.zeros_like(left)
    for i, (section, a, b) in enumerate(pieces):
        h = b - a
        edge, mass, inverse = curves(section, 0.5 * (a + b) + 0.5 * h * x)
        weight, steep = 0.5 * h * w, mass * inverse
        rows = np.arange(i * degree - 1, (i + 1) * degree)
        if i == len(pieces) - 1:
            rows[-1] = -1
        keep = rows >= 0
        us, ps = rows[keep], n_u + np.arange(i * degree, (i + 1) * degree)
        v, d = value[:, keep], slope[:, keep] * 2 / h
        left[np.ix_(us, us)] += (v.T * (weight * edge)) @ v
        right[np.ix_(us, us)] += (v.T * weight) @ v
        left[np.ix_(ps, us)] += H2M * (tests.T * weight) @ d
        left[np.ix_(us, ps)] += H2M * (d.T * weight) @ tests
        left[np.ix_(ps, ps)] -= H2M * (tests.T * (weight * (mass - steep * edge))) @ tests
        right[np.ix_(ps, ps)] += H2M * (tests.T * (weight * steep)) @ tests
        z0 += h
    lowest = max(
        float(np.max(edge - (1 - FLOOR) / inverse))
        for edge, _, inverse in (
            curves(s, np.linspace(0, s.thickness, 33)) for s in profile.sections
        )
    )
    found = eigh(left, right, eigvals_only=True)
    return found[(found > lowest) & (found < high)]
