"""The house has floors: a folder imports only from the ones above it, and nothing heavy at import."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1] / "src" / "beforehand"

# From the ground floor up; a module imports from its own floor or one before it.
FLOORS = (
    ("version", "faults", "names"),
    ("plan",),
    ("table",),
    ("fit",),
    ("steps",),
    ("lock", "wording"),
    ("running",),
    ("answer",),
    ("record",),
    ("fields", "review", "drafting", "guide", "comparing"),
    ("sealing",),
    ("refreshing",),
    ("runs",),
    ("rehearsing",),
    ("handing",),
    ("predicting",),
    ("picturing",),
    ("exchange", "rehearsals"),
    ("api",),
    ("screen",),
    ("reporting",),
    ("cli", "__main__", "__init__"),
)
FLOOR_OF = {name: number for number, names in enumerate(FLOORS) for name in names}
# Leaf modules without a rule of the house in them, which a floor above may lend from below.
LENT = {("table", "fit"), ("screen", "guide")}
HEAVY = {"pandas", "statsmodels", "matplotlib", "hypothesis"}
MODULES = sorted(ROOT.rglob("*.py"))


def imports_of(path: Path, *, only_top: bool) -> set[str]:
    """Modules that a file imports, at its top or anywhere, but for those that only a type checker sees."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    skipped: set[ast.AST] = set()
    for node in ast.walk(tree):
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.dump(node.test):
            skipped |= set(ast.walk(node))
        if only_top and isinstance(node, ast.FunctionDef | ast.AsyncFunctionDef):
            skipped |= {inner for inner in ast.walk(node) if inner is not node}
    found: set[str] = set()
    for node in ast.walk(tree):
        if node in skipped:
            continue
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        if isinstance(node, ast.ImportFrom) and node.module:
            found |= {node.module, *(f"{node.module}.{alias.name}" for alias in node.names)}
    return found


def floor(name: str) -> str:
    """The top part of a module's name inside the package."""
    return name.split(".")[1] if name.count(".") else "__init__"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_a_module_imports_only_from_its_floor_or_one_above_in_the_list(path):
    """The direction of imports is that of DEVELOPERS.md."""
    place = path.relative_to(ROOT).parts[0].removesuffix(".py")
    for name in imports_of(path, only_top=False):
        if not name.startswith("beforehand."):
            continue
        other = floor(name)
        if other not in FLOOR_OF or place == "__init__":
            continue
        assert FLOOR_OF[other] <= FLOOR_OF[place] or (place, other) in LENT, f"{path} imports {name}"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_nothing_heavy_is_imported_at_the_top(path):
    """pandas, statsmodels and scipy.stats are imported by the functions that need them."""
    for name in imports_of(path, only_top=True):
        assert name.split(".")[0] not in HEAVY, f"{path} imports {name}"
        assert not name.startswith("scipy.stats"), f"{path} imports {name}"


def test_importing_the_package_loads_almost_nothing():
    """``import beforehand`` alone loads neither numpy nor pydantic."""
    heavy = ["numpy", "pydantic", "scipy", "yaml"]
    code = f"import sys, beforehand; print([name for name in {heavy} if name in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_no_module_is_long():
    """A module holds one concept; past 400 lines it is split."""
    assert [
        (p.name, n) for p in MODULES if (n := len(p.read_text(encoding="utf-8").splitlines())) > 400
    ] == []
