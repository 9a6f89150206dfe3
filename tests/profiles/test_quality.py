"""Quality: each finding on a profile broken in one way, and what must pass."""

import dataclasses
import itertools
import math

import hypothesis.extra.numpy as hnp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles.flags import BIT, FLAGS, names_of
from backveer.profiles.labels import labels
from backveer.profiles.level_order import increasing
from backveer.profiles.quality import Thresholds, check, summary
from backveer.profiles.stack import Stack, wind_components

R_OVER_G = 287.05 / 9.80665  # dry air, ISO 2533:1975 [m K-1]


def found(stack, row=0):
    return [names_of(int(bits)) for bits in check(stack).level_flag[row]]


def sounding(**changes):
    """Give a clean sounding of an ordinary day, hydrostatic to a centimetre."""
    z = np.array([2.0, 60.0, 150.0, 300.0, 480.0, 700.0, 1000.0, 1400.0, 1900.0, 2500.0])
    temperature = 288.15 - 0.0065 * z
    pressure = 101325.0 * (temperature / 288.15) ** (1.0 / (0.0065 * R_OVER_G))
    u, v = wind_components(4.0 + 2.0 * np.log(z / 0.5), 230.0 + z / 60.0)
    given = {
        "height": z,
        "air_pressure": pressure,
        "air_temperature": temperature,
        "dew_point_temperature": temperature - 3.0,
        "eastward_wind": u,
        "northward_wind": v,
    }
    for name, edit in changes.items():
        edit(given[name])
    return Stack.of(**given)


def setting(place, value):
    def edit(array):
        array[place] = value

    return edit


def adding(place, value):
    def edit(array):
        array[place] += value

    return edit


def test_a_clean_sounding_carries_no_flag():
    assert not check(sounding()).level_flag.any()


@pytest.mark.parametrize(
    ("changes", "place", "names"),
    [
        ({"eastward_wind": setting(3, np.nan)}, 3, ("wind_missing",)),
        ({"eastward_wind": setting(3, 160.0)}, 3, ("wind_outside_limits",)),
        ({"eastward_wind": setting(3, np.inf)}, 3, ("wind_outside_limits",)),
        ({"eastward_wind": setting(3, -25.0)}, 3, ("wind_spike",)),
        ({"air_temperature": setting(3, 120.0)}, 3, ("temperature_outside_limits",)),
        ({"air_temperature": adding(3, 15.0)}, 3, ("temperature_spike",)),
        ({"dew_point_temperature": adding(3, 4.0)}, 3, ("humidity_outside_limits",)),
        ({"dew_point_temperature": adding(3, 3.4)}, 3, ()),
        ({"air_pressure": setting(3, 0.0)}, 3, ("pressure_outside_limits",)),
        ({"air_pressure": adding(3, 3000.0)}, 3, ("not_hydrostatic",)),
        ({"air_pressure": adding(0, -3000.0)}, 0, ("not_hydrostatic",)),
        ({"air_pressure": adding(9, 3000.0)}, 9, ("not_hydrostatic",)),
        ({"air_pressure": adding(3, 40.0)}, 3, ()),
        ({"height": setting(3, np.nan)}, 3, ("height_not_increasing",)),
        ({"height": setting(3, 99999.0)}, 3, ("height_not_increasing",)),
        ({"height": setting(3, 1800.0)}, 3, ("height_not_increasing",)),
        ({"height": setting(3, 20.0)}, 3, ("height_not_increasing",)),
        ({"height": setting(0, -30.0)}, 0, ("below_ground",)),
        ({"height": setting(0, -0.4)}, 0, ()),
        ({"air_temperature": adding(6, -2.1)}, 6, ("superadiabatic",)),
        ({"air_temperature": adding(1, -2.1)}, 1, ()),  # the surface layer over hot ground
    ],
)
def test_each_finding_alone(changes, place, names):
    told = found(sounding(**changes))
    assert told[place] == names
    assert not any(told[:place] + told[place + 1 :])


def test_calm_has_no_direction():
    stack = Stack.of(
        height=[10.0, 50.0, 90.0], eastward_wind=[0.0, 1.0, 0.0], northward_wind=[0, 0, 1]
    )
    checked = check(stack)
    assert checked.usable("direction").tolist() == [[False, True, True]]
    assert checked.usable("wind").all()


def test_lidar_thresholds():
    stack = Stack.of(
        height=[40.0, 80.0, 120.0, 160.0],
        eastward_wind=5.0,
        northward_wind=1.0,
        availability=[1.0, 0.79, 0.8, np.nan],
        carrier_to_noise_ratio=[-10.0, -22.9, -23.1, np.nan],
    )
    assert found(stack) == [(), ("low_availability",), ("weak_signal",), ()]
    eager = check(stack, Thresholds(lowest_availability=0.9, lowest_signal=-22.0))
    assert (eager.level_flag[0] != 0).tolist() == [False, True, True, False]


# --- Heights -------------------------------------------------------------------------------


def test_descent_after_the_burst_is_left_out_and_the_ascent_kept():
    z = np.array([[10.0, 500.0, 900.0, 1400.0, 1300.0, 950.0, 400.0, 20.0]])
    assert increasing(z)[0].tolist() == [True] * 4 + [False] * 4


def longest(z):
    """Return the length of the longest increasing subsequence by trying all of them."""
    best = 0
    for bits in range(1 << len(z)):
        chosen = [z[i] for i in range(len(z)) if bits >> i & 1]
        if all(b > a for a, b in itertools.pairwise(chosen)):
            best = max(best, len(chosen))
    return best


@given(hnp.arrays(float, (2, 8), elements=st.sampled_from([1.0, 2, 3, 4, 5, 6, 7, np.nan])))
def test_the_longest_increasing_run_is_kept(z):
    kept = increasing(z)
    for row, chosen in zip(z, kept, strict=True):
        run = row[chosen]
        assert np.isfinite(run).all()
        assert (np.diff(run) > 0).all()
        assert chosen.sum() == longest(row[np.isfinite(row)])


def test_duplicates_are_merged_by_the_vector_mean():
    stack = Stack.of(
        height=[[10.0, 50.0, 50.0, np.nan, 50.0, 90.0], [10.0, 20.0, 30.0, 40.0, 50.0, 60.0]],
        eastward_wind=[[1.0, 6.0, 0.0, 7.0, 0.0, 4.0]] * 2,
        northward_wind=[[1.0, 0.0, 6.0, 7.0, -3.0, 4.0]] * 2,
        air_temperature=[[290.0, 289.0, np.nan, 288.0, 287.0, 286.0]] * 2,
        time=np.datetime64("2031-05-14T00:00"),
    )
    checked = check(stack)
    assert np.array_equal(
        checked.height[0], [10.0, 50.0, np.nan, 90.0, np.nan, np.nan], equal_nan=True
    )
    assert (checked.eastward_wind[0, 1], checked.northward_wind[0, 1]) == (2.0, 1.0)
    assert checked.air_temperature[0, :4].tolist() == [290.0, 288.0, 288.0, 286.0]
    assert names_of(int(checked.level_flag[0, 1])) == ("duplicate_height",)
    assert names_of(int(checked.level_flag[0, 2])) == ("height_not_increasing",)
    assert not checked.level_flag[0, 3:].any()
    assert np.array_equal(checked.eastward_wind[1], stack.eastward_wind[1])
    assert summary(checked).level_count.tolist() == [4.0, 6.0]


def test_an_impossible_value_takes_no_part_in_the_mean_of_duplicates():
    stack = Stack.of(
        height=[10.0, 50.0, 50.0], eastward_wind=[3.0, 4.0, 999.0], northward_wind=[0.0, 1.0, 0.0]
    )
    checked = check(stack)
    assert (checked.eastward_wind[0, 1], checked.northward_wind[0, 1]) == (4.0, 1.0)
    assert names_of(int(checked.level_flag[0, 1])) == ("duplicate_height",)


# --- Spikes: what nature does must pass ------------------------------------------------------


def profile(z, speed, direction):
    u, v = wind_components(
        np.asarray(speed, float), np.broadcast_to(direction, len(z)).astype(float)
    )
    return Stack.of(height=np.asarray(z, float), eastward_wind=u, northward_wind=v)


@pytest.mark.parametrize(
    ("z", "speed", "direction"),
    [
        # the nose of a nocturnal jet in one level, with shear of 0.1 s-1 below
        ([10, 40, 80, 120, 200, 300, 500], [3, 6, 10, 14, 9, 8, 8], 200),
        # a front: 12 m/s and 90 degrees in one step
        ([10, 100, 200, 300, 400, 500], [6, 7, 8, 16, 17, 18], [180, 182, 184, 270, 272, 274]),
        # a strong but smooth surface layer
        ([2, 10, 40, 100, 200, 400], [4, 12, 18, 22, 25, 28], 250),
        # a jet at the tropopause in a coarse message
        (
            [100, 760, 1460, 3010, 5570, 7190, 9160, 10360, 11790, 13600, 16100],
            [6, 14, 18, 24, 34, 42, 60, 72, 48, 28, 16],
            [200, 220, 235, 245, 250, 255, 255, 258, 260, 262, 265],
        ),
        # light surface wind under a jet
        ([10, 150, 300, 450], [1, 16, 18, 15], 200),
    ],
)
def test_real_structure_is_no_spike(z, speed, direction):
    assert not (check(profile(z, speed, direction)).level_flag & BIT["wind_spike"]).any()


def test_noise_makes_no_spikes():
    rng = np.random.default_rng(8)
    z = np.arange(20.0, 1020.0, 20.0)
    noise = rng.normal(0.0, 1.5, (2, 400, 50))  # a very turbulent day
    stack = Stack.of(height=z, eastward_wind=8.0 + noise[0], northward_wind=2.0 + noise[1])
    assert not (check(stack).level_flag & BIT["wind_spike"]).any()


@pytest.mark.parametrize("place", [1, 4, 8, 9])
@pytest.mark.parametrize("kind", ["reversed", "tenfold"])
def test_a_wrong_direction_or_decimal_is_a_spike(place, kind):
    stack = sounding()
    u, v = stack.eastward_wind.copy(), stack.northward_wind.copy()
    factor = -1.0 if kind == "reversed" else 5.0
    u[0, place] *= factor
    v[0, place] *= factor
    flags = check(stack.replace(eastward_wind=u, northward_wind=v)).level_flag[0]
    assert np.flatnonzero(flags & BIT["wind_spike"]).tolist() == [place]


def test_two_spikes_and_a_pair_are_found():
    z = np.arange(1, 16) * 50.0
    speed = np.full(15, 9.0)
    speed[[3, 9, 10]] = 35.0
    flags = check(profile(z, speed, 240)).level_flag[0]
    assert np.flatnonzero(flags & BIT["wind_spike"]).tolist() == [3, 9, 10]


# --- Pressure against height -------------------------------------------------------------------


def test_heights_in_feet_taken_for_metres_are_found():
    stack = sounding()
    wrong = stack.replace(height=stack.height / 0.3048)
    flags = check(wrong).level_flag[0]
    assert (flags & BIT["not_hydrostatic"]).astype(bool).sum() >= 9


def test_heights_of_the_standard_atmosphere_are_not_held_against_the_pressure():
    stack = sounding(height=setting(slice(None), 1.1 * sounding().height[0]))
    assert (check(stack).level_flag & BIT["not_hydrostatic"]).any()
    derived = np.full(stack.height.shape, BIT["height_from_standard_atmosphere"], dtype=np.uint32)
    checked = check(stack.replace(level_flag=derived))
    assert not (checked.level_flag & BIT["not_hydrostatic"]).any()


def test_a_break_marks_both_sides():
    stack = sounding()
    z = stack.height.copy()
    z[0, 5:] += 400.0
    flags = check(stack.replace(height=z)).level_flag[0]
    assert np.flatnonzero(flags & BIT["not_hydrostatic"]).tolist() == [4, 5]


def test_moist_warm_air_is_hydrostatic():
    # a saturated tropical column: virtual temperature 4 K above temperature
    z = np.array([5.0, 800.0, 1600.0, 2400.0])
    temperature = np.array([303.0, 298.0, 294.0, 290.0])
    pressure = 101000.0 * np.exp(-z / (R_OVER_G * 300.5))
    stack = Stack.of(
        height=z,
        air_pressure=pressure,
        air_temperature=temperature,
        dew_point_temperature=temperature,
    )
    assert not (check(stack).level_flag & BIT["not_hydrostatic"]).any()


# --- The stack --------------------------------------------------------------------------------

numbers = st.sampled_from([0.0, 1.0, -7.5, 12.0, 60.0, -160.0, np.nan, np.inf, 5e-324])
heights = st.sampled_from([-50.0, 0.0, 10.0, 30.0, 30.0, 80.0, 150.0, 400.0, 1e6, np.nan, -np.inf])


@st.composite
def wild_stacks(draw):
    def array(elements):
        return draw(hnp.arrays(float, (3, 8), elements=elements))

    return Stack.of(
        height=array(heights),
        eastward_wind=array(numbers),
        northward_wind=array(numbers),
        air_temperature=array(st.sampled_from([250.0, 280.0, 288.0, 300.0, 1e4, np.nan])),
        air_pressure=array(st.sampled_from([101325.0, 95000.0, 90000.0, -1.0, np.nan])),
        dew_point_temperature=array(st.sampled_from([240.0, 285.0, np.nan])),
    )


def same(one, other, row_of_one=slice(None), row_of_other=slice(None)):
    for name, label in labels(one).items():
        if label.dims == ("profile", "level"):
            a, b = getattr(one, name)[row_of_one], getattr(other, name)[row_of_other]
            assert np.array_equal(a, b, equal_nan=True), name


@given(wild_stacks())
def test_a_second_check_changes_nothing(stack):
    once = check(stack)
    same(once, check(once))


@given(wild_stacks())
def test_what_stands_increases(stack):
    checked = check(stack)
    for z, usable in zip(checked.height, checked.usable(), strict=True):
        assert (np.diff(z[usable]) > 0).all()


@given(wild_stacks())
def test_a_stack_gives_what_its_profiles_give(stack):
    whole = check(stack)
    for i in range(3):
        same(whole, check(stack.select(i)), slice(i, i + 1))


@given(wild_stacks())
def test_padding_is_untouched_and_mirrors(stack):
    wide = Stack.of(
        **{
            name: np.pad(getattr(stack, name), ((0, 0), (0, 2)), constant_values=np.nan)
            for name in ("height", "eastward_wind", "northward_wind", "air_temperature")
        }
    )
    checked = check(wide)
    assert not checked.level_flag[:, 8:].any()
    mirrored = check(wide.replace(northward_wind=-wide.northward_wind))
    assert np.array_equal(checked.level_flag, mirrored.level_flag)
    turned = check(
        wide.replace(eastward_wind=wide.northward_wind, northward_wind=-wide.eastward_wind)
    )
    assert np.array_equal(checked.level_flag, turned.level_flag)


def test_bits_that_are_set_are_kept():
    stack = sounding()
    derived = np.full(stack.height.shape, BIT["height_from_hypsometric_equation"], dtype=np.uint32)
    assert (check(stack.replace(level_flag=derived)).level_flag == derived).all()


def test_empty_stacks_pass():
    assert check(Stack.of(profiles=0)).profile_count == 0
    assert check(Stack.of(profiles=2)).level_count == 0
    assert not check(Stack.of(height=[np.nan, np.nan])).level_flag.any()


def test_summary_counts_each_finding():
    stack = sounding(eastward_wind=setting(9, np.nan))
    told = summary(check(stack))
    assert (told.count("wind_missing")[0], told.level_count[0]) == (1.0, 10.0)
    assert told.flagged_count.shape == (1, len(FLAGS))
    assert told.to_pandas("profile")["level_count"].tolist() == [10.0]
    with pytest.raises(KeyError):
        told.count("no_such_finding")


@pytest.mark.parametrize("field", dataclasses.fields(Thresholds), ids=lambda field: field.name)
def test_every_threshold_matters(field):
    """Tightening any threshold to the absurd finds something in a clean profile."""
    absurd = -math.inf if field.name.startswith(("highest", "maximum")) else math.inf
    by_name = {
        "dew_point_excess": -10.0,
        "depth_below_ground": -50.0,
        "superadiabatic_excess": -50.0,
        "surface_layer": None,
        "wind_spike_rate": None,
        "temperature_spike_rate": None,
        "wind_spike_floor": None,
        "temperature_spike_floor": None,
        "spike_factor": None,
        "thickness_excess": -1e4,
        "thickness_fraction": -1e2,
        "pressure_resolution": -1e5,
    }
    value = by_name.get(field.name, absurd)
    stack = sounding().replace(
        availability=np.full((1, 10), 1.0), carrier_to_noise_ratio=np.full((1, 10), 0.0)
    )
    if value is not None:
        assert check(stack, Thresholds(**{field.name: value})).level_flag.any()
    else:  # allowances: with a generous one, what is found otherwise is not
        broken = sounding(
            eastward_wind=setting(4, -25.0), air_temperature=adding([4, 7], [-15.0, -3.0])
        )
        generous = check(broken, Thresholds(**{field.name: 1e6})).level_flag
        assert (generous != check(broken).level_flag).any()
