"""What came out of a fit, and what follows for the next run."""

from __future__ import annotations

import os
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt
from scipy.special import chdtrc

from ..errors import GrowthError, StackError
from ..frames import frame
from ..growth import (
    AlloyRate,
    Calibrations,
    Cell,
    GrowthSheet,
    growth_sheet,
    read_calibrations,
)
from ..levels import Levels
from ..quantities import Rate
from ..stack import Stack
from .apart import Told, correlation, told, words
from .factors import RATES, element_of, taken_back
from .measured import Measured
from .model import Model, Point, scale_of

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]

#: below this probability the factors don't explain the data
UNLIKELY = 0.01
#: what corrected calibrations say of themselves, and the digits that they keep
_CORRECTED, _DIGITS = "rates corrected by the fit of a wafer", 6


@dataclass(frozen=True, eq=False, repr=False)
class Fit:
    """By which factors a wafer differs from its design; `bandwright.fit` makes it.

    Attributes
    ----------
    model : Model
    first : Point
        The design.
    point : Point
        The wafer as fitted.
    basis : array (n_factors, n_seen)
        Combinations of the factors that were moved; all of them where the data see all.
    """

    model: Model
    first: Point
    point: Point
    basis: Floats

    def __repr__(self) -> str:
        return f"<Fit: {len(self.names)} factors to {len(self.model.values)} data>"

    @property
    def stack(self) -> Stack:
        """The design."""
        return self.model.stack

    @property
    def measured(self) -> Measured:
        """What was measured."""
        return self.model.measured

    @property
    def solves(self) -> int:
        """How many stacks were solved."""
        return self.model.solves

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the factors."""
        return tuple(factor.name for factor in self.model.factors)

    @cached_property
    def values(self) -> Floats:
        """The factors (n_factors,), in the units of their parameters."""
        return np.array(self.model.values_at(self.point.x))

    @cached_property
    def _told(self) -> Told:
        found = told(self.point.slopes)
        if self.basis.shape[1] == found.closed.shape[1]:
            return found
        # what was open at the design was not moved, whatever the end may see of it
        return Told(found.slopes, _rest(self.basis), found.unseen)

    @cached_property
    def covariance(self) -> Floats:
        """Covariance of the factors (n_factors, n_factors), errors of the data taken as given.

        Infinite for what the data leave open, nan between that and other factors.
        """
        scale = scale_of(self.model.factors, self.point.x)
        return np.asarray(self._told.covariance() * np.outer(scale, scale))

    @property
    def sigmas(self) -> Floats:
        """One standard deviation of each factor (n_factors,)."""
        return np.sqrt(np.diag(self.covariance))

    @property
    def correlations(self) -> Floats:
        """Correlations of the factors (n_factors, n_factors)."""
        return correlation(self.covariance)

    @property
    def apart(self) -> tuple[str, ...]:
        """Which factors the data can't tell apart, in sentences; empty where they tell all."""
        return words(self._told, self.names, self.correlations)

    @property
    def chi_square(self) -> float:
        """Sum of squares of (computed - measured)/error."""
        return float(self.point.pulls @ self.point.pulls)

    @property
    def freedom(self) -> int:
        """Degrees of freedom: data less what they tell."""
        return len(self.model.values) - int(self.basis.shape[1])

    @property
    def probability(self) -> float | None:
        """How likely chi-square is to be larger if the factors are all; None without freedom."""
        return float(chdtrc(self.freedom, self.chi_square)) if self.freedom else None

    @property
    def goodness(self) -> str:
        """How well the factors explain the data, in a sentence."""
        said = f"chi-square {self.chi_square:.3g} at {self.freedom} degrees of freedom"
        if self.freedom == 1:
            said = said.removesuffix("s of freedom") + " of freedom"
        if self.probability is None:
            return f"{said}: as many data as factors, so nothing tells whether they are the cause"
        return f"{said}, probability {self.probability:.3g}"

    @property
    def grown(self) -> Stack:
        """The wafer as fitted."""
        return self.point.stack

    @cached_property
    def corrected(self) -> Stack:
        """The stack to set, in place of the design, so that the next wafer is the design.

        For a reactor that does again what it did: fluxes and thicknesses by the inverse factors,
        compositions as far to the other side.

        Raises
        ------
        StackError
            If it can't be grown.
        """
        return taken_back(self.stack, self.model.factors, list(self.values))

    @property
    def levels(self) -> dict[float, Levels]:
        """Levels of the wafer as fitted, by temperature [K]."""
        return self.point.levels

    @property
    def table(self) -> pd.DataFrame:
        """One row a factor, index ``factor``.

        ``designed``, ``grown`` and its ``sigma``, ``off_percent`` (of a composition, of one), and
        ``to_set``, which brings the design.
        """
        return frame(self.columns, index="factor", texts=("factor", "unit"))

    @property
    def columns(self) -> dict[str, list[Any]]:
        """The columns of `table`."""
        factors = self.model.factors
        pairs = list(zip(factors, (float(v) for v in self.values), strict=True))
        return {
            "factor": list(self.names),
            "designed": [factor.start for factor in factors],
            "grown": [value for _, value in pairs],
            "sigma": [float(sigma) for sigma in self.sigmas],
            "off_percent": [
                100.0 * (value - f.start if f.adds else value / f.start - 1.0) for f, value in pairs
            ],
            "to_set": [factor.back(value) for factor, value in pairs],
            "unit": [factor.parameter.unit or None for factor in factors],
        }

    @property
    def data(self) -> pd.DataFrame:
        """One row a datum, index ``datum``.

        ``measured``, its ``error``, what the ``designed`` and the ``fitted`` stack have, and
        ``pull``, (fitted - measured)/error.
        """
        return frame(self.data_columns, index="datum", texts=("datum", "unit"))

    @property
    def data_columns(self) -> dict[str, list[Any]]:
        """The columns of `data`."""
        model, lines = self.model, len(self.model.pairs)
        period = ["nm"] if self.measured.period_nm is not None else []
        mismatch = ["ppm"] if self.measured.mismatch_ppm is not None else []
        scale = np.where(np.arange(len(model.values)) < lines, 1e-3, 1.0)  # wavelengths in um
        return {
            "datum": model.names,
            "measured": (model.values * scale).tolist(),
            "error": (model.errors * scale).tolist(),
            "designed": (self.first.data * scale).tolist(),
            "fitted": (self.point.data * scale).tolist(),
            "pull": self.point.pulls.tolist(),
            "unit": ["um"] * lines + period + mismatch,
        }

    @property
    def cautions(self) -> tuple[str, ...]:
        """What a reader should know: what is not told apart or can't be set, a poor fit, and so on.

        The cautions of the levels are among them.
        """
        texts = list(self.apart)
        if self.probability is not None and self.probability < UNLIKELY:
            worst = int(np.argmax(np.abs(self.point.pulls)))
            texts.append(
                f"these factors do not explain the data: {self.goodness}; the farthest off is"
                f" {self.model.names[worst]}, by {abs(self.point.pulls[worst]):.1f} standard"
                " deviations; the sigmas take the errors as given and are too small here"
            )
        try:
            _ = self.corrected
        except StackError as error:
            texts.append(str(error))
        for levels in self.levels.values():
            texts += levels.cautions
        return tuple(dict.fromkeys(texts))

    def calibrations(self, given: Calibrations | str | os.PathLike[str]) -> Calibrations:
        """Return a reactor's calibrations as this wafer says they are.

        Parameters
        ----------
        given : Calibrations or path
            Those by which the wafer was grown.

        Raises
        ------
        GrowthError
            If the rate of an alloy as a whole would need the factor of one flux.
        UnknownName
            If a flux that was fitted has no cell.
        """
        found = given if isinstance(given, Calibrations) else read_calibrations(given)
        overall, fluxes = 1.0, {}
        for factor, value in zip(self.model.factors, self.values, strict=True):
            element = element_of(factor)
            if element is not None:
                fluxes[element] = float(value)
            elif factor.parameter.kind in RATES:
                overall *= float(value)
        if fluxes and found.alloys:
            raise GrowthError(
                f"alloy '{found.alloys[0].formula}': its rate is that of the alloy as a whole, and"
                " a factor of one flux changes its composition too; fit 'all thicknesses', or"
                " calibrate by cells"
            )
        factors = {e: overall * fluxes.get(e, 1.0) for e in found.elements}
        factors |= {alloy.formula: overall for alloy in found.alloys}
        for element in fluxes:
            factors.setdefault(element, 1.0)  # one without a cell is said by `scaled`
        scaled = found.scaled(factors)
        cells = [
            Cell(c.name, c.element, _plain(c.rate), c.on, c.note, c.date) for c in scaled.cells
        ]
        alloys = [AlloyRate(a.formula, _plain(a.rate), a.note, a.date) for a in scaled.alloys]
        note = f"{found.note}; {_CORRECTED}" if found.note else _CORRECTED
        return Calibrations(cells, alloys, found.name, note, found.date)

    def sheet(
        self, calibrations: Calibrations | str | os.PathLike[str], **arguments: Any
    ) -> GrowthSheet:
        """Return the growth sheet of the next run, by the rates that this wafer tells.

        The cells are left as they are: rates are multiplied by the factors of fluxes and of all
        thicknesses, and the design is grown by them in whole monolayers. Factors of single layers
        change those layers.

        Parameters
        ----------
        calibrations : Calibrations or path
            Those by which the wafer was grown.
        **arguments
            As for `bandwright.growth_sheet`.

        Raises
        ------
        GrowthError, StackError, UnknownName
            As `bandwright.growth_sheet`, and `calibrations`.
        """
        single = [f.parameter.kind not in RATES for f in self.model.factors]
        factors = [f for f, alone in zip(self.model.factors, single, strict=True) if alone]
        values = [float(v) for v, alone in zip(self.values, single, strict=True) if alone]
        stack = taken_back(self.stack, factors, values)
        return growth_sheet(stack, self.calibrations(calibrations), **arguments)

    def __str__(self) -> str:
        from ..report.fitted import fit_text

        return fit_text(self)

    def _repr_html_(self) -> str:
        from ..report.fitted import fit_html

        return fit_html(self)

    def markdown(self) -> str:
        """Return the fit as Markdown."""
        from ..report.fitted import fit_markdown

        return fit_markdown(self)


def _rest(basis: Floats) -> Floats:
    """Return what is orthogonal to an orthonormal basis, (n_factors, n_factors - n_seen)."""
    full = np.linalg.qr(basis, mode="complete")[0] if basis.shape[1] else np.eye(len(basis))
    return np.asarray(full[:, basis.shape[1] :])


def _plain(rate: Rate) -> Rate:
    """Return a rate to as many digits as a fit can tell."""
    return Rate(float(f"{rate.value:.{_DIGITS}g}"), rate.unit)
