"""Low-level shear against published examples, and its properties."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles.labels import labels
from backveer.profiles.low_level_shear import (
    FOOT,
    KNOT,
    KNOT_PER_100_FEET,
    LowLevelShear,
    intensity,
    low_level_shear,
)
from backveer.profiles.stack import Stack, wind_components


def profile(feet, directions, knots, **more):
    u, v = wind_components(np.array(knots) * KNOT, np.array(directions, dtype=float))
    return Stack.of(height=np.array([feet]) * FOOT, eastward_wind=[u], northward_wind=[v], **more)


def shear_of(stack, **options):
    return low_level_shear(stack, np.full(stack.profile_count, 0.3), **options)


def test_units_of_shear():
    # Derived from the exact foot and knot (checks V2c): 1 kt/100 ft = 0.0168781 s-1.
    assert pytest.approx(0.0168781, abs=5e-8) == KNOT_PER_100_FEET


def test_worked_example_of_a_vector_difference():
    # Worked example of a wind-shear group (checks V12, seen in a transcription): surface 070/12 kt,
    # 2000 ft 130/45 kt: 60 degrees and 33 kt apart; the vector difference is 40.36 kt and
    # 2.02 kt per 100 ft (derived). The scalar difference is the wrong answer for vector shear.
    answer = shear_of(profile([0, 2000], [70, 130], [12, 45]))
    assert answer.reach_vector_difference[0, -1] / KNOT == pytest.approx(40.36, abs=0.005)
    assert answer.reach_shear[0, -1] / KNOT_PER_100_FEET == pytest.approx(2.02, abs=0.005)
    assert answer.reach_speed_difference[0, -1] / KNOT == pytest.approx(33.0)
    assert answer.reach_direction_change[0, -1] == pytest.approx(60.0)


@pytest.mark.parametrize(
    ("directions", "knots", "expected"),
    # Public test files (checks V13, seen in a transcription): surface and 500 ft.
    [([270, 270], [10, 30], 4.0), ([360, 270], [20, 20], 20 * 2**0.5 / 5)],
)
def test_vector_shear_of_public_examples(directions, knots, expected):
    answer = shear_of(profile([0, 500], directions, knots))
    assert answer.maximum_shear[0] / KNOT_PER_100_FEET == pytest.approx(expected, abs=0.005)


def test_stull_vector_shear():
    # Stull, Practical Meteorology, in a public transcription (checks W2): (1, 2) m/s at 2 km and
    # (5, -3) m/s at 3 km differ by 6.4 m/s: 0.0064 s-1.
    stack = Stack.of(
        height=[[2000.0, 3000.0]], eastward_wind=[[1.0, 5.0]], northward_wind=[[2.0, -3.0]]
    )
    answer = low_level_shear(stack, np.array([0.3]), top=3000.0)
    assert answer.layer_vector_difference[0, 0] == pytest.approx(6.4, abs=0.05)
    assert answer.maximum_shear[0] == pytest.approx(0.0064, abs=5e-5)


def test_stull_second_vector_shear():
    # The same book (checks W3): (10, 5) m/s at 1 km and (20, -3) m/s at 2 km: 0.0128 s-1.
    stack = Stack.of(
        height=[[1000.0, 2000.0]], eastward_wind=[[10.0, 20.0]], northward_wind=[[5.0, -3.0]]
    )
    answer = low_level_shear(stack, np.array([0.3]), top=2000.0)
    assert answer.maximum_shear[0] == pytest.approx(0.0128, abs=5e-5)


def test_bulk_shear_of_the_lowest_100_hpa():
    # MetPy 1.7.1, docstring of bulk_shear (checks W6, seen): 1000, 925, 850, 700, 500 hPa; 165,
    # 180, 190, 210, 220 degrees; 5, 15, 20, 30, 50 kt: (2.41943319, 11.6920573) kt over the lowest
    # 100 hPa, interpolated in log pressure; with the heights of isothermal air that is linear in
    # height.
    pressure = np.array([1000.0, 925, 850, 700, 500])
    z = 7000.0 * np.log(1000.0 / pressure)
    depth = 7000.0 * np.log(1000.0 / 900.0)
    u, v = wind_components(
        np.array([5.0, 15, 20, 30, 50]) * KNOT, np.array([165.0, 180, 190, 210, 220])
    )
    stack = Stack.of(height=[z], eastward_wind=[u], northward_wind=[v])
    answer = low_level_shear(stack, np.array([0.3]), top=depth, reaches=(depth,))
    expected = np.hypot(2.41943319, 11.6920573)
    assert answer.reach_vector_difference[0, 0] / KNOT == pytest.approx(expected, rel=1e-7)


def test_bulk_shear_as_metpy_computes_it():
    from metpy.calc import bulk_shear
    from metpy.units import units

    feet = np.array([33.0, 200, 420, 900, 1500, 2000])
    stack = profile(feet, [165, 180, 190, 210, 220, 228], [5, 15, 20, 30, 50, 52])
    u, v = stack.eastward_wind[0], stack.northward_wind[0]
    pressure = np.linspace(1000, 930, feet.size) * units.hPa
    height = feet * FOOT * units.m
    theirs = bulk_shear(
        pressure,
        u * units("m/s"),
        v * units("m/s"),
        height=height,
        bottom=height[0],
        depth=height[-1] - height[0],
    )
    size = np.hypot(*(component.to("m/s").magnitude for component in theirs))
    assert shear_of(stack).reach_vector_difference[0, -1] == pytest.approx(size, rel=1e-9)


def test_terms_of_intensity_begin_where_the_table_says():
    # Classes as told of ICAO Doc 9817 (checks V2b, from memory): 0-4, 5-8, 9-12, > 12 kt/100 ft.
    kt = KNOT_PER_100_FEET
    tiny = np.full(9, 1e-6)
    terms = intensity(np.array([4, 4.99, 5, 8, 9, 11.9, 12, 12.1, np.nan]) * kt, tiny)
    assert terms.tolist() == [
        "light", "light", "moderate", "moderate", "strong", "strong", "strong", "severe", "",
    ]  # fmt: skip


def test_a_shear_smaller_than_its_error_is_not_called_shear():
    stack = profile([33, 133], [270, 270], [10, 10.5])
    answer = low_level_shear(stack, np.array([1.0]))
    assert answer.layer_shear[0, 0] < answer.layer_error[0, 0]
    assert answer.layer_intensity[0, 0] == ""


def test_coarse_data_give_a_lower_bound_and_fine_data_do_not():
    coarse = shear_of(profile([33, 800, 2000], [270] * 3, [10, 30, 35]))
    assert coarse.step_lower_bound[0].all()
    fine = shear_of(profile(np.arange(0, 2001, 100), [270] * 21, np.arange(10, 31)))
    assert not fine.step_lower_bound.any()
    assert not fine.layer_lower_bound.any()
    np.testing.assert_allclose(fine.step_shear[0], KNOT_PER_100_FEET, rtol=1e-9)


def test_the_strongest_hundred_feet_wherever_they_lie():
    # 5 kt between 150 and 210 ft, calm change elsewhere: over 100 ft 5 kt, although the 60 ft alone
    # have 8.3 kt per 100 ft; no step from 100 to 200 or 200 to 300 ft holds all of it.
    answer = shear_of(profile([33, 150, 210, 900], [270] * 4, [10, 10, 15, 15]))
    kt = KNOT_PER_100_FEET
    assert answer.window_shear[0] / kt == pytest.approx(5)
    assert answer.window_intensity[0] == "moderate"
    assert answer.window_base[0] / FOOT == pytest.approx(110)
    assert answer.window_top[0] / FOOT == pytest.approx(210)
    assert answer.maximum_shear[0] / kt == pytest.approx(5 / 0.6)
    assert np.nanmax(answer.step_shear[0]) < answer.window_shear[0]
    assert answer.window_speed_difference[0] / KNOT == pytest.approx(5)
    assert answer.window_direction_change[0] == pytest.approx(0)
    assert (answer.window_measured_base / FOOT, answer.window_measured_top / FOOT) == (
        pytest.approx([33]),
        pytest.approx([210]),
    )
    assert answer.window_lower_bound[0]
    assert np.isnan(shear_of(profile([33, 100], [270, 270], [10, 20])).window_shear[0])


def test_inside_a_gap_a_step_has_the_error_of_the_gap():
    # 467 ft between the levels: the shear of any 100 ft inside is theirs, and so is its error.
    answer = shear_of(profile([33, 500], [270, 270], [10, 20]))
    assert answer.window_error[0] == pytest.approx(answer.layer_error[0, 0])
    assert answer.step_error[0, 1] == pytest.approx(answer.layer_error[0, 0])
    # One that holds a level keeps the error of a level's wind over its own depth.
    fine = shear_of(profile([33, 150, 210, 900], [270] * 4, [10, 10, 15, 15]))
    assert fine.window_error[0] == pytest.approx(0.3 * 2**0.5 / (100 * FOOT))


def test_no_level_below_500_ft_is_said():
    answer = shear_of(profile([600, 900, 2000], [270] * 3, [10, 30, 35]))
    assert answer.surface_why[0] == "there is no wind below 500 ft (152 m) above ground"


def test_a_lowest_level_above_the_surface_layer_gives_no_surface_wind():
    answer = shear_of(profile([400, 900, 2000], [270] * 3, [10, 30, 35]))
    assert np.isnan(answer.reach_shear).all()
    assert "above the surface layer" in answer.surface_why[0]
    assert np.isfinite(answer.maximum_shear[0])


def test_reasons_where_nothing_can_be_said():
    stack = Stack.concatenate([profile([3000, 5000], [1, 1], [9, 9]), profile([33], [1], [9])])
    answer = shear_of(stack)
    assert answer.why.tolist() == [
        "there is no usable wind below 2000 ft (610 m) above ground",
        "there is only one usable wind below 2000 ft (610 m) above ground",
    ]
    assert shear_of(Stack.of(profiles=0)).why.tolist() == []
    assert shear_of(Stack.of(profiles=1)).why[0]


levels = st.lists(
    st.tuples(st.floats(1, 605), st.floats(-40, 40), st.floats(-40, 40)),
    min_size=2,
    max_size=12,
    unique_by=lambda level: round(level[0]),
)


def stack_of(rows):
    z, u, v = (np.array([column]) for column in zip(*sorted(rows), strict=True))
    return Stack.of(height=z, eastward_wind=u, northward_wind=v)


@given(levels, st.tuples(st.floats(1, 605), st.floats(-40, 40), st.floats(-40, 40)))
def test_adding_a_level_never_lowers_the_maximum(rows, more):
    if round(more[0]) in {round(row[0]) for row in rows}:
        return
    before = shear_of(stack_of(rows)).maximum_shear[0]
    after = shear_of(stack_of([*rows, more])).maximum_shear[0]
    assert after >= before * (1 - 1e-9)


@given(levels)
def test_the_southern_hemisphere_mirrors_the_northern(rows):
    stack = stack_of(rows)
    mirrored = stack.replace(northward_wind=-stack.northward_wind, latitude=-stack.latitude)
    ours, theirs = shear_of(stack), shear_of(mirrored)
    for name in ("layer_shear", "step_shear", "reach_shear", "maximum_shear", "window_shear"):
        np.testing.assert_array_equal(getattr(ours, name), getattr(theirs, name))
    turn, other = ours.layer_direction_change, theirs.layer_direction_change
    apart = (turn + other + 180.0) % 360.0 - 180.0  # 180 degrees is its own mirror
    np.testing.assert_allclose(np.abs(apart) % 360.0, 0.0 * apart, atol=1e-6)


@given(levels, st.floats(0, 360))
def test_rotating_the_wind_changes_no_size(rows, angle):
    stack = stack_of(rows)
    turned = (stack.eastward_wind + 1j * stack.northward_wind) * np.exp(1j * np.radians(angle))
    other = stack.replace(eastward_wind=turned.real, northward_wind=turned.imag)
    for name in ("layer_shear", "step_shear", "reach_shear", "maximum_shear", "window_shear"):
        np.testing.assert_allclose(
            getattr(shear_of(other), name), getattr(shear_of(stack), name), rtol=1e-7, atol=1e-9
        )


@given(st.lists(levels, min_size=1, max_size=4))
def test_a_stack_is_its_profiles_bit_for_bit(many):
    stacks = [stack_of(rows) for rows in many]
    whole = shear_of(Stack.concatenate(stacks))
    for row, stack in enumerate(stacks):
        one = shear_of(stack)
        for name, label in labels(LowLevelShear).items():
            ours, alone = getattr(whole, name)[row], getattr(one, name)[0]
            if label.dims[-1] == "layer":
                ours = ours[: alone.shape[0]]
            np.testing.assert_array_equal(ours, alone, err_msg=name)
