"""A stack as a list of steps: layers, groups that begin and end, interruptions."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping
from typing import Any, NamedTuple

from .. import quantities as q
from ..errors import BandwrightError, GrowthError, UnknownName, close_matches
from ..stack import PLANES, Layer, Repeat, Stack, layer_name
from ..stackfile.keys import entries_of
from ..stackfile.shapetext import shape_text
from .films import Film
from .rates import Deposit, Reactor

LAYER = "layer"
REPEAT = "repeat"
END = "end of repeat"
INTERRUPTION = "interruption"
PLANE = "delta doping"

#: how far a fraction may be off before a caution says so
SAID = 1e-3


class Step(NamedTuple):
    """One line of a growth sheet.

    Parameters
    ----------
    step : str
        ``"layer"``, ``"repeat"``, ``"end of repeat"``, ``"interruption"``, or ``"delta doping"``
        of the face on which the next layer is grown.
    depth : int
        How many groups it is inside of.
    times : int or None
        Of a repeat and its end.
    number : int or None
        Of the written layer, from 1 in growth order.
    entries : dict
        The layer as a stack file writes it, shapes as one text.
    thickness_nm, thickness_ML : float or None
        As designed; ML of the strained film.
    whole_ML : int or None
    rounding_nm : float or None
        How much thicker the whole monolayers are.
    monolayer_nm : float or None
        Height of one.
    total_nm : float or None
        Sum down to this line, first copies of groups that have not ended.
    cells, implied, difference, rate_ML_per_s : str, str, float, float or None
        As `rates.Deposit` has them.
    time_s : float or None
        How long the shutters are open, or the interruption lasts.
    """

    step: str
    depth: int
    times: int | None = None
    number: int | None = None
    entries: Mapping[str, Any] = {}
    thickness_nm: float | None = None
    thickness_ML: float | None = None
    whole_ML: int | None = None
    rounding_nm: float | None = None
    monolayer_nm: float | None = None
    total_nm: float | None = None
    cells: str | None = None
    implied: str | None = None
    difference: float | None = None
    rate_ML_per_s: float | None = None
    time_s: float | None = None


class Walk(NamedTuple):
    """What decides the steps beside the stack.

    ``pauses`` holds seconds by the number of the layer they follow; ``within`` is the largest
    error of a fraction that is accepted.
    """

    films: Mapping[int, Film]
    reactor: Reactor | None
    whole: bool
    turned: bool
    pauses: Mapping[int, float]
    within: float


def read_pauses(given: object, stack: Stack) -> dict[int, float]:
    """Return the interruption after each written layer [s], by its number.

    A single time is for every layer but the one that is grown last.

    Raises
    ------
    UnknownName
        If no layer has a name that is given.
    QuantityError
        If a time can't be read.
    """
    written = stack.written()
    if given is None:
        return {}
    if not isinstance(given, Mapping):
        seconds = q.as_duration(given, "interruption")
        last = written[-1]
        outside = len(last.path) == 1
        return {w.number: seconds for w in written if not (outside and w is last)}
    pauses: dict[int, float] = {}
    for name, value in given.items():
        seconds = q.as_duration(value, f"interruption after {name!r}")
        numbers = [w.number for w in written if name in (w.layer.label, f"layer {w.number}")]
        if not numbers:
            known = [w.layer.label or f"layer {w.number}" for w in written]
            raise UnknownName(f"no layer {name!r}{close_matches(name, known)}", "interruption")
        pauses |= dict.fromkeys(numbers, seconds)
    return pauses


def steps_of(stack: Stack, walk: Walk) -> list[Step]:
    """Return the steps of a stack in the order in which they are listed.

    Raises
    ------
    GrowthError
        If a layer can't be grown by the calibrations; the text names it.
    StackFileError
        If a value along a layer is a callable.
    """
    found: list[Step] = []
    _add(stack.layers, 0, 1, walk, found)
    if walk.turned:
        swapped = {REPEAT: END, END: REPEAT}
        found = [step._replace(step=swapped.get(step.step, step.step)) for step in found[::-1]]
    return _with_totals(found, walk.whole)


def _add(
    layers: Iterable[Layer | Repeat], depth: int, number: int, walk: Walk, found: list[Step]
) -> int:
    """Add the steps of layers and groups; return the number of the next written layer."""
    for entry in layers:
        if isinstance(entry, Repeat):
            found.append(Step(REPEAT, depth, entry.times))
            number = _add(entry.layers, depth + 1, number, walk, found)
            found.append(Step(END, depth, entry.times))
            continue
        step = _layer(entry, depth, number, walk)
        planes = {key: step.entries[key] for key in PLANES if key in step.entries}
        if planes:
            found.append(Step(PLANE, depth, entries=planes))
            bare = {key: value for key, value in step.entries.items() if key not in planes}
            step = step._replace(entries=bare)
        found.append(step)
        if number in walk.pauses:
            found.append(Step(INTERRUPTION, depth, time_s=walk.pauses[number]))
        number += 1
    return number


def _layer(layer: Layer, depth: int, number: int, walk: Walk) -> Step:
    listed = layer.reversed() if walk.turned else layer
    entries = {
        key: shape_text(value) if isinstance(value, list) else value
        for key, value in entries_of(listed, number).items()
    }
    step = Step(LAYER, depth, number=number, entries=entries)
    film = walk.films.get(number)
    value, unit = layer.thickness
    if film is None:
        if walk.reactor is not None:
            raise GrowthError(
                "own numbers without a formula, so there is no growth time; write its material,"
                " or leave the calibrations out",
                layer_name(number, layer),
            )
        return step._replace(thickness_nm=value)
    height = film.monolayer_nm
    nm, ml = (value, value / height) if unit == "nm" else (value * height, value)
    whole = max(1, math.floor(ml + 0.5))
    step = step._replace(
        thickness_nm=nm, thickness_ML=ml, whole_ML=whole, rounding_nm=(whole - ml) * height,
        monolayer_nm=height,
    )  # fmt: skip
    if walk.reactor is None or film.composition is None:
        return step
    try:
        deposit = walk.reactor.deposit(film)
        _check(deposit, layer, walk.within)
    except BandwrightError as error:
        raise error.at(layer_name(number, layer)) from None
    return step._replace(
        cells=deposit.source, implied=deposit.implied, difference=deposit.difference,
        rate_ML_per_s=deposit.rate, time_s=(whole if walk.whole else ml) / deposit.rate,
    )  # fmt: skip


def _check(deposit: Deposit, layer: Layer, within: float) -> None:
    if deposit.difference is not None and abs(deposit.difference) > within:
        raise GrowthError(
            f"the cells can't give {layer.material}: the nearest is {deposit.implied} by"
            f" {deposit.source}, {abs(deposit.difference):.3g} off in {deposit.element}; mend the"
            f" rates, or accept it by within = {math.ceil(abs(deposit.difference) * 100) / 100:g}"
        )


def _with_totals(steps: list[Step], whole: bool) -> list[Step]:
    """Return the steps with the thickness down to each; the end of a group has all its copies."""
    found: list[Step] = []
    begun: list[float] = []
    total = 0.0
    for step in steps:
        if step.step == REPEAT:
            begun.append(total)
        elif step.step == END:
            start = begun.pop()
            total = start + (step.times or 1) * (total - start)
            step = step._replace(total_nm=total)
        elif step.step == LAYER:
            total += grown_nm(step, whole)
            step = step._replace(total_nm=total)
        found.append(step)
    return found


def grown_nm(step: Step, whole: bool) -> float:
    """Return how thick a layer is grown [nm]."""
    if whole and step.whole_ML is not None and step.monolayer_nm is not None:
        return step.whole_ML * step.monolayer_nm
    return step.thickness_nm or 0.0


def total(steps: Iterable[Step], amount: Callable[[Step], float]) -> float:
    """Return the sum over every step as often as it is done."""
    sums = [0.0]
    for step in steps:
        if step.step == REPEAT:
            sums.append(0.0)
        elif step.step == END:
            inside = sums.pop()
            sums[-1] += (step.times or 1) * inside
        else:
            sums[-1] += amount(step)
    return sums[0]
