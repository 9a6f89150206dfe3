"""Many profiles: a line each, then the trend, the persistence and the criteria over time."""

from __future__ import annotations

import textwrap
from collections import Counter

import numpy as np

from backveer.io.words.cautions import AVIATION as CAUTION
from backveer.io.words.page import wrapped
from backveer.io.words.safe import safe
from backveer.io.words.shear_group import candidate_groups
from backveer.io.words.units import NAMED, Units, with_error
from backveer.profiles.shear_series import TREND_HOURS, shear_series
from backveer.profiles.shear_statement import ShearStatement

LONGEST = 2000  # lines; of more profiles only the summary is written


def shear_summary(said: ShearStatement, *, units: str = "aviation", longest: int = LONGEST) -> str:
    """
    Write a line for each profile, and what they say together.

    Parameters
    ----------
    said
        The answers; without causes.
    units
        ``"si"`` or ``"aviation"``.
    longest
        Of more profiles than this only the summary is written.
    """
    shown = NAMED[units]
    count = said.stack.profile_count
    lines = []
    if count <= longest:
        lines += [*_head(shown), *_rows(said, shown), ""]
    lines.append(f"{count} profiles")
    stations = said.stack.station
    for name in dict.fromkeys(stations.tolist()):
        of = np.asarray(stations == name)
        lines += _series(said, of, safe(str(name), 40) if len(set(stations)) > 1 else "", shown)
    lines += _criteria(said)
    lines += _unanswered(said)
    if count > longest:
        lines.append(f"(a line for each of the {count} profiles: --json, or fewer files)")
    lines += ["", "All about one: --profile N.", textwrap.fill("Caution: " + CAUTION, 80)]
    return "\n".join(lines)


def _head(units: Units) -> list[str]:
    height = units.height.name
    return [
        f"{'N':>5} {'profile':<17} {'strongest':>9} {'term':<8} {'layer':>11} {'met':>3} group",
        f"{'':>5} {'time, UTC':<17} {units.shear.name:>9} {'':<8} {height:>11}",
    ]


def _rows(said: ShearStatement, units: Units) -> list[str]:
    stack = said.stack
    times = np.datetime_as_string(stack.time, unit="m").tolist()
    several = len(set(stack.station.tolist())) > 1
    texts, groups = strongest_columns(said, units), groups_of(said)
    met = np.count_nonzero(said.criteria.met, axis=-1).tolist()
    rows = []
    for n, (time, station, source, text, many, group) in enumerate(
        zip(times, stack.station, stack.source, texts, met, groups, strict=True), 1
    ):
        name = time.replace("T", " ") if time != "NaT" else safe(str(station or source), 17)
        if several and time != "NaT":
            name = f"{safe(str(station), 5):<5.5} {time[5:].replace('T', ' ')}"
        rows.append(f"{n:>5} {name:<17.17} {text} {many:>3} {group:<13}".rstrip())
    return rows


def groups_of(said: ShearStatement) -> list[str]:
    """Return the candidate group of each profile, empty where there is none."""
    return [str(group) for group in candidate_groups(said.stack, said.any_met)[0]]


def strongest_columns(said: ShearStatement, units: Units) -> list[str]:
    """Return value, term and layer of each profile, in columns; a dash where there is none."""
    shear = said.shear
    window = np.isfinite(shear.window_shear)
    value = np.where(window, shear.window_shear, shear.maximum_shear)
    error = np.where(window, shear.window_error, shear.maximum_error)
    base = np.where(window, shear.window_base, shear.maximum_base) / units.height.size
    top = np.where(window, shear.window_top, shear.maximum_top) / units.height.size
    term = np.where(window, shear.window_intensity, shear.maximum_intensity)
    least = window & shear.window_lower_bound
    texts = []
    for v, e, z0, z1, word, more in zip(
        (value / units.shear.size).tolist(),
        (error / units.shear.size).tolist(),
        base.tolist(),
        top.tolist(),
        term.tolist(),
        least.tolist(),
        strict=True,
    ):
        if v != v:
            texts.append(f"{'-':>9} {'':<8} {'':>11}")
            continue
        number = f"{'>=' if more else ''}{v:.1f}" if v >= e else "< error"
        texts.append(f"{number:>9} {word or 'none':<8} {f'{z0:.0f}-{z1:.0f}':>11}")
    return texts


def _series(said: ShearStatement, of: np.ndarray, name: str, units: Units) -> list[str]:
    shear = said.shear
    value = np.where(np.isfinite(shear.window_shear), shear.window_shear, shear.maximum_shear)
    told = shear_series(said.stack.time[of], value[of], said.any_met[of])
    before = f"{name}: " if name else ""
    if told.count < 2:
        return []
    first, last = (minute(time) for time in (told.first, told.last))
    lines = [f"{before}from {first} to {last} UTC"]
    if told.sense:
        scale = units.shear
        trend = with_error(told.trend, told.trend_error, scale, sign=True)
        lines.append(
            f"trend of the strongest shear over the last {TREND_HOURS:.0f} h: {told.sense}, "
            f"{trend} {scale.name} per hour"
        )
    else:
        lines.append(f"trend not determined, because there are {told.why}")
    if said.settings.rules:
        if told.run:
            since = minute(told.run_since)
            lines.append(f"some criterion met in the last {told.run} in a row, since {since} UTC")
        else:
            lines.append("no criterion met in the latest profile")
        lines.append(
            f"met in {100 * told.share:.0f} % of the profiles; the longest run {told.longest} "
            f"profiles, {told.longest_hours:.1f} h"
        )
    return [wrapped(line, "  ") for line in lines]


def _criteria(said: ShearStatement) -> list[str]:
    rules = said.settings.rules
    if not rules:
        return []
    lines = []
    met = np.count_nonzero(said.criteria.met, axis=0).tolist()
    judged = np.count_nonzero(np.isfinite(said.criteria.value), axis=0).tolist()
    for rule, yes, of in zip(rules, met, judged, strict=True):
        lines.append(
            wrapped(safe(f"met {yes} of {of} judged: {rule.name}; {rule.authority}"), "  ")
        )
    short = int(np.count_nonzero(said.criteria.lower_bound.any(axis=-1)))
    if short:
        lines.append(
            wrapped(
                f"{short} profiles do not span the layer of some rule: what they do not meet, a "
                "fuller profile might",
                "  ",
            )
        )
    return lines


def _unanswered(said: ShearStatement) -> list[str]:
    reasons = Counter(
        why or surface
        for why, surface in zip(said.shear.why, said.shear.surface_why, strict=True)
        if why or surface
    )
    return [wrapped(f"{number} times: {why}", "  ") for why, number in reasons.most_common(3)]


def minute(time: np.datetime64) -> str:
    """Write a time to the minute."""
    return str(np.datetime_as_string(time, unit="m")).replace("T", " ")
