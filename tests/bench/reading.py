"""
Time `backveer turn` against importing and reading: how long a user waits beyond what must be.

    python tests/bench/reading.py [--smoke]

Three ratios, each of two things measured in turn in one run, the best of several: `backveer --help`
and one file of 500 levels from start to printed statement, both against importing pandas and
xarray, as whole processes; and `turn` over 2,000 small CSVs in one call against pandas.read_csv
alone on the same files, in one process after all imports. Asked for: at most 0.2, 1.25 and 4.
"""

from __future__ import annotations

import argparse
import io
import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from contextlib import redirect_stdout
from pathlib import Path

# One core on both sides; read by the libraries as they are imported, here and in the processes.
for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[name] = "1"
# Without cached bytecode the imports are all there is to see.
os.environ.pop("PYTHONDONTWRITEBYTECODE", None)

import numpy as np  # noqa: E402  (after its threads are settled)

SMALL, LARGE = 60, 500  # levels
COMMAND = [sys.executable, "-c", "from backveer.io.command import main; raise SystemExit(main())"]


def write(path: Path, levels: int, random: np.random.Generator) -> None:
    """Write an invented sounding, with its place in columns so that read_csv needs no help."""
    z = np.linspace(30.0, 40.0 * levels, levels) + random.uniform(0.0, 10.0, levels)
    decay = np.exp(-(1.0 + 1.0j) * z / random.uniform(200.0, 350.0))
    heading = np.exp(1j * random.uniform(0.0, 2.0 * np.pi))
    w = random.uniform(7.0, 16.0) * heading * (1.0 - random.uniform(0.5, 0.9) * decay)
    w = w + 0.3 * (random.normal(size=levels) + 1j * random.normal(size=levels))
    kelvin = 285.0 - 0.0065 * z
    hectopascal = 1011.0 * (kelvin / 285.0) ** 5.2559
    direction = np.degrees(np.arctan2(-w.real, -w.imag)) % 360.0
    place = "2031-05-14T11:15Z,58.41,-3.05,52"
    lines = [
        "time_utc,latitude,longitude,elevation (m),height above ground (m),pressure (hPa),"
        "temperature (C),dew point (C),wind direction (deg),wind speed (m/s)"
    ]
    columns = (z, hectopascal, kelvin - 273.15, kelvin - 276.35, direction, np.abs(w))
    for row in zip(*columns, strict=True):
        lines.append(f"{place}," + ",".join(f"{x:.1f}" for x in row))
    path.write_text("\n".join(lines) + "\n")


def process(words: list[str]) -> Callable[[], None]:
    """Return what runs a whole process, and fails if that does."""
    return lambda: subprocess.run(words, check=True, stdout=subprocess.DEVNULL) and None


def in_turn(runs: int, **jobs: Callable[[], object]) -> dict[str, float]:
    """Time the jobs one after another, again and again: the machine is shared. Best of each. [s]"""
    took: dict[str, list[float]] = {name: [] for name in jobs}
    for job in jobs.values():
        job()  # files and bytecode into the system's cache
    for _ in range(runs):
        for name, job in jobs.items():
            start = time.perf_counter()
            job()
            took[name].append(time.perf_counter() - start)
    return {name: min(times) for name, times in took.items()}


def start_up(folder: Path, runs: int) -> None:
    """Print the ratios of whole processes."""
    path = folder / "large.csv"
    write(path, LARGE, np.random.default_rng(1))
    best = in_turn(
        runs,
        imports=process([sys.executable, "-c", "import pandas, xarray"]),
        usage=process([*COMMAND, "--help"]),
        statement=process([*COMMAND, "turn", str(path)]),
        numbers=process([sys.executable, "-c", "import numpy"]),
    )
    told("import pandas, xarray", f"{best['imports']:.3f} s")
    told("  import numpy alone", f"{best['numbers']:.3f} s")
    told("backveer --help", f"{best['usage']:.3f} s")
    told("  ratio", f"{best['usage'] / best['imports']:.2f} (asked for: at most 0.2)")
    told(f"backveer turn, one file of {LARGE} levels", f"{best['statement']:.3f} s")
    told("  ratio", f"{best['statement'] / best['imports']:.2f} (asked for: at most 1.25)")


def many_files(folder: Path, count: int, runs: int) -> None:
    """Print the ratio of `turn` over many files to reading them, and where the time goes."""
    import pandas

    from backveer.io import readers
    from backveer.io.command import main
    from backveer.io.readers.reading import Hints
    from backveer.io.words.table import summary_text
    from backveer.profiles import statement as whole

    random = np.random.default_rng(2)
    paths = [folder / f"s{i:04d}.csv" for i in range(count)]
    for path in paths:
        write(path, SMALL, random)
    names = tuple(str(path) for path in paths)
    reading = readers.read(names, Hints())
    if len(reading.files) != count or reading.stack.profile_count != count:
        raise SystemExit("not every file was read: the comparison would be false")
    said = whole.statement(reading.stack, whole.Settings())

    def turn() -> None:
        with redirect_stdout(io.StringIO()):
            status = main(["turn", *names])
        if status != 0:
            raise SystemExit(f"backveer turn ended with status {status}")

    best = in_turn(
        runs,
        csv=lambda: [pandas.read_csv(path) for path in paths],
        turn=turn,
        read=lambda: readers.read(names, Hints()),
        statement=lambda: whole.statement(reading.stack, whole.Settings()),
        words=lambda: summary_text(said),
    )
    told(f"pandas.read_csv, {count} files of {SMALL} levels", f"{best['csv']:.2f} s")
    told("backveer turn, the same files in one call", f"{best['turn']:.2f} s")
    for name in ("read", "statement", "words"):
        told(f"  {name}", f"{best[name]:.2f} s ({100 * best[name] / best['turn']:.0f} %)")
    told("  files per second", f"{count / best['turn']:.0f}")
    told("  ratio", f"{best['turn'] / best['csv']:.2f} (asked for: at most 4)")


def told(what: str, value: str) -> None:
    print(f"{what:<44}{value}")


def main() -> None:
    """Print all ratios."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[1])
    parser.add_argument("--smoke", action="store_true", help="few files, one run: does it work")
    smoke = parser.parse_args().smoke
    with tempfile.TemporaryDirectory() as folder:
        start_up(Path(folder), 1 if smoke else 7)
        many_files(Path(folder), 50 if smoke else 2000, 1 if smoke else 3)


if __name__ == "__main__":
    main()
