"""Many profiles: a line each, and what they have in common."""

from __future__ import annotations

from collections import Counter

import numpy as np

from backveer.io.words.cautions import GENERAL
from backveer.io.words.safe import safe
from backveer.io.words.units import NAMED, Units
from backveer.profiles.stack import wind_from_direction
from backveer.profiles.statement import Statement

SHORT = {"well determined": "well", "weakly determined": "weakly", "not determined": "not"}


def summary_text(said: Statement, *, units: str = "si", longest: int = 2000) -> str:
    """
    Write a line for each profile and a summary of all.

    Parameters
    ----------
    said
        The statement of the stack.
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
    lines += _summary(said, shown)
    if count > longest:
        lines.append(f"(a line for each of the {count} profiles: --json, or fewer files)")
    lines += ["", "The full statement of one: --profile N.", _caution()]
    return "\n".join(lines)


def _head(units: Units) -> list[str]:
    names = (
        f"{'N':>5} {'profile':<17} {'levels':>6} {'top':>6} {'turning':>9} {'friction':<8} "
        f"{'angle':>5} {'geostrophic':>11} {'jet':>5}"
    )
    speed = units.speed.name
    below = (
        f"{'':>5} {'time, UTC':<17} {'':>6} {units.height.name:>6} {'deg':>9} {'is':<8} "
        f"{'deg':>5} {'deg/' + speed:>11} {speed:>5}"
    )
    return [names, below]


def _rows(said: Statement, units: Units) -> list[str]:
    stack = said.stack
    usable = stack.usable("wind")
    levels = usable.sum(axis=1).tolist()
    top = said.turning.top / units.height.size
    total, error = said.turning.total, said.turning.error
    fit = said.ekman
    speed = np.hypot(fit.geostrophic_eastward_wind, fit.geostrophic_northward_wind)
    direction = wind_from_direction(fit.geostrophic_eastward_wind, fit.geostrophic_northward_wind)
    layer = said.boundary_layer
    jet = np.where(layer.jet_meets_criterion, layer.jet_speed, np.nan) / units.speed.size
    several = len(set(stack.station.tolist())) > 1
    times = np.datetime_as_string(stack.time, unit="m").tolist()
    sources = stack.source.tolist()
    stations = stack.station.tolist()
    columns = zip(
        times,
        stations,
        sources,
        levels,
        _numbers(top, "{:.0f}"),
        _with_errors(total, error),
        [SHORT[verdict] for verdict in fit.verdict.tolist()],
        _numbers(fit.cross_isobar_angle, "{:.0f}"),
        _numbers(direction, "{:03.0f}"),
        _numbers(speed / units.speed.size, "{:.1f}"),
        _numbers(jet, "{:.1f}"),
        strict=True,
    )
    rows = []
    for n, (time, station, source, many, high, turn, verdict, angle, d, g, nose) in enumerate(
        columns, 1
    ):
        known = time != "NaT"
        name = time.replace("T", " ") if known else safe(str(station or source), 17)
        if several and known:
            name = f"{safe(str(station), 6):<6.6} {time[5:].replace('T', ' ')}"
        wind = f"{d}/{g}" if g != "-" else "-"
        rows.append(
            f"{n:>5} {name:<17.17} {many:>6} {high:>6} {turn:>9} {verdict:<8} {angle:>5} "
            f"{wind:>11} {nose:>5}"
        )
    return rows


def _summary(said: Statement, units: Units) -> list[str]:
    count = said.stack.profile_count
    turned, fit = said.turning, said.ekman
    lines = [f"{count} profiles"]
    senses = Counter(sense for sense in turned.sense.tolist() if sense)
    told = sum(senses.values())
    if told:
        shares = ", ".join(
            f"{100 * senses[name] / told:.0f} % {name}"
            for name in ("veering", "backing", "steady")
            if senses[name]
        )
        middle = float(np.median(turned.total[np.isfinite(turned.total)]))
        lines.append(f"  turning: {shares}; median {middle:+.0f} deg from base to top")
    verdicts = Counter(fit.verdict.tolist())
    shares = ", ".join(f"{verdicts[name]} {SHORT[name]}" for name in SHORT if verdicts[name])
    lines.append(f"  friction's spiral: {shares} determined")
    good = fit.verdict == "well determined"
    if good.any():
        angle = float(np.median(fit.cross_isobar_angle[good]))
        height = float(np.median(fit.scale_height[good])) / units.height.size
        lines.append(
            f"  where well determined: median cross-isobar angle {angle:.0f} deg, "
            f"scale height {height:.0f} {units.height.name}"
        )
    reasons = Counter(why for why in fit.why[~good].tolist() if why)
    for why, number in reasons.most_common(3):
        lines.append(f"  {number} times: {why}"[:80])
    layer = said.boundary_layer
    jets = int(layer.jet_meets_criterion.sum())
    lines.append(f"  low-level jets: {jets} of {count}")
    return lines


def _numbers(values: np.ndarray, form: str) -> list[str]:
    return [form.format(v) if v == v else "-" for v in values.tolist()]


def _with_errors(values: np.ndarray, errors: np.ndarray) -> list[str]:
    pairs = zip(values.tolist(), errors.tolist(), strict=True)
    return [f"{v:+.0f} ± {e:.0f}" if v == v else "-" for v, e in pairs]


def _caution() -> str:
    import textwrap

    return textwrap.fill("Caution: " + GENERAL, 80)
