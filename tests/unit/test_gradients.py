import pickle

import numpy as np
import pytest

import bandwright as bw
from bandwright.errors import SolveError, StackError, UnknownName
from bandwright.gradients.stencil import stencil
from bandwright.profile.build import build_profile

WELL = "20 nm Al0.28Ga0.72As {label left}, 8 nm GaAs {label well}, 20 nm Al0.3Ga0.7As"


def solved(line=WELL, **arguments):
    return bw.solve(bw.parse_line(line, **arguments))


def own(thickness, edge, mass=0.067, **more):
    return bw.Layer(f"{thickness} nm", edge=f"{edge} eV", mass=mass, **more)


# -- numbers by differences ----------------------------------------------------------------------


@pytest.mark.parametrize("function", [lambda x: 3.0 * x, lambda x: x**6, np.exp, np.cos])
@pytest.mark.parametrize("room", [(1.0, 1.0), (0.0, 1.0), (1.0, 0.0), (0.005, 1.0)])
def test_a_stencil_gives_derivatives_to_rounding(function, room):
    value = np.array([0.3, 0.7])
    places, weights = stencil(value, *room, 0.004)
    found = np.sum(weights * function(places), axis=0)
    exact = (function(value + 1e-30j)).imag / 1e-30
    assert found == pytest.approx(exact, rel=1e-11)
    assert (places >= value - room[0] - 1e-15).all() and (places <= value + room[1] + 1e-15).all()


def test_a_stencil_without_room_is_refused():
    with pytest.raises(StackError, match=r"it has no room to move by 0\.024 in all"):
        stencil(np.array([0.5]), 0.01, 0.01, 0.004)


# -- what is listed ------------------------------------------------------------------------------


def test_every_parameter_by_default():
    levels = solved(WELL.replace("GaAs {label well}", "GaAs {donors 1e11 / cm^2, label well}"),
                    substrate="InP")  # fmt: skip
    gradient = levels.gradient()
    assert gradient.names == (
        "left.thickness", "left.composition", "well.thickness", "layer 3.thickness",
        "layer 3.composition", "temperature", "field", "all thicknesses", "flux Al", "flux Ga",
        "substrate_lattice",
    )  # fmt: skip
    assert gradient.energies.shape == (len(levels), 11)
    assert levels.gradient(["well.donors"]).energies == pytest.approx(0.0, abs=1e-15)


def test_without_a_substrate_there_is_no_lattice_of_it():
    assert "substrate_lattice" not in solved().gradient().names
    with pytest.raises(UnknownName, match="substrate_lattice: no parameter"):
        solved().gradient(["substrate_lattice"])


def test_an_unknown_name_is_refused_with_what_is_near():
    with pytest.raises(UnknownName, match=r"wel\.thickness: no parameter; did you mean 'well"):
        solved().gradient(["wel.thickness"])
    with pytest.raises(UnknownName, match="field: not in this gradient; known are temperature"):
        solved().gradient(["temperature"]).of("field")


def test_one_layer_of_a_label_by_its_number():
    levels = solved("20 nm Al0.3Ga0.7As {label a}, 8 nm GaAs, 20 nm Al0.3Ga0.7As {label a}")
    both = levels.gradient(["a.composition"]).energies
    first = levels.gradient(["layer 1.composition", "layer 3.composition"]).energies
    assert both[:, 0] == pytest.approx(first.sum(axis=1), rel=1e-9)


def test_the_phase_integral_has_no_states():
    levels = bw.solve(bw.parse_line(WELL), method="phase-integral")
    with pytest.raises(SolveError, match="phase integral gives energies only"):
        levels.gradient(["temperature"])


def test_a_number_without_room_says_why():
    levels = solved(WELL + ", 9 nm AlxGa1-xAs {x 0 to 1}")
    with pytest.raises(StackError, match=r"layer 4.x_shift.*composition|layer 4.x_shift.*fraction"):
        levels.gradient(["layer 4.x_shift"])


def test_no_levels_give_an_empty_gradient():
    levels = bw.solve(bw.Stack([own(20, 0.0)]))
    assert len(levels) == 0
    gradient = levels.gradient()
    assert gradient.energies.shape == (0, 6)
    assert len(gradient.table) == 0 and len(levels.lines().gradient().table) == 0


# -- kinks and clusters --------------------------------------------------------------------------


def test_a_tie_for_the_lowest_edge_is_said():
    layers = [own(9, 0.3), own(6, 0.0), own(3, 0.3), own(7, 0.0), own(9, 0.3)]
    levels = bw.solve(bw.Stack(layers))
    gradient = levels.gradient(["layer 2.edge", "layer 1.edge", "layer 2.thickness"])
    assert gradient.kinked == ("layer 2.edge",)
    named = bw.solve(bw.Stack([*layers[:1], own(6, 0.0, label="zero"), *layers[2:]], zero="zero"))
    fixed = named.gradient(["layer 4.edge"])
    assert fixed.kinked == ()
    # lines do not depend on zero
    pairs = [(2, 1)]
    tied = levels.gradient(["layer 4.edge"]).lines(pairs).energies
    assert tied == pytest.approx(fixed.lines(pairs).energies, rel=1e-9)


def test_equal_open_edges_rise_one_at_a_time():
    levels = bw.solve(bw.Stack([own(9, 0.3, label="left"), own(3, 0.0), own(9, 0.3)]))
    assert levels.gradient(["left.edge"]).edges.tolist() == [0.0]
    lower = bw.solve(bw.Stack([own(9, 0.29, label="left"), own(3, 0.0), own(9, 0.3)]))
    assert lower.gradient(["left.edge"]).edges == pytest.approx([1.0])
    walled = bw.solve(bw.Stack([own(9, 0.3, label="left"), own(9, 0.0)], ends="wall"))
    assert np.isnan(walled.gradient(["left.edge"]).edges).all()


def test_copies_move_as_one_row_and_singles_are_said_to_be_mixed():
    line = "60 nm Al0.28Ga0.72As, 2 x (8 nm GaAs, 60 nm Al0.28Ga0.72As)"
    levels = solved(line)
    gradient = levels.gradient(["layer 2.thickness"])
    assert gradient.mixed[:2].all()
    alone = solved("60 nm Al0.28Ga0.72As, 8 nm GaAs, 60 nm Al0.28Ga0.72As")
    expected = alone.gradient(["layer 2.thickness"]).energies
    assert gradient.groups == pytest.approx(expected, rel=1e-7)
    assert gradient.of_row(1) == pytest.approx(expected[0], rel=1e-7)
    assert not gradient.table["mixed"].any()  # each row holds all of its copies
    apart = bw.solve(bw.parse_line(line), group="0 meV").gradient(["layer 2.thickness"])
    assert apart.table["mixed"].tolist()[:2] == [True, True]
    assert not solved().gradient(["field"]).mixed.any()


# -- tables --------------------------------------------------------------------------------------


def test_table_names_the_unit_in_each_column():
    names = ["left.composition", "well.thickness", "temperature", "field"]
    gradient = solved().gradient(names)
    assert list(gradient.table.columns) == [
        "left.composition_meV_per_0.01", "well.thickness_meV_per_nm", "temperature_meV_per_K",
        "field_meV_per_kV_per_cm", "mixed",
    ]  # fmt: skip
    assert gradient.table.index.tolist() == list(range(1, len(gradient.energies) + 1))
    scales = [10.0, 1e3, 1e3, 0.1]
    assert gradient.table.to_numpy()[:, :4].astype(float) == pytest.approx(
        gradient.energies * scales, rel=1e-14
    )


def test_own_numbers_and_bias_have_their_units():
    stack = bw.Stack(
        [own(9, 0.3, gap="1.5 eV"), own(6, 0.0, gap="0.8 eV", field="1 kV/cm", label="well")],
        ends="wall", bias="10 mV",
    )  # fmt: skip
    names = ["well.edge", "well.mass", "well.gap", "well.field", "bias"]
    gradient = bw.solve(stack).gradient(names)
    assert list(gradient.table.columns)[:-1] == [
        "well.edge_meV_per_meV", "well.mass_meV_per_0.01_m0", "well.gap_meV_per_meV",
        "well.field_meV_per_kV_per_cm", "bias_meV_per_mV",
    ]  # fmt: skip
    expected = gradient.energies * [1.0, 10.0, 1.0, 0.1, 1.0]
    assert gradient.table.to_numpy()[:, :5].astype(float) == pytest.approx(expected, rel=1e-14)


def test_line_table_has_energies_and_wavelengths():
    lines = solved().lines()
    gradient = lines.gradient(["well.thickness"])
    table = gradient.table
    assert list(table.columns) == [
        "upper", "lower", "well.thickness_meV_per_nm", "well.thickness_um_per_nm",
    ]  # fmt: skip
    assert table["upper"].tolist() == lines.table["upper"].tolist()
    assert gradient.names == ("well.thickness",)
    slopes = table["well.thickness_um_per_nm"] / lines.table["wavelength_um"]
    relative = -table["well.thickness_meV_per_nm"] / lines.table["energy_meV"]
    assert slopes.to_numpy() == pytest.approx(relative.to_numpy(), rel=1e-12)


def test_a_gradient_pickles():
    gradient = solved().gradient(["well.thickness"])
    again = pickle.loads(pickle.dumps(gradient))
    assert again.names == gradient.names
    assert again.energies.tolist() == gradient.energies.tolist()


def test_repr_is_one_line():
    levels = solved(name="pair")
    gradient = levels.gradient(["well.thickness", "temperature"])
    assert repr(gradient) == "<Gradient: 2 parameters of <Levels: 2 of pair>>"
    assert repr(gradient.lines([(2, 1)])) == "<LineGradient: 2 parameters of 1 lines>"


# -- a substrate's lattice as a number ------------------------------------------------------------


def test_layers_once_looked_up_are_kept_apart_by_what_they_depend_on():
    stack = bw.parse_line("9 nm GaAs, 6 nm In0.1Ga0.9As, 9 nm GaAs", substrate="GaAs")
    known = {}
    for moved in (stack, stack.replace(temperature="77 K"), stack.replace(substrate="InP")):
        for lattice in (None, 0.57):
            for bands in ("one-band", "two-band"):
                fresh = build_profile(moved, bands, substrate_lattice=lattice)
                kept = build_profile(moved, bands, substrate_lattice=lattice, known=known)
                assert kept == fresh
    assert len(known) == 2 * 3 * 2 * 3


def test_a_substrate_of_any_lattice():
    stack = bw.parse_line("9 nm GaAs, 6 nm In0.1Ga0.9As, 9 nm GaAs", substrate="GaAs")
    named = build_profile(stack)
    library = bw.Library.shipped()
    same = build_profile(stack, substrate_lattice=library.lattice("GaAs"))
    assert same.sections == named.sections
    other = build_profile(stack, substrate_lattice=library.lattice("InP"))
    on_indium_phosphide = build_profile(stack.replace(substrate="InP"))
    assert other.sections == on_indium_phosphide.sections
    assert build_profile(stack).sections == named.sections  # nothing stays behind
