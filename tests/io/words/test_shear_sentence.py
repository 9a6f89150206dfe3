"""The candidate sentence: its rounding, its reservations, and what it must not look like."""

from __future__ import annotations

import numpy as np

from backveer.io.readers.shear_rules import read_rules
from backveer.io.words.shear_record import answer
from backveer.profiles.low_level_shear import FOOT, KNOT
from backveer.profiles.shear_statement import ShearSettings, shear_statement
from backveer.profiles.stack import Stack, wind_components


def sentence(feet, directions, knots, **settings):
    u, v = wind_components(np.array(knots) * KNOT, np.array(directions, dtype=float))
    stack = Stack.of(height=np.array([feet]) * FOOT, eastward_wind=[u], northward_wind=[v])
    settings = {"rules": read_rules(), "wind_error": 0.2} | settings
    return answer(shear_statement(stack, ShearSettings(**settings)), ()).sentence[0]


START = "Candidate wording, for a forecaster's judgement: "


def test_rounding_of_heights_directions_speeds_and_shears():
    # 84.4 ft to 80, 1449 to 1400 and 1451 to 1500 ft; 357 degrees to 360; 24.6 kt to 25; the
    # vector difference is sqrt(9.9^2 + 24.6^2 - 2 9.9 24.6 cos 8) = 14.9, the shear over 1366.6 ft
    # is 1.09 kt per 100 ft.
    assert sentence([84.4, 1451], [349, 357], [9.9, 24.6], rules=read_rules()[-1:]) == (
        START + "strongest shear at least 1.1 kt per 100 ft (light) from 80 ft to 180 ft; no "
        "criterion is met as far as the profile can tell, which does not cover them all."
    )
    told = sentence([84.4, 1449, 3000], [349, 357, 357], [9.9, 25.6, 25.6])
    assert told.startswith(
        START + "from the surface (80 ft, 350 degrees 10 kt) to 1400 ft (360 degrees 26 kt) the "
        "wind changes by 16 kt as a vector; strongest shear at least 1.2 kt per 100 ft"
    )


def test_reservations():
    assert sentence([33, 1000, 2000], [200, 200, 200], [5, 5.1, 5.1]) == (
        START + "no shear is larger than the error of the measurement; no criterion is met as far "
        "as the profile can tell, which does not cover them all."
    )
    full = sentence([33, *range(100, 2001, 100)], [200] * 21, np.linspace(5, 12, 21))
    assert full.endswith("no criterion is met.")
    assert sentence([33, 1000], [200, 210], [5, 9], rules=()).endswith("no criteria were given.")
    assert sentence([3000, 5000], [200, 210], [5, 9]) == (
        START + "none, because there is no usable wind below 2000 ft (610 m) above ground."
    )
    calm = sentence([33, 1000, 2000], [0, 270, 270], [0, 30, 30])
    assert "from the surface (30 ft, calm) to 1000 ft (270 degrees 30 kt)" in calm


def test_nothing_looks_like_an_issued_warning():
    told = sentence([33, 500, 2000], [200, 250, 260], [5, 40, 45])
    assert told.startswith(START)
    for word in ("WARNING", "warning", "ALERT", "alert", "VALID", "valid", "SIGMET", "issued"):
        assert word not in told
    assert not any(word.isupper() and len(word) > 2 for word in told.split())
