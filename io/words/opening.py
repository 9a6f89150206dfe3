"""How a statement begins: what, where and when, how it was read, and the findings in short."""

from __future__ import annotations

import numpy as np

from backveer.io.readers.reading import FileReading, Reading
from backveer.io.words.page import name_of, place_of, time_of, wrapped
from backveer.io.words.safe import safe
from backveer.io.words.units import DEGREE, Units, plainly, with_error
from backveer.profiles.statement import Statement

READ_AS = {"wind_from_direction": "wind direction"}


def heading(one: Statement, units: Units) -> str:
    """Say which profile this is, where and when, and what the Earth's rotation is there."""
    stack = one.stack
    when = "" if np.isnat(stack.time[0]) else f", {time_of(stack.time[0])}"
    lines = [f"{name_of(stack, 0)}{when}", place_of(stack, 0)]
    f = one.coriolis.coriolis_parameter[0]
    if np.isfinite(f):
        period = one.coriolis.inertial_period[0] / 3600.0
        swing = f"inertial period {period:.1f} h" if np.isfinite(period) else "no inertial period"
        lines.append(f"f = {f:+.3e} s-1, {swing}")
    usable = stack.usable("wind")[0]
    z = stack.height[0][usable]
    if z.size:
        lines.append(f"{_levels(z.size)} with wind, {span(z[0], z[-1], units)} above ground")
        error = plainly(one.wind_error[0], units.speed, 1)
        lines.append(f"standard error of a wind component {error} {units.speed.name}")
    return "\n".join(wrapped(line) for line in lines)


def how_read(one: Statement, file: FileReading | None) -> str:
    """Say in one line what was read from which columns in which units."""
    if file is None:
        return ""
    read = [
        f"{READ_AS.get(column.read_as, column.read_as).replace('_', ' ')} in {column.unit}"
        for column in file.columns
        if column.read_as and column.unit
    ]
    unused = sum(1 for column in file.columns if not column.read_as)
    # A wide table has the same quantity in many columns.
    understood = "; ".join(dict.fromkeys(safe(text, 60) for text in read))
    rest = f"; {unused} column{'s' * (unused != 1)} not used" if unused else ""
    source = safe(file.source)
    said = f"Read from {source}: {understood}{rest}" if understood else f"Read from {source}{rest}"
    return wrapped(said)


def file_of(reading: Reading | None, index: int) -> tuple[FileReading | None, int]:
    """Return the file that a profile of the whole stack comes from, and its place therein."""
    for file in () if reading is None else reading.files:
        if index < file.stack.profile_count:
            return file, index
        index -= file.stack.profile_count
    return None, index


def in_short(one: Statement, units: Units) -> str:
    """Say in plain sentences what a reader must know before any table."""
    sentences = [*_turning(one, units), _friction(one), *_advection(one, units), *_jet(one, units)]
    return wrapped(" ".join(sentences))


def span(base: float, top: float, units: Units) -> str:
    """Write a range of heights."""
    return f"{plainly(base, units.height)} to {plainly(top, units.height)} {units.height.name}"


def _turning(one: Statement, units: Units) -> list[str]:
    turned, stack = one.turning, one.stack
    usable = np.flatnonzero(stack.usable("wind")[0])
    if usable.size < 2:
        return []
    low, high = stack.wind_speed[0][usable[[0, -1]]]
    strength = (
        f"{plainly(low, units.speed, 1)} {units.speed.name} at the lowest level and "
        f"{plainly(high, units.speed, 1)} {units.speed.name} at the highest"
    )
    if not np.isfinite(turned.total[0]):
        return [
            f"The speed of the wind is {strength}; its total turning is not determined, because "
            f"{turned.why[0]}."
        ]
    how = {"veering": "veers", "backing": "backs"}.get(turned.sense[0])
    heights = span(turned.base[0], turned.top[0], units)
    if how:
        size = with_error(abs(turned.total[0]), turned.error[0], DEGREE)
        return [f"From {heights} the wind {how} by {size} deg; its speed is {strength}."]
    total = with_error(turned.total[0], turned.error[0], DEGREE, sign=True)
    return [
        f"From {heights} the wind's turning, {total} deg, is smaller than its error; its speed is "
        f"{strength}."
    ]


def _friction(one: Statement) -> str:
    fit = one.ekman
    if fit.verdict[0] == "not determined":
        return f"Friction's part is not determined, because {fit.why[0]}."
    error = fit.cross_isobar_angle_error[0]
    angle = with_error(fit.cross_isobar_angle[0], error, DEGREE)
    if angle == with_error(fit.cross_isobar_angle[0], 0.0, DEGREE):
        return (
            f"A spiral without slip at the ground describes the turning ({fit.verdict[0]}); its "
            f"angle of {angle} deg is the equation's, not a finding."
        )
    return f"Friction turns the surface stress {angle} deg toward low pressure ({fit.verdict[0]})."


def _advection(one: Statement, units: Units) -> list[str]:
    """Name the layers of warm and cold advection, those that touch as one."""
    layers = one.thermal_wind
    told: list[tuple[str, float, float]] = []
    for sense, base, top in zip(
        layers.layer_sense[0], layers.layer_base_height[0], layers.layer_top_height[0], strict=True
    ):
        if sense not in ("warm", "cold"):
            continue
        if told and told[-1][0] == sense and told[-1][2] == base:
            told[-1] = (sense, told[-1][1], top)
        else:
            told.append((sense, base, top))
    if not told:
        return []
    named = [f"{sense} advection from {span(base, top, units)}" for sense, base, top in told]
    more = f", and {len(named) - 3} more layers" if len(named) > 3 else ""
    return [f"The thermal wind shows {'; '.join(named[:3])}{more}."]


def _jet(one: Statement, units: Units) -> list[str]:
    layer = one.boundary_layer
    if not layer.jet_meets_criterion[0]:
        return []
    return [
        f"A low-level jet blows at {plainly(layer.jet_height[0], units.height)} "
        f"{units.height.name} with {plainly(layer.jet_speed[0], units.speed, 1)} "
        f"{units.speed.name}."
    ]


def _levels(count: int) -> str:
    return f"{count} level{'s' * (count != 1)}"
