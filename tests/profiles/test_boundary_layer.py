"""Boundary layer: Richardson numbers, depth, inversions and jets against published values."""

import math

import hypothesis.extra.numpy as hnp
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import air, inversions, low_level_jet
from backveer.profiles import boundary_layer as rooms
from backveer.profiles.boundary_layer import (
    boundary_layer,
    bulk_richardson_number,
    gradient_richardson_number,
)
from backveer.profiles.labels import labels
from backveer.profiles.stack import Stack

# --- Richardson numbers ---------------------------------------------------------------------


def test_bulk_richardson_number_of_a_textbook_layer():
    # Stull, Practical Meteorology (B1, S2): z 5.5/5.0 km, T -23/-20 C, U 50/40, V 0/8 m/s, dry:
    # 0.226. With the difference of temperature in place of theta the sign is wrong.
    theta_difference = -3.0 + 9.8 * 0.5
    number = bulk_richardson_number(273.15 - 21.5, theta_difference, 500.0, 10.0, -8.0)
    assert number == pytest.approx(0.226, abs=0.0005)


@pytest.mark.parametrize(("stability", "shear"), [(1e-4, 20.0), (6e-4, 49.0)])
def test_richardson_number_of_a_quarter(stability, shear):
    # Salby 13.2 (B2, S2): N2 of 1e-4 (6e-4) s-2 and Ri = 0.25 go with 20 (50, exactly 49) m/s in
    # 1 km.
    z = np.array([0.0, 300.0, 700.0, 1000.0])
    theta = 300.0 * np.exp(stability / 9.80665 * z)
    number = gradient_richardson_number(z, theta, shear / 1000 * z, 0 * z)
    assert number == pytest.approx(0.25, rel=1e-3)


def test_gradient_richardson_number_is_that_of_metpy():
    # MetPy 1.7.1, test of gradient_richardson_number (B3, S1)
    z = np.array([200.0, 400.0, 600.0])
    number = gradient_richardson_number(
        z, np.array([254.5, 258.3, 262.2]), np.array([-2.0, -1.1, 0.23]), np.array([3.3, 4.2, 5.2])
    )
    assert number == pytest.approx([24.2503551, 13.6242603, 8.4673744], rel=1e-6)


@pytest.mark.slow
def test_gradient_richardson_number_on_uneven_levels_agrees_with_metpy():
    calc = pytest.importorskip("metpy.calc")
    units = pytest.importorskip("metpy.units").units
    z = np.array([10.0, 40.0, 55.0, 130.0, 270.0, 300.0])
    theta = np.array([290.0, 290.2, 290.9, 292.0, 292.4, 293.5])
    u, v = np.array([2.0, 5.0, 5.5, 8.0, 7.0, 7.1]), np.array([1.0, 1.2, 0.3, -1.0, -2.0, -4.0])
    witness = calc.gradient_richardson_number(
        z * units.m, theta * units.K, u * units("m/s"), v * units("m/s")
    )
    assert np.allclose(gradient_richardson_number(z, theta, u, v), witness.magnitude, rtol=1e-5)


def test_gradient_is_exact_for_a_parabola_up_to_the_last_level_of_each_profile():
    z = np.array([[0.0, 10.0, 40.0, 90.0, 100.0], [5.0, 6.0, 9.0, np.nan, np.nan]])
    assert np.allclose(rooms._gradient(z, 3 + z - 0.02 * z**2), 1 - 0.04 * z, equal_nan=True)
    two = np.array([[0.0, 10.0, np.nan]])
    assert np.isnan(gradient_richardson_number(two, two + 290.0, two, two)).all()


# --- Depth -----------------------------------------------------------------------------------


def column(z, theta, speed, humidity=None, pressure=True, **more):
    """Build a column in hydrostatic balance from potential temperature, by small steps."""
    z, theta = np.asarray(z, float), np.asarray(theta, float)
    fine = np.linspace(0.0, z[-1], 4001)
    exner = 1.0 - 9.80665 / air.HEAT_CAPACITY * np.concatenate(
        [[0.0], np.cumsum(np.diff(fine) / np.interp(0.5 * (fine[1:] + fine[:-1]), z, theta))]
    )
    exner = np.interp(z, fine, exner)
    temperature = theta * exner
    given = {"air_pressure": 1e5 * exner ** (1 / air.KAPPA)} if pressure else {}
    if humidity is not None:
        given["dew_point_temperature"] = np.where(
            np.isnan(humidity), np.nan, temperature - humidity
        )
    return Stack.of(
        height=z,
        air_temperature=temperature,
        eastward_wind=0.6 * np.asarray(speed, float),
        northward_wind=0.8 * np.asarray(speed, float),
        **given,
        **more,
    )


Z = np.array([10.0, 100.0, 300.0, 600.0, 900.0, 1200.0])
MIXED = np.array([300.0, 300.0, 300.0, 300.0, 302.0, 305.0])
SPEED = np.array([4.0, 8.0, 9.0, 10.0, 10.0, 12.0])


def by_hand(critical):
    """Return the depth of the mixed column: only between 600 m (Ri = 0) and 900 m does it rise."""
    at_900 = 9.80665 / 300.0 * 2.0 * 890.0 / 100.0
    return 600.0 + 300.0 * critical / at_900


def test_depth_is_interpolated_to_the_critical_value():
    for critical in (0.25, 0.4):
        told = boundary_layer(column(Z, MIXED, SPEED), critical_richardson=critical)
        assert told.bulk_richardson_depth[0] == pytest.approx(by_hand(critical), abs=0.5)
        assert told.depth_why[0] == ""
        assert told.critical_richardson == critical


def test_depth_without_pressure_differs_little():
    told = boundary_layer(column(Z, MIXED, SPEED, pressure=False))
    assert told.bulk_richardson_depth[0] == pytest.approx(by_hand(0.25), abs=15.0)


def test_moisture_near_the_ground_deepens_the_layer():
    dry = boundary_layer(column(Z, MIXED, SPEED)).bulk_richardson_depth[0]
    moist = column(Z, MIXED, SPEED, humidity=[1.0, 2.0, 4.0, 8.0, 20.0, 25.0])
    assert boundary_layer(moist).bulk_richardson_depth[0] > dry + 20.0


def test_a_missing_dew_point_is_no_step_in_stability():
    humidity = np.array([1.0, 2.0, 4.0, 7.0, 10.0, 25.0])
    whole = boundary_layer(column(Z, MIXED, SPEED, humidity))
    humidity[2] = np.nan
    parted = boundary_layer(column(Z, MIXED, SPEED, humidity))
    assert parted.bulk_richardson_depth[0] == whole.bulk_richardson_depth[0]


@pytest.mark.parametrize(
    ("stack", "reason"),
    [
        (Stack.of(height=Z, eastward_wind=SPEED, northward_wind=0.0), "there is no temperature"),
        (Stack.of(height=Z, air_temperature=MIXED), "fewer than two levels"),
        (column(Z + 200.0, MIXED, SPEED), "above 100 m"),
        (column(Z, MIXED + 0.08 * Z, SPEED), "at the second level already"),
        (column(Z, 300.0 - 0 * Z, SPEED), "up to the highest level"),
        (Stack.of(height=[], air_temperature=[]), "there is no temperature"),
    ],
)
def test_reason_where_there_is_no_depth(stack, reason):
    told = boundary_layer(stack)
    assert math.isnan(told.bulk_richardson_depth[0])
    assert reason in told.depth_why[0]


def test_a_calm_in_stable_air_is_the_top():
    told = boundary_layer(column(Z, MIXED, [4, 8, 9, 10, 0, 3]))
    assert told.bulk_richardson_depth[0] == 600.0


@pytest.mark.parametrize("critical", [0.0, -0.25, math.nan])
def test_a_critical_number_that_is_none(critical):
    with pytest.raises(ValueError, match="must be above 0"):
        boundary_layer(column(Z, MIXED, SPEED), critical_richardson=critical)


# --- Inversions -------------------------------------------------------------------------------


def find(z, celsius):
    z, t = np.asarray(z, float)[np.newaxis], np.asarray(celsius, float)[np.newaxis] + 273.15
    found = inversions.inversions(z, t, np.isfinite(z) & np.isfinite(t))
    there = np.isfinite(found.base[0])
    return [
        (b, t, round(s, 6), k)
        for b, t, s, k in zip(
            found.base[0, there],
            found.top[0, there],
            found.strength[0, there],
            found.kind[0, there],
            strict=True,
        )
    ], found.number[0]


def test_inversions_have_base_top_strength_and_kind():
    told, number = find([2, 40, 90, 400, 800, 950, 1500], [5.0, 6.0, 8.0, 5.0, 1.0, 4.0, 0.0])
    assert told == [(2.0, 90.0, 3.0, "surface-based"), (800.0, 950.0, 3.0, "elevated")]
    assert number == 2


def test_thin_gaps_do_not_part_an_inversion_and_thick_ones_do():
    thin = find([10, 100, 150, 300], [5.0, 7.0, 6.8, 9.0])[0]
    assert thin == [(10.0, 300.0, 4.0, "surface-based")]
    thick = find([10, 100, 250, 300], [5.0, 7.0, 6.8, 9.0])[0]
    assert [inversion[:2] for inversion in thick] == [(10.0, 100.0), (250.0, 300.0)]


def test_weak_thin_and_stratospheric_rises_are_no_inversions():
    assert find([10, 100, 200], [5.0, 5.4, 3.0]) == ([], 0.0)
    assert find([10, 16, 200], [5.0, 6.4, 3.0]) == ([], 0.0)
    assert find([10, 5100, 9000], [5.0, -30.0, -20.0]) == ([], 0.0)
    assert find([10, 100, 200], [5.0, 5.0, 5.0]) == ([], 0.0)
    assert find([10], [5.0]) == ([], 0.0)


def test_the_strongest_four_are_kept_in_order_of_height():
    z = np.arange(11) * 300.0 + 10.0
    rises = [1.0, 3.0, 0.9, 2.0, 5.0]
    t = [10.0]
    for rise in rises:
        t += [t[-1] + rise, t[-1] + rise - 6.0]
    told, number = find(z, t)
    assert [inversion[2] for inversion in told] == [1.0, 3.0, 2.0, 5.0]
    assert number == 5


# --- Jet --------------------------------------------------------------------------------------


def nose(z, speed):
    z, speed = np.asarray(z, float)[np.newaxis], np.asarray(speed, float)[np.newaxis]
    found = low_level_jet.jet(z, speed, np.isfinite(z) & np.isfinite(speed))
    return found.height[0], found.speed[0], found.falloff[0], bool(found.meets[0]), found.why[0]


@pytest.mark.parametrize(
    ("z", "speed", "told"),
    [
        # a plain nose
        ([10, 100, 200, 400, 800], [3, 9, 12, 7, 8], (200, 12, 5, True, "")),
        # a wiggle above the nose ends nothing; a stronger wind does
        ([10, 100, 200, 300, 400, 800], [3, 12, 9, 9.5, 7, 13], (100, 12, 5, True, "")),
        # a lower nose that falls off enough counts, not the stronger wind above
        ([10, 100, 300, 900, 1400, 2500], [3, 10, 6, 9, 15, 16], (100, 10, 4, True, "")),
        # 2 m/s, but not 25 %
        ([10, 100, 200, 400], [8, 14, 20, 17], (200, 20, 3, False, "")),
        # 25 %, but not 2 m/s
        ([10, 100, 200, 400], [1, 2, 4, 2.5], (200, 4, 1.5, False, "")),
        # a flat nose is one nose
        ([10, 100, 200, 400], [3, 12, 12, 8], (100, 12, 4, True, "")),
        # a nose whose minimum lies above the search for noses
        ([10, 700, 1400, 2000, 3500], [3, 8, 12, 7, 2], (1400, 12, 5, True, "")),
        # the wind falls from the ground up, then a nose
        ([10, 50, 200, 400], [9, 4, 8, 5], (200, 8, 3, True, "")),
    ],
)
def test_nose_of_the_jet(z, speed, told):
    assert nose(z, speed) == told


def test_where_the_falloff_is_not_known_or_there_is_no_nose():
    height, speed, falloff, meets, why = nose([10, 100, 300], [3, 6, 9])
    assert (height, speed, meets) == (300, 9, False)
    assert math.isnan(falloff)
    assert "highest level" in why
    height, speed, falloff, meets, why = nose([10, 1000, 1400, 1800], [3, 6, 9, 12])
    assert (height, meets, math.isnan(falloff)) == (1400, False, True)
    assert "still rises at 1500 m" in why
    height, speed, falloff, meets, why = nose([10, 100, 300], [9, 6, 3])
    assert (height, speed, falloff, meets) == (10, 9, 6, False)
    assert "lowest level" in why
    height, _speed, _falloff, meets, why = nose([np.nan], [3])
    assert math.isnan(height)
    assert (meets, "no level below 1500 m" in why) == (False, True)


def slow_nose(z, speed):
    """Find the lowest nose by looking at every level in turn, without the one-pass argument."""
    for k in range(1, len(z)):
        if z[k] > low_level_jet.HIGHEST_NOSE or not (np.diff(speed[: k + 1]) > 0).any():
            continue
        lowest = math.inf
        for above, height in zip(speed[k + 1 :], z[k + 1 :], strict=True):
            if above > speed[k] or height > low_level_jet.HIGHEST_MINIMUM:
                break
            lowest = min(lowest, above)
        if speed[k] - lowest >= 2.0 and speed[k] >= 1.25 * lowest:
            return z[k]
    return None


@given(hnp.arrays(float, 12, elements=st.floats(0, 20).map(lambda x: round(x * 2) / 2)))
def test_one_pass_finds_the_lowest_nose(speed):
    z = np.array([10.0, 60, 120, 200, 320, 500, 800, 1100, 1450, 1900, 2600, 3300])
    height, _speed, _falloff, meets, _why = nose(z, speed)
    expected = slow_nose(z, speed)
    assert meets == (expected is not None)
    if meets:
        assert height == expected


# --- The stack --------------------------------------------------------------------------------

values = st.sampled_from([0.0, 1.0, 4.0, -6.0, 9.0, 14.0, np.nan, np.inf])


@st.composite
def wild_stacks(draw):
    def array(elements):
        return draw(hnp.arrays(float, (3, 7), elements=elements))

    return Stack.of(
        height=np.array([[2, 40, 90, 180, 400, 900, 2000.0]]) * np.array([[1.0], [1.3], [0.7]]),
        eastward_wind=array(values),
        northward_wind=array(values),
        air_temperature=array(st.sampled_from([280.0, 284.0, 288.0, 290.0, np.nan])),
        air_pressure=array(st.sampled_from([101325.0, 95000.0, 90000.0, np.nan])),
        dew_point_temperature=array(st.sampled_from([270.0, 280.0, np.nan])),
    )


def same(one, other, row=slice(None)):
    for name, label in labels(one).items():
        a, b = getattr(one, name)[row], getattr(other, name)
        if label.unit:
            assert np.array_equal(a, b, equal_nan=True), name
        else:
            assert a.tolist() == b.tolist(), name


@given(wild_stacks(), st.integers(0, 7))
def test_a_stack_and_a_missing_level_change_no_bit(stack, gap):
    whole = boundary_layer(stack)
    for i in range(3):
        same(whole, boundary_layer(stack.select(i)), slice(i, i + 1))
    wider = {
        name: np.insert(getattr(stack, name), gap, np.nan, axis=1)
        for name, label in labels(stack).items()
        if label.dims == ("profile", "level") and stack.has(name) and name != "level_flag"
    }
    same(whole, boundary_layer(Stack.of(profiles=3, **wider)))


@given(wild_stacks())
def test_mirror_and_quarter_turn_change_nothing(stack):
    whole = boundary_layer(stack)
    same(whole, boundary_layer(stack.replace(northward_wind=-stack.northward_wind)))
    turned = stack.replace(eastward_wind=stack.northward_wind, northward_wind=-stack.eastward_wind)
    same(whole, boundary_layer(turned))


def test_no_profile_and_labels():
    told = boundary_layer(Stack.of(profiles=0))
    assert told.jet_height.shape == (0,)
    dataset = boundary_layer(column(Z, MIXED, SPEED)).to_xarray()
    assert dataset.attrs["critical_richardson"] == 0.25
    assert "Baas" in dataset.attrs["jet_criterion"]
    assert dataset["inversion_base"].dims == ("profile", "inversion")
