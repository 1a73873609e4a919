"""A dense spectral-element solve: the other way of an engineer who wants digits.

Elements of one degree on cut sections, walls at the outer faces, then `scipy.linalg.eigh` for the
levels asked. The truth itself comes from `physics.dense`, which has finer elements, polishes and
counts.
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import eigh

from bandwright.constants import H2M
from physics.elements import basis


def elements(plain, longest):
    """Return section, left depth and length of each element no longer than ``longest`` [nm]."""
    thickness = np.diff(plain.faces)
    parts = np.maximum(1, np.ceil(thickness / longest - 1e-9)).astype(int)
    section = np.repeat(np.arange(len(parts)), parts)
    within = np.arange(len(section)) - np.repeat(np.cumsum(parts) - parts, parts)
    length = (thickness / parts)[section]
    return section, within * length, length


def along(powers, section, depth):
    """Value of a piecewise polynomial at depths (n_elements, n_points) of given sections."""
    value = np.zeros_like(depth)
    for row in powers[::-1]:
        value = value * depth + row[section][:, None]
    return value


def solve(plain, degree, longest, levels, *, states=False):
    """Return the lowest levels of the one-band model, and the coefficients of their states."""
    x, w, value, slope = basis(degree, degree + 3)
    section, left, length = elements(plain, longest)
    depth = left[:, None] + 0.5 * length[:, None] * (x + 1.0)
    weight = 0.5 * length[:, None] * w
    kinetic = H2M * weight / along(plain.mass, section, depth) * (2.0 / length[:, None]) ** 2
    stiff = (slope.T * kinetic[:, None, :]) @ slope
    stiff += (value.T * (weight * along(plain.edge, section, depth))[:, None, :]) @ value
    mass = (value.T * weight[:, None, :]) @ value
    size = degree * len(section) + 1
    whole = np.zeros((2, size, size))
    for i in range(len(section)):
        here = slice(i * degree, (i + 1) * degree + 1)
        whole[0, here, here] += stiff[i]
        whole[1, here, here] += mass[i]
    inside = whole[:, 1:-1, 1:-1]
    return eigh(
        inside[0], inside[1], subset_by_index=[0, levels - 1], eigvals_only=not states,
        check_finite=False,
    )  # fmt: skip


def grid(question, tolerance):
    """Return (degree, longest element) of the fewest unknowns that hold a true error; not timed."""
    best, least = None, np.inf
    for longest in (np.inf, 12.0, 6.0, 3.0):
        count = len(elements(question.plain, longest)[0])
        for degree in range(2, 40):
            unknowns = degree * count - 1
            if unknowns >= min(least, 4000):
                break
            if unknowns < question.levels:
                continue
            found = solve(question.plain, degree, longest, question.levels)
            if question.error(found) <= tolerance:
                best, least = (degree, longest), unknowns
                break
    if best is None:
        raise RuntimeError(f"no elements hold {tolerance} eV")
    return best
