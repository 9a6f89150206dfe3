r"""
Statistics over many profiles: of any quantity, by any class, with intervals and data recovery.

A quantity is an array over profiles (a turbine's veer, its shear exponent ...), a class one of
:mod:`backveer.profiles.classes`. Values that are not finite do not count, and what share of the
record did count stands beside every figure.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from backveer.profiles.block_bootstrap import Resampling
from backveer.profiles.classes import Classes
from backveer.profiles.labels import Floats, Labelled, Words, labels, variable
from backveer.profiles.stack import wind_components, wind_from_direction

if TYPE_CHECKING:
    import pandas

PERCENTILES = (1.0, 5.0, 10.0, 25.0, 50.0, 75.0, 90.0, 95.0, 99.0)

NO_VALUE = "no value in this class"
FEW_DAYS = "too few days or blocks of days for a confidence interval"
NO_RESAMPLING = "no confidence intervals were asked for"


class _Grouped(Labelled):
    """Answers with a row for each class."""

    def to_pandas(self, dimension: str | None = None) -> pandas.DataFrame:
        """
        Return a table with a row for each class.

        A second axis becomes columns, named by the value on the axis: ``percentile_5`` and so on.

        Raises
        ------
        ValueError
            For any other ``dimension`` than ``"group"``.
        """
        if dimension not in (None, "group"):
            raise ValueError(f"{type(self).__name__} has a row for each group, not {dimension!r}.")
        import pandas

        columns: dict[str, Any] = {}
        for name, label in labels(self).items():
            array = getattr(self, name)
            if label.dims == ("group",):
                columns[name] = array
            elif label.dims[0] == "group":
                for place, at in enumerate(getattr(self, label.dims[1])):
                    columns[f"{name}_{at:g}"] = array[:, place]
        return pandas.DataFrame(columns).set_index("group")


@dataclass(frozen=True, eq=False)
class Climate(_Grouped):
    """Statistics of one quantity in each class; the unit of the values is the quantity's."""

    group: Words = variable("", "group", "name of the class")
    count: Any = variable("1", "group", "values that the figures rest on")
    expected: Any = variable(
        "1", "group", "profiles of a complete record in this class, or the profiles that are in it"
    )
    recovery: Floats = variable("1", "group", "count over expected")
    mean: Floats = variable("", "group", "mean")
    mean_low: Floats = variable("", "group", "lower end of its confidence interval")
    mean_high: Floats = variable("", "group", "upper end of its confidence interval")
    deviation: Floats = variable("", "group", "standard deviation within the class")
    median: Floats = variable("", "group", "median")
    percentile_at: Floats = variable("", "percentile_at", "which percentiles")
    percentile: Floats = variable("", "group percentile_at", "percentiles")
    percentile_low: Floats = variable("", "group percentile_at", "lower ends of their intervals")
    percentile_high: Floats = variable("", "group percentile_at", "upper ends of their intervals")
    threshold_at: Floats = variable("", "threshold_at", "which thresholds")
    beyond: Floats = variable(
        "1", "group threshold_at", "share above a threshold; below it where it is negative"
    )
    beyond_low: Floats = variable("1", "group threshold_at", "lower ends of their intervals")
    beyond_high: Floats = variable("1", "group threshold_at", "upper ends of their intervals")
    wind_weighted_mean: Floats = variable("", "group", "mean weighted with the wind speed")
    wind_weighted_mean_low: Floats = variable("", "group", "lower end of its interval")
    wind_weighted_mean_high: Floats = variable("", "group", "upper end of its interval")
    energy_weighted_mean: Floats = variable(
        "", "group", "mean weighted with density and speed cubed"
    )
    energy_weighted_mean_low: Floats = variable("", "group", "lower end of its interval")
    energy_weighted_mean_high: Floats = variable("", "group", "upper end of its interval")
    why: Words = variable("", "group", "why a figure or its interval is missing")
    kind: str = "all"
    confidence: float = np.nan
    block_days: int = 0
    seed: int = 0


def climate(
    values: Floats,
    classes: Classes,
    speed: Floats | None = None,
    density: Floats | None = None,
    percentiles: Sequence[float] = PERCENTILES,
    thresholds: Sequence[float] = (),
    resampling: Resampling | None = None,
) -> Climate:
    r"""
    Statistics of a quantity in each class.

    Parameters
    ----------
    values : array, shape (profile,)
        The quantity. For directions see :func:`direction_climate`.
    classes
        What to sort by.
    speed : array, shape (profile,), optional
        Wind speed for the weighted means. [m s-1]
    density : array, shape (profile,), optional
        Air density; the same everywhere if left out. [kg m-3]
    percentiles
        From 0 to 100.
    thresholds
        For the shares beyond: above a positive one (or zero), below a negative one.
    resampling
        From :func:`backveer.profiles.block_bootstrap.resampling`; no intervals if left out.

    Returns
    -------
    Climate

    Raises
    ------
    ValueError
        For arrays of different length or percentiles outside 0 to 100.

    Notes
    -----
    Percentiles are straight lines between order statistics, the j-th of n at (j-1)/(n-1) (Hyndman,
    R. J., and Y. Fan, 1996: Am. Stat., 50, 361-365, type 7). The interval of a percentile is that
    of the share of values up to it, carried through the order statistics (Woodruff, R. S., 1952:
    J. Am. Stat. Assoc., 47, 635-646; from memory).

    Examples
    --------
    >>> two = Classes("side", ("left", "right"), np.array([0, 1, 0, 1, -1]))
    >>> told = climate(np.array([1.0, 5.0, 3.0, np.nan, 9.0]), two, thresholds=[2.0])
    >>> told.mean.tolist(), told.recovery.tolist(), told.beyond.tolist()
    ([2.0, 5.0], [1.0, 0.5], [[0.5], [1.0]])
    """
    values = np.asarray(values, dtype=float)
    groups = len(classes)
    wanted = np.asarray(percentiles, dtype=float)
    limits = np.asarray(thresholds, dtype=float)
    _check(values, classes, wanted, speed, density)
    group = np.where(np.isfinite(values), classes.index, -1)
    safe = np.where(group >= 0, values, 0.0)
    count = _sum(group, groups)
    order, start = _sorted(values, group, groups)
    ordered = values[order]
    at = _percentiles(ordered, start, count, np.append(wanted, 50.0))
    with np.errstate(invalid="ignore"):
        up_to = [(safe <= at[group, place]).astype(float) for place in range(wanted.size)]
    beyond = [(safe < x if x < 0 else safe > x).astype(float) for x in limits]
    # All in one: resampling costs by the call.
    found, low, high = _weighted([safe, *up_to, *beyond], None, group, groups, resampling)
    mean, share, shares = found[0], found[1 : 1 + wanted.size], found[1 + wanted.size :]
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        spread = np.where(group >= 0, safe - mean[group], 0.0)
        deviation = np.sqrt(_sum(group, groups, spread**2) / np.where(count > 1, count - 1, np.nan))
    ends = [
        _percentiles(
            ordered,
            start,
            count,
            # Where many profiles share the value, more than the wanted share lies up to it.
            wanted + 100.0 * (end[1 : 1 + wanted.size] - share).T,
        )
        for end in (low, high)
    ]
    by_wind, by_energy = _weights(speed, density, values.shape)
    wind = [x[0] for x in _weighted([safe], by_wind, group, groups, resampling)]
    energy = [x[0] for x in _weighted([safe], by_energy, group, groups, resampling)]
    expected = _expected(classes)
    with np.errstate(invalid="ignore", divide="ignore"):
        recovery = np.where(expected > 0, count / expected, np.nan)
    return Climate(
        group=np.array(classes.names, dtype=object),
        count=count.astype(int),
        expected=expected,
        recovery=recovery,
        mean=mean,
        mean_low=low[0],
        mean_high=high[0],
        deviation=deviation,
        median=at[:, -1],
        percentile_at=wanted,
        percentile=at[:, :-1],
        percentile_low=ends[0],
        percentile_high=ends[1],
        threshold_at=limits,
        beyond=shares.T,
        beyond_low=low[1 + wanted.size :].T,
        beyond_high=high[1 + wanted.size :].T,
        wind_weighted_mean=wind[0],
        wind_weighted_mean_low=wind[1],
        wind_weighted_mean_high=wind[2],
        energy_weighted_mean=energy[0],
        energy_weighted_mean_low=energy[1],
        energy_weighted_mean_high=energy[2],
        why=_why(count, low[0], resampling),
        kind=classes.kind,
        confidence=np.nan if resampling is None else resampling.confidence,
        block_days=0 if resampling is None else resampling.block_days,
        seed=0 if resampling is None else resampling.seed,
    )


@dataclass(frozen=True, eq=False)
class DirectionClimate(_Grouped):
    """Statistics of a direction in each class."""

    group: Words = variable("", "group", "name of the class")
    count: Any = variable("1", "group", "values that the figures rest on")
    expected: Any = variable(
        "1", "group", "profiles of a complete record in this class, or the profiles that are in it"
    )
    recovery: Floats = variable("1", "group", "count over expected")
    mean_direction: Floats = variable(
        "degree", "group", "direction of the mean of unit vectors", "wind_from_direction"
    )
    wind_weighted_mean_direction: Floats = variable(
        "degree", "group", "direction of the mean wind vector", "wind_from_direction"
    )
    concentration: Floats = variable("1", "group", "length of the mean of unit vectors, 0 to 1")
    steadiness: Floats = variable(
        "1", "group", "length of the mean wind vector over the mean speed"
    )
    deviation: Floats = variable("degree", "group", "circular standard deviation")
    kind: str = "all"


def direction_climate(
    direction: Floats, classes: Classes, speed: Floats | None = None
) -> DirectionClimate:
    r"""
    Statistics of a direction in each class, as vectors.

    Parameters
    ----------
    direction : array, shape (profile,)
        Where the wind blows from. [degree]
    classes
        What to sort by.
    speed : array, shape (profile,), optional
        Wind speed. [m s-1]

    Returns
    -------
    DirectionClimate
        A mean direction is NaN where the vectors cancel, to a part in a thousand million.

    Notes
    -----
    The circular standard deviation is :math:`\sqrt{-2 \ln R}`, R the length of the mean unit vector
    (Mardia, K. V., 1972: Statistics of Directional Data. Academic Press; from memory).

    Examples
    --------
    >>> one = Classes("all", ("all",), np.zeros(3, dtype=int))
    >>> direction_climate(np.array([350.0, 10.0, 30.0]), one).mean_direction.round(6).tolist()
    [10.0]
    """
    direction = np.asarray(direction, dtype=float)
    _check(direction, classes, np.array([]), speed, None)
    groups = len(classes)
    group = np.where(np.isfinite(direction), classes.index, -1)
    count = _sum(group, groups)
    east, north = wind_components(np.ones(direction.shape), np.where(group >= 0, direction, 0.0))
    length, mean_direction = _vector(group, groups, east, north, None)
    by_wind, _energy = _weights(speed, None, direction.shape)
    steadiness, wind_direction = _vector(group, groups, east, north, by_wind)
    with np.errstate(invalid="ignore", divide="ignore"):
        deviation = np.degrees(np.sqrt(-2.0 * np.log(np.minimum(length, 1.0))))
        expected = _expected(classes)
        recovery = np.where(expected > 0, count / expected, np.nan)
    return DirectionClimate(
        group=np.array(classes.names, dtype=object),
        count=count.astype(int),
        expected=expected,
        recovery=recovery,
        mean_direction=mean_direction,
        wind_weighted_mean_direction=wind_direction,
        concentration=length,
        steadiness=steadiness,
        deviation=np.where(length > 0, deviation, np.nan),
        kind=classes.kind,
    )


def _check(values: Floats, classes: Classes, percentiles: Floats, *weights: Floats | None) -> None:
    for name, array in zip(("values", "speed", "density"), (values, *weights), strict=True):
        if array is not None and np.shape(array) != classes.index.shape:
            raise ValueError(
                f"{name} has shape {np.shape(array)}, the classes {classes.index.shape}. "
                f"Give one value for each profile."
            )
    if not ((percentiles >= 0) & (percentiles <= 100)).all():
        raise ValueError("percentiles lie between 0 and 100. Correct the list.")


def _sum(group: Any, groups: int, weight: Any = None) -> Floats:
    """Sum over each group; -1 is none."""
    sums = np.bincount(group + 1, weight, minlength=groups + 1)
    return sums[1:].astype(float)


def _expected(classes: Classes) -> Any:
    if classes.expected is not None:
        return np.asarray(classes.expected)
    return _sum(classes.index, len(classes)).astype(int)


def _sorted(values: Floats, group: Any, groups: int) -> tuple[Any, Any]:
    """Order by group and, within each, by value; and where each group starts, ``none`` last."""
    order = np.argsort(values, kind="stable")
    # A stable sort of small whole numbers is a radix sort: fast, and the values stay in order.
    small = np.where(group < 0, groups, group).astype(np.uint16)
    order = order[np.argsort(small[order], kind="stable")]
    count = np.bincount(small, minlength=groups + 1)
    return order, np.concatenate([[0], np.add.accumulate(count)[:groups]])


def _percentiles(ordered: Floats, start: Any, count: Floats, wanted: Floats) -> Floats:
    """Percentiles of each group, shape (group, percentile); ``wanted`` may differ by group."""
    share = np.broadcast_to(wanted, (len(count), wanted.shape[-1])) / 100.0
    there = (count > 0)[:, np.newaxis] & np.isfinite(share)
    rank = np.where(there, np.clip(share, 0.0, 1.0), 0.0) * np.maximum(count - 1, 0)[:, np.newaxis]
    low = np.floor(rank).astype(int)
    top = np.maximum(count - 1, 0).astype(int)[:, np.newaxis]
    first = np.minimum(start[: len(count)], max(ordered.size - 1, 0))[:, np.newaxis]
    if not ordered.size:
        return np.full(share.shape, np.nan)
    last = ordered.size - 1
    below = ordered[np.minimum(first + low, last)]
    above = ordered[np.minimum(first + np.minimum(low + 1, top), last)]
    with np.errstate(invalid="ignore", over="ignore"):
        return np.where(there, below + (rank - low) * (above - below), np.nan)


def _weights(speed: Any, density: Any, shape: tuple[int, ...]) -> tuple[Any, Any]:
    """Weights by wind and by energy, NaN where they are not known."""
    if speed is None:
        return np.full(shape, np.nan), np.full(shape, np.nan)
    speed = np.asarray(speed, dtype=float)
    with np.errstate(over="ignore", invalid="ignore", under="ignore"):
        return speed, speed**3 * (1.0 if density is None else np.asarray(density, dtype=float))


def _weighted(
    quantities: Sequence[Floats],
    weight: Any,
    group: Any,
    groups: int,
    resampling: Resampling | None,
) -> tuple[Floats, Floats, Floats]:
    """
    Mean of each quantity in each group and the ends of its interval, shape (quantity, group).

    A NaN weight leaves a profile out.
    """
    if weight is None:
        weight = np.ones(group.shape)
    use = np.where(np.isfinite(weight) & (weight >= 0), group, -1)
    weight = np.where(use >= 0, weight, 0.0)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        sums = np.array([_sum(use, groups, weight * x) for x in quantities])
        mean = sums / _sum(use, groups, weight)
        mean = np.where(np.isfinite(mean), mean, np.nan)
        if resampling is None:
            return mean, np.full(mean.shape, np.nan), np.full(mean.shape, np.nan)
        above = np.stack([resampling.by_day(use, groups, weight * x) for x in quantities], axis=1)
        below = resampling.by_day(use, groups, weight)[:, np.newaxis, :]
        return mean, *resampling.interval(above, below)


def _vector(group: Any, groups: int, east: Floats, north: Floats, weight: Any) -> tuple[Any, Any]:
    """Length of the mean vector over the mean length, and the direction it comes from."""
    (u, v), _low, _high = _weighted([east, north], weight, group, groups, None)
    length = np.hypot(u, v)
    return length, np.where(length > 1e-9, wind_from_direction(u, v), np.nan)


def _why(count: Floats, low: Floats, resampling: Resampling | None) -> Words:
    interval = NO_RESAMPLING if resampling is None else FEW_DAYS
    why = np.where(count == 0, NO_VALUE, np.where(np.isnan(low), interval, ""))
    return why.astype(object)
