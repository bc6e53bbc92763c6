"""Sheets a second after start-up, and the memory of a long table, against `new` in one process."""

from __future__ import annotations

import tracemalloc
from pathlib import Path

from pytest_benchmark.fixture import BenchmarkFixture

from tausheet import templates
from tausheet.addin import fill_sheet
from tausheet.addin.fill_table import read_rows
from tausheet.addin.make import make_sheet
from tausheet.templates.model import Choice, Tolerance


def given(name: str) -> dict[str, str]:
    """What the demo of a sheet enters."""
    texts = {}
    for entry in templates.SHEETS[name].entries():
        texts[entry.symbol] = entry.demo.value
        if not isinstance(entry, Choice) and entry.tolerance is not Tolerance.NONE:
            texts[f"{entry.symbol}_lo"] = entry.demo.lowest
            texts[f"{entry.symbol}_hi"] = entry.demo.highest
    return {key: text for key, text in texts.items() if text}


def bench_fill_bleed(benchmark: BenchmarkFixture, tmp_path: Path) -> None:
    """One row on one core, the sheet built before; wanted: at least 10 a second."""
    values = given("bleed")
    fill_sheet.fill("bleed", values)
    turn = iter(range(10**9))

    def row() -> None:
        fill_sheet.fill("bleed", values | {"R_unit": f"{28 + next(turn) % 7} kohm"})

    benchmark.pedantic(row, rounds=30)

    def new() -> None:
        make_sheet("bleed", tmp_path / "x.xlsx", values, force=True)

    import timeit

    base = min(timeit.repeat(new, number=1, repeat=3))
    benchmark.extra_info.update(
        ratio=round(base / benchmark.stats.stats.median, 1),
        baseline="times as fast as `new` in one process",
        sheets_a_second=round(1 / benchmark.stats.stats.median, 1),
        wanted="at least 10",
    )


def bench_memory_of_ten_thousand_rows(benchmark: BenchmarkFixture, tmp_path: Path) -> None:
    """A table is read row by row: 10,000 rows take no more than 100 at their peak."""
    peaks = []
    for count in (100, 10_000):
        table = tmp_path / f"{count}.csv"
        table.write_text("C_unit,V_start\n" + "4.7 mF,565 V\n" * count, encoding="utf-8")
        tracemalloc.start()
        assert sum(1 for _ in read_rows("bleed", table)) == count
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    benchmark.pedantic(lambda: sum(1 for _ in read_rows("bleed", table)), rounds=1)
    benchmark.extra_info.update(
        ratio=round(peaks[1] / peaks[0], 2), baseline="peak memory of 100 rows", wanted="about 1"
    )
