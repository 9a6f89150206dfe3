"""Each cause from a profile made to have it, and its withholding when one thing is taken away."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import earth, ekman
from backveer.profiles.boundary_layer import boundary_layer
from backveer.profiles.labels import labels
from backveer.profiles.low_level_shear import low_level_shear
from backveer.profiles.shear_cause import FRICTION, FRONT, JET, UNKNOWN, ShearCause, shear_cause
from backveer.profiles.stack import Stack

NIGHT, DAY = "2031-09-23T00:40", "2031-09-23T12:40"


def told(stack, error=0.3):
    spread = np.full(stack.profile_count, error)
    return shear_cause(
        stack,
        low_level_shear(stack, spread),
        boundary_layer(stack),
        ekman.fit(stack, earth.coriolis(stack), error=spread),
        spread,
    )


def night_jet(time=NIGHT, lapse=+0.02, latitude=58.0, **more):
    """15 m/s at 200 m, 9 above, over an inversion of 20 K/km."""
    z = np.array([10.0, 50, 100, 150, 200, 300, 400, 600, 900, 1300])
    speed = np.interp(z, [10, 200, 500, 1300], [3, 15, 9, 9])
    t = 283 + np.where(z < 300, lapse * z, lapse * 300 - 0.0065 * (z - 300))
    known = {
        "height": [z],
        "eastward_wind": [speed],
        "northward_wind": [0.1 * speed],
        "air_temperature": [t],
        "time": np.array([time], dtype="datetime64[ns]"),
        "latitude": [latitude],
        "longitude": [-3.0],
    }
    return Stack.of(**(known | more))


def frontal(turn=60.0):
    """10 m/s throughout, turning inside an inversion from 300 to 360 m."""
    z = np.array([10.0, 100, 200, 300, 360, 450, 600, 900])
    angle = np.radians(np.interp(z, [300, 360], [220, 220 + turn]))
    t = 283 - 0.0065 * z + np.interp(z, [300, 360], [0, 4])
    return Stack.of(
        height=[z],
        eastward_wind=[-10 * np.sin(angle)],
        northward_wind=[-10 * np.cos(angle)],
        air_temperature=[t],
        latitude=[58.0],
    )


def spiral(latitude=55.0):
    z = np.linspace(10, 2000, 80)
    w = 12 * (1 - 0.9 * np.exp(-(1 + 1j) * z / 250))
    side = 1 if latitude > 0 else -1
    return Stack.of(
        height=[z], eastward_wind=[w.real], northward_wind=[side * w.imag], latitude=[latitude]
    )


def test_a_jet_by_night_on_a_stable_layer():
    answer = told(night_jet())
    assert answer.cause[0] == JET
    assert answer.evidence[0] == "the layer is stable and lies under the nose of a jet"
    # 12 m/s over 190 m of 20 + 9.77 K/km at 283 K: g/theta dtheta/dz / S^2, by hand 0.257, where
    # the wind is turned by 0.1: S^2 = (12/190)^2 * 1.01.
    by_hand = 9.80665 / 283.2 * 0.02977 / ((12 / 190) ** 2 * 1.01)
    assert answer.richardson_number[0] == pytest.approx(by_hand, rel=0.02)
    assert answer.stability[0] == "near the critical value"


@pytest.mark.parametrize(
    ("change", "evidence"),
    [
        ({"time": DAY}, "there is a jet above the stable layer, but by day"),
        ({"lapse": -0.012}, "there is a jet above the layer, but the layer is not stable"),
        (
            {"air_temperature": [[np.nan] * 10]},
            "there is a jet above the layer, but no temperature to say whether it is stable",
        ),
    ],
)
def test_no_nocturnal_jet_without_night_stability_or_temperature(change, evidence):
    answer = told(night_jet(**change))
    assert (answer.cause[0], answer.evidence[0]) == (UNKNOWN, evidence)


def test_night_is_not_asserted_where_the_time_is_not_known():
    answer = told(night_jet(time="NaT"))
    assert answer.cause[0] == JET
    assert answer.evidence[0].endswith("; whether it is night is not known")


def test_a_front_needs_turning_in_an_inversion():
    answer = told(frontal())
    assert answer.cause[0] == FRONT
    # Half of the turn's 60 m fit into 100 ft (30.5 m), so half of 60 degrees.
    assert answer.turning[0] == pytest.approx(30, abs=1)
    # By hand: g/theta (4 K / 60 m + 0.0033) / (10 m/s / 60 m)^2 = 0.0864.
    by_hand = 9.80665 / 284 * (4 / 60 + 0.00977 - 0.0065) / (10 / 60) ** 2
    assert answer.richardson_number[0] == pytest.approx(by_hand, rel=0.02)
    assert answer.stability[0] == "dynamically unstable"
    weak = told(frontal(turn=6.0))
    assert weak.cause[0] == UNKNOWN
    assert "hardly turns" in weak.evidence[0]


def test_friction_where_the_spiral_is_well_determined():
    answer = told(spiral())
    assert answer.cause[0] == FRICTION
    assert answer.richardson_why[0] == "there is no temperature at both ends of the layer"
    assert not answer.unstable[0]


def test_instability_in_words():
    unstable = told(night_jet(lapse=-0.008))
    assert unstable.unstable[0]
    assert unstable.stability[0] == "dynamically unstable"
    assert told(night_jet(lapse=-0.02)).stability[0] == "statically unstable"


def test_no_shear_no_cause():
    still = told(night_jet(eastward_wind=[[5.0] * 10], northward_wind=[[0.0] * 10]))
    assert (still.cause[0], still.evidence[0]) == (UNKNOWN, "no shear is larger than its error")
    assert still.richardson_why[0] == "no shear is larger than its error"
    assert told(Stack.of(profiles=1)).cause[0] == UNKNOWN
    assert told(Stack.of(profiles=0)).cause.shape == (0,)


def test_a_mirrored_profile_has_the_mirrored_cause():
    for north, south in ((spiral(), spiral(-55.0)),):
        a, b = told(north), told(south)
        assert a.cause[0] == b.cause[0]
        assert a.turning[0] == pytest.approx(-b.turning[0])


@given(st.permutations([0, 1, 2]))
def test_a_stack_is_its_profiles_bit_for_bit(order):
    stacks = [[night_jet(), frontal(), spiral()][i] for i in order]
    whole = told(Stack.concatenate(stacks))
    for row, stack in enumerate(stacks):
        for name in labels(ShearCause):
            np.testing.assert_array_equal(
                getattr(whole, name)[row], getattr(told(stack), name)[0], err_msg=name
            )
