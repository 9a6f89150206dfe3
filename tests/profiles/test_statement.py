"""Properties of the whole statement: mirror, rotation, stack and single, gaps, hostile numbers."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import quality
from backveer.profiles.labels import labels
from backveer.profiles.stack import Stack
from backveer.profiles.statement import Settings, Statement, statement

# What changes its sign with the hemisphere, besides the northward parts.
TURNED = ("total", "layer_turning", "layer_rate", "coriolis_parameter", "rotation")
SENSES = {"veering": "backing", "backing": "veering"}


def sounding(
    seed: int, latitude: float = 50.0, levels: int = 60, temperature: bool = True
) -> Stack:
    rng = np.random.default_rng(seed)
    z = np.sort(rng.uniform(5, 3500, levels)) + np.arange(levels)
    delta = rng.uniform(120, 450)
    g = rng.uniform(5, 18) * np.exp(2j * np.pi * rng.random())
    shear = (rng.normal() + 1j * rng.normal()) * 1e-3
    w = g + shear * z - 0.8 * g * np.exp(-(1 + 1j) * z / delta)
    w = w + 0.4 * (rng.normal(size=levels) + 1j * rng.normal(size=levels))
    more = {}
    if temperature:
        more = {
            "air_temperature": [288 - 0.006 * z + 2 * np.tanh((z - 900) / 80)],
            "air_pressure": [101000 * np.exp(-z / 8300)],
            "dew_point_temperature": [281 - 0.007 * z],
        }
    sign = 1.0 if latitude >= 0 else -1.0
    return Stack.of(
        height=[z], eastward_wind=[w.real], northward_wind=[sign * w.imag], latitude=[latitude],
        longitude=[3.0], elevation=[12.0], time=np.array(["2031-05-14T18:00"], "datetime64[ns]"),
        **more,
    )  # fmt: skip


def said_of(stack: Stack, **settings: object) -> Statement:
    return statement(quality.check(stack), Settings(**settings))


def arrays(said: Statement) -> dict[str, np.ndarray]:
    return {
        f"{answer}.{name}": getattr(holder, name)
        for answer, holder in said.answers.items()
        for name in labels(holder)
    }


@pytest.mark.parametrize("seed", range(6))
@pytest.mark.parametrize("temperature", [True, False])
def test_mirroring_the_hemisphere_mirrors_every_answer_exactly(seed, temperature):
    north = arrays(said_of(sounding(seed, 50.0, temperature=temperature)))
    south = arrays(said_of(sounding(seed, -50.0, temperature=temperature)))
    for name, ours in north.items():
        theirs = south[name]
        field = name.split(".")[1]
        if field == "direction":  # d becomes 180 - d; continuous, so up to whole turns
            apart = (ours + theirs - 180.0) % 360.0
            np.testing.assert_allclose(np.minimum(apart, 360 - apart), 0, atol=1e-9, err_msg=name)
        elif field.endswith(("_low", "_high")) and "northward" in field:
            other = field.replace("_low", "_x").replace("_high", "_low").replace("_x", "_high")
            np.testing.assert_array_equal(ours, -south[f"{name.split('.')[0]}.{other}"], name)
        elif field in TURNED or ("northward" in field and not field.endswith("error")):
            np.testing.assert_array_equal(ours, -theirs, err_msg=name)
        elif field in ("sense", "layer_sense") and name.startswith("turning"):
            flipped = [SENSES.get(word, word) for word in theirs.ravel()]
            assert ours.ravel().tolist() == flipped, name
        else:
            np.testing.assert_array_equal(ours, theirs, err_msg=name)


@pytest.mark.parametrize("seed", range(4))
def test_rotating_the_wind_changes_no_scalar(seed):
    stack = sounding(seed)
    turned = (stack.eastward_wind + 1j * stack.northward_wind) * np.exp(1j * 1.234)
    other = stack.replace(eastward_wind=turned.real, northward_wind=turned.imag)
    ours, theirs = said_of(stack), said_of(other)
    for name in ("scale_height", "cross_isobar_angle", "friction_velocity", "rms"):
        np.testing.assert_allclose(
            getattr(ours.ekman, name), getattr(theirs.ekman, name), rtol=1e-5, err_msg=name
        )
    np.testing.assert_allclose(ours.turning.total, theirs.turning.total, atol=1e-6)
    np.testing.assert_allclose(
        ours.thermal_wind.layer_advection, theirs.thermal_wind.layer_advection, rtol=1e-4, atol=1e-9
    )
    np.testing.assert_array_equal(ours.ekman.verdict, theirs.ekman.verdict)
    g = (ours.ekman.geostrophic_eastward_wind + 1j * ours.ekman.geostrophic_northward_wind)[0]
    h = (theirs.ekman.geostrophic_eastward_wind + 1j * theirs.ekman.geostrophic_northward_wind)[0]
    if np.isfinite(g):
        assert h / g == pytest.approx(np.exp(1j * 1.234), rel=1e-5)


@given(st.lists(st.integers(0, 40), min_size=2, max_size=5), st.integers(5, 60))
def test_a_stack_is_its_profiles_bit_for_bit(seeds, levels):
    stacks = [
        sounding(seed, levels=levels + 7 * k, temperature=bool(seed % 2))
        for k, seed in enumerate(seeds)
    ]
    whole = said_of(Stack.concatenate(stacks))
    for row, stack in enumerate(stacks):
        alone = arrays(said_of(stack))
        for name, array in arrays(whole.select(row)).items():
            one = alone[name]
            if array.ndim == 2 and array.shape[1] != one.shape[1]:
                array = array[:, : one.shape[1]]  # padding of the longer neighbours
            np.testing.assert_array_equal(array, one, err_msg=name)


@pytest.mark.parametrize("seed", range(3))
def test_a_missing_level_changes_nothing(seed):
    stack = sounding(seed)
    place = 20
    height = stack.height.copy()
    longer = {
        name: np.insert(np.array(getattr(stack, name)), place, np.nan, axis=1)
        for name, label in labels(Stack).items()
        if label.dims == ("profile", "level") and name != "level_flag"
    }
    longer["height"] = np.insert(
        height, place, 0.5 * (height[:, place - 1] + height[:, place]), axis=1
    )
    shared = {n: getattr(stack, n) for n, v in labels(Stack).items() if v.dims == ("profile",)}
    ours, theirs = arrays(said_of(stack)), arrays(said_of(Stack.of(**longer, **shared)))
    for name, array in ours.items():
        other = theirs[name]
        if array.ndim == 2 and other.shape[1] == array.shape[1] + 1:
            other = np.delete(other, place, axis=1)
        np.testing.assert_array_equal(array, other, err_msg=name)


def test_the_order_of_profiles_is_nobody_s_business():
    stacks = [sounding(seed, latitude=(-1) ** seed * 50.0) for seed in range(5)]
    forth = said_of(Stack.concatenate(stacks))
    back = said_of(Stack.concatenate(stacks[::-1]))
    for name, array in arrays(forth).items():
        np.testing.assert_array_equal(array, arrays(back)[name][::-1], err_msg=name)


Z = np.linspace(10, 2000, 40)
HOSTILE = {
    "nothing": Stack.of(profiles=0),
    "no level": Stack.of(profiles=2),
    "one level": Stack.of(height=[[10.0]], eastward_wind=3.0, northward_wind=1.0, latitude=[50.0]),
    "two levels": Stack.of(
        height=[[10.0, 50.0]], eastward_wind=[[3.0, 4.0]], northward_wind=1.0, latitude=[50.0]
    ),
    "all missing": Stack.of(height=Z, eastward_wind=np.nan, latitude=[50.0]),
    "infinite": Stack.of(height=Z, eastward_wind=np.inf, northward_wind=1.0, latitude=[50.0]),
    "denormal": Stack.of(height=Z, eastward_wind=5e-324, northward_wind=5e-324, latitude=[50.0]),
    "huge": Stack.of(height=Z, eastward_wind=1e300, northward_wind=-1e300, latitude=[50.0]),
    "calm": Stack.of(height=Z, eastward_wind=0.0, northward_wind=0.0, latitude=[50.0]),
    "all equal": Stack.of(height=Z, eastward_wind=7.0, northward_wind=7.0, latitude=[50.0]),
    "one height": Stack.of(
        height=np.full(40, 10.0), eastward_wind=7.0, northward_wind=Z / 100, latitude=[50.0]
    ),
    "heights beyond": Stack.of(
        height=Z * 1e300, eastward_wind=7.0, northward_wind=Z / 100, latitude=[50.0]
    ),
    "pole": Stack.of(
        height=Z, eastward_wind=7.0, northward_wind=Z / 100, latitude=[90.0], longitude=[180.0]
    ),
    "beyond the pole": Stack.of(
        height=Z, eastward_wind=7.0, northward_wind=Z / 100, latitude=[91.0]
    ),
    "equator": Stack.of(height=Z, eastward_wind=7.0, northward_wind=Z / 100, latitude=[0.0]),
    "nowhere": Stack.of(height=Z, eastward_wind=7.0, northward_wind=Z / 100),
    "long ago": Stack.of(
        height=Z, eastward_wind=7.0, northward_wind=Z / 100, latitude=[50.0],
        time=np.array(["1678-01-01"], "datetime64[ns]"),
    ),
    "absurd air": Stack.of(
        height=Z, eastward_wind=7.0, northward_wind=Z / 100, latitude=[50.0],
        air_pressure=-1.0, air_temperature=0.0, dew_point_temperature=1e9,
    ),
}  # fmt: skip


@pytest.mark.parametrize("case", HOSTILE)
def test_hostile_numbers_give_a_reason_and_no_warning(case):
    said = said_of(HOSTILE[case])
    for row in range(said.stack.profile_count):
        fit = said.ekman
        assert fit.verdict[row] in ("well determined", "weakly determined", "not determined")
        if fit.verdict[row] == "not determined":
            assert fit.why[row]
            assert np.isnan(fit.scale_height[row])
        if not np.isfinite(said.turning.total[row]):
            assert said.turning.why[row]
        if not np.isfinite(said.geostrophic.friction_velocity[row]):
            assert said.geostrophic.friction_velocity_why[row]
        if not np.isfinite(said.boundary_layer.bulk_richardson_depth[row]):
            assert said.boundary_layer.depth_why[row]


def test_a_hundred_thousand_levels():
    z = np.linspace(5, 20000, 100_000)
    w = 12 * (1 - np.exp(-(1 + 1j) * z / 250))
    stack = Stack.of(height=z, eastward_wind=[w.real], northward_wind=[w.imag], latitude=[50.0])
    said = said_of(stack)
    assert said.ekman.scale_height[0] == pytest.approx(250, rel=0.05)


def test_answers_cross_to_xarray_and_pandas_with_units():
    said = said_of(Stack.concatenate([sounding(1), sounding(2)]), geostrophic_wind=(5.0, 3.0))
    for name, answer in said.answers.items():
        dataset = answer.to_xarray()
        for key, label in labels(answer).items():
            assert dataset[key].attrs["long_name"] == label.meaning, (name, key)
            if label.unit:
                assert dataset[key].attrs["units"] == label.unit
        for dimension in {v.dims[1] for v in labels(answer).values() if len(v.dims) == 2}:
            table = answer.to_pandas(dimension)
            assert list(table.index.names) == ["profile", dimension]
        assert len(answer.to_pandas("profile")) == 2


def test_settings_are_heeded():
    stack = sounding(3, latitude=8.0)
    assert said_of(stack).coriolis.applies[0]
    assert not said_of(stack, equator_limit=10.0).coriolis.applies[0]
    given_wind = said_of(stack, geostrophic_wind=(5.0, 3.0)).geostrophic
    assert given_wind.chosen[0] == "given"
    edges = said_of(stack, layer_edges=(0.0, 50.0, 150.0)).turning
    assert edges.layer_top[0, -1] <= 150.0
    assert said_of(stack, wind_error=1.5).wind_error[0] == 1.5
    small = said_of(stack, critical_richardson=0.1).boundary_layer.bulk_richardson_depth[0]
    large = said_of(stack, critical_richardson=1.0).boundary_layer.bulk_richardson_depth[0]
    assert not small >= large
    layers = said_of(stack, pressures=(95000.0, 80000.0)).thermal_wind
    assert layers.layer_base_pressure.shape[1] == 1
