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

from backveer.profiles.ekman_moments import Moments, Profiles, Whitening, basis_moments
from backveer.profiles.ekman_search import MEMBERS, Member, descent, project, tangent
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


def noise_weights(data: Profiles, noise: Whitening, delta: Any, sheared: Any) -> Any:
    """
    Weigh the noise lengths by the restricted likelihood of the richest member that may be fitted.

    Parameters
    ----------
    data
        The profiles.
    noise
        Of the lengths that are weighed.
    delta : array, shape (profile, 2)
        Scale heights of the partial-slip and of the sheared partial-slip member. [m]
    sheared : array of bool, shape (profile,)
        Where the sheared one may be fitted.

    Returns
    -------
    weights : array, shape (profile, length)
        Adding up to one.
    """
    chosen = np.where(sheared, delta[:, 1], delta[:, 0])[:, np.newaxis]
    (sums,) = basis_moments(data, chosen, noise)
    logs = []
    for member in (MEMBERS[1], MEMBERS[3]):
        one = project(sums, member)
        size = np.where(one.tangent_size > 0, one.tangent_size, 1.0)
        residual = one.residual - np.abs(one.tangent_rhs) ** 2 / size
        # Rounding of the data leaves some scatter even where the fit is perfect.
        residual = np.maximum(residual, 1e-9 * (sums.wind + 1e-300))
        freedom = np.maximum(data.count - len(member.columns) - 1, 1)[:, np.newaxis, np.newaxis]
        logs.append(
            -freedom * np.log(residual) - sums.log_determinant - one.log_pivots - np.log(size)
        )
    log = np.where(sheared[:, np.newaxis], logs[1][..., 0], logs[0][..., 0])
    weights = np.exp(log - log.max(axis=-1, keepdims=True))
    return weights / ordered_sum(weights)[:, np.newaxis]


def effective_levels(data: Profiles, length: Any) -> Any:
    """
    Effective number of levels for a mean, by noise length; shape of ``length``.

    It is 1 + sum of (1 - rho) / (1 + rho) = tanh(gap / 2L) over the gaps between the levels.
    """
    there = np.arange(1, data.z.shape[1]) < data.count[:, np.newaxis]
    gap = np.where(there, np.diff(data.z, axis=1), 0.0)[:, np.newaxis]
    length = length[..., np.newaxis]
    share = np.where(length > 0, np.tanh(0.5 * gap / np.where(length > 0, length, 1.0)), 1.0)
    return (data.count > 0)[:, np.newaxis] + ordered_sum(np.where(there[:, np.newaxis], share, 0.0))


@dataclass
class Spread:
    """
    What is needed for the error of any function of the parameters; arrays (profile, length).

    The variance of q with dq = Re(sum a_k dc_k) + b dln(delta) follows from :meth:`variance`.
    """

    weights: Any
    noise: Any  # variance of one component
    inverse: list[list[Any]]
    change: list[Any]  # dc/dln(delta) of each coefficient
    curvature: Any
    move: Any  # shift of ln(delta) from the estimate
    shift: list[Any]  # shift of the coefficients from the estimate, at the same delta

    def variance(self, a: dict[int, Any], b: Any) -> Any:
        """Variance of a quantity, shape (profile,); complex ``a`` by place and real ``b`` alike."""
        along, shift, quadratic = b[:, np.newaxis], 0.0, 0.0
        for i, x in a.items():
            x = x[:, np.newaxis]
            along = along + (x * self.change[i]).real
            shift = shift + (x * self.shift[i]).real
            for j, y in a.items():
                quadratic = quadratic + (x * self.inverse[i][j] * y.conj()[:, np.newaxis]).real
        each = self.noise * (quadratic + along**2 / self.curvature)
        shift = shift + along * self.move
        return ordered_sum(np.where(self.weights > 0, self.weights * (each + shift**2), 0.0))


def spread(
    member: Member,
    data: Profiles,
    sums: Moments,
    delta: Any,
    coefficients: list[Any],
    weights: Any,
    least_noise: Any,
) -> Spread:
    """
    Work out how far the estimates of a member may be off.

    Parameters
    ----------
    member, data
        Which member, and the profiles.
    sums
        Moments for its scale height, under the noise of each length.
    delta : array, shape (profile,)
        Its scale height. [m]
    coefficients
        Its coefficients, each of shape (profile,).
    weights : array, shape (profile, length)
        From :func:`noise_weights`.
    least_noise : array, shape (profile,)
        Standard error of a wind component from elsewhere, taken as the least noise. [m s-1]
    """
    one = project(sums, member)
    factor = tangent(member, one, delta, data.unit)
    downhill, curvature = descent(member, one, delta, data.unit)
    move = np.where(curvature > 0, downhill / curvature, 0.0)
    explained = np.where(curvature > 0, downhill**2 / curvature, 0.0)
    freedom = np.maximum(2 * data.count[:, np.newaxis] - member.parameters, 1)
    noise = np.maximum(one.residual[..., 0] - explained, 0.0) / freedom
    return Spread(
        weights=weights,
        noise=np.maximum(noise, (least_noise**2)[:, np.newaxis]),
        inverse=[[x[..., 0] for x in row] for row in one.inverse],
        change=[-(factor * s)[..., 0] for s in one.slope],
        curvature=curvature,
        move=np.clip(move, -1.0, 1.0),
        shift=[
            c[..., 0] - c0[:, np.newaxis]
            for c, c0 in zip(one.coefficients, coefficients, strict=True)
        ],
    )
