"""Derivatives of smooth functions from seven values in equal steps, to rounding.

The steps may stand to one side, where a number ends (a fraction at 0 or 1, zero kelvin).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from ..errors import StackError

Floats = npt.NDArray[np.float64]

#: where the values are taken, in steps from the middle
STEPS = np.arange(-3.0, 4.0)
_POWERS = np.arange(1.0, 7.0)
# rows: coefficients of the polynomial through seven values, ascending, without the constant
_POLYNOMIAL = np.linalg.inv(np.vander(STEPS, increasing=True))[1:]


def stencil(
    value: Floats, below: npt.ArrayLike, above: npt.ArrayLike, step: float
) -> tuple[Floats, Floats]:
    """Return where to take values, and their weights in the derivative, each (7, n).

    Parameters
    ----------
    value : array (n,)
        Where the derivative is due.
    below, above : float or array (n,)
        How far it may go.
    step : float

    Raises
    ------
    StackError
        If there is no room for the steps.

    Examples
    --------
    >>> places, weights = stencil(np.array([0.0, 0.5]), np.array([0.0, 0.5]), 1.0, 0.004)
    >>> print(np.round(np.sum(weights * np.exp(places), axis=0), 9))
    [1.         1.64872127]
    """
    least, most = 3.0 * step - np.asarray(below), np.asarray(above) - 3.0 * step
    if np.any(least > most):
        raise StackError(f"it has no room to move by {6.0 * step:g} in all")
    off = np.broadcast_to(np.clip(0.0, least, most), value.shape)
    places = value + off + step * STEPS[:, None]
    slopes = _POWERS[:, None] * (-off / step) ** (_POWERS[:, None] - 1.0)
    return places, np.asarray(_POLYNOMIAL.T @ slopes / step)
