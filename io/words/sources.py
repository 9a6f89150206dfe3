"""
Method, equation and publication of each number of the statement, for ``--sources``.

Kept beside the words, in the order of the statement. The docstrings of ``backveer.profiles`` tell
the same at length; what is cited here from memory is cited so there.
"""

from __future__ import annotations

from dataclasses import dataclass

from backveer.io.words.page import section, wrapped


@dataclass(frozen=True)
class Source:
    """Where one kind of number comes from."""

    number: str
    method: str
    equation: str
    publication: str


SOURCES = (
    Source(
        "f, inertial period",
        "Coriolis parameter of the latitude",
        "f = 2 Omega sin(latitude), T = 2 pi / |f|, Omega = 7.292115e-5 s-1",
        "Omega: WGS84 (NIMA TR8350.2); period: American Meteorological Society, Glossary of "
        "Meteorology, 'inertial oscillation'",
    ),
    Source(
        "error of the wind",
        "given, or the robust small-scale scatter of the profile and the rounding of its numbers",
        "scale of second differences of u and v over levels",
        "our own rule, stated in wind_error.py; limits after WMO-No. 8 (from memory)",
    ),
    Source(
        "turning",
        "direction followed through north as a continuous angle; error from the wind's error",
        "direction = atan2(-u, -v); its error is the wind's over the speed, in light wind that of "
        "an unknown direction",
        "common practice, no source; the error is tested against simulated winds",
    ),
    Source(
        "Ekman spiral",
        "constant viscosity, no slip or partial slip, with or without a linear geostrophic shear; "
        "variable projection, generalised least squares, choice by AICc",
        "W = G + S z + A exp(-(1 + i s) z / delta), delta = sqrt(2 K / |f|), s = sign f",
        "Ekman 1905, Ark. Mat. Astr. Fys. 2 (11); Taylor 1915, Phil. Trans. R. Soc. A 215, 1-26; "
        "Golub and Pereyra 1973, SIAM J. Numer. Anal. 10, 413-432; Hurvich and Tsai 1989, "
        "Biometrika 76, 297-307",
    ),
    Source(
        "errors of the spiral",
        "noise correlated along height, its length weighed by the restricted likelihood",
        "correlation exp(-distance / L); variance of the mixture over L and over the members",
        "Harville 1977, J. Amer. Stat. Assoc. 72, 320-338; Burnham and Anderson 2002, Model "
        "Selection and Multimodel Inference, ch. 4",
    ),
    Source(
        "geostrophic wind, departure",
        "given, from the fit, and from the free air brought down by its own shear; departure is "
        "wind minus geostrophic wind",
        "along and across G, across positive toward low pressure",
        "balance: Holton 2004, An Introduction to Dynamic Meteorology, ch. 3 and 5",
    ),
    Source(
        "friction velocity",
        "momentum integral from the ground to the top of the layer with friction",
        "u*^2 = |f| |integral of (W - Wg) dz|",
        "Lettau 1950, Tellus 2, 125-129; Svensson and Holtslag 2009, Boundary-Layer Meteorol. 132, "
        "261-277",
    ),
    Source(
        "temperature gradient, advection",
        "thermal wind of a single station by layer, friction's part taken out where the spiral is "
        "well determined",
        "A = f / (R ln(p1/p2)) V1 V2 sin(veering angle), positive for warming",
        "Neiman and Shapiro 1989, Wea. Forecasting 4, 222-233 (method)",
    ),
    Source(
        "boundary-layer depth",
        "lowest height where the bulk Richardson number reaches its critical value",
        "Ri = g z (theta_v - theta_v0) / (theta_v0 (u^2 + v^2))",
        "Troen and Mahrt 1986, Boundary-Layer Meteorol. 37, 129-148",
    ),
    Source(
        "low-level jet",
        "wind maximum below 1500 m and its falloff above",
        "falloff of at least 2 m/s and 25 per cent of the maximum",
        "Baas et al. 2009, J. Appl. Meteor. Climatol. 48, 1627-1642",
    ),
)


def sources_text() -> str:
    """Write the method, equation and publication of each number."""
    lines = []
    for source in SOURCES:
        lines.append(wrapped(source.number, "  "))
        lines += [
            wrapped(f"method: {source.method}", "    "),
            wrapped(f"equation: {source.equation}", "    "),
            wrapped(f"publication: {source.publication}", "    "),
        ]
    return section("Sources", lines)
