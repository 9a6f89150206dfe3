r"""
The search for the layer of varying viscosity that a profile shows, and how far off it may be.

Four numbers make the wind of :mod:`backveer.profiles.ekman_solver`: ln h, ln mu, the direction of
the surface stress and ln z0. That u* is both in K and in the stress at the wall leaves no fifth:
:math:`u_* = |f| h / (\kappa \mu)`, and the geostrophic wind is the one that lets the wind vanish at
z0. A grid of depths and mu finds the start, damped Gauss-Newton steps (Levenberg, K., 1944: Quart.
Appl. Math. 2, 164-168; from memory) the least whitened residual, for all profiles at once.

Errors weigh the noise lengths of :mod:`backveer.profiles.ekman_errors` by restricted likelihood, as
that module does. Arrays are (level, profile): sums over levels go in order, row by row, and no
product of complex numbers is taken, whose last bit depends on where an array lies.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from backveer.profiles.ekman_errors import LENGTHS
from backveer.profiles.ekman_solver import BOTTOM, LOG_MU, MU_STEP, Table
from backveer.profiles.surface_layer import VON_KARMAN

DEPTH, MU, DIRECTION, ROUGHNESS = range(4)
DEPTHS = (40.0, 6000.0)  # of the search; a layer is neither thinner nor deeper. [m]
ROUGHNESSES = (1e-5, 3.0)  # calm sea to city: Stull (2017), Table 18-1 (second-hand), and a margin
DEPTH_STEP, ROW_STEP = 0.175, 4  # of the grid in ln h, and in rows of the table
MARGIN = 3 * MU_STEP  # the search keeps off the ends of the table
SEARCHED = 24  # levels that the grid looks at, spread over the profile: enough for a start
#: Chi square of a wind that changes with height: 99.9 % point for two degrees of freedom.
TREND = 13.8
HALF = 0.5  # the roughness stays below this share of the lowest level


class Winds(NamedTuple):
    """
    Profiles ready to be fitted, in the frame of the northern hemisphere.

    Attributes
    ----------
    z, u, v : array, shape (level, profile)
        Compact heights [m] and wind [m s-1]; height 1 and no wind beyond ``count``.
    count : array of int, shape (profile,)
    f : array, shape (profile,)
        Size of the Coriolis parameter. [s-1]
    low, high : array, shape (4, profile)
        Bounds of the four numbers; equal where one is given.
    """

    z: Any
    u: Any
    v: Any
    count: Any
    f: Any
    low: Any
    high: Any

    @property
    def there(self) -> Any:
        """Where there is a level."""
        return np.arange(len(self.z))[:, np.newaxis] < self.count


def bounds(lowest: Any, roughness: Any) -> tuple[Any, Any]:
    """
    Bounds of the four numbers.

    Parameters
    ----------
    lowest : array, shape (profile,)
        Height of the lowest level. [m]
    roughness : array, shape (profile,)
        Roughness length where it is given, otherwise NaN. [m]
    """
    given = np.log(roughness)
    nothing = np.zeros(lowest.shape)
    roof = np.minimum(np.log(ROUGHNESSES[1]), np.log(HALF * lowest))
    ground = np.log(ROUGHNESSES[0])
    known = np.isfinite(given)
    low = [np.log(DEPTHS[0]), LOG_MU[0] + MARGIN, -np.inf, np.where(known, given, ground)]
    high = [np.log(DEPTHS[1]), LOG_MU[1] - MARGIN, np.inf, np.where(known, given, roof)]
    return np.stack([nothing + x for x in low]), np.stack([nothing + x for x in high])


def total(x: Any) -> Any:
    """Sum over levels, the axis before the last, in order."""
    x = np.moveaxis(x, -2, 0)
    out = np.array(x[0])
    for row in x[1:]:
        out += row
    return out


@dataclass
class Noise:
    """Noise of one length a profile, as what whitening takes from the level below and keeps."""

    rho: Any
    scale: Any
    log_determinant: Any

    @classmethod
    def of(cls, winds: Winds, length: Any) -> Noise:
        """Return the noise of a correlation length [m], shape (profile,) or none."""
        length = np.broadcast_to(length, winds.count.shape)
        there = winds.there
        gap = np.where(there[1:], winds.z[1:] - winds.z[:-1], np.inf)
        kept = np.where(length > 0, np.exp(-gap / np.where(length > 0, length, 1.0)), 0.0)
        rest = (1.0 - kept) * (1.0 + kept)
        scale = there + 0.0
        scale[1:] /= np.sqrt(rest)
        return cls(kept, scale, total(np.concatenate([0.0 * scale[:1], np.log(rest)])))

    def whiten(self, x: Any) -> Any:
        """Whiten values of shape (..., level, profile)."""
        y = np.array(x)
        y[..., 1:, :] -= self.rho * x[..., :-1, :]
        y *= self.scale
        return y


def scale_of(winds: Winds, theta: Any) -> Any:
    """Return u* / kappa. [m s-1]."""
    return winds.f * np.exp(theta[DEPTH] - theta[MU]) / VON_KARMAN**2


def wind_of(table: Table, z: Any, theta: Any, size: Any) -> tuple[Any, Any]:
    """
    Wind at heights and its derivatives by the four numbers, turned so that the stress is along x.

    Parameters
    ----------
    table
        Of the shape.
    z : array, shape (level, profile)
        Heights. [m]
    theta : array, shape (4, profile)
        The numbers.
    size : array, shape (profile,)
        u* / kappa. [m s-1]

    Returns
    -------
    wind : array, shape (2, level, profile)
        Along and to the left of the surface stress. [m s-1]
    change : array, shape (4, 2, level, profile)
    """
    f, f_s, f_m = table.look_up(np.log(z) - theta[DEPTH], theta[MU])
    x, x_s, x_m = (a[np.newaxis] for a in table.look_up(theta[ROUGHNESS] - theta[DEPTH], theta[MU]))
    wind = _parts(x - f) * size
    change = np.empty((4, *wind.shape))
    change[DEPTH] = wind + _parts(f_s - x_s) * size
    change[MU] = _parts(x_m - f_m) * size - wind
    change[DIRECTION] = np.stack([-wind[1], wind[0]])
    change[ROUGHNESS] = _parts(x_s + 0.0 * f) * size
    return wind, change


def _parts(x: Any) -> Any:
    return np.stack([x.real, x.imag])


def turned(u: Any, v: Any, angle: Any) -> Any:
    """Return the components along and to the left of a direction [radian]."""
    c, s = np.cos(angle), np.sin(angle)
    return np.stack([u * c + v * s, v * c - u * s])


@dataclass
class Normal:
    """Whitened residual, its half gradient and the Gauss-Newton matrix, one a profile."""

    residual: Any
    downhill: Any  # (profile, 4)
    matrix: Any  # (profile, 4, 4)


def normal_equations(
    table: Table, winds: Winds, theta: Any, *noises: Noise, trend: bool = False
) -> list[Normal]:
    """Set up the normal equations at some numbers, under each noise; ``trend`` adds two columns."""
    wind, change = wind_of(table, winds.z, theta, scale_of(winds, theta))
    if trend:
        # A wind that grows with height, along the stress and to its left. [m s-1 per km]
        rise, nothing = winds.z * 1e-3, 0.0 * winds.z
        change = np.concatenate([change, [[rise, nothing], [nothing, rise]]])
    n = len(change)
    off = turned(winds.u, winds.v, theta[DIRECTION]) - wind
    answers = []
    for noise in noises:
        r, j = noise.whiten(off), noise.whiten(change)
        matrix = np.empty((winds.count.size, n, n))
        downhill = np.empty((winds.count.size, n))
        for a in range(n):
            downhill[:, a] = total(j[a, 0] * r[0] + j[a, 1] * r[1])
            for b in range(a, n):
                matrix[:, a, b] = total(j[a, 0] * j[b, 0] + j[a, 1] * j[b, 1])
                matrix[:, b, a] = matrix[:, a, b]
        answers.append(Normal(total(r[0] * r[0] + r[1] * r[1]), downhill, matrix))
    return answers


def free(winds: Winds, theta: Any, downhill: Any) -> Any:
    """Return which numbers may move, shape (profile, 4): not those that are given or at a bound."""
    held = (winds.low == winds.high) | ((theta <= winds.low) & (downhill.T < 0))
    return ~(held | ((theta >= winds.high) & (downhill.T > 0))).T


def held_matrix(matrix: Any, may: Any) -> Any:
    """Return the matrix with one on the diagonal, and nothing beside it, where none may move."""
    both = may[:, :, np.newaxis] & may[:, np.newaxis, :]
    return np.where(both, matrix, np.where(may, 0.0, 1.0)[:, :, np.newaxis] * np.eye(len(may.T)))


def thinned(winds: Winds) -> Winds:
    """Keep so many levels of each profile as the grid looks at, the lowest and highest always."""
    kept = np.minimum(winds.count, SEARCHED)
    place = np.arange(min(SEARCHED, len(winds.z)))[:, np.newaxis]
    place = place * np.maximum(winds.count - 1, 0) // np.maximum(kept - 1, 1)
    place = np.minimum(place, len(winds.z) - 1)
    there = np.arange(len(place))[:, np.newaxis] < kept
    z, u, v = (np.take_along_axis(x, place, 0) for x in (winds.z, winds.u, winds.v))
    return winds._replace(
        z=np.where(there, z, 1.0), u=np.where(there, u, 0.0), v=np.where(there, v, 0.0), count=kept
    )


def first_guess(table: Table, winds: Winds) -> Any:
    """
    Find the best of a grid of depths and mu, by ordinary least squares.

    For each, the direction and the roughness are found in turn, the other held: both are linear.

    Returns
    -------
    theta : array, shape (4, profile)
    """
    winds = thinned(winds)
    there = winds.there
    logs, count = np.log(winds.z), np.maximum(winds.count, 1)
    sum_u, sum_v = total(winds.u), total(winds.v)
    square = total(winds.u**2 + winds.v**2)
    best = np.full(count.shape, np.inf)
    theta = np.zeros((4, count.size))
    rows = range(round(MARGIN / MU_STEP) + 4, len(table.log_mu) - 5, ROW_STEP)
    for depth in np.arange(np.log(DEPTHS[0]), np.log(DEPTHS[1]), DEPTH_STEP):
        for row in rows:
            mu = table.log_mu[row]
            size = winds.f * np.exp(depth - mu) / VON_KARMAN**2
            f = table.nearest(logs - depth, row)
            wall = table.value[row, 0] + BOTTOM  # F = wall - s
            a, b = np.where(there, wall.real - f.real, 0.0), np.where(there, wall.imag - f.imag, 0)
            sum_a, own = total(a), total(a * a + b * b)
            with_u, with_v = total(a * winds.u + b * winds.v), total(a * winds.v - b * winds.u)
            least, most = depth - winds.high[ROUGHNESS], depth - winds.low[ROUGHNESS]
            depths = np.clip(0.0 * least + depth - np.log(0.05), least, most)  # ln(h / z0)
            for _ in range(3):
                x, y = depths * sum_u + with_u, depths * sum_v + with_v
                span = np.hypot(x, y)
                span = np.where(span > 0, span, 1.0)
                along = (x * sum_u + y * sum_v) / span
                depths = np.clip((along / size - sum_a) / count, least, most)
            x, y = depths * sum_u + with_u, depths * sum_v + with_v
            residual = square - 2.0 * size * np.hypot(x, y)
            residual += size**2 * (depths * (depths * count + 2.0 * sum_a) + own)
            better = residual < best
            best = np.where(better, residual, best)
            trial = np.stack([0.0 * x + depth, 0.0 * x + mu, np.arctan2(y, x), depth - depths])
            theta = np.where(better, trial, theta)
    return np.clip(theta, winds.low, winds.high)


def refine(table: Table, winds: Winds, noise: Noise, start: Any, steps: int) -> tuple[Any, Any]:
    """
    Descend to the least whitened residual by damped steps, each kept only where it lowers it.

    Returns
    -------
    theta : array, shape (4, profile)
    residual : array, shape (profile,)
    """
    best, trial = start, start
    least = np.full(winds.count.shape, np.inf)
    damping = np.full(winds.count.shape, 0.01)
    matrix, downhill = np.zeros((least.size, 4, 4)), np.zeros((least.size, 4))
    for _ in range(steps):
        (now,) = normal_equations(table, winds, trial, noise)
        better = now.residual < least
        best = np.where(better, trial, best)
        least = np.where(better, now.residual, least)
        matrix = np.where(better[:, np.newaxis, np.newaxis], now.matrix, matrix)
        downhill = np.where(better[:, np.newaxis], now.downhill, downhill)
        damping = np.clip(np.where(better, 0.2 * damping, 6.0 * damping), 1e-6, 1e4)
        trial = np.clip(best + step(winds, best, matrix, downhill, damping), winds.low, winds.high)
    return best, least


def step(winds: Winds, theta: Any, matrix: Any, downhill: Any, damping: Any) -> Any:
    """Return the damped Gauss-Newton step, shape (4, profile), at most one e-folding long."""
    may = free(winds, theta, downhill)
    bare = held_matrix(matrix, may)
    place = np.arange(4)
    bare[:, place, place] *= (1.0 + damping)[:, np.newaxis]
    bare, sound = solvable(bare)
    move = np.linalg.solve(bare, np.where(may, downhill, 0.0)[..., np.newaxis])[..., 0]
    move = np.where(sound[:, np.newaxis] & np.isfinite(move), move, 0.0)
    longest = np.maximum(np.max(np.abs(move), axis=-1), 1.0)
    return (move / longest[:, np.newaxis]).T


def solvable(matrix: Any) -> tuple[Any, Any]:
    """Put the identity where a matrix is no use, and say where it is."""
    place = np.arange(matrix.shape[-1])
    diagonal = matrix[:, place, place]
    sound = np.isfinite(matrix).all(axis=(1, 2)) & (diagonal > 0).all(axis=-1)
    matrix = np.where(sound[:, np.newaxis, np.newaxis], matrix, np.eye(place.size))
    root = np.sqrt(matrix[:, place, place])
    # A grain on the diagonal: numbers that cannot be told apart get a huge error, and no crash.
    matrix[:, place, place] += 1e-10 * root**2
    return matrix, sound


@dataclass
class Spread:
    """Errors of the four numbers under each noise length, and how likely each length is."""

    weights: Any  # (profile, length)
    covariance: Any  # (profile, length, 4, 4)
    shift: Any  # (profile, length, 4)
    noise: Any  # (profile,): standard deviation of a component
    trend: Any  # (profile,): chi square, two degrees of freedom, of a change with height left over

    def error(self, gradient: Any) -> Any:
        """Return the standard error of a quantity with the gradient (4, profile)."""
        variance = np.zeros(self.noise.shape)
        for length in range(self.weights.shape[1]):
            own, move = np.zeros(self.noise.shape), np.zeros(self.noise.shape)
            for a in range(4):
                move = move + gradient[a] * self.shift[:, length, a]
                for b in range(4):
                    own = own + gradient[a] * gradient[b] * self.covariance[:, length, a, b]
            weight = self.weights[:, length]
            variance = variance + np.where(weight > 0, weight * (own + move**2), 0.0)
        return np.sqrt(np.maximum(variance, 0.0))


def spread(table: Table, winds: Winds, theta: Any, lengths: Any, floor: Any) -> Spread:
    """
    Work out how far off the four numbers may be, under noise of unknown length.

    Parameters
    ----------
    table, winds, theta
        As in :func:`wind_of`.
    lengths : sequence
        Noise lengths to weigh. [m]
    floor : array, shape (profile,)
        Least standard error of a wind component. [m s-1]
    """
    noises = [Noise.of(winds, length) for length in lengths]
    answers = normal_equations(table, winds, theta, *noises, trend=True)
    logs, covariances, shifts, variances, gains = [], [], [], [], []
    wind = total(winds.u**2 + winds.v**2)
    for noise, one in zip(noises, answers, strict=True):
        may = (winds.low != winds.high).T & free(winds, theta, 0.0 * one.downhill[:, :4])
        inverse, move, gain, _ = _solved(one.matrix[:, :4, :4], one.downhill[:, :4], may)
        freedom = np.maximum(2 * winds.count - np.count_nonzero(may, axis=-1), 3)
        residual = np.maximum(one.residual - gain, 1e-9 * (wind + 1e-300))
        # A wind that changes with height would pass for noise of long correlation: the lengths are
        # judged by what is left beside it.
        beside = np.concatenate([may, np.ones((len(may), 2), dtype=bool)], axis=1)
        wider, farther, whole, log_size = _solved(one.matrix, one.downhill, beside)
        least = np.maximum(one.residual - whole, 1e-9 * (wind + 1e-300))
        logs.append(-0.5 * (freedom - 2) * np.log(least) - noise.log_determinant - 0.5 * log_size)
        gains.append((residual - least) * (freedom - 2) / least)
        variance = np.maximum(residual / freedom, floor**2)
        variances.append(variance)
        # Where it plainly is there, the numbers may be off by what allowing for it would move them.
        plain = gains[-1] > TREND
        inverse = np.where(plain[:, np.newaxis, np.newaxis], wider[:, :4, :4], inverse)
        move = np.where(plain[:, np.newaxis], farther[:, :4], move)
        covariances.append(inverse * variance[:, np.newaxis, np.newaxis])
        shifts.append(np.clip(move, -1.0, 1.0))
    log = np.stack(logs, -1)
    log = np.where(np.isfinite(log), log, -np.inf)
    highest = np.max(log, axis=-1, keepdims=True)
    weights = np.where(np.isfinite(highest), np.exp(log - highest), 1.0 / len(noises))
    weights = weights / total(weights.T)[:, np.newaxis]
    noise_square, trend = np.zeros(floor.shape), np.zeros(floor.shape)
    for length, variance in enumerate(variances):
        noise_square = noise_square + weights[:, length] * variance
        trend = trend + np.where(weights[:, length] > 0, weights[:, length] * gains[length], 0.0)
    return Spread(
        weights, np.stack(covariances, 1), np.stack(shifts, 1), np.sqrt(noise_square), trend
    )


def _solved(matrix: Any, downhill: Any, may: Any) -> tuple[Any, Any, Any, Any]:
    """Inverse of the normal matrix, the step, what it gains, and the log of the determinant."""
    matrix, sound = solvable(held_matrix(matrix, may))
    both = may[:, :, np.newaxis] & may[:, np.newaxis, :] & sound[:, np.newaxis, np.newaxis]
    inverse = np.where(both, np.linalg.inv(matrix), 0.0)
    move, gain = np.zeros(downhill.shape), np.zeros(len(downhill))
    for b in range(downhill.shape[1]):
        move = move + inverse[:, :, b] * downhill[:, b : b + 1]
    for b in range(downhill.shape[1]):
        gain = gain + move[:, b] * downhill[:, b]
    return inverse, move, gain, np.linalg.slogdet(matrix)[1]


def mean_length(weights: Any, lengths: Any = LENGTHS) -> Any:
    """Return the weighed noise length. [m]."""
    length = np.zeros(len(weights))
    for place, value in enumerate(lengths):
        length = length + weights[:, place] * value
    return length
