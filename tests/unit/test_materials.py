"""Materials: what a composition gives, and how a user's file goes over the shipped ones.

What the loader refuses is in test_material_files.py.
"""

import os
import re
import time
import tomllib
from importlib.resources import files

import numpy as np
import pytest

from bandwright import formula
from bandwright.errors import BandwrightError, MaterialError, UnknownName
from bandwright.materials import Library
from bandwright.materials.files import Entries, shipped_index
from bandwright.materials.mixing import pattern_of

SHIPPED = Library.shipped()
HEAD = '[sources]\nours = "invented for a test, 2026"\n'
BARE = """
[binary.GaN]
lattice = { value = "4.5 Å", source = "ours" }
gap = { value = "3.3 eV", valid = ["0 K", "300 K"], source = "ours" }
mass = { value = 0.15, at = "300 K", source = "ours" }
"""


def at(text, temperature=300.0, substrate=None, library=SHIPPED, **fractions):
    return library.properties(formula.parse(text, **fractions), temperature, substrate)


def own(*texts):
    return Library(Entries(HEAD + text, f"house{n}.toml") for n, text in enumerate(texts))


# --- the shipped files ---------------------------------------------------------------------


def shipped_files():
    return [p for p in files("bandwright_materials").iterdir() if p.name.endswith(".toml")]


def test_what_is_shipped():
    names = SHIPPED.names()
    for name in ("GaAs", "AlAs", "InAs", "InP", "GaSb", "AlSb", "InSb", "GaP"):
        assert name in names
    for text in ("Al0.3Ga0.7As", "In0.5Ga0.5As", "Al0.5In0.5As", "In0.5Ga0.3Al0.2As"):
        assert at(text).gap > 0.0
    for text in ("Ga0.5In0.5P", "Ga0.5Al0.5Sb", "InAs0.9Sb0.1", "Ga0.5In0.5Sb"):
        assert at(text).gap > 0.0


@pytest.mark.parametrize("path", shipped_files(), ids=lambda p: p.name)
def test_a_shipped_file_holds_what_its_name_says(path):
    elements = frozenset(formula.elements(path.name.removesuffix(".toml")))
    entries = Entries(path.read_text(encoding="utf-8"), path.name)
    found = [frozenset(formula.elements(name)) for name in entries.binaries] + [*entries.alloys]
    assert found == [elements]


@pytest.mark.parametrize("path", shipped_files(), ids=lambda p: p.name)
def test_each_shipped_source_says_who_or_how(path):
    sources = tomllib.loads(path.read_text(encoding="utf-8"))["sources"]
    for text in sources.values():
        assert re.search(r"\b(19|20)\d\d\b", text) or "common practice" in text
        assert "Table" in text or "table" in text
        assert "from memory" in text


def test_each_binary_is_complete():
    for name in SHIPPED.catalogue.names()[0]:
        point = at(name, 300.0, "GaAs")
        assert point.x_edge is not None and point.l_edge is not None
        assert all(np.isfinite(v) for v in point[:7])


def test_reading_is_quick_and_only_what_is_asked_for_is_read():
    """Each file under 10 ms, the median of several reads."""
    for path in shipped_files():
        times = []
        for _ in range(5):
            start = time.perf_counter()
            Entries(path.read_text(encoding="utf-8"), path.name)
            times.append(time.perf_counter() - start)
        assert sorted(times)[2] < 0.010, path.name
    assert len(shipped_index()) == len(shipped_files())


def test_a_pair_without_a_file_says_what_to_add():
    with pytest.raises(UnknownName, match=r"no material file says how GaP and GaSb mix \(in"):
        at("GaP0.5Sb0.5")


# --- what a composition gives --------------------------------------------------------------


def test_floats_for_floats_and_arrays_for_arrays():
    one = at("AlxGa1-xAs", 77.0, "GaAs", x=0.3)
    assert all(type(v) is float for v in (*one[:7], one.x_edge, one.l_edge))
    assert one.direct is True
    x = np.linspace(0.0, 1.0, 11)
    many = at("AlxGa1-xAs", 77.0, "GaAs", x=x)
    for name in ("edge", "mass", "gap", "lattice", "monolayer", "exx", "trace", "x_edge"):
        each = [getattr(at("AlxGa1-xAs", 77.0, "GaAs", x=v), name) for v in x]
        np.testing.assert_allclose(getattr(many, name), each, rtol=1e-13, atol=1e-15)
    assert many.direct.tolist() == [at("AlxGa1-xAs", 77.0, "GaAs", x=v).direct for v in x]


def test_quaternaries_meet_their_ternaries_and_are_smooth_there():
    for text, thin in (
        ("Al0.3Ga0.7As", "Al0.3Ga0.699999In1e-6As"),
        ("In0.6Ga0.4As", "Al1e-6In0.6Ga0.399999As"),
        ("InAs0.6P0.4", "In0.999999Ga1e-6As0.6P0.4"),
    ):
        for name in ("edge", "gap", "mass", "lattice"):
            assert getattr(at(thin), name) == pytest.approx(getattr(at(text), name), abs=2e-5)


def test_a_quaternary_is_the_sum_over_pairs():
    """InGaAlAs at 0 K: the mean of three gaps less three bowings, by hand."""
    al, ga, indium = 0.2, 0.3, 0.5
    mean = al * 3.099 + ga * 1.519 + indium * 0.417
    x = 0.5 * (1.0 + al - ga)  # where the bowing of AlGaAs is taken
    bowings = al * ga * (-0.127 + 1.310 * x) + ga * indium * 0.477 + al * indium * 0.70
    assert at("Al0.2Ga0.3In0.5As", 0.0).gap == pytest.approx(mean - bowings, abs=1e-12)


def test_both_sublattices_mixed():
    """In0.8Ga0.2As0.4P0.6 at 0 K: four binaries, four pairs."""
    x, y = 0.8, 0.4
    gap_p = 2.886
    mean = x * y * 0.417 + x * (1 - y) * 1.4236 + (1 - x) * y * 1.519 + (1 - x) * (1 - y) * gap_p
    bowings = x * (1 - x) * (y * 0.477 + (1 - y) * 0.65) + y * (1 - y) * (x * 0.10 + (1 - x) * 0.19)
    assert at("In0.8Ga0.2As0.4P0.6", 0.0).gap == pytest.approx(mean - bowings, abs=1e-12)


def test_the_order_of_the_elements_does_not_matter():
    assert at("Ga0.7Al0.3As").edge == pytest.approx(at("Al0.3Ga0.7As").edge, abs=1e-15)
    assert at("AlxGa1-xAs", x=0.0) == at("GaAs")


def test_mass_follows_the_gap():
    warm, cold = at("GaAs", 300.0), at("GaAs", 0.0)
    assert cold.mass == 0.067
    assert warm.mass == pytest.approx(0.067 * warm.gap / cold.gap, rel=1e-15)
    held = at("In0.2Ga0.8As", 0.0, "GaAs")
    free = at("In0.2Ga0.8As", 0.0)
    assert held.mass / free.mass == pytest.approx(held.gap / free.gap, rel=1e-14)


def test_monolayer_is_the_strained_films():
    assert at("GaAs").monolayer == 0.5 * at("GaAs").lattice
    assert at("In0.2Ga0.8As", 300.0, "GaAs").monolayer > at("In0.2Ga0.8As").monolayer


@pytest.mark.parametrize(
    ("text", "direct"), [("Al0.3Ga0.7As", True), ("Al0.6Ga0.4As", False), ("AlSb", False)]
)
def test_direct_or_not(text, direct):
    point = at(text)
    assert point.direct is direct
    assert any("indirect gap" in c for c in point.cautions) is not direct


def test_indirect_says_how_far_and_that_strain_is_left_out():
    (free,), (held,) = at("AlAs").cautions, at("AlAs", 300.0, "GaAs").cautions
    assert free == "AlAs: indirect gap; the edge at X lies 839 meV below the one at Gamma used here"
    assert held == free + " (X and L are not shifted by strain)"
    (graded,) = at("AlxGa1-xAs", x=np.linspace(0.0, 1.0, 5)).cautions
    assert "lies up to 839 meV below" in graded


def test_temperature_outside_a_fit():
    assert at("InAs", 300.0).cautions == ()
    (caution,) = at("InAs", 350.0).cautions
    assert caution == "InAs: its gap is fitted from 0 to 300 K, used at 350 K"


@pytest.mark.parametrize("temperature", [-1.0, float("nan"), float("inf")])
def test_impossible_temperatures(temperature):
    with pytest.raises(MaterialError, match=r"temperature is .* K; it must be 0 K or more"):
        at("GaAs", temperature)


def test_a_gap_that_closes():
    with pytest.raises(MaterialError, match=r"InAs at 300 K has a gap of -.* eV on InSb; this"):
        at("InAs", 300.0, "InSb")


@pytest.mark.parametrize(
    ("text", "error", "message"),
    [
        ("BAs", UnknownName, r"no material file has BAs; known are .*; add \[binary.BAs\]"),
        ("Ga0.9B0.1As", UnknownName, r"has BAs \(part of Ga0.9B0.1As\)"),
        ("Al0.28Ga0.62As", MaterialError, "add up to 0.9 instead of 1"),
    ],
)
def test_unknown_materials(text, error, message):
    with pytest.raises(error, match=message):
        at(text)


def test_unknown_substrates():
    with pytest.raises(UnknownName, match=r"^substrate: no material file has BP; known are"):
        at("GaAs", 300.0, "BP")
    with pytest.raises(MaterialError, match=r"^substrate: 'Si' sits on no sublattice"):
        at("GaAs", 300.0, "Si")


def test_an_alloy_can_be_the_substrate():
    point = at("In0.53Ga0.47As", 300.0, "In0.53Ga0.47As")
    assert point.exx == 0.0 and point.edge == at("In0.53Ga0.47As").edge


# --- routes of the conduction edge ---------------------------------------------------------

SHARE = """
[alloy.AlxGa1-xAs]
conduction_edge = "share"
partner = "GaAs"
share = { value = 0.65, source = "ours" }
"""
STEP = """
[alloy.AlxGa1-xAs]
conduction_edge = "step"
partner = "GaAs"
step = { polynomial = ["0 eV", "0.8 eV"], valid = [0.0, 0.4], source = "ours" }
"""


def test_route_by_share():
    house = own(SHARE)
    for x in (0.1, 0.3):
        well, barrier = (at("AlxGa1-xAs", 77.0, library=house, x=v) for v in (0.0, x))
        share = (barrier.edge - well.edge) / (barrier.gap - well.gap)
        assert share == pytest.approx(0.65, abs=1e-12)


def test_route_by_share_adds_the_layers_own_strain():
    house = own(SHARE)
    free, held = (at("Al0.3Ga0.7As", 77.0, s, house) for s in (None, "InP"))
    shipped = at("Al0.3Ga0.7As", 77.0, "InP")
    assert held.edge - free.edge == pytest.approx(shipped.edge - at("Al0.3Ga0.7As", 77.0).edge)


def test_route_by_step():
    house = own(STEP)
    well, barrier = (at("AlxGa1-xAs", 77.0, library=house, x=v) for v in (0.0, 0.3))
    assert barrier.edge - well.edge == pytest.approx(0.24, abs=1e-12)
    (caution,) = [c for c in at("Al0.5Ga0.5As", library=house).cautions if "step" in c]
    assert caution == ("Al0.5Ga0.5As: step of AlxGa1-xAs holds for a share of AlAs from 0 to 0.4")


def test_x_and_l_move_with_the_edge():
    house, text = own(SHARE), "Al0.3Ga0.7As"
    found, shipped = at(text, library=house), at(text)
    assert found.x_edge - found.edge == pytest.approx(shipped.x_edge - shipped.edge, abs=1e-12)


def test_binaries_by_different_routes_mix_by_their_valence_edges():
    house = own(
        """
[binary.AlAs]
conduction_edge = "share"
partner = "GaAs"
share = { value = 0.7, source = "ours" }
"""
    )
    alas, gaas = at("AlAs", 0.0, library=house), at("GaAs", 0.0, library=house)
    assert alas.edge - gaas.edge == pytest.approx(0.7 * (3.099 - 1.519), abs=1e-12)
    valence = 0.5 * (alas.edge - alas.gap + gaas.edge - gaas.gap)
    mixed = at("Al0.5Ga0.5As", 0.0, library=house)
    assert mixed.edge == pytest.approx(valence + mixed.gap, abs=1e-12)


def test_partners_that_run_in_a_circle():
    house = own(
        """
[binary.AlAs]
conduction_edge = "step"
partner = "GaAs"
step = { value = "1 eV", source = "ours" }
[binary.GaAs]
conduction_edge = "step"
partner = "AlAs"
step = { value = "-1 eV", source = "ours" }
"""
    )
    circle = "the conduction edge of GaAs counts from itself: GaAs from AlAs from GaAs"
    with pytest.raises(MaterialError, match=circle):
        at("GaAs", library=house)


def test_a_quaternary_says_that_it_leaves_a_ternarys_own_edge_out():
    (caution,) = at("Al0.2Ga0.3In0.5As", library=own(SHARE)).cautions
    assert "own polynomials and edge of AlxGa1-xAs serve the ternary alone" in caution


# --- own files -----------------------------------------------------------------------------


def test_an_own_file_goes_over_the_shipped_one_number_by_number():
    house = own('[binary.GaAs]\nmass = { value = 0.0655, at = "0 K", source = "ours" }\n')
    assert at("GaAs", 0.0, library=house).mass == 0.0655
    assert at("GaAs", 0.0, library=house).gap == at("GaAs", 0.0).gap
    assert at("Al0.5Ga0.5As", 0.0, library=house).mass == pytest.approx(0.5 * (0.0655 + 0.15))
    assert house.origin("GaAs") == "house0.toml over shipped"
    assert house.origin("AlAs") == SHIPPED.origin("GaAs") == "shipped"
    assert house.origin("Ga0.5Al0.5As") == "shipped"


def test_a_later_file_goes_over_an_earlier_one():
    text = '[binary.GaAs]\nmass = {{ value = {}, at = "0 K", source = "ours" }}\n'
    house = own(text.format(0.0655), text.format(0.068))
    assert at("GaAs", 0.0, library=house).mass == 0.068
    assert house.origin("GaAs") == "house1.toml over house0.toml over shipped"


def test_a_law_of_an_alloy_in_either_direction():
    """The same house law of AlGaAs, written for the share of AlAs and for that of GaAs."""
    one = own(
        """
[alloy.AlxGa1-xAs]
gap = { polynomial = ["1.424 eV", "1.247 eV"], at = "300 K", source = "ours" }
mass = { polynomial = [0.067, 0.083], at = "300 K", source = "ours" }
"""
    )
    other = own(
        """
[alloy.GaxAl1-xAs]
gap = { polynomial = ["2.671 eV", "-1.247 eV"], at = "300 K", source = "ours" }
mass = { polynomial = [0.150, -0.083], at = "300 K", source = "ours" }
"""
    )
    for x in (0.1, 0.37):
        found = at("AlxGa1-xAs", 300.0, library=one, x=x)
        assert found.gap == pytest.approx(1.424 + 1.247 * x, abs=1e-12)
        assert found.mass == pytest.approx(0.067 + 0.083 * x, abs=1e-12)
        again = at("AlxGa1-xAs", 300.0, library=other, x=x)
        assert again[:7] == pytest.approx(found[:7], abs=1e-12)
    # at another temperature the gap moves as the binaries' fits do, the mass with it
    cold, mean = (at("Al0.3Ga0.7As", 77.0, library=lib) for lib in (one, SHIPPED))
    shift = mean.gap - at("Al0.3Ga0.7As", 300.0).gap
    assert cold.gap == pytest.approx(1.424 + 1.247 * 0.3 + shift, abs=1e-12)
    assert cold.mass == pytest.approx((0.067 + 0.083 * 0.3) * cold.gap / (1.424 + 1.247 * 0.3))


def test_a_new_binary_and_its_alloy():
    house = own(
        BARE
        + """
conduction_edge = "step"
partner = "GaAs"
step = { value = "0.9 eV", source = "ours" }
[alloy.GaAs1-xNx]
gap = { bowing = ["20 eV", "-80 eV"], valid = [0, 0.03], source = "ours" }
"""
    )
    point = at("GaAs0.98N0.02", library=house)
    assert point.gap < at("GaAs").gap
    assert house.origin("GaN") == "house0.toml"
    assert "GaAs1-xNx" in house.names()
    with pytest.raises(MaterialError, match="GaN has no 'c11', needed to strain it to a substrate"):
        at("GaN", 300.0, "GaAs", house)


def test_without_x_and_l_an_alloys_direct_range_decides():
    text = BARE.replace("GaN", "BAs") + BARE.replace("GaN", "BP")
    text = text.replace('source = "ours" }\n[', 'source = "ours" }\n[')
    route = (
        'conduction_edge = "valence offset"\nvalence_offset = { value = "0 eV", source = "o u" }\n'
    )
    text = text.replace("lattice", route + "lattice")
    alloy = """
[alloy.BAs1-xPx]
gap = { bowing = "0 eV", source = "ours" }
"""
    ranged = alloy + 'direct = { range = [0.0, 0.45], source = "ours" }\n'
    house = own(text + ranged)
    assert at("BAs0.6P0.4", library=house).direct is True
    assert at("BAs0.6P0.4", library=house).cautions == ()
    point = at("BAs0.4P0.6", library=house)
    assert point.direct is False
    assert point.cautions == ("BAs0.4P0.6: indirect gap; direct for a share of BP from 0 to 0.45",)
    assert at("BAs1-xPx", library=house, x=np.array([0.1, 0.9])).direct.tolist() == [True, False]
    point = at("BAs0.4P0.6", library=own(text + alloy))
    assert point.direct is True
    assert point.cautions == ("BAs0.4P0.6: its file gives no edge at X or L; taken as direct",)


def test_a_mass_that_does_not_follow():
    fixed = "[binary.GaAs]\nmass_follows_gap = false\n"
    house = own(fixed)
    assert at("GaAs", 300.0, library=house).mass == 0.067
    with pytest.raises(MaterialError, match="the mass of GaAs does not follow the gap, that of"):
        at("Al0.3Ga0.7As", library=house)
    house = own(fixed + "[alloy.AlxGa1-xAs]\nmass_follows_gap = false\n")
    assert at("Al0.5Ga0.5As", library=house).mass == pytest.approx(0.5 * (0.067 + 0.15))


def test_the_other_convention_of_a_v_is_turned_round():
    text = """
[binary.GaAs]
a_v = {{ value = "{} eV", gap_shift = "(a_c {} a_v) Tr", source = "ours" }}
"""
    right = at("GaAs", 300.0, "InP", own(text.format("1.16", "-")))
    assert right == at("GaAs", 300.0, "InP")
    wrong = at("GaAs", 300.0, "InP", own(text.format("1.16", "+")))
    assert any("a_v is +1.16 eV in the convention (a_c + a_v) Tr" in c for c in wrong.cautions)
    assert right.cautions == ()


def test_elastic_constants_in_kbar_are_read_as_kbar():
    house = own(
        '[binary.GaAs]\nc11 = { value = "1221 kbar", source = "ours" }\n'
        'c12 = { value = "566 kbar", source = "ours" }\n'
    )
    assert at("GaAs", 300.0, "InP", house)[:7] == pytest.approx(at("GaAs", 300.0, "InP")[:7])


FORMS = [
    ('form = "linear", value = "1.5 eV", slope = "-0.3 meV/K"', 1.5 - 0.0003 * 200.0),
    ('form = "constant", value = "1500 meV"', 1.5),
    ('value = "1.5 eV"', 1.5),
    (
        'form = "varshni", value = "1.5 eV", alpha = "0.0005 eV/K", beta = "200 K"',
        1.5 - 0.0005 * 200.0**2 / 400.0,
    ),
    (
        'form = "coth", value = "1.5 eV", amplitude = "0.1 eV", theta = "164 K"',
        1.5 + 0.1 * (1.0 - 1.0 / np.tanh(164.0 / 200.0)),
    ),
]


@pytest.mark.parametrize(("form", "gap"), FORMS)
def test_temperature_forms(form, gap):
    house = own(f'[binary.GaAs]\ngap = {{ {form}, valid = ["0 K", "300 K"], source = "ours" }}\n')
    assert at("GaAs", 200.0, library=house).gap == pytest.approx(gap, abs=1e-12)
    assert at("GaAs", 0.0, library=house).gap == 1.5


def test_files_are_read_once_and_again_when_they_change(tmp_path):
    path = tmp_path / "house.toml"
    text = HEAD + '[binary.GaAs]\nmass = {{ value = {}, at = "0 K", source = "ours" }}\n'
    path.write_text(text.format(0.0655), encoding="utf-8")
    library = Library.with_files([path])
    assert library is Library.with_files([str(path)])
    assert at("GaAs", 0.0, library=library).mass == 0.0655
    path.write_text(text.format(0.0675), encoding="utf-8")
    os.utime(path, ns=(1, 1))
    assert at("GaAs", 0.0, library=Library.with_files([path])).mass == 0.0675
    assert Library.with_files([]) is Library.shipped()


@pytest.mark.parametrize(
    ("text", "material", "message"),
    [
        (BARE, "GaN", "the file of GaN has no 'conduction_edge'; name one of the routes"),
        (
            BARE + 'conduction_edge = "valence offset"\n',
            "GaN",
            "the file of GaN has no 'valence_offset', needed by the route of its conduction edge",
        ),
        (
            '[binary.GaN]\nlattice = { value = "4.5 Å", source = "ours" }\n',
            "GaN",
            "GaN: the file of GaN has no 'gap', needed by every layer",
        ),
        (
            BARE + "[alloy.GaAs1-xNx]\n",
            "GaAs0.9N0.1",
            'the file of GaAs1-xNx has no bowing of the gap; give it, or bowing = "0 eV" with',
        ),
    ],
)
def test_a_number_that_is_needed_and_missing(text, material, message):
    with pytest.raises(MaterialError, match=message):
        at(material, library=own(text))


# --- what a person is shown ----------------------------------------------------------------


def test_listing():
    rows = {row.name: row for row in SHIPPED.listing()}
    assert rows.keys() == set(SHIPPED.names())
    gaas = rows["GaAs"]
    assert (gaas.kind, gaas.direct, gaas.origin, gaas.note) == ("binary", "yes", "shipped", "")
    assert gaas.gap_eV == at("GaAs").gap and gaas.lattice_nm == SHIPPED.lattice("GaAs")
    assert rows["AlAs"].direct == "no"
    assert rows["AlxGa1-xAs"].direct == "x up to 0.41"
    assert rows["InxGa1-xP"].direct.startswith("x from 0.")
    assert rows["InxGa1-xAs"].direct == "yes"
    broken = {row.name: row for row in own(BARE).listing()}["GaN"]
    assert broken.gap_eV is None and "has no 'conduction_edge'" in broken.note


def test_show_gives_every_number_with_its_source():
    shown = SHIPPED.show("In0.2Ga0.8As", 77.0, "GaAs")
    assert shown.point == at("In0.2Ga0.8As", 77.0, "GaAs")
    assert shown.edge_route == "valence offset plus gap"
    facts = {(f.name, f.quantity): f for f in shown.facts}
    assert facts["GaAs", "gap"].value == "1.519 eV - 0.5405 meV/K T^2/(T + 204 K), 0 to 1000 K"
    assert facts["InxGa1-xAs", "a_c"].value == "bowing 2.61 eV"
    assert facts["InAs", "mass"].value == "0.026 at 0 K"
    assert all(f.source and f.origin.endswith(".toml") for f in shown.facts)
    assert {f.name for f in shown.facts} == {"InAs", "GaAs", "InxGa1-xAs"}


def test_show_says_which_file_a_number_comes_from():
    shown = own(SHARE).show("Al0.3Ga0.7As", 77.0)
    assert shown.edge_route == "share of the gap difference to GaAs"
    (share,) = [f for f in shown.facts if f.quantity == "share"]
    assert share.value == "0.65" and share.origin == "house0.toml"
    assert own(STEP).show("Al0.3Ga0.7As", 77.0).edge_route == "step from the edge of GaAs"
    (law,) = [f for f in own(STEP).show("Al0.3Ga0.7As", 77.0).facts if f.quantity == "step"]
    assert law.value == "(0 + 0.8 x) eV, x the share of AlAs, for a share of AlAs from 0 to 0.4"


def test_origin_of_a_stranger():
    with pytest.raises(UnknownName, match="no material file has 'BN'; known are"):
        SHIPPED.origin("BN")


def test_patterns():
    assert pattern_of("AlAs", "GaAs") == "AlxGa1-xAs"
    assert pattern_of("InAs", "InSb") == "InAsxSb1-x"


def test_errors_have_one_root():
    for error in (MaterialError, UnknownName):
        assert issubclass(error, BandwrightError)
