"""Air density at hub height: from what was measured or from the standard atmosphere, and which."""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.air import iec_air_density, standard_atmosphere
from backveer.profiles.earth import STANDARD_GRAVITY, geopotential_height
from backveer.profiles.grid import at_height
from backveer.profiles.humidity import saturation_vapour_pressure
from backveer.profiles.labels import Bools, Floats, Words
from backveer.profiles.stack import Stack

LAPSE_RATE = 0.0065  # K m-1, ISO 2533:1975
GAS_CONSTANT = 287.05  # J kg-1 K-1, dry air, IEC 61400-12-1
RELATIVE_HUMIDITY = 0.5  # IEC 61400-12-1 where it is not measured (from memory)
#: A measurement further away in height says little about the air at the hub; ours.
REACH = 200.0  # m

MEASURED = "pressure, temperature and humidity"
NO_HUMIDITY = "pressure and temperature, relative humidity taken as 50 %"
NO_PRESSURE = "temperature; pressure of the standard atmosphere at the site's elevation"
STANDARD = "standard atmosphere at the site's elevation"
NEITHER = (
    "not determined: pressure and temperature are not measured near the hub "
    "and the elevation of the site is not known"
)


def air_density(stack: Stack, hub_height: float) -> tuple[Floats, Words]:
    r"""
    Air density at a height above ground.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    hub_height
        [m]

    Returns
    -------
    density : array, shape (profile,)
        NaN where nothing is known. [kg m-3]
    origin : array of str, shape (profile,)
        What it rests on, or why there is none.

    Notes
    -----
    Temperature, dew point and the logarithm of pressure are straight lines between levels. Where
    the height lies outside the levels, the nearest within 200 m is brought there with 6.5 K/km and
    the hydrostatic equation. The density is that of IEC 61400-12-1
    (:func:`backveer.profiles.air.iec_air_density`), with the relative humidity from the dew point
    over water (WMO-No. 8); the standard atmosphere (ISO 2533) is dry.

    Examples
    --------
    >>> density, origin = air_density(Stack.of(height=[10.0], elevation=0.0), hub_height=0.0)
    >>> density.round(4), origin
    (array([1.225]), array(["standard atmosphere at the site's elevation"], dtype=object))
    """
    altitude = geopotential_height(_elevation(stack) + hub_height)
    usual_t, usual_p = standard_atmosphere(altitude)
    missing = np.full(stack.profile_count, np.nan)
    t = p = dew = missing
    with np.errstate(all="ignore"):
        if stack.has("air_temperature"):
            t, away = _nearby(stack, stack.usable("temperature"), stack.air_temperature, hub_height)
            t = t + LAPSE_RATE * away
        if stack.has("air_pressure"):
            good = stack.usable("pressure") & (stack.air_pressure > 0)
            log_p, away = _nearby(
                stack, good, np.log(np.where(good, stack.air_pressure, 1.0)), hub_height
            )
            between = np.where(np.isfinite(t), t, usual_t) + 0.5 * LAPSE_RATE * -away
            p = np.exp(log_p + STANDARD_GRAVITY * away / (GAS_CONSTANT * between))
        if stack.has("dew_point_temperature"):
            good = stack.usable("temperature", "humidity")
            dew, _away = _nearby(stack, good, stack.dew_point_temperature, hub_height)
        ratio = saturation_vapour_pressure(dew) / saturation_vapour_pressure(t)
        humidity = np.minimum(ratio, 1.0)
        warm, pressed, humid = np.isfinite(t), np.isfinite(p), np.isfinite(humidity)
        told = np.where(humid, humidity, RELATIVE_HUMIDITY)
        density = np.where(
            warm,
            iec_air_density(t, np.where(pressed, p, usual_p), told),
            iec_air_density(usual_t, usual_p, np.zeros_like(usual_t)),
        )
    density = np.where(np.isfinite(density) & (density > 0), density, np.nan)
    origin = np.select(
        [np.isnan(density), warm & pressed & humid, warm & pressed, warm],
        [NEITHER, MEASURED, NO_HUMIDITY, NO_PRESSURE],
        default=STANDARD,
    )
    return density, origin.astype(object)


def _elevation(stack: Stack) -> Floats:
    """Elevation of the site, from the altitude of a level where it is not given. [m]"""
    if not stack.level_count or not stack.has("altitude"):
        return stack.elevation
    with np.errstate(invalid="ignore"):
        ground = stack.altitude - stack.height
    first = np.isfinite(ground).argmax(axis=1)[:, np.newaxis]
    known = np.take_along_axis(ground, first, axis=1)[:, 0]
    return np.where(np.isfinite(stack.elevation), stack.elevation, known)


def _nearby(stack: Stack, good: Bools, x: Floats, height: float) -> tuple[Floats, Any]:
    """Value at a height, or at the nearest level in reach, and how far above the height that is."""
    z = np.where(good, stack.height, np.nan)
    value = at_height(z, np.where(good, x, np.nan), [height])[:, 0]
    distance = np.where(good, np.abs(stack.height - height), np.inf)
    nearest = distance.argmin(axis=1)[:, np.newaxis]
    there, z_there = (np.take_along_axis(y, nearest, axis=1)[:, 0] for y in (x, z))
    outside = np.isnan(value) & (np.take_along_axis(distance, nearest, axis=1)[:, 0] <= REACH)
    return np.where(outside, there, value), np.where(outside, z_there - height, 0.0)
