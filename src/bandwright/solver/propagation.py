"""One slice at one energy: x cot x and x / sin x, the mass, and the Magnus exponent.

A slice's propagator is the exponential of a traceless matrix [[x, a], [c, -x]], whose square is
-t times the unit matrix. With f = sqrt(t) cot sqrt(t) and g = sqrt(t) / sin sqrt(t), its
elements of K are A/B = (f + x)/a, D/B = (f - x)/a and 1/B = g/a; x = 0 in a constant slice.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import H2M

Floats = npt.NDArray[np.float64]
Product = Callable[[Floats, Floats], Floats]

# Coefficients of t^0, t^1, ... of x cot x and x / sin x with t = x^2 (DLMF 4.19.6, 4.19.4).
_F = (1.0, -1 / 3, -1 / 45, -2 / 945, -1 / 4725, -2 / 93555, -1382 / 638512875)
_G = (1.0, 1 / 6, 7 / 360, 31 / 15120, 127 / 604800, 73 / 3421440, 1414477 / 653837184000)
_POWERS = np.arange(len(_F) - 1.0)[:, None]
# of their derivatives by w = t/4
_SLOPES = np.array([_F, _G])[:, 1:] * (1.0 + _POWERS.T) * 4.0 ** (1.0 + _POWERS.T)
_SERIES_BELOW = 0.005
#: the two-band mass never falls below this share of the band-edge mass
MASS_FLOOR = 0.05


class Exponent(NamedTuple):
    """A traceless 2x2 matrix [[x, a], [c, -x]]: the exponent of a slice's propagator."""

    x: Floats
    a: Floats
    c: Floats


def half_wave_functions(w: Floats) -> tuple[Floats, Floats]:
    """Return ``x cot x`` and ``x / sin x`` at w = x^2/4, hyperbolic for w < 0; no overflow.

    With y = sqrt|w| and T = tan y or tanh y: y/T - s y T and y/T + s y T, s = sign w.

    Parameters
    ----------
    w : array
        Squared half phase of a slice [rad^2]; negative where the state decays.
    """
    half = np.abs(w)
    half += 1e-36  # keeps 0/0 off w = 0
    np.sqrt(half, out=half)
    # both tangents everywhere and a choice of one cost a third of calls with a mask
    tangent = np.tan(half)
    np.putmask(tangent, w < 0.0, np.tanh(half))
    ratio = half / tangent
    np.copysign(half, w, out=half)
    half *= tangent
    return np.subtract(ratio, half, out=tangent), np.add(ratio, half, out=ratio)


def half_wave_slopes(w: Floats, f: Floats, g: Floats) -> tuple[Floats, Floats]:
    """Return the derivatives of `half_wave_functions` with respect to w."""
    small = np.abs(w) < _SERIES_BELOW
    some = np.count_nonzero(small)
    twice = w + w
    if some:
        twice[small] = 1.0
    df = g * g
    np.subtract(f, df, out=df)
    df /= twice
    dg = 1.0 - f
    dg *= g
    dg /= twice
    if some:
        df[small], dg[small] = _SLOPES @ w[small] ** _POWERS
    return df, dg


def local_mass(
    energy: Floats, edge: Floats, mass: Floats, inverse_gap: Floats
) -> tuple[Floats, Floats]:
    """Return m(E) and dm/dE of the two-band model, floored far below the edge.

    Kane's m(E) = m [1 + (E - V)/Eg], its bracket never below `MASS_FLOOR`, with dm/dE = 0
    where the floor holds, so that counts stay right. dm/dE has the shape of the mass where no
    bracket is at the floor.
    """
    bracket = 1.0 + (energy - edge) * inverse_gap
    free = bracket > MASS_FLOOR
    if free.all():
        return mass * bracket, mass * inverse_gap
    return mass * np.where(free, bracket, MASS_FLOOR), mass * np.where(free, inverse_gap, 0.0)


def tilted(
    thickness: Floats, edge: Floats, mass: Floats, inverse_gap: Floats, drop: Floats
) -> tuple[Floats, Floats, Floats, Floats, Floats, Floats, Floats]:
    """Return the 6th-order Magnus exponent of linear slices as polynomials of E - V.

    With constant band-edge mass and gap everything is linear in z and in E, and the commutator
    [A1, A2] is a constant. Only where the mass is off its floor.

    Parameters
    ----------
    thickness, edge, mass, inverse_gap, drop : array (n_slices, ...)
        Thickness [nm], edge at the middle [eV], band-edge mass, 1/gap [1/eV], rise of the edge
        across the slice [eV].

    Returns
    -------
    tuple of array
        x0, x1, a0, c0, c1, x2, a1: with e = E - V at the middle, x = x0 + x1 e + x2 e^2,
        a = a0 + a1 e, c = c0 + c1 e; x2 and a1 are zero in the one-band model.
    """
    a0 = thickness * mass
    a1 = a0 * inverse_gap
    c1 = -thickness / H2M
    twist = -c1 * drop * a0
    small = twist * drop / 120.0
    bent = 1.0 + twist * twist / 3600.0
    turn = twist / 180.0 * c1
    return (
        -twist / 12.0, turn * a0, bent * a0 - small * a1, small * c1, bent * c1, turn * a1,
        bent * a1,
    )  # fmt: skip


def magnus(a: Floats, c: Floats, times: Product = np.multiply) -> Exponent:
    """Return the 6th-order Magnus exponent of slices.

    Blanes, Casas, Oteo & Ros, Phys. Rep. 470, 151 (2009), three Gauss points a slice.

    Parameters
    ----------
    a, c : array (3, ...)
        h m(E) and -h (E - V)/h2m at the Gauss points: the propagator's generator there.
    times : callable
        Product of two entries, where they are more than numbers (see `dual_product`).
    """
    fifteen = np.sqrt(15.0) / 3.0
    a1, a2, a3 = a[1], fifteen * (a[2] - a[0]), (10 / 3) * (a[2] - 2.0 * a[1] + a[0])
    c1, c2, c3 = c[1], fifteen * (c[2] - c[0]), (10 / 3) * (c[2] - 2.0 * c[1] + c[0])
    turn = times(a1, c2) - times(a2, c1)
    pa, pc = -20.0 * a1 - a3, -20.0 * c1 - c3
    qx = (times(a3, c1) - times(a1, c3)) / 30.0
    qa, qc = a2 + times(a1, turn) / 30.0, c2 - times(c1, turn) / 30.0
    return Exponent(
        (times(pa, qc) - times(qa, pc)) / 240.0,
        a1 + a3 / 12.0 + (times(turn, qa) - times(pa, qx)) / 120.0,
        c1 + c3 / 12.0 + (times(pc, qx) - times(turn, qc)) / 120.0,
    )


def dual_product(p: Floats, q: Floats) -> Floats:
    """Return the product of values stacked with their derivatives along the first axis."""
    return np.stack((p[0] * q[0], p[0] * q[1] + p[1] * q[0]))


def curved(thickness: Floats, edge: Floats, mass: Floats, inverse_gap: Floats) -> Exponent:
    """Return the 6th-order Magnus exponent of slices as polynomials of E - V.

    V is the edge at the middle. Only where the mass is off its floor: there the degree is
    known, and values at as many energies give the coefficients.

    Parameters
    ----------
    thickness : array (n_slices, ...)
        [nm]
    edge, mass, inverse_gap : array (3, n_slices, ...)
        At the Gauss points [eV, m0, 1/eV].

    Returns
    -------
    Exponent
        Of arrays (1 + degree, n_slices, ...), ascending powers.
    """
    if inverse_gap.any():
        degrees = (4, 5, 5)
    elif (mass == mass[1]).all():
        degrees = (1, 0, 1)
    else:
        degrees = (2, 2, 3)
    nodes, inverse = _interpolation(max(degrees))
    above = (edge[1] - edge)[:, None] + nodes.reshape(-1, *(1,) * thickness.ndim)
    local = mass[:, None] * (1.0 + above * inverse_gap[:, None])
    found = magnus(thickness * local, -(thickness / H2M) * above)
    return Exponent(
        *(
            np.tensordot(inverse[: degree + 1], values, 1)
            for degree, values in zip(degrees, found, strict=True)
        )
    )


@lru_cache(maxsize=8)
def _interpolation(degree: int) -> tuple[Floats, Floats]:
    """Return energies within 1 eV, and what makes coefficients of values there."""
    nodes = np.cos(np.pi * (np.arange(degree + 1) + 0.5) / (degree + 1))
    return nodes, np.linalg.inv(np.vander(nodes, increasing=True))
