"""Runs the analysers of low-level shear over a stack: from profiles to what is said of them."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from typing import Any, Self

import numpy as np

from backveer.profiles import boundary_layer, earth, ekman, wind_error
from backveer.profiles.flight_path import (
    CLIMB_SLOPE,
    GLIDE_SLOPE,
    GROUND_SPEED,
    FlightPath,
    flight_path,
)
from backveer.profiles.labels import Bools, Floats, Labelled
from backveer.profiles.low_level_shear import (
    FROM_SURFACE,
    STEP,
    TOP,
    LowLevelShear,
    low_level_shear,
)
from backveer.profiles.shear_cause import ShearCause, shear_cause
from backveer.profiles.shear_criteria import Criteria, Rule, judge
from backveer.profiles.stack import Stack


@dataclass(frozen=True)
class ShearSettings:
    """
    What the user may choose.

    Attributes
    ----------
    headings
        True headings along which aircraft land and depart. [degree]
    rules
        The criteria.
    top, step
        Height up to which shear is looked for, depth of the fixed layers. [m]
    ground_speed, glide_slope, climb_slope
        Of the aircraft [m s-1], the approach [degree] and the departure [per cent].
    wind_error
        Standard error of a wind component, when it is known better than the profile tells. [m s-1]
    """

    headings: tuple[float, ...] = ()
    rules: tuple[Rule, ...] = ()
    top: float = TOP
    step: float = STEP
    ground_speed: float = GROUND_SPEED
    glide_slope: float = GLIDE_SLOPE
    climb_slope: float = CLIMB_SLOPE
    wind_error: float | None = None


@dataclass(frozen=True, eq=False)
class ShearStatement:
    """Every answer about low-level shear, each an array over the same profiles."""

    stack: Stack
    wind_error: Floats
    boundary_layer: boundary_layer.BoundaryLayer
    shear: LowLevelShear
    path: FlightPath
    criteria: Criteria
    cause: ShearCause | None
    settings: ShearSettings

    def select(self, profiles: Any) -> Self:
        """Return the answers for some of the profiles (an index array, a mask or a slice)."""
        if isinstance(profiles, (int, np.integer)):
            profiles = slice(int(profiles), int(profiles) + 1 or None)
        answers = {field.name: getattr(self, field.name) for field in fields(self)}
        chosen: dict[str, Any] = {
            name: answer.select(profiles)
            for name, answer in answers.items()
            if isinstance(answer, Labelled)
        }
        return replace(self, wind_error=self.wind_error[profiles], **chosen)

    @property
    def any_met(self) -> Bools:
        """Profiles that meet some criterion."""
        return np.asarray(np.any(self.criteria.met, axis=-1), dtype=np.bool_)

    def with_cause(self) -> Self:
        """Return the same with the cause looked for."""
        stack, error = self.stack, self.wind_error
        fit = ekman.fit(stack, earth.coriolis(stack), error=error)
        cause = shear_cause(stack, self.shear, self.boundary_layer, fit, error)
        return replace(self, cause=cause)


def shear_statement(
    stack: Stack, settings: ShearSettings | None = None, *, cause: bool = True
) -> ShearStatement:
    """
    State what low-level shear each profile shows, which criteria it meets, and what causes it.

    Parameters
    ----------
    stack
        Quality-checked profiles (:func:`backveer.profiles.quality.check`).
    settings
        What to change from the defaults.
    cause
        Look for the cause too: of ten thousand profiles it takes longer than all the rest.

    Returns
    -------
    ShearStatement
        Arrays over profile, with a reason wherever a number is withheld.
    """
    settings = settings or ShearSettings()
    error = wind_error.wind_error(stack)
    if settings.wind_error is not None:
        error = error * 0.0 + settings.wind_error
    headings = np.array(settings.headings, dtype=float)
    top, step = settings.top, settings.step
    reaches = tuple(
        sorted({height for height in FROM_SURFACE if height < top * (1 - 1e-9)} | {top})
    )
    said = ShearStatement(
        stack=stack,
        wind_error=error,
        boundary_layer=boundary_layer.boundary_layer(stack),
        shear=low_level_shear(stack, error, top=top, step=step, reaches=reaches),
        path=flight_path(
            stack,
            headings,
            top=top,
            ground_speed=settings.ground_speed,
            glide_slope=settings.glide_slope,
            climb_slope=settings.climb_slope,
            step=step,
        ),
        criteria=judge(stack, settings.rules, error, headings),
        cause=None,
        settings=settings,
    )
    return said.with_cause() if cause else said
