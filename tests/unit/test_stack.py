"""Layers, groups and stacks: what is stored, what is equal, and what can't be grown."""

import copy
import dataclasses
import multiprocessing
import os
import pickle
import re
from pathlib import Path

import numpy as np
import pint
import pytest

import bandwright as bw
from bandwright import Layer, Repeat, Stack
from bandwright.errors import BandwrightError, QuantityError, StackError, UnknownName
from bandwright.quantities import Density, Length
from bandwright.shapes import Flat, Function, Linear, Points, Quadratic
from bandwright.stack import MOST_LAYERS, layer_name, numbered_layer

BARRIER = Layer("30 nm", "Al0.28Ga0.72As", label="left barrier")
WELL = Layer("6.2 nm", "GaAs", donors="2e11 / cm^2", label="well")
OWN = Layer("30 nm", edge="235 meV", mass=0.089, gap="1.79 eV")


def refused(text, kind=StackError):
    return pytest.raises(kind, match="^" + re.escape(text) + "$")


def ramp(depth):
    return 0.3 * depth / 8.0


# --- layers ---------------------------------------------------------------------------------


def test_a_layer_stores_core_units():
    assert dataclasses.asdict(WELL) == {
        "thickness": Length(6.2, "nm"),
        "material": "GaAs",
        "fractions": (),
        "edge": None,
        "mass": None,
        "gap": None,
        "nonparabolicity": None,
        "field": None,
        "donors": Density(0.002, "sheet"),
        "acceptors": None,
        "delta_donors": None,
        "delta_acceptors": None,
        "interface_width": None,
        "label": "well",
    }
    assert (OWN.edge, OWN.mass, OWN.gap) == (Flat(0.235), Flat(0.089), Flat(1.79))
    assert OWN.own_numbers and not WELL.own_numbers
    polar = Layer("22 ML", "GaN", field="3 MV/cm", acceptors="3e17 cm^-3")
    assert polar.thickness == Length(22.0, "ML")
    assert polar.field == 0.3
    assert polar.acceptors == Density(0.0003, "volume")
    bent = Layer("30 nm", edge="0.2 eV", mass="0.09", nonparabolicity="0.56 / eV")
    assert bent.nonparabolicity == Flat(0.56)


def test_shapes_of_a_layer():
    layer = Layer("8 nm", "AlxInyGa1-x-yAs", x=[0.0, 0.3], y=[("0 nm", 0.1), ("8 nm", 0.2)])
    assert layer.x == Linear(0.0, 0.3)
    assert layer.y == Points((0.0, 8.0), (0.1, 0.2))
    assert layer.fractions == (("x", layer.x), ("y", layer.y))
    assert layer.shapes == layer.fractions
    assert Layer("8 nm", "AlxGa1-xAs", x=ramp).x == Function(ramp)
    bowl = Layer("8 nm", edge=["0 meV", "0.2 eV"], mass=[0.06, 0.08], grading="quadratic")
    assert bowl.shapes == (("edge", Quadratic(0.0, 0.2)), ("mass", Quadratic(0.06, 0.08)))
    assert WELL.x is None and WELL.y is None and WELL.shapes == ()


def test_layers_written_differently_are_equal():
    assert Layer("62 Å", "GaAs") == Layer("6.2 nm", " GaAs ")
    assert Layer(pint.Quantity(62, "angstrom"), "GaAs") == Layer("6.2 nm", "GaAs")
    assert hash(Layer("62 Å", "GaAs")) == hash(Layer("6.2 nm", "GaAs"))
    assert Layer("8 nm", "AlxGa1-xAs", x=np.float64(0.3)).x == Flat(0.3)
    assert Layer("22 ML", "GaAs") != Layer("22 nm", "GaAs")
    assert WELL != BARRIER
    assert WELL != WELL.replace(label=None)


def test_replace_takes_inputs_and_stored_values():
    assert WELL.replace(thickness="70 Å").thickness == Length(7.0, "nm")
    assert WELL.replace(thickness=Length(7.0, "nm")).donors == WELL.donors
    assert WELL.replace(donors=None, label=None) == Layer("6.2 nm", "GaAs")
    assert OWN.replace(edge=Flat(0.25)).edge == Flat(0.25)
    graded = Layer("8 nm", "AlxInyGa1-x-yAs", x=[0.0, 0.3], y=0.1)
    assert graded.replace(y=0.2).fractions == (("x", Linear(0.0, 0.3)), ("y", Flat(0.2)))
    assert graded.replace(y=None).fractions == (("x", Linear(0.0, 0.3)),)
    swapped = OWN.replace(edge=None, mass=None, gap=None, material="AlAs")
    assert swapped == Layer("30 nm", "AlAs")


def test_replace_keeps_the_grading():
    bowl = Layer("8 nm", edge=["0 meV", "200 meV"], mass=0.067, grading="quadratic")
    assert bowl.replace(edge=["0 meV", "210 meV"]).edge == Quadratic(0.0, 0.21)
    assert bowl.replace(edge=["0 meV", "210 meV"], grading="linear").edge == Linear(0.0, 0.21)
    assert bowl.replace(edge="0 meV").edge == Flat(0.0)


def test_reversed_turns_every_shape_over():
    layer = Layer(
        "8 nm",
        "AlxInyGa1-x-yAs",
        x=[0.0, 0.3],
        y=[("0 nm", 0.1), ("3 nm", 0.2), ("8 nm", 0.3)],
        field="3 kV/cm",
    )
    turned = layer.reversed()
    assert turned.x == Linear(0.3, 0.0)
    assert turned.y == Points((0.0, 5.0, 8.0), (0.3, 0.2, 0.1))
    assert turned.field == layer.field
    assert turned.reversed() == layer
    assert Layer("22 ML", "AlxGa1-xAs", x=[0.0, 0.3]).reversed().x == Linear(0.3, 0.0)


@pytest.mark.parametrize(
    "layer",
    [
        WELL,
        OWN,
        Layer("22 ML", "GaN", field="-3 MV/cm", acceptors="3e17 cm^-3"),
        Layer("8 nm", "AlxInyGa1-x-yAs", x=[0.0, 0.3], y=[("0 nm", 0.1), ("8 nm", 0.2)]),
        Layer("8 nm", edge=["0 meV", "1.2 eV"], mass=[0.06, 0.08], grading="quadratic"),
        Layer("8 nm", edge=[("0 nm", "0 meV"), ("8 nm", "1 eV")], mass=1, nonparabolicity="1/eV"),
        Repeat(30, [WELL, Repeat(2, [BARRIER])]),
        Stack([BARRIER, OWN], zero="left barrier", field="12 kV/cm", electrons_run="to surface"),
        Stack([WELL], bias="-0.3 V", ends="wall", temperature="77 K", substrate="GaAs"),
        Stack([WELL], name="stack 3", bands="one-band", ends="periodic", materials=["a.toml"]),
    ],
)
def test_repr_pickle_hash(layer):
    assert eval(repr(layer), vars(bw) | {name: getattr(bw, name) for name in bw.__all__}) == layer
    again = pickle.loads(pickle.dumps(layer))
    assert again == layer
    assert hash(again) == hash(layer)
    for field in dataclasses.fields(layer):
        with pytest.raises(dataclasses.FrozenInstanceError, match="cannot assign"):
            setattr(layer, field.name, None)


def test_a_layer_with_a_callable_pickles_if_the_callable_does():
    layer = Layer("8 nm", "AlxGa1-xAs", x=ramp)
    assert pickle.loads(pickle.dumps(layer)) == layer
    assert "ramp" in repr(layer)


def test_layer_names():
    assert layer_name(2, WELL) == "well"
    assert layer_name(2, Layer("6.2 nm", "GaAs")) == "layer 2 (GaAs)"
    assert layer_name(3, OWN) == "layer 3 (own numbers)"


def test_a_numbered_layer_is_a_layer():
    inputs = {"thickness": "8 nm", "material": "AlxGa1-xAs", "x": [0.0, 0.3], "label": "ramp"}
    assert numbered_layer(2, **inputs) == Layer(**inputs)


@pytest.mark.parametrize(
    ("inputs", "says", "kind"),
    [
        ({"thickness": 6.2, "material": "GaAs"},
         "layer 2 (GaAs): thickness: got 6.2; write '6.2 nm'", QuantityError),
        ({"thickness": 6.2, "material": "GaAs", "label": "well"},
         "layer 2, 'well' (GaAs): thickness: got 6.2; write '6.2 nm'", QuantityError),
        ({"material": "GaAs"},
         "layer 2 (GaAs): thickness: missing; write for example '6.2 nm'", StackError),
        ({"thickness": "6.2 nm", "materiel": "GaAs"},
         "layer 2 (own numbers): 'materiel' is no input; did you mean 'material'?", UnknownName),
        ({"thickness": "8 nm", "material": "AlxGa1-xAs", "x": [0, 1.3]},
         "layer 2 (AlxGa1-xAs): x (last value): got 1.3; a fraction lies between 0 and 1; for perc"
         "ent write 0.013", QuantityError),
        ({"thickness": "8 nm", "material": "AlxGa1-xAs", "x": [["0 nm", 0], ["7 nm", 0.3]]},
         "layer 2 (AlxGa1-xAs): x: the table ends at 7 nm and the layer is 8 nm thick; end the tab"
         "le at the thickness", StackError),
        ({"thickness": "8 nm", "material": "AlxGa1-xAs", "x": [["1 nm", 0], ["8 nm", 0.3]]},
         "layer 2 (AlxGa1-xAs): x: the first depth is 1 nm; the table must start at '0 nm'",
         StackError),
    ],
)  # fmt: skip
def test_a_numbered_layer_says_which(inputs, says, kind):
    with refused(says, kind) as caught:
        numbered_layer(2, **inputs)
    again = pickle.loads(pickle.dumps(caught.value))
    assert (str(again), again.where) == (says, caught.value.where)


@pytest.mark.parametrize(
    ("inputs", "says"),
    [
        ({"material": "GaAs"}, "layer (GaAs): thickness: got None; write a thickness as text such"
         " as '6.2 nm'"),
        ({"thickness": 6.2, "material": "GaAs"},
         "layer (GaAs): thickness: got 6.2; write '6.2 nm'"),
        ({"thickness": "0 nm", "material": "GaAs", "label": "well"},
         "layer 'well' (GaAs): thickness: got '0 nm'; a thickness must be above zero"),
        ({}, "layer: no material; write one such as 'GaAs', or give edge and mass"),
        ({"material": " "}, "layer ( ): material: got ' '; write one line of text"),
        ({"material": 3}, "layer: material: got 3; write one line of text"),
        ({"material": "GaAs", "label": ""},
         "layer '' (GaAs): label: got ''; write one line of text"),
        ({"material": "GaAs", "label": "two\nlines"},
         "layer 'two\\nlines' (GaAs): label: got 'two\\nlines'; write one line of text"),
        ({"material": "GaAs", "label": 3}, "layer (GaAs): label: got 3; write one line of text"),
        ({"material": "GaAs", "label": "Layer 7"},
         "layer 'Layer 7' (GaAs): label: got 'Layer 7'; that is what layers without a label are ca"
         "lled; take another"),
        ({"material": "GaAs", "edge": "0.2 eV", "mass": 0.09},
         "layer (GaAs): edge and mass: own numbers on a material; leave out the material, or write"
         " a variant of it into a material file"),
        ({"material": "GaAs", "gap": "1.4 eV"},
         "layer (GaAs): gap: own numbers on a material; leave out the material, or write a variant"
         " of it into a material file"),
        ({"edge": "0.2 eV"}, "layer: mass: missing beside edge; write for example 0.067"),
        ({"mass": 0.09}, "layer: edge: missing beside mass; write for example '235 meV'"),
        ({"edge": "0.2 eV", "mass": 0.09, "x": 0.3}, "layer: x: a fraction needs a material's form"
         "ula"),
        ({"edge": "0.2 eV", "mass": 0.09, "gap": "1 eV", "nonparabolicity": "1 / eV"},
         "layer: gap and nonparabolicity: both given; leave one out"),
        ({"thickness": "22 ML", "edge": "0.2 eV", "mass": 0.09},
         "layer: thickness: got '22 ML'; monolayers need a material; write a length in nm"),
        ({"edge": 0.2, "mass": 0.09}, "layer: edge: got 0.2; write '0.2 meV'"),
        ({"edge": "0.2 eV", "mass": 0}, "layer: mass: got 0; a mass must be above zero"),
        ({"edge": "0.2 eV", "mass": Flat(-1)}, "layer: mass: got -1.0; it must be above zero"),
        ({"edge": "0.2 eV", "mass": 0.09, "gap": "0 eV"},
         "layer: gap: got '0 eV'; a gap must be above zero"),
        ({"edge": "0.2 eV", "mass": 0.09, "gap": Flat(-1.0)},
         "layer: gap: got -1.0; it must be above zero"),
        ({"edge": "0.2 eV", "mass": 0.09, "nonparabolicity": "-1 / eV"},
         "layer: nonparabolicity: got -1.0; it can't be negative"),
        ({"material": "AlxGa1-xAs", "x": Linear(0.0, 1.5)},
         "layer (AlxGa1-xAs): x: got 1.5; a fraction lies between 0 and 1"),
        ({"material": "AlxGa1-xAs", "x": 0.3, "grading": "quadratic"},
         "layer (AlxGa1-xAs): grading: got 'quadratic' but no pair to grade; give one, such as x ="
         " [0, 0.3]"),
        ({"material": "AlxGa1-xAs", "x": (0, 0.3), "grading": "quadratc"},
         "layer (AlxGa1-xAs): grading: got 'quadratc'; did you mean 'quadratic'?"),
        ({"material": "AlxGa1-xAs", "x": (0, 0.3), "grading": "cubic"},
         "layer (AlxGa1-xAs): grading: got 'cubic'; write 'linear' or 'quadratic'"),
        ({"edge": Linear(0.0, 0.2), "mass": Quadratic(0.06, 0.09)},
         "layer: grading: a linear and a quadratic pair; grade the pairs of a layer alike"),
        ({"material": "GaN", "field": 3}, "layer (GaN): field: got 3; write '3 kV/cm'"),
        ({"material": "GaAs", "donors": "3e17"}, "layer (GaAs): donors: got '3e17'; write '3e17 /"
         " cm^2'"),
    ],
)  # fmt: skip
def test_layers_that_cannot_be_grown(inputs, says):
    thickness = inputs.pop("thickness", None if says.endswith("as '6.2 nm'") else "6.2 nm")
    with refused(says, BandwrightError):
        Layer(thickness, **inputs)


def test_a_change_that_cannot_be_grown():
    with refused("layer 'well' (GaAs): edge: own numbers on a material; leave out the material, "
                 "or write a variant of it into a material file"):  # fmt: skip
        WELL.replace(edge="0.2 eV")
    with refused("Layer.replace: 'thicknes' is no input; did you mean 'thickness'?", UnknownName):
        WELL.replace(thicknes="7 nm")


# --- groups ---------------------------------------------------------------------------------


def test_groups():
    group = Repeat(np.int64(30), (layer for layer in [WELL, BARRIER]))
    assert group == Repeat(30, [WELL, BARRIER])
    assert type(group.times) is int
    assert group.reversed() == Repeat(30, [BARRIER, WELL])


@pytest.mark.parametrize(
    ("times", "layers", "says"),
    [
        (0, [WELL], "group: times: got 0; write a whole number from 1"),
        (-3, [WELL], "group: times: got -3; write a whole number from 1"),
        (2.0, [WELL], "group: times: got 2.0; write a whole number from 1"),
        ("2", [WELL], "group: times: got '2'; write a whole number from 1"),
        (True, [WELL], "group: times: got True; write a whole number from 1"),
        (1_000_001, [WELL], "group: times: got 1000001; at most 1,000,000"),
        (2, [], "group: no layers; give at least one"),
        (2, [WELL, "GaAs"], "group: entry 2 is 'GaAs'; a Layer or a Repeat is due"),
        (2, 5, "group: layers: got 5; give a list of layers"),
    ],
)
def test_groups_that_cannot_be_grown(times, layers, says):
    with refused(says):
        Repeat(times, layers)


# --- stacks ---------------------------------------------------------------------------------


def test_a_stack_stores_core_units():
    stack = Stack(
        [BARRIER, WELL, OWN],
        name=" monitor ",
        temperature="77 K",
        substrate="GaAs",
        field="12 kV/cm",
        electrons_run="to surface",
        ends=["open", "wall"],
        zero="GaAs",
        bands="two-band",
        materials=[Path("house.toml"), "other.toml"],
    )
    assert stack.layers == (BARRIER, WELL, OWN)
    assert stack.name == "monitor"
    assert (stack.temperature, stack.field, stack.bias) == (77.0, 0.0012, None)
    assert stack.ends == ("open", "wall")
    assert stack.materials == (os.path.abspath("house.toml"), os.path.abspath("other.toml"))
    assert Stack([WELL]).temperature == 300.0
    assert Stack([WELL]).ends == Stack([WELL], ends="open").ends == ("open", "open")
    assert Stack([WELL], materials="other.toml").materials == stack.materials[1:]


def test_which_way_electrons_run():
    # F > 0 along growth: an electron gains e F z, so it runs to the substrate (z = 0)
    assert Stack([WELL]).signed_field is None
    assert Stack([WELL], field="-12 kV/cm").signed_field == -0.0012
    down = Stack([WELL], field="12 kV/cm", electrons_run="to substrate")
    up = Stack([WELL], field="12 kV/cm", electrons_run="to surface")
    assert (down.signed_field, up.signed_field) == (0.0012, -0.0012)
    # U > 0 on the surface: the energy falls towards the surface by e U
    assert Stack([WELL], bias="-0.3 V").signed_bias == -0.3
    down = Stack([WELL], bias="0.3 V", electrons_run="to substrate")
    up = Stack([WELL], bias="0.3 V", electrons_run="to surface")
    assert (down.signed_bias, up.signed_bias) == (-0.3, 0.3)
    assert Stack([WELL], field="0 kV/cm", electrons_run="to surface").signed_field == 0.0


def test_surface_first_turns_all_over():
    ramp_up = Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3])
    ramp_down = Layer("8 nm", "AlxGa1-xAs", x=[0.3, 0.0])
    points = Layer("8 nm", "AlxGa1-xAs", x=[("0 nm", 0.0), ("3 nm", 0.1), ("8 nm", 0.3)])
    turned = Layer("8 nm", "AlxGa1-xAs", x=[("0 nm", 0.3), ("5 nm", 0.1), ("8 nm", 0.0)])
    listed = [WELL, Repeat(3, [BARRIER, ramp_up, Repeat(2, [WELL, points])]), points]
    grown = [turned, Repeat(3, [Repeat(2, [turned, WELL]), ramp_down, BARRIER]), WELL]
    stack = Stack(listed, order="surface first", ends=["wall", "open"], field="3 kV/cm")
    assert stack == Stack(grown, ends=["open", "wall"], field="3 kV/cm")
    assert stack.replace(layers=listed, order="surface first") == stack


def test_surface_first_needs_nm_for_tables():
    points = Layer("22 ML", "AlxGa1-xAs", x=[("0 nm", 0.0), ("6.2 nm", 0.3)], label="ramp")
    assert Stack([points]).layers == (points,)
    says = "can't be turned over in a layer counted in ML; give its thickness in nm, or list the"
    says += " stack with the first grown layer first"
    with refused(f"layer 'ramp' (AlxGa1-xAs): x: a table of points {says}"):
        Stack([points], order="surface first")
    with refused(f"layer (AlxGa1-xAs): x: a callable {says}"):
        Stack([Layer("22 ML", "AlxGa1-xAs", x=ramp)], order="surface first")


def test_a_callable_turned_over():
    stack = Stack([Layer("8 nm", "AlxGa1-xAs", x=ramp)], order="surface first")
    assert stack.layers[0].x.at([0.0, 6.0, 8.0], 8.0) == pytest.approx([0.3, 0.075, 0.0])


def test_written_and_grown():
    inner = Repeat(3, [WELL, OWN])
    stack = Stack([BARRIER, Repeat(2, [inner, BARRIER]), WELL], zero="GaAs")
    assert [(w.number, w.name, w.path, w.copies) for w in stack.written()] == [
        (1, "left barrier", (0,), 1),
        (2, "well", (1, 0, 0), 6),
        (3, "layer 3 (own numbers)", (1, 0, 1), 6),
        (4, "left barrier", (1, 1), 2),
        (5, "well", (2,), 1),
    ]
    grown = stack.grown()
    assert [number for _, number in grown] == [1, *[2, 3] * 3, 4, *[2, 3] * 3, 4, 5]
    by_number = {w.number: w.layer for w in stack.written()}
    assert all(layer == by_number[number] for layer, number in grown)


def test_with_layer_exchanges_one_written_layer():
    stack = Stack([BARRIER, Repeat(2, [Repeat(3, [WELL]), BARRIER])])
    thick = WELL.replace(thickness="7 nm")
    changed = stack.with_layer(2, thick)
    assert changed == Stack([BARRIER, Repeat(2, [Repeat(3, [thick]), BARRIER])])
    assert changed.with_layer(2, WELL) == stack
    with refused("layer 4: the stack has layers 1 to 3"):
        stack.with_layer(4, WELL)


def test_replace():
    stack = Stack([BARRIER, WELL], temperature="77 K", field="12 kV/cm")
    changed = stack.replace(field=None, bias="0.3 V", layers=[WELL])
    assert changed == Stack([WELL], temperature="77 K", bias="0.3 V")
    with refused("Stack.replace: 'temprature' is no input; did you mean 'temperature'?",
                 UnknownName):  # fmt: skip
        stack.replace(temprature="77 K")
    with refused("order: 'surface first' needs the layers it is about"):
        stack.replace(order="surface first")
    with refused("field and bias: both given; leave one out"):
        stack.replace(bias="0.3 V")


@pytest.mark.parametrize(
    ("layers", "inputs", "says"),
    [
        ([], {}, "stack: no layers; give at least one"),
        ("6 nm GaAs", {}, "stack: layers: got '6 nm GaAs'; a line of text is read by parse_line(te"
         "xt)"),
        (WELL, {}, None),
        ([WELL, None], {}, "stack: entry 2 is None; a Layer or a Repeat is due"),
        ([WELL], {"field": "1 kV/cm", "bias": "1 V"}, "field and bias: both given; leave one out"),
        ([WELL], {"electrons_run": "to surface"}, "electrons_run: given without a field or bias; a"
         "dd one"),
        ([WELL], {"electrons_run": "to surfce", "bias": "1 V"},
         "electrons_run: got 'to surfce'; did you mean 'to surface' or 'to substrate'?"),
        ([WELL], {"electrons_run": "uphill", "bias": "1 V"},
         "electrons_run: got 'uphill'; write 'to surface' or 'to substrate'"),
        ([WELL], {"electrons_run": "to surface", "field": "-12 kV/cm"},
         "field: got '-12 kV/cm' beside electrons_run; with electrons_run it is a magnitude, so wr"
         "ite it without the minus sign"),
        ([WELL], {"electrons_run": "to surface", "bias": "-0.3 V"},
         "bias: got '-0.3 V' beside electrons_run; with electrons_run it is a magnitude, so write"
         " it without the minus sign"),
        ([WELL], {"field": 12}, "field: got 12; write '12 kV/cm'"),
        ([WELL], {"bias": 0.3}, "bias: got 0.3; write '0.3 V'"),
        ([WELL], {"temperature": 77}, "temperature: got 77; write '77 K'"),
        ([WELL], {"temperature": None}, "temperature: got None; write a temperature as text such a"
         "s '300 K'"),
        ([WELL], {"ends": "opened"}, "ends: got 'opened'; did you mean 'open'?"),
        ([WELL], {"ends": ["open"]}, "ends: got ['open']; write two, such as ['open', 'wall']"),
        ([WELL], {"ends": 5}, "ends: got 5; write two, such as ['open', 'wall']"),
        ([WELL], {"ends": ["open", 5]}, "ends: got 5; write 'open' or 'wall' or 'periodic'"),
        ([WELL], {"ends": ["open", "periodic"]},
         "ends: got ['open', 'periodic']; 'periodic' joins both sides: write it for both"),
        ([WELL], {"bands": "two band"}, "bands: got 'two band'; did you mean 'two-band' or 'one-ba"
         "nd'?"),
        ([WELL], {"bands": 2}, "bands: got 2; write 'one-band' or 'two-band'"),
        ([WELL], {"order": "first"}, "order: got 'first'; write 'first grown first' or 'surface fi"
         "rst'"),
        ([WELL], {"name": ""}, "name: got ''; write one line of text"),
        ([WELL], {"substrate": 5.65}, "substrate: got 5.65; write one line of text"),
        ([WELL], {"zero": 0}, "zero: got 0; write one line of text"),
        ([WELL], {"materials": 5}, "materials: got 5; give paths of material files"),
        ([WELL], {"materials": [5]}, "materials: got 5; give the path of a material file"),
        ([WELL], {"materials": [""]}, "materials: got ''; give the path of a material file"),
        ([OWN, WELL], {}, "zero: missing; layer 1 (own numbers) brings its own numbers and well a"
         " material: name what own edges count from, for example zero = 'well'"),
        ([OWN, Layer("8 nm", "AlxGa1-xAs", x=0.3)], {}, "zero: missing; layer 1 (own numbers) brin"
         "gs its own numbers and layer 2 (AlxGa1-xAs) a material: name what own edges count from,"
         " for example zero = 'GaAs'"),
        ([OWN, Layer("30 nm", edge="0.2 eV", mass=0.09)], {"bands": "two-band"},
         "bands: 'two-band' needs a gap or a nonparabolicity in layer 2 (own numbers)"),
    ],
)  # fmt: skip
def test_stacks_that_cannot_be_grown(layers, inputs, says):
    if says is None:
        says = f"stack: layers: got {layers!r}; give a list of layers"
    with refused(says, BandwrightError):
        Stack(layers, **inputs)


def test_a_million_layers_and_no_more():
    pair = [WELL, BARRIER]
    assert len(Stack([Repeat(MOST_LAYERS // 2, pair)]).grown()) == MOST_LAYERS
    with refused("1,000,001 grown layers; at most 1,000,000 can be grown: lower the times of its"
                 " groups"):  # fmt: skip
        Stack([Repeat(MOST_LAYERS // 2, pair), WELL])
    with refused("1,000,000,000,000 grown layers; at most 1,000,000 can be grown: lower the times"
                 " of its groups"):  # fmt: skip
        Stack([Repeat(1_000_000, [Repeat(1_000_000, [WELL])])])


def test_stacks_travel_to_spawned_processes():
    stack = Stack([BARRIER, Repeat(2, [WELL, OWN])], zero="GaAs", field="12 kV/cm")
    with multiprocessing.get_context("spawn").Pool(1) as pool:
        assert pool.apply(copy.copy, (stack,)) == stack
        assert pool.apply(repr, (stack,)) == repr(stack)
