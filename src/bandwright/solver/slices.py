"""Profile -> slices, and slices -> the elements of K(E) with their derivative.

A flat section is exact in one slice, cut only so that no slice holds half a wave at the
highest energy asked: then K has no poles and its derivative is smooth. A varying section is cut
for the 6th-order Magnus exponent.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Protocol

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from ..profile import Profile
from .matrix import Elements
from .propagation import (
    MASS_FLOOR,
    Exponent,
    half_wave_functions,
    half_wave_slopes,
    local_mass,
    magnus,
    tilted,
)

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

_GAUSS = 0.5 * np.sqrt(0.6) * np.array([[-1.0], [0.0], [1.0]])
#: repeated slices are evaluated once from this many slices on
_MANY = 24


class Kind(Protocol):
    """Evaluates slices of one kind, made from their numbers as columns."""

    def __init__(self, *numbers: Floats) -> None: ...

    def __call__(self, energies: Floats, slopes: bool, owner: Indices | None = None) -> Elements:
        """Return the elements at each energy, stacked with their derivatives if ``slopes``.

        ``owner`` gives each energy's column of the numbers; None is one column for all.
        """
        ...


@dataclass(frozen=True)
class Slices:
    """Slices in growth order; all arrays (n_slices,) unless said otherwise.

    Attributes
    ----------
    counts : array (n_sections,)
        Slices a section.
    section, start : array
        Index of each slice's section, and the depth of its first face there [nm].
    thickness : array
        [nm]
    edge, mass, inverse_gap : array
        Values at the middle [eV, m0, 1/eV].
    drop : array
        Rise of the edge across the slice [eV].
    flat, curved : bool or array of bool
        Whether a slice is constant, or neither constant nor linear.
    """

    profile: Profile
    counts: Indices
    section: Indices
    start: Floats
    thickness: Floats
    edge: Floats
    mass: Floats
    inverse_gap: Floats
    drop: Floats
    flat: npt.NDArray[np.bool_]
    curved: npt.NDArray[np.bool_]

    def __len__(self) -> int:
        return len(self.thickness)

    @cached_property
    def faces(self) -> Floats:
        """Positions of all slice faces [nm], shape (n_slices + 1,)."""
        start = self.profile.faces[self.section[0]]
        return np.asarray(start + np.concatenate(([0.0], np.cumsum(self.thickness))))

    def halved(self) -> Slices:
        """Return the same profile with every slice cut in two."""
        return cut(self.profile, 2 * self.counts)

    def elements(self, energies: Floats) -> Elements:
        """Return the elements at each energy [eV], see `Elements`."""
        return self._elements(energies, slopes=False)

    def elements_and_slopes(self, energies: Floats) -> Elements:
        """Return the elements and their exact derivatives by E, stacked along a new first axis."""
        return self._elements(energies, slopes=True)

    def _elements(self, energies: Floats, slopes: bool) -> Elements:
        energies = np.asarray(energies, dtype=float)
        parts = [(rows, kind(energies, slopes)) for rows, kind in self._evaluators]
        return joined(parts, len(self))

    @cached_property
    def _evaluators(self) -> tuple[tuple[Indices | None, Kind], ...]:
        return tuple((rows, kind(*arrays)) for rows, kind, arrays in self.kinds())

    def kinds(self) -> list[tuple[Indices | None, type[Kind], tuple[Floats, ...]]]:
        """Return the kinds of slices: their rows (None is every row), evaluator and numbers.

        Numbers are columns (..., n_rows, 1). Where equal flat slices repeat, each is there once
        and rows says where every slice finds its own.
        """
        if self.profile.numbers.all_flat:
            first, back = self._distinct()
            return [(back, _Constant, self._columns(first))]
        straight = ~self.curved & ~self.flat
        found: list[tuple[Indices | None, type[Kind], tuple[Floats, ...]]] = []
        for mask, kind in ((self.flat, _Constant), (straight, _Tilted)):
            if mask.any():
                rows = np.flatnonzero(mask)
                found.append((rows, kind, self._columns(rows)))
        if self.curved.any():
            rows = np.flatnonzero(self.curved)
            found.append((rows, _Curved, (self.thickness[rows, None], *self._gauss(rows))))
        return found

    def _columns(self, rows: Indices | slice) -> tuple[Floats, ...]:
        arrays = (self.thickness, self.edge, self.mass, self.inverse_gap, self.drop)
        return tuple(v[rows, None] for v in arrays)

    def _distinct(self) -> tuple[Indices | slice, Indices | None]:
        """Return one row of each kind of equal flat slices, and where every slice finds its own."""
        if len(self) < _MANY:
            return slice(None), None
        seen: dict[tuple[float, ...], int] = {}
        keys = zip(
            self.thickness.tolist(), self.edge.tolist(), self.mass.tolist(),
            self.inverse_gap.tolist(), strict=True,
        )  # fmt: skip
        back = np.array([seen.setdefault(key, len(seen)) for key in keys])
        if 2 * len(seen) > len(self):
            return slice(None), None
        first = np.empty(len(seen), dtype=np.int64)
        first[back[::-1]] = np.arange(len(self))[::-1]
        return first, back

    def _gauss(self, rows: Indices) -> tuple[Floats, Floats, Floats]:
        """Edge, mass and inverse gap at the three Gauss points, each (3, n_rows, 1)."""
        shape = (3, len(rows))
        found = (np.empty(shape), np.empty(shape), np.empty(shape))
        thickness = self.thickness[rows]
        depth = self.start[rows] + 0.5 * thickness + _GAUSS * thickness
        for index, here in _runs(self.section[rows]):
            section = self.profile.sections[index]
            for target, curve in zip(
                found, (section.edge, section.mass, section.inverse_gap), strict=True
            ):
                target[:, here] = curve.at(depth[:, here])
        edge, mass, inverse_gap = (values[:, :, None] for values in found)
        return edge, mass, inverse_gap


class _Constant:
    """Elements of constant slices: thickness, edge, mass, inverse gap, rise (zero)."""

    def __init__(self, *numbers: Floats) -> None:
        h, self.edge, mass, inverse_gap, _ = numbers
        self.a = h * mass
        self.rate = h * self.a / H2M
        self.inverse_gap = inverse_gap if inverse_gap.any() else None

    def __call__(self, energies: Floats, slopes: bool, owner: Indices | None = None) -> Elements:
        edge, a, rate = _taken(owner, self.edge, self.a, self.rate)
        above = energies - edge
        t = rate * above
        da: Floats | None = None
        if self.inverse_gap is not None:
            (inverse_gap,) = _taken(owner, self.inverse_gap)
            bracket = above * inverse_gap
            bracket += 1.0
            if bracket.min(initial=1.0) < MASS_FLOOR:
                inverse_gap = np.where(bracket > MASS_FLOOR, inverse_gap, 0.0)
                bracket = np.maximum(bracket, MASS_FLOOR)
            dt = rate * bracket + t * inverse_gap if slopes else rate
            da = a * inverse_gap if slopes else None
            t *= bracket
            a = a * bracket
        else:
            dt = rate
        f, g = half_wave_functions(t)
        if not slopes:
            f /= a
            g /= a
            return Elements(f, f, g, _half_waves(t))
        side, off = np.empty((2, *f.shape)), np.empty((2, *f.shape))
        df, dg = half_wave_slopes(t, f, g)
        np.divide(f, a, out=side[0])
        np.divide(g, a, out=off[0])
        np.multiply(df, dt, out=side[1])
        np.multiply(dg, dt, out=off[1])
        if da is not None:
            side[1] -= side[0] * da
            off[1] -= off[0] * da
        side[1] /= a
        off[1] /= a
        return Elements(side, side, off, None)


class _Tilted:
    """Elements of slices with a linear edge, constant mass and gap; numbers as `_Constant`."""

    def __init__(self, *numbers: Floats) -> None:
        self.numbers = numbers
        self.edge = numbers[1]
        self.coefficients = tilted(*numbers)
        h, _, _, inverse_gap, drop = numbers
        self.inverse_gap = inverse_gap if inverse_gap.any() else None
        self.half_drop = 0.5 * np.abs(drop)

    def __call__(self, energies: Floats, slopes: bool, owner: Indices | None = None) -> Elements:
        edge, x0, x1, a0, c0, c1 = _taken(owner, self.edge, *self.coefficients[:5])
        above = energies - edge
        if self.inverse_gap is None:
            omega = Exponent(x0 + x1 * above, a0, c0 + c1 * above)
            return _exponential(omega, Exponent(x1, np.zeros((1, 1)), c1), slopes)
        x2, a1, inverse_gap, half_drop = _taken(
            owner, *self.coefficients[5:], self.inverse_gap, self.half_drop
        )
        omega = Exponent(x0 + (x1 + x2 * above) * above, a0 + a1 * above, c0 + c1 * above)
        d_omega = Exponent(x1 + 2.0 * x2 * above, a1, c1)
        lowest = 1.0 + (above - half_drop) * inverse_gap
        if lowest.min(initial=1.0) < MASS_FLOOR:
            rows = np.flatnonzero(lowest.min(axis=1) < MASS_FLOOR)
            omega, d_omega = self._floored(rows, energies, owner, omega, d_omega)
        return _exponential(omega, d_omega, slopes)

    def _floored(
        self, rows: Indices, energies: Floats, owner: Indices | None, omega: Exponent,
        d_omega: Exponent,
    ) -> tuple[Exponent, Exponent]:  # fmt: skip
        """Take the exponents of rows whose mass reaches its floor from their Gauss points."""
        h, edge, mass, inverse_gap, drop = _taken(owner, *(a[rows] for a in self.numbers))
        at = edge + _GAUSS[:, :, None] * drop
        local, b = local_mass(energies, at, mass, inverse_gap)
        b = np.broadcast_to(b, local.shape)  # a row may touch its floor between Gauss points
        shape = (len(omega.a), len(energies))
        whole = [
            Exponent(*(np.array(np.broadcast_to(column, shape)) for column in one))
            for one in (omega, d_omega)
        ]
        for target, source in zip(whole, magnus(h, energies, at, local, b), strict=True):
            for column, numbers in zip(target, source, strict=True):
                column[rows] = numbers
        return whole[0], whole[1]


def _taken(owner: Indices | None, *columns: Floats) -> tuple[Floats, ...]:
    """Return each design's numbers for every energy; one design's stay single columns."""
    return columns if owner is None else tuple(column[..., owner] for column in columns)


class _Curved:
    """Elements of slices that vary in any smooth way: thickness; edge, mass, 1/gap at 3 points."""

    def __init__(self, *numbers: Floats) -> None:
        self.thickness, self.edge, self.mass, self.inverse_gap = numbers

    def __call__(self, energies: Floats, slopes: bool, owner: Indices | None = None) -> Elements:
        thickness, edge, mass, inverse_gap = _taken(
            owner, self.thickness, self.edge, self.mass, self.inverse_gap
        )
        local, b = local_mass(energies, edge, mass, inverse_gap)
        return _exponential(*magnus(thickness, energies, edge, local, b), slopes)


def _exponential(omega: Exponent, d_omega: Exponent, slopes: bool) -> Elements:
    """Return the elements of the propagators exp(omega), and their derivatives."""
    x, a, c = omega
    t = -(x * x + a * c)
    f, g = half_wave_functions(t)
    if not slopes:
        return Elements((f + x) / a, (f - x) / a, g / a, _half_waves(t))
    left, right, off = (np.empty((2, *f.shape)) for _ in range(3))
    np.divide(f + x, a, out=left[0])
    np.divide(f - x, a, out=right[0])
    np.divide(g, a, out=off[0])
    dx, da, dc = d_omega
    df, dg = half_wave_slopes(t, f, g)
    dt = -(2.0 * x * dx + a * dc + da * c)
    df *= dt
    dg *= dt
    np.divide(df + dx - left[0] * da, a, out=left[1])
    np.divide(df - dx - right[0] * da, a, out=right[1])
    np.divide(dg - off[0] * da, a, out=off[1])
    return Elements(left, right, off, None)


def joined(parts: Sequence[tuple[Indices | None, Elements]], rows: int) -> Elements:
    """Return the elements of all kinds in the order of the slices."""
    where, found = parts[0]
    if len(parts) == 1:
        return found if where is None else found.rows(where)
    *stack, _, columns = parts[0][1].left.shape
    shape = (*stack, rows, columns)
    left, right, off = np.empty(shape), np.empty(shape), np.empty(shape)
    clamped: Indices | None = None
    for where, found in parts:
        left[..., where, :] = found.left
        right[..., where, :] = found.right
        off[..., where, :] = found.off
        if found.clamped is not None:
            clamped = np.zeros(shape, dtype=np.int64) if clamped is None else clamped
            clamped[where] = found.clamped
    return Elements(left, right, off, clamped)


def _half_waves(t: Floats) -> Indices | None:
    """Count each slice's own levels between two walls; none where all phases are below pi."""
    if t.max(initial=0.0) < np.pi**2:
        return None
    return np.asarray(np.sqrt(np.maximum(t, 0.0)) // np.pi, dtype=np.int64)


def _runs(section: Indices) -> Iterator[tuple[int, slice]]:
    """Yield each section of sorted slices with the range they take."""
    if not len(section):
        return
    starts = np.flatnonzero(np.diff(section, prepend=-1))
    stops = np.append(starts[1:], len(section))
    for start, stop in zip(starts.tolist(), stops.tolist(), strict=True):
        yield int(section[start]), slice(start, stop)


def cut(profile: Profile, counts: Sequence[int] | Indices) -> Slices:
    """Cut each section of a profile into that many equal slices; 0 leaves a section out."""
    counts = np.asarray(counts, dtype=np.int64)
    section = np.repeat(np.arange(len(counts)), counts)
    within = np.arange(len(section)) - (np.cumsum(counts) - counts)[section]
    thickness = profile.numbers.thickness[section] / counts[section]
    return slice_at(profile, counts, section, within * thickness, thickness)


def slice_at(
    profile: Profile, counts: Indices, section: Indices, start: Floats, thickness: Floats
) -> Slices:
    """Return slices at given places of given sections, in ascending order of section."""
    numbers = profile.numbers
    flat, curved = numbers.flat[section], numbers.curved[section]
    edge = numbers.edge[section, 0]
    mass, inverse_gap = numbers.mass[section], numbers.inverse_gap[section]
    drop = numbers.edge[section, 1] * thickness
    if not numbers.all_flat:
        middle = start + 0.5 * thickness
        edge = edge + numbers.edge[section, 1] * middle
        rows = np.flatnonzero(curved)
        for index, here in _runs(section[rows]):
            some, part = rows[here], profile.sections[index]
            edge[some] = part.edge.at(middle[some])
            mass[some] = part.mass.at(middle[some])
            inverse_gap[some] = part.inverse_gap.at(middle[some])
            step = part.edge.at(start[some] + thickness[some]) - part.edge.at(start[some])
            drop[some] = step
    return Slices(
        profile, counts, section, start, thickness, edge, mass, inverse_gap, drop, flat, curved
    )
