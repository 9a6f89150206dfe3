"""
Moist air, the thickness of a layer of it, and the standard atmosphere.

Every kernel is elementwise. Numbers without a meaning (no pressure, vapour above the pressure, at
or below absolute zero) give NaN. What measures humidity is in humidity.py.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.earth import STANDARD_GRAVITY
from backveer.profiles.humidity import EPSILON, saturation_vapour_pressure

GAS_CONSTANT = 287.05287  # J kg-1 K-1, dry air: ISO 2533:1975
KAPPA = 2.0 / 7.0  # R / cp of a diatomic ideal gas; air differs from it by 0.1 %
HEAT_CAPACITY = GAS_CONSTANT / KAPPA  # J kg-1 K-1, at constant pressure
DRY_ADIABATIC_LAPSE_RATE = STANDARD_GRAVITY / HEAT_CAPACITY  # K m-1
REFERENCE_PRESSURE = 100000.0  # Pa, of potential temperature: by definition

# IEC 61400-12-1, air density: as quoted in six public codes.
IEC_DRY = 287.05  # J kg-1 K-1
IEC_VAPOUR = 461.5  # J kg-1 K-1
IEC_VAPOUR_PRESSURE = (0.0000205, 0.0631846)  # Pa, K-1

# ISO 2533:1975: geopotential height of the base [m], temperature there [K], its gradient [K m-1].
STANDARD_LAYERS = (
    (0.0, 288.15, -0.0065), (11000.0, 216.65, 0.0), (20000.0, 216.65, 0.001),
    (32000.0, 228.65, 0.0028), (47000.0, 270.65, 0.0), (51000.0, 270.65, -0.0028),
    (71000.0, 214.65, -0.002),
)  # fmt: skip
STANDARD_PRESSURE = 101325.0  # Pa, ISO 2533:1975
STANDARD_LIMITS = (-5000.0, 80000.0)  # m, what the tables of ISO 2533 and its addenda cover


def virtual_temperature(temperature: Any, dew_point: Any, pressure: Any) -> Any:
    r"""
    Virtual temperature, that of dry air of the same density.

    Parameters
    ----------
    temperature, dew_point : array
        [K]
    pressure : array
        [Pa]

    Returns
    -------
    virtual_temperature : array
        :math:`T_v = T / [1 - (1 - \epsilon) e / p]`, from the ideal gas law for both gases; NaN
        where the dew point is missing. [K]

    Examples
    --------
    >>> virtual_temperature(303.15, 298.15, 100000.0).round(2)
    np.float64(306.82)
    """
    t, p = np.asarray(temperature, dtype=float), np.asarray(pressure, dtype=float)
    e = saturation_vapour_pressure(dew_point)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        tv = t / (1.0 - (1.0 - EPSILON) * (e / p))
        return np.where((e < p) & (t > 0), tv, np.nan)[()]


def potential_temperature(temperature: Any, pressure: Any) -> Any:
    r"""
    Potential temperature :math:`\theta = T (1000\,\mathrm{hPa} / p)^{R / c_p}`.

    Parameters
    ----------
    temperature : array
        Of air, or its virtual temperature. [K]
    pressure : array
        [Pa]

    Returns
    -------
    theta : array
        [K]

    Examples
    --------
    >>> potential_temperature(283.15, 70000.0).round(2)
    np.float64(313.53)
    """
    t, p = np.asarray(temperature, dtype=float), np.asarray(pressure, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        theta = t * (REFERENCE_PRESSURE / p) ** KAPPA
        return np.where((p > 0) & (t > 0), theta, np.nan)[()]


def virtual_potential_temperature(temperature: Any, dew_point: Any, pressure: Any) -> Any:
    """
    Virtual potential temperature, the potential temperature of the virtual temperature.

    Parameters
    ----------
    temperature, dew_point : array
        [K]
    pressure : array
        [Pa]

    Returns
    -------
    theta_v : array
        [K]

    Examples
    --------
    >>> virtual_potential_temperature(283.15, 279.15, 70000.0).round(2)
    np.float64(315.12)
    """
    tv = virtual_temperature(temperature, dew_point, pressure)
    return potential_temperature(tv, pressure)


def density(pressure: Any, virtual_temperature: Any) -> Any:
    r"""
    Density of air, :math:`\rho = p / (R T_v)`.

    Parameters
    ----------
    pressure : array
        [Pa]
    virtual_temperature : array
        The temperature itself for dry air. [K]

    Returns
    -------
    density : array
        [kg m-3]

    Examples
    --------
    >>> density(101325.0, 288.15).round(4)
    np.float64(1.225)
    """
    p, tv = np.asarray(pressure, dtype=float), np.asarray(virtual_temperature, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        return np.where((p >= 0) & (tv > 0), p / (GAS_CONSTANT * tv), np.nan)[()]


def iec_air_density(temperature: Any, pressure: Any, relative_humidity: Any) -> Any:
    r"""
    Air density as power performance measurements define it.

    Parameters
    ----------
    temperature : array
        [K]
    pressure : array
        [Pa]
    relative_humidity : array
        As a fraction, 0 to 1. [1]

    Returns
    -------
    density : array
        [kg m-3]

    Notes
    -----
    .. math::
        \rho = \frac{1}{T} \left[\frac{B}{R_0} - \phi P_w \left(\frac{1}{R_0} - \frac{1}{R_w}\right)
        \right], \qquad P_w = 0.0000205\,\mathrm{Pa}\, \exp(0.0631846\, T)

    References
    ----------
    IEC 61400-12-1, Wind energy generation systems: power performance measurements of electricity
    producing wind turbines (as quoted in six public codes).

    Examples
    --------
    >>> iec_air_density(288.15, 101325.0, np.array([0.0, 0.5, 1.0])).round(5)
    array([1.22501, 1.22123, 1.21745])
    """
    t, b = np.asarray(temperature, dtype=float), np.asarray(pressure, dtype=float)
    factor, exponent = IEC_VAPOUR_PRESSURE
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        vapour = np.asarray(relative_humidity, dtype=float) * (factor * np.exp(exponent * t))
        rho = (b / IEC_DRY - vapour * (1.0 / IEC_DRY - 1.0 / IEC_VAPOUR)) / t
        return np.where(t > 0, rho, np.nan)[()]


def scale_height(virtual_temperature: Any) -> Any:
    """
    Height over which the pressure falls by a factor e in isothermal air, R Tv / g.

    Parameters
    ----------
    virtual_temperature : array
        [K]

    Returns
    -------
    scale_height : array
        In geopotential metres. [m]

    Examples
    --------
    >>> scale_height(273.15).round(1)
    np.float64(7995.4)
    """
    return GAS_CONSTANT * np.asarray(virtual_temperature, dtype=float) / STANDARD_GRAVITY


def thickness(base_pressure: Any, top_pressure: Any, virtual_temperature: Any) -> Any:
    r"""
    Thickness of a layer, :math:`\Delta H = (R T_v / g) \ln(p_1 / p_2)` (hypsometric equation).

    Parameters
    ----------
    base_pressure, top_pressure : array
        [Pa]
    virtual_temperature : array
        Mean of the layer, over ln p. [K]

    Returns
    -------
    thickness : array
        In geopotential metres, positive where the top has the lower pressure. [m]

    Examples
    --------
    >>> thickness(100000.0, 50000.0, 273.15).round(1)
    np.float64(5542.0)
    """
    p1, p2 = np.asarray(base_pressure, dtype=float), np.asarray(top_pressure, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        step = np.where((p1 > 0) & (p2 > 0), np.log(p1 / p2), np.nan)
        return scale_height(virtual_temperature) * step


def standard_atmosphere(geopotential_height: Any) -> tuple[Any, Any]:
    r"""
    Temperature and pressure of the standard atmosphere.

    Parameters
    ----------
    geopotential_height : array
        -5 to 80 km; NaN comes back outside. [m]

    Returns
    -------
    temperature, pressure : array
        [K], [Pa]

    Notes
    -----
    In a layer with a constant gradient :math:`\beta = dT/dH`,

    .. math::
        T = T_b + \beta (H - H_b), \qquad
        p = p_b (T / T_b)^{-g / (R \beta)} \ \text{or} \
        p_b \exp\left[-\frac{g (H - H_b)}{R T_b}\right] \text{ for } \beta = 0

    References
    ----------
    ISO 2533:1975, Standard Atmosphere; ICAO Doc 7488.

    Examples
    --------
    >>> t, p = standard_atmosphere(np.array([0.0, 5000.0, 12000.0]))
    >>> t.round(2), p.round(1)
    (array([288.15, 255.65, 216.65]), array([101325. ,  54019.9,  19330.4]))
    """
    h = np.asarray(geopotential_height, dtype=float)
    with np.errstate(invalid="ignore"):
        h = np.where((h >= STANDARD_LIMITS[0]) & (h <= STANDARD_LIMITS[1]), h, np.nan)
        temperature = pressure = np.full(h.shape, np.nan)
        for number, ((base, t_base, gradient), p_base) in enumerate(_STANDARD_BASES):
            # The lowest layer goes on below the sea, each other one begins at its base.
            here = np.isfinite(h) if number == 0 else h >= base
            t = t_base + gradient * (h - base)
            if gradient:
                p = p_base * (t / t_base) ** (-STANDARD_GRAVITY / (GAS_CONSTANT * gradient))
            else:
                p = p_base * np.exp(-(h - base) / scale_height(t_base))
            temperature, pressure = np.where(here, t, temperature), np.where(here, p, pressure)
    return temperature[()], pressure[()]


def standard_density(geopotential_height: Any) -> Any:
    """
    Air density of the standard atmosphere.

    Parameters
    ----------
    geopotential_height : array
        [m]

    Returns
    -------
    density : array
        [kg m-3]

    Examples
    --------
    >>> standard_density(np.array([0.0, 10000.0])).round(5)
    array([1.225  , 0.41271])
    """
    temperature, pressure = standard_atmosphere(geopotential_height)
    return density(pressure, temperature)


def standard_height(pressure: Any) -> Any:
    """
    Geopotential height of a pressure in the standard atmosphere, inverse of the above.

    Parameters
    ----------
    pressure : array
        [Pa]

    Returns
    -------
    geopotential_height : array
        Pressure altitude; NaN outside -5 to 80 km. [m]

    Examples
    --------
    >>> standard_height(np.array([97520.0, 22632.0, 1000.0])).round(1)
    array([  321.7, 11000. , 31054.6])
    """
    p = np.asarray(pressure, dtype=float)
    height = np.full(p.shape, np.nan)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        for number, ((base, t_base, gradient), p_base) in enumerate(_STANDARD_BASES):
            here = p > 0 if number == 0 else p <= p_base
            if gradient:
                ratio = (p / p_base) ** (-GAS_CONSTANT * gradient / STANDARD_GRAVITY)
                h = base + t_base / gradient * (ratio - 1.0)
            else:
                h = base - scale_height(t_base) * np.log(p / p_base)
            height = np.where(here, h, height)
        inside = (p > 0) & (height >= STANDARD_LIMITS[0]) & (height <= STANDARD_LIMITS[1])
        return np.where(inside, height, np.nan)[()]


def _standard_bases() -> tuple[tuple[tuple[float, float, float], float], ...]:
    """Each layer of the standard atmosphere with the pressure at its base."""
    found, pressure = [], STANDARD_PRESSURE
    for layer, above in zip(STANDARD_LAYERS, (*STANDARD_LAYERS[1:], None), strict=True):
        found.append((layer, pressure))
        if above is None:
            break
        if layer[2]:
            exponent = -STANDARD_GRAVITY / (GAS_CONSTANT * layer[2])
            pressure *= (above[1] / layer[1]) ** exponent
        else:
            pressure *= float(np.exp(-(above[0] - layer[0]) / scale_height(layer[1])))
    return tuple(found)


_STANDARD_BASES = _standard_bases()
