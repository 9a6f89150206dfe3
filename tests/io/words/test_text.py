"""The printed statement: 80 columns, no escapes, the same facts as the arrays, reasons said."""

from __future__ import annotations

import re

import numpy as np
import pytest

from backveer.io.readers.reading import ColumnReading, FileReading, Reading
from backveer.io.words.text import statement_text
from backveer.io.words.understood import reading_text
from backveer.io.words.units import AVIATION, SI, Unit, decimals, plainly, with_error
from backveer.profiles import quality
from backveer.profiles.stack import Stack
from backveer.profiles.statement import Settings, Statement, statement


def sounding(latitude: float = 55.0, **more: object) -> Stack:
    rng = np.random.default_rng(20310514)
    z = np.linspace(10, 4000, 120)
    w = (12 + 3j) * (1 - np.exp(-(1 + 1j) * z / 220)) + (0.001 - 0.0005j) * z
    w = w + 0.3 * (rng.normal(size=z.size) + 1j * rng.normal(size=z.size))
    sign = 1 if latitude >= 0 else -1
    variables: dict[str, object] = {
        "height": z,
        "eastward_wind": [w.real],
        "northward_wind": [sign * w.imag],
        "latitude": [latitude],
        "longitude": [-3.05],
        "elevation": [20.0],
        "air_temperature": 288 - 0.0065 * z,
        "air_pressure": 101325 * np.exp(-z / 8400),
        "station": ["Harrow Skerry"],
        "time": np.array(["2031-05-14T23:15"], dtype="datetime64[ns]"),
    }
    return quality.check(Stack.of(**(variables | more)))


@pytest.fixture(scope="module")
def said() -> Statement:
    return statement(sounding(), Settings(geostrophic_wind=(12.0, 3.0)))


def test_every_line_fits_and_nothing_moves_the_cursor(said):
    for units in ("si", "aviation"):
        text = statement_text(said, 0, units=units, sources=True)
        assert max(len(line) for line in text.splitlines()) <= 80
        assert not re.search(r"[\x00-\x09\x0b-\x1f\x7f]", text)


def test_the_facts_are_those_of_the_arrays(said):
    text = statement_text(said, 0)
    assert text.startswith("Harrow Skerry, 2031-05-14 23:15 UTC\n55.00 N, 3.05 W, 20 m above")
    assert f"f = {said.coriolis.coriolis_parameter[0]:+.3e} s-1" in text
    fit = said.ekman
    height = with_error(fit.scale_height[0], fit.scale_height_error[0], SI.height)
    assert f"scale height        {height} m" in text
    assert fit.model[0] in text
    assert fit.verdict[0] in text
    total = said.turning.total[0]
    assert f"turning, {total:+.0f}" in text or f"by {abs(total):.0f}" in text
    u_star = with_error(
        said.geostrophic.friction_velocity[0],
        said.geostrophic.friction_velocity_error[0],
        Unit("m/s", 1.0),
    )
    assert f"friction velocity {u_star} m/s" in text
    assert "given" in text
    assert "(used below)" in text
    assert "support and do not" in text


def test_aviation_units_are_converted(said):
    text = statement_text(said, 0, units="aviation")
    top_feet = plainly(said.turning.top[0], AVIATION.height)
    assert f"{top_feet} ft" in text
    assert "deg/1000 ft" in text
    assert " m/s" not in text.replace("velocity", "").split("friction")[0]


def test_the_tropics_decline_once_for_each_subject():
    text = statement_text(statement(sounding(latitude=2.0)), 0)
    assert text.count("within 5") == 4
    assert "Turning and strengthening" in text


def test_without_temperature_the_depth_says_why():
    stack = sounding(air_temperature=np.nan, air_pressure=np.nan)
    text = statement_text(statement(stack), 0)
    assert re.search(r"depth +not determined, because", text)


def test_nothing_at_all_still_speaks():
    text = statement_text(statement(quality.check(Stack.of(profiles=1))), 0)
    assert "not determined, because" in text
    assert "latitude not known" in text


def test_hostile_names_do_not_reach_the_terminal():
    stack = sounding(station=["Skerry\x1b[2J\u202eevil\n"])
    text = statement_text(statement(stack), 0)
    assert "\x1b" not in text
    assert "\u202e" not in text
    assert "Skerry?[2J?evil?" in text


def test_remarks_of_the_file_and_of_the_levels_are_told():
    u = sounding().eastward_wind.copy()
    u[0, 5] = np.nan
    stack = sounding(eastward_wind=u)
    file = FileReading("a.csv", stack, (), ("time taken as UTC",))
    text = statement_text(statement(stack), 0, reading=Reading((file,), ()))
    assert "  - time taken as UTC" in text
    assert "  - 1 of 120 levels has no wind" in text


def test_how_a_file_was_understood():
    columns = (
        ColumnReading("Wind speed (kt)", "wind_speed", "kt", "name and unit in the header"),
        ColumnReading("battery\x07", None, None, "no such quantity is known"),
    )
    text = reading_text(FileReading("a.csv", sounding(), columns, ("one thing",)))
    assert "Wind speed (kt)  wind_speed" in text
    assert "battery?         not used" in text
    assert "  - one thing" in text
    assert max(len(line) for line in text.splitlines()) <= 80


@pytest.mark.parametrize(
    ("value", "error", "expected"),
    [
        (9.96, 0.14, "9.96 ± 0.14"),
        (9.96, 0.3, "10.0 ± 0.3"),
        (123.4, 17.2, "123 ± 17"),
        (-0.01, 0.3, "0.0 ± 0.3"),
        (5.0, np.nan, "5.0"),
        (np.nan, 0.3, "not determined"),
    ],
)
def test_rounding_follows_the_error(value, error, expected):
    assert with_error(value, error, Unit("", 1.0)) == expected
    assert decimals(0.0) == 1


def test_a_file_without_a_station_is_named_once_and_every_line_fits():
    stack = sounding(station=[""], source=["folder/" + "x" * 60 + ".csv"])
    text = reading_text(FileReading("folder/a.csv", stack, (), ()))
    assert text.splitlines()[0] == "folder/a.csv"
    assert text.splitlines()[1].startswith("55.00 N, 3.05 W, 20 m above sea level, 2031-05-14")
    two = Stack.concatenate([stack, sounding(station=["Other"])])
    text = reading_text(FileReading("a.csv", two, (), ()))
    assert "and 1 more; 2 profiles, 2031-05-14 23:15 UTC to" in " ".join(text.split())
    assert max(len(line) for line in text.splitlines()) <= 80
