r"""
The rotating earth: Coriolis parameter, the terms its horizontal form leaves out, gravity, heights.

The Coriolis acceleration of a wind (u eastward, v northward, w upward) at latitude
:math:`\varphi` (Holton, J. R., 2004: An Introduction to Dynamic Meteorology, 4th ed., ch. 2)

.. math::

    a_x = f v - \hat f w, \qquad a_y = -f u, \qquad a_z = \hat f u

with :math:`f = 2 \Omega \sin\varphi`, negative in the southern hemisphere and zero at the equator,
and its horizontal counterpart :math:`\hat f = 2 \Omega \cos\varphi`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.stack import Stack

OMEGA = 7.292115e-5  # s-1, WGS84 (NIMA TR8350.2; seen quoted in OEIS A125126)
STANDARD_GRAVITY = 9.80665  # m s-2, ISO 2533:1975
STANDARD_RADIUS = 6356766.0  # m, U.S. Standard Atmosphere, 1976, NOAA/NASA/USAF

# WGS84 normal gravity, formula of Somigliana (NIMA TR8350.2; constants seen in a transcription).
_GRAVITY_AT_EQUATOR = 9.7803253359  # m s-2
_GRAVITY_SLOPE = 0.00193185265241
_ECCENTRICITY_SQUARED = 0.00669437999013
_SEMI_MAJOR_AXIS = 6378137.0  # m
_FLATTENING = 1 / 298.257223563
_CENTRIFUGAL_RATIO = 0.00344978650684  # m of NIMA TR8350.2 (from memory)

NO_LATITUDE = "the latitude is not known"
OUTSIDE = "the latitude lies outside -90 to 90 degrees"


@dataclass(frozen=True, eq=False)
class Coriolis(Labelled):
    """The Coriolis parameter of each profile, and whether what divides by it may be asked."""

    coriolis_parameter: Floats = variable(
        "s-1", "profile", "2 Omega sin(latitude), negative in the south", "coriolis_parameter"
    )
    horizontal_coriolis_parameter: Floats = variable(
        "s-1", "profile", "2 Omega cos(latitude), in the terms that the horizontal form leaves out"
    )
    inertial_period: Floats = variable("s", "profile", "2 pi / |f|")
    applies: Bools = variable("1", "profile", "analyses that divide by f may be asked")
    why: Words = variable("", "profile", "why they decline")
    equator_limit: float = 5.0


def coriolis(stack: Stack, equator_limit: float = 5.0) -> Coriolis:
    """
    Coriolis parameter of each profile.

    Parameters
    ----------
    stack
        Profiles with a latitude.
    equator_limit
        Within this latitude the analyses that divide by f decline: there the balance they rest on
        is not that of the air (common practice, no source). [degree]

    Returns
    -------
    Coriolis
        ``coriolis_parameter`` is given at every known latitude; ``inertial_period`` is NaN on the
        equator.
    """
    latitude = np.where(np.abs(stack.latitude) <= 90, stack.latitude, np.nan)
    f = coriolis_parameter(latitude)
    applies = np.abs(latitude) > equator_limit
    near = f"the site is within {equator_limit:g} degrees of the equator, where f vanishes"
    why = np.select(
        [np.isnan(stack.latitude), np.isnan(latitude), ~applies], [NO_LATITUDE, OUTSIDE, near], ""
    )
    return Coriolis(
        coriolis_parameter=f,
        horizontal_coriolis_parameter=horizontal_coriolis_parameter(latitude),
        inertial_period=inertial_period(latitude),
        applies=applies,
        why=why.astype(object),
        equator_limit=float(equator_limit),
    )


def coriolis_parameter(latitude: Floats) -> Floats:
    r"""
    Coriolis parameter f. [s-1].

    Parameters
    ----------
    latitude : array
        North positive. [degree]

    Notes
    -----
    .. math:: f = 2 \Omega \sin\varphi

    Examples
    --------
    >>> coriolis_parameter(np.array([-30.0, 0.0, 45.0])).round(9)
    array([-7.29210e-05,  0.00000e+00,  1.03126e-04])
    """
    return 2.0 * OMEGA * np.sin(np.radians(latitude))


def horizontal_coriolis_parameter(latitude: Floats) -> Floats:
    r"""
    Horizontal counterpart of f, the same in both hemispheres. [s-1].

    .. math:: \hat f = 2 \Omega \cos\varphi
    """
    return 2.0 * OMEGA * np.cos(np.radians(latitude))


def coriolis_acceleration(
    u: Floats, v: Floats, w: Floats, latitude: Floats
) -> tuple[Floats, Floats, Floats]:
    """
    All three components of the Coriolis acceleration.

    Parameters
    ----------
    u, v, w : array
        Wind toward east, north and up. [m s-1]
    latitude : array
        North positive. [degree]

    Returns
    -------
    eastward, northward, upward : array
        An eastward wind in the north is accelerated southward and upward. [m s-2]

    Examples
    --------
    >>> east, north, up = coriolis_acceleration(10.0, 0.0, 0.0, 45.0)
    >>> round(float(north), 7), round(float(up), 7)
    (-0.0010313, 0.0010313)
    """
    f, f_hat = coriolis_parameter(latitude), horizontal_coriolis_parameter(latitude)
    return f * v - f_hat * w, -f * u, f_hat * u


def neglected_terms(u: Floats, v: Floats, w: Floats, latitude: Floats) -> tuple[Floats, Floats]:
    r"""
    Size of what the horizontal form of the Coriolis acceleration leaves out.

    Parameters
    ----------
    u, v, w : array
        Wind toward east, north and up. [m s-1]
    latitude : array
        North positive. [degree]

    Returns
    -------
    eastward : array
        :math:`|\hat f w|` over the size :math:`|f| \sqrt{u^2 + v^2}` of the horizontal
        acceleration; infinite at the equator, NaN without a wind. [1]
    upward : array
        :math:`|\hat f u| / g`. [1]

    Examples
    --------
    With 10 m/s, 1 cm/s and 45 degrees, 1 in 1000 (checks, section 11: derived).

    >>> round(float(neglected_terms(0.0, 10.0, 0.01, 45.0)[0]), 6)
    0.001
    """
    f, f_hat = coriolis_parameter(latitude), horizontal_coriolis_parameter(latitude)
    with np.errstate(divide="ignore", invalid="ignore"):
        eastward = np.abs(f_hat * w) / (np.abs(f) * np.hypot(u, v))
    return eastward, np.abs(f_hat * u) / gravity(latitude)


def inertial_period(latitude: Floats) -> Floats:
    r"""
    Inertial period, NaN on the equator where there is none. [s].

    .. math:: T = 2 \pi / |f|

    (American Meteorological Society, Glossary of Meteorology, "inertial oscillation".)

    Examples
    --------
    >>> round(float(inertial_period(30.0)) / 3600, 3)
    23.934
    """
    f = np.abs(coriolis_parameter(latitude))
    with np.errstate(divide="ignore"):
        return np.where(f > 0, 2.0 * np.pi / np.where(f > 0, f, 1.0), np.nan)


def gravity(latitude: Floats, altitude: Floats = 0.0) -> Floats:  # type: ignore[assignment]
    r"""
    Return the normal gravity of the WGS84 ellipsoid. [m s-2].

    Parameters
    ----------
    latitude : array
        Geodetic latitude. [degree]
    altitude : array
        Height above the ellipsoid, here taken as that above mean sea level. [m]

    Notes
    -----
    Somigliana's formula, and its expansion with height (NIMA TR8350.2, 1997: Department of Defense
    World Geodetic System 1984, equations 4-1 and 4-3; the numbers of the equations from memory):

    .. math::

        \gamma_0 = \gamma_e \frac{1 + k \sin^2\varphi}{\sqrt{1 - e^2 \sin^2\varphi}}, \qquad
        \gamma = \gamma_0 \left[1 - \frac{2}{a}(1 + f + m - 2 f \sin^2\varphi) h
        + \frac{3 h^2}{a^2}\right]

    Examples
    --------
    >>> round(float(gravity(45.0)), 7)
    9.8061978
    """
    sine2 = np.sin(np.radians(latitude)) ** 2
    at_ground = (
        _GRAVITY_AT_EQUATOR
        * (1.0 + _GRAVITY_SLOPE * sine2)
        / np.sqrt(1.0 - _ECCENTRICITY_SQUARED * sine2)
    )
    slope = 1.0 + _FLATTENING + _CENTRIFUGAL_RATIO - 2.0 * _FLATTENING * sine2
    ratio = np.asarray(altitude) / _SEMI_MAJOR_AXIS
    return at_ground * (1.0 - 2.0 * slope * ratio + 3.0 * ratio**2)


def geopotential_height(altitude: Floats) -> Floats:
    r"""
    Geopotential height of a geometric altitude. [m].

    .. math:: H = \frac{R z}{R + z}, \qquad R = 6356766\ \mathrm{m}

    (U.S. Standard Atmosphere, 1976, NOAA/NASA/USAF: standard gravity at z = 0, where a site's own
    differs by up to 0.27 per cent.)

    Examples
    --------
    >>> round(float(geopotential_height(10000.0)), 3)
    9984.293
    """
    altitude = np.asarray(altitude, dtype=float)
    return STANDARD_RADIUS * altitude / (STANDARD_RADIUS + altitude)


def geometric_altitude(geopotential_height: Floats) -> Floats:
    """
    Geometric altitude of a geopotential height, the inverse of :func:`geopotential_height`. [m].

    Examples
    --------
    >>> round(float(geometric_altitude(11000.0)), 2)
    11019.07
    """
    height = np.asarray(geopotential_height, dtype=float)
    return STANDARD_RADIUS * height / (STANDARD_RADIUS - height)
