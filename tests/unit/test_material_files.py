"""What the loader of material files refuses, and the text that says where, what and how to mend."""

import pytest

from bandwright.errors import MaterialError
from bandwright.materials import Library
from bandwright.materials.files import Entries

SOURCES = '[sources]\nours = "invented for a test, 2026"\n'


def entries(text):
    return Entries(SOURCES + text, "house.toml")


def gaas(*lines):
    return "\n".join(["[binary.GaAs]", *lines])


def algaas(*lines):
    return "\n".join(["[alloy.AlxGa1-xAs]", *lines])


def number(quantity, content):
    return f"{quantity} = {{ {content}, source = 'ours' }}"


def test_the_texts_above_are_accepted_when_right():
    found = entries(
        gaas(
            number("c11", "value = '122.1 GPa'"),
            number("c12", "value = '56.6 GPa'"),
            number("mass", "value = 0.067, at = '0 K'"),
            number("gap", "value = '1.5 eV', valid = ['0 K', '300 K']"),
        )
        + "\n"
        + algaas(number("gap", "bowing = '0.1 eV'"))
    )
    assert found.binaries["GaAs"].numbers["c11"].value == 122.1
    assert found.binaries["GaAs"].numbers["mass"].source == "invented for a test, 2026"


NO_SOURCE = [
    (gaas("mass = { value = 0.067, at = '0 K' }"), "house.toml, binary.GaAs.mass: a number needs"),
    (gaas("mass = { value = 0.067, at = '0 K', source = '' }"), "a number needs its source; add"),
    (gaas("mass = { value = 0.067, at = '0 K', source = 3 }"), "a number needs its source; add"),
    (
        gaas("mass = { value = 0.067, at = '0 K', source = 'our' }"),
        r"source 'our' is not in the file's \[sources\]; did you mean 'ours'",
    ),
    (gaas("mass = 0.067"), "binary.GaAs.mass: got 0.067, not a number with its source; write"),
    (
        gaas("gap = { value = '1 eV', valid = ['0 K', '9 K'] }"),
        "binary.GaAs.gap: a number needs its source",
    ),
    (algaas("gap = { bowing = '0.1 eV' }"), "alloy.AlxGa1-xAs.gap: a number needs its source"),
    (algaas("direct = { range = [0.0, 0.4] }"), "alloy.AlxGa1-xAs.direct: a number needs its"),
]

KEYS = [
    ("[binery.GaAs]", "house.toml: unknown table 'binery'; did you mean 'binary'"),
    (gaas(number("masss", "value = 1")), "binary.GaAs: unknown key 'masss'; did you mean 'mass'"),
    (gaas(number("c11", "vallue = 1")), "c11: unknown key 'vallue'; did you mean 'value'"),
    (gaas("c11 = { source = 'ours' }"), "binary.GaAs.c11: has no value; add value = '122.1 GPa'"),
    (algaas("bowing = '0.1 eV'"), "alloy.AlxGa1-xAs: unknown key 'bowing'"),
    (algaas(number("gap", "bowing = '0 eV', off = 1")), "alloy.AlxGa1-xAs.gap: unknown key 'off'"),
]

UNITS = [
    (gaas(number("c11", "value = '122 eV'")), "'eV' is no unit of an elastic constant; use one of"),
    (gaas(number("c11", "value = 122.1")), "122.1 has no unit; write an elastic constant like"),
    (
        gaas(number("lattice", "value = '5.65 K'")),
        "'K' is no unit of a lattice constant; use one of nm, Å",
    ),
    (gaas(number("mass", "value = '0.067 eV', at = '0 K'")), "a mass has no unit, got '0.067 eV'"),
    (gaas(number("a_c", "value = '-7,17 eV'")), "can't read '-7,17 eV' as an energy; write it"),
    (gaas(number("a_c", "value = 'much'")), "can't read 'much' as an energy; write it like"),
    (gaas(number("a_c", "value = true")), "got True; write an energy like '1.519 eV'"),
    (
        gaas(number("gap", "form = 'linear', value = '1.5 eV', slope = '1 eV', valid = [1, 2]")),
        "binary.GaAs.gap.slope: 'eV' is no unit of an energy per temperature",
    ),
]

VALUES = [
    (
        gaas(number("c11", "value = '1221 GPa'")),
        r"'1221 GPa' can't be right: an elastic constant lies between 20 and 500 GPa; tables often "
        r"print kbar and call it GPa \(10 kbar are 1 GPa\): if so, write '1221 kbar'",
    ),
    (gaas(number("c12", "value = '566 GPa'")), "if so, write '566 kbar'"),
    (gaas(number("c11", "value = '12.21 GPa'")), r"units of 1e11 dyn/cm\^2, which is 10 GPa"),
    (
        gaas(number("c11", "value = '56 GPa'"), number("c12", "value = '122 GPa'")),
        "binary.GaAs.c12: c12 is not below c11; are the two swapped",
    ),
    (
        gaas(number("lattice", "value = '5.65 nm'")),
        "'5.65 nm' can't be right: a lattice constant lies between 0.3 and 0.9 nm",
    ),
    (gaas(number("mass", "value = -0.067, at = '0 K'")), "-0.067 can't be right: a mass lies"),
    (
        gaas(number("gap", "form = 'linear', value = '1 eV', slope = '1 eV/K', valid = [1, 2]")),
        "'1 eV/K' can't be right",
    ),
]

FORMS = [
    (
        gaas(number("gap", "form = 'varshny', value = '1.5 eV'")),
        "unknown temperature form 'varshny'; did you mean 'varshni'",
    ),
    (
        gaas(number("gap", "form = 'varshni', value = '1.5 eV', alpha = '1 meV/K'")),
        "binary.GaAs.gap: the form 'varshni' needs 'beta': beta = ",
    ),
    (gaas(number("gap", "value = '1.5 eV'")), "the form 'constant' needs 'valid', the temp"),
    (
        gaas(number("gap", "value = '1.5 eV', valid = '0 K'")),
        r"binary.GaAs.gap.valid: got '0 K'; write a pair like \[lowest, highest\]",
    ),
    (
        gaas(number("gap", "value = '1.5 eV', valid = ['9 K', '0 K']")),
        r"the range \['9 K', '0 K'\] runs downwards",
    ),
    (
        gaas(number("gap", "form = 'linear', slope = '1 meV/K'")),
        "the form 'linear' needs 'value': value = '1.519 eV'",
    ),
    (gaas(number("mass", "value = 0.067")), 'needs the temperature it holds at, like at = "0 K"'),
    (
        gaas(number("a_v", "value = '-1.16 eV'")),
        "binary.GaAs.a_v: says gap_shift = None; two signs are in use, so write the one meant",
    ),
    (
        gaas(number("a_v", "value = '-1.16 eV', gap_shift = 'plus'")),
        r"says gap_shift = 'plus'; .* \(GaAs has -1.16 eV in the first, \+1.16 eV in the second\)",
    ),
    (gaas("a_v = 3"), "binary.GaAs.a_v: got 3, not a number with its source"),
    (gaas("mass_follows_gap = 'no'"), "mass_follows_gap: got 'no'; write true or false"),
]

ROUTES = [
    (gaas("conduction_edge = 'offset'"), "unknown route 'offset'; did you mean 'valence offset'"),
    (gaas("conduction_edge = 'share'"), "the route 'share' needs partner = \"GaAs\" or the like"),
    (
        gaas("conduction_edge = 'share'", "partner = 'AlAs'"),
        "binary.GaAs: the route 'share' needs the number 'share'",
    ),
    (
        gaas("conduction_edge = 'valence offset'", "partner = 'AlAs'"),
        "the route 'valence offset' has no partner",
    ),
    (gaas(number("share", "value = 0.6")), "has 'share' but no 'conduction_edge'; it names the"),
    (algaas("partner = 'GaAs'"), "has 'partner' but no 'conduction_edge'"),
    (
        gaas("conduction_edge = 'step'", "partner = 'AlAz'", number("step", "value = '1 eV'")),
        "house.toml, binary.GaAs.partner: 'AlAz'",
    ),
]

NAMES = [
    ("[binary.'Ga0.5In0.5P']", r"'Ga0.5In0.5P' is no binary; alloys are \[alloy.AlxGa1-xAs\]"),
    ("[binary.GaXx]", "house.toml, binary.GaXx: 'GaXx': 'Xx' sits on no sublattice"),
    ("[alloy.AlGaAs]", "has no letters, .*; an alloy is named by a pattern of two binaries"),
    ("[alloy.AlxInyGa1-x-yAs]", "needs a value for y.*; an alloy is named by a pattern"),
    ("[alloy.AlxGa1-xAsxP1-x]", "does not mix two binaries"),
    (
        "[alloy.AlxGa1-xAs]\n[alloy.GaxAl1-xAs]",
        r"alloy.GaxAl1-xAs: is the alloy of \[alloy.AlxGa1-xAs\] again",
    ),
    ("[binary]\nGaAs = 3", "binary.GaAs: got 3, not a"),
]

LAWS = [
    (algaas("gap = { source = 'ours' }"), "give one of bowing = C for mean - C x"),
    (
        algaas(number("gap", "bowing = '1 eV', polynomial = ['1 eV'], at = '0 K'")),
        "alloy.AlxGa1-xAs.gap: give one of bowing",
    ),
    (algaas(number("gap", "bowing = []")), "the polynomial is empty"),
    (
        algaas(number("gap", "polynomial = ['1 eV']")),
        'needs the temperature it holds at, like at = "300 K"',
    ),
    (
        algaas(number("gap", "bowing = '1 eV', at = '0 K'")),
        "a bowing holds at every temperature; leave 'at' out",
    ),
    (
        algaas("conduction_edge = 'share'", "partner = 'GaAs'", number("share", "bowing = 0.1")),
        "a share has no bowing; write value or polynomial",
    ),
    (
        algaas("direct = { source = 'ours' }"),
        "alloy.AlxGa1-xAs.direct.range: got None; write a pair",
    ),
]


@pytest.mark.parametrize(
    ("text", "message"), NO_SOURCE + KEYS + UNITS + VALUES + FORMS + ROUTES + NAMES + LAWS
)
def test_refused(text, message):
    with pytest.raises(MaterialError, match=message):
        entries(text)


def test_refused_outside_any_entry():
    with pytest.raises(MaterialError, match=r"house\.toml, sources.ours: got 'x'; a source names"):
        Entries("[sources]\nours = 'x'\n", "house.toml")
    with pytest.raises(MaterialError, match='or what you measured it on: "our own luminescence'):
        Entries("[sources]\nhouse = 'house'\n", "house.toml")
    with pytest.raises(MaterialError, match=r"write \[sources\] and lines like"):
        Entries("sources = 3\n", "house.toml")
    with pytest.raises(MaterialError, match=r"house.toml, binary: write \[binary.NAME\]"):
        Entries("binary = 3\n", "house.toml")
    with pytest.raises(MaterialError, match=r"house\.toml: is not TOML: .*line 1"):
        Entries("GaAs: 3", "house.toml")


def test_files_that_can_not_be_read(tmp_path):
    (tmp_path / "house.toml").write_bytes(b"\xff\xfe")
    with pytest.raises(MaterialError, match=r"house.toml: can't be read"):
        Library.with_files([tmp_path / "house.toml"])
    with pytest.raises(MaterialError, match=r"no such material file; did you mean 'house.toml'"):
        Library.with_files([tmp_path / "hause.toml"])
    with pytest.raises(MaterialError, match=r"there is no such material file$"):
        Library.with_files([tmp_path / "nowhere" / "house.toml"])
