r"""
Sunset, sunrise and the length of the night, by latitude, longitude and date.

Low-precision solar coordinates after Meeus, J., 1998: Astronomical Algorithms, 2nd ed.,
Willmann-Bell, ch. 22, 25 and 28 (from memory), good to about 0.01 degree, which is a few seconds in
the time of sunset outside the polar regions. Sunset is when the sun's centre stands 0.833 degrees
below the horizon: 34' of refraction and 16' of the sun's half width (common practice; the
refraction is that of a standard atmosphere, so that a sunset may be a minute or two off).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.labels import Bools, Floats, Times

SUNSET_ALTITUDE = -0.833  # degree, common practice
_J2000 = np.datetime64("2000-01-01T12:00:00", "ns")
_DAY = 86400.0


@dataclass(frozen=True)
class Night:
    """
    The night that follows a time, arrays over profile.

    Attributes
    ----------
    sunset, sunrise
        UTC; NaT where the sun does not set or does not rise.
    length
        From sunset to sunrise. [s]
    polar_day, polar_night
        The sun does not set, or does not rise, on that day.
    """

    sunset: Times
    sunrise: Times
    length: Floats
    polar_day: Bools
    polar_night: Bools


def declination_and_equation_of_time(time: Times) -> tuple[Floats, Floats]:
    r"""
    Declination of the sun [degree] and equation of time, apparent minus mean [minute].

    Parameters
    ----------
    time : array of datetime64
        UTC.

    Examples
    --------
    At the northern solstice the sun stands over the tropic, 23.44 degrees north (here 0.003 less).

    >>> d, _ = declination_and_equation_of_time(np.array(["2031-06-21T12:00"], "datetime64[ns]"))
    >>> d.round(2)
    array([23.43])
    """
    t = (np.asarray(time, "datetime64[ns]") - _J2000) / np.timedelta64(1, "D") / 36525.0
    mean_longitude = 280.46646 + t * (36000.76983 + 0.0003032 * t)
    anomaly = np.radians(357.52911 + t * (35999.05029 - 0.0001537 * t))
    eccentricity = 0.016708634 - t * (0.000042037 + 0.0000001267 * t)
    centre = (
        np.sin(anomaly) * (1.914602 - t * (0.004817 + 0.000014 * t))
        + np.sin(2 * anomaly) * (0.019993 - 0.000101 * t)
        + np.sin(3 * anomaly) * 0.000289
    )
    node = np.radians(125.04 - 1934.136 * t)
    apparent = np.radians(mean_longitude + centre - 0.00569 - 0.00478 * np.sin(node))
    obliquity = np.radians(23.439291 - 0.0130042 * t + 0.00256 * np.cos(node))
    declination = np.degrees(np.arcsin(np.sin(obliquity) * np.sin(apparent)))
    y = np.tan(obliquity / 2) ** 2
    double = 2 * np.radians(mean_longitude)
    equation = 4 * np.degrees(
        y * np.sin(double)
        - 2 * eccentricity * np.sin(anomaly)
        + 4 * eccentricity * y * np.sin(anomaly) * np.cos(double)
        - 0.5 * y**2 * np.sin(2 * double)
        - 1.25 * eccentricity**2 * np.sin(2 * anomaly)
    )
    return declination, equation


def next_night(time: Times, latitude: Floats, longitude: Floats) -> Night:
    """
    Find the night nearest to a time: the one that it lies in, or the one that follows.

    Parameters
    ----------
    time : array of datetime64, shape (profile,)
        UTC.
    latitude, longitude : array, shape (profile,)
        [degree]

    Returns
    -------
    Night
        NaT and NaN where the place or the time is not known.
    """
    time = np.asarray(time, "datetime64[ns]")
    latitude, longitude = np.asarray(latitude, float), np.asarray(longitude, float)
    # The local noon before the time opens the day to which the night belongs.
    east = (longitude + 180.0) % 360.0 - 180.0
    known = ~np.isnat(time) & np.isfinite(latitude) & np.isfinite(east)
    safe = np.where(known, time, _J2000)
    east = np.where(known, east, 0.0)
    shift = _seconds(east * 240.0)
    day = (safe + shift).astype("datetime64[D]").astype("datetime64[ns]")
    noon = day + np.timedelta64(12, "h") - shift
    noon = np.where(noon > safe, noon - np.timedelta64(1, "D"), noon)
    sunset, none_set, none_rise = _crossing(noon, latitude, +1.0)
    # A time in the forenoon, after that night's sunrise, belongs to the night that comes.
    rise, _, _ = _crossing(noon + np.timedelta64(1, "D"), latitude, -1.0)
    passed = safe > rise
    noon = np.where(passed, noon + np.timedelta64(1, "D"), noon)
    sunset, none_set, none_rise = _crossing(noon, latitude, +1.0)
    rise, none_set_later, none_rise_later = _crossing(noon + np.timedelta64(1, "D"), latitude, -1.0)
    none_set, none_rise = none_set | none_set_later, none_rise | none_rise_later
    sound = known & ~none_set & ~none_rise
    missing = np.datetime64("NaT", "ns")
    length = np.where(sound, (rise - sunset) / np.timedelta64(1, "s"), np.nan)
    return Night(
        sunset=np.where(sound, sunset, missing),
        sunrise=np.where(sound, rise, missing),
        length=length,
        polar_day=known & none_set,
        polar_night=known & none_rise & ~none_set,
    )


def _crossing(noon: Times, latitude: Floats, side: float) -> tuple[Times, Bools, Bools]:
    """Time at which the sun passes the horizon after (+1) or before (-1) a mean noon."""
    moment = noon
    never_sets = never_rises = np.zeros(noon.shape, dtype=bool)
    for _ in range(4):  # the sun moves on while it sinks: the fourth step changes milliseconds
        declination, equation = declination_and_equation_of_time(moment)
        phi, delta = np.radians(latitude), np.radians(declination)
        with np.errstate(invalid="ignore", divide="ignore"):
            cosine = (np.sin(np.radians(SUNSET_ALTITUDE)) - np.sin(phi) * np.sin(delta)) / (
                np.cos(phi) * np.cos(delta)
            )
        never_sets, never_rises = ~(cosine > -1), ~(cosine < 1) & (cosine > -1)
        hour_angle = np.degrees(np.arccos(np.clip(np.nan_to_num(cosine), -1, 1)))
        moment = noon + _seconds(side * hour_angle * 240.0 - equation * 60.0)
    return moment, never_sets, never_rises


def _seconds(value: Floats) -> Any:
    return np.round(np.asarray(value) * 1e9).astype("timedelta64[ns]")
