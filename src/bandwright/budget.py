"""Error budget of a line: what a monolayer, a per cent, ten kelvin and a field do to it.

The shift of a row is a derivative, exact from the states, times its change. Whether the whole
change is still linear, and still the same two levels, is checked by one solution there.
"""

from __future__ import annotations

import math
import warnings
from collections.abc import Sequence
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
import numpy.typing as npt

from .constants import HC
from .errors import BandwrightError, BandwrightWarning, SolveError, StackError
from .formula import parse
from .frames import frame
from .levels import Levels, solve
from .lines import CONTINUUM, Line, Lines, continuum_edge
from .parameters import Parameter, list_parameters, shifted
from .stack import Stack

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]

#: a level that keeps less of itself (probability) over a whole change has mixed with another
SAME_LEVEL = 0.7
#: levels looked at beyond the upper one, in case others pass
PASSING = 4
#: a whole change is called linear if its shift is this near to it, relative or in eV
LINEAR, LINEAR_EV = 0.25, 0.5e-3
#: how far a level may rise in a change [eV]
ROOM = 0.1
#: the change of a layer with its own numbers, which has no monolayer [nm]
OWN_STEP = 0.1


class Change(NamedTuple):
    """A change that a grower or the lab makes.

    Attributes
    ----------
    parameter : Parameter
    amount : float
        How much, in the parameter's unit.
    what : str
        The layer, or ``"temperature"`` and the like.
    text : str
        The change in words, as ``"+1 ML"``.
    """

    parameter: Parameter
    amount: float
    what: str
    text: str


def error_budget(
    lines: Lines, line: Line | tuple[int | str, int] | None = None, *, checked: bool = True
) -> pd.DataFrame:
    """Return what small changes of the stack do to a line, the largest shift first.

    Changes: one monolayer more in each written layer (repeats, and layers of one label,
    together; +0.1 nm where a layer brings its own numbers and so no lattice), 0.01 more of each
    composition, 10 K more, 1 kV/cm more along growth (10 mV more of a bias).

    Parameters
    ----------
    lines : Lines
    line : Line or (upper, lower), optional
        The strongest line if absent, or the first onset where no line joins two levels.
    checked : bool
        Whether to solve each changed stack as well, for the remarks; False solves nothing.

    Returns
    -------
    DataFrame
        ``what``, ``change``, ``shift_meV``, ``shift_um``, ``remark`` (a crossing, copies that part,
        or a change too large to be linear) and ``sentence``, all of it in words; empty without a
        line.

    Raises
    ------
    StackError
        If there is no such line.

    Examples
    --------
    >>> import bandwright as bw
    >>> well = bw.Layer("10 nm", edge="0 meV", mass=0.067, label="well")
    >>> wall = bw.Layer("20 nm", edge="250 meV", mass=0.092, label="barrier")
    >>> budget = bw.solve(bw.Stack([wall, well, wall])).lines().error_budget((2, 1))
    >>> print(budget["sentence"][0])
    well, +0.1 nm: +0.2 um
    """
    levels = lines.levels
    if line is None:
        chosen = lines.main
    else:
        upper, lower = line[:2]
        chosen = lines.find(upper, lower)
    rows: list[tuple[Change, float, str]] = []
    if chosen is not None:
        every = [
            change
            for change in changes(levels)
            if chosen.upper != CONTINUUM or change.parameter.kind not in ("field", "bias")
        ]
        slopes = derivatives(levels, chosen, every)
        before = _Sample.of(levels) if checked else None
        for change, (up, down) in zip(every, slopes, strict=True):
            shift = float(up - down) * change.amount
            rows.append((change, shift, _checked(levels, chosen, change, shift, before)))
    # equal to 1e-7 eV keeps the stack's order, whatever the rounding
    rows.sort(key=lambda row: -round(abs(row[1]), 7) if math.isfinite(row[1]) else math.inf)
    return _table(chosen, rows)


def _table(line: Line | None, rows: Sequence[tuple[Change, float, str]]) -> pd.DataFrame:
    lengths = [_wavelength_shift(line, shift) for _, shift, _ in rows]
    sentences = [
        f"{change.what}, {change.text}: {_signed(length)} um" + (f"; {remark}" if remark else "")
        for (change, _, remark), length in zip(rows, lengths, strict=True)
    ]
    return frame(
        {
            "what": [change.what for change, _, _ in rows],
            "change": [change.text for change, _, _ in rows],
            "shift_meV": [shift * 1e3 for _, shift, _ in rows],
            "shift_um": lengths,
            "remark": [remark or None for _, _, remark in rows],
            "sentence": sentences,
        },
        texts=("what", "change", "remark", "sentence"),
    )


def _signed(value: float) -> str:
    """Return a shift with its sign and two digits.

    Examples
    --------
    >>> _signed(-0.1234), _signed(2.5e-7), _signed(float("nan"))
    ('-0.12', '0', 'unknown')
    """
    if math.isnan(value):
        return "unknown"
    return f"{value:+.2g}" if abs(value) >= 1e-6 else "0"


def _wavelength_shift(line: Line | None, shift: float) -> float:
    """Return the shift of the vacuum wavelength [um] of a shift of the energy [eV]."""
    if line is None or line.energy_meV * 1e-3 + shift <= 0.0:
        return math.nan
    return HC / (line.energy_meV * 1e-3 + shift) * 1e-3 - line.wavelength_um


def changes(levels: Levels) -> list[Change]:
    """Return the changes a budget lists, in the order of the stack."""
    stack = levels.stack
    written = {one.number: one for one in stack.written()}
    monolayers = {n: fact.monolayer for n, fact in enumerate(levels.profile.facts, start=1)}
    materials = any(one.layer.material is not None for one in written.values())
    found = []
    for parameter in list_parameters(stack):
        kind, number = parameter.kind, parameter.layer_number
        if number is None:
            found += _of_stack(parameter, materials)
            continue
        head, _, key = parameter.name.rpartition(".")
        name = written[number].name
        what = f"{head} ({name})" if head != name and not name.startswith(head) else name
        layer = written[number].layer
        if kind == "thickness":
            monolayer = monolayers[number]
            if parameter.unit == "ML":
                found.append(Change(parameter, 1.0, what, "+1 ML"))
            elif math.isnan(monolayer):
                found.append(Change(parameter, OWN_STEP, what, f"+{OWN_STEP:g} nm"))
            else:
                found.append(Change(parameter, monolayer, what, "+1 ML"))
        elif kind == "composition":
            which = key.removesuffix("_shift")
            if layer.material is not None and which not in ("x", "y"):
                which = _first_element(layer.material, key)
            found.append(Change(parameter, 0.01, what, f"+0.01 {which}"))
    return found


def _of_stack(parameter: Parameter, materials: bool) -> list[Change]:
    """Return the change of a number of the whole stack; none of one that nothing follows."""
    kind = parameter.kind
    if kind == "temperature" and materials:
        return [Change(parameter, 10.0, kind, "+10 K")]
    if kind == "field":
        return [Change(parameter, 1e-4, kind, "+1 kV/cm")]
    if kind == "bias":
        return [Change(parameter, 0.01, kind, "+10 mV")]
    return []


def _first_element(formula: str, key: str) -> str:
    """Return the element whose fraction a composition parameter is.

    Examples
    --------
    >>> _first_element("In0.53Ga0.47As", "composition")
    'In'
    """
    mixed = [site for site in parse(formula).sublattices if len(site) > 1]
    return mixed[-1 if key == "anion_composition" else 0][0][0]


def derivatives(levels: Levels, line: Line, changes: Sequence[Change]) -> Floats:
    """Return dE of the upper and of the lower level by each parameter, (n_changes, 2).

    From the states, see `bandwright.gradients`; a group of copies by its mean. In eV per unit of
    the parameter; nan where it can be moved to neither side.

    Parameters
    ----------
    levels : Levels
    line : Line
        The upper level of an onset is the lower open edge; where both edges are equal, towards
        larger values.
    changes : sequence of Change
    """
    slopes = np.full((len(changes), 2), np.nan)
    for row, change in enumerate(changes):
        try:
            gradient = levels.gradient([change.parameter.name])
        except BandwrightError:
            continue
        slopes[row] = [gradient.of_row(end)[0] for end in (line.upper, line.lower)]
    return slopes


def _moved(stack: Stack, name: str, step: float) -> Stack:
    moved = shifted(stack, name, step)
    if moved == stack:
        raise StackError(f"the step {step:g} does not move it", name)
    return moved


def _solved(levels: Levels, stack: Stack, line: Line, more: int = 0) -> Levels:
    """Return the lowest levels of another stack, up to the upper one of a line and ``more``."""
    group = _members(levels, line.lower if line.upper == CONTINUUM else int(line.upper))
    below = float(levels.energies[group].max()) + ROOM
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", BandwrightWarning)  # said about the stack itself already
        return solve(
            stack,
            below=f"{below!r} eV",
            at_most=group.stop + more,
            tolerance=f"{levels.tolerance!r} eV",
            bands=levels.profile.bands,
        )


def _members(levels: Levels, number: int) -> slice:
    """Return the levels of the row that a level number names."""
    return next(group for group in levels.groups if group.start + 1 == number)


def _ends(found: Levels, levels: Levels, line: Line) -> Floats:
    """Return (upper, lower) energy [eV] of a line in another solution, levels by number."""
    ends = []
    for number in (line.upper, line.lower):
        if number == CONTINUUM:
            edge = continuum_edge(found)
            ends.append(math.nan if edge is None else edge)
        else:
            group = _members(levels, int(number))
            if group.stop > len(found):
                raise SolveError(f"level {number} is no longer there")
            if not found.count_checked[group].all():
                raise SolveError(f"the counts do not agree around level {number}")
            ends.append(float(np.mean(found.energies[group])))
    return np.array(ends)


def _checked(
    levels: Levels, line: Line, change: Change, shift: float, before: _Sample | None
) -> str:
    """Return what must be said of a whole change beside its linear shift, '' if nothing.

    Without ``before``, the states to be followed, nothing is solved.
    """
    if not math.isfinite(shift):
        return "it can be moved to neither side"
    if before is None:
        return ""
    try:
        moved = _moved(levels.stack, change.parameter.name, change.amount)
        found = _solved(levels, moved, line, more=PASSING)
        upper, lower = _ends(found, levels, line)
    except BandwrightError as error:
        return f"only for a smaller change: {error}"
    ends = {line.upper: upper, line.lower: lower}
    said, parted = [], []
    for number in ends:
        if number == CONTINUUM:
            continue
        group = _members(levels, int(number))
        places, kept = before.followed(found, group)
        if kept < SAME_LEVEL:
            return (
                f"level {number} crosses another on the way and mixes with it (keeps {kept:.0%}):"
                " compare the changed stack itself"
            )
        if places[0] != group.start:
            said.append(f"level {number} is level {places[0] + 1} then")
        spread = float(np.ptp(found.energies[places]))
        if spread > max(levels.group, LINEAR_EV):
            parted.append(f"those of level {number} by {spread * 1e3:.2g} meV")
        ends[number] = float(np.mean(found.energies[places]))
    whole = ends[line.upper] - ends[line.lower] - line.energy_meV * 1e-3
    if abs(whole - shift) > max(LINEAR_EV, LINEAR * abs(shift)):
        shown = _signed(_wavelength_shift(line, whole))
        said.insert(0, f"not linear, the whole change gives {shown} um")
    if parted:
        said.append(f"the mean over copies that part, {' and '.join(parted)}")
    return "; ".join(said)


class _Sample(NamedTuple):
    """States of all levels of a solution at fractional depths, to compare solutions by.

    A thicker layer is compared with itself. ``share`` is the number of depths in each section,
    ``u`` (n_levels, n_depths) is weighted so that rows have their products as overlaps.
    """

    share: npt.NDArray[np.int64]
    u: Floats

    @staticmethod
    def of(levels: Levels, share: npt.NDArray[np.int64] | None = None) -> _Sample:
        """Return the states of a solution; without ``share``, at some 150 depths."""
        profile = levels.profile
        thickness = np.array([s.thickness for s in profile.sections])
        if share is None:
            share = np.maximum(6, np.rint(150.0 * thickness / thickness.sum())).astype(np.int64)
        width = np.repeat(thickness / share, share)
        inside = np.concatenate([np.arange(n) + 0.5 for n in share])
        z = np.repeat(profile.faces[:-1], share) + inside * width
        return _Sample(share, levels.states.sample(z)[0] * np.sqrt(width))

    def followed(self, found: Levels, group: slice) -> tuple[list[int], float]:
        """Return which levels of another solution a group has become, and how surely.

        The levels (indices from 0) that lie most in the group's subspace, and the least part of
        them that does, 0 to 1.
        """
        if len(found.profile.sections) != len(self.share):
            return [group.start], 0.0
        other = _Sample.of(found, self.share).u
        old = np.linalg.svd(self.u[group], full_matrices=False)[2]
        parts = np.sum((old @ other.T) ** 2, axis=0) / np.sum(other**2, axis=1)
        best = sorted(map(int, np.argsort(-parts, kind="stable")[: group.stop - group.start]))
        return best, float(parts[best].min())
