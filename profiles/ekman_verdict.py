"""
How far a fitted Ekman member can be trusted, and why not farther.

The limits are ours, stated here one by one; they are choices about when to withhold a number, not
facts about the air.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.labels import Words

WELL, WEAKLY, NOT = "well determined", "weakly determined", "not determined"

SHORT = 1.0  # scale heights below the top under which friction and G are not told apart
SHORTISH = 1.95  # ... and only weakly, for e is still 0.14 there: 2.0 as it is written
HIGH = 1.5  # scale heights of the lowest level above which the frictional part is not seen
CALM = 0.3  # m/s: Beaufort 0 (WMO-No. 306, from memory), below which a wind has no direction
LIGHT = 3.0  # geostrophic wind over its error, or over the noise, under which the wind is light
LOOSE = 0.15  # error of ln(scale height), or of G over G, above which a fit is weak: K to a third
LOST = 0.7  # error of ln(scale height) above which it is known only to a factor of two
BETTER = 2.0  # by how much friction must improve on a wind without friction
MISFIT = 3.0  # residual over the wind's own error, where that is known, and
MISFIT_LEAST = 1.0  # m/s: above both the spiral misses the profile
ASTRAY = 60.0  # degrees of the surface wind from the surface stress, against Taylor's condition
ASTRAY_ERRORS = 2.0


@dataclass(frozen=True)
class Evidence:
    """
    What the verdict rests on; arrays over profile, or over profile and member.

    ``chosen`` is the chosen member, as :mod:`backveer.profiles.ekman_parameters` describes it,
    ``errors`` those of its quantities with the doubt about the member, and ``own`` without;
    ``sound`` says which members could be fitted, ``inside`` whose scale height is no end of the
    range.
    """

    declined: Any
    levels: Any
    enough: Any
    fitted: Any
    strongest: Any
    top: float
    sound: Any
    inside: Any
    aicc: Any
    aicc_anywhere: Any
    null: Any
    unturned: Any
    wrong_sense: Any
    lowest: Any
    reach: Any
    noise: Any
    floor: Any
    rms: Any
    chosen: dict[str, Any]
    errors: dict[str, Any]
    own: dict[str, Any]


def judge(evidence: Evidence) -> tuple[Words, Words]:
    """
    Return the verdict on each profile and its reason, empty where it is well determined.

    The first reason that holds is the one that is told, the graver ones first.
    """
    e = evidence
    chosen, errors = e.chosen, e.errors
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        speed = np.abs(chosen["geostrophic"])
        error_g = np.hypot(errors["eastward"], errors["northward"])
        own_g = np.hypot(e.own["eastward"], e.own["northward"])
        error_delta, own_delta = errors["log_scale_height"], e.own["log_scale_height"]
        loose = (error_delta > LOOSE, error_g > LOOSE * speed)
        # Each member by itself is sure of its answer, and they do not agree.
        tie = (loose[0] | loose[1]) & ~(own_delta > LOOSE) & ~(own_g > LOOSE * speed)
        span = e.reach / chosen["scale_height"]
        start = e.lowest / chosen["scale_height"]
        best = e.aicc.min(axis=-1)
        found = np.isfinite(best)
        angle, error_angle = chosen["cross_isobar_angle"], errors["cross_isobar_angle"]
        surface = chosen["geostrophic"] + chosen["amplitude"]
        astray = np.abs(np.degrees(np.angle(surface * np.conj(chosen["stress"]))))
        astray = np.where(np.abs(surface) > LIGHT * e.noise, astray, 0.0)
        component = e.rms / np.sqrt(2.0)
        grave = [
            (e.declined != "", e.declined),
            (~e.enough, _Numbered("too few levels ({:d}) below " + f"{e.top:.0f} m", e.levels)),
            (~e.fitted, "the heights do not increase from the ground"),
            (e.strongest < CALM, "light wind"),
            (e.wrong_sense, WRONG),
            (~found & (e.null - e.aicc_anywhere < BETTER), NO_FRICTION),
            (~found & (e.sound & ~e.inside).any(axis=-1), EDGE),
            (
                ~found,
                "the levels lie too close together, or the winds are too strong, to be fitted",
            ),
            (e.null - best < BETTER, NO_FRICTION),
            (e.unturned - best < BETTER, UNTURNED),
            (speed < LIGHT * np.maximum(error_g, e.noise), "light wind"),
            (span < SHORT, _Numbered("the profile ends at {:.1f} scale heights", span)),
            (start > HIGH, _Numbered("the lowest level is at {:.1f} scale heights", start)),
            (angle + 2.0 * error_angle < 0, WRONG),
            (
                ~(error_delta < LOST),
                "the scale height is known only to a factor of two or worse",
            ),
        ]
        mild = [
            (span < SHORTISH, _Numbered("the profile ends at {:.1f} scale heights", span)),
            (angle < 0, WRONG),
            (tie, "two models fit equally"),
            (loose[0], "the error of the scale height is large"),
            (loose[1], "the error of the geostrophic wind is large"),
            (
                (component > MISFIT * e.floor) & (component > MISFIT_LEAST) & (e.floor > 0),
                _Numbered("the spiral misses the profile by {:.1f} m/s", e.rms),
            ),
            (
                (astray > ASTRAY) & (astray > ASTRAY_ERRORS * error_angle),
                _Numbered("the surface wind lies {:.0f} degrees off the surface stress", astray),
            ),
        ]
    why = np.full(e.fitted.shape, "", dtype=object)
    verdict = np.full(e.fitted.shape, WELL, dtype=object)
    for conditions, word in ((grave, NOT), (mild, WEAKLY)):
        for holds, reason in conditions:
            new = holds & (why == "")
            verdict[new] = word
            why[new] = np.broadcast_to(np.asarray(_text(reason, new), dtype=object), why.shape)[new]
    return verdict, why


NO_FRICTION = (
    "the profile shows no friction: a wind that is constant or linear with height fits as well"
)
UNTURNED = (
    "the profile shows no turning by friction: a wind that strengthens along a straight line fits "
    "as well"
)
EDGE = "the scale height runs to the end of what the profile can tell"
WRONG = "the turning has the wrong sense for friction at this latitude"


@dataclass(frozen=True)
class _Numbered:
    """A reason with a number in it, written only for the profiles that need it."""

    form: str
    number: Any


def _text(reason: Any, rows: Any) -> Any:
    if not isinstance(reason, _Numbered):
        return reason
    words = np.full(rows.shape, "", dtype=object)
    words[rows] = [reason.form.format(number) for number in reason.number[rows].tolist()]
    return words
