import dataclasses

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import earth, ekman
from backveer.profiles import rotor as rotor_module
from backveer.profiles.flags import BIT
from backveer.profiles.humidity import dew_point_from_relative_humidity
from backveer.profiles.labels import labels
from backveer.profiles.rotor import Rotor, Turbine, rotor
from backveer.profiles.stack import Stack, wind_components

GATES = np.arange(40.0, 240.0, 20.0)
TURBINE = Turbine("north", hub_height=119.0, rotor_diameter=150.0)
SMALL = Turbine("small", hub_height=100.0, rotor_diameter=100.0)


def stack_of(z, speed, direction, **more):
    u, v = wind_components(np.asarray(speed, dtype=float), np.asarray(direction, dtype=float))
    return Stack.of(height=z, eastward_wind=u, northward_wind=v, **more)


def random_stack(seed=0, profiles=40, missing=0.15, **more):
    """Profiles that differ, with missing levels, calms and turns through north."""
    random = np.random.default_rng(seed)
    shape = (profiles, GATES.size)
    speed = np.abs(8.0 * (GATES / 100.0) ** 0.2 + random.normal(0.0, 1.5, shape))
    direction = random.uniform(0, 360, (profiles, 1)) + random.normal(0, 0.2, (profiles, 1)) * GATES
    direction = direction + random.normal(0.0, 4.0, shape)
    speed[random.random(shape) < 0.02] = 0.0
    stack = stack_of(GATES, speed, direction, **more)
    gone = random.random(shape) < missing
    return stack.replace(eastward_wind=np.where(gone, np.nan, stack.eastward_wind))


def same(a, b, names=None):
    for name in names or labels(Rotor):
        one, other = getattr(a, name), getattr(b, name)
        if one.dtype == object:
            assert (one == other).all(), name
        else:
            np.testing.assert_array_equal(one, other, err_msg=name)


def test_fields_of_the_contract():
    """The keys that design.md gives to a rotor in JSON (``why`` words and sizes included)."""
    keys = (
        "turbine, hub_height, rotor_diameter, hub_speed, hub_direction, veer, veer_rate, "
        "steepest_veer_rate, veer_upper_half, veer_lower_half, shear_exponent, equivalent_speed, "
        "equivalent_speed_with_veer, energy_flux_ratio, air_density, coverage, why"
    )
    assert set(keys.split(", ")) <= set(labels(Rotor))


@pytest.mark.parametrize("rate", [0.1, -0.25])
def test_linear_veer_and_power_law(rate):
    z = np.arange(30.0, 171.0, 2.0)
    told = rotor(stack_of(z, 8.0 * (z / 100.0) ** 0.2, 350.0 + rate * (z - 100.0)), SMALL)
    assert told.veer[0, 0] == pytest.approx(rate * 100.0)
    assert told.veer_upper_half[0, 0] == pytest.approx(rate * 50.0)
    assert told.veer_lower_half[0, 0] == pytest.approx(rate * 50.0)
    assert told.veer_rate[0, 0] == pytest.approx(rate)
    assert told.steepest_veer_rate[0, 0] == pytest.approx(rate)
    assert told.hub_speed[0, 0] == pytest.approx(8.0)
    assert told.hub_direction[0, 0] == pytest.approx(350.0)
    assert told.shear_exponent[0, 0] == pytest.approx(0.2)
    assert told.shear_exponent_error[0, 0] < 1e-10
    assert told.shear_exponent_tips[0, 0] == pytest.approx(0.2)
    # Checks R6 (derived): alpha 0.2 with no veer 0.997398, with 0.1 deg/m 0.996457; straight lines
    # every 2 m are within 2e-5 of the power law.
    assert told.equivalent_speed_ratio[0, 0] == pytest.approx(0.997398, abs=2e-5)
    if rate == 0.1:
        assert told.equivalent_speed_with_veer[0, 0] / 8.0 == pytest.approx(0.996457, abs=2e-5)
    assert told.energy_flux_ratio[0, 0] == pytest.approx(told.equivalent_speed_ratio[0, 0] ** 3)
    assert told.coverage[0, 0] == pytest.approx(1.0)
    assert told.why[0, 0] == ""


def test_segments_take_the_wind_at_their_middle():
    """By hand: three slices of 40 m about 60, 100 and 140 m, area fractions of checks R5."""
    z = np.array([40.0, 60.0, 100.0, 140.0, 160.0])
    speed, direction = np.array([5.0, 6.0, 8.0, 9.0, 9.5]), np.array([250, 255, 270, 280, 281.0])
    told = rotor(stack_of(z, speed, direction), Turbine("t", 100.0, 120.0), segments=3)
    share = np.array([0.291791, 0.416417, 0.291791])
    cube = np.array([6.0, 8.0, 9.0]) ** 3
    along = np.cos(np.radians([15.0, 0.0, 10.0])) ** 3
    assert told.equivalent_speed_segments[0, 0] == pytest.approx(
        np.cbrt((share * cube).sum()), rel=1e-6
    )
    assert told.equivalent_speed_with_veer_segments[0, 0] == pytest.approx(
        np.cbrt((share * cube * along).sum()), rel=1e-6
    )


def test_many_segments_come_to_the_exact_integral():
    stack = random_stack(1, missing=0.0)
    told = rotor(stack, TURBINE, segments=800)
    for name in ("equivalent_speed", "equivalent_speed_with_veer"):
        exact, sliced = getattr(told, name)[:, 0], getattr(told, f"{name}_segments")[:, 0]
        assert (np.isfinite(exact) == np.isfinite(sliced)).all()
        np.testing.assert_allclose(sliced, exact, rtol=5e-5)
        assert np.isfinite(exact).sum() > 20


def test_steepest_rate_and_its_place():
    z = np.array([40.0, 60.0, 80.0, 100.0, 120.0, 140.0, 160.0, 180.0])
    direction = np.array([0.0, 50.0, 352.0, 350.0, 338.0, 340.0, 342.0, 400.0])
    told = rotor(stack_of(z, 8.0, direction), Turbine("t", 110.0, 80.0))
    # 50 to 352 is a step of -58 by the short way round, inside the rotor from 70 m on.
    assert told.steepest_veer_rate[0, 0] == pytest.approx(-58.0 / 20.0)
    assert told.veer[0, 0] == pytest.approx(341.0 - (352.0 + 29.0))
    outside = rotor(stack_of(z, 8.0, direction), Turbine("t", 120.0, 80.0))
    assert outside.steepest_veer_rate[0, 0] == pytest.approx(-12.0 / 20.0)


def test_close_levels_do_not_make_the_steepest_rate():
    z = np.arange(40.0, 161.0, 2.0)
    saw = 270.0 + 3.0 * (np.arange(z.size) % 2)
    told = rotor(stack_of(z, 8.0, saw), SMALL)
    assert abs(told.steepest_veer_rate[0, 0]) <= 3.0 / 10.0 + 1e-9


def test_logarithmic_profile_gives_its_roughness():
    z0 = 0.04
    told = rotor(stack_of(GATES, 0.9 * np.log(GATES / z0), 200.0), TURBINE)
    assert told.roughness_length[0, 0] == pytest.approx(z0, rel=1e-9)
    assert told.roughness_why[0, 0] == ""


@pytest.mark.parametrize(
    ("speed", "words"),
    [
        (np.linspace(9.0, 7.0, GATES.size), "does not grow"),
        (np.where(np.arange(GATES.size) % 2, 6.0, 8.0) + GATES / 200.0, "closely enough"),
        (3.0 * (GATES / 40.0) ** 0.9, "no roughness that ground or sea has"),
    ],
)
def test_roughness_is_withheld(speed, words):
    told = rotor(stack_of(GATES, speed, 200.0), TURBINE)
    assert np.isnan(told.roughness_length[0, 0])
    assert words in told.roughness_why[0, 0]


def test_nose_inside_the_rotor():
    z = np.array([40.0, 60.0, 80.0, 100.0, 120.0, 140.0, 160.0])
    speed = np.array([6.0, 7.0, 8.0, 9.5, 9.0, 8.0, 7.0])
    told = rotor(stack_of(z, speed, 10.0), SMALL)
    assert told.nose_height[0, 0] == 100.0
    assert told.nose_speed[0, 0] == 9.5
    assert told.nose_falloff[0, 0] == pytest.approx(2.0)
    assert told.shear_above_nose[0, 0] == pytest.approx(-2.0 / 50.0)
    weak = np.array([6.0, 7.0, 8.0, 9.5, 9.4, 9.3, 9.2])
    assert np.isnan(rotor(stack_of(z, weak, 10.0), SMALL).nose_height[0, 0])
    for one_way in (z, z[::-1]):  # rising, then falling all the way
        assert np.isnan(rotor(stack_of(z, one_way / 10.0, 10.0), SMALL).nose_height[0, 0])


def test_turbulence_and_veer_error():
    stack = stack_of(GATES, 8.0, 30.0, wind_speed_deviation=0.5 + GATES / 400.0, wind_error=[0.1])
    told = rotor(stack, TURBINE)
    assert told.turbulence_intensity[0, 0] == pytest.approx((0.5 + 119.0 / 400.0) / 8.0)
    # In a strong wind the error of a direction is that of the component over the speed.
    expected = np.degrees(np.sqrt(2.0) * 0.1 / 8.0)
    assert told.veer_error[0, 0] == pytest.approx(expected, rel=1e-3)
    twice = rotor(stack, TURBINE, error=0.2)
    assert twice.veer_error[0, 0] == pytest.approx(2.0 * expected, rel=2e-3)
    plain = rotor(stack_of(GATES, 8.0, 30.0), TURBINE)
    assert np.isnan([plain.veer_error[0, 0], plain.turbulence_intensity[0, 0]]).all()


def test_density_normalised_speed():
    """IEC density of checks R7c (derived): 303.15 K, 95000 Pa, 0.8 gives 1.07687 kg/m3."""
    dew = dew_point_from_relative_humidity(303.15, 0.8)
    stack = stack_of(
        [50.0, 119.0, 200.0], 9.0, 0.0,
        air_temperature=303.15, air_pressure=95000.0, dew_point_temperature=dew,
    )  # fmt: skip
    told = rotor(stack, TURBINE, gap_limit=1.0)
    assert told.air_density[0, 0] == pytest.approx(1.07687, abs=5e-6)
    assert told.density_normalised_speed[0, 0] == pytest.approx(
        9.0 * (1.07687 / 1.225) ** (1 / 3), abs=2e-5
    )
    assert told.air_density_from[0, 0] == "pressure, temperature and humidity"


# -- bad input: a clear word each, nothing invented


def test_hub_below_the_lowest_level():
    told = rotor(stack_of(GATES + 100.0, 8.0, 10.0), TURBINE)
    assert "the hub lies below the lowest valid level" in told.why[0, 0]
    assert "too little of the rotor is covered" in told.why[0, 0]
    assert np.isnan([told.hub_speed[0, 0], told.veer[0, 0], told.equivalent_speed[0, 0]]).all()


def test_hub_above_the_highest_level():
    told = rotor(stack_of([10.0, 40.0, 80.0], 8.0, 10.0), TURBINE)
    assert told.why[0, 0].startswith("the hub lies above the highest valid level; ")
    assert np.isnan([told.hub_speed[0, 0], told.energy_flux_ratio[0, 0]]).all()


def test_rotor_below_the_ground():
    told = rotor(stack_of(GATES, 8.0, 10.0), Turbine("t", 119.0, 240.0))
    assert "the rotor reaches below the ground" in told.why[0, 0]
    assert told.hub_speed[0, 0] == pytest.approx(8.0)
    assert np.isnan([told.veer[0, 0], told.equivalent_speed[0, 0], told.shear_exponent[0, 0]]).all()


def test_part_of_the_rotor():
    """Lidar from 40 to 220 m, rotor from 33.5 to 204.5 m: the issue's own example."""
    told = rotor(stack_of(GATES, 8.0, 0.5 * GATES), Turbine("t", 119.0, 171.0))
    assert told.why[0, 0] == (
        "the lower tip lies below the lowest valid level; "
        "veer, shear and equivalent speed are those of the covered part of the rotor"
    )
    assert (told.covered_base[0, 0], told.covered_top[0, 0]) == (40.0, 204.5)
    assert told.veer[0, 0] == pytest.approx(0.5 * 164.5)
    assert told.veer_rate[0, 0] == pytest.approx(0.5)
    x = 1.0 - 6.5 / 85.5
    below = 0.5 - (x * np.sqrt(1 - x**2) + np.arcsin(x)) / np.pi
    assert told.coverage[0, 0] == pytest.approx(1.0 - below, abs=1e-9)
    strict = rotor(stack_of(GATES, 8.0, 10.0), Turbine("t", 119.0, 171.0), coverage_limit=1.0)
    assert np.isnan(strict.veer[0, 0])
    assert "too little of the rotor is covered" in strict.why[0, 0]
    assert strict.hub_speed[0, 0] == pytest.approx(8.0)


def test_tip_above_all_levels():
    told = rotor(stack_of(GATES[:7], 8.0, 10.0), TURBINE)
    assert told.why[0, 0].startswith("the upper tip lies above the highest valid level")
    assert told.covered_top[0, 0] == 160.0
    assert not told.extrapolated[0, 0]


def test_gap_inside_the_rotor():
    gone = (GATES > 60.0) & (GATES < 160.0)
    speed = np.where(gone, np.nan, 8.0)
    told = rotor(stack_of(GATES, speed, 10.0), TURBINE)
    assert "the levels around hub height are too far apart" in told.why[0, 0]
    assert "neighbouring levels inside the rotor are too far apart" in told.why[0, 0]
    assert np.isnan(told.hub_speed[0, 0])
    assert np.isnan(told.hub_direction[0, 0])
    joined = rotor(stack_of(GATES, speed, 10.0), TURBINE, gap_limit=0.7)
    assert joined.hub_speed[0, 0] == pytest.approx(8.0)


def test_gap_near_the_tip_is_left_out():
    z = np.delete(GATES, 7)  # from 160 to 200 m nothing
    direction = np.where(z > 190.0, 60.0, 0.1 * z)
    told = rotor(stack_of(z, 8.0, direction), TURBINE, gap_limit=0.2, coverage_limit=0.6)
    assert told.covered_top[0, 0] == 160.0
    assert told.veer[0, 0] == pytest.approx(0.1 * (160.0 - 44.0))
    assert told.steepest_veer_rate[0, 0] == pytest.approx(0.1)
    assert told.why[0, 0] == (
        "neighbouring levels inside the rotor are too far apart to be joined; "
        "veer, shear and equivalent speed are those of the covered part of the rotor"
    )
    low = np.delete(GATES, 3)  # from 80 to 120 m nothing, where the wind turns by 30 degrees
    direction = np.where(low > 100.0, 30.0, 0.0) + 0.1 * low
    inner = rotor(stack_of(low, 8.0, direction), Turbine("t", 140.0, 150.0), 0.6, gap_limit=0.2)
    assert inner.veer[0, 0] == pytest.approx(30.0 + 0.1 * 150.0)
    assert inner.steepest_veer_rate[0, 0] == pytest.approx(0.1)


def test_calm_at_one_level_has_no_direction():
    speed = np.full(GATES.size, 8.0)
    speed[4] = 0.0
    told = rotor(stack_of(GATES, speed, 10.0), TURBINE)
    assert "no direction at a level" in told.why[0, 0]
    assert np.isnan([told.veer[0, 0], told.equivalent_speed_with_veer[0, 0]]).all()
    assert np.isfinite([told.equivalent_speed[0, 0], told.hub_speed[0, 0]]).all()
    # The same far below the rotor hurts nothing.
    low = np.full(GATES.size, 8.0)
    low[0] = 0.0
    above = rotor(stack_of(GATES, low, 10.0 + GATES / 10.0), Turbine("t", 150.0, 100.0))
    assert above.veer[0, 0] == pytest.approx(10.0)
    assert above.hub_direction[0, 0] == pytest.approx(25.0)


def test_flagged_direction_is_not_used():
    flag = np.where(GATES == 120.0, BIT["calm_without_direction"], 0).astype(np.uint32)
    told = rotor(stack_of(GATES, 0.4, 10.0, level_flag=flag), TURBINE)
    assert "no direction at a level" in told.why[0, 0]
    assert np.isnan(told.hub_direction[0, 0])
    assert told.equivalent_speed[0, 0] == pytest.approx(0.4)


def test_calm_everywhere():
    told = rotor(stack_of(GATES, 0.0, 0.0), TURBINE)
    assert "it is calm at hub height" in told.why[0, 0]
    assert told.hub_speed[0, 0] == 0.0
    assert told.equivalent_speed[0, 0] == 0.0
    assert np.isnan([told.energy_flux_ratio[0, 0], told.hub_direction[0, 0]]).all()


def test_turn_that_cannot_be_followed():
    direction = np.where(GATES < 130.0, 10.0, 200.0)
    told = rotor(stack_of(GATES, 8.0, direction), TURBINE)
    assert "more than 120 degrees between neighbouring levels" in told.why[0, 0]
    assert np.isnan([told.veer[0, 0], told.steepest_veer_rate[0, 0]]).all()
    assert told.equivalent_speed[0, 0] == pytest.approx(8.0)
    assert told.hub_direction[0, 0] == pytest.approx(10.0)
    across = rotor(stack_of(GATES, 8.0, direction), Turbine("t", 130.0, 100.0))
    assert np.isnan(across.hub_direction[0, 0])


def test_wind_from_behind():
    direction = 2.0 * (GATES - 119.0)
    told = rotor(stack_of(GATES, 8.0, direction), TURBINE)
    assert "more than 90 degrees from that at the hub" in told.why[0, 0]
    assert np.isnan(told.equivalent_speed_with_veer[0, 0])
    assert told.veer[0, 0] == pytest.approx(300.0)


def test_nothing_at_all():
    for stack in (
        Stack.of(height=[[np.nan] * 3] * 2),
        Stack.of(height=np.zeros((2, 0))),
        Stack.of(height=GATES, profiles=2),
    ):
        told = rotor(stack, [TURBINE, SMALL])
        assert (told.why == "no level has a valid wind").all()
        assert (told.coverage == 0.0).all()
        assert np.isnan(told.hub_speed).all()
    none = rotor(Stack.of(profiles=0), TURBINE)
    assert none.veer.shape == (0, 1)
    assert rotor(stack_of(GATES, 8.0, 0.0), []).veer.shape == (1, 0)


def test_one_level_at_the_hub():
    told = rotor(stack_of([119.0], 8.0, 33.0), TURBINE)
    assert told.hub_speed[0, 0] == 8.0
    assert told.hub_direction[0, 0] == pytest.approx(33.0)
    assert np.isnan(told.veer[0, 0])


@pytest.mark.parametrize("size", [np.inf, 1e300, 1e-300, 5e-324])
def test_hostile_numbers(size):
    speed = np.full(GATES.size, size)
    stack = Stack.of(height=GATES, eastward_wind=speed, northward_wind=-speed)
    told = rotor(stack, TURBINE)
    assert np.isnan(told.equivalent_speed[0, 0])
    assert told.why[0, 0] != ""


def test_heights_that_do_not_increase_raise_nothing():
    z = np.array([40.0, 120.0, 120.0, 60.0, 200.0, 90.0])
    rotor(stack_of(z, np.arange(6.0), 10.0), TURBINE)


@pytest.mark.parametrize(
    ("hub", "diameter", "words"),
    [
        (390.0, 561.0, "hub height of 390 m is larger than any built.* 390 ft are 118.9 m"),
        (119.0, 561.0, "rotor diameter of 561 m"),
        (-119.0, 171.0, "hub height must be a positive number of metres, not -119"),
        (119.0, float("nan"), "rotor diameter must be a positive number"),
    ],
)
def test_turbines_that_cannot_be(hub, diameter, words):
    with pytest.raises(ValueError, match=f"turbine 'T1': a? ?{words}"):
        Turbine("T1", hub, diameter)


@pytest.mark.parametrize(
    ("settings", "words"),
    [
        ({"coverage_limit": 0.0}, "coverage limit is a share"),
        ({"gap_limit": 2.0}, "gap limit is a share"),
        ({"segments": 0}, "at least one segment, not 0"),
        ({"extrapolate": True}, "needs the Ekman fit"),
    ],
)
def test_settings_that_cannot_be(settings, words):
    with pytest.raises(ValueError, match=words):
        rotor(stack_of(GATES, 8.0, 0.0), TURBINE, **settings)


# -- extrapolation


@dataclasses.dataclass(frozen=True)
class TurningFit:
    """Stands in for a fit: a wind that turns at a steady rate, and where it is good."""

    verdict: np.ndarray

    def select(self, profiles):
        return TurningFit(self.verdict[profiles])


def turning_wind(fit, z):
    u, v = wind_components(np.full(z.shape, 8.0), 10.0 + 0.2 * z)
    return u, v


def test_extrapolation_is_an_option_and_marked(monkeypatch):
    monkeypatch.setattr("backveer.profiles.ekman.wind", turning_wind)
    z = GATES[:6]  # to 140 m, the tip at 194 m
    direction = 10.0 + 0.2 * z
    stack = stack_of(z, np.full((3, 6), 8.0), direction)
    lower = stack.replace(eastward_wind=stack.eastward_wind.copy())
    lower.eastward_wind[2, 3:] = np.nan  # the hub itself is out of reach
    fit = TurningFit(np.array(["well determined", "weakly determined", "well determined"], object))
    told = rotor(lower, TURBINE, extrapolate=True, fit=fit)
    assert told.extrapolated[:, 0].tolist() == [True, False, False]
    assert told.covered_top[0, 0] == 194.0
    assert told.coverage[0, 0] == pytest.approx(1.0)
    assert told.veer[0, 0] == pytest.approx(0.2 * 150.0, abs=1e-6)
    assert told.equivalent_speed[0, 0] == pytest.approx(8.0, abs=1e-6)
    assert "no well determined Ekman fit" in told.why[1, 0]
    assert told.covered_top[1, 0] == 140.0
    assert np.isnan(told.hub_speed[2, 0])
    plain = rotor(lower, TURBINE, fit=fit)
    assert not plain.extrapolated.any()
    assert plain.covered_top[0, 0] == 140.0


def test_extrapolation_has_no_leap(monkeypatch):
    """Only the model's change with height counts, not its offset from the highest level."""
    monkeypatch.setattr("backveer.profiles.ekman.wind", turning_wind)
    z = GATES[:6]
    fit = TurningFit(np.array(["well determined"], object))
    told = rotor(stack_of(z, 11.0, 38.0), TURBINE, extrapolate=True, fit=fit)
    u, v = turning_wind(None, np.array([140.0, 194.0]))
    u0, v0 = wind_components(np.array([11.0]), np.array([38.0]))
    tip = np.hypot(u0 + u[1] - u[0], v0 + v[1] - v[0])[0]
    assert told.shear_exponent_tips[0, 0] == pytest.approx(
        np.log(tip / 11.0) / np.log(194.0 / 44.0)
    )


def test_extrapolation_with_a_real_fit():
    """
    A spiral with scale height 70 m, measured to 140 m, of which the rotor reaches 194 m.

    u + i v = G (1 - exp(-(1 + i) z / delta)): Ekman (1905).
    """

    def spiral(z):
        return 10.0 * (1.0 - np.exp(-(1.0 + 1j) * z / 70.0))

    low, high = np.arange(10.0, 141.0, 10.0), np.arange(10.0, 301.0, 10.0)
    short, long = (
        Stack.of(
            height=z, eastward_wind=spiral(z).real, northward_wind=spiral(z).imag, latitude=52.0
        )
        for z in (low, high)
    )
    fit = ekman.fit(short, earth.coriolis(short), error=np.full(1, 0.05))
    assert fit.verdict[0] == "well determined"
    told = rotor(short, TURBINE, extrapolate=True, fit=fit)
    whole = rotor(long, TURBINE)
    assert told.extrapolated[0, 0]
    assert told.covered_top[0, 0] == 194.0
    assert told.veer[0, 0] == pytest.approx(whole.veer[0, 0], abs=0.1)
    assert told.equivalent_speed[0, 0] == pytest.approx(whole.equivalent_speed[0, 0], abs=0.01)


# -- properties

SCALARS = [
    name
    for name, label in labels(Rotor).items()
    if label.dims == ("profile", "turbine") and label.unit and name != "hub_direction"
]
TURNED = {
    "veer", "veer_rate", "steepest_veer_rate", "veer_upper_half", "veer_lower_half",
}  # fmt: skip


@given(angle=st.floats(0.0, 360.0), seed=st.integers(0, 20))
def test_rotating_the_wind_changes_only_directions(angle, seed):
    stack = random_stack(seed, profiles=12, wind_error=np.full(12, 0.2))
    turn = np.exp(-1j * np.radians(angle))
    w = (stack.eastward_wind + 1j * stack.northward_wind) * turn
    a = rotor(stack, [TURBINE, SMALL])
    b = rotor(stack.replace(eastward_wind=w.real, northward_wind=w.imag), [TURBINE, SMALL])
    for name in SCALARS:
        np.testing.assert_allclose(
            getattr(b, name), getattr(a, name), rtol=1e-9, atol=1e-8, err_msg=name
        )
    turned = (b.hub_direction - a.hub_direction - angle + 180.0) % 360.0 - 180.0
    assert np.nanmax(np.abs(turned), initial=0.0) < 1e-8
    assert (a.why == b.why).all()


@given(seed=st.integers(0, 20))
def test_mirror(seed):
    """North for south turns every veer round, exactly, and changes nothing else."""
    stack = random_stack(seed, profiles=12)
    a = rotor(stack, [TURBINE, SMALL])
    b = rotor(stack.replace(northward_wind=-stack.northward_wind), [TURBINE, SMALL])
    for name in SCALARS:
        sign = -1.0 if name in TURNED else 1.0
        np.testing.assert_array_equal(getattr(b, name), sign * getattr(a, name), err_msg=name)


@given(seed=st.integers(0, 20))
def test_missing_level_changes_nothing(seed):
    stack = random_stack(seed, profiles=12)
    z, u, v = (
        np.insert(x, place, np.nan, axis=1)
        for x in (stack.height, stack.eastward_wind, stack.northward_wind)
        for place in [seed % (GATES.size + 1)]
    )
    longer = Stack.of(height=z, eastward_wind=u, northward_wind=v)
    same(rotor(stack, [TURBINE, SMALL]), rotor(longer, [TURBINE, SMALL]))


def test_stack_is_its_profiles_one_at_a_time(monkeypatch):
    random = np.random.default_rng(8)
    stack = random_stack(
        5, profiles=60, wind_error=np.full(60, 0.2), elevation=np.linspace(0.0, 900.0, 60),
        wind_speed_deviation=random.uniform(0.2, 1.0, (60, GATES.size)),
        air_temperature=np.where(random.random((60, 1)) < 0.5, np.nan, 283.0),
    )  # fmt: skip
    stack = stack.replace(height=stack.height + random.uniform(0.0, 15.0, (60, 1)))
    whole = rotor(stack, [TURBINE, SMALL])
    for row in range(60):
        same(whole.select(row), rotor(stack.select(row), [TURBINE, SMALL]))
    monkeypatch.setattr(rotor_module, "_BLOCK", 7)
    same(whole, rotor(stack, [TURBINE, SMALL]))


def test_turbines_do_not_touch_each_other():
    stack = random_stack(2)
    both = rotor(stack, [TURBINE, SMALL])
    alone = rotor(stack, SMALL)
    for name in SCALARS:
        np.testing.assert_array_equal(getattr(both, name)[:, 1], getattr(alone, name)[:, 0])
    assert both.turbine.tolist() == ["north", "small"]
    assert both.to_xarray()["veer"].dims == ("profile", "turbine")
    assert len(both.to_pandas()) == 80
