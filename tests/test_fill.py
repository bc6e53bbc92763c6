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
    for table in templates.SHEETS[name].filled_in:
        for number, cells in enumerate(table.demo, start=1):
            for column, text in zip(table.columns, cells, strict=True):
                given[f"{table.symbol}.{column.name}.{number}"] = text
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


@pytest.mark.campaign
@pytest.mark.parametrize("name", [n for n in templates.SHEETS if n not in ("bleed", "sequence")])
def test_every_sheet_equals_that_of_new(tmp_path: Path, name: str) -> None:
    test_a_sheet_equals_that_of_new(tmp_path, name)


@pytest.mark.parametrize("name", ["bleed", "sequence"])
def test_a_sheet_equals_that_of_new(tmp_path: Path, name: str) -> None:
    given = demo_values(name) | {"doc_number": "=1+1", "project": "Quay 4"}
    first = next(e for e in templates.SHEETS[name].entries() if isinstance(e, Input) and e.units)
    long = "a data sheet with a long name, " * 6
    changes: tuple[dict[str, str], ...] = (
        {"doc_number": "Q4-7", "doc_title": "A <title> & more"},
        {first.symbol: "", f"{first.symbol}_source": long},
        {},
    )
    for turn, changed in enumerate(changes):
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
    assert lines[0][4] == "t_safe: R_unit highest, C_unit highest, V_start highest"
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


def test_a_sheet_that_is_another_is_replaced_by_force_alone(tmp_path: Path) -> None:
    table, out = write(tmp_path / "banks.csv", BANKS[:2]), tmp_path / "out"
    fill.fill("bleed", table, out)
    first, second = out / "bleed-000002.xlsx", out / "bleed-000003.xlsx"
    signed = load_workbook(second)
    signed.worksheets[0]["B24"] = "A. Checker"
    signed.save(second)
    before = first.read_bytes(), second.read_bytes()
    changed = write(table, [row | {"R_unit": "36 kohm"} for row in BANKS[:2]])
    for _ in range(2):  # a row that gave no sheet is tried again
        results = fill.fill("bleed", changed, out)
        assert all("is there and is another; move it away" in r.fault for r in results)
        assert (first.read_bytes(), second.read_bytes()) == before
    second.rename(tmp_path / "signed.xlsx")
    assert [r.verdict for r in fill.fill("bleed", changed, out)] == ["", "FAIL"]
    assert [r.verdict for r in fill.fill("bleed", changed, out, force=True)] == ["FAIL", "FAIL"]
    assert first.read_bytes() != before[0]


def test_a_sheet_in_place_that_was_not_noted_is_taken(tmp_path: Path) -> None:
    table, out = write(tmp_path / "banks.csv", BANKS[:1]), tmp_path / "out"
    fill.fill("bleed", table, out)
    notes, sheet = out / fill.NOTES, out / "bleed-000002.xlsx"
    when = sheet.stat().st_mtime_ns
    notes.write_text(notes.read_text().splitlines()[0] + '\n{"line": 2, "dig')
    (result,) = fill.fill("bleed", table, out)
    assert (result.verdict, result.fault) == ("PASS", "")
    assert sheet.stat().st_mtime_ns == when


def children(process: subprocess.Popen[Any]) -> list[str]:
    return Path(f"/proc/{process.pid}/task/{process.pid}/children").read_text().split()


def running(pid: str) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0] != "Z"
    except OSError:
        return False


@pytest.mark.parametrize("victim", ["parent", "worker"])
def test_one_of_several_processes_is_killed(tmp_path: Path, victim: str) -> None:
    many = [BANKS[0] | {"doc_number": f"Q4-{n}"} for n in range(40)]
    table, out = write(tmp_path / "banks.csv", many), tmp_path / "out"
    run = subprocess.Popen(
        [*COMMAND, "fill", "bleed", table, out, "--workers", "2"], stderr=subprocess.PIPE, text=True
    )
    limit = time.monotonic() + 200
    while not list(out.glob("bleed-0*.xlsx")):
        assert time.monotonic() < limit
        time.sleep(0.02)
    family = children(run)
    assert len(family) >= 2
    os.kill(run.pid if victim == "parent" else int(family[-1]), signal.SIGKILL)
    said = run.communicate()[1]
    while any(map(running, family)):  # nobody waits for ever
        assert time.monotonic() < limit
        time.sleep(0.05)
    if victim == "worker":
        assert run.returncode == 2
        assert "a worker process ended in the middle" in said
    assert len(list(out.glob("bleed-0*.xlsx"))) < 40
    results = fill.fill("bleed", table, out, workers=2)
    assert [result.verdict for result in results] == ["PASS"] * 40


def test_semicolons(tmp_path: Path) -> None:
    table = tmp_path / "t.csv"
    table.write_bytes(b"\xef\xbb\xbfC_unit;project\n4.7 mF;Quay 4, drive\n")
    (result,) = fill.fill("bleed", table, tmp_path / "out")
    assert (result.verdict, result.fault) == ("FAIL", "")


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
