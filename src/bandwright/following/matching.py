"""Which level of the next design is which of this one."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
from scipy.optimize import linear_sum_assignment

from ..levels import Levels
from .overlapping import overlaps

Floats = npt.NDArray[np.float64]
Indices = npt.NDArray[np.int64]

#: what a level that is not found again has in place of an index
LOST = -1
#: a level has kept its character if more than half of its probability is there
HALF = 0.5
#: what order weighs, against a probability, where two choices are equal
_ORDER = 1e-9


def matched(first: Levels, second: Levels) -> Indices:
    """Return the index in ``second`` of each level of ``first``, -1 where it is lost, (n_first,).

    Each level goes to the one that overlaps it most, no two to the same. It is kept if the
    overlap is above 1/sqrt(2). Levels that come out as mixtures of each other, as in the middle
    of an anticrossing, keep their order in energy. Copies (levels of one row of `Levels.table`)
    are compared as subspaces, and keep their order.

    Parameters
    ----------
    first, second : Levels
        Of designs with the same sequence of layers; indices count from 0.

    Raises
    ------
    StackError, SolveError
        As `overlaps`.

    Examples
    --------
    >>> import bandwright as bw
    >>> narrow, wide = (bw.solve(bw.parse_line(
    ...     f"20 nm Al0.3Ga0.7As, {width} nm GaAs, 20 nm Al0.3Ga0.7As", substrate="GaAs"))
    ...     for width in (8, 6))
    >>> matched(narrow, wide).tolist()
    [0, 1]
    """
    return assign(overlaps(first, second) ** 2, first.groups, second.groups)


def assign(squares: Floats, first: Sequence[slice], second: Sequence[slice]) -> Indices:
    """Return the partner of each row, -1 where it has none.

    Parameters
    ----------
    squares : array (n_first, n_second)
        Squared overlaps.
    first, second : sequence of slice
        Which rows, and which columns, are copies.

    Examples
    --------
    Two levels that have crossed, and a third that is new:

    >>> each = [slice(i, i + 1) for i in range(3)]
    >>> assign(np.array([[0.02, 0.97, 0.0], [0.98, 0.01, 0.0]]), each[:2], each)
    array([1, 0])
    """
    shared = _shared(squares, first, second)
    rows, columns = np.indices(shared.shape)
    taken, to = linear_sum_assignment(shared - _ORDER * (rows - columns) ** 2, maximize=True)
    kept = shared[taken, to] > HALF
    result = np.full(len(squares), LOST)
    result[taken[kept]] = to[kept]
    open_rows = result == LOST
    open_columns = np.ones(shared.shape[1], dtype=bool)
    open_columns[to[kept]] = False
    _mixtures(squares, open_rows, open_columns, result)
    return result


def _shared(squares: Floats, first: Sequence[slice], second: Sequence[slice]) -> Floats:
    """Return mean squared cosines between the subspaces that each pair of levels belongs to."""
    if all(g.stop - g.start == 1 for g in (*first, *second)):
        return squares
    shared = np.empty_like(squares)
    for rows in first:
        for columns in second:
            smaller = min(rows.stop - rows.start, columns.stop - columns.start)
            shared[rows, columns] = squares[rows, columns].sum() / smaller
    return shared


def _mixtures(
    squares: Floats, rows: npt.NDArray[np.bool_], columns: npt.NDArray[np.bool_], result: Indices
) -> None:
    """Set the partners of levels that are mixtures of each other, in order of energy.

    A row that is mostly in the columns left, and a column that is mostly in the rows left, have
    only changed places among themselves.
    """
    while True:
        inside = squares[:, columns].sum(axis=1) > HALF
        stay = rows & inside
        filled = squares[stay].sum(axis=0) > HALF
        keep = columns & filled
        if stay.sum() == rows.sum() and keep.sum() == columns.sum():
            break
        rows, columns = stay, keep
    if rows.sum() == columns.sum():
        result[rows] = np.flatnonzero(columns)
        return
    kept_rows, kept_columns = np.flatnonzero(rows), np.flatnonzero(columns)
    taken, to = linear_sum_assignment(squares[np.ix_(rows, columns)], maximize=True)
    result[kept_rows[taken]] = kept_columns[to]
