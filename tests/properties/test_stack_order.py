"""Any stack: turned over twice it is itself, and its repr, pickle and written layers agree."""

import pickle

from hypothesis import given, settings
from hypothesis import strategies as st

import bandwright as bw
from bandwright.quantities import Density, Length, length_text
from bandwright.shapes import Flat, Linear, Points, Quadratic

fraction = st.floats(0.0, 1.0)
energy = st.floats(-3.0, 3.0)
mass = st.floats(0.01, 3.0)
# thicknesses as they are written: a tenth of an angstrom and up
tenths = st.integers(1, 1_000_000).map(lambda n: n / 100)


def shapes(value, thickness_nm, pair):
    inner = st.lists(st.floats(0.01, 0.99), max_size=3, unique_by=lambda f: round(f, 2))
    depths = inner.map(lambda parts: (0.0, *sorted(round(f, 2) for f in parts), 1.0)).map(
        lambda parts: tuple(p * thickness_nm for p in parts)
    )
    tables = depths.flatmap(
        lambda d: st.tuples(*[value] * len(d)).map(lambda values: Points(d, values))
    )
    flat, graded = st.builds(Flat, value), st.builds(pair, value, value)
    return st.one_of(flat, graded, tables if thickness_nm > 0.1 else flat)


@st.composite
def layers(draw):
    thickness = draw(tenths)
    pair = draw(st.sampled_from([Linear, Quadratic]))
    inputs = {
        "thickness": Length(thickness, "nm"),
        "label": draw(st.sampled_from([None, "well", "NA", "b 2"])),
        "donors": draw(st.none() | st.builds(Density, st.floats(0, 1), st.just("sheet"))),
        "field": draw(st.sampled_from([None, "3 MV/cm", "-1 kV/cm"])),
    }
    if draw(st.booleans()):
        inputs["material"] = "AlxGa1-xAs"
        inputs["x"] = draw(shapes(fraction, thickness, pair))
    else:
        inputs["edge"] = draw(shapes(energy, thickness, pair))
        inputs["mass"] = draw(shapes(mass, thickness, pair))
        inputs["gap"] = draw(st.none() | shapes(mass, thickness, pair))
    return bw.Layer(**inputs)


def groups(children):
    return st.builds(bw.Repeat, st.integers(1, 5), st.lists(children, min_size=1, max_size=3))


trees = st.lists(st.recursive(layers(), groups, max_leaves=5), min_size=1, max_size=4)


@settings(max_examples=40)
@given(trees)
def test_turned_over_twice_is_the_same_stack(listed):
    stack = bw.Stack(listed, zero="GaAs", ends=["wall", "open"])
    turned = bw.Stack(listed, zero="GaAs", ends=["wall", "open"], order="surface first")
    names = [written.layer.label for written in stack.written()]
    assert [written.layer.label for written in turned.written()] == names[::-1]
    again = bw.Stack(turned.layers, zero="GaAs", ends=turned.ends, order="surface first")
    assert turned.ends == ("open", "wall")
    for one, other in zip(again.grown(), stack.grown(), strict=True):
        same_but_for_rounding(one[0], other[0])


def same_but_for_rounding(one, other):
    """Depths of a table that are no short decimals may move in the last digit."""
    for (name, a), (_, b) in zip(one.shapes, other.shapes, strict=True):
        if isinstance(a, Points):
            assert a.values == b.values
            assert all(abs(p - q) < 1e-9 for p, q in zip(a.depths_nm, b.depths_nm, strict=True))
        else:
            assert a == b, name
    assert (one.thickness, one.label, one.donors) == (other.thickness, other.label, other.donors)


@settings(max_examples=40)
@given(trees)
def test_repr_pickle_and_hash(listed):
    stack = bw.Stack(listed, zero="GaAs")
    names = {name: getattr(bw, name) for name in ("Layer", "Repeat", "Stack")}
    assert eval(repr(stack), names) == stack
    again = pickle.loads(pickle.dumps(stack))
    assert again == stack
    assert hash(again) == hash(stack)


@settings(max_examples=40)
@given(trees)
def test_written_layers_are_the_grown_ones(listed):
    stack = bw.Stack(listed, zero="GaAs")
    written = stack.written()
    grown = stack.grown()
    for number, layer, path, copies in written:
        assert sum(n == number for _, n in grown) == copies
        found = stack.layers[path[0]]
        for index in path[1:]:
            found = found.layers[index]
        assert found == layer
        assert stack.with_layer(number, layer) == stack
    assert {n for _, n in grown} == set(range(1, len(written) + 1))


@settings(max_examples=40)
@given(trees)
def test_a_stack_in_angstrom_is_the_stack_in_nm(listed):
    def in_angstrom(entry):
        if isinstance(entry, bw.Repeat):
            return bw.Repeat(entry.times, [in_angstrom(inner) for inner in entry.layers])
        return entry.replace(thickness=f"{round(entry.thickness.value * 1000)}e-2 Å")

    stack = bw.Stack([in_angstrom(entry) for entry in listed], zero="GaAs")
    assert stack == bw.Stack(listed, zero="GaAs")
    assert [length_text(w.layer.thickness) for w in stack.written()] == [
        length_text(w.layer.thickness) for w in bw.Stack(listed, zero="GaAs").written()
    ]
