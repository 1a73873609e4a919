"""How each level's energy answers a small change of the profile, exact to first order.

With u, p = u'/m normalised, <i|i> = 1, and changes at fixed fractional depth of each section,

    dE = int dV u^2 - h2m dm p^2 dz  -  sum over sections of (dh/h) int J dz ,
    J = h2m m(E) p^2 + (E - V) u^2 ,

dm at fixed E. The equation's functional is stationary at a state, which gives the first part; a
section stretched by dh scales dz by 1 + dh/h and d/dz by its inverse, which gives the second. With
products of two states instead of squares it is what couples one to the other, at the energy of
one of them.
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
from .propagation import MASS_FLOOR, local_mass
from .slices import Slices

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: a slice across which h^2 m |E - V| / h2m is smaller is a cubic, to 1e-9
_SMALL = 1e-4
#: a tail that falls by a smaller exponent is a polynomial, to 1e-12
_FALLS = 1e-2
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(10)


class Reach(NamedTuple):
    """What states weigh changes by along a stretch of the structure, or beyond its end.

    Attributes
    ----------
    section : array (n_points,)
    depth : array (n_points,)
        Depth in the section [nm].
    presence : array (n_levels, n_points)
        u^2 dz.
    kinetic : array (n_levels, n_points)
        h2m p^2 dz [eV/m0].
    beyond : bool
        Whether it lies outside, where nothing is stretched.
    """

    section: Indices
    depth: Floats
    presence: Floats
    kinetic: Floats
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
    reaches = sorted(reaches, key=lambda one: (one.section[0], one.section[-1]))
    section = np.concatenate([one.section for one in reaches])
    whole = profile.numbers.thickness
    share = np.concatenate([one.depth for one in reaches]) / whole[section]
    presence = np.concatenate([one.presence for one in reaches], axis=1)
    kinetic = np.concatenate([one.kinetic for one in reaches], axis=1)
    stretched = np.concatenate([np.full(len(one.depth), not one.beyond) for one in reaches])
    edge, mass, inverse_gap = numbers_at(profile, section, share)
    above = energies[:, None] - edge
    bracket = 1.0 + above * inverse_gap
    free = bracket > MASS_FLOOR
    bracket = np.where(free, bracket, MASS_FLOOR)
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
        if here.start == here.stop:  # materials are not asked about no point at all
            continue
        one = profile.sections[index]
        edge[here] = one.edge.at(depth[here])
        mass[here] = one.mass.at(depth[here])
        inverse_gap[here] = one.inverse_gap.at(depth[here])
    return edge, mass, inverse_gap


def tail_reaches(
    profile: Profile, position: float, outward: float, decay: Floats, presence: Floats,
    kinetic: Floats, at_points: bool = True,
) -> list[Reach]:  # fmt: skip
    """Return the tails of states that fall off from a position inside the outer section on.

    Parameters
    ----------
    profile : Profile
    position : float
        Where they begin to fall as exp(-decay s) [nm].
    outward : float
        -1 or 1.
    decay, presence, kinetic : array (n_levels,)
        [1/nm], u^2 and h2m p^2 there.
    at_points : bool
        Whether changes may vary in any way there; otherwise two points hold both moments.
    """
    row = 0 if outward < 0 else len(profile.sections) - 1
    face, start = float(profile.faces[row if outward < 0 else -1]), float(profile.faces[row])
    length = outward * (face - position)
    found = []
    if length > 1e-12 * profile.thickness:
        if at_points:
            cells = max(1, int(np.ceil(length * float(decay.max()) / 1.5)))
            width = length / cells
            s = (width * (np.arange(cells)[:, None] + 0.5 * (1.0 + _NODES))).reshape(-1)
            weight = np.tile(0.5 * width * _WEIGHTS, cells) * np.exp(-2.0 * decay[:, None] * s)
        else:
            s = np.array([0.0, length])
            weight = _falling(decay, length)
        rows = np.full(len(s), row)
        depth = position + outward * s - start
        found.append(Reach(rows, depth, weight * presence[:, None], weight * kinetic[:, None]))
    left = (0.5 / decay * np.exp(-2.0 * decay * length))[:, None]
    found.append(
        Reach(np.array([row]), np.array([face - start]), left * presence[:, None],
              left * kinetic[:, None], True)
    )  # fmt: skip
    return found


def _falling(decay: Floats, length: float) -> Floats:
    """Return weights at both ends with the integral and first moment of exp(-2 decay s)."""
    x = 2.0 * decay * length
    whole = -np.expm1(-x) / (2.0 * decay)
    few = 0.5 + x * (-1.0 / 3.0 + x * (1.0 / 8.0 + x * (-1.0 / 30.0 + x / 144.0)))
    moment = np.where(
        x > _FALLS, (-np.expm1(-x) - x * np.exp(-x)) / (2.0 * decay) ** 2, length**2 * few
    )
    return np.stack([whole - moment / length, moment / length], axis=1)


def flat_reach(slices: Slices, energies: Floats, u: Floats) -> Reach:
    """Return what states weigh changes by in flat slices: two points a slice, its faces.

    With J = h2m m p^2 + (E - V) u^2, which is constant in a flat slice, s from its first face, and
    [..] what changes across it,

        int h2m m p^2 + (E - V) u^2 = J h ,        int h2m m p^2 - (E - V) u^2 = h2m [u p] ,

    and the same with s under the integral: J h^2/2 and h2m [s u p] - h2m [u^2]/(2m). Two weights
    at the faces hold both moments, so that anything linear across a slice is weighed exactly.

    Parameters
    ----------
    slices : Slices
        All flat.
    energies : array (n_levels,)
    u : array (n_slices + 1, n_levels)
        At the slices' faces.
    """
    elements = slices.elements(energies)
    one, two = u[:-1], u[1:]
    p_one = elements.off * two - elements.left * one
    p_two = elements.right * two - elements.off * one
    h, edge = slices.thickness[:, None], slices.edge[:, None]
    mass, _ = local_mass(energies, edge, slices.mass[:, None], slices.inverse_gap[:, None])
    above = energies - edge
    ends = [(H2M * mass * p * p, above * v * v) for v, p in ((one, p_one), (two, p_two))]
    sizes = [k + np.abs(a) for k, a in ends]
    # where a state falls off, J is the small difference of what its smaller face holds
    flux = np.where(sizes[0] < sizes[1], sum(ends[0]), sum(ends[1]))
    risen = H2M * two * p_two
    turned = risen - H2M * one * p_one
    lean = h * risen - H2M * (two * two - one * one) / (2.0 * mass)
    kinetic = 0.5 * (flux * h + turned)
    leaning = 0.5 * (0.5 * flux * h * h + lean)
    small = np.abs(h * h * mass * above) < _SMALL * H2M
    divisor = np.where(small, 1.0, above)
    presence = (flux * h - kinetic) / divisor
    centred = (0.5 * flux * h * h - leaning) / divisor
    if small.any():
        row, _ = np.nonzero(small)
        width, heavy = slices.thickness[row], mass[small]
        presence[small], centred[small] = _bent(
            width, one[small], two[small], width * heavy * p_one[small],
            width * heavy * p_two[small],
        )  # fmt: skip
    faces = np.stack([slices.start, slices.start + slices.thickness], axis=1).reshape(-1)
    return Reach(
        np.repeat(slices.section, 2), faces,
        _at_faces(presence, centred / h), _at_faces(kinetic / mass, leaning / (mass * h)),
    )  # fmt: skip


def _bent(
    width: Floats, one: Floats, two: Floats, rise_one: Floats, rise_two: Floats
) -> tuple[Floats, Floats]:
    """Return the integrals of u^2 and s u^2 of cubics by their values and slopes at both faces."""
    s = 0.5 * (1.0 + _NODES)[:, None]
    t = 1.0 - s
    u = (
        one * (1.0 + 2.0 * s) * t**2 + two * (3.0 - 2.0 * s) * s**2
        + rise_one * s * t**2 - rise_two * t * s**2
    )  # fmt: skip
    weight = 0.5 * _WEIGHTS[:, None] * u * u
    return width * weight.sum(axis=0), width**2 * (s * weight).sum(axis=0)


def _at_faces(whole: Floats, centred: Floats) -> Floats:
    """Return weights at both faces of each slice by their sum and first moment, one row a level."""
    both = np.stack([whole - centred, centred], axis=1)
    return np.asarray(both.reshape(2 * len(whole), -1).T)
