"""
Direction that unwraps: how the wind turns with height, in total and by layer.

The direction is followed through north as a continuous angle (direction.py). Where the wind between
two levels passes so near to calm that it may have gone either way round, the turning is withheld,
not guessed.

Turning is positive when the wind veers with height (clockwise), negative when it backs.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.direction import PATH, Chain, direction_error, follow, take
from backveer.profiles.grid import at_height, compact
from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.stack import Stack
from backveer.profiles.wind_error import wind_error

# Tops of the surface layer, of stable and of convective boundary layers, then the free air: common
# practice, no source.
DEFAULT_EDGES = (
    0.0, 100.0, 200.0, 300.0, 500.0, 1000.0, 1500.0, 2000.0, 3000.0, 5000.0, 7000.0, 10000.0,
)  # fmt: skip
LIKELY = 0.05  # probability of the other way round that withholds a turning: the usual 5 %
TOO_FEW = "fewer than two levels have a wind with a direction"
EITHER_WAY = (
    "the wind passes so near to calm between levels, or turns by so nearly 180 degrees, "
    "that it can have gone either way round"
)
NOT_REACHED = "the profile does not reach into this layer"
CALM_EDGE = "the wind is calm at an edge of the layer"


@dataclass(frozen=True, eq=False)
class Turning(Labelled):
    """How the wind of each profile turns and strengthens with height."""

    direction: Floats = variable(
        "degree",
        "profile level",
        "direction the wind blows from, continuous with height: it may leave 0 to 360",
    )
    total: Floats = variable(
        "degree", "profile", "turning from base to top, positive when veering with height"
    )
    error: Floats = variable("degree", "profile", "standard error of the total turning")
    sense: Words = variable("", "profile", "veering, backing or steady (less than its error)")
    why: Words = variable("", "profile", "why the total turning is not determined")
    base: Floats = variable("m", "profile", "lowest level with a direction, above ground")
    top: Floats = variable("m", "profile", "highest level with a direction, above ground")
    layer_base: Floats = variable("m", "profile layer", "base of the layer, above ground")
    layer_top: Floats = variable("m", "profile layer", "top of the layer, above ground")
    layer_turning: Floats = variable(
        "degree", "profile layer", "turning from base to top, positive when veering with height"
    )
    layer_error: Floats = variable("degree", "profile layer", "standard error of the turning")
    layer_rate: Floats = variable(
        "degree/(100 m)", "profile layer", "turning in 100 m, positive when veering with height"
    )
    layer_sense: Words = variable("", "profile layer", "veering, backing or steady")
    layer_why: Words = variable("", "profile layer", "why the turning is not determined")
    layer_speed_change: Floats = variable(
        "m s-1", "profile layer", "wind speed at the top minus that at the base"
    )


def turning(
    stack: Stack,
    edges: Sequence[float] = DEFAULT_EDGES,
    error: Any = None,
) -> Turning:
    r"""
    Follow the wind's direction with height.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    edges
        Heights above ground that bound the layers, increasing; the first layer begins at the
        lowest level with a direction, the last ends at the highest. [m]
    error : float or array, shape (profile,)
        Standard error of a wind component; estimated if left out. [m s-1]

    Returns
    -------
    Turning
        One layer for each pair of edges, NaN where a profile has no such layer.

    Raises
    ------
    ValueError
        For fewer than two edges, or edges that do not increase.

    Notes
    -----
    At an edge between levels the wind *components* are interpolated, for they are what a sonde or a
    lidar averages, and what passes through calm without a leap; the angle then follows. The error
    of a direction is that of a component over the speed in a strong wind, and grows to that of a
    uniform direction (104 degrees) in a calm: :func:`backveer.profiles.direction.direction_error`.
    The edges of a layer that lie between the same levels share those levels' errors, and
    their covariance is counted. Between firm levels the wind may have gone the other way round
    with a probability p: because their errors carry the turn past 180 degrees, because the
    hodograph strays from its straight line by more than the line's distance from calm, or because
    a level between them is all but calm. It adds :math:`(360°)^2 p (1 - p)`.
    Propagation of errors, no further source.

    Examples
    --------
    >>> stack = Stack.of(height=[10.0, 110.0], eastward_wind=10.0, northward_wind=[1.0, -1.0])
    >>> told = turning(stack, error=0.2)
    >>> told.direction.round(1).tolist(), told.total.round(1), told.sense
    ([[264.3, 275.7]], array([11.4]), array(['veering'], dtype=object))
    """
    bounds = np.asarray(edges, dtype=float)
    if bounds.ndim != 1 or bounds.size < 2 or not (np.diff(bounds) > 0).all():
        raise ValueError(
            f"layer edges must be at least two heights that increase, not {list(edges)}. "
            f"Sort them and leave out repeated ones."
        )
    sigma = wind_error(stack) if error is None else np.asarray(error, dtype=float)
    sigma = np.broadcast_to(sigma, (stack.profile_count,))
    angle, chain = follow(stack, sigma)

    z = np.where(np.isfinite(angle), stack.height, np.nan)
    with np.errstate(invalid="ignore"):
        base, top = (
            np.fmin.reduce(z, axis=1, initial=np.nan),
            np.fmax.reduce(z, axis=1, initial=np.nan),
        )
        low = np.maximum(bounds[:-1], base[:, np.newaxis])
        high = np.minimum(bounds[1:], top[:, np.newaxis])
        reached = low < high
        several = base < top
    low, high = np.where(reached, low, np.nan), np.where(reached, high, np.nan)
    some = np.flatnonzero(reached.any(axis=0))  # a lidar reaches few of the layers
    told = _between(
        stack,
        chain,
        sigma,
        np.concatenate([base[:, np.newaxis], low[:, some]], axis=1),
        np.concatenate([top[:, np.newaxis], high[:, some]], axis=1),
    )
    total = np.where(several, told.turn[:, 0], np.nan)
    total_error = np.where(several, told.error[:, 0], np.nan)
    why = np.where(several, told.why[:, 0], TOO_FEW).astype(object)
    layer_turning, layer_error, speed_change = (np.full(low.shape, np.nan) for _ in range(3))
    layer_turning[:, some], layer_error[:, some] = told.turn[:, 1:], told.error[:, 1:]
    speed_change[:, some] = told.speed_change[:, 1:]
    layer_why = np.full(low.shape, NOT_REACHED, dtype=object)
    layer_why[:, some] = np.where(reached[:, some], told.why[:, 1:], NOT_REACHED)
    return Turning(
        direction=angle,
        total=total,
        error=total_error,
        sense=_sense(total, total_error),
        why=why,
        base=base,
        top=top,
        layer_base=low,
        layer_top=high,
        layer_turning=layer_turning,
        layer_error=layer_error,
        layer_rate=layer_turning * 100.0 / (high - low),
        layer_sense=_sense(layer_turning, layer_error),
        layer_why=layer_why,
        layer_speed_change=speed_change,
    )


@dataclass(frozen=True)
class _Edge:
    """The wind at heights between levels: u, v, direction, and where its errors come from."""

    index: Any
    weight: Floats
    u: Floats
    v: Floats
    angle: Floats
    error: Floats  # of a component [m s-1]
    bend: Floats  # the part of it that the straight line between levels makes [m s-1]


@dataclass(frozen=True)
class _Turn:
    turn: Floats
    error: Floats
    why: Words
    speed_change: Floats


def _between(stack: Stack, chain: Chain, sigma: Floats, low: Floats, high: Floats) -> _Turn:
    """Return the turning, its error and the change of speed between heights."""
    count, z, u, v = compact(
        stack.usable("wind"), stack.height, stack.eastward_wind, stack.northward_wind
    )
    base, top = (_edge(chain, count, z, u, v, sigma, target) for target in (low, high))
    turn = top.angle - base.angle
    speed0, speed1 = np.hypot(base.u, base.v), np.hypot(top.u, top.v)
    error0, error1 = direction_error(speed0, base.error), direction_error(speed1, top.error)
    together = base.index == top.index
    shared = np.where(
        together,
        (1 - base.weight) * (1 - top.weight) + base.weight * top.weight,
        np.where(base.index + 1 == top.index, base.weight * (1 - top.weight), 0.0),
    )
    common = sigma[:, np.newaxis] ** 2 * shared + np.where(together, base.bend * top.bend, 0.0)
    with np.errstate(invalid="ignore", divide="ignore"):
        correlation = np.nan_to_num(common * np.cos(np.radians(turn)) / (base.error * top.error))
    variance = error0**2 + error1**2 - 2.0 * correlation * error0 * error1
    i0, i1 = chain.below(low), chain.above(high)
    i1 = np.maximum(i0, i1)
    doubt = take(chain.doubt, i1) - take(chain.doubt, i0)
    extra = take(chain.variance, i1) - take(chain.variance, i0)
    error = np.sqrt(np.degrees(np.degrees(np.maximum(variance, 0.0))) + extra)
    calm, doubtful = np.isnan(turn), doubt > LIKELY
    why = np.full(turn.shape, "", dtype=object)
    why[doubtful], why[calm] = EITHER_WAY, CALM_EDGE
    return _Turn(
        turn=np.where(doubtful, np.nan, turn),
        error=np.where(doubtful | calm, np.nan, error),
        why=why,
        speed_change=speed1 - speed0,
    )


def _edge(
    chain: Chain, count: Any, z: Floats, u: Floats, v: Floats, sigma: Floats, target: Floats
) -> _Edge:
    """Interpolate the components to heights; levels are compact."""
    position = at_height(z, np.where(np.isfinite(z), np.arange(z.shape[1]), np.nan), target)
    last = np.maximum(count - 2, 0)[:, np.newaxis]
    index = np.clip(np.floor(np.nan_to_num(position)).astype(np.intp), 0, last)
    weight = position - index
    after = np.minimum(index + 1, z.shape[1] - 1)
    u0, v0, u1, v1 = take(u, index), take(v, index), take(u, after), take(v, after)
    # A level's own wind is that wind, also where the next one is missing.
    ue = np.where(weight == 0, u0, (1 - weight) * u0 + weight * u1)
    ve = np.where(weight == 0, v0, (1 - weight) * v0 + weight * v1)
    inside = np.where((weight > 0) & (weight < 1), 4.0 * weight * (1 - weight), 0.0)
    bend = PATH * np.where(inside > 0, np.hypot(u1 - u0, v1 - v0), 0.0) * inside
    noise = sigma[:, np.newaxis] * np.sqrt((1 - weight) ** 2 + weight**2)
    angle = chain.place(chain.below(target), target, ue, ve)
    angle = np.where((ue == 0) & (ve == 0), np.nan, angle)
    return _Edge(index, weight, ue, ve, angle, np.hypot(noise, bend), bend)


def _sense(turn: Floats, error: Floats) -> Words:
    """Return veering, backing, or steady where the turning is within its error."""
    word = np.full(turn.shape, "", dtype=object)
    with np.errstate(invalid="ignore"):
        word[turn > 0], word[turn < 0] = "veering", "backing"
        word[(np.abs(turn) < error) | (turn == 0)] = "steady"
    return word
