"""Turning: published profiles, directions through north, light winds, mirrors and rotations."""

import math

import hypothesis.extra.numpy as hnp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import direction, turning
from backveer.profiles.stack import Stack, wind_components, wind_from_direction

# Lettau, 1950: A re-examination of the "Leipzig wind profile" ..., Tellus, 2, 125-129: u along the
# geostrophic wind, v to its left, from a public script that holds the table scaled (S2).
LEIPZIG_Z = np.arange(50.0, 951.0, 50.0)
LEIPZIG_U = np.array(
    [
        9.15,
        10.45,
        11.58,
        12.60,
        13.48,
        14.30,
        14.97,
        15.62,
        16.28,
        16.83,
        17.30,
        17.70,
        17.99,
        18.23,
        18.42,
        18.60,
        18.66,
        18.68,
        18.62,
    ]
)
LEIPZIG_V = np.array(
    [
        4.35,
        4.64,
        4.80,
        4.95,
        4.96,
        4.90,
        4.78,
        4.60,
        4.29,
        4.00,
        3.71,
        3.37,
        3.07,
        2.73,
        2.43,
        2.06,
        1.70,
        1.31,
        0.91,
    ]
)


def from_directions(z, speeds, directions, **more):
    u, v = wind_components(np.asarray(speeds, float), np.asarray(directions, float))
    return Stack.of(height=np.asarray(z, float), eastward_wind=u, northward_wind=v, **more)


def test_leipzig_veers_by_22_63_degrees():
    stack = Stack.of(height=LEIPZIG_Z, eastward_wind=LEIPZIG_U, northward_wind=LEIPZIG_V)
    told = turning.turning(stack)
    # checks.md, 1d: derived from the table, 22.63 degrees, veering
    assert told.total[0] == pytest.approx(22.63, abs=0.005)
    assert told.sense[0] == "veering"
    assert told.error[0] == pytest.approx(
        math.degrees(0.1 * math.hypot(1 / 10.131, 1 / 18.642)), 1e-3
    )
    assert (told.base[0], told.top[0]) == (50.0, 950.0)
    reached = np.isfinite(told.layer_turning[0])
    assert told.layer_turning[0][reached].sum() == pytest.approx(22.63, abs=0.005)
    # 500 m is a level of the table: 13.37 degrees left of geostrophic, and 200 m: 21.45
    layer = list(told.layer_base[0]).index(300.0)
    assert told.layer_turning[0, layer] == pytest.approx(18.91 - 13.37, abs=0.01)
    assert told.layer_rate[0, layer] == pytest.approx((18.91 - 13.37) / 2, abs=0.005)
    assert told.layer_speed_change[0, layer] == pytest.approx(17.299 - 15.116, abs=0.001)


def test_textbook_directions():
    # Stull, Practical Meteorology: U = 3, V = 4 m/s blows from 216.9 degrees (W1, S2); MetPy's
    # docstring: u = v = 10 m/s from 225 degrees (W5, S1).
    assert wind_from_direction(3.0, 4.0) == pytest.approx(216.9, abs=0.05)
    stack = Stack.of(height=[100.0, 200.0], eastward_wind=[3.0, 10.0], northward_wind=[4.0, 10.0])
    told = turning.turning(stack, error=0.1)
    assert told.total[0] == pytest.approx(225.0 - 216.87, abs=0.005)
    # Stull: (1, 2) m/s at 2 km, (5, -3) m/s at 3 km (W2, S2): their difference is from 321.3
    assert wind_from_direction(5.0 - 1.0, -3.0 - 2.0) == pytest.approx(321.3, abs=0.05)
    stack = Stack.of(height=[2e3, 3e3], eastward_wind=[1.0, 5.0], northward_wind=[2.0, -3.0])
    told = turning.turning(stack, error=0.1)
    assert told.total[0] == pytest.approx(300.96 - 206.57, abs=0.01)
    assert told.sense[0] == "veering"


@pytest.mark.slow
def test_direction_agrees_with_metpy():
    calc = pytest.importorskip("metpy.calc")
    units = pytest.importorskip("metpy.units").units
    rng = np.random.default_rng(3)
    u, v = rng.normal(0.0, 8.0, (2, 40))
    stack = Stack.of(height=np.arange(40.0), eastward_wind=u, northward_wind=v)
    witness = calc.wind_direction(u * units("m/s"), v * units("m/s")).to("degree").magnitude
    told = turning.turning(stack, error=0.01).direction[0]
    assert np.allclose((told - witness + 180.0) % 360.0, 180.0, atol=1e-9)


def test_direction_goes_on_through_north():
    stack = from_directions([10, 50, 100, 150], [8, 9, 10, 11], [340, 355, 10, 30])
    told = turning.turning(stack, error=0.3)
    assert told.direction[0].round(9).tolist() == [340.0, 355.0, 370.0, 390.0]
    assert told.total[0] == pytest.approx(50.0)
    backing = from_directions([10, 50, 100, 150], [8, 9, 10, 11], [20, 5, 350, 330])
    told = turning.turning(backing, error=0.3)
    assert told.direction[0].round(9).tolist() == [20.0, 5.0, -10.0, -30.0]
    assert (told.total[0].round(9), told.sense[0]) == (-50.0, "backing")


def test_turning_adds_up_past_a_full_circle():
    stack = from_directions(np.arange(1, 11) * 100.0, [10.0] * 10, 50.0 * np.arange(10) % 360)
    assert turning.turning(stack, error=0.1).total[0] == pytest.approx(450.0)


def test_calm_and_light_levels_do_not_decide_the_branch():
    firm = from_directions([10, 50, 150, 200], [6, 7, 8, 9], [250, 255, 265, 270])
    with_light = from_directions(
        [10, 50, 100, 150, 200], [6, 7, 0.2, 8, 9], [250, 255, 60, 265, 270]
    )
    with_calm = from_directions([10, 50, 100, 150, 200], [6, 7, 0.0, 8, 9], [250, 255, 0, 265, 270])
    plain = turning.turning(firm, error=0.5)
    for stack in (with_light, with_calm):
        stack = stack.replace(
            level_flag=np.where(stack.wind_speed == 0, 1 << 10, 0).astype(np.uint32)
        )
        told = turning.turning(stack, error=0.5)
        assert told.total[0] == pytest.approx(plain.total[0])
        assert told.error[0] > plain.error[0]  # it may have gone round through the calm
    # The light wind takes its place beside its neighbours: 60 is 200 degrees from 260, not 160.
    told = turning.turning(with_light, error=0.5)
    assert told.direction[0, 2] == pytest.approx(420.0)
    checked = with_calm.replace(level_flag=np.array([[0, 0, 1 << 10, 0, 0]], dtype=np.uint32))
    assert np.isnan(turning.turning(checked, error=0.5).direction[0]).tolist() == [0, 0, 1, 0, 0]


@pytest.mark.parametrize("reversal", [165.0, 180.0, 195.0])
def test_a_reversal_is_withheld_with_the_reason(reversal):
    stack = from_directions(
        [10, 100, 200, 300], [8, 9, 9, 8], [90, 95, 95 + reversal, 100 + reversal]
    )
    told = turning.turning(stack, edges=(0, 100, 200, 300), error=0.3)
    assert math.isnan(told.total[0])
    assert "either way round" in told.why[0]
    assert told.sense[0] == ""
    assert told.layer_turning[0, [0, 2]].round(9).tolist() == [5.0, 5.0]
    assert math.isnan(told.layer_turning[0, 1])
    assert told.layer_why[0, 1] == told.why[0]


def test_a_right_angle_through_a_calm_is_withheld_and_without_it_is_not():
    z, directions = [10, 100, 200], [180, 225, 270]
    assert turning.turning(from_directions(z, [8, 6, 8], directions), error=0.5).total[0] == (
        pytest.approx(90.0)
    )
    told = turning.turning(from_directions(z, [8, 0.1, 8], directions), error=0.5)
    assert math.isnan(told.total[0])


def test_error_of_a_direction_grows_to_that_of_a_uniform_one():
    speed = np.array([0.0, 0.01, 0.5, 1.0, 2.0, 5.0, 20.0])
    errors = direction.direction_error(speed, np.full(7, 0.5))
    assert errors[0] == pytest.approx(math.pi / math.sqrt(3))
    assert (np.diff(errors) < 0).all()
    assert errors[-1] == pytest.approx(0.5 / 20.0, rel=1e-3)
    # An independent witness: the spread of directions of a wind with Gaussian errors.
    rng = np.random.default_rng(11)
    for ratio in (0.3, 1.0, 2.0, 4.0):
        x, y = rng.normal(0.0, 1.0, (2, 200_000))
        spread = np.sqrt(np.mean(np.arctan2(y, ratio + x) ** 2))
        assert direction.direction_error(np.array(ratio), np.array(1.0)) == pytest.approx(
            spread, 0.2
        )


def test_stated_error_is_the_scatter_of_repeated_measurements():
    rng = np.random.default_rng(5)
    z = np.array([40.0, 90.0, 140.0, 260.0, 330.0])
    u, v = wind_components(
        np.array([6.0, 7.0, 8.0, 9.0, 9.5]), np.array([240, 244, 250, 262, 266.0])
    )
    noise = rng.normal(0.0, 0.3, (2, 4000, 5))
    # 100 and 120 m lie between the same two levels: the errors at the edges are alike.
    edges = (0.0, 100.0, 120.0, 200.0, 400.0)
    noisy = turning.turning(
        Stack.of(height=z, eastward_wind=u + noise[0], northward_wind=v + noise[1]), edges, 0.3
    )
    told = turning.turning(Stack.of(height=z, eastward_wind=u, northward_wind=v), edges, 0.3)
    assert told.error[0] == pytest.approx(np.std(noisy.total), rel=0.05)
    scatter = np.std(noisy.layer_turning, axis=0)
    # the stated errors also hold what the straight line between levels may miss
    assert (told.layer_error[0] > 0.95 * scatter).all()
    assert (told.layer_error[0] < 1.6 * scatter).all()


def test_tail_of_the_gaussian():
    for x in (0.0, 0.3, 1.0, 2.5, 5.0):
        assert float(direction._tail(np.array(x))) == pytest.approx(
            0.5 * math.erfc(x / math.sqrt(2)), abs=1.5e-7
        )


def test_steady_where_the_turning_is_within_its_error():
    told = turning.turning(from_directions([10, 110], [5, 5], [200, 203]), error=0.5)
    assert told.sense[0] == "steady"
    assert told.total[0] == pytest.approx(3.0)
    assert (
        turning.turning(from_directions([10, 110], [5, 5], [200, 203]), error=0.1).sense[0]
        == "veering"
    )


def test_layers_are_clipped_to_the_profile():
    stack = from_directions([40, 80, 320], [5, 6, 8], [200, 205, 225])
    told = turning.turning(stack, edges=(0, 100, 300, 500, 1000), error=0.2)
    assert told.layer_base[0, :3].tolist() == [40.0, 100.0, 300.0]
    assert told.layer_top[0, :3].tolist() == [100.0, 300.0, 320.0]
    assert math.isnan(told.layer_turning[0, 3])
    assert told.layer_why[0].tolist() == ["", "", "", turning.NOT_REACHED]
    assert told.layer_turning[0, :3].sum() == pytest.approx(told.total[0])


def test_edges_are_interpolated_in_the_components():
    stack = from_directions([0, 100], [10, 2], [180, 270])
    told = turning.turning(stack, edges=(0, 50, 100), error=0.1)
    # halfway (1, 5): 11.3 degrees of veer, not 45
    assert told.layer_turning[0, 0] == pytest.approx(math.degrees(math.atan2(1, 5)))
    assert told.layer_speed_change[0, 0] == pytest.approx(math.hypot(1, 5) - 10)


@pytest.mark.parametrize(
    ("z", "u", "reason"),
    [
        ([10.0], [5.0], "fewer than two"),
        ([10.0, 20.0], [5.0, np.nan], "fewer than two"),
        ([np.nan, np.nan], [5.0, 4.0], "fewer than two"),
        ([10.0, 20.0], [np.inf, 4.0], "fewer than two"),
        ([], [], "fewer than two"),
    ],
)
def test_reason_where_there_is_no_answer(z, u, reason):
    told = turning.turning(
        Stack.of(height=np.array(z), eastward_wind=np.array(u), northward_wind=1.0)
    )
    assert reason in told.why[0]
    assert math.isnan(told.total[0])


def test_hostile_numbers_raise_nothing():
    tiny = np.array([[5e-324, -5e-324, 0.0], [1e-300, 1e300, -1e300], [0.0, 0.0, 0.0]])
    stack = Stack.of(height=[1.0, 2.0, 3.0], eastward_wind=tiny, northward_wind=tiny[::-1])
    told = turning.turning(stack)
    assert told.total.shape == (3,)
    assert turning.turning(Stack.of(profiles=0)).total.shape == (0,)


@pytest.mark.parametrize(
    "edges", [(0.0,), (0.0, 100.0, 100.0), (100.0, 0.0), ((0.0, 1.0), (2.0, 3.0))]
)
def test_edges_that_bound_nothing_are_an_error(edges):
    with pytest.raises(ValueError, match="at least two heights that increase"):
        turning.turning(from_directions([0, 1], [1, 1], [1, 1]), edges=edges)


winds = hnp.arrays(float, (3, 7), elements=st.floats(-30, 30).map(lambda x: round(x, 2)))


def make(u, v):
    z = np.array(
        [
            [5, 40, 90, 160, 300, 700, 1800.0],
            [2, 3, 5, 8, 13, 21, 34],
            [9, 99, 199, 299, 999, 1099, 9999],
        ]
    )
    return Stack.of(height=z, eastward_wind=u, northward_wind=v)


@given(winds, winds)
def test_mirror_flips_the_sign_exactly(u, v):
    told, mirrored = turning.turning(make(u, v)), turning.turning(make(u, -v))
    assert np.array_equal(told.total, -mirrored.total, equal_nan=True)
    assert np.array_equal(told.layer_turning, -mirrored.layer_turning, equal_nan=True)
    assert np.array_equal(told.error, mirrored.error, equal_nan=True)
    assert np.array_equal(told.layer_error, mirrored.layer_error, equal_nan=True)


@given(winds, winds, st.floats(0, 360))
def test_rotation_changes_nothing(u, v, angle):
    u, v = u + 31.0, v  # away from calm, where rounding decides
    c, s = math.cos(math.radians(angle)), math.sin(math.radians(angle))
    told = turning.turning(make(u, v), error=0.5)
    turned = turning.turning(make(c * u - s * v, s * u + c * v), error=0.5)
    for name in ("total", "error", "layer_turning", "layer_error", "layer_speed_change"):
        assert np.allclose(getattr(told, name), getattr(turned, name), atol=1e-6, equal_nan=True)


@given(winds, winds, st.integers(0, 7))
def test_a_stack_and_a_missing_level_change_no_bit(u, v, gap):
    stack = make(u, v)
    whole = turning.turning(stack)
    for i in range(3):
        alone = turning.turning(stack.select(i))
        wider = turning.turning(
            Stack.of(
                height=np.insert(stack.height[i], gap, np.nan),
                eastward_wind=np.insert(u[i], gap, np.nan),
                northward_wind=np.insert(v[i], gap, np.nan),
            )
        )
        for name in (
            "total",
            "error",
            "layer_turning",
            "layer_error",
            "layer_rate",
            "layer_speed_change",
        ):
            for other in (alone, wider):
                assert np.array_equal(
                    getattr(whole, name)[i], getattr(other, name)[0], equal_nan=True
                )
        assert np.array_equal(whole.direction[i], alone.direction[0], equal_nan=True)


def test_words_and_labels_cross_to_xarray_and_pandas():
    told = turning.turning(from_directions([10, 250], [5, 9], [200, 240]))
    assert told.to_xarray()["layer_turning"].attrs["units"] == "degree"
    assert "layer_sense" in told.to_pandas("layer").columns
