"""
Geostrophic balance: the wind that the pressure field would carry without friction or acceleration.

Gradients of pressure or slopes of pressure surfaces give it; the departure is the rest of the wind.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.labels import Floats

GRAVITY = 9.80665  # standard gravity [m s-2], ISO 2533:1975


def geostrophic_wind(
    eastward_pressure_gradient: Any, northward_pressure_gradient: Any, density: Any, f: Any
) -> tuple[Any, Any]:
    r"""
    Geostrophic wind from the horizontal pressure gradient.

    Parameters
    ----------
    eastward_pressure_gradient, northward_pressure_gradient : array
        Positive where pressure grows toward east, toward north. [Pa m-1]
    density : array
        Of the air. [kg m-3]
    f : array
        Coriolis parameter, negative in the southern hemisphere. [s-1]

    Returns
    -------
    u, v : array
        Toward east and north; not finite where f is zero. [m s-1]

    Notes
    -----
    .. math:: u_g = -\frac{1}{\rho f}\frac{\partial p}{\partial y}, \qquad
              v_g = \frac{1}{\rho f}\frac{\partial p}{\partial x}

    (Stull, 2017: Practical Meteorology, chapter on forces and winds).

    Examples
    --------
    >>> u, v = geostrophic_wind(0.0, -2000.0 / 800e3, density=1.2, f=1.1e-4)
    >>> round(float(u), 2), float(v)
    (18.94, 0.0)
    """
    with np.errstate(divide="ignore", invalid="ignore", over="ignore", under="ignore"):
        scale = 1.0 / (np.asarray(density, dtype=float) * f)
        u = -scale * np.asarray(northward_pressure_gradient, dtype=float)
        return u, scale * np.asarray(eastward_pressure_gradient, dtype=float)


def geostrophic_wind_from_height(
    eastward_slope: Any, northward_slope: Any, f: Any, gravity: Any = GRAVITY
) -> tuple[Any, Any]:
    r"""
    Geostrophic wind from the slope of a surface of constant pressure.

    Parameters
    ----------
    eastward_slope, northward_slope : array
        Change of the height of the surface toward east and north. [m m-1]
    f : array
        Coriolis parameter. [s-1]
    gravity : array
        Standard gravity when the heights are geopotential. [m s-2]

    Returns
    -------
    u, v : array
        Toward east and north; not finite where f is zero. [m s-1]

    Notes
    -----
    .. math:: u_g = -\frac{g}{f}\frac{\partial z}{\partial y}, \qquad
              v_g = \frac{g}{f}\frac{\partial z}{\partial x}

    Examples
    --------
    >>> u, v = geostrophic_wind_from_height(50.0 / 200e3, 0.0, f=0.9e-4)
    >>> round(float(v), 1)
    27.2
    """
    return geostrophic_wind(eastward_slope, northward_slope, 1.0 / np.asarray(gravity), f)


def departure(wind: Any, geostrophic: Any, f: Any) -> tuple[Floats, Floats]:
    """
    Wind minus geostrophic wind, along the geostrophic wind and across it.

    Parameters
    ----------
    wind, geostrophic : complex array
        East + i north. [m s-1]
    f : array
        Coriolis parameter, whose sign says on which side low pressure lies. [s-1]

    Returns
    -------
    along, across : array
        Across is positive toward low pressure, in both hemispheres. NaN where the geostrophic
        wind is zero. [m s-1]

    Examples
    --------
    >>> along, across = departure(6.0 + 3.0j, 10.0 + 0.0j, f=1e-4)
    >>> float(along), float(across)
    (-4.0, 3.0)
    >>> [float(x) for x in departure(6.0 - 3.0j, 10.0 + 0.0j, f=-1e-4)]
    [-4.0, 3.0]
    """
    wind, geostrophic = np.asarray(wind), np.asarray(geostrophic)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        speed = np.hypot(geostrophic.real, geostrophic.imag)
        east, north = geostrophic.real / speed, geostrophic.imag / speed
        u, v = wind.real - geostrophic.real, wind.imag - geostrophic.imag
        return u * east + v * north, (v * east - u * north) * np.sign(f)
