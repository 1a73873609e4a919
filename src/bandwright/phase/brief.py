"""Elements of pieces too brief for a phase: across less than half a wave the equation is followed.

Action and amplitude are the leading terms of a series in what changes within one wave. A piece
much shorter than a wave has no phase of its own to speak of, however little its edge varies, so
its element is worked out by Magnus slices (Iserles & Norsett, Phil. Trans. R. Soc. A 357, 983,
1999; fourth order, two Gauss nodes), which become exact as the piece gets shorter.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from ..solver.matrix import Elements
from .maps import rise
from .pieces import Batch, energy_mass

Floats = npt.NDArray[np.float64]

_SLICES = 16
_BRIEF = (1.5, 2.5)  # action plus decay [rad]: below the first followed, above the second not


def blended(batch: Batch, energies: Floats, extent: Floats, elements: Elements) -> Elements:
    """Return the elements with those of brief pieces followed by slices.

    Parameters
    ----------
    batch : Batch
    energies : array (n_energies,)
        Energies [eV].
    extent : array (n_pieces, n_energies)
        Action plus decay of each piece [rad].
    elements : Elements
        Elements of the phase integral, read from the low face to the high one.

    Linear pieces of the one-band model stay with Airy functions, which are exact; a section that
    is all there is between two walls keeps its plain condition, action = n pi.
    """
    share = shares(batch, extent)
    rows = np.flatnonzero((share > 0).any(axis=1))
    if not len(rows):
        return elements
    share = share[rows]
    left, right, off = (a.copy() for a in elements[:3])
    for mine, new in zip((left, right, off), followed(batch, rows, energies), strict=True):
        mine[rows] = np.where(share < 1, (1 - share) * mine[rows], 0.0) + np.where(
            share > 0, share * new, 0.0)
    return Elements(left, right, off, elements.clamped)


def shares(batch: Batch, extent: Floats) -> Floats:
    """Return what share of each piece's element comes from slices, (n_pieces, n_energies)."""
    share = 1 - rise((extent - _BRIEF[0]) / (_BRIEF[1] - _BRIEF[0]))
    return np.where(batch.alone | batch.exact, 0.0, share)


def followed(batch: Batch, rows: npt.NDArray[np.int64], energies: Floats
             ) -> tuple[Floats, Floats, Floats]:
    """Return A/B, D/B and 1/B of these pieces from the low face to the high one."""
    h = batch.length[rows, None] / _SLICES
    place = (np.arange(_SLICES)[:, None] + 0.5 + np.array([-0.5, 0.5]) / np.sqrt(3.0)) / _SLICES
    edge, mass, gap = (batch.slices(name, place)[rows][..., None]
                       for name in ("edge", "mass", "inverse_gap"))
    x = energies - edge  # (n_rows, n_slices, 2, n_energies)
    m = energy_mass(x, mass, gap)
    x = x / H2M
    b = 0.5 * h[..., None] * (m[:, :, 0] + m[:, :, 1])
    c = -0.5 * h[..., None] * (x[:, :, 0] + x[:, :, 1])
    turn = m[:, :, 1] * x[:, :, 0] - m[:, :, 0] * x[:, :, 1]
    a = -np.sqrt(3.0) / 12 * (h * h)[..., None] * turn
    even, odd = _exponential(a * a + b * c)
    steps = even + a * odd, b * odd, c * odd, even - a * odd
    start = (steps[i][:, 0] for i in range(4))
    ta, tb, tc, td = start
    for j in range(1, _SLICES):
        sa, sb, sc, sd = (step[:, j] for step in steps)
        ta, tb, tc, td = sa * ta + sb * tc, sa * tb + sb * td, sc * ta + sd * tc, sc * tb + sd * td
    return ta / tb, td / tb, 1 / tb


def _exponential(square: Floats) -> tuple[Floats, Floats]:
    """Return cosh r and sinh(r) / r for r^2 = ``square`` of either sign."""
    r = np.sqrt(np.minimum(np.abs(square), 1e4))
    small = r < 1e-3
    safe = np.where(small, 1.0, r)
    odd = np.where(square > 0, np.sinh(safe), np.sin(safe)) / safe
    return np.where(square > 0, np.cosh(r), np.cos(r)), np.where(small, 1 + square / 6, odd)
