"""Evidence for the geostrophic wind, the departure from it and the stress that this needs."""

from __future__ import annotations

import dataclasses
import functools
from typing import Any

import leipzig
import numpy as np
import pytest
import synthetic

from backveer.profiles import earth, ekman
from backveer.profiles import geostrophic as subject
from backveer.profiles.boundary_layer import BoundaryLayer
from backveer.profiles.ekman import EkmanFit
from backveer.profiles.geostrophic import geostrophic
from backveer.profiles.labels import labels
from backveer.profiles.stack import Stack

LATITUDE = 52.0
F = synthetic.coriolis_parameter(LATITUDE)
Z = np.concatenate([[10.0], np.arange(40.0, 3500.0, 30.0)])


def blank(kind: type, count: int, **known: Any) -> Any:
    """Return an answer of another room in which nothing is determined but what is known here."""
    sizes = {"profile": count, "level": 1}
    filled: dict[str, Any] = {}
    for field in dataclasses.fields(kind):
        label = field.metadata.get("variable")
        if field.name in known and label is None:
            filled[field.name] = known[field.name]
        elif label is None:
            filled[field.name] = "" if field.type in ("str", str) else 0.0
        else:
            shape = tuple(sizes.get(dim, 1) for dim in label.dims)
            value = known.get(field.name, np.nan if label.unit else "")
            filled[field.name] = np.broadcast_to(
                np.asarray(value, dtype=object if isinstance(value, str) else None), shape
            )
    return kind(**filled)


def no_fit(count: int = 1) -> EkmanFit:
    return blank(EkmanFit, count, verdict="not determined", why="there is no fit here")


def exact_fit(geostrophic_wind: complex, delta: float, latitude: float, **more: Any) -> EkmanFit:
    """Return the fit that a no-slip spiral deserves."""
    known = {
        "verdict": "well determined",
        "scale_height": delta,
        "scale_height_error": 10.0,
        "geostrophic_eastward_wind": geostrophic_wind.real,
        "geostrophic_northward_wind": geostrophic_wind.imag,
        "geostrophic_eastward_wind_error": 0.1,
        "geostrophic_northward_wind_error": 0.1,
        "geostrophic_eastward_shear": 0.0,
        "geostrophic_northward_shear": 0.0,
        "geostrophic_eastward_shear_error": 0.0,
        "geostrophic_northward_shear_error": 0.0,
        "departure_eastward_at_ground": -geostrophic_wind.real,
        "departure_northward_at_ground": -geostrophic_wind.imag,
        "noise_length": 50.0,
        "top": 3500.0,
    }
    return blank(EkmanFit, 1, **(known | more))


def layer(depth: Any = np.nan, count: int = 1) -> BoundaryLayer:
    return blank(BoundaryLayer, count, bulk_richardson_depth=depth)


def ask(stack: Stack, fit: Any = None, boundary: Any = None, **more: Any) -> Any:
    count = stack.profile_count
    more.setdefault("error", np.full(count, 0.2))
    return geostrophic(
        stack, earth.coriolis(stack), fit or no_fit(count), boundary or layer(count=count), **more
    )


def up_to(top: float) -> Any:
    return Z[top >= Z]


@functools.cache
def spiral(latitude: float = LATITUDE, shear: complex = 0.0) -> synthetic.Truth:
    return synthetic.solve(10.0, latitude, 1e-3, synthetic.constant(6.0), 250.0, shear)


def evidence(answer: Any, place: int) -> complex:
    return complex(answer.evidence_eastward[0, place], answer.evidence_northward[0, place])


def test_three_kinds_of_evidence_stand_at_the_ground():
    truth = spiral(shear=0.002 - 0.001j)
    stack = truth.stack(Z, LATITUDE)
    wg = truth.geostrophic
    answer = ask(
        stack,
        exact_fit(wg, 323.0, LATITUDE, top=3400.0),
        given=(wg.real, wg.imag),
        given_error=0.7,
    )
    assert answer.evidence_from.tolist() == [["given", "fit", "free air"]]
    assert answer.reference_height == 0.0
    assert evidence(answer, 0) == evidence(answer, 1) == pytest.approx(wg)
    # what is left of the spiral a quarter above pi delta leans on the line from below
    assert evidence(answer, 2) == pytest.approx(wg, abs=answer.evidence_error[0, 2])
    assert evidence(answer, 2) == pytest.approx(wg, abs=0.35)
    assert answer.evidence_error[0, 0] == 0.7
    assert answer.evidence_error[0, 1] == pytest.approx(0.1)
    assert 0.05 < answer.evidence_error[0, 2] < 1.0
    assert answer.evidence_why.tolist() == [["", "", ""]]


def test_evidence_that_is_missing_says_why():
    low = spiral().stack(Z[Z < 300.0], LATITUDE)
    answer = ask(low, given=(8.0, 3.0))
    assert answer.evidence_from.tolist() == [["given", "fit", "free air"]]
    assert answer.evidence_why[0, 0] == subject.NO_GIVEN_ERROR
    assert answer.evidence_why[0, 1] == "there is no fit here"
    assert answer.evidence_why[0, 2] == "the profile has no wind above the boundary layer"
    assert np.isnan(answer.evidence_eastward[0, 1:]).all()
    without = ask(low)
    assert without.evidence_from[0, 0] == ""
    assert without.chosen[0] == ""
    assert without.departure_why[0] == subject.NO_EVIDENCE
    assert without.friction_velocity_why[0] == subject.NO_EVIDENCE
    assert np.isnan(without.departure_along).all()
    few = ask(spiral().stack(Z[Z < 1650.0], LATITUDE))
    assert few.evidence_why[0, 2].startswith("fewer than 6 levels above the boundary layer")


@pytest.mark.parametrize(
    ("given", "verdict", "top", "chosen"),
    [
        ((9.0, 4.0), "well determined", 3500.0, "given"),
        (None, "well determined", 3500.0, "fit"),
        (None, "weakly determined", 3500.0, "free air"),
        (None, "weakly determined", 1000.0, "fit"),
        (None, "not determined", 3500.0, "free air"),
        (None, "not determined", 1000.0, ""),
    ],
)
def test_the_best_evidence_is_chosen(given, verdict, top, chosen):
    truth = spiral()
    fit = exact_fit(truth.geostrophic, 323.0, LATITUDE, verdict=verdict, top=900.0)
    answer = ask(truth.stack(up_to(top), LATITUDE), fit, given=given)
    assert answer.chosen[0] == chosen
    assert np.isfinite(answer.departure_along).any() == bool(chosen)


@pytest.mark.parametrize("latitude", [LATITUDE, -LATITUDE])
def test_departure_points_to_the_low_and_follows_the_sheared_geostrophic_wind(latitude):
    shear = 0.001 + np.sign(latitude) * 0.002j
    truth = synthetic.solve(10.0, latitude, 1e-3, synthetic.constant(6.0), 270.0, shear)
    fit = exact_fit(
        truth.geostrophic,
        323.0,
        latitude,
        geostrophic_eastward_shear=shear.real,
        geostrophic_northward_shear=shear.imag,
        top=2500.0,
    )
    answer = ask(truth.stack(Z, latitude), fit)
    away = (truth.wind(Z) - truth.geostrophic_wind(Z)) / truth.geostrophic_wind(Z)
    size = np.abs(truth.geostrophic_wind(Z))
    told = Z <= 2500.0
    assert answer.departure_along[0, told] == pytest.approx((away.real * size)[told], abs=1e-9)
    across = np.sign(latitude) * away.imag * size
    assert answer.departure_across[0, told] == pytest.approx(across[told], abs=1e-9)
    assert answer.departure_across[0, 3] > 2.0  # toward low pressure in both hemispheres
    assert np.isnan(answer.departure_along[0, ~told]).all()
    assert answer.departure_error[0] == pytest.approx(np.hypot(0.1, 0.2))


def test_free_air_shear_serves_the_departure():
    truth = spiral(shear=0.002 - 0.001j)
    answer = ask(truth.stack(Z, LATITUDE), boundary=layer(1200.0))
    assert answer.chosen[0] == "free air"
    aloft = (Z > 1600.0) & (Z < 3000.0)  # there the geostrophic wind has changed by 4 to 7 m/s
    assert np.abs(answer.departure_along[0, aloft]).max() < 0.15
    assert np.abs(answer.departure_across[0, aloft]).max() < 0.15
    assert np.isnan(answer.departure_along[0, Z > 3000.0]).all()


@pytest.mark.parametrize(
    ("inversions", "base"),
    [
        ({}, 1.25 * 200.0),
        ({"inversion_kind": "surface-based", "inversion_top": 150.0}, 1500.0),
        ({"inversion_kind": "elevated", "inversion_top": 1100.0}, 1100.0),
        ({"inversion_kind": "elevated", "inversion_top": 3600.0}, 1.25 * 200.0),
    ],
)
def test_free_air_begins_above_the_layer_of_the_day(inversions, base):
    """Below the base the wind is wild: only the right base keeps all of that out, and no more."""
    wind = np.where(base > Z, 30.0 * np.sin(Z / 70.0) - 20.0, 9.0 + 0.001 * Z)
    stack = Stack.of(height=Z, eastward_wind=wind, northward_wind=4.0, latitude=LATITUDE)
    boundary = blank(BoundaryLayer, 1, bulk_richardson_depth=200.0, **inversions)
    answer = ask(stack, boundary=boundary)
    assert evidence(answer, 2) == pytest.approx(9.0 + 4.0j)
    lowest = Z[base <= Z][0]
    assert np.isfinite(answer.departure_along[0, (lowest <= Z) & (base + 1500.0 >= Z)]).all()
    assert np.isnan(answer.departure_along[0, base + 1500.0 < Z]).all()


@pytest.mark.parametrize("top", [3500.0, 700.0])
def test_friction_velocity_of_the_spiral(top):
    """
    Surface stress G sqrt(K f), exactly; the fit carries the integral above the profile.

    At pi delta exp(-pi) of the departure is left, with the opposite sign: u*^2 is 4.3 % too high,
    but for the lowest 10 m, in which the spiral has no logarithmic wall.
    """
    truth = spiral()
    delta = np.sqrt(2 * 6.0 / F)
    fit = exact_fit(truth.geostrophic, delta, LATITUDE, top=top)
    answer = ask(truth.stack(up_to(top), LATITUDE), fit)
    assert answer.depth[0] == pytest.approx(np.pi * delta)
    assert answer.depth_from[0] == "fit"
    expected = np.sqrt(10.0 * np.sqrt(6.0 * F))
    assert answer.friction_velocity[0] == pytest.approx(expected * 1.021, rel=0.015)
    assert 0.0 < answer.friction_velocity_error[0] < 0.15 * expected


@pytest.mark.parametrize("roughness", [0.001, 0.1])
@pytest.mark.parametrize("latitude", [47.0, -60.0])
def test_friction_velocity_where_viscosity_varies(roughness, latitude):
    """Synthetic truth: cubic K(z), which ends at 900 m, and nobody told of the geostrophic wind."""
    truth = synthetic.solve(11.0, latitude, roughness, synthetic.cubic(900.0), 205.0)
    answer = ask(truth.stack(Z, latitude), boundary=layer(900.0))
    assert answer.chosen[0] == "free air"
    assert answer.depth_from[0] == "bulk Richardson number"
    error = answer.friction_velocity_error[0]
    assert error < 0.2 * truth.u_star
    assert answer.friction_velocity[0] == pytest.approx(truth.u_star, abs=2.0 * error)
    assert answer.friction_velocity[0] == pytest.approx(truth.u_star, rel=0.03)


def test_friction_velocity_error_covers_the_truth():
    """Ninety-five in a hundred within 1.96 errors, with radiosonde noise alike over 80 m."""
    truth = synthetic.solve(11.0, LATITUDE, 0.03, synthetic.cubic(900.0), 205.0)
    noise = synthetic.correlated_noise(np.random.default_rng(4), Z, 0.4, 80.0, profiles=1000)
    stack = truth.stack(Z, LATITUDE, noise)
    fit = blank(EkmanFit, 1000, verdict="not determined", noise_length=80.0)
    answer = ask(stack, fit, layer(900.0, 1000), error=np.full(1000, 0.4))
    told = np.isfinite(answer.friction_velocity)
    assert told.mean() > 0.9
    off = (answer.friction_velocity - truth.u_star)[told] / answer.friction_velocity_error[told]
    assert 0.92 < np.mean(np.abs(off) < 1.96) <= 0.995


def test_leipzig_against_lettau():
    """
    Lettau (1950), table in leipzig.py: u* 0.65 m/s and 26.1 degrees (from memory).

    The whole vector of the integral, not only its part across, so the angle comes out too:
    within the 2.5 degrees by which two copies of the table differ.
    """
    stack = Stack.of(
        height=leipzig.Z, eastward_wind=leipzig.U, northward_wind=leipzig.V, latitude=51.3
    )
    answer = ask(stack, boundary=layer(950.0), given=(17.5, 0.0), given_error=0.3)
    assert answer.friction_velocity[0] == pytest.approx(0.65, abs=0.03)


def reasons() -> dict[str, tuple[Any, dict[str, Any]]]:
    truth = spiral()
    wg = truth.geostrophic
    given = {"given": (wg.real, wg.imag), "given_error": 0.2}
    stack = truth.stack(Z, LATITUDE)
    jet = stack.replace(eastward_wind=stack.eastward_wind + 4.0 * np.exp(-(((Z - 400) / 200) ** 2)))
    return {
        subject.NO_DEPTH: (stack, given),
        subject.ENDS_BELOW: (
            truth.stack(Z[Z < 800.0], LATITUDE),
            given | {"boundary": layer(1000.0)},
        ),
        subject.STARTS_HIGH: (
            truth.stack(Z[Z > 300.0], LATITUDE),
            given | {"boundary": layer(1000.0)},
        ),
        subject.NO_LEVELS: (stack, given | {"boundary": layer(50.0)}),
        subject.UNSTEADY: (jet, given | {"boundary": layer(400.0)}),
        subject.WITHIN_ERROR: (
            stack,
            given | {"given_error": 3.0, "boundary": layer(1000.0)},
        ),
        subject.LIGHT: (stack, given | {"given_error": 8.0, "boundary": layer(1000.0)}),
    }


@pytest.mark.parametrize("word", list(reasons()))
def test_friction_velocity_is_withheld_for_a_reason(word):
    stack, more = reasons()[word]
    answer = ask(stack, **more)
    assert answer.friction_velocity_why[0] == word
    assert np.isnan(answer.friction_velocity[0])
    assert np.isnan(answer.friction_velocity_error[0])


def test_a_fit_alone_cannot_carry_most_of_the_integral():
    truth = spiral()
    fit = exact_fit(truth.geostrophic, 323.0, LATITUDE)
    answer = ask(truth.stack(Z[Z < 200.0], LATITUDE), fit)
    assert answer.chosen[0] == "fit"
    assert answer.friction_velocity_why[0] == subject.ENDS_BELOW


@pytest.mark.parametrize("latitude", [3.0, -3.0, np.nan])
def test_near_the_equator_it_declines(latitude):
    stack = Stack.of(height=Z, eastward_wind=5.0, northward_wind=1.0, latitude=latitude)
    answer = ask(stack, given=(8.0, 1.0), boundary=layer(900.0))
    why = earth.coriolis(stack).why[0]
    assert why
    assert answer.departure_why[0] == why
    assert answer.friction_velocity_why[0] == why
    assert answer.evidence_why[0, 2] == why
    assert np.isnan(answer.departure_across).all()
    assert np.isnan(answer.friction_velocity[0])
    assert answer.evidence_eastward[0, 0] == 8.0  # what the user gave is not taken away


def some_profiles(latitude: float = LATITUDE) -> tuple[Stack, EkmanFit, BoundaryLayer]:
    noise = synthetic.correlated_noise(np.random.default_rng(8), Z, 0.4, 80.0, profiles=6)
    wind = spiral(shear=0.001j).wind(Z) + noise
    z = np.tile(Z, (6, 1))
    for row in range(6):
        z[row, Z.size - 15 * row :] = np.nan
    wind[2, 5:8] = np.nan
    v = wind.imag if latitude > 0 else -wind.imag
    stack = Stack.of(height=z, eastward_wind=wind.real, northward_wind=v, latitude=latitude)
    return stack, ekman.fit(stack, earth.coriolis(stack), error=np.full(6, 0.4)), layer(1000.0, 6)


def test_hemispheres_mirror_exactly():
    north, south = (ask(*some_profiles(latitude)) for latitude in (LATITUDE, -LATITUDE))
    for name, label in labels(north).items():
        one, other = getattr(north, name), getattr(south, name)
        sign = -1.0 if name == "evidence_northward" else 1.0
        if label.unit:
            assert np.array_equal(one, sign * other, equal_nan=True), name
        else:
            assert one.tolist() == other.tolist(), name


def test_rotation_rotates_the_evidence_and_changes_no_scalar():
    truth, angle = spiral(shear=0.001j), np.exp(0.6j)
    before = truth.stack(Z, LATITUDE)
    wind = truth.wind(Z) * angle
    after = before.replace(eastward_wind=wind.real[None], northward_wind=wind.imag[None])
    one, other = (ask(stack, boundary=layer(1000.0)) for stack in (before, after))
    assert evidence(other, 2) == pytest.approx(evidence(one, 2) * angle)
    for name in ("departure_along", "departure_across", "friction_velocity", "evidence_error"):
        np.testing.assert_allclose(getattr(other, name), getattr(one, name), atol=1e-9)


def test_a_stack_gives_what_its_profiles_give_and_a_missing_level_changes_nothing():
    stack, fit, _layer = some_profiles()

    def alone(one: Stack, fit: EkmanFit) -> Any:
        count = one.profile_count
        return ask(one, fit, layer(1000.0, count), error=np.full(count, 0.4))

    together = alone(stack, fit)
    for row in range(6):
        single = stack.select(row)
        holed = Stack.of(
            height=np.insert(single.height, 3, np.nan, axis=1),
            eastward_wind=np.insert(single.eastward_wind, 3, 99.0, axis=1),
            northward_wind=np.insert(single.northward_wind, 3, 99.0, axis=1),
            latitude=single.latitude,
        )
        for name, label in labels(together).items():
            expected = getattr(together, name)[row]
            for answer in (alone(single, fit.select(row)), alone(holed, fit.select(row))):
                value = getattr(answer, name)[0]
                if "level" in label.dims:
                    value, wanted = value[np.isfinite(value)], expected[np.isfinite(expected)]
                    assert np.array_equal(value, wanted), name
                elif label.unit:
                    assert np.array_equal(value, expected, equal_nan=True), name
                else:
                    assert np.array_equal(value, expected), name


def test_numbers_withheld_have_a_reason():
    answer = ask(*some_profiles())
    no_u_star = np.isnan(answer.friction_velocity)
    assert (no_u_star == (answer.friction_velocity_why != "")).all()
    nothing = np.isnan(answer.departure_along).all(axis=1)
    assert (nothing <= (answer.departure_why != "")).all()
    missing = np.isnan(answer.evidence_eastward) & (answer.evidence_from != "")
    assert (answer.evidence_why[missing] != "").all()


@pytest.mark.parametrize("value", [0.0, np.inf, np.nan, 1e300, 5e-324])
def test_hostile_numbers_neither_warn_nor_raise(value):
    for count in (0, 1, 30):
        stack = Stack.of(
            1, height=Z[:count], eastward_wind=np.full(count, value), northward_wind=value,
            latitude=LATITUDE,
        )  # fmt: skip
        answer = ask(stack, given=(value, 1.0), boundary=layer(value), error=np.array([value]))
        assert answer.friction_velocity.shape == (1,)
    nobody = ask(Stack.of(0), layer(count=0) and no_fit(0), layer(count=0))
    assert nobody.chosen.shape == (0,)


def test_it_crosses_to_xarray():
    dataset = ask(*some_profiles()).to_xarray()
    assert dataset["departure_across"].dims == ("profile", "level")
    assert dataset["evidence_error"].attrs["units"] == "m s-1"
    assert dataset.attrs["reference_height"] == 0.0
