"""What was solved: the facts that stand at the head of every output."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..errors import BandwrightError
from ..quantities import field_text, number_text, temperature_text, voltage_text
from ..stackline import line_text

if TYPE_CHECKING:
    from ..levels import Levels
    from ..stack import Stack

Fact = tuple[str, str]

SAFETY = (
    "Infrared emission is invisible and can injure eyes; defer to the site's rules, its "
    "laser-safety officer, IEC 60825-1 and local codes."
)


def grown(stack: Stack) -> str:
    """Return the layers in growth order, materials as formulas.

    Examples
    --------
    >>> from bandwright.stackline import parse_line
    >>> grown(parse_line("30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As"))
    '30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As'
    """
    try:
        return line_text(stack)
    except BandwrightError:
        return ", ".join(
            f"{layer.thickness.value:g} {layer.thickness.unit} {layer.material or 'own numbers'}"
            for layer, _ in stack.grown()
        )


def held_at(temperature: float, substrate: str | None) -> str:
    """Return the temperature [K] and what the layers are strained to.

    Examples
    --------
    >>> held_at(77.0, "GaAs"), held_at(300.0, None)
    ('77 K, strained to GaAs', '300 K, unstrained (no substrate named)')
    """
    state = f"strained to {substrate}" if substrate else "unstrained (no substrate named)"
    return f"{temperature_text(temperature)}, {state}"


def ends(first: str, last: str) -> str:
    """Return how the stack ends, first-grown side first.

    Examples
    --------
    >>> ends("open", "open"), ends("wall", "open")
    ('open at both faces', 'wall at the substrate side, open at the surface side')
    """
    if first == last:
        return "periodic" if first == "periodic" else f"{first} at both faces"
    return f"{first} at the substrate side, {last} at the surface side"


def direction(levels: Levels) -> str:
    """Return which way electrons run."""
    way = levels.direction
    return f"run {way}" if way.startswith("to ") else way


def drive(stack: Stack) -> str:
    """Return what drives the electrons of a stack that is not solved yet, and where.

    Examples
    --------
    >>> from bandwright.stackline import parse_line
    >>> drive(parse_line("6.2 nm GaAs", field="12 kV/cm"))
    'electrons run to the substrate (12 kV/cm)'
    """
    if stack.signed_field:
        side = "substrate" if stack.signed_field > 0.0 else "surface"
        return f"electrons run to the {side} ({field_text(abs(stack.signed_field))})"
    if stack.signed_bias:
        side = "surface" if stack.signed_bias > 0.0 else "substrate"
        return f"electrons run to the {side} ({voltage_text(abs(stack.signed_bias))})"
    return "no field"


def completeness(levels: Levels) -> str:
    """Return how many levels there are, between which bounds, and whether any may be missing."""
    low, high = (f"{1e3 * bound:.1f} meV".replace("-0.0 ", "0.0 ") for bound in levels.bounds)
    count = len(levels.energies)
    noun = "level" if count == 1 else "levels"
    if levels.method != "shooting":
        by = levels.method.replace("-", " ")
        return f"{count} {noun} below {high} by the {by} alone, none counted"
    proof = "none missing by count" if levels.complete else "the counts do not prove it complete"
    return f"{count} {noun} between {low} and {high}, {proof}"


def interfaces(stack: Stack) -> str:
    """Return in words how a stack's interfaces differ from abrupt ones.

    Examples
    --------
    >>> from bandwright.stack import Layer, Stack
    >>> interfaces(Stack([Layer("6 nm", "InAs")], interface_width="3 Å", segregation={"In": 0.8}))
    'error functions of standard deviation 0.3 nm; In segregates, 0.8 a monolayer goes on'
    """
    said = []
    if stack.interface_width:
        said.append(
            f"error functions of standard deviation {number_text(stack.interface_width)} nm"
        )
    if any(written.layer.interface_width is not None for written in stack.written()):
        said.append("some with a width of their own")
    said += [
        f"{element} segregates, {number_text(share)} a monolayer goes on"
        for element, share in stack.segregation
    ]
    return "; ".join(said)


def facts(levels: Levels) -> list[Fact]:
    """Return (label, text) pairs in the order they are read."""
    stack, profile = levels.stack, levels.profile
    return [
        ("electrons", direction(levels)),
        ("stack", stack.name or "without a name"),
        ("grown", grown(stack)),
        ("held at", held_at(stack.temperature, stack.substrate)),
        *([("interfaces", interfaces(stack))] if stack.realistic else []),
        ("model", profile.bands),
        ("energies", f"from {profile.zero}"),
        ("ends", ends(*profile.ends)),
        ("found", completeness(levels)),
    ]
