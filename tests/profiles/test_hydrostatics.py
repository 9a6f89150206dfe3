"""Altitude from pressure and back: textbooks, closed forms, order of levels, missing levels."""

import numpy as np
import pytest

from backveer.profiles import air, earth
from backveer.profiles.hydrostatics import fill, hypsometric_altitude, hypsometric_pressure


def test_thickness_of_three_levels_as_another_library_prints_it():
    # MetPy 1.7.1 docstring (S1): 278, 275, 270 K at 950, 925, 900 hPa: 434.3769 gpm; its gas
    # constant differs in the fifth digit
    p = np.array([95000.0, 92500.0, 90000.0])
    z = hypsometric_altitude(p, np.array([278.0, 275.0, 270.0]))
    assert earth.geopotential_height(z[-1]) == pytest.approx(434.3769, rel=5e-5)


def test_thickness_of_air_with_a_lapse_rate():
    # Holton (second hand): 1000-500 hPa, 6.5 K/km, T0 = 273 K: 5187 m (R 287, g 9.8)
    exponent = air.GAS_CONSTANT * 0.0065 / 9.80665
    p = np.linspace(100000.0, 50000.0, 401)
    t = 273.0 * (p / 100000.0) ** exponent  # closed form of the hydrostatic equation
    z = hypsometric_altitude(p, t)
    exact = 273.0 / 0.0065 * (1.0 - 0.5**exponent)
    assert earth.geopotential_height(z[-1]) == pytest.approx(exact, abs=0.01)
    assert earth.geopotential_height(z[-1]) == pytest.approx(5187.0, abs=6.0)


@pytest.mark.parametrize(("temperature", "expected"), [(250.0, 25800.0), (300.0, 32400.0)])
def test_pressure_at_ten_kilometres_of_isothermal_air(temperature, expected):
    # Stull, Practical Meteorology (second hand): 25.8 and 32.4 kPa (to be exact 25.85 and 32.46)
    z = earth.geometric_altitude(np.array([0.0, 10000.0]))
    p = hypsometric_pressure(z, np.full(2, temperature), base_pressure=101325.0)
    assert p[1] == pytest.approx(expected, abs=110.0)
    assert p[1] == pytest.approx(101325.0 * np.exp(-10000.0 / air.scale_height(temperature)))


def test_pressure_a_hundred_metres_up():
    # Jacobson (second hand): 990 hPa at 100 m, 284 K: 978.16 hPa at 200 m
    p = hypsometric_pressure(np.array([100.0, 200.0]), np.full(2, 284.0), base_pressure=99000.0)
    assert p[1] == pytest.approx(97816.0, abs=2.0)


def test_standard_atmosphere_comes_back_from_its_own_levels():
    h = np.linspace(0.0, 18000.0, 361)
    t, p = air.standard_atmosphere(h)
    z = earth.geometric_altitude(h)
    np.testing.assert_allclose(hypsometric_altitude(p, t), z, rtol=0, atol=0.05)
    np.testing.assert_allclose(hypsometric_pressure(z, t), p, rtol=1e-5)
    # from a base of another altitude, everything is higher by as much geopotential
    up = hypsometric_altitude(p, t, base_altitude=z[20])
    np.testing.assert_allclose(
        earth.geopotential_height(up) - earth.geopotential_height(z), h[20], atol=0.05
    )


def _sounding():
    rng = np.random.default_rng(5)
    p = 101000.0 * np.exp(-np.cumsum(rng.uniform(0.005, 0.05, (4, 60)), axis=1))
    t = 300.0 + 45.0 * np.log(p / 100000.0) + rng.normal(0.0, 0.5, p.shape)
    return p, t, t - rng.uniform(0.5, 15.0, p.shape)


def test_humid_air_is_taller_and_pressure_comes_back():
    p, t, dew = _sounding()
    base, latitude = np.array([12.0, 600.0, -3.0, 2000.0]), np.array([0.0, -45.0, 60.0, 90.0])
    z = hypsometric_altitude(p, t, dew, base, latitude)
    np.testing.assert_allclose(z[:, 0], base)
    assert np.all(np.diff(z) > 0)
    dry = hypsometric_altitude(p, t, None, base, latitude)
    assert np.all(z[:, 1:] > dry[:, 1:])
    back = hypsometric_pressure(z, t, dew, p[:, 0], latitude)
    np.testing.assert_allclose(back, p, rtol=1e-9)
    np.testing.assert_array_equal(hypsometric_altitude(p, t, dew, base, -latitude), z)


def test_order_missing_levels_and_company_change_nothing():
    p, t, dew = _sounding()
    base = np.array([12.0, 600.0, -3.0, 2000.0])
    z = hypsometric_altitude(p, t, dew, base)
    back = hypsometric_pressure(z, t, dew, p[:, 0])
    descending = hypsometric_altitude(p[:, ::-1], t[:, ::-1], dew[:, ::-1], base)
    np.testing.assert_array_equal(descending[:, ::-1], z)
    at = [0, 7, 7, 30, 60]
    holes = [np.insert(x, at, np.nan, axis=1) for x in (p, t, dew, z)]
    kept = np.isfinite(holes[0][0])
    np.testing.assert_array_equal(hypsometric_altitude(*holes[:3], base)[:, kept], z)
    assert np.isnan(hypsometric_altitude(*holes[:3], base)[:, ~kept]).all()
    again = hypsometric_pressure(holes[3], holes[1], holes[2], p[:, 0])
    np.testing.assert_array_equal(again[:, kept], back)
    for i in range(4):
        alone = hypsometric_altitude(p[i], t[i], dew[i], base[i])
        np.testing.assert_array_equal(alone, z[i])
        np.testing.assert_array_equal(hypsometric_pressure(z[i], t[i], dew[i], p[i, 0]), back[i])


def test_a_missing_temperature_is_interpolated_but_not_far_beyond_the_ends():
    p = 100000.0 * np.exp(-np.arange(0.0, 0.5, 0.04))
    t = 290.0 - 60.0 * np.arange(0.0, 0.5, 0.04)  # linear in ln p
    z = hypsometric_altitude(p, t)
    hole = t.copy()
    hole[[3, 4, 5]] = np.nan
    np.testing.assert_allclose(hypsometric_altitude(p, hole), z, rtol=1e-12)
    end = t.copy()
    end[[0, -1, -2]] = np.nan
    ours = hypsometric_altitude(p, end)
    # the last level but one lies 0.04 beyond the last temperature, the last 0.08
    assert np.isfinite(ours[:-1]).all()
    assert np.isnan(ours[-1])
    assert ours[1] == pytest.approx(z[1], abs=2.0)
    end[[1]] = np.nan
    assert np.isnan(hypsometric_altitude(p, end)).all()  # no way up from the ground
    z_far = hypsometric_pressure(np.array([0.0, 300.0, 900.0]), np.array([285.0, np.nan, np.nan]))
    assert np.isfinite(z_far).tolist() == [True, True, False]


def test_hostile_numbers_give_nothing_and_no_warning():
    hostile = np.array([np.inf, -np.inf, np.nan, 0.0, -1.0, 5e-324, 1e308, 280.0, 90000.0])
    x, y = (a.reshape(9, 9) for a in np.meshgrid(hostile, hostile))
    hypsometric_altitude(x, y, y[::-1], hostile)
    hypsometric_pressure(x, y, y[::-1], hostile)
    assert hypsometric_altitude(np.empty((3, 0)), np.empty((3, 0))).shape == (3, 0)
    assert hypsometric_pressure(np.empty((0, 4)), np.empty((0, 4))).shape == (0, 4)
    assert hypsometric_altitude(np.array([90000.0]), np.array([280.0])).tolist() == [0.0]


def test_fill_keeps_what_is_there():
    x = np.array([0.0, 1.0, 3.0, 4.0, 9.0])
    y = np.array([np.nan, 2.0, np.nan, 8.0, np.nan])
    np.testing.assert_allclose(fill(x, y, 1.0), [2.0, 2.0, 6.0, 8.0, np.nan])
    np.testing.assert_allclose(fill(x, y, np.inf), [2.0, 2.0, 6.0, 8.0, 8.0])
    assert np.isnan(fill(x, np.full(5, np.nan), np.inf)).all()


def test_metpy_agrees():
    calc = pytest.importorskip("metpy.calc")
    from metpy.units import units

    p = np.linspace(100000.0, 50000.0, 51)
    t = np.linspace(295.0, 262.0, 51)
    theirs = (
        calc.thickness_hydrostatic(units.Quantity(p, "Pa"), units.Quantity(t, "K"))
        .to("m")
        .magnitude
    )
    ours = earth.geopotential_height(hypsometric_altitude(p, t)[-1])
    assert ours == pytest.approx(theirs, rel=3e-5)
