r"""
The geostrophic drag law: friction velocity and cross-isobar angle from G, f and roughness.

Rossby-number similarity of the neutral, barotropic boundary layer (Rossby and Montgomery 1935;
Kazanski and Monin 1961; constants below):

.. math::

    \frac{\kappa G}{u_*} = \sqrt{\left[\ln\frac{u_*}{|f| z_0} - A\right]^2 + B^2}, \qquad
    \sin\alpha_0 = \frac{B u_*}{\kappa G}

Of its two roots the physical one has the larger :math:`G / u_*`: on it friction grows with the
wind, and :math:`\ln(u_* / |f| z_0) > A`. The other is not a boundary layer.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from backveer.profiles.labels import Floats, Labelled, Words, variable

VON_KARMAN = 0.40  # Hogstrom, 1996: Boundary-Layer Meteorol. 78, 215-246 (0.40 +- 0.01)


@dataclass(frozen=True)
class Constants:
    """
    A pair of the constants of the drag law.

    Attributes
    ----------
    a, b
        A and B of the module's equation, for natural logarithms and kappa = 0.4.
    source
        Where they come from.
    """

    a: float
    b: float
    source: str


#: Neutral pairs in use (checks, section 4: seen in public transcriptions unless marked).
TROEN_PETERSEN = Constants(1.8, 4.5, "Troen and Petersen, 1989: European Wind Atlas (from memory)")
TENNEKES = Constants(1.7, 4.7, "Tennekes, 1973 (from memory)")
SHERLOCK = Constants(0.8, 3.5, "Sherlock, 1996, and Silva, 2005 (seen cited)")
DEFAULT = TROEN_PETERSEN

BELOW = "the roughness is too large for this wind: the drag law has no physical root"
NOT_GIVEN = "the geostrophic wind, the Coriolis parameter or the roughness is not known"


@dataclass(frozen=True, eq=False)
class DragLaw(Labelled):
    """Friction velocity and cross-isobar angle of the neutral, barotropic layer over each site."""

    friction_velocity: Floats = variable("m s-1", "profile", "friction velocity u*")
    cross_isobar_angle: Floats = variable(
        "degree",
        "profile",
        "surface stress toward low pressure from the geostrophic wind, positive",
    )
    drag_coefficient: Floats = variable("1", "profile", "u* / G")
    surface_rossby_number: Floats = variable("1", "profile", "G / (|f| z0)")
    why: Words = variable("", "profile", "why there is no answer")
    a: float = DEFAULT.a
    b: float = DEFAULT.b
    source: str = DEFAULT.source


def drag_law(
    speed: Floats, f: Floats, roughness: Floats, constants: Constants = DEFAULT
) -> DragLaw:
    r"""
    Solve the drag law for arrays.

    Parameters
    ----------
    speed : array, shape (profile,)
        Speed G of the geostrophic wind. [m s-1]
    f : array, shape (profile,)
        Coriolis parameter; only its size counts, so that the law mirrors. [s-1]
    roughness : array, shape (profile,)
        Roughness length z0. [m]
    constants
        A and B.

    Returns
    -------
    DragLaw
        On the physical branch; NaN with a reason where it has no root.

    Notes
    -----
    With :math:`x = \ln(u_* / |f| z_0)` the law is :math:`h(x) = x + \tfrac{1}{2}
    \ln[(x - A)^2 + B^2] - \ln(\kappa Ro) = 0` with the surface Rossby number
    :math:`Ro = G / |f| z_0`. For x > A, h increases, so the root is unique there; Newton's steps
    are kept inside the bracket :math:`A < x < \ln(\kappa Ro)` and halve it where they would leave
    it.

    Examples
    --------
    G = 10 m/s, f = 1e-4 s-1, z0 = 0.03 m: u* = 0.3673 m/s at 24.41 degrees (checks, section 4).

    >>> law = drag_law(np.array([10.0]), np.array([1e-4]), np.array([0.03]))
    >>> law.friction_velocity.round(4), law.cross_isobar_angle.round(2)
    (array([0.3673]), array([24.41]))
    """
    speed, f, roughness = np.broadcast_arrays(
        np.atleast_1d(np.asarray(speed, dtype=float)),
        np.asarray(f, dtype=float),
        np.asarray(roughness, dtype=float),
    )
    a, b = constants.a, constants.b
    known = (speed > 0) & (np.abs(f) > 0) & (roughness > 0)
    known &= np.isfinite(speed) & np.isfinite(f) & np.isfinite(roughness)
    with np.errstate(over="ignore", divide="ignore", invalid="ignore"):
        rossby = np.where(known, speed / (np.abs(f) * roughness), np.nan)
        goal = np.log(VON_KARMAN * rossby)
        # At x = A the law reads ln B + A; a smaller Rossby number has no root above it.
        solvable = known & (goal > a + np.log(b))
    goal = np.where(solvable, goal, a + np.log(b) + 1.0)
    low, high = np.full(goal.shape, float(a)), np.maximum(goal, a + 1.0)
    x = 0.5 * (low + high)
    # A count, and no test of convergence over all: a profile must not see its neighbours.
    for _ in range(30):
        gap = x - a
        squared = gap**2 + b**2
        h = x + 0.5 * np.log(squared) - goal
        low, high = np.where(h < 0, x, low), np.where(h < 0, high, x)
        step = x - h / (1.0 + gap / squared)
        x = np.where((step >= low) & (step <= high), step, 0.5 * (low + high))
    with np.errstate(invalid="ignore"):
        ratio = VON_KARMAN / np.sqrt((x - a) ** 2 + b**2)
        ratio = np.where(solvable, ratio, np.nan)
        angle = np.degrees(np.arcsin(b * ratio / VON_KARMAN))
    return DragLaw(
        friction_velocity=ratio * speed,
        cross_isobar_angle=angle,
        drag_coefficient=ratio,
        surface_rossby_number=rossby,
        why=np.where(solvable, "", np.where(known, BELOW, NOT_GIVEN)).astype(object),
        a=a,
        b=b,
        source=constants.source,
    )
