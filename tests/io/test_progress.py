"""A bar on a terminal, nothing elsewhere."""

from __future__ import annotations

import io
import sys

import pytest

from backveer.io.progress import progress


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


def test_nothing_is_written_to_a_pipe(monkeypatch) -> None:
    pipe = io.StringIO()
    monkeypatch.setattr(sys, "stderr", pipe)
    with progress("rotors", 3) as advance:
        advance(3)
    assert pipe.getvalue() == ""


def test_a_terminal_sees_what_is_done_and_is_left_clean(monkeypatch) -> None:
    terminal = Terminal()
    monkeypatch.setattr(sys, "stderr", terminal)
    monkeypatch.setenv("TERM", "xterm")
    with progress("rotors", 3) as advance:
        advance(2)
    assert "rotors" in terminal.getvalue()
    assert terminal.getvalue().rstrip().endswith("\x1b[2K")


def test_a_failure_goes_through(monkeypatch) -> None:
    monkeypatch.setattr(sys, "stderr", Terminal())
    with pytest.raises(KeyboardInterrupt), progress("reading", None):
        raise KeyboardInterrupt
