"""Crossings of 10,000 rows at once against a loop of scipy's brentq with brackets given."""

from __future__ import annotations

import math
import time

import numpy as np
from pytest_benchmark.fixture import BenchmarkFixture
from scipy.optimize import brentq

from tausheet.functions import crossing, table_crossing

ROWS = 10_000
FREQUENCY, AMPLITUDE = 1.3, 0.3
SOURCES = [["step", 1.0, None], ["sine", AMPLITUDE, FREQUENCY]]
_random = np.random.default_rng(5)
TAU = 10 ** _random.uniform(-0.5, 0.5, ROWS)
INITIAL = _random.uniform(-1.0, 0.0, ROWS)
LEVEL = _random.uniform(0.2, 0.9, ROWS)


def _callback(tau: float, initial: float, level: float):
    w = 2 * math.pi * FREQUENCY
    k = w * tau
    p, q = AMPLITUDE / (1 + k * k), -AMPLITUDE * k / (1 + k * k)
    left = initial - 1 - q
    rest = 1 - level
    return lambda t: p * math.sin(w * t) + q * math.cos(w * t) + left * math.exp(-t / tau) + rest


def _brackets(times):
    """Around each crossing, as wide as y stays on one side of the level on either side."""
    low, high = np.zeros(ROWS), times * 1.0
    for i, (tau, initial, level, t) in enumerate(
        zip(TAU.tolist(), INITIAL.tolist(), LEVEL.tolist(), times.tolist(), strict=True)
    ):
        f = _callback(tau, initial, level)
        width = 0.1
        while f(t + width) * f(0.0) >= 0:
            width /= 2
        high[i] = t + width
    return low.tolist(), high.tolist()


def _loop(low, high):
    return [
        brentq(_callback(tau, initial, level), a, b)
        for tau, initial, level, a, b in zip(
            TAU.tolist(), INITIAL.tolist(), LEVEL.tolist(), low, high, strict=True
        )
    ]


def bench_ten_thousand_crossings(benchmark: BenchmarkFixture) -> None:
    times = crossing(LEVEL, TAU, INITIAL, SOURCES)
    assert np.isfinite(times).all()
    brackets = _brackets(times)
    benchmark(crossing, LEVEL, TAU, INITIAL, SOURCES)
    base = math.inf
    for _ in range(5):
        start = time.perf_counter()
        _loop(*brackets)
        base = min(base, time.perf_counter() - start)
    benchmark.extra_info["times_faster"] = round(base / benchmark.stats.stats.min, 1)
    benchmark.extra_info["wanted"] = "at least 20"
    benchmark.extra_info["baseline"] = "a loop of scipy.optimize.brentq, math callback, brackets"


def bench_first_crossing_of_a_million_points(benchmark: BenchmarkFixture) -> None:
    times = np.cumsum(_random.uniform(0, 2, 1_000_000))
    levels = _random.uniform(-1, 1, 1_000_000)
    benchmark.pedantic(
        table_crossing, (0.1, 1.0, 0.0, times, levels, False, "rising", 1000), rounds=3
    )
    start = time.perf_counter()
    np.exp(-times)
    base = time.perf_counter() - start
    benchmark.extra_info["ratio"] = round(benchmark.stats.stats.min / base, 1)
    benchmark.extra_info["baseline"] = "numpy.exp of as many"
