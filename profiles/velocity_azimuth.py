r"""
From line-of-sight scans at a fixed elevation to profiles of the wind (velocity-azimuth display).

An instrument that looks round the horizon at one elevation sees a uniform wind as a sine of the
azimuth. Least squares over the beams of one range gate give the wind there:

.. math:: v_r = u \sin\varphi \cos\varepsilon + v \cos\varphi \cos\varepsilon + w \sin\varepsilon

with the radial velocity :math:`v_r` positive away from the instrument, the azimuth
:math:`\varphi` clockwise from north and the elevation :math:`\varepsilon` above the horizon.
Browning, K. A., and R. Wexler, 1968: The determination of kinematic properties of a wind field
using Doppler radar. J. Appl. Meteor., 7, 105-113.

Where the wind is not uniform over the circle, its horizontal divergence stands in w; a wind that
changes linearly over the circle leaves u and v as they are.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.stack import Stack

#: Three unknowns, and as many beams again to show how well they fit; ours.
FEWEST_AZIMUTHS = 6
#: A wider gap leaves an arc in which a sine is guessed, not seen; ours.
LARGEST_GAP = 90.0  # degree
#: Turbulence leaves some 1 m/s in a single scan by day; more is no uniform wind; ours.
LARGEST_RESIDUAL = 1.5  # m s-1
#: Beams of one scan point this much alike; a vertical beam among slanted ones does not; ours.
SAME_ELEVATION = 1.0  # degree
SAME_AZIMUTH = 0.5  # degree
#: Nearer to the horizon w, nearer to the zenith u and v are lost; ours.
ELEVATIONS = (1.0, 89.0)  # degree
_BLOCK = 1_000_000  # radial velocities at a time

NO_DATA = "no beam has a usable radial velocity"
FEW = "too few azimuths have a usable radial velocity"
GAP = "the azimuths leave too wide a gap"
NOT_FIXED = "the elevation is not fixed over the scan"
ELEVATION = "the elevation is too near to the horizon or to the zenith"
RESIDUAL = "the radial velocities are no sine of the azimuth: the wind was not uniform, or noise"


@dataclass(frozen=True, eq=False)
class VelocityAzimuth(Labelled):
    """The wind from each scan and range gate; NaN with the reason in ``why``."""

    height: Floats = variable("m", "profile level", "height above the instrument", "height")
    eastward_wind: Floats = variable(
        "m s-1", "profile level", "wind toward the east", "eastward_wind"
    )
    northward_wind: Floats = variable(
        "m s-1", "profile level", "wind toward the north", "northward_wind"
    )
    upward_air_velocity: Floats = variable(
        "m s-1",
        "profile level",
        "vertical wind, positive up, with the divergence over the circle in it",
        "upward_air_velocity",
    )
    eastward_wind_error: Floats = variable("m s-1", "profile level", "standard error")
    northward_wind_error: Floats = variable("m s-1", "profile level", "standard error")
    upward_air_velocity_error: Floats = variable("m s-1", "profile level", "standard error")
    residual: Floats = variable(
        "m s-1", "profile level", "standard deviation of the radial velocities about the fit"
    )
    used: Any = variable("1", "profile level", "beams that the fit rests on")
    azimuths: Any = variable("1", "profile level", "different azimuths among them")
    gap: Floats = variable("degree", "profile level", "widest gap between their azimuths")
    availability: Floats = variable("1", "profile level", "used beams over beams of the scan")
    why: Words = variable("", "profile level", "why there is no wind")
    fewest_azimuths: int = FEWEST_AZIMUTHS
    largest_gap: float = LARGEST_GAP
    largest_residual: float = LARGEST_RESIDUAL

    def to_stack(self, height: float = 0.0, **place_and_time: Any) -> Stack:
        """
        Return the profiles as a stack.

        Parameters
        ----------
        height
            Of the instrument above the ground. [m]
        **place_and_time
            ``time``, ``latitude``, ... as :meth:`backveer.profiles.stack.Stack.of` takes them.
            ``wind_error`` is the median over the gates of a profile where it is not given.
        """
        error = np.sqrt(0.5 * (self.eastward_wind_error**2 + self.northward_wind_error**2))
        place_and_time.setdefault("wind_error", _median(error))
        return Stack.of(
            height=self.height + height,
            eastward_wind=self.eastward_wind,
            northward_wind=self.northward_wind,
            upward_air_velocity=self.upward_air_velocity,
            availability=self.availability,
            **place_and_time,
        )


def velocity_azimuth(
    azimuth: Any,
    elevation: Any,
    distance: Any,
    radial_velocity: Any,
    usable: Any = True,
    fewest_azimuths: int = FEWEST_AZIMUTHS,
    largest_gap: float = LARGEST_GAP,
    largest_residual: float = LARGEST_RESIDUAL,
) -> VelocityAzimuth:
    r"""
    Fit the wind to the radial velocities of each scan and range gate.

    Parameters
    ----------
    azimuth : array, shape (scan, beam) or (beam,)
        Clockwise from north; NaN for a beam that a scan does not have. [degree]
    elevation : array, shape (scan, beam), (beam,) or a number
        Above the horizon. [degree]
    distance : array, shape (scan, gate) or (gate,)
        From the instrument to the middle of the gate, along the beam. [m]
    radial_velocity : array, shape (scan, beam, gate)
        Positive away from the instrument. [m s-1]
    usable : array of bool, shape (scan, beam, gate), optional
        False where the quality of the signal speaks against it.
    fewest_azimuths, largest_gap, largest_residual
        A fit is withheld with fewer azimuths, a wider gap [degree] or a larger residual [m s-1].

    Returns
    -------
    VelocityAzimuth
        Arrays over (scan, gate).

    Raises
    ------
    ValueError
        For fewer than four azimuths asked for, or shapes that do not fit.

    Notes
    -----
    With n beams and the residual sum of squares S the errors are those of the diagonal of
    :math:`\frac{S}{n - 3} (X^T X)^{-1}`, X holding the factors of u, v and w. They take the
    deviations of the beams as independent of each other. Gusts larger than the distance between
    beams are not, and then the errors are too small.

    Examples
    --------
    >>> azimuth = np.arange(0.0, 360.0, 30.0)
    >>> seen = 8.0 * np.sin(np.radians(azimuth)) * np.cos(np.radians(60.0))
    >>> told = velocity_azimuth(azimuth, 60.0, [100.0], seen[np.newaxis, :, np.newaxis])
    >>> told.height.round(2).tolist(), told.eastward_wind.round(6).tolist()
    ([[86.6]], [[8.0]])
    """
    radial = np.asarray(radial_velocity, dtype=float)
    if fewest_azimuths < 4:
        raise ValueError(
            f"a fit of three unknowns with {fewest_azimuths} azimuths has no error. Ask for 4 or "
            f"more."
        )
    if radial.ndim != 3:
        raise ValueError(
            f"radial velocities have shape {radial.shape}. Give them over (scan, beam, gate)."
        )
    scans, beams, gates = radial.shape
    try:
        azimuth = np.broadcast_to(np.asarray(azimuth, dtype=float), (scans, beams))
        elevation = np.broadcast_to(np.asarray(elevation, dtype=float), (scans, beams))
        distance = np.broadcast_to(np.asarray(distance, dtype=float), (scans, gates))
        usable = np.broadcast_to(np.asarray(usable, dtype=bool), radial.shape)
    except ValueError:
        raise ValueError(
            f"azimuth, elevation, distance or usable do not fit {scans} scans of {beams} beams "
            f"and {gates} gates. Give them over (scan, beam), (scan, gate) and all three."
        ) from None
    limits = (fewest_azimuths, largest_gap, largest_residual)
    step = max(1, _BLOCK // max(beams * gates, 1))
    blocks = [
        _fit(
            azimuth[start : start + step],
            elevation[start : start + step],
            distance[start : start + step],
            radial[start : start + step],
            usable[start : start + step],
            *limits,
        )
        for start in range(0, max(scans, 1), step)
    ]
    whole = {name: np.concatenate([block[name] for block in blocks]) for name in blocks[0]}
    return VelocityAzimuth(
        **whole,
        fewest_azimuths=fewest_azimuths,
        largest_gap=largest_gap,
        largest_residual=largest_residual,
    )


def _fit(
    azimuth: Floats,
    elevation: Floats,
    distance: Floats,
    radial: Floats,
    usable: Bools,
    fewest: int,
    widest: float,
    largest: float,
) -> dict[str, Any]:
    scans, beams, gates = radial.shape
    pointed = np.isfinite(azimuth) & np.isfinite(elevation)
    good = usable & np.isfinite(radial) & pointed[:, :, np.newaxis]
    # A hostile number must not overflow in a square.
    good &= np.abs(np.where(good, radial, 0.0)) < 1e6
    phi = np.radians(np.where(pointed, azimuth, 0.0))
    epsilon = np.radians(np.where(pointed, elevation, 0.0))
    factors = np.stack(
        [np.sin(phi) * np.cos(epsilon), np.cos(phi) * np.cos(epsilon), np.sin(epsilon)], axis=-1
    )
    matrix, right = np.zeros((scans, gates, 3, 3)), np.zeros((scans, gates, 3))
    count, angle = np.zeros((scans, gates), dtype=int), np.zeros((scans, gates))
    # Beam after beam, so that a beam that is missing adds an exact zero.
    for beam in range(beams):
        use = good[:, beam]
        x = np.where(use[..., np.newaxis], factors[:, beam, np.newaxis, :], 0.0)
        matrix += x[..., :, np.newaxis] * x[..., np.newaxis, :]
        right += x * np.where(use, radial[:, beam], 0.0)[..., np.newaxis]
        count += use
        angle += np.where(use, epsilon[:, beam, np.newaxis], 0.0)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.degrees(angle / np.where(count > 0, count, np.nan))
    seen = np.where(good, elevation[:, :, np.newaxis], np.nan)
    apart = np.fmax.reduce(seen, axis=1, initial=-np.inf) - np.fmin.reduce(
        seen, axis=1, initial=np.inf
    )
    azimuths, gap = _azimuths(azimuth, good)
    few = azimuths < fewest
    with np.errstate(invalid="ignore"):
        extreme = ~((mean >= ELEVATIONS[0]) & (mean <= ELEVATIONS[1]))
        wide = gap > widest * (1.0 + 1e-9)
        wobbles = apart > SAME_ELEVATION
    sound = ~(few | extreme | wide | wobbles)
    inverse = np.linalg.inv(np.where(sound[..., np.newaxis, np.newaxis], matrix, np.eye(3)))
    wind = inverse[..., 0] * right[..., :1]
    for column in (1, 2):
        wind = wind + inverse[..., column] * right[..., column, np.newaxis]
    squares = np.zeros((scans, gates))
    for beam in range(beams):
        x = factors[:, beam, np.newaxis, :]
        fitted = x[..., 0] * wind[..., 0] + x[..., 1] * wind[..., 1] + x[..., 2] * wind[..., 2]
        off = np.where(good[:, beam], radial[:, beam], fitted) - fitted
        squares += off**2
    residual = np.sqrt(squares / np.maximum(count - 3, 1))
    loose = sound & (residual > largest)
    told = sound & ~loose
    why = np.select(
        [count == 0, wobbles, extreme, few, wide, loose],
        [NO_DATA, NOT_FIXED, ELEVATION, FEW, GAP, RESIDUAL],
        default="",
    ).astype(object)
    found: dict[str, Any] = {
        "height": _heights(distance, elevation, pointed),
        "residual": np.where(sound, residual, np.nan),
        "used": count,
        "azimuths": azimuths,
        "gap": gap,
        "availability": count / np.maximum(np.count_nonzero(pointed, axis=1), 1)[:, np.newaxis],
        "why": why,
    }
    for place, name in enumerate(("eastward_wind", "northward_wind", "upward_air_velocity")):
        found[name] = np.where(told, wind[..., place], np.nan)
        error = residual * np.sqrt(np.maximum(inverse[..., place, place], 0.0))
        found[f"{name}_error"] = np.where(told, error, np.nan)
    return found


def _heights(distance: Floats, elevation: Floats, pointed: Bools) -> Floats:
    """Height of each gate above the instrument, at the mean elevation of the scan's beams."""
    total = np.add.accumulate(np.where(pointed, elevation, 0.0), axis=1)
    count = np.count_nonzero(pointed, axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = (total[:, -1] if total.shape[1] else 0.0) / np.where(count > 0, count, np.nan)
    return distance * np.sin(np.radians(mean))[:, np.newaxis]


def _azimuths(azimuth: Floats, good: Bools) -> tuple[Any, Floats]:
    """Count the different azimuths of each scan and gate, and the widest gap between them."""
    if not good.shape[1]:
        shape = (good.shape[0], good.shape[2])
        return np.zeros(shape, dtype=int), np.full(shape, 360.0)
    with np.errstate(invalid="ignore"):
        turned = (azimuth % 360.0)[:, :, np.newaxis]
    order = np.sort(np.where(good, turned, np.nan), axis=1)  # NaN sorts last
    steps = np.diff(order, axis=1)
    first = order[:, 0]
    last = np.fmax.reduce(order, axis=1)
    round_the_north = first + 360.0 - last
    with np.errstate(invalid="ignore"):
        different = np.count_nonzero(steps > SAME_AZIMUTH, axis=1)
        gap = np.fmax(np.fmax.reduce(steps, axis=1, initial=0.0), round_the_north)
        # 359.9 and 0.0 are one azimuth.
        count = different + (round_the_north > SAME_AZIMUTH)
    none = ~good.any(axis=1)
    return np.where(none, 0, np.maximum(count, 1)), np.where(none, 360.0, gap)


def _median(x: Floats) -> Floats:
    """Median over the gates of each scan, NaN where there is none."""
    count = np.count_nonzero(np.isfinite(x), axis=1)
    if not x.shape[1]:
        return np.full(len(x), np.nan)
    order = np.sort(x, axis=1)
    low, high = np.maximum(count - 1, 0) // 2, count // 2
    ends = [
        np.take_along_axis(order, np.minimum(at, x.shape[1] - 1)[:, np.newaxis], axis=1)[:, 0]
        for at in (low, high)
    ]
    return np.where(count > 0, 0.5 * (ends[0] + ends[1]), np.nan)
