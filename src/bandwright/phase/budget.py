"""The phase budget of a level: what each allowed region and each of its ends contributes.

    end_left + action + steps + end_right = n pi

An end adds 0 at a hard wall, pi/4 at a smooth turning point, arctan[(k/m_w)/(kappa/m_b)] at an
abrupt step into a long barrier, and otherwise what the solution beyond it asks for.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import H2M, HBAR
from ..profile import Profile
from ..solver.matrix import Elements
from .pieces import Piece, energy_mass
from .sections import Phases, Plan, phases

Floats = npt.NDArray[np.float64]

_STEP = 1e-6  # of the differences in energy [eV]


@dataclass(frozen=True)
class Well:
    """One allowed region at one energy.

    Parameters
    ----------
    layers : tuple of int
        Grown layers it reaches into, counted from 0.
    start_nm, stop_nm : float
        Where it begins and ends, from the first-grown outer face [nm].
    action, end_left, end_right, steps : float
        Integral of k dz, what each end adds, and what faces and pieces too brief for a phase
        of their own add inside the region [rad].
    half_waves : float
        Their sum over pi: a whole number at a level, in the region that holds its state.
    n : int
        ``half_waves`` rounded.
    round_trip_fs : float
        Classical round-trip time 2 hbar d(action)/dE [fs].
    phase_time_fs : float
        The same of the whole sum: with the time spent at ends and steps [fs]; nan where an
        end of the region jumps within a microelectronvolt.
    barrier_left, barrier_right : float
        Tunnelling exponent, the integral of kappa dz, of the barrier on each side; inf at a
        wall, or where the barrier goes on for ever.

    """

    layers: tuple[int, ...]
    start_nm: float
    stop_nm: float
    action: float
    end_left: float
    end_right: float
    steps: float
    half_waves: float
    n: int
    round_trip_fs: float
    phase_time_fs: float
    barrier_left: float
    barrier_right: float


class _Edge(NamedTuple):
    """One side of an allowed part: at a face, or at a turning point (``face`` None)."""

    face: int | None
    square: float = 0.0
    slope: float = 0.0  # (ln M)' along growth
    shift: float = 0.0


class _Part(NamedTuple):
    allowed: bool
    start: float
    stop: float
    amount: float  # action or decay
    left: _Edge
    right: _Edge


def budget(profile: Profile, energy: float, ends: tuple[str, str] | None = None) -> list[Well]:
    """Return the phase budget at one energy, well by well in growth order.

    Parameters
    ----------
    profile : Profile
    energy : float
        Energy [eV], usually a level of `levels` with the same ends.
    ends : tuple of str, optional
        ``"open"`` or ``"wall"`` for each end, instead of the profile's own.

    Raises
    ------
    SolveError
        If an end is ``"periodic"``.

    Examples
    --------
    The second level of a 10 nm box: one whole wave, nothing added by the walls.

    >>> from bandwright.profile import Polynomial, Profile, Section
    >>> from bandwright.phase.search import levels
    >>> box = Profile((Section(10.0, Polynomial((0.0,)), Polynomial((0.067,))),), ("wall", "wall"))
    >>> well = budget(box, levels(box, 0.0, 0.3)[1])[0]
    >>> well.n, round(well.action / np.pi, 6), round(well.end_left, 6)
    (2, 2.0, 0.0)
    """
    plan = Plan(profile, ends)
    energies = np.array([energy - _STEP, energy, energy + _STEP])
    elements = plan.elements(energies)
    outside = plan.outside(energies)
    lists = [None if batch is None else phases(batch, energies) for batch in plan.batches]
    found = []
    for column in range(3):
        parts = _parts(plan, lists, energies, column)
        found.append(_wells(parts, *_marches(elements, outside, column), plan.ends))
    before, here, after = found
    if len(before) == len(here) == len(after):
        here = [_timed(*wells) for wells in zip(before, here, after, strict=True)]
    faces, numbers = profile.faces, [section.layer for section in profile.sections]
    return [replace(well, layers=_layers(well, faces, numbers)) for well in here]


def _layers(well: Well, faces: Floats, numbers: list[int]) -> tuple[int, ...]:
    """Return the grown layers a well reaches into."""
    least = 1e-9 * float(faces[-1])
    inside = (faces[:-1] < well.stop_nm - least) & (faces[1:] > well.start_nm + least)
    return tuple(sorted({numbers[i] for i in np.flatnonzero(inside)}))


def _timed(before: Well, here: Well, after: Well) -> Well:
    """Fill in the two times by differences in energy."""
    rate = HBAR / _STEP  # 2 hbar over the distance of 2 steps
    turn = after.half_waves - before.half_waves
    steady = abs(turn - round(turn)) < 0.1
    return replace(
        here,
        round_trip_fs=rate * (after.action - before.action),
        phase_time_fs=rate * np.pi * (turn - round(turn)) if steady else float("nan"),
    )


def _marches(elements: Elements, outside: tuple[Floats | None, Floats | None],
             column: int) -> tuple[list[float], list[float]]:
    """Return p/u at each face marched from the left, and -p/u marched from the right."""
    left, right, off = (a[:, column] for a in elements[:3])
    first, last = (np.inf if o is None else float(o[column]) for o in outside)
    forth, back = [first], [last]
    for i in range(len(left)):
        forth.append(float(right[i] - off[i] ** 2 / _not_zero(forth[-1] + left[i])))
    for i in range(len(left) - 1, -1, -1):
        back.append(float(left[i] - off[i] ** 2 / _not_zero(back[-1] + right[i])))
    return forth, back[::-1]


def _not_zero(value: float) -> float:
    return value if value != 0.0 else 1e-300


def _parts(plan: Plan, lists: list[Phases | None], energies: Floats, column: int) -> list[_Part]:
    """List allowed and forbidden parts in growth order at one energy."""
    parts: list[_Part] = []
    position = 0.0
    for i, ((kind, row, falls), piece) in enumerate(zip(plan.rows, plan.pieces, strict=True)):
        if kind == 0:
            parts.append(_flat(piece, i, position, float(energies[column])))
        else:
            data = lists[kind - 1]
            assert data is not None
            turn = float(plan.turning(kind, energies)[row, column])
            parts += _curved(data, row, column, turn, piece, i, position, falls)
        position += piece.length
    return parts


def _flat(piece: Piece, i: int, position: float, energy: float) -> _Part:
    at = np.zeros(1)
    edge, mass, gap = (c.at(at) for c in (piece.section.edge, piece.section.mass,
                                          piece.section.inverse_gap))
    x = energy - edge
    m = float(energy_mass(x, mass, gap)[0])
    k = float(np.sqrt(m * abs(x[0]) / H2M))
    square = m / max(k, 1e-300)
    return _Part(bool(x[0] > 0), position, position + piece.length, k * piece.length,
                 _Edge(i, square), _Edge(i + 1, square))


def _curved(data: Phases, row: int, column: int, turn: float, piece: Piece, i: int,
            position: float, falls: bool) -> list[_Part]:
    def edge(high: bool) -> _Edge:
        face = data.high if high else data.low
        way = -1.0 if falls else 1.0
        shift = float(face.shift[row, column]) * (-1.0 if high else 1.0)
        return _Edge(i + (high != falls), float(face.square[row, column]),
                     way * float(face.slope[row, column]), shift)

    inner = _Edge(None)
    found = []
    low_allowed = bool(data.low.allowed[row, column])
    top = not bool(data.high.allowed[row, column])
    action, decay = float(data.action[row, column]), float(data.decay[row, column])
    if low_allowed:
        found.append((True, 0.0, turn, action, edge(False), inner if top else edge(True)))
    if turn < piece.length or not low_allowed:
        found.append((False, turn if low_allowed else 0.0, piece.length, decay,
                      inner if low_allowed else edge(False), edge(True)))
    parts = []
    for allowed, a, b, amount, low, high in found:
        start, stop = (piece.length - b, piece.length - a) if falls else (a, b)
        left, right = (high, low) if falls else (low, high)
        parts.append(_Part(allowed, position + start, position + stop, amount, left, right))
    return parts[::-1] if falls else parts


def _angle(ratio: float, edge: _Edge, way: float) -> float:
    """Return the phase since the last node where p/u = ``ratio`` along ``way`` (+1 growth)."""
    return float(np.arctan2(1.0, edge.square * (ratio - way * edge.slope))) if np.isfinite(
        ratio) else 0.0


def _near(value: float, centre: float) -> float:
    """Return ``value`` plus the multiple of pi that brings it nearest to ``centre``."""
    return value - np.pi * round((value - centre) / np.pi)


def _wells(parts: list[_Part], forth: list[float], back: list[float],
           ends: tuple[str, ...]) -> list[Well]:
    groups: list[list[_Part]] = []
    barriers = [0.0]
    for part in parts:
        if not part.allowed:
            barriers[-1] += part.amount
        elif groups and barriers[-1] == 0.0 and part.left.face is not None:
            groups[-1].append(part)
        else:
            groups.append([part])
            barriers.append(0.0)
    if groups:
        barriers[0] = np.inf if not barriers[0] or ends[0] == "open" else barriers[0]
        barriers[-1] = np.inf if not barriers[-1] or ends[1] == "open" else barriers[-1]
    return [_well(group, forth, back, barriers[j], barriers[j + 1])
            for j, group in enumerate(groups)]


def _well(group: list[_Part], forth: list[float], back: list[float], barrier_left: float,
          barrier_right: float) -> Well:
    end_left = _end(group[0].left, group[0].right, group[0], forth, 1.0)
    steps = 0.0
    for a, b in zip(group[:-1], group[1:], strict=True):
        assert b.left.face is not None
        ratio = forth[b.left.face]
        jump = _angle(ratio, b.left, 1.0) - _angle(ratio, a.right, 1.0)
        steps += jump + a.right.shift + b.left.shift
    steps += sum(_remainder(part, forth) for part in group)
    end_right = _end(group[-1].right, group[-1].left, group[-1], back, -1.0)
    action = sum(p.amount for p in group)
    half_waves = float(action + end_left + steps + end_right) / np.pi
    return Well(
        (), group[0].start, group[-1].stop,
        float(action), end_left, end_right, steps, half_waves, round(half_waves),
        float("nan"), float("nan"), float(barrier_left), float(barrier_right))


def _remainder(part: _Part, forth: list[float]) -> float:
    """Return what the phase gains across a part beyond its action and shifts, if it is brief."""
    if part.left.face is None or part.right.face is None:
        return 0.0
    gain = _angle(forth[part.right.face], part.right, 1.0) - _angle(
        forth[part.left.face], part.left, 1.0)
    beyond = _near(gain - part.amount - part.left.shift - part.right.shift, 0.0)
    return beyond if abs(beyond) > 1e-7 else 0.0  # else rounding


def _end(edge: _Edge, other: _Edge, part: _Part, march: list[float], way: float) -> float:
    """Return what the end of a well at ``edge`` adds; ``other`` is its part's far side."""
    if edge.face is not None:
        return _angle(march[edge.face], edge, way) + edge.shift
    if other.face is None:
        return np.pi / 4
    seen = _angle(march[other.face], other, way)
    return _near(seen - part.amount - other.shift, np.pi / 4)
