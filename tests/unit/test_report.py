"""The report room: what a person reads, and what another program does."""

import csv
import io
import json
import re

import pytest

import bandwright as bw
from bandwright.cautions import collect
from bandwright.errors import BandwrightError, UnknownName
from bandwright.report import data, facts, grid, html, known, text

WELL = "30 nm Al0.28Ga0.72As, 6.2 nm GaAs {label w<ell}, 30 nm Al0.28Ga0.72As"
SLOPED = "30 nm Al0.28Ga0.72As, 9 nm AlxGa1-xAs {x 0.1 to 0 quadratic}, 30 nm Al0.28Ga0.72As"


@pytest.fixture(scope="module")
def flat():
    return bw.solve(bw.parse_line(WELL, substrate="GaAs", name="a & b"))


@pytest.fixture(scope="module")
def curved():
    return bw.solve(bw.parse_line(SLOPED, substrate="GaAs"))


def test_heading_is_the_column_name_with_its_unit_below():
    lines = grid.grid({"wall_shift_meV_per_nm": [-4.912], "main_layer": ["well"]})
    assert lines == ["wall shift  main layer", "    meV/nm", "    -4.912  well"]


def test_long_headings_are_stacked_and_columns_line_up():
    lines = grid.grid({"largest_difference_meV": [1.0, 22.0], "level": [1, 10]})
    assert lines == [
        "   largest",
        "difference  level",
        "       meV",
        "     1.000      1",
        "    22.000     10",
    ]
    assert len({len(line) for line in lines[1:2] + lines[3:]}) == 1


@pytest.mark.parametrize(
    ("name", "value", "shown"),
    [
        ("energy_meV", 61.23456, "61.23"),
        ("energy_meV", -1e-9, "0.00"),
        ("difference_meV", -0.0061, "-0.006"),
        ("shift_um", 0.39096, "+0.391"),
        ("shift_um", -1e-15, "0.000"),
        ("anything", 1234567.0, "1.23457e+06"),
        ("anything", None, "-"),
        ("anything", float("nan"), "-"),
        ("copies", 30, "30"),
        ("of_box", True, "yes"),
        ("upper", "continuum", "continuum"),
    ],
)
def test_cell(name, value, shown):
    assert grid.cell(name, value) == shown


def test_every_unit_suffix_of_our_tables_is_known(flat, curved):
    lines = flat.lines()
    tables = [flat.table, lines.table, lines.error_budget(), bw.compare([curved.stack])]
    names = {str(name) for table in tables for name in table.columns}
    bare = {name for name in names if not grid.unit_of(name)[1]}
    assert bare == {
        *("count_checked", "main_layer", "probability", "copies", "upper", "lower", "levels"),
        *("oscillator_strength", "what", "change", "remark", "sentence", "name", "reason"),
    }


def test_finer_tolerance_shows_more_digits():
    shown = [grid.digits_for(t)["energy_meV"] for t in (1e-3, 1e-6, 2e-7, 1e-10, 1e-15)]
    assert shown == [".2f", ".2f", ".3f", ".6f", ".8f"]


def test_flat_stack_says_that_agreement_is_no_evidence(flat, curved):
    said = text.levels_text(flat)
    assert said.count("exact here") == len(flat.table) + 1
    assert "their agreement is no evidence" in " ".join(said.split())
    assert "exact here" not in text.levels_text(curved)
    assert data.levels_object(flat)["phase_exact"] is True
    assert data.levels_object(curved)["phase_exact"] is False


def test_head_has_what_was_solved(flat):
    head = dict(facts.facts(flat))
    assert list(head) == [
        "electrons", "stack", "grown", "held at", "model", "energies", "ends", "found"
    ]  # fmt: skip
    assert head["electrons"] == "no field"
    assert head["held at"] == "300 K, strained to GaAs"
    assert head["model"] == "two-band"
    assert head["ends"] == "open at both faces"
    assert "Al0.28Ga0.72As" in head["grown"]
    assert "none missing by count" in head["found"]


def test_head_tells_walls_from_open_ends():
    stack = bw.parse_line("9 nm GaAs, 9 nm Al0.2Ga0.8As", ends=("wall", "open"), substrate="GaAs")
    head = dict(facts.facts(bw.solve(stack)))
    assert head["ends"] == "wall at the substrate side, open at the surface side"


@pytest.mark.parametrize(
    ("arguments", "says"),
    [
        ({"field": "12 kV/cm"}, "electrons run to the substrate (12 kV/cm)"),
        ({"field": "-12 kV/cm"}, "electrons run to the surface (12 kV/cm)"),
        ({"field": "12 kV/cm", "electrons_run": "to surface"}, "electrons run to the surface"),
        ({"bias": "0.3 V"}, "electrons run to the surface (0.3 V)"),
        ({"bias": "-0.3 V"}, "electrons run to the substrate (0.3 V)"),
        ({"bias": "0.3 V", "electrons_run": "to substrate"}, "electrons run to the substrate"),
        ({}, "no field"),
    ],
)
def test_direction_before_and_after_solving_agree(arguments, says):
    stack = bw.parse_line(WELL, substrate="GaAs", **arguments)
    said = facts.drive(stack)
    assert said.startswith(says)
    assert facts.direction(bw.solve(stack)).split("(")[0] == said.removeprefix("electrons ").split(
        "("
    )[0]


def test_layers_break_only_between_layers():
    line = ", ".join(["40 nm Al0.24Ga0.76As {label lower barrier, donors 1e11 / cm^2}"] * 3)
    lines = text.layers("grown", line)
    assert len(lines) == 3
    assert all(part.rstrip(",").endswith("}") for part in lines)
    assert " ".join(part[11:] for part in lines) == line


def test_a_stack_that_no_line_can_hold_is_still_named():
    sloped = bw.Layer("9 nm", "AlxGa1-xAs", x=lambda depth: 0.02 * depth)
    assert facts.grown(bw.Stack([sloped, bw.Layer("3 nm", "AlAs")])) == "9 nm AlxGa1-xAs, 3 nm AlAs"


def test_lines_text_names_the_line_of_the_budget_and_ends_in_safety(flat):
    said = text.lines_text(flat.lines())
    assert re.search(r"^what moves 2 to 1, \d+\.\d{3} um, to first order:$", said, re.MULTILINE)
    assert said.rstrip().splitlines()[-2].startswith("safety ")


def test_lines_text_without_a_line(flat):
    said = text.lines_text(flat.lines(window=("1 um", "1.1 um")))
    assert "\nno line\n" in said and "what moves" not in said
    assert "free-electron mass" not in said


def test_lines_say_whose_mass_an_oscillator_strength_is_with(flat):
    note = "oscillator strengths are with the free-electron mass, wavelengths in vacuum"
    assert f"\nnote       {note}\n" in text.lines_text(flat.lines())
    assert f"<b>note</b> {note}" in html.lines_html(flat.lines())


def test_html_of_lines_has_what_was_solved_and_the_budget(flat):
    page = html.lines_html(flat.lines())
    assert page.startswith(html.html_facts(facts.facts(flat)))
    head, *_ = text.budget_text(flat.lines())
    assert head.startswith("what moves 2 to 1") and f"<div>{head}</div><table>" in page
    assert "+1 ML" in page
    assert "what moves" not in html.lines_html(flat.lines(window=("1 um", "1.1 um")))


def test_phase_integral_alone_claims_no_count(flat):
    said = str(bw.solve(flat.stack, method="phase-integral"))
    assert "2 levels below" in said and "by the phase integral alone, none counted" in said
    assert "approximates nothing" in said and "the count is" not in said


def test_failed_designs_are_told_below_the_table():
    stacks = [bw.parse_line(WELL, substrate="GaAs"), bw.parse_line("5 nm Al0.3Xx0.7As")]
    said = text.compare_text(stacks, data.columns_of(bw.compare(stacks)))
    assert "\ndesign 2   failed: " in said


def test_print_shows_the_text_and_repr_one_line(flat):
    assert str(flat) == text.levels_text(flat)
    assert str(flat.lines()) == text.lines_text(flat.lines())
    assert repr(flat) == "<Levels: 2 of a & b>"
    assert repr(flat.lines()) == "<Lines: 3 of <Levels: 2 of a & b>>"


def test_csv_reads_back_every_digit(curved):
    rows = list(csv.DictReader(io.StringIO(data.csv_text(data.columns_of(curved.table)))))
    assert [float(row["energy_meV"]) for row in rows] == curved.table["energy_meV"].tolist()


def test_json_has_no_nan():
    assert json.loads(data.json_text(data.rows_of({"a": [data.plain(float("nan"))]}))) == [
        {"a": None}
    ]
    with pytest.raises(ValueError, match="not JSON compliant"):
        data.json_text(float("nan"))


def test_whole_columns_stay_whole_beside_a_gap():
    table = bw.compare([bw.parse_line(WELL, substrate="GaAs"), bw.parse_line("5 nm Al0.3Xx0.7As")])
    assert data.columns_of(table)["levels"] == [2, None]


def test_html_escapes_and_shows_the_same_numbers(flat):
    page = html.levels_html(flat)
    assert "a &amp; b" in page and "w&lt;ell" in page and "w<ell" not in page
    assert f">{flat.table['energy_meV'].iloc[0]:.2f}</td>" in page
    assert flat._repr_html_() == page
    lines = flat.lines()._repr_html_()
    assert "can injure eyes" in lines and ">continuum</td>" in lines


def test_html_says_the_cautions():
    levels = bw.solve(bw.parse_line("30 nm AlAs, 6 nm GaAs, 30 nm AlAs"))
    assert "<b>caution</b>" in levels._repr_html_()
    assert len(collect(levels)) > 0


def test_materials_need_a_formula_for_temperature_and_substrate():
    with pytest.raises(BandwrightError, match="temperature: a temperature belongs to a formula"):
        known.known(temperature="77 K")
    with pytest.raises(BandwrightError, match="substrate: a substrate belongs to a formula"):
        known.known(substrate="GaAs")


def test_an_unknown_material_is_told_with_what_is_known():
    with pytest.raises((BandwrightError, UnknownName), match="Ga"):
        known.known(["GaXs"])


def test_every_number_of_a_shown_formula_has_a_source():
    shown = known.known(["In0.53Ga0.47As"], substrate="InP")
    assert all(shown.facts["source"])
    assert "[1]        " in text.materials_text(shown)
