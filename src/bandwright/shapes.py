"""A value along a layer: flat, linear, quadratic, a table of points, or a callable.

Shapes hold plain floats in core units (fractions, eV, m0) and are immutable, hashable and
equal by value (a callable by identity). Depth runs in nm from the layer's first-grown face.
"""

from __future__ import annotations

import math
from bisect import bisect_left
from collections.abc import Callable, Iterable, Mapping, Sequence, Set
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise
from typing import Any, Literal, Self

import numpy as np
import numpy.typing as npt

from .errors import StackError
from .quantities import as_length, number_text, show

Floats = npt.NDArray[np.float64]
Face = Literal["first", "last"]


class _Shape:
    """What shapes have in common; one without kinks that knows only its faces."""

    __slots__ = ()

    @property
    def samples(self) -> tuple[float, ...]:
        """The values that were given: none of a callable."""
        return ()

    @property
    def constant(self) -> bool:
        """Whether the value is known to be the same all along."""
        return bool(self.samples) and all(np.all(v == self.samples[0]) for v in self.samples[1:])

    def breaks(self, thickness_nm: float) -> tuple[float, ...]:
        """Return the interior depths [nm] where the slope jumps."""
        return ()

    def stretched(self, factor: float) -> Self:
        """Return the shape of a layer ``factor`` times as thick."""
        return self


@dataclass(frozen=True, slots=True)
class Flat(_Shape):
    """One value all along."""

    value: float

    def __post_init__(self) -> None:
        _store(self, "value", _finite(self.value, "value"))

    @property
    def samples(self) -> tuple[float, ...]:
        """The values that were given."""
        return (self.value,)

    def at(self, depth_nm: npt.ArrayLike, thickness_nm: float, flat_at: Face = "first") -> Floats:
        """Return the value at each depth [nm], in the shape of ``depth_nm``."""
        return np.full(np.shape(depth_nm), self.value)

    def mapped(self, function: Callable[[float], float]) -> Flat:
        """Return this shape with ``function`` done to its value."""
        return Flat(function(self.value))

    def reversed(self, thickness_nm: float | None) -> Flat:
        """Return the shape seen from the other face."""
        return self


@dataclass(frozen=True, slots=True)
class _Pair(_Shape):
    """From a value at the first-grown face to one at the last-grown face."""

    first: float
    last: float

    def __post_init__(self) -> None:
        _store(self, "first", _finite(self.first, "first value"))
        _store(self, "last", _finite(self.last, "last value"))

    @property
    def samples(self) -> tuple[float, ...]:
        """The values that were given."""
        return (self.first, self.last)

    def mapped(self, function: Callable[[float], float]) -> Self:
        """Return this shape with an affine ``function`` done to its values."""
        return type(self)(function(self.first), function(self.last))

    def reversed(self, thickness_nm: float | None) -> Self:
        """Return the shape seen from the other face."""
        return type(self)(self.last, self.first)


@dataclass(frozen=True, slots=True)
class Linear(_Pair):
    """Straight from the first-grown to the last-grown face."""

    def at(self, depth_nm: npt.ArrayLike, thickness_nm: float, flat_at: Face = "first") -> Floats:
        """Return the value at each depth [nm], in the shape of ``depth_nm``."""
        part = np.asarray(depth_nm, dtype=float) / thickness_nm
        return np.asarray(self.first * (1.0 - part) + self.last * part)


@dataclass(frozen=True, slots=True)
class Quadratic(_Pair):
    """A parabola between the faces, without slope at the face where the band edge is lower."""

    def at(self, depth_nm: npt.ArrayLike, thickness_nm: float, flat_at: Face = "first") -> Floats:
        """Return the value at each depth [nm]; ``flat_at`` is the face without slope."""
        part = np.asarray(depth_nm, dtype=float) / thickness_nm
        if flat_at == "first":
            return np.asarray(self.first + (self.last - self.first) * part**2)
        return np.asarray(self.last + (self.first - self.last) * (1.0 - part) ** 2)


@dataclass(frozen=True, slots=True)
class Points(_Shape):
    """A table of points, straight in between; the first depth is 0, the last the thickness.

    Parameters
    ----------
    depths_nm : sequence of float
        Increasing depths [nm] from the layer's first-grown face.
    values : sequence of float
        The value at each depth.

    Examples
    --------
    >>> Points((0.0, 3.0, 8.0), (0.0, 0.12, 0.30)).at([1.5, 8.0], 8.0)
    array([0.06, 0.3 ])
    """

    depths_nm: tuple[float, ...]
    values: tuple[float, ...]

    def __post_init__(self) -> None:
        depths = tuple(_finite(d, "depth") for d in self.depths_nm)
        values = tuple(_finite(v, "value") for v in self.values)
        if len(depths) != len(values):
            raise StackError(f"got {len(depths)} depths and {len(values)} values; give as many")
        if len(depths) < 2:
            raise StackError(f"got {len(depths)} point; a table needs two or more")
        if depths[0] != 0.0:
            raise StackError(
                f"the first depth is {number_text(depths[0])} nm; the table must start at '0 nm'"
            )
        for before, after in pairwise(depths):
            if after <= before:
                found = f"depth {number_text(after)} nm follows {number_text(before)} nm"
                raise StackError(f"{found}; depths must increase (for a jump, write two layers)")
        _store(self, "depths_nm", depths)
        _store(self, "values", values)

    @property
    def samples(self) -> tuple[float, ...]:
        """The values that were given."""
        return self.values

    def check_covers(self, thickness_nm: float) -> None:
        """Raise `StackError` unless the table ends at the layer's last face.

        The last depth may differ from the thickness by a part in 1e6 (rounded tables).
        """
        if abs(self.depths_nm[-1] - thickness_nm) > 1e-6 * thickness_nm:
            raise StackError(
                f"the table ends at {number_text(self.depths_nm[-1])} nm and the layer is"
                f" {number_text(thickness_nm)} nm thick; end the table at the thickness"
            )

    def at(self, depth_nm: npt.ArrayLike, thickness_nm: float, flat_at: Face = "first") -> Floats:
        """Return the value at each depth [nm], in the shape of ``depth_nm``."""
        return np.asarray(np.interp(np.asarray(depth_nm, dtype=float), self.depths_nm, self.values))

    def breaks(self, thickness_nm: float) -> tuple[float, ...]:
        """Return the interior depths [nm] where the slope jumps: every interior point."""
        inside = bisect_left(self.depths_nm, thickness_nm)
        return self.depths_nm[1 : min(inside, len(self.depths_nm) - 1)]

    def mapped(self, function: Callable[[float], float]) -> Points:
        """Return this shape with an affine ``function`` done to its values."""
        return Points(self.depths_nm, tuple(function(v) for v in self.values))

    def reversed(self, thickness_nm: float | None) -> Points:
        """Return the shape seen from the other face.

        Raises
        ------
        StackError
            If the thickness [nm] is not known (given in ML), or is not the table's.
        """
        thickness = _known(thickness_nm, "a table of points")
        self.check_covers(thickness)
        end = Decimal(repr(self.depths_nm[-1]))
        depths = tuple(float(end - Decimal(repr(d))) for d in reversed(self.depths_nm))
        return Points(depths, self.values[::-1])

    def stretched(self, factor: float) -> Points:
        """Return the shape of a layer ``factor`` times as thick."""
        return Points(tuple(d * factor for d in self.depths_nm), self.values)


@dataclass(frozen=True, slots=True, eq=False)
class Function(_Shape):
    """A callable of the depth: a float array [nm] in, floats in core units out.

    The callable is asked at ``offset + scale * depth``, so that a layer can be turned over or
    stretched. Two are equal when the callable is the same object. A lambda or a local function
    does not pickle, so it can't go to a worker process; a function of a module can.
    """

    function: Callable[[Floats], Any]
    scale: float = 1.0
    offset: float = 0.0

    def __post_init__(self) -> None:
        if not callable(self.function):
            raise StackError(f"got {show(self.function)}; a callable of the depth is due")

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Function):
            return NotImplemented
        return (
            self.function is other.function
            and self.scale == other.scale
            and self.offset == other.offset
        )

    def __hash__(self) -> int:
        return hash((id(self.function), self.scale, self.offset))

    def at(self, depth_nm: npt.ArrayLike, thickness_nm: float, flat_at: Face = "first") -> Floats:
        """Return the value at each depth [nm], in the shape of ``depth_nm``.

        Raises
        ------
        StackError
            If the callable returns no finite float for each depth.
        """
        depth = np.asarray(depth_nm, dtype=float)
        given = self.function(self.offset + self.scale * depth)
        try:
            value = np.asarray(given, dtype=float)
            value = np.array(np.broadcast_to(value, depth.shape))
        except (TypeError, ValueError):
            raise StackError(
                f"the callable returned {show(given)} for depths of shape {depth.shape}; it must"
                " return one float for each depth"
            ) from None
        if not np.all(np.isfinite(value)):
            bad = float(depth[~np.isfinite(value)].flat[0]) if depth.ndim else float(depth)
            raise StackError(f"the callable is not finite at {number_text(bad)} nm")
        return value

    def mapped(self, function: Callable[[float], float]) -> Function:
        """Return this shape with ``function`` done to its values (arrays of them)."""
        return Function(_Mapped(function, self))

    def reversed(self, thickness_nm: float | None) -> Function:
        """Return the shape seen from the other face.

        Raises
        ------
        StackError
            If the thickness [nm] is not known (given in ML).
        """
        thickness = _known(thickness_nm, "a callable")
        return Function(self.function, -self.scale, self.offset + self.scale * thickness)

    def stretched(self, factor: float) -> Function:
        """Return the shape of a layer ``factor`` times as thick."""
        return Function(self.function, self.scale / factor, self.offset)


@dataclass(frozen=True, slots=True)
class _Mapped:
    """A shape's callable followed by another."""

    outer: Callable[[Any], Any]
    inner: Function

    def __call__(self, depth: Floats) -> Any:
        return self.outer(self.inner.at(depth, 1.0))


Shape = Flat | Linear | Quadratic | Points | Function
_SHAPES = (Flat, Linear, Quadratic, Points, Function)


def as_shape(
    value: object,
    convert: Callable[[object, str], float],
    name: str,
    grading: str | None = None,
) -> Shape:
    """Return the shape a user's value stands for.

    Parameters
    ----------
    value : scalar, pair, list of (depth, value) pairs, callable, or shape
        One value is flat; a pair goes from the first to the last face; points are a table.
    convert : callable
        Turns one given value into a float of core units, and raises naming it.
    name : str
        What the value is for; begins the text of an error.
    grading : {"linear", "quadratic"}, optional
        How a pair is joined; linear if absent.

    Raises
    ------
    StackError, QuantityError
        If the value is none of these.

    Examples
    --------
    >>> from bandwright.quantities import as_fraction
    >>> as_shape([0.0, 0.3], as_fraction, "x")
    Linear(first=0.0, last=0.3)
    >>> as_shape([("0 nm", 0.0), ("3 nm", 0.12), ("8 nm", 0.3)], as_fraction, "x")
    Points(depths_nm=(0.0, 3.0, 8.0), values=(0.0, 0.12, 0.3))
    """
    if isinstance(value, _SHAPES):
        return value
    if callable(value):
        return Function(value)
    items = _items(value)
    if items is None:
        return Flat(convert(value, name))
    try:
        if items and all(_items(item) is not None for item in items):
            return _points(items, convert, name)
        if len(items) == 2:
            first = convert(items[0], f"{name} (first value)")
            last = convert(items[1], f"{name} (last value)")
            return Quadratic(first, last) if grading == "quadratic" else Linear(first, last)
        raise StackError(
            f"got {show(value)}; give one value, a pair (first face, last face), or a table of"
            " (depth, value) points"
        )
    except StackError as error:
        raise named(error, name) from None


def named(error: StackError, name: str) -> StackError:
    """Return the error with the key it is about before its text."""
    return StackError(f"{name}: {error.message}", error.where)


def _points(items: Sequence[Any], convert: Callable[[object, str], float], name: str) -> Points:
    depths, values = [], []
    for number, item in enumerate(items, start=1):
        pair = _items(item) or []
        if len(pair) != 2:
            raise StackError(f"point {number} is {show(item)}; a point is (depth, value)")
        depths.append(as_length(pair[0], f"{name} (depth of point {number})"))
        values.append(convert(pair[1], f"{name} (point {number})"))
    return Points(tuple(depths), tuple(values))


def _items(value: object) -> list[Any] | None:
    """Return the items of a sequence that is no text, quantity or scalar."""
    if isinstance(value, str | Mapping | Set) or hasattr(value, "m_as"):
        return None
    if isinstance(value, np.ndarray):
        return list(value.tolist()) if value.ndim else None
    if isinstance(value, Iterable):
        return list(value)
    return None


def _finite(value: Any, name: str) -> float:
    try:
        number = float(value)
    except (TypeError, ValueError):
        raise StackError(f"{name}: got {show(value)}; a float in core units is due") from None
    if not math.isfinite(number):
        raise StackError(f"{name}: got {show(value)}; that is not finite")
    return number + 0.0


def _known(thickness_nm: float | None, what: str) -> float:
    if thickness_nm is None:
        raise StackError(
            f"{what} can't be turned over in a layer counted in ML; give its thickness in nm, or"
            " list the stack with the first grown layer first"
        )
    return thickness_nm


def _store(shape: object, field: str, value: object) -> None:
    object.__setattr__(shape, field, value)
