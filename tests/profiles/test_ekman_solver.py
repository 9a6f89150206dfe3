"""The equation solved against scipy's collocation, its own convergence, and balance."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
import scipy.integrate

from backveer.profiles import ekman_solver
from backveer.profiles.ekman_solver import SHAPES, departure, solve_tridiagonal, table, viscosity

MUS = (0.3, 1.0, 3.0, 12.0)


def witness(shape: str, mu: float) -> Any:
    """Solve the same problem by collocation over ln(xi), and return F of ln(xi)."""
    bottom, top = ekman_solver.BOTTOM, ekman_solver.TOP

    def slopes(s: Any, y: Any) -> Any:
        xi = np.exp(s)
        over = xi / viscosity(shape, xi)
        flow = xi * mu
        return np.vstack([y[2] * over, y[3] * over, -flow * y[1], flow * y[0]])

    def ends(a: Any, b: Any) -> Any:
        return np.array([a[2] + 1.0, a[3], b[0], b[1]])  # a stress of one; no departure aloft

    s = np.linspace(bottom, top, 400)
    guess = np.zeros((4, s.size))
    guess[0] = np.maximum(-s, 0.0)
    guess[2] = -1.0 + (s - bottom) / (top - bottom)
    solved = scipy.integrate.solve_bvp(slopes, ends, s, guess, tol=1e-7, max_nodes=200000)
    assert solved.success
    return lambda x: solved.sol(x)[0] + 1j * solved.sol(x)[1]


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("mu", MUS)
def test_the_equation_is_solved_as_collocation_solves_it(shape: str, mu: float) -> None:
    s = np.linspace(-11.0, 0.2, 301)
    value, _, _ = table(shape).look_up(s, np.full(1, np.log(mu)))
    off = np.abs(value - witness(shape, mu)(s))
    # Looked up between the nodes of the table, in u* / kappa.
    assert off.max() < 0.01
    assert off[s < -1.0].max() < 2e-3


@pytest.mark.parametrize("shape", SHAPES)
def test_half_the_step_leaves_about_a_quarter_of_the_error(shape: str) -> None:
    mu = np.array(MUS)
    coarse, middle, fine = (
        departure(shape, mu, step)[1][:: round(0.02 / step)] for step in (0.02, 0.01, 0.0025)
    )
    errors = [np.abs(x - fine)[: round(12.8 / 0.02)].max(axis=0) for x in (coarse, middle)]
    # Second order: 4 and, against a fine solution that is off too, (16 - 1/4) / (4 - 1/4) = 4.2.
    # The linear shape has a corner at h, which costs a little.
    assert (errors[0] / errors[1] > (3.0 if shape == "linear" else 3.4)).all()
    at_wall = np.abs(departure(shape, mu)[1][0] - departure(shape, mu, 0.00125)[1][0])
    assert at_wall.max() < 5e-4


@pytest.mark.parametrize("shape", SHAPES)
def test_the_coriolis_force_of_the_layer_balances_the_stress(shape: str) -> None:
    mu = np.array(MUS)
    s, value, _ = departure(shape, mu)
    force = scipy.integrate.trapezoid(value * np.exp(s)[:, np.newaxis], s, axis=0)
    # 1 = i mu times the integral of F over xi.
    np.testing.assert_allclose(1j * mu * force, 1.0 + 0j, atol=2e-4)


def test_near_the_wall_the_wind_is_logarithmic() -> None:
    s = np.array([-30.0, -20.0, -13.8, -12.0])
    value, slope, _ = table("square").look_up(s, np.zeros(1))
    np.testing.assert_allclose(np.diff(value.real), -np.diff(s), rtol=1e-4)
    np.testing.assert_allclose(slope, -1.0 + 0.0j, atol=1e-4)


@pytest.mark.parametrize("shape", SHAPES)
def test_the_derivatives_are_those_of_the_values(shape: str) -> None:
    s, log_mu, small = np.linspace(-9.0, 0.3, 57), np.array([0.37]), 1e-6
    _, by_s, by_mu = table(shape).look_up(s, log_mu)
    up, down = (table(shape).look_up(s + d, log_mu)[0] for d in (small, -small))
    np.testing.assert_allclose((up - down) / (2 * small), by_s, atol=1e-5 * np.abs(by_s).max())
    up, down = (table(shape).look_up(s, log_mu + d)[0] for d in (small, -small))
    np.testing.assert_allclose((up - down) / (2 * small), by_mu, atol=1e-6)


def test_many_equations_are_solved_as_one_by_one() -> None:
    random = np.random.default_rng(3)
    lower, upper, rhs = (
        random.normal(size=(9, 5, 2)) + 1j * random.normal(size=(9, 5, 2)) for _ in range(3)
    )
    main = 6.0 + random.normal(size=(9, 5, 2))
    x = solve_tridiagonal(lower, main, upper, rhs)
    for i in range(5):
        for j in range(2):
            matrix = np.diag(main[:, i, j]).astype(complex)
            matrix += np.diag(lower[1:, i, j], -1) + np.diag(upper[:-1, i, j], 1)
            np.testing.assert_allclose(x[:, i, j], np.linalg.solve(matrix, rhs[:, i, j]))


def test_the_cubic_meets_the_surface_layer_and_the_top_as_it_should() -> None:
    base, small = ekman_solver.SURFACE_LAYER, 1e-7
    k = viscosity("cubic", np.array([base - small, base, base + small, 1.0 - small, 1.0]), 0.0)
    # O'Brien (1970): value and slope of the surface layer at its top, neither at h.
    assert k[1] == pytest.approx(base)
    assert (k[2] - k[0]) / (2 * small) == pytest.approx(1.0, rel=1e-5)
    assert k[4] == 0.0
    assert k[3] / small < 1e-6


def test_an_unknown_shape_is_refused() -> None:
    with pytest.raises(ValueError, match="no viscosity has the shape 'flat'"):
        viscosity("flat", np.ones(2))
