"""What the reactor did: factors of its fluxes from what a wafer was measured to be.

`measured` holds the data, `files` reads them, `factors` are what is looked for, `model` computes
the data of a design with their slopes, `apart` says what the data leave open, `search` calls
them, `result` holds what came out.
"""

from .files import measured_of, read_measured
from .measured import Measured, MeasuredLine
from .result import Fit
from .search import fit

__all__ = ["Fit", "Measured", "MeasuredLine", "fit", "measured_of", "read_measured"]
