"""The four panels over one height axis: speed, direction, departure and advection."""

from __future__ import annotations

import textwrap

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import FixedLocator, FuncFormatter, MaxNLocator, NullLocator

from backveer.io.figures.profile_of import Drawn
from backveer.io.figures.style import BLUE, FAINT, GREEN, INK, ORANGE, PALE, PURPLE, SKY, VERMILION
from backveer.io.words.units import DEGREE, plainly, with_error
from backveer.profiles import ekman
from backveer.profiles.labels import Bools, Floats

#: Profiles that reach higher than this are drawn over the square root of height, which gives the
#: layer of friction the room that a linear axis would give to the free air. [m]
LINEAR_TO = 1500.0
TICKS = (0, 50, 100, 200, 300, 500, 1000, 1500, 2000, 3000, 4000, 6000, 8000, 10000, 12000, 15000,
         20000, 25000, 30000, 40000, 50000, 65000, 80000, 100000)  # fmt: skip
COMPASS = (5.0, 10.0, 15.0, 30.0, 45.0, 90.0, 180.0)  # degrees
CLOSEST_TICKS = 0.042  # of the axis
DASHES = ((0, (5, 2)), (0, (1, 1.5)), (0, (6, 2, 1, 2)), (0, (3, 1)))
LETTERS = 33  # of a note that fit beneath a panel
DEEPEST = 0.42  # where the foot of the sheet begins, in heights of a panel beneath it


def height_axis(ax: Axes, drawn: Drawn) -> None:
    """Set up the axis that all four share."""
    unit = drawn.units.height
    top = drawn.top or 1000.0 / unit.size
    root = top * unit.size > LINEAR_TO
    if root:
        ax.set_yscale("function", functions=(lambda y: np.sqrt(np.maximum(y, 0.0)), np.square))
        ticks: list[float] = []
        for tick in TICKS:
            if tick <= 1.02 * top and (
                not ticks or np.sqrt(tick / top) - np.sqrt(ticks[-1] / top) >= CLOSEST_TICKS
            ):
                ticks.append(tick)
        ax.yaxis.set_major_locator(FixedLocator(ticks))
        ax.yaxis.set_minor_locator(NullLocator())
    else:
        ax.yaxis.set_major_locator(MaxNLocator(8))
    ax.yaxis.set_major_formatter(FuncFormatter(lambda y, _: f"{y:.0f}"))
    ax.set_ylim(0.0, 1.05 * top)
    scale = " (square-root scale)" if root else ""
    ax.set_ylabel(f"height above ground, {unit.name}{scale}")


def speed(ax: Axes, drawn: Drawn) -> None:
    """Draw the wind speed, the fitted models and the geostrophic wind."""
    size, metre = drawn.units.speed.size, drawn.units.height.size
    fit = drawn.one.ekman
    note = ""
    if drawn.fitted:
        z = drawn.heights(float(fit.top[0]))
        for (name, wind), dashes in zip(drawn.candidates(), DASHES, strict=False):
            ax.plot(
                np.abs(wind(z)) / size, z / metre,
                color=FAINT, lw=0.9, ls=dashes, label=f"not chosen: {name}",
            )  # fmt: skip
        u, v = ekman.geostrophic_wind(fit, z)
        ax.plot(
            np.hypot(u, v)[0] / size, z / metre,
            color=PURPLE, lw=1.6, ls=(0, (7, 2, 1.5, 2)), label="geostrophic wind of the fit",
        )  # fmt: skip
        u, v = ekman.wind(fit, z)
        ax.plot(
            np.hypot(u, v)[0] / size, z / metre,
            color=BLUE, lw=2.0, label=f"fit: {fit.model[0]}", zorder=4,
        )  # fmt: skip
    else:
        note = f"spiral not determined, because {fit.why[0] or 'no data'}"
    if drawn.usable.any():
        _measured(ax, drawn, drawn.speed, "measured")
    if drawn.left_out.any():
        ax.plot(
            drawn.speed[drawn.left_out], drawn.z[drawn.left_out],
            "x", color=FAINT, ms=4.5, mew=1.1, label="left out (quality)",
        )  # fmt: skip
    layer = drawn.one.boundary_layer
    if layer.jet_meets_criterion[0]:
        ax.plot(
            layer.jet_speed[0] / size, layer.jet_height[0] / metre,
            "D", mfc="none", mec=VERMILION, mew=1.4, ms=8, label="nose of the jet", zorder=6,
        )  # fmt: skip
    seen = drawn.speed[drawn.usable]
    ax.set_xlim(0.0, 1.12 * float(seen.max(initial=1.0)) or 1.0)
    ax.xaxis.set_major_locator(MaxNLocator(5))
    _titled(ax, "Speed", _ends(drawn))
    ax.set_xlabel(drawn.units.speed.name)
    _beneath(ax, note)
    if not seen.size:
        say(ax, "no level has a usable wind")


def direction(ax: Axes, drawn: Drawn) -> None:
    """Draw the direction as one continuous curve, with the turning of each layer beside it."""
    turned = drawn.one.turning
    angle = turned.direction[0]
    there = np.isfinite(angle) & np.isfinite(drawn.z)
    if there.sum() < 2:
        _titled(ax, "Direction", "")
        ax.set_xticks([])
        say(ax, f"turning not determined, because {turned.why[0] or 'no data'}")
        return
    low, high = float(angle[there].min()), float(angle[there].max())
    span = max(high - low, 20.0)
    middle = 0.5 * (low + high)
    left = middle - 0.6 * span
    # The right of the panel is kept for the turning of each layer.
    ax.set_xlim(left, left + 1.2 * span / 0.6)
    ax.xaxis.set_major_locator(FixedLocator(_compass(left, left + 1.25 * span)))
    ax.xaxis.set_major_formatter(FuncFormatter(lambda d, _: f"{d % 360.0:03.0f}"))
    _measured(ax, drawn, angle, "measured", there)
    if np.isfinite(turned.total[0]):
        at = np.flatnonzero(there)
        for place in (at[0], at[-1]):
            ax.axvline(angle[place], color=GREEN, lw=0.9, ls=(0, (2, 2)), zorder=1)
        if abs(turned.total[0]) > 0.02 * span:
            ax.annotate(
                "", (angle[at[-1]], 0.985), (angle[at[0]], 0.985),
                xycoords=ax.get_xaxis_transform(), textcoords=ax.get_xaxis_transform(),
                arrowprops={"arrowstyle": "-|>", "color": GREEN, "lw": 1.6, "shrinkA": 0,
                            "shrinkB": 0, "mutation_scale": 9},
            )  # fmt: skip
        said = with_error(turned.total[0], turned.error[0], DEGREE, sign=True)
        below = f"{turned.sense[0]}, {said}° in all"
        note = ""
    else:
        below = "turning not determined"
        note = f"not determined, because {turned.why[0]}"
    _titled(ax, "Direction", below)
    _layers_of_turning(ax, drawn)
    ax.set_xlabel("from, deg", loc="left")
    ax.text(
        1.0, -0.052, "by layer, deg", transform=ax.transAxes, fontsize=8.5, ha="right", va="top"
    )
    _beneath(ax, note)


def departure(ax: Axes, drawn: Drawn) -> None:
    """Draw the wind minus the geostrophic wind, along and across the isobars."""
    found = drawn.one.geostrophic
    size = drawn.units.speed.size
    along, across = found.departure_along[0] / size, found.departure_across[0] / size
    there = np.isfinite(along) & np.isfinite(across) & np.isfinite(drawn.z)
    if not there.any():
        _titled(ax, "Departure", "from the geostrophic wind")
        ax.set_xticks([])
        say(ax, f"not determined, because {found.departure_why[0] or 'no data'}")
        return
    error = float(found.departure_error[0]) / size
    ax.axvline(0.0, color=FAINT, lw=0.9, zorder=1)
    if np.isfinite(error):
        ax.axvspan(
            -2 * error, 2 * error, color=PALE, lw=0, zorder=0, label="within twice its error"
        )
    z = drawn.z[there]
    every = max(1, there.sum() // 14)
    style = {"lw": 1.4, "ms": 4.0, "markevery": every}
    ax.plot(along[there], z, "-o", color=BLUE, mfc="white", label="along the isobars", **style)
    ax.plot(
        across[there], z, "--s", color=VERMILION, mfc=VERMILION,
        label="across, to low pressure", **style,
    )  # fmt: skip
    widest = float(np.nanmax(np.abs([along[there], across[there]])))
    reach = max(1.1 * widest, min(2.2 * error, 3 * widest) if np.isfinite(error) else 0.0, 0.5)
    ax.set_xlim(-reach, reach)
    ax.xaxis.set_major_locator(MaxNLocator(4, symmetric=True))
    ax.set_xlabel(drawn.units.speed.name)
    _titled(ax, "Departure", f"from the geostrophic wind: {found.chosen[0]}")
    _beneath(ax, "")


def advection(ax: Axes, drawn: Drawn) -> None:
    """Draw the temperature advection of each layer with its error."""
    layers = drawn.one.thermal_wind
    metre, size = drawn.units.height.size, drawn.units.advection.size
    base, top = layers.layer_base_height[0] / metre, layers.layer_top_height[0] / metre
    value, error = layers.layer_advection[0] / size, layers.layer_error[0] / size
    there = np.isfinite(base) & np.isfinite(top)
    told = there & np.isfinite(value)
    _titled(ax, "Advection", "of temperature, by the thermal wind")
    if not told.any():
        ax.set_xticks([])
        whys = list(dict.fromkeys(str(why) for why in layers.layer_why[0][there] if why))
        why = drawn.one.coriolis.why[0] or "; ".join(whys[:2]) or "no layer has wind and pressure"
        say(ax, f"no layer is determined, because {why}")
        return
    ax.axvline(0.0, color=FAINT, lw=0.9, zorder=1)
    looks = {"warm": (VERMILION, "////"), "cold": (SKY, "...."), "none": ("#bbbbbb", "")}
    named = set()
    for i in np.flatnonzero(told):
        sense = str(layers.layer_sense[0, i]) or "none"
        colour, hatch = looks[sense]
        name = "none: within twice its error" if sense == "none" else sense
        ax.barh(
            base[i], value[i], height=top[i] - base[i], align="edge", color=colour, alpha=0.55,
            hatch=hatch, edgecolor=INK, lw=0.7, label=None if name in named else name,
        )  # fmt: skip
        named.add(name)
        ax.errorbar(
            value[i], _middle(ax, base[i], top[i]), xerr=error[i], color=INK, lw=1.1, capsize=2.5
        )
    whys = list(dict.fromkeys(str(layers.layer_why[0, i]) for i in np.flatnonzero(there & ~told)))
    for i in np.flatnonzero(there & ~told):
        ax.axhspan(base[i], top[i], facecolor="white", edgecolor=PALE, hatch="xx", lw=0, zorder=0)
        ax.text(
            0.03, _middle(ax, base[i], top[i]), f"({1 + whys.index(str(layers.layer_why[0, i]))})",
            transform=ax.get_yaxis_transform(), fontsize=7.5, va="center",
        )  # fmt: skip
    with np.errstate(invalid="ignore"):
        reach = 1.1 * float(np.nanmax(np.abs(value[told]) + np.nan_to_num(error[told])))
    ax.set_xlim(-max(reach, 0.2), max(reach, 0.2))
    ax.xaxis.set_major_locator(MaxNLocator(4, symmetric=True))
    ax.set_xlabel(f"{drawn.units.advection.name}, warming positive")
    _beneath(ax, " ".join(f"({n}) not determined, because {why}." for n, why in enumerate(whys, 1)))


def layer_marks(axes: list[Axes], drawn: Drawn) -> None:
    """Mark the top of the boundary layer and the inversions across all panels."""
    layer = drawn.one.boundary_layer
    metre = drawn.units.height.size
    depth = float(layer.bulk_richardson_depth[0]) / metre
    for ax in axes:
        bottom, top = ax.get_ylim()
        if depth <= top:
            ax.axhline(depth, color=ORANGE, lw=1.2, ls=(0, (4, 3)), zorder=1)
        for low, high in zip(layer.inversion_base[0], layer.inversion_top[0], strict=True):
            if low / metre <= top:
                ax.axhspan(low / metre, high / metre, color=ORANGE, alpha=0.13, lw=0, zorder=0)
        ax.set_ylim(bottom, top)


def say(ax: Axes, text: str) -> None:
    """Say in the middle of a panel why it is empty."""
    ax.text(
        0.5, 0.55, "\n".join(textwrap.wrap(text, 26)),
        transform=ax.transAxes, ha="center", va="center", fontsize=8.0, style="italic",
        parse_math=False, bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.85},
    )  # fmt: skip


def _measured(
    ax: Axes, drawn: Drawn, values: Floats, label: str, there: Bools | None = None
) -> None:
    kept = drawn.usable if there is None else there
    many = int(np.sum(kept)) > 80
    ax.plot(
        values[kept], drawn.z[kept],
        color=INK, lw=1.0 if many else 0.7, marker="" if many else "o", ms=3.2, label=label,
        zorder=3,
    )  # fmt: skip


def _layers_of_turning(ax: Axes, drawn: Drawn) -> None:
    turned = drawn.one.turning
    metre = drawn.units.height.size
    scale = ax.transData
    last = -np.inf
    for i in range(turned.layer_base.shape[1]):
        base, top = turned.layer_base[0, i] / metre, turned.layer_top[0, i] / metre
        if not (np.isfinite(base) and np.isfinite(top)):
            continue
        ax.plot([0.56, 1.0], [top, top], color=PALE, lw=0.8, transform=ax.get_yaxis_transform())
        middle = _middle(ax, base, top)
        at = scale.transform((0.0, middle))[1]
        if at - last < 0.022 * ax.figure.bbox.height:
            continue
        last = at
        if np.isfinite(turned.layer_turning[0, i]):
            text = with_error(turned.layer_turning[0, i], turned.layer_error[0, i], DEGREE, True)
        else:
            text = "not det."
        faint = turned.layer_sense[0, i] not in ("veering", "backing")
        ax.text(
            0.985, middle, text, transform=ax.get_yaxis_transform(), ha="right", va="center",
            fontsize=7.2, color=FAINT if faint else INK,
        )  # fmt: skip


def _middle(ax: Axes, low: float, high: float) -> float:
    """Middle of two heights as the axis shows it."""
    if ax.get_yscale() == "linear":
        return float(0.5 * (low + high))
    return float((0.5 * (np.sqrt(max(low, 0.0)) + np.sqrt(max(high, 0.0)))) ** 2)


def _ends(drawn: Drawn) -> str:
    seen = drawn.one.stack.wind_speed[0][drawn.usable]
    if not seen.size:
        return ""
    unit = drawn.units.speed
    return f"{plainly(seen[0], unit, 1)} lowest, {plainly(seen[-1], unit, 1)} {unit.name} highest"


def _titled(ax: Axes, title: str, below: str) -> None:
    ax.text(0.0, 1.052, title, transform=ax.transAxes, fontsize=10, fontweight="bold")
    ax.text(0.0, 1.014, below, transform=ax.transAxes, fontsize=7.6, parse_math=False)


def _beneath(ax: Axes, note: str) -> None:
    """Put the legend, and a note under it, beneath the panel."""
    handles, names = ax.get_legend_handles_labels()
    if handles:
        ax.legend(
            handles, names, loc="upper left", bbox_to_anchor=(-0.04, -0.095), borderaxespad=0.0,
            handlelength=2.4, labelspacing=0.35, handletextpad=0.6, borderpad=0.0,
        )  # fmt: skip
    if note:
        lines = textwrap.wrap(note, LETTERS)
        start = 0.105 + 0.033 * len(handles)
        room = int((DEEPEST - start) / 0.026)
        if len(lines) > room:
            lines = [*lines[: room - 1], lines[room - 1][: LETTERS - 3] + "..."]
        ax.text(
            0.0, -start, "\n".join(lines), transform=ax.transAxes,
            fontsize=7.2, style="italic", va="top", parse_math=False,
        )  # fmt: skip


def _compass(low: float, high: float) -> list[float]:
    """Round directions where the curve runs, three or four, none under the layers' numbers."""
    step = next((step for step in COMPASS if (high - low) / step <= 3.5), 360.0)
    return list(np.arange(np.ceil(low / step), high / step) * step)
