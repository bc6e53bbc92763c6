"""A calc sheet made in a new process, and one input of it changed, against making workbooks."""

from __future__ import annotations

import subprocess
import sys
import timeit
from pathlib import Path

from pytest_benchmark.fixture import BenchmarkFixture

from tausheet import templates
from tausheet.addin.embedded import Book

BASELINE = "from openpyxl import Workbook; from openpyxl.chart import ScatterChart; import numpy"


def bench_new_bleed(benchmark: BenchmarkFixture, tmp_path: Path) -> None:
    """`tausheet new bleed` with stored values; wanted: at most 2 s, warm disk."""
    out = tmp_path / "bleed.xlsx"
    command = [sys.executable, "-m", "tausheet.addin.cli", "new", "bleed", str(out), "--demo"]

    def new() -> None:
        subprocess.run([*command, "--force"], check=True, capture_output=True)

    new()
    benchmark.pedantic(new, rounds=5)
    start = [sys.executable, "-c", BASELINE]
    baseline = min(timeit.repeat(lambda: subprocess.run(start, check=True), number=1, repeat=5))
    seconds = benchmark.stats.stats.median
    benchmark.extra_info["baseline"] = "a new process that imports openpyxl and numpy"
    benchmark.extra_info["ratio"] = round(seconds / baseline, 1)
    benchmark.extra_info["seconds, wanted at most 2"] = round(seconds, 2)


def bench_changed_input(benchmark: BenchmarkFixture) -> None:
    """One input of bleed changed and everything computed again by the embedded engine."""
    workbook = templates.build("bleed", demo=True)
    defined = workbook.defined_names["value_of_R_unit"]
    title, cells = next(iter(defined.destinations))
    book = Book(workbook)

    def change(ohms: float) -> None:
        book.set(title, cells.replace("$", "").split(":")[0], ohms)
        book.values()

    change(30.0)
    benchmark(change, 33.0)
    baseline = min(timeit.repeat(lambda: templates.build("bleed", demo=True), number=1, repeat=5))
    benchmark.extra_info["baseline"] = "building the workbook"
    benchmark.extra_info["ratio"] = round(benchmark.stats.stats.median / baseline, 2)
