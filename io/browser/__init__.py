"""
The browser's part, shared by the report and the desk: what draws the statement's JSON.

Files
-----
statement.js   numbers, words, panels over a common height, hodograph, tables
statement.css  the look
d3.min.js      D3 7.9.2, vendored from the npm registry as it is (ISC licence, d3.LICENSE)
"""

from __future__ import annotations

from importlib.resources import files


def asset(name: str) -> str:
    """Return one of the files as text."""
    return files("backveer.io.browser").joinpath(name).read_text(encoding="utf-8")
