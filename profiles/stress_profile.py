r"""
The stress vector with height, the viscosity it implies, and whether the evidence agrees.

In a steady, even layer the departure from the geostrophic wind is what the stress drives, and
stress that has died out at the top of the layer is below it

.. math:: \tau(z) = -i f \int_z^h (W - W_g)\,\mathrm{d}z, \qquad
          K = \frac{\mathrm{Re}(\tau\,\overline{\mathrm{d}W/\mathrm{d}z})}
                   {|\mathrm{d}W/\mathrm{d}z|^2}

(Lettau, H., 1950: Tellus, 2, 125-129; in this complex form, derived here). If all that went in is
true, the stress lies along the shear, at the ground along the wind, and no departure is left above.
Where one of these is broken by more than the errors, the evidence contradicts itself.

The geostrophic wind goes in: given, fitted, or the one of
:mod:`backveer.profiles.viscosity_profile`, which is the one that makes stress and shear agree under
the viscosity that it fits. To solve for the wind that makes them agree with no law of the viscosity
was tried and left out: noise in the shear draws it toward the wind by ten times its error.

Its inverse, the shear over the stress, is linear in the noise of the shear: the interval of the
viscosity is that of its inverse turned over, with no upper end where the shear may be nothing.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.earth import Coriolis
from backveer.profiles.grid import at_height, compact, integral_between
from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.momentum_integral import departure_integral, friction_velocity
from backveer.profiles.stack import Stack
from backveer.profiles.surface_layer import VON_KARMAN

LAYERS = 5  # parts of the depth over which stress and shear are told; a choice
MINIMUM_LEVELS = 5  # inside the layer; a choice
HIGHEST_START = 0.2  # depths of the lowest level at most, as in geostrophic.py
ABOVE = 1.3  # depths up to which the departure above the layer is looked at; a choice
LEFT = 0.1  # departure there over the geostrophic wind that a layer in balance may have; a choice
ASTRAY = 30.0  # degrees between surface stress and lowest wind that height explains; a choice
STEEP = 3.0  # errors of stress, shear or inverse viscosity below which none is divided by; a choice
LARGEST = 0.15  # of K / (kappa u* h): x (1 - x)^2 is largest at 1/3, ekman_solver's square shape
NORMAL = 1.96  # two-sided 95 % point of the normal distribution
FIRM = 2.0  # a number is told, and a contradiction named, at so many times its error

CONSISTENT, CONTRADICTORY, NOT = "consistent", "contradictory", "not determined"


@dataclass(frozen=True, eq=False)
class StressProfile(Labelled):
    """Stress, implied viscosity and consistency; layers are equal parts of the depth."""

    friction_velocity: Floats = variable("m s-1", "profile", "friction velocity u*")
    friction_velocity_error: Floats = variable("m s-1", "profile", "its standard error")
    surface_stress_eastward: Floats = variable(
        "m2 s-2", "profile", "kinematic stress at the ground toward east"
    )
    surface_stress_northward: Floats = variable(
        "m2 s-2", "profile", "kinematic stress at the ground toward north"
    )
    surface_stress_error: Floats = variable("m2 s-2", "profile", "standard error of a component")
    stress_from_wind: Floats = variable(
        "degree", "profile", "surface stress from the lowest wind, positive to the left"
    )
    stress_from_wind_error: Floats = variable("degree", "profile", "its standard error")
    cross_isobar_angle: Floats = variable(
        "degree",
        "profile",
        "surface stress toward low pressure from the geostrophic wind, positive",
    )
    cross_isobar_angle_error: Floats = variable("degree", "profile", "its standard error")
    departure_above: Floats = variable(
        "m s-1", "profile", "size of the mean departure just above the depth"
    )
    verdict: Words = variable("", "profile", "whether the evidence agrees with itself")
    why: Words = variable("", "profile", "how it contradicts itself, or why that is not known")
    layer_base: Floats = variable("m", "profile layer", "base of the layer")
    layer_top: Floats = variable("m", "profile layer", "top of the layer")
    layer_stress_eastward: Floats = variable(
        "m2 s-2", "profile layer", "kinematic stress in mid-layer toward east"
    )
    layer_stress_northward: Floats = variable(
        "m2 s-2", "profile layer", "kinematic stress in mid-layer toward north"
    )
    layer_stress_error: Floats = variable("m2 s-2", "profile layer", "error of a component")
    layer_viscosity: Floats = variable(
        "m2 s-1", "profile layer", "viscosity by which it follows from the mean shear"
    )
    layer_viscosity_low: Floats = variable("m2 s-1", "profile layer", "lower end of its 95 %")
    layer_viscosity_high: Floats = variable(
        "m2 s-1", "profile layer", "upper end of its 95 %, infinite where there is none"
    )
    layer_stress_from_shear: Floats = variable(
        "degree", "profile layer", "stress from the shear, positive to the left"
    )


def stress_profile(
    stack: Stack,
    coriolis: Coriolis,
    geostrophic: Any,
    depth: Floats,
    geostrophic_error: Any = 0.0,
    error: Any = 0.0,
    noise_length: Any = 0.0,
) -> StressProfile:
    """
    Work the stress out from the departure, and check it.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    coriolis
        Their Coriolis parameter; profiles to which it does not apply are declined.
    geostrophic : complex array, shape (profile,) or (profile, level)
        East + i north: the same at all heights, or at the levels. [m s-1]
    depth : array, shape (profile,)
        Where the stress has died out. [m]
    geostrophic_error, error : array, shape (profile,)
        Standard error of a component of the geostrophic wind and of the wind. [m s-1]
    noise_length : array, shape (profile,)
        Distance over which the correlation of wind errors falls to 1/e. [m]
    """
    count, shape = stack.profile_count, stack.height.shape
    geostrophic = np.asarray(geostrophic, dtype=complex)
    sigma_g, sigma, length, depth = (
        np.nan_to_num(np.broadcast_to(np.asarray(x, dtype=float), (count,)), nan=fill)
        for x, fill in ((geostrophic_error, np.nan), (error, np.nan), (noise_length, 0.0),
                        (depth, np.nan))
    )  # fmt: skip
    flat = geostrophic.ndim < 2
    aloft = np.broadcast_to(geostrophic[:, np.newaxis] if flat else geostrophic, shape)
    with np.errstate(all="ignore"):
        usable = stack.usable("wind") & (stack.height > 0) & np.isfinite(aloft)
        sound = np.abs(stack.eastward_wind) + np.abs(stack.northward_wind) < 1e3
        levels, z, u, v, ge, gn = compact(
            usable & sound, stack.height, stack.eastward_wind, stack.northward_wind,
            aloft.real, aloft.imag,
        )  # fmt: skip
        wind, wg = u + 1j * v, ge + 1j * gn
        there = np.arange(z.shape[1]) < levels[:, np.newaxis]
        within = np.count_nonzero(there & (z <= depth[:, np.newaxis]), axis=-1)
        lowest = z[:, 0]
        last = np.take_along_axis(z, np.maximum(levels - 1, 0)[:, np.newaxis], -1)[:, 0]
        ground = geostrophic if flat else wg[:, 0]
        f = coriolis.coriolis_parameter
        grave = [
            (~coriolis.applies, coriolis.why),
            (~np.isfinite(ground), "the geostrophic wind is not known"),
            (~np.isfinite(depth), "the depth of the boundary layer is not known"),
            (within < MINIMUM_LEVELS, "fewer than five levels with wind lie within the layer"),
            (~(last >= depth), "the profile ends below the top of the boundary layer"),
            (~(lowest <= HIGHEST_START * depth), "the lowest wind is too high above the ground"),
        ]
        spacing = (depth - lowest) / np.maximum(within - 1, 1)
        length = np.maximum(length, 0.5 * spacing)  # independent levels err over half a spacing
        surface = departure_integral(z, wind, wg, ground, depth, sigma, length)
        tau0 = -1j * f * surface.value
        tau0_error = np.abs(f) * np.hypot(surface.error, sigma_g * depth)
        u_star, u_star_error = friction_velocity(f, surface.value, tau0_error / np.abs(f))
        grave.append(
            (~(np.abs(tau0) > FIRM * tau0_error), "the surface stress is smaller than its error")
        )
        layers = _layers(z, wind, wg, f, depth, sigma_g, sigma, length, tau0)
        turn = np.where(f < 0, -1.0, 1.0)
        from_wind = np.degrees(np.angle(tau0 * wind[:, 0].conj()))
        angle_error = np.degrees(tau0_error / np.abs(tau0))
        from_wind_error = np.hypot(angle_error, np.degrees(sigma / np.abs(wind[:, 0])))
        angle = turn * np.degrees(np.angle(tau0 * ground.conj()))
        above = np.minimum(ABOVE * depth, last)
        slab = above - depth
        left = np.abs(integral_between(
            z, wind - wg, depth[:, np.newaxis], above[:, np.newaxis]
        )[:, 0]) / slab  # fmt: skip
        left_error = np.hypot(_path_error(sigma, length, slab) / slab, sigma_g)
        contrary = np.count_nonzero(layers["contrary"], axis=-1)
        contradictions = [
            (
                (np.abs(from_wind) > ASTRAY) & (np.abs(from_wind) > FIRM * from_wind_error),
                "the surface stress lies {:.0f} degrees off the surface wind",
                np.abs(from_wind),
            ),
            (
                (left > LEFT * np.abs(ground)) & (left > FIRM * left_error),
                "the stress does not vanish aloft: a departure of {:.1f} m/s is left there",
                left,
            ),
            (
                contrary > 0,
                "the stress points against the shear in {:d} layers",
                contrary,
            ),
        ]
    why = np.full(count, "", dtype=object)
    verdict = np.full(count, CONSISTENT, dtype=object)
    for holds, reason in grave:
        new = holds & (why == "")
        verdict[new] = NOT
        why[new] = np.broadcast_to(np.asarray(reason, dtype=object), why.shape)[new]
    for holds, form, number in contradictions:
        new = holds & (why == "")
        verdict[new] = CONTRADICTORY
        why[new] = [form.format(x) for x in number[new].tolist()]
    told = verdict != NOT

    def give(x: Any) -> Any:
        return np.where(told if x.ndim < 2 else told[:, np.newaxis], x, np.nan)

    angle_all = np.hypot(angle_error, np.degrees(sigma_g / np.maximum(np.abs(ground), 1e-300)))
    return StressProfile(
        friction_velocity=give(u_star),
        friction_velocity_error=give(u_star_error),
        surface_stress_eastward=give(tau0.real),
        surface_stress_northward=give(tau0.imag),
        surface_stress_error=give(tau0_error),
        stress_from_wind=give(from_wind),
        stress_from_wind_error=give(from_wind_error),
        cross_isobar_angle=give(angle),
        cross_isobar_angle_error=give(angle_all),
        departure_above=give(left),
        verdict=verdict,
        why=why,
        layer_base=give(layers["base"]),
        layer_top=give(layers["top"]),
        layer_stress_eastward=give(layers["stress"].real),
        layer_stress_northward=give(layers["stress"].imag),
        layer_stress_error=give(layers["stress_error"]),
        layer_viscosity=give(layers["viscosity"]),
        layer_viscosity_low=give(layers["viscosity_low"]),
        layer_viscosity_high=give(layers["viscosity_high"]),
        layer_stress_from_shear=give(layers["turned"]),
    )


def _path_error(sigma: Any, length: Any, path: Any) -> Any:
    r"""
    Give the standard error of the integral of correlated noise over a path. [m2 s-1].

    Its variance is :math:`2\sigma^2\ell^2 (D/\ell - 1 + e^{-D/\ell})`.
    """
    x = path / length
    return sigma * length * np.sqrt(np.maximum(2.0 * (x + np.expm1(-x)), 0.0))


def _layers(
    z: Any,
    wind: Any,
    wg: Any,
    f: Any,
    depth: Any,
    sigma_g: Any,
    sigma: Any,
    length: Any,
    ground_stress: Any,
) -> dict[str, Any]:
    """Stress in mid-layer, shear, and what they make of each other, over equal parts of h."""
    share = np.linspace(0.0, 1.0, LAYERS + 1)
    edges = depth[:, np.newaxis] * share
    edges[:, 0] = np.maximum(edges[:, 0], z[:, 0])
    middle = 0.5 * (edges[:, 1:] + edges[:, :-1])
    thickness = np.diff(edges, axis=-1)
    shear = np.diff(at_height(z, wind, edges), axis=-1) / thickness
    top = np.broadcast_to(depth[:, np.newaxis], middle.shape)
    force = integral_between(z, wind - wg, middle, top)
    stress = -1j * f[:, np.newaxis] * force
    path = top - middle
    wide = length[:, np.newaxis]
    noise = _path_error(sigma[:, np.newaxis], wide, path)
    stress_error = np.abs(f)[:, np.newaxis] * np.hypot(noise, sigma_g[:, np.newaxis] * path)
    shear_error = sigma[:, np.newaxis] * np.sqrt(-2.0 * np.expm1(-thickness / wide)) / thickness
    size = np.abs(shear)
    inverse = (shear * stress.conj()).real / np.abs(stress) ** 2
    error = np.hypot(shear_error, np.abs(inverse) * stress_error) / np.abs(stress)
    # What is told must not hang on how the noise fell, or the lucky ones are told, all to one side:
    # the stress and the viscosity are held against what a layer of that depth and u* is like.
    usual_stress = np.abs(ground_stress)[:, np.newaxis] * (path / depth[:, np.newaxis]) ** 2
    firm = usual_stress > STEEP * stress_error
    usual_viscosity = LARGEST * VON_KARMAN * np.sqrt(np.abs(ground_stress)) * depth
    inverse, error = np.where(firm, inverse, np.nan), np.where(firm, error, np.nan)
    highest, lowest = inverse + NORMAL * error, inverse - NORMAL * error
    # Where there may be no stress, the viscosity may be anything.
    open_ended = np.abs(stress) < STEEP * stress_error
    highest, lowest = np.where(open_ended, np.inf, highest), np.where(open_ended, -1.0, lowest)
    beyond = np.where(firm, np.inf, np.nan)
    return {
        "base": edges[:, :-1],
        "top": edges[:, 1:],
        "stress": stress,
        "stress_error": stress_error,
        "viscosity": np.where(
            (STEEP * error * usual_viscosity[:, np.newaxis] < 1.0) & (inverse > 0),
            1.0 / inverse,
            np.nan,
        ),
        "viscosity_low": np.where(firm & (highest > 0), 1.0 / highest, np.nan),
        "viscosity_high": np.where(firm & (lowest > 0), 1.0 / lowest, beyond),
        "turned": np.where(
            firm & (size > STEEP * shear_error),
            np.degrees(np.angle(stress * shear.conj())),
            np.nan,
        ),
        "contrary": highest < 0,
    }
