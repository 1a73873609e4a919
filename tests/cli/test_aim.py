"""``bandwright aim``."""

import csv
import io
import json

import pytest

import bandwright as bw

WELL = (
    "40 nm Al0.24Ga0.76As {label barrier}, 6 nm GaAs {label well},"
    " 40 nm Al0.24Ga0.76As {label barrier}"
)
HELD = ("--substrate", "GaAs", "--temperature", "77 K")
ASKED = ("--free", "well.thickness=4nm..12nm", "--line", "2 to 1=10.3um")


@pytest.fixture
def due():
    stack = bw.parse_line(WELL, substrate="GaAs", temperature="77 K")
    return bw.aim(stack, {"well.thickness": "4nm..12nm"}, {"2 to 1": "10.3 um"})


def test_text_is_the_result(run, due):
    status, out, err = run("aim", WELL, *HELD, *ASKED)
    assert (status, err) == (0, "")
    assert out == str(due)


def test_csv_has_the_values(run, due):
    status, out, err = run("aim", WELL, *HELD, *ASKED, "--format", "csv")
    assert status == 0
    assert err == "every target is met\n"
    rows = list(csv.DictReader(io.StringIO(out)))
    assert [row["parameter"] for row in rows] == ["well.thickness", "barrier.thickness"]
    assert float(rows[0]["value"]) == due.values.value[0]
    assert rows[0]["monolayers"] == str(int(due.values.monolayers[0]))


def test_json_has_stacks_that_can_be_solved(run, due, tmp_path):
    path = tmp_path / "aimed.json"
    status, out, _ = run("aim", WELL, *HELD, *ASKED, "--output", path)
    assert (status, out) == (0, "")
    found = json.loads(path.read_text(encoding="utf-8"))
    assert found["reached"] is True and found["solves"] == due.solves
    file = tmp_path / "rounded.toml"
    file.write_text(found["rounded"]["toml"], encoding="utf-8")
    assert bw.read_stack(file) == due.rounded
    assert found["targets"][0]["reached"] == due.targets.reached[0]


def test_every_option_arrives(run):
    status, out, _ = run(
        "aim", WELL, *HELD, *ASKED, "--free", "barrier.composition=0.2..0.3", "--line",
        "continuum to 1=170 meV", "--weight", "2 to 1=5", "--limit", "thickness=..90nm", "--grid",
        "barrier.composition=0.01", "--starts", "2", "--follow", "--maximise", "dipole 2 to 1",
        "--one-band", "--below", "0.4 eV", "--format", "json",
    )  # fmt: skip
    assert status == 0
    found = json.loads(out)
    assert found["starts"] == 2
    assert [row["target"] for row in found["targets"]] == ["2 to 1", "continuum to 1",
                                                           "dipole 2 to 1"]  # fmt: skip
    assert found["limits"][0]["most"] == 90.0
    fraction = next(row["rounded"] for row in found["values"]
                    if row["parameter"] == "barrier.composition")  # fmt: skip
    assert fraction == pytest.approx(round(fraction, 2), abs=1e-12)
    assert 'bands = "' not in found["stack"]["toml"]


def test_out_of_reach_is_an_answer(run):
    status, out, _ = run("aim", WELL, *HELD, "--free", "well.thickness=6nm..7nm", *ASKED[2:])
    assert status == 0
    assert "out of reach within these bounds: the nearest to 10.3 um of 2 to 1 is" in out


@pytest.mark.parametrize(
    ("words", "text"),
    [
        (ASKED[2:], "free: no free parameter"),
        (ASKED[:2], "targets: none is given"),
        ((*ASKED, "--free", "field"), "--free: got 'field'; write a name, '=', and its value"),
        ((*ASKED, "--line", "2 to 1=9um"), "--line: 2 to 1 is given more than once"),
        ((*ASKED, "--weight", "2 to 1=much"), "--weight: got 'much' for 2 to 1; a number is due"),
        (("--free", "wel.thickness=4nm..9nm", *ASKED[2:]), "did you mean 'well.thickness'"),
    ],
)
def test_mistakes_take_one_line(run, words, text):
    status, out, err = run("aim", WELL, *HELD, *words)
    assert (status, out) == (2, "")
    assert text in err and err.count("\n") == 1
