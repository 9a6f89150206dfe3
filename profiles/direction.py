"""
The wind's direction followed with height as a continuous angle, through north and past light winds.

Levels with a firm direction (speed at least twice the wind's error) decide which way round it goes;
lighter levels only take their place beside them. How likely it is that the wind went the other way
round between two firm levels is kept beside the angle.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats
from backveer.profiles.stack import Stack, wind_from_direction

FIRM = 2.0  # speed over error of a firm direction: good to about 30 degrees
# Between levels the wind is taken to lie within a tenth of their vector difference of the straight
# line (one standard deviation); for a circular arc of 45 degrees the largest distance is 0.10.
PATH = 0.1
UNKNOWN_DIRECTION = np.pi / np.sqrt(3.0)  # standard deviation of a uniform direction [rad]


def direction_error(speed: Floats, error: Floats) -> Floats:
    r"""
    Return the standard error of a wind direction.

    Parameters
    ----------
    speed, error : array
        Wind speed and the standard error of a wind component. [m s-1]

    Returns
    -------
    error : array
        error / speed in a strong wind, pi / sqrt(3) in a calm. [rad]

    Notes
    -----
    With n = speed / error

    .. math:: \sigma^2 = (\pi^2/3 - 1/2)\, e^{-0.92 n - 0.27 n^2} + (1 - e^{-n^2/2}) / n^2,

    within 3.5 % of the spread about the true direction of a wind with Gaussian errors. The form
    and its two coefficients are ours, fitted to that spread (the test repeats it); both limits are
    exact.

    Examples
    --------
    >>> np.degrees(direction_error(np.array([0.0, 10.0]), np.array([0.5, 0.5]))).round(1)
    array([103.9,   2.9])
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        ratio = np.asarray(speed) / error
        square = ratio**2
        strong = np.where(square > 1e-12, -np.expm1(-0.5 * square) / square, 0.5)
        light = (UNKNOWN_DIRECTION**2 - 0.5) * np.exp(-0.92 * ratio - 0.27 * square)
        spread: Floats = np.where(np.isinf(ratio), 0.0, np.sqrt(light + strong))
    return np.where(np.isnan(ratio), np.nan, spread)


@dataclass(frozen=True)
class Chain:
    """The firm levels, compact: where they are, the angle there, the doubt gathered on the way."""

    count: Any
    z: Floats
    angle: Floats  # turning since the first firm level [degree]
    doubt: Floats  # sum of the probabilities of the other way round
    variance: Floats  # sum of 360^2 p (1 - p) [degree^2]
    u: Floats  # wind at the first firm level
    v: Floats

    def place(self, low: Any, z: Floats, u: Floats, v: Floats) -> Floats:
        """Return the turning from the first firm level to winds above the firm level ``low``."""
        high = np.minimum(low + 1, self.z.shape[1] - 1)
        z0, z1 = take(self.z, low), take(self.z, high)
        with np.errstate(invalid="ignore", divide="ignore"):
            weight = np.clip((z - z0) / (z1 - z0), 0.0, 1.0)
        weight = np.where(np.isfinite(weight), weight, 0.0)
        angle = take(self.angle, low)
        step = take(self.angle, high) - angle
        near = angle + np.where(weight > 0, weight * step, 0.0)
        rest = turn_between(self.u, self.v, u, v) - near
        # round() is odd, so that a mirrored wind has the mirrored angle.
        return near + (rest - 360.0 * np.round(rest / 360.0))

    def below(self, z: Floats) -> Any:
        """Return the last firm level at or below each height, the first where there is none."""
        low = [np.count_nonzero(self.z <= z[:, j : j + 1], axis=1) - 1 for j in range(z.shape[1])]
        return self._bounded(np.stack(low, axis=1))

    def above(self, z: Floats) -> Any:
        """Return the first firm level at or above each height, the last where there is none."""
        high = [np.count_nonzero(self.z < z[:, j : j + 1], axis=1) for j in range(z.shape[1])]
        return self._bounded(np.stack(high, axis=1))

    def _bounded(self, index: Any) -> Any:
        return np.clip(index, 0, np.maximum(self.count - 1, 0)[:, np.newaxis])


def follow(stack: Stack, sigma: Floats) -> tuple[Floats, Chain]:
    """Return the continuous direction at the levels, and the chain of firm levels it hangs from."""
    z, u, v = stack.height, stack.eastward_wind, stack.northward_wind
    directed = stack.usable("wind", "direction")
    speed = np.where(directed, np.hypot(u, v), np.nan)
    with np.errstate(invalid="ignore"):
        strongest = np.fmax.reduce(speed, axis=1, initial=np.nan)[:, np.newaxis]
        # In a wind that is light everywhere the strongest level has to do.
        firm = (speed >= FIRM * sigma[:, np.newaxis]) | (speed == strongest)
    count, zf, uf, vf = compact(firm, z, u, v)
    below = np.clip(np.add.accumulate(firm, axis=1) - 1, 0, np.maximum(count - 1, 0)[:, np.newaxis])
    step = turn_between(uf[:, :-1], vf[:, :-1], uf[:, 1:], vf[:, 1:])
    doubt = _doubt(uf, vf, step, sigma)
    light = stack.usable("wind") & ~firm & (np.add.accumulate(firm, axis=1) > 0)
    doubt = np.minimum(doubt + _doubt_of_light_levels(light, below, u, v, uf, vf, step, sigma), 0.5)
    chain = Chain(
        count=count,
        z=zf,
        angle=_running(step),
        doubt=_running(doubt),
        variance=_running(360.0**2 * doubt * (1.0 - doubt)),
        u=uf[:, :1],
        v=vf[:, :1],
    )
    start = wind_from_direction(chain.u, chain.v)
    return np.where(directed, start + chain.place(below, z, u, v), np.nan), chain


def _doubt(u: Floats, v: Floats, step: Floats, sigma: Floats) -> Floats:
    """Probability that the wind went the other way round between successive firm levels."""
    u0, v0, u1, v1 = u[:, :-1], v[:, :-1], u[:, 1:], v[:, 1:]
    single = direction_error(np.hypot(u, v), sigma[:, np.newaxis])
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        spread = np.degrees(np.hypot(single[:, :-1], single[:, 1:]))
        by_error = _tail((180.0 - np.abs(step)) / spread)
        du, dv = u1 - u0, v1 - v0
        length = np.hypot(du, dv)
        # Distance of the calm point from the straight line between the two winds.
        along = np.clip(-(u0 * du + v0 * dv) / length**2, 0.0, 1.0)
        distance = np.hypot(u0 + along * du, v0 + along * dv)
        by_path = _tail(distance / (PATH * length))
    return np.nan_to_num(by_error) + np.nan_to_num(by_path)


def _doubt_of_light_levels(
    light: Bools,
    below: Any,
    u: Floats,
    v: Floats,
    uf: Floats,
    vf: Floats,
    step: Floats,
    sigma: Floats,
) -> Floats:
    """
    Probability of the other way round because of a light wind between two firm ones.

    A calm turns the other way round if its true direction is opposite to those that the short way
    passes, which has the probability step / 360; a wind that is ``n`` errors strong exp(-n^2 / 2)
    of that (the density of a Gaussian wind's direction opposite to its mean, at most). A light
    wind that was seen on the other side leaves the question open.
    """
    doubt = np.zeros(step.shape)
    row, column = np.nonzero(light)
    low = below[row, column]
    between = low < step.shape[1]
    row, column, low = row[between], column[between], low[between]
    turn = step[row, low]
    between = np.isfinite(turn)
    row, column, low, turn = row[between], column[between], low[between], turn[between]
    ul, vl = u[row, column], v[row, column]
    way = turn_between(uf[row, low], vf[row, low], ul, vl) + turn_between(
        ul, vl, uf[row, low + 1], vf[row, low + 1]
    )
    calm = (ul == 0) & (vl == 0)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        ratio = np.where(calm, 0.0, np.hypot(ul, vl) / sigma[row])
        share = np.abs(turn) / 360.0 * np.exp(-0.5 * ratio**2)
    other_side = ~calm & (np.abs(way - turn) > 180.0)
    np.maximum.at(doubt, (row, low), np.where(other_side, 0.5, np.nan_to_num(share)))
    return doubt


def turn_between(u0: Floats, v0: Floats, u1: Floats, v1: Floats) -> Floats:
    """Smaller turn from one wind to another, clockwise positive. [degree]"""
    with np.errstate(invalid="ignore", under="ignore", over="ignore"):
        across, along = v0 * u1 - u0 * v1, u0 * u1 + v0 * v1
        turn: Floats = np.degrees(np.arctan2(across, along))
        # The wind reverses exactly: either way is as good, but a mirrored wind goes the other way.
        return np.where((across == 0) & (along < 0), np.copysign(180.0, v0), turn)


def _running(step: Floats) -> Floats:
    """Sum of the steps so far, in order, from zero at the first level; a missing step adds none."""
    so_far = np.add.accumulate(np.where(np.isfinite(step), step, 0.0), axis=1)
    return np.concatenate([np.zeros((len(step), 1)), so_far], axis=1)


def _tail(x: Floats) -> Floats:
    """
    Probability that a Gaussian error exceeds ``x`` of its standard deviations, for x >= 0.

    Abramowitz and Stegun, 1964: Handbook of Mathematical Functions, eq. 7.1.26 (error 1.5e-7;
    coefficients from memory, tested against :func:`math.erfc`).
    """
    y = np.minimum(np.abs(x), 40.0) / np.sqrt(2.0)
    t = 1.0 / (1.0 + 0.3275911 * y)
    series = t * (
        0.254829592 + t * (-0.284496736 + t * (1.421413741 + t * (-1.453152027 + t * 1.061405429)))
    )
    tail: Floats = 0.5 * series * np.exp(-(y**2))
    return tail


def take(x: Floats, index: Any) -> Floats:
    """Values at an index of the last axis, profile by profile."""
    return np.take_along_axis(x, index, axis=1)
