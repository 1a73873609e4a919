"""The numbers of a stack by name: list, read, replace.

``"well.thickness"`` is the thickness of every layer with the label *well*, which is one
parameter; ``"layer 2.thickness"`` is that of the second written layer alone. Groups are written
once, so their copies move together. Values are floats in core units: nm (or ML where the layer
is counted so), eV, V/nm, V, K, nm^-2 or nm^-3, fractions.

Names behind the dot:

- ``thickness``; tables of points and callables are stretched with it.
- ``composition``: in a formula with numbers, the fraction of the first element on the first
  mixed sublattice; the others of that sublattice share the change in proportion (+0.01 Al takes
  0.01 Ga). ``anion_composition`` where cations and anions are mixed.
- ``x``, ``y``, ``edge``, ``mass``, ``gap``, ``nonparabolicity``; graded ones have ``x_first``,
  ``x_last``, and any that varies has ``x_shift``, which moves it as a whole and reads 0.
- ``field`` (internal), ``donors``, ``acceptors``.

Without a dot: ``temperature``, ``field``, ``bias``, and ``substrate``, its composition. Factors on
the stack as written, which read 1: ``all thicknesses``, and ``flux Al`` and the like, the stack
grown with so much of that group-III element, in every layer that holds it.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from decimal import Decimal

from ..errors import BandwrightError, StackError, UnknownName, close_matches
from ..quantities import field_text, number_text, temperature_text, voltage_text
from ..stack import Stack, Written
from .fluxes import flux_elements, with_flux
from .fractions import first_fraction, mixed_sites, with_fraction
from .layers import finite, number_of, numbers_of, replaced, stretched

__all__ = ["FLUX", "Parameter", "find", "list_parameters", "read", "replace", "shifted"]

#: what the names of factors on a flux begin with
FLUX = "flux "
_ALL = "all thicknesses"
_STACK_UNITS = {"temperature": "K", "field": "V/nm", "bias": "V", "substrate": ""}
_NUMBERED = re.compile(r"layer (\d+)")


@dataclass(frozen=True)
class Parameter:
    """One number of a stack.

    Parameters
    ----------
    name : str
        As `read` and `replace` take it.
    layer_number : int or None
        The (first) written layer it belongs to, from 1; None for the whole stack.
    kind : str
        ``"thickness"``, ``"composition"`` (a fraction of a flat layer, or the shift of a graded
        one), ``"composition end"`` (one face of a graded layer), ``"edge"``, ``"mass"``,
        ``"gap"``, ``"nonparabolicity"`` (and ``"edge end"`` and so on), ``"internal field"``,
        ``"donors"``, ``"acceptors"``, ``"temperature"``, ``"field"``, ``"bias"``,
        ``"substrate"``, ``"scale"`` (of all thicknesses), ``"flux"``.
    unit : str
        Unit of the float.
    layer_numbers : tuple of int
        Every written layer that moves with it.
    """

    name: str
    layer_number: int | None
    kind: str
    unit: str
    layer_numbers: tuple[int, ...] = ()


def list_parameters(stack: Stack) -> list[Parameter]:
    """Return every parameter of a stack, each layer's in growth order, then the stack's.

    A label whose layers differ in a number does not name it: those are listed layer by layer.
    A shape's ends and its shift overlap: take one ``kind``.

    Raises
    ------
    MaterialError
        If a formula can't be read.

    Examples
    --------
    >>> from bandwright.stack import Layer
    >>> stack = Stack([Layer("8 nm", "Al0.3Ga0.7As", label="wall"), Layer("22 ML", "GaAs"),
    ...                Layer("8 nm", "Al0.3Ga0.7As", label="wall")])
    >>> for parameter in list_parameters(stack):
    ...     print(parameter.name, parameter.unit, parameter.layer_numbers)
    wall.thickness nm (1, 3)
    wall.composition  (1, 3)
    layer 2.thickness ML (2,)
    temperature K ()
    field V/nm ()
    all thicknesses  (1, 2, 3)
    flux Al  (1, 3)
    flux Ga  (1, 2, 3)
    """
    found: list[Parameter] = []
    every = stack.written()
    numbers = {written.number: tuple(numbers_of(written)) for written in every}
    by_label: dict[str | None, list[Written]] = {}
    for written in every:
        by_label.setdefault(written.layer.label, []).append(written)
    for written in every:
        label = written.layer.label
        together = by_label[label] if label is not None else [written]
        others = [numbers[other.number] for other in together if other is not written]
        for number in numbers[written.number]:
            agree = all(number in other for other in others)
            if agree and written.number != together[0].number:
                continue  # listed with the first
            members = together if agree else [written]
            head = label if label is not None and agree else f"layer {written.number}"
            moved = tuple(member.number for member in members)
            name = f"{head}.{number.key}"
            found.append(Parameter(name, moved[0], number.kind, number.unit, moved))
    names = ["temperature", "field" if stack.bias is None else "bias"]
    if stack.substrate is not None and mixed_sites(stack.substrate):
        names.append("substrate")
    found += [Parameter(name, None, name, _STACK_UNITS[name]) for name in names]
    return found + _factors(stack)


def read(stack: Stack, name: str) -> float:
    """Return a parameter's value in core units.

    Parameters
    ----------
    stack : Stack
    name : str
        As `list_parameters` names it. ``field`` and ``bias`` read 0 where none is given.

    Raises
    ------
    UnknownName
        If no layer or no number has the name.
    StackError
        If layers with the label differ in it.

    Examples
    --------
    >>> from bandwright.stack import Layer
    >>> stack = Stack([Layer("6.2 nm", "GaAs", label="well")], field="12 kV/cm")
    >>> read(stack, "well.thickness"), read(stack, "field")
    (6.2, 0.0012)
    """
    if name in _STACK_UNITS:
        return _read_stack(stack, name)
    if _is_factor(name):
        _factor(stack, name)
        return 1.0
    members, key = _find(stack, name)
    values = [number_of(member, key, name) for member in members]
    if len(set(values)) > 1:
        listed = ", ".join(
            f"layer {member.number} has {f'{number.value:.12g} {number.unit}'.strip()}"
            for member, number in zip(members, values, strict=True)
        )
        raise StackError(
            f"layers with this label differ: {listed}; name one, as"
            f" 'layer {members[0].number}.{key}', or give them labels of their own",
            name,
        )
    return values[0].value


def find(stack: Stack, name: str) -> Parameter:
    """Return the parameter of a name, also where `list_parameters` lists it under its label.

    Raises
    ------
    UnknownName, StackError
        As `read`.

    Examples
    --------
    >>> from bandwright.stack import Layer
    >>> stack = Stack([Layer("6.2 nm", "GaAs", label="well")])
    >>> find(stack, "layer 1.thickness").unit, find(stack, "field").unit
    ('nm', 'V/nm')
    """
    read(stack, name)
    if name in _STACK_UNITS:
        return Parameter(name, None, name, _STACK_UNITS[name])
    if _is_factor(name):
        return _factor(stack, name)
    members, key = _find(stack, name)
    number = number_of(members[0], key, name)
    numbers = tuple(member.number for member in members)
    return Parameter(name, numbers[0], number.kind, number.unit, numbers)


def replace(stack: Stack, name: str, value: float) -> Stack:
    """Return the stack with one parameter set to a value in core units.

    Parameters
    ----------
    stack : Stack
    name : str
        As `list_parameters` names it.
    value : float
        In the parameter's unit. Setting what `read` returns gives an equal stack.

    Raises
    ------
    UnknownName, StackError, QuantityError
        As `read`, and if the changed stack can't be grown; the text begins with the name.

    Examples
    --------
    >>> from bandwright.stack import Layer
    >>> stack = Stack([Layer("8 nm", "Al0.28Ga0.72As", label="wall")])
    >>> replace(stack, "wall.composition", 0.3).layers
    (Layer('8 nm', 'Al0.3Ga0.7As', label='wall'),)
    """
    value = float(value)
    if value == read(stack, name):
        return stack
    try:
        if name in _STACK_UNITS:
            return _replace_stack(stack, name, value)
        if _is_factor(name):
            return _multiplied(stack, name, value)
        members, key = _find(stack, name)
        for member in members:
            stack = stack.with_layer(member.number, replaced(member.layer, key, value))
        return stack
    except BandwrightError as error:
        raise error if str(error).startswith(f"{name}:") else error.at(name) from None


def shifted(stack: Stack, name: str, step: float, *, monolayer_nm: float | None = None) -> Stack:
    """Return the stack with a parameter moved by a step, added as decimals.

    Parameters
    ----------
    stack : Stack
    name : str
    step : float
        In the parameter's unit; in monolayers when ``monolayer_nm`` is given.
    monolayer_nm : float, optional
        The layer's (strained) monolayer [nm], for a step in ML of a thickness. A thickness
        written in ML moves by the step itself.

    Raises
    ------
    UnknownName, StackError, QuantityError
        As `replace`.

    Examples
    --------
    >>> from bandwright.stack import Layer
    >>> stack = Stack([Layer("6.2 nm", "GaAs"), Layer("22 ML", "GaAs")])
    >>> read(shifted(stack, "layer 1.thickness", 1, monolayer_nm=0.2827), "layer 1.thickness")
    6.4827
    >>> read(shifted(stack, "layer 2.thickness", 1, monolayer_nm=0.2827), "layer 2.thickness")
    23.0
    """
    exact = Decimal(repr(float(step)))
    if monolayer_nm is not None:
        if "." not in name or _find(stack, name)[1] != "thickness":
            raise StackError("a step in monolayers is for a thickness", name)
        if _find(stack, name)[0][0].layer.thickness.unit == "nm":
            exact *= Decimal(repr(float(monolayer_nm)))
    return replace(stack, name, float(Decimal(repr(read(stack, name))) + exact))


# --- a stack's own ---------------------------------------------------------------------------


def _read_stack(stack: Stack, name: str) -> float:
    if name == "substrate":
        sites = mixed_sites(stack.substrate) if stack.substrate is not None else []
        if not sites:
            raise UnknownName("the stack has no alloy as substrate, so no composition of it", name)
        return first_fraction(sites[0][1])
    return float(getattr(stack, name) or 0.0)


def _replace_stack(stack: Stack, name: str, value: float) -> Stack:
    if name == "substrate":
        site, sublattice = mixed_sites(str(stack.substrate))[0]
        return stack.replace(substrate=with_fraction(str(stack.substrate), site, sublattice, value))
    other = {"field": "bias", "bias": "field"}.get(name)
    if other and getattr(stack, other) is not None:
        raise StackError(
            f"the stack has a {other}; stack.replace({other}=None, {name}=...) exchanges it"
        )
    text = {"temperature": temperature_text, "field": field_text, "bias": voltage_text}[name]
    return stack.replace(**{name: text(finite(value))})


def _factors(stack: Stack) -> list[Parameter]:
    """Return the factors on the stack as written."""
    every = tuple(written.number for written in stack.written())
    fluxes = flux_elements(stack).items()
    return [
        Parameter(_ALL, None, "scale", "", every),
        *(Parameter(FLUX + element, None, "flux", "", held) for element, held in fluxes),
    ]


def _is_factor(name: str) -> bool:
    return name == _ALL or (name.startswith(FLUX) and "." not in name)


def _factor(stack: Stack, name: str) -> Parameter:
    known = {parameter.name: parameter for parameter in _factors(stack)}
    if name not in known:
        raise UnknownName(f"no layer of a material holds it{close_matches(name, known)}", name)
    return known[name]


def _multiplied(stack: Stack, name: str, factor: float) -> Stack:
    what = "a factor on thicknesses" if name == _ALL else "a factor on a flux"
    if finite(factor) <= 0.0:
        raise StackError(f"got {number_text(factor)}; {what} must be above zero")
    layers = {w.number: w.layer for w in stack.written()}
    changed = stack
    for number in _factor(stack, name).layer_numbers:
        layer = layers[number]
        new = (
            stretched(layer, factor)
            if name == _ALL
            else with_flux(layer, name.removeprefix(FLUX), factor, stack)
        )
        changed = changed.with_layer(number, new)
    return changed


def _find(stack: Stack, name: str) -> tuple[list[Written], str]:
    """Return the written layers that a name is about, and what stands behind its dot."""
    head, dot, key = name.rpartition(".")
    if not dot:
        raise UnknownName(f"no parameter{_near(stack, name)}", name)
    written = stack.written()
    numbered = _NUMBERED.fullmatch(head)
    if numbered:
        members = [w for w in written if w.number == int(numbered[1])]
        if not members:
            raise UnknownName(f"the stack has layers 1 to {len(written)}", name)
    else:
        members = [w for w in written if w.layer.label == head]
        if not members:
            raise UnknownName(f"no layer has the label {head!r}{_near(stack, name)}", name)
    return members, key


def _near(stack: Stack, name: str) -> str:
    try:
        listed = [parameter.name for parameter in list_parameters(stack)]
    except BandwrightError:  # a formula that can't be read is not what is asked about
        listed = []
    return close_matches(name, (*_STACK_UNITS, *listed))
