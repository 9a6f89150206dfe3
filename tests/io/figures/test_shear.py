"""The sheet of low-level shear: files that open, the same bytes again, the arrays' own facts."""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree
from typing import Any

import matplotlib as mpl
import numpy as np
import pytest

from backveer.io.atomic import WriteError
from backveer.io.figures import SUFFIXES
from backveer.io.figures.shear import draw, figure
from backveer.io.readers.shear_rules import read_rules
from backveer.io.words.cautions import AVIATION
from backveer.profiles.low_level_shear import FOOT, INTENSITY, KNOT, KNOT_PER_100_FEET
from backveer.profiles.shear_statement import ShearSettings, ShearStatement, shear_statement
from backveer.profiles.stack import Stack, wind_components

FEET = np.array([33.0, 133, 233, 333, 500, 750, 1000, 1500, 2000])


def told(feet: Any = FEET, **more: Any) -> ShearStatement:
    feet = np.asarray(feet, dtype=float)
    u, v = wind_components(
        np.interp(feet, [33, 333, 2000], [5, 29, 35]) * KNOT,
        np.interp(feet, [33, 2000], [210.0, 268.0]),
    )
    known = {"height": [feet * FOOT], "eastward_wind": [u], "northward_wind": [v]}
    stack = Stack.of(**(known | {"station": ["Low $Ness"]} | more))
    return shear_statement(
        stack, ShearSettings(headings=(268.0, 88.0), rules=read_rules(), wind_error=0.2)
    )


def words(sheet: Any) -> str:
    return " ".join(" ".join(t.get_text() for t in sheet.findobj(mpl.text.Text)).split())


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_two_runs_give_the_same_bytes_and_the_file_opens(tmp_path, suffix):
    first, second = tmp_path / f"one{suffix}", tmp_path / f"two{suffix}"
    draw(told(), ("268", "088"), first)
    draw(told(), ("268", "088"), second)
    assert first.read_bytes() == second.read_bytes()
    if suffix == ".svg":
        assert ElementTree.parse(first).getroot().tag.endswith("svg")
    else:
        assert first.read_bytes()[:4] in (b"\x89PNG", b"%PDF")


def test_the_words_and_bars_are_those_of_the_arrays():
    said = told()
    sheet = figure(said, ("268", "088"))
    text = words(sheet)
    assert "Low $Ness" in text
    for part in (*(term for term, _ in INTENSITY), AVIATION, "height above ground, ft"):
        assert part in text
    met = int(said.criteria.met[0].sum())
    assert f"{met} of 5 criteria met" in text
    assert f"F {said.path.approach_f_factor[0, 0]:+.3f}" in text
    bars = [p for p in sheet.axes[0].patches if p.get_width() > 0 and p.get_y() > 0]
    widths = sorted(p.get_width() for p in bars if abs(p.get_height() - 100) < 1e-6)
    shears = said.shear.step_shear[0] / KNOT_PER_100_FEET
    whole = np.isclose(said.shear.step_top[0] - said.shear.step_base[0], 100 * FOOT)
    np.testing.assert_allclose(widths, sorted(shears[whole]), rtol=1e-9)
    head = sheet.axes[1].lines[1].get_xdata()
    np.testing.assert_allclose(head, said.path.headwind[0, 0] / KNOT, rtol=1e-9)


def test_a_sparse_profile_and_none_at_all_say_why():
    sparse = figure(told([33.0, 900, 2000]), ("268",))
    assert "arrows: lower bounds" in words(sparse)
    none = figure(told([3000.0, 5000]), ("268",))
    assert "there are fewer than two usable winds up to 2000 ft (610 m)" in words(none)
    assert "no runway is given" in words(figure(told(), ()))


def test_a_suffix_that_cannot_be_written(tmp_path):
    with pytest.raises(WriteError, match="End it in"):
        draw(told(), ("268",), tmp_path / "a.jpg")
