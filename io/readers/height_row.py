"""
Tables whose heights stand in a row of their own, made into one header with heights in its names.

Three dresses, in any delimiter::

    Height (m),40,80,40,80                 time,Wind speed (m/s),,Direction (deg),
    time,WS,WS,WD,WD                       Height (m),40,80,40,80
    2031-05-14 00:00,7.0,8.0,250,254       2031-05-14 00:00,7.0,8.0,250,254

    Wind speed (m/s)
    time,40,80
    2031-05-14 00:00,7.0,8.0
    Wind direction (deg)
    time,40,80
    2031-05-14 00:00,250,254

Lines keep their numbers, so that a message still points at the right one; only blocks one under the
other, which are laid side by side where their first columns agree, do not.
"""

from __future__ import annotations

import csv
import io
import re

_HEAD = 64 << 10  # where the header must be
_LINES = 60
_HEIGHT = re.compile(r"\s*(\d{1,4}(?:\.\d+)?)\s*(m|metres|meters|ft|feet)?\s*", re.IGNORECASE)
_UNIT = re.compile(r"[\[(]\s*(m|ft)\s*[\])]|\b(?:in|,)\s*(m|ft)\s*$", re.IGNORECASE)
_WORD = re.compile(r"height|range|altitude|level|distance|gate|h[öo]e?he|hauteur|altura|^z\b")
_BRACKET = re.compile(r"^(.*?)(\s*[\[(][^\])]*[\])]\s*)$")
_DELIMITERS = (",", ";", "\t", "|")


def heights_into_names(text: bytes) -> bytes:
    r"""
    Return a text whose header holds the heights; the same text where there is no row of heights.

    Parameters
    ----------
    text
        UTF-8, lines ending in a line feed.

    Examples
    --------
    >>> two = b"Height (m),40,80\ntime,WS (m/s),WS (m/s)\n2031-05-14 00:00,7,8\n"
    >>> heights_into_names(two).decode().splitlines()[1]
    'time,WS 40m (m/s),WS 80m (m/s)'
    """
    head = text[:_HEAD].decode("utf-8", "replace").replace("\r", "")
    lines = head.split("\n")[:_LINES]
    for at in range(len(lines) - 1):
        for delimiter in _DELIMITERS:
            if lines[at].count(delimiter) < 2 and lines[at + 1].count(delimiter) < 2:
                continue
            first, second = _cells(lines[at], delimiter), _cells(lines[at + 1], delimiter)
            for heights, names in ((first, second), (second, first)):
                merged = _merged(heights, names)
                if merged is not None:
                    return _with_header(text, at, _line(merged, delimiter))
            if len(first) == 1 and first[0].strip() and _heads_a_block(second):
                blocks = _stacked(text, at, delimiter)
                if blocks is not None:
                    return blocks
    return text


def _cells(line: str, delimiter: str) -> list[str]:
    return next(csv.reader([line], delimiter=delimiter), [])


def _line(cells: list[str], delimiter: str) -> str:
    out = io.StringIO()
    csv.writer(out, delimiter=delimiter, lineterminator="").writerow(cells)
    return out.getvalue()


def _merged(heights: list[str], names: list[str]) -> list[str] | None:
    """Join a row of heights and a row of names; None where they are none."""
    if len(heights) != len(names) or len(names) < 3:
        return None
    # A row of data begins with a time or a station, a row of heights says so or says nothing.
    if heights[0].strip() and not _WORD.search(heights[0].casefold()):
        return None
    found = [_HEIGHT.fullmatch(cell) for cell in heights]
    count = sum(match is not None for match in found)
    if count < 2 or count < len(heights) // 2 or any(_HEIGHT.fullmatch(n) for n in names):
        return None
    unit = _UNIT.search(heights[0])
    general = (unit[1] or unit[2]).lower() if unit else ""
    merged, name, pairs, repeated = [], "", set(), False
    for cell, own, match in zip(heights, names, found, strict=True):
        if match is None:
            merged.append(own.strip() or cell.strip())
            name = ""
            continue
        repeated |= not own.strip() or own.strip() == name
        name = own.strip() or name
        if not name or (name, match[1]) in pairs:
            return None
        pairs.add((name, match[1]))
        merged.append(_named(name, match[1], (match[2] or general)[:2].lower()))
    # Names that all differ need no row of heights; it is rather a row of numbers.
    return merged if repeated else None


def _named(name: str, height: str, unit: str) -> str:
    """Put a height into a name, before the unit in brackets."""
    unit = "ft" if unit.startswith("f") else "m" if unit else ""
    bracket = _BRACKET.match(name)
    if bracket:
        return f"{bracket[1]} {height}{unit}{bracket[2]}"
    return f"{name} {height}{unit}"


def _with_header(text: bytes, at: int, header: str) -> bytes:
    """Replace lines ``at`` and ``at + 1`` by an empty one and the header."""
    lines = text.split(b"\n", at + 2)
    return b"\n".join([*lines[:at], b"", header.encode(), *lines[at + 2 :]])


def _heads_a_block(cells: list[str]) -> bool:
    """Whether a row is a name and then only heights."""
    return (
        len(cells) > 2
        and cells[0].strip()[:1].isalpha()
        and all(_HEIGHT.fullmatch(cell) for cell in cells[1:])
    )


def _stacked(text: bytes, at: int, delimiter: str) -> bytes | None:
    """Lay blocks side by side that stand one under the other, each under its title."""
    lines = text.decode("utf-8", "replace").replace("\r", "").split("\n")
    first = _cells(lines[at + 1], delimiter)
    start = at
    names, columns, keys = [first[0]], [], None
    while at + 1 < len(lines):
        title, header = lines[at].strip(" #" + delimiter), _cells(lines[at + 1], delimiter)
        if not title or header[:1] != first[:1] or len(header) < 3:
            return None
        found = [_HEIGHT.fullmatch(cell) for cell in header[1:]]
        rows = []
        at += 2
        while at < len(lines) and delimiter in lines[at] and any(lines[at].split(delimiter)):
            rows.append(_cells(lines[at], delimiter))
            at += 1
        own = [row[0] for row in rows]
        if not rows or None in found or any(len(row) != len(header) for row in rows):
            return None
        if keys is not None and own != keys:
            return None
        keys = own
        names += [_named(title, match[1], match[2] or "") for match in found if match is not None]
        columns.append([row[1:] for row in rows])
        while at < len(lines) and not lines[at].strip(" " + delimiter):
            at += 1
    if keys is None or len(columns) < 2:
        return None
    wide = [
        _line([key, *(cell for block in columns for cell in block[row])], delimiter)
        for row, key in enumerate(keys)
    ]
    kept = [*lines[:start], "", _line(names, delimiter), *wide, ""]
    return "\n".join(kept).encode()
