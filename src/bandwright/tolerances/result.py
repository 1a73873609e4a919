"""tolerance(): spreads in; sigma of each line, what it comes from, and the yield out."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from ..constants import HC
from ..errors import SolveError, StackError
from ..frames import frame
from ..gradients import LineGradient
from ..levels import Levels, solve
from ..lines import Line, Lines
from ..metrics import read_pair
from ..quantities import show
from ..stack import Stack
from .drawing import Draws, draw
from .numbers import (
    Window,
    gone_wrong,
    normal_share,
    read_sides,
    shares_of,
    sigma_length,
    whole,
)
from .spreads import Spread, read_spreads

if TYPE_CHECKING:
    import pandas as pd
    from matplotlib.axes import Axes

Floats = npt.NDArray[np.float64]

#: how many errors of the draws apart the two ways are said to disagree
APART = 3.0
#: and by how much at least: of sigma, and of the yield as it is
NOTABLE, NOTABLE_YIELD = 0.02, 0.005


@dataclass(frozen=True, eq=False, repr=False)
class Tolerance:
    """What spreads do to the lines of a stack; made by `bandwright.tolerance`.

    Attributes
    ----------
    lines : Lines
    spreads : tuple of Spread
    line : Line
        The line that shares, yield and draws are about.
    window : (float or None, float or None)
        Wavelengths [nm]; None is an open side.
    draws : Draws or None
        Wavelengths of stacks drawn at random.
    """

    lines: Lines
    spreads: tuple[Spread, ...]
    line: Line
    window: Window
    draws: Draws | None = None

    @cached_property
    def gradient(self) -> LineGradient:
        """Exact derivatives of all lines by what is spread."""
        return self.lines.gradient([spread.parameter.name for spread in self.spreads])

    @cached_property
    def shifts(self) -> Floats:
        """What one sigma of each spread does to each line [eV], (n_lines, n_spreads)."""
        sigmas = np.array([spread.sigma for spread in self.spreads])
        return np.asarray(self.gradient.energies * sigmas)

    @cached_property
    def _place(self) -> int:
        return self.gradient.pairs.index((self.line.upper, self.line.lower))

    @property
    def sigma_meV(self) -> float:
        """Standard deviation of the line's energy, to first order."""
        return float(np.linalg.norm(self.shifts[self._place])) * 1e3

    @property
    def sigma_um(self) -> float:
        """Standard deviation of the line's wavelength, to first order."""
        return sigma_length(self.line, self.sigma_meV)

    @property
    def windowed(self) -> bool:
        """Whether there is a window to yield in."""
        return self.window != (None, None)

    @property
    def linear_yield(self) -> float | None:
        """Share of wafers inside the window for normal wavelengths; None without a window."""
        return normal_share(self.line, self.sigma_um, self.window) if self.windowed else None

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a line: wavelength and energy with their sigma, and what most of it is from.

        ``most_percent`` is the share of the variance that the spread named in ``mostly`` has.
        """
        rows = self.lines.rows
        sigmas = np.linalg.norm(self.shifts, axis=1) * 1e3
        most = [int(np.argmax(np.abs(row))) for row in np.nan_to_num(self.shifts)]
        shares = [shares_of(row)[best] for row, best in zip(self.shifts, most, strict=True)]
        names = [spread.parameter.name for spread in self.spreads]
        return frame(
            {
                "upper": [line.upper for line in rows],
                "lower": [line.lower for line in rows],
                "wavelength_um": [line.wavelength_um for line in rows],
                "sigma_um": [sigma_length(line, s) for line, s in zip(rows, sigmas, strict=True)],
                "energy_meV": [line.energy_meV for line in rows],
                "sigma_meV": sigmas,
                "mostly": [names[best] if share > 0.0 else None
                           for best, share in zip(most, shares, strict=True)],
                "most_percent": [share * 100.0 for share in shares],
            },
            integers=("upper", "lower"), texts=("mostly",),
        )  # fmt: skip

    @cached_property
    def shares(self) -> pd.DataFrame:
        """One row a spread, the largest first: what one sigma of it does, its share of variance."""
        row = self.shifts[self._place]
        shares = shares_of(row)
        order = sorted(range(len(row)), key=lambda i: -round(float(np.nan_to_num(shares[i])), 9))
        rate = -HC / (self.line.energy_meV * 1e-3) ** 2 * 1e-3
        chosen = [self.spreads[i] for i in order]
        return frame(
            {
                "parameter": [spread.parameter.name for spread in chosen],
                "spread": [spread.text for spread in chosen],
                "shift_meV": [float(row[i]) * 1e3 for i in order],
                "shift_um": [float(row[i]) * rate for i in order],
                "share_percent": [shares[i] * 100.0 for i in order],
            },
            texts=("parameter", "spread"),
        )

    @cached_property
    def layers(self) -> pd.DataFrame:
        """One row a layer (or label, flux, temperature, field), the one that matters most first."""
        table = self.shares
        sums: dict[str, float] = {}
        for name, share in zip(table["parameter"], table["share_percent"], strict=True):
            head = str(name).rpartition(".")[0] or str(name)
            sums[head] = sums.get(head, 0.0) + float(share)
        order = sorted(sums, key=lambda head: -round(sums[head], 7))
        sigmas = [self.sigma_um * math.sqrt(sums[head] / 100.0) for head in order]
        columns: dict[str, Any] = {
            "layer": order, "sigma_um": sigmas, "share_percent": [sums[head] for head in order],
        }  # fmt: skip
        return frame(columns, texts=("layer",))

    @cached_property
    def estimates(self) -> pd.DataFrame:
        """Mean, sigma and yield to first order, and of the draws with one standard deviation each.

        Index ``method``: ``"linear"``, and ``"draws"`` where there are any.
        """
        rows: dict[str, list[float | None]] = {"linear": [
            self.line.wavelength_um, None, self.sigma_um, None, _percent(self.linear_yield), None
        ]}  # fmt: skip
        if self.draws is not None:
            d, band = self.draws, self.draws.inside(self.window)
            rows["draws"] = [d.mean_um, d.mean_error_um, d.sigma_um, d.sigma_error_um]
            rows["draws"] += [_percent(part if self.windowed else None) for part in band]
        names = ("mean_um", "mean_error_um", "sigma_um", "sigma_error_um", "yield_percent",
                 "yield_error_percent")  # fmt: skip
        columns: dict[str, Any] = {"method": list(rows)}
        columns |= dict(zip(names, zip(*rows.values(), strict=True), strict=True))
        if not self.windowed:
            columns = {name: column for name, column in columns.items() if "yield" not in name}
        return frame(columns, index="method", texts=("method",))

    @cached_property
    def cautions(self) -> tuple[str, ...]:
        """What a reader of these numbers should know, one sentence each."""
        return (*self._own_cautions(), *self.lines.cautions)

    def _own_cautions(self) -> list[str]:
        texts = []
        mixed = self.lines.levels.gradient([self.spreads[0].parameter.name]).mixed
        for end in (self.line.upper, self.line.lower):
            if isinstance(end, int) and mixed[end - 1]:
                texts.append(f"level {end} is too close to another for a slope of its own; sigma"
                             " is that of the mean")  # fmt: skip
        if math.isnan(self.sigma_um):
            texts.append("in a field no level is bound, so the onset has no sigma by the field")
        if self.draws is None:
            return texts
        return texts + gone_wrong(self.draws) + self._disagreement(self.draws)

    def _disagreement(self, draws: Draws) -> list[str]:
        """Return a sentence where both ways differ by more than the draws' error explains."""
        said = []
        shift, floor = draws.mean_um - self.line.wavelength_um, NOTABLE * self.sigma_um
        if abs(shift) > max(APART * draws.mean_error_um, floor):
            said.append(f"the mean moves by {shift * 1e3:+.2g} nm")
        other = draws.sigma_um - self.sigma_um
        if abs(other) > max(APART * draws.sigma_error_um, floor):
            said.append(f"sigma is {draws.sigma_um * 1e3:.4g} nm, not {self.sigma_um * 1e3:.4g} nm")
        linear, band = self.linear_yield, draws.inside(self.window)
        if linear is not None and abs(band.share - linear) > max(APART * band.error, NOTABLE_YIELD):
            said.append(f"the yield is {band.share:.1%}, not {linear:.1%}".replace("%", " %"))
        if not said:
            return []
        return [
            "linear propagation and draws disagree beyond the error of the draws, so the line is"
            f" not linear over these spreads: by the draws {'; '.join(said)}"
        ]

    def plot(
        self, ax: Axes | None = None, *, width: object = "85 mm", height: object = None
    ) -> Axes:
        """Draw the histogram of the draws; see `bandwright.yield_histogram`.

        Parameters
        ----------
        ax : Axes, optional
            Where to draw; a new figure of pyplot's if absent.
        width, height : length
            Size of a new figure.

        Raises
        ------
        SolveError
            If nothing was drawn.
        """
        from ..pictures import yield_histogram

        if self.draws is None:
            raise SolveError("there are no draws to show; ask tolerance(..., draws=2000)")
        sides = [None if side is None else f"{side!r} nm" for side in self.window]
        linear = {} if not self.sigma_um > 0.0 else {
            "mean_um": self.line.wavelength_um, "sigma_um": self.sigma_um,
        }  # fmt: skip
        return yield_histogram(
            self.draws.wavelengths_um, sides if self.windowed else None, ax, width=width,
            height=height, **linear,
        )  # fmt: skip

    def __repr__(self) -> str:
        return f"<Tolerance: {self.line.name}, {len(self.spreads)} spreads>"

    def __str__(self) -> str:
        from ..report.tolerated import tolerance_text

        return tolerance_text(self)

    def _repr_html_(self) -> str:
        from ..report.tolerated import tolerance_html

        return tolerance_html(self)


def tolerance(
    of: Stack | Levels | Lines,
    spreads: Mapping[str, object],
    *,
    line: Line | tuple[int | str, int] | None = None,
    window: Sequence[object] | None = None,
    draws: int = 0,
    seed: int = 1,
    chunk: int = 2000,
    **solve_args: Any,
) -> Tolerance:
    """Return what the spreads of a growth do to the wavelengths of a stack.

    Sigma of each line is the root of the summed squares of its exact slopes times the spreads,
    which are independent of one another. Copies of a group and layers of one label move together,
    as one parameter.

    Parameters
    ----------
    of : Stack, Levels or Lines
    spreads : mapping of str to quantity or text
        Standard deviations by parameter (`bandwright.parameters` lists them), or for each one of
        a kind: ``{"every thickness": "0.3 ML", "flux Al": "1 %", "temperature": "2 K"}``. A name
        goes before its kind; ``%`` is of the parameter's own value.
    line : (upper, lower), optional
        The line by the numbers of its levels; the strongest if absent, or the first onset where
        no line joins two levels.
    window : pair of wavelengths, optional
        What counts as yield, as ``("10 um", "10.6 um")``; None leaves a side open.
    draws : int
        Stacks drawn at random and solved, with normal spreads; none if 0. Levels are followed by
        number.
    seed : int
        Of the draws: the same seed gives the same draws.
    chunk : int
        Draws in work at a time, which bounds the memory; numbers depend on it by rounding alone.
    **solve_args
        As for `bandwright.solve`, with a stack.

    Returns
    -------
    Tolerance

    Raises
    ------
    StackError
        If there is no such line, or nothing is spread.
    UnknownName
        If the stack has no such parameter.
    QuantityError
        If a spread or the window can't be read, or the window is the wrong way round.
    SolveError
        If ``draws``, ``seed`` or ``chunk`` is no whole number in range, or the levels were found
        by the phase integral.

    Examples
    --------
    An invented well, whose thickness and barriers scatter from wafer to wafer:

    >>> import bandwright as bw
    >>> stack = bw.parse_line("20 nm Al0.3Ga0.7As, 7 nm GaAs {label well}, 20 nm Al0.3Ga0.7As",
    ...                       substrate="GaAs", temperature="77 K")
    >>> found = bw.tolerance(stack, {"well.thickness": "0.5 ML", "flux Al": "1 %"},
    ...                      window=("9 um", "9.6 um"))
    >>> print(found.shares[["parameter", "spread", "share_percent"]].round(1))
            parameter  spread  share_percent
    0  well.thickness  0.5 ML           98.9
    1         flux Al     1 %            1.1
    >>> print(f"{found.line.wavelength_um:.3f} um, sigma {found.sigma_um * 1e3:.0f} nm,"
    ...       f" yield {found.linear_yield:.0%}")
    9.315 um, sigma 193 nm, yield 88%
    """
    if isinstance(of, Stack):
        lines = solve(of, **solve_args).lines()
    elif isinstance(of, Levels | Lines):
        if solve_args:
            raise SolveError(f"{', '.join(solve_args)}: for a stack; these levels are solved")
        lines = of if isinstance(of, Lines) else of.lines()
    else:
        raise StackError(f"tolerance: got {show(of)}; give a Stack, Levels or Lines")
    count, start = whole(draws, "draws", 0), whole(seed, "seed", 0)
    size = whole(chunk, "chunk", 1)
    if count == 1:
        raise SolveError("draws: got 1, which tells no sigma; ask 0 for none, or more")
    sides = read_sides(window)
    chosen = _line(lines, line)
    found = Tolerance(lines, read_spreads(lines.levels, spreads), chosen, sides)
    if not count:
        return found
    slopes = found.gradient.energies[found._place]
    drawn = draw(lines.levels, chosen, found.spreads, np.nan_to_num(slopes), count, start, size)
    return Tolerance(lines, found.spreads, chosen, sides, drawn)


def _line(lines: Lines, line: Line | tuple[int | str, int] | None) -> Line:
    if line is not None:
        return lines.find(*read_pair(line))
    if lines.main is None:
        raise StackError("line: the stack has none that a tolerance could be of")
    return lines.main


def _percent(share: float | None) -> float | None:
    return None if share is None else share * 100.0
