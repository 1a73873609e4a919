"""solve_many: every design as it would be alone, errors in their place, bounded work."""

import numpy as np
import pytest

import bandwright as bw
from bandwright.errors import QuantityError, SolveError, StackError
from bandwright.solver import alike


def single(width, barrier=250.0):
    return bw.parse_line(
        f"20 nm {{edge {barrier} meV, mass 0.092, gap 1.9 eV}}, {width} nm {{edge 0 meV, mass"
        f" 0.067, gap 1.5 eV}}, 20 nm {{edge {barrier} meV, mass 0.092, gap 1.9 eV}}"
    )


def coupled(barrier):
    return bw.parse_line(
        f"20 nm Al0.3Ga0.7As, 6 nm GaAs, {barrier} nm Al0.3Ga0.7As, 6 nm GaAs, 20 nm Al0.3Ga0.7As",
        substrate="GaAs",
    )


def in_field(width):
    return bw.parse_line(
        f"10 nm Al0.3Ga0.7As, {width} nm GaAs, 2 nm Al0.3Ga0.7As, 4 nm GaAs, 10 nm Al0.3Ga0.7As",
        substrate="GaAs",
        field="40 kV/cm",
    )


def graded(width):
    return bw.parse_line(
        f"15 nm Al0.3Ga0.7As, {width} nm AlxGa1-xAs {{x 0.3 to 0 quadratic}}, 15 nm Al0.3Ga0.7As",
        substrate="GaAs",
    )


def superlattice(width):
    return bw.parse_line(
        f"5 nm Al0.3Ga0.7As, 20 x ({width} nm GaAs, 5 nm Al0.3Ga0.7As)", substrate="GaAs"
    )


WIDTHS = (6.0, 6.13, 7.4, 8.0, 8.01)


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
@pytest.mark.parametrize("make", [single, coupled, in_field, graded, superlattice])
@pytest.mark.parametrize("tolerance", ["1e-4 eV", "1e-6 eV", "1e-9 eV"])
def test_one_and_many_agree(make, tolerance):
    stacks = [make(width) for width in WIDTHS]
    many = bw.solve_many(stacks, tolerance=tolerance)
    for stack, levels in zip(stacks, many, strict=True):
        alone = bw.solve(stack, tolerance=tolerance)
        assert len(levels) == len(alone) > 0
        assert np.max(np.abs(levels.energies - alone.energies)) < 1e-12
        assert levels.count_checked.all() and levels.complete
    assert many.alone == 0


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
def test_layouts_may_differ_and_keep_their_order():
    stacks = [single(6.0), graded(7.0), superlattice(6.0), single(9.0), in_field(5.0)]
    many = bw.solve_many(stacks, chunk=2)
    for stack, levels in zip(stacks, many, strict=True):
        assert levels.stack is stack
        assert np.allclose(levels.energies, bw.solve(stack).energies, atol=1e-12, rtol=0)


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
def test_limits_are_those_of_solve():
    stacks = [single(width) for width in WIDTHS]
    for arguments in ({"at_most": 1}, {"below": "0.4 eV"}, {"below": "40 meV"}):
        for stack, levels in zip(stacks, bw.solve_many(stacks, **arguments), strict=True):
            alone = bw.solve(stack, **arguments)
            assert np.allclose(levels.energies, alone.energies, atol=1e-10, rtol=0)


def test_a_bad_design_is_its_error_and_stops_nobody():
    bad = bw.Stack([bw.Layer("20 nm", "Al0.3Ga0.7As"), bw.Layer("6 nm", "Zr0.3Ga0.7As")])
    many = bw.solve_many([single(6.0), bad, single(7.0)])
    assert isinstance(many[1], bw.BandwrightError)
    assert "Zr" in str(many[1])
    assert len(many[0]) == len(many[2]) == 2
    row = many.table.set_index("design").loc[2]
    assert "Zr" in row["reason"] and np.isnan(row["energy_meV"])


def test_the_table_is_tidy():
    table = bw.solve_many([single(6.0), single(10.0)]).table
    assert list(table.columns) == [
        "design", "name", "level", "energy_meV", "count_checked", "reason",
    ]  # fmt: skip
    assert table["design"].tolist() == [1, 1, 2, 2, 2]
    assert table["energy_meV"].is_monotonic_increasing is False
    assert table["count_checked"].all()


def test_states_come_from_the_batch_too():
    stacks = [single(width) for width in WIDTHS]
    for stack, levels in zip(stacks, bw.solve_many(stacks), strict=True):
        assert np.allclose(
            np.abs(levels.dipoles()), np.abs(bw.solve(stack).dipoles()), atol=1e-7, rtol=0
        )


def test_nothing_to_do():
    many = bw.solve_many([])
    assert len(many) == 0 and many.share_alone == 0.0 and len(many.table) == 0


def test_wrong_arguments_are_wrong_for_all():
    with pytest.raises(SolveError, match="chunk: got 0"):
        bw.solve_many([single(6.0)], chunk=0)
    with pytest.raises(QuantityError, match="tolerance"):
        bw.solve_many([single(6.0)], tolerance="1 nm")
    with pytest.raises(SolveError, match="at_most"):
        bw.solve_many([single(6.0)], at_most=0)
    with pytest.raises(StackError, match="stack 2: got 7; a Stack is due"):
        bw.solve_many([single(6.0), 7])


def test_a_generator_is_enough():
    many = bw.solve_many(single(width) for width in WIDTHS)
    assert len(many) == len(WIDTHS)
    assert not any(isinstance(one, StackError) for one in many)


def near(designs=40, spread=0.003):
    """Coupled wells of an invented emitter, each number its own hair off."""
    rng = np.random.default_rng(5)
    lines = (
        "20 nm {{edge {} meV, mass 0.09}}, {} nm {{edge 0 meV, mass 0.067}}, {} nm {{edge {} meV,"
        " mass 0.09}}, {} nm {{edge 0 meV, mass 0.067}}, 20 nm {{edge {} meV, mass 0.09}}"
    )
    stacks = []
    for _ in range(designs):
        off = 1.0 + spread * rng.uniform(-1.0, 1.0, 6)
        numbers = np.array([280.0, 7.0, 2.0, 280.0, 5.0, 280.0]) * off
        stacks.append(bw.parse_line(lines.format(*numbers.round(6))))
    return stacks


@pytest.fixture
def scanned(monkeypatch):
    """How many designs each scan of a family took."""
    sizes, scan = [], alike.find

    def find(system, asked, accuracy):
        sizes.append(len(asked.low))
        return scan(system, asked, accuracy)

    monkeypatch.setattr(alike, "find", find)
    return sizes


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
@pytest.mark.parametrize(
    "asked", [{}, {"at_most": 2}, {"below": "0.1 eV"}, {"tolerance": "1e-9 eV"}]
)
@pytest.mark.parametrize("field", [None, "20 kV/cm"])
def test_neighbours_are_foretold_by_one_of_them(asked, field, scanned):
    stacks = [stack.replace(field=field) for stack in near()]
    many = bw.solve_many(stacks, **asked)
    assert many.alone == 0
    assert sum(scanned) < len(stacks) / 2  # each pattern's leader, and patterns of very few
    if field is None:
        assert set(scanned) == {1}
    for stack, levels in zip(stacks, many, strict=True):
        alone = bw.solve(stack, **asked)
        assert len(levels) == len(alone) > 0
        assert np.max(np.abs(levels.energies - alone.energies)) < 1e-10
        assert levels.complete and levels.count_checked.all()


@pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")
def test_what_nobody_foretells_is_scanned(scanned):
    """Wells from one level to nine, and a limit that levels cross: each as it is alone."""
    stacks = [single(width) for width in np.linspace(2.0, 40.0, 30).round(3)]
    for asked in ({}, {"below": "0.1 eV"}, {"at_most": 3}):
        many = bw.solve_many(stacks, **asked)
        assert many.alone == 0
        for stack, levels in zip(stacks, many, strict=True):
            alone = bw.solve(stack, **asked)
            assert len(levels) == len(alone)
            assert np.max(np.abs(levels.energies - alone.energies), initial=0.0) < 1e-10
    assert max(scanned) > 1
