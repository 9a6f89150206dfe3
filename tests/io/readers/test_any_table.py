"""Any columns under any names give profiles or one line of what is wrong: never anything else."""

from __future__ import annotations

import tomllib
from importlib import resources

import numpy as np
from hypothesis import example, given, settings
from hypothesis import strategies as st

from backveer.io.readers.columns import understand
from backveer.io.readers.errors import ReadError
from backveer.io.readers.reading import Hints
from backveer.io.readers.table import Table
from backveer.profiles.quality import check
from backveer.profiles.stack import Stack

SPELLED = tomllib.loads(
    resources.files("backveer.io.readers").joinpath("spellings.toml").read_text("utf-8")
)
NAMES = sorted(
    {
        name
        for spelled in SPELLED["columns"].values()
        for names in spelled.values()
        for name in names
    }
)
UNITS = ["m", "ft", "gpm", "kt", "m/s", "hPa", "C", "F", "rad", "%", "g/kg", "FL", "UTC", "furlong"]
WORDS = ["", "abc", "2031-05-14T23:15Z", "03/04/2031", "23:15", "58.4N", "1e400", "VRB", "２３"]
SAID = ["58.41 N", "95", "O 3,05", "520 m", "1e9 m", "nan", "14.05.2031 25:99", "2031-05-14", ""]
KEYS = ["Latitude", "Longitude", "Elevation", "Launch", "Date", "Hour", "Time zone", "Position"]
ODD = [np.nan, np.inf, -np.inf, 0.0, -999.0, 9999.0, 1e300, -1e300, 5e-324, 360.0, 1.0, 2.0]
WHOLE = [
    ("Height AGL (m)", "Speed (m/s)", "Dir (deg)"),
    ("p (hPa)", "T (C)", "u (m/s)", "v (m/s)"),
    ("height", "pres", "ff (kt)", "dd"),
    ("ws_40 (m/s)", "wd_40", "ws_80 (m/s)", "wd_80"),
    ("FL", "u", "v", "ff (kt)", "dd"),
    ("z", "temp", "ws", "wd", "u (m/s)", "v (m/s)"),
]


def columns(rows: int):
    return st.one_of(
        st.lists(st.sampled_from(ODD), min_size=rows, max_size=rows).map(np.array),
        st.lists(st.sampled_from(WORDS), min_size=rows, max_size=rows).map(
            lambda words: np.array(words, dtype=object)
        ),
        st.tuples(st.sampled_from([1.0, 30.0, 400.0, 3e3, 1e5]), st.integers(0, 99)).map(
            lambda drawn: np.random.default_rng(drawn[1]).uniform(-1.0, drawn[0], rows)
        ),
        st.sampled_from([20.0, 1000.0, 5000.0, -800.0]).map(
            lambda top: np.linspace(1.0, 1.0 + top, rows)
        ),
    ).map(lambda column: column.astype(float) if column.dtype != object else column)


@st.composite
def tables(draw) -> Table:
    rows = draw(st.sampled_from([0, 1, 2, 3, 8, 20]))
    header = list(draw(st.sampled_from(WHOLE)))
    for _ in range(draw(st.integers(0, 3))):
        name, unit = draw(st.sampled_from(NAMES)), draw(st.sampled_from(["", *UNITS]))
        header.append(f"{name} ({unit})" if unit else name)
    metadata = draw(st.lists(st.tuples(st.sampled_from(KEYS), st.sampled_from(SAID)), max_size=3))
    return Table(
        source="any.csv",
        header=tuple(header),
        units=(),
        columns=tuple(draw(columns(rows)) for _ in header),
        lines=np.arange(2, 2 + rows),
        metadata=tuple(metadata),
        remarks=(),
        encoding="utf-8",
        delimiter=",",
        decimal=".",
    )


TINY = Table(  # u and v so small that the ratio of the speed to them overflows
    "tiny.csv", ("z", "ws", "wd", "u (m/s)", "v (m/s)"), (),
    (np.array([10.0, 20.0]), np.array([18.0, 19.0]), np.array([10.0, 20.0]), np.zeros(2),
     np.full(2, 5e-324)), np.array([2, 3]), (), (), "utf-8", ",", ".",
)  # fmt: skip


@settings(max_examples=300, deadline=None)
@example(TINY, Hints())
@given(
    tables(),
    st.sampled_from(
        [Hints(), Hints(elevation=5.0), Hints(latitude=4.0, longitude=9.0, time="2031-01-01")]
    ),
)
def test_any_table_gives_profiles_or_a_read_error(table, hints):
    failure: ReadError | None = None
    try:
        draft = understand(table, hints)
    except ReadError as error:
        failure = error
    if failure is not None:
        assert "\n" not in str(failure)
        assert failure.problem
        assert failure.remedy
        return
    stack = check(Stack.of(**draft.levels, **draft.profile))
    assert np.isfinite(stack.eastward_wind).any()
    assert [column.column for column in draft.columns] == list(table.header)
    assert all(column.why for column in draft.columns)
    assert all(column.unit is None for column in draft.columns if column.read_as is None)
    assert not any(remark.endswith(".") or "\n" in remark for remark in draft.remarks)
