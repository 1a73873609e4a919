"""Tolerance: spreads as written, sigma to first order, draws beside it."""

import math
import pickle

import numpy as np
import pint
import pytest

import bandwright as bw
from bandwright.errors import QuantityError, SolveError, StackError, UnknownName
from bandwright.tolerances import read_spreads
from bandwright.tolerances.drawing import Draws

#: invented: a well for 10 um, one in own numbers, two wells that talk
WELL = (
    "20 nm Al0.3Ga0.7As {label lower}, 7 nm GaAs {label well}, 20 nm Al0.3Ga0.7As {label upper}"
)
OWN = (
    "20 nm {edge 250 meV, mass 0.092}, 9 nm {edge 0 meV, mass 0.067, label well},"
    " 20 nm {edge 250 meV, mass 0.092}"
)


@pytest.fixture(scope="module")
def levels():
    return bw.solve(bw.parse_line(WELL, substrate="GaAs", temperature="77 K"))


def sigmas(levels, spreads):
    return {s.parameter.name: s.sigma for s in read_spreads(levels, spreads)}


# -- spreads ------------------------------------------------------------------------------------


def test_absolute_relative_and_in_monolayers(levels):
    monolayer = levels.profile.facts[1].monolayer
    assert sigmas(levels, {"well.thickness": "1 Å"}) == {"well.thickness": pytest.approx(0.1)}
    assert sigmas(levels, {"well.thickness": "2 %"}) == {"well.thickness": pytest.approx(0.14)}
    assert sigmas(levels, {"well.thickness": "0.5ML"})["well.thickness"] == 0.5 * monolayer
    assert sigmas(levels, {"lower.composition": "2 %"})["lower.composition"] == pytest.approx(0.006)
    assert sigmas(levels, {"lower.composition": 0.005})["lower.composition"] == 0.005
    assert sigmas(levels, {"temperature": "2 K", "field": "1 kV/cm", "flux Al": "1 %"}) == {
        "temperature": 2.0, "field": 1e-4, "flux Al": 0.01
    }  # fmt: skip
    unit = pint.UnitRegistry()
    assert sigmas(levels, {"temperature": unit.Quantity(2, "delta_degC")})["temperature"] == 2.0
    relative = sigmas(levels, {"well.thickness": unit.Quantity(2, "percent")})
    assert relative["well.thickness"] == pytest.approx(0.14)


def test_a_thickness_written_in_monolayers_takes_nm():
    levels = bw.solve(bw.parse_line(WELL.replace("7 nm", "25 ML"), substrate="GaAs"))
    monolayer = levels.profile.facts[1].monolayer
    assert sigmas(levels, {"well.thickness": "0.1 nm"})["well.thickness"] == 0.1 / monolayer
    assert sigmas(levels, {"well.thickness": "0.5 ML"})["well.thickness"] == 0.5


def test_every_one_of_a_kind_and_a_name_before_its_kind(levels):
    found = sigmas(levels, {"well.thickness": "0.2 nm", "every thickness": "0.1 nm"})
    assert found == {"lower.thickness": 0.1, "well.thickness": 0.2, "upper.thickness": 0.1}
    assert list(sigmas(levels, {"every flux": "1 %"})) == ["flux Al", "flux Ga"]
    off = {"every thickness": "0.1 nm", "lower.thickness": "0 nm", "upper.thickness": "0 nm"}
    assert list(sigmas(levels, off)) == ["well.thickness"]


def test_a_shift_is_set_after_the_ends_it_shifts():
    stack = bw.parse_line("20 nm Al0.3Ga0.7As, 9 nm AlxGa1-xAs {x 0.02 to 0.1, label g},"
                          " 20 nm Al0.3Ga0.7As", substrate="GaAs")  # fmt: skip
    spreads = {"flux Al": "1 %", "g.x_shift": 0.01, "g.x_first": 0.01, "temperature": "1 K"}
    names = [s.parameter.name for s in read_spreads(bw.solve(stack), spreads)]
    assert names == ["g.x_first", "g.x_shift", "temperature", "flux Al"]


@pytest.mark.parametrize(
    ("spreads", "error", "says"),
    [
        ({}, StackError, "spreads: nothing is spread; give at least one standard deviation"),
        ({"well.thickness": "0 nm"}, StackError, "spreads: nothing is spread"),
        ("0.3 ML", StackError, r"spreads: got '0.3 ML'; give a mapping such as"),
        ({"well.thicknes": "1 nm"}, UnknownName, "no 'thicknes'; did you mean 'thickness'"),
        ({"wall.thickness": "1 nm"}, UnknownName, "spreads, wall.thickness: no layer has"),
        ({"flux In": "1 %"}, UnknownName, "flux In: no layer of a material holds it; did you mean"),
        ({"every thicknes": "1 nm"}, UnknownName, "no thicknes; did you mean 'thickness'"),
        ({"every mass": "1 %"}, UnknownName, "every mass: the stack has no mass; known are"),
        ({"well.thickness": "-0.1 nm"}, QuantityError, "-0.1 nm'; a standard deviation can't be"),
        ({"well.thickness": "-1 %"}, QuantityError, "'-1 %'; a standard deviation can't be nega"),
        ({"well.thickness": 0.1}, QuantityError, "of well.thickness: got 0.1; write '0.1 nm"),
        ({"well.thickness": "2 K"}, QuantityError, "got '2 K'; that is a temperature"),
        ({"well.thickness": "few %"}, QuantityError, "spread of well.thickness: got 'few %'"),
        ({"field": "2 %"}, QuantityError, "of field: got '2 %', and a percentage of zero is noth"),
        ({"temperature": "2 °C"}, QuantityError, "counts from the freezing point; write a differ"),
        ({"well.thickness": "1 nm", "layer 2.thickness": "1 nm"}, StackError,
         "'well.thickness' and 'layer 2.thickness' both move layer 2; layers of one label"),
    ],
)  # fmt: skip
def test_spreads_that_mean_nothing(levels, spreads, error, says):
    with pytest.raises(error, match=says):
        bw.tolerance(levels, spreads)


def test_monolayers_that_a_layer_has_not():
    own = bw.solve(bw.parse_line(OWN))
    with pytest.raises(QuantityError, match="a layer with its own numbers has no monolayer; write"):
        bw.tolerance(own, {"every thickness": "0.3 ML"})
    text = "20 nm AlSb, 7 nm GaAs {label a}, 3 nm InAs, 7 nm AlSb {label a}"
    both = bw.solve(bw.parse_line(text, substrate="GaAs"))
    with pytest.raises(QuantityError, match="monolayers of layers 2 and 4 differ; write it in nm"):
        bw.tolerance(both, {"a.thickness": "0.3 ML"})


# -- to first order -----------------------------------------------------------------------------


def test_sigma_is_the_root_of_the_squares_of_slopes_times_spreads(levels):
    spreads = {"well.thickness": "0.1 nm", "flux Al": "1 %", "temperature": "3 K"}
    found = bw.tolerance(levels, spreads)
    gradient = levels.lines().gradient(["well.thickness", "temperature", "flux Al"])
    wanted = np.linalg.norm(gradient.wavelengths * [0.1, 3.0, 0.01], axis=1) * 1e-3
    np.testing.assert_allclose(found.table["sigma_um"], wanted, rtol=1e-12)
    assert found.sigma_um == pytest.approx(wanted[0], rel=1e-12)
    assert (found.line.upper, found.line.lower) == (2, 1)
    shares = found.shares
    assert shares["share_percent"].sum() == pytest.approx(100.0)
    assert shares["share_percent"].is_monotonic_decreasing
    assert np.linalg.norm(shares["shift_um"]) == pytest.approx(wanted[0], rel=1e-12)
    assert np.linalg.norm(shares["shift_meV"]) == pytest.approx(found.sigma_meV, rel=1e-12)
    assert shares["parameter"][0] == found.table["mostly"][0] == "well.thickness"
    assert shares["spread"][0] == "0.1 nm"


def test_what_a_layer_does_in_all(levels):
    spreads = {"well.thickness": "0.1 nm", "every composition": 0.01, "lower.thickness": "0.2 nm"}
    found = bw.tolerance(levels, spreads)
    by_name = dict(zip(found.shares["parameter"], found.shares["share_percent"], strict=True))
    by_layer = dict(zip(found.layers["layer"], found.layers["share_percent"], strict=True))
    both = by_name["lower.thickness"] + by_name["lower.composition"]
    assert by_layer["lower"] == pytest.approx(both)
    assert found.layers["layer"][0] == "well"
    assert np.linalg.norm(found.layers["sigma_um"]) == pytest.approx(found.sigma_um)


def test_yield_to_first_order_is_the_normal_share(levels):
    spreads = {"well.thickness": "0.1 nm"}
    free = bw.tolerance(levels, spreads)
    assert free.linear_yield is None and "yield_percent" not in free.estimates
    center, sigma = free.line.wavelength_um, free.sigma_um
    for low, high, share in ((-1, 1, 0.682689492), (-2, 2, 0.954499736), (0, 1, 0.341344746)):
        window = (f"{center + low * sigma!r} um", f"{center + high * sigma!r} um")
        found = bw.tolerance(levels, spreads, window=window)
        assert found.linear_yield == pytest.approx(share, abs=1e-8)
        assert found.estimates.loc["linear", "yield_percent"] == found.linear_yield * 100.0
    half = bw.tolerance(levels, spreads, window=(None, f"{center!r} um"))
    assert half.linear_yield == pytest.approx(0.5, abs=1e-9)


def test_the_line_is_the_strongest_or_the_one_named(levels):
    onset = bw.tolerance(levels.lines(), {"well.thickness": "0.1 nm"}, line=("continuum", 1))
    assert onset.line.upper == "continuum" and onset.sigma_um == onset.table["sigma_um"][1]
    in_field = bw.tolerance(levels, {"field": "1 kV/cm"}, line=("continuum", 1))
    assert math.isnan(in_field.sigma_um)
    assert "the onset has no sigma by the field" in in_field.cautions[0]
    with pytest.raises(StackError, match="there is no line 7 to 1 here"):
        bw.tolerance(levels, {"well.thickness": "0.1 nm"}, line=(7, 1))


def test_a_stack_without_a_line():
    walls = bw.parse_line("1 nm Al0.1Ga0.9As, 2 nm GaAs {label well}, 1 nm Al0.1Ga0.9As",
                          substrate="GaAs", ends=("wall", "wall"))  # fmt: skip
    with pytest.raises(StackError, match="line: the stack has none that a tolerance could be of"):
        bw.tolerance(walls, {"well.thickness": "0.1 nm"}, at_most=1)


@pytest.mark.parametrize(
    ("arguments", "error", "says"),
    [
        ({"window": ("10 um", "9 um")}, QuantityError, "write the shorter wavelength first"),
        ({"window": ("9 um", "9 um")}, QuantityError, "write the shorter wavelength first"),
        ({"window": ("80 meV", "90 meV")}, QuantityError, "window: got '80 meV'; that is an"),
        ({"window": "9 um"}, QuantityError, "window: got '9 um'; write two wavelengths"),
        ({"draws": -1}, SolveError, "draws: got -1; a whole number from 0 is due"),
        ({"draws": 1}, SolveError, "draws: got 1, which tells no sigma; ask 0 for none, or more"),
        ({"draws": 2.5}, SolveError, "draws: got 2.5; a whole number from 0 is due"),
        ({"draws": 5, "seed": -1}, SolveError, "seed: got -1; a whole number from 0 is due"),
        ({"draws": 5, "chunk": 0}, SolveError, "chunk: got 0; a whole number from 1 is due"),
        ({"bands": "one-band"}, SolveError, "bands: for a stack; these levels are solved"),
        ({"line": (1, 2)}, StackError, "the upper level comes first"),
    ],
)
def test_arguments_that_mean_nothing(levels, arguments, error, says):
    with pytest.raises(error, match=says):
        bw.tolerance(levels, {"well.thickness": "0.1 nm"}, **arguments)


def test_what_has_no_lines():
    with pytest.raises(StackError, match="tolerance: got 7; give a Stack, Levels or Lines"):
        bw.tolerance(7, {"well.thickness": "0.1 nm"})
    with pytest.raises(SolveError, match="the phase integral gives energies only"):
        bw.tolerance(bw.parse_line(OWN), {"well.thickness": "0.1 nm"}, method="phase-integral")


# -- draws --------------------------------------------------------------------------------------


def test_draws_are_the_lines_of_stacks_solved_one_by_one(levels):
    from bandwright.parameters import read, replace

    spreads = {"every thickness": "0.3 ML", "lower.composition": 0.005, "flux Ga": "1 %"}
    found = bw.tolerance(levels, spreads, draws=6, seed=3)
    for steps, wavelength in zip(found.draws.steps(), found.draws.wavelengths_um, strict=True):
        stack = levels.stack
        for spread, step in zip(found.spreads, steps, strict=True):
            name = spread.parameter.name
            stack = replace(stack, name, read(stack, name) + step)
        line = bw.solve(stack).lines().find(2, 1)
        assert wavelength == pytest.approx(line.wavelength_um, rel=1e-9)
    assert len(set(found.draws.wavelengths_um)) == 6


def test_draws_depend_on_the_seed_and_not_on_chunks(levels):
    spreads = {"well.thickness": "0.3 ML", "upper.composition": 0.005}
    one, same, other = (
        bw.tolerance(levels, spreads, draws=50, seed=seed, chunk=chunk).draws.wavelengths_um
        for seed, chunk in ((5, 2000), (5, 7), (6, 2000))
    )
    np.testing.assert_allclose(one, same, rtol=1e-9)  # 1e-10 eV
    assert not np.isclose(one, other).any()


def test_an_onset_is_drawn_too(levels):
    found = bw.tolerance(levels, {"lower.composition": 0.002, "upper.composition": 0.002},
                         line=("continuum", 1), draws=8)  # fmt: skip
    assert np.isfinite(found.draws.wavelengths_um).all() and found.draws.sigma_um > 0.0


def test_a_level_above_the_usual_range_is_drawn_too():
    stack = bw.parse_line(WELL, substrate="GaAs")
    levels = bw.solve(stack, below="0.4 eV")
    assert len(levels) > len(bw.solve(stack)) + 1
    lines = levels.lines(of_box=True)
    top = len(levels)
    found = bw.tolerance(lines, {"well.thickness": "0.05 nm"}, line=(top, 1), draws=4)
    assert np.isfinite(found.draws.wavelengths_um).all()


def test_draws_that_fail_or_have_not_the_line_are_counted_and_said(levels):
    wide = bw.tolerance(levels, {"well.thickness": "4 nm"}, draws=60, window=("8 um", "12 um"))
    draws = wide.draws
    assert draws.failed > 0 and draws.missing > 0
    assert draws.failed + draws.missing == np.isnan(draws.wavelengths_um).sum()
    assert len(draws.found) == 60 - draws.failed - draws.missing
    inside = (draws.found >= 8.0) & (draws.found <= 12.0)
    assert draws.inside(wide.window).share == inside.sum() / 60
    said = " ".join(wide.cautions)
    assert f"{draws.failed} of 60 draws failed and count as no yield: " in said
    assert "a thickness must be above zero" in said
    assert f"{draws.missing} of 60 draws have not the line and count as no yield" in said
    assert "linear propagation and draws disagree" in said


def test_reasons_that_differ_in_a_number_are_said_once():
    stack = bw.parse_line("20 nm Al0.2Ga0.8As, 8 nm AlxGa1-xAs {x 0 to 0.01, label g},"
                          " 20 nm Al0.2Ga0.8As", substrate="GaAs")  # fmt: skip
    found = bw.tolerance(stack, {"g.x_shift": 0.002}, draws=60, chunk=10)
    assert 10 < found.draws.failed < 50 and found.draws.missing == 0
    (reason,) = found.draws.reasons
    assert "a fraction lies between 0 and 1" in reason
    assert found.cautions[0].endswith(reason)


def test_a_level_that_has_changed_its_character_is_said():
    # invented: the deeper of two wells far apart changes from draw to draw
    text = ("20 nm Al0.3Ga0.7As, 7 nm GaAs {label a}, 9 nm Al0.3Ga0.7As, 6.9 nm GaAs {label b},"
            " 20 nm Al0.3Ga0.7As")  # fmt: skip
    stack = bw.parse_line(text, substrate="GaAs")
    found = bw.tolerance(stack, {"b.thickness": "0.3 nm"}, line=(3, 1), draws=40)
    steps = np.array(list(found.draws.steps()))[:, 0]
    # both wells are alike at 0.1 nm, and levels are mixtures nearby
    assert 0 < np.sum(steps > 0.11) <= found.draws.unlike <= np.sum(steps > 0.09) < 40
    said = f"in {found.draws.unlike} of 40 draws a level of that number has another character"
    assert said in found.cautions[0]
    still = bw.tolerance(stack, {"b.thickness": "0.01 nm"}, line=(3, 1), draws=40)
    assert still.draws.unlike == 0 and still.cautions == still.lines.cautions


def test_a_caution_where_the_line_is_not_linear():
    # by symmetry a field moves nothing to first order
    stack = bw.parse_line(OWN.replace("9 nm", "12 nm"), field="0 kV/cm")
    found = bw.tolerance(stack, {"field": "20 kV/cm"}, line=(2, 1), draws=40)
    assert found.sigma_meV < 1e-6 < found.draws.sigma_um
    assert "the line is not linear over these spreads" in found.cautions[0]
    assert found.shares["share_percent"].notna().all()


def test_errors_of_the_draws_are_those_of_many_repetitions():
    generator = np.random.default_rng(7)
    every = [Draws(10.0 + 0.1 * generator.standard_normal(400), 0) for _ in range(400)]
    window = (9950.0, 10200.0)
    for name, error in (("mean_um", "mean_error_um"), ("sigma_um", "sigma_error_um")):
        scatter = np.std([getattr(one, name) for one in every])
        said = np.mean([getattr(one, error) for one in every])
        # 400 repetitions tell a standard deviation to 3.5 %; three of these
        assert said == pytest.approx(scatter, rel=0.11)
    shares = [one.inside(window) for one in every]
    assert np.mean([s.error for s in shares]) == pytest.approx(
        np.std([s.share for s in shares]), rel=0.11
    )


def test_no_error_bar_vanishes_where_all_is_inside():
    all_inside = Draws(np.full(50, 10.0), 0).inside((9000.0, 11000.0))
    assert all_inside.share == 1.0 and 0.005 < all_inside.error < 0.02
    few = Draws(np.array([10.0, np.nan, np.nan]), 0)
    assert math.isnan(few.mean_um) and math.isnan(few.sigma_um) and math.isnan(few.sigma_error_um)


# -- out ----------------------------------------------------------------------------------------


def test_text_html_and_pickle(levels):
    found = bw.tolerance(levels, {"well.thickness": "0.3 ML", "flux Al": "1 %"},
                         window=("9 um", "9.6 um"), draws=30)  # fmt: skip
    text, page = str(found), found._repr_html_()
    for told in ("well.thickness", "0.3 ML", "linear", "draws", "binomial", "can injure eyes"):
        assert told in text and told in page
    assert "and its yield from 9 um to 9.6 um:" in text
    assert f"{found.linear_yield * 100:.2f}" in text
    assert "up to 9.6 um" in str(bw.tolerance(levels, {"flux Al": "1 %"}, window=(None, "9.6 um")))
    assert "from 9 um on" in str(bw.tolerance(levels, {"flux Al": "1 %"}, window=("9 um", None)))
    again = pickle.loads(pickle.dumps(found))
    assert again.sigma_um == found.sigma_um and str(again) == text
    assert repr(found) == "<Tolerance: 2 to 1, 2 spreads>"


def test_the_histogram_takes_it(levels):
    pytest.importorskip("matplotlib").use("agg")
    found = bw.tolerance(levels, {"well.thickness": "0.3 ML"}, window=("9 um", "9.6 um"), draws=30)
    told = [text.get_text() for text in found.plot().get_legend().get_texts()]
    share = found.draws.inside(found.window).share
    assert told[0].startswith(f"yield {share * 100:.1f}")
    assert any(t == f"linear, yield {found.linear_yield * 100:.1f} %" for t in told)
    with pytest.raises(SolveError, match=r"no draws to show; ask tolerance\(\.\.\., draws=2000\)"):
        bw.tolerance(levels, {"well.thickness": "0.3 ML"}).plot()
