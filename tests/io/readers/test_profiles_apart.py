"""Long tables in every order: no level of one profile gets into another, and none is lost."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.io.readers.columns import understand
from backveer.io.readers.errors import MissingColumn
from backveer.io.readers.reading import Hints
from backveer.io.readers.table import Table

HEIGHTS = np.array([10.0, 40.0, 100.0, 120.0, 180.0])
TIMES = np.array(["2031-07-10T04:30Z", "2031-07-10T05:30Z", "2031-07-10T06:30Z"], dtype=object)
# The speed of a level says which profile and which level it is.
SPEED = 4.0 + np.arange(3)[:, np.newaxis] + np.arange(5) / 10.0
DIRECTION = 200.0 + 10.0 * np.arange(3)[:, np.newaxis] + np.arange(5)


def long_table(order, keys=("time",), height="Height AGL (m)") -> Table:
    row, level = np.divmod(np.asarray(order), 5)
    known = {"time": TIMES[row], "launch": row + 1.0}
    header = (*keys, height, "Wind speed (m/s)", "Wind dir (deg)")
    columns = (
        *(known[key] for key in keys),
        HEIGHTS[level],
        SPEED[row, level],
        DIRECTION[row, level],
    )
    lines = np.arange(2, 2 + len(row))
    return Table("mast.csv", header, (), columns, lines, (), (), "utf-8", ",", ".")


ORDERS = {
    "as measured": np.arange(15),
    "top down": np.arange(15).reshape(3, 5)[:, ::-1].ravel(),
    "latest first": np.arange(15).reshape(3, 5)[::-1].ravel(),
    "height by height": np.arange(15).reshape(3, 5).T.ravel(),
    # 10, 100, 120, 180, 40: as words are sorted
    "sorted as words": np.arange(15).reshape(3, 5)[:, [0, 2, 3, 4, 1]].ravel(),
    "the lowest last": np.arange(15).reshape(3, 5)[:, [1, 2, 3, 4, 0]].ravel(),
    "shuffled": np.random.default_rng(4).permutation(15),
}


@pytest.mark.parametrize("keys", [("time",), ("launch",), ("launch", "time")])
@pytest.mark.parametrize("order", sorted(ORDERS))
def test_any_order_of_the_rows_gives_the_same_profiles(order, keys):
    draft = understand(long_table(ORDERS[order], keys), Hints())
    u, v = draft.levels["eastward_wind"], draft.levels["northward_wind"]
    assert u.shape == (3, 5)
    np.testing.assert_array_equal(draft.levels["height"], np.tile(HEIGHTS, (3, 1)))
    speed = np.hypot(u, v)
    which = np.argsort(speed[:, 0])
    np.testing.assert_allclose(speed[which], SPEED)
    if "time" in keys:
        times = np.array([str(time).rstrip("Z") for time in TIMES], dtype="datetime64[ns]")
        np.testing.assert_array_equal(draft.profile["time"][which], times)


def test_without_a_key_a_height_that_starts_again_tells_profiles_apart():
    draft = understand(long_table(ORDERS["as measured"], ()), Hints())
    assert draft.levels["height"].shape == (3, 5)
    assert any("starting again" in remark for remark in draft.remarks)


def test_two_heights_that_alternate_are_profiles_of_two_levels():
    order = np.arange(15).reshape(3, 5)[:, [1, 4]].ravel()
    draft = understand(long_table(order, ()), Hints())
    np.testing.assert_array_equal(draft.levels["height"], np.tile([40.0, 180.0], (3, 1)))


@pytest.mark.parametrize("order", ["height by height", "shuffled"])
def test_rows_that_nothing_tells_apart_are_refused(order):
    with pytest.raises(MissingColumn, match="nothing tells profiles apart") as caught:
        understand(long_table(ORDERS[order], ()), Hints())
    assert "--column time=" in caught.value.remedy
