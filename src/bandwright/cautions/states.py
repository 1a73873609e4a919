"""Cautions about levels: counts, box, clusters, barrier tops, phase integral, two-band model."""

from __future__ import annotations

from itertools import groupby

import numpy as np

from ..levels import Levels
from ..profile import Profile
from .words import listed, numbered

#: a level this near to a barrier's top [eV] hangs on the barrier's last meV
NEAR_TOP = 3e-3
#: ... if at least this part of it lies in the barrier
IN_BARRIER = 0.05
#: largest difference of phase integral and shooting, in spacings to the next level
APART = 0.1
#: largest probability where the two-band mass stands at its floor
CLAMPED = 1e-3
#: levels closer than this many energy errors are not told apart singly
TOLD_APART = 100.0
_ROUNDING = 1e-15


def counts(levels: Levels) -> list[str]:
    """Return what is wrong with the certificate of completeness."""
    if levels.method == "phase-integral":
        return [
            "these are phase-integral energies, nothing was shot or counted: use"
            " method = 'shooting' for levels with a certificate"
        ]
    texts = []
    wrong = np.flatnonzero(~levels.count_checked) + 1
    if len(wrong):
        texts.append(
            f"THE COUNTS DO NOT AGREE around {numbered(wrong)}: a level may be missing or wrong"
            f" by more than {levels.tolerance:g} eV; ask for a finer tolerance, or split a layer"
            " with a kink inside"
        )
    elif not levels.complete:
        texts.append(
            "THE SET IS NOT PROVED COMPLETE between its bounds: a level may be missing; ask for a"
            " finer tolerance, or move below away from a level"
        )
    return texts


def boxes(levels: Levels) -> list[str]:
    """Return that walls stand in for open ends, and how many levels are the box's."""
    if not levels.boxed.any():
        return []
    why = "in a field" if levels.profile.field != 0.0 else "above the lower open edge"
    numbers = numbered(np.flatnonzero(levels.boxed) + 1)
    box = np.flatnonzero(levels.of_box) + 1
    texts = [
        f"no state is bound {why}: walls at the outer faces stand in for the open ends of {numbers}"
    ]
    if len(box):
        texts.append(
            f"{numbered(box)} {'belong' if len(box) > 1 else 'belongs'} to that box, not to the"
            " structure (over 0.1 meV/nm of wall shift): lines leave"
            f" {'them' if len(box) > 1 else 'it'} out; thicker outer layers move"
            f" {'them' if len(box) > 1 else 'it'}"
        )
    return texts


def clusters(levels: Levels) -> list[str]:
    """Return sets of levels that are too close to be told apart singly."""
    sets: list[str] = []
    first = 0
    for part in levels.parts:
        if part.solution is not None and len(part.energies):
            error = np.maximum(part.solution.error, _ROUNDING)
            near = np.diff(part.energies) < TOLD_APART * np.maximum(error[1:], error[:-1])
            label = np.concatenate(([0], np.cumsum(~near)))
            for _, members in groupby(range(len(label)), key=lambda i: int(label[i])):
                numbers = np.array(list(members)) + first + 1
                if len(numbers) > 1:
                    sets.append(numbered(numbers))
        first += len(part.energies)
    return [
        f"{listed(sets)} are too close to be told apart singly: energies and the sum over them"
        " hold, single states and dipoles are mixtures; widen group, so that they are one row"
    ] if sets else []  # fmt: skip


def tops(levels: Levels) -> list[str]:
    """Return levels within a few meV of the top of a barrier they lie in."""
    if levels.method == "phase-integral" or not len(levels.energies):
        return []
    profile = levels.profile
    heights = _barrier_tops(profile)
    inside = levels.states.probabilities
    said: dict[tuple[int, str], str] = {}
    for section, top in heights.items():
        for index in np.flatnonzero(np.abs(levels.energies - top) < NEAR_TOP):
            if levels.of_box[index] or inside[index, section] < IN_BARRIER:
                continue
            off = 1e3 * float(levels.energies[index] - top)
            side = "above" if off >= 0.0 else "below"
            key = (int(index), profile.name(section))
            said[key] = f"level {index + 1} lies {abs(off):.2g} meV {side} the top of {key[1]}"
    return [
        f"{text}: a small error of the band offset binds or frees it; compare a stack with"
        " 0.01 more and less in its composition"
        for _, text in sorted(said.items())
    ]


def _barrier_tops(profile: Profile) -> dict[int, float]:
    """Return the highest edge [eV] of each section that stands above one of its neighbours."""
    sections = profile.sections
    edges = [s.edge.at(np.linspace(0.0, s.thickness, 2 if s.tilted else 65)) for s in sections]
    tops = {}
    for i, edge in enumerate(edges):
        beside = [float(edges[i - 1][-1]) - float(edge[0])] if i else []
        beside += [float(edges[i + 1][0]) - float(edge[-1])] if i + 1 < len(edges) else []
        if beside and min(beside) < -2.0 * NEAR_TOP:
            tops[i] = float(edge.max())
    return tops


def phases(levels: Levels) -> list[str]:
    """Return levels whose two methods are further apart than a tenth of the spacing."""
    if levels.method == "phase-integral" or len(levels.groups) < 2 or levels.phase_exact:
        return []
    energies = np.array([float(np.mean(levels.energies[g])) for g in levels.groups])
    phase = np.array([float(np.mean(levels.phase_integral[g])) for g in levels.groups])
    gaps = np.diff(energies)
    spacing = np.minimum(np.append(gaps, np.inf), np.append(np.inf, gaps))
    share = np.abs(phase - energies) / spacing
    texts = []
    apart = np.flatnonzero(share > APART)
    if len(apart):
        worst = apart[int(np.argmax(share[apart]))]
        numbers = numbered([levels.groups[i].start + 1 for i in apart])
        texts.append(
            f"phase integral and shooting are over {APART:.0%} of the spacing apart for {numbers}"
            f" (level {levels.groups[worst].start + 1}: {share[worst]:.0%}): the simple picture of"
            " standing waves fails there; trust the shooting energy, or try phase_order = 2"
        )
    missing = np.flatnonzero(np.isnan(phase))
    if len(missing):
        numbers = numbered([levels.groups[i].start + 1 for i in missing])
        texts.append(
            f"the phase integral has no level of the number of {numbers}: the simple picture of"
            " standing waves fails there; trust the shooting energy"
        )
    return texts


def two_band(levels: Levels) -> list[str]:
    """Return levels near or beyond the limit of the two-band model."""
    profile = levels.profile
    if profile.bands != "two-band" or levels.method == "phase-integral" or not len(levels.energies):
        return []
    texts = []
    clamped = levels.states.clamped
    deep = np.flatnonzero(clamped > CLAMPED)
    if len(deep):
        texts.append(
            f"two-band model near its limit: {numbered(deep + 1)} with up to"
            f" {float(clamped[deep].max()):.1e} of the probability so far below a barrier's edge"
            " that its mass was held at 5 % of the edge's; solve with bands = 'one-band' to see how"
            " much it matters"
        )
    beyond: dict[str, list[int]] = {}
    for index, main in enumerate(np.argmax(levels.states.probabilities, axis=1)):
        section = profile.sections[main]
        middle = np.array([0.5 * section.thickness])
        above = float(levels.energies[index] - section.edge.at(middle)[0])
        if above * float(section.inverse_gap.at(middle)[0]) > 1.0:
            beyond.setdefault(profile.name(int(main)), []).append(index + 1)
    return texts + [
        f"two-band model near its limit: {numbered(numbers)} further above the edge of {name}"
        " than its gap; far bands count there, expect the energy to be some per cent off"
        for name, numbers in beyond.items()
    ]
