"""Layer, Repeat, Stack: what is grown, immutable, hashable, in growth order.

Everything is checked here that needs no material. Values are stored in core units: thickness
in nm or ML as written, energies in eV, fields in V/nm, temperature in K.
"""

from __future__ import annotations

import operator
import os
import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, fields
from typing import Any, NamedTuple, Self

from . import quantities as q
from .errors import BandwrightError, StackError, UnknownName, close_matches
from .shapes import Flat, Function, Linear, Points, Quadratic, Shape, as_shape

#: a stack of more grown layers than this is refused
MOST_LAYERS = 1_000_000
_LETTERS = ("x", "y")
_OWN = ("edge", "mass", "gap", "nonparabolicity")
_GRADINGS = ("linear", "quadratic")
_ENDS = ("open", "wall", "periodic")
_BANDS = ("one-band", "two-band")
_RUNS = ("to surface", "to substrate")
_ORDERS = ("first grown first", "surface first")
_NUMBERED = re.compile(r"layer\s+\d+", re.IGNORECASE)


@dataclass(frozen=True, init=False, repr=False)
class Layer:
    """One layer: a thickness and a material, or its own edge and mass.

    Parameters
    ----------
    thickness : str or quantity
        Any length, or a number of monolayers of the strained film (``"22 ML"``).
    material : str, optional
        The chemical formula: ``"Al0.28Ga0.72As"``, or with letters ``"AlxGa1-xAs"``.
    x, y : float, pair, list of (depth, value), or callable, optional
        Fractions of the formula's letters. A pair goes from the first to the last face.
    edge : energy, pair, list of (depth, energy), or callable, optional
        Conduction-band edge above the stack's zero, for a layer with its own numbers. A
        callable takes depths [nm] from the first face (a float array) and gives eV.
    mass : float, pair, list of (depth, value), or callable, optional
        Effective mass [free-electron masses].
    gap : energy or any shape of it, optional
        Gap of the two-band mass.
    nonparabolicity : inverse energy or any shape of it, optional
        Given instead of ``gap``, as ``"0.56 / eV"``.
    grading : {"linear", "quadratic"}, optional
        How every pair of the layer goes; linear if absent.
    field : electric field, optional
        The layer's internal field along growth, added to the stack's.
    donors, acceptors : density, optional
        ``"2e11 / cm^2"`` spread over the layer, or ``"3e17 / cm^3"``.
    label : str, optional
        A name of your own; layers with the same label are one parameter.

    Raises
    ------
    StackError, QuantityError
        If the layer can't be grown as written; the text names the layer and the key.

    Examples
    --------
    >>> Layer("6.2 nm", "GaAs", label="well").thickness
    Length(value=6.2, unit='nm')
    >>> Layer("62 Å", "GaAs") == Layer("6.2 nm", "GaAs")
    True
    >>> Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3]).x
    Linear(first=0.0, last=0.3)
    """

    thickness: q.Length
    material: str | None
    fractions: tuple[tuple[str, Shape], ...]
    edge: Shape | None
    mass: Shape | None
    gap: Shape | None
    nonparabolicity: Shape | None
    field: float | None
    donors: q.Density | None
    acceptors: q.Density | None
    label: str | None

    def __init__(
        self,
        thickness: object,
        material: str | None = None,
        *,
        x: object = None,
        y: object = None,
        edge: object = None,
        mass: object = None,
        gap: object = None,
        nonparabolicity: object = None,
        grading: str | None = None,
        field: object = None,
        donors: object = None,
        acceptors: object = None,
        label: str | None = None,
    ) -> None:
        inputs = dict(locals())
        del inputs["self"]
        try:
            self._fill(_layer_fields(inputs))
        except BandwrightError as error:
            raise error.at(_own_place(label, material)) from None

    def _fill(self, values: Mapping[str, Any]) -> None:
        for field in fields(self):
            object.__setattr__(self, field.name, values[field.name])
        _check_layer(self)

    @property
    def x(self) -> Shape | None:
        """Fraction x of the formula, if given."""
        return dict(self.fractions).get("x")

    @property
    def y(self) -> Shape | None:
        """Fraction y of the formula, if given."""
        return dict(self.fractions).get("y")

    @property
    def own_numbers(self) -> bool:
        """Whether the layer brings edge and mass instead of a material."""
        return self.material is None

    @property
    def shapes(self) -> tuple[tuple[str, Shape], ...]:
        """Every (key, shape) of the layer."""
        own = ((name, getattr(self, name)) for name in _OWN)
        return self.fractions + tuple((name, shape) for name, shape in own if shape is not None)

    def replace(self, **changes: object) -> Layer:
        """Return the layer with some inputs changed; they are written as for `Layer`.

        Stored values (a `Length`, a shape, a `Density`) are taken as well.

        Raises
        ------
        StackError, QuantityError
            If the changed layer can't be grown.

        Examples
        --------
        >>> Layer("6.2 nm", "GaAs").replace(thickness="7 nm")
        Layer('7 nm', 'GaAs')
        """
        known = ("thickness", "material", *_LETTERS, *_OWN, "grading", "field", "donors")
        _known_names(changes, (*known, "acceptors", "label"), "Layer.replace")
        return self._changed(_layer_fields(changes, self))

    def _changed(self, values: Mapping[str, Any]) -> Layer:
        new = object.__new__(Layer)
        try:
            new._fill({f.name: getattr(self, f.name) for f in fields(self)} | dict(values))
        except BandwrightError as error:
            raise error.at(_own_place(self.label, self.material)) from None
        return new

    def reversed(self) -> Layer:
        """Return the layer turned over: every shape seen from the other face.

        The internal field keeps its sign: it is given along growth.

        Raises
        ------
        StackError
            If a table of points or a callable meets a thickness in ML.
        """
        thickness = self.thickness.value if self.thickness.unit == "nm" else None
        turned: dict[str, Any] = {}
        for name, shape in self.shapes:
            try:
                turned[name] = shape.reversed(thickness)
            except StackError as error:
                raise error.at(name).at(_own_place(self.label, self.material)) from None
        letters = tuple((letter, turned.pop(letter)) for letter, _ in self.fractions)
        return self._changed(turned | {"fractions": letters})

    def __repr__(self) -> str:
        parts = [repr(q.length_text(self.thickness))]
        parts += [repr(self.material)] if self.material is not None else []
        texts = {"edge": q.energy_text, "gap": q.energy_text}
        texts["nonparabolicity"] = q.inverse_energy_text
        for name, shape in self.shapes:
            parts.append(f"{name}={_shape_repr(shape, texts.get(name, q.number_text))}")
        parts += ["grading='quadratic'"] if _graded(self) else []
        parts += [] if self.field is None else [f"field={q.field_text(self.field)!r}"]
        for name in ("donors", "acceptors"):
            density = getattr(self, name)
            parts += [] if density is None else [f"{name}={q.density_text(density)!r}"]
        parts += [] if self.label is None else [f"label={self.label!r}"]
        return f"Layer({', '.join(parts)})"


@dataclass(frozen=True, init=False, repr=False)
class Repeat:
    """A group of layers grown several times.

    Parameters
    ----------
    times : int
        At least 1.
    layers : sequence of Layer or Repeat
        In the order of the stack they are part of.

    Raises
    ------
    StackError
        If ``times`` is no whole number from 1, or ``layers`` is empty or holds anything else.

    Examples
    --------
    >>> Repeat(30, [Layer("5 nm", "GaAs"), Layer("8 nm", "Al0.3Ga0.7As")]).times
    30
    """

    times: int
    layers: tuple[Layer | Repeat, ...]

    def __init__(self, times: int, layers: Iterable[Layer | Repeat]) -> None:
        try:
            whole = operator.index(times)
        except TypeError:
            whole = 0
        if whole < 1 or isinstance(times, bool):
            raise StackError(f"times: got {q.show(times)}; write a whole number from 1", "group")
        object.__setattr__(self, "times", whole)
        object.__setattr__(self, "layers", _layers(layers, "group"))

    def reversed(self) -> Repeat:
        """Return the group turned over: layers in the other order, each turned over."""
        return Repeat(self.times, [layer.reversed() for layer in reversed(self.layers)])

    def __repr__(self) -> str:
        return f"Repeat({self.times}, {list(self.layers)!r})"


class Written(NamedTuple):
    """A layer as written once: its number from 1 in growth order, its path, its copies.

    ``path`` holds the index in `Stack.layers`, then the index in each group's `layers`.
    """

    number: int
    layer: Layer
    path: tuple[int, ...]
    copies: int

    @property
    def name(self) -> str:
        """The label, or the number and formula."""
        return layer_name(self.number, self.layer)


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
        Own material files.
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
        return -value if value and self.electrons_run == negative else value

    def written(self) -> tuple[Written, ...]:
        """Return each written layer once, in growth order, numbered from 1.

        Examples
        --------
        >>> pair = [Layer("5 nm", "GaAs"), Layer("8 nm", "Al0.3Ga0.7As")]
        >>> [(w.number, w.path, w.copies) for w in Stack([Repeat(30, pair)]).written()]
        [(1, (0, 0), 30), (2, (0, 1), 30)]
        """
        found: list[Written] = []
        _walk(self.layers, (), 1, found)
        return tuple(found)

    def grown(self) -> list[tuple[Layer, int]]:
        """Return every grown layer with the number it was written under, groups expanded.

        Examples
        --------
        >>> stack = Stack([Repeat(2, [Layer("5 nm", "GaAs"), Layer("8 nm", "AlAs")])])
        >>> [number for layer, number in stack.grown()]
        [1, 2, 1, 2]
        """
        return _expand(self.layers, 1)[0]

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
        _known_names(changes, [*known, "order"], "Stack.replace")
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
                return self._changed({"layers": _exchanged(self.layers, written.path, layer)})
        raise StackError(f"layer {number}: the stack has layers 1 to {len(self.written())}")

    def _changed(self, values: Mapping[str, Any]) -> Self:
        new = object.__new__(type(self))
        new._fill({f.name: getattr(self, f.name) for f in fields(self)} | dict(values))
        return new

    def __repr__(self) -> str:
        texts: dict[str, Callable[[Any], str]] = {
            "temperature": q.temperature_text,
            "field": q.field_text,
            "bias": q.voltage_text,
        }
        defaults = {"temperature": 300.0, "ends": ("open", "open"), "materials": ()}
        parts = [repr(list(self.layers))]
        for field in fields(self)[1:]:
            value = getattr(self, field.name)
            if value != defaults.get(field.name):
                text = texts[field.name](value) if field.name in texts else value
                parts.append(f"{field.name}={text!r}")
        return f"Stack({', '.join(parts)})"


def layer_name(number: int, layer: Layer) -> str:
    """Return how a reader names a layer: its label, or its number and formula.

    Examples
    --------
    >>> layer_name(2, Layer("6.2 nm", "GaAs")), layer_name(2, Layer("6 nm", "GaAs", label="well"))
    ('layer 2 (GaAs)', 'well')
    """
    return layer.label if layer.label is not None else _place(number, layer.material)


def numbered_layer(number: int, **inputs: Any) -> Layer:
    """Return `Layer` from inputs by name, its errors naming the layer by number.

    For readers of files, lines and tables, where the number is known.

    Raises
    ------
    StackError, QuantityError
        As `Layer`, beginning ``layer 2 (GaAs):`` or ``layer 2, 'well' (GaAs):``.

    Examples
    --------
    >>> numbered_layer(2, thickness="6.2", material="GaAs")
    Traceback (most recent call last):
    ...
    bandwright.errors.QuantityError: layer 2 (GaAs): thickness: got '6.2'; write '6.2 nm'
    """
    material = inputs.get("material")
    label = inputs.get("label")
    try:
        known = ["thickness", "material", *_LETTERS, *_OWN, "grading", "field", "donors"]
        _known_names(inputs, [*known, "acceptors", "label"], None)
        if inputs.get("thickness") is None:
            raise StackError("thickness: missing; write for example '6.2 nm'")
        new = object.__new__(Layer)
        empty = dict.fromkeys(f.name for f in fields(Layer)) | {"fractions": ()}
        new._fill(empty | _layer_fields(inputs))
        return new
    except BandwrightError as error:
        raise error.at(_place(number, material, label)) from None


# --- layers ---------------------------------------------------------------------------------


def _layer_fields(inputs: Mapping[str, Any], old: Layer | None = None) -> dict[str, Any]:
    """Return the stored fields that some inputs of `Layer` stand for."""
    grading = inputs.get("grading")
    if grading is not None:
        _word(grading, _GRADINGS, "grading")
    converts: dict[str, Callable[[object, str], float]] = {
        "x": q.as_fraction,
        "y": q.as_fraction,
        "edge": q.as_energy,
        "mass": q.as_mass,
        "gap": _as_gap,
        "nonparabolicity": q.as_inverse_energy,
    }
    values: dict[str, Any] = {}
    for name, convert in converts.items():
        if name in inputs:
            given = inputs[name]
            values[name] = None if given is None else as_shape(given, convert, name, grading)
    if grading is not None and not any(
        isinstance(shape, Linear | Quadratic) for shape in values.values()
    ):
        raise StackError(
            f"grading: got {q.show(grading)} but no pair to grade; give one, such as x = [0, 0.3]"
        )
    letters = dict(old.fractions) if old else {}
    letters |= {name: values.pop(name) for name in _LETTERS if name in values}
    values["fractions"] = tuple((n, letters[n]) for n in _LETTERS if letters.get(n) is not None)
    plain: dict[str, Callable[[Any, str], Any]] = {
        "thickness": q.as_thickness,
        "material": _text,
        "field": q.as_field,
        "donors": q.as_density,
        "acceptors": q.as_density,
        "label": _label,
    }
    for name, read in plain.items():
        if name in inputs:
            given = inputs[name]
            missing = given is None and name != "thickness"
            values[name] = None if missing else read(given, name)
    return values


def _check_layer(layer: Layer) -> None:
    own = [name for name in _OWN if getattr(layer, name) is not None]
    if layer.material is not None and own:
        raise StackError(
            f"{' and '.join(own)}: own numbers on a material; leave out the material, or write a"
            " variant of it into a material file"
        )
    if layer.material is None:
        if not own:
            raise StackError("no material; write one such as 'GaAs', or give edge and mass")
        if layer.fractions:
            raise StackError(f"{layer.fractions[0][0]}: a fraction needs a material's formula")
        for name, example in (("edge", "'235 meV'"), ("mass", "0.067")):
            if getattr(layer, name) is None:
                raise StackError(f"{name}: missing beside {own[0]}; write for example {example}")
        if layer.gap is not None and layer.nonparabolicity is not None:
            raise StackError("gap and nonparabolicity: both given; leave one out")
        if layer.thickness.unit == "ML":
            raise StackError(
                f"thickness: got '{q.length_text(layer.thickness)}'; monolayers need a material;"
                " write a length in nm"
            )
    for name, shape in layer.shapes:
        _check_shape(layer, name, shape)


def _check_shape(layer: Layer, name: str, shape: Shape) -> None:
    if isinstance(shape, Points) and layer.thickness.unit == "nm":
        try:
            shape.check_covers(layer.thickness.value)
        except StackError as error:
            raise error.at(name) from None
    for value in shape.samples:
        if name in _LETTERS and not 0.0 <= value <= 1.0:
            raise StackError(f"{name}: got {value}; a fraction lies between 0 and 1")
        if name in ("mass", "gap") and value <= 0.0:
            raise StackError(f"{name}: got {value}; it must be above zero")
        if name == "nonparabolicity" and value < 0.0:
            raise StackError(f"{name}: got {value}; it can't be negative")


def _as_gap(value: object, name: str) -> float:
    gap = q.as_energy(value, name)
    if gap <= 0.0:
        raise StackError(f"{name}: got {q.show(value)}; a gap must be above zero")
    return gap


def _graded(layer: Layer) -> bool:
    return any(isinstance(shape, Quadratic) for _, shape in layer.shapes)


def _shape_repr(shape: Shape, text: Callable[[float], str]) -> str:
    def one(value: float) -> str:
        written = text(value)
        return repr(written) if " " in written else written

    if isinstance(shape, Flat):
        return one(shape.value)
    if isinstance(shape, Points):
        pairs = zip(shape.depths_nm, shape.values, strict=True)
        return "[" + ", ".join(f"({q.length_text(d)!r}, {one(v)})" for d, v in pairs) + "]"
    if isinstance(shape, Function):
        return repr(shape.function)
    return f"({one(shape.first)}, {one(shape.last)})"


def _place(number: int, material: object, label: object = None) -> str:
    formula = material if isinstance(material, str) else "own numbers"
    quoted = f", {label!r}" if isinstance(label, str) else ""
    return f"layer {number}{quoted} ({formula})"


def _own_place(label: object, material: object) -> str:
    """Return the place of an error in a layer that has no number yet."""
    quoted = f" {label!r}" if isinstance(label, str) else ""
    formula = f" ({material})" if isinstance(material, str) else ""
    return f"layer{quoted}{formula}"


# --- stacks ---------------------------------------------------------------------------------


def _stack_fields(inputs: Mapping[str, Any]) -> dict[str, Any]:
    """Return the stored fields that some inputs of `Stack` stand for."""
    values = dict(inputs)
    order = values.pop("order", _ORDERS[0])
    _word(order, _ORDERS, "order")
    if "layers" in values:
        layers = _layers(values["layers"], "stack")
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
    optional: dict[str, Callable[[Any, str], Any]] = {
        "name": _text,
        "substrate": _text,
        "zero": _text,
        "field": q.as_field,
        "bias": q.as_voltage,
        "electrons_run": lambda value, name: _word(value, _RUNS, name),
        "bands": lambda value, name: _word(value, _BANDS, name),
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
            text = q.field_text(value) if name == "field" else q.voltage_text(value)
            raise StackError(
                f"{name}: got '{text}' beside electrons_run; with electrons_run it is a"
                " magnitude, so write it without the minus sign"
            )
    count = _count(stack.layers)
    if count > MOST_LAYERS:
        raise StackError(
            f"{count:,} grown layers; at most {MOST_LAYERS:,} can be grown: lower the times of"
            " its groups"
        )
    written = stack.written()
    own = [w for w in written if w.layer.own_numbers]
    if own and len(own) < len(written) and stack.zero is None:
        other = next(w for w in written if not w.layer.own_numbers)
        raise StackError(
            f"zero: missing; {own[0].name} brings its own numbers and {other.name} a material:"
            f" name what own edges count from, for example zero = '{_zero(other)}'"
        )
    if stack.bands == "two-band":
        bare = [w.name for w in own if w.layer.gap is None and w.layer.nonparabolicity is None]
        if bare:
            raise StackError(
                f"bands: 'two-band' needs a gap or a nonparabolicity in {', '.join(bare)}"
            )


def _zero(written: Written) -> str:
    layer = written.layer
    return layer.label if layer.label is not None else str(layer.material)


def _layers(given: object, place: str) -> tuple[Layer | Repeat, ...]:
    if isinstance(given, str):
        raise StackError(
            f"layers: got {q.show(given)}; a line of text is read by parse_line(text)", place
        )
    if isinstance(given, Layer | Repeat) or not isinstance(given, Iterable):
        raise StackError(f"layers: got {q.show(given)}; give a list of layers", place)
    layers = tuple(given)
    if not layers:
        raise StackError("no layers; give at least one", place)
    for number, layer in enumerate(layers, start=1):
        if not isinstance(layer, Layer | Repeat):
            raise StackError(
                f"entry {number} is {q.show(layer)}; a Layer or a Repeat is due", place
            )
    return layers


def _walk(
    layers: tuple[Layer | Repeat, ...], path: tuple[int, ...], copies: int, found: list[Written]
) -> None:
    for index, layer in enumerate(layers):
        if isinstance(layer, Repeat):
            _walk(layer.layers, (*path, index), copies * layer.times, found)
        else:
            found.append(Written(len(found) + 1, layer, (*path, index), copies))


def _expand(layers: tuple[Layer | Repeat, ...], number: int) -> tuple[list[tuple[Layer, int]], int]:
    """Return the grown layers, and the number the next written layer has."""
    grown: list[tuple[Layer, int]] = []
    for layer in layers:
        if isinstance(layer, Repeat):
            group, number = _expand(layer.layers, number)
            grown += group * layer.times
        else:
            grown.append((layer, number))
            number += 1
    return grown, number


def _count(layers: tuple[Layer | Repeat, ...]) -> int:
    return sum(
        layer.times * _count(layer.layers) if isinstance(layer, Repeat) else 1 for layer in layers
    )


def _exchanged(
    layers: tuple[Layer | Repeat, ...], path: tuple[int, ...], new: Layer
) -> tuple[Layer | Repeat, ...]:
    index, *rest = path
    here = layers[index]
    entry: Layer | Repeat = new
    if isinstance(here, Repeat):
        entry = Repeat(here.times, _exchanged(here.layers, tuple(rest), new))
    return (*layers[:index], entry, *layers[index + 1 :])


# --- words ----------------------------------------------------------------------------------


def _text(value: object, name: str) -> str:
    if not isinstance(value, str) or not value.strip() or not value.isprintable():
        raise StackError(f"{name}: got {q.show(value)}; write one line of text")
    return str(value).strip()


def _label(value: object, name: str) -> str:
    label = _text(value, name)
    if _NUMBERED.fullmatch(label):
        raise StackError(
            f"{name}: got {q.show(value)}; that is what layers without a label are called; take"
            " another"
        )
    return label


def _word(value: object, words: tuple[str, ...], name: str) -> str:
    if isinstance(value, str) and value in words:
        return str(value)
    hint = close_matches(value, words) if isinstance(value, str) else ""
    if "mean" not in hint:
        hint = "; write " + " or ".join(repr(word) for word in words)
    raise StackError(f"{name}: got {q.show(value)}{hint}")


def _read_ends(value: object) -> tuple[str, str]:
    if isinstance(value, str):
        end = _word(value, _ENDS, "ends")
        return (end, end)
    given = tuple(value) if isinstance(value, Iterable) else ()
    if len(given) != 2:
        raise StackError(f"ends: got {q.show(value)}; write two, such as ['open', 'wall']")
    first, last = (_word(end, _ENDS, "ends") for end in given)
    if (first == "periodic") != (last == "periodic"):
        raise StackError(
            f"ends: got ['{first}', '{last}']; 'periodic' joins both sides: write it for both"
        )
    return (first, last)


def _paths(value: object) -> tuple[str, ...]:
    given = [value] if isinstance(value, str | os.PathLike) else value
    if not isinstance(given, Iterable):
        raise StackError(f"materials: got {q.show(value)}; give paths of material files")
    paths = []
    for path in given:
        if not isinstance(path, str | os.PathLike):
            raise StackError(f"materials: got {q.show(path)}; give the path of a material file")
        paths.append(str(os.fspath(path)))
    return tuple(paths)


def _known_names(given: Mapping[str, object], known: Iterable[str], where: str | None) -> None:
    for name in given:
        if name not in known:
            raise UnknownName(f"{name!r} is no input{close_matches(name, known)}", where)
