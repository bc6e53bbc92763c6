"""A fit of 10,000 points, against numpy.exp of as many."""

from __future__ import annotations

import timeit

import numpy as np
from pytest_benchmark.fixture import BenchmarkFixture

from tausheet.functions import fit

TIMES = np.linspace(0.0, 5.0, 10_000)
VALUES = 5 - 3 * np.exp(-TIMES / 1.3) + 0.02 * np.random.default_rng(0).normal(size=TIMES.size)


def bench_fit_of_10000_points(benchmark: BenchmarkFixture) -> None:
    """Wanted: at most 50 ms."""
    fit(TIMES, VALUES)
    result = benchmark(fit, TIMES, VALUES)
    assert 1.2 < result.tau < 1.4
    baseline = min(timeit.repeat(lambda: np.exp(-TIMES), number=100, repeat=5)) / 100
    seconds = benchmark.stats.stats.median
    benchmark.extra_info["baseline"] = "numpy.exp of as many"
    benchmark.extra_info["ratio"] = round(seconds / baseline, 1)
    benchmark.extra_info["milliseconds, wanted at most 50"] = round(1000 * seconds, 2)
