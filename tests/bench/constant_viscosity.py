"""
How far a fit with constant viscosity is off where viscosity varies with height.

    python tests/bench/constant_viscosity.py

Layers solved with K = kappa u* z exp(-z / h), h = 0.04 u* / |f| ("neutral"), and with the cubic K
that ends at 500 m ("lid"; tests/synthetic.py has both), over geostrophic winds and roughness
lengths; winds from 10 m to 3 km, free of noise. Beside the fit: the friction velocity from the
momentum integral against the geostrophic wind that geostrophic.py chose.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

import synthetic

from backveer.profiles.boundary_layer import boundary_layer
from backveer.profiles.earth import coriolis
from backveer.profiles.ekman import fit
from backveer.profiles.geostrophic import Geostrophic, geostrophic
from backveer.profiles.stack import Stack

SPEEDS = (5.0, 10.0, 20.0)
ROUGHNESS = (1e-4, 0.01, 0.1, 0.5)
LATITUDE = 45.0
VISCOSITY = {"neutral": synthetic.neutral(LATITUDE), "lid": synthetic.cubic(500.0)}
Z = np.concatenate([[10.0], np.arange(25.0, 3001.0, 25.0)])


def main() -> None:
    """Print the table."""
    cases = [
        (name, synthetic.solve(speed, LATITUDE, roughness, viscosity))
        for name, viscosity in VISCOSITY.items()
        for speed in SPEEDS
        for roughness in ROUGHNESS
    ]
    truths = [truth for _, truth in cases]
    stack = Stack.concatenate(truth.stack(Z, LATITUDE) for truth in truths)
    error = np.full(len(truths), 0.2)
    f = coriolis(stack)
    fitted = fit(stack, f, error=error)
    against = geostrophic(stack, f, fitted, boundary_layer(stack), error=error)
    print("                      truth          constant-K fit: error of           momentum")
    print("K          G     z0     u* angle      G  dir(G)     u*  angle  verdict   integral u*")
    print("         m/s      m    m/s   deg      %     deg      %    deg                      %")
    for i, (name, truth) in enumerate(cases):
        wind = complex(fitted.geostrophic_eastward_wind[i], fitted.geostrophic_northward_wind[i])
        ratio = wind / truth.geostrophic
        print(
            f"{name:8}{abs(truth.geostrophic):4.0f} {truth.roughness:6g} {truth.u_star:5.3f} "
            f"{truth.cross_isobar_angle:6.1f} {100 * (abs(ratio) - 1):+6.1f} "
            f"{-np.degrees(np.angle(ratio)):+7.1f} "
            f"{100 * (fitted.friction_velocity[i] / truth.u_star - 1):+6.1f} "
            f"{fitted.cross_isobar_angle[i] - truth.cross_isobar_angle:+6.1f}  "
            f"{fitted.verdict[i].split()[0]:<8} "
            f"{ratio_or_reason(against, i, truth.u_star)}"
        )


def ratio_or_reason(against: Geostrophic, i: int, u_star: float) -> str:
    """Tell how far the friction velocity is off, or why there is none."""
    if against.friction_velocity_why[i]:
        return f"withheld: {against.friction_velocity_why[i]}"
    return f"{100 * (against.friction_velocity[i] / u_star - 1):+7.1f}"


if __name__ == "__main__":
    main()
