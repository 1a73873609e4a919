"""What the material files know: a row for each material, or for each formula asked about."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from ..errors import BandwrightError
from ..formula import parse
from ..materials import Library
from ..quantities import as_temperature
from .data import Columns

ABSOLUTE = "edges stand on the material files' common scale; only differences have a meaning"


def known(
    formulas: Sequence[str] = (),
    temperature: str = "300 K",
    substrate: str | None = None,
    files: Sequence[str] = (),
) -> tuple[Columns, tuple[str, ...]]:
    """Return columns of gap, edge, mass and lattice, and the cautions that go with them.

    Parameters
    ----------
    formulas : sequence of str
        Compositions; every material of the files if empty, an alloy's row then without numbers.
    temperature : str
        Temperature of gaps, edges and masses.
    substrate : str, optional
        Crystal that everything is strained to.
    files : sequence of str
        Own material files.

    Raises
    ------
    MaterialError, UnknownName, QuantityError
        If a formula or file gives no usable number.

    Examples
    --------
    >>> columns, cautions = known(["GaAs"])
    >>> columns["material"], [round(gap, 3) for gap in columns["gap_eV"]]
    (['GaAs'], [1.422])
    """
    library = Library.with_files(files)
    kelvin = as_temperature(temperature, "temperature")
    rows: list[dict[str, Any]] = []
    cautions: list[str] = [ABSOLUTE]
    for name in formulas or library.names():
        row, more = _row(library, name, kelvin, substrate, listed=not formulas)
        rows.append(row)
        cautions += more
    return {key: [row[key] for row in rows] for key in rows[0]}, tuple(dict.fromkeys(cautions))


def _row(
    library: Library, name: str, kelvin: float, substrate: str | None, listed: bool
) -> tuple[dict[str, Any], tuple[str, ...]]:
    row: dict[str, Any] = dict.fromkeys(
        (
            *("material", "gap_eV", "edge_eV", "mass_m0", "lattice_nm", "monolayer_nm"),
            *("strain_percent", "direct", "x_edge_eV", "l_edge_eV"),
        )
    )
    row["material"] = name
    if listed:
        row["files"] = library.origin(name)
        if any(letter in name for letter in "xyz"):
            return row, ()
    try:
        point = library.properties(parse(name), kelvin, substrate)
    except BandwrightError as error:
        if not listed:
            raise
        return row, (str(error),)
    row |= {
        "gap_eV": float(point.gap),
        "edge_eV": float(point.edge),
        "mass_m0": float(point.mass),
        "lattice_nm": float(point.lattice),
        "monolayer_nm": float(point.monolayer),
        "strain_percent": 100.0 * float(point.exx),
        "direct": point.direct,
        "x_edge_eV": None if point.x_edge is None else float(point.x_edge),
        "l_edge_eV": None if point.l_edge is None else float(point.l_edge),
    }
    return row, point.cautions if not listed else ()
