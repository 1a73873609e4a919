"""Real interfaces: elements keep their amounts, closed forms, limits, and what is refused."""

import math

import numpy as np
import pytest
from scipy.special import erf

import bandwright as bw
from bandwright.errors import BandwrightError, QuantityError, StackError
from bandwright.formula import elements
from bandwright.materials import Library
from bandwright.parameters import shifted
from bandwright.profile.build import build_profile
from bandwright.profile.interfaces import Real
from bandwright.profile.segregation import Carried, carried
from bandwright.profile.spreading import _real, _rises, _seen
from bandwright.report.facts import facts
from bandwright.stackfile import dumps, loads
from bandwright.stackframe import frame_from_stack, stack_from_frame
from bandwright.stackline import line_text, parse_line

#: an alloy whose edge counts from GaAs by a step that does not vanish with its aluminium
ODD = """
[sources]
own = "invented for this test"

[binary.AlAs]
conduction_edge = "step"
partner = "GaAs"
step = { value = "1.0 eV", source = "own" }

[alloy.AlxGa1-xAs]
conduction_edge = "step"
partner = "GaAs"
step = { polynomial = ["0.02 eV", "0.8 eV"], source = "own" }
"""
TWO_WELLS = "20 nm Al0.3Ga0.7As, 6 nm GaAs, 3 nm Al0.3Ga0.7As, 4 nm GaAs, 20 nm Al0.3Ga0.7As"
INDIUM = "15 nm GaAs, 20 ML In0.2Ga0.8As, 60 nm GaAs"
NODES, WEIGHTS = np.polynomial.legendre.leggauss(40)


def two_wells(**settings):
    return parse_line(TWO_WELLS, substrate="GaAs", zero="GaAs", **settings)


def real_of(stack) -> Real:
    """Return the layers of a stack with their steps, abrupt."""
    profile = build_profile(stack.abrupt())
    known = {}
    build_profile(stack.abrupt(), known=known)
    by_name = {built.facts.name: built for built in known.values()}
    layers = [by_name[profile.facts[number].name] for number in profile.written]
    return _real(stack, layers, Library.shipped(), (0.0, 0.0))


def carried_of(stack) -> Carried:
    real = real_of(stack)
    monolayers = [built.facts.monolayer for built in real.layers]
    widths = np.full(len(real.layers), stack.interface_width or 0.0)
    return carried(real.nominals, monolayers, stack.segregation, real.steps, widths)


def integral(function, cuts):
    """Return the integral of a function of places between cuts, by Gauss in small spans."""
    total = 0.0
    for low, high in zip(cuts[:-1], cuts[1:], strict=True):
        fine = np.linspace(low, high, 1 + max(1, int((high - low) / 0.25)))
        for a, b in zip(fine[:-1], fine[1:], strict=True):
            z = 0.5 * (a + b) + 0.5 * (b - a) * NODES
            total = total + 0.5 * (b - a) * (WEIGHTS @ function(z))
    return total


# --- amounts --------------------------------------------------------------------------------


@pytest.mark.parametrize("ends", ["open", "periodic"])
@pytest.mark.parametrize(
    "text",
    [
        "8 nm Al0.3Ga0.7As, 6 nm GaAs, 0.5 nm AlAs, 4 nm GaAs, 0.7 nm In0.1Al0.2Ga0.7As",
        "3 nm GaAs, 8 nm AlxGa1-xAs {x 0.1 to 0.4}, 5 nm In0.2Ga0.8As {interface_width 0.5 nm}",
        "9 nm InP, 6 nm In0.53Ga0.47As, 9 nm InAs0.4P0.6",
    ],
)
def test_every_element_keeps_its_amount(text, ends):
    stack = parse_line(text, interface_width="0.4 nm", ends=ends)
    real = real_of(stack)
    rises = _rises(stack, real.faces)
    built, asked = {}, {}
    for index, one in enumerate(real.nominals):
        seen = _seen(rises, real.faces, index)
        span = [0.0, one.thickness]
        for name in {e for nominal in real.nominals for e in nominal.fractions(np.zeros(1))}:

            def spread(z, name=name, index=index, seen=seen):
                return real.fractions(index, z, seen).get(name, np.zeros_like(z))

            def plain(z, name=name, one=one):
                return one.fractions(z).get(name, np.zeros_like(z))

            built[name] = built.get(name, 0.0) + integral(spread, span)
            asked[name] = asked.get(name, 0.0) + integral(plain, span)
    assert len(asked) >= 3
    for name, amount in asked.items():
        assert built[name] == pytest.approx(amount, rel=1e-10)


@pytest.mark.parametrize("width", [None, "0.3 nm"])
@pytest.mark.parametrize(
    "text",
    [
        INDIUM,
        "15 nm Al0.3Ga0.7As, 6 nm In0.2Ga0.8As, 3 nm Al0.3Ga0.7As, 70 nm GaAs",
        "15 nm Al0.3Ga0.7As, 6 nm InxGa1-xAs {x 0.05 to 0.2}, 70 nm AlxGa1-xAs {x 0.2 to 0}",
    ],
)
def test_segregated_elements_keep_their_amounts_or_float(text, width):
    stack = parse_line(text, segregation={"In": 0.8}, interface_width=width)
    found = carried_of(stack)
    real = real_of(stack)
    cuts = np.unique(np.concatenate([
        real.faces, found.moved(0, real.faces), [0.0, found.top]
    ]))  # fmt: skip
    names = list(found.arriving)
    assert {"In", "Ga", "As"} <= {name for _, name in names}
    for name in names:
        built = integral(lambda z, name=name: found.fractions(z)[name], cuts)
        arrived = integral(lambda z, name=name: found.arrived(name, z), cuts)
        asked = sum(
            integral(lambda z, one=one, name=name: one.fractions(z).get(name, 0.0 * z),
                     [0.0, one.thickness])
            for one in real.nominals
        )  # fmt: skip
        assert arrived == pytest.approx(asked, rel=1e-10)
        assert built == pytest.approx(asked, rel=1e-10)


def test_fractions_of_a_sublattice_add_up_to_one():
    stack = parse_line(
        "15 nm Al0.3Ga0.7As, 6 nm In0.2Ga0.8As, 3 nm Al0.3Ga0.7As, 20 nm GaAs",
        segregation={"In": 0.85}, interface_width="0.2 nm",
    )  # fmt: skip
    found = carried_of(stack).fractions(np.linspace(0.0, 44.0, 999))
    total = sum(values for (site, _), values in found.items() if site == 0)
    assert total == pytest.approx(np.ones(999), abs=1e-13)
    assert min(values.min() for values in found.values()) > -1e-12


# --- closed forms ---------------------------------------------------------------------------


def test_segregation_is_muraki_s_closed_form():
    # Muraki, Fukatsu, Shiraki, Ito, Appl. Phys. Lett. 61, 557 (1992): x0 (1 - R^n) for n <= N,
    # x0 (1 - R^N) R^(n - N) above, n monolayers from the first-grown face
    share, count, x0 = 0.8, 20, 0.2
    stack = parse_line(INDIUM, substrate="GaAs", segregation={"In": share})
    monolayer = build_profile(stack.abrupt()).facts[1].monolayer
    n = np.arange(1, 80)
    x = np.where(
        n <= count, x0 * (1.0 - share**n), x0 * (1.0 - share**count) * share ** (n - float(count))
    )
    assert carried_of(stack).fractions(15.0 + n * monolayer)[0, "In"] == pytest.approx(x, abs=1e-13)
    # summed over whole monolayers it is all that arrived, but for the tail left at the last
    floating = x[-1] * share / (1.0 - share)
    assert x.sum() + floating == pytest.approx(x0 * count, rel=1e-12)


def test_segregated_profile_reaches_the_band_edge():
    stack = parse_line(INDIUM, substrate="GaAs", zero="GaAs", segregation={"In": 0.8})
    profile = build_profile(stack)
    monolayer = profile.facts[1].monolayer
    library = Library.shipped()
    zero = library.properties(bw.formula.parse("GaAs"), 300.0, "GaAs").edge
    for n in (3.5, 12.0, 27.25):
        x = 0.2 * (1 - 0.8**n) if n <= 20 else 0.2 * (1 - 0.8**20) * 0.8 ** (n - 20)
        edge = library.properties(bw.formula.parse("InxGa1-xAs", x=x), 300.0, "GaAs").edge - zero
        z = 15.0 + n * monolayer
        index = int(np.searchsorted(profile.faces, z)) - 1
        assert profile.sections[index].edge.value(z - profile.faces[index]) == pytest.approx(
            edge, abs=1e-10
        )


def test_uniform_layers_become_sums_of_error_functions():
    stack = two_wells(interface_width="0.5 nm")
    real = real_of(stack)
    rises = _rises(stack, real.faces)
    for index in range(5):
        depth = np.linspace(0.0, real.faces[index + 1] - real.faces[index], 31)
        z = real.faces[index] + depth
        x = 0.3 * np.ones_like(z)
        for place, step in zip((20.0, 26.0, 29.0, 33.0), (-0.3, 0.3, -0.3, 0.3), strict=True):
            x += step * 0.5 * (1.0 + erf((z - place) / (0.5 * math.sqrt(2.0))))
        found = real.fractions(index, depth, _seen(rises, real.faces, index))
        assert found[0, "Al"] == pytest.approx(x, abs=2e-9)  # what lies beyond reach


# --- levels ---------------------------------------------------------------------------------


def test_no_width_is_the_abrupt_stack():
    abrupt = bw.solve(two_wells(), tolerance="1e-9 eV").energies
    zero = bw.solve(two_wells(interface_width="0 nm"), tolerance="1e-9 eV").energies
    assert np.array_equal(abrupt, zero)
    shifts = [
        np.abs(bw.solve(two_wells(interface_width=w), tolerance="1e-9 eV").energies - abrupt).max()
        for w in ("0.04 nm", "0.004 nm", "0.0004 nm")
    ]
    assert shifts[2] < 1e-5 and shifts[0] > 5.0 * shifts[1] > 25.0 * shifts[2]


def test_levels_are_those_of_the_same_composition_written_by_hand():
    def fraction(depth):
        x = np.full_like(depth, 0.3)
        for place, step in zip((20.0, 26.0, 29.0, 33.0), (-0.3, 0.3, -0.3, 0.3), strict=True):
            x = x + step * 0.5 * (1.0 + erf((depth - place) / (0.5 * math.sqrt(2.0))))
        return x

    by_hand = bw.Stack([bw.Layer("53 nm", "AlxGa1-xAs", x=fraction)], substrate="GaAs", zero="GaAs")
    asked = {"tolerance": "1e-9 eV", "below": "0.2 eV"}
    expected = bw.solve(by_hand, **asked).energies
    found = bw.solve(two_wells(interface_width="0.5 nm"), **asked).energies
    assert len(found) == 2
    assert found == pytest.approx(expected, abs=4e-9)


def test_levels_of_a_segregated_well_are_those_of_muraki_s_composition():
    stack = parse_line(INDIUM, substrate="GaAs", zero="GaAs", segregation={"In": 0.7})
    monolayer = build_profile(stack.abrupt()).facts[1].monolayer

    def inside(depth):
        return 0.2 * (1.0 - 0.7 ** (depth / monolayer))

    def above(depth):
        return 0.2 * (1.0 - 0.7**20) * 0.7 ** (depth / monolayer)

    layers = [
        bw.Layer("15 nm", "GaAs"),
        bw.Layer(f"{20 * monolayer!r} nm", "InxGa1-xAs", x=inside),
        bw.Layer("60 nm", "InxGa1-xAs", x=above),
    ]
    by_hand = bw.Stack(layers, substrate="GaAs", zero="GaAs")
    asked = {"tolerance": "1e-9 eV", "at_most": 1}
    expected = bw.solve(by_hand, **asked).energies
    assert len(expected) == 1
    assert bw.solve(stack, **asked).energies == pytest.approx(expected, abs=4e-9)


@pytest.mark.parametrize("share", [0.05, 0.005])
def test_little_segregation_is_the_abrupt_stack(share):
    abrupt = parse_line(INDIUM, substrate="GaAs", zero="GaAs")
    levels = bw.solve(abrupt.replace(segregation={"In": share}), tolerance="1e-9 eV", at_most=1)
    shift = float(levels.energies[0] - bw.solve(abrupt, tolerance="1e-9 eV", at_most=1).energies[0])
    assert 0.0 < abs(shift) < 0.02 * share


def test_a_small_width_shifts_levels_as_first_order_says():
    # own numbers of one mass: int (Phi - H) dt = 0 and int t (Phi - H) dt = -s^2/2, so that a step
    # of V shifts by -s^2/2 times the slope of psi^2 there; the next order is kappa s = 0.5 %
    width = 0.01
    wall = "20 nm {edge 250 meV, mass 0.067}"
    text = f"{wall}, 8 nm {{edge 0 meV, mass 0.067}}, {wall}"
    abrupt = bw.solve(parse_line(text), tolerance="1e-11 eV")
    wide = bw.solve(parse_line(text, interface_width=f"{width} nm"), tolerance="1e-11 eV")
    h2m = 0.0380998212  # hbar^2/2m0 [eV nm^2], CODATA 2018
    for number in range(len(abrupt.energies)):
        energy = abrupt.energies[number]
        k = math.sqrt(0.067 * energy / h2m)
        kappa = math.sqrt(0.067 * (0.25 - energy) / h2m)
        half = 4.0
        inside = math.cos(k * half) if number % 2 == 0 else math.sin(k * half)
        sign = 1.0 if number % 2 == 0 else -1.0
        norm = half + sign * math.sin(2.0 * k * half) / (2.0 * k) + inside**2 / kappa
        slope = -2.0 * kappa * inside**2 / norm  # of psi^2 across the last face
        # V is 0.25 eV higher beyond: dE = 0.25 (-s^2/2) slope at each of the two faces
        expected = 2.0 * 0.25 * (-(width**2) / 2.0) * slope
        assert wide.energies[number] - energy == pytest.approx(expected, rel=0.01)


@pytest.mark.parametrize("settings", [{"interface_width": "2 nm"}, {"segregation": {"Al": 0.9}}])
def test_phase_integral_agrees_as_far_as_it_says(settings):
    # profiles that vary slowly over a wavelength; a steep one is beyond the phase integral
    stack = parse_line("25 nm Al0.3Ga0.7As, 20 nm GaAs, 25 nm Al0.3Ga0.7As", **settings)
    levels = bw.solve(stack, tolerance="1e-9 eV")
    assert levels.count_checked.all() and len(levels) == 5
    with pytest.warns(bw.BandwrightWarning):
        phase = bw.solve(stack, method="phase-integral").energies
    spacing = np.diff(levels.energies).min()
    assert np.abs(phase[:5] - levels.energies).max() < 0.1 * spacing


def test_one_and_many_agree():
    stacks = [two_wells(interface_width=w) for w in ("0.2 nm", "0.3 nm", None)]
    stacks += [
        shifted(two_wells(interface_width="0.3 nm"), "layer 2.thickness", 0.1 * k) for k in range(6)
    ]
    stacks += [two_wells(segregation={"Al": r}) for r in (0.3, 0.4)]
    for stack, levels in zip(stacks, bw.solve_many(stacks), strict=True):
        assert levels.energies == pytest.approx(bw.solve(stack).energies, abs=1e-10)
    energies = [float(levels.energies[0]) for levels in bw.solve_many(stacks)]
    assert len({round(energy, 7) for energy in energies}) == 10  # one of two is there twice


def test_copies_of_a_group_are_alike():
    repeat = parse_line(
        "9 nm Al0.3Ga0.7As, 3 x (5 nm GaAs, 9 nm Al0.3Ga0.7As)", interface_width="0.3 nm"
    )
    plain = parse_line(
        "9 nm Al0.3Ga0.7As" + 3 * ", 5 nm GaAs, 9 nm Al0.3Ga0.7As", interface_width="0.3 nm"
    )
    assert bw.solve(repeat).energies == pytest.approx(bw.solve(plain).energies, abs=1e-12)


def test_own_numbers_beside_materials():
    text = "9 nm Al0.3Ga0.7As, 6 nm GaAs {label well}, 9 nm {edge 240 meV, mass 0.09, gap 1.8 eV}"
    abrupt = parse_line(text, zero="GaAs")
    profile = build_profile(abrupt.replace(interface_width="0.3 nm"))
    sharp = build_profile(abrupt)
    assert profile.sections[0].edge.value(0.0) == sharp.sections[0].edge.value(0.0)
    assert profile.sections[-1].edge.value(1.0) == pytest.approx(0.24, abs=1e-12)
    at_face = next(s for s in profile.sections if s.layer == 2)
    assert at_face.edge.value(0.0) == pytest.approx(0.12, abs=1e-10)
    assert at_face.mass.value(0.0) == pytest.approx(
        0.5 * (0.09 + sharp.sections[1].mass.value(0.0)), abs=1e-10
    )


@pytest.mark.parametrize(
    "settings",
    [
        {"interface_width": "0.3 nm", "field": "20 kV/cm"},
        {"segregation": {"Al": 0.6}, "interface_width": "0.2 nm"},
    ],
)
@pytest.mark.parametrize(
    ("name", "step"),
    [
        ("layer 2.thickness", 1e-3), ("layer 3.composition", 1e-3), ("temperature", 0.5),
        ("flux Al", 1e-3), ("all thicknesses", 1e-3),
    ],
)  # fmt: skip
def test_gradients_follow_the_interfaces(settings, name, step):
    stack = two_wells(**settings)
    asked = {"tolerance": "1e-11 eV", "below": "0.18 eV", "at_most": 2}
    slope = bw.solve(stack, **asked).gradient([name]).energies[:, 0]
    up, down = (bw.solve(shifted(stack, name, way * step), **asked).energies for way in (1, -1))
    assert slope == pytest.approx((up - down) / (2.0 * step), rel=1e-3, abs=1e-7)


def test_factors_on_the_model_meet_those_of_the_abrupt_stack():
    names = ["masses", "offset_share", "substrate_lattice"]
    wide, abrupt = (
        bw.solve(two_wells(interface_width=w), tolerance="1e-10 eV").gradient(names).energies
        for w in ("0.005 nm", None)
    )
    assert wide == pytest.approx(abrupt, rel=2e-3)


def test_own_edges_and_doping_in_gradients():
    text = "20 nm {edge 250 meV, mass 0.09}, 8 nm {edge 10 meV, mass 0.07, donors 1e11 / cm^2}"
    stack = parse_line(f"{text}, 20 nm {{edge 250 meV, mass 0.09}}", interface_width="0.2 nm")
    gradient = bw.solve(stack, tolerance="1e-10 eV").gradient(["offsets", "layer 2.donors"])
    # all edges times a factor, counted from the lowest: E - <V> falls out of a scaled well
    assert gradient.energies[:, 1] == pytest.approx(np.zeros(len(gradient.energies)))
    assert (gradient.energies[:, 0] > 0.0).all()


def test_the_budget_says_what_interfaces_cause():
    levels = bw.solve(two_wells(interface_width="0.3 nm"), tolerance="1e-9 eV")
    abrupt = bw.solve(two_wells(), tolerance="1e-9 eV").energies
    budget = levels.lines().error_budget((2, 1))
    row = budget[budget["what"] == "interfaces"].iloc[0]
    assert row["change"] == "made abrupt"
    expected = np.diff(abrupt)[0] - np.diff(levels.energies)[0]
    assert row["shift_meV"] == pytest.approx(1e3 * expected, abs=1e-5)
    plain = bw.solve(two_wells()).lines().error_budget((2, 1))
    assert "interfaces" not in set(plain["what"])


def test_the_budget_says_where_the_abrupt_stack_has_no_such_line():
    text = "20 nm Al0.3Ga0.7As, 5.2 nm GaAs, 20 nm Al0.3Ga0.7As"
    stack = parse_line(text, segregation={"Al": 0.9}, zero="GaAs")
    budget = bw.solve(stack).lines().error_budget()
    assert (budget["what"] == "interfaces").sum() == 1


# --- written forms --------------------------------------------------------------------------


def test_every_written_form_keeps_the_interfaces():
    stack = parse_line(
        "9 nm GaAs, 5 nm In0.2Ga0.8As {interface_width 0.25 nm, label well}, 9 nm GaAs",
        interface_width="3 Å", segregation={"In": 0.8},
    )  # fmt: skip
    assert stack.layers[1].interface_width == 0.25
    assert stack.interface_width == 0.3
    assert stack.segregation == (("In", 0.8),)
    assert loads(dumps(stack)) == stack
    assert "segregation = { In = 0.8 }" in dumps(stack)
    settings = {"interface_width": "0.3 nm", "segregation": {"In": "80 %"}}
    assert parse_line(line_text(stack), **settings) == stack
    frame = frame_from_stack(stack)
    assert frame["interface_width_nm"].tolist()[1] == 0.25
    assert stack_from_frame(frame, **settings) == stack
    names = {"Stack": bw.Stack, "Layer": bw.Layer}
    assert eval(repr(stack), names) == stack
    assert stack.layers[1].reversed().interface_width == 0.25
    assert not stack.abrupt().realistic and stack.realistic
    assert stack.abrupt() == parse_line("9 nm GaAs, 5 nm In0.2Ga0.8As {label well}, 9 nm GaAs")


def test_reports_say_how_interfaces_are():
    stack = two_wells(interface_width="0.3 nm", segregation={"Al": 0.1})
    said = dict(facts(bw.solve(stack, at_most=1)))["interfaces"]
    assert said.startswith("error functions of standard deviation 0.3 nm; Al segregates, 0.1")
    own = parse_line("9 nm AlAs, 5 nm GaAs {interface_width 0.2 nm}, 9 nm AlAs")
    assert dict(facts(bw.solve(own)))["interfaces"] == "some with a width of their own"
    assert "interfaces" not in dict(facts(bw.solve(two_wells())))


def test_zero_is_that_of_the_abrupt_stack():
    narrow = "9 nm AlAs, 1 nm GaAs {label well}, 9 nm AlAs"
    for zero, words in ((None, "the lowest band edge of the stack"), ("well", "the first-grown")):
        sharp = build_profile(parse_line(narrow, zero=zero))
        wide = build_profile(parse_line(narrow, zero=zero, interface_width="0.3 nm"))
        assert wide.zero.startswith(words) and wide.zero.endswith(", were its interfaces abrupt")
        assert wide.sections[0].edge.value(0.0) == sharp.sections[0].edge.value(0.0)
        assert wide.numbers.lowest.min() > 0.01  # nowhere GaAs any more
    named = build_profile(parse_line(narrow, zero="GaAs", interface_width="0.3 nm"))
    assert named.zero == "the conduction edge of GaAs"


def test_a_group_becomes_abrupt_too():
    stack = parse_line("2 x (5 nm GaAs {interface_width 0.2 nm}, 5 nm AlAs)")
    assert stack.realistic and not stack.abrupt().realistic


# --- what is refused ------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("settings", "text"),
    [
        ({"interface_width": "-0.3 nm"}, r"interface_width: got '-0.3 nm'; a standard deviation"),
        ({"interface_width": 0.3}, r"interface_width: got 0.3; write"),
        ({"segregation": {"In": 0.8}}, r"segregation: no layer has 'In'"),
        ({"segregation": {"Al": 1.0}}, r"segregation of Al: got 1.0; the share that stays"),
        ({"segregation": {"Al": 1.5}}, r"segregation of Al: got 1.5"),
        ({"segregation": {"Al": -0.1}}, r"segregation of Al: got -0.1"),
        ({"segregation": 0.8}, r"segregation: got 0.8; write elements with their shares"),
    ],
)
def test_bad_words_are_refused(settings, text):
    with pytest.raises((StackError, QuantityError), match=text):
        two_wells(**settings)


def test_a_negative_width_of_a_layer_is_refused():
    with pytest.raises(StackError, match=r"layer 1 \(GaAs\).*interface_width: got '-1 nm'"):
        parse_line("9 nm GaAs {interface_width -1 nm}")


@pytest.mark.parametrize(
    ("stack", "text"),
    [
        (("3 nm GaAs, 3 nm AlAs", {"interface_width": "1.5 nm"}), "less than a 6th of the whole"),
        (("9 nm GaAs, 1 nm AlxGa1-xAs {x 0 to 1}, 9 nm GaAs",
          {"interface_width": "0.9 nm"}), "spread (Al|Ga) to a fraction of"),
        (("9 nm Al0.3Ga0.7As, 6 nm In0.2Ga0.8As, 3 nm Al0.3Ga0.7As, 20 nm GaAs",
          {"segregation": {"In": 0.85, "Ga": 0.2}}), "spread Al to a fraction of -0.0"),
        (("9 nm GaAs, 5 nm In0.2Ga0.8As, 9 nm {edge 0.1 eV, mass 0.1, gap 1.5 eV}",
          {"segregation": {"In": 0.8}, "zero": "GaAs"}), "own numbers hold no elements"),
        ((INDIUM, {"segregation": {"In": 0.8}, "ends": "periodic"}), "nothing is grown first"),
        (("1 nm GaAs, 5 nm In0.2Ga0.8As, 9 nm GaAs",
          {"segregation": {"In": 0.8}, "interface_width": "0.3 nm"}), "6th of the first"),
        (("9 nm ZnSe, 9 nm GaAs", {"interface_width": "0.3 nm"}), "no material file"),
    ],
)  # fmt: skip
def test_what_cannot_be_built_is_said(stack, text):
    line, settings = stack
    with pytest.raises(BandwrightError, match=text):
        build_profile(parse_line(line, **settings))


def test_a_callable_does_not_segregate():
    layer = bw.Layer("8 nm", "InxGa1-xAs", x=lambda depth: 0.1 + 0.0 * depth)
    stack = bw.Stack([bw.Layer("9 nm", "GaAs"), layer], segregation={"In": 0.8})
    with pytest.raises(StackError, match="one here is a callable"):
        build_profile(stack)


def test_sites_that_nothing_fills_are_said():
    stack = parse_line(
        "9 nm Al0.3Ga0.7As, 5 nm InAs, 9 nm Al0.3Ga0.7As, 9 nm InAs", segregation={"In": 0.5}
    )
    with pytest.raises(StackError, match="Al and Ga fill sites where none of them arrives"):
        build_profile(stack)


def test_a_width_beyond_a_layer_is_a_caution():
    stack = parse_line("9 nm AlAs, 0.4 nm GaAs, 9 nm AlAs, 9 nm GaAs", interface_width="0.5 nm")
    with pytest.warns(bw.BandwrightWarning, match="thinner than an interface_width of 0.5 nm"):
        levels = bw.solve(stack)
    assert not any("interface_width" in text for text in bw.solve(stack.abrupt()).cautions)
    assert any("layer 2 (GaAs): thinner" in text for text in levels.cautions)


def test_mixtures_with_an_edge_of_their_own_are_refused(tmp_path):
    path = tmp_path / "odd.toml"
    path.write_text(ODD, encoding="utf-8")
    stack = parse_line("9 nm Al0.3Ga0.7As, 9 nm GaAs", materials=path, interface_width="0.3 nm")
    with pytest.raises(StackError, match="meV away from that of its mixture"):
        build_profile(stack)


def test_elements_of_a_formula_that_is_none():
    assert elements("GaAs") == ("Ga", "As")
    layers = [bw.Layer("9 nm", "Nothing"), bw.Layer("9 nm", "InAs")]
    assert bw.Stack(layers, segregation={"In": 0.5}).segregation == (("In", 0.5),)
