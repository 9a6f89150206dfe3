r"""
The wind near the ground as a power law or a logarithm of height, and both fitted to levels.

The power law is a fit and nothing more; the logarithm is the law of the neutral surface layer, the
lowest tenth or so of the boundary layer, and a fit of it further up is checked before it is told.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.grid import ordered_sum
from backveer.profiles.labels import Bools, Floats

VON_KARMAN = 0.40  # Högström, 1996: Boundary-Layer Meteorol., 78, 215-246 (0.40 +- 0.01)
#: Exponents of the standards' normal wind profile, for comparison and not as a verdict.
#: IEC 61400-1 sec. 6.3.1.2 onshore (seen in public codes that cite it); IEC 61400-3-1 offshore
#: (from memory).
NORMAL_EXPONENT = {"onshore": 0.2, "offshore": 0.14}


def power_law_speed(z: Any, z_reference: Any, speed_reference: Any, exponent: Any) -> Floats:
    r"""
    Wind speed of the power law.

    Parameters
    ----------
    z, z_reference : array
        Heights above ground, > 0. [m]
    speed_reference : array
        Speed at ``z_reference``. [m s-1]
    exponent : array
        Shear exponent. [1]

    Returns
    -------
    speed : array
        NaN at and below the ground. [m s-1]

    Notes
    -----
    .. math:: M(z) = M_r (z / z_r)^\alpha

    the normal wind profile of IEC 61400-1, with alpha 0.2 onshore.

    Examples
    --------
    >>> power_law_speed(np.array([80.0]), 10.0, 6.5, 0.14).round(2)
    array([8.7])
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        ratio = np.asarray(z, dtype=float) / z_reference
        return np.asarray(speed_reference * np.where(ratio > 0, ratio, np.nan) ** exponent)


def log_law_speed(z: Any, z_reference: Any, speed_reference: Any, roughness_length: Any) -> Floats:
    r"""
    Wind speed of the neutral logarithmic law.

    Parameters
    ----------
    z, z_reference : array
        Heights above ground. [m]
    speed_reference : array
        Speed at ``z_reference``. [m s-1]
    roughness_length : array
        Height at which the law has no wind, > 0 and below ``z_reference``. [m]

    Returns
    -------
    speed : array
        NaN at and below the roughness length, where the law says nothing. [m s-1]

    Notes
    -----
    .. math:: M(z) = M_r \ln(z / z_0) / \ln(z_r / z_0)

    Stull, R. B., 1988: An Introduction to Boundary Layer Meteorology. Kluwer, ch. 9.

    Examples
    --------
    >>> log_law_speed(np.array([120.0, 0.05]), 20.0, 8.0, 0.1).round(2)
    array([10.71,   nan])
    """
    z0 = np.asarray(roughness_length, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        above = np.where(np.asarray(z) > z0, z, np.nan)
        reference = np.where(np.asarray(z_reference) > z0, z_reference, np.nan)
        return np.asarray(speed_reference * np.log(above / z0) / np.log(reference / z0))


def exponent_between(z_low: Any, speed_low: Any, z_high: Any, speed_high: Any) -> Floats:
    r"""
    Shear exponent between two heights.

    Parameters
    ----------
    z_low, z_high : array
        Heights above ground, 0 < z_low < z_high. [m]
    speed_low, speed_high : array
        Speeds there, > 0. [m s-1]

    Returns
    -------
    exponent : array
        :math:`\ln(M_2/M_1) / \ln(z_2/z_1)`; NaN where a speed or a height is not positive. [1]

    Examples
    --------
    >>> round(float(exponent_between(40.0, 6.0, 160.0, 8.0)), 4)
    0.2075
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        faster = np.log(np.asarray(speed_high, dtype=float) / speed_low)
        exponent = faster / np.log(np.asarray(z_high, dtype=float) / z_low)
    return np.where(np.isfinite(exponent) & (np.asarray(z_low) > 0), exponent, np.nan)


def fit_line(x: Floats, y: Floats, use: Bools) -> tuple[Any, Floats, Floats, Floats, Floats]:
    """
    Least-squares straight line along the last axis.

    Parameters
    ----------
    x, y : array, shape (..., level)
        Abscissa and ordinate; only where ``use`` is true are they looked at.
    use : array of bool, shape (..., level)
        Which levels take part.

    Returns
    -------
    count : array of int, shape (...)
        Levels that took part.
    slope, slope_error : array, shape (...)
        Slope and its standard error from the scatter about the line; NaN for fewer than two levels,
        the error for fewer than three.
    root, root_error : array, shape (...)
        Where the line crosses zero, x = mean(x) - mean(y) / slope, and its standard error
        s / |slope| sqrt(1/n + (root - mean(x))^2 / Sxx). Draper, N. R., and H. Smith, 1981: Applied
        Regression Analysis. Wiley, sec. 1.7, inverse regression (section from memory).

    Examples
    --------
    >>> x = np.array([1.0, 2.0, 3.0])
    >>> count, slope, slope_error, root, root_error = fit_line(x, 2.0 * x - 3.0, x > 0)
    >>> int(count), slope.tolist(), root.tolist()
    (3, 2.0, 1.5)
    """
    count = np.count_nonzero(use, axis=-1)
    with np.errstate(all="ignore"):
        n = np.where(count > 0, count, np.nan)
        mean_x = ordered_sum(np.where(use, x, 0.0)) / n
        mean_y = ordered_sum(np.where(use, y, 0.0)) / n
        dx = np.where(use, x - mean_x[..., np.newaxis], 0.0)
        dy = np.where(use, y - mean_y[..., np.newaxis], 0.0)
        sxx = ordered_sum(dx * dx)
        slope = np.where(count >= 2, ordered_sum(dx * dy) / sxx, np.nan)
        residual = dy - slope[..., np.newaxis] * dx
        free = np.where(count >= 3, count - 2.0, np.nan)
        scatter = np.sqrt(ordered_sum(residual * residual) / free)
        root = mean_x - mean_y / slope
        root_error = scatter / np.abs(slope) * np.sqrt(1.0 / n + (root - mean_x) ** 2 / sxx)
        slope_error = scatter / np.sqrt(sxx)
    return count, slope, slope_error, root, root_error
