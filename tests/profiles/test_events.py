import itertools

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles.events import events

START = np.datetime64("2031-05-14T00:00", "ns")
TEN = np.timedelta64(10, "m")


def at(*steps):
    return START + np.array(steps, dtype=int) * TEN


def test_runs_with_their_peaks():
    told = events(at(*range(8)), np.array([1.0, 11, 14, 12, 2, 20, 20, 3]), 10.0)
    assert (told.begin == at(1, 5)).all()
    assert (told.end == at(4, 7)).all()
    assert told.duration.tolist() == [1800.0, 1200.0]
    assert told.count.tolist() == [3, 2]
    assert told.peak.tolist() == [14.0, 20.0]
    assert (told.peak_time == at(2, 5)).all()
    assert not told.cut.any()
    assert told.recovery == 1.0
    assert len(told.to_pandas()) == 2
    assert told.to_xarray()["duration"].attrs["units"] == "s"


def test_negative_threshold_looks_below():
    told = events(at(*range(4)), np.array([-1.0, -11.0, -14.0, 30.0]), -10.0)
    assert told.duration.tolist() == [1200.0]
    assert told.peak.tolist() == [-14.0]


def test_gap_breaks_or_is_bridged():
    time, x = at(0, 1, 2, 5, 6, 7), np.array([1.0, 20, 20, 20, 20, 1])
    broken = events(time, x, 10.0)
    assert broken.duration.tolist() == [1200.0, 1200.0]
    assert broken.cut.tolist() == [True, True]
    assert broken.recovery == pytest.approx(6 / 8)
    for minutes, runs in ((19, 2), (20, 1)):  # two profiles are missing
        told = events(time, x, 10.0, bridge=np.timedelta64(minutes, "m"))
        assert told.duration.size == runs
    assert told.duration.tolist() == [3600.0]
    assert told.cut.tolist() == [False]
    # A missing value is a gap like a missing time.
    filled = np.array([1.0, 20, 20, np.nan, np.nan, 20, 20, 1])
    same = events(at(*range(8)), filled, 10.0, bridge=np.timedelta64(20, "m"))
    assert same.duration.tolist() == [3600.0]


def test_a_calm_value_is_no_gap_to_bridge():
    told = events(at(0, 1, 2), np.array([20.0, 1.0, 20.0]), 10.0, bridge=np.timedelta64(1, "D"))
    assert told.count.tolist() == [1, 1]
    assert told.cut.tolist() == [True, True]


def test_order_of_the_record_does_not_matter():
    random = np.random.default_rng(4)
    time, x = at(*range(200)), random.normal(size=200)
    shuffled = random.permutation(200)
    a, b = events(time, x, 0.5), events(time[shuffled], x[shuffled], 0.5)
    assert (a.begin == b.begin).all()
    assert (a.peak == b.peak).all()


@given(st.lists(st.sampled_from([np.nan, -1.0, 0.5, 2.0, 3.0]), max_size=30))
def test_against_a_walk_through_the_record(values):
    """Group by group with itertools: gaps break runs."""
    x = np.array(values, dtype=float)
    told = events(at(*range(x.size)) if x.size else at(), x, 1.0, interval=TEN)
    runs = [list(run) for high, run in itertools.groupby(values, lambda v: v > 1.0) if high]
    assert told.count.tolist() == [len(run) for run in runs]
    assert told.peak.tolist() == [max(run) for run in runs]
    assert told.duration.tolist() == [600.0 * len(run) for run in runs]


def test_refused_records():
    with pytest.raises(ValueError, match="time 2031-05-14T00:10:00 occurs twice"):
        events(at(0, 1, 1, 2), np.zeros(4), 1.0)
    with pytest.raises(ValueError, match="must be positive"):
        events(at(0, 1), np.zeros(2), 1.0, interval=np.timedelta64(0, "s"))
    with pytest.raises(ValueError, match="3 values do not fit 2 times"):
        events(at(0, 1), np.zeros(3), 1.0)
    with pytest.raises(ValueError, match="row for each event, not 'profile'"):
        events(at(0, 1), np.zeros(2), 1.0).to_pandas("profile")


def test_nothing_and_a_single_profile():
    assert events(at()[:0], np.zeros(0), 1.0).duration.size == 0
    assert np.isnan(events(np.array(["NaT"], dtype="datetime64[ns]"), np.ones(1), 0.0).recovery)
    told = events(at(0), np.array([5.0]), 1.0)
    assert (told.count.tolist(), told.duration.tolist(), told.cut.tolist()) == ([1], [0.0], [True])
