"""The winds from the ground up to a height, with the wind at that height itself."""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.grid import at_height, compact
from backveer.profiles.labels import Floats
from backveer.profiles.stack import Stack


def low_levels(stack: Stack, top: float) -> tuple[Any, Floats, Any]:
    """
    Return the usable winds up to a height.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    top
        Height above ground. [m]

    Returns
    -------
    count : array of int, shape (profile,)
        Number of winds.
    z : array, shape (profile, level)
        Their heights, compact: NaN beyond the last. The last is ``top`` where the profile reaches
        it, its wind taken between the levels around. [m]
    w : array of complex, shape (profile, level)
        The winds, u + i v. [m s-1]

    Examples
    --------
    >>> u = [1.0, 5.0, 16.0]
    >>> stack = Stack.of(height=[10.0, 90.0, 200.0], eastward_wind=u, northward_wind=0.0)
    >>> count, z, w = low_levels(stack, 100.0)
    >>> z.tolist(), w.real.tolist()
    ([[10.0, 90.0, 100.0]], [[1.0, 5.0, 6.0]])
    """
    usable = stack.usable("wind")
    z = np.where(usable, stack.height, np.nan)
    w: Any = np.where(usable, stack.eastward_wind + 1j * stack.northward_wind, np.nan)
    cut = at_height(z, w, [top])
    with np.errstate(invalid="ignore"):
        below = usable & (z < top)
    # Levels that no profile uses cost time in all that follows.
    used = np.flatnonzero(below.any(axis=0))
    last = int(used[-1]) + 1 if used.size else 0
    count, low_z, low_w = compact(
        np.concatenate([below[:, :last], np.isfinite(cut)], axis=-1),
        np.concatenate([z[:, :last], np.full(cut.shape, top)], axis=-1),
        np.concatenate([w[:, :last], cut], axis=-1),
    )
    return count, low_z, low_w
