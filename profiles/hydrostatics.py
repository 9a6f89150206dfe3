"""
Hydrostatics: altitude from pressure, and pressure from altitude, through the air between levels.

Levels are put into order and what is missing is passed over, so that the order of the levels and a
missing one change nothing; sums run upward in order.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.air import STANDARD_PRESSURE, scale_height, virtual_temperature
from backveer.profiles.earth import geometric_altitude, geopotential_height
from backveer.profiles.grid import compact

#: Beyond its outermost level a temperature is taken to stay the same for this step of ln p
#: (about 400 m): at the steepest lapse that makes an error of 2 m. Further out there is no answer.
REACH = 0.05


def hypsometric_altitude(
    pressure: Any,
    temperature: Any,
    dew_point: Any = None,
    base_altitude: Any = 0.0,
    latitude: Any = None,
) -> Any:
    """
    Altitude of levels from their pressure, temperature and humidity.

    Parameters
    ----------
    pressure : array, shape (..., level)
        In any order, NaN where missing. [Pa]
    temperature, dew_point : array, shape (..., level)
        Where one is missing it is interpolated in ln p. Air without a dew point above or below
        counts as dry. [K]
    base_altitude : array, shape (...)
        Altitude of the level with the highest pressure. [m]
    latitude : array, shape (...), optional
        With it, gravity is that of the latitude, otherwise that of ISO 2533. [degree]

    Returns
    -------
    altitude : array, shape (..., level)
        Geometric. NaN without pressure, and further than 0.05 in ln p from any temperature; all
        NaN if that is so at the base. [m]

    Notes
    -----
    The hypsometric equation from level to level, with the mean of the virtual temperatures of both
    ends (exact where it is linear in ln p), then from geopotential to geometric.

    Examples
    --------
    >>> p = np.array([100000.0, np.nan, 50000.0])
    >>> hypsometric_altitude(p, np.array([273.15, np.nan, 273.15])).round(1)
    array([   0. ,    nan, 5546.9])
    """
    given = (pressure, temperature) if dew_point is None else (pressure, temperature, dew_point)
    p, t, *dew = np.broadcast_arrays(*(np.asarray(x, dtype=float) for x in given))
    with np.errstate(invalid="ignore", divide="ignore"):
        depth = -np.log(np.where((p > 0) & np.isfinite(p), p, np.nan))  # grows upward, as height
    order = np.argsort(depth, axis=-1, kind="stable")  # NaN last
    depth, p, t = (np.take_along_axis(x, order, axis=-1) for x in (depth, p, t))
    tv = fill(depth, t, REACH)
    if dew:
        moist = virtual_temperature(
            tv, fill(depth, np.take_along_axis(dew[0], order, axis=-1), 0.0), p
        )
        tv = np.where(np.isfinite(moist), moist, tv)
    base = np.asarray(base_altitude, dtype=float)[..., np.newaxis]
    place = None if latitude is None else np.asarray(latitude, dtype=float)[..., np.newaxis]
    height = geopotential_height(base, place) + _upward(0.5 * scale_height(1.0), depth, tv, False)
    altitude = np.full(np.broadcast_shapes(height.shape, order.shape), np.nan)
    np.put_along_axis(altitude, order, geometric_altitude(height, place), axis=-1)
    return altitude


def hypsometric_pressure(
    altitude: Any,
    temperature: Any,
    dew_point: Any = None,
    base_pressure: Any = STANDARD_PRESSURE,
    latitude: Any = None,
) -> Any:
    """
    Pressure of levels from their altitude, temperature and humidity.

    Parameters
    ----------
    altitude : array, shape (..., level)
        Geometric, in any order, NaN where missing. [m]
    temperature, dew_point : array, shape (..., level)
        As in :func:`hypsometric_altitude`, interpolated in height. [K]
    base_pressure : array, shape (...)
        Pressure at the lowest level. [Pa]
    latitude : array, shape (...), optional
        As there. [degree]

    Returns
    -------
    pressure : array, shape (..., level)
        NaN without altitude, and further than 400 m from any temperature. [Pa]

    Notes
    -----
    The inverse of :func:`hypsometric_altitude` with the same mean temperature between levels. The
    humidity needs the pressure, which begins dry and is improved three times: each time takes the
    error down by more than a factor of 1000.

    Examples
    --------
    >>> z = np.array([100.0, 200.0])
    >>> hypsometric_pressure(z, np.array([284.0, 284.0]), base_pressure=99000.0).round(0)
    array([99000., 97816.])
    """
    given = (altitude, temperature) if dew_point is None else (altitude, temperature, dew_point)
    z, t, *dew = np.broadcast_arrays(*(np.asarray(x, dtype=float) for x in given))
    place = None if latitude is None else np.asarray(latitude, dtype=float)[..., np.newaxis]
    h = geopotential_height(z, place)
    h = np.where(np.isfinite(h), h, np.nan)
    order = np.argsort(h, axis=-1, kind="stable")
    h, t = (np.take_along_axis(x, order, axis=-1) for x in (h, t))
    dry = fill(h, t, REACH * 8000.0)
    base = np.asarray(base_pressure, dtype=float)[..., np.newaxis]
    tv = dry
    for turn in range(4 if dew else 1):
        with np.errstate(over="ignore", under="ignore", invalid="ignore"):
            p = base * np.exp(-_upward(2.0 / scale_height(1.0), h, tv, True))
        if dew and turn == 0:
            wet = fill(h, np.take_along_axis(dew[0], order, axis=-1), 0.0)
        if dew:
            moist = virtual_temperature(dry, wet, p)
            tv = np.where(np.isfinite(moist), moist, dry)
    result = np.full(np.broadcast_shapes(p.shape, order.shape), np.nan)
    np.put_along_axis(result, order, np.where(base > 0, p, np.nan), axis=-1)
    return result


def fill(x: Any, y: Any, reach: float) -> Any:
    """
    Interpolate what is missing in ``y`` along a coordinate that does not fall, NaN last.

    Beyond the outermost values they stay the same for ``reach``; further out comes NaN.
    """
    there = np.isfinite(x) & np.isfinite(y)
    if not there.any():
        return np.full(np.shape(y), np.nan)
    place = np.broadcast_to(np.arange(y.shape[-1]), y.shape)
    low = np.maximum.accumulate(np.where(there, place, -1), axis=-1)
    high = np.where(there, place, y.shape[-1])
    high = np.minimum.accumulate(high[..., ::-1], axis=-1)[..., ::-1]
    inside_low, inside_high = low >= 0, high < y.shape[-1]
    low = np.where(inside_low, low, np.minimum(high, y.shape[-1] - 1))
    high = np.where(inside_high, high, low)
    x0, x1 = np.take_along_axis(x, low, -1), np.take_along_axis(x, high, -1)
    y0, y1 = np.take_along_axis(y, low, -1), np.take_along_axis(y, high, -1)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        between = y0 + (y1 - y0) * ((x - x0) / (x1 - x0))
        near = np.abs(x - x0) <= reach
    both = inside_low & inside_high
    filled = np.where(both & (x1 > x0), between, np.where(both | near, y0, np.nan))
    return np.where(there, y, np.where(np.isfinite(x), filled, np.nan))


def _upward(factor: float, x: Any, tv: Any, divide: bool) -> Any:
    """
    Sum from the lowest level of ``factor (tv0 + tv1) dx``, or of ``factor dx / (tv0 + tv1)``.

    ``x`` does not fall, NaN last. A level without temperature is passed over; all is NaN where it
    is the lowest.
    """
    good = np.isfinite(x) & np.isfinite(tv) & (tv > 0)
    _count, xk, tk, place = compact(good, x, tv, np.arange(x.shape[-1], dtype=float))
    with np.errstate(invalid="ignore", over="ignore"):
        step, pair = np.diff(xk, axis=-1), tk[..., 1:] + tk[..., :-1]
        step = factor * step / pair if divide else factor * step * pair
    start = np.zeros_like(xk[..., :1])
    running = np.add.accumulate(np.concatenate([start, step], axis=-1), axis=-1)
    running = np.where(np.isfinite(xk), running, np.nan)
    whole = np.full(x.shape, np.nan)
    kept = np.isfinite(place)
    index = np.where(kept, place, 0).astype(np.intp)
    rows = np.nonzero(kept)
    whole[(*rows[:-1], index[rows])] = running[rows]
    based = good[..., :1] if x.shape[-1] else good
    return np.where(based, whole, np.nan)
