"""
Time `backveer shear`: one profile against importing pandas and xarray, 10,000 against read_csv.

    python tests/bench/shear.py

The first ratio is of whole processes, start to end; the second of work in one process, after all
imports: reading, checking, shear, path, criteria and the printed summary against pandas.read_csv of
the same file. Bounds asked for: 1.25 and 3. The best of several runs is taken, in turn, because the
machines are shared.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

SOUNDING = Path(__file__).parents[2] / "sample_soundings" / "harrow_skerry_night_jet.txt"
PROFILES = 10_000
HEIGHTS = np.arange(40, 300, 20)


def main() -> None:
    """Print both ratios."""
    ours = [sys.executable, "-c", "from backveer.io.command import main; raise SystemExit(main())"]
    ours += ["shear", str(SOUNDING), "--runway", "268"]
    theirs = [sys.executable, "-c", "import pandas, xarray"]
    took = {"answer": [], "imports": []}
    for _ in range(7):
        for name, words in (("answer", ours), ("imports", theirs)):
            start = time.perf_counter()
            subprocess.run(words, check=True, stdout=subprocess.DEVNULL)
            took[name].append(time.perf_counter() - start)
    answer, imports = min(took["answer"]), min(took["imports"])
    print(f"one profile, file to answer      {answer:.3f} s")
    print(f"import pandas, xarray            {imports:.3f} s")
    print(f"ratio                            {answer / imports:.2f} (asked for: at most 1.25)")

    import pandas

    from backveer.io.readers.door import read
    from backveer.io.readers.reading import Hints
    from backveer.io.readers.shear_rules import read_rules
    from backveer.io.words.shear_table import shear_summary
    from backveer.profiles.shear_statement import ShearSettings, shear_statement

    settings = ShearSettings(headings=(268.0, 88.0), rules=read_rules())
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "lidar.csv"
        _write(path)
        parts: dict[str, list[float]] = {"read_csv": [], "read": [], "shear": [], "words": []}
        for _ in range(7):
            marks = [time.perf_counter()]
            pandas.read_csv(path)
            marks.append(time.perf_counter())
            reading = read(path, Hints(latitude=58.0))
            marks.append(time.perf_counter())
            said = shear_statement(reading.stack, settings, cause=False)
            marks.append(time.perf_counter())
            shear_summary(said)
            marks.append(time.perf_counter())
            for (_, times), step in zip(parts.items(), np.diff(marks), strict=True):
                times.append(float(step))
    best = {name: min(times) for name, times in parts.items()}
    whole = best["read"] + best["shear"] + best["words"]
    print(f"{PROFILES} lidar profiles, read_csv    {best['read_csv']:.3f} s")
    for name in ("read", "shear", "words"):
        print(f"  {name:<30} {best[name]:.3f} s")
    print(f"ratio                            {whole / best['read_csv']:.1f} (asked for: under 3)")


def _write(path: Path) -> None:
    random = np.random.default_rng(5)
    times = np.datetime64("2031-01-01T00:00") + np.arange(PROFILES) * np.timedelta64(10, "m")
    strength, angle = random.uniform(4, 18, PROFILES), random.uniform(0, 360, PROFILES)
    speed = strength[:, None] * (HEIGHTS / 300) ** 0.2
    speed = speed + random.normal(0, 0.2, speed.shape)
    turned = angle[:, None] + 5 * np.log(HEIGHTS / 40) + random.normal(0, 1, speed.shape)
    head = ["time"] + [f"ws_{z}m (m/s)" for z in HEIGHTS] + [f"wd_{z}m (deg)" for z in HEIGHTS]
    lines = [",".join(head)]
    for when, fast, way in zip(times, speed, turned % 360, strict=True):
        numbers = [f"{x:.2f}" for x in fast] + [f"{x:.1f}" for x in way]
        lines.append(f"{when}," + ",".join(numbers))
    path.write_text("\n".join(lines) + "\n")


if __name__ == "__main__":
    main()
