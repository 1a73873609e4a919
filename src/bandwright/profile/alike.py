"""Many designs of one layout as one Profile, whose numbers are arrays (n_designs,)."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt

from ..stack import Stack
from ..stack.layout import filled
from .build import build_profile
from .curves import Series
from .sections import Curve, Floats, Number, Polynomial, Profile, Sampled, Section

Indices = npt.NDArray[np.int64]

def build_alike(stack: Stack, numbers: Floats, bands: str | None = None) -> Profile:
    """Return the profile of many designs of one stack's layout.

    Parameters
    ----------
    stack : Stack
        Any of the designs.
    numbers : array (n_numbers, n_designs)
        Each design's numbers, in the order of its layout.
    bands : str, optional
        As for `build_profile`.

    Raises
    ------
    StackError, MaterialError
        If any design can't be built.
    Unlike
        If the designs differ in kind.
    """
    profile = build_profile(filled(stack, numbers), bands, designs=numbers.shape[1])
    _ = profile.numbers  # says whether all are of one kind
    return profile


def together(profiles: Sequence[Profile]) -> Profile:
    """Return profiles of as many sections of the same kinds as one.

    Raises
    ------
    Unlike
        If they differ in kind.
    """
    first = profiles[0]
    sections = tuple(
        Section(
            np.array([section.thickness for section in same]),
            _joined([section.edge for section in same]),
            _joined([section.mass for section in same]),
            _joined([section.inverse_gap for section in same]),
            same[0].layer,
        )
        for same in zip(*(profile.sections for profile in profiles), strict=True)
    )
    field = np.array([profile.field for profile in profiles])
    joined = replace(first, sections=sections, field=field, designs=len(profiles))
    _ = joined.numbers
    return joined


def chosen(profile: Profile, designs: Indices) -> Profile:
    """Return some designs of a profile of many."""
    sections = tuple(
        Section(
            _of(section.thickness, designs),
            _of_curve(section.edge, designs),
            _of_curve(section.mass, designs),
            _of_curve(section.inverse_gap, designs),
            section.layer,
        )
        for section in profile.sections
    )
    return replace(
        profile, sections=sections, field=_of(profile.field, designs), designs=len(designs)
    )


@dataclass(frozen=True, slots=True)
class _Beside:
    """Curves of any kind, one a design."""

    curves: tuple[Curve, ...]

    def __call__(self, depth: Floats) -> Floats:
        """Return each design's values at its depths [nm], designs along the last axis."""
        depth = np.asarray(depth, dtype=float)
        full = np.broadcast_to(depth, np.broadcast_shapes(depth.shape, (len(self.curves),)))
        return np.stack([c.at(full[..., i]) for i, c in enumerate(self.curves)], axis=-1)


def _joined(curves: Sequence[Curve]) -> Curve:
    if all(isinstance(curve, Polynomial) for curve in curves):
        return Polynomial(_padded([c.coefficients for c in curves if isinstance(c, Polynomial)]))
    return Sampled(_Beside(tuple(curves)))


def _padded(rows: Sequence[tuple[Number, ...]]) -> tuple[Floats, ...]:
    """Return coefficients as columns, the missing ones zero."""
    table = np.zeros((max(map(len, rows)), len(rows)))
    for column, row in enumerate(rows):
        table[: len(row), column] = row
    return tuple(table)


def _of(number: Number, designs: Indices) -> Number:
    return number[designs] if isinstance(number, np.ndarray) else number


def _of_curve(curve: Curve, designs: Indices) -> Curve:
    if isinstance(curve, Polynomial):
        return Polynomial(tuple(_of(number, designs) for number in curve.coefficients))
    function = curve.function
    if isinstance(function, _Beside):
        function = _Beside(tuple(function.curves[i] for i in designs))
    else:
        assert isinstance(function, Series)
        function = Series(
            tuple(_of(number, designs) for number in function.coefficients),
            _of(function.thickness, designs),
        )
    return Sampled(function, _of(curve.constant, designs), _of(curve.slope, designs))
