"""The night's outlook in print and in JSON."""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.io.words.cautions import AVIATION, TURBINE
from backveer.io.words.page import name_of, pairs_of, place_of, section, table, time_of, wrapped
from backveer.io.words.record import LEVEL_DECIMALS, plain
from backveer.io.words.units import NAMED, Unit, plainly, with_error
from backveer.profiles.outlook import Outlook
from backveer.profiles.stack import Stack, wind_from_direction

HOUR = Unit("h", 3600.0)


def outlook_records(stack: Stack, told: Outlook) -> list[dict[str, Any]]:
    """Return the value of ``outlook`` for each profile."""
    heights = plain(stack.height, LEVEL_DECIMALS)
    by_level = {
        name: plain(getattr(told, name))
        for name in (
            "amplitude",
            "amplitude_error",
            "maximum_speed",
            "maximum_speed_error",
            "time_of_maximum",
            "wind_error",
        )
    }
    winds = {name: plain(getattr(told, name)) for name in ("eastward_wind", "northward_wind")}
    single = {
        name: plain(getattr(told, name))
        for name in (
            "inertial_period",
            "night_length",
            "jet_height",
            "jet_speed",
            "jet_speed_error",
            "jet_time",
        )
    }
    hours = plain(told.hour)
    records = []
    for row in range(stack.profile_count):
        kept = [i for i, x in enumerate(by_level["amplitude"][row]) if x is not None]
        records.append(
            {
                "inertial_period": single["inertial_period"][row],
                "release_time": _iso(told.release[row]),
                "end_time": _iso(told.end[row]),
                "night_length": single["night_length"][row],
                "night_depth": told.night_depth,
                "height": [heights[row][i] for i in kept],
                **{name: [values[row][i] for i in kept] for name, values in by_level.items()},
                "jet": {
                    "height": single["jet_height"][row],
                    "speed": single["jet_speed"][row],
                    "error": single["jet_speed_error"][row],
                    "time": single["jet_time"][row],
                },
                "time": [x for x in hours[row] if x is not None],
                **{
                    name: [[at[i] for i in kept] for at in values[row]] if kept else []
                    for name, values in winds.items()
                },
                "remark": told.remark[row] or None,
                "why": told.why[row] or None,
            }
        )
    return records


def outlook_text(
    stack: Stack,
    told: Outlook,
    index: int,
    *,
    units: str = "si",
    rotor: list[dict[str, Any]] | None = None,
    check: str = "",
) -> str:
    """
    Write the outlook of one profile.

    Parameters
    ----------
    stack, told, index
        The profiles, their outlook, and which of them.
    units
        ``"si"`` or ``"aviation"``.
    rotor
        Rows of what a rotor meets through the night, already formatted: time, veer, exponent.
    check
        How a later sounding compares, in one paragraph.
    """
    shown = NAMED[units]
    when = "" if np.isnat(stack.time[index]) else f", {time_of(stack.time[index])}"
    parts = [f"{name_of(stack, index)}{when}\n{place_of(stack, index)}"]
    if told.why[index]:
        parts.append(wrapped(f"The night's swing is not determined, because {told.why[index]}."))
        return "\n\n".join(parts)
    speed, height = shown.speed, shown.height
    jet = with_error(told.jet_speed[index], told.jet_speed_error[index], speed)
    parts.append(
        wrapped(
            f"If friction lets go at {time_of(told.release[index])} and nothing else changes, the "
            f"wind is strongest at {plainly(told.jet_height[index], height)} {height.name}, "
            f"{plainly(told.jet_time[index], HOUR, 1)} h later: {jet} {speed.name}. "
            "This is an undamped swing in a pressure field that is held, an upper bound."
        )
    )
    parts.append(
        "\n".join(
            pairs_of(
                [
                    ("inertial period", f"{plainly(told.inertial_period[index], HOUR, 1)} h"),
                    ("told until", time_of(told.end[index])),
                    (
                        "night",
                        "-"
                        if not np.isfinite(told.night_length[index])
                        else f"{plainly(told.night_length[index], HOUR, 1)} h",
                    ),
                    (
                        "night's friction",
                        f"up to {plainly(told.night_depth, height)} {height.name}, an assumption",
                    ),
                ]
            )
        )
    )
    if told.remark[index]:
        parts.append(wrapped(f"Note: {told.remark[index]}."))
    levels = np.flatnonzero(np.isfinite(told.amplitude[index]))
    picked = levels[np.unique(np.linspace(0, levels.size - 1, 8).round().astype(int))]
    rows = [
        [
            plainly(stack.height[index, i], height),
            with_error(told.amplitude[index, i], told.amplitude_error[index, i], speed),
            with_error(told.maximum_speed[index, i], told.maximum_speed_error[index, i], speed),
            plainly(told.time_of_maximum[index, i], HOUR, 1),
        ]
        for i in picked
    ]
    head = [
        ["height", "swing", "strongest", "after"],
        [height.name, speed.name, speed.name, "h"],
    ]
    parts.append(section("By height", table(head, rows, "rrrr")))
    few = np.unique(np.linspace(0, told.hour.shape[1] - 1, 9).round().astype(int))
    at = picked[[0, picked.size // 3, 2 * picked.size // 3, picked.size - 1]]
    at = np.unique(at)
    names = [f"{plainly(stack.height[index, i], height)} {height.name}" for i in at]
    hours = [
        [
            plainly(told.hour[index, j], HOUR, 1),
            *(_wind(told, index, j, int(i), speed) for i in at),
        ]
        for j in few
    ]
    head = [["after", *names], ["h", *(f"deg/{speed.name}" for _ in at)]]
    parts.append(section("Through the night", table(head, hours, "r" * (at.size + 1))))
    if rotor:
        head = [["after", "veer", "exponent"], ["h", "deg", ""]]
        lines = [[r["after"], r["veer"], r["exponent"]] for r in rotor]
        parts.append(section("Across the rotor", table(head, lines, "rrr")))
    if check:
        parts.append(wrapped(check))
    parts.append(wrapped(f"Caution: {AVIATION if units == 'aviation' else TURBINE}"))
    return "\n\n".join(parts)


def _wind(told: Outlook, index: int, hour: int, level: int, speed: Unit) -> str:
    u, v = told.eastward_wind[index, hour, level], told.northward_wind[index, hour, level]
    direction = float(wind_from_direction(np.array(u), np.array(v)))
    return f"{direction:03.0f}/{plainly(float(np.hypot(u, v)), speed, 1)}"


def _iso(time: np.datetime64) -> str | None:
    return None if np.isnat(time) else f"{np.datetime_as_string(time, unit='s')}Z"
