"""
What a turbine meets on one sheet: the rotor to scale beside the profiles, and veer over time.

Three panels share a height axis: the disc with the part of it that the levels cover, the wind
speed, the direction relative to that at the hub. For many profiles their spread is drawn, veer by
hour and month, and how often it is exceeded.
"""

from __future__ import annotations

import os
import warnings
from collections.abc import Sequence
from typing import Any

import matplotlib
import matplotlib.style
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.patches import Circle, Rectangle

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
    PURPLE,
    SKY,
    STYLE,
    VERMILION,
)
from backveer.io.run import Run
from backveer.io.words.cautions import TURBINE
from backveer.io.words.page import cut, name_of, place_of, time_of
from backveer.io.words.units import NAMED, Units
from backveer.profiles.classes import MONTHS
from backveer.profiles.grid import at_height
from backveer.profiles.labels import Floats
from backveer.profiles.rotor import Rotor
from backveer.profiles.rotor_climate import RotorClimate, exceedance
from backveer.profiles.stack import Stack

SIZE = (13.6, 7.6)  # inches
BOTTOM, HEIGHT = 0.125, 0.70
DISC = (0.055, 0.245)  # left, width
SPEED, TURN = (0.325, 0.135), (0.475, 0.135)
RIGHT, WIDE = 0.675, 0.30
LINES = ((BLUE, "-"), (VERMILION, "--"), (GREEN, ":"), (ORANGE, "-."), (PURPLE, (0, (5, 1, 1, 1))))
_KEYS = {".svg": "Description", ".pdf": "Subject", ".png": "Description"}
_MOST_HEIGHTS = 40


def draw(
    stack: Stack,
    told: Rotor,
    over: Sequence[RotorClimate],
    path: str | os.PathLike[str],
    run: Run,
    *,
    units: str = "si",
    index: int | None = None,
) -> None:
    """
    Draw the sheet into a file.

    Parameters
    ----------
    stack, told
        Profiles and answers, in the same order.
    over
        The answers over time, one a turbine; none for a single profile.
    path
        Where to; its suffix (.svg, .pdf, .png) says the format.
    run
        Goes into the file's metadata, and in short onto the sheet.
    units
        ``"si"`` or ``"aviation"``.
    index
        Draw this profile, from 0, in place of the spread of all.

    Raises
    ------
    backveer.io.atomic.WriteError
        If the suffix is none of these, or the file cannot be written.
    """
    suffix = suffix_among(path, SUFFIXES)
    with matplotlib.style.context(["default", dict(STYLE)]), warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing", category=UserWarning)
        sheet = figure(stack, told, over, run, units=units, index=index)
        metadata = dict(METADATA[suffix]) | {_KEYS[suffix]: run.line()}
        with replacing(path) as temporary:
            sheet.savefig(temporary, format=suffix[1:], metadata=metadata)


def figure(
    stack: Stack,
    told: Rotor,
    over: Sequence[RotorClimate],
    run: Run,
    *,
    units: str = "si",
    index: int | None = None,
) -> Figure:
    """Return the sheet, to be shown or saved by the caller; as :func:`draw`."""
    shown = NAMED[units]
    if index is not None or stack.profile_count == 1:
        row = index or 0
        stack, told, over = stack.select(row), told.select(row), ()
    sheet = Figure(figsize=SIZE)
    first = sheet.add_axes((DISC[0], BOTTOM, DISC[1], HEIGHT))
    top = _height_axis(first, told, shown)
    _disc(first, stack, told, shown, top)
    speed = sheet.add_axes((SPEED[0], BOTTOM, SPEED[1], HEIGHT), sharey=first)
    turn = sheet.add_axes((TURN[0], BOTTOM, TURN[1], HEIGHT), sharey=first)
    _profiles(speed, turn, stack, told, shown)
    for ax in (speed, turn):
        ax.tick_params(labelleft=False)
        _tips(ax, told, shown)
    if over:
        _hour_and_month(sheet.add_axes((RIGHT, 0.555, 0.255, 0.27)), sheet, over[0], told)
        half = 0.5 * WIDE - 0.025
        _exceedance(
            sheet.add_axes((RIGHT, BOTTOM, half, 0.28)), told, "veer", "veer, deg", legend=True
        )
        other = sheet.add_axes((RIGHT + half + 0.05, BOTTOM, half, 0.28))
        _exceedance(other, told, "shear_exponent", "shear exponent", legend=False)
    else:
        _numbers(sheet, told, shown)
    _heading(sheet, stack, told, run)
    return sheet


def _height_axis(ax: Axes, told: Rotor, units: Units) -> float:
    """Set equal scales of height and width and return the top of the axis. [m]"""
    tip = float((told.hub_height + 0.5 * told.rotor_diameter).max())
    widest = float(told.rotor_diameter.max())
    shape = DISC[1] * SIZE[0] / (HEIGHT * SIZE[1])
    top = max(1.22 * tip, 1.12 * widest / shape)
    size = units.height.size
    ax.set_ylim(0.0, top / size)
    ax.set_xlim(-0.5 * top * shape / size, 0.5 * top * shape / size)
    ax.set_ylabel(f"height above ground, {units.height.name}")
    ax.set_xlabel(f"across the rotor, {units.height.name}")
    ax.tick_params(axis="x", pad=9)  # below the ground
    return top


def _disc(ax: Axes, stack: Stack, told: Rotor, units: Units, top: float) -> None:
    size = units.height.size
    ax.set_title("Rotor, to scale")
    ax.axhspan(-0.02 * top / size, 0.0, color=FAINT, clip_on=False)
    for place in range(len(told.turbine)):
        colour, style = LINES[place % len(LINES)]
        hub = told.hub_height[place] / size
        radius = 0.5 * told.rotor_diameter[place] / size
        if place == 0:
            covered = [_middle(told.covered_base[:, 0]), _middle(told.covered_top[:, 0])]
            ax.add_patch(
                Circle((0.0, hub), radius, facecolor="none", edgecolor=FAINT, hatch="////")
            )
            if np.isfinite(covered).all():
                low, high = covered[0] / size, covered[1] / size
                within = Rectangle((-radius, low), 2.0 * radius, high - low, visible=False)
                ax.add_patch(within)
                disc = Circle((0.0, hub), radius, facecolor="#dcebf5", edgecolor="none")
                ax.add_patch(disc)
                disc.set_clip_path(within)
        ax.add_patch(
            Circle((0.0, hub), radius, facecolor="none", edgecolor=colour, lw=1.6, ls=style)
        )
        ax.plot([0.0, 0.0], [0.0, hub], color=INK, lw=2.2, solid_capstyle="butt", zorder=2)
        ax.plot([0.0], [hub], "o", color=INK, ms=5, zorder=3)
    levels, _ = _heights(stack)
    for z in levels[levels <= top]:
        ax.plot([0.955, 1.0], [z / size] * 2, color=INK, lw=1.0, transform=ax.get_yaxis_transform())
    ax.text(
        0.02,
        0.985,
        "shaded: covered by levels (ticks at the right)\nhatched: not covered",
        transform=ax.transAxes,
        va="top",
        fontsize=7.2,
        color="#555555",
    )


def _tips(ax: Axes, told: Rotor, units: Units) -> None:
    size = units.height.size
    hub, radius = told.hub_height[0] / size, 0.5 * told.rotor_diameter[0] / size
    ax.axhspan(hub - radius, hub + radius, color="#f0f5f9", zorder=0, lw=0)
    ax.axhline(hub, color=FAINT, lw=0.8, ls="--", zorder=1)


def _heights(stack: Stack) -> tuple[Floats, bool]:
    """Return heights to draw the profiles at, and whether these are the levels themselves."""
    z = np.where(stack.usable("wind"), stack.height, np.nan)
    different = np.unique(z[np.isfinite(z)])
    if different.size <= _MOST_HEIGHTS:
        return different, True
    return np.linspace(different[0], different[-1], _MOST_HEIGHTS), False


def _profiles(speed: Axes, turn: Axes, stack: Stack, told: Rotor, units: Units) -> None:
    """Draw speed and direction relative to the hub: the middle, and the spread of many."""
    heights, _ = _heights(stack)
    size, knot = units.height.size, units.speed.size
    usable = stack.usable("wind")
    z = np.where(usable, stack.height, np.nan)
    blowing = np.radians(told.hub_direction[:, :1])
    with np.errstate(invalid="ignore"):
        wind = stack.eastward_wind + 1j * stack.northward_wind
        hub = -(np.sin(blowing) + 1j * np.cos(blowing))
        relative = np.where(
            usable & (stack.wind_speed > 0), -np.degrees(np.angle(wind * np.conj(hub))), np.nan
        )
    speed.set_title("Speed")
    speed.set_xlabel(f"wind speed, {units.speed.name}")
    turn.set_title("Turn from the hub")
    turn.set_xlabel("direction minus that at the hub, deg")
    for ax, x, scale in ((speed, np.where(usable, stack.wind_speed, np.nan), knot),
                         (turn, relative, 1.0)):  # fmt: skip
        if not heights.size:
            continue
        at = at_height(np.where(np.isfinite(x), z, np.nan), x, heights) / scale
        _spread(ax, at, heights / size, single=stack.profile_count == 1)
    speed.set_xlim(left=0.0)
    left, right = turn.get_xlim()
    turn.set_xlim(min(left, -5.0), max(right, 5.0))
    turn.axvline(0.0, color=FAINT, lw=0.8, ls="--")
    if stack.profile_count > 1 and heights.size:
        handles, names = speed.get_legend_handles_labels()
        speed.legend(handles, names, loc="lower right", fontsize=6.8)


def _spread(ax: Axes, x: Floats, z: Floats, single: bool) -> None:
    known = np.isfinite(x).any(axis=0)
    x, z = x[:, known], z[known]
    if not z.size:
        return
    if single:
        ax.plot(x[0], z, color=BLUE, lw=1.6, marker="o", ms=3.2)
        return
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", RuntimeWarning)
        low, quarter, middle, three, high = np.nanpercentile(x, [5, 25, 50, 75, 95], axis=0)
    ax.fill_betweenx(z, low, high, color=SKY, alpha=0.28, lw=0, label="5 to 95 %")
    ax.fill_betweenx(z, quarter, three, color=SKY, alpha=0.6, lw=0, label="25 to 75 %")
    ax.plot(middle, z, color=BLUE, lw=1.8, marker="o", ms=2.8, label="median")


def _hour_and_month(ax: Axes, sheet: Figure, over: RotorClimate, told: Rotor) -> None:
    """Draw the mean veer in each hour of each month; a dot where less than half is there."""
    place = int(np.flatnonzero(told.turbine == over.turbine)[0])
    veer = told.veer[:, place]
    hour, month = _hours_and_months(over)
    known = np.isfinite(veer) & (hour >= 0)
    cell = np.where(known, month * 24 + hour, 0)[known]
    count = np.bincount(cell, minlength=288).reshape(12, 24)
    total = np.bincount(cell, veer[known], minlength=288).reshape(12, 24)
    all_of = np.bincount((month * 24 + hour)[hour >= 0], minlength=288).reshape(12, 24)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.where(count > 0, total / count, np.nan)
    months = np.flatnonzero(all_of.any(axis=1))
    if months.size > 2:
        months = np.arange(12)
    if not months.size:
        ax.text(0.5, 0.5, "no times", transform=ax.transAxes, ha="center", color="#555555")
        ax.set_axis_off()
        return
    largest = max(float(np.nanmax(np.abs(mean), initial=0.0)), 1.0)
    picture = ax.pcolormesh(
        np.arange(25),
        np.arange(months.size + 1),
        mean[months],
        cmap="PuOr_r",
        vmin=-largest,
        vmax=largest,
        edgecolors="white",
        linewidth=0.3,
    )
    poor = (count < 0.5 * all_of)[months] & (count[months] > 0)
    y, x = np.nonzero(poor)
    ax.plot(x + 0.5, y + 0.5, ".", color=INK, ms=2.5)
    ax.set_yticks(np.arange(months.size) + 0.5, [MONTHS[m] for m in months])
    ax.set_xticks(np.arange(0, 25, 3))
    ax.tick_params(axis="y", length=0)
    ax.invert_yaxis()
    ax.set_xlabel("hour of the day (blank: no answer; dot: less than half of the profiles)")
    ax.set_title(f"Mean veer by hour and month: {cut(over.turbine, 30)}")
    where = ax.get_position()
    bar = sheet.add_axes((where.x1 + 0.008, where.y0, 0.009, where.height))
    sheet.colorbar(picture, cax=bar).set_label("deg, veering positive")


def _hours_and_months(over: RotorClimate) -> tuple[Any, Any]:
    """Hour of the day and month of each profile by the clock of the tables, -1 for none."""
    there = ~np.isnat(over.begins)
    clock = np.where(there, over.begins, np.datetime64(0, "ns"))
    clock = clock + np.timedelta64(round(over.utc_offset * 3600), "s")
    hour = clock.astype("datetime64[h]").astype(int) % 24
    month = clock.astype("datetime64[M]").astype(int) % 12
    return np.where(there, hour, -1), np.where(there, month, -1)


def _exceedance(ax: Axes, told: Rotor, name: str, label: str, legend: bool) -> None:
    values = getattr(told, name)
    known = values[np.isfinite(values)]
    ax.set_xlabel(label)
    ax.set_title("Share of profiles above" if legend else "")
    if not known.size:
        ax.text(0.5, 0.5, "not determined", transform=ax.transAxes, ha="center", color="#555555")
        return
    low, high = np.percentile(known, [0.2, 99.95])
    points = np.linspace(low, high, 240)
    lowest = 1.0
    for place in range(values.shape[1]):
        colour, style = LINES[place % len(LINES)]
        share = exceedance(values[:, place], points.tolist())
        count = int(np.count_nonzero(np.isfinite(values[:, place])))
        ax.plot(
            points,
            np.where(share > 0, 100.0 * share, np.nan),
            color=colour,
            ls=style,
            lw=1.6,
            label=f"{cut(str(told.turbine[place]), 16)}: {count} of {len(values)}",
        )
        lowest = min(lowest, 1.0 / max(count, 1))
    ax.set_yscale("log")
    # Room for the legend below what one profile of all is.
    ax.set_ylim(max(100.0 * lowest, 1e-3) / (12.0 if legend else 1.0), 140.0)
    ax.yaxis.set_major_formatter(lambda y, _: f"{y:g} %")
    ax.grid(color=PALE, lw=0.6)
    if legend:
        ax.legend(loc="lower left", fontsize=6.8)


def _numbers(sheet: Figure, told: Rotor, units: Units) -> None:
    """Write the answers of a single profile."""
    speed, y = units.speed, 0.80
    for place in range(min(len(told.turbine), 4)):
        sheet.text(RIGHT, y, cut(str(told.turbine[place]), 40), fontsize=10, fontweight="bold",
                   parse_math=False)  # fmt: skip
        rows = [
            ("hub", told.hub_speed, speed.size, f"{{:.1f}} {speed.name}"),
            ("from", told.hub_direction, 1.0, "{:03.0f} deg"),
            ("veer", told.veer, 1.0, "{:+.1f} deg"),
            ("shear exponent", told.shear_exponent, 1.0, "{:.2f}"),
            ("equivalent speed", told.equivalent_speed, speed.size, f"{{:.2f}} {speed.name}"),
            ("with veer", told.equivalent_speed_with_veer, speed.size, f"{{:.2f}} {speed.name}"),
            ("energy flux ratio", told.energy_flux_ratio, 1.0, "{:.3f}"),
            ("covered", told.coverage, 0.01, "{:.0f} %"),
        ]
        for name, values, size, form in rows:
            y -= 0.027
            value = float(values[0, place]) / size
            said = form.format(value) if np.isfinite(value) else "not determined"
            sheet.text(RIGHT, y, name, fontsize=8.5, color="#555555")
            sheet.text(RIGHT + 0.12, y, said, fontsize=8.5)
        y -= 0.045


def _heading(sheet: Figure, stack: Stack, told: Rotor, run: Run) -> None:
    count = stack.profile_count
    title = cut(name_of(stack, 0), 70) if count else "no profile"
    known = stack.time[~np.isnat(stack.time)]
    if len(set(stack.station.tolist())) > 1:
        title = f"{len(set(stack.station.tolist()))} stations"
    sheet.text(DISC[0], 0.945, title, fontsize=14, fontweight="bold", parse_math=False)
    parts = [place_of(stack, 0)] if count else []
    if known.size:
        parts.append(
            time_of(known[0])
            if count == 1
            else f"{count} profiles, {time_of(known.min())} to {time_of(known.max())}"
        )
    parts += [
        f"{cut(str(name), 24)}: hub {hub:g} m, rotor {diameter:g} m"
        for name, hub, diameter in zip(
            told.turbine[:3], told.hub_height[:3], told.rotor_diameter[:3], strict=True
        )
    ]
    sheet.text(DISC[0], 0.912, "; ".join(parts), fontsize=9, parse_math=False)
    sheet.text(DISC[0], 0.012, f"Caution: {TURBINE} {run.short()}", fontsize=7.2, color=FAINT)


def _middle(x: Floats) -> float:
    known = x[np.isfinite(x)]
    return float(np.median(known)) if known.size else float("nan")
