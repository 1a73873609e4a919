"""`bandwright digital`: its formats, its options, and what it refuses."""

import json

import pytest

import bandwright as bw
from bandwright.report.digitized import digital_markdown

WELL = "9 nm Al0.3Ga0.7As, 6 nm AlxGa1-xAs {x 0.3 to 0, label grade}, 5 nm GaAs, 9 nm Al0.3Ga0.7As"


@pytest.fixture
def ask(run):
    def command(*more):
        return run("digital", WELL, "--substrate", "GaAs", *more)

    return command


def digital(**more):
    return bw.digital_alloy(bw.parse_line(WELL, substrate="GaAs"), **more)


def test_toml_is_the_digital_stack(ask, tmp_path):
    path = tmp_path / "digital.toml"
    status, out, err = ask("--layer", "grade", "--period", "4", "--output", path)
    assert (status, out) == (0, "")
    assert bw.read_stack(path) == digital(period=4).stack
    assert "an effective mass is not made for layers" in " ".join(err.split())


def test_toml_finds_its_material_files(ask, tmp_path):
    house = tmp_path / "house.toml"
    house.write_text(
        '[sources]\nours = "invented for a test"\n\n[alloy.AlxGa1-xAs]\n'
        'gap = { bowing = "0.3 eV", source = "ours" }\n', encoding="utf-8",
    )  # fmt: skip
    (tmp_path / "deeper").mkdir()
    path = tmp_path / "deeper" / "digital.toml"
    assert ask("--materials", house, "--output", path)[0] == 0
    assert bw.read_stack(path).materials == (str(house),)


def test_csv_holds_the_pulses(ask):
    status, out, _ = ask("--format", "csv")
    table = digital().table
    rows = [line.split(",") for line in out.splitlines()]
    assert (status, rows[0]) == (0, ["pulse", "layer", "material", "monolayers", "thickness_nm"])
    assert [row[2] for row in rows[1:]] == table["material"].tolist()
    assert [int(row[3]) for row in rows[1:]] == table["monolayers"].tolist()


def test_json_holds_everything(ask):
    status, out, _ = ask("--format", "json", "--between", "GaAs", "Al0.4Ga0.6As")
    found = json.loads(out)
    expected = digital(between=("GaAs", "Al0.4Ga0.6As"))
    assert (status, found["period"]) == (0, 6)
    assert found["layers"][0]["between"] == ["GaAs", "Al0.4Ga0.6As"]
    pulses = [row["monolayers"] for row in found["layers"][0]["pulses"]]
    assert pulses == expected.table["monolayers"].tolist()
    shifts = [row["shift_meV"] for row in found["levels"]]
    assert shifts == pytest.approx(expected.shifts.levels["shift_meV"].tolist())
    assert [row["element"] for row in found["content"]] == ["Ga", "As", "Al"]
    assert found["cautions"] == list(expected.cautions)


def test_markdown_and_html_by_suffix(ask, tmp_path):
    ask("--output", tmp_path / "digital.md")
    assert (tmp_path / "digital.md").read_text(encoding="utf-8") == digital_markdown(digital())
    ask("--output", tmp_path / "digital.html")
    page = (tmp_path / "digital.html").read_text(encoding="utf-8")
    assert page.startswith("<!DOCTYPE html>") and digital()._repr_html_() in page


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (["--layer", "grate"], "layers: no layer 'grate'; did you mean 'grade'?"),
        (["--layer", "layer 3"], "layer 3 (GaAs): GaAs is no alloy, it is grown as it is"),
        (["--period", "1"], "period: got 1; write a whole number of monolayers from 2"),
        (["--period", "six"], "argument --period: invalid int value: 'six'"),
        (["--between", "GaAs", "InAs"], "is not between GaAs and InAs; name two ends"),
    ],
)
def test_mistakes(words, says, ask):
    status, out, err = ask(*words)
    assert (status, out) == (2, "")
    assert says in err and err.count("\n") == 1
