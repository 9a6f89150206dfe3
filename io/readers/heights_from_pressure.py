"""
Heights from pressure: hypsometric where there is temperature, otherwise of the standard atmosphere.

Pressure gives depths; where they begin has to be known. The lowest level is the ground only where
that can be defended: it has the pressure that the elevation of the site lets expect or, where no
elevation is known, a pressure as a barometer reads it and no isobaric level. Where the lowest level
lies aloft, its altitude is that of the standard atmosphere, as of a flight level.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.place_and_time import cannot_place
from backveer.profiles.air import standard_height
from backveer.profiles.earth import geometric_altitude, geopotential_height
from backveer.profiles.flags import BIT
from backveer.profiles.hydrostatics import hypsometric_altitude

Array = NDArray[np.float64]

# How far the weather and a cold or warm day put the standard height of a pressure off: 965 to
# 1063 hPa at the sea (common practice, no source).
WEATHER = 400.0  # m
_ISOBARIC = 2500.0  # Pa, between levels of constant pressure such as 850 or 925 hPa
_HIGHEST_GROUND = 45e3  # Pa: people launch balloons up to 6 km above the sea


class Heights(NamedTuple):
    """
    Heights derived from pressure.

    Attributes
    ----------
    height, altitude : array, shape (profile, level)
        Above ground and above sea level; the latter NaN where no elevation is known. [m]
    flag : array of uint32, shape (profile, level)
        How each was derived.
    remark
        The same in words.
    """

    height: Array
    altitude: Array
    flag: NDArray[np.uint32]
    remark: str


def heights_from_pressure(
    pressure: Array,
    temperature: Array | None,
    dew_point: Array | None,
    elevation: Any,
    latitude: Any,
    flight_levels: bool = False,
) -> Heights:
    """
    Derive heights from pressure.

    Parameters
    ----------
    pressure, temperature, dew_point : array, shape (profile, level)
        [Pa], [K], [K]
    elevation, latitude : array, shape (profile,) or ()
        NaN where not known. [m], [degree]
    flight_levels
        Whether the pressures were written as flight levels, which never begin at the ground.

    Raises
    ------
    MissingColumn
        No profile's lowest level can be defended as the ground, and no elevation is known.
    """
    p = pressure
    base = np.broadcast_to(np.asarray(elevation, dtype=float), p.shape[:1])
    of_place = np.broadcast_to(np.asarray(latitude, dtype=float), p.shape[:1])
    place = of_place if np.isfinite(of_place).any() else None
    lowest = np.fmax.reduce(p, axis=-1)
    aloft = np.asarray(geometric_altitude(standard_height(lowest)), dtype=float)
    known = np.isfinite(base)
    if flight_levels:
        ground = np.zeros(known.shape, dtype=bool)
    else:
        with np.errstate(invalid="ignore"):
            ground = np.where(known, np.abs(aloft - base) <= WEATHER, _as_of_a_barometer(lowest))
    lost = ~known & ~ground & np.isfinite(lowest)
    if lost.any() and not (known | ground).any():
        raise _not_known(float(lowest[lost][0]), flight_levels)
    start = np.where(ground, np.where(known, base, 0.0), np.where(known, aloft, np.nan))

    altitude = np.full(p.shape, np.nan)
    flag = np.zeros(p.shape, dtype=np.uint32)
    by = []
    too_far = 0
    if temperature is not None:
        altitude = np.array(hypsometric_altitude(p, temperature, dew_point, start, place))
        good = np.isfinite(altitude)
        flag[good] = BIT["height_from_hypsometric_equation"]
        warm = good.any(axis=-1)
        too_far = int(np.count_nonzero(np.isfinite(p[warm]) & ~good[warm]))
        by += ["by the hypsometric equation"] if warm.any() else []
    cold = ~np.isfinite(altitude).any(axis=-1) & np.isfinite(start)
    if cold.any():
        above = standard_height(p[cold]) - standard_height(lowest[cold])[:, np.newaxis]
        begin = geopotential_height(start[cold])[:, np.newaxis]
        altitude[cold] = geometric_altitude(above + begin)
        flag[cold] |= np.where(
            np.isfinite(altitude[cold]),
            np.uint32(BIT["height_from_standard_atmosphere"]),
            np.uint32(0),
        )
        by.append("by the standard atmosphere, for want of temperature")
    raised = known & ~ground
    standard = np.isfinite(altitude) & raised[:, np.newaxis]
    flag[standard] |= np.uint32(BIT["height_from_standard_atmosphere"])

    remark = f"heights were derived from pressure {' and '.join(by)}"
    if too_far:
        levels = "level is" if too_far == 1 else "levels are"
        remark += f" ({too_far} {levels} too far from any temperature)"
    if ground.any():
        remark += "; the lowest level was taken as the surface"
    if flight_levels:
        remark += (
            "; flight levels are altitudes of the standard atmosphere, from which the weather puts "
            "the true ones off by some 300 m"
        )
    elif raised.any():
        some = "" if raised.all() else f" in {int(raised.sum())} of {raised.size} profiles"
        remark += (
            f"; the lowest level ({lowest[raised][0] / 100.0:g} hPa) is not at the ground "
            f"({base[raised][0]:g} m){some}: heights begin at its altitude in the standard "
            "atmosphere, from which the weather puts the true one off by some 300 m"
        )
    if lost.any():
        remark += (
            f"; {int(lost.sum())} of {lost.size} profiles have no heights, for their lowest level "
            "may not be the ground and no elevation is known"
        )
    # The ground is at 0 exactly, whatever geopotential and geometric heights round to.
    zero = np.where(ground, np.fmin.reduce(altitude, axis=-1), base)
    height = altitude - zero[:, np.newaxis]
    return Heights(height, np.where(known[:, np.newaxis], altitude, np.nan), flag, remark)


def _as_of_a_barometer(pressure: Array) -> NDArray[np.bool_]:
    """Say whether a lowest pressure is one of the ground rather than an isobaric level."""
    off = np.abs(pressure - np.round(pressure / _ISOBARIC) * _ISOBARIC)
    read: NDArray[np.bool_] = (off > 1.0) & (pressure > _HIGHEST_GROUND)
    return read


def _not_known(lowest: float, flight_levels: bool) -> Exception:
    what = (
        "flight levels are counted from 1013.25 hPa"
        if flight_levels
        else f"the lowest level, {lowest / 100.0:g} hPa, may not be the ground"
    )
    return cannot_place(
        "elevation",
        f"{what}, and the elevation of the site is not known: heights above ground cannot be had",
    )
