"""What the quality check found, as remarks of each profile."""

from __future__ import annotations

import numpy as np

from backveer.io.readers.reading import FileReading
from backveer.profiles.flags import FLAGS
from backveer.profiles.stack import Stack

# What is said after "1 of 60 levels" and after "2 of 60 levels".
SAID = {
    "wind_missing": ("has no wind", "have no wind"),
    "wind_outside_limits": ("has a wind outside limits", "have a wind outside limits"),
    "temperature_outside_limits": (
        "has a temperature outside limits",
        "have a temperature outside limits",
    ),
    "humidity_outside_limits": (
        "has a humidity outside limits",
        "have a humidity outside limits",
    ),
    "pressure_outside_limits": (
        "has a pressure outside limits",
        "have a pressure outside limits",
    ),
    "height_not_increasing": (
        "is not above the one before",
        "are not above the one before",
    ),
    "duplicate_height": (
        "is the mean of several at one height",
        "are means of several at one height",
    ),
    "wind_spike": ("has a wind spike", "have a wind spike"),
    "temperature_spike": ("has a temperature spike", "have a temperature spike"),
    "not_hydrostatic": (
        "has a pressure that disagrees with its height",
        "have a pressure that disagrees with their height",
    ),
    "superadiabatic": ("is superadiabatic", "are superadiabatic"),
    "calm_without_direction": (
        "is calm, without a direction",
        "are calm, without a direction",
    ),
    "low_availability": ("has low availability", "have low availability"),
    "weak_signal": ("has a weak signal", "have a weak signal"),
    "height_from_standard_atmosphere": (
        "has its height from the standard atmosphere",
        "have their height from the standard atmosphere",
    ),
    "height_from_hypsometric_equation": (
        "has its height from the hypsometric equation",
        "have their height from the hypsometric equation",
    ),
    "below_ground": ("is below the ground", "are below the ground"),
}


def findings(file: FileReading) -> list[list[str]]:
    """Return the remarks of each profile: those of its file, then what its levels show."""
    found = [list(file.remarks) for _ in range(file.stack.profile_count)]
    for row, sentences in enumerate(level_findings(file.stack)):
        found[row].extend(sentences)
    return found


def level_findings(stack: Stack) -> list[list[str]]:
    """
    Return, for each profile, a sentence for each kind of finding at its levels.

    Examples
    --------
    >>> stack = Stack.of(height=[[10.0, 20.0]], level_flag=[[0, 1]])
    >>> level_findings(stack)
    [['1 of 2 levels has no wind']]
    """
    present = np.isfinite(stack.height) | (stack.level_flag != 0)
    count = np.count_nonzero(present, axis=1)
    found: list[list[str]] = [[] for _ in range(stack.profile_count)]
    for flag in FLAGS:
        flagged = np.count_nonzero(stack.level_flag & flag.bit, axis=1)
        one, several = SAID[flag.name]
        for row in np.flatnonzero(flagged):
            n = int(flagged[row])
            levels = "level" if count[row] == 1 else "levels"
            found[row].append(f"{n} of {int(count[row])} {levels} {one if n == 1 else several}")
    return found
