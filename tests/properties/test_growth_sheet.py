"""A growth sheet goes back to its stack, whatever is grown and however it is listed."""

from hypothesis import given
from hypothesis import strategies as st

import bandwright as bw
from bandwright.stackfile import settings

ORDERS = st.sampled_from(["first grown first", "surface first"])
REACTOR = bw.Calibrations(
    [bw.Cell("Ga1", "Ga", "0.7 ML/s", "GaAs"), bw.Cell("Al1", "Al", "0.3 ML/s", "AlAs"),
     bw.Cell("In1", "In", "0.5 ML/s", "InAs")],
    name="invented",
)  # fmt: skip


@st.composite
def layers(draw):
    """A layer of a material that is known, flat, graded or in a table of depths."""
    thickness = draw(st.decimals("0.05", 60, places=2))
    inputs = {"label": draw(st.sampled_from([None, None, "well", "left | barrier", "ö, \"x\""]))}
    fraction = st.decimals(0, 1, places=3).map(float)
    kind = draw(st.sampled_from(["formula", "letters", "graded", "quadratic", "points", "two"]))
    material, unit = "AlxGa1-xAs", draw(st.sampled_from(["nm", "ML"]))
    if kind == "formula":
        material = draw(st.sampled_from(["GaAs", "InAs", "Al0.28Ga0.72As", "In0.2Ga0.8As"]))
    elif kind == "two":
        material = "AlxInyGa1-x-yAs"
        inputs |= {"x": 0.2, "y": draw(fraction) * 0.8}
    elif kind == "letters":
        inputs["x"] = draw(fraction)
    elif kind == "points":
        unit = "nm"
        half = f"{thickness / 2} nm"
        inputs["x"] = [["0 nm", draw(fraction)], [half, draw(fraction)],
                       [f"{thickness} nm", draw(fraction)]]  # fmt: skip
    else:
        inputs["x"] = [draw(fraction), draw(fraction)]
        inputs["grading"] = "quadratic" if kind == "quadratic" else None
    if draw(st.booleans()):
        inputs[draw(st.sampled_from(["donors", "acceptors"]))] = "2e11 / cm^2"
    return bw.Layer(f"{thickness} {unit}", material, **inputs)


def groups(inside):
    return st.builds(bw.Repeat, st.integers(1, 9), st.lists(inside, min_size=1, max_size=3))


entries = st.recursive(layers(), groups, max_leaves=6)
stacks = st.builds(
    bw.Stack,
    st.lists(entries, min_size=1, max_size=4),
    substrate=st.sampled_from(["GaAs", "InP", None]),
    ends=st.sampled_from([("open", "open"), ("open", "wall"), ("wall", "open")]),
)


@given(stacks, ORDERS, st.sampled_from([None, "3 s"]))
def test_as_designed_the_sheet_is_the_stack(stack, order, pause):
    sheet = bw.growth_sheet(stack, order=order, interruption=pause, whole=False)
    assert sheet.grown == bw.stack_from_sheet(sheet) == stack
    said = {**settings(stack), "order": order, "ends": stack.ends}
    if order == "surface first":
        said["ends"] = stack.ends[::-1]
    assert bw.stack_from_sheet(sheet.table, whole=False, **said) == stack


@given(stacks, ORDERS)
def test_rounded_once_it_stays(stack, order):
    sheet = bw.growth_sheet(stack, REACTOR, order=order, within=1.0)
    again = bw.growth_sheet(sheet.grown, REACTOR, order=order, within=1.0)
    for name in ("step", "times", "number", "whole_ML", "cells", "implied", "time_s"):
        assert sheet.columns.get(name) == again.columns.get(name), name
    for before, after in zip(sheet.steps, again.steps, strict=True):
        if before.whole_ML is not None:
            assert abs(after.rounding_nm) < 1e-9
            assert abs(after.thickness_nm - before.thickness_nm - before.rounding_nm) < 1e-9
    assert abs(again.total_nm - sheet.total_nm) < 1e-9 * sheet.total_nm


@given(stacks)
def test_the_order_of_the_list_changes_nothing_that_is_grown(stack):
    first = bw.growth_sheet(stack, REACTOR, interruption="2 s", within=1.0)
    turned = bw.growth_sheet(stack, REACTOR, interruption="2 s", within=1.0, order="surface first")
    kept = [[(s.number, s.times, s.whole_ML, s.cells, s.time_s) for s in sheet.steps]
            for sheet in (first, turned)]  # fmt: skip
    assert kept[0] == kept[1][::-1]
    assert abs(turned.total_nm - first.total_nm) < 1e-9 * first.total_nm
    assert abs((turned.total_s or 0.0) - (first.total_s or 0.0)) <= 1e-9 * (first.total_s or 0.0)
