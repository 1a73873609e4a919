"""One line of text: what it says, how it is written, and every way it can be wrong."""

import pytest

from bandwright import BandwrightError, Layer, Repeat, Stack, StackFileError, write_stack
from bandwright.shapes import Linear, Points
from bandwright.stackline import line_text, parse_line, read_any

WALL = Layer("30 nm", "Al0.28Ga0.72As")
GRADE = Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3])
OWN = Layer("8 nm", edge="250 meV", mass=0.09, gap="1.8 eV")

LINES = [
    ("30 nm Al0.28Ga0.72As, 6.2 nm GaAs", [WALL, Layer("6.2 nm", "GaAs")]),
    ("30nm Al0.28Ga0.72As,\n  62 Å GaAs", [WALL, Layer("6.2 nm", "GaAs")]),
    ("22 ML GaAs", [Layer("22 ML", "GaAs")]),
    (
        "30 x (5 nm GaAs, 8 nm Al0.3Ga0.7As)",
        [Repeat(30, [Layer("5 nm", "GaAs"), Layer("8 nm", "Al0.3Ga0.7As")])],
    ),
    ("2x(3×(5 nm GaAs), 1 * (8 nm {edge 250 meV, mass 0.09, gap 1.8 eV}))", None),
    ("8 nm AlxGa1-xAs {x 0 to 0.3}", [GRADE]),
    ("8 nm AlxGa1-xAs{x = 0 to 0.3}", [GRADE]),
    ("8 nm AlxGa1-xAs {x: 0 % to 30 %}", [GRADE]),
    ("8 nm {edge 250 meV, mass 0.09, gap 1.8 eV}", [OWN]),
    (
        "8 nm AlxGa1-xAs {x 0 to 0.3 quadratic}",
        [Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3], grading="quadratic")],
    ),
    (
        "8 nm AlxGa1-xAs {x 0 to 0.3, grading quadratic}",
        [Layer("8 nm", "AlxGa1-xAs", x=[0.0, 0.3], grading="quadratic")],
    ),
    (
        "8 nm AlxGa1-xAs {x 0 at 0 nm to 0.12 at 3 nm to 0.3 at 8 nm}",
        [Layer("8 nm", "AlxGa1-xAs", x=[("0 nm", 0), ("3 nm", 0.12), ("8 nm", 0.3)])],
    ),
    (
        "6 nm GaAs {label wide well, donors 2e11 / cm^2, field 1 MV/cm}",
        [Layer("6 nm", "GaAs", label="wide well", donors="2e11 / cm^2", field="1 MV/cm")],
    ),
    (
        r'6 nm GaAs {label "a, \"b\" {c}"}, 6 nm GaAs {label"d"}',
        [Layer("6 nm", "GaAs", label='a, "b" {c}'), Layer("6 nm", "GaAs", label="d")],
    ),
    ('6 nm "my alloy, 3" {label a}', [Layer("6 nm", "my alloy, 3", label="a")]),
    (
        "8 nm {edge 0 meV, mass 0.1, nonparabolicity 0.5 / eV}",
        [Layer("8 nm", edge="0 eV", mass=0.1, nonparabolicity="0.5 / eV")],
    ),
]


@pytest.mark.parametrize(("line", "layers"), LINES)
def test_lines(line, layers):
    if layers is None:
        layers = [Repeat(2, [Repeat(3, [Layer("5 nm", "GaAs")]), Repeat(1, [OWN])])]
    stack = parse_line(line, zero="GaAs")
    assert stack == Stack(layers, zero="GaAs")
    assert parse_line(line_text(stack), zero="GaAs") == stack


def test_what_is_written():
    stack = Stack(
        [
            Layer("30 nm", "Al0.28Ga0.72As", label="left barrier"),
            Repeat(2, [Layer("22 ML", "GaAs", donors="2e11 / cm^2"), GRADE]),
            Layer("8 nm", edge=["0 eV", "0.25 eV"], mass=[0.07, 0.09], grading="quadratic"),
            Layer("1 nm", "my alloy", label="a, b"),
        ],
        zero="GaAs",
    )
    assert line_text(stack) == (
        "30 nm Al0.28Ga0.72As {label left barrier},"
        " 2 x (22 ML GaAs {donors 2e11 / cm^2}, 8 nm AlxGa1-xAs {x 0 to 0.3}),"
        " 8 nm {edge 0 meV to 250 meV quadratic, mass 0.07 to 0.09 quadratic},"
        ' 1 nm "my alloy" {label "a, b"}'
    )


def test_arguments_of_the_stack():
    stack = parse_line(
        "8 nm AlxGa1-xAs {x 0 to 0.3}, 6 nm GaAs", temperature="77 K", order="surface first"
    )
    assert stack.temperature == 77.0
    assert stack.layers[1].x == Linear(0.3, 0.0)


def test_a_callable_does_not_fit():
    bowl = Layer("8 nm", "AlxGa1-xAs", x=lambda z: z / 80)
    with pytest.raises(StackFileError, match=r"layer 1 \(AlxGa1-xAs\): x is a callable"):
        line_text(Stack([bowl]))


MISTAKES = [
    ("", "^line: no layers; write them like '30 nm"),
    ("2 x ()", "group from layer 1 on: no layers"),
    ("6 nm GaAs, ", "layer 2: nothing stands between two commas, or after the last"),
    ("6 nm GaAs,, 5 nm AlAs", "layer 2: nothing stands between two commas"),
    ("GaAs 6 nm", "layer 1: got 'GaAs 6 nm'; a layer begins with its thickness"),
    ("(5 nm GaAs) x 3", r"got '\(5 nm GaAs\) x 3'; a group is written 30 x \(...\)"),
    ("x (5 nm GaAs)", r"a group is written 30 x \(...\)"),
    ("0 x (5 nm GaAs)", "group from layer 1 on: times: got 0; write a whole number from 1"),
    ("2.5 x (5 nm GaAs)", "times: got '2.5'"),
    (
        "6 nm GaAs, 30 Al0.3Ga0.7As",
        "layer 2: thickness: got '30' before 'Al0.3Ga0.7As'; write '30 nm",
    ),
    ("30", r"layer 1 .*: thickness: got '30'; write '30 nm'"),
    ("30 nm", "layer 1 .*: no material"),
    (
        "30 mn GaAs",
        r"layer 1 \(GaAs\): thickness: got '30 mn'; unit 'mn' is not known; did you mean",
    ),
    ("30 meV GaAs", "thickness: got '30 meV'; that is an energy"),
    ("-3 nm GaAs", "thickness: got '-3 nm'; a thickness must be above zero"),
    ("1_000 nm GaAs", "thickness: got '1_000 nm'; write '1000 nm'"),
    (
        "6,2 nm GaAs",
        "line: a comma between two digits in '6,2 nm GaAs'; write decimals with a point",
    ),
    ("30 nm Al0,28Ga0.72As", "a comma between two digits in"),
    ("6 nm GaAs 5 nm AlAs", "layer 1: got 'GaAs 5 nm AlAs' as material; put a comma between"),
    ('6 nm "GaAs" 5 nm AlAs', "layer 1: '5 nm AlAs' follows the material; put a comma"),
    ("2 x (5 nm GaAs, 6 nm AlAs", r"line: '\(' is not closed by '\)' in '2 x \(5 nm GaAs"),
    ("5 nm GaAs), 6 nm AlAs", r"line: '\)' closes nothing in '5 nm GaAs\), 6 nm"),
    ("6 nm GaAs {label a", "'{' is not closed by '}' in "),
    ('6 nm GaAs {label "a}', "a quote is not closed in "),
    ('6 nm GaAs {label "a"b}', r'"a"b is no quoted text; write \\" for a quote'),
    ("6 nm GaAs {label a} x", "got '{label a} x'; braces hold everything else and end the layer"),
    ("6 nm GaAs {label a}{label b}", "got '{label a}{label b}'; braces hold everything else"),
    ("6 nm GaAs {label}", r"layer 1 \(GaAs\): got 'label' in braces; write a key and a value"),
    ("6 nm GaAs {}", r"layer 1 \(GaAs\): got '' in braces"),
    ("6 nm GaAs {lable a}", r"layer 1 \(GaAs\): unknown key 'lable'; did you mean 'label'"),
    ("6 nm GaAs {thickness 5 nm}", "unknown key 'thickness'"),
    ("6 nm GaAs {label a, label b}", "'label' is given twice; leave one out"),
    ("6 nm GaAs {donors 2e11}", r"layer 1 \(GaAs\): donors: got '2e11'; write '2e11 / cm\^2'"),
    ("8 nm {edge 250, mass 0.1}", "edge: got '250'; write '250 meV'"),
    ("8 nm {edge 250 meV}", "mass: missing beside edge"),
    ("8 nm AlxGa1-xAs {x 0 to 0.1 to 0.2}", "x: got .*; give one value, a pair"),
    ("8 nm AlxGa1-xAs {x 0 to 3}", "x .*: got '3'; a fraction lies between 0 and 1"),
    ("8 nm AlxGa1-xAs {x 0 at 0 nm to 0.3 at 7 nm}", "x: the table ends at 7 nm"),
    ("8 nm AlxGa1-xAs {x 0.3 quadratic}", "grading: got 'quadratic' but no pair to grade"),
    (
        "8 nm AlxInyGa1-x-yAs {x 0 to 0.3 quadratic, y 0 to 0.1}",
        "layer 1 .*: a grading for some; write 'linear' or 'quadratic' behind every pair",
    ),
    ("8 nm AlxGa1-xAs {x 0 to 0.3 linear, grading quadratic}", "a grading for some"),
    ("6 nm GaAs {mass 0.1}", "mass: own numbers on a material"),
]


@pytest.mark.parametrize(("line", "match"), MISTAKES)
def test_mistakes(line, match):
    with pytest.raises(BandwrightError, match=match) as caught:
        parse_line(line)
    assert "\n" not in str(caught.value)


# --- what a person in a shell means ---------------------------------------------------------


def test_file_or_line(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    stack = Stack([Layer("6 nm", "GaAs")], name="a")
    write_stack(stack, "well.toml")
    write_stack(stack, "5 nm GaAs")  # a file may be called anything
    write_stack(stack, "ammonia")
    assert read_any("well.toml") == read_any("ammonia") == read_any("5 nm GaAs") == stack
    assert read_any(str(tmp_path / "well.toml"), temperature="77 K").temperature == 77.0
    assert read_any("well.toml", temperature="77 K").name == "a"
    assert read_any("6 nm GaAs", name="a") == stack
    assert read_any(" 2 x (6 nm GaAs)").layers == (Repeat(2, stack.layers),)


def test_neither_file_nor_line(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    write_stack(Stack([Layer("6 nm", "GaAs")]), "well.toml")
    (tmp_path / "stacks").mkdir()
    for text, match in [
        ("wel.toml", r"^wel.toml: no such file; did you mean 'well.toml'\?$"),
        ("zzz.toml", "^zzz.toml: no such file$"),
        ("far/off/well.toml", "^far/off/well.toml: no such file$"),
        ("stacks/3nm", "^stacks/3nm: no such file$"),
        ("stacks", "^stacks: is a folder; name a stack file in it"),
        ("well", "'well' is neither an existing stack file nor a line of layers; a line begins"),
        ("GaAs 6 nm", "neither an existing stack file nor a line"),
        ("", "line: no layers"),
        ("6 nm GaAs\0", "layer 1"),
        ("9" * 5000, "layer 1"),
    ]:
        with pytest.raises(BandwrightError, match=match):
            read_any(text)


def test_points_in_the_braces_are_exact():
    stack = parse_line("8 nm AlxGa1-xAs {x 0.1 at 0 Å to 0.3 at 80 Å}")
    assert stack.layers[0].x == Points((0.0, 8.0), (0.1, 0.3))
