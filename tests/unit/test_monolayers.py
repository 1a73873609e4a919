"""A stack in whole monolayers, and the strain it carries as a whole."""

import numpy as np
import pytest

import bandwright as bw
from bandwright.monolayers import in_monolayers, net_strain, rounded


def test_every_layer_has_whole_monolayers_and_one_at_least():
    stack = bw.parse_line(
        "20 nm Al0.3Ga0.7As, 2 x (24.6 ML GaAs, 3 nm AlxGa1-xAs {x 0 to 0.3}), 0.1 nm AlAs,"
        " 9 nm {edge 250 meV, mass 0.09, gap 1.8 eV}", substrate="GaAs", zero="GaAs",
    )  # fmt: skip
    levels = bw.solve(stack)
    again = bw.solve(rounded(levels), at_most=1)
    before, after = levels.profile.facts, again.profile.facts
    for number in (0, 1, 2, 3):
        count = after[number].thickness / after[number].monolayer
        assert count == pytest.approx(round(count), abs=1e-9) and count > 0.5
        change = abs(after[number].thickness - before[number].thickness)
        assert change <= before[number].monolayer * (0.5 if number < 3 else 1.0) + 1e-12
    assert rounded(levels).written()[1].layer.thickness == (25.0, "ML")
    assert after[4].thickness == before[4].thickness == 9.0  # its lattice is not known
    assert rounded(again) == rounded(levels)


def test_the_rounded_stack_has_the_levels_that_were_asked():
    stack = bw.parse_line("20 nm Al0.3Ga0.7As, 7 nm GaAs, 20 nm Al0.3Ga0.7As", substrate="GaAs")
    high = bw.solve(stack, below="0.35 eV", bands="one-band")
    again = in_monolayers(high)
    assert len(again) == len(high) > len(bw.solve(stack))
    assert again.profile.bands == "one-band"
    field = bw.solve(stack.replace(field="10 kV/cm"))
    assert len(in_monolayers(field)) == len(field)


def test_net_strain_is_weighted_with_thickness_and_copies():
    stack = bw.parse_line("10 nm InP, 3 x (5 nm In0.6Ga0.4As, 4 nm Al0.4In0.6As), 10 nm InP",
                          substrate="InP")  # fmt: skip
    levels = bw.solve(stack)
    exx = [fact.mismatch for fact in levels.profile.facts]
    assert exx[0] == 0.0 and exx[1] < 0.0
    wanted = (15.0 * exx[1] + 12.0 * exx[2]) / 47.0
    assert net_strain(levels) == pytest.approx(wanted, rel=1e-12)
    assert bw.compare([stack], ["net_strain_percent"]).loc[1, "net_strain_percent"] == (
        net_strain(levels) * 100.0
    )


def test_a_grade_counts_with_its_mean_not_its_worst_face():
    stack = bw.parse_line("5 nm InP, 9 nm InxGa1-xAs {x 0.53 to 0.73}, 5 nm InP", substrate="InP")
    levels = bw.solve(stack)
    fact = levels.profile.facts[1]
    # exx = (a_InP - a)/a along x, a linear in x: the mean by quadrature on many points
    walls = {"substrate": "InP", "ends": ("wall", "wall")}
    slices = [bw.parse_line(f"9 nm In{x:.2f}Ga{1 - x:.2f}As", **walls) for x in (0.53, 0.63, 0.73)]
    first, middle, last = (bw.solve(s, at_most=1).profile.facts[0].mismatch for s in slices)
    simpson = (first + 4.0 * middle + last) / 6.0
    assert fact.mean_mismatch == pytest.approx(simpson, rel=1e-5)
    assert fact.mismatch == pytest.approx(last, rel=1e-5)
    assert net_strain(levels) == pytest.approx(9.0 * fact.mean_mismatch / 19.0, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "arguments"),
    [
        ("20 nm Al0.3Ga0.7As, 7 nm GaAs, 20 nm Al0.3Ga0.7As", {}),
        ("20 nm {edge 250 meV, mass 0.09, gap 1.8 eV}, 7 nm GaAs, 20 nm Al0.3Ga0.7As",
         {"substrate": "GaAs", "zero": "GaAs"}),
    ],
)  # fmt: skip
def test_strain_that_is_not_known(text, arguments):
    stack = bw.parse_line(text, **arguments)
    assert net_strain(bw.solve(stack)) is None
    assert np.isnan(bw.compare([stack], ["net_strain_percent"]).loc[1, "net_strain_percent"])
