"""What rounding to whole monolayers does to one line."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

from ..constants import HC
from ..errors import GrowthError
from ..following.line import followed_pairs
from ..gradients import gradient_of
from ..levels import Levels
from ..metrics import Pair, line_between, read_pair
from ..monolayers import solved_like
from ..stack import Stack
from .steps import LAYER, Step


class Shift(NamedTuple):
    """A line before and after rounding, both solved, with the first-order estimate beside.

    Parameters
    ----------
    pair : (upper, lower)
        In the stack as designed.
    before_um, after_um : float
        Wavelengths [um], each by a solve.
    first_order_um : float
        Wavelength after rounding [um], by the exact gradient of the designed stack.
    """

    pair: Pair
    before_um: float
    after_um: float
    first_order_um: float


def shift_of(levels: Levels, grown: Stack, steps: Sequence[Step], line: object) -> Shift:
    """Return what a line of a designed stack becomes in the stack of whole monolayers.

    The line is followed by the character of its levels.

    Raises
    ------
    StackError
        If ``line`` is no line.
    GrowthError
        If the design has no such line, or it is lost in rounding.
    """
    pair = _chosen(levels, line)
    before = line_between(levels, pair, dipole=False)
    if before is None:
        raise GrowthError(f"the designed stack has no line {pair[0]} to {pair[1]}", "line")
    rounded = solved_like(levels, grown)
    followed = followed_pairs([levels, rounded], pair)[1]
    after = None if followed is None else line_between(rounded, followed, dipole=False)
    if after is None:
        raise GrowthError(f"{pair[0]} to {pair[1]} is lost when layers are rounded", "line")
    photon = HC / (1e3 * before.wavelength_um) + _first_order(levels, pair, steps)
    return Shift(pair, before.wavelength_um, after.wavelength_um, HC / photon * 1e-3)


def _chosen(levels: Levels, line: object) -> Pair:
    if line != "strongest":
        return read_pair(line)
    main = levels.lines().strongest
    if main is None:
        raise GrowthError("the designed stack has no line between two levels", "line")
    return main.upper, main.lower


def _first_order(levels: Levels, pair: Pair, steps: Sequence[Step]) -> float:
    """Return how much the photon energy changes by the rounding of every layer [eV]."""
    moves: dict[str, float] = {}
    for step in steps:
        if step.step == LAYER and step.whole_ML is not None and step.thickness_ML is not None:
            in_ml = str(step.entries["thickness"]).endswith("ML")
            change = step.whole_ML - step.thickness_ML if in_ml else step.rounding_nm or 0.0
            if change:
                moves[f"layer {step.number}.thickness"] = change
    if not moves:
        return 0.0
    names = list(moves)
    slopes = gradient_of(levels, names).lines([_row(levels, pair)]).energies[0]
    return float(sum(slope * moves[name] for slope, name in zip(slopes, names, strict=True)))


def _row(levels: Levels, pair: Pair) -> Pair:
    """Return the pair by the first level of each of its rows."""

    def first(number: int) -> int:
        return int(next(g.start + 1 for g in levels.groups if g.start < number <= g.stop))

    upper, lower = pair
    return first(upper) if isinstance(upper, int) else upper, first(lower)
