r"""
The Ekman balance with a viscosity that varies with height, solved once and looked up after.

With :math:`\xi = z/h`, :math:`K = \kappa u_* h\, k(\xi)` and :math:`\mu = |f| h / (\kappa u_*)` the
steady balance :math:`\mathrm{d}(K\,\mathrm{d}W/\mathrm{d}z)/\mathrm{d}z = i f (W - W_g)` under a
geostrophic wind that does not change with height is, in the northern hemisphere,

.. math::

    W = W_g - \frac{u_*}{\kappa} e^{i\alpha} F(\xi; \mu), \qquad
    \frac{\mathrm{d}}{\mathrm{d}\xi}\Bigl(k \frac{\mathrm{d}F}{\mathrm{d}\xi}\Bigr) = i \mu F,
    \qquad -k \frac{\mathrm{d}F}{\mathrm{d}\xi} \to 1 \text{ at the wall}

with the surface stress in the direction :math:`\alpha`. The wall's roughness is no part of this
problem: near the wall :math:`F = -\ln\xi + C(\mu)`, and that the wind vanishes at z0 says that
:math:`G = (u_*/\kappa) e^{i\alpha} F(z_0/h; \mu)`, a drag law. So F depends on two numbers only and
one table for each shape of k serves all profiles and all trials: linear equations with three
diagonals for all :math:`\mu` at once.

Shapes: :math:`k = \xi (1 - \xi)^p`, and the cubic of O'Brien, J. J., 1970: J. Atmos. Sci. 27,
1213-1215 (formula from memory, sure), which is :math:`\xi` in a surface layer and meets nothing at
h with no slope. All of them vanish at h, where the equation is singular and a wind may jump; a
small viscosity is therefore added everywhere, :math:`\nu (1 - e^{-\xi})^2`, an assumption.
"""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import Any

import numpy as np

#: Viscosity left aloft, over kappa u* h. With u* 0.3 m/s and h 600 m it is 0.14 m2 s-1, a tenth of
#: a per cent of what mixes in mid-layer: a choice, large enough that no wind jumps at h. [1]
BACKGROUND = 0.002
SURFACE_LAYER = 0.05  # share of h below which the cubic is the logarithmic layer's; a choice
STEP = 0.005  # of ln(xi): the grid error is below a part in 2000 of u* / kappa (test_ekman_solver)
BOTTOM, TOP = -13.8, 1.2  # ln(xi) of the table's ends: a millionth of h, and 3.3 h
LOG_MU = (np.log(0.05), np.log(40.0))  # no boundary layer is known outside: convection to calm
MU_STEP = 0.1  # of ln(mu): cubic interpolation errs by less than the grid does
#: Exponent p of each shape; the cubic has none.
EXPONENTS = {"linear": 1, "square": 2, "fourth power": 4}
SHAPES = (*EXPONENTS, "cubic")


def viscosity(shape: str, xi: Any, background: float = BACKGROUND) -> Any:
    """
    Viscosity over kappa u* h.

    Parameters
    ----------
    shape
        ``linear``, ``square`` and ``fourth power`` are xi (1 - xi)^p with p 1, 2 and 4; ``cubic``
        is O'Brien's.
    xi : array
        Height over depth. [1]
    background
        Viscosity that is left aloft. [1]

    Raises
    ------
    ValueError
        If there is no such shape.

    Examples
    --------
    >>> viscosity("square", np.array([0.2, 0.5, 1.5]), background=0.0)
    array([0.128, 0.125, 0.   ])
    """
    if shape not in SHAPES:
        raise ValueError(f"no viscosity has the shape {shape!r}. Choose one of {SHAPES}.")
    xi = np.asarray(xi, dtype=float)
    left = np.maximum(1.0 - xi, 0.0)
    if shape == "cubic":
        base = SURFACE_LAYER
        aloft = (left / (1.0 - base)) ** 2 * (base + (xi - base) * (1.0 + 2.0 * base / (1 - base)))
        within = np.where(xi < base, xi, aloft)
    else:
        within = xi * left ** EXPONENTS[shape]
    return within + background * np.expm1(-xi) ** 2


def solve_tridiagonal(lower: Any, main: Any, upper: Any, rhs: Any) -> Any:
    """
    Solve linear equations with three diagonals, any number of them at once.

    Parameters
    ----------
    lower, main, upper, rhs : array, shape (point, ...)
        The diagonals and the right side; the first of ``lower`` and the last of ``upper`` are not
        looked at. The matrix must be dominated by its diagonal, for nothing is exchanged.

    Returns
    -------
    x : array, shape (point, ...)

    Notes
    -----
    Elimination down and substitution up, known as the algorithm of Thomas (1949); a loop over
    points, each step over all the equations.

    Examples
    --------
    >>> solve_tridiagonal(np.ones(3), np.full(3, -2.0), np.ones(3), np.array([0.0, 0.0, -4.0]))
    array([1., 2., 3.])
    """
    shape = np.broadcast_shapes(*(np.shape(a) for a in (lower, main, upper, rhs)))
    kind = np.result_type(lower, main, upper, rhs)
    ratio, x = np.empty(shape, dtype=kind), np.empty(shape, dtype=kind)
    ratio[0], x[0] = upper[0] / main[0], rhs[0] / main[0]
    for i in range(1, shape[0]):
        pivot = main[i] - lower[i] * ratio[i - 1]
        ratio[i] = upper[i] / pivot
        x[i] = (rhs[i] - lower[i] * x[i - 1]) / pivot
    for i in range(shape[0] - 2, -1, -1):
        x[i] -= ratio[i] * x[i + 1]
    return x


def departure(shape: str, mu: Any, step: float = STEP, background: float = BACKGROUND) -> Any:
    r"""
    Solve for the departure from the geostrophic wind.

    Parameters
    ----------
    shape, background
        As for :func:`viscosity`.
    mu : array, shape (...)
        Depth over the scale of friction, |f| h / (kappa u*). [1]
    step
        Of the grid in ln(xi). [1]

    Returns
    -------
    s : array, shape (point,)
        ln(xi).
    value, slope : complex array, shape (point, ...)
        F of the module's equation, and dF/ds.

    Notes
    -----
    Over :math:`s = \ln\xi` the equation reads
    :math:`\mathrm{d}(k/\xi\;\mathrm{d}F/\mathrm{d}s)/\mathrm{d}s = i\mu\xi F`: cells of
    equal size, the stress at their faces. A stress of one enters below; above, where the viscosity
    no longer changes, the solution dies out as Ekman's does, :math:`k F' = -\sqrt{i\mu k} F`.
    """
    mu = np.asarray(mu, dtype=float)
    count = round((TOP - BOTTOM) / step) + 1
    s = BOTTOM + step * np.arange(count)
    lanes = (slice(None), *(np.newaxis,) * mu.ndim)
    xi = np.exp(s)
    # The resistance between two points by Simpson's rule: K falls a hundredfold close to h.
    knots = np.exp(BOTTOM + 0.5 * step * np.arange(2 * count - 1))
    resistance = knots / viscosity(shape, knots, background)
    between = (resistance[:-2:2] + 4.0 * resistance[1:-1:2] + resistance[2::2]) * step / 6.0
    conductance = (1.0 / between)[lanes] + 0j * mu
    size = step * xi
    size[[0, -1]] *= 0.5
    turning = 1j * size[lanes] * mu
    closing = np.sqrt(1j * mu * viscosity(shape, xi[-1], background))
    nothing = 0j * mu[np.newaxis]
    lower = np.concatenate([nothing, conductance])
    upper = np.concatenate([conductance, nothing])
    main = -lower - upper - turning
    main[-1] -= closing
    rhs = np.zeros(main.shape, dtype=complex)
    rhs[0] = -1.0
    value = solve_tridiagonal(lower, main, upper, rhs)
    flux = conductance * (value[1:] - value[:-1])
    flux = np.concatenate([nothing - 1.0, flux, -(closing * value[-1])[np.newaxis]])
    inner = 0.5 * (flux[1:] + flux[:-1])
    inner[0], inner[-1] = flux[0], flux[-1]
    return s, value, inner / (viscosity(shape, xi, background) / xi)[lanes]


@dataclass(frozen=True)
class Table:
    """F of one shape; ``value`` and ``slope`` (dF/ds, per grid step) of shape (mu, point)."""

    value: Any
    slope: Any
    log_mu: Any

    def nearest(self, s: Any, row: int) -> Any:
        """Return F of one row of the table at the grid point below each ln(z/h)."""
        place = (s - BOTTOM) / STEP
        inside = np.clip(place, 0.0, self.value.shape[1] - 1.0).astype(np.intp)
        return self.value[row].take(inside) - STEP * np.minimum(place, 0.0)

    def look_up(self, s: Any, log_mu: Any) -> tuple[Any, Any, Any]:
        """
        Look F up, cubic in both numbers.

        Parameters
        ----------
        s : array
            ln(z/h).
        log_mu : array
            Inside ``LOG_MU``, of a shape that broadcasts to that of ``s``.

        Returns
        -------
        value, by_s, by_log_mu : complex array, shape of ``s``
            F and its derivatives. Below the table F is logarithmic, above it zero.
        """
        points = self.value.shape[1]
        place = (np.asarray(s) - BOTTOM) / STEP
        below = np.minimum(place, 0.0)
        inside = np.clip(place, 0.0, points - 1.0)
        left = np.minimum(inside.astype(np.intp), points - 2)
        t = inside - left
        row, weights, changes = self._across(log_mu)
        value, by_s, by_log_mu = (np.zeros(place.shape, dtype=complex) for _ in range(3))
        square, rest = t * t, 1.0 - t
        first = rest * rest * (1.0 + 2.0 * t), t * rest * rest
        second = square * (3.0 - 2.0 * t), -square * rest
        bend = 6.0 * t * rest
        tangent = rest * (1.0 - 3.0 * t), t * (3.0 * t - 2.0)
        for m in range(4):
            at = (row + m) * points + left
            f0, f1 = self.value.ravel()[at], self.value.ravel()[at + 1]
            d0, d1 = self.slope.ravel()[at], self.slope.ravel()[at + 1]
            f = first[0] * f0 + first[1] * d0 + second[0] * f1 + second[1] * d1
            value += weights[m] * f
            by_log_mu += changes[m] * f
            by_s += weights[m] * (bend * (f1 - f0) + tangent[0] * d0 + tangent[1] * d1)
        high = place > points - 1.0
        value = np.where(high, 0.0, value - STEP * below)
        by_s = np.where(high, 0.0, np.where(below < 0, -1.0, by_s / STEP))
        return value, by_s, np.where(high, 0.0, by_log_mu)

    def _across(self, log_mu: Any) -> tuple[Any, list[Any], list[Any]]:
        """First of four rows, their weights for a cubic through them, and the weights' slopes."""
        place = (np.asarray(log_mu) - LOG_MU[0]) / MU_STEP
        row = np.clip(place.astype(np.intp) - 1, 0, len(self.log_mu) - 4)
        x = place - row
        weights, changes = [], []
        for m in range(4):
            others = [n for n in range(4) if n != m]
            a, b, c = (x - n for n in others)
            size = float(np.prod([m - n for n in others]))
            weights.append(a * b * c / size)
            changes.append((a * b + a * c + b * c) / (size * MU_STEP))
        return row, weights, changes


@functools.cache
def table(shape: str) -> Table:
    """Return the table of a shape; worked out when it is first wanted."""
    rows = round((LOG_MU[1] - LOG_MU[0]) / MU_STEP) + 1
    log_mu = LOG_MU[0] + MU_STEP * np.arange(rows)
    _, value, slope = departure(shape, np.exp(log_mu))
    return Table(np.ascontiguousarray(value.T), np.ascontiguousarray(slope.T) * STEP, log_mu)
