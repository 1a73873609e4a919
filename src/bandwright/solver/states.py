"""States of found levels anywhere: values, probabilities and matrix elements of z.

A point inside a slice cuts it in two; u there follows from u at the slice's faces and the two
parts' elements, which is exact for a constant slice and as good as the slice for others.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from .matrix import Elements
from .propagation import MASS_FLOOR, local_mass
from .sensitivity import Reach, Sensitivity, flat_reach, sensitivity, tail_reaches
from .slices import slice_at
from .system import System

Floats = npt.NDArray[np.float64]

_ORDER = 10
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(_ORDER)
#: largest phase or decay exponent of a quadrature cell
_CELL = 1.5


class _Quadrature(NamedTuple):
    z: Floats
    weight: Floats
    section: npt.NDArray[np.int64]
    u: Floats
    p: Floats  # sqrt(h2m b) psi'/m: the valence-like partner of the two-band product
    clamped: npt.NDArray[np.bool_]
    rise: Floats  # psi'/m


class _Tail(NamedTuple):
    position: float
    outward: float
    decay: Floats
    u: Floats
    p: Floats


@dataclass(frozen=True)
class States:
    """Normalised states: energies [eV] (n_levels,), ``u`` at all slice faces (n_faces, n_levels).

    Norm and matrix elements use the product <i|j> = int u_i u_j + h2m b p_i p_j dz of the
    two-band model (b = dm/dE; the ordinary product where b = 0).
    """

    system: System
    energies: Floats
    u: Floats

    def sample(self, z: Floats) -> tuple[Floats, Floats]:
        """Return u [nm^-1/2] and p = u'/m [nm^-3/2] at positions z [nm], (n_levels, n_points)."""
        z = np.atleast_1d(np.asarray(z, dtype=float))
        faces = self.system.slices.faces
        order = np.argsort(z, kind="stable")
        inside = np.clip(z[order], faces[0], faces[-1])
        index = np.clip(np.searchsorted(faces, inside, side="right") - 1, 0, len(faces) - 2)
        u, p = self._inside(inside, index)
        self._set_tails(z[order], u, p)
        outside = (z[order] < faces[0]) | (z[order] > faces[-1])
        for end, out in zip(self.system.ends, (z[order] < faces[0], z[order] > faces[-1]),
                            strict=True):  # fmt: skip
            if end == "wall":
                u[:, out & outside] = p[:, out & outside] = 0.0
        back = np.empty_like(order)
        back[order] = np.arange(len(order))
        return u[:, back], p[:, back]

    def _set_tails(self, z: Floats, u: Floats, p: Floats) -> None:
        """Set u and p at the positions that lie where the tails do: also in unsliced layers."""
        for tail in self._tails:
            depth = tail.outward * (z - tail.position)
            out = depth > 0
            if out.any():
                shrink = np.exp(-tail.decay[:, None] * depth[out])
                u[:, out] = tail.u[:, None] * shrink
                p[:, out] = tail.p[:, None] * shrink

    def _inside(self, z: Floats, index: npt.NDArray[np.int64]) -> tuple[Floats, Floats]:
        """U and p at sorted positions z in slices ``index``, from u at the slices' faces."""
        if not len(self.energies):
            return np.zeros((0, len(z))), np.zeros((0, len(z)))
        slices = self.system.slices
        whole = slices.thickness[index]
        depth = np.clip(z - slices.faces[index], 1e-9 * whole, (1 - 1e-9) * whole)
        section, start = slices.section[index], slices.start[index]
        before = slice_at(slices.profile, slices.counts, section, start, depth)
        after = slice_at(slices.profile, slices.counts, section, start + depth, whole - depth)
        one = before.elements(self.energies)
        two = after.elements(self.energies)
        left, right = self.u[index], self.u[index + 1]
        u = (one.off * left + two.off * right) / (one.right + two.left)
        p = _choose(2 * depth > whole, one, two, u, left, right)
        return np.ascontiguousarray(u.T), np.ascontiguousarray(p.T)

    @cached_property
    def _tails(self) -> tuple[_Tail, ...]:
        """What each open end's outside holds."""
        tails = []
        faces = self.system.slices.faces
        for end, row, position, sign in zip(
            self.system.outside, (0, -1), (faces[0], faces[-1]), (-1.0, 1.0), strict=True
        ):
            if end is not None:
                kappa, mass = end.decay(self.energies)
                u = self.u[row]
                p = -sign * kappa / mass * u
                tails.append(_Tail(float(position), sign, np.maximum(kappa, 1e-9), u, p))
        return tuple(tails)

    @cached_property
    def _quadrature(self) -> _Quadrature:
        if not len(self.energies):
            return self._on(np.zeros(0), np.zeros(0))
        low, high = float(self.energies.min()), float(self.energies.max())
        return self._on(*_cells(self.system, low, high, self._floors))

    @property
    def _floors(self) -> Floats:
        """Where the mass of each level meets its floor in a linear edge [nm]: dm/dE jumps there."""
        profile = self.system.slices.profile
        numbers = profile.numbers
        rising = np.flatnonzero((numbers.slope != 0.0) & ~numbers.curved
                                & (numbers.inverse_gap > 0.0))  # fmt: skip
        edge, slope = numbers.edge[rising], numbers.slope[rising]
        top = self.energies[:, None] + (1.0 - MASS_FLOOR) / numbers.inverse_gap[rising]
        with np.errstate(over="ignore"):  # the floor of a field next to none lies at infinity
            depth = (top - edge) / slope
        inside = (depth > 0.0) & (depth < numbers.thickness[rising])
        return np.asarray((profile.faces[rising] + depth)[inside])

    def _on(self, z: Floats, weight: Floats) -> _Quadrature:
        """States at sorted points inside the structure."""
        slices = self.system.slices
        index = np.searchsorted(slices.faces, z, side="right") - 1
        index = np.clip(index, 0, len(slices.thickness) - 1)
        u, p = self._inside(z, index)
        self._set_tails(z, u, p)
        section = np.searchsorted(slices.profile.faces, z, side="right") - 1
        section = np.clip(section, 0, len(slices.counts) - 1)
        place = z - slices.profile.faces[section]
        here = slice_at(slices.profile, slices.counts, section, place, np.zeros_like(z))
        _, b = local_mass(self.energies[:, None], here.edge, here.mass, here.inverse_gap)
        clamped = (b == 0.0) & (here.inverse_gap > 0.0)
        return _Quadrature(z, weight, section, u, np.sqrt(H2M * b) * p, clamped, p)

    def components(self, z: Floats) -> tuple[Floats, Floats]:
        """Return u and its valence-like partner at ascending positions z [nm] of the structure.

        Both (n_levels, n_points); the product <i|j> is the integral of u_i u_j and that of the
        partners.
        """
        q = self._on(z, np.zeros_like(z))
        return q.u, q.p

    def beyond(self, end: int) -> tuple[Floats, Floats, Floats] | None:
        """Return decay [1/nm], u and partner at an outer face; None if nothing lies beyond it.

        ``end`` is 0 for the first-grown face, 1 for the last; each (n_levels,).
        """
        row = -end
        for tail in self._tails:
            if (tail.outward > 0) == bool(end):
                face = self.system.slices.profile.faces[row]
                shrink = np.exp(-tail.decay * abs(face - tail.position))
                return tail.decay, shrink * tail.u, shrink * self._tail_partner(tail, row)
        return None

    def _tail_partner(self, tail: _Tail, row: int) -> Floats:
        section = self.system.slices.profile.sections[row]
        depth = np.array([0.0 if row == 0 else section.thickness])
        edge, mass, gap = (c.at(depth)[0] for c in (section.edge, section.mass,
                                                    section.inverse_gap))  # fmt: skip
        _, b = local_mass(self.energies, edge, mass, gap)
        return np.asarray(np.sqrt(H2M * b) * tail.p)

    @cached_property
    def _moments(self) -> tuple[Floats, Floats, Floats]:
        """Matrices <i|1|j>, <i|z|j>, <i|z^2|j>, tails beyond open ends included."""
        q = self._quadrature
        centre = self.system.slices.faces[-1] / 2.0
        z = q.z - centre
        partnered = bool(q.p.any())  # not in the one-band model
        moments = []
        for power in (0, 1, 2):
            w = q.weight * z**power
            moment = (q.u * w) @ q.u.T
            moments.append(moment + (q.p * w) @ q.p.T if partnered else moment)
        for tail in self._tails:
            row = 0 if tail.outward < 0 else -1
            partner = self._tail_partner(tail, row)
            size = np.outer(tail.u, tail.u) + np.outer(partner, partner)
            k = tail.decay[:, None] + tail.decay
            start, sign = tail.position - centre, tail.outward
            moments[0] += size / k
            moments[1] += size * (start / k + sign / k**2)
            moments[2] += size * (start**2 / k + 2 * sign * start / k**2 + 2 / k**3)
        one, first, second = moments
        return one, first + centre * one, second + 2 * centre * first + centre**2 * one

    @property
    def overlaps(self) -> Floats:
        """<i|j> by quadrature, (n_levels, n_levels); the unit matrix for exact states."""
        return self._moments[0]

    @property
    def dipoles(self) -> Floats:
        """Matrix elements of z [nm], (n_levels, n_levels); positions on the diagonal."""
        return self._moments[1]

    @property
    def positions(self) -> Floats:
        """Mean position of each level [nm], (n_levels,)."""
        return np.diag(self._moments[1]).copy()

    @property
    def squares(self) -> Floats:
        """Mean square of the position of each level [nm^2], (n_levels,)."""
        return np.diag(self._moments[2]).copy()

    @cached_property
    def probabilities(self) -> Floats:
        """Probability in each section, outer sections with their tails, (n_levels, n_sections)."""
        q = self._quadrature
        sections = len(self.system.slices.profile.sections)
        density = (q.u**2 + q.p**2) * q.weight
        present, starts = np.unique(q.section, return_index=True)
        result = np.zeros((len(self.energies), sections))
        if len(present):
            result[:, present] = np.add.reduceat(density, starts, axis=1)
        for tail in self._tails:
            row = 0 if tail.outward < 0 else -1
            partner = self._tail_partner(tail, row)
            result[:, row] += (tail.u**2 + partner**2) / (2.0 * tail.decay)
        return np.asarray(result)

    @cached_property
    def sensitivity(self) -> Sensitivity:
        """What small changes of the profile do to each energy, tails beyond open ends included.

        In flat profiles for changes that are linear across a slice.
        """
        if not self.system.slices.profile.numbers.all_flat or not len(self.energies):
            return self.sensitivity_at_points
        return self._sensitivity(flat_reach(self.system.slices, self.energies, self.u), False)

    @cached_property
    def sensitivity_at_points(self) -> Sensitivity:
        """The same for changes that vary in any way along a section."""
        return self._sensitivity(self._at_points(None))

    def coupling(self, level: int) -> Sensitivity:
        """Return what small changes of the profile do between one level and each, a row each."""
        return self._sensitivity(self._at_points(level), level=level)

    def _at_points(self, level: int | None) -> Reach:
        q, profile = self._quadrature, self.system.slices.profile
        u, p = (q.u, q.rise) if level is None else (q.u[level], q.rise[level])
        depth = q.z - profile.faces[q.section]
        return Reach(q.section, depth, q.weight * q.u * u, H2M * q.weight * q.rise * p)

    def _sensitivity(
        self, inside: Reach, at_points: bool = True, level: int | None = None
    ) -> Sensitivity:
        profile, parts, energies = self.system.slices.profile, [inside], self.energies
        if level is not None:
            energies = np.full_like(energies, energies[level])
        for tail in self._tails:
            decay, u, p = tail.decay, tail.u, tail.p
            if level is not None:
                decay, u, p = 0.5 * (decay + decay[level]), u[level], p[level]
            sizes = tail.u * u, H2M * tail.p * p
            parts += tail_reaches(profile, tail.position, tail.outward, decay, *sizes, at_points)
        return sensitivity(profile, energies, parts)

    @property
    def clamped(self) -> Floats:
        """Probability where the two-band mass stands at its floor, (n_levels,)."""
        q = self._quadrature
        total = np.sum((q.u**2) * q.weight * q.clamped, axis=1)
        for tail in self._tails:
            row = 0 if tail.outward < 0 else -1
            section = self.system.slices.profile.sections[row]
            depth = np.array([0.0 if row == 0 else section.thickness])
            edge, mass, gap = (
                float(c.at(depth)[0]) for c in (section.edge, section.mass, section.inverse_gap)
            )
            _, b = local_mass(self.energies, np.array(edge), np.array(mass), np.array(gap))
            total = total + np.where((b == 0.0) & (gap > 0.0), tail.u**2 / (2.0 * tail.decay), 0.0)
        return np.asarray(total)

    @property
    def wall_shifts(self) -> Floats:
        """dE/dwall = -h2m m(E) p_wall^2 / <i|i> [eV/nm] of the more sensitive wall, (n_levels,)."""
        shift = np.zeros(len(self.energies))
        if not len(shift):
            return shift
        slices = self.system.slices
        elements = slices.elements(self.energies)
        for end, row, inner in zip(self.system.ends, (0, -1), (1, -2), strict=True):
            if end == "wall":
                p = elements.off[row] * self.u[inner]
                section = slices.profile.sections[row]
                depth = np.array([0.0 if row == 0 else section.thickness])
                edge, mass, gap = (c.at(depth)[0] for c in (section.edge, section.mass,
                                                            section.inverse_gap))  # fmt: skip
                local, _ = local_mass(self.energies, edge, mass, gap)
                shift = np.minimum(shift, -H2M * local * p**2)
        return shift


def _choose(
    use_before: npt.NDArray[np.bool_], one: Elements, two: Elements, u: Floats,
    left: Floats, right: Floats,
) -> Floats:  # fmt: skip
    """P at a point, from the longer of the two parts of its slice."""
    from_before = one.right * u - one.off * left
    from_after = two.off * right - two.left * u
    return np.where(use_before[:, None], from_before, from_after)


def _cells(
    system: System, low: float, high: float, cuts: npt.ArrayLike = ()
) -> tuple[Floats, Floats]:
    """Return Gauss points and weights on cells in which no state turns or decays much.

    ``cuts`` are further positions [nm] between cells.
    """
    slices = system.slices
    cells = cells_for(slices.thickness * rates(system, low, high))
    width = np.repeat(slices.thickness / cells, cells)
    within = np.arange(len(width)) - np.repeat(np.cumsum(cells) - cells, cells)
    begin = np.repeat(slices.faces[:-1], cells) + within * width
    if np.size(cuts):
        begin = np.unique(np.concatenate((begin, np.asarray(cuts))))
        width = np.diff(begin, append=slices.faces[-1])
    z = (begin[:, None] + 0.5 * width[:, None] * (1.0 + _NODES)).reshape(-1)
    return z, (0.5 * width[:, None] * _WEIGHTS).reshape(-1)


def rates(system: System, low: float, high: float) -> Floats:
    """Return how fast states of these energies turn or decay at most in each slice [1/nm]."""
    slices = system.slices
    tilt = 0.5 * np.abs(slices.drop)
    heavy = slices.mass * (1.0 + np.maximum(0.0, high - slices.edge + tilt) * slices.inverse_gap)
    reach = np.maximum(np.abs(high - slices.edge), np.abs(slices.edge - low)) + tilt
    return np.asarray(np.sqrt(heavy * reach / H2M))


def cells_for(turns: Floats) -> npt.NDArray[np.int64]:
    """Return how many quadrature cells stretches need in which states turn so far [rad]."""
    return np.maximum(1, np.ceil(turns / _CELL)).astype(np.int64)


def gauss(cells: npt.NDArray[np.int64]) -> tuple[npt.NDArray[np.int64], Floats, Floats]:
    """Return stretch, place and weight of each Gauss point, stretches in so many equal cells.

    Places and weights are fractions of the stretch.
    """
    stretch = np.repeat(np.arange(len(cells)), cells)
    within = np.arange(len(stretch)) - np.repeat(np.cumsum(cells) - cells, cells)
    share = 1.0 / cells[stretch]
    place = (within[:, None] + 0.5 * (1.0 + _NODES)) * share[:, None]
    weight = 0.5 * share[:, None] * _WEIGHTS
    return np.repeat(stretch, _ORDER), place.reshape(-1), weight.reshape(-1)


def cross_moment(bound: States, boxed: States) -> Floats:
    """Return matrix elements of z between states of two sets of ends [nm], inside the structure.

    They are taken about the mean of both states' positions, (n_bound, n_boxed).
    """
    energies = np.concatenate((bound.energies, boxed.energies))
    points = _cells(boxed.system, float(energies.min()), float(energies.max()))
    one, two = bound._on(*points), boxed._on(*points)
    weighted = one.weight * one.z
    first = (one.u * weighted) @ two.u.T + (one.p * weighted) @ two.p.T
    overlap = (one.u * one.weight) @ two.u.T + (one.p * one.weight) @ two.p.T
    middle = 0.5 * (bound.positions[:, None] + boxed.positions)
    return np.asarray(first - middle * overlap)
