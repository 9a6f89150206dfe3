"""A long table of line-of-sight velocities through the door: the wind behind it, what is said."""

from __future__ import annotations

import numpy as np
import pytest

from backveer.io.readers.door import read_bytes
from backveer.profiles.stack import wind_components

HEAD = "time_utc,azimuth (deg),elevation (deg),range (m),radial velocity (m/s),cnr (dB)\n"
AZIMUTH = np.arange(0.0, 360.0, 30.0)
RANGE = np.array([80.0, 120.0, 160.0])
SLOPE = np.radians(60.0)


def wind(scan, gate):
    return wind_components(np.array(6.0 + gate + 0.5 * scan), np.array(240.0 + 5.0 * gate + scan))


def table(scans=3, head=HEAD, elevation=60.0, change=lambda scan, azimuth, gate, row: row):
    lines = [head]
    for scan in range(scans):
        for beam, azimuth in enumerate(AZIMUTH):
            for gate, distance in enumerate(RANGE):
                u, v = wind(scan, gate)
                angle = np.radians(azimuth)
                seen = (u * np.sin(angle) + v * np.cos(angle)) * np.cos(np.radians(elevation))
                row = [f"2031-05-14 00:{10 * scan:02d}:{beam:02d}", f"{azimuth:.1f}",
                       f"{elevation:.1f}", f"{distance:g}", f"{seen:.4f}", "-12.5"]  # fmt: skip
                row = change(scan, azimuth, gate, row)
                if row is not None:
                    lines.append(",".join(row) + "\n")
    return "# Station: Harrow Skerry\n# Latitude: 58.4\n" + "".join(lines)


def read(text):
    return read_bytes("scans.csv", text.encode())


def test_each_scan_becomes_a_profile() -> None:
    reading = read(table())
    assert not reading.failures, str(reading.failures[0])
    stack = reading.stack
    assert stack.profile_count == 3
    np.testing.assert_allclose(stack.height, np.tile(RANGE * np.sin(SLOPE), (3, 1)))
    for scan in range(3):
        for gate in range(3):
            u, v = wind(scan, gate)
            assert stack.eastward_wind[scan, gate] == pytest.approx(float(u), abs=2e-4)
            assert stack.northward_wind[scan, gate] == pytest.approx(float(v), abs=2e-4)
    assert stack.time.astype("datetime64[s]").astype(str).tolist() == [
        "2031-05-14T00:00:00", "2031-05-14T00:10:00", "2031-05-14T00:20:00",
    ]  # fmt: skip
    assert (stack.latitude == 58.4).all()
    assert stack.station[0] == "Harrow Skerry"
    (file,) = reading.files
    assert [column.read_as for column in file.columns] == [
        "time", "azimuth", "elevation", "range", "radial_velocity", "quality",
    ]  # fmt: skip
    assert any("positive away from the instrument" in remark for remark in file.remarks)


def test_units_are_converted_and_a_speed_without_one_is_refused() -> None:
    knots = table(head=HEAD.replace("(m/s)", "(kt)"))
    plain = read(table()).stack
    np.testing.assert_allclose(read(knots).stack.wind_speed, plain.wind_speed * 1852.0 / 3600.0)
    failure = read(table(head=HEAD.replace(" (m/s)", ""))).failures[0]
    assert 'the unit of column "radial velocity" is not known' in str(failure)
    assert '--unit "radial velocity=m/s"' in str(failure)


def test_weak_signals_and_missing_beams_do_not_count() -> None:
    def spoil(scan, azimuth, gate, row):
        if scan == 0 and azimuth in (30.0, 60.0):
            return [*row[:4], "55.0", "-40"]
        if scan == 1 and azimuth == 90.0:
            return None
        if scan == 2 and azimuth < 180.0:
            return [*row[:4], "-999", row[5]]
        return row

    reading = read(table(change=spoil))
    stack = reading.stack
    u, _ = wind(0, 1)
    assert stack.eastward_wind[0, 1] == pytest.approx(float(u), abs=2e-4)
    assert stack.availability[0, 1] == pytest.approx(10 / 12)
    u, _ = wind(1, 1)
    assert stack.eastward_wind[1, 1] == pytest.approx(float(u), abs=2e-4)
    assert np.isnan(stack.eastward_wind[2]).all()
    assert any(
        remark.startswith("3 of 9 fits withheld, most because the azimuths leave too wide a gap")
        for remark in reading.files[0].remarks
    )


def test_numbers_of_scans_tell_them_apart() -> None:
    head = HEAD.replace("cnr (dB)", "scan,valid")

    def numbered(scan, azimuth, gate, row):
        return [*row[:5], str(7 + scan), "1"]

    assert read(table(head=head, change=numbered)).stack.profile_count == 3


def test_a_single_gate_is_no_profile() -> None:
    text = table(change=lambda scan, azimuth, gate, row: row if gate == 0 else None)
    assert "there is a single range gate" in str(read(text).failures[0])


def test_without_quality_it_is_said() -> None:
    head = HEAD.replace(",cnr (dB)", "")
    text = table(head=head, change=lambda scan, azimuth, gate, row: row[:5])
    assert any("no quality of the signal" in remark for remark in read(text).files[0].remarks)
