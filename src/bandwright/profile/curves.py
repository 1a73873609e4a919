"""Curves along a section from functions of the depth, exact where they can be."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.polynomial import chebyshev

from .sections import Curve, Floats, Number, Polynomial, Sampled, Unlike, is_zero

_DEGREE = 24
_NODES = np.cos(np.pi * (np.arange(_DEGREE + 1) + 0.5) / (_DEGREE + 1))
# interpolation at Chebyshev's nodes: coefficients are sums of cosines (DLMF 3.11.11)
_TO_SERIES = 2.0 / (_DEGREE + 1) * chebyshev.chebvander(_NODES, _DEGREE).T
_TO_SERIES[0] *= 0.5
_DEGREES = np.arange(_DEGREE + 1)
_NEGLIGIBLE = 2e-15
_FEW = 400


@dataclass(frozen=True, slots=True)
class Series:
    """A Chebyshev series on a section of given thickness [nm]; picklable, quick to evaluate."""

    coefficients: tuple[Number, ...]
    thickness: Number

    def __call__(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        place = np.clip(2.0 * np.asarray(depth, dtype=float) / self.thickness - 1.0, -1.0, 1.0)
        series = np.array(self.coefficients)
        if series.ndim > 1 or place.size > _FEW:
            return np.asarray(chebyshev.chebval(place, series, tensor=False))
        angle = np.arccos(place)  # T_k(cos a) = cos(k a): few calls for few depths
        return np.asarray(np.cos(angle[..., None] * np.arange(len(series))) @ series)


def straight(first: Number, last: Number, thickness: Number) -> Polynomial:
    """Return the line through the values at both faces."""
    if is_zero(last - first):
        return Polynomial((first,))
    return Polynomial((first, (last - first) / thickness))


def fit_depths(thickness: Number) -> Floats:
    """Return the depths [nm] at which `fitted` wants its values."""
    return np.asarray(np.multiply.outer(0.5 * (1.0 + _NODES), thickness))


def fitted(
    values: Floats, thickness: Number, function: Callable[[Floats], Floats],
    negligible: float = _NEGLIGIBLE,
) -> Curve:  # fmt: skip
    """Return a smooth function of the depth as a polynomial, a Chebyshev series, or itself.

    ``values`` are the function's at `fit_depths`. Degree two and less become polynomials; a
    function that a series of degree 24 does not hold to rounding stays as it is; ``negligible`` is
    what counts as rounding, by the largest value.

    Raises
    ------
    Unlike
        If many designs don't all end as the same of these.
    """
    series = _TO_SERIES @ values
    size = np.max(np.abs(values), axis=0)
    large = np.abs(series) > negligible * np.where(size > 0.0, size, 1.0)
    degrees = np.where(large, _DEGREES.reshape(-1, *(1,) * (large.ndim - 1)), 0).max(axis=0)
    degree = int(degrees.max())
    if values.ndim > 1:
        kinds = np.minimum(degrees, 3)
        if (kinds != kinds[0]).any() or degree > _DEGREE - 4:
            raise Unlike("a grade is of one degree in some designs and of another in others")
    if degree > _DEGREE - 4:
        return Sampled(function)
    series = series[: degree + 1]
    if degree > 2:
        return Sampled(Series(_plain(series), thickness))
    first, *rest = series
    if not rest:
        return Polynomial(_plain(series))
    stretch = 2.0 / thickness
    if degree == 1:  # T_1 = place, place = stretch * depth - 1
        return Polynomial(_plain((first - rest[0], rest[0] * stretch)))
    slope, bend = rest  # T_2 = 2 place^2 - 1
    return Polynomial(
        _plain((first - slope + bend, (slope - 4.0 * bend) * stretch, 2.0 * bend * stretch**2))
    )


def _plain(numbers: Iterable[Any]) -> tuple[Number, ...]:
    """Return plain floats; numbers of many designs stay arrays."""
    return tuple(number if np.ndim(number) else float(number) for number in numbers)


def least(curve: Curve, thickness: Number) -> Any:
    """Return the true minimum of a curve on its section, found between ever closer places."""
    if isinstance(curve, Polynomial) and curve.degree <= 1:
        first, *slope = curve.coefficients
        return smaller(first, first + slope[0] * thickness) if slope else first
    if isinstance(curve, Polynomial) and curve.degree == 2:
        slope, bend = curve.coefficients[1:3]
        if np.all(bend != 0.0):  # the vertex, or the face nearest to it
            nearest = np.clip(-0.5 * slope / bend, 0.0, thickness)
            faces = smaller(curve.value(0.0), curve.value(thickness))
            return smaller(faces, curve.value(nearest))
    low: Any = np.zeros_like(thickness)
    high, points = thickness, 257
    for _ in range(6):
        places = np.linspace(low, high, points)
        values = curve.at(places)
        best = np.argmin(values, axis=0)
        step = (high - low) / (points - 1)
        middle = low + best * step
        low, high, points = np.maximum(middle - step, low), np.minimum(middle + step, high), 33
    found = np.min(values, axis=0)
    return found if np.ndim(found) else float(found)


def smaller(one: Number, other: Number) -> Any:
    """Return the smaller number, design by design."""
    if isinstance(one, float) and isinstance(other, float):
        return min(one, other)
    return np.minimum(one, other)
