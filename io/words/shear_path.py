"""The part of the printed answer that is about the flight path."""

from __future__ import annotations

import numpy as np

from backveer.io.words.opening import span
from backveer.io.words.page import pairs_of, section, table, undetermined, wrapped
from backveer.io.words.units import Units, plainly
from backveer.profiles.flight_path import crosswind, headwind
from backveer.profiles.grid import at_height
from backveer.profiles.labels import Floats
from backveer.profiles.low_level_shear import FOOT
from backveer.profiles.shear_statement import ShearStatement

HEIGHTS = tuple(feet * FOOT for feet in (200, 500, 1000, 1600, 2000))
#: Ends of a runway side by side in one table.
ACROSS = 2


def path_section(one: ShearStatement, runways: tuple[str, ...], units: Units) -> str:
    """Write headwind and crosswind by height, and what they do to an approach and a departure."""
    title = "Along the flight path"
    if not runways:
        return section(title, ["  no runway is given (--runway, a true heading)"])
    if one.path.why[0]:
        return section(title, [undetermined(one.path.why[0])])
    speed, height = units.speed.name, units.height.name
    path = one.path
    settings = one.settings
    lines = [
        wrapped(
            f"ground speed {plainly(path.ground_speed, units.speed)} {speed}; approach of "
            f"{path.glide_slope:g} deg from {plainly(path.path_top[0], units.height)} to "
            f"{plainly(path.path_base[0], units.height)} {height}; departure at "
            f"{path.climb_slope:g} per cent. Headwind is positive against the aircraft, "
            "crosswind positive from its right.",
            "  ",
        )
    ]
    if path.path_top[0] < settings.top * (1 - 1e-9):
        lines.append("  the profile ends below the top asked for: above, nothing is known")
    z, wind = _picked(one)
    for first in range(0, len(runways), ACROSS):
        ends = range(first, min(first + ACROSS, len(runways)))
        head = [["height", *(f"{kind} {runways[i]}" for i in ends for kind in ("head", "cross"))]]
        head.append([height, *([speed] * (2 * len(ends)))])
        rows = []
        for level, w in zip(z, wind, strict=True):
            row = [plainly(level, units.height)]
            for i in ends:
                along = path.runway[i]
                row.append(plainly(float(headwind(w.real, w.imag, along)), units.speed, 0, True))
                row.append(plainly(float(crosswind(w.real, w.imag, along)), units.speed, 0, True))
            rows.append(row)
        lines += ["", *table(head, rows, "r" * len(head[0]))]
    for i, name in enumerate(runways):
        lines += ["", *_end(one, i, name, units)]
    lines += [
        "",
        wrapped(
            "F is the horizontal term of the F-factor only, along the path: a profile knows no "
            "downdraught. A loss of headwind is a loss of energy, positive.",
            "  ",
        ),
    ]
    return section(title, lines)


def _end(one: ShearStatement, i: int, name: str, units: Units) -> list[str]:
    path = one.path
    speed = units.speed.name
    where = span(path.approach_worst_base[0, i], path.approach_worst_top[0, i], units)
    loss, gain = path.largest_loss[0, i], path.largest_gain[0, i]

    def way(kind: str, most_loss: float, most_gain: float) -> str:
        change = getattr(path, f"{kind}_change")[0, i]
        rate = getattr(path, f"{kind}_worst_rate")[0, i]
        second = getattr(path, f"{kind}_worst_per_second")[0, i]
        factor = getattr(path, f"{kind}_f_factor")[0, i]
        return (
            f"{_gain(change, units)} from end to end; on the way at most "
            f"{plainly(most_loss, units.speed)} {speed} lost and "
            f"{plainly(most_gain, units.speed)} {speed} gained. Worst "
            f"{plainly(rate, units.shear, 1, True)} {units.shear.name} at {where}: "
            f"{plainly(second, units.speed, 2, True)} {speed} per second, F {factor:+.3f}"
        )

    pairs = [("approach", way("approach", loss, gain)), ("departure", way("departure", gain, loss))]
    pairs += _effects(one, path.runway[i], units)
    note = "" if name.isdigit() and len(name) == 3 else ", from the designator: good to 5 degrees"
    return [f"  {name} (true heading {path.runway[i]:03.0f}{note})", *pairs_of(pairs)]


def _gain(change: float, units: Units) -> str:
    if abs(change) < 0.5 * units.speed.size:
        return "headwind the same"
    word = "gain" if change > 0 else "loss"
    return f"{word} of {plainly(abs(change), units.speed)} {units.speed.name}"


def _effects(one: ShearStatement, heading: float, units: Units) -> list[tuple[str, str]]:
    """Say what the jet's nose and each inversion do to the headwind on an approach."""
    layer = one.boundary_layer
    speed = units.speed.name
    low, high = one.path.path_base[0], one.path.path_top[0]
    pairs = []
    nose = layer.jet_height[0]
    if layer.jet_meets_criterion[0] and low < nose <= high:
        head = _head_at(one, heading, [high, nose, low])
        pairs.append(
            (
                "jet nose",
                f"headwind {plainly(head[1], units.speed, 0, True)} {speed} at "
                f"{plainly(nose, units.height)} {units.height.name}: an approach has a "
                f"{_gain(head[1] - head[0], units)} above it, a {_gain(head[2] - head[1], units)} "
                "below it",
            )
        )
    for base, top in zip(layer.inversion_base[0], layer.inversion_top[0], strict=True):
        begin, end = max(base, low), min(top, high)
        if not begin < end:
            continue
        head = _head_at(one, heading, [end, begin])
        pairs.append(
            (
                "inversion",
                f"down through it, {span(begin, end, units)}: {_gain(head[1] - head[0], units)}",
            )
        )
    return pairs


def _head_at(one: ShearStatement, heading: float, heights: list[float]) -> Floats:
    w = at_height(one.stack.height, _wind(one), heights)[0]
    along: Floats = headwind(w.real, w.imag, heading)
    return along


def _picked(one: ShearStatement) -> tuple[list[float], list[complex]]:
    """Heights to show: the ends of the path, round ones between, and the nose of a jet."""
    low, high = one.path.path_base[0], one.path.path_top[0]
    layer = one.boundary_layer
    wanted = {low, high} | {z for z in HEIGHTS if low < z < high * (1 - 1e-9)}
    if layer.jet_meets_criterion[0] and low < layer.jet_height[0] < high:
        wanted.add(layer.jet_height[0])
    z = sorted(float(height) for height in wanted)
    w = at_height(one.stack.height, _wind(one), z)[0]
    return z, [complex(value) for value in w]


def _wind(one: ShearStatement) -> Floats:
    stack = one.stack
    wind: Floats = np.where(
        stack.usable("wind"), stack.eastward_wind + 1j * stack.northward_wind, np.nan
    )
    return wind
