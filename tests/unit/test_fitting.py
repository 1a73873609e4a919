"""Fit of a wafer: factors come back, errors are those of Cramer and Rao, mistakes are one line.

Every stack and datum here is invented; "measured" data are computed, with noise of a known seed.
"""

import math
import pickle
import re

import numpy as np
import pytest
import scipy.stats

import bandwright as bw
from bandwright.errors import (
    GrowthError,
    QuantityError,
    ResultsError,
    SolveError,
    StackError,
    UnknownName,
)
from bandwright.fitting import measured_of
from bandwright.fitting.apart import correlation, told
from bandwright.metrics import line_between
from bandwright.parameters import replace
from bandwright.report.fitted import fit_object, layer_columns

pytestmark = pytest.mark.filterwarnings("ignore::bandwright.BandwrightWarning")

PAIRS = bw.parse_line(
    "9 nm In0.52Al0.48As, 3 x (6.4 nm In0.53Ga0.47As {label well}, 9 nm In0.52Al0.48As"
    " {label wall})",
    substrate="InP", temperature="290 K",
)  # fmt: skip
TRUE = {"flux Al": 1.008, "flux Ga": 0.985, "flux In": 1.012}
WELL = bw.parse_line("20 nm Al0.3Ga0.7As, 8 nm GaAs {label well}, 20 nm Al0.3Ga0.7As",
                     substrate="GaAs", temperature="77 K")  # fmt: skip
OWN = bw.parse_line("20 nm {edge 250 meV, mass 0.092}, 10 nm {edge 0 meV, mass 0.067, label well},"
                    " 20 nm {edge 250 meV, mass 0.092}")  # fmt: skip


def grown(stack, factors):
    for name, factor in factors.items():
        stack = replace(stack, name, factor)
    return stack


def single(design):
    """Return one well of PAIRS: lines of one period are not split."""
    layers = design.layers[1].layers
    return design.replace(layers=[design.layers[0], *layers])


STAGE = single(PAIRS)
LINES = [((2, 1), 290.0), (("continuum", 1), 290.0), ((2, 1), 77.0)]
ERRORS = np.array([20.0, 10.0, 20.0, 0.01, 40.0])  # nm, nm, nm, nm, ppm


def exact(factors, stack=STAGE):
    """Return what would be measured of a wafer: three lines, period, mean mismatch."""
    wafer = grown(stack, factors)
    found = []
    for pair, kelvin in LINES:
        levels = bw.solve(wafer.replace(temperature=f"{kelvin} K"), tolerance="1e-10 eV")
        found.append(line_between(levels, pair, dipole=False).wavelength_um * 1e3)
    pattern = bw.xray_pattern(wafer)
    return np.array([*found, pattern.period_nm, pattern.mean_mismatch_ppm])


def data_of(values):
    values = [float(value) for value in values]
    lines = [
        bw.MeasuredLine(f"{value!r} nm", f"{error} nm", pair, f"{kelvin} K")
        for value, error, (pair, kelvin) in zip(values, ERRORS, LINES, strict=False)
    ]
    return bw.Measured(lines, period=f"{values[3]!r} nm", period_error=f"{ERRORS[3]} nm",
                       mismatch_ppm=values[4], mismatch_error=float(ERRORS[4]))  # fmt: skip


def test_factors_come_back_in_few_solves():
    found = bw.fit(STAGE, data_of(exact(TRUE)))
    assert found.names == ("flux In", "flux Al", "flux Ga")
    assert found.values == pytest.approx([TRUE[name] for name in found.names], abs=1e-6)
    assert found.solves < 30  # of three factors to five data at two temperatures
    assert found.freedom == 2 and found.apart == ()
    assert found.chi_square < 1e-6 and found.probability == pytest.approx(1.0, abs=1e-6)


def test_real_interfaces_are_fitted_too():
    real = STAGE.replace(interface_width="0.4 nm")
    found = bw.fit(real, data_of(exact(TRUE, real)))
    assert found.values == pytest.approx([TRUE[name] for name in found.names], abs=1e-6)
    assert found.solves < 30


def test_solves_are_counted(monkeypatch):
    from bandwright.fitting import model

    counted = []
    real = model.solve
    monkeypatch.setattr(model, "solve", lambda *a, **k: counted.append(1) or real(*a, **k))
    found = bw.fit(STAGE, data_of(exact(TRUE)))
    assert found.solves == len(counted) > 2


def test_slopes_and_covariance_are_those_of_solved_designs():
    """Central differences of whole solves against the exact slopes, at the wafer as fitted."""
    found = bw.fit(STAGE, data_of(exact(TRUE)))
    slopes = np.zeros((5, 3))
    for place, name in enumerate(found.names):
        step = 1e-4
        ends = [exact({**TRUE, name: TRUE[name] + s}) for s in (step, -step)]
        slopes[:, place] = (ends[0] - ends[1]) / (2 * step) / ERRORS
    # differences: 1e-10 eV over a step of 1e-4, 1e-4 of a line; curvature is of that size as well
    covariance = np.linalg.inv(slopes.T @ slopes)
    assert found.covariance == pytest.approx(covariance, rel=1e-3)
    assert found.correlations == pytest.approx(
        covariance / np.sqrt(np.outer(np.diag(covariance), np.diag(covariance))), abs=1e-3
    )


def test_errors_reach_the_width_of_cramer_and_rao():
    """60 wafers, each with noise of its errors, seed 7.

    Q = sum of (found - true)^T C^-1 (found - true) is chi-square of 3 x 60 if the estimate is
    efficient and unbiased: no unbiased estimate is narrower (H. Cramer, Mathematical Methods of
    Statistics, 1946, section 32.3), and a wider one would show. Bounds leave out 1e-4 of each side.
    """
    draws = 60
    truth = exact(TRUE)
    generator = np.random.default_rng(7)
    bound = np.linalg.inv(bw.fit(STAGE, data_of(truth)).covariance)
    names = ("flux In", "flux Al", "flux Ga")
    off, chi = [], []
    for noise in generator.standard_normal((draws, 5)):
        found = bw.fit(STAGE, data_of(truth + noise * ERRORS))
        assert found.names == names and found.solves < 30
        off.append(found.values - [TRUE[name] for name in names])
        chi.append(found.chi_square)
    off = np.array(off)
    width = np.einsum("ni,ij,nj->", off, bound, off)
    low, high = scipy.stats.chi2.ppf([1e-4, 1 - 1e-4], 3 * draws)
    assert low < width < high
    low, high = scipy.stats.chi2.ppf([1e-4, 1 - 1e-4], 2 * draws)
    assert low < sum(chi) < high
    mean = off.mean(axis=0)  # unbiased: chi-square of 3 with the covariance of a mean
    assert draws * mean @ bound @ mean < scipy.stats.chi2.ppf(1 - 1e-4, 3)


def test_corrected_stack_grows_into_the_design():
    found = bw.fit(STAGE, data_of(exact(TRUE)))
    again = grown(found.corrected, dict(zip(found.names, found.values, strict=True)))
    for layer, wanted in zip(again.layers, STAGE.layers, strict=True):
        assert layer.thickness.value == pytest.approx(wanted.thickness.value, rel=1e-9)
    pattern, design = bw.xray_pattern(again), bw.xray_pattern(STAGE)
    assert pattern.mean_mismatch == pytest.approx(design.mean_mismatch, rel=1e-6)
    assert found.table["to_set"].to_numpy() == pytest.approx(1 / found.values)


def test_sheet_of_the_next_run_brings_the_design():
    """Cells that give 1.012, 0.985 and 1.008 of their rates grow each layer in its time."""
    found = bw.fit(STAGE, data_of(exact(TRUE)))
    old = bw.Calibrations(
        [bw.Cell("In1", "In", "0.53 ML/s", "InP"), bw.Cell("Ga2", "Ga", "0.436 ML/s", "GaAs"),
         bw.Cell("Al2", "Al", "0.455 ML/s", "GaAs")], note="invented",
    )  # fmt: skip
    sheet = found.sheet(old)
    assert sheet == bw.growth_sheet(STAGE, found.calibrations(old))
    rates = {cell.element: cell.rate.value for cell in found.calibrations(old).cells}
    assert rates == pytest.approx({"In": 0.53 * 1.012, "Ga": 0.436 * 0.985, "Al": 0.455 * 1.008},
                                  rel=2e-6)  # fmt: skip
    assert found.calibrations(old).note == "invented; rates corrected by the fit of a wafer"
    alloys = bw.Calibrations(alloys=[bw.AlloyRate("In0.53Ga0.47As", "0.5 nm/s")])
    with pytest.raises(GrowthError, match=r"^alloy 'In0\.53Ga0\.47As': its rate is that of the"):
        found.sheet(alloys)
    with pytest.raises(UnknownName, match="'Al'"):
        found.sheet(bw.Calibrations([bw.Cell("In1", "In", "0.53 ML/s", "InP"),
                                     bw.Cell("Ga2", "Ga", "0.436 ML/s", "GaAs")]))  # fmt: skip


def test_sheet_of_alloys_and_of_single_layers():
    wafer = grown(WELL, {"all thicknesses": 1.03, "well.thickness": 1.03 * 8.0 * 1.02})
    levels = bw.solve(wafer, tolerance="1e-10 eV")
    line = float(line_between(levels, (2, 1)).wavelength_um)
    alloys = bw.Calibrations(alloys=[bw.AlloyRate("Al0.3Ga0.7As", "0.5 nm/s"),
                                     bw.AlloyRate("GaAs", "0.4 nm/s")])  # fmt: skip
    found = bw.fit(WELL, bw.Measured([bw.MeasuredLine(f"{line} um", "20 nm", (2, 1))]),
                   ["well.thickness"])  # fmt: skip
    assert found.table.loc["well.thickness", "unit"] == "nm"
    assert found.sheet(alloys).stack == found.corrected
    assert found.values[0] == pytest.approx(1.03 * 8.0 * 1.02, rel=1e-3)  # but for the walls
    data = bw.Measured(period=f"{48.0 * 1.03} nm", period_error="0.01 nm")
    found = bw.fit(WELL, data, ["all thicknesses"])
    assert found.values == pytest.approx([1.03], rel=1e-9) and found.solves == 0
    rates = [a.rate.value for a in found.calibrations(alloys).alloys]
    assert rates == pytest.approx([0.515, 0.412], rel=1e-6)


def test_a_composition_is_found_and_set_to_the_other_side():
    stack = bw.parse_line("8 x (8 nm In0.2Ga0.8As {label well}, 10 nm GaAs)", substrate="GaAs")
    wafer = bw.xray_pattern(replace(stack, "well.composition", 0.21))
    data = bw.Measured(perpendicular_mismatch_ppm=float(wafer.perpendicular_mismatch_ppm),
                       mismatch_error=30.0)  # fmt: skip
    found = bw.fit(stack, data, ["well.composition"])
    assert found.values == pytest.approx([0.21], abs=1e-9)
    assert found.columns["to_set"] == pytest.approx([0.19], abs=1e-9)
    assert found.columns["off_percent"] == pytest.approx([1.0], abs=1e-6)
    assert found.data_columns["datum"] == ["mismatch along growth"]
    assert "X-ray" not in str(found) and found.probability is None
    assert "as many data as factors" in found.goodness


def test_a_smooth_grade_is_fitted_by_both_its_fluxes():
    stack = bw.parse_line("30 nm Al0.24Ga0.76As, 3 nm AlxGa1-xAs {x 0.24 to 0, grading quadratic},"
                          " 4 nm GaAs, 30 nm Al0.24Ga0.76As", substrate="GaAs",
                          temperature="77 K")  # fmt: skip
    one, other = (grown(stack, {a: TRUE[a], b: TRUE[b]})
                  for a, b in (("flux Al", "flux Ga"), ("flux Ga", "flux Al")))  # fmt: skip
    levels = bw.solve(one, tolerance="1e-10 eV")
    assert levels.energies == pytest.approx(
        bw.solve(other, tolerance="1e-10 eV").energies, abs=2e-9
    )
    pairs = [("continuum", 1), (2, 1)]
    lines = [bw.MeasuredLine(f"{float(line_between(levels, p).wavelength_um):.10f} um", "10 nm", p)
             for p in pairs]  # fmt: skip
    found = bw.fit(stack, bw.Measured(lines))
    expected = [TRUE[name] for name in found.names]
    assert found.values == pytest.approx(expected, abs=2e-5)
    columns = layer_columns(found)
    assert columns["designed"][1] == "AlxGa1-xAs {x 0.24 to 0}"
    al = 0.24 / TRUE["flux Al"], 0.76 / TRUE["flux Ga"]  # atoms that a flat layer gets
    assert columns["to_set"][1] == f"AlxGa1-xAs {{x {al[0] / sum(al):.5g} to 0}}"
    assert columns["to_set"][0] == f"Al{al[0] / sum(al):.5g}Ga{al[1] / sum(al):.5g}As"
    assert columns["thickness_to_set"][2] == f"{4 / TRUE['flux Ga']:.6g} nm"


def test_the_strongest_line_is_looked_up_once():
    found = bw.fit(WELL, bw.Measured([bw.MeasuredLine("12 um", "20 nm")]), ["all thicknesses"])
    strongest = bw.solve(WELL).lines().strongest
    assert found.model.pairs == [(strongest.upper, strongest.lower)]
    assert found.data.index[0] == f"strongest, {strongest.name}, 77 K"
    assert found.data["fitted"].iloc[0] == pytest.approx(12.0, abs=1e-6)


# -- what data leave open ---------------------------------------------------------------------


def test_fluxes_and_all_thicknesses_are_not_told_apart():
    found = bw.fit(STAGE, data_of(exact(TRUE)), [*TRUE, "all thicknesses"])
    (text,) = found.apart
    assert text.startswith("flux Al, flux Ga, flux In and all thicknesses can't be told apart")
    assert "a singular value below 1e-06 of the largest" in text
    assert np.all(np.isinf(found.sigmas)) and found.freedom == 2
    assert text in found.cautions and text in " ".join(str(found).split())
    # what is seen came back: the product with all thicknesses
    product = found.values[:3] * found.values[3]
    assert product == pytest.approx([TRUE[name] for name in found.names[:3]], abs=1e-6)


def test_a_close_pair_is_said_with_its_correlation():
    lines = data_of(exact(TRUE)).lines
    found = bw.fit(STAGE, bw.Measured([lines[0], lines[2]]), ["flux Ga", "all thicknesses"])
    size = found.correlations[0, 1]
    assert abs(size) > 0.95
    assert any(
        re.match(r"flux Ga and all thicknesses are hardly told apart: correlation"
                 rf" {re.escape(f'{size:+.4f}')}, beyond 0.95 in size", text)
        for text in found.apart
    )  # fmt: skip


def test_a_factor_that_no_datum_sees():
    stack = bw.parse_line("40 nm Al0.3Ga0.7As {label far}, 8 x (8 nm In0.2Ga0.8As, 10 nm GaAs)",
                          substrate="GaAs")  # fmt: skip
    data = bw.Measured(period="18.2 nm", period_error="0.01 nm", mismatch_ppm=6500,
                       mismatch_error=40)  # fmt: skip
    found = bw.fit(stack, data, ["flux Al", "flux In"])
    assert found.apart == ("flux Al: these data do not see it; leave it out, or measure what it"
                           " moves",)  # fmt: skip
    assert math.isinf(found.sigmas[0]) and math.isfinite(found.sigmas[1])
    assert found.values[0] == 1.0 and found.freedom == 1
    assert "1 degree of freedom," in found.goodness
    alone = bw.fit(stack, data, ["flux Al"])
    assert alone.values[0] == 1.0 and alone.freedom == 2


def test_combinations_by_hand():
    found = told(np.array([[1.0, 2.0, 0.0], [2.0, 4.0, 0.0], [0.0, 0.0, 0.0]]))
    assert found.unseen.tolist() == [False, False, True]
    assert found.closed.shape == (3, 1)
    assert np.abs(found.closed[:, 0]) == pytest.approx(np.array([1, 2, 0]) / math.sqrt(5))
    assert np.diag(told(np.diag([2.0, 4.0])).covariance()) == pytest.approx([1 / 4, 1 / 16])
    assert np.isnan(correlation(np.diag([np.inf, 1.0]))[0, 0])


def test_data_that_no_factor_explains_are_said():
    values = exact(TRUE)
    values[0] += 12 * ERRORS[0]
    found = bw.fit(STAGE, data_of(values))
    assert found.probability < 1e-6
    (text,) = [t for t in found.cautions if t.startswith("these factors do not explain the data")]
    assert "the farthest off is" in text and "standard deviations" in text


# -- what is refused --------------------------------------------------------------------------

LINE = bw.MeasuredLine("10 um", "20 nm", (2, 1))


@pytest.mark.parametrize(
    ("stack", "data", "factors", "error", "says"),
    [
        (WELL, bw.Measured([LINE]), None, StackError,
         r"^measured: 1 datum for 2 factors \(flux Al, flux Ga\); name fewer, or measure more$"),
        (WELL, bw.Measured([bw.MeasuredLine("10 um", "20 nm", (9, 1))]), ["flux Ga"], StackError,
         r"^measured, line 1: the design has no line 9 to 1: it has 2 levels$"),
        (WELL.replace(field="10 kV/cm"), bw.Measured([bw.MeasuredLine("9 um", "1 nm",
         ("continuum", 1))]), ["flux Ga"], StackError,
         r"no line continuum to 1: .* and an onset takes an open end without a field$"),
        (bw.parse_line("20 nm Al0.3Ga0.7As, 2 nm GaAs, 20 nm Al0.3Ga0.7As", substrate="GaAs"),
         bw.Measured([bw.MeasuredLine("9 um", "1 nm")]), ["flux Ga"], StackError,
         r"^measured, line 1: the design has no line between two levels: it has 1 level$"),
        (OWN, bw.Measured([LINE]), None, StackError,
         r"^factors: no layer is of a material, so there is no flux to find; name 'all thick"),
        (OWN, bw.Measured([LINE]), ["flux Ga"], UnknownName, r"^flux Ga: no layer of a material"),
        (WELL, bw.Measured([LINE]), ["flux G"], UnknownName, r"did you mean 'flux Ga'"),
        (WELL, bw.Measured([LINE]), [], StackError, r"^factors: got \[\]; give a list of names"),
        (WELL, bw.Measured([LINE]), "flux Ga", StackError, r"^factors: got 'flux Ga'; give a list"),
        (WELL, bw.Measured([LINE]), ["temperature"], StackError, r"^temperature: no growth rate"),
        (WELL, bw.Measured([LINE, LINE]), ["flux Ga", "flux Ga"], StackError,
         r"^flux Ga: it is given twice$"),
        (WELL, bw.Measured([LINE, LINE]), ["well.thickness", "flux Ga"], StackError,
         r"^flux Ga: moves what well\.thickness moves too; name one of them$"),
        (WELL, 3, None, ResultsError, r"^measured: got 3; give Measured data, or the path of a"),
        (OWN, bw.Measured(period="9 nm", period_error="1 nm"), ["all thicknesses"], StackError,
         r"substrate"),
    ],
)  # fmt: skip
def test_mistakes_of_a_fit(stack, data, factors, error, says):
    with pytest.raises(error, match=says):
        bw.fit(stack, data, factors)


def test_a_fit_that_finds_no_end():
    data = bw.Measured([bw.MeasuredLine("60 um", "1e-3 nm", (2, 1))])
    with pytest.raises(SolveError, match=r"^no end of the fit .*a factor beyond two"):
        bw.fit(WELL, data, ["all thicknesses"])


def test_a_corrected_stack_that_can_not_be_grown():
    stack = bw.parse_line("8 x (8 nm In0.01Ga0.99As {label well}, 10 nm GaAs)", substrate="GaAs")
    wafer = bw.xray_pattern(replace(stack, "well.composition", 0.05))
    data = bw.Measured(mismatch_ppm=float(wafer.mean_mismatch_ppm), mismatch_error=30.0)
    found = bw.fit(stack, data, ["well.composition"])
    with pytest.raises(StackError, match=r"^the corrected stack can't be grown: well\.compos"):
        _ = found.corrected
    (text,) = [t for t in found.cautions if t.startswith("the corrected stack can't be grown")]
    for form in (str(found), found._repr_html_(), found.markdown()):
        assert "in place of the design:" not in form and "well.composition" in form
    assert text in " ".join(str(found).split())
    assert fit_object(found)["corrected"] is None


@pytest.mark.parametrize(
    ("arguments", "error", "says"),
    [
        (("10 meV", "1 nm"), QuantityError, r"^wavelength: got '10 meV'; that is an energy"),
        (("-10 um", "1 nm"), QuantityError, r"^wavelength: got '-10 um'; it must be above zero"),
        (("10 um", "0 nm"), QuantityError, r"^error: got '0 nm'; a standard deviation is above"),
        (("10 um", "-1 nm"), QuantityError, r"^error: got '-1 nm'; a standard deviation is above"),
        (("10 um", "1 nm", (1, 2)), StackError, r"^line: got \(1, 2\); the upper level comes"),
        (("10 um", "1 nm", (2, 1), "7 nm"), QuantityError, r"^temperature: got '7 nm'"),
    ],
)
def test_mistakes_of_a_line(arguments, error, says):
    with pytest.raises(error, match=says):
        bw.MeasuredLine(*arguments)


@pytest.mark.parametrize(
    ("arguments", "error", "says"),
    [
        ({}, ResultsError, r"^no data: give a line, an X-ray period or a mismatch$"),
        ({"period": "9 nm"}, ResultsError,
         r'^period_error: missing beside period; write for example period_error = "0\.02 nm"$'),
        ({"period_error": "9 nm"}, ResultsError, r"^period: missing beside period_error$"),
        ({"mismatch_ppm": 9}, ResultsError, r"^mismatch_error: missing beside mismatch_ppm; "),
        ({"mismatch_ppm": 9, "perpendicular_mismatch_ppm": 9}, ResultsError, r"are both given"),
        ({"mismatch_ppm": "9", "mismatch_error": 1}, QuantityError,
         r"^mismatch_ppm: got '9'; a number is due, in parts per million$"),
        ({"mismatch_ppm": math.nan, "mismatch_error": 1}, QuantityError, r"^mismatch_ppm: got nan"),
        ({"mismatch_ppm": 9, "mismatch_error": 0}, QuantityError, r"^mismatch_error: got 0; a st"),
        ({"period": "0 nm", "period_error": "1 nm"}, QuantityError, r"^period: got '0 nm'; it mu"),
        ({"period": "9 nm", "period_error": "0 nm"}, QuantityError, r"^period_error: got '0 nm'"),
    ],
)  # fmt: skip
def test_mistakes_of_measured_data(arguments, error, says):
    with pytest.raises(error, match=says):
        bw.Measured(**arguments)


GOOD = '[[line]]\nwavelength = "10 um"\nerror = "1 nm"\n'


@pytest.mark.parametrize(
    ("text", "error", "says"),
    [
        ("[[lines]]\n", ResultsError, r"^here: unknown key 'lines'; did you mean 'line'\?$"),
        (GOOD + "uper = 2\n", ResultsError,
         r"^here, line 1: unknown key 'uper'; did you mean 'upper'"),
        (GOOD + "[xray]\nperiods = 3\n", ResultsError,
         r"^here, \[xray\]: unknown key 'periods'; did you mean 'period'"),
        (GOOD + "[measured]\nnam = 3\n", ResultsError, r"^here, \[measured\]: unknown key 'nam'"),
        (GOOD + "upper = 2\n", ResultsError, r"^here, line 1: only upper is given; write upper"),
        ('[[line]]\nerror = "1 nm"\n', ResultsError,
         r'^here, line 1: wavelength: missing; write for example wavelength = "10\.3 um"$'),
        ('[[line]]\nwavelength = "1 um"\n', ResultsError, r"^here, line 1: error: missing; write"),
        (GOOD + GOOD.replace("um", "meV"), QuantityError,
         r"^here, line 2: wavelength: got '10 meV'; that is an energy"),
        (GOOD.replace("1 nm", "0 nm"), QuantityError, r"^here, line 1: error: got '0 nm'; a st"),
        ("line = 3\n", ResultsError, r"^here, line: got 3; begin each line with \[\[line\]\]$"),
        ("line = [3]\n", ResultsError, r"^here, line 1: got 3; write a table$"),
        ("line = \n", ResultsError, r"^here: not TOML: "),
        ("", ResultsError, r"^here: no data"),
    ],
)  # fmt: skip
def test_mistakes_of_a_file(text, error, says):
    with pytest.raises(error, match=says):
        measured_of(text, "here")


def test_files(tmp_path):
    path = tmp_path / "data.toml"
    path.write_text(
        '[measured]\nname = "invented"\n' + GOOD + 'upper = "Continuum"\nlower = 1\n'
        'temperature = "77 K"\n[xray]\nperiod = "9 nm"\nperiod_error = "0.1 nm"\n',
        encoding="utf-8",
    )
    read = bw.read_measured(path)
    line = bw.MeasuredLine("10 um", "1 nm", ("continuum", 1), "77 K")
    assert read == bw.Measured([line], period="9 nm", period_error="0.1 nm", name="invented")
    assert len(read) == 2 and line.name == "continuum to 1, 77 K"
    assert pickle.loads(pickle.dumps(read)) == read
    path.write_bytes(b"\xff")
    with pytest.raises(ResultsError, match=r"data\.toml: is not UTF-8 text"):
        bw.read_measured(path)
    with pytest.raises(ResultsError, match=r"none\.toml: can't be read: No such file"):
        bw.fit(WELL, tmp_path / "none.toml")


def test_every_form_says_the_same():
    found = bw.fit(STAGE, data_of(exact(TRUE)))
    text, page, marked = str(found), found._repr_html_(), found.markdown()
    for form in (text, page, marked):
        for said in ("flux In", "X-ray period", "2 to 1, 77 K", "degrees of freedom", "can injure"):
            assert said in form
    assert repr(found) == "<Fit: 3 factors to 5 data>"
    assert found.measured is found.model.measured and found.stack is STAGE
    assert found.grown == grown(STAGE, dict(zip(found.names, found.values, strict=True)))
