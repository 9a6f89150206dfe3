"""The house as it is planned: one direction, one package list, nothing opened in the science."""

from __future__ import annotations

import ast
import importlib.util
import re
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
SCIENCE = sorted((ROOT / "profiles").rglob("*.py"))


def test_every_folder_with_code_is_in_the_wheel():
    listed = tomllib.loads((ROOT / "pyproject.toml").read_text())["tool"]["setuptools"]["packages"]
    found = {
        "backveer." + ".".join(path.parent.relative_to(ROOT).parts)
        for top in ("profiles", "io")
        for path in (ROOT / top).rglob("__init__.py")
    }
    assert set(listed) == found


@pytest.mark.parametrize("path", SCIENCE, ids=lambda path: path.stem)
def test_science_opens_no_file_and_prints_nothing(path):
    tree = ast.parse(path.read_text())
    called = {
        node.func.id
        for node in ast.walk(tree)
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)
    }
    assert not called & {"open", "print", "input", "exec", "eval"}
    imported = {
        name
        for node in ast.walk(tree)
        for name in (
            [alias.name for alias in node.names]
            if isinstance(node, ast.Import)
            else [node.module or ""]
            if isinstance(node, ast.ImportFrom)
            else []
        )
    }
    assert not {name for name in imported if name.startswith(("backveer.io", "os", "pathlib"))}


@pytest.mark.parametrize("path", SCIENCE, ids=lambda path: path.stem)
def test_science_imports_heavy_packages_only_when_asked(path):
    """Scipy, xarray and pandas cost seconds: the command line must answer before them."""
    for node in ast.parse(path.read_text()).body:
        names = []
        if isinstance(node, ast.Import):
            names = [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            names = [node.module or ""]
        assert not [name for name in names if name.split(".")[0] in {"scipy", "xarray", "pandas"}]


def test_the_top_of_the_tree_is_what_the_plan_says():
    visible = {path.name for path in ROOT.iterdir() if not path.name.startswith(".")}
    planned = {
        "README.md",
        "DEVELOPERS.md",
        "LICENSE",
        "pyproject.toml",
        "profiles",
        "io",
        "tests",
        "sample_soundings",
    }
    made_by_tools = {"build", "uv.lock", "dist", "backveer.egg-info"}
    assert visible - made_by_tools == planned


def test_the_folder_names_are_not_imported_by_themselves():
    """``import profiles`` from the root would be a second copy of every module."""
    for path in (*SCIENCE, *(ROOT / "io").rglob("*.py"), *(ROOT / "tests").rglob("*.py")):
        for node in ast.walk(ast.parse(path.read_text())):
            if isinstance(node, ast.Import):
                assert not [a.name for a in node.names if a.name.split(".")[0] == "profiles"]
            if isinstance(node, ast.ImportFrom):
                assert (node.module or "").split(".")[0] != "profiles", path
    assert importlib.util.find_spec("backveer.profiles") is not None


@pytest.mark.parametrize(
    "package", ["profiles", "io/readers", "io/words", "io/figures", "io/command"]
)
def test_every_module_is_listed_in_its_package(package):
    """A package's docstring is its table of contents."""
    listed = set(
        re.findall(
            r"[a-z][a-z0-9_]*",
            ast.get_docstring(ast.parse((ROOT / package / "__init__.py").read_text())) or "",
        )
    )
    modules = {path.stem for path in (ROOT / package).glob("*.py")} - {"__init__"}
    assert modules <= listed
