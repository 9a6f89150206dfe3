"""
Each shape of the viscosity fitted to a block of profiles: estimates, errors, what speaks for each.

In the frame of the northern hemisphere; which shape to name, and what can be said of it, is decided
in :mod:`backveer.profiles.viscosity_profile`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles import viscosity_search as search
from backveer.profiles.ekman_members import _aicc
from backveer.profiles.ekman_solver import Table, table
from backveer.profiles.surface_layer import VON_KARMAN

DESCENT, SECOND_DESCENT = 8, 5  # steps; further ones move no number by a tenth of its error
#: What is told of a shape. Those in logarithms are never negative.
QUANTITIES = (
    "log_friction_velocity",
    "log_roughness_length",
    "log_depth",
    "cross_isobar_angle",
    "eastward",
    "northward",
)


@dataclass
class Shape:
    """
    One shape fitted to a block; arrays over profile.

    ``residual`` is the whitened sum of squares under the noise of the analytic fit, ``values`` and
    ``errors`` those of ``QUANTITIES`` (quantity, profile), ``inside`` whether depth and mu are no
    ends of their ranges, ``rms`` the plain vector residual [m s-1] and ``length`` the noise
    length [m].
    """

    residual: Any  # under the noise of the analytic fit
    values: Any
    errors: Any
    inside: Any
    rms: Any
    length: Any
    spread: search.Spread


def fit_shapes(
    winds: search.Winds, shapes: Any, analytic_length: Any, lengths: Any, floor: Any, fitted: Any
) -> list[Shape]:
    """
    Fit each shape.

    Parameters
    ----------
    winds
        The profiles.
    shapes
        Names of shapes.
    analytic_length : array, shape (profile,)
        Noise length of the analytic fit, under which ``residual`` is told. [m]
    lengths : array
        Noise lengths to weigh. [m]
    floor : array, shape (profile,)
        Least standard error of a wind component. [m s-1]
    fitted : array of bool, shape (profile,)
        Which profiles have levels at all.
    """
    shared = search.Noise.of(winds, np.where(fitted, analytic_length, 0.0))
    alone = search.Noise.of(winds, 0.0)
    fits = []
    for shape in shapes:
        look = table(shape)
        start = search.first_guess(look, winds)
        # Independent noise to begin with: what is left of differences alone has many hollows.
        first, _ = search.refine(look, winds, alone, start, DESCENT)
        about = search.spread(look, winds, first, lengths, floor)
        length = search.mean_length(about.weights, lengths)
        noise = search.Noise.of(winds, length)
        theta, _ = search.refine(look, winds, noise, first, SECOND_DESCENT)
        _, residual = search.refine(look, winds, shared, theta, SECOND_DESCENT)
        about = search.spread(look, winds, theta, lengths, floor)
        values, errors = _quantities(look, winds, theta, about)
        inside = np.ones(fitted.shape, dtype=bool)
        for number in (search.DEPTH, search.MU):
            inside &= (theta[number] > winds.low[number] + 1e-3) & (
                theta[number] < winds.high[number] - 1e-3
            )
        plain, _ = search.wind_of(look, winds.z, theta, search.scale_of(winds, theta))
        miss = np.where(
            winds.there, search.turned(winds.u, winds.v, theta[search.DIRECTION]) - plain, 0.0
        )
        square = search.total(miss[0] ** 2 + miss[1] ** 2) / np.maximum(winds.count, 1)
        fits.append(Shape(residual, values, errors, inside, np.sqrt(square), length, about))
    return fits


def _quantities(look: Table, winds: search.Winds, theta: Any, about: search.Spread) -> Any:
    """Work out the ``QUANTITIES`` and their standard errors, shape (quantity, profile)."""
    size = search.scale_of(winds, theta)
    s = theta[search.ROUGHNESS] - theta[search.DEPTH]
    x, x_s, x_m = look.look_up(s, theta[search.MU])
    one, nothing = np.ones(size.shape), np.zeros(size.shape)
    # arg and ln of X by s and by ln mu: d ln X = dX conj(X) / |X|^2
    square = x.real**2 + x.imag**2
    by_s = (x_s.imag * x.real - x_s.real * x.imag) / square
    by_m = (x_m.imag * x.real - x_m.real * x.imag) / square
    degree = 180.0 / np.pi
    wind = search.turned(x.real * size, x.imag * size, -theta[search.DIRECTION])
    change_s = search.turned(x_s.real * size, x_s.imag * size, -theta[search.DIRECTION])
    change_m = search.turned(x_m.real * size, x_m.imag * size, -theta[search.DIRECTION])
    aside = (-wind[1], wind[0])
    gradients = [
        [one, -one, nothing, nothing],
        [nothing, nothing, nothing, one],
        [one, nothing, nothing, nothing],
        [degree * by_s, -degree * by_m, nothing, -degree * by_s],
        *([wind[k] - change_s[k], change_m[k] - wind[k], aside[k], change_s[k]] for k in range(2)),
    ]
    values = np.stack(
        [
            np.log(size * VON_KARMAN),
            theta[search.ROUGHNESS],
            theta[search.DEPTH],
            -degree * np.arctan2(x.imag, x.real),
            wind[0],
            wind[1],
        ]
    )
    return values, np.stack([about.error(gradient) for gradient in gradients])


def criterion_of(residual: Any, count: Any, levels: Any, parameters: Any) -> Any:
    """AICc of one fit, parameters a profile; as that of the analytic family."""
    return _aicc(residual[:, np.newaxis], count, levels, parameters[:, np.newaxis])[:, 0]


def without_friction(winds: search.Winds, length: Any, count: Any, levels: Any) -> Any:
    """Return the better AICc of a constant and of a linear wind."""
    noise = search.Noise.of(winds, np.where(winds.count > 0, length, 0.0))
    one, x = noise.whiten(winds.there + 0.0), noise.whiten(winds.z * winds.there)
    square = search.total(one * one)
    slope = search.total(one * x) / square
    x = x - slope * one
    steep = search.total(x * x)
    constant, linear = 0.0, 0.0
    for part in (winds.u, winds.v):
        y = noise.whiten(part)
        y = y - search.total(one * y) / square * one
        constant = constant + search.total(y * y)
        y = y - search.total(x * y) / steep * x
        linear = linear + search.total(y * y)
    both = [
        criterion_of(r, count, levels, np.full(count.shape, k))
        for r, k in ((constant, 2), (linear, 4))
    ]
    return np.fmin(*both)
