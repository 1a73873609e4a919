"""The symmetric tridiagonal matrix K(E) of all faces, and the count of its negative pivots.

An element (a slice, or a whole section of the phase integral) carries (u, p = psi'/m) from its
left to its right face by [[A, B], [C, D]] of determinant 1. With p eliminated, the values of u
at the faces obey K(E) u = 0 with the diagonal D/B of the element before plus A/B of the element
after, and the off-diagonal -1/B. K falls strictly with E, so the number of levels below E is
its number of negative eigenvalues plus the levels of each element clamped at both its faces
(Wittrick & Williams, Q. J. Mech. Appl. Math. 24, 263, 1971).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
#: keeps 0/0 out of the recursion where a thick barrier's coupling underflows
_TINY = 1e-290
#: numbers an array of the recursion holds at most, so that it stays in the cache
_CELLS = 12_000
#: rows at most, so that a byte counts them
_ROWS = 255
Counts = npt.NDArray[np.int64]


class Elements(NamedTuple):
    """One row an element, one column an energy; every array has shape (n_elements, n_energies).

    ``left`` is A/B, ``right`` is D/B, ``off`` is 1/B, all [1/nm]; a further axis before the others
    may stack values and derivatives. ``clamped`` counts each element's own levels below E when
    u = 0 at both its faces; None says there are none.
    """

    left: Floats
    right: Floats
    off: Floats
    clamped: Counts | None = None

    def rows(self, which: npt.NDArray[np.int64]) -> Elements:
        """Return the elements of these rows, in this order."""
        clamped = None if self.clamped is None else self.clamped[which]
        left = self.left[..., which, :]
        right = left if self.right is self.left else self.right[..., which, :]
        return Elements(left, right, self.off[..., which, :], clamped)


class Matrix(NamedTuple):
    """K(E) of the free faces: ``diagonal`` (n_nodes, n_energies), ``off`` one row fewer.

    ``off`` holds -1/B; a further axis before the others may stack K and its derivative.
    ``clamped`` (n_energies,) sums the elements' own levels; None is none.
    """

    diagonal: Floats
    off: Floats
    clamped: Counts | None

    def split(self) -> tuple[Matrix, Matrix]:
        """Return K and its derivative of a stacked pair."""
        value, slope = (
            Matrix(diagonal, off, None)
            for diagonal, off in zip(self.diagonal, self.off, strict=True)
        )
        return value, slope


def assemble(elements: Elements, first: Floats | None, last: Floats | None) -> Matrix:
    """Join elements to K(E).

    Parameters
    ----------
    elements : Elements
    first, last : array (n_energies,), or stacked like the elements, or None
        What the outside adds to the end's diagonal (kappa/m for an open end below its edge);
        None is a wall: the end's face is dropped.
    """
    left, right, off, clamped = elements
    *stack, n, energies = left.shape
    start, stop = int(first is None), n + int(last is not None)
    diagonal = np.empty((*stack, n + 1, energies))
    np.add(right[..., :-1, :], left[..., 1:, :], out=diagonal[..., 1:-1, :])
    if first is not None:
        np.add(left[..., 0, :], first, out=diagonal[..., 0, :])
    if last is not None:
        np.add(right[..., -1, :], last, out=diagonal[..., -1, :])
    total = None if clamped is None else clamped.sum(axis=0)
    return Matrix(diagonal[..., start:stop, :], -off[..., start : stop - 1, :], total)


def count_below(matrix: Matrix) -> Counts:
    """Return how many levels lie below each energy, shape (n_energies,).

    Pivots by the sequential recursion with IEEE infinities, which is backward stable
    (Demmel, Dhillon, Ren, ETNA 3, 116, 1995).
    """
    return count_and_pivot(matrix)[0]


def count_and_pivot(matrix: Matrix) -> tuple[Counts, Floats]:
    """Return the count below each energy and the last pivot, which passes zero at each level.

    The last pivot is the mismatch of a march from the first face to the last one.
    """
    diagonal, off, clamped = matrix
    if not len(diagonal):
        none = np.zeros(diagonal.shape[1], dtype=np.int64)
        return none if clamped is None else clamped.astype(np.int64), np.ones(len(none))
    pivot = diagonal[0]
    total = np.signbit(pivot).astype(np.int64)
    if clamped is not None:
        total += clamped
    quotient = np.empty_like(pivot)
    step = min(_ROWS, max(1, _CELLS // max(1, len(pivot))))
    with np.errstate(divide="ignore", over="ignore"):
        for start in range(0, len(off), step):
            squares = np.square(off[start : start + step])
            squares += _TINY
            pivots = diagonal[start + 1 : start + 1 + step].copy()
            for square, row in zip(squares, pivots, strict=True):
                np.divide(square, pivot, quotient)
                pivot = np.subtract(row, quotient, row)
            negative = np.signbit(pivots).view(np.uint8)
            total += np.add.reduce(negative, axis=0, dtype=np.uint8)
    return total, pivot
