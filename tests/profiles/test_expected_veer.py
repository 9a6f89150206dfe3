"""Measured veer beside that of a neutral layer: solved layers, mirrors, reasons."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
import synthetic

from backveer.profiles import expected_veer as module
from backveer.profiles.drag_law import drag_law
from backveer.profiles.earth import coriolis
from backveer.profiles.ekman import fit
from backveer.profiles.expected_veer import expected_veer
from backveer.profiles.rotor import Turbine, rotor
from backveer.profiles.stack import Stack

Z = np.arange(10.0, 400.0, 10.0)
TURBINES = [Turbine("A", 119.0, 171.0), Turbine("B", 80.0, 90.0)]


def layer(speed: float, latitude: float, roughness: float, kind: Any = None) -> Any:
    truth = synthetic.solve(speed, latitude, roughness, kind or synthetic.neutral(latitude))
    stack = truth.stack(Z, latitude)
    return truth, stack, rotor(stack, TURBINES, error=0.1), coriolis(stack)


@pytest.mark.parametrize("latitude", [45.0, 58.0, -40.0])
@pytest.mark.parametrize("speed", [5.0, 10.0, 20.0])
@pytest.mark.parametrize("roughness", [1e-4, 0.1, 0.5])
def test_a_neutral_layer_is_no_anomaly(latitude: float, speed: float, roughness: float) -> None:
    truth, _, told, f = layer(speed, latitude, roughness)
    wind = truth.geostrophic.real, truth.geostrophic.imag
    found = expected_veer(told, f, geostrophic=wind, roughness=roughness)
    assert (found.why == "").all()
    ratio = found.expected / told.veer
    assert (np.abs(ratio - 1.0) < 0.4).all()
    assert (np.abs(found.anomaly) < 1.5 * found.anomaly_error).all()
    assert found.friction_velocity[0] == pytest.approx(truth.u_star, rel=0.02)
    # Without the geostrophic wind, from the hub's speed.
    guessed = expected_veer(told, f, roughness=roughness)
    assert (guessed.geostrophic_from == module.HUB).all()
    assert guessed.geostrophic_speed == pytest.approx(speed, rel=module.FROM_HUB_ERROR)
    assert (np.abs(guessed.expected / told.veer - 1.0) < 0.4).all()


def test_a_layer_mixed_to_a_lid_veers_less_than_expected() -> None:
    truth, _, told, f = layer(10.0, 58.0, 0.1, synthetic.cubic(1200.0))
    found = expected_veer(
        told, f, geostrophic=(truth.geostrophic.real, truth.geostrophic.imag), roughness=0.1
    )
    assert (found.anomaly < -1.0).all()


def test_it_mirrors_and_turns_with_the_wind() -> None:
    _, stack, told, f = layer(10.0, 52.0, 0.05)
    found = expected_veer(told, f, roughness=0.05)
    south = stack.replace(latitude=-stack.latitude, northward_wind=-stack.northward_wind)
    mirrored = expected_veer(rotor(south, TURBINES, error=0.1), coriolis(south), roughness=0.05)
    np.testing.assert_array_equal(mirrored.expected, -found.expected)
    np.testing.assert_array_equal(mirrored.expected_error, found.expected_error)
    np.testing.assert_allclose(mirrored.anomaly, -found.anomaly, atol=1e-12)
    turned = stack.replace(eastward_wind=stack.northward_wind, northward_wind=-stack.eastward_wind)
    again = expected_veer(rotor(turned, TURBINES, error=0.1), coriolis(turned), roughness=0.05)
    np.testing.assert_allclose(again.expected, found.expected, atol=1e-12)


def test_the_drag_law_is_the_published_one() -> None:
    """G = 10 m/s, f = 1e-4 s-1, z0 = 0.03 m: u* = 0.3673 m/s, 24.41 degrees (checks, section 4)."""
    _, _, told, f = layer(10.0, 45.0, 0.03)
    f = replace(f, coriolis_parameter=np.array([1e-4]))
    found = expected_veer(told, f, geostrophic=(6.0, 8.0), roughness=0.03)
    assert found.friction_velocity[0, 0].round(4) == 0.3673
    assert found.cross_isobar_angle[0, 0].round(2) == 24.41


def test_a_wind_given_a_fit_and_a_guess_come_in_this_order() -> None:
    random = np.random.default_rng(4)
    z = np.linspace(10.0, 2500.0, 120)
    spiral = 10.0 * (1.0 - np.exp(-(1.0 + 1.0j) * z / 250.0))
    noise = 0.05 * (random.normal(size=z.size) + 1j * random.normal(size=z.size))
    stack = Stack.of(
        height=z,
        eastward_wind=[(spiral + noise).real],
        northward_wind=[(spiral + noise).imag],
        latitude=[50.0],
    )
    f = coriolis(stack)
    fitted = fit(stack, f, error=np.array([0.05]))
    assert fitted.verdict[0] == "well determined"
    told = rotor(stack, TURBINES, error=0.05)
    by_fit = expected_veer(told, f, fitted, roughness=0.1)
    assert (by_fit.geostrophic_from == "fit").all()
    assert by_fit.geostrophic_speed == pytest.approx(10.0, rel=0.05)
    # Between the same heights the fitted spiral turns as the noisy wind does.
    assert by_fit.fitted == pytest.approx(told.veer, abs=1.5)
    given = expected_veer(told, f, fitted, geostrophic=(12.0, 5.0), roughness=0.1)
    assert (given.geostrophic_from == "given").all()
    assert given.geostrophic_speed == pytest.approx(13.0)
    assert np.isnan(expected_veer(told, f, roughness=0.1).fitted).all()


def test_the_roughness_of_the_profile_serves_where_none_is_given() -> None:
    z = np.arange(20.0, 220.0, 20.0)
    stack = Stack.of(
        height=z, eastward_wind=0.5 / 0.4 * np.log(z / 0.03), northward_wind=0.0, latitude=[50.0]
    )
    found = expected_veer(rotor(stack, TURBINES, error=0.1), coriolis(stack))
    assert (found.roughness_from == module.FITTED).all()
    assert found.roughness_length == pytest.approx(0.03)
    # u* = 0.5 m/s stands in the profile (straight lines between levels), and the drag law has it.
    assert found.friction_velocity == pytest.approx(0.5, rel=1e-3)
    again = drag_law(found.geostrophic_speed[0], coriolis(stack).coriolis_parameter, [0.03])
    assert again.friction_velocity == pytest.approx(0.5, rel=1e-3)


@pytest.mark.parametrize(
    ("change", "roughness", "why"),
    [
        ({"latitude": np.array([np.nan])}, 0.05, module.NO_CORIOLIS),
        ({"latitude": np.array([2.0])}, 0.05, module.NO_CORIOLIS),
        ({"eastward_wind": np.full((1, Z.size), 8.0), "northward_wind": np.zeros((1, Z.size))},
         None, module.NO_ROUGHNESS),
        ({"eastward_wind": np.full((1, Z.size), np.nan)}, 0.05, module.NO_WIND),
    ],
)  # fmt: skip
def test_what_is_missing_is_said(change: Any, roughness: Any, why: str) -> None:
    _, stack, _, _ = layer(10.0, 45.0, 0.05)
    stack = stack.replace(**change)
    found = expected_veer(rotor(stack, TURBINES), coriolis(stack), roughness=roughness)
    assert set(found.why.reshape(-1)) == {why}
    assert np.isnan(found.anomaly).all()
    assert np.isnan(found.anomaly_error).all()


def test_a_roughness_that_is_none_is_refused() -> None:
    _, _, told, f = layer(10.0, 45.0, 0.05)
    with pytest.raises(ValueError, match="a roughness length is positive, not -1"):
        expected_veer(told, f, roughness=-1.0)
