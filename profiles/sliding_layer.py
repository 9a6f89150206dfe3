"""The layer of a given depth over which something changes most, wherever it lies in a profile."""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.grid import at_height
from backveer.profiles.labels import Bools, Floats


def layer_differences(z: Floats, x: Any, depth: float) -> tuple[Floats, Floats, Any]:
    """
    Differences over the layers of a depth among which the largest lies.

    Parameters
    ----------
    z : array, shape (..., level)
        Heights, compact (:func:`backveer.profiles.grid.compact`): increasing, NaN beyond the last.
        [m]
    x : array, shape (..., level)
        What differs, real or complex (the wind as u + i v).
    depth
        Of the layers; 0 for those between neighbouring levels. [m]

    Returns
    -------
    base, top : array, shape (..., candidate)
        Of each layer. [m]
    difference : array, shape (..., candidate)
        Top minus base; NaN where the layer reaches beyond the levels.

    Notes
    -----
    With straight lines between levels the size of the difference over a sliding layer is convex
    between the heights where an end of it passes a level: its largest value is at one of those, so
    only layers that begin or end at a level are looked at.

    Examples
    --------
    >>> z, x = np.array([0.0, 50.0, 100.0]), np.array([0.0, 1.0, 5.0])
    >>> base, top, difference = layer_differences(z, x, 60.0)
    >>> best = np.nanargmax(np.abs(difference))
    >>> base[best].item(), top[best].item(), round(difference[best].item(), 2)
    (40.0, 100.0, 4.2)
    """
    if depth <= 0:
        with np.errstate(invalid="ignore", over="ignore"):
            base, top, difference = z[..., :-1], z[..., 1:], x[..., 1:] - x[..., :-1]
            return base, top, np.where(top > base, difference, np.nan)
    with np.errstate(invalid="ignore", over="ignore"):
        base = np.concatenate([z, z - depth], axis=-1)
        top = np.concatenate([z + depth, z], axis=-1)
        others: Any = at_height(z, x, np.concatenate([z + depth, z - depth], axis=-1))
        count = z.shape[-1]
        difference = np.concatenate([others[..., :count] - x, x - others[..., count:]], axis=-1)
    return base, top, difference


def strongest_layer(z: Floats, x: Any, depth: float) -> tuple[Floats, Floats, Any]:
    """
    Return base, top and difference of the layer over which ``x`` changes most per metre.

    Parameters
    ----------
    z, x, depth
        As for :func:`layer_differences`.

    Returns
    -------
    base, top, difference : array, shape (...)
        The lowest of several that are equal; NaN where the levels span less than ``depth``.
    """
    base, top, difference = layer_differences(z, x, depth)
    if base.shape[-1] == 0:
        missing = np.full(z.shape[:-1], np.nan)
        return missing, missing, np.full(z.shape[:-1], np.nan, dtype=np.asarray(x).dtype)
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        rate = np.abs(difference) / (top - base)
    # Layers equal to rounding count as equal, so that a turned wind names the same layer.
    largest = np.max(np.where(np.isfinite(rate), rate, -1.0), axis=-1, keepdims=True)
    with np.errstate(invalid="ignore"):
        candidates = np.where(rate >= largest * (1 - 1e-9), base, np.inf)
    chosen = np.argmin(candidates, axis=-1)[..., np.newaxis]
    found = largest[..., 0] >= 0

    def taken(array: Any) -> Any:
        return np.where(found, np.take_along_axis(array, chosen, axis=-1)[..., 0], np.nan)

    return taken(base), taken(top), taken(difference)


def measured_between(z: Floats, base: Floats, top: Floats) -> tuple[Floats, Floats, Floats, Bools]:
    """
    Say between which levels a layer's ends were interpolated.

    Parameters
    ----------
    z : array, shape (..., level)
        Heights, compact. [m]
    base, top : array, shape (..., layer)
        Of the layers. [m]

    Returns
    -------
    below, above : array, shape (..., layer)
        Highest level not above the base, lowest level not below the top. [m]
    widest : array, shape (..., layer)
        Largest distance between neighbouring levels among those that the layer touches. [m]
    inside : array of bool, shape (..., layer)
        Some level lies between base and top.
    """
    shape = np.broadcast_shapes(base.shape, top.shape)
    below, above = np.full(shape, np.nan), np.full(shape, np.nan)
    widest, inside = np.zeros(shape), np.zeros(shape, dtype=bool)
    # A layer that ends at a level to rounding ends at it.
    with np.errstate(invalid="ignore"):
        slack = 1e-9 * (np.abs(top) + np.abs(base))
        for i in range(z.shape[-1]):
            level = z[..., i : i + 1]
            below = np.where(level <= base + slack, np.fmax(below, level), below)
            above = np.where(level >= top - slack, np.fmin(above, level), above)
            inside |= (level > base + slack) & (level < top - slack)
            if i:
                lower = z[..., i - 1 : i]
                touches = (lower < top - slack) & (level > base + slack)
                widest = np.where(touches, np.fmax(widest, level - lower), widest)
    return below, above, widest, inside
