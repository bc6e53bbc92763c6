"""`tausheet pdf` for many files: one LibreOffice, started again when it dies or hangs."""

from __future__ import annotations

import os
import signal
import time
from collections.abc import Iterator
from pathlib import Path

import pypdfium2
import pytest
from openpyxl import Workbook
from typer.testing import CliRunner

from tausheet.addin import calc
from tausheet.addin.calc import Calc
from tausheet.addin.calc.helper_process import CalcError, HelperProcess
from tausheet.addin.cli import app
from tausheet.addin.files import NotWritten
from tausheet.addin.printing import NotPrinted, Printed, print_sheets


@pytest.fixture
def shared(monkeypatch: pytest.MonkeyPatch) -> Iterator[Calc]:
    """The LibreOffice of the commands, here one of its own."""
    with Calc() as own:
        monkeypatch.setattr(calc, "_shared", lambda: own)
        yield own


@pytest.fixture
def workbooks(tmp_path: Path) -> list[Path]:
    paths = [tmp_path / f"sheet {number}.xlsx" for number in range(4)]
    for number, path in enumerate(paths):
        workbook = Workbook()
        workbook.worksheets[0]["A1"] = f"page of crane {number}"
        workbook.worksheets[0]["A2"] = "=FO_TAU_RC(1000, 2)"
        workbook.save(path)
    return paths


def text(printed: Printed) -> str:
    assert printed.error is None
    return str(pypdfium2.PdfDocument(printed.out)[0].get_textpage().get_text_bounded())


def office(shared: Calc) -> int:
    """The process of the LibreOffice that serves now: the child of the helper."""
    process = shared.helper._process
    assert process is not None
    for entry in Path("/proc").iterdir():
        if entry.name.isdigit():
            try:
                command = entry.joinpath("cmdline").read_bytes()
            except OSError:
                continue
            if b"soffice.bin" in command and shared.helper.folder.encode() in command:
                return int(entry.name)
    raise AssertionError("no LibreOffice runs")


def test_one_libreoffice_prints_them_all(shared: Calc, workbooks: list[Path]) -> None:
    seen = set()
    for number, printed in enumerate(print_sheets(workbooks)):
        assert f"page of crane {number}" in text(printed)
        assert "2000" in text(printed)
        seen.add(office(shared))
    assert len(seen) == 1


def test_a_bad_file_a_death_and_a_hang_stop_no_other(shared: Calc, workbooks: list[Path]) -> None:
    workbooks[0].write_bytes(workbooks[0].read_bytes()[:2000])
    printing = print_sheets(workbooks, limit=4.0)
    first = next(printing)
    assert "is not a whole .xlsx workbook" in str(first.error)
    assert not first.out.exists()
    second = next(printing)
    os.kill(office(shared), signal.SIGKILL)  # dies between two files
    third = next(printing)
    for number, printed in ((1, second), (2, third)):
        assert f"page of crane {number}" in text(printed)
    hanging = office(shared)
    os.kill(hanging, signal.SIGSTOP)
    began = time.monotonic()
    late = next(printing)
    assert time.monotonic() - began < 30
    assert "LibreOffice took longer than 4 s and was ended" in str(late.error)
    assert not late.out.exists()
    (again,) = print_sheets(workbooks[3:])  # a fresh one does it
    assert "page of crane 3" in text(again)
    assert office(shared) != hanging


def test_the_command_says_which_were_not_printed(shared: Calc, workbooks: list[Path]) -> None:
    workbooks[1].write_bytes(b"not a workbook")
    run = CliRunner().invoke(app, ["pdf", *map(str, workbooks[:3]), "--time-limit", "100"])
    assert run.exit_code == 2
    assert [path.with_suffix(".pdf").exists() for path in workbooks[:3]] == [True, False, True]
    assert "sheet 1.xlsx is not a whole .xlsx workbook" in run.stderr
    # what would be overwritten is refused before the first is printed
    before = workbooks[0].with_suffix(".pdf").stat().st_mtime_ns
    with pytest.raises(NotWritten, match=r"sheet 0\.pdf exists"):
        print_sheets(workbooks)
    assert workbooks[0].with_suffix(".pdf").stat().st_mtime_ns == before
    assert not workbooks[3].with_suffix(".pdf").exists()


def test_what_is_refused_before_the_first(workbooks: list[Path]) -> None:
    with pytest.raises(NotPrinted, match="from two workbooks"):
        print_sheets([workbooks[0], workbooks[0]])
    for limit in (0.0, -1.0, float("nan")):
        with pytest.raises(NotPrinted, match="time limit is"):
            print_sheets(workbooks, limit=limit)


class _Slow(HelperProcess):
    """One that needs 0.2 s for each answer, and notes what time it was given."""

    def __init__(self) -> None:
        super().__init__(100.0, {})
        self.given: list[float] = []

    def _start(self) -> None:
        pass

    def _exchange(self, request: object, limit: float) -> dict[str, object]:
        self.given.append(limit)
        time.sleep(0.2)
        if limit < 0.2:
            raise CalcError(f"too late for {self._whole:g} s")
        return {"result": None}


def test_the_limit_is_for_the_file_not_for_each_request() -> None:
    helper = _Slow()
    with helper.within(0.5):
        helper.ask("open")
        helper.ask("calculate")
        with pytest.raises(CalcError, match=r"too late for 0\.5 s"):
            helper.ask("store")
    assert helper.given[0] == 0.5
    assert helper.given[0] > helper.given[1] > helper.given[2]
    helper.ask("open")
    assert helper.given[-1] == 100.0
