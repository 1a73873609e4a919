"""Spectral elements for `physics.dense`: basis, mesh and the matrix T(E) of the weak form.

Integrated Legendre polynomials at Gauss points; elements are cut until each holds little phase
and its curves are polynomials to 13 digits. Nothing here imports the solver; only `Profile`, the
plain data, is shared.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.polynomial import legendre

from bandwright.constants import H2M
from bandwright.profile import Profile

FLOOR = 0.05  # the two-band bracket never falls below this
LONGEST = 5.0  # phase an element may hold [rad]


def mass_at(energy, edge, mass, inverse_gap):
    """Return m(E) and dm/dE."""
    bracket = 1.0 + (energy - edge) * inverse_gap
    free = bracket > FLOOR
    return mass * np.where(free, bracket, FLOOR), np.where(free, mass * inverse_gap, 0.0)


@lru_cache(maxsize=64)
def gauss(points):
    return legendre.leggauss(points)


def shapes_at(degree, x):
    """Return values and x-derivatives, shape (len(x), degree + 1), of the basis on [-1, 1].

    First and last are the two hats; between them integrated Legendre polynomials, zero at +-1.
    """
    x = np.asarray(x, dtype=float)
    legendres = legendre.legvander(x, degree)
    value = np.empty((len(x), degree + 1))
    slope = np.empty_like(value)
    value[:, 0], value[:, -1] = 0.5 * (1 - x), 0.5 * (1 + x)
    slope[:, 0], slope[:, -1] = -0.5, 0.5
    for k in range(1, degree):
        scale = np.sqrt(k + 0.5)
        value[:, k] = scale * (legendres[:, k + 1] - legendres[:, k - 1]) / (2 * k + 1)
        slope[:, k] = scale * legendres[:, k]
    return value, slope


@lru_cache(maxsize=64)
def basis(degree, points):
    x, w = gauss(points)
    return (x, w, *shapes_at(degree, x))


def curves(section, depth):
    return section.edge.at(depth), section.mass.at(depth), section.inverse_gap.at(depth)


def smooth(section, a, b):
    """Whether edge, mass and gap are polynomials of degree 12 on [a, b] to 13 digits."""
    if max(section.edge.degree, section.mass.degree, section.inverse_gap.degree) <= 3:
        return True
    x, w = gauss(17)
    depth = 0.5 * (a + b) + 0.5 * (b - a) * x
    moments = legendre.legvander(x, 16) * w[:, None]
    for curve in curves(section, depth):
        c = np.abs(moments.T @ curve) * (np.arange(17) + 0.5)
        if c[13:].max() > 3e-13 * max(c.max(), 1e-3):
            return False
    return True


def phase_of(section, a, b, top, bottom):
    """Largest phase (or decay) any level can have across [a, b]."""
    depth = np.linspace(a, b, 9)
    edge, mass, inverse = curves(section, depth)
    heavy, _ = mass_at(np.maximum(top, edge), edge, mass, inverse)
    depth_ev = np.maximum(np.abs(top - edge), edge - bottom)
    return (b - a) * np.sqrt((heavy * depth_ev).max() / H2M)


def bottoms(profile, reach=20.0):
    """Least edge within ``reach`` nm of each section: levels further off have died out there."""
    faces = profile.faces
    least = [float(s.edge.at(np.linspace(0, s.thickness, 33)).min()) for s in profile.sections]
    return [
        min(
            v
            for a, b, v in zip(faces[:-1], faces[1:], least, strict=True)
            if b > left - reach and a < right + reach
        )
        for left, right in zip(faces[:-1], faces[1:], strict=True)
    ]


def degree_for(phase):
    """Least degree whose approximation error (q/4)^(N+1)/(N+1)! is below 1e-8."""
    error, n = 1.0, 0
    while n < 4 or error > 1e-8:
        n += 1
        error *= phase / 4.0 / n
    return n


def split(section, top, bottom, cuts):
    """Return elements (a, b, degree) of a section, cut where it must be resolved."""
    stack = list(zip([0.0, *cuts][::-1], [*cuts, section.thickness][::-1], strict=True))
    done = []
    while stack:
        a, b = stack.pop()
        phase = phase_of(section, a, b, top, bottom)
        if (phase > LONGEST or not smooth(section, a, b)) and b - a > 1e-4:
            middle = 0.5 * (a + b)
            stack += [(middle, b), (a, middle)]
        else:
            extra = 0 if section.flat else 2
            done.append((a, b, degree_for(phase) + extra))
    return done


def clamp_cuts(profile, energy):
    """Depths in each section at which the mass starts to be clamped at this energy."""
    cuts = []
    for section in profile.sections:
        depth = np.linspace(0.0, section.thickness, 65)
        edge, _, inverse = curves(section, depth)
        gap = 1.0 + (energy - edge) * inverse - FLOOR
        here = []
        for i in np.flatnonzero(np.signbit(gap[:-1]) != np.signbit(gap[1:])):
            a, b = depth[i], depth[i + 1]
            for _ in range(60):
                middle = 0.5 * (a + b)
                edge, _, inverse = curves(section, np.array([middle]))
                same = np.signbit(1.0 + (energy - edge[0]) * inverse[0] - FLOOR)
                a, b = (middle, b) if same == np.signbit(gap[i]) else (a, middle)
            if 1e-6 < a < section.thickness - 1e-6:
                here.append(a)
        cuts.append(tuple(here))
    return cuts


@dataclass
class Group:
    """All elements of one degree: curves at their Gauss points, shape (n_elements, n_points)."""

    value: np.ndarray
    slope: np.ndarray
    z: np.ndarray
    weight: np.ndarray
    stretch: np.ndarray
    edge: np.ndarray
    mass: np.ndarray
    inverse: np.ndarray
    dofs: np.ndarray
    left: np.ndarray
    degree: int


class Mesh:
    """Elements, numbering and the matrices T(E), -T'(E) on them."""

    def __init__(self, profile: Profile, top: float, cuts=None):
        self.profile, self.top = profile, top  # iterations never leave E <= top
        rows, z0, lowest = [], 0.0, bottoms(profile)
        for i, section in enumerate(profile.sections):
            for a, b, degree in split(section, top, lowest[i], cuts[i] if cuts else ()):
                rows.append((i, a, b, z0, degree))
            z0 += section.thickness
        self.length = z0
        first = 1 if profile.ends[0] == "wall" else 0
        node = -first
        numbering = []
        for row in rows:
            numbering.append(np.arange(node, node + row[4] + 1))
            node += row[4]
        self.size = node + 1
        if profile.ends[1] == "wall":
            numbering[-1][-1] = -1
            self.size -= 1
        self.band = max(row[4] for row in rows)
        self.groups = [self._group(rows, numbering, d) for d in sorted({r[4] for r in rows})]
        self.end_curves = self._ends()
        self._scatter()

    def _group(self, rows, numbering, degree):
        mine = [i for i, row in enumerate(rows) if row[4] == degree]
        curved = any(not self.profile.sections[rows[i][0]].flat for i in mine)
        x, w, value, slope = basis(degree, degree + (9 if curved else 2))
        data = {k: [] for k in ("z", "weight", "stretch", "edge", "mass", "inverse", "left")}
        for i in mine:
            s, a, b, z0, _ = rows[i]
            depth = 0.5 * (a + b) + 0.5 * (b - a) * x
            edge, mass, inverse = curves(self.profile.sections[s], depth)
            for key, item in zip(
                data,
                (z0 + depth, 0.5 * (b - a) * w, 2.0 / (b - a), edge, mass, inverse, z0 + a),
                strict=True,
            ):
                data[key].append(item)
        arrays = {key: np.array(item) for key, item in data.items()}
        dofs = np.array([numbering[i] for i in mine])
        return Group(value=value, slope=slope, dofs=dofs, degree=degree, **arrays)

    def _ends(self):
        first, last = self.profile.sections[0], self.profile.sections[-1]
        faces = [(first, 0.0), (last, last.thickness)]
        out = []
        for (section, depth), end in zip(faces, self.profile.ends, strict=True):
            if end == "open":
                out.append(tuple(float(c[0]) for c in curves(section, np.array([depth]))))
            elif end == "wall":
                out.append(None)
            else:
                raise NotImplementedError(f"this reference knows no end {end!r}")
        return out

    def _scatter(self):
        rows, cols = [], []
        for g in self.groups:
            n = g.dofs.shape[1]
            rows.append(np.repeat(g.dofs, n, axis=1).ravel())
            cols.append(np.tile(g.dofs, (1, n)).ravel())
        row, col = np.concatenate(rows), np.concatenate(cols)
        self._keep = (row >= 0) & (col >= 0)
        self._row, self._col = row[self._keep], col[self._keep]

    def pieces(self, energy, frozen=False):
        """Element matrices of T and -T' (frozen: m fixed) at an energy; what open ends add."""
        stiff, weight = [], []
        for g in self.groups:
            m, b = mass_at(energy, g.edge, g.mass, g.inverse)
            b = 0.0 * b if frozen else b
            kinetic = H2M * g.weight * g.stretch[:, None] ** 2 / m
            transposed, sloped = g.value.T, g.slope.T
            stiff.append(
                (sloped * kinetic[:, None, :]) @ g.slope
                + (transposed * (g.weight * (g.edge - energy))[:, None, :]) @ g.value
            )
            weight.append(
                (sloped * (kinetic * b / m)[:, None, :]) @ g.slope
                + (transposed * g.weight[:, None, :]) @ g.value
            )
        flat = [np.concatenate([k.ravel() for k in part])[self._keep] for part in (stiff, weight)]
        return flat[0], flat[1], [self.end(energy, e) for e in self.end_curves]

    def end(self, energy, face):
        """What an open end adds: its energy of decay and minus its derivative, the tail's norm."""
        if face is None:
            return None
        edge, mass, inverse = face
        if energy >= edge:
            raise ValueError(f"open end with its edge {edge} eV below the energy {energy} eV")
        m, b = (float(q) for q in mass_at(energy, edge, mass, inverse))
        g = np.sqrt(H2M * (edge - energy) / m)
        return g, H2M / (2 * g) * (1 / m + (edge - energy) * b / m**2)

    def full(self, flat, ends, which):
        matrix = np.zeros((self.size, self.size))
        np.add.at(matrix, (self._row, self._col), flat)
        return self._with_ends(matrix, ends, which, lambda i: (i, i))

    def banded(self, flat, ends, which):
        w = self.band
        place = (w + self._row - self._col) * self.size + self._col
        size = (2 * w + 1) * self.size
        matrix = np.bincount(place, flat, minlength=size).reshape(2 * w + 1, self.size)
        return self._with_ends(matrix, ends, which, lambda i: (w, i))

    def _with_ends(self, matrix, ends, which, place):
        for end, node in zip(ends, (0, self.size - 1), strict=True):
            if end is not None:
                matrix[place(node)] += end[which]
        return matrix

    def fields(self, vectors):
        """u and u' at every Gauss point, shape (n_vectors, n_points), in group order."""
        padded = np.vstack([vectors, np.zeros(vectors.shape[1])])
        u, du = [], []
        for g in self.groups:
            local = padded[g.dofs]  # (elements, N + 1, vectors); dof -1 reads the zero row
            u.append(np.einsum("qi,eiv->veq", g.value, local).reshape(vectors.shape[1], -1))
            slope = np.einsum("qi,eiv->veq", g.slope, local) * g.stretch[None, :, None]
            du.append(slope.reshape(vectors.shape[1], -1))
        return np.hstack(u), np.hstack(du)

    def points(self):
        """z, weight, edge, mass, inverse gap at every Gauss point, in group order."""
        names = ("z", "weight", "edge", "mass", "inverse")
        return tuple(np.concatenate([getattr(g, n).ravel() for g in self.groups]) for n in names)

    def forms(self, energy, vectors, frozen=False):
        """Matrices x'T x and x'(-T')x of the columns, summed over Gauss points."""
        _, weight, edge, mass, inverse = self.points()
        m, b = mass_at(energy, edge, mass, inverse)
        b = 0.0 * b if frozen else b
        u, du = self.fields(vectors)
        p = du * (1 / m)
        stiff = (p * (H2M * weight * m)) @ p.T + (u * (weight * (edge - energy))) @ u.T
        norm = (p * (H2M * weight * b)) @ p.T + (u * weight) @ u.T
        for face, node in zip(self.end_curves, (0, self.size - 1), strict=True):
            if face is not None:
                g, tail = self.end(energy, face)
                stiff += g * np.outer(vectors[node], vectors[node])
                norm += tail * np.outer(vectors[node], vectors[node])
        return stiff, norm

    def sample(self, vectors, z):
        """u at positions z, shape (n_vectors, len(z)); zero outside unless the end is open."""
        padded = np.vstack([vectors, np.zeros(vectors.shape[1])])
        out = np.zeros((vectors.shape[1], len(z)))
        for g in self.groups:
            for e in range(len(g.left)):
                a, h = g.left[e], 2.0 / g.stretch[e]
                inside = np.flatnonzero((z >= a) & (z <= a + h))
                if len(inside):
                    value, _ = shapes_at(g.degree, 2 * (z[inside] - a) / h - 1)
                    out[:, inside] = (value @ padded[g.dofs[e]]).T
        return out
