"""Metrics: the numbers of a solved design that comparisons and sweeps have as columns."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from .constants import HC
from .errors import StackError, UnknownName, close_matches
from .levels import Levels
from .lines import CONTINUUM, Line, Lines, continuum_edge, line_of, read_strength, read_window
from .monolayers import in_monolayers, net_strain
from .quantities import show
from .stack import Stack

Floats = npt.NDArray[np.float64]
Value = float | int | str | None
#: numbers of the upper and the lower level; the upper may be ``"continuum"``
Pair = tuple[int | str, int]
#: a number, word or None of one solved design
Metric = Callable[["Solved"], Value]


class Solved(NamedTuple):
    """What a metric is given: a stack, its levels, its lines as filtered, and a chosen one.

    Attributes
    ----------
    stack : Stack
    levels : Levels
    lines : Lines
    pair : (upper, lower) or None
        Levels of the line that was chosen; None for the strongest.
    """

    stack: Stack
    levels: Levels
    lines: Lines
    pair: Pair | None = None

    @property
    def line(self) -> Line | None:
        """The chosen line, or the strongest; None where the design has it not."""
        if self.pair is None:
            return self.lines.strongest
        line = line_between(self.levels, self.pair)
        return line if line is not None and self.lines.shows(line) else None


class Choice(NamedTuple):
    """Which line metrics are about: the filters of `Levels.lines`, and a pair of levels."""

    window: tuple[float | None, float | None] = (None, None)
    strength: float | None = None
    pair: Pair | None = None

    @property
    def filtered(self) -> bool:
        """Whether a line can be left out by its wavelength or strength."""
        return self.window != (None, None) or self.strength is not None

    def solved(self, levels: Levels) -> Solved:
        """Return what metrics of these levels are given."""
        return Solved(
            levels.stack, levels, Lines(levels, self.window, self.strength), self.pair
        )


def read_choice(
    line: object, window: Sequence[object] | None, strength: float | None
) -> Choice:
    """Return which line metrics are about, from what a user gives.

    Raises
    ------
    StackError
        If ``line`` is no pair of levels.
    QuantityError
        If ``window`` or ``strength`` can't be read.
    """
    pair = None if line is None else read_pair(line)
    return Choice(read_window(window), read_strength(strength), pair)


def read_pair(line: object) -> Pair:
    """Return the (upper, lower) of a line.

    Raises
    ------
    StackError
        If it is no pair of level numbers, the upper above the lower.

    Examples
    --------
    >>> read_pair((3, 1)), read_pair(("continuum", 1))
    ((3, 1), ('continuum', 1))
    """
    ends = tuple(line)[:3] if isinstance(line, Sequence) and not isinstance(line, str) else ()
    ends = ends[:2] if isinstance(line, Line) else ends
    whole = [end for end in ends if isinstance(end, int) and not isinstance(end, bool) and end > 0]
    if len(ends) == 2 and ends[0] == CONTINUUM and len(whole) == 1:
        return CONTINUUM, whole[0]
    if len(ends) != 2 or len(whole) != 2:
        raise StackError(
            f"line: got {show(line)}; give the numbers of its upper and lower level, such as (2, 1)"
        )
    if whole[0] <= whole[1]:
        raise StackError(
            f"line: got {show(line)}; the upper level comes first and has the larger number"
        )
    return whole[0], whole[1]


# -- one line by the numbers of its levels ----------------------------------------------------


def line_between(levels: Levels, pair: Pair, *, dipole: bool = True) -> Line | None:
    """Return the line between two levels by their numbers; None where one of them is not there.

    A number stands for its row of `Levels.table`, so copies count together; between copies of
    one row it is the line of the two levels themselves.

    Parameters
    ----------
    levels : Levels
    pair : (upper, lower)
        The upper may be ``"continuum"``.
    dipole : bool
        Whether the dipole and the oscillator strength are asked; energies cost no states.
    """
    upper, lower = pair
    low = _row(levels, lower)
    if low is None:
        return None
    if not isinstance(upper, int):
        edge = continuum_edge(levels)
        rest = None if edge is None else edge - _mean(levels, low)
        return None if rest is None or rest <= 0.0 else line_of(upper, low.start + 1, rest)
    up = _row(levels, upper)
    if up is None:
        return None
    numbers = up.start + 1, low.start + 1
    if up == low:
        up, low, numbers = slice(upper - 1, upper), slice(lower - 1, lower), (upper, lower)
    energy = _mean(levels, up) - _mean(levels, low)
    if not dipole:
        return line_of(*numbers, energy)
    squares = float(np.sum(levels.dipoles()[low, up] ** 2))
    return line_of(*numbers, energy, float(np.sqrt(squares / (low.stop - low.start))))


def _row(levels: Levels, number: int) -> slice | None:
    """Return the members of the row that a level belongs to."""
    return next((group for group in levels.groups if group.start < number <= group.stop), None)


def _mean(levels: Levels, members: slice) -> float:
    return float(np.mean(levels.energies[members]))


# -- metrics ----------------------------------------------------------------------------------


@dataclass(frozen=True)
class OfLine:
    """A number of the chosen line, or of the strongest: a field of `Line`."""

    field: str

    def __call__(self, solved: Solved) -> Value:
        """Return the number; None without the line."""
        if solved.pair is None or self.needs_states or solved.lines.strength is not None:
            return getattr(solved.line, self.field, None)
        line = line_between(solved.levels, solved.pair, dipole=False)
        shown = line is not None and solved.lines.shows(line)
        return getattr(line, self.field) if shown else None

    @property
    def needs_states(self) -> bool:
        """Whether the number follows from the states, not from energies alone."""
        return self.field in ("dipole_nm", "oscillator_strength")

    def of_energies(self, energies: Floats, choice: Choice, group: float) -> Floats | None:
        """Return the number of many designs, as `OfEnergies` does; None where it takes more."""
        if self.field not in ("energy_meV", "wavelength_um") or choice.filtered:
            return None
        if choice.pair is None or not isinstance(choice.pair[0], int) or _copies(energies, group):
            return None
        upper, lower = choice.pair[0], choice.pair[1]
        energy = _level(energies, upper) - _level(energies, lower)
        return energy * 1e3 if self.field == "energy_meV" else HC / energy * 1e-3


@dataclass(frozen=True)
class OfEnergies:
    """The energy of a level from the stack's zero, or of two levels apart [meV]."""

    upper: int
    lower: int | None = None

    def __call__(self, solved: Solved) -> float | None:
        """Return the energy; None where a level is not there."""
        energies = solved.levels.energies
        if max(self.upper, self.lower or 1) > len(energies):
            return None
        below = 0.0 if self.lower is None else energies[self.lower - 1]
        return float(energies[self.upper - 1] - below) * 1e3

    def of_energies(self, energies: Floats, choice: Choice, group: float) -> Floats:
        """Return the energies of many designs (n_designs,), nan where a level is not there.

        ``energies`` (n_designs, n_levels) are all levels in eV, nan where there are fewer.
        """
        upper = _level(energies, self.upper)
        return (upper if self.lower is None else upper - _level(energies, self.lower)) * 1e3


def _level(energies: Floats, number: int) -> Floats:
    if number > energies.shape[1]:
        return np.full(len(energies), np.nan)
    return energies[:, number - 1]


def _copies(energies: Floats, group: float) -> bool:
    """Return whether any two levels are so close that they may be one row."""
    return bool(np.any(np.diff(energies, axis=1) <= group))


@dataclass(frozen=True)
class LevelsFound:
    """The number of levels found, those of a closed box too."""

    def __call__(self, solved: Solved) -> int:
        """Return the number."""
        return len(solved.levels)

    def of_energies(self, energies: Floats, choice: Choice, group: float) -> npt.NDArray[np.int64]:
        """Return the number of each of many designs, as `OfEnergies` does."""
        return np.asarray(np.count_nonzero(~np.isnan(energies), axis=1))


def _level_count(solved: Solved) -> int:
    """Return the number of levels of the structure, copies counted, those of a box not."""
    return int(np.sum(~solved.levels.of_box))


def _largest_difference(solved: Solved) -> float | None:
    """Return the largest |phase integral - shooting| of the structure's levels [meV]."""
    levels = solved.levels
    differences = np.abs(levels.phase_integral - levels.energies)[~levels.of_box] * 1e3
    known = differences[np.isfinite(differences)]
    return float(known.max()) if len(known) else None


def _thickness(solved: Solved) -> float:
    return float(solved.levels.profile.thickness)


def _net_strain(solved: Solved) -> float | None:
    """Return the mean in-plane strain of the whole stack [%], None where it is not known."""
    strain = net_strain(solved.levels)
    return None if strain is None else strain * 100.0


def _rounded_wavelength(solved: Solved) -> float | None:
    """Return the line's wavelength with all layers of whole monolayers, solved again [um]."""
    line = solved.line
    if line is None:
        return None
    again = line_between(in_monolayers(solved.levels), (line.upper, line.lower), dipole=False)
    return None if again is None else again.wavelength_um


def _caution_count(solved: Solved) -> int:
    return len(solved.lines.cautions)


#: every metric by the name of its column; `add_metric` adds to it
METRICS: dict[str, Metric] = {
    "levels": _level_count,
    "levels_found": LevelsFound(),
    "upper": OfLine("upper"),
    "lower": OfLine("lower"),
    "wavelength_um": OfLine("wavelength_um"),
    "energy_meV": OfLine("energy_meV"),
    "wavenumber_per_cm": OfLine("wavenumber_per_cm"),
    "frequency_THz": OfLine("frequency_THz"),
    "dipole_nm": OfLine("dipole_nm"),
    "oscillator_strength": OfLine("oscillator_strength"),
    "largest_difference_meV": _largest_difference,
    "thickness_nm": _thickness,
    "net_strain_percent": _net_strain,
    "rounded_wavelength_um": _rounded_wavelength,
    "cautions": _caution_count,
}
#: metrics of counts and level numbers
WHOLE = ("levels", "levels_found", "upper", "lower", "cautions")
_ENERGIES = re.compile(r"(?:level_([1-9]\d*)|spacing_([1-9]\d*)_([1-9]\d*))_meV")


def add_metric(column: str, metric: Metric) -> None:
    """Make a metric known to `compare` and `sweep` by the name of its column.

    Parameters
    ----------
    column : str
        Name of the column, with its unit: ``"thickness_nm"``.
    metric : callable
        Takes a `Solved` (``.stack``, ``.levels``, ``.lines``, ``.line``), gives a number, a word
        or None.

    Raises
    ------
    StackError
        If the name is taken or the metric can't be called.

    Examples
    --------
    >>> add_metric("bare_levels", lambda solved: len(solved.levels))
    >>> METRICS.pop("bare_levels") is not None
    True
    """
    if column in METRICS or column in ("design", "reason") or _ENERGIES.fullmatch(column):
        raise StackError(f"metric {column!r} is taken; choose another name")
    if not callable(metric):
        raise StackError(f"metric {column!r}: got {show(metric)}; give a function of one argument")
    METRICS[column] = metric


def choose(
    metrics: Sequence[str] | Mapping[str, Metric] | None,
    default: Sequence[str],
    more: Mapping[str, Metric] = MappingProxyType({}),
    what: str = "metrics",
) -> dict[str, Metric]:
    """Return metrics by their columns.

    Parameters
    ----------
    metrics : sequence of str, or mapping of str to callable, or None
        Names that `METRICS` has, ``"level_3_meV"`` for level 3 from the stack's zero,
        ``"spacing_3_1_meV"`` for level 3 above level 1; or functions of a `Solved`.
    default : sequence of str
        What None stands for.
    more : mapping of str to callable
        Further names.
    what : str
        Begins the text of an error.

    Raises
    ------
    UnknownName
        If there is no metric of a name.

    Examples
    --------
    >>> choose(["spacing_2_1_meV"], ())
    {'spacing_2_1_meV': OfEnergies(upper=2, lower=1)}
    """
    if metrics is None:
        metrics = default
    if isinstance(metrics, Mapping):
        return dict(metrics)
    names = (metrics,) if isinstance(metrics, str) else metrics
    return {name: _named(name, more, what) for name in names}


def _named(name: str, more: Mapping[str, Metric], what: str) -> Metric:
    energies = _ENERGIES.fullmatch(str(name))
    if energies:
        numbers = [int(number) for number in energies.groups() if number]
        return OfEnergies(*numbers)
    metric = more.get(name) or METRICS.get(name)
    if metric is None:
        known = [*METRICS, *more, "level_1_meV", "spacing_2_1_meV"]
        raise UnknownName(f"{what}: there is none of the name {name!r}"
                          f"{close_matches(str(name), known)}")  # fmt: skip
    return metric
