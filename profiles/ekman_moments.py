r"""
Inner products of an Ekman basis with itself and with the wind, for many trials at once.

The basis at a level is [1, x, e, x e] with x the height in a unit of the profile's own and
:math:`e = \exp(-(1 + i) z / \delta)`. Noise correlated along height as
:math:`\exp(-|z_i - z_j| / L)` (Ornstein-Uhlenbeck) is whitened from level to level,

.. math:: y'_i = (y_i - \rho_i y_{i-1}) / \sqrt{1 - \rho_i^2}, \qquad
          \rho_i = \exp(-(z_i - z_{i-1}) / L)

which is exact on irregular levels, because that process is Markov: given the level below, the ones
farther down say nothing more.

The sums run over the levels in order, one level at a time over all profiles and trials, in real
arithmetic: so a profile in a stack gives bit for bit what it gives alone, and the loop is short.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

ONE, HEIGHT, DECAY, TANGENT = range(4)


class Profiles(NamedTuple):
    """
    Profiles ready to be fitted.

    Attributes
    ----------
    z, w : array, shape (profile, level)
        Compact heights and complex wind; zero beyond ``count``. [m], [m s-1]
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
    Sums over the whitened levels, each of a shape that broadcasts to (profile, trial).

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


def basis_moments(data: Profiles, delta: Any, length: Any, tangent: bool = True) -> Moments:
    """
    Sum the moments of profiles for trial scale heights and noise lengths.

    Parameters
    ----------
    data
        The profiles.
    delta : array, shape (profile, trial)
        Scale height. [m]
    length : array, shape (profile, trial) or (profile, 1)
        Noise length; 0 for independent noise. [m]
    tangent
        Sum also what the column x e needs; without it its moments are zero.
    """
    z, w, count, unit = data
    rate = 1.0 / delta
    narrow, wide = length.shape, np.broadcast_shapes(delta.shape, length.shape)
    one_one, one_x, x_x = (np.zeros(narrow) for _ in range(3))
    one_w, x_w = np.zeros(narrow, dtype=complex), np.zeros(narrow, dtype=complex)
    w_w, log_determinant = np.zeros(narrow), np.zeros(narrow)
    # Real and imaginary parts of the sums with e (c, s) and with x e (p, q).
    one_c, one_s, x_c, x_s, e_e, wc, ws = (np.zeros(wide) for _ in range(7))
    one_p, one_q, x_p, x_q, t_t, ec, es, wp, wq = (np.zeros(wide) for _ in range(9))
    correlated = bool((length > 0).any())
    safe_length = np.where(length > 0, length, 1.0)
    c0 = s0 = p0 = q0 = np.zeros(wide)
    x0 = u0 = v0 = below = np.zeros_like(z[:, :1])
    with np.errstate(under="ignore"):
        for i in range(z.shape[1]):
            there = (i < count)[:, np.newaxis]
            height = np.where(there, z[:, i : i + 1], 0.0)
            u = np.where(there, w.real[:, i : i + 1], 0.0)
            v = np.where(there, w.imag[:, i : i + 1], 0.0)
            x = height / unit[:, np.newaxis]
            phase = height * rate
            size = np.exp(-phase)
            c, s = size * np.cos(phase), -size * np.sin(phase)
            if correlated and i > 0:
                gap = np.where(there, height - below, 0.0)
                rho = np.where(there & (length > 0), np.exp(-gap / safe_length), 0.0)
                rest = (1.0 - rho) * (1.0 + rho)
                weight = np.where(there, 1.0 / np.sqrt(rest), 0.0)
                log_determinant += np.log(rest)
                one_ = (1.0 - rho) * weight
                x_ = (x - rho * x0) * weight
                u_, v_ = (u - rho * u0) * weight, (v - rho * v0) * weight
                c_, s_ = (c - rho * c0) * weight, (s - rho * s0) * weight
            else:
                one_ = np.where(there, np.ones(narrow), 0.0)
                x_, u_, v_ = x * one_, u * one_, v * one_
                c_, s_ = c * one_, s * one_
            one_one += one_ * one_
            one_x += one_ * x_
            x_x += x_ * x_
            one_w += one_ * (u_ + 1j * v_)
            x_w += x_ * (u_ + 1j * v_)
            w_w += u_ * u_ + v_ * v_
            one_c += one_ * c_
            one_s += one_ * s_
            x_c += x_ * c_
            x_s += x_ * s_
            e_e += c_ * c_ + s_ * s_
            wc += c_ * u_ + s_ * v_
            ws += c_ * v_ - s_ * u_
            if tangent:
                p, q = x * c, x * s
                if correlated and i > 0:
                    p_, q_ = (p - rho * p0) * weight, (q - rho * q0) * weight
                else:
                    p_, q_ = p * one_, q * one_
                one_p += one_ * p_
                one_q += one_ * q_
                x_p += x_ * p_
                x_q += x_ * q_
                t_t += p_ * p_ + q_ * q_
                ec += c_ * p_ + s_ * q_
                es += c_ * q_ - s_ * p_
                wp += p_ * u_ + q_ * v_
                wq += p_ * v_ - q_ * u_
                p0, q0 = p, q
            c0, s0, x0, u0, v0, below = c, s, x, u, v, height
    one_e, x_e, e_w = one_c + 1j * one_s, x_c + 1j * x_s, wc + 1j * ws
    one_t, x_t, e_t, t_w = one_p + 1j * one_q, x_p + 1j * x_q, ec + 1j * es, wp + 1j * wq
    gram = [
        [one_one + 0j, one_x + 0j, one_e, one_t],
        [one_x + 0j, x_x + 0j, x_e, x_t],
        [one_e.conj(), x_e.conj(), e_e + 0j, e_t],
        [one_t.conj(), x_t.conj(), e_t.conj(), t_t + 0j],
    ]
    return Moments(gram, [one_w, x_w, e_w, t_w], w_w, log_determinant)
