"""Standard deviations as a grower writes them: ``0.1 nm``, ``2 %``, ``0.5 ML``."""

from __future__ import annotations

import math
import unicodedata
from collections.abc import Mapping
from itertools import combinations
from typing import Any, NamedTuple

from ..errors import QuantityError, StackError, UnknownName, close_matches
from ..levels import Levels
from ..parameters import Parameter, find, list_parameters, read
from ..quantities import Length, as_value, show

#: what stands before a kind, for every parameter of it
EVERY = "every "
_FACTORS = ("scale", "flux")


class Spread(NamedTuple):
    """How far one parameter scatters.

    Attributes
    ----------
    parameter : Parameter
    value : float
        As designed, in the parameter's unit.
    sigma : float
        Standard deviation, in the parameter's unit.
    text : str
        As given.
    """

    parameter: Parameter
    value: float
    sigma: float
    text: str


def read_spreads(levels: Levels, spreads: Mapping[str, object]) -> tuple[Spread, ...]:
    """Return the spreads of a stack's parameters, in the order in which they are set.

    Parameters
    ----------
    levels : Levels
        Of the stack; they know its monolayers.
    spreads : mapping of str to quantity or text
        Name of a parameter, or ``"every thickness"``, ``"every composition"``, ``"every flux"``
        and so on for each parameter of a kind; a name of its own goes before. Values are absolute
        (``"0.1 nm"``, ``"0.5 ML"``, ``"2 K"``, ``0.005`` of a composition), or relative with
        ``%``, always of the parameter's own value.

    Raises
    ------
    UnknownName
        If the stack has no such parameter, or none of the kind.
    QuantityError
        If an amount can't be read, is negative, or is a percentage of zero.
    StackError
        If nothing is spread, or one number of a layer twice.

    Examples
    --------
    >>> import bandwright as bw
    >>> levels = bw.solve(bw.parse_line(
    ...     "20 nm Al0.3Ga0.7As, 7 nm GaAs {label well}, 20 nm Al0.3Ga0.7As", substrate="GaAs"))
    >>> for one in read_spreads(levels, {"every thickness": "1 %", "flux Al": "2 %"}):
    ...     print(one.parameter.name, round(one.sigma, 12))
    layer 1.thickness 0.2
    well.thickness 0.07
    layer 3.thickness 0.2
    flux Al 0.02
    """
    if not isinstance(spreads, Mapping):
        raise StackError(
            f"spreads: got {show(spreads)}; give a mapping such as {{'every thickness': '0.3 ML'}}"
        )
    listed = list_parameters(levels.stack)
    known = {parameter.name: parameter for parameter in listed}
    named: dict[str, tuple[Parameter, object]] = {}
    for name, amount in spreads.items():
        for parameter in _of_kind(str(name), listed):
            named[parameter.name] = parameter, amount
    for name, amount in spreads.items():
        if not str(name).startswith(EVERY):
            named[str(name)] = known.get(str(name)) or _found(levels, str(name)), amount
    found = [_read(levels, parameter, amount) for parameter, amount in named.values()]
    found = [spread for spread in found if spread.sigma > 0.0]
    if not found:
        raise StackError("spreads: nothing is spread; give at least one standard deviation above"
                         " zero, such as {'every thickness': '0.3 ML'}")  # fmt: skip
    _refuse_twice(found)
    return tuple(sorted(found, key=_order))


def _of_kind(name: str, listed: list[Parameter]) -> list[Parameter]:
    """Return every parameter that ``"every thickness"`` and the like stand for."""
    if not name.startswith(EVERY):
        return []
    kind = name.removeprefix(EVERY).strip()
    found = [parameter for parameter in listed if parameter.kind == kind]
    if not found:
        kinds = dict.fromkeys(parameter.kind for parameter in listed)
        raise UnknownName(f"the stack has no {kind}{close_matches(kind, kinds)}", name)
    return found


def _found(levels: Levels, name: str) -> Parameter:
    try:
        return find(levels.stack, name)
    except UnknownName as error:
        raise error.at("spreads") from None


def _read(levels: Levels, parameter: Parameter, amount: object) -> Spread:
    """Return one spread in the parameter's unit."""
    name, value = parameter.name, read(levels.stack, parameter.name)
    percent = _percent(amount)
    if percent is not None:
        sigma = as_value(percent, f"spread of {name}", "")[0] * abs(value)
        if value == 0.0:
            what = f"'0.5 {parameter.unit}'" if parameter.unit else "0.005"
            raise QuantityError(
                f"spread of {name}: got {show(amount)}, and a percentage of zero is nothing; give"
                f" it by itself, such as {_EXAMPLES.get(parameter.unit, what)}"
            )
    elif parameter.kind == "thickness":
        sigma = _thickness(levels, parameter, amount)
    else:
        _refuse_celsius(parameter, amount)
        sigma = as_value(amount, f"spread of {name}", parameter.unit)[0]
    if not (math.isfinite(sigma) and sigma >= 0.0):
        raise QuantityError(
            f"spread of {name}: got {show(amount)}; a standard deviation can't be negative"
        )
    return Spread(parameter, value, sigma, _text(amount))


_EXAMPLES = {"V/nm": "'1 kV/cm'", "eV": "'2 meV'", "V": "'2 mV'", "K": "'2 K'"}


def _percent(amount: object) -> object:
    """Return an amount that is relative, None for one that is not."""
    if isinstance(amount, str):
        return amount if amount.strip().endswith("%") else None
    return amount if str(getattr(amount, "units", "")) == "percent" else None


def _refuse_celsius(parameter: Parameter, amount: object) -> None:
    """Refuse a temperature counted from the freezing point, which is no difference."""
    text = amount if isinstance(amount, str) else str(getattr(amount, "units", ""))
    plain = unicodedata.normalize("NFKC", text)
    if parameter.unit == "K" and any(c in plain for c in ("°C", "degC", "degree_Celsius")):
        if not plain.startswith("delta"):
            raise QuantityError(
                f"spread of {parameter.name}: got {show(amount)}, which counts from the freezing"
                " point; write a difference such as '2 K'"
            )


def _thickness(levels: Levels, parameter: Parameter, amount: object) -> float:
    """Return a spread of a thickness in the unit that it is written in."""
    where = f"spread of {parameter.name}"
    sigma, unit = as_value(amount, where, parameter.unit)
    if unit == parameter.unit:
        return sigma
    each = [levels.profile.facts[number - 1].monolayer for number in parameter.layer_numbers]
    if any(math.isnan(one) for one in each):
        raise QuantityError(f"{where}: got {show(amount)}, and a layer with its own numbers has no"
                            " monolayer; write it in nm")  # fmt: skip
    if max(each) - min(each) > 1e-9 * max(each):
        raise QuantityError(
            f"{where}: got {show(amount)}, and the monolayers of layers"
            f" {' and '.join(map(str, parameter.layer_numbers))} differ; write it in"
            f" {parameter.unit}, or give the layers labels of their own"
        )
    return sigma * each[0] if unit == "ML" else sigma / each[0]


def _text(amount: Any) -> str:
    """Return an amount as given."""
    if isinstance(amount, Length):
        return f"{amount.value:g} {amount.unit}"
    return " ".join(str(amount).split())


def _refuse_twice(spreads: list[Spread]) -> None:
    """Refuse two spreads of one number of a layer, of which the later would hide the other."""
    for one, other in combinations(spreads, 2):
        a, b = one.parameter, other.parameter
        both = sorted(set(a.layer_numbers) & set(b.layer_numbers))
        same = a.name.rpartition(".")[2] == b.name.rpartition(".")[2]
        if both and same and a.layer_number and b.layer_number:
            raise StackError(
                f"spreads: {a.name!r} and {b.name!r} both move layer {both[0]}; layers of one label"
                " have one number in common, so name one of the two"
            )


def _order(spread: Spread) -> tuple[int, int]:
    """Return where a parameter stands: a shift after what it shifts, factors after all else."""
    parameter = spread.parameter
    if parameter.kind in _FACTORS:
        return 3, 0
    if parameter.layer_number is None:
        return 2, 0
    return int(parameter.name.endswith("_shift")), parameter.layer_number
