"""`backveer shear`: whole outputs and exit status, refusals, JSON, many profiles, a folder."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import click
import pytest

from backveer.io.command import main
from backveer.io.command.runways import runways
from backveer.io.command.shear import watch_folder
from backveer.io.command.watch import settled
from backveer.io.readers.reading import Hints
from backveer.io.readers.shear_rules import read_rules
from backveer.io.words.cautions import AVIATION
from backveer.profiles.low_level_shear import KNOT, KNOT_PER_100_FEET
from backveer.profiles.shear_statement import ShearSettings

DATA = Path(__file__).parents[2] / "data"
HEAD = """# Station: Low Ness
# Latitude: 58.00
# Longitude: -3.00
# Elevation: 20 m
# Time: 2031-09-23T{time}Z
height_agl_ft,wind_speed_kt,wind_direction_deg,temperature_C
"""
NIGHT = [
    "33,8,210,9.0",
    "133,14,220,10.0",
    "500,34,250,12.0",
    "1000,40,260,11.2",
    "2000,38,268,8.6",
    "3500,30,270,4.6",
]
WEAK = ["33,8,210,9.0", "500,9,215,8.0", "1000,10,220,7.0", "2000,11,220,5.0"]


def sounding(folder, rows=NIGHT, name="ness.csv", clock="00:40"):
    path = folder / name
    path.write_text(HEAD.format(time=clock) + "\n".join(rows) + "\n")
    return path


@pytest.fixture
def here(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    return tmp_path


def run(capsys, *words):
    status = main(["shear", *map(str, words)])
    captured = capsys.readouterr()
    return status, captured.out, captured.err


def test_the_whole_page(here, capsys):
    sounding(here)
    status, out, err = run(capsys, "ness.csv", "--runway", "268")
    # Written by this program, then checked by hand against the winds of the file: 6.3 kt/100 ft
    # is |14 kt from 220 - 8 kt from 210| over 100 ft; headwinds are 8 cos 58, 34 cos 18, ...
    assert out == (DATA / "shear_page.txt").read_text()
    assert (status, err) == (0, "")
    assert max(len(line) for line in out.splitlines()) <= 80


def test_every_page_fits_and_carries_the_caution(here, capsys):
    sounding(here)
    for more in ((), ("--units", "si"), ("--sources",), ("--runway", "090", "--runway", "200")):
        status, out, err = run(capsys, "ness.csv", *more)
        assert (status, err) == (0, "")
        assert max(len(line) for line in out.splitlines()) <= 80
        assert AVIATION in " ".join(out.split())


@pytest.mark.parametrize(
    ("words", "problem"),
    [
        (["--runway", "400"], "'400' is no true heading. Give three digits from 001 to 360."),
        (["--runway", "000"], "'000' is no true heading. Give three digits from 001 to 360."),
        (["--runway", "0"], "'0' may be a designator, which is magnetic, or part of a heading. Give"
         " the true heading in three digits, such as 268, or add --magnetic-variation."),
        (["--runway", "27"], "'27' may be a designator, which is magnetic, or part of a heading."
         " Give the true heading in three digits, such as 268, or add --magnetic-variation."),
        (["--runway", "09L"], "'09L' may be a designator, which is magnetic, or part of a heading."
         " Give the true heading in three digits, such as 268, or add --magnetic-variation."),
        (["--runway", "west"], "'WEST' is no true heading. Give three digits from 001 to 360."),
        (["--runway", "268", "--magnetic-variation", "2"], "'268' is a heading, and with"
         " --magnetic-variation a designator such as 27 or 09L is meant. Give that, or give the"
         " true heading without the variation."),
        (["--runway", "37", "--magnetic-variation", "2"], "'37' is no designator. Give a number"
         " from 01 to 36, with L, R or C if it has one."),
    ],
)  # fmt: skip
def test_a_runway_that_could_hurt_is_refused(here, capsys, words, problem):
    sounding(here)
    assert run(capsys, "ness.csv", *words) == (
        2,
        "",
        f"backveer: Invalid value for --runway: {problem} See backveer shear --help.\n",
    )


@pytest.mark.parametrize(
    ("words", "problem"),
    [
        (["ness.csv", "--top", "2000"], "Invalid value for --top: '2000' is no height with its"
         " unit. Write it as 2000ft or 600m."),
        (["ness.csv", "--step", "900m"], "Invalid value for --step: '900m' is outside 3 m to 610 m"
         " (10 to 2000 ft)."),
        (["ness.csv", "--magnetic-variation", "3"], "--magnetic-variation is of no use without"
         " --runway."),
        (["ness.csv", "--profile", "2"], "Invalid value for --profile: there is no 2, only 1"
         " profile."),
        ([], "give either FILE... or --watch DIR."),
        (["ness.csv", "--watch", "."], "give either FILE... or --watch DIR."),
        (["--watch", ".", "--figure", "a.png"], "--watch goes with none of --figure, --profile,"
         " --sources."),
    ],
)  # fmt: skip
def test_a_wrong_call_is_one_line(here, capsys, words, problem):
    sounding(here)
    status, out, err = run(capsys, *words)
    assert (status, out) == (2, "")
    assert err == f"backveer: {problem} See backveer shear --help.\n"


def test_altitudes_without_an_elevation_and_a_unit_that_is_not_said(here, capsys):
    (here / "alt.csv").write_text("altitude_m,wind_speed_kt,wind_dir_deg\n33,8,210\n133,14,220\n")
    status, out, err = run(capsys, "alt.csv", "--runway", "268")
    assert (status, out) == (3, "")
    assert err == (
        "backveer: alt.csv: the heights are altitudes above sea level, and the elevation of the "
        "site is not known: heights above ground cannot be had. Say it with --elevation.\n"
    )
    (here / "bare.csv").write_text("height_agl_m,wind_speed,wind_dir_deg\n33,8,210\n133,14,220\n")
    status, out, err = run(capsys, "bare.csv", "--runway", "268")
    assert (status, out) == (3, "")
    assert 'the unit of column "wind_speed" is not known' in err


@pytest.mark.parametrize(
    ("rows", "words"),
    [
        (["600,20,250,9", "900,30,260,8", "2000,35,265,6"],
         "surface wind not determined, because there is no wind below 500 ft (152 m) above ground"),
        (["300,20,250,9", "900,30,260,8", "2000,35,265,6"],
         "surface wind not determined, because the lowest wind is above the surface layer, higher "
         "than 30 m (98 ft)"),
        (["33,0,0,9", "900,30,260,8", "2000,35,265,6"], "surface wind calm at 33 ft"),
        (["3000,20,250,9", "5000,30,260,8"], "not determined, because there is no usable wind below"
         " 2000 ft (610 m) above ground"),
    ],
)  # fmt: skip
def test_what_the_profile_does_not_know_has_a_word(here, capsys, rows, words):
    sounding(here, rows)
    status, out, err = run(capsys, "ness.csv", "--runway", "268")
    assert (status, err) == (0, "")
    assert words in " ".join(out.split())
    if "calm" not in words:
        assert "group none (non-convective" in " ".join(out.split())


def test_json_has_the_keys_of_the_contract_in_si(here, capsys):
    sounding(here)
    status, out, _ = run(capsys, "ness.csv", "--runway", "268", "--json")
    assert status == 0
    told = json.loads(out)["profiles"][0]["low_level_shear"]
    first = told["layers"][0]
    assert set(first) >= {
        "base", "top", "shear", "vector_difference", "speed_difference", "direction_change",
        "intensity", "lower_bound", "error",
    }  # fmt: skip
    # 14 kt from 220 less 8 kt from 210, by the cosine rule: sqrt(196 + 64 - 224 cos 10).
    by_hand = (196 + 64 - 224 * 0.984807753) ** 0.5
    assert first["vector_difference"] == pytest.approx(by_hand * KNOT, rel=1e-5)
    assert first["shear"] == pytest.approx(by_hand * KNOT_PER_100_FEET, rel=1e-5)
    assert first["direction_change"] == pytest.approx(10)
    assert first["intensity"] == "moderate"
    assert set(told["from_surface"][0]) >= {"height", "vector_difference", "shear"}
    assert [row["height"] for row in told["from_surface"]] == [152.4, 304.8, 487.68, 609.6]
    assert [end["heading"] for end in told["runways"]] == [268, 88]
    end = told["runways"][0]
    assert len(end["height"]) == len(end["headwind"]) == len(end["crosswind"]) == 6
    # 40 kt from 260 against 268: 40 cos 8 of headwind, 40 sin 8 from the left.
    assert end["headwind"][3] == pytest.approx(40 * KNOT * 0.990268, rel=1e-5)
    assert end["crosswind"][3] == pytest.approx(-40 * KNOT * 0.139173, rel=1e-4)
    rule = told["criteria"][0]
    assert set(rule) >= {"rule", "authority", "value", "threshold", "unit", "met", "margin"}
    assert rule["met"]
    assert rule["margin"] == pytest.approx(rule["value"] - rule["threshold"], rel=1e-4)
    assert rule["unit"] == "m s-1"
    assert told["candidate_group"] == "WS010/26040KT"
    assert told["cause"] == "nocturnal jet on a stable layer"
    assert told["sentence"].startswith("Candidate wording, for a forecaster's judgement: from the")
    assert told["caution"] == AVIATION
    assert told["stability"]["unstable"] is True


def test_text_and_json_say_the_same(here, capsys):
    sounding(here)
    _, page, _ = run(capsys, "ness.csv", "--runway", "268")
    told = json.loads(run(capsys, "ness.csv", "--runway", "268", "--json")[1])
    told = told["profiles"][0]["low_level_shear"]
    page = " ".join(page.split())
    assert told["sentence"] in page
    assert told["candidate_group"] in page
    for rule in told["criteria"]:
        assert f"{'met' if rule['met'] else 'not met'} {rule['rule']}: value" in page


def test_options_are_not_ignored(here, capsys):
    sounding(here)
    (here / "local.toml").write_text(
        'only = true\n[[rule]]\nname = "ours"\nauthority = "Low Ness"\nmetric = "shear"\n'
        'threshold = "6 kt/100 ft"\ntop = "1000 ft"\ndepth = "100 ft"\n'
    )

    def told(*more):
        words = ("ness.csv", "--runway", "268", "--json", *more)
        return json.loads(run(capsys, *words)[1])["profiles"][0]["low_level_shear"]

    plain = told()
    assert [r["rule"] for r in told("--criteria", "local.toml")["criteria"]] == ["ours"]
    assert told("--top", "1000ft")["layers"][-1]["top"] == pytest.approx(304.8)
    assert len(told("--step", "50m")["steps"]) == 12
    second = plain["runways"][0]["approach_worst_per_second"]
    faster = told("--ground-speed", "280")["runways"][0]["approach_worst_per_second"]
    assert faster == pytest.approx(2 * second, rel=1e-4)
    steeper = told("--glide-slope", "6")["runways"][0]["approach_worst_per_second"]
    assert steeper == pytest.approx(2.0055 * second, rel=1e-3)
    climb = plain["runways"][0]["departure_worst_per_second"]
    assert told("--climb-gradient", "6.6")["runways"][0][
        "departure_worst_per_second"
    ] == pytest.approx(2 * climb, rel=1e-4)
    assert told("--wind-error", "2")["layers"][0]["error"] == pytest.approx(2 * 2**0.5 / 30.48)
    named = json.loads(
        run(capsys, "ness.csv", "--json", "--runway", "27L", "--magnetic-variation", "-4")[1]
    )["profiles"][0]["low_level_shear"]["runways"]
    assert [(end["runway"], end["heading"]) for end in named] == [("27L", 266), ("09R", 86)]
    _, page, _ = run(capsys, "ness.csv", "--units", "si")
    assert "m/s/30 m" in page
    assert "kt/100 ft" not in page
    assert "Bowles" in run(capsys, "ness.csv", "--sources")[1]


def test_bad_criteria_are_a_wrong_call(here, capsys):
    sounding(here)
    (here / "bad.toml").write_text('[[rule]]\nname = "x"\n')
    status, out, err = run(capsys, "ness.csv", "--criteria", "bad.toml")
    assert (status, out) == (2, "")
    assert err == (
        "backveer: Invalid value for --criteria: bad.toml: rule 'x': authority, metric, threshold, "
        "top is missing. Add it. See backveer shear --help.\n"
    )


def test_many_profiles_a_line_each_with_trend_and_persistence(here, capsys):
    for n, rows in enumerate((WEAK, NIGHT, NIGHT, NIGHT)):
        sounding(here, rows, name=f"{n}.csv", clock=f"0{n // 2}:{30 * (n % 2):02d}")
    (here / "broken.csv").write_text("")
    status, out, err = run(capsys, "*.csv")
    assert status == 1
    assert err.startswith("backveer: broken.csv: ")
    assert out.count("\n") > 10
    lines = [line.rstrip() for line in out.splitlines()]
    assert lines[:6] == [
        "    N profile           strongest term           layer met group",
        "      time, UTC         kt/100 ft                   ft",
        "    1 2031-09-23 00:00    < error none          33-133   0",
        "    2 2031-09-23 00:30        6.3 moderate      33-133   3 WS010/26040KT",
        "    3 2031-09-23 01:00        6.3 moderate      33-133   3 WS010/26040KT",
        "    4 2031-09-23 01:30        6.3 moderate      33-133   3 WS010/26040KT",
    ]
    text = " ".join(out.split())
    assert "some criterion met in the last 3 in a row, since 2031-09-23 00:30 UTC" in text
    assert "met in 75 % of the profiles; the longest run 3 profiles, 1.0 h" in text
    assert "trend of the strongest shear over the last 3 h:" in text
    assert max(len(line) for line in lines) <= 80
    assert run(capsys, "[0-9].csv", "--profile", "2")[1].startswith("Low Ness, 2031-09-23 00:30")


def test_runways_are_told_once_and_north_is_360():
    assert [end.name for end in runways(["268", "088", "360"], None)] == [
        "268",
        "088",
        "360",
        "180",
    ]
    assert [end.heading for end in runways(["36"], 0.0)] == [360.0, 180.0]
    assert [end.name for end in runways(["09C"], 1.0)] == ["09C", "27C"]
    with pytest.raises(click.UsageError):
        runways([], 1.0)


def looks(folder, *steps):
    """Look once before each step and once after the last."""
    todo = list(steps)

    def pause(_seconds):
        todo.pop(0)()

    found = settled(folder, 1.0, scans=len(steps) + 1, sleep=pause)
    return [[path.name for path in paths] for paths in found]


def test_a_file_is_given_when_it_rests_and_again_when_it_changes(tmp_path):
    file = tmp_path / "a.csv"
    nothing = lambda: None  # noqa: E731

    def grow():
        with file.open("a") as out:
            out.write("more\n")

    def go():
        file.unlink()

    (tmp_path / ".hidden").write_text("x")
    (tmp_path / "folder").mkdir()
    assert looks(tmp_path, grow, grow, nothing, nothing, grow, nothing, go, grow, nothing) == [
        [], [], [], ["a.csv"], [], [], ["a.csv"], [], [], ["a.csv"],
    ]  # fmt: skip
    assert looks(tmp_path / "none", nothing) == [[], []]


def test_watching_tells_a_change_a_line_and_tries_again_what_failed(tmp_path, capsys, monkeypatch):
    file = tmp_path / "ness.csv"
    steps = [
        lambda: sounding(tmp_path, WEAK, clock="00:40"),
        lambda: None,
        lambda: sounding(tmp_path, NIGHT, clock="01:10"),
        lambda: None,
        lambda: file.write_text("half a he"),
        lambda: None,
        lambda: None,
        lambda: sounding(tmp_path, WEAK, clock="01:40"),
        lambda: None,
        lambda: None,
    ]
    monkeypatch.setattr(time, "sleep", lambda _: steps.pop(0)())
    monkeypatch.setattr(settled, "__kwdefaults__", {"scans": None, "sleep": time.sleep})
    settings = ShearSettings(rules=read_rules())
    status = watch_folder(
        str(tmp_path), Hints(), settings, (), "aviation", False, 1.0, scans=len(steps) + 1
    )
    captured = capsys.readouterr()
    assert status == 0
    assert captured.out.splitlines() == [
        "2031-09-23 00:40 UTC  Low Ness  no shear larger than its error; no criterion met",
        "2031-09-23 01:10 UTC  Low Ness  6.3 kt/100 ft moderate, 33-133 ft; now met: 15 kt or more "
        "along the path; gain or loss of 20 kt; severe, more than 15 kt; candidate WS010/26040KT",
        "2031-09-23 01:40 UTC  Low Ness  no shear larger than its error; no longer met: 15 kt or "
        "more along the path; gain or loss of 20 kt; severe, more than 15 kt",
    ]
    assert captured.err.count("\n") == 1
    assert captured.err.startswith(f"backveer: {file}: ")


def test_watching_as_json_gives_an_object_a_line(tmp_path, capsys):
    sounding(tmp_path, WEAK, name="a.csv", clock="00:40")
    sounding(tmp_path, NIGHT, name="b.csv", clock="01:10")
    settings = ShearSettings(rules=read_rules(), headings=(268.0, 88.0))
    ends = runways(["268"], None)
    watch_folder(str(tmp_path), Hints(), settings, ends, "aviation", True, 0.001, scans=2)
    told = [json.loads(line) for line in capsys.readouterr().out.splitlines()]
    assert [one["time"] for one in told] == ["2031-09-23T00:40:00Z", "2031-09-23T01:10:00Z"]
    assert [one["low_level_shear"]["candidate_group"] for one in told] == [None, "WS010/26040KT"]
    assert [end["runway"] for end in told[1]["low_level_shear"]["runways"]] == ["268", "088"]


def test_one_odd_file_does_not_end_a_watch(tmp_path, capsys, monkeypatch):
    sounding(tmp_path, name="a.csv")
    sounding(tmp_path, name="b.csv")
    from backveer.profiles import shear_statement as module

    real, calls = module.shear_statement, []

    def first_fails(*words, **more):
        calls.append(words)
        if len(calls) == 1:
            raise ZeroDivisionError("odd\nfile")
        return real(*words, **more)

    monkeypatch.setattr(module, "shear_statement", first_fails)
    monkeypatch.delenv("BACKVEER_TRACEBACK", raising=False)
    settings = ShearSettings(rules=read_rules())
    watch_folder(str(tmp_path), Hints(), settings, (), "aviation", False, 0.001, scans=2)
    captured = capsys.readouterr()
    assert captured.out.startswith("2031-09-23 00:40 UTC  Low Ness  6.3 kt/100 ft")
    assert captured.out.count("\n") == 1
    assert captured.err == (
        f"backveer: {tmp_path / 'a.csv'}: internal fault (ZeroDivisionError: odd file). "
        "Please report it.\n"
    )


@pytest.mark.slow
def test_watching_ends_cleanly_on_ctrl_c(tmp_path):
    sounding(tmp_path)
    words = [sys.executable, "-c", "from backveer.io.command import main; raise SystemExit(main())"]
    words += ["shear", "--watch", str(tmp_path), "--interval", "0.1"]
    with subprocess.Popen(words, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True) as one:
        first = one.stdout.readline()
        os.kill(one.pid, signal.SIGINT)
        out, err = one.communicate(timeout=20)
    assert first.startswith(
        "2031-09-23 00:40 UTC  Low Ness  6.3 kt/100 ft moderate, 33-133 ft; met:"
    )
    assert (one.returncode, out, err) == (0, "", "backveer: stopped watching.\n")
