"""``4nm..9nm``: two ends written as one text, either of them open where that makes sense."""

from __future__ import annotations

from ..errors import QuantityError
from .texts import show

#: what stands between two ends
BETWEEN = ".."


def split_span(value: object, name: str, *, may_be_open: bool = False) -> tuple[object, object]:
    """Return the two ends of a span as they are written, None for an open one.

    Parameters
    ----------
    value : str or pair
        ``"4nm..9nm"``, or ``("4 nm", "9 nm")``; with ``may_be_open`` also ``"..60 nm"``,
        ``"34 meV.."`` and None in a pair.
    name : str
        Begins the text of an error.
    may_be_open : bool
        Whether one of the ends may be missing.

    Raises
    ------
    QuantityError
        If the value has no two ends.

    Examples
    --------
    >>> split_span("4nm..9nm", "well"), split_span("..60 nm", "limit", may_be_open=True)
    (('4nm', '9nm'), (None, '60 nm'))
    """
    example = "'4 nm..9 nm'" + (", '..9 nm' or '4 nm..'" if may_be_open else "")
    if isinstance(value, str):
        parts = [part.strip() or None for part in value.split(BETWEEN)]
    else:
        parts = list(value) if isinstance(value, tuple | list) else []
    if len(parts) != 2 or (parts[0] is None and parts[1] is None):
        raise QuantityError(f"{name}: got {show(value)}; write both ends, such as {example}")
    if None in parts and not may_be_open:
        raise QuantityError(f"{name}: got {show(value)}; it needs both ends, such as {example}")
    return parts[0], parts[1]
