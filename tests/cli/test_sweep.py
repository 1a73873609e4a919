"""``bandwright sweep``."""

import csv
import fcntl
import io
import json
import os
import pty
import re
import select
import signal
import struct
import subprocess
import sys
import termios

import pandas as pd
import pytest

import bandwright as bw

WELL = "20 nm Al0.3Ga0.7As, 7 nm GaAs {label well}, 20 nm Al0.3Ga0.7As"
WIDTHS = "well.thickness=6 nm..8 nm step 1 nm"
HELD = ("--substrate", "GaAs", "--zero", "well")


def rows(text):
    return list(csv.DictReader(io.StringIO(text)))


@pytest.fixture
def table():
    stack = bw.parse_line(WELL, substrate="GaAs", zero="well")
    return bw.sweep(stack, {"well.thickness": "6 nm..8 nm step 1 nm"})


def test_csv_is_the_table(run, table):
    status, out, err = run("sweep", WELL, *HELD, "--over", WIDTHS, "--format", "csv")
    assert (status, err) == (0, "")
    found = rows(out)
    assert list(found[0]) == ["design", *table.columns]
    for row, (_, due) in zip(found, table.iterrows(), strict=True):
        for name in table.columns.drop("reason"):
            assert float(row[name] or "nan") == pytest.approx(due[name], nan_ok=True, rel=1e-15)


def test_json(run, table):
    status, out, _ = run("sweep", WELL, *HELD, "--over", WIDTHS, "--format", "json")
    found = json.loads(out)
    assert status == 0 and list(found) == ["stack", "parameters", "line", "designs"]
    assert found["parameters"] == ["well.thickness_nm"] and found["line"] == [2, 1]
    assert [row["design"] for row in found["designs"]] == [1, 2, 3]
    assert [row["wavelength_um"] for row in found["designs"]] == table["wavelength_um"].tolist()
    assert [type(row["levels_found"]) for row in found["designs"]] == [int] * 3


def test_options_reach_the_sweep(run):
    words = ["--over", "well.thickness=6 nm, 9 nm", "--over", "field=0 kV/cm, 5 kV/cm", "--paired",
             "--metric", "upper", "--metric", "level_1_meV", "--line", "continuum", "1",
             "--at-most", "1", "--one-band", "--workers", "1", "--chunk", "1",
             "--window", "1 um", "90 um", "--format", "csv"]  # fmt: skip
    status, out, _ = run("sweep", WELL, *HELD, *words)
    found = rows(out)
    assert status == 0 and list(found[0]) == [
        "design", "well.thickness_nm", "field_kV_per_cm", "upper", "level_1_meV", "reason",
    ]  # fmt: skip
    assert [row["upper"] for row in found] == ["continuum", ""]
    assert [row["field_kV_per_cm"] for row in found] == ["0.0", "5.0"]
    one = bw.solve(bw.parse_line(WELL, substrate="GaAs", zero="well", bands="one-band").replace(
        layers=bw.parse_line(WELL.replace("7 nm", "6 nm")).layers))  # fmt: skip
    assert float(found[0]["level_1_meV"]) == pytest.approx(one.energies[0] * 1e3, abs=1e-6)
    status, out, _ = run("sweep", WELL, *HELD, "--over", WIDTHS, "--strongest", "--strength", "99",
                         "--metric", "upper", "--format", "csv")  # fmt: skip
    assert [row["upper"] for row in rows(out)] == ["", "", ""]


def test_a_line_that_is_followed(run):
    pair = WELL.replace("20 nm Al0.3Ga0.7As, 7 nm", "20 nm Al0.3Ga0.7As, 6 nm GaAs, 14 nm"
                        " Al0.3Ga0.7As, 7 nm")  # fmt: skip
    words = ["sweep", pair, "--substrate", "GaAs", "--over", "well.thickness=5.5 nm, 6.5 nm",
             "--line", "4", "2", "--metric", "lower"]  # fmt: skip
    assert [row["lower"] for row in rows(run(*words, "--format", "csv")[1])] == ["2", "2"]
    status, out, _ = run(*words, "--follow", "--format", "csv")
    assert status == 0 and [row["lower"] for row in rows(out)] == ["2", "1"]
    assert "4 to 2, in the first design, followed by character" in run(*words, "--follow")[1]


def test_designs_from_a_table(run, tmp_path):
    path = tmp_path / "designs.csv"
    path.write_text(
        "# ours\nwell.thickness,layer 1.thickness_nm\n6 nm,20\n7 nm,25.5\n", encoding="utf-8"
    )
    status, out, err = run("sweep", WELL, *HELD, "--designs", path, "--format", "csv")
    assert (status, err) == (0, "")
    assert [(row["well.thickness_nm"], row["layer 1.thickness_nm"]) for row in rows(out)] == [
        ("6.0", "20.0"), ("7.0", "25.5"),
    ]  # fmt: skip


def test_failures_are_said_beside_the_data(run):
    over = "well.thickness=0 nm..7 nm step 1 nm"
    status, out, err = run("sweep", WELL, *HELD, "--over", over, "--format", "csv")
    assert status == 0 and len(rows(out)) == 8
    assert err == (
        "caution    1 of 8 designs lack numbers\n"
        "caution    design 1: well.thickness: got 0; a thickness must be above zero\n"
    )
    many = "well.thickness=" + ", ".join(f"-{i} nm" for i in range(1, 9)) + ", 7 nm"
    _, out, _ = run("sweep", WELL, *HELD, "--over", many)
    assert "8 of 9 designs lack numbers" in out and "and 3 more reasons, in the column" in out


def test_the_same_command_goes_on(run, tmp_path):
    path = tmp_path / "wells.csv"
    words = ["sweep", WELL, *HELD, "--over", WIDTHS, "--chunk", "1", "--format", "csv"]
    _, due, _ = run(*words)
    assert run(*words, "--results", path) == (0, due, "")
    lines = path.read_bytes().splitlines(keepends=True)
    path.write_bytes(b"".join(lines[:4]) + b"3,8")
    assert run(*words, "--results", path, "--workers", "2") == (0, due, "")
    assert path.read_bytes() == b"".join(lines)
    designs = pd.read_csv(path, comment="#")["design"].tolist()
    assert designs == [1, 2, 3]


BAD = [
    (
        ["--over", "well.thickness=8nm..6nm step 1nm"],
        "which runs backwards; write '6nm..8nm step 1",
    ),
    (["--over", "well.thickness=6nm..8nm step 0 nm"], "step: got '0 nm'; a step above zero is due"),
    (["--over", "well.thickness=6nm..8nm count 0"], "count: got '0'; a whole number from 1 is due"),
    (
        ["--over", "well.thickness=6nm..8nm"],
        "without a step or a count; write for example '6nm..8nm",
    ),
    (
        ["--over", "wel.thickness=6nm"],
        "no layer has the label 'wel'; did you mean 'well.thickness'",
    ),
    (
        ["--over", "well.thickness=6 meV"],
        "got '6 meV'; that is an energy; write a thickness such as",
    ),
    (["--over", "well.thickness"], "--over: got 'well.thickness'; write a parameter, '=', and its"),
    (["--over", "well.thickness="], "--over: got 'well.thickness='; write a parameter, '='"),
    (["--over", WIDTHS, "--over", WIDTHS], "--over: well.thickness is given more than once"),
    (
        ["--over", WIDTHS, "--over", "field=1 kV/cm", "--paired"],
        "paired: well.thickness has 3, field",
    ),
    ([], "--over or --designs says what is swept, and nothing is given; write for example --over"),
    (["--over", WIDTHS, "--designs", "d.csv"], "says what is swept, and both are given"),
    (["--designs", "no.csv"], "no.csv: No such file or directory"),
    (
        ["--over", WIDTHS, "--line", "1", "2"],
        "the upper level comes first and has the larger number",
    ),
    (["--over", WIDTHS, "--line", "2", "x"], "line: got (2, 'x'); give the numbers of its upper"),
    (
        ["--over", WIDTHS, "--line", "2", "1", "--strongest"],
        "--line names one line for all designs",
    ),
    (["--over", WIDTHS, "--metric", "wavelenth_um"], "did you mean 'wavelength_um'"),
    (["--over", WIDTHS, "--workers", "0"], "workers: got 0; a whole number from 1 is due"),
    (["--over", WIDTHS, "--chunk", "0"], "chunk: got 0; a whole number from 1 is due"),
    (["--over", WIDTHS, "--results", "/no/such/folder/r.csv"], "can't be written: No such file"),
    (["--over", WIDTHS, "--method", "shooting"], "sweep takes no option '--method'"),
]


@pytest.mark.parametrize(("words", "says"), BAD, ids=lambda value: " ".join(value)[:40])
def test_mistakes_are_one_line(words, says, run, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    status, out, err = run("sweep", WELL, *HELD, *words)
    assert (status, out) == (2, "")
    assert err.startswith("bandwright: ") and err.count("\n") == 1 and says in err


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "is no CSV with a line of parameters above rows"),
        ("# nothing\n", "is no CSV with a line of parameters above rows"),
        ("well.thickness\n", "well.thickness: an empty list, so that there is nothing to sweep"),
        ("well.thickness,field\n6 nm,\n", "design 1 has not a value for each of the 2 columns"),
        ("well.thickness,field\n6 nm,1 kV/cm\n7 nm\n", "design 2 has not a value for each"),
        ("field,field\n1 kV/cm,2 kV/cm\n", "'field' names more than one column"),
        ("well.thickness\nwide\n", "well.thickness: got 'wide'; write one number and one unit"),
    ],
)
def test_tables_of_designs_that_are_none(text, says, run, tmp_path):
    path = tmp_path / "designs.csv"
    path.write_text(text, encoding="utf-8")
    status, out, err = run("sweep", WELL, *HELD, "--designs", path)
    assert (status, out) == (2, "") and says in err and err.count("\n") == 1


def test_foreign_and_other_results_stay_as_they_are(run, tmp_path):
    path = tmp_path / "wells.csv"
    path.write_text("my own notes\n", encoding="utf-8")
    words = ["sweep", WELL, *HELD, "--over", WIDTHS, "--results", path]
    status, out, err = run(*words)
    assert (status, out) == (2, "") and err.count("\n") == 1
    assert "is no results file of a sweep, and stays as it is" in err
    assert path.read_text(encoding="utf-8") == "my own notes\n"
    path.unlink()
    assert run(*words)[0] == 0
    text = path.read_bytes()
    for other, says in (
        (["--temperature", "77 K"], "holds results of another design, and stays as it is"),
        (["--tolerance", "1e-8 eV"], "holds results solved with other arguments"),
    ):
        status, out, err = run(*words, *other)
        assert (status, out) == (2, "") and says in err and err.count("\n") == 1
        assert path.read_bytes() == text


def test_interrupted_at_a_terminal(tmp_path):
    path = tmp_path / "wells.csv"
    over = "well.thickness=6 nm..8 nm count 40000"
    words = ["sweep", WELL, *HELD, "--over", over, "--chunk", "20", "--metric", "dipole_nm"]
    screen, end = pty.openpty()
    fcntl.ioctl(end, termios.TIOCSWINSZ, struct.pack("HHHH", 24, 80, 0, 0))
    work = subprocess.Popen(
        [sys.executable, "-m", "bandwright.cli", *words, "--results", str(path)],
        stderr=end, stdout=subprocess.PIPE,
        # a shell's background job is deaf to it, and its children inherit that
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL),
    )  # fmt: skip
    os.close(end)
    said = b""
    while b"/40000 [" not in said:  # until the bar shows
        assert select.select([screen], [], [], 60.0)[0], "no bar"
        said += os.read(screen, 65536)
    work.send_signal(signal.SIGINT)
    try:
        while more := os.read(screen, 65536):
            said += more
    except OSError:  # the other side has closed
        pass
    out, _ = work.communicate(timeout=60)
    os.close(screen)
    assert work.returncode == 130 and out == b""
    text = said.decode()
    assert re.search(
        r"bandwright: interrupted; .*wells\.csv holds [\d,]+ of 40,000 designs; the same call goes"
        r" on from there",
        text,
    )
    assert "Traceback" not in text
