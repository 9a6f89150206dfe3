"""
Time the Ekman fits over a stack against scipy.optimize.least_squares, one profile at a time.

    python tests/bench/fits.py [--smoke]

20,000 profiles of 60 levels, all four members, on one core; scipy fits a few of them. Both must
reach the same optimum under the same noise length. Ours finds that length, weighs six of them for
the errors, and gives intervals and a verdict; scipy is timed at three tasks:

tuned       the optimum and the covariance under the length that ours found, with all that makes it
            fast: MINPACK, the analytic Jacobian, a start at the true scale height
as called   the same by its own method and differences, from a scale height of 250 m
six lengths as called, for each noise length that our errors weigh, each from the last optimum

Asked for: at least 100 times faster.
"""

from __future__ import annotations

import argparse
import os
import sys
import time
from pathlib import Path
from typing import Any

# One core on both sides; read by the libraries as they are imported.
for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[name] = "1"
sys.path.insert(0, str(Path(__file__).resolve().parents[1]))

import numpy as np  # noqa: E402  (after its threads are settled)
from spirals import PlainFit, correlated_noise, spiral, stack_of  # noqa: E402

from backveer.profiles.earth import coriolis  # noqa: E402
from backveer.profiles.ekman import EkmanFit, fit  # noqa: E402
from backveer.profiles.ekman_errors import LENGTHS  # noqa: E402

LEVELS = 60
START = 250.0  # scale height that a careful user would start from [m]
SAME = 1e-3  # in ln(scale height): far below any error of it


def profiles(count: int) -> tuple[Any, Any, Any, Any]:
    """Return heights, wind, latitude and true scale heights of invented profiles of all kinds."""
    random = np.random.default_rng(11)
    z = np.sort(random.uniform(10.0, 2500.0, (count, LEVELS)), axis=1)
    latitude = random.choice([55.0, -40.0], count)
    delta = random.uniform(120.0, 400.0, count)
    g = random.uniform(6.0, 18.0, count) * np.exp(2j * np.pi * random.random(count))
    a = -g * random.choice([1.0, 0.7, 0.6 + 0.2j], count)
    s = random.choice([0.0, 0.002], count) * np.exp(2j * np.pi * random.random(count))
    w = spiral(z, delta, g, a, s)
    w = w + correlated_noise(random, z, random.choice([0.0, 50.0, 150.0], count), 0.4)
    # A southern profile is a northern one in the mirror.
    return z, np.where(latitude[:, np.newaxis] < 0, w.conj(), w), latitude, delta


def one_at_a_time(z: Any, w: Any, latitude: Any, lengths: Any, truth: Any = None) -> Any:
    """Fit by scipy; return ln(scale height) under the first length, and the time. [s]"""
    found = np.empty((len(z), 4))
    begin = time.perf_counter()
    for i in range(len(z)):
        for member in range(4):
            start: Any = None
            for k, length in enumerate(lengths[i]):
                plain = PlainFit(member, z[i], w[i], length, float(np.sign(latitude[i])))
                if truth is not None:
                    best = plain.fit(plain.start(truth[i]), jac=plain.jacobian, method="lm")
                else:
                    best = plain.fit(plain.start(START) if start is None else start)
                start = best.x
                variance = 2.0 * best.cost / (2 * LEVELS - best.x.size)
                np.sqrt(np.diag(variance * np.linalg.inv(best.jac.T @ best.jac)))
                if k == 0:
                    found[i, member] = best.x[0]
    return found, time.perf_counter() - begin


def agreement(told: EkmanFit, z: Any, found: Any) -> tuple[int, int]:
    """Count the fits whose optimum lies inside the range of each, and those that agree."""
    ours = told.candidate_scale_height[: len(found)]
    # What a sheared member may be is limited by the reach of the profile, as documented.
    most = z[: len(found), -1:] * np.array([5.0, 5.0, 1.0 / 3.0, 1.0 / 3.0])
    inside = np.isfinite(told.candidate_aicc[: len(found)]) & (np.exp(found) < most)
    return int(inside.sum()), int((inside & (np.abs(np.log(ours) - found) < SAME)).sum())


def main() -> None:
    """Print the times, their ratios, and how many optima agree."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[1])
    parser.add_argument("--smoke", action="store_true", help="few profiles: does it work")
    smoke = parser.parse_args().smoke
    count, few = (400, 6) if smoke else (20_000, 100)
    z, w, latitude, delta = profiles(count)
    stack = stack_of(z, w, latitude)
    f = coriolis(stack)
    fit(stack.select(slice(0, 100)), f.select(slice(0, 100)))  # what is done once, is done
    ours = []
    for _ in range(1 if smoke else 3):
        begin = time.perf_counter()
        told = fit(stack, f)
        ours.append(time.perf_counter() - begin)
    each = min(ours) / count
    print(f"ours, of {count} profiles{1e6 * each:26.0f} us a profile")
    print("scipy, of a few            us a profile   ratio   same optimum")
    length = told.noise_length[:, np.newaxis]
    tasks = {
        "tuned": (few, length, delta),
        "as called": (few, length, None),
        "six lengths": (max(few // 5, 2), np.broadcast_to(LENGTHS, (count, LENGTHS.size)), None),
    }
    for name, (size, lengths, truth) in tasks.items():
        given = z[:size], w[:size], latitude[:size], lengths[:size]
        found, took = one_at_a_time(*given, truth=truth)
        agree = ""
        if lengths is length:
            inside, same = agreement(told, z, found)
            agree = f"{same} of {inside} fits inside the range"
        print(f"  {name:<24}{1e6 * took / size:11.0f}{took / size / each:10.0f}   {agree}".rstrip())


if __name__ == "__main__":
    main()
