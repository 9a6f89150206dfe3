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
    """

    delimiter: str
    decimal: str
    edges: tuple[int, ...] = ()

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


@dataclass(frozen=True)
class Detected:
    """A dialect, the cells that its lines agree on, how well it fits (0 to 1), and its columns."""

    dialect: Dialect
    width: int
    score: float
    spans: tuple[tuple[int, int], ...] = ()


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
    Detected(dialect=Dialect(delimiter=';', decimal=',', edges=()), width=2, score=..., spans=())
    """
    # What stands above a table is no table: of a long sample, the later part tells more.
    lines = [line for line in lines if line.strip()]
    body = lines[len(lines) // 3 :] if len(lines) > 8 else lines
    step = max(1, len(body) // _SAMPLE_LINES)
    sample = body[::step]
    best: Detected | None = None
    for delimiter, decimal in _CANDIDATES:
        if delimiter != " " and not any(delimiter in line for line in sample):
            continue
        found = _scored(Dialect(delimiter, decimal), sample)
        if found and (best is None or found.score > best.score + 1e-9):
            best = found
    if (best is None or (best.dialect.delimiter == " " and best.score < 1)) and max(
        map(len, lines), default=0
    ) < _LONGEST_LINE:
        best = _better_fixed(best, body)
    return best if best is not None and best.score >= _POOR else None


def _scored(
    dialect: Dialect, sample: Sequence[str], spans: tuple[tuple[int, int], ...] = ()
) -> Detected | None:
    rows = [dialect.split(line) for line in sample]
    widths = Counter(len(row) for row in rows if len(row) > 1)
    if not widths:
        return None
    width, agreeing = max(widths.items(), key=lambda item: (item[1], item[0]))
    if dialect.edges:
        agreeing -= sum(dialect.cuts_a_word(line) for line in sample)
    cells = [cell for row in rows if len(row) == width for cell in row[:_SAMPLE_CELLS]]
    worth = sum(_worth(cell, dialect.decimal) for cell in cells)
    return Detected(dialect, width, agreeing / len(rows) * worth / len(cells), spans)


@lru_cache(maxsize=4096)
def _worth(cell: str, decimal: str) -> float:
    """1 for what only a right cut leaves whole; a missing mark fits any cut a little less."""
    if is_number(cell, decimal) or is_time(cell):
        return 1.0
    return 0.9 if cell in MISSING else 0.0


def _better_fixed(best: Detected | None, body: Sequence[str]) -> Detected | None:
    """Take fixed columns where white space leaves rows of unequal length, if they mend that."""
    rows = [line.expandtabs() for line in body if _mostly_numbers(line)][:_FIXED_LINES]
    spans = _spans(rows)
    if len(spans) < 2:
        return best
    edges = _edges(spans)
    plain = [_scored(Dialect(" ", decimal), rows) for decimal in ".,"]
    fixed = [_scored(Dialect("", decimal, edges), rows, spans) for decimal in ".,"]
    rival = max((found.score for found in (best, *plain) if found), default=0.0)
    winner = max((found for found in fixed if found), key=lambda f: f.score, default=None)
    return winner if winner and winner.score > rival + 0.005 else best


def _mostly_numbers(line: str) -> bool:
    words = line.split()
    return sum(_worth(word, ".") == 1 or _worth(word, ",") == 1 for word in words) > 0.4 * len(
        words
    )


def _spans(lines: Sequence[str]) -> tuple[tuple[int, int], ...]:
    """Start and end of the columns that blanks in each line set apart."""
    columns: list[tuple[int, int]] = []
    for start, end in sorted(m.span() for line in lines for m in re.finditer(r"\S+", line)):
        if columns and start <= columns[-1][1]:
            columns[-1] = (columns[-1][0], max(end, columns[-1][1]))
        else:
            columns.append((start, end))
    return tuple(columns)


def _edges(spans: Sequence[tuple[int, int]]) -> tuple[int, ...]:
    # Numbers stand flush right and grow to the left: the gap belongs to what follows it.
    return (0, *(end for _, end in spans[:-1]))


def fixed_columns(
    header: str, spans: Sequence[tuple[int, int]]
) -> tuple[list[str], tuple[int, ...]]:
    """
    Names and edges of fixed columns under a header.

    A name belongs to the column that begins or ends nearest to it; a name that stands over no
    column of its own gets an empty one, for its values may all be missing.

    Examples
    --------
    >>> fixed_columns("Height  Wind speed  Dir", [(2, 6), (14, 18), (20, 23)])
    (['Height', 'Wind speed', 'Dir'], (0, 6, 18))
    """
    pattern = r"\S+(?: \S+)*" if re.search(r"\S {2,}\S", header) else r"\S+"
    names = [(m.group(), m.span()) for m in re.finditer(pattern, header)]
    under: dict[int, int] = {}  # place of the name over each column
    lone = []
    for place, (_, span) in enumerate(names):
        distance, column = min((_apart(span, other), c) for c, other in enumerate(spans))
        if column not in under:
            under[column] = place
        elif distance < _apart(names[under[column]][1], spans[column]):
            lone.append(under[column])
            under[column] = place
        else:
            lone.append(place)
    columns = [(span, names[under[c]][0] if c in under else "") for c, span in enumerate(spans)] + [
        (names[place][1], names[place][0]) for place in lone
    ]
    columns.sort()
    return [name for _, name in columns], _edges([span for span, _ in columns])


def _apart(one: tuple[int, int], other: tuple[int, int]) -> int:
    return min(abs(one[0] - other[0]), abs(one[1] - other[1]))
