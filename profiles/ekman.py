r"""
The Ekman family, fitted: constant viscosity, no slip or partial slip, barotropic or sheared.

The steady balance of Coriolis force, pressure gradient and friction with a constant eddy viscosity
K has, in the complex wind :math:`W = u + i v`, the solution (Ekman, V. W., 1905: Ark. Mat. Astr.
Fys. 2, no. 11; with slip at the ground Taylor, G. I., 1915: Phil. Trans. R. Soc. A 215, 1-26)

.. math::

    W(z) = G + S z + A\, e^{-(1 + i s) z / \delta}, \qquad \delta = \sqrt{2 K / |f|},
    \qquad s = \mathrm{sign}\, f

with the geostrophic wind G at the ground and its shear S with height (zero in the barotropic
members). With no slip A = -G; with partial slip A is free, and that the surface wind should lie
along the surface stress (Taylor's condition) is left as a check. For a given scale height the rest
is linear, so :math:`\delta` is found by variable projection (Golub, G. H., and V. Pereyra, 1973:
SIAM J. Numer. Anal. 10, 413-432), over the whole stack at once. A profile of the southern
hemisphere is fitted as its mirror image (v to -v), so that every answer mirrors exactly.

The member to name is chosen by AICc (Hurvich, C. M., and C.-L. Tsai, 1989: Biometrika 76, 297-307)
with the effective number of levels and a price on each parameter. Errors and intervals allow for
noise correlated along height (:mod:`backveer.profiles.ekman_errors`) and for the doubt about the
member (:mod:`backveer.profiles.ekman_intervals`). The publications are cited from memory.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from backveer.profiles.earth import Coriolis
from backveer.profiles.ekman_errors import t95
from backveer.profiles.ekman_intervals import averaged, tail_ends, weights_of
from backveer.profiles.ekman_members import Members, fit_members
from backveer.profiles.ekman_moments import profiles_of
from backveer.profiles.ekman_parameters import QUANTITIES
from backveer.profiles.ekman_search import MEMBERS
from backveer.profiles.ekman_verdict import Evidence, judge
from backveer.profiles.grid import compact
from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.stack import Stack

#: Levels above this are not used: the family holds for the boundary layer and a linear geostrophic
#: wind above it, and hardly a boundary layer is deeper (common practice, no source). [m]
TOP = 3000.0
BLOCK = 65536  # profiles times levels at a time: memory stays flat
MINIMUM_LEVELS = 5  # the smallest member has 3 parameters in 2 components; 5 leave 7 to spare


@dataclass(frozen=True, eq=False)
class EkmanFit(Labelled):
    """
    The chosen member of the family for each profile.

    ``X_error`` is one standard deviation; ``X_low`` and ``X_high`` bound the 95 % interval. Where
    the verdict is "not determined" every number of the chosen member is NaN; the candidates stay.
    """

    model: Words = variable("", "profile", "chosen member of the family")
    scale_height: Floats = variable("m", "profile", "scale height delta")
    scale_height_error: Floats = variable("m", "profile", "its standard error")
    scale_height_low: Floats = variable("m", "profile", "lower end of its 95 % interval")
    scale_height_high: Floats = variable("m", "profile", "upper end of its 95 % interval")
    eddy_viscosity: Floats = variable("m2 s-1", "profile", "eddy viscosity K")
    eddy_viscosity_error: Floats = variable("m2 s-1", "profile", "its standard error")
    eddy_viscosity_low: Floats = variable("m2 s-1", "profile", "lower end of its 95 % interval")
    eddy_viscosity_high: Floats = variable("m2 s-1", "profile", "upper end of its 95 % interval")
    geostrophic_eastward_wind: Floats = variable(
        "m s-1", "profile", "geostrophic wind at the ground toward east",
        "geostrophic_eastward_wind",
    )  # fmt: skip
    geostrophic_eastward_wind_error: Floats = variable("m s-1", "profile", "its standard error")
    geostrophic_eastward_wind_low: Floats = variable("m s-1", "profile", "lower end of its 95 %")
    geostrophic_eastward_wind_high: Floats = variable("m s-1", "profile", "upper end of its 95 %")
    geostrophic_northward_wind: Floats = variable(
        "m s-1", "profile", "geostrophic wind at the ground toward north",
        "geostrophic_northward_wind",
    )  # fmt: skip
    geostrophic_northward_wind_error: Floats = variable("m s-1", "profile", "its standard error")
    geostrophic_northward_wind_low: Floats = variable("m s-1", "profile", "lower end of its 95 %")
    geostrophic_northward_wind_high: Floats = variable("m s-1", "profile", "upper end of its 95 %")
    geostrophic_eastward_shear: Floats = variable(
        "s-1", "profile", "change with height of the geostrophic wind toward east"
    )
    geostrophic_eastward_shear_error: Floats = variable("s-1", "profile", "its standard error")
    geostrophic_eastward_shear_low: Floats = variable("s-1", "profile", "lower end of its 95 %")
    geostrophic_eastward_shear_high: Floats = variable("s-1", "profile", "upper end of its 95 %")
    geostrophic_northward_shear: Floats = variable(
        "s-1", "profile", "change with height of the geostrophic wind toward north"
    )
    geostrophic_northward_shear_error: Floats = variable("s-1", "profile", "its standard error")
    geostrophic_northward_shear_low: Floats = variable("s-1", "profile", "lower end of its 95 %")
    geostrophic_northward_shear_high: Floats = variable("s-1", "profile", "upper end of its 95 %")
    departure_eastward_at_ground: Floats = variable(
        "m s-1", "profile", "frictional departure A at the ground toward east"
    )
    departure_eastward_at_ground_error: Floats = variable("m s-1", "profile", "its standard error")
    departure_eastward_at_ground_low: Floats = variable("m s-1", "profile", "lower end of its 95 %")
    departure_eastward_at_ground_high: Floats = variable(
        "m s-1", "profile", "upper end of its 95 %"
    )
    departure_northward_at_ground: Floats = variable(
        "m s-1", "profile", "frictional departure A at the ground toward north"
    )
    departure_northward_at_ground_error: Floats = variable("m s-1", "profile", "its standard error")
    departure_northward_at_ground_low: Floats = variable(
        "m s-1", "profile", "lower end of its 95 %"
    )
    departure_northward_at_ground_high: Floats = variable(
        "m s-1", "profile", "upper end of its 95 %"
    )
    cross_isobar_angle: Floats = variable(
        "degree",
        "profile",
        "surface stress from the geostrophic wind, toward low pressure positive",
    )
    cross_isobar_angle_error: Floats = variable("degree", "profile", "its standard error")
    cross_isobar_angle_low: Floats = variable("degree", "profile", "lower end of its 95 %")
    cross_isobar_angle_high: Floats = variable("degree", "profile", "upper end of its 95 %")
    friction_velocity: Floats = variable(
        "m s-1", "profile", "square root of the kinematic surface stress K |dW/dz| at the ground"
    )
    friction_velocity_error: Floats = variable("m s-1", "profile", "its standard error")
    friction_velocity_low: Floats = variable("m s-1", "profile", "lower end of its 95 %")
    friction_velocity_high: Floats = variable("m s-1", "profile", "upper end of its 95 %")
    rotation: Floats = variable("1", "profile", "sign of f: 1 in the north, -1 in the south")
    rms: Floats = variable(
        "m s-1", "profile", "root of the mean square of the vector residual over the levels"
    )
    effective_levels: Floats = variable("1", "profile", "effective number of independent levels")
    noise_length: Floats = variable("m", "profile", "correlation length of the noise, weighed")
    top: Floats = variable("m", "profile", "highest level used, above ground")
    verdict: Words = variable("", "profile", "well, weakly or not determined")
    why: Words = variable("", "profile", "why the verdict is less than well determined")
    candidate_model: Words = variable("", "profile candidate", "member, empty where not fitted")
    candidate_scale_height: Floats = variable("m", "profile candidate", "scale height")
    candidate_eddy_viscosity: Floats = variable("m2 s-1", "profile candidate", "eddy viscosity")
    candidate_geostrophic_eastward_wind: Floats = variable(
        "m s-1", "profile candidate", "geostrophic wind at the ground toward east"
    )
    candidate_geostrophic_northward_wind: Floats = variable(
        "m s-1", "profile candidate", "geostrophic wind at the ground toward north"
    )
    candidate_geostrophic_eastward_shear: Floats = variable(
        "s-1", "profile candidate", "its change with height toward east"
    )
    candidate_geostrophic_northward_shear: Floats = variable(
        "s-1", "profile candidate", "its change with height toward north"
    )
    candidate_cross_isobar_angle: Floats = variable(
        "degree", "profile candidate", "surface stress from the geostrophic wind"
    )
    candidate_friction_velocity: Floats = variable("m s-1", "profile candidate", "u*")
    candidate_rms: Floats = variable("m s-1", "profile candidate", "as rms")
    candidate_aicc: Floats = variable("1", "profile candidate", "corrected Akaike criterion")


def fit(
    stack: Stack,
    coriolis: Coriolis,
    error: Floats | None = None,
    top: float = TOP,
    noise_length: float | None = None,
) -> EkmanFit:
    """
    Fit every member of the family to every profile and choose.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    coriolis
        Their Coriolis parameter; profiles to which it does not apply are declined.
    error : array, shape (profile,), optional
        Standard error of a wind component, the least that the noise is taken to be. [m s-1]
    top
        Levels above this height are not used. [m]
    noise_length
        Correlation length of the noise where it is known; 0 makes ordinary least squares. [m]

    Returns
    -------
    EkmanFit
        ``rms`` counts both components: sqrt(mean |W - fit|^2).

    Raises
    ------
    ValueError
        If the noise length is negative or not finite, or the top is not above the ground.
    """
    if noise_length is not None and not 0.0 <= noise_length < np.inf:
        raise ValueError(f"the noise length is {noise_length:g} m. Give 0 m or more.")
    if not top > 0.0:
        raise ValueError(f"the top is {top:g} m. Give a height above the ground.")
    count = stack.profile_count
    floor = np.zeros(count)
    if error is not None:  # where it is not known nothing is known of the noise
        given = np.broadcast_to(np.asarray(error, dtype=float), (count,))
        floor = np.where(given > 0, given, 0.0)
    size = max(1, min(1024, BLOCK // max(stack.height.shape[1], 1)))
    parts = [
        _fit_block(stack, coriolis, floor, slice(start, start + size), top, noise_length)
        for start in range(0, max(count, 1), size)
    ]
    if len(parts) == 1:
        return parts[0]
    return EkmanFit(
        **{
            field.name: np.concatenate([getattr(part, field.name) for part in parts])
            for field in fields(EkmanFit)
        }
    )


def wind(fitted: EkmanFit, z: Floats) -> tuple[Floats, Floats]:
    """
    Wind of the chosen member at given heights.

    Parameters
    ----------
    fitted
        The fit.
    z : array, shape (profile, level) or (level,)
        Height above ground. [m]

    Returns
    -------
    u, v : array, shape (profile, level)
        NaN where the fit is not determined. [m s-1]
    """
    z = np.asarray(z, dtype=float)
    u, v = geostrophic_wind(fitted, z)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore", under="ignore"):
        phase = z / fitted.scale_height[:, np.newaxis]
        size = np.exp(-phase)
        c, s = size * np.cos(phase), -size * np.sin(phase)
    s = s * fitted.rotation[:, np.newaxis]
    a = fitted.departure_eastward_at_ground[:, np.newaxis]
    b = fitted.departure_northward_at_ground[:, np.newaxis]
    return u + a * c - b * s, v + b * c + a * s


def geostrophic_wind(fitted: EkmanFit, z: Floats) -> tuple[Floats, Floats]:
    """Geostrophic wind of the chosen member at given heights, as :func:`wind`. [m s-1]."""
    z = np.asarray(z, dtype=float)
    u = fitted.geostrophic_eastward_wind[:, np.newaxis]
    v = fitted.geostrophic_northward_wind[:, np.newaxis]
    return (
        u + fitted.geostrophic_eastward_shear[:, np.newaxis] * z,
        v + fitted.geostrophic_northward_shear[:, np.newaxis] * z,
    )


def _fit_block(
    stack: Stack,
    coriolis: Coriolis,
    floor: Floats,
    rows: slice,
    top: float,
    known_length: float | None,
) -> EkmanFit:
    f = coriolis.coriolis_parameter[rows]
    rotation = np.where(f < 0, -1.0, 1.0)
    with np.errstate(invalid="ignore"):
        usable = stack.usable("wind")[rows] & (stack.height[rows] <= top)
    # The southern hemisphere is fitted as its mirror image in the north.
    mirrored = stack.northward_wind[rows] * rotation[:, np.newaxis]
    count, z, u, v = compact(usable, stack.height[rows], stack.eastward_wind[rows], mirrored)
    reach = np.take_along_axis(z, np.maximum(count - 1, 0)[:, np.newaxis], -1)[:, 0]
    with np.errstate(invalid="ignore"):
        increasing = ~(np.diff(z, axis=-1) <= 0).any(axis=-1) & (z[:, 0] >= 0)
    enough = (count >= MINIMUM_LEVELS) & (np.nan_to_num(reach) > 0)
    fitted = coriolis.applies[rows] & enough & increasing
    lowest = z[:, 0]
    with np.errstate(over="ignore", invalid="ignore"):
        strongest = np.max(np.where(np.isfinite(u), np.hypot(u, v), 0.0), axis=-1)
    # A profile that is not fitted passes through without levels, and is refused at the end.
    count = np.where(fitted, count, 0)
    data = profiles_of(z, u, v, count, np.where(fitted, reach, 1.0))
    all_members = fit_members(data, np.abs(f), floor[rows], known_length)
    answers, values, errors = all_members.answers, all_members.values, all_members.errors
    may = all_members.sound & all_members.inside
    aicc = np.where(may, all_members.aicc, np.inf)
    choice = np.argmin(aicc, axis=-1)
    with np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore"):
        values = _wrapped(values, choice)
        trust = weights_of(np.where(may, all_members.doubt, np.inf).T)
        off = averaged(values, errors, trust, choice)
    chosen = {
        name: _take(np.stack([answer[name] for answer in answers], -1), choice)
        for name in answers[0]
    }
    verdict, why = judge(
        Evidence(
            declined=np.where(coriolis.applies[rows], "", coriolis.why[rows]),
            levels=np.count_nonzero(usable, axis=-1),
            enough=enough,
            fitted=fitted,
            strongest=strongest,
            top=top,
            sound=all_members.sound,
            inside=all_members.inside,
            aicc=aicc,
            aicc_anywhere=np.where(all_members.sound, all_members.aicc, np.inf).min(axis=-1),
            null=all_members.without_friction,
            unturned=all_members.unturned,
            wrong_sense=all_members.wrong_sense & fitted,
            lowest=lowest,
            reach=reach,
            noise=np.maximum(floor[rows], _take(all_members.noise, choice)),
            floor=floor[rows],
            rms=_take(all_members.rms, choice),
            chosen=chosen,
            errors=dict(zip(QUANTITIES, off, strict=True)),
            own=dict(zip(QUANTITIES, _of(choice, errors), strict=True)),
        )
    )
    told = np.flatnonzero(verdict != "not determined")
    low, high = np.full(off.shape, np.nan), np.full(off.shape, np.nan)
    with np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore"):
        low[:, told], high[:, told] = tail_ends(
            values[..., told], errors[..., told], trust[:, told], _of(choice, values)[:, told],
            all_members.t[:, told] / t95(np.inf),
        )  # fmt: skip
    intervals = dict(zip(QUANTITIES, zip(off, low, high, strict=True), strict=True))
    return _answer(
        all_members, chosen, intervals, choice, verdict, why, rotation, reach, fitted, np.abs(f)
    )  # fmt: skip


def _of(choice: Any, stacked: Any) -> Any:
    """Take the chosen member from the first axis of (member, quantity, profile)."""
    return np.take_along_axis(stacked, choice[np.newaxis, np.newaxis], axis=0)[0]


def _wrapped(values: Any, choice: Any) -> Any:
    """Take the angles of all members within half a turn of the chosen one's."""
    place = QUANTITIES.index("cross_isobar_angle")
    chosen = _of(choice, values)[place]
    values[:, place] = chosen + (values[:, place] - chosen + 180.0) % 360.0 - 180.0
    return values


def _take(stacked: Any, choice: Any) -> Any:
    return np.take_along_axis(stacked, choice[..., np.newaxis], axis=-1)[..., 0]


def _answer(
    members: Members,
    chosen: Any,
    intervals: Any,
    choice: Any,
    verdict: Any,
    why: Any,
    rotation: Any,
    reach: Any,
    fitted: Any,
    f: Any,
) -> EkmanFit:
    """Turn the southern hemisphere back and leave out what is not determined."""
    told = verdict != "not determined"
    values: dict[str, Any] = {}

    def put(name: str, value: Any, quantity: str, flip: Any = None) -> None:
        error, low, high = intervals[quantity]
        if flip is not None:
            value = flip * value
            low, high = np.where(flip < 0, -high, low), np.where(flip < 0, -low, high)
        give(name, value, error, low, high)

    def give(name: str, value: Any, error: Any, low: Any, high: Any) -> None:
        values[name] = np.where(told, value, np.nan)
        values[f"{name}_error"] = np.where(told, error, np.nan)
        values[f"{name}_low"] = np.where(told, low, np.nan)
        values[f"{name}_high"] = np.where(told, high, np.nan)

    g, shear, amplitude = chosen["geostrophic"], chosen["shear"], chosen["amplitude"]
    with np.errstate(over="ignore", invalid="ignore"):
        for name in ("scale_height", "friction_velocity"):
            error, low, high = intervals[f"log_{name}"]
            give(name, chosen[name], chosen[name] * error, np.exp(low), np.exp(high))
            if name == "scale_height":
                # K = |f| delta^2 / 2
                viscosity = chosen["eddy_viscosity"]
                ends = (0.5 * f * np.exp(2.0 * end) for end in (low, high))
                give("eddy_viscosity", viscosity, 2.0 * viscosity * error, *ends)
    put("geostrophic_eastward_wind", g.real, "eastward")
    put("geostrophic_northward_wind", g.imag, "northward", flip=rotation)
    put("geostrophic_eastward_shear", shear.real, "shear_eastward")
    put("geostrophic_northward_shear", shear.imag, "shear_northward", flip=rotation)
    put("departure_eastward_at_ground", amplitude.real, "departure_eastward")
    put("departure_northward_at_ground", amplitude.imag, "departure_northward", flip=rotation)
    put("cross_isobar_angle", chosen["cross_isobar_angle"], "cross_isobar_angle")
    names = np.array([member.name for member in MEMBERS], dtype=object)

    def each(value: Callable[[Any], Any]) -> Any:
        stacked = np.stack([value(answer) for answer in members.answers], axis=-1)
        return np.where(members.sound, stacked, np.nan)

    flip = rotation[:, np.newaxis]
    return EkmanFit(
        **values,
        model=np.where(told, names[choice], "").astype(object),
        rotation=rotation,
        rms=np.where(told, _take(members.rms, choice), np.nan),
        effective_levels=np.where(fitted, members.levels, np.nan),
        noise_length=np.where(fitted, members.length, np.nan),
        top=np.where(fitted, reach, np.nan),
        verdict=verdict,
        why=why,
        candidate_model=np.where(members.sound, names, "").astype(object),
        candidate_scale_height=each(lambda a: a["scale_height"]),
        candidate_eddy_viscosity=each(lambda a: a["eddy_viscosity"]),
        candidate_geostrophic_eastward_wind=each(lambda a: a["geostrophic"].real),
        candidate_geostrophic_northward_wind=flip * each(lambda a: a["geostrophic"].imag),
        candidate_geostrophic_eastward_shear=each(lambda a: a["shear"].real),
        candidate_geostrophic_northward_shear=flip * each(lambda a: a["shear"].imag),
        candidate_cross_isobar_angle=each(lambda a: a["cross_isobar_angle"]),
        candidate_friction_velocity=each(lambda a: a["friction_velocity"]),
        candidate_rms=np.where(members.sound, members.rms, np.nan),
        candidate_aicc=np.where(members.sound & members.inside, members.aicc, np.nan),
    )
