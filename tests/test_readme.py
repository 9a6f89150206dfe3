"""The README is true: its commands print what it shows, its Python runs, its options exist."""

from __future__ import annotations

import doctest
import re
import shlex
from pathlib import Path

import pytest

from backveer.io.command import main

ROOT = Path(__file__).parents[1]
TEXT = (ROOT / "README.md").read_text(encoding="utf-8")
SHOWN = re.findall(r"^```\n\$ (backveer [^\n]*)\n(.*?)^```", TEXT, re.M | re.S)


def test_there_are_commands_to_check():
    assert len(SHOWN) >= 3


@pytest.mark.parametrize(("command", "printed"), SHOWN, ids=[command for command, _ in SHOWN])
def test_commands_print_what_the_readme_shows(capsys, monkeypatch, command, printed):
    """A line of "..." stands for any lines that were left out."""
    monkeypatch.chdir(ROOT)
    main(shlex.split(command)[1:])
    captured = capsys.readouterr()
    got = (captured.out + captured.err).rstrip("\n")
    pattern = "\n".join(
        ".*" if line == "..." else re.escape(line) for line in printed.rstrip("\n").split("\n")
    )
    assert re.fullmatch(pattern, got, re.S), f"now it prints:\n{got}"


def test_python_examples_run(monkeypatch):
    monkeypatch.chdir(ROOT)
    failed, tried = doctest.testfile(str(ROOT / "README.md"), module_relative=False)
    assert tried >= 5
    assert failed == 0


def test_pictures_are_there():
    for picture in re.findall(r"!\[[^\]]*\]\(([^)]*)\)", TEXT):
        assert (ROOT / picture).is_file(), picture


@pytest.mark.parametrize("command", ["read", "turn", "rotor", "shear", "outlook", "desk"])
def test_every_option_named_exists(capsys, command):
    assert main([command, "--help"]) == 0
    assert capsys.readouterr().out.startswith("Usage: backveer " + command)
