"""One slice at one energy: x cot x and x / sin x, the mass, and the Magnus exponent.

A slice's propagator is the exponential of a traceless matrix [[x, a], [c, -x]], whose square is
-t times the unit matrix. With f = sqrt(t) cot sqrt(t) and g = sqrt(t) / sin sqrt(t), its
elements of K are A/B = (f + x)/a, D/B = (f - x)/a and 1/B = g/a; x = 0 in a constant slice.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import H2M

Floats = npt.NDArray[np.float64]

# Coefficients of t^0, t^1, ... of x cot x and x / sin x with t = x^2 (DLMF 4.19.6, 4.19.4).
_F = (1.0, -1 / 3, -1 / 45, -2 / 945, -1 / 4725, -2 / 93555, -1382 / 638512875)
_G = (1.0, 1 / 6, 7 / 360, 31 / 15120, 127 / 604800, 73 / 3421440, 1414477 / 653837184000)
_SERIES_BELOW = 0.02
#: the two-band mass never falls below this share of the band-edge mass
MASS_FLOOR = 0.05


class Exponent(NamedTuple):
    """A traceless 2x2 matrix [[x, a], [c, -x]]: the exponent of a slice's propagator."""

    x: Floats
    a: Floats
    c: Floats


def half_wave_functions(t: Floats) -> tuple[Floats, Floats]:
    """Return ``x cot x`` and ``x / sin x`` at t = x^2, hyperbolic for t < 0; no overflow.

    With y = sqrt|t|/2 and T = tan y or tanh y: (y/T)(1 - s T^2) and (y/T)(1 + s T^2), s = sign t.

    Parameters
    ----------
    t : array
        Squared phase of a slice [rad^2]; negative where the state decays.
    """
    half = np.sqrt(np.abs(t))
    half *= 0.5
    np.maximum(half, 1e-9, out=half)
    decays = t < 0.0
    tangent = np.tanh(half, where=decays, out=np.empty_like(half))
    np.tan(half, where=~decays, out=tangent)
    ratio = half / tangent
    square = np.where(decays, -tangent, tangent)
    square *= tangent
    square *= ratio
    return ratio - square, ratio + square


def half_wave_slopes(t: Floats, f: Floats, g: Floats) -> tuple[Floats, Floats]:
    """Return the derivatives of `half_wave_functions` with respect to t."""
    small = np.abs(t) < _SERIES_BELOW
    some = small.any()
    twice = 2.0 * (np.where(small, 1.0, t) if some else t)
    df = (f - g * g) / twice
    dg = g * (1.0 - f) / twice
    if some:
        df[small] = _series_slope(_F, t[small])
        dg[small] = _series_slope(_G, t[small])
    return df, dg


def _series_slope(coefficients: tuple[float, ...], t: Floats) -> Floats:
    slope = np.zeros_like(t)
    for power in range(len(coefficients) - 1, 0, -1):
        slope = slope * t + power * coefficients[power]
    return slope


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


def magnus(
    thickness: Floats, energy: Floats, edge: Floats, mass: Floats, slope: Floats
) -> tuple[Exponent, Exponent]:
    """Return the 6th-order Magnus exponent of slices and its derivative by E.

    Blanes, Casas, Oteo & Ros, Phys. Rep. 470, 151 (2009), three Gauss points a slice.

    Parameters
    ----------
    thickness : array (n_slices, 1)
        Slice thicknesses [nm].
    energy : array (n_energies,)
        Energies [eV].
    edge : array (3, n_slices, 1)
        Edge at the Gauss points [eV].
    mass, slope : array (3, n_slices, n_energies)
        m(E) and dm/dE at the Gauss points.
    """
    a = thickness * mass
    c = -(thickness / H2M) * (energy - edge)
    da = thickness * slope
    dc = np.broadcast_to(-thickness / H2M, a.shape[1:])
    zero = np.zeros(a.shape[1:])
    fifteen = np.sqrt(15.0) / 3.0

    one = Exponent(zero, a[1], c[1])
    two = Exponent(zero, fifteen * (a[2] - a[0]), fifteen * (c[2] - c[0]))
    three = Exponent(zero, (10 / 3) * (a[2] - 2 * a[1] + a[0]), (10 / 3) * (c[2] - 2 * c[1] + c[0]))
    d_one = Exponent(zero, da[1], dc)
    d_two = Exponent(zero, fifteen * (da[2] - da[0]), zero)
    d_three = Exponent(zero, (10 / 3) * (da[2] - 2 * da[1] + da[0]), zero)

    first = _bracket(one, two)
    d_first = _mix((1, _bracket(d_one, two)), (1, _bracket(one, d_two)))
    inner, d_inner = _mix((2, three), (1, first)), _mix((2, d_three), (1, d_first))
    second = _bracket(one, inner)
    d_second = _mix((1, _bracket(d_one, inner)), (1, _bracket(one, d_inner)))
    p = _mix((-20, one), (-1, three), (1, first))
    d_p = _mix((-20, d_one), (-1, d_three), (1, d_first))
    q = _mix((1, two), (-1 / 60, second))
    d_q = _mix((1, d_two), (-1 / 60, d_second))
    omega = _mix((1, one), (1 / 12, three), (1 / 240, _bracket(p, q)))
    turn = _mix((1, _bracket(d_p, q)), (1, _bracket(p, d_q)))
    return omega, _mix((1, d_one), (1 / 12, d_three), (1 / 240, turn))


def _bracket(p: Exponent, q: Exponent) -> Exponent:
    """Return the commutator of two traceless 2x2 matrices."""
    return Exponent(
        p.a * q.c - q.a * p.c, 2.0 * (p.x * q.a - p.a * q.x), 2.0 * (p.c * q.x - p.x * q.c)
    )


def _mix(*terms: tuple[float, Exponent]) -> Exponent:
    """Return the weighted sum of exponents."""
    weight, term = terms[0]
    x, a, c = weight * term.x, weight * term.a, weight * term.c
    for weight, term in terms[1:]:
        x, a, c = x + weight * term.x, a + weight * term.a, c + weight * term.c
    return Exponent(x, a, c)
