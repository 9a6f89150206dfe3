"""Several profiles in time: how the shear changes, and how long a criterion has been met."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from backveer.profiles.labels import Bools, Floats, Times

#: The trend is that of the last hours: what a forecaster can still act on. Our own choice.
TREND_HOURS = 3.0
#: Profiles farther apart than this many usual intervals do not continue a run. Our own choice.
LARGEST_GAP = 3.0


@dataclass(frozen=True)
class ShearSeries:
    """
    What a series of profiles of one place says.

    Attributes
    ----------
    count
        Profiles with a time.
    first, last
        Times of the earliest and the latest.
    trend, trend_error
        Of the strongest shear over the last :data:`TREND_HOURS` hours, and its standard error, from
        a straight line; NaN with fewer than four profiles. [s-1 per hour]
    sense
        "rising", "falling", "steady" (smaller than twice its error), or empty.
    run, run_since
        Number of profiles up to the latest that all meet a criterion, and the time of the first.
    longest, longest_hours
        The longest such run: profiles, and hours from its first to its last.
    share
        Of the profiles, those that meet a criterion.
    why
        Why there is no trend.
    """

    count: int
    first: np.datetime64
    last: np.datetime64
    trend: float
    trend_error: float
    sense: str
    run: int
    run_since: np.datetime64
    longest: int
    longest_hours: float
    share: float
    why: str


def shear_series(time: Times, shear: Floats, met: Bools) -> ShearSeries:
    """
    Tell the trend and the persistence of the shear at one place.

    Parameters
    ----------
    time : array of datetime64, shape (profile,)
        In any order; profiles without a time are left out.
    shear : array, shape (profile,)
        Strongest shear, NaN where there is none. [s-1]
    met : array of bool, shape (profile,)
        Some criterion is met.

    Examples
    --------
    >>> time = np.datetime64("2031-05-14T00:00", "ns") + np.arange(6) * np.timedelta64(10, "m")
    >>> met = np.array([True, False, True, True, True, True])
    >>> said = shear_series(time, np.linspace(0.01, 0.06, 6), met)
    >>> said.run, said.longest, said.sense
    (4, 4, 'rising')
    """
    known = ~np.isnat(time)
    order = np.argsort(time[known], kind="stable")
    time, shear, met = time[known][order], shear[known][order], met[known][order]
    count = int(time.size)
    never = np.datetime64("NaT", "ns")
    if count == 0:
        return ShearSeries(
            0, never, never, np.nan, np.nan, "", 0, never, 0, 0.0, np.nan, "no profile has a time"
        )
    hours = (time - time[-1]) / np.timedelta64(1, "h")
    trend, error, why = _trend(hours, shear)
    begins, lengths = _runs(hours, met)
    last_run = int(lengths[-1]) if lengths.size and begins[-1] + lengths[-1] == count else 0
    longest = int(lengths.max(initial=0))
    ends = begins + lengths - 1
    long_hours = float((hours[ends] - hours[begins]).max(initial=0.0))
    if why:
        sense = ""
    elif abs(trend) <= 2 * error:
        sense = "steady"
    else:
        sense = "rising" if trend > 0 else "falling"
    return ShearSeries(
        count=count,
        first=time[0],
        last=time[-1],
        trend=trend,
        trend_error=error,
        sense=sense,
        run=last_run,
        run_since=time[count - last_run] if last_run else never,
        longest=longest,
        longest_hours=long_hours,
        share=float(np.count_nonzero(met)) / count,
        why=why,
    )


def _trend(hours: Floats, shear: Floats) -> tuple[float, float, str]:
    recent = (hours >= -TREND_HOURS * (1 + 1e-9)) & np.isfinite(shear)
    x, y = hours[recent], shear[recent]
    if x.size < 4 or x[0] == x[-1]:
        return np.nan, np.nan, f"fewer than four profiles in the last {TREND_HOURS:.0f} hours"
    x = x - x.mean()
    square = float(np.sum(x * x))
    slope = float(np.sum(x * y)) / square
    rest = y - y.mean() - slope * x
    return slope, float(np.sqrt(np.sum(rest * rest) / (x.size - 2) / square)), ""


def _runs(hours: Floats, met: Bools) -> tuple[np.ndarray, np.ndarray]:
    """Begin and length of each run of profiles that are met, one close upon the other."""
    step = np.diff(hours)
    usual = float(np.median(step)) if step.size else 0.0
    joined = np.concatenate([[False], met[:-1] & met[1:] & (step <= LARGEST_GAP * usual)])
    begins = np.flatnonzero(met & ~joined)
    ends = np.flatnonzero(met & ~np.concatenate([joined[1:], [False]]))
    return begins, ends - begins + 1
