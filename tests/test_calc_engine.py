"""The headless LibreOffice: what it computes, and what happens when it hangs, dies or refuses."""

from __future__ import annotations

import math
import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from openpyxl import Workbook, load_workbook
from openpyxl.worksheet.formula import ArrayFormula

from tausheet.addin.calc import Book, Calc, CalcError, libreoffice
from tausheet.addin.cells import CellValue
from tausheet.functions import step
from tausheet.functions.errors import ErrorKind


@pytest.fixture(scope="module")
def calc() -> Iterator[Calc]:
    with Calc() as running:
        yield running


def save(path: Path, cells: dict[str, CellValue | ArrayFormula], protect: bool = False) -> Path:
    book = Workbook()
    sheet = book.active
    assert sheet is not None
    sheet.title = "Link"
    for address, value in cells.items():
        sheet[address] = value
    sheet.protection.sheet = protect
    book.save(path)
    return path


@pytest.fixture
def workbook(tmp_path: Path) -> Path:
    return save(
        tmp_path / "crane link.xlsx",
        {
            "A1": 1.0,
            "B1": "=FO_STEP(A1,1,0,5)",
            "B2": "=B1>3",
            "B3": '="y is "&FO_TEXT(B1,"V")',
            "B4": "=FO_STEP(A1,0,0,5)",
            "B5": "=B1*0",
            "C1": ArrayFormula("C1:C3", "=FO_STEP({1;2;-1},1,0,5)"),
        },
    )


def office_processes() -> list[int]:
    """Every process of a LibreOffice that this engine started."""
    found = []
    for entry in Path("/proc").iterdir():
        if entry.name.isdigit():
            try:
                command = entry.joinpath("cmdline").read_bytes()
            except OSError:
                continue
            if b"soffice.bin" in command and b"accept=pipe,name=tausheet" in command:
                found.append(int(entry.name))
    return found


class Started:
    """A LibreOffice of its own, told apart from those of other tests by its folder."""

    def __init__(self, calc: Calc) -> None:
        self.folder = calc.helper.folder.encode()

    def processes(self) -> list[int]:
        return [
            pid
            for pid in office_processes()
            if self.folder in Path(f"/proc/{pid}/cmdline").read_bytes()
        ]

    def signal(self, number: signal.Signals) -> None:
        for pid in self.processes():
            os.kill(pid, number)


def until(condition: Callable[[], bool], seconds: float = 20.0) -> bool:
    deadline = time.monotonic() + seconds
    while not condition():
        if time.monotonic() > deadline:
            return False
        time.sleep(0.1)
    return True


def test_every_formula_cell_gets_its_value(calc: Calc, workbook: Path) -> None:
    assert calc.compute(workbook) == {
        "Link": {
            "B1": step(1, 1, 0, 5),
            "B2": True,
            "B3": "y is 3.16 V",
            "B4": ErrorKind.NUM,
            "B5": 0.0,
            "C1": step(1, 1, 0, 5),
            "C2": step(2, 1, 0, 5),
            "C3": 0.0,
        }
    }
    assert calc.compute(workbook)["Link"]["B2"] is True


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=FO_STEP(NA(),1,0,5)", ErrorKind.NA),
        ("=1/0", ErrorKind.DIV0),
        ("=NOSUCH(1)", ErrorKind.NAME),
        ("=EXP(1000)", ErrorKind.NUM),
        ("=FO_STEP(1,1,,5)", ErrorKind.VALUE),
        ('=INDIRECT("nowhere")', ErrorKind.REF),
        ("=SQRT(-1)", ErrorKind.VALUE),
        ("=FO_PARALLEL(A1:A3)", ErrorKind.VALUE),
        ("=FO_PARALLEL(A3)", ErrorKind.NA),
        ("=1=1", True),
        ("=A1=2", False),
        ("=A1", 1.0),
        ('=""', ""),
    ],
)
def test_kinds_of_values(calc: Calc, tmp_path: Path, formula: str, value: CellValue) -> None:
    path = save(tmp_path / "kinds.xlsx", {"A1": 1.0, "A2": 2.0, "A3": "=NA()", "B1": formula})
    found = calc.compute(path)["Link"]["B1"]
    assert found == value
    assert type(found) is type(value)


@pytest.mark.parametrize(("formula", "number"), [("=B1+1", 522), ("=1+", 0), ("=@@", 0)])
def test_a_formula_without_any_workbook_error_is_refused(
    calc: Calc, tmp_path: Path, formula: str, number: int
) -> None:
    path = save(tmp_path / "odd.xlsx", {"B1": formula})
    with pytest.raises(CalcError, match=rf"odd\.xlsx: cell Link!B1 .* error {number or '5'}"):
        calc.compute(path)


def test_an_open_workbook_is_filled_in_and_computed_again(calc: Calc, workbook: Path) -> None:
    before = workbook.read_bytes()
    with calc.open(workbook) as book:
        for value, expected in [
            (2.0, step(2, 1, 0, 5)),
            (0.1, step(0.1, 1, 0, 5)),
            (True, step(1, 1, 0, 5)),
            ("4.7 mF", ErrorKind.VALUE),
            ("=1/0", ErrorKind.VALUE),
            (None, 0.0),
            (ErrorKind.NA, ErrorKind.NA),
            (ErrorKind.NUM, ErrorKind.NUM),
            (ErrorKind.NULL, ErrorKind.NULL),
        ]:
            book.set({"Link": {"A1": value}})
            assert book.values()["Link"]["B1"] == expected
    assert workbook.read_bytes() == before


def test_what_takes_no_value(calc: Calc, workbook: Path) -> None:
    with calc.open(workbook) as book:
        with pytest.raises(CalcError, match=r"crane link\.xlsx: cell .*A\$1 cannot hold nan"):
            book.set({"Link": {"A1": math.nan}})
        with pytest.raises(CalcError, match="it has no sheet Rope"):
            book.set({"Rope": {"A1": 2.0}})


def test_a_protected_sheet_is_filled_in_and_computed(calc: Calc, tmp_path: Path) -> None:
    path = save(tmp_path / "locked.xlsx", {"A1": 1.0, "B1": "=A1"}, protect=True)
    with calc.open(path) as book:
        book.set({"Link": {"A1": 2.0}})
        assert book.values() == {"Link": {"B1": 2.0}}


def test_storing_and_printing(calc: Calc, workbook: Path, tmp_path: Path) -> None:
    for ending in (".xlsx", ".ods"):
        out = tmp_path / f"stored{ending}"
        calc.store(workbook, out)
        assert calc.compute(out) == calc.compute(workbook)
    stored = load_workbook(tmp_path / "stored.xlsx", data_only=True)["Link"]
    assert stored["B1"].value == pytest.approx(step(1, 1, 0, 5), rel=1e-14)
    [printed] = calc.pdf([workbook])
    assert printed == tmp_path / "crane link.pdf"
    assert printed.read_bytes().startswith(b"%PDF-")
    assert sorted(path.name for path in tmp_path.iterdir()) == [
        "crane link.pdf",
        "crane link.xlsx",
        "stored.ods",
        "stored.xlsx",
    ]


def test_a_failed_store_leaves_the_old_file(calc: Calc, workbook: Path, tmp_path: Path) -> None:
    old = tmp_path / "kept.pdf"
    old.write_bytes(b"old")
    with calc.open(workbook) as book:
        Started(calc).signal(signal.SIGKILL)
        with pytest.raises(CalcError, match="LibreOffice ended in the middle"):
            book.store(old)
    assert old.read_bytes() == b"old"
    assert len(list(tmp_path.iterdir())) == 2


def test_a_file_that_another_one_has_open_is_computed(calc: Calc, workbook: Path) -> None:
    lock = workbook.with_name(f".~lock.{workbook.name}#")
    lock.write_text(",other,quay4,01.12.2025 10:00,file:///home/other;")
    assert calc.compute(workbook)["Link"]["B1"] == step(1, 1, 0, 5)
    assert lock.exists()


def test_files_that_cannot_be_opened(calc: Calc, tmp_path: Path) -> None:
    with pytest.raises(CalcError, match=r"gone\.xlsx does not exist"):
        calc.compute(tmp_path / "gone.xlsx")
    with pytest.raises(CalcError, match=r"notes\.txt is no workbook that can be read here"):
        calc.compute(tmp_path / "notes.txt")
    good = save(tmp_path / "good.xlsx", {"B1": "=1"}).read_bytes()
    for name, content in {
        "text.xlsx": b"1;2;3\n",
        "empty.xlsx": b"",
        "cut.xlsx": good[: len(good) // 2],
        "page.xlsx": b"<html><table><tr><td>=1</td></tr></table></html>",
    }.items():
        (tmp_path / name).write_bytes(content)
        with pytest.raises(CalcError, match=f"{name} was not opened: "):
            calc.compute(tmp_path / name)
    assert calc.compute(tmp_path / "good.xlsx") == {"Link": {"B1": 1.0}}


def test_one_that_died_is_started_again(calc: Calc, workbook: Path) -> None:
    calc.compute(workbook)
    Started(calc).signal(signal.SIGKILL)
    assert calc.compute(workbook)["Link"]["B1"] == step(1, 1, 0, 5)


def test_a_workbook_open_in_one_that_died_is_gone(calc: Calc, workbook: Path) -> None:
    with calc.open(workbook) as book:
        Started(calc).signal(signal.SIGKILL)
        with pytest.raises(CalcError, match="LibreOffice ended in the middle"):
            book.values()
        with pytest.raises(CalcError, match="it was open in a LibreOffice that has ended"):
            book.values()


def test_one_that_dies_twice_is_an_error(
    calc: Calc, workbook: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    deaths = []

    def die(book: Book) -> None:
        Started(calc).signal(signal.SIGKILL)
        deaths.append(book)
        book._ask("values", None)

    monkeypatch.setattr(Book, "calculate", die)
    with pytest.raises(CalcError, match=r"crane link\.xlsx: LibreOffice ended in the middle"):
        calc.compute(workbook)
    assert len(deaths) == 2


def test_one_that_hangs_is_ended_in_time(workbook: Path) -> None:
    with Calc(time_limit=3.0) as calc:
        calc.compute(workbook)
        started, folder = Started(calc), Path(calc.helper.folder)
        started.signal(signal.SIGSTOP)
        with pytest.raises(CalcError, match="took longer than 3 s and was ended"):
            calc.compute(workbook)
        assert until(lambda: not started.processes())
        assert not folder.exists()
        assert calc.compute(workbook)["Link"]["B2"] is True


def test_closing_leaves_nothing_behind(workbook: Path) -> None:
    with Calc() as calc:
        calc.compute(workbook)
        started, folder = Started(calc), Path(calc.helper.folder)
        assert len(started.processes()) == 1
        assert folder.exists()
    assert until(lambda: not started.processes())
    assert not folder.exists()


PARENT = """
import sys, time
from pathlib import Path
from tausheet.addin.calc import Calc
calc = Calc()
calc.compute(Path(sys.argv[1]))
print(calc.helper.folder, flush=True)
time.sleep(60)
"""


def test_when_python_is_killed_libreoffice_ends(workbook: Path) -> None:
    command = [sys.executable, "-c", PARENT, str(workbook)]
    with subprocess.Popen(command, stdout=subprocess.PIPE, text=True) as parent:
        assert parent.stdout is not None
        folder = Path(parent.stdout.readline().strip())
        assert folder.is_dir()
        parent.kill()
    assert until(lambda: not folder.exists())


def test_two_threads_share_one_libreoffice(calc: Calc, workbook: Path) -> None:
    found: list[CellValue] = []
    threads = [
        threading.Thread(target=lambda: found.append(calc.compute(workbook)["Link"]["B1"]))
        for _ in range(2)
    ]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert found == [step(1, 1, 0, 5)] * 2


def test_without_libreoffice_a_sentence_says_what_to_install(
    workbook: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    libreoffice.find.cache_clear()
    with monkeypatch.context() as patch:
        patch.setattr(libreoffice, "_programs", lambda: iter(()))
        with (
            Calc() as calc,
            pytest.raises(libreoffice.NotInstalled, match="was not found; install"),
        ):
            calc.compute(workbook)
    with monkeypatch.context() as patch:
        patch.setattr(libreoffice, "_pythons", lambda _: iter((Path("/bin/false"),)))
        with pytest.raises(libreoffice.NotInstalled, match="no Python that can use it; install"):
            libreoffice.find()
    assert libreoffice.find().soffice.exists()
