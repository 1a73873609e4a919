"""Where X-ray diffraction will find a grown stack: period, zero order, satellites.

The positions are kinematic: where Bragg's law puts them, each layer strained to the substrate.
No refraction, no dynamical shift, no intensities, no widths. Lattice constants are those of the
material files, at 300 K.
"""

from __future__ import annotations

import math
import operator
import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from .cautions.words import listed
from .errors import QuantityError, StackError, UnknownName, close_matches
from .frames import frame
from .materials import Library
from .mismatch import Film, films_of, groups_of, substrate_of
from .quantities import as_length, number_text, show
from .stack import Stack

if TYPE_CHECKING:
    import pandas as pd

#: lines of X-ray tubes [nm]: 1537.400 copper and 707.831 molybdenum x units, by definition; the
#: x units of CODATA 2018 (E. Tiesinga et al., Rev. Mod. Phys. 93, 025010, 2021)
LINES = {
    "Cu K-alpha1": 1537.400 * 1.00207697e-4,
    "Mo K-alpha1": 707.831 * 1.00209952e-4,
}
_INDICES = re.compile(r"\(?\s*(-?\d)\s*(-?\d)\s*(-?\d{1,2})\s*\)?")


@dataclass(frozen=True)
class XrayPattern:
    """The kinematic positions of a stack's reflections; `xray_pattern` makes it.

    Attributes
    ----------
    stack : Stack
    reflection : tuple of int
        h, k, l; l counts along growth.
    wavelength_nm : float
    line : str
        Name of the wavelength, or the length as given.
    substrate_nm : float
        The substrate's lattice constant [nm].
    period_nm : float
        Period of the superlattice [nm]; without a repeated group the thickness of all layers.
    times : int
        How often the period is grown; 1 without a repeated group.
    members : tuple of str
        Names of the layers of one period.
    cells : float
        Unit cells, two monolayers each, of the strained layers in one period.
    mean_mismatch : float
        Mean of (a - a_substrate)/a_substrate of the relaxed lattices over one period.
    highest_order : int
    """

    stack: Stack
    reflection: tuple[int, int, int]
    wavelength_nm: float
    line: str
    substrate_nm: float
    period_nm: float
    times: int
    members: tuple[str, ...]
    cells: float
    mean_mismatch: float
    highest_order: int = 3

    @property
    def mean_perpendicular_nm(self) -> float:
        """Mean lattice constant of the strained period along growth [nm]."""
        return self.period_nm / self.cells

    @property
    def perpendicular_mismatch_ppm(self) -> float:
        """What the zero order shows: (a_perpendicular - a_substrate)/a_substrate [1e-6]."""
        return 1e6 * (self.mean_perpendicular_nm / self.substrate_nm - 1.0)

    @property
    def mean_mismatch_ppm(self) -> float:
        """What the period would be off if it were relaxed, the mean by thickness [1e-6]."""
        return 1e6 * self.mean_mismatch

    @property
    def substrate_deg(self) -> float:
        """Bragg angle of the substrate [degrees]."""
        return self._angle(self.reflection[2] / self.substrate_nm, "the substrate")

    @property
    def zero_order_deg(self) -> float:
        """Bragg angle of the zero order [degrees]."""
        return self.angle_deg(0)

    @property
    def spacing_deg(self) -> float:
        """Distance from one satellite to the next about the zero order [degrees].

        Half of what the first orders on both sides are apart; where the upper one is beyond 90
        degrees, what the lower one is from the zero order.
        """
        below = self.angle_deg(-1)
        try:
            return 0.5 * (self.angle_deg(1) - below)
        except StackError:
            return self.zero_order_deg - below

    @property
    def substrate_tilt_deg(self) -> float:
        """Angle between the reflecting planes of the substrate and its surface [degrees]."""
        return self._tilt(self.reflection[2] / self.substrate_nm)

    def angle_deg(self, order: int) -> float:
        """Return the Bragg angle of a satellite [degrees], 0 for the zero order.

        Raises
        ------
        StackError
            If it would be beyond 90 degrees.
        """
        what = f"satellite {order:+d}" if order else "the zero order"
        return self._angle(self._along(order), what)

    def tilt_deg(self, order: int) -> float:
        """Return the angle between a satellite's reciprocal vector and the surface's normal."""
        return self._tilt(self._along(order))

    def _along(self, order: int) -> float:
        """Return the reciprocal length of a satellite along growth [1/nm]."""
        return self.reflection[2] / self.mean_perpendicular_nm + order / self.period_nm

    def _tilt(self, along: float) -> float:
        h, k, _ = self.reflection
        return math.degrees(math.atan2(math.hypot(h, k) / self.substrate_nm, along))

    def _angle(self, along: float, what: str) -> float:
        """Return the Bragg angle of a reciprocal length along growth [1/nm], in degrees."""
        h, k, _ = self.reflection
        sine = 0.5 * self.wavelength_nm * math.hypot(h / self.substrate_nm,
                                                     k / self.substrate_nm, along)  # fmt: skip
        if sine > 1.0:
            raise StackError(
                f"reflection {_named(self.reflection)}: {what} has no angle at"
                f" {self.wavelength_nm:.6g} nm, the sine would be {sine:.3f}, beyond 90 degrees;"
                " take a lower reflection or a shorter wavelength"
            )
        return math.degrees(math.asin(sine))

    @property
    def columns(self) -> dict[str, list[Any]]:
        """The columns of `table`."""
        rows: list[tuple[int, float]] = []
        for order in range(-self.highest_order, self.highest_order + 1):
            try:
                rows.append((order, self.angle_deg(order)))
            except StackError:  # those beyond 90 degrees are not there
                break
        zero = self.substrate_deg
        return {
            "order": [order for order, _ in rows],
            "bragg_angle_deg": [angle for _, angle in rows],
            "two_theta_deg": [2.0 * angle for _, angle in rows],
            "tilt_deg": [self.tilt_deg(order) for order, _ in rows],
            "from_substrate_arcsec": [3600.0 * (angle - zero) for _, angle in rows],
        }

    @property
    def table(self) -> pd.DataFrame:
        """One row a satellite, index ``order``: angles, and distance from the substrate's.

        ``tilt_deg`` is the angle of the reflecting planes to the surface, and
        ``from_substrate_arcsec`` the difference of Bragg angles, positive at the larger one.
        Orders beyond 90 degrees are left out.
        """
        return frame(self.columns, index="order")

    @property
    def cautions(self) -> tuple[str, ...]:
        """What a reader should know."""
        texts = []
        if self.times == 1:
            texts.append(
                "no group is repeated: all layers are taken as one, and the spacing is that of"
                " thickness fringes"
            )
        if sum(self.reflection) % 4 == 2 and self.reflection[0] % 2 == 0:
            texts.append(
                f"reflection {_named(self.reflection)} is weak: only the difference of both"
                " sublattices scatters"
            )
        tilt, angle = self.substrate_tilt_deg, self.substrate_deg
        if tilt > 0.0:
            texts.append(
                f"reflection {_named(self.reflection)}: its planes are tilted, by another angle in"
                " each order: turning the wafer alone shows differences of Bragg angle and tilt"
            )
        if tilt >= angle:
            texts.append(
                f"reflection {_named(self.reflection)}: its planes are tilted by {tilt:.2f}"
                f" degrees, more than the Bragg angle of {angle:.2f}: the beam would have to come"
                " or leave below the surface"
            )
        return tuple(texts)

    def __str__(self) -> str:
        from .report.strained import xray_text

        return xray_text(self)

    def _repr_html_(self) -> str:
        from .report.strained import xray_html

        return xray_html(self)


def xray_pattern(
    stack: Stack,
    reflection: str | Iterable[int] = "004",
    wavelength: object = "Cu K-alpha1",
    *,
    orders: int = 3,
) -> XrayPattern:
    """Return period, zero order and satellites that X-ray diffraction will find.

    Parameters
    ----------
    stack : Stack
        With a substrate, to which every layer is strained. The period is that of the repeated
        group that is thickest as a whole; without one all layers are taken as one.
    reflection : str or three int
        ``"004"``, ``"1 1 5"`` or ``(1, 1, 5)``; the last counts along growth.
    wavelength : length or str
        A length, ``"Cu K-alpha1"`` or ``"Mo K-alpha1"``.
    orders : int
        Satellites on each side that the table lists.

    Raises
    ------
    StackError
        If the stack has no substrate, no layer of a material, or in its period a layer without a
        lattice; if the reflection is none, is forbidden in zincblende, or lies beyond 90 degrees.
    QuantityError
        If the wavelength is no length above zero.
    UnknownName
        If there is no line of a name.

    Notes
    -----
    2 sin(theta)/wavelength = |G|, with G along growth l/a + n/L of order n, period L and mean
    strained lattice constant a along growth, and in the plane that of the substrate: Bragg's law
    for a periodic stack, V. S. Speriosu and T. Vreeland, J. Appl. Phys. 56, 1591 (1984); from
    memory. So L = wavelength/(2 (sin t1 - sin t2)) of neighbours, in a reflection 0 0 l.

    Examples
    --------
    Invented: a superlattice on GaAs.

    >>> import bandwright as bw
    >>> stack = bw.parse_line("200 nm GaAs, 20 x (8 nm In0.1Ga0.9As, 12 nm GaAs)",
    ...                       substrate="GaAs")
    >>> pattern = bw.xray_pattern(stack)
    >>> print(f"{pattern.period_nm:.1f} nm, {pattern.zero_order_deg:.4f} deg,"
    ...       f" {pattern.spacing_deg:.4f} deg, {pattern.perpendicular_mismatch_ppm:.0f} ppm")
    20.0 nm, 32.8228 deg, 0.2626 deg, 5509 ppm
    """
    indices = read_reflection(reflection)
    length, line = read_wavelength(wavelength)
    if isinstance(orders, bool) or not isinstance(orders, int) or orders < 0:
        raise StackError(f"orders: got {show(orders)}; a whole number from 0 is due")
    library = Library.with_files(stack.materials)
    substrate = substrate_of(stack, library)
    films = films_of(stack, library)
    times, members = _period(stack, films)
    bare = [films[place].name for place, _ in members if films[place].own]
    if bare:
        raise StackError(
            f"{listed(bare)}: own numbers, so no lattice for X-rays; give a material to every layer"
            f" of {'the repeated group' if times > 1 else 'the stack'}"
        )
    parts = [(films[place], count * films[place].thickness) for place, count in members]
    thickness = sum(part for _, part in parts)
    pattern = XrayPattern(
        stack, indices, length, line, substrate, thickness, times,
        tuple(films[place].name for place, _ in members),
        sum(film.cells * part for film, part in parts),
        sum(film.mismatch * part for film, part in parts) / thickness,
        orders,
    )  # fmt: skip
    _ = pattern.substrate_deg, pattern.zero_order_deg  # an error now, not when one is asked for
    return pattern


def _period(stack: Stack, films: tuple[Film, ...]) -> tuple[int, tuple[tuple[int, int], ...]]:
    """Return times and members of the thickest repeated group, or all layers as one."""
    groups = groups_of(stack, films)
    if not groups:
        return 1, tuple((place, film.copies) for place, film in enumerate(films))
    group = max(groups, key=lambda g: g.times * g.thickness)
    return group.times, group.members


def read_wavelength(given: object) -> tuple[float, str]:
    """Return a wavelength [nm] and what it is called.

    Raises
    ------
    QuantityError
        If it is no length above zero.
    UnknownName
        If it is the name of no line.

    Examples
    --------
    >>> read_wavelength("1.5406 Å"), read_wavelength("Mo K-alpha1")
    ((0.15406, '0.15406 nm'), (0.0709317105..., 'Mo K-alpha1'))
    """
    if isinstance(given, str) and given[:1].isalpha():
        if given not in LINES:
            raise UnknownName(
                f"wavelength: there is no line {given!r}{close_matches(given, LINES)}; or write a"
                " length, '0.15406 nm'"
            )
        return LINES[given], given
    length = as_length(given, "wavelength")
    if length <= 0.0:
        raise QuantityError(f"wavelength: got {show(given)}; it must be above zero")
    return length, f"{number_text(length)} nm"


def read_reflection(given: object) -> tuple[int, int, int]:
    """Return h, k, l.

    Raises
    ------
    StackError
        If it is no reflection, or one that zincblende or growth along l does not have.

    Examples
    --------
    >>> read_reflection("004"), read_reflection("1 1 5"), read_reflection((0, 0, 10))
    ((0, 0, 4), (1, 1, 5), (0, 0, 10))
    """
    try:
        if isinstance(given, str):
            found = _INDICES.fullmatch(given.strip())
            parts = [int(part) for part in found.groups()] if found else []
        else:
            parts = [operator.index(part) for part in given]  # type: ignore[attr-defined]
    except TypeError:
        parts = []
    if len(parts) != 3:
        raise StackError(
            f"reflection: got {show(given)}; write three indices, such as '004' or '1 1 5'"
        )
    h, k, along = parts
    if len({h % 2, k % 2, along % 2}) > 1:
        raise StackError(
            f"reflection: {_named((h, k, along))} is forbidden in zincblende, which has all indices"
            " odd or all even; write for example '004' or '115'"
        )
    if along < 1:
        raise StackError(
            f"reflection: {_named((h, k, along))} shows no layers; its last index, along growth,"
            " must be 1 or more"
        )
    return h, k, along


def _named(indices: tuple[int, int, int]) -> str:
    """Return indices as they are read, apart where one has more than a digit."""
    simple = all(0 <= index <= 9 for index in indices)
    return ("" if simple else " ").join(str(index) for index in indices)
