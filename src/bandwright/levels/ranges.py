"""Which part of the spectrum is solved between which ends.

Below the lower open edge and without a field levels are bound and keep their open ends. Above
it, or in a field, no state is bound: that part is solved between walls at the outer faces, as a
closed box, and counted on its own.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from ..constants import H2M
from ..errors import SolveError
from ..profile import Profile, Section

Ends = tuple[str, str]


class Range(NamedTuple):
    """A part of the spectrum: its ends, its highest energy [eV], whether it is a closed box."""

    ends: Ends
    high: float
    boxed: bool


def ranges(profile: Profile, below: float | None, at_most: int | None) -> tuple[Range, ...]:
    """Return the parts to solve, from below.

    Parameters
    ----------
    profile : Profile
    below : float or None
        Highest energy asked [eV]; None for the limit of the structure itself: its bound levels,
        or in a field its highest edge without that field, carried along by the field.
    at_most : int or None
        Most levels asked, which bounds the search between two walls.

    Raises
    ------
    SolveError
        If ends are periodic, or nothing bounds the energies asked.
    """
    if "periodic" in profile.ends:
        raise SolveError(
            "ends = 'periodic' is read but not solved yet; use 'open', 'wall', or write the"
            " periods out as a group"
        )
    edge = open_edge(profile)
    if edge is None:
        if below is None:
            below = _walled_limit(profile, at_most)
        return (Range(profile.ends, below, False),)
    if profile.field != 0.0:
        high = carried_edge(profile) if below is None else below
        return (Range(_box(profile.ends), high, True),)
    if below is None or below <= edge:
        return (Range(profile.ends, edge if below is None else below, False),)
    return Range(profile.ends, edge, False), Range(_box(profile.ends), below, True)


def open_edge(profile: Profile) -> float | None:
    """Return the lower edge of the open ends' outer faces [eV]; None between two walls."""
    first, last = profile.sections[0], profile.sections[-1]
    places = ((profile.ends[0], first, 0.0), (profile.ends[1], last, last.thickness))
    edges = [section.edge.value(depth) for end, section, depth in places if end == "open"]
    return min(edges) if edges else None


def carried_edge(profile: Profile) -> float:
    """Return the highest energy [eV] that the highest edge without the field has in it."""
    tops = [_top(section, profile.field, start)
            for start, section in zip(profile.faces, profile.sections, strict=False)]  # fmt: skip
    highest = max(bare for bare, _ in tops)
    return max(carried for bare, carried in tops if bare > highest - 1e-9)


def _top(section: Section, field: float, start: float) -> tuple[float, float]:
    """Return a section's highest edge without the field, and its energy in the field there."""
    depth = np.linspace(0.0, section.thickness, 2 if section.tilted else 129)
    bare = section.edge.at(depth) - field * (start + depth)
    reached = bare > bare.max() - 1e-9
    return float(bare.max()), float(np.max((bare + field * (start + depth))[reached]))


def _walled_limit(profile: Profile, at_most: int | None) -> float:
    """Return a limit between two walls: the highest edge, or enough room for ``at_most``."""
    edges = [s.edge.at(np.linspace(0.0, s.thickness, 65)) for s in profile.sections]
    low, high = min(float(e.min()) for e in edges), max(float(e.max()) for e in edges)
    if at_most is None:
        if high - low < 1e-9:
            raise SolveError(
                "two walls around a flat bottom bind levels at every energy: say how far to go,"
                " below = '0.5 eV' or at_most = 6"
            )
        return high
    lightest = min(
        float(np.min(s.mass.at(np.linspace(0.0, s.thickness, 65)))) for s in profile.sections
    )
    # The lightest flat well of this width above the highest edge has at least so many levels.
    return high + H2M / lightest * (np.pi * (at_most + 1) / profile.thickness) ** 2


def _box(ends: Ends) -> Ends:
    return ("wall", "wall") if "open" in ends else ends
