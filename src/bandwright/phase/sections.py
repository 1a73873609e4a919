"""Elements of the phase integral: one for each stretch on which the edge rises or falls.

Flat sections are exact; linear ones in the one-band model are exact by Airy functions. All
others use the action and the amplitude sqrt(m/k), with the pi/4 of a smooth turning point
inside and the local Airy or parabolic model of `maps` at their faces. Cutting a section in two
changes nothing, because both sides of the cut carry the same model.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from ..errors import SolveError
from ..profile import Profile, Sampled, Section
from ..solver.matrix import Elements
from .joints import joined
from .maps import (
    Face,
    airy_face,
    bottom_exponent,
    bottom_face,
    edge_phase,
    rise,
    top_exponent,
    top_face,
    top_phase,
    trough_phase,
)
from .pieces import Batch, Piece, energy_mass, pieces_of

Floats = npt.NDArray[np.float64]
Counts = npt.NDArray[np.int64]

_HALF_LN2 = 0.5 * float(np.log(2.0))


class Phases(NamedTuple):
    """What a batch of pieces does at each energy, shape (n_pieces, n_energies) each.

    ``action`` is the integral of k over the allowed part, ``decay`` that of kappa over the
    forbidden part [rad]; ``total`` is Theta at the low face (the difference of Theta where
    both faces are allowed), ``exponent`` S at the high face (the difference of S where both
    are forbidden); ``low`` and ``high`` are the faces.
    """

    action: Floats
    decay: Floats
    total: Floats
    exponent: Floats
    low: Face
    high: Face


def flat_elements(h: Floats, edge: Floats, mass: Floats, inverse_gap: Floats,
                  energies: Floats) -> Elements:
    """Return the exact elements of flat sections, arrays (n_sections, 1), for all energies.

    t = h^2 m (E - V) / h2m, x = sqrt|t|: A/B = (x cot x)/(h m), 1/B = (x / sin x)/(h m) from
    the tangent of x/2; hyperbolic for t < 0 from exp(-x).
    """
    m = energy_mass(energies - edge, mass, inverse_gap)
    t = h * h * m * (energies - edge) / H2M
    x = np.sqrt(np.abs(t))
    small = x < 1e-4
    y = np.where(small, 1.0, 0.5 * x)
    wave = np.where(t > 0, y, 1.0)
    tangent = np.tan(wave)
    decay = np.exp(-np.where(t > 0, 1.0, 2 * y))
    between = -np.expm1(-np.where(t > 0, 2.0, 4 * y))
    near, off = wave / tangent, wave * tangent
    f = np.where(t > 0, near - off, 2 * y * (1 + decay * decay) / between)
    g = np.where(t > 0, near + off, 4 * y * decay / between)
    f = np.where(small, 1 - t / 3, f) / (h * m)
    g = np.where(small, 1 + t / 6, g) / (h * m)
    clamped = np.where(t > 0, np.floor(x / np.pi), 0.0).astype(np.int64)
    return Elements(f, f, g, clamped)


class Plan:
    """A profile taken apart once: its different flat sections and pieces, and their order.

    Parameters
    ----------
    profile : Profile
        Its ends must be ``"open"`` or ``"wall"``.
    ends : tuple of str, optional
        Used instead of the profile's own.

    Raises
    ------
    SolveError
        If an end is ``"periodic"``, which the phase integral does not know.
    """

    def __init__(self, profile: Profile, ends: tuple[str, str] | None = None) -> None:
        self.profile = profile
        self.ends = ends or profile.ends
        if "periodic" in self.ends:
            raise SolveError(
                "the phase integral knows open ends and walls, found 'periodic'; "
                "give ends = 'open' or 'wall'", "phase integral")
        self.rows: list[tuple[int, int, bool]] = []  # group, row there, read from high to low
        self.pieces: list[Piece] = []  # one an element, in growth order
        groups: list[list[Piece]] = [[], [], [], []]  # flat, tilted, polynomial, sampled
        known: dict[tuple[object, ...], list[tuple[int, int, bool, Piece]]] = {}
        sections = joined(profile.sections)
        final = len(sections) - 1
        for number, s in enumerate(sections):
            walls = (number == 0 and self.ends[0] == "wall",
                     number == final and self.ends[1] == "wall")
            key = (s.thickness, s.edge, s.mass, s.inverse_gap, walls)
            if key not in known:
                known[key] = []
                for piece in [Piece(s, 0.0, s.thickness, 1)] if s.flat else pieces_of(s, walls):
                    kind = _kind(s)
                    groups[kind].append(piece)
                    known[key].append((kind, len(groups[kind]) - 1, piece.direction < 0, piece))
            parts = known[key]
            for kind, row, falls, piece in parts if _in_growth_order(parts) else parts[::-1]:
                self.rows.append((kind, row, falls))
                self.pieces.append(piece)
        self.flats = groups[0]
        self.batches = [
            Batch(groups[1], 12) if groups[1] else None,
            Batch(groups[2], 24, 2) if groups[2] else None,
            Batch(groups[3], 12, 8) if groups[3] else None,
        ]

    def elements(self, energies: Floats, order: int = 1) -> Elements:
        """Return one element a piece, in growth order, at these energies [eV]."""
        lists: list[Elements | None] = [self._flats(energies) if self.flats else None]
        for batch in self.batches:
            lists.append(None if batch is None else piece_elements(batch, energies, order))
        n = len(self.rows), len(energies)
        left, right, off = np.empty(n), np.empty(n), np.empty(n)
        clamped = np.empty(n, dtype=np.int64)
        for i, (kind, row, falls) in enumerate(self.rows):
            part = lists[kind]
            assert part is not None and part.clamped is not None
            low, high = (part.right, part.left) if falls else (part.left, part.right)
            left[i], right[i], off[i], clamped[i] = low[row], high[row], part.off[row], \
                part.clamped[row]
        return Elements(left, right, off, clamped)

    def turning(self, kind: int, energies: Floats) -> Floats:
        """Return turning points of the batch of this kind, s [nm], see `Batch.turning`."""
        batch = self.batches[kind - 1]
        assert batch is not None
        return batch.turning(energies)

    def outside(self, energies: Floats) -> tuple[Floats | None, Floats | None]:
        """Return what each end adds: kappa/m(E) of its outer face [1/nm], None at a wall."""
        first, last = self.profile.sections[0], self.profile.sections[-1]
        return (
            None if self.ends[0] == "wall" else _leak(first, 0.0, energies),
            None if self.ends[1] == "wall" else _leak(last, last.thickness, energies),
        )

    def _flats(self, energies: Floats) -> Elements:
        zero = np.zeros((1,))
        edge, mass, inverse_gap = (
            np.array([[float(getattr(p.section, name).at(zero)[0])] for p in self.flats])
            for name in ("edge", "mass", "inverse_gap"))
        lengths = np.array([[p.length] for p in self.flats])
        return flat_elements(lengths, edge, mass, inverse_gap, energies)


def _kind(section: Section) -> int:
    if section.flat:
        return 0
    if section.tilted:
        return 1
    curves = (section.edge, section.mass, section.inverse_gap)
    return 3 if any(isinstance(c, Sampled) for c in curves) else 2


def _in_growth_order(parts: list[tuple[int, int, bool, Piece]]) -> bool:
    starts = [min(p.start, p.start + p.direction * p.length) for *_, p in parts]
    return starts == sorted(starts)


def _leak(section: Section, depth: float, energies: Floats) -> Floats:
    edge, mass, inverse_gap = (float(c.at(np.array([depth]))[0])
                               for c in (section.edge, section.mass, section.inverse_gap))
    m = energy_mass(energies - edge, np.array(mass), np.array(inverse_gap))
    return np.sqrt(np.maximum(edge - energies, 0.0) / (H2M * m))


def piece_elements(batch: Batch, energies: Floats, order: int = 1) -> Elements:
    """Return the elements of a batch, read from the low face to the high one."""
    p = phases(batch, energies, order)
    both, none = p.low.allowed & p.high.allowed, ~p.low.allowed
    decay = np.where(both | none, 0.0, np.exp(-np.maximum(p.exponent, -0.5)))
    q = decay * decay
    angle = np.where(none, 1.0, p.total)
    sine, cosine = np.sin(angle), np.cos(angle)
    across = np.where(none, 1.0, sine - q * cosine)  # B without its modulus
    back = np.where(none, 1.0, cosine + q * sine)
    growth = np.maximum(np.where(none, p.exponent, 1.0), 1e-300)
    fall = np.exp(-growth)
    between = -np.expm1(-2 * growth)
    coth = (1 + fall * fall) / between
    n_low, n_high = p.low.square, p.high.square
    mean = np.sqrt(n_low * n_high)
    left = np.where(none, coth, back / across) / n_low
    right = np.where(none, coth, np.where(both, cosine, sine + q * cosine) / across) / n_high
    # M_l N_h exp(S) (...) with square = 2 N^2 on the forbidden side
    link = np.where(both, 1.0, np.where(none, 2 * fall / between, np.sqrt(2.0) * decay))
    off = np.where(none, link, link / across) / mean
    lost = np.where(both | none, 0.0, np.arctan(q))
    clamped = np.where(none, 0.0, np.floor((p.total - lost) / np.pi))
    return Elements(left - p.low.slope, right + p.high.slope, off,
                    np.maximum(clamped, 0.0).astype(np.int64))


def phases(batch: Batch, energies: Floats, order: int = 1) -> Phases:
    """Return action, decay and face models of a batch, see `Phases`."""
    turn = batch.turning(energies)
    length = np.broadcast_to(batch.length[:, None], turn.shape)
    zero = np.zeros_like(turn)
    action = integral(batch, energies, turn, zero)
    decay = integral(batch, energies, turn, length)
    low_q, low = _face(batch, 0, energies)
    high_q, high = _face(batch, 1, energies)
    inside = (low_q > 0) & (high_q <= 0)
    below = low_q <= 0
    bottom, top = batch.bottom > 0, batch.top > 0
    scaled = np.where(top, high_q * batch.top**2, 0.0)
    a = np.where(high_q > 0, -scaled, 2 * decay / np.pi)
    theta = np.where(high_q > 0, -0.5 * np.pi * scaled, decay)
    start, span = np.where(batch.alone, 0.0, 0.5), np.where(batch.alone, 0.5, 0.75)
    over = 1 - rise((np.abs(a) - start) / span) * (high_q > 0)  # a top well below the level
    peak = np.where(below, 0.0, over * top_phase(a)) if top.any() else 0.0
    if order == 1:
        low, high = _between_walls(batch, energies, low, high)
    total = action + low.shift
    if order == 1 and batch.plain[1].any():  # joins the plain condition at the wall's own edge
        lost = np.pi / 12 * (1 - rise(high.distance / 0.5))
        total = total - np.where(inside & batch.plain[1][:, None], lost, 0.0)
    total = total + np.where(top, np.pi / 4 + peak, np.where(inside, np.pi / 4, -high.shift))
    high_exponent = np.where(top, over * top_exponent(theta), decay + _HALF_LN2 + high.shift)
    height = np.where(inside, 2 * (action + peak) / np.pi, np.abs(low_q) * batch.bottom**2)
    round_, weight, phase = _smooth_edge(batch, energies, turn, low_q, high_q, action, decay)
    larger = np.where(bottom, bottom_exponent(height), 0.0)
    larger = np.where(inside, larger * round_, larger)
    weight = np.where(batch.alone & (high_q > 0), over * weight, weight)
    total = total + np.where(top | inside, weight * phase, 0.0)
    if order == 2:
        gain = next_order(batch, energies, inside, low_q > 0)
        near = np.where(inside, low.distance, np.minimum(low.distance, high.distance))
        trust = rise((near - 0.3) / 0.7) * rise((action - 0.15) / 0.35)
        gain = np.clip(np.nan_to_num(gain), -0.5, 0.5) * trust
        total = total + (1 - weight) * gain
    exponent = np.where(below, decay + high.shift - low.shift + larger,
                        high_exponent - np.where(inside, larger, 0.0))
    return Phases(action, decay, total, exponent, low, high)


def _between_walls(batch: Batch, energies: Floats, low: Face, high: Face) -> tuple[Face, Face]:
    """Take what the Airy models add to the phase at hard walls away, above the piece's edge.

    There is no turning point there, and the condition is the plain one, action = n pi.
    """
    bottom, top = (edge[:, None] for edge in batch.edge)
    near = rise((top - energies) / np.maximum(0.2 * (top - bottom), 1e-300))
    wall = batch.plain[..., None]
    plain_high = wall[1] & high.allowed
    return (low._replace(shift=np.where(wall[0], near * low.shift, low.shift)),
            high._replace(shift=np.where(plain_high, 0.0, high.shift)))


def _smooth_edge(batch: Batch, energies: Floats, turn: Floats, low_q: Floats, high_q: Floats,
                 action: Floats, decay: Floats) -> tuple[Floats, Floats, Floats]:
    """Return how round the low side is (1 a parabola, 0 flat), and weight and phase of an edge.

    Where the edge is flat on both sides of its rise, within the reach of the wave, the pi/4 of
    a turning point is corrected by the smooth step that has its two levels and its slope.
    """
    if batch.tilted:
        return np.ones_like(low_q), np.zeros_like(low_q), np.zeros_like(low_q)
    slant, curved, bends = [], [], []
    for end, q, reach in ((0, low_q, action), (1, high_q, decay)):
        m = batch.at("mass", batch.ends[end][:, None])
        m = energy_mass(energies - batch.edge[end][:, None], m,
                        batch.at("inverse_gap", batch.ends[end][:, None]))
        size = np.maximum(np.abs(q), 1e-100)
        slope = np.abs(batch.slopes["edge"][end][:, None]) / (H2M * m * m)
        bend = np.sqrt(2 * np.abs(batch.curvature[end][:, None]) / (H2M * m**3))
        slant.append((1.5 * reach * slope / size**1.5) ** 2)
        curved.append((2 * reach / np.pi * bend / size) ** 2)
        bends.append(bend)
    weight = (np.clip(1 - slant[0], 0, 1) * np.clip(1 - slant[1] - curved[1], 0, 1)) ** 2
    x = energies - batch.at("edge", batch.middle)
    m = energy_mass(x, batch.at("mass", batch.middle), batch.at("inverse_gap", batch.middle))
    width = m * batch.local_width(energies, turn)
    k = np.sqrt(np.maximum(low_q, 0.0)) * width
    kappa = np.sqrt(np.maximum(-high_q, 0.0)) * width
    over = np.clip(1 - np.maximum(high_q, 0.0) / np.maximum(low_q, 1e-300), 0, 1)
    hollow = np.clip(curved[0], 0, 1)
    phase = (1 - hollow) * edge_phase(k, kappa) + hollow * trough_phase(low_q - high_q, bends[0])
    phase = np.where(low_q > 0, over * phase, 0.0)
    return rise((slant[0] + curved[0]) / 0.7), weight, phase


def _face(batch: Batch, end: int, energies: Floats) -> tuple[Floats, Face]:
    """Return Q and the model of the low (0) or high (1) faces."""
    s = batch.ends[end][:, None]
    x = energies - batch.edge[end][:, None]
    mass, inverse_gap = batch.at("mass", s), batch.at("inverse_gap", s)
    m = energy_mass(x, mass, inverse_gap)
    v1, m1, i1 = (batch.slopes[name][end][:, None] for name in ("edge", "mass", "inverse_gap"))
    bracket = m / mass
    m_slope = m1 * bracket + np.where(bracket > 0.05, mass * (x * i1 - v1 * inverse_gap), 0.0)
    q = x / (H2M * m)
    slope = (-v1 - x * m_slope / m) / (H2M * m * m)
    face = airy_face(q, slope)
    scale = batch.bottom if end == 0 else batch.top
    level = np.broadcast_to(scale > 0, q.shape)
    if level.any():
        safe = np.where(scale > 0, scale, 1.0)
        model = bottom_face(q, safe) if end == 0 else top_face(q, safe)
        tilt = -0.25 * slope / np.sqrt(q * q + safe**-4.0)
        face = Face(*(np.where(level, new, old) for new, old in
                      zip(model._replace(slope=tilt), face, strict=True)))
    return q, face


def integral(batch: Batch, energies: Floats, begin: Floats, end: Floats,
             weight: Floats | None = None) -> Floats:
    """Return the integral of sqrt(m |E - V| / h2m) dz from s = ``begin`` to s = ``end`` [rad].

    Depth is taken linear in |E - V| from face to face, which lifts the square root at a
    turning point; Gauss-Legendre then converges fast.
    """
    e = energies[None, :]
    wa = np.sqrt(np.abs(e - batch.at("edge", begin)))
    wb = np.sqrt(np.abs(e - batch.at("edge", end)))
    none = wa + wb == 0
    wa, wb = np.where(none, 1.0, wa)[..., None], np.where(none, 1.0, wb)[..., None]
    tau = batch.tau
    w = wa + tau * (wb - wa)
    share = tau * (2 * wa + tau * (wb - wa)) / (wa + wb)
    rate = 2 * w / (wa + wb)
    span = (end - begin)[..., None]
    s = begin[..., None] + span * share
    x = e[..., None] - batch.at("edge", s)
    m = energy_mass(x, batch.at("mass", s), batch.at("inverse_gap", s))
    value = np.sqrt(np.abs(x) * m / H2M) * rate
    total: Floats = np.abs(end - begin) * (value * batch.weight).sum(axis=-1)
    return total


def next_order(batch: Batch, energies: Floats, inside: npt.NDArray[np.bool_],
               any_allowed: npt.NDArray[np.bool_]) -> Floats:
    """Return -1/48 of the finite part of the integral of Q'' Q^(-3/2) dy, the next correction.

    Equal to (1/24) d/dl of the integral of Q'' / sqrt(Q + l) dy (Dunham, Phys. Rev. 41, 713,
    1932); with dQ/dE = w, d/dE of the integral of (Q''/w) / sqrt(Q) dy is the same, and a
    turning point is free to move. The faces' own terms are in their Airy models.
    """
    e = np.broadcast_to(energies[None, :], inside.shape)
    low, high = batch.edge[0][:, None], batch.edge[1][:, None]
    room = np.where(inside, np.minimum(e - low, high - e), np.where(any_allowed, e - high, 1.0))
    step = 0.02 * np.maximum(room, 1e-9)
    total = np.zeros(inside.shape)
    for factor, at in ((1 / 12, -2), (-2 / 3, -1), (2 / 3, 1), (-1 / 12, 2)):
        total += factor * _bent(batch, e, e + at * step)
    return np.where(any_allowed, total / (24 * step), 0.0)


def _bent(batch: Batch, base: Floats, energies: Floats) -> Floats:
    """Return the integral of (Q''/w) / sqrt(Q) dy at ``energies``, Q''/w taken at ``base``."""
    turn = batch.turning(energies)[..., None]
    s = turn * (1 - batch.tau**2)
    jacobian = 2 * turn * batch.tau
    h = 3e-4 * batch.length[:, None, None]
    centre = np.clip(s, h, batch.length[:, None, None] - h)
    e = base[..., None]
    q, rate, m = [], [], []
    for at in (-1.0, 0.0, 1.0):
        z = centre + at * h
        x = e - batch.at("edge", z)
        mass = batch.at("mass", z)
        m.append(energy_mass(x, mass, batch.at("inverse_gap", z)))
        q.append(x / (H2M * m[-1]))
        rate.append(mass / (H2M * m[-1] ** 2))
    q2 = 2 * ((q[2] - q[1]) / (m[2] + m[1]) - (q[1] - q[0]) / (m[1] + m[0])) / (h * h * m[1])
    x = energies[..., None] - batch.at("edge", s)
    mass = energy_mass(x, batch.at("mass", s), batch.at("inverse_gap", s))
    root = np.sqrt(np.maximum(x / (H2M * mass), 1e-300))
    total: Floats = (batch.weight * jacobian * q2 / rate[1] * mass / root).sum(axis=-1)
    return total
