"""
The steady Ekman balance with a viscosity that varies with height: wind profiles of known truth.

The balance i f (W - Wg) = d/dz (K dW/dz), W = u + i v, is solved with ``scipy.integrate.solve_bvp``
(collocation with error control) and shares no code with the package, so that it can be its witness.
"""

from __future__ import annotations

import functools
from collections.abc import Callable
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from scipy.integrate import solve_bvp

from backveer.profiles.stack import Stack

VON_KARMAN = 0.40  # Högström, 1996: Boundary-Layer Meteorol., 78, 215-246 (0.40 +- 0.01)
OMEGA = 7.292115e-5  # rad s-1, WGS84 (NIMA/NGA)

Viscosity = Callable[[Any, Any], Any]


def coriolis_parameter(latitude: float) -> float:
    """Return f = 2 Omega sin(latitude). [s-1]"""
    return float(2.0 * OMEGA * np.sin(np.radians(latitude)))


@functools.cache
def constant(viscosity: float) -> Viscosity:
    """Return K the same at all heights [m2 s-1], as Ekman's spiral has it."""
    return lambda z, u_star: np.full_like(z, viscosity)


@functools.cache
def exponential(depth: float, background: float = 0.1) -> Viscosity:
    """
    Return K = kappa u* z exp(-z / depth) + a small background aloft. [m2 s-1]

    Grows as the logarithmic wall wants it and dies out above; largest at ``depth`` [m]. The
    background, an assumption, keeps the equation regular aloft and vanishes at the wall.
    """
    return lambda z, u_star: (
        VON_KARMAN * u_star * z * np.exp(-z / depth) + background * np.expm1(-z / depth) ** 2
    )


@functools.cache
def neutral(latitude: float, share: float = 0.04, background: float = 0.1) -> Viscosity:
    """
    Return the ``exponential`` viscosity whose depth is ``share`` u* / |f|. [m2 s-1]

    The share is chosen so that the drag law (test_synthetic.py) comes out, which neutral
    layers follow.
    """
    f = abs(coriolis_parameter(latitude))
    return lambda z, u_star: (
        VON_KARMAN * u_star * z * np.exp(-z * f / (share * u_star))
        + background * np.expm1(-z * f / (share * u_star)) ** 2
    )


@functools.cache
def cubic(depth: float, surface_layer: float = 0.05, background: float = 0.1) -> Viscosity:
    """
    Return the cubic of O'Brien (1970) above the surface layer, kappa u* z within it. [m2 s-1]

    O'Brien, J. J., 1970: A note on the vertical structure of the eddy exchange coefficient in the
    planetary boundary layer. J. Atmos. Sci., 27, 1213-1215 (formula from memory, sure). The surface
    layer takes the given share of ``depth``; above ``depth`` only the background is left.
    """
    base = surface_layer * depth

    def viscosity(z: Any, u_star: Any) -> Any:
        low, slope = VON_KARMAN * u_star * base, VON_KARMAN * u_star
        share = ((depth - z) / (depth - base)) ** 2
        aloft = share * (low + (z - base) * (slope + 2.0 * low / (depth - base)))
        within = np.where(z < base, slope * z, np.where(z < depth, aloft, 0.0))
        return within + background * np.expm1(-z / depth) ** 2

    return viscosity


@dataclass(frozen=True, eq=False)
class Truth:
    """
    A solved boundary layer; complex numbers are east + i north.

    Attributes
    ----------
    f
        Coriolis parameter. [s-1]
    geostrophic, shear
        Geostrophic wind at the ground [m s-1] and its change with height [s-1].
    u_star
        Friction velocity, from the stress at the roughness length. [m s-1]
    cross_isobar_angle
        Between surface stress and geostrophic wind, positive toward low pressure. [degree]
    roughness, top
        Heights of the wall and of the upper edge of the solution. [m]
    """

    f: float
    geostrophic: complex
    shear: complex
    u_star: float
    cross_isobar_angle: float
    roughness: float
    top: float
    _solution: Callable[[Any], Any]
    _mirrored: bool
    _turn: complex

    def geostrophic_wind(self, z: Any) -> Any:
        """Return the geostrophic wind at the heights z [m], complex. [m s-1]"""
        return self.geostrophic + self.shear * np.asarray(z, dtype=float)

    def wind(self, z: Any) -> Any:
        """Return the wind at the heights z [m], complex; geostrophic above the solution. [m s-1]"""
        z = np.asarray(z, dtype=float)
        wind = self._look_up(z, 0)
        return np.where(z > self.top, self.geostrophic_wind(z), wind)

    def stress(self, z: Any) -> Any:
        """Return the kinematic stress K dW/dz at the heights z [m], complex. [m2 s-2]"""
        return self._look_up(np.asarray(z, dtype=float), 2)

    def _look_up(self, z: Any, first: int) -> Any:
        values = self._solution(np.log(np.clip(z, self.roughness, self.top)))
        value = values[first] + 1j * values[first + 1]
        return (value.conj() if self._mirrored else value) * self._turn

    def stack(self, z: Any, latitude: float, noise: Any = 0.0, **more: Any) -> Stack:
        """Return a stack of one profile (or as many as ``noise`` has rows) at the heights z."""
        wind = np.atleast_2d(self.wind(z) + noise)
        return Stack.of(
            height=z, eastward_wind=wind.real, northward_wind=wind.imag, latitude=latitude, **more
        )


def solve(
    speed: float = 10.0,
    latitude: float = 52.0,
    roughness: float = 0.05,
    viscosity: Viscosity | None = None,
    direction: float = 270.0,
    shear: complex = 0.0,
) -> Truth:
    """
    Solve the steady balance between friction, Coriolis force and pressure gradient.

    Parameters
    ----------
    speed, direction
        Geostrophic wind at the ground [m s-1] and where it blows from [degree].
    latitude
        Degrees north; the southern hemisphere is the mirror image.
    roughness
        Height at which the wind vanishes. [m]
    viscosity
        K(z, u_star) of height [m] and friction velocity [m s-1]; by default ``exponential`` with
        a depth of 250 m.
    shear
        Change of the geostrophic wind with height, east + i north. [s-1]
    """
    f = coriolis_parameter(latitude)
    southern = f < 0
    turn = complex(-1j * np.exp(-1j * np.radians(direction)))  # unit vector that the wind follows
    along = complex(shear) / turn
    core = _core(
        float(speed),
        abs(f),
        float(roughness),
        viscosity or exponential(250.0),
        along.conjugate() if southern else along,
    )
    return replace(
        core, f=f, geostrophic=speed * turn, shear=complex(shear), _mirrored=southern, _turn=turn
    )


@functools.cache
def _core(speed: float, f: float, z0: float, viscosity: Viscosity, shear: complex) -> Truth:
    """Solve with the geostrophic wind along x in the northern hemisphere, over s = ln z."""
    top = 6000.0

    def slopes(s: Any, y: Any, u_star: Any) -> Any:
        z = np.exp(s)
        k = viscosity(z, u_star)
        away = y[0] + 1j * y[1] - speed - shear * z
        return np.vstack([z * y[2] / k, z * y[3] / k, -z * f * away.imag, z * f * away.real])

    def ends(bottom: Any, lid: Any, u_star: Any) -> Any:
        carried = viscosity(np.array([top]), u_star)[0] * shear  # no turning is left up there
        return np.array([bottom[0], bottom[1], lid[2] - carried.real, lid[3] - carried.imag])

    # With u* held, the problem is linear and any guess leads to it; then u* is freed.
    s = np.linspace(np.log(z0), np.log(top), 120)
    rise = 1.0 - np.exp(-(np.exp(s) - z0) / 300.0)
    y = np.vstack([speed * rise, 0.0 * rise, 0.02 * (1.0 - rise), 0.02 * (1.0 - rise)])
    u_star = 0.04 * speed
    for _ in range(3):
        held = u_star
        rough = solve_bvp(
            lambda s, y, held=held: slopes(s, y, held),
            lambda a, b, held=held: ends(a, b, held),
            s,
            y,
            tol=1e-2,
            max_nodes=20000,
        )
        s, y = rough.x, rough.y
        u_star = float(np.sqrt(np.hypot(y[2, 0], y[3, 0])))
    solved = solve_bvp(
        lambda s, y, p: slopes(s, y, np.exp(p[0])),
        lambda a, b, p: np.append(
            ends(a, b, np.exp(p[0])), np.log(np.hypot(a[2], a[3])) - 2.0 * p[0]
        ),
        s,
        y,
        p=[np.log(u_star)],
        tol=1e-6,
        max_nodes=50000,
    )
    if not solved.success:
        raise RuntimeError(f"the synthetic boundary layer was not solved: {solved.message}")
    stress = complex(solved.y[2, 0], solved.y[3, 0])
    return Truth(
        f=f,
        geostrophic=complex(speed),
        shear=shear,
        u_star=float(np.exp(solved.p[0])),
        cross_isobar_angle=float(np.degrees(np.angle(stress))),
        roughness=z0,
        top=top,
        _solution=solved.sol,
        _mirrored=False,
        _turn=1.0 + 0.0j,
    )


def correlated_noise(
    random: np.random.Generator, z: Any, error: float, length: float, profiles: int = 1
) -> Any:
    """
    Draw wind noise, complex over (profile, level), of which each component has the given error.

    The correlation of two levels is exp(-distance / ``length``) [m], independent for length 0.
    """
    z = np.asarray(z, dtype=float)
    fresh = random.normal(size=(2, profiles, z.size)) * error
    noise = fresh[0] + 1j * fresh[1]
    if length > 0:
        kept = np.exp(-np.diff(z) / length)
        for level in range(1, z.size):
            share = kept[level - 1]
            noise[:, level] = share * noise[:, level - 1] + np.sqrt(1 - share**2) * noise[:, level]
    return noise
