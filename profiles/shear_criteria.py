"""
Which criteria of which authority a profile meets: rules are data, this module only measures.

A rule names a metric, the layer in which it is taken, and a threshold. The metrics:

``shear``
    Vector shear over a depth of at least ``depth`` (the levels' own spacing when 0). [s-1]
``vector_difference``
    Size of the vector difference between the surface wind and any height up to ``top``. [m s-1]
``speed_difference``
    Size of the change of wind speed between the surface wind and any height up to ``top``. [m s-1]
``headwind_change``
    Largest gain or loss of headwind between two heights of an approach or departure up to ``top``,
    over the runways given; without one, along the heading that makes it largest. [m s-1]
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from backveer.profiles.flight_path import headwind
from backveer.profiles.grid import at_height, compact
from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.low_level_shear import SURFACE_LIMIT
from backveer.profiles.stack import Stack

METRICS = ("shear", "vector_difference", "speed_difference", "headwind_change")


@dataclass(frozen=True)
class Rule:
    """
    One published or local criterion.

    Attributes
    ----------
    name, authority, source, verified, wording
        What it is called, whose it is, where it stands, how that was verified, what it says.
    metric
        One of :data:`METRICS`.
    threshold
        The rule is met at this value and above. [s-1 for shear, otherwise m s-1]
    unit
        The unit in which its authority states it.
    top
        Height above ground up to which it looks. [m]
    depth
        Least depth of the layer of a shear. [m]
    strict
        Met only above the threshold.
    """

    name: str
    authority: str
    source: str
    verified: str
    wording: str
    metric: str
    threshold: float
    unit: str
    top: float
    depth: float = 0.0
    strict: bool = False


@dataclass(frozen=True, eq=False)
class Criteria(Labelled):
    """Each rule against each profile; ``value`` is in s-1 or m s-1, as the rule's threshold."""

    rule: Words = variable("", "rule", "name of the rule")
    threshold: Floats = variable("", "rule", "threshold, in the unit of the value")
    value: Floats = variable("", "profile rule", "what the profile shows, in s-1 or m s-1")
    met: Bools = variable("1", "profile rule", "the value reaches the threshold")
    margin: Floats = variable("", "profile rule", "value minus threshold")
    why: Words = variable("", "profile rule", "why there is no value")


def judge(stack: Stack, rules: tuple[Rule, ...], headings: Floats | None = None) -> Criteria:
    """
    Hold every profile against every rule.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    rules
        The criteria.
    headings : array, shape (runway,), optional
        True headings of the runways. [degree]

    Returns
    -------
    Criteria
        ``met`` is False where there is no value, and ``why`` says so: a rule that cannot be judged
        is not a rule that is passed.

    Raises
    ------
    ValueError
        For a metric that is not known.
    """
    values, reasons = [], []
    for rule in rules:
        if rule.metric not in METRICS:
            raise ValueError(
                f"rule {rule.name!r} has the metric {rule.metric!r}. Use {', '.join(METRICS)}."
            )
        value, why = _measure(stack, rule, headings)
        values.append(value)
        reasons.append(why)
    shape = (stack.profile_count, len(rules))
    threshold = np.array([rule.threshold for rule in rules], dtype=float)
    strict = np.array([rule.strict for rule in rules], dtype=bool)
    value = np.stack(values, axis=-1) if rules else np.zeros(shape)
    with np.errstate(invalid="ignore"):
        # A threshold met to rounding is met: 10 kt per 100 ft, however it was computed.
        slack = 1e-9 * threshold
        met = np.where(strict, value > threshold + slack, value >= threshold - slack)
    return Criteria(
        rule=np.array([rule.name for rule in rules], dtype=object),
        threshold=threshold,
        value=value,
        met=met,
        margin=value - threshold,
        why=np.stack(reasons, axis=-1) if rules else np.zeros(shape, dtype=object),
    )


def strongest_shear(z: Floats, w: Floats, depth: float) -> Floats:
    """
    Strongest vector shear over layers of a depth, anywhere in a profile.

    Parameters
    ----------
    z : array, shape (..., level)
        Heights, increasing, NaN beyond the last. [m]
    w : array of complex, shape (..., level)
        Wind, u + i v. [m s-1]
    depth
        Depth of the layers; 0 for those between neighbouring levels. [m]

    Returns
    -------
    shear : array, shape (...)
        Layers thinner than ``depth`` do not count; between levels farther apart than it the wind is
        a straight line, so that their own shear stands. [s-1]

    Notes
    -----
    The wind being piecewise linear, the difference over a sliding layer is convex between the
    heights where an end of it passes a level: its largest value is at one of those.
    """
    if depth <= 0:
        with np.errstate(invalid="ignore", divide="ignore"):
            shears = np.abs(np.diff(w, axis=-1)) / np.diff(z, axis=-1)
        shears = np.where(np.isfinite(shears), shears, -np.inf)
    else:
        ends = np.concatenate([at_height(z, w, z + depth) - w, w - at_height(z, w, z - depth)], -1)
        shears = np.where(np.isfinite(ends), np.abs(ends) / depth, -np.inf)
    strongest = np.max(shears, axis=-1, initial=-np.inf)
    return np.where(np.isfinite(strongest), strongest, np.nan)


def _measure(stack: Stack, rule: Rule, headings: Floats | None) -> tuple[Floats, Words]:
    usable = stack.usable("wind")
    z = np.where(usable, stack.height, np.nan)
    w = np.where(usable, stack.eastward_wind + 1j * stack.northward_wind, np.nan)
    cut = at_height(z, w, [rule.top])
    with np.errstate(invalid="ignore"):
        below = usable & (z < rule.top)
    count, z, w = compact(
        np.concatenate([below, np.isfinite(cut)], -1),
        np.concatenate([z, np.full_like(cut.real, rule.top)], -1),
        np.concatenate([w, cut], -1),
    )
    why = np.where(
        count < 2, f"there are fewer than two usable winds up to {rule.top:.0f} m", ""
    ).astype(object)
    if rule.metric == "shear":
        value = strongest_shear(z, w, rule.depth)
        thin = (why == "") & ~np.isfinite(value)
        why[thin] = f"the winds up to {rule.top:.0f} m span less than {rule.depth:.0f} m"
        return np.where(count < 2, np.nan, value), why
    if rule.metric == "headwind_change":
        value = _largest_headwind_change(w, headings)
        return np.where(count < 2, np.nan, value), why
    with np.errstate(invalid="ignore"):
        high = (count >= 2) & ~(z[..., 0] <= SURFACE_LIMIT)
        difference = (
            np.abs(w - w[..., :1])
            if rule.metric == "vector_difference"
            else np.abs(np.abs(w) - np.abs(w[..., :1]))
        )
    why[high] = f"the lowest wind is above the surface layer, higher than {SURFACE_LIMIT:.0f} m"
    largest = np.max(np.where(np.isfinite(difference), difference, -np.inf), axis=-1)
    return np.where(why == "", largest, np.nan), why


def _largest_headwind_change(w: Floats, headings: Floats | None) -> Floats:
    """Largest change between two heights: by runway, or along the line that makes it largest."""
    if headings is not None and np.size(headings):
        along = np.asarray(headings, dtype=float)[:, np.newaxis]
        head = headwind(w.real[:, np.newaxis, :], w.imag[:, np.newaxis, :], along)
        low = np.fmin.reduce(head, axis=-1)
        widest: Floats = np.fmax.reduce(np.fmax.reduce(head, axis=-1) - low, axis=-1)
        return widest
    largest = np.zeros(w.shape[:-1])
    for shift in range(1, w.shape[-1]):
        with np.errstate(invalid="ignore"):
            apart = np.abs(w[..., shift:] - w[..., :-shift])
        largest = np.fmax(largest, np.fmax.reduce(apart, axis=-1))
    return largest
