import numpy as np
import pytest

from backveer.profiles.block_bootstrap import block_length, resampling


def days(count, per_day=1):
    step = np.timedelta64(86400 // per_day, "s")
    return np.datetime64("2031-01-01T00:00", "ns") + np.arange(count * per_day) * step


def persistent(random, shape, memory):
    """First-order autoregressive series along the last axis, of unit innovation."""
    x = random.normal(size=shape)
    x[..., 0] /= np.sqrt(1.0 - memory**2)
    for i in range(1, shape[-1]):
        x[..., i] += memory * x[..., i - 1]
    return x


def mean_interval(time, values, **settings):
    drawn = resampling(time, values, **settings)
    group = np.zeros(values.size, dtype=int)
    low, high = drawn.interval(drawn.by_day(group, 1, values), drawn.by_day(group, 1))
    return low[0], high[0]


def test_blocks_grow_with_memory():
    random = np.random.default_rng(2)
    lengths = [
        np.mean([block_length(row) for row in persistent(random, (50, 730), memory)])
        for memory in (0.0, 0.5, 0.8)
    ]
    # For an AR(1) the rule in its closed form: G/g(0) = 2 a / (1 - a^2), b = (1.5 n (G/g)^2)^(1/3).
    expected = [(1.5 * 730 * (2 * a / (1 - a * a)) ** 2) ** (1 / 3) for a in (0.5, 0.8)]
    assert lengths[0] < 4
    assert lengths[1:] == pytest.approx(expected, rel=0.25)


@pytest.mark.parametrize("series", [[], [1.0], [2.0] * 50, [1.0, 2.0, 3.0], list(range(40))])
def test_block_length_of_odd_series(series):
    assert 1 <= block_length(np.array(series, dtype=float)) <= 20


@pytest.mark.parametrize("count", [14, 200])
def test_interval_of_independent_days_is_the_usual_one(count):
    """Mean +- t s/sqrt(n), also for few days; scipy is the witness for t."""
    from scipy.stats import t

    x = np.random.default_rng(5).normal(3.0, 2.0, count)
    low, high = mean_interval(days(count), x, replicates=4000, block_days=1)
    half = t.ppf(0.975, count - 1) * x.std(ddof=1) / np.sqrt(count)
    assert [low, high] == pytest.approx([x.mean() - half, x.mean() + half], abs=0.06 * half)


def test_hours_of_a_day_are_not_independent():
    x = np.repeat(np.random.default_rng(6).normal(size=100), 24)
    low, high = mean_interval(days(100, 24), x, block_days=1, replicates=2000)
    assert high - low == pytest.approx(2 * 1.984 * x.std() / 10.0, rel=0.08)


@pytest.mark.slow
@pytest.mark.parametrize(("memory", "length"), [(0.0, 365), (0.5, 365), (0.5, 900), (0.8, 730)])
def test_intervals_cover_the_truth(memory, length):
    random = np.random.default_rng(9)
    series = persistent(random, (400, length), memory)
    hits = 0
    for row, x in enumerate(series):
        low, high = mean_interval(days(length), x, replicates=400, seed=row)
        hits += low < 0.0 < high
    # 95 % asked for; three standard errors of 400 trials are 3 %, and blocks lose a little.
    assert 0.89 <= hits / 400 <= 0.985


def test_seed_and_batches():
    x = np.random.default_rng(7).normal(size=60)
    first = mean_interval(days(60), x, seed=3)
    assert first == mean_interval(days(60), x, seed=3)
    assert first != mean_interval(days(60), x, seed=4)
    assert mean_interval(days(60), x, confidence=0.5)[0] > first[0]
    drawn = resampling(days(60), x, replicates=450, block_days=6)
    assert drawn.drawn.shape == (450, 60)
    assert (drawn.drawn.sum(axis=1) == 60).all()


def test_short_records_get_no_interval():
    x = np.random.default_rng(7).normal(size=60)
    assert np.isnan(mean_interval(days(60), x, block_days=7)).all()
    assert np.isnan(mean_interval(days(9), x[:9])).all()
    assert np.isnan(mean_interval(days(0), x[:0])).all()
    assert np.isfinite(mean_interval(days(60), x, block_days=6)).all()


def test_missing_times_and_values():
    time, x = days(60), np.random.default_rng(7).normal(size=60)
    gone = x.copy()
    gone[10:13] = np.nan
    drawn = resampling(time, gone)
    group = np.where(np.isfinite(gone), 0, -1)
    low, high = drawn.interval(drawn.by_day(group, 1, gone), drawn.by_day(group, 1))
    assert low[0] < np.nanmean(gone) < high[0]
    time = np.append(time, np.datetime64("NaT"))
    later = resampling(time, np.append(gone, 1e9))
    np.testing.assert_array_equal(later.drawn, drawn.drawn)
    assert later.day[-1] == -1


@pytest.mark.parametrize(
    ("settings", "words"),
    [
        ({"confidence": 1.0}, "confidence lies between 0 and 1, not 1.0"),
        ({"block_days": 0}, "at least one day, not 0"),
    ],
)
def test_refused_settings(settings, words):
    with pytest.raises(ValueError, match=words):
        resampling(days(20), np.zeros(20), **settings)
