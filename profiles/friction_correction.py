"""
What friction does to the wind, so that it can be taken out: how far up, how much, how well known.

All is written out in real numbers, which mirror exactly and do not depend on the batch.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.ekman import EkmanFit
from backveer.profiles.labels import Bools, Floats, Words
from backveer.profiles.layer_line import LayerLine

# Where nothing tells the depth of friction: the trade reads advection from 850 hPa upward, which in
# cold air lies no higher above the sea than this (common practice, no source). [m]
DEFAULT_DEPTH = 1250.0
CLEARANCE = 1.25  # friction over a depth by Richardson number: choice, as for the free air
LEAST_DEPTH = 300.0  # m, of friction: above a very stable night the air still swings; choice


def friction_depth(fit: EkmanFit, depth: Any, profiles: int) -> tuple[Floats, Words, Bools]:
    """
    How far up friction turns the wind.

    Parameters
    ----------
    fit
        The Ekman fit.
    depth : array, shape (profile,), or None
        Boundary-layer depth, for profiles without a well determined fit. [m]
    profiles
        Number of profiles.

    Returns
    -------
    friction : array, shape (profile,)
        [m]
    origin : array of str, shape (profile,)
        Where it comes from: fit, boundary-layer depth, or default.
    well : array of bool, shape (profile,)
        Where the fit is well determined.
    """
    scale_height = np.asarray(fit.scale_height, dtype=float)
    given = np.asarray(np.nan if depth is None else depth, dtype=float)
    given = np.broadcast_to(given, (profiles,))
    with np.errstate(invalid="ignore", over="ignore"):
        well = (np.asarray(fit.verdict) == "well determined") & (scale_height > 0)
        stirred = np.maximum(CLEARANCE * given, LEAST_DEPTH)
        known = np.isfinite(given) & (given >= 0)
        friction = np.where(well, np.pi * scale_height, np.where(known, stirred, DEFAULT_DEPTH))
    words = np.where(well, "fit", np.where(known, "boundary-layer depth", "default"))
    return friction, words.astype(object), well


def frictional_wind(fit: EkmanFit, f: Floats, well: Bools, z: Floats) -> tuple[Floats, Floats]:
    r"""
    Return the frictional part of the wind of a constant-viscosity spiral.

    Parameters
    ----------
    fit
        Its amplitude A at the ground and scale height :math:`\delta`.
    f : array, shape (profile,)
        Coriolis parameter, whose sign is s. [s-1]
    well : array of bool, shape (profile,)
        Profiles whose fit counts; the others get zero.
    z : array, shape (profile, level)
        Height above ground. [m]

    Returns
    -------
    u, v : array, shape (profile, level)
        :math:`A \exp[-(1 + i s) z / \delta]`, to be subtracted from the wind. [m s-1]
    """
    if not well.any():
        return np.zeros(z.shape), np.zeros(z.shape)
    east = np.asarray(fit.departure_eastward_at_ground)[:, np.newaxis]
    north = np.asarray(fit.departure_northward_at_ground)[:, np.newaxis]
    there = well[:, np.newaxis] & np.isfinite(z)
    with np.errstate(invalid="ignore", over="ignore", under="ignore", divide="ignore"):
        phase = z / np.where(well, fit.scale_height, np.nan)[:, np.newaxis]
        left, cos = np.exp(-phase), np.cos(phase)
        sin = np.sign(f)[:, np.newaxis] * np.sin(phase)
        u, v = left * (east * cos + north * sin), left * (north * cos - east * sin)
    return np.where(there, u, 0.0), np.where(there, v, 0.0)


def spiral_variance(
    line: LayerLine,
    wind: tuple[Floats, Floats],
    drag: tuple[Floats, Floats],
    z: Floats,
    f: Floats,
    fit: EkmanFit,
) -> Floats:
    """
    Variance that the errors of the spiral bring to the cross product of a layer's mean and slope.

    Parameters
    ----------
    line
        The layer.
    wind, drag : pair of array, shape (profile, near)
        Corrected wind and frictional wind at the levels of the layer. [m s-1]
    z : array, shape (profile, near)
        Height of these levels above ground. [m]
    f : array, shape (profile,)
        Coriolis parameter. [s-1]
    fit
        Whose errors of amplitude and scale height count. They are taken as independent, for the
        fit does not hand on how they are correlated.

    Returns
    -------
    variance : array, shape (profile,)
        [m4 s-4]
    """
    amplitude = np.hypot(fit.departure_eastward_at_ground, fit.departure_northward_at_ground)
    amplitude_variance = 0.5 * (
        fit.departure_eastward_at_ground_error**2 + fit.departure_northward_at_ground_error**2
    )
    slope = line.slope(wind[0]), line.slope(wind[1])
    mean = line.mean(wind[0]), line.mean(wind[1])

    def change(east: Floats, north: Floats) -> Any:
        """How mean x slope changes when the wind changes by this."""
        a, b = (line.mean(east), line.mean(north)), (line.slope(east), line.slope(north))
        return a[0] * slope[1] - a[1] * slope[0] + mean[0] * b[1] - mean[1] * b[0]

    # Relative errors of the amplitude: of its length, along the frictional wind, and of its angle,
    # across it.
    east, north = drag
    relative = amplitude_variance / amplitude**2
    of_amplitude = relative * (change(east, north) ** 2 + change(-north, east) ** 2)
    # The derivative of A exp(-(1 + i s) z / delta) by delta is (1 + i s) z / delta^2 times it.
    sign = np.sign(f)[:, np.newaxis]
    stretch = z / fit.scale_height[:, np.newaxis] ** 2
    by_scale = change((east - sign * north) * stretch, (north + sign * east) * stretch)
    of_scale: Floats = (by_scale * fit.scale_height_error) ** 2
    return np.where(amplitude > 0, of_amplitude, 0.0) + of_scale
