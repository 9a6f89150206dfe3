"""
What is wrong with a level.

Every finding is a bit of ``level_flag`` (the table is in flags.py). Flagged levels stay in the
data, and an analyser leaves out those whose flags concern it. The checks follow one another, each
on the levels that those before it left standing:

1. physical limits of wind, temperature, dew point, pressure and height;
2. levels at the same height, merged by their mean (of the wind vector);
3. heights that do not increase (:func:`backveer.profiles.level_order.increasing`), or lie below
   the ground;
4. wind that is missing, or calm (no direction); lidar availability and signal;
5. spikes of wind and temperature (:func:`backveer.profiles.spikes.spikes`);
6. superadiabatic layers above the surface layer;
7. pressure and height that disagree with the hypsometric equation.

A second check of a checked stack changes nothing, and a level where nothing is given gets no flag.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from backveer.profiles import air
from backveer.profiles.air_checks import not_hydrostatic, superadiabatic
from backveer.profiles.flags import BIT, FLAGS
from backveer.profiles.labels import Bools, Flags, Floats, Labelled, labels, variable
from backveer.profiles.level_order import increasing, is_given, merge_duplicates
from backveer.profiles.spikes import spikes
from backveer.profiles.stack import Stack


@dataclass(frozen=True)
class Thresholds:
    """
    Where each check draws its line. SI units; every default says where it comes from.

    Attributes
    ----------
    maximum_speed
        Highest wind speed taken for real. [m s-1]
    lowest_temperature, highest_temperature
        Limits of air temperature and dew point. [K]
    dew_point_excess
        By how much a dew point may exceed the temperature. [K]
    lowest_pressure, highest_pressure
        Limits of pressure. [Pa]
    highest_height
        Highest height that a profile reaches. [m]
    depth_below_ground
        How far below the ground a height may lie for the rounding of heights and elevations. [m]
    wind_spike_floor, wind_spike_rate
        Departure from the neighbours allowed always, and for each metre of distance.
        [m s-1], [s-1]
    temperature_spike_floor, temperature_spike_rate
        The same for temperature. [K], [K m-1]
    spike_factor
        How many times the profile's typical departure is allowed.
    superadiabatic_excess
        Cooling with height beyond the dry adiabat that is allowed in a layer. [K]
    surface_layer
        Layers that begin below this height may be superadiabatic. [m]
    thickness_excess, thickness_fraction, pressure_resolution
        Disagreement of heights and hypsometric thickness allowed always [m], as a fraction of
        the thickness, and for the rounding of the pressure [Pa].
    lowest_availability
        Lowest fraction of valid lidar data in the interval.
    lowest_signal
        Lowest carrier-to-noise ratio. [dB]
    """

    # The record gust at the ground is 113 m/s (Barrow Island, 1996), in jets aloft somewhat more:
    # WMO World Weather and Climate Extremes Archive, from memory; rounded up generously.
    maximum_speed: float = 150.0
    # From -89 C (Vostok, 1983) to 57 C (Death Valley, 1913) at the ground, and -100 C at a cold
    # tropopause: the same archive, from memory; rounded outward.
    lowest_temperature: float = 160.0
    highest_temperature: float = 335.0
    dew_point_excess: float = 0.5  # rounding of both to whole tenths, slight supersaturation
    # A balloon bursts before 1 hPa; sea-level records stay below 1090 hPa (the same archive, from
    # memory), and the lowest land lies 430 m below sea level.
    lowest_pressure: float = 100.0
    highest_pressure: float = 1.15e5
    highest_height: float = 60e3  # above any balloon; common practice, no source
    depth_below_ground: float = 1.0  # two heights, each rounded to a whole metre
    # Ten times the random error of a wind component from a balloon or lidar (0.5 m/s or less:
    # WMO-No. 8, from memory), and the shear of a strong jet (20 m/s in 2 km). Common practice, no
    # source.
    wind_spike_floor: float = 5.0
    wind_spike_rate: float = 0.01
    # Ten times a sonde's random error (0.4 K or less: WMO-No. 8, from memory); the dry adiabat.
    temperature_spike_floor: float = 4.0
    temperature_spike_rate: float = 0.01
    # Fewer than one in 10^5 of Gaussian errors of a wind go beyond it (measured); common practice.
    spike_factor: float = 8.0
    # Twice the rounding and noise of two temperatures: common practice, no source.
    superadiabatic_excess: float = 1.0
    surface_layer: float = 100.0  # a tenth of a boundary layer of 1 km: Stull, 1988, ch. 1
    thickness_excess: float = 15.0  # noise of a height and a pressure; common practice, no source
    # The layer's mean temperature is good to 2 % (5 K) if it is taken from the two ends.
    thickness_fraction: float = 0.02
    pressure_resolution: float = 50.0  # half of a whole hPa, the coarsest that is reported
    lowest_availability: float = 0.8  # common practice in wind-lidar campaigns, no source
    lowest_signal: float = -23.0  # for pulsed lidars; common practice, no source


@dataclass(frozen=True, eq=False)
class Summary(Labelled):
    """How many levels each profile has, and how many carry each finding."""

    level_count: Floats = variable("1", "profile", "levels where anything is given")
    flagged_count: Floats = variable(
        "1", "profile flag", "levels that carry the finding, in the order of the table of flags"
    )

    def count(self, name: str) -> Floats:
        """
        Return the number of levels of each profile with the finding of this name.

        Raises
        ------
        KeyError
            For a name that is not in the table of flags.
        """
        return self.flagged_count[:, {flag.name: i for i, flag in enumerate(FLAGS)}[name]]


def summary(stack: Stack) -> Summary:
    """
    Count the findings.

    Examples
    --------
    >>> stack = Stack.of(height=[10.0, 50.0], eastward_wind=[3.0, np.nan], northward_wind=1.0)
    >>> told = summary(check(stack))
    >>> told.count("wind_missing"), told.level_count
    (array([1.]), array([2.]))
    """
    counts = [np.count_nonzero(stack.level_flag & flag.bit, axis=1) for flag in FLAGS]
    return Summary(
        level_count=np.count_nonzero(_given(stack), axis=1).astype(float),
        flagged_count=np.stack(counts, axis=1).astype(float),
    )


def check(stack: Stack, thresholds: Thresholds | None = None) -> Stack:
    """
    Flag what is wrong with each level, and merge levels at the same height.

    Parameters
    ----------
    stack
        Profiles as they were read. Bits that are set already are kept.
    thresholds
        Where to draw the lines; the defaults are those of :class:`Thresholds`.

    Returns
    -------
    Stack
        With ``level_flag`` set. The heights of the levels without a flag that concerns the height
        increase strictly. No value is changed but by merging.

    Notes
    -----
    Rotating the wind or mirroring it changes no finding; a stack gives what its profiles give one
    at a time.

    Examples
    --------
    >>> from backveer.profiles.flags import names_of
    >>> u = [3.0, 5.0, 0.0]
    >>> stack = Stack.of(height=[10.0, 10.0, 40.0], eastward_wind=u, northward_wind=0.0)
    >>> checked = check(stack)
    >>> checked.eastward_wind.tolist()
    [[4.0, 0.0, nan]]
    >>> [names_of(int(bits)) for bits in checked.level_flag[0]]
    [('duplicate_height',), ('calm_without_direction',), ()]
    """
    limits = thresholds or Thresholds()
    if stack.level_count == 0 or stack.profile_count == 0:
        return stack
    good = _within_limits(stack, limits)
    merged = merge_duplicates(stack, good)
    if merged is not stack:
        stack, good = merged, _within_limits(merged, limits)

    given = _given(stack)
    flag = np.zeros(given.shape, dtype=np.uint32)
    z = stack.height
    with np.errstate(invalid="ignore"):
        possible = np.abs(z) <= limits.highest_height
        ordered = increasing(np.where(possible, z, np.nan))
        below = z < -limits.depth_below_ground
    _mark(flag, "height_not_increasing", given & ~ordered)
    _mark(flag, "below_ground", given & below)
    standing = ordered & ~below

    _check_wind(stack, limits, flag, given, standing, good)
    _check_lidar(stack, limits, flag, given)
    _check_air(stack, limits, flag, standing, good)
    return stack.replace(level_flag=stack.level_flag | flag)


def _mark(flag: Flags, name: str, where: Bools) -> None:
    """Set a flag's bit."""
    np.bitwise_or(flag, np.uint32(BIT[name]), out=flag, where=where)


def _given(stack: Stack) -> Bools:
    """Say where a level has a value of anything; beyond the last such level is padding."""
    given = np.zeros(stack.height.shape, dtype=bool)
    for name, label in labels(stack).items():
        if label.dims == ("profile", "level") and name != "level_flag" and is_given(stack, name):
            given |= ~np.isnan(getattr(stack, name))
    return given


def _within_limits(stack: Stack, limits: Thresholds) -> dict[str, Bools]:
    """Say for each variable that has limits where it is there and within them."""
    good: dict[str, Bools] = {}
    with np.errstate(invalid="ignore", over="ignore"):
        if is_given(stack, "eastward_wind"):
            good["eastward_wind"] = stack.wind_speed <= limits.maximum_speed
            good["northward_wind"] = good["eastward_wind"]
        if is_given(stack, "air_temperature"):
            temperature = stack.air_temperature
            good["air_temperature"] = (temperature >= limits.lowest_temperature) & (
                temperature <= limits.highest_temperature
            )
        if is_given(stack, "dew_point_temperature"):
            dew_point = stack.dew_point_temperature
            good["dew_point_temperature"] = (dew_point >= limits.lowest_temperature) & (
                dew_point <= limits.highest_temperature
            )
            if is_given(stack, "air_temperature"):
                # A temperature that is itself impossible is no witness against the dew point.
                above = dew_point > stack.air_temperature + limits.dew_point_excess
                good["dew_point_temperature"] &= ~(above & good["air_temperature"])
        if is_given(stack, "air_pressure"):
            pressure = stack.air_pressure
            good["air_pressure"] = (pressure >= limits.lowest_pressure) & (
                pressure <= limits.highest_pressure
            )
    return good


def _check_wind(
    stack: Stack,
    limits: Thresholds,
    flag: Flags,
    given: Bools,
    standing: Bools,
    good: dict[str, Bools],
) -> None:
    """Missing, outside limits, calm, spikes."""
    u, v = stack.eastward_wind, stack.northward_wind
    missing = np.isnan(u) | np.isnan(v)
    _mark(flag, "wind_missing", given & missing)
    if "eastward_wind" not in good:
        return
    good_wind = good["eastward_wind"]
    _mark(flag, "wind_outside_limits", ~missing & ~good_wind)
    _mark(flag, "calm_without_direction", (u == 0) & (v == 0))
    usable = standing & good_wind
    u, v = np.where(usable, u, np.nan), np.where(usable, v, np.nan)
    found = spikes(
        stack.height,
        (u, v),
        limits.wind_spike_floor,
        limits.wind_spike_rate,
        limits.spike_factor,
        friction=True,
    )
    _mark(flag, "wind_spike", found)


def _check_lidar(stack: Stack, limits: Thresholds, flag: Flags, given: Bools) -> None:
    """Availability and signal below their thresholds; where they are not given, nothing is said."""
    with np.errstate(invalid="ignore"):
        if is_given(stack, "availability"):
            low = stack.availability < limits.lowest_availability
            _mark(flag, "low_availability", given & low)
        if is_given(stack, "carrier_to_noise_ratio"):
            weak = stack.carrier_to_noise_ratio < limits.lowest_signal
            _mark(flag, "weak_signal", given & weak)


def _check_air(
    stack: Stack, limits: Thresholds, flag: Flags, standing: Bools, good: dict[str, Bools]
) -> None:
    """Check temperature, dew point and pressure, each where it is given."""
    if "dew_point_temperature" in good:
        there = ~np.isnan(stack.dew_point_temperature)
        outside = there & ~good["dew_point_temperature"]
        _mark(flag, "humidity_outside_limits", outside)
    if "air_pressure" in good:
        outside = ~np.isnan(stack.air_pressure) & ~good["air_pressure"]
        _mark(flag, "pressure_outside_limits", outside)
    if "air_temperature" not in good:
        return
    z, temperature = stack.height, stack.air_temperature
    outside = ~np.isnan(temperature) & ~good["air_temperature"]
    _mark(flag, "temperature_outside_limits", outside)
    usable = standing & good["air_temperature"]
    spike = spikes(
        z,
        (np.where(usable, temperature, np.nan),),
        limits.temperature_spike_floor,
        limits.temperature_spike_rate,
        limits.spike_factor,
        friction=False,
    )
    _mark(flag, "temperature_spike", spike)
    usable &= ~spike
    unstable = superadiabatic(
        z, temperature, usable, limits.superadiabatic_excess, limits.surface_layer
    )
    _mark(flag, "superadiabatic", unstable)
    if "air_pressure" not in good:
        return
    pressure, virtual = stack.air_pressure, temperature
    if "dew_point_temperature" in good:
        moist = np.where(good["dew_point_temperature"], stack.dew_point_temperature, np.nan)
        virtual = air.virtual_temperature(temperature, moist, pressure)
        virtual = np.where(np.isfinite(virtual), virtual, temperature)
    # Heights out of the standard atmosphere are known to disagree with the day's temperatures.
    measured = (stack.level_flag & BIT["height_from_standard_atmosphere"]) == 0
    disagreeing = not_hydrostatic(
        z,
        pressure,
        virtual,
        usable & good["air_pressure"] & measured,
        limits.thickness_excess,
        limits.thickness_fraction,
        limits.pressure_resolution,
    )
    _mark(flag, "not_hydrostatic", disagreeing)
