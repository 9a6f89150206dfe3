"""
Where in a text file the table stands: its header, its units row, its first row.

What was found is kept by the exact text of the header, for an archive repeats it in thousands of
files; it is checked against the first rows before it is used again.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from backveer.io.readers.cells import MISSING, is_number, is_time, is_word
from backveer.io.readers.dialect import Detected, Dialect, detect, fixed_columns
from backveer.io.readers.errors import NotATable
from backveer.io.readers.preamble import is_rule, looks_like_units, metadata, uncommented

_KIND_ROWS = 60
_KNOWN_LIMIT = 256
_LONGEST_KNOWN = 20_000
_HEADER_SEARCH = 200  # lines in which a known header is looked for


@dataclass(frozen=True)
class Layout:
    """
    A header and the rows under it.

    Attributes
    ----------
    dialect, width
        How a row is cut, and into how many cells (with those after a trailing delimiter).
    header, units
        Names of the columns, and what the units row says of each; no units where it is absent.
    kinds
        Of each column, what most cells of the sample are: ``n`` numbers, ``t`` times, ``w``
        words, ``e`` nothing but missing marks.
    between
        The lines from the header down to the first row, as written; empty without header.
    odd_rows
        How many of those are neither header nor units.
    """

    dialect: Dialect
    width: int
    header: tuple[str, ...]
    units: tuple[str, ...]
    kinds: str
    between: tuple[str, ...]
    odd_rows: int

    def accepts(self, cells: Sequence[str]) -> bool:
        """Whether a row has the cells of the header, and nothing after them."""
        count = len(self.header)
        return len(cells) == count or (len(cells) > count and not any(cells[count:]))

    def like_data(self, cells: Sequence[str]) -> bool:
        """Whether at least half of the cells under numbers and times are such."""
        return _like_data(cells, self.kinds, self.dialect.decimal)


@dataclass(frozen=True)
class Found:
    """A layout and where it stands: places in the list of lines of the header and first row."""

    layout: Layout
    header_at: int
    first_row: int
    known: bool


_known: dict[str, Layout] = {}


def find(lines: Sequence[str], *, nameless: bool = False, use_known: bool = True) -> Found:
    """
    Find the table in the lines of a file (or of its beginning).

    Parameters
    ----------
    lines
        Lines without their end marks.
    nameless
        Name the columns ``column 1``, ``column 2``, ... where there is no header.
    use_known
        Look whether a header that was met before fits.

    Raises
    ------
    NotATable
        No table of two columns, no rows, no header, or a header of another length; ``line`` is
        the place in the list, from 1.
    """
    if use_known:
        for place, line in enumerate(lines[:_HEADER_SEARCH]):
            layout = _known.get(line)
            if layout is not None:
                if _still_fits(layout, lines, place):
                    return Found(layout, place, place + len(layout.between), True)
                break
    found = _find_anew(lines, nameless)
    layout = found.layout
    if layout.between and not layout.dialect.edges and len(layout.between[0]) < _LONGEST_KNOWN:
        if len(_known) >= _KNOWN_LIMIT:
            _known.clear()
        _known[layout.between[0]] = layout
    return found


def _still_fits(layout: Layout, lines: Sequence[str], place: int) -> bool:
    first = place + len(layout.between)
    if tuple(lines[place:first]) != layout.between:
        return False
    rows = [layout.dialect.split(line) for line in lines[first : first + 3]]
    fit = [layout.accepts(row) and layout.like_data(row) for row in rows]
    return bool(fit) and fit[0] and 2 * sum(fit) > len(fit)


def _find_anew(lines: Sequence[str], nameless: bool) -> Found:
    detected = detect([line for line in lines if uncommented(line) is None])
    if detected is None:
        raise _no_table(lines)
    dialect, width = detected.dialect, detected.width
    plain = [
        place
        for place, line in enumerate(lines)
        if line.strip() and uncommented(line, dialect.delimiter) is None
    ]
    rows = [row for row in map(dialect.split, _sampled(lines, plain)) if len(row) == width]
    kinds = "".join(_kind(cells, dialect.decimal) for cells in zip(*rows, strict=True))
    if "n" not in kinds:
        raise _no_table(lines)
    for first in plain:
        row = dialect.split(lines[first])
        if (
            len(row) == width
            and not is_rule(lines[first])
            and _like_data(row, kinds, dialect.decimal)
            # "Elevation: 52 m" has a number and, by its m, a missing mark.
            and not _is_metadata(lines[first], dialect)
        ):
            break
    else:
        raise _no_table(lines)
    return _with_header(lines, first, detected, kinds, nameless)


def _sampled(lines: Sequence[str], plain: Sequence[int]) -> list[str]:
    body = plain[len(plain) // 3 :] if len(plain) > 8 else plain
    return [lines[place] for place in body[:: len(body) // _KIND_ROWS | 1]]


def _kind(cells: Sequence[str], decimal: str) -> str:
    said = [cell for cell in cells if cell not in MISSING]
    if not said:
        return "e" if any(cells) else "_"
    if sum(is_number(cell, decimal) for cell in said) >= 0.5 * len(said):
        return "n"
    return "t" if sum(map(is_time, said)) >= 0.5 * len(said) else "w"


def _like_data(cells: Sequence[str], kinds: str, decimal: str) -> bool:
    checked = good = 0
    for cell, kind in zip(cells, kinds, strict=False):
        if kind in "nt" and cell not in MISSING:
            checked += 1
            good += not is_word(cell, decimal)
    return 2 * good >= checked


def _with_header(
    lines: Sequence[str], first: int, detected: Detected, kinds: str, nameless: bool
) -> Found:
    dialect = detected.dialect
    trailing = kinds[-1] == "_"
    plain: list[int] = []
    comments: list[int] = []
    texts: dict[int, str] = {}
    for place in range(first - 1, -1, -1):
        line = lines[place]
        if is_rule(line):
            continue
        text = uncommented(line, dialect.delimiter)
        if text is not None:
            # A header among comments stands at their end, not above other lines.
            if not is_rule(text) and (not comments or comments[-1] >= 0):
                fits = _names(text, detected, trailing) and not _is_metadata(text, dialect)
                comments.append(place if fits else -1)
                texts[place] = text
        elif _names(line, detected, trailing) and not _mostly_numbers(line, dialect):
            plain.append(place)
        else:
            break
    commented = [place for place in comments if place >= 0][::-1]
    candidates = plain[::-1]
    if len(candidates) == 1 and commented and looks_like_units(dialect.split(lines[plain[0]])):
        candidates = [commented[-1], *candidates]
    elif not candidates:
        candidates = commented
    else:
        candidates += [
            place
            for place in commented
            if place > plain[0] and looks_like_units(_bracket_cells(texts[place], dialect))
        ]
    if not candidates:
        row = dialect.split(lines[first])
        if any(
            kind in "nt" and is_word(cell, dialect.decimal)
            for cell, kind in zip(row, kinds, strict=True)
        ):
            if first + 1 == len(lines):
                raise _no_table(lines)
            return _found(lines, [first], first + 1, detected, kinds)
        return _without_header(lines, first, detected, kinds, nameless)
    return _found(lines, candidates, first, detected, kinds)


def _found(
    lines: Sequence[str], candidates: list[int], first: int, detected: Detected, kinds: str
) -> Found:
    """Choose header and units among the rows of text above the first row."""
    dialect = detected.dialect
    trailing = kinds[-1] == "_"
    texts = [uncommented(lines[at], dialect.delimiter) or lines[at] for at in candidates]
    cells = [_names(text, detected, trailing) or [] for text in texts]
    raw = [_bracket_cells(text, dialect) for text in texts]
    units_at = max((i for i in range(1, len(cells)) if looks_like_units(raw[i])), default=None)
    header_i = len(cells) - 1 if units_at is None else units_at - 1
    header = cells[header_i]
    units: tuple[str, ...] = ()
    if dialect.edges:
        names, edges = fixed_columns(texts[header_i].expandtabs(), detected.columns)
        kinds = _kinds_of_edges(names, edges, dialect, kinds)
        dialect = Dialect("", dialect.decimal, edges)
        header = names
        if units_at is not None:
            units = tuple(dialect.split(texts[units_at].expandtabs()))
    elif units_at is not None:
        units = tuple(raw[units_at][: len(header)])
        units += ("",) * (len(header) - len(units))
    width = max(detected.width, len(header))
    return Found(
        Layout(
            dialect,
            width,
            tuple(header),
            units,
            kinds[: len(header)].replace("_", "e"),
            tuple(lines[candidates[header_i] : first]),
            len(cells) - 1 - (header_i if units_at is None else units_at),
        ),
        candidates[header_i],
        first,
        False,
    )


def _kinds_of_edges(names: Sequence[str], edges: Sequence[int], old: Dialect, kinds: str) -> str:
    """Kinds of the columns, ``e`` for those that only a name told."""
    by_edge = dict(zip(old.edges, kinds, strict=True))
    if len(names) == len(kinds):
        return kinds
    return "".join(by_edge.get(edge, "e") for edge in edges)


def _names(line: str, detected: Detected, trailing: bool) -> list[str] | None:
    """Cells of a line that has as many as the rows, otherwise None."""
    dialect, width = detected.dialect, detected.width
    if dialect.edges:
        names, _ = fixed_columns(line.expandtabs(), detected.columns)
        return names if sum(map(bool, names)) >= max(2, 0.6 * width) else None
    for cells in _cuts(line, dialect):
        if len(cells) == width + 1 and not cells[-1]:
            return cells[:-1]
        if trailing and len(cells) == width and not cells[-1]:
            return cells[:-1]
        if len(cells) == width or (trailing and len(cells) == width - 1):
            return cells
    return None


def _cuts(line: str, dialect: Dialect) -> list[list[str]]:
    """Ways to cut a header: by white space, names may hold blanks and units in brackets."""
    cuts = [dialect.split(line)]
    if dialect.delimiter == " ":
        cuts.append(_bracket_cells(line, dialect))
        joined = re.sub(r" (?=[(\[])", "\0", " ".join(line.split()))
        cuts.append([m.group().replace("\0", " ") for m in re.finditer(_BRACKETED, joined)])
        cuts.append([part.strip() for part in re.split(r"\s{2,}|\t", line.strip())])
    return cuts


_BRACKETED = re.compile(r"(?:\([^)]{0,40}\)|\[[^]]{0,40}\]|\S)+")


def _bracket_cells(line: str, dialect: Dialect) -> list[str]:
    if dialect.delimiter.strip() or dialect.delimiter == "\t":
        return dialect.split(line)
    return re.findall(_BRACKETED, line)


def _mostly_numbers(line: str, dialect: Dialect) -> bool:
    said = [cell for cell in dialect.split(line) if cell]
    return sum(is_number(cell, dialect.decimal) for cell in said) > 0.5 * len(said)


def _is_metadata(text: str, dialect: Dialect) -> bool:
    """Of a comment that has the header's count of words: whether it is a key and a value."""
    return bool(re.search(r"\w\s*[:=]\s", text)) and bool(metadata(text, dialect.delimiter)[0][0])


def _without_header(
    lines: Sequence[str], first: int, detected: Detected, kinds: str, nameless: bool
) -> Found:
    dialect, width = detected.dialect, detected.width
    for place in range(first - 1, -1, -1):
        if is_rule(lines[place]):
            continue
        cells = dialect.split(uncommented(lines[place], dialect.delimiter) or lines[place])
        words = [cell for cell in cells if cell and is_word(cell, dialect.decimal)]
        if len(words) >= max(2, 0.5 * width) and not _is_metadata(lines[place], dialect):
            if dialect.delimiter == " " and len(cells) == width - 1 and "tt" in kinds:
                joining = Dialect(" ", dialect.decimal, joins_times=True)
                if len(joining.split(lines[first])) == width - 1:
                    narrower = Detected(joining, width - 1, detected.score)
                    one_less = kinds.replace("tt", "t", 1)
                    return _with_header(lines, first, narrower, one_less, nameless)
            raise NotATable(
                f"the header has {len(cells)} names and the rows have {width} cells",
                "Give each column one name; put names that hold the delimiter in quotes",
                line=place + 1,
            )
        break
    if not nameless:
        raise NotATable(
            "has no header, the columns are not named",
            "Put a line of names above the numbers, or say which column is what: "
            "--column height='column 1'",
            line=first + 1,
        )
    count = width - (kinds[-1] == "_")
    header = tuple(f"column {number + 1}" for number in range(count))
    layout = Layout(dialect, width, header, (), kinds[:count].replace("_", "e"), (), 0)
    return Found(layout, first, first, False)


def _no_table(lines: Sequence[str]) -> NotATable:
    """Say whether there is a header at least."""
    said = [line for line in lines if not is_rule(line)]
    last = next((line for line in reversed(said) if uncommented(line) is None), "")
    for delimiter in ",;\t|":
        cells = Dialect(delimiter, ".").split(last)
        if len(cells) > 2 and all(len(cell) < 60 for cell in cells):
            return NotATable(
                "has a header and no rows of numbers",
                "Check that the file was written or fetched to its end",
            )
    if len(said) == 1 and 2 < len(last.split()) < 40:
        return NotATable(
            "has one line and no rows of numbers",
            "Check that the file was written or fetched to its end",
        )
    return NotATable(
        "holds no table: no delimiter makes columns of numbers",
        "Name a file with a header and one row a level",
    )
