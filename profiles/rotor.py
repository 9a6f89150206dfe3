r"""
What a wind turbine meets: speed, veer, shear and energy over the disc that its rotor sweeps.

Between levels speed and direction are each a straight line, the direction followed the short way
round. A rotor in a steady veer then meets just that veer, and levels of equal speed stay at that
speed between them; straight lines in the components would put a lull there, cos(half the turn) of
the speed, that nobody measured. Below the lowest and above the highest level nothing is said: the
answers are those of the covered part of the rotor, and below ``coverage_limit`` there are none.

Veer is positive when the wind veers with height (clockwise), negative when it backs.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles import ekman
from backveer.profiles import rotor_reasons as reasons
from backveer.profiles.direction import direction_error
from backveer.profiles.grid import at_height, ordered_sum
from backveer.profiles.hub_air import air_density
from backveer.profiles.labels import Bools, Floats, Labelled, Words, labels, variable
from backveer.profiles.rotor_levels import (
    LARGEST_STEP,
    Between,
    Levels,
    extended,
    levels_of,
    nose,
    profile_laws,
    steepest_veer_rate,
)
from backveer.profiles.rotor_reasons import pack, spell
from backveer.profiles.stack import Stack
from backveer.profiles.surface_layer import exponent_between
from backveer.profiles.swept_area import disc_mean, segment_fractions

#: IEC 61400-12-1:2017 wants levels beyond two thirds of the radius on both sides of the hub (from
#: memory); 0.781 of the area lies between.
COVERAGE_LIMIT = 0.78
#: Neighbours further apart than this share of the diameter are not joined by a straight line: at
#: least about three levels over the rotor, as IEC 61400-12-1:2017 wants (from memory).
GAP_LIMIT = 0.5
STANDARD_DENSITY = 1.225  # kg m-3, IEC 61400-12-1; ISO 2533:1975 at sea level
#: No turbine built is larger (common knowledge, no source); beyond, heights are rather in feet.
LARGEST_HUB, LARGEST_ROTOR = 300.0, 400.0  # m
_BLOCK = 2048  # profiles at a time: the work arrays of a block stay in the processor's cache


@dataclass(frozen=True)
class Turbine:
    """
    A turbine: its name, the height of the hub above ground [m] and the rotor's diameter [m].

    Raises
    ------
    ValueError
        For a size that is not positive or that no turbine has; the message names the turbine.
    """

    name: str
    hub_height: float
    rotor_diameter: float

    def __post_init__(self) -> None:
        for what, value, largest in (
            ("hub height", self.hub_height, LARGEST_HUB),
            ("rotor diameter", self.rotor_diameter, LARGEST_ROTOR),
        ):
            if not 0.0 < value < float("inf"):
                raise ValueError(
                    f"turbine {self.name!r}: {what} must be a positive number of metres, "
                    f"not {value}. Correct it."
                )
            if value > largest:
                raise ValueError(
                    f"turbine {self.name!r}: a {what} of {value:g} m is larger than any built. "
                    f"Give metres: {value:g} ft are {value * 0.3048:.1f} m."
                )


@dataclass(frozen=True, eq=False)
class Rotor(Labelled):
    """What each turbine meets in each profile; NaN with the reason in ``why``."""

    turbine: Words = variable("", "turbine", "name of the turbine")
    hub_height: Floats = variable("m", "turbine", "height of the hub above ground")
    rotor_diameter: Floats = variable("m", "turbine", "diameter of the rotor")
    hub_speed: Floats = variable(
        "m s-1", "profile turbine", "wind speed at hub height", "wind_speed"
    )
    hub_direction: Floats = variable(
        "degree",
        "profile turbine",
        "direction the wind at hub height blows from",
        "wind_from_direction",
    )
    coverage: Floats = variable(
        "1", "profile turbine", "share of the rotor's area that lies between valid levels"
    )
    covered_base: Floats = variable("m", "profile turbine", "lower end of the covered part")
    covered_top: Floats = variable("m", "profile turbine", "upper end of the covered part")
    veer: Floats = variable(
        "degree",
        "profile turbine",
        "direction at the top of the covered rotor minus that at its base, veering positive",
    )
    veer_error: Floats = variable(
        "degree", "profile turbine", "standard error of the veer, where the wind's error is known"
    )
    veer_rate: Floats = variable(
        "degree m-1", "profile turbine", "veer over the depth of the covered rotor"
    )
    steepest_veer_rate: Floats = variable(
        "degree m-1",
        "profile turbine",
        "largest veer or backing rate between levels, with its sign",
    )
    veer_upper_half: Floats = variable("degree", "profile turbine", "veer from hub to covered top")
    veer_lower_half: Floats = variable("degree", "profile turbine", "veer from covered base to hub")
    shear_exponent: Floats = variable(
        "1", "profile turbine", "power-law exponent by regression over the levels in the rotor"
    )
    shear_exponent_error: Floats = variable(
        "1", "profile turbine", "its standard error, from the scatter about the power law"
    )
    shear_exponent_tips: Floats = variable(
        "1", "profile turbine", "power-law exponent between the ends of the covered rotor"
    )
    roughness_length: Floats = variable(
        "m", "profile turbine", "effective roughness length of the logarithmic law, where sound"
    )
    roughness_why: Words = variable("", "profile turbine", "why there is no roughness length")
    equivalent_speed: Floats = variable(
        "m s-1", "profile turbine", "rotor-equivalent wind speed by exact chord integration"
    )
    equivalent_speed_with_veer: Floats = variable(
        "m s-1", "profile turbine", "the same of the wind along the hub's direction"
    )
    equivalent_speed_segments: Floats = variable(
        "m s-1", "profile turbine", "rotor-equivalent wind speed by segments of equal height"
    )
    equivalent_speed_with_veer_segments: Floats = variable(
        "m s-1", "profile turbine", "the same of the wind along the hub's direction"
    )
    equivalent_speed_ratio: Floats = variable(
        "1", "profile turbine", "equivalent speed (exact, without veer) over hub speed"
    )
    energy_flux_ratio: Floats = variable(
        "1", "profile turbine", "mean cube of the speed over the rotor, over that at the hub"
    )
    energy_flux_ratio_with_veer: Floats = variable(
        "1", "profile turbine", "the same of the wind along the hub's direction"
    )
    air_density: Floats = variable("kg m-3", "profile turbine", "air density at hub height")
    air_density_from: Words = variable(
        "", "profile turbine", "what the air density rests on, or why it is not determined"
    )
    density_normalised_speed: Floats = variable(
        "m s-1", "profile turbine", "hub speed that carries the same energy at 1.225 kg m-3"
    )
    turbulence_intensity: Floats = variable(
        "1",
        "profile turbine",
        "deviation over mean of the speed at the hub; NaN where none is given",
    )
    nose_height: Floats = variable(
        "m", "profile turbine", "wind maximum inside the rotor; NaN where there is none"
    )
    nose_speed: Floats = variable("m s-1", "profile turbine", "wind speed at the nose")
    nose_falloff: Floats = variable(
        "m s-1", "profile turbine", "wind speed at the nose minus that at the covered top"
    )
    shear_above_nose: Floats = variable(
        "s-1", "profile turbine", "change of speed with height from the nose to the covered top"
    )
    extrapolated: Bools = variable(
        "1", "profile turbine", "the wind above the highest level is that of the fitted Ekman model"
    )
    why: Words = variable(
        "", "profile turbine", "why an answer is missing or is of a part of the rotor only"
    )
    coverage_limit: float = COVERAGE_LIMIT
    gap_limit: float = GAP_LIMIT
    segments: int = 5


def rotor(
    stack: Stack,
    turbines: Turbine | Sequence[Turbine],
    coverage_limit: float = COVERAGE_LIMIT,
    segments: int = 5,
    gap_limit: float = GAP_LIMIT,
    extrapolate: bool = False,
    fit: ekman.EkmanFit | None = None,
    error: Any = None,
) -> Rotor:
    r"""
    State what turbines meet in each profile.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    turbines
        One or several.
    coverage_limit
        Share of the rotor's area that valid levels must cover for answers about the rotor. [1]
    segments
        Number of slices of equal height for the equivalent speeds by segments; each takes the wind
        at its middle height, and they are given where all of these are covered.
    gap_limit
        Neighbouring levels further apart are not joined, as a share of the diameter. [1]
    extrapolate
        Continue the wind above the highest level with the fitted Ekman model, shifted to agree at
        that level, where the fit is well determined and the hub lies between valid levels. Marked
        in ``extrapolated``; ``coverage`` then counts the extrapolated part too.
    fit
        From :func:`backveer.profiles.ekman.fit`; needed to extrapolate.
    error : float or array, shape (profile,)
        Standard error of a wind component; from the stack if left out. [m s-1]

    Returns
    -------
    Rotor
        Arrays over (profile, turbine).

    Raises
    ------
    ValueError
        For a limit outside its range, for no segment, and for ``extrapolate`` without ``fit``.

    Notes
    -----
    The equivalent speed is :math:`[\frac1A\int M^3 dA]^{1/3}` over the covered area, with veer
    :math:`M\cos\varphi` for M, where :math:`\varphi` is the direction minus that at the hub. By
    segments it is :math:`[\sum M_i^3 A_i/A]^{1/3}` (IEC 61400-12-1:2017; the form with direction
    from memory). Beyond 90 degrees the cosine changes sign, a wind from behind, which the formula
    was not made for: that answer is withheld. The energy ratio is the cube of the ratio of speeds.
    The density-normalised speed is :math:`M_{hub} (\rho/\rho_0)^{1/3}` (IEC 61400-12-1).

    Errors are given where they follow from the wind's error alone. That of an equivalent speed
    would need the correlation of the errors between levels, and there is none.

    Cautions: no guarantee of loads or energy; the standards' procedures and licensed practice
    decide.

    Examples
    --------
    >>> stack = Stack.of(
    ...     height=[40.0, 80.0, 120.0, 160.0, 200.0],
    ...     eastward_wind=[7.0, 8.0, 8.8, 9.4, 9.8],
    ...     northward_wind=0.0,
    ...     elevation=0.0,
    ... )
    >>> told = rotor(stack, Turbine("A", hub_height=120.0, rotor_diameter=150.0))
    >>> told.hub_speed.tolist(), told.veer.tolist(), told.shear_exponent.round(2).tolist()
    ([[8.8]], [[0.0]], [[0.23]])
    """
    several = (turbines,) if isinstance(turbines, Turbine) else tuple(turbines)
    _refuse(coverage_limit, gap_limit, segments, extrapolate, fit)
    sigma = np.broadcast_to(
        np.asarray(stack.wind_error if error is None else error, dtype=float),
        (stack.profile_count,),
    )
    shape = (stack.profile_count, len(several))
    found: dict[str, Any] = {
        name: np.full(shape, False if name == "extrapolated" else np.nan)
        for name, label in labels(Rotor).items()
        if label.dims == ("profile", "turbine") and label.unit
    }
    codes = np.zeros(shape, dtype=np.int64)
    roughness_why = np.full(shape, "", dtype=object)
    density_from = np.full(shape, "", dtype=object)
    for start in range(0, stack.profile_count, _BLOCK):
        rows = slice(start, start + _BLOCK)
        part = stack.select(rows)
        levels = levels_of(part)
        for place, turbine in enumerate(several):
            seen, more, missed = levels, np.zeros(len(levels.count), dtype=bool), pack({})
            if extrapolate and fit is not None:
                tip = turbine.hub_height + 0.5 * turbine.rotor_diameter
                seen, more, wanted = extended(levels, turbine.hub_height, tip, fit.select(rows))
                missed = pack({reasons.NO_FIT: wanted & ~more})
            answers = _answers(seen, turbine, coverage_limit, gap_limit, segments, sigma[rows])
            codes[rows, place] = answers.pop("code") | missed
            roughness_why[rows, place] = answers.pop("roughness_why")
            density, origin = air_density(part, turbine.hub_height)
            density_from[rows, place] = origin
            hub_speed = answers["hub_speed"]
            with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
                answers["density_normalised_speed"] = hub_speed * np.cbrt(
                    density / STANDARD_DENSITY
                )
                if part.has("wind_speed_deviation"):
                    z = np.where(part.usable("wind"), part.height, np.nan)
                    deviation = at_height(z, part.wind_speed_deviation, [turbine.hub_height])[:, 0]
                    answers["turbulence_intensity"] = np.where(
                        hub_speed > 0, deviation / hub_speed, np.nan
                    )
            answers.update(air_density=density, extrapolated=more)
            for name, values in answers.items():
                found[name][rows, place] = values
    return Rotor(
        turbine=np.array([turbine.name for turbine in several], dtype=object),
        hub_height=np.array([turbine.hub_height for turbine in several], dtype=float),
        rotor_diameter=np.array([turbine.rotor_diameter for turbine in several], dtype=float),
        roughness_why=roughness_why,
        air_density_from=density_from,
        why=spell(codes),
        coverage_limit=coverage_limit,
        gap_limit=gap_limit,
        segments=segments,
        **found,
    )


def _refuse(
    coverage_limit: float, gap_limit: float, segments: int, extrapolate: bool, fit: Any
) -> None:
    if not 0.0 < coverage_limit <= 1.0:
        raise ValueError(
            f"the coverage limit is a share between 0 and 1, not {coverage_limit}. "
            f"{COVERAGE_LIMIT} is the default."
        )
    if not 0.0 < gap_limit <= 1.0:
        raise ValueError(
            f"the gap limit is a share of the rotor's diameter between 0 and 1, not {gap_limit}. "
            f"{GAP_LIMIT} is the default."
        )
    if segments < 1:
        raise ValueError(f"a rotor has at least one segment, not {segments}. Give a whole number.")
    if extrapolate and fit is None:
        raise ValueError("extrapolation needs the Ekman fit of the same profiles. Give fit.")


def _answers(
    levels: Levels,
    turbine: Turbine,
    coverage_limit: float,
    gap_limit: float,
    segments: int,
    sigma: Floats,
) -> dict[str, Any]:
    """Everything about one turbine that the wind alone says, by field name, and the reasons."""
    hub, diameter = turbine.hub_height, turbine.rotor_diameter
    z, speed = levels.z, levels.speed
    bottom, tip = hub - 0.5 * diameter, hub + 0.5 * diameter
    fractions = segment_fractions(segments)
    centres = bottom + diameter * (np.arange(segments) + 0.5) / segments
    with np.errstate(all="ignore"):
        joined = np.diff(z, axis=1) <= gap_limit * diameter * (1.0 + 1e-9)  # 0.1 + 0.2 > 0.3
        ends = [np.clip(x, levels.lowest, levels.highest) for x in (bottom, tip)]
        at = Between.of(levels, joined, [*ends, hub, *centres])
        base, top = at.edge(0, upper=True), at.edge(1, upper=False)
        hub_speed, hub_turn = at.speed[:, 2], at.turn[:, 2]
        met = (z[:, 1:] > base.z[:, np.newaxis]) & (z[:, :-1] < top.z[:, np.newaxis])
        inside = (z >= base.z[:, np.newaxis]) & (z <= top.z[:, np.newaxis])
        used = np.flatnonzero(met.any(axis=0))
        first, last = (used[0], used[-1] + 2) if used.size else (0, 2)
        relative = levels.turn - hub_turn[:, np.newaxis]
        mean = disc_mean(
            z[:, first:last],
            speed[:, first:last],
            relative[:, first:last],
            joined[:, first : last - 1],
            hub,
            diameter,
        )
        enough = mean.coverage >= coverage_limit - 1e-12
        covered = enough & (bottom >= 0)
        no_direction = (met & np.isnan(levels.step)).any(axis=1)
        either_way = (met & (np.abs(levels.step) > LARGEST_STEP)).any(axis=1)
        followed = covered & ~no_direction & ~either_way
        away = np.where(inside, np.abs(relative), 0.0).max(axis=1, initial=0.0)
        away = np.maximum(away, np.maximum(abs(base.turn - hub_turn), abs(top.turn - hub_turn)))
        ahead = followed & (away <= 90.0)
        depth = top.z - base.z
        veer = np.where(followed, top.turn - base.turn, np.nan)
        error = np.degrees(
            np.hypot(direction_error(top.speed, sigma), direction_error(base.speed, sigma))
        )
        # A cube that left the range of numbers is no answer.
        lost = covered & ~((mean.cube < np.inf) & ((mean.cube > 0) | (hub_speed == 0)))
        equivalent = np.cbrt(np.where(covered & ~lost, mean.cube, np.nan))
        along = np.cbrt(np.where(ahead & ~lost, mean.cube_along, np.nan))
        blowing = np.where(hub_speed > 0, hub_speed, np.nan)
        wind, angle = at.speed[:, 3:], at.turn[:, 3:] - hub_turn[:, np.newaxis]
        straight = wind * np.cos(np.radians(angle))
        some = levels.count > 0
        laws = profile_laws(z, speed, covered[:, np.newaxis] & inside)
        hub_known = np.isfinite(hub_speed)
        reach = (z[:, 1:] > bottom) & (z[:, :-1] < tip)
        holes = (reach & ~joined).any(axis=1)
        low, high = bottom < levels.lowest, tip > levels.highest
        part = covered & (low | high | holes)
        answers: dict[str, Any] = {
            "hub_speed": hub_speed,
            "hub_direction": at.direction(2),
            "coverage": np.where(some, np.minimum(mean.coverage, 1.0), 0.0),
            "covered_base": np.where(depth > 0, base.z, np.nan),
            "covered_top": np.where(depth > 0, top.z, np.nan),
            "veer": veer,
            "veer_error": np.where(np.isfinite(veer), error, np.nan),
            "veer_rate": veer / depth,
            "steepest_veer_rate": np.where(
                followed, steepest_veer_rate(levels, joined, met), np.nan
            ),
            "veer_upper_half": np.where(followed, top.turn - hub_turn, np.nan),
            "veer_lower_half": np.where(followed, hub_turn - base.turn, np.nan),
            "shear_exponent_tips": np.where(
                covered, exponent_between(base.z, base.speed, top.z, top.speed), np.nan
            ),
            "equivalent_speed": equivalent,
            "equivalent_speed_with_veer": along,
            "equivalent_speed_segments": np.where(
                covered & ~lost, np.cbrt(ordered_sum(fractions * wind**3)), np.nan
            ),
            "equivalent_speed_with_veer_segments": np.where(
                ahead & ~lost, np.cbrt(ordered_sum(fractions * straight**3)), np.nan
            ),
            "equivalent_speed_ratio": equivalent / blowing,
            "energy_flux_ratio": (equivalent / blowing) ** 3,
            "energy_flux_ratio_with_veer": (along / blowing) ** 3,
        }
        answers.update(nose(z, speed, base, top, covered), **laws)
        answers["code"] = pack(
            {
                reasons.NO_WIND: ~some,
                reasons.HUB_BELOW: hub < levels.lowest,
                reasons.HUB_ABOVE: hub > levels.highest,
                reasons.HUB_GAP: ~hub_known & (hub >= levels.lowest) & (hub <= levels.highest),
                reasons.BELOW_GROUND: some & (bottom < 0),
                reasons.LOWER_TIP: low,
                reasons.UPPER_TIP: high,
                reasons.GAP: holes,
                reasons.PART: part,
                reasons.LOW_COVERAGE: some & ~enough,
                reasons.HUB_CALM: hub_speed == 0,
                reasons.NO_DIRECTION: no_direction,
                reasons.EITHER_WAY: either_way,
                reasons.TURNS_AWAY: followed & (away > 90.0),
                reasons.FEW_LEVELS: covered & np.isnan(laws["shear_exponent"]),
                reasons.TOO_LARGE: lost,
            }
        )
    return answers
