"""The factors that a fit looks for: which they are, their scale, and what takes them back.

A factor on fluxes, on all thicknesses or on one thickness moves as its logarithm, so that factors
multiply where their coordinates add; a composition moves as it is. All coordinates begin at 0.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from ..errors import BandwrightError, StackError
from ..parameters import FLUX, Parameter, find, list_parameters, read, replace
from ..quantities import show
from ..stack import Stack

#: kinds that multiply what they find
RATES = ("scale", "flux")
_KINDS = (*RATES, "thickness", "composition")


@dataclass(frozen=True)
class Factor:
    """One number of the stack that the data should tell.

    Attributes
    ----------
    parameter : Parameter
    start : float
        Of the design, in the parameter's unit; 1 of a factor.
    """

    parameter: Parameter
    start: float

    @property
    def name(self) -> str:
        """Its name, as asked."""
        return self.parameter.name

    @property
    def adds(self) -> bool:
        """Whether its coordinate adds to it, as that of a composition."""
        return self.parameter.kind == "composition"

    def value(self, coordinate: float) -> float:
        """Return what it is at a coordinate."""
        if self.adds:
            return self.start + coordinate
        return self.start * math.exp(coordinate)

    def per_unit(self, coordinate: float) -> float:
        """Return its slope by its coordinate."""
        return 1.0 if self.adds else self.value(coordinate)

    def slope(self, coordinate: float) -> float:
        """Return what a gradient of the moved stack is to be multiplied with."""
        if self.parameter.kind in RATES:  # the gradient's factor begins there anew
            return 1.0
        return self.per_unit(coordinate)

    def back(self, value: float) -> float:
        """Return what to set so that a reactor that turns the design into ``value`` gives it."""
        return 2.0 * self.start - value if self.adds else self.start**2 / value


def read_factors(stack: Stack, names: Sequence[str] | None) -> tuple[Factor, ...]:
    """Return the factors asked, or the flux of every group-III element of the stack.

    Raises
    ------
    StackError, UnknownName
        If a name is none that growth moves, two of them move one number, or there is no flux.
    """
    if names is None:
        names = [p.name for p in list_parameters(stack) if p.kind == "flux"]
        if not names:
            raise StackError("factors: no layer is of a material, so there is no flux to find;"
                             " name 'all thicknesses' or a thickness")  # fmt: skip
    if isinstance(names, str) or not names:
        raise StackError(f"factors: got {show(names)}; give a list of names, such as ['flux Ga']")
    found = []
    for name in names:
        parameter = find(stack, name)
        if parameter.kind not in _KINDS or name.endswith("_shift"):
            raise StackError("no growth rate moves it; name 'flux Ga', 'all thicknesses', a"
                             " thickness or a composition", name)  # fmt: skip
        found.append(Factor(parameter, read(stack, name)))
    for place, one in enumerate(found):
        for other in found[:place]:
            _refuse_shared(one.parameter, other.parameter)
    return tuple(found)


def _refuse_shared(one: Parameter, other: Parameter) -> None:
    """Raise if two factors move one number of a layer; rates may, the data have to tell."""
    if one.name == other.name:
        raise StackError("it is given twice", one.name)
    kinds = {one.kind, other.kind}
    if kinds <= set(RATES) or kinds == {"scale", "composition"}:
        return
    if kinds == {"thickness", "composition"}:
        return
    if set(one.layer_numbers) & set(other.layer_numbers):
        raise StackError(f"moves what {other.name} moves too; name one of them", one.name)


def moved(stack: Stack, factors: Sequence[Factor], values: Sequence[float]) -> Stack:
    """Return the stack with its factors set, those of single layers first."""
    rates_last = sorted(zip(factors, values, strict=True),
                        key=lambda pair: pair[0].parameter.kind in RATES)  # fmt: skip
    for factor, value in rates_last:
        stack = replace(stack, factor.name, value)
    return stack


def element_of(factor: Factor) -> str | None:
    """Return the element whose flux a factor is, None of others.

    Examples
    --------
    >>> element_of(Factor(Parameter("flux Ga", None, "flux", ""), 1.0))
    'Ga'
    """
    return factor.name.removeprefix(FLUX) if factor.parameter.kind == "flux" else None


def taken_back(stack: Stack, factors: Sequence[Factor], values: Sequence[float]) -> Stack:
    """Return the stack to set so that the next wafer comes out as designed.

    Raises
    ------
    StackError
        If it can't be grown.
    """
    try:
        backs = [one.back(value) for one, value in zip(factors, values, strict=True)]
        return moved(stack, factors, backs)
    except BandwrightError as error:
        raise StackError(f"the corrected stack can't be grown: {error}") from None
