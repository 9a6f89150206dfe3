r"""
Friction velocity from the momentum integral: the stress that the departure of a layer needs.

In a steady layer, friction, Coriolis force and pressure gradient balance,
:math:`i f (W - W_g) = \mathrm{d}\tau/\mathrm{d}z`. From the ground to the height where the stress
has died out,

.. math:: \tau_0 = -i f \int_0^h (W - W_g)\,\mathrm{d}z, \qquad u_*^2 = |\tau_0|

(Lettau, H., 1950: Tellus, 2, 125-129; in this complex form, derived here).

Below the lowest level nothing is measured. There the wind is taken to keep its direction and to
follow the logarithmic law with a roughness length that is not known but lies between 0.2 mm and
1 m, its logarithm anywhere as likely; what that leaves open goes into the error.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np

from backveer.profiles.grid import compact, ordered_sum
from backveer.profiles.labels import Floats

# Sea to forest, the classes of Stull (2017), Practical Meteorology, Table 18-1 (second-hand). [m]
ROUGHNESS = (2e-4, 1.0)
ABOVE_ROUGHNESS = 0.1  # the law holds well above the roughness: z0 is at most this share of z1


class Integral(NamedTuple):
    """
    The integral of W - Wg over height, complex (east + i north), shape (...).

    ``value`` in m2 s-1; ``error`` the standard error of one of its components, from the noise of
    the wind and the part below the lowest level; ``lowest`` and ``highest`` level used, in m.
    """

    value: Any
    error: Floats
    lowest: Floats
    highest: Floats


def departure_integral(
    z: Floats,
    wind: Any,
    geostrophic: Any,
    at_ground: Any,
    top: Floats,
    error: Any = 0.0,
    noise_length: Any = 0.0,
) -> Integral:
    r"""
    Integrate wind minus geostrophic wind from the ground to a height.

    Parameters
    ----------
    z : array, shape (..., level)
        Heights above ground, increasing, NaN where missing. [m]
    wind, geostrophic : complex array, shape (..., level)
        East + i north at these heights. [m s-1]
    at_ground : complex array, shape (...)
        Geostrophic wind at the ground. [m s-1]
    top : array, shape (...)
        Where the integral ends; at the highest level if that is lower. [m]
    error, noise_length : array, shape (...)
        Standard error of a wind component [m s-1] and the distance over which the correlation of
        the errors of two levels falls to 1/e [m]; 0 for independent levels.

    Returns
    -------
    Integral
        NaN where no level lies at or below ``top``.

    Notes
    -----
    Straight lines between the levels. With levels weighted :math:`w_j` the noise adds the variance
    :math:`\sigma^2 \sum_{jk} w_j w_k \exp(-|z_j - z_k| / \ell)`.

    Examples
    --------
    >>> z, wind = np.array([10.0, 50.0, 110.0]), np.array([6.0, 8.0, 10.0]) + 0.0j
    >>> integral = departure_integral(z, wind, np.full(3, 10.0 + 0.0j), 10.0 + 0.0j, 110.0)
    >>> integral.value.real.round(1)  # -(3 * 40 + 1 * 60) aloft, 10 (0.818 * 6 - 10) below
    np.float64(-230.9)
    """
    top = np.asarray(top, dtype=float)
    wind, geostrophic = np.asarray(wind), np.asarray(geostrophic)
    shape = np.broadcast_shapes(z.shape, wind.shape, geostrophic.shape, (*top.shape, 1))
    z, wind, geostrophic = (np.broadcast_to(x, shape) for x in (z, wind, geostrophic))
    keep = np.isfinite(z) & np.isfinite(wind) & np.isfinite(geostrophic)
    count, z, wind, geostrophic = compact(keep, z, wind, geostrophic)
    there = np.arange(z.shape[-1]) < count[..., np.newaxis]
    end = np.broadcast_to(top[..., np.newaxis], (*shape[:-1], 1))
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        step = np.diff(z, axis=-1)
        part = np.clip(end - z[..., :-1], 0.0, step)
        upper = np.where(there[..., 1:], part * part / (2.0 * step), 0.0)
        lower = np.where(there[..., 1:], part, 0.0) - upper
        nothing = np.zeros_like(z[..., :1])
        weight = np.concatenate([lower, nothing], -1) + np.concatenate([nothing, upper], -1)
        z1, w1, g1 = z[..., 0], wind[..., 0], geostrophic[..., 0]
        share, doubt = logarithmic_share(z1)
        departure = np.where(there, wind - geostrophic, 0.0)
        value = ordered_sum(weight * departure.real) + 1j * ordered_sum(weight * departure.imag)
        value = value + z1 * (share * w1 - 0.5 * (at_ground + g1))
        weight[..., 0] = weight[..., 0] + np.where(there[..., 0], share * z1, 0.0)
        kept = _correlation(step, noise_length)
        noise = ordered_sum(weight * (weight + 2.0 * _carried(weight, kept)))
        spread = np.asarray(error) ** 2 * noise + (doubt * z1 * np.abs(w1)) ** 2 / 2.0
        last = np.take_along_axis(z, np.maximum(count - 1, 0)[..., np.newaxis], -1)[..., 0]
        highest = np.minimum(last, top)
        good = (count > 0) & (z1 <= top)
        return Integral(
            np.where(good, value, np.nan),
            np.where(good, np.sqrt(spread), np.nan),
            np.where(good, z1, np.nan),
            np.where(good, highest, np.nan),
        )


def logarithmic_share(z1: Any) -> tuple[Any, Any]:
    r"""
    Mean wind below a height over the wind there, by the logarithmic law of unknown roughness.

    Parameters
    ----------
    z1 : array
        Height of the lowest wind. [m]

    Returns
    -------
    share, doubt : array
        Mean and standard deviation of the share over the roughness lengths.

    Notes
    -----
    The law gives :math:`1 - 1/x` with :math:`x = \ln(z_1/z_0)`, but for terms in
    :math:`z_0/z_1`. With x as likely anywhere between :math:`x_1` and :math:`x_2`, the mean of
    1/x is :math:`\ln(x_2/x_1)/(x_2 - x_1)` and that of its square :math:`1/(x_1 x_2)`.

    Examples
    --------
    >>> share, doubt = logarithmic_share(np.array([10.0, 50.0]))
    >>> share.round(3), doubt.round(3)
    (array([0.818, 0.864]), array([0.084, 0.046]))
    """
    z1 = np.asarray(z1, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        # Below a millimetre the range would be empty; there the share hardly matters.
        least = np.log(np.maximum(z1 / ROUGHNESS[1], 1.0 / ABOVE_ROUGHNESS))
        most = np.maximum(np.log(z1 / ROUGHNESS[0]), least + 0.1)
        mean = np.log(most / least) / (most - least)
        variance = np.maximum(1.0 / (most * least) - mean**2, 0.0)
        return 1.0 - mean, np.sqrt(variance)


def friction_velocity(f: Any, integral: Any, error: Any) -> tuple[Any, Any]:
    """
    Friction velocity and its standard error from the integral of the departure.

    Parameters
    ----------
    f : array
        Coriolis parameter. [s-1]
    integral, error : array
        Integral of W - Wg over the boundary layer, complex, and the standard error of one of its
        components. [m2 s-1]

    Returns
    -------
    u_star, u_star_error : array
        [m s-1]

    Examples
    --------
    >>> friction_velocity(-1.0e-4, 1200.0 - 900.0j, 150.0)
    (np.float64(0.3872983346207417), np.float64(0.019364916731037084))
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        u_star = np.sqrt(np.abs(f) * np.abs(integral))
        return u_star, np.abs(f) * error / (2.0 * u_star)


def _correlation(step: Floats, length: Any) -> Floats:
    """Correlation of the noise of neighbouring levels; 0 where there is no step or no length."""
    length = np.asarray(length, dtype=float)
    length = np.where(np.isfinite(length) & (length > 0), length, 1e-9)[..., np.newaxis]
    kept = np.exp(-step / length)
    return np.where(np.isfinite(kept), kept, 0.0)


def _carried(weight: Floats, kept: Floats) -> Floats:
    """Sum of the weights of all lower levels, each times its correlation with the level."""
    carried = np.zeros_like(weight)
    for level in range(1, weight.shape[-1]):
        before = carried[..., level - 1] + weight[..., level - 1]
        carried[..., level] = kept[..., level - 1] * before
    return carried
