"""
How long the layers of varying viscosity take to fit, beside the analytic family.

    python tests/bench/viscosity.py [profiles]

10,000 profiles of 60 levels by default, with noise, of a layer solved with the cubic viscosity.
Both are timed in processor time, on the same stack; the issue asks for no more than 20 times.
"""

from __future__ import annotations

import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[1]))

import synthetic

from backveer.profiles import earth, ekman, viscosity_profile

LATITUDE = 52.0
Z = np.linspace(20.0, 1500.0, 60)


def main(count: int = 10_000) -> None:
    """Print the times and their ratio."""
    truth = synthetic.solve(10.0, LATITUDE, 0.05, synthetic.cubic(700.0))
    random = np.random.default_rng(1)
    noise = synthetic.correlated_noise(random, Z, 0.3, 100.0, count)
    stack = truth.stack(Z, LATITUDE, noise)
    f, error = earth.coriolis(stack), np.full(count, 0.3)
    begun = time.process_time()
    analytic = ekman.fit(stack, f, error)
    between = time.process_time()
    viscosity_profile.fit(stack, f, analytic, error)
    first, second = between - begun, time.process_time() - between
    print(f"{count} profiles of {Z.size} levels")
    print(f"analytic family    {first:6.2f} s")
    print(f"varying viscosity  {second:6.2f} s, {second / first:.1f} times as long")


if __name__ == "__main__":
    main(*map(int, sys.argv[1:]))
