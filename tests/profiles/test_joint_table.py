import numpy as np
import pytest

from backveer.profiles.classes import by_range, by_speed
from backveer.profiles.joint_table import joint


def test_joint_table_of_veer_and_speed():
    veer = np.array([-5.0, 3.0, 12.0, 12.0, np.nan, 4.0])
    speed = np.array([4.1, 4.1, 4.1, 0.0, 4.0, np.nan])
    told = joint(by_range(veer, [0.0, 10.0], "veer"), by_speed(speed, 1.0))
    assert told.count.tolist() == [[0, 0, 0, 0, 1], [0, 0, 0, 0, 1], [1, 0, 0, 0, 1]]
    assert told.share.sum() == pytest.approx(1.0)
    assert told.recovery == pytest.approx(4 / 6)
    assert (told.row_kind, told.column_kind) == ("veer", "speed")
    assert told.to_pandas().loc[">= 10", "4.0"] == pytest.approx(0.25)
    assert told.to_xarray()["count"].dims == ("row", "column")


def test_joint_tables_refuse_other_profiles():
    a, b = by_speed(np.zeros(3)), by_speed(np.zeros(4))
    with pytest.raises(ValueError, match="speed has 3 profiles, speed 4"):
        joint(a, b)
    empty = joint(by_speed(np.zeros(0)), by_speed(np.zeros(0)))
    assert np.isnan(empty.share).all()
    with pytest.raises(ValueError, match="not 'column'"):
        empty.to_pandas("column")
