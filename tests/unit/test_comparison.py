import math
import pickle

import numpy as np
import pytest

import bandwright as bw
from bandwright import metrics
from bandwright.comparison import ENERGIES_ONLY
from bandwright.errors import QuantityError, StackError, UnknownName
from bandwright.metrics import METRICS, add_metric
from bandwright.tolerances import OfTolerance

DEFAULT = [
    "name", "levels", "upper", "lower", "wavelength_um", "energy_meV", "dipole_nm",
    "oscillator_strength", "largest_difference_meV", "thickness_nm", "reason",
]  # fmt: skip


def design(width, **arguments):
    text = f"30 nm Al0.3Ga0.7As, {width} nm GaAs, 30 nm Al0.3Ga0.7As"
    return bw.parse_line(text, **arguments)


BAD = bw.Stack([bw.Layer("30 nm", "Al0.3Ga0.6As"), bw.Layer("8 nm", "GaAs")], name="swapped")


def test_one_row_a_design_with_its_own_numbers():
    stacks = [design(8, name="thick"), design(7)]
    table = bw.compare(stacks)
    assert list(table.columns) == DEFAULT and table.index.name == "design"
    assert table.index.tolist() == [1, 2] and table["name"].tolist() == ["thick", None]
    for number, stack in enumerate(stacks, start=1):
        levels = bw.solve(stack)
        line = levels.lines().strongest
        found = table.loc[number]
        assert found["levels"] == len(levels.energies)
        for column in DEFAULT[2:8]:
            assert found[column] == getattr(line, column)
        difference = np.abs(levels.phase_integral - levels.energies).max() * 1e3
        assert found["largest_difference_meV"] == pytest.approx(difference)
        assert found["thickness_nm"] == levels.profile.thickness
        assert found["reason"] is None
    assert table["levels"].dtype == np.int64 and table["upper"].dtype == np.int64
    assert table["wavelength_um"].dtype == np.float64


def test_a_design_that_fails_keeps_its_row_with_the_reason():
    table = bw.compare([design(8), BAD, design(7)])
    assert table["reason"].notna().tolist() == [False, True, False]
    row = table.loc[2]
    assert row["name"] == "swapped" and math.isnan(row["wavelength_um"])
    assert "Al 0.3 and Ga 0.6 add up to 0.9 instead of 1" in row["reason"]
    assert "layer 1 (Al0.3Ga0.6As)" in row["reason"]
    assert table.loc[1, "wavelength_um"] > table.loc[3, "wavelength_um"]


def test_files_are_designs_and_a_missing_one_is_a_reason(tmp_path):
    path = tmp_path / "well.toml"
    bw.write_stack(design(8, name="from a file"), path)
    table = bw.compare([path, str(path), tmp_path / "gone.toml"], ["levels"])
    assert table["name"].tolist() == ["from a file", "from a file", str(tmp_path / "gone.toml")]
    assert table["levels"].tolist()[:2] == [2, 2]
    assert "gone.toml" in table.loc[3, "reason"]


def test_a_design_without_a_line_is_no_failure():
    table = bw.compare([design(3), design(8)])
    assert table["levels"].tolist() == [1, 2]
    assert math.isnan(table.loc[1, "wavelength_um"]) and table.loc[1, "reason"] is None


def test_levels_of_the_box_are_not_counted():
    stack = design(8, field="20 kV/cm", electrons_run="to surface")
    levels = bw.solve(stack)
    assert levels.of_box.any()
    assert bw.compare([stack])["levels"].tolist() == [int((~levels.of_box).sum())]


def test_chosen_metrics_and_own_ones():
    table = bw.compare([design(8)], ["frequency_THz", "wavenumber_per_cm", "cautions"])
    assert list(table.columns) == [
        "name",
        "frequency_THz",
        "wavenumber_per_cm",
        "cautions",
        "reason",
    ]
    line = bw.solve(design(8)).lines().strongest
    assert table.loc[1, "frequency_THz"] == line.frequency_THz
    own = bw.compare([design(8)], {"ground_meV": lambda solved: solved.levels.energies[0] * 1e3})
    assert own["ground_meV"].tolist() == [bw.solve(design(8)).energies[0] * 1e3]


def test_a_metric_added_by_its_column(monkeypatch):
    monkeypatch.setattr(metrics, "METRICS", dict(METRICS))
    add_metric("layers", lambda solved: len(solved.stack.grown()))
    assert bw.compare([design(8)], ["layers"])["layers"].tolist() == [3]
    with pytest.raises(StackError, match="metric 'layers' is taken; choose another name"):
        add_metric("layers", len)
    with pytest.raises(StackError, match="metric 'reason' is taken"):
        add_metric("reason", len)
    with pytest.raises(StackError, match="metric 'sigma_K': got 3; give a function"):
        add_metric("sigma_K", 3)


def test_filters_choose_which_line_is_the_strongest():
    stack = design(12)
    table = bw.compare([stack], ["upper", "lower"], window=("15 um", "30 um"))
    line = bw.solve(stack).lines(window=("15 um", "30 um")).strongest
    assert table.loc[1].tolist()[1:3] == [line.upper, line.lower]
    weak = bw.compare([stack], ["wavelength_um"], strength=1e3)
    assert math.isnan(weak.loc[1, "wavelength_um"])


def test_arguments_of_solve_are_handed_on():
    one = bw.compare([design(8)], ["energy_meV"], bands="one-band").loc[1, "energy_meV"]
    assert one == bw.solve(design(8), bands="one-band").lines().strongest.energy_meV
    assert bw.compare([design(12)], ["levels"], at_most=1)["levels"].tolist() == [1]


def test_no_designs_make_an_empty_table():
    table = bw.compare([])
    assert list(table.columns) == DEFAULT and len(table) == 0


@pytest.mark.parametrize(
    ("stacks", "says"),
    [
        (design(8), r"stacks: got Stack.*; give a list of stacks, \[stack, \.\.\.\]"),
        ("well.toml", r"stacks: got 'well.toml'; give a list of stacks"),
        (7, r"stacks: got 7; give a list of stacks"),
        ([design(8), 7], r"design 2: got 7; a Stack or a path is due"),
    ],
)
def test_what_is_no_list_of_designs(stacks, says):
    with pytest.raises(StackError, match=says):
        bw.compare(stacks)


def test_a_metric_that_does_not_exist_and_filters_that_mean_nothing():
    with pytest.raises(UnknownName, match=r"none of the name 'wavelenth_um'; did you mean"):
        bw.compare([design(8)], ["wavelenth_um"])
    with pytest.raises(QuantityError, match="window: got"):
        bw.compare([design(8)], window="8 um")
    with pytest.raises(TypeError, match="unexpected keyword"):
        bw.compare([design(8)], belw="1 eV")


def test_the_phase_integral_has_levels_but_no_lines():
    table = bw.compare([design(8), design(12)], method="phase-integral")
    assert list(table.columns) == ["name", *ENERGIES_ONLY, "reason"]
    assert table["reason"].tolist() == [None, None]
    energies = bw.solve(design(12), method="phase-integral").energies * 1e3
    assert table.loc[2, "levels"] == len(energies)
    assert table.loc[2, "level_2_meV"] == energies[1]
    asked = bw.compare([design(8)], ["dipole_nm"], method="phase-integral")
    assert "the phase integral gives energies only" in asked.loc[1, "reason"]


def test_sigma_and_yield_are_those_of_the_tolerance():
    spreads, window = {"every thickness": "0.3 ML"}, ("9 um", "10 um")
    stacks = [design(7, substrate="GaAs"), design(8, substrate="GaAs"), design(3, substrate="GaAs")]
    names = ["sigma_um", "sigma_meV", "yield_percent"]
    table = bw.compare(stacks, names, spreads=spreads, yield_window=window)
    for number, stack in enumerate(stacks[:2], start=1):
        found = bw.tolerance(stack, spreads, window=window)
        wanted = [found.sigma_um, found.sigma_meV, 100.0 * found.linear_yield]
        assert table.loc[number, names].tolist() == pytest.approx(wanted, rel=1e-12)
    assert table.loc[3, names].isna().all() and table.loc[3, "reason"] is None  # it has no line
    usual = bw.compare(stacks[:1], spreads=spreads)
    assert list(usual.columns) == [*DEFAULT[:-1], "sigma_um", "sigma_meV", "reason"]
    pickle.loads(pickle.dumps(OfTolerance("sigma_um", tuple(spreads.items()))))


def test_a_sweep_takes_sigma_as_a_metric():
    sigma = OfTolerance("sigma_um", (("every thickness", "0.3 ML"),))
    stack = bw.parse_line("30 nm Al0.3Ga0.7As, 7 nm GaAs {label well}, 30 nm Al0.3Ga0.7As",
                          substrate="GaAs")  # fmt: skip
    table = bw.sweep(stack, {"well.thickness": "7 nm..8 nm step 1 nm"}, metrics={"sigma_um": sigma})
    wanted = bw.compare([stack, design(8, substrate="GaAs")], {"sigma_um": sigma})
    assert table["sigma_um"].tolist() == pytest.approx(wanted["sigma_um"].tolist(), rel=1e-6)


def test_a_spread_that_one_design_has_not_is_its_reason():
    table = bw.compare([design(8)], ["sigma_um"], spreads={"well.thickness": "1 nm"})
    assert "no layer has the label 'well'" in table.loc[1, "reason"]


@pytest.mark.parametrize(
    ("arguments", "error", "says"),
    [
        ({"metrics": ["sigma_um"]}, StackError, "metrics: sigma_um needs spreads, such as"),
        ({"metrics": "yield_percent", "spreads": {"flux Al": "1 %"}}, StackError,
         "metrics: yield_percent needs yield_window, such as"),
        ({"yield_window": ("9 um", "10 um")}, StackError, "yield_window: a yield needs spreads"),
        ({"spreads": "0.3 ML"}, StackError, "spreads: got '0.3 ML'; give a mapping"),
        ({"spreads": {"flux Al": "1 %"}, "yield_window": ("9 um", "8 um")}, QuantityError,
         "window: got .*; write the shorter wavelength first"),
        ({"wishes": {"wavelenth_um": ("near", 10)}}, UnknownName,
         "wishes: there is none of the name 'wavelenth_um'; did you mean 'wavelength_um'"),
        ({"wishes": {"sigma_um": "small"}}, UnknownName, "wishes: there is none of the name"),
        ({"metrics": {"score": len}}, StackError, "metrics: 'score' is the name of another column"),
        ({"metrics": {"word": lambda solved: "good"}, "wishes": {"word": "large"}}, StackError,
         "wish for word: its column holds words; wish for a number"),
    ],
)  # fmt: skip
def test_what_a_comparison_can_not_do(arguments, error, says):
    with pytest.raises(error, match=says):
        bw.compare([design(8)], **arguments)


def test_wishes_rank_designs_and_make_their_columns():
    stacks = [design(6), design(7), BAD, design(8), design(3)]
    wishes = {"wavelength_um": ("near", 9.0, 3.0), "dipole_nm": "large"}
    table = bw.compare(stacks, ["levels"], wishes=wishes)
    assert list(table.columns) == [
        "name", "rank", "score", "levels", "wavelength_um", "dipole_nm", "reason"
    ]  # fmt: skip
    off = (table["wavelength_um"] - 9.0).abs()
    dipole = table["dipole_nm"]
    marks = 3.0 * (1.0 - off / off.max()) + (dipole - dipole.min()) / (dipole.max() - dipole.min())
    for number in (1, 2, 4):
        assert table.loc[number, "score"] == pytest.approx(marks[number] / 4.0, rel=1e-12)
    assert math.isnan(table.loc[3, "score"]) and math.isnan(table.loc[3, "rank"])
    assert table.loc[5, "score"] == 0.0  # no line: no wish is met
    order = table["score"].dropna().sort_values(ascending=False).index.tolist()
    assert table["rank"].dropna().sort_values().index.tolist() == order


def test_rounded_to_whole_monolayers_and_solved_again():
    stack = design(7.93, substrate="GaAs")
    levels = bw.solve(stack)
    each = [fact.monolayer for fact in levels.profile.facts]
    counts = [round(layer.thickness.value / one) for layer, one in
              zip(stack.layers, each, strict=True)]  # fmt: skip
    whole = stack.replace(layers=[
        layer.replace(thickness=f"{count} ML")
        for layer, count in zip(stack.layers, counts, strict=True)
    ])  # fmt: skip
    wanted = bw.solve(whole).lines().find(2, 1).wavelength_um
    found = bw.compare([stack, design(3)], ["rounded_wavelength_um", "wavelength_um"])
    assert found.loc[1, "rounded_wavelength_um"] == pytest.approx(wanted, rel=1e-9)
    assert abs(wanted - found.loc[1, "wavelength_um"]) > 1e-3
    assert math.isnan(found.loc[2, "rounded_wavelength_um"])
