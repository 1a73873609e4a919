"""Stack files: what they say, what is written, and every way they can be wrong."""

import re

import numpy as np
import pytest

from bandwright import BandwrightError, Layer, QuantityError, Repeat, Stack, StackFileError
from bandwright.shapes import Linear, Points, Quadratic
from bandwright.stackfile import dumps, loads, read_stack, settings, tabulated, write_stack

FULL = """
[stack]
name = "detector well 3"
temperature = "77 K"
substrate = "GaAs"
field = "12 kV/cm"
electrons_run = "to surface"
ends = ["open", "wall"]
zero = "GaAs"
bands = "one-band"
materials = ["house.toml"]

[[layers]]
label = "left barrier"
material = "Al0.28Ga0.72As"
thickness = "300 Å"

[[layers]]
label = "well"
material = "GaAs"
thickness = "22 ML"
donors = "2e11 / cm^2"
acceptors = "3e17 / cm^3"
field = "1 MV/cm"

[[layers]]
label = "right barrier"
edge = "235 meV"
mass = 0.089
gap = "1.79 eV"
thickness = "30 nm"

[[layers]]
times = 30
layers = [
  { material = "GaAs", thickness = "5 nm" },
  { material = "AlxGa1-xAs", x = [0.0, 0.3], thickness = "8 nm" },
]

[[layers]]
material = "AlxGa1-xAs"
x_points = [["0 nm", 0.0], ["3 nm", 0.12], ["8 nm", 0.30]]
thickness = "8 nm"

[[layers]]
material = "AlxGa1-xAs"
x = [0.3, 0.0]
grading = "quadratic"
thickness = "8 nm"
"""

BUILT = [
    Layer("30 nm", "Al0.28Ga0.72As", label="left barrier"),
    Layer(
        "22 ML",
        "GaAs",
        label="well",
        donors="2e11 / cm^2",
        acceptors="3e17 / cm^3",
        field="1 MV/cm",
    ),
    Layer("30 nm", edge="235 meV", mass=0.089, gap="1.79 eV", label="right barrier"),
    Repeat(30, [Layer("5 nm", "GaAs"), Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3])]),
    Layer("8 nm", "AlxGa1-xAs", x=[("0 nm", 0.0), ("3 nm", 0.12), ("8 nm", 0.3)]),
    Layer("8 nm", "AlxGa1-xAs", x=[0.3, 0.0], grading="quadratic"),
]


def test_file_and_python_give_the_same_stack(tmp_path):
    built = Stack(
        BUILT,
        name="detector well 3",
        temperature="77 K",
        substrate="GaAs",
        field="12 kV/cm",
        electrons_run="to surface",
        ends=("open", "wall"),
        zero="GaAs",
        bands="one-band",
        materials=[tmp_path / "house.toml"],
    )
    path = tmp_path / "well.toml"
    path.write_text(FULL, encoding="utf-8")
    assert read_stack(path) == built
    assert hash(read_stack(str(path))) == hash(built)


def test_what_is_written(tmp_path):
    stack = Stack(
        [
            Layer("30 nm", edge=["0 eV", "235 meV"], mass=0.089, label='say "x"'),
            Repeat(2, [Layer("5 nm", "GaAs"), Repeat(3, [Layer("8 nm", "AlAs")])]),
            Layer("2 nm", "AlxGa1-xAs", x=[(f"{d} nm", d / 10) for d in (0, 0.5, 1, 1.5, 2)]),
        ],
        temperature="77 K",
        zero="GaAs",
        ends="wall",
        materials=[tmp_path / "house.toml", tmp_path.parent / "up.toml"],
    )
    assert (
        dumps(stack, tmp_path)
        == r"""[stack]
temperature = "77 K"
ends = ["wall", "wall"]
zero = "GaAs"
materials = ["house.toml", "../up.toml"]

[[layers]]
label = "say \"x\""
thickness = "30 nm"
edge = ["0 meV", "235 meV"]
mass = 0.089

[[layers]]
times = 2
layers = [
  { material = "GaAs", thickness = "5 nm" },
  { times = 3, layers = [{ material = "AlAs", thickness = "8 nm" }] },
]

[[layers]]
material = "AlxGa1-xAs"
thickness = "2 nm"
x_points = [
  ["0 nm", 0.0],
  ["0.5 nm", 0.05],
  ["1 nm", 0.1],
  ["1.5 nm", 0.15],
  ["2 nm", 0.2],
]
"""
    )


def test_a_moved_file_finds_its_materials(tmp_path):
    stack = Stack([Layer("5 nm", "GaAs")], materials=[tmp_path / "house.toml"])
    below = tmp_path / "below"
    below.mkdir()
    write_stack(stack, below / "stack.toml")
    assert '["../house.toml"]' in (below / "stack.toml").read_text()
    assert read_stack(below / "stack.toml") == stack
    one = loads('[stack]\nmaterials = "house.toml"\n[[layers]]\n' + GAAS, tmp_path)
    assert one.materials == (str(tmp_path / "house.toml"),)


def test_windows_notepad(tmp_path):
    path = tmp_path / "well.toml"
    path.write_bytes(b"\xef\xbb\xbf" + FULL.replace("\n", "\r\n").encode())
    assert read_stack(path).name == "detector well 3"


def test_surface_first():
    text = '[stack]\norder = "surface first"\nends = ["wall", "open"]\n'
    text += '[[layers]]\nmaterial = "AlxGa1-xAs"\nx = [0.0, 0.3]\nthickness = "8 nm"\n[[layers]]\n'
    stack = loads(text + GAAS)
    assert [w.layer.material for w in stack.written()] == ["GaAs", "AlxGa1-xAs"]
    assert stack.layers[1].x == Linear(0.3, 0.0)
    assert stack.ends == ("open", "wall")
    assert "order" not in dumps(stack)


def test_settings_leave_out_what_is_so_anyway():
    stack = Stack([Layer("5 nm", "GaAs")], temperature="300 K", ends="open")
    assert settings(stack) == {}
    full = settings(Stack(BUILT, bias="0.3 V", zero="GaAs", ends=("open", "wall"), name="a"))
    assert full == {"name": "a", "bias": "0.3 V", "ends": ["open", "wall"], "zero": "GaAs"}


# --- tables of points in a CSV --------------------------------------------------------------

RAMP = '[[layers]]\nmaterial = "AlxGa1-xAs"\nthickness = "8 nm"\nx_file = "ramp.csv"\n'
OWN = '[[layers]]\nthickness = "8 nm"\nmass = 0.09\nedge_file = "ramp.csv"\n'
GAAS = 'material = "GaAs"\nthickness = "5 nm"\n'


def test_csv_is_read_and_written_inline(tmp_path):
    (tmp_path / "ramp.csv").write_text(
        "# measured by nobody\ndepth_nm, x, note\n0, 0.0,\n\n3, 0.12, a\n8, 0.3,\n"
    )
    stack = loads(RAMP, tmp_path)
    assert stack.layers[0].x == Points((0.0, 3.0, 8.0), (0.0, 0.12, 0.3))
    assert 'x_points = [["0 nm", 0.0], ["3 nm", 0.12], ["8 nm", 0.3]]' in dumps(stack)


@pytest.mark.parametrize("column", ["edge_meV", "edge_eV"])
@pytest.mark.parametrize("depth", ["depth_nm", "depth_angstrom"])
def test_csv_columns_say_their_unit(tmp_path, column, depth):
    end = {"edge_meV": "235", "edge_eV": "0.235"}[column]
    last = {"depth_nm": "8", "depth_angstrom": "80"}[depth]
    text = f"\ufeff{depth},{column}\r\n0,0\r\n{last},{end}\r\n"
    (tmp_path / "ramp.csv").write_text(text, encoding="utf-8")
    assert loads(OWN, tmp_path).layers[0].edge == Points((0.0, 8.0), (0.0, 0.235))


@pytest.mark.parametrize(
    ("content", "text"),
    [
        (None, "layer 1, x_file, {path}: can't be read: No such file or directory"),
        ("", "{path}: holds no table; write columns depth_nm and x"),
        (
            "depth,x\n0,0\n8,0.3\n",
            "{path}: no column depth_nm or depth_angstrom or depth_um; found",
        ),
        ("depth_nm,y\n0,0\n", "{path}: no column x; found 'depth_nm', 'y'"),
        ("depth_nm;x\n0;0,1\n", "{path}: no column depth_nm .*; separate columns by commas"),
        ("depth_nm\n0\n", "{path}: no column x; found 'depth_nm'"),
        ("depht_nm\n0\n", "found 'depht_nm'; did you mean 'depth_nm'"),
        ("depth_nm,depth_um,x\n0,0,0\n", "columns depth_nm and depth_um both say depth; leave one"),
        (
            "depth_nm,x\n0,0\n8,0,3\n",
            "{path}, line 3: 3 cells under 2 columns; write decimals with",
        ),
        ("depth_nm,x\n\n0,0\n8,\n", "{path}, line 4: no value under 'x'"),
        ("depth_nm,x\n0,0\n8,a\n", r"layer 1 .*: x \(point 2\): got 'a'"),
        ("depth_nm,x\n0,0\n8 nm,0.3\n", r"x \(depth of point 2\): got '8 nm nm'"),
        ("depth_nm,x\n0,0\n7,0.3\n", "x: the table ends at 7 nm and the layer is 8 nm thick"),
        (b"depth_nm,x\n0,\xff\n", "{path}: can't be read: not UTF-8 text"),
    ],
)
def test_csv_mistakes(tmp_path, content, text):
    path = tmp_path / "ramp.csv"
    if content is not None:
        path.write_bytes(content if isinstance(content, bytes) else content.encode())
    folder = re.escape(str(path))
    text = text.replace("layer 1, x_file", r"layer 1 \(AlxGa1-xAs\), x_file")
    with pytest.raises(BandwrightError, match=text.replace("{path}", folder)):
        loads(RAMP, tmp_path)


# --- callables ------------------------------------------------------------------------------


def test_a_callable_is_refused_and_a_tabulated_copy_offered(tmp_path):
    bowl = Layer("8 nm", "AlxGa1-xAs", x=lambda z: 0.3 * (z / 8) ** 2, label="bowl")
    stack = Stack([Layer("5 nm", "GaAs"), Repeat(2, [bowl])])
    path = tmp_path / "bowl.toml"
    text = r"bowl.toml, layer 2, 'bowl' \(AlxGa1-xAs\): x is a callable.*tabulated\(stack"
    with pytest.raises(StackFileError, match=text):
        write_stack(stack, path)
    assert not path.exists()
    copy = tabulated(stack)
    write_stack(copy, path)
    assert read_stack(path) == copy
    table = copy.layers[1].layers[0].x
    assert len(table.depths_nm) == 101
    assert table.at([4.0], 8.0) == pytest.approx(0.075, abs=1e-12)
    assert copy.layers[0] == stack.layers[0]


def test_what_can_not_be_tabulated():
    with pytest.raises(StackFileError, match="points: got 1; a table needs two or more"):
        tabulated(Stack([Layer("5 nm", "GaAs")]), points=1)
    with pytest.raises(StackFileError, match="bowl: x is a callable and the thickness is in ML"):
        tabulated(Stack([Layer("8 ML", "AlxGa1-xAs", x=np.cos, label="bowl")]))


# --- mistakes -------------------------------------------------------------------------------

MISTAKES = [
    # keys
    (
        '[[layers]]\nmaterial = "GaAs"\nthicknes = "5 nm"',
        r"layer 1 \(GaAs\): unknown key 'thicknes'",
    ),
    ('[[layers]]\nmaterial = "GaAs"\nthicknes = "5 nm"', "did you mean 'thickness'"),
    ('[stack]\ntemprature = "77 K"', r"\[stack\]: unknown key 'temprature'; did you mean 'temper"),
    ("[stak]", "unknown key 'stak'; did you mean 'stack'"),
    ('thickness = "5 nm"', r"'thickness' stands outside a table; write it under \[\[layers\]\]"),
    ('temperature = "5 K"', r"'temperature' stands outside a table; write it under \[stack\]"),
    ('order = "surface first"', r"'order' stands outside a table; write it under \[stack\]"),
    ('stack = "GaAs"', r"stack: got 'GaAs'; write a table \[stack\]"),
    # layers
    ("", r"^well.toml, stack: no layers; write a \[\[layers\]\] table for each"),
    ("layers = []", "no layers"),
    ("[layers]\n" + 'material = "GaAs"', r"write \[\[layers\]\] in double brackets"),
    ('layers = "GaAs"', "layers: got 'GaAs'; write a list of tables"),
    ('layers = ["GaAs"]', "layer 1: got 'GaAs'; write a table, such as { thickness"),
    (
        '[[layers]]\nlabel = "well"\nmaterial = "GaAs"',
        r"layer 1, 'well' \(GaAs\): thickness: missing",
    ),
    ('[[layers]]\nthickness = "5 nm"', r"layer 1 \(.*\): no material"),
    ('[[layers]]\nmaterial = "GaAs"\nthickness = 6.2', "thickness: got 6.2; write '6.2 nm'"),
    ('[[layers]]\nmaterial = "GaAs"\nthickness = "6.2"', "thickness: got '6.2'; write '6.2 nm'"),
    (
        '[[layers]]\nmaterial = "GaAs"\nthickness = "6.2 mn"',
        "thickness: got '6.2 mn'; unit 'mn' is",
    ),
    ('[[layers]]\nmaterial = "GaAs"\nthickness = "5,5 nm"', "use a decimal point"),
    ('[[layers]]\nmaterial = "GaAs"\nthickness = "-5 nm"', "thickness: got '-5 nm'; .* above zero"),
    (
        '[[layers]]\nmaterial = "GaAs"\nthickness = "62 meV"',
        "thickness: got '62 meV'; that is an en",
    ),
    ('[[layers]]\nmaterial = "AlxGa1-xAs"\nx = nan\nthickness = "5 nm"', "x: got nan"),
    ('[[layers]]\nmaterial = "AlxGa1-xAs"\nx = 28\nthickness = "5 nm"', "for percent write 0.28"),
    ('[[layers]]\nmaterial = "GaAs"\nmass = 0.1\nthickness = "5 nm"', "mass: own numbers on a mat"),
    ('[[layers]]\nmaterial = 5\nthickness = "5 nm"', "material: got 5"),
    # groups
    (
        '[[layers]]\nmaterial = "GaAs"\nlayers = []',
        "group from layer 1 on: both 'layers' and 'mater",
    ),
    ('[[layers]]\ntimes = 3\nthickness = "5 nm"', "both 'times' and 'thickness' in one table"),
    ("[[layers]]\ntimes = 3", "group from layer 1 on: layers: missing"),
    ('[[layers]]\nlayers = [{material="GaAs", thickness="5 nm"}]', "times: missing; .* times = 30"),
    ("[[layers]]\ntimes = 3\nlayers = []", "group from layer 1 on: no layers"),
    (
        '[[layers]]\ntimes = 0\nlayers = [{material="GaAs", thickness="5 nm"}]',
        "times: got 0; write a",
    ),
    ('[[layers]]\ntimes = 2.5\nlayers = [{material="GaAs", thickness="5 nm"}]', "times: got 2.5"),
    ("[[layers]]\ntimes = 2\ntims = 1\nlayers = []", "unknown key 'tims'; did you mean 'times'"),
    (
        '[[layers]]\ntimes = 2\nlayers = [{material="GaAs", thicknes="5 nm"}]',
        "layer 1 .*'thicknes'",
    ),
    # shapes
    ('[[layers]]\nthickness = "5 nm"\nx = 0.1\nx_points = []', "both 'x' and 'x_points' given"),
    ('[[layers]]\nthickness = "5 nm"\nx_points = [0, 1]', r"x_points: got \[0, 1\]; write points"),
    (
        '[[layers]]\nthickness = "5 nm"\nedge_points = 5',
        r"edge_points: got 5; .*\[\[depth, value\]",
    ),
    ('[[layers]]\nthickness = "5 nm"\nx_file = 5', "x_file: got 5; write the path of a CSV"),
    (
        '[[layers]]\nmaterial = "AlxGa1-xAs"\nthickness = "5 nm"\nx_points = [["0 nm", 0]]',
        "1 point",
    ),
    (
        '[[layers]]\nmaterial = "AlxGa1-xAs"\nthickness = "5 nm"\nx_points = [[0, 0], [5, 1]]',
        "0 nm",
    ),
    (f'[[layers]]\n{GAAS}grading = "cubic"', "grading: got 'cubic'"),
    # the stack's own
    (
        "[stack]\ntemperature = 77\n[[layers]]\n" + GAAS,
        "^well.toml: temperature: got 77; write '77 K'",
    ),
    ('[stack]\nfield = "1 kV/cm"\nbias = "1 V"\n[[layers]]\n' + GAAS, "field and bias: both given"),
    ("[stack]\nmaterials = 5\n[[layers]]\n" + GAAS, r"\[stack\]: materials: got 5; write paths"),
    ("[stack]\nmaterials = [5]\n[[layers]]\n" + GAAS, r"materials: got \[5\]; write paths"),
    ('[stack]\nends = ["open"]\n[[layers]]\n' + GAAS, "ends: got"),
    (
        '[stack]\norder = "surface first"\n[[layers]]\nmaterial = "GaAs"',
        r"toml \(surface first\), lay",
    ),
    # no TOML
    ("[stack]\n[[layers]]\nthickness = 5 nm", r"^well.toml: not TOML: .*line 3"),
    ("30 nm GaAs", "not TOML: .*line 1"),
    ('[[layers]]\nthickness = "1 nm"\nthickness = "2 nm"', "not TOML: .*line 3"),
]


@pytest.mark.parametrize(("text", "match"), MISTAKES)
def test_mistakes(text, match, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "well.toml").write_text(text)
    with pytest.raises(BandwrightError, match=match) as caught:
        read_stack("well.toml")
    assert str(caught.value).startswith("well.toml")
    assert "\n" not in str(caught.value)


def test_kinds_of_error():
    with pytest.raises(StackFileError):
        loads("[stak]")
    with pytest.raises(QuantityError):
        loads('[[layers]]\nmaterial = "GaAs"\nthickness = 6')


def test_files_that_can_not_be_read_or_written(tmp_path):
    path = tmp_path / "none.toml"
    with pytest.raises(StackFileError, match=r"none\.toml: can't be read: No such file"):
        read_stack(path)
    with pytest.raises(StackFileError, match="can't be read: Is a directory"):
        read_stack(tmp_path)
    path.write_bytes(b'[stack]\nname = "\xff"\n')
    with pytest.raises(StackFileError, match=r"none.toml: line 2 is not UTF-8 text; save"):
        read_stack(path)
    stack = Stack([Layer("5 nm", "GaAs")])
    with pytest.raises(StackFileError, match="can't be written: No such file or directory"):
        write_stack(stack, tmp_path / "no" / "stack.toml")


def test_half_a_character():
    from bandwright.stackfile.writer import toml_value

    with pytest.raises(StackFileError, match=r"'\\ud800' is half a character"):
        toml_value("a\ud800")


def test_quadratic_applies_to_every_pair():
    text = '[[layers]]\nmaterial = "AlxInyGa1-x-yAs"\nthickness = "8 nm"\n'
    layer = loads(text + 'x = [0.0, 0.3]\ny = [0.1, 0.0]\ngrading = "quadratic"\n').layers[0]
    assert (layer.x, layer.y) == (Quadratic(0.0, 0.3), Quadratic(0.1, 0.0))
