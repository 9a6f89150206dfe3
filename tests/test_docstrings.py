"""Every example in a docstring runs, and every public name has its docstring."""

from __future__ import annotations

import doctest
import importlib
import inspect
from pathlib import Path

import numpy as np
import pytest

ROOT = Path(__file__).parents[1]
MODULES = sorted(
    "backveer." + ".".join(path.relative_to(ROOT).with_suffix("").parts).removesuffix(".__init__")
    for top in ("profiles", "io")
    for path in (ROOT / top).rglob("*.py")
)


@pytest.mark.parametrize("name", MODULES)
def test_examples_run(name):
    module = importlib.import_module(name)
    failed, _ = doctest.testmod(module, extraglobs={"np": np}, optionflags=doctest.ELLIPSIS)
    assert failed == 0


@pytest.mark.parametrize("name", MODULES)
def test_public_functions_are_documented(name):
    module = importlib.import_module(name)
    assert module.__doc__
    for key, thing in vars(module).items():
        if key.startswith("_") or getattr(thing, "__module__", None) != name:
            continue
        if inspect.isfunction(thing) or inspect.isclass(thing):
            assert inspect.getdoc(thing), f"{name}.{key} has no docstring"
