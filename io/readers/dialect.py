"""
How the cells of a text table are told apart: delimiter, decimal mark, fixed columns.

Every candidate splits a sample of lines; its score is the share of lines that agree on the
number of cells, times the share of their cells that are numbers or times. Fixed columns stand
beside the delimiters: their edges are where every line of the sample is blank.
"""

from __future__ import annotations

import csv
import re
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise
from typing import NamedTuple

from backveer.io.readers.cells import MISSING, is_number, is_time

# Order breaks ties: "100, 5, 230" is as regular by white space with a decimal comma.
_CANDIDATES = (
    (",", "."),
    (";", "."),
    (";", ","),
    ("\t", "."),
    ("\t", ","),
    ("|", "."),
    ("|", ","),
    (" ", "."),
    (" ", ","),
    (",", ","),  # quoted numbers: "4,5","231"
)

_SAMPLE_LINES = 40
_SAMPLE_CELLS = 80
_POOR = 0.2  # below this share of agreeing numbers, text is prose and not a table
_FIXED_LINES = 400
_DATE_AND_TIME = re.compile(r"(\d{4}[-/]\d\d?[-/]\d\d?|\d\d?[./]\d\d?[./]\d{4})\s+(\d\d?:\d\d)")
_LONGEST_LINE = 4000  # fixed columns are for the eye; longer lines were never meant for it


@dataclass(frozen=True)
class Dialect:
    """
    How a line is cut into cells.

    Attributes
    ----------
    delimiter
        ``","``, ``";"``, tab, ``"|"``, ``" "`` for white space, ``""`` for fixed columns.
    decimal
        ``"."`` or ``","``.
    edges
        Where each fixed column begins; empty otherwise.
    joins_times
        Whether a date and the clock time after it, with white space between, are one cell.
    """

    delimiter: str
    decimal: str
    edges: tuple[int, ...] = ()
    joins_times: bool = False

    def split(self, line: str) -> list[str]:
        """
        Cells of a line, stripped of quotes and outer white space.

        Examples
        --------
        >>> Dialect(";", ",").split('1,5; "a;b" ;')
        ['1,5', 'a;b', '']
        """
        if self.edges:
            ends = (*self.edges[1:], None)
            return [
                line[start:end].strip().strip('"')
                for start, end in zip(self.edges, ends, strict=True)
            ]
        if self.joins_times:
            line = _DATE_AND_TIME.sub(r"\1T\2", line)
        if '"' in line:
            return _split_quoted(line, self.delimiter)
        if self.delimiter == " ":
            return line.split()
        return [cell.strip() for cell in line.split(self.delimiter)]

    def cuts_a_word(self, line: str) -> bool:
        """Whether a fixed column would end within a word or number of this line."""
        return any(
            not line[edge - 1].isspace() and not line[edge].isspace()
            for edge in self.edges
            if 0 < edge < len(line)
        )


def _split_quoted(line: str, delimiter: str) -> list[str]:
    if delimiter == " ":
        line = re.sub(r"\s+", " ", line.strip())
    try:
        cells = next(csv.reader([line], delimiter=delimiter, skipinitialspace=True), [])
    except csv.Error:
        cells = line.split(delimiter)
    return [cell.strip().strip('"').strip() for cell in cells]


class Column(NamedTuple):
    """A fixed column: where its words stand in the sample, and where its cells begin."""

    start: int
    end: int
    edge: int


@dataclass(frozen=True)
class Detected:
    """A dialect, the cells that its lines agree on, how well it fits (0 to 1), and its columns."""

    dialect: Dialect
    width: int
    score: float
    columns: tuple[Column, ...] = ()


def detect(lines: Sequence[str]) -> Detected | None:
    """
    Find the dialect of a table.

    Parameters
    ----------
    lines
        Lines of the file without its end marks and comments, at best from its body.

    Returns
    -------
    detected
        None where nothing makes two columns or more of mostly numbers.

    Examples
    --------
    >>> detect(["Height;Speed", "10;4,5", "20;5,25"])
    Detected(dialect=Dialect(delimiter=';', decimal=',', ...), width=2, score=..., columns=())
    """
    # What stands above a table is no table: of a long sample, the later part tells more.
    lines = [line for line in lines if line.strip()]
    body = lines[len(lines) // 3 :] if len(lines) > 8 else lines
    step = len(body) // _SAMPLE_LINES | 1  # an even one would see one half of alternating lines
    sample = body[::step]
    best: Detected | None = None
    for delimiter, decimal in _CANDIDATES:
        if delimiter != " " and not any(delimiter in line for line in sample):
            continue
        if delimiter == " " and best and best.dialect.delimiter == "\t" and best.score > 0.6:
            continue  # tabs are white space too, but between two of them a cell may be empty
        found = _scored(Dialect(delimiter, decimal), sample)
        if found and (best is None or found.score > best.score + 1e-9):
            best = found
    longest = max(map(len, lines), default=0)
    if (best is None or best.dialect.delimiter == " ") and longest < _LONGEST_LINE:
        # A line of the preamble may be mostly numbers too, and blur where the columns stand.
        whole, later = _fixed(lines), _fixed(body)
        found = max((f for f in (whole, later) if f), key=lambda f: f.score, default=None)
        best = found or best
    return best if best is not None and best.score >= _POOR else None


def _scored(
    dialect: Dialect, sample: Sequence[str], columns: tuple[Column, ...] = ()
) -> Detected | None:
    rows = [dialect.split(line) for line in sample]
    widths = Counter(len(row) for row in rows if len(row) > 1)
    if not widths:
        return None
    width, agreeing = max(widths.items(), key=lambda item: (item[1], item[0]))
    if dialect.edges:
        agreeing -= sum(dialect.cuts_a_word(line) for line in sample)
    cells = [cell for row in rows if len(row) == width for cell in row[:_SAMPLE_CELLS]]
    # A cell that long is none, and is not to be remembered either.
    worth = sum(_worth(cell, dialect.decimal) for cell in cells if len(cell) < 40)
    return Detected(dialect, width, agreeing / len(rows) * worth / len(cells), columns)


@lru_cache(maxsize=4096)
def _worth(cell: str, decimal: str) -> float:
    """1 for what only a right cut leaves whole; a missing mark fits any cut a little less."""
    if is_number(cell, decimal) or is_time(cell):
        return 1.0
    return 0.9 if cell in MISSING else 0.0


def _fixed(lines: Sequence[str]) -> Detected | None:
    """Find fixed columns where white space leaves rows of unequal length, if they mend that."""
    rows = [line.expandtabs() for line in lines if _mostly_numbers(line)][:_FIXED_LINES]
    if len({len(row.split()) for row in rows}) < 2:
        return None
    columns = _columns(rows)
    if len(columns) < 2:
        return None
    edges = tuple(column.edge for column in columns)
    plain = [_scored(Dialect(" ", decimal), rows) for decimal in ".,"]
    fixed = [_scored(Dialect("", decimal, edges), rows, columns) for decimal in ".,"]
    rival = max((found.score for found in plain if found), default=0.0)
    winner = max((found for found in fixed if found), key=lambda f: f.score, default=None)
    return winner if winner and winner.score > rival else None


def _mostly_numbers(line: str) -> bool:
    words = [word for word in line.split() if len(word) < 40]
    return sum(_worth(word, ".") == 1 or _worth(word, ",") == 1 for word in words) > 0.4 * len(
        words
    )


def _columns(lines: Sequence[str]) -> tuple[Column, ...]:
    """Columns that blanks in each line set apart."""
    groups: list[list[tuple[int, int]]] = []
    end = -1
    for span in sorted(m.span() for line in lines for m in re.finditer(r"\S+", line)):
        if span[0] > end:
            groups.append([])
        groups[-1].append(span)
        end = max(end, span[1])
    columns: list[Column] = []
    flush_left = False
    for group in groups:
        start, end = min(group)[0], max(stop for _, stop in group)
        # What stands flush left grows to the right, into the gap; else the gap is the next one's.
        edge = 0 if not columns else (start if flush_left else columns[-1].end)
        columns.append(Column(start, end, edge))
        flush_left = {first for first, _ in group} == {start} and len({s for _, s in group}) > 1
    return tuple(columns)


def fixed_columns(header: str, columns: Sequence[Column]) -> tuple[list[str], tuple[int, ...]]:
    """
    Names and edges of fixed columns under a header.

    A name belongs to the column that begins or ends nearest to it; a name that stands over no
    column of its own gets an empty one, for its values may all be missing.

    Examples
    --------
    >>> columns = [Column(2, 6, 0), Column(14, 18, 6), Column(20, 23, 18)]
    >>> fixed_columns("Height  Wind speed  Dir", columns)
    (['Height', 'Wind speed', 'Dir'], (0, 6, 18))
    """
    pattern = r"\S+(?: \S+)*" if re.search(r"\S {2,}\S", header) else r"\S+"
    names = [(m.group(), m.span()) for m in re.finditer(pattern, header)]
    under: dict[int, int] = {}  # place of the name over each column
    lone = []
    for place, (_, span) in enumerate(names):
        distance, nearest = min((_apart(span, column), c) for c, column in enumerate(columns))
        if nearest not in under:
            under[nearest] = place
        elif distance < _apart(names[under[nearest]][1], columns[nearest]):
            lone.append(under[nearest])
            under[nearest] = place
        else:
            lone.append(place)
    named = [
        (column, names[under[c]][0] if c in under else "") for c, column in enumerate(columns)
    ] + [(Column(*names[place][1], 0), names[place][0]) for place in lone]
    named.sort()
    edges = [0]
    for (before, _), (column, _) in pairwise(named):
        edges.append(max(column.edge, before.end))
    return [name for _, name in named], tuple(edges)


def _apart(span: tuple[int, int], column: Column) -> int:
    return min(abs(span[0] - column.start), abs(span[1] - column.end))
