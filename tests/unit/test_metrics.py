"""Metrics of one solved design: the chosen line, levels by number, and the registry."""

import math
import pickle

import numpy as np
import pytest

import bandwright as bw
from bandwright.errors import StackError, UnknownName
from bandwright.metrics import (
    METRICS,
    Choice,
    OfEnergies,
    OfLine,
    add_metric,
    choose,
    line_between,
    read_choice,
    read_pair,
)


def well(width, barrier=250.0):
    return bw.parse_line(
        f"20 nm {{edge {barrier} meV, mass 0.092}}, {width} nm {{edge 0 meV, mass 0.067}},"
        f" 20 nm {{edge {barrier} meV, mass 0.092}}"
    )


def twins(barrier):
    """Two equal wells so far apart that each pair of levels is one row of two copies."""
    return bw.parse_line(
        f"20 nm Al0.3Ga0.7As, 9 nm GaAs, {barrier} nm Al0.3Ga0.7As, 9 nm GaAs, 20 nm Al0.3Ga0.7As",
        substrate="GaAs",
    )


@pytest.mark.parametrize("stack", [well(12), twins(30), twins(2.0)], ids=["well", "copies", "near"])
def test_a_line_by_its_numbers_is_the_row_of_the_table(stack):
    levels = bw.solve(stack)
    rows = levels.lines().rows
    assert len(rows) > 2
    for row in rows:
        found = line_between(levels, (row.upper, row.lower))
        assert found._replace(dipole_nm=0, oscillator_strength=0) == row._replace(
            dipole_nm=0, oscillator_strength=0
        )
        if row.dipole_nm is None:
            assert found.dipole_nm is None
        else:
            assert found.dipole_nm == pytest.approx(row.dipole_nm, rel=1e-12)
            bare = line_between(levels, (row.upper, row.lower), dipole=False)
            assert bare == found._replace(dipole_nm=None, oscillator_strength=None)


def test_a_copy_stands_for_its_row_and_copies_for_themselves():
    levels = bw.solve(twins(30))
    assert [g.stop - g.start for g in levels.groups][:2] == [2, 2]
    assert line_between(levels, (4, 2)) == line_between(levels, (3, 1))
    pair = line_between(levels, (2, 1))
    assert (pair.upper, pair.lower) == (2, 1)
    assert pair.energy_meV == (levels.energies[1] - levels.energies[0]) * 1e3 > 0.0
    assert pair.dipole_nm == abs(levels.dipoles()[0, 1]) > 10.0


def test_a_line_whose_levels_are_not_there():
    levels = bw.solve(well(6))
    assert len(levels) == 2
    for pair in ((3, 1), (5, 4)):
        assert line_between(levels, pair) is None
    in_field = bw.solve(well(6).replace(field="20 kV/cm"))
    assert line_between(in_field, ("continuum", 1)) is None


@pytest.mark.parametrize(
    ("given", "pair"),
    [((2, 1), (2, 1)), ([5, 2], (5, 2)), (("continuum", 3), ("continuum", 3))],
)
def test_pairs(given, pair):
    assert read_pair(given) == pair


def test_a_line_of_a_table_is_a_choice():
    line = bw.solve(well(12)).lines().strongest
    assert read_choice(line, None, None).pair == (line.upper, line.lower)


@pytest.mark.parametrize(
    ("given", "says"),
    [
        ((1, 2), r"line: got \(1, 2\); the upper level comes first and has the larger number"),
        ((2, 2), r"line: got \(2, 2\); the upper level comes first"),
        ((2,), r"line: got \(2,\); give the numbers of its upper and lower level"),
        ((3, 2, 1), r"line: got \(3, 2, 1\); give the numbers"),
        ((2, 0), r"line: got \(2, 0\); give the numbers"),
        ((2.0, 1), r"line: got \(2\.0, 1\); give the numbers"),
        ((True, 1), r"line: got \(True, 1\); give the numbers"),
        ("21", r"line: got '21'; give the numbers"),
        (2, r"line: got 2; give the numbers"),
    ],
)
def test_what_is_no_pair(given, says):
    with pytest.raises(StackError, match=says):
        read_pair(given)


def test_the_chosen_line_beside_the_strongest():
    stack = well(12)
    lines = bw.solve(stack).lines()
    assert (lines.strongest.upper, lines.strongest.lower) != (2, 1)
    columns = ["upper", "lower", "wavelength_um", "energy_meV", "dipole_nm", "frequency_THz"]
    row = bw.compare([stack], columns, line=(2, 1)).loc[1]
    assert row[columns].tolist() == [getattr(lines.find(2, 1), name) for name in columns]
    free = bw.compare([stack], columns).loc[1]
    assert free[columns].tolist() == [getattr(lines.strongest, name) for name in columns]


def test_a_chosen_line_outside_the_window_has_no_numbers():
    stack = well(12)
    length = bw.solve(stack).lines().find(2, 1).wavelength_um
    for window, shown in (("5 um", "30 um"), True), (("5 um", "9 um"), False):
        table = bw.compare([stack], ["wavelength_um", "dipole_nm"], line=(2, 1), window=window)
        assert table.loc[1, "wavelength_um"] == length if shown else True
        assert table.loc[1, ["wavelength_um", "dipole_nm"]].isna().tolist() == [not shown] * 2
    weak = bw.compare([stack], ["wavelength_um"], line=(2, 1), strength=1e3)
    assert math.isnan(weak.loc[1, "wavelength_um"])


def test_energies_by_number():
    stacks = [well(6), well(12)]
    table = bw.compare(stacks, ["level_1_meV", "level_3_meV", "spacing_3_1_meV", "levels_found"])
    few, many = (bw.solve(stack).energies * 1e3 for stack in stacks)
    assert table["levels_found"].tolist() == [len(few), len(many)] == [2, 3]
    assert table.loc[1, "level_1_meV"] == few[0]
    assert table.loc[1].isna().tolist()[2:4] == [True, True]
    assert table.loc[2, "level_3_meV"] == pytest.approx(many[2], rel=1e-15)
    assert table.loc[2, "spacing_3_1_meV"] == pytest.approx(many[2] - many[0], rel=1e-14)


def test_many_designs_at_once_as_one_by_one():
    stacks = [well(6), well(12), well(9)]
    levels = [bw.solve(stack) for stack in stacks]
    energies = np.full((3, 3), np.nan)
    for row, one in zip(energies, levels, strict=True):
        row[: len(one)] = one.energies
    choice = Choice(pair=(3, 1))
    for metric in (OfEnergies(2), OfEnergies(3, 2), OfEnergies(7), OfEnergies(7, 1),
                   OfLine("energy_meV"), OfLine("wavelength_um")):  # fmt: skip
        together = metric.of_energies(energies, choice, 1e-5)
        for found, one in zip(together, levels, strict=True):
            alone = metric(choice.solved(one))
            assert math.isnan(found) if alone is None else found == pytest.approx(alone, rel=1e-14)


@pytest.mark.parametrize(
    ("metric", "choice", "group"),
    [
        (OfLine("dipole_nm"), Choice(pair=(2, 1)), 1e-5),
        (OfLine("energy_meV"), Choice(), 1e-5),
        (OfLine("energy_meV"), Choice(pair=("continuum", 1)), 1e-5),
        (OfLine("energy_meV"), Choice(pair=(2, 1), strength=0.1), 1e-5),
        (OfLine("energy_meV"), Choice(pair=(2, 1), window=(None, 9e3)), 1e-5),
        (OfLine("energy_meV"), Choice(pair=(2, 1)), 0.2),
    ],
)
def test_what_energies_alone_do_not_tell(metric, choice, group):
    assert metric.of_energies(np.array([[0.1, 0.2]]), choice, group) is None


def test_metrics_by_name():
    assert choose(None, ("levels",)) == {"levels": METRICS["levels"]}
    assert choose("upper", ()) == {"upper": OfLine("upper")}
    assert choose(["level_12_meV"], ()) == {"level_12_meV": OfEnergies(12)}
    own = {"layers": len}
    assert choose(own, ()) == own
    with pytest.raises(UnknownName, match=r"none of the name 'levl_1_meV'; did you mean 'level_1"):
        choose(["levl_1_meV"], ())
    with pytest.raises(UnknownName, match=r"none of the name 'level_0_meV'"):
        choose(["level_0_meV"], ())


def test_the_metrics_there_are_can_be_sent_to_other_processes():
    levels = bw.solve(well(12))
    solved = read_choice((3, 1), None, None).solved(levels)
    for name, metric in METRICS.items():
        again = pickle.loads(pickle.dumps(metric))
        assert again(solved) == metric(solved), name


def test_a_name_of_energies_is_taken():
    with pytest.raises(StackError, match="metric 'spacing_2_1_meV' is taken"):
        add_metric("spacing_2_1_meV", len)
    with pytest.raises(StackError, match="metric 'design' is taken"):
        add_metric("design", len)
