"""Stack -> Profile: a tuple of smooth sections, the one thing solvers and pictures read.

A section is a stretch of the structure on which the conduction edge V, the mass m and the
inverse gap are smooth functions of the depth s from the section's first-grown face. Faces of
layers, points of a table and every other kink lie between sections.

Many designs of one layout are one Profile as well: every number is then an array (n_designs,),
and depths have the designs along their last axis.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any, NamedTuple, Protocol

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
#: a float of one design, or an array (n_designs,) of many of one layout
Number = Any


def is_zero(number: Number) -> bool:
    """Return whether a number is zero in every design."""
    return number == 0.0 if isinstance(number, float) else not np.any(number)


@dataclass(frozen=True, slots=True)
class Polynomial:
    """A polynomial of the depth s [nm], coefficients in ascending powers."""

    coefficients: tuple[Number, ...]

    def at(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        depth = np.asarray(depth, dtype=float)
        value = np.zeros_like(depth)
        for coefficient in reversed(self.coefficients):
            value = value * depth + coefficient
        return value

    def value(self, depth: Number) -> Any:
        """Return the value at one depth [nm]."""
        value: Number = 0.0
        for coefficient in reversed(self.coefficients):
            value = value * depth + coefficient
        return value

    @property
    def degree(self) -> int:
        """Degree after trailing zeros are dropped; 0 for a constant."""
        degree = len(self.coefficients) - 1
        while degree > 0 and is_zero(self.coefficients[degree]):
            degree -= 1
        return degree

    def plus(self, constant: Number, slope: Number) -> Polynomial:
        """Return this polynomial with ``constant + slope * s`` added."""
        first, *rest = self.coefficients
        if is_zero(slope):
            return Polynomial((first + constant, *rest))
        second, *more = rest or [0.0]
        return Polynomial((first + constant, second + slope, *more))


@dataclass(frozen=True, slots=True)
class Sampled:
    """Any smooth function of the depth s [nm], plus ``constant + slope * s``."""

    function: Callable[[Floats], Floats]
    constant: Number = 0.0
    slope: Number = 0.0

    degree = 99  # neither flat nor linear: solvers treat it as curved

    def at(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        depth = np.asarray(depth, dtype=float)
        value = np.asarray(self.function(depth), dtype=float)
        return np.asarray(value + self.constant + self.slope * depth)

    def value(self, depth: Number) -> Any:
        """Return the value at one depth [nm]."""
        found = self.at(np.atleast_2d(depth))[0]  # the designs, if many, stand along the last axis
        return found if found.size > 1 else float(found[0])

    def plus(self, constant: Number, slope: Number) -> Sampled:
        """Return this curve with ``constant + slope * s`` added."""
        return Sampled(self.function, self.constant + constant, self.slope + slope)


Curve = Polynomial | Sampled
ZERO = Polynomial((0.0,))


@dataclass(frozen=True, slots=True)
class Section:
    """One smooth stretch: thickness [nm], edge [eV], mass [m0], inverse gap [1/eV].

    ``edge`` holds everything: the material, internal fields and the stack's field.
    ``inverse_gap`` is identically zero in the one-band model. ``layer`` counts grown layers
    from 0.
    """

    thickness: Any
    edge: Curve
    mass: Curve
    inverse_gap: Curve = ZERO
    layer: int = 0

    @property
    def flat(self) -> bool:
        """Whether edge, mass and gap are constant."""
        return self.edge.degree == 0 and self.mass.degree == 0 and self.inverse_gap.degree == 0

    @property
    def tilted(self) -> bool:
        """Whether the edge is exactly linear (or flat) with constant mass and gap."""
        return self.edge.degree <= 1 and self.mass.degree == 0 and self.inverse_gap.degree == 0


@dataclass(frozen=True, slots=True)
class LayerFacts:
    """What a written layer turned out to be, once its material was looked up.

    Attributes
    ----------
    name : str
        Label, or number and formula.
    thickness : float
        [nm], monolayers resolved.
    own : bool
        Whether the layer brings its own numbers instead of a material.
    material : str
        Formula as written; empty for own numbers.
    monolayer : float
        Thickness of one monolayer of the strained film [nm]; nan for own numbers.
    lattice : float
        Relaxed lattice constant [nm]; nan for own numbers. The face farthest off for a grade.
    mismatch : float
        In-plane strain exx on the substrate, the face farthest off; 0 without a substrate.
    direct : bool
        Whether the lowest conduction edge is the zone centre's all along the layer.
    cautions : tuple of str
        What the material data say about their own use here.
    mean_mismatch : float
        In-plane strain as ``mismatch``, its mean along the layer.
    """

    name: str
    thickness: Any
    own: bool = True
    material: str = ""
    monolayer: float = float("nan")
    lattice: float = float("nan")
    mismatch: float = 0.0
    direct: bool = True
    cautions: tuple[str, ...] = ()
    mean_mismatch: float = 0.0


def _row(section: Section) -> tuple[Number, ...]:
    """Thickness, edge, its slope, mass and inverse gap at the first face, and 1 if curved."""
    edge = section.edge
    slope: Number = 0.0
    if isinstance(edge, Polynomial) and len(edge.coefficients) > 1:
        slope = edge.coefficients[1]
    mass, gap = _first(section.mass), _first(section.inverse_gap)
    return section.thickness, _first(edge), slope, mass, gap, float(not section.tilted)


def _first(curve: Curve) -> Number:
    if isinstance(curve, Polynomial):
        return curve.coefficients[0]
    found: Number = curve.value(0.0)
    return found


class Unlike(Exception):
    """Designs of one layout differ in kind (flat here, tilted there): each goes its own way."""


class SectionNumbers(NamedTuple):
    """All sections as arrays (n_sections,): what solvers need without asking each section.

    ``edge`` and ``slope`` are those of flat and linear edges; ``mass`` and ``inverse_gap`` are
    the first face's; ``lowest`` is the lowest edge; ``flat`` says constant, ``curved`` neither
    constant nor linear. Of many designs arrays are (n_sections, n_designs), but the flags, which
    all designs share.
    """

    thickness: Floats
    edge: Floats
    slope: Floats
    mass: Floats
    inverse_gap: Floats
    lowest: Floats
    flat: npt.NDArray[np.bool_]
    curved: npt.NDArray[np.bool_]
    all_flat: bool


@dataclass(frozen=True)
class Profile:
    """Sections in growth order, the ends, and how a reader names the layers.

    Parameters
    ----------
    sections : tuple of Section
    ends : tuple of str
        ``"open"``, ``"wall"`` or ``"periodic"`` at the first-grown and the last-grown face.
    field : float
        The stack's electric field along growth [V/nm], an electron's energy slope [eV/nm];
        already part of each section's edge.
    bands : str
        ``"one-band"`` or ``"two-band"``.
    zero : str
        What energies count from, in words.
    facts : tuple of LayerFacts
        One a written layer.
    written : tuple of int
        Index into ``facts`` of each grown layer.
    designs : int, optional
        How many designs of one layout the numbers are of, each an array of this length.
    """

    sections: tuple[Section, ...]
    ends: tuple[str, str] = ("open", "open")
    field: Any = 0.0
    bands: str = "one-band"
    zero: str = "the edges' own zero"
    facts: tuple[LayerFacts, ...] = ()
    written: tuple[int, ...] = ()
    designs: int | None = None

    @cached_property
    def numbers(self) -> SectionNumbers:
        """The sections as arrays."""
        rows = [_row(section) for section in self.sections]
        if self.designs is not None:
            rows = [np.broadcast_arrays(*row, np.empty(self.designs))[:-1] for row in rows]
        h, edge, slope, mass, inverse_gap, bent = np.swapaxes(np.array(rows), 0, 1).copy()
        curved = bent > 0.0
        flat = (slope == 0.0) & ~curved
        if self.designs is not None:
            if (flat != flat[:, :1]).any():
                raise Unlike("a section is flat in some designs and tilted in others")
            flat, curved = flat[:, 0], curved[:, 0]
        lowest = edge + np.minimum(slope, 0.0) * h
        for index in np.flatnonzero(curved):
            section = self.sections[index]
            lowest[index] = section.edge.at(np.linspace(0.0, section.thickness, 65)).min(axis=0)
        return SectionNumbers(
            h, edge, slope, mass, inverse_gap, lowest, flat, curved, bool(flat.all())
        )

    @cached_property
    def faces(self) -> Floats:
        """Positions of all section faces [nm], shape (n_sections + 1,), the first is 0."""
        steps = np.cumsum(self.numbers.thickness, axis=0)
        return np.concatenate((np.zeros_like(steps[:1]), steps))

    @property
    def thickness(self) -> Any:
        """Total thickness [nm]."""
        return self.faces[-1] if self.designs else float(self.faces[-1])

    def name(self, section: int) -> str:
        """Return the name of the layer a section lies in."""
        if not self.written:
            return f"section {section + 1}"
        return self.facts[self.written[self.sections[section].layer]].name

    def sample(self, points: int = 400) -> dict[str, Floats]:
        """Return arrays along growth for tables and plots, both sides of every face included.

        Parameters
        ----------
        points : int
            About how many points; every section has at least two.

        Returns
        -------
        dict
            ``position_nm``, ``edge_eV``, ``mass`` [m0], ``gap_eV`` (inf in the one-band model),
            each of shape (n_points,).
        """
        parts: list[tuple[Floats, Floats, Floats, Floats]] = []
        for start, section in zip(self.faces, self.sections, strict=False):
            share = (
                2 if section.tilted else max(9, int(points * section.thickness / self.thickness))
            )
            depth = np.linspace(0.0, section.thickness, share)
            inverse = section.inverse_gap.at(depth)
            with np.errstate(divide="ignore"):
                gap = np.where(inverse > 0.0, 1.0 / inverse, np.inf)
            parts.append((start + depth, section.edge.at(depth), section.mass.at(depth), gap))
        names = ("position_nm", "edge_eV", "mass", "gap_eV")
        columns = zip(*parts, strict=True)
        return {n: np.concatenate(c) for n, c in zip(names, columns, strict=True)}


class Origin(Protocol):
    """Whatever has one design's profile, built by now or when first asked for."""

    @property
    def profile(self) -> Profile:
        """The profile."""
        ...


class Ready(NamedTuple):
    """An `Origin` that was built."""

    profile: Profile
