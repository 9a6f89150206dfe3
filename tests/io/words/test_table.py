"""Many profiles: the same facts as the arrays, a line each, and a summary that counts them all."""

from __future__ import annotations

import re
from typing import Any

import numpy as np
import pytest

from backveer.io.words.table import circular_mean, summary_text
from backveer.profiles import quality
from backveer.profiles.stack import Stack
from backveer.profiles.statement import Statement, statement


def several(**more: Any) -> Stack:
    """Three of a northern, a southern and a tropical place, and one without any wind."""
    random = np.random.default_rng(11)
    z = np.linspace(10.0, 4000.0, 100)
    wind = (12 + 3j) * (1 - 0.8 * np.exp(-(1 + 1j) * z / 300)) + 0.0005 * z
    noise = random.normal(size=(4, z.size)) + 1j * random.normal(size=(4, z.size))
    wind = wind + 0.2 * noise
    wind[1] = wind[1].conj()
    wind[3] = np.nan
    known: dict[str, Any] = {
        "height": z,
        "eastward_wind": wind.real,
        "northward_wind": wind.imag,
        "latitude": [55.0, -55.0, 2.0, 55.0],
        "station": ["Harrow Skerry", "Punta Escarcha", "Morvanne", "Morvanne"],
        "time": np.array(["2031-05-14T23:15", "2031-05-15T11:05", "NaT", "NaT"], "M8[ns]"),
    }
    return quality.check(Stack.of(**(known | more)))


@pytest.fixture(scope="module")
def said() -> Statement:
    return statement(several())


def test_each_profile_is_a_line_under_its_station(said):
    lines = summary_text(said).splitlines()
    assert max(len(line) for line in lines) <= 80
    assert lines[2] == "Harrow Skerry"
    assert lines[4] == "Punta Escarcha"
    assert lines[6] == "Morvanne"
    first = lines[3].split()
    fit = said.ekman
    assert first[:5] == ["1", "2031-05-14", "23:15", "100", "4000"]
    assert first[5:9] == [
        f"{said.turning.total[0]:+.0f}", "±", f"{said.turning.error[0]:.0f}", "veers"
    ]  # fmt: skip
    assert first[9:11] == ["well", f"{fit.cross_isobar_angle[0]:.0f}"]
    speed = np.hypot(fit.geostrophic_eastward_wind[0], fit.geostrophic_northward_wind[0])
    assert first[11].endswith(f"/{speed:.1f}")
    assert lines[5].split()[8] == "backs"
    assert lines[8].split() == ["4", "-", "0", "-", "-", "-", "not", "-", "-", "-"]


def test_the_summary_counts_every_profile(said):
    text = " ".join(summary_text(said).split())
    assert "4 profiles, 2031-05-14 23:15 UTC to 2031-05-15 11:05 UTC" in text
    assert "spiral: 2 well determined, 2 not determined" in text
    assert "1 times because the site lies within 5 degrees of the equator" in text
    assert "turning not determined: 1 times because fewer than two levels" in text
    assert re.search(r"turning from base to top: \d+ % veering, 33 % backing", text)
    assert "low-level jets: 0 of 4" in text


def test_aviation_units_are_converted(said):
    text = summary_text(said, units="aviation")
    first = text.splitlines()[3].split()
    assert first[4] == f"{4000 / 0.3048:.0f}"
    fit = said.ekman
    speed = np.hypot(fit.geostrophic_eastward_wind[0], fit.geostrophic_northward_wind[0])
    assert first[11].endswith(f"/{speed * 3600 / 1852:.1f}")
    assert " m/s" not in text


def test_reasons_that_differ_in_a_number_are_counted_as_one():
    stack = several()
    height = np.array(stack.height)
    height[:2, 12:] = np.nan  # between one and two scale heights remain
    height[1, 11] = np.nan
    text = " ".join(summary_text(statement(quality.check(stack.replace(height=height)))).split())
    assert re.search(r"2 times because the profile ends at \d\.\d to \d\.\d scale heights", text)


def test_names_of_stations_do_not_reach_the_terminal():
    names = ["Skerry\x1b[2J", "\u202eevil", "x" * 300, "plain\nline"]
    text = summary_text(statement(several(station=names)))
    assert not re.search(r"[\x00-\x09\x0b-\x1f\x7f\u202e]", text)
    assert "Skerry?[2J" in text
    assert max(len(line) for line in text.splitlines()) <= 80


def test_no_profile_is_no_error():
    text = summary_text(statement(Stack.of(profiles=0)))
    assert "0 profiles" in text


def test_the_angle_that_no_slip_imposes_stands_in_brackets():
    z = np.linspace(10.0, 2000.0, 60)
    wind = 10 * (1 - np.exp(-(1 + 1j) * z / 250))
    random = np.random.default_rng(3)
    noise = 0.1 * (random.normal(size=(2, 60)) + 1j * random.normal(size=(2, 60)))
    stack = Stack.of(
        height=z, eastward_wind=wind.real + noise.real, northward_wind=wind.imag + noise.imag,
        latitude=[55.0, 56.0],
    )  # fmt: skip
    told = statement(quality.check(stack))
    assert set(told.ekman.model) == {"no slip"}
    text = summary_text(told)
    assert " (45) " in text
    assert "cross-isobar angle" not in text.split("profiles", 1)[1]


def test_circular_mean_goes_through_north():
    mean, constancy = circular_mean(np.array([350.0, 30.0, np.nan]))
    assert mean == pytest.approx(10.0)
    assert constancy == pytest.approx(np.cos(np.radians(20.0)))
    assert np.isnan(circular_mean(np.array([90.0, 270.0]))[0])
    assert np.isnan(circular_mean(np.array([np.nan]))[0])
