"""`bandwright fit`: its formats, its options, and what it refuses."""

import json
from pathlib import Path

import pytest

import bandwright as bw

DEMO_RATES = Path(__file__).parents[2] / "demo" / "calibrations.toml"

@pytest.fixture
def ask(run, demo):
    def command(*more):
        return run("fit", demo / "emitter-stage.toml", "--measured", demo / "measured-stage.toml",
                   *more)  # fmt: skip

    return command


@pytest.fixture
def found(demo):
    with pytest.warns(bw.BandwrightWarning):
        return bw.fit(bw.read_stack(demo / "emitter-stage.toml"), demo / "measured-stage.toml")


def test_text_and_the_sheet_in_one_command(ask, demo, found):
    status, out, err = ask("--calibrations", demo / "calibrations.toml")
    assert (status, err) == (0, "")
    sheet = found.sheet(demo / "calibrations.toml")
    assert out.startswith(str(found)) and out.endswith(str(sheet))
    assert "growth sheet of the next run, by the rates that this wafer tells" in out
    assert found.solves < 30 and f"3 factors to 5 data, by {found.solves} solves" in out


def test_json_holds_covariance_and_the_stack_to_set(ask, demo, found):
    status, out, _ = ask("--format", "json", "--calibrations", demo / "calibrations.toml")
    said = json.loads(out)
    assert status == 0
    assert said["covariance"] == found.covariance.tolist()
    assert [row["grown"] for row in said["factors"]] == found.values.tolist()
    assert bw.stackfile.loads(said["corrected"]["toml"]) == found.corrected
    assert said["chi_square"] == found.chi_square and said["degrees_of_freedom"] == 2
    assert "[cells.Ga2]" in said["sheet"]["calibrations"] and said["told_apart"] is True


def test_csv_markdown_and_html(ask, found, tmp_path):
    _, out, err = ask("--format", "csv")
    assert out.splitlines()[0] == "factor,designed,grown,sigma,off_percent,to_set,unit"
    assert out.splitlines()[1].startswith(f"flux In,1.0,{found.values[0]!r},".replace(
        f"{found.values[0]!r}", repr(float(found.values[0]))))  # fmt: skip
    assert "can injure" in err
    ask("--output", tmp_path / "fit.md")
    assert (tmp_path / "fit.md").read_text(encoding="utf-8") == found.markdown()
    ask("--output", tmp_path / "fit.html")
    page = (tmp_path / "fit.html").read_text(encoding="utf-8")
    assert page.startswith("<!DOCTYPE html>") and found._repr_html_() in page


def test_factors_by_name(ask):
    status, out, _ = ask("--factor", "all thicknesses", "--factor", "flux In")
    assert status == 0 and "2 factors to 5 data" in out


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (["--measured", "none.toml"], "none.toml: can't be read: No such file"),
        (["--calibrations", "none.toml"], "none.toml: can't be read: No such file"),
        (["--calibrations", DEMO_RATES, "--within", "0.001"], "In0.53Ga0.47As"),
        (["--factor", "flux Gaa"], "did you mean 'flux Ga'"),
        (["--factor", "temperature"], "temperature: no growth rate moves it"),
    ],
)
def test_mistakes(words, says, ask):
    status, out, err = ask(*words)
    assert (status, out) == (2, "")
    assert says in err and err.count("\n") == 1


def test_measured_data_must_be_given(run):
    status, _, err = run("fit", "6 nm GaAs")
    assert status == 2 and "--measured" in err and err.count("\n") == 1
