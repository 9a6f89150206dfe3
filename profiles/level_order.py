"""
The order of the levels: which heights increase, and levels that share a height.

Heights that fall back (a sonde in a downdraught, a telemetry error, a line out of place) must not
cost the levels above them, so the rule is not "above the level before" but "part of the longest
increasing run": the fewest levels are left out that leave the rest increasing.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from backveer.profiles.flags import BIT
from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats, labels
from backveer.profiles.stack import Stack


def increasing(z: Floats) -> Bools:
    """
    Choose the longest run of levels whose heights increase.

    Parameters
    ----------
    z : array, shape (profile, level)
        Heights; NaN where there is none. [m]

    Returns
    -------
    kept : array of bool, shape (profile, level)
        True for the levels of the longest strictly increasing subsequence. Of several that are
        equally long, the one that keeps the earlier levels.

    Notes
    -----
    One height that is far too high (or too low) costs that level alone, and the descent after a
    burst costs the descent. Found in order n log n by patience sorting [1]_, with a loop over
    levels; profiles whose heights increase anyway take no part.

    References
    ----------
    .. [1] Fredman, M. L., 1975: On computing the length of longest increasing subsequences.
           Discrete Math., 11, 29-35.

    Examples
    --------
    >>> increasing(np.array([[10.0, 200.0, 30.0, np.nan, 30.0, 40.0]])).tolist()
    [[True, False, True, False, False, True]]
    """
    z = np.asarray(z, dtype=float)
    kept = np.isfinite(z)
    _count, heights, level = compact(kept, z, np.broadcast_to(np.arange(z.shape[-1]), z.shape))
    with np.errstate(invalid="ignore"):
        disordered = np.flatnonzero((np.diff(heights, axis=-1) <= 0).any(axis=-1))
    if disordered.size:
        chosen = _longest_run(heights[disordered])
        kept[disordered] = False
        row, column = np.nonzero(chosen)
        kept[disordered[row], level[disordered[row], column]] = True
    return kept


def _longest_run(z: Floats) -> Bools:
    """Mark the longest increasing subsequence of each row; NaN only at the ends of the rows."""
    before = _longest_ending_at(z)
    after = _longest_ending_at(-z[:, ::-1])[:, ::-1]
    longest = before.max(axis=-1)
    # A level lies on some longest run if the runs that end and start there make one together. From
    # any such level a next one can be reached, so taking the first that fits never leads astray.
    candidate = (before > 0) & (before + after - 1 == longest[:, np.newaxis])
    chosen = np.zeros(z.shape, dtype=bool)
    rank, height = np.zeros(len(z), dtype=int), np.full(len(z), -np.inf)
    for j in range(z.shape[1]):
        take = candidate[:, j] & (before[:, j] == rank + 1) & (z[:, j] > height)
        chosen[:, j] = take
        rank += take
        height = np.where(take, z[:, j], height)
    return chosen


def _longest_ending_at(z: Floats) -> np.ndarray[tuple[int, ...], np.dtype[np.int_]]:
    """Return the length of the longest increasing run that ends at each level, 0 where NaN."""
    rows, levels = np.arange(z.shape[0]), z.shape[1]
    lowest_end = np.full((z.shape[0], levels + 1), np.inf)  # of a run of each length so far
    lowest_end[:, 0] = -np.inf
    longest = np.zeros(z.shape[0], dtype=int)
    length = np.zeros(z.shape, dtype=int)
    for j in range(levels):
        low, high = np.zeros_like(longest), longest.copy()
        for _ in range((j + 1).bit_length()):
            middle = (low + high + 1) // 2
            fits = lowest_end[rows, middle] < z[:, j]
            low, high = np.where(fits, middle, low), np.where(fits, high, middle - 1)
            high = np.maximum(low, high)
        there = np.isfinite(z[:, j])
        length[there, j] = low[there] + 1
        lowest_end[rows[there], low[there] + 1] = z[there, j]
        longest = np.maximum(longest, length[:, j])
    return length


def is_given(stack: Stack, name: str) -> bool:
    """Say whether any level has a value of this variable, be it infinite; cheap where none has."""
    array = getattr(stack, name)
    if array.size and not any(array.strides):
        array = array[:1, :1]
    return not bool(np.isnan(array).all())


def merge_duplicates(stack: Stack, good: Mapping[str, Bools]) -> Stack:
    """
    Replace levels that follow each other at the same height by their mean.

    Parameters
    ----------
    stack
        Profiles with their heights in any order.
    good
        By name of the variable, where its values are within their limits: other values take no
        part in a mean, unless there are no better ones. Both wind components have the same entry,
        so that their mean is that of the vector.

    Returns
    -------
    Stack
        The merged level stands at the place of the first and carries ``duplicate_height``; the
        emptied places are gone, and the padding at the end is longer. The same stack where there
        are no duplicates.
    """
    z = stack.height
    finite = np.isfinite(z)
    place = np.broadcast_to(np.arange(z.shape[1]), z.shape)
    # Height of the last level that has one, so that a missing height between two equal ones is
    # no reason to keep them apart.
    last = np.maximum.accumulate(np.where(finite, place, -1), axis=1)
    previous = np.concatenate([np.full((len(z), 1), -1), last[:, :-1]], axis=1)
    same = finite & (previous >= 0)
    same &= np.take_along_axis(z, np.maximum(previous, 0), axis=1) == z
    rows = np.flatnonzero(same.any(axis=1))
    if not rows.size:
        return stack

    same, finite, shape = same[rows], finite[rows], (len(rows), z.shape[1])
    place = place[rows]
    first = np.maximum.accumulate(np.where(finite & ~same, place, 0), axis=1)
    group = (
        np.where(same, first, place) + np.arange(len(rows))[:, np.newaxis] * z.shape[1]
    ).ravel()
    size = np.bincount(group, minlength=same.size).reshape(shape)
    order = np.argsort(same, axis=1, kind="stable")  # the emptied places go to the end
    beyond = np.take_along_axis(same, order, axis=1)
    changed = {}
    for name, label in labels(stack).items():
        if label.dims != ("profile", "level") or name == "level_flag" or not is_given(stack, name):
            continue
        whole = np.array(getattr(stack, name))
        there = np.isfinite(whole[rows])
        better = there & good[name][rows] if name in good else there
        any_better = np.bincount(group, better.ravel(), minlength=same.size)[group] > 0
        mean = _group_mean(whole[rows], np.where(any_better.reshape(shape), better, there), group)
        merged = np.where(size > 1, mean, whole[rows])
        whole[rows] = np.where(beyond, np.nan, np.take_along_axis(merged, order, axis=1))
        changed[name] = whole
    flag = np.array(stack.level_flag)
    joined = np.zeros(same.size, dtype=flag.dtype)
    np.bitwise_or.at(joined, group, flag[rows].ravel())
    joined |= np.where(size.ravel() > 1, np.uint32(BIT["duplicate_height"]), np.uint32(0))
    flag[rows] = np.where(beyond, 0, np.take_along_axis(joined.reshape(shape), order, axis=1))
    return stack.replace(**changed, level_flag=flag)


def _group_mean(
    x: Floats, used: Bools, group: np.ndarray[tuple[int, ...], np.dtype[np.int_]]
) -> Floats:
    """Return the mean of each group at its first level; bincount adds in the order of levels."""
    number = np.bincount(group, used.ravel(), minlength=x.size)
    total = np.bincount(group, np.where(used, x, 0.0).ravel(), minlength=x.size)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean: Floats = (total / number).reshape(x.shape)
    return mean
