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
