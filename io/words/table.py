"""Many profiles: a line each, and what they have in common."""

from __future__ import annotations

import re
import textwrap
from collections import Counter

import numpy as np

from backveer.io.words.cautions import GENERAL
from backveer.io.words.page import WIDTH, cut, name_of, time_of, wrapped
from backveer.io.words.units import NAMED, Units
from backveer.profiles.labels import Bools, Floats, Words
from backveer.profiles.stack import Stack, wind_from_direction
from backveer.profiles.statement import Statement

VERDICTS = {"well determined": "well", "weakly determined": "weakly", "not determined": "not"}
SENSES = {"veering": "veers", "backing": "backs", "steady": "steady", "": "-"}
NUMBER = re.compile(r"\d+(?:\.\d+)?")
MOST_REASONS = 4
NO_SLIP = "no slip"  # its angle is the equation's and no finding


def summary_text(said: Statement, *, units: str = "si") -> str:
    """
    Write a line for each profile and a summary of all.

    Parameters
    ----------
    said
        The statement of the stack.
    units
        ``"si"`` or ``"aviation"``.
    """
    shown = NAMED[units]
    lines = _lines(said, shown)
    if (said.ekman.model == NO_SLIP).any():
        lines.append("An angle in brackets is the one that no slip imposes.")
    lines += ["", *_summary(said, shown), "", "The full statement of one: --profile N."]
    lines.append(wrapped("Caution: " + GENERAL))
    return "\n".join(lines)


def _lines(said: Statement, units: Units) -> list[str]:
    """Write the head and a line for each profile; a line of its own where the station changes."""
    height, speed = units.height.name, units.speed.name
    lines = [
        f"{'N':>5} {'time, UTC':<16} {'lev':>4} {'top':>6} {'turning':>9} {'sense':<6} "
        f"{'spiral':<6} {'angle':>5} {'geostr.':>9} {'jet':>5}",
        f"{'':>5} {'':<16} {'':>4} {height:>6} {'deg':>9} {'':<6} {'is':<6} {'deg':>5} "
        f"{'deg/' + speed:>9} {speed:>5}",
    ]
    stack, fit, layer = said.stack, said.ekman, said.boundary_layer
    g, direction = _geostrophic(said)
    jet = np.where(layer.jet_meets_criterion, layer.jet_speed, np.nan) / units.speed.size
    times = np.datetime_as_string(stack.time, unit="m").tolist()
    columns = (
        np.arange(1, stack.profile_count + 1).tolist(),
        ["-" if t == "NaT" else t.replace("T", " ") for t in times],
        stack.usable("wind").sum(axis=1).tolist(),
        _numbers(said.turning.top / units.height.size, "%.0f"),
        _with_errors(said.turning.total, said.turning.error),
        [SENSES[sense] for sense in said.turning.sense.tolist()],
        [VERDICTS[verdict] for verdict in fit.verdict.tolist()],
        _angles(fit.cross_isobar_angle, fit.model == NO_SLIP),
        _winds(direction, g / units.speed.size),
        _numbers(jet, "%.1f"),
    )
    form = "%5d %-16s %4d %6s %9s %-6s %-6s %5s %9s %5s"
    rows = [form % row for row in zip(*columns, strict=True)]
    names = _changes(stack)
    for place, row in enumerate(rows):
        if place in names:
            lines.append(names[place])
        lines.append(row)
    return lines


def _changes(stack: Stack) -> dict[int, str]:
    """Name the station, or else the source, where it differs from that of the profile before."""
    names = np.where(stack.station != "", stack.station, stack.source)
    changed = np.flatnonzero(np.concatenate([[True], names[1:] != names[:-1]]))
    return {int(place): cut(name_of(stack, place), WIDTH) for place in changed[: len(names)]}


def _summary(said: Statement, units: Units) -> list[str]:
    stack, turned, fit, layer = said.stack, said.turning, said.ekman, said.boundary_layer
    count = stack.profile_count
    times = stack.time[~np.isnat(stack.time)]
    when = f", {time_of(times.min())} to {time_of(times.max())}" if times.size else ""
    lines = [f"{count} profiles{when}"]
    told = np.isfinite(turned.total)
    if told.any():
        lines.append(
            f"turning from base to top: {_shares(turned.sense[told])}; median "
            f"{np.median(turned.total[told]):+.0f} deg"
        )
    if (~told).any():
        lines.append(f"turning not determined: {_reasons(turned.why[~told])}")
    lines.append(f"spiral: {_counts(fit.verdict)}")
    well = fit.verdict == "well determined"
    if well.any():
        lines.append(_where_well(said, units, well))
    if (~well).any():
        lines.append(f"less than well: {_reasons(fit.why[~well])}")
    sense = said.thermal_wind.layer_sense
    layers = ", ".join(
        f"{n} {name}"
        for name in ("warm", "cold", "none")
        if (n := int(np.count_nonzero(sense == name)))
    )
    if layers:
        lines.append(f"advection, layers of all profiles: {layers}")
    depth = layer.bulk_richardson_depth[np.isfinite(layer.bulk_richardson_depth)]
    if depth.size:
        middle = float(np.median(depth)) / units.height.size
        lines.append(
            f"boundary layer: median depth {middle:.0f} {units.height.name} "
            f"of {depth.size} profiles"
        )
    jets = int(np.count_nonzero(layer.jet_meets_criterion))
    share = f" ({100.0 * jets / count:.0f} %)" if jets else ""
    lines.append(f"low-level jets: {jets} of {count}{share}")
    return [lines[0], *(line for text in lines[1:] for line in _hanging(text))]


def _where_well(said: Statement, units: Units, well: Bools) -> str:
    """Tell the means over the profiles with a well determined spiral."""
    fit = said.ekman
    g, direction = _geostrophic(said)
    mean, constancy = circular_mean(direction[well])
    text = (
        f"where well determined: median scale height "
        f"{np.median(fit.scale_height[well]) / units.height.size:.0f} {units.height.name}; "
        f"geostrophic wind {np.mean(g[well]) / units.speed.size:.1f} {units.speed.name} in the "
        "mean"
    )
    if np.isfinite(mean):
        text += f", from {mean:03.0f} deg (circular mean, constancy {constancy:.2f})"
    free = well & (fit.model != NO_SLIP)
    if free.any():
        angle, _ = circular_mean(fit.cross_isobar_angle[free])
        angle = (angle + 180.0) % 360.0 - 180.0
        text += (
            f"; cross-isobar angle {angle:+.0f} deg (circular mean of {int(free.sum())} spirals "
            "with slip or shear)"
        )
    return text


def circular_mean(directions: Floats) -> tuple[float, float]:
    """
    Mean direction of unit vectors and the length of their mean.

    Parameters
    ----------
    directions : array
        Directions; NaN is left out. [degree]

    Returns
    -------
    mean, constancy : float
        0 to 360 [degree], NaN where the directions cancel; 1 where all agree, 0 where they cancel.

    References
    ----------
    Mardia, K. V., and P. E. Jupp, 2000: Directional Statistics. Wiley, ch. 2 (from memory).

    Examples
    --------
    >>> mean, constancy = circular_mean(np.array([350.0, 20.0]))
    >>> round(mean, 6), round(constancy, 3)
    (5.0, 0.966)
    """
    angle = np.radians(directions[np.isfinite(directions)])
    if not angle.size:
        return float("nan"), 0.0
    east, north = float(np.mean(np.sin(angle))), float(np.mean(np.cos(angle)))
    constancy = float(np.hypot(east, north))
    if constancy < 1e-9:
        return float("nan"), 0.0
    return float(np.degrees(np.arctan2(east, north)) % 360.0), constancy


def _geostrophic(said: Statement) -> tuple[Floats, Floats]:
    u, v = said.ekman.geostrophic_eastward_wind, said.ekman.geostrophic_northward_wind
    return np.hypot(u, v), wind_from_direction(u, v)


def _counts(verdicts: Words) -> str:
    counted = Counter(verdicts.tolist())
    return ", ".join(f"{counted[name]} {name}" for name in VERDICTS if counted[name])


def _shares(senses: Words) -> str:
    counted = Counter(senses.tolist())
    return ", ".join(
        f"{100.0 * counted[name] / senses.size:.0f} % {name}"
        for name in ("veering", "backing", "steady")
        if counted[name]
    )


def _reasons(whys: Words) -> str:
    """Count the reasons, those that differ only in a number as one with the numbers' range."""
    alike: dict[str, list[list[str]]] = {}
    for why in whys.tolist():
        alike.setdefault(NUMBER.sub("#", why), []).append(NUMBER.findall(why))
    ranked = sorted(alike.items(), key=lambda item: -len(item[1]))
    told = []
    for form, numbers in ranked[:MOST_REASONS]:
        parts = form.split("#")
        text = parts[0]
        for place, after in enumerate(parts[1:]):
            values = sorted((row[place] for row in numbers), key=float)
            low, high = values[0], values[-1]
            text += (low if low == high else f"{low} to {high}") + after
        told.append(f"{len(numbers)} times because {text or 'no reason is told'}")
    rest = sum(len(numbers) for _, numbers in ranked[MOST_REASONS:])
    return "; ".join(told + [f"{rest} times for other reasons"] * bool(rest))


def _hanging(text: str) -> list[str]:
    return textwrap.wrap(text, WIDTH, initial_indent="  ", subsequent_indent="    ")


def _numbers(values: Floats, form: str) -> list[str]:
    return [form % v if v == v else "-" for v in values.tolist()]


def _angles(values: Floats, imposed: Bools) -> list[str]:
    pairs = zip(_numbers(values, "%.0f"), imposed.tolist(), strict=True)
    return [f"({text})" if given else text for text, given in pairs]


def _with_errors(values: Floats, errors: Floats) -> list[str]:
    pairs = zip(values.tolist(), errors.tolist(), strict=True)
    return [f"{v:+.0f} ± {e:.0f}" if v == v else "-" for v, e in pairs]


def _winds(directions: Floats, speeds: Floats) -> list[str]:
    # 359.7 rounds to 360, which is north and is written so.
    pairs = zip(directions.tolist(), speeds.tolist(), strict=True)
    return [f"{d:03.0f}/{g:.1f}" if g == g else "-" for d, g in pairs]
