"""Checks of the air: layers that cool too fast with height, pressures that do not fit heights."""

from __future__ import annotations

from typing import Any

import numpy as np

from backveer.profiles import air
from backveer.profiles.grid import compact
from backveer.profiles.labels import Bools, Floats


def superadiabatic(
    z: Floats, temperature: Floats, usable: Bools, excess: float, surface_layer: float
) -> Bools:
    r"""
    Mark the upper level of each layer that cools with height faster than air can hold.

    Parameters
    ----------
    z, temperature : array, shape (profile, level)
        Height above ground [m] and temperature [K].
    usable : array of bool, shape (profile, level)
        The levels to look at; their heights increase.
    excess
        Cooling beyond the dry adiabat that noise and rounding may make. [K]
    surface_layer
        Layers that begin below this height are left alone: over hot ground they are real. [m]

    Returns
    -------
    found : array of bool, shape (profile, level)

    Notes
    -----
    :math:`T_2 - T_1 + \Gamma (z_2 - z_1) < -` excess, with the dry-adiabatic lapse rate
    :math:`\Gamma`. The upper level is marked, for what does this is mostly a sensor that leaves a
    cloud wet and cools as it dries.
    """
    place: Any = np.broadcast_to(np.arange(z.shape[1]), z.shape)
    _count, zk, tk, place = compact(usable, z, temperature, place)
    with np.errstate(invalid="ignore"):
        beyond = np.diff(tk, axis=1) + air.DRY_ADIABATIC_LAPSE_RATE * np.diff(zk, axis=1)
        row, column = np.nonzero((beyond < -excess) & (zk[:, :-1] >= surface_layer))
    found = np.zeros(z.shape, dtype=bool)
    found[row, place[row, column + 1]] = True
    return found


def not_hydrostatic(
    z: Floats,
    pressure: Floats,
    virtual_temperature: Floats,
    usable: Bools,
    excess: float,
    fraction: float,
    resolution: float,
) -> Bools:
    r"""
    Mark the levels whose pressure and height disagree with the layers around them.

    Parameters
    ----------
    z, pressure, virtual_temperature : array, shape (profile, level)
        Height [m], pressure [Pa] and virtual temperature [K].
    usable : array of bool, shape (profile, level)
        The levels to look at; their heights increase.
    excess, fraction, resolution
        Disagreement allowed always [m], as a fraction of the depth of the layer, and for an error
        of each pressure [Pa].

    Returns
    -------
    found : array of bool, shape (profile, level)

    Notes
    -----
    Each level is held against the two below and the two above, and is at fault where fewer than
    half of these layers agree with the hypsometric equation: so a single wrong level does not
    spoil its neighbours. Neighbours among the rest that still disagree (a break, with no telling
    which side is right) are both at fault. The idea of checking layers against each other to find
    the level at fault is that of Gandin, 1988: Mon. Wea. Rev., 116, 1137-1156 (from memory).
    """
    found = np.zeros(z.shape, dtype=bool)
    place: Any = np.broadcast_to(np.arange(z.shape[1]), z.shape)
    for lags in ((1, 2), (1,)):
        _count, zk, pk, tk, where = compact(
            usable & ~found, z, pressure, virtual_temperature, place
        )
        asked, agreeing = np.zeros(zk.shape, dtype=int), np.zeros(zk.shape, dtype=int)
        for lag in lags:
            if zk.shape[1] <= lag:
                continue
            below, above = slice(None, -lag), slice(lag, None)
            p0, p1 = pk[:, below], pk[:, above]
            mean = 0.5 * (tk[:, below] + tk[:, above])
            with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
                depth = zk[:, above] - zk[:, below]
                thickness = air.thickness(p0, p1, mean)
                # dz = (R T / g) dp / p for an error of either pressure.
                rounding = air.scale_height(mean) * resolution * (1.0 / p0 + 1.0 / p1)
                agrees = np.abs(thickness - depth) <= excess + fraction * depth + rounding
            for ends in (below, above):
                asked[:, ends] += np.isfinite(depth)
                agreeing[:, ends] += agrees
        faulty = 2 * agreeing < asked if len(lags) == 2 else agreeing < asked
        row, column = np.nonzero(faulty)
        found[row, where[row, column]] = True
    return found
