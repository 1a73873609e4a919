"""Levels: energies with their evidence, states and table, each made when asked for."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
import numpy.typing as npt

from .. import phase
from ..errors import SolveError
from ..frames import frame
from ..profile import Origin, Profile
from ..solver import Solution, lowest_edge
from ..stack import Stack
from .groups import group_levels
from .ranges import Range
from .states import AllStates

if TYPE_CHECKING:
    import pandas as pd
    from matplotlib.axes import Axes

    from ..gradients import Gradient
    from ..lines import Lines

Floats = npt.NDArray[np.float64]

#: a level that moves more than this with a wall [eV/nm] is the box's, not the structure's
OF_BOX = 1e-4


class Part(NamedTuple):
    """A solved part of the spectrum: what was asked, the levels' numbers in it, energies [eV]."""

    span: Range
    numbers: npt.NDArray[np.int64]
    energies: Floats
    solution: Solution | None


@dataclass(frozen=True, repr=False)
class Levels:
    """The levels of a stack below a limit, ascending.

    Made by `bandwright.solve`. Energies count from the stack's zero.

    Attributes
    ----------
    stack : Stack
    origin : Origin
        Whatever has the profile.
    tolerance, group : float
        As asked [eV].
    method : str
        ``"shooting"`` or ``"phase-integral"``.
    phase_order : int
    """

    stack: Stack
    origin: Origin
    parts: tuple[Part, ...]
    tolerance: float
    group: float
    method: str
    phase_order: int

    def __len__(self) -> int:
        return len(self.energies)

    @property
    def profile(self) -> Profile:
        """Edges, masses and gaps along growth."""
        return self.origin.profile

    @cached_property
    def energies(self) -> Floats:
        """Energy of every level [eV], (n_levels,)."""
        return np.concatenate([part.energies for part in self.parts])

    @cached_property
    def part_of(self) -> npt.NDArray[np.int64]:
        """Which part of the spectrum each level belongs to, (n_levels,)."""
        return np.repeat(np.arange(len(self.parts)), [len(p.energies) for p in self.parts])

    @cached_property
    def groups(self) -> tuple[slice, ...]:
        """Members of each row of the table, as ranges of level indices from 0."""
        return group_levels(self.energies, self.part_of, self.group)

    @property
    def boxed(self) -> npt.NDArray[np.bool_]:
        """Whether each level was solved between walls in place of open ends, (n_levels,)."""
        return np.array([self.parts[p].span.boxed for p in self.part_of], dtype=bool)

    @cached_property
    def phase_integral(self) -> Floats:
        """Phase-integral energy of every level, by the same number [eV], (n_levels,)."""
        if self.method == "phase-integral":
            return self.energies
        return np.concatenate([self._phase_of(part) for part in self.parts])

    def _phase_of(self, part: Part) -> Floats:
        """Phase-integral energies of one part's level numbers; nan where it has no such level."""
        if not len(part.energies):
            return np.zeros(0)
        low = lowest_edge(self.profile)
        high = part.span.high
        if "open" not in part.span.ends:  # open ends hold nothing above their edge
            high = float(part.energies[-1]) + 0.25 * (float(part.energies[-1]) - low)
        return phase.levels(self.profile, low, high, part.numbers, part.span.ends, self.phase_order)

    @property
    def phase_exact(self) -> bool:
        """Whether both methods are one matrix here, so that their agreement proves nothing."""
        return phase.exact(self.profile)

    @cached_property
    def phase_followed(self) -> npt.NDArray[np.bool_]:
        """Whether all curved stretches are too short for a phase at a level, (n_levels,).

        Both methods then follow them by slices, and their agreement is little evidence.
        """
        followed = [
            phase.followed(self.profile, part.energies, part.span.ends)
            for part in self.parts
            if len(part.energies)
        ]
        return np.concatenate(followed) if followed else np.zeros(0, dtype=bool)

    @property
    def count_checked(self) -> npt.NDArray[np.bool_]:
        """Whether the counts on halved slices agree around each level, (n_levels,)."""
        checked = [
            np.zeros(len(part.energies), dtype=bool)
            if part.solution is None
            else part.solution.count_checked
            for part in self.parts
        ]
        return np.concatenate(checked)

    @property
    def complete(self) -> bool:
        """Whether the counts prove the set complete between its bounds."""
        return all(part.solution is not None and part.solution.complete for part in self.parts)

    @property
    def bounds(self) -> tuple[float, float]:
        """Energies [eV] between which the set is complete."""
        solutions = [part.solution for part in self.parts if part.solution is not None]
        if not solutions:
            return float(self.energies.min(initial=np.inf)), self.parts[-1].span.high
        return solutions[0].low, solutions[-1].high

    @cached_property
    def states(self) -> AllStates:
        """The states of all levels; none by the phase integral alone.

        Raises
        ------
        SolveError
            If the levels were found by the phase integral, which gives energies only.
        """
        if self.method == "phase-integral":
            raise SolveError(
                "the phase integral gives energies only; states, dipoles and lines need"
                " method = 'shooting'"
            )
        solutions = [part.solution for part in self.parts if part.solution is not None]
        return AllStates(tuple(s.states for s in solutions if len(s.energies)))

    def wavefunctions(self, points: int = 400) -> tuple[Floats, Floats]:
        """Return positions z [nm] (n_points,) and psi [nm^-1/2] (n_levels, n_points).

        psi is the conduction part u; the two-band norm adds its valence-like partner.
        """
        z = np.linspace(0.0, self.profile.thickness, points)
        return z, self.states.sample(z)[0]

    def dipoles(self) -> Floats:
        """Return the matrix elements of z [nm], (n_levels, n_levels), in the two-band product."""
        return self.states.dipoles

    @cached_property
    def wall_shifts(self) -> Floats:
        """dE/dwall of each level in a closed box [eV/nm], 0 for others, (n_levels,)."""
        if self.method == "phase-integral":
            return np.full(len(self), np.nan)
        boxed = self.boxed
        return np.where(boxed, self.states.wall_shifts, 0.0) if boxed.any() else np.zeros(len(self))

    @property
    def of_box(self) -> npt.NDArray[np.bool_]:
        """Whether each level belongs to the closed box, not to the structure, (n_levels,)."""
        return np.asarray(np.abs(self.wall_shifts) > OF_BOX)

    @cached_property
    def layer_probabilities(self) -> tuple[tuple[str, ...], Floats]:
        """Names of the written layers, and each level's probability in them (n_levels, n_names).

        Copies of a repeated layer, and layers of one label, count together.
        """
        by_section = self.states.probabilities
        names: dict[str, int] = {}
        columns = [
            names.setdefault(self.profile.name(i), len(names))
            for i in range(len(self.profile.sections))
        ]
        total = np.zeros((len(self), len(names)))
        np.add.at(total.T, columns, by_section.T)
        return tuple(names), total

    def phase_budget(self, level: int) -> Any:
        """Return the phase budget of a level, well by well.

        Parameters
        ----------
        level : int
            Level number from 1.
        """
        index = self._index(level)
        ends = self.parts[self.part_of[index]].span.ends
        return phase.budget(self.profile, float(self.phase_integral[index]), ends)

    def _index(self, level: int) -> int:
        if not 1 <= level <= len(self):
            raise SolveError(f"level {level}: there are levels 1 to {len(self)} here")
        return level - 1

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a level (or group of copies), index ``level`` from 1."""
        columns: dict[str, Any] = {
            "level": [g.start + 1 for g in self.groups],
            "energy_meV": [float(np.mean(self.energies[g])) * 1e3 for g in self.groups],
        }
        if self.method == "shooting":
            phase = self.phase_integral
            columns["phase_integral_meV"] = [float(np.mean(phase[g])) * 1e3 for g in self.groups]
            columns["difference_meV"] = [
                p - e for p, e in zip(columns["phase_integral_meV"], columns["energy_meV"],
                                      strict=True)
            ]  # fmt: skip
            columns["count_checked"] = [bool(np.all(self.count_checked[g])) for g in self.groups]
            columns |= self._places()
        columns["copies"] = [g.stop - g.start for g in self.groups]
        if self.method == "shooting" and self.boxed.any():
            shifts = [float(self.wall_shifts[g].min()) * 1e3 for g in self.groups]
            columns["wall_shift_meV_per_nm"] = shifts
            columns["of_box"] = [bool(np.any(self.of_box[g])) for g in self.groups]
        return frame(columns, index="level", texts=("main_layer",), integers=("copies",))

    def _places(self) -> dict[str, Any]:
        """Columns on where each row's states are."""
        main, share, position, spread = [], [], [], []
        if len(self):
            names, by_layer = self.layer_probabilities
            first, second = self.states.positions, self.states.squares
            for g in self.groups:
                here = by_layer[g].mean(axis=0)
                first_of_equals = int(np.argmax(here > here.max() * (1.0 - 1e-3)))
                main.append(names[first_of_equals])
                share.append(float(here.max()))
                mean = float(first[g].mean())
                position.append(mean)
                spread.append(float(np.sqrt(max(second[g].mean() - mean**2, 0.0))))
        return {"main_layer": main, "probability": share, "mean_position_nm": position,
                "spread_nm": spread}  # fmt: skip

    @property
    def direction(self) -> str:
        """Which way electrons run, in words."""
        if self.profile.field == 0.0:
            return "no field"
        to = "the substrate" if self.profile.field > 0.0 else "the surface"
        return f"to {to} ({abs(self.profile.field) * 1e4:.4g} kV/cm)"

    @cached_property
    def cautions(self) -> tuple[str, ...]:
        """What a reader of these numbers should know, one sentence each."""
        from ..cautions import collect

        return collect(self)

    def lines(
        self,
        window: Sequence[object] | None = None,
        strength: float | None = None,
        of_box: bool = False,
    ) -> Lines:
        """Return the lines between these levels.

        Parameters
        ----------
        window : pair of wavelengths, optional
            Vacuum wavelengths to stay between, as ``("8 um", "12 um")``; None leaves a side open.
        strength : float, optional
            Least oscillator strength, with the free-electron mass.
        of_box : bool
            Whether to show lines of levels that belong to the closed box, not to the structure.
        """
        from ..lines import lines_of

        return lines_of(self, window, strength, of_box)

    def gradient(self, parameters: Sequence[str] | None = None) -> Gradient:
        """Return dE by parameters of the stack; see `bandwright.gradients.gradient_of`."""
        from ..gradients import gradient_of

        return gradient_of(self, parameters)

    def plot(
        self, ax: Axes | None = None, *, width: object = "85 mm", height: object = None,
        whole: bool = False,
    ) -> Axes:  # fmt: skip
        """Draw the band diagram; see `bandwright.pictures.band_diagram`.

        Parameters
        ----------
        ax : Axes, optional
            Where to draw; a new figure of pyplot's if absent.
        width, height : length
            Size of a new figure.
        whole : bool
            Whether outer layers are shown in full, not only as far as the states reach.
        """
        from ..pictures import band_diagram

        return band_diagram(self, ax, width=width, height=height, whole=whole)

    def __repr__(self) -> str:
        return f"<Levels: {len(self)} of {self.stack.name or 'a stack without a name'}>"

    def __str__(self) -> str:
        from ..report.text import levels_text

        return levels_text(self)

    def _repr_html_(self) -> str:
        from ..report.html import levels_html

        return levels_html(self)
