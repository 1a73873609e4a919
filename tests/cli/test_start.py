"""What the command loads before it computes, and how it speaks when asked for nothing else."""

import json
import subprocess
import sys

import pytest

from bandwright import cli

COMMANDS = ("levels", "lines", "strain", "xray",
            "compare", "sweep", "aim", "anticrossings", "tolerance", "picture", "grow", "digital",
            "fit", "materials")  # fmt: skip

PROBE = """
import json, sys
before = set(sys.modules)
from bandwright.cli import main
try:
    main(sys.argv[1:])
except SystemExit:
    pass
tops = sorted({name.split(".")[0] for name in set(sys.modules) - before})
print(json.dumps(tops), file=sys.stderr)
"""

# Everything --help and --version may load: our two light rooms and the standard library's.
ALLOWED = {"bandwright", *sys.stdlib_module_names}


@pytest.mark.parametrize(
    "words",
    [["--help"], ["--version"], [], ["nonsense"], *([name, "--help"] for name in COMMANDS)],
    ids=" ".join,
)
def test_talk_loads_nothing_heavy(words):
    run = subprocess.run([sys.executable, "-c", PROBE, *words], capture_output=True, text=True)
    loaded = set(json.loads(run.stderr.splitlines()[-1]))
    assert "bandwright" in loaded
    assert loaded <= ALLOWED, sorted(loaded - ALLOWED)


def test_talk_loads_only_the_rooms_errors_and_cli():
    code = PROBE.replace('name.split(".")[0]', "name")
    run = subprocess.run(
        [sys.executable, "-c", code, "lines", "--help"], capture_output=True, text=True
    )
    ours = {m for m in json.loads(run.stderr.splitlines()[-1]) if m.startswith("bandwright")}
    assert {m for m in ours if not m.startswith("bandwright.cli")} == {
        "bandwright",
        "bandwright.errors",
    }


def test_version_is_the_installed_one(capsys):
    from importlib.metadata import version

    with pytest.raises(SystemExit) as left:
        cli.main(["--version"])
    assert left.value.code == 0
    assert capsys.readouterr().out == f"bandwright {version('bandwright')}\n"


@pytest.mark.parametrize("command", COMMANDS)
def test_each_command_explains_every_option(command, capsys):
    with pytest.raises(SystemExit) as left:
        cli.main([command, "--help"])
    assert left.value.code == 0
    out = capsys.readouterr().out
    _, made = cli.build()
    for action in made[command]._actions:
        assert action.help, action
        for option in action.option_strings:
            assert option in out


def test_help_names_every_command(capsys):
    with pytest.raises(SystemExit):
        cli.main(["--help"])
    out = capsys.readouterr().out
    assert all(f"  {name} " in out for name in COMMANDS)
