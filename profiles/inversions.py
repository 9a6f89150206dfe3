"""Temperature inversions: layers of a sounding in which the temperature rises with height."""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np

from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats, Words

SLOTS = 4  # inversions kept of a profile; more than that are told by their number alone
# Layers without an inversion that are thinner than this do not part one: Kahl, 1990: Int. J.
# Climatol., 10, 537-548 (from memory).
THINNEST_GAP = 100.0  # [m]
HIGHEST_BASE = 5000.0  # [m] about 500 hPa, the top of that climatology; keeps the stratosphere out
LEAST_STRENGTH = 0.5  # [K] a sonde's error (0.4 K: WMO-No. 8, from memory), rounded up
LEAST_DEPTH = 10.0  # [m] two levels of a fast sonde; common practice, no source


class Inversions(NamedTuple):
    """Inversions by profile and slot, in the order of their height; NaN and "" in empty slots."""

    base: Floats
    top: Floats
    strength: Floats
    kind: Words
    number: Floats


def inversions(z: Floats, temperature: Floats, usable: Bools) -> Inversions:
    """
    Find the layers in which the temperature rises with height.

    Parameters
    ----------
    z, temperature : array, shape (profile, level)
        Height above ground [m] and temperature [K].
    usable : array of bool, shape (profile, level)
        The levels to look at; their heights increase.

    Returns
    -------
    Inversions
        The four strongest of each profile, shape (profile, 4): base and top [m], strength (top
        minus base) [K], kind ("surface-based" where the base is the lowest level, else
        "elevated"), and the number, shape (profile,), of all there are.

    Notes
    -----
    Layers of rising temperature that are parted by less than 100 m belong together (Kahl 1990).
    An inversion begins below 5000 m, is at least 10 m deep and at least 0.5 K strong.

    Examples
    --------
    >>> z = np.array([[2.0, 50.0, 100.0, 800.0, 1000.0, 1500.0]])
    >>> t = np.array([[279.0, 281.0, 282.0, 276.0, 277.5, 274.0]])
    >>> found = inversions(z, t, np.isfinite(z))
    >>> found.base[0, :2].tolist(), found.strength[0, :2].tolist(), found.kind[0, :2].tolist()
    ([2.0, 800.0], [3.0, 1.5], ['surface-based', 'elevated'])
    """
    _count, zk, tk = compact(usable, z, temperature)
    with np.errstate(invalid="ignore"):
        rising = np.diff(tk, axis=1) > 0
        below = np.maximum.accumulate(np.where(rising, zk[:, 1:], -np.inf), axis=1)
        above = np.where(rising, zk[:, :-1], np.inf)[:, ::-1]
        above = np.minimum.accumulate(above, axis=1)[:, ::-1]
        inside = rising | (above - below < THINNEST_GAP)
    edge = np.zeros((len(zk), 1), dtype=bool)
    row, start = np.nonzero(inside & ~np.concatenate([edge, inside[:, :-1]], axis=1))
    _row, end = np.nonzero(inside & ~np.concatenate([inside[:, 1:], edge], axis=1))
    base, top = zk[row, start], zk[row, end + 1]
    strength = tk[row, end + 1] - tk[row, start]
    real = (strength >= LEAST_STRENGTH) & (top - base >= LEAST_DEPTH) & (base < HIGHEST_BASE)
    row, start, base, top, strength = (x[real] for x in (row, start, base, top, strength))
    count = np.bincount(row, minlength=len(zk))

    kept = _place_within(row, np.lexsort((-strength, row)), count) < SLOTS
    row, start, base, top, strength = (x[kept] for x in (row, start, base, top, strength))
    slot = _place_within(row, np.arange(row.size), np.minimum(count, SLOTS))
    empty = np.full((len(zk), SLOTS), np.nan)
    told = [empty.copy() for _ in range(3)]
    for into, values in zip(told, (base, top, strength), strict=True):
        into[row, slot] = values
    kind = np.full(empty.shape, "", dtype=object)
    kind[row, slot] = np.where(start == 0, "surface-based", "elevated").astype(object)
    return Inversions(told[0], told[1], told[2], kind, count.astype(float))


def _place_within(row: Any, order: Any, count: Any) -> Any:
    """Return for each entry its place within its row, when entries are taken in ``order``."""
    first = np.cumsum(count) - count
    place = np.empty(row.size, dtype=np.intp)
    place[order] = np.arange(row.size) - first[row[order]]
    return place
