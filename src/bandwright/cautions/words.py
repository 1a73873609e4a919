"""Names and numbers of layers and levels in a sentence."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from itertools import groupby


def numbered(numbers: Iterable[int]) -> str:
    """Return level numbers in words.

    Examples
    --------
    >>> numbered([3]), numbered([1, 2, 3, 7])
    ('level 3', 'levels 1 to 3, 7')
    """
    found = [int(n) for n in numbers]
    runs = []
    for _, run in groupby(enumerate(found), key=lambda pair: pair[1] - pair[0]):
        members = [number for _, number in run]
        if len(members) > 2:
            runs.append(f"{members[0]} to {members[-1]}")
        else:
            runs += [str(number) for number in members]
    return ("level " if len(found) == 1 else "levels ") + ", ".join(runs)


def listed(names: Sequence[str], most: int = 6) -> str:
    """Return names in a row, the rest counted.

    Examples
    --------
    >>> listed(["well", "barrier", "well"]), listed(list("abcd"), most=2)
    ('well, barrier', 'a, b and 2 more')
    """
    different = list(dict.fromkeys(names))
    more = len(different) - most
    return ", ".join(different[:most]) + (f" and {more} more" if more > 0 else "")
