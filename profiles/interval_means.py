r"""
Ten-minute (or other) averages of profiles that come faster, with availability and deviation.

Winds are averaged as vectors. The mean vector is shorter than the mean speed where the direction
wanders within the interval (by some 1 % for a standard deviation of 8 degrees), which a record of
cup speeds would not show; what a turbine's rotor meets is nearer to the mean vector.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.classes import usual_interval
from backveer.profiles.flags import BIT, FLAGS
from backveer.profiles.labels import Bools, Floats
from backveer.profiles.stack import Stack

TEN_MINUTES = np.timedelta64(600, "s")
#: Share of the samples that an average must rest on; common practice for lidars, no source.
AVAILABILITY_LIMIT = 0.8
#: Levels may move by this much within an interval and still be one level; ours.
SAME_HEIGHT = 0.5  # m


def interval_means(
    stack: Stack,
    interval: Any = TEN_MINUTES,
    sample_interval: Any = None,
    availability_limit: float = AVAILABILITY_LIMIT,
    stamp: str = "begin",
) -> Stack:
    r"""
    Average profiles over intervals of the clock.

    Parameters
    ----------
    stack
        Quality-checked profiles in any order, at the same levels throughout each interval; those
        without a time are left out. Stations are kept apart.
    interval : timedelta64
        Length of the averages; they begin at multiples of it since midnight UTC.
    sample_interval : timedelta64, optional
        Time from one profile to the next; by default the median of the record.
    availability_limit
        Averages of fewer samples than this share of a full interval are flagged
        ``low_availability`` and so left out by the analysers; their values stay.
    stamp
        Whether the times of profiles and of averages are at the ``"begin"`` or at the ``"end"`` of
        what they stand for.

    Returns
    -------
    Stack
        One profile for each interval and station that has any, in the order of time.
        ``availability`` is the share of samples with a usable wind, weighted with the samples' own
        where they have one. ``wind_speed_deviation`` is that of the samples' speeds, joined with
        their own where they have one; NaN for a single sample without.

    Raises
    ------
    ValueError
        For an interval that does not divide a day or is shorter than the samples', and for levels
        that move.

    Notes
    -----
    .. math:: \sigma^2 = \frac1{n-1} \sum (M_j - \overline M)^2 + \frac1n \sum \sigma_j^2

    Variables that are no wind are plain means of the samples that have them and are not flagged.
    Whether an average is calm is for the quality check of the averages to say.

    Examples
    --------
    >>> time = np.datetime64("2031-05-14T00:00", "ns") + np.arange(4) * np.timedelta64(5, "m")
    >>> fast = Stack.of(
    ...     height=[40.0], eastward_wind=[[4.0], [6.0], [7.0], [7.0]], northward_wind=0.0, time=time
    ... )
    >>> slow = interval_means(fast)
    >>> slow.eastward_wind.tolist(), slow.availability.tolist()
    ([[5.0], [7.0]], [[1.0], [1.0]])
    """
    length = np.timedelta64(interval, "ns")
    day = np.timedelta64(1, "D").astype("timedelta64[ns]")
    if length <= np.timedelta64(0, "ns") or day % length != np.timedelta64(0, "ns"):
        raise ValueError(f"averages over {interval} do not fill a day. Ten minutes are usual.")
    if stamp not in ("begin", "end"):
        raise ValueError(f"times stand at the 'begin' or the 'end' of an interval, not {stamp!r}.")
    stack = stack.select(~np.isnat(stack.time))
    sample = usual_interval(stack.time) if sample_interval is None else sample_interval
    sample = np.timedelta64(sample, "ns")
    if sample > length:
        raise ValueError(
            f"profiles come every {sample / np.timedelta64(1, 's'):g} s, more seldom than the "
            f"averages asked for. Choose a longer interval."
        )
    if not stack.profile_count:
        return stack
    # A profile that ends on the full interval belongs to the one before.
    late = np.timedelta64(1, "ns") if stamp == "end" else np.timedelta64(0, "ns")
    slot = (stack.time - late - np.datetime64(0, "ns")) // length
    _names, station = np.unique(stack.station.astype(str), return_inverse=True)
    order = np.lexsort((station, slot))
    stack, slot, station = stack.select(order), slot[order], station[order]
    new = np.concatenate([[True], (np.diff(slot) != 0) | (np.diff(station) != 0)])
    start = np.flatnonzero(new)
    full = 1.0 if np.isnat(sample) else max(float(length / sample), 1.0)
    return _averages(stack, start, np.cumsum(new) - 1, full, availability_limit).replace(
        time=np.datetime64(0, "ns") + (slot[start] + (stamp == "end")) * length
    )


def _averages(stack: Stack, start: Any, run: Any, full: float, limit: float) -> Stack:
    """Average the runs of profiles that begin at ``start``; ``run`` is the run of each."""
    windy = stack.usable("wind")
    _refuse_moving_levels(stack, start)
    count, u = _mean(stack.eastward_wind, windy, start)
    _, v = _mean(stack.northward_wind, windy, start)
    own = stack.availability if stack.has("availability") else np.ones(windy.shape)
    present = np.where(windy, np.where(np.isfinite(own), np.clip(own, 0.0, 1.0), 1.0), 0.0)
    availability = np.minimum(np.add.reduceat(present, start, axis=0) / full, 1.0)
    given = {
        name: _mean(getattr(stack, name), stack.usable(group), start)[1]
        for name, group in (
            ("air_temperature", "temperature"),
            ("dew_point_temperature", "humidity"),
            ("air_pressure", "pressure"),
            ("upward_air_velocity", "wind"),
            ("carrier_to_noise_ratio", "wind"),
            ("altitude", "wind"),
            ("geopotential_height", "wind"),
        )
        if stack.has(name)
    }
    # Findings that spoil nothing (how a height was made) stay true of the average.
    kept = np.bitwise_or.reduceat(stack.level_flag & _HARMLESS, start, axis=0)
    flag = np.where(count == 0, BIT["wind_missing"], 0)
    flag |= np.where((count > 0) & (availability < limit), BIT["low_availability"], 0)
    return stack.select(start).replace(
        height=_mean(stack.height, np.isfinite(stack.height), start)[1],
        eastward_wind=u,
        northward_wind=v,
        availability=availability,
        wind_speed_deviation=_deviation(stack, windy, start, run),
        level_flag=kept | flag.astype(np.uint32),
        # An average is no worse than the worst of its samples; how much better depends on how their
        # errors hang together, which is not known.
        wind_error=np.maximum.reduceat(stack.wind_error, start),
        **given,
    )


def _mean(x: Floats, use: Bools, start: Any) -> tuple[Any, Floats]:
    """Count and mean of each run of profiles at each level; NaN where there is nothing."""
    use = use & np.isfinite(x)
    count = np.add.reduceat(use, start, axis=0, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        return count, np.add.reduceat(np.where(use, x, 0.0), start, axis=0) / count


def _deviation(stack: Stack, windy: Bools, start: Any, run: Any) -> Floats:
    """Return the deviation of the speed within each run, from the samples and their own."""
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        speed = stack.wind_speed
        count, mean = _mean(speed, windy, start)
        _, square = _mean((speed - mean[run]) ** 2, windy, start)
        between = np.where(count > 1, square * count / (count - 1.0), np.nan)
        if not stack.has("wind_speed_deviation"):
            return np.sqrt(between)
        _, within = _mean(stack.wind_speed_deviation**2, windy, start)
        within = np.where(np.isnan(within), 0.0 * between, within)
        return np.sqrt(np.where(count > 1, between, 0.0 * within) + within)


def _refuse_moving_levels(stack: Stack, start: Any) -> None:
    z = stack.height
    if z.strides[0] == 0:
        return
    with np.errstate(invalid="ignore"):
        moved = np.fmax.reduceat(z, start, axis=0) - np.fmin.reduceat(z, start, axis=0)
        bad = np.argwhere(moved > SAME_HEIGHT)
    if bad.size:
        run, level = bad[0]
        when = np.datetime_as_string(stack.time[start[run]], unit="s")
        raise ValueError(
            f"the height of level {level} moves by {moved[run, level]:.1f} m within the interval "
            f"of {when}. Bring the profiles to common heights first."
        )


_HARMLESS = np.uint32(sum(flag.bit for flag in FLAGS if not flag.concerns))
