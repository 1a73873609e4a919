"""Profile -> slices, and slices -> the elements of K(E) with their derivative.

A flat section is exact in one slice, cut only so that no slice holds half a wave at the
highest energy asked: then K has no poles and its derivative is smooth. A varying section is cut
for the 6th-order Magnus exponent.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from bandwright.constants import H2M
from bandwright.profile import Profile, Section
from bandwright.solver.matrix import Elements
from bandwright.solver.propagation import (
    half_wave_functions,
    half_wave_slopes,
    local_mass,
    magnus,
)

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

_GAUSS = 0.5 + 0.5 * np.sqrt(0.6) * np.array([-1.0, 0.0, 1.0])
#: largest phase of a slice [rad], at the highest energy; a pole would stand at pi
PHASE_LIMIT = 2.0
#: most slices one profile may take
MOST_SLICES = 2_000_000


@dataclass(frozen=True)
class Slices:
    """Slices in growth order.

    Attributes
    ----------
    thickness : array (n_slices,)
        [nm]
    section : array (n_slices,)
        Index of each slice's section.
    start : array (n_slices,)
        Depth of the slice's first face in its section [nm].
    edge, mass, inverse_gap : array (3, n_slices)
        Values at the three Gauss points.
    varying : array of int
        Which slices vary along z; the others are constant.
    counts : array (n_sections,)
        Slices a section.
    """

    profile: Profile
    counts: Indices
    section: Indices
    start: Floats
    thickness: Floats
    edge: Floats
    mass: Floats
    inverse_gap: Floats
    varying: Indices
    constant: Indices

    @property
    def faces(self) -> Floats:
        """Positions of all slice faces [nm], shape (n_slices + 1,)."""
        return np.asarray(np.concatenate(([0.0], np.cumsum(self.thickness))))

    def halved(self) -> Slices:
        """Return the same profile with every slice cut in two."""
        return cut(self.profile, 2 * self.counts)

    def elements(self, energies: Floats) -> Elements:
        """Return the elements at each energy [eV], see `Elements`."""
        return self._elements(energies, slopes=False)[0]

    def elements_and_slopes(self, energies: Floats) -> tuple[Elements, Elements]:
        """Return the elements and their exact derivatives by E."""
        return self._elements(energies, slopes=True)

    def _elements(self, energies: Floats, slopes: bool) -> tuple[Elements, Elements]:
        energies = np.asarray(energies, dtype=float)
        shape = (len(self.thickness), len(energies))
        value, slope = _blank(shape), _blank(shape)
        for which, part in ((self.constant, _constant), (self.varying, _varying)):
            if len(which):
                for target, source in zip(
                    (value, slope), part(self, which, energies, slopes), strict=False
                ):
                    for column, numbers in zip(target, source, strict=True):
                        column[which] = numbers
        return value, slope


def _blank(shape: tuple[int, int]) -> Elements:
    return Elements(
        np.empty(shape), np.empty(shape), np.empty(shape), np.zeros(shape, dtype=np.int64)
    )


def _constant(
    slices: Slices, which: Indices, energies: Floats, slopes: bool
) -> tuple[Elements, ...]:
    edge = slices.edge[1, which, None]
    h = slices.thickness[which, None]
    mass, b = local_mass(
        energies, edge, slices.mass[1, which, None], slices.inverse_gap[1, which, None]
    )
    above = energies - edge
    t = (h * h / H2M) * mass * above
    f, g = half_wave_functions(t)
    a = h * mass
    side, off = f / a, g / a
    value = Elements(side, side, off, _half_waves(t))
    if not slopes:
        return (value,)
    df, dg = half_wave_slopes(t, f, g)
    dt = (h * h / H2M) * (b * above + mass)
    da = h * b
    d_side = (df * dt - side * da) / a
    return value, Elements(d_side, d_side, (dg * dt - off * da) / a, value.clamped)


def _varying(
    slices: Slices, which: Indices, energies: Floats, slopes: bool
) -> tuple[Elements, ...]:
    edge = slices.edge[:, which, None]
    mass, b = local_mass(
        energies, edge, slices.mass[:, which, None], slices.inverse_gap[:, which, None]
    )
    omega, d_omega = magnus(slices.thickness[which, None], energies, edge, mass, b)
    x, a, c = omega
    t = -(x * x + a * c)
    f, g = half_wave_functions(t)
    left, right, off = (f + x) / a, (f - x) / a, g / a
    value = Elements(left, right, off, _half_waves(t))
    if not slopes:
        return (value,)
    dx, da, dc = d_omega
    df, dg = half_wave_slopes(t, f, g)
    dt = -(2.0 * x * dx + a * dc + da * c)
    d_left, d_right = (df * dt + dx - left * da) / a, (df * dt - dx - right * da) / a
    return value, Elements(d_left, d_right, (dg * dt - off * da) / a, value.clamped)


def _half_waves(t: Floats) -> Indices:
    return np.asarray(np.sqrt(np.maximum(t, 0.0)) // np.pi, dtype=np.int64)


def cut(profile: Profile, counts: Sequence[int] | Indices) -> Slices:
    """Cut each section of a profile into that many equal slices."""
    counts = np.asarray(counts, dtype=np.int64)
    section = np.repeat(np.arange(len(counts)), counts)
    within = np.arange(len(section)) - np.repeat(np.cumsum(counts) - counts, counts)
    whole = np.array([s.thickness for s in profile.sections])
    thickness = (whole / counts)[section]
    start = within * thickness
    return slice_at(profile, counts, section, start, thickness)


def slice_at(
    profile: Profile, counts: Indices, section: Indices, start: Floats, thickness: Floats
) -> Slices:
    """Return slices at given places of given sections, sampled at their Gauss points."""
    shape = (3, len(section))
    edge, mass, inverse_gap = np.empty(shape), np.empty(shape), np.empty(shape)
    depth = start + _GAUSS[:, None] * thickness
    bounds = np.searchsorted(section, np.arange(len(profile.sections) + 1))
    flat = np.array([s.flat for s in profile.sections])
    for index, part in enumerate(profile.sections):
        here = slice(bounds[index], bounds[index + 1])
        if flat[index]:
            edge[:, here] = _first(part.edge)
            mass[:, here] = _first(part.mass)
            inverse_gap[:, here] = _first(part.inverse_gap)
        elif bounds[index] < bounds[index + 1]:
            edge[:, here] = part.edge.at(depth[:, here])
            mass[:, here] = part.mass.at(depth[:, here])
            inverse_gap[:, here] = part.inverse_gap.at(depth[:, here])
    varying = ~flat[section]
    return Slices(
        profile, counts, section, start, thickness, edge, mass, inverse_gap,
        np.flatnonzero(varying), np.flatnonzero(~varying),
    )  # fmt: skip


def _first(curve: object) -> float:
    return curve.coefficients[0]  # type: ignore[attr-defined,no-any-return]


def needed(profile: Profile, high: float, tolerance: float) -> Indices:
    """Return how many slices each section needs for levels up to ``high`` [eV].

    With k3 = (m F / h2m)^(1/3) of the steepest place, k4 likewise of the curvature, and the
    largest wave number k: steps of a fixed share of 1/k3, 1/k4, 1/k; the share falls with the
    sixth root of the tolerance.
    """
    share = (max(tolerance, 1e-13) / 1e-6) ** (1 / 6)
    counts = np.array([_section_need(s, high, share) for s in profile.sections])
    if len(counts) == 1:  # a face between two walls, so that K has a row
        counts = np.maximum(counts, 2)
    return counts


def _section_need(section: Section, high: float, share: float) -> int:
    if section.flat:
        edge, mass, inverse_gap = (
            np.array(_first(c)) for c in (section.edge, section.mass, section.inverse_gap)
        )
        local, _ = local_mass(np.array(high), edge, mass, inverse_gap)
        phase = section.thickness * np.sqrt(np.maximum(local * (high - edge), 0.0) / H2M)
        return max(1, int(np.ceil(phase / PHASE_LIMIT)))
    points = np.linspace(0.0, section.thickness, 33)
    step = points[1]
    edge = section.edge.at(points)
    mass, _ = local_mass(
        np.array(high), edge, section.mass.at(points), section.inverse_gap.at(points)
    )
    heavy = np.maximum(mass, section.mass.at(points))
    steep = np.abs(np.gradient(edge, step))
    bent = np.abs(np.gradient(np.gradient(edge, step), step))
    drift = float(np.max(np.abs(np.gradient(np.log(mass), step))))
    k3 = float(np.max(heavy * steep / H2M)) ** (1 / 3)
    k4 = float(np.max(heavy * bent / H2M)) ** (1 / 4)
    wave = float(np.max(np.sqrt(np.maximum(mass * (high - edge), 0.0) / H2M)))
    rate = max(k3 / 0.36, k4 / 0.5, wave / 1.2, drift / 1.0) / share
    rate = max(rate, wave / PHASE_LIMIT * 1.5)
    return max(1, int(np.ceil(section.thickness * rate)))
