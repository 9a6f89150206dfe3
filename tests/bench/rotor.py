"""
A year of ten-minute profiles with 20 gates, file to climatology, against pandas.read_csv alone.

    python tests/bench/rotor.py [YEARS]

Each in a process of its own, once imports are done; time is the best of three, memory what the
process holds at most beyond what it held before.
"""

from __future__ import annotations

import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

GATES = np.arange(40, 240, 10)
RUNS = 3


def write(path: Path, years: int) -> None:
    """Write an invented record: speed, direction, deviation and availability by height."""
    random = np.random.default_rng(20310514)
    count = 52560 * years
    start = np.datetime64("2031-01-01T00:00")
    stamps = np.datetime_as_string(start + np.arange(count) * np.timedelta64(10, "m"), unit="s")
    day = np.arange(count) / 144.0
    hub = np.abs(9.0 + 4.0 * np.sin(2.0 * np.pi * day / 5.3) + random.normal(0.0, 1.0, count))
    veer = 6.0 + 8.0 * np.cos(2.0 * np.pi * (day - 0.1)) + random.normal(0.0, 2.0, count)
    names = [f"{kind}_{z} ({unit})" for z in GATES for kind, unit in (("ws", "m/s"), ("wd", "deg"))]
    with path.open("w") as out:
        out.write(",".join(["time_utc", *names]) + "\n")
        for block in range(0, count, 52560):
            rows = slice(block, block + 52560)
            size = (52560, GATES.size)
            speed = hub[rows, None] * (GATES / 119.0) ** 0.2 + random.normal(0.0, 0.1, size)
            turn = 250.0 + veer[rows, None] * (GATES - 119.0) / 171.0
            direction = (turn + random.normal(0.0, 0.6, size)) % 360.0
            whole = np.stack([np.abs(speed), direction], axis=2).reshape(52560, -1)
            lines = (",".join(f"{x:.2f}" for x in row) for row in whole)
            out.writelines(f"{t},{line}\n" for t, line in zip(stamps[rows], lines, strict=True))


def ours(path: str) -> float:
    """Time from the file to veer by hour, month and speed of one turbine. [s]"""
    from backveer.io.command.rotor import _fitted, _told
    from backveer.io.readers.door import read
    from backveer.io.readers.series import series
    from backveer.profiles.rotor import Turbine
    from backveer.profiles.rotor_climate import Over, rotor_climate

    begin = time.perf_counter()
    stack = series(read(path)).stack
    _fit, _coriolis, error = _fitted(stack, False, None)
    told = _told(stack, [Turbine("A", 119.0, 171.0)], 0.78, 5, False, None, error)
    found = rotor_climate(stack, told, 0, Over(by=("hour", "month", "speed")))
    spent = time.perf_counter() - begin
    assert found.tables[0].count[0] == stack.profile_count
    return spent


def alone(path: str) -> float:
    """Time of pandas.read_csv alone. [s]"""
    import pandas

    begin = time.perf_counter()
    pandas.read_csv(path)
    return time.perf_counter() - begin


def main() -> None:
    """Print times, their ratio, and memory against the size of the file."""
    years = int(sys.argv[1]) if len(sys.argv) > 1 else 1
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "record.csv"
        write(path, years)
        size = path.stat().st_size / 1e6
        print(f"{years} a of ten-minute profiles with {GATES.size} gates: {size:.1f} MB")
        found = {}
        for what in ("alone", "ours"):
            told = [
                subprocess.run(
                    [sys.executable, __file__, what, str(path)],
                    check=True,
                    capture_output=True,
                    text=True,
                ).stdout.split()
                for _ in range(RUNS)
            ]
            spent = min(float(each[0]) for each in told)
            held = min(float(each[1]) for each in told)
            found[what] = spent
            print(f"{what:6} {spent:7.3f} s  {held:7.1f} MB = {held / size:.1f} times the file")
        print(f"ratio {found['ours'] / found['alone']:.2f}")


def measure(what: str, path: str) -> None:
    """Print time [s] and memory [MB] of one of the two in this process."""
    import pandas  # noqa: F401  (what both import is not counted)

    import backveer.io.command.rotor
    import backveer.io.readers.door
    import backveer.profiles.rotor_climate  # noqa: F401

    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    spent = {"ours": ours, "alone": alone}[what](path)
    held = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before
    print(spent, held * 1024 / 1e6)


if __name__ == "__main__":
    if len(sys.argv) == 3:
        measure(sys.argv[1], sys.argv[2])
    else:
        main()
