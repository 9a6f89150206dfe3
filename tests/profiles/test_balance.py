"""Geostrophic balance against printed examples, and the signs of the departure."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles.balance import (
    departure,
    geostrophic_wind,
    geostrophic_wind_from_height,
)

SPEEDS = st.floats(-60.0, 60.0)


def test_pressure_gradient_gives_the_printed_winds():
    # Stull, Practical Meteorology (seen in a second-hand transcription; (S2) below means the same):
    # G1: density 1.2, f 1.1e-4, -2 kPa over 800 km northward -> Ug 18.94 m/s, Vg 0
    u, v = geostrophic_wind(0.0, -2000.0 / 800e3, 1.2, 1.1e-4)
    assert u == pytest.approx(18.94, abs=0.005)
    assert v == 0.0
    # G3: 1 kPa over 1000 km, f 1.1e-4, density 0.8 -> 11.36 m/s
    assert geostrophic_wind(1e3 / 1e6, 0.0, 0.8, 1.1e-4)[1] == pytest.approx(11.36, abs=0.005)


def test_height_gradient_gives_the_printed_winds():
    # G2: Stull (S2): +50 m over 200 km eastward, f 0.9e-4 -> Vg 27.2 m/s (with g = 9.8)
    u, v = geostrophic_wind_from_height(50.0 / 200e3, 0.0, 0.9e-4, gravity=9.8)
    assert v == pytest.approx(27.2, abs=0.05)
    assert u == 0.0
    # G4: Wallace & Hobbs (S2): contours 60 m apart every 300 km at 40 N -> 20.9 m/s
    f = 2 * 7.292115e-5 * np.sin(np.radians(40.0))
    assert geostrophic_wind_from_height(0.0, -60.0 / 300e3, f)[0] == pytest.approx(20.9, abs=0.05)


def test_southeasterly_wind_has_both_gradients_positive():
    # G6: SE wind 30 m/s at 38 N, density 0.8194 -> 1.56e-3 Pa/m each (S2). The printed sign of
    # dp/dy is wrong: a southeasterly (u < 0, v > 0) needs dp/dy > 0 and dp/dx > 0.
    f = 2 * 7.292115e-5 * np.sin(np.radians(38.0))
    u, v = geostrophic_wind(1.56e-3, 1.56e-3, 0.8194, f)
    assert np.hypot(u, v) == pytest.approx(30.0, abs=0.1)
    assert u < 0 < v


def test_low_pressure_lies_to_the_left_in_the_north_and_to_the_right_in_the_south():
    for f in (1e-4, -1e-4):
        u, v = geostrophic_wind(3e-4, -7e-4, 1.2, f)
        toward_low = np.array([-3e-4, 7e-4])
        left = np.array([-v, u])
        assert np.sign(left @ toward_low) == np.sign(f)
        # a wind that is the geostrophic wind and a bit toward the low
        wind = complex(u, v) + 2.0 * complex(*toward_low) / np.hypot(*toward_low)
        along, across = departure(wind, complex(u, v), f)
        assert along == pytest.approx(0.0, abs=1e-12)
        assert across == pytest.approx(2.0)


@given(SPEEDS, SPEEDS, SPEEDS, SPEEDS)
def test_departure_mirrors_exactly(u, v, ug, vg):
    north = departure(np.complex128(u + 1j * v), np.complex128(ug + 1j * vg), 1.2e-4)
    south = departure(np.complex128(u - 1j * v), np.complex128(ug - 1j * vg), -1.2e-4)
    assert np.array_equal(north, south, equal_nan=True)


@given(SPEEDS, SPEEDS, st.floats(0.5, 60.0), st.floats(0.0, 360.0))
def test_departure_does_not_change_when_everything_turns(u, v, speed, angle):
    turn = np.exp(1j * np.radians(angle))
    before = np.array(departure(u + 1j * v, speed + 0j, 1e-4))
    after = np.array(departure((u + 1j * v) * turn, speed * turn, 1e-4))
    assert after == pytest.approx(before, abs=1e-11)
    assert before == pytest.approx([u - speed, v], abs=1e-12)


def test_no_direction_no_departure():
    along, across = departure(np.array([3.0 + 1j]), np.array([0.0 + 0j]), np.array([1e-4]))
    assert np.isnan(along).all()
    assert np.isnan(across).all()


def test_without_rotation_nothing_is_finite():
    u, v = geostrophic_wind(np.array([1e-3]), np.array([0.0]), 1.2, np.array([0.0]))
    assert not np.isfinite(u).any()
    assert not np.isfinite(v).any()
