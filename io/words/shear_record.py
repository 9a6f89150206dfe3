"""The JSON of low-level shear: SI, one object a profile."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from backveer.io.words.cautions import AVIATION
from backveer.io.words.record import LEVEL_DECIMALS, plain
from backveer.io.words.shear_group import candidate_groups
from backveer.io.words.shear_sentence import sentences
from backveer.profiles.labels import Floats, Words
from backveer.profiles.low_level_shear import INTENSITY, KNOT_PER_100_FEET
from backveer.profiles.shear_statement import ShearStatement

LAYER = (
    "base",
    "top",
    "shear",
    "vector_difference",
    "speed_difference",
    "direction_change",
    "intensity",
    "lower_bound",
    "error",
)
REACH = ("height", "vector_difference", "shear", "speed_difference", "direction_change", "error")
WINDOW = (*LAYER, "measured_base", "measured_top")
PATH = (
    "approach_change",
    "approach_worst_rate",
    "approach_worst_base",
    "approach_worst_top",
    "approach_worst_per_second",
    "approach_f_factor",
    "departure_change",
    "departure_worst_rate",
    "departure_worst_per_second",
    "departure_f_factor",
    "largest_loss",
    "largest_gain",
)
JUDGED = ("value", "met", "margin", "error", "lower_bound", "span", "why")
CAUSE = (
    "base",
    "top",
    "cause",
    "evidence",
    "turning",
    "turning_error",
    "potential_temperature_difference",
    "richardson_number",
    "richardson_error",
    "unstable",
    "stability",
    "richardson_why",
)


@dataclass(frozen=True, eq=False)
class ShearAnswer:
    """
    What is said of the low-level shear of a stack, with the words made from it.

    ``runways`` are the names of the ends, in the order of the headings.
    """

    said: ShearStatement
    runways: tuple[str, ...]
    group: Words
    group_height: Floats
    sentence: Words


def answer(said: ShearStatement, runways: tuple[str, ...]) -> ShearAnswer:
    """Write the candidate group and the sentence of each profile in which a criterion is met."""
    groups, heights = candidate_groups(said.stack, said.any_met)
    return ShearAnswer(said, runways, groups, heights, sentences(said, heights))


def shear_records(answered: ShearAnswer) -> list[dict[str, Any]]:
    """Return the value of ``low_level_shear`` for each profile."""
    said = answered.said
    shear, path, criteria, cause = said.shear, said.path, said.criteria, said.cause
    tables = {kind: _columns(shear, kind, LAYER) for kind in ("layer", "step")}
    reach = _columns(shear, "reach", REACH)
    strongest = _columns(shear, "window", WINDOW)
    pair = _columns(shear, "maximum", ("base", "top", "shear", "error", "intensity"))
    head, cross = plain(path.headwind), plain(path.crosswind)
    heights = plain(said.stack.height, LEVEL_DECIMALS)
    along = {name: plain(getattr(path, name)) for name in PATH}
    ends = {name: plain(getattr(path, f"path_{name}")) for name in ("base", "top")}
    judged = {name: plain(getattr(criteria, name)) for name in JUDGED}
    causes = {} if cause is None else {name: plain(getattr(cause, name)) for name in CAUSE}
    surface = plain(shear.surface_height)
    headings = plain(path.runway)

    records = []
    for row in range(said.stack.profile_count):
        runways = []
        for place, heading in enumerate(headings):
            kept = [
                (z, h, c)
                for z, h, c in zip(heights[row], head[row][place], cross[row][place], strict=True)
                if h is not None
            ]
            runways.append(
                {
                    "runway": answered.runways[place],
                    "heading": heading,
                    "height": [z for z, _, _ in kept],
                    "headwind": [h for _, h, _ in kept],
                    "crosswind": [c for _, _, c in kept],
                    **{name: values[row][place] for name, values in along.items()},
                    "why": path.why[row] or None,
                }
            )
        records.append(
            {
                "layers": _rows(tables["layer"], row, "shear"),
                "steps": _rows(tables["step"], row, "shear"),
                "from_surface": _rows(reach, row, "height"),
                "surface_height": surface[row],
                "surface_why": shear.surface_why[row] or None,
                "strongest": _one(strongest, row),
                "strongest_between_levels": _one(pair, row),
                "intensity_terms": [
                    {"term": term, "from_shear": bound * KNOT_PER_100_FEET}
                    for term, bound in INTENSITY
                ],
                "top": shear.top,
                "step": shear.step,
                "path": {
                    "base": ends["base"][row],
                    "top": ends["top"][row],
                    "ground_speed": path.ground_speed,
                    "glide_slope": path.glide_slope,
                    "climb_gradient": path.climb_slope / 100.0,
                },
                "runways": runways,
                "criteria": [
                    {
                        "rule": rule.name,
                        "authority": rule.authority,
                        "value": judged["value"][row][place],
                        "threshold": rule.threshold,
                        "unit": "s-1" if rule.metric == "shear" else "m s-1",
                        "met": judged["met"][row][place],
                        "margin": judged["margin"][row][place],
                        "error": judged["error"][row][place],
                        "lower_bound": judged["lower_bound"][row][place],
                        "not_spanned": judged["span"][row][place] or None,
                        "metric": rule.metric,
                        "top": rule.top,
                        "depth": rule.depth,
                        "wording": rule.wording,
                        "source": rule.source,
                        "verified": rule.verified,
                        "why": judged["why"][row][place] or None,
                    }
                    for place, rule in enumerate(said.settings.rules)
                ],
                **_cause(causes, row),
                "candidate_group": answered.group[row] or None,
                "sentence": answered.sentence[row],
                "why": shear.why[row] or None,
                "caution": AVIATION,
            }
        )
    return records


def _columns(holder: Any, kind: str, names: Sequence[str]) -> dict[str, list[Any]]:
    return {name: plain(getattr(holder, f"{kind}_{name}")) for name in names}


def _one(columns: dict[str, list[Any]], row: int) -> dict[str, Any]:
    return {
        name: (values[row] or None) if name == "intensity" else values[row]
        for name, values in columns.items()
    }


def _cause(causes: dict[str, list[Any]], row: int) -> dict[str, Any]:
    if not causes:
        return {"cause": None, "cause_why": "it was not looked for", "stability": None}
    return {
        "cause": causes["cause"][row],
        "cause_why": causes["evidence"][row],
        "stability": {
            "base": causes["base"][row],
            "top": causes["top"][row],
            "gradient_richardson_number": causes["richardson_number"][row],
            "error": causes["richardson_error"][row],
            "unstable": causes["unstable"][row],
            "says": causes["stability"][row] or None,
            "turning": causes["turning"][row],
            "turning_error": causes["turning_error"][row],
            "potential_temperature_difference": causes["potential_temperature_difference"][row],
            "why": causes["richardson_why"][row] or None,
        },
    }


def _rows(columns: dict[str, list[Any]], row: int, present: str) -> list[dict[str, Any]]:
    return [
        {
            name: (values[row][place] or None) if name == "intensity" else values[row][place]
            for name, values in columns.items()
        }
        for place, there in enumerate(columns[present][row])
        if there is not None
    ]
