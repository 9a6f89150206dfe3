"""
Long tables: one row a level, one profile or many.

Many profiles are told apart by a launch number, a time or a station; otherwise by the height (or
the pressure) starting again. Nothing here loops over rows or profiles.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.cells import numbers
from backveer.io.readers.errors import Contradiction, MissingColumn, TooFewLevels
from backveer.io.readers.levels import (
    EFFECT,
    HEIGHTS,
    VAGUE,
    Array,
    Draft,
    Notes,
    dew_point,
    flight_level_pressure,
    in_si,
    no_height,
    vertical,
    wind,
)
from backveer.io.readers.names import Claim
from backveer.io.readers.place_and_time import Site
from backveer.io.readers.plausible import LIMITS
from backveer.io.readers.profiles_apart import Indices, groups, places, told_apart
from backveer.io.readers.row_places import row_coordinates, row_times
from backveer.io.readers.settle import Columns
from backveer.io.readers.table import Table

_OF_LEVEL = (
    "upward_air_velocity",
    "wind_speed_deviation",
    "availability",
    "carrier_to_noise_ratio",
)
# What is left unused where it holds words; of these, words are an error.
_NEEDED = frozenset(
    (
        *("wind_speed", "wind_from_direction", "wind_to_direction"),
        *("eastward_wind", "northward_wind", "air_pressure", "air_temperature"),
        *HEIGHTS,
        *VAGUE,
    )
)
_OF_PROFILE = ("latitude", "longitude", "elevation", "wind_error")


class _Rows:
    """The columns of a table by quantity: raw, and in SI when asked for."""

    def __init__(self, table: Table, claims: tuple[Claim, ...], notes: Notes) -> None:
        self.notes = notes
        self.by = {claim.quantity: claim for claim in claims if claim.quantity is not None}
        raw: dict[str, Array] = {}
        for quantity, claim in list(self.by.items()):
            if quantity not in LIMITS and quantity not in VAGUE:
                continue
            column = table.columns[claim.column]
            if quantity in ("latitude", "longitude"):
                column = row_coordinates(column, claim, table.header)
            try:
                raw[quantity] = as_numbers(column, claim, table, notes)
            except Contradiction:
                if quantity in _NEEDED:
                    raise
                del self.by[quantity]
                if quantity == "elapsed_time":  # 00:01:30, for instance
                    notes.say(claim, quantity, None, f"{claim.why}; no answer hangs on it")
                else:
                    notes.unused(claim, f"{quantity.replace('_', ' ')}: holds no numbers")
        self.columns = Columns(raw, self.by)
        self.raw = raw
        self.made: dict[str, Array] = {}

    def has(self, quantity: str) -> bool:
        return quantity in self.by

    def forget(self) -> None:
        """Let go of the columns, which for a large table fill the memory."""
        self.raw.clear()
        self.made.clear()

    def __call__(self, quantity: str) -> Array:
        """Return a column in SI, and say how its unit was settled."""
        if quantity not in self.made:
            claim = self.by[quantity]
            settled = self.columns.unit(quantity)
            if claim.unit is None:
                self.notes.say(claim, quantity, settled.unit.sign, settled.why)
            if settled.unit.kind == "level":
                self.made[quantity] = flight_level_pressure(self.raw[quantity], settled.unit.factor)
                return self.made[quantity]
            limits = "altitude" if quantity in VAGUE else quantity
            effect = EFFECT.get(quantity, "left out")
            self.made[quantity] = in_si(
                self.raw[quantity], limits, settled, claim, self.notes, effect
            )
        return self.made[quantity]


def as_numbers(column: NDArray[Any], claim: Claim, table: Table, notes: Notes) -> Array:
    """
    Return a column as numbers; the few cells that are none are named.

    Raises
    ------
    Contradiction
        No cell is a number.
    """
    if column.dtype == np.float64:
        return _measurable(column, claim, notes)
    values, places = numbers(column, table.decimal)
    if places.size:
        first = int(places[0])
        line, cell = int(table.lines[first]), column[first]
        if not np.isfinite(values).any():
            error = Contradiction(
                f'column "{claim.name}" holds no numbers ("{cell}")',
                "Correct the file, or name another column with --column",
            )
            error.line = line
            raise error
        cells = "1 cell is no number" if places.size == 1 else f"{places.size} cells are no numbers"
        notes.remarks.append(f'column "{claim.name}": {cells} (line {line}: "{cell}"), left out')
    return _measurable(values, claim, notes)


_HUGE = 1e15  # no measurement in any unit; fill values of 1e20 and 9.97e36 are usual


def _measurable(values: Array, claim: Claim, notes: Notes) -> Array:
    """Return numbers without those that no instrument gives, which would overflow."""
    if values.size == 0:
        return values
    low, high = np.fmin.reduce(values), np.fmax.reduce(values)
    if not (low < -_HUGE or high > _HUGE):
        return values
    huge = np.abs(values) > _HUGE
    notes.add(claim, f"{int(np.count_nonzero(huge))} values beyond 1e15 count as missing")
    return np.where(huge, np.nan, values)


def read_long(table: Table, claims: tuple[Claim, ...], site: Site) -> Draft:
    """
    Turn a long table into profiles.

    Raises
    ------
    ReadError
        Units that are not known, no wind, no height, a single level, nothing that tells profiles
        apart.
    """
    notes = Notes(table, claims)
    rows = _Rows(table, claims, notes)
    flat: dict[str, Any] = wind(rows.has, rows, notes, rows.by)
    if rows.has("air_temperature"):
        flat["air_temperature"] = rows("air_temperature")
    if rows.has("air_pressure"):
        flat["air_pressure"] = rows("air_pressure")
    moisture = dew_point(rows.has, rows, flat.get("air_pressure"), notes, rows.by)
    if moisture is not None:
        flat["dew_point_temperature"] = moisture
    vague = _vague(rows, notes)
    for name in (*HEIGHTS, *_OF_LEVEL):
        if rows.has(name):
            flat[name] = rows(name)
    if vague is not None:
        flat[""] = rows(vague)
    if rows.has("elapsed_time"):
        rows("elapsed_time")

    kept = _not_empty(flat, notes)
    times, in_utc = row_times(table, rows.by, site, notes)
    keys = {name: table.columns[rows.by[name].column] for name in ("launch", "station", "source")
            if rows.has(name)}  # fmt: skip
    of_height = [flat[name] for name in ("", *HEIGHTS) if name in flat]
    if not of_height and "air_pressure" not in flat:
        raise no_height(table.header)
    axis: Array = of_height[0] if of_height else -flat["air_pressure"]
    if rows.has("level_flag"):
        flat["level_flag"] = _flags(rows, table, notes)
    per_row = {name: rows(name) for name in _OF_PROFILE if rows.has(name)}
    rows.forget()
    if kept is not None:
        flat = {name: values[kept] for name, values in flat.items()}
        per_row = {name: values[kept] for name, values in per_row.items()}
        keys = {name: values[kept] for name, values in keys.items()}
        times = None if times is None else times[kept]
        axis = axis[kept]
    group, keyed = groups(axis, times, keys, flat["eastward_wind"].size)
    told_apart(axis, group, keyed, table.header)
    place, first, shape, moved = places(axis, group)
    if moved:
        of = "the profile were" if shape[0] == 1 else f"{moved} of {shape[0]} profiles were"
        notes.remarks.append(f"the levels of {of} put into the order of their height")
    levels: dict[str, Any] = {}
    if "level_flag" in flat:
        flags: Any = np.zeros(shape, dtype=np.uint32)
        flags[place] = flat.pop("level_flag")
        levels["level_flag"] = flags
    for name in list(flat):
        levels[name] = _scatter(flat.pop(name), place, shape)
    if group is not None and not keyed and "station" not in keys:
        by = "height" if of_height else "pressure"
        notes.remarks.append(f"profiles were told apart by the {by} starting again")
    profile = _of_profiles(
        site, per_row, keys, times if in_utc else None, group, first, place, shape
    )
    if any(_drifts(per_row.get(name), group) for name in ("latitude", "longitude")):
        notes.remarks.append(
            "the position drifts from level to level, that of the site "
            + ("was said" if np.isfinite(site.latitude) else "is the lowest level's")
        )
    z = levels.pop("", None)
    vertical(levels, None if vague is None or z is None else (rows.by[vague], z), profile, notes)
    if not (np.count_nonzero(np.isfinite(levels["height"]), axis=1) > 1).any():
        raise TooFewLevels(
            "a single level is no profile" if shape[1] < 2 or shape[0] == 1
            else f"each of {shape[0]} profiles has a single level",
            "Give a table with two or more levels"
            if shape[0] == 1
            else "Check which column tells profiles apart (--column launch=HEADER)",
        )  # fmt: skip
    notes.remarks += site.remarks
    return Draft(levels, profile, notes.readings(), notes.remarks)


def _vague(rows: _Rows, notes: Notes) -> str | None:
    """Return the height whose reference is open, if another does not make it needless."""
    open_ = [name for name in VAGUE if rows.has(name)]
    clear = [name for name in HEIGHTS if rows.has(name)]
    if len(open_) == 2 and not clear:
        # Both are there: then the words mean what they are defined to mean.
        for vague, name in zip(VAGUE, ("height", "altitude"), strict=True):
            claim = rows.by.pop(vague)
            why = f"{claim.why}; both are given, so the words hold"
            rows.by[name] = claim
            rows.raw[name] = rows.columns.raw[vague]
            unit = None if claim.unit is None else claim.unit.sign
            notes.say(claim, name, unit, why)
        return None
    if not open_:
        return None
    if clear:
        for name in list(open_):
            of = "altitude" if name == "some_altitude" else "height"
            if of not in clear and _apart(rows, name, clear[0], of):
                claim = rows.by.pop(name)
                rows.by[of], rows.raw[of] = claim, rows.raw[name]
                rows.made[of] = rows.made[name]
                unit = rows.columns.unit(name).unit.sign
                beside = f'as it lies beside "{rows.by[clear[0]].name}"'
                notes.say(claim, of, unit, f"{claim.why}; {of} {beside}")
                open_.remove(name)
        for name in open_:
            notes.unused(
                rows.by[name],
                f'does not say what it is counted from, "{rows.by[clear[0]].name}" does',
            )
            del rows.by[name]
        return None
    return open_[0]


def _apart(rows: _Rows, vague: str, clear: str, of: str) -> bool:
    """Say whether an open height lies on its own side of one that is clear."""
    with np.errstate(invalid="ignore"):
        above = rows(vague) - rows(clear)
    above = above[np.isfinite(above)]
    if above.size == 0:
        return False
    offset = float(np.median(above))
    return offset > 1.0 if of == "altitude" else offset < -1.0


def _not_empty(flat: dict[str, Any], notes: Notes) -> NDArray[np.bool_] | None:
    """Say which rows hold anything; None if all do."""
    some: Any = None
    for values in flat.values():
        there = np.isfinite(values)
        if some is None and there.all():
            return None
        some = there if some is None else some | there
        if some.all():
            return None
    if some is None or not some.any():
        raise MissingColumn("no row holds a value", "Check the missing codes and the columns")
    count = int(np.count_nonzero(~some))
    notes.remarks.append("1 row holds no values" if count == 1 else f"{count} rows hold no values")
    kept: NDArray[np.bool_] = some
    return kept


def _flags(rows: _Rows, table: Table, notes: Notes) -> Any:
    """Return the findings of an earlier check, in a table that this program wrote."""
    from backveer.profiles.flags import FLAGS

    claim = rows.by["level_flag"]
    column = table.columns[claim.column]
    known = sum(flag.bit for flag in FLAGS)
    ours = column.dtype == np.float64 and "eastward_wind (m s-1)" in table.header
    if ours and ((column >= 0) & (column == np.floor(column)) & (column <= known)).all():
        return column.astype(np.uint32) & np.uint32(known)
    notes.unused(claim, "findings of another program")
    return np.zeros(column.shape, dtype=np.uint32)


def _scatter(values: Array, place: tuple[Any, Any], shape: tuple[int, int]) -> Array:
    if shape[0] == 1 and (shape[1] < 2 or place[1][0] == 0):
        return values.reshape(shape)
    whole = np.full(shape, np.nan)
    whole[place] = values
    return whole


def _of_profiles(
    site: Site,
    per_row: dict[str, Array],
    keys: dict[str, Any],
    times: NDArray[Any] | None,
    group: Indices | None,
    first: Indices,
    place: tuple[Any, Any],
    shape: tuple[int, int],
) -> dict[str, Any]:
    """Place, time and names of each profile; what the user says holds, then metadata."""
    profile: dict[str, Any] = {}
    several_stations = "station" in keys and group is not None
    for name in _OF_PROFILE:
        general = getattr(site, name, np.nan)
        use_rows = name in per_row and name not in site.said
        if use_rows and (general != general or several_stations):
            lowest = _lowest_given(per_row[name], place, shape)
            if name in ("latitude", "longitude") and name == "longitude":
                lowest = np.where(lowest > 180.0, lowest - 360.0, lowest)
            profile[name] = np.where(np.isfinite(lowest), lowest, general)
        elif general == general or name in ("latitude", "longitude", "elevation"):
            profile[name] = np.full(shape[0], general)
    given = site.time
    if times is not None and not ("time" in site.said or (shape[0] == 1 and not np.isnat(given))):
        earliest = times[first]
        if group is None:
            there = times[~np.isnat(times)]
            earliest = there[:1] if there.size == 0 else there.min(keepdims=True)
        else:
            order = np.argsort(group, kind="stable")
            begin = np.concatenate([[0], np.cumsum(np.bincount(group))[:-1]])
            earliest = np.fmin.reduceat(times[order], begin)
        profile["time"] = earliest if earliest.size else given
    else:
        profile["time"] = np.full(shape[0], given)
    for name in ("station", "source"):
        if name in keys and name not in site.said:
            words = keys[name][first]
            if words.dtype != object:
                words = np.array([f"{word:g}" for word in words], dtype=object)
            profile[name] = words
        elif name == "station":
            profile[name] = np.full(shape[0], site.station, dtype=object)
    return profile


def _drifts(values: Array | None, group: Indices | None) -> bool:
    """Say whether a coordinate changes within any profile."""
    if values is None:
        return False
    there = np.isfinite(values)
    step = np.abs(np.diff(values[there]))
    if group is not None:
        step = step[np.diff(group[there]) == 0]
    return bool((step > 1e-6).any())


def _lowest_given(values: Array, place: tuple[Any, Any], shape: tuple[int, int]) -> Array:
    """Value of each profile at its lowest level that has one."""
    grid = np.full(shape, np.nan)
    grid[place] = values
    finite = np.isfinite(grid)
    at = np.argmax(finite, axis=1)
    found: Array = grid[np.arange(shape[0]), at]
    return found
