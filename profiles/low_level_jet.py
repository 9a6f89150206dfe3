"""The low-level jet: the wind's maximum near the ground, and how far the wind falls off above."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats, Words

# The criterion of Baas, P., F. C. Bosveld, H. Klein Baltink and A. A. M. Holtslag, 2009: A
# climatology of nocturnal low-level jets at Cabauw. J. Appl. Meteor. Climatol., 48, 1627-1642 (from
# memory): at least 2 m/s and 25 % faster than the next minimum above.
LEAST_FALLOFF = 2.0  # [m s-1]
LEAST_RATIO = 1.25
CRITERION = (
    "at least 2 m/s and 25 % faster than the minimum above "
    "(Baas et al., 2009: J. Appl. Meteor. Climatol., 48, 1627-1642)"
)
# They search to 500 m at a flat inland site; 1500 m takes in coastal and polar jets: Tuononen, M.,
# V. A. Sinclair and T. Vihma, 2015: Atmos. Sci. Lett., 16, 492-499 (from memory).
HIGHEST_NOSE = 1500.0  # [m]
HIGHEST_MINIMUM = 3000.0  # [m] twice that; the free air above has winds of its own; our choice

NO_WIND = "no level below 1500 m has a wind"
AT_TOP = "the wind is strongest at the highest level searched, so what it does above is not known"
STILL_RISING = "the wind still rises at 1500 m, the top of the search"
AT_BOTTOM = "the wind is strongest at the lowest level, so there is no nose"


class Jet(NamedTuple):
    """The jet of each profile, shape (profile,)."""

    height: Floats
    speed: Floats
    falloff: Floats
    meets: Bools
    why: Words


def jet(z: Floats, speed: Floats, usable: Bools) -> Jet:
    """
    Find the nose of the jet.

    Parameters
    ----------
    z, speed : array, shape (profile, level)
        Height above ground [m] and wind speed [m s-1].
    usable : array of bool, shape (profile, level)
        The levels to look at; their heights increase.

    Returns
    -------
    Jet
        Height [m], speed [m s-1] and falloff [m s-1] of the lowest nose below 1500 m that meets the
        criterion; where none does, of the strongest wind below 1500 m. ``why`` says why a falloff
        is not determined, or why a maximum is no nose.

    Notes
    -----
    The falloff is the speed of the nose minus the lowest speed above it before the wind is
    stronger again, below 3000 m: small wiggles end nothing. Only a level that is stronger than
    all below it (from where the wind begins to rise) can be the lowest nose with enough falloff,
    for a weaker one has a stronger one below it that falls off at least as far; so one pass upward
    finds it.

    Examples
    --------
    >>> z = np.array([[10.0, 100.0, 200.0, 400.0, 800.0]])
    >>> speed = np.array([[3.0, 9.0, 12.0, 7.0, 10.0]])
    >>> found = jet(z, speed, np.isfinite(z))
    >>> found.height, found.speed, found.falloff, found.meets
    (array([200.]), array([12.]), array([5.]), array([ True]))
    """
    with np.errstate(invalid="ignore"):
        count, z, speed = compact(usable & (z <= HIGHEST_MINIMUM), z, speed)
    rows = len(z)
    nothing = np.full(rows, np.nan)
    # The first nose that meets the criterion: (height, speed, lowest above), frozen once it does,
    # ended once the wind is stronger again. And the strongest wind of all, likewise.
    nose = _Peak(nothing.copy(), np.full(rows, -np.inf), nothing.copy())
    strongest = _Peak(nothing.copy(), np.full(rows, -np.inf), nothing.copy())
    risen, meets, ended = (np.zeros(rows, dtype=bool) for _ in range(3))
    regained = np.zeros(rows, dtype=bool)
    previous = np.full(rows, np.nan)
    for k in range(z.shape[1]):
        zk, sk = z[:, k], speed[:, k]
        with np.errstate(invalid="ignore"):
            low = zk <= HIGHEST_NOSE
            risen |= sk > previous
            new = low & ~meets & ((sk > nose.speed) | ~risen)
            ended = (ended | (sk > nose.speed)) & ~new
            fallen = ~new & ~ended & np.isfinite(sk)
            new_strongest = low & (sk > strongest.speed)
            regained = (regained | (sk > strongest.speed)) & ~new_strongest
        nose.move(new, fallen, zk, sk)
        strongest.move(new_strongest, ~new_strongest & ~regained & np.isfinite(sk), zk, sk)
        with np.errstate(invalid="ignore"):
            enough = (nose.speed - nose.lowest >= LEAST_FALLOFF) & (
                nose.speed >= LEAST_RATIO * nose.lowest
            )
        meets |= risen & enough & ~ended
        previous = sk
    found = np.isfinite(strongest.height)
    height = np.where(meets, nose.height, strongest.height)
    peak = np.where(meets, nose.speed, strongest.speed)
    lowest = np.where(meets, nose.lowest, strongest.lowest)
    with np.errstate(invalid="ignore"):
        falloff = peak - lowest
        at_bottom = found & ~meets & (height == z[:, 0]) & (count > 1)
    why = np.select(
        [meets, ~found, at_bottom, np.isfinite(falloff), regained],
        ["", NO_WIND, AT_BOTTOM, "", STILL_RISING],
        AT_TOP,
    ).astype(object)
    return Jet(height, np.where(found, peak, np.nan), falloff, meets, why)


class _Peak(NamedTuple):
    height: Floats
    speed: Floats
    lowest: Floats  # above it so far, NaN where there is no level yet

    def move(self, new: Bools, fallen: Bools, z: Floats, speed: Floats) -> None:
        """Move the peak to a new level, or take a level above it into its minimum."""
        np.copyto(self.height, z, where=new)
        np.copyto(self.speed, speed, where=new)
        np.copyto(self.lowest, np.nan, where=new)
        np.copyto(self.lowest, np.fmin(self.lowest, speed), where=fallen)
