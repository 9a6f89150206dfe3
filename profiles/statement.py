"""Runs the analysers over a stack: from profiles to a statement that can be defended."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any, Self

from backveer.profiles import (
    boundary_layer,
    earth,
    ekman,
    geostrophic,
    steadiness,
    thermal_wind,
    turning,
    viscosity_profile,
    wind_error,
)
from backveer.profiles.labels import Floats, Labelled
from backveer.profiles.stack import Stack


@dataclass(frozen=True)
class Settings:
    """
    What the user may choose; the defaults are the ones that the documentation defends.

    Attributes
    ----------
    equator_limit
        Analyses that divide by f decline closer to the equator than this. [degree]
    geostrophic_wind
        The geostrophic wind, when it is known: eastward and northward. [m s-1]
    wind_error
        Standard error of a wind component, when it is known better than the profile tells. [m s-1]
    layer_edges
        Heights above ground between which turning is told. [m]
    pressures
        Bounds of the thermal-wind layers, descending; None for the standard ones. [Pa]
    critical_richardson
        Bulk Richardson number at the top of the boundary layer.
    varying_viscosity
        Fit layers whose viscosity varies with height beside the spirals; costs ten times as much.
    roughness_length
        Roughness length for that, where it is known. [m]
    """

    equator_limit: float = 5.0
    geostrophic_wind: tuple[float, float] | None = None
    wind_error: float | None = None
    layer_edges: tuple[float, ...] = turning.DEFAULT_EDGES
    pressures: tuple[float, ...] | None = None
    critical_richardson: float = 0.25
    varying_viscosity: bool = False
    roughness_length: float | None = None


@dataclass(frozen=True, eq=False)
class Statement:
    """
    Every answer of the main job, each an array over the same profiles.

    ``wind_error`` is the standard error of a wind component that the answers rest on. [m s-1]
    """

    stack: Stack
    wind_error: Floats
    coriolis: earth.Coriolis
    turning: turning.Turning
    ekman: ekman.EkmanFit
    geostrophic: geostrophic.Geostrophic
    thermal_wind: thermal_wind.ThermalWind
    boundary_layer: boundary_layer.BoundaryLayer
    settings: Settings
    viscosity_profile: viscosity_profile.ViscosityProfile | None = None

    @property
    def answers(self) -> dict[str, Labelled]:
        """The answers by name, without the stack."""
        return {
            field.name: getattr(self, field.name)
            for field in fields(self)
            if field.name != "stack" and isinstance(getattr(self, field.name), Labelled)
        }

    def select(self, profiles: Any) -> Self:
        """Return the statement of some of the profiles (an index array, a mask or a slice)."""
        chosen = {name: answer.select(profiles) for name, answer in self.answers.items()}
        if isinstance(profiles, int):
            profiles = slice(profiles, profiles + 1 or None)
        return type(self)(
            stack=self.stack.select(profiles),
            wind_error=self.wind_error[profiles],
            settings=self.settings,
            **chosen,  # type: ignore[arg-type]
        )


def statement(stack: Stack, settings: Settings | None = None) -> Statement:
    """
    State how the wind of each profile turns and strengthens, and what turns it.

    Parameters
    ----------
    stack
        Quality-checked profiles (:func:`backveer.profiles.quality.check`).
    settings
        What to change from the defaults.

    Returns
    -------
    Statement
        Arrays over profile, with a reason wherever a number is withheld.
    """
    settings = settings or Settings()
    error = wind_error.wind_error(stack)
    if settings.wind_error is not None:
        error = error * 0.0 + settings.wind_error
    coriolis = earth.coriolis(stack, equator_limit=settings.equator_limit)
    turned = turning.turning(stack, edges=settings.layer_edges, error=error)
    layer = boundary_layer.boundary_layer(stack, critical_richardson=settings.critical_richardson)
    fit = steadiness.doubt_unsteady(ekman.fit(stack, coriolis, error=error), layer)
    varying = None
    if settings.varying_viscosity:
        varying = viscosity_profile.fit(
            stack, coriolis, fit, error=error, roughness_length=settings.roughness_length
        )
    return Statement(
        stack=stack,
        wind_error=error,
        coriolis=coriolis,
        turning=turned,
        ekman=fit,
        geostrophic=geostrophic.geostrophic(
            stack, coriolis, fit, layer, given=settings.geostrophic_wind, error=error
        ),
        thermal_wind=steadiness.withhold_unsteady(
            thermal_wind.thermal_wind(
                stack,
                coriolis,
                fit,
                error=error,
                pressures=settings.pressures,
                depth=layer.bulk_richardson_depth,
            ),
            layer,
        ),
        boundary_layer=layer,
        settings=settings,
        viscosity_profile=varying,
    )
