"""Profile -> slices, and slices -> the elements of K(E) with their derivative.

A flat section is exact in one slice, cut only so that no slice holds half a wave at the
highest energy asked: then K has no poles and its derivative is smooth. A varying section is cut
for the 6th-order Magnus exponent.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import numpy.typing as npt

from ..profile import Profile
from .kinds import GAUSS, Constant, Curved, Kind, Tilted, joined
from .matrix import Elements

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: repeated slices are evaluated once from this many slices on
_MANY = 24


@dataclass(frozen=True)
class Slices:
    """Slices in growth order; all arrays (n_slices,) unless said otherwise.

    Of many designs, arrays of numbers are (n_slices, n_designs).

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

        Numbers are columns (..., n_rows, n_designs or 1). Where equal flat slices repeat, each is
        there once and rows says where every slice finds its own.
        """
        if self.profile.numbers.all_flat:
            first, back = self._distinct()
            return [(back, Constant, self._columns(first))]
        straight = ~self.curved & ~self.flat
        found: list[tuple[Indices | None, type[Kind], tuple[Floats, ...]]] = []
        for mask, kind in ((self.flat, Constant), (straight, Tilted)):
            if mask.any():
                rows = np.flatnonzero(mask)
                where = None if len(rows) == len(self) else rows
                found.append((where, kind, self._columns(rows)))
        if self.curved.any():
            rows = np.flatnonzero(self.curved)
            where = None if len(rows) == len(self) else rows
            found.append((where, Curved, (_columns(self.thickness[rows]), *self._gauss(rows))))
        return found

    def _columns(self, rows: Indices | slice) -> tuple[Floats, ...]:
        arrays = (self.thickness, self.edge, self.mass, self.inverse_gap, self.drop)
        return tuple(_columns(v[rows]) for v in arrays)

    def _distinct(self) -> tuple[Indices | slice, Indices | None]:
        """Return one row of each kind of equal flat slices, and where every slice finds its own."""
        few = len(self) < _MANY
        if few or 2 * len(set(_columns(self.thickness)[:, 0].tolist())) > len(self):
            return slice(None), None
        seen: dict[bytes, int] = {}
        keys = np.stack((self.thickness, self.edge, self.mass, self.inverse_gap), axis=1)
        back = np.array([seen.setdefault(key.tobytes(), len(seen)) for key in keys])
        if 2 * len(seen) > len(self):
            return slice(None), None
        first = np.empty(len(seen), dtype=np.int64)
        first[back[::-1]] = np.arange(len(self))[::-1]
        return first, back

    def _gauss(self, rows: Indices) -> tuple[Floats, Floats, Floats]:
        """Edge, mass and inverse gap at the three Gauss points, each (3, n_rows, n_columns)."""
        thickness = _columns(self.thickness[rows])
        depth = _columns(self.start[rows]) + 0.5 * thickness + GAUSS[:, None, None] * thickness
        found = (np.empty_like(depth), np.empty_like(depth), np.empty_like(depth))
        for index, here in _runs(self.section[rows]):
            section = self.profile.sections[index]
            for target, curve in zip(
                found, (section.edge, section.mass, section.inverse_gap), strict=True
            ):
                target[:, here] = curve.at(depth[:, here])
        return found


def _columns(numbers: Floats) -> Floats:
    """Return slices as rows, their designs (or the one there is) as columns."""
    return numbers.reshape(len(numbers), -1)


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
    thickness = profile.numbers.thickness[section]
    column = (-1,) + (1,) * (thickness.ndim - 1)  # many designs stand along a further axis
    thickness = thickness / counts[section].reshape(column)
    return slice_at(profile, counts, section, within.reshape(column) * thickness, thickness)


def slice_at(
    profile: Profile, counts: Indices, section: Indices, start: Floats, thickness: Floats
) -> Slices:
    """Return slices at given places of given sections, in ascending order of section."""
    numbers = profile.numbers
    flat, curved = numbers.flat[section], numbers.curved[section]
    edge, mass, inverse_gap = (
        a[section] for a in (numbers.edge, numbers.mass, numbers.inverse_gap)
    )
    drop = numbers.slope[section] * thickness
    if not numbers.all_flat:
        middle = start + 0.5 * thickness
        edge = edge + numbers.slope[section] * middle
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
