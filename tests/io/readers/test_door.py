"""From names to checked profiles: samples, the contract, many files, our own CSV."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import backveer.io
from backveer.io import readers
from backveer.io.readers import Hints, door, read
from backveer.io.readers.errors import NotFound, UnknownUnit
from backveer.profiles.flags import BIT
from backveer.profiles.quality import check
from backveer.profiles.stack import Stack

SAMPLES = Path(__file__).parents[3] / "sample_soundings"

# What the samples' own README says of each: profiles, levels, latitude, first height [m].
EXPECTED = {
    "harrow_skerry_ekman.csv": (1, 500, 58.41, 10.0),
    "harrow_skerry_lidar_week.csv": (952, 12, 58.44, 40.0),
    "harrow_skerry_night_jet.txt": (1, 210, 58.41, 33 * 0.3048),
    "harrow_skerry_pilot_balloon.txt": (1, 30, 58.41, 75.0),
    "harrow_skerry_warm.tsv": (1, 130, 58.41, 10.0),
    "morvanne_tropiques.csv.gz": (1, 140, 3.2, 0.0),
    "punta_escarcha_calido.csv": (1, 160, -47.9, 10.0),
    "punta_escarcha_tower.csv": (6, 7, -47.88, 10.0),
}


def same(a: Stack, b: Stack) -> None:
    for name, values in vars(a).items():
        np.testing.assert_array_equal(values, getattr(b, name), err_msg=name)


@pytest.mark.parametrize("name", EXPECTED)
def test_every_sample_reads_well(name):
    (file,) = read(SAMPLES / name).files
    profiles, levels, latitude, first = EXPECTED[name]
    stack = file.stack
    assert (stack.profile_count, stack.level_count) == (profiles, levels)
    assert stack.latitude[0] == latitude
    assert stack.height[0, 0] == pytest.approx(first)
    assert all(column.read_as for column in file.columns)
    assert np.isfinite(stack.elevation).all()
    assert not np.isnat(stack.time).any()
    good = stack.usable("wind")
    assert np.count_nonzero(good) > 0.6 * good.size
    assert not (stack.level_flag & BIT["wind_outside_limits"]).any()


def test_longitudes_of_the_samples_are_all_west():
    stack = read(str(SAMPLES / "*.*")).stack
    named = [name for name in EXPECTED if stack.has("longitude")]
    assert named
    assert (stack.longitude[np.isfinite(stack.longitude)] < 0).all()


EXAMPLE = """# Station: Harrow Skerry
# Latitude: 58.41 N
# Longitude: 3.05 W
# Elevation: 52 m
# Launch: 2031-05-14 23:15 UTC
Altitude MSL (m),Pressure (hPa),Temp (C),Dew point (C),Wind speed (kt),Wind dir (deg)
64,1003.2,11.4,8.1,9.9,231
152,992.7,11.0,7.6,17.3,238
331,971.6,9.6,6.4,22.5,244
610,939.6,7.7,4.9,25.3,251
948,901.9,5.2,3.0,24.9,256
1390,854.4,2.9,-3.5,,
"""


@pytest.fixture
def example(tmp_path):
    path = tmp_path / "example.csv"
    path.write_text(EXAMPLE)
    return path


def test_the_contract(example):
    """The project's contract for ``read --json``, copied number by number."""
    run = subprocess.run(
        [sys.executable, "-c", "from backveer.io.command import main; main()", "read", "--json",
         str(example)],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    (profile,) = json.loads(run.stdout)["profiles"]
    levels = profile.pop("levels")
    assert levels.pop("level_flag") == [0, 0, 0, 0, 0, BIT["wind_missing"]]
    assert levels == {
        "height": [12.0, 100.0, 279.0, 558.0, 896.0, 1338.0],
        "altitude": [64.0, 152.0, 331.0, 610.0, 948.0, 1390.0],
        "air_pressure": [100320.0, 99270.0, 97160.0, 93960.0, 90190.0, 85440.0],
        "air_temperature": [284.55, 284.15, 282.75, 280.85, 278.35, 276.05],
        "dew_point_temperature": [281.25, 280.75, 279.55, 278.05, 276.15, 269.65],
        "eastward_wind": [3.958, 7.5475, 10.4035, 12.3063, 12.4292, None],
        "northward_wind": [3.2051, 4.7162, 5.0741, 4.2374, 3.0989, None],
    }
    columns = profile.pop("columns")
    assert [(c["column"], c["read_as"], c["unit"]) for c in columns] == [
        ("Altitude MSL (m)", "altitude", "m"),
        ("Pressure (hPa)", "air_pressure", "hPa"),
        ("Temp (C)", "air_temperature", "degC"),
        ("Dew point (C)", "dew_point_temperature", "degC"),
        ("Wind speed (kt)", "wind_speed", "kt"),
        ("Wind dir (deg)", "wind_from_direction", "deg"),
    ]
    assert {c["why"] for c in columns} == {"name and unit in the header"}
    assert profile == {
        "source": str(example),
        "station": "Harrow Skerry",
        "time": "2031-05-14T23:15:00Z",
        "latitude": 58.41,
        "longitude": -3.05,
        "elevation": 52.0,
        "remarks": ["1 of 6 levels has no wind"],
    }


def test_a_failure_stops_no_other(example):
    lone = example.with_name("lone.csv")
    lone.write_text("Height AGL (m),Speed,Dir (deg)\n10,3,200\n50,5,210\n")
    reading = read([example, lone, example.with_name("none.csv")])
    assert [file.source for file in reading.files] == [str(example)]
    assert [type(failure) for failure in reading.failures] == [UnknownUnit, NotFound]
    assert str(reading.failures[0]).startswith(f"{lone}: the unit of column")
    assert len(read(lone, Hints(units={"Speed": "kt"})).files) == 1


def test_many_files_at_once_are_each_read_as_alone(tmp_path, example, monkeypatch):
    names = [example, *(SAMPLES / name for name in EXPECTED if "week" not in name)]
    together = read(names)
    monkeypatch.setattr(door, "_BATCH", 1)
    alone = read(names)
    assert len(together.files) == len(names)
    for a, b in zip(together.files, alone.files, strict=True):
        assert (a.source, a.columns, a.remarks) == (b.source, b.columns, b.remarks)
        same(a.stack, b.stack)


def test_every_stack_is_checked(example):
    (file,) = read(example).files
    same(file.stack, check(file.stack))
    assert file.stack.level_flag[0, -1] == BIT["wind_missing"]


@pytest.mark.parametrize("place", ["ekman", "week", "morvanne", "tower"])
def test_our_own_csv_reads_back(tmp_path, place):
    from backveer.io.store import write_stack

    name = next(name for name in EXPECTED if place in name)
    (before,) = read(SAMPLES / name).files
    write_stack(before.stack, str(tmp_path / "out.csv"))
    (after,) = read(tmp_path / "out.csv").files
    # Profiles without any value (a power cut) hold no row in a long table.
    kept = np.isfinite(before.stack.eastward_wind).any(axis=1) | np.isfinite(
        before.stack.height
    ).any(axis=1)
    assert after.stack.profile_count == np.count_nonzero(kept)
    for field in vars(before.stack):
        ours, theirs = getattr(before.stack, field)[kept], getattr(after.stack, field)
        if ours.dtype.kind == "f":
            np.testing.assert_allclose(theirs, ours, rtol=1e-9, atol=1e-9, err_msg=field)
        else:
            np.testing.assert_array_equal(theirs, ours, err_msg=field)


def test_several_blocks_in_one_file(tmp_path):
    text = EXAMPLE + "\n" + EXAMPLE.replace("23:15", "11:15").replace("231", "131")
    path = tmp_path / "two.csv"
    path.write_text(text)
    (file,) = read(path).files
    assert file.stack.time.astype("datetime64[h]").astype(str).tolist() == [
        "2031-05-14T23",
        "2031-05-14T11",
    ]
    assert len(file.columns) == 6


def test_the_doors_are_one_and_light():
    assert backveer.io.read is readers.read is door.read
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        backveer.io.nothing  # noqa: B018
    code = "import sys, backveer.io, backveer.io.readers; print('numpy' in sys.modules)"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == "False"


def test_reading_imports_neither_pandas_nor_scipy(example):
    code = (
        "import sys, backveer.io; backveer.io.read(sys.argv[1]);"
        "print([m for m in ('pandas', 'scipy', 'xarray', 'pyarrow') if m in sys.modules])"
    )
    run = subprocess.run(
        [sys.executable, "-c", code, str(example)], capture_output=True, text=True, check=True
    )
    assert run.stdout.strip() == "[]"


def test_a_year_of_wide_rows_is_one_stack(tmp_path):
    heights = [40, 80, 120]
    start = np.datetime64("2031-01-01T00:00")
    count = 52560
    rng = np.random.default_rng(3)
    speed = rng.uniform(3, 15, (count, 3)).round(2)
    direction = rng.uniform(0, 360, (count, 3)).round(1)
    cells = np.stack([speed, direction], axis=2).reshape(count, 6)
    times = (start + 10 * np.arange(count)).astype(str)
    header = ",".join(f"ws_{z} (m/s),wd_{z} (deg)" for z in heights)
    rows = "\n".join(
        f"{t},{','.join(map(str, row))}" for t, row in zip(times, cells.tolist(), strict=True)
    )
    path = tmp_path / "year.csv"
    path.write_text(f"time_utc,{header}\n{rows}\n")
    (file,) = read(path).files
    assert file.stack.profile_count == count
    assert (file.stack.time == start + 10 * np.arange(count)).all()
    np.testing.assert_allclose(file.stack.wind_speed, speed, rtol=1e-12)
