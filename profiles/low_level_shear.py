r"""
Low-level wind shear: between levels, over fixed layers, from the surface, and what causes it.

Shear is the vector difference of the wind over the depth of a layer, in s-1, and never without
that depth: a layer thicker than the one asked for can hide a stronger shear inside, so its answer
is a lower bound and is marked as one. Along a flight path see
:mod:`backveer.profiles.flight_path`.

.. math:: s = |V_{top} - V_{base}| / (z_{top} - z_{base})
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from backveer.profiles.grid import at_height
from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.low_levels import low_levels
from backveer.profiles.sliding_layer import measured_between, strongest_layer
from backveer.profiles.stack import Stack

FOOT = 0.3048  # m, exact: ISO 80000-3:2019, annex B
KNOT = 1852.0 / 3600.0  # m s-1, exact: ISO 80000-3:2019, annex B
KNOT_PER_100_FEET = KNOT / (100.0 * FOOT)  # s-1, 0.0168781

#: Surface to 2000 ft: the layer of the non-convective wind-shear group (US NWS forecaster training
#: text on the TAF, "surface to 2000 ft AGL inclusive"; seen there, checks V7).
TOP = 2000 * FOOT
STEP = 100 * FOOT
#: Tops of the layers told from the surface: 500, 1000, 1600 (runway level to 500 m, the scope of
#: wind-shear warnings in ICAO Annex 3 as carried in national law, checks V3) and 2000 ft.
FROM_SURFACE = (500 * FOOT, 1000 * FOOT, 1600 * FOOT, 2000 * FOOT)
#: The surface wind is the wind at 10 m (WMO-No. 8); a lowest level above this is none.
SURFACE_LIMIT = 30.0  # m, common practice, no source
LOWEST_REACH = FROM_SURFACE[0]

#: Terms of intensity and the shear, in kt per 100 ft, from which each holds; the severe above it.
#: Wording after the Fifth Air Navigation Conference (1967), as told of ICAO Doc 9817 and Circular
#: 186: light 0-4, moderate 5-8, strong 9-12, severe above 12 kt per 100 ft. From memory and a
#: second-hand note that itself says "not verified from an ICAO document" (checks V2, V2b). The
#: published classes leave gaps between whole knots; the bounds here are the lower ends, so that
#: 4.5 kt is light.
INTENSITY = (("light", 0.0), ("moderate", 5.0), ("strong", 9.0), ("severe", 12.0))


@dataclass(frozen=True, eq=False)
class LowLevelShear(Labelled):
    """
    Shear between the ground and ``top``; every ``error`` is one standard deviation.

    A layer with a shear smaller than its error carries no term of intensity: it is not shear.
    """

    layer_base: Floats = variable("m", "profile layer", "base of the layer between two levels")
    layer_top: Floats = variable("m", "profile layer", "top of the layer between two levels")
    layer_shear: Floats = variable("s-1", "profile layer", "vector shear between two levels")
    layer_vector_difference: Floats = variable(
        "m s-1", "profile layer", "size of the vector difference, top minus base"
    )
    layer_speed_difference: Floats = variable(
        "m s-1", "profile layer", "wind speed at the top minus that at the base"
    )
    layer_direction_change: Floats = variable(
        "degree", "profile layer", "direction at the top minus that at the base, veering positive"
    )
    layer_error: Floats = variable("s-1", "profile layer", "standard error of the shear")
    layer_intensity: Words = variable("", "profile layer", "term of intensity, empty for none")
    layer_lower_bound: Bools = variable(
        "1", "profile layer", "the layer is thicker than the step asked for"
    )
    step_base: Floats = variable("m", "profile step", "base of a step of fixed depth")
    step_top: Floats = variable("m", "profile step", "top of a step of fixed depth")
    step_shear: Floats = variable("s-1", "profile step", "vector shear over the step")
    step_vector_difference: Floats = variable("m s-1", "profile step", "size of the difference")
    step_speed_difference: Floats = variable("m s-1", "profile step", "speed, top minus base")
    step_direction_change: Floats = variable("degree", "profile step", "veering positive")
    step_error: Floats = variable("s-1", "profile step", "standard error of the shear")
    step_intensity: Words = variable("", "profile step", "term of intensity, empty for none")
    step_lower_bound: Bools = variable(
        "1", "profile step", "no two levels are as close as the step here: shear may hide inside"
    )
    surface_height: Floats = variable("m", "profile", "height of the surface wind")
    surface_why: Words = variable("", "profile", "why there is no surface wind")
    reach_height: Floats = variable("m", "profile reach", "top of a layer from the surface")
    reach_vector_difference: Floats = variable(
        "m s-1", "profile reach", "size of the vector difference from the surface wind"
    )
    reach_speed_difference: Floats = variable("m s-1", "profile reach", "speed, top minus surface")
    reach_direction_change: Floats = variable("degree", "profile reach", "veering positive")
    reach_shear: Floats = variable("s-1", "profile reach", "vector shear from the surface")
    reach_error: Floats = variable("s-1", "profile reach", "standard error of the shear")
    window_shear: Floats = variable(
        "s-1", "profile", "strongest vector shear over a layer as deep as the step, wherever it is"
    )
    window_base: Floats = variable("m", "profile", "base of that layer")
    window_top: Floats = variable("m", "profile", "top of that layer")
    window_vector_difference: Floats = variable("m s-1", "profile", "size of the difference there")
    window_speed_difference: Floats = variable("m s-1", "profile", "speed there, top minus base")
    window_direction_change: Floats = variable("degree", "profile", "there, veering positive")
    window_error: Floats = variable("s-1", "profile", "standard error of that shear")
    window_intensity: Words = variable("", "profile", "its term of intensity, empty for none")
    window_lower_bound: Bools = variable("1", "profile", "levels are farther apart than the step")
    window_measured_base: Floats = variable("m", "profile", "level below it, used for its base")
    window_measured_top: Floats = variable("m", "profile", "level above it, used for its top")
    maximum_shear: Floats = variable("s-1", "profile", "strongest shear between two levels")
    maximum_error: Floats = variable("s-1", "profile", "standard error of that shear")
    maximum_base: Floats = variable("m", "profile", "base of the layer of the strongest shear")
    maximum_top: Floats = variable("m", "profile", "top of the layer of the strongest shear")
    maximum_intensity: Words = variable("", "profile", "its term of intensity, empty for none")
    why: Words = variable("", "profile", "why nothing is said of the profile")
    top: float = TOP
    step: float = STEP


def low_level_shear(
    stack: Stack,
    error: Floats,
    top: float = TOP,
    step: float = STEP,
    reaches: tuple[float, ...] = FROM_SURFACE,
) -> LowLevelShear:
    """
    Shear of each profile between the ground and ``top``.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    error
        Standard error of a wind component, shape (profile,). [m s-1]
    top
        Height above ground up to which shear is looked for. [m]
    step
        Depth of the layers of fixed depth. [m]
    reaches
        Tops of the layers told from the surface; those above ``top`` are left out. [m]

    Returns
    -------
    LowLevelShear
        Layers between neighbouring levels, steps of fixed depth, layers from the surface, and the
        strongest. Adding a level never lowers ``maximum_shear``: the vector shear of a layer is the
        mean, by depth, of the shears inside it.

    Notes
    -----
    The layer that reaches across ``top`` is cut there, the wind taken between its levels. The
    error of a vector difference is that of one component, error times the square root of 2. A layer
    that lies between two neighbouring levels has their shear and its error; for one that holds a
    level the error of its ends is kept at that of a level, though interpolation makes it smaller.

    Between levels a few metres apart the strongest shear is mostly noise, and the terms of
    intensity are for 100 ft: the shear to go by is ``window_shear``. Where the levels span less
    than a step it is not determined.
    """
    count, z, w = low_levels(stack, top)
    pair = _difference(z[..., :-1], z[..., 1:], w[..., :-1], w[..., 1:], error)

    edges = np.arange(0.0, top + 0.5 * step, step)
    lowest = z[..., :1]
    # The lowest step begins at the lowest level, if that lies in it: nobody measures at the ground.
    bases = np.broadcast_to(edges[:-1], (stack.profile_count, edges.size - 1))
    with np.errstate(invalid="ignore"):
        bases = np.where((lowest > bases) & (lowest < edges[1:]), lowest, bases)
    tops = np.broadcast_to(edges[1:], bases.shape)
    # Steps above all profiles are known to be missing.
    reached = int(np.count_nonzero(edges[:-1] < np.fmax.reduce(z, axis=None, initial=-1.0)))
    fixed = _between(bases[:, :reached], tops[:, :reached], z, w, error).padded(bases.shape[1])
    missing = ~np.isfinite(fixed.shear)

    low, high = (end[..., np.newaxis] for end in strongest_layer(z, w, step)[:2])
    window = _between(low, high, z, w, error)
    seen = np.isfinite(window.shear[..., 0])

    surface = np.where(lowest[..., 0] <= SURFACE_LIMIT, lowest[..., 0], np.nan)
    heights = np.array([height for height in reaches if height <= top * (1 + 1e-9)])
    reach = _difference(
        np.broadcast_to(surface[..., np.newaxis], (stack.profile_count, heights.size)),
        np.broadcast_to(heights, (stack.profile_count, heights.size)),
        np.where(np.isfinite(surface), w[..., 0], np.nan)[..., np.newaxis],
        at_height(z, w, heights),
        error,
    )

    shear = np.where(np.isfinite(pair.shear), pair.shear, -1.0)
    if shear.shape[-1] == 0:
        shear = np.full((stack.profile_count, 1), -1.0)
    strongest = np.argmax(shear, axis=-1)[..., np.newaxis]
    found = np.take_along_axis(shear, strongest, -1)[..., 0] >= 0

    def of_strongest(array: Any, missing: Any) -> Any:
        if array.shape[-1] == 0:
            return np.full(stack.profile_count, missing, dtype=array.dtype)
        return np.where(found, np.take_along_axis(array, strongest, -1)[..., 0], missing)

    return LowLevelShear(
        layer_base=pair.base,
        layer_top=pair.top,
        layer_shear=pair.shear,
        layer_vector_difference=pair.size,
        layer_speed_difference=pair.speed,
        layer_direction_change=pair.turn,
        layer_error=pair.error,
        layer_intensity=pair.intensity,
        layer_lower_bound=np.where(
            np.isfinite(pair.shear), _deeper(pair.top, pair.base, step), False
        ),
        step_base=np.where(missing, np.nan, bases),
        step_top=np.where(missing, np.nan, tops),
        step_shear=fixed.shear,
        step_vector_difference=fixed.size,
        step_speed_difference=fixed.speed,
        step_direction_change=fixed.turn,
        step_error=fixed.error,
        step_intensity=fixed.intensity,
        step_lower_bound=(fixed.widest > step * (1 + 1e-9)) & ~missing,
        surface_height=surface,
        surface_why=_surface_why(count, lowest[..., 0]),
        reach_height=np.where(np.isfinite(reach.shear), reach.top, np.nan),
        reach_vector_difference=reach.size,
        reach_speed_difference=reach.speed,
        reach_direction_change=reach.turn,
        reach_shear=reach.shear,
        reach_error=reach.error,
        window_shear=window.shear[..., 0],
        window_base=np.where(seen, window.base[..., 0], np.nan),
        window_top=np.where(seen, window.top[..., 0], np.nan),
        window_vector_difference=window.size[..., 0],
        window_speed_difference=window.speed[..., 0],
        window_direction_change=window.turn[..., 0],
        window_error=window.error[..., 0],
        window_intensity=window.intensity[..., 0],
        window_lower_bound=seen & (window.widest[..., 0] > step * (1 + 1e-9)),
        window_measured_base=np.where(seen, window.below[..., 0], np.nan),
        window_measured_top=np.where(seen, window.above[..., 0], np.nan),
        maximum_error=of_strongest(pair.error, np.nan),
        maximum_shear=np.where(found, np.take_along_axis(shear, strongest, -1)[..., 0], np.nan),
        maximum_base=of_strongest(pair.base, np.nan),
        maximum_top=of_strongest(pair.top, np.nan),
        maximum_intensity=of_strongest(pair.intensity, ""),
        why=_why(count, found, top),
        top=float(top),
        step=float(step),
    )


def intensity(shear: Floats, error: Floats) -> Words:
    """
    Term of intensity of a shear.

    Parameters
    ----------
    shear, error : array
        Vector shear and its standard error. [s-1]

    Returns
    -------
    term : array of str
        ``"light"``, ``"moderate"``, ``"strong"`` or ``"severe"`` (:data:`INTENSITY`); empty where
        the shear is missing or smaller than its error.

    Examples
    --------
    >>> kt = KNOT_PER_100_FEET
    >>> intensity(np.array([3, 6, 9, 13, 0.2]) * kt, np.full(5, 0.5 * kt)).tolist()
    ['light', 'moderate', 'strong', 'severe', '']
    """
    term = np.full(np.shape(shear), "", dtype=object)
    with np.errstate(invalid="ignore"):
        for name, bound in INTENSITY:
            # A bound met to rounding is met: 5 kt per 100 ft is moderate, however it was computed.
            # The severe begin above theirs.
            slack = 1 + 1e-9 if name == "severe" else 1 - 1e-9
            term[np.asarray(shear >= bound * KNOT_PER_100_FEET * slack)] = name
        term[np.asarray(~(shear >= error))] = ""
    return term


@dataclass(frozen=True)
class _Difference:
    """Top minus base of layers, each array of the layers' shape; where they were measured."""

    base: Floats
    top: Floats
    shear: Floats
    size: Floats
    speed: Floats
    turn: Floats
    error: Floats
    intensity: Words
    below: Floats
    above: Floats
    widest: Floats

    def padded(self, count: int) -> _Difference:
        """Return the same with missing layers up to ``count``."""
        more = count - self.base.shape[-1]
        wide = [(0, 0), (0, more)]
        return _Difference(
            **{
                name: np.pad(array, wide, constant_values="" if array.dtype == object else np.nan)
                for name, array in vars(self).items()
            }
        )


def _between(base: Floats, top: Floats, z: Floats, w: Any, error: Floats) -> _Difference:
    """Differences over layers whose ends lie between levels."""
    below, above, widest, inside = measured_between(z, base, top)
    with np.errstate(invalid="ignore", over="ignore"):
        known = top - base
        # Between two neighbours the shear, and so its error, is that of the neighbours.
        known = np.where(inside, known, np.fmax(known, above - below))
    ends = at_height(z, w, np.concatenate([base, top], axis=-1))
    w_base, w_top = ends[..., : base.shape[-1]], ends[..., base.shape[-1] :]
    told = _difference(base, top, w_base, w_top, error, known)
    return replace(told, below=below, above=above, widest=widest)


def _difference(
    base: Floats, top: Floats, w_base: Any, w_top: Any, error: Floats, known: Floats | None = None
) -> _Difference:
    """Differences over layers; ``known`` is the depth that divides the error, if not theirs."""
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        depth = top - base
        size = np.abs(w_top - w_base)
        shear = size / depth
        # Clockwise is negative in the complex plane and positive on the compass.
        turn = np.degrees(np.angle(w_base * np.conj(w_top)))
        turn = np.where((w_base == 0) | (w_top == 0), np.nan, turn)
        spread = np.sqrt(2.0) * error[..., np.newaxis] / (depth if known is None else known)
        spread = np.where(np.isfinite(shear), spread, np.nan)
        speed = np.abs(w_top) - np.abs(w_base)
    term = intensity(shear, spread)
    return _Difference(base, top, shear, size, speed, turn, spread, term, base, top, depth)


def _deeper(top: Floats, base: Floats, step: float) -> Bools:
    with np.errstate(invalid="ignore"):
        deeper: Bools = top - base > step * (1 + 1e-9)
    return deeper


def _surface_why(count: Floats, lowest: Floats) -> Words:
    above = f"the lowest wind is above the surface layer, higher than {SURFACE_LIMIT:.0f} m (98 ft)"
    none = "there is no wind below 500 ft (152 m) above ground"
    with np.errstate(invalid="ignore"):
        words = np.where(lowest <= SURFACE_LIMIT, "", np.where(lowest > LOWEST_REACH, none, above))
    return np.where(count == 0, "there is no usable wind", words).astype(object)


def _why(levels: Floats, found: Bools, top: float) -> Words:
    one = f"there is only one usable wind below {top / FOOT:.0f} ft ({top:.0f} m) above ground"
    none = f"there is no usable wind below {top / FOOT:.0f} ft ({top:.0f} m) above ground"
    return np.where(found, "", np.where(levels == 0, none, one)).astype(object)
