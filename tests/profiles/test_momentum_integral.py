"""The momentum integral: closed forms, the Leipzig profile, synthetic truth, noise."""

from __future__ import annotations

import leipzig
import numpy as np
import pytest
import synthetic

from backveer.profiles.momentum_integral import (
    departure_integral,
    friction_velocity,
    logarithmic_share,
)


def integrate(z, wind, geostrophic, top, **more):
    z, wind = np.asarray(z, dtype=float), np.atleast_2d(wind)
    count = len(wind)
    return departure_integral(
        z,
        wind,
        np.broadcast_to(geostrophic, wind.shape),
        np.broadcast_to(np.asarray(geostrophic).reshape(-1)[:1], (count,)),
        np.full(count, float(top)),
        **more,
    )


def test_leipzig_gives_lettaus_friction_velocity():
    """
    The integral of v: 3442 m2/s with 0-50 m taken at 0.9 v(50 m) (derived from the table).

    Here 0-50 m follows the logarithmic law, 0.864 +- 0.046 of v(50 m): 8 m2/s less. With
    f = 1.13e-4 and alpha0 = 26.1 degrees (from memory) u*^2 cos(alpha0) = f times it gives
    0.658 m/s; Lettau has 0.65.
    """
    integral = integrate(leipzig.Z, leipzig.U + 1j * leipzig.V, 17.5 + 0j, 950.0)
    across = integral.value.imag[0]
    assert across == pytest.approx(3442.0 - (0.9 - 0.8636) * 4.35 * 50.0, abs=1.0)
    u_star = np.sqrt(1.13e-4 * across / np.cos(np.radians(26.1)))
    assert u_star == pytest.approx(0.658, abs=0.001)


def test_analytic_spiral_gives_half_g_delta_both_ways():
    """Integrals of v and of G - u are G delta / 2 each, exactly."""
    f, viscosity, speed = 1e-4, 5.0, 12.0
    delta = np.sqrt(2 * viscosity / f)
    z = np.concatenate([[1e-3], np.linspace(2.0, 30 * delta, 4000)])
    wind = speed * (1.0 - np.exp(-(1 + 1j) * z / delta))
    integral = integrate(z, wind, speed + 0j, 30 * delta)
    assert integral.value[0] == pytest.approx(speed * delta / 2 * (-1 + 1j), rel=1e-4)
    # surface stress G sqrt(K f), 45 degrees to the left
    u_star, _ = friction_velocity(f, integral.value, 0.0)
    assert u_star[0] ** 2 == pytest.approx(speed * np.sqrt(viscosity * f), rel=1e-4)
    stress = -1j * f * integral.value[0]
    assert np.degrees(np.angle(stress)) == pytest.approx(45.0, abs=0.01)


@pytest.mark.parametrize("latitude", [48.0, -33.0])
@pytest.mark.parametrize("roughness", [0.001, 0.03, 0.5])
def test_synthetic_truth_is_within_the_error(latitude, roughness):
    truth = synthetic.solve(11.0, latitude, roughness, synthetic.cubic(900.0))
    z = np.concatenate([[10.0], np.arange(30.0, 1200.0, 25.0)])
    integral = integrate(z, truth.wind(z), truth.geostrophic, 1200.0)
    u_star, error = friction_velocity(truth.f, integral.value, integral.error)
    assert u_star[0] == pytest.approx(truth.u_star, rel=0.01)
    assert abs(u_star[0] - truth.u_star) < 2.5 * error[0]


def test_top_may_lie_between_levels():
    z = np.array([10.0, 50.0, 110.0])
    wind = np.array([6.0, 8.0, 12.0]) + 1j * np.array([2.0, 1.0, 0.0])
    part = integrate(z, wind, 10.0 + 0j, 80.0).value[0]
    share = logarithmic_share(10.0)[0]
    by_hand = 10.0 * (share * (6 + 2j) - 10.0)
    by_hand += 40.0 * (7 + 1.5j - 10.0) + 30.0 * (0.5 * (8 + 10) + 1j * 0.5 * (1 + 0.5) - 10.0)
    assert part == pytest.approx(by_hand)
    whole = integrate(z, wind, 10.0 + 0j, 500.0)
    assert whole.highest == [110.0]
    assert np.isnan(integrate(z, wind, 10.0 + 0j, 9.0).value[0])


def test_logarithmic_share_is_that_of_the_log_law():
    """Against the integral of the law itself, over roughness lengths from 0.2 mm to 1 m."""
    roughness = np.exp(np.linspace(np.log(2e-4), np.log(1.0), 4001))
    for z1 in (12.0, 50.0):
        x = np.log(z1 / roughness)
        exact = 1.0 - (1.0 - roughness / z1) / x
        share, doubt = logarithmic_share(np.array(z1))
        assert share == pytest.approx(exact.mean(), abs=0.01)
        assert doubt == pytest.approx(exact.std(), abs=0.015)


@pytest.mark.parametrize("length", [0.0, 40.0, 200.0])
def test_noise_error_is_that_of_drawn_noise(length):
    random = np.random.default_rng(11)
    z = np.concatenate([[0.5], np.cumsum(random.uniform(10.0, 60.0, 25))])
    noise = synthetic.correlated_noise(random, z, 0.5, length, profiles=8000)
    integral = integrate(z, noise, 0j, 700.0, error=0.5, noise_length=length)
    drawn = np.sqrt(0.5 * np.mean(np.abs(integral.value) ** 2))
    assert np.median(integral.error) == pytest.approx(drawn, rel=0.03)


def test_padding_gaps_and_neighbours_change_no_bit():
    random = np.random.default_rng(12)
    z = np.cumsum(random.uniform(10.0, 60.0, (7, 30)), axis=1)
    wind = random.normal(size=z.shape) + 1j * random.normal(size=z.shape)
    for row in range(7):
        z[row, 30 - 3 * row :] = np.nan
    far = np.full(7, 600.0)
    more = {"error": np.full(7, 0.3), "noise_length": np.linspace(10.0, 200.0, 7)}
    together = departure_integral(z, wind, 0.01 * z + 1j, np.full(7, 1.0j), far, **more)
    for row in range(7):
        keep = np.isfinite(z[row])
        one = {name: value[row : row + 1] for name, value in more.items()}
        for hole in (False, True):
            zs, ws = z[row, keep], wind[row, keep]
            if hole:
                zs, ws = np.insert(zs, 3, 200.0), np.insert(ws, 3, np.nan)
            alone = departure_integral(
                zs[np.newaxis], ws[np.newaxis], 0.01 * zs + 1j, np.full(1, 1.0j), far[:1], **one
            )
            for a, b in zip(alone, together, strict=True):
                assert np.array_equal(a[0], b[row])


@pytest.mark.parametrize("value", [0.0, np.inf, np.nan, 1e308, 5e-324])
def test_hostile_numbers_neither_warn_nor_raise(value):
    z = np.array([10.0, 20.0, 40.0])
    wind = np.array([3.0 + 1j, value, 5.0])
    integrate(z, wind, 10.0 + 0j, 40.0, error=value, noise_length=value)
    integrate(z, wind, complex(value), value)
    empty = integrate(np.empty(0), np.empty((1, 0)), 1j, 100.0)
    assert np.isnan(empty.value[0])
    friction_velocity(value, np.array([0j, value]), value)
