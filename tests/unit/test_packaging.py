"""What pyproject.toml says, checked against the tree it is about.

`.ci/run` builds the wheel and tries it, and the editable install, far from the checkout.
"""

import importlib.resources
import re
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
PROJECT = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))


def test_every_folder_of_modules_is_packaged():
    found = {
        ".".join(path.parent.relative_to(ROOT / "src").parts)
        for path in (ROOT / "src").rglob("__init__.py")
    }
    assert set(PROJECT["tool"]["setuptools"]["packages"]) == found | {"bandwright_materials"}


def test_every_module_lies_in_a_package():
    for path in (ROOT / "src").rglob("*.py"):
        assert (path.parent / "__init__.py").exists(), path


def test_material_files_are_found_by_the_import_system():
    shipped = {p.name for p in importlib.resources.files("bandwright_materials").iterdir()}
    in_tree = {p.name for p in (ROOT / "materials").glob("*.toml")}
    assert in_tree, "materials/ holds no file"
    assert in_tree <= shipped


def test_nothing_but_toml_would_be_left_out_of_materials():
    kinds = {p.suffix for p in (ROOT / "materials").iterdir() if p.is_file()}
    assert kinds <= {".py", ".toml"}


@pytest.mark.parametrize("requirement", PROJECT["project"]["dependencies"])
def test_each_dependency_has_one_lower_bound_that_ci_can_pin(requirement):
    assert re.fullmatch(r"(numpy|scipy|pint|pandas|tqdm)>=\d+(\.\d+)+", requirement)


def test_nothing_else_is_needed_at_run_time():
    assert len(PROJECT["project"]["dependencies"]) == 5
