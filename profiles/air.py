r"""
Moist air, hydrostatics and the standard atmosphere.

Temperatures in K, pressures in Pa, mixing ratios and humidities as pure numbers. Hydrostatic steps
follow the hypsometric equation with virtual temperature,

.. math:: H_2 - H_1 = \frac{R_d \overline{T_v}}{g_0} \ln\frac{p_1}{p_2}

in geopotential height, with the mean of :math:`T_v` over :math:`\ln p` (Wallace, J. M., and
P. V. Hobbs, 2006: Atmospheric Science, 2nd ed., ch. 3).
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.earth import STANDARD_GRAVITY
from backveer.profiles.labels import Floats

DRY_GAS_CONSTANT = 287.05287  # J kg-1 K-1, ISO 2533:1975
VAPOUR_RATIO = 0.62198  # ratio of molar masses of water and dry air, WMO-No. 8, Annex 4.B
KAPPA = 2.0 / 7.0  # R / cp of a diatomic gas; 0.2857, Wallace and Hobbs 2006, ch. 3
ZERO_CELSIUS = 273.15  # K, exact

# Saturation over water, WMO-No. 8 (CIMO guide), Annex 4.B: ew = 6.112 exp(17.62 t/(243.12 + t)) hPa
# (seen quoted in an instrument manual); good from -45 to 60 degrees Celsius.
_E0, _A, _B = 611.2, 17.62, 243.12

# Standard atmosphere to 47 km: base of each layer in geopotential m, lapse rate in K/m
# (ISO 2533:1975; U.S. Standard Atmosphere, 1976).
_SEA_LEVEL_TEMPERATURE, _SEA_LEVEL_PRESSURE = 288.15, 101325.0
_BASES = np.array([-5000.0, 11000.0, 20000.0, 32000.0])
_LAPSES = np.array([-0.0065, 0.0, 0.001, 0.0028])
_CEILING = 47000.0


def saturation_vapour_pressure(temperature: Floats) -> Floats:
    """
    Vapour pressure at saturation over water, at radiosonde colds too as WMO reports it. [Pa].

    WMO-No. 8, Annex 4.B: 6.112 exp(17.62 t / (243.12 + t)) hPa, t in degrees Celsius. Over water at
    all temperatures, because dew points of soundings are reported so.

    Examples
    --------
    >>> round(float(saturation_vapour_pressure(293.15)), 1)
    2332.6
    """
    celsius = np.asarray(temperature, dtype=float) - ZERO_CELSIUS
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        pressure = _E0 * np.exp(_A * celsius / (_B + celsius))
    return np.where(celsius > -_B, pressure, np.nan)


def dew_point(vapour_pressure: Floats) -> Floats:
    """
    Temperature at which a vapour pressure is saturation, the inverse of the formula above. [K].

    NaN where the vapour pressure is not positive: dry air has no dew point.

    Examples
    --------
    >>> round(float(dew_point(saturation_vapour_pressure(278.15))), 6)
    278.15
    """
    vapour_pressure = np.asarray(vapour_pressure, dtype=float)
    good = vapour_pressure > 0
    logarithm = np.log(np.where(good, vapour_pressure, _E0) / _E0)
    with np.errstate(divide="ignore", invalid="ignore"):
        celsius = _B * logarithm / (_A - logarithm)
    return np.where(good, celsius + ZERO_CELSIUS, np.nan)


def dew_point_from_relative_humidity(temperature: Floats, relative_humidity: Floats) -> Floats:
    """
    Dew point from temperature and relative humidity over water, 0 to 1. [K].

    Examples
    --------
    >>> round(float(dew_point_from_relative_humidity(288.15, 1.0)), 6)
    288.15
    """
    return dew_point(np.asarray(relative_humidity) * saturation_vapour_pressure(temperature))


def dew_point_from_mixing_ratio(mixing_ratio: Floats, pressure: Floats) -> Floats:
    """Dew point from mixing ratio (kg of vapour per kg of dry air) and pressure. [K]."""
    mixing_ratio = np.asarray(mixing_ratio, dtype=float)
    return dew_point(pressure * mixing_ratio / (VAPOUR_RATIO + mixing_ratio))


def dew_point_from_specific_humidity(specific_humidity: Floats, pressure: Floats) -> Floats:
    """Dew point from specific humidity (kg of vapour per kg of moist air) and pressure. [K]."""
    q = np.asarray(specific_humidity, dtype=float)
    return dew_point_from_mixing_ratio(q / (1.0 - q), pressure)


def mixing_ratio(dew_point_temperature: Floats, pressure: Floats) -> Floats:
    r"""
    Mass of vapour per mass of dry air. [1].

    .. math:: r = \varepsilon \frac{e}{p - e}

    NaN where the vapour pressure would reach the pressure.
    """
    e = saturation_vapour_pressure(dew_point_temperature)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.where(e < pressure, VAPOUR_RATIO * e / (pressure - e), np.nan)


def virtual_temperature(temperature: Floats, mixing_ratio: Floats) -> Floats:
    r"""
    Temperature of dry air of the same density. [K].

    .. math:: T_v = T \frac{r + \varepsilon}{\varepsilon (1 + r)}

    Examples
    --------
    >>> round(float(virtual_temperature(283.0, 0.012)), 2)
    285.04
    """
    r = np.asarray(mixing_ratio, dtype=float)
    return temperature * (r + VAPOUR_RATIO) / (VAPOUR_RATIO * (1.0 + r))


def virtual_temperature_of(temperature: Floats, dew_point: Floats, pressure: Floats) -> Floats:
    """
    Virtual temperature of a level; dry air is taken where the dew point is missing. [K].

    Without humidity the thickness is too small by at most 0.6 per cent in the wettest air and
    0.2 per cent at a mixing ratio of 3 g/kg.
    """
    r = mixing_ratio(dew_point, pressure)
    return virtual_temperature(temperature, np.where(np.isfinite(r), r, 0.0))


def potential_temperature(temperature: Floats, pressure: Floats) -> Floats:
    r"""
    Temperature of air brought to 1000 hPa without heat. [K].

    .. math:: \theta = T (p_0 / p)^{\kappa}

    Examples
    --------
    >>> round(float(potential_temperature(278.0, 90000.0)), 2)
    286.5
    """
    pressure = np.asarray(pressure, dtype=float)
    good = pressure > 0
    return np.where(good, temperature * (100000.0 / np.where(good, pressure, 1e5)) ** KAPPA, np.nan)


def virtual_potential_temperature(
    temperature: Floats, dew_point: Floats, pressure: Floats
) -> Floats:
    """Potential temperature of the virtual temperature; dry where the dew point is missing. [K]."""
    return potential_temperature(virtual_temperature_of(temperature, dew_point, pressure), pressure)


def density(pressure: Floats, virtual_temperature: Floats) -> Floats:
    r"""
    Density of moist air. [kg m-3].

    .. math:: \rho = p / (R_d T_v)
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(pressure) / (DRY_GAS_CONSTANT * np.asarray(virtual_temperature))


def iec_air_density(temperature: Floats, pressure: Floats, relative_humidity: Floats) -> Floats:
    r"""
    Density of moist air by the formula of IEC 61400-12-1. [kg m-3].

    Parameters
    ----------
    temperature, pressure : array
        [K], [Pa]
    relative_humidity : array
        0 to 1.

    Notes
    -----
    .. math::

        \rho = \frac{1}{T}\left[\frac{B}{R_0} - \phi P_w
        \left(\frac{1}{R_0} - \frac{1}{R_w}\right)\right], \qquad
        P_w = 0.0000205 \exp(0.0631846\,T)

    with :math:`R_0 = 287.05`, :math:`R_w = 461.5` J kg-1 K-1 (IEC 61400-12-1, quoted in public
    codes; the standard itself was not opened).

    Examples
    --------
    >>> round(float(iec_air_density(288.15, 101325.0, 0.5)), 5)
    1.22123
    """
    temperature = np.asarray(temperature, dtype=float)
    dry, vapour = 287.05, 461.5
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        saturation = 0.0000205 * np.exp(0.0631846 * temperature)
        return (
            pressure / dry - relative_humidity * saturation * (1 / dry - 1 / vapour)
        ) / temperature


def thickness(virtual_temperature: Floats, pressure_base: Floats, pressure_top: Floats) -> Floats:
    """
    Geopotential thickness of a layer with the given mean virtual temperature. [m].

    The hypsometric equation of the module; positive where the top has the lower pressure.

    Examples
    --------
    >>> round(float(thickness(273.0, 100000.0, 50000.0)))
    5539
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        ratio = np.log(np.asarray(pressure_base, dtype=float) / pressure_top)
    return DRY_GAS_CONSTANT * virtual_temperature / STANDARD_GRAVITY * ratio


def heights_from_pressure(
    pressure: Floats, virtual_temperature: Floats, base_height: Floats
) -> Floats:
    """
    Geopotential heights of levels, upward from the lowest one.

    Parameters
    ----------
    pressure, virtual_temperature : array, shape (..., level)
        Compact: the levels of a profile stand together at its front, from the ground up, NaN beyond
        the last (:func:`backveer.profiles.grid.compact`). [Pa], [K]
    base_height : array, shape (...)
        Geopotential height of the lowest level. [m]

    Returns
    -------
    height : array, shape (..., level)
        Virtual temperature is linear in ln p between levels; NaN beyond the last level. [m]

    Examples
    --------
    >>> heights_from_pressure(np.array([1e5, 5e4]), np.array([273.0, 273.0]), 100.0).round()
    array([ 100., 5639.])
    """
    pressure, tv = np.asarray(pressure, dtype=float), np.asarray(virtual_temperature, dtype=float)
    steps = thickness(0.5 * (tv[..., 1:] + tv[..., :-1]), pressure[..., :-1], pressure[..., 1:])
    base = np.asarray(base_height, dtype=float)[..., np.newaxis]
    base = np.broadcast_to(base, (*steps.shape[:-1], 1))
    above = np.add.accumulate(np.concatenate([base, steps], axis=-1), axis=-1)
    return np.where(np.isfinite(pressure) & np.isfinite(tv), above, np.nan)


def pressures_from_height(
    height: Floats, virtual_temperature: Floats, base_pressure: Floats
) -> Floats:
    """
    Pressures of levels, upward from the lowest one.

    Parameters
    ----------
    height, virtual_temperature : array, shape (..., level)
        Geopotential heights and virtual temperature, compact as in :func:`heights_from_pressure`.
        [m], [K]
    base_pressure : array, shape (...)
        Pressure of the lowest level. [Pa]

    Returns
    -------
    pressure : array, shape (..., level)
        By the hypsometric equation with the mean of the two virtual temperatures, so that it is the
        inverse of :func:`heights_from_pressure`. [Pa]
    """
    height, tv = np.asarray(height, dtype=float), np.asarray(virtual_temperature, dtype=float)
    mean = 0.5 * (tv[..., 1:] + tv[..., :-1])
    with np.errstate(divide="ignore", invalid="ignore"):
        steps = -STANDARD_GRAVITY * np.diff(height, axis=-1) / (DRY_GAS_CONSTANT * mean)
        base = np.log(np.asarray(base_pressure, dtype=float))[..., np.newaxis]
    base = np.broadcast_to(base, (*steps.shape[:-1], 1))
    above = np.exp(np.add.accumulate(np.concatenate([base, steps], axis=-1), axis=-1))
    return np.where(np.isfinite(height) & np.isfinite(tv), above, np.nan)


def standard_temperature(geopotential_height: Floats) -> Floats:
    """
    Temperature of the standard atmosphere, -5 to 47 km; NaN outside. [K].

    ISO 2533:1975.

    Examples
    --------
    >>> standard_temperature(np.array([0.0, 2500.0, 12000.0]))
    array([288.15, 271.9 , 216.65])
    """
    height, layer = _layer_of(geopotential_height)
    temperature: Floats = _TEMPERATURES[layer] + _LAPSES[layer] * (height - _STARTS[layer])
    return temperature


def standard_pressure(geopotential_height: Floats) -> Floats:
    """
    Pressure of the standard atmosphere, -5 to 47 km; NaN outside. [Pa].

    ISO 2533:1975.

    Examples
    --------
    >>> standard_pressure(np.array([0.0, 1000.0, 12000.0])).round(1)
    array([101325. ,  89874.6,  19330.4])
    """
    pressure: Floats = _pressure_in(*_layer_of(geopotential_height))
    return pressure


def standard_density(geopotential_height: Floats) -> Floats:
    """Density of the standard atmosphere, -5 to 47 km; NaN outside (ISO 2533:1975). [kg m-3]."""
    return density(
        standard_pressure(geopotential_height), standard_temperature(geopotential_height)
    )


def standard_height(pressure: Floats) -> Floats:
    """
    Geopotential height at which the standard atmosphere has a pressure; NaN outside. [m].

    ISO 2533:1975; the pressure altitude behind flight levels.

    Examples
    --------
    >>> standard_height(np.array([101325.0, 89874.6])).round(1)
    array([   0., 1000.])
    """
    pressure = np.asarray(pressure, dtype=float)
    inside = (pressure <= _TOP_AND_FLOOR[1]) & (pressure >= _TOP_AND_FLOOR[0])
    ratio = np.where(inside, pressure, _SEA_LEVEL_PRESSURE)
    layer = np.clip(np.searchsorted(-_PRESSURES, -ratio, side="right") - 1, 0, len(_BASES) - 1)
    lapse = _LAPSES[layer]
    sloped = np.where(lapse == 0, 1.0, lapse)
    gas = DRY_GAS_CONSTANT / STANDARD_GRAVITY
    logarithm = np.log(ratio / _PRESSURES[layer])
    isothermal = -gas * _TEMPERATURES[layer] * logarithm
    with_lapse = _TEMPERATURES[layer] / sloped * np.expm1(-gas * sloped * logarithm)
    height = _STARTS[layer] + np.where(lapse == 0, isothermal, with_lapse)
    return np.where(inside, height, np.nan)


def _layer_of(geopotential_height: Floats) -> tuple[Any, Any]:
    height = np.asarray(geopotential_height, dtype=float)
    height = np.where((height >= _BASES[0]) & (height <= _CEILING), height, np.nan)
    layer = np.searchsorted(_BASES, np.where(np.isfinite(height), height, 0.0), side="right") - 1
    return height, layer


def _pressure_in(height: Any, layer: Any) -> Any:
    """Pressure in a layer, from its start up (ISO 2533:1975, equations of its section 2)."""
    lapse, start = _LAPSES[layer], _TEMPERATURES[layer]
    sloped = np.where(lapse == 0, 1.0, lapse)
    rise = height - _STARTS[layer]
    exponent = STANDARD_GRAVITY / DRY_GAS_CONSTANT
    isothermal = np.exp(-exponent * rise / start)
    with_lapse = (1.0 + sloped * rise / start) ** (-exponent / sloped)
    return _PRESSURES[layer] * np.where(lapse == 0, isothermal, with_lapse)


# The lowest layer is reckoned from sea level, the others from their bases.
_STARTS = np.array([0.0, *_BASES[1:]])
_TEMPERATURES = np.full(len(_BASES), _SEA_LEVEL_TEMPERATURE)
_PRESSURES = np.full(len(_BASES), _SEA_LEVEL_PRESSURE)
for _i in range(1, len(_BASES)):
    _TEMPERATURES[_i] = _TEMPERATURES[_i - 1] + _LAPSES[_i - 1] * (_STARTS[_i] - _STARTS[_i - 1])
    _PRESSURES[_i] = _pressure_in(_STARTS[_i], np.intp(_i - 1))
_TOP_AND_FLOOR = (
    float(_pressure_in(np.float64(_CEILING), np.intp(len(_BASES) - 1))),
    float(_pressure_in(_BASES[0], np.intp(0))),
)
