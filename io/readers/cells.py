"""What one cell of a table says: a number, a missing mark, a clock time, a word."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

_WORDS = ("nan", "na", "n/a", "n.a.", "#n/a", "null", "none", "missing", "miss", "nil", "m", "nd")

MISSING = frozenset(
    ["", "."]
    + [mark * count for mark in "/-*xX?" for count in range(2 if mark in "xX" else 1, 13)]
    + [form for word in _WORDS for form in (word, word.upper(), word.title())]
    + ["NaN", "-nan", "-NaN", "\N{EN DASH}", "\N{EM DASH}"]
)
"""Marks that say in words that there is no value (a single x may be a name: it is none)."""

_NUMBER = {
    ".": re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?", re.ASCII),
    ",": re.compile(r"[+-]?(\d+(,\d+)?|,\d+)([eE][+-]?\d+)?", re.ASCII),
}
_TIME = re.compile(
    r"""(\d{1,4}[-/.]\d{1,2}[-/.]\d{1,4}      # 2031-05-14, 14.05.2031
        |\d{1,4}[-\ ][A-Za-z]{3,9}[-\ ]\d{2,4} # 14-May-2031
        |\d{8}(?=T))?
        [T\ _]?(\d{1,2}:\d{2}(:\d{2}([.,]\d*)?)?|(?<=T)\d{4,6})?
        \ ?([AaPp][Mm])?\ ?(Z|UTC|GMT|[+-]\d{2}:?\d{2})?""",
    re.VERBOSE | re.ASCII,
)


def is_number(cell: str, decimal: str) -> bool:
    """
    Whether a cell is a plain number.

    Examples
    --------
    >>> is_number("-1.5e3", "."), is_number("1,5", "."), is_number("1,5", ",")
    (True, False, True)
    """
    return _NUMBER[decimal].fullmatch(cell) is not None


def is_time(cell: str) -> bool:
    """
    Whether a cell is a date, a clock time or both.

    Examples
    --------
    >>> is_time("14.05.2031 23:15"), is_time("23:15:00"), is_time("speed")
    (True, True, False)
    """
    return 4 <= len(cell) < 40 and cell[0].isdecimal() and _TIME.fullmatch(cell) is not None


def is_word(cell: str, decimal: str) -> bool:
    """Whether a cell is neither number, missing mark nor time."""
    return not (cell in MISSING or is_number(cell, decimal) or is_time(cell))


def numbers(
    cells: Sequence[str] | NDArray[Any], decimal: str
) -> tuple[NDArray[np.float64], NDArray[np.intp]]:
    """
    Cells as numbers, and where they are none.

    For a column that is known to be numeric although a few of its cells are not (``"ERR"``):
    those become NaN, and their places are told so that they can be named.

    Parameters
    ----------
    cells
        Cells as written.
    decimal
        ``"."`` or ``","``. With a decimal comma, a cell with a point is no number: it could be a
        date or a thousand.

    Returns
    -------
    values
        The numbers; NaN for a missing mark and for what is no number.
    odd
        Places of the cells that are neither.

    Examples
    --------
    >>> numbers(["4,5", "///", "ERR"], ",")
    (array([4.5, nan, nan]), array([2]))
    """
    values = np.empty(len(cells))
    odd = []
    for place, cell in enumerate(cells):
        value = _value(cell.strip(), decimal)
        if value is None:
            odd.append(place)
            value = np.nan
        values[place] = value
    return values, np.array(odd, np.intp)


def _value(cell: str, decimal: str) -> float | None:
    if cell in MISSING:
        return np.nan
    # float() would also take 1_000 and the digits of every script.
    if not cell.isascii() or "_" in cell:
        return None
    if decimal == ",":
        if "." in cell:
            return None
        cell = cell.replace(",", ".")
    try:
        return float(cell)
    except ValueError:
        return None


def column(cells: Sequence[str], decimal: str) -> NDArray[np.float64] | None:
    """Cells as float64 if each is a number or a missing mark, otherwise None."""
    joined = "\n".join(cells)
    fast: Iterable[str] = cells
    if decimal == "," and "," in joined:
        fast = joined.replace(",", ".").split("\n")
    plain = joined.isascii() and "_" not in joined and not (decimal == "," and "." in joined)
    if plain:
        try:
            return np.fromiter(map(float, fast), np.float64, len(cells))
        except ValueError:
            pass
    values = np.empty(len(cells))
    for place, cell in enumerate(cells):
        value = _value(cell.strip(), decimal)
        if value is None:
            return None
        values[place] = value
    return values


def words(cells: Iterable[str], known: dict[str, str]) -> NDArray[np.object_]:
    """Cells as an object array of stripped text, one object for equal ones."""
    stripped = [cell.strip() for cell in cells]
    array = np.empty(len(stripped), object)
    array[:] = [known.setdefault(cell, cell) for cell in stripped]
    return array
