"""What a reader of levels should know: one sentence each, naming the layer or level and a mend.

`collect` gathers them for `Levels.cautions`; `warn` gives those that cost nothing to know as
`BandwrightWarning`. Limits that cite nothing are common practice.
"""

from __future__ import annotations

import warnings

from ..errors import BandwrightWarning
from ..levels import Levels
from .layers import charges, directions, interfaces, materials, own_numbers, thicknesses
from .states import boxes, clusters, counts, nothing, phases, tops, two_band
from .strained import strains

__all__ = ["at_once", "collect", "warn"]


def at_once(levels: Levels) -> tuple[str, ...]:
    """Return the cautions that need no state and no phase integral, the gravest first.

    Parameters
    ----------
    levels : Levels
    """
    return (
        *counts(levels),
        *nothing(levels),
        *thicknesses(levels),
        *interfaces(levels),
        *materials(levels),
        *strains(levels),
        *charges(levels),
        *directions(levels),
    )


def collect(levels: Levels) -> tuple[str, ...]:
    """Return every caution about these levels.

    Parameters
    ----------
    levels : Levels

    Examples
    --------
    >>> import bandwright as bw
    >>> levels = bw.solve(bw.parse_line(
    ...     "20 nm {edge 250 meV, mass 0.092}, 1200 nm {edge 0 meV, mass 0.067},"
    ...     " 20 nm {edge 250 meV, mass 0.092}"), at_most=2)
    >>> print(collect(levels)[0])
    layer 2 (own numbers) is 1200 nm thick, over 1 um: is the unit right? 1.2 nm if um
    stands for nm, 120 nm if nm stands for Å
    """
    return (
        *at_once(levels),
        *own_numbers(levels),
        *boxes(levels),
        *clusters(levels),
        *tops(levels),
        *phases(levels),
        *two_band(levels),
    )


def warn(levels: Levels, stacklevel: int = 2) -> None:
    """Give the cautions of `at_once` as Python warnings.

    Parameters
    ----------
    levels : Levels
    stacklevel : int
        As for `warnings.warn`; 2 is the caller's line.
    """
    for text in at_once(levels):
        warnings.warn(text, BandwrightWarning, stacklevel=stacklevel + 1)
