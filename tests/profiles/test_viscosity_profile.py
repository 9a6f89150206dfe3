"""Layers of varying viscosity, solved by collocation, must be found again, with honest errors."""

from __future__ import annotations

import dataclasses
import functools
from typing import Any

import leipzig
import numpy as np
import pytest
import synthetic

from backveer.profiles import earth, ekman, viscosity_profile
from backveer.profiles.grid import ordered_sum
from backveer.profiles.labels import labels
from backveer.profiles.stack import Stack
from backveer.profiles.viscosity_profile import ViscosityProfile

Z = np.arange(20.0, 1501.0, 25.0)
NUMBERS = (
    "friction_velocity",
    "roughness_length",
    "depth",
    "cross_isobar_angle",
    "geostrophic_eastward_wind",
    "geostrophic_northward_wind",
)


@functools.cache
def power(depth: float, p: int) -> synthetic.Viscosity:
    """Return K = kappa u* z (1 - z/h)^p and a small background. [m2 s-1]"""

    def viscosity(z: Any, u_star: Any) -> Any:
        share = z / depth
        mixed = share * np.clip(1.0 - share, 0.0, 1.0) ** p + 0.002 * np.expm1(-share) ** 2
        return synthetic.VON_KARMAN * u_star * depth * mixed

    return viscosity


def fit(stack: Stack, error: float = 0.1, **more: Any) -> ViscosityProfile:
    """Fit the analytic family and then the layers of varying viscosity."""
    f = earth.coriolis(stack)
    errors = np.full(stack.profile_count, error)
    return viscosity_profile.fit(stack, f, ekman.fit(stack, f, errors), errors, **more)


def noisy(truth: synthetic.Truth, latitude: float, count: int, z: Any = Z, seed: int = 1) -> Stack:
    """Return profiles with radiosonde-like noise."""
    random = np.random.default_rng(seed)
    return truth.stack(z, latitude, synthetic.correlated_noise(random, z, 0.3, 100.0, count))


@pytest.fixture(scope="module")
def mixed() -> Stack:
    """Profiles of both hemispheres, of several lengths."""
    north = synthetic.solve(10.0, 52.0, 0.05, synthetic.cubic(700.0), direction=225.0)
    south = synthetic.solve(7.0, -40.0, 0.01, power(600.0, 2), direction=80.0)
    return Stack.concatenate(
        [
            noisy(north, 52.0, 6),
            noisy(south, -40.0, 6, Z[:43], seed=2),
            noisy(south, -40.0, 3, Z[:9], seed=3),
            noisy(north, 2.0, 1, seed=4),
        ]
    )


CASES = {
    "cubic": (synthetic.cubic(500.0), 8.0, 0.02, 500.0),
    # The witness leaves 0.1 m2 s-1 aloft unless told; here what the package does, for u* 0.64 m/s.
    "cubic, deep": (synthetic.cubic(1000.0, background=0.5), 15.0, 0.1, 1000.0),
    "linear": (power(600.0, 1), 12.0, 0.1, 600.0),
    "square": (power(700.0, 2), 10.0, 0.05, 700.0),
    "fourth power": (power(900.0, 4), 10.0, 0.05, 900.0),
}


@pytest.mark.parametrize("name", CASES)
def test_a_layer_without_noise_is_found_again(name: str) -> None:
    viscosity, speed, roughness, depth = CASES[name]
    truth = synthetic.solve(speed, 52.0, roughness, viscosity)
    found = fit(truth.stack(np.arange(10.0, 2001.0, 30.0), 52.0))
    assert found.shape[0] == name.split(",")[0]
    assert found.verdict[0] == "well determined"
    assert found.friction_velocity[0] == pytest.approx(truth.u_star, rel=0.01)
    assert found.cross_isobar_angle[0] == pytest.approx(truth.cross_isobar_angle, abs=0.2)
    assert found.depth[0] == pytest.approx(depth, rel=0.015)
    assert found.roughness_length[0] == pytest.approx(roughness, rel=0.05)
    assert found.geostrophic_eastward_wind[0] == pytest.approx(speed, abs=0.03)
    assert found.geostrophic_northward_wind[0] == pytest.approx(0.0, abs=0.03)
    assert found.aicc_gain[0] > 100.0
    assert found.rms[0] < 0.12


def test_a_known_roughness_sharpens_the_friction_velocity() -> None:
    truth = synthetic.solve(10.0, 52.0, 0.05, synthetic.cubic(700.0))
    stack = noisy(truth, 52.0, 20)
    free, given = fit(stack), fit(stack, roughness_length=0.05)
    assert (given.roughness_length == np.exp(np.log(0.05))).all()
    assert (given.roughness_length_error == 0.0).all()
    ratio = given.friction_velocity_error / free.friction_velocity_error
    assert np.median(ratio) < 0.75
    off = np.abs(given.friction_velocity - truth.u_star) / given.friction_velocity_error
    assert np.sqrt(np.mean(off**2)) < 1.6


def test_a_spiral_of_constant_viscosity_is_left_to_the_analytic_family() -> None:
    f, delta = synthetic.coriolis_parameter(52.0), 300.0
    assert f > 0
    wave = 10.0 * (1.0 - np.exp(-(1.0 + 1.0j) * Z / delta))
    noise = synthetic.correlated_noise(np.random.default_rng(8), Z, 0.1, 0.0, 5)
    stack = Stack.of(
        height=Z, eastward_wind=(wave + noise).real, northward_wind=(wave + noise).imag,
        latitude=52.0,
    )  # fmt: skip
    found = fit(stack)
    assert (found.aicc_gain < -20.0).all()
    assert (found.verdict == "weakly determined").all()
    assert (found.why == "a constant viscosity fits the profile better").all()


def test_the_criterion_is_that_of_the_analytic_family() -> None:
    """The same residual, noise length and number of parameters must give the same AICc."""
    truth = synthetic.solve(10.0, 52.0, 0.05, synthetic.cubic(700.0))
    stack = noisy(truth, 52.0, 4)
    f = earth.coriolis(stack)
    analytic = ekman.fit(stack, f, noise_length=0.0)
    found = viscosity_profile.fit(stack, f, analytic, noise_length=0.0)
    u, v = viscosity_profile.wind(found, Z)
    square = ordered_sum((u - stack.eastward_wind) ** 2 + (v - stack.northward_wind) ** 2)
    np.testing.assert_allclose(np.sqrt(square / Z.size), found.rms, rtol=1e-6)
    # Independent noise: residuals to the AICc of either, with k = parameters + 1 and price 1.
    n = 2.0 * Z.size
    no_slip = analytic.candidate_rms[:, 0] ** 2 * Z.size

    def by_hand(r: Any, k: float) -> Any:
        return n * np.log(r / n) + 3.0 * k + 2.0 * k * (k + 1.0) / (n - k - 1.0)

    np.testing.assert_allclose(found.aicc, by_hand(square, 5.0), rtol=1e-6)
    np.testing.assert_allclose(analytic.candidate_aicc[:, 0], by_hand(no_slip, 4.0), rtol=1e-6)


def test_the_closure_is_the_drag_law_of_the_wall(mixed: Stack) -> None:
    found = fit(mixed)
    told = np.flatnonzero(found.shape != "")
    assert told.size >= 8
    z0 = found.roughness_length[:, np.newaxis]
    u, v = viscosity_profile.wind(found, np.hstack([z0, 1.01 * z0, 1.0 + 0.0 * z0]))
    speed = np.hypot(u, v)[told]
    np.testing.assert_allclose(speed[:, 0], 0.0, atol=1e-9)
    # Close to the wall u*/kappa ln(z/z0).
    log = found.friction_velocity[told] / 0.4 * np.log(1.01)
    np.testing.assert_allclose(speed[:, 1], log, rtol=5e-3)  # of u*, to what z0/h takes
    assert (speed[:, 2] > 0.5).all()


def same(one: Any, other: Any) -> bool:
    one, other = np.asarray(one), np.asarray(other)
    return np.array_equal(one, other, equal_nan=one.dtype != object)


def test_the_southern_hemisphere_is_the_mirror_image(mixed: Stack) -> None:
    mirrored = dataclasses.replace(
        mixed, latitude=-mixed.latitude, northward_wind=-mixed.northward_wind
    )
    one, other = fit(mixed), fit(mirrored)
    swapped = {
        "geostrophic_northward_wind": "geostrophic_northward_wind",
        "geostrophic_northward_wind_low": "geostrophic_northward_wind_high",
        "geostrophic_northward_wind_high": "geostrophic_northward_wind_low",
        "rotation": "rotation",
        "coriolis_parameter": "coriolis_parameter",
    }
    for name in labels(one):
        value = getattr(other, swapped.get(name, name))
        assert same(getattr(one, name), -value if name in swapped else value), name


def test_a_stack_gives_what_its_profiles_give_alone(mixed: Stack) -> None:
    together = fit(mixed)
    for row in range(mixed.profile_count):
        alone = fit(mixed.select([row]))
        for name in labels(together):
            assert same(getattr(together, name)[row : row + 1], getattr(alone, name)), name


def test_a_missing_level_changes_nothing(mixed: Stack) -> None:
    widened = {
        field.name: np.insert(getattr(mixed, field.name), 5, np.nan, axis=1)
        for field in dataclasses.fields(mixed)
        if field.name in ("height", "eastward_wind", "northward_wind")
    }
    plain = Stack.of(
        height=mixed.height, eastward_wind=mixed.eastward_wind,
        northward_wind=mixed.northward_wind, latitude=mixed.latitude,
    )  # fmt: skip
    one, other = fit(plain), fit(Stack.of(**widened, latitude=mixed.latitude))
    for name in labels(one):
        assert same(getattr(one, name), getattr(other, name)), name


def test_turning_the_wind_turns_the_answer(mixed: Stack) -> None:
    c, s = np.cos(1.234), np.sin(1.234)
    u, v = mixed.eastward_wind, mixed.northward_wind
    turned = dataclasses.replace(mixed, eastward_wind=c * u - s * v, northward_wind=s * u + c * v)
    one, other = fit(mixed), fit(turned)
    for name in ("friction_velocity", "depth", "roughness_length", "cross_isobar_angle", "rms"):
        np.testing.assert_allclose(getattr(other, name), getattr(one, name), rtol=1e-4)
    east, north = one.geostrophic_eastward_wind, one.geostrophic_northward_wind
    np.testing.assert_allclose(other.geostrophic_eastward_wind, c * east - s * north, atol=1e-3)
    np.testing.assert_allclose(other.geostrophic_northward_wind, s * east + c * north, atol=1e-3)


def test_near_the_equator_it_declines(mixed: Stack) -> None:
    found = fit(mixed)
    coriolis = earth.coriolis(mixed)
    assert not coriolis.applies[-1]
    assert found.verdict[-1] == "not determined"
    assert found.why[-1] == coriolis.why[-1] != ""
    for name in NUMBERS:
        assert np.isnan(getattr(found, name)[-1])


HOSTILE = {
    "no wind": (Z, 0.0 * Z, 0.0 * Z),
    "one wind at all heights": (Z, 0.0 * Z + 7.0, 0.0 * Z),
    "a straight line": (Z, 5.0 + 0.001 * Z, 1.0 - 0.002 * Z),
    "one level": (np.array([10.0]), np.array([5.0]), np.array([1.0])),
    "nothing": (np.full(4, np.nan), np.full(4, np.nan), np.full(4, np.nan)),
    "infinite": (Z, np.where(Z > 300, np.inf, 5.0), 0.0 * Z),
    "all but infinite": (Z, 1e300 * np.sin(Z), 1e300 * np.cos(Z)),
    "all but nothing": (Z, 1e-310 * np.sin(Z), 1e-310 * np.cos(Z)),
    "at one height": (np.full(12, 50.0), np.arange(12.0), np.arange(12.0)),
    "below the ground": (Z - 2000.0, Z / 100.0, Z / 200.0),
    "on the ground": (np.linspace(0.0, 1e-6, 20), np.linspace(0, 5, 20), np.linspace(0, 1, 20)),
    "noise": (Z, np.random.default_rng(1).normal(size=Z.size), 0.1 * Z % 1.3),
}


@pytest.mark.parametrize("name", HOSTILE)
@pytest.mark.parametrize("given", [None, 0.03])
def test_hostile_numbers_get_a_reason(name: str, given: float | None) -> None:
    z, u, v = HOSTILE[name]
    stack = Stack.of(height=z, eastward_wind=u, northward_wind=v, latitude=45.0)
    found = fit(stack, roughness_length=given)
    assert found.verdict[0] == "not determined"
    assert found.why[0] != ""
    for number in NUMBERS:
        assert np.isnan(getattr(found, number)[0])
    assert np.isnan(viscosity_profile.wind(found, Z)).all()


def test_no_profile_gives_no_answer() -> None:
    found = fit(noisy(synthetic.solve(), 52.0, 1).select([]))
    assert found.verdict.size == 0


def test_a_roughness_that_cannot_be_is_refused(mixed: Stack) -> None:
    with pytest.raises(ValueError, match="a roughness length must be above 0 m"):
        fit(mixed, roughness_length=0.0)
    with pytest.raises(ValueError, match="no viscosity has a shape of"):
        fit(mixed, shapes=("flat",))


def test_a_profile_that_ends_inside_the_layer_is_not_trusted() -> None:
    truth = synthetic.solve(15.0, 52.0, 0.1, synthetic.cubic(1500.0))
    found = fit(truth.stack(np.arange(20.0, 401.0, 20.0), 52.0), error=0.3)
    assert found.verdict[0] != "well determined"


def test_leipzig() -> None:
    """
    Lettau (1950) by his balance: u* about 0.65 m/s, 26 degrees (second-hand, checks section 1).

    A curve smoothed by hand is not noise about a law, and no shape of the viscosity follows it: the
    fit says that it is only weakly determined, and its u* is 19 % high. With the roughness left
    free as well it withholds the numbers.
    """
    stack = Stack.of(
        height=leipzig.Z, eastward_wind=leipzig.U, northward_wind=leipzig.V, latitude=51.0
    )
    found = fit(stack, error=0.2, roughness_length=0.3)
    assert found.shape[0] == "fourth power"
    assert found.friction_velocity[0] == pytest.approx(0.65, abs=0.14)
    assert found.cross_isobar_angle[0] == pytest.approx(26.0, abs=2.0)
    assert found.verdict[0] == "weakly determined"
    assert fit(stack, error=0.2).verdict[0] != "well determined"


@pytest.mark.parametrize("shear", [1e-3, 2e-3, -3e-3, 3e-3j, -3e-3j])
def test_a_geostrophic_wind_that_changes_with_height_is_not_taken_for_friction(
    shear: complex,
) -> None:
    truth = synthetic.solve(10.0, 52.0, 0.05, synthetic.cubic(700.0), shear=shear)
    z = np.arange(20.0, 2001.0, 30.0)
    noise = synthetic.correlated_noise(np.random.default_rng(3), z, 0.3, 0.0, 50)
    found = fit(truth.stack(z, 52.0, noise), error=0.2)
    assert not (found.verdict == "well determined").any()
    told = found.verdict != "not determined"
    inside = found.friction_velocity_low <= truth.u_star
    inside &= truth.u_star <= found.friction_velocity_high
    assert inside[told].sum() >= 0.9 * told.sum()


@pytest.mark.slow
def test_intervals_hold_what_they_say() -> None:
    random = np.random.default_rng(5)
    held: dict[str, list[Any]] = {name: [] for name in NUMBERS}
    surveys = (
        (np.arange(20.0, 2001.0, 30.0), 0.3, 0.0),
        (np.arange(20.0, 1501.0, 25.0), 0.3, 100.0),
        (np.arange(40.0, 2001.0, 40.0), 0.5, 200.0),
        (np.arange(20.0, 1501.0, 60.0), 0.5, 100.0),
    )
    told = total = 0
    for viscosity, speed, roughness, depth in CASES.values():
        truth = synthetic.solve(speed, 52.0, roughness, viscosity)
        values = (truth.u_star, roughness, depth, truth.cross_isobar_angle, speed, 0.0)
        for z, error, length in surveys:
            noise = synthetic.correlated_noise(random, z, error, length, 100)
            found = fit(truth.stack(z, 52.0, noise))
            good = found.verdict != "not determined"
            told, total = told + good.sum(), total + good.size
            for name, value in zip(NUMBERS, values, strict=True):
                inside = getattr(found, f"{name}_low") <= value
                inside &= value <= getattr(found, f"{name}_high")
                held[name].append(inside[good])
    assert told > 0.97 * total
    for name in NUMBERS:
        assert 0.92 <= np.concatenate(held[name]).mean() <= 0.98, name
