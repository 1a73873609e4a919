"""Profiles for checks, with masses scaled so that h2m / m is the reference's own C / m.

Reference values were computed with the C = hbar^2/(2 m0) printed beside them; the package takes
its own from scipy, which moves with CODATA. A mass times H2M / C makes both the same equation.
"""

from __future__ import annotations

import json
from functools import cache
from pathlib import Path

from bandwright.constants import H2M
from bandwright.profile import ZERO, Polynomial, Profile, Sampled, Section


@cache
def reference():
    """Return the C in use in the reference, and its records by name."""
    text = (Path(__file__).parent / "reference_values.json").read_text(encoding="utf-8")
    data = json.loads(text)
    return float(data["C"]), {record["id"]: record for record in data["records"]}


def scaled(mass):
    """Return the mass with which the package's h2m / m equals the reference's C / m."""
    return mass * H2M / reference()[0]


def poly(*coefficients):
    """Polynomial of the depth."""
    return Polynomial(tuple(float(c) for c in coefficients))


def flat(thickness, edge, mass, gap=None):
    """One flat section, mass scaled."""
    return curved(thickness, poly(edge), mass, gap)


def curved(thickness, edge, mass, gap=None):
    """A section with any edge, its mass a number or a curve (then already scaled)."""
    mass = mass if isinstance(mass, Polynomial | Sampled) else poly(scaled(mass))
    inverse = ZERO if gap is None else poly(1.0 / gap)
    return Section(float(thickness), edge, mass, inverse)


def profile(*sections, ends="open"):
    """Profile with one kind of end, or a pair of ends."""
    pair = (ends, ends) if isinstance(ends, str) else tuple(ends)
    two = any(s.inverse_gap != ZERO for s in sections)
    return Profile(tuple(sections), pair, bands="two-band" if two else "one-band")


def liouville(q, start, end, pieces=1):
    """Profile of -y'' + q(x) y = lambda y on [start, end] between walls: h2m / m = 1."""
    width = (end - start) / pieces
    sections = []
    for i in range(pieces):
        left = start + i * width
        edge = Sampled(lambda s, left=left: q(left + s))
        sections.append(Section(width, edge, poly(H2M)))
    return Profile(tuple(sections), ("wall", "wall"))
