"""A turbine over time: the tables are those of the single modules, by the clock asked for."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.profiles.classes import by_hour, by_sector, by_stability
from backveer.profiles.climatology import climate
from backveer.profiles.rotor import Turbine, rotor
from backveer.profiles.rotor_climate import Over, exceedance, rotor_climate
from backveer.profiles.stack import Stack, wind_components

Z = np.array([40.0, 80.0, 120.0, 160.0, 200.0])
TEN = np.timedelta64(600, "s")


def record(days: int = 20, station: object = "Harrow Skerry", **more: object) -> Stack:
    """Veer of 10 to 30 degrees by night and none by day, noise, some gaps."""
    random = np.random.default_rng(3)
    count = days * 144
    time = np.datetime64("2031-03-01", "ns") + np.arange(count) * TEN
    hour = (np.arange(count) / 6.0) % 24.0
    veer = np.where(hour < 6.0, 20.0, 1.0) + random.normal(0.0, 1.0, count)
    speed = 8.0 + random.normal(0.0, 1.0, count)[:, np.newaxis] + Z / 100.0
    direction = 250.0 + veer[:, np.newaxis] * (Z - 120.0) / 160.0
    u, v = wind_components(speed, direction)
    u[random.random(count) < 0.05] = np.nan
    return Stack.of(height=Z, eastward_wind=u, northward_wind=v, time=time, elevation=10.0,
                    station=station, **more)  # fmt: skip


TURBINES = [Turbine("A", 120.0, 120.0), Turbine("B", 120.0, 160.0)]


def test_the_tables_are_those_of_the_modules() -> None:
    stack = record()
    told = rotor(stack, TURBINES)
    found = rotor_climate(stack, told, 1, Over(by=("hour", "sector"), thresholds=(10.0, -5.0)))
    assert found.turbine == "B"
    assert [table.kind for table in found.tables] == ["all", "hour", "sector"]
    wanted = climate(
        told.veer[:, 1],
        by_hour(stack.time),
        speed=told.hub_speed[:, 1],
        density=told.air_density[:, 1],
        thresholds=(10.0, -5.0),
    )
    for name in ("mean", "median", "beyond", "energy_weighted_mean", "recovery"):
        np.testing.assert_array_equal(getattr(found.tables[1], name), getattr(wanted, name))
    assert found.tables[2].count.sum() == (by_sector(told.hub_direction[:, 1]).index >= 0).sum()
    assert [each.threshold for each in found.events] == [10.0, -5.0]
    assert found.by_hour.count.sum() == np.isfinite(told.veer[:, 1]).sum()
    assert found.unit == "degree"


def test_times_at_the_end_belong_to_the_interval_before() -> None:
    stack = record(2)
    told = rotor(stack, TURBINES)
    begin = rotor_climate(stack, told, 0, Over(by=("hour",)))
    end = rotor_climate(
        stack.replace(time=stack.time + TEN), told, 0, Over(by=("hour",), stamp="end")
    )
    np.testing.assert_array_equal(end.tables[1].mean, begin.tables[1].mean)
    np.testing.assert_array_equal(end.begins, begin.begins)


def test_the_clock_of_the_place() -> None:
    stack = record(3)
    told = rotor(stack, TURBINES)
    utc = rotor_climate(stack, told, 0, Over(by=("hour",))).tables[1].mean
    there = rotor_climate(stack, told, 0, Over(by=("hour",), utc_offset=2.0)).tables[1].mean
    np.testing.assert_allclose(there, np.roll(utc, 2), rtol=1e-12)


def test_intervals_only_where_asked_for() -> None:
    stack = record(40)
    told = rotor(stack, TURBINES)
    plain = rotor_climate(stack, told, 0, Over()).tables[0]
    asked = rotor_climate(stack, told, 0, Over(confidence=0.9)).tables[0]
    assert np.isnan(plain.mean_low).all()
    assert asked.mean_low[0] < asked.mean[0] < asked.mean_high[0]


def test_stations_that_interleave_have_no_events() -> None:
    one, other = record(1), record(1, station="Punta Escarcha")
    stack = Stack.concatenate([one, other])
    stack = stack.select(np.argsort(stack.time, kind="stable"))
    found = rotor_climate(stack, rotor(stack, TURBINES), 0, Over(thresholds=(5.0,)))
    assert found.events == ()
    assert found.tables[0].count[0] > 0


def test_stability_where_temperature_allows() -> None:
    stable = np.where(np.arange(144) < 72, 0.03, -0.012)[:, np.newaxis] * Z + 285.0
    stack = record(1, air_temperature=stable)
    told = rotor(stack, TURBINES)
    found = rotor_climate(stack, told, 0, Over(by=("stability",))).tables[1]
    names = dict(zip(found.group.tolist(), found.count.tolist(), strict=True))
    assert names["very stable"] + names["stable"] > 50
    assert names["very unstable"] + names["unstable"] > 50
    wanted = by_stability(stack, 90.0, 150.0)
    assert wanted.names == tuple(found.group.tolist())
    without = record(1)
    assert (rotor_climate(without, rotor(without, TURBINES), 0, Over(by=("stability",)))
            .tables[1].count == 0).all()  # fmt: skip


def test_shares_above() -> None:
    assert exceedance(np.array([np.nan]), [1.0, 2.0]) == pytest.approx([np.nan] * 2, nan_ok=True)
    assert exceedance(np.array([1.0, 5.0]), [0.0, 1.0, 5.0]).tolist() == [1.0, 0.5, 0.0]


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"quantity": "weather"}, "'weather' is none of veer"),
        ({"by": ("moon",)}, "'moon' is none of all, hour"),
        ({"stamp": "middle"}, "'begin' or the 'end', not 'middle'"),
    ],
)
def test_what_is_not_offered_is_refused(change, words) -> None:
    with pytest.raises(ValueError, match=words):
        Over(**change)
