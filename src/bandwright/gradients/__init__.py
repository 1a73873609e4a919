"""Exact first derivatives of levels and lines by the numbers of their stack."""

from .result import Gradient, LineGradient, gradient_of

__all__ = ["Gradient", "LineGradient", "gradient_of"]
