"""
The boundary layer: its depth by bulk Richardson number, its inversions, the nose of its jet.

Kernels for Richardson numbers are here too; inversions.py and low_level_jet.py have theirs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from backveer.profiles import air
from backveer.profiles.earth import STANDARD_GRAVITY
from backveer.profiles.grid import compact
from backveer.profiles.inversions import inversions
from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.low_level_jet import CRITERION, jet
from backveer.profiles.stack import Stack

# Troen, I., and L. Mahrt, 1986: Boundary-Layer Meteorol., 37, 129-148 use 0.5, most radiosonde work
# since Vogelezang and Holtslag, 1996 uses 0.25, the limit of Miles, 1961 and Howard, 1961 (the
# GFS documentation citing the first; checks.md B4, B5).
CRITICAL_RICHARDSON = 0.25
# The parcel starts in the surface layer; higher up it says nothing about air from the ground. A
# tenth of a boundary layer of 1 km: Stull, 1988: An Introduction to Boundary Layer Meteorology.
HIGHEST_REFERENCE = 100.0  # [m]

NO_TEMPERATURE = "there is no temperature"
TOO_FEW = "fewer than two levels have both temperature and wind"
TOO_HIGH = "the lowest level with temperature and wind lies above 100 m, out of the surface layer"
SHALLOW = "the bulk Richardson number is above its critical value at the second level already"
NOT_REACHED = "the bulk Richardson number stays below its critical value up to the highest level"


@dataclass(frozen=True, eq=False)
class BoundaryLayer(Labelled):
    """Depth, inversions and jet of each profile, with the settings that made them."""

    bulk_richardson_depth: Floats = variable(
        "m",
        "profile",
        "height above ground where the bulk Richardson number reaches its critical value",
        "atmosphere_boundary_layer_thickness",
    )
    depth_why: Words = variable("", "profile", "why the depth is not determined")
    inversion_base: Floats = variable("m", "profile inversion", "base above ground")
    inversion_top: Floats = variable("m", "profile inversion", "top above ground")
    inversion_strength: Floats = variable(
        "K", "profile inversion", "temperature at the top minus that at the base"
    )
    inversion_kind: Words = variable("", "profile inversion", "surface-based or elevated")
    inversion_count: Floats = variable(
        "1", "profile", "number of inversions; the strongest four are told"
    )
    jet_height: Floats = variable("m", "profile", "height above ground of the wind's maximum")
    jet_speed: Floats = variable("m s-1", "profile", "wind speed there")
    jet_falloff: Floats = variable(
        "m s-1", "profile", "wind speed there minus the minimum above, before it is stronger again"
    )
    jet_meets_criterion: Bools = variable("1", "profile", "whether the maximum is a low-level jet")
    jet_why: Words = variable(
        "", "profile", "why the falloff is not determined, or the maximum is no nose"
    )
    critical_richardson: float = CRITICAL_RICHARDSON
    jet_criterion: str = CRITERION


def boundary_layer(stack: Stack, critical_richardson: float = CRITICAL_RICHARDSON) -> BoundaryLayer:
    """
    Find the depth of the boundary layer, inversions and the low-level jet.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    critical_richardson
        Bulk Richardson number at the top of the boundary layer, above 0.

    Returns
    -------
    BoundaryLayer

    Raises
    ------
    ValueError
        For a critical Richardson number that is not above 0.

    Examples
    --------
    >>> stack = Stack.of(
    ...     height=[2.0, 100.0, 500.0, 1000.0],
    ...     air_temperature=[293.0, 292.0, 288.1, 290.0],
    ...     eastward_wind=[3.0, 7.0, 8.0, 9.0],
    ...     northward_wind=0.0,
    ... )
    >>> told = boundary_layer(stack)
    >>> told.bulk_richardson_depth.round(), told.inversion_kind[0, 0], told.jet_height
    (array([547.]), 'elevated', array([1000.]))
    """
    if not critical_richardson > 0:
        raise ValueError(
            f"the critical Richardson number must be above 0, not {critical_richardson}. "
            f"Usual values lie from 0.15 to 0.5."
        )
    depth, why = _depth(stack, critical_richardson)
    warm = inversions(stack.height, stack.air_temperature, stack.usable("temperature"))
    nose = jet(stack.height, stack.wind_speed, stack.usable("wind"))
    return BoundaryLayer(
        bulk_richardson_depth=depth,
        depth_why=why,
        inversion_base=warm.base,
        inversion_top=warm.top,
        inversion_strength=warm.strength,
        inversion_kind=warm.kind,
        inversion_count=warm.number,
        jet_height=nose.height,
        jet_speed=nose.speed,
        jet_falloff=nose.falloff,
        jet_meets_criterion=nose.meets,
        jet_why=nose.why,
        critical_richardson=float(critical_richardson),
    )


def bulk_richardson_number(
    theta_v: Floats, theta_v_difference: Floats, depth: Floats, du: Floats, dv: Floats
) -> Floats:
    r"""
    Bulk Richardson number of a layer.

    Parameters
    ----------
    theta_v : array
        Virtual potential temperature of the layer (or of its base). [K]
    theta_v_difference : array
        Top minus base; not the difference of temperature. [K]
    depth : array
        Top minus base. [m]
    du, dv : array
        Difference of the wind, top minus base (base 0 for the ground). [m s-1]

    Returns
    -------
    number : array
        Positive where stable; infinite where there is no wind difference. [1]

    Notes
    -----
    .. math:: Ri_B = \frac{g}{\theta_v} \frac{\Delta\theta_v \, \Delta z}
              {(\Delta u)^2 + (\Delta v)^2}

    Stull, 1988: An Introduction to Boundary Layer Meteorology. Kluwer, ch. 5.

    Examples
    --------
    >>> bulk_richardson_number(251.65, 1.9, 500.0, 10.0, 8.0).round(3)
    np.float64(0.226)
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        square = np.asarray(du, dtype=float) ** 2 + np.asarray(dv, dtype=float) ** 2
        number: Floats = STANDARD_GRAVITY / theta_v * theta_v_difference * depth / square
    return number


def gradient_richardson_number(z: Floats, theta_v: Floats, u: Floats, v: Floats) -> Floats:
    r"""
    Gradient Richardson number at the levels.

    Parameters
    ----------
    z, theta_v, u, v : array, shape (..., level)
        Height [m], virtual potential temperature [K] and wind [m s-1], compact
        (:func:`backveer.profiles.grid.compact`): NaN only beyond the last level.

    Returns
    -------
    number : array, shape (..., level)
        NaN where a profile has fewer than three levels, and beyond the last. [1]

    Notes
    -----
    .. math:: Ri = \frac{g}{\theta_v} \frac{\partial \theta_v / \partial z}
              {(\partial u / \partial z)^2 + (\partial v / \partial z)^2}

    with derivatives of second order on levels of any spacing, one-sided at the lowest and the
    highest level (the derivative of the parabola through three levels).

    Examples
    --------
    >>> z = np.array([200.0, 400.0, 600.0])
    >>> theta = np.array([254.5, 258.3, 262.2])
    >>> gradient_richardson_number(z, theta, np.array([-2.0, -1.1, 0.23]), 0 * z).round(1)
    array([61.6, 23.5, 12.4])
    """
    gradients = [_gradient(np.asarray(z, dtype=float), np.asarray(x)) for x in (theta_v, u, v)]
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        shear = gradients[1] ** 2 + gradients[2] ** 2
        number: Floats = STANDARD_GRAVITY / np.asarray(theta_v) * gradients[0] / shear
    return number


def _gradient(z: Floats, x: Floats) -> Floats:
    """Return the derivative at each level of the parabola through it and its neighbours."""
    if z.shape[-1] < 3:
        return np.full(z.shape, np.nan)
    count = np.count_nonzero(np.isfinite(z) & np.isfinite(x), axis=-1)[..., np.newaxis]
    first = np.clip(np.arange(z.shape[-1]) - 1, 0, np.maximum(count - 3, 0))
    za, zb, zc = (np.take_along_axis(z, first + k, axis=-1) for k in range(3))
    xa, xb, xc = (np.take_along_axis(x, first + k, axis=-1) for k in range(3))
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        lower = (xb - xa) / (zb - za)
        bend = ((xc - xb) / (zc - zb) - lower) / (zc - za)
        slope: Floats = lower + bend * ((z - za) + (z - zb))
    return slope


def _depth(stack: Stack, critical: float) -> tuple[Floats, Words]:
    r"""
    Return the height where the bulk Richardson number reaches the critical value, and why not.

    .. math:: Ri(z) = \frac{g}{\theta_{v,s}}
              \frac{(\theta_v(z) - \theta_{v,s})(z - z_s)}{u(z)^2 + v(z)^2}

    with s the lowest level: the form of Troen and Mahrt (1986), without an excess of temperature,
    that is the form of Vogelezang, D. H. P., and A. A. M. Holtslag, 1996: Boundary-Layer
    Meteorol., 81, 245-269 with no wind at the ground and no friction term (as Seidel, D. J., et
    al., 2012: J. Geophys. Res., 117, D17106 apply it to radiosondes; all from memory). Linear
    between levels.
    """
    usable = stack.usable("wind", "temperature")
    theta_v, usable = _virtual_potential_temperature(stack, usable)
    count, z, theta_v, u, v = compact(
        usable, stack.height, theta_v, stack.eastward_wind, stack.northward_wind
    )
    number = bulk_richardson_number(theta_v[:, :1], theta_v - theta_v[:, :1], z - z[:, :1], u, v)
    number[:, 0] = np.where(count > 0, 0.0, np.nan)  # no depth, whatever the wind
    with np.errstate(invalid="ignore"):
        over = number >= critical
        low = z[:, 0] <= HIGHEST_REFERENCE
    reaches = over.any(axis=1)
    top = np.argmax(over, axis=1)[:, np.newaxis]
    below = np.maximum(top - 1, 0)
    z0, z1 = np.take_along_axis(z, below, 1), np.take_along_axis(z, top, 1)
    n0, n1 = np.take_along_axis(number, below, 1), np.take_along_axis(number, top, 1)
    with np.errstate(invalid="ignore", divide="ignore"):
        # A calm level has an infinite number: then the level below it is the top.
        depth = (z0 + (z1 - z0) * ((critical - n0) / (n1 - n0)))[:, 0]
    warm = stack.usable("temperature").any(axis=1)
    why = np.select(
        [~warm, count < 2, ~low, ~reaches, top[:, 0] == 1],
        [NO_TEMPERATURE, TOO_FEW, TOO_HIGH, NOT_REACHED, SHALLOW],
        "",
    ).astype(object)
    return np.where(why == "", depth, np.nan), why


def _virtual_potential_temperature(stack: Stack, usable: Bools) -> tuple[Floats, Bools]:
    """
    Virtual potential temperature from what there is, and the levels where it is comparable.

    A profile without pressure takes T plus the dry-adiabatic lapse times z (a potential temperature
    but for a factor near one: Stull, 1988, ch. 1). One whose lowest level has no dew point is taken
    as dry; otherwise levels without one are left out, for a step from moist to dry air would
    look like a step in stability.
    """
    with_pressure = usable & stack.usable("pressure")
    # Two levels make a layer; fewer are no reason to pass over the rest.
    pressed = (np.count_nonzero(with_pressure, axis=1) >= 2)[:, np.newaxis]
    chosen = np.where(pressed, with_pressure, usable)
    theta = stack.air_temperature + air.DRY_ADIABATIC_LAPSE_RATE * stack.height
    if not pressed.any():
        return theta, chosen
    humid = stack.usable("humidity")
    lowest = np.argmax(chosen, axis=1)[:, np.newaxis]
    moist = pressed & np.take_along_axis(humid & chosen, lowest, axis=1)
    chosen = chosen & (humid | ~moist)
    pressure = np.where(chosen & pressed, stack.air_pressure, np.nan)
    dry = air.potential_temperature(stack.air_temperature, pressure)
    wet = air.virtual_potential_temperature(
        stack.air_temperature, np.where(humid, stack.dew_point_temperature, np.nan), pressure
    )
    return np.where(moist, wet, np.where(pressed, dry, theta)), chosen
