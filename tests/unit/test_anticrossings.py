"""Anticrossings: what is read, what is found, what its columns say; all stacks invented.

Closed forms are in tests/physics/test_anticrossings.py.
"""

import numpy as np
import pandas as pd
import pytest

import bandwright as bw
from bandwright.crossings.candidates import Bend, Coarse, bend, exchanged
from bandwright.crossings.narrowest import Pair, Point, refine
from bandwright.crossings.path import COUNT, Path
from bandwright.errors import BandwrightWarning, QuantityError, SolveError, StackError, UnknownName

WALL = "Al0.3Ga0.7As"
PAIR = bw.parse_line(
    f"15 nm {WALL}, 5 nm GaAs {{label narrow}}, 4 nm {WALL}, 8 nm GaAs {{label wide}},"
    f" 15 nm {WALL}",
    substrate="GaAs",
)
FIELD = {"field": "10 kV/cm..60 kV/cm step 5 kV/cm"}
COLUMNS = ["field_kV_per_cm", "lower", "upper", "lower_track", "upper_track", "splitting_meV",
           "splitting_error_meV", "half_width_kV_per_cm", "exchange", "at_end"]  # fmt: skip


def equal(first="6 nm", barrier="4 nm"):
    return bw.parse_line(
        f"20 nm {WALL}, {first} GaAs {{label first}}, {barrier} {WALL}, 6 nm GaAs, 20 nm {WALL}",
        substrate="GaAs",
    )


@pytest.fixture(scope="module")
def found():
    return bw.anticrossings(PAIR, FIELD)


# -- what is found ----------------------------------------------------------------------------


def test_the_table(found):
    assert found.columns.tolist() == COLUMNS and len(found) == 1
    kinds = {"lower": np.int64, "upper": np.int64, "upper_track": np.int64, "at_end": bool}
    assert {name: found[name].dtype for name in kinds} == kinds
    row = found.iloc[0]
    assert (row["lower"], row["upper"], row["lower_track"], row["upper_track"]) == (1, 2, 1, 2)
    assert row["exchange"] == pytest.approx(1.0, abs=0.02)
    assert not row["at_end"]
    assert found.attrs == {"parameter": "field_kV_per_cm", "cautions": ()}


def test_the_spacing_is_the_smallest_there_is(found):
    row = found.iloc[0]

    def spacing(field):
        levels = bw.solve(PAIR.replace(field=f"{float(field)!r} kV/cm"), tolerance="1e-10 eV")
        return 1e3 * float(levels.energies[1] - levels.energies[0])

    at, split = row["field_kV_per_cm"], row["splitting_meV"]
    assert spacing(at) == pytest.approx(split, abs=row["splitting_error_meV"])
    assert 0 < row["splitting_error_meV"] < 1e-5
    for step in (0.01, 0.1, 1.0):
        assert spacing(at - step) > split and spacing(at + step) > split
    assert spacing(at + row["half_width_kV_per_cm"]) == pytest.approx(split * 2**0.5, rel=0.02)


@pytest.mark.parametrize("over", ["10 kV/cm..60 kV/cm", "12 kV/cm..50 kV/cm step 9.5 kV/cm"])
def test_the_coarse_step_does_not_matter(found, over):
    other = bw.anticrossings(PAIR, {"field": over})
    assert other["splitting_meV"].tolist() == pytest.approx(found["splitting_meV"], rel=1e-6)
    off = abs(other["field_kV_per_cm"] - found["field_kV_per_cm"])
    assert (off < 2e-3 * found["half_width_kV_per_cm"]).all()


def test_a_narrow_one_within_one_coarse_step():
    # far narrower than the step: only the characters tell that the levels have met
    stack = bw.parse_line(f"15 nm {WALL}, 5 nm GaAs, 16 nm {WALL}, 8 nm GaAs, 15 nm {WALL}",
                          substrate="GaAs")  # fmt: skip
    row = bw.anticrossings(stack, {"field": "10 kV/cm..30 kV/cm step 5 kV/cm"}).iloc[0]
    assert row["half_width_kV_per_cm"] < 2e-3 and row["splitting_meV"] < 0.01
    assert row["exchange"] == pytest.approx(1.0, abs=1e-3)
    finer = bw.anticrossings(stack, {"field": "14 kV/cm..18 kV/cm step 0.5 kV/cm"},
                             tolerance="1e-11 eV").iloc[0]  # fmt: skip
    assert row["splitting_meV"] == pytest.approx(
        finer["splitting_meV"], abs=row["splitting_error_meV"]
    )
    assert finer["splitting_error_meV"] < row["splitting_error_meV"]


def test_an_array_of_levels_that_only_come_close():
    # two levels of one well come closer in a field, but stay what they are
    well = bw.parse_line(f"15 nm {WALL}, 9 nm GaAs, 15 nm {WALL}", substrate="GaAs")
    assert len(bw.anticrossings(well, {"field": "-20 kV/cm..20 kV/cm step 4 kV/cm"})) == 0
    empty = bw.anticrossings(well, {"field": "-20 kV/cm..20 kV/cm step 4 kV/cm"}, at_most=1)
    assert len(empty) == 0 and empty.columns.tolist() == COLUMNS


def test_levels_of_the_box():
    field = {"field": "20 kV/cm..60 kV/cm step 2 kV/cm"}
    own = bw.anticrossings(PAIR, field)
    every = bw.anticrossings(PAIR, field, of_box=True)
    assert every.columns.tolist() == [*COLUMNS, "of_box"]
    assert 0 < every["of_box"].sum() < len(every)
    same = every[~every["of_box"]].reset_index(drop=True)
    pd.testing.assert_frame_equal(same[COLUMNS], own, rtol=1e-3)  # places are good to that


def test_the_end_of_the_range():
    row = bw.anticrossings(equal(), {"field": "0 kV/cm..20 kV/cm step 1 kV/cm"}).iloc[0]
    assert row["at_end"] and row["field_kV_per_cm"] == 0.0
    levels = bw.solve(equal(), tolerance="1e-10 eV")
    assert row["splitting_meV"] == pytest.approx(1e3 * np.diff(levels.energies)[0], abs=1e-6)
    upper_end = bw.anticrossings(equal(), {"field": "-20 kV/cm..0 kV/cm step 1 kV/cm"})
    assert upper_end["at_end"].all()
    assert upper_end["splitting_meV"].iloc[0] == row["splitting_meV"]
    both = bw.anticrossings(equal(), {"field": "-20 kV/cm..20 kV/cm step 1 kV/cm"}, below="0.2 eV")
    assert not both["at_end"].any()
    assert both["splitting_meV"].iloc[0] == pytest.approx(row["splitting_meV"], abs=1e-5)
    # a few widths past it nothing is near enough to be one
    past = bw.anticrossings(equal(), {"field": "25 kV/cm..40 kV/cm step 1 kV/cm"}, below="0.2 eV")
    assert len(past) == 0


def test_a_level_that_leaves_the_range_of_energies_near_by():
    # the upper level passes `below` a little beyond the middle
    row = bw.anticrossings(PAIR, FIELD).iloc[0]
    field = f"{float(row['field_kV_per_cm'])!r} kV/cm"
    middle = float(bw.solve(PAIR.replace(field=field)).energies[1])
    over = {"field": "25 kV/cm..45 kV/cm step 1 kV/cm"}
    near = bw.anticrossings(PAIR, over, below=f"{1e3 * middle + 8!r} meV").iloc[0]
    assert near["splitting_meV"] == pytest.approx(row["splitting_meV"], rel=1e-6)
    assert len(bw.anticrossings(PAIR, over, below=f"{1e3 * middle - 8!r} meV")) == 0


def test_a_thickness_in_nm_in_monolayers_and_of_a_function():
    def design(width, barrier="4 nm"):
        return equal(width, barrier)

    nm = bw.anticrossings(equal(), {"first.thickness": "5 nm..7 nm step 0.25 nm"})
    assert nm.columns[0] == "first.thickness_nm" and nm.columns[7] == "half_width_nm"
    assert nm["first.thickness_nm"].iloc[0] == pytest.approx(6.03, abs=0.01)
    made = bw.anticrossings(design, {"width": "5 nm..7 nm step 0.25 nm"})
    assert made.columns[0] == "width_nm"
    assert made.to_numpy().tolist() == nm.to_numpy().tolist()
    layers = bw.anticrossings(equal(), {"first.thickness": "18 ML..25 ML step 1 ML"})
    assert layers["splitting_meV"].iloc[0] == pytest.approx(nm["splitting_meV"].iloc[0], rel=1e-5)
    listed = bw.anticrossings(lambda width: equal(f"{width} nm"), {"width": [7, 5.0, 6.5, 6, 5.5]})
    assert listed.columns[0] == "width"
    assert listed["splitting_meV"].iloc[0] == pytest.approx(nm["splitting_meV"].iloc[0], rel=1e-5)


def test_a_bias_and_a_table_of_designs(found):
    row = found.iloc[0]
    volts = bw.anticrossings(PAIR, {"bias": "-0.3 V..-0.05 V step 0.01 V"})
    assert volts["splitting_meV"].tolist() == pytest.approx([row["splitting_meV"]], rel=1e-6)
    thickness = 15 + 5 + 4 + 8 + 15  # the bias falls across all of it
    off = abs(-volts["bias_V"].iloc[0] / thickness * 1e4 - row["field_kV_per_cm"])
    assert off < 2e-3 * row["half_width_kV_per_cm"]
    table = pd.DataFrame({"field_kV_per_cm": [10.0, 20.0, 30.0, 40.0, 50.0]})
    given = bw.anticrossings(PAIR, table)
    assert given["splitting_meV"].tolist() == pytest.approx([row["splitting_meV"]], rel=1e-6)


def test_more_than_two_that_meet():
    # the five wells of a superlattice all come apart from a field of zero on
    wells = bw.parse_line(f"25 nm {WALL}, 5 * (6 nm GaAs, 4 nm {WALL}), 20 nm {WALL}",
                          substrate="GaAs")  # fmt: skip
    table = bw.anticrossings(wells, {"field": "0 kV/cm..20 kV/cm step 1 kV/cm"}, below="0.16 eV")
    ends = table[table["at_end"]]
    assert (1, 2) in set(zip(ends["lower"], ends["upper"], strict=True))
    assert (abs(ends["exchange"] - 1.0) > 0.2).all()


def test_designs_that_fail_are_left_out_and_said():
    def design(field):
        if field > 50.0:
            raise ValueError("no such field")
        return PAIR.replace(field=f"{field} kV/cm")

    text = r"2 of 11 designs have no levels and are left out, the first at field = 55: .*no such f"
    with pytest.warns(BandwrightWarning, match=text):
        some = bw.anticrossings(design, {"field": "10..60 count 11"})
    assert len(some) == 1 and len(some.attrs["cautions"]) == 1

    def never(field):
        raise ValueError("no such field")

    with pytest.raises(StackError, match="ValueError: no such field"):
        bw.anticrossings(never, {"field": "10..60 count 11"})


def test_a_design_that_fails_where_the_levels_are_closest():
    def design(field):
        if 34.0 < field < 35.0:
            raise ValueError("no such field")
        return PAIR.replace(field=f"{field} kV/cm")

    with pytest.raises(StackError, match=r"design\(field=34.*ValueError: no such field"):
        bw.anticrossings(design, {"field": "10..60 count 11"})


# -- parts ------------------------------------------------------------------------------------


def test_the_formula_through_three_designs():
    formula = Bend(2.0, 3.0, 1.5)
    values = [1.0, 2.7, 4.0]
    spacings = [np.hypot(1.5, 3.0 * (v - 2.0)) for v in values]
    assert bend(values, spacings) == pytest.approx(formula)
    assert bend([0.0, 1.0, 2.0], [1.0, 2.0, 1.0]) is None
    assert bend([0.0, 1.0, 2.0], [1.0, 1.0, 1.0]) is None
    assert bend([0.0, 1.0, 3.0], [1.0, 0.0, 2.0]) == pytest.approx(Bend(1.0, 1.0, 0.0))
    # far out on both sides all of the character, within one width a half
    assert formula.exchange(-1e9, 1e9) == pytest.approx(1.0)
    assert formula.exchange(1.5, 2.5) == pytest.approx(0.5)
    assert formula.exchange(2.0, 1e9) == pytest.approx(0.5)
    assert formula.window(0.0, 2.25) == (1.5, 2.25)


def test_exchanged_takes_the_smaller_of_both_ways():
    found = np.array([[0.1, 0.9], [0.5, 0.2]])
    assert exchanged(found, (0, 1), (0, 1)) == 0.25


def test_a_step_after_which_a_level_has_no_successor():
    values = np.array([10e-4, 60e-4])
    levels = [bw.solve(PAIR.replace(field=f"{v * 1e4} kV/cm")) for v in values]
    coarse = Coarse(values, levels, True)
    assert coarse.torn().tolist() == [0]
    same = Coarse(values, [levels[0], levels[0]], True)
    assert same.torn().tolist() == []


def point(path, value, pair=(0, 1)):
    (levels,) = path.solve([value])
    return Point(value, levels, pair)


def test_a_spacing_that_is_no_parabola_is_searched(found, monkeypatch):
    path = Path.read(PAIR, FIELD, {})
    low, high = point(path, 15e-4), point(path, 45e-4)
    monkeypatch.setattr("bandwright.crossings.narrowest.bend", lambda *_: None)
    at, off, _ = Pair(path, (low, high), 1e-6).least(low, high, (10e-4, 60e-4))
    assert off == pytest.approx(3e-7)
    assert 1e4 * at.value == pytest.approx(found["field_kV_per_cm"].iloc[0], abs=5 * 3e-3)


def test_two_levels_keep_to_their_subspace():
    # levels 3 and 4, asked for beyond the designs where a third level passes between them
    path = Path.read(PAIR, FIELD, {})
    low = point(path, 10e-4, (0, 1))
    assert Pair(path, [low], 1e-6).at(12e-4).pair == (0, 1)
    (levels,) = path.solve([12e-4])
    one = point(path, 12e-4, (0, len(levels) - 1))
    # a level that is above the limit elsewhere is gone
    short = Path.read(PAIR, FIELD, {"at_most": 2})
    assert refine(Pair(short, [one], 1e-6), one, point(path, 20e-4, (0, 1)), (0.0, 1.0)) is None


# -- bad input --------------------------------------------------------------------------------


def test_ranges_without_a_step_have_our_own_count():
    assert len(Path.read(PAIR, {"field": "0 kV/cm..60 kV/cm"}, {}).values) == COUNT
    assert len(Path.read(PAIR, {"field": "0 kV/cm..60 kV/cm count 5"}, {}).values) == 5
    assert len(Path.read(PAIR, {"field": "0 kV/cm, 9 kV/cm, 5 kV/cm, 9 kV/cm"}, {}).values) == 3


@pytest.mark.parametrize(
    ("over", "text"),
    [
        ("field", "over: got 'field'; give parameters with their values"),
        ({**FIELD, "temperature": "77 K, 300 K"},
         "over: got field and temperature; anticrossings are looked for along one parameter"),
        ({"field": "0 kV/cm, 5 kV/cm"}, "field: got 2 values; 3 are the least"),
        ({"field": "60 kV/cm..0 kV/cm"}, "field: .* runs backwards"),
        ({"field": "0 kV/cm..60 kV/cm step 0 kV/cm"}, "step: got '0 kV/cm'; a step above zero"),
    ],
)  # fmt: skip
def test_what_is_no_path(over, text):
    with pytest.raises(StackError, match=text):
        bw.anticrossings(PAIR, over)


def test_names_and_units():
    with pytest.raises(UnknownName, match="did you mean 'narrow"):
        bw.anticrossings(PAIR, {"narow.thickness": "5 nm..7 nm"})
    with pytest.raises(QuantityError, match="field"):
        bw.anticrossings(PAIR, {"field": "0 nm..60 nm"})
    with pytest.raises(StackError, match="width: got 'wide'; anticrossings are looked for along"):
        bw.anticrossings(lambda width: PAIR, {"width": ["wide", "narrow", "none"]})
    with pytest.raises(StackError, match="lower: is the name of another column"):
        bw.anticrossings(lambda lower: equal(f"{lower} nm"), {"lower": [5.0, 6.0, 7.0]})


def test_arguments():
    with pytest.raises(StackError, match="of_box: got 'yes'; True or False is due"):
        bw.anticrossings(PAIR, FIELD, of_box="yes")
    with pytest.raises(TypeError, match=r"anticrossings\(\) got an unexpected .* 'workers'"):
        bw.anticrossings(PAIR, FIELD, workers=2)
    with pytest.raises(SolveError, match="at_most: got 0"):
        bw.anticrossings(PAIR, FIELD, at_most=0)
