"""Which part of the spectrum is solved between which ends.

Below the lower open edge and without a field levels are bound and keep their open ends. Above
it, or in a field, no state is bound: that part is solved between walls at the outer faces, as a
closed box, and counted on its own.
"""

from __future__ import annotations

from functools import reduce
from typing import Any, NamedTuple

import numpy as np

from ..constants import H2M
from ..errors import SolveError
from ..profile import Profile, Section
from ..profile.curves import smaller
from ..profile.sections import is_zero

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
    _refuse_periodic(profile)
    edge, limit = open_edge(profile), _limit(profile, below, at_most)
    return _parts(profile, None if edge is None else float(edge), float(limit))


def ranges_of_many(
    profile: Profile, below: float | None, at_most: int | None
) -> list[tuple[Range, ...]]:
    """Return the parts to solve of each of many designs."""
    _refuse_periodic(profile)
    edge, limit = open_edge(profile), _limit(profile, below, at_most)
    limits = np.broadcast_to(limit, profile.designs or 1).tolist()
    edges = [None] * len(limits) if edge is None else np.broadcast_to(edge, len(limits)).tolist()
    return [_parts(profile, *pair) for pair in zip(edges, limits, strict=True)]


def _refuse_periodic(profile: Profile) -> None:
    if "periodic" in profile.ends:
        raise SolveError(
            "ends = 'periodic' is read but not solved yet; use 'open', 'wall', or write the"
            " periods out as a group"
        )


def _limit(profile: Profile, below: float | None, at_most: int | None) -> Any:
    """Return the highest energy asked [eV], or each design's own limit."""
    if below is not None:
        return below
    edge = open_edge(profile)
    if edge is None:
        return _walled_limit(profile, at_most)
    return edge if is_zero(profile.field) else carried_edge(profile)


def _parts(profile: Profile, edge: float | None, limit: float) -> tuple[Range, ...]:
    if edge is None:
        return (Range(profile.ends, limit, False),)
    if not is_zero(profile.field):
        return (Range(_box(profile.ends), limit, True),)
    if limit <= edge:
        return (Range(profile.ends, limit, False),)
    return Range(profile.ends, edge, False), Range(_box(profile.ends), limit, True)


def open_edge(profile: Profile) -> Any:
    """Return the lower edge of the open ends' outer faces [eV]; None between two walls."""
    first, last = profile.sections[0], profile.sections[-1]
    places = ((profile.ends[0], first, 0.0), (profile.ends[1], last, last.thickness))
    edges = [section.edge.value(depth) for end, section, depth in places if end == "open"]
    return reduce(smaller, edges) if edges else None


def carried_edge(profile: Profile) -> Any:
    """Return the highest energy [eV] that the highest edge without the field has in it."""
    tops = [_top(section, profile.field, start)
            for start, section in zip(profile.faces, profile.sections, strict=False)]  # fmt: skip
    bare, carried = (np.array(np.broadcast_arrays(*column)) for column in zip(*tops, strict=True))
    return np.where(bare > bare.max(axis=0) - 1e-9, carried, -np.inf).max(axis=0)


def _top(section: Section, field: Any, start: Any) -> tuple[Any, Any]:
    """Return a section's highest edge without the field, and its energy in the field there."""
    depth = np.linspace(0.0, section.thickness, 2 if section.tilted else 129)
    bare = section.edge.at(depth) - field * (start + depth)
    highest = bare.max(axis=0)
    carried = np.where(bare > highest - 1e-9, bare + field * (start + depth), -np.inf)
    return highest, carried.max(axis=0)


def _walled_limit(profile: Profile, at_most: int | None) -> Any:
    """Return a limit between two walls: the highest edge, or enough room for ``at_most``."""
    places = [np.linspace(0.0, s.thickness, 65) for s in profile.sections]
    edges = [s.edge.at(z) for s, z in zip(profile.sections, places, strict=True)]
    low = reduce(np.minimum, [e.min(axis=0) for e in edges])
    high = reduce(np.maximum, [e.max(axis=0) for e in edges])
    if at_most is None:
        if np.any(high - low < 1e-9):
            raise SolveError(
                "two walls around a flat bottom bind levels at every energy: say how far to go,"
                " below = '0.5 eV' or at_most = 6"
            )
        return high
    masses = [s.mass.at(z).min(axis=0) for s, z in zip(profile.sections, places, strict=True)]
    # The lightest flat well of this width above the highest edge has at least so many levels.
    room = H2M / reduce(np.minimum, masses)
    return high + room * (np.pi * (at_most + 1) / profile.thickness) ** 2


def _box(ends: Ends) -> Ends:
    return ("wall", "wall") if "open" in ends else ends
