"""Lidar tables with a row of heights: the same profiles in every dress, and no harm to others."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.io.readers.door import read_bytes
from backveer.io.readers.height_row import heights_into_names

TIMES = ("2031-05-14 00:00", "2031-05-14 00:10", "2031-05-14 00:20")
SPEED = (("7.0", "8.0", "8.8"), ("6.0", "7.5", "8.1"), ("5.0", "5.5", ""))
TURN = (("250", "254", "258"), ("240", "250", "260"), ("230", "231", "232"))


def rows(*blocks, d=","):
    return "".join(
        d.join([time, *(cell for block in blocks for cell in block[i])]) + "\n"
        for i, time in enumerate(TIMES)
    )


DRESSES = {
    "heights above names": "Height (m),40,80,120,40,80,120\n"
    "time_utc,Wind speed (m/s),Wind speed (m/s),Wind speed (m/s),"
    "Direction (deg),Direction (deg),Direction (deg)\n" + rows(SPEED, TURN),
    "heights with their unit above names and units": ",40 m,80 m,120 m,40 m,80 m,120 m\n"
    "time_utc,WS,WS,WS,WD,WD,WD\n,m/s,m/s,m/s,deg,deg,deg\n" + rows(SPEED, TURN),
    "names once above heights": "# Station: Harrow Skerry\ntime_utc,Wind speed (m/s),,,"
    "Wind direction (deg),,\nHeight (m),40,80,120,40,80,120\n" + rows(SPEED, TURN),
    "blocks under each other": "# lidar\nWind speed (m/s)\nTimestamp (UTC),40,80,120\n"
    + rows(SPEED)
    + "\nWind direction (deg)\nTimestamp (UTC),40,80,120\n"
    + rows(TURN),
    "semicolons": "Range [m];40;80;120;40;80;120\n"
    "time_utc;WS (m/s);WS (m/s);WS (m/s);WD (deg);WD (deg);WD (deg)\n" + rows(SPEED, TURN, d=";"),
    "feet": "Height (ft),131.2,262.5,393.7,131.2,262.5,393.7\n"
    "time_utc,WS (m/s),,,WD (deg),,\n" + rows(SPEED, TURN),
}


@pytest.mark.parametrize("dress", DRESSES)
def test_every_dress_gives_the_same_profiles(dress) -> None:
    reading = read_bytes("lidar.csv", DRESSES[dress].encode())
    assert not reading.failures, str(reading.failures[0])
    stack = reading.stack
    np.testing.assert_allclose(stack.height[:, :3], [[40.0, 80.0, 120.0]] * 3, atol=0.03)
    wanted = np.array([[float(x or "nan") for x in row] for row in SPEED])
    np.testing.assert_allclose(stack.wind_speed, wanted)
    turn = np.array(TURN, dtype=float)
    known = np.isfinite(wanted)
    np.testing.assert_allclose(stack.wind_from_direction[known], turn[known])
    assert stack.time.tolist() == np.array(TIMES, dtype="datetime64[ns]").tolist()


@pytest.mark.parametrize(
    "text",
    [
        "time,ws_40,wd_40\n2031-05-14 00:00,7,250\n",
        "height,speed,direction\n10,5,200\n20,6,210\n",
        "p,t,t\n1000,15,14\n900,10,9\n",
        "time,a,b\nx,40,80\n",  # names that differ need no heights
        "Height (m),40,80\n",
        "station,height,,\nHarrow,10,5,7\n",
        "one\ntwo\n",
        "",
        "Wind speed\ntime,40,80\n00:00,7,8\nDirection\ntime,40,80\n00:10,2,3\n",
        "Height (m),40,40\ntime,WS,WS\n2031-05-14 00:00,7,8\n",
    ],
)
def test_other_texts_are_left_alone(text) -> None:
    assert heights_into_names(text.encode()) == text.encode()


def test_lines_keep_their_numbers() -> None:
    text = DRESSES["heights above names"].encode()
    assert heights_into_names(text).split(b"\n")[2:] == text.split(b"\n")[2:]
    assert heights_into_names(text).split(b"\n")[0] == b""


def test_any_bytes_do_no_harm() -> None:
    random = np.random.default_rng(6)
    for size in (1, 40, 4000):
        heights_into_names(random.integers(0, 256, size, dtype=np.uint8).tobytes())
    heights_into_names(b'Height,"40,80\ntime,"a\n' * 40)
