r"""
Thermal wind and temperature advection, layer by layer, from a single profile.

A geostrophic wind that changes with height tells the horizontal gradient of temperature, and a
geostrophic wind that turns with height blows across that gradient: veering brings warm air in the
northern hemisphere, backing cold air, and the other way round in the southern. With
:math:`x = -\ln p`, growing upward, and the mean :math:`(\bar u, \bar v)` and slope of the
geostrophic wind over a layer,

.. math::
    \frac{\partial T}{\partial x_E} = \frac{f}{R} \frac{dv}{dx}, \qquad
    \frac{\partial T}{\partial x_N} = -\frac{f}{R} \frac{du}{dx}, \qquad
    A = -\bar{\mathbf V} \cdot \nabla T
      = -\frac{f}{R} \left(\bar u \frac{dv}{dx} - \bar v \frac{du}{dx}\right)

[1]_. For a layer with a wind at each end only this is
:math:`A = f V_1 V_2 \sin(\text{veering}) / (R \ln(p_1 / p_2))`. T is the virtual temperature.

Friction turns the wind too. Within the layer of friction the wind is not geostrophic, and calling
its turning advection is the classic mistake: there the frictional part of a well determined Ekman
spiral is taken out first, and where there is none, no answer is given.

References
----------
.. [1] Neiman, P. J., and M. A. Shapiro, 1989: Retrieving horizontal temperature gradients and
   advections from single-station wind profiler observations. Wea. Forecasting, 4, 222-233.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.air import GAS_CONSTANT
from backveer.profiles.earth import Coriolis
from backveer.profiles.ekman import EkmanFit
from backveer.profiles.friction_correction import friction_depth, frictional_wind, spiral_variance
from backveer.profiles.grid import at_height, compact, integral_between, ordered_sum
from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.layer_line import LayerLine, layer_line, noise_gain
from backveer.profiles.level_pressure import level_pressure
from backveer.profiles.stack import Stack
from backveer.profiles.wind_error import wind_error

# Pa, standard isobaric surfaces: WMO-No. 306, Manual on Codes, FM 35 TEMP.
STANDARD_PRESSURES = (
    100000.0, 92500.0, 85000.0, 70000.0, 50000.0, 40000.0, 30000.0, 25000.0, 20000.0, 15000.0,
    10000.0,
)  # fmt: skip
NOISE_LENGTH = 100.0  # m, of wind errors along height where the fit tells none: choice
LEAST_COVER = 0.5  # share of a layer, in ln p, that the profile must cover: choice
WIDEST_GAP = (
    1.5  # between levels, over the layer, both in ln p: choice; one whole layer may be bare
)
FEWEST_SCATTERS = (
    4  # levels within a layer that tell a scatter about its line: four more than 2 x 2
)
# Relative error of the spiral's share, for viscosity is not constant: measured on solved boundary
# layers whose viscosity varies with height (test_thermal_wind.py); with it some two thirds of the
# advections lie within one standard error of the truth, and nearly all within two.
CORRECTION_DOUBT = 0.5
# Standard errors beyond which advection is called warm or cold: about 95 %. One would call a third
# of all layers without advection one or the other.
SENSE_FACTOR = 2.0

NOT_REACHED = "the profile does not reach into this layer"
TOO_LITTLE = "the profile covers less than half of this layer"
TOO_SPARSE = "the levels around this layer are too far apart"
FRICTION = (
    "the layer reaches into the air that friction turns, and no well determined spiral "
    "tells how much of the turning is friction's"
)
OVERFLOW = "the numbers of this layer are beyond all bounds"
NO_PRESSURE = "no level with a wind has a pressure or a height"


@dataclass(frozen=True, eq=False)
class ThermalWind(Labelled):
    """Thermal wind, temperature gradient and advection of the layers of each profile."""

    layer_base_pressure: Floats = variable("Pa", "profile layer", "pressure at the base")
    layer_top_pressure: Floats = variable("Pa", "profile layer", "pressure at the top")
    layer_base_height: Floats = variable("m", "profile layer", "base, above ground")
    layer_top_height: Floats = variable("m", "profile layer", "top, above ground")
    layer_eastward: Floats = variable(
        "m s-1", "profile layer", "thermal wind toward the east: geostrophic, top minus base"
    )
    layer_northward: Floats = variable(
        "m s-1", "profile layer", "thermal wind toward the north: geostrophic, top minus base"
    )
    layer_temperature_gradient_eastward: Floats = variable(
        "K m-1", "profile layer", "temperature gradient, positive where it is warmer to the east"
    )
    layer_temperature_gradient_northward: Floats = variable(
        "K m-1", "profile layer", "temperature gradient, positive where it is warmer to the north"
    )
    layer_advection: Floats = variable(
        "K s-1", "profile layer", "mean temperature advection, positive for warming"
    )
    layer_error: Floats = variable("K s-1", "profile layer", "standard error of the advection")
    layer_uncorrected_advection: Floats = variable(
        "K s-1", "profile layer", "what the wind as measured would say if it were geostrophic"
    )
    layer_mean_temperature: Floats = variable(
        "K", "profile layer", "mean air temperature over ln p, where measured throughout"
    )
    layer_corrected: Bools = variable(
        "", "profile layer", "whether the frictional part of the wind was taken out"
    )
    layer_sense: Words = variable(
        "", "profile layer", "warm, cold or none (less than twice its error)"
    )
    layer_why: Words = variable("", "profile layer", "why the advection is not determined")
    friction_depth: Floats = variable(
        "m", "profile", "depth of the layer in which friction turns the wind, as used here"
    )
    friction_depth_from: Words = variable(
        "", "profile", "fit, boundary-layer depth, or default: where that depth comes from"
    )
    pressure_from: Words = variable("", "profile", "where the pressure of the levels comes from")


def thermal_wind(
    stack: Stack,
    coriolis: Coriolis,
    fit: EkmanFit,
    error: Any = None,
    pressures: Sequence[float] | None = None,
    depth: Any = None,
) -> ThermalWind:
    r"""
    State the thermal wind and the temperature advection by layer.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    coriolis, fit
        Their Coriolis parameter and Ekman fit.
    error : float or array, shape (profile,)
        Standard error of a wind component; estimated if left out. [m s-1]
    pressures
        Bounds of the layers, falling; the standard ones from 1000 to 100 hPa if left out. [Pa]
    depth : array, shape (profile,)
        Boundary-layer depth, for profiles without a well determined fit. [m]

    Returns
    -------
    ThermalWind
        One layer for each pair of pressures. A layer that the profile covers in part is clipped to
        it, and answered if at least half of it, in ln p, is left.

    Raises
    ------
    ValueError
        For fewer than two pressures, for pressures that do not fall or are not positive, and for
        pressures that can only be hPa.

    Notes
    -----
    Slope and mean of the wind are those of the line laid through the layer
    (:mod:`backveer.profiles.layer_line`). The difference between the winds at the edges would throw
    away the levels between, and takes the noise of two levels in full. The error follows from that
    of each level, correlated over the noise length of the fit (100 m where it tells none); levels
    that scatter about the line by more than their error widen it, over a length of a quarter of the
    layer, as waves do. It does not know how far the free wind is from geostrophic, some 10 % of
    the wind in the mid-latitudes (common practice, no source).

    Friction reaches to pi times the scale height of a well determined fit (Ekman, 1905: the first
    height where the wind is parallel to the geostrophic wind), otherwise to 1.25 times the
    boundary-layer depth but at least 300 m, otherwise to 1250 m. What a corrected layer loses to
    the spiral carries the errors of the spiral's parameters and half of itself, for the viscosity
    of real air is not constant: a layer within friction rarely has a sense. The inertial
    oscillation above a stable night is not friction and is not taken out.

    Levels without a pressure get one (:func:`backveer.profiles.level_pressure.level_pressure`), and
    ``pressure_from`` says how.

    Examples
    --------
    >>> from backveer.profiles.earth import coriolis
    >>> from backveer.profiles.ekman import fit
    >>> stack = Stack.of(
    ...     height=[3000.0, 5600.0],
    ...     air_pressure=[70000.0, 50000.0],
    ...     eastward_wind=[0.0, 10.0],
    ...     northward_wind=[10.0, 10.0],
    ...     latitude=45.0,
    ... )
    >>> f = coriolis(stack)
    >>> told = thermal_wind(stack, f, fit(stack, f), error=0.5, pressures=[70000.0, 50000.0])
    >>> (told.layer_advection * 3600.0).round(2), told.layer_sense
    (array([[0.38]]), array([['warm']], dtype=object))
    """
    edges = _edges(pressures)
    sigma = wind_error(stack) if error is None else np.asarray(error, dtype=float)
    sigma = np.broadcast_to(sigma, (stack.profile_count,))
    friction, friction_from, well = friction_depth(fit, depth, stack.profile_count)
    pressure, pressure_from = level_pressure(stack)
    count, z, p, x, u, v = _levels(stack, pressure)
    drag_u, drag_v = frictional_wind(fit, coriolis.coriolis_parameter, well, z)
    warm = np.where(stack.usable("temperature"), stack.air_temperature, np.nan)
    with np.errstate(invalid="ignore", divide="ignore"):
        x_all = np.where(np.isfinite(pressure), -np.log(pressure), np.nan)
        bounds = -np.log(edges)
        last = np.maximum(count - 1, 0)[:, np.newaxis]
        base = np.maximum(bounds[:-1], x[:, :1])
        top = np.minimum(bounds[1:], np.take_along_axis(x, last, axis=1))
        base_pressure = np.minimum(edges[:-1], p[:, :1])
        top_pressure = np.maximum(edges[1:], np.take_along_axis(p, last, axis=1))
        reached = base < top
        base, top = np.where(reached, base, np.nan), np.where(reached, top, np.nan)
        covered = (top - base) >= LEAST_COVER * np.diff(bounds)
    base_height, top_height = _height(z, x, base), _height(z, x, top)

    noise_length = np.asarray(fit.noise_length, dtype=float)
    noise_length = np.where(np.isfinite(noise_length), noise_length, NOISE_LENGTH)
    scale = coriolis.coriolis_parameter / GAS_CONSTANT
    columns: list[tuple[Any, ...]] = []
    for number in range(len(edges) - 1):
        line = layer_line(x, base[:, number], top[:, number])
        wind = (line.take(u), line.take(v))
        heights = np.where(np.isfinite(line.place), line.take(z), np.nan)
        with np.errstate(invalid="ignore"):
            inside = reached[:, number] & (base_height[:, number] < friction) & well
        drag = (
            np.where(inside[:, np.newaxis], line.take(drag_u), 0.0),
            np.where(inside[:, np.newaxis], line.take(drag_v), 0.0),
        )
        with np.errstate(invalid="ignore", over="ignore", under="ignore", divide="ignore"):
            plain, _ = _advection(line, wind, scale)
            corrected = (wind[0] - drag[0], wind[1] - drag[1])
            advection, gradient = _advection(line, corrected, scale)
            variance = _noise_variance(line, corrected, heights, sigma, noise_length)
            if inside.any():
                spiral = spiral_variance(
                    line, corrected, drag, line.take(z), coriolis.coriolis_parameter, fit
                )
                variance = variance + np.where(inside, spiral, 0.0)
            doubt = np.sqrt(scale**2 * variance + (CORRECTION_DOUBT * (advection - plain)) ** 2)
            thermal = [line.slope(w) * line.extent for w in corrected]
            sparse = line.widest_gap > WIDEST_GAP * line.extent
        columns.append((*thermal, *gradient, advection, doubt, plain, inside, sparse))
    answers = [np.stack(column, axis=-1) for column in zip(*columns, strict=True)]
    *numbers, plain, corrected_for, sparse = answers

    applies = np.asarray(coriolis.applies, dtype=bool)[:, np.newaxis]
    with np.errstate(invalid="ignore"):
        caught = (base_height < friction[:, np.newaxis]) & ~well[:, np.newaxis]
    finite = np.logical_and.reduce([np.isfinite(number) for number in numbers])
    why = np.select(
        [~applies, (count == 0)[:, np.newaxis], ~reached, ~covered, sparse, caught, ~finite],
        [
            np.asarray(coriolis.why, dtype=object)[:, np.newaxis],
            NO_PRESSURE, NOT_REACHED, TOO_LITTLE, TOO_SPARSE, FRICTION, OVERFLOW,
        ],
        default="",
    ).astype(object)  # fmt: skip
    good = why == ""
    eastward, northward, to_east, to_north, advection, doubt = (
        np.where(good, number, np.nan) for number in numbers
    )
    told = good | ((why == FRICTION) & np.isfinite(plain))
    with np.errstate(invalid="ignore"):
        none = ~(np.abs(advection) > SENSE_FACTOR * doubt)
        sense = np.where(none, "none", np.where(advection > 0, "warm", "cold"))
    return ThermalWind(
        layer_base_pressure=np.where(reached, base_pressure, np.nan),
        layer_top_pressure=np.where(reached, top_pressure, np.nan),
        layer_base_height=base_height,
        layer_top_height=top_height,
        layer_eastward=eastward,
        layer_northward=northward,
        layer_temperature_gradient_eastward=to_east,
        layer_temperature_gradient_northward=to_north,
        layer_advection=advection,
        layer_error=doubt,
        layer_uncorrected_advection=np.where(told, plain, np.nan),
        layer_mean_temperature=_mean(x_all, warm, base, top),
        layer_corrected=corrected_for & good,
        layer_sense=np.where(good, sense, "").astype(object),
        layer_why=why,
        friction_depth=friction,
        friction_depth_from=friction_from,
        pressure_from=pressure_from,
    )


def _edges(pressures: Sequence[float] | None) -> Floats:
    """Check the bounds of the layers."""
    edges = np.asarray(STANDARD_PRESSURES if pressures is None else pressures, dtype=float)
    falling = edges.ndim == 1 and edges.size >= 2 and bool((np.diff(edges) < 0).all())
    if not falling or not np.isfinite(edges).all() or edges[-1] <= 0:
        raise ValueError(
            f"layer pressures must be at least two positive numbers that fall with height, "
            f"not {edges.tolist()}. Sort them and leave out repeated ones."
        )
    if edges[0] < 1100.0:
        raise ValueError(
            f"the highest layer pressure is {edges[0]:g} Pa, which is found above 30 km. "
            f"Give pressures in Pa: 850 hPa is 85000 Pa."
        )
    return edges


def _levels(stack: Stack, pressure: Floats) -> tuple[Any, ...]:
    """Levels with a wind and a pressure that does not rise: count, z, p, x = -ln p, u, v."""
    with np.errstate(invalid="ignore", divide="ignore"):
        x = np.where(stack.usable("wind") & (pressure > 0), -np.log(pressure), np.nan)
    highest = np.maximum.accumulate(np.where(np.isfinite(x), x, -np.inf), axis=1)
    keep = np.isfinite(x) & (x >= highest)
    answer: tuple[Any, ...] = compact(
        keep, stack.height, pressure, x, stack.eastward_wind, stack.northward_wind
    )
    return answer


def _advection(
    line: LayerLine, wind: tuple[Floats, Floats], scale: Floats
) -> tuple[Floats, tuple[Floats, Floats]]:
    """Advection and the temperature gradient toward east and north, from a geostrophic wind."""
    u, v = wind
    mean_u, mean_v = line.mean(u), line.mean(v)
    slope_u, slope_v = line.slope(u), line.slope(v)
    gradient = scale * slope_v, -scale * slope_u
    return -(mean_u * gradient[0] + mean_v * gradient[1]), gradient


def _noise_variance(
    line: LayerLine,
    wind: tuple[Floats, Floats],
    z: Floats,
    sigma: Floats,
    noise_length: Floats,
) -> Floats:
    """
    Variance of mean x slope from the noise of the levels. [m4 s-4]

    To second order in the noise, so that a calm has an error too.
    """
    u, v = wind
    mean_u, mean_v, slope_u, slope_v = (*map(line.mean, wind), *map(line.slope, wind))
    off = line.x - line.middle[:, np.newaxis]
    inside = np.abs(off) <= 0.5 * line.extent[:, np.newaxis] * (1.0 + 1e-9)
    rest = [
        np.where(inside, w - a[:, np.newaxis] - b[:, np.newaxis] * off, 0.0)
        for w, a, b in ((u, mean_u, slope_u), (v, mean_v, slope_v))
    ]
    count = np.count_nonzero(inside, axis=1)
    freedom = np.maximum(2.0 * count - 4.0, 1.0)
    scatter = ordered_sum(rest[0] ** 2 + rest[1] ** 2) / freedom
    beyond = np.where(count >= FEWEST_SCATTERS, np.maximum(scatter - sigma**2, 0.0), 0.0)
    depth = np.fmax.reduce(z, axis=1, initial=np.nan) - np.fmin.reduce(z, axis=1, initial=np.nan)
    own, wave = noise_gain(line, z, noise_length), noise_gain(line, z, 0.25 * depth)
    of_mean, of_slope, both = (sigma**2 * n + beyond * w for n, w in zip(own, wave, strict=True))
    first = (
        (slope_u**2 + slope_v**2) * of_mean
        + (mean_u**2 + mean_v**2) * of_slope
        - 2.0 * both * (mean_u * slope_u + mean_v * slope_v)
    )
    second = 2.0 * np.maximum(of_mean * of_slope - both**2, 0.0)
    variance: Floats = np.maximum(first, 0.0) + second
    return variance


def _height(z: Floats, x: Floats, target: Floats) -> Floats:
    """Height above ground at x; of levels with the same pressure, that of the lowest."""
    with np.errstate(invalid="ignore"):
        first = np.concatenate([np.ones_like(x[:, :1], bool), x[:, 1:] > x[:, :-1]], axis=1)
        height: Floats = at_height(np.where(first, x, np.nan), z, target)
    return height


def _mean(x: Floats, y: Floats, base: Floats, top: Floats) -> Floats:
    """Mean of a variable over x, NaN where it does not cover the layer."""
    highest = np.maximum.accumulate(np.where(np.isfinite(x), x, -np.inf), axis=1)
    below = np.concatenate([np.full_like(highest[:, :1], -np.inf), highest[:, :-1]], axis=1)
    rising = np.isfinite(x) & (x > below)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        whole = integral_between(np.where(rising, x, np.nan), y, base, top)
        mean: Floats = whole / (top - base)
    return mean
