"""What the material files know: all materials, or formulas with the numbers they rest on."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, NamedTuple

from ..errors import BandwrightError
from ..materials import Library
from ..quantities import as_temperature
from .data import Columns

ROOM = "300 K"
COMMON_SCALE = "edges stand on the material files' common scale; only differences mean anything"


class Known(NamedTuple):
    """A table of materials, the numbers behind it, and what to beware of.

    ``facts`` has one row a number of the files, ``source`` beside it; no rows for the list of
    all materials.
    """

    columns: Columns
    facts: Columns
    cautions: tuple[str, ...]


def known(
    formulas: Sequence[str] = (),
    temperature: str | None = None,
    substrate: str | None = None,
    files: Sequence[str] = (),
) -> Known:
    """Return the list of all materials, or a row for each formula.

    Parameters
    ----------
    formulas : sequence of str
        Compositions without letters; every material of the files if empty.
    temperature : str, optional
        Of gaps, edges and masses; 300 K if absent.
    substrate : str, optional
        Crystal that the formulas are strained to.
    files : sequence of str
        Own material files.

    Raises
    ------
    MaterialError, UnknownName, QuantityError
        If a formula or a file gives no usable number.
    BandwrightError
        If a temperature or substrate is given, but no formula.

    Examples
    --------
    >>> table = known(["GaAs"]).columns
    >>> table["material"], [round(gap, 3) for gap in table["gap_eV"]]
    (['GaAs'], [1.422])
    """
    library = Library.with_files(files)
    if formulas:
        kelvin = as_temperature(temperature or ROOM, "temperature")
        return _shown(library, formulas, kelvin, substrate)
    for name, given in (("temperature", temperature), ("substrate", substrate)):
        if given is not None:
            raise BandwrightError(
                f"a {name} belongs to a formula; name one, such as Al0.28Ga0.72As", name
            )
    listed = library.listing()
    heads = ("material", "kind", "gap_eV", "mass_m0", "lattice_nm", "direct", "files")
    columns = {head: [row[place] for row in listed] for place, head in enumerate(heads)}
    return Known(columns, {}, tuple(f"{row.name}: {row.note}" for row in listed if row.note))


def _shown(
    library: Library, formulas: Sequence[str], kelvin: float, substrate: str | None
) -> Known:
    rows: list[dict[str, Any]] = []
    facts: dict[tuple[str, str], dict[str, Any]] = {}
    cautions: list[str] = []
    for formula in formulas:
        shown = library.show(formula, kelvin, substrate)
        point = shown.point
        rows.append(
            {
                "material": formula,
                "temperature_K": kelvin,
                "substrate": substrate,
                "gap_eV": float(point.gap),
                "edge_eV": float(point.edge),
                "mass_m0": float(point.mass),
                "lattice_nm": float(point.lattice),
                "monolayer_nm": float(point.monolayer),
                "strain_percent": 100.0 * float(point.exx),
                "direct": bool(point.direct),
                "x_edge_eV": None if point.x_edge is None else float(point.x_edge),
                "l_edge_eV": None if point.l_edge is None else float(point.l_edge),
                "edge_route": shown.edge_route,
            }
        )
        for fact in shown.facts:
            facts.setdefault(
                (fact.name, fact.quantity),
                {
                    "of": fact.name,
                    "number": fact.quantity,
                    "value": fact.value,
                    "source": fact.source,
                    "file": fact.origin,
                },
            )
        cautions += point.cautions
    return Known(
        {key: [row[key] for row in rows] for key in rows[0]},
        {key: [fact[key] for fact in facts.values()] for key in next(iter(facts.values()))},
        tuple(dict.fromkeys(cautions)),
    )
