"""Method, equation and publications of each number about low-level shear, for ``--sources``."""

from __future__ import annotations

from backveer.io.words.page import section, wrapped
from backveer.io.words.sources import Source

SHEAR_SOURCES = (
    Source(
        "shear of a layer and its error",
        "vector difference of the wind over the depth of the layer, winds linear between levels",
        "s = |V_top - V_base| / (z_top - z_base), error sqrt(2) e / depth with the error e of a "
        "wind component; 1 kt per 100 ft = 0.0168781 s-1",
        ("ISO 80000-3:2019, annex B (foot and knot)", "propagation of error: common practice"),
        ("low_level_shear",),
    ),
    Source(
        "strongest over a step",
        "the layer of that depth, wherever it lies, with the largest vector difference; the "
        "difference over a sliding layer is convex between levels, so an end lies at one",
        "max over z of |V(z + step) - V(z)| / step",
        ("our own, stated in the module",),
        ("sliding_layer",),
    ),
    Source(
        "terms of intensity",
        "limits in kt per 100 ft",
        "light; moderate from 5, strong from 9, severe above 12",
        (
            "ICAO: Fifth Air Navigation Conference (1967), as told of Doc 9817 and Circular 186 "
            "(from memory and second hand)",
        ),
        ("low_level_shear",),
    ),
    Source(
        "headwind, crosswind, change per second, F",
        "components along and across the true heading; straight path at constant ground speed; "
        "horizontal term of the F-factor only",
        "headwind H = -(u sin h + v cos h), crosswind = -(u cos h - v sin h); "
        "dH/dt = dH/dz V tan(slope); F = (1/g) dWx/dt with the tailwind Wx",
        (
            "Bowles, R. L., 1990: Reducing windshear risk through airborne systems technology, "
            "17th Congress of the ICAS (from memory)",
            "ISO 2533:1975 (g)",
        ),
        ("flight_path",),
    ),
    Source(
        "cause",
        "the first rule that holds: jet on a stable layer by night; elevated inversion across "
        "which the wind turns; layer inside a well determined Ekman spiral",
        "stated in the module",
        ("our own rules; Blackadar 1957, Bull. Amer. Meteor. Soc. 38, 283-290 (the jet)",),
        ("shear_cause",),
    ),
    Source(
        "Richardson number",
        "of the layer of strongest shear, from the differences between its top and base",
        "Ri = (g / theta) dtheta dz / (du^2 + dv^2); unstable below 0.25",
        ("Miles, J. W., 1961, and Howard, L. N., 1961, J. Fluid Mech. 10, 496-512",),
        ("shear_cause",),
    ),
    Source(
        "candidate group",
        "top of the layer is the level, up to 2000 ft, whose wind differs most from that at the "
        "surface",
        "WShhh/dddffKT: hundreds of feet, tens of degrees, knots",
        ("US National Weather Service: training text on the TAF",),
        (),
    ),
)


def sources_text() -> str:
    """Write the method, equation and publications of each number, numbered."""
    lines = []
    for number, source in enumerate(SHEAR_SOURCES, 1):
        lines.append(wrapped(f"{number}. {source.number}", "  "))
        lines += [
            wrapped(f"method: {source.method}", "     "),
            wrapped(f"equation: {source.equation}", "     "),
            *(wrapped(f"source: {text}", "     ") for text in source.publications),
        ]
    return section("Sources: method, equation and publications of each number", lines)
