"""A value along a layer in one text, for lines and cells.

``0.3``, ``0 to 0.3``, ``0 to 0.3 quadratic``, ``0 at 0 nm to 0.12 at 3 nm to 0.3 at 8 nm``.
"""

from __future__ import annotations

import re
from typing import Any

from ..quantities import number_text
from .keys import GRADINGS


def shape_value(text: str) -> tuple[Any, str | None]:
    """Return the value that a text such as ``"0 to 0.3 quadratic"`` means, and its grading.

    Examples
    --------
    >>> shape_value("0 to 0.3 quadratic"), shape_value("0 at 0 nm to 0.3 at 8 nm")
    ((['0', '0.3'], 'quadratic'), ([['0 nm', '0'], ['8 nm', '0.3']], None))
    """
    grading = None
    words = text.rsplit(None, 1)
    if len(words) == 2 and words[1] in GRADINGS:
        text, grading = words
    parts = re.split(r"\s+to\s+", text.strip())
    if all(re.search(r"\s+at\s+", part) for part in parts):
        points = [re.split(r"\s+at\s+", part, maxsplit=1) for part in parts]
        return [[depth, value] for value, depth in points], grading
    return (parts if len(parts) > 1 else parts[0]), grading


def is_pair(value: Any) -> bool:
    """Whether a value is a pair of scalars (points are lists of lists)."""
    return isinstance(value, list) and not isinstance(value[0], list)


def shape_text(value: Any) -> str:
    """Return the text that `shape_value` reads as this value, pair, or list of points.

    Examples
    --------
    >>> shape_text([0.0, 0.3]), shape_text([["0 nm", "0 meV"], ["8 nm", "250 meV"]])
    ('0 to 0.3', '0 meV at 0 nm to 250 meV at 8 nm')
    """
    if not isinstance(value, list):
        return value if isinstance(value, str) else number_text(value)
    points = (
        f"{shape_text(p[1])} at {p[0]}" if isinstance(p, list) else shape_text(p) for p in value
    )
    return " to ".join(points)
