"""Line-of-sight scans become profiles, or say why not."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import velocity_azimuth as va
from backveer.profiles.velocity_azimuth import velocity_azimuth

AZIMUTH = np.array([3.0, 41.0, 80.0, 127.0, 170.0, 200.0, 251.0, 290.0, 333.0])
DISTANCE = np.array([60.0, 110.0, 190.0, 240.0])


def radials(u: Any, v: Any, w: Any, azimuth: Any, elevation: Any) -> Any:
    """Radial velocities (scan, beam, gate) of winds (scan, gate), in complex numbers."""
    wind = np.asarray(u) + 1j * np.asarray(v)  # east + i north
    looking = 1j * np.exp(-1j * np.radians(azimuth))  # the same of the beam
    across = (wind[:, np.newaxis, :] * np.conj(looking)[..., :, np.newaxis]).real
    slope = np.radians(np.asarray(elevation, dtype=float))
    return across * np.cos(slope) + np.asarray(w)[:, np.newaxis, :] * np.sin(slope)


WIND = (
    np.array([[3.0, -5.0, 8.0, 12.0], [-1.0, 0.5, 20.0, -14.0]]),
    np.array([[1.0, 4.0, -9.0, 0.0], [6.0, -0.5, 2.0, -31.0]]),
    np.array([[0.1, -0.4, 0.0, 0.7], [2.0, -1.0, 0.3, 0.2]]),
)


def test_the_wind_behind_synthetic_radials_comes_back() -> None:
    """Browning and Wexler, 1968: J. Appl. Meteor., 7, 105-113; the identity test of their model."""
    for elevation in (15.0, 35.3, 60.0, 80.0):
        told = velocity_azimuth(AZIMUTH, elevation, DISTANCE, radials(*WIND, AZIMUTH, elevation))
        assert (told.why == "").all()
        for found, true in zip(
            (told.eastward_wind, told.northward_wind, told.upward_air_velocity), WIND, strict=True
        ):
            np.testing.assert_allclose(found, true, atol=1e-11)
        np.testing.assert_allclose(told.residual, 0.0, atol=1e-12)
        np.testing.assert_allclose(
            told.height, np.tile(DISTANCE * np.sin(np.radians(elevation)), (2, 1))
        )


def test_even_azimuths_give_the_first_harmonic() -> None:
    """u = a1 / cos(el), v = b1 / cos(el), w = a0 / sin(el) by a Fourier sum (same source)."""
    azimuth = np.arange(0.0, 360.0, 20.0)
    seen = np.random.default_rng(3).normal(0.0, 0.5, (1, azimuth.size, 2))
    told = velocity_azimuth(azimuth, 40.0, DISTANCE[:2], seen)
    angle, slope = np.radians(azimuth), np.radians(40.0)
    for gate in range(2):
        line = seen[0, :, gate]
        assert told.eastward_wind[0, gate] == pytest.approx(
            2.0 * np.mean(line * np.sin(angle)) / np.cos(slope)
        )
        assert told.northward_wind[0, gate] == pytest.approx(
            2.0 * np.mean(line * np.cos(angle)) / np.cos(slope)
        )
        assert told.upward_air_velocity[0, gate] == pytest.approx(np.mean(line) / np.sin(slope))


def test_linear_change_over_the_circle_leaves_the_horizontal_wind_alone() -> None:
    azimuth = np.arange(0.0, 360.0, 15.0)
    slope = np.radians(30.0)
    x = 200.0 * np.cos(slope) * np.sin(np.radians(azimuth))
    y = 200.0 * np.cos(slope) * np.cos(np.radians(azimuth))
    u, v = 7.0 + 1e-3 * x - 2e-3 * y, -3.0 + 1.5e-3 * x + 5e-4 * y
    seen = (u * np.sin(np.radians(azimuth)) + v * np.cos(np.radians(azimuth))) * np.cos(slope)
    told = velocity_azimuth(azimuth, 30.0, [200.0], seen[np.newaxis, :, np.newaxis])
    assert told.eastward_wind[0, 0] == pytest.approx(7.0)
    assert told.northward_wind[0, 0] == pytest.approx(-3.0)
    # The divergence stands in w: r cos(el)^2 (u_x + v_y) / 2 over sin(el), the same source.
    expected = 200.0 * np.cos(slope) ** 2 * (1e-3 + 5e-4) / 2.0 / np.sin(slope)
    assert told.upward_air_velocity[0, 0] == pytest.approx(expected)


def test_errors_are_those_of_the_scatter() -> None:
    random = np.random.default_rng(11)
    scans = 4000
    wind = [np.full((scans, 1), x) for x in (6.0, -4.0, 0.2)]
    seen = radials(*wind, AZIMUTH, 50.0) + random.normal(0.0, 0.3, (scans, AZIMUTH.size, 1))
    told = velocity_azimuth(AZIMUTH, 50.0, [100.0], seen)
    for name in ("eastward_wind", "northward_wind", "upward_air_velocity"):
        spread = getattr(told, name).std()
        stated = np.sqrt((getattr(told, f"{name}_error") ** 2).mean())
        assert stated == pytest.approx(spread, rel=0.05)


def test_each_poor_scan_says_why() -> None:
    seen = radials(*WIND, AZIMUTH, 60.0)[:1]
    usable = np.ones(seen.shape, dtype=bool)
    usable[0, :, 0] = False
    usable[0, 5:, 1] = False
    usable[0, 4:7, 2] = False
    told = velocity_azimuth(AZIMUTH, 60.0, DISTANCE, seen, usable)
    assert told.why[0].tolist() == [va.NO_DATA, va.FEW, va.GAP, ""]
    assert np.isnan(told.eastward_wind[0]).tolist() == [True, True, True, False]
    assert told.used[0].tolist() == [0, 5, 6, 9]
    assert told.azimuths[0].tolist() == [0, 5, 6, 9]
    # 170 to 3 degrees round by north; 127 to 290 degrees; 200 to 251 degrees.
    assert told.gap[0].tolist() == [360.0, 193.0, 163.0, 51.0]


def test_a_wind_that_is_not_uniform_is_withheld() -> None:
    seen = radials(*WIND, AZIMUTH, 60.0)
    seen[1, ::2, 2] += 9.0
    told = velocity_azimuth(AZIMUTH, 60.0, DISTANCE, seen)
    assert told.why[1].tolist() == ["", "", va.RESIDUAL, ""]
    assert np.isnan(told.northward_wind[1, 2])
    assert told.residual[1, 2] > va.LARGEST_RESIDUAL
    looser = velocity_azimuth(AZIMUTH, 60.0, DISTANCE, seen, largest_residual=20.0)
    assert (looser.why == "").all()


def test_a_beam_to_the_zenith_is_no_part_of_a_fixed_elevation() -> None:
    elevation = np.full(AZIMUTH.shape, 60.0)
    elevation[4] = 90.0
    told = velocity_azimuth(AZIMUTH, elevation, DISTANCE, radials(*WIND, AZIMUTH, 60.0))
    assert set(told.why.reshape(-1)) == {va.NOT_FIXED}


@pytest.mark.parametrize("elevation", [0.0, 90.0, -5.0])
def test_at_the_horizon_and_the_zenith_there_is_no_profile(elevation: float) -> None:
    told = velocity_azimuth(AZIMUTH, elevation, DISTANCE, radials(*WIND, AZIMUTH, elevation))
    assert set(told.why.reshape(-1)) == {va.ELEVATION}
    assert np.isnan(told.eastward_wind).all()


def test_the_same_azimuth_many_times_is_one() -> None:
    azimuth = np.concatenate([np.full(20, 359.9), np.full(20, 0.1), [120.0, 240.0]])
    told = velocity_azimuth(azimuth, 60.0, DISTANCE, radials(*WIND, azimuth, 60.0))
    assert told.azimuths[0].tolist() == [3] * 4
    assert set(told.why.reshape(-1)) == {va.FEW}


@given(st.integers(0, 8), st.floats(0.0, 360.0))
def test_scans_do_not_see_each_other_nor_beams_that_are_missing(scan: int, turn: float) -> None:
    random = np.random.default_rng(5)
    azimuth = np.sort(random.uniform(0.0, 360.0, (9, 14)), axis=1)
    seen = random.normal(0.0, 1.0, (9, 14, 3))
    usable = random.random(seen.shape) > 0.1
    whole = velocity_azimuth(azimuth, 45.0, DISTANCE[:3], seen, usable)
    alone = velocity_azimuth(
        np.insert(azimuth[scan : scan + 1], 4, np.nan, axis=1),
        45.0,
        DISTANCE[:3],
        np.insert(seen[scan : scan + 1], 4, turn, axis=1),
        np.insert(usable[scan : scan + 1], 4, True, axis=1),
    )
    for name in ("eastward_wind", "northward_wind_error", "gap", "residual", "height"):
        np.testing.assert_array_equal(getattr(whole, name)[scan], getattr(alone, name)[0])
    assert whole.why[scan].tolist() == alone.why[0].tolist()


def test_turning_the_instrument_turns_the_wind() -> None:
    seen = radials(*WIND, AZIMUTH, 60.0) + 0.1 * np.sin(np.arange(9.0))[:, np.newaxis]
    told = velocity_azimuth(AZIMUTH, 60.0, DISTANCE, seen)
    turned = velocity_azimuth(AZIMUTH + 90.0, 60.0, DISTANCE, seen)
    np.testing.assert_allclose(turned.eastward_wind, told.northward_wind, atol=1e-12)
    np.testing.assert_allclose(turned.northward_wind, -told.eastward_wind, atol=1e-12)


def test_hostile_numbers_do_no_harm() -> None:
    seen = radials(*WIND, AZIMUTH, 60.0)
    seen[0, 0, :] = [np.inf, -np.inf, np.nan, 1e300]
    told = velocity_azimuth(AZIMUTH, 60.0, DISTANCE, seen)
    assert told.used[0].tolist() == [8, 8, 8, 8]
    np.testing.assert_allclose(told.eastward_wind, WIND[0], atol=1e-11)
    for shape in ((0, 9, 4), (2, 0, 4), (2, 9, 0)):
        empty = velocity_azimuth(np.zeros(shape[1]), 60.0, np.zeros(shape[2]), np.zeros(shape))
        assert empty.eastward_wind.shape == (shape[0], shape[2])
        assert empty.to_stack().profile_count == shape[0]


def test_it_becomes_a_stack() -> None:
    told = velocity_azimuth(AZIMUTH, 60.0, DISTANCE, 0.2 + radials(*WIND, AZIMUTH, 60.0))
    time = np.array(["2031-05-14T00:00", "2031-05-14T00:10"], dtype="datetime64[ns]")
    stack = told.to_stack(height=2.0, time=time, latitude=58.4)
    np.testing.assert_allclose(stack.height[1], DISTANCE * np.sin(np.radians(60.0)) + 2.0)
    np.testing.assert_allclose(stack.eastward_wind, WIND[0], atol=1e-11)
    assert stack.time.tolist() == time.tolist()
    assert stack.latitude.tolist() == [58.4, 58.4]
    assert (stack.availability == 1.0).all()
    assert stack.wind_error.shape == (2,)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"fewest_azimuths": 3}, "with 3 azimuths has no error. Ask for 4"),
        ({"radial_velocity": np.zeros((9, 4))}, r"shape \(9, 4\). Give them over \(scan, beam"),
        ({"azimuth": np.zeros(5)}, "do not fit 2 scans of 9 beams and 4 gates"),
    ],
)
def test_calls_that_make_no_sense_are_refused(change: dict[str, Any], words: str) -> None:
    call: dict[str, Any] = {
        "azimuth": AZIMUTH,
        "elevation": 60.0,
        "distance": DISTANCE,
        "radial_velocity": radials(*WIND, AZIMUTH, 60.0),
    }
    with pytest.raises(ValueError, match=words):
        velocity_azimuth(**(call | change))
