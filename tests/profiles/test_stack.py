"""Labels, units, shapes and round trips of the stack; not numbers."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles.flags import BIT, FLAGS, bits_concerning, names_of
from backveer.profiles.labels import labels
from backveer.profiles.stack import Stack, wind_components, wind_from_direction


def two_profiles() -> Stack:
    return Stack.of(
        height=[[10.0, 80.0, 300.0], [12.0, 95.0, np.nan]],
        eastward_wind=[[3.0, 5.0, 8.0], [-2.0, -4.0, np.nan]],
        northward_wind=[[4.0, 1.0, np.nan], [0.0, 2.5, np.nan]],
        air_temperature=[[288.0, 287.0, 285.0], [290.0, 289.5, np.nan]],
        latitude=[58.4, -33.0],
        time=np.array(["2031-05-14T23:15", "2031-05-15T11:00"], dtype="datetime64[ns]"),
        station=["Harrow Skerry", ""],
    )


def test_absent_variables_take_no_memory():
    stack = Stack.of(profiles=1000, height=np.arange(50.0), eastward_wind=np.ones((1000, 50)))
    assert stack.air_pressure.shape == (1000, 50)
    assert not any(stack.air_pressure.strides)
    assert stack.height.strides[0] == 0
    assert stack.has("eastward_wind")
    assert not stack.has("air_pressure")


def test_shapes_that_do_not_fit_are_named():
    with pytest.raises(ValueError, match=r"northward_wind has shape \(3,\), the stack \(2, 4\)"):
        Stack.of(eastward_wind=np.ones((2, 4)), northward_wind=np.ones(3))
    with pytest.raises(TypeError, match="no variable of a stack: wind"):
        Stack.of(wind=1.0)


def test_usable_leaves_out_what_a_flag_concerns():
    stack = two_profiles()
    flags = np.zeros((2, 3), dtype=np.uint32)
    flags[0, 1] = BIT["wind_spike"]
    flags[1, 0] = BIT["calm_without_direction"]
    stack = stack.replace(level_flag=flags)
    assert stack.usable("wind").tolist() == [[True, False, False], [True, True, False]]
    assert stack.usable("direction").tolist() == [[True, True, False], [False, True, False]]
    assert stack.usable("temperature").tolist() == [[True, True, True], [True, True, False]]


def test_flags_are_single_bits_of_their_own():
    bits = [flag.bit for flag in FLAGS]
    assert len(set(bits)) == len(bits)
    assert all(bit & (bit - 1) == 0 for bit in bits)
    assert names_of(BIT["wind_spike"] | BIT["below_ground"]) == ("wind_spike", "below_ground")
    assert bits_concerning("wind") & BIT["height_not_increasing"]


def test_to_xarray_and_back():
    stack = two_profiles()
    dataset = stack.to_xarray()
    assert dataset["eastward_wind"].attrs["standard_name"] == "eastward_wind"
    assert dataset["eastward_wind"].attrs["units"] == "m s-1"
    assert dataset.attrs["featureType"] == "profile"
    assert dataset["level_flag"].attrs["flag_meanings"].split()[0] == "wind_missing"
    back = Stack.from_xarray(dataset)
    for name in labels(Stack):
        np.testing.assert_array_equal(getattr(back, name), getattr(stack, name), err_msg=name)


def test_from_xarray_goes_by_standard_name_and_refuses_another_unit():
    dataset = two_profiles().to_xarray().rename(eastward_wind="u")
    assert Stack.from_xarray(dataset).has("eastward_wind")
    dataset["u"].attrs["units"] = "knot"
    with pytest.raises(ValueError, match="u is in 'knot', a stack holds 'm s-1'"):
        Stack.from_xarray(dataset)


def test_to_pandas_is_a_row_a_level():
    table = two_profiles().to_pandas()
    assert list(table.index.names) == ["profile", "level"]
    assert table.loc[(1, 1), "northward_wind"] == 2.5
    assert table.loc[(0, 2), "station"] == "Harrow Skerry"


def test_concatenate_pads_and_select_takes_out():
    stack = two_profiles()
    short = Stack.of(height=[[5.0]], eastward_wind=[[1.5]], station=["x"])
    joined = Stack.concatenate([stack, short])
    assert joined.profile_count == 3
    assert np.isnan(joined.eastward_wind[2]).tolist() == [False, True, True]
    assert not any(joined.dew_point_temperature.strides)
    again = joined.select(2)
    assert again.eastward_wind[0, 0] == 1.5
    assert again.station.tolist() == ["x"]
    assert Stack.concatenate([]).profile_count == 0


def test_wind_components_published():
    # Stull, Practical Meteorology, via checks W1 (seen in a transcription): u 3, v 4 m/s
    # is a wind of 5 m/s from 216.9 degrees.
    assert np.hypot(3.0, 4.0) == 5.0
    assert wind_from_direction(np.array(3.0), np.array(4.0)) == pytest.approx(216.9, abs=0.05)
    # MetPy 1.7.1 docstrings of wind_components (W5): 10 m/s from 225 degrees.
    u, v = wind_components(np.array(10.0), np.array(225.0))
    assert (u, v) == (pytest.approx(7.0710678, abs=5e-8), pytest.approx(7.0710678, abs=5e-8))


@given(st.floats(0.01, 100), st.floats(0, 360, exclude_max=True))
def test_direction_round_trip(speed, direction):
    u, v = wind_components(np.array(speed), np.array(direction))
    turned = (wind_from_direction(u, v) - direction + 180) % 360 - 180
    assert abs(turned) < 1e-9
    assert np.hypot(u, v) == pytest.approx(speed)


def test_calm_has_no_direction_and_its_components_are_zero():
    u, v = wind_components(np.array([0.0, 0.0]), np.array([np.nan, 0.0]))
    assert u.tolist() == [0.0, 0.0]
    assert v.tolist() == [0.0, 0.0]
    assert np.isnan(wind_from_direction(u, v)).all()


def test_opens_in_metpy_with_units():
    import metpy  # noqa: F401  (registers the accessor)

    dataset = two_profiles().to_xarray()
    quantified = dataset[["eastward_wind", "air_temperature"]].metpy.quantify()
    assert str(quantified["eastward_wind"].metpy.units) == "meter / second"
    knots = quantified["eastward_wind"].metpy.convert_units("knot")
    back = Stack.from_xarray(dataset.assign(eastward_wind=knots))
    np.testing.assert_allclose(back.eastward_wind, two_profiles().eastward_wind, rtol=1e-12)
