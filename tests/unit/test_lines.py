import math
import pickle
import warnings

import numpy as np
import pandas as pd
import pytest

import bandwright as bw
from bandwright.constants import H2M
from bandwright.errors import QuantityError, SolveError, StackError
from bandwright.lines import CONTINUUM, Line, continuum_edge, line_of

COLUMNS = [
    "upper", "lower", "energy_meV", "wavelength_um", "wavenumber_per_cm", "frequency_THz",
    "dipole_nm", "oscillator_strength",
]  # fmt: skip


def well(width="10 nm", **arguments):
    wall = bw.Layer("20 nm", edge="250 meV", mass=0.092)
    return bw.Stack([wall, bw.Layer(width, edge="0 meV", mass=0.067), wall], **arguments)


# Closed form of the finite well, psi'/m continuous: BenDaniel & Duke, Phys. Rev. 152, 683 (1966),
# solved with mpmath; width nm, E21 eV, z12 nm, f12 with the free-electron mass. Printed digits.
CLOSED = [
    ("7.5 nm", 0.129202075316, 2.062992311, 14.432507),
    ("10 nm", 0.0894758667013, 2.482939481, 14.478222),
    ("15 nm", 0.0486337018769, 3.358245148, 14.395912),
    ("20 nm", 0.0302987527146, 4.250116905, 14.364932),
]


@pytest.mark.parametrize(("width", "energy", "dipole", "strength"), CLOSED)
def test_first_line_of_a_finite_well(width, energy, dipole, strength):
    line = bw.solve(well(width), tolerance="1e-9 eV").lines().find(2, 1)
    print(f"E21 {line.energy_meV!r} meV, closed form {energy * 1e3!r}")
    assert line.energy_meV == pytest.approx(energy * 1e3, abs=1e-6)
    assert line.dipole_nm == pytest.approx(dipole, abs=1e-8)
    # f = E z^2 / (hbar^2 / 2 m0): the reference's ten digits of z allow eight of f
    assert line.oscillator_strength == pytest.approx(strength, rel=1e-7)


def test_units_of_one_photon():
    line = line_of(2, 1, 0.1)  # 100 meV
    # CODATA 2022: hc = 1239.841984332 eV nm, 1 cm^-1 = 0.1239841984332 meV,
    # 1 THz = 4.13566769692386 meV; h, c and e are exact since 2019
    assert line.wavelength_um == pytest.approx(12.39841984332, rel=1e-12)
    assert line.wavenumber_per_cm == pytest.approx(100.0 / 0.1239841984332, rel=1e-12)
    assert line.frequency_THz == pytest.approx(100.0 / 4.13566769692386, rel=1e-12)
    assert line.energy_meV == 100.0
    assert line.dipole_nm is None and line.oscillator_strength is None


def test_every_pair_and_every_onset_once():
    levels = bw.solve(well("20 nm"))
    table = levels.lines().table
    assert list(table.columns) == COLUMNS
    number = len(levels.energies)
    pairs = [(u, low) for u, low in zip(table["upper"], table["lower"], strict=True)]
    expected = [
        pair
        for low in range(1, number + 1)
        for pair in [*((up, low) for up in range(low + 1, number + 1)), (CONTINUUM, low)]
    ]
    assert pairs == expected
    onset = table[table["upper"] == CONTINUUM]
    assert onset["energy_meV"].tolist() == pytest.approx(250.0 - 1e3 * levels.energies)
    assert onset[["dipole_nm", "oscillator_strength"]].isna().all().all()
    assert table["energy_meV"].dtype == np.float64 and table["dipole_nm"].dtype == np.float64


def test_without_open_ends_there_is_no_onset_and_numbers_are_integers():
    levels = bw.solve(well(ends="wall"), at_most=3)
    table = levels.lines().table
    assert CONTINUUM not in table["upper"].tolist()
    assert table["upper"].dtype == np.int64 and table["lower"].dtype == np.int64
    assert continuum_edge(levels) is None


def test_in_a_field_there_is_no_onset():
    levels = bw.solve(well(field="5 kV/cm"), at_most=2)
    assert continuum_edge(levels) is None
    assert CONTINUUM not in levels.lines().table["upper"].tolist()


def test_the_onset_counts_from_the_lower_open_edge():
    low = bw.Layer("20 nm", edge="210 meV", mass=0.092)
    stack = bw.Stack([*well().layers[:2], low], zero=None)
    line = bw.solve(stack).lines().find(CONTINUUM, 1)
    assert line.energy_meV == pytest.approx(210.0 - 1e3 * bw.solve(stack).energies[0])


def test_a_stack_without_levels_has_no_lines():
    levels = bw.solve(bw.Stack([bw.Layer("20 nm", edge="0 meV", mass=0.067)]))
    lines = levels.lines()
    assert lines.rows == () and lines.strongest is None and lines.main is None
    assert list(lines.table.columns) == COLUMNS and len(lines.table) == 0
    with pytest.raises(StackError, match="no line 2 to 1 here; lines are none"):
        lines.find(2, 1)


def test_a_single_level_has_only_its_onset():
    lines = bw.solve(well("3 nm")).lines()
    assert [line.name for line in lines.rows] == ["continuum to 1"]
    assert lines.strongest is None
    assert lines.main == lines.rows[0]


def test_strongest():
    lines = bw.solve(well("10 nm")).lines()
    strengths = lines.table["oscillator_strength"]
    assert lines.strongest.oscillator_strength == strengths.max()
    assert lines.strongest.name == "3 to 2"
    assert lines.main is lines.strongest


def test_a_tie_goes_to_the_lowest_levels_and_is_said(monkeypatch):
    rows = (
        line_of(2, 1, 0.01, 0.1),
        line_of(3, 1, 0.12, math.sqrt(12 * H2M / 0.12)),
        line_of(3, 2, 0.11, math.sqrt(12 * (1 + 1e-8) * H2M / 0.11)),
    )
    lines = bw.solve(well()).lines()
    assert not [text for text in lines.cautions if "equally strong" in text]
    tied = bw.solve(well()).lines()
    monkeypatch.setitem(tied.__dict__, "rows", rows)
    assert tied.strongest.name == "3 to 1"
    [text] = [text for text in tied.cautions if "equally strong" in text]
    assert text.startswith("lines 3 to 1 and 3 to 2 are equally strong (oscillator strength 12)")
    assert "3 to 1 is called the strongest" in text and "error_budget(line=" in text


@pytest.fixture(scope="module")
def twins():
    wall = bw.Layer("60 nm", edge="250 meV", mass=0.092)
    pit = bw.Layer("7.5 nm", edge="0 meV", mass=0.067)
    return bw.Stack([wall, pit, wall, pit, wall])


def test_copies_are_one_line_as_strong_as_one_well(twins):
    alone = bw.solve(well("7.5 nm")).lines().find(2, 1)
    levels = bw.solve(twins)
    assert [group.stop - group.start for group in levels.groups] == [2, 2]
    [line] = [line for line in levels.lines().rows if line.upper != CONTINUUM]
    assert (line.upper, line.lower) == (3, 1)
    assert line.energy_meV == pytest.approx(alone.energy_meV, abs=1e-5)
    assert line.dipole_nm == pytest.approx(alone.dipole_nm, abs=1e-5)
    assert line.oscillator_strength == pytest.approx(alone.oscillator_strength, abs=1e-4)


def test_levels_of_the_box_are_left_out_unless_asked():
    levels = bw.solve(well("10 nm", field="20 kV/cm"), below="0.33 eV")
    assert levels.of_box.any() and not levels.of_box.all()
    own = np.flatnonzero(~levels.of_box) + 1
    lines = levels.lines()
    assert {n for line in lines.rows for n in (line.upper, line.lower)} <= set(own)
    assert len(levels.lines(of_box=True).rows) == math.comb(len(levels.energies), 2)
    number = int(levels.of_box.sum())
    assert [t for t in lines.cautions if t.startswith(f"lines of the {number} level")]
    assert not [t for t in levels.lines(of_box=True).cautions if t.startswith("lines of the")]
    assert levels.lines().cautions[-1].endswith("shows them, in the shell --of-box")


def test_window_and_strength():
    levels = bw.solve(well("10 nm"))  # 13.86, 5.81, 10.00 um and onsets at 5.65, 9.54, 205 um

    def names(**filters):
        return [line.name for line in levels.lines(**filters).rows]

    assert names(window=("8 um", "12 um")) == ["3 to 2", "continuum to 2"]
    assert names(window=("12 um", "8 um")) == names(window=("8 um", "12 um"))
    assert names(window=("8000 nm", None)) == [
        "2 to 1",
        "3 to 2",
        "continuum to 2",
        "continuum to 3",
    ]
    assert names(window=(None, "8 um")) == ["3 to 1", "continuum to 1"]
    assert names(window=("8 um", "12 um"), strength=0.5) == ["3 to 2"]
    assert names(strength=20) == ["3 to 2"]
    assert names(strength=0) == ["2 to 1", "3 to 1", "3 to 2"]
    assert levels.lines(window=("13 um", "14 um")).strongest.name == "2 to 1"
    exact = levels.lines().find(3, 2).wavelength_um
    assert names(window=(f"{exact!r} um", f"{exact!r} um")) == ["3 to 2"]


@pytest.mark.parametrize(
    ("filters", "says"),
    [
        ({"window": "8 um..12 um"}, r"window: got '8 um..12 um'; write two wavelengths, such as"),
        ({"window": ("8 um",)}, r"window: got .*; write two wavelengths"),
        ({"window": 8.0}, r"window: got 8.0; write two wavelengths"),
        ({"window": (8, 12)}, r"window: got 8; write"),
        ({"window": ("100 meV", "150 meV")}, r"window"),
        ({"window": ("0 um", "12 um")}, r"window: got '0 um'; a wavelength is above zero"),
        ({"strength": "much"}, r"strength: got 'much'; write a number from 0"),
        ({"strength": -1}, r"strength: got -1; write a number from 0"),
        ({"strength": math.nan}, r"strength: got nan; write a number from 0"),
        ({"strength": True}, r"strength: got True; write a number from 0"),
    ],
)
def test_filters_that_mean_nothing(filters, says):
    with pytest.raises(QuantityError, match=says):
        bw.solve(well()).lines(**filters)


def test_a_line_that_is_not_there_names_those_that_are():
    with pytest.raises(StackError, match=r"no line 7 to 1 here; lines are 2 to 1, 3 to 1, cont"):
        bw.solve(well()).lines().find(7, 1)


def test_the_phase_integral_alone_has_no_lines():
    levels = bw.solve(well(), method="phase-integral")
    with pytest.raises(SolveError, match="lines need method = 'shooting'"):
        levels.lines()  # here, not first where a table or a text is made of them


def test_nothing_is_made_before_it_is_asked():
    levels = bw.solve(well())
    lines = levels.lines()
    assert not {"rows", "table"} & set(lines.__dict__)
    assert "states" not in levels.__dict__
    assert lines.strongest is not None
    assert "table" not in lines.__dict__
    assert isinstance(lines.table, pd.DataFrame) and lines.table is lines.table


def test_lines_carry_the_cautions_of_their_levels():
    wall = bw.Layer("20 nm", edge="250 meV", mass=0.092)
    wide = bw.Stack([wall, bw.Layer("1500 nm", edge="0 meV", mass=1.0), wall])
    levels = bw.solve(wide, at_most=2)
    assert set(levels.cautions) <= set(levels.lines().cautions)
    assert any("is the unit right" in text for text in levels.lines().cautions)


def test_html_shows_the_table_and_the_safety_line():
    html = bw.solve(well()).lines()._repr_html_()
    assert "<table>" in html and "continuum" in html and "eyes" in html


def test_a_line_pickles_and_lines_as_well():
    lines = bw.solve(well()).lines(window=("8 um", "12 um"))
    line = pickle.loads(pickle.dumps(lines.strongest))
    assert isinstance(line, Line) and line == lines.strongest
    assert pickle.loads(pickle.dumps(lines)).rows == lines.rows


def test_degenerate_levels_divide_nothing_by_zero():
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        assert line_of(2, 1, 0.0, 1.0).wavelength_um == math.inf
