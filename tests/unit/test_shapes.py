"""A value along a layer: what each shape says at a depth, and what makes none."""

import dataclasses
import math
import pickle
import re

import numpy as np
import pint
import pytest

from bandwright import quantities as q
from bandwright.errors import QuantityError, StackError
from bandwright.shapes import Flat, Function, Linear, Points, Quadratic, as_shape

DEPTHS = np.array([0.0, 2.0, 4.0, 8.0])
TABLE = Points((0.0, 3.0, 8.0), (0.0, 0.12, 0.30))


def refused(text, kind=StackError):
    return pytest.raises(kind, match="^" + re.escape(text) + "$")


def ramp(depth):
    return 0.3 * depth / 8.0


@pytest.mark.parametrize(
    ("shape", "values"),
    [
        (Flat(0.3), [0.3, 0.3, 0.3, 0.3]),
        (Linear(0.0, 0.4), [0.0, 0.1, 0.2, 0.4]),
        (Quadratic(0.0, 0.4), [0.0, 0.025, 0.1, 0.4]),
        (TABLE, [0.0, 0.08, 0.156, 0.30]),
        (Function(ramp), [0.0, 0.075, 0.15, 0.3]),
        (Function(lambda depth: 0.25), [0.25, 0.25, 0.25, 0.25]),
    ],
)
def test_values_along_a_layer(shape, values):
    assert shape.at(DEPTHS, 8.0) == pytest.approx(values, abs=1e-15)
    assert shape.at(DEPTHS.reshape(2, 2), 8.0).shape == (2, 2)
    assert float(shape.at(4.0, 8.0)) == pytest.approx(values[2], abs=1e-15)


def test_a_parabola_is_flat_at_the_named_face():
    # flat at the last face: last + (first - last) (1 - s/t)^2
    shape = Quadratic(0.0, 0.4)
    assert shape.at(DEPTHS, 8.0, flat_at="last") == pytest.approx([0.0, 0.175, 0.3, 0.4])
    step = 1e-6
    for face, depth, into in (("first", 0.0, step), ("last", 8.0, 8.0 - step)):
        near, there = shape.at([into, depth], 8.0, flat_at=face)
        assert abs(near - there) < 1e-12


def test_faces_are_exact():
    for shape in (Linear(0.1, 0.3), Quadratic(0.1, 0.3), Points((0.0, 0.3), (0.1, 0.3))):
        for flat_at in ("first", "last"):
            assert shape.at([0.0, 0.3], 0.3, flat_at=flat_at).tolist() == [0.1, 0.3]


def test_breaks_are_the_interior_points():
    assert TABLE.breaks(8.0) == (3.0,)
    assert Points((0.0, 8.0), (0.0, 0.3)).breaks(8.0) == ()
    for shape in (Flat(0.3), Linear(0.0, 0.3), Quadratic(0.0, 0.3), Function(ramp)):
        assert shape.breaks(8.0) == ()


def test_constant_is_what_is_known_to_be_constant():
    assert Flat(0.3).constant
    assert Linear(0.3, 0.3).constant and not Linear(0.3, 0.2).constant
    assert Quadratic(0.3, 0.3).constant and not Quadratic(0.3, 0.2).constant
    assert Points((0.0, 1.0), (0.3, 0.3)).constant and not TABLE.constant
    assert not Function(lambda depth: 0.3).constant


@pytest.mark.parametrize(
    "shape", [Flat(0.3), Linear(0.0, 0.3), Quadratic(0.0, 0.3), TABLE, Function(ramp)]
)
def test_reversed_mapped_stretched(shape):
    turned = {"first": "last", "last": "first"}
    for flat_at in ("first", "last"):
        there = shape.at(DEPTHS, 8.0, flat_at=flat_at)
        back = shape.reversed(8.0).at(8.0 - DEPTHS, 8.0, flat_at=turned[flat_at])
        assert back == pytest.approx(there, abs=1e-15)
        wide = shape.stretched(1.5).at(1.5 * DEPTHS, 12.0, flat_at=flat_at)
        assert wide == pytest.approx(there, abs=1e-15)
        moved = shape.mapped(lambda v: 2.0 * v - 0.1).at(DEPTHS, 8.0, flat_at=flat_at)
        assert moved == pytest.approx(2.0 * there - 0.1, abs=1e-15)
    assert shape.reversed(8.0).reversed(8.0) == shape


def test_tables_turn_over_in_decimals():
    table = Points((0.0, 0.1, 6.2), (1.0, 2.0, 3.0))
    assert table.reversed(6.2) == Points((0.0, 6.1, 6.2), (3.0, 2.0, 1.0))


@pytest.mark.parametrize(
    "shape", [Flat(0.3), Linear(0.0, 0.3), Quadratic(0.0, 0.3), TABLE, Function(ramp)]
)
def test_shapes_hash_compare_and_pickle(shape):
    again = pickle.loads(pickle.dumps(shape))
    assert again == shape
    assert hash(again) == hash(shape)
    for field in dataclasses.fields(shape):
        with pytest.raises(dataclasses.FrozenInstanceError, match="cannot assign"):
            setattr(shape, field.name, 1.0)


def test_equality_is_by_value_and_kind():
    assert Flat(1) == Flat(1.0) == Flat(np.float64(1))
    assert Linear(0.0, 0.3) != Quadratic(0.0, 0.3)
    assert Points([0, 8], np.array([0.0, 0.3])) == Points((0.0, 8.0), (0.0, 0.3))
    assert Function(ramp) == Function(ramp)
    assert Function(ramp) != Function(lambda depth: 0.3 * depth / 8.0)
    assert Function(ramp) != Function(ramp).stretched(2.0)
    assert Function(ramp) != Flat(0.3)
    unhashable = np.poly1d([0.0375, 0.0])
    assert hash(Function(unhashable)) == hash(Function(unhashable))


@pytest.mark.parametrize(
    ("make", "says"),
    [
        (lambda: Flat(math.nan), "value: got nan; that is not finite"),
        (lambda: Flat("0.3"), None),
        (lambda: Flat("much"), "value: got 'much'; a float in core units is due"),
        (lambda: Linear(0.0, math.inf), "last value: got inf; that is not finite"),
        (lambda: Quadratic(None, 0.0), "first value: got None; a float in core units is due"),
        (lambda: Points((0.0, 8.0), (0.0, math.nan)), "value: got nan; that is not finite"),
        (lambda: Points((0.0, 8.0), (0.0,)), "got 2 depths and 1 values; give as many"),
        (lambda: Points((0.0,), (0.0,)), "got 1 point; a table needs two or more"),
        (
            lambda: Points((1.0, 8.0), (0.0, 0.3)),
            "the first depth is 1 nm; the table must start at '0 nm'",
        ),
        (
            lambda: Points((0.0, 3.0, 3.0, 8.0), (0.0, 0.1, 0.2, 0.3)),
            "depth 3 nm follows 3 nm; depths must increase (for a jump, write two layers)",
        ),
        (
            lambda: TABLE.check_covers(8.1),
            "the table ends at 8 nm and the layer is 8.1 nm thick; end the table at the thickness",
        ),
        (
            lambda: TABLE.reversed(8.1),
            "the table ends at 8 nm and the layer is 8.1 nm thick; end the table at the thickness",
        ),
        (
            lambda: TABLE.reversed(None),
            "a table of points can't be turned over in a layer counted in ML; give its thickness"
            " in nm, or list the stack with the first grown layer first",
        ),
        (
            lambda: Function(ramp).reversed(None),
            "a callable can't be turned over in a layer counted in ML; give its thickness in nm,"
            " or list the stack with the first grown layer first",
        ),
        (lambda: Function(0.3), "got 0.3; a callable of the depth is due"),
        (
            lambda: Function(lambda depth: [0.1, 0.2]).at(np.array([0.0, 1.0, 2.0]), 8.0),
            "the callable returned [0.1, 0.2] for depths of shape (3,); it must return one float"
            " for each depth",
        ),
        (
            lambda: Function(lambda depth: "x").at(0.0, 8.0),
            "the callable returned 'x' for depths of shape (); it must return one float for each"
            " depth",
        ),
        (
            lambda: Function(lambda depth: np.where(depth > 1.5, np.nan, 0.1)).at(DEPTHS, 8.0),
            "the callable is not finite at 2 nm",
        ),
        (
            lambda: Function(lambda depth: math.inf).at(2.5, 8.0),
            "the callable is not finite at 2.5 nm",
        ),
    ],
)
def test_what_makes_no_shape(make, says):
    if says is None:
        assert make().value == 0.3
        return
    with refused(says):
        make()


def test_a_table_may_be_rounded():
    Points((0.0, 33.333333), (0.0, 0.3)).check_covers(100 / 3)


# --- as_shape -------------------------------------------------------------------------------

UREG = pint.UnitRegistry()


@pytest.mark.parametrize(
    ("value", "shape"),
    [
        (0.3, Flat(0.3)),
        (np.float64(0.3), Flat(0.3)),
        (np.array(0.3), Flat(0.3)),
        ("30 %", Flat(0.3)),
        (UREG.Quantity(30, "percent"), Flat(0.3)),
        ((0.0, 0.3), Linear(0.0, 0.3)),
        ([0.0, "30 %"], Linear(0.0, 0.3)),
        (np.array([0.0, 0.3]), Linear(0.0, 0.3)),
        ([("0 nm", 0.0), ("80 Å", 0.3)], Points((0.0, 8.0), (0.0, 0.3))),
        ((["0 nm", 0.0], [3 * UREG.nm, 0.12], ("8 nm", 0.3)), TABLE),
        (ramp, Function(ramp)),
        (TABLE, TABLE),
    ],
)
def test_what_a_value_stands_for(value, shape):
    assert as_shape(value, q.as_fraction, "x") == shape


def test_grading():
    assert as_shape((0.0, 0.3), q.as_fraction, "x", "quadratic") == Quadratic(0.0, 0.3)
    assert as_shape((0.0, 0.3), q.as_fraction, "x", "linear") == Linear(0.0, 0.3)
    energies = as_shape(["0 meV", "235 meV"], q.as_energy, "edge", "quadratic")
    assert energies == Quadratic(0.0, 0.235)


@pytest.mark.parametrize(
    ("value", "says", "kind"),
    [
        ([0.1, 0.2, 0.3], "x: got [0.1, 0.2, 0.3]; give one value, a pair (first face, last face),"
         " or a table of (depth, value) points", StackError),
        ([], "x: got []; give one value, a pair (first face, last face), or a table of (depth, val"
         "ue) points", StackError),
        ([0.1], "x: got [0.1]; give one value, a pair (first face, last face), or a table of (dept"
         "h, value) points", StackError),
        ([0.1, 1.2], "x (last value): got 1.2; a fraction lies between 0 and 1; for percent write"
         " 0.012", QuantityError),
        ([-0.1, 0.2], "x (first value): got -0.1; a fraction lies between 0 and 1", QuantityError),
        ([("0 nm", 0.1), ("3 nm", 0.1, 0.2)], "x: point 2 is ('3 nm', 0.1, 0.2); a point is (depth"
         ", value)", StackError),
        ([("0 nm", 0.1), (3, 0.2)], "x (depth of point 2): got 3; write '3 nm'", QuantityError),
        ([("0 nm", 0.1), ("3 nm", -1)], "x (point 2): got -1; a fraction lies between 0 and 1",
         QuantityError),
        ([("0 nm", 0.1)], "x: got 1 point; a table needs two or more", StackError),
        ([("0 nm", 0.1), ("0 nm", 0.2)], "x: depth 0 nm follows 0 nm; depths must increase (for a"
         " jump, write two layers)", StackError),
        ({"first": 0.1, "last": 0.2}, "x: got {'first': 0.1, 'last': 0.2}; write a number such as"
         " 0.28", QuantityError),
        ({0.1, 0.2}, "x: got {0.1, 0.2}; write a number such as 0.28", QuantityError),
    ],
)  # fmt: skip
def test_values_that_stand_for_no_shape(value, says, kind):
    with refused(says, kind):
        as_shape(value, q.as_fraction, "x")
