r"""
Whether the sun is up: its elevation at a time and place.

.. math:: \sin h = \sin\varphi \sin\delta + \cos\varphi \cos\delta \cos\omega

with the latitude :math:`\varphi`, the declination :math:`\delta` and the hour angle :math:`\omega`.
"""

from __future__ import annotations

import numpy as np

from backveer.profiles.labels import Floats, Times
from backveer.profiles.sun import declination_and_equation_of_time


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

    Examples
    --------
    At the equinox the sun stands nearly overhead at noon at the equator.

    >>> noon = np.array(["2031-03-20T12:07"], dtype="datetime64[ns]")
    >>> bool(solar_elevation(noon, np.array([0.0]), np.array([0.0]))[0] > 89)
    True
    """
    known = ~np.isnat(time)
    moment = np.where(known, time, np.datetime64("2000-01-01T12:00", "ns"))
    declination, equation = declination_and_equation_of_time(moment)
    seconds = (moment - moment.astype("datetime64[D]")) / np.timedelta64(1, "s")
    # Apparent solar time runs 240 s a degree; the hour angle is zero at apparent noon.
    hour_angle = np.radians((seconds + 60.0 * equation) / 240.0 + longitude - 180.0)
    phi, delta = np.radians(latitude), np.radians(declination)
    sine = np.sin(phi) * np.sin(delta) + np.cos(phi) * np.cos(delta) * np.cos(hour_angle)
    elevation = np.degrees(np.arcsin(np.clip(sine, -1.0, 1.0)))
    return np.where(known, elevation, np.nan)
