"""Two designs' states laid on each other: how much of one there is in another."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from ..errors import StackError
from ..levels import Levels
from ..quantities import show
from ..solver.overlaps import grid_for, lay, product

Floats = npt.NDArray[np.float64]


def overlaps(first: Levels, second: Levels) -> Floats:
    """Return |<i|j>| of the states of two designs, (n_first, n_second).

    The designs are laid on each other layer by layer, each point at the same fraction of its
    layer's thickness, so that a thicker layer does not shift what comes after it. States keep
    their norm, and the product is that of the two-band model.

    Parameters
    ----------
    first, second : Levels
        Of designs with the same sequence of layers.

    Returns
    -------
    array
        1 where a level has kept its character, 0 where it has nothing of it.

    Raises
    ------
    StackError
        If something else is given, or the designs differ in their sequence of layers.
    SolveError
        If the levels were found by the phase integral, which gives no states.

    Notes
    -----
    <i|j> = integral of u_i u_j + (hbar^2/2m0) b p_i p_j along the common fraction, with
    p = u'/m and b = dm/dE; the product in which the states of one two-band design are exactly
    orthogonal.

    Examples
    --------
    An invented well, and one 0.5 nm wider:

    >>> import bandwright as bw
    >>> narrow, wide = (bw.solve(bw.parse_line(
    ...     f"20 nm Al0.3Ga0.7As, {width} nm GaAs, 20 nm Al0.3Ga0.7As", substrate="GaAs"))
    ...     for width in (8, 8.5))
    >>> overlaps(narrow, wide).round(3)
    array([[1.   , 0.   ],
           [0.   , 0.999]])
    """
    check_levels(first, "first")
    check_levels(second, "second")
    counts = [len(levels.profile.sections) for levels in (first, second)]
    written = [levels.profile.written for levels in (first, second)]
    if counts[0] != counts[1] or written[0] != written[1]:
        raise StackError(
            f"overlaps: designs of {len(written[0])} and {len(written[1])} layers in {counts[0]}"
            f" and {counts[1]} stretches can't be laid on each other; change numbers, not the"
            " sequence of layers"
        )
    one, two = first.states.sets, second.states.sets
    if not one or not two:
        return np.zeros((len(first), len(second)))
    grid = grid_for([*one, *two])
    left, right = ([lay(states, grid) for states in sets] for sets in (one, two))
    return np.asarray(np.abs(np.block([[product(a, b) for b in right] for a in left])))


def check_levels(given: object, name: str) -> None:
    """Raise a `StackError` if something else is given as levels."""
    if not isinstance(given, Levels):
        raise StackError(f"{name}: got {show(given)}; Levels are due, as solve(stack) returns them")
