"""The rotor's sheet: to scale, the same bytes again, the arrays' own numbers, whatever comes."""

from __future__ import annotations

from typing import Any

import matplotlib as mpl
import numpy as np
import pytest

from backveer.io.figures import SUFFIXES
from backveer.io.figures.rotor import draw, figure
from backveer.io.run import Run
from backveer.profiles.rotor import Turbine, rotor
from backveer.profiles.rotor_climate import Over, rotor_climate
from backveer.profiles.stack import Stack, wind_components

Z = np.array([40.0, 80.0, 119.0, 160.0, 200.0])
RUN = Run("rotor", "0.1.0", {"stamp": "begin"}, ({"source": "a.csv", "sha256": "ab" * 32},))
TURBINES = [Turbine("Tern", 119.0, 171.0), Turbine("Gannet", 150.0, 120.0)]


def record(count: int = 400, **more: Any) -> Stack:
    random = np.random.default_rng(5)
    time = np.datetime64("2031-05-30", "ns") + np.arange(count) * np.timedelta64(600, "s")
    veer = 10.0 + random.normal(0.0, 4.0, count)
    u, v = wind_components(
        8.0 + Z / 60.0 + random.normal(0.0, 1.0, count)[:, np.newaxis],
        250.0 + veer[:, np.newaxis] * (Z - 119.0) / 171.0,
    )
    given = {"eastward_wind": u, "northward_wind": v, "time": time, "station": "Harrow $kerry_1"}
    return Stack.of(height=Z, elevation=10.0, latitude=58.0, **(given | more))


def answers(stack: Stack) -> tuple[Any, Any]:
    told = rotor(stack, TURBINES)
    over = [rotor_climate(stack, told, i, Over()) for i in range(2)]
    return told, over


def words(sheet: Any) -> str:
    return " ".join(" ".join(t.get_text() for t in sheet.findobj(mpl.text.Text)).split())


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_two_runs_give_the_same_bytes_with_their_run(tmp_path, suffix) -> None:
    stack = record(30)
    told, over = answers(stack)
    for name in ("one", "two"):
        draw(stack, told, over, tmp_path / f"{name}{suffix}", RUN)
    first = (tmp_path / f"one{suffix}").read_bytes()
    assert first == (tmp_path / f"two{suffix}").read_bytes()
    if suffix == ".svg":
        assert "abababab" in first.decode()


def test_the_rotor_is_to_scale() -> None:
    stack = record()
    sheet = figure(stack, *answers(stack), RUN)
    ax = sheet.axes[0]
    box = ax.get_position()
    wide = box.width * sheet.get_figwidth() / np.diff(ax.get_xlim())[0]
    high = box.height * sheet.get_figheight() / np.diff(ax.get_ylim())[0]
    assert wide == pytest.approx(high)
    radii = sorted({p.radius for p in ax.patches if isinstance(p, mpl.patches.Circle)})
    assert radii == [60.0, 85.5]
    assert ax.get_ylim()[1] > 119.0 + 85.5
    assert -ax.get_xlim()[0] > 85.5


def test_the_spread_is_that_of_the_arrays() -> None:
    stack = record()
    sheet = figure(stack, *answers(stack), RUN)
    speed = sheet.axes[1]
    (line,) = [line for line in speed.lines if line.get_label() == "median"]
    np.testing.assert_allclose(line.get_xdata(), np.median(stack.wind_speed, axis=0))
    np.testing.assert_allclose(line.get_ydata(), Z)
    turn = sheet.axes[2]
    (line,) = [line for line in turn.lines if line.get_label() == "median"]
    assert line.get_xdata()[2] == pytest.approx(0.0, abs=1e-9)
    assert line.get_xdata()[4] - line.get_xdata()[0] == pytest.approx(160 / 171 * 10.0, abs=0.6)


def test_hours_and_months_are_those_of_the_arrays() -> None:
    stack = record()
    told, over = answers(stack)
    sheet = figure(stack, told, over, RUN)
    (mesh,) = [c for ax in sheet.axes for c in ax.collections if hasattr(c, "get_coordinates")][:1]
    shown = np.ma.filled(mesh.get_array(), np.nan).reshape(2, 24)
    june = stack.time >= np.datetime64("2031-06-01")
    hour = stack.time.astype("datetime64[h]").astype(int) % 24
    assert shown[1, 5] == pytest.approx(told.veer[june & (hour == 5), 0].mean())
    assert shown[0, 7] == pytest.approx(told.veer[~june & (hour == 7), 0].mean())


def test_aviation_units_and_a_single_profile() -> None:
    stack = record(3)
    told, over = answers(stack)
    many = words(figure(stack, told, over, RUN, units="aviation"))
    assert "wind speed, kt" in many
    assert "height above ground, ft" in many
    one = words(figure(stack, told, over, RUN, index=1))
    assert f"{told.veer[1, 0]:+.1f} deg" in one
    assert "Mean veer by hour" not in one
    assert "Not a guarantee of load or energy" in one


@pytest.mark.parametrize(
    "change",
    [
        {"eastward_wind": np.full((30, 5), np.nan)},
        {"eastward_wind": np.zeros((30, 5)), "northward_wind": np.zeros((30, 5))},
        {"time": np.full(30, np.datetime64("NaT", "ns"))},
        {"station": "漢字 $\\alpha"},
    ],
)
def test_whatever_comes_it_draws(tmp_path, change) -> None:
    stack = record(30, **change)
    told, over = answers(stack)
    draw(stack, told, over, tmp_path / "out.png", RUN)
    draw(stack, told, over, tmp_path / "one.png", RUN, index=4)
    assert (tmp_path / "out.png").stat().st_size > 10_000
