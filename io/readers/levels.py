"""From columns in SI to the variables of a stack: wind, dew point, heights."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.errors import Contradiction, MissingColumn
from backveer.io.readers.heights_from_pressure import heights_from_pressure
from backveer.io.readers.names import Claim
from backveer.io.readers.place_and_time import cannot_place
from backveer.io.readers.plausible import LIMITS, clean
from backveer.io.readers.reading import ColumnReading
from backveer.io.readers.settle import Counted, Settled, counted_from
from backveer.io.readers.table import Table
from backveer.profiles.air import standard_atmosphere
from backveer.profiles.earth import geometric_altitude
from backveer.profiles.humidity import (
    dew_point_from_mixing_ratio,
    dew_point_from_relative_humidity,
    dew_point_from_specific_humidity,
)
from backveer.profiles.stack import wind_components

Array = NDArray[np.float64]

# Recognised in spellings.toml under these names, and told to people under the plain one.
HEIGHTS = ("height", "altitude", "geopotential_height")
VAGUE = ("some_height", "some_altitude")
HUMIDITIES = ("relative_humidity", "mixing_ratio", "specific_humidity")


@dataclass(eq=False)
class Draft:
    """
    Profiles on their way to a stack.

    Attributes
    ----------
    levels
        Arrays over (profile, level), by the names of the stack.
    profile
        Arrays over (profile,) or single values, by the names of the stack.
    columns, remarks
        As in the reading.
    """

    levels: dict[str, Any]
    profile: dict[str, Any]
    columns: tuple[ColumnReading, ...]
    remarks: list[str] = field(default_factory=list)

    @property
    def shape(self) -> tuple[int, int]:
        """Numbers of profiles and levels."""
        rows, levels = self.levels["eastward_wind"].shape
        return int(rows), int(levels)


class Notes:
    """What is said of each column in the end, and of the table as a whole."""

    def __init__(self, table: Table, claims: tuple[Claim, ...]) -> None:
        self.table = table
        self.claims = list(claims)
        self.changed: dict[int, ColumnReading] = {}
        self.remarks: list[str] = list(table.remarks)

    def say(self, claim: Claim, read_as: str | None, unit: str | None, why: str) -> None:
        """Say what a column was read as."""
        self.changed[claim.column] = ColumnReading(claim.name, read_as, unit, why)

    def add(self, claim: Claim, more: str) -> None:
        """Add to what is said of a column."""
        now = self.changed.get(claim.column) or plain_reading(claim)
        self.changed[claim.column] = ColumnReading(
            now.column, now.read_as, now.unit, f"{now.why}; {more}"
        )

    def unused(self, claim: Claim, why: str) -> None:
        """Say that a column is left unused."""
        self.changed[claim.column] = ColumnReading(claim.name, None, None, why)

    def readings(self) -> tuple[ColumnReading, ...]:
        """Return what is said of each column."""
        return tuple(
            self.changed.get(claim.column) or plain_reading(claim) for claim in self.claims
        )


def plain_reading(claim: Claim) -> ColumnReading:
    """Return what is said of a column about which nothing had to be settled."""
    unit = None if claim.unit is None else claim.unit.sign
    return ColumnReading(claim.name, claim.quantity, unit, claim.why)


def in_si(
    raw: Array, quantity: str, settled: Settled, claim: Claim, notes: Notes, effect: str
) -> Array:
    """
    Return values in SI, without codes and impossible ones, which are counted.

    Raises
    ------
    Contradiction
        All values of the column are impossible.
    """
    if quantity == "wind_from_direction" and settled.unit.factor == 1.0 and raw.size:
        low, high = np.fmin.reduce(raw, axis=None), np.fmax.reduce(raw, axis=None)
        if -180.0 <= low < 0.0 and high <= 180.0:
            raw = np.where(raw < 0, raw + 360.0, raw)
            notes.add(claim, "counted from -180 to 180 degrees")
    done = clean(raw, quantity, settled.unit)
    if done.codes:
        what = "1 value is a code" if done.codes == 1 else f"{done.codes} values are codes"
        notes.add(claim, f"{what} for missing" + (" (all heights)" if raw.ndim == 2 else ""))
    if done.impossible is not None:
        count = int(np.count_nonzero(done.impossible))
        rows = done.impossible.reshape(done.impossible.shape[0], -1).any(axis=1)
        line = int(notes.table.lines[int(np.argmax(rows))])
        said = LIMITS[quantity].said
        if not np.isfinite(done.values).any():
            first = float(raw[done.impossible][0])
            raise_at = Contradiction(
                f'column "{claim.name}": every value {said} ({first:g})',
                f'Correct the file, or say what it is with --unit "{claim.name}=UNIT" or --column',
            )
            raise_at.line = line
            raise raise_at
        values = "1 value" if count == 1 else f"{count} values"
        notes.remarks.append(
            f'column "{claim.name}": {values} refused, because it {said} '
            f"({'' if count == 1 else 'first '}in line {line}), {effect}"
        )
    return done.values


EFFECT = {
    "wind_speed": "no wind there",
    "wind_from_direction": "no wind there",
    "wind_to_direction": "no wind there",
    "relative_humidity": "no humidity there",
}


def wind(
    have: Callable[[str], bool], si: Callable[[str], Array], notes: Notes, by: Mapping[str, Claim]
) -> dict[str, Array]:
    """
    Return eastward and northward wind from u and v, or from speed and direction.

    Raises
    ------
    MissingColumn
        There is no wind, or half of it, or no level has one.
    Contradiction
        Both are there and disagree.
    """
    u, v = _components(have, si, notes, by)
    if not (np.isfinite(u) & np.isfinite(v)).any():
        raise MissingColumn(
            "there is no wind: it is missing at every level",
            "Check the missing codes, or name other columns with --column",
        )
    return {"eastward_wind": u, "northward_wind": v}


def _components(
    have: Callable[[str], bool], si: Callable[[str], Array], notes: Notes, by: Mapping[str, Claim]
) -> tuple[Array, Array]:
    """Return u and v; where one of them is missing, from speed and direction."""
    pair = have("eastward_wind") and have("northward_wind")
    direction = next(
        (name for name in ("wind_from_direction", "wind_to_direction") if have(name)), None
    )
    polar = have("wind_speed") and direction is not None
    if not pair and not polar:
        raise _no_wind(have, notes)
    if polar and direction is not None:
        speed, angle = si("wind_speed"), si(direction)
        if direction == "wind_to_direction":
            angle = angle + 180.0
        u, v = wind_components(speed, angle)
        if not pair:
            return u, v
        east, north = si("eastward_wind"), si("northward_wind")
        with np.errstate(invalid="ignore"):
            apart = np.hypot(u - east, v - north)
            # Rounding of both, and directions in tens of degrees.
            far = apart > 1.0 + 0.15 * np.hypot(u, v)
        if np.count_nonzero(far) > 0.5 * np.count_nonzero(np.isfinite(apart)):
            names = ", ".join(f'"{by[n].name}"' for n in ("wind_speed", "eastward_wind"))
            raise Contradiction(
                f"speed and direction disagree with u and v (columns {names})",
                "Check the units and the sense of the direction, or leave one pair out with "
                "--columns",
            )
        for name in ("wind_speed", direction):
            notes.add(by[name], "u and v agree with it and are used")
        there = np.isfinite(east) & np.isfinite(north)
        if there.all():
            return east, north
        return np.where(there, east, u), np.where(there, north, v)
    return si("eastward_wind"), si("northward_wind")


def _no_wind(have: Callable[[str], bool], notes: Notes) -> MissingColumn:
    names = ", ".join(notes.table.header)
    if have("wind_speed"):
        return MissingColumn(
            "there is a wind speed and no direction",
            f'Name it with --column wind_from_direction="HEADER"; the columns are: {names}',
        )
    if have("wind_from_direction"):
        return MissingColumn(
            "there is a wind direction and no speed",
            f'Name it with --column wind_speed="HEADER"; the columns are: {names}',
        )
    half = [name for name in ("eastward_wind", "northward_wind") if have(name)]
    what = f"there is {half[0].replace('_', ' ')} alone" if half else "there is no wind"
    return MissingColumn(
        f"{what} among the columns",
        'Name speed and direction with --column wind_speed="HEADER" --column '
        f'wind_from_direction="HEADER"; the columns are: {names}',
    )


def dew_point(
    have: Callable[[str], bool],
    si: Callable[[str], Array],
    pressure: Array | None,
    notes: Notes,
    by: Mapping[str, Claim],
) -> Array | None:
    """Return the dew point, given or from the first humidity that can become one."""
    found: Array | None = None
    source = ""
    for name in ("dew_point_temperature", "dew_point_depression", *HUMIDITIES):
        if not have(name):
            continue
        if found is not None:
            notes.unused(by[name], f'{name.replace("_", " ")}: "{source}" is used instead')
        elif name == "dew_point_temperature":
            found = si(name)
        elif name == "dew_point_depression" and have("air_temperature"):
            found = si("air_temperature") - si(name)
        elif name == "relative_humidity" and have("air_temperature"):
            found = dew_point_from_relative_humidity(si("air_temperature"), si(name))
        elif name == "mixing_ratio" and pressure is not None:
            found = dew_point_from_mixing_ratio(si(name), pressure)
        elif name == "specific_humidity" and pressure is not None:
            found = dew_point_from_specific_humidity(si(name), pressure)
        else:
            needs = "pressure" if name in ("mixing_ratio", "specific_humidity") else "temperature"
            notes.unused(by[name], f"{name.replace('_', ' ')}: of no use without {needs}")
        source = source or (by[name].name if found is not None else "")
    if found is not None:
        found = np.where(np.isfinite(found), found, np.nan)
    return found


def vertical(
    levels: dict[str, Any], vague: tuple[Claim, Array] | None, profile: dict[str, Any], notes: Notes
) -> None:
    """
    Complete height and altitude, and say what a height without reference is counted from.

    Raises
    ------
    MissingColumn
        No height and no pressure, or altitudes without an elevation.
    """
    elevation = profile["elevation"]
    base = np.asarray(elevation, dtype=float)
    if vague is not None:
        claim, z = vague
        counted = counted_from(claim, z, levels.get("air_pressure"), base)
        _counted(claim, counted, notes)
        levels[counted.quantity] = z
    latitude = np.asarray(profile["latitude"], dtype=float)[..., np.newaxis]
    if "altitude" not in levels and "geopotential_height" in levels:
        place = latitude if np.isfinite(latitude).any() else None
        levels["altitude"] = geometric_altitude(levels["geopotential_height"], place)
    if "height" in levels and "altitude" in levels and not np.isfinite(base).any():
        with np.errstate(invalid="ignore"):
            between = levels["altitude"] - levels["height"]
        base = _first_finite(between)
        profile["elevation"] = base
        if np.isfinite(base).any():
            notes.remarks.append("the elevation of the site is altitude minus height")
    if "height" in levels:
        if "altitude" not in levels and np.isfinite(base).any():
            levels["altitude"] = levels["height"] + base[..., np.newaxis]
        return
    if "altitude" in levels:
        if not np.isfinite(base).any():
            raise cannot_place(
                "elevation",
                "the heights are altitudes above sea level, and the elevation of the site is not "
                "known: heights above ground cannot be had",
            )
        levels["height"] = levels["altitude"] - base[..., np.newaxis]
        return
    if "air_pressure" not in levels:
        raise no_height(notes.table.header)
    found = heights_from_pressure(
        levels["air_pressure"],
        levels.get("air_temperature"),
        levels.get("dew_point_temperature"),
        base,
        profile["latitude"],
        any(claim.unit is not None and claim.unit.kind == "level" for claim in notes.claims),
    )
    levels["height"] = found.height
    if np.isfinite(base).any():
        levels["altitude"] = found.altitude
    levels["level_flag"] = levels.get("level_flag", np.uint32(0)) | found.flag
    notes.remarks.append(found.remark)


def no_height(header: tuple[str, ...]) -> MissingColumn:
    """Return the error for a table without height and pressure."""
    return MissingColumn(
        "there is no height and no pressure",
        'Name one with --column height="HEADER", altitude="HEADER" or air_pressure="HEADER"; '
        f"the columns are: {', '.join(header)}",
    )


def _counted(claim: Claim, counted: Counted, notes: Notes) -> None:
    now = notes.changed.get(claim.column) or plain_reading(claim)
    notes.say(claim, counted.quantity, now.unit, f"{now.why}; {counted.why}")
    if counted.remark:
        notes.remarks.append(counted.remark)


def _first_finite(values: Array) -> Array:
    """First finite value of each row, NaN where there is none."""
    finite = np.isfinite(values)
    place = np.argmax(finite, axis=-1)[..., np.newaxis]
    found: Array = np.take_along_axis(np.where(finite, values, np.nan), place, -1)[..., 0]
    return found


def flight_level_pressure(levels: Array, factor: float) -> Array:
    """Pressure of flight levels, by the standard atmosphere. [Pa]"""
    pressure: Array = np.asarray(standard_atmosphere(levels * factor)[1], dtype=float)
    return pressure
