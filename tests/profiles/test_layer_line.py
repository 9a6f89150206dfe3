"""The line of a layer: exact on lines, as quadrature says on kinks, and its noise."""

import numpy as np
import pytest

from backveer.profiles.layer_line import layer_line, noise_gain


def _layer():
    rng = np.random.default_rng(2)
    x = np.cumsum(rng.uniform(0.01, 0.2, (3, 14)), axis=1)
    y = rng.normal(0.0, 5.0, x.shape)
    base, top = x[:, 2] + 0.004, x[:, 11] - 0.006
    return x, y, base, top


def test_lines_are_kept():
    x, _y, base, top = _layer()
    line = layer_line(x, base, top)
    near = np.where(np.isfinite(line.x), 3.0 - 7.0 * line.x, 0.0)
    np.testing.assert_allclose(line.slope(near), -7.0)
    np.testing.assert_allclose(line.mean(near), 3.0 - 3.5 * (base + top))
    np.testing.assert_allclose(line.extent, top - base)


def test_mean_and_slope_are_those_of_a_regression_on_the_profile_between_levels():
    # Independent: the profile read off at 200001 points, and a least-squares line through them.
    x, y, base, top = _layer()
    line = layer_line(x, base, top)
    near = line.take(y)
    for i in range(3):
        fine = np.linspace(base[i], top[i], 200001)
        slope, _ = np.polyfit(fine, np.interp(fine, x[i], y[i]), 1)
        mean = np.trapezoid(np.interp(fine, x[i], y[i]), fine) / (top[i] - base[i])
        assert line.slope(near)[i] == pytest.approx(slope, rel=1e-4)
        assert line.mean(near)[i] == pytest.approx(mean, rel=1e-6)


def test_a_layer_within_one_step_and_levels_at_one_place():
    x = np.array([[0.0, 1.0, 1.0, 3.0]])
    line = layer_line(x, np.array([0.2]), np.array([0.7]))
    y = line.take(np.array([[0.0, 2.0, 5.0, 9.0]]))
    assert line.slope(y)[0] == pytest.approx(2.0)
    assert line.widest_gap.tolist() == [1.0]
    over = layer_line(x, np.array([0.0]), np.array([3.0]))
    assert np.isfinite(over.slope(over.take(np.array([[0.0, 2.0, 5.0, 9.0]]))))
    none = layer_line(x, np.array([np.nan]), np.array([np.nan]))
    assert none.slope(none.take(x)).tolist() == [0.0]


@pytest.mark.parametrize("length", [0.0, 30.0, 400.0])
def test_noise_gain_is_the_double_sum(length):
    x, _y, base, top = _layer()
    line = layer_line(x, base, top)
    heights = np.where(np.isfinite(line.place), line.take(8000.0 * x), np.nan)
    ours = noise_gain(line, heights, np.full(3, length))
    for i in range(3):
        n = np.count_nonzero(np.isfinite(heights[i]))
        z, m, c = heights[i, :n], line.mean_weight[i, :n], line.slope_weight[i, :n]
        together = np.exp(-np.abs(z[:, None] - z) / length) if length else np.eye(n)
        expected = m @ together @ m, c @ together @ c, m @ together @ c
        for one, other in zip(ours, expected, strict=True):
            assert one[i] == pytest.approx(other, rel=1e-9, abs=1e-12)
