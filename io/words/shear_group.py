"""
The candidate wind-shear group of the TAF code and its plain sentence.

Candidates for a forecaster's judgement: nothing here is an issued warning. The group is that of
non-convective low-level wind shear, ``WShhh/dddffKT``: hhh the top of the layer in hundreds of
feet, ddd and ff the wind there (US NWS forecaster training text on the TAF, seen there:
WS020/27035KT is the layer from the surface to 2000 ft with 270 degrees 35 kt at 2000 ft; the layer
never ends above 2000 ft).

Rounding: the height to the nearest hundred feet, at least 001; the direction to the nearest ten
degrees, north as 360; the speed to the nearest knot, in two figures, three from 100 kt.
"""

from __future__ import annotations

import numpy as np

from backveer.io.words.shear_sentence import half_up
from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats, Words
from backveer.profiles.low_level_shear import FOOT, KNOT, SURFACE_LIMIT
from backveer.profiles.stack import Stack, wind_from_direction

HIGHEST = 2000 * FOOT


def group(height: float, direction: float, speed: float) -> str:
    """
    Write the group for a layer from the surface to ``height``.

    Parameters
    ----------
    height
        Top of the layer above ground. [m]
    direction, speed
        Wind there: from, degrees true; [m s-1].

    Examples
    --------
    >>> group(2000 * FOOT, 270.0, 35 * KNOT)
    'WS020/27035KT'
    >>> group(1500 * FOOT, 297.0, 23.15)
    'WS015/30045KT'
    """
    hundreds = max(1, half_up(height / FOOT / 100))
    tens = half_up(direction / 10) % 36 or 36
    return f"WS{hundreds:03d}/{tens * 10:03d}{half_up(speed / KNOT):02d}KT"


def candidate_groups(stack: Stack, wanted: Bools) -> tuple[Words, Floats]:
    """
    Write a candidate group for each profile in which some criterion is met.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    wanted : array of bool, shape (profile,)
        Where a group is to be given.

    Returns
    -------
    groups : array of str, shape (profile,)
        Empty where none is wanted, or where the surface wind is not known.
    heights : array, shape (profile,)
        Top of the layer: the level, not above 2000 ft, whose wind differs most from the wind at the
        surface. [m]
    """
    usable = stack.usable("wind")
    with np.errstate(invalid="ignore"):
        below = usable & (stack.height <= HIGHEST * (1 + 1e-9))
    count, z, w = compact(below, stack.height, stack.eastward_wind + 1j * stack.northward_wind)
    with np.errstate(invalid="ignore"):
        known = wanted & (count >= 2) & (z[:, 0] <= SURFACE_LIMIT)
        apart = np.abs(w - w[:, :1])
    highest = np.argmax(np.where(np.isfinite(apart), apart, -1.0), axis=-1)
    heights = np.where(known, np.take_along_axis(z, highest[:, np.newaxis], -1)[:, 0], np.nan)
    groups = np.full(stack.profile_count, "", dtype=object)
    for row in np.flatnonzero(known):
        wind = w[row, highest[row]]
        direction = float(wind_from_direction(wind.real, wind.imag))
        # Beyond three figures no wind is one; a checked stack holds none.
        if np.isfinite(direction) and np.abs(wind) < 999 * KNOT:
            groups[row] = group(float(heights[row]), direction, float(np.abs(wind)))
    return groups, heights
