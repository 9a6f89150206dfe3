"""Headwind, crosswind and their change along a path."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.profiles.flight_path import crosswind, flight_path, headwind
from backveer.profiles.low_level_shear import FOOT, KNOT
from backveer.profiles.stack import Stack, wind_components


def profile(feet, directions, knots):
    u, v = wind_components(np.array(knots) * KNOT, np.array(directions, dtype=float))
    return Stack.of(height=np.array([feet]) * FOOT, eastward_wind=[u], northward_wind=[v])


@pytest.mark.parametrize(
    ("wind", "heading", "along", "across"),
    [
        # By geometry, common practice: a wind from 30 degrees right of the nose at 20 kt has a
        # headwind of 20 cos 30 = 17.3 kt and a crosswind of 20 sin 30 = 10 kt from the right.
        ((298, 20), 268, 17.32, 10.0),
        ((238, 20), 268, 17.32, -10.0),
        ((88, 20), 268, -20.0, 0.0),
        ((360, 10), 90, 0.0, -10.0),
    ],
)
def test_components_along_a_runway(wind, heading, along, across):
    u, v = wind_components(np.array(wind[1] * 1.0), np.array(wind[0] * 1.0))
    assert headwind(u, v, heading) == pytest.approx(along, abs=0.005)
    assert crosswind(u, v, heading) == pytest.approx(across, abs=0.005)


def test_descending_out_of_a_jet_loses_headwind():
    stack = profile([33, 500, 1000, 2000], [268] * 4, [8, 30, 45, 40])
    path = flight_path(stack, np.array([268.0, 88.0]))
    # From 40 kt at 2000 ft to 8 kt at the ground, along 268; the other way round a tailwind falls.
    np.testing.assert_allclose(path.approach_change[0] / KNOT, [-32, 32], atol=1e-9)
    np.testing.assert_allclose(path.departure_change[0] / KNOT, [32, -32], atol=1e-9)
    np.testing.assert_allclose(path.largest_loss[0] / KNOT, [37, 5], atol=1e-9)
    np.testing.assert_allclose(path.largest_gain[0] / KNOT, [5, 37], atol=1e-9)
    assert path.approach_worst_base[0, 0] / FOOT == pytest.approx(33)
    # Loss of headwind is loss of energy: F positive. By hand: 22 kt over 467 ft at 140 kt and
    # 3 degrees: 140 kt tan 3 = 3.7745 m/s sink; 11.318 m/s / 142.34 m = 0.079513 s-1;
    # 0.30013 m s-2; / 9.80665 = 0.030604.
    assert path.approach_worst_per_second[0, 0] == pytest.approx(-0.30013, rel=1e-4)
    assert path.approach_f_factor[0, 0] == pytest.approx(0.030604, rel=1e-4)


def test_the_worst_is_over_a_hundred_feet_not_between_noisy_neighbours():
    # 2 kt between levels 10 ft apart are 20 kt per 100 ft of noise; over 100 ft they are 2 kt, less
    # than the 4 kt per 100 ft higher up.
    stack = profile([33, 500, 510, 1000, 1250], [268] * 5, [10, 10, 12, 12, 22])
    path = flight_path(stack, np.array([268.0]))
    per_100_ft = KNOT / (100 * FOOT)
    assert path.departure_worst_rate[0, 0] / per_100_ft == pytest.approx(4)
    assert path.approach_worst_base[0, 0] / FOOT == pytest.approx(1000)
    assert path.approach_worst_top[0, 0] / FOOT == pytest.approx(1100)
    assert path.path_base[0] / FOOT == pytest.approx(33)
    assert path.path_top[0] / FOOT == pytest.approx(1250)
    thin = flight_path(profile([33, 43], [268, 268], [10, 12]), np.array([268.0, 88.0]))
    np.testing.assert_allclose(thin.departure_worst_rate[0] / per_100_ft, [20, -20])


def test_too_few_levels_and_bad_speeds():
    path = flight_path(profile([33], [268], [8]), np.array([268.0]))
    assert path.why[0] == "there are fewer than two usable winds up to 2000 ft (610 m) above ground"
    assert np.isnan(path.approach_change).all()
    with pytest.raises(ValueError, match="must be positive"):
        flight_path(profile([33], [268], [8]), np.array([268.0]), ground_speed=0.0)
