"""The pressure of every level: measured, between measured ones, or derived, and which."""

from __future__ import annotations

import numpy as np

from backveer.profiles.air import STANDARD_PRESSURE, standard_atmosphere
from backveer.profiles.earth import geopotential_height
from backveer.profiles.grid import compact
from backveer.profiles.hydrostatics import fill, hypsometric_pressure
from backveer.profiles.labels import Floats, Words
from backveer.profiles.stack import Stack

MEASURED = "measured"
HYPSOMETRIC = "the hypsometric equation, from the standard pressure at the lowest level"
STANDARD = "the standard atmosphere"
NO_ELEVATION = ", with the ground taken to be at sea level"


def level_pressure(stack: Stack) -> tuple[Floats, Words]:
    """
    Pressure of every level with a usable height.

    Parameters
    ----------
    stack
        Quality-checked profiles.

    Returns
    -------
    pressure : array, shape (profile, level)
        Falls with height as far as the measured pressures do. NaN without a height. [Pa]
    origin : array of str, shape (profile,)
        What it rests on.

    Notes
    -----
    Between measured pressures, and beyond the outermost, the standard atmosphere (ISO 2533) gives
    the shape: the logarithm of measured over standard pressure is a straight line between, and
    stays the same beyond. One measured pressure is enough to anchor a profile. With none the
    hypsometric equation serves where the profile has temperatures that reach all its levels,
    otherwise the standard atmosphere. The ratio of two pressures, which is all that the thermal
    wind asks for, is then good to the relative error of the absolute temperature, a few per cent.

    Examples
    --------
    >>> stack = Stack.of(height=[0.0, 1000.0], eastward_wind=5.0, northward_wind=0.0, elevation=0.0)
    >>> pressure, origin = level_pressure(stack)
    >>> pressure.round(-2), origin
    (array([[101300.,  89900.]]), array(['the standard atmosphere'], dtype=object))
    """
    usable = stack.usable()
    ground = np.where(np.isfinite(stack.elevation), stack.elevation, 0.0)[:, np.newaxis]
    place = np.broadcast_to(np.arange(stack.level_count, dtype=float), usable.shape)
    measured = np.where(stack.usable("pressure"), stack.air_pressure, np.nan)
    warm = np.where(stack.usable("temperature"), stack.air_temperature, np.nan)
    dew = np.where(stack.usable("humidity"), stack.dew_point_temperature, np.nan)
    above_sea = np.where(np.isfinite(stack.altitude), stack.altitude, stack.height + ground)
    count, z, altitude, p, t, td, place = compact(
        usable, stack.height, above_sea, measured, warm, dew, place
    )
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        log_measured = np.log(np.where(p > 0, p, np.nan))
        log_standard = np.log(standard_atmosphere(geopotential_height(altitude))[1])
        offset = fill(z, log_measured - log_standard, np.inf)
        told = np.isfinite(offset).any(axis=-1)
        log_p = np.where(
            np.isfinite(log_measured),
            log_measured,
            log_standard + np.where(told[:, np.newaxis], offset, 0.0),
        )
        warm_all = (count > 0) & ~told
        if warm_all.any() and np.isfinite(t).any():
            base = np.exp(log_standard[:, 0])
            base = np.where(np.isfinite(base), base, STANDARD_PRESSURE)
            derived = hypsometric_pressure(altitude, t, td, base)
            there = np.arange(z.shape[1]) < count[:, np.newaxis]
            warm_all &= (np.isfinite(derived) | ~there).all(axis=-1)
            log_p = np.where(warm_all[:, np.newaxis], np.log(derived), log_p)
        else:
            warm_all = np.zeros(len(count), dtype=bool)
        compacted = np.where(p > 0, p, np.exp(log_p))
    pressure = np.full(usable.shape, np.nan)
    kept = np.isfinite(place)
    row, column = np.nonzero(kept)
    pressure[row, place[kept].astype(np.intp)] = compacted[row, column]
    known = np.isfinite(stack.elevation) | np.isfinite(stack.altitude).any(axis=-1)
    origin = np.where(told, MEASURED, np.where(warm_all, HYPSOMETRIC, STANDARD)).astype(object)
    origin = np.where(told | known, origin, origin + NO_ELEVATION)
    return pressure, np.where(count > 0, origin, "").astype(object)
