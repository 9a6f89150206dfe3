"""Whatever the profile: a page of 80 columns, JSON without NaN, a line in the table, a sheet."""

from __future__ import annotations

import json

import numpy as np
import pytest

from backveer.io.figures.shear import draw
from backveer.io.readers.shear_rules import read_rules
from backveer.io.words.shear_record import answer, shear_records
from backveer.io.words.shear_sources import SHEAR_SOURCES
from backveer.io.words.shear_table import shear_summary
from backveer.io.words.shear_text import shear_text
from backveer.profiles import flight_path, low_level_shear, shear_cause, sliding_layer
from backveer.profiles.labels import labels
from backveer.profiles.shear_statement import ShearSettings, shear_statement
from backveer.profiles.stack import Stack

SETTINGS = ShearSettings(headings=(268.0, 88.0, 360.0), rules=read_rules())
RUNWAYS = ("268", "088", "360")
nan, inf = np.nan, np.inf


def winds(height, u, v=1.0, **more):
    return Stack.of(height=[height], eastward_wind=[u], northward_wind=[np.full(len(u), v)], **more)


HOSTILE = {
    "no level": Stack.of(profiles=1),
    "no wind": winds([10.0, 50, 100], [nan, nan, nan]),
    "one level": winds([10.0], [3.0]),
    "calm": winds([10.0, 50, 100, 200], [0.0] * 4, 0.0),
    "denormal": winds([10.0, 50, 100, 200], [5e-324, 0, 1e-310, 0], 0.0),
    "absurd": winds([10.0, 50, 100, 200], [1e3, -1e5, 1e4, 0]),
    "infinite": winds([10.0, 50, 100, inf], [1, inf, 5, 0]),
    "close": winds([10.0, 10.0000000001, 10.1, 40.48], [1, 9, 5, 0]),
    "exactly at the top": winds([0.0, 10, 609.6], [1, 9, 5]),
    "a name with an escape": winds([10.0, 100, 700], [1, 9, 5], station=["a\x1b[31m\nb" * 30]),
}


@pytest.mark.parametrize("name", HOSTILE)
def test_any_profile_has_a_page_a_record_and_a_sheet(name, tmp_path):
    said = shear_statement(HOSTILE[name], SETTINGS)
    told = answer(said, RUNWAYS)
    json.dumps(shear_records(told), allow_nan=False)
    for units in ("si", "aviation"):
        page = shear_text(told, 0, units=units, sources=True)
        assert max(len(line) for line in page.splitlines()) <= 80
        assert "nan" not in page.split()
        assert "\x1b" not in page
    draw(said, RUNWAYS, tmp_path / "sheet.png")


def test_a_stack_answers_as_its_profiles_do_one_at_a_time():
    whole = shear_statement(Stack.concatenate(HOSTILE.values()), SETTINGS)
    assert "10 profiles" in shear_summary(whole)
    for row, stack in enumerate(HOSTILE.values()):
        one = shear_statement(stack, SETTINGS)
        for part in ("shear", "path", "criteria", "cause"):
            for name, label in labels(getattr(one, part)).items():
                if label.dims[0] != "profile":
                    continue
                ours = getattr(getattr(whole, part), name)[row]
                alone = getattr(getattr(one, part), name)[0]
                if label.dims[-1] in ("layer", "level"):
                    ours = ours[..., : alone.shape[-1]]
                np.testing.assert_array_equal(ours, alone, err_msg=f"{part}.{name}")
    assert shear_summary(shear_statement(Stack.of(profiles=0), SETTINGS)).startswith("    N")


def test_answers_cross_to_xarray_and_pandas():
    said = shear_statement(HOSTILE["exactly at the top"], SETTINGS)
    data = said.path.to_xarray()
    assert data["headwind"].dims == ("profile", "runway", "level")
    assert data["headwind"].attrs["units"] == "m s-1"
    assert said.shear.to_xarray()["layer_shear"].attrs["units"] == "s-1"
    assert len(said.shear.to_pandas("layer")) == said.shear.layer_base.size
    assert said.cause.to_pandas()["cause"].tolist() == said.cause.cause.tolist()


def test_every_author_and_year_of_the_sources_stands_in_the_modules():
    modules = {m.__name__.rsplit(".", 1)[1]: m.__doc__ or "" for m in
               (flight_path, low_level_shear, shear_cause, sliding_layer)}  # fmt: skip
    assert {name for source in SHEAR_SOURCES for name in source.modules} == set(modules)
    assert "Blackadar 1957" in modules["shear_cause"]
    assert "Bowles" in (flight_path.flight_path.__doc__ or "")
