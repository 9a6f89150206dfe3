"""Time and place of each row, where columns say them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.levels import Array, Notes, plain_reading
from backveer.io.readers.moments import Moments, compact_clock, numbers_as_moments, read_moments
from backveer.io.readers.names import Claim
from backveer.io.readers.place_and_time import ASSUMED_UTC, Site, as_times, coordinate, times_said
from backveer.io.readers.spellings import languages, words_of
from backveer.io.readers.table import Table


def row_times(
    table: Table, by: Mapping[str, Claim], site: Site, notes: Notes
) -> tuple[NDArray[Any] | None, bool]:
    """
    Return the time of each row from columns of time, date and clock, None where there is none.

    Also returned is whether the times are in UTC; local times only tell profiles apart.

    Raises
    ------
    Contradiction
        Day and month cannot be told apart.
    """
    day: Array | None = None
    second: Array | None = None
    zone, in_utc = False, True
    order_offset: int | None = site.offset
    used: list[Claim] = []
    for name in ("time", "date", "clock"):
        if name not in by:
            continue
        claim = by[name]
        order, offset = times_said(claim.unit)
        order_offset = offset if offset is not None else order_offset
        moments = _moments(table.columns[claim.column], claim, name, order)
        if moments is None:
            if name == "time":
                notes.say(claim, "elapsed_time", None, f"{claim.why}; no answer hangs on it")
            else:
                notes.unused(claim, f"{name}: not understood")
            continue
        if moments.unknown is not None:
            notes.add(claim, f'"{moments.unknown}" was not understood')
        if moments.day is None and moments.second is None:
            notes.unused(claim, f"{name}: not understood")
            continue
        day = moments.day if day is None else day
        second = moments.second if second is None else second
        said = words_of(claim.name)
        zone = zone or moments.zone or any(word in said for word in ("utc", "gmt", "z"))
        row = table.units[claim.column].casefold() if table.units else ""
        zone = zone or any(word in row for word in ("utc", "gmt"))
        unit = claim.unit.sign if claim.unit is not None and claim.unit.kind == "time" else None
        notes.say(claim, name, unit, (notes.changed.get(claim.column) or plain_reading(claim)).why)
        used.append(claim)
        local = any(word in said for word in ("local", "lt", "ortszeit", "locale"))
        if local and order_offset is None:
            notes.remarks.append(
                f'column "{claim.name}" is local time, its offset to UTC is not known: say it with '
                f'--unit "{claim.name}=UTC+1"; no time is given'
            )
            in_utc = False
    if day is None:
        if second is None or not np.isfinite(site.day):
            return None, False
        day = np.full(second.shape, site.day)
        zone = zone or site.zone
    elif second is None and np.isfinite(site.second) and used and np.unique(day).size == 1:
        second, zone = np.full(day.shape, site.second), zone or site.zone
    moments = Moments(day, second, zone, None)
    times = as_times(moments)
    if not zone and second is not None and in_utc:
        if order_offset is None:
            notes.remarks.append(ASSUMED_UTC)
        else:
            times = times - np.timedelta64(order_offset * 60, "s")
    return times, in_utc


def _moments(column: NDArray[Any], claim: Claim, name: str, order: str) -> Moments | None:
    if column.dtype != np.float64:
        remedy = f'Say it with --unit "{claim.name}=DD/MM/YYYY" or --unit "{claim.name}=MM/DD/YYYY"'
        # The levels of a profile repeat its time: each run of equal cells is read once.
        begins = np.flatnonzero(np.append(True, column[1:] != column[:-1]))
        lengths = np.diff(np.append(begins, column.size))
        read = read_moments(column[begins].tolist(), order, f'column "{claim.name}"', remedy)
        return replace(
            read,
            day=None if read.day is None else np.repeat(read.day, lengths),
            second=None if read.second is None else np.repeat(read.second, lengths),
        )
    if name != "clock":
        found = numbers_as_moments(column)
        if found is not None:
            return found
    if name in ("clock",):
        seconds = compact_clock(column)
        return None if seconds is None else Moments(None, seconds, False, None)
    return None


def row_coordinates(column: NDArray[Any], claim: Claim, header: tuple[str, ...]) -> Array:
    """Latitude or longitude of each row, also where it is written as ``58.41N``."""
    if column.dtype == np.float64:
        return column
    spoken = languages(header)
    assert claim.quantity is not None
    read = {
        cell: coordinate(claim.name, cell, claim.quantity, spoken)
        for cell in dict.fromkeys(column.tolist())
    }
    return np.array([read[cell] for cell in column.tolist()], dtype=float)
