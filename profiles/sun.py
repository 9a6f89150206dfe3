r"""
How high the sun stands: enough to tell night from day.

.. math:: \sin h = \sin\varphi \sin\delta + \cos\varphi \cos\delta \cos\omega

with the latitude :math:`\varphi`, the declination :math:`\delta` and the hour angle :math:`\omega`.
"""

from __future__ import annotations

import numpy as np

from backveer.profiles.labels import Floats, Times

# Julian centuries are counted from noon UTC of 1 January 2000: IAU epoch J2000.0.
J2000 = np.datetime64("2000-01-01T12:00", "ns")


def solar_elevation(time: Times, latitude: Floats, longitude: Floats) -> Floats:
    """
    Elevation of the sun's centre above the horizon, without refraction.

    Parameters
    ----------
    time : array of datetime64
        UTC.
    latitude, longitude : array
        North and east positive. [degree]

    Returns
    -------
    elevation : array
        NaN where any of these is missing. [degree]

    Notes
    -----
    The low-precision formulas of the Astronomical Almanac (from memory; good to about 0.01 degree
    from 1950 to 2050, and to a few tenths for centuries around).

    Examples
    --------
    At the equinox the sun stands nearly overhead at noon at the equator.

    >>> noon = np.array(["2031-03-20T12:07"], dtype="datetime64[ns]")
    >>> bool(solar_elevation(noon, np.array([0.0]), np.array([0.0]))[0] > 89)
    True
    """
    known = ~np.isnat(time)
    days = np.where(known, (time - J2000) / np.timedelta64(1, "D"), np.nan)
    mean_longitude = 280.460 + 0.9856474 * days
    anomaly = np.radians(357.528 + 0.9856003 * days)
    ecliptic = np.radians(mean_longitude + 1.915 * np.sin(anomaly) + 0.020 * np.sin(2 * anomaly))
    obliquity = np.radians(23.439 - 4e-7 * days)
    ascension = np.arctan2(np.cos(obliquity) * np.sin(ecliptic), np.cos(ecliptic))
    declination = np.arcsin(np.sin(obliquity) * np.sin(ecliptic))
    sidereal = np.radians(280.46062 + 360.98564737 * days + longitude)
    phi = np.radians(latitude)
    sine = np.sin(phi) * np.sin(declination)
    sine = sine + np.cos(phi) * np.cos(declination) * np.cos(sidereal - ascension)
    elevation: Floats = np.degrees(np.arcsin(np.clip(sine, -1.0, 1.0)))
    return elevation
