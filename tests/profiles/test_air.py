"""Moist air, thickness and the standard atmosphere against tables, textbooks and MetPy."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import air
from backveer.profiles.humidity import dew_point_from_mixing_ratio

C = 273.15

# Standard atmosphere 1976 / ICAO (checks.md 8a: second hand, the same in the printed table from
# memory): geopotential height [m], temperature [K], pressure [Pa], density [kg m-3].
TABLE = np.array(
    [
        (-1000.0, 294.65, 113929.0, 1.3470),
        (0.0, 288.15, 101325.0, 1.2250),
        (1000.0, 281.65, 89874.6, 1.11164),
        (2000.0, 275.15, 79495.2, 1.00649),
        (3000.0, 268.65, 70108.5, 0.909122),
        (4000.0, 262.15, 61640.2, 0.819129),
        (5000.0, 255.65, 54019.9, 0.736116),
        (6000.0, 249.15, 47181.0, 0.659697),
        (7000.0, 242.65, 41060.7, 0.589501),
        (8000.0, 236.15, 35599.8, 0.525168),
        (10000.0, 223.15, 26436.3, 0.412707),
        (12000.0, 216.65, 19330.4, 0.310828),
    ]
)


def test_standard_atmosphere_of_the_table():
    h, t, p, rho = TABLE.T
    ours_t, ours_p = air.standard_atmosphere(h)
    np.testing.assert_allclose(ours_t, t, rtol=0, atol=1e-9)
    # half of the last digit printed, and 2e-6 for the rounding of the table's own constants
    assert np.all(np.abs(ours_p - p) <= np.where(h < 0, 0.5, 0.05) + 2e-6 * p)
    # half of the last digit printed, which is the fourth decimal up to the ground
    assert np.all(np.abs(air.standard_density(h) - rho) <= np.where(h <= 0, 6e-5, 6e-6))
    np.testing.assert_allclose(air.standard_height(p), h, rtol=0, atol=0.05)


def test_standard_atmosphere_of_a_textbook():
    # Stull, Practical Meteorology (second hand): H 2.5 km, 271.9 K, 74.7 kPa; tropopause 22632 Pa
    t, p = air.standard_atmosphere(2500.0)
    assert t == pytest.approx(271.9, abs=0.05)
    assert p == pytest.approx(74700.0, abs=50.0)
    assert air.standard_atmosphere(11000.0)[1] == pytest.approx(22632.0, abs=0.5)
    # 1976 table above the tropopause (from memory): 20 km 5474.89 Pa, 32 km 868.02 Pa; the last
    # digit depends on the rounding of R
    _t, p = air.standard_atmosphere(np.array([20000.0, 32000.0]))
    np.testing.assert_allclose(p, [5474.89, 868.02], rtol=6e-6)


def test_standard_height_as_another_library_prints_it():
    # MetPy 1.7.1 (S1), printed to 0.1 m; its gas constant differs in the sixth digit
    p = np.array([97520.0, 98750.0, 95600.0, 94300.0])
    np.testing.assert_allclose(air.standard_height(p), [321.5, 216.5, 487.6, 601.7], atol=0.3)


@given(st.floats(-5000.0, 80000.0))
def test_standard_height_is_the_inverse(h):
    t, p = air.standard_atmosphere(h)
    assert air.standard_height(p) == pytest.approx(h, abs=1e-6)
    assert air.density(p, t) == pytest.approx(air.standard_density(h))


def test_standard_atmosphere_is_hydrostatic_and_continuous_at_every_base():
    h = np.arange(-5000.0, 80000.0, 10.0)
    t, p = air.standard_atmosphere(h)
    assert np.all(np.diff(p) < 0)
    middle = 0.5 * (t[1:] + t[:-1])
    np.testing.assert_allclose(air.thickness(p[:-1], p[1:], middle), 10.0, rtol=1e-6)


def test_standard_atmosphere_ends_where_its_table_does():
    t, p = air.standard_atmosphere(np.array([-5001.0, 80001.0, np.nan, np.inf, -np.inf]))
    assert np.isnan(t).all()
    assert np.isnan(p).all()
    assert np.isnan(air.standard_height(np.array([0.0, -1.0, np.nan, np.inf, 1e-300, 1e9]))).all()


@pytest.mark.parametrize(
    ("p1", "p2", "tv", "expected", "tolerance"),
    [
        # Holton, problem 1.12 solution (second hand): R 287, g 9.8, isothermal 273 and 250 K
        (1000.0, 500.0, 273.0, 5536.0, 6.0),
        (1000.0, 500.0, 250.0, 5070.0, 6.0),
        # Wallace and Hobbs (second hand): Tv 288 and 233 K, 585 and 473 dam
        (1000.0, 500.0, 288.0, 5850.0, 8.0),
        (1000.0, 500.0, 233.0, 4730.0, 8.0),
        # MetPy 1.7.1 tests (S1), isothermal 0 deg C; R of dry air differs in the fifth digit
        (1000.0, 500.0, 273.15, 5541.91, 0.2),
        (850.0, 500.0, 273.15, 4242.527, 0.2),
        # Stull, Practical Meteorology (second hand): 50 kPa at 0 deg C, ground 101.3 kPa: 5.64 km
        (1013.0, 500.0, 273.15, 5640.0, 8.0),
    ],
)
def test_thickness_of_textbook_layers(p1, p2, tv, expected, tolerance):
    ours = air.thickness(p1 * 100.0, p2 * 100.0, tv)
    assert ours == pytest.approx(expected, abs=tolerance)
    assert air.thickness(p2 * 100.0, p1 * 100.0, tv) == pytest.approx(-ours)


def test_sixty_metres_of_thickness_are_three_kelvin():
    # Holton, problem 1.13 (second hand): 60 m between contours of 1000-500 hPa: 2.96 K
    per_kelvin = air.thickness(100000.0, 50000.0, 1.0)
    assert 60.0 / per_kelvin == pytest.approx(2.96, abs=0.005)


def test_scale_height_of_the_sea_level_correction():
    # Wallace and Hobbs (second hand): 1014 hPa at sea level, scale height 8 km: Z(1000) = 111.2 m
    tv = 8000.0 / air.scale_height(1.0)
    assert air.thickness(101400.0, 100000.0, tv) == pytest.approx(111.2, abs=0.05)


@pytest.mark.parametrize(
    ("p", "t", "expected", "tolerance"),
    [
        # Stull, Practical Meteorology (second hand)
        (70000.0, 10.0 + C, 40.4 + C, 0.05),
        (90000.0, 30.0 + C, 39.3 + C, 0.1),
        # MetPy 1.7.1 tests (S1)
        (90000.0, 278.0, 286.496, 0.001),
        (50000.0, 283.0, 344.981, 0.001),
        (30000.0, 291.0, 410.475, 0.001),
    ],
)
def test_potential_temperature_of_textbooks(p, t, expected, tolerance):
    assert air.potential_temperature(t, p) == pytest.approx(expected, abs=tolerance)


def test_dry_adiabat_falls_by_its_rate():
    p = 95000.0
    t = 293.0 * (p / 100000.0) ** air.KAPPA
    assert air.potential_temperature(t, p) == pytest.approx(293.0)
    height = air.HEAT_CAPACITY * (293.0 - t) / 9.80665  # cp dT = -g dz along an adiabat
    assert (293.0 - t) / height == pytest.approx(air.DRY_ADIABATIC_LAPSE_RATE)
    assert pytest.approx(9.8e-3, abs=0.05e-3) == air.DRY_ADIABATIC_LAPSE_RATE


@pytest.mark.parametrize(
    ("t", "r", "p", "expected", "tolerance"),
    [
        # Stull (second hand): 35 deg C, 30 g/kg: 40.6 deg C, by T (1 + 0.61 r), which is 0.1 K more
        # than the law itself at 30 g/kg
        (35.0 + C, 0.030, 100000.0, 40.6 + C, 0.15),
        # Wallace and Hobbs (second hand): 30 deg C, 20 g/kg: 3.7 K more, by the same formula
        (30.0 + C, 0.020, 100000.0, 33.7 + C, 0.1),
        # MetPy 1.7.1 docstring (S1): 283 K, 12 g/kg
        (283.0, 0.012, 101325.0, 285.039709, 0.002),
    ],
)
def test_virtual_temperature_of_textbooks(t, r, p, expected, tolerance):
    dew = dew_point_from_mixing_ratio(r, p)
    assert air.virtual_temperature(t, dew, p) == pytest.approx(expected, abs=tolerance)


def test_virtual_temperature_from_dew_point_as_another_library_prints_it():
    # MetPy 1.7.1 (S1): 1000 hPa, 30 deg C, dew point 25 deg C: 33.668 deg C; its vapour pressure
    # is 0.2 % another
    ours = air.virtual_temperature(30.0 + C, 25.0 + C, 100000.0)
    assert ours == pytest.approx(33.668 + C, abs=0.01)


def test_virtual_potential_temperature_of_a_textbook():
    # Stull (second hand): theta 15 deg C, 8 g/kg: 16.4 deg C
    dew = dew_point_from_mixing_ratio(0.008, 100000.0)
    ours = air.virtual_potential_temperature(15.0 + C, dew, 100000.0)
    assert ours == pytest.approx(16.4 + C, abs=0.05)


def test_density_of_moist_air_as_another_library_prints_it():
    # MetPy 1.7.1 (S1): 1000 hPa, 10 deg C, 24 g/kg: 1.21307146 kg m-3; and 999 hPa,
    # Tv 288.2796 K: 1.2072
    dew = dew_point_from_mixing_ratio(0.024, 100000.0)
    tv = air.virtual_temperature(10.0 + C, dew, 100000.0)
    assert air.density(100000.0, tv) == pytest.approx(1.21307146, rel=3e-5)
    assert air.density(99900.0, 288.2796) == pytest.approx(1.2072, abs=0.5e-4)


@pytest.mark.parametrize(
    ("t", "b", "phi", "expected"),
    # IEC 61400-12-1 formula as quoted in six public codes (second hand); values derived (checks R7)
    [
        (288.15, 101325.0, 0.0, 1.22501),
        (288.15, 101325.0, 0.5, 1.22123),
        (288.15, 101325.0, 1.0, 1.21745),
        (293.15, 101325.0, 0.5, 1.19902),
        (303.15, 95000.0, 0.8, 1.07687),
        (273.15, 90000.0, 0.5, 1.14630),
    ],
)
def test_air_density_of_the_turbine_standard(t, b, phi, expected):
    assert air.iec_air_density(t, b, phi) == pytest.approx(expected, abs=0.6e-5)


def test_turbine_density_agrees_with_the_moist_gas_law():
    # Two formulas for one thing; the standard's vapour pressure is 3 % off at 15 deg C, which is
    # 0.01 % of the density.
    t, b = 288.15, 101325.0
    from backveer.profiles.humidity import dew_point_from_relative_humidity

    tv = air.virtual_temperature(t, dew_point_from_relative_humidity(t, 0.7), b)
    assert air.density(b, tv) == pytest.approx(air.iec_air_density(t, b, 0.7), rel=3e-4)


@pytest.mark.parametrize("bad", [0.0, -5.0, np.nan])
def test_without_a_pressure_or_above_it_there_is_no_answer(bad):
    assert np.isnan(air.potential_temperature(280.0, bad))
    assert np.isnan(air.virtual_temperature(280.0, 275.0, bad))
    assert np.isnan(air.thickness(bad, 50000.0, 280.0))
    assert np.isnan(air.density(100000.0, bad))
    assert np.isnan(air.iec_air_density(bad, 100000.0, 0.5))
    assert np.isnan(air.virtual_temperature(280.0, 300.0, 1000.0))  # more vapour than air


def test_hostile_numbers_raise_no_warning():
    hostile = np.array([np.inf, -np.inf, np.nan, 0.0, -1.0, 5e-324, 1e308, 280.0])
    x, y, w = (a.ravel() for a in np.meshgrid(hostile, hostile, hostile))
    air.potential_temperature(x, y)
    air.virtual_potential_temperature(x, y, w)
    air.density(x, y)
    air.iec_air_density(x, y, w)
    air.thickness(x, y, w)


def test_metpy_agrees():
    calc = pytest.importorskip("metpy.calc")
    from metpy.units import units

    Q = units.Quantity
    p = np.array([101300.0, 92000.0, 70000.0, 45000.0, 30000.0])
    t = np.array([301.0, 293.0, 280.0, 257.0, 229.0])
    dew = np.array([296.0, 288.5, 262.0, 240.0, 210.0])
    theta = calc.potential_temperature(Q(p, "Pa"), Q(t, "K")).magnitude
    np.testing.assert_allclose(air.potential_temperature(t, p), theta, rtol=1e-5)
    tv = calc.virtual_temperature_from_dewpoint(Q(p, "Pa"), Q(t, "K"), Q(dew, "K"))
    # the vapour pressures differ by 0.2 % at 296 K: 0.01 K of 3 K
    np.testing.assert_allclose(air.virtual_temperature(t, dew, p), tv.to("K").magnitude, atol=0.02)
    height = calc.pressure_to_height_std(Q(p, "Pa")).to("m").magnitude
    # it begins with 288 K at the ground, not 288.15 K: 5.2e-4 of the height
    np.testing.assert_allclose(air.standard_height(p), height * 288.15 / 288.0, rtol=3e-5)
