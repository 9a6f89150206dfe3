"""What the panels of one sheet share: a profile's levels in the units shown, and its models."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.io.words.units import NAMED, Units
from backveer.profiles import ekman
from backveer.profiles.labels import Bools, Floats
from backveer.profiles.statement import Statement


@dataclass(frozen=True, eq=False)
class Drawn:
    """
    One profile, ready to be drawn.

    Attributes
    ----------
    one
        The statement of this profile alone.
    units
        What people read.
    usable
        Levels whose wind the answers rest on.
    left_out
        Levels with a wind that a finding of the quality check keeps out.
    z, speed
        Height above ground and wind speed of all levels, in the units shown.
    """

    one: Statement
    units: Units
    usable: Bools
    left_out: Bools
    z: Floats
    speed: Floats

    @classmethod
    def of(cls, said: Statement, index: int, units: str) -> Drawn:
        """Take one profile out of a statement."""
        one = said.select(index)
        shown = NAMED[units]
        usable = one.stack.usable("wind")[0]
        with np.errstate(over="ignore", invalid="ignore"):
            speed = one.stack.wind_speed[0] / shown.speed.size
        z = one.stack.height[0] / shown.height.size
        there = np.isfinite(z) & np.isfinite(speed)
        return cls(one, shown, usable & there, ~usable & there & (z >= 0), z, speed)

    @property
    def top(self) -> float:
        """Highest level with a usable wind, in the unit shown; 0 where there is none."""
        return float(self.z[self.usable].max(initial=0.0))

    @property
    def fitted(self) -> bool:
        """Whether there is a fit to draw."""
        return bool(self.one.ekman.verdict[0] != "not determined")

    def heights(self, top: float) -> Floats:
        """Heights from the ground to ``top`` [m], close together near the ground. [m]"""
        z: Floats = top * np.linspace(0.0, 1.0, 200) ** 2
        return z

    def candidates(self) -> list[tuple[str, Any]]:
        """
        Members of the family that were not chosen: the name, and the wind as a function of height.

        The function takes heights [m] and returns the complex wind east + i north. [m s-1]
        """
        fit = self.one.ekman
        found = []
        for place, name in enumerate(fit.candidate_model[0]):
            if name and name != fit.model[0] and np.isfinite(fit.candidate_aicc[0, place]):
                found.append((str(name), _candidate(fit, place)))
        return found


def _candidate(fit: ekman.EkmanFit, place: int) -> Any:
    """
    Return the wind of a member that was not chosen, from what the fit tells of it.

    Its amplitude follows from the stress: T = u*^2 / K at the cross-isobar angle from G is the
    shear of the wind at the ground, T = S - (1 + i s) A / delta.
    """

    def of(name: str) -> float:
        return float(getattr(fit, f"candidate_{name}")[0, place])

    s = float(fit.rotation[0])
    g = of("geostrophic_eastward_wind") + 1j * of("geostrophic_northward_wind")
    shear = of("geostrophic_eastward_shear") + 1j * of("geostrophic_northward_shear")
    turn = (1.0 + 1j * s) / of("scale_height")
    stress = of("friction_velocity") ** 2 / of("eddy_viscosity") * np.exp(1j * np.angle(g))
    stress *= np.exp(1j * s * np.radians(of("cross_isobar_angle")))
    amplitude = (shear - stress) / turn
    return lambda z: g + shear * z + amplitude * np.exp(-turn * z)
