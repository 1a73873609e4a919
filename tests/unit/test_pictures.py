"""Pictures: what stands in each, that nothing lies over anything else, and what is refused.

Structure is compared (texts, lines, fills), not pixels, which differ between versions of
matplotlib and of its fonts.
"""

import itertools
import re
import subprocess
import sys

import matplotlib
import numpy as np
import pandas as pd
import pytest
from matplotlib import pyplot

import bandwright as bw
from bandwright.errors import PictureError, QuantityError
from bandwright.pictures import band_diagram, budget_bars, save_picture, sweep_curves
from bandwright.pictures import yield_histogram as histogram
from bandwright.pictures.bands import SIDE_STROKES
from bandwright.pictures.margin import spread
from bandwright.pictures.sheet import INKS, STROKES, paper

MINUS = "\N{MINUS SIGN}"


@pytest.fixture(autouse=True)
def no_screen():
    matplotlib.use("agg")
    yield
    pyplot.close("all")


def texts_of(figure):
    """Return every text that is drawn, with its box in pixels."""
    figure.draw_without_rendering()
    renderer = figure.canvas.get_renderer()
    found = {}
    for text in figure.findobj(matplotlib.text.Text):
        if text.get_visible() and text.get_text().strip():
            # an annotation's own window extent holds its arrow as well
            found[id(text)] = text, matplotlib.text.Text.get_window_extent(text, renderer)
    ticks = {
        id(label)
        for ax in figure.axes
        for axis in (ax.xaxis, ax.yaxis)
        for tick in axis.get_major_ticks()
        for label in (tick.label1, tick.label2)
        if not tick.get_visible() or not inside(axis, tick.get_loc())
    }
    return [pair for key, pair in found.items() if key not in ticks]


def inside(axis, place):
    low, high = sorted(axis.get_view_interval())
    margin = 1e-9 * (high - low)
    return low - margin <= place <= high + margin


def assert_tidy(ax):
    """No text lies over another or leaves the paper."""
    figure = paper(ax)
    texts = texts_of(figure)
    whole = figure.bbox
    for text, box in texts:
        assert whole.x0 - 1 <= box.x0 and box.x1 <= whole.x1 + 1, f"{text.get_text()!r} is clipped"
        assert whole.y0 - 1 <= box.y0 and box.y1 <= whole.y1 + 1, f"{text.get_text()!r} is clipped"
    for (one, a), (other, b) in itertools.combinations(texts, 2):
        wide = min(a.x1, b.x1) - max(a.x0, b.x0)
        high = min(a.y1, b.y1) - max(a.y0, b.y0)
        over = wide > 1.0 and high > 1.0
        assert not over, f"{one.get_text()!r} lies over {other.get_text()!r}"
    for text, _ in texts:
        assert text.get_fontsize() >= 6.0


def named(ax, pattern):
    """Return the artists whose id fits."""
    return [a for a in ax.findobj() if a.get_gid() and re.fullmatch(pattern, a.get_gid())]


def labels(ax):
    return [a.get_text() for a in named(ax, "label")]


def legend(ax):
    return [t.get_text() for t in ax.get_legend().get_texts()]


def solve(line, **arguments):
    keys = ("below", "at_most", "group", "method", "phase_order", "bands")
    asked = {key: arguments.pop(key) for key in keys if key in arguments}
    return bw.solve(bw.parse_line(line, **arguments), **asked)


WELL = "30 nm Al0.3Ga0.7As, 7 nm GaAs {label well}, 30 nm Al0.3Ga0.7As"
STAGE = "6 nm In0.52Al0.48As" + "".join(
    f", {well} nm In0.53Ga0.47As, {barrier} nm In0.52Al0.48As"
    for well, barrier in zip(
        (2.7, 5.4, 6.4, 3.4, 2.9, 2.8, 2.7, 2.6, 2.5, 2.5, 2.4, 2.4, 2.3, 2.3, 2.2),
        (1.3, 1.1, 2.1, 1.6, 1.5, 1.4, 1.4, 1.5, 1.6, 1.7, 1.8, 1.9, 2.0, 2.1, 6.0),
        strict=True,
    )
)  # 31 layers, invented


@pytest.fixture(scope="module")
def well():
    return solve(WELL, name="a well", substrate="GaAs", zero="well")


@pytest.fixture(scope="module")
def stage():
    return solve(STAGE, substrate="InP", field="55 kV/cm", electrons_run="to surface",
                 zero="In0.53Ga0.47As", below="0.55 eV")  # fmt: skip


# -- the band diagram -----------------------------------------------------------------------


def test_each_level_stands_at_its_energy(well):
    ax = band_diagram(well)
    assert_tidy(ax)
    assert ax.get_title(loc="left") == "a well\nno field"
    assert "substrate → surface" in ax.get_xlabel() and "(nm)" in ax.get_xlabel()
    assert " ".join(ax.get_ylabel().split()) == "energy from the first-grown face of 'well' (eV)"
    assert labels(ax) == [f"{n}  {e * 1e3:.1f}" for n, e in enumerate(well.energies, 1)]
    for number, energy in enumerate(well.energies, 1):
        (level,) = named(ax, f"level {number}")
        assert level.get_ydata() == pytest.approx([energy, energy])
        assert len(named(ax, f"fill {number}")) == 1
    (edge,) = named(ax, "edge")
    assert np.ptp(edge.get_ydata()) == pytest.approx(well.profile.sample()["edge_eV"].max())
    assert legend(ax) == ["conduction edge"]


def test_all_densities_have_the_scale_that_is_told(well):
    ax = band_diagram(well)
    (told,) = [t for t, _ in texts_of(ax.figure) if "stands on its level" in t.get_text()]
    found = re.search(r"([\d.]+) /nm is ([\d.]+) meV high", told.get_text())
    unit, high = map(float, found.groups())
    assert re.fullmatch(r"[125]0*", f"{high:g}".replace("0.", "").replace(".", ""))
    for number, energy in enumerate(well.energies, 1):
        (curve,) = named(ax, f"psi {number}")
        z, y = curve.get_data()
        density = well.states.sample(z)[0][number - 1] ** 2
        assert y - energy == pytest.approx(density * high * 1e-3 / unit, abs=1e-12)


def test_outer_layers_are_cut_where_no_state_is_unless_asked(well):
    left, right = band_diagram(well).get_xlim()
    assert 0.0 < left < 30.0 and 37.0 < right < 67.0
    assert band_diagram(well, whole=True).get_xlim() == (0.0, 67.0)
    assert well.plot(whole=True).get_xlim() == (0.0, 67.0)


def test_an_axes_goes_in_and_the_same_comes_out(well):
    figure, (left, right) = pyplot.subplots(1, 2, figsize=(7, 3), layout="constrained")
    left.set_title("my own", loc="left")
    assert band_diagram(well, left) is left
    assert well.plot(ax=right) is right
    assert left.get_title(loc="left") == "my own" and right.get_title(loc="left")
    assert_tidy(left)
    assert pyplot.get_fignums() == [figure.number]


def test_a_part_of_a_figure(well):
    figure = pyplot.figure(figsize=(7, 3), layout="constrained")
    left, right = figure.subfigures(1, 2)
    ax = band_diagram(well, left.subplots())
    sweep_curves(grid([0.0], [6.0, 7.0]), right.subplots(), over="well.thickness_nm")
    assert_tidy(ax)
    assert paper(ax) is figure


def test_size(well):
    figure = well.plot(width="120 mm", height="9 cm").figure
    assert figure.get_size_inches() * 25.4 == pytest.approx([120, 90])
    figure = well.plot().figure
    assert figure.get_figwidth() * 25.4 == pytest.approx(85)


def test_a_stage_of_31_layers_in_a_field(stage):
    ax = band_diagram(stage)
    assert_tidy(ax)
    assert len(stage.profile.sections) == 31 and len(stage) >= 20
    assert len(labels(ax)) == len(stage)
    assert ax.get_title(loc="left") == "electrons run to the surface (55 kV/cm)"
    assert {"X edge", "L edge", "belongs to the box"} <= set(legend(ax))
    for number, boxed in enumerate(stage.of_box, 1):
        (curve,) = named(ax, f"psi {number}")
        assert (curve.get_linestyle() != "-") == boxed
    assert any(text.startswith(f"1  {MINUS}") for text in labels(ax))


def test_where_labels_find_no_room_some_are_named_and_the_picture_says_so(stage):
    figure, ax = pyplot.subplots(figsize=(3.3, 2.2), layout="constrained")
    band_diagram(stage, ax)
    assert_tidy(ax)
    (head,) = named(ax, "head")
    assert f"({len(labels(ax))} of {len(stage)} named)" in head.get_text()
    assert 3 < len(labels(ax)) < len(stage)
    assert len(named(ax, r"level \d+")) == len(stage)


def test_copies_stand_as_one_by_the_mean_of_their_levels():
    levels = solve("10 nm Al0.3Ga0.7As, 4 x (8 nm GaAs, 20 nm Al0.3Ga0.7As)", at_most=4)
    assert [g.stop - g.start for g in levels.groups] == [4]
    ax = band_diagram(levels)
    assert labels(ax) == [f"1–4  {np.mean(levels.energies) * 1e3:.1f}"]
    (curve,) = named(ax, "psi 1–4")
    z, y = curve.get_data()
    peaks = [y[abs(z - place) < 4].max() for place in (14, 42, 70, 98)]
    assert np.ptp(peaks) < 1e-3 * np.mean(np.array(peaks) - levels.energies[0])


def test_a_superlattice_of_ten_periods():
    levels = solve("20 nm Al0.3Ga0.7As, 10 x (7 nm GaAs, 3 nm Al0.3Ga0.7As), 17 nm Al0.3Ga0.7As")
    ax = band_diagram(levels)
    assert_tidy(ax)
    assert len(labels(ax)) == len(levels) == 20


SHORT = (
    "10 nm Al0.4Ga0.6As, 7 nm AlxGa1-xAs {x 0.4 to 0, grading quadratic},"
    " 7 nm AlxGa1-xAs {x 0 to 0.4, grading quadratic}, 10 nm Al0.4Ga0.6As"
)


def test_both_methods_are_there_where_they_differ():
    levels = solve(SHORT)
    ax = band_diagram(levels)
    assert_tidy(ax)
    assert "phase integral" in legend(ax)
    (phase,) = named(ax, "phase 1")
    energies = phase.get_ydata()
    assert np.nanmax(energies) == np.nanmin(energies) == levels.phase_integral[0]
    assert abs(levels.phase_integral[0] - levels.energies[0]) > 1e-3
    assert labels(ax)[0] == (
        f"1  {levels.energies[0] * 1e3:.1f} ({levels.phase_integral[0] * 1e3:.1f})"
    )
    (head,) = named(ax, "head")
    assert head.get_text() == "level  meV (phase)"


def test_the_phase_integral_alone_has_energies_and_no_states():
    levels = solve(SHORT, method="phase-integral")
    ax = band_diagram(levels)
    assert_tidy(ax)
    assert len(named(ax, r"phase \d")) == len(levels) and not named(ax, r"(psi|fill|level) \d")
    assert ax.get_legend().get_title().get_text() == ""


def test_x_and_l_are_drawn_only_where_they_come_near():
    far = band_diagram(solve(WELL, at_most=1))
    assert not named(far, "[XL] edge")
    ax = band_diagram(solve("12 nm Al0.5Ga0.5As, 5 nm GaAs, 12 nm Al0.5Ga0.5As"))
    assert_tidy(ax)
    (x_edge,) = named(ax, "X edge")
    (l_edge,) = named(ax, "L edge")
    (edge,) = named(ax, "edge")
    assert x_edge.get_linewidth() < 0.6 * edge.get_linewidth()
    assert x_edge.is_dashed() and l_edge.is_dashed() and not edge.is_dashed()
    assert SIDE_STROKES["X"] != SIDE_STROKES["L"]
    z, energies = x_edge.get_data()
    assert np.nanmax(energies) < edge.get_ydata().max()  # below Gamma in the barriers
    assert not np.any((z > 12.0) & (z < 17.0))  # and far above it in the well
    assert "its own" not in ax.get_legend().get_title().get_text()


def test_strained_layers_say_that_x_and_l_are_not_shifted():
    levels = solve("10 nm AlAs, 4 nm In0.2Ga0.8As, 10 nm AlAs", substrate="GaAs")
    note = band_diagram(levels).get_legend().get_title().get_text()
    assert "without their own shift by strain" in " ".join(note.split())


def test_walls_are_drawn():
    levels = solve("10 nm {edge 0 meV, mass 0.067}", ends=("wall", "wall"), at_most=3)
    ax = band_diagram(levels)
    assert_tidy(ax)
    assert len(named(ax, "wall")) == 2 and "wall" in legend(ax)
    tops = [named(ax, f"psi {n}")[0].get_ydata().max() for n in (1, 2, 3)]
    assert max(tops) < ax.get_ylim()[1]


def test_internal_fields_and_two_band_and_graded_stand_tidy():
    own = "mass 0.2"
    nitride = (
        f"10 nm {{edge 1.2 eV, {own}, field 0.6 MV/cm}}, 2.2 nm {{edge 0 eV, {own},"
        f" field -2.5 MV/cm, label well}}, 10 nm {{edge 1.2 eV, {own}, field 0.6 MV/cm}}"
    )
    for levels in (solve(nitride, zero="well"), solve(WELL, bands="two-band"), solve(SHORT)):
        ax = band_diagram(levels)
        assert_tidy(ax)
        assert len(labels(ax)) == len(levels)


def test_a_long_name_is_folded():
    ax = band_diagram(solve(WELL, name="a name " * 20))
    assert_tidy(ax)
    assert ax.get_title(loc="left").count("\n") >= 2


@pytest.mark.parametrize("size", [("50 mm", None), ("85 mm", "45 mm")])
def test_small_paper_folds_texts_and_names_fewer_levels(stage, size):
    ax = band_diagram(stage, width=size[0], height=size[1])
    assert_tidy(ax)
    assert 1 <= len(labels(ax)) <= len(stage)


def test_bad_band_diagrams():
    levels = solve("30 nm Al0.3Ga0.7As, 7 nm GaAs, 30 nm Al0.3Ga0.7As", below="10 meV")
    assert len(levels) == 0
    with pytest.raises(PictureError, match=r"no level to draw: 0 levels .* 10\.0 meV, .*; raise"):
        band_diagram(levels)
    with pytest.raises(PictureError, match=r"levels: got .*; give what bandwright.solve\(stack\)"):
        band_diagram("a well")


@pytest.mark.parametrize(
    ("arguments", "error", "says"),
    [
        ({"ax": "axes"}, PictureError, r"ax: got 'axes'; give a matplotlib Axes"),
        ({"width": "85"}, QuantityError, r"width: got '85'; write '85 nm'"),
        ({"width": "85 nm"}, PictureError, r"width: got '85 nm'; a picture is 20 mm to 1000 mm"),
        ({"height": "2 m"}, PictureError, r"height: got '2 m'; a picture is 20 mm to 1000 mm"),
    ],
)
def test_bad_paper(well, arguments, error, says):
    with pytest.raises(error, match=says):
        band_diagram(well, **arguments)


# -- labels ---------------------------------------------------------------------------------


def test_labels_are_moved_as_little_as_can_be():
    assert spread([0.0, 3.0, 9.0], 1.0, 0.0, 10.0) == pytest.approx([0.0, 3.0, 9.0])
    assert spread([5.0, 5.0, 5.0], 1.0, 0.0, 10.0) == pytest.approx([4.0, 5.0, 6.0])
    assert spread([0.0, 0.0], 1.0, 0.0, 10.0) == pytest.approx([0.0, 1.0])
    assert spread([10.0, 10.0, 10.0], 2.0, 0.0, 10.0) == pytest.approx([6.0, 8.0, 10.0])
    wanted = np.sort(np.random.default_rng(5).uniform(0, 30, 20))
    found = spread(wanted, 1.5, 0.0, 30.0)
    assert np.diff(found).min() > 1.5 - 1e-9 and found[0] >= 0.0 and found[-1] <= 30.0 + 1e-9


def test_no_two_curves_share_ink_and_stroke():
    pairs = {(INKS[n % len(INKS)], str(STROKES[n % len(STROKES)])) for n in range(30)}
    assert len(pairs) == 30


# -- sweeps ---------------------------------------------------------------------------------


def grid(fields, widths):
    rows = [
        {"well.thickness_nm": w, "field_kV_per_cm": f, "wavelength_um": w + 0.01 * f, "levels": 3}
        for f in fields
        for w in widths
    ]
    return pd.DataFrame(rows)


def test_one_parameter():
    table = grid([0.0], [8.0, 6.0, 7.0]).drop(columns="field_kV_per_cm")
    ax = sweep_curves(table)
    assert_tidy(ax)
    (curve,) = named(ax, "curve .*")
    assert curve.get_xdata().tolist() == [6.0, 7.0, 8.0]
    assert ax.get_xlabel().split() == ["well.thickness", "(nm)"]
    assert ax.get_ylabel().split() == ["wavelength", "(µm)"]
    assert labels(ax) == []


def test_metrics_of_one_unit_share_an_axes():
    x = np.linspace(0, 50, 60)
    table = pd.DataFrame(
        {"field_kV_per_cm": x, "level 1_meV": 50 + 0 * x, "level 2_meV": 150 - x, "dipole_nm": x,
         "level 3_meV": np.where(x < 30, 200.0, np.nan), "checked": x > 3}
    )  # fmt: skip
    ax = sweep_curves(table)
    assert_tidy(ax)
    assert labels(ax) == ["level 1", "level 2", "level 3"]
    assert ax.get_ylabel().split() == ["energy", "(meV)"]
    strokes = [(c.get_color(), c.get_linestyle()) for c in named(ax, "curve .*")]
    assert len(set(strokes)) == len({ink for ink, _ in strokes}) == 3
    ax = sweep_curves(table, metrics="dipole_nm")
    assert [c.get_gid() for c in named(ax, "curve .*")] == ["curve dipole"]


def test_two_parameters_as_curves():
    table = grid([0.0, 20.0, -20.0], [6.0, 7.0, 8.0])
    figure, mine = pyplot.subplots(figsize=(3.3, 2.5), layout="constrained")
    ax = sweep_curves(table, mine, over=["well.thickness_nm", "field_kV_per_cm"])
    assert ax is mine
    assert_tidy(ax)
    assert labels(ax) == [f"{MINUS}20", "0", "20"]
    assert named(ax, "head")[0].get_text().split() == ["field", "(kV/cm)"]
    assert [c.get_ydata()[0] for c in named(ax, "curve .*")] == pytest.approx([5.8, 6.0, 6.2])


def test_the_wavelength_is_drawn_if_nothing_is_asked_else_what_has_a_unit():
    table = pd.DataFrame({"x": [1.0, 2.0], "levels": [2, 3], "level_1_meV": [1.0, 2.0],
                          "level_2_meV": [3.0, 4.0], "wavelength_um": [9.0, 8.0]})  # fmt: skip
    assert [c.get_gid() for c in named(sweep_curves(table), "curve .*")] == ["curve wavelength"]
    ax = sweep_curves(table.drop(columns="wavelength_um"))
    assert labels(ax) == ["level 1", "level 2"]
    ax = sweep_curves(table[["x", "levels"]])
    assert [c.get_gid() for c in named(ax, "curve .*")] == ["curve levels"]


def test_two_parameters_by_words():
    table = grid([0.0, 20.0], [6.0, 7.0])
    table["barrier"] = ["AlAs" if f else "Al0.3Ga0.7As" for f in table["field_kV_per_cm"]]
    ax = sweep_curves(table, over=["well.thickness_nm", "barrier"], metrics="wavelength_um")
    assert sorted(labels(ax)) == ["Al0.3Ga0.7As", "AlAs"]


def test_two_parameters_as_a_map():
    table = grid(np.linspace(0, 60, 8), np.linspace(5, 9, 9))
    table.attrs["parameters"] = ["well.thickness_nm", "field_kV_per_cm"]
    ax = sweep_curves(table)
    assert_tidy(ax)
    assert named(ax, "map") and named(ax, "contours")
    assert ax.get_title(loc="left").split() == ["wavelength", "(µm)"]
    numbers = [t.get_text() for t in ax.texts]
    assert "7" in numbers and len(numbers) >= 4
    assert not named(sweep_curves(table, kind="curves"), "map")
    table.loc[5, "wavelength_um"] = np.nan
    assert legend(sweep_curves(table)) == ["no value"]
    table["wavelength_um"] = 10.0
    assert [t.get_text() for t in sweep_curves(table).texts] == ["10 everywhere"]


@pytest.mark.parametrize(
    ("table", "arguments", "says"),
    [
        ("nothing", {}, r"table: got 'nothing'; give a pandas DataFrame"),
        (pd.DataFrame({"a_nm": []}), {}, r"table: it has no row"),
        (pd.DataFrame({"a_nm": [1.0], "word": ["b"]}), {}, r"no column of numbers beside a_nm"),
        (pd.DataFrame({"a": ["b"], "c": [1.0]}), {}, r"column 'a' holds no numbers"),
        (grid([0.0], [6.0]), {"over": "well.thicknes"}, r"no column 'well.thicknes'; did you mean"),
        (grid([0.0], [6.0]), {"over": ["levels", "field"]}, r"no column 'field'; known"),
        (grid([0.0], [6.0]), {"over": ["levels", "a", "b"]}, r"3 parameters \(levels, a, b\); a"),
        (grid([0.0, 1.0], [6.0]), {}, r"over: well.thickness_nm 6 is there more than once; name"),
        (grid([0.0], [6.0]), {"metrics": "wave"}, r"no column 'wave'"),
        (grid([0.0], [6.0]), {"metrics": ["levels", "wavelength_um"]},
         r"differ in unit \(no unit, um\)"),
        (grid([0.0, 1.0], [6.0, 7.0]), {"over": ["well.thickness_nm", "field_kV_per_cm"],
         "metrics": ["levels", "levels"]}, r"metrics: got 2; over two parameters one"),
        (grid([0.0], [6.0]), {"kind": "mat"}, r"kind: got 'mat'; did you mean 'map'"),
        (grid([0.0], [6.0]), {"kind": "map"}, r"kind: a map needs two parameters"),
        (grid([0.0, 1.0], [6.0, 7.0])[:3], {"over": ["well.thickness_nm", "field_kV_per_cm"],
         "kind": "map"}, r"kind: a map needs every pair"),
    ],
)  # fmt: skip
def test_bad_sweeps(table, arguments, says):
    with pytest.raises(PictureError, match=says):
        sweep_curves(table, **arguments)


# -- the error budget -----------------------------------------------------------------------


def test_the_budget_has_the_largest_bar_on_top(well):
    table = well.lines().error_budget(checked=False)
    ax = budget_bars(table, unit="meV", title="2 to 1")
    assert_tidy(ax)
    assert ax.get_title(loc="left") == "2 to 1"
    bars = named(ax, r"bar \d+")
    assert [b.get_width() for b in bars] == pytest.approx(table["shift_meV"].tolist())
    first, last = ax.get_ylim()
    assert first > last  # rows run down
    names = [" ".join(t.get_text().split()) for t in ax.get_yticklabels()]
    assert names[0] == f"{table['what'][0]}, {table['change'][0]}" == "well, +1 ML"
    hatched = [bool(b.get_hatch()) for b in bars]
    assert hatched == [shift < 0 for shift in table["shift_meV"]]
    values = [t.get_text() for t in named(ax, "value")]
    assert values[0] == f"{table['shift_meV'][0]:+.2f}".replace("-", MINUS)


def test_the_budget_says_what_it_leaves_out_and_what_has_a_remark():
    table = pd.DataFrame(
        {"what": [f"layer {n}" for n in range(5)], "change": ["+1 ML"] * 5,
         "shift_um": [0.2, -0.1, 0.05, np.nan, 0.01],
         "remark": ["not linear", None, None, "it can be moved to neither side", None]}
    )  # fmt: skip
    ax = budget_bars(table, most=3)
    assert_tidy(ax)
    assert len(named(ax, r"bar \d+")) == 3
    assert [t.get_text() for t in named(ax, "value")] == ["+0.200*", f"{MINUS}0.100", "+0.050"]
    (note,) = named(ax, "note")
    assert note.get_text() == "* read the remark in the table\n2 smaller or unknown not shown"


def test_bad_budgets(well):
    table = well.lines().error_budget(checked=False)
    with pytest.raises(PictureError, match=r"unit: got 'nm'; did you mean|unit: got 'nm'; known"):
        budget_bars(table, unit="nm")
    with pytest.raises(PictureError, match=r"most: got 0; a whole number from 1"):
        budget_bars(table, most=0)
    with pytest.raises(PictureError, match=r"no column 'what'; give lines.error_budget\(\)"):
        budget_bars(pd.DataFrame({"shift_um": [1.0]}))
    with pytest.raises(PictureError, match=r"no shift_um is above rounding"):
        budget_bars(table.assign(shift_um=1e-12))
    with pytest.raises(PictureError, match=r"table: got 3; give a pandas DataFrame"):
        budget_bars(3)


# -- the histogram --------------------------------------------------------------------------


def draws(count=4000):
    return 10.3 + 0.12 * np.random.default_rng(3).standard_normal(count)


def test_the_histogram_counts_every_draw_and_the_yield():
    found = draws()
    found[:40] = np.nan
    window = ("10.2 um", "10.5 um")
    ax = histogram(found, window, mean_um=10.3, sigma_um=0.12)
    assert_tidy(ax)
    inside, outside = (sum(b.get_height() for b in named(ax, g)) for g in ("inside", "outside"))
    assert inside + outside == 3960
    share = np.mean((found >= 10.2) & (found <= 10.5))
    assert inside == pytest.approx(share * 4000, abs=1)
    error = np.sqrt(share * (1 - share) / 4000)
    told = legend(ax)
    assert told[0] == f"yield {share * 100:.1f} ± {error * 100:.1f} %"
    assert told[1:] == ["outside", "linear, yield 75.0 %", "window 10.2 to 10.5 µm"]
    # 0.74986 is the normal distribution's from -0.8333 to 1.6667 sigma (from memory of its table)
    note = " ".join(ax.get_legend().get_title().get_text().split())
    assert note.startswith("4000 draws, 40 of them without the line; mean 10.3")
    sides = sorted(line.get_xdata()[0] for line in named(ax, "window"))
    assert sides == pytest.approx([10.2, 10.5])


def test_the_normal_curve_has_the_area_of_the_columns():
    found = draws()
    ax = histogram(found, mean_um=10.3, sigma_um=0.12)
    x, y = named(ax, "linear")[0].get_data()
    width = named(ax, "inside")[0].get_width()
    area = np.sum(0.5 * (y[1:] + y[:-1]) * np.diff(x))
    assert area == pytest.approx(len(found) * width, rel=2e-3)
    assert legend(ax) == ["linear"]


def test_an_open_side_and_one_axes():
    _, mine = pyplot.subplots()
    ax = histogram(draws(), (None, "10.4 um"), mine)
    assert ax is mine
    assert legend(ax)[-1] == "window to 10.4 µm"
    assert legend(histogram(draws(), ("10.4 um", None)))[-1] == "window from 10.4 µm"


def test_equal_wavelengths():
    ax = histogram([10.0, 10.0, 10.0])
    assert sum(b.get_height() for b in named(ax, "inside")) == 3


@pytest.mark.parametrize(
    ("arguments", "error", "says"),
    [
        (([10.0],), PictureError, r"wavelengths_um: 1 of 1 are numbers; two are due"),
        ((["a", "b"],), PictureError, r"wavelengths_um: got .*; give a list of numbers"),
        (([[1.0, 2.0]],), PictureError, r"wavelengths_um: got .*; give a list of numbers"),
        (([1.0, 2.0], (1, 2)), QuantityError, r"window: got 1"),
    ],
)
def test_bad_histograms(arguments, error, says):
    with pytest.raises(error, match=says):
        histogram(*arguments)


def test_bad_linear_propagation():
    with pytest.raises(PictureError, match=r"mean_um and sigma_um: one is missing"):
        histogram([1.0, 2.0], mean_um=1.5)
    with pytest.raises(PictureError, match=r"sigma_um: got 0.0; a number above zero"):
        histogram([1.0, 2.0], mean_um=1.5, sigma_um=0.0)


# -- files ----------------------------------------------------------------------------------


@pytest.mark.parametrize("suffix", [".svg", ".png", ".SVG"])
def test_the_same_picture_is_the_same_file(well, tmp_path, suffix):
    paths = [tmp_path / f"{name}{suffix}" for name in ("one", "other")]
    for path in paths:
        save_picture(band_diagram(well), path)
    one, other = (path.read_bytes() for path in paths)
    assert one == other and len(one) > 5000
    assert b"<dc:date>" not in one
    assert one.startswith(b"<?xml" if suffix.lower() == ".svg" else b"\x89PNG")


def test_bad_files(well, tmp_path):
    ax = band_diagram(well)
    with pytest.raises(PictureError, match=r"well.jpg: got the suffix '.jpg'; name a file"):
        save_picture(ax, tmp_path / "well.jpg")
    with pytest.raises(PictureError, match=r"well: got no suffix; .* \.png or \.svg"):
        save_picture(ax, tmp_path / "well")
    with pytest.raises(PictureError, match=r"none/well.svg: can't be written: No such file"):
        save_picture(ax, tmp_path / "none" / "well.svg")
    with pytest.raises(PictureError, match=r"ax: got 3; give the Axes that a picture returned"):
        save_picture(3, tmp_path / "well.svg")


def test_without_matplotlib_one_line_says_how_to_get_it(well, monkeypatch):
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    says = r"^pictures need matplotlib; install it with pip install 'bandwright\[plot\]'$"
    with pytest.raises(PictureError, match=says):
        well.plot()
    with pytest.raises(PictureError, match=says):
        save_picture(None, "well.svg")


def test_nothing_else_loads_matplotlib():
    code = (
        "import sys, bandwright as bw;"
        f"levels = bw.solve(bw.parse_line({WELL!r})); str(levels); levels.lines().error_budget();"
        "bw.band_diagram; print('matplotlib' in sys.modules)"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout == "False\n"
