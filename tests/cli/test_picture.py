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
