"""What a reader copies from README is what runs, and its output is the real one.

``pytest tests/cli --rewrite-golden`` writes the outputs anew.
"""

import contextlib
import io
import re
import runpy
import shlex
import shutil

import pytest

FENCE = re.compile(r"```(?P<kind>\w*)\n(?P<text>.*?)```", re.DOTALL)


def console(text, run):
    """Run the ``$`` lines of a console block and return the block with their real output."""
    out = []
    for line in text.splitlines():
        if line.startswith("$ "):
            program, *words = shlex.split(line[2:])
            assert program == "bandwright"
            status, printed, _ = run(*words)
            assert status == 0, line
            out.append(f"{line}\n{printed}")
    assert out, "a console block without a command"
    return "".join(out)


def python(text):
    """Run a block of Python and return what it prints."""
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed):
        exec(compile(text, "README.md", "exec"), {"__name__": "readme"})
    return printed.getvalue()


@pytest.fixture
def folder(root, tmp_path, monkeypatch):
    """A folder that looks like a checkout to README's commands."""
    shutil.copytree(root / "demo", tmp_path / "demo")
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_examples_and_their_output(root, folder, run, request):
    path = root / "README.md"
    page = path.read_text(encoding="utf-8")
    real, printed, kinds = page, None, []
    for block in FENCE.finditer(page):
        kind, text = block["kind"], block["text"]
        kinds.append(kind)
        if kind == "toml":
            name = re.match(r"# file: (\S+)\n", text)
            assert name, "a TOML block begins with '# file: NAME'"
            (folder / name[1]).write_text(text, encoding="utf-8")
        elif kind == "python":
            printed = python(text)
        elif kind == "text":
            assert printed is not None, "an output without its example"
            real = real.replace(f"```text\n{text}```", f"```text\n{printed}```")
            printed = None
        elif kind == "console":
            real = real.replace(block[0], f"```console\n{console(text, run)}```")
    assert kinds.count("python") == 2 and kinds.count("console") >= 3
    assert printed is None, "an example without its output"
    if request.config.getoption("--rewrite-golden"):
        path.write_text(real, encoding="utf-8")
        page = real
    assert page == real


def test_the_python_example_is_ten_lines(root):
    page = (root / "README.md").read_text(encoding="utf-8")
    text = next(b["text"] for b in FENCE.finditer(page) if b["kind"] == "python")
    assert len(text.splitlines()) <= 10


def test_ci_runs_exactly_the_two_command_lines(root):
    page = (root / "README.md").read_text(encoding="utf-8")
    commands = [line for line in page.splitlines() if line.startswith("python3 -m venv ")]
    assert len(commands) == 2
    assert "bandwright lines demo/" in commands[0]
    assert commands[1].endswith("-m pytest -q")


def test_developers_page_draws_the_house_that_is_tested(root):
    from importlib.util import module_from_spec, spec_from_file_location

    spec = spec_from_file_location("house", root / "tests" / "unit" / "test_house.py")
    house = module_from_spec(spec)
    spec.loader.exec_module(house)
    page = (root / "DEVELOPERS.md").read_text(encoding="utf-8")
    page = page.split("## Imports look down")[1].split("\n## ")[0]
    heads = [line.split("|")[1] for line in page.splitlines() if line.startswith("| `")]
    assert [room for head in heads for room in re.findall(r"`(\w+)`", head)] == house.HOUSE


def test_the_demo_script_runs_from_anywhere(root, tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    runpy.run_path(str(root / "demo" / "ammonia.py"), run_name="__main__")
    out = capsys.readouterr().out
    assert "wavelength_um" in out and "ammonia monitor, detector well" in out
    assert "+1 ML" in out
