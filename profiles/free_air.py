r"""
The wind of the free air, brought down to the ground by its own shear.

Above the boundary layer the wind is close to geostrophic, and its change with height is the thermal
wind. Over a layer of it, a straight line is laid through both components,

.. math:: W(z) = a + b z + e(z), \qquad W = u + i v

by generalised least squares with noise whose correlation is :math:`\exp(-|\Delta z| / \ell)`; its
value at the ground stands for the geostrophic wind there. The length of the noise is weighed over
a handful of trial values by restricted likelihood [1]_, so that waves and curvature in the layer
widen the error. What the line cannot know is a thermal wind that differs within the boundary layer.

References
----------
.. [1] Patterson, H. D., and R. Thompson, 1971: Recovery of inter-block information when block sizes
   are unequal. Biometrika, 58, 545-554 (from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.grid import compact, ordered_sum
from backveer.profiles.labels import Bools, Floats

MIN_LEVELS = 6  # choice: twice the three unknowns of a component (value, shear, length of noise)
MIN_SPAN = 0.5  # choice: of the layer's depth, so that the shear rests on more than its edge
LENGTHS = (0.0, 40.0, 80.0, 160.0, 320.0, 640.0)  # trial lengths of the noise [m]

TOO_LOW = "the profile has no wind above the boundary layer"
TOO_FEW = f"fewer than {MIN_LEVELS} levels above the boundary layer have a wind"
TOO_THIN = "the winds above the boundary layer lie within too thin a layer to tell their shear"


@dataclass(frozen=True, eq=False)
class FreeAir:
    """
    A line through the wind of the free air; every array has shape (...).

    Attributes
    ----------
    eastward, northward
        The line at the ground. [m s-1]
    eastward_shear, northward_shear
        Its slope, positive when the component grows with height. [s-1]
    ground_variance, shear_variance, covariance
        Of one component: of the value at the ground [m2 s-2], of the slope [s-2], of both [m s-2].
    top
        Highest level that was used. [m]
    determined
        False where there are too few levels; everything else is NaN there.
    count
        Levels within the layer, usable or not enough.
    """

    eastward: Floats
    northward: Floats
    eastward_shear: Floats
    northward_shear: Floats
    ground_variance: Floats
    shear_variance: Floats
    covariance: Floats
    top: Floats
    determined: Bools
    count: Any


def free_air(
    z: Floats, u: Floats, v: Floats, base: Floats, top: Floats, error: Any = 0.0
) -> FreeAir:
    """
    Lay a line through the wind between two heights and read it at the ground.

    Parameters
    ----------
    z, u, v : array, shape (..., level)
        Heights [m], increasing, and wind toward east and north [m s-1]; NaN where missing.
    base, top : array, shape (...)
        The layer of free air. [m]
    error : array, shape (...)
        Standard error of a wind component; the scatter about the line is never taken to be
        less. [m s-1]

    Returns
    -------
    FreeAir
        Not determined with fewer than ``MIN_LEVELS`` levels, or where they span less than
        ``MIN_SPAN`` of the layer.

    Examples
    --------
    >>> z = np.arange(1000.0, 2500.0, 100.0)
    >>> line = free_air(z, 8.0 + 0.002 * z, 0.0 * z - 3.0, np.array(1000.0), np.array(2500.0), 0.2)
    >>> line.eastward.round(6), line.northward.round(6), line.eastward_shear.round(6)
    (np.float64(8.0), np.float64(-3.0), np.float64(0.002))
    """
    base, top = np.asarray(base, dtype=float), np.asarray(top, dtype=float)
    shape = np.broadcast_shapes(z.shape, u.shape, (*base.shape, 1))
    z, u, v = (np.broadcast_to(x, shape) for x in (z, u, v))
    inside = (z >= base[..., np.newaxis]) & (z <= top[..., np.newaxis])
    count, z, u, v = compact(inside & np.isfinite(u) & np.isfinite(v), z, u, v)
    there = np.arange(z.shape[-1]) < count[..., np.newaxis]
    last = np.take_along_axis(z, np.maximum(count - 1, 0)[..., np.newaxis], -1)[..., 0]
    determined = (count >= MIN_LEVELS) & (last - z[..., 0] >= MIN_SPAN * (top - base))
    trials = [_line(z, u, v, there, count, length, error) for length in LENGTHS]
    with np.errstate(invalid="ignore", over="ignore", divide="ignore", under="ignore"):
        misfit = np.stack([trial[0] for trial in trials])
        misfit = np.where(np.isfinite(misfit), misfit, np.inf)
        best = misfit.min(axis=0)
        weight = np.exp(-0.5 * (misfit - np.where(np.isfinite(best), best, 0.0)))
        weight = weight / ordered_sum(weight, axis=0)
        answers = np.stack([np.stack(trial[1:]) for trial in trials])
        answers = np.where(weight[:, np.newaxis] > 0, answers, 0.0)
        mean = ordered_sum(weight[:, np.newaxis] * answers, axis=0)
        # The trials differ in what they say, and that is part of what is not known.
        spread = answers[:, :4] - mean[:4]
        ground = ordered_sum(weight * (spread[:, 0] ** 2 + spread[:, 1] ** 2), axis=0) / 2.0
        shear = ordered_sum(weight * (spread[:, 2] ** 2 + spread[:, 3] ** 2), axis=0) / 2.0
        both = ordered_sum(
            weight * (spread[:, 0] * spread[:, 2] + spread[:, 1] * spread[:, 3]), axis=0
        )
        values = [*mean[:4], mean[4] + ground, mean[5] + shear, mean[6] + both / 2.0]
    determined = determined & np.logical_and.reduce([np.isfinite(value) for value in values])
    kept: list[Any] = [np.where(determined, value, np.nan) for value in (*values, last)]
    return FreeAir(*[*kept, determined, count])


def _line(
    z: Floats, u: Floats, v: Floats, there: Bools, count: Any, length: float, error: Any
) -> tuple[Floats, ...]:
    """
    Fit one line for one length of the noise.

    Returns the misfit (-2 log of the restricted likelihood), value and slope of u and v, and the
    variances of value and slope and their covariance.
    """
    with np.errstate(invalid="ignore", over="ignore", divide="ignore", under="ignore"):
        step = np.diff(z, axis=-1, prepend=np.nan)
        kept = np.exp(-step / length) if length > 0 else 0.0 * step
        kept = np.where(np.isfinite(kept), kept, 0.0)
        fresh = np.sqrt(1.0 - kept**2)

        def whiten(x: Floats) -> Floats:
            """Take out of each level what the level below tells of it."""
            below = np.concatenate([np.zeros_like(x[..., :1]), x[..., :-1]], axis=-1)
            return np.where(there, (x - kept * below) / fresh, 0.0)

        one, height = whiten(np.ones_like(z)), whiten(z)
        east, north = whiten(u), whiten(v)
        s11, s12, s22 = (
            ordered_sum(a * b) for a, b in ((one, one), (one, height), (height, height))
        )
        determinant = s11 * s22 - s12 * s12
        lines = []
        rest = 0.0
        for y in (east, north):
            r1, r2 = ordered_sum(one * y), ordered_sum(height * y)
            value, slope = (s22 * r1 - s12 * r2) / determinant, (s11 * r2 - s12 * r1) / determinant
            left = y - value[..., np.newaxis] * one - slope[..., np.newaxis] * height
            rest = rest + ordered_sum(left * left)
            lines.append((value, slope))
        freedom = 2.0 * count - 4.0
        # A scatter below the wind's own error is luck, or coarse rounding.
        scatter = np.maximum(rest / freedom, np.asarray(error) ** 2)
        logs = 2.0 * ordered_sum(np.where(there, np.log(fresh), 0.0))
        misfit = freedom * np.log(scatter) + rest / scatter + 2.0 * (logs + np.log(determinant))
        return (
            misfit,
            lines[0][0],
            lines[1][0],
            lines[0][1],
            lines[1][1],
            scatter * s22 / determinant,
            scatter * s11 / determinant,
            -scatter * s12 / determinant,
        )
