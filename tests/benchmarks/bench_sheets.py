"""Calc sheets made in a new process, and one input changed, against making workbooks."""

from __future__ import annotations

import math
import random
import subprocess
import sys
import timeit
from pathlib import Path
from typing import Any

import pytest
from pytest_benchmark.fixture import BenchmarkFixture

from tausheet import templates
from tausheet.addin import calc
from tausheet.addin.embedded import Book
from tausheet.templates.model import Input

BASELINE = "from openpyxl import Workbook; from openpyxl.chart import ScatterChart; import numpy"
POINTS = 10_000


def report(benchmark: BenchmarkFixture, baseline: float, what: str, wanted: float) -> None:
    """The ratio to a baseline of the same run, and the seconds with what is wanted of them."""
    seconds = benchmark.stats.stats.median
    benchmark.extra_info["baseline"] = what
    benchmark.extra_info["ratio"] = round(seconds / baseline, 2)
    benchmark.extra_info[f"seconds, wanted at most {wanted}"] = round(seconds, 3)


def a_new_process() -> float:
    """Seconds of a new process that imports openpyxl and numpy."""
    start = [sys.executable, "-c", BASELINE]
    return min(timeit.repeat(lambda: subprocess.run(start, check=True), number=1, repeat=5))


def building(name: str) -> float:
    """Seconds to build the workbook of a sheet, without computing it."""
    return min(timeit.repeat(lambda: templates.build(name, demo=True), number=1, repeat=3))


def cell_of(workbook: Any, name: str) -> tuple[str, str]:
    ((title, cells),) = workbook.defined_names[name].destinations
    return title, cells.replace("$", "").split(":")[0]


def some_input(name: str, workbook: Any) -> tuple[str, str, float]:
    """The cell of the first input that has a tolerance or else a unit, and its value."""
    inputs = [e for e in templates.SHEETS[name].entries() if isinstance(e, Input) and e.units]
    title, cell = cell_of(workbook, f"value_of_{inputs[0].symbol}")
    return title, cell, float(workbook[title][cell].value)


@pytest.mark.parametrize("name", templates.SHEETS)
def bench_new(benchmark: BenchmarkFixture, tmp_path: Path, name: str) -> None:
    """`tausheet new NAME` with stored values; wanted: at most 2 s, warm disk."""
    out = tmp_path / f"{name}.xlsx"
    command = [sys.executable, "-m", "tausheet.addin.cli", "new", name, str(out), "--demo"]

    def new() -> None:
        subprocess.run([*command, "--force"], check=True, capture_output=True)

    new()
    benchmark.pedantic(new, rounds=1)
    report(benchmark, a_new_process(), "a new process that imports openpyxl and numpy", 2)


def bench_acceptance_of_10_000_points(benchmark: BenchmarkFixture, tmp_path: Path) -> None:
    """`tausheet new acceptance` with a full table of points; wanted: at most 3 s."""
    values = tmp_path / "points.csv"
    noise, lines = random.Random(1), ["symbol,value"]
    for number in range(1, POINTS + 1):
        time = 60e-3 * number / POINTS
        lines.append(f"measured.time.{number},{time!r}")
        level = 24 * (1 - math.exp(-time / 10.3e-3)) + noise.gauss(0, 0.04)
        lines.append(f"measured.value.{number},{level!r}")
    values.write_text("\n".join(lines))
    out = tmp_path / "acceptance.xlsx"
    command = [sys.executable, "-m", "tausheet.addin.cli", "new", "acceptance", str(out)]

    def new() -> None:
        subprocess.run(
            [*command, "--demo", "--values", str(values), "--force"],
            check=True,
            capture_output=True,
        )

    new()
    benchmark.pedantic(new, rounds=3)
    report(benchmark, a_new_process(), "a new process that imports openpyxl and numpy", 3)


@pytest.mark.parametrize("name", templates.SHEETS)
def bench_changed_input(benchmark: BenchmarkFixture, name: str) -> None:
    """One input changed and everything computed again by the embedded engine."""
    workbook = templates.build(name, demo=True)
    title, cell, value = some_input(name, workbook)
    book = Book(workbook)
    book.values()
    turn = iter(range(10**9))

    def change() -> None:
        book.set(title, cell, value * (1 + 0.001 * (next(turn) % 2)))
        book.values()

    benchmark(change)
    report(benchmark, building(name), "building the workbook", 0.5)


@pytest.fixture(scope="module")
def office() -> Any:
    with calc.Calc() as running:
        yield running


@pytest.mark.parametrize("name", templates.SHEETS)
def bench_changed_input_in_libreoffice(
    benchmark: BenchmarkFixture, office: calc.Calc, tmp_path: Path, name: str
) -> None:
    """One input changed, every formula computed by LibreOffice; wanted: at most 0.5 s."""
    workbook = templates.build(name, demo=True)
    title, cell, value = some_input(name, workbook)
    path = tmp_path / f"{name}.xlsx"
    workbook.save(path)
    turn = iter(range(10**9))
    with office.open(path) as book:

        def change() -> None:
            book.set({title: {cell: value * (1 + 0.001 * (next(turn) % 2))}})
            book.calculate()

        change()
        benchmark.pedantic(change, rounds=10)
    report(benchmark, building(name), "building the workbook", 0.5)
