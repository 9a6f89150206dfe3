"""Trend and persistence of a series, by hand."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.profiles.shear_series import shear_series

START = np.datetime64("2031-05-14T00:00", "ns")


def at(*minutes):
    return START + np.array(minutes) * np.timedelta64(1, "m")


def test_a_run_is_broken_by_a_profile_that_does_not_meet_and_by_a_gap():
    time = at(0, 10, 20, 30, 40, 120, 130)
    met = np.array([True, True, True, False, True, True, True])
    said = shear_series(time, np.full(7, 0.02), met)
    assert (said.run, said.longest, said.longest_hours) == (2, 3, pytest.approx(1 / 3))
    assert said.run_since == at(120)[0]
    assert said.share == pytest.approx(6 / 7)


def test_the_order_of_the_files_does_not_matter_and_profiles_without_time_are_left_out():
    time = at(30, 0, 20, 10)
    time = np.concatenate([time, [np.datetime64("NaT", "ns")]])
    shear = np.array([0.04, 0.01, 0.03, 0.02, 9.0])
    said = shear_series(time, shear, np.array([True, False, True, False, True]))
    assert (said.count, said.run, said.sense) == (4, 2, "rising")
    assert said.trend == pytest.approx(0.06)  # 0.01 in ten minutes


def test_trend_only_of_the_last_hours_and_only_beyond_its_error():
    time = at(*range(0, 600, 30))
    shear = np.where(np.arange(20) < 13, np.linspace(0.1, 0.01, 20), 0.03)
    assert shear_series(time, shear, np.zeros(20, bool)).sense == "steady"
    falling = shear_series(time, np.linspace(0.1, 0.01, 20), np.zeros(20, bool))
    assert falling.sense == "falling"
    assert (falling.run, falling.longest, np.isnat(falling.run_since)) == (0, 0, True)


def test_too_little_says_so():
    one = shear_series(at(0), np.array([0.01]), np.array([True]))
    assert one.why == "fewer than four profiles in the last 3 hours"
    assert (one.run, one.longest, one.longest_hours, one.sense) == (1, 1, 0.0, "")
    none = shear_series(np.array(["NaT"], dtype="datetime64[ns]"), np.zeros(1), np.ones(1, bool))
    assert (none.count, none.why) == (0, "no profile has a time")
