"""Sums, interpolation and integrals over levels: exact where they can be, stack as single."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles.grid import at_height, compact, integral_between, ordered_sum

rng = np.random.default_rng(20310514)


def ragged(profiles=7, levels=40):
    z = np.cumsum(rng.uniform(5, 60, (profiles, levels)), axis=1)
    x = rng.normal(size=(profiles, levels))
    x[rng.random((profiles, levels)) < 0.2] = np.nan
    for row, length in enumerate(rng.integers(3, levels, profiles)):
        z[row, length:] = np.nan
        x[row, length:] = np.nan
    return z, x


def test_ordered_sum_does_not_see_padding():
    x = rng.normal(size=203)
    padded = np.concatenate([x, np.zeros(317)])
    assert ordered_sum(x) == ordered_sum(padded)
    assert ordered_sum(np.zeros((3, 0))).tolist() == [0, 0, 0]


def test_compact_keeps_order_and_marks_the_rest():
    keep = np.array([[True, False, True, True], [False, False, True, False]])
    count, x = compact(keep, np.array([[1.0, 2.0, 3.0, 4.0], [5.0, 6.0, 7.0, 8.0]]))
    assert count.tolist() == [3, 1]
    np.testing.assert_array_equal(x, [[1, 3, 4], [7, np.nan, np.nan]])


def test_at_height_against_numpy():
    z, x = ragged()
    targets = np.linspace(0, 1500, 61)
    ours = at_height(z, x, targets)
    for row in range(len(z)):
        keep = np.isfinite(x[row])
        theirs = np.interp(targets, z[row, keep], x[row, keep], left=np.nan, right=np.nan)
        np.testing.assert_allclose(ours[row], theirs, rtol=1e-12, atol=1e-12)


def test_integral_against_a_fine_sum():
    z, x = ragged()
    base, top = np.array([40.0, 61.3, 90.0]), np.array([55.0, 140.7, 90.0])
    ours = integral_between(z, x, base, top)
    for row in range(len(z)):
        for column in range(3):
            fine = np.linspace(base[column], top[column], 200001)
            theirs = np.trapezoid(at_height(z[row], x[row], fine), fine)
            if np.isnan(theirs):
                assert np.isnan(ours[row, column])
            else:
                assert ours[row, column] == pytest.approx(theirs, abs=1e-5)


@given(st.integers(1, 12), st.integers(0, 2**32 - 1))
def test_a_stack_is_its_profiles_bit_for_bit(profiles, seed):
    global rng
    rng = np.random.default_rng(seed)
    z, x = ragged(profiles, 30)
    targets = np.array([20.0, 77.0, 300.0, 2000.0])
    whole = at_height(z, x, targets)
    integral = integral_between(z, x, targets[:-1], targets[1:])
    for row in range(profiles):
        length = int(np.isfinite(z[row]).sum())
        one_z, one_x = z[row : row + 1, :length], x[row : row + 1, :length]
        np.testing.assert_array_equal(whole[row : row + 1], at_height(one_z, one_x, targets))
        np.testing.assert_array_equal(
            integral[row : row + 1], integral_between(one_z, one_x, targets[:-1], targets[1:])
        )


def test_the_ends_belong_to_the_profile_and_beyond_is_nothing():
    z, x = np.array([10.0, 20.0]), np.array([3.0, 7.0])
    np.testing.assert_array_equal(
        at_height(z, x, [9.999, 10.0, 20.0, 20.001]), [np.nan, 3, 7, np.nan]
    )
    np.testing.assert_array_equal(at_height(z[:1], x[:1], [10.0, 11.0]), [3.0, np.nan])
    assert np.isnan(at_height(np.zeros((2, 0)), np.zeros((2, 0)), [1.0])).all()


def test_complex_values_pass():
    z = np.array([0.0, 10.0])
    assert at_height(z, np.array([0, 2 + 4j]), [5.0])[0] == 1 + 2j
