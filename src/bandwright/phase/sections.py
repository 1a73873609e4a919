"""Elements of the phase integral: one for each stretch on which the edge rises or falls.

Flat sections are exact; linear ones in the one-band model are exact by Airy functions. All
others use the action and the amplitude sqrt(m/k), with the pi/4 of a smooth turning point
inside and the local Airy or parabolic model of `maps` at their faces; those much shorter than a
wave are followed by slices (`brief`). Cutting a section in two changes nothing: smooth
neighbours are joined first (`joints`).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from ..errors import SolveError
from ..profile import Profile, Sampled, Section
from ..solver.matrix import Elements
from .brief import blended, shares
from .corrections import between_walls, next_order, smooth_edge
from .joints import joined
from .maps import (
    Face,
    airy_face,
    bottom_exponent,
    bottom_face,
    rise,
    top_exponent,
    top_face,
    top_phase,
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

    def followed(self, energies: Floats) -> npt.NDArray[np.bool_]:
        """Return whether, at each energy [eV], every piece without an exact element is brief.

        Such pieces are followed by slices, as shooting does; False where there are none.
        """
        every = np.ones(len(energies), dtype=bool)
        some = False
        for batch in self.batches:
            if batch is not None and not batch.exact.all():
                p = phases(batch, energies)
                share = shares(batch, p.action + p.decay)
                every &= (share[~batch.exact[:, 0]] > 0.5).all(axis=0)
                some = True
        return every & some

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
    found = Elements(left - p.low.slope, right + p.high.slope, off,
                     np.maximum(clamped, 0.0).astype(np.int64))
    return blended(batch, energies, p.action + p.decay, found)


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
        low, high = between_walls(batch, energies, low, high)
    total = action + low.shift
    if order == 1 and batch.plain[1].any():  # joins the plain condition at the wall's own edge
        lost = np.pi / 12 * (1 - rise(high.distance / 0.5))
        total = total - np.where(inside & batch.plain[1][:, None], lost, 0.0)
    total = total + np.where(top, np.pi / 4 + peak, np.where(inside, np.pi / 4, -high.shift))
    high_exponent = np.where(top, over * top_exponent(theta), decay + _HALF_LN2 + high.shift)
    height = np.where(inside, 2 * (action + peak) / np.pi, np.abs(low_q) * batch.bottom**2)
    round_, weight, phase = smooth_edge(batch, energies, turn, low_q, high_q, action, decay)
    larger = np.where(bottom, bottom_exponent(height), 0.0)
    larger = np.where(inside, larger * round_, larger)
    weight = np.where(high_q > 0, over * weight, weight)
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
