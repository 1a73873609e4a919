"""DataFrame <-> Stack, one row a written layer.

Columns are a layer's keys. A column of texts has the key's own name (``thickness`` with
``"6.2 nm"``), a column of numbers says its unit (``thickness_nm``, ``edge_meV``). A graded value
takes two columns, ``x_first`` and ``x_last``; a table of points is text in ``x_points``, as a
line writes it: ``"0 at 0 nm to 0.3 at 8 nm"``. A group is named in ``group`` and counted in
``times``; one inside another is ``"1/1"`` with ``"30/4"``.
"""

from __future__ import annotations

from collections.abc import Mapping
from decimal import Decimal
from itertools import groupby
from typing import TYPE_CHECKING, Any

from . import frames
from .errors import StackFileError, close_matches
from .quantities import (
    as_density,
    as_energy,
    as_field,
    as_inverse_energy,
    as_length,
    as_thickness,
    number_text,
    show,
)
from .stack import DOPING, Layer, Repeat, Stack
from .stackfile.keys import PLAIN, SHAPED, UNITS, column, entries_of, layer_from
from .stackfile.shapetext import shape_text, shape_value

if TYPE_CHECKING:
    import pandas as pd

_ENDS = ("first", "last")
_POINTS = tuple(f"{key}_points" for key in SHAPED)
#: column -> (key or key_first or key_last, text of the unit)
_COLUMNS: Mapping[str, tuple[str, str]] = {
    column(name, unit): (name, text)
    for key, units in UNITS.items()
    if key != "depth"
    for name in ((key, f"{key}_first", f"{key}_last") if key in SHAPED else (key,))
    for unit, text in units.items()
}
#: key -> families of forms; a form is (end of the column's name, power of ten from core units),
#: the last one of a family exact
_FORMS: Mapping[str, tuple[tuple[tuple[str, int], ...], ...]] = {
    "thickness": ((("nm", 0),), (("ML", 0),)),
    "edge": ((("meV", 3), ("eV", 0)),),
    "gap": ((("eV", 0),),),
    "nonparabolicity": ((("per_eV", 0),),),
    "interface_width": ((("nm", 0),),),
    "field": ((("kV_per_cm", 4), ("V_per_nm", 0)),),
    "donors": ((("per_cm2", 14), ("per_nm2", 0)), (("per_cm3", 21), ("per_nm3", 0))),
    "acceptors": ((("per_cm2", 14), ("per_nm2", 0)), (("per_cm3", 21), ("per_nm3", 0))),
    "delta_donors": ((("per_cm2", 14), ("per_nm2", 0)),),
    "delta_acceptors": ((("per_cm2", 14), ("per_nm2", 0)),),
}
_READ = {
    "edge": as_energy,
    "gap": as_energy,
    "nonparabolicity": as_inverse_energy,
    "field": as_field,
    "interface_width": as_length,
}
_TEXTS = (*PLAIN, *SHAPED, *(f"{key}_{end}" for key in SHAPED for end in _ENDS), *_POINTS)
_KNOWN = (*_TEXTS, *(name for name in _COLUMNS if name not in _TEXTS), "group", "times")


def stack_from_frame(df: pd.DataFrame, **stack_arguments: Any) -> Stack:
    """Return the stack whose layers are the rows of a table.

    Parameters
    ----------
    df : DataFrame
        One row a layer, in growth order (or the order named in ``stack_arguments``). Empty
        cells (NaN, None, blank text) are left out; a label ``"NA"`` is a label. From a CSV
        file: ``pandas.read_csv(path, keep_default_na=False, dtype=str)``.
    **stack_arguments
        What the rows do not say, as for `Stack`.

    Raises
    ------
    StackFileError
        If a column is unknown, or a row or a group can't be read; the text names the row.
    StackError, QuantityError
        If the layers can't be grown.

    Examples
    --------
    >>> import pandas as pd
    >>> table = pd.DataFrame({"thickness_nm": [30.0, 6.2], "material": ["Al0.3Ga0.7As", "GaAs"]})
    >>> stack_from_frame(table, temperature="77 K")
    Stack([Layer('30 nm', 'Al0.3Ga0.7As'), Layer('6.2 nm', 'GaAs')], temperature='77 K')
    """
    found = frames.rows(df)
    for name in (str(name).strip() for name in df.columns):
        if name not in _KNOWN:
            raise StackFileError(f"unknown column {name!r}{close_matches(name, _KNOWN)}", "table")
    if not found:
        raise StackFileError("no layers; write one row for each", "table")
    entries = []
    for number, row in enumerate(found, start=1):
        path = _path(row, number)
        layer = layer_from(_entries(row, number), number)
        entries.append((path, layer))
    return Stack(_grouped(entries, 0, 1), **stack_arguments)


def frame_from_stack(stack: Stack) -> pd.DataFrame:
    """Return a table with one row for each written layer, indexed by number from 1.

    What the stack says beyond its layers is not part of the table; `stackfile.settings` returns
    it as the arguments that `stack_from_frame` takes.

    Parameters
    ----------
    stack : Stack

    Returns
    -------
    DataFrame
        Columns that no layer needs are left out. ``edge_meV`` and its like become
        ``edge_eV`` where only that gives back exactly the stack's numbers.

    Raises
    ------
    StackFileError
        If a value along a layer is a callable.

    Examples
    --------
    >>> print(frame_from_stack(Stack([Layer("6.2 nm", "GaAs", label="well")])))
           label material  thickness_nm
    layer
    1       well     GaAs           6.2
    """
    records = []
    for written in stack.written():
        record: dict[str, Any] = {"layer": written.number}
        groups = _groups_of(stack, written.path)
        if groups:
            record["group"] = "/".join(str(name) for name, _ in groups)
            record["times"] = "/".join(str(times) for _, times in groups)
        entries = entries_of(written.layer, written.number)
        for key, value in entries.items():
            record |= _cells(key, value)
        records.append(record)
    return frames.frame(
        _columns(records), index="layer", texts=("label", "material", "grading", "group", *_POINTS)
    )


# --- rows -> layers -------------------------------------------------------------------------


def _entries(row: Mapping[str, Any], number: int) -> dict[str, Any]:
    """Return a row as the mapping that `layer_from` reads."""
    where = f"row {number}"
    given: dict[str, Any] = {}
    for name, cell in row.items():
        if name in ("group", "times"):
            continue
        key, unit = _COLUMNS.get(name, (name, ""))
        if key in given:
            raise StackFileError(f"two columns say {key}; leave one of them empty", where)
        given[key] = _value(name, cell, unit, where)
    for key in SHAPED:
        ends = [given.pop(f"{key}_{end}") for end in _ENDS if f"{key}_{end}" in given]
        points = given.pop(f"{key}_points", None)
        if len(ends) == 1:
            raise StackFileError(f"{key}_first and {key}_last belong together; one is empty", where)
        if (key in given) + bool(ends) + (points is not None) > 1:
            raise StackFileError(f"{key} is given more than once; leave one", where)
        if ends:
            given[key] = ends
        if points is not None:
            given[key] = _points(points, key, where)
    return given


def _value(name: str, cell: Any, unit: str, where: str) -> Any:
    """Return one cell: a text as it stands, or a number with its column's unit."""
    if name in ("label", "material"):
        if isinstance(cell, int) and not isinstance(cell, bool):
            return str(cell)
        if not isinstance(cell, str):
            raise StackFileError(f"{name}: got {show(cell)}; write text", where)
        return cell
    if not unit:
        return cell
    if isinstance(cell, str):
        cell = cell.strip()
        try:
            float(cell)
        except ValueError:
            raise StackFileError(
                f"{name}: got {show(cell)}; the column's name says the unit, so write a number",
                where,
            ) from None
        return f"{cell} {unit}"
    if isinstance(cell, bool) or not isinstance(cell, int | float):
        raise StackFileError(f"{name}: got {show(cell)}; write a number", where)
    if cell in (float("inf"), float("-inf")):
        raise StackFileError(f"{name}: got {cell}; that is not finite", where)
    return f"{number_text(cell)} {unit}"


def _points(cell: Any, key: str, where: str) -> Any:
    value = shape_value(cell)[0] if isinstance(cell, str) else None
    if not isinstance(value, list) or not isinstance(value[0], list):
        raise StackFileError(
            f"{key}_points: got {show(cell)}; write points such as '0 at 0 nm to 0.3 at 8 nm'",
            where,
        )
    return value


def _path(row: Mapping[str, Any], number: int) -> tuple[tuple[str, int], ...]:
    """Return (name, times) of each group a row is in, the outermost first."""
    where = f"row {number}"
    times, group = row.get("times"), row.get("group")
    if times is None:
        if group is not None:
            raise StackFileError(f"group {show(group)} has no times", where)
        return ()
    counts = [_whole(part, where) for part in str(times).split("/")]
    names = [f"row {number}"] if group is None else [_name(n) for n in str(group).split("/")]
    if len(names) != len(counts):
        raise StackFileError(
            f"group {show(group)} and times {show(times)} are not as deep; write '1/1' with '30/4'",
            where,
        )
    return tuple(zip(names, counts, strict=True))


def _whole(text: str, where: str) -> int:
    bare = text.strip().removesuffix(".0")
    if not (bare.isascii() and bare.isdigit()) or int(bare) < 1:
        raise StackFileError(f"times: got {show(text.strip())}; write a whole number from 1", where)
    return int(bare)


def _name(text: str) -> str:
    return text.strip().removesuffix(".0")


def _grouped(
    entries: list[tuple[tuple[tuple[str, int], ...], Layer]], depth: int, number: int
) -> list[Layer | Repeat]:
    """Return neighbours of one group as a `Repeat`, from a depth of groups on."""
    found: list[Layer | Repeat] = []
    lone: int | None = None  # times of a group without a name, in the row before
    for group, members in groupby(
        entries, key=lambda e: e[0][depth] if len(e[0]) > depth else None
    ):
        rows = list(members)
        if group is None:
            found += [layer for _, layer in rows]
            lone = None
        else:
            name, times = group
            unnamed = name == f"row {number}"
            if unnamed and lone == times and times > 1:
                raise StackFileError(
                    f"times {times} follows times {times}; write in a column group which rows"
                    " are grown together",
                    name,
                )
            lone = times if unnamed else None
            found.append(Repeat(times, _grouped(rows, depth + 1, number)))
        number += len(rows)
    return found


# --- layers -> rows -------------------------------------------------------------------------


def _groups_of(stack: Stack, path: tuple[int, ...]) -> list[tuple[int, int]]:
    """Return (number among its neighbours, times) of each group around a written layer."""
    groups = []
    layers = stack.layers
    for index in path[:-1]:
        entry = layers[index]
        assert isinstance(entry, Repeat)
        groups.append((index + 1, entry.times))
        layers = entry.layers
    return groups


def _cells(key: str, value: Any) -> dict[str, Any]:
    """Return the cells of one key: name without unit -> text or number."""
    if key in SHAPED and isinstance(value, list):
        if isinstance(value[0], list):
            return {f"{key}_points": shape_text(value)}
        return {f"{key}_first": value[0], f"{key}_last": value[1]}
    return {key: value}


def _columns(records: list[dict[str, Any]]) -> dict[str, list[Any]]:
    """Return columns in the order of `_KNOWN`, numbers with their unit in the name."""
    columns: dict[str, list[Any]] = {"layer": [record["layer"] for record in records]}
    bases = dict.fromkeys(["group", "times", *PLAIN])
    for key in SHAPED:
        bases |= dict.fromkeys((key, f"{key}_first", f"{key}_last", f"{key}_points"))
    for base in bases:
        cells = [record.get(base) for record in records]
        if any(cell is not None for cell in cells):
            columns |= _with_unit(base, cells)
    return columns


def _with_unit(base: str, cells: list[Any]) -> dict[str, list[Any]]:
    key = base.removesuffix("_first").removesuffix("_last")
    if key not in _FORMS or base.endswith("_points"):
        return {base: cells}
    cores = [(0, None) if cell is None else _core(key, cell) for cell in cells]
    columns: dict[str, list[Any]] = {}
    for family, forms in enumerate(_FORMS[key]):
        values = [value if of == family else None for of, value in cores]
        if any(value is not None for value in values):
            suffix, power = next(form for form in forms if _exact(values, form[1]))
            columns[f"{base}_{suffix}"] = [_scaled(value, power) for value in values]
    return columns


def _core(key: str, text: str) -> tuple[int, float]:
    """Return which family of forms a text belongs to, and its value in core units."""
    if key == "thickness":
        length = as_thickness(text, key)
        return ("nm", "ML").index(length.unit), length.value
    if key in DOPING:
        density = as_density(text, key)
        return ("sheet", "volume").index(density.kind), density.value
    return 0, _READ[key](text, key)


def _scaled(value: float | None, power: int) -> float | None:
    return None if value is None else float(number_text(value, power))


def _exact(values: list[float | None], power: int) -> bool:
    """Whether every value comes back exactly from a column scaled by a power of ten."""
    scaled = [_scaled(value, power) for value in values]
    return all(
        number is None or float(Decimal(repr(number)).scaleb(-power)) == value
        for number, value in zip(scaled, values, strict=True)
    )
