"""`backveer read` and `backveer turn`: the contract, whole outputs, exit status, short errors."""

from __future__ import annotations

import csv
import gzip
import json
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

from backveer.io.command import main
from backveer.io.readers import read
from backveer.profiles.flags import BIT

SAMPLES = Path(__file__).parents[3] / "sample_soundings"
EKMAN = str(SAMPLES / "harrow_skerry_ekman.csv")
WARM = str(SAMPLES / "harrow_skerry_warm.tsv")
TROPICAL = str(SAMPLES / "morvanne_tropiques.csv.gz")
LIDAR = str(SAMPLES / "harrow_skerry_lidar_week.csv")

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


def run(capsys, *words):
    status = main([str(word) for word in words])
    captured = capsys.readouterr()
    return status, captured.out, captured.err


@pytest.fixture
def example(tmp_path):
    path = tmp_path / "example.csv"
    path.write_text(EXAMPLE)
    return path


def test_read_json_is_the_contract(capsys, example):
    status, out, err = run(capsys, "read", "--json", example)
    assert (status, err) == (0, "")
    answer = json.loads(out)
    assert set(answer) == {"backveer", "profiles", "failures"}
    profile = answer["profiles"][0]
    assert profile["station"] == "Harrow Skerry"
    assert profile["time"] == "2031-05-14T23:15:00Z"
    assert (profile["latitude"], profile["longitude"]) == (58.41, -3.05)
    assert profile["elevation"] == 52.0
    assert profile["columns"][4] == {
        "column": "Wind speed (kt)",
        "read_as": "wind_speed",
        "unit": "kt",
        "why": "name and unit in the header",
    }
    levels = profile["levels"]
    assert levels["height"] == [12.0, 100.0, 279.0, 558.0, 896.0, 1338.0]
    assert levels["air_pressure"][0] == 100320.0
    assert levels["air_temperature"][5] == 276.05
    # 9.9 kt from 231 degrees: 5.093 m/s times -sin and -cos of 231 degrees, by hand.
    assert levels["eastward_wind"][0] == 3.958
    assert levels["northward_wind"][0] == 3.2051
    assert levels["eastward_wind"][5] is None
    assert levels["level_flag"] == [0, 0, 0, 0, 0, BIT["wind_missing"]]
    assert profile["remarks"] == ["1 of 6 levels has no wind"]


def test_turn_json_has_every_key_of_the_contract(capsys):
    status, out, _ = run(capsys, "turn", "--json", EKMAN, "--geostrophic", "262/25kt")
    assert status == 0
    profile = json.loads(out)["profiles"][0]
    assert set(profile["coriolis"]) >= {"coriolis_parameter", "inertial_period", "applies", "why"}
    assert set(profile["turning"]) >= {"total", "error", "sense", "layers"}
    layer = profile["turning"]["layers"][0]
    assert set(layer) >= {"base", "top", "turning", "error", "rate", "sense"}
    ekman = profile["ekman"]
    assert set(ekman) >= {
        "model",
        "scale_height",
        "eddy_viscosity",
        "geostrophic_eastward_wind",
        "geostrophic_northward_wind",
        "cross_isobar_angle",
        "rms",
        "errors",
        "verdict",
        "why",
        "candidates",
    }
    assert set(ekman["candidates"][0]) == {"model", "parameters", "rms", "aicc"}
    assert set(ekman["errors"]) <= set(ekman)
    evidence = profile["geostrophic"]["evidence"]
    assert [found["from"] for found in evidence] == ["given", "fit", "free air"]
    given = evidence[0]
    # 25 kt from 262 degrees, by hand: 12.861 m/s; u = -M sin 262, v = -M cos 262.
    assert given["eastward"] == pytest.approx(12.736, abs=5e-4)
    assert given["northward"] == pytest.approx(1.790, abs=5e-4)
    departure = profile["geostrophic"]["departure"]
    assert len(departure["height"]) == len(departure["along"]) == len(departure["across"]) > 0
    wind = profile["thermal_wind"]["layers"][0]
    assert set(wind) >= {
        "base_pressure",
        "top_pressure",
        "base_height",
        "top_height",
        "eastward",
        "northward",
        "temperature_gradient_eastward",
        "temperature_gradient_northward",
        "advection",
        "error",
        "sense",
        "why",
    }
    layer = profile["boundary_layer"]
    assert set(layer) >= {"bulk_richardson_depth", "inversions", "jet"}
    assert set(layer["jet"]) >= {"height", "speed", "falloff"}
    assert "NaN" not in out


def test_what_is_null_has_its_reason(capsys):
    _, out, _ = run(capsys, "turn", "--json", TROPICAL)
    profile = json.loads(out)["profiles"][0]
    assert profile["coriolis"]["applies"] is False
    assert "equator" in profile["coriolis"]["why"]
    assert profile["turning"]["total"] is not None
    assert profile["ekman"]["scale_height"] is None
    assert profile["ekman"]["verdict"] == "not determined"
    assert profile["ekman"]["why"]
    assert all(found["why"] for found in profile["geostrophic"]["evidence"])
    assert all(layer["why"] for layer in profile["thermal_wind"]["layers"])


def test_the_truth_of_the_samples_is_found(capsys):
    # The script that makes the samples prescribes a warm advection aloft and a turning friction.
    _, out, _ = run(capsys, "turn", "--json", WARM)
    senses = {layer["sense"] for layer in json.loads(out)["profiles"][0]["thermal_wind"]["layers"]}
    assert "warm" in senses
    assert "cold" not in senses
    _, out, _ = run(capsys, "turn", "--json", SAMPLES / "punta_escarcha_calido.csv")
    south = json.loads(out)["profiles"][0]
    assert south["coriolis"]["coriolis_parameter"] < 0
    assert south["turning"]["sense"] == "backing"
    assert "warm" in {layer["sense"] for layer in south["thermal_wind"]["layers"]}


def test_one_and_many(capsys):
    status, one, _ = run(capsys, "turn", EKMAN)
    assert status == 0
    assert one.startswith("Harrow Skerry, 2031-05-14 11:15 UTC")
    status, many, _ = run(capsys, "turn", EKMAN, WARM)
    assert status == 0
    assert "2 profiles" in many
    status, second, _ = run(capsys, "turn", EKMAN, WARM, "--profile", "2")
    assert "2031-01-22 05:30 UTC" in second


def test_a_lidar_week_is_one_stack(capsys):
    reading = read([LIDAR])
    assert reading.stack.profile_count == 952
    assert reading.stack.height.strides[0] == 0
    status, out, _ = run(capsys, "turn", LIDAR)
    assert status == 0
    assert "952 profiles" in out


@pytest.mark.parametrize("suffix", [".csv", ".nc", ".parquet"])
def test_stored_profiles_hold_what_was_read(capsys, tmp_path, suffix):
    path = tmp_path / f"out{suffix}"
    status, _, err = run(capsys, "read", WARM, "--to", path)
    assert (status, err) == (0, "")
    original = read([WARM]).stack
    if suffix == ".nc":
        import xarray

        with xarray.open_dataset(path, engine="netcdf4") as dataset:
            assert dataset["eastward_wind"].attrs["standard_name"] == "eastward_wind"
            np.testing.assert_array_equal(dataset["eastward_wind"], original.eastward_wind)
    elif suffix == ".parquet":
        import pandas

        table = pandas.read_parquet(path)
        kept = table["eastward_wind (m s-1)"].dropna().to_numpy()
        np.testing.assert_array_equal(
            kept, original.eastward_wind[np.isfinite(original.eastward_wind)]
        )
    else:
        back = read([path])
        assert not back.failures
        np.testing.assert_allclose(back.stack.eastward_wind, original.eastward_wind, atol=1e-9)
        np.testing.assert_allclose(back.stack.height, original.height, atol=1e-6)
        np.testing.assert_array_equal(back.stack.latitude, original.latitude)
        np.testing.assert_array_equal(back.stack.time, original.time)


def test_our_csv_has_its_units_in_the_header(capsys, tmp_path):
    path = tmp_path / "out.csv"
    run(capsys, "read", EKMAN, "--to", path)
    with path.open(newline="") as lines:
        header = next(csv.reader(lines))
    assert "eastward_wind (m s-1)" in header
    assert "air_pressure (Pa)" in header


def test_exit_status_and_the_others_are_done(capsys, tmp_path, example):
    missing = tmp_path / "none.csv"
    status, out, err = run(capsys, "read", example, missing)
    assert status == 1
    assert "Harrow Skerry" in out
    assert err == f"backveer: {missing}: no such file. Check the name and the folder.\n"
    status, out, err = run(capsys, "turn", missing)
    assert (status, out) == (3, "")
    assert err.count("\n") == 1


def test_json_of_a_failure_is_whole(capsys, tmp_path):
    path = tmp_path / "empty.csv"
    path.write_text("")
    status, out, err = run(capsys, "read", "--json", path)
    assert status == 3
    answer = json.loads(out)
    assert answer["profiles"] == []
    failure = answer["failures"][0]
    assert failure["source"] == str(path)
    assert failure["problem"]
    assert failure["remedy"]
    assert err.startswith(f"backveer: {path}: ")


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["turn"], "Missing argument 'FILE...'"),
        (["turn", EKMAN, "--latitude", "95"], "95"),
        (["turn", EKMAN, "--geostrophic", "400/10"], "is not DIRECTION/SPEED"),
        (["turn", EKMAN, "--layers", "100,50"], "increasing numbers"),
        (["turn", EKMAN, "--profile", "2"], "there are only 1 profiles"),
        (["turn", EKMAN, "--figure", "out.xyz"], "End it in .svg, .pdf or .png"),
        (["turn", EKMAN, "--report", "out.txt"], "End it in .html"),
        (["read", EKMAN, "--to", "out.xls"], "End it in .nc, .parquet or .csv"),
        (["read", EKMAN, "--unit", "kt"], "is not of the form NAME=VALUE"),
        (["turn", EKMAN, "--unknown"], "No such option"),
        (["nothing"], "No such command"),
    ],
)
def test_a_wrong_call_is_one_line_and_status_2(capsys, words, said):
    status, out, err = run(capsys, *words)
    assert (status, out) == (2, "")
    assert said in err
    assert err.startswith("backveer: ")
    assert err.count("\n") == 1


def test_the_map_file_says_what_the_options_say(capsys, tmp_path):
    table = tmp_path / "odd.csv"
    table.write_text("Hoogte,Kracht,Ric\n10,5,200\n60,8,210\n150,11,220\n400,12,232\n")
    mapping = tmp_path / "map.toml"
    mapping.write_text(
        'latitude = 52.1\nelevation = 3\n[columns]\nheight = "Hoogte"\nwind_speed = "Kracht"\n'
        'wind_from_direction = "Ric"\n[units]\nHoogte = "m"\nKracht = "kt"\nRic = "deg"\n'
    )
    status, by_file, err = run(capsys, "read", "--json", table, "--columns", mapping)
    assert (status, err) == (0, "")
    words = ["--latitude", "52.1", "--elevation", "3"]
    for name, header, unit in (
        ("height", "Hoogte", "m"),
        ("wind_speed", "Kracht", "kt"),
        ("wind_from_direction", "Ric", "deg"),
    ):
        words += ["--column", f"{name}={header}", "--unit", f"{header}={unit}"]
    status, by_words, _ = run(capsys, "read", "--json", table, *words)
    assert status == 0
    assert by_file == by_words
    mapping.write_text("[units]\nKracht = 3\n")
    status, _, err = run(capsys, "read", table, "--columns", mapping)
    assert status == 2
    assert "every entry of [units] must be a text" in err


def test_standard_input_and_compression(tmp_path):
    packed = tmp_path / "example.csv.gz"
    packed.write_bytes(gzip.compress(EXAMPLE.encode()))
    command = [
        sys.executable,
        "-c",
        "import sys; from backveer.io.command import main; sys.exit(main())",
    ]
    done = subprocess.run(
        [*command, "read", "-", str(packed), "--json"], input=EXAMPLE.encode(), capture_output=True,
        check=False,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    first, second = json.loads(done.stdout)["profiles"]
    assert first["levels"] == second["levels"]


def test_sources_tell_method_equation_publication(capsys):
    _, out, _ = run(capsys, "turn", EKMAN, "--sources")
    assert "W = G + S z + A exp(-(1 + i s) z / delta)" in " ".join(out.split())
    assert "Lettau" in out


def test_figure_and_report_are_written(capsys, tmp_path):
    figure, page = tmp_path / "a.svg", tmp_path / "a.html"
    status, _, err = run(capsys, "turn", EKMAN, "--figure", figure, "--report", page)
    assert (status, err) == (0, "")
    assert figure.read_text().lstrip().startswith("<?xml")
    assert "<!doctype html>" in page.read_text()[:20]


def test_viscosity_that_varies_stands_beside_the_spiral_when_asked_for(capsys):
    _, out, _ = run(capsys, "turn", EKMAN, "--json")
    assert "viscosity_profile" not in json.loads(out)["profiles"][0]
    status, out, _ = run(capsys, "turn", EKMAN, "--json", "--roughness", "0.1")
    assert status == 0
    varying = json.loads(out)["profiles"][0]["viscosity_profile"]
    assert varying["roughness_length"] == 0.1
    assert set(varying) >= {"friction_velocity", "depth", "errors", "verdict", "why", "candidates"}
    assert varying["errors"]["friction_velocity"] > 0
    _, text, _ = run(capsys, "turn", EKMAN, "--varying-viscosity")
    assert "Friction: viscosity that varies with height" in text
