r"""
The wind along a flight path: headwind, crosswind, and how the headwind changes on the way.

An aircraft that moves along ``heading`` (true, degrees clockwise from north) meets

.. math:: headwind = -(u \sin h + v \cos h), \qquad crosswind = -(u \cos h - v \sin h)

Headwind is positive against the aircraft, crosswind positive from its right.

On a straight path of slope :math:`\gamma` at ground speed :math:`V` the height changes by
:math:`V \tan\gamma` a second, so the headwind changes by that times its vertical gradient. A
headwind that falls along the path takes airspeed away: a loss.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.low_level_shear import FOOT, STEP, TOP
from backveer.profiles.low_levels import low_levels
from backveer.profiles.sliding_layer import layer_differences
from backveer.profiles.stack import Stack

STANDARD_GRAVITY = 9.80665  # m s-2, ISO 2533:1975
GLIDE_SLOPE = 3.0  # degree, the usual approach; common practice, no source
CLIMB_SLOPE = 3.3  # per cent, least climb gradient of departures; ICAO PANS-OPS, from memory
GROUND_SPEED = 140 * 1852.0 / 3600.0  # m s-1, 140 kt; common practice, no source


@dataclass(frozen=True, eq=False)
class FlightPath(Labelled):
    """
    Headwind and crosswind by runway, and the change of headwind on an approach and a departure.

    Rates and F are those of the layer as deep as ``step``, wherever it lies, over which the
    headwind changes most; between neighbouring levels where the levels span less than that.
    """

    runway: Floats = variable("degree", "runway", "true heading along which the aircraft moves")
    headwind: Floats = variable(
        "m s-1", "profile runway level", "against the aircraft positive, by level"
    )
    crosswind: Floats = variable(
        "m s-1", "profile runway level", "from the right of the aircraft positive, by level"
    )
    approach_change: Floats = variable(
        "m s-1", "profile runway", "headwind at the end of the descent minus at its start, gain +"
    )
    approach_worst_rate: Floats = variable(
        "s-1", "profile runway", "largest change of headwind per metre of descent, gain positive"
    )
    approach_worst_base: Floats = variable("m", "profile runway", "base of that layer")
    approach_worst_top: Floats = variable("m", "profile runway", "top of that layer")
    approach_worst_per_second: Floats = variable(
        "m s-2", "profile runway", "the same per second at the ground speed, gain positive"
    )
    approach_f_factor: Floats = variable(
        "1", "profile runway", "F-factor there, horizontal term only, loss of energy positive"
    )
    departure_change: Floats = variable(
        "m s-1", "profile runway", "headwind at the top of the climb minus at its start, gain +"
    )
    departure_worst_rate: Floats = variable(
        "s-1", "profile runway", "largest change of headwind per metre of climb, gain positive"
    )
    departure_worst_per_second: Floats = variable(
        "m s-2", "profile runway", "the same per second at the ground speed, gain positive"
    )
    departure_f_factor: Floats = variable(
        "1", "profile runway", "F-factor there, horizontal term only, loss of energy positive"
    )
    largest_loss: Floats = variable(
        "m s-1", "profile runway", "largest fall of headwind between two heights of an approach"
    )
    largest_gain: Floats = variable(
        "m s-1", "profile runway", "largest rise of headwind between two heights of an approach"
    )
    path_base: Floats = variable("m", "profile", "lowest height of the path: the lowest wind")
    path_top: Floats = variable("m", "profile", "highest: ``top``, or the highest wind below it")
    why: Words = variable("", "profile", "why nothing is said of the profile")
    ground_speed: float = GROUND_SPEED
    glide_slope: float = GLIDE_SLOPE
    climb_slope: float = CLIMB_SLOPE
    top: float = TOP
    step: float = STEP


def headwind(u: Any, v: Any, heading: Any) -> Any:
    """
    Wind against an aircraft that moves along ``heading``.

    Parameters
    ----------
    u, v : array
        Wind toward east and north. [m s-1]
    heading : array
        True heading, degrees clockwise from north. [degree]

    Returns
    -------
    headwind : array
        Negative for a tailwind. [m s-1]

    Examples
    --------
    >>> round(float(headwind(-10.0, 0.0, 90.0)), 6)
    10.0
    """
    angle = np.radians(heading)
    return -(u * np.sin(angle) + v * np.cos(angle))


def crosswind(u: Any, v: Any, heading: Any) -> Any:
    """
    Wind across an aircraft that moves along ``heading``, positive from its right. [m s-1].

    Examples
    --------
    A wind from the south is from the right of an aircraft that moves east.

    >>> round(float(crosswind(0.0, 10.0, 90.0)), 6)
    10.0
    """
    angle = np.radians(heading)
    return -(u * np.cos(angle) - v * np.sin(angle))


def flight_path(
    stack: Stack,
    headings: Floats,
    top: float = TOP,
    ground_speed: float = GROUND_SPEED,
    glide_slope: float = GLIDE_SLOPE,
    climb_slope: float = CLIMB_SLOPE,
    step: float = STEP,
) -> FlightPath:
    r"""
    Wind along straight paths through each profile, from ``top`` down to its lowest level and up.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    headings : array, shape (runway,)
        True headings along which aircraft land and depart. [degree]
    top
        Height above ground where the approach begins and the departure ends. [m]
    ground_speed
        Of the aircraft, constant. [m s-1]
    glide_slope
        Of the approach. [degree]
    climb_slope
        Of the departure, height over distance. [per cent]
    step
        Depth of the layer over which the largest rate is looked for: thinner ones show the noise of
        the measurement, and an aircraft passes them in a second or two. [m]

    Returns
    -------
    FlightPath
        NaN where the profile has fewer than two levels up to ``top``.

    Notes
    -----
    Of the F-factor only the horizontal term is given, because a profile knows no downdraught:

    .. math:: F = \frac{1}{g} \frac{dW_x}{dt}

    with the tailwind :math:`W_x`; positive where the aircraft loses energy. After Bowles, R. L.,
    1990: Reducing windshear risk through airborne systems technology, 17th Congress of the ICAS
    (from memory).

    Raises
    ------
    ValueError
        For a speed or a slope that is not positive.
    """
    if not min(ground_speed, glide_slope, climb_slope) > 0:
        raise ValueError("ground speed, glide slope and climb slope must be positive")
    headings = np.atleast_1d(np.asarray(headings, dtype=float))
    usable = stack.usable("wind")
    u = np.where(usable, stack.eastward_wind, np.nan)
    v = np.where(usable, stack.northward_wind, np.nan)
    count, z_path, w = low_levels(stack, top)
    enough = (count >= 2)[:, np.newaxis]
    path = _along(w, headings)
    worst, worst_base, worst_top = _steepest(z_path, w, headings, step)
    last = np.maximum(count - 1, 0)[:, np.newaxis]
    end = np.take_along_axis(path, last[..., np.newaxis], -1)[..., 0]
    rise = np.where(enough, end - path[..., 0], np.nan)
    sink = ground_speed * np.tan(np.radians(glide_slope))
    climb = ground_speed * climb_slope / 100.0
    loss, gain = _largest_changes(path)
    return FlightPath(
        runway=headings,
        headwind=headwind(u[:, np.newaxis], v[:, np.newaxis], headings[:, np.newaxis]),
        crosswind=crosswind(u[:, np.newaxis], v[:, np.newaxis], headings[:, np.newaxis]),
        approach_change=-rise,
        approach_worst_rate=-worst,
        approach_worst_base=worst_base,
        approach_worst_top=worst_top,
        approach_worst_per_second=-worst * sink,
        approach_f_factor=worst * sink / STANDARD_GRAVITY,
        departure_change=rise,
        departure_worst_rate=worst,
        departure_worst_per_second=worst * climb,
        departure_f_factor=-worst * climb / STANDARD_GRAVITY,
        largest_loss=np.where(enough, loss, np.nan),
        largest_gain=np.where(enough, gain, np.nan),
        path_base=np.where(enough[:, 0], z_path[:, 0], np.nan),
        path_top=np.where(enough[:, 0], np.take_along_axis(z_path, last, -1)[:, 0], np.nan),
        why=np.where(
            enough[:, 0],
            "",
            f"there are fewer than two usable winds up to {top / FOOT:.0f} ft ({top:.0f} m) "
            "above ground",
        ).astype(object),
        ground_speed=float(ground_speed),
        glide_slope=float(glide_slope),
        climb_slope=float(climb_slope),
        top=float(top),
        step=float(step),
    )


def _along(w: Any, headings: Floats) -> Floats:
    """Headwind of winds (profile, level) along each heading: (profile, runway, level)."""
    along: Floats = headwind(w.real[:, np.newaxis], w.imag[:, np.newaxis], headings[:, np.newaxis])
    return along


def _steepest(z: Floats, w: Any, headings: Floats, step: float) -> tuple[Floats, Floats, Floats]:
    """Largest change of headwind per metre of height, with its layer, each (profile, runway)."""
    rate, base, top = (np.full((z.shape[0], headings.size), np.nan) for _ in range(3))
    for depth in (step, 0.0):
        low, high, difference = layer_differences(z, w, depth)
        if low.shape[-1] == 0:
            continue
        with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
            rates = _along(difference / (high - low), headings)
        size = np.where(np.isfinite(rates), np.abs(rates), -1.0)
        largest = np.max(size, axis=-1, keepdims=True)
        # The lowest of layers that are equal to rounding.
        places = np.where(size >= largest * (1 - 1e-9), low[:, np.newaxis], np.inf)
        chosen = np.argmin(places, axis=-1)[..., np.newaxis]
        # Where the levels span less than a step their own pairs must do.
        use = (largest[..., 0] >= 0) & ~np.isfinite(rate)
        rate[use] = np.take_along_axis(rates, chosen, -1)[..., 0][use]
        base[use] = np.take_along_axis(low, chosen[..., 0], -1)[use]
        top[use] = np.take_along_axis(high, chosen[..., 0], -1)[use]
    return rate, base, top


def _largest_changes(path: Floats) -> tuple[Floats, Floats]:
    """
    Largest fall and rise of headwind between any two heights on the way down.

    On the way down the aircraft meets the levels from the last to the first; the largest fall from
    a level to any lower one is that level minus the smallest headwind below it.
    """
    below_min = np.fmin.accumulate(path, axis=-1)
    below_max = np.fmax.accumulate(path, axis=-1)
    with np.errstate(invalid="ignore"):
        loss = np.fmax.reduce(path - below_min, axis=-1)
        gain = np.fmax.reduce(below_max - path, axis=-1)
    return loss, gain
