"""`tausheet fill`: sheets from a table, equal to `new`, resumed, safe against the table."""

from __future__ import annotations

import csv
import io
import json
import os
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from openpyxl import load_workbook

from tausheet import templates
from tausheet.addin import fill, fill_sheet
from tausheet.addin.make import make_sheet
from tausheet.templates.model import Choice, Input, Tolerance

COMMAND = [sys.executable, "-m", "tausheet.addin.cli"]


def demo_values(name: str) -> dict[str, str]:
    """What the demo of a sheet enters, as texts of a table."""
    given = {}
    for entry in templates.SHEETS[name].entries():
        demo = entry.demo
        given[entry.symbol] = demo.value
        given[f"{entry.symbol}_source"] = demo.source
        if not isinstance(entry, Choice) and entry.tolerance is not Tolerance.NONE:
            given |= {f"{entry.symbol}_lo": demo.lowest, f"{entry.symbol}_hi": demo.highest}
    return {key: text for key, text in given.items() if text}


def write(path: Path, rows: list[dict[str, str]]) -> Path:
    keys = list(dict.fromkeys(key for row in rows for key in row))
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, keys)
        writer.writeheader()
        writer.writerows(rows)
    return path


BANKS = [
    {**demo_values("bleed"), "R_unit": f"{r} kohm", "doc_number": f"Q4-BANK-{r}"}
    for r in (28, 30, 33, 36)
]


def contents(book: Any) -> dict[tuple[str, str], tuple[Any, int]]:
    return {
        (sheet.title, cell.coordinate): (cell.value, cell.style_id)
        for sheet in book.worksheets
        for row in sheet.iter_rows()
        for cell in row
    }


@pytest.mark.parametrize(("name", "turns"), [("bleed", 3), ("sequence", 1)])
def test_a_sheet_equals_that_of_new(tmp_path: Path, name: str, turns: int) -> None:
    given = demo_values(name) | {"doc_number": "=1+1", "project": "Quay 4"}
    first = next(e for e in templates.SHEETS[name].entries() if isinstance(e, Input) and e.units)
    changes: tuple[dict[str, str], ...] = ({"doc_number": "Q4-7"}, {first.symbol: ""}, {})
    for turn, changed in enumerate(changes[:turns]):
        values = given | changed
        make_sheet(name, tmp_path / f"{turn}.xlsx", values)
        done = fill_sheet.fill(name, {key: text for key, text in values.items() if text})
        for computed in (True, False):
            ours = load_workbook(io.BytesIO(done.data), data_only=computed)
            theirs = load_workbook(tmp_path / f"{turn}.xlsx", data_only=computed)
            mine = contents(ours)
            for place, content in contents(theirs).items():
                assert mine[place] == content or hasattr(content[0], "ref"), place
            assert ours.properties.title == theirs.properties.title


def test_a_table_becomes_sheets_and_a_summary(tmp_path: Path) -> None:
    bad = {**BANKS[0], "C_unit": "4.7 kohm"}
    table = write(tmp_path / "banks.csv", [*BANKS, bad])
    run = subprocess.run(
        [*COMMAND, "fill", "bleed", table, tmp_path / "out"], capture_output=True, text=True
    )
    assert run.returncode == 1, run.stderr
    assert 'line 6: C_unit is "4.7 kohm", but "kohm" is no unit of it' in run.stdout
    assert "5 rows: 2 PASS, 2 FAIL, 1 not made" in run.stdout
    made = sorted(path.name for path in (tmp_path / "out").glob("bleed-*.xlsx"))
    assert made == [f"bleed-{line:06d}.xlsx" for line in (2, 3, 4, 5)]
    page = load_workbook(tmp_path / "out" / "summary.xlsx").active
    assert page is not None
    lines = list(page.iter_rows(min_row=3, values_only=True))
    assert [line[0] for line in lines] == [2, 3, 4, 5, 6]
    assert [line[2] for line in lines] == ["PASS", "PASS", "FAIL", "FAIL", None]
    assert page["B3"].hyperlink.target == "bleed-000002.xlsx"
    sheet = load_workbook(tmp_path / "out" / "bleed-000004.xlsx", data_only=True)
    ((title, cell),) = sheet.defined_names["verdict"].destinations
    assert sheet[title][cell.replace("$", "").split(":")[0]].value == "FAIL"


def test_two_workers_make_the_same(tmp_path: Path) -> None:
    table = write(tmp_path / "banks.csv", BANKS)
    alone = fill.fill("bleed", table, tmp_path / "one")
    both = fill.fill("bleed", table, tmp_path / "two", workers=2)
    assert alone == both
    for result in alone:
        one, two = (load_workbook(tmp_path / f / result.file) for f in ("one", "two"))
        assert contents(one).keys() == contents(two).keys()


@pytest.fixture
def scheduler() -> Iterator[str]:
    """A real scheduler and two workers, each a process of its own, on this machine only."""
    run = [sys.executable, "-m", "distributed.cli.dask_scheduler"]
    local = ["--host", "127.0.0.1", "--no-dashboard"]
    started = [subprocess.Popen([*run, *local, "--port", "0"], stderr=subprocess.PIPE, text=True)]
    try:
        assert started[0].stderr is not None
        address = next(
            line.split("Scheduler at:")[1].strip()
            for line in started[0].stderr
            if "Scheduler at:" in line
        )
        worker = [sys.executable, "-m", "distributed.cli.dask_worker", address]
        for _ in range(2):
            options = ["--nthreads", "1", "--no-nanny", "--no-dashboard", "--host", "127.0.0.1"]
            started.append(subprocess.Popen([*worker, *options], stderr=subprocess.DEVNULL))
        yield address
    finally:
        for process in reversed(started):
            process.terminate()
            process.wait(20)


def test_a_cluster_makes_the_same(tmp_path: Path, scheduler: str) -> None:
    table = write(tmp_path / "banks.csv", BANKS)
    alone = fill.fill("bleed", table, tmp_path / "one")
    spread = fill.fill("bleed", table, tmp_path / "spread", cluster=scheduler)
    assert spread == alone
    assert all((tmp_path / "spread" / result.file).is_file() for result in spread)


def test_no_cluster_is_a_sentence(tmp_path: Path) -> None:
    table = write(tmp_path / "banks.csv", BANKS[:1])
    with pytest.raises(fill.NotFilled, match="no cluster answers at nonsense://"):
        fill.fill("bleed", table, tmp_path / "out", cluster="nonsense://127.0.0.1:1")


def test_an_interrupted_run_goes_on_where_it_stopped(tmp_path: Path) -> None:
    many = [BANKS[0] | {"doc_number": f"Q4-{n}"} for n in range(12)]
    table, out = write(tmp_path / "banks.csv", many), tmp_path / "out"
    run = subprocess.Popen([*COMMAND, "fill", "bleed", table, out], stderr=subprocess.DEVNULL)
    notes = out / fill.NOTES
    for _ in range(600):
        if notes.exists() and notes.read_text().count("\n") > 4:
            break
        time.sleep(0.05)
    os.kill(run.pid, signal.SIGKILL)
    run.wait()
    before = {path.name: path.stat().st_mtime_ns for path in out.glob("bleed-*.xlsx")}
    assert 2 <= len(before) < 12
    for path in before:
        load_workbook(out / path).close()  # each that is there is whole
    noted = [json.loads(line) for line in notes.read_text().splitlines()[1:] if line.endswith("}")]
    results = fill.fill("bleed", table, out)
    assert [result.line for result in results] == list(range(2, 14))
    kept = {result["file"] for result in noted}
    for name in kept:
        assert (out / name).stat().st_mtime_ns == before[name]
    changed = write(tmp_path / "banks.csv", [many[0] | {"R_unit": "36 kohm"}, *many[1:]])
    again = fill.fill("bleed", changed, out)
    assert [result.verdict for result in again] == ["FAIL"] + ["PASS"] * 11


def test_the_folder_is_ours_or_empty(tmp_path: Path) -> None:
    table = write(tmp_path / "banks.csv", BANKS[:1])
    (tmp_path / "out").mkdir()
    (tmp_path / "out" / "letter.txt").write_text("mine")
    with pytest.raises(fill.NotFilled, match="is not empty; name a new folder"):
        fill.fill("bleed", table, tmp_path / "out")
    fill.fill("bleed", table, tmp_path / "new")
    coil = write(tmp_path / "coil.csv", [demo_values("coil")])
    with pytest.raises(fill.NotFilled, match="filled from something else"):
        fill.fill("coil", coil, tmp_path / "new")


@pytest.mark.parametrize(
    ("content", "sentence"),
    [
        (b"", "has no heading row"),
        (b"C_unit,C_unit\n1,2\n", 'has the column "C_unit" twice'),
        (b"C_unit,volts\n1,2\n", 'has no input "volts"'),
        (b"../../x,C_unit\n1,2\n", "bleed has no table"),
        (b"=cmd|' /C calc'!A0\n1\n", "has no input"),
        (b"C_unit\n", "has no rows below its heading"),
        (b"C_unit\n\xff\xfe\n", "is not UTF-8 text"),
        ("C_unit\n4.7 mF\n".encode("utf-16"), "is not UTF-8 text"),
        (b"C_unit," * 3000 + b"C_unit\n", "columns; at most"),
        (b"x" * 20_000 + b"\n1\n", "cannot be read as a table"),
    ],
)
def test_a_table_that_cannot_be_used_is_a_sentence(
    tmp_path: Path, content: bytes, sentence: str
) -> None:
    table = tmp_path / "table.csv"
    table.write_bytes(content)
    with pytest.raises(fill.NotFilled, match=sentence):
        fill.fill("bleed", table, tmp_path / "out")
    assert not (tmp_path / "out").exists()


@pytest.mark.parametrize(
    ("row", "sentence"),
    [
        ("4.7 mF,565 V,1", "it has 3 fields where the heading has 2"),
        ("4.7 mF", "it has 1 fields"),
        ("many,565 V", "C_unit is"),
        ("1E400 F,565 V", "beyond the range of numbers"),
        ("\0,565 V", "NUL"),
        ("x" * 20_000 + ",565 V", "it cannot be read"),
        ('"4.7 mF"x,565 V', "it cannot be read"),
    ],
)
def test_a_bad_row_stops_nothing_else(tmp_path: Path, row: str, sentence: str) -> None:
    table = tmp_path / "table.csv"
    table.write_text(f"C_unit,V_start\n{row}\n4.7 mF,565 V\n", encoding="utf-8")
    bad, good = fill.fill("bleed", table, tmp_path / "out")
    assert (bad.line, bad.file, bad.verdict) == (2, "", "")
    assert sentence in bad.fault
    assert (good.line, good.verdict, good.fault) == (3, "FAIL", "")


@pytest.mark.parametrize("text", ["=1+1", "@SUM(1)"])
def test_a_text_of_the_table_is_never_a_formula(tmp_path: Path, text: str) -> None:
    rows = [BANKS[0] | {"doc_number": text, "C_unit_source": text, "prepared_by": text}]
    (result,) = fill.fill("bleed", write(tmp_path / "t.csv", rows), tmp_path / "out")
    made = load_workbook(tmp_path / "out" / result.file)
    for name in ("doc_number", "source_of_C_unit", "prepared_by"):
        ((title, reference),) = made.defined_names[name].destinations
        cell = made[title][reference.replace("$", "").split(":")[0]]
        assert (cell.value, cell.data_type) == (text, "s")
