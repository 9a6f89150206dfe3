"""Criteria: what each metric measures, when a rule is met, and what its value is worth."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.profiles.low_level_shear import FOOT, KNOT
from backveer.profiles.shear_criteria import Rule, judge
from backveer.profiles.sliding_layer import measured_between, strongest_layer
from backveer.profiles.stack import Stack, wind_components


def profile(feet, directions, knots):
    u, v = wind_components(np.array(knots) * KNOT, np.array(directions, dtype=float))
    return Stack.of(height=np.array([feet]) * FOOT, eastward_wind=[u], northward_wind=[v])


def hold(stack, rules, headings=None, error=0.3):
    return judge(stack, rules, np.full(stack.profile_count, error), headings)


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
    answer = hold(stack, rules, headings=np.array([268.0, 358.0]))
    assert answer.met[0].tolist() == [True, False, True, False, True, True]
    np.testing.assert_allclose(answer.value[0, :4] / KNOT, 20.0)
    assert answer.margin[0, 1] / KNOT == pytest.approx(-1)
    # Over 1000 ft the 20 kt of the lowest 500 ft are spread: 20 kt / 1000 ft.
    assert answer.value[0, 5] == pytest.approx(20 * KNOT / (1000 * FOOT))


def test_without_a_runway_the_worst_heading_counts():
    stack = profile([33, 533], [268, 178], [10, 10])
    assert hold(stack, (rule("headwind_change", 1.0),)).value[0, 0] == pytest.approx(
        10 * KNOT * 2**0.5
    )


def test_a_rule_that_cannot_be_judged_is_not_passed_in_silence():
    answer = hold(profile([33], [268], [10]), (rule("shear", 0.01),))
    assert not answer.met[0, 0]
    assert answer.why[0, 0] == "there are fewer than two usable winds up to 2000 ft (610 m)"
    high = hold(profile([400, 900], [268, 268], [10, 20]), (rule("vector_difference", 0.01),))
    assert "above the surface layer" in high.why[0, 0]
    with pytest.raises(ValueError, match="metric 'gust'"):
        hold(profile([33], [268], [10]), (rule("gust", 1.0),))


def test_strongest_layer_of_a_depth_against_a_fine_search():
    rng = np.random.default_rng(5)
    z = np.cumsum(rng.uniform(5, 40, 30))
    w = np.cumsum(rng.normal(size=30) + 1j * rng.normal(size=30))
    depth = 61.0
    base = np.linspace(z[0], z[-1] - depth, 400001)
    wind = np.interp(base + depth, z, w) - np.interp(base, z, w)
    fine = np.abs(wind).max() / depth
    base, top, difference = strongest_layer(z, w, depth)
    assert top - base == pytest.approx(depth)
    ours = np.abs(difference) / depth
    assert ours == pytest.approx(fine, rel=1e-5)
    assert ours >= fine * (1 - 1e-12)


def test_a_value_carries_its_error_and_says_what_the_winds_do_not_span():
    rules = (
        rule("headwind_change", 15 * KNOT),
        rule("shear", 0.01, depth=200 * FOOT),
        rule("headwind_change", 15 * KNOT, top=500 * FOOT),
    )
    answer = hold(profile([33, 500, 700], [268, 268, 268], [10, 12, 13]), rules)
    assert answer.span[0].tolist() == [
        "the winds end below the rule's top",
        "the winds end below the rule's top",
        "",
    ]
    assert answer.lower_bound[0].tolist() == [True, True, False]
    assert not answer.met.any()
    # Two components of 0.3 m/s each; over a layer of 200 ft between levels 200 ft apart.
    root = 0.3 * 2**0.5
    np.testing.assert_allclose(answer.error[0], [root, root / (200 * FOOT), root], rtol=1e-9)
    high = hold(profile([300, 700], [268, 268], [10, 12]), rules)
    assert high.span[0, 0] == "the winds begin above the surface layer and end below the rule's top"
    assert high.span[0, 2] == "the winds begin above the surface layer"
    coarse = hold(profile([33, 2000], [268, 268], [10, 40]), rules)
    assert coarse.span[0, 1] == "levels are farther apart than the rule's depth"


def test_no_rules_and_no_profiles():
    assert hold(profile([33, 500], [1, 1], [1, 2]), ()).met.shape == (1, 0)
    assert hold(Stack.of(profiles=0), (rule("shear", 0.01),)).met.shape == (0, 1)


def test_where_a_layer_was_measured():
    z = np.array([10.0, 50, 200])
    below, above, widest, inside = measured_between(z, np.array([20.0, 10]), np.array([40.0, 60]))
    assert (below.tolist(), above.tolist()) == ([10, 10], [50, 200])
    assert (widest.tolist(), inside.tolist()) == ([40, 150], [False, True])


def test_a_stack_is_its_profiles_bit_for_bit():
    rules = (
        rule("headwind_change", 5.0),
        rule("vector_difference", 5.0),
        rule("speed_difference", 5.0),
        rule("shear", 0.02, depth=100 * FOOT),
        rule("shear", 0.02),
    )
    stacks = [
        profile([33, 500, 700], [268, 200, 268], [10, 12, 33]),
        profile([300, 2000], [10, 40], [5, 45]),
        profile([33], [268], [10]),
        profile([33, 80, 120, 1500, 3000], [268, 269, 270, 275, 290], [8, 9, 13, 40, 50]),
    ]
    whole = hold(Stack.concatenate(stacks), rules)
    for row, stack in enumerate(stacks):
        one = hold(stack, rules)
        for name in ("value", "met", "margin", "error", "lower_bound", "span", "why"):
            np.testing.assert_array_equal(getattr(whole, name)[row], getattr(one, name)[0])
