"""Sweeps: what is read, which designs are made, what their rows say."""

import math
import re

import numpy as np
import pandas as pd
import pint
import pytest

import bandwright as bw
from bandwright.errors import QuantityError, SolveError, StackError, UnknownName
from bandwright.metrics import METRICS
from bandwright.parameters import read, replace
from bandwright.quantities import as_value
from bandwright.sweeps.axes import read_axes
from bandwright.sweeps.making import maker
from bandwright.sweeps.plan import Plan
from bandwright.sweeps.ranges import expand
from sweeps import wells

PAIR = bw.parse_line(
    "20 nm Al0.3Ga0.7As {label wall}, 7 nm GaAs {label wide}, 1.5 nm Al0.3Ga0.7As {label thin},"
    " 5 nm GaAs {label narrow}, 20 nm Al0.3Ga0.7As {label wall}",
    substrate="GaAs",
)
ZERO = PAIR.replace(zero="GaAs")
OWN = bw.parse_line(
    "20 nm {edge 250 meV, mass 0.092, gap 1.9 eV}, 8 nm {edge 0 meV, mass 0.067, gap 1.5 eV,"
    " label well}, 20 nm {edge 250 meV, mass 0.092, gap 1.9 eV}"
)
GROUP = bw.Stack(
    [
        bw.Layer("20 nm", "Al0.3Ga0.7As", label="wall"),
        bw.Repeat(3, [bw.Layer("6 nm", "GaAs", label="well"),
                      bw.Layer("2 nm", "AlxGa1-xAs", x=[0.1, 0.3], label="slope")]),
        bw.Layer("20 nm", "Al0.3Ga0.7As", label="wall"),
    ],
    substrate="GaAs", zero="GaAs",
)  # fmt: skip


def nm(text):
    return as_value(text, "well", "nm")


# -- ranges -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "values", "unit"),
    [
        ("4 nm..9 nm step 0.5 nm", [4 + 0.5 * i for i in range(11)], "nm"),
        ("4nm..9nm count 11", [4 + 0.5 * i for i in range(11)], "nm"),
        ("41 Å .. 43Å step 1Å", [4.1, 4.2, 4.3], "nm"),
        ("4nm..5nm step 0.1nm", [float(f"4.{i}") for i in range(10)] + [5.0], "nm"),
        ("4 nm..5 nm step 0.4 nm", [4.0, 4.4, 4.8], "nm"),
        ("14 ML..20 ML step 2 ML", [14.0, 16.0, 18.0, 20.0], "ML"),
        ("5 nm..5 nm count 1", [5.0], "nm"),
        ("5 nm..5 nm step 1 nm", [5.0], "nm"),
        ("4..5 nm", None, None),
    ],
)  # fmt: skip
def test_ranges_to_the_last_decimal(text, values, unit):
    if values is None:
        with pytest.raises(StackError, match=r"without a step or a count; write for example '4"):
            expand(text, "well", nm)
    else:
        assert expand(text, "well", nm) == (values, unit)


def test_a_counted_range_meets_both_ends_and_is_even():
    values = expand("4 nm..9 nm count 7", "well", nm).numbers
    assert (values[0], values[-1], len(values)) == (4.0, 9.0, 7)
    assert np.allclose(np.diff(values), 5 / 6, rtol=1e-15)


@pytest.mark.parametrize(
    ("text", "kind", "says"),
    [
        ("9nm..4nm step 1 nm", StackError, "well: got '9nm..4nm step 1 nm', which runs backwards;"
         " write '4nm..9nm step 1 nm'"),
        ("4nm..9nm step 0 nm", StackError, "step: got '0 nm'; a step above zero is due"),
        ("4nm..9nm step -1 nm", StackError, "step: got '-1 nm'; a step above zero is due"),
        ("4nm..9nm step 7 nm", StackError, "step: got '7 nm', longer than the range"),
        ("4nm..9nm step 1 ML", StackError, "step: got '1 ML' in a range of nm; write one unit"),
        ("4nm..9nm step 1", QuantityError, "well: got '1'; write '1 nm'"),
        ("4nm..9nm step", QuantityError, "well: got ''; write one number and one unit"),
        ("4nm..9nm count 0", StackError, "count: got '0'; a whole number from 1 is due"),
        ("4nm..9nm count -3", StackError, "count: got '-3'; a whole number from 1"),
        ("4nm..9nm count few", StackError, "count: got 'few'; a whole number from 1"),
        ("4nm..9nm count 1", StackError, "one value has no two ends; count 2 at least"),
        ("4nm..9nm count 20000000", StackError, "20,000,000 values; at most 10,000,000 are swept"),
        ("4nm..9nm step 1e-9 nm", StackError, "5,000,000,001 values; at most"),
        ("4nm..9ML count 3", StackError, "write both ends in one unit"),
        ("4nm..9meV count 3", QuantityError, "well: got '9meV'; that is an energy; write"),
        ("4nm.. count 3", StackError, "write a range as '4 nm..9 nm step 0.5 nm'"),
        ("..9nm", StackError, "write a range as '4 nm..9 nm step 0.5 nm'"),
    ],
)  # fmt: skip
def test_ranges_that_lead_nowhere(text, kind, says):
    with pytest.raises(kind, match=re.escape(says)) as error:
        expand(text, "well", nm)
    assert str(error.value).startswith("well: ")


def test_a_step_of_celsius_is_no_difference():
    with pytest.raises(StackError, match="temperature: step: got '10 °C'; write a step of temp"):
        read_axes(PAIR, {"temperature": "-20 °C..60 °C step 10 °C"})
    (axis,) = read_axes(PAIR, {"temperature": "-20 °C..60 °C step 40 K"})
    assert axis.values == [253.15, 293.15, 333.15]


# -- axes -------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "given", "column", "values", "shown"),
    [
        ("wide.thickness", ["6 nm", "75 Å"], "wide.thickness_nm", [6.0, 7.5], [6.0, 7.5]),
        ("wide.thickness", "6 nm, 7 nm", "wide.thickness_nm", [6.0, 7.0], [6.0, 7.0]),
        ("wide.thickness", "20 ML..22 ML step 1 ML", "wide.thickness_ML", [20.0, 21.0, 22.0], None),
        ("layer 2.thickness", ["6 nm"], "layer 2.thickness_nm", [6.0], [6.0]),
        ("wide.thickness_nm", np.array([6.0, 7.5]), "wide.thickness_nm", [6.0, 7.5], [6.0, 7.5]),
        ("wide.thickness_nm", "6..7 step 0.5", "wide.thickness_nm", [6.0, 6.5, 7.0], None),
        ("wide.thickness_ML", [21], "wide.thickness_ML", [21.0], [21.0]),
        ("wall.composition", [0.25, "30 %"], "wall.composition", [0.25, 0.3], [0.25, 0.3]),
        ("field", ["12 kV/cm", "-3.3 kV/cm"], "field_kV_per_cm", [0.0012, -0.00033], [12.0, -3.3]),
        ("field_kV_per_cm", [12, 3.3], "field_kV_per_cm", [0.0012, 0.00033], [12.0, 3.3]),
        ("temperature", "77 K..300 K count 2", "temperature_K", [77.0, 300.0], [77.0, 300.0]),
        ("temperature", "77 K", "temperature_K", [77.0], [77.0]),
    ],
)  # fmt: skip
def test_parameters_of_a_stack(name, given, column, values, shown):
    (axis,) = read_axes(PAIR, {name: given})
    assert (axis.column, axis.values, axis.shown) == (column, values, shown or values)


def test_edges_and_quantities():
    (axis,) = read_axes(OWN, {"well.edge": "-0.1 eV..0.1 eV step 50 meV"})
    assert axis.column == "well.edge_meV"
    assert axis.values == [-0.1, -0.05, 0.0, 0.05, 0.1] and axis.shown == [-100, -50, 0, 50, 100]
    ureg = pint.UnitRegistry()
    for given in (np.array([40.0, 62.0]) * ureg.angstrom, [4.0 * ureg.nm, 62 * ureg.angstrom]):
        (axis,) = read_axes(PAIR, {"wide.thickness": given})
        assert axis.values == [4.0, 6.2]
    (axis,) = read_axes(PAIR, {"wide.thickness": 62 * ureg.angstrom})
    assert axis.values == [6.2]


@pytest.mark.parametrize(
    ("over", "kind", "says"),
    [
        ({}, StackError, "over: no parameter is given, so that there is nothing to sweep"),
        (7, StackError, "over: got 7; give parameters with their values, as {'well.thickness'"),
        ({"wide.thickness": []}, StackError, "wide.thickness: an empty list, so that there is"),
        ({"wide.thickness": {"a": 1}}, StackError, "wide.thickness: got {'a': 1}; give a range as"),
        ({"wide.thickness": ["6 nm", None]}, StackError, "wide.thickness: value 2 is missing"),
        ({"wide.thickness": [6.0]}, QuantityError, "wide.thickness: got 6.0; write '6 nm'"),
        ({"wide.thickness": ["6 meV"]}, QuantityError, "wide.thickness: got '6 meV'; that is an"),
        ({"wide.thickness": ["6 nm", "20 ML"]}, StackError, "values in ML and nm; write all"),
        ({"wid.thickness": ["6 nm"]}, UnknownName, "wid.thickness: no layer has the label 'wid';"
         " did you mean 'wide.thickness'"),
        ({"wide.thicknes": ["6 nm"]}, UnknownName, "wide has no 'thicknes'; did you mean"),
        ({"feild": ["6 nm"]}, UnknownName, "feild: no parameter; did you mean 'field'"),
        ({"wide.thickness_meV": [6.0]}, UnknownName, "wide has no 'thickness_meV'; did you mean"),
        ({"wide.thickness": ["6 nm"], "wide.thickness_nm": [6.0]}, StackError,
         "wide.thickness: given more than once"),
    ],
)  # fmt: skip
def test_what_can_not_be_swept(over, kind, says):
    with pytest.raises(kind, match=re.escape(says)):
        bw.sweep(PAIR, over)


def test_densities_stay_of_their_kind():
    doped = PAIR.with_layer(2, PAIR.layers[1].replace(donors="2e11 / cm^2"))
    (axis,) = read_axes(doped, {"wide.donors": ["1e11 / cm^2"]})
    assert (axis.column, axis.shown) == ("wide.donors_per_cm2", [1e11])
    with pytest.raises(StackError, match=r"wide.donors: the layer's density is in nm\^-2; give"):
        read_axes(doped, {"wide.donors": ["1e17 / cm^3"]})


@pytest.mark.parametrize(
    ("given", "column", "values", "shown"),
    [
        ("4 nm..5 nm step 0.5 nm", "width_nm", ["4 nm", "4.5 nm", "5 nm"], [4.0, 4.5, 5.0]),
        ("0.1..0.3 count 3", "width", [0.1, 0.2, 0.3], [0.1, 0.2, 0.3]),
        ("1, 2.5", "width", [1.0, 2.5], [1.0, 2.5]),
        ([1, 2], "width", [1, 2], [1, 2]),
        (["4 kV/cm", "5.5 kV/cm"], "width_kV_per_cm", ["4 kV/cm", "5.5 kV/cm"], [4.0, 5.5]),
        (["4 nm", "50 Å"], "width", ["4 nm", "50 Å"], ["4 nm", "50 Å"]),
        (["GaAs", "InP"], "width", ["GaAs", "InP"], ["GaAs", "InP"]),
    ],
)
def test_arguments_of_a_function(given, column, values, shown):
    (axis,) = read_axes(wells.well, {"width": given})
    assert (axis.column, axis.values, axis.shown) == (column, values, shown)
    assert [type(v) for v in axis.values] == [type(v) for v in values]


@pytest.mark.parametrize(
    ("design", "over", "kind", "says"),
    [
        (wells.well, {"widht": [4]}, UnknownName, "widht: well() has no such argument; did you mean"
         " 'width'?"),
        (wells.well, {"x": [0.2]}, StackError, "design: well() needs width as well; sweep over it"),
        (wells.well, {"width": "4 nm..a step 1 nm"}, StackError, "width: got 'a'; a number is due"),
        (7, {"width": [4]}, StackError, "design: got 7; a Stack is due, or a function that"),
    ],
)  # fmt: skip
def test_a_function_that_is_not_asked_right(design, over, kind, says):
    with pytest.raises(kind, match=re.escape(says)):
        bw.sweep(design, over)


def test_a_function_may_take_any_name():
    table = bw.sweep(lambda **given: wells.well(**given), {"width": [6, 7]}, metrics=["levels"])
    assert table["width"].tolist() == [6, 7]


# -- plans ------------------------------------------------------------------------------------


def plan(paired, **lengths):
    over = {f"{name}.thickness_nm": np.arange(1, n + 1) for name, n in lengths.items()}
    return Plan(PAIR, read_axes(PAIR, over), paired)


def test_a_grid_and_pairs():
    grid = plan(False, wide=2, thin=3)
    assert (len(grid), grid.shape) == (6, (2, 3))
    assert grid.values(range(6)) == [[1, 1, 1, 2, 2, 2], [1, 2, 3, 1, 2, 3]]
    assert grid.values([4]) == [[2], [2]]
    pairs = plan(True, wide=3, thin=3)
    assert len(pairs) == 3 and pairs.values([0, 2]) == [[1, 3], [1, 3]]
    with pytest.raises(StackError, match=r"paired: wide.thickness has 2, thin.thickness has 3;"):
        bw.sweep(PAIR, {"wide.thickness": ["6 nm", "7 nm"], "thin.thickness": "1 nm, 2 nm, 3 nm"},
                 paired=True)  # fmt: skip
    with pytest.raises(StackError, match=r"over: 25,000,000 designs; at most 10,000,000"):
        plan(False, wide=5000, thin=5000)
    with pytest.raises(StackError, match="paired: got 'yes'; True or False is due"):
        bw.sweep(PAIR, {"wide.thickness": ["6 nm"]}, paired="yes")


def test_the_neighbour_that_levels_are_followed_from():
    grid = plan(False, wide=2, thin=3, narrow=2)
    before = [grid.before(design) for design in range(len(grid))]
    assert before == [None, 0, 0, 2, 2, 4, 0, 6, 6, 8, 8, 10]
    places = np.array(grid.places(range(len(grid))))
    for design, other in enumerate(before[1:], start=1):
        assert np.abs(places[:, design] - places[:, other]).sum() == 1
    pairs = plan(True, wide=3, thin=3)
    assert [pairs.before(design) for design in range(3)] == [None, 0, 1]


def test_probes_are_corners():
    assert plan(False, wide=4, thin=3).probes() == [0, 11, 7, 2, 9]
    assert plan(True, wide=4, thin=4).probes() == [0, 3, 2]
    assert plan(False, wide=1).probes() == [0]


# -- stacks -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("stack", "over"),
    [
        (ZERO, {"wide.thickness": ["6 nm", "7 nm", "8.1 nm"], "wall.composition": [0.25, 0.3]}),
        (ZERO, {"wall.thickness": ["15 nm", "25 nm"], "field": ["-9 kV/cm", "5 kV/cm"],
                "temperature": ["77 K", "300 K"]}),
        (ZERO, {"wall.thickness": ["15 nm", "25 nm"], "layer 1.composition": [0.2, 0.35],
                "layer 5.thickness": ["10 nm"]}),
        (GROUP, {"well.thickness": ["5 nm", "6 nm"], "slope.x_last": [0.2, 0.25]}),
        (GROUP, {"slope.x_shift": [0.0, 0.05], "temperature": ["4 K", "300 K"]}),
        (OWN, {"well.edge": ["-10 meV", "10 meV"], "well.mass": [0.06, 0.07],
               "well.gap": ["1.4 eV", "1.6 eV"]}),
        (ZERO, {"flux Al": [0.98, 1.02], "wide.thickness": ["6 nm", "8 nm"]}),
    ],
    ids=["two", "around", "both names", "group", "shift", "own", "flux"],
)  # fmt: skip
def test_stacks_are_those_that_replace_makes(stack, over):
    axes = read_axes(stack, over)
    all_of_them = Plan(stack, axes, False)
    values = all_of_them.values(range(len(all_of_them)))
    names = [axis.name for axis in axes]
    made = maker(stack, names, [axis.unit for axis in axes])(values)
    assert len(made) == len(all_of_them)
    for one, *numbers in zip(made, *values, strict=True):
        due = stack
        for name, number in zip(names, numbers, strict=True):
            due = replace(due, name, number)
        assert one == due or [read(one, n) for n in names] == [read(due, n) for n in names]
        if "layer 1.composition" not in names:
            assert repr(one) == repr(due) or abs(
                bw.solve(one).energies - bw.solve(due).energies).max() < 1e-12  # fmt: skip


def test_designs_share_the_layers_that_they_have_alike():
    axes = read_axes(ZERO, {"wide.thickness": "6 nm, 7 nm", "thin.thickness": "1 nm, 2 nm"})
    plan_ = Plan(ZERO, axes, False)
    made = maker(ZERO, [a.name for a in axes], [a.unit for a in axes])(plan_.values(range(4)))
    assert made[0].layers[0] is ZERO.layers[0] is made[3].layers[0]
    assert made[0].layers[1] is made[1].layers[1] is not made[2].layers[1]
    assert made[0].layers[2] is made[2].layers[2] is not made[1].layers[2]


def test_monolayers_of_a_layer_in_nm():
    table = bw.sweep(ZERO, {"wide.thickness": "20 ML..24 ML step 2 ML"})
    assert table["wide.thickness_ML"].tolist() == [20.0, 22.0, 24.0]
    for number, width in enumerate(("20 ML", "22 ML", "24 ML"), start=1):
        alone = bw.solve(ZERO.with_layer(2, ZERO.layers[1].replace(thickness=width))).energies
        assert table.loc[number, "level_1_meV"] == pytest.approx(alone[0] * 1e3, abs=1e-7)
    table_of_points = ZERO.with_layer(
        2, bw.Layer("7 nm", "AlxGa1-xAs", x=[("0 nm", 0.0), ("7 nm", 0.1)], label="wide")
    )
    with pytest.raises(StackError, match=r"wide.thickness: got values in ML; a layer with"):
        bw.sweep(table_of_points, {"wide.thickness": ["20 ML", "21 ML"]})


# -- rows -------------------------------------------------------------------------------------


def test_rows_are_those_of_solve():
    over = {"wide.thickness": "6 nm..8 nm step 1 nm", "field": ["0 kV/cm", "10 kV/cm"]}
    table = bw.sweep(ZERO, over, line=(2, 1))
    assert list(table.columns[:3]) == ["wide.thickness_nm", "field_kV_per_cm", "levels_found"]
    assert list(table.columns[-3:]) == ["energy_meV", "wavelength_um", "reason"]
    assert table.index.tolist() == [1, 2, 3, 4, 5, 6] and table.index.name == "design"
    assert table.attrs == {"parameters": ("wide.thickness_nm", "field_kV_per_cm"), "line": (2, 1)}
    assert table["wide.thickness_nm"].tolist() == [6.0, 6.0, 7.0, 7.0, 8.0, 8.0]
    assert table["levels_found"].dtype == np.int64 and table["reason"].isna().all()
    for _, row in table.iterrows():
        stack = replace(ZERO, "wide.thickness", row["wide.thickness_nm"])
        levels = bw.solve(stack.replace(field=f"{row['field_kV_per_cm']} kV/cm"))
        assert row["levels_found"] == len(levels)
        for number, energy in enumerate(levels.energies[:12], start=1):
            found = row.get(f"level_{number}_meV", math.nan)
            assert found == pytest.approx(energy * 1e3, abs=1e-7) or number > 3
        gap = (levels.energies[1] - levels.energies[0]) * 1e3
        assert row["energy_meV"] == pytest.approx(gap, abs=1e-7)
        assert row["wavelength_um"] == pytest.approx(1239.8419843320026 / gap, rel=1e-9)


def test_nothing_hops_when_another_layer_becomes_the_lowest():
    over = {"narrow.composition": "0..0.2 step 0.01"}
    stack = ZERO.with_layer(4, bw.Layer("8 nm", "In0.05Ga0.95As", label="narrow"))
    table = bw.sweep(stack, {"narrow.composition": over["narrow.composition"]})
    ground = table["level_1_meV"]
    assert table["reason"].isna().all() and np.abs(np.diff(ground)).max() < 20.0
    bare = bw.sweep(stack.replace(zero=None), over)
    assert [c for c in bare.columns if c.startswith("level_")] == []
    assert bare["spacing_2_1_meV"].tolist() == pytest.approx(
        (table["level_2_meV"] - table["level_1_meV"]).tolist(), abs=1e-7
    )
    with pytest.raises(StackError, match=r"metrics: level_1_meV counts from zero, and the"):
        bw.sweep(stack.replace(zero=None), over, metrics=["level_1_meV"])


def test_the_line_is_one_for_all_unless_it_may_hop():
    over = {"wide.thickness": "4 nm..12 nm step 1 nm"}
    table = bw.sweep(ZERO, over, metrics=["upper", "lower", "wavelength_um"])
    first = bw.solve(replace(ZERO, "wide.thickness", 4.0)).lines().strongest
    assert table.attrs["line"] == (first.upper, first.lower)
    assert set(table["upper"]) == {first.upper} and set(table["lower"]) == {first.lower}
    own = bw.sweep(ZERO, over, metrics=["upper", "lower"], line="strongest")
    assert own.attrs["line"] is None
    for width, upper, lower in zip(range(4, 13), own["upper"], own["lower"], strict=True):
        line = bw.solve(replace(ZERO, "wide.thickness", float(width))).lines().strongest
        assert (upper, lower) == (line.upper, line.lower)
    assert len(set(zip(own["upper"], own["lower"], strict=True))) > 1


def test_metrics_that_need_states_and_own_ones():
    metrics = {
        "dipole_nm": METRICS["dipole_nm"],
        "name": lambda s: s.stack.name or "none",
        "twice": lambda s: 2 * len(s.levels),
        "tied": lambda s: len(s.levels) > 2,
    }
    table = bw.sweep(ZERO, {"wide.thickness": "6 nm, 9 nm"}, metrics=metrics, line=(2, 1))
    for width, found in zip((6.0, 9.0), table["dipole_nm"], strict=True):
        line = bw.solve(replace(ZERO, "wide.thickness", width)).lines().find(2, 1)
        assert found == pytest.approx(line.dipole_nm, rel=1e-9)
    assert table["name"].tolist() == ["none", "none"]
    assert table["twice"].dtype == np.int64 and table["tied"].dtype == bool


def test_a_table_of_designs():
    designs = pd.DataFrame({"wide.thickness": ["6 nm", "7 nm"], "thin.thickness_nm": [1.0, 2.5]})
    table = bw.sweep(ZERO, designs)
    assert len(table) == 2
    assert table["wide.thickness_nm"].tolist() == [6.0, 7.0]
    assert table["thin.thickness_nm"].tolist() == [1.0, 2.5]
    again = bw.sweep(ZERO, table[list(table.attrs["parameters"])])
    pd.testing.assert_frame_equal(table, again)
    with pytest.raises(StackError, match=r"thin.thickness_nm: value 2 is missing"):
        bw.sweep(ZERO, pd.DataFrame({"thin.thickness_nm": [1.0, None]}))
    with pytest.raises(StackError, match=r"over: no parameter is given"):
        bw.sweep(ZERO, pd.DataFrame())


def test_designs_that_fail_have_a_reason_and_no_numbers():
    table = bw.sweep(ZERO, {"wide.thickness": ["0 nm", "6 nm"], "wall.composition": [0.3, 1.2]})
    assert table["reason"].tolist() == [
        "wide.thickness: got 0; a thickness must be above zero",
        "wide.thickness: got 0; a thickness must be above zero",
        None,
        "wall.composition: got 1.2; a fraction lies between 0 and 1",
    ]
    numbers = [c for c in table.columns if c.startswith(("level", "energy", "wave"))]
    assert table.loc[[1, 2, 4], numbers].isna().all(axis=None)
    assert table.loc[3, numbers].notna().sum() >= 4


def test_a_function_that_raises_is_a_reason():
    table = bw.sweep(wells.fragile, {"width": "5..9 step 1"})
    assert table["reason"].tolist() == [
        None, None, "fragile(width=7.0): ValueError: no well of 7.0 nm today", None, None,
    ]  # fmt: skip
    table = bw.sweep(lambda width: width, {"width": [3]})
    assert re.fullmatch(r".*\(width=3\): returned 3; a Stack is due", table.loc[1, "reason"])

    def bad(width):
        raise bw.StackError("too wide", "my wells")

    assert bw.sweep(bad, {"width": [3]}).loc[1, "reason"] == "my wells: too wide"


def test_a_metric_that_raises_is_a_reason():
    metrics = {"inverse": lambda s: 1 / 0, "levels": lambda s: len(s.levels)}
    table = bw.sweep(ZERO, {"wide.thickness": ["6 nm"]}, metrics=metrics)
    assert table.loc[1, "reason"] == "metric 'inverse': ZeroDivisionError: division by zero"
    assert math.isnan(table.loc[1, "inverse"]) and table.loc[1, "levels"] == 3
    table = bw.sweep(ZERO, {"wide.thickness": ["6 nm"]}, metrics={"whole": lambda s: s.levels})
    assert table.loc[1, "reason"] == "metric 'whole': gave Levels; a number, a word or None is due"
    table = bw.sweep(PAIR.replace(ends="wall"), {"wide.thickness": ["6 nm"]},
                     metrics={"no": lambda s: bw.solve(s.stack, tolerance="1 nm")})  # fmt: skip
    assert table.loc[1, "reason"].startswith("tolerance: got '1 nm'; that is a length")


def test_a_metric_can_not_take_the_name_of_a_column():
    for name in ("wide.thickness_nm", "reason", "design"):
        with pytest.raises(StackError, match=f"metrics: '{name}' is the name of another column"):
            bw.sweep(ZERO, {"wide.thickness": ["6 nm"]}, metrics={name: len})


def test_arguments_of_the_solution():
    over = {"wide.thickness": "6 nm, 7 nm"}
    fine = bw.sweep(ZERO, over, tolerance="1e-9 eV", bands="one-band", at_most=1)
    levels = bw.solve(replace(ZERO, "wide.thickness", 6.0), tolerance="1e-10 eV", bands="one-band")
    assert fine.loc[1, "level_1_meV"] == pytest.approx(levels.energies[0] * 1e3, abs=1e-6)
    assert fine["levels_found"].tolist() == [1, 1] and "level_2_meV" not in fine
    below = bw.sweep(ZERO, over, below=pint.UnitRegistry().Quantity(60, "meV"))
    assert below["levels_found"].tolist() == [1, 1]
    for arguments, kind, says in (
        ({"belw": "1 eV"}, TypeError, r"sweep\(\) got an unexpected keyword argument 'belw'"),
        ({"method": "phase-integral"}, TypeError, "unexpected keyword argument 'method'"),
        ({"tolerance": "1 nm"}, QuantityError, "tolerance: got '1 nm'"),
        ({"chunk": 0}, SolveError, "chunk: got 0; a whole number from 1 is due"),
        ({"workers": 0}, SolveError, "workers: got 0; a whole number from 1 is due"),
        ({"workers": True}, SolveError, "workers: got True; a whole number from 1 is due"),
        ({"executor": 3}, SolveError, "executor: got 3; one of concurrent.futures is due"),
        ({"line": (1, 2)}, StackError, "line: got"),
        ({"window": "8 um"}, QuantityError, "window: got '8 um'"),
        ({"metrics": ["wavelenth_um"]}, UnknownName, "did you mean 'wavelength_um'"),
    ):
        with pytest.raises(kind, match=says):
            bw.sweep(ZERO, over, **arguments)


def test_chunks_do_not_change_the_rows():
    over = {"wide.thickness": "6 nm..8 nm count 9", "thin.thickness": "1 nm..3 nm count 5"}
    whole = bw.sweep(ZERO, over)
    for chunk in (7, 45, 1):
        cut = bw.sweep(ZERO, over, chunk=chunk)
        pd.testing.assert_frame_equal(whole, cut, rtol=0, atol=1e-7)
