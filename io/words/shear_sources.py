"""Method, equation and publication of each number about low-level shear, for ``--sources``."""

from __future__ import annotations

from backveer.io.words.page import section, wrapped
from backveer.io.words.sources import SOURCES, Source

SHEAR_SOURCES = (
    Source(
        "shear",
        "vector difference of the wind over the depth of a layer, winds linear between levels",
        "s = |V_top - V_base| / (z_top - z_base); 1 kt per 100 ft = 0.0168781 s-1",
        "definition; units: ISO 80000-3:2019",
    ),
    Source(
        "strongest over a step",
        "the layer of that depth, wherever it lies, with the largest vector difference",
        "the difference over a sliding layer is convex between levels: its largest value has an "
        "end at a level",
        "our own, stated in sliding_layer.py",
    ),
    Source(
        "error of a shear",
        "from the standard error of a wind component",
        "error = sqrt(2) e / depth",
        "propagation of error; common practice, no source",
    ),
    Source(
        "terms of intensity",
        "limits in kt per 100 ft",
        "light, moderate from 5, strong from 9, severe from 12",
        "ICAO, Fifth Air Navigation Conference (1967), as told of Doc 9817 and Circular 186 (from "
        "memory and second hand)",
    ),
    Source(
        "headwind, crosswind",
        "components of the wind along and across the true heading",
        "headwind = -(u sin h + v cos h), crosswind = -(u cos h - v sin h)",
        "geometry; common practice, no source",
    ),
    Source(
        "change per second, F",
        "straight path at constant ground speed, horizontal term of the F-factor only",
        "dH/dt = dH/dz V tan(slope); F = (1/g) dWx/dt with the tailwind Wx",
        "Bowles 1990, 17th Congress of the ICAS (from memory); g: ISO 2533:1975",
    ),
    Source(
        "Richardson number",
        "of the layer of strongest shear, from the differences between its top and base",
        "Ri = (g / theta) (d theta / dz) / ((du/dz)^2 + (dv/dz)^2)",
        "critical value: Miles 1961 and Howard 1961, J. Fluid Mech. 10, 496-512",
    ),
    Source(
        "cause",
        "the first rule that holds: jet on a stable layer by night, inversion with turning, spiral",
        "stated in shear_cause.py",
        "our own rules; Blackadar 1957, Bull. Amer. Meteor. Soc. 38, 283-290",
    ),
    Source(
        "candidate group",
        "top of the layer is the level, to 2000 ft, whose wind differs most from the surface wind",
        "WShhh/dddffKT: hundreds of feet, tens of degrees, knots",
        "US National Weather Service, training text on the TAF",
    ),
)


def sources_text() -> str:
    """Write the sources, those of the wind's error and of the layers among them."""
    shared = tuple(source for source in SOURCES if source.number == "error of the wind")
    lines = []
    for source in (*SHEAR_SOURCES, *shared):
        lines.append(f"  {source.number}")
        for text in (source.method, source.equation, source.publication):
            lines.append(wrapped(text, "    "))
    return section("Sources", lines)
