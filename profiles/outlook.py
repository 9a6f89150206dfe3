r"""
The coming night from a profile at sunset: the inertial oscillation after friction lets go.

When turbulence dies at sunset the wind above the new, shallow frictional layer swings about its
nocturnal equilibrium (Blackadar, A. K., 1957: Bull. Amer. Meteor. Soc. 38, 283-290; about the
equilibrium wind instead of the geostrophic one after Van de Wiel, B. J. H., et al., 2010: J. Atmos.
Sci. 67, doi:10.1175/2010JAS3289.1, abstract seen):

.. math:: W(z, t) = W_e(z) + [W_0(z) - W_e(z)]\, e^{-i f t}

with the wind :math:`W_0` at the release and the equilibrium wind :math:`W_e`, which is the Ekman
spiral without slip of the night's own shallow layer,

.. math:: W_e(z) = W_g(z) - G\, e^{-(1 + i s) z / \delta_n}, \qquad \delta_n = h_n / \pi .

The swing turns clockwise in the northern hemisphere and the other way in the southern. Its
amplitude is :math:`|W_0 - W_e|`; the wind is strongest, :math:`|W_e| + |W_0 - W_e|`, when the
swinging part lies along :math:`W_e`. The oscillation is undamped and the pressure field is held: an
upper bound for a real night.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.earth import Coriolis
from backveer.profiles.ekman import EkmanFit
from backveer.profiles.geostrophic import Geostrophic
from backveer.profiles.labels import Bools, Floats, Labelled, Times, Words, variable
from backveer.profiles.stack import Stack
from backveer.profiles.sun import Night, next_night

#: Depth of the night's frictional layer: that of weak-wind to moderate clear nights over land, 100
#: to 300 m; common practice, no source. It is an option.
NIGHT_DEPTH = 150.0  # m
NIGHT_DEPTH_DOUBT = 0.5  # relative standard error of that depth; common practice, no source
HOURS = 24  # times that are told between the release and the end
TOP = 2000.0  # m: above the daytime boundary layer friction has nothing to let go

NO_TIME = "the time of the profile is not known, so the night cannot be found"
NO_PLACE = "latitude or longitude is not known, so the night cannot be found"
NO_BALANCE = "the geostrophic wind is not determined"
POLAR_DAY = "the sun does not set on that day"
POLAR_NIGHT = "the sun does not rise on that day, so there is no sunset"
OVER = "the night is over before the profile was taken, or the end lies before the release"
NO_WIND = "there is no usable wind in the lowest 2000 m"


@dataclass(frozen=True, eq=False)
class Outlook(Labelled):
    """
    The night's oscillation; ``error`` is one standard deviation of a wind component.

    Heights are those of the profile's levels up to 2000 m; NaN elsewhere.
    """

    coriolis_parameter: Floats = variable("s-1", "profile", "f, negative in the south")
    inertial_period: Floats = variable("s", "profile", "2 pi / |f|")
    release: Times = variable("", "profile", "when friction lets go, UTC")
    end: Times = variable("", "profile", "until when the night is told, UTC")
    night_length: Floats = variable("s", "profile", "from sunset to sunrise")
    amplitude: Floats = variable("m s-1", "profile level", "size of the swinging part")
    amplitude_error: Floats = variable("m s-1", "profile level", "its standard error")
    equilibrium_eastward: Floats = variable(
        "m s-1", "profile level", "equilibrium wind toward east"
    )
    equilibrium_northward: Floats = variable(
        "m s-1", "profile level", "equilibrium wind toward north"
    )
    maximum_speed: Floats = variable(
        "m s-1", "profile level", "strongest wind between the release and the end"
    )
    maximum_speed_error: Floats = variable("m s-1", "profile level", "its standard error")
    time_of_maximum: Floats = variable(
        "s", "profile level", "time of the strongest wind, after the release"
    )
    jet_height: Floats = variable("m", "profile", "height of the strongest wind of the night")
    jet_speed: Floats = variable("m s-1", "profile", "its speed")
    jet_speed_error: Floats = variable("m s-1", "profile", "its standard error")
    jet_time: Floats = variable("s", "profile", "when, after the release")
    hour: Floats = variable("s", "profile hour", "times that are told, after the release")
    eastward_wind: Floats = variable("m s-1", "profile hour level", "wind toward east")
    northward_wind: Floats = variable("m s-1", "profile hour level", "wind toward north")
    wind_error: Floats = variable("m s-1", "profile level", "standard error of a component")
    remark: Words = variable("", "profile", "what limits the answer")
    why: Words = variable("", "profile", "why there is no answer")
    night_depth: float = NIGHT_DEPTH


def outlook(
    stack: Stack,
    coriolis: Coriolis,
    balance: Geostrophic,
    fit: EkmanFit,
    error: Floats,
    until: Times | None = None,
    release: Times | None = None,
    night_depth: float = NIGHT_DEPTH,
    hours: int = HOURS,
) -> Outlook:
    """
    Tell the night after each profile.

    Parameters
    ----------
    stack
        Quality-checked profiles, taken at or shortly before sunset.
    coriolis
        Their Coriolis parameter; declined where it does not apply.
    balance
        The geostrophic wind, with its errors; the chosen evidence is used.
    fit
        Their Ekman fit, for the shear of the geostrophic wind where the fit is what was chosen.
    error : array, shape (profile,)
        Standard error of a wind component. [m s-1]
    until : array of datetime64, optional
        End of what is told, UTC; sunrise when left out.
    release : array of datetime64, optional
        When friction lets go, UTC; sunset, or the time of the profile if that is later.
    night_depth
        Depth of the night's frictional layer. [m]
    hours
        How many times are told, evenly from the release to the end.

    Returns
    -------
    Outlook
        NaN with a reason where it declines.

    Notes
    -----
    The error of a component is that of the measured wind, which the swing only turns, joined to
    that of the equilibrium wind, which enters the swing twice: at phase a = f t,
    W = W_0 exp(-ia) + W_e (1 - exp(-ia)), so var = var_0 + |1 - exp(-ia)|^2 var_e, told at its
    largest, |1 - exp(-ia)| = 2. The doubt about the night's depth counts in var_e.

    Raises
    ------
    ValueError
        If ``night_depth`` or ``hours`` is not positive.
    """
    if not night_depth > 0 or hours < 2:
        raise ValueError("the night's depth must be positive, and two times or more be told")
    count, levels = stack.profile_count, stack.level_count
    f = coriolis.coriolis_parameter
    spin = np.where(f < 0, -1.0, 1.0)
    night = next_night(stack.time, stack.latitude, stack.longitude)
    start = np.fmax(night.sunset, np.where(np.isnat(stack.time), night.sunset, stack.time))
    if release is not None:
        start = np.broadcast_to(np.asarray(release, "datetime64[ns]"), (count,))
    end: Any = night.sunrise if until is None else np.asarray(until, "datetime64[ns]")
    end = np.broadcast_to(end, (count,))
    span: Any = (end - start) / np.timedelta64(1, "s")

    g, shear, g_error, known = _geostrophic(balance, fit)
    usable = stack.usable("wind") & (stack.height <= TOP)
    why = _why(stack, coriolis, night, known, usable, span)
    told = why == ""
    z = np.where(usable & told[:, np.newaxis], stack.height, np.nan)
    wind = np.where(np.isfinite(z), stack.eastward_wind + 1j * stack.northward_wind, np.nan)

    delta = night_depth / np.pi
    with np.errstate(invalid="ignore", over="ignore", under="ignore"):
        decay = np.exp(-(1 + 1j * spin[:, np.newaxis]) * z / delta)
        equilibrium = g[:, np.newaxis] + shear[:, np.newaxis] * z - g[:, np.newaxis] * decay
        swing = wind - equilibrium
        # d(We)/d(ln h_n) = -G (1 + i s)(z/delta) exp(...)
        by_depth = np.abs(g)[:, np.newaxis] * np.sqrt(2.0) * z / delta * np.abs(decay)
        e_error = np.hypot(g_error[:, np.newaxis], NIGHT_DEPTH_DOUBT * by_depth / np.sqrt(2.0))
        amplitude = np.abs(swing)
        spread = np.hypot(error[:, np.newaxis], e_error)
        component = np.sqrt(error[:, np.newaxis] ** 2 + 4.0 * e_error**2)
        # The swinging part turns by -f t; it lies along We after this angle, taken in 0 to 2 pi.
        ahead = np.angle(swing * np.conj(equilibrium)) * spin[:, np.newaxis]
        phase = np.where(ahead < 0, ahead + 2.0 * np.pi, ahead)
        at = phase / np.abs(f)[:, np.newaxis]
        reached = at <= span[:, np.newaxis]
        last = equilibrium + swing * np.exp(-1j * (f * span)[:, np.newaxis])
        first_faster = np.abs(wind) >= np.abs(last)
        best = np.where(
            reached,
            np.abs(equilibrium) + amplitude,
            np.where(first_faster, np.abs(wind), np.abs(last)),
        )
        when = np.where(reached, at, np.where(first_faster, 0.0, span[:, np.newaxis]))
        when = np.where(np.isfinite(best), when, np.nan)

    share = np.linspace(0.0, 1.0, hours)
    hour = np.where(told[:, np.newaxis], span[:, np.newaxis] * share, np.nan)
    with np.errstate(invalid="ignore"):
        turned = np.exp(-1j * f[:, np.newaxis] * hour)
    winds = equilibrium[:, np.newaxis, :] + swing[:, np.newaxis, :] * turned[:, :, np.newaxis]

    fastest = np.argmax(np.where(np.isfinite(best), best, -1.0), axis=-1)[:, np.newaxis]
    has_level = told & (levels > 0)

    def at_jet(array: Floats) -> Floats:
        if levels == 0:
            return np.full(count, np.nan)
        return np.where(has_level, np.take_along_axis(array, fastest, -1)[:, 0], np.nan)

    period = coriolis.inertial_period
    with np.errstate(invalid="ignore"):
        short = span < 0.5 * period
    remark = np.where(
        told & short,
        "the night is shorter than half an inertial period: the swing does not complete",
        "",
    ).astype(object)
    missing = np.datetime64("NaT", "ns")
    return Outlook(
        coriolis_parameter=f,
        inertial_period=period,
        release=np.where(told, start, missing),
        end=np.where(told, end, missing),
        night_length=night.length,
        amplitude=amplitude,
        amplitude_error=np.where(np.isfinite(amplitude), spread, np.nan),
        equilibrium_eastward=equilibrium.real,
        equilibrium_northward=equilibrium.imag,
        maximum_speed=best,
        maximum_speed_error=np.where(np.isfinite(best), component, np.nan),
        time_of_maximum=when,
        jet_height=at_jet(z),
        jet_speed=at_jet(best),
        jet_speed_error=at_jet(component),
        jet_time=at_jet(when),
        hour=hour,
        eastward_wind=winds.real,
        northward_wind=winds.imag,
        wind_error=np.where(np.isfinite(best), component, np.nan),
        remark=remark,
        why=why,
        night_depth=float(night_depth),
    )


def at_time(told: Outlook, time: Times) -> tuple[Floats, Floats]:
    """
    Wind that an outlook tells for a time, for comparison with a later sounding.

    Parameters
    ----------
    told
        The outlook.
    time : array of datetime64, shape (profile,)
        UTC.

    Returns
    -------
    u, v : array, shape (profile, level)
        NaN outside the night. [m s-1]
    """
    after = (np.asarray(time, "datetime64[ns]") - told.release) / np.timedelta64(1, "s")
    with np.errstate(invalid="ignore"):
        inside = (after >= 0) & (np.asarray(time, "datetime64[ns]") <= told.end)
        equilibrium = told.equilibrium_eastward + 1j * told.equilibrium_northward
        swing = told.eastward_wind[:, 0] + 1j * told.northward_wind[:, 0] - equilibrium
        turned = np.exp(-1j * told.coriolis_parameter * after)[:, np.newaxis]
        wind = np.where(inside[:, np.newaxis], equilibrium + swing * turned, np.nan)
    return wind.real, wind.imag


def _geostrophic(balance: Geostrophic, fit: EkmanFit) -> tuple[Any, Any, Floats, Bools]:
    """Chosen geostrophic wind at the ground, its shear, the error of a component, and whether."""
    chosen = balance.evidence_from == balance.chosen[:, np.newaxis]
    chosen &= np.isfinite(balance.evidence_eastward) & np.isfinite(balance.evidence_northward)
    known = chosen.any(axis=-1)
    place = np.argmax(chosen, axis=-1)[:, np.newaxis]

    def take(array: Floats) -> Floats:
        return np.where(known, np.take_along_axis(array, place, -1)[:, 0], np.nan)

    error = take(balance.evidence_error)
    shear = fit.geostrophic_eastward_shear + 1j * fit.geostrophic_northward_shear
    return (
        take(balance.evidence_eastward) + 1j * take(balance.evidence_northward),
        # Only the fit tells a shear along with its wind; another is taken as constant.
        np.where((balance.chosen == "fit") & np.isfinite(shear), shear, 0.0),
        np.where(np.isfinite(error), error, 0.0),
        known,
    )


def _why(
    stack: Stack, coriolis: Coriolis, night: Night, known: Bools, usable: Bools, span: Floats
) -> Words:
    placed = np.isfinite(stack.latitude) & np.isfinite(stack.longitude)
    return np.select(
        [
            coriolis.why != "",
            np.isnat(stack.time) & ~np.isfinite(span),
            ~placed & ~np.isfinite(span),
            night.polar_day & ~np.isfinite(span),
            night.polar_night & ~np.isfinite(span),
            ~np.isfinite(span),
            ~(span > 0),
            ~usable.any(axis=-1),
            ~known,
        ],
        [
            coriolis.why, NO_TIME, NO_PLACE, POLAR_DAY, POLAR_NIGHT, NO_TIME, OVER, NO_WIND,
            NO_BALANCE,
        ],
        "",
    ).astype(object)  # fmt: skip
