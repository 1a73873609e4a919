"""Which layers become pulses, and the stack with the pulses in their place."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from typing import NamedTuple

from .. import quantities as q
from ..errors import BandwrightError, StackError, UnknownName, close_matches
from ..levels import Levels
from ..materials import Library
from ..stack import PLANES, Layer, Repeat, Stack, Written
from .cells import Pulse, pulses_of
from .ends import Amounts, Ends, amounts, binaries, mixed


class Pulsed(NamedTuple):
    """A written layer and the pulses it is grown as.

    Parameters
    ----------
    number, name, copies : int, str, int
        Of the written layer.
    ends : Ends
    pulses : tuple of Pulse
    asked_nm : float
        Thickness as designed [nm].
    asked_ML : (float, float)
        Monolayers of each end in the layer as designed.
    heights_nm : (float, float)
        Height of a monolayer of each end [nm].
    indirect : tuple of str
        Ends whose lowest conduction edge is not the zone centre's.
    """

    number: int
    name: str
    copies: int
    ends: Ends
    pulses: tuple[Pulse, ...]
    asked_nm: float
    asked_ML: tuple[float, float]
    heights_nm: tuple[float, float]
    indirect: tuple[str, ...]

    @property
    def grown_ML(self) -> tuple[int, int]:
        """Whole monolayers of each end."""
        second = sum(pulse.monolayers for pulse in self.pulses if pulse.second)
        return sum(pulse.monolayers for pulse in self.pulses) - second, second

    @property
    def grown_nm(self) -> float:
        """Thickness of all pulses [nm]."""
        return sum(n * height for n, height in zip(self.grown_ML, self.heights_nm, strict=True))


def chosen(stack: Stack, names: object) -> list[Written]:
    """Return the layers that become pulses.

    Raises
    ------
    StackError
        If there is none, or what is given names no layers.
    UnknownName
        If no layer has a name.
    """
    written = stack.written()
    if names is None:
        alloys = [w for w in written if mixed(w.layer)]
        graded = [w for w in alloys if any(not s.constant for _, s in w.layer.fractions)]
        if not alloys:
            raise StackError("layers: no layer of the stack is an alloy, so none becomes pulses")
        return graded or alloys
    given = (names,) if isinstance(names, str) else names
    if not isinstance(given, Iterable) or not (wanted := list(given)):
        raise StackError(f"layers: got {q.show(names)}; give names such as 'grade' or 'layer 2'")
    found: dict[int, Written] = {}
    for name in wanted:
        some = [w for w in written if name in (w.layer.label, f"layer {w.number}")]
        if not some:
            known = [w.layer.label or f"layer {w.number}" for w in written]
            raise UnknownName(f"no layer {q.show(name)}{close_matches(str(name), known)}", "layers")
        found |= {w.number: w for w in some}
    return [found[number] for number in sorted(found)]


def pulsed(levels: Levels, one: Written, period: int, between: Ends | None) -> Pulsed:
    """Return a layer of a solved stack as pulses.

    Raises
    ------
    StackError, MaterialError, UnknownName
        If it has no two ends, or is too thin; the text names the layer.
    """
    stack, thickness = levels.stack, float(levels.profile.facts[one.number - 1].thickness)
    library = Library.with_files(stack.materials)
    try:
        if one.layer.material is None:
            raise StackError("own numbers hold no atoms; give the layer a material")
        ends = between or binaries(one.layer.material)
        points = [
            library.properties(end, stack.temperature, stack.substrate)
            for end in ends.compositions
        ]
        along = amounts(one.layer, thickness, ends, stack, library)
        pulses = pulses_of(along, period)
        if not pulses:
            raise StackError(
                f"{along.grown[-1]:.2g} monolayers thick, and less than half a monolayer of either"
                " end: too thin for pulses"
            )
    except BandwrightError as error:
        raise error.at(one.name) from None
    first, second = (float(point.monolayer) for point in points)
    indirect = tuple(name for name, p in zip(ends, points, strict=True) if not p.direct)
    return Pulsed(one.number, one.name, one.copies, ends, pulses, thickness, _totals(along),
                  (first, second), indirect)  # fmt: skip


def _totals(along: Amounts) -> tuple[float, float]:
    second = float(along.second[-1])
    return float(along.grown[-1]) - second, second


def digital_stack(stack: Stack, layers: Sequence[Pulsed]) -> Stack:
    """Return the stack with pulses in place of layers; groups stay groups.

    Where energies counted from the label of such a layer, they count from its first end.
    """
    by_number = {one.number: one for one in layers}
    every = _spliced(stack.layers, 1, by_number)[0]
    changes: dict[str, object] = {"layers": every}
    if zero_is_lost(stack, layers):
        changes["zero"] = layers[0].ends.first
    return stack.replace(**changes)


def zero_is_lost(stack: Stack, layers: Sequence[Pulsed]) -> bool:
    """Whether energies count from a label that only layers have that become pulses."""
    numbers = {one.number for one in layers}
    labelled = {w.number for w in stack.written() if w.layer.label == stack.zero}
    return stack.zero is not None and bool(labelled) and labelled <= numbers


def _spliced(
    layers: Iterable[Layer | Repeat], number: int, by_number: Mapping[int, Pulsed]
) -> tuple[list[Layer | Repeat], int]:
    """Return layers with pulses in place, and the number of the next written layer."""
    found: list[Layer | Repeat] = []
    for entry in layers:
        if isinstance(entry, Repeat):
            inside, number = _spliced(entry.layers, number, by_number)
            found.append(Repeat(entry.times, inside))
            continue
        found += _pulses(entry, by_number[number]) if number in by_number else [entry]
        number += 1
    return found, number


def _pulses(layer: Layer, one: Pulsed) -> list[Layer]:
    """Return a layer's pulses as layers; its field and doping go on, its label does not."""
    made: list[Layer] = []
    for place, pulse in enumerate(one.pulses):
        changes: dict[str, object] = {
            "thickness": q.Length(float(pulse.monolayers), "ML"),
            "material": one.ends[pulse.second],
            "x": None, "y": None, "label": None,
        }  # fmt: skip
        part = pulse.monolayers * one.heights_nm[pulse.second] / one.grown_nm
        for name in ("donors", "acceptors"):
            density = getattr(layer, name)
            if density is not None and density.kind == "sheet":
                changes[name] = density._replace(value=density.value * part)
        if place:
            changes |= dict.fromkeys((*PLANES, "interface_width"))  # of the layer's first face
        made.append(layer.replace(**changes))
    return made
