"""
Low-level shear of one profile on one sheet, height in feet.

From left to right: the shear of each layer against the limits of the terms of intensity; headwind
and crosswind along the first runway; and the flight path itself, an approach from the left and a
departure to the right, drawn thicker where the headwind changes and in another line where it is
lost than where it is gained.
"""

from __future__ import annotations

import os
import textwrap
import warnings
from typing import Any

import matplotlib.style
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from backveer.io.atomic import replacing, suffix_among
from backveer.io.figures import SUFFIXES
from backveer.io.figures.style import (
    BLUE,
    FAINT,
    GREEN,
    INK,
    METADATA,
    ORANGE,
    PALE,
    STYLE,
    VERMILION,
)
from backveer.io.words.cautions import AVIATION as CAUTION
from backveer.io.words.page import cut, name_of, place_of, time_of
from backveer.io.words.units import NAMED, Units, plainly, with_error
from backveer.profiles.flight_path import crosswind, headwind
from backveer.profiles.grid import at_height
from backveer.profiles.labels import Floats
from backveer.profiles.low_level_shear import FOOT, INTENSITY, KNOT_PER_100_FEET
from backveer.profiles.shear_statement import ShearStatement

SIZE = (13.2, 7.6)  # inches
BOTTOM, HEIGHT = 0.175, 0.655
NAUTICAL_MILE = 1852.0  # m, exact: ISO 80000-3:2019, annex B
#: Colour and hatch of each term: none rests on colour alone.
LOOK = {
    "": (PALE, ""),
    "light": (GREEN, ""),
    "moderate": (ORANGE, "//"),
    "strong": (VERMILION, "xx"),
    "severe": (INK, ".."),
}


def draw(
    said: ShearStatement,
    runways: tuple[str, ...],
    path: str | os.PathLike[str],
    *,
    units: str = "aviation",
) -> None:
    """
    Draw the sheet of the first profile into a file.

    Parameters
    ----------
    said
        The answers.
    runways
        Names of the runway ends, in the order of the headings; the first one is drawn.
    path
        Where to; its suffix (.svg, .pdf, .png) says the format.
    units
        ``"si"`` or ``"aviation"``: speeds and shears. Heights are in feet.

    Raises
    ------
    backveer.io.atomic.WriteError
        If the suffix is none of these, or the file cannot be written. A file that stood there
        before stays as it was.
    """
    suffix = suffix_among(path, SUFFIXES)
    with matplotlib.style.context(["default", dict(STYLE)]), warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing", category=UserWarning)
        sheet = figure(said, runways, units=units)
        with replacing(path) as temporary:
            sheet.savefig(temporary, format=suffix[1:], metadata=dict(METADATA[suffix]))


def figure(said: ShearStatement, runways: tuple[str, ...], *, units: str = "aviation") -> Figure:
    """Return the sheet of the first profile, to be shown or saved by the caller."""
    one, shown = said.select(0), NAMED[units]
    sheet = Figure(figsize=SIZE)
    by_layer = sheet.add_axes((0.058, BOTTOM, 0.275, HEIGHT))
    components = sheet.add_axes((0.368, BOTTOM, 0.19, HEIGHT), sharey=by_layer)
    flight = sheet.add_axes((0.593, BOTTOM, 0.393, HEIGHT), sharey=by_layer)
    for ax in (components, flight):
        ax.tick_params(labelleft=False)
    by_layer.set_ylim(0, one.settings.top / FOOT * 1.02)
    by_layer.set_ylabel("height above ground, ft")
    _layers(by_layer, one, shown)
    _components(components, one, runways, shown)
    _flight(flight, one, runways, shown)
    _marks((by_layer, components, flight), one)
    _heading(sheet, one, shown)
    sheet.text(0.058, 0.02, "Caution: " + CAUTION, fontsize=7.4, color="#555555")
    return sheet


def _layers(ax: Axes, one: ShearStatement, units: Units) -> None:
    shear = one.shear
    size = units.shear.size
    ax.set_title("Shear by layer", pad=22)
    there = np.flatnonzero(np.isfinite(shear.step_shear[0]))
    largest = max(
        [float(shear.step_shear[0, i] + shear.step_error[0, i]) for i in there]
        + [float(np.nan_to_num(shear.window_shear[0])), 14 * KNOT_PER_100_FEET]
    )
    limits = [bound * KNOT_PER_100_FEET / size for _, bound in INTENSITY]
    right = min(1.05 * largest / size, 2.2 * limits[-1])
    ax.set_xlim(0, right)
    for n, (term, _) in enumerate(INTENSITY):
        if n:
            ax.axvline(limits[n], color=FAINT, lw=0.9, ls=(0, (4, 3)), zorder=0)
        end = limits[n + 1] if n + 1 < len(limits) else right
        ax.text(
            (limits[n] + end) / 2, 1.012, term, transform=ax.get_xaxis_transform(), ha="center",
            fontsize=7.6, color="#444444",
        )  # fmt: skip
    for i in there:
        colour, hatch = LOOK[shear.step_intensity[0, i]]
        base, top = shear.step_base[0, i] / FOOT, shear.step_top[0, i] / FOOT
        ax.barh(
            base, shear.step_shear[0, i] / size, height=top - base, align="edge", color=colour,
            alpha=0.75 if shear.step_lower_bound[0, i] else 1.0, hatch=hatch, edgecolor="white",
            lw=0.5, zorder=2,
        )  # fmt: skip
        if shear.step_lower_bound[0, i]:
            ax.plot(
                min(shear.step_shear[0, i] / size, right), (base + top) / 2, ">", ms=3.5,
                color=INK, zorder=4, clip_on=False,
            )  # fmt: skip
    for i in np.flatnonzero(np.isfinite(shear.layer_shear[0])):
        ends = np.array([shear.layer_base[0, i], shear.layer_top[0, i]]) / FOOT
        value = shear.layer_shear[0, i] / size
        if shear.layer_shear[0, i] >= shear.layer_error[0, i]:
            ax.plot([value, value], ends, color=BLUE, lw=1.1, zorder=3)
    if np.isfinite(shear.window_shear[0]) and shear.window_intensity[0]:
        ends = np.array([shear.window_base[0], shear.window_top[0]]) / FOOT
        value = min(shear.window_shear[0] / size, right)
        ax.errorbar(
            value, ends.mean(), xerr=shear.window_error[0] / size, yerr=np.ptp(ends) / 2,
            color=INK, lw=1.6, capsize=2.5, zorder=5,
        )  # fmt: skip
    ax.set_xlabel(f"{units.shear.name}")
    step = f"{shear.step / FOOT:.0f} ft"
    legend = f"bars: layers of {step}; blue: between levels;\ncross: the strongest {step}, error"
    if shear.step_lower_bound[0].any():
        legend += "; arrows: lower bounds"
    ax.text(0, -0.125, legend, transform=ax.transAxes, fontsize=7.4, va="top")


def _components(ax: Axes, one: ShearStatement, runways: tuple[str, ...], units: Units) -> None:
    ax.set_title("Wind along the runway", pad=22)
    if not runways or one.path.why[0]:
        _nothing(ax, one, runways)
        return
    z, head, cross = _along(one)
    speed = units.speed.size
    ax.axvline(0, color=FAINT, lw=0.8)
    few = z.size <= 40
    ax.plot(head / speed, z / FOOT, color=BLUE, lw=1.8, marker="o" if few else "", ms=3)
    ax.plot(
        cross / speed, z / FOOT, color=VERMILION, lw=1.6, ls=(0, (5, 2)),
        marker="s" if few else "", ms=3,
    )  # fmt: skip
    both = np.concatenate([head, cross, [0.0]]) / speed
    room = 0.12 * max(float(np.ptp(both)), 2.0)
    ax.set_xlim(both.min() - room, both.max() + room)
    ax.set_xlabel(
        f"{units.speed.name}; headwind against the aircraft,\ncrosswind from its right positive"
    )
    ax.text(
        0.0, 1.012, "headwind, solid", color=BLUE, transform=ax.transAxes, fontsize=7.8,
        fontweight="bold",
    )  # fmt: skip
    ax.text(
        1.0, 1.012, "crosswind, dashed", color=VERMILION, transform=ax.transAxes, fontsize=7.8,
        fontweight="bold", ha="right",
    )  # fmt: skip


def _flight(ax: Axes, one: ShearStatement, runways: tuple[str, ...], units: Units) -> None:
    if not runways or one.path.why[0]:
        ax.set_title("Flight path", pad=22)
        _nothing(ax, one, runways)
        return
    path = one.path
    ax.set_title(f"Flight path, runway {runways[0]} (true heading {path.runway[0]:03.0f})", pad=22)
    run_in = 1.0 / np.tan(np.radians(path.glide_slope))
    run_out = 100.0 / path.climb_slope
    top = one.settings.top
    left, right = -top * run_in / NAUTICAL_MILE, top * run_out / NAUTICAL_MILE
    ax.set_xlim(left * 1.04, right * 1.04)
    ax.plot([left, 0], [top / FOOT, 0], color=PALE, lw=1.2, zorder=1)
    ax.plot([0, right], [0, top / FOOT], color=PALE, lw=1.2, zorder=1)
    z = np.linspace(path.path_base[0], path.path_top[0], 41)
    head = _headwind_at(one, z)
    scale = 6.0 / max(float(np.max(np.abs(np.diff(head)))), 1e-9)
    # Less over a step than its error is no change.
    small = np.sqrt(2.0) * one.wind_error[0] * (z[1] - z[0]) / max(one.shear.step, z[1] - z[0])
    for side, sign in ((-run_in, -1.0), (run_out, 1.0)):
        for i in range(z.size - 1):
            # On the way down a headwind that grows with height is lost.
            change = sign * (head[i + 1] - head[i])
            x, y = side * z[i : i + 2] / NAUTICAL_MILE, z[i : i + 2] / FOOT
            if abs(change) < small:
                ax.plot(x, y, color=FAINT, lw=1.0, zorder=2)
                continue
            width = 1.5 + scale * abs(change)
            colour = BLUE if change > 0 else VERMILION
            ax.plot(x, y, color=colour, lw=width, solid_capstyle="butt", zorder=2)
            if change < 0:  # hollow, so that nothing rests on colour alone
                ax.plot(x, y, color="white", lw=0.4 * width, solid_capstyle="butt", zorder=3)
    for kind, side in (("approach", -run_in), ("departure", run_out)):
        base, roof = path.approach_worst_base[0, 0], path.approach_worst_top[0, 0]
        rate = getattr(path, f"{kind}_worst_rate")[0, 0]
        middle = (base + roof) / 2
        where = (side * middle / NAUTICAL_MILE, middle / FOOT)
        change = getattr(path, f"{kind}_change")[0, 0]
        note = (
            f"{kind}: {_gain(change, units)}\nworst {plainly(rate, units.shear, 1, True)} "
            f"{units.shear.name}\n"
            f"{plainly(getattr(path, f'{kind}_worst_per_second')[0, 0], units.speed, 2, True)} "
            f"{units.speed.name}/s, F {getattr(path, f'{kind}_f_factor')[0, 0]:+.3f}"
        )
        ax.annotate(
            note, where, xycoords="data",
            xytext=(0.02 if side < 0 else 0.98, 0.06),
            textcoords="axes fraction", ha="left" if side < 0 else "right", va="bottom",
            fontsize=7.8, zorder=6,
            bbox={"boxstyle": "square,pad=0.3", "fc": "white", "ec": "none", "alpha": 0.85},
            arrowprops={"arrowstyle": "->", "color": INK, "lw": 0.9},
        )  # fmt: skip
    for level in (500 * FOOT, 1000 * FOOT, 1600 * FOOT, path.path_top[0]):
        if not path.path_base[0] < level <= path.path_top[0]:
            continue
        value = _headwind_at(one, np.array([level]))[0]
        ax.annotate(
            f"{plainly(value, units.speed, 0, True)}",
            (-run_in * level / NAUTICAL_MILE, level / FOOT),
            xytext=(5, 4) if level < 0.95 * top else (7, -8),
            textcoords="offset points", fontsize=7.6, color="#444444",
        )  # fmt: skip
    ax.plot([-0.25, 0.25], [0, 0], color=INK, lw=5, solid_capstyle="butt", clip_on=False)
    ax.set_xlabel(
        f"nautical miles from the runway; thicker: faster change; figures: headwind in "
        f"{units.speed.name}\nF: the horizontal term of the F-factor only"
    )
    ax.text(0.0, 1.012, f"approach, {path.glide_slope:g}°", transform=ax.transAxes, fontsize=7.8)
    ax.text(
        1.0, 1.012, f"departure, {path.climb_slope:g} %", transform=ax.transAxes, fontsize=7.8,
        ha="right",
    )  # fmt: skip
    for n, (colour, word) in enumerate(
        ((BLUE, "headwind gained"), (VERMILION, "headwind lost, hollow"))
    ):
        ax.text(
            0.24 + 0.24 * n, 1.012, word, color=colour, fontweight="bold", fontsize=7.8,
            transform=ax.transAxes,
        )  # fmt: skip


def _marks(axes: tuple[Axes, ...], one: ShearStatement) -> None:
    """Mark the jet's nose and the inversions across the panels."""
    layer, top = one.boundary_layer, one.settings.top
    for n, ax in enumerate(axes):
        if layer.jet_meets_criterion[0] and layer.jet_height[0] <= top:
            nose = layer.jet_height[0] / FOOT
            ax.axhline(nose, color=INK, lw=0.8, ls=":", zorder=1)
            if n == 2:
                _label(ax, nose, "jet nose")
        for base, roof in zip(layer.inversion_base[0], layer.inversion_top[0], strict=True):
            if base < top:
                ax.axhspan(base / FOOT, min(roof, top) / FOOT, color="#f3efe2", zorder=-1, lw=0)
                if n == 2:
                    _label(ax, min(roof, top) / FOOT, "inversion", "top")


def _label(ax: Axes, height: float, word: str, side: str = "bottom") -> None:
    # The departure is low at the left of the right half, and high at its right.
    right = 0.985 if height < 0.7 * ax.get_ylim()[1] else 0.6
    ax.text(
        right, height, word, transform=ax.get_yaxis_transform(), ha="right", va=side,
        fontsize=7.2, color="#444444",
    )  # fmt: skip


def _heading(sheet: Figure, one: ShearStatement, units: Units) -> None:
    stack, shear = one.stack, one.shear
    when = "" if np.isnat(stack.time[0]) else f", {time_of(stack.time[0])}"
    sheet.text(
        0.058, 0.945, cut(name_of(stack, 0), 80) + when, fontsize=14, fontweight="bold",
        parse_math=False,
    )  # fmt: skip
    parts = [place_of(stack, 0)]
    if shear.why[0]:
        parts.append(f"not determined, because {shear.why[0]}")
    elif np.isfinite(shear.window_shear[0]):
        least = "at least " if shear.window_lower_bound[0] else ""
        value = with_error(shear.window_shear[0], shear.window_error[0], units.shear)
        parts.append(
            f"strongest over {shear.step / FOOT:.0f} ft: {least}{value} {units.shear.name}, "
            f"{shear.window_intensity[0] or 'smaller than its error'}, from "
            f"{shear.window_base[0] / FOOT:.0f} to {shear.window_top[0] / FOOT:.0f} ft"
        )
    met = int(one.criteria.met[0].sum())
    parts.append(f"{met} of {len(one.settings.rules)} criteria met")
    for n, line in enumerate(textwrap.wrap("; ".join(parts), 165)[:2]):
        sheet.text(0.058, 0.915 - 0.022 * n, line, fontsize=9, parse_math=False)


def _nothing(ax: Axes, one: ShearStatement, runways: tuple[str, ...]) -> None:
    why = one.path.why[0] if runways else "no runway is given"
    text = "\n".join(textwrap.wrap(why, 30))
    ax.text(0.5, 0.5, text, transform=ax.transAxes, ha="center", va="center", color="#444444")
    ax.set_xticks([])


def _gain(change: float, units: Units) -> str:
    if abs(change) < 0.5 * units.speed.size:
        return "headwind the same"
    word = "gain" if change > 0 else "loss"
    return f"{word} of {plainly(abs(change), units.speed)} {units.speed.name}"


def _along(one: ShearStatement) -> tuple[Floats, Floats, Floats]:
    stack, heading = one.stack, float(one.path.runway[0])
    usable = stack.usable("wind")[0] & (stack.height[0] <= one.settings.top * (1 + 1e-9))
    u, v = stack.eastward_wind[0][usable], stack.northward_wind[0][usable]
    return stack.height[0][usable], headwind(u, v, heading), crosswind(u, v, heading)


def _headwind_at(one: ShearStatement, z: Floats) -> Floats:
    stack = one.stack
    wind: Any = np.where(
        stack.usable("wind"), stack.eastward_wind + 1j * stack.northward_wind, np.nan
    )
    w: Any = at_height(stack.height, wind, z)[0]
    along: Floats = headwind(w.real, w.imag, one.path.runway[0])
    return along
