"""The sheet: files that open, the same bytes again, the same facts as the arrays, reasons said."""

from __future__ import annotations

import struct
import warnings
import xml.etree.ElementTree as ElementTree
from pathlib import Path
from typing import Any

import matplotlib as mpl
import numpy as np
import pytest

from backveer.io.atomic import WriteError
from backveer.io.figures import SUFFIXES
from backveer.io.figures.profile_of import Drawn, _candidate
from backveer.io.figures.sheet import draw, figure
from backveer.profiles import ekman, quality
from backveer.profiles.stack import Stack
from backveer.profiles.statement import Settings, Statement, statement

Z = np.concatenate([[10.0, 30.0, 60.0], np.arange(100.0, 4001.0, 50.0)])


def sounding(latitude: float = 55.0, z: Any = Z, **more: Any) -> Stack:
    """A sheared spiral with seeded noise, mirrored in the south."""
    random = np.random.default_rng(7)
    z = np.asarray(z, dtype=float)
    wind = (12 + 3j) * (1 - 0.8 * np.exp(-(1 + 1j) * z / 300)) + (0.001 - 0.0008j) * z
    wind += 0.2 * (random.normal(size=z.size) + 1j * random.normal(size=z.size))
    known: dict[str, Any] = {
        "height": [z],
        "eastward_wind": [wind.real],
        "northward_wind": [wind.imag if latitude >= 0 else -wind.imag],
        "air_temperature": 288.0 - 0.0065 * z,
        "air_pressure": 101325.0 * np.exp(-z / 8400.0),
        "latitude": [latitude],
        "station": ["Harrow Skerry"],
        "time": np.array(["2031-05-14T23:15"], dtype="datetime64[ns]"),
    }
    return quality.check(Stack.of(**(known | more)))


@pytest.fixture(scope="module")
def said() -> Statement:
    return statement(sounding(), Settings(geostrophic_wind=(12.0, 3.0)))


def words(sheet: Any) -> str:
    """All text of a sheet, with single spaces."""
    kinds = mpl.text.Text
    return " ".join(" ".join(t.get_text() for t in sheet.findobj(kinds)).split())


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_two_runs_give_the_same_bytes_and_the_file_opens(said, tmp_path, suffix):
    first, second = tmp_path / f"one{suffix}", tmp_path / f"two{suffix}"
    draw(said, 0, first)
    draw(said, 0, second)
    data = first.read_bytes()
    assert data == second.read_bytes()
    assert sorted(tmp_path.iterdir()) == [first, second]
    if suffix == ".svg":
        assert ElementTree.fromstring(data).tag.endswith("svg")
        assert b"dc:date" not in data
    elif suffix == ".pdf":
        assert data.startswith(b"%PDF-")
        assert data.rstrip().endswith(b"%%EOF")
        assert b"CreationDate" not in data
    else:
        assert data.startswith(b"\x89PNG\r\n\x1a\n")
        assert struct.unpack(">II", data[16:24]) == (2040, 1230)


def test_a_persons_own_settings_change_nothing(said, tmp_path):
    draw(said, 0, tmp_path / "plain.svg")
    with mpl.rc_context({"font.size": 20, "axes.facecolor": "black", "text.usetex": True}):
        draw(said, 0, tmp_path / "odd.svg")
    assert (tmp_path / "plain.svg").read_bytes() == (tmp_path / "odd.svg").read_bytes()


def test_an_unknown_suffix_is_one_error_before_anything_is_drawn(said, tmp_path):
    with pytest.raises(WriteError, match=r"End it in \.svg, \.pdf or \.png"):
        draw(said, 0, tmp_path / "sheet.bmp")
    assert list(tmp_path.iterdir()) == []


def test_a_failure_leaves_the_old_file_and_nothing_else(said, tmp_path, monkeypatch):
    kept = tmp_path / "sheet.svg"
    kept.write_text("old")

    def full(*_: Any, **__: Any) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("matplotlib.figure.Figure.savefig", full)
    with pytest.raises(WriteError, match="No space left"):
        draw(said, 0, kept)
    assert kept.read_text() == "old"
    assert list(tmp_path.iterdir()) == [kept]


def test_the_curves_are_the_arrays(said):
    sheet = figure(said, 0)
    speed, direction, departure, advection, hodograph = sheet.axes
    curves = {line.get_label(): line.get_xydata() for line in speed.lines}
    np.testing.assert_array_equal(curves["measured"][:, 0], said.stack.wind_speed[0])
    np.testing.assert_array_equal(curves["measured"][:, 1], said.stack.height[0])
    fitted = curves[f"fit: {said.ekman.model[0]}"]
    u, v = ekman.wind(said.ekman, fitted[:, 1])
    np.testing.assert_allclose(fitted[:, 0], np.hypot(u, v)[0], rtol=1e-12)
    turn = next(line for line in direction.lines if line.get_label() == "measured")
    np.testing.assert_array_equal(turn.get_xdata(), said.turning.direction[0])
    across = next(line for line in departure.lines if "across" in line.get_label())
    there = np.isfinite(said.geostrophic.departure_across[0])
    np.testing.assert_array_equal(across.get_xdata(), said.geostrophic.departure_across[0][there])
    told = np.isfinite(said.thermal_wind.layer_advection[0])
    bars = [
        bar for bars in advection.containers if hasattr(bars, "patches") for bar in bars.patches
    ]
    np.testing.assert_allclose(
        [bar.get_width() for bar in bars], said.thermal_wind.layer_advection[0][told] * 3600.0
    )
    # The geostrophic wind that the departure is measured against is where the hodograph has it.
    marks = {line.get_label(): line.get_xydata()[0] for line in hodograph.lines}
    np.testing.assert_array_equal(marks["geostrophic wind: given"], [12.0, 3.0])
    np.testing.assert_allclose(
        marks["geostrophic wind: fit"],
        [said.ekman.geostrophic_eastward_wind[0], said.ekman.geostrophic_northward_wind[0]],
    )


def test_the_four_panels_share_their_height_axis(said):
    speed, *others, hodograph = figure(said, 0).axes
    for ax in others:
        assert ax.get_shared_y_axes().joined(speed, ax)
        assert ax.get_ylim() == speed.get_ylim()
    assert not speed.get_shared_y_axes().joined(speed, hodograph)
    assert speed.get_ylim()[0] == 0.0
    assert speed.get_ylim()[1] >= 4000.0


@pytest.mark.parametrize("latitude", [55.0, -55.0])
def test_a_member_is_rebuilt_from_what_the_fit_tells_of_it(latitude):
    fit = statement(sounding(latitude)).ekman
    place = list(fit.candidate_model[0]).index(fit.model[0])
    z = np.array([0.0, 20.0, 150.0, 600.0, 2500.0])
    u, v = ekman.wind(fit, z)
    np.testing.assert_allclose(_candidate(fit, place)(z), (u + 1j * v)[0], atol=1e-9)
    names = [name for name, _ in Drawn.of(statement(sounding(latitude)), 0, "si").candidates()]
    assert fit.model[0] not in names
    assert "no slip" in names


def test_aviation_units_are_those_of_the_axes(said):
    sheet = figure(said, 0, units="aviation")
    text = words(sheet)
    assert "height above ground, ft" in text
    assert "toward east, kt" in text
    speed = next(line for line in sheet.axes[0].lines if line.get_label() == "measured")
    # 1 kt = 1852/3600 m/s and 1 ft = 0.3048 m, both exact (ISO 80000-3:2019, annex B).
    np.testing.assert_allclose(speed.get_xdata() * 1852 / 3600, said.stack.wind_speed[0])
    np.testing.assert_allclose(speed.get_ydata() * 0.3048, said.stack.height[0])


def test_the_tropics_say_why_in_each_panel_that_declines():
    sheet = figure(statement(sounding(latitude=2.0)), 0)
    reason = "the site lies within 5 degrees of the equator"
    for ax in (sheet.axes[0], sheet.axes[2], sheet.axes[3]):
        assert reason in words(ax)
    assert "in all" in words(sheet.axes[1])


def test_layers_without_an_answer_carry_a_number_and_its_reason(said):
    why = said.thermal_wind.layer_why[0]
    assert any(why)
    text = words(figure(said, 0).axes[3])
    assert "(1) not determined, because " + next(w for w in why if w) in text


def test_levels_that_are_left_out_are_shown_as_such():
    stack = sounding()
    u = np.array(stack.eastward_wind)
    u[0, 20] += 40.0
    sheet = figure(statement(quality.check(stack.replace(eastward_wind=u))), 0)
    line = next(line for line in sheet.axes[0].lines if line.get_label() == "left out (quality)")
    assert line.get_ydata().tolist() == [Z[20]]


HOSTILE = {
    "nothing": Stack.of(profiles=1),
    "one level": Stack.of(height=[[10.0]], eastward_wind=[[3.0]], northward_wind=[[1.0]]),
    "calm": Stack.of(height=[[10.0, 50.0]], eastward_wind=0.0, northward_wind=0.0, latitude=50.0),
    "no height above zero": Stack.of(height=[[0.0]], eastward_wind=[[3.0]], northward_wind=1.0),
    "denormal": Stack.of(
        height=[[10.0, 50.0, 90.0]],
        eastward_wind=[[5e-324, 1e-310, 0.0]],
        northward_wind=0.0,
        latitude=50.0,
    ),
    "infinite": Stack.of(
        height=[[10.0, np.inf, 90.0]],
        eastward_wind=[[np.inf, 1.0, 1e300]],
        northward_wind=[[1.0, -np.inf, 1e300]],
        latitude=50.0,
    ),
    "few gates": sounding(z=[40.0, 80.0, 120.0, 160.0, 200.0]),
    "no temperature": sounding(air_temperature=np.nan, air_pressure=np.nan),
    "north": sounding(eastward_wind=[np.sin(Z / 300)], northward_wind=[-5 + 0 * Z]),
    "south": sounding(latitude=-55.0),
    "a long way up": sounding(z=np.linspace(5.0, 34000.0, 500)),
}


@pytest.mark.parametrize("name", HOSTILE)
def test_whatever_comes_is_drawn_without_a_warning(name, tmp_path):
    told = statement(HOSTILE[name])
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        draw(told, 0, tmp_path / "sheet.png")
    assert (tmp_path / "sheet.png").stat().st_size > 10_000


@pytest.mark.parametrize(
    "name", ["$x_", r"\frac{1}{", "a<b>&\"'", "Skerry\x1b[2J\u202e\n", "天気", "x" * 5000]
)
def test_a_station_may_be_called_anything(name, tmp_path):
    told = statement(sounding(station=[name]))
    draw(told, 0, tmp_path / "sheet.svg")
    ElementTree.parse(tmp_path / "sheet.svg")
    assert "\x1b" not in words(figure(told, 0))


def test_no_window_and_no_figure_are_left_open(said, tmp_path):
    import matplotlib.pyplot as plt

    before = plt.get_fignums()
    draw(said, 0, Path(tmp_path) / "sheet.png")
    assert plt.get_fignums() == before
