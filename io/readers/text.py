"""
From the bytes of a text file to its tables.

A small file is read in one piece by plain string methods, which for it is faster than any
parser, and needs no import. A large regular one goes to pyarrow's parser; where that refuses
(rows of unequal length, comments or further headers inside, white space, fixed columns), it is
read like a small one, in pieces, so that memory stays bounded.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.assembly import Assembly, Mixed, NewHeader
from backveer.io.readers.cells import MISSING, column, words
from backveer.io.readers.encoding import to_utf8
from backveer.io.readers.errors import NotATable, ReadError
from backveer.io.readers.height_row import heights_into_names
from backveer.io.readers.layout import Found, Layout, find
from backveer.io.readers.preamble import uncommented
from backveer.io.readers.table import Table

LARGE = 4 << 20
"""Bytes from which a file is worth importing pyarrow (0.3 s), and the size of a piece."""

_MOST_HEADERS = 100  # different ones in one file; each costs a search of its own
_HEAD = 256 << 10  # where a large file must have its header


def read_tables(source: str, data: bytes, *, nameless: bool = False) -> list[Table]:
    """
    Tables of a text file.

    One table, unless blocks repeat with metadata of their own (several profiles in one file: each
    block becomes a table, which inherits the metadata that its own lines do not give anew), or a
    second, different header follows.

    Parameters
    ----------
    source
        The file as the user named it.
    data
        Its bytes, decompressed.
    nameless
        Accept a table without header, and name its columns ``column 1``, ``column 2``, ...;
        meant for a user who says which column is what.

    Raises
    ------
    NotATable
        Empty, binary or another kind of file, no rows, no header, rows that do not fit it.
    """
    try:
        text, encoding = to_utf8(data)
        if b"\r" in text and (len(text) <= LARGE or text.count(b"\r") != text.count(b"\r\n")):
            text = text.replace(b"\r\n", b"\n").replace(b"\r", b"\n")
        return _File(source, heights_into_names(text), encoding, nameless).tables()
    except ReadError as error:
        error.source = error.source or source
        raise


class _File:
    """A text on its way to tables: what stays the same while its parts are read."""

    def __init__(self, source: str, text: bytes, encoding: str, nameless: bool) -> None:
        self.source = source
        self.text = text
        self.encoding = encoding
        self.nameless = nameless

    def tables(self) -> list[Table]:
        """All tables, from one header to the next different one."""
        start, number, headers = 0, 1, 1
        tables: list[Table] = []
        inherited: tuple[tuple[str, str], ...] = ()
        while True:
            try:
                read, rest = self._from(start, number, inherited)
            except NotATable as error:
                if not tables:
                    error.line = None if error.line is None else error.line + number - 1
                    raise
                remark = f"what stands under the table from line {number} on was left out"
                tables[-1] = _with_remark(tables[-1], remark)
                return tables
            tables += read
            if rest is None:
                return tables
            headers += 1
            if headers > _MOST_HEADERS:
                raise NotATable(
                    f"has more than {_MOST_HEADERS} different headers",
                    "Split it into one file a table",
                    line=rest,
                )
            inherited = tables[-1].metadata if tables else ()
            start = _nth_line(self.text, start, rest - number)
            number = rest

    def _from(
        self, start: int, number: int, inherited: tuple[tuple[str, str], ...]
    ) -> tuple[list[Table], int | None]:
        """Tables under the header at or after ``start``; the line of the next other header."""
        head, numbers = _lines(self.text[start : start + self._head_size(start)], number)
        found = find(head, nameless=self.nameless)
        read = self._under(found, head, numbers, start, number, inherited)
        if read is None:  # a header met before, over numbers written in another way
            found = find(head, nameless=self.nameless, use_known=False)
            read = self._under(found, head, numbers, start, number, inherited)
        assert read is not None
        return read

    def _head_size(self, start: int) -> int:
        if len(self.text) - start <= LARGE:
            return len(self.text)
        return self.text.rfind(b"\n", start, start + _HEAD) + 1 - start or _HEAD

    def _under(
        self,
        found: Found,
        head: list[str],
        numbers: Sequence[int],
        start: int,
        number: int,
        inherited: tuple[tuple[str, str], ...],
    ) -> tuple[list[Table], int | None] | None:
        first = numbers[found.first_row]
        offset = _nth_line(self.text, start, first - number)
        layout = found.layout
        large = len(self.text) - start > LARGE
        last_line = number + self.text.count(b"\n", start) - self.text.endswith(b"\n")
        as_text: frozenset[tuple[int, int]] = frozenset()
        while True:
            assembly = Assembly(self.source, self.encoding, layout, last_line, as_text)
            assembly.preamble(head[: found.header_at], numbers, inherited)
            arrays = by_arrow(self.text, offset, layout) if large and not as_text else None
            rest = None
            try:
                if arrays is not None:
                    assembly.add_columns(arrays, np.arange(first, first + len(arrays[0])))
                elif not large:
                    rows = slice(found.first_row, None)
                    assembly.add(head[rows], numbers[rows])
                else:
                    for piece, count in _pieces(self.text, offset, first):
                        lines, of_lines = _lines(piece, count)
                        assembly.add(lines, of_lines)
            except NewHeader as other:
                rest = other.line
            try:
                tables = assembly.tables()
            except Mixed as mixed:
                as_text |= mixed.places
                continue
            if found.known and not assembly.kinds_held():
                return None
            return tables, rest


def _with_remark(table: Table, remark: str) -> Table:
    return replace(table, remarks=(*table.remarks, remark))


def _lines(piece: bytes, number: int) -> tuple[list[str], Sequence[int]]:
    """Lines of a piece and their numbers; a quoted line end does not end a line."""
    text = piece.decode("utf-8", "replace")
    if "\r" in text:
        text = text.replace("\r\n", "\n")
    lines = text.split("\n")
    if '"' in text and any(line.count('"') % 2 for line in lines):
        return _joined(lines, number)
    return lines, range(number, number + len(lines))


def _joined(lines: list[str], number: int) -> tuple[list[str], list[int]]:
    joined: list[str] = []
    numbers: list[int] = []
    place = 0
    while place < len(lines):
        line, end = lines[place], place + 1
        if line.count('"') % 2:
            # A lone quote (inches) opens nothing: the other one must come soon.
            for last in range(end, min(place + 8, len(lines))):
                if lines[last].count('"') % 2:
                    line, end = " ".join(lines[place : last + 1]), last + 1
                    break
        joined.append(line)
        numbers.append(number + place)
        place = end
    return joined, numbers


def _nth_line(text: bytes, start: int, count: int) -> int:
    """Where the line begins that is ``count`` lines after ``start``."""
    for _ in range(count):
        start = text.index(b"\n", start) + 1
    return start


def _pieces(text: bytes, start: int, number: int) -> Iterator[tuple[bytes, int]]:
    """Whole lines of about ``LARGE`` bytes, and the number of their first."""
    while start < len(text):
        end = text.rfind(b"\n", start, start + LARGE) + 1
        if end == 0:
            end = text.find(b"\n", start + LARGE) + 1 or len(text)
        if start + LARGE >= len(text):
            end = len(text)
        piece = text[start:end]
        yield piece.removesuffix(b"\n"), number
        number += piece.count(b"\n")
        start = end


def by_arrow(text: bytes, start: int, layout: Layout) -> list[NDArray[Any]] | None:
    """Columns of a regular table by pyarrow; None where it is not regular enough for that."""
    delimiter, decimal = layout.dialect.delimiter, layout.dialect.decimal
    if not delimiter.strip() and delimiter != "\t":
        return None
    import pyarrow as pa
    from pyarrow import csv

    names = [str(place) for place in range(layout.width)]
    types = {"n": pa.float64(), "e": pa.float64(), " ": pa.null()}
    text_type = pa.dictionary(pa.int32(), pa.string())
    kinds = [*layout.kinds, *" " * (layout.width - len(layout.kinds))]
    # What stands after a trailing delimiter (here " ") must be empty.
    column_types = [types.get(kind, text_type) for kind in kinds]
    # The parser passes over blank lines, and then the numbers of the lines would not be known:
    # so the rows must be as many as the lines, and their arrays can be made at once.
    count = text.count(b"\n", start) + (not text.endswith(b"\n"))
    arrays: list[NDArray[Any]] = [
        np.empty(count, float if kind in "ne" else object) for kind in layout.kinds
    ]
    known: list[dict[str, str]] = [{} for _ in arrays]
    done = 0
    try:
        batches = csv.open_csv(
            pa.BufferReader(pa.py_buffer(text).slice(start)),
            read_options=csv.ReadOptions(column_names=names, use_threads=False),
            parse_options=csv.ParseOptions(delimiter=delimiter),
            convert_options=csv.ConvertOptions(
                column_types=dict(zip(names, column_types, strict=True)),
                null_values=sorted(MISSING),
                strings_can_be_null=False,
                decimal_point=decimal,
            ),
        )
        for batch in batches:
            rows = slice(done, done + batch.num_rows)
            done = rows.stop
            if done > count:
                return None
            for place, array in enumerate(arrays):
                if array.dtype == np.float64:
                    array[rows] = _values(batch.column(place), np.float64)
                    continue
                coded = batch.column(place)
                said = words(coded.dictionary.to_pylist(), known[place])
                array[rows] = said[_values(coded.indices, np.int32)]
    except (pa.ArrowInvalid, pa.ArrowKeyError, pa.ArrowNotImplementedError):
        return None
    if done != count or any(uncommented(cell, delimiter) is not None for cell in known[0]):
        return None
    for place, cells in enumerate(known):
        # In the sample these were no numbers, and yet all of them may be.
        values = column(list(cells), decimal) if cells else None
        if values is not None:
            value_of = dict(zip(cells, values.tolist(), strict=True))
            arrays[place] = np.array([value_of[cell] for cell in arrays[place]])
    return arrays


def _values(chunk: Any, kind: type[np.generic]) -> NDArray[Any]:
    """Values of an arrow array, NaN for a null; its own to_numpy would import pandas."""
    count, offset = len(chunk), chunk.offset
    if not count:
        return np.empty(0, kind)
    valid, data = chunk.buffers()
    values = np.frombuffer(data, kind, offset + count)[offset:]
    if chunk.null_count:
        bits = np.unpackbits(
            np.frombuffer(valid, np.uint8), count=offset + count, bitorder="little"
        )[offset:]
        values = np.where(bits.astype(bool), values, np.nan)
    return values
