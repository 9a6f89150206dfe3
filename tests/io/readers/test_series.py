"""Files become one record in time order; clocks that were changed are seen."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.io.readers.reading import FileReading, Reading
from backveer.io.readers.series import clock_change, series
from backveer.profiles.stack import Stack

TEN = np.timedelta64(600, "s")


def record(begin: str, count: int, **more) -> FileReading:
    time = np.datetime64(begin, "ns") + np.arange(count) * TEN
    speed = np.arange(count)[:, np.newaxis] + np.array([[5.0, 6.0]])
    given = {"eastward_wind": speed, "time": time, "station": "Harrow Skerry"} | more
    stack = Stack.of(height=[40.0, 80.0], northward_wind=0.0, **given)
    return FileReading(begin, stack, (), (f"read {begin}",))


def test_files_in_any_order_become_one_in_order() -> None:
    found = series(Reading((record("2031-05-15", 3), record("2031-05-14", 2)), ()))
    assert found.stack.time.astype("datetime64[m]").astype(str).tolist() == [
        "2031-05-14T00:00", "2031-05-14T00:10",
        "2031-05-15T00:00", "2031-05-15T00:10", "2031-05-15T00:20",
    ]  # fmt: skip
    assert found.stack.eastward_wind[:, 0].tolist() == [5, 6, 5, 6, 7]
    assert found.interval == TEN
    (file,) = found.reading.files
    assert file.source == "2031-05-15 and 1 more"
    assert file.remarks == ("read 2031-05-15", "read 2031-05-14")
    assert len(found.inputs.files) == 2


def test_one_file_in_order_is_not_copied() -> None:
    file = record("2031-05-14", 4)
    assert series(Reading((file,), ())).stack is file.stack


def test_the_first_of_two_profiles_of_a_time_is_kept() -> None:
    other = record("2031-05-14", 2, eastward_wind=np.array([[5.0, 6.0], [9.0, 9.0]]))
    found = series(Reading((record("2031-05-14", 2), other), ()))
    assert found.stack.eastward_wind.tolist() == [[5, 6], [6, 7]]
    assert found.reading.files[0].remarks[1:] == (
        "2 profiles of a time that had one already left out, 1 of them with another wind",
    )
    # Another station's profile of the same time is no duplicate.
    apart = series(Reading((record("2031-05-14", 2), record("2031-05-14", 2, station="Punta")), ()))
    assert apart.stack.profile_count == 4
    assert apart.reading.files[0].remarks == ("read 2031-05-14",)


def test_profiles_without_time_are_kept_at_the_end() -> None:
    time = np.array(["NaT", "NaT", "2031-05-14"], dtype="datetime64[ns]")
    found = series(Reading((record("2031-05-14", 3, time=time),), ()))
    assert np.isnat(found.stack.time).tolist() == [False, True, True]


def clock(*hours: float, day: str = "2031-10-26") -> np.ndarray:
    minutes = np.array([60 * hour + m for hour in hours for m in range(0, 60, 10)])
    return np.datetime64(day, "ns") + minutes.astype("timedelta64[m]")


@pytest.mark.parametrize("fixed", [False, True])
def test_a_repeated_hour_is_seen(fixed) -> None:
    problem = clock_change(clock(0, 1, 2, 2, 3, 4), fixed)
    assert problem is not None
    assert "the hour from 2031-10-26 02:00 on stands twice" in problem.problem


def test_a_missing_hour_is_seen_on_the_days_of_the_change_only() -> None:
    spring = clock(0, 1, 3, 4, 5, day="2031-03-30")
    problem = clock_change(spring, False)
    assert problem is not None
    assert "an hour is missing after 2031-03-30 01:50" in problem.problem
    assert clock_change(spring, True) is None
    assert clock_change(clock(0, 1, 3, 4, day="2031-03-29"), False) is None  # a Saturday
    assert clock_change(clock(0, 1, 3, 4, day="2031-06-29"), False) is None  # June
    assert clock_change(clock(6, 7, 9, 10, day="2031-03-30"), False) is None  # in the morning
    assert clock_change(clock(0, 1, 4, 5, day="2031-03-30"), False) is None  # two hours


def test_what_is_no_change_of_a_clock_passes() -> None:
    assert clock_change(clock(0, 1, 2, 3), False) is None
    assert clock_change(clock(3, 2, 1, 0), False) is None
    # The same day twice is a duplicate, of which the record keeps one.
    assert clock_change(np.concatenate([clock(0, 1, 2)] * 2), False) is None
    assert clock_change(np.array(["NaT"] * 5, dtype="datetime64[ns]"), False) is None
    assert clock_change(clock(0)[:1], False) is None


def test_a_refused_file_is_a_failure_and_the_others_go_on() -> None:
    bad = record("2031-10-26", 36, time=clock(0, 1, 2, 2, 3, 4))
    found = series(Reading((bad, record("2031-05-14", 2)), ()))
    assert found.stack.profile_count == 2
    assert str(found.reading.failures[0]).startswith("2031-10-26: the hour from 2031-10-26 02:00")
    none = series(Reading((bad,), ()))
    assert none.reading.files == ()
    assert none.stack.profile_count == 0


def test_the_hour_is_told_in_the_clock_of_the_file() -> None:
    shifted = clock(0, 1, 2, 2, 3, 4) - np.timedelta64(3600, "s")
    found = series(Reading((record("2031-10-26", 36, time=shifted),), ()), utc_offset=1.0)
    assert "the hour from 2031-10-26 02:00" in str(found.reading.failures[0])
