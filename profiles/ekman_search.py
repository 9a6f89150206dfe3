"""
The members of the Ekman family as linear problems, and the search for the scale height.

For a trial scale height each member is a complex linear least-squares problem in a few columns of
the basis of :mod:`backveer.profiles.ekman_moments`. Eliminating them from the normal equations
leaves the residual, the coefficients, and what is left of the derivative by the logarithm of the
scale height: one Gauss-Newton step of variable projection (Kaufman, L., 1975: BIT 15, 49-57; from
memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.ekman_moments import (
    DECAY,
    HEIGHT,
    ONE,
    TANGENT,
    Moments,
    Profiles,
    Whitening,
    basis_moments,
)


@dataclass(frozen=True)
class Member:
    """
    One member: its columns, as combinations of the basis, in the order of the coefficients.

    ``decay`` is the place of the coefficient of e, and ``sign`` its sign in the wind;
    ``shear`` is the place of the shear, or None; ``parameters`` counts real numbers.
    """

    name: str
    columns: tuple[dict[int, float], ...]
    wind: int
    decay: int
    sign: float
    shear: int | None
    parameters: int


_NO_SLIP = {ONE: 1.0, DECAY: -1.0}
MEMBERS = (
    Member("no slip", (_NO_SLIP,), 0, 0, -1.0, None, 3),
    Member("partial slip", ({ONE: 1.0}, {DECAY: 1.0}), 0, 1, 1.0, None, 5),
    Member("no slip, sheared", (_NO_SLIP, {HEIGHT: 1.0}), 0, 0, -1.0, 1, 5),
    Member("partial slip, sheared", ({ONE: 1.0}, {HEIGHT: 1.0}, {DECAY: 1.0}), 0, 2, 1.0, 1, 7),
)
#: What a wind without friction may be: constant, or linear with height.
WITHOUT_FRICTION = (
    Member("constant", ({ONE: 1.0},), 0, 0, 0.0, None, 2),
    Member("linear", ({ONE: 1.0}, {HEIGHT: 1.0}), 0, 0, 0.0, 1, 4),
)
#: Trial scale heights: two to the octave, from well below any mast to far above any layer. [m]
TRIALS = 15.0 * 2.0 ** (np.arange(20) / 2.0)
PER_OCTAVE = 2
SINGULAR = 1e-8  # a column that is this small beside itself after elimination is not there
STEPS = 8  # at most, after the parabola; hardly a profile takes more than four
ARRIVED = 1e-4  # a last step of ln(scale height) after which nothing is left, for steps square
SURE = 1e-3  # a step as short as this is taken on trust


@dataclass
class Projection:
    """A member's linear problem solved, arrays of shape (profile, length, trial)."""

    residual: Any  # sum of squares of the whitened residual
    coefficients: list[Any]
    inverse: list[list[Any]]  # of the columns' own gram matrix
    slope: list[Any]  # change of the coefficients for one unit of the tangent column
    tangent_size: Any  # of the tangent column, after elimination
    tangent_rhs: Any
    log_pivots: Any  # logarithm of the determinant of the columns' gram matrix
    sound: Any  # no column was lost


def project(moments: Moments, member: Member) -> Projection:
    """Eliminate the columns of a member from its normal equations, and the tangent column last."""
    k = len(member.columns)
    gram, rhs, residual, sound, log_pivots = _eliminate(
        moments, [*member.columns, {TANGENT: 1.0}], k
    )
    return Projection(
        residual=residual,
        coefficients=_back_substitute(gram, rhs[:k]),
        inverse=_inverse(gram, k),
        slope=_back_substitute(gram, [gram[j][k] for j in range(k)]),
        tangent_size=np.maximum(gram[k][k].real, 0.0),
        tangent_rhs=rhs[k],
        log_pivots=log_pivots,
        sound=sound,
    )


def _eliminate(moments: Moments, columns: list[dict[int, float]], k: int) -> tuple[Any, ...]:
    """Eliminate the first k columns; what is left of the others stays in the lower corner."""
    n = len(columns)
    gram, rhs = _combined(moments, columns)
    size = [gram[j][j].real for j in range(k)]
    residual = moments.wind + 0 * gram[0][0].real
    sound = np.ones(residual.shape, dtype=bool)
    log_pivots = np.zeros(residual.shape)
    for j in range(k):
        pivot = gram[j][j].real
        good = pivot > SINGULAR * size[j]
        sound = sound & good
        pivot = np.where(good, pivot, 1.0)
        log_pivots = log_pivots + np.log(pivot)
        residual = residual - np.where(good, (rhs[j].real ** 2 + rhs[j].imag ** 2) / pivot, 0.0)
        for i in range(j + 1, n):
            factor = gram[i][j] / pivot
            for other in range(j + 1, n):
                gram[i][other] = gram[i][other] - factor * gram[j][other]
            rhs[i] = rhs[i] - factor * rhs[j]
        gram[j][j] = pivot + 0j
    return gram, rhs, np.maximum(residual, 0.0), sound, log_pivots


def _combined(moments: Moments, columns: list[dict[int, float]]) -> tuple[Any, Any]:
    n = len(columns)
    gram: list[list[Any]] = [[None] * n for _ in range(n)]
    rhs: list[Any] = [None] * n
    for a in range(n):
        for b in range(a, n):
            gram[a][b] = sum(
                (p * q) * moments.gram[i][j]
                for i, p in columns[a].items()
                for j, q in columns[b].items()
            )
            gram[b][a] = gram[a][b].conj()
        rhs[a] = sum(p * moments.rhs[i] for i, p in columns[a].items())
    return gram, rhs


def _back_substitute(gram: Any, rhs: list[Any]) -> list[Any]:
    k = len(rhs)
    x: list[Any] = [None] * k
    for j in range(k - 1, -1, -1):
        total = rhs[j]
        for other in range(j + 1, k):
            total = total - gram[j][other] * x[other]
        x[j] = total / gram[j][j].real
    return x


def _inverse(gram: Any, k: int) -> list[list[Any]]:
    """Inverse of the columns' gram matrix from its elimination, G = U^H D^-1 U with U the rows."""
    # Rows of the unit upper triangle, inverted; then inverse = V D^-1 V^H.
    one = np.ones_like(gram[0][0])
    v: list[list[Any]] = [[0.0 * one for _ in range(k)] for _ in range(k)]
    for j in range(k):
        v[j][j] = one
        for i in range(j - 1, -1, -1):
            total = 0.0 * one
            for other in range(i + 1, j + 1):
                total = total - gram[i][other] / gram[i][i].real * v[other][j]
            v[i][j] = total
    return [
        [
            sum(
                v[a][other] * v[b][other].conj() / gram[other][other].real
                for other in range(max(a, b), k)
            )
            for b in range(k)
        ]
        for a in range(k)
    ]


def tangent(member: Member, projection: Projection, delta: Any, unit: Any) -> Any:
    """Return the factor of x e in the derivative of the wind by ln delta, (profile, length, 1)."""
    amplitude = member.sign * projection.coefficients[member.decay]
    return (1.0 + 1.0j) * (unit / delta)[:, np.newaxis, np.newaxis] * amplitude


def descent(member: Member, projection: Projection, delta: Any, unit: Any) -> tuple[Any, Any]:
    """
    Slope and Gauss-Newton curvature, by ln delta, of half the residual.

    Parameters
    ----------
    member, projection
        Which member, and its linear problem for one trial.
    delta, unit : array, shape (profile,)
        Scale height and height unit. [m]

    Returns
    -------
    downhill, curvature : array, shape (profile, length)
        The slope with its sign turned, exact; their ratio is the Gauss-Newton step.
    """
    factor = tangent(member, projection, delta, unit)
    curvature = (factor.real**2 + factor.imag**2) * projection.tangent_size
    downhill = (factor.conj() * projection.tangent_rhs).real
    return downhill[..., 0], curvature[..., 0]


def lowest(moments: Moments, trials: Any, member: Member, ceiling: Any) -> tuple[Any, ...]:
    """
    Find the scale height of a member on a grid, and between by a parabola.

    Parameters
    ----------
    moments
        For one noise length a profile and all trials.
    trials : array, shape (trial,)
        Scale heights, evenly spaced in their logarithm. [m]
    member
        Which member.
    ceiling : array, shape (profile,)
        Its largest scale height. [m]

    Returns
    -------
    delta, edge, least : array, shape (profile,)
        Scale height of the least residual [m], whether it is no minimum inside the range, and the
        least residual on the grid.
    """
    columns = list(member.columns)
    _, _, residual, sound, _ = _eliminate(moments, columns, len(columns))
    usable = sound[:, 0] & (trials <= ceiling[:, np.newaxis])
    residual = np.where(usable, residual[:, 0], np.inf)
    best = np.argmin(residual, axis=-1)
    inner = np.clip(best, 1, trials.size - 2)
    r = [np.take_along_axis(residual, (inner + k)[:, np.newaxis], -1)[:, 0] for k in (-1, 0, 1)]
    inside = (inner == best) & np.isfinite(r[0]) & np.isfinite(r[1]) & np.isfinite(r[2])
    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        shift = 0.5 * (r[0] - r[2]) / (r[0] - 2 * r[1] + r[2])
    shift = np.where(inside & np.isfinite(shift), np.clip(shift, -1, 1), 0.0)
    logs = np.log(trials)
    least = np.min(residual, axis=-1)
    return np.exp(logs[best] + shift * (logs[1] - logs[0])), ~inside, least


def ceilings(reach: Any) -> Any:
    """
    Largest scale height that each member may have, shape (profile, member). [m].

    Beyond five times the profile's reach e is a straight line and nothing tells it from G; a shear
    of the geostrophic wind is told from friction only above the frictional layer, so a sheared
    member must leave three scale heights below the top (e is then 0.05).
    """
    return np.stack(
        [5.0 * reach if member.shear is None else reach / 3.0 for member in MEMBERS], axis=-1
    )


def refine(data: Profiles, noise: Whitening, start: Any) -> Any:
    """
    Descend to the least whitened residual, each step kept only where it lowers it.

    Parameters
    ----------
    data
        The profiles.
    noise
        Of one length a profile, from :func:`backveer.profiles.ekman_moments.whiten`.
    start : array, shape (profile, member)
        Scale heights to start from. [m]

    Returns
    -------
    delta : array, shape (profile, member)
        Scale heights of the least whitened residual. [m]

    Notes
    -----
    The first step is that of Gauss and Newton; the next ones take the curvature from the change of
    the slope, which is exact, since the last point (the secant), where that is of the same order.
    A step that does not help is halved.
    """
    floor, roof = np.log(TRIALS[0]), np.log(np.minimum(ceilings(data.unit), TRIALS[-1]))
    trial = np.clip(np.log(start), floor, roof)
    best, least = trial.copy(), np.full(start.shape, np.inf)
    move, last_slope = np.zeros(start.shape), np.full(start.shape, np.nan)
    rows = np.flatnonzero(data.count > 0)  # those still on their way
    for _ in range(STEPS):
        here = data.at(rows)
        residual, slope, curvature = (np.empty((rows.size, len(MEMBERS))) for _ in range(3))
        (sums,) = basis_moments(here, np.exp(trial[rows]), noise.at(rows))
        for m, member in enumerate(MEMBERS):
            one = project(sums.trial(m), member)
            residual[:, m] = np.where(one.sound, one.residual, np.inf)[:, 0, 0]
            downhill, bend = descent(member, one, np.exp(trial[rows, m]), here.unit)
            slope[:, m], curvature[:, m] = downhill[:, 0], bend[:, 0]
        secant = (last_slope[rows] - slope) / (trial[rows] - best[rows])
        like = (secant > 0.03 * curvature) & (secant < 30.0 * curvature)
        ahead = np.clip(slope / np.where(like, secant, curvature), -0.5, 0.5)
        better = residual < least[rows]
        move[rows] = np.where(better, np.where(np.isfinite(ahead), ahead, 0.0), 0.5 * move[rows])
        best[rows] = np.where(better, trial[rows], best[rows])
        least[rows] = np.where(better, residual, least[rows])
        last_slope[rows] = np.where(better, slope, last_slope[rows])
        trial[rows] = np.clip(best[rows] + move[rows], floor, roof[rows])
        rows = rows[(np.abs(trial[rows] - best[rows]) > ARRIVED).any(axis=-1)]
    # The last step is not tried any more, and taken only where nothing can go wrong.
    return np.exp(np.where(np.abs(trial - best) < SURE, trial, best))


def without_friction(moments: Moments) -> list[Any]:
    """Whitened residual of a constant and of a linear wind, each of shape (profile,)."""
    return [
        _eliminate(moments.trial(0), list(null.columns), len(null.columns))[2][:, 0, 0]
        for null in WITHOUT_FRICTION
    ]
