"""Growth: a reactor's calibrations, and the sheet by which a stack is grown."""

from .back import stack_from_sheet
from .calibrations import AlloyRate, Calibrations, Cell
from .files import calibrations_of, calibrations_text, read_calibrations, write_calibrations
from .sheet import GrowthSheet, growth_sheet

__all__ = [
    "AlloyRate",
    "Calibrations",
    "Cell",
    "GrowthSheet",
    "calibrations_of",
    "calibrations_text",
    "growth_sheet",
    "read_calibrations",
    "stack_from_sheet",
    "write_calibrations",
]
