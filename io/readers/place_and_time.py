"""Where and when: from metadata lines, columns and what the user says."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np

from backveer.io.readers.errors import Contradiction, MissingColumn
from backveer.io.readers.moments import DAY, Moments, offset_of, read_moments
from backveer.io.readers.reading import Hints
from backveer.io.readers.spellings import languages, metadata_key, words_of
from backveer.io.readers.units import Unit, kinds_of, parse, reference_of

NAN = float("nan")
ASSUMED_UTC = "the times name no zone and were taken as UTC"


@dataclass(frozen=True)
class Site:
    """
    What is said of place and time outside the columns; NaN, NaT and "" where nothing is.

    Attributes
    ----------
    latitude, longitude, elevation
        [degree], [degree], [m].
    station
        Name.
    day, second
        Days since 1970 and seconds of the day of the profile.
    offset
        Minutes east of UTC that a line on the time zone says, None where there is none.
    zone
        Whether the time says its zone.
    heights
        Unit of the heights in the names of columns, where a line says so.
    heights_above
        ``height`` or ``altitude``: what those are counted from.
    remarks
        What was assumed or not understood.
    said
        Which of these the user gave.
    """

    latitude: float = NAN
    longitude: float = NAN
    elevation: float = NAN
    station: str = ""
    day: float = NAN
    second: float = NAN
    offset: int | None = None
    zone: bool = False
    heights: Unit | None = None
    heights_above: str = "height"
    remarks: tuple[str, ...] = ()
    said: frozenset[str] = frozenset()

    @property
    def time(self) -> np.datetime64:
        """Time in UTC, NaT where it is not known."""
        return moment(self.day, self.second)


def moment(day: float, second: float) -> np.datetime64:
    """Return days and seconds as a time; midnight where only the day is known."""
    if math.isnan(day):
        return np.datetime64("NaT", "ns")
    seconds = day * DAY + (0.0 if math.isnan(second) else second)
    return np.datetime64(round(seconds * 1000) * 1_000_000, "ns")


def site(metadata: tuple[tuple[str, str], ...], header: tuple[str, ...], hints: Hints) -> Site:
    """
    Return what metadata lines and the user say of place and time; the user's word holds.

    Raises
    ------
    Contradiction
        A latitude of 95, an east that may be a west, a date that may be read in two ways.
    """
    said = (hints.latitude, hints.longitude, hints.elevation, hints.station, hints.time)
    return _site(metadata, header, said)


@lru_cache(maxsize=4096)
def _site(
    metadata: tuple[tuple[str, str], ...],
    header: tuple[str, ...],
    said: tuple[float | None, float | None, float | None, str | None, str | None],
) -> Site:
    found: dict[str, tuple[str, str]] = {}
    for key, value in metadata:
        quantity = metadata_key(key) if key else None
        if quantity is None and _about_heights(f"{key} {value}"):
            quantity, value = "heights", f"{key} {value}"
        elif quantity == "heights":
            value = f"{key} {value}"
        if quantity is not None and value.strip() and quantity not in found:
            found[quantity] = (key, value)
    spoken = languages((*(key for key, _ in metadata if key), *header))
    latitude, longitude, elevation, named, time = said
    remarks: list[str] = []
    place: dict[str, Any] = {}
    if "position" in found:
        _position(found["position"], spoken, found, place)
    for name, degrees in (("latitude", latitude), ("longitude", longitude)):
        if degrees is not None:
            place[name] = _within(name, degrees, f"--{name}")
        elif name in found:
            place[name] = coordinate(*found[name], name, spoken)
            if math.isnan(place[name]):
                remarks.append(f'"{found[name][0]}: {found[name][1]}" was not understood')
    if elevation is not None:
        place["elevation"] = float(elevation)
    elif "elevation" in found:
        place["elevation"], remark = _elevation(*found["elevation"])
        remarks += [remark] if remark else []
    place["station"] = named or (found["station"][1] if "station" in found else "")
    if "heights" in found:
        text = found["heights"][1]
        unit = re.search(r"\b(?:in|en)\s+([^\W\d_]+)|[\[(]([^\])]+)[\])]", text)
        place["heights"] = parse(unit[1] or unit[2], "length") if unit else None
        if reference_of(text.split(" in ")[0]) == "sea" or "sea level" in text.casefold():
            place["heights_above"] = "altitude"
    if "zone" in found:
        place["offset"] = offset_of(found["zone"][1])
        if place["offset"] is None:
            remarks.append(f'time zone "{found["zone"][1]}" was not understood')
    if time is not None:
        place.update(_when("--time", time, "Write it as 2031-05-14T23:15Z"))
        if math.isnan(place["day"]):
            raise Contradiction(f"--time {time} is no date", "Write it as 2031-05-14T23:15Z")
        place["zone"] = True
    else:
        place.update(_time_of(found, remarks, place.get("offset")))
    given = frozenset(_HINTED[i] for i, value in enumerate(said) if value is not None)
    return Site(**place, remarks=tuple(remarks), said=given)


_HINTED = ("latitude", "longitude", "elevation", "station", "time")


def _about_heights(text: str) -> bool:
    words = words_of(text)
    return bool(words) and words[0] in ("heights", "hohen", "hauteurs", "alturas")


def _when(key: str, text: str, remedy: str) -> dict[str, Any]:
    moments = read_moments([text], "", f'"{key}: {text}"', remedy)
    return {
        "day": NAN if moments.day is None else float(moments.day[0]),
        "second": NAN if moments.second is None else float(moments.second[0]),
        "zone": moments.zone,
    }


def _time_of(
    found: dict[str, tuple[str, str]], remarks: list[str], offset: int | None
) -> dict[str, Any]:
    """Put together what lines on time, date and clock time say."""
    when: dict[str, Any] = {"day": NAN, "second": NAN, "zone": False}
    for name in ("time", "date", "clock"):
        if name not in found:
            continue
        key, text = found[name]
        if name == "clock" and re.fullmatch(r"\s*\d{1,4}\s*", text):
            text = text.strip().zfill(4) if len(text.strip()) > 2 else f"{text.strip()}:00"
        got = _when(key, text, "Say it with --time 2031-05-14T23:15Z")
        if math.isnan(got["day"]) and math.isnan(got["second"]):
            if any(character.isdecimal() for character in text):
                remarks.append(f'"{key}: {text}" was not understood as a time')
            continue
        for part in ("day", "second"):
            if math.isnan(when[part]):
                when[part] = got[part]
        when["zone"] = when["zone"] or got["zone"] or "utc" in words_of(key)
        if "local" in words_of(f"{key} {text}") and offset is None:
            remarks.append(
                f'"{key}: {text}" is local time, its offset to UTC is not known: left out'
            )
            return {"day": NAN, "second": NAN, "zone": True}
    if not math.isnan(when["day"]) and not when["zone"]:
        if offset is None:
            if not math.isnan(when["second"]):
                remarks.append(ASSUMED_UTC)
        else:
            total = when["day"] * DAY + when["second"] - 60.0 * offset
            when["day"], when["second"] = divmod(total, DAY)
            when["zone"] = True
    return when


def _position(
    line: tuple[str, str],
    spoken: frozenset[str],
    found: dict[str, tuple[str, str]],
    place: dict[str, Any],
) -> None:
    """Read "58.41 N 3.05 W"; otherwise it is the name of a place."""
    key, text = line
    parts = re.findall(r"[-+]?\d[^NSEWO;|]*?\s*[NSEWO]\b|[NSEWO]\s*\d[^NSEWO;|]*", text)
    if len(parts) != 2:
        parts = re.findall(r"[-+]?\d+(?:\.\d+)?", text)
        if len(parts) != 2 or re.search(r"[^\W\d_]{2,}", text):
            found.setdefault("station", line)
            return
    for name, part in zip(("latitude", "longitude"), parts, strict=True):
        place[name] = coordinate(key, part, name, spoken)


_SIDES = {
    "n": 1, "nord": 1, "north": 1, "norte": 1, "s": -1, "sud": -1, "sur": -1, "south": -1,
    "e": 1, "est": 1, "este": 1, "east": 1, "ost": 1,
    "w": -1, "west": -1, "ouest": -1, "oeste": -1,
}  # fmt: skip
_OF_LATITUDE = {"n", "nord", "north", "norte", "s", "sud", "sur", "south"}


def coordinate(key: str, text: str, name: str, spoken: frozenset[str]) -> float:
    """
    Read a latitude or longitude.

    Parameters
    ----------
    key
        Where it stands, for the message.
    text
        As written: ``58.41 N``, ``3°03'W``, ``58-24-30N``, ``61,20 O``, ``-3.05``.
    name
        ``latitude`` or ``longitude``.
    spoken
        Languages of the file: an O is Ost (east) in German, Ouest or Oeste (west) in the others.

    Returns
    -------
    degrees : float
        North or east positive; NaN where it is not understood.

    Raises
    ------
    Contradiction
        Out of range, of the other kind, or an O in an unknown language.

    Examples
    --------
    >>> round(coordinate("Longitude", "3°03'W", "longitude", frozenset()), 4)
    -3.05
    >>> coordinate("Longitud", "61,20 O", "longitude", frozenset({"es"}))
    -61.2
    >>> round(coordinate("lat", "58-24-30N", "latitude", frozenset()), 4)
    58.4083
    """
    words = [word for word in words_of(text) if not word[0].isdecimal()]
    sides = [word for word in words if word in _SIDES or word == "o"]
    numbers = [float(n.replace(",", ".")) for n in re.findall(r"\d+(?:[.,]\d+)?", text)]
    if not 1 <= len(numbers) <= 3 or len(sides) > 1:
        return NAN
    if any(part >= 60 for part in numbers[1:]) or any(n % 1 for n in numbers[:-1]):
        return NAN
    value = sum(part / 60.0**power for power, part in enumerate(numbers))
    negative = text.strip().startswith(("-", "\N{MINUS SIGN}"))
    remedy = f"Say it with --{name}"
    if sides:
        side = sides[0]
        sign = _SIDES.get(side, 0)
        if side == "o":
            german, romance = "de" in spoken, bool(spoken & {"fr", "es"})
            if german == romance:
                raise Contradiction(
                    f'"{key}: {text}": O may be Ost (east), Ouest or Oeste (west)', remedy
                )
            sign = 1 if german else -1
        if (side in _OF_LATITUDE) != (name == "latitude") or (negative and sign < 0):
            raise Contradiction(f'"{key}: {text}" is no {name}', remedy)
        value *= sign
    return _within(name, -value if negative else value, f'"{key}: {text}"')


def _within(name: str, value: float, said: str) -> float:
    limit = 90.0 if name == "latitude" else 360.0
    if not -limit <= value <= limit or (name == "longitude" and value < -180.0):
        low = "-90 to 90" if name == "latitude" else "-180 to 360"
        raise Contradiction(
            f"{name} {value:g} ({said}) is outside {low} degrees", f"Say it with --{name}"
        )
    return value - 360.0 if name == "longitude" and value > 180.0 else value


def _elevation(key: str, text: str) -> tuple[float, str]:
    """Read an elevation; its unit stands beside it or in the key."""
    match = re.match(r"\s*([-+]?\d+(?:[.,]\d+)?)\s*(.*)", text)
    if match is None:
        return NAN, f'"{key}: {text}" was not understood'
    value = float(match[1].replace(",", "."))
    unit_text = match[2].strip(" .;,")
    if not unit_text:
        inside = re.findall(r"[\[(]([^\])]*)[\])]", key) or [key.replace("_", " ").split()[-1]]
        unit_text = next((part for part in inside if kinds_of(part)), "")
    unit = parse(unit_text, "length") or parse(re.split(r"[\s(]", unit_text)[0], "length")
    if unit is None and unit_text:
        return NAN, f'"{key}: {text}" was not understood'
    remark = "" if unit else f'"{key}: {text}" names no unit, it was taken as m'
    return value * (unit.factor if unit else 1.0), remark


def cannot_place(option: str, what: str) -> MissingColumn:
    """Return the error for a place that is needed and not known."""
    return MissingColumn(what, f"Say it with --{option}")


def times_said(unit: Unit | None) -> tuple[str, int | None]:
    """
    Return the order of day and month and the offset that ``--unit TIME=...`` says.

    Examples
    --------
    >>> times_said(Unit("DD/MM/YYYY", "time", 1.0)), times_said(Unit("UTC+2", "time", 1.0))
    (('dmy', None), ('', 120))
    """
    if unit is None or unit.kind != "time":
        return "", None
    text = unit.sign.casefold()
    letters = [letter for letter in re.sub(r"[^dmy]", "", text)]
    order = "".join(dict.fromkeys(letters))
    if order in ("dmy", "mdy", "ymd"):
        return ("" if order == "ymd" else order), None
    offset = offset_of(text)
    if offset is None:
        raise Contradiction(
            f'--unit TIME="{unit.sign}" is neither an order of the date nor an offset to UTC',
            "Say for example DD/MM/YYYY or UTC+2",
        )
    return "", offset


def as_times(moments: Moments) -> Any:
    """Return moments with a date as datetime64[ns], NaT where missing."""
    assert moments.day is not None
    second = 0.0 if moments.second is None else moments.second
    total = moments.day * float(DAY) + second
    good = np.isfinite(total)
    result = np.full(total.shape, np.datetime64("NaT", "ns"))
    milliseconds = np.round(np.where(good, total, 0.0) * 1000.0).astype(np.int64)
    result[good] = milliseconds.astype("datetime64[ms]")[good].astype("datetime64[ns]")
    return result
