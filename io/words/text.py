"""
The printed statement of one profile.

Plain text of at most 80 columns, readable without colour: first what a reader must know in two or
three sentences, then each subject with its numbers, errors and verdict, last the cautions. The
functions return text; the command line prints it.
"""

from __future__ import annotations

import numpy as np

from backveer.io.readers.reading import FileReading, Reading
from backveer.io.words.cautions import GENERAL
from backveer.io.words.findings import findings, level_findings
from backveer.io.words.opening import file_of, heading, how_read, in_short, span
from backveer.io.words.page import (
    bullet,
    pairs_of,
    section,
    table,
    undetermined,
    wrapped,
)
from backveer.io.words.safe import safe
from backveer.io.words.units import DEGREE, NAMED, Unit, Units, plainly, with_error
from backveer.profiles.stack import wind_from_direction
from backveer.profiles.statement import Statement


def statement_text(
    said: Statement,
    index: int,
    *,
    reading: Reading | None = None,
    units: str = "si",
    sources: bool = False,
) -> str:
    """
    Write the statement of one profile.

    Parameters
    ----------
    said
        The statement of a stack.
    index
        Which of its profiles, from 0.
    reading
        What it was read from, for the remarks.
    units
        ``"si"`` or ``"aviation"``.
    sources
        Add the method, equation and publication of each number.
    """
    one = said.select(index)
    shown = NAMED[units]
    file, row = file_of(reading, index)
    parts = [
        "\n".join(part for part in (heading(one, shown), how_read(one, file)) if part),
        in_short(one, shown),
        _turning(one, shown),
        _ekman(one, shown),
        _viscosity(one, shown),
        _balance(one, shown),
        _advection(one, shown),
        _boundary_layer(one, shown),
        _remarks(one, row, file),
    ]
    if sources:
        from backveer.io.words.sources import sources_text

        parts.append(sources_text())
    parts.append(wrapped("Caution: " + GENERAL))
    return "\n\n".join(part for part in parts if part)


def _imposed(model: str) -> str:
    """Without slip the angle is 45 degrees whatever the air does: it is no measurement."""
    return ", the angle that no slip imposes" if model == "no slip" else ""


def _angle(one: Statement) -> str:
    angle = one.ekman.cross_isobar_angle[0]
    if _imposed(one.ekman.model[0]):
        return plainly(angle, DEGREE)
    return with_error(angle, one.ekman.cross_isobar_angle_error[0], DEGREE)


def _turning(one: Statement, units: Units) -> str:
    turned = one.turning
    rows = []
    for i in range(turned.layer_base.shape[1]):
        base, top = turned.layer_base[0, i], turned.layer_top[0, i]
        if not np.isfinite(base):
            continue
        bounds = [plainly(base, units.height), plainly(top, units.height)]
        change = turned.layer_speed_change[0, i]
        stronger = [
            plainly(change, units.speed, 1, True),
            plainly(change / (top - base), units.strengthening, 1, True),
        ]
        if turned.layer_why[0, i]:
            rows.append([*bounds, "not determined", "-", *stronger, turned.layer_why[0, i]])
            continue
        rows.append(
            [
                *bounds,
                with_error(turned.layer_turning[0, i], turned.layer_error[0, i], DEGREE, True),
                plainly(turned.layer_rate[0, i], units.rate, 1, True),
                *stronger,
                turned.layer_sense[0, i],
            ]
        )
    if not rows:
        return section("Turning and strengthening", [undetermined(turned.why[0])])
    height = units.height.name
    head = [
        ["from", "to", "turning", "rate", "stronger", "rate", ""],
        [height, height, "deg", units.rate.name, units.speed.name, units.strengthening.name, ""],
    ]
    return section(
        "Turning and strengthening with height (veering, clockwise, is positive)",
        table(head, rows, "rrrrrrl"),
    )


def _ekman(one: Statement, units: Units) -> str:
    fit = one.ekman
    title = "Friction: Ekman spiral of constant viscosity"
    if fit.verdict[0] == "not determined":
        lines = [undetermined(fit.why[0])]
    else:
        why = f": {fit.why[0]}" if fit.why[0] else ""
        speed, direction, spread, veer = _vector(
            fit.geostrophic_eastward_wind[0],
            fit.geostrophic_northward_wind[0],
            np.hypot(
                fit.geostrophic_eastward_wind_error[0], fit.geostrophic_northward_wind_error[0]
            )
            / np.sqrt(2.0),
        )
        lines = [
            wrapped(f"{fit.verdict[0]}{why}", "  "),
            *pairs_of(
                [
                    ("model", fit.model[0]),
                    (
                        "scale height",
                        with_error(fit.scale_height[0], fit.scale_height_error[0], units.height)
                        + f" {units.height.name}",
                    ),
                    (
                        "eddy viscosity",
                        with_error(
                            fit.eddy_viscosity[0], fit.eddy_viscosity_error[0], Unit("m2/s", 1.0)
                        )
                        + " m2/s",
                    ),
                    (
                        "geostrophic wind",
                        f"{with_error(speed, spread, units.speed)} {units.speed.name} from "
                        f"{with_error(direction, veer, DEGREE)} deg, at the ground",
                    ),
                    (
                        "cross-isobar angle",
                        _angle(one)
                        + " deg, surface stress toward low pressure"
                        + _imposed(fit.model[0]),
                    ),
                    (
                        "misfit (rms)",
                        f"{plainly(fit.rms[0], units.speed, 2)} {units.speed.name}, up to "
                        f"{plainly(fit.top[0], units.height)} {units.height.name}",
                    ),
                ]
            ),
        ]
    return section(title, lines)


def _viscosity(one: Statement, units: Units) -> str:
    """Tell the layer whose viscosity varies with height, where it was asked for."""
    fit = one.viscosity_profile
    if fit is None:
        return ""
    title = "Friction: viscosity that varies with height"
    if fit.verdict[0] == "not determined":
        return section(title, [undetermined(fit.why[0])])
    why = f": {fit.why[0]}" if fit.why[0] else ""
    gain = fit.aicc_gain[0]
    beside = (
        f"AICc {abs(gain):.0f} {'lower' if gain > 0 else 'higher'} than that of the best spiral"
        if np.isfinite(gain)
        else "no spiral to compare with"
    )
    shown = [
        ("friction velocity", "friction_velocity", Unit("m/s", 1.0)),
        ("roughness length", "roughness_length", Unit("m", 1.0)),
        ("depth", "depth", units.height),
        ("cross-isobar angle", "cross_isobar_angle", DEGREE),
    ]
    rows = [("shape of K", f"{fit.shape[0]}; {beside}")]
    for name, key, unit in shown:
        value = with_error(getattr(fit, key)[0], getattr(fit, f"{key}_error")[0], unit)
        rows.append((name, f"{value} {unit.name}"))
    return section(title, [wrapped(f"{fit.verdict[0]}{why}", "  "), *pairs_of(rows)])


def _balance(one: Statement, units: Units) -> str:
    title = "Distance from geostrophic balance"
    found = one.geostrophic
    lines = []
    rows = []
    for i, origin in enumerate(found.evidence_from[0]):
        if not origin:
            continue
        u, v = found.evidence_eastward[0, i], found.evidence_northward[0, i]
        if not np.isfinite(u):
            # Where there was nothing to be given, nothing is missing.
            if origin != "given":
                rows.append([origin, "not determined", "", found.evidence_why[0, i]])
            continue
        speed, direction, spread, veer = _vector(u, v, found.evidence_error[0, i])
        mark = "(used below)" if origin == found.chosen[0] else ""
        rows.append(
            [
                origin,
                f"{with_error(speed, spread, units.speed)} {units.speed.name}",
                f"from {with_error(direction, veer, DEGREE)} deg",
                mark,
            ]
        )
    if one.coriolis.why[0]:
        return section(title, [undetermined(one.coriolis.why[0])])
    if rows:
        lines += table([["geostrophic wind", "", "", ""]], rows, "llll")
    along, across = found.departure_along[0], found.departure_across[0]
    there = np.flatnonzero(np.isfinite(along))
    if there.size:
        picked = _spread_out(there, one.stack.height[0], 6)
        head = [
            ["height", "along", "across"],
            [units.height.name, units.speed.name, units.speed.name],
        ]
        departures = [
            [
                plainly(one.stack.height[0, i], units.height),
                plainly(along[i], units.speed, 1, True),
                plainly(across[i], units.speed, 1, True),
            ]
            for i in picked
        ]
        lines += ["", *table(head, departures, "rrr")]
        lines.append("  wind minus geostrophic wind; across: toward low pressure is positive")
        if np.isfinite(found.departure_error[0]):
            lines.append(
                f"  standard error of either, near the ground: "
                f"{plainly(found.departure_error[0], units.speed, 1)} {units.speed.name}"
            )
    elif one.geostrophic.departure_why[0]:
        lines.append(undetermined(f"{one.geostrophic.departure_why[0]}", "departure"))
    if np.isfinite(found.friction_velocity[0]):
        text = with_error(
            found.friction_velocity[0], found.friction_velocity_error[0], Unit("m/s", 1.0)
        )
        lines.append(f"  friction velocity {text} m/s, from the momentum integral")
    else:
        lines.append(undetermined(found.friction_velocity_why[0], "friction velocity"))
    return section(title, lines)


def _advection(one: Statement, units: Units) -> str:
    layers = one.thermal_wind
    rows = []
    for i in range(layers.layer_base_pressure.shape[1]):
        base, top = layers.layer_base_pressure[0, i], layers.layer_top_pressure[0, i]
        if not np.isfinite(base):
            continue
        where = [
            f"{plainly(base, units.pressure)}-{plainly(top, units.pressure)}",
            f"{plainly(layers.layer_base_height[0, i], units.height)}-"
            f"{plainly(layers.layer_top_height[0, i], units.height)}",
        ]
        if layers.layer_why[0, i] and not np.isfinite(layers.layer_advection[0, i]):
            rows.append([*where, "not determined", "", layers.layer_why[0, i]])
            continue
        gradient = np.hypot(
            layers.layer_temperature_gradient_eastward[0, i],
            layers.layer_temperature_gradient_northward[0, i],
        )
        rows.append(
            [
                *where,
                with_error(
                    layers.layer_advection[0, i], layers.layer_error[0, i], units.advection, True
                ),
                plainly(gradient, units.gradient, 1),
                layers.layer_sense[0, i],
            ]
        )
    title = "Temperature advection from the thermal wind (warming is positive)"
    if one.coriolis.why[0] or not rows:
        why = one.coriolis.why[0] or "no layer is covered by levels with wind and pressure"
        return section(title, [undetermined(why)])
    head = [
        ["layer", "above ground", "advection", "gradient", ""],
        [
            units.pressure.name, units.height.name, units.advection.name,
            units.gradient.name, "",
        ],
    ]  # fmt: skip
    return section(title, table(head, rows, "rrrrl"))


def _boundary_layer(one: Statement, units: Units) -> str:
    layer = one.boundary_layer
    name = units.height.name
    if np.isfinite(layer.bulk_richardson_depth[0]):
        pairs = [
            (
                "depth",
                f"{plainly(layer.bulk_richardson_depth[0], units.height)} {name} "
                f"(bulk Richardson number {layer.critical_richardson:g})",
            )
        ]
    else:
        pairs = [("depth", f"not determined, because {layer.depth_why[0]}")]
    for base, top, strength, kind in zip(
        layer.inversion_base[0],
        layer.inversion_top[0],
        layer.inversion_strength[0],
        layer.inversion_kind[0],
        strict=True,
    ):
        if np.isfinite(base):
            pairs.append(
                ("inversion", f"{kind}, {span(base, top, units)}, {strength:.1f} K warmer on top")
            )
    if np.isfinite(layer.jet_speed[0]):
        falloff = (
            f"falling off by {plainly(layer.jet_falloff[0], units.speed, 1)} {units.speed.name} "
            "above"
            if np.isfinite(layer.jet_falloff[0])
            else f"falloff not determined, because {layer.jet_why[0]}"
        )
        kind = "a low-level jet" if layer.jet_meets_criterion[0] else "no low-level jet"
        pairs.append(
            (
                "wind maximum",
                f"{plainly(layer.jet_speed[0], units.speed, 1)} {units.speed.name} at "
                f"{plainly(layer.jet_height[0], units.height)} {name}, {falloff}: {kind}",
            )
        )
    elif layer.jet_why[0]:
        pairs.append(("wind maximum", f"not determined, because {layer.jet_why[0]}"))
    return section("Boundary layer", pairs_of(pairs))


def _remarks(one: Statement, row: int, file: FileReading | None) -> str:
    said = level_findings(one.stack)[0] if file is None else findings(file)[row]
    lines = [bullet(safe(remark, 400)) for remark in said]
    return section("Remarks", lines) if lines else ""


def _vector(u: float, v: float, error: float) -> tuple[float, float, float, float]:
    """Speed, direction, and the error of each from that of a component."""
    speed = float(np.hypot(u, v))
    veer = float(np.degrees(error / speed)) if speed > 0 else float("nan")
    return speed, float(wind_from_direction(np.array(u), np.array(v))), float(error), veer


def _spread_out(places: np.ndarray, heights: np.ndarray, count: int) -> list[int]:
    """Pick levels about evenly in the square root of height, denser where the wind bends."""
    if places.size <= count:
        return [int(i) for i in places]
    z = np.sqrt(np.maximum(heights[places], 0.0))
    wanted = np.linspace(z[0], z[-1], count)
    return sorted({int(places[np.argmin(np.abs(z - goal))]) for goal in wanted})
