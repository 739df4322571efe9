"""Imports run downwards only, and heavy packages stay off the paths that do not need them."""

from __future__ import annotations

import ast
from pathlib import Path

import pytest

PACKAGE = Path(__file__).parents[1] / "shopfloor"

# Lower number, lower layer. Packages on the same number do not import each other.
LAYER = {
    "errors": 0, "settings": 0, "model": 1, "kernel": 1,
    "bounds": 2, "openshop": 2, "audit": 2, "read": 2, "render": 2, "journal": 2, "replan": 2,
    "pipeline": 3, "fit": 4, "rolling": 4, "sweep": 5, "cli": 6, "board": 6,
}  # fmt: skip
ONLY_MODEL = {"read", "render", "journal", "audit"}  # never the kernel
TOP = {"", "__main__"}  # the package's front door may name anything


def _modules() -> list[Path]:
    return sorted(PACKAGE.rglob("*.py"))


def _place(path: Path) -> str:
    first = path.relative_to(PACKAGE).parts[0]
    return "" if first == "__init__.py" else first.removesuffix(".py")


def _imports(path: Path) -> set[str]:
    """Return the packages of ours that a module imports when it runs, wherever in the module."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    typing_only = {
        id(child)
        for node in ast.walk(tree)
        if isinstance(node, ast.If) and "TYPE_CHECKING" in ast.dump(node.test)
        for child in ast.walk(node)
    }
    found: set[str] = set()
    for node in ast.walk(tree):
        if id(node) in typing_only:
            continue
        if isinstance(node, ast.ImportFrom) and node.module:
            if node.module == "shopfloor":
                found |= {alias.name for alias in node.names if not alias.name.startswith("__")}
            elif node.module.startswith("shopfloor."):
                found.add(node.module.split(".")[1])
        elif isinstance(node, ast.Import):
            found |= {alias.name.split(".")[1] for alias in node.names if alias.name.startswith("shopfloor.")}
    return found


@pytest.mark.parametrize("path", _modules(), ids=lambda path: str(path.relative_to(PACKAGE)))
def test_imports_run_downwards(path: Path) -> None:
    here = _place(path)
    if here in TOP:
        return
    for there in _imports(path) - {here}:
        assert there in LAYER, f"{path} imports {there}, which has no layer"
        assert LAYER[there] < LAYER[here], f"{here} must not import {there}"
        assert not (here in ONLY_MODEL and there == "kernel"), f"{here} must not import the kernel"
        assert not (here == "model" and there == "kernel"), "the model knows no kernel"
        assert not (here == "kernel" and there != "errors"), "the kernel knows integers and graphs only"


def test_only_the_solver_model_and_fit_import_ortools() -> None:
    for path in _modules():
        if "ortools" in path.read_text(encoding="utf-8") and "import" in path.read_text(encoding="utf-8"):
            tree = ast.parse(path.read_text(encoding="utf-8"))
            names = [
                name
                for node in ast.walk(tree)
                for name in (
                    [node.module or ""] if isinstance(node, ast.ImportFrom)
                    else [a.name for a in node.names] if isinstance(node, ast.Import) else []
                )
            ]  # fmt: skip
            if any(name.startswith("ortools") for name in names):
                assert {"cpsat", "fit"} & set(path.parts), f"{path} imports the solver"


def test_the_method_package_never_imports_the_bounds() -> None:
    for path in (PACKAGE / "openshop").rglob("*.py"):
        assert "bounds" not in _imports(path)
