"""What the solution looks like at a face: modulus and phase on an Airy or a parabolic model.

In the variable y = integral of m dz the equation is u'' = -Q u with Q = (E - V) / (h2m m). Two
solutions a (dying out towards the high side) and b (growing) are written

    allowed:    a = M sin(Theta),  b = M cos(Theta),  Theta' = -1 / M^2
    forbidden:  a = N exp(-S),     b = N exp(S),      S' = 1 / (2 N^2)

with a b' - a' b = 1. Far from a turning point M^2 = Q^-1/2 (amplitude sqrt(m/k)) and Theta is
the action from the turning point plus pi/4. Near one, the local slope of Q gives M and the
rest of Theta by Airy functions (Langer, Phys. Rev. 51, 669, 1937); at the bottom of a well or
the top of a barrier its curvature does, by parabolic cylinder functions (DLMF 12.2, 12.14;
Miller & Good, Phys. Rev. 91, 174, 1953).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt
from scipy.special import airy, gammaln, loggamma

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]

_FAR = 10.0  # beyond it the series below are good to 1e-11, and scipy's airy is slow
_MODULUS = (1.0, 5 / 32, 1155 / 2048, 425425 / 65536, 1301375075 / 8388608)
_PHASE = (0.0, 5 / 32, 1105 / 6144, 82825 / 65536, 1282031525 / 58720256)
_NONE = 1e12  # a scaled distance that stands for "no turning point anywhere near"


class Face(NamedTuple):
    """One face of every piece at every energy, shape (n_pieces, n_energies) each.

    ``square`` is M^2 where ``allowed``, else 2 N^2 [nm]; ``slope`` is (ln M)' or (ln N)' along
    y towards the high side [1/nm]; ``shift`` is what Theta or S has beyond the action, and
    ``distance`` |Q| / |Q'|^(2/3), the scaled distance from a turning point.
    """

    allowed: Mask
    square: Floats
    slope: Floats
    shift: Floats
    distance: Floats


def _series(x: Floats, sign: float) -> tuple[Floats, Floats, Floats]:
    """Return the asymptotic series at x, ``sign`` -1 on the allowed side (DLMF 9.8.20, 9.8.22)."""
    c = sign * x**-3.0
    factor = np.asarray(np.polynomial.polynomial.polyval(c, _MODULUS), dtype=np.float64)
    derivative = -3 * np.polynomial.polynomial.polyval(c, [k * a for k, a in enumerate(_MODULUS)])
    phase: Floats = 2 / 3 * x**1.5 * np.polynomial.polynomial.polyval(c, _PHASE)
    return factor, (-0.5 + derivative / factor) / (2 * x), phase


def allowed_modulus(distance: Floats) -> tuple[Floats, Floats, Floats]:
    """Return Airy's modulus and phase at -distance, as corrections to the plain amplitude.

    Parameters
    ----------
    distance : array
        Scaled distance x >= 0 from the turning point.

    Returns
    -------
    factor, logarithmic, phase : arrays
        pi sqrt(x) (Ai^2 + Bi^2) [DLMF 9.8.20]; half the logarithmic derivative of Ai^2 + Bi^2
        with respect to x; the phase beyond (2/3) x^(3/2) + pi/4 [DLMF 9.8.22].
    """
    near = distance < _FAR
    x = distance[near]
    ai, aip, bi, bip = airy(-x)
    square = ai * ai + bi * bi
    turn = np.arctan2(ai, bi) - 2.0 / 3.0 * x**1.5 - np.pi / 4
    far = np.where(near, _FAR, np.minimum(distance, _NONE))
    factor, logarithmic, phase = _series(far, -1.0)
    factor[near] = np.pi * np.sqrt(x) * square
    logarithmic[near] = -(ai * aip + bi * bip) / square
    phase[near] = turn - 2 * np.pi * np.round(turn / (2 * np.pi))
    return factor, logarithmic, phase


def forbidden_modulus(distance: Floats) -> tuple[Floats, Floats, Floats]:
    """Return the same on the forbidden side, from sqrt(Ai Bi) and half ln(Bi / Ai).

    Returns
    -------
    factor, logarithmic, exponent : arrays
        2 pi sqrt(x) Ai Bi; half the logarithmic derivative of Ai Bi with respect to x; the
        exponent beyond (2/3) x^(3/2) + (ln 2) / 2 (DLMF 9.7).
    """
    near = distance < _FAR
    x = distance[near]
    ai, aip, bi, bip = airy(x)
    far = np.where(near, _FAR, np.minimum(distance, _NONE))
    factor, logarithmic, exponent = _series(far, 1.0)
    factor[near] = 2 * np.pi * np.sqrt(x) * ai * bi
    logarithmic[near] = 0.5 * (aip / ai + bip / bi)
    exponent[near] = 0.5 * np.log(bi / (2 * ai)) - 2.0 / 3.0 * x**1.5
    return factor, logarithmic, exponent


def airy_face(q: Floats, slope: Floats) -> Face:
    """Return a face where Q = ``q`` and Q' = ``slope``, by the Airy functions of that slope.

    For a linear Q this is exact.
    """
    steep = np.maximum(np.abs(slope), 1e-300)
    with np.errstate(over="ignore"):
        x = np.minimum(np.abs(q) * steep ** (-2.0 / 3.0), _NONE)
    sign = np.sign(slope)
    allowed = q > 0
    scale = steep ** (1.0 / 3.0)
    m_factor, m_log, phase = allowed_modulus(np.where(allowed, x, _NONE))
    n_factor, n_log, exponent = forbidden_modulus(np.where(allowed, _NONE, x))
    root = np.sqrt(np.maximum(np.abs(q), 1e-300))
    tiny = x < 1e-8  # at the turning point: Ai, Bi at zero instead of 0 / 0
    ai, _, bi, _ = airy(0.0)
    square = np.where(
        allowed,
        np.where(tiny, np.pi * (ai * ai + bi * bi) / scale, m_factor / root),
        np.where(tiny, 2 * np.pi * ai * bi / scale, n_factor / root),
    )
    return Face(
        allowed,
        square,
        np.where(allowed, m_log * sign * scale, -n_log * sign * scale),
        np.where(allowed, -sign * phase, -sign * exponent),
        np.maximum(x, 1e-6),
    )


def rise(x: Floats) -> Floats:
    """Return 0 for x <= 0, 1 for x >= 1, and a smooth rise between."""
    t = np.clip(x, 0.0, 1.0)
    smooth: Floats = t * t * (3 - 2 * t)
    return smooth


def gamma_ratio(height: Floats) -> Floats:
    """Return Gamma(1/4 + h/2) / Gamma(3/4 + h/2) for h >= 0."""
    h = np.minimum(height, 1e8)
    ratio: Floats = np.exp(gammaln(0.25 + h / 2) - gammaln(0.75 + h / 2))
    return np.where(height > 1e6, np.sqrt(2 / np.maximum(height, 1.0)), ratio)


def bottom_face(q: Floats, scale: Floats) -> Face:
    """Return a face at the bottom of a parabolic well, ``scale`` = (2 |Q''|)^(-1/4) [nm].

    From U(a, 0) and U'(a, 0), DLMF 12.2.6 and 12.2.7.
    """
    allowed = q > 0
    square = scale * gamma_ratio(np.abs(q) * scale * scale) / np.sqrt(2.0)
    none = np.zeros_like(q)
    return Face(allowed, square, none, none, none + _NONE)


def top_face(q: Floats, scale: Floats) -> Face:
    """Return a face at the top of a parabolic barrier; it counts as forbidden at any energy.

    From W(a, 0), DLMF 12.14.2.
    """
    a = np.minimum(np.abs(q) * scale * scale, 1e8)
    ratio = np.exp((loggamma(0.25 + 0.5j * a) - loggamma(0.75 + 0.5j * a)).real)
    none = np.zeros_like(q)
    return Face(none > 0, scale * ratio / np.sqrt(2.0), none, none, none + _NONE)


def bottom_exponent(height: Floats) -> Floats:
    """Return half the logarithm of sqrt(2 pi) (h/e)^h / Gamma(h + 1/2), the bottom's amplitude.

    The factor by which the state of a parabolic well is larger outside than the plain
    amplitude says (Furry, Phys. Rev. 71, 360, 1947).
    """
    h = np.maximum(np.minimum(height, 1e8), 1e-300)
    exact = 0.5 * (0.5 * np.log(2 * np.pi) + h * (np.log(h) - 1) - gammaln(h + 0.5))
    amplitude: Floats = np.where(height > 1e4, 1 / (48 * h), exact)
    return amplitude


def top_phase(height: Floats) -> Floats:
    """Return half of arg Gamma(1/2 + i a) - a ln|a| + a, the phase a barrier's top adds.

    Positive ``height`` a is below the top (DLMF 12.14.17; Ford, Hill, Wakano, Wheeler,
    Ann. Phys. 7, 239, 1959).
    """
    a = np.where(height == 0, 1e-300, height)
    large = np.abs(a) > 1e4
    safe = np.where(large, 1.0, a)
    exact = 0.5 * (loggamma(0.5 + 1j * safe).imag - safe * np.log(np.abs(safe)) + safe)
    phase: Floats = np.where(large, 1 / (48 * a), exact)
    return phase


def top_exponent(theta: Floats) -> Floats:
    """Return half of arsinh(exp(2 theta)): theta + (ln 2)/2 deep below the top, 0 far above."""
    capped = np.minimum(theta, 300.0)
    near = 0.5 * np.arcsinh(np.exp(2 * capped))
    exponent: Floats = np.where(theta > 17.0, theta + 0.5 * np.log(2.0), near)
    return exponent


def edge_phase(k: Floats, kappa: Floats) -> Floats:
    """Return what a smooth edge between two levels adds to the pi/4 of its turning point.

    For Q = k^2 - (k^2 + kappa^2) / (1 + exp(-y/l)), whose solutions are hypergeometric
    (Eckart, Phys. Rev. 35, 1303, 1930): from the step's arctan(k/kappa) - pi/4 at l = 0 to 0
    for a wide edge.

    Parameters
    ----------
    k, kappa : arrays
        k l and kappa l, both >= 0.
    """
    k = np.clip(k, 1e-12, 1e4)
    kappa = np.clip(kappa, 0.0, 1e4)
    action = k * np.log(4 * k * k / (k * k + kappa * kappa)) - 2 * kappa * np.arctan2(k, kappa)
    far = (loggamma(kappa + 1j * k) + loggamma(1 + kappa + 1j * k) - loggamma(2j * k)).imag
    phase: Floats = np.pi / 4 - action - far
    return phase


def trough_phase(depth: Floats, bend: Floats) -> Floats:
    """Return what each side of a rounded trough between level flanks adds to its pi/4.

    For Q = q - depth tanh^2(y/l), ``bend`` = sqrt(2 |Q''|) at the bottom: the exact levels of
    Poeschl & Teller, Z. Phys. 83, 143 (1933), have l - 1/2 where the action alone gives
    sqrt(l (l - 1)).
    """
    x = 2 * np.maximum(depth, 0.0) / np.maximum(bend, 1e-100)
    phase: Floats = np.pi / 2 * 0.25 / (np.sqrt(0.25 + x * x) + x)
    return phase
