"""Why an answer about a rotor is missing or is of a part of it only: words and their bits."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from backveer.profiles.labels import Words

REASONS = (
    NO_WIND := "no level has a valid wind",
    HUB_BELOW := "the hub lies below the lowest valid level",
    HUB_ABOVE := "the hub lies above the highest valid level",
    HUB_GAP := "the levels around hub height are too far apart",
    BELOW_GROUND := "the rotor reaches below the ground",
    LOWER_TIP := "the lower tip lies below the lowest valid level",
    UPPER_TIP := "the upper tip lies above the highest valid level",
    GAP := "neighbouring levels inside the rotor are too far apart to be joined",
    PART := "veer, shear and equivalent speed are those of the covered part of the rotor",
    LOW_COVERAGE := "too little of the rotor is covered by valid levels",
    HUB_CALM := "it is calm at hub height",
    NO_DIRECTION := "the wind has no direction at a level that the rotor meets (calm)",
    EITHER_WAY := "the direction turns by more than 120 degrees between neighbouring levels, "
    "it can have gone either way round",
    TURNS_AWAY := "the wind inside the rotor turns by more than 90 degrees from that at the hub, "
    "where the equivalent speed with veer has no meaning",
    FEW_LEVELS := "fewer than three levels with wind inside the rotor for a shear exponent",
    NO_FIT := "no well determined Ekman fit to extrapolate with",
    TOO_LARGE := "the speeds are too large or too small to compute with",
)
_CODE = {words: 1 << place for place, words in enumerate(REASONS)}


def pack(reasons: Mapping[str, Any]) -> Any:
    """
    Pack the reasons of each profile into the bits of a number.

    Parameters
    ----------
    reasons
        Words of ``REASONS`` and, for each, where they hold: bool or array of bool.

    Returns
    -------
    code : array of int, of the shape of the arrays
        To be joined with ``|``.

    Examples
    --------
    >>> spell(pack({NO_WIND: np.array([True, False])})).tolist()
    ['no level has a valid wind', '']
    """
    code: Any = np.int64(0)
    for words, holds in reasons.items():
        code = code | np.where(holds, _CODE[words], 0)
    return code


def spell(codes: Any) -> Words:
    """Spell out packed reasons in the order of the table, each combination once."""
    packed, place = np.unique(codes, return_inverse=True)
    spelled = np.empty(packed.size, dtype=object)
    for index, code in enumerate(packed):
        spelled[index] = "; ".join(words for words in REASONS if code & _CODE[words])
    return spelled[place].reshape(codes.shape)
