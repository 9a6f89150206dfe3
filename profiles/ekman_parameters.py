"""
What the coefficients of a fitted Ekman member mean, and how far off each quantity may be.

In the frame of the northern hemisphere; :mod:`backveer.profiles.ekman` turns the southern one back.
"""

from __future__ import annotations

import functools
from collections.abc import Callable
from typing import Any

import numpy as np

from backveer.profiles.ekman_errors import spread
from backveer.profiles.ekman_moments import Profiles
from backveer.profiles.ekman_search import MEMBERS, Member
from backveer.profiles.grid import ordered_sum

ERRORS = (
    "scale_height",
    "eastward",
    "northward",
    "shear_eastward",
    "shear_northward",
    "departure_eastward",
    "departure_northward",
    "cross_isobar_angle",
    "friction_velocity",
    "noise",
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
    coefficients : list of array, shape (profile, 1)
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
    g = coefficients[member.wind][:, 0]
    amplitude = member.sign * coefficients[member.decay][:, 0]
    shear = 0.0 * g if member.shear is None else coefficients[member.shear][:, 0] / unit
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


def standard_errors(
    data: Profiles,
    choice: Any,
    delta: Any,
    projections: Any,
    weights: Any,
    floor: Any,
    known_length: float | None,
) -> dict[str, Any]:
    """
    Work out the standard errors of the chosen member of each profile.

    Parameters
    ----------
    data
        The profiles.
    choice : array of int, shape (profile,)
        Place of the chosen member.
    delta : array, shape (profile, member)
        Scale heights. [m]
    projections
        The members' linear problems there.
    weights : array, shape (profile, length)
        Of the noise lengths.
    floor : array, shape (profile,)
        Least standard error of a wind component. [m s-1]
    known_length
        The noise length, where it is known. [m]

    Returns
    -------
    dict
        Errors of ``eastward``, ``northward`` and of the ``departure`` at the ground [m s-1], of the
        ``shear`` [s-1], of ``cross_isobar_angle`` [degree], of the logarithms of ``scale_height``
        and ``friction_velocity``, and the ``noise`` of a component [m s-1].

    Notes
    -----
    A quantity q changes by dq = Re(sum a_k dc_k) + b dln(delta) with the coefficients c. With
    m = (1 + i)/delta, A = +-c and T = S - m A along the surface stress: dT = dS - m dA + m A
    dln(delta); the angle is Im(ln T - ln G), and ln u* = ln delta + ln|T| / 2 + constant.
    """
    errors = {name: np.full(choice.shape, np.nan) for name in ERRORS}
    for m, member in enumerate(MEMBERS):
        rows = np.flatnonzero(choice == m)
        if not rows.size:
            continue
        part = data.at(rows)
        coefficients = [c[rows] for c in projections[m].coefficients]
        d = delta[rows, m : m + 1]
        lengths = None if known_length is None else np.full((rows.size, 1), float(known_length))
        weight = weights[rows] if known_length is None else np.ones((rows.size, 1))
        about = spread(member, part, d, coefficients, weight, floor[rows], lengths)
        unit = part.unit[:, np.newaxis]
        g, turn = coefficients[member.wind], (1.0 + 1.0j) / d
        amplitude = member.sign * coefficients[member.decay]
        shear = 0.0 * g if member.shear is None else coefficients[member.shear] / unit
        stress = shear - turn * amplitude

        gradient = functools.partial(_gradient, member, len(coefficients), 0.0 * g)

        log_stress = gradient(decay=-turn * member.sign / stress, shear=1.0 / (unit * stress))
        by_delta = turn * amplitude / stress
        log_wind = gradient(wind=1.0 / g)
        angle = [-1j * (x - y) for x, y in zip(log_stress, log_wind, strict=True)]
        wanted = {
            "scale_height": (gradient(), 1.0),
            "eastward": (gradient(wind=1.0), 0.0),
            "northward": (gradient(wind=-1j), 0.0),
            "shear_eastward": (gradient(shear=1.0 / unit), 0.0),
            "shear_northward": (gradient(shear=-1j / unit), 0.0),
            "departure_eastward": (gradient(decay=member.sign + 0.0 * g), 0.0),
            "departure_northward": (gradient(decay=-1j * member.sign + 0.0 * g), 0.0),
            "cross_isobar_angle": (angle, (-1j * by_delta).real),
            "friction_velocity": ([0.5 * x for x in log_stress], 1.0 + 0.5 * by_delta.real),
        }
        for name, (a, b) in wanted.items():
            errors[name][rows] = np.sqrt(about.variance(a, b + 0.0 * d))
        errors["noise"][rows] = np.sqrt(ordered_sum(about.weights * about.noise))
    errors["cross_isobar_angle"] = np.degrees(errors["cross_isobar_angle"])
    return errors


def _gradient(member: Member, count: int, zero: Any, **parts: Any) -> list[Any]:
    """Place derivatives by ``wind``, ``decay`` and ``shear`` at the member's coefficients."""
    a = [zero for _ in range(count)]
    for name, value in parts.items():
        place = getattr(member, name)
        if place is not None:
            a[place] = a[place] + value
    return a


def widen(errors: dict[str, Any], answers: Any, choice: Any, aicc: Any) -> None:
    """
    Add to the errors what comes of not knowing the member.

    The variance of an estimate, whichever member is true, is that of the chosen one plus the mean
    square of the others' distance from it, by Akaike weights (Burnham, K. P., and D. R. Anderson,
    2002: Model Selection and Multimodel Inference, 2nd ed., Springer, ch. 4; from memory).
    """
    least = aicc.min(axis=-1, keepdims=True)
    weights = np.where(np.isfinite(aicc), np.exp(-0.5 * (aicc - least)), 0.0)
    weights = weights / ordered_sum(weights)[:, np.newaxis]
    told: dict[str, Callable[[Any], Any]] = {
        "scale_height": lambda a: np.log(a["scale_height"]),
        "eastward": lambda a: a["geostrophic"].real,
        "northward": lambda a: a["geostrophic"].imag,
        "departure_eastward": lambda a: a["amplitude"].real,
        "departure_northward": lambda a: a["amplitude"].imag,
        "cross_isobar_angle": lambda a: a["cross_isobar_angle"],
        "friction_velocity": lambda a: np.log(a["friction_velocity"]),
    }
    for name, value in told.items():
        values = np.stack([value(answer) for answer in answers], axis=-1)
        apart = values - np.take_along_axis(values, choice[:, np.newaxis], axis=-1)
        if name == "cross_isobar_angle":
            apart = (apart + 180.0) % 360.0 - 180.0
        square = ordered_sum(np.where(weights > 1e-12, weights * apart**2, 0.0))
        errors[name] = np.sqrt(errors[name] ** 2 + square)
