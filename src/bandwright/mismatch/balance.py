"""The thickness or composition of a layer that brings the mean stress of a stack to zero.

The condition is that of the least elastic energy, sum of t A e/a = 0 over the layers, with
thickness t, relaxed lattice constant a, strain in the plane e and A = C11 + C12 - 2 C12^2/C11:
N. J. Ekins-Daukes, K. Kawaguchi, J. Zhang, Cryst. Growth Des. 2, 287 (2002); from memory.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from ..errors import BandwrightError, StackError
from ..materials import Library
from ..parameters import find, read, replace
from ..stack import Layer, Stack
from .films import Film, film_of, substrate_of

#: values of a composition that are tried before the root between two is sought
_TRIED = 41


class Balance(NamedTuple):
    """A change that brings the mean stress to zero.

    Attributes
    ----------
    name : str
        The parameter.
    unit : str
        ``"nm"``, ``"ML"``, or ``""`` of a composition.
    before, after : float
        Its value as written, and the one that balances.
    stack : Stack
        The stack with it.
    """

    name: str
    unit: str
    before: float
    after: float
    stack: Stack

    @property
    def change(self) -> float:
        """How much is added."""
        return self.after - self.before


def balanced(stack: Stack, name: str) -> Balance:
    """Return the value of a thickness or composition at which the mean stress is zero.

    Parameters
    ----------
    stack : Stack
    name : str
        As `bandwright.parameters` names it; copies and layers of one label move together.

    Raises
    ------
    StackError
        If it is no thickness or composition of a layer, or no value of it balances.
    UnknownName
        If the stack has no parameter of the name.
    """
    parameter = find(stack, name)
    if parameter.kind not in ("thickness", "composition", "composition end"):
        raise StackError(
            f"a {parameter.kind} balances no strain; name a layer's thickness or composition, for"
            " example 'layer 1.thickness'",
            name,
        )
    before = read(stack, name)
    force = _Force(stack, name)
    root = _thickness if parameter.kind == "thickness" else _composition
    after = root(force, before, name)
    return Balance(name, parameter.unit, before, after, replace(stack, name, after))


class _Force:
    """Sum of t A e/a over the layers [GPa] as a function of one parameter's value."""

    def __init__(self, stack: Stack, name: str) -> None:
        self.stack, self.name = stack, name
        self.library = Library.with_files(stack.materials)
        self.substrate = substrate_of(stack, self.library)
        self.known: dict[Layer, Film] = {}

    def film(self, layer: Layer) -> Film:
        if layer not in self.known:
            self.known[layer] = film_of(layer, "", self.stack, self.library, self.substrate)
        return self.known[layer]

    def __call__(self, value: float) -> float:
        total = 0.0
        for written in replace(self.stack, self.name, value).written():
            film = self.film(written.layer)
            if not film.own:
                total += written.copies * film.thickness * film.pull
        return total


def _thickness(force: Callable[[float], float], before: float, name: str) -> float:
    """Return the root in a thickness, of which the force is a straight line."""
    now, twice = force(before), force(2.0 * before)
    layer = twice - now  # the part of the force that grows with the thickness
    if layer == 0.0:
        raise StackError("it has no strain, so no thickness of it balances any", name)
    guess = before * (1.0 - now / layer)
    if guess <= 1e-9 * before:
        raise StackError(
            "no thickness of it brings the mean stress to zero: the other layers together are"
            f" {'without stress' if abs(now - layer) <= 1e-9 * abs(layer) else 'strained alike'}",
            name,
        )
    return _root(force, 0.9 * guess, 1.1 * guess)


def _composition(force: Callable[[float], float], before: float, name: str) -> float:
    """Return the root in a composition that lies nearest to the one written."""
    low = -1.0 if name.endswith("_shift") else 0.0
    tried = [(value, _finite(force, value)) for value in np.linspace(low, 1.0, _TRIED).tolist()]
    known = [(value, found) for value, found in tried if found is not None]
    roots = [
        _root(force, a, b)
        for (a, at_a), (b, at_b) in pairwise(known)
        if at_a * at_b <= 0.0
    ]
    if not roots:
        side = "stretched" if known and known[0][1] > 0.0 else "pressed together"
        raise StackError(
            "no composition of it brings the mean stress to zero: the stack stays"
            f" {side} all the way",
            name,
        )
    return min(roots, key=lambda root: abs(root - before))


def _finite(force: Callable[[float], float], value: float) -> float | None:
    """Return the force, None where there is no such layer."""
    try:
        return force(value)
    except BandwrightError:
        return None


def _root(force: Callable[[float], float], low: float, high: float) -> float:
    from scipy.optimize import brentq

    return float(brentq(force, low, high, xtol=1e-13, rtol=1e-14))
