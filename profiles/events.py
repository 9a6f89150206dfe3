"""How long events last: runs of profiles in which a quantity stays beyond a threshold."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from backveer.profiles.classes import complete_record, usual_interval
from backveer.profiles.labels import Bools, Floats, Labelled, Times, variable

if TYPE_CHECKING:
    import pandas

_SECOND = np.timedelta64(1, "s")


@dataclass(frozen=True, eq=False)
class Events(Labelled):
    """Runs beyond a threshold, in the order of their beginning."""

    begin: Times = variable("", "event", "time of the first profile of the run")
    end: Times = variable("", "event", "time of the last profile, and one interval")
    duration: Floats = variable("s", "event", "end minus begin, bridged gaps within")
    count: Any = variable("1", "event", "profiles in the run")
    peak: Floats = variable("", "event", "the value furthest beyond the threshold")
    peak_time: Times = variable("", "event", "when that was")
    cut: Bools = variable(
        "1", "event", "the run touches a gap or an end of the record: it may have lasted longer"
    )
    threshold: float = np.nan
    interval: float = np.nan
    bridge: float = 0.0
    recovery: float = np.nan

    def to_pandas(self, dimension: str | None = None) -> pandas.DataFrame:
        """
        Return a table with a row for each event.

        Raises
        ------
        ValueError
            For any other ``dimension`` than ``"event"``.
        """
        if dimension not in (None, "event"):
            raise ValueError(f"Events has a row for each event, not {dimension!r}.")
        return self.to_xarray().to_dataframe()


def events(
    time: Times,
    values: Floats,
    threshold: float,
    interval: Any = None,
    bridge: Any = None,
) -> Events:
    """
    Find the runs in which a quantity stays beyond a threshold.

    Parameters
    ----------
    time : array of datetime64, shape (profile,)
        In any order; not-a-time is left out.
    values : array, shape (profile,)
        A value that is not finite is a gap.
    threshold
        Beyond is above it; below it where it is negative.
    interval : timedelta64, optional
        Time from one profile to the next; by default the median of the record. A run of one profile
        lasts one interval.
    bridge : timedelta64, optional
        A run goes on across a gap that is no longer, where it is beyond the threshold on both
        sides; by default no gap is bridged. A value that is not beyond always ends a run.

    Returns
    -------
    Events
        ``recovery`` is the share of a complete record that has a value.

    Raises
    ------
    ValueError
        For times that occur twice, or an interval that is not positive.

    Examples
    --------
    >>> time = np.datetime64("2031-05-14T00:00", "ns") + np.arange(6) * np.timedelta64(10, "m")
    >>> told = events(time, np.array([3.0, 12.0, 15.0, 4.0, 11.0, np.nan]), threshold=10.0)
    >>> told.duration.tolist(), told.peak.tolist(), told.cut.tolist()
    ([1200.0, 600.0], [15.0, 11.0], [False, True])
    """
    time, values = np.asarray(time, dtype="datetime64[ns]"), np.asarray(values, dtype=float)
    if time.shape != values.shape:
        raise ValueError(f"{values.size} values do not fit {time.size} times. Give one for each.")
    step = usual_interval(time) if interval is None else np.timedelta64(interval, "ns")
    if step <= np.timedelta64(0, "ns"):
        raise ValueError(f"the interval between profiles must be positive, not {interval}.")
    there = ~np.isnat(time)
    order = np.argsort(time[there], kind="stable")
    whole, x = time[there][order], values[there][order]
    if (np.diff(whole) == np.timedelta64(0, "ns")).any():
        twice = whole[:-1][np.diff(whole) == np.timedelta64(0, "ns")][0]
        raise ValueError(
            f"the time {np.datetime_as_string(twice, unit='s')} occurs twice. "
            f"Keep one profile of each time, or take one station at a time."
        )
    record = whole
    whole, x = whole[np.isfinite(x)], x[np.isfinite(x)]
    if np.isnat(step):  # a single profile: nobody knows how long it stands for
        step = np.timedelta64(0, "ns")
    allowed = np.timedelta64(0, "ns") if bridge is None else np.timedelta64(bridge, "ns")
    # Clocks are not exact: half an interval more is no gap yet.
    late = np.diff(whole) - step
    half = step // 2
    joined = late <= np.maximum(half, allowed)
    beyond = x < threshold if threshold < 0 else x > threshold
    first = beyond & np.concatenate([[True], ~beyond[:-1] | ~joined])[: x.size]
    last = beyond & np.concatenate([~beyond[1:] | ~joined, [True]])[: x.size]
    begin, end = np.flatnonzero(first), np.flatnonzero(last)
    before = np.concatenate([[True], late > half])[: x.size]
    after = np.concatenate([late > half, [True]])[: x.size]
    peak = _peaks(-x if threshold < 0 else x, begin, end)
    expected = complete_record(record, step).size if record.size > 1 else record.size
    return Events(
        begin=whole[begin],
        end=whole[end] + step,
        duration=(whole[end] + step - whole[begin]) / _SECOND,
        count=end - begin + 1,
        peak=x[peak],
        peak_time=whole[peak],
        cut=before[begin] | after[end],
        threshold=float(threshold),
        interval=float(step / _SECOND),
        bridge=float(allowed / _SECOND),
        recovery=min(x.size / expected, 1.0) if expected else np.nan,
    )


def _peaks(x: Floats, begin: Any, end: Any) -> Any:
    """Place of the largest value of each run, the first of equal ones."""
    if not begin.size:
        return begin
    run = np.repeat(np.arange(begin.size), end - begin + 1)
    place = np.concatenate([[0], np.add.accumulate(end - begin + 1)[:-1]])
    inside = np.arange(run.size) - place[run] + begin[run]
    largest = np.maximum.reduceat(x[inside], place)
    at_peak = np.flatnonzero(x[inside] == largest[run])
    _runs, first = np.unique(run[at_peak], return_index=True)
    return inside[at_peak[first]]
