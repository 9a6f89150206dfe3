"""
Measures of humidity, one turned into another.

Humidity is always over liquid water, below freezing too, as a dew point is reported (WMO-No. 8).
Numbers without a meaning (no pressure, no vapour, vapour above the pressure) give NaN.
"""

from __future__ import annotations

from typing import Any

import numpy as np

EPSILON = 0.62198  # molar masses, water to dry air: WMO-No. 49, Technical Regulations (memory)
FREEZING = 273.15  # K, 0 degrees Celsius: by definition
MAGNUS = (611.2, 17.62, 243.12)  # Pa, 1, K; over water, -45 to 60 deg C: WMO-No. 8, annex 4.B


def saturation_vapour_pressure(temperature: Any) -> Any:
    r"""
    Vapour pressure of saturated air over liquid water; of a dew point, the actual vapour pressure.

    Parameters
    ----------
    temperature : array
        [K]

    Returns
    -------
    vapour_pressure : array
        :math:`e = 6.112\,\mathrm{hPa}\, \exp[17.62\, t / (243.12 + t)]`, t in degrees Celsius [1]_.
        [Pa]

    References
    ----------
    .. [1] WMO-No. 8, Guide to Instruments and Methods of Observation, annex 4.B.

    Examples
    --------
    >>> saturation_vapour_pressure(np.array([273.15, 298.15])).round(1)
    array([ 611.2, 3160.1])
    """
    e0, a, b = MAGNUS
    t = np.asarray(temperature, dtype=float) - FREEZING
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        return np.where(t > -b, e0 * np.exp(a * t / (b + t)), np.nan)[()]


def dew_point_from_vapour_pressure(vapour_pressure: Any) -> Any:
    r"""
    Dew point, the inverse of :func:`saturation_vapour_pressure`.

    Parameters
    ----------
    vapour_pressure : array
        [Pa]

    Returns
    -------
    dew_point : array
        NaN for air without vapour, which has no dew point. [K]

    Examples
    --------
    >>> dew_point_from_vapour_pressure(611.2)
    np.float64(273.15)
    """
    e0, a, b = MAGNUS
    e = np.asarray(vapour_pressure, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore"):
        x = np.log(e / e0)
        # Beyond x = a the formula has no finite temperature.
        return np.where((e > 0) & (x < a), FREEZING + b * x / (a - x), np.nan)[()]


def dew_point_from_relative_humidity(temperature: Any, relative_humidity: Any) -> Any:
    """
    Dew point from relative humidity over liquid water.

    Parameters
    ----------
    temperature : array
        [K]
    relative_humidity : array
        As a fraction, 0 to 1. [1]

    Returns
    -------
    dew_point : array
        [K]

    Examples
    --------
    >>> dew_point_from_relative_humidity(293.15, np.array([1.0, 0.5])).round(2)
    array([293.15, 282.41])
    """
    with np.errstate(invalid="ignore", over="ignore"):
        e = saturation_vapour_pressure(temperature) * np.asarray(relative_humidity, dtype=float)
    return dew_point_from_vapour_pressure(e)


def dew_point_from_mixing_ratio(mixing_ratio: Any, pressure: Any) -> Any:
    r"""
    Dew point from mixing ratio, through :math:`e = p r / (\epsilon + r)`.

    Parameters
    ----------
    mixing_ratio : array
        Mass of vapour to mass of dry air. [kg kg-1]
    pressure : array
        [Pa]

    Returns
    -------
    dew_point : array
        [K]

    Examples
    --------
    >>> dew_point_from_mixing_ratio(0.01, 100000.0).round(2)
    np.float64(287.02)
    """
    r, p = np.asarray(mixing_ratio, dtype=float), np.asarray(pressure, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        return dew_point_from_vapour_pressure(p * (r / (EPSILON + r)))


def dew_point_from_specific_humidity(specific_humidity: Any, pressure: Any) -> Any:
    r"""
    Dew point from specific humidity, through :math:`r = q / (1 - q)`.

    Parameters
    ----------
    specific_humidity : array
        Mass of vapour to mass of moist air. [kg kg-1]
    pressure : array
        [Pa]

    Returns
    -------
    dew_point : array
        [K]

    Examples
    --------
    >>> dew_point_from_specific_humidity(0.01, 100000.0).round(2)
    np.float64(287.18)
    """
    q = np.asarray(specific_humidity, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore"):
        return dew_point_from_mixing_ratio(np.where(q < 1.0, q / (1.0 - q), np.nan), pressure)


def mixing_ratio(vapour_pressure: Any, pressure: Any) -> Any:
    r"""
    Mixing ratio :math:`r = \epsilon e / (p - e)`.

    Parameters
    ----------
    vapour_pressure, pressure : array
        [Pa]

    Returns
    -------
    mixing_ratio : array
        NaN where the vapour pressure is not below the pressure. [kg kg-1]

    Examples
    --------
    >>> mixing_ratio(1500.0, 100000.0).round(5)
    np.float64(0.00947)
    """
    e, p = np.asarray(vapour_pressure, dtype=float), np.asarray(pressure, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        return np.where((e >= 0) & (e < p), EPSILON * (e / (p - e)), np.nan)[()]
