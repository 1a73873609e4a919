"""Kinds of slices: each gives its elements of K(E), and their derivatives, at many energies.

Off the mass's floor the exponent of every slice is a polynomial of e = E - V: its coefficients
are made once, and an evaluation is Horner's rule, two tangents and few products a cell.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from typing import NamedTuple, Protocol

import numpy as np
import numpy.typing as npt

from ..constants import H2M
from .matrix import Elements
from .propagation import (
    MASS_FLOOR,
    curved,
    dual_product,
    half_wave_functions,
    half_wave_slopes,
    local_mass,
    magnus,
    tilted,
)

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: share of the thickness by which the three Gauss points lie off the middle
GAUSS = 0.5 * np.sqrt(0.6) * np.array([-1.0, 0.0, 1.0])
#: numbers an array holds at most while rows are evaluated, so that all of them stay in the cache
_CELLS = 12_000


class Kind(Protocol):
    """Evaluates slices of one kind, made from their numbers as columns."""

    def __init__(self, *numbers: Floats) -> None: ...

    def __call__(self, energies: Floats, slopes: bool, owner: Indices | None = None) -> Elements:
        """Return the elements at each energy, stacked with their derivatives if ``slopes``.

        ``owner`` gives each energy's column of the numbers; None is one column for all.
        """
        ...


class _Points(NamedTuple):
    """Thickness (n_slices, ...); edge, mass, inverse gap at Gauss points, (3, n_slices, ...)."""

    thickness: Floats
    edge: Floats
    mass: Floats
    inverse_gap: Floats


class _Slopes(NamedTuple):
    """Derivatives by E of w, of ln a and of x/a; None is zero."""

    w: Floats
    log_a: Floats | None = None
    x: Floats | None = None


class _Evaluator:
    """Rows evaluated in blocks; those whose mass reaches its floor from their Gauss points.

    Parameters
    ----------
    columns : sequence of array (n_slices, n_columns)
        What the polynomials are made of, the edge first.
    points : _Points
    even : bool
        Whether A/B and D/B are equal.
    """

    def __init__(self, columns: Sequence[Floats], points: _Points, even: bool = False) -> None:
        self._columns, self._points, self._even = columns, points, even
        self._clear = _clear_of_floor(points) if points.inverse_gap.any() else None
        self._all_clear = -np.inf if self._clear is None else self._clear.max()

    def __call__(self, energies: Floats, slopes: bool, owner: Indices | None = None) -> Elements:
        """Return the elements at each energy, see `Kind`."""
        if self._columns[0].shape[-1] == 1:
            owner = None
        if self._clear is None or energies.min(initial=np.inf) > self._all_clear:
            return self._evaluated(energies, slopes, owner)
        (clear,) = _taken(None, owner, (self._clear,))
        floored = np.flatnonzero((energies <= clear).any(axis=1))
        with np.errstate(all="ignore"):  # what the polynomials make of these rows is replaced
            elements = self._evaluated(energies, slopes, owner)
        if not len(floored):
            return elements
        return self._replaced(floored, elements, energies, slopes, owner)

    def _fill(
        self, target: tuple[Floats, ...], columns: Sequence[Floats], energies: Floats, slopes: bool
    ) -> Indices | None:
        raise NotImplementedError

    def _evaluated(self, energies: Floats, slopes: bool, owner: Indices | None) -> Elements:
        elements = _room((len(self._columns[0]), len(energies)), slopes, self._even)
        clamped: Indices | None = None
        for rows in _blocks(*elements.off.shape[-2:]):
            columns = _taken(rows, owner, self._columns)
            target = elements[:3] if rows is None else tuple(v[..., rows, :] for v in elements[:3])
            inside = self._fill(target, columns, energies, slopes)
            if inside is not None:
                if clamped is None:
                    clamped = np.zeros(elements.off.shape, dtype=np.int64)
                clamped[slice(None) if rows is None else rows] = inside
        return elements._replace(clamped=clamped)

    def _replaced(
        self, rows: Indices, elements: Elements, energies: Floats, slopes: bool,
        owner: Indices | None,
    ) -> Elements:  # fmt: skip
        """Take the elements of some rows from their Gauss points, where the mass has its floor."""
        h, edge, mass, inverse_gap = (
            v if owner is None else v.take(owner, axis=-1)
            for v in (column[..., rows, :] for column in self._points)
        )
        above = energies - edge
        local, b = local_mass(energies, edge, mass, inverse_gap)
        a = np.stack((h * local, np.broadcast_to(h * b, above.shape)), axis=1)
        c = np.stack((above, np.ones(above.shape)), axis=1)
        c *= -h / H2M
        x, a, c = magnus(a, c, dual_product)
        w = -0.25 * (dual_product(x, x) + dual_product(a, c))
        inverse = 1.0 / a[0]
        log_a = a[1] * inverse
        x *= inverse
        x[1] -= x[0] * log_a
        some = _room(w.shape[1:], slopes, False)
        inside = _write(
            some[:3], w[0], inverse, x[0], _Slopes(w[1], log_a, x[1]) if slopes else None
        )
        for whole, part in zip(elements[:3], some[:3], strict=True):
            whole[..., rows, :] = part
        clamped = elements.clamped
        if clamped is None and inside is not None:
            clamped = np.zeros(elements.off.shape, dtype=np.int64)
        if clamped is not None:
            clamped[rows] = 0 if inside is None else inside
        return elements._replace(clamped=clamped)


class Constant(_Evaluator):
    """Constant slices: thickness, edge, mass, inverse gap, rise (zero)."""

    def __init__(self, *numbers: Floats) -> None:
        h, edge, mass, inverse_gap, _ = numbers
        a = h * mass
        columns = [edge, (0.25 / H2M) * h * a, 1.0 / a]
        if inverse_gap.any():
            columns.append(inverse_gap)
        same = np.broadcast_to(edge, (3, *edge.shape))
        super().__init__(columns, _Points(h, same, mass[None], inverse_gap[None]), even=True)

    def _fill(
        self, target: tuple[Floats, ...], columns: Sequence[Floats], energies: Floats, slopes: bool
    ) -> Indices | None:
        edge, rate, inverse, *gap = columns
        e = energies - edge
        w = rate * e
        if not gap:
            return _write(target, w, inverse, None, _Slopes(rate) if slopes else None)
        bracket = e * gap[0]
        bracket += 1.0
        rising = None
        if slopes:
            rising = _Slopes(rate * bracket + w * gap[0], gap[0] / bracket)
        w *= bracket
        return _write(target, w, inverse / bracket, None, rising)


class _Varying(_Evaluator):
    """Slices whose exponent has an x; its polynomials as columns of ascending powers of e.

    Where a is a constant of each slice, columns hold 1/a, x/a and -4 w = x^2 + a c in place of
    a, x and c.
    """

    def __init__(self, edge: Floats, omega: Iterable[Iterable[Floats]], points: _Points) -> None:
        x, a, c = (list(columns) for columns in omega)
        if len(a) == 1:
            c = [
                x[0] * x[0] + a[0] * c[0], 2.0 * x[0] * x[1] + a[0] * c[1], x[1] * x[1],
            ]  # fmt: skip
            a = [1.0 / a[0]]
            x = [v * a[0] for v in x]
        self._ends = 1 + len(x), 1 + len(x) + len(a)
        super().__init__([edge, *x, *a, *(-0.25 * v for v in c)], points)

    def _fill(
        self, target: tuple[Floats, ...], columns: Sequence[Floats], energies: Floats, slopes: bool
    ) -> Indices | None:
        first, last = self._ends
        e = energies - columns[0]
        x, dx = _horner(columns[1:first], e, slopes)
        w, dw = _horner(columns[last:], e, slopes)
        if last - first == 1:
            inverse = columns[first]
            return _write(target, w, inverse, x, _Slopes(dw, None, dx) if slopes else None)
        a, da = _horner(columns[first:last], e, slopes)
        rising = None
        half = 0.5 * x
        if slopes:
            dw = dw * a
            dw += da * w
            dw -= half * dx
        w *= a
        half *= half
        w -= half
        inverse = np.divide(1.0, a, out=a)
        x *= inverse
        if slopes:
            log_a = da * inverse
            dx = dx * inverse
            dx -= x * log_a
            rising = _Slopes(dw, log_a, dx)
        return _write(target, w, inverse, x, rising)


class Tilted(_Varying):
    """Slices with a linear edge, constant mass and gap; numbers as `Constant`."""

    def __init__(self, *numbers: Floats) -> None:
        h, edge, mass, inverse_gap, drop = numbers
        x0, x1, a0, c0, c1, x2, a1 = tilted(*numbers)
        x, a = [x0, x1], [a0]
        if inverse_gap.any():
            x, a = [x0, x1, x2], [a0, a1]
        at = edge + GAUSS[:, None, None] * drop
        super().__init__(edge, (x, a, [c0, c1]), _Points(h, at, mass[None], inverse_gap[None]))


class Curved(_Varying):
    """Slices that vary in any smooth way: thickness; edge, mass, 1/gap at 3 points."""

    def __init__(self, *numbers: Floats) -> None:
        points = _Points(*numbers)
        super().__init__(points.edge[1], curved(*points), points)


def _clear_of_floor(points: _Points) -> Floats:
    """Return the energy from which on each slice's mass is off its floor at its Gauss points."""
    inverse_gap = np.broadcast_to(points.inverse_gap, points.edge.shape)
    reach = np.full(points.edge.shape, np.inf)
    np.divide(1.0 - MASS_FLOOR, inverse_gap, out=reach, where=inverse_gap > 0.0)
    return np.asarray((points.edge - reach).max(axis=0))


def _room(shape: tuple[int, ...], slopes: bool, even: bool) -> Elements:
    """Return arrays for elements."""
    stacked = (2, *shape) if slopes else shape
    left = np.empty(stacked)
    return Elements(left, left if even else np.empty(stacked), np.empty(stacked))


def _blocks(rows: int, columns: int) -> Iterator[slice | None]:
    """Yield ranges of rows of few cells; None is all of them."""
    if rows * columns <= 2 * _CELLS:
        yield None
        return
    step = max(1, _CELLS // columns)
    for start in range(0, rows, step):
        yield slice(start, start + step)


def _taken(
    rows: slice | None, owner: Indices | None, columns: Sequence[Floats]
) -> Sequence[Floats]:
    """Return rows of columns, each energy's design's; one design's stay single columns."""
    if rows is not None:
        columns = [column[rows] for column in columns]
    return columns if owner is None else [column.take(owner, axis=-1) for column in columns]


def _horner(columns: Sequence[Floats], e: Floats, slopes: bool) -> tuple[Floats, Floats]:
    """Return a polynomial of degree one at least and its derivative; the latter if asked."""
    *lower, second, slope = columns
    value = slope * e
    value += second
    for column in reversed(lower):
        if slopes:
            slope = slope * e
            slope += value
        value *= e
        value += column
    return value, slope


def _write(
    target: tuple[Floats, ...], w: Floats, inverse: Floats, x: Floats | None,
    slopes: _Slopes | None,
) -> Indices | None:  # fmt: skip
    """Write elements from w, 1/a and x/a, and return how many levels each holds between walls."""
    f, g = half_wave_functions(w)
    if slopes is None:
        left, right, off = target
        np.multiply(g, inverse, out=off)
        if x is None:
            np.multiply(f, inverse, out=left)
        else:
            f *= inverse
            np.add(f, x, out=left)
            np.subtract(f, x, out=right)
        return _half_waves(w)
    (left, d_left), (right, d_right), (off, d_off) = target
    df, dg = half_wave_slopes(w, f, g)
    scale = slopes.w * inverse
    f *= inverse
    df *= scale
    np.multiply(g, inverse, out=off)
    np.multiply(dg, scale, out=d_off)
    if slopes.log_a is not None:
        df -= f * slopes.log_a
        d_off -= off * slopes.log_a
    if x is None or slopes.x is None:
        left[...], d_left[...] = f, df
    else:
        np.add(f, x, out=left)
        np.subtract(f, x, out=right)
        np.add(df, slopes.x, out=d_left)
        np.subtract(df, slopes.x, out=d_right)
    return None


def _half_waves(w: Floats) -> Indices | None:
    """Count each slice's own levels between two walls; none where all phases are below pi."""
    if np.maximum.reduce(w, axis=None, initial=0.0) < (0.5 * np.pi) ** 2:
        return None
    return np.asarray(np.sqrt(np.maximum(w, 0.0)) // (0.5 * np.pi), dtype=np.int64)


def joined(parts: Sequence[tuple[Indices | None, Elements]], rows: int) -> Elements:
    """Return the elements of all kinds in the order of the slices."""
    where, found = parts[0]
    if len(parts) == 1:
        return found if where is None else found.rows(where)
    *stack, _, columns = found.left.shape
    shape = (*stack, rows, columns)
    left, right, off = np.empty(shape), np.empty(shape), np.empty(shape)
    clamped: Indices | None = None
    for where, found in parts:
        place = _place(where)
        left[..., place, :] = found.left
        right[..., place, :] = found.right
        off[..., place, :] = found.off
        if found.clamped is not None:
            clamped = np.zeros(shape, dtype=np.int64) if clamped is None else clamped
            clamped[place] = found.clamped
    return Elements(left, right, off, clamped)


def _place(rows: Indices | None) -> Indices | slice:
    """Return ascending rows as a range if they are one."""
    if rows is None:
        return slice(None)
    first, stop = int(rows[0]), int(rows[-1]) + 1
    return slice(first, stop) if stop - first == len(rows) else rows
