"""Each caution by its text, and the same stack mended without it."""

import dataclasses
import warnings

import numpy as np
import pytest

import bandwright as bw
from bandwright import cautions
from bandwright.cautions.words import listed, numbered

WELL = "30 nm Al0.28Ga0.72As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As"


def solve(line, stack=None, **arguments):
    return bw.solve(bw.parse_line(line, **(stack or {})), **arguments)


def said(levels, word):
    """The one caution that holds a word; None if none does."""
    found = [text for text in levels.cautions if word in text]
    assert len(found) <= 1, found
    return found[0] if found else None


def well(width, *, top=0.25, barrier=20, mass=0.067, count=1):
    wall = bw.Layer(f"{barrier} nm", edge=f"{top} eV", mass=mass)
    layers = [wall]
    for _ in range(count):
        layers += [bw.Layer(f"{width} nm", edge="0 eV", mass=mass), wall]
    return bw.Stack(layers)


def test_a_plain_well_needs_none():
    assert solve(WELL).cautions == ()
    assert solve(WELL, {"substrate": "GaAs", "temperature": "77 K"}).cautions == ()


# -- layers -----------------------------------------------------------------------------------


def test_nothing_bound_names_the_outer_layer_that_lets_electrons_out():
    capped = solve(f"{WELL}, 10 nm GaAs", {"substrate": "GaAs"})
    text = said(capped, "nothing is bound")
    assert "above 0 meV, the edge of layer 4 (GaAs), leaves through it" in text
    assert "leave out a cap or buffer" in text and "ends = 'wall'" in text
    buffered = solve(f"10 nm GaAs, {WELL}", {"substrate": "GaAs"})
    assert "the edge of layer 1 (GaAs)" in said(buffered, "nothing is bound")
    for mended in (WELL, f"{WELL}, 10 nm GaAs"):
        ends = "open" if mended == WELL else "wall"
        assert said(solve(mended, {"substrate": "GaAs", "ends": ends}), "is bound") is None


def test_no_level_under_the_limit_asked():
    assert "no level below 5 meV; to look higher" in said(solve(WELL, below="5 meV"), "no level")
    in_field = solve(WELL, {"field": "20 kV/cm"}, below="5 meV")
    assert "no level below 5 meV" in said(in_field, "no level")
    assert said(solve(WELL, below="0.1 eV"), "no level") is None


def test_own_numbers_that_look_like_a_slip():
    line = "20 nm {{edge {top}, mass 0.09}}, 7 nm {{edge 0 meV, mass {mass}, label well}}, " \
           "20 nm {{edge 200 meV, mass 0.09}}"  # fmt: skip
    slip = solve(line.format(top="200 meV", mass=67), at_most=1)
    assert said(slip, "decimal point").startswith("well: a mass of 67 times the free electron's")
    slip = solve(line.format(top="235 eV", mass=0.067), at_most=1)
    assert said(slip, "eV or meV?").startswith("layer 1 (own numbers): an edge 235 eV above")
    plain = solve(line.format(top="200 meV", mass=0.067), at_most=1)
    assert plain.cautions == ()
    in_field = solve(line.format(top="0.2 eV", mass=0.067), {"field": "4000 kV/cm"}, at_most=1)
    assert said(in_field, "eV or meV?") is None


def test_a_layer_over_a_micrometre():
    text = said(solve("30 nm Al0.28Ga0.72As, 6.2 um GaAs, 30 nm Al0.28Ga0.72As", at_most=2), "unit")
    assert text == (
        "layer 2 (GaAs) is 6200 nm thick, over 1 um: is the unit right? 6.2 nm if um stands for"
        " nm, 620 nm if nm stands for Å"
    )
    assert said(solve("30 nm AlAs, 1000 nm GaAs, 30 nm AlAs", at_most=2), "is the unit") is None


def test_a_layer_thinner_than_atoms():
    line = "30 nm Al0.28Ga0.72As, 0.062 nm GaAs, 5 nm GaAs, 30 nm Al0.28Ga0.72As"
    assert said(solve(line), "is the unit right") == (
        "layer 2 (GaAs) is 0.062 nm thick, thinner than any layer of atoms: is the unit right?"
    )


def test_a_layer_under_one_monolayer():
    line = "30 nm Al0.28Ga0.72As, 5 nm GaAs, {} AlAs, 5 nm GaAs, 30 nm Al0.28Ga0.72As"
    text = said(solve(line.format("0.2 nm")), "monolayer")
    assert text.startswith("layer 3 (AlAs) is 0.2 nm thick, less than one monolayer (0.2831 nm):")
    assert "write it in ML, or as an alloy" in text
    assert said(solve(line.format("1 ML")), "monolayer") is None


def test_an_indirect_barrier_says_x_is_lower_and_not_shifted_by_strain():
    line = "30 nm Al0.8Ga0.2As, 6.2 nm GaAs, 30 nm Al0.8Ga0.2As"
    text = said(solve(line), "indirect")
    assert text.startswith("layer 1 (Al0.8Ga0.2As), layer 3 (Al0.8Ga0.2As): indirect gap; the edge")
    assert "at X lies" in text and "not shifted by strain" not in text
    strained = said(solve(line, {"substrate": "GaAs"}), "indirect")
    assert "(X and L are not shifted by strain)" in strained


def test_a_labelled_layer_keeps_its_formula():
    line = "30 nm Al0.8Ga0.2As {label cap}, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As"
    assert said(solve(line), "indirect").startswith("cap: Al0.8Ga0.2As: indirect gap")


def test_temperature_outside_the_fit():
    text = said(solve(WELL, {"temperature": "900 K"}), "900 K")
    assert "fitted from" in text and "used at 900 K" in text
    assert text.startswith("layer 1 (Al0.28Ga0.72As)")


def test_doping_is_kept_and_charge_is_not_included():
    doped = "30 nm Al0.28Ga0.72As, 6.2 nm GaAs {donors 2e11 / cm^2}, 30 nm Al0.28Ga0.72As"
    text = said(solve(doped), "charge not included")
    assert "the doping of layer 2 (GaAs) is kept and bends no band" in text
    undoped = doped.replace("2e11", "0")
    assert said(solve(undoped), "charge") is None


@pytest.mark.parametrize(
    ("stack", "given", "way", "other"),
    [
        ({"field": "12 kV/cm"}, "field", "substrate", "surface"),
        ({"field": "-12 kV/cm"}, "field", "surface", "substrate"),
        ({"bias": "50 mV"}, "bias", "surface", "substrate"),
    ],
)
def test_direction_where_only_a_sign_says_it(stack, given, way, other):
    text = said(solve(WELL, stack), "sign")
    assert text == (
        f"the sign of the {given} makes electrons run to the {way}; write electrons_run ="
        f" 'to {way}' to say so, or 'to {other}' if it is the other way round"
    )
    positive = {name: value.removeprefix("-") for name, value in stack.items()}
    named = solve(WELL, {**positive, "electrons_run": f"to {way}"})
    assert said(named, "sign") is None
    assert named.direction.startswith(f"to the {way}")


# -- strain -----------------------------------------------------------------------------------


def test_lattices_differ_and_no_substrate_is_named():
    line = "30 nm Al0.48In0.52As, 6 nm In0.6Ga0.4As, 30 nm Al0.48In0.52As"
    text = said(solve(line), "no substrate is named")
    assert "lattices differ by 0.4" in text and "layer 2 (In0.6Ga0.4As) 0.5896" in text
    assert "every layer is taken unstrained" in text and "substrate = 'InP'" in text
    assert said(solve(line, {"substrate": "InP"}), "no substrate") is None


def test_layers_off_the_lattice_of_the_substrate():
    line = "30 nm GaAs, 6 nm In0.2Ga0.8As, 30 nm GaAs"
    text = said(solve(line, {"substrate": "GaAs"}), "off the lattice")
    assert text.startswith(
        "off the lattice of GaAs: layer 2 (In0.2Ga0.8As) (pressed together 1.41%)"
    )
    assert "no splitting of the valence bands" in text
    stretched = said(solve(line, {"substrate": "InP"}), "off the lattice")
    assert "layer 1 (GaAs) (stretched 3." in stretched
    assert said(solve(WELL, {"substrate": "GaAs"}), "off the lattice") is None


def test_beyond_critical_thickness():
    line = "30 nm GaAs, {} nm In0.2Ga0.8As, 30 nm GaAs"
    text = said(solve(line.format(14.2), {"substrate": "GaAs"}), "critical")
    assert text.startswith(
        "layer 2 (In0.2Ga0.8As): 14.2 nm with a misfit of +1.43% is beyond the critical thickness"
        " of 14.1 nm (Matthews and Blakeslee 1974) and may relax"
    )
    assert "make it thinner" in text
    assert said(solve(line.format(14.0), {"substrate": "GaAs"}), "critical") is None


def test_a_layer_cut_in_two_relaxes_as_one():
    line = "30 nm GaAs, 7.1 nm In0.2Ga0.8As {label a}, 7.1 nm In0.2Ga0.8As {label b}, 30 nm GaAs"
    text = said(solve(line, {"substrate": "GaAs"}), "critical")
    assert text.startswith("a + b: 14.2 nm with a misfit of +1.43%")


def test_an_uncapped_layer_relaxes_sooner():
    line = "30 nm GaAs, 6 nm In0.2Ga0.8As, {} nm {}"
    bare = solve(line.format(3, "In0.2Ga0.8As"), {"substrate": "GaAs", "ends": "wall"})
    assert "thickness of 5.63 nm" in said(bare, "critical")
    capped = solve(line.format(3, "GaAs"), {"substrate": "GaAs", "ends": "wall"})
    assert said(capped, "critical") is None


def test_a_superlattice_relaxes_as_a_whole_unless_balanced():
    line = "30 nm GaAs, 12 x (8 nm In0.2Ga0.8As, 8 nm {}), 30 nm GaAs"
    text = said(solve(line.format("GaAs"), {"substrate": "GaAs"}, at_most=2), "critical")
    assert text.startswith("layer 2 (In0.2Ga0.8As) to layer 2 (In0.2Ga0.8As): 184 nm with")
    assert "though no layer alone is; balance the strain with layers of the other sign" in text
    balanced = solve(line.format("GaAs0.6P0.4"), {"substrate": "GaAs"}, at_most=2)
    assert said(balanced, "critical") is None


def test_a_superlattice_with_a_grade_relaxes_as_a_whole():
    # by hand, weighted with t A/a^2: (1.433 x 355.9 - 0.179 x 398.8)/(355.9 + 398.8) = 0.581 %
    line = "30 nm GaAs, 12 x (8 nm In0.2Ga0.8As, 8 nm GaAsxP1-x {x 1 to 0.95}), 30 nm GaAs"
    text = said(solve(line, {"substrate": "GaAs"}, at_most=2), "critical")
    assert "192 nm with a misfit of +0.58%" in text and "though no layer alone is" in text


# -- levels -----------------------------------------------------------------------------------


def test_walls_in_a_field_and_levels_of_the_box():
    levels = solve(WELL, {"field": "12 kV/cm", "electrons_run": "to surface"})
    number = len(levels.energies)
    own, box = int((~levels.of_box).sum()), int(levels.of_box.sum())
    assert own == 2 and box > 2
    assert levels.cautions[0] == (
        "no state is bound in a field: walls at the outer faces stand in for the open ends of"
        f" levels 1 to {number}"
    )
    assert levels.cautions[1].startswith(f"levels 3 to {number} belong to that box, not to the")
    assert "lines leave them out" in levels.cautions[1]


def test_walls_above_the_lower_open_edge():
    levels = solve(WELL, below="0.27 eV")
    assert levels.of_box.tolist()[:2] == [False, False]
    assert said(levels, "no state is bound").startswith(
        "no state is bound above the lower open edge: walls at the outer faces stand in for the"
        f" open ends of levels 3 to {len(levels.energies)}"
    )
    assert len(levels.energies) > 4


def test_own_walls_set_nothing_apart():
    levels = solve(WELL, {"field": "12 kV/cm", "electrons_run": "to surface", "ends": "wall"})
    assert said(levels, "no state is bound") is None


def test_pairs_that_are_not_told_apart():
    stack = well(6, barrier=80, mass=0.092, count=2)
    text = said(bw.solve(stack, below="0.1 eV"), "told apart")
    assert text.startswith("levels 1, 2 are too close to be told apart singly: their energies")
    assert text.endswith("the table's row counts them together")
    text = said(bw.solve(stack, below="0.1 eV", group="0 meV"), "told apart")
    assert text.endswith("widen group, so that they become one row")
    near = bw.solve(well(6, barrier=10, mass=0.092, count=2))
    assert said(near, "told apart") is None


def test_a_level_near_the_top_of_a_barrier():
    # The second level of a well of equal masses appears at a width of 4.73809686653922 nm (x the
    # root of 0.067 / 0.067): L = pi sqrt(C / (m V)), bound by 4 ueV a little above it.
    text = said(bw.solve(well(4.75)), "lies")
    assert text.startswith("level 2 lies 0.0")
    assert (
        "meV below the top of layer 1 (own numbers), layer 3 (own numbers): a small error" in text
    )
    assert "slightly higher and slightly lower" in text
    assert said(bw.solve(well(7.5)), "lies") is None


def test_a_barrier_top_reached_by_a_grade_counts():
    layers = [
        bw.Layer("20 nm", edge="250 meV", mass=0.067),
        bw.Layer("4.6 nm", edge=("250 meV", "0 meV"), mass=0.067),
        bw.Layer("4.6 nm", edge=("0 meV", "250 meV"), mass=0.067),
        bw.Layer("20 nm", edge="250 meV", mass=0.067),
    ]
    levels = bw.solve(bw.Stack(layers))
    assert 0.0 < 0.25 - levels.energies[-1] < 3e-3
    assert "layer 4 (own numbers)" in said(levels, "lies")


def test_a_tilted_well_is_no_barrier():
    levels = solve("9 nm Al0.28Ga0.72As, 30 nm GaAs, 9 nm Al0.28Ga0.72As", {
        "field": "40 kV/cm", "electrons_run": "to surface", "ends": "wall"})  # fmt: skip
    assert all("top of layer 2" not in text for text in levels.cautions)


def test_the_two_methods_apart():
    levels = bw.solve(bw.Stack(parabola()))
    assert not levels.phase_exact and said(levels, "of the spacing apart") is None
    gaps = np.diff(levels.energies)
    spacing = np.minimum(np.append(gaps, np.inf), np.append(np.inf, gaps))
    apart = dataclasses.replace(levels)
    shares = np.full(len(levels), 0.09)
    shares[:2] = 0.14, -0.11
    apart.__dict__["phase_integral"] = levels.energies + shares * spacing
    assert said(apart, "of the spacing apart") == (
        "phase integral and shooting are over 10% of the spacing apart for levels 1, 2 (level 1:"
        " 14%): the simple picture of standing waves fails there; trust the shooting"
        " energy, or try phase_order = 2"
    )


def test_the_phase_integral_without_a_level_of_that_number():
    levels = bw.solve(bw.Stack(parabola()))
    moved = dataclasses.replace(levels)
    moved.__dict__["phase_integral"] = np.append(levels.phase_integral[:-1], np.nan)
    number = len(levels.energies)
    assert said(moved, "no level of the number").startswith(
        f"the phase integral has no level of the number of level {number}"
    )


def parabola():
    return [
        bw.Layer("20 nm", edge="250 meV", mass=0.067),
        bw.Layer("10 nm", edge=("250 meV", "0 meV"), mass=0.067, grading="quadratic"),
        bw.Layer("10 nm", edge=("0 meV", "250 meV"), mass=0.067, grading="quadratic"),
        bw.Layer("20 nm", edge="250 meV", mass=0.067),
    ]


def test_two_band_model_far_below_a_barrier():
    layers = [
        bw.Layer("10 nm", edge="1.2 eV", mass=0.1, gap="1.0 eV"),
        bw.Layer("8 nm", edge="0 eV", mass=0.03, gap="0.5 eV"),
        bw.Layer("10 nm", edge="1.2 eV", mass=0.1, gap="1.0 eV"),
    ]
    levels = bw.solve(bw.Stack(layers), at_most=1)
    assert levels.states.clamped[0] > 1e-3
    text = said(levels, "of the probability")
    assert text.startswith("two-band model near its limit: level 1 with up to")
    assert "solve with bands = 'one-band'" in text
    assert said(bw.solve(bw.Stack(layers), at_most=1, bands="one-band"), "two-band") is None


def test_two_band_model_a_gap_above_the_edge():
    layers = [
        bw.Layer("10 nm", edge="1.2 eV", mass=0.1, gap="1.5 eV"),
        bw.Layer("6 nm", edge="0 eV", mass=0.026, gap="0.354 eV", label="well"),
        bw.Layer("10 nm", edge="1.2 eV", mass=0.1, gap="1.5 eV"),
    ]
    levels = bw.solve(bw.Stack(layers))
    beyond = [n for n, energy in enumerate(levels.energies, 1) if energy > 0.354]
    assert beyond and beyond[0] > 1
    assert said(levels, "than its gap") == (
        f"two-band model near its limit: {numbered(beyond)} further above the edge of well than"
        " its gap; far bands count there: take the energy as a guess, or stay lower"
    )


def test_counts_that_do_not_agree_are_loud():
    levels = bw.solve(well(10))
    part = levels.parts[0]
    checked = np.array([True, False, True])
    wrong = dataclasses.replace(part.solution, count_checked=checked, complete=False)
    broken = dataclasses.replace(levels, parts=(part._replace(solution=wrong),))
    assert broken.cautions[0].startswith("THE COUNTS DO NOT AGREE around level 2: a level may be")
    assert "finer tolerance" in broken.cautions[0]
    open_set = dataclasses.replace(part.solution, complete=False)
    broken = dataclasses.replace(levels, parts=(part._replace(solution=open_set),))
    assert broken.cautions[0].startswith("THE SET IS NOT PROVED COMPLETE between its bounds")


def test_phase_integral_alone_says_that_nothing_was_counted():
    levels = bw.solve(well(10), method="phase-integral")
    assert levels.cautions == (
        "these are phase-integral energies, nothing was shot or counted: use method = 'shooting'"
        " for levels with a certificate",
    )


# -- as warnings ------------------------------------------------------------------------------


def test_warn_gives_what_needs_no_state_as_warnings():
    levels = solve(WELL, {"field": "12 kV/cm"})
    with warnings.catch_warnings(record=True) as caught:
        warnings.simplefilter("always")
        cautions.warn(levels, stacklevel=1)
    assert [str(w.message) for w in caught] == list(cautions.at_once(levels))
    assert all(w.category is bw.BandwrightWarning for w in caught)
    assert caught[0].filename == __file__
    assert set(cautions.at_once(levels)) < set(levels.cautions)


def test_solving_warns_at_the_line_that_asked():
    stack = bw.parse_line(WELL, field="12 kV/cm")
    with pytest.warns(bw.BandwrightWarning, match="the sign of the field") as caught:
        bw.solve(stack)
    assert {warning.filename for warning in caught} == {__file__}
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        solve(WELL)


def test_words():
    assert numbered([2, 3, 5]) == "levels 2, 3, 5"
    assert numbered(np.array([1, 2, 3])) == "levels 1 to 3"
    assert listed([f"layer {n}" for n in range(1, 9)]).endswith("layer 6 and 2 more")


def test_many_thin_layers_are_not_a_flood():
    line = ", ".join(["20 nm AlAs", *["0.05 nm GaAs"] * 30, "20 nm AlAs"])
    texts = [t for t in bw.solve(bw.parse_line(line)).cautions if "thi" in t and "layer" in t]
    assert sum("thinner than any layer" in t for t in texts) == 4
    assert "26 more layers are as odd in thickness" in texts
