"""Stack: the layers and everything around them that decides their levels."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, fields
from typing import Any, Self

from .. import quantities as q
from ..errors import BandwrightError, StackError, close_matches
from ..formula import elements
from .groups import (
    MOST_LAYERS,
    Repeat,
    Written,
    count,
    exchanged,
    expand,
    mapped,
    read_layers,
    walk,
)
from .layer import Layer
from .words import as_width, known_names, one_line, word

_ENDS = ("open", "wall", "periodic")
_BANDS = ("one-band", "two-band")
_RUNS = ("to surface", "to substrate")
_ORDERS = ("first grown first", "surface first")


@dataclass(frozen=True, init=False, repr=False)
class Stack:
    """A stack of layers and everything around it that decides its levels.

    Parameters
    ----------
    layers : sequence of Layer or Repeat
    name : str, optional
    temperature : temperature
        300 K if absent.
    substrate : str, optional
        The crystal every layer is strained to.
    field : electric field, optional
        Along growth when signed; a magnitude when ``electrons_run`` is given.
    bias : voltage, optional
        Potential of the surface side minus the substrate side; a magnitude when
        ``electrons_run`` is given.
    electrons_run : {"to surface", "to substrate"}, optional
    ends : str or pair of str
        ``"open"``, ``"wall"`` or ``"periodic"``, for both sides or a pair; ``"periodic"`` only
        for both.
    zero : str, optional
        The label or material that energies count from.
    bands : {"one-band", "two-band"}, optional
    materials : path or sequence of paths
        Own material files; stored as absolute paths, so that a stack means the same anywhere.
    interface_width : length, optional
        Standard deviation of every interface that has none of its own: the composition goes from
        one layer's to the next's by an error function. Abrupt if absent.
    segregation : mapping of str to float, optional
        Elements that float on the growing surface, each with the share of it there that goes on
        to the next monolayer: ``{"In": 0.8}`` (Muraki, Fukatsu, Shiraki, Ito, Appl. Phys. Lett.
        61, 557, 1992).
    order : {"first grown first", "surface first"}
        The order of what is given: ``layers``, groups, and of every pair, the one of ``ends``
        too. Stored in growth order.

    Raises
    ------
    StackError, QuantityError
        If the stack can't be grown or solved as written.

    Examples
    --------
    >>> stack = Stack([Layer("30 nm", "Al0.28Ga0.72As"), Layer("6.2 nm", "GaAs", label="well")])
    >>> [written.name for written in stack.written()]
    ['layer 1 (Al0.28Ga0.72As)', 'well']
    >>> stack.temperature
    300.0
    """

    layers: tuple[Layer | Repeat, ...]
    name: str | None
    temperature: float
    substrate: str | None
    field: float | None
    bias: float | None
    electrons_run: str | None
    ends: tuple[str, str]
    zero: str | None
    bands: str | None
    materials: tuple[str, ...]
    interface_width: float | None
    segregation: tuple[tuple[str, float], ...]

    def __init__(
        self,
        layers: Iterable[Layer | Repeat],
        *,
        name: str | None = None,
        temperature: object = "300 K",
        substrate: str | None = None,
        field: object = None,
        bias: object = None,
        electrons_run: str | None = None,
        ends: str | Iterable[str] = ("open", "open"),
        zero: str | None = None,
        bands: str | None = None,
        materials: str | os.PathLike[str] | Iterable[str | os.PathLike[str]] = (),
        interface_width: object = None,
        segregation: object = (),
        order: str = "first grown first",
    ) -> None:
        inputs = dict(locals())
        del inputs["self"]
        self._fill(_stack_fields(inputs))

    def _fill(self, values: Mapping[str, Any]) -> None:
        for field in fields(self):
            object.__setattr__(self, field.name, values[field.name])
        _check_stack(self)

    @property
    def signed_field(self) -> float | None:
        """Electric field along growth [V/nm], ``electrons_run`` applied; None without field."""
        return self._signed(self.field, negative="to surface")

    @property
    def signed_bias(self) -> float | None:
        """Potential of the surface minus the substrate side [V], ``electrons_run`` applied."""
        return self._signed(self.bias, negative="to substrate")

    def _signed(self, value: float | None, negative: str) -> float | None:
        return -value if self.electrons_run == negative and value else value

    def written(self) -> tuple[Written, ...]:
        """Return each written layer once, in growth order, numbered from 1.

        Examples
        --------
        >>> pair = [Layer("5 nm", "GaAs"), Layer("8 nm", "Al0.3Ga0.7As")]
        >>> [(w.number, w.path, w.copies) for w in Stack([Repeat(30, pair)]).written()]
        [(1, (0, 0), 30), (2, (0, 1), 30)]
        """
        found: list[Written] = []
        walk(self.layers, (), 1, found)
        return tuple(found)

    def grown(self) -> list[tuple[Layer, int]]:
        """Return every grown layer with the number it was written under, groups expanded.

        Examples
        --------
        >>> stack = Stack([Repeat(2, [Layer("5 nm", "GaAs"), Layer("8 nm", "AlAs")])])
        >>> [number for layer, number in stack.grown()]
        [1, 2, 1, 2]
        """
        return expand(self.layers, 1)[0]

    def replace(self, **changes: Any) -> Stack:
        """Return the stack with some inputs changed; they are written as for `Stack`.

        ``order`` tells the order of the layers and ends in this same call.

        Raises
        ------
        StackError, QuantityError
            If the changed stack can't be grown or solved.

        Examples
        --------
        >>> Stack([Layer("6.2 nm", "GaAs")]).replace(temperature="77 K").temperature
        77.0
        """
        known = [f.name for f in fields(self)]
        known_names(changes, [*known, "order"], "Stack.replace")
        return self._changed(_stack_fields(changes))

    def with_layer(self, number: int, layer: Layer) -> Stack:
        """Return the stack with the written layer of that number exchanged.

        Raises
        ------
        StackError
            If no written layer has the number.
        """
        for written in self.written():
            if written.number == number:
                return self._changed({"layers": exchanged(self.layers, written.path, layer)})
        raise StackError(f"layer {number}: the stack has layers 1 to {len(self.written())}")

    @property
    def realistic(self) -> bool:
        """Whether an interface is as it grows: spread, or carried on by segregation."""
        return bool(
            self.interface_width
            or self.segregation
            or any(written.layer.interface_width for written in self.written())
        )

    def abrupt(self) -> Stack:
        """Return the stack with every interface abrupt.

        Examples
        --------
        >>> Stack([Layer("6.2 nm", "GaAs")], interface_width="0.3 nm").abrupt()
        Stack([Layer('6.2 nm', 'GaAs')])
        """

        def bare(layer: Layer) -> Layer:
            plain = layer.interface_width is None
            return layer if plain else layer.replace(interface_width=None)

        layers = mapped(self.layers, bare)
        return self._changed({"layers": layers, "interface_width": None, "segregation": ()})

    def _changed(self, values: Mapping[str, Any]) -> Self:
        new = object.__new__(type(self))
        new._fill({f.name: getattr(self, f.name) for f in fields(self)} | dict(values))
        return new

    def __repr__(self) -> str:
        texts: dict[str, Callable[[Any], str]] = {
            "temperature": q.temperature_text,
            "field": q.field_text,
            "bias": q.voltage_text,
            "interface_width": lambda width: q.length_text(q.Length(width, "nm")),
        }
        defaults = {
            "temperature": 300.0, "ends": ("open", "open"), "materials": (), "segregation": (),
        }  # fmt: skip
        parts = [repr(list(self.layers))]
        for field in fields(self)[1:]:
            value = getattr(self, field.name)
            if value != defaults.get(field.name):
                written = texts[field.name](value) if field.name in texts else value
                if field.name == "segregation":
                    written = dict(value)
                parts.append(f"{field.name}={written!r}")
        return f"Stack({', '.join(parts)})"


def _stack_fields(inputs: Mapping[str, Any]) -> dict[str, Any]:
    """Return the stored fields that some inputs of `Stack` stand for."""
    values = dict(inputs)
    order = values.pop("order", _ORDERS[0])
    word(order, _ORDERS, "order")
    if "layers" in values:
        layers = read_layers(values["layers"], "stack")
        if order == "surface first":
            layers = tuple(layer.reversed() for layer in reversed(layers))
        values["layers"] = layers
    elif order == "surface first":
        raise StackError("order: 'surface first' needs the layers it is about")
    if "ends" in values:
        ends = _read_ends(values["ends"])
        values["ends"] = ends[::-1] if order == "surface first" else ends
    if "materials" in values:
        values["materials"] = _paths(values["materials"])
    if "temperature" in values:
        values["temperature"] = q.as_temperature(values["temperature"], "temperature")
    if "segregation" in values:
        values["segregation"] = _shares(values["segregation"])
    optional: dict[str, Callable[[Any, str], Any]] = {
        "name": one_line,
        "substrate": one_line,
        "zero": one_line,
        "field": q.as_field,
        "bias": q.as_voltage,
        "electrons_run": lambda value, name: word(value, _RUNS, name),
        "bands": lambda value, name: word(value, _BANDS, name),
        "interface_width": as_width,
    }
    for name, read in optional.items():
        if values.get(name) is not None:
            values[name] = read(values[name], name)
    return values


def _check_stack(stack: Stack) -> None:
    if stack.field is not None and stack.bias is not None:
        raise StackError("field and bias: both given; leave one out")
    if stack.electrons_run is not None:
        name = "field" if stack.field is not None else "bias"
        value = getattr(stack, name)
        if value is None:
            raise StackError("electrons_run: given without a field or bias; add one")
        if value < 0.0:
            found = q.field_text(value) if name == "field" else q.voltage_text(value)
            raise StackError(
                f"{name}: got '{found}' beside electrons_run; with electrons_run it is a"
                " magnitude, so write it without the minus sign"
            )
    grown = count(stack.layers)
    if grown > MOST_LAYERS:
        raise StackError(
            f"{grown:,} grown layers; at most {MOST_LAYERS:,} can be grown: lower the times of"
            " its groups"
        )
    written = stack.written()
    for element, _ in stack.segregation:
        holds = {e for w in written if w.layer.material for e in _elements(w.layer.material)}
        if element not in holds:
            raise StackError(
                f"segregation: no layer has {element!r}{close_matches(element, holds)}"
            )
    own = [w for w in written if w.layer.own_numbers]
    if own and len(own) < len(written) and stack.zero is None:
        other = next(w for w in written if not w.layer.own_numbers)
        raise StackError(
            f"zero: missing; {own[0].name} brings its own numbers and {other.name} a material:"
            f" name what own edges count from, for example zero = '{_zero(written)}'"
        )
    if stack.bands == "two-band":
        bare = [w.name for w in own if w.layer.gap is None and w.layer.nonparabolicity is None]
        if bare:
            raise StackError(
                f"bands: 'two-band' needs a gap or a nonparabolicity in {', '.join(bare)}"
            )


def _elements(formula: str) -> tuple[str, ...]:
    try:
        return elements(formula)
    except BandwrightError:  # what is wrong with it is said when its layer is built
        return ()


def _zero(written: Iterable[Written]) -> str:
    """Return a zero that a stack of own numbers and materials may name."""
    layers = [w.layer for w in written if not w.layer.own_numbers]
    names = [layer.label or layer.material for layer in layers if not layer.fractions]
    return names[0] or "GaAs" if names else "GaAs"


def _read_ends(value: object) -> tuple[str, str]:
    if isinstance(value, str):
        end = word(value, _ENDS, "ends")
        return (end, end)
    given = tuple(value) if isinstance(value, Iterable) else ()
    if len(given) != 2:
        raise StackError(f"ends: got {q.show(value)}; write two, such as ['open', 'wall']")
    first, last = (word(end, _ENDS, "ends") for end in given)
    if (first == "periodic") != (last == "periodic"):
        raise StackError(
            f"ends: got ['{first}', '{last}']; 'periodic' joins both sides: write it for both"
        )
    return (first, last)


def _shares(value: object) -> tuple[tuple[str, float], ...]:
    """Return the elements that segregate, each with the share that stays on the surface."""
    try:
        given = dict(() if value is None else value)  # type: ignore[call-overload]  # no mapping raises
    except (TypeError, ValueError):
        raise StackError(
            f"segregation: got {q.show(value)}; write elements with their shares, such as"
            " {In = 0.8}"
        ) from None
    shares = []
    for element, share in sorted(given.items(), key=str):
        number = q.as_fraction(share, f"segregation of {element}")
        if not 0.0 <= number < 1.0:
            raise StackError(
                f"segregation of {element}: got {q.show(share)}; the share that stays on the"
                " surface lies from 0 to below 1"
            )
        if number:
            shares.append((str(element), number))
    return tuple(shares)


def _paths(value: object) -> tuple[str, ...]:
    given = [value] if isinstance(value, str | os.PathLike) else value
    if not isinstance(given, Iterable):
        raise StackError(f"materials: got {q.show(value)}; give paths of material files")
    paths = []
    for path in given:
        if not isinstance(path, str | os.PathLike) or not os.fspath(path):
            raise StackError(f"materials: got {q.show(path)}; give the path of a material file")
        paths.append(os.path.abspath(os.fsdecode(path)))
    return tuple(paths)
