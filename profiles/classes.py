"""
The class that each profile falls into: hour, month, season, sector, speed bin, range, stability.

Classes by the clock know how many profiles a complete record would have, so that data recovery can
stand beside every figure; the others count the profiles that have a class.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.grid import at_height
from backveer.profiles.labels import Floats, Times
from backveer.profiles.stack import Stack

_SPARSEST = 100
SEASONS = ("DJF", "MAM", "JJA", "SON")  # by months, so that they mean the same on both hemispheres
COMPASS = (
    "N", "NNE", "NE", "ENE", "E", "ESE", "SE", "SSE",
    "S", "SSW", "SW", "WSW", "W", "WNW", "NW", "NNW",
)  # fmt: skip
MONTHS = tuple("Jan Feb Mar Apr May Jun Jul Aug Sep Oct Nov Dec".split())  # noqa: SIM905
SECTORS = (12, 16, 36)
SPEED_BIN = 0.5  # m s-1, centred on its multiples: IEC 61400-12-1
LARGEST_SPEED = 75.0  # m s-1; no ten-minute mean near the ground was ever as high; ours

GRAVITY = 9.80665  # m s-2, ISO 2533:1975
DRY_LAPSE_RATE = 0.0098  # K m-1, Stull, 1988: g/cp
#: Bounds of the Obukhov length and names after Gryning, S.-E., et al., 2007: Boundary-Layer
#: Meteorol., 124, 251-268 (from memory); the outer classes are drawn to zero here.
STABILITY = (
    "very unstable", "unstable", "near unstable", "neutral", "near stable", "stable", "very stable",
)  # fmt: skip
_STABILITY_EDGES = (-1.0 / 100.0, -1.0 / 200.0, -1.0 / 500.0, 1.0 / 500.0, 1.0 / 200.0, 1.0 / 50.0)


@dataclass(frozen=True, eq=False)
class Classes:
    """
    One way to sort profiles.

    Attributes
    ----------
    kind
        By what: ``"hour"``, ``"month"``, ``"sector"`` ...
    names
        One for each class, in order.
    index : array of int, shape (profile,)
        The class of each profile, -1 for none.
    expected : array of int, shape (class,), or None
        Profiles that a complete record of one station would have in each class, where the clock
        tells.
    """

    kind: str
    names: tuple[str, ...]
    index: Any
    expected: Any = None

    def __len__(self) -> int:
        """Return the number of classes."""
        return len(self.names)


def everything(time: Times, interval: Any = None) -> Classes:
    """
    Return a single class, ``"all"``, with every profile that has a time.

    Parameters
    ----------
    time, interval
        As in :func:`by_hour`.
    """
    return _by_clock("all", ("all",), time, 0.0, interval, lambda t: np.zeros(t.shape, dtype=int))


def by_hour(time: Times, utc_offset: float = 0.0, interval: Any = None) -> Classes:
    """
    Sort by hour of the day.

    Parameters
    ----------
    time : array of datetime64, shape (profile,)
        UTC; not-a-time has no class.
    utc_offset
        Hours to add for the clock of the place, fixed all year. [h]
    interval : timedelta64, optional
        Time from one profile to the next in a complete record; by default the median of the record.

    Examples
    --------
    >>> times = np.array(["2031-05-14T23:50", "2031-05-15T00:00", "NaT"], dtype="datetime64[ns]")
    >>> by_hour(times).index.tolist(), by_hour(times, utc_offset=2.0).index.tolist()
    ([23, 0, -1], [1, 2, -1])
    """
    names = tuple(f"{hour:02d}" for hour in range(24))
    return _by_clock(
        "hour",
        names,
        time,
        utc_offset,
        interval,
        lambda t: t.astype("datetime64[h]").astype(int) % 24,
    )


def by_month(time: Times, utc_offset: float = 0.0, interval: Any = None) -> Classes:
    """Sort by month of the year; parameters as in :func:`by_hour`."""
    return _by_clock("month", MONTHS, time, utc_offset, interval, _month)


def by_season(time: Times, utc_offset: float = 0.0, interval: Any = None) -> Classes:
    """Sort by season, DJF to SON; parameters as in :func:`by_hour`."""
    return _by_clock(
        "season", SEASONS, time, utc_offset, interval, lambda t: (_month(t) + 1) % 12 // 3
    )


def by_sector(direction: Floats, sectors: int = 12) -> Classes:
    """
    Sort by the sector that the wind blows from; the first is centred on north.

    Parameters
    ----------
    direction : array, shape (profile,)
        NaN has no class. [degree]
    sectors
        12, 16 or 36.

    Raises
    ------
    ValueError
        For another number of sectors.

    Examples
    --------
    >>> by_sector(np.array([350.0, 14.9, 15.0, np.nan])).index.tolist()
    [0, 0, 1, -1]
    """
    if sectors not in SECTORS:
        raise ValueError(f"{sectors} direction sectors are not offered. Choose 12, 16 or 36.")
    width = 360.0 / sectors
    names = COMPASS if sectors == 16 else tuple(f"{round(i * width):03d}" for i in range(sectors))
    with np.errstate(invalid="ignore"):
        place = np.floor((np.asarray(direction, dtype=float) % 360.0 + 0.5 * width) / width)
    return Classes("sector", names, _index(place % sectors, sectors))


def by_speed(speed: Floats, width: float = SPEED_BIN) -> Classes:
    """
    Sort by wind speed, in bins centred on the multiples of their width.

    Parameters
    ----------
    speed : array, shape (profile,)
        NaN, and anything above 75 m/s, has no class. [m s-1]
    width
        The width of IEC 61400-12-1 by default. [m s-1]

    Examples
    --------
    >>> bins = by_speed(np.array([0.1, 7.25, 7.74]))
    >>> [bins.names[i] for i in bins.index]
    ['0.0', '7.5', '7.5']
    """
    if not 0.01 <= width <= LARGEST_SPEED:
        raise ValueError(f"a speed bin of {width} m/s cannot be used. {SPEED_BIN} is usual.")
    speed = np.asarray(speed, dtype=float)
    with np.errstate(invalid="ignore"):
        place = np.where((speed >= 0) & (speed <= LARGEST_SPEED), speed, np.nan)
        place = np.floor(place / width + 0.5)
    count = int(np.fmax.reduce(place, initial=0.0)) + 1
    names = tuple(f"{i * width:.{1 if width * 10 % 1 == 0 else 2}f}" for i in range(count))
    return Classes("speed", names, _index(place, count))


def by_range(values: Floats, edges: Sequence[float], kind: str = "value") -> Classes:
    """
    Sort by a quantity between given edges; a value on an edge belongs to the range above it.

    Parameters
    ----------
    values : array, shape (profile,)
        NaN has no class.
    edges
        Increasing. The classes below the first and from the last on are open.
    kind
        What the quantity is.

    Raises
    ------
    ValueError
        For edges that do not increase.

    Examples
    --------
    >>> ranges = by_range(np.array([-3.0, 5.0, 40.0]), [0.0, 10.0], "veer")
    >>> [ranges.names[i] for i in ranges.index]
    ['< 0', '0 to 10', '>= 10']
    """
    bounds = np.asarray(edges, dtype=float)
    if bounds.ndim != 1 or not bounds.size or not (np.diff(bounds) > 0).all():
        raise ValueError(f"edges of {kind} must increase, not {list(edges)}. Sort them.")
    told = [f"{edge:g}" for edge in bounds]
    between = [f"{low} to {high}" for low, high in itertools.pairwise(told)]
    names = (f"< {told[0]}", *between, f">= {told[-1]}")
    values = np.asarray(values, dtype=float)
    place = np.where(np.isnan(values), np.nan, np.searchsorted(bounds, values, side="right"))
    return Classes(kind, names, _index(place, len(names)))


def by_stability(stack: Stack, base: float, top: float) -> Classes:
    r"""
    Sort by stability, from the bulk Richardson number between two heights.

    Parameters
    ----------
    stack
        Quality-checked profiles; one without temperature and wind at both heights has no class.
    base, top
        Heights above ground, 0 < base < top. [m]

    Notes
    -----
    The bulk Richardson number stands for that of the gradients at the logarithmic mean height
    z = (top - base) / ln(top/base), and gives the Obukhov length by

    .. math:: z/L = Ri \ (Ri < 0), \qquad z/L = Ri / (1 - 5 Ri) \ (0 \le Ri < 0.2)

    (Dyer, A. J., 1974: Boundary-Layer Meteorol., 7, 363-372; from memory); from 0.2 on the air is
    very stable. The classes are those of L of Gryning et al. (2007).
    """
    if not 0 < base < top:
        raise ValueError(f"stability needs 0 < base < top, not {base} and {top} m. Correct them.")
    ri = bulk_richardson_between(stack, base, top)
    z = (top - base) / np.log(top / base)
    with np.errstate(all="ignore"):
        inverse = np.where(ri < 0, ri, np.where(ri < 0.2, ri / (1.0 - 5.0 * ri), np.inf)) / z
    place = np.where(np.isnan(ri), np.nan, np.searchsorted(_STABILITY_EDGES, inverse, side="right"))
    return Classes("stability", STABILITY, _index(place, len(STABILITY)))


def bulk_richardson_between(stack: Stack, base: float, top: float) -> Floats:
    r"""
    Bulk Richardson number between two heights.

    .. math:: Ri = \frac{g}{\overline T} \frac{(\Delta T + \Gamma \Delta z)\, \Delta z}
              {(\Delta u)^2 + (\Delta v)^2}

    Stull, R. B., 1988: An Introduction to Boundary Layer Meteorology. Kluwer, ch. 5; dry air, with
    T + 0.0098 z for the potential temperature of the shallow layer.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    base, top
        Heights above ground. [m]

    Returns
    -------
    number : array, shape (profile,)
        Infinite, with the sign of the stability, where there is no shear; NaN where a height is
        outside the levels or neither is there. [1]
    """
    targets = np.array([base, top])
    warm, windy = stack.usable("temperature"), stack.usable("wind")
    if not stack.level_count:
        return np.full(stack.profile_count, np.nan)
    t = at_height(np.where(warm, stack.height, np.nan), stack.air_temperature, targets)
    wind = stack.eastward_wind + 1j * stack.northward_wind
    w = at_height(np.where(windy, stack.height, np.nan), np.where(windy, wind, np.nan), targets)
    depth = top - base
    with np.errstate(all="ignore"):
        shear = np.abs(w[:, 1] - w[:, 0])
        stratified = t[:, 1] - t[:, 0] + DRY_LAPSE_RATE * depth
        number = GRAVITY / (0.5 * (t[:, 1] + t[:, 0])) * stratified * depth / shear**2
    return np.asarray(number)


def usual_interval(time: Times) -> Any:
    """
    Return the median time from one profile to the next, as timedelta64[ns].

    Examples
    --------
    >>> times = np.array(["2031-05-14T00:00", "2031-05-14T00:10", "2031-05-14T00:20"])
    >>> usual_interval(times.astype("datetime64[ns]")) == np.timedelta64(10, "m")
    np.True_
    """
    steps = np.diff(np.sort(time[~np.isnat(time)].astype("datetime64[ns]")))
    steps = steps[steps > np.timedelta64(0, "ns")]
    if not steps.size:
        return np.timedelta64("NaT", "ns")
    middle = (steps.size - 1) // 2
    return np.partition(steps, middle)[middle]


def complete_record(time: Times, interval: Any = None) -> Times:
    """
    Return the times that a record without gaps would have, from the first to the last.

    Parameters
    ----------
    time : array of datetime64, shape (profile,)
        Not-a-time is passed over.
    interval : timedelta64, optional
        By default the median of the record; a record so irregular that fewer than one in a hundred
        of its times would be there counts as complete.

    Raises
    ------
    ValueError
        For an interval that is not positive.

    Examples
    --------
    >>> times = np.array(["2031-05-14T00:00", "2031-05-14T00:10", "2031-05-14T00:40"])
    >>> complete_record(times.astype("datetime64[ns]"), np.timedelta64(10, "m")).size
    5
    """
    there = time[~np.isnat(time)].astype("datetime64[ns]")
    step = usual_interval(time) if interval is None else np.timedelta64(interval, "ns")
    if there.size < 2 or np.isnat(step):
        return there
    if step <= np.timedelta64(0, "ns"):
        raise ValueError(f"the interval between profiles must be positive, not {interval}.")
    first, last = there.min(), there.max()
    count = int((last - first) / step + 0.5) + 1
    if interval is None and count > _SPARSEST * there.size:
        return there
    return np.asarray(first + np.arange(count) * step)


def _month(time: Any) -> Any:
    return time.astype("datetime64[M]").astype(int) % 12


def _by_clock(
    kind: str, names: tuple[str, ...], time: Times, utc_offset: float, interval: Any, place: Any
) -> Classes:
    time = np.asarray(time, dtype="datetime64[ns]")
    shift = np.timedelta64(round(utc_offset * 3600), "s")
    there = ~np.isnat(time)
    index = np.full(time.shape, -1)
    index[there] = place(time[there] + shift)
    whole = place(complete_record(time, interval) + shift)
    return Classes(kind, names, index, np.bincount(whole, minlength=len(names)))


def _index(place: Floats, count: int) -> Any:
    """Whole numbers from 0 to ``count`` - 1, and -1 where there is no class."""
    good = (place >= 0) & (place < count)
    return np.where(good, np.where(good, place, 0), -1).astype(np.intp)
