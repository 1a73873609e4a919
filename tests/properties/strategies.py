"""Arbitrary valid stacks for hypothesis: whatever a file can hold, whether or not it has levels."""

import os

from hypothesis import strategies as st

from bandwright import Layer, Repeat, Stack
from bandwright.quantities import Density, Length
from bandwright.shapes import Flat, Linear, Points, Quadratic

# Anything a float can be, and what people write more often than that.
positive = st.one_of(
    st.decimals("0.001", 1000, places=3).map(float),
    st.floats(1e-6, 1e6),
)
signed = st.one_of(st.decimals(-20, 20, places=4).map(float), st.floats(-50, 50))
fraction = st.one_of(st.decimals(0, 1, places=3).map(float), st.floats(0, 1))
_odd = ["NA", "nan", "None", "", "#", '"', "\\", "'", "{", "}", "(", ")", ",", "=", ": a", "x 3"]
_odd += ["π-Schicht", "量子井戸", "a.b", "left  barrier", "5 nm", "1/1", "true", "1.0", "-", "🧪"]
_odd += ['"quoted"', "\\u0041", "label", "to", "at", "0 to 1 quadratic", "{x 0.3}", "é", "007"]


def _is_line(text):
    return bool(text.strip()) and text.isprintable()


names = st.one_of(
    st.sampled_from([text for text in _odd if text]),
    st.text(min_size=1, max_size=12).filter(_is_line),
    st.text("ab \"'\\{}(),=.:#µÅ\t0-", min_size=1, max_size=8).filter(_is_line),
)
labels = names.filter(lambda text: not text.strip().lower().startswith("layer"))


def shapes(value, thickness, pair):
    """Return every shape that a file can hold; points only where the thickness is in nm."""
    kinds = [st.builds(Flat, value), st.builds(pair, value, value)]
    if thickness.unit == "nm":
        kinds.append(_points(value, thickness.value))
    return st.one_of(kinds)


@st.composite
def _points(draw, value, thickness):
    parts = draw(st.lists(st.floats(0.01, 0.99), max_size=6, unique=True))
    depths = sorted({0.0, *(part * thickness for part in parts), thickness})
    values = draw(st.lists(value, min_size=len(depths), max_size=len(depths)))
    return Points(tuple(depths), tuple(values))


densities = st.builds(Density, positive, st.sampled_from(["sheet", "volume"]))
planes = st.builds(Density, positive, st.just("sheet"))


@st.composite
def layers(draw):
    inputs = {}
    own = draw(st.booleans())
    unit = "nm" if own else draw(st.sampled_from(["nm", "nm", "ML"]))
    thickness = Length(draw(positive), unit)
    pair = draw(st.sampled_from([Linear, Quadratic]))  # a layer's pairs are graded alike
    if own:
        inputs["edge"] = draw(shapes(signed, thickness, pair))
        inputs["mass"] = draw(shapes(positive, thickness, pair))
        band = draw(st.sampled_from([None, "gap", "nonparabolicity"]))
        if band:
            inputs[band] = draw(shapes(positive, thickness, pair))
    else:
        inputs["material"] = draw(
            st.one_of(st.sampled_from(["GaAs", "Al0.28Ga0.72As", "AlxInyGa1-x-yAs"]), names)
        )
        for letter in draw(st.sampled_from(["", "x", "y", "xy"])):
            inputs[letter] = draw(shapes(fraction, thickness, pair))
    if draw(st.integers(0, 3)) == 0:
        inputs["field"] = f"{draw(signed)!r} V/nm"
    for kind in ("donors", "acceptors"):
        if draw(st.integers(0, 3)) == 0:
            inputs[kind] = draw(densities)
    for kind in ("delta_donors", "delta_acceptors"):
        if draw(st.integers(0, 3)) == 0:
            inputs[kind] = draw(planes)
    if draw(st.integers(0, 3)) == 0:
        inputs["interface_width"] = f"{draw(positive)!r} nm"
    if draw(st.booleans()):
        inputs["label"] = draw(labels)
    return Layer(thickness, **inputs)


def _groups(entries):
    return st.builds(Repeat, st.integers(1, 12), st.lists(entries, min_size=1, max_size=3))


#: layers, groups, and groups in groups
entries = st.recursive(layers(), _groups, max_leaves=6)


@st.composite
def stacks(draw):
    settings = {}
    maybe = st.integers(0, 2).map(lambda n: n == 0)
    for key in ("name", "substrate"):
        if draw(maybe):
            settings[key] = draw(names)
    settings["zero"] = draw(names)
    if draw(maybe):
        settings["temperature"] = f"{draw(positive)!r} K"
    drive = draw(st.sampled_from([None, "field", "bias"]))
    if drive:
        value = draw(signed)
        if draw(maybe):
            settings["electrons_run"] = draw(st.sampled_from(["to surface", "to substrate"]))
            value = abs(value)
        settings[drive] = f"{value!r} {'V/nm' if drive == 'field' else 'V'}"
    settings["ends"] = draw(
        st.one_of(
            st.tuples(*[st.sampled_from(["open", "wall"])] * 2), st.just(("periodic", "periodic"))
        )
    )
    if draw(maybe):
        settings["bands"] = "one-band"
    if draw(maybe):
        settings["interface_width"] = f"{draw(positive)!r} nm"
    if draw(maybe):
        parts = st.sampled_from(["house.toml", "files/my house.toml", "../up.toml", "/far/ä.toml"])
        settings["materials"] = [os.path.abspath(p) for p in draw(st.lists(parts, max_size=2))]
    return Stack(draw(st.lists(entries, min_size=1, max_size=4)), **settings)
