import numpy as np
import pytest

from backveer.profiles.surface_layer import (
    exponent_between,
    fit_line,
    log_law_speed,
    power_law_speed,
)


@pytest.mark.parametrize(
    ("speed", "reference", "exponent", "z", "expected"),
    [
        # Table of the public site codingace.net (checks R3, R3b; S2, recomputed), to 0.01 m/s.
        (6.50, 10.0, 0.14, 80.0, 8.70),
        (7.20, 10.0, 0.20, 100.0, 11.41),
    ],
)
def test_power_law_examples(speed, reference, exponent, z, expected):
    told = power_law_speed(z, reference, speed, exponent)
    assert told == pytest.approx(expected, abs=0.005)
    assert exponent_between(reference, speed, z, told) == pytest.approx(exponent, abs=1e-12)


@pytest.mark.parametrize(
    ("speed", "reference", "roughness", "z", "expected"),
    [
        # The same table (checks R3d, R3e; S2); R3e is printed 9.51, the law gives 9.506.
        (8.00, 20.0, 0.10, 120.0, 10.71),
        (7.00, 10.0, 0.03, 80.0, 9.51),
    ],
)
def test_log_law_examples(speed, reference, roughness, z, expected):
    told = log_law_speed(z, reference, speed, roughness)
    assert told == pytest.approx(expected, abs=0.005)


def test_laws_say_nothing_below_their_floor():
    below = np.array([0.0, -5.0, 0.1, 12.0])
    assert np.isnan(power_law_speed(below, 10.0, 7.0, 0.2)).tolist() == [True, True, False, False]
    assert np.isnan(log_law_speed(below, 10.0, 7.0, 0.1)).tolist() == [True, True, True, False]
    assert np.isnan(log_law_speed(12.0, 0.05, 7.0, 0.1))


def test_exponent_needs_wind_and_height():
    told = exponent_between([10.0, 0.0, 10.0, 10.0], [5.0, 5.0, 0.0, 5.0], 80.0, [7.0, 7, 7, 0.0])
    assert np.isfinite(told).tolist() == [True, False, False, False]


def test_line_against_numpy():
    """numpy.polyfit with its covariance is the independent witness."""
    random = np.random.default_rng(3)
    x = random.uniform(1.0, 9.0, (4, 12))
    y = 2.5 * x - 4.0 + random.normal(size=x.shape)
    use = random.random(x.shape) < 0.8
    count, slope, slope_error, root, root_error = fit_line(x, y, use)
    for row in range(4):
        kept = use[row]
        (b, a), covariance = np.polyfit(x[row, kept], y[row, kept], 1, cov=True)
        assert count[row] == kept.sum()
        assert slope[row] == pytest.approx(b, rel=1e-12)
        assert root[row] == pytest.approx(-a / b, rel=1e-12)
        assert slope_error[row] == pytest.approx(np.sqrt(covariance[0, 0]), rel=1e-10)
        toward = np.array([a / b**2, -1.0 / b])  # propagation through root = -a / b
        assert root_error[row] == pytest.approx(np.sqrt(toward @ covariance @ toward), rel=1e-10)


def test_line_through_too_few_levels():
    x, y = np.array([[1.0, 2.0, 4.0]]), np.array([[1.0, 3.0, 9.0]])
    count, slope, slope_error, root, root_error = fit_line(x, y, np.array([[True, True, False]]))
    assert (count[0], slope[0], root[0]) == (2, 2.0, 0.5)
    assert np.isnan([slope_error[0], root_error[0]]).all()
    count, slope, *_ = fit_line(x, y, np.zeros((1, 3), dtype=bool))
    assert count[0] == 0
    assert np.isnan(slope[0])
