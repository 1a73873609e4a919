"""Sigma and yield as metrics of `compare` and `sweep`."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

from ..errors import StackError
from ..metrics import Solved
from .numbers import read_sides
from .result import tolerance

#: metrics that need spreads, by the names of their columns
NAMES = ("sigma_um", "sigma_meV", "yield_percent")


@dataclass(frozen=True)
class OfTolerance:
    """A number of the chosen line's tolerance to first order: one of `NAMES`.

    Parameters
    ----------
    field : str
    spreads : tuple of (name, amount)
        As `bandwright.tolerance` takes them.
    window : pair of wavelengths, optional
        For ``"yield_percent"``.

    Examples
    --------
    >>> import bandwright as bw
    >>> sigma = OfTolerance("sigma_um", (("every thickness", "0.3 ML"),))
    >>> wells = [bw.parse_line(f"20 nm Al0.3Ga0.7As, {w} nm GaAs, 20 nm Al0.3Ga0.7As",
    ...                        substrate="GaAs") for w in (6, 8)]
    >>> bw.compare(wells, {"sigma_um": sigma})["sigma_um"].round(3).tolist()
    [0.084, 0.126]
    """

    field: str
    spreads: tuple[tuple[str, object], ...]
    window: tuple[object, object] | None = None

    def __call__(self, solved: Solved) -> float | None:
        """Return the number; None without the line."""
        line = solved.line
        if line is None:
            return None
        found = tolerance(solved.lines, dict(self.spreads), line=line, window=self.window)
        if self.field == "yield_percent":
            return None if found.linear_yield is None else found.linear_yield * 100.0
        return float(getattr(found, self.field))


def with_spreads(
    spreads: Mapping[str, object] | None, window: Sequence[object] | None
) -> Mapping[str, OfTolerance]:
    """Return the metrics of `NAMES` for some spreads and a window of yield.

    Raises
    ------
    StackError
        If they are no mapping, or there is a window but no spread.
    """
    if spreads is None:
        if window is not None:
            raise StackError("yield_window: a yield needs spreads, such as"
                             " spreads={'every thickness': '0.3 ML'}")  # fmt: skip
        return MappingProxyType({})
    if not isinstance(spreads, Mapping):
        raise StackError(
            f"spreads: got {spreads!r}; give a mapping such as {{'every thickness': '0.3 ML'}}"
        )
    _ = read_sides(window)
    sides = None if window is None else (window[0], window[1])
    given = tuple(spreads.items())
    names = NAMES if sides is not None else NAMES[:2]
    return {name: OfTolerance(name, given, sides) for name in names}
