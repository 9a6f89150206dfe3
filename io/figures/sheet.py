"""
One profile on one sheet: four panels over a shared height axis, the hodograph, the key numbers.

Drawn straight onto a canvas (no pyplot, no window, no state), in the look of
:mod:`backveer.io.figures.style` whatever the person's own settings are, so that two runs give the
same bytes.
"""

from __future__ import annotations

import os
import textwrap
import warnings

import matplotlib.style
import numpy as np
from matplotlib.figure import Figure

from backveer.io.atomic import replacing, suffix_among
from backveer.io.figures import SUFFIXES, panels
from backveer.io.figures.hodograph import hodograph
from backveer.io.figures.profile_of import Drawn
from backveer.io.figures.style import FAINT, METADATA, STYLE
from backveer.io.words.cautions import GENERAL
from backveer.io.words.page import cut, name_of, place_of, time_of
from backveer.io.words.units import DEGREE, Unit, plainly, with_error
from backveer.profiles.stack import wind_from_direction
from backveer.profiles.statement import Statement

SIZE = (13.6, 8.2)  # inches
BOTTOM, HEIGHT = 0.275, 0.57
LEFT, WIDTH, GAP = 0.062, 0.139, 0.0165


def draw(said: Statement, index: int, path: str | os.PathLike[str], *, units: str = "si") -> None:
    """
    Draw one profile's sheet into a file.

    Parameters
    ----------
    said
        The statement of a stack.
    index
        Which of its profiles, from 0.
    path
        Where to; its suffix (.svg, .pdf, .png) says the format.
    units
        ``"si"`` or ``"aviation"``.

    Raises
    ------
    backveer.io.atomic.WriteError
        If the suffix is none of these, or the file cannot be written. A file that stood there
        before stays as it was.
    """
    suffix = suffix_among(path, SUFFIXES)
    with matplotlib.style.context(["default", dict(STYLE)]), warnings.catch_warnings():
        # A station's name in letters that the font lacks is drawn as boxes, and no cause to warn.
        warnings.filterwarnings("ignore", message="Glyph .* missing", category=UserWarning)
        sheet = figure(said, index, units=units)
        with replacing(path) as temporary:
            sheet.savefig(temporary, format=suffix[1:], metadata=dict(METADATA[suffix]))


def figure(said: Statement, index: int, *, units: str = "si") -> Figure:
    """Return one profile's sheet, to be shown or saved by the caller; as :func:`draw`."""
    drawn = Drawn.of(said, index, units)
    sheet = Figure(figsize=SIZE)
    first = sheet.add_axes((LEFT, BOTTOM, WIDTH, HEIGHT))
    axes = [first]
    for n in range(1, 4):
        beside = LEFT + n * (WIDTH + GAP)
        axes.append(sheet.add_axes((beside, BOTTOM, WIDTH, HEIGHT), sharey=first))
        axes[-1].tick_params(labelleft=False)
    panels.height_axis(first, drawn)
    for ax, paint in zip(
        axes, (panels.speed, panels.direction, panels.departure, panels.advection), strict=True
    ):
        paint(ax, drawn)
    panels.layer_marks(axes, drawn)
    hodograph(sheet.add_axes((0.715, BOTTOM + 0.055, 0.28, HEIGHT - 0.055)), drawn)
    _heading(sheet, drawn)
    _numbers(sheet, drawn)
    sheet.text(LEFT, 0.012, "Caution: " + GENERAL, fontsize=7.2, color=FAINT)
    return sheet


def _heading(sheet: Figure, drawn: Drawn) -> None:
    stack = drawn.one.stack
    when = "" if np.isnat(stack.time[0]) else f", {time_of(stack.time[0])}"
    title = cut(name_of(stack, 0), 80) + when
    sheet.text(LEFT, 0.953, title, fontsize=14, fontweight="bold", parse_math=False)
    parts = [place_of(stack, 0)]
    f = drawn.one.coriolis.coriolis_parameter[0]
    if np.isfinite(f):
        parts.append(f"f = {f:+.3e} s⁻¹")
    name = drawn.units.speed.name
    parts.append(f"{int(drawn.usable.sum())} levels with wind")
    parts.append(
        f"error of a wind component {plainly(drawn.one.wind_error[0], drawn.units.speed, 1)} {name}"
    )
    sheet.text(LEFT, 0.923, "; ".join(parts), fontsize=9, parse_math=False)


def _numbers(sheet: Figure, drawn: Drawn) -> None:
    """Write the key numbers beneath the hodograph, and what the marks across the panels are."""
    fit, layer = drawn.one.ekman, drawn.one.boundary_layer
    units = drawn.units
    metre, knot = units.height.name, units.speed.name
    rows = [("spiral", str(fit.verdict[0]))]
    if drawn.fitted:
        rows += [("", line) for line in textwrap.wrap(str(fit.why[0]), 44)]
        u, v = fit.geostrophic_eastward_wind[0], fit.geostrophic_northward_wind[0]
        spread = float(
            np.hypot(
                fit.geostrophic_eastward_wind_error[0], fit.geostrophic_northward_wind_error[0]
            )
        ) / np.sqrt(2.0)
        rows += [
            (
                "geostrophic wind",
                f"{with_error(np.hypot(u, v), spread, units.speed)} {knot} from "
                f"{float(wind_from_direction(u, v)):03.0f}°",
            ),
            (
                "scale height",
                f"{with_error(fit.scale_height[0], fit.scale_height_error[0], units.height)} "
                f"{metre}",
            ),
            (
                "cross-isobar angle",
                with_error(fit.cross_isobar_angle[0], fit.cross_isobar_angle_error[0], DEGREE)
                + "°"
                + ", imposed by no slip" * (fit.model[0] == "no slip"),
            ),
        ]
    found = drawn.one.geostrophic
    if np.isfinite(found.friction_velocity[0]):
        said = with_error(
            found.friction_velocity[0], found.friction_velocity_error[0], Unit("m/s", 1.0)
        )
        rows.append(("friction velocity", f"{said} m/s"))
    if np.isfinite(layer.bulk_richardson_depth[0]):
        depth = f"{plainly(layer.bulk_richardson_depth[0], units.height)} {metre}"
        rows.append(("boundary layer", f"{depth} (Ri {layer.critical_richardson:g})"))
    if layer.jet_meets_criterion[0]:
        rows.append(
            (
                "jet",
                f"{plainly(layer.jet_speed[0], units.speed, 1)} {knot} at "
                f"{plainly(layer.jet_height[0], units.height)} {metre}",
            )
        )
    left, top, step = 0.715, 0.224, 0.0213
    for n, (name, value) in enumerate(rows):
        sheet.text(left, top - n * step, name, fontsize=8.2, color="#555555")
        sheet.text(left + 0.095, top - n * step, value, fontsize=8.2, parse_math=False)
    marks = []
    if np.isfinite(layer.bulk_richardson_depth[0]):
        marks.append("dashed: top of the boundary layer")
    if np.isfinite(layer.inversion_base[0]).any():
        marks.append("shaded: inversions")
    if marks:
        sheet.text(left, top - len(rows) * step, "; ".join(marks), fontsize=7.6)
