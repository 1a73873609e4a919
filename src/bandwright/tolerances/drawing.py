"""Monte Carlo: stacks drawn at random within their spreads, solved many at a time.

Levels are followed by number. Where that may deceive (a neighbour came near, or the line went
elsewhere than its slopes say) the states are compared with those of the design.
"""

from __future__ import annotations

import math
import re
import warnings
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import HC
from ..errors import BandwrightError, BandwrightWarning
from ..following import matched
from ..levels import Levels
from ..lines import CONTINUUM, Line, continuum_edge
from ..many import Many, solve_many
from ..stack import Stack
from ..sweeps.making import Maker, maker
from .spreads import Spread

Floats = npt.NDArray[np.float64]

#: a neighbour this much nearer than in the design may have changed places with a level
NEARER = 0.5
#: a line further off its slopes than one sigma and this [eV] may be another
OFF = 0.5e-3
#: how far above the upper level is looked if the usual range leaves it out [eV]
ROOM = 0.1
#: reasons kept, of those that differ in more than a number
MOST_REASONS = 5
_NUMBER = re.compile(r"[-+]?\d+\.?\d*(?:e[-+]?\d+)?")


class Band(NamedTuple):
    """A share of draws inside a window, and its error."""

    share: float
    error: float


@dataclass(frozen=True, eq=False)
class Draws:
    """Wavelengths of stacks drawn at random, as they come for `bandwright.yield_histogram`.

    Attributes
    ----------
    wavelengths_um : array (n_draws,)
        nan of a draw that failed or has not the line.
    seed : int
    failed : int
        Draws that can't be grown or solved, such as those of a negative thickness.
    missing : int
        Draws that have not the line's levels.
    unlike : int
        Draws where a level of that number has another character than in the design; their
        wavelength is still that of the numbers.
    reasons : tuple of str
        Why draws failed: the first few that differ in more than a number.
    """

    wavelengths_um: Floats
    seed: int
    failed: int = 0
    missing: int = 0
    unlike: int = 0
    reasons: tuple[str, ...] = ()
    spreads: tuple[Spread, ...] = field(default=(), repr=False)

    def __len__(self) -> int:
        return len(self.wavelengths_um)

    @property
    def found(self) -> Floats:
        """Wavelengths of the draws that have the line [um]."""
        return self.wavelengths_um[np.isfinite(self.wavelengths_um)]

    @property
    def mean_um(self) -> float:
        """Mean wavelength; nan of fewer than two."""
        return float(self.found.mean()) if len(self.found) > 1 else math.nan

    @property
    def mean_error_um(self) -> float:
        """One standard deviation of the mean, sigma/sqrt(n)."""
        return self.sigma_um / math.sqrt(max(len(self.found), 1))

    @property
    def sigma_um(self) -> float:
        """Standard deviation of the wavelengths; nan of fewer than two."""
        return float(self.found.std(ddof=1)) if len(self.found) > 1 else math.nan

    @property
    def sigma_error_um(self) -> float:
        """One standard deviation of sigma, from the fourth moment of the draws.

        var(s^2) = (m4 - s^4 (n - 3)/(n - 1))/n; for normal draws it is s/sqrt(2(n - 1)).
        """
        count = len(self.found)
        if count < 4 or self.sigma_um == 0.0:
            return math.nan if count < 4 else 0.0
        variance = self.sigma_um**2
        fourth = float(np.mean((self.found - self.mean_um) ** 4))
        spread = (fourth - variance**2 * (count - 3) / (count - 1)) / count
        return math.sqrt(max(spread, 0.0)) / (2.0 * self.sigma_um)

    def inside(self, window: tuple[float | None, float | None]) -> Band:
        """Return the share of all draws in a window [nm], and its binomial error.

        A draw without the line is outside. The error is half of Wilson's interval of one standard
        deviation (J. Am. Stat. Assoc. 22, 209 (1927), from memory), which does not vanish where
        all draws are inside.
        """
        low, high = (None if side is None else side * 1e-3 for side in window)
        good = np.isfinite(self.wavelengths_um)
        if low is not None:
            good &= self.wavelengths_um >= low
        if high is not None:
            good &= self.wavelengths_um <= high
        total = len(good)
        share = float(good.mean())
        error = math.sqrt(share * (1.0 - share) / total + 0.25 / total**2) / (1.0 + 1.0 / total)
        return Band(share, error)

    def steps(self) -> Iterator[Floats]:
        """Yield what each draw was grown with, (n_spreads,) off the design, drawn once more."""
        for block in _steps(self.spreads, len(self), self.seed, 4096):
            yield from block


def draw(
    levels: Levels, line: Line, spreads: tuple[Spread, ...], slopes: Floats, draws: int,
    seed: int, chunk: int,
) -> Draws:  # fmt: skip
    """Return the wavelengths of stacks drawn with normal spreads.

    Numbers depend on the seed, but for rounding not on ``chunk``, the designs in work at a time.

    Parameters
    ----------
    levels : Levels
        Of the design.
    line : Line
    spreads : tuple of Spread
    slopes : array (n_spreads,)
        dE of the line [eV] per unit of each parameter, for what is expected of a draw.
    draws, seed, chunk : int
    """
    work = _Work.of(levels, line, spreads, slopes)
    lengths, failed, missing, unlike = [np.zeros(0)], 0, 0, 0
    reasons: dict[str, str] = {}
    for steps in _steps(spreads, draws, seed, chunk):
        part = work.solved(steps)
        lengths.append(part.lengths)
        failed += part.failed
        missing += int(np.isnan(part.lengths).sum()) - part.failed
        unlike += part.unlike
        reasons = part.reasons | reasons  # the first of each kind stays
    said = tuple(reasons.values())[:MOST_REASONS]
    return Draws(np.concatenate(lengths), seed, failed, missing, unlike, said, spreads)


def _steps(spreads: tuple[Spread, ...], draws: int, seed: int, chunk: int) -> Iterator[Floats]:
    """Yield normal steps off the design, (n, n_spreads), in the parameters' units."""
    generator = np.random.default_rng(seed)
    sigma = np.array([spread.sigma for spread in spreads])
    for start in range(0, draws, chunk):
        size = min(chunk, draws - start)
        yield generator.standard_normal((size, len(spreads))) * sigma


class _Part(NamedTuple):
    """Some draws: wavelengths [um], how many went wrong, and a reason of each kind."""

    lengths: Floats
    failed: int
    unlike: int
    reasons: dict[str, str]


@dataclass(frozen=True)
class _Work:
    """What is done with each draw."""

    levels: Levels
    ends: tuple[slice | None, slice]
    spreads: tuple[Spread, ...]
    slopes: Floats
    make: Maker
    arguments: dict[str, Any]

    @staticmethod
    def of(levels: Levels, line: Line, spreads: tuple[Spread, ...], slopes: Floats) -> _Work:
        """Return the work on draws of a design."""
        upper = None if line.upper == CONTINUUM else _members(levels, int(line.upper))
        lower = _members(levels, line.lower)
        names = [spread.parameter.name for spread in spreads]
        units = [spread.parameter.unit for spread in spreads]
        make = maker(levels.stack, names, units)
        top = max(end.stop for end in (upper, lower) if end is not None)
        arguments: dict[str, Any] = {
            "at_most": top + 1, "tolerance": f"{levels.tolerance!r} eV",
            "group": f"{levels.group!r} eV", "bands": levels.profile.bands,
        }  # fmt: skip
        usual = solve_many([levels.stack], **arguments)[0]
        if isinstance(usual, BandwrightError) or len(usual) < top:
            arguments["below"] = f"{float(levels.energies[top - 1]) + ROOM!r} eV"
        return _Work(levels, (upper, lower), spreads, slopes, make, arguments)

    def solved(self, steps: Floats) -> _Part:
        """Return the draws of some steps."""
        design = np.array([spread.value for spread in self.spreads])
        made = self.make([column.tolist() for column in (design + steps).T])
        places = [place for place, one in enumerate(made) if isinstance(one, Stack)]
        stacks = [one for one in made if isinstance(one, Stack)]
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", BandwrightWarning)  # said about the design already
            many = solve_many(stacks, chunk=max(len(stacks), 1), **self.arguments)
        errors = [one for one in made if isinstance(one, BandwrightError)]
        errors += many.errors.values()
        energies = np.full((len(made), self.arguments["at_most"]), np.nan)
        for place, own in zip(places, many.energies, strict=True):
            energies[place, : len(own)] = own
        photons = self._photons(energies, many, places)
        photons[~(photons > 0.0)] = np.nan
        doubtful = self._doubtful(energies, photons, steps)
        unlike = sum(
            self._is_another(many[index]) for index, place in enumerate(places) if doubtful[place]
        )
        reasons: dict[str, str] = {}
        for text in (" ".join(str(error).split()) for error in errors):
            reasons.setdefault(_NUMBER.sub("#", text), text)
        return _Part(HC / photons * 1e-3, len(errors), unlike, reasons)

    def _photons(self, energies: Floats, many: Many, places: Sequence[int]) -> Floats:
        """Return the line's photon energy in each draw [eV], nan where it is not there."""
        upper, lower = self.ends
        below = energies[:, lower].mean(axis=1)
        if upper is not None:
            return np.asarray(energies[:, upper].mean(axis=1) - below)
        edges = np.full(len(energies), np.nan)
        for place, one in zip(places, many, strict=True):
            edge = continuum_edge(one) if isinstance(one, Levels) else None
            edges[place] = np.nan if edge is None else edge
        return np.asarray(edges - below)

    def _doubtful(self, energies: Floats, photons: Floats, steps: Floats) -> npt.NDArray[np.bool_]:
        """Return whether numbers may deceive in each draw."""
        own = self.levels.energies
        design = np.full((1, energies.shape[1]), np.nan)
        design[0, : min(len(own), energies.shape[1])] = own[: energies.shape[1]]
        doubt = np.zeros(len(energies), dtype=bool)
        for end in self.ends:
            for gap in () if end is None else (_gap(end.start - 1), _gap(end.stop - 1)):
                if gap.start >= 0 and gap.stop <= energies.shape[1]:
                    apart, usual = np.diff(energies[:, gap])[:, 0], np.diff(design[:, gap])[0, 0]
                    doubt |= apart < NEARER * usual
        moved = steps @ self.slopes
        there = own[self.ends[1]].mean()
        if self.ends[0] is not None:
            sigmas = np.array([spread.sigma for spread in self.spreads])
            sigma = float(np.linalg.norm(self.slopes * sigmas))
            line = own[self.ends[0]].mean() - there
            doubt |= np.abs(photons - line - moved) > max(sigma, OFF)
        return doubt & np.isfinite(photons)

    def _is_another(self, found: Levels | BandwrightError) -> bool:
        """Return whether a level of the line has another character than its number says."""
        if isinstance(found, BandwrightError):
            return False
        try:
            partner = matched(self.levels, found)
        except BandwrightError:
            return True
        return any(
            set(partner[end].tolist()) != set(range(end.start, end.stop))
            for end in self.ends
            if end is not None
        )


def _gap(first: int) -> slice:
    """Return a level (index) and the next."""
    return slice(first, first + 2)


def _members(levels: Levels, number: int) -> slice:
    """Return the levels of the row that a level number names."""
    return next(group for group in levels.groups if group.start + 1 == number)
