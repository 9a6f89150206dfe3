"""The candidate group: code form, rounding, and when there is none."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.io.words.shear_group import candidate_groups, group
from backveer.profiles.low_level_shear import FOOT, KNOT
from backveer.profiles.stack import Stack, wind_components


@pytest.mark.parametrize(
    ("feet", "direction", "knots", "expected"),
    [
        # US NWS training text (checks V7, seen): surface to 2000 ft, 270 degrees 35 kt there.
        (2000, 270, 35, "WS020/27035KT"),
        # Unit test of a public decoder (checks V11, seen in a transcription): 1500 ft = 457.2 m,
        # 300 degrees, 45 kt = 23.15 m/s.
        (457.2 / 0.3048, 300, 23.15 / (1852 / 3600), "WS015/30045KT"),
        (1049, 4.9, 9.5, "WS010/36010KT"),
        (1050, 5.0, 9.4, "WS011/01009KT"),
        (30, 355, 104.6, "WS001/360105KT"),
    ],
)
def test_form_and_rounding(feet, direction, knots, expected):
    assert group(feet * FOOT, direction, knots * KNOT) == expected


def test_the_layer_ends_where_the_wind_differs_most_and_never_above_2000_ft():
    feet = np.array([33, 900, 1500, 4000])
    u, v = wind_components(np.array([5.0, 40, 30, 90]) * KNOT, np.array([230.0, 250, 255, 270]))
    one = Stack.of(height=[feet * FOOT], eastward_wind=[u], northward_wind=[v])
    high = Stack.of(height=[feet[1:] * FOOT], eastward_wind=[u[1:]], northward_wind=[v[1:]])
    groups, heights = candidate_groups(
        Stack.concatenate([one, one, high, Stack.of()]), np.array([True, False, True, True])
    )
    assert groups.tolist() == ["WS009/25040KT", "", "", ""]
    assert heights[0] == pytest.approx(900 * FOOT)
