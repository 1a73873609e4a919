"""``bandwright anticrossings``."""

import csv
import io
import json

import pytest

import bandwright as bw

PAIR = ("15 nm Al0.3Ga0.7As, 5 nm GaAs {label narrow}, 4 nm Al0.3Ga0.7As, 8 nm GaAs,"
        " 15 nm Al0.3Ga0.7As")  # fmt: skip
FIELD = "field=10 kV/cm..60 kV/cm step 5 kV/cm"
HELD = ("--substrate", "GaAs")


def rows(text):
    return list(csv.DictReader(io.StringIO(text)))


@pytest.fixture(scope="module")
def table():
    stack = bw.parse_line(PAIR, substrate="GaAs")
    return bw.anticrossings(stack, {"field": "10 kV/cm..60 kV/cm step 5 kV/cm"})


def test_csv_is_the_table(run, table):
    status, out, err = run("anticrossings", PAIR, *HELD, "--over", FIELD, "--format", "csv")
    assert (status, err) == (0, "")
    (found,) = rows(out)
    assert list(found) == list(table.columns)
    assert float(found["splitting_meV"]) == table["splitting_meV"].iloc[0]
    assert (found["lower"], found["upper"], found["at_end"]) == ("1", "2", "False")


def test_json(run, table):
    status, out, _ = run("anticrossings", PAIR, *HELD, "--over", FIELD, "--format", "json")
    found = json.loads(out)
    assert status == 0 and list(found) == ["stack", "parameter", "anticrossings", "cautions"]
    assert found["parameter"] == "field_kV_per_cm" and found["cautions"] == []
    (row,) = found["anticrossings"]
    assert row["field_kV_per_cm"] == table["field_kV_per_cm"].iloc[0]
    assert row["at_end"] is False and type(row["upper_track"]) is int


def test_options_reach_the_search(run):
    words = ("anticrossings", PAIR, *HELD, "--over", FIELD, "--format", "csv")
    boxed = rows(run(*words, "--of-box")[1])
    assert "of_box" in boxed[0] and len(boxed) > 1
    assert rows(run(*words, "--at-most", "1")[1]) == []
    one_band, two_band = (rows(run(*words, model)[1])[0] for model in ("--one-band", "--two-band"))
    assert one_band["splitting_meV"] != two_band["splitting_meV"]


def test_designs_without_levels_are_said_beside_the_data(run):
    over = "narrow.thickness=-1 nm..11 nm step 1 nm"
    text = "2 of 13 designs have no levels and are left out, the first at narrow.thickness = -1"
    words = ("anticrossings", PAIR, *HELD, "--over", over)
    status, out, err = run(*words, "--format", "csv")
    assert status == 0 and len(rows(out)) == 3
    assert text in " ".join(err.split())
    status, out, err = run(*words)
    assert (status, err) == (0, "") and text in " ".join(out.split())
    assert json.loads(run(*words, "--format", "json")[1])["cautions"][0].startswith(text)


@pytest.mark.parametrize(
    ("words", "text"),
    [
        ([], "--over says along what, and is missing; write for example --over 'field="),
        (["--over", "field"], "--over: got 'field'; write a parameter, '=', and its values"),
        (["--over", FIELD, "--over", "temperature=77 K..300 K"],
         "over: got field and temperature; anticrossings are looked for along one parameter"),
        (["--over", "field=10 kV/cm"], "field: got 1 values; 3 are the least that show where"),
        (["--over", "narow.thickness=5 nm..6 nm"], "did you mean 'narrow"),
        (["--over", FIELD, "--workers", "2"], "anticrossings takes no option '--workers'"),
    ],
)  # fmt: skip
def test_mistakes(run, words, text):
    status, out, err = run("anticrossings", PAIR, *HELD, *words)
    assert (status, out) == (2, "") and text in err
    assert err.count("\n") == 1
