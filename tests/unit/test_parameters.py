"""The numbers of a stack by name."""

import pickle

import numpy as np
import pytest

from bandwright import BandwrightError, Layer, MaterialError, Repeat, Stack, StackError, UnknownName
from bandwright.parameters import Parameter, find, list_parameters, read, replace, shifted
from bandwright.shapes import Linear, Points

WALL = Layer("30 nm", "Al0.28Ga0.72As", label="wall")
WELL = Layer("22 ML", "GaAs", label="well", donors="2e11 / cm^2", field="10 kV/cm")
GRADE = Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3])
OWN = Layer("8 nm", edge="250 meV", mass=0.09, gap="1.8 eV")
STACK = Stack([WALL, WELL, Repeat(30, [GRADE, OWN]), WALL], zero="GaAs", temperature="77 K")


def listed(stack):
    return {p.name: (p.kind, p.unit, p.layer_numbers) for p in list_parameters(stack)}


def test_list():
    assert listed(STACK) == {
        "wall.thickness": ("thickness", "nm", (1, 5)),
        "wall.composition": ("composition", "", (1, 5)),
        "well.thickness": ("thickness", "ML", (2,)),
        "well.field": ("internal field", "V/nm", (2,)),
        "well.donors": ("donors", "nm^-2", (2,)),
        "layer 3.thickness": ("thickness", "nm", (3,)),
        "layer 3.x_first": ("composition end", "", (3,)),
        "layer 3.x_last": ("composition end", "", (3,)),
        "layer 3.x_shift": ("composition", "", (3,)),
        "layer 4.thickness": ("thickness", "nm", (4,)),
        "layer 4.edge": ("edge", "eV", (4,)),
        "layer 4.mass": ("mass", "m0", (4,)),
        "layer 4.gap": ("gap", "eV", (4,)),
        "temperature": ("temperature", "K", ()),
        "field": ("field", "V/nm", ()),
        "all thicknesses": ("scale", "", (1, 2, 3, 4, 5)),
        "flux Al": ("flux", "", (1, 3, 5)),
        "flux Ga": ("flux", "", (1, 2, 3, 5)),
    }
    assert list_parameters(STACK)[0] == Parameter(
        "wall.thickness", 1, "thickness", "nm", layer_numbers=(1, 5)
    )
    assert [p.layer_number for p in list_parameters(STACK)[-5:]] == [None] * 5


def test_list_names_each_number_once():
    names = [p.name for p in list_parameters(STACK)]
    assert len(set(names)) == len(names)
    for name in names:
        assert replace(STACK, name, read(STACK, name)) is STACK


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("wall.thickness", 30.0),
        ("wall.composition", 0.28),
        ("well.thickness", 22.0),
        ("well.field", 1e-3),
        ("well.donors", 2e-3),
        ("layer 3.x_last", 0.3),
        ("layer 3.x_shift", 0.0),
        ("layer 4.edge", 0.25),
        ("layer 5.thickness", 30.0),
        ("temperature", 77.0),
        ("field", 0.0),
        ("bias", 0.0),
    ],
)
def test_read_and_replace(name, value):
    assert read(STACK, name) == value
    changed = replace(STACK, name, 0.123)
    assert read(changed, name) == (0.0 if name.endswith("shift") else 0.123)
    assert changed != STACK


def test_a_label_is_one_parameter_and_a_number_is_one_layer():
    both = replace(STACK, "wall.thickness", 25.0)
    assert [w.layer.thickness.value for w in both.written()] == [25.0, 22.0, 8.0, 8.0, 25.0]
    one = replace(STACK, "layer 5.thickness", 25.0)
    assert [w.layer.thickness.value for w in one.written()] == [30.0, 22.0, 8.0, 8.0, 25.0]
    assert {"layer 1.thickness", "layer 5.thickness", "wall.composition"} < listed(one).keys()
    assert "wall.thickness" not in listed(one)
    with pytest.raises(
        StackError,
        match=r"^wall.thickness: layers with this label differ: layer 1 has 30 nm, layer 5 has"
        r" 25 nm; name one, as 'layer 1.thickness'",
    ):
        read(one, "wall.thickness")


def test_find_knows_every_name_that_can_be_read():
    for parameter in list_parameters(STACK):
        found = find(STACK, parameter.name)
        assert (found.name, found.unit) == (parameter.name, parameter.unit)
        assert found.layer_numbers == parameter.layer_numbers
    alone = find(STACK, "layer 5.composition")
    assert (alone.layer_numbers, alone.kind) == ((5,), "composition")
    with pytest.raises(UnknownName, match=r"^wal\.thickness: no layer has the label 'wal'; did"):
        find(STACK, "wal.thickness")


def test_copies_move_together():
    changed = replace(STACK, "layer 3.thickness", 9.0)
    assert [layer.thickness.value for layer, n in changed.grown() if n == 3] == [9.0] * 30


def test_a_label_with_dots():
    stack = Stack([Layer("5 nm", "GaAs", label="a.b")])
    assert read(stack, "a.b.thickness") == 5.0


def test_thickness_stretches_what_is_along_it():
    table = Layer("8 nm", "AlxGa1-xAs", x=[("0 nm", 0.0), ("2 nm", 0.1), ("8 nm", 0.3)])
    called = Layer("8 nm", "AlxGa1-xAs", x=lambda z: 0.3 * z / 8)
    stack = replace(Stack([table, called]), "layer 1.thickness", 4.0)
    stack = replace(stack, "layer 2.thickness", 4.0)
    assert stack.layers[0].x == Points((0.0, 1.0, 4.0), (0.0, 0.1, 0.3))
    assert stack.layers[1].x.at(np.array([2.0, 4.0]), 4.0) == pytest.approx([0.15, 0.3])


def test_shifts_move_every_shape():
    shapes = [[0.0, 0.3], [("0 nm", 0.0), ("8 nm", 0.3)]]
    for x in shapes:
        stack = Stack([Layer("8 nm", "AlxGa1-xAs", x=x)])
        moved = replace(stack, "layer 1.x_shift", 0.25).layers[0].x
        assert moved.at(np.array([0.0, 8.0]), 8.0) == pytest.approx([0.25, 0.55])
    stack = Stack([Layer("8 nm", "AlxGa1-xAs", x=np.sin)])
    moved = replace(stack, "layer 1.x_shift", 0.25)
    assert moved.layers[0].x.at(np.array([0.5]), 8.0) == pytest.approx([np.sin(0.5) + 0.25])
    assert pickle.loads(pickle.dumps(moved)).layers[0].x.at(np.array([0.5]), 8.0) > 0.7
    quadratic = Stack([Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3], grading="quadratic")])
    assert replace(quadratic, "layer 1.x_first", 0.1) == Stack(
        [Layer("8 nm", "AlxGa1-xAs", x=[0.1, 0.3], grading="quadratic")]
    )
    assert replace(STACK, "layer 3.x_last", 0.2).written()[2].layer.x == Linear(0.0, 0.2)


@pytest.mark.parametrize(
    ("formula", "value", "found"),
    [
        ("Al0.28Ga0.72As", 0.29, "Al0.29Ga0.71As"),
        ("In0.53Ga0.47As", 0.5, "In0.5Ga0.5As"),
        ("Al0.28Ga0.72As", 0.0, "Al0Ga1As"),
        ("Al0.28Ga0.72As", 1.0, "Al1Ga0As"),
        ("Al0.28Ga0.72As", 1e-7, "Al0.0000001Ga0.9999999As"),
        ("In0.5Al0.2Ga0.3As", 0.6, "In0.6Al0.16Ga0.24As"),
        ("In1Al0Ga0As", 0.6, "In0.6Al0Ga0.4As"),
        ("GaAs0.51Sb0.49", 0.5, "GaAs0.5Sb0.5"),
    ],
)
def test_composition_of_a_formula(formula, value, found):
    changed = replace(Stack([Layer("5 nm", formula)]), "layer 1.composition", value)
    assert changed.layers[0].material == found
    assert read(changed, "layer 1.composition") == value


def test_both_sublattices():
    stack = Stack([Layer("5 nm", "In0.7Ga0.3As0.6P0.4")])
    assert read(stack, "layer 1.composition") == 0.7
    changed = replace(stack, "layer 1.anion_composition", 0.5)
    assert changed.layers[0].material == "In0.7Ga0.3As0.5P0.5"


def test_a_binary_has_no_composition():
    with pytest.raises(UnknownName, match=r"^layer 1.composition: layer 1 \(GaAs\) has no 'comp"):
        read(Stack([Layer("5 nm", "GaAs")]), "layer 1.composition")


def test_the_stacks_own():
    stack = Stack([WALL], field="12 kV/cm", electrons_run="to surface", substrate="In0.53Ga0.47As")
    assert listed(stack)["substrate"] == ("substrate", "", ())
    assert read(stack, "substrate") == 0.53
    assert replace(stack, "substrate", 0.52).substrate == "In0.52Ga0.48As"
    stronger = replace(stack, "field", 0.002)
    assert (stronger.field, stronger.electrons_run) == (0.002, "to surface")
    biased = Stack([WALL], bias="0.3 V")
    assert "bias" in listed(biased) and "field" not in listed(biased)
    assert replace(biased, "bias", -0.1).bias == -0.1
    assert replace(STACK, "bias", 0.2).bias == 0.2


def test_shifted_adds_decimals():
    assert shifted(STACK, "wall.composition", 0.01).layers[0].material == "Al0.29Ga0.71As"
    assert read(shifted(STACK, "temperature", 10), "temperature") == 87.0
    assert read(shifted(STACK, "field", 1e-4), "field") == 1e-4
    assert (
        read(shifted(STACK, "layer 4.thickness", -1, monolayer_nm=0.28), "layer 4.thickness")
        == 7.72
    )
    assert read(shifted(STACK, "well.thickness", 1, monolayer_nm=0.28), "well.thickness") == 23.0
    assert read(shifted(STACK, "well.thickness", 0.5), "well.thickness") == 22.5


MISTAKES = [
    (
        "wel.thickness",
        1.0,
        UnknownName,
        "wel.thickness: no layer has the label 'wel'; did you mean",
    ),
    (
        "well.thicknes",
        1.0,
        UnknownName,
        "well.thicknes: well has no 'thicknes'; did you mean 'thick",
    ),
    ("temprature", 1.0, UnknownName, "temprature: no parameter; did you mean 'temperature'"),
    ("layer 9.thickness", 1.0, UnknownName, "layer 9.thickness: the stack has layers 1 to 5"),
    (
        "layer 3.x",
        0.1,
        UnknownName,
        r"layer 3.x: layer 3 \(AlxGa1-xAs\) has no 'x'; known are thick",
    ),
    ("substrate", 0.1, UnknownName, "substrate: the stack has no alloy as substrate"),
    ("well.thickness", 0.0, StackError, "well.thickness: got 0; a thickness must be above zero"),
    (
        "well.thickness",
        float("nan"),
        StackError,
        "well.thickness: got nan; a parameter must be fin",
    ),
    ("temperature", float("inf"), StackError, "temperature: got inf; a parameter must be finite"),
    ("temperature", -1.0, BandwrightError, "^temperature: got '-1 K'"),
    ("wall.composition", 1.01, StackError, "wall.composition: got 1.01; a fraction lies between 0"),
    ("layer 3.x_shift", 0.8, BandwrightError, "layer 3.x_shift.*: x: got 1.1; a fraction lies"),
    (
        "layer 4.mass",
        -0.1,
        BandwrightError,
        "layer 4.mass.*: mass: got -0.1; it must be above zero",
    ),
    ("well.donors", -0.1, BandwrightError, "well.donors.* can't be negative"),
]


@pytest.mark.parametrize(("name", "value", "kind", "match"), MISTAKES)
def test_mistakes(name, value, kind, match):
    with pytest.raises(kind, match=match):
        replace(STACK, name, value)


def test_more_mistakes():
    with pytest.raises(
        StackError, match=r"^bias: the stack has a field; stack.replace\(field=None, b"
    ):
        replace(Stack([WALL], field="1 kV/cm"), "bias", 0.1)
    with pytest.raises(StackError, match=r"^well\.field: a step in monolayers is for a thickness"):
        shifted(STACK, "well.field", 1, monolayer_nm=0.28)
    with pytest.raises(StackError, match="temperature: a step in monolayers is for a thickness"):
        shifted(STACK, "temperature", 1, monolayer_nm=0.28)
    odd = Stack([WALL, Layer("5 nm", "unobtainium")])
    with pytest.raises(MaterialError, match="layer 2: 'unobtainium'"):
        list_parameters(odd)
    with pytest.raises(UnknownName, match="no parameter; did you mean 'field'"):
        read(odd, "feld")
