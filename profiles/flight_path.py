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

import numpy as np

from backveer.profiles.grid import at_height, compact
from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.low_level_shear import TOP
from backveer.profiles.stack import Stack

STANDARD_GRAVITY = 9.80665  # m s-2, ISO 2533:1975
GLIDE_SLOPE = 3.0  # degree, the usual approach; common practice, no source
CLIMB_SLOPE = 3.3  # per cent, least climb gradient of departures; ICAO PANS-OPS, from memory
GROUND_SPEED = 140 * 1852.0 / 3600.0  # m s-1, 140 kt; common practice, no source


@dataclass(frozen=True, eq=False)
class FlightPath(Labelled):
    """
    Headwind and crosswind by runway, and the change of headwind on an approach and a departure.

    Rates and F are those of the segment between two neighbouring levels where the change of
    headwind per height is largest in size.
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
    approach_worst_base: Floats = variable("m", "profile runway", "base of that segment")
    approach_worst_top: Floats = variable("m", "profile runway", "top of that segment")
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
    why: Words = variable("", "profile", "why nothing is said of the profile")
    ground_speed: float = GROUND_SPEED
    glide_slope: float = GLIDE_SLOPE
    climb_slope: float = CLIMB_SLOPE
    top: float = TOP


def headwind(u: Floats, v: Floats, heading: Floats) -> Floats:
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


def crosswind(u: Floats, v: Floats, heading: Floats) -> Floats:
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
    z = np.where(usable, stack.height, np.nan)[:, np.newaxis, :]
    u = np.where(usable, stack.eastward_wind, np.nan)[:, np.newaxis, :]
    v = np.where(usable, stack.northward_wind, np.nan)[:, np.newaxis, :]
    along = headings[:, np.newaxis]
    head, cross = headwind(u, v, along), crosswind(u, v, along)

    z = np.broadcast_to(z, head.shape)
    cut = at_height(z, head, [top])
    below = np.isfinite(head) & (np.where(np.isfinite(z), z, np.inf) < top)
    count, z_path, path = compact(
        np.concatenate([below, np.isfinite(cut)], axis=-1),
        np.concatenate([z, np.full_like(cut, top)], axis=-1),
        np.concatenate([head, cut], axis=-1),
    )
    enough = count >= 2
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        gradient = np.diff(path, axis=-1) / np.diff(z_path, axis=-1)
    if gradient.shape[-1] == 0:
        gradient = np.full((*path.shape[:-1], 1), np.nan)
        z_path = np.concatenate([z_path, np.full_like(z_path, np.nan)], axis=-1)
    steepest = np.argmax(np.where(np.isfinite(gradient), np.abs(gradient), -1.0), axis=-1)
    steepest = steepest[..., np.newaxis]
    worst = np.where(enough, np.take_along_axis(gradient, steepest, -1)[..., 0], np.nan)
    end = np.maximum(count - 1, 0)[..., np.newaxis]
    rise = np.where(enough, np.take_along_axis(path, end, -1)[..., 0] - path[..., 0], np.nan)
    sink = ground_speed * np.tan(np.radians(glide_slope))
    climb = ground_speed * climb_slope / 100.0
    loss, gain = _largest_changes(path)
    return FlightPath(
        runway=headings,
        headwind=head,
        crosswind=cross,
        approach_change=-rise,
        approach_worst_rate=-worst,
        approach_worst_base=np.where(
            enough, np.take_along_axis(z_path, steepest, -1)[..., 0], np.nan
        ),
        approach_worst_top=np.where(
            enough, np.take_along_axis(z_path, steepest + 1, -1)[..., 0], np.nan
        ),
        approach_worst_per_second=-worst * sink,
        approach_f_factor=worst * sink / STANDARD_GRAVITY,
        departure_change=rise,
        departure_worst_rate=worst,
        departure_worst_per_second=worst * climb,
        departure_f_factor=-worst * climb / STANDARD_GRAVITY,
        largest_loss=np.where(enough, loss, np.nan),
        largest_gain=np.where(enough, gain, np.nan),
        why=np.where(
            enough[..., 0] if headings.size else True,
            "",
            f"there are fewer than two usable winds up to {top:.0f} m above ground",
        ).astype(object),
        ground_speed=float(ground_speed),
        glide_slope=float(glide_slope),
        climb_slope=float(climb_slope),
        top=float(top),
    )


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
