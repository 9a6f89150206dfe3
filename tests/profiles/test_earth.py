"""Coriolis acceleration, gravity and geopotential against tables, and what must hold exactly."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import earth
from backveer.profiles.stack import Stack

latitudes = st.floats(-90.0, 90.0)
speeds = st.floats(-80.0, 80.0)


@pytest.mark.parametrize(
    ("latitude", "expected"),
    [
        # checks.md 8c, 10: derived with Omega of WGS84 (exact; printed digits)
        (15.0, 3.774676e-5),
        (30.0, 7.292115e-5),
        (45.0, 1.031261e-4),
        (52.0, 1.149253e-4),
        (60.0, 1.263031e-4),
        (75.0, 1.408728e-4),
        (90.0, 1.458423e-4),
        (0.0, 0.0),
    ],
)
def test_coriolis_parameter_of_the_table(latitude, expected):
    tolerance = 0.5e-10 if abs(expected) >= 1e-4 else 0.5e-11
    assert earth.coriolis_parameter(latitude) == pytest.approx(expected, abs=tolerance)
    assert earth.coriolis_parameter(-latitude) == -earth.coriolis_parameter(latitude)


def test_coriolis_parameter_as_another_library_prints_it():
    # MetPy 1.7.1, tests of coriolis_parameter (seen, S1). The numbers go back to an Omega of
    # 7.2921159e-5 s-1, which is 1.3e-7 of itself more than that of WGS84.
    lat = np.array([-90.0, -30.0, 0.0, 30.0, 90.0])
    expected = np.array([-1.4584232e-4, -0.72921159e-4, 0.0, 0.72921159e-4, 1.4584232e-4])
    np.testing.assert_allclose(earth.coriolis_parameter(lat), expected, rtol=1.4e-7)


def test_coriolis_acceleration_of_a_textbook_wind():
    # Jacobson, Fundamentals of Atmospheric Modeling, 4.5: u 30, v 10 m/s at 45 N: 3.2611e-3 m s-2
    # (second hand; horizontal components)
    east, north, _up = earth.coriolis_acceleration(30.0, 10.0, 0.0, 45.0)
    assert np.hypot(east, north) == pytest.approx(3.2611e-3, abs=0.5e-7)
    assert east > 0 > north  # to the right of a wind toward the north-east


def test_at_the_equator_a_zonal_wind_is_only_lifted():
    # Fact of the trade (common practice, no source): only the vertical component remains.
    east, north, up = earth.coriolis_acceleration(10.0, 0.0, 0.0, 0.0)
    assert (east, north) == (0.0, 0.0)
    assert up == pytest.approx(1.458423e-3, abs=1e-9)


def test_what_the_horizontal_form_leaves_out():
    # Sizes of a mid-latitude cyclone (common practice, no source): 10 m/s, 1 cm/s, 45 degrees.
    left = earth.neglected_terms(10.0, 10.0, 0.01, 45.0)
    assert left.eastward_fraction == pytest.approx(1e-3, rel=1e-12)
    assert left.upward == pytest.approx(1.03e-3, abs=0.5e-5)
    assert left.upward_fraction == pytest.approx(1.03e-3 / 9.806, rel=2e-3)
    assert np.isnan(earth.neglected_terms(10.0, 0.0, 0.01, 45.0).eastward_fraction)
    # and they are what is left out of the full form
    full = earth.coriolis_acceleration(7.0, 3.0, 2.0, -35.0)
    f = earth.coriolis_parameter(-35.0)
    left = earth.neglected_terms(7.0, 3.0, 2.0, -35.0)
    assert full[0] - f * 3.0 == pytest.approx(left.eastward, rel=1e-12)
    assert full[2] == left.upward


@given(speeds, speeds, speeds, latitudes)
def test_coriolis_does_no_work_and_mirrors(u, v, w, latitude):
    a = earth.coriolis_acceleration(u, v, w, latitude)
    assert abs(u * a[0] + v * a[1] + w * a[2]) < 1e-14 * (u * u + v * v + w * w + 1.0)
    b = earth.coriolis_acceleration(u, -v, w, -latitude)
    assert (b[0], b[1], b[2]) == (a[0], -a[1], a[2])
    # the cross product of the vectors, an independent way to the same
    omega = earth.OMEGA * np.array(
        [0.0, np.cos(np.radians(latitude)), np.sin(np.radians(latitude))]
    )
    np.testing.assert_allclose(a, -2.0 * np.cross(omega, [u, v, w]), rtol=1e-12, atol=1e-16)


@pytest.mark.parametrize(
    ("latitude", "hours"),
    # checks.md 5: derived with Omega of WGS84; 30 degrees and the pole also in print (GFD-Dennou)
    [
        (15.0, 46.238),
        (30.0, 23.934),
        (45.0, 16.924),
        (52.0, 15.187),
        (60.0, 13.819),
        (90.0, 11.967),
    ],
)
def test_inertial_period(latitude, hours):
    for sign in (1.0, -1.0):
        period = earth.inertial_period(earth.coriolis_parameter(sign * latitude))
        assert period / 3600.0 == pytest.approx(hours, abs=0.0006)


def test_inertial_period_is_two_pi_over_f_and_missing_on_the_equator():
    # Stull, Practical Meteorology (second hand): f = 1e-4 gives 17.45 h
    assert earth.inertial_period(1e-4) / 3600.0 == pytest.approx(17.45, abs=0.005)
    assert np.isnan(earth.inertial_period(np.array([0.0, np.nan, 1e-320]))).all()


@pytest.mark.parametrize(
    ("latitude", "expected"),
    # checks.md 8c: WGS84 closed formula, derived; the pole also printed with the constants (S2)
    [(0.0, 9.7803253), (30.0, 9.7932473), (45.0, 9.8061978), (60.0, 9.8191770), (90.0, 9.8321849)],
)
def test_gravity_on_the_ground(latitude, expected):
    assert earth.gravity(latitude) == pytest.approx(expected, abs=0.5e-7)
    assert earth.gravity(-latitude) == earth.gravity(latitude)


def test_gravity_agrees_with_the_older_international_formula():
    # ISO 2533 by latitude: another formula, which differs by up to 1.05e-4 (checks.md 8c)
    lat = np.linspace(-90.0, 90.0, 37)
    c = np.cos(2.0 * np.radians(lat))
    iso = 9.80616 * (1.0 - 0.0026373 * c + 0.0000059 * c**2)
    np.testing.assert_allclose(earth.gravity(lat), iso, rtol=0, atol=1.1e-4)


def test_gravity_of_a_point_mass_and_spin_along_the_polar_axis():
    # GM of WGS84 (from memory) and the flattening's J2 make the field outside; at the pole there is
    # no spin: g(h) / g(0) follows from GM / r^2 (1 - 3 J2 (a / r)^2).
    gm, j2, a, b = 3.986004418e14, 1.08263e-3, earth.SEMI_MAJOR_AXIS, 6356752.3142

    def field(h):
        r = b + h
        return gm / r**2 * (1.0 - 3.0 * j2 * (a / r) ** 2)

    for h in (1000.0, 10000.0, 30000.0):
        change = earth.gravity(90.0, h) - earth.gravity(90.0)
        assert change == pytest.approx(field(h) - field(0.0), rel=2e-3)


def test_geopotential_height_of_the_table():
    # checks.md 8b: H = R Z / (R + Z), R of ISO 2533 (derived, printed digits)
    z = np.array([1000.0, 5000.0, 10000.0, 11019.07])
    expected = np.array([999.843, 4996.070, 9984.293, 11000.00])
    np.testing.assert_allclose(earth.geopotential_height(z), expected, rtol=0, atol=0.006)


def test_geopotential_as_another_library_prints_it():
    # MetPy 1.7.1 docstring (S1): 9805.111, 19607.145, 29406.103 m2 s-2, with another radius and g
    z = np.array([1000.0, 2000.0, 3000.0])
    ours = earth.geopotential_height(z) * earth.STANDARD_GRAVITY
    np.testing.assert_allclose(ours, [9805.111, 19607.145, 29406.103], rtol=2e-4)


@pytest.mark.parametrize("latitude", [0.0, -33.0, 45.0, 71.0, 90.0])
def test_geopotential_is_the_integral_of_gravity(latitude):
    z = np.linspace(0.0, 30000.0, 3001)
    g = earth.gravity(latitude, z)
    integral = np.concatenate([[0.0], np.cumsum(0.5 * (g[1:] + g[:-1]) * np.diff(z))])
    expected = integral / earth.STANDARD_GRAVITY
    ours = earth.geopotential_height(z, latitude)
    # both are expansions to second order in z / R; 30 km: (z / R)^3 = 1e-7
    np.testing.assert_allclose(ours, expected, rtol=0, atol=0.02)


@given(st.floats(-1000.0, 90000.0), st.one_of(st.none(), latitudes))
def test_geopotential_and_back(z, latitude):
    back = earth.geometric_altitude(earth.geopotential_height(z, latitude), latitude)
    assert back == pytest.approx(z, abs=1e-8, rel=1e-12)


def test_what_is_no_altitude_has_no_geopotential():
    bad = np.array([np.inf, -np.inf, np.nan, -4e6])
    assert np.isnan(earth.geopotential_height(bad)).all()
    bad = np.array([np.inf, -np.inf, np.nan, 6356766.0, 1e9])
    assert np.isnan(earth.geometric_altitude(bad)).all()


@pytest.mark.parametrize("bad", [90.001, -95.0, np.inf, -np.inf, np.nan])
def test_a_latitude_that_is_none_gives_nothing(bad):
    for kernel in (
        earth.coriolis_parameter,
        earth.horizontal_coriolis_parameter,
        earth.gravity,
        lambda latitude: earth.geopotential_height(100.0, latitude),
    ):
        answer = kernel(np.array([bad, 60.0]))
        assert np.isnan(answer[0])
        assert np.isfinite(answer[1])


def test_analyser_says_where_it_declines_and_why():
    latitude = np.array([52.0, -52.0, 5.0, -3.0, 0.0, np.nan, 95.0, -np.inf])
    told = earth.coriolis(Stack.of(latitude=latitude, height=np.zeros((8, 1))))
    assert told.applies.tolist() == [True, True] + [False] * 6
    near = "the site lies within 5 degrees of the equator"
    outside = "the latitude lies outside -90 to 90 degrees"
    assert told.why.tolist() == [
        "", "", near, near, near, "the latitude is not known", outside, outside,
    ]  # fmt: skip
    # f itself is still given near the equator
    np.testing.assert_array_equal(told.coriolis_parameter, earth.coriolis_parameter(latitude))
    assert np.isfinite(told.inertial_period).tolist() == [True] * 4 + [False] * 4
    assert told.coriolis_parameter[1] == -told.coriolis_parameter[0]
    assert told.inertial_period[1] == told.inertial_period[0]


def test_the_limit_can_be_moved_but_not_beyond_the_equator_itself():
    stack = Stack.of(latitude=[3.0, 0.0, 12.0], height=np.zeros((3, 1)))
    assert earth.coriolis(stack, equator_limit=2.0).applies.tolist() == [True, False, True]
    wide = earth.coriolis(stack, equator_limit=12.5)
    assert wide.why.tolist() == ["the site lies within 12.5 degrees of the equator"] * 3
    none = earth.coriolis(stack, equator_limit=0.0)
    assert none.why.tolist() == ["", "the site lies on the equator", ""]
    for bad in (-1.0, 91.0, np.nan):
        with pytest.raises(
            ValueError, match=r"equator limit is .* degrees. Give a distance of 0 to"
        ):
            earth.coriolis(stack, equator_limit=bad)


def test_analyser_gives_a_stack_what_it_gives_each_profile():
    latitude = np.random.default_rng(1).uniform(-90.0, 90.0, 37)
    stack = Stack.of(latitude=latitude, height=np.zeros((37, 2)))
    whole = earth.coriolis(stack)
    for i in range(37):
        alone = earth.coriolis(stack.select(i))
        for name in ("coriolis_parameter", "horizontal_coriolis_parameter", "inertial_period"):
            assert getattr(alone, name)[0] == getattr(whole, name)[i]
    assert earth.coriolis(Stack.of(profiles=0)).why.shape == (0,)


def test_metpy_agrees():
    calc = pytest.importorskip("metpy.calc")
    from metpy.units import units

    lat = np.array([-61.0, -12.5, 33.0, 78.0])
    theirs = calc.coriolis_parameter(units.Quantity(lat, "degrees")).to("1/s").magnitude
    np.testing.assert_allclose(earth.coriolis_parameter(lat), theirs, rtol=1e-12)
