"""Pictures: the only room that knows matplotlib, which comes with the extra ``plot``.

An Axes goes in, an Axes comes out. matplotlib is imported when a picture is drawn, not before.
"""

from .bands import band_diagram
from .bars import budget_bars
from .histogram import yield_histogram
from .reading import read_table
from .sheet import check_path, save_picture, without_screen
from .sweeping import sweep_curves

__all__ = [
    "band_diagram",
    "budget_bars",
    "check_path",
    "read_table",
    "save_picture",
    "sweep_curves",
    "without_screen",
    "yield_histogram",
]
