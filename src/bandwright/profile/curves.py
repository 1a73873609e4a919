"""Curves along a section from functions of the depth, exact where they can be."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import chebyshev, polynomial

from .sections import Curve, Floats, Polynomial, Sampled

_DEGREE = 24
_NODES = np.cos(np.pi * (np.arange(_DEGREE + 1) + 0.5) / (_DEGREE + 1))
# interpolation at Chebyshev's nodes: coefficients are sums of cosines (DLMF 3.11.11)
_TO_SERIES = 2.0 / (_DEGREE + 1) * chebyshev.chebvander(_NODES, _DEGREE).T
_TO_SERIES[0] *= 0.5
_NEGLIGIBLE = 2e-15
_FEW = 400


@dataclass(frozen=True, slots=True)
class Series:
    """A Chebyshev series on a section of given thickness [nm]; picklable, quick to evaluate."""

    coefficients: tuple[float, ...]
    thickness: float

    def __call__(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        place = 2.0 * np.asarray(depth, dtype=float) / self.thickness - 1.0
        series = np.array(self.coefficients)
        if place.size > _FEW:
            return np.asarray(chebyshev.chebval(place, series))
        angle = np.arccos(
            np.clip(place, -1.0, 1.0)
        )  # T_k(cos a) = cos(k a): few calls for few depths
        return np.asarray(np.cos(angle[..., None] * np.arange(len(series))) @ series)


def straight(first: float, last: float, thickness: float) -> Polynomial:
    """Return the line through the values at both faces."""
    if first == last:
        return Polynomial((first,))
    return Polynomial((first, (last - first) / thickness))


def fit_depths(thickness: float) -> Floats:
    """Return the depths [nm] at which `fitted` wants its values."""
    return np.asarray(0.5 * thickness * (1.0 + _NODES))


def fitted(values: Floats, thickness: float, function: Callable[[Floats], Floats]) -> Curve:
    """Return a smooth function of the depth as a polynomial, a Chebyshev series, or itself.

    ``values`` are the function's at `fit_depths`. Degree two and less become polynomials; a
    function that a series of degree 24 does not hold to rounding stays as it is.
    """
    series = _TO_SERIES @ values
    size = float(np.max(np.abs(values))) or 1.0
    large = np.flatnonzero(np.abs(series) > _NEGLIGIBLE * size)
    degree = int(large[-1]) if len(large) else 0
    if degree > _DEGREE - 4:
        return Sampled(function)
    series = series[: degree + 1]
    if degree > 2:
        return Sampled(Series(tuple(map(float, series)), thickness))
    powers = chebyshev.cheb2poly(series)
    shifted: Floats = np.zeros(1)
    for power, coefficient in enumerate(powers):
        term = coefficient * polynomial.polypow([-1.0, 2.0 / thickness], power)
        shifted = np.asarray(polynomial.polyadd(shifted, term), dtype=float)
    return Polynomial(tuple(map(float, shifted)))


def least(curve: Curve, thickness: float) -> float:
    """Return the true minimum of a curve on its section, between sampled places by a search."""
    if isinstance(curve, Polynomial) and curve.degree <= 1:
        first, *slope = curve.coefficients
        return min(first, first + slope[0] * thickness) if slope else first
    places = np.linspace(0.0, thickness, 257)
    values = curve.at(places)
    best = int(np.argmin(values))
    if best in (0, 256):
        near = places[1] * 1e-6
        if curve.value(near if best == 0 else thickness - near) >= values[best]:
            return float(values[best])  # it rises into the section: the face is the lowest
    low, high = places[max(best - 1, 0)], places[min(best + 1, 256)]
    from scipy.optimize import minimize_scalar  # a quarter second that flat stacks need not pay

    found = minimize_scalar(
        lambda s: float(curve.at(np.array([s]))[0]),
        bounds=(low, high), method="bounded", options={"xatol": 1e-9 * thickness},
    )  # fmt: skip
    return float(min(values[best], found.fun))
