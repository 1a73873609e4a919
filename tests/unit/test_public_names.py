"""`import bandwright` costs nothing, and every public name is found where it is promised."""

import ast
import json
import subprocess
import sys
from importlib.metadata import version
from pathlib import Path

import pytest

import bandwright as bw

ROOT = Path(bw.__file__)


def test_the_import_loads_none_of_our_rooms_nor_any_library():
    code = (
        "import sys; before = set(sys.modules); import bandwright, json;"
        "print(json.dumps(sorted(set(sys.modules) - before)))"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    tops = {name.split(".")[0] for name in json.loads(run.stdout)}
    assert tops <= {"bandwright", *sys.stdlib_module_names}
    assert [n for n in json.loads(run.stdout) if n.startswith("bandwright")] == ["bandwright"]


@pytest.mark.parametrize("name", bw.__all__)
def test_every_public_name_is_there(name):
    assert getattr(bw, name) is not None
    assert name in dir(bw)


def test_a_room_does_not_hide_a_public_name():
    # importing bandwright.lines sets the attribute `lines` of the package, and so for every
    # room; so no public name may be called like a room
    rooms = {path.stem for path in ROOT.parent.iterdir()}
    assert rooms.isdisjoint(bw.__all__)


def test_names_for_type_checkers_are_the_names_at_run_time():
    tree = ast.parse(ROOT.read_text(encoding="utf-8"))
    (block,) = [n for n in tree.body if isinstance(n, ast.If) and "TYPE" in ast.unparse(n.test)]
    typed = {
        alias.asname: node.module
        for node in block.body
        if isinstance(node, ast.ImportFrom)
        for alias in node.names
    }
    assert typed == bw._ROOM_OF


def test_version():
    assert bw.__version__ == version("bandwright")


def test_an_unknown_name():
    with pytest.raises(AttributeError, match="module 'bandwright' has no attribute 'solv'"):
        _ = bw.solv
