import numpy as np
import pytest

from backveer.profiles import hub_air
from backveer.profiles.air import standard_atmosphere
from backveer.profiles.hub_air import air_density
from backveer.profiles.humidity import dew_point_from_relative_humidity
from backveer.profiles.stack import Stack


def test_standard_atmosphere_at_the_site():
    """Table of the standard atmosphere, checks 8a (S2): 1.2250 at 0 m, 1.11164 at 1000 m."""
    stack = Stack.of(height=[10.0], elevation=[-100.0, 900.0, np.nan])
    density, origin = air_density(stack, 100.0)
    # The table is by geopotential height; 1000 m are 999.84 (checks 8b), 2e-5 of the density.
    assert density[:2] == pytest.approx([1.2250, 1.11164], abs=5e-5)
    assert np.isnan(density[2])
    assert origin.tolist() == [hub_air.STANDARD, hub_air.STANDARD, hub_air.NEITHER]


def test_elevation_from_the_altitude_of_a_level():
    stack = Stack.of(
        height=[[np.nan, 10.0], [5.0, 10.0]], altitude=[[400.0, 910.0], [np.nan, np.nan]]
    )
    density, origin = air_density(stack, 100.0)
    assert density[0] == pytest.approx(1.11164, abs=5e-5)
    assert origin.tolist() == [hub_air.STANDARD, hub_air.NEITHER]


@pytest.mark.parametrize(
    ("temperature", "pressure", "humidity", "expected"),
    [
        # Checks R7b and R7c (derived from the formula of IEC 61400-12-1, five digits printed).
        (288.15, 101325.0, 1.0, 1.21745),
        (293.15, 101325.0, 0.5, 1.19902),
        (303.15, 95000.0, 0.8, 1.07687),
        (273.15, 90000.0, 0.5, 1.14630),
    ],
)
def test_iec_density(temperature, pressure, humidity, expected):
    stack = Stack.of(
        height=[50.0, 150.0],
        air_temperature=temperature,
        air_pressure=pressure,
        dew_point_temperature=dew_point_from_relative_humidity(temperature, humidity),
    )
    density, origin = air_density(stack, 100.0)
    assert density[0] == pytest.approx(expected, abs=6e-6)
    assert origin[0] == hub_air.MEASURED


def test_missing_humidity_is_half():
    """Checks R7b: 288.15 K, 101325 Pa and 50 % give 1.22123 kg/m3."""
    stack = Stack.of(height=[50.0, 150.0], air_temperature=288.15, air_pressure=101325.0)
    density, origin = air_density(stack, 100.0)
    assert density[0] == pytest.approx(1.22123, abs=6e-6)
    assert origin[0] == hub_air.NO_HUMIDITY


def test_between_levels():
    stack = Stack.of(
        height=[0.0, 50.0, 200.0],
        air_temperature=[270.0, 290.0, 284.0],
        air_pressure=[2e5, 100000.0, 98000.0],
    )
    density, _ = air_density(stack, 100.0)
    level = Stack.of(
        height=[100.0],
        air_temperature=288.0,
        air_pressure=np.exp((2 * np.log(100000.0) + np.log(98000.0)) / 3),
    )
    assert density[0] == pytest.approx(air_density(level, 100.0)[0][0], rel=1e-12)


@pytest.mark.parametrize("level", [0.0, 260.0])
def test_nearest_level_is_brought_to_the_hub(level):
    """In the standard atmosphere the way to the hub must end in the standard atmosphere."""
    temperature, pressure = standard_atmosphere(level)
    stack = Stack.of(
        height=[level],
        air_temperature=temperature,
        air_pressure=pressure,
        dew_point_temperature=150.0,  # dry
    )
    density, origin = air_density(stack, 130.0)
    temperature, pressure = standard_atmosphere(130.0)
    dry = pressure / (287.05 * temperature)
    assert density[0] == pytest.approx(dry, rel=1e-6)
    assert origin[0] == hub_air.MEASURED
    far, origin = air_density(stack, 130.0 + 400.0)
    assert np.isnan(far[0])
    assert origin[0] == hub_air.NEITHER


def test_temperature_alone():
    stack = Stack.of(height=[90.0, 110.0], air_temperature=300.0, elevation=0.0)
    density, origin = air_density(stack, 100.0)
    expected, _ = air_density(
        stack.replace(air_pressure=np.full((1, 2), standard_atmosphere(100.0)[1])), 100.0
    )
    assert density[0] == pytest.approx(expected[0], rel=1e-5)
    assert origin[0] == hub_air.NO_PRESSURE


def test_pressure_alone_is_not_enough():
    stack = Stack.of(height=[90.0, 110.0], air_pressure=99000.0, elevation=0.0)
    assert air_density(stack, 100.0)[1][0] == hub_air.STANDARD


@pytest.mark.parametrize("bad", [0.0, -5.0, np.inf, 1e308])
def test_hostile_numbers(bad):
    stack = Stack.of(height=[90.0, 110.0], air_temperature=bad, air_pressure=bad)
    density, origin = air_density(stack, 100.0)
    assert np.isnan(density[0]) or density[0] > 0
    assert np.isnan(density[0]) == origin[0].startswith("not determined")


def test_no_levels_and_no_profiles():
    assert air_density(Stack.of(height=np.zeros((2, 0)), elevation=0.0), 100.0)[0].shape == (2,)
    assert air_density(Stack.of(profiles=0), 100.0)[0].shape == (0,)
