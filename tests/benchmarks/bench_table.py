"""A table of a million points, in time and memory, against numpy.exp and scipy.signal.lsim."""

from __future__ import annotations

import timeit
import tracemalloc
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tausheet import functions

COUNT = 1_000_000
RANDOM = np.random.default_rng(1)
TIMES = np.cumsum(RANDOM.uniform(0.5, 1.5, COUNT)) * 1e-5
LEVELS = RANDOM.normal(size=COUNT)
OTHERS = np.sort(RANDOM.uniform(0.0, TIMES[-1], COUNT))


def seconds(call: Callable[[], Any], repeat: int = 15) -> float:
    """The least of the repeats: what else the machine does only ever adds to it."""
    return min(timeit.repeat(call, number=1, repeat=repeat))


def exponential() -> float:
    """Seconds that numpy.exp takes for as many."""
    exponents = -np.linspace(0.0, 10.0, COUNT)
    return seconds(lambda: np.exp(exponents))


def report(benchmark: BenchmarkFixture, ratio: float, baseline: str, wanted: str) -> None:
    benchmark.extra_info.update(ratio=round(ratio, 2), baseline=baseline, wanted=wanted)


@pytest.mark.parametrize(
    ("asked", "wanted"), [(TIMES, "at most 8"), (OTHERS, "at most 14")], ids=["own", "other"]
)
def bench_a_million_uneven_points(benchmark: BenchmarkFixture, asked: Any, wanted: str) -> None:
    benchmark(functions.table, asked, 1.0, 0.0, TIMES, LEVELS)
    ratio = benchmark.stats.stats.min / exponential()
    report(benchmark, ratio, "numpy.exp of as many", wanted)


def bench_a_million_even_points(benchmark: BenchmarkFixture) -> None:
    from scipy.signal import lsim

    even = np.arange(COUNT) * 1e-5
    benchmark(functions.table, even, 1.0, 0.0, even, LEVELS)
    base = seconds(lambda: lsim(([1.0], [1.0, 1.0]), LEVELS, even), repeat=1)
    ratio = base / benchmark.stats.stats.min
    report(benchmark, ratio, "times faster than scipy.signal.lsim", "at least 100")


def bench_memory(benchmark: BenchmarkFixture) -> None:
    """Peak of what the call takes on top, as a multiple of what it is given."""

    def peak() -> int:
        tracemalloc.start()
        functions.table(OTHERS, 1.0, 0.0, TIMES, LEVELS)
        most = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        return most

    most = benchmark.pedantic(peak, rounds=1)
    given = OTHERS.nbytes + TIMES.nbytes + LEVELS.nbytes
    report(benchmark, most / given, "bytes of times, levels and moments", "at most 5")
