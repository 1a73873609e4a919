"""Tolerance: what the spreads of a growth do to wavelengths, and how many wafers stay in a window.

`spreads` reads standard deviations, `result` propagates them by exact gradients, `drawing` solves
stacks drawn at random beside it, `columns` are sigma and yield as metrics of `compare`.
"""

from .columns import NAMES as NAMES
from .columns import OfTolerance as OfTolerance
from .result import Tolerance as Tolerance
from .result import tolerance as tolerance
from .spreads import Spread as Spread
from .spreads import read_spreads as read_spreads
