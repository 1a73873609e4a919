"""The data of a design and their slopes: lines by the exact gradients, X-rays by closed forms."""

from __future__ import annotations

import warnings
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from ..constants import HC
from ..errors import BandwrightError, BandwrightWarning, StackError
from ..levels import Levels, solve
from ..lines import Lines
from ..metrics import Pair, line_between
from ..quantities import temperature_text
from ..stack import Stack
from ..xray import xray_pattern
from .factors import Factor, moved
from .measured import Measured, MeasuredLine

Floats = npt.NDArray[np.float64]

#: farthest that a coordinate may go: factors of two
_FARTHEST = np.log(2.0)
#: step of a coordinate in the closed forms; central, so that what it leaves out is of second order
_STEP = 1e-4


@dataclass(frozen=True, eq=False)
class Point:
    """A design with what would be measured of it.

    Attributes
    ----------
    model : Model
    x : array (n_factors,)
        Coordinates.
    stack : Stack
    levels : dict
        Levels by temperature [K].
    wavelengths : array (n_lines,)
        [nm]
    xrays : array (n_xrays,)
        Period [nm], mismatch [ppm], as far as they were measured.
    """

    model: Model
    x: Floats
    stack: Stack
    levels: dict[float, Levels]
    wavelengths: Floats
    xrays: Floats

    @property
    def data(self) -> Floats:
        """All that would be measured, lines first."""
        return np.concatenate((self.wavelengths, self.xrays))

    @property
    def pulls(self) -> Floats:
        """Computed less measured, in standard deviations, (n_data,)."""
        return np.asarray((self.data - self.model.values) / self.model.errors)

    @cached_property
    def slopes(self) -> Floats:
        """Slopes of the pulls by the coordinates, (n_data, n_factors); nothing is solved."""
        model, count = self.model, len(self.x)
        rows = np.zeros((len(model.values), count))
        scales = np.array([f.slope(v) for f, v in zip(model.factors, self.x, strict=True)])
        names = [factor.name for factor in model.factors]
        for kelvin, levels in self.levels.items():
            places = [i for i, at in enumerate(model.kelvins) if at == kelvin]
            found = levels.gradient(names).lines([model.pairs[i] for i in places])
            rows[places] = found.wavelengths * scales
        for place in range(count if len(self.xrays) else 0):
            step = np.zeros(count)
            step[place] = _STEP
            above, below = (model.xrays(model.stack_at(self.x + s)) for s in (step, -step))
            rows[len(model.pairs) :, place] = (above - below) / (2.0 * _STEP)
        return np.asarray(rows / model.errors[:, None])


@dataclass(eq=False)
class Model:
    """A design, the data of its wafer, the factors looked for, and the solves spent.

    Attributes
    ----------
    stack : Stack
    measured : Measured
    factors : tuple of Factor
    arguments : dict
        Of each solve.
    solves : int
    why : str
        Why the last place had no point.
    pairs : list of (upper, lower)
        Of each line; the strongest is looked up at the design.
    """

    stack: Stack
    measured: Measured
    factors: tuple[Factor, ...]
    arguments: dict[str, Any]
    solves: int = 0
    why: str = ""
    pairs: list[Pair] = field(default_factory=list)
    _known: dict[bytes, Point] = field(default_factory=dict)

    @cached_property
    def kelvins(self) -> list[float]:
        """Temperature of each line [K]."""
        own = self.stack.temperature
        return [own if at is None else at for at in (o.temperature_K for o in self.measured.lines)]

    @cached_property
    def values(self) -> Floats:
        """What was measured, (n_data,)."""
        found = [line.wavelength_nm for line in self.measured.lines]
        xrays = (self.measured.period_nm, self.measured.mismatch_ppm)
        return np.array([*found, *(v for v in xrays if v is not None)], dtype=np.float64)

    @cached_property
    def errors(self) -> Floats:
        """One standard deviation of each, (n_data,)."""
        found = [line.error_nm for line in self.measured.lines]
        xrays = (self.measured.period_error_nm, self.measured.mismatch_error_ppm)
        return np.array([*found, *(v for v in xrays if v is not None)], dtype=np.float64)

    @property
    def names(self) -> list[str]:
        """What was measured, in words."""
        lines = [
            f"{'strongest, ' if line.pair is None else ''}{pair[0]} to {pair[1]}, "
            f"{temperature_text(kelvin)}"
            for line, pair, kelvin in zip(
                self.measured.lines, self.pairs, self.kelvins, strict=True
            )
        ]
        return [*lines, *self.measured.xray_names]

    def values_at(self, x: Floats) -> list[float]:
        """Return the factors of a place."""
        return [f.value(float(v)) for f, v in zip(self.factors, x, strict=True)]

    def stack_at(self, x: Floats) -> Stack:
        """Return the stack as grown with the factors of a place."""
        return moved(self.stack, self.factors, self.values_at(x))

    def xrays(self, stack: Stack) -> Floats:
        """Return what X-rays would be measured of a stack."""
        given = self.measured
        if not given.xray_names:
            return np.zeros(0)
        pattern = xray_pattern(stack)
        relaxed, along = pattern.mean_mismatch_ppm, pattern.perpendicular_mismatch_ppm
        period = [] if given.period_nm is None else [pattern.period_nm]
        mismatch = [along if given.along_growth else relaxed]
        return np.array(period + ([] if given.mismatch_ppm is None else mismatch))

    def first(self) -> Point:
        """Return the design as a point.

        Raises
        ------
        BandwrightError
            If it can't be solved, or lacks a line that was measured.
        """
        levels: dict[float, Levels] = {}
        for number, (line, kelvin) in enumerate(
            zip(self.measured.lines, self.kelvins, strict=True), 1
        ):
            if kelvin not in levels:
                levels[kelvin] = self._solve(self.stack, kelvin)
            self.pairs.append(_pair(line, levels[kelvin], f"measured, line {number}"))
        return self._point(np.zeros(len(self.factors)), self.stack, levels)

    def at(self, x: Floats) -> Point | None:
        """Return the design of a place; None where it can't be grown, or lacks a line."""
        key = x.tobytes()
        if key in self._known:
            return self._known[key]
        if np.abs(x).max(initial=0.0) > _FARTHEST:
            self.why = "a factor beyond two"
            return None
        try:
            stack = self.stack_at(x)
            levels = {kelvin: self._solve(stack, kelvin) for kelvin in dict.fromkeys(self.kelvins)}
            return self._point(x.copy(), stack, levels)
        except BandwrightError as error:
            self.why = str(error)
            return None

    def _point(self, x: Floats, stack: Stack, levels: dict[float, Levels]) -> Point:
        lengths = [
            _wavelength(levels[kelvin], pair)
            for kelvin, pair in zip(self.kelvins, self.pairs, strict=True)
        ]
        found = Point(self, x, stack, levels, np.array(lengths), self.xrays(stack))
        self._known[x.tobytes()] = found
        return found

    def _solve(self, stack: Stack, kelvin: float) -> Levels:
        self.solves += 1
        numbers = [
            number
            for pair, at in zip(self.pairs, self.kelvins, strict=False)
            if at == kelvin
            for number in pair
            if isinstance(number, int)
        ]
        most = max(numbers) if len(self.pairs) == len(self.kelvins) else None
        with warnings.catch_warnings():
            # the wafer that is found gives its own
            warnings.simplefilter("ignore", BandwrightWarning)
            return solve(stack.replace(temperature=temperature_text(kelvin)), at_most=most,
                         **self.arguments)  # fmt: skip


def _pair(line: MeasuredLine, levels: Levels, where: str) -> Pair:
    """Return the levels of a measured line, of one row of the levels' table each.

    Raises
    ------
    StackError
        If the design has no such line.
    """
    found = Lines(levels).strongest if line.pair is None else line_between(levels, line.pair)
    starts = [group.start + 1 for group in levels.groups]
    if found is None or (isinstance(found.upper, int) and found.upper not in starts):
        what = "line between two levels" if line.pair is None else f"line {line.name}"
        count = f"{len(levels)} level{'s' if len(levels) != 1 else ''}"
        raise StackError(f"the design has no {what}: it has {_onsets(line, count)}", where)
    if not found.energy_meV > 0.0:
        raise StackError(f"line {line.name}: both levels have one energy", where)
    return found.upper, found.lower


def _onsets(line: MeasuredLine, count: str) -> str:
    bound = line.pair is not None and isinstance(line.pair[0], str)
    return f"{count}, and an onset takes an open end without a field" if bound else count


def _wavelength(levels: Levels, pair: Pair) -> float:
    """Return the wavelength of a line [nm].

    Raises
    ------
    StackError
        If there is no such line.
    """
    line = line_between(levels, pair, dipole=False)
    if line is None or (line.upper, line.lower) != pair or not line.energy_meV > 0.0:
        raise StackError(f"there is no line {pair[0]} to {pair[1]}")
    return float(HC / (line.energy_meV * 1e-3))


def scale_of(factors: Sequence[Factor], x: Floats) -> Floats:
    """Return the slopes of the factors by their coordinates."""
    return np.array([f.per_unit(float(v)) for f, v in zip(factors, x, strict=True)])
