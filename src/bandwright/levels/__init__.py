"""Profile -> Levels: what is solved between which ends, groups, and the result itself."""

from .result import Levels
from .solving import solve

__all__ = ["Levels", "solve"]
