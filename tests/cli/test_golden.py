"""The text of each command, letter by letter.

After a wanted change: ``pytest tests/cli --rewrite-golden``, then read every difference.
"""

from pathlib import Path

import pytest

GOLDEN = Path(__file__).parent / "golden"

PAIRS = "20 x (8 nm In0.2Ga0.8As {label well}, 10 nm GaAs0.9P0.1 {label barrier})"  # invented

CASES = {
    "levels": ["levels", "demo/detector-well.toml"],
    "levels-graded": ["levels", "demo/graded-well.toml"],
    "levels-in-a-field": ["levels", "demo/emitter-period.toml"],
    "levels-fine": ["levels", "demo/graded-well.toml", "--tolerance", "1e-9 eV", "--one-band"],
    "levels-phase-integral": ["levels", "demo/graded-well.toml", "--method", "phase-integral"],
    "levels-none": ["levels", "5 nm GaAs, 5 nm Al0.3Ga0.7As, 5 nm GaAs", "--substrate", "GaAs"],
    "lines": ["lines", "demo/detector-well.toml"],
    "lines-in-a-field": ["lines", "demo/emitter-period.toml", "--window", "8 um", "12 um"],
    "compare": ["compare", "demo/detector-well.toml", "demo/graded-well.toml",
                "demo/emitter-period.toml"],
    "compare-ranked": ["compare", "demo/detector-well.toml", "demo/graded-well.toml", "--metric",
                       "wavelength_um", "--metric", "net_strain_percent", "--metric",
                       "rounded_wavelength_um", "--metric", "yield_percent", "--spread",
                       "every thickness=0.3ML", "--yield-window", "10um", "10.6um", "--wish",
                       "wavelength_um=near 10.3, weight 2", "--wish", "yield_percent=large"],
    "compare-html": ["compare", "demo/detector-well.toml", "--format", "html"],
    "tolerance": ["tolerance", "demo/emitter-period.toml", "--spread", "every thickness=0.1 ML",
                  "--spread", "field=2 %", "--spread", "flux Al=1 %", "--window", "10.2um",
                  "10.4um", "--draws", "200"],
    "sweep": ["sweep", "demo/detector-well.toml", "--over",
              "well.thickness=6 nm..8 nm step 0.5 nm"],
    "sweep-grid": ["sweep", "demo/emitter-period.toml", "--over",
                   "field=40 kV/cm..60 kV/cm count 3", "--over",
                   "thin barrier.thickness=0 nm, 0.8 nm, 1.2 nm", "--line", "3", "2", "--metric",
                   "wavelength_um", "--metric", "dipole_nm"],
    "anticrossings": ["anticrossings", "demo/emitter-stage.toml", "--over",
                      "field=20 kV/cm..80 kV/cm step 2 kV/cm"],
    "anticrossings-none": ["anticrossings", "demo/detector-well.toml", "--over",
                           "well.thickness=6 nm..8 nm"],
    "strain": ["strain", PAIRS, "--substrate", "GaAs", "--balance", "barrier.thickness"],
    "strain-graded": ["strain", "demo/graded-well.toml"],
    "strain-markdown": ["strain", PAIRS, "--substrate", "GaAs", "--balance", "well.composition",
                        "--format", "markdown"],
    "xray": ["xray", PAIRS, "--substrate", "GaAs"],
    "xray-markdown": ["xray", PAIRS, "--substrate", "GaAs", "--reflection", "115", "--format",
                      "markdown"],
    "grow": ["grow", "demo/detector-well.toml", "--calibrations", "demo/calibrations.toml",
             "--line", "strongest"],
    "grow-surface-first": ["grow", "demo/emitter-stage.toml", "--calibrations",
                           "demo/calibrations.toml", "--order", "surface first",
                           "--interruption", "exit barrier=30 s", "--interruption",
                           "layer 1=5 s"],
    "grow-repeats": ["grow", "9 nm Al0.3Ga0.7As, 3 x (5 nm GaAs {donors 3e17 / cm^3}, 2 x "
                     "(2 nm AlAs, 8 nm AlxGa1-xAs {x 0 to 0.3})), 9 nm GaAs", "--substrate",
                     "GaAs", "--interruption", "10 s", "--format", "markdown"],
    "digital": ["digital", "demo/parabolic-well.toml", "--between", "GaAs", "Al0.3Ga0.7As",
                "--period", "8"],
    "digital-markdown": ["digital", "9 nm Al0.3Ga0.7As, 2 x (5 nm GaAs, 3 nm Al0.3Ga0.7As {label"
                         " thin}), 5 nm GaAs, 9 nm Al0.3Ga0.7As", "--layer", "thin", "--period",
                         "5", "--substrate", "GaAs", "--format", "markdown"],
    "fit": ["fit", "demo/emitter-stage.toml", "--measured", "demo/measured-stage.toml"],
    "fit-markdown": ["fit", "demo/emitter-stage.toml", "--measured", "demo/measured-stage.toml",
                     "--factor", "all thicknesses", "--factor", "flux In", "--calibrations",
                     "demo/calibrations.toml", "--format", "markdown"],
    "materials": ["materials"],
    "materials-formulas": ["materials", "In0.53Ga0.47As", "InP", "--substrate", "InP",
                           "--temperature", "77 K"],
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_text(name, run, root, monkeypatch, request):
    monkeypatch.chdir(root)
    status, out, err = run(*CASES[name])
    assert (status, err) == (0, "")
    path = GOLDEN / f"{name}.txt"
    if request.config.getoption("--rewrite-golden"):
        path.write_text(out, encoding="utf-8")
    assert out == path.read_text(encoding="utf-8")


def test_no_golden_text_is_left_over():
    assert {path.stem for path in GOLDEN.glob("*.txt")} == set(CASES)


@pytest.mark.parametrize("name", [n for n in CASES if n.startswith(("levels", "lines"))])
def test_the_first_line_says_which_way_electrons_run(name):
    first = (GOLDEN / f"{name}.txt").read_text(encoding="utf-8").splitlines()[0]
    assert first.startswith("electrons  ")


@pytest.mark.parametrize("name", [n for n in CASES if n.startswith("lines")])
def test_lines_end_with_the_safety_line(name):
    text = (GOLDEN / f"{name}.txt").read_text(encoding="utf-8")
    last = text[text.index("safety     ") :]
    assert "can injure eyes" in last
    assert "laser-safety officer" in last and "IEC 60825-1" in last
    assert "\n\n" not in last
