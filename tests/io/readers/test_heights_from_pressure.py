"""Heights above ground, from heights, altitudes or pressure: only where they can be defended."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.io.readers.columns import understand
from backveer.io.readers.errors import Contradiction, MissingColumn
from backveer.io.readers.levels import Draft
from backveer.io.readers.reading import Hints
from backveer.io.readers.table import Table
from backveer.profiles.air import standard_atmosphere, standard_height
from backveer.profiles.earth import geopotential_height
from backveer.profiles.flags import BIT
from backveer.profiles.hydrostatics import hypsometric_pressure

HEIGHT = np.array([9.0, 63.0, 210.0, 480.0, 905.0, 1530.0, 2475.0])
SPEED = np.array([3.2, 5.1, 8.8, 10.7, 11.9, 11.2, 13.3])
DIRECTION = np.array([221.0, 226.0, 234.0, 241.0, 247.0, 251.0, 258.0])


def air(elevation: float, sea_level: float = 101325.0) -> tuple[np.ndarray, np.ndarray]:
    """Temperature and pressure of an ascent from a site, 7 K warmer than the standard day."""
    altitude = HEIGHT + elevation
    temperature = standard_atmosphere(geopotential_height(altitude))[0] + 7.0
    base = standard_atmosphere(geopotential_height(altitude[0]))[1] * sea_level / 101325.0
    return temperature, hypsometric_pressure(altitude, temperature, base_pressure=base)


def read(elevation: float | None = None, upper=slice(None), hints=None, **columns) -> Draft:
    columns = {"wspd (m/s)": SPEED, "wdir (deg)": DIRECTION, **columns}
    said = () if elevation is None else (("Elevation", f"{elevation:g} m"),)
    arrays = tuple(np.asarray(values, dtype=float)[upper] for values in columns.values())
    lines = np.arange(3, 3 + len(arrays[0]))
    table = Table(
        "up.csv", tuple(columns), (), arrays, lines, said, (), "utf-8", ",", "."
    )  # fmt: skip
    return understand(table, hints or Hints())


# --- a height that does not say what it is counted from -----------------------------------------


@pytest.mark.parametrize("sea_level", [99900.0, 101325.0, 102600.0])
@pytest.mark.parametrize("elevation", [520.0, 1240.0])
@pytest.mark.parametrize("name", ["height (m)", "z (m)", "HGHT (m)"])
def test_the_pressure_tells_above_sea_level_from_above_ground(name, elevation, sea_level):
    _, p = air(elevation, sea_level)
    for values, read_as in ((HEIGHT + elevation, "altitude"), (HEIGHT, "height")):
        draft = read(elevation, **{name: values, "pres (hPa)": p / 100.0})
        assert draft.columns[2].read_as == read_as
        np.testing.assert_allclose(draft.levels["height"][0], HEIGHT)
        np.testing.assert_allclose(draft.levels["altitude"][0], HEIGHT + elevation)


def test_what_nothing_tells_apart_is_refused_with_both_options():
    _, p = air(40.0)
    with pytest.raises(Contradiction, match="above ground or above sea level") as caught:
        read(40.0, **{"height (m)": HEIGHT + 47.0, "pres (hPa)": p / 100.0})
    assert '--column height="height (m)"' in caught.value.remedy
    assert '--column altitude="height (m)"' in caught.value.remedy


def test_the_user_settles_what_nothing_else_does():
    for quantity, expected in (("height", HEIGHT + 47.0), ("altitude", HEIGHT + 7.0)):
        draft = read(
            40.0, hints=Hints(columns={quantity: "height (m)"}), **{"height (m)": HEIGHT + 47.0}
        )
        np.testing.assert_allclose(draft.levels["height"][0], expected)


# --- pressure alone -----------------------------------------------------------------------------


def test_with_temperature_the_hypsometric_equation_gives_the_heights():
    t, p = air(52.0)
    draft = read(52.0, **{"p (hPa)": p / 100.0, "T (K)": t})
    np.testing.assert_allclose(draft.levels["height"][0], HEIGHT - HEIGHT[0], atol=0.5)
    assert draft.levels["height"][0, 0] == 0.0
    np.testing.assert_allclose(draft.levels["altitude"][0], HEIGHT - HEIGHT[0] + 52.0, atol=0.5)
    assert (draft.levels["level_flag"] == BIT["height_from_hypsometric_equation"]).all()
    assert any("hypsometric equation" in remark for remark in draft.remarks)


def test_without_temperature_the_standard_atmosphere_does_and_it_is_said():
    _, p = air(52.0)
    draft = read(52.0, **{"p (hPa)": p / 100.0})
    # 7 K of 280 K: the day's layers are 2.5 % deeper than the standard ones
    np.testing.assert_allclose(draft.levels["height"][0], HEIGHT - HEIGHT[0], rtol=0.035, atol=2.0)
    assert (draft.levels["level_flag"] == BIT["height_from_standard_atmosphere"]).all()
    assert any("standard atmosphere" in remark for remark in draft.remarks)


@pytest.mark.parametrize("temperature", [True, False])
def test_a_profile_that_begins_aloft_is_not_put_on_the_ground(temperature):
    t, p = air(52.0)
    columns = {"p (hPa)": p / 100.0} | ({"T (K)": t} if temperature else {})
    draft = read(52.0, upper=slice(5, None), **columns)
    # The lowest pressure level lies 1.5 km up; on a standard day with the weather's 300 m to spare.
    np.testing.assert_allclose(draft.levels["height"][0], HEIGHT[5:], atol=300.0)
    assert draft.levels["height"][0, 0] > 1000.0
    flags = draft.levels["level_flag"]
    assert (flags & BIT["height_from_standard_atmosphere"] != 0).all()
    assert any("not at the ground" in remark for remark in draft.remarks)


@pytest.mark.parametrize("lowest", [1000.0, 925.0, 850.0, 700.0])
def test_isobaric_levels_without_an_elevation_are_refused(lowest):
    p = lowest - np.array([0.0, 10.0, 30.0, 60.0, 100.0, 150.0, 220.0])
    with pytest.raises(MissingColumn, match="may not be the ground") as caught:
        read(**{"p (hPa)": p})
    assert "--elevation" in caught.value.remedy


def test_a_surface_pressure_is_the_ground_and_it_is_said():
    _, p = air(52.0)
    draft = read(**{"p (hPa)": p / 100.0})
    assert draft.levels["height"][0, 0] == 0.0
    assert "altitude" not in draft.levels
    assert any("lowest level was taken as the surface" in remark for remark in draft.remarks)


@pytest.mark.parametrize("name", ["FL", "Flight level", "level (FL)"])
def test_flight_levels_are_pressure_altitudes(name):
    levels = np.array([10.0, 20.0, 30.0, 50.0, 80.0, 100.0, 140.0])
    draft = read(150.0, **{name: levels})
    np.testing.assert_allclose(
        standard_height(draft.levels["air_pressure"][0]), levels * 30.48, rtol=1e-9
    )
    np.testing.assert_allclose(draft.levels["altitude"][0], levels * 30.48, rtol=1e-3)
    np.testing.assert_allclose(draft.levels["height"][0], levels * 30.48 - 150.0, atol=3.0)
    assert (draft.levels["level_flag"] & BIT["height_from_standard_atmosphere"] != 0).all()
    assert any("flight level" in remark for remark in draft.remarks)


def test_flight_levels_without_an_elevation_are_refused():
    with pytest.raises(MissingColumn, match="elevation of the site is not known") as caught:
        read(FL=np.arange(10.0, 80.0, 10.0))
    assert "--elevation" in caught.value.remedy


def test_an_altitude_without_an_elevation_is_refused():
    with pytest.raises(MissingColumn, match="elevation of the site is not known"):
        read(**{"Altitude MSL (m)": HEIGHT + 52.0})


# --- wind ---------------------------------------------------------------------------------------


def test_a_wind_that_is_missing_throughout_is_no_wind():
    with pytest.raises(MissingColumn, match="no wind"):
        read(**{"Height AGL (m)": HEIGHT, "wspd (m/s)": np.full(7, -999.0)})


def test_a_position_that_drifts_is_that_of_the_lowest_level_and_it_is_said():
    drift = np.linspace(0.0, 0.4, 7)
    draft = read(**{"Height AGL (m)": HEIGHT, "lat": 58.4 + drift, "lon": -3.1 + drift})
    np.testing.assert_allclose(draft.profile["latitude"], 58.4)
    np.testing.assert_allclose(draft.profile["longitude"], -3.1)
    assert any("drift" in remark for remark in draft.remarks)
