"""Results files of sweeps: killed and resumed, refused when they hold something else."""

import math
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pandas as pd
import pytest

import bandwright as bw
from bandwright.errors import ResultsError
from bandwright.sweeps import sweeping
from bandwright.sweeps.record import Record, _cell, _value
from sweeps import wells

TESTS = Path(__file__).parents[1]
OVER = {"width": "5..9 step 0.5"}


def read_file(path):
    return pd.read_csv(path, comment="#")


def numbers(path):
    """Return the designs on the whole lines of a results file."""
    lines = path.read_bytes().split(b"\n")[2:-1]
    return [int(line.split(b",")[0]) for line in lines]


# -- killed -----------------------------------------------------------------------------------


def start(results, log, workers):
    """Start a slow sweep in a process of its own, and wait until it has written something."""
    run = subprocess.Popen(
        [sys.executable, "-m", "sweeps.wells", str(results), str(log), str(workers)],
        cwd=TESTS, stderr=subprocess.PIPE, text=True,
        # a shell's background job is deaf to Ctrl-C, and its children inherit that
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL),
    )  # fmt: skip
    patience = time.monotonic() + 120.0
    while not (results.exists() and len(numbers(results)) >= 3 * wells.CHUNK):
        assert run.poll() is None, run.stderr.read()
        assert time.monotonic() < patience
        time.sleep(0.002)
    return run


def gone(process):
    try:
        os.kill(process, 0)
    except ProcessLookupError:
        return True
    state = Path(f"/proc/{process}/stat")  # one that nobody has waited for is gone all the same
    return state.exists() and state.read_text().rpartition(")")[2].split()[0] == "Z"


def wait_for_end_of(processes):
    patience = time.monotonic() + 60.0
    while not all(map(gone, processes)):
        assert time.monotonic() < patience, "a worker outlives its sweep"
        time.sleep(0.01)


@pytest.mark.parametrize("workers", [1, 2])
def test_a_killed_sweep_goes_on_where_it_stopped(workers, tmp_path):
    results, log = tmp_path / "wells.csv", tmp_path / "log.txt"
    run = start(results, log, workers)
    run.kill()
    assert run.wait() == -signal.SIGKILL
    run.stderr.close()
    before = numbers(results)
    kept = results.read_bytes()
    kept = kept[: kept.rfind(b"\n") + 1]
    wait_for_end_of({process for process, _ in wells.made(log)})
    assert 0 < len(before) < wells.COUNT
    again = tmp_path / "again.txt"
    table = wells.run(results, again, 1)
    assert results.read_bytes().startswith(kept)  # no recorded row lost or written anew
    assert sorted(numbers(results)) == list(range(1, wells.COUNT + 1))
    whole = wells.run(None, tmp_path / "whole.txt", 1)
    pd.testing.assert_frame_equal(table, whole, check_exact=True)
    # what was made twice, but for the few designs by which each run settles its columns
    probes = {4.0, 10.0, *(width for _, width in wells.made(tmp_path / "whole.txt")[:3])}
    first, second = ({w for _, w in wells.made(file)} - probes for file in (log, again))
    assert len(first & second) <= workers * wells.CHUNK
    assert len(second) <= wells.COUNT - len(before)


def test_an_interrupted_sweep_says_how_to_go_on(tmp_path):
    results, log = tmp_path / "wells.csv", tmp_path / "log.txt"
    run = start(results, log, 2)
    run.send_signal(signal.SIGINT)
    _, said = run.communicate(timeout=60)
    assert run.returncode != 0
    assert f"of {wells.COUNT} designs; the same call goes on from there" in said
    wait_for_end_of({process for process, _ in wells.made(log)})
    table = wells.run(results, tmp_path / "again.txt", 1)
    assert table["reason"].isna().all() and len(table) == wells.COUNT
    assert sorted(numbers(results)) == list(range(1, wells.COUNT + 1))


@pytest.mark.parametrize("torn", [b"3", b"7,8.0,2,61.2,15", b'9,9.0,,,,,"a, \xc3', b""])
def test_a_torn_row_is_dropped(torn, tmp_path):
    results = tmp_path / "wells.csv"
    whole = bw.sweep(wells.well, OVER, results=results, chunk=3)
    lines = results.read_bytes().splitlines(keepends=True)
    results.write_bytes(b"".join(lines[:7]) + torn)
    table = bw.sweep(wells.well, OVER, results=results, chunk=3)
    pd.testing.assert_frame_equal(table, whole, check_exact=True)
    assert sorted(results.read_bytes().splitlines()) == sorted(b"".join(lines).splitlines())


@pytest.mark.parametrize("kept", [0, 25, 60, -30, -1])
def test_a_torn_head_is_written_anew(kept, tmp_path):
    results = tmp_path / "wells.csv"
    whole = bw.sweep(wells.well, OVER, results=results)
    lines = results.read_bytes().splitlines(keepends=True)
    results.write_bytes(b"".join(lines[:2])[: kept or None] if kept else b"")
    pd.testing.assert_frame_equal(bw.sweep(wells.well, OVER, results=results), whole)
    assert results.read_bytes() == b"".join(lines)


def test_a_finished_sweep_is_only_read(tmp_path, monkeypatch):
    results = tmp_path / "wells.csv"
    over = {"width": "5..9 step 0.5", "x": [0.25, 1.2]}
    metrics = ["levels_found", "wavelength_um", "upper", "dipole_nm"]
    whole = bw.sweep(wells.well, over, metrics=metrics, results=results)
    assert whole["reason"].notna().sum() == 9
    text = results.read_bytes()

    def never(task, parts, workers, executor):
        assert list(parts) == []
        yield from ()

    monkeypatch.setattr(sweeping, "run", never)
    again = bw.sweep(wells.well, over, metrics=metrics, results=results)
    pd.testing.assert_frame_equal(whole, again, check_exact=True)
    assert results.read_bytes() == text


def test_the_file_is_a_table_for_anyone(tmp_path):
    results = tmp_path / "wells.csv"
    table = bw.sweep(wells.well, OVER, results=results)
    found = read_file(results).set_index("design")
    assert list(found.columns) == list(table.columns)
    for column in table.columns.drop("reason"):
        assert found[column].tolist() == pytest.approx(
            table[column].tolist(), rel=1e-15, nan_ok=True
        )


# -- refused ----------------------------------------------------------------------------------


def refused(path, says, design=wells.well, over=OVER, **arguments):
    """A sweep is refused by one line, and the file stays letter by letter."""
    before = path.read_bytes()
    with pytest.raises(ResultsError, match=says) as error:
        bw.sweep(design, over, results=path, **arguments)
    assert str(error.value).startswith(f"{path}: ") and "\n" not in str(error.value)
    assert path.read_bytes() == before


@pytest.fixture
def done(tmp_path):
    path = tmp_path / "wells.csv"
    bw.sweep(wells.well, OVER, results=path, line=(2, 1))
    return path


@pytest.mark.parametrize(
    ("says", "change"),
    [
        ("holds results of another design, and stays as it is", {"design": wells.fragile}),
        ("over other values", {"over": {"width": "5..9 step 1"}}),
        ("over other values", {"over": {"width": "5..9 step 0.5", "x": [0.3]}}),
        ("over other values", {"over": {"width": ["5 ", "5.5", "6", "6.5", "7", "7.5", "8", "9"]}}),
        ("with other metrics", {"metrics": ["levels"], "line": None}),
        ("about another line", {"line": (3, 1)}),
        ("about another line", {"window": ("5 um", "20 um")}),
        ("solved with other arguments", {"tolerance": "1e-7 eV"}),
        ("with other metrics and about another line", {"metrics": ["levels"], "line": (3, 1)}),
    ],
)
def test_results_of_something_else_are_refused(says, change, done):
    refused(done, says, **{"line": (2, 1), **change})


def test_results_of_another_version_are_refused(done):
    text = done.read_bytes()
    found = f'"bandwright": "{bw.__version__}"'.encode()
    assert found in text
    done.write_bytes(text.replace(found, b'"bandwright": "0.0.1"'))
    refused(done, "holds results of another version of bandwright", line=(2, 1))


def test_a_stack_is_told_from_another_by_everything(tmp_path):
    own = tmp_path / "own.toml"
    body = '[binary.MyAs]\nlike = "GaAs"\n'
    own.write_text("", encoding="utf-8")
    stack = wells.well(6.0).replace(materials=[own])
    path = tmp_path / "stack.csv"
    over = {"well.thickness": "6 nm, 7 nm"}
    bw.sweep(stack, over, results=path)
    for other in (stack.replace(temperature="299 K"), stack.replace(name="other"),
                  stack.replace(ends="wall"), stack.replace(substrate=None)):  # fmt: skip
        refused(path, "of another design", design=other, over=over)
    bw.sweep(stack, over, results=path)
    own.write_text("# " + body, encoding="utf-8")
    refused(path, "of another design", design=stack, over=over)


def test_a_metric_of_the_same_name_is_told_by_its_source(tmp_path):
    path = tmp_path / "wells.csv"
    bw.sweep(wells.well, OVER, results=path, metrics={"n": lambda s: len(s.levels)})
    refused(path, "with other metrics", metrics={"n": lambda s: len(s.levels) + 1})
    bw.sweep(wells.well, OVER, results=path, metrics={"n": lambda s: len(s.levels)})


@pytest.mark.parametrize(
    "text", ["design,width\n1,5.0\n", "# bandwright sweep: no json\n", "\n", '{"a": 1}', "# bandw",
             "# bandwright sweep: [1]\n", "\x00\xff"],
)  # fmt: skip
def test_a_foreign_file_is_refused(text, tmp_path):
    path = tmp_path / "foreign.csv"
    path.write_bytes(text.encode("latin-1"))
    refused(path, "is no results file of a sweep, and stays as it is; give another file")


def test_a_file_that_can_not_be_written(tmp_path):
    for path, says in ((tmp_path, "Is a directory"), (tmp_path / "no" / "r.csv", "No such file")):
        with pytest.raises(ResultsError, match=f"can't be written: {says}"):
            bw.sweep(wells.well, OVER, results=path)


def test_a_full_disk(tmp_path, monkeypatch):
    path = tmp_path / "wells.csv"
    whole = bw.sweep(wells.well, OVER, results=path, chunk=3)
    path.unlink()
    real, room = os.write, [0, 1200]

    def write(file, data):
        kept = data[: max(room[1] - room[0], 0)]
        if not kept:
            raise OSError(28, "No space left on device")
        room[0] += len(kept)
        return real(file, kept)

    with monkeypatch.context() as full:
        full.setattr(os, "write", write)
        with pytest.raises(
            ResultsError, match=r"wells.csv: can't be written: No space left on dev"
        ):
            bw.sweep(wells.well, OVER, results=path, chunk=3)
    assert path.stat().st_size == 1200
    table = bw.sweep(wells.well, OVER, results=path, chunk=3)
    pd.testing.assert_frame_equal(table, whole, check_exact=True)


@pytest.mark.parametrize(
    ("row", "says"),
    [
        ("x,5.0,2,1.0,2.0,3.0,4.0,\n", "line 12 is no row of this sweep; mend it"),
        ("10,5.0,2,1.0,2.0,3.0,4.0,\n", "line 12 is no row of this sweep"),
        ("0,5.0,2,1.0,2.0,3.0,4.0,\n", "line 12 is no row of this sweep"),
        ("1,5.0\n", "line 12 is no row of this sweep"),
        ("\n", "line 12 is no row of this sweep"),
        ('1,"5.0"x,2,1.0,2.0,3.0,4.0,\n', "line 12 is no row of this sweep"),
        (None, "line 12: design 9 stands twice"),
    ],
)
def test_a_row_that_can_not_be_read(row, says, done):
    lines = done.read_text(encoding="utf-8").splitlines(keepends=True)
    with open(done, "a", encoding="utf-8") as file:
        file.write(lines[-1] if row is None else row)
    refused(done, says, line=(2, 1))


@pytest.mark.skipif(sys.platform == "win32", reason="no such locks there")
def test_two_runs_on_one_file(tmp_path):
    path = tmp_path / "wells.csv"
    with Record(path, {"bandwright": "1"}, ("design", "reason"), 3):
        with pytest.raises(ResultsError, match="another run is writing it; wait for it"):
            Record(path, {"bandwright": "1"}, ("design", "reason"), 3)
    with Record(path, {"bandwright": "1"}, ("design", "reason"), 3) as record:
        record.write([(2, None), (1, "why, so")])
        assert list(record.rows()) == [(1, [None]), (0, ["why, so"])]


@pytest.mark.parametrize(
    "value",
    [1, -7, 0.1, 1e300, 5e-324, math.inf, -math.inf, True, False, None, "2 to 1", "a, b", "7",
     "1.5", "nan", "inf", "True", "", '"quoted"', "two\nlines", "1_000", " 7 ", "µ, Å", 2**70],
)  # fmt: skip
def test_a_cell_reads_back_as_what_it_was(value, tmp_path):
    with Record(tmp_path / "cells.csv", {}, ("design", "value"), 1) as record:
        record.write([(1, value)])
        ((design, (found,)),) = record.rows()
    assert design == 0 and type(found) is type(value) and found == value
    assert "\n" not in _cell(value)


def test_nothing_is_not_a_number():
    assert _cell(math.nan) == "" and _value("") is None
