"""Sweeps whose line is followed by character; all designs invented."""

import numpy as np
import pandas as pd
import pytest

import bandwright as bw
from bandwright.errors import ResultsError, StackError

WALL = "Al0.3Ga0.7As"
STACK = bw.parse_line(
    f"20 nm {WALL}, 5.4 nm GaAs {{label first}}, 14 nm {WALL} {{label between}}, 6 nm GaAs,"
    f" 20 nm {WALL}",
    substrate="GaAs",
)
WIDTHS = {"first.thickness": "5.4 nm..6.6 nm step 0.2 nm"}
GRID = {"between.thickness": "11 nm..15 nm step 2 nm", **WIDTHS}
LINE = ["upper", "lower", "wavelength_um", "dipole_nm"]


def design(first):
    if first == 5.8:
        raise ValueError("not today")
    return STACK.with_layer(2, STACK.layers[1].replace(thickness=f"{first} nm"))


def levels_of(widths):
    return list(bw.solve_many([STACK.with_layer(2, STACK.layers[1].replace(thickness=f"{w} nm"))
                               for w in widths]))  # fmt: skip


@pytest.fixture(scope="module")
def table():
    return bw.sweep(STACK, WIDTHS, line=(4, 2), follow=True, metrics=LINE)


def test_the_line_stays_in_its_well(table):
    # at 6 nm both wells are alike, and their states belong to both: the line is in neither
    assert table["upper"].tolist() == [4, 4, 4, 4, 3, 3, 3]
    assert table["lower"].tolist()[4:] == [1, 1, 1]
    due = bw.follow_line(levels_of(table["first.thickness_nm"]), (4, 2))
    for name in LINE:
        assert table[name].tolist() == pytest.approx(due[name].tolist(), rel=1e-9)
    alone = [bw.solve(bw.parse_line(f"20 nm {WALL}, {w} nm GaAs, 20 nm {WALL}", substrate="GaAs"))
             .lines().rows[0].wavelength_um for w in (6.2, 6.6)]  # fmt: skip
    assert table["wavelength_um"].tolist()[4::2] == pytest.approx(alone, rel=1e-3)
    by_number = bw.sweep(STACK, WIDTHS, line=(4, 2), metrics=LINE)
    assert abs(by_number["wavelength_um"].iloc[-1] - alone[-1]) > 0.5


def test_columns_unless_metrics_are_named():
    found = bw.sweep(STACK, WIDTHS, line=(4, 2), follow=True)
    assert found.columns[1:3].tolist() == ["upper", "lower"]
    strongest = bw.sweep(STACK, WIDTHS, follow=True)
    assert strongest.attrs["line"] == tuple(strongest[["upper", "lower"]].iloc[0])


def test_a_grid_row_by_row():
    found = bw.sweep(STACK, GRID, line=(4, 2), follow=True, metrics=LINE)
    heads = [0, 7, 14]
    assert found["lower"].iloc[heads].tolist() == [2, 2, 2]
    for start in heads:
        assert found["upper"].iloc[start + 4 : start + 7].tolist() == [3, 3, 3]
    # the other way round each column begins at the first row, and there the line has crossed
    turned = {name: GRID[name] for name in reversed(GRID)}
    other = bw.sweep(STACK, turned, line=(4, 2), follow=True, metrics=LINE)
    one, two = (np.array(t["wavelength_um"]).reshape(shape) for t, shape in
                ((found, (3, 7)), (other, (7, 3))))  # fmt: skip
    off_resonance = [0, 1, 2, 4, 5, 6]
    assert one[:, off_resonance] == pytest.approx(two.T[:, off_resonance], rel=1e-9)


def test_rows_do_not_depend_on_chunks_and_workers():
    whole = bw.sweep(STACK, GRID, line=(4, 2), follow=True, metrics=LINE)
    for arguments in ({"chunk": 4}, {"chunk": 5, "workers": 2}):
        found = bw.sweep(STACK, GRID, line=(4, 2), follow=True, metrics=LINE, **arguments)
        pd.testing.assert_frame_equal(found, whole, rtol=1e-9)


def test_a_sweep_that_goes_on(tmp_path):
    path = tmp_path / "wells.csv"
    given = {"line": (4, 2), "follow": True, "metrics": LINE, "chunk": 2, "results": path}
    whole = bw.sweep(STACK, WIDTHS, **given)
    lines = path.read_bytes().splitlines(keepends=True)
    path.write_bytes(b"".join(lines[:-3]))
    pd.testing.assert_frame_equal(bw.sweep(STACK, WIDTHS, **given), whole)
    assert path.read_bytes() == b"".join(lines)
    with pytest.raises(ResultsError):
        bw.sweep(STACK, WIDTHS, **{**given, "follow": False})


def test_a_design_that_fails_is_stepped_over(table):
    found = bw.sweep(design, {"first": [5.4, 5.6, 5.8, 6.2, 6.6]}, line=(4, 2), follow=True,
                     metrics=LINE)  # fmt: skip
    assert "not today" in found["reason"].iloc[2]
    assert found["upper"].tolist()[3:] == [3, 3]
    assert found["wavelength_um"].iloc[-1] == pytest.approx(table["wavelength_um"].iloc[-1])


def test_a_line_that_is_lost_and_found():
    # at 2.5 nm the first well has no second level
    over = {"first.thickness": "5.4 nm, 2.5 nm, 5.6 nm"}
    found = bw.sweep(STACK, over, line=(4, 2), follow=True, metrics=[*LINE, "levels"])
    assert found["wavelength_um"].isna().tolist() == [False, True, False]
    assert found["reason"].iloc[1].startswith("the line is lost: a level has left the range")
    assert found["levels"].notna().all()
    assert found["upper"].iloc[2] == 4


def test_it_begins_where_the_line_is_there():
    over = {"first.thickness": "2.5 nm, 5.4 nm, 5.6 nm"}
    found = bw.sweep(STACK, over, line=(4, 2), follow=True, metrics=LINE)
    assert found["upper"].isna().tolist() == [True, False, False]


def test_an_onset():
    over = {"first.thickness": "5.4 nm, 6.6 nm"}
    found = bw.sweep(STACK, over, line=("continuum", 2), follow=True, metrics=LINE)
    assert found["upper"].tolist() == ["continuum"] * 2 and found["lower"].tolist() == [2, 1]


def test_bad_input():
    with pytest.raises(StackError, match="follow: got 'yes'; True or False is due"):
        bw.sweep(STACK, WIDTHS, follow="yes")
    with pytest.raises(StackError, match="follow: each design's strongest line is not one line"):
        bw.sweep(STACK, WIDTHS, follow=True, line="strongest")

    def growing(count):
        wells = [bw.Layer("20 nm", WALL), bw.Layer("6 nm", "GaAs")] * int(count)
        return bw.Stack([*wells, bw.Layer("20 nm", WALL)], substrate="GaAs")

    with pytest.raises(StackError, match="follow, design 2: overlaps: designs of 3 and 5 layers"):
        bw.sweep(growing, {"count": [1, 2]}, line=(2, 1), follow=True)
