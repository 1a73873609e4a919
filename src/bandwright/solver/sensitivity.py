"""How each level's energy answers a small change of the profile, exact to first order.

With u, p = u'/m normalised, <i|i> = 1, and changes at fixed fractional depth of each section,

    dE = int dV u^2 - h2m dm p^2 dz  -  sum over sections of (dh/h) int J dz ,
    J = h2m m(E) p^2 + (E - V) u^2 ,

dm at fixed E. The equation's functional is stationary at a state, which gives the first part; a
section stretched by dh scales dz by 1 + dh/h and d/dz by its inverse, which gives the second.
Beyond an open end edge, mass and gap are those of the outer face and u falls as exp(-kappa s):
that weighs like 1/(2 kappa) nm at the face.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from ..profile import Profile
from .propagation import MASS_FLOOR

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(10)


class Reach(NamedTuple):
    """States along a stretch of the structure, or beyond its end.

    Attributes
    ----------
    section : array (n_points,)
    depth : array (n_points,)
        Depth in the section [nm].
    weight : array (n_points,) or (n_levels, n_points)
        Of the integral along z [nm].
    u, p : array (n_levels, n_points)
    beyond : bool
        Whether it lies outside, where nothing is stretched.
    """

    section: Indices
    depth: Floats
    weight: Floats
    u: Floats
    p: Floats
    beyond: bool = False


class Sensitivity(NamedTuple):
    """Weights of dE = edge @ dV + mass @ dm + inverse_gap @ d(1/Eg) + thickness @ dh.

    Attributes
    ----------
    section : array (n_points,)
        Section of each point, ascending.
    share : array (n_points,)
        Its fractional depth there, 0 to 1.
    edge, mass, inverse_gap : array (n_levels, n_points)
        [1], [eV/m0], [eV^2]
    thickness : array (n_levels, n_sections)
        [eV/nm]
    """

    section: Indices
    share: Floats
    edge: Floats
    mass: Floats
    inverse_gap: Floats
    thickness: Floats


def sensitivity(profile: Profile, energies: Floats, reaches: Sequence[Reach]) -> Sensitivity:
    """Return what small changes of a profile do to each level.

    m(E) = m (1 + (E - V)/Eg), so that dV also takes m/Eg off the mass; where the bracket stands
    at its floor only the band-edge mass counts.

    Parameters
    ----------
    profile : Profile
    energies : array (n_levels,)
    reaches : sequence of Reach
        Of the normalised states, the whole of the structure and what lies beyond open ends.
    """
    reaches = sorted(reaches, key=lambda reach: (reach.section[0], reach.section[-1]))
    section = np.concatenate([reach.section for reach in reaches])
    whole = profile.numbers.thickness
    share = np.concatenate([reach.depth for reach in reaches]) / whole[section]
    u, p = (np.concatenate(some, axis=1) for some in zip(*(r[3:5] for r in reaches), strict=True))
    shape = (len(energies),)
    weight = np.concatenate(
        [np.broadcast_to(r.weight, shape + r.depth.shape) for r in reaches], axis=1
    )
    stretched = np.concatenate([np.full(len(r.depth), not r.beyond) for r in reaches])
    edge, mass, inverse_gap = numbers_at(profile, section, share)
    above = energies[:, None] - edge
    bracket = 1.0 + above * inverse_gap
    free = bracket > MASS_FLOOR
    bracket = np.where(free, bracket, MASS_FLOOR)
    presence = weight * u * u
    kinetic = weight * p * p * H2M
    rising = np.where(free, kinetic * mass, 0.0)
    stress = (kinetic * (mass * bracket) + above * presence) * stretched
    present, starts = np.unique(section, return_index=True)
    thickness = np.zeros((len(energies), len(whole)))
    thickness[:, present] = -np.add.reduceat(stress, starts, axis=1) / whole[present]
    return Sensitivity(
        section, share, presence + rising * inverse_gap, -kinetic * bracket, -rising * above,
        thickness,
    )  # fmt: skip


def numbers_at(profile: Profile, section: Indices, share: Floats) -> tuple[Floats, Floats, Floats]:
    """Return edge, mass and inverse gap at fractional depths of sections, each (n_points,).

    Parameters
    ----------
    profile : Profile
    section : array (n_points,)
        Ascending.
    share : array (n_points,)
    """
    numbers = profile.numbers
    depth = share * numbers.thickness[section]
    edge = numbers.edge[section] + numbers.slope[section] * depth
    mass, inverse_gap = numbers.mass[section], numbers.inverse_gap[section]
    for index in np.flatnonzero(numbers.curved):
        here = slice(*np.searchsorted(section, [index, index + 1]))
        one = profile.sections[index]
        edge[here] = one.edge.at(depth[here])
        mass[here] = one.mass.at(depth[here])
        inverse_gap[here] = one.inverse_gap.at(depth[here])
    return edge, mass, inverse_gap


def tail_reaches(
    profile: Profile, position: float, outward: float, decay: Floats, u: Floats, p: Floats
) -> list[Reach]:
    """Return the tails of states that fall off from a position inside the outer section on.

    Parameters
    ----------
    profile : Profile
    position : float
        Where they begin to fall as exp(-decay s) [nm].
    outward : float
        -1 or 1.
    decay, u, p : array (n_levels,)
        [1/nm], and the values there.
    """
    row = 0 if outward < 0 else len(profile.sections) - 1
    face, start = float(profile.faces[row if outward < 0 else -1]), float(profile.faces[row])
    length = outward * (face - position)
    found = []
    if length > 1e-12 * profile.thickness:
        cells = max(1, int(np.ceil(length * float(decay.max()) / 1.5)))
        width = length / cells
        s = (width * (np.arange(cells)[:, None] + 0.5 * (1.0 + _NODES))).reshape(-1)
        weight = np.tile(0.5 * width * _WEIGHTS, cells)
        falling = np.exp(-decay[:, None] * s)
        depth = position + outward * s - start
        rows = np.full(len(s), row)
        found.append(Reach(rows, depth, weight, u[:, None] * falling, p[:, None] * falling))
    left = np.exp(-decay * length)[:, None]
    found.append(
        Reach(np.array([row]), np.array([face - start]), 0.5 / decay[:, None], u[:, None] * left,
              p[:, None] * left, True)
    )  # fmt: skip
    return found
