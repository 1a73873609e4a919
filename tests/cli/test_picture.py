"""``bandwright picture``."""

import pytest

from bandwright.errors import PictureError


@pytest.mark.parametrize("suffix", ["png", "svg"])
def test_a_picture_is_written_and_nothing_printed(run, demo, tmp_path, suffix):
    path = tmp_path / f"well.{suffix}"
    status, out, err = run("picture", demo / "detector-well.toml", "--output", path)
    assert (status, out, err) == (0, "", "")
    data = path.read_bytes()
    assert data.startswith(b"<?xml" if suffix == "svg" else b"\x89PNG")
    if suffix == "svg":
        text = data.decode("utf-8")
        assert "<!-- ammonia monitor, detector well -->" in text
        assert 'id="psi 2"' in text and 'id="psi 3"' not in text


def test_cautions_stand_on_standard_error(run, demo, tmp_path):
    path = tmp_path / "stage.png"
    status, out, err = run("picture", demo / "emitter-stage.toml", "--output", path)
    assert (status, out) == (0, "") and path.exists()
    assert err.startswith("caution    ")


def test_the_budget_and_the_size(run, well, tmp_path):
    path = tmp_path / "budget.svg"
    status, _, _ = run("picture", well, "--show", "budget", "--output", path, "--width", "10 cm")
    assert status == 0
    text = path.read_text(encoding="utf-8")
    assert "<!-- well, +1 ML -->" in text and "<!-- 2 to 1" in text
    assert 'width="283.464567pt"' in text


def test_options_of_the_stack_and_the_solution(run, well, tmp_path):
    path = tmp_path / "well.svg"
    words = ("--field", "-20 kV/cm", "--at-most", "1", "--whole", "--height", "70 mm")
    status, _, _ = run("picture", well, "--output", path, *words)
    assert status == 0
    text = path.read_text(encoding="utf-8")
    assert "<!-- electrons run to the surface (20 kV/cm) -->" in text
    assert 'id="psi 1"' in text and 'id="psi 2"' not in text


SWEEP = """\
# bandwright sweep: {"over": {"parameters": [{"column": "well.x"}, {"column": "field_kV_per_cm"}]}}
design,well.x,field_kV_per_cm,levels,wavelength_um,reason
1,0.1,0,2,9.5,
3,0.2,0,2,10.5,
2,0.1,20,2,9.75,
4,0.2,20,0,,no level
"""


@pytest.fixture
def table(tmp_path):
    def write(text, name="table.csv"):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return write


def test_a_sweep_from_its_results_file(run, table, tmp_path):
    path = tmp_path / "sweep.svg"
    status, out, err = run("picture", table(SWEEP), "--output", path)
    assert (status, out, err) == (0, "", "")
    text = path.read_text(encoding="utf-8")
    assert 'id="curve 0"' in text and 'id="curve 20"' in text
    assert "<!-- field\N{NO-BREAK SPACE}(kV/cm) -->" in text


def test_a_sweep_as_asked(run, table, tmp_path):
    path = tmp_path / "sweep.svg"
    bare = SWEEP.partition("\n")[2].replace(",,", ",8,").replace("no level", "")
    words = ("--over", "field_kV_per_cm", "--over", "well.x", "--metric", "levels")
    status, _, err = run("picture", table(bare), "--output", path, *words)
    assert (status, err) == (0, "")
    text = path.read_text(encoding="utf-8")
    assert 'id="curve 0.1"' in text and "<!-- levels -->" in text
    status, _, err = run("picture", table(bare), "--output", path, *words, "--kind", "map")
    assert status == 0 and 'id="map' in path.read_text(encoding="utf-8")


def test_a_budget_from_its_table(run, table, tmp_path):
    path = tmp_path / "budget.svg"
    head = "what,change,shift_meV,shift_um,remark"
    rows = ("well,+1 ML,-4.4,0.39,", 'field,+1 kV/cm,0,0,"a, b"')
    status, _, err = run("picture", table("\n".join((head, *rows))), "--output", path)
    assert (status, err) == (0, "")
    text = path.read_text(encoding="utf-8")
    assert "<!-- +0.390 -->" in text and "<!-- 0* -->" in text


@pytest.mark.parametrize(
    ("text", "words", "says"),
    [
        (None, [], "none.csv: can't be read: No such file"),
        ("a,b\n", [], "table.csv: holds no table; a line of names"),
        ("a,b\n1,2\n3\n", [], "table.csv: row 2 has 1 cells under 2 names"),
        ("a,b\n1,2\n", ["--metric", "c"], "there is no column 'c'"),
        ("a,b\n1,2\n", ["--kind", "map"], "kind: a map needs two parameters"),
        ("a,b\n1,2\n", ["--show", "bands"], "--show is for a stack; a table is drawn as"),
    ],
)
def test_a_mistake_about_a_table(run, table, tmp_path, text, words, says):
    source = tmp_path / "none.csv" if text is None else table(text)
    status, out, err = run("picture", source, "--output", tmp_path / "a.svg", *words)
    assert (status, out) == (2, "") and err.count("\n") == 1
    assert says in err and not (tmp_path / "a.svg").exists()


def test_a_table_that_is_no_text(run, tmp_path):
    path = tmp_path / "table.csv"
    path.write_bytes(b"\xff\xfe\x00")
    status, _, err = run("picture", path, "--output", tmp_path / "a.svg")
    assert status == 2 and "table.csv: is no text; a table in CSV is due" in err


@pytest.mark.parametrize("option", ["--over", "--metric", "--kind"])
def test_options_of_a_table_with_a_stack(run, well, tmp_path, option):
    status, _, err = run("picture", well, "--output", tmp_path / "a.svg", option, "map")
    assert status == 2 and f"{option} is for a sweep's table; name a file that" in err


@pytest.mark.parametrize(
    ("words", "says"),
    [
        ([], "required: --output; see bandwright picture --help"),
        (["--output", "well.jpg"], "well.jpg: got the suffix '.jpg'; name a file that ends"),
        (["--output", "none/well.svg"], "none/well.svg: can't be written: No such file"),
        (["--output", "a.svg", "--width", "85"], "width: got '85'; write '85 nm'"),
        (["--output", "a.svg", "--show", "budgets"], "invalid choice: 'budgets'"),
        (["--output", "a.svg", "--below", "5 meV"], "there is no level to draw"),
    ],
)
def test_a_mistake_is_one_line_and_leaves_no_file(run, well, tmp_path, monkeypatch, words, says):
    monkeypatch.chdir(tmp_path)
    status, out, err = run("picture", well, *words)
    assert (status, out) == (2, "") and err.count("\n") == 1
    assert says in err
    assert list(tmp_path.iterdir()) == []


def test_without_matplotlib(run, well, tmp_path, monkeypatch):
    from bandwright.pictures import sheet

    def missing():
        raise PictureError("pictures need matplotlib; install it")

    monkeypatch.setattr(sheet, "need_matplotlib", missing)
    status, _, err = run("picture", well, "--output", tmp_path / "a.svg")
    assert (status, err) == (2, "bandwright: pictures need matplotlib; install it\n")
