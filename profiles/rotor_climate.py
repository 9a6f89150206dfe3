"""What a turbine meets over time: a quantity by class, jointly with others, and how long."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles import classes
from backveer.profiles.block_bootstrap import resampling
from backveer.profiles.climatology import Climate, DirectionClimate, climate, direction_climate
from backveer.profiles.events import Events, events
from backveer.profiles.joint_table import Joint, joint
from backveer.profiles.labels import Floats, Times, labels
from backveer.profiles.rotor import Rotor
from backveer.profiles.stack import Stack

KINDS = ("all", "hour", "month", "season", "sector", "speed", "stability")
#: What can be told over time.
QUANTITIES = (
    "veer",
    "veer_rate",
    "steepest_veer_rate",
    "veer_upper_half",
    "veer_lower_half",
    "shear_exponent",
    "shear_exponent_tips",
    "hub_speed",
    "equivalent_speed",
    "equivalent_speed_with_veer",
    "equivalent_speed_ratio",
    "energy_flux_ratio",
    "energy_flux_ratio_with_veer",
    "air_density",
    "density_normalised_speed",
    "turbulence_intensity",
    "shear_above_nose",
)
#: Edges of the ranges of veer in joint tables; ours. [degree]
VEER_EDGES = (-10.0, -5.0, 0.0, 5.0, 10.0, 20.0, 40.0)
#: Of the rotor's own height; where the temperatures are measured decides what can be told; ours.
STABILITY_SPAN = (0.25, 0.25)


@dataclass(frozen=True)
class Over:
    """
    How to tell a quantity over time.

    Attributes
    ----------
    quantity
        A name of ``QUANTITIES``.
    by
        Names of ``KINDS``; ``"all"`` always stands first.
    thresholds
        In the quantity's unit: above, or below a negative one.
    confidence
        Of the block-bootstrap intervals, None for none.
    utc_offset
        Hours of the clock that hours, months and seasons are told by.
    stamp
        Whether a profile's time is at the ``"begin"`` or the ``"end"`` of what it stands for.
    sectors
        12, 16 or 36.
    """

    quantity: str = "veer"
    by: tuple[str, ...] = ()
    thresholds: tuple[float, ...] = ()
    confidence: float | None = None
    utc_offset: float = 0.0
    stamp: str = "begin"
    sectors: int = 12

    def __post_init__(self) -> None:
        if self.quantity not in QUANTITIES:
            raise ValueError(f"{self.quantity!r} is none of {', '.join(QUANTITIES)}.")
        unknown = sorted(set(self.by) - set(KINDS))
        if unknown:
            raise ValueError(f"{unknown[0]!r} is none of {', '.join(KINDS)}.")
        if self.stamp not in ("begin", "end"):
            raise ValueError(f"a time is at the 'begin' or the 'end', not {self.stamp!r}.")


@dataclass(frozen=True, eq=False)
class RotorClimate:
    """
    One turbine over time.

    Attributes
    ----------
    turbine
        Its name.
    quantity, unit
        What the tables are of.
    tables
        One for each way to sort, ``"all"`` first.
    direction
        The hub's direction in the first way to sort, as vectors.
    events
        One for each threshold; none where stations are mixed, whose times interleave.
    by_speed, by_hour
        How often each range of veer meets each speed bin, each hour.
    begins
        Time at which each profile's interval begins.
    utc_offset
        Hours that the clock of the tables is ahead of UTC.
    """

    turbine: str
    quantity: str
    unit: str
    tables: tuple[Climate, ...]
    direction: DirectionClimate
    events: tuple[Events, ...]
    by_speed: Joint
    by_hour: Joint
    begins: Times
    utc_offset: float = 0.0


def rotor_climate(stack: Stack, told: Rotor, place: int, over: Over) -> RotorClimate:
    """
    Tell a turbine's quantity over time.

    Parameters
    ----------
    stack
        Profiles of one record, each time once for each station.
    told
        What the turbines meet in them.
    place
        Which turbine, from 0.
    over
        How.

    Returns
    -------
    RotorClimate

    Examples
    --------
    >>> from backveer.profiles.rotor import Turbine, rotor
    >>> time = np.datetime64("2031-05-14T00:10", "ns") + np.arange(3) * np.timedelta64(10, "m")
    >>> stack = Stack.of(
    ...     height=[40.0, 80.0, 120.0],
    ...     eastward_wind=[[7.0, 8.0, 9.0]] * 3,
    ...     northward_wind=0.0,
    ...     time=time,
    ... )
    >>> told = rotor(stack, Turbine("A", 80.0, 80.0))
    >>> found = rotor_climate(stack, told, 0, Over(by=("hour",), stamp="end"))
    >>> found.tables[1].count[:2].tolist(), found.tables[0].mean.tolist()
    ([3, 0], [0.0])
    """
    values = getattr(told, over.quantity)[:, place]
    speed, density = told.hub_speed[:, place], told.air_density[:, place]
    step = classes.usual_interval(stack.time)
    late = over.stamp == "end" and not np.isnat(step)
    begins = stack.time - step if late else stack.time
    with_days = None
    if over.confidence is not None:
        with_days = resampling(begins, values, confidence=over.confidence)
    weight = np.where(np.isfinite(density), density, np.nan) if np.isfinite(density).any() else None
    ways = [
        sort(kind, stack, told, place, begins, over)
        for kind in ("all", *(kind for kind in over.by if kind != "all"))
    ]
    single = len(np.unique(stack.station.astype(str))) <= 1
    there = ~np.isnat(stack.time)
    once = single and np.unique(stack.time[there]).size == np.count_nonzero(there)
    ranges = classes.by_range(told.veer[:, place], VEER_EDGES, "veer")
    return RotorClimate(
        turbine=str(told.turbine[place]),
        quantity=over.quantity,
        unit=labels(Rotor)[over.quantity].unit,
        tables=tuple(
            climate(
                values,
                way,
                speed=speed,
                density=weight,
                thresholds=over.thresholds,
                resampling=with_days,
            )
            for way in ways
        ),
        direction=direction_climate(told.hub_direction[:, place], ways[0], speed),
        events=tuple(events(begins, values, x) for x in over.thresholds) if once else (),
        by_speed=joint(classes.by_speed(speed), ranges),
        by_hour=joint(classes.by_hour(begins, over.utc_offset), ranges),
        begins=begins,
        utc_offset=over.utc_offset,
    )


def sort(
    kind: str, stack: Stack, told: Rotor, place: int, begins: Times, over: Over
) -> classes.Classes:
    """
    Sort the profiles in one of the ways of ``KINDS``.

    Stability is told between the hub and a quarter of the rotor above and below it, or between the
    lowest and highest levels with temperature where it is not measured there.
    """
    if kind == "sector":
        return classes.by_sector(told.hub_direction[:, place], over.sectors)
    if kind == "speed":
        return classes.by_speed(told.hub_speed[:, place])
    if kind == "stability":
        base, top = _stability_heights(stack, told, place)
        return classes.by_stability(stack, base, top)
    by_clock: dict[str, Any] = {
        "hour": classes.by_hour,
        "month": classes.by_month,
        "season": classes.by_season,
    }
    if kind in by_clock:
        return by_clock[kind](begins, over.utc_offset)  # type: ignore[no-any-return]
    return classes.everything(begins)


def _stability_heights(stack: Stack, told: Rotor, place: int) -> tuple[float, float]:
    """Heights that most profiles have temperature and wind at, near the rotor's own."""
    hub, diameter = float(told.hub_height[place]), float(told.rotor_diameter[place])
    base, top = hub - STABILITY_SPAN[0] * diameter, hub + STABILITY_SPAN[1] * diameter
    both = stack.usable("temperature", "wind")
    z = np.where(both, stack.height, np.nan)
    if not both.any():
        return max(base, 0.1 * hub), top
    lowest = _middle(np.fmin.reduce(z, axis=1))
    highest = _middle(np.fmax.reduce(z, axis=1))
    base, top = max(base, lowest, 0.1 * hub), min(top, highest)
    if base < top:
        return base, top
    return (lowest, highest) if 0.0 < lowest < highest else (0.5 * hub, hub)


def _middle(x: Floats) -> float:
    return float(np.median(x[np.isfinite(x)]))


def exceedance(values: Floats, points: Sequence[float]) -> Floats:
    """
    Share of the values above each point.

    Parameters
    ----------
    values : array, shape (profile,)
        NaN is left out.
    points
        In the unit of the values.

    Returns
    -------
    share : array, shape (point,)
        NaN where there is no value. [1]

    Examples
    --------
    >>> exceedance(np.array([1.0, 2.0, 3.0, np.nan]), [0.0, 2.0, 9.0]).round(3).tolist()
    [1.0, 0.333, 0.0]
    """
    known = np.sort(values[np.isfinite(values)])
    if not known.size:
        return np.full(len(points), np.nan)
    return np.asarray(1.0 - np.searchsorted(known, points, side="right") / known.size)
