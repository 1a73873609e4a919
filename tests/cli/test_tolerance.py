"""bandwright tolerance, and what compare has besides: wishes, spreads, Markdown and HTML."""

import csv
import io
import json
from html.parser import HTMLParser

import pytest

import bandwright as bw

SPREADS = ("--spread", "every thickness=0.3ML", "--spread", "flux Al=1 %")
WINDOW = ("--window", "8um", "8.6um")


@pytest.fixture
def found(well):
    stack = bw.parse_line(well, substrate="GaAs")
    spreads = {"every thickness": "0.3 ML", "flux Al": "1 %"}
    return bw.tolerance(stack, spreads, window=("8 um", "8.6 um"), draws=40, seed=3)


def test_json_holds_what_python_finds(run, well, found):
    status, out, err = run("tolerance", well, "--substrate", "GaAs", *SPREADS, *WINDOW,
                           "--draws", "40", "--seed", "3", "--format", "json")  # fmt: skip
    assert status == 0
    told = json.loads(out)
    assert [row["sigma_um"] for row in told["lines"]] == found.table["sigma_um"].tolist()
    assert [row["parameter"] for row in told["shares"]] == found.shares["parameter"].tolist()
    linear, drawn = told["estimates"]
    assert linear["yield_percent"] == found.linear_yield * 100.0 and linear["mean_error_um"] is None
    assert drawn["sigma_um"] == found.draws.sigma_um
    assert told["draws"] == {"draws": 40, "seed": 3, "failed": 0, "missing": 0, "unlike": 0}
    assert told["line"] == [2, 1] and told["window_um"] == [8.0, 8.6]
    assert told["cautions"] == list(found.cautions)
    assert "can injure eyes" in err and "share of the variance" in err


def test_csv_has_the_lines_and_the_rest_is_beside(run, well, found):
    status, out, err = run("tolerance", well, "--substrate", "GaAs", *SPREADS, "--format", "csv")
    assert status == 0
    rows = list(csv.DictReader(io.StringIO(out)))
    assert [float(row["sigma_um"]) for row in rows] == found.table["sigma_um"].tolist()
    assert "well.thickness" in err and "draws" not in err


def test_a_line_by_its_levels(run, well):
    line = ("--line", "continuum", "1", "--format", "json")
    told = json.loads(run("tolerance", well, "--substrate", "GaAs", *SPREADS, *line)[1])
    assert told["line"] == ["continuum", 1] and told["draws"] is None


@pytest.mark.parametrize(
    ("words", "says"),
    [
        ((), "--spread is missing: what is spread, such as --spread 'every thickness=0.3 ML'"),
        (("--spread", "well.thickness"), "--spread: got 'well.thickness'; write a name, '=', and"),
        (("--spread", "field=1 V", "--spread", "field=2 V"), "--spread: field is given more than"),
        (("--spread", "well.thicknes=1 nm"), "did you mean 'thickness'"),
        ((*SPREADS, "--window", "9um", "8um"), "write the shorter wavelength first"),
        ((*SPREADS, "--draws", "-5"), "draws: got -5; a whole number from 0 is due"),
        ((*SPREADS, "--line", "2", "one"), "--line: got 'one'; the lower level is a number"),
        ((*SPREADS, "--line", "two", "1"), "line: got ('two', 1); give the numbers"),
    ],
)
def test_a_mistake_is_one_line(run, well, words, says):
    status, out, err = run("tolerance", well, *words)
    assert (status, out) == (2, "") and err.count("\n") == 1
    assert says in err


# -- compare ------------------------------------------------------------------------------------

RANKED = ("--metric", "wavelength_um", "--metric", "sigma_um", *SPREADS,
          "--wish", "wavelength_um=near 8.4, weight 2", "--wish", "dipole_nm=large")  # fmt: skip


@pytest.fixture
def pair(well):
    return [well, well.replace("6.2 nm", "6.6 nm")]


def test_compare_ranks_by_wishes(run, pair):
    out = run("compare", *pair, "--substrate", "GaAs", *RANKED, "--format", "json")[1]
    table = bw.compare(
        [bw.parse_line(text, substrate="GaAs") for text in pair], ["wavelength_um", "sigma_um"],
        spreads={"every thickness": "0.3 ML", "flux Al": "1 %"},
        wishes={"wavelength_um": ("near", 8.4, 2.0), "dipole_nm": ("large",)},
    )  # fmt: skip
    for number, row in enumerate(json.loads(out)["designs"], start=1):
        for name in ("rank", "score", "wavelength_um", "sigma_um", "dipole_nm"):
            assert row[name] == table.loc[number, name]
    assert set(table["rank"]) == {1, 2}


def test_compare_by_the_phase_integral_has_levels(run, pair):
    status, out, _ = run("compare", *pair, "--method", "phase-integral", "--format", "csv")
    rows = list(csv.DictReader(io.StringIO(out)))
    assert status == 0 and [row["reason"] for row in rows] == ["", ""]
    assert float(rows[1]["level_1_meV"]) < float(rows[0]["level_1_meV"])


def test_compare_takes_a_line_and_a_window_of_yield(run, pair):
    words = (*SPREADS, "--yield-window", "8 um", "8.6 um", "--line", "2", "1")
    row = json.loads(run("compare", pair[0], *words, "--format", "json")[1])["designs"][0]
    assert 0.0 < row["yield_percent"] < 100.0 and (row["upper"], row["lower"]) == (2, 1)


def test_markdown_is_a_table_and_a_list(run, pair, tmp_path):
    bad = "5 nm Al0.3Xx0.7As"
    status, out, err = run("compare", *pair, bad, "--format", "markdown")
    lines = out.splitlines()
    assert (status, err) == (0, "") and lines[0].startswith("| design | levels |")
    cells = {line.count("|") for line in lines[:5]}
    assert len(cells) == 1 and lines[1].startswith("| ---: ")
    assert sum(line.startswith("- **design ") for line in lines) == 4 and "failed: " in lines[-1]
    path = tmp_path / "designs.md"
    run("compare", *pair, bad, "--output", path)
    assert path.read_text(encoding="utf-8") == out


class Tags(HTMLParser):
    def __init__(self):
        super().__init__()
        self.open, self.rows = [], 0

    def handle_starttag(self, tag, attrs):
        if tag not in ("meta", "br"):
            self.open.append(tag)
        self.rows += tag == "tr"

    def handle_endtag(self, tag):
        assert self.open.pop() == tag


def test_html_is_a_whole_page(run, pair, tmp_path):
    path = tmp_path / "designs.html"
    named = pair[0].replace("label well", "label a<b")
    assert run("compare", named, pair[1], "--output", path)[0] == 0
    page = path.read_text(encoding="utf-8")
    tags = Tags()
    tags.feed(page)
    assert page.startswith("<!DOCTYPE html>") and tags.open == [] and tags.rows == 3
    assert "a&lt;b" in page and "a<b" not in page and "wavelength<br><small>um</small>" in page


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (("--wish", "wavelenth_um=near 9"), "wishes: there is none of the name 'wavelenth_um'"),
        (("--wish", "dipole_nm"), "--wish: got 'dipole_nm'; write a name, '=', and what it is"),
        (("--wish", "dipole_nm=bigger"), "wish for dipole_nm: got 'bigger'"),
        (("--metric", "sigma_um"), "metrics: sigma_um needs spreads, such as"),
        (("--yield-window", "8um", "9um"), "yield_window: a yield needs spreads"),
    ],
)
def test_a_mistake_in_a_comparison_is_one_line(run, well, words, says):
    status, out, err = run("compare", well, *words)
    assert (status, out) == (2, "") and err.count("\n") == 1
    assert says in err
