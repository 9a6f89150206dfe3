"""
Which rows of a long table are one profile, and in which order its levels stand.

Profiles are told apart by a launch number, a time or a station; otherwise by the height (or the
pressure) starting again.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.errors import MissingColumn
from backveer.io.readers.levels import Array
from backveer.profiles.level_order import increasing

Indices = NDArray[np.intp]


def _codes(values: NDArray[Any]) -> tuple[Indices, int]:
    """Return a number for each different value, in the order of first appearance."""
    begins = np.flatnonzero(np.asarray(values[1:] != values[:-1], dtype=bool)) + 1
    if 4 * begins.size < values.size:
        # Rows of one profile follow one another: one row of each is enough.
        begins = np.concatenate([np.zeros(1, dtype=np.intp), begins])
        of_runs, several = _codes_of(values[begins])
        return np.repeat(of_runs, np.diff(np.append(begins, values.size))), several
    return _codes_of(values)


def _codes_of(values: NDArray[Any]) -> tuple[Indices, int]:
    if values.dtype == object:
        number = {value: place for place, value in enumerate(dict.fromkeys(values.tolist()))}
        return np.array([number[value] for value in values.tolist()], dtype=np.intp), len(number)
    _, first, inverse = np.unique(values, return_index=True, return_inverse=True)
    rank = np.empty(first.size, dtype=np.intp)
    rank[np.argsort(first, kind="stable")] = np.arange(first.size)
    return rank[inverse.reshape(-1)], int(first.size)


def groups(
    axis: Array | None, times: NDArray[Any] | None, keys: dict[str, Any], count: int
) -> tuple[Indices | None, bool]:
    """Return the profile of each row, None where there is one, and whether a key told them."""
    group: Indices | None = None
    keyed = False
    for name in ("station", "source", "launch"):
        if name in keys:
            codes, several = _codes(keys[name])
            if several > 1:
                group = codes if group is None else _codes(group * several + codes)[0]
                keyed = keyed or name == "launch"
    if times is not None and not keyed:
        codes, several = _codes(times)
        if several > 1 and (_same_heights(axis, several) or not _runs_on(axis, codes, group)):
            group = codes if group is None else _codes(group * several + codes)[0]
            keyed = True
    if not keyed and axis is not None:
        starts = _restarts(axis)
        if starts is not None:
            part: Indices = np.cumsum(starts).astype(np.intp)
            group = part if group is None else _codes(group * (int(part[-1]) + 1) + part)[0]
    if group is not None and int(group.max(initial=0)) == 0:
        group = None
    return group, keyed


def _same_heights(axis: Array | None, several: int) -> bool:
    """Say whether so many profiles would share one set of heights, each with most of them."""
    if axis is None:
        return False
    there = axis[np.isfinite(axis)]
    each = there.size / several
    return each >= 2.0 and np.unique(there).size <= 1.5 * each


def _runs_on(axis: Array | None, codes: Indices, group: Indices | None) -> bool:
    """Say whether times change while the height goes on: each level then has its own time."""
    if axis is None:
        return False
    change = codes[1:] != codes[:-1]
    if group is not None:
        change &= group[1:] == group[:-1]
    with np.errstate(invalid="ignore"):
        step = np.diff(axis)
        steps = step[change & np.isfinite(step)]
    if steps.size == 0:
        return True
    rising, falling = np.count_nonzero(steps > 0), np.count_nonzero(steps < 0)
    # A new profile jumps against the sense of the levels within it.
    within = step[~change & np.isfinite(step)]
    if within.size > steps.size:
        sense = np.sign(np.sum(np.sign(within)))
        against = falling if sense > 0 else rising
        return bool(against < 0.5 * steps.size and rising + falling > 0.5 * steps.size)
    return bool(max(rising, falling) > 0.6 * steps.size)


def _restarts(axis: Array) -> NDArray[np.bool_] | None:
    """
    Say at which rows the height begins again; None if it never does.

    A profile begins where the height falls back into the lowest fifth of what was reached, and
    stays there for the next level: a single bad height is no beginning. Where the same heights
    come again and again, as at a mast, the next level may be the topmost.
    """
    finite = np.flatnonzero(np.isfinite(axis))
    if finite.size < 4:
        return None
    s = axis[finite]
    step = np.diff(s)
    if (step >= 0).all() or (step <= 0).all():
        return None
    if np.count_nonzero(step < 0) > np.count_nonzero(step > 0):
        s = -s
        step = -step
    low = float(s.min())
    reached = s[:-1] - low
    here = s[1:] - low
    after = np.append(here[1:], here[-1])
    back = (step < 0) & (here < 0.2 * reached)
    few = np.unique(s).size <= 0.5 * s.size
    if not few:
        back &= after < 0.5 * reached
    if not back.any():
        return None
    starts = np.zeros(axis.size, dtype=bool)
    starts[finite[1:][back]] = True
    return starts


def told_apart(
    axis: Array | None, group: Indices | None, keyed: bool, header: tuple[str, ...]
) -> None:
    """Refuse rows that repeat one height again and again with nothing to tell them apart."""
    if axis is None or axis.size < 6:
        return
    with np.errstate(invalid="ignore"):
        step = np.diff(axis)
    if group is not None:
        same = group[1:] == group[:-1]
        whole = np.count_nonzero(same) == same.size - int(group.max())  # each in one piece
        step = step[same]
    rising, falling = np.count_nonzero(step > 0), np.count_nonzero(step < 0)
    if max(rising, falling) == step.size and (group is None or whole):
        return
    # Where the height starts again it goes one way in between.
    still = np.count_nonzero(step == 0)
    one_way = min(rising, falling) + still <= 0.25 * (rising + falling + still)
    mixed = group is not None and not keyed and not one_way
    there = np.isfinite(axis)
    if group is None:
        different = np.unique(axis[there]).size
    else:
        _, codes = np.unique(axis[there], return_inverse=True)
        different = np.unique(group[there] * (int(codes.max(initial=0)) + 1) + codes).size
    if mixed or different < 0.5 * np.count_nonzero(there):
        raise MissingColumn(
            "heights repeat, and nothing tells profiles apart",
            'Name what does with --column time="HEADER", launch="HEADER" or station="HEADER"; '
            f"the columns are: {', '.join(header)}",
        )


class Places(NamedTuple):
    """
    Where the rows of a table stand in the stack.

    Attributes
    ----------
    of_row
        Profile and level of each row, lowest level first.
    first
        First row of each profile.
    shape
        Numbers of profiles and levels.
    put_in_order
        How many profiles had their levels out of order.
    """

    of_row: tuple[Any, Any]
    first: Indices
    shape: tuple[int, int]
    put_in_order: int


def places(axis: Array, group: Indices | None) -> Places:
    """
    Return the place of each row.

    Profiles from the top down are turned round. Levels in the order of their lines are left so, for
    a balloon may sink for a while and the quality check knows; levels that stand in an order of
    another kind (as words are sorted, significant levels after standard ones) are sorted.
    """
    if group is None:
        level = np.arange(axis.size)
        with np.errstate(invalid="ignore"):
            step = np.diff(axis)
            up, down = np.count_nonzero(step > 0), np.count_nonzero(step < 0)
        if down > up:
            level = level[::-1]
        of_row: tuple[Any, Any] = (np.zeros(axis.size, dtype=np.intp), level)
        shape, moved = (1, int(axis.size)), 0
        if min(up, down) > 0:
            of_row, moved = _in_order(axis, of_row, shape)
        return Places(of_row, np.zeros(1, dtype=np.intp), shape, moved)
    order = np.argsort(group, kind="stable")
    sizes = np.bincount(group)
    begin = np.concatenate([[0], np.cumsum(sizes)[:-1]])
    level = np.empty(group.size, dtype=np.intp)
    level[order] = np.arange(group.size) - np.repeat(begin, sizes)
    s, g = axis[order], group[order]
    with np.errstate(invalid="ignore"):
        sign = np.nan_to_num(np.where(g[1:] == g[:-1], np.sign(np.diff(s)), 0.0))
    total = np.bincount(g[1:], weights=sign, minlength=sizes.size)
    turned = total < 0
    if turned.any():
        level = np.where(turned[group], sizes[group] - 1 - level, level)
    shape = (int(sizes.size), int(sizes.max()))
    of_row, moved = (group, level), 0
    if (sign < 0).any() and (sign > 0).any():
        of_row, moved = _in_order(axis, of_row, shape)
    return Places(of_row, order[begin], shape, moved)


def _in_order(
    axis: Array, of_row: tuple[Any, Any], shape: tuple[int, int]
) -> tuple[tuple[Any, Any], int]:
    """Sort the levels of the profiles that stand out of order, and say how many there were."""
    grid = np.full(shape, np.nan)
    grid[of_row] = axis
    with np.errstate(invalid="ignore"):
        falls = np.count_nonzero(np.diff(grid, axis=1) < 0, axis=1)
    rows = np.flatnonzero(falls)
    if not rows.size:
        return of_row, 0
    finite = np.count_nonzero(np.isfinite(grid), axis=1)
    if shape[0] == 1 or not _same_heights(axis, shape[0]):
        # A few falls that cost many levels: blocks or words. A balloon that sinks falls at each.
        lost = finite[rows] - np.count_nonzero(increasing(grid[rows]), axis=1)
        rows = rows[(lost > np.maximum(2, 0.1 * finite[rows])) & (falls[rows] <= 0.5 * lost)]
    if not rows.size:
        return of_row, 0
    level = np.broadcast_to(np.arange(shape[1]), shape).copy()
    rank = np.empty((rows.size, shape[1]), dtype=np.intp)
    sorting = np.argsort(grid[rows], axis=1, kind="stable")
    np.put_along_axis(rank, sorting, np.arange(shape[1])[np.newaxis], axis=1)
    level[rows] = rank
    return (of_row[0], level[of_row]), int(rows.size)
