"""Wide tables: one row a time, columns by height, as lidars and masts write them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from backveer.io.readers.errors import MissingColumn, TooFewLevels
from backveer.io.readers.levels import (
    EFFECT,
    Array,
    Draft,
    Notes,
    dew_point,
    in_si,
    vertical,
    wind,
)
from backveer.io.readers.long_table import as_numbers
from backveer.io.readers.names import BY_HEIGHT, Claim
from backveer.io.readers.place_and_time import Site
from backveer.io.readers.row_places import row_coordinates, row_times
from backveer.io.readers.settle import Columns
from backveer.io.readers.table import Table
from backveer.io.readers.units import Unit, parse

_LOWEST_TOP = 10.0  # m: numbers below this may count sensors rather than metres
_OF_ROW = ("time", "date", "clock", "station", "latitude", "longitude", "elevation")


def is_wide(claims: tuple[Claim, ...]) -> bool:
    """Say whether the columns are by height."""
    return any(claim.height is not None and claim.quantity in BY_HEIGHT for claim in claims)


def read_wide(table: Table, claims: tuple[Claim, ...], site: Site) -> Draft:
    """
    Turn a wide table into profiles, one a row.

    Raises
    ------
    ReadError
        Units that are not known, no wind, a single height, numbers that may be no heights.
    """
    notes = Notes(table, claims)
    z, level_of = _heights(claims, site, notes)
    by: dict[str, list[Claim]] = {}
    single: dict[str, Claim] = {}
    for claim in claims:
        if claim.quantity is None:
            continue
        if claim.height is not None:
            by.setdefault(claim.quantity, []).append(claim)
        elif claim.quantity in _OF_ROW:
            single[claim.quantity] = claim
        else:
            notes.unused(claim, f"{claim.quantity.replace('_', ' ')}: at no known height")
    grid = _Grid(table, by, level_of, z.size, notes)
    levels: dict[str, Any] = dict(wind(grid.has, grid, notes, grid.first))
    grid.let_go()
    for name in ("air_temperature", "air_pressure"):
        if grid.has(name):
            levels[name] = grid(name)
    moisture = dew_point(grid.has, grid, levels.get("air_pressure"), notes, grid.first)
    if moisture is not None:
        levels["dew_point_temperature"] = moisture
    for name in ("upward_air_velocity", "wind_speed_deviation", "availability",
                 "carrier_to_noise_ratio"):  # fmt: skip
        if grid.has(name):
            levels[name] = grid(name)
    grid.let_go()
    count = len(table.lines)
    levels[site.heights_above] = np.broadcast_to(z, (count, z.size))
    profile = _of_rows(table, single, site, count, notes)
    vertical(levels, None, profile, notes)
    notes.remarks += site.remarks
    return Draft(levels, profile, notes.readings(), notes.remarks)


class _Grid:
    """The columns by height as arrays (row, height), in SI when asked for."""

    def __init__(
        self,
        table: Table,
        by: Mapping[str, list[Claim]],
        level_of: Mapping[int, int],
        count: int,
        notes: Notes,
    ) -> None:
        self.table, self.by, self.level_of, self.count, self.notes = (
            table, by, level_of, count, notes,
        )  # fmt: skip
        self.first = {name: claims[0] for name, claims in by.items()}
        self.raw: dict[str, Array] = {}
        self.made: dict[str, Array] = {}
        self.columns = Columns(_Flat(self), self.first)

    def has(self, quantity: str) -> bool:
        return quantity in self.by

    def let_go(self) -> None:
        """Forget the arrays that were made: what is used up need not stay in memory."""
        self.raw.clear()
        self.made.clear()

    def rawly(self, quantity: str) -> Array:
        """Return the numbers as written, NaN at heights without such a column."""
        if quantity not in self.raw:
            shape = (len(self.table.lines), self.count)
            claims = self.by[quantity]
            whole = np.empty(shape) if len(claims) == self.count else np.full(shape, np.nan)
            for claim in claims:
                column = self.table.columns[claim.column]
                level = self.level_of[claim.column]
                whole[:, level] = as_numbers(column, claim, self.table, self.notes)
            self.raw[quantity] = whole
        return self.raw[quantity]

    def __call__(self, quantity: str) -> Array:
        if quantity in self.made:
            return self.made[quantity]
        raw = self.rawly(quantity)
        claims = self.by[quantity]
        settled = self.columns.unit(quantity)
        units = {claim.unit for claim in claims}
        effect = EFFECT.get(quantity, "left out")
        if len(units) == 1:
            values = in_si(raw, quantity, settled, claims[0], self.notes, effect)
        else:
            values = np.full(raw.shape, np.nan)
            for claim in claims:
                level = self.level_of[claim.column]
                own = settled if claim.unit is None else settled._replace(unit=claim.unit)
                values[:, level] = in_si(raw[:, level], quantity, own, claim, self.notes, effect)
        for claim in claims:
            if claim.unit is None:
                why = settled.why if claim is claims[0] else f"{settled.why}".split("; ")[0]
                self.notes.say(claim, quantity, settled.unit.sign, why)
        self.made[quantity] = values
        del self.raw[quantity]
        return values


class _Flat(dict[str, Array]):
    """Raw columns of a grid by quantity, made when first asked for."""

    def __init__(self, grid: _Grid) -> None:
        super().__init__()
        self.grid = grid

    def __missing__(self, quantity: str) -> Array:
        return self.grid.rawly(quantity).ravel()


def _heights(claims: tuple[Claim, ...], site: Site, notes: Notes) -> tuple[Array, dict[int, int]]:
    """Return the heights [m], increasing, and the place of each column among them."""
    placed = [claim for claim in claims if claim.height is not None and claim.quantity is not None]
    winds = [c for c in placed if c.quantity in ("wind_speed", "eastward_wind")]
    metre = parse("m", "length")
    assert metre is not None
    named: set[Unit] = {claim.height_unit for claim in placed if claim.height_unit is not None}
    general = site.heights or (next(iter(named)) if len(named) == 1 else None)
    numbers = {claim.height for claim in placed if claim.height is not None}
    if general is None:
        if max(numbers) < _LOWEST_TOP:
            names = " and ".join(f'"{claim.name}"' for claim in winds[:2])
            raise MissingColumn(
                f"the numbers in the names of {names} may count sensors rather than metres",
                "If they are heights, say --unit height=m; otherwise rename the columns",
            )
        notes.remarks.append(
            "the numbers in the names of the columns were taken as heights above ground in m"
        )
        general = metre
    in_metres = {
        claim.column: round((claim.height or 0.0) * (claim.height_unit or general).factor, 6)
        for claim in placed
    }
    heights = sorted(set(in_metres.values()))
    if len(heights) < 2:
        raise TooFewLevels("there is a single height", "Give a table with two or more heights")
    level = {height: place for place, height in enumerate(heights)}
    return np.array(heights), {column: level[height] for column, height in in_metres.items()}


def _of_rows(
    table: Table, single: Mapping[str, Claim], site: Site, count: int, notes: Notes
) -> dict[str, Any]:
    """Place, time and station of each row."""
    profile: dict[str, Any] = {}
    times, in_utc = row_times(table, single, site, notes)
    if times is not None and in_utc and "time" not in site.said:
        profile["time"] = times
    else:
        profile["time"] = np.full(count, site.time)
    for name in ("latitude", "longitude", "elevation"):
        general = getattr(site, name)
        if name in single and general != general:
            claim = single[name]
            column = table.columns[claim.column]
            if name != "elevation":
                column = row_coordinates(column, claim, table.header)
            column = as_numbers(column, claim, table, notes)
            settled = Columns({name: column}, {name: claim}).unit(name)
            profile[name] = in_si(column, name, settled, claim, notes, "left out")
        else:
            profile[name] = np.full(count, general)
    if "station" in single and not site.station:
        names = table.columns[single["station"].column]
        profile["station"] = (
            names if names.dtype == object else np.array([f"{n:g}" for n in names], dtype=object)
        )
    else:
        profile["station"] = np.full(count, site.station, dtype=object)
    return profile
