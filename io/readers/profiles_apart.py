"""
Which rows of a long table are one profile, and in which order its levels stand.

Profiles are told apart by a launch number, a time or a station; otherwise by the height (or the
pressure) starting again.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.errors import MissingColumn
from backveer.io.readers.levels import Array

Indices = NDArray[np.intp]


def _codes(values: NDArray[Any]) -> tuple[Indices, int]:
    """Return a number for each different value, in the order of first appearance."""
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
        if several > 1 and not _runs_on(axis, codes, group):
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
    stays there for the next level: a single bad height is no beginning.
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
    back = (step < 0) & (here < 0.2 * reached) & (after < 0.5 * reached)
    if not back.any():
        return None
    starts = np.zeros(axis.size, dtype=bool)
    starts[finite[1:][back]] = True
    return starts


def told_apart(axis: Array | None, group: Indices | None, header: tuple[str, ...]) -> None:
    """Refuse rows that repeat one height again and again with nothing to tell them apart."""
    if axis is None or axis.size < 6:
        return
    there = np.isfinite(axis)
    if group is None:
        step = np.diff(axis)
        if (step > 0).all() or (step < 0).all():
            return
        different = np.unique(axis[there]).size
    else:
        _, codes = np.unique(axis[there], return_inverse=True)
        different = np.unique(group[there] * (int(codes.max(initial=0)) + 1) + codes).size
    if different < 0.5 * np.count_nonzero(there):
        raise MissingColumn(
            "heights repeat, and nothing tells profiles apart",
            'Name what does with --column time="HEADER", launch="HEADER" or station="HEADER"; '
            f"the columns are: {', '.join(header)}",
        )


def places(
    axis: Array | None, group: Indices | None
) -> tuple[tuple[Any, Any], Indices, tuple[int, int]]:
    """Return the place (profile, level) of each row, lowest level first, and first rows."""
    if group is None:
        count = 0 if axis is None else axis.size
        level = np.arange(count)
        if axis is not None and _descends(axis):
            level = level[::-1]
        return (np.zeros(count, dtype=np.intp), level), np.zeros(1, dtype=np.intp), (1, count)
    order = np.argsort(group, kind="stable")
    sizes = np.bincount(group)
    begin = np.concatenate([[0], np.cumsum(sizes)[:-1]])
    level = np.empty(group.size, dtype=np.intp)
    level[order] = np.arange(group.size) - np.repeat(begin, sizes)
    if axis is not None:
        s, g = axis[order], group[order]
        with np.errstate(invalid="ignore"):
            sign = np.where(g[1:] == g[:-1], np.sign(np.diff(s)), 0.0)
        total = np.bincount(g[1:], weights=np.nan_to_num(sign), minlength=sizes.size)
        down = total < 0
        if down.any():
            level = np.where(down[group], sizes[group] - 1 - level, level)
    return (group, level), order[begin], (int(sizes.size), int(sizes.max()))


def _descends(axis: Array) -> bool:
    there = axis[np.isfinite(axis)]
    return bool(there.size > 1 and np.sum(np.sign(np.diff(there))) < 0)
