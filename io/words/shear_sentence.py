"""
The plain sentence about low-level shear: a candidate for a forecaster's judgement.

Rounding, so that nothing is told finer than it is known: heights to the nearest 10 ft, 100 ft from
1000 ft up; directions to 10 degrees, north as 360; speeds and differences to the nearest knot;
shears to a tenth of a knot per 100 ft. Halves go up, as people round. The words are ordinary small
ones: nothing here reads like an issued warning, and each sentence begins by saying what it is.
"""

from __future__ import annotations

import math

import numpy as np

from backveer.profiles.grid import at_height
from backveer.profiles.labels import Floats, Words
from backveer.profiles.low_level_shear import FOOT, KNOT, KNOT_PER_100_FEET
from backveer.profiles.shear_statement import ShearStatement
from backveer.profiles.stack import wind_from_direction

OPENING = "Candidate wording, for a forecaster's judgement:"


def sentences(said: ShearStatement, heights: Floats) -> Words:
    """
    Write the candidate sentence of each profile.

    Parameters
    ----------
    said
        The answers.
    heights : array, shape (profile,)
        Top of the layer that the candidate group names, NaN where there is no group. [m]

    Returns
    -------
    sentences : array of str, shape (profile,)
    """
    shear = said.shear
    stack = said.stack
    wind = np.where(stack.usable("wind"), stack.eastward_wind + 1j * stack.northward_wind, np.nan)
    ends = at_height(stack.height, wind, np.stack([shear.surface_height, heights], axis=-1))
    texts = np.empty(stack.profile_count, dtype=object)
    for row in range(stack.profile_count):
        if shear.why[row]:
            texts[row] = f"{OPENING} none, because {shear.why[row]}."
            continue
        parts = [_layer(said, row)]
        if np.isfinite(heights[row]):
            parts.insert(0, _surface_to(shear.surface_height[row], heights[row], *ends[row]))
        parts.append(_criteria(said, row))
        texts[row] = f"{OPENING} {' '.join(parts)}"
    return texts


def feet(height: float) -> str:
    """
    Round a height for a sentence.

    Examples
    --------
    >>> feet(10.0), feet(137.0), feet(500.0)
    ('30 ft', '450 ft', '1600 ft')
    """
    value = height / FOOT
    unit = 100 if value >= 1000 else 10
    return f"{unit * half_up(value / unit)} ft"


def half_up(value: float) -> int:
    """Round halves up, as people do, not to the even number."""
    return math.floor(value + 0.5)


def wind_words(wind: complex) -> str:
    """
    Write a wind as direction and speed.

    Examples
    --------
    >>> wind_words(complex(0, -10)), wind_words(0j)
    ('360 degrees 19 kt', 'calm')
    """
    speed = half_up(abs(wind) / KNOT)
    if speed == 0:
        return "calm"
    direction = float(wind_from_direction(np.array(wind.real), np.array(wind.imag)))
    tens = half_up(direction / 10) % 36 or 36
    return f"{10 * tens:03d} degrees {speed} kt"


def _surface_to(surface: float, height: float, low: complex, high: complex) -> str:
    return (
        f"from the surface ({feet(surface)}, {wind_words(low)}) to {feet(height)} "
        f"({wind_words(high)}) the wind changes by {half_up(abs(high - low) / KNOT)} kt as a "
        "vector;"
    )


def _layer(said: ShearStatement, row: int) -> str:
    shear = said.shear
    window = np.isfinite(shear.window_shear[row])
    of = "window" if window else "maximum"
    value, error = getattr(shear, f"{of}_shear")[row], getattr(shear, f"{of}_error")[row]
    base, top = getattr(shear, f"{of}_base")[row], getattr(shear, f"{of}_top")[row]
    if not value >= error:
        return "no shear is larger than the error of the measurement;"
    term = getattr(shear, f"{of}_intensity")[row]
    rounded = half_up(10 * value / KNOT_PER_100_FEET) / 10
    least = "at least " if window and shear.window_lower_bound[row] else ""
    return (
        f"strongest shear {least}{rounded:.1f} kt per 100 ft ({term}) from {feet(base)} to "
        f"{feet(top)};"
    )


def _criteria(said: ShearStatement, row: int) -> str:
    rules, criteria = said.settings.rules, said.criteria
    met = [rule.name for rule, yes in zip(rules, criteria.met[row], strict=True) if yes]
    if met:
        return f"criteria met: {'; '.join(met)}."
    if not rules:
        return "no criteria were given."
    judged = np.isfinite(criteria.value[row])
    if not judged.any():
        return "no criterion can be judged."
    if criteria.lower_bound[row].any() or not judged.all():
        return "no criterion is met as far as the profile can tell, which does not cover them all."
    return "no criterion is met."
