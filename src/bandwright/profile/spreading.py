"""Stacks whose interfaces are not abrupt: their sections, cut where interfaces begin and end."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Any

import numpy as np

from ..errors import BandwrightError, StackError
from ..materials import Library
from ..stack import Stack
from .curves import fit_depths, fitted
from .interfaces import Element, Nominal, Real, Rise, nominal
from .layers import Built, Piece
from .sections import ZERO, Curve, Floats
from .segregation import TAIL, Carried, carried

#: beyond this many standard deviations nothing is left of an interface (1e-9)
REACH = 6.0
#: sections within reach are at most this many standard deviations long
_SPAN = 2.0
#: cuts closer than this part of it are one
_NEAR = 0.1
#: shortest section where elements segregate [nm]
_LEAST = 1e-3
#: largest step where a layer meets its own plain part [eV]
_STEP = 1e-6
#: of the largest value, what counts as rounding in a section's series: of interfaces alone, and
#: with segregation, where rounding of places adds up
_NEGLIGIBLE, _CARRIED = 1e-13, 1e-11


@dataclass(frozen=True)
class _Along:
    """Edge, mass or inverse gap (0, 1, 2) at depths of one section of a grown layer."""

    real: Real
    index: int
    start: float
    rises: tuple[Rise, ...]
    which: int

    def __call__(self, depth: Floats) -> Floats:
        """Return the value at each depth [nm]."""
        flat = np.ravel(self.start + np.asarray(depth, dtype=float))
        found = self.real.numbers(self.index, flat, self.rises)[self.which]
        return np.asarray(found.reshape(np.shape(depth)))


def widths_of(stack: Stack) -> Floats:
    """Return the standard deviation of each grown layer's first-grown face [nm]."""
    general = stack.interface_width or 0.0
    own = [layer.interface_width for layer, _ in stack.grown()]
    return np.array([general if width is None else width for width in own])


def spread(
    stack: Stack, layers: Sequence[Built], library: Library, shift: tuple[Any, Any], two_band: bool
) -> list[Built]:
    """Return grown layers whose interfaces are as wide as the stack says.

    Parameters
    ----------
    stack : Stack
    layers : sequence of Built
        Its grown layers, abrupt.
    library : Library
    shift : pair of float
        What comes off edges of materials and off own edges [eV].
    two_band : bool

    Raises
    ------
    StackError
        If the interfaces are too wide for the layers, or the materials' files give mixtures
        another edge than their members.
    MaterialError, UnknownName
        If no file says how the materials of neighbours mix.
    """
    grown = stack.grown()
    real = _real(stack, layers, library, shift)
    if stack.segregation:
        return _segregated(stack, real, two_band)
    rises = _rises(stack, real.faces)
    known: dict[object, tuple[Piece, ...]] = {}
    found = []
    for index, ((_, number), built) in enumerate(zip(grown, layers, strict=True)):
        seen = _seen(rises, real.faces, index)
        key = number, *(
            (round(r.place, 9), r.width, *r[3:], grown[r.face - 1][1], grown[r.face][1])
            for r in seen
        )  # fmt: skip
        if key not in known:
            try:
                known[key] = _pieces(real, index, seen, two_band)
            except BandwrightError as error:
                raise error.at(built.facts.name) from None
        found.append(Built(known[key], built.facts, built.field, built.label))
    return found


def _real(stack: Stack, layers: Sequence[Built], library: Library, shift: tuple[Any, Any]) -> Real:
    known: dict[int, Nominal | None] = {}
    nominals = []
    for (layer, number), built in zip(stack.grown(), layers, strict=True):
        if number not in known:
            known[number] = nominal(layer, built, stack, library)
        nominals.append(known[number])
    steps: list[Mapping[Element, float]] = []
    jumps = np.zeros((len(layers), 3))
    for index, here in enumerate(nominals):
        before = nominals[index - 1]  # of the first the last, as between periodic ends
        if before is None or here is None:
            steps.append({})
            jumps[index] = _face(layers[index], shift) - _face(layers[index - 1], shift, last=True)
            continue
        old, new = before.fractions(np.array([before.thickness])), here.fractions(np.zeros(1))
        steps.append({
            e: float(new.get(e, np.zeros(1))[0] - old.get(e, np.zeros(1))[0])
            for e in {**old, **new}
        })  # fmt: skip
    thickness = [float(built.facts.thickness) for built in layers]
    faces = np.concatenate(([0.0], np.cumsum(thickness)))
    return Real(stack, library, tuple(nominals), tuple(layers), faces, tuple(steps), jumps)


def _segregated(stack: Stack, real: Real, two_band: bool) -> list[Built]:
    """Return grown layers with their elements carried on by segregation."""
    widths = widths_of(stack)
    nominals = [one for one in real.nominals if one is not None]
    if len(nominals) < len(real.layers):
        name = next(b.facts.name for b in real.layers if b.facts.own)
        raise StackError("own numbers hold no elements that segregate; give it a material", name)
    if stack.ends[0] == "periodic":
        raise StackError(
            "segregation: nothing is grown first between periodic ends; write some periods with"
            " ends = 'open' or 'wall'"
        )
    outer = min(nominals[0].thickness, nominals[-1].thickness)
    if REACH * max(widths[1:], default=0.0) > outer:
        raise StackError(
            f"interface_width: with segregation it must be less than a {REACH:.0f}th of the first"
            f" and of the last layer, here of {outer:.6g} nm"
        )
    monolayers = [built.facts.monolayer for built in real.layers]
    fractions = carried(nominals, monolayers, stack.segregation, real.steps, widths)
    real = replace(real, carried=fractions)
    cuts = _segregated_cuts(real, fractions, widths)
    found = []
    for index, built in enumerate(real.layers):
        low, high = real.faces[index], real.faces[index + 1]
        try:
            inside = cuts[(cuts > low) & (cuts < high)] - low
            bounds = [0.0, *inside.tolist(), built.facts.thickness]
            pieces = tuple(
                _piece(real, index, start, stop - start, (), two_band)
                for start, stop in pairwise(bounds)
            )
        except BandwrightError as error:
            raise error.at(built.facts.name) from None
        found.append(Built(pieces, built.facts, built.field, built.label))
    return found


def _segregated_cuts(real: Real, fractions: Carried, widths: Floats) -> Floats:
    """Return where sections end inside layers [nm]: kinks, tails, and faces moved down."""
    marks = np.arange(-REACH, REACH + 1.0, _SPAN)
    moving, still = [real.faces[:1]], [real.faces, fractions.starts]
    for face, width in enumerate(widths):
        if face and any(real.steps[face].values()):
            spread = real.faces[face] + (marks * width if width else np.zeros(1))
            moving.append(spread)
            still.append(spread)
            still += [
                real.faces[face] + length * np.array(TAIL) for length in fractions.decay.values()
            ]
    sites = {site for site, _ in fractions.decay}
    still += [fractions.moved(site, np.concatenate(moving)) for site in sorted(sites)]
    every = np.unique(np.concatenate(still))
    faces = set(real.faces.tolist())
    cuts: list[float] = []
    for cut in every.tolist():
        apart = min(abs(real.faces - cut))
        if cut not in faces and apart > _LEAST and (not cuts or cut - cuts[-1] > _LEAST):
            cuts.append(cut)
    return np.array(cuts)


def _face(built: Built, shift: tuple[Any, Any], *, last: bool = False) -> Floats:
    """Return edge, mass and inverse gap at a face of a layer, from the stack's zero."""
    piece = built.pieces[-1 if last else 0]
    depth = piece.thickness if last else 0.0
    edge = piece.edge.value(depth) - shift[1 if built.facts.own else 0]
    return np.array([edge, piece.mass.value(depth), piece.inverse_gap.value(depth)])


def _rises(stack: Stack, faces: Floats) -> list[Rise]:
    """Return all interfaces and their images, placed from the stack's first face."""
    widths, total = widths_of(stack), float(faces[-1])
    periodic = stack.ends[0] == "periodic"
    first = 0 if periodic else 1
    widest = max(widths[first:], default=0.0)
    if REACH * widest > total:
        raise StackError(
            f"interface_width: got '{widest:.6g} nm' in a stack of {total:.6g} nm; it must be less"
            f" than a {REACH:.0f}th of the whole"
        )
    found = []
    for face in range(first, len(widths)):
        place, width = float(faces[face]), float(widths[face])
        if width > 0.0:
            images = [(place, 1.0, 1.0)]
            if periodic:
                images += [(place - total, 1.0, 1.0), (place + total, 1.0, 1.0)]
            else:
                images += [(-place, 1.0, -1.0), (2.0 * total - place, -1.0, 1.0)]
            found += [Rise(at, width, face, sign, way, False) for at, sign, way in images]
    return found


def _seen(rises: Sequence[Rise], faces: Floats, index: int) -> tuple[Rise, ...]:
    """Return what reaches into a grown layer, with `before` as it is there."""
    low, high = float(faces[index]), float(faces[index + 1])
    middle = 0.5 * (low + high)
    return tuple(
        rise._replace(place=rise.place - low, before=rise.direction > 0.0 and rise.place < middle)
        for rise in rises
        if rise.place + REACH * rise.width > low and rise.place - REACH * rise.width < high
    )


def _pieces(real: Real, index: int, seen: tuple[Rise, ...], two_band: bool) -> tuple[Piece, ...]:
    """Return the sections of a grown layer, cut where interfaces begin, end, and bend."""
    built = real.layers[index]
    if not seen:
        return built.pieces
    kinks = np.concatenate(([0.0], np.cumsum([float(p.thickness) for p in built.pieces])))
    marks = np.arange(-REACH, REACH + 1.0, _SPAN)
    cuts = [(r.place + mark * r.width, r.width) for r in seen for mark in marks]
    kept = [float(kink) for kink in kinks]
    for cut, width in sorted(cuts):
        if all(abs(cut - other) > _NEAR * _SPAN * width for other in kept):
            if 0.0 < cut < kinks[-1]:
                kept.append(cut)
    plain = len(built.pieces) == 1 and all(c.degree == 0 for c in built.pieces[0][1:])
    found: list[Piece] = []
    whole = built.pieces[0]
    for start, stop in pairwise(sorted(kept)):
        middle = 0.5 * (start + stop)
        rises = tuple(r for r in seen if abs(middle - r.place) < REACH * r.width)
        if plain and not rises:
            found.append(Piece(stop - start, whole.edge, whole.mass, whole.inverse_gap))
        else:
            found.append(_piece(real, index, start, stop - start, rises, two_band))
    if plain:
        _check_joints(found, built)
    return tuple(found)


def _piece(
    real: Real, index: int, start: float, span: float, rises: tuple[Rise, ...], two_band: bool
) -> Piece:
    depth = fit_depths(span)
    values = real.numbers(index, start + depth, rises)
    least = _NEGLIGIBLE if real.carried is None else _CARRIED
    edge, mass, gap = (
        fitted(row, span, _Along(real, index, start, rises, which), least)
        for which, row in enumerate(values)
    )
    inverse_gap: Curve = gap if two_band else ZERO
    return Piece(span, edge, mass, inverse_gap)


def _check_joints(pieces: Sequence[Piece], built: Built) -> None:
    """Refuse materials whose mixture, as one part vanishes, is not the other part."""
    for one, other in pairwise(pieces):
        flat = one.edge.degree == 0, other.edge.degree == 0
        if flat[0] != flat[1]:
            step = abs(one.edge.value(one.thickness) - other.edge.value(0.0))
            if step > _STEP:
                raise StackError(
                    f"interface_width: its material files give the edge of {built.facts.material}"
                    f" {1e3 * step:.3g} meV away from that of its mixture with the neighbour as the"
                    " neighbour's part vanishes; leave this interface abrupt (interface_width ="
                    " '0 nm'), or mend the files"
                )
