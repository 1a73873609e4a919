"""What a user sweeps over -> axes: each a parameter with its values and their column."""

from __future__ import annotations

import inspect
import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from ..errors import BandwrightError, StackError, UnknownName, close_matches
from ..frames import columns_of_table, is_table
from ..parameters import Parameter, find
from ..quantities import as_value, number_text, show
from ..quantities.reading import TEXT, cleaned
from ..stack import Stack
from .ranges import Values, expand, is_range, split

#: core unit -> suffix of a column, and the decimal places between core unit and column
_COLUMNS = {
    "nm": ("_nm", 0), "ML": ("_ML", 0), "eV": ("_meV", 3), "V/nm": ("_kV_per_cm", 4),
    "V": ("_V", 0), "K": ("_K", 0), "1/eV": ("_per_eV", 0), "nm^-2": ("_per_cm2", 14),
    "nm^-3": ("_per_cm3", 21),
}  # fmt: skip
#: a text behind a number that is longer is no unit
LONGEST_UNIT = 12


@dataclass(frozen=True)
class Axis:
    """One parameter that is swept.

    Parameters
    ----------
    name : str
        As `bandwright.parameters.replace` takes it, or an argument of a stack-making function.
    column : str
        What its column is called, with its unit.
    unit : str
        Core unit of ``values`` for a parameter of a stack.
    values : sequence
        What designs are made with: floats in core units, or what a function is given.
    shown : sequence
        What the column shows.
    """

    name: str
    column: str
    unit: str
    values: Sequence[Any]
    shown: Sequence[Any]

    def __len__(self) -> int:
        return len(self.values)


def read_axes(design: Stack | Callable[..., Stack], over: object) -> tuple[Axis, ...]:
    """Return the axes of a sweep.

    Parameters
    ----------
    design : Stack or callable
    over : mapping of str to values, or DataFrame
        Values: text such as ``"4 nm..9 nm step 0.5 nm"``, or a list.

    Raises
    ------
    StackError, QuantityError, UnknownName
        If a name or a value can't be read; the text begins with the name.
    """
    if is_table(over):
        given: Mapping[str, Any] = columns_of_table(over)
    elif isinstance(over, Mapping):
        given = over
    else:
        raise StackError(
            f"over: got {show(over)}; give parameters with their values, as"
            " {'well.thickness': '4 nm..9 nm step 0.5 nm'}, or a DataFrame of designs"
        )
    if not given:
        raise StackError("over: no parameter is given, so that there is nothing to sweep")
    known = None if isinstance(design, Stack) else _arguments(design, given)
    axes = []
    for name, values in given.items():
        listed = _listed(values, str(name))
        if isinstance(design, Stack):
            axes.append(_of_stack(design, str(name), listed))
        else:
            axes.append(_of_function(str(name), listed))
    names = [axis.name for axis in axes]
    for name in names:
        if names.count(name) > 1:
            raise StackError("given more than once", name)
    assert known is None or set(names) <= known
    return tuple(axes)


def _listed(values: Any, name: str) -> Any:
    """Return a range as its text, anything else as a list of values."""
    if isinstance(values, str):
        return values if is_range(values) else split(values)
    if isinstance(values, Mapping | set):
        raise StackError(f"got {show(values)}; give a range as text, or a list of values", name)
    if hasattr(values, "m_as"):  # quantities; the own list of an array would be bare numbers
        listed = [values[i] for i in range(len(values))] if _shape(values) else [values]
    elif not isinstance(values, Iterable):
        listed = [values]
    else:
        listed = values.tolist() if hasattr(values, "tolist") else list(values)
    if not listed:
        raise StackError("an empty list, so that there is nothing to sweep", name)
    for number, value in enumerate(listed, start=1):
        if value is None or (isinstance(value, float) and value != value):
            raise StackError(f"value {number} is missing", name)
    return listed


def _shape(values: Any) -> tuple[int, ...]:
    return tuple(getattr(values, "shape", ()))


# -- parameters of a stack --------------------------------------------------------------------


def _of_stack(stack: Stack, name: str, given: Any) -> Axis:
    parameter, places = _parameter(stack, name)

    def read(value: object) -> tuple[float, str]:
        bare = None if places is None else _bare(value)
        if bare is not None:
            return float(bare.scaleb(-(places or 0))), parameter.unit
        return as_value(value, name, parameter.unit)

    if isinstance(given, str):
        values = expand(given, name, read)
    else:
        pairs = [read(value) for value in given]
        units = sorted({unit for _, unit in pairs})
        if len(units) > 1:
            raise StackError(f"values in {' and '.join(units)}; write all in one unit", name)
        values = Values([number for number, _ in pairs], units[0])
    if parameter.unit in ("nm^-2", "nm^-3") and values.unit != parameter.unit:
        raise StackError(f"the layer's density is in {parameter.unit}; give densities alike", name)
    suffix = _COLUMNS.get(values.unit, ("", 0))[0]
    shown = [in_column(value, values.unit) for value in values.numbers]
    return Axis(parameter.name, parameter.name + suffix, values.unit, values.numbers, shown)


def in_column(value: float, unit: str) -> float:
    """Return a number in core units as its column shows it.

    Examples
    --------
    >>> in_column(0.0012, "V/nm")
    12.0
    """
    power = _COLUMNS.get(unit, ("", 0))[1]
    return float(Decimal(repr(value)).scaleb(power)) if power else value


def _parameter(stack: Stack, name: str) -> tuple[Parameter, int | None]:
    """Return the parameter that a name means, and its decimal places if it carries its unit.

    A column of an earlier sweep, such as ``well.thickness_nm``, is a name of bare numbers.
    """
    try:
        return find(stack, name), None
    except BandwrightError as error:
        for unit, (suffix, power) in _COLUMNS.items():
            if not name.endswith(suffix):
                continue
            try:
                parameter = find(stack, name.removesuffix(suffix))
            except UnknownName:
                continue
            lengths = {parameter.unit, unit} == {"nm", "ML"}
            if parameter.unit == unit or lengths:
                at = parameter.layer_number, parameter.kind, unit, parameter.layer_numbers
                return Parameter(parameter.name, *at), power
        raise error from None


def _bare(value: object) -> Decimal | None:
    """Return a number without a unit; None for anything else."""
    if isinstance(value, str):
        match = TEXT.fullmatch(cleaned(value))
        return Decimal(match[1]) if match and not match[2] else None
    number = isinstance(value, int | float) and not isinstance(value, bool)
    return Decimal(repr(value)) if number else None


# -- arguments of a function ------------------------------------------------------------------


def _of_function(name: str, given: Any) -> Axis:
    if isinstance(given, str):
        values = expand(given, name, lambda text: _as_written(text, name))
        shown: list[Any] = values.numbers
        unit = values.unit
        made = [f"{number_text(v)} {unit}" for v in shown] if unit else shown
        return Axis(name, name + _suffix(unit), unit, made, shown)
    written = [_written(value) for value in given]
    units = {pair[1] for pair in written if pair}
    if len(units) == 1 and all(written):
        (unit,) = units
        if not unit:
            numbers = [_number(value) for value in given]
            return Axis(name, name, unit, numbers, numbers)
        return Axis(name, name + _suffix(unit), unit, given, [pair[0] for pair in written if pair])
    plain = [v if isinstance(v, int | float | str) else show(v) for v in given]
    return Axis(name, name, "", given, plain)


def _as_written(text: object, name: str) -> tuple[float, str]:
    """Return number and unit of a text as they are written."""
    pair = _written(text)
    if pair is None:
        raise StackError(f"got {show(text)}; a number is due, with its unit if it has one", name)
    return pair


def _written(value: object) -> tuple[float, str] | None:
    if isinstance(value, str):
        match = TEXT.fullmatch(cleaned(value))
        unit = match[2].strip() if match else ""
        one = match is not None and len(unit) <= LONGEST_UNIT and "," not in unit
        return (float(match[1]), unit) if match and one else None
    if isinstance(value, int | float) and not isinstance(value, bool):
        return float(value), ""
    return None


def _number(value: Any) -> Any:
    """Return a text that is a number as one; a list written as text holds texts only."""
    return float(value) if isinstance(value, str) else value


def _suffix(unit: str) -> str:
    """Return the end of a column name for a unit as written.

    Examples
    --------
    >>> _suffix("kV/cm"), _suffix("/ cm^2"), _suffix("")
    ('_kV_per_cm', '_per_cm2', '')
    """
    words = re.sub(r"\s*/\s*", "_per_", unit)
    words = re.sub(r"[^\w%]+", "", words).strip("_")
    return f"_{words}" if words else ""


def _arguments(design: object, given: Iterable[str]) -> set[str]:
    """Return the arguments of a stack-making function that are swept; check their names."""
    if not callable(design):
        raise StackError(
            f"design: got {show(design)}; a Stack is due, or a function that returns one"
        )
    name = called(design)
    try:
        parameters = inspect.signature(design).parameters.values()
    except ValueError:  # written in C, and silent about its arguments
        return set(map(str, given))
    by_name = [p for p in parameters if p.kind in (p.POSITIONAL_OR_KEYWORD, p.KEYWORD_ONLY)]
    known = {p.name for p in by_name}
    free = any(p.kind == p.VAR_KEYWORD for p in parameters)
    for argument in map(str, given):
        if argument not in known and not free:
            raise UnknownName(f"{name} has no such argument{close_matches(argument, known)}",
                              argument)  # fmt: skip
    missing = [p.name for p in by_name if p.default is p.empty and p.name not in set(given)]
    if missing:
        raise StackError(
            f"design: {name} needs {', '.join(missing)} as well; sweep over it, or give it a"
            " default"
        )
    return set(map(str, given))


def called(function: Any) -> str:
    """Return what a function is called in an error text."""
    name = getattr(function, "__qualname__", None) or type(function).__qualname__
    return f"{name}()"
