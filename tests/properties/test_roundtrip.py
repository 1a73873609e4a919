"""A stack written and read again is the same stack, by every route."""

import io
import os
import pickle
import tomllib

import pandas as pd
import pytest
from hypothesis import HealthCheck, assume, example, given, settings
from hypothesis import strategies as st

from bandwright import Layer, Repeat, Stack, parameters, stackfile
from bandwright.stackframe import frame_from_stack, stack_from_frame
from bandwright.stackline import line_text, parse_line
from properties.strategies import entries, fraction, names, positive, stacks

thorough = settings(max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])
quick = settings(thorough, max_examples=40)


def assert_same(found, stack):
    assert found == stack
    assert hash(found) == hash(stack)
    assert repr(found) == repr(stack)  # equal to the last digit and sign


@thorough
@given(stacks())
def test_every_route_gives_the_same_stack(stack):
    arguments = stackfile.settings(stack)
    text = stackfile.dumps(stack)
    found = stackfile.loads(text)
    assert_same(found, stack)
    assert stackfile.dumps(found) == text
    assert_same(parse_line(line_text(stack), **arguments), stack)
    assert_same(stack_from_frame(frame_from_stack(stack), **arguments), stack)
    assert_same(Stack(stack.layers, **arguments), stack)


@quick
@given(stack=stacks())
def test_file_in_another_folder(stack, tmp_path_factory):
    path = tmp_path_factory.mktemp("stacks") / "stack ü.toml"
    stackfile.write_stack(stack, path)
    assert_same(stackfile.read_stack(path), stack)
    assert_same(stackfile.read_stack(os.path.relpath(path)), stack)
    assert_same(pickle.loads(pickle.dumps(stack)), stack)


@quick
@given(stacks())
def test_table_through_csv(stack):
    text = frame_from_stack(stack).to_csv()
    table = pd.read_csv(io.StringIO(text), index_col="layer", keep_default_na=False, dtype=str)
    assert_same(stack_from_frame(table, **stackfile.settings(stack)), stack)


@thorough
@given(names)
def test_every_text_survives_toml(text):
    written = f"text = {stackfile.writer.toml_value(text)}"
    assert tomllib.loads(written)["text"] == text


@thorough
@given(st.text())
@example("\x7f\x00\u2028\r\n\t\\u0041")
def test_every_character_survives_toml(text):
    assume(not any(0xD800 <= ord(character) < 0xE000 for character in text))
    assert tomllib.loads(f"text = {stackfile.writer.toml_value(text)}")["text"] == text


@quick
@given(stack=stacks(), data=st.data())
def test_setting_what_was_read_changes_nothing(stack, data):
    # Materials with odd names have no composition: only formulas are asked for it.
    plain = [w for w in stack.written() if w.layer.material is None]
    assume(plain)
    stack = stack.replace(layers=[w.layer for w in plain], substrate=None)
    for parameter in parameters.list_parameters(stack):
        value = parameters.read(stack, parameter.name)
        assert_same(parameters.replace(stack, parameter.name, value), stack)
    parameter = data.draw(st.sampled_from(parameters.list_parameters(stack)))
    if parameter.kind in ("thickness", "mass", "gap", "temperature", "donors"):
        new = data.draw(positive)
        changed = parameters.replace(stack, parameter.name, new)
        if not parameter.name.endswith("_shift"):
            assert parameters.read(changed, parameter.name) == new
        others = {p.name: parameters.read(stack, p.name) for p in _others(stack, parameter)}
        assert {name: parameters.read(changed, name) for name in others} == others


def _others(stack, parameter):
    """Return the parameters that a change of one leaves alone."""
    moved = set(parameter.layer_numbers)
    return [
        other
        for other in parameters.list_parameters(stack)
        if other.kind.split()[0] != parameter.kind or not moved & set(other.layer_numbers)
        if other.name != parameter.name
    ]


@thorough
@given(fraction, fraction)
def test_composition_in_a_formula_is_set_exactly(first, other):
    share = round(other * (1 - 0.3), 6)
    formula = f"Al0.3In{share:f}Ga{round(0.7 - share, 6):f}As"
    for material in ("Al0.3Ga0.7As", "GaAs0.51Sb0.49", formula):
        stack = Stack([Layer("8 nm", material, label="a")])
        changed = parameters.replace(stack, "a.composition", first)
        assert parameters.read(changed, "a.composition") == first
        assert parameters.replace(changed, "a.composition", first) == changed


@pytest.mark.parametrize("depth", [1, 2, 30])
def test_deep_groups(depth):
    entry = Layer("5 nm", "GaAs")
    for _ in range(depth):
        entry = Repeat(1, [entry, Layer("1 nm", "AlAs")])
    stack = Stack([entry, entry])
    assert stackfile.loads(stackfile.dumps(stack)) == stack
    assert parse_line(line_text(stack)) == stack
    assert stack_from_frame(frame_from_stack(stack)) == stack


@quick
@given(st.lists(entries, min_size=1, max_size=4))
def test_surface_first_is_the_stack_turned_over(layers):
    assume(not any(w.layer.thickness.unit == "ML" for w in Stack(layers, zero="GaAs").written()))
    listed = Stack(layers, zero="GaAs")
    text = stackfile.dumps(listed).replace("[stack]\n", '[stack]\norder = "surface first"\n')
    assert stackfile.loads(text) == Stack(layers, zero="GaAs", order="surface first")
