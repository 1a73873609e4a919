"""Segregation: elements that float on the growing surface, exponential in the monolayers grown.

Of what lies on the surface a share R goes on to the next monolayer (Muraki, Fukatsu, Shiraki, Ito,
Appl. Phys. Lett. 61, 557, 1992). The fraction X(z) built in then follows the one arriving, x(z), as

    L dX/dz = x - X ,   L = -d / ln R ,

d the monolayer: for a layer of N monolayers, x0 (1 - R^n) in it and x0 (1 - R^N) R^(n - N) above,
at n monolayers from its first-grown face, whole or not. All that arrives is built in, or floats at
the end. Other elements of the sublattice fill its remaining sites in the order in which they
arrive: of them as much is built in below z as there are sites,

    int (1 - X) = int (1 - x) + L X  below z ,

so that each keeps its amount, and a face of theirs moves down by what floats there.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import Protocol

import numpy as np
import numpy.typing as npt
from scipy.special import log_ndtr, ndtr

from ..errors import StackError
from ..shapes import Function
from ..stack import Layer
from .sections import Floats

Element = tuple[int, str]
Indices = npt.NDArray[np.int64]

#: cuts above a face, in decay lengths
TAIL = (3.0, 6.0, 10.0, 15.0, 22.0, 30.0)
#: beyond so many standard deviations, or decay lengths, nothing is left to rounding
_FELT, _TAIL_FELT = 9.0, 40.0
_SITES_LEFT = 1e-9
_STEPS = 100
#: how well a source is found [nm]
_CLOSE = 1e-12


class Asked(Protocol):
    """A material layer as asked for."""

    @property
    def layer(self) -> Layer:
        """The layer as written."""
        ...

    @property
    def thickness(self) -> float:
        """[nm]."""
        ...

    def fractions(self, depth: Floats) -> dict[Element, Floats]:
        """Return the fraction of each (sublattice, element) at depths [nm]."""
        ...


@dataclass(frozen=True, eq=False)
class Carried:
    """All fractions of a stack with its segregation and its interfaces.

    Attributes
    ----------
    starts : array (n_stretches,)
        Where stretches begin on which fractions are parabolas at most [nm].
    top : float
        The last face [nm].
    arriving : dict
        Coefficients (n_stretches, 3) of each element's fraction by the depth in a stretch.
    places, widths : array (n_spread,)
        Interfaces that are not abrupt: where, and standard deviations [nm].
    steps : dict
        Of each element's fraction there, (n_spread,).
    decay : dict
        Decay length of each element that segregates [nm].
    """

    starts: Floats
    top: float
    arriving: dict[Element, Floats]
    places: Floats
    widths: Floats
    steps: dict[Element, Floats]
    decay: dict[Element, float]

    def fractions(self, z: Floats) -> dict[Element, Floats]:
        """Return the fraction of each (sublattice, element) built in at places [nm]."""
        found: dict[Element, Floats] = {}
        for site in (0, 1):
            names = [element for element in self.arriving if element[0] == site]
            floating = [element for element in names if element in self.decay]
            found |= {element: self._built_in(element, z) for element in floating}
            still = [element for element in names if element not in self.decay]
            left = 1.0 - sum((found[element] for element in floating), np.zeros_like(z))
            if len(still) == 1:
                found[still[0]] = left
            elif still:
                source = self.source(site, z) if floating else z
                parts = np.array([self.arrived(element, source) for element in still])
                total = parts.sum(axis=0)
                if np.any((total < _SITES_LEFT) & (left > _SITES_LEFT)):
                    raise StackError(
                        f"segregation: {' and '.join(name for _, name in still)} fill sites where"
                        " none of them arrives; grow layers of nothing but what segregates beside"
                        " only one other element"
                    )
                found |= dict(zip(still, left * parts / np.maximum(total, 1e-300), strict=True))
        return found

    def arrived(self, element: Element, z: Floats) -> Floats:
        """Return the fraction arriving at places [nm], interfaces spread."""
        index, depth = self._stretch(z)
        a, b, c = self.arriving[element][index].T
        found = a + depth * (b + depth * c)
        for place, width, step in self._spread(element, z):
            far = (z - place) / width
            found = found + step * np.where(z >= place, -ndtr(-far), ndtr(far))
        return np.asarray(found)

    def source(self, site: int, z: Floats) -> Floats:
        """Return where what is built in at places was to be: sites below met by supply [nm]."""
        floating = [element for element in self.decay if element[0] == site]
        target = self._supply(floating, z) + self._afloat(floating, z)
        low, high = z.copy(), np.full_like(z, self.top)
        guess = z.copy()
        for _ in range(_STEPS):
            miss = self._supply(floating, guess) - target
            low, high = np.where(miss < 0.0, guess, low), np.where(miss < 0.0, high, guess)
            rate = 1.0 - sum((self.arrived(e, guess) for e in floating), np.zeros_like(z))
            with np.errstate(divide="ignore", invalid="ignore"):
                new = guess - miss / rate
            new = np.where((new >= low) & (new <= high), new, 0.5 * (low + high))
            if np.all(np.abs(new - guess) <= _CLOSE):
                break
            guess = new
        return np.asarray(guess)

    def moved(self, site: int, places: Floats) -> Floats:
        """Return where what was to be at places [nm] is built in: lower, by what floats."""
        floating = [element for element in self.decay if element[0] == site]
        target = self._supply(floating, places)
        low, high = np.zeros_like(places), places.copy()
        for _ in range(60):
            middle = 0.5 * (low + high)
            above = self._supply(floating, middle) + self._afloat(floating, middle) >= target
            low, high = np.where(above, low, middle), np.where(above, middle, high)
        return np.asarray(high)

    def _stretch(self, z: Floats) -> tuple[Indices, Floats]:
        index = np.clip(np.searchsorted(self.starts, z, side="right") - 1, 0, None)
        return index, z - self.starts[index]

    def _spread(
        self, element: Element, z: Floats, tail: float = 0.0
    ) -> list[tuple[float, float, float]]:
        """Return place, width and step of the interfaces that places may feel."""
        steps = self.steps.get(element, np.zeros(len(self.places)))
        if not z.size:
            return []
        reach = _FELT * self.widths
        low, high = self.places - reach, self.places + np.maximum(reach, tail)
        felt = np.flatnonzero((steps != 0.0) & (low < z.max()) & (high > z.min()))
        return [(float(self.places[i]), float(self.widths[i]), float(steps[i])) for i in felt]

    @cached_property
    def _particular(self) -> dict[Element, Floats]:
        """What X would be long after each stretch began, as coefficients like `arriving`."""
        found = {}
        for element, length in self.decay.items():
            a, b, c = self.arriving[element].T
            found[element] = np.column_stack(
                (a - length * b + 2.0 * c * length**2, b - 2.0 * length * c, c)
            )
        return found

    @cached_property
    def _states(self) -> dict[Element, Floats]:
        """X of each floating element where stretches begin; the first goes on from before."""
        found = {}
        spans = np.diff(self.starts)
        for element, length in self.decay.items():
            a, b, c = self._particular[element].T
            state = [float(self.arriving[element][0, 0])]
            for index, span in enumerate(spans):
                late = a[index] + span * (b[index] + span * c[index])
                state.append(float(late + (state[-1] - a[index]) * math.exp(-span / length)))
            found[element] = np.array(state)
        return found

    def _built_in(self, element: Element, z: Floats) -> Floats:
        """Return the fraction of a floating element built in at places [nm]."""
        length = self.decay[element]
        index, depth = self._stretch(z)
        a, b, c = self._particular[element][index].T
        rest = self._states[element][index] - a
        found = a + depth * (b + depth * c) + rest * np.exp(-depth / length)
        for place, width, step in self._spread(element, z, _TAIL_FELT * length):
            t, v = z - place, width / length
            carried = np.exp(0.5 * v * v - t / length + log_ndtr(t / width - v))
            above = np.exp(-np.maximum(t, 0.0) / length) - ndtr(-t / width)
            found = found + step * (np.where(t >= 0.0, above, ndtr(t / width)) - carried)
        return np.asarray(found)

    def _afloat(self, elements: Sequence[Element], z: Floats) -> Floats:
        """Return what of some elements floats at places, over what did at first [nm]."""
        total = np.zeros_like(z)
        for element in elements:
            built = self._built_in(element, z) - self._states[element][0]
            total = total + self.decay[element] * built
        return total

    def _supply(self, elements: Sequence[Element], z: Floats) -> Floats:
        """Return what of all but some elements arrived below places [nm]."""
        index, depth = self._stretch(z)
        total = z.copy()
        for element in elements:
            a, b, c = self.arriving[element].T
            span = np.diff(self.starts)
            whole = span * (a[:-1] + span * (b[:-1] / 2.0 + span * c[:-1] / 3.0))
            below = np.concatenate(([0.0], np.cumsum(whole)))[index]
            part = depth * (a[index] + depth * (b[index] / 2.0 + depth * c[index] / 3.0))
            total = total - below - part
            for place, width, step in self._spread(element, z):
                far = np.abs(z - place) / width
                bell = np.exp(-0.5 * far * far) / math.sqrt(2.0 * math.pi)
                total = total - step * width * (bell - far * ndtr(-far))
        return np.asarray(total)


def carried(
    nominals: Sequence[Asked], monolayers: Sequence[float], shares: Sequence[tuple[str, float]],
    steps: Sequence[Mapping[Element, float]], widths: Floats,
) -> Carried:  # fmt: skip
    """Return the fractions of grown layers, all of materials.

    Parameters
    ----------
    nominals : sequence
        The grown layers as asked for.
    monolayers : sequence of float
        Of each [nm].
    shares : sequence of (element, R)
    steps : sequence of dict
        Each layer's fractions at its first-grown face over those of the layer before.
    widths : array (n_layers,)
        Standard deviation of each first-grown face [nm].

    Raises
    ------
    StackError
        If a fraction is a callable.
    """
    starts, rows, origin = [], [], 0.0
    amounts: dict[Element, Floats] = {}
    for index, one in enumerate(nominals):
        for start, stop in pairwise(_kinks(one)):
            span = stop - start
            inside = one.fractions(start + span * np.array([0.25, 0.5, 0.75]))
            row = {}
            for element, (p, q, r) in inside.items():
                bend, slope = 8.0 * (p - 2.0 * q + r), 2.0 * (r - p)  # about the middle
                row[element] = (
                    q - slope / 2.0 + bend / 4.0, (slope - bend) / span, bend / span**2,
                )  # fmt: skip
                held = amounts.setdefault(element, np.zeros(len(nominals)))
                held[index] += (q + bend / 12.0) * span
            starts.append(origin + start)
            rows.append(row)
        origin += one.thickness
    none = (0.0, 0.0, 0.0)
    decay = {}
    for element, held in amounts.items():
        share = dict(shares).get(element[1])
        if share is not None and held.any():
            decay[element] = float(held @ np.array(monolayers) / held.sum()) / -math.log(share)
    faces = np.concatenate(([0.0], np.cumsum([one.thickness for one in nominals])))
    spread = np.flatnonzero(widths[1:] > 0.0) + 1
    return Carried(
        np.array(starts), origin,
        {element: np.array([row.get(element, none) for row in rows]) for element in amounts},
        faces[spread], widths[spread],
        {e: np.array([steps[int(face)].get(e, 0.0) for face in spread]) for e in amounts},
        decay,
    )  # fmt: skip


def _kinks(one: Asked) -> list[float]:
    """Return the depths in a layer between which its fractions are parabolas at most."""
    kinks = {0.0, one.thickness}
    for _, shape in one.layer.fractions:
        if isinstance(shape, Function):
            raise StackError(
                "segregation needs flat or graded fractions or tables of points, and one here is a"
                " callable; take the copy that stackfile.tabulated(stack) returns"
            )
        kinks |= set(shape.breaks(one.thickness))
    return sorted(kinks)
