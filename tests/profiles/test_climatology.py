import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from backveer.profiles import climatology
from backveer.profiles.block_bootstrap import resampling
from backveer.profiles.classes import Classes, by_hour, by_range, everything
from backveer.profiles.climatology import climate, direction_climate
from backveer.profiles.stack import wind_components


def sample(seed=0, profiles=900, groups=7):
    random = np.random.default_rng(seed)
    values = random.normal(4.0, 9.0, profiles).round(1)  # rounding makes ties
    values[random.random(profiles) < 0.1] = np.nan
    index = random.integers(-1, groups, profiles)
    index[index == 3] = 2  # a class that nobody is in
    return (
        values,
        Classes("side", tuple("abcdefg"[:groups]), index),
        random.weibull(2, profiles) * 9,
    )


def test_against_numpy_class_by_class():
    """numpy's own percentiles, means and deviations are the witness."""
    values, classes, speed = sample()
    density = 1.0 + np.arange(values.size) / 3000.0
    told = climate(
        values, classes, speed, density, percentiles=range(1, 100), thresholds=[10.0, -5.0]
    )
    for place in range(7):
        member = (classes.index == place) & np.isfinite(values)
        x = values[member]
        assert told.count[place] == x.size
        assert told.expected[place] == (classes.index == place).sum()
        if place == 3:
            continue
        assert told.recovery[place] == x.size / (classes.index == place).sum()
        assert told.mean[place] == pytest.approx(x.mean(), rel=1e-12)
        assert told.deviation[place] == pytest.approx(x.std(ddof=1), rel=1e-12)
        assert told.median[place] == pytest.approx(np.median(x), rel=1e-12)
        np.testing.assert_allclose(
            told.percentile[place], np.percentile(x, range(1, 100)), atol=1e-12
        )
        assert told.beyond[place].tolist() == pytest.approx([(x > 10).mean(), (x < -5).mean()])
        wind = np.average(x, weights=speed[member])
        energy = np.average(x, weights=density[member] * speed[member] ** 3)
        assert told.wind_weighted_mean[place] == pytest.approx(wind, rel=1e-12)
        assert told.energy_weighted_mean[place] == pytest.approx(energy, rel=1e-12)


def test_empty_class_says_so():
    values, classes, speed = sample()
    told = climate(values, classes, speed, thresholds=[1.0])
    assert told.why[3] == climatology.NO_VALUE
    assert told.why[0] == climatology.NO_RESAMPLING
    figures = (told.mean, told.median, told.percentile, told.beyond, told.wind_weighted_mean)
    assert all(np.isnan(figure[3]).all() for figure in figures)
    assert np.isnan(told.recovery[3])
    assert told.count[3] == 0


def test_recovery_counts_what_is_missing_altogether():
    time = np.datetime64("2031-03-01T00:00", "ns") + np.arange(4 * 144) * np.timedelta64(10, "m")
    values = np.where(np.arange(time.size) % 6 == 0, np.nan, 1.0)
    there = np.ones(time.size, dtype=bool)
    there[144:288] = False
    told = climate(values[there], by_hour(time[there]))
    assert told.recovery == pytest.approx(np.full(24, 5 / 6 * 3 / 4))
    assert told.expected.tolist() == [24] * 24
    assert told.count.sum() == 360


def test_order_of_profiles_does_not_matter():
    values, classes, speed = sample(3)
    order = np.random.default_rng(1).permutation(values.size)
    mixed = Classes("side", classes.names, classes.index[order])
    a, b = climate(values, classes, speed), climate(values[order], mixed, speed[order])
    np.testing.assert_array_equal(a.percentile, b.percentile)
    np.testing.assert_allclose(a.energy_weighted_mean, b.energy_weighted_mean, rtol=1e-12)


@given(st.lists(st.floats(-1e6, 1e6), min_size=1, max_size=12))
def test_small_samples(values):
    x = np.array(values)
    told = climate(
        x, Classes("all", ("all",), np.zeros(x.size, dtype=int)), percentiles=[0, 37, 100]
    )
    np.testing.assert_allclose(told.percentile[0], np.percentile(x, [0, 37, 100]), atol=1e-9)
    assert np.isnan(told.deviation[0]) == (x.size == 1)


def test_hostile_values():
    x = np.array([np.inf, -np.inf, np.nan, 1e308, -1e308, 5e-324])
    one = Classes("all", ("all",), np.zeros(6, dtype=int))
    told = climate(
        x, one, speed=np.array([np.inf, np.nan, -1.0, 1e200, 2.0, 0.0]), thresholds=[0.0]
    )
    assert told.count[0] == 3
    none = climate(np.zeros(0), Classes("all", ("all",), np.zeros(0, dtype=int)))
    assert none.count.tolist() == [0]
    assert np.isnan(none.percentile).all()
    assert climate(np.zeros(0), Classes("none", (), np.zeros(0, dtype=int))).mean.size == 0


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"speed": np.zeros(4)}, r"speed has shape \(4,\), the classes \(3,\)"),
        ({"percentiles": [101.0]}, "percentiles lie between 0 and 100"),
        ({"values": np.zeros(2)}, r"values has shape \(2,\)"),
    ],
)
def test_refused(change, words):
    given_ = {"values": np.zeros(3), "classes": Classes("all", ("all",), np.zeros(3, dtype=int))}
    with pytest.raises(ValueError, match=words):
        climate(**{**given_, **change})


# -- intervals


def year(seed=0, days=200):
    random = np.random.default_rng(seed)
    time = np.datetime64("2031-01-01T00:00", "ns") + np.arange(days * 24) * np.timedelta64(1, "h")
    weather = np.repeat(random.normal(size=days) * 3.0, 24)
    return time, weather + random.normal(size=time.size) + 5.0, np.abs(weather + 9.0)


def test_intervals_enclose_their_figures():
    time, values, speed = year()
    drawn = resampling(time, values, replicates=500, seed=1)
    told = climate(
        values, by_hour(time), speed, percentiles=[5, 50, 95], thresholds=[6.0], resampling=drawn
    )
    for name in ("mean", "percentile", "beyond", "wind_weighted_mean", "energy_weighted_mean"):
        low, high = getattr(told, f"{name}_low"), getattr(told, f"{name}_high")
        assert (low < getattr(told, name)).all(), name
        assert (getattr(told, name) < high).all(), name
    # The scatter from day to day is 3.2 in each hour; 200 days give 1.96 * 3.2 / sqrt(200).
    width = told.mean_high - told.mean_low
    assert width == pytest.approx(np.full(24, 2 * 1.97 * 3.16 / np.sqrt(200.0)), rel=0.25)
    # For a normal distribution the median's is sqrt(pi/2) as wide.
    median = told.percentile_high[:, 1] - told.percentile_low[:, 1]
    assert (median / width).mean() == pytest.approx(np.sqrt(np.pi / 2), rel=0.15)
    assert (told.confidence, told.block_days, told.seed) == (0.95, drawn.block_days, 1)
    assert (told.why == "").all()


def test_rare_class_gets_no_interval():
    time, values, _speed = year()
    classes = by_range(np.where(np.arange(values.size) < 5 * 24, 1.0, 0.0), [0.5])
    told = climate(values, classes, resampling=resampling(time, values, replicates=100))
    assert told.why.tolist() == ["", climatology.FEW_DAYS]
    assert np.isfinite(told.mean).all()
    assert np.isnan([told.mean_low[1], told.mean_high[1], told.percentile_low[1, 0]]).all()


def test_a_value_that_most_share():
    """Seven tenths at one value, so that the median has no doubt and its interval no width."""
    time, values, _speed = year()
    values = np.where(np.random.default_rng(2).random(values.size) < 0.7, 5.0, values)
    told = climate(values, everything(time), percentiles=[50], resampling=resampling(time, values))
    assert [told.percentile_low[0, 0], told.percentile_high[0, 0]] == [5.0, 5.0]


# -- directions


def test_direction_through_north():
    classes = Classes("side", ("a", "b", "c"), np.array([0, 0, 0, 1, 1, -1]))
    told = direction_climate(np.array([350.0, 10.0, np.nan, 90.0, 270.0, 5.0]), classes)
    assert told.mean_direction[0] == pytest.approx(0.0, abs=1e-9) or told.mean_direction[
        0
    ] == pytest.approx(360.0)
    assert told.concentration == pytest.approx([np.cos(np.radians(10.0)), 0.0, np.nan], nan_ok=True)
    assert np.isnan(told.mean_direction[1:]).all()
    assert told.recovery[:2].tolist() == pytest.approx([2 / 3, 1.0])


def test_wind_weighted_direction_is_that_of_the_mean_vector():
    random = np.random.default_rng(1)
    direction, speed = random.normal(200.0, 40.0, 500) % 360, random.weibull(2, 500) * 8
    told = direction_climate(direction, Classes("all", ("all",), np.zeros(500, dtype=int)), speed)
    u, v = (x.mean() for x in wind_components(speed, direction))
    assert told.wind_weighted_mean_direction[0] == pytest.approx(
        np.degrees(np.arctan2(-u, -v)) % 360
    )
    assert told.steadiness[0] == pytest.approx(np.hypot(u, v) / speed.mean())
    # For a wrapped normal the circular deviation is that of the normal.
    assert told.deviation[0] == pytest.approx(40.0, rel=0.1)


# -- hand-over


def test_tables():
    values, classes, speed = sample()
    told = climate(values, classes, speed, percentiles=[5, 50], thresholds=[10.0, 20.0])
    table = told.to_pandas()
    assert table.index.tolist() == list("abcdefg")
    assert table.loc["b", "percentile_50"] == told.median[1]
    assert table.loc["b", "beyond_20"] == told.beyond[1, 1]
    dataset = told.to_xarray()
    assert dataset["percentile"].dims == ("group", "percentile_at")
    assert dataset.attrs["kind"] == "side"
    with pytest.raises(ValueError, match="row for each group, not 'profile'"):
        told.to_pandas("profile")
    assert len(direction_climate(values, classes).to_pandas()) == 7
