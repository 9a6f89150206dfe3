"""Synthetic spirals of known truth, with noise correlated along height, and their plain fit."""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy.optimize import least_squares

from backveer.profiles.earth import coriolis_parameter
from backveer.profiles.stack import Stack


def spiral(z: Any, delta: Any, g: Any, a: Any, s: Any = 0.0, sign: float = 1.0) -> Any:
    """
    Return W = G + S z + A exp(-(1 + i sign) z / delta), shape (profile, level).

    Ekman, 1905; Taylor, 1915 (full references in ekman.py).
    """
    delta, g, a, s = (np.asarray(x).reshape(-1, 1) for x in (delta, g, a, s))
    return g + s * z + a * np.exp(-(1.0 + 1j * sign) * np.asarray(z) / delta)


def correlated_noise(rng: np.random.Generator, z: Any, length: Any, sigma: Any) -> Any:
    """Return complex noise whose components correlate as exp(-distance / length)."""
    z = np.asarray(z, dtype=float)
    white = rng.normal(size=z.shape) + 1j * rng.normal(size=z.shape)
    noise = white.copy()
    length = np.broadcast_to(length, z.shape[:1])
    for i in range(1, z.shape[1]):
        gap = z[:, i] - z[:, i - 1]
        rho = np.where(length > 0, np.exp(-gap / np.where(length > 0, length, 1.0)), 0.0)
        noise[:, i] = rho * noise[:, i - 1] + np.sqrt(1.0 - rho**2) * white[:, i]
    return noise * np.reshape(sigma, (-1, 1))


def stack_of(z: Any, w: Any, latitude: Any) -> Stack:
    w = np.atleast_2d(w)
    return Stack.of(
        profiles=len(w),
        height=z,
        eastward_wind=w.real,
        northward_wind=w.imag,
        latitude=np.broadcast_to(latitude, (len(w),)),
    )


def truth_of(delta: Any, g: Any, a: Any, s: Any, latitude: Any) -> dict[str, Any]:
    """Return what a fit should find, by the names of EkmanFit; arrays (profile,)."""
    delta, g, a, s, latitude = np.broadcast_arrays(delta, g, a, s, latitude)
    f = coriolis_parameter(latitude)
    viscosity = 0.5 * np.abs(f) * delta**2
    stress = s - (1.0 + 1j * np.sign(f)) / delta * a
    return {
        "scale_height": delta,
        "eddy_viscosity": viscosity,
        "geostrophic_eastward_wind": g.real,
        "geostrophic_northward_wind": g.imag,
        "geostrophic_eastward_shear": s.real,
        "geostrophic_northward_shear": s.imag,
        "departure_eastward_at_ground": a.real,
        "departure_northward_at_ground": a.imag,
        "cross_isobar_angle": np.sign(f) * np.degrees(np.angle(stress * g.conj())),
        "friction_velocity": np.sqrt(viscosity * np.abs(stress)),
    }


class PlainFit:
    """
    One member fitted to one profile with ``scipy.optimize.least_squares``; shares no code.

    Parameters are ln delta, G and then, as the member has them, A and S (per km), complex numbers
    as two real ones.
    """

    SIZES = (3, 5, 5, 7)

    def __init__(self, member: int, z: Any, w: Any, length: float = 0.0, sign: float = 1.0) -> None:
        self.member, self.z, self.w = member, z, w
        self.decay = -(1.0 + 1j * sign) * z
        self.rho = np.exp(-np.diff(z) / length) if length > 0 else np.zeros(z.size - 1)
        self.weight = 1.0 / np.sqrt(1.0 - self.rho**2)

    def _whitened(self, y: Any) -> Any:
        white = y.astype(complex)
        white[..., 1:] -= self.rho * y[..., :-1]
        white[..., 1:] *= self.weight
        return np.concatenate([white.real, white.imag], axis=-1)

    def residual(self, p: Any) -> Any:
        e = np.exp(self.decay * np.exp(-p[0]))
        g = complex(p[1], p[2])
        fitted = g - g * e if self.member in (0, 2) else g + complex(p[3], p[4]) * e
        if self.member >= 2:
            fitted += complex(p[-2], p[-1]) / 1000.0 * self.z
        return self._whitened(fitted - self.w)

    def jacobian(self, p: Any) -> Any:
        exponent = self.decay * np.exp(-p[0])
        e = np.exp(exponent)
        no_slip = self.member in (0, 2)
        columns = np.empty((p.size, self.z.size), dtype=complex)
        amplitude = -complex(p[1], p[2]) if no_slip else complex(p[3], p[4])
        columns[0] = -amplitude * exponent * e
        columns[1] = 1.0 - e if no_slip else 1.0
        if not no_slip:
            columns[3] = e
        if self.member >= 2:
            columns[-2] = self.z / 1000.0
        columns[2::2] = 1j * columns[1::2]
        return self._whitened(columns).T

    def start(self, delta: float) -> Any:
        """Return a start that a careful user would take: the top's wind, and no slip."""
        g = self.w[-1]
        p = np.array([np.log(delta), g.real, g.imag, -g.real, -g.imag, 0.0, 0.0])
        return p[[0, 1, 2, 5, 6]] if self.member == 2 else p[: self.SIZES[self.member]]

    def fit(self, start: Any, **options: Any) -> Any:
        return least_squares(self.residual, start, **options)
