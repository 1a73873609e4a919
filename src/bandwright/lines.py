"""Levels -> Lines: the wavelengths a stack emits or detects, with dipoles and strengths."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, NamedTuple

import numpy as np
import numpy.typing as npt

from .constants import EV_CM, EV_PER_THZ, H2M, HC
from .errors import QuantityError, StackError
from .frames import frame
from .gradients import LineGradient
from .levels import Levels
from .levels.ranges import open_edge
from .quantities import as_length, show

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]

#: what `upper` says where a bound level's electron leaves into the open end
CONTINUUM = "continuum"
#: strengths closer than this, relative, are a tie
_TIE = 1e-6


class Line(NamedTuple):
    """One line, a row of `Lines.table`.

    Attributes
    ----------
    upper : int or str
        Number of the upper level, or ``"continuum"`` for the onset of a bound level's.
    lower : int
        Number of the lower level.
    energy_meV : float
    wavelength_um : float
        hc/E, in vacuum.
    wavenumber_per_cm : float
    frequency_THz : float
    dipole_nm : float or None
        |z| between the two; None for an onset.
    oscillator_strength : float or None
        2 m0 E |z|^2 / hbar^2, with the free-electron mass m0; None for an onset.
    """

    upper: int | str
    lower: int
    energy_meV: float
    wavelength_um: float
    wavenumber_per_cm: float
    frequency_THz: float
    dipole_nm: float | None
    oscillator_strength: float | None

    @property
    def name(self) -> str:
        """The two ends in words, as ``"2 to 1"``.

        Examples
        --------
        >>> line_of("continuum", 1, 0.12).name
        'continuum to 1'
        """
        return f"{self.upper} to {self.lower}"


def line_of(upper: int | str, lower: int, energy: float, dipole: float | None = None) -> Line:
    """Return the line of a photon energy [eV] and a dipole [nm].

    The oscillator strength is that of absorption from one electron in ``lower``, with the
    free-electron mass: f = 2 m0 E |z|^2 / hbar^2.

    Examples
    --------
    >>> line = line_of(2, 1, 0.168371714375, 1.80126548697)
    >>> print(f"{line.wavelength_um:.8f} um, f = {line.oscillator_strength:.7f}")
    7.36371895 um, f = 14.3384317
    """
    strength = None if dipole is None else energy * dipole**2 / H2M
    length = HC / energy * 1e-3 if energy else math.inf
    return Line(
        upper, lower, energy * 1e3, length, energy / EV_CM, energy / EV_PER_THZ, dipole, strength
    )


@dataclass(frozen=True, eq=False, repr=False)
class Lines:
    """The lines between the levels of a stack; made by `Levels.lines`, worked out when asked.

    Attributes
    ----------
    levels : Levels
    window : (float or None, float or None)
        Shortest and longest vacuum wavelength [nm].
    strength : float or None
        Least oscillator strength.
    of_box : bool
        Whether lines of levels that belong to the closed box are among them.

    Examples
    --------
    >>> import bandwright as bw
    >>> lines = bw.solve(bw.parse_line(
    ...     "20 nm {edge 250 meV, mass 0.092}, 10 nm {edge 0 meV, mass 0.067},"
    ...     " 20 nm {edge 250 meV, mass 0.092}")).lines()
    >>> lines.table[["upper", "lower", "energy_meV", "wavelength_um"]].round(3)
           upper  lower  energy_meV  wavelength_um
    0          2      1      89.476         13.857
    1          3      1     213.428          5.809
    2  continuum      1     219.461          5.649
    3          3      2     123.952         10.003
    4  continuum      2     129.985          9.538
    5  continuum      3       6.033        205.495
    """

    levels: Levels
    window: tuple[float | None, float | None] = (None, None)
    strength: float | None = None
    of_box: bool = False

    @cached_property
    def rows(self) -> tuple[Line, ...]:
        """Every line, those of one lower level together, its onset to the continuum last."""
        return tuple(line for line in _every(self.levels, self.of_box) if self.shows(line))

    def shows(self, line: Line) -> bool:
        """Whether a line's wavelength and strength are within what was asked."""
        shortest, longest = self.window
        length = line.wavelength_um * 1e3
        if shortest is not None and length < shortest * (1.0 - 1e-12):
            return False
        if longest is not None and length > longest * (1.0 + 1e-12):
            return False
        if self.strength is None:
            return True
        return line.oscillator_strength is not None and line.oscillator_strength >= self.strength

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a line, the columns of `Line`; `upper` may be ``"continuum"``."""
        columns = dict(zip(Line._fields, zip(*self.rows, strict=True), strict=False))
        return frame(
            {name: columns.get(name, ()) for name in Line._fields}, integers=("upper", "lower")
        )

    @cached_property
    def strongest(self) -> Line | None:
        """The line of the largest oscillator strength; None where no line joins two levels.

        Of lines equally strong (to 1e-6), the one of the lowest levels.
        """
        return next(iter(self._strongest), None)

    @cached_property
    def _strongest(self) -> tuple[Line, ...]:
        joining = [line for line in self.rows if line.oscillator_strength is not None]
        most = max((line.oscillator_strength or 0.0 for line in joining), default=0.0)
        return tuple(
            line for line in joining if (line.oscillator_strength or 0.0) >= most * (1.0 - _TIE)
        )

    @property
    def main(self) -> Line | None:
        """The strongest line, or the first onset to the continuum where no line joins levels."""
        return self.strongest or next(iter(self.rows), None)

    def find(self, upper: int | str, lower: int) -> Line:
        """Return the line between two levels, by their numbers.

        Raises
        ------
        StackError
            If there is no such line here; the text names those there are.
        """
        for line in self.rows:
            if (line.upper, line.lower) == (upper, lower):
                return line
        names = [line.name for line in self.rows]
        known = ", ".join(names[:12]) + (", ..." if len(names) > 12 else "")
        raise StackError(f"there is no line {upper} to {lower} here; lines are {known or 'none'}")

    def error_budget(
        self, line: Line | tuple[int | str, int] | None = None, *, checked: bool = False
    ) -> pd.DataFrame:
        """Return what small changes of the stack do to a line, the largest first.

        See `bandwright.budget.error_budget`.

        Parameters
        ----------
        line : Line or (upper, lower), optional
            The strongest line if absent.
        checked : bool
            Whether to solve each changed stack as well, for more remarks; otherwise nothing is
            solved.
        """
        from .budget import error_budget

        return error_budget(self, line, checked=checked)

    def gradient(self, parameters: Sequence[str] | None = None) -> LineGradient:
        """Return dE and d(wavelength) of each line by parameters of the stack, exactly.

        See `bandwright.gradients.gradient_of`.

        Parameters
        ----------
        parameters : sequence of str, optional
            Names as ``"well.thickness"``; every one if absent.
        """
        pairs = [(line.upper, line.lower) for line in self.rows]
        return self.levels.gradient(parameters).lines(pairs)

    @cached_property
    def cautions(self) -> tuple[str, ...]:
        """What a reader of these lines should know, one sentence each."""
        return (*self.levels.cautions, *self._own_cautions())

    def _own_cautions(self) -> list[str]:
        texts = []
        tied = self._strongest
        if len(tied) > 1:
            others = " and ".join(line.name for line in tied[1:])
            texts.append(
                f"lines {tied[0].name} and {others} are equally strong"
                f" (oscillator strength {tied[0].oscillator_strength:.4g}); {tied[0].name} is"
                " called the strongest: ask error_budget(line=(upper, lower)) for another"
            )
        left_out = int(np.sum(self.levels.of_box))
        if left_out and not self.of_box:
            texts.append(
                f"lines of the {left_out} level{'s' if left_out > 1 else ''} that belong to the"
                " closed box are left out; lines(of_box=True) shows them, in the shell --of-box"
            )
        return texts

    def __repr__(self) -> str:
        return f"<Lines: {len(self.rows)} of {self.levels!r}>"

    def __str__(self) -> str:
        from .report.text import lines_text

        return lines_text(self)

    def _repr_html_(self) -> str:
        from .report.html import lines_html

        return lines_html(self)


def lines_of(
    levels: Levels,
    window: Sequence[object] | None = None,
    strength: float | None = None,
    of_box: bool = False,
) -> Lines:
    """Return the lines between levels.

    Every pair of rows of ``levels.table`` is a line, copies counted together; every bound level
    has its onset to the continuum besides, where an end is open and there is no field.

    Parameters
    ----------
    levels : Levels
        Solved by shooting.
    window : pair of wavelengths, optional
        Vacuum wavelengths to stay between, as ``("8 um", "12 um")``; None leaves a side open.
    strength : float, optional
        Least oscillator strength; an onset has none and is left out with it.
    of_box : bool
        Whether to show lines of levels that belong to the closed box, not to the structure.

    Raises
    ------
    QuantityError
        If ``window`` is no pair of wavelengths, or ``strength`` no number from 0.
    SolveError
        If the levels were found by the phase integral, which gives energies only.

    Examples
    --------
    >>> import bandwright as bw
    >>> levels = bw.solve(bw.parse_line(
    ...     "20 nm {edge 250 meV, mass 0.092}, 10 nm {edge 0 meV, mass 0.067},"
    ...     " 20 nm {edge 250 meV, mass 0.092}"))
    >>> [line.name for line in levels.lines(window=("8 um", "12 um"), strength=0.5).rows]
    ['3 to 2']
    """
    lines = Lines(levels, read_window(window), read_strength(strength), bool(of_box))
    if levels.method == "phase-integral":
        _ = levels.states  # raises here, not first where the lines are read
    return lines


def read_window(window: Sequence[object] | None) -> tuple[float | None, float | None]:
    """Return the shortest and longest wavelength [nm] of a pair; None is an open side."""
    if window is None:
        return None, None
    if isinstance(window, str) or not isinstance(window, Sequence) or len(window) != 2:
        raise QuantityError(
            f"window: got {show(window)}; write two wavelengths, such as ('8 um', '12 um')"
        )
    lengths = [None if side is None else as_length(side, "window") for side in window]
    for given, length in zip(window, lengths, strict=True):
        if length is not None and length <= 0.0:
            raise QuantityError(f"window: got {show(given)}; a wavelength is above zero")
    first, last = lengths
    if first is not None and last is not None and first > last:
        first, last = last, first
    return first, last


def read_strength(strength: object) -> float | None:
    """Return a least oscillator strength; None for none."""
    if strength is None:
        return None
    try:
        value = float(strength)  # type: ignore[arg-type]  # what has no float raises, below
    except (TypeError, ValueError):
        value = math.nan
    if not (math.isfinite(value) and value >= 0.0) or isinstance(strength, bool):
        raise QuantityError(f"strength: got {show(strength)}; write a number from 0, such as 0.5")
    return value


def _every(levels: Levels, of_box: bool) -> list[Line]:
    """Return every line, unfiltered."""
    if not len(levels.energies):
        return []
    starts = [group.start for group in levels.groups]
    copies = np.diff([*starts, len(levels.energies)])
    squares = np.add.reduceat(
        np.add.reduceat(levels.dipoles() ** 2, starts, axis=0), starts, axis=1
    )
    energies = np.add.reduceat(levels.energies, starts) / copies
    box = np.logical_or.reduceat(levels.of_box, starts)
    edge = continuum_edge(levels)
    lines = []
    kept = [i for i in range(len(starts)) if of_box or not box[i]]
    for place, low in enumerate(kept):
        for up in kept[place + 1 :]:
            dipole = math.sqrt(squares[low, up] / copies[low])
            energy = float(energies[up] - energies[low])
            lines.append(line_of(starts[up] + 1, starts[low] + 1, energy, dipole))
        if edge is not None and energies[low] < edge:
            lines.append(line_of(CONTINUUM, starts[low] + 1, float(edge - energies[low])))
    return lines


def continuum_edge(levels: Levels) -> float | None:
    """Return the energy [eV] above which an electron can leave a structure without a field.

    None between walls, and in a field, where no level is bound.
    """
    if levels.profile.field != 0.0:
        return None
    edge: float | None = open_edge(levels.profile)
    return edge
