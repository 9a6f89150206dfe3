"""
The standard error of a wind component, from what a profile says about itself.

Given where the instrument or the user says it; otherwise from the profile's own small-scale scatter
and the rounding of its numbers, within limits that no sensor in use leaves.
"""

from __future__ import annotations

import numpy as np

from backveer.profiles.grid import compact, ordered_sum
from backveer.profiles.labels import Bools, Floats
from backveer.profiles.stack import Stack

# Radiosondes that navigate by satellite: 0.5 m/s, the goal for the troposphere of WMO-No. 8, Guide
# to Instruments and Methods of Observation (from memory).
DEFAULT = 0.5  # [m s-1]
# Wind lidar against mast, ten-minute means: 0.1 m/s (common practice, no source). Satellite sondes
# reproduce no better: Nash et al., 2011, WMO-IOM Report 107 (from memory).
FLOOR = 0.1  # [m s-1]
# Optical theodolites and old radio direction finding: 1 to 3 m/s (WMO-No. 8, from memory). More
# than that is structure of the wind, not error.
CEILING = 3.0  # [m s-1]
FEWEST_SCATTERS = 5  # a median of fewer is good to no better than a factor of two
# Four levels over more than this reach across real structure (a jet's nose, a capping inversion).
WIDEST_SPAN = 600.0  # [m] common practice, no source
FEWEST_ROUNDED = 4  # by chance 1 in 1000 profiles with whole degrees has four whole tens

DIRECTION_STEPS = (10.0, 5.0, 1.0)  # [degree] code tables report tens (WMO-No. 306), old data fives
# Whole knots (FM 35 TEMP, WMO-No. 306) or m/s, and the half feather of a plotted barb.
SPEED_STEPS = (5 * 0.514444, 1.0, 0.514444)  # [m s-1]


def wind_error(stack: Stack) -> Floats:
    r"""
    Return the standard error of one wind component.

    Parameters
    ----------
    stack
        Quality-checked profiles; a finite, positive ``stack.wind_error`` is taken as it is.

    Returns
    -------
    error : array, shape (profile,)
        Never NaN. [m s-1]

    Notes
    -----
    Scatter: the residual r of each level from the parabola through its neighbours (a third
    difference, which leaves straight and evenly curved profiles out), scaled to the variance of
    white noise. The median of \|r\|^2 of a two-component Gaussian error is
    :math:`2 \ln 2 \, \sigma^2`, which outliers and a few kinks do not move. Rounding: a step q
    leaves :math:`q / \sqrt{12}`, of direction times the wind speed. The larger of the two counts,
    for scatter contains rounding where it is seen. Without enough levels close together the error
    is 0.5 m/s, or the rounding if that is more.

    The scatter holds turbulence as well as the instrument: for a mean wind both are errors. Errors
    alike over many levels leave no scatter and are not seen.

    Examples
    --------
    >>> wind_error(Stack.of(height=[10.0, 40.0], eastward_wind=[4.0, 6.1], northward_wind=0.7))
    array([0.5])
    """
    usable = stack.usable("wind")
    _count, z, u, v = compact(usable, stack.height, stack.eastward_wind, stack.northward_wind)
    scatter = small_scale_scatter(z, u, v)
    rounding = rounding_error(u, v)
    estimate = np.fmax(np.where(np.isfinite(scatter), scatter, DEFAULT), rounding)
    estimate = np.clip(estimate, FLOOR, CEILING)
    with np.errstate(invalid="ignore"):
        given = np.isfinite(stack.wind_error) & (stack.wind_error > 0)
    return np.where(given, stack.wind_error, estimate)


def small_scale_scatter(z: Floats, u: Floats, v: Floats) -> Floats:
    """
    Return the standard deviation of white noise in one component that scatters levels like these.

    Parameters
    ----------
    z, u, v : array, shape (profile, level)
        Height [m] and wind [m s-1], NaN only beyond the last level.

    Returns
    -------
    scatter : array, shape (profile,)
        NaN where fewer than five groups of four levels lie within 600 m each. [m s-1]

    Examples
    --------
    >>> z = 20.0 * np.arange(1.0, 61.0)[np.newaxis]
    >>> noise = np.random.default_rng(0).normal(0.0, 0.4, (2, 1, 60))
    >>> small_scale_scatter(z, 5.0 + 1e-5 * z**2 + noise[0], 0.01 * z + noise[1]).round(1)
    array([0.4])
    """
    if z.shape[1] < 4:
        return np.full(len(z), np.nan)
    a, b, c, d = (z[:, k : z.shape[1] - 3 + k] for k in range(4))
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        # Weights of the third divided difference, which a parabola of any shape makes zero.
        weights = (
            1.0 / ((a - b) * (a - c) * (a - d)),
            1.0 / ((b - a) * (b - c) * (b - d)),
            1.0 / ((c - a) * (c - b) * (c - d)),
            1.0 / ((d - a) * (d - b) * (d - c)),
        )
        squares = [w**2 for w in weights]
        gain = squares[0] + squares[1] + squares[2] + squares[3]
        total = np.zeros(a.shape)
        for x in (u, v):
            terms = [w * x[:, k : z.shape[1] - 3 + k] for k, w in enumerate(weights)]
            total = total + ((terms[0] + terms[1]) + (terms[2] + terms[3])) ** 2
        square = np.where(d - a <= WIDEST_SPAN, total / gain, np.nan)
    square = np.where(np.isfinite(square), square, np.nan)
    count = np.count_nonzero(np.isfinite(square), axis=1)
    ordered = np.sort(square, axis=1)  # NaN last
    lower = np.take_along_axis(ordered, np.maximum(count - 1, 0)[:, np.newaxis] // 2, axis=1)[:, 0]
    upper = np.take_along_axis(
        ordered, np.minimum(count // 2, square.shape[1] - 1)[:, np.newaxis], axis=1
    )[:, 0]
    scatter: Floats = np.sqrt(0.5 * (lower + upper) / (2.0 * np.log(2.0)))
    return np.where(count >= FEWEST_SCATTERS, scatter, np.nan)


def rounding_error(u: Floats, v: Floats) -> Floats:
    """
    Error of a component that the rounding of speed and direction leaves.

    Parameters
    ----------
    u, v : array, shape (profile, level)
        Wind, NaN where missing. [m s-1]

    Returns
    -------
    error : array, shape (profile,)
        The larger of that across the wind (direction) and along it (speed); 0 where neither is
        seen to be rounded. [m s-1]

    Notes
    -----
    Directions count as rounded to a step if their *differences* are whole multiples of it, so
    that the answer does not change when the wind is rotated; at least four levels and two
    different values are asked for.

    Examples
    --------
    >>> tens = np.radians([[230.0, 240.0, 240.0, 270.0, 260.0]])
    >>> rounding_error(-10.3 * np.sin(tens), -10.3 * np.cos(tens)).round(2)
    array([0.52])
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        speed = np.hypot(u, v)
        there = speed > 0
        strongest = np.argmax(np.where(there, speed, -1.0), axis=1)[:, np.newaxis]
        u0, v0 = np.take_along_axis(u, strongest, axis=1), np.take_along_axis(v, strongest, axis=1)
        turn = np.degrees(np.arctan2(v0 * u - u0 * v, u0 * u + v0 * v))
        count = np.count_nonzero(there, axis=1)
        mean_square = ordered_sum(np.where(there, speed**2, 0.0)) / np.maximum(count, 1)
        across = _step(turn, there, DIRECTION_STEPS, 1e-3) / np.sqrt(12.0)
        along = _step(speed, there, SPEED_STEPS, 1e-4) / np.sqrt(12.0)
        lateral = np.where(across > 0, np.radians(across) * np.sqrt(mean_square), 0.0)
    larger: Floats = np.maximum(lateral, along)
    return larger


def _step(x: Floats, there: Bools, steps: tuple[float, ...], tolerance: float) -> Floats:
    """Largest of the steps (descending) that all values are multiples of, 0 where none is."""
    low = np.min(np.where(there, x, np.inf), axis=1, initial=np.inf)
    high = np.max(np.where(there, x, -np.inf), axis=1, initial=-np.inf)
    enough = (np.count_nonzero(there, axis=1) >= FEWEST_ROUNDED) & (high - low > tolerance)
    found = np.zeros(len(x))
    for step in steps:
        off = np.abs(x - step * np.round(x / step)) > tolerance * step
        found = np.where((found == 0) & enough & ~(off & there).any(axis=1), step, found)
    return found
