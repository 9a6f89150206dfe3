import numpy as np
import pytest

from backveer.profiles.classes import (
    STABILITY,
    bulk_richardson_between,
    by_hour,
    by_month,
    by_range,
    by_season,
    by_sector,
    by_speed,
    by_stability,
    complete_record,
    everything,
    usual_interval,
)
from backveer.profiles.stack import Stack


def times(*words):
    return np.array(words, dtype="datetime64[ns]")


def test_clock_in_utc_and_at_the_place():
    time = times("2031-12-31T23:40", "2032-01-01T00:10", "NaT", "1969-07-20T20:17")
    assert by_hour(time).index.tolist() == [23, 0, -1, 20]
    assert by_hour(time, utc_offset=5.5).index.tolist() == [5, 5, -1, 1]
    assert [by_month(time).names[i] for i in (11, 0, 6)] == ["Dec", "Jan", "Jul"]
    assert by_month(time).index.tolist() == [11, 0, -1, 6]
    assert by_month(time, utc_offset=1.0).index.tolist() == [0, 0, -1, 6]


def test_seasons():
    time = np.datetime64("2031-01", "M") + np.arange(12)
    told = by_season(time.astype("datetime64[ns]"))
    names = [told.names[i] for i in told.index]
    assert names == ["DJF"] * 2 + ["MAM"] * 3 + ["JJA"] * 3 + ["SON"] * 3 + ["DJF"]


def test_what_a_complete_record_would_have():
    whole = np.datetime64("2031-03-01T00:00", "ns") + np.arange(3 * 144) * np.timedelta64(10, "m")
    kept = np.delete(whole, np.arange(100, 250))
    assert by_hour(kept).expected.tolist() == [18] * 24
    assert everything(kept).expected.tolist() == [432]
    assert usual_interval(kept[::-1]) == np.timedelta64(600, "s")
    # A shift of the clock moves the profiles and what is expected alike.
    assert by_month(kept, utc_offset=-1.0).expected[[1, 2]].tolist() == [6, 426]
    assert everything(kept, np.timedelta64(5, "m")).expected.tolist() == [863]


def test_irregular_times_expect_nothing_more():
    time = times("2031-01-01T00:00", "2031-01-01T00:00:00.000000001", "2041-01-01T00:00")
    assert complete_record(time).size == 3
    assert complete_record(times("NaT")).size == 0
    assert everything(times()).expected.tolist() == [0]
    with pytest.raises(ValueError, match="interval between profiles must be positive"):
        complete_record(time, np.timedelta64(0, "s"))


@pytest.mark.parametrize("sectors", [12, 16, 36])
def test_sectors_are_centred_on_north(sectors):
    width = 360.0 / sectors
    middles = np.arange(sectors) * width
    nudge = 0.5 * width - 1e-9
    for shift in (-nudge, 0.0, nudge, 360.0):
        assert by_sector(middles + shift, sectors).index.tolist() == list(range(sectors))
    assert by_sector(np.array([np.nan, np.inf, 359.999999]), sectors).index.tolist() == [-1, -1, 0]


def test_sector_names():
    assert by_sector(np.array([90.0]), 16).names[4] == "E"
    assert by_sector(np.array([90.0]), 36).names[9] == "090"
    with pytest.raises(ValueError, match="13 direction sectors are not offered"):
        by_sector(np.array([90.0]), 13)


def test_speed_bins_of_the_standard():
    """IEC 61400-12-1: 0.5 m/s, centred on multiples of 0.5 m/s."""
    told = by_speed(np.array([0.0, 0.2499, 0.25, 7.7499, 7.75, np.nan, 80.0, -1.0, np.inf]))
    assert [told.names[i] if i >= 0 else "" for i in told.index] == [
        "0.0", "0.0", "0.5", "7.5", "8.0", "", "", "", "",
    ]  # fmt: skip
    assert by_speed(np.array([np.nan])).names == ("0.0",)
    assert by_speed(np.array([3.2]), width=0.25).names[-1] == "3.25"
    with pytest.raises(ValueError, match=r"bin of 0\.0 m/s"):
        by_speed(np.array([1.0]), width=0.0)


def test_ranges():
    told = by_range(np.array([-np.inf, 0.0, 9.9, 10.0, np.inf, np.nan]), [0.0, 10.0], "veer")
    assert told.index.tolist() == [0, 1, 1, 2, 2, -1]
    assert told.kind == "veer"
    with pytest.raises(ValueError, match=r"edges of veer must increase, not \[10.0, 0.0\]"):
        by_range(np.array([1.0]), [10.0, 0.0], "veer")


def test_richardson_number_of_a_textbook():
    """
    Stull, 2017: Practical Meteorology (checks B1, S2): 0.226 with 9.8 K/km recomputed 0.2256.

    Levels 5.0 and 5.5 km, -20 and -23 degC, wind (40, 8) and (50, 0) m/s.
    """
    stack = Stack.of(
        height=[5000.0, 5500.0], air_temperature=[253.15, 250.15],
        eastward_wind=[40.0, 50.0], northward_wind=[8.0, 0.0],
    )  # fmt: skip
    told = bulk_richardson_between(stack, 5000.0, 5500.0)
    assert told[0] == pytest.approx(0.226, abs=5e-4)


def test_stability_classes():
    """Winds and temperatures made so that z/L is known: z the logarithmic mean of 40 and 160 m."""
    z = 120.0 / np.log(4.0)
    lengths = np.array([-60.0, -150.0, -300.0, 1e4, 300.0, 100.0, 20.0])
    ratio = z / lengths
    ri = np.where(ratio < 0, ratio, ratio / (1.0 + 5.0 * ratio))
    shear = 2.0
    stratified = ri * shear**2 / 120.0 * 290.0 / 9.80665
    # The mean temperature is 290 K whatever the difference.
    change = stratified - 0.0098 * 120.0
    stack = Stack.of(
        height=[40.0, 160.0],
        air_temperature=np.stack([290.0 - change / 2, 290.0 + change / 2], axis=1),
        eastward_wind=[5.0, 7.0], northward_wind=0.0,
    )  # fmt: skip
    told = by_stability(stack, 40.0, 160.0)
    assert [STABILITY[i] for i in told.index] == list(STABILITY)
    cold = Stack.of(height=[40.0, 160.0], eastward_wind=[5.0, 7.0], northward_wind=0.0)
    assert by_stability(cold, 40.0, 160.0).index.tolist() == [-1]
    assert by_stability(stack, 20.0, 160.0).index.tolist() == [-1] * 7
    with pytest.raises(ValueError, match="0 < base < top"):
        by_stability(stack, 160.0, 40.0)


def test_no_shear_is_as_stable_or_unstable_as_can_be():
    stack = Stack.of(
        height=[40.0, 160.0], air_temperature=[[290.0, 293.0], [293.0, 290.0]],
        eastward_wind=5.0, northward_wind=0.0,
    )  # fmt: skip
    told = by_stability(stack, 40.0, 160.0)
    assert [STABILITY[i] for i in told.index] == ["very stable", "very unstable"]
