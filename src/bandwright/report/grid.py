"""A table as fixed-width text: stacked headings, a line of units, sensible digits.

Headings come from the column names, unit suffix and all, so what is read in the text is called
the same in CSV and JSON.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from textwrap import wrap
from typing import Any

# Suffix of a column name -> unit as printed; the longest that fits counts.
UNITS = {
    "_meV_per_nm": "meV/nm",
    "_per_eV": "1/eV",
    "_per_cm": "cm-1",
    "_kV_per_cm": "kV/cm",
    "_meV": "meV",
    "_eV": "eV",
    "_nm": "nm",
    "_ML": "ML",
    "_V": "V",
    "_per_cm2": "cm-2",
    "_per_cm3": "cm-3",
    "_um": "um",
    "_THz": "THz",
    "_ML_per_s": "ML/s",
    "_s": "s",
    "_ps": "ps",
    "_fs": "fs",
    "_K": "K",
    "_m0": "m0",
    "_percent": "%",
    "_GPa": "GPa",
    "_deg": "deg",
    "_arcsec": "arcsec",
}

NARROW = 11  # no heading is wrapped to less

# Digits that levels good to 1e-6 eV deserve; anything not named prints with six.
DIGITS = {
    "energy_meV": ".2f",
    "phase_integral_meV": ".2f",
    "difference_meV": ".3f",
    "largest_difference_meV": ".3f",
    "wall_shift_meV_per_nm": ".3f",
    "shift_meV": "+.3f",
    "shift_um": "+.3f",
    "probability": ".3f",
    "mean_position_nm": ".2f",
    "spread_nm": ".2f",
    "wavelength_um": ".3f",
    "wavenumber_per_cm": ".1f",
    "frequency_THz": ".2f",
    "dipole_nm": ".3f",
    "oscillator_strength": ".3f",
    "thickness_nm": ".3f",
    "net_strain_percent": ".4f",
    "rounded_wavelength_um": ".3f",
    "sigma_um": ".4f",
    "sigma_meV": ".3f",
    "yield_percent": ".2f",
    "score": ".3f",
    "gap_eV": ".4f",
    "edge_eV": ".4f",
    "x_edge_eV": ".4f",
    "l_edge_eV": ".4f",
    "mass_m0": ".5f",
    "lattice_nm": ".6f",
    "monolayer_nm": ".6f",
    "strain_percent": ".3f",
    "mismatch_percent": "+.3f",
    "worst_mismatch_percent": "+.3f",
    "stress_GPa": "+.3f",
    "critical_thickness_nm": ".2f",
    "critical_in_group_nm": ".2f",
    "bragg_angle_deg": ".4f",
    "tilt_deg": ".4f",
    "two_theta_deg": ".4f",
    "from_substrate_arcsec": "+.1f",
}


# Columns that show more of them when levels are better than that.
FINER = (
    *("energy_meV", "phase_integral_meV", "difference_meV"),
    *("wavelength_um", "wavenumber_per_cm", "frequency_THz"),
)


def digits_for(tolerance: float) -> dict[str, str]:
    """Return the digits that levels good to a tolerance [eV] deserve.

    Examples
    --------
    >>> digits_for(1e-6)["energy_meV"], digits_for(1e-9)["energy_meV"]
    ('.2f', '.5f')
    """
    more = min(max(0, round(-6.0 - math.log10(tolerance))), 6)
    finer = {name: f".{int(DIGITS[name][1]) + more}f" for name in FINER}
    return {**DIGITS, **finer}


def unit_of(name: str) -> tuple[str, str]:
    """Return the words of a column name and the unit it carries.

    Examples
    --------
    >>> unit_of("wall_shift_meV_per_nm")
    ('wall shift', 'meV/nm')
    >>> unit_of("main_layer")
    ('main layer', '')
    """
    for suffix in sorted(UNITS, key=len, reverse=True):
        if name.endswith(suffix):
            return name.removesuffix(suffix).replace("_", " "), UNITS[suffix]
    return name.replace("_", " "), ""


def cell(name: str, value: Any, digits: Mapping[str, str] = DIGITS) -> str:
    """Return one value as a reader wants it.

    Examples
    --------
    >>> cell("energy_meV", 61.23456), cell("of_box", False), cell("dipole_nm", float("nan"))
    ('61.23', 'no', '-')
    """
    if value is None:
        return "-"
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int | str):
        return str(value)
    number = float(value)
    if math.isnan(number):
        return "-"
    text = format(number, digits.get(name, ".6g"))
    return text.lstrip("+-") if float(text) == 0.0 else text


def grid(columns: Mapping[str, Sequence[Any]], digits: Mapping[str, str] = DIGITS) -> list[str]:
    r"""Return the lines of a table: headings from the column names, then the rows.

    Words are set flush left, numbers flush right.

    Parameters
    ----------
    columns : mapping of str to sequence
        Column name -> its values.
    digits : mapping of str to str
        Column name -> format of its floats.

    Examples
    --------
    >>> print("\n".join(grid({"level": [1, 2], "energy_meV": [61.2346, 140.1]})))
    level  energy
              meV
        1   61.23
        2  140.10
    """
    blocks = []
    for name, values in columns.items():
        cells = [cell(name, value, digits) for value in values]
        words, unit = unit_of(name)
        longest = max((len(c) for c in cells), default=0)
        title = wrap(words, max(longest, NARROW)) or [""]
        width = max(longest, len(unit), *(len(line) for line in title))
        of_words = not unit and all(isinstance(value, str | None) for value in values)
        fit = str.ljust if of_words else str.rjust
        blocks.append([fit(text, width) for text in [*title, unit, *cells]])
    height = max(len(block) for block in blocks)
    for block in blocks:
        block[:0] = [" " * len(block[0])] * (height - len(block))
    lines = ["  ".join(row).rstrip() for row in zip(*blocks, strict=True)]
    return [line for line in lines if line]
