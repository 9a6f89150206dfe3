"""
How far a fit with varying viscosity can be trusted, and why not farther.

As in :mod:`backveer.profiles.ekman_verdict`, the limits are choices about when to withhold a
number, stated one by one.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.ekman_verdict import BETTER, LIGHT, MISFIT, MISFIT_LEAST, NOT, WEAKLY, WELL
from backveer.profiles.labels import Words
from backveer.profiles.viscosity_search import TREND

SHORT, SHORTISH = 0.3, 0.8  # depths that the profile must reach to see any, and enough of the layer
HIGH = 0.3  # depths of the lowest level above which stress and roughness are not seen
LOST = 0.7  # error of ln u* or ln h above which it is known only to a factor of two
LOOSE = 0.15  # error of ln u* above which the answer is weak
ROUGH = 2.3  # error of ln z0 above which it is not known to a factor of ten


@dataclass(frozen=True)
class Evidence:
    """
    What the verdict rests on; arrays over profile.

    ``gain`` and ``friction`` say by how much AICc is better than that of the analytic family and
    of a wind without friction; ``chosen`` and ``errors`` are the estimates and their errors;
    ``noise`` is what the fit leaves, ``floor`` the wind's own error [m s-1]; ``trend`` is the chi
    square of a change with height that the fit leaves over.
    """

    declined: Any
    levels: Any
    fitted: Any
    top: float
    found: Any
    gain: Any
    friction: Any
    reach: Any
    lowest: Any
    noise: Any
    floor: Any
    trend: Any
    rms: Any
    chosen: dict[str, Any]
    errors: dict[str, Any]
    given: Any


def judge(evidence: Evidence) -> tuple[Words, Words]:
    """
    Return the verdict on each profile and its reason, empty where it is well determined.

    The first reason that holds is the one that is told, the graver ones first.
    """
    e = evidence
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        speed = np.hypot(e.chosen["eastward"], e.chosen["northward"])
        error_g = np.hypot(e.errors["eastward"], e.errors["northward"])
        depth = np.exp(e.chosen["log_depth"])
        span, start = e.reach / depth, e.lowest / depth
        error_u = e.errors["log_friction_velocity"]
        component = e.rms / np.sqrt(2.0)
        light = speed < LIGHT * np.maximum(error_g, e.noise)
        lost = light | ~(error_u < LOST) | ~(e.errors["log_depth"] < LOST)
        grave = [
            (e.declined != "", e.declined),
            (~e.fitted, _numbered("too few levels with wind ({:d}) in the layer", e.levels)),
            (~e.found, "the depth runs to the end of what the profile can tell"),
            (
                ~(e.friction >= BETTER),
                "the profile shows no friction: a wind that is constant or linear with height "
                "fits as well",
            ),
            (
                lost & (e.trend > TREND),
                "the geostrophic wind seems to change with height more than this layer can bear",
            ),
            (light, "light wind"),
            (span < SHORT, _numbered("the profile ends at {:.1f} depths of the layer", span)),
            (start > HIGH, _numbered("the lowest level is at {:.1f} depths of the layer", start)),
            (
                ~(error_u < LOST),
                "the friction velocity is known only to a factor of two or worse",
            ),
            (
                ~(e.errors["log_depth"] < LOST),
                "the depth is known only to a factor of two or worse",
            ),
        ]
        mild = [
            (
                e.gain < -BETTER,
                "a constant viscosity fits the profile better",
            ),
            (
                e.trend > TREND,
                "what is left over changes with height: the geostrophic wind may, and here it "
                "may not",
            ),
            (span < SHORTISH, _numbered("the profile ends at {:.1f} depths of the layer", span)),
            (
                ~e.given & ~(e.errors["log_roughness_length"] < ROUGH),
                "the roughness length is not known to a factor of ten",
            ),
            (error_u > LOOSE, "the error of the friction velocity is large"),
            (error_g > LOOSE * speed, "the error of the geostrophic wind is large"),
            (
                (component > MISFIT * e.floor) & (component > MISFIT_LEAST),
                _numbered("the layer misses the profile by {:.1f} m/s", e.rms),
            ),
        ]
    why = np.full(e.fitted.shape, "", dtype=object)
    verdict = np.full(e.fitted.shape, WELL, dtype=object)
    for conditions, word in ((grave, NOT), (mild, WEAKLY)):
        for holds, reason in conditions:
            new = holds & (why == "")
            verdict[new] = word
            text = reason(new) if callable(reason) else reason
            why[new] = np.broadcast_to(np.asarray(text, dtype=object), why.shape)[new]
    return verdict, why


def _numbered(form: str, number: Any) -> Any:
    """Return a reason with a number in it, written only for the profiles that need it."""

    def text(rows: Any) -> Any:
        words = np.full(rows.shape, "", dtype=object)
        words[rows] = [form.format(x) for x in number[rows].tolist()]
        return words

    return text
