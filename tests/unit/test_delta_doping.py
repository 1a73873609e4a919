"""Delta doping: planes without thickness, kept in every written form, of no effect on levels."""

import pytest

import bandwright as bw
from bandwright.errors import GrowthError, QuantityError, StackError
from bandwright.growth.rows import stack_of_rows
from bandwright.profile.build import build_profile
from bandwright.quantities import Density
from bandwright.report.facts import facts
from bandwright.stackfile import dumps, loads
from bandwright.stackframe import frame_from_stack, stack_from_frame
from bandwright.stackline import line_text, parse_line

LINE = (
    "10 nm Al0.3Ga0.7As, 10 nm Al0.3Ga0.7As {delta_donors 2e11 / cm^2}, 6 nm GaAs,"
    " 20 nm Al0.3Ga0.7As {acceptors 1e17 / cm^3, delta_acceptors 5e10 / cm^2}"
)
PLAIN = "10 nm Al0.3Ga0.7As, 10 nm Al0.3Ga0.7As, 6 nm GaAs, 20 nm Al0.3Ga0.7As"


def test_every_written_form_keeps_a_plane():
    stack = parse_line(LINE)
    assert stack.layers[1].delta_donors == Density(0.002, "sheet")
    assert stack.layers[3].delta_acceptors == Density(0.0005, "sheet")
    assert parse_line(line_text(stack)) == stack
    assert loads(dumps(stack)) == stack
    assert 'delta_donors = "2e11 / cm^2"' in dumps(stack)
    frame = frame_from_stack(stack)
    assert frame["delta_donors_per_cm2"].tolist()[1] == 2e11
    assert stack_from_frame(frame) == stack
    assert eval(repr(stack), {"Stack": bw.Stack, "Layer": bw.Layer}) == stack
    assert stack.layers[1].replace(delta_donors=None) == stack.layers[0]


@pytest.mark.parametrize("order", ["first grown first", "surface first"])
def test_the_growth_sheet_has_planes_as_lines_of_their_own(order):
    group = "2 x (6 nm GaAs {delta_donors 1e11 / cm^2}, 4 nm AlAs)"
    stack = parse_line(f"{LINE}, {group}", substrate="GaAs")
    sheet = bw.growth_sheet(stack, order=order)
    steps = [step.step for step in sheet.steps]
    assert steps.count("delta doping") == 3
    place = steps.index("delta doping") + (1 if order == "first grown first" else -1)
    assert steps[place] == "layer" and "delta_donors" not in sheet.steps[place].entries
    assert "delta doping" in str(sheet) and "2e11 / cm^2" in str(sheet)
    assert bw.stack_from_sheet(sheet, whole=False) == stack
    table = sheet.table
    back = bw.stack_from_sheet(table, whole=False, substrate="GaAs", order=order)
    assert back == stack
    assert sheet.total_nm == pytest.approx(
        bw.growth_sheet(stack.with_layer(2, stack.layers[0]), order=order).total_nm
    )


PLANE = {"step": "delta doping", "delta_donors": "2e11 / cm^2"}
GROWN = {"step": "layer", "material": "GaAs", "written": "6 nm"}


@pytest.mark.parametrize(
    ("order", "rows", "row"),
    [
        ("first grown first", [GROWN, PLANE], 2),
        ("first grown first", [PLANE, {"step": "interruption"}, GROWN], 1),
        ("surface first", [PLANE, GROWN], 1),
    ],
)
def test_a_plane_without_its_layer_is_refused(order, rows, row):
    with pytest.raises(GrowthError, match=f"row {row}: a delta doping without the layer grown"):
        stack_of_rows(rows, whole=False, order=order)


def test_a_plane_stays_on_the_first_grown_face():
    stack = parse_line(LINE)
    turned = bw.Stack(stack.layers[::-1], order="surface first")
    assert turned == stack
    assert stack.layers[1].reversed() == stack.layers[1]


def test_a_plane_has_no_thickness_and_no_effect_and_is_said():
    doped, plain = (parse_line(line, substrate="GaAs") for line in (LINE, PLAIN))
    assert build_profile(doped).thickness == build_profile(plain).thickness
    with pytest.warns(bw.BandwrightWarning, match=r"doping of layer 2 \(Al0.3Ga0.7As\), layer 4"):
        levels = bw.solve(doped)
    assert levels.energies.tolist() == bw.solve(plain).energies.tolist()
    assert "{delta_donors 2e11 / cm^2}" in dict(facts(levels))["grown"]


@pytest.mark.parametrize("key", ["delta_donors", "delta_acceptors"])
@pytest.mark.parametrize(
    ("given", "text"),
    [
        ("3e17 / cm^3", r"got '3e17 / cm\^3'; a plane has no thickness: write a density in"),
        (2e11, "got 200000000000.0; write"),
        ("-1e11 / cm^2", "got '-1e11 / cm"),
    ],
)
def test_what_is_no_plane_is_refused(key, given, text):
    with pytest.raises((StackError, QuantityError), match=rf"layer \(GaAs\): {key}: {text}"):
        bw.Layer("6 nm", "GaAs", **{key: given})


def test_of_a_digital_layer_the_first_pulse_alone_has_the_plane():
    stack = parse_line(
        "9 nm Al0.3Ga0.7As, 4 nm AlxGa1-xAs {x 0 to 0.3, delta_donors 2e11 / cm^2}, 6 nm GaAs",
        substrate="GaAs",
    )
    layers = [layer for layer, _ in bw.digital_alloy(stack, period=4).stack.grown()]
    doped = [place for place, layer in enumerate(layers) if layer.delta_donors is not None]
    assert doped == [1] and len(layers) > 4
