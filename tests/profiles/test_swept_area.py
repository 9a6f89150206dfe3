import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles.swept_area import disc_mean, equivalent_speed, segment_fractions


@pytest.mark.parametrize(
    ("segments", "expected"),
    [
        # Plane geometry, checks R5 (derived; exact to the six digits printed).
        (3, [0.291791, 0.416417, 0.291791]),
        (5, [0.142378, 0.231152, 0.252940, 0.231152, 0.142378]),
        (7, [0.087630, 0.148132, 0.173603, 0.181271, 0.173603, 0.148132, 0.087630]),
    ],
)
def test_area_fractions(segments, expected):
    told = segment_fractions(segments)
    assert told == pytest.approx(expected, abs=5e-7)
    assert told.sum() == pytest.approx(1.0, abs=1e-15)
    assert (told == told[::-1]).all()


def test_no_segment_is_refused():
    with pytest.raises(ValueError, match="at least one segment, not 0"):
        segment_fractions(0)


@pytest.mark.parametrize(
    ("exponent", "veer", "expected"),
    [
        # Continuous rotor of 100 m at a hub of 100 m, checks R6 (derived; six digits printed).
        (0.1, 0.0, 0.997692),
        (0.14, 0.0, 0.997337),
        (0.2, 0.0, 0.997398),
        (0.3, 0.0, 0.999037),
        (0.0, 0.1, 0.999049),
        (0.2, 0.1, 0.996457),
        (0.0, 0.2, 0.996212),
        (0.2, 0.2, 0.993650),
    ],
)
def test_continuous_rotor(exponent, veer, expected):
    # Every 0.1 m the straight lines between levels are within 1e-7 of the power law.
    z = np.linspace(50.0, 150.0, 1001)
    turn = veer * (z - 100.0)
    told = equivalent_speed(z, (z / 100.0) ** exponent, 100.0, 100.0, turn if veer else None)
    assert told == pytest.approx(expected, abs=5.1e-7)


def bessel_1_over_x(x):
    """J1(x)/x by its power series (Abramowitz and Stegun, 1964, eq. 9.1.10)."""
    total, term = 0.0, 0.5
    for k in range(1, 40):
        total += term
        term *= -((x / 2.0) ** 2) / (k * (k + 1))
    return total


@pytest.mark.parametrize("rate", [0.05, -0.2, 0.7])
def test_linear_veer_has_its_closed_form(rate):
    """
    Mean of cos^3(q y) over a disc of radius R: (3 J1(qR)/qR + J1(3qR)/3qR) / 2.

    From cos^3 a = (3 cos a + cos 3a)/4 and the mean of cos(k y) over the disc, 2 J1(kR)/(kR).
    """
    z, hub, diameter = np.array([20.0, 41.0, 77.0, 95.0, 140.0, 161.0]), 88.0, 130.0
    told = equivalent_speed(z, np.full(6, 9.0), hub, diameter, rate * (z - hub))
    q = np.radians(rate) * diameter / 2.0
    expected = 9.0 * np.cbrt(1.5 * bessel_1_over_x(q) + 0.5 * bessel_1_over_x(3.0 * q))
    assert told == pytest.approx(expected, rel=1e-9)


def test_linear_speed_has_its_closed_form():
    """Mean of (a + b y)^3 over a disc: a^3 + 3 a b^2 R^2 / 4, for the mean of y^2 is R^2/4."""
    z = np.array([20.0, 66.0, 90.0, 131.0, 160.0])
    told = equivalent_speed(z, 7.0 + 0.05 * (z - 88.0), 88.0, 130.0)
    assert told == pytest.approx(np.cbrt(7.0**3 + 3.0 * 7.0 * (0.05 * 65.0) ** 2 / 4.0), rel=1e-11)


def brute_force(z, speed, turn, hub, diameter):
    """Two-dimensional midpoint sum over a Cartesian grid of the disc; nothing shared."""
    n = 1500
    x = (np.arange(n) + 0.5) / n * diameter - diameter / 2.0
    across, up = np.meshgrid(x, x)
    disc = across**2 + up**2 <= (diameter / 2.0) ** 2
    wind = np.interp(hub + up, z, speed) * np.cos(np.radians(np.interp(hub + up, z, turn)))
    return np.cbrt((wind[disc] ** 3).mean())


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_against_a_sum_over_the_disc(seed):
    random = np.random.default_rng(seed)
    z = np.sort(random.uniform(30.0, 220.0, 9))
    z[[0, -1]] = 25.0, 230.0
    speed, turn = random.uniform(3.0, 14.0, 9), random.uniform(-40.0, 40.0, 9)
    turn -= np.interp(119.0, z, turn)
    told = equivalent_speed(z, speed, 119.0, 171.0, turn)
    # The staircase rim of the grid is worth some 1e-5 of the disc.
    assert told == pytest.approx(brute_force(z, speed, turn, 119.0, 171.0), rel=2e-5)


@given(
    speed=st.floats(0.5, 40.0),
    hub=st.floats(60.0, 200.0),
    diameter=st.floats(10.0, 110.0),
    levels=st.lists(st.floats(1.0, 300.0), max_size=8, unique=True),
)
def test_even_flow_is_its_own_equivalent(speed, hub, diameter, levels):
    z = np.array(sorted({0.5, *levels, 301.0}))
    told = equivalent_speed(z, np.full(z.shape, speed), hub, diameter)
    assert told == pytest.approx(speed, rel=1e-14)


def test_area_between_levels_that_are_not_joined_is_left_out():
    z, speed = np.array([50.0, 80.0, 120.0, 150.0]), np.array([5.0, 6.0, 30.0, 8.0])
    joined = np.array([True, False, True])
    told = disc_mean(z, speed, np.zeros(4), joined, 100.0, 100.0)
    x = 0.4
    middle = 2.0 * (x * np.sqrt(1 - x**2) + np.arcsin(x)) / np.pi
    assert told.coverage == pytest.approx(1.0 - middle, abs=1e-9)


def test_tip_out_of_reach_gives_no_equivalent():
    z = np.array([[40.0, 100.0, 160.0], [60.0, 100.0, 160.0]])
    told = equivalent_speed(z, np.array([[5.0, 6.0, 7.0], [5.0, 6.0, 7.0]]), 100.0, 100.0)
    assert np.isnan(told).tolist() == [False, True]
