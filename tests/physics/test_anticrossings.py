"""Anticrossings of two coupled wells against the two-level formula and closed forms.

Two states of energies E_a, E_b coupled by t are sqrt((E_a - E_b)^2 + 4 t^2) apart (any textbook of
quantum mechanics). Wells and fields are invented.
"""

import numpy as np
import pytest
from scipy.optimize import brentq

import bandwright as bw
from bandwright.constants import H2M

EDGE, HEAVY, LIGHT = 0.25, 0.092, 0.067  # barrier [eV], masses; one band
FIELDS = {"field": "2 kV/cm..80 kV/cm step 3 kV/cm"}


def wells(*widths_and_barriers, outer=15.0):
    """Wells and barriers in turn, between outer barriers."""
    parts = [outer, *widths_and_barriers, outer]
    barrier, well = (f"{{edge {edge} eV, mass {mass}}}" for edge, mass in
                     ((EDGE, HEAVY), (0.0, LIGHT)))  # fmt: skip
    return bw.parse_line(", ".join(f"{nm} nm {barrier if i % 2 == 0 else well}"
                                   for i, nm in enumerate(parts)))  # fmt: skip


def spacing(stack, kV_per_cm, pair=(0, 1)):
    field = f"{kV_per_cm!r} kV/cm"
    energies = bw.solve(stack.replace(field=field), tolerance="1e-9 eV").energies
    return float(energies[pair[1]] - energies[pair[0]])


@pytest.mark.parametrize("barrier", [2.5, 4.0, 6.0, 9.0])
def test_the_two_level_formula(barrier):
    stack = wells(5.0, barrier, 8.0)
    (row,) = bw.anticrossings(stack, FIELDS).to_dict("records")
    split, width = 1e-3 * row["splitting_meV"], row["half_width_kV_per_cm"]
    # the slope is that of two states, one in each well, whose centres are `apart` nm apart: a
    # field F moves them e F apart against each other; each state's own place shifts it by a few %
    apart = 0.5 * 5.0 + barrier + 0.5 * 8.0
    assert split / width * 1e4 == pytest.approx(apart, rel=0.07)
    for off in (-2.0, -1.0, -0.5, 0.5, 1.0, 2.0):
        at = row["field_kV_per_cm"] + off * width
        if at > 1.0:
            formula = split * np.hypot(1.0, off)
            found = spacing(stack, at)
            print(f"{barrier} nm, {off:+} widths: {1e3 * found:.6f} meV, formula"
                  f" {1e3 * formula:.6f}")  # fmt: skip
            # what is beyond two levels grows with the field's reach over the distance to others
            assert found == pytest.approx(formula, rel=0.02)


@pytest.mark.parametrize(("barrier", "within"), [(4.0, 0.02), (7.0, 0.01), (11.0, 0.005)])
def test_the_resonance_field(barrier, within):
    row = bw.anticrossings(wells(5.0, barrier, 8.0), FIELDS).iloc[0]
    alone = [float(bw.solve(wells(width)).energies[0]) for width in (5.0, 8.0)]
    apart = 0.5 * 5.0 + barrier + 0.5 * 8.0
    due = (alone[0] - alone[1]) / apart * 1e4
    print(f"{barrier} nm: {row['field_kV_per_cm']:.4f} kV/cm, (E2 - E1)/(e d) {due:.4f}")
    # the coupling shifts both levels alike, the field each by its square: less the further apart
    assert row["field_kV_per_cm"] == pytest.approx(due, rel=within)


def level_of_pair(width, barrier, odd):
    """Lowest even or odd level of two equal wells: the textbook's transcendental equation."""

    def mismatch(energy):
        k = np.sqrt(LIGHT * energy / H2M) / LIGHT
        kappa = np.sqrt(HEAVY * (EDGE - energy) / H2M) / HEAVY
        inner = np.tanh(0.5 * kappa * HEAVY * barrier)
        inner = 1.0 / inner if odd else inner
        phase = np.arctan2(kappa, k) + np.arctan2(kappa * inner, k) - k * LIGHT * width
        return phase

    return brentq(mismatch, 1e-9, EDGE - 1e-9, xtol=1e-16, rtol=1e-15)


@pytest.mark.parametrize("barrier", [2.0, 4.0, 8.0, 12.0])
def test_two_equal_wells_against_the_transcendental_equation(barrier):
    due = level_of_pair(7.0, barrier, odd=True) - level_of_pair(7.0, barrier, odd=False)
    stack = wells(7.0, barrier, 7.0, outer=40.0)
    over = {"field": "-9 kV/cm..15 kV/cm step 1.5 kV/cm"}
    table = bw.anticrossings(stack, over, below="0.13 eV")
    (row,) = table.to_dict("records")
    found = 1e-3 * row["splitting_meV"]
    print(f"{barrier} nm: splitting {found:.12g} eV, equation {due:.12g}")
    assert abs(row["field_kV_per_cm"]) < 2e-3 * row["half_width_kV_per_cm"]
    assert found == pytest.approx(due, abs=1e-3 * row["splitting_error_meV"] + 1e-12)


def test_the_splitting_falls_as_the_wave_in_the_barrier():
    over = {"field": "-6 kV/cm..9 kV/cm step 1 kV/cm"}
    tables = [bw.anticrossings(wells(7.0, barrier, 7.0, outer=30.0), over, below="0.12 eV")
              for barrier in (8.0, 12.0)]  # fmt: skip
    thin, thick = (table["splitting_meV"].item() for table in tables)
    energy = float(bw.solve(wells(7.0)).energies[0])
    kappa = np.sqrt(HEAVY * (EDGE - energy) / H2M)
    # to first order in the coupling itself, e^(-8 kappa) = 4e-3
    assert np.log(thin / thick) / 4.0 == pytest.approx(kappa, rel=1e-3)


def test_every_minimum_of_a_fine_sweep_is_found():
    # four wells between walls; neighbours that come closest and there follow the two-level formula
    stack = wells(6.2, 2.4, 4.1, 3.5, 9.0, 2.0, 5.2, outer=9.0).replace(ends=("wall", "wall"))
    table = bw.anticrossings(stack, {"field": "4 kV/cm..60 kV/cm step 2 kV/cm"},
                             of_box=True, at_most=7)  # fmt: skip
    fields = np.linspace(4.0, 60.0, 1121)
    designs = [stack.replace(field=f"{field!r} kV/cm") for field in fields.tolist()]
    energies = np.array([levels.energies for levels in bw.solve_many(designs, at_most=7)])
    for lower in range(6):
        apart = energies[:, lower + 1] - energies[:, lower]
        for k in range(40, len(fields) - 40):
            if apart[k] == apart[k - 40 : k + 41].min():
                same = table[(table["lower"] == lower + 1)
                             & (abs(table["field_kV_per_cm"] - fields[k]) < 0.1)]  # fmt: skip
                print(f"{lower + 2} to {lower + 1} at {fields[k]:.2f}: {1e3 * apart[k]:.5f} meV")
                assert len(same) == 1
                assert same["splitting_meV"].iloc[0] == pytest.approx(1e3 * apart[k], rel=0.02)
                assert same["splitting_meV"].iloc[0] <= 1e3 * apart[k] + 1e-3
    assert len(table) >= 5


def test_levels_that_truly_cross():
    stack = wells(6.0, 40.0, 6.0)
    (row,) = bw.anticrossings(stack, {"layer 2.thickness": "5.3 nm..6.8 nm step 0.25 nm"},
                              below="0.15 eV").to_dict("records")  # fmt: skip
    assert row["layer 2.thickness_nm"] == pytest.approx(6.0, abs=1e-8)
    assert row["splitting_meV"] < row["splitting_error_meV"] + 1e-8
    assert (row["lower_track"], row["upper_track"]) == (1, 2)
