"""The house stands as DEVELOPERS.md draws it: every import looks down.

Read from the sources by an AST walk, so that an import inside a function counts as well.
"""

import ast
from pathlib import Path

import pytest

SRC = Path(__file__).parents[2] / "src" / "bandwright"

# From the ground up; a room imports only rooms named before it.
HOUSE = [
    "errors",
    "constants",
    "quantities",
    "frames",
    "formula",
    "strain",
    "materials",
    "shapes",
    "stack",
    "stackfile",
    "stackline",
    "stackframe",
    "parameters",
    "profile",
    "solver",
    "phase",
    "levels",
    "many",
    "gradients",
    "cautions",
    "lines",
    "budget",
    "monolayers",
    "metrics",
    "mismatch",
    "xray",
    "following",
    "sweeps",
    "aiming",
    "crossings",
    "tolerances",
    "wishes",
    "comparison",
    "growth",
    "digital",
    "fitting",
    "report",
    "pictures",
    "cli",
]

# A result's method may hand its object on to a room above, by an import inside that method:
# levels.lines(), levels.gradient(), levels._repr_html_(), lines.error_budget(). Nothing else may
# look up.
HANDED_ON = {
    ("aiming", "report"),
    ("digital", "report"),
    ("fitting", "report"),
    ("growth", "report"),
    ("levels", "cautions"),
    ("levels", "gradients"),
    ("levels", "lines"),
    ("levels", "pictures"),
    ("levels", "report"),
    ("lines", "budget"),
    ("lines", "report"),
    ("mismatch", "report"),
    ("xray", "report"),
    ("tolerances", "pictures"),
    ("tolerances", "report"),
}

KNOWN_TO_ONE = {
    "pint": "quantities",
    "pandas": "frames",
    "matplotlib": "pictures",
    "tqdm": "sweeps",
}
MODULES = sorted(p.relative_to(SRC) for p in SRC.rglob("*.py"))


def room_of(path):
    return path.parts[0].removesuffix(".py")


def only_for_types(node, parents):
    while node in parents:
        node = parents[node]
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.unparse(node.test):
            return True
    return False


def in_function(node, parents):
    while node in parents:
        node = parents[node]
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda):
            return True
    return False


def imports_of(path, source=None):
    """Yield (full name, inside a function, only for types) of every import in a module."""
    text = (SRC / path).read_text(encoding="utf-8") if source is None else source
    tree = ast.parse(text)
    parents = {child: node for node in ast.walk(tree) for child in ast.iter_child_nodes(node)}
    package = ("bandwright", *path.parts[:-1])
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else ()
            stem = [*base, *(node.module or "").split(".")] if node.module else [*base]
            names = [".".join([*stem, alias.name]) for alias in node.names]
        elif isinstance(node, ast.Call) and ast.unparse(node.func).endswith(
            ("import_module", "__import__")
        ):
            names = [ast.unparse(node.args[0]).strip("'\"")] if node.args else ["?"]
        else:
            continue
        for name in names:
            yield name, in_function(node, parents), only_for_types(node, parents)


def rooms_imported(path, source=None):
    """Yield (room, inside a function, only for types) of every import of our own."""
    for name, late, typed in imports_of(path, source):
        parts = name.split(".")
        if parts[0] == "bandwright":
            yield (parts[1] if len(parts) > 1 else "__init__"), late, typed


def looks_up(path, source=None):
    """Return the imports of one module that break the order, as text."""
    here = room_of(path)
    wrong = []
    for room, late, typed in rooms_imported(path, source):
        if room == here and len(path.parts) > 1:
            continue  # a room's own modules: test_nothing_circles looks at them
        if room not in HOUSE or HOUSE.index(room) >= HOUSE.index(here):
            if not ((late or typed) and (here, room) in HANDED_ON):
                wrong.append(f"{path} imports {room}")
    return wrong


def test_every_room_has_its_place():
    rooms = {room_of(p) for p in MODULES} - {"__init__", "__main__"}
    assert rooms <= set(HOUSE), f"no place in the house for {sorted(rooms - set(HOUSE))}"


@pytest.mark.parametrize("path", MODULES, ids=str)
def test_imports_look_down(path):
    if room_of(path) in ("__init__", "__main__"):
        return  # the doors stand above the house
    assert looks_up(path) == []


def test_the_walk_sees_a_wrong_import():
    assert looks_up(Path("stack.py"), "from .levels import solve") == ["stack.py imports levels"]
    late = "def f():\n    import bandwright.cli"
    assert looks_up(Path("levels.py"), late) == ["levels.py imports cli"]
    assert looks_up(Path("levels.py"), "from .lines import Lines") == ["levels.py imports lines"]
    assert looks_up(Path("levels.py"), "def f():\n    from .lines import Lines") == []
    assert looks_up(Path("solver/matrix.py"), "from ..cli import main") == [
        "solver/matrix.py imports cli"
    ]
    assert looks_up(Path("phase/search.py"), "from . import elements\nfrom ..solver import x") == []


def test_each_hand_over_is_used():
    used = {
        (room_of(path), room)
        for path in MODULES
        for room, late, _ in rooms_imported(path)
        if late and (room_of(path), room) in HANDED_ON
    }
    assert used == HANDED_ON


@pytest.mark.parametrize("package", KNOWN_TO_ONE)
def test_only_one_room_knows(package):
    knowing = {
        room_of(path)
        for path in MODULES
        for name, _, typed in imports_of(path)
        if name.split(".")[0] == package and not typed
    }
    assert knowing == {KNOWN_TO_ONE[package]}


def test_nothing_circles():
    modules = {}
    for path in MODULES:
        parts = path.with_suffix("").parts
        name = ".".join(("bandwright", *(parts[:-1] if parts[-1] == "__init__" else parts)))
        modules[name] = path
    graph = {
        name: {
            target
            for full, late, typed in imports_of(path)
            if not late and not typed
            for target in [full if full in modules else full.rpartition(".")[0]]
            if target in modules and target != name
        }
        - {"bandwright"}
        for name, path in modules.items()
    }
    done, open_ = set(), []

    def walk(name):
        assert name not in open_, "a circle: " + " -> ".join([*open_, name])
        if name in done:
            return
        open_.append(name)
        for target in sorted(graph[name]):
            walk(target)
        open_.pop()
        done.add(name)

    for name in graph:
        walk(name)


@pytest.mark.parametrize("path", MODULES, ids=str)
def test_rooms_stay_small(path):
    assert len((SRC / path).read_text(encoding="utf-8").splitlines()) <= 400
