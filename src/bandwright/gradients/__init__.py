"""Exact first derivatives of levels and lines by the numbers of their stack."""

from .energies import couplings, model_parameters
from .result import Gradient, LineGradient, gradient_of

__all__ = ["Gradient", "LineGradient", "couplings", "gradient_of", "model_parameters"]
