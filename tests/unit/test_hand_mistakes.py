"""Mistakes people make by hand: each is an error or a printed line, never a silent number."""

import re

import pytest

import bandwright as bw
from bandwright.cli import main
from bandwright.errors import BandwrightError, MaterialError, QuantityError, StackError


def printed(capsys, *words, command="lines"):
    """What `bandwright lines` prints of a stack, spaces and line ends as single spaces."""
    capsys.readouterr()
    assert main([command, *words]) == 0
    return " ".join(capsys.readouterr().out.split())


def refused(capsys, *words):
    """The one line on standard error that `bandwright lines` refuses a stack with."""
    capsys.readouterr()
    assert main(["lines", *words]) == 2
    out, err = capsys.readouterr()
    assert out == "" and err.count("\n") == 1
    return err


STEP = "30 nm Al0.3Ga0.7As, 6 nm GaAs, 6 nm Al0.1Ga0.9As, 30 nm Al0.3Ga0.7As"


def test_reversed_field(capsys):
    """A field of the other sign is another device: the first line says which was solved."""
    up = printed(capsys, STEP, "--field", "20 kV/cm")
    down = printed(capsys, STEP, "--field", "-20 kV/cm")
    assert up.startswith("electrons run to the substrate (20 kV/cm)")
    assert down.startswith("electrons run to the surface (20 kV/cm)")
    assert "the sign of the field makes electrons run to the substrate; write electrons_run" in up
    one, two = (bw.solve(bw.parse_line(STEP, field=f"{s}20 kV/cm"), at_most=2) for s in "+-")
    assert abs(one.lines().strongest.energy_meV - two.lines().strongest.energy_meV) > 5.0
    named = printed(capsys, STEP, "--field", "20 kV/cm", "--electrons-run", "to surface")
    assert (
        named.startswith("electrons run to the surface (20 kV/cm)") and "the sign of" not in named
    )


def test_minus_beside_a_direction(capsys):
    err = refused(capsys, STEP, "--field", "-20 kV/cm", "--electrons-run", "to surface")
    assert "with electrons_run it is a magnitude, so write it without the minus sign" in err


def test_swapped_fraction(capsys):
    """0.28 and 0.62: two digits of a fraction swapped or one mistyped."""
    err = refused(capsys, "30 nm Al0.28Ga0.62As, 6.2 nm GaAs, 30 nm Al0.28Ga0.72As")
    assert "layer 1 (Al0.28Ga0.62As)" in err
    assert "Al 0.28 and Ga 0.62 add up to 0.9 instead of 1" in err
    assert "Al0.28Ga0.72As or Al0.38Ga0.62As would" in err


def test_fraction_of_the_other_element(capsys):
    """Al0.72Ga0.28As for Al0.28Ga0.72As adds up, but is indirect: that is printed."""
    out = printed(capsys, "30 nm Al0.72Ga0.28As, 6.2 nm GaAs, 30 nm Al0.72Ga0.28As")
    assert "30 nm Al0.72Ga0.28As, 6.2 nm GaAs, 30 nm Al0.72Ga0.28As" in out  # echoed as formula
    assert "indirect gap" in out


def test_fraction_in_per_cent():
    with pytest.raises(MaterialError, match=r"Al0\.28Ga0\.72As"):
        bw.solve(bw.Stack([bw.Layer("30 nm", "Al28Ga72As"), bw.Layer("6 nm", "GaAs")]))
    with pytest.raises(QuantityError, match=r"x: got 28; a fraction lies between 0 and 1; for per"):
        bw.Layer("30 nm", "AlxGa1-xAs", x=28)


def own(thickness, edge, **more):
    return bw.Layer(thickness, edge=edge, mass=0.067, **more)


def test_one_gap_forgotten():
    """Two layers with a gap and one without: neither model is meant for sure."""
    stack = bw.Stack([
        own("20 nm", "250 meV", gap="1.8 eV"),
        own("8 nm", "0 meV", label="well"),
        own("20 nm", "250 meV", gap="1.8 eV"),
    ])  # fmt: skip
    with pytest.raises(StackError, match=r"missing in well; add gap = '\.\.\. eV' there, or say"):
        bw.solve(stack)
    assert bw.solve(stack, bands="one-band").profile.bands == "one-band"


def test_own_numbers_mixed_with_materials_without_zero():
    layers = [own("20 nm", "250 meV", gap="1.8 eV"), bw.Layer("8 nm", "GaAs", label="well")]
    with pytest.raises(
        StackError, match=r"zero: missing; layer 1 .* its own numbers and well a ma"
    ):
        bw.Stack(layers)
    assert bw.solve(bw.Stack(layers, zero="GaAs")).profile.zero == "the conduction edge of GaAs"


@pytest.mark.parametrize(
    ("thickness", "says"),
    [
        ("6.2 um", "layer 2 (GaAs) is 6200 nm thick, over 1 um: is the unit right? 6.2 nm if um"),
        ("0.062 nm", "layer 2 (GaAs) is 0.062 nm thick, thinner than any layer of atoms"),
        ("0.2 nm", "layer 2 (GaAs) is 0.2 nm thick, less than one monolayer (0.2827 nm)"),
    ],
)
def test_thickness_in_the_wrong_unit(thickness, says, capsys):
    line = f"30 nm Al0.28Ga0.72As, {thickness} GaAs, 3 nm GaAs, 30 nm Al0.28Ga0.72As"
    assert says in printed(capsys, line, "--at-most", "3", command="levels")


@pytest.mark.parametrize("thickness", ["6.2", "6.2 m2", "6,2 nm", "6.2 kV", "-6.2 nm", "0 nm"])
def test_thickness_without_a_unit_or_of_no_length(thickness, capsys):
    line = f"30 nm Al0.28Ga0.72As, {thickness} GaAs, 30 nm Al0.28Ga0.72As"
    assert refused(capsys, line)
    with pytest.raises(BandwrightError, match=re.escape(thickness)):
        bw.Layer(thickness, "GaAs")


def test_a_bare_number_shows_the_fix():
    with pytest.raises(QuantityError, match=r"thickness: got 6.2; write '6.2 nm'"):
        bw.Layer(6.2, "GaAs")


def test_text_where_a_stack_is_due():
    with pytest.raises(StackError, match=r"stack: got '5 nm GaAs'; .*parse_line\(text\) from a"):
        bw.solve("5 nm GaAs")
    with pytest.raises(StackError, match=r"stacks: got '5 nm GaAs'; give a list of stacks"):
        bw.solve_many("5 nm GaAs")
    stack = bw.parse_line("9 nm AlAs, 5 nm GaAs, 9 nm AlAs")
    with pytest.raises(StackError, match=r"stacks: got Stack\(.*; give a list of stacks"):
        bw.solve_many(stack)
    with pytest.raises(StackError, match=r"stack 2: got 'x.toml'; .*read_stack\(path\) reads"):
        bw.solve_many([stack, "x.toml"])


def test_indirect_barrier(capsys):
    out = printed(capsys, "30 nm AlAs, 6.2 nm GaAs, 30 nm AlAs", "--substrate", "GaAs")
    assert "caution layer 1 (AlAs), layer 3 (AlAs): indirect gap; the edge at X lies" in out
    assert "below the one at Gamma used here (X and L are not shifted by strain)" in out


def test_off_match_layer_without_substrate(capsys):
    line = "30 nm Al0.48In0.52As, 6 nm In0.7Ga0.3As, 30 nm Al0.48In0.52As"
    out = printed(capsys, line)
    assert "caution no substrate is named, and lattices differ by 1." in out
    assert "layer 2 (In0.7Ga0.3As)" in out and "name it, for example substrate = 'InP'" in out
    strained = printed(capsys, line, "--substrate", "InP")
    assert "no substrate is named" not in strained
    assert "off the lattice of InP: layer 2 (In0.7Ga0.3As) (pressed together 1." in strained


def test_lists_from_the_cap_down():
    """Half of all wafer lists run from the cap down: read so, the field acts the other way."""
    layers = [
        bw.Layer("30 nm", "Al0.3Ga0.7As"),
        bw.Layer("6 nm", "GaAs"),
        bw.Layer("6 nm", "Al0.1Ga0.9As"),
        bw.Layer("30 nm", "Al0.3Ga0.7As"),
    ]
    grown = bw.Stack(layers, field="20 kV/cm")
    listed = bw.Stack(layers[::-1], field="20 kV/cm", order="surface first")
    assert grown == listed
    assert grown != bw.Stack(layers, field="20 kV/cm", order="surface first")


def test_doping_is_not_taken_for_an_effect(capsys):
    line = "30 nm Al0.3Ga0.7As, 8 nm GaAs {donors 5e11 / cm^2, label well}, 30 nm Al0.3Ga0.7As"
    assert "charge not included: the doping of well is kept and bends no band" in printed(
        capsys, line
    )


def test_temperature_that_nobody_gave_is_printed(capsys):
    assert "held at 300 K" in printed(capsys, STEP)
