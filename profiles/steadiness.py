"""
Where a steady balance of friction cannot be meant, though a spiral can be fitted.

A low-level jet over a surface-based inversion is the night's inertial oscillation (Blackadar,
A. K., 1957: Bull. Amer. Meteor. Soc. 38, 283-290): its wind turns with time about a balance. A
spiral fitted to one moment of it takes that swing for friction, and a thermal wind taken from it
takes the swing for a temperature gradient.
"""

from __future__ import annotations

import dataclasses

import numpy as np

from backveer.profiles.boundary_layer import BoundaryLayer
from backveer.profiles.ekman import EkmanFit
from backveer.profiles.labels import Bools
from backveer.profiles.thermal_wind import ThermalWind

SWINGING = (
    "a jet over a surface-based inversion swings about the balance, it is not steady (see outlook)"
)
TURNS_TOO = "the night's oscillation turns the wind of this layer too (see outlook)"
#: Up to here the layer of the day before may swing: the depth of daytime boundary layers over land
#: is 1 to 2 km; common practice, no source.
DEPTH = 1500.0  # m
LOW = 1000.0  # m: the nose of a nocturnal jet lies lower; common practice, no source


def swings(layer: BoundaryLayer) -> Bools:
    """
    Say where a low-level jet stands over a surface-based inversion, shape (profile,).

    Parameters
    ----------
    layer
        Jets and inversions of the profiles.
    """
    inversion = (layer.inversion_kind == "surface-based").any(axis=-1)
    with np.errstate(invalid="ignore"):
        swinging: Bools = layer.jet_meets_criterion & (layer.jet_height <= LOW) & inversion
    return swinging


def doubt_unsteady(fit: EkmanFit, layer: BoundaryLayer) -> EkmanFit:
    """
    Call a spiral at most weakly determined where the layer swings.

    Parameters
    ----------
    fit
        The fit of the profiles.
    layer
        Their jets and inversions.

    Returns
    -------
    EkmanFit
        With verdict and reason changed where a well determined spiral belongs to a swinging layer.
    """
    doubted = (fit.verdict == "well determined") & swings(layer)
    return dataclasses.replace(
        fit,
        verdict=np.where(doubted, "weakly determined", fit.verdict).astype(object),
        why=np.where(doubted, SWINGING, fit.why).astype(object),
    )


def withhold_unsteady(wind: ThermalWind, layer: BoundaryLayer) -> ThermalWind:
    """
    Withhold the advection of layers that the night's oscillation turns.

    Parameters
    ----------
    wind
        The thermal wind of the profiles.
    layer
        Their jets and inversions.

    Returns
    -------
    ThermalWind
        Layers whose base lies below 1500 m have no advection where the layer swings; what the
        measured wind would say stays as ``layer_uncorrected_advection``.
    """
    with np.errstate(invalid="ignore"):
        turned = swings(layer)[:, np.newaxis] & (wind.layer_base_height < DEPTH)
    turned &= np.isfinite(wind.layer_advection)
    gone = (
        "layer_advection",
        "layer_error",
        "layer_temperature_gradient_eastward",
        "layer_temperature_gradient_northward",
        "layer_eastward",
        "layer_northward",
    )
    return dataclasses.replace(
        wind,
        layer_sense=np.where(turned, "", wind.layer_sense).astype(object),
        layer_why=np.where(turned, TURNS_TOO, wind.layer_why).astype(object),
        **{name: np.where(turned, np.nan, getattr(wind, name)) for name in gone},
    )
