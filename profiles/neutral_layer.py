r"""
The wind of a neutral, barotropic layer in which viscosity grows from the ground and dies out above.

With the height :math:`\zeta = z|f|/u_*` the stress :math:`u_*^2 T` of the steady balance obeys

.. math:: T'' = \frac{i\,T}{\kappa\,\zeta\,e^{-\zeta/c}}, \quad T(0) = 1, \quad T(\infty) = 0, \quad
          W - W_g = -i\,u_*\,T'

(direction along the surface stress, northern hemisphere), whatever the wind and the roughness are:
Rossby-number similarity, as in :mod:`backveer.profiles.drag_law`. Its viscosity
:math:`K = \kappa u_* z\,e^{-z|f|/(c u_*)}` is the Ekman family's member with a logarithmic wall.
The depth c is the one number that is chosen, so that the constant B of the drag law comes out:
:math:`\kappa\,\mathrm{Im}(W - W_g)/u_* \to B` toward the ground.
"""

from __future__ import annotations

import functools
from typing import Any

import numpy as np

from backveer.profiles.drag_law import VON_KARMAN
from backveer.profiles.labels import Floats

_LOWEST, _HIGHEST, _POINTS = 1e-7, 0.8, 500
_DEPTHS = (0.02, 0.08)  # B from 6.2 to 3.0 (solved here)


def departure(height: Floats, b: float) -> Any:
    """
    Wind minus geostrophic wind over the friction velocity, along the surface stress.

    Parameters
    ----------
    height : array
        z |f| / u*. NaN below 1e-7, where the wall is. [1]
    b
        Constant B of the drag law, 3.0 to 6.2.

    Returns
    -------
    departure : complex array
        Real part along the stress; imaginary part to its left in the northern hemisphere, to its
        right in the southern. [1]

    Raises
    ------
    ValueError
        For a B outside the range.

    Examples
    --------
    >>> complex(departure(np.array([1e-5]), b=4.5)[0].round(1))
    (-25.1+11.2j)
    """
    logarithm, found = _solved(depth_of(b))
    height = np.asarray(height, dtype=float)
    with np.errstate(invalid="ignore", divide="ignore"):
        at = np.where((height >= _LOWEST) & (height < np.inf), np.log(height), np.nan)
    return np.interp(at, logarithm, found.real) + 1j * np.interp(at, logarithm, found.imag)


@functools.cache
def depth_of(b: float) -> float:
    """
    Return the depth c at which the constant B comes out.

    Raises
    ------
    ValueError
        For a B that no depth from 0.02 to 0.08 gives.

    Examples
    --------
    >>> round(depth_of(4.5), 4)
    0.0346
    """
    low, high = _DEPTHS
    if not _constant(high) <= b <= _constant(low):
        raise ValueError(
            f"B = {b:g} is outside {_constant(high):.1f} to {_constant(low):.1f}. "
            f"Take a published pair of the drag law."
        )
    # B falls as the layer deepens; eighteen halvings leave 1e-6 of the depth.
    for _ in range(18):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if _constant(middle) > b else (low, middle)
    return 0.5 * (low + high)


def _constant(depth: float) -> float:
    logarithm, found = _solved(depth)
    place = int(np.searchsorted(logarithm, np.log(1e-5)))
    return float(VON_KARMAN * found[place].imag)


@functools.lru_cache(maxsize=64)
def _solved(depth: float) -> tuple[Floats, Any]:
    """Solve for T over ln(height) by central differences, eliminating from the ground upward."""
    s = np.linspace(np.log(_LOWEST), np.log(_HIGHEST), _POINTS)
    h = s[1] - s[0]
    z = np.exp(s)
    # T_ss - T_s = i z T e^(z/c) / kappa; far above the layer any large number says T = 0.
    pull = 1j * z * np.exp(np.minimum(z / depth, 25.0)) / VON_KARMAN
    below, above = 1.0 / h**2 + 0.5 / h, 1.0 / h**2 - 0.5 / h
    share, rest = np.zeros(s.size, dtype=complex), np.zeros(s.size, dtype=complex)
    rest[0] = 1.0
    for i in range(1, s.size - 1):
        middle = -2.0 / h**2 - pull[i] + below * share[i - 1]
        share[i], rest[i] = -above / middle, -below * rest[i - 1] / middle
    stress = np.zeros(s.size, dtype=complex)
    for i in range(s.size - 2, -1, -1):
        stress[i] = share[i] * stress[i + 1] + rest[i]
    return s, -1j * np.gradient(stress, s) / z
