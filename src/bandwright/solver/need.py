"""How many slices each section needs for an energy and a tolerance."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from ..errors import SolveError
from ..profile import Profile, Sampled, Section
from ..profile.curves import Series
from .propagation import local_mass

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: largest phase of a slice [rad], at the highest energy; a pole would stand at pi
PHASE_LIMIT = 2.0
# shares of each error term's own length that a slice takes at a tolerance of 1e-6 eV, and the least
# slices a radian at the highest energy: random stacks then stay some three times below it
_TILTED, _SLOPE, _BEND, _DRIFT, _WAVE = 0.48, 0.42, 0.44, 0.42, 0.75
#: most slices one profile may take
MOST_SLICES = 2_000_000


def needed(
    profile: Profile, high: float | Floats, tolerance: float, ends: tuple[str, str]
) -> Indices:
    """Return how many slices each section needs for levels up to ``high`` [eV], (n_sections,).

    Of many designs ``high`` is (n_designs,) and the result (n_sections, n_designs).

    A flat outer section with an open end needs none: it goes on for ever from its inner face.

    With k3 = (m F / h2m)^(1/3) of the steepest place and q the largest wave number or decay rate,
    the 6th-order Magnus exponent leaves terms like (k3^3 q^4) h^7: slices of a fixed share of
    (k3^3 q^4)^(-1/7), likewise for curvature and a varying mass; the share falls with the sixth
    root of the tolerance. Flat sections only keep each slice below `PHASE_LIMIT`.
    """
    numbers = profile.numbers
    above = np.maximum(high - numbers.lowest, 0.0)
    local = numbers.mass * (1.0 + above * numbers.inverse_gap)
    wave = np.sqrt(local * above / H2M)
    counts = np.ceil(wave * numbers.thickness / PHASE_LIMIT)
    if not numbers.all_flat:
        share = (max(tolerance, 1e-13) / 1e-6) ** (1 / 6)
        heavy = local / H2M
        depth = np.maximum(above, numbers.lowest - numbers.lowest.min(axis=0))
        steep = (heavy * np.abs(numbers.slope)) ** (1 / 3)
        rate = _mixed(steep, np.sqrt(heavy * depth), 3) / (_TILTED * share)
        rate = np.maximum(rate, _WAVE * wave)
        tilted = np.flatnonzero(~numbers.flat)
        counts[tilted] = np.ceil(numbers.thickness * rate)[tilted]
        for index in np.flatnonzero(numbers.curved):
            section = profile.sections[index]
            for curve in (section.edge, section.mass, section.inverse_gap):
                if isinstance(curve, Sampled) and not isinstance(curve.function, Series):
                    _refuse_jump(curve, section.thickness, profile.name(int(index)))
            counts[index] = _curved_need(section, high, share)
    counts = np.maximum(counts, 1).astype(np.int64)
    first, last = (
        int(end == "open" and numbers.flat[row]) for end, row in zip(ends, (0, -1), strict=True)
    )
    if first + last < len(counts):
        if first:
            counts[0] = 0
        if last:
            counts[-1] = 0
    # a face between two walls, so that K has a row
    return np.where(counts.sum(axis=0) == 1, 2 * counts, counts)


def _refuse_jump(curve: Sampled, thickness: Any, name: str) -> None:
    """Raise `SolveError` if a curve jumps inside its section: slices would not see where."""
    low, high = np.zeros_like(thickness), np.asarray(thickness)
    for _ in range(6):  # ever closer around the steepest step
        places = np.linspace(low, high, 129)
        steps = np.abs(np.diff(curve.at(places), axis=0))
        worst = np.argmax(steps, axis=0)
        step = np.take_along_axis(steps, worst[None], axis=0)[0]
        if (step < 1e-9).all():
            return
        part = (high - low) / 128
        low, high = low + worst * part, low + (worst + 1) * part
    jumps = np.ravel((high - low < 1e-6 * thickness) & (step > 1e-6))
    if jumps.any():
        where = int(np.argmax(jumps))
        raise SolveError(
            f"the shape jumps by {np.ravel(step)[where]:.4g} about {np.ravel(low)[where]:.6g} nm"
            " from the first face; write two layers there",
            name,
        )


def _curved_need(section: Section, high: Floats | float, share: float) -> Floats:
    points = np.linspace(0.0, section.thickness, 33)
    step = points[1]
    edge, mass0 = section.edge.at(points), section.mass.at(points)
    mass, _ = local_mass(np.asarray(high), edge, mass0, section.inverse_gap.at(points))
    heavy = np.maximum(mass, mass0)
    tilt = np.gradient(edge, axis=0) / step
    steep = np.abs(tilt)
    bent = np.abs(np.gradient(tilt, axis=0) / step)
    drift = np.abs(np.gradient(np.log(mass), axis=0) / step)
    k3 = (heavy * steep / H2M) ** (1 / 3)
    k4 = (heavy * bent / H2M) ** (1 / 4)
    wave = np.sqrt(mass * np.maximum(high - edge, 0.0) / H2M)
    reach = np.sqrt(heavy * np.maximum(np.abs(high - edge), edge - edge.min(axis=0)) / H2M)
    rates = (
        _mixed(k3, reach, 3) / _SLOPE,
        _mixed(k4, reach, 4) / _BEND,
        _mixed(drift, reach, 1) / _DRIFT,
    )
    rate = np.max(rates, axis=(0, 1)) / share
    return np.asarray(np.ceil(section.thickness * np.maximum(rate, _WAVE * wave.max(axis=0))))


def _mixed(rate: Floats, reach: Floats, power: int) -> Floats:
    """Return the rate of an error term rate^power reach^(7 - power) h^7."""
    return np.asarray((rate**power * np.maximum(rate, reach) ** (7 - power)) ** (1 / 7))
