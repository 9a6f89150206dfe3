"""
From the lines under a header to tables: columns, line numbers, and what was left out.

Lines come in pieces. A piece whose lines all have the right number of cells is cut and
transposed as a whole; any other is gone through line by line.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.cells import column, is_number, is_time, is_word, words
from backveer.io.readers.errors import NotATable
from backveer.io.readers.layout import Layout
from backveer.io.readers.preamble import is_rule, looks_like_units, metadata, uncommented
from backveer.io.readers.table import Table

_COMMENT_STARTS = tuple("#%!;/ \t")
_LONGEST_REMEMBERED = 400
_INHERITED = 100  # of a file with so many blocks that each would carry all that was said above
_FOOTER = 5  # lines from the end of the file in which "mean;4.5;231" is a footer and no row


class NewHeader(Exception):
    """Another header begins at this line."""

    def __init__(self, line: int) -> None:
        super().__init__(line)
        self.line = line


class Mixed(Exception):
    """Columns (table, place) that are numbers in one piece and text in another."""

    def __init__(self, places: frozenset[tuple[int, int]]) -> None:
        super().__init__(places)
        self.places = places


@dataclass
class _Lines:
    """Lines left out for one reason."""

    one: str
    many: str
    count: int = 0
    first: int = 0

    def add(self, line: int) -> None:
        self.first = self.first or line
        self.count += 1

    def remark(self) -> str:
        if self.count == 1:
            return f"{self.one} was left out (line {self.first})"
        return f"{self.count} {self.many} were left out (the first at line {self.first})"


@dataclass
class _Part:
    """One table in the making."""

    metadata: list[tuple[str, str]]
    inherited: tuple[tuple[str, str], ...] = ()
    columns: list[list[NDArray[Any]]] = field(default_factory=list)
    lines: list[NDArray[np.int64]] = field(default_factory=list)
    headers: _Lines = field(default_factory=lambda: _Lines("a repeated header", "repeated headers"))
    ragged: _Lines = field(
        default_factory=lambda: _Lines(
            "a row with more or fewer cells than the header",
            "rows with more or fewer cells than the header",
        )
    )
    comments: _Lines = field(
        default_factory=lambda: _Lines(
            "a comment inside or under the table", "comments inside or under the table"
        )
    )
    texts: _Lines = field(
        default_factory=lambda: _Lines(
            "a line of text inside or under the table", "lines of text inside or under the table"
        )
    )
    numbers_above: _Lines = field(
        default_factory=lambda: _Lines(
            "a line of numbers above the header", "lines of numbers above the header"
        )
    )

    @property
    def row_count(self) -> int:
        return sum(map(len, self.lines))

    def all_metadata(self) -> tuple[tuple[str, str], ...]:
        own = {key for key, _ in self.metadata}
        kept = [(key, value) for key, value in self.inherited if key and key not in own]
        return (*kept[:_INHERITED], *self.metadata)


class Assembly:
    """
    Tables under one header.

    Parameters
    ----------
    source, encoding
        As in Table.
    layout
        How the rows are cut.
    last_line
        Number of the last line of the file, near which footers stand.
    as_text
        Columns (table, place) to be kept as text, because an earlier try found them mixed.
    """

    def __init__(
        self,
        source: str,
        encoding: str,
        layout: Layout,
        last_line: int,
        as_text: frozenset[tuple[int, int]] = frozenset(),
    ) -> None:
        self._source = source
        self._encoding = encoding
        self._layout = layout
        self._footer_from = last_line - _FOOTER
        self._as_text = as_text
        self._parts = [_Part([])]
        self._pending: list[tuple[int, str]] = []  # lines of text since the last row
        self._header_pending = False
        self._known: dict[str, str] = {}
        self._headers = frozenset(line.strip() for line in layout.between[:1])
        self._under_header = frozenset(line.strip() for line in layout.between[1:] if line.strip())

    def preamble(
        self,
        lines: Sequence[str],
        numbers: Sequence[int],
        inherited: tuple[tuple[str, str], ...] = (),
    ) -> None:
        """Take the lines above the header, and those between it and the first row."""
        part = self._parts[0]
        part.inherited = inherited
        delimiter = self._layout.dialect.delimiter
        for line, number in zip(lines, numbers, strict=False):
            text = uncommented(line, delimiter)
            if text is None and self._is_ragged(line):
                part.numbers_above.add(number)
                continue
            part.metadata += _metadata(line if text is None else text, delimiter)
        for line in self._layout.between[1:]:
            text = uncommented(line, delimiter)
            if text is not None and not looks_like_units(self._layout.dialect.split(text)):
                part.metadata += _metadata(text, delimiter)

    def add_columns(self, columns: list[NDArray[Any]], lines: NDArray[np.int64]) -> None:
        """Take columns that were parsed elsewhere."""
        self._parts[-1].columns.append(columns)
        self._parts[-1].lines.append(lines)

    def add(self, lines: Sequence[str], numbers: Sequence[int]) -> None:
        """
        Take lines of the table.

        Raises
        ------
        NewHeader
            Where another header stands; what is above it was taken.
        """
        end = len(lines)
        while end and not lines[end - 1].strip():
            end -= 1
        lines, numbers = lines[:end], numbers[:end]
        if not lines:
            return
        cut = None if self._pending else self._cut_whole(lines)
        if cut is not None:
            columns = [self._column(cells, place) for place, cells in enumerate(cut)]
            held = [
                kind != "n" or array.dtype == np.float64
                for kind, array in zip(self._layout.kinds, columns, strict=True)
            ]
            if all(held):
                self.add_columns(columns, np.array(numbers, np.int64))
                return
        self._add_one_by_one(lines, numbers)

    def _cut_whole(self, lines: Sequence[str]) -> list[Sequence[str]] | None:
        """Columns of cells where all lines are rows of full width, otherwise None."""
        layout = self._layout
        delimiter, width, count = layout.dialect.delimiter, layout.width, len(layout.header)
        if layout.dialect.edges:
            return None
        if layout.kinds[0] != "n" and any(
            line.startswith(_COMMENT_STARTS) and uncommented(line, delimiter) is not None
            for line in lines
        ):
            return None
        if delimiter == " ":
            rows = [layout.dialect.split(line) for line in lines]
            if set(map(len, rows)) != {width}:
                return None
            return list(zip(*rows, strict=True))
        if {line.count(delimiter) for line in lines} != {width - 1}:
            return None
        whole = delimiter.join(lines)
        if '"' in whole:
            return None
        cells = whole.split(delimiter)
        if any("".join(cells[place::width]).strip() for place in range(count, width)):
            return None
        return [cells[place::width] for place in range(count)]

    def _column(self, cells: Sequence[str], place: int) -> NDArray[Any]:
        if (len(self._parts) - 1, place) not in self._as_text:
            values = column(cells, self._layout.dialect.decimal)
            if values is not None:
                return values
        return words(cells, self._known)

    def _add_one_by_one(self, lines: Sequence[str], numbers: Sequence[int]) -> None:
        layout = self._layout
        dialect = layout.dialect
        rows: list[list[str]] = []
        of_rows: list[int] = []
        for line, number in zip(lines, numbers, strict=True):
            if not line.strip():
                continue
            if line.strip() in self._headers:
                self._header_pending = True
                self._parts[-1].headers.add(number)
                continue
            if line.strip() in self._under_header and self._header_pending:
                continue
            if uncommented(line, dialect.delimiter) is not None:
                self._pending.append((number, line))
                continue
            if dialect.edges:
                line = line.expandtabs()
            cells = dialect.split(line)
            fits = layout.accepts(cells) and not (dialect.edges and dialect.cuts_a_word(line))
            footer = number > self._footer_from and self._is_footer(cells)
            if fits and layout.like_data(cells) and not footer:
                if self._pending or self._header_pending:
                    self._settle(rows, of_rows)
                rows.append(cells[: len(layout.header)])
                of_rows.append(number)
            elif fits and self._is_header(cells) and (rows or self._parts[0].lines):
                self._flush(rows, of_rows)
                raise NewHeader(self._before_header(number))
            elif self._is_ragged(line):
                self._parts[-1].ragged.add(number)
            else:
                self._pending.append((number, line))
        self._flush(rows, of_rows)

    def _flush(self, rows: list[list[str]], of_rows: list[int]) -> None:
        if rows:
            columns = [
                self._column(cells, place) for place, cells in enumerate(zip(*rows, strict=True))
            ]
            self.add_columns(columns, np.array(of_rows, np.int64))
            rows.clear()
            of_rows.clear()

    def _settle(self, rows: list[list[str]], of_rows: list[int]) -> None:
        """Decide, at a row after lines of text, whether they began a new table."""
        part = self._parts[-1]
        delimiter = self._layout.dialect.delimiter
        said = [
            pair
            for _, line in self._pending
            for pair in _metadata(uncommented(line, delimiter) or line, delimiter)
        ]
        keys = {key for key, _ in said if key}
        again = bool(keys) and any(key in keys for key, _ in part.metadata)
        if (again or (self._header_pending and keys)) and (rows or part.row_count):
            self._flush(rows, of_rows)
            if self._header_pending:
                part.headers.count -= 1  # it is the new table's own
            self._parts.append(_Part(said, part.all_metadata()))
        else:
            self._count_pending()
        self._pending.clear()
        self._header_pending = False

    def _count_pending(self) -> None:
        part = self._parts[-1]
        for number, line in self._pending:
            if uncommented(line, self._layout.dialect.delimiter) is not None:
                part.comments.add(number)
            elif not is_rule(line):
                part.texts.add(number)

    def _before_header(self, number: int) -> int:
        """First line of the text above another header, which belongs to it."""
        if self._pending:
            number = min(number, self._pending[0][0])
            self._pending.clear()
        return number

    def _is_header(self, cells: Sequence[str]) -> bool:
        """Whether a row holds only words, where numbers and times should be."""
        under = [c for c, kind in zip(cells, self._layout.kinds, strict=False) if kind in "nt"]
        return (
            len(under) > 1
            and all(is_word(cell, self._layout.dialect.decimal) for cell in under)
            # "ws;h" could be watt seconds and hours, were they not names of the header above.
            and (not looks_like_units(cells) or bool(set(cells) & set(self._layout.header)))
        )

    def _is_footer(self, cells: Sequence[str]) -> bool:
        """Whether a row is one of means or counts: a word where a number or time should be."""
        decimal = self._layout.dialect.decimal
        return self._layout.kinds[0] in "nt" and is_word(cells[0], decimal)

    def _is_ragged(self, line: str) -> bool:
        """Whether a line that does not fit is a row gone wrong rather than text."""
        dialect = self._layout.dialect
        cells = [cell for cell in dialect.split(line) if cell]
        if len(cells) < 2 or (self._layout.kinds[0] in "nt" and is_word(cells[0], dialect.decimal)):
            return False
        return 2 * sum(is_number(c, dialect.decimal) or is_time(c) for c in cells) >= len(cells)

    def kinds_held(self) -> bool:
        """Whether what the layout says to be numbers turned out so, in all tables."""
        return all(
            kind != "n" or array.dtype == np.float64
            for part in self._parts
            for columns in part.columns
            for kind, array in zip(self._layout.kinds, columns, strict=True)
        )

    def tables(self) -> list[Table]:
        """
        Give the tables, in the order of the file.

        Raises
        ------
        Mixed
            Columns to be read again as text.
        NotATable
            More rows were left out than kept.
        """
        self._count_pending()
        self._pending.clear()
        mixed = frozenset(
            (number, place)
            for number, part in enumerate(self._parts)
            for place in range(len(self._layout.header))
            if len({columns[place].dtype for columns in part.columns}) > 1
        )
        if mixed:
            raise Mixed(mixed)
        kept = sum(part.row_count for part in self._parts)
        ragged = sum(part.ragged.count for part in self._parts)
        if ragged > kept:
            raise NotATable(
                f"{ragged} of {kept + ragged} rows have more or fewer cells than the header",
                "Check the delimiter and the header",
                line=next(part.ragged.first for part in self._parts if part.ragged.count),
            )
        return [self._table(part) for part in self._parts if part.row_count]

    def _table(self, part: _Part) -> Table:
        layout = self._layout
        reasons = (part.numbers_above, part.headers, part.ragged, part.comments, part.texts)
        remarks = [reason.remark() for reason in reasons if reason.count]
        if layout.odd_rows and part is self._parts[0]:
            remarks.insert(
                0, f"{layout.odd_rows} further row(s) of text beside the header were left out"
            )
        if layout.width > len(layout.header):
            remarks.append("the delimiter at the end of each line was passed over")
        columns: list[NDArray[Any]] = []
        for place in range(len(layout.header)):
            pieces = [piece[place] for piece in part.columns]
            columns.append(pieces[0] if len(pieces) == 1 else np.concatenate(pieces))
            for piece in part.columns:
                piece[place] = columns[-1][:0]  # the memory of the pieces is given back
        return Table(
            source=self._source,
            header=layout.header,
            units=layout.units,
            columns=tuple(columns),
            lines=np.concatenate(part.lines) if len(part.lines) > 1 else part.lines[0],
            metadata=part.all_metadata(),
            remarks=tuple(remarks),
            encoding=self._encoding,
            delimiter=layout.dialect.delimiter,
            decimal=layout.dialect.decimal,
        )


def _metadata(line: str, delimiter: str) -> tuple[tuple[str, str], ...]:
    if is_rule(line):
        return ()
    # An archive repeats these lines; long ones are not worth the memory.
    if len(line) > _LONGEST_REMEMBERED:
        return tuple(metadata(line, delimiter))
    return _remembered_metadata(line, delimiter)


@lru_cache(maxsize=1024)
def _remembered_metadata(line: str, delimiter: str) -> tuple[tuple[str, str], ...]:
    return tuple(metadata(line, delimiter))
