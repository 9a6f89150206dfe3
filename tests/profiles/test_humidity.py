"""Measures of humidity against printed values, each the inverse of another."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import humidity

C = 273.15


def test_saturation_as_the_guide_writes_it():
    # WMO-No. 8, annex 4.B (constants second hand): 6.112 exp(17.62 t / (243.12 + t)) hPa
    assert humidity.saturation_vapour_pressure(C) == pytest.approx(611.2)
    t = np.array([5.0, 10.0, 18.0, 25.0])
    # MetPy 1.7.1 (S1): 8.72, 12.27, 20.61, 31.62 hPa, after another formula (Ambaum, 2020): 0.25 %
    ours = humidity.saturation_vapour_pressure(t + C)
    np.testing.assert_allclose(ours, [872.0, 1227.0, 2061.0, 3162.0], rtol=2.5e-3)
    # steam table (from memory): 23.37 hPa at 20 deg C; 100 deg C lies beyond the formula's range
    assert humidity.saturation_vapour_pressure(20.0 + C) == pytest.approx(2337.0, rel=3e-3)


def test_mixing_ratio_of_a_textbook_number():
    # 15 hPa in 1000 hPa: 0.62198 x 15 / 985, by hand
    assert humidity.mixing_ratio(1500.0, 100000.0) == pytest.approx(0.62198 * 15.0 / 985.0)
    assert np.isnan(humidity.mixing_ratio(np.array([1000.0, 2000.0, -1.0]), 1000.0)).all()


@given(st.floats(200.0, 330.0), st.floats(20000.0, 105000.0))
def test_every_measure_comes_back(dew, p):
    e = humidity.saturation_vapour_pressure(dew)
    assert humidity.dew_point_from_vapour_pressure(e) == pytest.approx(dew, abs=1e-9)
    if e < 0.5 * p:
        r = humidity.mixing_ratio(e, p)
        assert humidity.dew_point_from_mixing_ratio(r, p) == pytest.approx(dew, abs=1e-7)
        q = r / (1.0 + r)
        assert humidity.dew_point_from_specific_humidity(q, p) == pytest.approx(dew, abs=1e-7)


@given(st.floats(220.0, 320.0), st.floats(0.01, 1.0))
def test_relative_humidity_is_the_ratio_of_vapour_pressures(t, rh):
    dew = humidity.dew_point_from_relative_humidity(t, rh)
    ratio = humidity.saturation_vapour_pressure(dew) / humidity.saturation_vapour_pressure(t)
    assert ratio == pytest.approx(rh)
    assert dew <= t + 1e-9


def test_dry_air_has_no_dew_point():
    none = np.array([0.0, -0.1, np.nan, -np.inf])
    assert np.isnan(humidity.dew_point_from_relative_humidity(290.0, none)).all()
    assert np.isnan(humidity.dew_point_from_mixing_ratio(none, 90000.0)).all()
    assert np.isnan(humidity.dew_point_from_specific_humidity(none, 90000.0)).all()
    assert np.isnan(humidity.dew_point_from_specific_humidity(1.0, 90000.0))
    assert np.isnan(humidity.saturation_vapour_pressure(np.array([0.0, 30.0, np.nan]))).all()
    assert np.isnan(humidity.dew_point_from_vapour_pressure(np.array([np.inf, 1e12])))[0]


def test_hostile_numbers_raise_no_warning():
    hostile = np.array([np.inf, -np.inf, np.nan, 0.0, -1.0, 5e-324, 1e308, 280.0])
    x, y = (a.ravel() for a in np.meshgrid(hostile, hostile))
    for kernel in (
        humidity.dew_point_from_mixing_ratio,
        humidity.dew_point_from_relative_humidity,
        humidity.dew_point_from_specific_humidity,
        humidity.mixing_ratio,
    ):
        kernel(x, y)


def test_metpy_agrees_on_the_dew_point():
    calc = pytest.importorskip("metpy.calc")
    from metpy.units import units

    t, rh = np.array([300.0, 288.0, 275.0, 262.0]), np.array([0.9, 0.4, 0.75, 0.2])
    theirs = calc.dewpoint_from_relative_humidity(units.Quantity(t, "K"), rh).to("K").magnitude
    ours = humidity.dew_point_from_relative_humidity(t, rh)
    np.testing.assert_allclose(ours, theirs, atol=0.1)
