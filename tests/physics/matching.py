"""Found, reference and matching digits, printed for every external check."""

from __future__ import annotations

import math
from decimal import Decimal


def digits(found, reference):
    """Return how many leading digits agree: -log10 of the relative error, 16 at most."""
    if found == reference:
        return 16.0
    scale = max(abs(reference), abs(found))
    return max(0.0, min(16.0, -math.log10(abs(found - reference) / scale)))


def last_digit(printed):
    """Return one unit of the last printed digit: what a printed value can promise."""
    exponent = Decimal(printed).as_tuple().exponent
    return float(Decimal(1).scaleb(exponent))


def check(label, found, reference, tolerance, source):
    """Print found, reference and matching digits of a list; fail outside the tolerance.

    ``reference`` holds strings, digits as printed, or floats. A printed value promises no more
    than half a unit of its last digit, which is added to ``tolerance``.
    """
    found = [float(f) for f in found]
    reference = list(reference)
    print(f"\n{label}   [{source}]")
    if len(found) != len(reference):
        print(f"  found {found}\n  reference {reference}")
    assert len(found) == len(reference), f"{label}: {len(found)} values for {len(reference)}"
    worst = 0.0
    for f, printed in zip(found, reference, strict=True):
        r = float(printed)
        slack = 0.5 * last_digit(printed) if isinstance(printed, str) else 0.0
        allowed = tolerance + slack
        shown = printed if isinstance(printed, str) else f"{r:.15g}"
        print(f"  found {f:.15g}   reference {shown}   {digits(f, r):.1f} digits")
        worst = max(worst, abs(f - r) / allowed)
    assert worst <= 1.0, f"{label}: {worst:.3g} times the tolerance {tolerance:g} ({source})"
