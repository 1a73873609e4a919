"""`bandwright grow`: its formats, its options, and what it refuses."""

import json

import pytest

import bandwright as bw

PAIRS = "9 nm Al0.24Ga0.76As, 3 x (5 nm GaAs {label well}, 2 nm Al0.24Ga0.76As)"


@pytest.fixture
def ask(run, demo):
    def command(*more):
        return run("grow", PAIRS, "--substrate", "GaAs", "--calibrations",
                   demo / "calibrations.toml", *more)  # fmt: skip

    return command


def sheet(demo, **more):
    stack = bw.parse_line(PAIRS, substrate="GaAs")
    return bw.growth_sheet(stack, demo / "calibrations.toml", **more)


def test_csv_goes_back_to_the_stack(ask, demo, tmp_path):
    path = tmp_path / "sheet.csv"
    status, out, err = ask("--output", path)
    assert (status, out) == (0, "")
    assert "licensed practice" in " ".join(err.split())
    assert path.read_text(encoding="utf-8") == sheet(demo).csv()
    assert bw.stack_from_sheet(path, substrate="GaAs") == sheet(demo).grown


def test_json_holds_the_sheet_and_what_it_rests_on(ask, demo):
    status, out, _ = ask("--format", "json", "--line", "2", "1")
    found = json.loads(out)
    assert status == 0
    expected = sheet(demo, line=(2, 1))
    assert found["total_nm"] == expected.total_nm and found["total_s"] == expected.total_s
    assert found["line"]["after_um"] == expected.shift.after_um
    assert [row["whole_ML"] for row in found["steps"]] == expected.columns["whole_ML"]
    assert "[cells.Ga1]" in found["calibrations"] and "toxic" in found["safety"]


def test_markdown_and_html_by_suffix(ask, demo, tmp_path):
    ask("--output", tmp_path / "sheet.md")
    assert (tmp_path / "sheet.md").read_text(encoding="utf-8") == sheet(demo).markdown()
    ask("--output", tmp_path / "sheet.html")
    page = (tmp_path / "sheet.html").read_text(encoding="utf-8")
    assert page.startswith("<!DOCTYPE html>") and sheet(demo)._repr_html_() in page


def test_options_are_those_of_the_function(ask, demo):
    _, out, _ = ask("--order", "surface first", "--as-designed", "--interruption", "well=2 s",
                    "--interruption", "layer 1=1 min", "--within", "0.1")  # fmt: skip
    pauses = {"well": "2 s", "layer 1": "1 min"}
    expected = sheet(demo, order="surface first", whole=False, interruption=pauses, within=0.1)
    assert out == str(expected)
    assert "the thicknesses as designed, 30.00 nm in all" in out


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (["--calibrations", "none.toml"], "none.toml: can't be read: No such file"),
        (["--interruption", "5 nm"], "interruption: got '5 nm'; that is a length; write a time"),
        (["--interruption", "wel=5 s"], "interruption: no layer 'wel'; did you mean 'well'?"),
        (["--interruption", "5 s", "--interruption", "well=1 s"], "--interruption: got '5 s'; wr"),
        (["--line", "2"], "line: got '2'; write two levels, '2 1', or 'strongest'"),
        (["--line", "2", "two"], "line: got (2, 'two'); give the numbers"),
        (["--within", "3"], "within: got 3.0; a fraction lies between 0 and 1"),
        (["--at-most", "3"], "at_most: nothing is solved without a line"),
    ],
)
def test_mistakes(words, says, ask):
    status, out, err = ask(*words)
    assert (status, out) == (2, "")
    assert says in err and err.count("\n") == 1
