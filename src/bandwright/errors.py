"""Every error and warning bandwright raises, rooted at one class each.

A concrete error also is the builtin a Python programmer would expect (`ValueError`,
`KeyError`, `RuntimeError`), keeps its data as attributes and builds its text from them:
where, what was found, what would be right.
"""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches


class BandwrightError(Exception):
    """Base of every error bandwright raises on purpose.

    Parameters
    ----------
    message : str
        What was found and what would be right.
    where : str, optional
        File, layer or key the message is about; printed before it.
    """

    def __init__(self, message: str, where: str | None = None) -> None:
        super().__init__(message, where)
        self.message = message
        self.where = where

    def __str__(self) -> str:
        return f"{self.where}: {self.message}" if self.where else self.message

    def at(self, where: str) -> BandwrightError:
        """Return the same error with ``where`` put before its own place."""
        place = f"{where}, {self.where}" if self.where else where
        return type(self)(self.message, place)


class QuantityError(BandwrightError, ValueError):
    """A value that is no quantity of the kind that is due."""


class StackError(BandwrightError, ValueError):
    """A layer or stack that can't be grown or solved as written."""


class StackFileError(StackError):
    """A stack file or line that can't be read."""


class ResultsError(BandwrightError, ValueError):
    """A results file that can't be written, or that holds something else."""


class MaterialError(BandwrightError, ValueError):
    """A formula or material file that gives no usable number."""


class GrowthError(BandwrightError, ValueError):
    """Calibrations that can't be used, or a layer that they can't grow."""


class UnknownName(BandwrightError, KeyError):
    """A name that nothing has; close matches are part of the text."""

    __str__ = BandwrightError.__str__


class SolveError(BandwrightError, RuntimeError):
    """Levels that can't be found to the accuracy asked."""


class PictureError(BandwrightError, RuntimeError):
    """A picture that can't be drawn or written."""


class BandwrightWarning(UserWarning):
    """A result that stands, with something its reader should know."""


def close_matches(found: str, known: Iterable[str]) -> str:
    """Return ``"; did you mean ...?"`` or the list of what is known, to end an error text.

    Examples
    --------
    >>> close_matches("thicknes", ["thickness", "label"])
    "; did you mean 'thickness'?"
    """
    names = sorted(known)
    close = get_close_matches(found, names, n=3)
    if close:
        return "; did you mean " + " or ".join(repr(name) for name in close) + "?"
    return "; known are " + ", ".join(names) if names else ""
