"""A network of 200 elements, and a curve of 200 single-cell calls on a table already seen."""

from __future__ import annotations

import itertools
import time
import timeit
from typing import Any

import numpy as np
from pytest_benchmark.fixture import BenchmarkFixture

from tausheet.functions import network, network_at

HEADINGS = ("Name", "Kind", "From", "To", "Value", "Before", "Start", "Control", "Shape", *"ABCDE")
FRESH = itertools.count(1)


def grid() -> tuple[tuple[Any, ...], ...]:
    """A grid of 9 x 11 nodes in 178 resistors, 22 more elements; a table not seen before.

    Blank cells are empty texts, as LibreOffice hands them over.
    """
    rng = np.random.default_rng(0)
    rows: list[tuple[Any, ...]] = [HEADINGS]

    def add(*row: Any) -> None:
        rows.append((*row, *[""] * (len(HEADINGS) - len(row))))

    for i, j in itertools.product(range(9), range(11)):
        for a, b in ((i + 1, j), (i, j + 1)):
            if a < 9 and b < 11:
                ohm = round(float(10 ** rng.uniform(-3, 9)), 6)
                add(f"R{len(rows)}", "resistor", f"n{i}_{j}", f"n{a}_{b}", ohm)
    add("V1", "voltage source", "ground", "n0_0", 24.0 + 1e-6 * next(FRESH), 0.0)
    add("Rg", "resistor", "n4_5", "ground", 1e6)
    for k in range(10):
        add(f"I{k}", "current source", "ground", f"n{k % 9}_{k}", 1e-3 * k, 0.0)
        add(f"C{k}", "capacitor", "n8_10", "ground", 1e-6)
    assert len(rows) == 201
    return tuple(rows)


def bench_network_of_200_elements(benchmark: BenchmarkFixture) -> None:
    """Wanted: at most 50 ms for a table that was not seen before."""
    result = benchmark.pedantic(network, setup=lambda: ((grid(),), {}), rounds=20)
    assert result.order == 1
    matrix, right = np.eye(200) + 0.1, np.ones(200)
    baseline = min(timeit.repeat(lambda: np.linalg.solve(matrix, right), number=10, repeat=5)) / 10
    seconds = benchmark.stats.stats.median
    benchmark.extra_info["baseline"] = "numpy.linalg.solve of 200 unknowns"
    benchmark.extra_info["ratio"] = round(seconds / baseline, 1)
    benchmark.extra_info["milliseconds, wanted at most 50"] = round(1000 * seconds, 2)


def bench_curve_on_a_table_already_seen(benchmark: BenchmarkFixture) -> None:
    """Wanted: 200 single-cell calls at most 5 x the first call."""
    times = [1e-5 * k for k in range(200)]
    firsts, tables = [], []
    for _ in range(5):
        rows = grid()
        start = time.perf_counter()
        network_at(times[0], rows, "voltage at n8_10")
        firsts.append(time.perf_counter() - start)
        tables.append(rows)

    def curve() -> None:
        for t in times:
            # a host makes the rows anew for each call
            network_at(t, tuple(tuple(row) for row in tables[-1]), "voltage at n8_10")

    benchmark(curve)
    seconds = benchmark.stats.stats.median
    benchmark.extra_info["baseline"] = "the first call on that table"
    benchmark.extra_info["ratio, wanted at most 5"] = round(seconds / sorted(firsts)[2], 2)
