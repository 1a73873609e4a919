"""Shifts in words."""

from __future__ import annotations

import math

from ..constants import HC
from ..lines import Line

#: shifts below this are said in nm [um]
IN_NM = 0.1


def signed(value: float) -> str:
    """Return a shift with its sign and two digits.

    Examples
    --------
    >>> signed(-0.1234), signed(2.5e-7), signed(float("nan"))
    ('-0.12', '0', 'unknown')
    """
    if math.isnan(value):
        return "unknown"
    return f"{value:+.2g}" if abs(value) >= 1e-6 else "0"


def length_shift(shift: float) -> str:
    """Return a shift of a wavelength [um] with its unit.

    Examples
    --------
    >>> length_shift(-0.1234), length_shift(0.0123), length_shift(float("nan"))
    ('-0.12 um', '+12 nm', 'unknown')
    """
    if math.isnan(shift):
        return "unknown"
    small = 1e-6 <= abs(shift) < IN_NM
    return f"{signed(shift * 1e3)} nm" if small else f"{signed(shift)} um"


def wavelength_shift(line: Line | None, shift: float) -> float:
    """Return the shift of the vacuum wavelength [um] of a shift of the energy [eV]."""
    if line is None or line.energy_meV * 1e-3 + shift <= 0.0:
        return math.nan
    return HC / (line.energy_meV * 1e-3 + shift) * 1e-3 - line.wavelength_um
