"""A mistake is one line on standard error and exit status 2, never a traceback."""


import pytest

from bandwright.cli import main

WELL = "30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As"


def fails(capsys, *words):
    status = main(list(words))
    out, err = capsys.readouterr()
    assert status == 2
    assert out == ""
    assert err.startswith("bandwright: ")
    assert err.count("\n") == 1 and err.endswith("\n")
    return err


@pytest.mark.parametrize(
    ("words", "says"),
    [
        ([], "a command is missing; see bandwright --help"),
        (["level", WELL], "no command 'level'; did you mean 'levels'?"),
        (["levels"], "required: STACK; see bandwright levels --help"),
        (["levels", WELL, "--fild", "3 kV/cm"], "no option '--fild'; did you mean '--field'"),
        (["levels", WELL, "--temp", "77 K"], "no option '--temp'; did you mean '--temperature'?"),
        (["levels", "30 nm", "Al0.28Ga0.72As,"], "no further argument 'Al0.28Ga0.72As,'; quote a"),
        (["levels", WELL, "--at-most", "few"], "--at-most: invalid int value: 'few'"),
        (["levels", WELL, "--one-band", "--two-band"], "not allowed with argument --one-band"),
        (["levels", WELL, "--format", "xml"], "invalid choice: 'xml'"),
        (["levels", WELL, "--field"], "--field: expected one argument"),
    ],
)
def test_command_line(words, says, capsys):
    assert says in fails(capsys, *words)


BARRIERS = "30 nm AlAs, 5 nm GaAs, 30 nm AlAs"
OWN = "9 nm {edge 200 meV, mass 0.1, gap 1.8 eV}"


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (["no-such.toml"], "no-such.toml: no such file"),
        (["."], "is a folder; name a stack file in it"),
        (["thirty nm GaAs"], "neither an existing stack file nor a line of layers"),
        ([""], "no layers; write them like"),
        (["30 nm Al0.28Ga0.62As, 6 nm GaAs"], "layer 1 (Al0.28Ga0.62As)"),
        (["30 nm Al0.28Ga0.62As, 6 nm GaAs"], "Al0.28Ga0.72As or Al0.38Ga0.62As"),
        (["30 nm AlAs, 6.2 GaAs"], "layer 2: thickness: got '6.2' before 'GaAs'; write '6.2 nm"),
        (["30 nm AlAs, 6,2 nm GaAs, 9 nm AlAs"], "write decimals with a point"),
        ([f"{OWN}, 5 nm {{edge 0 meV, mass 0.067}}, {OWN}"], "missing in layer 2 (own numbers)"),
        ([f"{OWN}, 5 nm GaAs"], "zero: missing"),
        ([BARRIERS, "--field", "12 kV"], "that is a voltage; write an electric field such as"),
        ([BARRIERS, "--field", "12"], "field: got '12'; write '12 kV/cm'"),
        ([BARRIERS, "--electrons-run", "to surface"], "given without a field or bias"),
        ([BARRIERS, "--field", "5 kV/cm", "--electrons-run", "to surfce"], "did you mean 'to surf"),
        ([BARRIERS, "--field", "-5 kV/cm", "--electrons-run", "to surface"], "field"),
        ([BARRIERS, "--substrate", "Gaas"], "did you mean 'GaAs'?"),
        ([BARRIERS, "--method", "shoting"], "did you mean 'shooting'?"),
        ([BARRIERS, "--below", "0.3"], "below: got '0.3'; write '0.3 meV'"),
        ([BARRIERS, "--temperature", "-5 K"], "below absolute zero"),
        ([BARRIERS, "--tolerance", "0 eV"], "an energy above zero is due"),
        ([BARRIERS, "--at-most", "0"], "a whole number from 1 is due"),
        ([BARRIERS, "--phase-order", "3"], "1 or 2 is due"),
        ([BARRIERS, "--zero", "GaAss"], "neither a label nor a material"),
        ([BARRIERS, "--materials", "no-such.toml"], "no such material file"),
    ],
)
def test_stack(words, says, capsys):
    assert says in fails(capsys, "levels", *words)


def test_lines_by_the_phase_integral(capsys):
    assert "lines need" in fails(capsys, "lines", BARRIERS, "--method", "phase-integral")


def test_window_without_a_unit(capsys):
    assert "window: got '8'" in fails(capsys, "lines", BARRIERS, "--window", "8", "12")


@pytest.mark.parametrize(
    ("words", "says"),
    [
        (["strain", BARRIERS], "substrate: missing; strain counts from it"),
        (["strain", OWN, "--substrate", "GaAs"], "no layer of a material"),
        (["strain", BARRIERS, "--substrate", "GaAs", "--balance", "field"], "balances no strain"),
        (["xray", BARRIERS], "substrate: missing"),
        (["xray", BARRIERS, "--substrate", "GaAs", "--reflection", "014"], "forbidden"),
        (["xray", BARRIERS, "--substrate", "GaAs", "--reflection", "four"], "write three indices"),
        (["xray", BARRIERS, "--substrate", "GaAs", "--reflection", "008"], "beyond 90 degrees"),
        (["xray", BARRIERS, "--substrate", "GaAs", "--wavelength", "8 keV"], "that is an energy"),
    ],
)
def test_strain_and_xray(words, says, capsys):
    assert says in fails(capsys, *words)


def test_materials(capsys):
    assert "'Xs'" in fails(capsys, "materials", "GaXs")
    assert "needs a value for x" in fails(capsys, "materials", "AlxGa1-xAs")
    said = fails(capsys, "materials", "--temperature", "9 K")
    assert "a temperature belongs to a formula" in said


def test_a_file_names_itself_layer_and_key(capsys, tmp_path):
    path = tmp_path / "typo.toml"
    path.write_text('[[layers]]\nmaterial = "GaAs"\nthicknes = "9 nm"\n', encoding="utf-8")
    said = fails(capsys, "levels", str(path))
    assert str(path) in said and "layer 1" in said and "did you mean 'thickness'?" in said


def test_a_file_that_is_no_toml(capsys, tmp_path):
    path = tmp_path / "broken.toml"
    path.write_text("[[layers\n", encoding="utf-8")
    assert str(path) in fails(capsys, "levels", str(path))


@pytest.mark.parametrize(
    ("line", "says"),
    [
        ("30 um Al0.28Ga0.72As, 6.2 nm GaAs, 30 um Al0.28Ga0.72As", "is the unit right?"),
        ("30 nm Al0.6Ga0.4As, 5 nm GaAs, 30 nm Al0.6Ga0.4As", "indirect gap"),
        ("30 nm Al0.48In0.52As, 5 nm InAs, 30 nm Al0.48In0.52As", "no substrate is named"),
        ("30 nm AlAs, 5 nm GaAs {donors 1e11 / cm^2}, 30 nm AlAs", "charge"),
    ],
)
def test_what_may_be_meant_is_answered_with_a_caution(line, says, capsys):
    assert main(["levels", line, "--format", "csv"]) == 0
    out, err = capsys.readouterr()
    assert out.startswith("level,")
    assert says in " ".join(err.split()) and err.startswith("caution    ")


def test_a_reversed_field_shows_in_the_first_line(capsys):
    firsts = []
    for field in ("20 kV/cm", "-20 kV/cm"):
        main(["levels", BARRIERS, "--substrate", "GaAs", f"--field={field}"])
        firsts.append(capsys.readouterr().out.splitlines()[0])
    assert firsts == [
        "electrons  run to the substrate (20 kV/cm)",
        "electrons  run to the surface (20 kV/cm)",
    ]
