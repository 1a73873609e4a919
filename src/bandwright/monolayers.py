"""A solved stack as it is grown: in whole monolayers, and with the strain it carries."""

from __future__ import annotations

import math
import warnings

from .errors import BandwrightWarning
from .levels import Levels, solve
from .parameters.layers import replaced
from .stack import Stack

#: how far above the highest level of the design is looked [eV]
_ROOM = 0.1


def rounded(levels: Levels) -> Stack:
    """Return the stack with every thickness rounded to whole monolayers, one at least.

    A monolayer is that of the strained film; layers with their own numbers have none and stay.

    Examples
    --------
    >>> import bandwright as bw
    >>> levels = bw.solve(bw.parse_line("20 nm Al0.3Ga0.7As, 24.4 ML GaAs, 20 nm Al0.3Ga0.7As",
    ...                                 substrate="GaAs"))
    >>> [round(layer.thickness.value, 4) for layer in rounded(levels).layers]
    [20.085, 24.0, 20.085]
    """
    stack = levels.stack
    for written in stack.written():
        monolayer = levels.profile.facts[written.number - 1].monolayer
        value, unit = written.layer.thickness
        each = 1.0 if unit == "ML" else monolayer
        if math.isnan(each):
            continue
        whole = max(1.0, math.floor(value / each + 0.5))
        stack = stack.with_layer(written.number, replaced(written.layer, "thickness", whole * each))
    return stack


def in_monolayers(levels: Levels) -> Levels:
    """Return the levels of the `rounded` stack, as many as the design has at most."""
    return solved_like(levels, rounded(levels))


def solved_like(levels: Levels, grown: Stack) -> Levels:
    """Return the levels of a stack that is nearly the design, as many as that has at most."""
    below = None
    if len(levels) and levels.boxed.any():
        below = f"{float(levels.energies[-1]) + _ROOM!r} eV"
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", BandwrightWarning)  # said about the design already
        return solve(
            grown, below=below, at_most=max(len(levels), 1),
            tolerance=f"{levels.tolerance!r} eV", group=f"{levels.group!r} eV",
            bands=levels.profile.bands,
        )  # fmt: skip


def net_strain(levels: Levels) -> float | None:
    """Return the in-plane strain exx of all layers, weighted with their thickness.

    None without a substrate, or where a layer with its own numbers has no lattice. Positive is
    tension.

    Examples
    --------
    An invented well that is pressed together, between barriers that pull a little:

    >>> import bandwright as bw
    >>> levels = bw.solve(bw.parse_line(
    ...     "10 nm Al0.48In0.52As, 5 nm In0.6Ga0.4As, 10 nm Al0.48In0.52As", substrate="InP"))
    >>> print(f"{net_strain(levels):.3%}")
    -0.062%
    """
    facts = levels.profile.facts
    if levels.stack.substrate is None or any(fact.own for fact in facts):
        return None
    grown = [facts[number - 1] for _, number in levels.stack.grown()]
    total = sum(fact.thickness for fact in grown)
    return float(sum(fact.thickness * fact.mean_mismatch for fact in grown) / total)
