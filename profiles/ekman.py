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

The members are compared by AICc (Hurvich, C. M., and C.-L. Tsai, 1989: Biometrika 76, 297-307) with
the effective number of levels. Errors are those of :mod:`backveer.profiles.ekman_errors`. The
publications are cited from memory.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from backveer.profiles.earth import Coriolis
from backveer.profiles.ekman_errors import LENGTHS, effective_levels, noise_weights, t95
from backveer.profiles.ekman_moments import Profiles
from backveer.profiles.ekman_parameters import describe, standard_errors, widen
from backveer.profiles.ekman_search import (
    MEMBERS,
    TRIALS,
    ceilings,
    first_guess,
    refine,
)
from backveer.profiles.ekman_verdict import Evidence, judge
from backveer.profiles.grid import compact, ordered_sum
from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.stack import Stack

#: Levels above this are not used: the family holds for the boundary layer and a linear geostrophic
#: wind above it, and hardly a boundary layer is deeper (common practice, no source). [m]
TOP = 3000.0
#: What a parameter costs beyond AICc. Without it one profile in eight with independent noise is
#: given a shear or a slip that it does not have, and its intervals miss; with it one in thirty
#: (measured over 1500 synthetic profiles).
PRICE = 2.0
BLOCK = 1024  # profiles at a time: the working arrays stay in the processor's cache
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
    """
    count = stack.profile_count
    floor = np.zeros(count) if error is None else np.broadcast_to(error, (count,))
    parts = [
        _fit_block(stack, coriolis, floor, slice(start, start + BLOCK), top, noise_length)
        for start in range(0, max(count, 1), BLOCK)
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
    fitted = coriolis.applies[rows] & (count >= MINIMUM_LEVELS) & (np.nan_to_num(reach) > 0)
    lowest = z[:, 0]
    # A profile that is not fitted passes through without levels, and is refused at the end.
    count = np.where(fitted, count, 0)
    data = Profiles(
        z=np.where(np.isfinite(z), z, 0.0),
        w=np.where(np.isfinite(u), u, 0.0) + 1j * np.where(np.isfinite(v), v, 0.0),
        count=count,
        unit=np.where(fitted, reach, 1.0),
    )
    with np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore"):
        guess, edge = first_guess(data)
        weights, effective = noise_weights(data, guess[:, [1, 3]], ~edge[:, 3])
        if known_length is not None:
            weights = np.where(np.arange(LENGTHS.size) == 0, 1.0, np.zeros_like(weights))
            effective = effective_levels(data, np.full(weights.shape, float(known_length)))
        length = ordered_sum(weights * LENGTHS) if known_length is None else known_length + 0 * f
        levels = ordered_sum(weights * effective)
        delta, projections, without_friction = refine(data, length[:, np.newaxis], guess)
        answers = [
            describe(member, delta[:, m], projections[m].coefficients, data.unit, np.abs(f))
            for m, member in enumerate(MEMBERS)
        ]
        rms = np.stack([_rms(data, answer) for answer in answers], axis=-1)
        sound = np.stack([p.sound[:, 0] for p in projections], axis=-1) & fitted[:, np.newaxis]
        roof = np.minimum(ceilings(data.unit), TRIALS[-1])
        inside = (delta > TRIALS[0] * 1.001) & (delta < roof * 0.999)
        aicc = np.stack(
            [
                _aicc(p.residual[:, 0], data.count, levels, member.parameters)
                for p, member in zip(projections, MEMBERS, strict=True)
            ],
            axis=-1,
        )
        aicc = np.where(sound & inside, aicc, np.inf)
        null = np.minimum(
            _aicc(without_friction[0], data.count, levels, 2),
            _aicc(without_friction[1], data.count, levels, 4),
        )
        choice = np.argmin(aicc, axis=-1)
        errors = standard_errors(
            data, choice, delta, projections, weights, floor[rows], known_length
        )
        widen(errors, answers, choice, aicc)
    chosen = {
        name: _take(np.stack([answer[name] for answer in answers], -1), choice)
        for name in answers[0]
    }
    verdict, why = judge(
        Evidence(
            declined=np.where(coriolis.applies[rows], "", coriolis.why[rows]),
            levels=np.where(coriolis.applies[rows], np.count_nonzero(usable, axis=-1), 0),
            fitted=fitted,
            top=top,
            sound=sound,
            inside=inside,
            aicc=aicc,
            null=null,
            lowest=lowest,
            reach=reach,
            noise=np.maximum(floor[rows], errors["noise"]),
            rms=_take(rms, choice),
            delta=delta,
            geostrophic=np.stack([answer["geostrophic"] for answer in answers], -1),
            chosen=chosen,
            errors=errors,
        )
    )
    return _answer(
        answers, chosen, errors, choice, sound, aicc, rms, verdict, why, rotation, levels, length,
        reach, fitted, t95(data.count + levels - _PARAMETERS[choice]),
    )  # fmt: skip


_PARAMETERS = np.array([member.parameters for member in MEMBERS], dtype=float)


def _rms(data: Profiles, answer: Any) -> Any:
    z = data.z
    x = z / answer["scale_height"][:, np.newaxis]
    e = np.exp(-x) * (np.cos(x) - 1j * np.sin(x))
    fitted = answer["geostrophic"][:, np.newaxis] + answer["shear"][:, np.newaxis] * z
    fitted = fitted + answer["amplitude"][:, np.newaxis] * e
    apart = np.where(np.arange(z.shape[1]) < data.count[:, np.newaxis], data.w - fitted, 0.0)
    return np.sqrt(ordered_sum(apart.real**2 + apart.imag**2) / np.maximum(data.count, 1))


def _aicc(residual: Any, count: Any, levels: Any, parameters: int) -> Any:
    """AICc of a member: the scale of the noise is a parameter too, and both components count."""
    k = parameters + 1
    numbers = 2.0 * count
    # Where noise of long correlation leaves few effective levels, a parameter costs its most.
    spare = np.maximum(2.0 * levels - k - 1.0, 1.0)
    scatter = np.maximum(residual / np.maximum(numbers, 1.0), 1e-12)
    value = numbers * np.log(scatter) + (2.0 + PRICE) * k + 2.0 * k * (k + 1.0) / spare
    return np.where(numbers > k + 1, value, np.inf)


def _take(stacked: Any, choice: Any) -> Any:
    return np.take_along_axis(stacked, choice[:, np.newaxis], axis=-1)[:, 0]


def _answer(
    answers: Any,
    chosen: Any,
    errors: Any,
    choice: Any,
    sound: Any,
    aicc: Any,
    rms: Any,
    verdict: Any,
    why: Any,
    rotation: Any,
    levels: Any,
    length: Any,
    reach: Any,
    fitted: Any,
    t: Any,
) -> EkmanFit:
    """Turn the southern hemisphere back and leave out what is not determined."""
    told = verdict != "not determined"
    values: dict[str, Any] = {}

    def put(name: str, value: Any, error: Any, logarithmic: bool = False, flip: Any = 1.0) -> None:
        with np.errstate(over="ignore", invalid="ignore"):
            ends = (
                (value * np.exp(-t * error), value * np.exp(t * error))
                if logarithmic
                else (flip * value - t * error, flip * value + t * error)
            )
            size = value * error if logarithmic else error
        values[name] = np.where(told, flip * value, np.nan)
        values[f"{name}_error"] = np.where(told, size, np.nan)
        values[f"{name}_low"] = np.where(told, ends[0], np.nan)
        values[f"{name}_high"] = np.where(told, ends[1], np.nan)

    g, shear, amplitude = chosen["geostrophic"], chosen["shear"], chosen["amplitude"]
    put("scale_height", chosen["scale_height"], errors["scale_height"], logarithmic=True)
    put("eddy_viscosity", chosen["eddy_viscosity"], 2.0 * errors["scale_height"], logarithmic=True)
    put("geostrophic_eastward_wind", g.real, errors["eastward"])
    put("geostrophic_northward_wind", g.imag, errors["northward"], flip=rotation)
    put("geostrophic_eastward_shear", shear.real, errors["shear_eastward"])
    put("geostrophic_northward_shear", shear.imag, errors["shear_northward"], flip=rotation)
    put("departure_eastward_at_ground", amplitude.real, errors["departure_eastward"])
    put(
        "departure_northward_at_ground", amplitude.imag, errors["departure_northward"],
        flip=rotation,
    )  # fmt: skip
    put("cross_isobar_angle", chosen["cross_isobar_angle"], errors["cross_isobar_angle"])
    put(
        "friction_velocity", chosen["friction_velocity"], errors["friction_velocity"],
        logarithmic=True,
    )  # fmt: skip
    names = np.array([member.name for member in MEMBERS], dtype=object)

    def each(value: Callable[[Any], Any]) -> Any:
        return np.where(sound, np.stack([value(answer) for answer in answers], axis=-1), np.nan)

    flip = rotation[:, np.newaxis]
    return EkmanFit(
        **values,
        model=np.where(told, names[choice], "").astype(object),
        rotation=rotation,
        rms=np.where(told, _take(rms, choice), np.nan),
        effective_levels=np.where(fitted, levels, np.nan),
        noise_length=np.where(fitted, length, np.nan),
        top=np.where(fitted, reach, np.nan),
        verdict=verdict,
        why=why,
        candidate_model=np.where(sound, names, "").astype(object),
        candidate_scale_height=each(lambda a: a["scale_height"]),
        candidate_eddy_viscosity=each(lambda a: a["eddy_viscosity"]),
        candidate_geostrophic_eastward_wind=each(lambda a: a["geostrophic"].real),
        candidate_geostrophic_northward_wind=flip * each(lambda a: a["geostrophic"].imag),
        candidate_geostrophic_eastward_shear=each(lambda a: a["shear"].real),
        candidate_geostrophic_northward_shear=flip * each(lambda a: a["shear"].imag),
        candidate_cross_isobar_angle=each(lambda a: a["cross_isobar_angle"]),
        candidate_friction_velocity=each(lambda a: a["friction_velocity"]),
        candidate_rms=np.where(sound, rms, np.nan),
        candidate_aicc=np.where(sound & np.isfinite(aicc), aicc, np.nan),
    )
