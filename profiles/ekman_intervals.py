r"""
Intervals that allow for not knowing which member of the Ekman family is true.

A profile whose noise is correlated along height hides a shear or a slip easily. The simpler member
is then chosen, and an interval that takes it for granted can hold the truth one time in five where
it states 95 % (seen in synthetic profiles of 1.5 km with noise of 0.5 m/s and 300 m). So the
intervals are those of all members that could be fitted, weighed.

With weights w_m by Akaike's criterion, estimates :math:`\theta_m` and errors :math:`\sigma_m` of
the members, the ends of an interval solve

.. math:: \sum_m w_m \Phi\left(\frac{\theta_{95} - \theta_m}{\sigma_m}\right) = 0.025, \; 0.975

(the model-averaged tail area of Turek, D., and D. Fletcher, 2012: Comput. Stat. Data Anal. 56,
2809-2815), and the standard error is the root of the mean of
:math:`\sigma_m^2 + (\theta_m - \theta)^2` about the chosen estimate (after Burnham, K. P., and
D. R. Anderson, 2002: Model Selection and Multimodel Inference, 2nd ed., Springer, ch. 4). Both are
cited from memory.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.grid import ordered_sum

TAIL = 0.025  # on either side of a 95 % interval
POINT = 1.959963985  # standard errors to the tail of one normal distribution
BISECTIONS = 18  # to a few millionths of the way between the ends of the members by themselves
STEP = 1e-140  # width of a step: its square and that of its inverse are numbers still
NEGLIGIBLE = 1e-4  # weight of a member that moves no end of an interval

# Abramowitz, M., and I. A. Stegun, 1964: Handbook of Mathematical Functions, formula 26.2.17
# (coefficients from memory; off by less than 1e-7).
_P = 0.2316419
_B = (0.319381530, -0.356563782, 1.781477937, -1.821255978, 1.330274429)


def normal_tail(x: Any) -> Any:
    """
    Probability that a standard normal number is below x.

    Examples
    --------
    >>> normal_tail(np.array([-1.96, 0.0, 1.0])).round(5)
    array([0.025  , 0.5    , 0.84134])
    """
    t = 1.0 / (1.0 + _P * np.abs(x))
    series = t * (_B[0] + t * (_B[1] + t * (_B[2] + t * (_B[3] + t * _B[4]))))
    upper = np.exp(-0.5 * x * x) / np.sqrt(2.0 * np.pi) * series
    return np.where(x > 0, 1.0 - upper, upper)


def weights_of(criterion: Any) -> Any:
    """Akaike weights along the first axis; members with an infinite criterion count for nothing."""
    weights = np.exp(-0.5 * (criterion - np.min(criterion, axis=0)))
    weights = np.where(weights > NEGLIGIBLE, weights, 0.0)
    return weights / ordered_sum(weights, axis=0)


def averaged(values: Any, errors: Any, weights: Any, choice: Any) -> Any:
    """
    Give the standard errors of quantities about the estimates of chosen members.

    Parameters
    ----------
    values, errors : array, shape (member, quantity, profile)
        Estimates and their standard errors.
    weights : array, shape (member, profile)
        From :func:`weights_of`.
    choice : array of int, shape (profile,)
        Place of the chosen member.

    Returns
    -------
    error : array, shape (quantity, profile)
    """
    chosen = np.take_along_axis(values, choice[np.newaxis, np.newaxis], axis=0)[0]
    mean_square = sum(
        np.where(weight > 0, weight * (error**2 + (value - chosen) ** 2), 0.0)
        for value, error, weight in zip(values, errors, weights, strict=True)
    )
    return np.sqrt(mean_square)


def tail_ends(values: Any, errors: Any, weights: Any, chosen: Any, factor: Any) -> tuple[Any, Any]:
    """
    Find the ends of the 95 % intervals.

    Parameters
    ----------
    values, errors, weights
        As for :func:`averaged`.
    chosen : array, shape (quantity, profile)
        The chosen estimate, which the interval holds whatever the others say.
    factor : array, shape (member, profile)
        The 95 % point of each member's distribution, over that of the normal one.

    Returns
    -------
    low, high : array, shape (quantity, profile)
    """
    counted = np.broadcast_to((weights > 0)[:, np.newaxis], values.shape)
    apart = np.where(counted, values - chosen, 0.0)
    wide = np.where(counted, errors * factor[:, np.newaxis], 0.0)
    # A quantity that a member fixes (no shear) is a step of its distribution: all but a step.
    steep = 1.0 / (wide + STEP)
    ends = []
    for tail, point in ((TAIL, -POINT), (1.0 - TAIL, POINT)):
        # The end lies between the ends of the members by themselves.
        own = apart + point * wide
        low = np.min(np.where(counted, own, np.inf), axis=0)
        high = np.max(np.where(counted, own, -np.inf), axis=0)
        for _ in range(BISECTIONS):
            middle = 0.5 * (low + high)
            short = -tail
            for m, weight in enumerate(weights):
                short = short + weight * normal_tail((middle - apart[m]) * steep[m])
            low, high = np.where(short < 0, middle, low), np.where(short < 0, high, middle)
        # The outer side, so that an interval which ends at a step holds the value there.
        ends.append(low if point < 0 else high)
    return chosen + np.minimum(ends[0], 0.0), chosen + np.maximum(ends[1], 0.0)
