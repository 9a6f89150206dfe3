"""
What the coefficients of a fitted Ekman member mean, and how far off each quantity may be.

In the frame of the northern hemisphere; :mod:`backveer.profiles.ekman` turns the southern one back.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles.ekman_errors import Spread
from backveer.profiles.ekman_moments import Profiles
from backveer.profiles.ekman_search import Member
from backveer.profiles.grid import ordered_sum

#: The quantities that get an error and an interval. Those in logarithms are never negative.
QUANTITIES = (
    "log_scale_height",
    "log_friction_velocity",
    "cross_isobar_angle",
    "eastward",
    "northward",
    "shear_eastward",
    "shear_northward",
    "departure_eastward",
    "departure_northward",
)


def describe(member: Member, delta: Any, coefficients: list[Any], unit: Any, f: Any) -> Any:
    """
    Put a member's coefficients into physical terms, in the frame of the northern hemisphere.

    Parameters
    ----------
    member
        Which member.
    delta : array, shape (profile,)
        Scale height. [m]
    coefficients : list of array, shape (profile,)
        Of the member's columns.
    unit : array, shape (profile,)
        Height unit of the basis. [m]
    f : array, shape (profile,)
        Size of the Coriolis parameter. [s-1]

    Returns
    -------
    dict
        ``geostrophic`` G, ``shear`` S, ``amplitude`` A and, along the stress, ``stress`` dW/dz at
        the ground (complex), ``scale_height``, ``eddy_viscosity`` K = |f| delta^2 / 2,
        ``cross_isobar_angle`` arg(dW/dz) - arg G at the ground [degree] and
        ``friction_velocity`` sqrt(K |dW/dz|).
    """
    g = coefficients[member.wind]
    amplitude = member.sign * coefficients[member.decay]
    shear = 0.0 * g if member.shear is None else coefficients[member.shear] / unit
    stress = shear - (1.0 + 1.0j) / delta * amplitude
    viscosity = 0.5 * f * delta**2
    return {
        "geostrophic": g,
        "shear": shear,
        "amplitude": amplitude,
        "stress": stress,
        "scale_height": delta,
        "eddy_viscosity": viscosity,
        "cross_isobar_angle": np.degrees(np.angle(stress * g.conj())),
        "friction_velocity": np.sqrt(viscosity * np.abs(stress)),
    }


def quantities(answer: Any) -> Any:
    """Return the ``QUANTITIES`` of a described member, shape (quantity, profile)."""
    g, shear, amplitude = answer["geostrophic"], answer["shear"], answer["amplitude"]
    return np.stack(
        [
            np.log(answer["scale_height"]),
            np.log(answer["friction_velocity"]),
            answer["cross_isobar_angle"],
            g.real,
            g.imag,
            shear.real,
            shear.imag,
            amplitude.real,
            amplitude.imag,
        ]
    )


def standard_errors(member: Member, data: Profiles, answer: Any, about: Spread) -> tuple[Any, Any]:
    """
    Work out the standard errors of a member.

    Parameters
    ----------
    member, data
        Which member, and the profiles.
    answer
        From :func:`describe`.
    about
        From :func:`backveer.profiles.ekman_errors.spread`.

    Returns
    -------
    errors : array, shape (quantity, profile)
        Of the ``QUANTITIES``: of logarithms, in degrees, m s-1 and s-1.
    noise : array, shape (profile,)
        Standard deviation of the noise of a component. [m s-1]

    Notes
    -----
    A quantity q changes by dq = Re(sum a_k dc_k) + b dln(delta) with the coefficients c. With
    m = (1 + i)/delta, A = +-c and T = S - m A along the surface stress: dT = dS - m dA + m A
    dln(delta); the angle is Im(ln T - ln G), and ln u* = ln delta + ln|T| / 2 + constant.
    """
    g, stress, unit = answer["geostrophic"], answer["stress"], data.unit
    turn = (1.0 + 1.0j) / answer["scale_height"]
    nothing = np.zeros(g.shape)

    def gradient(wind: Any = None, decay: Any = None, shear: Any = None) -> dict[int, Any]:
        """Place derivatives by G, c and S at the member's coefficients."""
        a: dict[int, Any] = {}
        for place, value in ((member.wind, wind), (member.decay, decay), (member.shear, shear)):
            if place is not None and value is not None:
                a[place] = a.get(place, 0.0) + value + 0.0 * g
        return a

    by_decay, by_shear = -turn * member.sign / stress, 1.0 / (unit * stress)
    by_delta = turn * answer["amplitude"] / stress
    wanted = (
        (gradient(), nothing + 1.0),
        (gradient(decay=0.5 * by_decay, shear=0.5 * by_shear), 1.0 + 0.5 * by_delta.real),
        (gradient(1j / g, -1j * by_decay, -1j * by_shear), by_delta.imag),
        (gradient(wind=1.0), nothing),
        (gradient(wind=-1j), nothing),
        (gradient(shear=1.0 / unit), nothing),
        (gradient(shear=-1j / unit), nothing),
        (gradient(decay=member.sign), nothing),
        (gradient(decay=-1j * member.sign), nothing),
    )
    errors = np.sqrt(np.stack([about.variance(a, b) for a, b in wanted]))
    errors[QUANTITIES.index("cross_isobar_angle")] *= 180.0 / np.pi
    return errors, np.sqrt(ordered_sum(about.weights * about.noise))
