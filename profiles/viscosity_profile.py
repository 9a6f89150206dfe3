r"""
The steady Ekman layer over a logarithmic wall, its viscosity varying with height, fitted.

The wind of :mod:`backveer.profiles.ekman_solver` for four shapes of K, of which AICc names one:
:math:`K = \kappa u_* z (1 - z/h)^p` with p 1 ("linear"), 2 ("square") and 4 ("fourth power", close
to a viscosity that dies out exponentially), and the cubic of O'Brien (1970). Because u* is in K as
well as in the stress at the wall, a layer has four numbers only: its depth h, its friction
velocity, the direction of the surface stress and the roughness length z0 (three, if z0 is given).
The geostrophic wind, taken as the same at all heights, follows from them; where it is known from
elsewhere, that the two agree is a check of the whole.

It stands beside the members of :mod:`backveer.profiles.ekman`: the AICc is of the same likelihood,
under the noise length that the analytic fit found. Numbers and errors come from a second descent
under the noise length that the residuals of this fit show, since what the spiral misses of a layer
with varying viscosity looks like noise of long correlation. Errors weigh the noise lengths, and
intervals the shapes, as those of the analytic family do.

A geostrophic wind that does change with height is looked for in what the fit leaves over. Where it
shows, the errors hold what allowing for it would change, and the verdict says so.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from backveer.profiles import viscosity_search as search
from backveer.profiles.earth import Coriolis
from backveer.profiles.ekman import BLOCK, TOP, EkmanFit
from backveer.profiles.ekman_errors import LENGTHS, t95
from backveer.profiles.ekman_intervals import averaged, tail_ends, weights_of
from backveer.profiles.ekman_solver import BOTTOM, SHAPES, table
from backveer.profiles.grid import compact
from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.stack import Stack
from backveer.profiles.surface_layer import VON_KARMAN
from backveer.profiles.viscosity_shapes import (
    QUANTITIES,
    criterion_of,
    fit_shapes,
    without_friction,
)
from backveer.profiles.viscosity_verdict import Evidence, judge

MINIMUM_LEVELS = 6  # four numbers and the noise, in 12
LOWEST = 1.0  # a wind at the ground itself is no wind of the layer. [m]
FASTEST = 200.0  # no wind of the boundary layer; beyond it nothing is fitted. [m s-1]


@dataclass(frozen=True, eq=False)
class ViscosityProfile(Labelled):
    """
    The chosen shape for each profile.

    ``X_error`` is one standard deviation; ``X_low`` and ``X_high`` bound the 95 % interval. Where
    the verdict is "not determined" every number of the chosen shape is NaN.
    """

    shape: Words = variable("", "profile", "chosen shape of the viscosity")
    friction_velocity: Floats = variable("m s-1", "profile", "friction velocity u*")
    friction_velocity_error: Floats = variable("m s-1", "profile", "its standard error")
    friction_velocity_low: Floats = variable("m s-1", "profile", "lower end of its 95 % interval")
    friction_velocity_high: Floats = variable("m s-1", "profile", "upper end of its 95 % interval")
    roughness_length: Floats = variable(
        "m", "profile", "height at which the logarithmic wind vanishes",
        "surface_roughness_length",
    )  # fmt: skip
    roughness_length_error: Floats = variable("m", "profile", "its standard error, 0 if given")
    roughness_length_low: Floats = variable("m", "profile", "lower end of its 95 % interval")
    roughness_length_high: Floats = variable("m", "profile", "upper end of its 95 % interval")
    depth: Floats = variable("m", "profile", "height where the viscosity ends")
    depth_error: Floats = variable("m", "profile", "its standard error")
    depth_low: Floats = variable("m", "profile", "lower end of its 95 % interval")
    depth_high: Floats = variable("m", "profile", "upper end of its 95 % interval")
    geostrophic_eastward_wind: Floats = variable(
        "m s-1", "profile", "geostrophic wind toward east", "geostrophic_eastward_wind"
    )
    geostrophic_eastward_wind_error: Floats = variable("m s-1", "profile", "its standard error")
    geostrophic_eastward_wind_low: Floats = variable("m s-1", "profile", "lower end of its 95 %")
    geostrophic_eastward_wind_high: Floats = variable("m s-1", "profile", "upper end of its 95 %")
    geostrophic_northward_wind: Floats = variable(
        "m s-1", "profile", "geostrophic wind toward north", "geostrophic_northward_wind"
    )
    geostrophic_northward_wind_error: Floats = variable("m s-1", "profile", "its standard error")
    geostrophic_northward_wind_low: Floats = variable("m s-1", "profile", "lower end of its 95 %")
    geostrophic_northward_wind_high: Floats = variable("m s-1", "profile", "upper end of its 95 %")
    cross_isobar_angle: Floats = variable(
        "degree",
        "profile",
        "surface stress toward low pressure from the geostrophic wind, positive",
    )
    cross_isobar_angle_error: Floats = variable("degree", "profile", "its standard error")
    cross_isobar_angle_low: Floats = variable("degree", "profile", "lower end of its 95 % interval")
    cross_isobar_angle_high: Floats = variable(
        "degree", "profile", "upper end of its 95 % interval"
    )
    rms: Floats = variable("m s-1", "profile", "root of the mean square of the vector residual")
    aicc: Floats = variable(
        "1", "profile", "corrected Akaike criterion, beside candidate_aicc of the analytic family"
    )
    aicc_gain: Floats = variable(
        "1", "profile", "best candidate_aicc of the analytic family minus aicc"
    )
    noise_length: Floats = variable("m", "profile", "correlation length of the residuals")
    rotation: Floats = variable("1", "profile", "1 in the northern hemisphere, -1 in the southern")
    coriolis_parameter: Floats = variable(
        "s-1", "profile", "Coriolis parameter", "coriolis_parameter"
    )
    verdict: Words = variable("", "profile", "how far the answer can be trusted")
    why: Words = variable("", "profile", "why it is not well determined")
    candidate_shape: Words = variable("", "profile shape", "shape of the viscosity")
    candidate_aicc: Floats = variable("1", "profile shape", "corrected Akaike criterion")
    candidate_friction_velocity: Floats = variable("m s-1", "profile shape", "u*")
    candidate_cross_isobar_angle: Floats = variable("degree", "profile shape", "as the chosen one")


def fit(
    stack: Stack,
    coriolis: Coriolis,
    analytic: EkmanFit,
    error: Floats | None = None,
    roughness_length: Any = None,
    shapes: tuple[str, ...] = SHAPES,
    top: float = TOP,
    noise_length: float | None = None,
) -> ViscosityProfile:
    """
    Fit each shape of the viscosity to every profile and choose.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    coriolis
        Their Coriolis parameter; profiles to which it does not apply are declined.
    analytic
        The analytic family fitted to the same stack, for its noise length and criterion.
    error : array, shape (profile,), optional
        Standard error of a wind component, the least that the noise is taken to be. [m s-1]
    roughness_length : float or array, shape (profile,), optional
        Where it is known; it is fitted where this is left out, or NaN. [m]
    shapes
        The shapes to try.
    top
        Levels above this height are not used. [m]
    noise_length
        Correlation length of the noise where it is known. [m]

    Returns
    -------
    ViscosityProfile

    Raises
    ------
    ValueError
        If a roughness length is not positive, or there is no such shape.
    """
    count = stack.profile_count
    floor = np.zeros(count) if error is None else np.broadcast_to(error, (count,))
    given = np.full(count, np.nan)
    if roughness_length is not None:
        given = np.broadcast_to(np.asarray(roughness_length, dtype=float), (count,))
    if (given <= 0).any() or np.isinf(given).any():
        raise ValueError("a roughness length must be above 0 m. Leave it out to have it fitted.")
    if not shapes or not set(shapes) <= set(SHAPES):
        raise ValueError(f"no viscosity has a shape of {shapes}. Choose from {SHAPES}.")
    lengths = LENGTHS if noise_length is None else np.array([float(noise_length)])
    size = max(1, min(512, BLOCK // 2 // max(stack.height.shape[1], 1)))
    parts = [
        _fit_block(
            stack, coriolis, analytic, floor, given, shapes, top, lengths,
            slice(start, start + size),
        )
        for start in range(0, max(count, 1), size)
    ]  # fmt: skip
    return ViscosityProfile(
        **{
            field.name: np.concatenate([getattr(part, field.name) for part in parts])
            for field in fields(ViscosityProfile)
        }
    )


def wind(fitted: ViscosityProfile, z: Floats) -> tuple[Floats, Floats]:
    """
    Wind of the chosen shape at given heights.

    Parameters
    ----------
    fitted
        The fit.
    z : array, shape (profile, level) or (level,)
        Height above ground. [m]

    Returns
    -------
    u, v : array, shape (profile, level)
        Zero at and below the roughness length; NaN where the fit is not determined. [m s-1]
    """
    z = np.asarray(z, dtype=float)
    z = np.broadcast_to(z, (len(fitted.shape), z.shape[-1]))
    u, v = np.full(z.shape, np.nan), np.full(z.shape, np.nan)
    for shape in SHAPES:
        rows = np.flatnonzero(fitted.shape == shape)
        if not rows.size:
            continue
        flip, f = fitted.rotation[rows], np.abs(fitted.coriolis_parameter[rows])
        east, north = (
            fitted.geostrophic_eastward_wind[rows],
            fitted.geostrophic_northward_wind[rows],
        )
        u_star, log_depth = fitted.friction_velocity[rows], np.log(fitted.depth[rows])
        size = u_star / VON_KARMAN
        log_mu = np.log(f / u_star / VON_KARMAN) + log_depth
        # The wall is where the departure is as large as the geostrophic wind; F = C - s near it.
        speed = np.hypot(east, north) / size
        c, _, _ = table(shape).look_up(np.full(rows.shape, BOTTOM), log_mu)
        wall = BOTTOM + c.real - np.sqrt(np.maximum(speed**2 - c.imag**2, 0.0))
        for _ in range(3):
            x, slope, _ = table(shape).look_up(wall, log_mu)
            reach = np.hypot(x.real, x.imag)
            wall = wall + (speed - reach) * reach / (x.real * slope.real + x.imag * slope.imag)
        x, _, _ = table(shape).look_up(wall, log_mu)
        theta = np.stack([log_depth, log_mu, 0.0 * log_mu, log_depth + wall])
        turn = np.arctan2(north * flip, east) - np.arctan2(x.imag, x.real)
        with np.errstate(invalid="ignore"):
            above = np.maximum(z[rows].T, np.exp(theta[search.ROUGHNESS]))
        here = np.isfinite(above)
        w, _ = search.wind_of(table(shape), np.where(here, above, 1.0), theta, size)
        w = np.where(here, search.turned(w[0], w[1], -turn), np.nan)
        u[rows], v[rows] = w[0].T, (w[1] * flip).T
    return u, v


def _fit_block(
    stack: Stack,
    coriolis: Coriolis,
    analytic: EkmanFit,
    floor: Floats,
    roughness: Floats,
    shapes: tuple[str, ...],
    top: float,
    lengths: Any,
    rows: slice,
) -> ViscosityProfile:
    f, floor, roughness = coriolis.coriolis_parameter[rows], floor[rows], roughness[rows]
    rotation = np.where(f < 0, -1.0, 1.0)
    height = stack.height[rows]
    known = np.isfinite(roughness)
    with np.errstate(invalid="ignore"):
        least = np.where(known, np.maximum(2.0 * roughness, LOWEST), LOWEST)
        usable = stack.usable("wind")[rows] & (height >= least[:, np.newaxis]) & (height <= top)
    mirrored = stack.northward_wind[rows] * rotation[:, np.newaxis]
    levels, z, u, v = compact(usable, height, stack.eastward_wind[rows], mirrored)
    reach = np.take_along_axis(z, np.maximum(levels - 1, 0)[:, np.newaxis], -1)[:, 0]
    lowest = z[:, 0]
    speed = np.where(np.isfinite(u), np.hypot(u, v), 0.0).max(axis=-1)
    fitted = coriolis.applies[rows] & (levels >= MINIMUM_LEVELS)
    fitted &= np.isfinite(analytic.noise_length[rows]) & (speed > 0) & (speed < FASTEST)
    count = np.where(fitted, levels, 0)
    there = (np.arange(z.shape[1]) < count[:, np.newaxis]).T
    winds = search.Winds(
        np.where(there, z.T, 1.0), np.where(there, u.T, 0.0), np.where(there, v.T, 0.0), count,
        np.where(fitted, np.abs(f), 1e-4),
        *search.bounds(np.where(fitted, lowest, 10.0), np.where(fitted, roughness, np.nan)),
    )  # fmt: skip
    with np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore"):
        fits = fit_shapes(winds, shapes, analytic.noise_length[rows], lengths, floor, fitted)
        numbers = np.maximum(count, 1)
        free = 4.0 - known
        effective = np.where(fitted, analytic.effective_levels[rows], 1.0)
        squares = np.stack([one.residual for one in fits], -1)
        criterion = np.stack(
            [criterion_of(one.residual, numbers, effective, free) for one in fits], -1
        )
        doubt = np.stack([criterion_of(one.residual, numbers, numbers, free) for one in fits], -1)
        may = fitted[:, np.newaxis] & np.stack([one.inside for one in fits], -1)
        may &= np.isfinite(squares)
        found = may.any(axis=-1)
        criterion = np.where(may, criterion, np.inf)
        choice = np.argmin(criterion, axis=-1)
        values = np.stack([one.values for one in fits])
        errors = np.stack([one.errors for one in fits])
        safe = np.where(may, doubt, np.inf)
        safe[~found] = 0.0
        trust = weights_of(safe.T)
        off = averaged(values, errors, trust, choice)
        chosen = _of(choice, values)
        rms = _take(np.stack([one.rms for one in fits], -1), choice)
        noise = _take(np.stack([one.spread.noise for one in fits], -1), choice)
        rival = np.where(np.isfinite(analytic.candidate_aicc[rows]),
                         analytic.candidate_aicc[rows], np.inf).min(axis=-1)  # fmt: skip
        best = _take(criterion, choice)
        nothing = without_friction(winds, analytic.noise_length[rows], numbers, effective)
        verdict, why = judge(
            Evidence(
                declined=np.where(coriolis.applies[rows], "", coriolis.why[rows]),
                levels=np.where(coriolis.applies[rows], levels, 0),
                fitted=fitted,
                top=top,
                found=found,
                gain=rival - best,
                friction=nothing - best,
                reach=reach,
                lowest=lowest,
                noise=np.maximum(floor, noise),
                floor=floor,
                trend=_take(np.stack([one.spread.trend for one in fits], -1), choice),
                rms=rms,
                chosen=dict(zip(QUANTITIES, chosen, strict=True)),
                errors=dict(zip(QUANTITIES, off, strict=True)),
                given=known,
            )
        )
        told = np.flatnonzero(verdict != "not determined")
        low, high = np.full(off.shape, np.nan), np.full(off.shape, np.nan)
        t = t95(numbers + effective - free) / t95(np.inf)
        low[:, told], high[:, told] = tail_ends(
            values[..., told], errors[..., told], trust[:, told], chosen[:, told],
            np.broadcast_to(t[told], (len(fits), told.size)),
        )  # fmt: skip
    answers = _answers(chosen, off, low, high, rotation, verdict != "not determined")
    determined = verdict != "not determined"
    names = np.array(shapes, dtype=object)

    def each(name: str, function: Any) -> Any:
        stacked = np.stack([function(one.values[QUANTITIES.index(name)]) for one in fits], -1)
        return np.where(may, stacked, np.nan)

    with np.errstate(invalid="ignore"):
        gain = np.where(determined & np.isfinite(rival), rival - best, np.nan)
    length = _take(np.stack([one.length for one in fits], -1), choice)
    return ViscosityProfile(
        **answers,
        shape=np.where(determined, names[choice], "").astype(object),
        rms=np.where(determined, rms, np.nan),
        aicc=np.where(determined, best, np.nan),
        aicc_gain=gain,
        noise_length=np.where(determined, length, np.nan),
        rotation=rotation,
        coriolis_parameter=np.array(f, dtype=float),
        verdict=verdict,
        why=why,
        candidate_shape=np.where(may, names, "").astype(object),
        candidate_aicc=np.where(may, criterion, np.nan),
        candidate_friction_velocity=each("log_friction_velocity", np.exp),
        candidate_cross_isobar_angle=each("cross_isobar_angle", np.array),
    )


def _of(choice: Any, stacked: Any) -> Any:
    return np.take_along_axis(stacked, choice[np.newaxis, np.newaxis], axis=0)[0]


def _take(stacked: Any, choice: Any) -> Any:
    return np.take_along_axis(stacked, choice[:, np.newaxis], axis=-1)[:, 0]


def _answers(chosen: Any, off: Any, low: Any, high: Any, rotation: Any, told: Any) -> Any:
    """Turn the southern hemisphere back and leave out what is not determined."""
    answers: dict[str, Any] = {}

    def give(name: str, value: Any, error: Any, bottom: Any, top: Any) -> None:
        for ending, x in (("", value), ("_error", error), ("_low", bottom), ("_high", top)):
            answers[name + ending] = np.where(told, x, np.nan)

    with np.errstate(over="ignore", invalid="ignore"):
        for k, name in enumerate(("friction_velocity", "roughness_length", "depth")):
            value = np.exp(chosen[k])
            give(name, value, value * off[k], np.exp(low[k]), np.exp(high[k]))
    give("cross_isobar_angle", chosen[3], off[3], low[3], high[3])
    give("geostrophic_eastward_wind", chosen[4], off[4], low[4], high[4])
    flipped = rotation < 0
    give(
        "geostrophic_northward_wind", rotation * chosen[5], off[5],
        np.where(flipped, -high[5], low[5]), np.where(flipped, -low[5], high[5]),
    )  # fmt: skip
    return answers
