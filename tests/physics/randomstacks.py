"""Random layer profiles of every class a solver must survive, from a seed.

`random_case(kind, bands, seed)` gives a `Case`: a `Profile` and the energy below which its levels
are wanted. Nothing here knows how levels are found. Numbers are drawn around what III-V and
nitride layers have; they describe no real structure.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.special import erf

from bandwright.profile import ZERO, Polynomial, Profile, Sampled, Section

KINDS = (
    "flat", "walls", "field", "linear", "quadratic", "error-function", "points", "mixed",
    "coupled", "thin", "thick", "polar",
)  # fmt: skip
CLASSES = (
    *((kind, bands) for kind in KINDS for bands in ("one-band", "two-band")),
    ("clamped", "two-band"),
)
H2M = 0.0381  # only to keep sizes in hand
MOST_PHASE = 220.0  # rad: bounds the size of a case
FLOOR = 0.05


@dataclass(frozen=True)
class Case:
    """A profile, the energy asked, and what reproduces it."""

    kind: str
    bands: str
    seed: int
    profile: Profile
    high: float

    def __str__(self):
        return f"random_case({self.kind!r}, {self.bands!r}, {self.seed})"


@dataclass(frozen=True)
class Stuff:
    """Edge [eV], mass and gap [eV] at one place."""

    edge: float
    mass: float
    gap: float


def random_case(kind, bands, seed):
    """Return the case of this class and seed, the same on every machine."""
    rng = np.random.default_rng([CLASSES.index((kind, bands)), seed])
    for _ in range(200):
        built = _draw(kind, bands, rng)
        if built is not None:
            profile, high = built
            return Case(kind, bands, seed, profile, high)
    raise RuntimeError(f"no profile of class {kind}, {bands} from seed {seed}")


def flat(thickness, edge, mass, gap=None, layer=0):
    """One flat section."""
    inverse = ZERO if gap is None else Polynomial((1.0 / gap,))
    return Section(thickness, Polynomial((edge,)), Polynomial((mass,)), inverse, layer)


def tilt(sections, field):
    """Add the potential of a field [V/nm] along the growth, zero at the first face."""
    out, z = [], 0.0
    for s in sections:
        edge = s.edge.plus(field * z, field)
        out.append(Section(s.thickness, edge, s.mass, s.inverse_gap, s.layer))
        z += s.thickness
    return tuple(out)


def lowest(sections):
    """Least edge."""
    return min(float(s.edge.at(np.linspace(0, s.thickness, 65)).min()) for s in sections)


def clamps(sections, energy):
    """Whether the two-band bracket falls to its floor somewhere at this energy."""
    for s in sections:
        depth = np.linspace(0, s.thickness, 33)
        if np.any(1 + (energy - s.edge.at(depth)) * s.inverse_gap.at(depth) < FLOOR):
            return True
    return False


# ---------------------------------------------------------------- drawing


def _draw(kind, bands, rng):
    two = bands == "two-band"
    pieces = _MAKERS.get(kind, _alternating)(kind, rng)
    sections = []
    for layer, (thickness, first, last, shape) in enumerate(pieces):
        sections += _sections(thickness, first, last, shape, two, layer, rng)
    field = 0.0
    length = sum(s.thickness for s in sections)
    if kind in ("field", "clamped"):
        field = rng.uniform(0.0005, 0.015)
    elif kind in ("linear", "quadratic", "error-function", "points", "mixed", "thick"):
        field = rng.choice([0.0, 1.0]) * rng.uniform(0.0002, 0.01)
    if kind == "clamped":
        field = max(field, 2.0 / length)
    field *= rng.choice([-1.0, 1.0])
    sections = tilt(sections, field)
    ends = _ends(kind, field, sections, rng)
    bottom = lowest(sections)
    high = _high(kind, sections, ends, bottom, rng)
    if high is None or (two and clamps(sections, bottom) != (kind == "clamped")):
        return None
    if _phase(sections, bottom, high) > MOST_PHASE:
        return None
    return Profile(sections, ends, field, bands=bands), high


def _ends(kind, field, sections, rng):
    if field or kind in ("walls", "polar"):
        return ("wall", "wall")
    choice = rng.integers(4)
    return (
        "wall" if choice in (1, 3) else "open",
        "wall" if choice in (2, 3) else "open",
    )


def _high(kind, sections, ends, bottom, rng):
    """An energy with levels below it, under every open end's edge."""
    limits = [
        float(s.edge.at(np.array([d]))[0])
        for s, d, end in zip(
            (sections[0], sections[-1]), (0.0, sections[-1].thickness), ends, strict=True
        )
        if end == "open"
    ]
    high = bottom + rng.uniform(0.1, 0.7)
    if kind == "clamped":
        high = bottom + rng.uniform(0.5, 1.6)
    if kind == "polar":
        high = bottom + rng.uniform(0.5, 2.5)
    if limits:
        high = min(high, min(limits) - rng.choice([1e-3, 1e-5]))
    return high if high > bottom + 0.01 else None


def _phase(sections, bottom, high):
    """Rough size of the problem: the phase and decay of all sections [rad]."""
    total = 0.0
    for s in sections:
        depth = np.linspace(0, s.thickness, 9)
        reach = np.maximum(np.abs(high - s.edge.at(depth)), 0.1)
        total += s.thickness * math.sqrt(float((s.mass.at(depth) * reach).max()) / H2M) + 1.0
    return total


def _stuff(rng):
    """A well and a barrier material."""
    kind = rng.integers(4)
    if kind == 0:  # like GaAs and AlGaAs
        x = rng.uniform(0.1, 0.45)
        return Stuff(0, 0.067, 1.5), Stuff(0.85 * x, 0.067 + 0.083 * x, 1.5 + 1.3 * x)
    if kind == 1:  # like GaInAs and AlInAs
        return Stuff(0, 0.043, 0.8), Stuff(rng.uniform(0.4, 0.6), 0.075, 1.5)
    if kind == 2:  # light and deep
        return Stuff(0, 0.025, 0.45), Stuff(rng.uniform(0.5, 1.2), 0.12, 2.0)
    return (
        Stuff(0, rng.uniform(0.03, 0.1), rng.uniform(0.6, 2.5)),
        Stuff(rng.uniform(0.05, 0.8), rng.uniform(0.04, 0.2), rng.uniform(1.0, 3.0)),
    )


def _layer_count(rng):
    return int(np.clip(round(math.exp(rng.uniform(0.0, math.log(61)))), 1, 60))


def _mix(a, b, share):
    return Stuff(*(p + share * (q - p) for p, q in zip(
        (a.edge, a.mass, a.gap), (b.edge, b.mass, b.gap), strict=True)))  # fmt: skip


def _alternating(kind, rng):
    """Wells and barriers in turn, or any composition in any order; graded where asked."""
    well, barrier = _stuff(rng)
    count = _layer_count(rng)
    wild = rng.random() < 0.3
    longest = min(25.0, 260.0 / count)
    pieces = []
    for i in range(count):
        share = rng.random() if wild else float(i % 2 == 0)
        thickness = math.exp(rng.uniform(math.log(0.5), math.log(longest)))
        first = last = _mix(well, barrier, share)
        shape = "flat"
        graded = {"linear", "quadratic", "error-function", "points"}
        if kind in graded and rng.random() < 0.7:
            shape = kind
        elif kind == "mixed":
            shape = rng.choice(sorted(graded | {"flat"}))
        if shape != "flat":
            last = _mix(well, barrier, rng.random())
        pieces.append((thickness, first, last, shape))
    return pieces


def _coupled(kind, rng):
    """Two to twelve equal wells behind equal barriers, nearly degenerate."""
    well, barrier = _stuff(rng)
    wells = int(rng.integers(2, 13))
    width = rng.uniform(2.0, 12.0)
    between = math.exp(rng.uniform(math.log(1.0), math.log(30.0)))
    outer = rng.uniform(1.0, 20.0)
    pieces = [(outer, barrier, barrier, "flat")]
    for i in range(wells):
        pieces.append((width, well, well, "flat"))
        last = i == wells - 1
        pieces.append((outer if last else between, barrier, barrier, "flat"))
    return pieces


def _thin(kind, rng):
    """Many layers of one or a few monolayers of 0.28 nm, in thicker ones."""
    well, barrier = _stuff(rng)
    pieces = []
    for _ in range(int(rng.integers(5, 61))):
        thickness = 0.28 * rng.integers(1, 6) if rng.random() < 0.8 else rng.uniform(2, 8)
        stuff = _mix(well, barrier, rng.choice([0.0, 1.0, rng.random()]))
        pieces.append((thickness, stuff, stuff, "flat"))
    return pieces


def _thick(kind, rng):
    """A few wells behind barriers of up to 200 nm."""
    well, barrier = _stuff(rng)
    pieces = [(rng.uniform(5, 200), barrier, barrier, "flat")]
    for _ in range(int(rng.integers(1, 4))):
        pieces.append((rng.uniform(2, 15), well, well, "flat"))
        pieces.append((rng.uniform(2, 100), barrier, barrier, "flat"))
    return pieces


def _polar(kind, rng):
    """Like nitrides: 1.75 eV steps and internal fields to 3 MV/cm of alternate sign."""
    well, barrier = Stuff(0.0, 0.2, 3.4), Stuff(rng.uniform(0.5, 1.75), 0.3, 6.0)
    wide, thick = rng.uniform(1.0, 5.0), rng.uniform(1.0, 6.0)
    field = rng.uniform(0.02, 0.3) * rng.choice([-1.0, 1.0])
    balance = -field * wide / thick
    while abs(balance) > 0.3:
        field, balance = field / 2, balance / 2
    pieces, potential = [], 0.0
    for i in range(2 * int(rng.integers(1, 9)) + 1):
        stuff, width, slope = (well, wide, field) if i % 2 else (barrier, thick, balance)
        first = Stuff(stuff.edge + potential, stuff.mass, stuff.gap)
        potential += slope * width
        last = Stuff(stuff.edge + potential, stuff.mass, stuff.gap)
        pieces.append((width, first, last, "linear"))
    return pieces


def _clamped(kind, rng):
    """Several periods in a field that lifts the upfield ones by more than the gap."""
    well, barrier = Stuff(0, 0.043, 0.8), Stuff(rng.uniform(0.35, 0.55), 0.075, 1.5)
    if rng.random() < 0.3:
        well = Stuff(0, 0.025, 0.45)
    period = [(rng.uniform(0.8, 5), i % 2) for i in range(int(rng.integers(2, 9)))]
    length = sum(w for w, _ in period)
    times = int(np.clip(rng.uniform(60, 160) / length, 2, 12))
    shape = rng.choice(["flat", "flat", "linear"])
    pieces = []
    for _ in range(times):
        for width, which in period:
            stuff = well if which else barrier
            last = _mix(stuff, barrier, 0.3) if shape == "linear" else stuff
            pieces.append((width, stuff, last, shape))
    return pieces


_MAKERS = {
    "coupled": _coupled, "thin": _thin, "thick": _thick, "polar": _polar, "clamped": _clamped,
}  # fmt: skip


# ---------------------------------------------------------------- shapes to sections


def _sections(thickness, first, last, shape, two, layer, rng):
    """Sections of one layer of this shape."""
    if shape == "points":
        return _pointwise(thickness, first, last, two, layer, rng)
    power = {"flat": 0, "linear": 1, "quadratic": 2}.get(shape)
    if power is not None:

        def curve(a, b):
            if power == 0 or a == b:
                return Polynomial((a,))
            return Polynomial((a, *(0.0,) * (power - 1), (b - a) / thickness**power))
    else:
        width = min(rng.uniform(0.3, 1.5), thickness / 3)
        centre = rng.uniform(0.3, 0.7) * thickness

        def curve(a, b):
            return Sampled(lambda s: a + 0.5 * (b - a) * (1 + erf((s - centre) / width)))

    edge, mass = curve(first.edge, last.edge), curve(first.mass, last.mass)
    inverse = ZERO
    if two and shape == "linear" and rng.random() < 0.5:
        gap = curve(first.gap, last.gap)
        inverse = Sampled(lambda s: 1.0 / gap.at(s))
    elif two:
        inverse = curve(1.0 / first.gap, 1.0 / last.gap)
    return [Section(thickness, edge, mass, inverse, layer)]


def _pointwise(thickness, first, last, two, layer, rng):
    """A table of points: linear between them."""
    count = int(rng.integers(2, 9))
    cuts = np.sort(rng.uniform(0, thickness, count - 1))
    depths = [0.0, *cuts, thickness]
    shares = [0.0, *rng.random(count - 1), 1.0]
    out = []
    for (a, b), (p, q) in zip(pairwise(depths), pairwise(shares), strict=True):
        if b - a > 1e-3:
            one, two_ = _mix(first, last, p), _mix(first, last, q)
            out += _sections(b - a, one, two_, "linear", two, layer, rng)
    return out
