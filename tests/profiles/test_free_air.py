"""The line through the free air: exact on lines, honest errors, and what it declines."""

from __future__ import annotations

import numpy as np
import pytest
import synthetic

from backveer.profiles.free_air import MIN_LEVELS, FreeAir, free_air

Z = np.arange(1000.0, 2501.0, 50.0)
FIELDS = [name for name in FreeAir.__dataclass_fields__ if name not in ("determined", "count")]


def lay(z, wind, base=1000.0, top=2500.0, error=0.0):
    wind = np.atleast_2d(wind)
    edges = (np.full(len(wind), edge) for edge in (base, top))
    return free_air(np.asarray(z), wind.real, wind.imag, *edges, error)


def test_a_line_is_found_again():
    line = lay(Z, 7.0 - 2.0j + (0.003 - 0.001j) * Z)
    assert line.eastward == pytest.approx([7.0])
    assert line.northward == pytest.approx([-2.0])
    assert line.eastward_shear == pytest.approx([0.003])
    assert line.northward_shear == pytest.approx([-0.001])
    assert line.top == [2500.0]


def test_variances_are_those_of_the_textbook_regression():
    """For independent errors: the weighing leaves a little room for noise that is correlated."""
    noise = synthetic.correlated_noise(np.random.default_rng(2), Z, 0.5, 0.0, profiles=400)
    line = lay(Z, 7.0 + 1.0j + noise)
    spread = np.sum((Z - Z.mean()) ** 2)
    for name, expected in (
        ("ground_variance", 0.25 * (1 / Z.size + Z.mean() ** 2 / spread)),
        ("shear_variance", 0.25 / spread),
        ("covariance", -0.25 * Z.mean() / spread),
    ):
        assert 0.95 < np.median(getattr(line, name)) / expected < 1.3, name


def test_the_error_is_never_less_than_the_winds_own():
    line = lay(Z, (7.0 + 1.0j) * np.ones_like(Z), error=0.5)
    spread = np.sum((Z - Z.mean()) ** 2)
    assert line.ground_variance[0] > 0.25 * (1 / Z.size + Z.mean() ** 2 / spread)
    assert line.covariance[0] < 0  # a steeper line starts lower


@pytest.mark.parametrize("length", [0.0, 100.0, 300.0])
def test_errors_are_honest(length):
    """The error of the ground value over 1500 profiles, whatever the noise is like."""
    random = np.random.default_rng(7)
    noise = synthetic.correlated_noise(random, Z, 0.4, length, profiles=1500)
    line = lay(Z, 9.0 + 0.002 * Z + noise, error=0.05)
    off = np.concatenate([line.eastward - 9.0, line.northward])
    pull = off / np.sqrt(np.tile(line.ground_variance, 2))
    inside = np.mean(np.abs(pull) < 1.96)
    assert 0.90 < inside <= 0.985
    assert np.abs(off.mean()) < 0.06
    shear = line.eastward_shear - 0.002
    assert 0.90 < np.mean(np.abs(shear) < 1.96 * np.sqrt(line.shear_variance)) <= 0.985


def test_error_grows_with_the_way_down():
    noise = synthetic.correlated_noise(np.random.default_rng(3), Z, 0.3, 0.0)
    near = lay(Z, 9.0 + noise)
    z = Z + 1500.0
    far = lay(z, 9.0 + noise, base=2500.0, top=4000.0)
    assert far.ground_variance > 2.0 * near.ground_variance
    assert far.shear_variance == pytest.approx(near.shear_variance)


def test_too_little_is_declined():
    few = Z.copy()
    few[MIN_LEVELS - 1 :] = np.nan
    thin = np.where(Z <= 1700.0, Z, np.nan)
    below = Z - 1000.0
    for z, count in ((few, MIN_LEVELS - 1), (thin, 15), (below[below < 1000.0], 0)):
        line = lay(z, np.full(z.size, 5.0 + 1.0j))
        assert not line.determined[0]
        assert line.count[0] == count
        assert all(np.isnan(getattr(line, name)[0]) for name in FIELDS)
    assert lay(Z[::5], np.full(7, 5.0 + 1.0j)).determined[0]


def test_stack_padding_and_gaps_change_no_bit():
    random = np.random.default_rng(5)
    wind = 8.0 + 0.001 * Z + synthetic.correlated_noise(random, Z, 0.5, 60.0, profiles=9)
    z = np.tile(Z, (9, 1))
    for row in range(9):
        z[row, Z.size - 2 * row :] = np.nan
    together = free_air(z, wind.real, wind.imag, np.full(9, 1000.0), np.full(9, 2500.0), 0.1)
    for row in range(9):
        keep = np.isfinite(z[row])
        alone = lay(z[row, keep], wind[row, keep], error=0.1)
        gap = np.insert(np.where(keep, z[row], np.nan), 4, 1190.0)
        holed = lay(gap, np.insert(wind[row], 4, np.nan + 0j), error=0.1)
        for name in FIELDS:
            expected = getattr(together, name)[row]
            assert np.array_equal(getattr(alone, name)[0], expected, equal_nan=True), name
            assert np.array_equal(getattr(holed, name)[0], expected, equal_nan=True), name


def test_mirror_is_exact_and_rotation_rotates():
    wind = 8.0 + (0.001 + 0.002j) * Z
    wind = wind + synthetic.correlated_noise(np.random.default_rng(6), Z, 0.5, 60.0)
    line, mirrored = lay(Z, wind), lay(Z, wind.conj())
    assert mirrored.northward == -line.northward
    assert mirrored.eastward == line.eastward
    assert mirrored.ground_variance == line.ground_variance
    turn = np.exp(0.7j)
    turned = lay(Z, wind * turn)
    expected = complex(line.eastward[0], line.northward[0]) * turn
    assert complex(turned.eastward[0], turned.northward[0]) == pytest.approx(expected)
    assert turned.ground_variance == pytest.approx(line.ground_variance)


@pytest.mark.parametrize("value", [0.0, np.inf, -np.inf, np.nan, 1e308, 5e-324])
def test_hostile_numbers_neither_warn_nor_raise(value):
    wind = np.full(Z.size, 5.0 + 1.0j)
    wind[3:9] = value
    line = lay(Z, wind)
    assert line.determined[0] in (True, False)
    if not line.determined[0]:
        assert np.isnan(line.eastward[0])
    assert free_air(Z[:0], Z[:0], Z[:0], np.array(1.0), np.array(2.0)).determined == np.array(False)
