"""The keys of a written layer, and what every written form of a stack has in common.

A layer is written as a plain mapping: ``{"thickness": "6.2 nm", "material": "GaAs"}``. Files,
lines and tables differ only in how they spell that mapping, so all of them read it here.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from .. import quantities as q
from ..errors import StackFileError, close_matches
from ..shapes import Flat, Function, Points, Quadratic, Shape
from ..stack import DOPING, Layer, Stack, numbered_layer

#: what may vary along a layer: key -> what writes one float of it
SHAPED: Mapping[str, Callable[[float], str | float]] = {
    "x": float,
    "y": float,
    "edge": q.energy_text,
    "mass": float,
    "gap": q.energy_text,
    "nonparabolicity": q.inverse_energy_text,
}
PLAIN = (
    "label",
    "material",
    "thickness",
    "grading",
    "field",
    "donors",
    "acceptors",
    "delta_donors",
    "delta_acceptors",
    "interface_width",
)
LAYER_KEYS = (*PLAIN, *SHAPED)
STACK_KEYS = (
    "name",
    "temperature",
    "substrate",
    "field",
    "bias",
    "electrons_run",
    "ends",
    "zero",
    "bands",
    "materials",
    "interface_width",
    "segregation",
)
GRADINGS = ("linear", "quadratic")

#: units that a column's name may end with, by key
UNITS: Mapping[str, Mapping[str, str]] = {
    "depth": {"nm": "nm", "angstrom": "Å", "um": "um"},
    "thickness": {"nm": "nm", "ML": "ML", "angstrom": "Å", "um": "um"},
    "interface_width": {"nm": "nm", "angstrom": "Å"},
    "x": {"": ""},
    "y": {"": ""},
    "mass": {"": ""},
    "edge": {"meV": "meV", "eV": "eV"},
    "gap": {"eV": "eV", "meV": "meV"},
    "nonparabolicity": {"per_eV": "/ eV"},
    "field": {"kV_per_cm": "kV/cm", "V_per_nm": "V/nm", "MV_per_cm": "MV/cm"},
    "donors": {
        "per_cm2": "/ cm^2",
        "per_cm3": "/ cm^3",
        "per_nm2": "/ nm^2",
        "per_nm3": "/ nm^3",
    },
    "acceptors": {
        "per_cm2": "/ cm^2",
        "per_cm3": "/ cm^3",
        "per_nm2": "/ nm^2",
        "per_nm3": "/ nm^3",
    },
    "delta_donors": {"per_cm2": "/ cm^2", "per_nm2": "/ nm^2"},
    "delta_acceptors": {"per_cm2": "/ cm^2", "per_nm2": "/ nm^2"},
}


def column(key: str, unit: str) -> str:
    """Return a column's name: the key, and its unit where it has one."""
    return f"{key}_{unit}" if unit else key


def place(number: int, entries: Mapping[str, Any]) -> str:
    """Return how an error names a written layer: number, label, formula."""
    label = entries.get("label")
    quoted = f", {label!r}" if isinstance(label, str) else ""
    material = entries.get("material")
    formula = f" ({material})" if isinstance(material, str) else ""
    return f"layer {number}{quoted}{formula}"


def check_keys(found: Mapping[str, Any], known: tuple[str, ...], where: str | None) -> None:
    """Refuse keys that nothing knows, with those that come close.

    Raises
    ------
    StackFileError
        If a key is not among ``known``.
    """
    for key in found:
        if key not in known:
            raise StackFileError(f"unknown key {key!r}{close_matches(str(key), known)}", where)


def layer_from(entries: Mapping[str, Any], number: int) -> Layer:
    """Return the layer that a mapping of `LAYER_KEYS` describes.

    Raises
    ------
    StackFileError
        If a key is unknown.
    StackError, QuantityError
        If the layer can't be grown; the text begins with the layer's number.

    Examples
    --------
    >>> layer_from({"thickness": "6.2 nm", "material": "GaAs"}, 1)
    Layer('6.2 nm', 'GaAs')
    """
    check_keys(entries, LAYER_KEYS, place(number, entries))
    return numbered_layer(number, **entries)


def entries_of(layer: Layer, number: int) -> dict[str, Any]:
    """Return the mapping that `layer_from` reads as this layer, values as texts and floats.

    Points are lists of ``[depth, value]``; only they are longer than a pair of scalars.

    Raises
    ------
    StackFileError
        If a value along the layer is a callable, which only Python can hold.
    """
    entries: dict[str, Any] = {}
    if layer.label is not None:
        entries["label"] = layer.label
    if layer.material is not None:
        entries["material"] = layer.material
    entries["thickness"] = q.length_text(layer.thickness)
    for key, shape in layer.shapes:
        entries[key] = _shape_value(key, shape, place(number, entries))
    if any(isinstance(shape, Quadratic) for _, shape in layer.shapes):
        entries["grading"] = "quadratic"
    if layer.field is not None:
        entries["field"] = q.field_text(layer.field)
    for key in DOPING:
        density = getattr(layer, key)
        if density is not None:
            entries[key] = q.density_text(density)
    if layer.interface_width is not None:
        entries["interface_width"] = _nm(layer.interface_width)
    return entries


def _nm(length: float) -> str:
    return q.length_text(q.Length(length, "nm"))


def _shape_value(key: str, shape: Shape, where: str) -> Any:
    text = SHAPED[key]
    if isinstance(shape, Function):
        raise StackFileError(
            f"{key} is a callable, which can't be written; write the tabulated copy that"
            " stackfile.tabulated(stack, points=101) returns",
            where,
        )
    if isinstance(shape, Flat):
        return text(shape.value)
    if isinstance(shape, Points):
        pairs = zip(shape.depths_nm, shape.values, strict=True)
        return [[q.length_text(depth), text(value)] for depth, value in pairs]
    return [text(shape.first), text(shape.last)]


def settings(stack: Stack) -> dict[str, Any]:
    """Return what a stack says beyond its layers, as arguments of `Stack` in texts.

    What is as it would be without a word is left out.

    Parameters
    ----------
    stack : Stack

    Returns
    -------
    dict
        ``Stack(stack.layers, **settings(stack)) == stack``.

    Examples
    --------
    >>> settings(Stack([Layer("6.2 nm", "GaAs")], temperature="77 K", field="12 kV/cm"))
    {'temperature': '77 K', 'field': '12 kV/cm'}
    """
    texts: dict[str, Callable[[Any], Any]] = {
        "temperature": q.temperature_text,
        "field": q.field_text,
        "bias": q.voltage_text,
        "ends": list,
        "materials": list,
        "interface_width": _nm,
        "segregation": dict,
    }
    absent = {
        "temperature": 300.0, "ends": ("open", "open"), "materials": (), "segregation": (),
    }  # fmt: skip
    found: dict[str, Any] = {}
    for key in STACK_KEYS:
        value = getattr(stack, key)
        if value != absent.get(key):
            found[key] = texts[key](value) if key in texts else value
    return found
