"""A swinging layer is not called a well determined spiral."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from backveer.io.readers import read
from backveer.profiles import boundary_layer, earth, ekman
from backveer.profiles.statement import statement
from backveer.profiles.steadiness import SWINGING, TURNS_TOO, doubt_unsteady, swings

SAMPLES = Path(__file__).parents[2] / "sample_soundings"


def test_the_night_jet_is_doubted_and_the_clean_spiral_is_not():
    night = read(SAMPLES / "harrow_skerry_night_jet.txt").stack
    said = statement(night)
    assert swings(said.boundary_layer).tolist() == [True]
    assert said.ekman.verdict[0] != "well determined"
    # The script that makes the sample gives it a level balance: no advection below 1500 m is real.
    low = said.thermal_wind.layer_base_height[0] < 1500
    assert np.isnan(said.thermal_wind.layer_advection[0, low]).all()
    assert TURNS_TOO in said.thermal_wind.layer_why[0, low]
    assert np.isfinite(said.thermal_wind.layer_uncorrected_advection[0, low]).any()
    clean = statement(read(SAMPLES / "harrow_skerry_ekman.csv").stack)
    assert swings(clean.boundary_layer).tolist() == [False]
    assert clean.ekman.verdict[0] == "well determined"


@pytest.mark.parametrize("jet", [True, False])
def test_only_a_well_determined_fit_changes_and_only_its_words(jet):
    clean = read(SAMPLES / "harrow_skerry_ekman.csv").stack
    fit = ekman.fit(clean, earth.coriolis(clean))
    layer = boundary_layer.boundary_layer(read(SAMPLES / "harrow_skerry_night_jet.txt").stack)
    if not jet:
        layer = boundary_layer.boundary_layer(clean)
    told = doubt_unsteady(fit, layer)
    assert told.verdict[0] == ("weakly determined" if jet else "well determined")
    assert told.why[0] == (SWINGING if jet else fit.why[0])
    np.testing.assert_array_equal(told.scale_height, fit.scale_height)
