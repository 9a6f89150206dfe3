"""
Spikes: a single level (or two) that its neighbours on both sides contradict.

What nature does in one step must pass: the nose of a jet, a front, an inversion and the shear of
the surface layer all continue the profile on at least one side. So a level is judged by the best
of three predictions (from both neighbours, from the two below, from the two above), and only a
level that none of them foresees is a spike.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats

FEWEST_LEVELS = 4  # with three levels nothing tells a spike from a jet's nose
PASSES = 4  # rounds of "take out the worst and look again"; neighbours of a spike look bad too
END_FACTOR = 2.0  # an end is predicted from one side only, so it takes twice as much


def spikes(
    z: Floats,
    components: tuple[Floats, ...],
    floor: float,
    rate: float,
    factor: float,
    friction: bool,
) -> Bools:
    r"""
    Find the levels that no prediction from their neighbours foresees.

    Parameters
    ----------
    z : array, shape (profile, level)
        Heights, increasing over the levels where everything is finite. [m]
    components : tuple of arrays, shape (profile, level)
        The components of a vector (or a single scalar), in one unit; NaN where missing.
    floor
        Departure that is always allowed. [unit of the components]
    rate
        What is allowed on top for each metre to the nearest neighbour. [unit per m]
    factor
        How many times the typical departure of the profile is allowed.
    friction
        Judge the lowest level where it is stronger than the level above; near the ground friction
        weakens the wind by any amount. False: the lowest level is never judged.

    Returns
    -------
    spike : array of bool, shape (profile, level)

    Notes
    -----
    With the departure :math:`d_k` = min over the predictions of \|x_k - predicted\| the rule is

    .. math:: d_k > \max(a + b \, \Delta z_k,\; c \, \tilde d)

    with floor a, rate b, factor c, distance to the nearest neighbour :math:`\Delta z_k` and the
    median :math:`\tilde d` over the profile of the departure (or the step to a neighbour, where
    that is smaller). The highest level, and the lowest, need twice as much. Of neighbours that all
    break the rule the worst goes first, and the rest are judged without it.
    The rule is rotation invariant: a vector departs by its vector difference. Common practice,
    no source; the median keeps the scale free of the spikes themselves.

    Examples
    --------
    >>> z = np.array([[10.0, 50.0, 100.0, 150.0, 200.0]])
    >>> u = np.array([[4.0, 6.0, 30.0, 8.0, 8.5]])
    >>> spikes(z, (u, 0 * u), floor=5.0, rate=0.01, factor=6.0, friction=True).tolist()
    [[False, False, True, False, False]]
    """
    keep = np.isfinite(z)
    for x in components:
        keep = keep & np.isfinite(x)
    place: Any = np.broadcast_to(np.arange(keep.shape[-1]), keep.shape)
    found = np.zeros(keep.shape, dtype=bool)
    rows = np.arange(len(keep))
    for _ in range(PASSES):
        _count, zk, place_k, *xs = compact(
            keep[rows], z[rows], place[rows], *(x[rows] for x in components)
        )
        worst = _worst(zk, xs, floor, rate, factor, friction)
        row, column = np.nonzero(worst)
        if not row.size:
            break
        found[rows[row], place_k[row, column]] = True
        keep[rows[row], place_k[row, column]] = False
        rows = rows[np.unique(row)]
    return found


def _worst(
    z: Floats, xs: list[Floats], floor: float, rate: float, factor: float, friction: bool
) -> Bools:
    """Mark the levels that break the rule more than either neighbour; levels are compact."""
    z1, z2, za, zb = _beside(z)
    both, below, above, step1, step2 = [], [], [], [], []
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        for x in xs:
            x1, x2, xa, xb = _beside(x)
            both.append(x - (x1 + (xa - x1) * ((z - z1) / (za - z1))))
            below.append(x - (x1 + (x1 - x2) * ((z - z1) / (z1 - z2))))
            above.append(x - (xa + (xa - xb) * ((z - za) / (za - zb))))
            step1.append(x - x1)
            step2.append(x - xa)
        step = np.fmin(_size(step1), _size(step2))
        inner = np.isfinite(z1) & np.isfinite(za)
        sides = np.fmin(_size(below), _size(above))
        departure = np.where(inner, np.fmin(_size(both), sides), np.fmin(step, sides))
        scale = _lower_median(np.where(inner, np.fmin(departure, step), np.nan))
        gap = np.fmin(z - z1, za - z)
        allowed = np.maximum(floor + rate * gap, factor * scale[:, np.newaxis])
        excess = departure / np.where(inner, allowed, END_FACTOR * allowed)
        bottom = np.isfinite(za) & ~np.isfinite(z1)
        if friction:
            size = _size(xs)
            bottom &= ~(size > _beside(size)[2])
        excess = np.where(bottom | ~np.isfinite(excess), -np.inf, excess)
        lower, _, upper, _ = _beside(excess)
        local = (excess >= np.fmax(lower, -np.inf)) & (excess >= np.fmax(upper, -np.inf))
    enough = np.count_nonzero(np.isfinite(z), axis=-1) >= FEWEST_LEVELS
    worst: Bools = (excess > 1.0) & local & enough[:, np.newaxis]
    return worst


def _beside(x: Floats) -> tuple[Floats, Floats, Floats, Floats]:
    """Return the values one and two levels below, one and two levels above, NaN beyond the ends."""
    wide = np.pad(x, ((0, 0), (2, 2)), constant_values=np.nan)
    return wide[:, 1:-3], wide[:, :-4], wide[:, 3:-1], wide[:, 4:]


def _size(xs: list[Floats]) -> Floats:
    """Length of a vector given by its components."""
    return np.abs(xs[0]) if len(xs) == 1 else np.hypot(*xs)


def _lower_median(x: Floats) -> Floats:
    """Median over levels, the lower of the two in the middle; NaN is left out, 0 if all are."""
    ordered = np.sort(x, axis=-1)  # NaN last
    count = np.count_nonzero(np.isfinite(x), axis=-1)
    middle = np.maximum(count - 1, 0)[:, np.newaxis] // 2
    return np.where(count > 0, np.take_along_axis(ordered, middle, axis=-1)[:, 0], 0.0)
