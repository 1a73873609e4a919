"""Cautions about strain: layers off the substrate's lattice, and layers that may relax."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from itertools import groupby
from typing import NamedTuple

import numpy as np

from ..formula import parse
from ..levels import Levels
from ..materials import Library
from ..profile import LayerFacts
from ..stack import Layer
from ..strain import biaxial_stiffness, critical_thickness
from .words import listed

#: lattices that differ by less than this, relative, count as matched
MATCHED = 1e-3


def strains(levels: Levels) -> list[str]:
    """Return layers off the substrate's lattice, or off each other's without a substrate."""
    facts = [fact for fact in levels.profile.facts if not fact.own]
    if not facts:
        return []
    substrate = levels.stack.substrate
    if substrate is None:
        small = min(facts, key=lambda fact: fact.lattice)
        large = max(facts, key=lambda fact: fact.lattice)
        apart = large.lattice / small.lattice - 1.0
        if apart <= MATCHED:
            return []
        return [
            f"no substrate is named, and lattices differ by {apart:.2%} ({small.name}"
            f" {small.lattice:.5f} nm, {large.name} {large.lattice:.5f} nm): every layer is taken"
            f" unstrained; name it, for example substrate = '{_likely(levels, facts)}', and edges"
            " and gaps shift"
        ]
    off = [fact for fact in facts if abs(fact.mismatch) > MATCHED]
    texts = []
    if off:
        named = listed([f"{fact.name} ({_sized(fact)})" for fact in _distinct(off)])
        texts.append(
            f"off the lattice of {substrate}: {named}; taken as strained to it, edge and gap"
            " shifted with the volume, no splitting of the valence bands"
        )
    return texts + _too_thick(levels, substrate)


def _likely(levels: Levels, facts: Sequence[LayerFacts]) -> str:
    """Return the usual substrate nearest to the layers' lattices."""
    library = Library.with_files(levels.stack.materials)
    mean = sum(fact.lattice * fact.thickness for fact in facts) / sum(f.thickness for f in facts)
    return min(("GaAs", "InP", "GaSb"), key=lambda name: abs(library.lattice(name) - mean))


def _sized(fact: LayerFacts) -> str:
    word = "pressed together" if fact.mismatch < 0.0 else "stretched"
    return f"{word} {abs(fact.mismatch):.2%}"


def _too_thick(levels: Levels, substrate: str) -> list[str]:
    """Return runs of layers strained alike, or else all, beyond their critical thickness."""
    profile = levels.profile
    grown = [profile.facts[index] for index in profile.written]
    library = Library.with_files(levels.stack.materials)
    lattice = library.lattice(substrate)
    texts = runs_too_thick(grown, lattice)
    first, last = strained_part(grown)
    if not texts and last > first and not any(fact.own for fact in grown):
        stiff = [
            _stiffness(written.layer, fact.thickness, library)
            for written, fact in zip(levels.stack.written(), profile.facts, strict=True)
        ]
        weights = [stiff[index] for index in profile.written[first : last + 1]]
        film = as_one(grown[first : last + 1], lattice, last < len(grown) - 1, weights)
        texts = whole_too_thick(grown[first].name, grown[last].name, film)
    return texts


def _stiffness(layer: Layer, thickness: float, library: Library) -> float:
    """Return the stress in the plane per strain [GPa]; of a grade at half its thickness [nm]."""
    half = np.array([0.5 * thickness])
    values = {letter: float(shape.at(half, thickness)[0]) for letter, shape in layer.fractions}
    c11, c12 = library.stiffness(parse(str(layer.material), **values))
    return float(biaxial_stiffness(c11, c12))


def runs_too_thick(grown: Sequence[LayerFacts], lattice: float) -> list[str]:
    """Return runs of layers strained alike that are beyond their critical thickness.

    Neighbours strained in the same sense count as one film of their mean misfit.

    Parameters
    ----------
    grown : sequence of LayerFacts
        Every grown layer.
    lattice : float
        The substrate's lattice constant [nm].
    """
    found: dict[str, str] = {}
    place = 0
    for _, run in groupby(grown, key=_sense):
        film = list(run)
        place += len(film)
        if _sense(film[0]) == 0:
            continue
        names = " + ".join(dict.fromkeys(fact.name for fact in film))
        text = _beyond(as_one(film, lattice, place < len(grown)))
        if text:
            found[names] = f"{names}: {text}; make it thinner, or its misfit smaller"
    return list(found.values())


def whole_too_thick(first: str, last: str, film: AsOne) -> list[str]:
    """Return whether all from one layer to another is too much as one film."""
    text = _beyond(film)
    if text is None:
        return []
    return [
        f"{first} to {last}: {text}, though no layer alone is; balance the strain with layers of"
        " the other sign"
    ]


def strained_part(grown: Sequence[LayerFacts]) -> tuple[int, int]:
    """Return the places of the first and the last strained layer, (0, -1) where none is."""
    places = [i for i, fact in enumerate(grown) if _sense(fact) != 0]
    return (places[0], places[-1]) if places else (0, -1)


def _sense(fact: LayerFacts) -> int:
    """Return whether a layer is pressed together (-1), matched or unknown (0), stretched (1)."""
    return 0 if abs(fact.mismatch) <= MATCHED else int(math.copysign(1.0, fact.mismatch))


class AsOne(NamedTuple):
    """Layers taken as one film: thickness [nm], mean misfit, critical thickness [nm], its case."""

    thickness: float
    misfit: float
    limit: float
    case: str


def as_one(
    film: Sequence[LayerFacts], lattice: float, buried: bool, stiffness: Sequence[float] = ()
) -> AsOne:
    """Return neighbouring layers as one film on a substrate of a lattice constant [nm].

    Its misfit is the mean by thickness, and by stiffness over lattice constant squared where
    given: then layers whose stresses balance have none.
    """
    thickness = sum(fact.thickness for fact in film)
    stiff = stiffness or [fact.lattice**2 for fact in film]
    parts = [f.thickness * a / f.lattice**2 for f, a in zip(film, stiff, strict=True)]
    misfits = [-f.mismatch / (1.0 + f.mismatch) for f in film]
    misfit = sum(m * part for m, part in zip(misfits, parts, strict=True)) / sum(parts)
    poisson = sum(_poisson(fact) * fact.thickness for fact in film) / thickness
    case = "single layer" if buried else "free surface"
    return AsOne(thickness, misfit, critical_thickness(misfit, lattice, poisson, case), case)


def _beyond(film: AsOne) -> str | None:
    """Return how far a film is beyond its critical thickness, None if it is not."""
    if film.thickness <= film.limit or abs(film.misfit) < 1e-6:
        return None
    return (
        f"{film.thickness:.3g} nm with a misfit of {film.misfit:+.2%} is beyond the critical"
        f" thickness of {film.limit:.3g} nm (Matthews and Blakeslee 1974) and may relax"
    )


def _poisson(fact: LayerFacts) -> float:
    """Return C12/(C11 + C12) as the film's own strain shows it; a third where it can't."""
    if abs(fact.mismatch) <= MATCHED:
        return 1.0 / 3.0
    ratio = -0.5 * (2.0 * fact.monolayer / fact.lattice - 1.0) / fact.mismatch
    return ratio / (1.0 + ratio) if 0.2 < ratio < 0.9 else 1.0 / 3.0


def _distinct(facts: Iterable[LayerFacts]) -> list[LayerFacts]:
    return list({(fact.name, round(fact.mismatch, 6)): fact for fact in facts}.values())
