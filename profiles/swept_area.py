r"""
The disc that a rotor sweeps: area fractions and means of the wind over it.

At height z a rotor of radius R and hub height h has the chord :math:`2\sqrt{R^2 - (z-h)^2}`. With
:math:`z = h - R\cos t` the area element is :math:`2R^2\sin^2 t\,dt`, which is smooth also at the
tips, so that Gauss-Legendre quadrature between levels converges fast.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.grid import ordered_sum
from backveer.profiles.labels import Bools, Floats

#: Eight nodes between two levels: 1e-10 of the integral where the levels are no further apart than
#: the rotor's radius, 5e-6 for a single straight line from tip to tip (measured).
NODES, NODE_WEIGHTS = np.polynomial.legendre.leggauss(8)


def segment_fractions(segments: int) -> Floats:
    """
    Area fractions of horizontal slices of equal height, from the bottom up.

    Parameters
    ----------
    segments
        Number of slices, at least 1.

    Returns
    -------
    fractions : array, shape (segments,)
        They sum to 1.

    Raises
    ------
    ValueError
        For fewer than one slice.

    Notes
    -----
    The share of a circle below the relative height x = (z - h)/R is
    1/2 + (x sqrt(1 - x^2) + arcsin x) / pi: plane geometry.

    Examples
    --------
    >>> segment_fractions(3).round(6)
    array([0.291791, 0.416417, 0.291791])
    """
    if segments < 1:
        raise ValueError(f"a rotor has at least one segment, not {segments}. Give a whole number.")
    # From symmetric bounds, so that the slices above and below the hub are the same to the bit.
    x = np.arange(-segments, segments + 1, 2) / segments
    below = (x * np.sqrt(np.maximum(1.0 - x**2, 0.0)) + np.arcsin(x)) / np.pi
    return np.asarray(np.diff(below))


@dataclass(frozen=True, eq=False)
class DiscMean:
    """
    Means over the covered part of the disc, shape (...).

    Attributes
    ----------
    coverage
        Share of the disc's area between levels that may be joined by a straight line. [1]
    cube
        Mean of the speed cubed. [m3 s-3]
    cube_along
        Mean of the cube of the wind along the hub's direction. [m3 s-3]
    """

    coverage: Floats
    cube: Floats
    cube_along: Floats


def disc_mean(
    z: Floats, speed: Floats, turn: Floats, joined: Bools, hub_height: float, rotor_diameter: float
) -> DiscMean:
    r"""
    Mean cube of the wind over a rotor, with the chord as weight.

    Parameters
    ----------
    z : array, shape (..., level)
        Heights above ground, increasing; NaN beyond the last level. [m]
    speed : array, shape (..., level)
        Wind speed, a straight line between levels. [m s-1]
    turn : array, shape (..., level)
        Direction minus that at hub height, continuous, a straight line between levels. [degree]
    joined : array of bool, shape (..., level - 1)
        Which neighbours may be joined by a straight line; the area between others is left out.
    hub_height, rotor_diameter
        [m]

    Returns
    -------
    DiscMean
        NaN where nothing of the disc is covered, ``cube_along`` also where ``turn`` is missing.

    Notes
    -----
    .. math:: \overline{M^3} = \frac1A \int M(z)^3\, 2\sqrt{R^2-(z-h)^2}\, dz

    and likewise of :math:`(M\cos\varphi)^3`, with :math:`\varphi` the turn from hub height: the
    limit of many segments in the rotor-equivalent wind speed of IEC 61400-12-1:2017 (the form with
    direction from memory; also Murphy, P., J. K. Lundquist, and P. Fleming, 2020: Wind Energ. Sci.,
    5, 1169-1190).

    Examples
    --------
    >>> z = np.array([50.0, 100.0, 150.0])
    >>> even = disc_mean(z, np.full(3, 8.0), np.zeros(3), np.ones(2, dtype=bool), 100.0, 90.0)
    >>> [round(float(x), 9) for x in (even.cube, even.coverage)]
    [512.0, 1.0]
    """
    radius = 0.5 * rotor_diameter
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        t = np.arccos(np.clip((hub_height - z) / radius, -1.0, 1.0))
        half = 0.5 * np.diff(t, axis=-1)
        inside = (half > 0) & joined
        middle = 0.5 * (t[..., 1:] + t[..., :-1])
        z0, depth = z[..., :-1], np.diff(z, axis=-1)
        speed0, rise = speed[..., :-1], np.diff(speed, axis=-1)
        angle0 = np.radians(turn[..., :-1])
        swing = np.radians(np.diff(turn, axis=-1))
        cube = np.zeros(half.shape)
        along = np.zeros(half.shape)
        area = np.zeros(half.shape)
        for node, node_weight in zip(NODES, NODE_WEIGHTS, strict=True):
            cosine = np.cos(middle + node * half)
            share = (hub_height - radius * cosine - z0) / depth
            weight = node_weight * (1.0 - cosine * cosine)
            wind = speed0 + share * rise
            straight = wind * np.cos(angle0 + share * swing)
            area += weight
            cube += weight * wind * wind * wind
            along += weight * straight * straight * straight
        covered = ordered_sum(np.where(inside, half * area, 0.0))
        mean = ordered_sum(np.where(inside, half * cube, 0.0)) / covered
        mean_along = ordered_sum(np.where(inside, half * along, 0.0)) / covered
    return DiscMean(coverage=covered * (2.0 / np.pi), cube=mean, cube_along=mean_along)


def equivalent_speed(
    z: Any, speed: Any, hub_height: float, rotor_diameter: float, turn: Any = None
) -> Floats:
    """
    Rotor-equivalent wind speed of levels that cover the whole rotor, by exact chord integration.

    Parameters
    ----------
    z : array, shape (level,) or (..., level)
        Heights above ground, increasing. [m]
    speed : array, shape (..., level)
        Wind speed, a straight line between levels. [m s-1]
    hub_height, rotor_diameter
        [m]
    turn : array, shape (..., level), optional
        Direction minus that at hub height, continuous; then the wind along the hub's direction
        counts. [degree]

    Returns
    -------
    speed : array, shape (...)
        Cube root of the mean cube; NaN where a level is missing or a tip is out of reach. [m s-1]

    Examples
    --------
    >>> z = np.linspace(50.0, 150.0, 1001)
    >>> round(float(equivalent_speed(z, (z / 100.0) ** 0.2, 100.0, 100.0)), 6)
    0.997398
    """
    z, speed = np.broadcast_arrays(np.asarray(z, dtype=float), np.asarray(speed, dtype=float))
    turned = np.broadcast_to(0.0 if turn is None else np.asarray(turn, dtype=float), z.shape)
    joined = np.ones((*z.shape[:-1], z.shape[-1] - 1), dtype=bool)
    mean = disc_mean(z, speed, turned, joined, hub_height, rotor_diameter)
    with np.errstate(invalid="ignore"):
        reached = mean.coverage > 1.0 - 1e-9  # rounding of the angles at the tips
    return np.where(reached, np.cbrt(mean.cube if turn is None else mean.cube_along), np.nan)
