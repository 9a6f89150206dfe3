"""The hodograph: the wind vectors of the lowest levels, the fitted spiral, the geostrophic wind."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.patches import Circle

from backveer.io.figures.panels import say
from backveer.io.figures.profile_of import Drawn
from backveer.io.figures.style import BLUE, FAINT, GREEN, INK, ORANGE, PALE, PURPLE, VERMILION
from backveer.io.words.units import plainly
from backveer.profiles import ekman
from backveer.profiles.ekman import TOP
from backveer.profiles.labels import Bools, Floats

RINGS = (0.5, 1.0, 2.0, 5.0, 10.0, 20.0, 50.0, 100.0)
LOOKS = {"given": ("*", VERMILION, 12), "fit": ("P", PURPLE, 8), "free air": ("^", GREEN, 8)}
NAMED_HEIGHTS = (10.0, 50.0, 100.0, 200.0, 300.0, 500.0, 1000.0, 1500.0, 2000.0, 3000.0)  # m


def hodograph(ax: Axes, drawn: Drawn) -> None:
    """
    Draw the hodograph of the levels up to 3 km, as high as the spiral is fitted.

    The frame holds the winds and the origin with nothing spare, rather than four equal quarters.
    """
    from metpy.plots import Hodograph

    size, metre = drawn.units.speed.size, drawn.units.height.size
    stack = drawn.one.stack
    low = drawn.usable & (drawn.z <= TOP / metre)
    u, v = stack.eastward_wind[0] / size, stack.northward_wind[0] / size
    found = drawn.one.geostrophic
    evidence = [
        (str(name), complex(east, north) / size, float(error) / size)
        for name, east, north, error in zip(
            found.evidence_from[0],
            found.evidence_eastward[0],
            found.evidence_northward[0],
            found.evidence_error[0],
            strict=True,
        )
        if name and np.isfinite(east) and np.isfinite(north)
    ]
    points = [0j, *(u[low] + 1j * v[low]), *(wind for _, wind, _ in evidence)]
    x, y = np.real(points), np.imag(points)
    side = 1.16 * max(float(np.ptp(x)), float(np.ptp(y)), 1.0)
    middle = 0.5 * (x.max() + x.min()), 0.5 * (y.max() + y.min())
    reach = float(np.hypot(*(np.abs(middle) + np.array([side, side]))))
    step = next((ring for ring in RINGS if 5 * ring >= side), side / 4)
    frame = Hodograph(ax, component_range=reach)
    frame.add_grid(step, color=PALE, linestyle="-", linewidth=0.9)
    ax.set_xlim(middle[0] - side / 2, middle[0] + side / 2)
    ax.set_ylim(middle[1] - side / 2, middle[1] + side / 2)
    for spine in ax.spines.values():
        spine.set_visible(True)
    ax.set_xticks(np.arange(np.ceil(ax.get_xlim()[0] / step), ax.get_xlim()[1] / step) * step)
    ax.set_yticks(np.arange(np.ceil(ax.get_ylim()[0] / step), ax.get_ylim()[1] / step) * step)
    name = drawn.units.speed.name
    ax.set_xlabel(f"toward east, {name}")
    ax.set_ylabel(f"toward north, {name}")
    reached = min(TOP, drawn.top * metre)
    below = f"wind vectors to {plainly(reached, drawn.units.height)} {drawn.units.height.name}"
    ax.text(0.0, 1.052, "Hodograph", transform=ax.transAxes, fontsize=10, fontweight="bold")
    if not low.any():
        say(ax, "no level has a usable wind")
        return
    ax.text(0.0, 1.014, f"{below} above ground", transform=ax.transAxes, fontsize=7.6)
    many = int(low.sum()) > 80
    frame.plot(
        u[low], v[low], color=INK, linewidth=1.0, marker="o",
        markersize=1.8 if many else 3.4, label="measured", zorder=3,
    )  # fmt: skip
    if drawn.fitted:
        z = drawn.heights(float(drawn.one.ekman.top[0]))
        east, north = ekman.wind(drawn.one.ekman, z)
        frame.plot(
            east[0] / size, north[0] / size, color=BLUE, linewidth=2.0, label="fit", zorder=4
        )
    for origin, wind, error in evidence:
        marker, colour, big = LOOKS.get(origin, ("h", ORANGE, 8))
        ax.plot(
            wind.real, wind.imag, marker, color=colour, mec="white", ms=big, mew=0.8, zorder=6,
            label=f"geostrophic wind: {origin}",
        )  # fmt: skip
        if np.isfinite(error):
            ax.add_patch(
                Circle((wind.real, wind.imag), error, fill=False, ec=colour, lw=1.1, zorder=5)
            )
        if origin == found.chosen[0]:
            ax.annotate(
                "", (wind.real, wind.imag), (0.0, 0.0), zorder=2,
                arrowprops={"arrowstyle": "-", "color": colour, "lw": 1.2, "shrinkA": 0,
                            "shrinkB": 0, "ls": (0, (7, 2, 1.5, 2))},
            )  # fmt: skip
    ax.plot(0.0, 0.0, "+", color=INK, ms=8, mew=1.0)
    _heights(ax, drawn, low, u, v, side)
    ax.legend(
        loc="upper left", bbox_to_anchor=(0.0, -0.115), ncols=2, borderaxespad=0.0,
        handlelength=2.0, labelspacing=0.35, columnspacing=1.2, borderpad=0.0,
    )  # fmt: skip


def _heights(ax: Axes, drawn: Drawn, low: Bools, u: Floats, v: Floats, side: float) -> None:
    """Name the height of some levels, as many as have room."""
    places = np.flatnonzero(low)
    z, metre = drawn.z[places] * drawn.units.height.size, drawn.units.height.size
    path = u[places] + 1j * v[places]
    reach = max(1, len(path) // 10)
    taken: list[complex] = []
    wanted = [goal for goal in NAMED_HEIGHTS if z[0] <= goal <= z[-1]]
    chosen = dict.fromkeys([0, len(z) - 1, *(int(np.argmin(np.abs(z - goal))) for goal in wanted)])
    for i in chosen:
        point = complex(path[i])
        if any(abs(point - other) < 0.07 * side for other in taken):
            continue
        taken.append(point)
        # Beside the path, on its outer side.
        along = complex(path[min(i + reach, len(path) - 1)] - path[max(i - reach, 0)])
        away = 1j * along / abs(along) if abs(along) > 0 else 1j
        if (away.conjugate() * (point - complex(path.mean()))).real < 0:
            away = -away
        ax.annotate(
            f"{z[i] / metre:.0f}", (point.real, point.imag),
            (11 * away.real, 11 * away.imag), textcoords="offset points", fontsize=7.2,
            ha="center", va="center", color=INK, zorder=7,
            bbox={"facecolor": "white", "edgecolor": FAINT, "lw": 0.4, "pad": 0.9, "alpha": 0.8},
        )  # fmt: skip
