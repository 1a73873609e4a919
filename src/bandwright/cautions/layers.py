"""Cautions about single layers: thickness, material data, doping; and the field's direction."""

from __future__ import annotations

import numpy as np

from ..levels import Levels
from ..quantities import number_text
from ..stack import DOPING
from .words import listed

#: thinner [nm] or thicker [nm] layers look like a slip of the unit
THIN, THICK = 0.1, 1000.0
#: own masses [free electron's] and edges above the lowest [eV] that look like one
HEAVY, HIGH = 5.0, 10.0
_SINGLY = 4


def thicknesses(levels: Levels) -> list[str]:
    """Return layers whose thickness looks like a slip."""
    texts: list[str] = []
    odd = [
        fact
        for fact in levels.profile.facts
        if not THIN <= fact.thickness <= THICK or fact.thickness < fact.monolayer * (1.0 - 1e-6)
    ]
    for fact in odd[:_SINGLY]:
        length = f"{number_text(round(fact.thickness, 6))} nm"
        if fact.thickness > THICK:
            nm, tenth = (number_text(round(fact.thickness / by, 6)) for by in (1000, 10))
            texts.append(
                f"{fact.name} is {length} thick, over 1 um: is the unit right? {nm} nm if um"
                f" stands for nm, {tenth} nm if nm stands for Å"
            )
        elif fact.thickness < THIN:
            texts.append(
                f"{fact.name} is {length} thick, thinner than any layer of atoms: is the unit"
                " right?"
            )
        else:
            texts.append(
                f"{fact.name} is {length} thick, less than one monolayer"
                f" ({fact.monolayer:.4f} nm): it can't be a layer of its own; write it in ML, or as"
                " an alloy"
            )
    if len(odd) > _SINGLY:
        texts.append(f"{len(odd) - _SINGLY} more layers are as odd in thickness")
    return texts


def interfaces(levels: Levels) -> list[str]:
    """Return layers thinner than the standard deviation of an interface of theirs."""
    stack = levels.stack
    if not stack.realistic:
        return []
    facts, general = levels.profile.facts, stack.interface_width or 0.0
    grown = [(layer.interface_width, number) for layer, number in stack.grown()]
    faces = [(general if width is None else width, number) for width, number in grown]
    thin: dict[str, float] = {}
    for (width, number), (beyond, _) in zip(faces, [*faces[1:], (0.0, 0)], strict=True):
        fact, widest = facts[number - 1], max(width, beyond)
        if widest > fact.thickness:
            thin[fact.name] = max(widest, thin.get(fact.name, 0.0))
    if not thin:
        return []
    worst = number_text(round(max(thin.values()), 6))
    return [
        f"{listed(list(thin))}: thinner than an interface_width of {worst} nm, so that its own"
        " composition is nowhere reached: is the width right?"
    ]


def own_numbers(levels: Levels) -> list[str]:
    """Return own masses and edges that look like a slip."""
    profile = levels.profile
    own = {fact.name for fact in profile.facts if fact.own}
    if not own:
        return []
    lowest, masses, tops = np.inf, dict.fromkeys(own, 0.0), dict.fromkeys(own, -np.inf)
    for index, (start, section) in enumerate(zip(profile.faces, profile.sections, strict=False)):
        depth = np.linspace(0.0, section.thickness, 2 if section.tilted else 17)
        bare = section.edge.at(depth) - profile.field * (start + depth)
        lowest = min(lowest, float(bare.min()))
        name = profile.name(index)
        if name in own:
            masses[name] = max(masses[name], float(section.mass.at(depth).max()))
            tops[name] = max(tops[name], float(bare.max()))
    heavy = {name: mass for name, mass in masses.items() if mass > HEAVY}
    high = {name: top - lowest for name, top in tops.items() if top - lowest > HIGH}
    texts = []
    if heavy:
        texts.append(
            f"{listed(sorted(heavy))}: a mass of {max(heavy.values()):.4g} times the free"
            " electron's: is the decimal point right?"
        )
    if high:
        texts.append(
            f"{listed(sorted(high))}: an edge {max(high.values()):.4g} eV above the lowest: is the"
            " unit right, eV or meV?"
        )
    return texts


def materials(levels: Levels) -> list[str]:
    """Return what the material data say about their use here, layers named."""
    said: dict[str, list[str]] = {}
    for fact in levels.profile.facts:
        for text in fact.cautions:
            own = fact.name.endswith(f"({fact.material})")  # the name says the formula already
            short = text.removeprefix(f"{fact.material}: ") if own else text
            said.setdefault(short, []).append(fact.name)
    return [f"{listed(names)}: {text}" for text, names in said.items()]


def charges(levels: Levels) -> list[str]:
    """Return that doping has no effect yet."""
    written = levels.stack.written()
    doped = [
        one.name
        for one in written
        if any(d is not None and d.value > 0.0 for d in (getattr(one.layer, k) for k in DOPING))
    ]
    if not doped:
        return []
    return [
        f"charge not included: the doping of {listed(doped)} is kept and bends no band; dope"
        " lightly, or expect shifts of some meV from 1e11 / cm^2 on"
    ]


def directions(levels: Levels) -> list[str]:
    """Return which way electrons run where only a sign says it."""
    stack, field = levels.stack, levels.profile.field
    if field == 0.0 or stack.electrons_run is not None:
        return []
    given = "field" if stack.bias is None else "bias"
    way, other = ("substrate", "surface") if field > 0.0 else ("surface", "substrate")
    return [
        f"the sign of the {given} makes electrons run to the {way}; write electrons_run ="
        f" 'to {way}' to say so, or 'to {other}' if it is the other way round"
    ]
