"""
The findings that a level can carry, as a table: one bit each, and which variable it spoils.

A flagged level stays in the data; an analyser leaves out the levels whose flags concern it
(:meth:`backveer.profiles.stack.Stack.usable`).
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Flag:
    """
    One kind of finding.

    Attributes
    ----------
    name
        As stored in ``flag_meanings`` and told to people, with underscores.
    bit
        Its value in ``level_flag``.
    concerns
        The groups of variables that it makes unusable: ``"wind"``, ``"direction"``,
        ``"temperature"``, ``"humidity"``, ``"pressure"``, ``"height"`` (all of the level).
    meaning
        The rule in words.
    source
        Where the rule comes from.
    """

    name: str
    bit: int
    concerns: tuple[str, ...]
    meaning: str
    source: str


FLAGS = (
    Flag(
        "wind_missing",
        1 << 0,
        ("wind",),
        "no wind at this level",
        "by definition",
    ),
    Flag(
        "wind_outside_limits",
        1 << 1,
        ("wind",),
        "wind speed outside its physical limits",
        "WMO Weather and Climate Extremes Archive, rounded outward (Thresholds in quality.py)",
    ),
    Flag(
        "temperature_outside_limits",
        1 << 2,
        ("temperature", "humidity"),
        "temperature outside its physical limits",
        "WMO Weather and Climate Extremes Archive, rounded outward (Thresholds in quality.py)",
    ),
    Flag(
        "pressure_outside_limits",
        1 << 3,
        ("pressure",),
        "pressure outside its physical limits",
        "WMO Weather and Climate Extremes Archive, rounded outward (Thresholds in quality.py)",
    ),
    Flag(
        "height_not_increasing",
        1 << 4,
        ("height",),
        "height is missing, impossible, or not part of the longest run that increases",
        "longest increasing subsequence: Fredman, 1975, Discrete Math., 11, 29-35",
    ),
    Flag(
        "duplicate_height",
        1 << 5,
        (),
        "mean of several levels that had the same height",
        "by definition",
    ),
    Flag(
        "wind_spike",
        1 << 6,
        ("wind",),
        "wind vector far from what its neighbours on either side say",
        "common practice (rule in spikes.py, numbers in quality.py)",
    ),
    Flag(
        "temperature_spike",
        1 << 7,
        ("temperature", "humidity"),
        "temperature far from what its neighbours on either side say",
        "common practice (rule in spikes.py, numbers in quality.py)",
    ),
    Flag(
        "not_hydrostatic",
        1 << 8,
        ("pressure",),
        "pressure and height disagree with the hypsometric equation",
        "after Gandin, 1988, Mon. Wea. Rev., 116, 1137-1156 (rule in air_checks.py)",
    ),
    Flag(
        "superadiabatic",
        1 << 9,
        ("temperature", "humidity"),
        "temperature falls with height faster than air can hold, above the surface layer",
        "more than 1 K beyond the dry adiabat: common practice (air_checks.py)",
    ),
    Flag(
        "calm_without_direction",
        1 << 10,
        ("direction",),
        "calm: the wind is known to be light, its direction means nothing",
        "WMO-No. 306, Manual on Codes (direction 0 for calm)",
    ),
    Flag(
        "low_availability",
        1 << 11,
        ("wind",),
        "lidar availability in the interval below the threshold",
        "80 %: common practice (Thresholds in quality.py)",
    ),
    Flag(
        "weak_signal",
        1 << 12,
        ("wind",),
        "lidar carrier-to-noise ratio below the threshold",
        "-23 dB: common practice (Thresholds in quality.py)",
    ),
    Flag(
        "height_from_standard_atmosphere",
        1 << 13,
        (),
        "height derived from pressure with the standard atmosphere, for want of temperature",
        "ISO 2533:1975",
    ),
    Flag(
        "height_from_hypsometric_equation",
        1 << 14,
        (),
        "height derived from pressure, temperature and humidity",
        "hypsometric equation, air.py",
    ),
    Flag(
        "below_ground",
        1 << 15,
        ("height",),
        "below the ground at the site",
        "more than 1 m, for the rounding of heights: by definition",
    ),
    Flag(
        "humidity_outside_limits",
        1 << 16,
        ("humidity",),
        "dew point outside its physical limits, or above the temperature",
        "by definition; limits as for temperature (Thresholds in quality.py)",
    ),
)

BIT = {flag.name: flag.bit for flag in FLAGS}


def bits_concerning(*groups: str) -> int:
    """
    Return the bits of all flags that concern any of the given groups, ``"height"`` always.

    Examples
    --------
    >>> bits_concerning("direction") == BIT["calm_without_direction"] | bits_concerning()
    True
    """
    wanted = {"height", *groups}
    return sum(flag.bit for flag in FLAGS if wanted & set(flag.concerns))


def names_of(bits: int) -> tuple[str, ...]:
    """Return the names of the findings in ``bits``, in the order of the table."""
    return tuple(flag.name for flag in FLAGS if bits & flag.bit)
