"""Levels and wavelengths of quantum-well layer stacks, each with its evidence.

The public names below are loaded from their rooms on first use, so that ``import bandwright``
costs nothing.

Examples
--------
>>> import bandwright as bw
>>> bw.Layer("62 Å", "GaAs") == bw.Layer("6.2 nm", "GaAs")
True
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .aiming import Aimed as Aimed
    from .aiming import aim as aim
    from .comparison import compare as compare
    from .crossings import anticrossings as anticrossings
    from .digital import Digital as Digital
    from .digital import digital_alloy as digital_alloy
    from .errors import BandwrightError as BandwrightError
    from .errors import BandwrightWarning as BandwrightWarning
    from .errors import GrowthError as GrowthError
    from .errors import MaterialError as MaterialError
    from .errors import PictureError as PictureError
    from .errors import QuantityError as QuantityError
    from .errors import ResultsError as ResultsError
    from .errors import SolveError as SolveError
    from .errors import StackError as StackError
    from .errors import StackFileError as StackFileError
    from .errors import UnknownName as UnknownName
    from .fitting import Fit as Fit
    from .fitting import Measured as Measured
    from .fitting import MeasuredLine as MeasuredLine
    from .fitting import fit as fit
    from .fitting import read_measured as read_measured
    from .following import follow as follow
    from .following import follow_line as follow_line
    from .following import overlaps as overlaps
    from .gradients import Gradient as Gradient
    from .gradients import LineGradient as LineGradient
    from .growth import AlloyRate as AlloyRate
    from .growth import Calibrations as Calibrations
    from .growth import Cell as Cell
    from .growth import GrowthSheet as GrowthSheet
    from .growth import growth_sheet as growth_sheet
    from .growth import read_calibrations as read_calibrations
    from .growth import stack_from_sheet as stack_from_sheet
    from .growth import write_calibrations as write_calibrations
    from .levels import Levels as Levels
    from .levels import solve as solve
    from .lines import Lines as Lines
    from .many import Many as Many
    from .many import solve_many as solve_many
    from .materials import Library as Library
    from .mismatch import Mismatches as Mismatches
    from .mismatch import mismatches as mismatches
    from .pictures import band_diagram as band_diagram
    from .pictures import budget_bars as budget_bars
    from .pictures import save_picture as save_picture
    from .pictures import sweep_curves as sweep_curves
    from .pictures import yield_histogram as yield_histogram
    from .shapes import Points as Points
    from .stack import Layer as Layer
    from .stack import Repeat as Repeat
    from .stack import Stack as Stack
    from .stackfile import read_stack as read_stack
    from .stackfile import write_stack as write_stack
    from .stackframe import frame_from_stack as frame_from_stack
    from .stackframe import stack_from_frame as stack_from_frame
    from .stackline import parse_line as parse_line
    from .sweeps import sweep as sweep
    from .tolerances import Tolerance as Tolerance
    from .tolerances import tolerance as tolerance
    from .xray import XrayPattern as XrayPattern
    from .xray import xray_pattern as xray_pattern

    __version__: str

_ROOMS = {
    "errors": (
        "BandwrightError",
        "BandwrightWarning",
        "GrowthError",
        "MaterialError",
        "PictureError",
        "QuantityError",
        "ResultsError",
        "SolveError",
        "StackError",
        "StackFileError",
        "UnknownName",
    ),
    "shapes": ("Points",),
    "stack": ("Layer", "Repeat", "Stack"),
    "stackfile": ("read_stack", "write_stack"),
    "stackline": ("parse_line",),
    "stackframe": ("frame_from_stack", "stack_from_frame"),
    "materials": ("Library",),
    "levels": ("Levels", "solve"),
    "lines": ("Lines",),
    "many": ("Many", "solve_many"),
    "gradients": ("Gradient", "LineGradient"),
    "mismatch": ("Mismatches", "mismatches"),
    "xray": ("XrayPattern", "xray_pattern"),
    "following": ("follow", "follow_line", "overlaps"),
    "comparison": ("compare",),
    "pictures": (
        "band_diagram",
        "budget_bars",
        "save_picture",
        "sweep_curves",
        "yield_histogram",
    ),
    "sweeps": ("sweep",),
    "tolerances": ("Tolerance", "tolerance"),
    "aiming": ("Aimed", "aim"),
    "crossings": ("anticrossings",),
    "digital": ("Digital", "digital_alloy"),
    "growth": (
        "AlloyRate",
        "Calibrations",
        "Cell",
        "GrowthSheet",
        "growth_sheet",
        "read_calibrations",
        "stack_from_sheet",
        "write_calibrations",
    ),
    "fitting": ("Fit", "Measured", "MeasuredLine", "fit", "read_measured"),
}
_ROOM_OF = {name: room for room, names in _ROOMS.items() for name in names}

__all__ = ["__version__", *sorted(_ROOM_OF)]


def __getattr__(name: str) -> Any:
    if name == "__version__":
        from importlib.metadata import version

        value: Any = version("bandwright")
    elif name in _ROOM_OF:
        value = getattr(import_module(f".{_ROOM_OF[name]}", __name__), name)
    else:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted({*globals(), *__all__})
