"""Formulas: what is read, what is refused and with which text."""

import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from bandwright import formula
from bandwright.errors import MaterialError

READ = [
    ("GaAs", {}, [("Ga", 1.0)], [("As", 1.0)]),
    (" Al0.28Ga0.72As ", {}, [("Al", 0.28), ("Ga", 0.72)], [("As", 1.0)]),
    ("Ga.5In.5P", {}, [("Ga", 0.5), ("In", 0.5)], [("P", 1.0)]),
    ("AlxGa1-xAs", {"x": 0.28}, [("Al", 0.28), ("Ga", 0.72)], [("As", 1.0)]),
    ("Al(x)Ga(1-x)As", {"x": 0.28}, [("Al", 0.28), ("Ga", 0.72)], [("As", 1.0)]),
    ("AlxGa1-xAs", {"x": 0}, [("Al", 0.0), ("Ga", 1.0)], [("As", 1.0)]),
    ("GaAs1-yPy", {"y": 0.2}, [("Ga", 1.0)], [("As", 0.8), ("P", 0.2)]),
    (
        "AlxInyGa1-x-yAs",
        {"x": 0.2, "y": 0.5},
        [("Al", 0.2), ("In", 0.5), ("Ga", 0.3)],
        [("As", 1.0)],
    ),
    (
        "InxGa1-xAsyP1-y",
        {"x": 0.6, "y": 0.1},
        [("In", 0.6), ("Ga", 0.4)],
        [("As", 0.1), ("P", 0.9)],
    ),
    ("Hg0.2Cd0.8Te", {}, [("Hg", 0.2), ("Cd", 0.8)], [("Te", 1.0)]),
]


@pytest.mark.parametrize(("text", "fractions", "cations", "anions"), READ)
def test_reads(text, fractions, cations, anions):
    found = formula.parse(text, **fractions)
    assert list(found.cations) == cations
    assert list(found.anions) == anions
    assert not found.graded


def test_the_rest_has_no_rounding_noise():
    assert formula.parse("AlxGa1-xAs", x=0.9) == formula.parse("Al0.9Ga0.1As")
    assert 1.0 - 0.9 != 0.1  # which is why


def test_arrays_give_arrays():
    x = np.linspace(0.0, 0.3, 4)
    found = formula.parse("AlxGa1-xAs", x=x)
    assert found.graded
    np.testing.assert_array_equal(found.fraction("Al"), x)
    np.testing.assert_array_equal(found.fraction("Ga"), 1.0 - x)
    assert found.fraction("In") == 0.0
    assert formula.text(found) == "Al(0 to 0.3)Ga(1 to 0.7)As"


def test_letters_and_elements():
    assert formula.letters("AlxInyGa1-x-yAs") == ("x", "y")
    assert formula.letters("Al0.3Ga0.7As") == ()
    assert formula.elements("AlGaAs") == ("Al", "Ga", "As")


REFUSED = [
    # the fractions of a sublattice, and what would be right
    (
        "Al0.28Ga0.62As",
        {},
        "'Al0.28Ga0.62As': Al 0.28 and Ga 0.62 add up to 0.9 instead of 1; "
        "Al0.28Ga0.72As or Al0.38Ga0.62As would",
    ),
    ("Al0.3GaAs", {}, "add up to 1.3 instead of 1; Al0.3Ga0.7As would"),
    ("Al28Ga72As", {}, "add up to 100 instead of 1; Al0.28Ga0.72As would"),
    ("AlGaAs", {}, "add up to 2 instead of 1; an alloy is written with fractions, like Al0.5Ga0.5"),
    ("GaAsP", {}, "As 1 and P 1 add up to 2 instead of 1; .* like GaAs0.5P0.5"),
    ("InGaAsyP1-y", {"y": 0.3}, "like In0.5Ga0.5AsyP1-y"),
    ("Ga0.5As", {}, "the amount of Ga is 0.5 instead of 1; Ga is alone on its sites"),
    ("AlxGaxAs", {"x": 0.2}, "add up to 0.4 instead of 1; write AlxGa1-xAs"),
    ("AlxGayAs", {"x": 0.2, "y": 0.7}, "add up to 0.9 instead of 1; write AlxGa1-xAs"),
    # outside 0 to 1
    ("AlxGa1-xAs", {"x": 1.2}, r"fraction of Al is 1.2 \(x = 1.2\); it must lie between 0 and 1"),
    ("AlxGa1-xAs", {"x": -0.1}, r"fraction of Al is -0.1 \(x = -0.1\)"),
    ("AlxInyGa1-x-yAs", {"x": 0.6, "y": 0.5}, r"of Ga is -0.1 \(x = 0.6, y = 0.5\)"),
    ("AlxGa1-xAs", {"x": np.array([0.1, 1.5])}, r"fraction of Al is 1.5 \(x = 1.5\)"),
    ("AlxGa1-xAs", {"x": float("nan")}, "a fraction must be a number between 0 and 1"),
    ("AlxGa1-xAs", {"x": float("inf")}, "a fraction must be a number between 0 and 1"),
    # letters
    ("AlxGa1-xAs", {}, "needs a value for x, for example x = 0.3"),
    ("AlxInyGa1-x-yAs", {"x": 0.1}, "needs a value for y, for example y = 0.3"),
    ("GaAs", {"x": 0.3}, "has no letters, but a value for x was given; write the letter"),
    ("AlxGa1-xAs", {"x": 0.3, "y": 0.1}, "only has x, but a value for y was given"),
    # elements
    ("GaTe", {}, "'GaTe': Te has no site in a III-V compound"),
    ("Si", {}, "'Si' sits on no sublattice of a compound; did you mean 'S'"),
    ("Ga0.5Xx0.5As", {}, "'Xx' sits on no sublattice of a compound; known are Al, As"),
    ("As", {}, r"has no cation \(an element like Ga\)"),
    ("Al0.3Ga0.7", {}, r"has no anion \(an element like As\)"),
    ("GaAsGa", {}, "names Ga twice"),
    # no formula at all
    ("gaas", {}, "can't be read from 'gaas' on; did you mean 'GaAs'"),
    ("ALGaAs", {}, "'A' sits on no sublattice of a compound; did you mean 'AlGaAs'"),
    ("Al0,3Ga0,7As", {}, "can't be read from ',3Ga0,7As' on; did you mean 'Al0.3Ga0.7As'"),
    ("6.2 nm", {}, "can't be read from '6.2 nm' on; write a formula like"),
    ("", {}, "an empty text is no formula; write one like 'GaAs'"),
    (7, {}, "a formula is text like 'Al0.28Ga0.72As', got 7"),
]


@pytest.mark.parametrize(("text", "fractions", "message"), REFUSED)
def test_refuses(text, fractions, message):
    with pytest.raises(MaterialError, match=message):
        formula.parse(text, **fractions)


def test_every_formula_an_error_proposes_can_be_read():
    for text, fractions, _ in REFUSED:
        with pytest.raises(MaterialError) as caught:
            formula.parse(text, **fractions)
        message = str(caught.value)
        if "would" in message:
            proposal = message.rpartition("; ")[2].removesuffix(" would")
            for one in proposal.split(" or "):
                formula.parse(one)


ELEMENTS = st.sampled_from(["Al", "Ga", "In"])


@given(st.lists(ELEMENTS, min_size=2, max_size=3, unique=True), st.data())
def test_text_is_read_back(cations, data):
    parts = [data.draw(st.integers(1, 400)) for _ in cations[1:]]
    fractions = [n / 1000 for n in parts]
    letters = "xy"[: len(parts)]
    pattern = "".join(f"{e}{c}" for e, c in zip(cations, letters, strict=False))
    pattern += f"{cations[-1]}1-{'-'.join(letters)}As"
    found = formula.parse(pattern, **dict(zip(letters, fractions, strict=True)))
    written = formula.text(found)
    assert formula.parse(written) == found
    assert re.fullmatch(r"([A-Z][a-z]?[\d.]*)+", written)


@given(st.floats(0.0, 1.0))
def test_any_float_is_read_back(x):
    found = formula.parse("AlxGa1-xAs", x=x)
    again = formula.parse(formula.text(found))
    assert again.fraction("Al") == pytest.approx(x, abs=1e-12)


def test_binaries_of_a_quaternary():
    shares = dict(formula.pairs(formula.parse("In0.6Ga0.4As0.1P0.9")))
    assert shares == pytest.approx({"InAs": 0.06, "InP": 0.54, "GaAs": 0.04, "GaP": 0.36})
