"""Gradients of levels and of lines, as arrays in core units and as tables."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from ..constants import HC
from ..errors import UnknownName, close_matches
from ..frames import frame
from ..levels import Levels
from ..levels.ranges import open_edge
from ..parameters import Parameter
from .energies import clusters, energy_slopes, parameters_of

if TYPE_CHECKING:
    import pandas as pd

Floats = npt.NDArray[np.float64]

# The step that tables show of a parameter: its size in the parameter's unit, and its name.
_STEPS = {
    "nm": (1.0, "nm"), "ML": (1.0, "ML"), "": (0.01, "0.01"), "eV": (1e-3, "meV"),
    "m0": (0.01, "0.01_m0"), "1/eV": (1.0, "inverse_eV"), "V/nm": (1e-4, "kV_per_cm"),
    "V": (1e-3, "mV"), "K": (1.0, "K"), "nm^-2": (1.0, "inverse_nm2"),
    "nm^-3": (1.0, "inverse_nm3"),
}  # fmt: skip


@dataclass(frozen=True, eq=False, repr=False)
class Gradient:
    """dE of every level by parameters of the stack, exact to first order.

    Made by `Levels.gradient`. Energies count from the stack's zero, which may move with a
    parameter as well. Copies of a repeated layer and layers of one label move together.

    Attributes
    ----------
    levels : Levels
    parameters : tuple of Parameter
    energies : array (n_levels, n_parameters)
        [eV] per unit of the parameter.
    edges : array (n_parameters,)
        Of the lower open edge [eV] per unit; where both open edges are equal, towards larger
        values of the parameter. nan between walls.
    kinked : tuple of str
        Names of parameters whose two sides differ, as where two layers tie for the lowest edge,
        which is zero: ``energies`` holds the mean of both sides. Lines do not depend on zero.
    """

    levels: Levels
    parameters: tuple[Parameter, ...]
    energies: Floats
    edges: Floats
    kinked: tuple[str, ...]

    def __repr__(self) -> str:
        return f"<Gradient: {len(self.parameters)} parameters of {self.levels!r}>"

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the parameters."""
        return tuple(parameter.name for parameter in self.parameters)

    def of(self, name: str) -> Floats:
        """Return dE of every level by one parameter [eV] per unit, (n_levels,).

        Raises
        ------
        UnknownName
            If the gradient does not hold it.
        """
        if name not in self.names:
            raise UnknownName(f"not in this gradient{close_matches(name, self.names)}", name)
        return np.asarray(self.energies[:, self.names.index(name)])

    @cached_property
    def mixed(self) -> npt.NDArray[np.bool_]:
        """Whether a level is too close to another for a derivative of its own, (n_levels,).

        Only the sum over such a set is certain; each carries the value of its own state.
        """
        label = clusters(self.levels)
        return np.asarray(np.bincount(label, minlength=1)[label] > 1)

    @cached_property
    def groups(self) -> Floats:
        """The mean over each row of ``levels.table`` [eV] per unit, (n_rows, n_parameters)."""
        rows = [self.energies[group].mean(axis=0) for group in self.levels.groups]
        return np.array(rows).reshape(len(rows), len(self.parameters))

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a level or group of copies, index ``level``; a column a parameter, in meV.

        The step is named in the column: ``well.thickness_meV_per_nm``, ``field_meV_per_kV_per_cm``,
        ``well.composition_meV_per_0.01`` and so on. ``mixed`` says where levels too close to be
        told apart are not all in the row.
        """
        columns: dict[str, Any] = {"level": [g.start + 1 for g in self.levels.groups]}
        columns |= _columns(self.parameters, self.groups * 1e3, "meV")
        label = clusters(self.levels)
        columns["mixed"] = [
            bool(np.isin(np.delete(label, np.arange(len(label))[g]), label[g]).any())
            for g in self.levels.groups
        ]
        return frame(columns, index="level")

    def of_row(self, end: int | str) -> Floats:
        """Return the slopes of a row of ``levels.table``, or of the continuum's onset.

        Parameters
        ----------
        end : int or str
            A row's level number; text is the lower open edge. Its slope by a field is nan: a
            field leaves no level bound.
        """
        if isinstance(end, str):
            fields = [p.kind in ("field", "bias") for p in self.parameters]
            return np.where(fields, np.nan, self.edges)
        starts = [group.start + 1 for group in self.levels.groups]
        return np.asarray(self.groups[starts.index(end)])

    def lines(self, pairs: Sequence[tuple[int | str, int]]) -> LineGradient:
        """Return the gradient of lines, each by its two levels' numbers.

        Parameters
        ----------
        pairs : sequence of (upper, lower)
            Level numbers as in ``levels.table``; an upper end that is text is the lower open
            edge, the continuum's onset.
        """
        rows = {group.start + 1: index for index, group in enumerate(self.levels.groups)}
        means = [float(self.levels.energies[group].mean()) for group in self.levels.groups]
        slopes = np.zeros((len(pairs), len(self.parameters)))
        photons = np.zeros(len(pairs))
        for place, (upper, lower) in enumerate(pairs):
            low = rows[lower]
            slopes[place] = self.of_row(upper) - self.of_row(lower)
            if isinstance(upper, str):
                photons[place] = _open_edge(self.levels) - means[low]
            else:
                photons[place] = means[rows[upper]] - means[low]
        return LineGradient(tuple(pairs), self.parameters, photons, slopes)


@dataclass(frozen=True, eq=False, repr=False)
class LineGradient:
    """dE and d(wavelength) of lines by parameters of the stack, exact to first order.

    Made by `Lines.gradient`.

    Attributes
    ----------
    pairs : tuple of (upper, lower)
        As in ``lines.table``.
    parameters : tuple of Parameter
    photons : array (n_lines,)
        Photon energies [eV].
    energies : array (n_lines, n_parameters)
        [eV] per unit of the parameter; nan for an onset by a field.
    """

    pairs: tuple[tuple[int | str, int], ...]
    parameters: tuple[Parameter, ...]
    photons: Floats
    energies: Floats

    def __repr__(self) -> str:
        return f"<LineGradient: {len(self.parameters)} parameters of {len(self.pairs)} lines>"

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the parameters."""
        return tuple(parameter.name for parameter in self.parameters)

    @property
    def wavelengths(self) -> Floats:
        """d(wavelength) = -hc/E^2 dE, in vacuum [nm] per unit, (n_lines, n_parameters)."""
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.asarray(-HC / self.photons[:, None] ** 2 * self.energies)

    @cached_property
    def table(self) -> pd.DataFrame:
        """One row a line: ``upper``, ``lower``, then a column each parameter, in meV and in um."""
        columns: dict[str, Any] = {
            "upper": [upper for upper, _ in self.pairs],
            "lower": [lower for _, lower in self.pairs],
        }
        columns |= _columns(self.parameters, self.energies * 1e3, "meV")
        columns |= _columns(self.parameters, self.wavelengths * 1e-3, "um")
        return frame(columns, integers=("upper", "lower"))


def gradient_of(levels: Levels, parameters: Sequence[str] | None = None) -> Gradient:
    """Return dE of every level by parameters of its stack, from its states; nothing is solved.

    Parameters
    ----------
    levels : Levels
        Solved by shooting.
    parameters : sequence of str, optional
        Names as `bandwright.parameters` lists them, such as ``"well.thickness"`` or ``"flux Al"``
        (per unit of a factor, 1 as designed), and ``"substrate_lattice"``, the substrate's lattice
        constant. Every one of these if absent, but for donors and acceptors. Others on request:
        ``"masses"``, a factor on all masses; ``"offset_share"``, the share of the gap's steps that
        falls to the conduction band; ``"offsets"``, a factor on own edges.

    Returns
    -------
    Gradient

    Raises
    ------
    SolveError
        If the levels were found by the phase integral, which gives no states.
    UnknownName
        If a parameter is none of the stack's.
    BandwrightError
        If a parameter can't be moved to either side; the text says why.

    Notes
    -----
    The formulas stand in `bandwright.solver.sensitivity`. Bound levels keep their open ends when
    a field begins: beyond the outer faces it lifts what lies there by as much as the face.

    Examples
    --------
    >>> import bandwright as bw
    >>> well = bw.Layer("10 nm", edge="0 meV", mass=0.067, label="well")
    >>> levels = bw.solve(bw.Stack([well], ends="wall"), at_most=2)
    >>> gradient = gradient_of(levels, ["well.thickness"])
    >>> [round(float(e), 6) for e in gradient.energies[:, 0] / levels.energies]  # -2 / L
    [-0.2, -0.2]
    >>> list(gradient.table.columns)
    ['well.thickness_meV_per_nm', 'mixed']
    """
    found = parameters_of(levels, parameters)
    slopes = energy_slopes(levels, found)
    kinked = tuple(p.name for p, bent in zip(found, slopes.kinked, strict=True) if bent)
    return Gradient(levels, found, slopes.energies, slopes.edges, kinked)


def _open_edge(levels: Levels) -> float:
    edge = open_edge(levels.profile)
    return float("nan") if edge is None else edge


def _columns(parameters: Sequence[Parameter], values: Floats, unit: str) -> dict[str, Floats]:
    found = {}
    for parameter, column in zip(parameters, values.T, strict=True):
        size, name = _STEPS[parameter.unit]
        found[f"{parameter.name}_{unit}_per_{name}"] = column * size
    return found
