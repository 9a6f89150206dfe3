"""
The levels of a profile as a rotor meets them: joined by straight lines in speed and in direction.

Kernels of :mod:`backveer.profiles.rotor`, over blocks of profiles; the direction is followed from
level to level the short way round, and no answer reaches across a step that cannot be followed.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Self

import numpy as np

from backveer.profiles import ekman
from backveer.profiles.direction import turn_between
from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats
from backveer.profiles.stack import Stack, wind_from_direction
from backveer.profiles.surface_layer import fit_line

#: A larger step of direction from level to level may as well have gone the other way round; ours.
LARGEST_STEP = 120.0  # degree
#: The steepest veer is told between levels at least this far apart, lest it be their noise; ours.
STEEPEST_DEPTH = 10.0  # m
#: A wind maximum counts as a nose when the wind falls by this much above it, some three times the
#: error of a ten-minute lidar mean; ours.
NOSE_FALLOFF = 0.5  # m s-1
#: From smoother than any sea to a city's centre (classes of Davenport and Wieringa, 0.0002 to 2 m,
#: from memory), with ln(z0) good to 1, a factor e.
ROUGHNESS = (1e-5, 2.0)  # m
LOOSEST_LOGARITHM = 1.0
EXTRAPOLATED_LEVELS = 4

ROUGHNESS_FEW = "fewer than three covered levels with wind inside the rotor"
ROUGHNESS_NO_SHEAR = "the speed does not grow with height"
ROUGHNESS_LOOSE = "the levels do not follow the logarithmic law closely enough"
ROUGHNESS_OUTSIDE = "the logarithm fits with no roughness that ground or sea has (0.00001 to 2 m)"


@dataclass(frozen=True, eq=False)
class Levels:
    """
    The valid levels of a block of profiles, shape (profile, level), at least two columns.

    Attributes
    ----------
    count
        How many levels each profile has; beyond, all is NaN.
    z, u, v, speed
        Height [m] and wind [m s-1].
    turn
        Direction, continuous from the lowest level, NaN in a calm. [degree]
    step
        Turn from each level to the next, NaN where either is calm. [degree]
    lowest, highest
        Heights of the ends, shape (profile,). [m]
    """

    count: Any
    z: Floats
    u: Floats
    v: Floats
    speed: Floats
    turn: Floats
    step: Floats
    lowest: Floats
    highest: Floats


def levels_of(stack: Stack) -> Levels:
    """Return the levels of a stack whose wind is usable."""
    directed = stack.usable("wind", "direction").astype(float)
    wind = stack.height, stack.eastward_wind, stack.northward_wind
    return _follow(*compact(stack.usable("wind"), *wind, directed))


def _follow(count: Any, z: Floats, u: Floats, v: Floats, directed: Floats) -> Levels:
    """Follow the direction from level to level; ``directed`` is 1 where there is one."""
    if z.shape[1] < 2:
        pad = ((0, 0), (0, 1))
        z, u, v, directed = (np.pad(x, pad, constant_values=np.nan) for x in (z, u, v, directed))
    with np.errstate(all="ignore"):
        speed = np.hypot(u, v)
        known = (directed == 1.0) & (speed > 0)
        east, north = np.where(known, u / speed, np.nan), np.where(known, v / speed, np.nan)
        step = turn_between(east[:, :-1], north[:, :-1], east[:, 1:], north[:, 1:])
    turn = np.zeros_like(z)
    np.add.accumulate(np.where(np.isnan(step), 0.0, step), axis=1, out=turn[:, 1:])
    last = np.maximum(count - 1, 0)[:, np.newaxis]
    return Levels(
        count=count,
        z=z,
        u=u,
        v=v,
        speed=speed,
        turn=np.where(known, turn, np.nan),
        step=step,
        lowest=z[:, 0],
        highest=np.take_along_axis(z, last, axis=1)[:, 0],
    )


def extended(
    levels: Levels, hub_height: float, tip: float, fit: ekman.EkmanFit
) -> tuple[Levels, Bools, Bools]:
    """
    Add levels of the fitted Ekman model from the highest level to the upper tip.

    Parameters
    ----------
    levels
        Of the same profiles as ``fit``.
    hub_height, tip
        [m]
    fit
        The fitted model.

    Returns
    -------
    levels : Levels
        The model's change of the wind with height, without a leap where the measurement ends.
    extended, wanted : array of bool, shape (profile,)
        Which profiles got levels, where the fit is well determined; which needed them: the highest
        level lies between hub and tip.
    """
    last = np.maximum(levels.count - 1, 0)[:, np.newaxis]
    u_top, v_top = (np.take_along_axis(x, last, axis=1) for x in (levels.u, levels.v))
    top = levels.highest[:, np.newaxis]
    with np.errstate(invalid="ignore"):
        wanted = (top < tip) & (top >= hub_height) & (levels.lowest[:, np.newaxis] <= hub_height)
    sound = wanted & (np.asarray(fit.verdict) == "well determined")[:, np.newaxis]
    share = np.arange(EXTRAPOLATED_LEVELS + 1) / EXTRAPOLATED_LEVELS
    z = np.where(sound, np.where(share == 1.0, tip, top + (tip - top) * share), np.nan)
    u, v = ekman.wind(fit, z)
    with np.errstate(invalid="ignore"):
        u, v = u_top + (u - u[:, :1]), v_top + (v - v[:, :1])
    got = (sound & np.isfinite(u) & np.isfinite(v)).all(axis=1)
    added = np.broadcast_to(got[:, np.newaxis], (len(got), EXTRAPOLATED_LEVELS))
    known = np.isfinite(levels.turn).astype(float)
    pairs = (levels.z, z[:, 1:]), (levels.u, u[:, 1:]), (levels.v, v[:, 1:]), (known, added * 1.0)
    keep = np.concatenate([np.isfinite(levels.z), added], axis=1)
    longer = compact(keep, *(np.concatenate(pair, axis=1) for pair in pairs))
    return _follow(*longer), got, wanted[:, 0]


@dataclass(frozen=True, eq=False)
class Edge:
    """One end of the covered part of a rotor: height [m], speed [m s-1] and turn [degree]."""

    z: Floats
    speed: Floats
    turn: Floats


@dataclass(frozen=True, eq=False)
class Between:
    """
    The wind at given heights, shape (profile, target), and the levels below and above each.

    ``speed`` and ``turn`` are NaN outside the levels and between levels that are not joined;
    ``turn`` also where the step between the levels cannot be followed.
    """

    z: Floats
    speed: Floats
    turn: Floats
    low: Levels
    high: Levels

    @classmethod
    def of(cls, levels: Levels, joined: Bools, targets: list[Any]) -> Self:
        """Interpolate at each target: a height [m], or one for each profile."""
        target = np.stack([np.broadcast_to(x, levels.count.shape) for x in targets], axis=1)
        below = np.empty(target.shape, dtype=np.intp)
        with np.errstate(all="ignore"):
            for place in range(target.shape[1]):
                below[:, place] = np.count_nonzero(levels.z <= target[:, place, np.newaxis], axis=1)
            below = np.clip(below - 1, 0, np.maximum(levels.count - 2, 0)[:, np.newaxis])
            low, high = _taken(levels, below), _taken(levels, below + 1)
            step = np.take_along_axis(levels.step, below, axis=1)
            whole = np.take_along_axis(joined, below, axis=1)
            share = (target - low.z) / (high.z - low.z)
            within = whole & (target > low.z) & (target < high.z)
            speed = np.where(within, low.speed + share * (high.speed - low.speed), np.nan)
            within &= np.abs(step) <= LARGEST_STEP
            turn = np.where(within, low.turn + share * step, np.nan)
            # A level's own height has its own wind, even where it is the only level.
            for level in (high, low):
                here = target == level.z
                speed = np.where(here, level.speed, speed)
                turn = np.where(here, level.turn, turn)
        return cls(target, speed, turn, low, high)

    def edge(self, place: int, upper: bool) -> Edge:
        """Return the target as an edge; between unjoined levels the upper or the lower of them."""
        z, speed, turn = self.z[:, place], self.speed[:, place], self.turn[:, place]
        level = self.high if upper else self.low
        lost = np.isnan(speed)
        return Edge(
            np.where(lost, level.z[:, place], z),
            np.where(lost, level.speed[:, place], speed),
            np.where(lost, level.turn[:, place], turn),
        )

    def direction(self, place: int) -> Floats:
        """Return the direction that the wind blows from at a target, in [0, 360). [degree]"""
        low, turn = self.low, self.turn[:, place]
        start = wind_from_direction(low.u[:, place], low.v[:, place])
        with np.errstate(invalid="ignore"):
            known = (start + (turn - low.turn[:, place])) % 360.0
        known = np.where(known >= 360.0, 0.0, known)  # -1e-15 % 360 rounds up to 360
        high = wind_from_direction(self.high.u[:, place], self.high.v[:, place])
        at_high = self.z[:, place] == self.high.z[:, place]
        direction = np.where(at_high, high, np.where(turn == low.turn[:, place], start, known))
        return np.where(np.isfinite(turn), direction, np.nan)


def _taken(levels: Levels, index: Any) -> Levels:
    fields = (levels.z, levels.u, levels.v, levels.speed, levels.turn)
    z, u, v, speed, turn = (np.take_along_axis(x, index, axis=1) for x in fields)
    none = np.empty((len(z), 0))
    return Levels(levels.count, z, u, v, speed, turn, none, levels.lowest, levels.highest)


def steepest_veer_rate(levels: Levels, joined: Bools, met: Bools) -> Floats:
    """
    Largest rate of veer or backing inside a rotor, with its sign.

    Parameters
    ----------
    levels
        Shape (profile, level).
    joined, met : array of bool, shape (profile, level - 1)
        Which neighbours may be joined by a straight line, and between which the rotor reaches.

    Returns
    -------
    rate : array, shape (profile,)
        From each level to the next that is at least ``STEEPEST_DEPTH`` higher. [degree m-1]
    """
    z, turn = levels.z, levels.turn
    rate = np.full(len(z), np.nan)
    with np.errstate(all="ignore"):
        followed = joined & (np.abs(levels.step) <= LARGEST_STEP)
        breaks = np.zeros(z.shape, dtype=np.intp)
        np.add.accumulate(~followed, axis=1, out=breaks[:, 1:])
        wanting = met.copy()
        for apart in range(1, z.shape[1]):
            wanting = wanting[:, : z.shape[1] - apart]
            depth = z[:, apart:] - z[:, :-apart]
            reached = wanting & (depth >= STEEPEST_DEPTH * (1.0 - 1e-9))
            unbroken = reached & (breaks[:, apart:] == breaks[:, :-apart])
            rates = np.where(unbroken, (turn[:, apart:] - turn[:, :-apart]) / depth, 0.0)
            pick = np.abs(rates).argmax(axis=1)[:, np.newaxis]
            best = np.take_along_axis(rates, pick, axis=1)[:, 0]
            better = unbroken.any(axis=1) & ~(np.abs(best) <= np.abs(rate))
            rate = np.where(better, best, rate)
            wanting = wanting & ~reached
            if not wanting.any():
                break
    return rate


def nose(z: Floats, speed: Floats, base: Edge, top: Edge, covered: Bools) -> dict[str, Floats]:
    """
    Find the wind maximum inside the rotor and the negative shear above it.

    Parameters
    ----------
    z, speed : array, shape (profile, level)
        [m], [m s-1]
    base, top
        The ends of the covered part.
    covered : array of bool, shape (profile,)
        Where enough of the rotor is covered.

    Returns
    -------
    dict
        ``nose_height``, ``nose_speed``, ``nose_falloff``, ``shear_above_nose``, shape (profile,);
        NaN where the wind falls by less than ``NOSE_FALLOFF`` from the maximum to the top.
    """
    with np.errstate(all="ignore"):
        inner = (z > base.z[:, np.newaxis]) & (z < top.z[:, np.newaxis])
        pick = np.where(inner, speed, -np.inf).argmax(axis=1)[:, np.newaxis]
        height, peak = (np.take_along_axis(x, pick, axis=1)[:, 0] for x in (z, speed))
        falloff = peak - top.speed
        there = covered & inner.any(axis=1) & (peak > base.speed) & (falloff >= NOSE_FALLOFF)
        found = {
            "nose_height": height,
            "nose_speed": peak,
            "nose_falloff": falloff,
            "shear_above_nose": -falloff / (top.z - height),
        }
    return {name: np.where(there, values, np.nan) for name, values in found.items()}


def profile_laws(z: Floats, speed: Floats, use: Bools) -> dict[str, Any]:
    r"""
    Fit the power law and the logarithmic law to the levels inside a rotor.

    Parameters
    ----------
    z, speed : array, shape (profile, level)
        [m], [m s-1]
    use : array of bool, shape (profile, level)
        The levels that take part; those without wind do not.

    Returns
    -------
    dict
        ``shear_exponent`` with ``shear_exponent_error``, the slope of ln M against ln z, and
        ``roughness_length`` with ``roughness_why``, where M against ln z crosses zero.

    Notes
    -----
    In air that is not neutral the crossing is an effective length, a number that reproduces the
    profile, and no property of the ground. It is withheld where ln(z0) is uncertain by more than 1.
    """
    with np.errstate(all="ignore"):
        use = use & (speed > 0) & (z > 0)
        ln_z, ln_speed = np.log(np.where(use, z, 1.0)), np.log(np.where(use, speed, 1.0))
        count, exponent, exponent_error, _, _ = fit_line(ln_z, ln_speed, use)
        _, slope, _, root, root_error = fit_line(ln_z, speed, use)
        enough = (count >= 3) & np.isfinite(exponent)
        length = np.exp(root)
        why = np.select(
            [
                ~enough,
                ~(slope > 0),
                ~(root_error <= LOOSEST_LOGARITHM),
                ~((length >= ROUGHNESS[0]) & (length <= ROUGHNESS[1])),
            ],
            [ROUGHNESS_FEW, ROUGHNESS_NO_SHEAR, ROUGHNESS_LOOSE, ROUGHNESS_OUTSIDE],
            default="",
        ).astype(object)
    return {
        "shear_exponent": np.where(enough, exponent, np.nan),
        "shear_exponent_error": np.where(enough, exponent_error, np.nan),
        "roughness_length": np.where(why == "", length, np.nan),
        "roughness_why": why,
    }
