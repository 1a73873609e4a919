"""Stack -> Profile: layers looked up, zero, bands and field applied."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..errors import BandwrightError, MaterialError, StackError
from ..formula import parse
from ..materials import Library
from ..stack import Stack, Written
from .curves import least, smaller
from .layers import Built, build_layer
from .sections import Number, Profile, Section, Unlike


@dataclass(frozen=True)
class Blueprint:
    """An `Origin` that builds a stack's profile when it is first asked for."""

    stack: Stack
    bands: str | None = None

    @cached_property
    def profile(self) -> Profile:
        """The profile."""
        return build_profile(self.stack, self.bands)


def build_profile(
    stack: Stack,
    bands: str | None = None,
    *,
    substrate_lattice: float | None = None,
    known: dict[object, Built] | None = None,
    designs: int | None = None,
) -> Profile:
    """Return the profile of a stack.

    Parameters
    ----------
    stack : Stack
    bands : str, optional
        ``"one-band"`` or ``"two-band"`` instead of the stack's own choice.
    substrate_lattice : float, optional
        Lattice constant of the substrate [nm] instead of its material's own.
    known : dict, optional
        Keeps layers once looked up, for profiles of stacks that share most of their layers and
        their material files.
    designs : int, optional
        How many designs the stack stands for, each of its numbers an array of this length, as
        `bandwright.profile.alike` writes it.

    Returns
    -------
    Profile
        Edges count from the stack's zero and hold all fields.

    Raises
    ------
    StackError
        If zero, bands or a layer's shape can't be settled; the text names the layer.
    MaterialError
        If a material gives no number that is needed.
    Unlike
        If many designs differ in kind.
    """
    library = Library.with_files(stack.materials) if stack.materials else Library.shipped()
    if substrate_lattice is not None:
        library = library.on_lattice(substrate_lattice)
    every = stack.written()
    two_band = _choose_bands(every, bands or stack.bands)
    built: dict[int, Built] = {}
    around = (stack.temperature, stack.substrate, substrate_lattice, two_band)
    for one in every:
        key = None if known is None else (one.layer, one.name, around)
        found = None if known is None else known.get(key)
        if found is None:
            try:
                found = build_layer(one.layer, one.name, stack, library, two_band)
            except BandwrightError as error:
                raise error.at(one.name) from None
            if known is not None:
                known[key] = found
        built[one.number] = found
    real = bool(stack.interface_width or stack.segregation) or any(
        one.layer.interface_width for one in every
    )
    if real and designs is not None:
        raise Unlike("where interfaces are wide, designs are built one by one")
    facts = tuple(one.facts for one in built.values())
    if any(one.copies > 1 for one in every):
        written = tuple(number - 1 for _, number in stack.grown())
        layers = [built[number + 1] for number in written]
    else:
        written = tuple(range(len(every)))
        layers = list(built.values())
    shift, words = _zero(stack, layers, library)
    if real:
        from .spreading import spread  # stacks of abrupt interfaces need none of it

        if stack.zero is None or any(one.label == stack.zero for one in layers):
            words += ", were its interfaces abrupt"
        layers = spread(stack, layers, library, shift, two_band)
    field = _field(stack, sum(one.facts.thickness for one in layers))
    return Profile(
        _sections(layers, shift, field), stack.ends, field,
        "two-band" if two_band else "one-band", words, facts, written, designs,
    )  # fmt: skip


def _choose_bands(every: Sequence[Written], asked: str | None) -> bool:
    """Return whether the two-band model holds; every layer must then give its gap."""
    lacking = [
        one.name
        for one in every
        if one.layer.material is None
        and one.layer.gap is None
        and one.layer.nonparabolicity is None
    ]
    if asked == "one-band":
        return False
    if not lacking:
        return True
    if asked is None and len(lacking) == len(every):
        return False
    need = "bands = 'two-band' needs" if asked else "some layers give a gap and some do not:"
    raise StackError(
        f"{need} a gap or nonparabolicity in every layer; missing in {', '.join(lacking)};"
        " add gap = '... eV' there, or say bands = 'one-band'"
    )


def _zero(
    stack: Stack, layers: Sequence[Built], library: Library
) -> tuple[tuple[Number, Number], str]:
    """Return what to take off material edges and off own edges [eV], and zero in words."""
    mixed = len({one.facts.own for one in layers}) == 2
    own = all(one.facts.own for one in layers)
    if stack.zero is None:
        if mixed:
            raise StackError(
                "zero: own edges stand beside materials, so zero must be named: a material"
                " (zero = 'GaAs') or the label of a material layer, from which own edges count"
            )
        low = _lowest(layers)
        return (low, low), "the lowest band edge of the stack"
    labelled = [one for one in layers if one.label == stack.zero]
    if labelled:
        return _zero_at_label(stack.zero, layers, labelled, mixed, own)
    try:
        point = library.properties(parse(stack.zero), stack.temperature, stack.substrate)
        edge = float(point.edge)
    except MaterialError as error:
        known = sorted({one.label for one in layers if one.label})
        extra = f"; labels here: {', '.join(known)}" if known else "; no layer has a label"
        raise StackError(f"zero = {stack.zero!r} is neither a label nor a material:"
                         f" {error.message}{extra}") from None  # fmt: skip
    strained = f", strained to {stack.substrate}" if stack.substrate else ""
    return (edge, 0.0), f"the conduction edge of {stack.zero}{strained}"


def _zero_at_label(
    label: str, layers: Sequence[Built], labelled: Sequence[Built], mixed: bool, own: bool
) -> tuple[tuple[Number, Number], str]:
    edges = [one.first_edge for one in labelled]
    every = np.array(np.broadcast_arrays(*edges))
    low, high = every.min(axis=0), every.max(axis=0)
    apart = np.argmax(high - low)
    if np.ravel(high - low)[apart] > 1e-12:
        raise StackError(
            f"zero = {label!r}: layers of this label have different edges"
            f" ({np.ravel(low)[apart]:.6g} to {np.ravel(high)[apart]:.6g} eV); give one of them a"
            " label of its own"
        )
    if mixed and labelled[0].facts.own:
        raise StackError(
            f"zero = {label!r} is a layer with its own edge, which counts from zero itself;"
            " name a material or a material layer's label"
        )
    potential: Number = 0.0
    for one in layers:
        if one is labelled[0]:
            break
        potential = potential + one.field * one.facts.thickness
    shift = edges[0] + potential
    words = f"the first-grown face of {label!r}"
    return (shift, shift if own else potential), words


def _lowest(layers: Sequence[Built]) -> Number:
    """Return the lowest edge [eV], internal fields included."""
    low: Number = float("inf")
    potential: Number = 0.0
    for one in layers:
        start: Number = 0.0
        for piece in one.pieces:
            tilted = piece.edge.plus(potential + one.field * start, one.field)
            low = smaller(low, least(tilted, piece.thickness))
            start = start + piece.thickness
        potential = potential + one.field * one.facts.thickness
    return low


def _field(stack: Stack, thickness: Number) -> Number:
    """Return the stack's field along growth [V/nm], an electron's energy slope [eV/nm]."""
    bias = stack.signed_bias
    if bias is not None:
        return -bias / thickness
    return 0.0 if stack.signed_field is None else stack.signed_field


def _sections(
    layers: Sequence[Built], shift: tuple[Number, Number], field: Number
) -> tuple[Section, ...]:
    """Return all sections with zero, internal fields and the stack's field in their edges."""
    sections = []
    potential: Number = 0.0
    position: Number = 0.0
    for index, one in enumerate(layers):
        start: Number = 0.0
        for piece in one.pieces:
            constant = (
                potential + one.field * start + field * (position + start)
                - shift[1 if one.facts.own else 0]
            )  # fmt: skip
            slope = one.field + field
            edge = piece.edge.plus(constant, slope)
            sections.append(Section(piece.thickness, edge, piece.mass, piece.inverse_gap, index))
            start = start + piece.thickness
        potential = potential + one.field * one.facts.thickness
        position = position + one.facts.thickness
    return tuple(sections)
