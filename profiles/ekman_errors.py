r"""
Errors of a fitted Ekman member under noise correlated along height by an unknown length.

The restricted likelihood (Harville, D. A., 1977: J. Amer. Stat. Assoc. 72, 320-338; from memory) of
the residuals weighs a handful of noise lengths. For each, generalised least squares gives the scale
of the noise, the covariance of the parameters and the shift of the estimates; the stated variance
is that of the mixture, so that not knowing the length widens the errors. Noise treated as
independent gives 95 % intervals that hold the truth about half the time.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.ekman_moments import Profiles, basis_moments
from backveer.profiles.ekman_search import MEMBERS, Member, Projection, project, tangent
from backveer.profiles.grid import ordered_sum

#: Noise lengths that are weighed; none says that neighbouring levels err independently. [m]
LENGTHS = np.array([0.0, 30.0, 70.0, 150.0, 300.0, 600.0])
#: Two-sided 95 % point of Student's t by degrees of freedom: Abramowitz, M., and I. A. Stegun,
#: 1964: Handbook of Mathematical Functions, table 26.10 (from memory; interpolated in 1/n).
_FREEDOM = np.array([1, 2, 3, 4, 5, 6, 8, 10, 15, 20, 30, 60, 120, np.inf])
_T95 = np.array(
    [12.706, 4.303, 3.182, 2.776, 2.571, 2.447, 2.306, 2.228, 2.131, 2.086, 2.042, 2.0, 1.98, 1.96]
)


def t95(freedom: Any) -> Any:
    """
    Two-sided 95 % point of Student's t.

    Examples
    --------
    >>> t95(np.array([1.0, 10.0, 1e9])).round(2)
    array([12.71,  2.23,  1.96])
    """
    return np.interp(1.0 / np.maximum(freedom, 1.0), 1.0 / _FREEDOM[::-1], _T95[::-1])


def noise_weights(data: Profiles, delta: Any, sheared: Any) -> tuple[Any, Any]:
    """
    Weigh the noise lengths by the restricted likelihood of the richest member that may be fitted.

    Parameters
    ----------
    data
        The profiles.
    delta : array, shape (profile, 2)
        Scale heights of the partial-slip and of the sheared partial-slip member. [m]
    sheared : array of bool, shape (profile,)
        Where the sheared one may be fitted.

    Returns
    -------
    weights : array, shape (profile, length)
        Adding up to one.
    effective : array, shape (profile, length)
        Effective number of levels for each length: 1 + sum of (1 - rho) / (1 + rho).
    """
    lengths = np.broadcast_to(LENGTHS, (data.z.shape[0], LENGTHS.size))
    chosen = np.where(sheared, delta[:, 1], delta[:, 0])[:, np.newaxis]
    sums = basis_moments(data, np.broadcast_to(chosen, lengths.shape), lengths)
    logs = []
    for member in (MEMBERS[1], MEMBERS[3]):
        one = project(sums, member)
        size = np.where(one.tangent_size > 0, one.tangent_size, 1.0)
        residual = one.residual - np.abs(one.tangent_rhs) ** 2 / size
        # Rounding of the data leaves some scatter even where the fit is perfect.
        residual = np.maximum(residual, 1e-9 * (sums.wind + 1e-300))
        freedom = np.maximum(data.count[:, np.newaxis] - len(member.columns) - 1, 1)
        logs.append(
            -freedom * np.log(residual) - sums.log_determinant - one.log_pivots - np.log(size)
        )
    log = np.where(sheared[:, np.newaxis], logs[1], logs[0])
    weights = np.exp(log - log.max(axis=-1, keepdims=True))
    return weights / ordered_sum(weights)[:, np.newaxis], effective_levels(data, lengths)


def effective_levels(data: Profiles, length: Any) -> Any:
    """Effective number of levels for a mean, by noise length; shape of ``length``."""
    z, count = data.z, data.count
    effective = np.where(count > 0, 1.0, 0.0)[:, np.newaxis] + np.zeros(length.shape)
    safe = np.where(length > 0, length, 1.0)
    with np.errstate(under="ignore"):
        for i in range(1, z.shape[1]):
            there = (i < count)[:, np.newaxis]
            gap = np.where(there, (z[:, i] - z[:, i - 1])[:, np.newaxis], 0.0)
            rho = np.where(length > 0, np.exp(-gap / safe), 0.0)
            effective = effective + np.where(there, (1.0 - rho) / (1.0 + rho), 0.0)
    return effective


@dataclass
class Spread:
    """
    What is needed for the error of any function of the parameters; arrays (profile, length).

    The variance of q with dq = Re(sum a_k dc_k) + b dln(delta) follows from :meth:`variance`.
    """

    weights: Any
    noise: Any  # variance of one component
    projection: Projection
    change: list[Any]  # dc/dln(delta) of each coefficient
    curvature: Any
    move: Any  # shift of ln(delta) from the estimate
    shift: list[Any]  # shift of the coefficients from the estimate, at the same delta

    def variance(self, a: list[Any], b: Any) -> Any:
        """Variance of a quantity, shape (profile,); ``a`` complex and ``b`` real, (profile, 1)."""
        k = len(self.change)
        along = b + sum((a[j] * self.change[j]).real for j in range(k))
        quadratic = sum(
            (a[i] * self.projection.inverse[i][j] * np.conj(a[j])).real
            for i in range(k)
            for j in range(k)
        )
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            each = self.noise * (quadratic + along**2 / self.curvature)
            shift = sum((a[j] * self.shift[j]).real for j in range(k)) + along * self.move
            terms = np.where(self.weights > 0, self.weights * (each + shift**2), 0.0)
        return ordered_sum(terms)


def spread(
    member: Member,
    data: Profiles,
    delta: Any,
    coefficients: list[Any],
    weights: Any,
    least_noise: Any,
    lengths: Any = None,
) -> Spread:
    """
    Work out how far the estimates of a member may be off.

    Parameters
    ----------
    member, data
        Which member, and the profiles.
    delta : array, shape (profile, 1)
        Its scale height. [m]
    coefficients
        Its coefficients, each of shape (profile, 1).
    weights : array, shape (profile, length)
        From :func:`noise_weights`.
    least_noise : array, shape (profile,)
        Standard error of a wind component from elsewhere, taken as the least noise. [m s-1]
    lengths : array, shape (profile, length), optional
        Other noise lengths than ``LENGTHS``. [m]
    """
    if lengths is None:
        lengths = np.broadcast_to(LENGTHS, (data.z.shape[0], LENGTHS.size))
    wide = np.broadcast_to(delta, lengths.shape)
    one = project(basis_moments(data, wide, lengths), member)
    factor = tangent(member, one, wide, data.unit)
    curvature = (factor.real**2 + factor.imag**2) * one.tangent_size
    slope = (factor.conj() * one.tangent_rhs).real
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        move = np.where(curvature > 0, slope / curvature, 0.0)
        residual = np.maximum(one.residual - np.where(curvature > 0, slope**2 / curvature, 0.0), 0)
    freedom = np.maximum(2 * data.count[:, np.newaxis] - member.parameters, 1)
    return Spread(
        weights=weights,
        noise=np.maximum(residual / freedom, (least_noise**2)[:, np.newaxis]),
        projection=one,
        change=[-factor * s for s in one.slope],
        curvature=curvature,
        move=np.clip(move, -1.0, 1.0),
        shift=[c - c0 for c, c0 in zip(one.coefficients, coefficients, strict=True)],
    )
