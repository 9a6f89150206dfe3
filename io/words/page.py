"""A page of plain text, 80 columns wide: sections, tables, pairs, and what a profile is called."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable

import numpy as np

from backveer.io.words.safe import safe
from backveer.profiles.stack import Stack

WIDTH = 80


def section(title: str, lines: Iterable[str]) -> str:
    """Put a title over lines."""
    return "\n".join([title, *lines])


def pairs_of(pairs: list[tuple[str, str]]) -> list[str]:
    """Align names and texts; the texts wrap."""
    wide = max(len(name) for name, _ in pairs) + 2
    return [
        textwrap.fill(
            text,
            WIDTH,
            initial_indent="  " + name.ljust(wide),
            subsequent_indent=" " * (wide + 2),
        )
        for name, text in pairs
    ]


def table(head: list[list[str]], rows: list[list[str]], sides: str) -> list[str]:
    """Align columns; the last one wraps inside the page."""
    wide = [max(len(row[i]) for row in [*head, *rows]) for i in range(len(sides) - 1)]
    # A long reason in a narrow table must not push its columns apart.
    before = sum(wide) + 2 * len(wide) + 2
    lines = []
    for row in [*head, *rows]:
        cells = [
            cell.rjust(w) if side == "r" else cell.ljust(w)
            for cell, w, side in zip(row, wide, sides, strict=False)
        ]
        last = row[len(sides) - 1]
        if sides[-1] == "r":
            width = max(len(other[-1]) for other in [*head, *rows])
            lines.append(("  " + "  ".join([*cells, last.rjust(width)])).rstrip())
            continue
        wrapped = textwrap.wrap(last, max(WIDTH - before, 20)) or [""]
        lines.append(("  " + "  ".join([*cells, wrapped[0]])).rstrip())
        lines += [" " * before + more for more in wrapped[1:]]
    return lines


def bullet(text: str) -> str:
    """Write one item of a list."""
    return textwrap.fill(text, WIDTH, initial_indent="  - ", subsequent_indent="    ")


def wrapped(text: str, indent: str = "") -> str:
    """Wrap a paragraph."""
    return textwrap.fill(text, WIDTH, initial_indent=indent, subsequent_indent=indent)


def cut(text: str, width: int) -> str:
    """Shorten a text to a width, and show that it was."""
    return text if len(text) <= width else text[: width - 1] + "~"


def undetermined(why: str, what: str = "") -> str:
    """Say that something is not determined, and why."""
    return wrapped(f"{what + ' ' if what else ''}not determined, because {why or 'no data'}", "  ")


def name_of(stack: Stack, row: int) -> str:
    """Return what a profile is called."""
    return safe(str(stack.station[row])) or safe(str(stack.source[row])) or "profile"


def time_of(time: np.datetime64) -> str:
    """Write a time."""
    return f"{np.datetime_as_string(time, unit='m').replace('T', ' ')} UTC"


def place_of(stack: Stack, row: int) -> str:
    """Write where a profile is."""
    latitude, longitude = float(stack.latitude[row]), float(stack.longitude[row])
    elevation = float(stack.elevation[row])
    parts = []
    if np.isfinite(latitude):
        parts.append(f"{abs(latitude):.2f} {'N' if latitude >= 0 else 'S'}")
    else:
        parts.append("latitude not known")
    if np.isfinite(longitude):
        east = (longitude + 180.0) % 360.0 - 180.0
        parts.append(f"{abs(east):.2f} {'E' if east >= 0 else 'W'}")
    if np.isfinite(elevation):
        parts.append(f"{elevation:.0f} m above sea level")
    return ", ".join(parts)
