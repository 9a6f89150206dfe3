r"""
Veer across a rotor that latitude, geostrophic wind and roughness would give: the site's anomaly.

The drag law (:mod:`backveer.profiles.drag_law`) gives the friction velocity and the cross-isobar
angle of a neutral, barotropic layer over even ground, and the Ekman family's member with a
logarithmic wall (:mod:`backveer.profiles.neutral_layer`) how the wind turns between two heights,

.. math:: W = G\,e^{-i\alpha_0} + u_* D(z|f|/u_*)

along the surface stress. What the measured veer has beyond it is stability, slope, baroclinity,
terrain or the instrument: a place to look, and no verdict. All mirrors: in the southern hemisphere
friction makes the wind back with height.

The textbook's spiral of constant viscosity that has the same friction velocity and angle (Taylor,
G. I., 1915: Phil. Trans. R. Soc. A, 215, 1-26; from memory) turned 0.9 to 1.9 times as much across
a rotor as neutral layers solved with a varying viscosity (measured), and is not used.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles import ekman
from backveer.profiles.drag_law import (
    SHERLOCK,
    TENNEKES,
    TROEN_PETERSEN,
    VON_KARMAN,
    Constants,
    drag_law,
)
from backveer.profiles.earth import Coriolis
from backveer.profiles.labels import Floats, Labelled, Words, variable
from backveer.profiles.neutral_layer import departure
from backveer.profiles.rotor import Rotor

#: Exponents of the standards' normal wind profile, which has no veer: IEC 61400-1, section 6.3
#: (as several public codes cite it), and IEC 61400-3-1 (from memory).
NORMAL_EXPONENT_ONSHORE, NORMAL_EXPONENT_OFFSHORE = 0.2, 0.14
#: How well a roughness length is known: a factor e; ours (neighbouring classes of Davenport and
#: Wieringa differ by a factor 2 to 5, from memory).
ROUGHNESS_LOGARITHM_ERROR = 1.0
#: Error of a geostrophic wind that stands on the hub's speed by the neutral logarithmic law; ours.
FROM_HUB_ERROR = 0.2
#: Error of the model itself: how far it was from layers solved with viscosity that varies with
#: height (tests/profiles/test_expected_veer.py), as a share of the veer.
MODEL_ERROR = 0.3
PAIRS = (TROEN_PETERSEN, TENNEKES, SHERLOCK)

GIVEN, FIT, HUB = "given", "fit", "hub speed, by the neutral logarithmic law"
FITTED = "fitted to the profile"
NO_VEER = "the veer across the rotor is not determined"
NO_CORIOLIS = "the latitude is not known or too near to the equator"
NO_ROUGHNESS = "no roughness length is given and none can be fitted to the profile"
NO_WIND = "there is no geostrophic wind and no hub speed to estimate it from"


@dataclass(frozen=True, eq=False)
class ExpectedVeer(Labelled):
    """Measured veer beside that of a neutral layer over even ground, for each turbine."""

    geostrophic_speed: Floats = variable(
        "m s-1", "profile turbine", "speed of the geostrophic wind that the expectation rests on"
    )
    geostrophic_from: Words = variable("", "profile turbine", "where that comes from")
    roughness_length: Floats = variable("m", "profile turbine", "roughness length it rests on")
    roughness_from: Words = variable("", "profile turbine", "where that comes from")
    friction_velocity: Floats = variable(
        "m s-1", "profile turbine", "friction velocity by the drag law"
    )
    cross_isobar_angle: Floats = variable(
        "degree", "profile turbine", "cross-isobar angle by the drag law"
    )
    expected: Floats = variable(
        "degree", "profile turbine", "veer between the same heights by drag law and Ekman family"
    )
    expected_error: Floats = variable("degree", "profile turbine", "its standard error")
    anomaly: Floats = variable("degree", "profile turbine", "measured minus expected veer")
    anomaly_error: Floats = variable("degree", "profile turbine", "its standard error")
    fitted: Floats = variable(
        "degree",
        "profile turbine",
        "veer between the same heights of the fitted Ekman model, where it is well determined",
    )
    expected_shear_exponent: Floats = variable(
        "1", "profile turbine", "power-law exponent between them by the neutral logarithmic law"
    )
    why: Words = variable("", "profile turbine", "why there is no expectation or no anomaly")
    a: float = TROEN_PETERSEN.a
    b: float = TROEN_PETERSEN.b


def expected_veer(
    told: Rotor,
    coriolis: Coriolis,
    fit: ekman.EkmanFit | None = None,
    geostrophic: Any = None,
    roughness: Any = None,
) -> ExpectedVeer:
    r"""
    Set the measured veer beside what a neutral, barotropic layer over even ground would give.

    Parameters
    ----------
    told
        What the turbines meet.
    coriolis
        Of the same profiles.
    fit
        Ekman fit of the same profiles; its geostrophic wind is used where it is well determined.
    geostrophic
        Eastward and northward geostrophic wind, each a number or an array over profile, where it is
        known. [m s-1]
    roughness : float or array, shape (profile,)
        Roughness length; that fitted to each profile inside the rotor where left out. [m]

    Returns
    -------
    ExpectedVeer
        Arrays over (profile, turbine).

    Raises
    ------
    ValueError
        For a roughness length that is not positive.

    Notes
    -----
    Where no geostrophic wind is given or well determined, it is the one that the drag law has with
    the friction velocity :math:`u_* = \kappa M_{hub} / \ln(h/z_0)`, with an error of 20 %. The
    error of the expectation joins those of the geostrophic wind and of the roughness length (a
    factor e), half the range over three published pairs of A and B, and 30 % for the model.
    """
    shape = told.veer.shape
    limits = np.full(shape[0], np.nan) if roughness is None else np.asarray(roughness, dtype=float)
    if roughness is not None and not (limits > 0).all():
        raise ValueError(f"a roughness length is positive, not {roughness}. Give metres.")
    length = np.broadcast_to(limits.reshape(-1, 1), shape)
    known = np.isfinite(length)
    length = np.where(known, length, told.roughness_length)
    length_from = np.where(known, GIVEN, np.where(np.isfinite(length), FITTED, ""))
    f = np.where(coriolis.applies, coriolis.coriolis_parameter, np.nan)[:, np.newaxis]
    speed, speed_error, speed_from = _geostrophic(told, f, length, fit, geostrophic)
    base, top = told.covered_base, told.covered_top
    law = drag_law(speed, np.broadcast_to(f, shape), length)
    veer = _veer(speed, f, length, base, top, TROEN_PETERSEN)
    with np.errstate(all="ignore"):
        by_wind = 0.5 * (
            _veer(speed + speed_error, f, length, base, top, TROEN_PETERSEN)
            - _veer(np.maximum(speed - speed_error, 0.1 * speed), f, length, base, top)
        )
        factor = np.exp(ROUGHNESS_LOGARITHM_ERROR)
        by_length = 0.5 * (
            _veer(speed, f, length * factor, base, top)
            - _veer(speed, f, length / factor, base, top)
        )
        pairs = np.stack([_veer(speed, f, length, base, top, pair) for pair in PAIRS])
        by_pair = 0.5 * (pairs.max(axis=0) - pairs.min(axis=0))
        error = np.sqrt(by_wind**2 + by_length**2 + by_pair**2 + (MODEL_ERROR * veer) ** 2)
        measured_error = np.where(np.isfinite(told.veer_error), told.veer_error, 0.0)
        exponent = np.log(np.log(top / length) / np.log(base / length)) / np.log(top / base)
    why = np.select(
        [
            np.broadcast_to(np.isnan(f), shape),
            np.isnan(length),
            np.isnan(speed),
            np.isnan(veer) & (law.why != ""),
            np.isnan(veer) | np.isnan(told.veer),
        ],
        [NO_CORIOLIS, NO_ROUGHNESS, NO_WIND, law.why, NO_VEER],
        default="",
    ).astype(object)
    return ExpectedVeer(
        geostrophic_speed=speed,
        geostrophic_from=speed_from,
        roughness_length=length,
        roughness_from=length_from.astype(object),
        friction_velocity=law.friction_velocity,
        cross_isobar_angle=law.cross_isobar_angle,
        expected=veer,
        expected_error=np.where(np.isfinite(veer), error, np.nan),
        anomaly=told.veer - veer,
        anomaly_error=np.where(
            np.isfinite(told.veer - veer), np.hypot(error, measured_error), np.nan
        ),
        fitted=_fitted(fit, base, top),
        expected_shear_exponent=np.where(np.isfinite(exponent), exponent, np.nan),
        why=why,
    )


def _geostrophic(
    told: Rotor, f: Floats, length: Floats, fit: Any, geostrophic: Any
) -> tuple[Floats, Floats, Words]:
    """Return the speed of the geostrophic wind, its error, and where it comes from."""
    shape = told.veer.shape
    with np.errstate(all="ignore"):
        u_star = VON_KARMAN * told.hub_speed / np.log(told.hub_height / length)
        u_star = np.where(u_star > 0, u_star, np.nan)
        gap = np.log(u_star / (np.abs(f) * length)) - TROEN_PETERSEN.a
        speed = np.where(gap > 0, u_star / VON_KARMAN * np.hypot(gap, TROEN_PETERSEN.b), np.nan)
    error = FROM_HUB_ERROR * speed
    origin = np.where(np.isfinite(speed), HUB, "")
    if fit is not None:
        east, north = fit.geostrophic_eastward_wind, fit.geostrophic_northward_wind
        sound = (np.asarray(fit.verdict) == "well determined") & np.isfinite(east + north)
        sound = np.broadcast_to(sound[:, np.newaxis], shape)
        spread = np.sqrt(
            0.5 * (fit.geostrophic_eastward_wind_error**2 + fit.geostrophic_northward_wind_error**2)
        )
        speed = np.where(sound, np.hypot(east, north)[:, np.newaxis], speed)
        error = np.where(sound, spread[:, np.newaxis], error)
        origin = np.where(sound, FIT, origin)
    if geostrophic is not None:
        east, north = (np.asarray(x, dtype=float).reshape(-1, 1) for x in geostrophic)
        given = np.broadcast_to(np.hypot(east, north), shape)
        known = np.isfinite(given)
        speed, error = np.where(known, given, speed), np.where(known, 0.0, error)
        origin = np.where(known, GIVEN, origin)
    return speed, np.where(np.isfinite(error), error, 0.0), origin.astype(object)


def _veer(
    speed: Floats,
    f: Floats,
    length: Floats,
    base: Floats,
    top: Floats,
    constants: Constants = TROEN_PETERSEN,
) -> Floats:
    """Turn of direction from base to top by drag law and Ekman family. [degree]"""
    size = np.broadcast_to(np.abs(f), speed.shape)
    law = drag_law(speed.reshape(-1), size.reshape(-1), length.reshape(-1), constants)
    u_star, angle = (
        x.reshape(speed.shape) for x in (law.friction_velocity, law.cross_isobar_angle)
    )
    with np.errstate(all="ignore"):
        above = speed * np.exp(-1j * np.radians(angle))
        ends = [above + u_star * departure(z * size / u_star, constants.b) for z in (base, top)]
        veer = -np.degrees(np.angle(ends[1] * np.conj(ends[0])))
    return np.sign(f) * np.where(np.isfinite(veer) & (base > length), veer, np.nan)


def _fitted(fit: Any, base: Floats, top: Floats) -> Floats:
    """Turn of direction from base to top in the fitted Ekman model. [degree]"""
    if fit is None:
        return np.full(base.shape, np.nan)
    sound = (np.asarray(fit.verdict) == "well determined")[:, np.newaxis]
    with np.errstate(all="ignore"):
        ends = [u + 1j * v for u, v in (ekman.wind(fit, z) for z in (base, top))]
        turned = -np.degrees(np.angle(ends[1] * np.conj(ends[0])))
    return np.where(sound & np.isfinite(turned), turned, np.nan)
