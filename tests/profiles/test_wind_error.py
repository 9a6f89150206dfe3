"""The wind's error: known noise is found again, structure is not taken for it, rounding is seen."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import wind_error as room
from backveer.profiles.stack import Stack, wind_components
from backveer.profiles.wind_error import rounding_error, small_scale_scatter, wind_error

KNOT = 0.514444  # [m s-1] exactly 1852 / 3600


def spiral(z):
    """Give an Ekman spiral of 12 m/s over a depth of 300 m: real structure, no error."""
    wave = 12.0 * (1.0 - np.exp(-(1 + 1j) * z / 300.0))
    return wave.real, wave.imag


@pytest.mark.parametrize("sigma", [0.2, 0.5, 1.5])
def test_white_noise_on_uneven_levels_is_found_again(sigma):
    rng = np.random.default_rng(7)
    z = np.cumsum(rng.uniform(10.0, 60.0, (400, 50)), axis=1)
    u, v = spiral(z)
    noise = rng.normal(0.0, sigma, (2, *z.shape))
    found = wind_error(Stack.of(height=z, eastward_wind=u + noise[0], northward_wind=v + noise[1]))
    assert np.median(found) == pytest.approx(sigma, rel=0.05)
    assert np.std(found) < 0.2 * sigma


def test_smooth_structure_is_no_error():
    z = np.arange(20.0, 1500.0, 30.0)
    u, v = spiral(z)
    assert wind_error(Stack.of(height=z, eastward_wind=u, northward_wind=v))[0] == room.FLOOR


def test_outliers_hardly_move_it():
    rng = np.random.default_rng(2)
    z = np.arange(20.0, 1220.0, 20.0)
    noise = rng.normal(0.0, 0.4, (2, 200, 60))
    u, v = 8.0 + noise[0], noise[1]
    clean = np.median(small_scale_scatter(np.broadcast_to(z, u.shape), u, v))
    u[:, [10, 30]] += 15.0
    spoiled = np.median(small_scale_scatter(np.broadcast_to(z, u.shape), u, v))
    assert spoiled == pytest.approx(clean, rel=0.2)


def test_a_given_error_is_taken_where_it_makes_sense():
    stack = Stack.of(
        height=np.array([10.0, 20.0]),
        eastward_wind=5.0,
        northward_wind=1.0,
        wind_error=np.array([0.7, np.nan, 0.0, -1.0, np.inf]),
    )
    assert wind_error(stack).tolist() == [0.7] + 4 * [room.DEFAULT]


def test_few_or_distant_levels_leave_the_default():
    coarse = np.arange(6) * 900.0 + 10.0
    u = np.array([3.0, 11.0, 5.0, 18.0, 6.0, 25.0])
    assert wind_error(Stack.of(height=coarse, eastward_wind=u, northward_wind=0.3))[0] == 0.5
    assert wind_error(Stack.of(height=coarse / 20, eastward_wind=u, northward_wind=0.3))[0] == 0.5
    assert wind_error(Stack.of(height=[], eastward_wind=[]))[0] == 0.5
    assert wind_error(Stack.of(profiles=0)).shape == (0,)


def test_noise_beyond_any_sensor_is_cut_off():
    rng = np.random.default_rng(4)
    u, v = rng.normal(0.0, 12.0, (2, 1, 40))
    z = np.arange(40) * 20.0
    assert wind_error(Stack.of(height=z, eastward_wind=u, northward_wind=v))[0] == room.CEILING


def rounded(speed, direction, speed_step, direction_step):
    speed = np.round(speed / speed_step) * speed_step
    return wind_components(speed, np.round(direction / direction_step) * direction_step)


def test_rounded_directions_and_speeds_are_seen():
    speed = np.array([5.3, 8.1, 10.9, 13.4, 15.2, 15.9])
    direction = np.array([231.0, 238.0, 244.0, 251.0, 256.0, 262.0])
    u, v = rounded(speed, direction, 0.001, 10.0)
    rms = math.sqrt(np.mean(np.hypot(u, v) ** 2))
    expected = math.radians(10.0) / math.sqrt(12.0) * rms
    assert rounding_error(u[np.newaxis], v[np.newaxis])[0] == pytest.approx(expected)
    # whole knots alone, with directions to a thousandth
    u, v = rounded(speed, direction * 1.0123, KNOT, 0.0007)
    assert rounding_error(u[np.newaxis], v[np.newaxis])[0] == pytest.approx(KNOT / math.sqrt(12.0))
    u, v = rounded(speed, direction * 1.0123, 0.0007, 0.0007)
    assert rounding_error(u[np.newaxis], v[np.newaxis])[0] == 0.0


def test_rounding_is_the_scatter_that_it_makes():
    rng = np.random.default_rng(9)
    direction, speed = rng.uniform(0, 360, 20_000), np.full(20_000, 12.0)
    u, v = wind_components(speed, direction)
    coarse_u, coarse_v = wind_components(speed, np.round(direction / 10) * 10)
    across = np.sqrt(np.mean((coarse_u - u) ** 2 + (coarse_v - v) ** 2))
    stated = rounding_error(coarse_u[np.newaxis], coarse_v[np.newaxis])[0]
    assert stated == pytest.approx(across, rel=0.02)


def test_one_direction_all_the_way_is_no_sign_of_rounding():
    u, v = wind_components(np.array([[3.7, 5.2, 6.6, 8.3]]), np.full((1, 4), 230.0))
    assert rounding_error(u, v)[0] == 0.0


@given(st.integers(0, 10_000), st.floats(0, 360))
def test_mirror_and_rotation(seed, angle):
    rng = np.random.default_rng(seed)
    z = np.cumsum(rng.uniform(10.0, 200.0, (3, 15)), axis=1)
    directions = np.round(rng.uniform(0, 36, z.shape)) * 10.0
    u, v = wind_components(rng.uniform(1, 20, z.shape), directions)
    plain = wind_error(Stack.of(height=z, eastward_wind=u, northward_wind=v))
    mirrored = wind_error(Stack.of(height=z, eastward_wind=u, northward_wind=-v))
    assert np.array_equal(plain, mirrored)
    c, s = math.cos(math.radians(angle)), math.sin(math.radians(angle))
    turned = Stack.of(height=z, eastward_wind=c * u - s * v, northward_wind=s * u + c * v)
    assert np.allclose(wind_error(turned), plain, rtol=1e-9)


@given(st.integers(0, 10_000), st.integers(0, 15))
def test_a_stack_and_a_missing_level_change_no_bit(seed, gap):
    rng = np.random.default_rng(seed)
    z = np.cumsum(rng.uniform(10.0, 200.0, (3, 15)), axis=1)
    u, v = rng.normal(5.0, 3.0, (2, 3, 15))
    u[0, 9:], v[1, 3] = np.nan, np.inf
    whole = wind_error(Stack.of(height=z, eastward_wind=u, northward_wind=v))
    for i in range(3):
        alone = Stack.of(
            height=np.insert(z[i], gap, np.nan),
            eastward_wind=np.insert(u[i], gap, np.nan),
            northward_wind=np.insert(v[i], gap, np.nan),
        )
        assert wind_error(alone)[0] == whole[i]
