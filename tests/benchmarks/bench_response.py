"""Responses on a million points, single calls, and the time to import, each against a baseline."""

from __future__ import annotations

import math
import subprocess
import sys
import time
import timeit
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tausheet import functions

TIMES = np.linspace(0.0, 10.0, 1_000_000)
EXPONENTS = -TIMES


def seconds(call: Callable[[], Any], number: int = 1, repeat: int = 25) -> float:
    """The least of the repeats: what else the machine does only ever adds to it."""
    return min(timeit.repeat(call, number=number, repeat=repeat)) / number


def report(benchmark: BenchmarkFixture, baseline: str, base: float, wanted: str = "") -> None:
    benchmark.extra_info["ratio"] = round(benchmark.stats.stats.min / base, 2)
    benchmark.extra_info["wanted"] = wanted
    benchmark.extra_info["baseline"] = baseline


FORCINGS = {
    "step": (0.0, 5.0),
    "natural": (5.0,),
    "ramp": (0.0, 0.0, 5.0, 1.0),
    "sine": (0.0, 5.0, 3.0, 30.0),
    "decay": (0.0, 5.0, 2.0),
    "pulse": (0.0, 0.0, 5.0, 1.0, 0.1),
    "square": (0.0, 0.0, 5.0, 0.1, 0.5),
}


@pytest.mark.parametrize("name", FORCINGS)
def bench_a_million_points(benchmark: BenchmarkFixture, name: str) -> None:
    benchmark(getattr(functions, name), TIMES, 1.0, *FORCINGS[name])
    base = seconds(lambda: np.exp(EXPONENTS))
    wanted = "at most 3" if name == "step" else ""
    report(benchmark, "numpy.exp of as many", base, wanted)


def bench_square_at_the_millionth_period(benchmark: BenchmarkFixture) -> None:
    late = TIMES + 1e6 * 0.1
    benchmark(functions.square, late, 1.0, *FORCINGS["square"])
    base = seconds(lambda: functions.square(TIMES, 1.0, *FORCINGS["square"]))
    report(benchmark, "the same in the first hundred periods", base, "about 1")


def bench_ten_thousand_single_steps(benchmark: BenchmarkFixture) -> None:
    moments = [k * 1e-3 for k in range(10_000)]

    def closed_form() -> list[float]:
        return [0.0 + (5.0 - 0.0) * -math.expm1(-t / 1.0) for t in moments]

    benchmark(lambda: [functions.step(t, 1.0, 0.0, 5.0) for t in moments])
    report(benchmark, "the closed form in plain Python", seconds(closed_form))


def bench_import(benchmark: BenchmarkFixture) -> None:
    """In new processes, taken in turn so that both meet the same machine."""
    ours, theirs = [], []
    for _ in range(7):
        for module, taken in (("tausheet.functions", ours), ("scipy.special", theirs)):
            begin = time.perf_counter()
            subprocess.run([sys.executable, "-c", f"import {module}"], check=True)
            taken.append(time.perf_counter() - begin)
    benchmark.pedantic(
        lambda: subprocess.run([sys.executable, "-c", "import tausheet.functions"], check=True),
        rounds=3,
    )
    benchmark.extra_info["ratio"] = round(min(ours) / min(theirs), 2)
    benchmark.extra_info["wanted"] = "at most 2"
    benchmark.extra_info["baseline"] = "import scipy.special in a new process"
