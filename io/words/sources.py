"""
Method, equation and publication of each number of the statement, for ``--sources``.

In the order of the statement. The docstrings of ``backveer.profiles`` say the same at length, and a
test holds every author and year here to the modules named beside them. Titles are cited from
memory, and so are the publications that the docstrings mark so.
"""

from __future__ import annotations

from dataclasses import dataclass

from backveer.io.words.page import section, wrapped


@dataclass(frozen=True)
class Source:
    """
    Where one kind of number comes from.

    Attributes
    ----------
    number
        What is told.
    method, equation
        How it is worked out.
    publications
        Author, year, title and journal of each.
    modules
        Where in ``backveer.profiles`` it is done.
    """

    number: str
    method: str
    equation: str
    publications: tuple[str, ...]
    modules: tuple[str, ...]


SOURCES = (
    Source(
        "f and inertial period",
        "Coriolis parameter of the latitude; no analysis divides by it near the equator",
        "f = 2 Omega sin(latitude), Omega = 7.292115e-5 s-1; T = 2 pi / |f|",
        (
            "NIMA, 2000: Department of Defense World Geodetic System 1984, TR8350.2",
            "American Meteorological Society: Glossary of Meteorology, inertial oscillation",
        ),
        ("earth",),
    ),
    Source(
        "standard error of a wind component",
        "as given; otherwise the larger of the profile's small-scale scatter (each level from the "
        "parabola through its neighbours, median over levels) and of the rounding of its numbers, "
        "between 0.1 and 3 m/s; 0.5 m/s where too few levels tell",
        "median |r|^2 = 2 ln 2 sigma^2; rounding q / sqrt(12)",
        ("WMO-No. 8: Guide to Instruments and Methods of Observation (the limits)",),
        ("wind_error",),
    ),
    Source(
        "turning, its rate and error; strengthening",
        "direction from the components, followed through north as a continuous angle; components "
        "linear between levels; withheld where it may have gone either way round",
        "direction = atan2(-u, -v); error of a direction = error of the wind / speed, growing to "
        "104 deg (no direction) in a calm; steady: less than its error",
        ("common practice, no publication; the error's formula is ours (docstring)",),
        ("turning", "direction"),
    ),
    Source(
        "Ekman spiral: scale height, viscosity, geostrophic wind, cross-isobar angle",
        "constant viscosity; no slip or partial slip, geostrophic wind constant or linear with "
        "height; fitted to all levels up to 3 km by variable projection, member chosen by AICc "
        "with the effective number of levels and a price on each parameter",
        "W = G + S z + A exp(-(1 + i s) z / delta), W = u + i v, s = sign f; "
        "delta = sqrt(2 K / |f|); no slip: A = -G; angle = arg(dW/dz at the ground) - arg G",
        (
            "Ekman, V. W., 1905: On the influence of the earth's rotation on ocean-currents. "
            "Ark. Mat. Astr. Fys., 2, no. 11",
            "Taylor, G. I., 1915: Eddy motion in the atmosphere. Phil. Trans. R. Soc. A, 215, 1-26",
            "Golub, G. H., and V. Pereyra, 1973: The differentiation of pseudo-inverses and "
            "nonlinear least squares problems whose variables separate. SIAM J. Numer. Anal., 10, "
            "413-432",
            "Hurvich, C. M., and C.-L. Tsai, 1989: Regression and time series model selection in "
            "small samples. Biometrika, 76, 297-307",
        ),
        ("ekman", "ekman_search"),
    ),
    Source(
        "errors and verdict of the spiral",
        "generalised least squares with noise correlated along height, the length weighed by the "
        "restricted likelihood; widened by what the other members say; the limits of the verdict "
        "are ours",
        "correlation exp(-distance / L); variance = weighted mean over L of the variance and the "
        "squared shift, plus the members' spread by Akaike weights",
        (
            "Harville, D. A., 1977: Maximum likelihood approaches to variance component "
            "estimation and to related problems. J. Amer. Stat. Assoc., 72, 320-338",
            "Burnham, K. P., and D. R. Anderson, 2002: Model Selection and Multimodel Inference, "
            "2nd ed. Springer, ch. 4",
        ),
        ("ekman_errors", "ekman_intervals", "ekman_parameters", "ekman_verdict"),
    ),
    Source(
        "viscosity that varies with height (where asked for)",
        "the steady balance solved for K(z) = kappa u* z (1 - z/h)^p and a cubic, with a "
        "logarithmic wall; fitted by generalised least squares and compared by AICc",
        "d/dz (K dW/dz) = i f (W - Wg), W = 0 at z0; u*^2 = K |dW/dz| at the wall",
        (
            "O'Brien, J. J., 1970: A note on the vertical structure of the eddy exchange "
            "coefficient in the planetary boundary layer. J. Atmos. Sci., 27, 1213-1215",
        ),
        ("viscosity_profile", "viscosity_shapes", "ekman_solver"),
    ),
    Source(
        "geostrophic wind of the free air; departure",
        "straight line through both components over 1500 m above the layer of friction, by "
        "generalised least squares, read at the ground; departure is wind minus geostrophic wind, "
        "along it and across it toward low pressure",
        "W(z) = a + b z; departure = W - Wg",
        (
            "Patterson, H. D., and R. Thompson, 1971: Recovery of inter-block information when "
            "block sizes are unequal. Biometrika, 58, 545-554",
            "Stull, R. B., 2017: Practical Meteorology (geostrophic balance)",
        ),
        ("free_air", "balance", "geostrophic"),
    ),
    Source(
        "friction velocity",
        "momentum integral of the departure from the ground to the top of the layer of friction; "
        "logarithmic law below the lowest level",
        "u*^2 = |f| |integral of (W - Wg) dz|",
        (
            'Lettau, H., 1950: A re-examination of the "Leipzig wind profile" considering some '
            "relations between wind and turbulence in the frictional layer. Tellus, 2, 125-129",
        ),
        ("momentum_integral", "geostrophic"),
    ),
    Source(
        "temperature gradient and advection",
        "thermal wind of a single station, layer by layer; where a layer reaches into the air that "
        "friction turns, the well determined spiral's part is taken out (its own doubt in the "
        "error), otherwise no answer; warm or cold beyond twice the error",
        "A = f / (R ln(p1 / p2)) V1 V2 sin(veering), R = 287.05 J kg-1 K-1, T virtual; for more "
        "than two levels the mean and slope over ln p",
        (
            "Neiman, P. J., and M. A. Shapiro, 1989: Retrieving horizontal temperature gradients "
            "and advections from single-station wind profiler observations. Wea. Forecasting, 4, "
            "222-233",
        ),
        ("thermal_wind", "friction_correction", "layer_line"),
    ),
    Source(
        "boundary-layer depth",
        "lowest height at which the bulk Richardson number reaches its critical value, from the "
        "lowest level, with virtual potential temperature; linear between levels",
        "Ri = (g / theta_v,s) (theta_v - theta_v,s) (z - z_s) / (u^2 + v^2)",
        (
            "Troen, I., and L. Mahrt, 1986: A simple model of the atmospheric boundary layer; "
            "sensitivity to surface evaporation. Boundary-Layer Meteorol., 37, 129-148",
            "Vogelezang, D. H. P., and A. A. M. Holtslag, 1996: Evaluation and model impacts of "
            "alternative boundary-layer height formulations. Boundary-Layer Meteorol., 81, 245-269",
        ),
        ("boundary_layer",),
    ),
    Source(
        "inversions",
        "layers of rising temperature below 5 km, at least 10 m deep and 0.5 K strong; those "
        "parted by less than 100 m belong together",
        "strength = T(top) - T(base)",
        (
            "Kahl, J. D., 1990: Characteristics of the low-level temperature inversion along the "
            "Alaskan Arctic coast. Int. J. Climatol., 10, 537-548",
        ),
        ("inversions",),
    ),
    Source(
        "wind maximum, low-level jet",
        "lowest wind maximum below 1500 m that meets the criterion, otherwise the strongest wind; "
        "falloff to the minimum above",
        "falloff >= 2 m/s and speed >= 1.25 times the minimum above",
        (
            "Baas, P., F. C. Bosveld, H. Klein Baltink and A. A. M. Holtslag, 2009: A climatology "
            "of nocturnal low-level jets at Cabauw. J. Appl. Meteor. Climatol., 48, 1627-1642",
            "Tuononen, M., V. A. Sinclair and T. Vihma, 2015: A climatology of low-level jets in "
            "the mid-latitudes and polar regions of the Northern Hemisphere. Atmos. Sci. Lett., "
            "16, 492-499 (the height searched)",
        ),
        ("low_level_jet",),
    ),
)


def sources_text() -> str:
    """Write the method, equation and publications of each number, numbered."""
    lines = []
    for number, source in enumerate(SOURCES, 1):
        lines.append(wrapped(f"{number}. {source.number}", "  "))
        lines += [
            wrapped(f"method: {source.method}", "     "),
            wrapped(f"equation: {source.equation}", "     "),
            *(wrapped(f"source: {text}", "     ") for text in source.publications),
        ]
    title = "Sources: method, equation and publications of each number, in their order above"
    return section(title, lines)
