"""Cautions about levels: counts, box, clusters, barrier tops, phase integral, two-band model."""

from __future__ import annotations

from itertools import groupby

import numpy as np

from ..levels import Levels
from ..levels.ranges import open_edge
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


def nothing(levels: Levels) -> list[str]:
    """Return why there is no level, and how to get one."""
    if len(levels.energies):
        return []
    profile, high = levels.profile, levels.parts[-1].span.high
    edge = open_edge(profile)
    if edge is None or profile.field != 0.0 or abs(high - edge) > _ROUNDING:
        return [
            f"there is no level below {high * 1e3:.4g} meV; to look higher up, give a higher"
            " below"
        ]
    first, last = profile.sections[0], profile.sections[-1]
    at_first = profile.ends[0] == "open" and first.edge.value(0.0) <= edge + _ROUNDING
    name = profile.name(0 if at_first else len(profile.sections) - 1)
    face = first.edge.value(0.0) if at_first else last.edge.value(last.thickness)
    return [
        f"nothing is bound: an electron above {face * 1e3:.4g} meV, the edge of {name}, leaves"
        " through it, as the outer layer goes on for ever at an open end; put a barrier outside,"
        " leave out a cap or buffer that is no part of the problem, or say ends = 'wall' or how"
        " high to look, below"
    ]


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
    texts = []
    first = 0
    for part in levels.parts:
        if part.solution is not None and len(part.energies):
            error = np.maximum(part.solution.error, _ROUNDING)
            near = np.diff(part.energies) < TOLD_APART * np.maximum(error[1:], error[:-1])
            label = np.concatenate(([0], np.cumsum(~near)))
            for _, members in groupby(range(len(label)), key=lambda i: int(label[i])):
                numbers = [index + first for index in members]
                if len(numbers) > 1:
                    texts.append(_mixed(levels, numbers))
        first += len(part.energies)
    return texts


def _mixed(levels: Levels, indices: list[int]) -> str:
    text = (
        f"{numbered([i + 1 for i in indices])} are too close to be told apart singly: their"
        " energies and sums over all of them hold, a single state or dipole is a mixture"
    )
    if any(group.start <= indices[0] and indices[-1] < group.stop for group in levels.groups):
        return f"{text}; the table's row counts them together"
    return f"{text}; widen group, so that they become one row"


def tops(levels: Levels) -> list[str]:
    """Return levels within a few meV of the top of a barrier they lie in."""
    if levels.method == "phase-integral" or not len(levels.energies):
        return []
    inside = levels.states.probabilities
    near: dict[int, dict[str, float]] = {}
    for section, top in _barrier_tops(levels.profile).items():
        for index in map(int, np.flatnonzero(np.abs(levels.energies - top) < NEAR_TOP)):
            if not levels.of_box[index] and inside[index, section] >= IN_BARRIER:
                off = float(levels.energies[index] - top)
                near.setdefault(index, {})[levels.profile.name(section)] = off
    texts = []
    for index, tops_here in sorted(near.items()):
        off = min(tops_here.values(), key=abs)
        side = "above" if off >= 0.0 else "below"
        texts.append(
            f"level {index + 1} lies {abs(off) * 1e3:.2g} meV {side} the top of"
            f" {listed(list(tops_here))}: a small error of the band offset binds or frees it;"
            " compare the stack with a barrier slightly higher and slightly lower"
        )
    return texts


def _barrier_tops(profile: Profile) -> dict[int, float]:
    """Return the highest edge [eV] of each section that is a barrier to one of its neighbours.

    What is a barrier is seen without the stack's field.
    """
    lows, highs, tops = [], [], []
    for start, section in zip(profile.faces, profile.sections, strict=False):
        depth = np.linspace(0.0, section.thickness, 2 if section.tilted else 65)
        edge = section.edge.at(depth)
        bare = edge - profile.field * (start + depth)
        lows.append(float(bare.min()))
        highs.append(float(bare.max()))
        tops.append(float(edge.max()))
    found = {}
    for i, high in enumerate(highs):
        beside = lows[max(i - 1, 0) : i] + lows[i + 1 : i + 2]
        if beside and min(beside) < high - 2.0 * NEAR_TOP:
            found[i] = tops[i]
    return found


def phases(levels: Levels) -> list[str]:
    """Return levels whose two methods are further apart than a tenth of the spacing."""
    if levels.method == "phase-integral" or not len(levels.groups) or levels.phase_exact:
        return []
    energies = np.array([float(np.mean(levels.energies[g])) for g in levels.groups])
    phase = np.array([float(np.mean(levels.phase_integral[g])) for g in levels.groups])
    own = np.array([not bool(np.any(levels.of_box[g])) for g in levels.groups])
    numbers = np.array([g.start + 1 for g in levels.groups])
    gaps = np.diff(energies)
    spacing = np.minimum(np.append(gaps, np.inf), np.append(np.inf, gaps))
    share = np.abs(phase - energies) / spacing
    texts = []
    apart = np.flatnonzero(own & (share > APART))
    if len(apart):
        worst = apart[int(np.argmax(share[apart]))]
        texts.append(
            f"phase integral and shooting are over {APART:.0%} of the spacing apart for"
            f" {numbered(numbers[apart])} (level {numbers[worst]}: {share[worst]:.0%}): the simple"
            " picture of standing waves fails there; trust the shooting energy, or try"
            " phase_order = 2"
        )
    missing = np.flatnonzero(own & np.isnan(phase))
    if len(missing):
        texts.append(
            f"the phase integral has no level of the number of {numbered(numbers[missing])}: the"
            " simple picture of standing waves fails there; trust the shooting energy"
        )
    return texts


def two_band(levels: Levels) -> list[str]:
    """Return levels near or beyond the limit of the two-band model."""
    profile = levels.profile
    if profile.bands != "two-band" or levels.method == "phase-integral" or not len(levels.energies):
        return []
    texts = []
    clamped = levels.states.clamped
    deep = np.flatnonzero((clamped > CLAMPED) & ~levels.of_box)
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
        if above * float(section.inverse_gap.at(middle)[0]) > 1.0 and not levels.of_box[index]:
            beyond.setdefault(profile.name(int(main)), []).append(index + 1)
    return texts + [
        f"two-band model near its limit: {numbered(numbers)} further above the edge of {name} than"
        " its gap; far bands count there: take the energy as a guess, or stay lower"
        for name, numbers in beyond.items()
    ]
