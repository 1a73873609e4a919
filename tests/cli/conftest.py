"""What the tests of the command share."""

from pathlib import Path

import pytest

from bandwright.cli import main

ROOT = Path(__file__).parents[2]
WELL = "30 nm Al0.28Ga0.72As, 6.2 nm GaAs {label well}, 30 nm Al0.28Ga0.72As"


@pytest.fixture
def run(capsys):
    """Run the command in this process; return (status, standard output, standard error)."""

    def command(*words):
        capsys.readouterr()
        try:
            status = main([str(word) for word in words])
        except SystemExit as left:
            status = left.code
        return status, *capsys.readouterr()

    return command


@pytest.fixture
def well():
    """One line of text: a well between thick barriers, all of it flat."""
    return WELL


@pytest.fixture
def root():
    return ROOT


@pytest.fixture
def demo(root):
    return root / "demo"
