"""
Long tables of line-of-sight velocities: one row a beam and range gate, as a scanning lidar writes.

The columns azimuth, elevation, range and radial velocity must be there; a quality (a
carrier-to-noise ratio in dB, or 0 and 1) and the number of the scan may be. The profiles come from
:mod:`backveer.profiles.velocity_azimuth`.
"""

from __future__ import annotations

import re
from dataclasses import replace
from typing import Any

import numpy as np

from backveer.io.readers.errors import MissingColumn, TooFewLevels, UnknownUnit
from backveer.io.readers.levels import Draft, Notes
from backveer.io.readers.place_and_time import Site
from backveer.io.readers.reading import ColumnReading, Hints
from backveer.io.readers.recognise import recognise
from backveer.io.readers.row_places import row_times
from backveer.io.readers.table import Table
from backveer.io.readers.units import Unit, parse, spellings_of
from backveer.profiles.quality import Thresholds
from backveer.profiles.velocity_azimuth import velocity_azimuth

#: Names of the columns, without unit, in lower case, words apart by a space.
NAMES = {
    "azimuth": ("azimuth", "azimuth angle", "azi", "az", "beam azimuth"),
    "elevation": ("elevation", "elevation angle", "elev", "el", "ele", "beam elevation"),
    "range": ("range", "distance", "range gate", "gate range", "gate distance", "slant range"),
    "radial_velocity": (
        "radial velocity", "radial wind speed", "radial speed", "rws", "vr", "v r", "vrad",
        "los velocity", "line of sight velocity", "los wind speed", "doppler velocity",
    ),
    "quality": ("cnr", "snr", "carrier to noise ratio", "quality", "valid", "ok", "status"),
    "scan": ("scan", "scan id", "scan number", "sweep", "scan no", "scan index"),
}  # fmt: skip
NEEDED = ("azimuth", "elevation", "range", "radial_velocity")
_KIND = {"azimuth": "angle", "elevation": "angle", "range": "length", "radial_velocity": "speed"}
_DECIBEL = re.compile(r"\bdb\b", re.IGNORECASE)
_TURN_BACK = 180.0  # degree: the azimuth goes round, or the scanner goes back to its start
_SAME = 1.0  # degree of elevation


def is_radial(header: tuple[str, ...], hints: Hints) -> bool:
    """
    Say whether a table is one of line-of-sight velocities.

    Examples
    --------
    >>> is_radial(("time", "azimuth (deg)", "elevation", "range", "rws (m/s)"), Hints())
    True
    >>> is_radial(("time", "azimuth", "elevation", "wind speed"), Hints())
    False
    """
    return set(NEEDED) <= set(_columns(header, hints))


def read_radial(table: Table, site: Site, hints: Hints) -> Draft:
    """
    Turn line-of-sight velocities into profiles, one a scan.

    Raises
    ------
    ReadError
        A velocity without a unit, columns that hold no numbers, a single gate.
    """
    place = _columns(table.header, hints)
    said: dict[int, ColumnReading] = {}
    values = {name: _numbers(table, place, name, hints, said) for name in NEEDED}
    usable, remarks = _usable(table, place, said)
    rest = tuple(i for i in range(len(table.header)) if i not in place.values())
    times, notes = _times(table, rest, site, hints)
    scan, beam, gate, distance = _sorted_out(table, place, values, times)
    scans, beams = int(scan.max(initial=-1)) + 1, int(beam.max(initial=-1)) + 1
    shape = (scans, beams, distance.size)
    if distance.size < 2:
        raise TooFewLevels("there is a single range gate", "Give a table with two or more gates")
    azimuth, elevation = np.full(shape[:2], np.nan), np.full(shape[:2], np.nan)
    radial, good = np.full(shape, np.nan), np.zeros(shape, dtype=bool)
    azimuth[scan, beam], elevation[scan, beam] = values["azimuth"], values["elevation"]
    radial[scan, beam, gate], good[scan, beam, gate] = values["radial_velocity"], usable
    told = velocity_azimuth(azimuth, elevation, distance, radial, good)
    remarks.append(
        "radial velocities were taken as positive away from the instrument, azimuths as clockwise "
        "from north; heights are above the instrument"
    )
    poor = [str(why) for why in told.why.reshape(-1) if why]
    if poor:
        most = max(set(poor), key=poor.count)
        remarks.append(f"{len(poor)} of {told.why.size} fits withheld, most because {most}")
    first = np.unique(scan, return_index=True)[1]
    stack = told.to_stack()
    profile: dict[str, Any] = {
        "time": np.full(scans, site.time) if times is None else times[first],
        "wind_error": stack.wind_error,
        "station": np.full(scans, site.station, dtype=object),
    }
    for name in ("latitude", "longitude", "elevation"):
        profile[name] = np.full(scans, getattr(site, name))
    levels: dict[str, Any] = {
        name: getattr(stack, name)
        for name in ("height", "eastward_wind", "northward_wind", "upward_air_velocity",
                     "availability")
    }  # fmt: skip
    columns = tuple(
        said.get(i) or notes.get(i) or ColumnReading(name, None, None, "not needed")
        for i, name in enumerate(table.header)
    )
    return Draft(levels, profile, columns, [*table.remarks, *site.remarks, *remarks])


def _columns(header: tuple[str, ...], hints: Hints) -> dict[str, int]:
    """Place of each column that is known; the user's word holds."""
    found: dict[str, int] = {}
    for name, written in hints.columns.items():
        if name in NAMES and written in header:
            found[name] = header.index(written)
    for i, written in enumerate(header):
        bare = re.sub(r"[\[(].*?[\])]", " ", written.casefold())
        bare = " ".join(re.split(r"[\W_]+", bare)).strip()
        for name, spellings in NAMES.items():
            if name not in found and bare in spellings:
                found[name] = i
    return found


def _numbers(
    table: Table, place: dict[str, int], name: str, hints: Hints, said: dict[int, ColumnReading]
) -> Any:
    """Return a column in degrees, m or m/s."""
    at = place[name]
    column, written = table.columns[at], table.header[at]
    if column.dtype != np.float64:
        raise MissingColumn(
            f'column "{written}" holds no numbers',
            "Correct the file, or name another with --column",
        )
    kind = _KIND[name]
    unit = _unit(table, at, name, kind, hints)
    why = "name and unit in the header"
    if unit is None and kind == "speed":
        raise UnknownUnit(
            f'the unit of column "{written}" is not known',
            f'Say it with --unit "{written}=m/s" ({spellings_of("speed")})',
        )
    if unit is None:
        unit = parse("deg" if kind == "angle" else "m", kind)
        why = "name in the header; no unit given: degrees" if kind == "angle" else (
            "name in the header; no unit given: m"
        )  # fmt: skip
    assert unit is not None
    said[at] = ColumnReading(written, name, unit.sign, why)
    with np.errstate(invalid="ignore"):
        # A code for missing is far from any velocity that a lidar sees.
        column = np.where(np.abs(column) >= 900, np.nan, column) if kind == "speed" else column
    return column * unit.factor


def _unit(table: Table, at: int, name: str, kind: str, hints: Hints) -> Unit | None:
    written = table.header[at]
    bracket = re.search(r"[\[(](.*?)[\])]", written)
    for text in (
        hints.units.get(written),
        hints.units.get(name),
        bracket[1] if bracket else None,
        table.units[at] if table.units else None,
    ):
        if text and (unit := parse(text, kind)) is not None:
            return unit
    return None


def _usable(
    table: Table, place: dict[str, int], said: dict[int, ColumnReading]
) -> tuple[Any, list[str]]:
    """Say where the quality of the signal is good enough."""
    everywhere = np.ones(len(table.lines), dtype=bool)
    if "quality" not in place:
        return everywhere, ["no quality of the signal is given: all radial velocities were used"]
    at = place["quality"]
    column, written = table.columns[at], table.header[at]
    unit = table.units[at] if table.units else ""
    if column.dtype != np.float64:
        said[at] = ColumnReading(written, None, None, "quality: no numbers")
        return everywhere, [f'"{written}" holds no numbers: all radial velocities were used']
    if _DECIBEL.search(f"{written} {unit}"):
        lowest = Thresholds().lowest_signal
        said[at] = ColumnReading(written, "quality", "dB", f"used from {lowest:g} dB on")
        with np.errstate(invalid="ignore"):
            return column >= lowest, []
    if np.isin(column[np.isfinite(column)], (0.0, 1.0)).all():
        said[at] = ColumnReading(written, "quality", "1", "used where it is 1")
        return column == 1.0, []
    said[at] = ColumnReading(written, None, None, "quality: neither in dB nor 0 and 1")
    return everywhere, [
        f'"{written}" is neither in dB nor 0 and 1: all radial velocities were used'
    ]


def _times(
    table: Table, rest: tuple[int, ...], site: Site, hints: Hints
) -> tuple[Any, dict[int, ColumnReading]]:
    """Return the times of the rows from the columns that are left, and what was said of these."""
    part = replace(
        table,
        header=tuple(table.header[i] for i in rest),
        units=tuple(table.units[i] for i in rest) if table.units else (),
        columns=tuple(table.columns[i] for i in rest),
    )
    claims = recognise(
        part.header,
        part.units,
        tuple(column.dtype != np.float64 for column in part.columns),
        tuple(item for item in hints.columns.items() if item[0] not in NAMES),
        tuple(hints.units.items()),
    )
    notes = Notes(part, claims)
    clocks = {
        claim.quantity: claim for claim in claims if claim.quantity in ("time", "date", "clock")
    }
    times, in_utc = row_times(part, clocks, site, notes)
    told = {rest[i]: reading for i, reading in enumerate(notes.readings())}
    unused = {
        at: reading if reading.read_as in clocks else ColumnReading(
            reading.column, None, None, "not needed for line-of-sight velocities"
        )
        for at, reading in told.items()
    }  # fmt: skip
    return (times if in_utc else None), unused


def _sorted_out(
    table: Table, place: dict[str, int], values: dict[str, Any], times: Any
) -> tuple[Any, Any, Any, Any]:
    """
    Give each row its scan, beam and gate, and the distances of the gates.

    A scan ends where its number changes; without numbers, where the azimuth leaps by more than half
    a circle (round by north, or back to its start); and where the elevation changes.
    """
    azimuth, elevation, distance = (values[name] for name in ("azimuth", "elevation", "range"))
    rows = azimuth.size
    new_beam = np.ones(rows, dtype=bool)
    if rows:
        moved = (np.diff(azimuth) != 0) | (np.abs(np.diff(elevation)) > 0)
        if "scan" in place:
            number = table.columns[place["scan"]]
            moved |= number[1:] != number[:-1]
        # The next beam at the same angles begins again with the nearest gate.
        moved |= np.diff(distance) < 0
        new_beam[1:] = moved
    first = np.flatnonzero(new_beam)
    beam = np.cumsum(new_beam) - 1
    at, up = azimuth[first], elevation[first]
    new_scan = np.zeros(first.size, dtype=bool)
    new_scan[:1] = True
    if first.size:
        if "scan" in place:
            number = table.columns[place["scan"]][first]
            new_scan[1:] = number[1:] != number[:-1]
        else:
            with np.errstate(invalid="ignore"):
                new_scan[1:] = np.abs(np.diff(at)) > _TURN_BACK
        new_scan[1:] |= np.abs(np.diff(up)) > _SAME
    scan_of_beam = np.cumsum(new_scan) - 1
    begin = np.flatnonzero(new_scan)
    beam_in_scan = np.arange(first.size) - begin[scan_of_beam]
    gates = np.unique(np.round(distance[np.isfinite(distance)], 2))
    gate = np.searchsorted(gates, np.round(np.nan_to_num(distance, nan=np.inf), 2))
    gate = np.minimum(gate, max(gates.size - 1, 0))
    return scan_of_beam[beam], beam_in_scan[beam], gate, gates
