"""`backveer rotor`: whole outputs, exit status, files with their run, and what is refused."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pandas
import pytest
import xarray
from pyarrow import parquet

from backveer.io.command import main
from backveer.io.readers import read
from backveer.profiles.rotor import Turbine, rotor
from backveer.profiles.stack import wind_components
from backveer.profiles.wind_error import wind_error

SAMPLES = Path(__file__).parents[3] / "sample_soundings"
LIDAR = str(SAMPLES / "harrow_skerry_lidar_week.csv")
SIZE = ("--hub-height", "119", "--rotor-diameter", "100")
HEADER = ",".join(
    ["time_utc", *(f"{k}_{z} ({u})" for z in (60, 100, 140, 180)
                   for k, u in (("ws", "m/s"), ("wd", "deg")))]
)  # fmt: skip
GOOD = "7.0,250,8.0,254,8.8,258,9.4,262"
CAUTION = "Caution: Not a guarantee of load or energy. The standards' own procedures and\n"

MANY = """\
Harrow Skerry, 58.40 N, 31 m above sea level
6 profiles from 2031-05-14 00:00 UTC to 2031-05-14 00:50 UTC, every 10 min;
100.0 % of a complete record
Times stand at the end of their interval (--stamp); hours, months and seasons go
by its beginning, in UTC
the numbers in the names of the columns were taken as heights above ground in m

turbine: hub 119 m, rotor 100 m, from 69 to 169 m
                          unit       count  recovery    mean     5 %  median    95 %
  hub speed               m/s            5    83.3 %    8.18    7.58    8.38    8.38
  veer                    deg            5    83.3 %    15.0    10.0    10.0    30.0
    lower half            deg            5    83.3 %     7.5     5.0     5.0    15.0
    upper half            deg            5    83.3 %     7.5     5.0     5.0    15.0
    steepest rate         deg/100 m      5    83.3 %    15.0    10.0    10.0    30.0
  equivalent / hub speed                 5    83.3 %  1.0000  0.9999  0.9999  1.0003
  energy flux ratio                      5    83.3 %   1.000   1.000   1.000   1.001
    with veer                            5    83.3 %   0.991   0.973   0.997   0.997
  air density             kg/m3          6   100.0 %   1.207   1.207   1.207   1.207

  A jet nose inside the rotor in 0 of 6 profiles.
  Air density in 6: standard atmosphere at the site's elevation.
  Notes, and in how many profiles:
  5  fewer than three levels with wind inside the rotor for a shear exponent
  1  no level has a valid wind

Veer (deg) by all; recovery and shares in %
  all  count  recov.  mean   5 %  median  95 %  wind-w.  energy-w.  > 20  < -5
  all      5      83  15.0  10.0    10.0  30.0     14.5       13.6  20.0   0.0
  hub direction, averaged as vectors: 259 deg, 259 deg weighted with the wind,
  steadiness 1.00 (5 values, recovery 83 %)

Veer (deg) by hour; recovery and shares in %
  hour  count  recov.  mean   5 %  median  95 %  wind-w.  energy-w.  > 20  < -5
  00        4      80  16.2  10.0    10.0  31.2     15.7       14.6  25.0   0.0
  23        1     100  10.0  10.0    10.0  10.0     10.0       10.0   0.0   0.0
  22 without a value left out

How long veer stays above 20 deg
  1 time, median 10 min, 95 % up to 10 min, longest 10 min; 1 of them touch a
  gap or an end of the record and may have lasted longer (data recovery 83.3 %)

How long veer stays below -5 deg
  never (data recovery 83.3 %)

Veer (deg) and hour: per cent of 5 profiles (data recovery 83.3 %)
  hour  < -10  -10 to -5  -5 to 0  0 to 5  5 to 10  10 to 20  20 to 40  >= 40  count
  00        .          .        .       .     60.0         .      20.0      .      4
  23        .          .        .       .     20.0         .         .      .      1

The full answer of one profile: --profile N.

"""


@pytest.fixture
def lidar(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., str]:
    """Write rows of a lidar of four gates; the folder is the working one."""
    monkeypatch.chdir(tmp_path)

    def write(
        winds: str | list[str] = GOOD,
        name: str = "lidar.csv",
        begin: str = "2031-05-14T00:00",
        minutes: float = 10,
        count: int = 1,
        header: str = HEADER,
        place: str = "# Station: Harrow Skerry\n# Latitude: 58.4\n# Elevation: 31 m\n",
        times: list[str] | None = None,
    ) -> str:
        start = datetime.fromisoformat(begin)
        stamps = times or [
            (start + timedelta(minutes=minutes * i)).strftime("%Y-%m-%d %H:%M:%S")
            for i in range(count)
        ]
        rows = [winds] * len(stamps) if isinstance(winds, str) else winds
        text = place + header + "\n"
        text += "".join(f"{t},{row}\n" for t, row in zip(stamps, rows, strict=True))
        Path(name).write_text(text)
        return name

    return write


def run(capsys: Any, *words: str) -> tuple[int, str, str]:
    status = main(["rotor", *words])
    captured = capsys.readouterr()
    return status, captured.out, captured.err


def test_one_profile_whole(capsys, lidar) -> None:
    name = lidar("7.0,250,8.0,254,8.8,258,9.4,262")
    status, out, err = run(capsys, name, *SIZE, "--wind-error", "0.1")
    assert (status, err) == (0, "")
    before, _, after = out.partition("backveer 0.1.0, inputs ")
    assert after[12:] == "\n" + CAUTION + "licensed practice decide.\n"
    assert (
        before
        == """\
Harrow Skerry, 2031-05-14 00:00 UTC
58.40 N, 31 m above sea level

turbine: hub 119 m, rotor 100 m, from 69 to 169 m
  wind at the hub      8.38 m/s from 256 deg
  covered              100 % of the rotor, from 69 to 169 m
  veer                 +10.0 ± 1.0 deg (+10.0 deg/100 m), veering
    lower, upper half  +5.0, +5.0 deg
    steepest inside    +10.0 deg/100 m
  shear exponent       by regression not determined, between the ends 0.27 (the
                       standards' normal profiles have 0.20 on land and 0.14 at
                       sea: for information)
  roughness length     not determined, because fewer than three covered levels
                       with wind inside the rotor
  equivalent speed     8.38 m/s, with veer 8.37 (exact); 8.38, 8.37 by 5
                       segments
    over hub speed     0.9999; flux of kinetic energy 1.000, with veer 0.997
  air density          1.207 kg/m3, from standard atmosphere at the site's
                       elevation; hub speed at 1.225 kg/m3 8.34 m/s
  note                 fewer than three levels with wind inside the rotor for a
                       shear exponent

  Beside a neutral layer over even ground (drag law and Ekman family)
    expected veer  not determined, because no roughness length is given and none
                   can be fitted to the profile

Remarks
  - the numbers in the names of the columns were taken as heights above ground
    in m

"""
    )


def test_the_comparison_names_what_it_rests_on(capsys, lidar) -> None:
    words = (lidar(), *SIZE, "--roughness", "0.03", "--geostrophic", "262/12")
    status, out, _ = run(capsys, *words)
    said = " ".join(out.split())
    assert status == 0
    assert "geostrophic wind 12.0 m/s (given), roughness length 0.03 m (given)" in said
    assert "a place to look, no verdict" in said
    _, out, _ = run(capsys, *words, "--json")
    told = json.loads(out)["profiles"][0]["rotors"][0]
    beside = told["expected_veer"]
    assert beside["anomaly"] == pytest.approx(told["veer"] - beside["expected"], abs=1e-4)
    assert 0 < beside["expected"] < 10


def test_aviation_units(capsys, lidar) -> None:
    _, out, _ = run(capsys, lidar(), *SIZE, "--units", "aviation")
    assert "hub 390 ft, rotor 328 ft, from 226 to 554 ft" in out
    assert "16.29 kt from 256 deg" in out
    assert "+30.5 deg/1000 ft" in out


def test_many_profiles_whole(capsys, lidar) -> None:
    rows = [GOOD, "6.0,250,7.0,264,7.8,278,8.4,292", ",,,,,,,", GOOD, GOOD, GOOD]
    name = lidar(rows, count=6)
    words = ("--stamp", "end", "--by", "hour", "--thresholds", "20,-5", "--joint", "hour")
    status, out, err = run(capsys, name, *SIZE, *words)
    assert (status, err) == (0, "")
    before, _, after = out.partition("backveer 0.1.0, inputs ")
    assert after[12:] == "\n" + CAUTION + "licensed practice decide.\n"
    # The first profile ends at midnight: its interval lies in the hour before.
    assert before == MANY


def test_the_sample_week_agrees_with_the_library(capsys) -> None:
    words = (LIDAR, "--hub-height", "119", "--rotor-diameter", "171", "--stamp", "end")
    status, out, err = run(capsys, *words, "--by", "season", "--json")
    assert (status, err) == (0, "")
    told = json.loads(out)
    stack = read(LIDAR).stack
    wanted = rotor(stack, Turbine("turbine", 119.0, 171.0), error=wind_error(stack))
    for name in ("veer", "veer_error", "shear_exponent", "energy_flux_ratio_with_veer"):
        found = [profile["rotors"][0][name] for profile in told["profiles"]]
        np.testing.assert_allclose(
            np.array(found, dtype=float), getattr(wanted, name)[:, 0], rtol=1e-5
        )
    table = told["climate"][0]["tables"][0]
    assert table["by"] == "all"
    assert table["mean"] == [pytest.approx(np.nanmean(wanted.veer), rel=1e-5)]
    assert table["expected"] == [1008]
    season = told["climate"][0]["tables"][1]
    assert season["group"] == ["DJF", "MAM", "JJA", "SON"]
    assert season["why"] == ["no value in this class"] * 3 + [
        "no confidence intervals were asked for"
    ]
    assert told["run"]["options"]["stamp"] == "end"
    assert told["run"]["inputs"][0]["of"] == "bytes"
    assert "guarantee" in told["caution"]


def test_the_keys_of_the_contract(capsys, lidar) -> None:
    _, out, _ = run(capsys, lidar(), *SIZE, "--json")
    told = json.loads(out)["profiles"][0]["rotors"][0]
    assert set(told) >= {
        "turbine", "hub_height", "rotor_diameter", "hub_speed", "hub_direction", "veer",
        "veer_rate", "steepest_veer_rate", "veer_upper_half", "veer_lower_half",
        "shear_exponent", "equivalent_speed", "equivalent_speed_with_veer", "energy_flux_ratio",
        "air_density", "coverage", "why", "roughness_why", "air_density_from",
    }  # fmt: skip
    assert told["shear_exponent"] is None
    assert told["why"]


@pytest.mark.parametrize(
    ("size", "winds", "words"),
    [
        (("50", "60"), GOOD, "the hub lies below the lowest valid level"),
        (("119", "250"), GOOD, "the rotor reaches below the ground"),
        (("160", "160"), GOOD, "the upper tip lies above the highest valid level"),
        (("250", "100"), GOOD, "the hub lies above the highest valid level"),
        (("119", "100"), "0,0,0,0,0,0,0,0", "it is calm at hub height"),
        (("119", "100"), "7.0,250,8.0,,8.8,258,9.4,262",
         "the levels around hub height are too far apart"),
        (("119", "100"), "7.0,250,8.0,20,8.8,170,9.4,262",
         "the direction turns by more than 120 degrees between neighbouring levels"),
    ],
)  # fmt: skip
def test_bad_profiles_say_a_word_and_invent_nothing(capsys, lidar, size, winds, words) -> None:
    sizes = ("--hub-height", size[0], "--rotor-diameter", size[1])
    status, out, err = run(capsys, lidar(winds), *sizes)
    assert (status, err) == (0, "")
    assert words in " ".join(out.split())
    _, out, _ = run(capsys, lidar(winds), *sizes, "--json")
    told = json.loads(out)["profiles"][0]["rotors"][0]
    assert words in told["why"]
    assert told["veer"] is None
    assert told["equivalent_speed_with_veer"] is None


def test_a_gate_without_direction_is_remarked(capsys, lidar) -> None:
    _, out, _ = run(capsys, lidar("7.0,250,8.0,,8.8,258,9.4,262"), *SIZE)
    assert "1 of 4 levels has no wind" in out


def test_heights_in_feet_are_refused_or_converted(capsys, lidar) -> None:
    status, out, err = run(capsys, lidar(), "--hub-height", "390", "--rotor-diameter", "100")
    assert (status, out) == (2, "")
    assert err == (
        "backveer: turbine 'turbine': a hub height of 390 m is larger than any built. Give metres: "
        "390 ft are 118.9 m. See backveer rotor --help.\n"
    )
    feet = HEADER
    for metre, foot in ((60, "197ft"), (100, "328ft"), (140, "459ft"), (180, "591ft")):
        feet = feet.replace(f"_{metre} ", f"_{foot} ")
    _, out, _ = run(capsys, lidar(header=feet), *SIZE, "--json")
    assert json.loads(out)["profiles"][0]["levels"]["height"] == pytest.approx(
        [60, 100, 140, 180], abs=0.2
    )


@pytest.mark.parametrize(
    ("words", "said"),
    [
        ((), "what turbine? Give --hub-height and --rotor-diameter in m, or --turbines FILE.toml"),
        (("--hub-height", "119"), "what turbine?"),
        ((*SIZE, "--turbines", "t.toml"), "not both"),
        ((*SIZE, "--quantity", "weather"), "'weather' is none of veer,"),
        ((*SIZE, "--thresholds", "5,x"), "'5,x' is not a list of numbers"),
        ((*SIZE, "--interval", "7"), "averages over 7 min do not fill a day"),
        ((*SIZE, "--profile", "9"), "there are only 1 profiles"),
        ((*SIZE, "--to", "out.xls"), "no format is known by that name. End it in .nc"),
        ((*SIZE, "--figure", "out.gif"), "no format is known by that name. End it in .svg"),
        ((*SIZE, "--to", "nowhere/out.csv"), "the folder nowhere does not exist"),
        ((*SIZE, "--geostrophic", "west"), "is not DIRECTION/SPEED"),
        (("--hub-height", "-5", "--rotor-diameter", "9"), "hub height must be a positive number"),
    ],
)
def test_wrong_calls_are_one_line_and_status_2(capsys, lidar, words, said) -> None:
    Path("t.toml").write_text('[[turbine]]\nname = "A"\nhub_height = 90\nrotor_diameter = 100\n')
    status, _, err = run(capsys, lidar(), *words)
    assert status == 2
    assert said in err
    assert err.count("\n") == 1


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("[[turbine", "not a TOML file"),
        ("x = 1", "holds no turbines"),
        ('[[turbine]]\nname = "A"', "turbine 1 must have name, hub_height and rotor_diameter"),
        ('[[turbine]]\nname = "A"\nhub_height = "9"\nrotor_diameter = 5', "must be a text"),
        ('[[turbine]]\nname = "A"\nhub_height = 900\nrotor_diameter = 5', "larger than any built"),
        (2 * '[[turbine]]\nname = "A"\nhub_height = 90\nrotor_diameter = 50\n', "the same name"),
    ],
)
def test_turbine_files_that_cannot_be_used(capsys, lidar, text, said) -> None:
    Path("bad.toml").write_text(text)
    status, _, err = run(capsys, lidar(), "--turbines", "bad.toml")
    assert status == 2
    assert said in err


def test_several_turbines_and_inputs_that_fail(capsys, lidar) -> None:
    Path("t.toml").write_text(
        '[[turbine]]\nname = "Tern"\nhub_height = 119\nrotor_diameter = 100\n'
        '[[turbine]]\nname = "Gannet"\nhub_height = 100\nrotor_diameter = 70.5\n'
    )
    status, out, err = run(capsys, lidar(), "none.csv", "--turbines", "t.toml")
    assert status == 1
    assert err == "backveer: none.csv: no such file. Check the name and the folder.\n"
    assert "Tern: hub 119 m" in out
    assert "Gannet: hub 100 m" in out
    status, out, err = run(capsys, "none.csv", *SIZE)
    assert (status, out) == (3, "")


def test_files_of_a_day_in_any_order_are_one_record(capsys, lidar) -> None:
    first = lidar(name="a.csv", begin="2031-05-15T00:00", count=144)
    second = lidar(name="b.csv", begin="2031-05-14T00:00", count=144)
    status, out, _ = run(capsys, first, second, second, *SIZE)
    assert status == 0
    assert "288 profiles from 2031-05-14 00:00 UTC to 2031-05-15 23:50 UTC, every 10 min" in out
    said = " ".join(out.split())
    assert "144 profiles of a time that had one already left out, 0 of them with another" in said


def test_a_clock_that_was_changed_is_refused_with_a_remedy(capsys, lidar) -> None:
    local = HEADER.replace("time_utc", "time")
    hour = [f"2031-10-26 0{h}:{m:02d}" for h in (1, 2, 2, 3) for m in range(0, 60, 10)]
    name = lidar(header=local, times=hour)
    for more in ((), ("--utc-offset", "1")):
        status, out, err = run(capsys, name, *SIZE, *more)
        assert (status, out) == (3, "")
        assert err == (
            "backveer: lidar.csv: the hour from 2031-10-26 02:00 on stands twice, as when a clock "
            "is put back. Give the times in UTC, or in a clock that is not changed with "
            "--utc-offset HOURS.\n"
        )
    hour = [f"2031-03-30 0{h}:{m:02d}" for h in (0, 1, 3, 4) for m in range(0, 60, 10)]
    name = lidar(header=local, times=hour)
    status, _, err = run(capsys, name, *SIZE)
    assert status == 3
    assert "an hour is missing after 2031-03-30 01:50, a Sunday on which clocks are" in err
    status, out, err = run(capsys, name, *SIZE, "--utc-offset", "1")
    assert (status, err) == (0, "")
    assert "24 profiles from 2031-03-29 23:00 UTC to 2031-03-30 03:50 UTC" in out
    # In UTC an hour without data is a gap.
    status, out, _ = run(capsys, lidar(times=hour), *SIZE)
    assert (status, "80.0 % of a complete record" in out.replace("\n", " ")) == (0, True)


def test_the_clock_of_the_tables(capsys, lidar) -> None:
    local = HEADER.replace("time_utc", "time")
    name = lidar(header=local, begin="2031-05-14T00:00", count=6)
    _, out, _ = run(capsys, name, *SIZE, "--utc-offset", "2", "--by", "hour")
    assert "from 2031-05-13 22:00 UTC" in out
    assert "in UTC+2 h" in " ".join(out.split())
    assert any(line.split()[:2] == ["00", "6"] for line in out.splitlines())


def test_averages_of_faster_data(capsys, lidar) -> None:
    name = lidar(minutes=1, count=27)
    status, out, _ = run(capsys, name, *SIZE, "--interval", "10", "--json")
    assert status == 0
    profiles = json.loads(out)["profiles"]
    assert [p["time"][11:16] for p in profiles] == ["00:00", "00:10", "00:20"]
    told = [p["rotors"][0] for p in profiles]
    assert told[0]["veer"] == pytest.approx(10.0, abs=0.01)
    # Seven of ten minutes are too few.
    assert told[2]["veer"] is None
    _, out, _ = run(capsys, name, *SIZE, "--interval", "10")
    assert "3 averages over 10 min of 27 profiles" in out


def test_intervals_where_they_are_asked_for(capsys, lidar) -> None:
    random = np.random.default_rng(8)
    rows = []
    for turn in random.normal(8.0, 3.0, 40 * 24):
        rows.append(f"7,250,8,{250 + turn:.1f},8.8,{250 + 2 * turn:.1f},9.4,{250 + 3 * turn:.1f}")
    name = lidar(rows, minutes=60, count=len(rows))
    _, out, _ = run(capsys, name, *SIZE, "--confidence", "0.9")
    assert "90 % interval" in out
    assert "intervals by resampling blocks of" in out
    _, out, _ = run(capsys, name, *SIZE, "--confidence", "0.9", "--json")
    table = json.loads(out)["climate"][0]["tables"][0]
    assert table["mean_low"][0] < table["mean"][0] < table["mean_high"][0]


@pytest.mark.parametrize("suffix", [".csv", ".parquet", ".nc"])
def test_a_row_a_profile_and_turbine_with_the_run(capsys, lidar, suffix) -> None:
    Path("t.toml").write_text(
        '[[turbine]]\nname = "Tern"\nhub_height = 119\nrotor_diameter = 100\n'
        '[[turbine]]\nname = "Gannet"\nhub_height = 100\nrotor_diameter = 70.5\n'
    )
    name = lidar([GOOD, "6.0,250,7.0,264,7.8,278,8.4,292", ",,,,,,,"], count=3)
    out = f"out{suffix}"
    status, _, err = run(
        capsys, name, "--turbines", "t.toml", "--to", out, "--roughness", "0.03", "--stamp", "end"
    )
    assert (status, err) == (0, "")
    if suffix == ".nc":
        with xarray.open_dataset(out) as told:
            assert told["veer"].dims == ("profile", "turbine")
            assert told["veer"].attrs["units"] == "degree"
            veer = told["veer"].values.reshape(-1)
            turbine, line = told["turbine"].values.tolist() * 3, told.attrs["backveer_run"]
            assert told["time"].values[1] == np.datetime64("2031-05-14T00:10")
            anomaly = told["expected_veer_anomaly"].values.reshape(-1)
            assert told.attrs["coverage_limit"] == 0.78
    else:
        if suffix == ".csv":
            first = Path(out).read_text().splitlines()[0]
            line = first.removeprefix("# backveer run: ")
            told = pandas.read_csv(out, comment="#")
        else:
            told = pandas.read_parquet(out)
            line = parquet.read_schema(out).metadata[b"backveer_run"].decode()
        veer, turbine = told["veer (degree)"].to_numpy(), told["turbine"].tolist()
        anomaly = told["expected_veer_anomaly (degree)"].to_numpy()
        assert told["profile"].tolist() == [1, 1, 2, 2, 3, 3]
    assert turbine == ["Tern", "Gannet"] * 3
    assert veer[0] == pytest.approx(10.0)
    assert np.isnan(veer[4:]).all()
    assert anomaly[0] < veer[0]
    made = json.loads(line)
    assert made["options"]["turbines"][1] == {
        "name": "Gannet", "hub_height": 100.0, "rotor_diameter": 70.5
    }  # fmt: skip
    assert made["options"]["stamp"] == "end"
    assert len(made["inputs"][0]["sha256"]) == 64
    assert sorted(path.name for path in Path().iterdir()) == ["lidar.csv", out, "t.toml"]


def test_extrapolation_is_never_silent(capsys, lidar) -> None:
    z = np.arange(20, 620, 20)
    spiral = 10.0 * (1.0 - np.exp(-(1.0 + 1.0j) * z / 150.0))
    random = np.random.default_rng(2)
    spiral = spiral + 0.02 * (random.normal(size=z.size) + 1j * random.normal(size=z.size))
    keep = z <= 600
    header = "time_utc," + ",".join(f"u_{h} (m/s),v_{h} (m/s)" for h in z[keep])
    winds = ",".join(f"{w.real:.3f},{w.imag:.3f}" for w in spiral[keep])
    name = lidar(winds, header=header)
    size = ("--hub-height", "290", "--rotor-diameter", "400", "--wind-error", "0.02")
    _, out, _ = run(capsys, name, *size, "--json")
    assert json.loads(out)["profiles"][0]["rotors"][0]["extrapolated"] is False
    low = lidar(
        ",".join(f"{w.real:.3f},{w.imag:.3f}" for w in spiral[:22]),
        header="time_utc," + ",".join(f"u_{h} (m/s),v_{h} (m/s)" for h in z[:22]),
        name="low.csv",
    )
    _, plain, _ = run(capsys, low, *size)
    _, more, _ = run(capsys, low, *size, "--extrapolate")
    assert "extrapolated" not in plain
    assert "above the highest level, by the fitted Ekman model" in more


def test_a_figure_says_its_run(capsys, lidar) -> None:
    status, _, err = run(capsys, lidar(count=20), *SIZE, "--figure", "out.svg")
    assert (status, err) == (0, "")
    assert "sha256" in Path("out.svg").read_text()


def test_standard_input_is_digested_by_its_values(capsys, lidar, monkeypatch) -> None:
    import io as streams

    text = Path(lidar()).read_bytes()
    monkeypatch.setattr(sys, "stdin", streams.TextIOWrapper(streams.BytesIO(text)))
    status, out, _ = run(capsys, "-", *SIZE, "--json")
    assert status == 0
    assert json.loads(out)["run"]["inputs"][0]["of"] == "values"


def test_interrupting_leaves_no_half_file(lidar) -> None:
    lidar(count=3000)
    code = (
        "import sys, time\n"
        "import pandas\n"
        "def slow(self, out, **more):\n"
        "    out.write('half'); out.flush(); print('now', flush=True); time.sleep(60)\n"
        "pandas.DataFrame.to_csv = slow\n"
        "from backveer.io.command import main\n"
        "sys.exit(main(sys.argv[1:]))\n"
    )
    words = ["rotor", "lidar.csv", *SIZE, "--to", "out.csv"]
    with subprocess.Popen(
        [sys.executable, "-c", code, *words],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        env=os.environ | {"PYTHONUNBUFFERED": "1"},
    ) as process:
        assert process.stdout is not None
        for line in process.stdout:
            if line == "now\n":
                break
        time.sleep(0.1)
        process.send_signal(signal.SIGINT)
        _, err = process.communicate(timeout=30)
    assert process.returncode == 130
    assert err.strip() == "backveer: stopped. Nothing half-written is left behind."
    assert [path.name for path in Path().iterdir()] == ["lidar.csv"]


def test_the_test_profile_is_what_it_says() -> None:
    """The veer of GOOD from 69 to 169 m is 10 degrees by straight lines of 0.1 degree a metre."""
    speed = np.array([7.0, 8.0, 8.8, 9.4])
    u, v = wind_components(speed, np.array([250.0, 254.0, 258.0, 262.0]))
    angle = np.degrees(np.unwrap(np.angle(u + 1j * v)))
    assert -np.diff(angle) / 40.0 == pytest.approx(0.1)
