"""The walls of the house: what a layer may import, and what a cold start may cost."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

SOURCE = Path(__file__).parents[1] / "src" / "headledger"
HEAVY = frozenset({"numpy", "scipy", "pandas", "pint", "rich", "textual", "reportlab", "python_calamine"})
# Who may import what, by the first folder or module under the package.
OWNERS = {
    "textual": {"tui"},
    "rich": {"cli", "tui", "sheets"},
    "pandas": {"readers", "sheets"},
    "pint": {"quantities"},
    "reportlab": {"sheets"},
    "click": {"cli"},
}
SCIPY_PARTS = {"special", "linalg", "sparse"}
CORE = ("quantities", "physics", "statistics", "plant", "diagnosis")


def imported_names(path: Path) -> set[str]:
    """Every module that a file imports, at its top or later, as dotted names."""
    names: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom) and node.module and not node.level:
            names.update(f"{node.module}.{alias.name}" for alias in node.names)
    return names


def modules_after(code: str) -> set[str]:
    """Top-level modules that a fresh interpreter holds after running some code."""
    script = f"import sys\n{code}\nprint('\\n'.join({{name.split('.')[0] for name in sys.modules}}), file=sys.stderr)"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    return set(done.stderr.split())


def module_names(layer: str) -> list[str]:
    """Dotted names of all modules of a layer."""
    single = SOURCE / f"{layer}.py"
    paths = [single] if single.exists() else sorted((SOURCE / layer).rglob("*.py"))
    dotted = (".".join(path.relative_to(SOURCE.parent).with_suffix("").parts) for path in paths)
    return [name.removesuffix(".__init__") for name in dotted]


@pytest.mark.parametrize("library", OWNERS)
def test_library_is_imported_by_its_owners_alone(library: str):
    users = {
        path.relative_to(SOURCE).with_suffix("").parts[0]
        for path in SOURCE.rglob("*.py")
        if any(name.split(".")[0] == library for name in imported_names(path))
    }
    assert users <= OWNERS[library]


def test_scipy_is_used_for_linear_algebra_and_special_functions_alone():
    for path in SOURCE.rglob("*.py"):
        parts = {name.split(".")[1] for name in imported_names(path) if name.startswith("scipy.")}
        assert parts <= SCIPY_PARTS, path


@pytest.mark.parametrize("layer", CORE)
def test_core_layer_loads_no_screen_and_no_paper(layer: str):
    names = module_names(layer)
    assert names
    if layer == "diagnosis":
        # The pipeline alone calls the readers, and they bring pandas.
        names = [name for name in names if name != "headledger.diagnosis.check"]
    loaded = modules_after("\n".join(f"import {name}" for name in names))
    assert not loaded & {"textual", "textual_plot", "rich", "reportlab", "click", "pandas", "pint"}


def test_help_loads_nothing_heavy():
    code = "from headledger.cli.main import main\nassert main(['--help']) == 0"
    loaded = modules_after(code)
    assert "click" in loaded
    assert not loaded & HEAVY


def test_first_screen_loads_no_numbers():
    """The screen stands before the check's libraries are read."""
    loaded = modules_after("import headledger.tui.app")
    assert "textual" in loaded
    assert not loaded & {"numpy", "scipy", "pandas", "pint", "reportlab"}


def test_json_of_a_result_loads_no_screen():
    loaded = modules_after("import headledger.sheets.to_json")
    assert not loaded & {"textual", "rich", "pandas", "reportlab"}
