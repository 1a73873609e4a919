"""Sections cut where their edge turns: each piece rises or falls, with one turning point at most.

A piece is read from its low face, where the edge is lower (s = 0), to its high face
(s = length). All pieces of one kind are held as arrays and evaluated together.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from ..profile import Curve, Polynomial, Section

Floats = npt.NDArray[np.float64]

LEAST_MASS = 0.05  # share of the band-edge mass that m(E) never falls below
_SAMPLES = 513
_TURN = 1e-11  # rises smaller than this share of the edge's range are rounding


@dataclass(frozen=True)
class Piece:
    """A monotone stretch of a section.

    ``start`` is the depth of the low face in the section [nm], ``direction`` +1 when the edge
    rises with depth; ``bottom`` and ``top`` hold (2 |Q''|)^(-1/4) [nm of y] where the low face
    is a smooth minimum or the high face a smooth maximum of the edge, else 0.
    """

    section: Section
    start: float
    length: float
    direction: int
    bottom: float = 0.0
    top: float = 0.0
    walls: tuple[bool, bool] = (False, False)  # whether the low and the high face is a wall
    alone: bool = False  # whether its section is all there is between two walls


def derivative(curve: Curve, depth: float, inward: int, reach: float) -> tuple[float, float]:
    """Return first and second derivative of ``curve`` at ``depth`` [nm].

    Exact for a polynomial. A sampled curve is differenced from ``depth`` towards ``inward``
    (+1 or -1) within ``reach`` [nm], as it may end there.
    """
    if isinstance(curve, Polynomial):
        c = list(enumerate(curve.coefficients))
        return (sum(n * a * depth ** (n - 1) for n, a in c[1:]),
                sum(n * (n - 1) * a * depth ** (n - 2) for n, a in c[2:]))
    h = inward * reach * 2e-3
    value = curve.at(depth + h * np.arange(6.0))
    first = (-137 / 60, 5.0, -5.0, 10 / 3, -5 / 4, 1 / 5)
    second = (15 / 4, -77 / 6, 107 / 6, -13.0, 61 / 12, -5 / 6)
    return float(np.dot(first, value)) / h, float(np.dot(second, value)) / h**2


def turns(section: Section) -> list[float]:
    """Return the depths inside the section where the edge goes from rising to falling or back."""
    curve, length = section.edge, section.thickness
    if isinstance(curve, Polynomial):
        if curve.degree < 2:
            return []
        roots = np.polynomial.Polynomial(curve.coefficients).deriv(1).roots()
        real = np.sort(roots.real[np.abs(roots.imag) < 1e-9 * length])
        inside = real[(real > 1e-9 * length) & (real < (1 - 1e-9) * length)]
        return [float(z) for z in inside if _turns_at(curve, z, length)]
    depth = np.linspace(0.0, length, _SAMPLES)
    value = curve.at(depth)
    step = np.diff(value)
    moving = np.flatnonzero(np.abs(step) > _TURN * max(float(np.ptp(value)), 1e-12))
    found = []
    for a, b in zip(moving[:-1], moving[1:], strict=True):
        if step[a] * step[b] < 0:
            sign = np.sign(step[a])
            found.append(_highest(curve, depth[a], depth[b + 1], sign) if b == a + 1
                         else 0.5 * float(depth[a + 1] + depth[b]))
    return found


def _turns_at(curve: Curve, depth: float, length: float) -> bool:
    h = 1e-4 * length
    before, here, after = curve.at(depth + np.array([-h, 0.0, h]))
    return bool((here - before) * (after - here) < 0)


def _highest(curve: Curve, low: float, high: float, sign: float) -> float:
    for _ in range(12):  # each round keeps a quarter
        depth = np.linspace(low, high, 9)
        best = int(np.argmax(sign * curve.at(depth)))
        low, high = depth[max(best - 1, 0)], depth[min(best + 1, 8)]
    return 0.5 * float(low + high)


def pieces_of(section: Section, walls: tuple[bool, bool] = (False, False)) -> list[Piece]:
    """Cut a section that is not flat into its monotone pieces, in order of depth.

    ``walls`` says whether its first and its last face is a hard wall.
    """
    length = section.thickness
    cuts = [0.0, *turns(section), length]
    edges = section.edge.at(np.array(cuts))
    scales = [_scale(section, z, cuts, i) for i, z in enumerate(cuts)]
    found = []
    for i, (a, b) in enumerate(zip(cuts[:-1], cuts[1:], strict=True)):
        rises = edges[i + 1] >= edges[i]
        low, high = (i, i + 1) if rises else (i + 1, i)
        ends = (walls[0] and i == 0, walls[1] and i == len(cuts) - 2)
        found.append(Piece(section, cuts[low], b - a, 1 if rises else -1,
                           scales[low], scales[high], ends if rises else ends[::-1], all(walls)))
    return found


def _scale(section: Section, depth: float, cuts: list[float], index: int) -> float:
    """Return (2 |Q''|)^(-1/4) where the edge is smooth and level at ``depth``, else 0."""
    spans = [b - a for a, b in zip(cuts[:-1], cuts[1:], strict=True)]
    beside = spans[max(index - 1, 0):index + 1]
    reach = min(beside)
    inward = 1 if index < len(cuts) - 1 else -1
    slope, curvature = derivative(section.edge, depth, inward, reach)
    edges = section.edge.at(np.array([depth, depth + inward * reach]))
    rise = abs(float(edges[1] - edges[0]))
    if index in (0, len(cuts) - 1) and abs(slope) * reach > 1e-6 * rise:
        return 0.0
    mass = float(section.mass.at(np.array([depth]))[0])
    bent = max(abs(curvature), 1e-9 * rise / reach**2)
    return float((2 * bent / (H2M * mass**3)) ** -0.25) if bent > 0.0 else 0.0


class Batch:
    """Pieces of one kind as arrays: evaluates their curves for all energies at once.

    Parameters
    ----------
    pieces : sequence of Piece
    nodes, panels : int
        Gauss-Legendre nodes a panel and panels of the action integral.
    """

    def __init__(self, pieces: Sequence[Piece], nodes: int, panels: int = 1) -> None:
        self.pieces = tuple(pieces)
        self.start = np.array([p.start for p in pieces])
        self.direction = np.array([float(p.direction) for p in pieces])
        self.length = np.array([p.length for p in pieces])
        self.bottom = np.array([[p.bottom] for p in pieces])
        self.top = np.array([[p.top] for p in pieces])
        self.alone = np.array([[p.alone] for p in pieces])
        self.tilted = all(p.section.tilted for p in pieces)
        self.plain = np.array([[w and p.alone and not _linear(p.section) for w in p.walls]
                               for p in pieces]).T
        self.exact = np.array([[_linear(p.section)] for p in pieces])
        self._curves = {
            name: _Stacked([getattr(p.section, name) for p in pieces])
            for name in ("edge", "mass", "inverse_gap")
        }
        self._sliced: dict[str, Floats] = {}
        self.ends = np.stack([np.zeros_like(self.length), self.length])  # (2, n_pieces)
        self.edge = np.stack([self.at("edge", s[:, None])[:, 0] for s in self.ends])
        self.slopes = {name: self._slopes(name) for name in self._curves}
        self.curvature = self._slopes("edge", 1)
        grid = np.linspace(0.0, 1.0, 129)
        self._table = self.at("edge", self.length[:, None] * grid)
        rise = np.diff(self._table)
        steepest = rise.argmax(axis=1)
        self.middle = (self.length * (steepest + 0.5) / 128)[:, None]
        self.width = 0.25 * (self.edge[1] - self.edge[0])[:, None] * (
            self.length / 128 / np.maximum(rise.max(axis=1), 1e-300))[:, None]
        x, w = np.polynomial.legendre.leggauss(nodes)
        part = (np.arange(panels)[:, None] + 0.5 * (x + 1)) / panels
        self.tau, self.weight = part.ravel(), np.tile(0.5 * w / panels, panels)

    def at(self, name: str, s: Floats) -> Floats:
        """Return edge [eV], mass or inverse_gap at s [nm from the low face], (n_pieces, ...)."""
        shape = (-1,) + (1,) * (s.ndim - 1)
        return self._curves[name](self.start.reshape(shape) + self.direction.reshape(shape) * s)

    def slices(self, name: str, shares: Floats) -> Floats:
        """Return the same at these shares of each piece's length, kept for the next call."""
        if name not in self._sliced:
            s = self.length.reshape((-1,) + (1,) * shares.ndim) * shares
            self._sliced[name] = self.at(name, s)
        return self._sliced[name]

    def local_width(self, energies: Floats, turn: Floats) -> Floats:
        """Return the width l [nm] of the smooth step with this edge's levels and slope at ``turn``.

        V = low + (high - low) / (1 + exp(-s/l)) has V' = (V - low)(high - V) / (l (high - low)).
        """
        length = self.length[:, None]
        h = 1e-3 * length
        s = np.clip(turn, h, length - h)
        slope = (self.at("edge", s + h) - self.at("edge", s - h)) / (2 * h)
        low, high = self.edge[0][:, None], self.edge[1][:, None]
        e = np.clip(energies, low, high)
        with np.errstate(divide="ignore", invalid="ignore"):
            local = (e - low) * (high - e) / ((high - low) * slope)
        width: Floats = np.clip(np.nan_to_num(local), 0.25 * self.width, 2.0 * self.width)
        return width

    def _slopes(self, name: str, which: int = 0) -> Floats:
        value = np.zeros((2, len(self.pieces)))
        for i, p in enumerate(self.pieces):
            curve, way = getattr(p.section, name), p.direction
            sign = 1 if which else way
            end = p.start + way * p.length
            value[0, i] = sign * derivative(curve, p.start, way, p.length)[which]
            value[1, i] = sign * derivative(curve, end, -way, p.length)[which]
        return value

    def turning(self, energies: Floats) -> Floats:
        """Return where the edge meets each energy, s [nm], kept within 0 and the length.

        ``energies`` is (n_energies,) or (n_pieces, n_energies).
        """
        e = np.atleast_2d(energies)
        low, high = self.edge[0][:, None], self.edge[1][:, None]
        length = self.length[:, None]
        share = np.clip((e - low) / np.where(high > low, high - low, 1.0), 0.0, 1.0)
        share = np.where(e > high, 1.0, np.where(e < low, 0.0, share))
        s: Floats = share * length
        if self.tilted:
            return s
        return self._refined(s, e)

    def _refined(self, s: Floats, e: Floats) -> Floats:
        """Bracket each turning point by a table, then Ridders' method on all at once."""
        grid = np.linspace(0.0, 1.0, 129)
        cell = np.clip((self._table[:, None, :] <= e[:, :, None]).sum(axis=-1) - 1, 0, 127)
        a, b = self.length[:, None] * grid[cell], self.length[:, None] * grid[cell + 1]
        fa, fb = self.at("edge", a) - e, self.at("edge", b) - e
        inside = (fa <= 0) & (fb > 0)
        for _ in range(7):
            c = 0.5 * (a + b)
            fc = self.at("edge", c) - e
            root = np.sqrt(np.maximum(fc * fc - fa * fb, 1e-300))
            d = np.clip(c + (c - a) * np.sign(fa - fb) * fc / root, a, b)
            fd = self.at("edge", d) - e
            left, lf = np.where(fc <= 0, c, a), np.where(fc <= 0, fc, fa)
            right, rf = np.where(fc > 0, c, b), np.where(fc > 0, fc, fb)
            use_left = (fd <= 0) & (d > left)
            use_right = (fd > 0) & (d < right)
            a, fa = np.where(use_left, d, left), np.where(use_left, fd, lf)
            b, fb = np.where(use_right, d, right), np.where(use_right, fd, rf)
        between = np.where(fb - fa > 0, a - fa * (b - a) / np.where(fb > fa, fb - fa, 1.0), a)
        found: Floats = np.where(inside, between, s)
        return found


def _linear(section: Section) -> bool:
    """Whether Airy functions are exact: a linear edge, one mass at all energies."""
    gap = section.inverse_gap
    return section.tilted and isinstance(gap, Polynomial) and gap.coefficients[0] == 0.0


class _Stacked:
    """One curve a piece: polynomials by one Horner scheme, the others one by one."""

    def __init__(self, curves: Sequence[Curve]) -> None:
        degree = max([c.degree for c in curves if isinstance(c, Polynomial)], default=0)
        self.coefficients = np.zeros((degree + 1, len(curves)))
        self.others = [(i, c) for i, c in enumerate(curves) if not isinstance(c, Polynomial)]
        for i, c in enumerate(curves):
            if isinstance(c, Polynomial):
                kept = c.coefficients[: degree + 1]
                self.coefficients[: len(kept), i] = kept

    def __call__(self, depth: Floats) -> Floats:
        shape = (-1,) + (1,) * (depth.ndim - 1)
        value = np.zeros_like(depth)
        for row in self.coefficients[::-1]:
            value = value * depth + row.reshape(shape)
        for i, curve in self.others:
            value[i] = curve.at(depth[i].ravel()).reshape(depth[i].shape)
        return value


def energy_mass(x: Floats, mass: Floats, inverse_gap: Floats) -> Floats:
    """Return m(E) [m0] for x = E - V [eV]: m (1 + x / gap), never under a twentieth of m."""
    m: Floats = mass * np.maximum(1.0 + x * inverse_gap, LEAST_MASS)
    return m
