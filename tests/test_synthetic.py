"""The synthetic truth, against closed forms, a second solver, the drag law and its own balance."""

from __future__ import annotations

import numpy as np
import pytest
import synthetic
from scipy.linalg import solve_banded
from scipy.optimize import brentq

LATITUDE = 52.0
F = synthetic.coriolis_parameter(LATITUDE)


def test_f_is_that_of_the_tables():
    # 1.149253e-4 s-1 at 52 degrees, 2 Omega sin(latitude), by arithmetic
    assert synthetic.coriolis_parameter(52.0) == pytest.approx(1.149253e-4, abs=5e-11)


def test_constant_viscosity_gives_the_ekman_spiral():
    """Ekman (1905), u + i v = G (1 - exp(-(1 + i) z / delta)), exactly."""
    truth = synthetic.solve(10.0, LATITUDE, 1e-4, synthetic.constant(5.0))
    delta = np.sqrt(2 * 5.0 / F)
    z = np.linspace(1.0, 2000.0, 40)
    expected = 10.0 * (1.0 - np.exp(-(1 + 1j) * (z - 1e-4) / delta))
    assert np.abs(truth.wind(z) - expected).max() < 2e-5
    assert truth.cross_isobar_angle == pytest.approx(45.0, abs=1e-3)
    assert truth.u_star**2 == pytest.approx(10.0 * np.sqrt(5.0 * F), rel=1e-5)


def test_linear_shear_over_constant_viscosity_adds_to_the_spiral():
    """With Wg linear in height, W - Wg obeys the same equation: W = Wg + A exp(-(1 + i) z / d)."""
    shear = 0.002 - 0.003j
    truth = synthetic.solve(10.0, LATITUDE, 1e-4, synthetic.constant(5.0), 240.0, shear)
    delta = np.sqrt(2 * 5.0 / F)
    z = np.linspace(1.0, 3000.0, 40)
    geostrophic = 10.0 * (np.sin(np.radians(60.0)) + 1j * np.cos(np.radians(60.0))) + shear * z
    ground = geostrophic[0] - shear * 1.0
    expected = geostrophic - ground * np.exp(-(1 + 1j) * z / delta)
    assert np.abs(truth.wind(z) - expected).max() < 1e-4


@pytest.mark.parametrize(
    "viscosity",
    [synthetic.exponential(250.0), synthetic.exponential(90.0), synthetic.cubic(800.0)],
)
def test_a_second_solver_agrees(viscosity):
    """Finite volumes on a stretched grid, a banded solve, u* by iteration: other mathematics."""
    speed, roughness = 12.0, 0.03
    truth = synthetic.solve(speed, LATITUDE, roughness, viscosity)
    edges = np.exp(np.linspace(np.log(roughness), np.log(6000.0), 6001))
    z = np.sqrt(edges[1:] * edges[:-1])
    u_star = 0.4
    for _ in range(60):
        # flux through the lower edge of each cell; the wind is zero at the lowest edge
        between = np.diff(np.concatenate([[roughness], z]))
        conductance = viscosity(edges[:-1], u_star) / between
        bands = np.zeros((3, z.size), dtype=complex)
        bands[0, 1:] = conductance[1:]
        bands[2, :-1] = conductance[1:]
        bands[1] = -conductance - 1j * F * np.diff(edges)
        bands[1, :-1] -= conductance[1:]
        wind = solve_banded((1, 1), bands, -1j * F * speed * np.diff(edges) + 0j)
        u_star = np.sqrt(np.abs(conductance[0] * wind[0]))
    assert truth.u_star == pytest.approx(u_star, rel=2e-3)
    heights = np.array([5.0, 40.0, 200.0, 600.0, 1500.0])
    second = np.interp(heights, z, wind.real) + 1j * np.interp(heights, z, wind.imag)
    assert np.abs(truth.wind(heights) - second).max() < 0.02


def test_the_stress_balances_the_departure():
    """Stress(0) = -i f times the integral of W - Wg, whatever the viscosity."""
    truth = synthetic.solve(9.0, LATITUDE, 0.2, synthetic.cubic(700.0), 310.0)
    z = np.exp(np.linspace(np.log(0.2), np.log(6000.0), 20001))
    departure = truth.wind(z) - truth.geostrophic_wind(z)
    integral = np.trapezoid(departure, z) - 0.2 * truth.geostrophic
    stress = -1j * F * integral
    assert np.abs(stress - truth.stress(0.2)) < 2e-4 * truth.u_star**2 + F * 0.2 * 9.0
    assert np.abs(truth.stress(0.2)) == pytest.approx(truth.u_star**2, rel=1e-6)
    angle = np.degrees(np.angle(truth.stress(0.2) / truth.geostrophic))
    assert truth.cross_isobar_angle == pytest.approx(angle, abs=1e-6)
    assert 0.0 < angle < 45.0  # to the left, where the low lies in the northern hemisphere


def test_the_wall_is_logarithmic():
    truth = synthetic.solve(10.0, LATITUDE, 0.1, synthetic.exponential(250.0))
    z = np.array([0.2, 0.5, 1.0, 2.0])
    expected = truth.u_star / synthetic.VON_KARMAN * np.log(z / 0.1)
    assert np.abs(truth.wind(z)) == pytest.approx(expected, rel=0.01)


@pytest.mark.parametrize(("speed", "roughness"), [(10.0, 1e-4), (10.0, 0.03), (20.0, 0.1)])
def test_neutral_layers_follow_the_drag_law(speed, roughness):
    """
    Geostrophic drag law with A = 1.8, B = 4.5 and with A = 0.8, B = 3.5; both pairs second-hand.

    The pairs differ by 4 % in u* and by 5 degrees or more; the solver must come out between them.
    """
    f = synthetic.coriolis_parameter(45.0)

    def law(a, b):
        def excess(u_star):
            return u_star / 0.4 * np.hypot(np.log(u_star / (f * roughness)) - a, b) - speed

        u_star = brentq(excess, 0.01 * speed, 0.1 * speed)
        return u_star, np.degrees(np.arcsin(b * u_star / 0.4 / speed))

    truth = synthetic.solve(speed, 45.0, roughness, synthetic.neutral(45.0))
    first, second = law(1.8, 4.5), law(0.8, 3.5)
    assert second[0] < 1.01 * truth.u_star < 1.04 * first[0]
    assert second[1] < truth.cross_isobar_angle < first[1]


def test_hemispheres_mirror_and_rotation_rotates():
    north = synthetic.solve(11.0, 40.0, 0.05, direction=250.0, shear=0.001 + 0.002j)
    south = synthetic.solve(11.0, -40.0, 0.05, direction=290.0, shear=0.001 - 0.002j)
    z = np.array([10.0, 100.0, 900.0, 7000.0])
    assert south.wind(z) == pytest.approx(np.conj(north.wind(z)), abs=1e-12)
    assert south.cross_isobar_angle == north.cross_isobar_angle
    assert south.f == -north.f
    turned = synthetic.solve(
        11.0, 40.0, 0.05, direction=280.0, shear=(0.001 + 0.002j) * np.exp(-1j * np.pi / 6)
    )
    assert turned.wind(z) == pytest.approx(north.wind(z) * np.exp(-1j * np.pi / 6), abs=1e-4)
    direction = synthetic.solve(11.0, 40.0, direction=250.0).stack(z, 40.0).wind_from_direction
    assert np.all(np.diff(direction[0, :3]) > 0)  # veers with height
    assert direction[0, 3] == pytest.approx(250.0)


def test_noise_has_the_error_and_the_correlation_asked_for():
    random = np.random.default_rng(1)
    z = np.array([10.0, 30.0, 70.0, 150.0])
    noise = synthetic.correlated_noise(random, z, 0.5, 50.0, profiles=40000)
    assert noise.real.std(axis=0) == pytest.approx(0.5, rel=0.02)
    assert noise.imag.std(axis=0) == pytest.approx(0.5, rel=0.02)
    correlation = np.corrcoef(noise.real.T)
    assert correlation == pytest.approx(np.exp(-np.abs(z[:, None] - z) / 50.0), abs=0.02)
    assert np.abs(np.corrcoef(noise.real[:, 1], noise.imag[:, 1])[0, 1]) < 0.02
    fresh = synthetic.correlated_noise(random, z, 0.5, 0.0, profiles=20000)
    assert np.abs(np.corrcoef(fresh.real.T)[0, 1]) < 0.03
