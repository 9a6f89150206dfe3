"""The printed tables over time carry the arrays' own numbers, their intervals and their gaps."""

from __future__ import annotations

import numpy as np

from backveer.io.words.climate_text import climate_text
from backveer.profiles.rotor import Turbine, rotor
from backveer.profiles.rotor_climate import Over, rotor_climate
from backveer.profiles.stack import Stack, wind_components

Z = np.array([40.0, 80.0, 120.0, 160.0])


def told(days: int, over: Over, joint: tuple[str, ...] = (), units: str = "si") -> tuple:
    random = np.random.default_rng(1)
    count = days * 24
    time = np.datetime64("2031-03-01", "ns") + np.arange(count) * np.timedelta64(3600, "s")
    veer = random.normal(8.0, 4.0, count)[:, np.newaxis]
    speed = 9.0 + random.normal(0.0, 2.0, count)[:, np.newaxis] + Z / 100.0
    u, v = wind_components(np.abs(speed), 250.0 + veer * (Z - 100.0) / 120.0)
    stack = Stack.of(height=Z, eastward_wind=u, northward_wind=v, time=time, elevation=0.0)
    found = rotor_climate(stack, rotor(stack, Turbine("A", 100.0, 110.0)), 0, over)
    return found, climate_text(found, joint, units=units)


def row(text: str, name: str) -> list[str]:
    rows = [line.split() for line in text.splitlines()]
    return next(cells for cells in rows if cells[:1] == [name] and cells[1].isdigit())


def test_the_numbers_are_those_of_the_tables() -> None:
    found, text = told(30, Over(by=("hour",), thresholds=(10.0, -2.0)))
    table = found.tables[1]
    assert "Veer (deg) by hour; recovery and shares in %" in text
    assert row(text, "07") == [
        "07", str(table.count[7]), "100", f"{table.mean[7]:.1f}",
        f"{table.percentile[7, 1]:.1f}", f"{table.median[7]:.1f}", f"{table.percentile[7, 7]:.1f}",
        f"{table.wind_weighted_mean[7]:.1f}", f"{table.energy_weighted_mean[7]:.1f}",
        f"{100 * table.beyond[7, 0]:.1f}", f"{100 * table.beyond[7, 1]:.1f}",
    ]  # fmt: skip
    assert list(table.percentile_at[[1, 7]]) == [5.0, 95.0]


def test_intervals_or_why_there_are_none() -> None:
    found, text = told(60, Over(confidence=0.9))
    table = found.tables[0]
    assert f"{table.mean_low[0]:.1f} to {table.mean_high[0]:.1f}" in text
    assert f"blocks of {table.block_days} day" in text
    _, short = told(5, Over(confidence=0.9))
    assert "no interval where there are too few days" in " ".join(short.split())
    assert "intervals by resampling" not in short


def test_units_and_decimals_follow_the_quantity() -> None:
    found, text = told(3, Over(quantity="hub_speed"), units="aviation")
    assert "Hub speed (kt) by all" in text
    assert row(text, "all")[3] == f"{found.tables[0].mean[0] * 3600 / 1852:.2f}"
    found, text = told(3, Over(quantity="veer_rate", thresholds=(0.1,)))
    assert "Veer rate (deg/100 m) by all" in text
    assert row(text, "all")[3] == f"{100 * found.tables[0].mean[0]:.1f}"
    assert "> 10" in text  # 0.1 degrees a metre


def test_what_stability_needs_is_said() -> None:
    _, text = told(3, Over(by=("stability",)))
    assert "no value: temperature and wind at two heights are needed" in text


def test_joint_tables_add_up() -> None:
    found, text = told(20, Over(by=("speed",)), joint=("speed", "hour"))
    assert "speed, m/s" in text
    hours = text[text.index("Veer (deg) and hour") :].splitlines()[2:]
    shares = [float(x) for line in hours for x in line.split()[1:-1] if x != "."]
    assert abs(sum(shares) - 100.0) < 5.0  # rounded to a tenth in some hundred cells
    assert sum(int(line.split()[-1]) for line in hours) == found.by_hour.count.sum()
