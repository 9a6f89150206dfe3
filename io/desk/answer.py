"""From an upload and what was said about it to what the page shows."""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from backveer.io.desk.session import Upload
from backveer.io.readers.door import read_bytes
from backveer.io.readers.errors import ReadError
from backveer.io.readers.reading import FileReading, Hints, Reading
from backveer.io.words.record import failure_record, plain, profile_records
from backveer.io.words.units import NAMED
from backveer.profiles.stack import wind_components
from backveer.profiles.statement import Settings, Statement, statement

BLOCK = 2000  # profiles between two looks at whether the work was cancelled
PLACE = ("latitude", "longitude", "elevation")
TEXTS = ("station", "time")


class Cancelled(Exception):
    """The user asked for the work to stop."""


class BadCall(ValueError):
    """What the page sent cannot be meant; the text says what, in one line."""


@dataclass
class Work:
    """One piece of work: how far it is, and whether it is to stop."""

    done: float = 0.0
    cancelled: threading.Event = field(default_factory=threading.Event)

    def reach(self, done: float) -> None:
        """Tell how far the work is; raises if it was cancelled."""
        self.done = done
        if self.cancelled.is_set():
            raise Cancelled


def hints_of(said: dict[str, Any]) -> Hints:
    """
    Turn what the page said into hints.

    Raises
    ------
    BadCall
        For a number that is none, or lies outside what it can be.
    """
    kept: dict[str, Any] = {}
    for name, limit in (("latitude", 90.0), ("longitude", 360.0), ("elevation", 9000.0)):
        if said.get(name) not in (None, ""):
            value = _number(said[name], name)
            if abs(value) > limit:
                raise BadCall(f"{name} {value:g} is outside {-limit:g} to {limit:g}")
            kept[name] = value
    for name in TEXTS:
        if said.get(name):
            kept[name] = _text(said[name], name)
    for name in ("units", "columns"):
        table = said.get(name) or {}
        if not isinstance(table, dict):
            raise BadCall(f"{name} must be names and texts")
        kept[name] = {_text(k, name): _text(v, name) for k, v in table.items() if v}
    return Hints(**kept)


def settings_of(said: dict[str, Any]) -> Settings:
    """Turn what the page said into settings of the statement; raises :class:`BadCall`."""
    kept: dict[str, Any] = {}
    direction, speed = said.get("geostrophic_direction"), said.get("geostrophic_speed")
    if direction not in (None, "") and speed not in (None, ""):
        d, v = _number(direction, "direction"), _number(speed, "speed")
        if not 0 <= d <= 360 or not 0 <= v <= 200:
            raise BadCall(f"a geostrophic wind of {d:g} degrees and {v:g} m/s cannot be meant")
        u, w = wind_components(np.float64(v), np.float64(d))  # type: ignore[arg-type]
        kept["geostrophic_wind"] = (float(u), float(w))
    if said.get("wind_error") not in (None, ""):
        error = _number(said["wind_error"], "error of the wind")
        if not 0 < error <= 20:
            raise BadCall("the error of the wind must lie between 0 and 20 m/s")
        kept["wind_error"] = error
    return Settings(**kept)


def _number(value: Any, name: str) -> float:
    try:
        number = float(str(value).replace(",", "."))
    except ValueError:
        raise BadCall(f"{name} {str(value)[:40]!r} is not a number") from None
    if not np.isfinite(number):
        raise BadCall(f"{name} must be a finite number")
    return number


def _text(value: Any, name: str) -> str:
    if not isinstance(value, str) or len(value) > 200:
        raise BadCall(f"{name} must be a text of at most 200 characters")
    return value


def read_upload(upload: Upload) -> Reading:
    """Read an upload with the hints that were given for it."""
    return read_bytes(upload.name, upload.place.read_bytes(), hints_of(upload.said))


def answer(upload: Upload, work: Work) -> dict[str, Any]:
    """
    Read, analyse and put into the page's words.

    Parameters
    ----------
    upload
        The file, with what was said about it; ``said["profile"]`` chooses one of many.
    work
        Told how far it is; may be cancelled.

    Returns
    -------
    dict
        ``profile`` is the JSON of the chosen one, ``profiles`` a line for each, ``failures`` what
        could not be read, with the readers' own words.
    """
    reading = read_upload(upload)
    work.reach(0.3)
    if not reading.files or reading.stack.profile_count == 0:
        return {"failures": [failure_record(failure) for failure in reading.failures]}
    stack, settings = reading.stack, settings_of(upload.said)
    count = stack.profile_count
    chosen = upload.said.get("profile", 0)
    chosen = min(max(int(chosen), 0), count - 1) if isinstance(chosen, int) else 0
    lines = _lines(reading, settings, lambda share: work.reach(0.3 + 0.6 * share))
    one, single = only(reading, chosen)
    said = statement(single.stack, settings)
    record = next(profile_records(one, said))
    record["extras"] = extras(upload.said, said)
    work.reach(1.0)
    return {
        "profile": record,
        "index": chosen,
        "profiles": lines,
        "failures": [failure_record(failure) for failure in reading.failures],
    }


def only(reading: Reading, index: int) -> tuple[Reading, FileReading]:
    """Return a reading of a single profile of another, and its file."""
    for file in reading.files:
        if index < file.stack.profile_count:
            single = FileReading(
                file.source, file.stack.select(index), file.columns, file.remarks, file.digest
            )
            return Reading((single,), reading.failures), single
        index -= file.stack.profile_count
    raise IndexError("no such profile")


def _lines(
    reading: Reading, settings: Settings, reached: Callable[[float], None]
) -> list[dict[str, Any]]:
    """Tell of each profile what the page's list shows, block by block."""
    stack = reading.stack
    count = stack.profile_count
    if count == 1:
        return []
    lines: list[dict[str, Any]] = []
    for start in range(0, count, BLOCK):
        part = statement(stack.select(slice(start, start + BLOCK)), settings)
        columns = zip(
            np.datetime_as_string(part.stack.time, unit="s").tolist(),
            part.stack.station.tolist(),
            plain(part.turning.total),
            plain(part.turning.error),
            part.ekman.verdict.tolist(),
            plain(part.ekman.cross_isobar_angle),
            strict=True,
        )
        lines += [
            {
                "time": None if time == "NaT" else f"{time}Z",
                "station": station,
                "turning": turning,
                "error": error,
                "verdict": verdict,
                "angle": angle,
            }
            for time, station, turning, error, verdict, angle in columns
        ]
        reached(min(1.0, (start + BLOCK) / count))
    return lines


def extras(said: dict[str, Any], one: Statement) -> dict[str, Any]:
    """Answer for a rotor and a runway, where they are set."""
    found: dict[str, Any] = {}
    hub, diameter = said.get("hub_height"), said.get("rotor_diameter")
    if hub not in (None, "") and diameter not in (None, ""):
        from backveer.profiles.rotor import Turbine, rotor

        try:
            turbine = Turbine("rotor", _number(hub, "hub height"), _number(diameter, "diameter"))
        except ValueError as error:
            raise BadCall(str(error)) from None
        met = rotor(one.stack, (turbine,), error=one.wind_error)
        found["rotor"] = {
            name: plain(getattr(met, name))[0][0]
            for name in (
                "hub_speed",
                "hub_direction",
                "veer",
                "veer_error",
                "veer_rate",
                "shear_exponent",
                "equivalent_speed",
                "equivalent_speed_with_veer",
                "air_density",
                "coverage",
                "why",
            )
        }
    if said.get("runway") not in (None, ""):
        from backveer.profiles.flight_path import flight_path
        from backveer.profiles.low_level_shear import low_level_shear

        heading = _number(said["runway"], "runway heading")
        if not 0 < heading <= 360:
            raise BadCall(f"a runway heading of {heading:g} degrees cannot be meant")
        shear = low_level_shear(one.stack, one.wind_error)
        path = flight_path(one.stack, np.array([heading]))
        found["runway"] = {
            "heading": heading,
            "largest_loss": plain(path.largest_loss)[0][0],
            "largest_gain": plain(path.largest_gain)[0][0],
            "shear": plain(shear.maximum_shear)[0],
            "base": plain(shear.maximum_base)[0],
            "top": plain(shear.maximum_top)[0],
            "intensity": shear.maximum_intensity[0] or None,
            "why": shear.why[0] or path.why[0] or None,
        }
    return found


def mapping_toml(said: dict[str, Any]) -> str:
    """Write what was said as the TOML that ``--columns`` takes."""
    hints = hints_of(said)
    lines = [
        f"{name} = {getattr(hints, name):.10g}"
        for name in PLACE
        if getattr(hints, name) is not None
    ]
    lines += [f"{name} = {_quoted(getattr(hints, name))}" for name in TEXTS if getattr(hints, name)]
    for name in ("columns", "units"):
        table = getattr(hints, name)
        if table:
            lines += ["", f"[{name}]"]
            lines += [f"{_quoted(key)} = {_quoted(value)}" for key, value in table.items()]
    return "\n".join(lines) + "\n"


def _quoted(text: str) -> str:
    """Quote a text as a basic TOML string, which escapes as JSON does."""
    import json

    return json.dumps(text)


def command_line(upload: Upload) -> str:
    """Write the command that gives the same statement."""
    import shlex

    said = upload.said
    hints = hints_of(said)
    words = ["backveer", "turn", upload.name]
    for name in (*PLACE, *TEXTS):
        value = getattr(hints, name)
        if value is not None:
            words += [f"--{name}", f"{value:.10g}" if isinstance(value, float) else str(value)]
    for option, table in (("--column", hints.columns), ("--unit", hints.units)):
        for key, value in table.items():
            words += [option, f"{key}={value}"]
    if settings_of(said).geostrophic_wind is not None:
        direction = _number(said["geostrophic_direction"], "direction")
        words += ["--geostrophic", f"{direction:g}/{_number(said['geostrophic_speed'], 'speed'):g}"]
    if settings_of(said).wind_error is not None:
        words += ["--wind-error", f"{settings_of(said).wind_error:g}"]
    if isinstance(said.get("profile"), int) and said["profile"] > 0:
        words += ["--profile", str(said["profile"] + 1)]
    if said.get("shown") in NAMED and said["shown"] != "si":
        words += ["--units", said["shown"]]
    return shlex.join(words)


__all__ = ["BadCall", "Cancelled", "ReadError", "Work", "answer", "command_line", "mapping_toml"]
