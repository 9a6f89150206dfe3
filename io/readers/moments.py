"""
Dates and times as people write them, to UTC.

A column is read at once where all its cells have one layout; otherwise each different cell once.
The order of day and month is settled over the whole column, or refused.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.errors import Contradiction

_MONTHS = {
    word: number
    for number, words in enumerate(
        (
            "jan january januar janvier janv enero ene",
            "feb february februar fevrier fevr febrero",
            "mar march marz mrz mars marzo", "apr april avril avr abril abr", "may mai mayo",
            "jun june juni juin junio", "jul july juli juillet juil julio",
            "aug august aout agosto ago", "sep sept september septembre septiembre",
            "oct okt october oktober octobre octubre", "nov november novembre noviembre",
            "dec dez december dezember decembre diciembre dic",
        ),
        start=1,
    )
    for word in words.split()
}  # fmt: skip

_MOMENT = re.compile(
    r"""\s*(?:\w{2,10},?\s+(?=\d{1,2}\W))?
    (?:
      (?P<y>\d{4})[-/.](?P<m>\d{1,2})[-/.](?P<d>\d{1,2})
     |(?P<a>\d{1,2})(?P<sep>[-/.])(?P<b>\d{1,2})(?P=sep)(?P<yy>\d{4}|\d{2})(?!\d)
     |(?P<dw>\d{1,2})\.?[-\s]*(?:de\s+)?(?P<word>[^\W\d_]{3,10})\.?[-,\s]*(?:de\s+)?(?P<yw>\d{4})
     |(?P<word2>[^\W\d_]{3,10})\.?\s+(?P<dw2>\d{1,2}),?\s+(?P<yw2>\d{4})
     |(?P<yc>\d{4})(?P<mc>\d{2})(?P<dc>\d{2})(?=\D|$|\d{4}(?:\d\d)?(?:\D|$))
    )?
    (?:(?:\s*(?:T|_|,|;|/|\bat\b|\bum\b)\s*|\s+|(?<=\d{8})|^\s*)
      (?:
        (?P<H>\d{1,2})[:h](?P<M>\d{2})(?::(?P<S>\d{2}(?:[.,]\d+)?))?
       |(?P<Hc>\d{2})(?P<Mc>\d{2})(?P<Sc>\d{2})?
       |(?P<Hz>\d{1,2})(?=\s*(?:Z|UTC|GMT|h|Uhr|$))
      )
      \s*(?:h\b|Uhr\b)?\s*(?P<ap>[AaPp]\.?[Mm]\.?)?
    )?
    \s*[\[(]?(?P<zone>Z|(?:UTC|GMT|UT|TU)?\s*(?:[+-]\d{1,2}(?::?\d{2})?)?)[\])]?
    (?P<rest>\s*[^\W\d_]*)\s*""",
    re.VERBOSE | re.IGNORECASE,
)
# Local times whose offset does not hang on the season (common practice, no source).
_ZONES = {"cet": 60, "mez": 60, "cest": 120, "mesz": 120, "eet": 120, "wet": 0}
DAY = 86400


@dataclass(frozen=True, eq=False)
class Moments:
    """
    Cells as dates and times.

    Attributes
    ----------
    day, second
        Days since 1970 and seconds of the day (in UTC where a zone is given), float, NaN where
        missing; None where no cell has a date, or a clock time.
    zone
        Whether the cells say their zone.
    unknown
        The first cell that was not understood, None if all were.
    """

    day: NDArray[np.float64] | None
    second: NDArray[np.float64] | None
    zone: bool
    unknown: str | None


def read_moments(cells: Iterable[Any], order: str, name: str, remedy: str) -> Moments:
    """
    Read cells as dates, clock times or both.

    Parameters
    ----------
    cells
        Text, empty where missing.
    order
        ``"dmy"`` or ``"mdy"`` where the user says so, else ``""``.
    name
        The column or key, for the message.
    remedy
        What to do where day and month cannot be told apart.

    Raises
    ------
    Contradiction
        Day and month cannot be told apart.

    Examples
    --------
    >>> moments = read_moments(["14.05.2031 23:15 UTC"], "", "Start", "")
    >>> (moments.day * DAY + moments.second).astype("datetime64[s]").tolist()
    [datetime.datetime(2031, 5, 14, 23, 15)]
    """
    cells = [cell if isinstance(cell, str) else "" for cell in cells]
    quick = _same_layout(cells, order, name, remedy)
    if quick is not None:
        return quick
    different = list(dict.fromkeys(cells))
    parsed = {cell: _MOMENT.fullmatch(cell) for cell in different if cell.strip()}
    unknown = next((cell for cell, match in parsed.items() if not _sensible(match)), None)
    matches = {cell: match for cell, match in parsed.items() if match and _sensible(match)}
    pairs = [(int(m["a"]), int(m["b"]), m["sep"]) for m in matches.values() if m["a"]]
    first = "dmy"
    if pairs:
        a, b = np.array([p[0] for p in pairs]), np.array([p[1] for p in pairs])
        first = order or _order(a, b, pairs[0][2], name, remedy)
    day = {cell: _day(match, first) for cell, match in matches.items()}
    second = {cell: _second(match) for cell, match in matches.items()}
    zones = {cell: _zone(match) for cell, match in matches.items()}
    nan = float("nan")
    days = np.array([day.get(cell, nan) for cell in cells], dtype=float)
    seconds = np.array([second.get(cell, nan) for cell in cells], dtype=float)
    given = [minutes for minutes in zones.values() if minutes is not None]
    if any(given):
        offset = np.array([60.0 * (zones.get(cell) or 0) for cell in cells])
        total = seconds - offset
        # A clock time without a date keeps what belongs to the day before or after.
        dated = np.isfinite(days)
        days = days + np.floor(total / DAY)
        seconds = np.where(dated, total % DAY, total)
    return Moments(
        days if np.isfinite(days).any() else None,
        seconds if np.isfinite(seconds).any() else None,
        bool(given) and len(given) == len(zones),
        unknown,
    )


def _sensible(match: re.Match[str] | None) -> bool:
    """Say whether a match holds a date or a time, and nothing odd after it."""
    if match is None:
        return False
    rest = match["rest"].strip().casefold()
    if rest and rest not in _ZONES and rest not in ("local", "lt", "ortszeit", "utc", "gmt"):
        return False
    dated = any(match[key] for key in ("y", "a", "yw", "yw2", "yc"))
    timed = any(match[key] for key in ("H", "Hc", "Hz"))
    return dated or timed


def _order(a: Any, b: Any, separator: str, name: str, remedy: str) -> str:
    """Tell the order of day and month from the numbers; points are day first."""
    if (a > 12).any():
        return "dmy"
    if (b > 12).any():
        return "mdy"
    if separator == "." or (a == b).all():
        return "dmy"
    raise Contradiction(f"day and month of {name} cannot be told apart", remedy)


def _day(match: re.Match[str], order: str) -> float:
    if match["y"]:
        y, m, d = int(match["y"]), int(match["m"]), int(match["d"])
    elif match["yc"]:
        y, m, d = int(match["yc"]), int(match["mc"]), int(match["dc"])
    elif match["a"]:
        d, m = int(match["a"]), int(match["b"])
        if order == "mdy":
            d, m = m, d
        y = _century(int(match["yy"]), len(match["yy"]))
    elif match["word"] or match["word2"]:
        word = _plain(match["word"] or match["word2"])
        m = _MONTHS.get(word, _MONTHS.get(word[:3], 0))
        y, d = int(match["yw"] or match["yw2"]), int(match["dw"] or match["dw2"])
    else:
        return float("nan")
    return float(_days(np.array([y]), np.array([m]), np.array([d]))[0])


def _plain(word: str) -> str:
    import unicodedata

    text = unicodedata.normalize("NFKD", word.casefold())
    return "".join(c for c in text if not unicodedata.combining(c))


def _century(year: int, digits: int) -> int:
    """Two digits: 1970 to 2069, as POSIX has it (69 to 99 are the last century there)."""
    return year if digits == 4 else year + (2000 if year < 70 else 1900)


def _second(match: re.Match[str]) -> float:
    hour, minute, second = (
        match["H"] or match["Hc"] or match["Hz"],
        match["M"] or match["Mc"] or 0,
        match["S"] or match["Sc"] or "0",
    )
    if hour is None:
        return float("nan")
    h, m, s = int(hour), int(minute), float(str(second).replace(",", "."))
    if match["ap"]:
        if not 1 <= h <= 12:
            return float("nan")
        h = h % 12 + (12 if match["ap"][0] in "pP" else 0)
    if h > 24 or m > 59 or s >= 61 or (h == 24 and (m or s)):
        return float("nan")
    return 3600.0 * h + 60.0 * m + s


def _zone(match: re.Match[str]) -> int | None:
    """Return minutes east of UTC, None where no zone is given."""
    rest = match["rest"].strip().casefold()
    if rest in _ZONES:
        return _ZONES[rest]
    if rest in ("utc", "gmt"):
        return 0
    return offset_of(match["zone"])


def offset_of(text: str) -> int | None:
    """
    Return the minutes east of UTC that a zone says, None where it says none.

    Examples
    --------
    >>> offset_of("UTC+2"), offset_of("-03:30"), offset_of("Z"), offset_of("somewhere")
    (120, -210, 0, None)
    """
    text = re.sub(r"\s", "", text).casefold()
    if text in _ZONES:
        return _ZONES[text]
    match = re.fullmatch(r"(?:z|utc|gmt|ut|tu)?(?:([+-])(\d{1,2})(?::?(\d{2}))?)?", text)
    if not text or match is None:
        return None
    if match[1] is None:
        return 0
    minutes = 60 * int(match[2]) + int(match[3] or 0)
    return -minutes if match[1] == "-" else minutes


def _days(y: NDArray[Any], m: NDArray[Any], d: NDArray[Any]) -> NDArray[np.float64]:
    """Days since 1970, NaN for a date that does not exist."""
    good = (m >= 1) & (m <= 12) & (y >= 1) & (y <= 9999)
    month = (np.where(good, y, 1970) - 1970) * 12 + np.where(good, m, 1) - 1
    first = month.astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
    after = (month + 1).astype("datetime64[M]").astype("datetime64[D]").astype(np.int64)
    good &= (d >= 1) & (d <= after - first)
    days: NDArray[np.float64] = np.where(good, first + d - 1, np.nan)
    return days


def _same_layout(cells: list[str], order: str, name: str, remedy: str) -> Moments | None:
    """Read cells whose digits all stand in the same places; None where they do not."""
    if len(cells) < 32:
        return None
    match = _MOMENT.fullmatch(cells[0])
    if match is None or not _sensible(match) or match["word"] or match["word2"] or match["ap"]:
        return None
    if _zone(match):
        return None
    try:
        text = np.array(cells, dtype=np.bytes_)  # a quarter of what str takes, for millions of rows
    except UnicodeEncodeError:
        return None
    width = text.dtype.itemsize
    if width != len(cells[0]):
        return None
    points = text.view(np.uint8).reshape(len(cells), width)
    sample = (points[0] >= 48) & (points[0] <= 57)
    for place in range(width):
        column = points[:, place]
        alike = (column >= 48) & (column <= 57) if sample[place] else column == points[0, place]
        if not alike.all():
            return None

    def number(*keys: str) -> NDArray[np.int64] | None:
        for key in keys:
            if match[key]:
                whole = np.zeros(len(cells), dtype=np.int64)
                for place in range(*match.span(key)):
                    if not sample[place]:
                        break  # a decimal mark: fractions of a second are left out
                    whole = 10 * whole + points[:, place] - 48
                return whole
        return None

    day = second = None
    a, b, y = number("a"), number("b"), number("y", "yc", "yy")
    if y is not None:
        if a is not None and b is not None:
            first = order or _order(a, b, match["sep"], name, remedy)
            d, m = (a, b) if first == "dmy" else (b, a)
            if len(match["yy"]) == 2:
                y = np.where(y < 70, 2000, 1900) + y
        else:
            found_month, found_day = number("m", "mc"), number("d", "dc")
            if found_month is None or found_day is None:
                return None
            m, d = found_month, found_day
        day = _days(y, m, d)
    h = number("H", "Hc", "Hz")
    if h is not None:
        found_minute, found_second = number("M", "Mc"), number("S", "Sc")
        minute = np.zeros_like(h) if found_minute is None else found_minute
        s = np.zeros_like(h) if found_second is None else found_second
        good = (h < 24) | ((h == 24) & (minute == 0) & (s == 0))
        good &= (minute < 60) & (s < 61)
        second = np.where(good, 3600.0 * h + 60.0 * minute + s, np.nan)
    broken = np.zeros(len(cells), dtype=bool)
    for part in (day, second):
        if part is not None:
            broken |= np.isnan(part)
    unknown = cells[int(np.argmax(broken))] if broken.any() else None
    return Moments(day, second, _zone(match) is not None, unknown)


def numbers_as_moments(values: NDArray[np.float64]) -> Moments | None:
    """
    Read numbers as dates or times: epoch seconds or milliseconds, 20310514, 203105142315.

    Returns None where they are none of these (seconds since launch, clock times).

    Examples
    --------
    >>> moments = numbers_as_moments(np.array([1935875700.0]))
    >>> (moments.day * DAY + moments.second).astype("datetime64[s]").tolist()
    [datetime.datetime(2031, 5, 6, 23, 15)]
    """
    there = values[np.isfinite(values)]
    if there.size == 0 or (there < 1e7).any():
        return None
    whole = bool((there == np.floor(there)).all())
    if whole:
        for digits in (8, 10, 12, 14):
            if (there >= 10.0 ** (digits - 1)).all() and (there < 10.0**digits).all():
                clock = there % 10.0 ** (digits - 8)
                date = np.floor(there / 10.0 ** (digits - 8))
                year = np.floor(date / 1e4)
                day = _days(year.astype(int), (date // 100 % 100).astype(int),
                            (date % 100).astype(int))  # fmt: skip
                seconds = _compact_clock(clock, digits - 8)
                if np.isfinite(day + seconds).all() and (year >= 1850).all():
                    all_days = np.full(values.shape, np.nan)
                    all_seconds = all_days.copy()
                    all_days[np.isfinite(values)] = day
                    all_seconds[np.isfinite(values)] = seconds
                    return Moments(all_days, all_seconds if digits > 8 else None, False, None)
    scale = 1.0 if there.max() < 1e11 else 1e3 if there.max() < 1e14 else 1e9
    seconds = values / scale
    if not ((there / scale > 0).all() and (there / scale < 1e10).all()):
        return None
    day = np.floor(seconds / DAY)
    return Moments(day, seconds - day * DAY, True, None)


def _compact_clock(clock: NDArray[np.float64], digits: int) -> NDArray[np.float64]:
    """Seconds of the day of HH, HHMM or HHMMSS as a number."""
    padded = clock * 10.0 ** (6 - digits)
    h, m, s = padded // 10000, padded // 100 % 100, padded % 100
    good = (h < 24) & (m < 60) & (s < 61)
    return np.where(good, 3600.0 * h + 60.0 * m + s, np.nan)


def compact_clock(values: NDArray[np.float64]) -> NDArray[np.float64] | None:
    """
    Seconds of the day of numbers such as 2315 or 231500; None where they cannot be that.

    Examples
    --------
    >>> compact_clock(np.array([2315.0, 30.0]))
    array([83700.,  1800.])
    """
    values = np.where(np.isfinite(values), values, np.nan)
    there = values[np.isfinite(values)]
    if there.size == 0 or (there < 0).any() or (there != np.floor(there)).any():
        return None
    top = float(there.max())
    digits = 2 if top <= 24 else 4 if top < 2400 else 6
    seconds = _compact_clock(values, digits)
    return None if np.isnan(seconds[np.isfinite(values)]).any() else seconds
