"""
Files of a day each become one record in time order: duplicates, gaps and clocks that changed.

A clock that is put forward leaves an hour out and one that is put back repeats an hour: in either
case nobody can say from the file which instant a line belongs to, and it is refused with a remedy.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.io.readers.errors import Contradiction, ReadError
from backveer.io.readers.place_and_time import ASSUMED_UTC
from backveer.io.readers.reading import FileReading, Reading
from backveer.profiles.classes import usual_interval
from backveer.profiles.labels import Times
from backveer.profiles.stack import Stack

_HOUR = np.timedelta64(3600, "s").astype("timedelta64[ns]")
_NONE = np.timedelta64(0, "ns")
#: Clocks change on Sundays of these months, on either hemisphere, in the small hours (common
#: practice, no source).
_MONTHS = (3, 4, 9, 10, 11)
_SMALL_HOURS = 4


@dataclass(frozen=True, eq=False)
class Series:
    """
    One record in time order.

    Attributes
    ----------
    reading
        All profiles in the order of time, each time once for each station, as one file; what was
        refused is among its failures.
    inputs
        The files as they were read, without those that were refused.
    interval
        Usual time from one profile to the next, timedelta64[ns]; not-a-time for a single one.
    """

    reading: Reading
    inputs: Reading
    interval: Any

    @property
    def stack(self) -> Stack:
        """The profiles."""
        return self.reading.stack


def series(reading: Reading, utc_offset: float | None = None) -> Series:
    """
    Put what was read in time order.

    Parameters
    ----------
    reading
        From :func:`backveer.io.readers.door.read`.
    utc_offset
        Hours that the files' clock is ahead of UTC all year, where the user says so.

    Returns
    -------
    Series
        A file whose clock changed is among the failures of its reading.

    Examples
    --------
    >>> series(Reading((), ())).stack.profile_count
    0
    """
    kept: list[FileReading] = []
    failures: list[ReadError] = list(reading.failures)
    for file in reading.files:
        problem = clock_change(
            file.stack.time + np.timedelta64(round((utc_offset or 0.0) * 3600), "s"),
            fixed_clock=utc_offset is not None or _says_utc(file),
        )
        if problem is None:
            kept.append(file)
        else:
            problem.source = file.source
            failures.append(problem)
    left = Reading(tuple(kept), tuple(failures))
    if not kept:
        return Series(left, left, np.timedelta64("NaT", "ns"))
    stack = left.stack
    order, remarks = _order(stack)
    if not np.array_equal(order, np.arange(stack.profile_count)):
        stack = stack.select(order)
    return Series(joined(left, stack, remarks), left, usual_interval(stack.time))


def joined(reading: Reading, stack: Stack, more: Sequence[str] = ()) -> Reading:
    """Return profiles made from a reading as the only file of one, with more remarks."""
    first = reading.files[0]
    others = len(reading.files) - 1
    source = first.source if not others else f"{first.source} and {others} more"
    columns = tuple(dict.fromkeys(column for file in reading.files for column in file.columns))
    remarks = tuple(dict.fromkeys(remark for file in reading.files for remark in file.remarks))
    return Reading((FileReading(source, stack, columns, (*remarks, *more)),), reading.failures)


def clock_change(time: Times, fixed_clock: bool) -> ReadError | None:
    """
    Say whether the clock of a file was put back or forward.

    Parameters
    ----------
    time : array of datetime64[ns], shape (row,)
        In the order of the file.
    fixed_clock
        Whether it is known to keep one offset; then an hour without data is a gap.

    Examples
    --------
    >>> twice = np.array(["2031-10-26T02:00", "2031-10-26T02:30"] * 2, dtype="datetime64[ns]")
    >>> print(clock_change(twice, fixed_clock=True))
    input: the hour from 2031-10-26 02:00 on stands twice, as when a clock is put back. Give the \
times in UTC, or in a clock that is not changed with --utc-offset HOURS.
    """
    time = time[~np.isnat(time)]
    if time.size < 4:
        return None
    step = np.diff(time)
    usual = usual_interval(time)
    if np.isnat(usual):
        return None
    half = usual // 2
    # Back by an hour less one step, and what follows repeats what was.
    back = np.flatnonzero(np.abs(step + _HOUR - usual) <= half)
    for place in back[(step[back] < _NONE)]:
        begin = time[place + 1]
        after = time[place + 1 :]
        before = np.isin(after[after <= time[place]], time[: place + 1])
        if before.size and before.mean() > 0.5:
            return Contradiction(
                f"the hour from {_told(begin)} on stands twice, as when a clock is put back",
                "Give the times in UTC, or in a clock that is not changed with --utc-offset HOURS",
            )
    if fixed_clock:
        return None
    forward = np.flatnonzero(np.abs(step - _HOUR - usual) <= half)
    for place in forward:
        hour = time[place].astype("datetime64[h]").astype(int) % 24
        day = time[place].astype("datetime64[D]")
        sunday = (day.astype(int) + 4) % 7 == 0
        month = time[place].astype("datetime64[M]").astype(int) % 12 + 1
        if sunday and month in _MONTHS and hour < _SMALL_HOURS:
            return Contradiction(
                f"an hour is missing after {_told(time[place])}, a Sunday on which clocks are put "
                f"forward",
                "Give the times in UTC, or say --utc-offset HOURS if the clock is not changed",
            )
    return None


def _says_utc(file: FileReading) -> bool:
    """Whether the times of the file say that they are in UTC."""
    return ASSUMED_UTC not in file.remarks


def _order(stack: Stack) -> tuple[Any, list[str]]:
    """Rows in the order of time and station, each instant of a station once."""
    _names, station = np.unique(stack.station.astype(str), return_inverse=True)
    order = np.lexsort((station, stack.time))  # not-a-time sorts last
    time, at = stack.time[order], station[order]
    same = np.concatenate([[False], (np.diff(time) == _NONE) & (np.diff(at) == 0)])
    same &= ~np.isnat(time)
    remarks = []
    if same.any():
        first = np.maximum.accumulate(np.where(same, 0, np.arange(same.size)))
        rows, kept = order[same], order[first[same]]
        alike = np.ones(rows.size, dtype=bool)
        for name in ("eastward_wind", "northward_wind"):
            x = getattr(stack, name)
            alike &= ((x[rows] == x[kept]) | (np.isnan(x[rows]) & np.isnan(x[kept]))).all(axis=1)
        twice = int(same.sum())
        remarks.append(
            f"{twice} {'profile' if twice == 1 else 'profiles'} of a time that had one already "
            f"left out, {int((~alike).sum())} of them with another wind"
        )
    return order[~same], remarks


def _told(time: Any) -> str:
    return str(np.datetime_as_string(time, unit="m")).replace("T", " ")
