"""Profiles for hypothesis, and what may be done to one without changing its physics."""

from hypothesis import strategies as st

from bandwright.profile import ZERO, Polynomial, Profile, Section


def polynomial(*coefficients):
    return Polynomial(tuple(float(c) for c in coefficients))


def _curve(first, last, thickness, power):
    if power == 0 or first == last:
        return polynomial(first)
    return polynomial(first, *([0.0] * (power - 1)), (last - first) / thickness**power)


numbers = st.fixed_dictionaries(
    {
        "edge": st.floats(0.0, 0.6),
        "mass": st.floats(0.03, 0.15),
        "inverse": st.floats(0.3, 0.7),  # 1/eV: no mass is clamped below 1.3 eV of depth
    }
)


@st.composite
def profiles(draw, bands=None, ends=None, most=6, flat=False):
    """Profiles of 1 to ``most`` layers with levels to be found, as (profile, highest energy)."""
    two = draw(st.booleans()) if bands is None else bands == "two-band"
    field = 0.0 if flat else draw(st.sampled_from([0.0, 1.0])) * draw(st.floats(-0.008, 0.008))
    if ends is None:
        pair = draw(st.tuples(*[st.sampled_from(["open", "wall"])] * 2))
        ends = ("wall", "wall") if field else pair
    sections, z = [], 0.0
    for layer in range(draw(st.integers(1, most))):
        thickness = draw(st.floats(0.5, 12.0))
        first = draw(numbers)
        power = 0 if flat else draw(st.integers(0, 2))
        last = draw(numbers) if power else first
        edge, mass, inverse = (
            _curve(first[k], last[k], thickness, power) for k in ("edge", "mass", "inverse")
        )
        edge = edge.plus(field * z, field) if field else edge
        sections.append(Section(thickness, edge, mass, inverse if two else ZERO, layer))
        z += thickness
    profile = Profile(tuple(sections), ends, field, bands="two-band" if two else "one-band")
    high = lowest(profile) + draw(st.floats(0.05, 0.5))
    return profile, under_open_ends(profile, high)


def at(curve, depth):
    return float(curve.at([depth])[0])


def lowest(profile):
    return min(min(at(s.edge, f * s.thickness / 16) for f in range(17)) for s in profile.sections)


def outer_edges(profile):
    """Edges at the outer faces."""
    first, last = profile.sections[0], profile.sections[-1]
    return at(first.edge, 0.0), at(last.edge, last.thickness)


def under_open_ends(profile, high):
    """Lower the energy under every open end's edge."""
    edges = zip(outer_edges(profile), profile.ends, strict=True)
    return min([high, *(edge - 1e-4 for edge, end in edges if end == "open")])


# ---------------------------------------------------------------- what changes nothing


def _with(profile, sections, ends=None):
    ends = ends or profile.ends
    return Profile(tuple(sections), ends, profile.field, bands=profile.bands)


def shifted(curve, start):
    """Return q with q(s) = curve(start + s), for a polynomial."""
    c = list(curve.coefficients)
    out = [0.0] * len(c)
    for power, value in enumerate(c):
        term = 1.0  # binomial(power, k) start^(power - k), from k = power down
        for k in range(power, -1, -1):
            out[k] += value * term
            term = term * start * k / (power - k + 1) if k else 0.0
    return polynomial(*out)


def mapped(section, curve, thickness=None, edge=None):
    return Section(
        section.thickness if thickness is None else thickness,
        (edge or curve)(section.edge), curve(section.mass), curve(section.inverse_gap),
        section.layer,
    )  # fmt: skip


def mirrored(profile):
    """The same structure from the other side; a field comes out reversed."""
    sections = []
    for s in reversed(profile.sections):
        def turn(curve, t=s.thickness):
            flipped = [c * (-1) ** i for i, c in enumerate(curve.coefficients)]
            return shifted(polynomial(*flipped), -t)  # curve(t - s)
        sections.append(mapped(s, turn))
    return _with(profile, sections, profile.ends[::-1])


def moved(profile, energy):
    """All edges lifted by one energy."""
    return _with(profile, [mapped(s, lambda c: c, edge=lambda c: c.plus(energy, 0.0))
                           for s in profile.sections])  # fmt: skip


def cut(profile, number, share):
    """One section cut in two at a share of its thickness."""
    sections = list(profile.sections)
    s = sections[number]
    depth = share * s.thickness
    sections[number : number + 1] = [
        mapped(s, lambda c: c, thickness=depth),
        mapped(s, lambda c: shifted(c, depth), thickness=s.thickness - depth),
    ]
    return _with(profile, sections)


def stretched(profile, factor):
    """Lengths by a factor, energies by 1 / factor^2, masses as they are: levels / factor^2."""
    def scale(curve, power):
        return polynomial(
            *(c * factor ** (power - i) for i, c in enumerate(curve.coefficients))
        )
    return _with(profile, [
        Section(s.thickness * factor, scale(s.edge, -2), scale(s.mass, 0),
                scale(s.inverse_gap, 2), s.layer)
        for s in profile.sections
    ])  # fmt: skip


def lifted(profile, number, energy):
    """One section's edge lifted."""
    sections = list(profile.sections)
    s = sections[number]
    sections[number] = mapped(s, lambda c: c, edge=lambda c: c.plus(energy, 0.0))
    return _with(profile, sections)
