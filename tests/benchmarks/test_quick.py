"""The benchmarks still run, hold the errors they are timed at, and time grows no faster than size.

No test asserts an absolute time. `python tests/benchmarks/run.py` gives the figures.
"""

from pathlib import Path

import numpy as np
import pytest

from benchmarks import breakdown, floor, grids, growth, memory, sides, spectral, yardstick
from benchmarks.cases import CASES, Vary
from benchmarks.figures import PARTS, main
from benchmarks.plain import question
from benchmarks.timing import medians, table

STEEPEST = 1.1  # slope of time against layers or periods
MOST_ARRAYS = 60  # of levels x slices numbers alive at once in solve
pytestmark = pytest.mark.filterwarnings("ignore::bandwright.errors.BandwrightWarning")
short = {"seconds": 0.05}


@pytest.mark.parametrize("name", ["single", "coupled", "stage-20", "graded-alloy",
                                  "nitride-open", "single, two-band"])  # fmt: skip
def test_sides_hold_their_error(name):
    """`one` raises where a competitor misses the error it is timed at."""
    found = sides.one(CASES[name], 1e-4, **short)
    assert found["levels"] > 0 and found["error"] <= 1e-4 and found["yardstick_error"] <= 1e-4
    assert all(ratio > 0.0 for ratio in found["ratio"].values())


def test_a_sweep_holds_its_error():
    """`measure` raises where a design of the sweep misses the error it is timed at."""
    found = grids.measure(1e-6, values=12, sampled=3, seconds=0.05)
    assert found["designs"] == 144 and found["error"] <= 1e-6
    assert set(found["ratio"]) == {"m", "1/m", "loose"}


@pytest.mark.skipif(not Path("/proc/self/status").exists(), reason="Linux tells a process's peak")
def test_memory_of_a_sweep_is_bounded(tmp_path):
    """Four times as many designs take little more: their table, not their states."""
    few, many = (grids.peak(designs, tmp_path / f"{designs}.csv") for designs in (5000, 20_000))
    assert many - few < 25.0  # MB; 15,000 designs of 9 columns are a tenth of that


def test_states_and_dipoles_agree_with_the_yardstick():
    found = sides.with_states(CASES["coupled"], 1e-6, **short)
    assert found["dipole_difference"] < 1e-3


def test_a_wrong_level_is_not_timed():
    asked = question(CASES["single"].stack, CASES["single"].asked, 1e-6)
    assert asked.error(asked.truth[:-1]) == np.inf
    with pytest.raises(sides.Wrong, match=r"error 0\.002 eV where 1e-06 eV is asked"):
        sides._held("x", asked.error(asked.truth + 2e-3), 1e-6)


def test_yardstick_keeps_second_order_wherever_faces_fall():
    asked = question(CASES["coupled"].family(1)[0], CASES["coupled"].asked, 1e-10)
    cells = np.array([2003, 4001, 8009, 16001])
    errors = [asked.error(yardstick.solve(asked.plain, n, asked.high)) for n in cells]
    order = -np.polyfit(np.log(cells), np.log(errors), 1)[0]
    assert 1.7 < order < 2.3


def test_spectral_elements_reach_rounding():
    asked = question(CASES["parabolic"].stack, CASES["parabolic"].asked, 1e-12)
    assert asked.error(spectral.solve(asked.plain, 22, 6.0, asked.levels)) < 1e-10


def test_neighbours_are_seeded_and_differ():
    for case in CASES.values():
        first, second = case.family(2)
        assert first != second and first != case.stack
        assert case.family(2)[1] == second
        assert case.build(Vary()) == case.stack


@pytest.mark.parametrize("name", ["single", "stage-20", "graded-alloy", "single, two-band"])
def test_many_agrees_with_solve_and_truth(name):
    found = sides.many(CASES[name], 1e-6, designs=12, sampled=2, **short)
    assert found["error"] <= 1e-6


@pytest.mark.parametrize("build, sizes", [
    (growth.digital, (100, 300, 1000)), (growth.periods, (10, 20, 50, 100)),
], ids=["layers", "periods"])  # fmt: skip
def test_time_grows_no_faster_than_size(build, sizes):
    found = growth.measure(build, sizes, seconds=1.0)
    assert len({levels for levels, _ in found.values()}) == 1
    assert growth.slope(found) <= STEEPEST, found


def test_kernel_runs_beside_its_floor():
    found = floor.measure(200, 500, **short)
    assert found["ratio"]["bare"] > 1.0


def test_memory_at_most_levels_times_slices():
    found = memory.of_solve((20, 40))
    assert all(arrays <= MOST_ARRAYS for *_, arrays in found.values()), found


def test_memory_of_many_beyond_the_result_is_bounded():
    found = memory.of_many(numbers=(100, 400), chunk=100)
    assert found[400][1] < 1.5 * found[100][1], found


def test_breakdown_shares_add_up():
    found, ms = breakdown.shares(CASES["single"], 3)
    assert ms > 0.0 and sum(share for share, _ in found.values()) == pytest.approx(1.0)
    assert {"profile", "levels", "solver/find"} <= set(found)


@pytest.mark.parametrize("part", PARTS)
def test_every_part_prints_a_table(part, capsys):
    assert not main(["--quick", "--case", "single", "--part", part])
    printed = capsys.readouterr().out
    assert "one BLAS thread" in printed and printed.count("\n") > 4


def test_medians_take_turns():
    calls = []
    found = medians({"a": lambda: calls.append("a"), "b": lambda: calls.append("b")}, rounds=1)
    assert set(found) == {"a", "b"} and set(calls) == {"a", "b"}


def test_table():
    found = table(("case", "ms"), [["a", 1.23456], ["bb", None]])
    assert found == "case    ms\na     1.23\nbb       -"
