"""
The printed answer about the low-level shear of one profile, 80 columns wide.

First what a forecaster must know at once, then layers, the flight path, criteria and cause, last
the candidates and the cautions. Functions return text; the command line prints it.
"""

from __future__ import annotations

import numpy as np

from backveer.io.readers.reading import Reading
from backveer.io.words.cautions import AVIATION as CAUTION
from backveer.io.words.findings import findings, level_findings
from backveer.io.words.opening import file_of, span
from backveer.io.words.page import (
    bullet,
    name_of,
    pairs_of,
    place_of,
    section,
    table,
    time_of,
    undetermined,
    wrapped,
)
from backveer.io.words.safe import safe
from backveer.io.words.shear_path import path_section
from backveer.io.words.shear_record import ShearAnswer
from backveer.io.words.units import DEGREE, NAMED, Unit, Units, plainly, with_error
from backveer.profiles.low_level_shear import INTENSITY
from backveer.profiles.shear_statement import ShearStatement

TERMS = (
    "Terms: "
    + ", ".join(
        f"{term} {how} {bound:.0f}"
        for (term, _), (how, bound) in zip(
            INTENSITY,
            [("below", INTENSITY[1][1])]
            + [("from", bound) for _, bound in INTENSITY[1:-1]]
            + [("above", INTENSITY[-1][1])],
            strict=True,
        )
    )
    + " kt per 100 ft; ICAO, after the Fifth Air Navigation Conference (1967), as told of Doc 9817 "
    "and Circular 186 (from memory and second hand)."
)


def shear_text(
    answered: ShearAnswer,
    index: int,
    *,
    reading: Reading | None = None,
    units: str = "aviation",
    sources: bool = False,
) -> str:
    """
    Write what is said of the low-level shear of one profile.

    Parameters
    ----------
    answered
        The answer for a stack.
    index
        Which of its profiles, from 0.
    reading
        What it was read from, for the remarks.
    units
        ``"si"`` or ``"aviation"``.
    sources
        Add the method, equation and publication of each number.
    """
    one, shown = answered.said.select(index), NAMED[units]
    parts = [
        _heading(one, shown),
        _strongest(one, shown),
        _layers(one, shown),
        _from_surface(one, shown),
        path_section(one, answered.runways, shown),
        _criteria(one, shown),
        _cause(one, shown),
        _candidates(answered, index),
        _remarks(one, reading, index),
    ]
    if sources:
        from backveer.io.words.shear_sources import sources_text

        parts.append(sources_text())
    parts.append(wrapped("Caution: " + CAUTION))
    return "\n\n".join(part for part in parts if part)


def _heading(one: ShearStatement, units: Units) -> str:
    stack = one.stack
    when = "" if np.isnat(stack.time[0]) else f", {time_of(stack.time[0])}"
    lines = [f"{name_of(stack, 0)}{when}", place_of(stack, 0)]
    z = stack.height[0][stack.usable("wind")[0]]
    z = z[z <= one.settings.top * (1 + 1e-9)]
    if z.size:
        levels = f"{z.size} level{'s' * (z.size != 1)} with wind"
        where = span(z[0], z[-1], units) if z.size > 1 else f"{plainly(z[0], units.height)} "
        where += "" if z.size > 1 else units.height.name
        lines.append(
            f"{levels} from {where} above ground; standard error of a wind component "
            f"{plainly(one.wind_error[0], units.speed, 1)} {units.speed.name}"
        )
    return "\n".join(wrapped(line) for line in lines)


def _strongest(one: ShearStatement, units: Units) -> str:
    shear = one.shear
    title = f"Low-level wind shear, ground to {_height(one.settings.top, units)}"
    if shear.why[0]:
        return section(title, [undetermined(shear.why[0])])
    step = _height(shear.step, units)
    pairs = []
    if np.isfinite(shear.window_shear[0]):
        pairs.append((f"strongest over {step}", _window(one, units)))
    else:
        pairs.append((f"over {step}", f"not determined, because the winds span less than {step}"))
    if np.isfinite(shear.maximum_shear[0]):
        base, top = shear.maximum_base[0], shear.maximum_top[0]
        deep = f"{_height(top - base, units)} deep"
        if shear.maximum_shear[0] >= shear.maximum_error[0]:
            value = with_error(shear.maximum_shear[0], shear.maximum_error[0], units.shear)
            thin = top - base < shear.step * (1 - 1e-9)
            note = (
                f"; thinner than the {step} that the terms are for"
                if thin
                else f"; {shear.maximum_intensity[0]}"
            )
            text = f"{value} {units.shear.name} from {span(base, top, units)}, {deep}{note}"
        else:
            text = f"smaller than its error ({span(base, top, units)}): no shear"
        pairs.append(("between two levels", text))
    if shear.surface_why[0]:
        pairs.append(("surface wind", f"not determined, because {shear.surface_why[0]}"))
    elif _surface_speed(one) == 0:
        pairs.append(("surface wind", f"calm at {_height(shear.surface_height[0], units)}"))
    return section(title, [*pairs_of(pairs), wrapped(TERMS, "  ")])


def _window(one: ShearStatement, units: Units) -> str:
    shear = one.shear
    base, top = shear.window_base[0], shear.window_top[0]
    if not shear.window_shear[0] >= shear.window_error[0]:
        return f"smaller than its error ({span(base, top, units)}): no shear"
    least = "at least " if shear.window_lower_bound[0] else ""
    value = with_error(shear.window_shear[0], shear.window_error[0], units.shear)
    turn = shear.window_direction_change[0]
    turned = (
        f", direction {plainly(turn, DEGREE, 0, True)} deg"
        if np.isfinite(turn)
        else ", direction not determined"
    )
    text = (
        f"{least}{value} {units.shear.name} ({shear.window_intensity[0]}) from "
        f"{span(base, top, units)}; vector difference "
        f"{plainly(shear.window_vector_difference[0], units.speed, 1)} {units.speed.name}, speed "
        f"{plainly(shear.window_speed_difference[0], units.speed, 1, True)} {units.speed.name}"
        f"{turned}"
    )
    if shear.window_lower_bound[0]:
        low, high = shear.window_measured_base[0], shear.window_measured_top[0]
        text += (
            f". A lower bound: measured between levels at {span(low, high, units)}, and thinner "
            "shear may hide between them"
        )
    return text


def _layers(one: ShearStatement, units: Units) -> str:
    """Tell the fixed steps, neighbours of one term together, and the three strongest pairs."""
    shear = one.shear
    groups: list[list[int]] = []
    for i in np.flatnonzero(np.isfinite(shear.step_shear[0])):
        same = groups and (
            groups[-1][-1] == i - 1
            and shear.step_intensity[0, i] == shear.step_intensity[0, i - 1]
            and shear.step_lower_bound[0, i] == shear.step_lower_bound[0, i - 1]
        )
        if same:
            groups[-1].append(int(i))
        else:
            groups.append([int(i)])
    rows = []
    for group in groups:
        strongest = max(group, key=lambda i: shear.step_shear[0, i])
        rows.append(
            [
                plainly(shear.step_base[0, group[0]], units.height),
                plainly(shear.step_top[0, group[-1]], units.height),
                _with(shear.step_shear[0, strongest], shear.step_error[0, strongest], units),
                *_change(shear, "step", strongest, units),
                shear.step_intensity[0, strongest] or "none",
                "lower bound" if shear.step_lower_bound[0, group[0]] else "",
            ]
        )
    pairs = shear.layer_shear[0]
    order = [int(i) for i in np.argsort(-np.where(np.isfinite(pairs), pairs, -1.0), kind="stable")]
    order = sorted(i for i in order[:3] if np.isfinite(pairs[i]))
    between = [
        [
            plainly(shear.layer_base[0, i], units.height),
            plainly(shear.layer_top[0, i], units.height),
            _with(pairs[i], shear.layer_error[0, i], units),
            *_change(shear, "layer", i, units),
            shear.layer_intensity[0, i] or "none",
            "lower bound" if shear.layer_lower_bound[0, i] else "",
        ]
        for i in order
    ]
    parts = []
    sides = "rrrrrrll"
    if rows:
        title = f"Layers of {_height(shear.step, units)}, each row's strongest"
        parts.append(section(title, table(_head(units), rows, sides)))
    count = int(np.isfinite(pairs).sum())
    if between:
        which = "all" if count <= 3 else f"the strongest 3 of {count}"
        parts.append(
            section(f"Between neighbouring levels, {which}", table(_head(units), between, sides))
        )
    return "\n\n".join(parts)


def _head(units: Units) -> list[list[str]]:
    height, speed = units.height.name, units.speed.name
    return [
        ["from", "to", "shear", "vector", "speed", "dir.", "term", ""],
        [height, height, units.shear.name, speed, speed, "deg", "", ""],
    ]


def _change(shear: object, kind: str, i: int, units: Units) -> list[str]:
    turn = getattr(shear, f"{kind}_direction_change")[0, i]
    return [
        plainly(getattr(shear, f"{kind}_vector_difference")[0, i], units.speed, 1),
        plainly(getattr(shear, f"{kind}_speed_difference")[0, i], units.speed, 1, True),
        plainly(turn, DEGREE, 0, True),
    ]


def _from_surface(one: ShearStatement, units: Units) -> str:
    shear = one.shear
    title = "From the surface wind"
    if shear.why[0]:
        return ""
    if shear.surface_why[0]:
        return section(title, [undetermined(shear.surface_why[0])])
    rows = [
        [
            plainly(shear.reach_height[0, i], units.height),
            _with(shear.reach_shear[0, i], shear.reach_error[0, i], units),
            *_change(shear, "reach", int(i), units),
        ]
        for i in np.flatnonzero(np.isfinite(shear.reach_shear[0]))
    ]
    title = f"{title} at {_height(shear.surface_height[0], units)} to"
    if not rows:
        return section(title, [undetermined("the profile ends below the lowest of these heights")])
    head = [
        ["height", "shear", "vector", "speed", "dir."],
        [units.height.name, units.shear.name, units.speed.name, units.speed.name, "deg"],
    ]
    lines = table(head, rows, "rrrrr")
    missing = shear.reach_height.shape[1] - len(rows)
    if missing:
        lines.append(f"  ({missing} higher not reached by the profile)")
    return section(title, lines)


def _criteria(one: ShearStatement, units: Units) -> str:
    criteria = one.criteria
    lines = []
    for i, rule in enumerate(one.settings.rules):
        unit = units.shear if rule.metric == "shear" else units.speed
        value, error = criteria.value[0, i], criteria.error[0, i]
        if not np.isfinite(value):
            verdict, text = "not judged", f"not determined, because {criteria.why[0, i]}"
        else:
            verdict = "met" if criteria.met[0, i] else "not met"
            at_least = "at least " if criteria.lower_bound[0, i] else ""
            text = (
                f"value {at_least}{with_error(value, error, unit)}, threshold "
                f"{'above ' if rule.strict else ''}{plainly(rule.threshold, unit, 1)}, margin "
                f"{plainly(criteria.margin[0, i], unit, 1, True)} {unit.name}"
            )
            if abs(criteria.margin[0, i]) < error:
                text += "; the margin is smaller than the error"
            if criteria.lower_bound[0, i]:
                text += f"; {criteria.span[0, i]}"
        lines += pairs_of([(verdict.ljust(10), safe(f"{rule.name}: {text}", 500))])
        source = f"{rule.authority}; {rule.verified or 'not said how it was verified'}"
        lines += pairs_of([(" " * 10, safe(source, 500))])
    if not lines:
        lines = [undetermined("no criteria were given")]
    along = any(rule.metric == "headwind_change" for rule in one.settings.rules)
    if along and not one.settings.headings:
        lines.append(wrapped("no runway is given: along the heading of largest change", "  "))
    if along:
        lines.append(
            wrapped(
                "A change along the path is between any two of its heights, however slowly it "
                "comes: an aircraft meets less of it at once.",
                "  ",
            )
        )
    return section("Criteria (local rules decide; --criteria adds or replaces)", lines)


def _cause(one: ShearStatement, units: Units) -> str:
    cause = one.cause
    if cause is None or one.shear.why[0]:
        return ""
    pairs = [("cause", f"{cause.cause[0]}: {cause.evidence[0]}")]
    if cause.cause[0] == "not determined":
        pairs = [("cause", f"not determined, because {cause.evidence[0]}")]
    if np.isfinite(cause.base[0]):
        pairs.append(("layer", span(cause.base[0], cause.top[0], units)))
    if np.isfinite(cause.turning[0]):
        turn = with_error(cause.turning[0], cause.turning_error[0], DEGREE, True)
        pairs.append(("wind turns", f"{turn} deg across it (veering is positive)"))
    if np.isfinite(cause.potential_temperature_difference[0]):
        warm = cause.potential_temperature_difference[0]
        pairs.append(("stability", f"potential temperature {warm:+.1f} K from its base to its top"))
    if cause.stability[0]:
        number = with_error(cause.richardson_number[0], cause.richardson_error[0], Unit("1", 1.0))
        pairs.append(
            (
                "Richardson",
                f"gradient number {number}: {cause.stability[0]} (critical 0.25; over this layer, "
                "a thinner one inside may differ)",
            )
        )
    else:
        pairs.append(("Richardson", f"not determined, because {cause.richardson_why[0]}"))
    layer = one.boundary_layer
    if np.isfinite(layer.jet_speed[0]) and layer.jet_meets_criterion[0]:
        pairs.append(
            (
                "jet",
                f"{plainly(layer.jet_speed[0], units.speed)} {units.speed.name} at "
                f"{_height(layer.jet_height[0], units)}",
            )
        )
    for i in np.flatnonzero(layer.inversion_base[0] < one.settings.top):
        where = span(layer.inversion_base[0, i], layer.inversion_top[0, i], units)
        strength = layer.inversion_strength[0, i]
        pairs.append(
            ("inversion", f"{layer.inversion_kind[0, i]}, {where}, {strength:.1f} K warmer on top")
        )
    return section("Cause of the strongest shear", pairs_of(pairs))


def _candidates(answered: ShearAnswer, index: int) -> str:
    group = answered.group[index] or "none"
    lines = pairs_of([("group", f"{group} (non-convective wind-shear group of the TAF code)")])
    lines.append(wrapped(safe(answered.sentence[index], 2000), "  "))
    return section("Candidates for a forecaster's judgement; nothing here is issued", lines)


def _remarks(one: ShearStatement, reading: Reading | None, index: int) -> str:
    file, row = file_of(reading, index)
    said = level_findings(one.stack)[0] if file is None else findings(file)[row]
    lines = [bullet(safe(remark, 400)) for remark in said]
    return section("Remarks", lines) if lines else ""


def _with(value: float, error: float, units: Units) -> str:
    return with_error(value, error, units.shear) if value >= error else "< error"


def _height(height: float, units: Units) -> str:
    return f"{plainly(height, units.height)} {units.height.name}"


def _surface_speed(one: ShearStatement) -> float:
    usable = np.flatnonzero(one.stack.usable("wind")[0])
    return float(one.stack.wind_speed[0, usable[0]]) if usable.size else float("nan")
