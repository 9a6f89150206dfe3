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
    over the runways given; without one, along the heading that makes it largest. However slowly it
    comes: the most that an aircraft can meet, and more than it meets at once. [m s-1]
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.flight_path import headwind
from backveer.profiles.labels import Bools, Floats, Labelled, Words, variable
from backveer.profiles.low_level_shear import FOOT, SURFACE_LIMIT
from backveer.profiles.low_levels import low_levels
from backveer.profiles.sliding_layer import measured_between, strongest_layer
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
    error: Floats = variable("", "profile rule", "standard error of the value")
    lower_bound: Bools = variable(
        "1", "profile rule", "the winds do not span the rule's layer: the true value may be larger"
    )
    span: Words = variable("", "profile rule", "what the winds do not span, empty where they do")
    why: Words = variable("", "profile rule", "why there is no value")


def judge(
    stack: Stack, rules: tuple[Rule, ...], error: Floats, headings: Floats | None = None
) -> Criteria:
    """
    Hold every profile against every rule.

    Parameters
    ----------
    stack
        Quality-checked profiles.
    rules
        The criteria.
    error
        Standard error of a wind component, shape (profile,). [m s-1]
    headings : array, shape (runway,), optional
        True headings of the runways. [degree]

    Returns
    -------
    Criteria
        ``met`` is False where there is no value, and ``why`` says so: a rule that cannot be judged
        is not a rule that is passed. Nor is one that the winds do not reach up to: see ``span``.
        The ``error`` of a headwind change or of a speed difference is that of two components along
        a line, of a vector difference the same, of a shear that over the rule's depth (over the
        gap where the layer lies between two levels).

    Raises
    ------
    ValueError
        For a metric that is not known.
    """
    values, errors, spans, reasons = [], [], [], []
    levels = {top: low_levels(stack, top) for top in dict.fromkeys(rule.top for rule in rules)}
    for rule in rules:
        if rule.metric not in METRICS:
            raise ValueError(
                f"rule {rule.name!r} has the metric {rule.metric!r}. Use {', '.join(METRICS)}."
            )
        value, depth, span, why = _measure(levels[rule.top], rule, headings)
        values.append(value)
        errors.append(np.where(np.isfinite(value), np.sqrt(2.0) * error / depth, np.nan))
        spans.append(span)
        reasons.append(why)
    shape = (stack.profile_count, len(rules))
    threshold = np.array([rule.threshold for rule in rules], dtype=float)
    strict = np.array([rule.strict for rule in rules], dtype=bool)
    value = np.stack(values, axis=-1) if rules else np.zeros(shape)
    span = np.stack(spans, axis=-1) if rules else np.zeros(shape, dtype=object)
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
        error=np.stack(errors, axis=-1) if rules else np.zeros(shape),
        lower_bound=span != "",
        span=span,
        why=np.stack(reasons, axis=-1) if rules else np.zeros(shape, dtype=object),
    )


def _measure(
    levels: tuple[Any, Floats, Any], rule: Rule, headings: Floats | None
) -> tuple[Floats, Floats, Words, Words]:
    """Value, the depth that divides its error, what the winds do not span, why there is none."""
    count, z, w = levels
    why = np.where(
        count < 2, f"there are fewer than two usable winds up to {_feet(rule.top)}", ""
    ).astype(object)
    span = _not_spanned(count, z, rule.top)
    whole = np.ones(count.shape)
    if rule.metric == "shear":
        base, top, difference = strongest_layer(z, w, rule.depth)
        with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
            value = np.where(count < 2, np.nan, np.abs(difference) / (top - base))
            depth = top - base
        thin = (why == "") & ~np.isfinite(value)
        why[thin] = f"the winds up to {_feet(rule.top)} span less than {_feet(rule.depth)}"
        ends = measured_between(z, base[:, np.newaxis], top[:, np.newaxis])
        with np.errstate(invalid="ignore"):
            gap = np.fmax(depth, (ends[1] - ends[0])[:, 0])
            coarse = (why == "") & (span == "") & (ends[2][:, 0] > rule.depth * 1.001)
        depth = np.where(ends[3][:, 0], depth, gap)
        # A rule of no depth asks for the levels' own spacing, whatever it is.
        span[coarse & (rule.depth > 0)] = "levels are farther apart than the rule's depth"
        return value, depth, np.where(why == "", span, ""), why
    if rule.metric == "headwind_change":
        value = _largest_headwind_change(w, headings)
        return np.where(count < 2, np.nan, value), whole, np.where(why == "", span, ""), why
    with np.errstate(invalid="ignore"):
        high = (count >= 2) & ~(z[..., 0] <= SURFACE_LIMIT)
        difference = (
            np.abs(w - w[..., :1])
            if rule.metric == "vector_difference"
            else np.abs(np.abs(w) - np.abs(w[..., :1]))
        )
    why[high] = (
        f"the lowest wind is above the surface layer, higher than {SURFACE_LIMIT:.0f} m (98 ft)"
    )
    largest = np.max(np.where(np.isfinite(difference), difference, -np.inf), axis=-1)
    return np.where(why == "", largest, np.nan), whole, np.where(why == "", span, ""), why


def _not_spanned(count: Floats, z: Floats, top: float) -> Words:
    """Say where the winds begin above the surface layer or end below the top of the rule."""
    last = np.take_along_axis(z, np.maximum(count - 1, 0)[:, np.newaxis], -1)[:, 0]
    with np.errstate(invalid="ignore"):
        high = ~(z[:, 0] <= SURFACE_LIMIT)
        low = ~(last >= top * (1 - 1e-9))
    text = np.select(
        [high & low, high, low],
        [
            "the winds begin above the surface layer and end below the rule's top",
            "the winds begin above the surface layer",
            "the winds end below the rule's top",
        ],
        "",
    )
    return text.astype(object)


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


def _feet(height: float) -> str:
    return f"{height / FOOT:.0f} ft ({height:.0f} m)"
