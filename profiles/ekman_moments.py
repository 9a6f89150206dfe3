r"""
Inner products of an Ekman basis with itself and with the wind, for many trials at once.

The basis at a level is [1, x, e, x e] with x the height in a unit of the profile's own and
:math:`e = \exp(-(1 + i) z / \delta)`. Noise correlated along height as
:math:`\exp(-|z_i - z_j| / L)` (Ornstein-Uhlenbeck) is whitened from level to level,

.. math:: y'_i = (y_i - \rho_i y_{i-1}) / \sqrt{1 - \rho_i^2}, \qquad
          \rho_i = \exp(-(z_i - z_{i-1}) / L)

which is exact on irregular levels, because that process is Markov: given the level below, the ones
farther down say nothing more. So the inverse Q of the correlation matrix has three diagonals only,

.. math:: Q_{ii} = q_i + \rho_{i+1}^2 q_{i+1}, \quad Q_{i,i-1} = -\rho_i q_i, \quad
          q_i = 1 / (1 - \rho_i^2)

and every inner product is a weighted sum over levels: what depends on the noise is weight, what
depends on the scale height is column, and a trial of one against the other is a small matrix
product.

A matrix product over levels gives bits that depend on how many levels it is given. Here it is
always given the same: the levels between fixed borders, filled up with zeros, and the parts are
added in order. So a profile in a stack gives bit for bit what it gives alone.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

ONE, HEIGHT, DECAY, TANGENT = range(4)
PART = 64  # levels in one matrix product, but for the borders below
FIRST_BORDERS = (0, 16, 32)  # short profiles are not filled up to a whole part
CACHE = 12288  # numbers in a column for which all columns stay in the processor's cache


class Profiles(NamedTuple):
    """
    Profiles ready to be fitted.

    Attributes
    ----------
    z, w : array, shape (profile, level)
        Compact heights and complex wind; zero beyond ``count``, up to a border. [m], [m s-1]
    count : array of int, shape (profile,)
        Number of levels.
    unit : array, shape (profile,)
        Height of the highest level, the height unit of the basis. [m]
    """

    z: Any
    w: Any
    count: Any
    unit: Any

    def at(self, rows: Any) -> Profiles:
        """Return some of the profiles."""
        return Profiles(*(array[rows] for array in self))


@dataclass
class Moments:
    """
    Sums over the whitened levels, each of a shape that broadcasts to (profile, length, trial).

    Attributes
    ----------
    gram
        ``gram[a][b]`` is the sum of conj(y_a) y_b.
    rhs
        ``rhs[a]`` is the sum of conj(y_a) w.
    wind
        Sum of abs(w)^2.
    log_determinant
        Logarithm of the determinant of the correlation matrix.
    """

    gram: list[list[Any]]
    rhs: list[Any]
    wind: Any
    log_determinant: Any

    def trial(self, m: int) -> Moments:
        """Return the moments of one trial only, its axis kept."""
        return Moments(
            [[_one(x, m) for x in row] for row in self.gram],
            [_one(x, m) for x in self.rhs],
            self.wind,
            self.log_determinant,
        )


@dataclass
class Whitening:
    """
    The noise of some lengths, as weights of the levels.

    Attributes
    ----------
    columns : array, shape (profile, 4 length, level)
        Q times 1, x, u and v.
    diagonals : array, shape (profile, 2 length, level)
        The main diagonal of Q, and the one below.
    plain : array, shape (profile, 4, length, 4)
        Inner products of 1, x, u and v.
    log_determinant : array, shape (profile, length)
        Logarithm of the determinant of the correlation matrix.
    """

    columns: Any
    diagonals: Any
    plain: Any
    log_determinant: Any

    def at(self, rows: Any) -> Whitening:
        """Return that of some of the profiles."""
        return Whitening(
            self.columns[rows], self.diagonals[rows], self.plain[rows], self.log_determinant[rows]
        )


def profiles_of(z: Any, u: Any, v: Any, count: Any, unit: Any) -> Profiles:
    """
    Fill compact levels up to whole parts.

    Parameters
    ----------
    z, u, v : array, shape (profile, level)
        Heights and wind, in their order, NaN beyond ``count``. [m], [m s-1]
    count, unit : array, shape (profile,)
        As in :class:`Profiles`.
    """
    there = np.arange(z.shape[1]) < count[:, np.newaxis]
    filled = np.zeros((3, len(z), _borders(z.shape[1])[-1]))
    for place, x in enumerate((z, u, v)):
        filled[place, :, : z.shape[1]] = np.where(there, x, 0.0)
    return Profiles(filled[0], filled[1] + 1j * filled[2], count, unit)


def whiten(data: Profiles, length: Any) -> Whitening:
    """
    Work out the weights of the levels under noise of some lengths.

    Parameters
    ----------
    data
        The profiles.
    length : array, shape (profile, length)
        Noise length; 0 for independent noise. [m]
    """
    count, width = data.z.shape
    lengths = length.shape[1]
    columns = np.empty((count, 4, lengths, width))
    diagonals = np.zeros((count, 2, lengths, width))
    plain = np.empty((count, 4 * lengths, 4))
    log_determinant = np.empty((count, lengths))
    for rows in _slices(count, width * lengths):
        z = data.z[rows]
        there = np.arange(width) < data.count[rows, np.newaxis]
        gap = np.full(z.shape, np.inf)
        gap[:, 1:] = np.where(there[:, 1:], z[:, 1:] - z[:, :-1], np.inf)
        span = length[rows, :, np.newaxis]
        rho = np.exp(-gap[:, np.newaxis] / np.where(span > 0, span, 1.0))
        rho = np.where(span > 0, rho, 0.0)
        rest = (1.0 - rho) * (1.0 + rho)
        log_determinant[rows] = np.add.accumulate(np.log(rest), axis=-1)[..., -1]
        q = np.where(there[:, np.newaxis], 1.0 / rest, 0.0)
        y = np.stack([there + 0.0, z / data.unit[rows, np.newaxis], *_parts(data.w[rows])], axis=1)
        # Q y, one step of whitening down and one back up.
        step = np.repeat(y[:, :, np.newaxis], lengths, axis=2)
        rise = rho[:, np.newaxis, :, 1:]
        step[..., 1:] -= rise * y[:, :, np.newaxis, :-1]
        step *= q[:, np.newaxis]
        columns[rows] = step
        columns[rows, ..., :-1] -= rise * step[..., 1:]
        diagonals[rows, 0] = q
        diagonals[rows, 0, :, :-1] += rho[..., 1:] ** 2 * q[..., 1:]
        diagonals[rows, 1] = -rho * q
        plain[rows] = _product(columns[rows].reshape(len(z), 4 * lengths, width), y)
    return Whitening(
        columns.reshape(count, 4 * lengths, width),
        diagonals.reshape(count, 2 * lengths, width),
        plain.reshape(count, 4, lengths, 4),
        log_determinant,
    )


def basis_moments(data: Profiles, delta: Any, *noise: Whitening) -> list[Moments]:
    """
    Sum the moments of profiles for trial scale heights, under each noise.

    Parameters
    ----------
    data
        The profiles.
    delta : array, shape (profile, trial)
        Scale height. [m]
    *noise
        From :func:`whiten`.
    """
    count, width = data.z.shape
    trials = delta.shape[1]
    first = [np.empty((count, n.columns.shape[1], 4 * trials)) for n in noise]
    second = [np.empty((count, n.diagonals.shape[1], 7 * trials)) for n in noise]
    for rows in _slices(count, width * trials):
        z = data.z[rows, np.newaxis]
        x = z / data.unit[rows, np.newaxis, np.newaxis]
        linear = np.empty((len(z), 4, trials, width))
        c, s, p, q = (linear[:, k] for k in range(4))
        decay(z, delta[rows, :, np.newaxis], c, s)
        np.multiply(x, c, out=p)
        np.multiply(x, s, out=q)
        # Squares of e, and of e with e at the level below; each also with x.
        square = np.zeros((len(z), 7, trials, width))
        e2, xe2, xxe2 = (square[:, k] for k in range(3))
        np.multiply(c, c, out=e2)
        e2 += s * s
        np.multiply(x, e2, out=xe2)
        np.multiply(x, xe2, out=xxe2)
        real, x_real, xx_real, x_imaginary = (square[:, k, :, 1:] for k in range(3, 7))
        np.multiply(c[..., 1:], c[..., :-1], out=real)
        real += s[..., 1:] * s[..., :-1]
        np.multiply(x[..., 1:] + x[..., :-1], real, out=x_real)
        np.multiply(x[..., 1:] * x[..., :-1], real, out=xx_real)
        np.multiply(c[..., 1:], s[..., :-1], out=x_imaginary)
        x_imaginary -= s[..., 1:] * c[..., :-1]
        x_imaginary *= x[..., :-1] - x[..., 1:]
        for n, one, two in zip(noise, first, second, strict=True):
            one[rows] = _product(n.columns[rows], linear.reshape(len(z), 4 * trials, width))
            two[rows] = _product(n.diagonals[rows], square.reshape(len(z), 7 * trials, width))
    return [
        _assemble(
            n,
            one.reshape(count, 4, n.log_determinant.shape[1], 4, trials),
            two.reshape(count, 2, n.log_determinant.shape[1], 7, trials),
        )
        for n, one, two in zip(noise, first, second, strict=True)
    ]


def coarse_moments(
    data: Profiles, largest: Any, halvings: int, noise: Whitening, turning: bool = True
) -> tuple[Moments, Any]:
    """
    Sum the moments for a row of scale heights that all profiles share, without the tangent.

    Parameters
    ----------
    data
        The profiles.
    largest : array, shape (few,)
        The largest scale heights, increasing. [m]
    halvings : int
        How often they are halved: the decay for half a scale height is the square of that for the
        whole, which spares nearly all of the exponentials.
    noise
        Of one length a profile, from :func:`whiten`.
    turning
        Without it the decay is exp(-z / delta), which does not turn.

    Returns
    -------
    moments
        Trials in increasing order.
    mirrored
        What stands in place of ``moments.rhs`` if the wind turns the other way (v to -v).
    """
    count, width = data.z.shape
    few = len(largest)
    trials = few * (halvings + 1)
    linear = np.zeros((count, 4, 1, 4, trials))
    square = np.zeros((count, 2, 1, 7, trials))
    for rows in _slices(count, width * trials // 3):  # 4 columns here, 11 in basis_moments
        z = data.z[rows, np.newaxis]
        columns = np.empty((len(z), 2, trials, width))
        c, s = columns[:, 0], columns[:, 1]
        decay(z, largest[:, np.newaxis], c[:, -few:], s[:, -few:])
        if not turning:
            c[:, -few:], s[:, -few:] = np.exp(-z / largest[:, np.newaxis]), 0.0
        for start in range(trials - 2 * few, -1, -few):
            half, whole = slice(start, start + few), slice(start + few, start + 2 * few)
            np.multiply(c[:, whole], c[:, whole], out=c[:, half])
            c[:, half] -= s[:, whole] * s[:, whole]
            np.multiply(c[:, whole], s[:, whole], out=s[:, half])
            s[:, half] *= 2.0
        squares = np.zeros((len(z), 2, trials, width))
        np.multiply(c, c, out=squares[:, 0])
        squares[:, 0] += s * s
        np.multiply(c[..., 1:], c[..., :-1], out=squares[:, 1, :, 1:])
        squares[:, 1, :, 1:] += s[..., 1:] * s[..., :-1]
        sums = _product(noise.columns[rows], columns.reshape(len(z), 2 * trials, width))
        linear[rows, :, 0, :2] = sums.reshape(len(z), 4, 2, trials)
        sums = _product(noise.diagonals[rows], squares.reshape(len(z), 2 * trials, width))
        square[rows, 0, 0, 0] = sums[:, 0, :trials]
        square[rows, 1, 0, 3] = sums[:, 1, trials:]
    moments = _assemble(noise, linear, square)
    u, v = linear[:, 2], linear[:, 3]
    mirrored = [x.conj() for x in moments.rhs]
    mirrored[DECAY] = (u[:, :, 0] - v[:, :, 1]) - 1j * (v[:, :, 0] + u[:, :, 1])
    return moments, mirrored


def decay(z: Any, delta: Any, c: Any, s: Any) -> None:
    """
    Put the real and imaginary part of exp(-(1 + i) z / delta) into c and s.

    Both come from the tangent of half the angle t, cos = (1 - t^2) / (1 + t^2) and sin =
    2 t / (1 + t^2): numpy has a vectorised tangent where it has no vectorised sine.
    """
    phase = z / delta
    size = np.exp(-phase)
    phase *= 0.5
    t = np.tan(phase, out=phase)
    np.multiply(t, t, out=c)
    c += 1.0
    np.divide(size, c, out=c)
    c *= 2.0
    np.multiply(t, c, out=s)
    np.negative(s, out=s)
    c -= size


def _parts(w: Any) -> tuple[Any, Any]:
    return w.real, w.imag


def _assemble(noise: Whitening, linear: Any, square: Any) -> Moments:
    """Put the sums together: (profile, 4, length, 4, trial) and (profile, 2, length, 7, trial)."""
    one, x, u, v = (linear[:, k] for k in range(4))
    one_e, x_e = one[:, :, 0] + 1j * one[:, :, 1], x[:, :, 0] + 1j * x[:, :, 1]
    one_t, x_t = one[:, :, 2] + 1j * one[:, :, 3], x[:, :, 2] + 1j * x[:, :, 3]
    e_w = (u[:, :, 0] + v[:, :, 1]) + 1j * (v[:, :, 0] - u[:, :, 1])
    t_w = (u[:, :, 2] + v[:, :, 3]) + 1j * (v[:, :, 2] - u[:, :, 3])
    main, below = square[:, 0], square[:, 1]
    e_e = main[:, :, 0] + 2.0 * below[:, :, 3]
    e_t = main[:, :, 1] + below[:, :, 4] + 1j * below[:, :, 6]
    t_t = main[:, :, 2] + 2.0 * below[:, :, 5]
    plain = noise.plain[..., np.newaxis]
    one_one, one_x, x_x = plain[:, 0, :, 0], plain[:, 0, :, 1], plain[:, 1, :, 1]
    one_w = plain[:, 0, :, 2] + 1j * plain[:, 0, :, 3]
    x_w = plain[:, 1, :, 2] + 1j * plain[:, 1, :, 3]
    gram = [
        [one_one + 0j, one_x + 0j, one_e, one_t],
        [one_x + 0j, x_x + 0j, x_e, x_t],
        [one_e.conj(), x_e.conj(), e_e + 0j, e_t],
        [one_t.conj(), x_t.conj(), e_t.conj(), t_t + 0j],
    ]
    return Moments(
        gram,
        [one_w, x_w, e_w, t_w],
        plain[:, 2, :, 2] + plain[:, 3, :, 3],
        noise.log_determinant[..., np.newaxis],
    )


def _borders(levels: int) -> list[int]:
    """Return the borders of the parts that hold so many levels; they never move."""
    borders = [0]
    for border in (*FIRST_BORDERS[1:], *range(PART, levels + PART, PART)):
        if borders[-1] < levels:
            borders.append(border)
    return borders


def _product(weights: Any, columns: Any) -> Any:
    """Multiply (profile, row, level) with (profile, column, level), part by part of the levels."""
    columns = columns.swapaxes(-1, -2)
    borders = _borders(columns.shape[1])
    total = weights[..., : borders[1]] @ columns[:, : borders[1]]
    for start, end in itertools.pairwise(borders[1:]):
        total += weights[..., start:end] @ columns[:, start:end]
    return total


def _slices(count: int, numbers: int) -> list[slice]:
    """Cut the profiles, of so many numbers each, into pieces that the cache holds."""
    size = max(1, CACHE // max(numbers, 1))
    return [slice(start, start + size) for start in range(0, count, size)]


def _one(x: Any, m: int) -> Any:
    return x[..., m : m + 1] if x.shape[-1] > 1 else x
