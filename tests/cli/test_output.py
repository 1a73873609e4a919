"""What goes where: data on standard output or into a file, everything else on standard error."""

import csv
import io
import json
import os
import subprocess
import sys

import pytest

import bandwright as bw
from bandwright.stackfile import loads

LEVEL_COLUMNS = [
    "level",
    "energy_meV",
    "phase_integral_meV",
    "difference_meV",
    "count_checked",
    "main_layer",
    "probability",
    "mean_position_nm",
    "spread_nm",
    "copies",
]


def rows(text):
    return list(csv.DictReader(io.StringIO(text)))


def test_levels_as_json(run, demo):
    status, out, err = run("levels", demo / "emitter-period.toml", "--format", "json")
    assert status == 0
    found = json.loads(out)
    levels = bw.solve(bw.read_stack(demo / "emitter-period.toml"))
    assert [row["energy_meV"] for row in found["levels"]] == levels.table["energy_meV"].tolist()
    assert list(found["levels"][0]) == [*LEVEL_COLUMNS, "wall_shift_meV_per_nm", "of_box"]
    assert [type(v) for v in found["levels"][0].values()] == [
        int, float, float, float, bool, str, float, float, float, int, float, bool
    ]  # fmt: skip
    assert found["electrons_run"] == "to the surface (50 kV/cm)"
    assert found["bands"] == "two-band"
    assert found["zero"] == levels.profile.zero
    assert found["cautions"] == list(levels.cautions) != []
    assert loads(found["stack"]["toml"], demo) == levels.stack
    said = " ".join(line[11:] for line in err.splitlines())
    assert all(text in said for text in levels.cautions)


def test_levels_as_csv(run, well):
    status, out, err = run("levels", well, "--substrate", "GaAs", "--format", "csv")
    assert (status, err) == (0, "")
    found = rows(out)
    levels = bw.solve(bw.parse_line(well, substrate="GaAs"))
    assert list(found[0]) == LEVEL_COLUMNS
    assert [float(row["energy_meV"]) for row in found] == levels.table["energy_meV"].tolist()
    assert out.count("\n") == len(levels.table) + 1


def test_lines_as_json(run, well):
    status, out, err = run("lines", well, "--substrate", "GaAs", "--format", "json")
    assert status == 0
    found = json.loads(out)
    table = bw.solve(bw.parse_line(well, substrate="GaAs")).lines().table
    assert list(found["lines"][0]) == list(table.columns)
    assert [row["wavelength_um"] for row in found["lines"]] == table["wavelength_um"].tolist()
    assert "continuum" in [row["upper"] for row in found["lines"]]
    assert found["error_budget"] and found["error_budget_of"] == "2 to 1"
    assert "can injure eyes" in found["safety"] and "can injure eyes" in err


def test_lines_as_csv_say_budget_and_safety_on_the_side(run, well):
    status, out, err = run("lines", well, "--substrate", "GaAs", "--format", "csv")
    assert status == 0
    assert [row["upper"] for row in rows(out)] == ["2", "continuum", "continuum"]
    assert "what moves 2 to 1" in err and "can injure eyes" in err
    assert "can injure eyes" not in out


def test_what_is_not_there_is_empty_and_null(run, well):
    onset = rows(run("lines", well, "--format", "csv")[1])[-1]
    assert onset["dipole_nm"] == ""
    found = json.loads(run("lines", well, "--format", "json")[1])
    assert found["lines"][-1]["dipole_nm"] is None


def test_compare_says_the_cautions_of_each_design(run, well):
    indirect = "30 nm AlAs, 6.2 nm GaAs, 30 nm AlAs"
    options = ("--substrate", "GaAs")
    _, out, err = run("compare", indirect, well, "9 nm GaXs", indirect, *options)
    assert err == "" and out.count("indirect gap") == 1
    assert "caution    designs 1, 4: layer 1 (AlAs), layer 3 (AlAs): indirect gap" in out
    _, out, err = run("compare", indirect, well, *options, "--format", "csv")
    assert "indirect" not in out and "caution    design 1: layer 1 (AlAs)" in err
    assert "heard" not in rows(out)[0]
    _, out, err = run("compare", indirect, well, *options, "--format", "json")
    first, second = json.loads(out)["designs"]
    assert any("indirect gap" in text for text in first["cautions"]) and "indirect" in err
    assert second["cautions"] == [] and "heard" not in first


def test_compare_keeps_a_design_that_fails_with_its_reason(run, well):
    status, out, _ = run("compare", well, "5 nm Al0.3Xx0.7As", "--format", "csv")
    assert status == 0
    good, bad = rows(out)
    assert good["levels"] == "2" and good["reason"] == ""
    assert bad["wavelength_um"] == "" and bad["reason"]
    found = json.loads(run("compare", well, "--format", "json")[1])
    assert found["designs"][0]["levels"] == 2


def test_materials_as_csv_and_json(run):
    found = rows(run("materials", "--format", "csv")[1])
    assert {"GaAs", "AlAs", "InAs", "InP", "GaSb", "AlSb"} <= {row["material"] for row in found}
    found = json.loads(run("materials", "GaAs", "--format", "json")[1])
    assert found["materials"][0]["gap_eV"] == pytest.approx(1.42248, abs=1e-5)
    assert all(fact["source"] for fact in found["facts"])


@pytest.mark.parametrize(("suffix", "first"), [("csv", "level,"), ("json", "{"), ("txt", "elec")])
def test_a_file_takes_the_data_and_its_suffix_the_format(run, well, tmp_path, suffix, first):
    path = tmp_path / f"levels.{suffix}"
    assert run("levels", well, "--substrate", "GaAs", "--output", path) == (0, "", "")
    assert path.read_text(encoding="utf-8").startswith(first)


def test_format_goes_before_the_suffix(run, well, tmp_path):
    path = tmp_path / "levels.txt"
    run("levels", well, "--format", "json", "--output", path)
    assert json.loads(path.read_text(encoding="utf-8"))["levels"]


def test_a_file_that_cannot_be_written_is_one_line(run, well, tmp_path):
    path = tmp_path / "no such folder" / "levels.csv"
    status, out, err = run("levels", well, "--output", path)
    assert (status, out) == (2, "")
    assert err == f"bandwright: {path}: No such file or directory\n"


def test_a_reader_that_leaves_early_is_no_error(well):
    read, write = os.pipe()
    os.close(read)
    ran = subprocess.run(
        [sys.executable, "-m", "bandwright.cli", "levels", well],
        stdout=write, stderr=subprocess.PIPE, text=True,
    )  # fmt: skip
    os.close(write)
    assert (ran.returncode, ran.stderr) == (1, "")


def test_a_screen_without_the_letters_of_a_label_gets_their_codes():
    ran = subprocess.run(
        [sys.executable, "-m", "bandwright.cli", "levels",
         "9 nm Al0.3Ga0.7As {label µ}, 5 nm GaAs, 9 nm Al0.3Ga0.7As"],
        env={**os.environ, "PYTHONIOENCODING": "ascii"}, capture_output=True, text=True,
    )  # fmt: skip
    assert (ran.returncode, ran.stderr) == (0, "")
    assert r"{label \xb5}" in ran.stdout


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="needs a device that is always full")
def test_a_full_disk_is_one_line(well):
    with open("/dev/full", "w") as full:
        ran = subprocess.run(
            [sys.executable, "-m", "bandwright.cli", "levels", well],
            stdout=full, stderr=subprocess.PIPE, text=True,
        )  # fmt: skip
    assert ran.returncode == 2
    assert ran.stderr == "bandwright: output: No space left on device\n"


OPTIONS = {
    ("--field", "-12kV/cm"): {"field": "-12 kV/cm"},
    ("--field", "12 kV/cm", "--electrons-run", "to surface"): {"field": "-12 kV/cm"},
    ("--bias", "50 mV"): {"bias": "50 mV"},
    ("--temperature", "77 K"): {"temperature": "77 K"},
    ("--substrate", "GaAs"): {"substrate": "GaAs"},
    ("--zero", "well"): {"zero": "well"},
    ("--below", "100 meV"): {"solve": {"below": "100 meV"}},
    ("--at-most", "1"): {"solve": {"at_most": 1}},
    ("--one-band",): {"solve": {"bands": "one-band"}},
    ("--two-band",): {"solve": {"bands": "two-band"}},
    ("--tolerance", "1e-9 eV"): {"solve": {"tolerance": "1e-9 eV"}},
    ("--group", "1 eV"): {"solve": {"group": "1 eV"}},
    ("--method", "phase-integral"): {"solve": {"method": "phase-integral"}},
    ("--method", "phase-integral", "--phase-order", "2"): {
        "solve": {"method": "phase-integral", "phase_order": 2}
    },
}


@pytest.mark.parametrize("words", OPTIONS, ids=" ".join)
def test_options_do_what_python_does(words, run):
    line = "30 nm Al0.28Ga0.72As, 14 nm AlxGa1-xAs {x 0.1 to 0, label well}, 30 nm Al0.28Ga0.72As"
    plain, option = (run("levels", line, *more, "--format", "csv") for more in ((), words))
    arguments = dict(OPTIONS[words])
    solve = arguments.pop("solve", {})
    levels = bw.solve(bw.parse_line(line, **arguments), **solve)
    assert option[0] == 0
    assert [float(r["energy_meV"]) for r in rows(option[1])] == levels.table["energy_meV"].tolist()
    if words not in (("--two-band",), ("--tolerance", "1e-9 eV")):  # the default, and finer digits
        assert option[1] != plain[1]


@pytest.mark.parametrize(
    ("has", "option", "says"),
    [
        ('bias = "50 mV"', ("--field", "3 kV/cm"), "to the substrate (3 kV/cm)"),
        ('field = "3 kV/cm"', ("--bias", "36 mV"), "to the surface (20 kV/cm)"),
        (
            'bias = "50 mV"\nelectrons_run = "to surface"',
            ("--field", "3 kV/cm"),
            "to the surface (3 kV/cm)",
        ),
        (
            'field = "3 kV/cm"\nelectrons_run = "to substrate"',
            ("--bias", "36 mV"),
            "to the substrate (20 kV/cm)",
        ),
    ],
)
def test_field_and_bias_take_the_place_of_what_a_file_has(run, tmp_path, has, option, says):
    path = tmp_path / "driven.toml"
    path.write_text(
        f'[stack]\n{has}\n[[layers]]\nmaterial = "GaAs"\nthickness = "9 nm"\n'
        '[[layers]]\nmaterial = "Al0.3Ga0.7As"\nthickness = "9 nm"\n',
        encoding="utf-8",
    )
    status, out, _ = run("levels", path, *option, "--format", "json")
    assert status == 0
    assert json.loads(out)["electrons_run"] == says


PAIRS = "9 x (8 nm In0.2Ga0.8As {label well}, 10 nm GaAs0.9P0.1 {label barrier})"


def test_strain_as_json_and_csv(run):
    ask = ["strain", PAIRS, "--substrate", "GaAs", "--balance", "barrier.thickness"]
    status, out, err = run(*ask, "--format", "json")
    assert status == 0
    found = json.loads(out)
    strain = bw.mismatches(bw.parse_line(PAIRS, substrate="GaAs"))
    assert found["mean_stress_GPa"] == strain.mean_stress_GPa
    assert [row["layer"] for row in found["layers"]] == ["well", "barrier"]
    assert found["layers"][0]["mismatch_percent"] == strain.table["mismatch_percent"].iloc[0]
    assert found["whole"]["critical_thickness_nm"] == strain.whole.limit
    (balance,) = found["balances"]
    assert loads(balance["stack"]["toml"], None) == strain.balanced("barrier.thickness").stack
    assert found["cautions"] == list(strain.cautions) != []
    said = " ".join(err.split())
    assert "brings the mean stress to zero" in said and "K = 8 pi" in said
    status, out, err = run(*ask, "--format", "csv")
    assert [float(r["stress_GPa"]) for r in rows(out)] == strain.table["stress_GPa"].tolist()
    assert "caution    well to barrier" in err


def test_what_is_infinite_or_not_there_is_null(run):
    line = "9 nm GaAs, 8 nm In0.2Ga0.8As, 9 nm GaAs"
    found = json.loads(run("strain", line, "--substrate", "GaAs", "--format", "json")[1])
    assert found["layers"][0]["critical_thickness_nm"] is None
    assert found["layers"][1]["critical_in_group_nm"] is None
    line = "9 nm GaAs, 8 nm Al0.2Ga0.8As"
    found = json.loads(run("strain", line, "--substrate", "GaAs", "--format", "json")[1])
    assert found["whole"] is None


def test_xray_as_json_and_csv(run):
    ask = ["xray", PAIRS, "--substrate", "GaAs", "--reflection", "115", "--orders", "2",
           "--wavelength", "1.5406 Å"]  # fmt: skip
    status, out, err = run(*ask, "--format", "json")
    assert status == 0
    found = json.loads(out)
    pattern = bw.xray_pattern(bw.parse_line(PAIRS, substrate="GaAs"), "115", "0.15406 nm", orders=2)
    assert found["zero_order_deg"] == pattern.zero_order_deg
    assert found["reflection"] == [1, 1, 5] and found["wavelength_nm"] == 0.15406
    assert [row["order"] for row in found["satellites"]] == [-2, -1, 0, 1, 2]
    status, out, err = run(*ask, "--format", "csv")
    assert [float(r["bragg_angle_deg"]) for r in rows(out)] == pattern.columns["bragg_angle_deg"]
    assert "period     18 nm (9 times): well + barrier" in err and "kinematic" in err


@pytest.mark.parametrize("command", ["strain", "xray"])
def test_strain_and_xray_as_a_page_of_html(command, run, tmp_path):
    path = tmp_path / "page.html"
    ask = [command, PAIRS, "--substrate", "GaAs", "--output", path]
    more = ["--balance", "well.thickness"] if command == "strain" else []
    assert run(*ask, *more) == (0, "", "")
    page = path.read_text(encoding="utf-8")
    assert page.startswith("<!DOCTYPE html>") and page.count("<table>") == 1
    assert ("<b>balance</b> well.thickness from 8 nm to" in page) == (command == "strain")
