"""Pressure of every level: measured stays, between and beyond it is hydrostatic, and it is said."""

import numpy as np
import pytest

from backveer.profiles import air, earth
from backveer.profiles.level_pressure import level_pressure
from backveer.profiles.stack import Stack

Z = np.arange(0.0, 6000.0, 150.0)


def truth(warmer=12.0, elevation=400.0, sea_level=99000.0):
    """A hydrostatic atmosphere that is not standard, at altitudes above the site."""
    fine = np.linspace(0.0, 7000.0, 7001)
    t = 288.15 + warmer - 0.0065 * fine
    steps = 9.80665 / (air.GAS_CONSTANT * 0.5 * (t[1:] + t[:-1])) * np.diff(fine)
    log_p = np.log(sea_level) - np.concatenate([[0.0], np.cumsum(steps)])
    h = earth.geopotential_height(Z + elevation)
    return np.exp(np.interp(h, fine, log_p)), 288.15 + warmer - 0.0065 * h


def test_measured_pressures_stay_and_gaps_are_bridged():
    p, _t = truth()
    holes = np.where(np.arange(Z.size) % 10 == 0, p, np.nan)
    ours, origin = level_pressure(Stack.of(height=Z, air_pressure=holes, elevation=400.0))
    np.testing.assert_array_equal(ours[0, ::10], p[::10])
    np.testing.assert_allclose(ours[0, :31], p[:31], rtol=1e-4)
    np.testing.assert_allclose(ours[0, 31:], p[31:], rtol=1e-2)
    np.testing.assert_allclose(np.diff(np.log(ours[0])), np.diff(np.log(p)), rtol=0.1)
    assert origin.tolist() == ["measured"]


def test_one_measured_pressure_anchors_the_profile():
    p, _t = truth(warmer=0.0)
    one = np.where(np.arange(Z.size) == 3, p, np.nan)
    ours, _origin = level_pressure(Stack.of(height=Z, air_pressure=one, elevation=400.0))
    np.testing.assert_allclose(ours[0], p, rtol=2e-4)


def test_without_pressure_the_temperature_tells_the_ratio():
    p, t = truth()
    ours, origin = level_pressure(Stack.of(height=Z, air_temperature=t, elevation=400.0))
    np.testing.assert_allclose(np.diff(np.log(ours[0])), np.diff(np.log(p)), rtol=2e-5)
    assert origin[0].startswith("the hypsometric equation")
    # the standard atmosphere is 12 K colder: 4 %
    ours, origin = level_pressure(Stack.of(height=Z, elevation=400.0))
    np.testing.assert_allclose(np.diff(np.log(ours[0])), np.diff(np.log(p)), rtol=0.05)
    assert origin.tolist() == ["the standard atmosphere"]
    # a temperature at the ground alone does not reach the levels
    some = np.where(Z < 300.0, t, np.nan)
    _p, origin = level_pressure(Stack.of(height=Z, air_temperature=some, elevation=400.0))
    assert origin.tolist() == ["the standard atmosphere"]


def test_company_and_missing_levels_change_nothing():
    p, t = truth()
    nothing = np.full(Z.size, np.nan)
    rows = {
        "height": np.stack([Z, Z + 5.0, Z, np.where(Z > 3000.0, np.nan, Z)]),
        "air_pressure": np.stack([np.where(Z > 2000.0, np.nan, p), nothing, nothing, nothing]),
        "air_temperature": np.stack([t, t, nothing, t]),
        "elevation": np.array([400.0, 100.0, np.nan, 0.0]),
    }
    stack = Stack.of(**rows)
    ours, origin = level_pressure(stack)
    assert len(set(origin)) == 3
    for i in range(4):
        alone, word = level_pressure(stack.select(i))
        np.testing.assert_array_equal(alone[0], ours[i])
        assert word[0] == origin[i]
    at = [0, 7, 40]
    wide = {k: np.insert(a, at, np.nan, axis=1) if a.ndim == 2 else a for k, a in rows.items()}
    kept = np.insert(np.ones(Z.size, dtype=bool), at, False)
    np.testing.assert_array_equal(level_pressure(Stack.of(**wide))[0][:, kept], ours)


@pytest.mark.parametrize("levels", [0, 1])
def test_hardly_any_level(levels):
    ours, origin = level_pressure(Stack.of(profiles=2, height=np.full((2, levels), 50.0)))
    assert ours.shape == (2, levels)
    assert (origin != "").all() == (levels == 1)
