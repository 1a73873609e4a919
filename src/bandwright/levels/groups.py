"""Levels closer together than a reader can tell apart become one row with ``copies``."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt


def group_levels(
    energies: npt.NDArray[np.float64], parts: npt.NDArray[np.int64], span: float
) -> tuple[slice, ...]:
    """Return the members of each group as ranges of level indices.

    A group spans at most ``span`` [eV] from its first member and stays within one part of the
    spectrum; a span of 0 lists every level.

    Examples
    --------
    >>> group_levels(np.array([0.1, 0.100001, 0.2]), np.zeros(3, dtype=int), 1e-5)
    (slice(0, 2, None), slice(2, 3, None))
    """
    groups: list[slice] = []
    start = 0
    for index in range(1, len(energies) + 1):
        inside = (
            index < len(energies)
            and span > 0.0
            and parts[index] == parts[start]
            and energies[index] - energies[start] <= span
        )
        if not inside:
            groups.append(slice(start, index))
            start = index
    return tuple(groups) if len(energies) else ()
