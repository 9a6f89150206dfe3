"""Headwind, crosswind and their change along a path."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.profiles.flight_path import crosswind, flight_path, headwind
from backveer.profiles.low_level_shear import FOOT, KNOT
from backveer.profiles.shear_criteria import Rule, judge, strongest_shear
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


def test_too_few_levels_and_bad_speeds():
    path = flight_path(profile([33], [268], [8]), np.array([268.0]))
    assert path.why[0] == "there are fewer than two usable winds up to 610 m above ground"
    assert np.isnan(path.approach_change).all()
    with pytest.raises(ValueError, match="must be positive"):
        flight_path(profile([33], [268], [8]), np.array([268.0]), ground_speed=0.0)


def rule(metric, threshold, top=2000 * FOOT, depth=0.0, **more):
    return Rule("rule", "", "", "", "", metric, threshold, "", top, depth, **more)


def test_rules_measure_what_they_name():
    stack = profile([33, 533, 2000], [268, 268, 268], [10, 30, 30])
    rules = (
        rule("headwind_change", 15 * KNOT),
        rule("vector_difference", 21 * KNOT),
        rule("speed_difference", 20 * KNOT),
        rule("speed_difference", 20 * KNOT, strict=True),
        rule("shear", 0.01),
        rule("shear", 0.01, depth=1000 * FOOT),
    )
    answer = judge(stack, rules, headings=np.array([268.0, 358.0]))
    assert answer.met[0].tolist() == [True, False, True, False, True, True]
    np.testing.assert_allclose(answer.value[0, :4] / KNOT, 20.0)
    assert answer.margin[0, 1] / KNOT == pytest.approx(-1)
    # Over 1000 ft the 20 kt of the lowest 500 ft are spread: 20 kt / 1000 ft.
    assert answer.value[0, 5] == pytest.approx(20 * KNOT / (1000 * FOOT))


def test_without_a_runway_the_worst_heading_counts():
    stack = profile([33, 533], [268, 178], [10, 10])
    assert judge(stack, (rule("headwind_change", 1.0),)).value[0, 0] == pytest.approx(
        10 * KNOT * 2**0.5
    )


def test_a_rule_that_cannot_be_judged_is_not_passed_in_silence():
    answer = judge(profile([33], [268], [10]), (rule("shear", 0.01),))
    assert not answer.met[0, 0]
    assert answer.why[0, 0] == "there are fewer than two usable winds up to 610 m"
    high = judge(profile([400, 900], [268, 268], [10, 20]), (rule("vector_difference", 0.01),))
    assert "above the surface layer" in high.why[0, 0]
    with pytest.raises(ValueError, match="metric 'gust'"):
        judge(profile([33], [268], [10]), (rule("gust", 1.0),))


def test_strongest_shear_over_a_depth_against_a_fine_search():
    rng = np.random.default_rng(5)
    z = np.cumsum(rng.uniform(5, 40, 30))
    w = np.cumsum(rng.normal(size=30) + 1j * rng.normal(size=30))
    depth = 61.0
    base = np.linspace(z[0], z[-1] - depth, 400001)
    wind = np.interp(base + depth, z, w) - np.interp(base, z, w)
    fine = np.abs(wind).max() / depth
    ours = strongest_shear(z, w, depth)
    assert ours == pytest.approx(fine, rel=1e-5)
    assert ours >= fine * (1 - 1e-12)
