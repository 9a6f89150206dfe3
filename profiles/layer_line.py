r"""
The straight line that stands for a profile within a layer, and the errors of its mean and slope.

The profile runs straight from level to level in a coordinate x. Its mean over the layer and the
slope of its line are integrals over it, and so weighted sums over the levels,

.. math::
    a = \frac{1}{L} \int W \, dx = \sum_k m_k W_k, \qquad
    b = \frac{12}{L^3} \int W (x - x_m) \, dx = \sum_k c_k W_k .

Two levels at the ends of the layer give exactly their mean and their difference. More levels
average the noise down, as a regression does; but unlike in a regression over levels, a cluster of
levels counts for the depth that it stands for, and the edges of a layer need no level of their own.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.grid import compact, ordered_sum
from backveer.profiles.labels import Floats


@dataclass(frozen=True, eq=False)
class LayerLine:
    """
    The weights of one layer in each profile, over the levels that it needs, shape (profile, near).

    Attributes
    ----------
    mean_weight, slope_weight
        m and c above, 0 beyond the last level. [1], [1 / x]
    x, place
        Coordinate and index of the levels that they belong to, NaN beyond the last.
    middle, extent
        Middle and length of the layer in x, shape (profile).
    widest_gap
        Largest step in x between neighbouring levels that the layer lies between, shape (profile).
    """

    mean_weight: Floats
    slope_weight: Floats
    x: Floats
    place: Floats
    middle: Floats
    extent: Floats
    widest_gap: Floats

    def take(self, y: Floats) -> Floats:
        """Pick the levels of this layer from an array (profile, level), 0 beyond the last."""
        index = np.where(np.isfinite(self.place), self.place, 0).astype(np.intp)
        return np.where(np.isfinite(self.place), np.take_along_axis(y, index, axis=-1), 0.0)

    def mean(self, y: Floats) -> Any:
        """Mean over the layer of a variable at the levels of this layer."""
        return ordered_sum(self.mean_weight * y)

    def slope(self, y: Floats) -> Any:
        """Slope in x of a variable at the levels of this layer."""
        return ordered_sum(self.slope_weight * y)


def layer_line(x: Floats, base: Floats, top: Floats) -> LayerLine:
    """
    Weights of the mean and of the slope of a profile over a layer.

    Parameters
    ----------
    x : array, shape (profile, level)
        Coordinate of the levels, from the first on never falling, NaN only beyond the last.
    base, top : array, shape (profile,)
        The layer, within the levels.

    Returns
    -------
    LayerLine
        All weights are zero where the layer is NaN.

    Examples
    --------
    >>> line = layer_line(np.array([[0.0, 1.0, 3.0]]), np.array([0.5]), np.array([2.5]))
    >>> wind = np.array([[1.0, 3.0, 7.0]])
    >>> line.mean(wind).round(12), line.slope(wind).round(12)
    (array([4.]), array([2.]))
    """
    base, top = np.asarray(base)[:, np.newaxis], np.asarray(top)[:, np.newaxis]
    with np.errstate(invalid="ignore"):
        after = np.concatenate([x[:, 1:], np.full_like(x[:, :1], np.nan)], axis=1)
        before = np.concatenate([np.full_like(x[:, :1], np.nan), x[:, :-1]], axis=1)
        near = np.isfinite(x) & (base <= top)
        near &= ~(after <= base) & ~(before >= top)
    place = np.broadcast_to(np.arange(x.shape[1], dtype=float), x.shape)
    _count, x, place = compact(near, x, place)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        middle, extent = 0.5 * (base + top), top - base
        x0, x1 = x[:, :-1], x[:, 1:]
        step = x1 - x0
        low, high = np.clip(base, x0, x1), np.clip(top, x0, x1)
        width, centre = high - low, 0.5 * (low + high)
        # The upper of the two levels takes the part t of each point, the lower one the rest.
        ok = (step > 0) & (width > 0)
        off = centre - middle
        zeroth, first = width, width * off
        upper_zeroth = width * (centre - x0) / step
        upper_first = width * ((centre - x0) * off + width**2 / 12.0) / step
        parts = []
        for whole, upper, scale in (
            (zeroth, upper_zeroth, extent),
            (first, upper_first, extent**3 / 12.0),
        ):
            upper = np.where(ok, upper / scale, 0.0)
            lower = np.where(ok, whole / scale, 0.0) - upper
            edge = np.zeros_like(x[:, :1])
            parts.append(np.concatenate([lower, edge], 1) + np.concatenate([edge, upper], 1))
        gap = np.max(np.where(ok, step, 0.0), axis=1, initial=0.0)
    return LayerLine(parts[0], parts[1], x, place, middle[:, 0], extent[:, 0], gap)


def noise_gain(line: LayerLine, z: Floats, length: Floats) -> tuple[Floats, Floats, Floats]:
    r"""
    Variances of mean and slope, and their covariance, for noise of unit variance.

    Parameters
    ----------
    line
        The weights.
    z : array, shape (profile, near)
        Heights of its levels, increasing, NaN beyond the last. [m]
    length : array, shape (profile,)
        The noise of two levels is correlated by :math:`\exp(-|\Delta z| / \ell)`; 0 for
        independent noise. [m]

    Returns
    -------
    of_mean, of_slope, covariance : array, shape (profile,)

    Notes
    -----
    The noise is a Markov process along height, so that one pass upward gives the double sum:
    what the levels below bring to a level is what they brought to the one below, and that level's
    own, both fading over the step between.
    """
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        kept = np.exp(-np.diff(z, axis=1) / length[:, np.newaxis])
        kept = np.where(np.isfinite(kept) & (length > 0)[:, np.newaxis], kept, 0.0)
    m, c = line.mean_weight, line.slope_weight
    mean = slope = both = np.zeros(len(z))
    from_mean = from_slope = np.zeros(len(z))
    with np.errstate(invalid="ignore", over="ignore", under="ignore"):
        for k in range(z.shape[1]):
            mk, ck = m[:, k], c[:, k]
            if k:
                from_mean = kept[:, k - 1] * (from_mean + m[:, k - 1])
                from_slope = kept[:, k - 1] * (from_slope + c[:, k - 1])
            mean = mean + mk * (mk + 2.0 * from_mean)
            slope = slope + ck * (ck + 2.0 * from_slope)
            both = both + (mk * ck + mk * from_slope + ck * from_mean)
    return mean, slope, both
