"""The door: from the names that the user gives to checked profiles."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from backveer.io.readers.columns import understand
from backveer.io.readers.errors import ReadError
from backveer.io.readers.files import Input, open_inputs, unfold
from backveer.io.readers.levels import Draft
from backveer.io.readers.reading import ColumnReading, FileReading, Hints, Reading
from backveer.io.readers.text import read_tables
from backveer.profiles.quality import check
from backveer.profiles.stack import Stack

Names = str | os.PathLike[str] | Iterable[str | os.PathLike[str]]

# An input that waits for the check of many at once: its name, its digest, its profiles.
_Waiting = tuple[str, str, list[Draft]]

# So many cells of (profile, level) are checked at once: the arrays then still fit in the caches
# of a small machine, and the fixed cost of a check is shared by hundreds of files.
_BATCH = 1 << 18


def read(paths: Names, hints: Hints | None = None) -> Reading:
    """
    Read what the names stand for.

    Parameters
    ----------
    paths
        A path, a glob pattern, ``-`` for standard input, or several of these.
    hints
        What the user says to fill or override what a file lacks.

    Returns
    -------
    Reading
        What was read, quality-checked, and an error in the place of each input that could not be.

    Examples
    --------
    >>> reading = read("no_such_file.csv")
    >>> print(reading.failures[0])
    no_such_file.csv: no such file. Check the name and the folder.
    """
    names = [paths] if isinstance(paths, str | os.PathLike) else list(paths)
    return _read(open_inputs([os.fspath(name) for name in names]), hints or Hints())


def read_bytes(name: str, data: bytes, hints: Hints | None = None) -> Reading:
    """
    Read the bytes of one file, compressed or not, that is no file of this machine.

    Parameters
    ----------
    name
        What people call it; no file of that name is looked for.
    data
        Its content.
    hints
        What the user says to fill or override what it lacks.
    """
    return _read(unfold(name, data), hints or Hints())


def _read(inputs: Iterable[Input | ReadError], said: Hints) -> Reading:
    failures: list[ReadError] = []
    files: list[FileReading] = []
    waiting: list[_Waiting] = []
    size = 0
    for source, digest, outcome in _drafts(inputs, said):
        if isinstance(outcome, ReadError):
            failures.append(outcome)
            continue
        cells = sum(draft.shape[0] * draft.shape[1] for draft in outcome)
        if waiting and size + cells > _BATCH:
            files += _checked(waiting)
            waiting, size = [], 0
        waiting.append((source, digest, outcome))
        del outcome
        size += cells
    files += _checked(waiting)
    return Reading(tuple(files), tuple(failures))


def _drafts(
    inputs: Iterable[Input | ReadError], hints: Hints
) -> Iterator[tuple[str, str, list[Draft] | ReadError]]:
    """Give each input's name, digest, and profiles not yet checked, or what is wrong with it."""
    nameless = bool(hints.columns)
    for opened in inputs:
        if isinstance(opened, ReadError):
            yield opened.source or "", "", opened
            continue
        source, data = opened
        digest = hashlib.sha256(data).hexdigest()
        try:
            tables = read_tables(source, data, nameless=nameless)
            del data, opened
            outcome: list[Draft] | ReadError = _understood(tables, hints)
        except ReadError as error:
            error.source = error.source or source
            outcome = error
        tables = []  # only one copy of a large input may be in memory while it is checked
        yield source, digest, outcome
        del outcome


def _understood(tables: Sequence[Any], hints: Hints) -> list[Draft]:
    """Understand the tables of one input; one of several that is no profile is left out."""
    drafts: list[Draft] = []
    errors: list[tuple[int, ReadError]] = []
    for table in tables:
        try:
            drafts.append(understand(table, hints))
        except ReadError as error:
            errors.append((int(table.lines[0]) if len(table.lines) else 0, error))
    if not drafts:
        raise errors[0][1]
    for line, reason in errors:
        drafts[0].remarks.append(f"the table from line {line} on was left out: {reason.problem}")
    return drafts


def _checked(waiting: list[_Waiting]) -> list[FileReading]:
    """Check the profiles of several inputs at once, and give each input its own."""
    if not waiting:
        return []
    drafts = [draft for _, _, group in waiting for draft in group]
    whole = _check(_joined(drafts))
    files = []
    row = 0
    for source, digest, group in waiting:
        rows = sum(draft.shape[0] for draft in group)
        levels = max(draft.shape[1] for draft in group)
        stack = whole if len(waiting) == 1 else _part(whole, row, row + rows, levels)
        row += rows
        columns = group[0].columns
        remarks = group[0].remarks
        for other in group[1:]:
            columns = columns + tuple(c for c in other.columns if c not in columns)
            remarks = remarks + [remark for remark in other.remarks if remark not in remarks]
        files.append(
            FileReading(source, _with_source(stack, source), columns, tuple(remarks), digest)
        )
    return files


def _check(stack: Stack) -> Stack:
    """Check a stack some rows at a time, so that a large one needs little more than itself."""
    rows = max(1, _BATCH // max(1, stack.level_count))
    if stack.profile_count <= rows:
        return check(stack)
    flags = np.zeros(stack.height.shape, dtype=np.uint32)
    changed: dict[str, Any] = {}
    for begin in range(0, stack.profile_count, rows):
        part = _part(stack, begin, begin + rows, stack.level_count)
        done = check(part)
        flags[begin : begin + rows] = done.level_flag
        for name in _LEVEL_FIELDS:
            values = getattr(done, name)
            if name != "level_flag" and (values is not getattr(part, name) or name in changed):
                whole = changed.setdefault(name, getattr(stack, name).copy())
                whole[begin : begin + rows] = values
    return stack.replace(level_flag=flags, **changed)


def _joined(drafts: list[Draft]) -> Stack:
    """Put the profiles of several drafts into one stack."""
    if len(drafts) == 1:
        return Stack.of(**drafts[0].levels, **drafts[0].profile)
    rows = sum(draft.shape[0] for draft in drafts)
    levels = max(draft.shape[1] for draft in drafts)
    arrays: dict[str, Any] = {}
    for name in dict.fromkeys(name for draft in drafts for name in draft.levels):
        flags = name == "level_flag"
        whole = (
            np.zeros((rows, levels), dtype=np.uint32) if flags else np.full((rows, levels), np.nan)
        )
        row = 0
        for draft in drafts:
            count, depth = draft.shape
            if name in draft.levels:
                whole[row : row + count, :depth] = draft.levels[name]
            row += count
        arrays[name] = whole
    for name in dict.fromkeys(name for draft in drafts for name in draft.profile):
        missing: Any = {"time": np.datetime64("NaT", "ns"), "station": "", "source": ""}.get(
            name, np.nan
        )
        kind: Any = {"time": "datetime64[ns]", "station": object, "source": object}.get(name, float)
        column = np.full(rows, missing, dtype=kind)
        row = 0
        for draft in drafts:
            if name in draft.profile:
                column[row : row + draft.shape[0]] = draft.profile[name]
            row += draft.shape[0]
        arrays[name] = column
    return Stack.of(rows, **arrays)


_LEVEL_FIELDS = tuple(
    name for name, array in vars(Stack.of(1, height=[0.0, 1.0])).items() if array.ndim == 2
)
_PROFILE_FIELDS = tuple(
    name for name, array in vars(Stack.of(1, height=[0.0, 1.0])).items() if array.ndim == 1
)


def _part(whole: Stack, begin: int, end: int, levels: int) -> Stack:
    """Return some rows of a stack, without padding beyond ``levels``."""
    return Stack(
        **{name: getattr(whole, name)[begin:end, :levels] for name in _LEVEL_FIELDS},
        **{name: getattr(whole, name)[begin:end] for name in _PROFILE_FIELDS},
    )


def _with_source(stack: Stack, source: str) -> Stack:
    """Name the input where the table does not name another."""
    given = stack.source
    if given.size and given[0]:
        return stack
    named = np.full(stack.profile_count, source, dtype=object)
    return replace(stack, source=named)


__all__ = ["ColumnReading", "FileReading", "Hints", "Reading", "read"]
