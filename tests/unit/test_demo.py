"""The demo stacks say that they are invented, read, survive a trip, and do what they say."""

from pathlib import Path

import pytest

import bandwright as bw
from bandwright import stackfile, stackline

DEMO = Path(__file__).parents[2] / "demo"
FILES = sorted(DEMO.rglob("*.toml"))
STACKS = [path for path in FILES if "[[layers]]" in path.read_text(encoding="utf-8")]


def name(path):
    return path.relative_to(DEMO).as_posix()


@pytest.mark.parametrize("path", FILES, ids=name)
def test_says_that_it_is_invented(path):
    assert path.read_text(encoding="utf-8").startswith("# Invented for this demo: ")


@pytest.mark.parametrize("path", STACKS, ids=name)
def test_survives_a_trip(path, tmp_path):
    stack = bw.read_stack(path)
    bw.write_stack(stack, tmp_path / "copy.toml")
    assert bw.read_stack(tmp_path / "copy.toml") == stack
    line = bw.parse_line(stackline.line_text(stack), **stackfile.settings(stack))
    assert line == stack
    assert bw.stack_from_frame(bw.frame_from_stack(stack), **stackfile.settings(stack)) == stack


@pytest.mark.parametrize(
    ("file", "pair"),
    [
        ("detector-well.toml", (2, 1)),
        ("graded-well.toml", (2, 1)),
        ("measured-numbers.toml", (2, 1)),
        ("house/detector-well.toml", (2, 1)),
        ("emitter-period.toml", (3, 2)),
        ("emitter-stage.toml", (7, 6)),
    ],
)
def test_near_the_ammonia_line(file, pair):
    table = bw.solve(bw.read_stack(DEMO / file)).lines().table
    line = table[(table["upper"] == pair[0]) & (table["lower"] == pair[1])]
    assert 10.1 < line["wavelength_um"].item() < 10.5
    assert line["oscillator_strength"].item() > 10.0


def test_a_field_hardly_moves_the_parabolas_line():
    stack = bw.read_stack(DEMO / "parabolic-well.toml")
    energies = []
    for field in (None, "10 kV/cm"):
        table = bw.solve(stack.replace(field=field)).lines().table
        first = (table["upper"] == 2) & (table["lower"] == 1)
        energies.append(table[first]["energy_meV"].item())
    assert energies[0] != energies[1]
    assert energies[1] == pytest.approx(energies[0], rel=2e-3)
