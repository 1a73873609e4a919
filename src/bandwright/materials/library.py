"""Material file + composition + temperature + substrate -> edge, mass, gap, lattice."""

from __future__ import annotations

import math
from collections.abc import Iterable
from copy import copy
from functools import lru_cache
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np

from .. import formula, strain
from ..errors import BandwrightError, MaterialError, UnknownName, close_matches
from ..formula import Composition, Value
from .entries import Route
from .files import Catalogue, Entries, read_file
from .listing import Row, Shown, direct_text, facts, route_text
from .mixing import Mix

#: a composition with gaps closer than this at Gamma and at X or L is called direct [eV]
_EVEN = 1e-9
_CACHED = 4096


class BandPoint(NamedTuple):
    """What a layer needs to know of its material; floats, or arrays along a graded layer.

    Parameters
    ----------
    edge : float or array
        Conduction edge, strained [eV], on the absolute scale of the files' valence offsets.
    mass : float or array
        Mass at the edge [m0].
    gap : float or array
        Gap, strained [eV].
    lattice : float or array
        Relaxed lattice constant [nm].
    monolayer : float or array
        Thickness of one monolayer of the strained film [nm].
    exx, trace : float or array
        Strain in the plane and trace of the strain; 0 without a substrate.
    direct : bool or array of bool
        Whether the lowest conduction edge is the one at Gamma, strain left out.
    x_edge, l_edge : float, array or None
        The edges at X and L [eV], not shifted by strain; None where no source gives them.
    cautions : tuple of str
        What a reader should know of these numbers.
    """

    edge: Value
    mass: Value
    gap: Value
    lattice: Value
    monolayer: Value
    exx: Value
    trace: Value
    direct: Any
    x_edge: Value | None
    l_edge: Value | None
    cautions: tuple[str, ...]


class Library:
    """All materials a stack can name: those shipped, and those of a user's own files.

    Use `Library.shipped` or `Library.with_files`; both are cached for the process.

    Examples
    --------
    >>> point = Library.shipped().properties(formula.parse("Al0.3Ga0.7As"), 300.0)
    >>> print(f"gap {point.gap:.4f} eV, mass {point.mass:.5f} m0")
    gap 1.8408 eV, mass 0.08733 m0
    """

    def __init__(self, own: Iterable[Entries] = ()) -> None:
        self.catalogue = Catalogue(own)
        self._points: dict[object, BandPoint] = {}
        self._lattices: dict[str, float] = {}
        self._every_lattice: float | None = None

    @staticmethod
    def shipped() -> Library:
        """Return the library of the shipped files."""
        return _library(())

    @staticmethod
    def with_files(paths: Iterable[str | Path]) -> Library:
        """Return the library with own files over the shipped ones; a later file over an earlier.

        Parameters
        ----------
        paths : iterable of str or Path
            Material files (TOML).

        Raises
        ------
        MaterialError
            If a file can't be read, or an entry is refused.
        """
        return _library(tuple((str(path), _stamp(path)) for path in paths))

    def on_lattice(self, lattice_nm: float) -> Library:
        """Return the same library with one lattice constant for whatever substrate is named.

        Parameters
        ----------
        lattice_nm : float
            Lattice constant of every substrate [nm].

        Examples
        --------
        >>> free = Library.shipped()
        >>> held = free.on_lattice(0.5660).properties(formula.parse("GaAs"), 300.0, "GaAs")
        >>> print(f"exx {held.exx:.6f}")
        exx 0.001194
        """
        view = copy(self)
        view._points = {}
        view._every_lattice = float(lattice_nm)
        return view

    def names(self) -> tuple[str, ...]:
        """Return the names of all binaries, then the patterns of all alloys."""
        binaries, alloys = self.catalogue.names()
        return binaries + alloys

    def origin(self, name: str) -> str:
        """Return the files that say something about a binary or an alloy, the last one first.

        Raises
        ------
        UnknownName
            If no file has it.

        Examples
        --------
        >>> Library.shipped().origin("GaAs")
        'shipped'
        """
        found = self.catalogue.origins(name)
        if not found:
            raise UnknownName(f"no material file has {name!r}{close_matches(name, self.names())}")
        return " over ".join(reversed(found))

    def lattice(self, composition: str | Composition) -> float:
        """Return the relaxed lattice constant [nm] of a formula.

        Examples
        --------
        >>> round(Library.shipped().lattice("GaAs"), 6)
        0.565325
        """
        return float(self._mix(composition).value("lattice"))

    def stiffness(self, composition: str | Composition) -> tuple[Value, Value]:
        """Return C11 and C12 [GPa]; arrays of fractions give arrays.

        Examples
        --------
        >>> Library.shipped().stiffness("GaAs")
        (122.1, 56.6)
        """
        mix = self._mix(composition)
        return mix.value("c11"), mix.value("c12")

    def properties(
        self, composition: Composition, temperature_K: float, substrate: str | None = None
    ) -> BandPoint:
        """Return edge, mass, gap and lattice of a composition.

        Parameters
        ----------
        composition : Composition
            From `bandwright.formula.parse`; arrays of fractions give arrays.
        temperature_K : float
            Temperature [K].
        substrate : str, optional
            Formula of the substrate, to which the layer is strained; None leaves it relaxed.

        Raises
        ------
        MaterialError
            If a needed number is missing, or the temperature or the gap is impossible.
        UnknownName
            If no file has the material, one of its binaries, or the substrate.
        """
        if composition.graded:
            return self._point(composition, temperature_K, substrate)
        key = (composition, temperature_K, substrate)
        if key not in self._points:
            if len(self._points) >= _CACHED:
                self._points.clear()
            self._points[key] = self._point(composition, temperature_K, substrate)
        return self._points[key]

    def listing(self) -> tuple[Row, ...]:
        """Return one row for each binary and each alloy, numbers at 300 K without strain."""
        binaries, alloys = self.catalogue.names()
        rows = [self._row(name, "binary", {}) for name in binaries]
        x = np.linspace(0.0, 1.0, 201)
        return (*rows, *(self._row(pattern, "alloy", {"x": x}) for pattern in alloys))

    def _row(self, name: str, kind: str, fractions: dict[str, Value]) -> Row:
        origin = self.origin(name)
        try:
            point = self.properties(formula.parse(name, **fractions), 300.0)
        except BandwrightError as error:
            return Row(name, kind, None, None, None, "", origin, str(error))
        if kind == "alloy":
            direct = direct_text(np.asarray(fractions["x"]), point.direct)
            return Row(name, kind, None, None, None, direct, origin, "")
        gap, mass, lattice = float(point.gap), float(point.mass), float(point.lattice)
        return Row(name, kind, gap, mass, lattice, "yes" if point.direct else "no", origin, "")

    def show(self, composition: str, temperature_K: float, substrate: str | None = None) -> Shown:
        """Return one formula's numbers, and every number of the files they rest on.

        Parameters
        ----------
        composition : str
            A formula without letters.
        temperature_K : float
            Temperature [K].
        substrate : str, optional
            Formula of the substrate.

        Raises
        ------
        MaterialError, UnknownName
            As `properties`.

        Examples
        --------
        >>> shown = Library.shipped().show("Al0.3Ga0.7As", 77.0, "GaAs")
        >>> shown.facts[0].name, shown.facts[0].quantity, shown.facts[0].value
        ('AlAs', 'lattice', '0.56611 nm at 300 K')
        """
        parsed = formula.parse(composition)
        point = self.properties(parsed, temperature_K, substrate)
        mix = Mix(parsed, self.catalogue)
        route = route_text(self._route(mix))
        return Shown(composition, temperature_K, substrate, point, route, tuple(facts(mix)))

    def _mix(self, composition: str | Composition) -> Mix:
        if isinstance(composition, str):
            composition = formula.parse(composition)
        return Mix(composition, self.catalogue)

    def _substrate_lattice(self, substrate: str) -> float:
        if self._every_lattice is not None:
            return self._every_lattice
        if substrate not in self._lattices:
            try:
                self._lattices[substrate] = self.lattice(substrate)
            except BandwrightError as error:
                raise error.at("substrate") from None
        return self._lattices[substrate]

    def _point(self, composition: Composition, t: float, substrate: str | None) -> BandPoint:
        if not (math.isfinite(t) and t >= 0.0):
            raise MaterialError(f"temperature is {t:g} K; it must be 0 K or more")
        mix = self._mix(composition)
        lattice = mix.value("lattice")
        zero = 0.0 * lattice
        exx, tr, shift, gap_shift, monolayer = zero, zero, zero, zero, 0.5 * lattice
        if substrate is not None:
            exx = strain.in_plane(lattice, self._substrate_lattice(substrate))
            ezz = strain.along_growth(exx, mix.value("c11"), mix.value("c12"))
            tr = strain.trace(exx, ezz)
            a_c = mix.value("a_c")
            shift = strain.edge_shift(a_c, tr)
            gap_shift = strain.gap_shift(a_c, mix.value("a_v"), tr)
            monolayer = strain.monolayer(lattice, ezz)
        gap = mix.value("gap", t)
        strained_gap = gap + gap_shift
        if np.any(np.asarray(strained_gap) <= 0.0):
            least = float(np.min(np.asarray(strained_gap)))
            raise MaterialError(
                f"{mix.name} at {t:g} K has a gap of {least:.4f} eV"
                + (f" on {substrate}" if substrate else "")
                + "; this model needs one above 0"
            )
        mass = mix.value("mass")
        if mix.follows_gap:
            mass = mass * strained_gap / mix.gap_of_mass()
        unstrained = self._unstrained_edge(mix, t)
        x_edge, l_edge = (
            mix.value(q, t) + (unstrained - gap) if mix.has(q) else None for q in ("gap_x", "gap_l")
        )
        sides = [(n, e) for n, e in (("X", x_edge), ("L", l_edge)) if e is not None]
        strained = bool(np.any(np.abs(exx) > 1e-6))
        direct, cautions = _direct(mix, unstrained, sides, strained)
        return BandPoint(
            unstrained + shift,
            mass,
            strained_gap,
            lattice,
            monolayer,
            exx,
            tr,
            direct,
            x_edge,
            l_edge,
            (*cautions, *mix.cautions(t, strained)),
        )

    def _unstrained_edge(self, mix: Mix, t: float, seen: tuple[str, ...] = ()) -> Value:
        """Return the conduction edge without strain [eV], by the route the file names."""
        if mix.name in seen:
            raise MaterialError(
                f"the conduction edge of {mix.name} counts from itself: "
                + " from ".join((*seen, mix.name))
            )
        seen = (*seen, mix.name)
        route = self._route(mix)
        gap = mix.value("gap", t)
        if route is not None and route.partner is not None:
            partner = self._mix(route.partner)
            base = self._unstrained_edge(partner, t, seen)
            if route.kind == "step":
                return base + mix.value("step")
            return base + mix.value("share") * (gap - partner.value("gap", t))
        if len(mix.parts) == 1:
            return mix.value("valence_offset") + gap
        if all(binary.route and not binary.route.partner for binary, _ in mix.parts):
            return mix.value("valence_offset") + gap
        valence: Value = 0.0
        for binary, weight in mix.parts:  # binaries by different routes: mix their valence edges
            alone = self._mix(binary.name)
            edge = self._unstrained_edge(alone, t, seen)
            valence = valence + weight * (edge - alone.value("gap", t))
        return valence - mix.bowing("valence_offset") + gap

    def _route(self, mix: Mix) -> Route | None:
        if mix.ternary is not None:
            return mix.ternary.alloy.route
        binary = mix.parts[0][0]
        if len(mix.parts) == 1:
            if binary.route is None:
                raise MaterialError(
                    f"the file of {binary.name} has no 'conduction_edge'; name one of the routes "
                    "'valence offset', 'share', 'step'"
                )
            return binary.route
        return None


def _direct(
    mix: Mix, edge: Value, sides: list[tuple[str, Value]], strained: bool
) -> tuple[Any, tuple[str, ...]]:
    """Return whether Gamma is lowest, and a caution where it is not or nobody knows."""
    law = mix.ternary.alloy.direct if mix.ternary else None
    if not sides and mix.ternary is not None and law is not None:
        share = np.asarray(mix.ternary.x(law.first))
        inside = (share >= law.valid[0]) & (share <= law.valid[1])
        if np.all(inside):
            return _plain(inside), ()
        low, high = law.valid
        return _plain(inside), (
            f"{mix.name}: indirect gap; direct for a share of {law.first} from {low:g} to {high:g}",
        )
    if not sides:
        return _plain(np.full(np.shape(edge), True)), (
            f"{mix.name}: its file gives no edge at X or L; taken as direct",
        )
    lowest = np.minimum.reduce([np.asarray(side) for _, side in sides])
    direct = np.asarray(edge) <= lowest + _EVEN
    if np.all(direct):
        return _plain(direct), ()
    deepest = np.asarray(edge) - lowest
    index = int(np.argmax(deepest))
    which = min(sides, key=lambda s: float(np.broadcast_to(s[1], deepest.shape).flat[index]))[0]
    up_to = "up to " if np.ndim(deepest) else ""
    bare = " (X and L are not shifted by strain)" if strained else ""
    return _plain(direct), (
        f"{mix.name}: indirect gap; the edge at {which} lies {up_to}"
        f"{1000.0 * float(deepest.flat[index]):.0f} meV below the one at Gamma used here{bare}",
    )


def _plain(flags: Any) -> Any:
    """Return a bool for a single composition, the array for a graded one."""
    return flags if np.ndim(flags) else bool(flags)


def _stamp(path: str | Path) -> int:
    """Return the time a file was changed, so that an edited file is read again."""
    try:
        return Path(path).stat().st_mtime_ns
    except OSError:
        return -1  # read_file says what is wrong


@lru_cache(maxsize=64)
def _library(paths: tuple[tuple[str, int], ...]) -> Library:
    return Library(read_file(path) for path, _ in paths)
