"""Tables of layers: what they say, what is written, and every way they can be wrong."""

import io

import numpy as np
import pandas as pd
import pytest

from bandwright import BandwrightError, Layer, Repeat, Stack, StackFileError
from bandwright.stackframe import frame_from_stack, stack_from_frame

EDGE = 0.029040787574867943  # eV; no float in meV is this energy
PAIR = [Layer("5 nm", "GaAs"), Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3])]
STACK = Stack(
    [
        Layer("30 nm", "Al0.28Ga0.72As", label="NA"),
        Layer("22 ML", "GaAs", donors="2e11 / cm^2", field="10 kV/cm"),
        Layer("30 nm", edge="235 meV", mass=0.089, gap="1.79 eV"),
        Repeat(30, PAIR),
        Layer("8 nm", "AlxGa1-xAs", x=[("0 nm", 0.0), ("8 nm", 0.3)]),
        Layer("8 nm", "AlxGa1-xAs", x=[0.3, 0.0], grading="quadratic"),
    ],
    zero="GaAs",
)


def test_what_is_written():
    table = frame_from_stack(STACK)
    assert table.index.name == "layer"
    assert list(table.index) == [1, 2, 3, 4, 5, 6, 7]
    assert list(table.columns) == [
        "group",
        "times",
        "label",
        "material",
        "thickness_nm",
        "thickness_ML",
        "grading",
        "field_kV_per_cm",
        "donors_per_cm2",
        "x_first",
        "x_last",
        "x_points",
        "edge_meV",
        "mass",
        "gap_eV",
    ]
    assert table["thickness_nm"].dtype == table["edge_meV"].dtype == float
    assert table.loc[3, "edge_meV"] == 235.0
    assert table.loc[2, "donors_per_cm2"] == 2e11
    assert list(table.loc[[4, 5], "times"]) == ["30", "30"]
    assert table.loc[6, "x_points"] == "0 at 0 nm to 0.3 at 8 nm"
    assert np.isnan(table.loc[2, "thickness_nm"])


def test_it_comes_back():
    assert stack_from_frame(frame_from_stack(STACK), zero="GaAs") == STACK
    text = frame_from_stack(STACK).to_csv()
    table = pd.read_csv(io.StringIO(text), index_col="layer", keep_default_na=False, dtype=str)
    assert stack_from_frame(table, zero="GaAs") == STACK


def test_pandas_own_way_with_csv_still_gives_numbers():
    text = frame_from_stack(Stack(STACK.layers[1:], zero="GaAs")).to_csv(index=False)
    table = pd.read_csv(io.StringIO(text))
    assert stack_from_frame(table, zero="GaAs").layers == STACK.layers[1:]


def test_numbers_a_float_can_not_scale_stay_in_core_units():
    reachable = Stack([Layer("5 nm", edge="300 meV", mass=0.1)])
    table = frame_from_stack(reachable)
    assert "edge_meV" in table.columns and stack_from_frame(table) == reachable
    between = Stack([Layer("5 nm", edge=f"{EDGE!r} eV", mass=0.1)])
    table = frame_from_stack(between)
    assert "edge_eV" in table.columns and "edge_meV" not in table.columns
    assert stack_from_frame(table) == between


def test_hand_made():
    table = pd.DataFrame(
        {
            "thickness": ["30 nm", "62 Å", "30 nm"],
            "material": ["Al0.28Ga0.72As", "GaAs", None],
            "edge_meV": [None, None, 235],
            "mass": [np.nan, np.nan, 0.089],
            "label": ["", "NA", pd.NA],
        }
    )
    assert stack_from_frame(table, zero="GaAs", temperature="77 K") == Stack(
        [
            Layer("30 nm", "Al0.28Ga0.72As"),
            Layer("6.2 nm", "GaAs", label="NA"),
            Layer("30 nm", edge="235 meV", mass=0.089),
        ],
        zero="GaAs",
        temperature="77 K",
    )


@pytest.mark.parametrize(
    ("column", "value", "like"),
    [
        ("thickness_angstrom", 62, Layer("6.2 nm", "GaAs")),
        ("thickness_um", 0.0062, Layer("6.2 nm", "GaAs")),
        ("thickness_ML", 22, Layer("22 ML", "GaAs")),
        ("thickness_nm", "6.2", Layer("6.2 nm", "GaAs")),
        ("thickness_nm", np.float32(6.5), Layer("6.5 nm", "GaAs")),
    ],
)
def test_units_in_a_columns_name(column, value, like):
    table = pd.DataFrame({column: [value], "material": "GaAs"})
    assert stack_from_frame(table).layers == (like,)


@pytest.mark.parametrize(
    ("columns", "layers"),
    [
        ({"times": [1, 3, None, 2]}, "aRbR"),
        ({"group": [1, 1, None, None], "times": [3, 3, None, None]}, "(ab)cd"),
        ({"group": ["g", "g", "h", "h"], "times": [3, 3, 3, 3]}, "(ab)(cd)"),
        ({"group": ["1/1", "1/1", "1", None], "times": ["2/3", "2/3", "2", None]}, "((ab)c)d"),
    ],
)
def test_groups(columns, layers):
    a, b, c, d = (Layer(f"{n} nm", "GaAs") for n in (1, 2, 3, 4))
    table = pd.DataFrame({"thickness_nm": [1.0, 2.0, 3.0, 4.0], "material": "GaAs"} | columns)
    expected = {
        "aRbR": [Repeat(1, [a]), Repeat(3, [b]), c, Repeat(2, [d])],
        "(ab)cd": [Repeat(3, [a, b]), c, d],
        "(ab)(cd)": [Repeat(3, [a, b]), Repeat(3, [c, d])],
        "((ab)c)d": [Repeat(2, [Repeat(3, [a, b]), c]), d],
    }[layers]
    assert stack_from_frame(table) == Stack(expected)


def test_surface_first():
    table = frame_from_stack(Stack(PAIR))
    assert stack_from_frame(table, order="surface first") == Stack(PAIR, order="surface first")


def test_a_callable_does_not_fit():
    bowl = Layer("8 nm", "AlxGa1-xAs", x=lambda z: z / 80)
    with pytest.raises(StackFileError, match=r"layer 1 \(AlxGa1-xAs\): x is a callable"):
        frame_from_stack(Stack([bowl]))


GOOD = {"thickness_nm": [5.0, 6.0], "material": ["GaAs", "AlxGa1-xAs"], "x": [None, 0.3]}


@pytest.mark.parametrize(
    ("changes", "match"),
    [
        ({"thicknes": 1}, "table: unknown column 'thicknes'; did you mean 'thickness'"),
        ({"edge_mev": 1}, "table: unknown column 'edge_mev'; did you mean 'edge_meV'"),
        ({"thickness": "5 nm"}, "row 1: two columns say thickness; leave one of them empty"),
        ({"thickness_nm": [5.0, None]}, r"layer 2 \(AlxGa1-xAs\): thickness: missing"),
        ({"thickness_nm": [5.0, -1]}, "layer 2 .*: thickness: got '-1 nm'; .* above zero"),
        (
            {"thickness_nm": ["5", "6 nm"]},
            "row 2: thickness_nm: got '6 nm'; the column's name says",
        ),
        ({"thickness_nm": [5, True]}, "row 2: thickness_nm: got True; write a number"),
        ({"thickness_nm": [5, np.inf]}, "row 2: thickness_nm: got inf; that is not finite"),
        ({"label": [1.5, 2.5]}, "row 1: label: got 1.5; write text"),
        ({"material": ["GaAs", None]}, "layer 2 .*: no material"),
        ({"x_first": [None, 0.1]}, "row 2: x_first and x_last belong together; one is empty"),
        ({"x_first": [None, 0], "x_last": [None, 1]}, "row 2: x is given more than once"),
        ({"x_points": [None, "0 at 0 nm"]}, "row 2: x is given more than once; leave one"),
        ({"x": None, "x_points": [None, 5]}, "row 2: x_points: got 5.0; write points"),
        ({"x": None, "x_points": [None, "0 to 1"]}, "row 2: x_points: got '0 to 1'; write points"),
        ({"x": [None, 3]}, r"layer 2 \(AlxGa1-xAs\): x: got 3"),
        ({"x": [None, "a"]}, r"layer 2 \(AlxGa1-xAs\): x: got 'a'; write a number"),
        ({"grading": [None, "quadratic"]}, "layer 2 .*: grading: got 'quadratic' but no pair"),
        ({"times": [2, 2]}, "row 2: times 2 follows times 2; write in a column group which rows"),
        ({"times": [2, 0]}, "row 2: times: got '0'; write a whole number from 1"),
        ({"times": [2, 2.5]}, "row 2: times: got '2.5'; write a whole number"),
        ({"group": [1, 1]}, "row 1: group 1 has no times"),
        (
            {"group": ["1", "1/1"], "times": [2, 2]},
            "row 2: group '1/1' and times 2 are not as deep",
        ),
        ({"mass": [0.1, None]}, "layer 1 .*: mass: own numbers on a material"),
    ],
)
def test_mistakes(changes, match):
    with pytest.raises(BandwrightError, match=match) as caught:
        stack_from_frame(pd.DataFrame(GOOD | changes))
    assert "\n" not in str(caught.value)


def test_no_rows_and_no_table():
    with pytest.raises(StackFileError, match="table: no layers; write one row for each"):
        stack_from_frame(pd.DataFrame({"thickness": [], "material": []}))
    with pytest.raises(BandwrightError, match="give a pandas DataFrame, one row a layer"):
        stack_from_frame([{"thickness": "5 nm"}])
