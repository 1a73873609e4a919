"""Factors on fluxes and thicknesses: atoms are counted, before and after."""

import pickle

import numpy as np
import pytest

from bandwright import Layer, Library, Repeat, Stack, StackError, UnknownName, parse_line
from bandwright.formula import parse
from bandwright.parameters import list_parameters, read, replace, shifted
from bandwright.shapes import Function, Points

EVERY = ("Al", "Ga", "In")


def atoms(layer, stack, depths=None, face="first"):
    """Atoms of each element from the first face to each depth, in monolayers."""
    thickness, unit = layer.thickness
    if depths is None:
        depths = np.array([thickness])
    nodes, weights = np.polynomial.legendre.leggauss(40)
    half = 0.5 * depths[:, None]
    z = half * (1.0 + nodes)
    values = {k: shape.at(z, thickness, face) for k, shape in layer.fractions}
    composition = parse(layer.material, **values)
    point = Library.shipped().properties(composition, stack.temperature, stack.substrate)
    height = 1.0 if unit == "ML" else point.monolayer
    return {
        e: np.sum(half * weights * composition.fraction(e) / height, axis=1) for e in EVERY
    }  # fmt: skip


FLAT = [
    "20 nm Al0.28Ga0.72As", "20 nm Ga0.72Al0.28As", "22 ML In0.2Ga0.8As", "8 nm GaAs",
    "8 nm GaAs0.9Sb0.1", "5 nm AlxGa1-xAs {x 0.3}", "5 nm Al1-xGaxAs {x 0.3}",
    "9 nm InxGayAl1-x-yAs {x 0.53, y 0.2}", "9 nm In0.5Al0.2Ga0.3As",
    "7 nm InxGa1-xAsyP1-y {x 0.53, y 0.7}", "7 ML In0.7Ga0.3As0.6P0.4",
]  # fmt: skip


@pytest.mark.parametrize("element", EVERY)
@pytest.mark.parametrize("line", FLAT)
def test_atoms_of_one_element_and_of_no_other(line, element):
    stack = parse_line(f"{line}, 3 nm In0.1Al0.1Ga0.8As", substrate="InP")
    grown = replace(stack, f"flux {element}", 1.04)
    before, after = (atoms(s.layers[0], s) for s in (stack, grown))
    for other in EVERY:
        factor = 1.04 if other == element else 1.0
        assert after[other] == pytest.approx(factor * before[other], rel=1e-12, abs=1e-15)
    assert after[element] == 0.0 or grown.layers[0] != stack.layers[0]
    assert grown.layers[0].thickness.unit == stack.layers[0].thickness.unit
    anions = [parse(s.layers[0].material, **{k: v.value for k, v in s.layers[0].fractions}).anions
              for s in (stack, grown)]  # fmt: skip
    assert anions[0] == anions[1]


GRADED = [
    "14 nm AlxGa1-xAs {x 0.02 to 0.42}",
    "30 ML InxAl1-xAs {x 0.6 to 0.4}",
    "7 nm InxGayAl1-x-yAs {x 0.53, y 0.3 to 0.44}",
]


@pytest.mark.parametrize("grading", ["linear", "quadratic"])
@pytest.mark.parametrize("line", GRADED)
@pytest.mark.parametrize("element", EVERY)
def test_a_grade_keeps_its_atoms_at_every_depth(line, grading, element):
    stack = parse_line(f"{line}, 3 nm In0.1Al0.1Ga0.8As", substrate="InP")
    old = stack.layers[0]
    heights = [atoms_height(old, stack, share) for share in (0.0, 1.0)]
    height = float(np.mean(heights)) if old.thickness.unit == "ML" else 1.0
    pairs = {k: (s.first, s.last) for k, s in old.fractions if not s.constant}
    old = old.replace(thickness=f"{old.thickness.value * height!r} nm", grading=grading, **pairs)
    stack = stack.with_layer(1, old)
    new = replace(stack, f"flux {element}", 1.04).layers[0]
    if element not in old.material:
        assert new == old
        return
    face = "first" if edges(old, stack)[0] <= edges(old, stack)[1] else "last"
    places = np.linspace(0.05, 1.0, 9)
    counted = atoms(new, stack, new.thickness.value * places)
    fine = np.linspace(0.0, old.thickness.value, 20001)[1:]
    before = atoms(old, stack, fine, face)
    others = [e for e in EVERY if e in old.material and e != element]
    # where as many atoms of another element have landed, 1.04 times as many of this one have
    depth = np.interp(counted[others[0]], before[others[0]], fine)
    exact = atoms(old, stack, depth, face)
    for e in EVERY:
        assert counted[e] == pytest.approx(exact[e] * (1.04 if e == element else 1.0), rel=1e-6)
    assert pickle.loads(pickle.dumps(new)).fractions[0][1].at(np.array([1.0]), 14.0) >= 0.0


def atoms_height(layer, stack, share):
    values = {k: float(shape.at(share, 1.0)) for k, shape in layer.fractions}
    return Library.shipped().properties(parse(layer.material, **values), 300.0, "InP").monolayer


def edges(layer, stack):
    values = {k: shape.at(np.array([0.0, 1.0]), 1.0) for k, shape in layer.fractions}
    point = Library.shipped().properties(parse(layer.material, **values), 300.0, "InP")
    return np.broadcast_to(point.edge, 2)


def test_a_grade_in_monolayers_is_that_in_nm():
    stack = parse_line("30 ML InxAl1-xAs {x 0.6 to 0.4}", substrate="InP")
    layer = stack.layers[0]
    height = 0.5 * (atoms_height(layer, stack, 0.0) + atoms_height(layer, stack, 1.0))
    same = stack.with_layer(1, layer.replace(thickness=f"{30.0 * height!r} nm"))
    one, two = (replace(s, "flux In", 0.98).layers[0] for s in (stack, same))
    assert one.thickness.unit == "nm"
    assert one.thickness.value == pytest.approx(two.thickness.value, rel=1e-13)
    depths = np.linspace(0.0, one.thickness.value, 5)
    assert one.x.at(depths, one.thickness.value) == pytest.approx(two.x.at(depths, 8.0), rel=1e-12)


def test_a_table_keeps_its_points():
    table = [("0 nm", 0.0), ("2 nm", 0.1), ("8 nm", 0.3)]
    stack = Stack([Layer("8 nm", "AlxGa1-xAs", x=table)])
    new = replace(stack, "flux Al", 1.1).layers[0]
    assert isinstance(new.x, Points)
    assert new.x.values == pytest.approx([1.1 * x / (1.0 + 0.1 * x) for x in (0.0, 0.1, 0.3)])
    # 2 nm of 0.05 on average, 6 nm of 0.2; monolayers of AlAs are 0.14 % higher than of GaAs
    expected = [0.0, 2.0 * 1.005, 2.0 * 1.005 + 6.0 * 1.02]
    assert new.x.depths_nm == pytest.approx(expected, rel=0.0014 * 0.03)
    assert new.thickness.value == new.x.depths_nm[-1]
    binary = replace(Stack([Layer("8 nm", "GaAs1-xSbx", x=table)]), "flux Ga", 1.1).layers[0]
    assert binary.x == Points((0.0, 2.2, 8.8), (0.0, 0.1, 0.3))


def test_repeats_and_order_of_changes():
    group = Repeat(9, [Layer("5 nm", "GaAs"), Layer("3 nm", "Al0.3Ga0.7As")])
    stack = Stack([group, Layer("5 nm", edge="0.1 eV", mass=0.07)], zero="GaAs")
    both = replace(replace(stack, "flux Al", 1.02), "flux Ga", 1.02)
    assert [w.layer.thickness.value for w in both.written()] == pytest.approx([5.1, 3.06, 5.0])
    assert both.written()[1].layer.material == "Al0.3Ga0.7As"
    every = replace(stack, "all thicknesses", 1.02)
    assert [w.layer.thickness.value for w in every.written()] == pytest.approx([5.1, 3.06, 5.1])
    assert every.written()[0].copies == 9
    assert shifted(stack, "flux Al", 0.02) == replace(stack, "flux Al", 1.02)


def test_what_is_listed():
    line = "8 nm In0.53Ga0.47As, 5 nm AlxGa1-xAs {x 0.2}"
    listed = {p.name: p for p in list_parameters(parse_line(line))}
    assert listed["flux In"].layer_numbers == (1,)
    assert listed["flux Ga"].layer_numbers == listed["all thicknesses"].layer_numbers == (1, 2)
    assert (listed["flux Al"].kind, listed["flux Al"].unit) == ("flux", "")
    assert listed["all thicknesses"].kind == "scale"
    other = {p.name for p in list_parameters(parse_line("8 nm Zn0.8Cd0.2Se"))}
    assert other == {"layer 1.thickness", "layer 1.composition", "temperature", "field",
                     "all thicknesses"}  # fmt: skip
    called = Stack([Layer("8 nm", "AlxGa1-xAs", x=lambda z: 0.01 * z), Layer("5 nm", "InAs")])
    assert [p.name for p in list_parameters(called)][-2:] == ["all thicknesses", "flux In"]
    sb = Stack([Layer("8 nm", "GaAs1-xSbx", x=lambda z: 0.01 * z)])
    assert isinstance(replace(sb, "flux Ga", 1.1).layers[0].x, Function)


def test_mistakes():
    stack = parse_line("8 nm Al0.2Ga0.8As")
    assert read(stack, "flux Al") == read(stack, "all thicknesses") == 1.0
    assert replace(stack, "flux Al", 1.0) is stack
    with pytest.raises(UnknownName, match=r"^flux In: no layer of a material .*'flux Al'"):
        read(stack, "flux In")
    with pytest.raises(StackError, match=r"^flux Al: got 0; a factor on a flux must be"):
        replace(stack, "flux Al", 0.0)
    with pytest.raises(StackError, match="thicknesses: got -1; a factor on thicknesses must be ab"):
        replace(stack, "all thicknesses", -1.0)
    with pytest.raises(StackError, match="flux Al: a step in monolayers is for a thickness"):
        shifted(stack, "flux Al", 1.0, monolayer_nm=0.28)
    called = Stack([Layer("8 nm", "AlxGa1-xAs", x=lambda z: 0.01 * z), Layer("5 nm", "AlAs")])
    with pytest.raises(UnknownName, match="flux Al: no layer of a material"):
        replace(called, "flux Al", 1.1)
