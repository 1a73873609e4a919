import math
import re
import warnings

import numpy as np
import pytest

import bandwright as bw
from bandwright import budget
from bandwright.budget import changes, checking, derivatives
from bandwright.budget.slopes import Derivatives
from bandwright.constants import H2M
from bandwright.errors import StackError
from bandwright.lines import CONTINUUM
from bandwright.parameters import replace, shifted

COLUMNS = ["what", "change", "shift_meV", "shift_um", "remark", "sentence"]
WELL = "30 nm Al0.28Ga0.72As {label left}, 8 nm GaAs {label well}, 30 nm Al0.28Ga0.72As"


def lines_of(line, stack=None, **arguments):
    return bw.solve(bw.parse_line(line, **(stack or {})), **arguments).lines()


def row(table, what, change):
    [found] = table[(table["what"] == what) & (table["change"] == change)].to_dict("records")
    return found


def slope(levels, line, name):
    """dE of (upper, lower) by one parameter that a budget lists."""
    [change] = [c for c in changes(levels) if c.parameter.name == name]
    return derivatives(levels, levels.lines().find(*line), [change]).ends[0]


def own(thickness, edge, mass, **more):
    return bw.Layer(f"{thickness} nm", edge=f"{edge} eV", mass=mass, **more)


# -- the derivative against closed forms --------------------------------------------------------


def test_infinite_well_goes_as_one_over_the_square_of_its_width():
    stack = bw.Stack([own(10, 0, 0.067, label="well")], ends="wall")
    levels = bw.solve(stack, at_most=3)
    found = slope(levels, (2, 1), "well.thickness")
    expected = -2.0 * levels.energies[[1, 0]] / 10.0
    print(f"found {found}, -2 E / L {expected}")
    assert found == pytest.approx(expected, rel=1e-11)
    shift = row(levels.lines().error_budget((2, 1)), "well", "+0.1 nm")["shift_meV"]
    assert shift == pytest.approx(1e3 * 0.1 * (expected[0] - expected[1]), rel=1e-11)


def by_flux(levels, section, field=0.0):
    """dE/d(thickness) of each level from its own state: minus J at the layer's last face.

    J = h2m m p^2 + (E - V) u^2 inside the layer at that face, plus the slope of the energy times
    the probability beyond it, which is carried along.
    """
    faces = levels.profile.faces
    face = faces[section + 1] - 1e-9
    here = levels.profile.sections[section]
    u, p = (values[:, 0] for values in levels.states.sample([face]))
    place = np.array([here.thickness])
    edge, mass, gap = (c.at(place)[0] for c in (here.edge, here.mass, here.inverse_gap))
    local = mass * (1.0 + (levels.energies - edge) * gap)
    flux = H2M * local * p**2 + (levels.energies - edge) * u**2
    return -flux + field * levels.states.probabilities[:, section + 1 :].sum(axis=1)


@pytest.mark.parametrize("name", ["a", "b", "c"])
def test_thickness_against_the_flux_of_the_state(name):
    layers = [
        own(12, 0.52, 0.075, gap="1.53 eV"),
        own(5, 0, 0.043, gap="0.816 eV", label="a"),
        own(2, 0.52, 0.075, gap="1.53 eV", label="b"),
        own(7, 0.05, 0.043, gap="0.816 eV", label="c"),
        own(12, 0.52, 0.075, gap="1.53 eV"),
    ]
    levels = bw.solve(bw.Stack(layers), tolerance="1e-10 eV")
    found = slope(levels, (3, 1), f"{name}.thickness")
    expected = by_flux(levels, "abc".index(name) + 1)[[2, 0]]
    print(f"found {found}, from the state {expected}")
    # the state is sampled 1e-9 nm before the face
    assert found == pytest.approx(expected, rel=1e-7)


def test_thickness_in_a_field_against_the_flux_of_the_state():
    layers = [own(15, 0.25, 0.092), own(7, 0, 0.067, label="well"), own(15, 0.25, 0.092)]
    levels = bw.solve(bw.Stack(layers, field="40 kV/cm", ends="wall"), tolerance="1e-10 eV")
    found = slope(levels, (2, 1), "well.thickness")
    expected = by_flux(levels, 1, levels.profile.field)[[1, 0]]
    print(f"found {found}, from the state {expected}")
    assert found == pytest.approx(expected, rel=1e-7)


def test_a_field_from_zero_shifts_by_the_positions():
    layers = [own(20, 0.25, 0.092), own(5, 0, 0.067), own(4, 0.1, 0.067), own(20, 0.25, 0.092)]
    levels = bw.solve(bw.Stack(layers))
    assert levels.profile.field == 0.0
    positions = np.diag(levels.dipoles())
    found = slope(levels, (2, 1), "field")
    print(f"found {found}, <z> {positions[[1, 0]]}")
    assert found == pytest.approx(positions[[1, 0]], abs=2e-3)
    symmetric = lines_of(WELL).error_budget()
    assert abs(row(symmetric, "field", "+1 kV/cm")["shift_meV"]) < 1e-5


def test_fields_of_either_way_of_writing():
    layers = [own(20, 0.25, 0.092), own(5, 0, 0.067), own(4, 0.1, 0.067), own(20, 0.25, 0.092)]
    signed = bw.solve(bw.Stack(layers, field="0.05 kV/cm"), at_most=2)
    named = bw.solve(bw.Stack(layers, field="0.05 kV/cm", electrons_run="to substrate"), at_most=2)
    one, two = slope(signed, (2, 1), "field"), slope(named, (2, 1), "field")
    assert two == pytest.approx(one, rel=1e-4)  # one-sided: the size of a field ends at zero
    away = bw.solve(bw.Stack(layers, field="0.05 kV/cm", electrons_run="to surface"), at_most=2)
    assert slope(away, (2, 1), "field") == pytest.approx(-one, abs=5e-3)


def test_bias_shifts_as_the_field_it_makes():
    layers = [own(20, 0.25, 0.092), own(5, 0, 0.067), own(4, 0.1, 0.067), own(20, 0.25, 0.092)]
    levels = bw.solve(bw.Stack(layers, bias="20 mV"), at_most=2)
    field = bw.solve(bw.Stack(layers, field=f"{-0.02 / 49!r} V/nm"), at_most=2)
    expected = -slope(field, (2, 1), "field") / 49.0
    assert slope(levels, (2, 1), "bias") == pytest.approx(expected, abs=1e-5)
    found = row(levels.lines().error_budget(), "bias", "+10 mV")
    assert found["shift_meV"] == pytest.approx(10 * (expected[0] - expected[1]), abs=1e-4)


# -- the changes ---------------------------------------------------------------------------------


def test_every_change_of_a_stack_of_materials():
    table = lines_of(WELL).error_budget()
    assert list(table.columns) == COLUMNS
    assert sorted(zip(table["what"], table["change"], strict=True)) == [
        ("field", "+1 kV/cm"),
        ("flux Al", "+1 %"),
        ("flux Ga", "+1 %"),
        ("layer 3 (Al0.28Ga0.72As)", "+0.01 Al"),
        ("layer 3 (Al0.28Ga0.72As)", "+1 ML"),
        ("left", "+0.01 Al"),
        ("left", "+1 ML"),
        ("masses", "+1 %"),
        ("offset share", "+0.01"),
        ("temperature", "+10 K"),
        ("well", "+1 ML"),
    ]
    sizes = table["shift_meV"].abs().tolist()
    assert sizes == pytest.approx(sorted(sizes, reverse=True), rel=0.0, abs=1e-4)


@pytest.mark.parametrize(
    ("what", "change", "changed"),
    [
        ("well", "+1 ML", WELL.replace("8 nm GaAs", "8.2826625 nm GaAs")),
        ("left", "+0.01 Al", WELL.replace("Al0.28Ga0.72As {", "Al0.29Ga0.71As {")),
        ("temperature", "+10 K", WELL),
    ],
)
def test_shifts_and_sentences_are_those_of_the_changed_stack(what, change, changed):
    lines = lines_of(WELL)
    before = lines.find(2, 1)
    after = lines_of(changed, {"temperature": "310 K"} if what == "temperature" else {}).find(2, 1)
    found = row(lines.error_budget((2, 1)), what, change)
    print(found, after.energy_meV - before.energy_meV)
    # a whole change is linear to some per cent
    assert found["shift_meV"] == pytest.approx(after.energy_meV - before.energy_meV, rel=0.06)
    assert found["shift_um"] == pytest.approx(after.wavelength_um - before.wavelength_um, rel=0.06)
    assert found["remark"] is None
    nm = found["shift_um"] * 1e3
    length = f"{nm:+.2g} nm" if abs(nm) < 100.0 else f"{nm * 1e-3:+.2g} um"
    assert found["sentence"] == f"{what}, {change}: {length}"


def test_repeats_and_equal_labels_move_together():
    layers = [
        bw.Layer("20 nm", "Al0.3Ga0.7As", label="wall"),
        bw.Repeat(3, [bw.Layer("7 nm", "GaAs"), bw.Layer("12 nm", "Al0.3Ga0.7As")]),
        bw.Layer("8 nm", "Al0.3Ga0.7As", label="wall"),
    ]
    table = bw.solve(bw.Stack(layers)).lines().error_budget()
    thicker = table[table["change"] == "+1 ML"]["what"].tolist()
    # the walls differ in thickness, so these are two numbers; their composition is one
    assert sorted(thicker) == [
        "layer 1 (wall)", "layer 2 (GaAs)", "layer 3 (Al0.3Ga0.7As)", "layer 4 (wall)",
    ]  # fmt: skip
    richer = table[table["change"] == "+0.01 Al"]["what"].tolist()
    assert sorted(richer) == ["layer 3 (Al0.3Ga0.7As)", "wall"]


def test_own_numbers_have_no_monolayer_and_no_temperature():
    lines = bw.solve(
        bw.Stack([own(20, 0.25, 0.092), own(10, 0, 0.067), own(20, 0.25, 0.092)])
    ).lines()
    table = lines.error_budget()
    assert set(table["change"]) == {"+0.1 nm", "+1 kV/cm", "+1 %"}
    assert set(table["what"][table["change"] == "+1 %"]) == {"masses", "own edges"}


def test_monolayers_written_as_such():
    in_nm = lines_of("30 nm Al0.28Ga0.72As, 8.479875 nm GaAs, 30 nm Al0.28Ga0.72As").error_budget()
    in_ml = lines_of("30 nm Al0.28Ga0.72As, 30 ML GaAs, 30 nm Al0.28Ga0.72As").error_budget()
    one, two = (row(t, "layer 2 (GaAs)", "+1 ML")["shift_meV"] for t in (in_nm, in_ml))
    assert one == pytest.approx(two, rel=1e-5)


def test_a_fraction_at_its_bound_takes_the_side_there_is():
    line = "30 nm Al0.28Ga0.72As, 8 nm AlxGa1-xAs {{x {} }}, 30 nm Al0.28Ga0.72As"
    bound, near = (slope(lines_of(line.format(x)).levels, (2, 1), "layer 2.x") for x in (0, 0.002))
    assert bound == pytest.approx(near, rel=0.01)
    found = row(lines_of(line.format(0)).error_budget(), "layer 2 (AlxGa1-xAs)", "+0.01 x")
    assert math.isfinite(found["shift_meV"])


def test_a_grade_is_moved_as_a_whole():
    line = "30 nm Al0.28Ga0.72As, 8 nm AlxGa1-xAs {x 0 to 0.1}, 30 nm Al0.28Ga0.72As"
    found = row(lines_of(line).error_budget((2, 1)), "layer 2 (AlxGa1-xAs)", "+0.01 x")
    moved = lines_of(line.replace("0 to 0.1", "0.01 to 0.11")).find(2, 1).energy_meV
    expected = moved - lines_of(line).find(2, 1).energy_meV
    assert found["shift_meV"] == pytest.approx(expected, rel=0.05)


def test_at_absolute_zero_the_temperature_goes_one_way():
    found = row(lines_of(WELL, {"temperature": "0 K"}).error_budget(), "temperature", "+10 K")
    assert math.isfinite(found["shift_meV"])


# -- what must be said of a shift ----------------------------------------------------------------


PAIR = "20 nm AlAs, 8 nm GaAs {label a}, 8 nm AlAs, 8.1 nm GaAs {label b}, 20 nm AlAs"


def test_a_level_is_followed_past_others():
    lines = lines_of(PAIR)  # levels 1 and 3 are b's, until a is wider
    table = lines.error_budget((3, 1), checked=True)
    found = row(table, "a", "+1 ML")
    assert found["shift_meV"] == pytest.approx(0.0, abs=1e-3)
    assert found["remark"] == "level 3 is level 4 then; level 1 is level 2 then"
    found = row(table, "b", "+1 ML")
    assert found["shift_meV"] < -4.0 and found["remark"] is None
    # 1.6 meV from well to well, the pair 1.2 meV apart
    assert row(table, "field", "+1 kV/cm")["remark"] == "level 1 is level 2 then"


def test_levels_that_mix_on_the_way_are_said():
    near = PAIR.replace("8 nm AlAs", "2.5 nm AlAs").replace("8.1 nm", "8 nm")
    found = row(lines_of(near).error_budget((3, 1), checked=True), "a", "+1 ML")
    assert "crosses another on the way and mixes with it (keeps " in found["remark"]
    assert found["remark"].endswith("%): compare the changed stack itself")
    assert found["sentence"].endswith("; " + found["remark"])


def test_a_shift_that_is_not_linear_is_said():
    line = (
        "30 nm Al0.28Ga0.72As, 8 nm GaAs {label a}, 4 nm Al0.28Ga0.72As, 8 nm GaAs {label b},"
        " 30 nm Al0.28Ga0.72As"
    )
    lines = lines_of(line)
    found = row(lines.error_budget((3, 2), checked=True), "a", "+1 ML")
    whole = lines_of(line.replace("8 nm GaAs {label a}", "8.2826625 nm GaAs")).find(3, 2)
    shift = whole.wavelength_um - lines.find(3, 2).wavelength_um
    assert abs(shift / found["shift_um"] - 1.0) > 0.25
    assert found["sentence"].endswith(f"; not linear, the whole change gives {shift:+.2g} um")


def test_levels_that_slopes_bring_together_are_said_without_solving():
    lines = lines_of(PAIR)
    table = lines.error_budget((3, 1))
    asks = "error_budget(checked=True) solves the changed stack"
    found = row(table, "a", "+1 ML")
    # the other well's pair falls by 5 to 8 meV past levels 1 and 3
    assert found["remark"] == f"level 3 comes near level 4 by then: {asks}"
    assert found["sentence"] == f"a, +1 ML: 0 um; {found['remark']}"
    assert row(table, "masses", "+1 %")["remark"] is None
    alone = lines_of(WELL).error_budget()
    assert alone["remark"].tolist() == [None] * len(alone)


def test_fluxes_are_those_of_the_changed_stack():
    lines = lines_of(WELL, {"substrate": "GaAs"})
    table = lines.error_budget((2, 1))
    before = lines.find(2, 1)
    for name in ("flux Al", "flux Ga"):
        after = bw.solve(replace(lines.levels.stack, name, 1.01)).lines().find(2, 1)
        found = row(table, name, "+1 %")
        print(found, after.energy_meV - before.energy_meV)
        shift = after.energy_meV - before.energy_meV
        assert found["shift_meV"] == pytest.approx(shift, rel=0.02, abs=1e-3)
    # both together are 1 % more of everything
    every = lines.levels.gradient(["flux Al", "flux Ga", "all thicknesses"]).energies
    assert every[:, 0] + every[:, 1] == pytest.approx(every[:, 2], rel=1e-9)


def test_mixing_that_bends_a_shift_is_said_without_solving():
    line = (
        "30 nm Al0.28Ga0.72As, 8 nm GaAs {label a}, 3.2 nm Al0.28Ga0.72As, 8 nm GaAs,"
        " 30 nm Al0.28Ga0.72As"
    )
    lines = lines_of(line)
    found = row(lines.error_budget((3, 2)), "a", "+1 ML")
    asks = "error_budget(checked=True) solves the changed stack"
    said = re.fullmatch(
        r"not linear, mixing with level (\d) makes it about (\S+) um: " + re.escape(asks),
        found["remark"],
    )
    after = lines_of(line.replace("8 nm GaAs {label a}", "8.2826625 nm GaAs")).find(3, 2)
    whole = after.wavelength_um - lines.find(3, 2).wavelength_um
    print(f"first order {found['shift_um']:.3g} um, said {said[2]} um, whole {whole:.3g} um")
    assert said[1] in "14"  # each of the pair's levels mixes with its partner
    assert abs(float(said[2]) - whole) < 0.3 * abs(found["shift_um"] - whole)
    assert found["sentence"] == f"a, +1 ML: {found['shift_um']:+.2g} um; {found['remark']}"


def test_a_change_that_is_no_stack_is_said():
    line = "30 nm AlxGa1-xAs {x 0.995}, 8 nm GaAs, 30 nm Al0.28Ga0.72As"
    found = row(lines_of(line).error_budget(), "layer 1 (AlxGa1-xAs)", "+0.01 x")
    assert math.isfinite(found["shift_meV"])
    assert "; only for a smaller change: layer 1.x" in found["sentence"]
    assert "got 1.005; a fraction lies between 0 and 1" in found["sentence"]


def test_a_number_that_can_not_be_moved_is_said():
    line = "30 nm Al0.3Ga0.7As, 8 nm GaAs {label well}, 30 nm AlxGa1-xAs {x 0 to 1}"
    table = lines_of(line).error_budget()
    found = row(table, "layer 3 (AlxGa1-xAs)", "+0.01 x")  # 0 to 1 is all there is
    assert found["remark"] == "it can be moved to neither side"
    assert found["sentence"] == (
        "layer 3 (AlxGa1-xAs), +0.01 x: unknown; it can be moved to neither side"
    )
    assert math.isnan(found["shift_meV"]) and table["what"].tolist()[-1] == found["what"]


# -- which line ----------------------------------------------------------------------------------


def test_the_strongest_line_is_taken_or_the_one_named():
    lines = lines_of("30 nm Al0.4Ga0.6As, 11 nm GaAs {label well}, 30 nm Al0.4Ga0.6As")
    assert lines.strongest.name != "2 to 1"
    assert lines.error_budget().equals(lines.error_budget(lines.strongest))
    named = lines.error_budget((2, 1))
    assert not named.equals(lines.error_budget())
    assert named.equals(lines.error_budget(lines.find(2, 1)))
    with pytest.raises(StackError, match="no line 9 to 1 here; lines are"):
        lines.error_budget((9, 1))


def test_an_onset_counts_from_the_lower_edge_and_leaves_fields_out():
    lines = lines_of("30 nm Al0.2Ga0.8As {label left}, 3 nm GaAs, 30 nm Al0.2Ga0.8As {label right}")
    assert lines.strongest is None and lines.main.upper == CONTINUUM
    table = lines.error_budget()
    assert "field" not in table["what"].tolist()
    # one edge alone rises: the other stays the lower one, only the level follows
    found = row(table, "left", "+0.01 Al")
    changed = lines_of("30 nm Al0.21Ga0.79As, 3 nm GaAs, 30 nm Al0.2Ga0.8As").main
    assert found["shift_meV"] == pytest.approx(changed.energy_meV - lines.main.energy_meV, rel=0.1)
    assert found["shift_meV"] < 0.0


def test_without_a_line_the_budget_is_empty():
    levels = bw.solve(bw.Stack([own(20, 0, 0.067)]))
    table = levels.lines().error_budget()
    assert list(table.columns) == COLUMNS and len(table) == 0


def test_copies_are_followed_as_one():
    line = "60 nm Al0.28Ga0.72As, 2 x (8 nm GaAs, 60 nm Al0.28Ga0.72As)"
    lines = lines_of(line)
    assert [group.stop - group.start for group in lines.levels.groups] == [2, 2]
    found = row(lines.error_budget(), "layer 2 (GaAs)", "+1 ML")
    alone = row(lines_of(WELL).error_budget(), "well", "+1 ML")
    assert found["shift_meV"] == pytest.approx(alone["shift_meV"], rel=1e-4)
    assert found["sentence"] == alone["sentence"].replace("well", "layer 2 (GaAs)")


def test_copies_that_part_are_said_to():
    wall, one, two = "60 nm Al0.3Ga0.7As", "8 nm GaAs {label one}", "8 nm GaAs {label two}"
    lines = lines_of(f"{wall}, {one}, {wall}, {two}, {wall}", {"substrate": "GaAs"})
    assert [group.stop - group.start for group in lines.levels.groups] == [2, 2]
    table = lines.error_budget(checked=True)
    # one more monolayer in one of the wells: the other well's levels stay where they were
    alone = lines_of(f"{wall}, {one}, {wall}", {"substrate": "GaAs"}).levels
    thicker = alone.stack.replace(
        layers=[*alone.stack.layers[:1], bw.Layer("8.2826625 nm", "GaAs"), alone.stack.layers[2]]
    )
    moved = (alone.energies - bw.solve(thicker).energies) * 1e3
    remark = row(table, "one", "+1 ML")["remark"]
    assert remark == (
        "the mean over copies that part, those of level 3 by"
        f" {moved[1]:.2g} meV and those of level 1 by {moved[0]:.2g} meV"
    )
    assert row(table, "temperature", "+10 K")["remark"] is None


# -- how it is done ------------------------------------------------------------------------------


def test_only_whole_changes_are_solved_again(monkeypatch):
    lines = lines_of("30 nm Al0.4Ga0.6As, 11 nm GaAs, 30 nm Al0.4Ga0.6As")
    assert len(lines.levels.energies) > 2
    asked = []

    def solve(stack, **arguments):
        asked.append(arguments["at_most"])
        return bw.solve(stack, **arguments)

    monkeypatch.setattr(checking, "solve", solve)
    table = lines.error_budget((2, 1), checked=True)
    # up to the upper level, and some more in case others pass; the model's factors are no stack
    assert asked == [2 + checking.PASSING] * (len(table) - 2)
    asked.clear()
    unchecked = lines.error_budget((2, 1))
    assert asked == []
    assert unchecked["shift_meV"].tolist() == table["shift_meV"].tolist()
    assert unchecked["remark"].tolist() == [None] * len(table)


AGREE = {
    "materials": (WELL, {}),
    "a field": (WELL, {"field": "30 kV/cm"}),
    "a bias and a substrate": (WELL, {"bias": "0.2 V", "substrate": "In0.05Ga0.95As"}),
    "a grade in monolayers": (
        "20 nm Al0.3Ga0.7As, 30 ML AlxGa1-xAs {x 0.01 to 0.1}, 20 nm Al0.3Ga0.7As", {},
    ),
    "repeats": ("9 nm AlAs, 2 x (6 nm GaAs, 2 nm AlAs), 7 nm Al0.3Ga0.7As", {}),
}  # fmt: skip


@pytest.mark.parametrize("name", AGREE)
def test_derivatives_agree_with_solving_again(name):
    line, arguments = AGREE[name]
    levels = bw.solve(bw.parse_line(line, **arguments), tolerance="1e-10 eV")
    chosen = levels.lines().find(2, 1)
    steps = {"thickness": 0.01, "composition": 5e-4, "temperature": 1.0, "field": 1e-5,
             "bias": 1e-3, "flux": 1e-3}  # fmt: skip
    for change in changes(levels):
        if change.parameter.kind in ("masses", "offset share"):
            continue  # no stack has them; see the gradients' own tests
        if change.parameter.name == "field" and levels.profile.field == 0.0:
            continue  # a field, however small, has walls instead of open ends
        found = derivatives(levels, chosen, [change]).ends[0]
        step = steps[change.parameter.kind]
        up, down = (
            bw.solve(
                shifted(levels.stack, change.parameter.name, side * step), at_most=2,
                tolerance="1e-10 eV",
            ).energies[[1, 0]]
            for side in (1, -1)
        )  # fmt: skip
        expected = (up - down) / (2.0 * step)
        print(f"{change.parameter.name}: found {found}, by solving again {expected}")
        # central difference: its square term, below 1e-4 of the derivative at these steps
        assert found == pytest.approx(expected, rel=1e-4, abs=2e-10 / step)


def test_a_change_of_the_band_model_is_kept():
    one = lines_of(WELL, bands="one-band")
    found = row(one.error_budget(), "well", "+1 ML")["shift_meV"]
    thicker = lines_of(WELL.replace("8 nm", "8.2826625 nm"), bands="one-band").find(2, 1)
    two = row(lines_of(WELL).error_budget(), "well", "+1 ML")["shift_meV"]
    shift = thicker.energy_meV - one.find(2, 1).energy_meV
    assert found == pytest.approx(shift, rel=0.05) and abs(found - two) > 0.02 * abs(found)


def test_the_source_of_the_derivatives_is_one_function(monkeypatch):
    lines = lines_of(WELL)

    def given(levels, line, changes):
        return Derivatives(np.full((len(changes), 2), [2.0, 1.0]), np.zeros((len(changes), 2)))

    monkeypatch.setattr(budget, "derivatives", given)
    found = row(lines.error_budget((2, 1)), "temperature", "+10 K")
    assert found["shift_meV"] == pytest.approx(1e4)


def test_solving_again_repeats_no_warning():
    lines = lines_of(WELL, {"field": "5 kV/cm"})
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        lines.error_budget()
