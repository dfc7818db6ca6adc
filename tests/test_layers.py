"""Layers import only downward; importing the package stays light."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import torsionfe

ROOT = Path(torsionfe.__file__).parent
#: From the ground up. Modules of one floor don't import each other, packages are free inside.
FLOORS = [
    ["errors", "cautions"],
    ["checks", "text", "storing", "units"],
    ["quantities"],
    ["outline"],
    ["mesh"],
    ["fem"],
    ["torsion"],
    ["closed_form"],
    ["member"],
    ["study"],
    ["output"],
    ["job"],
    ["cli"],
    ["__init__", "__main__"],
]
FLOOR = {name: level for level, names in enumerate(FLOORS) for name in names}
MODULES = sorted(path.relative_to(ROOT) for path in ROOT.rglob("*.py"))


def room(path):
    return path.parts[0].removesuffix(".py")


def imports(tree):
    """Return the rooms that a module imports when it is loaded (imports inside functions are not)."""
    found = set()
    pending = list(tree.body)
    while pending:
        node = pending.pop()
        if isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef | ast.Lambda):
            continue
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.unparse(node.test):
            continue
        names = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            names = [node.module] if node.module != "torsionfe" else [f"torsionfe.{a.name}" for a in node.names]
        found |= {name.split(".")[1] for name in names if name.startswith("torsionfe.")}
        pending.extend(ast.iter_child_nodes(node))
    return found & set(FLOOR)


@pytest.mark.parametrize("path", MODULES, ids=str)
def test_imports_run_downward(path):
    own = room(path)
    assert own in FLOOR, f"{own} has no floor: give it one"
    if own in ("__init__", "__main__"):
        return
    used = imports(ast.parse((ROOT / path).read_text())) - {own}
    upward = {name for name in used if FLOOR[name] >= FLOOR[own]}
    assert not upward, f"{path} imports upward: {upward}"


def test_closed_forms_know_nothing_of_finite_elements():
    for path in MODULES:
        if room(path) == "closed_form":
            assert not imports(ast.parse((ROOT / path).read_text())) & {"mesh", "fem", "torsion"}


def test_a_function_that_imports_upward_is_seen():
    assert imports(ast.parse("from torsionfe.output import contour")) == {"output"}
    assert imports(ast.parse("def f():\n    from torsionfe.output import contour")) == set()


@pytest.mark.parametrize("path", MODULES, ids=str)
def test_no_module_is_longer_than_a_sitting(path):
    assert len((ROOT / path).read_text().splitlines()) <= 500


def test_importing_the_package_is_light():
    heavy = "{'matplotlib', 'ezdxf', 'jinja2', 'tqdm', 'meshio', 'scipy.sparse.linalg', 'scipy.spatial', 'distributed'}"
    code = f"import sys, torsionfe; print(sorted({heavy} & set(sys.modules)))"
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert found.stdout.strip() == "[]"


def test_every_public_name_is_there_and_known_to_type_checkers():
    tree = ast.parse((ROOT / "__init__.py").read_text())
    typed = {}
    for node in ast.walk(tree):
        if isinstance(node, ast.ImportFrom) and node.module.startswith("torsionfe."):
            typed |= {alias.name: node.module.removeprefix("torsionfe.") for alias in node.names}
    assert set(torsionfe.__all__) == set(typed)
    assert typed.items() >= torsionfe._HOME.items()
    for name in torsionfe.__all__:
        assert getattr(torsionfe, name) is not None
    assert set(torsionfe.__all__) <= set(dir(torsionfe))
    with pytest.raises(AttributeError, match="no attribute 'torsoin'"):
        torsionfe.torsoin  # noqa: B018
