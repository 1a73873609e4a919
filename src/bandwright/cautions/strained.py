"""Cautions about strain: layers off the substrate's lattice, and layers that may relax."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from itertools import groupby

from ..levels import Levels
from ..materials import Library
from ..profile import LayerFacts
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


def critical_thickness(
    misfit: float, lattice: float, poisson: float = 1.0 / 3.0, buried: bool = True
) -> float:
    """Return the thickness [nm] beyond which a strained layer makes misfit dislocations.

    Parameters
    ----------
    misfit : float
        Relative difference of the layer's relaxed lattice from the substrate's, of either sign.
    lattice : float
        The substrate's lattice constant [nm].
    poisson : float
        C12/(C11 + C12) of the layer.
    buried : bool
        Whether another layer lies on it (two dislocation lines, half the force each).

    Returns
    -------
    float
        0 where even the thinnest layer is too much, inf without misfit.

    Notes
    -----
    h = b (1 - nu cos^2 a) [ln(h/b) + 1] / (K f (1 + nu) cos l), with b = lattice/sqrt 2 and
    cos a = cos l = 1/2 of 60 degree dislocations, K = 4 pi for a buried layer and 8 pi for an
    uncapped one: J. W. Matthews and A. E. Blakeslee, J. Cryst. Growth 27, 118 (1974). The two
    values of K are from memory.

    Examples
    --------
    >>> print(f"{critical_thickness(0.0143298103, 0.565325, 0.322120116):.4f} nm")
    14.0863 nm
    """
    if misfit == 0.0:
        return math.inf
    from scipy.special import lambertw

    b = lattice / math.sqrt(2.0)
    k = (4.0 if buried else 8.0) * math.pi
    scale = (1.0 - 0.25 * poisson) / (k * abs(misfit) * (1.0 + poisson) * 0.5)
    if scale <= 1.0:  # h/b = scale [ln(h/b) + 1] then has no root above b
        return 0.0
    return -b * scale * float(lambertw(-math.exp(-1.0) / scale, -1).real)


def _too_thick(levels: Levels, substrate: str) -> list[str]:
    """Return runs of layers strained alike, and the whole stack, beyond their critical thickness.

    Neighbours strained in the same sense count as one film of their mean misfit.
    """
    profile = levels.profile
    grown = [profile.facts[index] for index in profile.written]
    lattice = Library.with_files(levels.stack.materials).lattice(substrate)
    found: dict[str, str] = {}
    place = 0
    for _, run in groupby(grown, key=_sense):
        film = list(run)
        place += len(film)
        if _sense(film[0]) == 0:
            continue
        names = " + ".join(dict.fromkeys(fact.name for fact in film))
        text = _beyond(film, lattice, place < len(grown))
        if text:
            found[names] = f"{names}: {text}; make it thinner, or its misfit smaller"
    if not found:
        found[""] = _whole(grown, lattice)
    return [text for text in found.values() if text]


def _whole(grown: Sequence[LayerFacts], lattice: float) -> str:
    """Return whether all from the first to the last strained layer is too much as one film."""
    places = [i for i, fact in enumerate(grown) if _sense(fact) != 0]
    if len(places) < 2 or any(fact.own for fact in grown):
        return ""
    film = grown[places[0] : places[-1] + 1]
    text = _beyond(film, lattice, places[-1] < len(grown) - 1)
    if text is None:
        return ""
    return (
        f"{film[0].name} to {film[-1].name}: {text}, though no layer alone is; balance the strain"
        " with layers of the other sign"
    )


def _sense(fact: LayerFacts) -> int:
    """Return whether a layer is pressed together (-1), matched or unknown (0), stretched (1)."""
    return 0 if abs(fact.mismatch) <= MATCHED else int(math.copysign(1.0, fact.mismatch))


def _beyond(film: Sequence[LayerFacts], lattice: float, buried: bool) -> str | None:
    """Return how far a film is beyond its critical thickness, None if it is not."""
    thickness = sum(fact.thickness for fact in film)
    misfit = sum(-f.mismatch / (1.0 + f.mismatch) * f.thickness for f in film) / thickness
    poisson = sum(_poisson(fact) * fact.thickness for fact in film) / thickness
    limit = critical_thickness(misfit, lattice, poisson, buried)
    if thickness <= limit or abs(misfit) < 1e-6:
        return None
    return (
        f"{thickness:.3g} nm with a misfit of {misfit:+.2%} is beyond the critical thickness of"
        f" {limit:.3g} nm (Matthews and Blakeslee 1974) and may relax"
    )


def _poisson(fact: LayerFacts) -> float:
    """Return C12/(C11 + C12) as the film's own strain shows it; a third where it can't."""
    if abs(fact.mismatch) <= MATCHED:
        return 1.0 / 3.0
    ratio = -0.5 * (2.0 * fact.monolayer / fact.lattice - 1.0) / fact.mismatch
    return ratio / (1.0 + ratio) if 0.2 < ratio < 0.9 else 1.0 / 3.0


def _distinct(facts: Iterable[LayerFacts]) -> list[LayerFacts]:
    return list({(fact.name, round(fact.mismatch, 6)): fact for fact in facts}.values())
