"""
The rotating, flattened Earth: Coriolis acceleration, gravity and geopotential.

The mirror holds exactly: latitude to -latitude with v to -v mirrors every answer. A latitude
outside -90 to 90 degrees gives NaN here, for one bad profile must not stop the others; the readers
refuse it, and :func:`coriolis` says why.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.stack import Stack

OMEGA = 7.292115e-5  # s-1, angular velocity: NIMA, 2000, TR8350.2 (WGS84), 7292115.0e-11
STANDARD_GRAVITY = 9.80665  # m s-2, ISO 2533:1975; also the unit of the geopotential metre
EARTH_RADIUS = 6356766.0  # m, nominal, for geopotential height: ISO 2533:1975
# WGS84, NIMA, 2000, TR8350.2, Department of Defense World Geodetic System 1984, tables 3.1 to 3.4.
EQUATORIAL_GRAVITY = 9.7803253359  # m s-2
SOMIGLIANA = 0.00193185265241  # the theoretical (normal) gravity formula constant
ECCENTRICITY_SQUARED = 0.00669437999013
SEMI_MAJOR_AXIS = 6378137.0  # m
FLATTENING = 1.0 / 298.257223563
GRAVITY_RATIO = 0.00344978650684  # omega^2 a^2 b / GM (from memory)

# Common practice: within 5 degrees of the equator the wind is far from geostrophic.
EQUATOR_LIMIT = 5.0
NO_LATITUDE = "the latitude is not known"
BAD_LATITUDE = "the latitude lies outside -90 to 90 degrees"


@dataclass(frozen=True, eq=False)
class Coriolis(Labelled):
    """The Coriolis parameter of each profile, and whether an analysis may divide by it."""

    coriolis_parameter: Floats = variable(
        "s-1",
        "profile",
        "f = 2 Omega sin(latitude), negative in the southern hemisphere",
        "coriolis_parameter",
    )
    horizontal_coriolis_parameter: Floats = variable(
        "s-1", "profile", "2 Omega cos(latitude), never negative"
    )
    inertial_period: Floats = variable("s", "profile", "2 pi / |f|, missing on the equator")
    applies: Bools = variable("", "profile", "whether analyses that divide by f are made")
    why: Words = variable("", "profile", "why they decline")
    equator_limit: float = EQUATOR_LIMIT


@dataclass(frozen=True, eq=False)
class NeglectedTerms:
    r"""
    What the horizontal form of the Coriolis acceleration leaves out, and how much that is.

    Attributes
    ----------
    eastward
        :math:`-2 \Omega w \cos\phi`, left out of the eastward equation. [m s-2]
    eastward_fraction
        Its size beside that of :math:`2 \Omega v \sin\phi`, which is kept; NaN where that is 0.
    upward
        :math:`2 \Omega u \cos\phi`, left out of the vertical equation. [m s-2]
    upward_fraction
        Its size beside that of gravity.
    """

    eastward: Floats
    eastward_fraction: Floats
    upward: Floats
    upward_fraction: Floats


def coriolis_parameter(latitude: Any) -> Any:
    r"""
    Coriolis parameter :math:`f = 2 \Omega \sin\phi`.

    Parameters
    ----------
    latitude : array
        North positive; NaN comes back outside -90 to 90. [degree]

    Returns
    -------
    f : array
        Positive in the northern hemisphere, negative in the southern, 0 on the equator. [s-1]

    Examples
    --------
    >>> coriolis_parameter(np.array([30.0, -30.0, 0.0]))
    array([ 7.292115e-05, -7.292115e-05,  0.000000e+00])
    """
    return 2.0 * OMEGA * np.sin(_radians(latitude))


def horizontal_coriolis_parameter(latitude: Any) -> Any:
    r"""
    Horizontal counterpart of the Coriolis parameter, :math:`2 \Omega \cos\phi`.

    Parameters
    ----------
    latitude : array
        North positive; NaN comes back outside -90 to 90. [degree]

    Returns
    -------
    parameter : array
        Never negative, 0 at the poles, largest on the equator. [s-1]

    Examples
    --------
    >>> horizontal_coriolis_parameter(np.array([60.0, -60.0, 90.0]))
    array([7.292115e-05, 7.292115e-05, 0.000000e+00])
    """
    radians = _radians(latitude)
    # pi / 2 is no floating-point number: its cosine is 6e-17, and the pole has none.
    cosine = np.where(np.abs(radians) == np.pi / 2.0, 0.0, np.cos(radians))
    return 2.0 * OMEGA * cosine


def coriolis_acceleration(u: Any, v: Any, w: Any, latitude: Any) -> tuple[Any, Any, Any]:
    r"""
    Coriolis acceleration of moving air, with all its terms.

    Parameters
    ----------
    u, v, w : array
        Wind toward east, toward north and upward. [m s-1]
    latitude : array
        North positive. [degree]

    Returns
    -------
    eastward, northward, upward : array
        [m s-2]

    Notes
    -----
    The components of :math:`-2 \mathbf{\Omega} \times \mathbf{v}` with
    :math:`\mathbf{\Omega} = \Omega (0, \cos\phi, \sin\phi)`:

    .. math::
        a_x &= 2 \Omega (v \sin\phi - w \cos\phi) \\
        a_y &= -2 \Omega u \sin\phi \\
        a_z &= 2 \Omega u \cos\phi

    A wind toward the east in the northern hemisphere is accelerated southward and upward. Moving
    air is never given energy: the acceleration is at right angles to the motion.

    References
    ----------
    Coriolis, G.-G., 1835: Mémoire sur les équations du mouvement relatif des systèmes de corps.
    J. École Polytechnique, 15, 144-154 (from memory).

    Examples
    --------
    >>> east, north, up = coriolis_acceleration(10.0, 0.0, 0.0, latitude=60.0)
    >>> east.round(6), north.round(6), up.round(6)
    (np.float64(0.0), np.float64(-0.001263), np.float64(0.000729))
    """
    u, v, w = (np.asarray(x, dtype=float) for x in (u, v, w))
    f, f_horizontal = coriolis_parameter(latitude), horizontal_coriolis_parameter(latitude)
    with np.errstate(invalid="ignore", over="ignore", under="ignore"):
        return f * v - f_horizontal * w, -f * u, f_horizontal * u


def neglected_terms(u: Any, v: Any, w: Any, latitude: Any) -> NeglectedTerms:
    """
    Size of the Coriolis terms that the horizontal form (f v, -f u) leaves out.

    Parameters
    ----------
    u, v, w : array
        Wind toward east, toward north and upward. [m s-1]
    latitude : array
        North positive. [degree]

    Returns
    -------
    NeglectedTerms
        Each term as an acceleration and beside what it is left out against.

    Examples
    --------
    >>> left_out = neglected_terms(10.0, 10.0, 0.01, latitude=45.0)
    >>> left_out.eastward_fraction.round(6), left_out.upward_fraction.round(6)
    (np.float64(0.001), np.float64(0.000105))
    """
    kept = np.asarray(coriolis_parameter(latitude) * np.asarray(v, dtype=float))
    f_horizontal = horizontal_coriolis_parameter(latitude)
    with np.errstate(invalid="ignore", over="ignore", under="ignore", divide="ignore"):
        eastward = -f_horizontal * np.asarray(w, dtype=float)
        upward = f_horizontal * np.asarray(u, dtype=float)
        fraction = np.where(kept == 0, np.nan, np.abs(eastward) / np.abs(kept))
        return NeglectedTerms(
            eastward=eastward,
            eastward_fraction=fraction[()],
            upward=upward,
            upward_fraction=np.abs(upward) / gravity(latitude),
        )


def inertial_period(f: Any) -> Any:
    r"""
    Period of a free inertial oscillation, :math:`2 \pi / |f|`.

    Parameters
    ----------
    f : array
        Coriolis parameter, of either sign. [s-1]

    Returns
    -------
    period : array
        Half a sidereal day at the poles, a whole one at 30 degrees. NaN on the equator, where
        nothing oscillates. [s]

    References
    ----------
    American Meteorological Society: Glossary of Meteorology, "Inertial oscillation".

    Examples
    --------
    >>> (inertial_period(coriolis_parameter(-30.0)) / 3600.0).round(3)
    np.float64(23.934)
    """
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        period = 2.0 * np.pi / np.abs(np.asarray(f, dtype=float))
    return np.where(np.isfinite(period), period, np.nan)[()]


def gravity(latitude: Any, altitude: Any = 0.0) -> Any:
    r"""
    Gravity of the WGS84 ellipsoid, the centrifugal part included.

    Parameters
    ----------
    latitude : array
        North positive. [degree]
    altitude : array
        Above the ellipsoid, which is within 110 m of sea level. [m]

    Returns
    -------
    g : array
        Downward. [m s-2]

    Notes
    -----
    On the ellipsoid the closed formula of Somigliana, above it the expansion to second order in the
    altitude h, TR8350.2 equations (4-1) and (4-3) [1]_:

    .. math::
        g_0 &= g_e \frac{1 + k \sin^2\phi}{\sqrt{1 - e^2 \sin^2\phi}} \\
        g &= g_0 \left[1 - \frac{2}{a} (1 + f + m - 2 f \sin^2\phi) h + \frac{3}{a^2} h^2\right]

    References
    ----------
    .. [1] NIMA, 2000: Department of Defense World Geodetic System 1984. TR8350.2, third edition
       (equation numbers from memory).

    Examples
    --------
    >>> gravity(45.0).round(6), gravity(45.0, 10000.0).round(4)
    (np.float64(9.806198), np.float64(9.7754))
    """
    sine2 = np.sin(_radians(latitude)) ** 2
    ratio = np.asarray(altitude, dtype=float) / SEMI_MAJOR_AXIS
    surface = (
        EQUATORIAL_GRAVITY
        * (1.0 + SOMIGLIANA * sine2)
        / np.sqrt(1.0 - ECCENTRICITY_SQUARED * sine2)
    )
    slope = 1.0 + FLATTENING + GRAVITY_RATIO - 2.0 * FLATTENING * sine2
    with np.errstate(invalid="ignore", over="ignore", under="ignore"):
        return surface * (1.0 - 2.0 * slope * ratio + 3.0 * ratio**2)


def geopotential_height(altitude: Any, latitude: Any = None) -> Any:
    r"""
    Geopotential height of a geometric altitude.

    Parameters
    ----------
    altitude : array
        Above mean sea level. [m]
    latitude : array, optional
        With it, the gravity of that latitude; without it, that of ISO 2533. [degree]

    Returns
    -------
    geopotential_height : array
        NaN below half an Earth radius under the sea. [m]

    Notes
    -----
    .. math:: H = \Gamma \frac{R Z}{R + Z}

    with :math:`\Gamma = 1` and R = 6356766 m in ISO 2533:1975 [1]_; with a latitude
    :math:`\Gamma = g_0(\phi) / 9.80665` and
    :math:`R = a / (1 + f + m - 2 f \sin^2\phi)`, which gives gravity its true decrease with
    height [2]_.

    References
    ----------
    .. [1] ISO 2533:1975, Standard Atmosphere.
    .. [2] WMO-No. 8, Guide to Instruments and Methods of Observation, upper-air pressure,
       temperature and humidity, after M. J. Mahoney (from memory; R follows from the formula of
       :func:`gravity`).

    Examples
    --------
    >>> geopotential_height(np.array([1000.0, 10000.0])).round(3)
    array([ 999.843, 9984.293])
    >>> geopotential_height(10000.0, latitude=70.0).round(1)
    np.float64(10004.1)
    """
    z = np.asarray(altitude, dtype=float)
    radius, ratio = _radius(latitude)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        height = ratio * radius * (z / (radius + z))
        return np.where(z > -0.5 * radius, height, np.nan)[()]


def geometric_altitude(geopotential_height: Any, latitude: Any = None) -> Any:
    r"""
    Geometric altitude of a geopotential height, the inverse of :func:`geopotential_height`.

    Parameters
    ----------
    geopotential_height : array
        [m]
    latitude : array, optional
        As there. [degree]

    Returns
    -------
    altitude : array
        :math:`Z = R H / (\Gamma R - H)`; NaN where no altitude has that geopotential. [m]

    Examples
    --------
    >>> geometric_altitude(11000.0).round(2)
    np.float64(11019.07)
    """
    h = np.asarray(geopotential_height, dtype=float)
    radius, ratio = _radius(latitude)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        altitude = radius * (h / (ratio * radius - h))
        exists = (h < ratio * radius) & (altitude > -0.5 * radius)
        return np.where(exists, altitude, np.nan)[()]


def coriolis(stack: Stack, equator_limit: float = EQUATOR_LIMIT) -> Coriolis:
    """
    Coriolis parameter of each profile, and whether it is large enough to divide by.

    Parameters
    ----------
    stack
        Profiles with their latitude.
    equator_limit
        Analyses that divide by f decline at and within this distance from the equator. [degree]

    Returns
    -------
    Coriolis
        ``coriolis_parameter`` is given wherever the latitude is known, near the equator too.

    Raises
    ------
    ValueError
        If the limit is not between 0 and 90.

    Examples
    --------
    >>> told = coriolis(Stack.of(latitude=[52.0, -3.0, np.nan], height=[[10.0]]))
    >>> told.applies.tolist(), told.why.tolist()[1]
    ([True, False, False], 'the site lies within 5 degrees of the equator')
    """
    if not 0.0 <= equator_limit <= 90.0:
        raise ValueError(
            f"the equator limit is {equator_limit:g} degrees. Give a distance of 0 to 90 degrees."
        )
    latitude = np.array(stack.latitude, dtype=float)
    f = coriolis_parameter(latitude)
    known = np.isfinite(f)
    with np.errstate(invalid="ignore"):
        applies = known & (np.abs(latitude) > equator_limit) & (f != 0)
    near = f"the site lies within {equator_limit:g} degrees of the equator"
    if equator_limit == 0.0:
        near = "the site lies on the equator"
    why = np.select(
        [np.isnan(latitude), ~known, ~applies], [NO_LATITUDE, BAD_LATITUDE, near], default=""
    )
    return Coriolis(
        coriolis_parameter=f,
        horizontal_coriolis_parameter=horizontal_coriolis_parameter(latitude),
        inertial_period=inertial_period(f),
        applies=applies,
        why=why.astype(object),
        equator_limit=float(equator_limit),
    )


def _radians(latitude: Any) -> Any:
    """Latitude in radians, NaN where it is none."""
    degrees = np.asarray(latitude, dtype=float)
    with np.errstate(invalid="ignore"):
        return np.radians(np.where(np.abs(degrees) <= 90.0, degrees, np.nan))


def _radius(latitude: Any) -> tuple[Any, Any]:
    """Radius of the geopotential formula and gravity on the ground over standard gravity."""
    if latitude is None:
        return EARTH_RADIUS, 1.0
    sine2 = np.sin(_radians(latitude)) ** 2
    radius = SEMI_MAJOR_AXIS / (1.0 + FLATTENING + GRAVITY_RATIO - 2.0 * FLATTENING * sine2)
    return radius, gravity(latitude) / STANDARD_GRAVITY
