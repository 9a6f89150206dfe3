"""The stress that a departure needs, against known layers; and what contradicts itself."""

from __future__ import annotations

import dataclasses
from typing import Any

import leipzig
import numpy as np
import pytest
import synthetic

from backveer.profiles.earth import coriolis
from backveer.profiles.labels import labels
from backveer.profiles.stack import Stack
from backveer.profiles.stress_profile import StressProfile, stress_profile

Z = np.arange(10.0, 1501.0, 20.0)
SPEED, DEPTH = 10.0, 750.0


@pytest.fixture(scope="module")
def truth() -> synthetic.Truth:
    return synthetic.solve(SPEED, 52.0, 0.05, synthetic.cubic(700.0))


def stress(stack: Stack, geostrophic: Any = SPEED, depth: float = DEPTH, **more: Any) -> Any:
    count = stack.profile_count
    wind = np.broadcast_to(np.asarray(geostrophic, dtype=complex), (count,))
    return stress_profile(stack, coriolis(stack), wind, np.full(count, depth), **more)


def test_stress_and_viscosity_are_those_of_the_layer(truth: synthetic.Truth) -> None:
    found = stress(truth.stack(Z, 52.0), geostrophic_error=0.01, error=0.01)
    assert found.verdict[0] == "consistent"
    assert found.friction_velocity[0] == pytest.approx(truth.u_star, rel=0.005)
    assert found.cross_isobar_angle[0] == pytest.approx(truth.cross_isobar_angle, abs=0.3)
    # The lowest wind, at 10 m, still lies along the stress within a degree.
    assert found.stress_from_wind[0] == pytest.approx(0.0, abs=1.5)
    middle = 0.5 * (found.layer_base + found.layer_top)[0]
    known = truth.stress(middle)
    np.testing.assert_allclose(found.layer_stress_eastward[0], known.real, atol=1e-3)
    np.testing.assert_allclose(found.layer_stress_northward[0], known.imag, atol=1e-3)
    viscosity = synthetic.cubic(700.0)(middle, truth.u_star)
    # Not the lowest layer, whose mean shear is that of a logarithm; at the top there is none.
    np.testing.assert_allclose(found.layer_viscosity[0, 1:4], viscosity[1:4], rtol=0.05)
    assert (np.abs(found.layer_stress_from_shear[0, 1:4]) < 6.0).all()
    assert found.departure_above[0] < 0.05


@pytest.mark.parametrize(("error", "length"), [(0.2, 0.0), (0.3, 100.0)])
def test_errors_hold_what_they_say(truth: synthetic.Truth, error: float, length: float) -> None:
    random = np.random.default_rng(1)
    noise = synthetic.correlated_noise(random, Z, error, length, 500)
    exact = stress(truth.stack(Z, 52.0))
    found = stress(truth.stack(Z, 52.0, noise), error=error, noise_length=length)
    off = np.abs(found.friction_velocity - truth.u_star) < 1.96 * found.friction_velocity_error
    assert 0.92 <= off.mean() <= 0.985
    off = np.abs(found.cross_isobar_angle - truth.cross_isobar_angle)
    assert 0.92 <= (off < 1.96 * found.cross_isobar_angle_error).mean() <= 0.985
    known = exact.layer_viscosity
    told = np.isfinite(found.layer_viscosity_low)
    assert told[:, :3].all()
    assert not told[:, 4].any()
    held = (found.layer_viscosity_low <= known) & (known <= found.layer_viscosity_high)
    assert 0.92 <= held[told].mean() <= 0.985
    # Where one number is told for all, it is right on the average.
    told_to_all = np.isfinite(found.layer_viscosity).all(axis=0)
    middling = np.median(found.layer_viscosity[:, told_to_all], axis=0)
    np.testing.assert_allclose(middling, known[0, told_to_all], rtol=0.05)


def test_a_wrong_geostrophic_wind_is_found_out(truth: synthetic.Truth) -> None:
    plain = {"error": 0.1, "geostrophic_error": 0.1}
    turned = stress(truth.stack(Z, 52.0), SPEED * np.exp(0.5j), **plain)
    assert turned.verdict[0] == "contradictory"
    assert turned.why[0].startswith("the surface stress lies")
    assert turned.why[0].endswith("degrees off the surface wind")
    shallow = stress(truth.stack(Z, 52.0), depth=350.0, **plain)
    assert shallow.verdict[0] == "contradictory"
    assert "the stress does not vanish aloft: a departure of" in shallow.why[0]


def test_a_stress_against_the_shear_is_found_out() -> None:
    # A jet: above it the wind falls off toward a geostrophic wind that is lower still.
    speed = np.interp(Z, [10.0, 300.0, 700.0, 1500.0], [5.0, 12.0, 10.0, 10.0])
    wind = speed * np.exp(1j * np.interp(Z, [10.0, 550.0, 720.0], [0.4, 0.35, 0.0]))
    stack = Stack.of(height=Z, eastward_wind=wind.real, northward_wind=wind.imag, latitude=52.0)
    found = stress(stack, error=0.05, geostrophic_error=0.05)
    assert found.verdict[0] == "contradictory"
    assert found.why[0] == "the stress points against the shear in 2 layers"


@pytest.fixture(scope="module")
def mixed(truth: synthetic.Truth) -> Stack:
    random = np.random.default_rng(4)
    return Stack.concatenate(
        [
            truth.stack(Z, 52.0, synthetic.correlated_noise(random, Z, 0.2, 50.0, 5)),
            truth.stack(Z[:52], -35.0, synthetic.correlated_noise(random, Z[:52], 0.2, 50.0, 4)),
            truth.stack(Z[:52], 1.0),
        ]
    )


def same(one: Any, other: Any) -> bool:
    one, other = np.asarray(one), np.asarray(other)
    return np.array_equal(one, other, equal_nan=one.dtype != object)


def test_the_southern_hemisphere_is_the_mirror_image(mixed: Stack) -> None:
    more = {"error": 0.2, "noise_length": 50.0}
    one = stress(mixed, 10.0 - 2.0j, **more)
    flipped = dataclasses.replace(
        mixed, latitude=-mixed.latitude, northward_wind=-mixed.northward_wind
    )
    other = stress(flipped, 10.0 + 2.0j, **more)
    swapped = {
        "surface_stress_northward", "stress_from_wind", "layer_stress_northward",
        "layer_stress_from_shear",
    }  # fmt: skip
    assert (one.verdict != "not determined").any()
    for name in labels(one):
        value = getattr(other, name)
        assert same(getattr(one, name), -value if name in swapped else value), name


def test_a_stack_gives_what_its_profiles_give_alone(mixed: Stack) -> None:
    more = {"error": 0.2, "noise_length": 50.0}
    together = stress(mixed, 9.0 + 1.0j, **more)
    for row in range(mixed.profile_count):
        alone = stress(mixed.select([row]), 9.0 + 1.0j, **more)
        for name in labels(together):
            assert same(getattr(together, name)[row : row + 1], getattr(alone, name)), name


def test_a_missing_level_changes_nothing(mixed: Stack) -> None:
    def of(put: Any) -> StressProfile:
        stack = Stack.of(
            height=put(mixed.height), eastward_wind=put(mixed.eastward_wind),
            northward_wind=put(mixed.northward_wind), latitude=mixed.latitude,
        )  # fmt: skip
        return stress(stack, 9.0 + 1.0j, error=0.2)

    one, other = of(lambda x: x), of(lambda x: np.insert(x, 7, np.nan, axis=1))
    for name in labels(one):
        assert same(getattr(one, name), getattr(other, name)), name


def test_turning_the_wind_turns_the_answer(mixed: Stack) -> None:
    turn = np.exp(0.77j)
    wind = (mixed.eastward_wind + 1j * mixed.northward_wind) * turn
    turned = dataclasses.replace(mixed, eastward_wind=wind.real, northward_wind=wind.imag)
    one, other = stress(mixed, error=0.2), stress(turned, SPEED * turn, error=0.2)
    before = one.layer_stress_eastward + 1j * one.layer_stress_northward
    after = other.layer_stress_eastward + 1j * other.layer_stress_northward
    np.testing.assert_allclose(after, before * turn, atol=1e-12)
    for name in ("friction_velocity", "cross_isobar_angle", "layer_viscosity_low"):
        np.testing.assert_allclose(getattr(one, name), getattr(other, name), rtol=1e-9)


def test_what_is_not_known_is_said(truth: synthetic.Truth, mixed: Stack) -> None:
    stack = truth.stack(Z, 52.0)
    for found, why in (
        (stress(stack, np.nan), "the geostrophic wind is not known"),
        (stress(stack, depth=np.nan), "the depth of the boundary layer is not known"),
        (stress(stack, depth=50.0), "fewer than five levels with wind lie within the layer"),
        (stress(stack, depth=2000.0), "the profile ends below the top of the boundary layer"),
        (stress(truth.stack(Z + 200.0, 52.0)), "the lowest wind is too high above the ground"),
        (stress(stack, error=20.0), "the surface stress is smaller than its error"),
        (stress(mixed.select([-1])), coriolis(mixed).why[-1]),
    ):
        assert (found.verdict[0], found.why[0]) == ("not determined", why)
        assert np.isnan(found.friction_velocity[0])
        assert np.isnan(found.layer_viscosity_high[0]).all()


@pytest.mark.parametrize(
    "wind",
    [np.full(Z.shape, np.nan), np.full(Z.shape, np.inf), 1e300 * Z, 0.0 * Z, 1e-310 * Z],
    ids=["missing", "infinite", "huge", "none", "tiny"],
)
def test_hostile_numbers_get_a_reason(wind: Any) -> None:
    stack = Stack.of(height=Z, eastward_wind=wind, northward_wind=0.5 * wind, latitude=40.0)
    for geostrophic in (10.0, 0.0, np.inf, 1e308):
        found = stress(stack, geostrophic, error=0.2)
        assert found.why[0] != ""
    assert stress(stack.select([])).verdict.size == 0


def test_leipzig() -> None:
    """
    Lettau (1950): u* about 0.65 m/s and 26 degrees (second-hand, checks section 1).

    His angle is that of the lowest wind, 25.4 degrees at 50 m; the integral needs a little more.
    """
    stack = Stack.of(
        height=leipzig.Z, eastward_wind=leipzig.U, northward_wind=leipzig.V, latitude=51.0
    )
    found = stress(stack, 17.5, 950.0, error=0.2, geostrophic_error=0.3, noise_length=100.0)
    assert found.verdict[0] == "consistent"
    assert found.friction_velocity[0] == pytest.approx(0.65, abs=0.03)
    assert found.cross_isobar_angle[0] == pytest.approx(26.0, abs=4.0)
    # A viscosity that is largest in the lower half.
    assert np.nanargmax(found.layer_viscosity[0]) in (0, 1)
