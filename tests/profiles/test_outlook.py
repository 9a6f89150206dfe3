"""The night's swing against the textbook release, its closed form, and the mirror."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp

from backveer.profiles import boundary_layer, earth, ekman, geostrophic, quality
from backveer.profiles.outlook import Outlook, at_time, outlook
from backveer.profiles.stack import Stack
from backveer.profiles.sun import declination_and_equation_of_time, next_night

EVENING = np.array(["2031-05-14T20:30"], dtype="datetime64[ns]")


def sunset_profile(latitude=55.0, **more) -> Stack:
    z = np.linspace(10, 1500, 60)
    sign = 1 if latitude >= 0 else -1
    w = 12 * (1 - 0.6 * np.exp(-(1 + 1j) * z / 250)) * np.exp(0.7j)
    given = {
        "height": z,
        "eastward_wind": [w.real],
        "northward_wind": [sign * w.imag],
        "latitude": [latitude],
        "longitude": [0.0],
        "time": EVENING,
    }
    return quality.check(Stack.of(**(given | more)))


def told_of(stack: Stack, **more) -> Outlook:
    c = earth.coriolis(stack)
    fit = ekman.fit(stack, c)
    layer = boundary_layer.boundary_layer(stack)
    g = 12 * np.exp(0.7j)
    sign = np.sign(stack.latitude[0])
    error = np.full(stack.profile_count, 0.3)
    balance = geostrophic.geostrophic(
        stack, c, fit, layer, given=(g.real, sign * g.imag), error=error
    )
    return outlook(stack, c, balance, fit, error, **more)


def test_release_of_rayleigh_friction_in_a_textbook():
    # Andrews, An Introduction to Atmospheric Physics, 5.9, in a public transcription (checks I5):
    # r = 1e-5 s-1, 30 N, ug = 20 m/s; r -> 0 at sunset: amplitude r ug / sqrt(r^2 + f^2) = 2.7 m/s,
    # the flow across the isobars reversed after 12 h (half the inertial period of one day).
    r, ug = 1e-5, 20.0
    f = float(earth.coriolis_parameter(30.0))
    # Steady balance with friction: i f (W - G) = -r W.
    w = 1j * f * ug / (1j * f + r)
    z = np.linspace(300, 1200, 10)
    stack = quality.check(
        Stack.of(
            height=z, eastward_wind=w.real, northward_wind=w.imag, latitude=[30.0],
            longitude=[0.0], time=EVENING,
        )
    )  # fmt: skip
    c = earth.coriolis(stack)
    fit = ekman.fit(stack, c)
    error = np.array([0.3])
    balance = geostrophic.geostrophic(
        stack, c, fit, boundary_layer.boundary_layer(stack), given=(ug, 0.0), error=error
    )
    until = EVENING + np.timedelta64(24, "h")
    told = outlook(stack, c, balance, fit, error, until=until, release=EVENING)
    assert told.amplitude[0, -1] == pytest.approx(2.7, abs=0.05)
    period = told.inertial_period[0]
    assert period / 3600 == pytest.approx(23.934, abs=0.001)
    _, v = at_time(told, EVENING + np.timedelta64(int(period / 2 * 1e9), "ns"))
    assert v[0, -1] == pytest.approx(-w.imag, abs=1e-3)


def test_against_the_equation_of_motion():
    stack = sunset_profile()
    told = told_of(stack, hours=13)
    f = told.coriolis_parameter[0]
    level = 20
    equilibrium = told.equilibrium_eastward[0, level] + 1j * told.equilibrium_northward[0, level]

    def motion(_, y):
        d = -1j * f * (y[0] + 1j * y[1] - equilibrium)
        return [d.real, d.imag]

    start = [stack.eastward_wind[0, level], stack.northward_wind[0, level]]
    solved = solve_ivp(motion, (0, told.hour[0, -1]), start, t_eval=told.hour[0], rtol=1e-10)
    np.testing.assert_allclose(told.eastward_wind[0, :, level], solved.y[0], atol=1e-6)
    np.testing.assert_allclose(told.northward_wind[0, :, level], solved.y[1], atol=1e-6)
    speeds = np.hypot(*solve_ivp(motion, (0, told.hour[0, -1]), start, rtol=1e-9, max_step=60).y)
    assert told.maximum_speed[0, level] == pytest.approx(speeds.max(), abs=1e-3)


def test_the_jet_is_where_the_wind_was_slowest_above_the_night_layer():
    told = told_of(sunset_profile())
    assert 80 < told.jet_height[0] < 500
    assert told.jet_speed[0] > 12.5
    assert told.jet_speed_error[0] > 0.3
    assert 0 < told.jet_time[0] < told.hour[0, -1]


def test_mirror():
    north, south = told_of(sunset_profile()), told_of(
        sunset_profile(-55.0), release=told_of(sunset_profile()).release,
        until=told_of(sunset_profile()).end,
    )  # fmt: skip
    np.testing.assert_array_equal(north.eastward_wind, south.eastward_wind)
    np.testing.assert_array_equal(north.northward_wind, -south.northward_wind)
    np.testing.assert_array_equal(north.maximum_speed, south.maximum_speed)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"latitude": 2.0}, "within 5 degrees of the equator"),
        ({"time": np.array(["NaT"], dtype="datetime64[ns]")}, "time of the profile is not known"),
        ({"longitude": [np.nan]}, "longitude is not known"),
        ({"latitude": 78.0, "time": np.array(["2031-06-21T20:00"], "datetime64[ns]")}, "not set"),
        (
            {"latitude": 78.0, "time": np.array(["2031-12-21T20:00"], "datetime64[ns]")},
            "not rise",
        ),
        ({"eastward_wind": np.nan}, "no usable wind"),
    ],
)
def test_reasons(change, words):
    told = told_of(sunset_profile(**change))
    assert words in told.why[0]
    assert np.isnan(told.jet_speed[0])


def test_a_short_night_says_so():
    stack = sunset_profile(58.0, time=np.array(["2031-06-21T20:30"], "datetime64[ns]"))
    assert "shorter than half an inertial period" in told_of(stack).remark[0]
    long = sunset_profile(58.0, time=np.array(["2031-12-21T15:00"], "datetime64[ns]"))
    assert told_of(long).remark[0] == ""


def test_nonsense_settings():
    with pytest.raises(ValueError, match="depth must be positive"):
        told_of(sunset_profile(), night_depth=0.0)


@pytest.mark.parametrize(
    ("time", "declination", "equation"),
    [
        # Solstices by the obliquity of the ecliptic, 23.44 degrees; equinox 0 (common knowledge of
        # astronomy, no source). Extremes of the equation of time, about -14.2 and +16.4 minutes in
        # mid February and early November (common practice, no source).
        ("2031-06-21T12:00", 23.44, -1.8),
        ("2031-12-22T00:00", -23.44, 1.7),
        ("2031-02-11T12:00", None, -14.2),
        ("2031-11-03T12:00", None, 16.45),
    ],
)
def test_the_sun(time, declination, equation):
    d, e = declination_and_equation_of_time(np.array([time], "datetime64[ns]"))
    if declination is not None:
        assert d[0] == pytest.approx(declination, abs=0.01)
    assert e[0] == pytest.approx(equation, abs=0.15)


@pytest.mark.parametrize(("latitude", "longitude"), [(58.4, -3.0), (-47.9, -61.2), (60.0, 179.0)])
@pytest.mark.parametrize("day", ["2031-01-15", "2031-06-21", "2031-10-02"])
def test_sunset_as_an_independent_library_has_it(latitude, longitude, day):
    astral = pytest.importorskip("astral")
    from astral.sun import sunset

    start = np.datetime64(f"{day}T18:00", "ns")
    night = next_night(start[np.newaxis], np.array([latitude]), np.array([longitude]))
    found = night.sunset[0]
    apart = []
    for shift in (-1, 0, 1):
        date = (np.datetime64(day) + shift).astype(object)
        theirs = sunset(astral.Observer(latitude, longitude), date=date).replace(tzinfo=None)
        seconds = abs((np.datetime64(theirs) - found) / np.timedelta64(1, "s"))
        # Its date is that of UTC, which may skip a sunset near midnight: the day before will do.
        apart.append(min(seconds, abs(seconds - 86400.0)))
    # It takes the refraction a little differently; half a minute to a minute at these latitudes,
    # and a day brings a minute or two.
    assert min(apart) < 100
    assert found < start + np.timedelta64(24, "h")


def test_a_time_in_the_night_belongs_to_that_night_and_the_forenoon_to_the_next():
    place = np.array([55.0]), np.array([0.0])
    midnight = next_night(np.array(["2031-03-21T00:30"], "datetime64[ns]"), *place)
    assert str(midnight.sunset[0])[:10] == "2031-03-20"
    forenoon = next_night(np.array(["2031-03-21T09:00"], "datetime64[ns]"), *place)
    assert str(forenoon.sunset[0])[:10] == "2031-03-21"
