import numpy as np
import pytest

from backveer.profiles.flags import BIT
from backveer.profiles.interval_means import interval_means
from backveer.profiles.labels import labels
from backveer.profiles.stack import Stack, wind_components

START = np.datetime64("2031-05-14T00:00", "ns")


def fast(minutes, seed=0, **more):
    random = np.random.default_rng(seed)
    count = len(minutes)
    speed = 8.0 + random.normal(size=(count, 3))
    u, v = wind_components(speed, 270.0 + random.normal(0, 8, (count, 3)))
    time = START + (np.asarray(minutes) * 60e9).astype("timedelta64[ns]")
    return Stack.of(
        **{
            "height": [40.0, 80.0, 120.0],
            "eastward_wind": u,
            "northward_wind": v,
            "time": time,
            **more,
        }
    )


def test_vector_mean_and_deviation():
    stack = fast(np.arange(25))
    told = interval_means(stack)
    assert told.time.tolist() == (START + np.arange(3) * np.timedelta64(10, "m")).tolist()
    for run, rows in enumerate((slice(0, 10), slice(10, 20), slice(20, 25))):
        assert told.eastward_wind[run] == pytest.approx(stack.eastward_wind[rows].mean(axis=0))
        assert told.northward_wind[run] == pytest.approx(stack.northward_wind[rows].mean(axis=0))
        assert told.wind_speed_deviation[run] == pytest.approx(
            stack.wind_speed[rows].std(axis=0, ddof=1)
        )
    assert told.availability.tolist() == [[1.0] * 3, [1.0] * 3, [0.5] * 3]
    low = BIT["low_availability"]
    assert told.level_flag.tolist() == [[0] * 3, [0] * 3, [low] * 3]
    assert told.usable("wind").tolist() == [[True] * 3, [True] * 3, [False] * 3]
    lax = interval_means(stack, availability_limit=0.5)
    assert lax.usable("wind").all()


def test_direction_through_north():
    u, v = wind_components(np.full((2, 1), 6.0), np.array([[350.0], [20.0]]))
    stack = Stack.of(
        height=[40.0],
        eastward_wind=u,
        northward_wind=v,
        time=START + np.arange(2) * np.timedelta64(5, "m"),
    )
    told = interval_means(stack)
    assert told.wind_from_direction[0, 0] == pytest.approx(5.0)
    assert told.wind_speed[0, 0] == pytest.approx(6.0 * np.cos(np.radians(15.0)))


def test_missing_and_flagged_samples():
    stack = fast(np.arange(10))
    u = stack.eastward_wind.copy()
    u[:3, 1] = np.nan
    u[:, 2] = np.nan
    flag = np.zeros((10, 3), dtype=np.uint32)
    flag[0, 0] = BIT["wind_spike"]
    flag[:, 0] |= np.uint32(BIT["height_from_standard_atmosphere"])
    told = interval_means(stack.replace(eastward_wind=u, level_flag=flag))
    assert told.availability[0].tolist() == pytest.approx([0.9, 0.7, 0.0])
    assert told.level_flag[0].tolist() == [
        BIT["height_from_standard_atmosphere"], BIT["low_availability"], BIT["wind_missing"],
    ]  # fmt: skip
    assert told.eastward_wind[0, 0] == pytest.approx(u[1:, 0].mean())
    assert np.isnan(told.eastward_wind[0, 2])
    assert np.isnan(told.wind_speed_deviation[0, 2])


def test_own_availability_and_deviation_count():
    own = np.array([1.0, 0.5])[:, np.newaxis]
    stack = fast([0.0, 5.0], availability=own, wind_speed_deviation=0.7)
    told = interval_means(stack)
    assert told.availability[0] == pytest.approx([0.75] * 3)
    between = stack.wind_speed.var(axis=0, ddof=1)
    assert told.wind_speed_deviation[0] == pytest.approx(np.sqrt(between + 0.49))
    single = interval_means(stack.select(slice(0, 1)))
    assert single.wind_speed_deviation[0] == pytest.approx([0.7] * 3)
    assert np.isnan(interval_means(fast([0.0])).wind_speed_deviation).all()


def test_stamps_at_the_end():
    stack = fast(np.arange(1, 21))  # 00:01 to 00:20: two full intervals
    told = interval_means(stack, stamp="end")
    assert told.time.tolist() == (START + np.array([1, 2]) * np.timedelta64(10, "m")).tolist()
    assert (told.availability == 1.0).all()
    assert told.eastward_wind[0] == pytest.approx(stack.eastward_wind[:10].mean(axis=0))


def test_order_and_stations():
    stack = fast(np.tile(np.arange(20), 2), station=np.repeat(["a", "b"], 20).astype(object))
    told = interval_means(stack, sample_interval=np.timedelta64(1, "m"))
    assert told.station.tolist() == ["a", "b", "a", "b"]
    assert (told.availability == 1.0).all()
    mixed = np.random.default_rng(1).permutation(40)
    again = interval_means(stack.select(mixed), sample_interval=np.timedelta64(1, "m"))
    np.testing.assert_allclose(again.eastward_wind, told.eastward_wind, rtol=1e-12)
    alone = interval_means(stack.select(stack.station == "b"))
    np.testing.assert_allclose(told.eastward_wind[told.station == "b"], alone.eastward_wind)


def test_other_variables_are_averaged_too():
    t = 280.0 + np.arange(10.0)[:, np.newaxis]
    told = interval_means(fast(np.arange(10), air_temperature=t, latitude=np.full(10, 52.0)))
    assert told.air_temperature[0] == pytest.approx([284.5] * 3)
    assert told.latitude.tolist() == [52.0]
    assert told.height.tolist() == [[40.0, 80.0, 120.0]]
    for name, label in labels(Stack).items():
        assert getattr(told, name).shape == {1: (1,), 2: (1, 3)}[len(label.dims)]


def test_averages_of_averages():
    """Six ten-minute means of full availability make the hour that the samples make."""
    stack = fast(np.arange(60))
    hour = np.timedelta64(1, "h")
    np.testing.assert_allclose(
        interval_means(interval_means(stack), hour).eastward_wind,
        interval_means(stack, hour).eastward_wind,
        rtol=1e-12,
    )


def test_nothing():
    assert interval_means(Stack.of(profiles=0)).profile_count == 0
    lost = fast([0.0, 1.0]).replace(time=np.array(["NaT"] * 2, dtype="datetime64[ns]"))
    assert interval_means(lost).profile_count == 0


@pytest.mark.parametrize(
    ("settings", "words"),
    [
        ({"interval": np.timedelta64(7, "m")}, "do not fill a day"),
        ({"interval": np.timedelta64(0, "m")}, "do not fill a day"),
        ({"interval": np.timedelta64(30, "s")}, "every 60 s, more seldom than the averages"),
        ({"stamp": "middle"}, "not 'middle'"),
    ],
)
def test_refused_settings(settings, words):
    with pytest.raises(ValueError, match=words):
        interval_means(fast(np.arange(10)), **settings)


def test_levels_that_move_are_refused():
    z = np.array([40.0, 80.0, 120.0]) + np.arange(10.0)[:, np.newaxis]
    with pytest.raises(ValueError, match=r"level 0 moves by 9\.0 m within .* 2031-05-14T00:00:00"):
        interval_means(fast(np.arange(10), height=z))
