"""`backveer outlook`: print, JSON, verification against a later sounding, refusals."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from backveer.io.command import main

SAMPLES = Path(__file__).parents[3] / "sample_soundings"
EVENING = str(SAMPLES / "harrow_skerry_ekman.csv")


def run(capsys, *words):
    status = main(["outlook", *words])
    captured = capsys.readouterr()
    return status, captured.out, captured.err


def test_print(capsys):
    status, out, err = run(capsys, EVENING, "--hub-height", "119", "--rotor-diameter", "171")
    assert (status, err) == (0, "")
    assert out.startswith("Harrow Skerry, 2031-05-14 11:15 UTC")
    assert "inertial period   14.0 h" in out
    assert "Across the rotor" in out
    assert "an upper bound" in out.replace("\n", " ")
    assert max(len(line) for line in out.splitlines()) <= 80


def test_json_has_the_keys_of_the_contract(capsys):
    status, out, _ = run(capsys, EVENING, "--json", "--release", "2031-05-14T20:30Z")
    assert status == 0
    told = json.loads(out)["profiles"][0]["outlook"]
    assert told["release_time"] == "2031-05-14T20:30:00Z"
    assert told["inertial_period"] == pytest.approx(50578, rel=1e-3)
    levels, hours = len(told["height"]), len(told["time"])
    assert levels > 50
    for name in ("amplitude", "maximum_speed", "time_of_maximum"):
        assert len(told[name]) == levels
    for name in ("eastward_wind", "northward_wind"):
        assert [len(row) for row in told[name]] == [levels] * hours
    assert set(told["jet"]) >= {"height", "speed", "time"}
    assert told["why"] is None


def test_the_tropics_decline(capsys):
    status, out, _ = run(capsys, str(SAMPLES / "morvanne_tropiques.csv.gz"))
    assert status == 0
    assert "not determined, because the site" in " ".join(out.split())


def test_a_later_sounding_verifies(capsys):
    night = str(SAMPLES / "harrow_skerry_night_jet.txt")
    status, out, _ = run(
        capsys, EVENING, "--verify", night, "--until", "2031-09-24T00:00", "--json"
    )
    assert status == 0
    found = json.loads(out)["profiles"][0]["outlook"]["verification"]
    assert found["levels"] > 0
    assert found["rms"] is not None


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--until", "soon"], "'soon' is no ISO 8601 time"),
        (["--hub-height", "100"], "--hub-height and --rotor-diameter go together"),
        (["--profile", "3"], "there are only 1 profiles"),
        (["--geostrophic", "nonsense"], "is not DIRECTION/SPEED"),
    ],
)
def test_refusals_are_one_line(capsys, words, said):
    status, out, err = run(capsys, EVENING, *words)
    assert (status, out) == (2, "")
    assert said in err
    assert err.count("\n") == 1
