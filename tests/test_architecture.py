"""The map of the rooms, kept true: who may import whom, and what loads when."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "ductsolve"
MODULES = sorted(PACKAGE.rglob("*.py"))

# A room imports only from these; everything from itself.
ALLOWED = {
    "errors": set(),
    "rheology": {"errors"},
    "mesh": {"errors"},
    "solver": {"errors", "rheology", "mesh"},
    "post": {"errors", "rheology", "mesh", "solver"},
    "app": {"errors", "rheology", "mesh", "solver", "post"},
}
# The package itself, whose public names load when they are first used, and ``python -m``.
DOORS = {"__init__", "__main__"}
VERSION = "ductsolve.__version__"  # open to all
# What only the room that meets users may load.
ONLY_IN_APP = {"pint", "matplotlib", "click"}
# Other packages the rest may load.
NUMERICAL = {"numpy", "scipy", "meshio", "numba"}


def module_name(path):
    parts = path.relative_to(PACKAGE.parent).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def imports(path, top_level_only=False):
    """Full names of all modules that a file imports."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    nodes = tree.body if top_level_only else ast.walk(tree)
    found = set()
    for node in nodes:
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path.name}: relative import"
            whole = {f"{node.module}.{alias.name}" for alias in node.names}
            found |= {name if name in NAMES else node.module for name in whole - {VERSION}}
    return found


NAMES = {module_name(path) for path in MODULES}


def room(name):
    """The part of the package a full module name belongs to, None outside it."""
    first, *rest = name.split(".")
    if first != PACKAGE.name:
        return None
    return rest[0] if rest else "__init__"


@pytest.mark.parametrize("path", MODULES, ids=module_name)
def test_a_room_imports_only_from_the_rooms_to_its_left(path):
    own = room(module_name(path))
    if own in DOORS:
        return
    assert own in ALLOWED, f"{own} is not on the map: add it here and to the map of the project"
    for name in imports(path):
        other = room(name)
        if other is not None:
            assert other == own or other in ALLOWED[own], f"{own} must not import {name}"


@pytest.mark.parametrize("path", MODULES, ids=module_name)
def test_only_the_app_meets_users(path):
    if room(module_name(path)) in {"app", *DOORS}:
        return
    outside = {name.split(".")[0] for name in imports(path)} - {PACKAGE.name}
    assert not outside & ONLY_IN_APP
    assert outside <= NUMERICAL | sys.stdlib_module_names
    calls = [node for node in ast.walk(ast.parse(path.read_text())) if isinstance(node, ast.Call)]
    assert not [
        call for call in calls if isinstance(call.func, ast.Name) and call.func.id in {"print", "exit"}
    ]


@pytest.mark.parametrize("path", MODULES, ids=module_name)
def test_imports_hide_in_functions_only_where_start_up_must_be_quick(path):
    if room(module_name(path)) not in {"app", *DOORS}:
        assert imports(path) == imports(path, top_level_only=True)


def test_no_import_cycles():
    following = {
        module_name(path): {name for name in imports(path) if name in NAMES} - {module_name(path)}
        for path in MODULES
    }
    while following:
        free = [name for name, others in following.items() if not others & following.keys()]
        assert free, f"imports in a circle among {sorted(following)}"
        for name in free:
            del following[name]


def loaded_after(statement):
    """Names of the packages that a fresh interpreter holds after a statement."""
    code = f"import sys; {statement}; print(*sorted({{name.split('.')[0] for name in sys.modules}}))"
    run = subprocess.run(
        [sys.executable, "-c", code], cwd=PACKAGE.parent, capture_output=True, text=True, check=True
    )
    return set(run.stdout.split())


@pytest.mark.parametrize("statement", ["import ductsolve", "import ductsolve; dir(ductsolve)"])
def test_importing_the_package_loads_nothing_numerical(statement):
    assert not loaded_after(statement) & (NUMERICAL | ONLY_IN_APP)


def test_the_error_classes_cost_nothing():
    assert not loaded_after("from ductsolve import DuctsolveError") & (NUMERICAL | ONLY_IN_APP)


def test_solving_loads_nothing_of_the_app():
    use = (
        "import ductsolve as d; "
        "d.solve(d.rectangle(1, 1), d.PowerLaw(1, 0.5), pressure_gradient=1).wall_shear.max"
    )
    assert not loaded_after(use) & (ONLY_IN_APP | {"numba", "meshio"})


def test_every_public_name_is_there():
    code = "import ductsolve; print([n for n in ductsolve.__all__ if getattr(ductsolve, n, None) is None])"
    run = subprocess.run([sys.executable, "-c", code], cwd=PACKAGE.parent, capture_output=True, text=True)
    assert run.stdout.strip() == "[]", run.stderr
