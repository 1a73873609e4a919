"""A design solved, and how far it is off: deviations with their exact slopes.

The free parameters are scaled to 0..1 between their bounds. A target's deviation is the logarithm
of its energy over the energy asked, so that wavelengths and energies weigh alike, and a deviation
of 0.01 is one percent. What a limit still leaves is relative too, and negative where it is broken.
"""

from __future__ import annotations

import warnings
from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
import numpy.typing as npt

from ..errors import BandwrightError, BandwrightWarning
from ..following import matched
from ..levels import Levels, solve
from ..levels.ranges import open_edge
from ..lines import line_of
from ..metrics import Pair
from ..parameters import replace
from ..profile.build import build_profile
from ..stack import Stack
from .asking import FACTORS, Free, Limit, Wishes, name_of

Floats = npt.NDArray[np.float64]

#: levels more than asked about, so that characters may change places
_MORE = 3
#: spacings below this [eV] are no line
_SMALLEST = 1e-9
#: a step of the scaled parameters in thickness, which is linear in nearly all of them
_STEP = 1e-4


@dataclass(frozen=True, eq=False)
class Point:
    """A solved design.

    Attributes
    ----------
    problem : Problem
    x : array (n_free,)
        Scaled parameters.
    levels : Levels
    places : dict
        Index among the levels of each level number asked about.
    """

    problem: Problem
    x: Floats
    levels: Levels
    places: dict[int, int]

    def energy(self, pair: Pair) -> float:
        """Return the energy of a line [eV]."""
        upper, lower = pair
        low = float(self.levels.energies[self.places[lower]])
        if isinstance(upper, int):
            return float(self.levels.energies[self.places[upper]]) - low
        edge = open_edge(self.levels.profile)
        return float("nan") if edge is None or self.levels.profile.field else float(edge) - low

    @cached_property
    def _gradient(self) -> Any:
        return self.levels.gradient(self.problem.wishes.names)

    def slope(self, pair: Pair) -> Floats:
        """Return the slopes of a line's energy by the scaled parameters [eV], (n_free,)."""
        upper, lower = pair
        rows = self._gradient.energies
        low = rows[self.places[lower]]
        up = rows[self.places[upper]] if isinstance(upper, int) else self._gradient.of_row(upper)
        return np.asarray(self.problem.per_unit(self.x) * (up - low))

    @cached_property
    def deviations(self) -> Floats:
        """Deviation of each target times its weight, (n_targets,)."""
        wishes = self.problem.wishes
        energies = [self.energy(target.pair) / target.energy for target in wishes.targets]
        return np.asarray(self.problem.weights * np.log(energies))

    @cached_property
    def deviation_slopes(self) -> Floats:
        """Slopes of the deviations, (n_targets, n_free)."""
        rows = [self.slope(t.pair) / self.energy(t.pair) for t in self.problem.wishes.targets]
        shape = len(rows), len(self.x)
        return self.problem.weights[:, None] * np.array(rows).reshape(shape)

    @cached_property
    def rests(self) -> Floats:
        """What each end of each limit still leaves, relative, (n_ends,)."""
        return np.array([sign * (self._limited(one) / end - 1.0)
                         for one, sign, end in self.problem.ends])  # fmt: skip

    @cached_property
    def rest_slopes(self) -> Floats:
        """Slopes of `rests`, (n_ends, n_free)."""
        rows = [
            sign / end * (self.thickness_slopes if one.pair is None else self.slope(one.pair))
            for one, sign, end in self.problem.ends
        ]
        return np.array(rows).reshape(len(rows), len(self.x))

    def _limited(self, limit: Limit) -> float:
        return self.thickness if limit.pair is None else self.energy(limit.pair)

    @property
    def thickness(self) -> float:
        """Total thickness [nm]."""
        return float(self.levels.profile.thickness)

    @cached_property
    def thickness_slopes(self) -> Floats:
        """Slopes of the total thickness [nm], (n_free,)."""
        slopes = np.zeros(len(self.x))
        for place, value in enumerate(self.x):
            step = _STEP if value + _STEP <= 1.0 else -_STEP
            x = self.x.copy()
            x[place] += step
            there = build_profile(self.problem.stack_at(x)).thickness
            slopes[place] = (float(there) - self.thickness) / step
        return slopes

    @cached_property
    def quantity(self) -> float:
        """What is maximised; nan where nothing is."""
        wished = self.problem.wishes.quantity
        if wished is None:
            return float("nan")
        ends = [self.places[number] for number in wished.pair if isinstance(number, int)]
        dipole = abs(float(self.levels.dipoles()[ends[0], ends[1]]))
        if wished.column == "dipole_nm":
            return dipole
        energy = float(self.levels.energies[ends[0]] - self.levels.energies[ends[1]])
        return line_of(*wished.pair, energy, dipole).oscillator_strength or 0.0

    @property
    def broken(self) -> float:
        """By how much limits are broken, relative, in all."""
        return float(-np.minimum(self.rests, 0.0).sum())


@dataclass(eq=False)
class Problem:
    """Wishes, and the solves spent on them.

    Attributes
    ----------
    wishes : Wishes
    arguments : dict
        Of each solve.
    follow : bool
        Whether levels keep their character.
    solves : int
    why : str
        Why the last place had no point.
    edges : dict
        Why a search went no further, by the scaled place where it ended.
    """

    wishes: Wishes
    arguments: dict[str, Any]
    follow: bool
    solves: int = 0
    why: str = ""
    edges: dict[bytes, str] = field(default_factory=dict)
    _known: dict[bytes, Point] = field(default_factory=dict)
    _solved: dict[Stack, Levels] = field(default_factory=dict)

    @cached_property
    def weights(self) -> Floats:
        """Weights of the targets, the largest 1."""
        given = np.array([target.weight for target in self.wishes.targets])
        return np.asarray(given / given.max() if len(given) else given)

    @cached_property
    def ends(self) -> list[tuple[Limit, float, float]]:
        """Each end of each limit: the limit, 1 for a least and -1 for a most, the end itself."""
        return [
            (one, sign, end)
            for one in self.wishes.limits
            for sign, end in ((1.0, one.least), (-1.0, one.most))
            if end is not None
        ]

    @cached_property
    def numbers(self) -> tuple[int, ...]:
        """Level numbers asked about."""
        return tuple(sorted({n for pair in self.wishes.pairs for n in pair if isinstance(n, int)}))

    @cached_property
    def start(self) -> Floats:
        """The stack's own values, within the bounds."""
        own = [(one.start - one.least) / one.width for one in self.wishes.free]
        return np.asarray(np.clip(np.array(own), 0.0, 1.0))

    def values(self, x: Floats) -> list[float]:
        """Return the parameters of a scaled place."""
        return [_value(one, share) for one, share in zip(self.wishes.free, x, strict=True)]

    def per_unit(self, x: Floats) -> Floats:
        """Return what a scaled step is in units of the gradient there."""
        found: list[float] = [one.width for one in self.wishes.free]
        for place, one in enumerate(self.wishes.free):
            if one.parameter.kind in FACTORS:  # the gradient's factor begins there anew
                found[place] /= _value(one, x[place])
        return np.array(found)

    def stack_at(self, x: Floats) -> Stack:
        """Return the design of a scaled place."""
        return design(self.wishes, self.values(x))

    def at(self, x: Floats, near: Point | None = None) -> Point | None:
        """Return a design solved; None where it lacks a level, or can't be solved.

        ``near`` is the design whose levels are followed by character.
        """
        key = x.tobytes()
        if key in self._known:
            return self._known[key]
        try:
            levels = self.solve(self.stack_at(x))
            places = self._places(levels, near)
        except BandwrightError as error:
            self.why = str(error)
            return None
        if places is None:
            return None
        point = Point(self, x.copy(), levels, places)
        for pair in self.wishes.pairs:
            if not point.energy(pair) > _SMALLEST:
                self.why = f"there is no line {name_of(pair)}"
                return None
        self._known[key] = point
        return point

    def solve(self, stack: Stack) -> Levels:
        """Return the levels of a design, counted; those of the last one are kept."""
        if stack in self._solved:
            return self._solved[stack]
        self.solves += 1
        with warnings.catch_warnings():
            # the design that is found gives its own
            warnings.simplefilter("ignore", BandwrightWarning)
            levels = solve(stack, **self.arguments)
        self._solved = {stack: levels}
        return levels

    def _places(self, levels: Levels, near: Point | None) -> dict[int, int] | None:
        """Return where the levels asked about are; None where one is missing."""
        if self.follow and near is not None:
            partner = matched(near.levels, levels)
            found = {number: int(partner[place]) for number, place in near.places.items()}
            if min(found.values()) < 0:
                self.why = "a level is lost on the way: a step of half its character"
                return None
            return found
        missing = [number for number in self.numbers if number > len(levels.energies)]
        if missing:
            has = f"{len(levels)} level{'s' if len(levels) != 1 else ''}"
            pair = next(p for p in self.wishes.pairs if missing[0] in p)
            self.why = f"there is no line {name_of(pair)}: the stack has {has}"
            return None
        return {number: number - 1 for number in self.numbers}

    def placed(self, levels: Levels, near: Point) -> Point | None:
        """Return a design beside the scaled ones, such as a rounded one, as a point."""
        places = self._places(levels, near)
        return None if places is None else Point(self, near.x, levels, places)


def design(wishes: Wishes, values: Sequence[float]) -> Stack:
    """Return the stack with its free parameters set."""
    stack = wishes.stack
    for one, value in zip(wishes.free, values, strict=True):
        stack = replace(stack, one.name, value)
    return stack


def _value(one: Free, share: float) -> float:
    if share in (0.0, 1.0):
        return one.least if share == 0.0 else one.most
    return one.least + float(share) * one.width


def at_most(wishes: Wishes, follow: bool) -> int:
    """Return how many levels are asked of each design."""
    most = max(number for pair in wishes.pairs for number in pair if isinstance(number, int))
    return most + (_MORE if follow else 0)
