"""Layer: a thickness and a material, or a thickness and its own numbers."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields
from typing import Any

from .. import quantities as q
from ..errors import BandwrightError, StackError
from ..shapes import Flat, Function, Linear, Points, Quadratic, Shape, as_shape, named
from .words import as_plane, as_width, known_names, label_text, one_line, word

_LETTERS = ("x", "y")
_OWN = ("edge", "mass", "gap", "nonparabolicity")
_GRADINGS = ("linear", "quadratic")
#: keys of doping: spread over the layer, and planes on its first-grown face
PLANES = ("delta_donors", "delta_acceptors")
DOPING = ("donors", "acceptors", *PLANES)
_INPUTS = (
    "thickness",
    "material",
    *_LETTERS,
    *_OWN,
    "grading",
    "field",
    "donors",
    "acceptors",
    "delta_donors",
    "delta_acceptors",
    "interface_width",
    "label",
)


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
    delta_donors, delta_acceptors : sheet density, optional
        A delta doping plane, without thickness, on the layer's first-grown face in whatever order
        layers are listed: ``"2e11 / cm^2"``.
    interface_width : length, optional
        Standard deviation of the interface on which the layer is grown, its first-grown face in
        whatever order layers are listed; instead of the stack's.
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
    delta_donors: q.Density | None
    delta_acceptors: q.Density | None
    interface_width: float | None
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
        delta_donors: object = None,
        delta_acceptors: object = None,
        interface_width: object = None,
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
        known_names(changes, _INPUTS, "Layer.replace")
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

        The internal field keeps its sign, it is given along growth; and delta doping and
        ``interface_width`` stay those of the first-grown face.

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
                raise named(error, name).at(_own_place(self.label, self.material)) from None
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
        for name in DOPING:
            density = getattr(self, name)
            parts += [] if density is None else [f"{name}={q.density_text(density)!r}"]
        if self.interface_width is not None:
            width = q.length_text(q.Length(self.interface_width, "nm"))
            parts.append(f"interface_width={width!r}")
        parts += [] if self.label is None else [f"label={self.label!r}"]
        return f"Layer({', '.join(parts)})"


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
        known_names(inputs, _INPUTS, None)
        if inputs.get("thickness") is None:
            raise StackError("thickness: missing; write for example '6.2 nm'")
        new = object.__new__(Layer)
        empty = dict.fromkeys(f.name for f in fields(Layer)) | {"fractions": ()}
        new._fill(empty | _layer_fields(inputs))
        return new
    except BandwrightError as error:
        raise error.at(_place(number, material, label)) from None


def _layer_fields(inputs: Mapping[str, Any], old: Layer | None = None) -> dict[str, Any]:
    """Return the stored fields that some inputs of `Layer` stand for."""
    grading = inputs.get("grading")
    if grading is not None:
        word(grading, _GRADINGS, "grading")
    elif old is not None and _graded(old):
        grading = "quadratic"  # a new pair goes as the layer's other pairs do
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
    pairs = any(isinstance(shape, Linear | Quadratic) for shape in values.values())
    if inputs.get("grading") is not None and not pairs:
        raise StackError(
            f"grading: got {q.show(grading)} but no pair to grade; give one, such as x = [0, 0.3]"
        )
    letters = dict(old.fractions) if old else {}
    letters |= {name: values.pop(name) for name in _LETTERS if name in values}
    values["fractions"] = tuple((n, letters[n]) for n in _LETTERS if letters.get(n) is not None)
    plain: dict[str, Callable[[Any, str], Any]] = {
        "thickness": q.as_thickness,
        "material": one_line,
        "field": q.as_field,
        "donors": q.as_density,
        "acceptors": q.as_density,
        "delta_donors": as_plane,
        "delta_acceptors": as_plane,
        "interface_width": as_width,
        "label": label_text,
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
    if _graded(layer) and any(isinstance(shape, Linear) for _, shape in layer.shapes):
        raise StackError("grading: a linear and a quadratic pair; grade the pairs of a layer alike")
    for name, shape in layer.shapes:
        _check_shape(layer, name, shape)


def _check_shape(layer: Layer, name: str, shape: Shape) -> None:
    if isinstance(shape, Points) and layer.thickness.unit == "nm":
        try:
            shape.check_covers(layer.thickness.value)
        except StackError as error:
            raise named(error, name) from None
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


def _shape_repr(shape: Shape, written_as: Callable[[float], str]) -> str:
    def one(value: float) -> str:
        written = written_as(value)
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
