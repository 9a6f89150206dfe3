r"""
How far from geostrophic balance: evidence for the geostrophic wind, departure, friction velocity.

The geostrophic wind is not measured. What speaks for it is laid side by side, each at the ground
and with its error: the wind that is *given*, the one that the Ekman *fit* needs, and the wind of
the *free air* brought down by its own shear (:mod:`backveer.profiles.free_air`). The departure,
wind minus geostrophic wind, is measured against the best of them; its integral over the boundary
layer is the surface stress (:mod:`backveer.profiles.momentum_integral`).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np

from backveer.profiles.balance import departure
from backveer.profiles.boundary_layer import BoundaryLayer
from backveer.profiles.earth import Coriolis
from backveer.profiles.ekman import EkmanFit
from backveer.profiles.free_air import MIN_LEVELS, TOO_FEW, TOO_LOW, TOO_THIN, FreeAir, free_air
from backveer.profiles.grid import at_height
from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.momentum_integral import departure_integral, friction_velocity
from backveer.profiles.stack import Stack
from backveer.profiles.wind_error import wind_error

FREE_AIR_DEPTH = 1500.0  # of the layer whose shear is brought down; choice [m]
DEFAULT_DEPTH = (
    1500.0  # of a boundary layer of which nothing is known; choice, on the safe side [m]
)
CLEARANCE = 1.25  # base of the free air over depth: the last of the spiral dies out; choice
HIGHEST_LID = 3000.0  # an inversion above this does not end the boundary layer; choice [m]
DEPTH_DOUBT = 0.2  # relative error of a depth by bulk Richardson number; choice, of the trade
NOISE_LENGTH = 100.0  # of wind errors along height where the fit tells none; choice [m]
FIRM = 2.0  # a vector is told when it is at least so many times its error
LONGEST_TAIL = 0.3  # share of the integral that may come from the fit above the profile; choice
TAIL_DOUBT = 0.5  # relative error of that share: real viscosity is not constant; choice
STILL_TURNING = (
    0.2  # departure at the top over the geostrophic wind, beyond which: not steady; choice
)
HIGHEST_START = (
    0.2  # lowest wind over depth, at most: below lies the surface layer and more; choice
)

NO_GIVEN_ERROR = "the error of the geostrophic wind that was given is not known"
NO_EVIDENCE = "neither a given value, nor the fit, nor the free air tells the geostrophic wind"
NO_DEPTH = "the depth of the boundary layer is not known"
ENDS_BELOW = "the profile ends below the top of the boundary layer"
STARTS_HIGH = "the lowest wind is too high above the ground for so shallow a boundary layer"
NO_LEVELS = "fewer than three levels with wind lie within the boundary layer"
UNSTEADY = (
    "the wind at the top of the boundary layer is far from geostrophic: the layer is not steady, "
    "or not as deep as it seems"
)
WITHIN_ERROR = "the integral of the departure is smaller than twice its error"
LIGHT = "the geostrophic wind is smaller than twice its error, so it has no direction"


@dataclass(frozen=True, eq=False)
class Geostrophic(Labelled):
    """
    Evidence for the geostrophic wind, the departure from it, and what the departure tells.

    The evidence stands at the ground (``evidence`` axis: given, fit, free air; a slot without
    a word was not asked for). ``reference_height`` says so in m.
    """

    evidence_from: Words = variable("", "profile evidence", "where the evidence comes from")
    evidence_eastward: Floats = variable(
        "m s-1", "profile evidence", "geostrophic wind at the ground, toward the east"
    )
    evidence_northward: Floats = variable(
        "m s-1", "profile evidence", "geostrophic wind at the ground, toward the north"
    )
    evidence_error: Floats = variable(
        "m s-1", "profile evidence", "standard error of one component of the evidence"
    )
    evidence_why: Words = variable(
        "", "profile evidence", "why the evidence, or its error, is not determined, or not well"
    )
    chosen: Words = variable("", "profile", "the evidence that the departure is measured against")
    departure_along: Floats = variable(
        "m s-1", "profile level", "wind minus geostrophic wind, along the geostrophic wind"
    )
    departure_across: Floats = variable(
        "m s-1",
        "profile level",
        "wind minus geostrophic wind, across it, positive toward low pressure",
    )
    departure_error: Floats = variable(
        "m s-1", "profile", "standard error of one component of the departure near the ground"
    )
    departure_why: Words = variable("", "profile", "why there is no departure")
    depth: Floats = variable("m", "profile", "depth of the layer with friction, as used here")
    depth_from: Words = variable(
        "", "profile", "fit, bulk Richardson number, or default: where the depth comes from"
    )
    friction_velocity: Floats = variable(
        "m s-1", "profile", "friction velocity, from the momentum integral"
    )
    friction_velocity_error: Floats = variable(
        "m s-1", "profile", "standard error of the friction velocity"
    )
    friction_velocity_why: Words = variable(
        "", "profile", "why the friction velocity is not determined"
    )
    reference_height: float = 0.0


class _Chosen(NamedTuple):
    """Geostrophic wind a + b z that the departure is measured against, complex, shape (profile)."""

    at_ground: Any
    shear: Any
    ground_variance: Floats
    shear_variance: Floats
    covariance: Floats
    top: Floats


def geostrophic(
    stack: Stack,
    coriolis: Coriolis,
    fit: EkmanFit,
    boundary: BoundaryLayer,
    given: tuple[Any, Any] | None = None,
    error: Any = None,
    given_error: Any = np.nan,
) -> Geostrophic:
    """
    Lay the evidence for the geostrophic wind side by side and measure the departure from it.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    coriolis, fit, boundary
        Their Coriolis parameter, Ekman fit and boundary layer.
    given
        Geostrophic wind at the ground, eastward and northward: numbers or arrays (profile).
        [m s-1]
    error
        Standard error of a wind component, (profile); estimated when left out. [m s-1]
    given_error
        Standard error of a component of ``given``, where known; otherwise the errors told here
        leave it out. [m s-1]

    Returns
    -------
    Geostrophic

    Notes
    -----
    The departure is measured against the first of these that there is: the wind that is given, the
    fit where it is well determined, the free air, the fit where it is weakly determined. It changes
    with height as the sheared fit or the free air says; a given wind takes its change from a well
    determined fit, otherwise from the free air, otherwise it is the same at all heights. No
    departure is told above the levels that this rests on.

    The layer with friction reaches to pi times the scale height of a well determined fit, otherwise
    to the depth by bulk Richardson number. The free air begins a quarter above it, and above
    the lowest elevated inversion: beneath that lies the layer of the day, in which the wind may
    still swing at night. It does not begin below ``DEFAULT_DEPTH`` where the ground is under an
    inversion and no lid shows how far the day had mixed, or where no depth is known; then the
    friction velocity is withheld.

    At the top of the layer the stress is taken to have died out: that of a spiral has not quite,
    and its friction velocity comes out 2 % high, but solved layers with varying viscosity agree
    within 1 % where the geostrophic wind is known. Where a profile ends lower, the integral goes on
    to the top along a well determined fit. Half of what the fit has above the last wind counts as
    error. Errors of the fit and of the wind are taken as independent, which makes the error
    of the friction velocity rather too large.
    """
    error = wind_error(stack) if error is None else np.broadcast_to(error, stack.profile_count)
    usable = stack.usable("wind")
    z, u, v = (
        np.where(usable, x, np.nan)
        for x in (stack.height, stack.eastward_wind, stack.northward_wind)
    )
    applies = np.asarray(coriolis.applies, dtype=bool)
    well = applies & (fit.verdict == "well determined")
    weak = applies & (fit.verdict == "weakly determined")
    depth, depth_error, depth_from = _depth(fit, boundary, well)
    base = _base(boundary, depth, depth_from)
    line = free_air(z, u, v, base, base + FREE_AIR_DEPTH, error)
    evidence = _evidence(coriolis, fit, line, well | weak, given, given_error)
    chosen, pick = _choose(evidence, fit, line, well, weak, base)
    pick = np.where(applies, pick, "").astype(object)

    with np.errstate(invalid="ignore", over="ignore", under="ignore"):
        ground_error = np.sqrt(chosen.ground_variance)
        at_levels = chosen.at_ground[:, np.newaxis] + chosen.shear[:, np.newaxis] * z
        along, across = departure(u + 1j * v, at_levels, coriolis.coriolis_parameter[:, np.newaxis])
        firm = np.abs(chosen.at_ground) >= FIRM * ground_error
        told = (applies & firm)[:, np.newaxis] & (z <= chosen.top[:, np.newaxis])
        departure_error = np.where(
            applies & firm, np.sqrt(chosen.ground_variance + error**2), np.nan
        )
    why = np.where(pick == "", NO_EVIDENCE, np.where(firm, "", LIGHT)).astype(object)
    why = np.where(applies, why, coriolis.why)
    u_star, u_star_error, u_star_why = _stress(
        z, u + 1j * v, at_levels, chosen, coriolis, fit, well, depth, depth_error, depth_from, error
    )
    return Geostrophic(
        **evidence,
        chosen=pick,
        departure_along=np.where(told, along, np.nan),
        departure_across=np.where(told, across, np.nan),
        departure_error=departure_error,
        departure_why=why,
        depth=np.where(applies, depth, np.nan),
        depth_from=np.where(applies, depth_from, ""),
        friction_velocity=u_star,
        friction_velocity_error=u_star_error,
        friction_velocity_why=np.where(why != "", why, u_star_why),
    )


def _depth(fit: EkmanFit, boundary: BoundaryLayer, well: Bools) -> tuple[Floats, Floats, Words]:
    """Depth of the layer with friction, its error, and where it comes from."""
    richardson = boundary.bulk_richardson_depth
    known = np.isfinite(richardson)
    depth = np.where(well, np.pi * fit.scale_height, np.where(known, richardson, DEFAULT_DEPTH))
    error = np.where(
        well, np.pi * fit.scale_height_error, np.where(known, DEPTH_DOUBT * richardson, np.nan)
    )
    words = np.where(well, "fit", np.where(known, "bulk Richardson number", "default"))
    return depth, error, words.astype(object)


def _base(boundary: BoundaryLayer, depth: Floats, depth_from: Words) -> Floats:
    """Where the free air begins."""
    lids = np.where(
        (boundary.inversion_kind == "elevated") & (boundary.inversion_top <= HIGHEST_LID),
        boundary.inversion_top,
        np.inf,
    )
    lid = lids.min(axis=-1, initial=np.inf)
    night = (boundary.inversion_kind == "surface-based").any(axis=-1)
    least = np.where(np.isfinite(lid), lid, np.where(night, DEFAULT_DEPTH, 0.0))
    base = np.maximum(CLEARANCE * depth, least)
    return np.where(depth_from == "default", np.maximum(DEFAULT_DEPTH, least), base)


def _evidence(
    coriolis: Coriolis,
    fit: EkmanFit,
    line: FreeAir,
    fitted: Bools,
    given: tuple[Any, Any] | None,
    given_error: Any,
) -> dict[str, Any]:
    """Lay given, fit and free air side by side: fields of the answer, shape (profile, 3)."""
    count = len(fitted)
    nothing = np.full(count, np.nan)
    u, v = (nothing, nothing) if given is None else (_each(x, count) for x in given)
    there = np.isfinite(u) & np.isfinite(v)
    applies = np.asarray(coriolis.applies, dtype=bool)
    free = applies & line.determined
    short = np.where(line.count == 0, TOO_LOW, np.where(line.count < MIN_LEVELS, TOO_FEW, TOO_THIN))
    doubt = np.where(there, _each(given_error, count), np.nan)
    fit_error = np.sqrt(
        0.5 * (fit.geostrophic_eastward_wind_error**2 + fit.geostrophic_northward_wind_error**2)
    )
    blank = np.full(count, "", dtype=object)
    whys = (
        np.where(there & ~np.isfinite(doubt), NO_GIVEN_ERROR, blank),
        np.where(applies, fit.why, coriolis.why),
        np.where(applies, np.where(free, blank, short), coriolis.why),
    )
    columns = {
        "evidence_from": (np.where(there, "given", blank), blank + "fit", blank + "free air"),
        "evidence_eastward": (
            np.where(there, u, np.nan),
            np.where(fitted, fit.geostrophic_eastward_wind, np.nan),
            np.where(free, line.eastward, np.nan),
        ),
        "evidence_northward": (
            np.where(there, v, np.nan),
            np.where(fitted, fit.geostrophic_northward_wind, np.nan),
            np.where(free, line.northward, np.nan),
        ),
        "evidence_error": (
            doubt,
            np.where(fitted, fit_error, np.nan),
            np.where(free, np.sqrt(line.ground_variance), np.nan),
        ),
        "evidence_why": whys,
    }
    return {name: np.stack(column, axis=-1) for name, column in columns.items()}


def _choose(
    evidence: dict[str, Any],
    fit: EkmanFit,
    line: FreeAir,
    well: Bools,
    weak: Bools,
    base: Floats,
) -> tuple[_Chosen, Words]:
    """Choose what the departure is measured against, and how that changes with height."""
    u, v, doubt = (evidence[f"evidence_{name}"] for name in ("eastward", "northward", "error"))
    there = np.isfinite(u)
    free = there[:, 2]
    with np.errstate(invalid="ignore", over="ignore"):
        firm = free & (np.hypot(u[:, 2], v[:, 2]) >= FIRM * doubt[:, 2])
    place = np.select([there[:, 0], well, firm, weak, free], [0, 1, 2, 1, 2], default=-1)
    names = np.array(["given", "fit", "free air", ""], dtype=object)
    row = np.arange(len(place))
    fitted = (place == 1) | ((place == 0) & well)
    from_line = (place == 2) | ((place == 0) & ~well & free)

    def of(by_fit: Any, by_line: Any, otherwise: Any) -> Any:
        return np.where(fitted, by_fit, np.where(from_line, by_line, otherwise))

    variance = np.where(place == 0, np.nan_to_num(doubt[:, 0]) ** 2, doubt[row, place] ** 2)
    fit_shear_variance = 0.5 * (
        fit.geostrophic_eastward_shear_error**2 + fit.geostrophic_northward_shear_error**2
    )
    chosen = _Chosen(
        at_ground=np.where(place < 0, np.nan, u[row, place] + 1j * v[row, place]),
        shear=of(fit.geostrophic_eastward_shear, line.eastward_shear, 0.0)
        + 1j * of(fit.geostrophic_northward_shear, line.northward_shear, 0.0),
        ground_variance=np.where(place < 0, np.nan, variance),
        shear_variance=of(np.nan_to_num(fit_shear_variance), line.shear_variance, 0.0),
        covariance=np.where(place == 2, line.covariance, 0.0),
        top=of(fit.top, line.top, base + FREE_AIR_DEPTH),
    )
    return chosen, names[place]


def _stress(
    z: Floats,
    wind: Any,
    at_levels: Any,
    chosen: _Chosen,
    coriolis: Coriolis,
    fit: EkmanFit,
    well: Bools,
    depth: Floats,
    depth_error: Floats,
    depth_from: Words,
    error: Floats,
) -> tuple[Floats, Floats, Words]:
    """Friction velocity from the departure integrated over the layer, its error, and why not."""
    f = coriolis.coriolis_parameter
    length = np.where(np.isfinite(fit.noise_length), fit.noise_length, NOISE_LENGTH)
    part = departure_integral(z, wind, at_levels, chosen.at_ground, depth, error, length)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        highest = part.highest
        turn = (1.0 + 1j * np.sign(f)) / fit.scale_height
        amplitude = fit.departure_eastward_at_ground + 1j * fit.departure_northward_at_ground
        beyond = amplitude / turn * np.exp(-turn * highest)  # the fit's departure, to infinity
        tail = np.where(well, beyond - amplitude / turn * np.exp(-turn * depth), 0.0)
        value = part.value + tail
        at_top = np.abs(at_height(z, wind - at_levels, highest[:, np.newaxis])[:, 0])
        noise = np.sqrt(2.0 * (chosen.ground_variance + error**2))  # of the vector
        beyond_noise = np.sqrt(np.maximum(at_top**2 - noise**2, 0.0))
        slipped = np.where(well, TAIL_DOUBT * np.abs(beyond), beyond_noise * depth_error)
        of_evidence = (
            highest**2 * chosen.ground_variance
            + highest**4 / 4.0 * chosen.shear_variance
            + highest**3 * chosen.covariance
        )
        doubt = np.sqrt(part.error**2 + slipped**2 + np.maximum(of_evidence, 0.0))
        u_star, u_star_error = friction_velocity(f, value, doubt)
        levels = np.count_nonzero(np.isfinite(wind) & (z <= depth[:, np.newaxis]), axis=-1)
        speed = np.abs(chosen.at_ground + chosen.shear * highest)
        reasons = (
            (depth_from == "default", NO_DEPTH),
            (levels < 3, NO_LEVELS),
            (part.lowest > HIGHEST_START * depth, STARTS_HIGH),
            ((highest < depth) & ~(np.abs(tail) <= LONGEST_TAIL * np.abs(value)), ENDS_BELOW),
            ((highest < depth) & ~well, ENDS_BELOW),
            (
                (highest >= depth) & (at_top > STILL_TURNING * speed) & (at_top > FIRM * noise),
                UNSTEADY,
            ),
            (~(np.abs(value) >= FIRM * doubt), WITHIN_ERROR),
        )
    why = np.select([met for met, _ in reasons], [word for _, word in reasons], default="")
    good = why == ""
    return np.where(good, u_star, np.nan), np.where(good, u_star_error, np.nan), why.astype(object)


def _each(x: Any, count: int) -> Floats:
    """One number for each profile."""
    return np.broadcast_to(np.asarray(x, dtype=float), (count,))
