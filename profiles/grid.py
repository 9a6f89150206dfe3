"""
Common heights, sums and integrals over levels.

Every kernel here gives for a profile in a stack, bit for bit, what it gives for that profile alone,
and a missing level changes nothing: levels are summed in order, and padding adds an exact zero.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.labels import Bools, Floats


def ordered_sum(x: Any, axis: int = -1) -> Any:
    """
    Sum along an axis strictly in order.

    ``numpy.sum`` adds in blocks whose borders depend on the length and layout of the array, so
    that the same profile in a longer stack can differ in the last bit; this does not.

    Examples
    --------
    >>> ordered_sum(np.array([[0.1, 0.2, 0.3], [1.0, 2.0, 0.0]]))
    array([0.6, 3. ])
    """
    x = np.asarray(x)
    if x.shape[axis] == 0:
        return np.zeros(np.delete(x.shape, axis), dtype=x.dtype)
    return np.take(np.add.accumulate(x, axis=axis), -1, axis=axis)


def compact(keep: Bools, *arrays: Floats) -> tuple[Any, ...]:
    """
    Move the kept levels of each profile to its front.

    Parameters
    ----------
    keep : array of bool, shape (..., level)
        The levels to keep, in their order.
    *arrays : array, shape (..., level)
        Any number of variables.

    Returns
    -------
    count : array of int, shape (...)
        How many levels each profile kept.
    *arrays : array, shape (..., kept)
        The variables, NaN beyond ``count``; ``kept`` is the largest count, at least 1.

    Examples
    --------
    >>> count, z = compact(np.array([[True, False, True]]), np.array([[10.0, 20.0, 30.0]]))
    >>> count, z
    (array([2]), array([[10., 30.]]))
    """
    count = np.count_nonzero(keep, axis=-1)
    width = max(int(count.max(initial=0)), 1)
    if keep.shape[-1] == 0:
        return count, *(np.full((*keep.shape[:-1], 1), np.nan) for _ in arrays)
    order = np.argsort(~keep, axis=-1, kind="stable")[..., :width]
    beyond = np.arange(order.shape[-1]) >= count[..., np.newaxis]
    taken = []
    for array in arrays:
        moved = np.take_along_axis(np.broadcast_to(array, keep.shape), order, axis=-1)
        missing = np.nan if np.issubdtype(moved.dtype, np.inexact) else 0
        taken.append(np.where(beyond, missing, moved))
    return count, *taken


def at_height(z: Floats, x: Floats, target: Any) -> Floats:
    """
    Value at given heights, linear between the levels around each.

    Parameters
    ----------
    z : array, shape (..., level)
        Heights (or any other coordinate) that increase over the levels where ``x`` is finite. [m]
    x : array, shape (..., level)
        The variable, real or complex; NaN at a level means that the level is not there.
    target : array, shape (..., target) or (target,)
        Where the value is wanted. [m]

    Returns
    -------
    value : array, shape (..., target)
        NaN below the lowest and above the highest level: nothing is extrapolated.

    Examples
    --------
    >>> at_height(np.array([10.0, 20.0, 40.0]), np.array([1.0, np.nan, 4.0]), [25.0, 50.0])
    array([2.5, nan])
    """
    _count, z, x, low, target, inside = _bracket(z, x, target)
    z0, z1 = np.take_along_axis(z, low, -1), np.take_along_axis(z, low + 1, -1)
    x0, x1 = np.take_along_axis(x, low, -1), np.take_along_axis(x, low + 1, -1)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        weight = (target - z0) / (z1 - z0)
        between = (1.0 - weight) * x0 + weight * x1
    # A level's own height gives its own value, even where it is the only level.
    value = np.where(target == z0, x0, np.where(target == z1, x1, between))
    return np.where(inside, value, np.nan)


def integral_between(z: Floats, x: Floats, base: Any, top: Any) -> Floats:
    """
    Integral of a variable over height between two heights, exact for straight lines between levels.

    Parameters
    ----------
    z, x : array, shape (..., level)
        As in :func:`at_height`.
    base, top : array, shape (..., layer) or (layer,)
        Bounds of the layers, inside the profile. [m]

    Returns
    -------
    integral : array, shape (..., layer)
        In the unit of ``x`` times m; NaN where a bound lies outside the levels. Divide by
        ``top - base`` for the mean.

    Examples
    --------
    >>> integral_between(np.array([0.0, 10.0, 30.0]), np.array([0.0, 1.0, 3.0]), [5.0], [15.0])
    array([10.])
    """
    return _integral_to(z, x, top) - _integral_to(z, x, base)


def _integral_to(z: Floats, x: Floats, target: Any) -> Floats:
    """Integral from the lowest level of each profile to ``target``."""
    _count, z, x, low, target, inside = _bracket(z, x, target)
    with np.errstate(invalid="ignore", over="ignore"):
        steps = 0.5 * (x[..., 1:] + x[..., :-1]) * np.diff(z, axis=-1)
    running = np.add.accumulate(np.where(np.isfinite(steps), steps, 0.0), axis=-1)
    running = np.concatenate([np.zeros_like(running[..., :1]), running], axis=-1)
    z0, z1 = np.take_along_axis(z, low, -1), np.take_along_axis(z, low + 1, -1)
    x0, x1 = np.take_along_axis(x, low, -1), np.take_along_axis(x, low + 1, -1)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        at_target = x0 + (x1 - x0) * (target - z0) / (z1 - z0)
        whole = np.take_along_axis(running, low, -1) + 0.5 * (x0 + at_target) * (target - z0)
    return np.where(inside, whole, np.nan)


def _bracket(z: Floats, x: Floats, target: Any) -> tuple[Any, ...]:
    """Compact the levels and find, for every target, the level at or below it."""
    z, x, target = np.asarray(z, dtype=float), np.asarray(x), np.asarray(target, dtype=float)
    shape = np.broadcast_shapes(z.shape, x.shape)
    z, x = np.broadcast_to(z, shape), np.broadcast_to(x, shape)
    count, z, x = compact(np.isfinite(z) & np.isfinite(x), z, x)
    if z.shape[-1] < 2:  # a pair of levels to look at, even where there is only one
        pad = [(0, 0)] * (z.ndim - 1) + [(0, 1)]
        z = np.pad(z, pad, constant_values=np.nan)
        x = np.pad(x, pad, constant_values=np.nan)
    target = np.broadcast_to(target, (*shape[:-1], target.shape[-1]))
    low = np.empty(target.shape, dtype=np.intp)
    for j in range(target.shape[-1]):
        low[..., j] = np.count_nonzero(z <= target[..., j : j + 1], axis=-1) - 1
    inside = (low >= 0) & (
        (low < count[..., np.newaxis] - 1)
        | (target == np.take_along_axis(z, np.maximum(count - 1, 0)[..., np.newaxis], -1))
    )
    low = np.clip(low, 0, np.maximum(count - 2, 0)[..., np.newaxis])
    return count, z, x, low, target, inside
