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
SINGULAR = 1e-8  # a column that is this small beside itself after elimination is not there
STEPS = 5  # Gauss-Newton steps after the parabola


@dataclass
class Projection:
    """A member's linear problem solved, arrays of shape (profile, trial)."""

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
    columns = [*member.columns, {TANGENT: 1.0}]
    n, k = len(columns), len(member.columns)
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
    coefficients = _back_substitute(gram, rhs[:k])
    slope = _back_substitute(gram, [gram[j][k] for j in range(k)])
    return Projection(
        residual=np.maximum(residual, 0.0),
        coefficients=coefficients,
        inverse=_inverse(gram, k),
        slope=slope,
        tangent_size=np.maximum(gram[k][k].real, 0.0),
        tangent_rhs=rhs[k],
        log_pivots=log_pivots,
        sound=sound,
    )


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
    """Return the factor of the column x e in the derivative of the wind by ln delta."""
    amplitude = member.sign * projection.coefficients[member.decay]
    return (1.0 + 1.0j) * (unit[:, np.newaxis] / delta) * amplitude


def step(member: Member, projection: Projection, delta: Any, unit: Any) -> tuple[Any, Any]:
    """Gauss-Newton step of ln delta, and the curvature of half the residual there."""
    factor = tangent(member, projection, delta, unit)
    curvature = (factor.real**2 + factor.imag**2) * projection.tangent_size
    slope = (factor.conj() * projection.tangent_rhs).real
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        move = slope / curvature
    return np.where(np.isfinite(move), move, 0.0), curvature


def first_guess(data: Profiles) -> tuple[Any, Any]:
    """
    Find the scale height of each member to about a tenth, by ordinary least squares on a grid.

    Parameters
    ----------
    data
        The profiles.

    Returns
    -------
    delta, edge : array, shape (profile, member)
        Scale height of the least residual [m], and whether it is no minimum inside the range.
    """
    trials = np.broadcast_to(TRIALS, (data.z.shape[0], TRIALS.size))
    independent = np.zeros((data.z.shape[0], 1))
    coarse = basis_moments(data, trials, independent, tangent=False)
    log_delta = np.empty((data.z.shape[0], len(MEMBERS)))
    edge = np.zeros(log_delta.shape, dtype=bool)
    logs = np.log(TRIALS)
    ceiling = ceilings(data.unit)
    for m, member in enumerate(MEMBERS):
        projection = project(coarse, member)
        usable = projection.sound & (trials <= ceiling[:, m : m + 1])
        residual = np.where(usable, projection.residual, np.inf)
        best = np.argmin(residual, axis=-1)
        inner = np.clip(best, 1, TRIALS.size - 2)
        r = [np.take_along_axis(residual, (inner + k)[:, np.newaxis], -1)[:, 0] for k in (-1, 0, 1)]
        inside = (inner == best) & np.isfinite(r[0]) & np.isfinite(r[1]) & np.isfinite(r[2])
        with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
            shift = 0.5 * (r[0] - r[2]) / (r[0] - 2 * r[1] + r[2])
        shift = np.where(inside & np.isfinite(shift), np.clip(shift, -1, 1), 0.0)
        log_delta[:, m] = logs[best] + shift * (logs[1] - logs[0])
        edge[:, m] = ~inside
    return np.exp(log_delta), edge


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


def refine(data: Profiles, length: Any, start: Any) -> tuple[Any, list[Projection], list[Any]]:
    """
    Take Gauss-Newton steps, each kept only where it lowers the residual, halved where it does not.

    Parameters
    ----------
    data
        The profiles.
    length : array, shape (profile, 1)
        Noise length. [m]
    start : array, shape (profile, member)
        Scale heights to start from. [m]

    Returns
    -------
    delta : array, shape (profile, member)
        Scale heights of the least whitened residual. [m]
    projections : list
        Each member's linear problem there.
    without_friction : list
        Whitened residual of a constant and of a linear wind, each of shape (profile,).
    """
    floor, roof = np.log(TRIALS[0]), np.log(np.minimum(ceilings(data.unit), TRIALS[-1]))
    best = trial = np.clip(np.log(start), floor, roof)
    least = np.full(start.shape, np.inf)
    move = np.zeros(start.shape)
    for _ in range(STEPS):
        residual, moves = np.empty(start.shape), np.empty(start.shape)
        projections, _ = _all_members(data, np.exp(trial), length)
        for m, (member, projection) in enumerate(zip(MEMBERS, projections, strict=True)):
            gauss_newton, _ = step(member, projection, np.exp(trial[:, m : m + 1]), data.unit)
            residual[:, m] = np.where(projection.sound, projection.residual, np.inf)[:, 0]
            moves[:, m] = np.clip(gauss_newton[:, 0], -0.5, 0.5)
        better = residual < least
        best, least = np.where(better, trial, best), np.where(better, residual, least)
        move = np.where(better, moves, 0.5 * move)
        trial = np.clip(best + move, floor, roof)
    delta = np.exp(best)
    projections, sums = _all_members(data, delta, length)
    narrow = Moments(
        [[_column(x, 0) for x in row] for row in sums.gram],
        [_column(x, 0) for x in sums.rhs],
        sums.wind,
        sums.log_determinant,
    )
    return delta, projections, [project(narrow, null).residual[:, 0] for null in WITHOUT_FRICTION]


def _all_members(data: Profiles, delta: Any, length: Any) -> tuple[list[Projection], Moments]:
    sums = basis_moments(data, delta, length)
    projections = [
        project(
            Moments(
                [[_column(x, m) for x in row] for row in sums.gram],
                [_column(x, m) for x in sums.rhs],
                sums.wind,
                sums.log_determinant,
            ),
            member,
        )
        for m, member in enumerate(MEMBERS)
    ]
    return projections, sums


def _column(x: Any, m: int) -> Any:
    return x[:, m : m + 1] if x.shape[1] > 1 else x
