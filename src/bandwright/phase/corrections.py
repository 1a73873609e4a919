"""What is added to the phase beyond action and pi/4: edges, hard walls, the next order."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from .maps import Face, edge_phase, rise, trough_phase
from .pieces import Batch, energy_mass

Floats = npt.NDArray[np.float64]


def between_walls(batch: Batch, energies: Floats, low: Face, high: Face) -> tuple[Face, Face]:
    """Take what the Airy models add to the phase at hard walls away, above the piece's edge.

    There is no turning point there, and the condition is the plain one, action = n pi.
    """
    bottom, top = (edge[:, None] for edge in batch.edge)
    near = rise((top - energies) / np.maximum(0.2 * (top - bottom), 1e-300))
    wall = batch.plain[..., None]
    plain_high = wall[1] & high.allowed
    return (low._replace(shift=np.where(wall[0], near * low.shift, low.shift)),
            high._replace(shift=np.where(plain_high, 0.0, high.shift)))


def smooth_edge(batch: Batch, energies: Floats, turn: Floats, low_q: Floats, high_q: Floats,
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
