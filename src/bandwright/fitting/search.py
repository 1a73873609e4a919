"""fit(): a design and what its wafer was measured to be in, what the reactor did out."""

from __future__ import annotations

import os
from collections.abc import Sequence

import numpy as np
import numpy.typing as npt
from scipy.optimize import least_squares

from ..cautions import warn
from ..errors import ResultsError, SolveError, StackError
from ..levels.solving import check_stack
from ..quantities import as_energy, show
from ..stack import Stack
from .apart import told
from .factors import read_factors
from .files import read_measured
from .measured import Measured
from .model import Model, Point
from .result import Fit

Floats = npt.NDArray[np.float64]

#: coarsest tolerance of a solve [eV]
_FINE = 1e-9
#: relative change of chi-square, and of the coordinates, at which the search ends
_CHANGE, _STEP = 1e-9, 1e-9
#: most places looked at
_MOST = 25


def fit(
    stack: Stack,
    measured: Measured | str | os.PathLike[str],
    factors: Sequence[str] | None = None,
    *,
    below: object = None,
    tolerance: object = "1e-9 eV",
    bands: str | None = None,
) -> Fit:
    """Return by which factors a wafer differs from its design, from what was measured of it.

    Parameters
    ----------
    stack : Stack
        The design.
    measured : Measured or path
        Lines, X-ray period and mismatch of one wafer, each with its error.
    factors : sequence of str, optional
        ``"flux Ga"`` and the like, ``"all thicknesses"``, thicknesses and compositions, as
        `bandwright.parameters.list_parameters` names them; the flux of every group-III element of
        the stack if absent.
    below, bands
        As for `bandwright.solve`.
    tolerance : energy
        Of each level; 1e-9 eV at least.

    Returns
    -------
    Fit
        ``.table`` of the factors with their errors, ``.data``, ``.covariance``, ``.chi_square``,
        ``.probability``, ``.apart``, ``.grown``, ``.corrected``, ``.sheet(calibrations)``.

    Raises
    ------
    StackError
        If there are fewer data than factors, a line that the design does not have, a factor that
        growth does not move, or no flux.
    SolveError
        If the search comes to no end.
    ResultsError, QuantityError, UnknownName
        If something given can't be read.

    Notes
    -----
    The sum of squares of (computed - measured)/error is made smallest by
    `scipy.optimize.least_squares` with exact slopes: those of lines by `Levels.gradient`, so that
    each place costs one solve a temperature; those of the X-ray data by central differences of
    closed forms. The covariance is the inverse of J^T J, J the slopes in standard deviations:
    errors are taken as given. The goodness of fit is the probability that chi-square is larger.

    Factors that multiply move as logarithms. What no datum sees stays as designed.

    Examples
    --------
    An invented superlattice, with data as if gallium had come 2 % too fast:

    >>> import bandwright as bw
    >>> stack = bw.parse_line("9 nm Al0.3Ga0.7As, 10 x (6.5 nm GaAs, 9 nm Al0.3Ga0.7As)",
    ...                       substrate="GaAs")
    >>> data = bw.Measured(period="15.756 nm", period_error="0.01 nm", mismatch_ppm=238,
    ...                    mismatch_error=4)
    >>> found = bw.fit(stack, data)
    >>> print(found.table[["designed", "grown", "sigma"]].round(4))
             designed   grown   sigma
    factor
    flux Al       1.0  1.0002  0.0168
    flux Ga       1.0  1.0200  0.0036
    >>> found.freedom, found.solves
    (0, 0)
    """
    check_stack(stack, "stack")
    data = measured if isinstance(measured, Measured) else _read(measured)
    wanted = read_factors(stack, factors)
    if len(data) < len(wanted):
        raise StackError(
            f"measured: {_counted(len(data), 'datum', 'data')} for"
            f" {_counted(len(wanted), 'factor', 'factors')}"
            f" ({', '.join(factor.name for factor in wanted)}); name fewer, or measure more"
        )
    finest = min(as_energy(tolerance, "tolerance"), _FINE)
    arguments = {"below": below, "bands": bands, "tolerance": f"{finest!r} eV"}
    model = Model(stack, data, wanted, arguments)
    first = model.first()
    basis = told(first.slopes).closed
    point = _nearest(model, basis) if basis.shape[1] else first
    for levels in point.levels.values():
        warn(levels)
    return Fit(model, first, point, basis)


def _read(given: object) -> Measured:
    if isinstance(given, str | os.PathLike):
        return read_measured(given)
    raise ResultsError(f"measured: got {show(given)}; give Measured data, or the path of a file")


def _nearest(model: Model, basis: Floats) -> Point:
    """Return the best place of a basis of coordinates.

    Raises
    ------
    SolveError
        If there is no end.
    """
    def pulls(z: Floats) -> Floats:
        point = model.at(basis @ z)
        # what is not finite is taken back by the search, with a shorter step
        return np.full(len(model.values), np.nan) if point is None else point.pulls

    def slopes(z: Floats) -> Floats:
        point = model.at(basis @ z)
        assert point is not None  # it is asked only where the pulls were finite
        return point.slopes @ basis

    found = least_squares(
        pulls, np.zeros(basis.shape[1]), slopes, method="trf", ftol=_CHANGE, xtol=_STEP,
        gtol=None, max_nfev=_MOST,
    )  # fmt: skip
    point = model.at(basis @ found.x)
    if found.status == 0 or point is None:
        why = f"; last: {model.why}" if model.why else ""
        raise SolveError(f"no end of the fit after {_MOST} designs{why}; are the lines the right"
                         " ones, and the errors not too small?")  # fmt: skip
    return point


def _counted(count: int, one: str, many: str) -> str:
    return f"{count} {one if count == 1 else many}"
