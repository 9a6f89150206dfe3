r"""
What makes the strongest low-level shear: a jet, a front, friction, or nothing that can be told.

The rules are ours, stated here and nowhere published as a set; each rests on the published analysis
that it names. The first that holds is the cause; the evidence is told with it.

1. *nocturnal jet on a stable layer*: the wind has a jet that meets its criterion, its nose is below
   1000 m, the layer of strongest shear lies under the nose, the air there is stable, and the sun is
   not up (where time and place are known; Blackadar 1957, Bull. Amer. Meteor. Soc. 38, 283-290).
2. *frontal inversion*: the layer of strongest shear overlaps an elevated inversion, and across it
   the wind turns by 10 degrees or more and by more than twice its error, as a frontal zone in
   thermal-wind balance must. A subsidence inversion can do the same.
3. *friction*: an Ekman spiral is well determined and the layer of strongest shear lies below the
   height where the spiral first meets the geostrophic direction (pi scale heights).

The Richardson number is that of the same layer, from the differences between its top and base:

.. math:: Ri = \frac{g}{\theta} \frac{\Delta\theta \, \Delta z}{(\Delta u)^2 + (\Delta v)^2}

the gradient Richardson number at the resolution of the layer: derivatives between levels a few
metres apart would be those of the instrument's noise.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles import air
from backveer.profiles.boundary_layer import BoundaryLayer, bulk_richardson_number
from backveer.profiles.daylight import solar_elevation
from backveer.profiles.ekman import EkmanFit
from backveer.profiles.grid import at_height
from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.low_level_shear import LowLevelShear
from backveer.profiles.stack import Stack

JET = "nocturnal jet on a stable layer"
FRONT = "frontal inversion"
FRICTION = "friction (Ekman turning)"
UNKNOWN = "not determined"
#: Below this a sheared stable layer breaks into turbulence: Miles, J. W., 1961, and Howard, L. N.,
#: 1961, J. Fluid Mech. 10, 496-512 (seen quoted, checks B5).
CRITICAL_RICHARDSON = 0.25
LOW_JET = 1000.0  # m: the nose of a nocturnal jet lies lower; common practice, no source
LEAST_TURN = 10.0  # degree: less is no front's; our own choice


@dataclass(frozen=True, eq=False)
class ShearCause(Labelled):
    """What makes the strongest shear of each profile, and whether its layer holds."""

    base: Floats = variable("m", "profile", "base of the layer of strongest shear")
    top: Floats = variable("m", "profile", "top of the layer of strongest shear")
    cause: Words = variable("", "profile", "the cause, or 'not determined'")
    evidence: Words = variable("", "profile", "what speaks for it, or why it is not determined")
    turning: Floats = variable(
        "degree", "profile", "of the wind across the layer, veering positive"
    )
    turning_error: Floats = variable("degree", "profile", "its standard error")
    potential_temperature_difference: Floats = variable(
        "K", "profile", "potential temperature, top minus base"
    )
    richardson_number: Floats = variable("1", "profile", "gradient Richardson number of the layer")
    richardson_error: Floats = variable(
        "1", "profile", "its standard error, from that of the wind alone"
    )
    unstable: Bools = variable("1", "profile", "the Richardson number is below 0.25")
    stability: Words = variable(
        "", "profile", "what the Richardson number says, empty where there is none"
    )
    richardson_why: Words = variable("", "profile", "why there is no Richardson number")


def shear_cause(
    stack: Stack, shear: LowLevelShear, layer: BoundaryLayer, fit: EkmanFit, error: Floats
) -> ShearCause:
    """
    Tell what makes the strongest shear of each profile.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    shear, layer, fit
        Their low-level shear, boundary layer and Ekman fit.
    error
        Standard error of a wind component, shape (profile,). [m s-1]

    Returns
    -------
    ShearCause
        Of the layer ``window`` of the shear, or of its strongest pair of levels where the levels
        span less than that. ``cause`` is "not determined" where no rule holds, with the reason in
        ``evidence``. Potential temperature is dry; without pressure it is taken as the temperature
        plus the dry-adiabatic lapse times height.
    """
    window = np.isfinite(shear.window_shear)
    base = np.where(window, shear.window_base, shear.maximum_base)
    top = np.where(window, shear.window_top, shear.maximum_top)
    size = np.where(window, shear.window_shear, shear.maximum_shear)
    spread = np.where(window, shear.window_error, shear.maximum_error)
    low, high = _between(stack.height, _wind(stack), base, top)
    theta = _potential_temperature(stack)
    cold, warm = _between(stack.height, theta, base, top)
    sun = solar_elevation(stack.time, stack.latitude, stack.longitude)

    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        known = np.isfinite(size) & (size >= spread)
        # Clockwise is negative in the complex plane and positive on the compass.
        turn = np.degrees(np.angle(low * np.conj(high)))
        # Two directions, each with the error of the wind over its speed.
        turn_error = np.degrees(error * np.hypot(1 / np.abs(low), 1 / np.abs(high)))
        turn = np.where(np.isfinite(turn_error) & (turn_error < 60.0), turn, np.nan)
        difference = warm - cold
        jet = (
            layer.jet_meets_criterion
            & (layer.jet_height <= LOW_JET)
            & (top <= layer.jet_height * (1 + 1e-9))
        )
        day = sun > 0
        overlap = (
            (layer.inversion_kind == "elevated")
            & (layer.inversion_base < top[:, np.newaxis])
            & (layer.inversion_top > base[:, np.newaxis])
        ).any(axis=-1)
        turns = (np.abs(turn) >= LEAST_TURN) & (np.abs(turn) > 2 * turn_error)
        spiral = (fit.verdict == "well determined") & (top <= np.pi * fit.scale_height)
        stable = difference > 0
        change = high - low
        number = bulk_richardson_number(cold, difference, top - base, change.real, change.imag)
        # dRi / Ri = 2 d|dV| / |dV|, and the error of a component of the difference is root two e.
        number_error = np.abs(number) * 2 * np.sqrt(2.0) * error / np.abs(change)
        number = np.where(known & np.isfinite(number), number, np.nan)

    measured = np.isfinite(difference)
    nocturnal = known & jet & stable & ~day
    frontal = known & ~nocturnal & overlap & turns
    friction = known & ~nocturnal & ~frontal & spiral
    choices = [nocturnal, frontal, friction]
    cause = np.select(choices, [JET, FRONT, FRICTION], UNKNOWN).astype(object)
    evidence = np.select(
        [
            *choices,
            ~known,
            jet & ~measured,
            jet & ~stable,
            jet & day,
            overlap,
        ],
        [
            "the layer is stable and lies under the nose of a jet",
            "the layer lies in an elevated inversion, and the wind turns across it",
            "the layer lies inside a well determined Ekman spiral",
            "no shear is larger than its error",
            "there is a jet above the layer, but no temperature to say whether it is stable",
            "there is a jet above the layer, but the layer is not stable",
            "there is a jet above the stable layer, but by day",
            "the layer lies in an elevated inversion, but the wind hardly turns across it",
        ],
        "there is no low jet, no elevated inversion and no well determined spiral to lay it to",
    ).astype(object)
    evidence[nocturnal & ~np.isfinite(sun)] += "; whether it is night is not known"
    return ShearCause(
        base=base,
        top=top,
        cause=cause,
        evidence=evidence,
        turning=turn,
        turning_error=np.where(np.isfinite(turn), turn_error, np.nan),
        potential_temperature_difference=difference,
        richardson_number=number,
        richardson_error=np.where(np.isfinite(number), number_error, np.nan),
        unstable=np.where(np.isfinite(number), number, np.inf) < CRITICAL_RICHARDSON,
        stability=_stability(number, number_error),
        richardson_why=np.select(
            [np.isfinite(number), ~known, ~measured],
            [
                "",
                "no shear is larger than its error",
                "there is no temperature at both ends of the layer",
            ],
            "the wind does not differ across the layer",
        ).astype(object),
    )


def _stability(number: Floats, error: Floats) -> Words:
    with np.errstate(invalid="ignore"):
        near = np.abs(number - CRITICAL_RICHARDSON) < error
        return np.select(
            [~np.isfinite(number), number < 0, near, number < CRITICAL_RICHARDSON],
            ["", "statically unstable", "near the critical value", "dynamically unstable"],
            "dynamically stable",
        ).astype(object)


def _wind(stack: Stack) -> Any:
    return np.where(stack.usable("wind"), stack.eastward_wind + 1j * stack.northward_wind, np.nan)


def _potential_temperature(stack: Stack) -> Floats:
    """Dry potential temperature, or what differs from it by a factor near one (Stull 1988)."""
    usable = stack.usable("temperature")
    with_pressure = usable & stack.usable("pressure")
    pressed = (np.count_nonzero(with_pressure, axis=1) >= 2)[:, np.newaxis]
    plain = np.where(
        usable, stack.air_temperature + air.DRY_ADIABATIC_LAPSE_RATE * stack.height, np.nan
    )
    if not pressed.any():
        return plain
    pressure = np.where(with_pressure, stack.air_pressure, np.nan)
    return np.where(pressed, air.potential_temperature(stack.air_temperature, pressure), plain)


def _between(z: Floats, x: Any, base: Floats, top: Floats) -> tuple[Any, Any]:
    ends = at_height(z, x, np.stack([base, top], axis=-1))
    return ends[:, 0], ends[:, 1]
