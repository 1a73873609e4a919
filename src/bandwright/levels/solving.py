"""solve(): a stack in, its levels out."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import NamedTuple

import numpy as np

from .. import phase
from ..errors import SolveError, StackError, close_matches
from ..profile import Origin, Profile, Ready
from ..profile.build import build_profile
from ..quantities import as_energy, show
from ..solver import lowest_edge, solve_profile
from ..stack import Stack
from .ranges import Range, ranges
from .result import Levels, Part

METHODS = ("shooting", "phase-integral")
#: finest tolerance [eV]
FINEST = 1e-12


def solve(
    stack: Stack,
    *,
    below: object = None,
    at_most: int | None = None,
    tolerance: object = "1e-6 eV",
    group: object = "0.01 meV",
    method: str = "shooting",
    phase_order: int = 1,
    bands: str | None = None,
) -> Levels:
    """Return the levels of a stack, each with its evidence.

    Parameters
    ----------
    stack : Stack
    below : energy, optional
        Highest energy asked, from the stack's zero. Without it, a flat stack stops at its bound
        levels, and a stack in a field at the highest edge it has without the field, carried
        along by the field.
    at_most : int, optional
        Most levels returned, from the lowest.
    tolerance : energy
        Largest error of an energy; 1e-10 eV is within reach.
    group : energy
        Levels closer than this to the first of them are one row; "0 meV" lists every one.
    method : str
        ``"shooting"``, exact; or ``"phase-integral"``, which stands alone and shoots nothing.
    phase_order : int
        1, or 2 for the next phase-integral correction in smooth sections.
    bands : str, optional
        ``"one-band"`` or ``"two-band"`` instead of the stack's own choice.

    Returns
    -------
    Levels

    Raises
    ------
    StackError, MaterialError
        If the stack can't be solved as written; the text names the layer.
    QuantityError
        If an argument is no energy.
    SolveError
        If the tolerance is not reached, or nothing bounds the energies asked.

    Examples
    --------
    >>> import bandwright as bw
    >>> stack = bw.parse_line("20 nm {edge 250 meV, mass 0.092}, 10 nm {edge 0 meV, mass 0.067},"
    ...                       " 20 nm {edge 250 meV, mass 0.092}")
    >>> [round(float(energy) * 1e3, 3) for energy in bw.solve(stack).energies]
    [30.539, 120.015, 243.967]
    """
    check_stack(stack, "stack")
    request = read_request(below, at_most, tolerance, group, method, phase_order, bands)
    profile = build_profile(stack, bands)
    spans = span_of(profile, request)
    if method == "shooting":
        parts = shoot(profile, spans, at_most, request.tolerance)
    else:
        parts = _phase_only(profile, spans, at_most, phase_order)
    levels = request.levels(stack, Ready(profile), parts)
    from ..cautions import warn

    warn(levels)
    return levels


class Request(NamedTuple):
    """What is asked of a stack, as floats [eV]."""

    below: float | None
    at_most: int | None
    tolerance: float
    group: float
    method: str
    phase_order: int
    bands: str | None

    def levels(self, stack: Stack, origin: Origin, parts: tuple[Part, ...]) -> Levels:
        """Return the result for a stack."""
        return Levels(
            stack, origin, parts, self.tolerance, self.group, self.method, self.phase_order
        )


def read_request(
    below: object, at_most: int | None, tolerance: object, group: object, method: str,
    phase_order: int, bands: str | None,
) -> Request:  # fmt: skip
    """Return the arguments of `solve` as floats, each checked."""
    tolerance_eV = _positive(as_energy(tolerance, "tolerance"), "tolerance")
    if tolerance_eV < FINEST:
        raise SolveError(
            f"tolerance: got {tolerance_eV:g} eV, finer than rounding lets anyone check; {FINEST:g}"
            " eV is the finest"
        )
    group_eV = as_energy(group, "group")
    if group_eV < 0.0:
        raise SolveError("group: got a negative energy; '0 meV' lists every level")
    limit = None if below is None else as_energy(below, "below")
    _check_choice("method", method, METHODS)
    if at_most is not None and (not isinstance(at_most, int) or at_most < 1):
        raise SolveError(f"at_most: got {at_most!r}; a whole number from 1 is due")
    if phase_order not in (1, 2):
        raise SolveError(f"phase_order: got {phase_order!r}; 1 or 2 is due")
    if bands is not None:
        _check_choice("bands", bands, ("one-band", "two-band"))
    return Request(limit, at_most, tolerance_eV, group_eV, method, phase_order, bands)


def check_stack(stack: object, name: str) -> None:
    """Raise a `StackError` if something else is given as a stack."""
    if not isinstance(stack, Stack):
        raise StackError(
            f"{name}: got {show(stack)}; a Stack is due: read_stack(path) reads one from a file,"
            " parse_line(text) from a line"
        )


def span_of(profile: Profile, request: Request) -> tuple[Range, ...]:
    """Return the parts of the spectrum that a request asks of a profile."""
    return ranges(profile, request.below, request.at_most)


def _check_choice(name: str, given: str, known: tuple[str, ...]) -> None:
    if given not in known:
        raise SolveError(f"{name}: got {given!r}{close_matches(str(given), known)}")


def _positive(value: float, name: str) -> float:
    if value <= 0.0:
        raise SolveError(
            f"{name}: got {value:g} eV; an energy above zero is due, such as '1e-6 eV'"
        )
    return value


def shoot(
    profile: Profile, spans: Sequence[Range], at_most: int | None, tolerance: float
) -> tuple[Part, ...]:
    """Return the levels of each part of the spectrum, by shooting."""

    def one(span: Range, left: int | None, found: int) -> Part:
        solution = solve_profile(
            profile, high=span.high, at_most=left, tolerance=tolerance, ends=span.ends, skip=found
        )
        return Part(span, solution.numbers, solution.energies, solution)

    return _each(spans, at_most, one)


def _phase_only(
    profile: Profile, spans: Sequence[Range], at_most: int | None, order: int
) -> tuple[Part, ...]:
    """Return the levels of each part of the spectrum, by the phase integral alone."""
    low = lowest_edge(profile)

    def one(span: Range, left: int | None, found: int) -> Part:
        high = max(span.high, low)
        first, last = phase.count(profile, [low, high], span.ends, order)
        numbers = np.arange(max(found, int(first)), int(last))[:left]
        energies = phase.levels(profile, low, high, numbers, span.ends, order)
        return Part(span, numbers, energies, None)

    return _each(spans, at_most, one)


def _each(
    spans: Sequence[Range], at_most: int | None, one: Callable[[Range, int | None, int], Part]
) -> tuple[Part, ...]:
    """Solve part after part; each is told how many levels are left, and how many were found."""
    parts: list[Part] = []
    found = 0
    for span in spans:
        if at_most is not None and found == at_most:
            break
        parts.append(one(span, None if at_most is None else at_most - found, found))
        found += len(parts[-1].energies)
    return tuple(parts)
