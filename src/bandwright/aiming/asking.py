"""What a user frees, aims at, limits and maximises: read, checked, in core units."""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from ..constants import HC
from ..errors import QuantityError, StackError, UnknownName, close_matches
from ..lines import CONTINUUM, Line
from ..metrics import Pair, read_pair
from ..parameters import Parameter, find, read, replace
from ..quantities import as_energy, as_length, as_value, show
from ..quantities.spans import split_span
from ..stack import Stack

#: core unit -> unit shown, decimal places between
SHOWN = {
    "eV": ("meV", 3), "V/nm": ("kV/cm", 4), "nm^-2": ("cm-2", 14), "nm^-3": ("cm-3", 21),
    "1/eV": ("1/eV", 0),
}  # fmt: skip
_LINE = re.compile(r"\s*(\d+|continuum)\s*to\s*(\d+)\s*", re.IGNORECASE)
_QUANTITIES = {"dipole": "dipole_nm", "oscillator strength": "oscillator_strength"}
_THICKNESS = "thickness"
#: kinds of parameters that multiply what they find
FACTORS = ("scale", "flux")


@dataclass(frozen=True)
class Free:
    """A parameter that may change, between two bounds in its unit."""

    parameter: Parameter
    start: float
    least: float
    most: float

    @property
    def name(self) -> str:
        """Its name, as asked."""
        return self.parameter.name

    @property
    def width(self) -> float:
        """How far it may go in all."""
        return self.most - self.least


@dataclass(frozen=True)
class Target:
    """A line or spacing that should have an energy [eV]; asked as a wavelength or an energy."""

    pair: Pair
    energy: float
    unit: str
    weight: float = 1.0

    @property
    def name(self) -> str:
        """Its line in words."""
        return name_of(self.pair)

    @property
    def asked(self) -> float:
        """What was asked, in its unit."""
        return shown_energy(self.energy, self.unit)


@dataclass(frozen=True)
class Limit:
    """Least and most of the total thickness [nm] (no pair), or of a spacing [eV]."""

    pair: Pair | None
    least: float | None
    most: float | None
    unit: str

    @property
    def name(self) -> str:
        """What is limited, in words."""
        return _THICKNESS if self.pair is None else name_of(self.pair)


@dataclass(frozen=True)
class Quantity:
    """A number of a line that should be large: a column of lines, and the line."""

    column: str
    pair: Pair

    @property
    def name(self) -> str:
        """What is maximised, in words."""
        return f"{next(w for w, c in _QUANTITIES.items() if c == self.column)} {name_of(self.pair)}"


@dataclass(frozen=True)
class Wishes:
    """All that is asked of a stack."""

    stack: Stack
    free: tuple[Free, ...]
    targets: tuple[Target, ...]
    limits: tuple[Limit, ...]
    quantity: Quantity | None

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the free parameters."""
        return tuple(free.name for free in self.free)

    @property
    def pairs(self) -> tuple[Pair, ...]:
        """Every pair of levels that is asked about."""
        asked = [target.pair for target in self.targets]
        limited = [limit.pair for limit in self.limits if limit.pair is not None]
        raised = [self.quantity.pair] if self.quantity else []
        return tuple(dict.fromkeys([*asked, *limited, *raised]))


def read_wishes(
    stack: Stack, free: object, targets: object, weights: object, maximise: object, limits: object,
) -> Wishes:  # fmt: skip
    """Return what is asked, each part checked.

    Raises
    ------
    StackError, QuantityError, UnknownName
        With one line that says which part can't be read.
    """
    found = _targets(targets, weights)
    wished = _quantity(maximise, found)
    if not found and wished is None:
        raise StackError(
            "targets: none is given, and nothing to maximise; write for example"
            " {'2 to 1': '10.3 um'}"
        )
    return Wishes(stack, _free(stack, free), found, _limits(limits), wished)


def relative(parameter: Parameter) -> bool:
    """Return whether a parameter reads the same in every stack: a factor, or the shift of a grade.

    Examples
    --------
    >>> relative(Parameter("all thicknesses", None, "scale", ""))
    True
    """
    return parameter.kind in FACTORS or parameter.name.endswith("_shift")


def name_of(pair: Pair) -> str:
    """Return a line in words.

    Examples
    --------
    >>> name_of((2, 1))
    '2 to 1'
    """
    return f"{pair[0]} to {pair[1]}"


def shown_energy(energy: float, unit: str) -> float:
    """Return a photon energy [eV] in a unit that is shown.

    Examples
    --------
    >>> shown_energy(0.12, "meV"), round(shown_energy(0.12, "um"), 4)
    (120.0, 10.332)
    """
    return HC / energy * 1e-3 if unit == "um" else energy * 1e3


# -- free parameters --------------------------------------------------------------------------


def _free(stack: Stack, given: object) -> tuple[Free, ...]:
    example = "{'well.thickness': '4 nm..9 nm'}"
    if given is None or (isinstance(given, Mapping | Sequence) and not given):
        raise StackError(f"free: no free parameter; give names with their bounds, as {example}")
    if not isinstance(given, Mapping):
        raise StackError(f"free: got {show(given)}; give names with their bounds, as {example}")
    found = tuple(_one_free(stack, str(name), span) for name, span in given.items())
    for place, one in enumerate(found):
        for other in found[:place]:
            _refuse_shared(one.parameter, other.parameter)
    return found


def _one_free(stack: Stack, name: str, span: object) -> Free:
    parameter = find(stack, name)
    start = read(stack, name)
    least, most = (
        _in_unit(stack, parameter, end, name) for end in split_span(span, name)
    )  # fmt: skip
    if least > most:
        raise StackError(f"got {show(span)}, which runs backwards; write the smaller end first",
                         name)  # fmt: skip
    if least == most:
        raise StackError(f"got {show(span)}, which leaves nothing free; leave it out", name)
    for end in (least, most):
        replace(stack, name, end)  # what can't be grown is said before anything is solved
    return Free(parameter, start, least, most)


def _in_unit(stack: Stack, parameter: Parameter, end: object, name: str) -> float:
    """Return a bound in the parameter's unit; lengths and monolayers go into each other."""
    value, unit = as_value(end, name, parameter.unit)
    if unit == parameter.unit:
        return value
    if {unit, parameter.unit} != {"nm", "ML"} or parameter.layer_number is None:
        raise QuantityError(f"{name}: got {show(end)}; it is counted in {parameter.unit}")
    from ..profile.build import build_profile

    height = build_profile(stack).facts[parameter.layer_number - 1].monolayer
    if math.isnan(height):
        raise QuantityError(f"{name}: got {show(end)}; a layer of own numbers has no monolayer")
    return value * height if unit == "ML" else value / height


def _refuse_shared(one: Parameter, other: Parameter) -> None:
    """Raise if two free parameters move one number."""
    if not set(one.layer_numbers) & set(other.layer_numbers) and one.name != other.name:
        return
    factor = one.kind in FACTORS or other.kind in FACTORS
    keys = [p.name.rpartition(".")[2] for p in (one, other)]
    ends = {"first", "last"} == {key.rpartition("_")[2] for key in keys}
    same = keys[0].partition("_")[0] == keys[1].partition("_")[0] and not ends
    if factor or same:
        raise StackError(f"moves what {other.name} moves too; free one of them", one.name)


# -- targets, limits, and what is maximised ---------------------------------------------------


def read_line(given: object, name: str) -> Pair:
    """Return the levels of a line, from ``"2 to 1"`` or ``(2, 1)``.

    Raises
    ------
    StackError
        If it is no line.
    """
    if isinstance(given, str):
        match = _LINE.fullmatch(given)
        if match is None:
            raise StackError(f"got {show(given)}; write a line as '2 to 1'", name)
        upper = match[1].lower()
        given = (upper if upper == CONTINUUM else int(upper), int(match[2]))
    try:
        return read_pair(given)
    except StackError as error:
        raise error.at(name) from None


def _mapping(given: object, name: str, example: str) -> Mapping[Any, Any]:
    if given is None:
        return {}
    if not isinstance(given, Mapping):
        raise StackError(f"{name}: got {show(given)}; write for example {example}")
    return given


def _targets(given: object, weights: object) -> tuple[Target, ...]:
    asked = _mapping(given, "targets", "{'2 to 1': '10.3 um'}")
    weighed = {
        read_line(line, "weights"): _weight(value, line)
        for line, value in _mapping(weights, "weights", "{'2 to 1': 3}").items()
    }
    found: dict[Pair, Target] = {}
    for line, value in asked.items():
        pair = read_line(line, "targets")
        if pair in found:
            raise StackError(f"targets: {name_of(pair)} is given more than once")
        energy, unit = _photon(value, f"targets, {name_of(pair)}")
        found[pair] = Target(pair, energy, unit, weighed.pop(pair, 1.0))
    if weighed:
        raise UnknownName(
            f"weights: {name_of(next(iter(weighed)))} is no target"
            f"{close_matches(name_of(next(iter(weighed))), [t.name for t in found.values()])}"
        )
    return tuple(found.values())


def _weight(value: object, line: object) -> float:
    number = not isinstance(value, bool) and isinstance(value, int | float)
    if not number or not 0.0 < float(value) < math.inf:  # type: ignore[arg-type]  # is a number
        raise StackError(f"weights, {line}: got {show(value)}; a number above zero is due")
    return float(value)  # type: ignore[arg-type]  # as above


def _photon(value: object, name: str) -> tuple[float, str]:
    """Return a photon energy [eV] from a wavelength or an energy, and the unit to show it in."""
    try:
        length = as_length(value, name)
    except QuantityError:
        length = None
    if length is None:
        try:
            energy = as_energy(value, name)
        except QuantityError:
            raise QuantityError(
                f"{name}: got {show(value)}; a wavelength or an energy is due, such as '10.3 um'"
                " or '120 meV'"
            ) from None
    if (energy if length is None else length) <= 0.0:
        raise QuantityError(f"{name}: got {show(value)}; it must be above zero")
    return (energy, "meV") if length is None else (HC / length, "um")


def _limits(given: object) -> tuple[Limit, ...]:
    example = "{'thickness': '..60 nm', '2 to 1': '34 meV..38 meV'}"
    found = []
    for what, span in _mapping(given, "limits", example).items():
        if what == _THICKNESS:
            ends = split_span(span, "limits, thickness", may_be_open=True)
            least, most = (None if e is None else as_length(e, "limits, thickness") for e in ends)
            found.append(Limit(None, least, most, "nm"))
        else:
            found.append(_line_limit(what, span))
        one = found[-1]
        if one.least is not None and one.most is not None and one.least > one.most:
            raise StackError(f"limits, {one.name}: got {show(span)}, which runs backwards; write"
                             " the smaller end first")  # fmt: skip
    return tuple(found)


def _line_limit(what: object, span: object) -> Limit:
    if isinstance(what, str) and _LINE.fullmatch(what) is None:
        known = [_THICKNESS, "2 to 1"]
        raise UnknownName(f"limits: {what!r} can't be limited{close_matches(what, known)}")
    pair = read_line(what, "limits")
    name = f"limits, {name_of(pair)}"
    ends = split_span(span, name, may_be_open=True)
    read_ends = [None if end is None else _photon(end, name) for end in ends]
    units = sorted({end[1] for end in read_ends if end is not None})
    if len(units) > 1:
        raise StackError(f"{name}: got {show(span)}; write both ends as wavelengths, or as"
                         " energies")  # fmt: skip
    least, most = (None if end is None else end[0] for end in read_ends)
    return Limit(pair, most, least, "um") if units == ["um"] else Limit(pair, least, most, "meV")


def _quantity(given: object, targets: Sequence[Target]) -> Quantity | None:
    if given is None:
        return None
    what: Any = given
    line: Any = None
    if isinstance(given, str):
        match = re.search(r"\d|continuum", given)
        what, line = (given[: match.start()], given[match.start() :]) if match else (given, None)
        what = what.strip().removesuffix(" of")
    elif isinstance(given, Sequence) and len(given) == 2 and not isinstance(given, Line):
        what, line = given
    if not isinstance(what, str) or what not in _QUANTITIES:
        hint = close_matches(what, _QUANTITIES) if isinstance(what, str) else ""
        raise UnknownName(f"maximise: got {show(given)}; write for example 'dipole 2 to 1'{hint}")
    if line is None:
        if len(targets) != 1:
            raise StackError(f"maximise: got {show(given)}; say of which line, as '{what} 2 to 1'")
        line = targets[0].pair
    pair = read_line(line, "maximise")
    if pair[0] == CONTINUUM:
        raise StackError(f"maximise: got {show(given)}; an onset to the continuum has no {what}")
    return Quantity(_QUANTITIES[what], pair)
