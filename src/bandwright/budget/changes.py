"""The changes a budget lists: what a grower or the lab may do to a stack by accident."""

from __future__ import annotations

import math
from typing import NamedTuple

from ..formula import parse
from ..gradients import model_parameters
from ..levels import Levels
from ..parameters import Parameter, list_parameters

#: the change of a layer with its own numbers, which has no monolayer [nm]
OWN_STEP = 0.1
#: kinds of parameters that are factors on the model and no stack's own numbers
MODEL = {
    "masses": ("masses", "+1 %"),
    "offset share": ("offset share", "+0.01"),
    "offsets": ("own edges", "+1 %"),
}
_HUNDREDTH = 0.01


class Change(NamedTuple):
    """A change that a grower or the lab makes.

    Attributes
    ----------
    parameter : Parameter
    amount : float
        How much, in the parameter's unit.
    what : str
        The layer, or ``"temperature"`` and the like.
    text : str
        The change in words, as ``"+1 ML"``.
    """

    parameter: Parameter
    amount: float
    what: str
    text: str


#: the change by which every interface becomes abrupt; no slope stands for it
ABRUPT = Change(Parameter("interfaces", None, "interfaces", ""), 1.0, "interfaces", "made abrupt")


def changes(levels: Levels) -> list[Change]:
    """Return the changes a budget lists, in the order of the stack."""
    stack = levels.stack
    materials = any(one.layer.material is not None for one in stack.written())
    found = []
    for parameter in list_parameters(stack):
        if parameter.layer_number is None:
            found += _of_stack(parameter, materials)
        else:
            found += _of_layer(levels, parameter)
    for parameter in model_parameters(stack).values():
        if parameter.kind in MODEL:
            found.append(Change(parameter, _HUNDREDTH, *MODEL[parameter.kind]))
    return found


def _of_layer(levels: Levels, parameter: Parameter) -> list[Change]:
    """Return the change of a thickness or a composition; none of a layer's other numbers."""
    number = int(parameter.layer_number or 0)
    written = next(one for one in levels.stack.written() if one.number == number)
    head, _, key = parameter.name.rpartition(".")
    name = written.name
    what = f"{head} ({name})" if head != name and not name.startswith(head) else name
    if parameter.kind == "thickness":
        monolayer = levels.profile.facts[number - 1].monolayer
        if parameter.unit == "ML":
            return [Change(parameter, 1.0, what, "+1 ML")]
        if math.isnan(monolayer):
            return [Change(parameter, OWN_STEP, what, f"+{OWN_STEP:g} nm")]
        return [Change(parameter, monolayer, what, "+1 ML")]
    if parameter.kind == "composition":
        which = key.removesuffix("_shift")
        material = written.layer.material
        if material is not None and which not in ("x", "y"):
            which = _first_element(material, key)
        return [Change(parameter, _HUNDREDTH, what, f"+{_HUNDREDTH:g} {which}")]
    return []


def _of_stack(parameter: Parameter, materials: bool) -> list[Change]:
    """Return the change of a number of the whole stack; none of one that nothing follows."""
    kind = parameter.kind
    if kind == "temperature" and materials:
        return [Change(parameter, 10.0, kind, "+10 K")]
    if kind == "field":
        return [Change(parameter, 1e-4, kind, "+1 kV/cm")]
    if kind == "bias":
        return [Change(parameter, 0.01, kind, "+10 mV")]
    if kind == "flux":
        return [Change(parameter, _HUNDREDTH, parameter.name, "+1 %")]
    return []


def _first_element(formula: str, key: str) -> str:
    """Return the element whose fraction a composition parameter is.

    Examples
    --------
    >>> _first_element("In0.53Ga0.47As", "composition")
    'In'
    """
    mixed = [site for site in parse(formula).sublattices if len(site) > 1]
    return mixed[-1 if key == "anion_composition" else 0][0][0]
