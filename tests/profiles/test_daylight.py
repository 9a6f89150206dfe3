"""The sun's elevation against what geometry demands."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.profiles.daylight import solar_elevation


def elevation(time, latitude, longitude):
    return solar_elevation(
        np.array([time], dtype="datetime64[ns]"), np.array([latitude]), np.array([longitude])
    )[0]


@pytest.mark.parametrize(
    ("time", "latitude", "longitude", "expected"),
    [
        # By geometry: at noon 90 - |latitude - declination|, at midnight the mirror; the
        # declination is 23.44 at a solstice and 0 at an equinox (common practice, no source).
        ("2031-06-21T12:02", 55.0, 0.0, 90 - 55 + 23.44),
        ("2031-12-22T00:00", 55.0, 0.0, -(90 - 55 + 23.44)),
        ("2031-12-22T17:58", -40.0, -90.0, 90 - 40 + 23.44),
        ("2031-03-20T12:07", 90.0, 0.0, 0.0),
    ],
)
def test_noon_and_midnight(time, latitude, longitude, expected):
    assert elevation(time, latitude, longitude) == pytest.approx(expected, abs=0.4)


def test_a_missing_time_or_place_gives_none():
    assert np.isnan(elevation("NaT", 10.0, 10.0))
    assert np.isnan(elevation("2031-03-20T12:07", np.nan, 10.0))
    assert np.isnan(elevation("2031-03-20T12:07", 10.0, np.nan))
